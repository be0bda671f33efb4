package run

import (
	"math"
	"testing"

	"groundtally/geo"
	"groundtally/geo/measure"
	"groundtally/geo/overlay"
	"groundtally/geo/rows"
)

func field(x, y, w, h float64) geo.XYGeometry {
	return rectangle(geo.Extent{MinX: x, MinY: y, MaxX: x + w, MaxY: y + h})
}

// Rows 3.464 m deep (4 m at 30 degrees), 8.889 m apart (4 m over 0.45), of modules 1.134 m wide, 4 m inside a fence
// of 208 by 108 m: 200 by 100 m hold floor((100-3.464)/8.889)+1 = 11 rows. Lanes of 5 m after 100 m leave 100 and
// 95 m: 88 and 83 modules a row.
func TestPanelsByHand(t *testing.T) {
	e := overlay.New()
	defer closeEngine(e)
	p := panelRows{
		layout: rows.Layout{AzimuthDeg: 180, PitchM: 4 / 0.45, DepthM: 4 * math.Cos(math.Pi/6), UnitM: 1.134, LeastUnits: 9, BlockM: 100, LaneM: 5},
		unitKW: 0.21 * 4 * 1.134, across: 2, offsetM: 4,
	}
	out, err := p.fill(e, field(0, 0, 208, 108), 0)
	if err != nil {
		t.Fatal(err)
	}
	if want := 11 * (88 + 83); out.units != want || math.Abs(out.ha-208*108/1e4) > 1e-9 {
		t.Errorf("%d units on %v ha, want %d", out.units, out.ha, want)
	}
	// 1.79 MW on 2.25 ha are 0.80 MWp/ha: below 10 efficiency GCR = 0.945, which leaves out edges and lanes.
	if d := float64(out.units) * p.unitKW / 1000 / out.ha; math.Abs(d-0.797) > 0.01 {
		t.Errorf("%v MWp/ha", d)
	}
	// Half of it needs about half of the ground, not less, and what is fenced has room for it.
	half, err := p.fill(e, field(0, 0, 208, 108), out.units/2)
	if err != nil {
		t.Fatal(err)
	}
	laid, err := p.in(e, half.fence, 0)
	if err != nil {
		t.Fatal(err)
	}
	if half.units != out.units/2 || unitsOf(laid) < half.units || half.ha > 0.62*out.ha || half.ha < 0.45*out.ha {
		t.Errorf("%d units on %v ha of %v, which have room for %d", half.units, half.ha, out.ha, unitsOf(laid))
	}
	// The largest patch first; a patch without room for a row is not fenced.
	three := geo.XYGeometry{Kind: geo.Polygons}
	for _, g := range []geo.XYGeometry{field(500, 0, 60, 60), field(0, 0, 208, 108), field(900, 0, 300, 9)} {
		three.Parts = append(three.Parts, g.Parts...)
	}
	all, err := p.fill(e, three, 0)
	if err != nil {
		t.Fatal(err)
	}
	if len(all.fence.Parts) != 2 || math.Abs(measure.AreaM2(all.fence)-208*108-3600) > 1e-6 || all.units <= out.units {
		t.Errorf("%d patches fenced, %v m2, %d units", len(all.fence.Parts), measure.AreaM2(all.fence), all.units)
	}
	if first, err := p.fill(e, three, out.units); err != nil || len(first.fence.Parts) != 1 || first.units != out.units {
		t.Errorf("up to what the largest holds: %d patches, %d units, %v", len(first.fence.Parts), first.units, err)
	}
}
