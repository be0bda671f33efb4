package run

import (
	"math"

	"groundtally/geo"
	"groundtally/geo/measure"
	"groundtally/geo/overlay"
	"groundtally/geo/rows"
	"groundtally/scoring/solar"
	"groundtally/scoring/units"
)

// panelRows is how the rows of an option are laid on a site. A unit is one column of modules, side by side across
// the row.
type panelRows struct {
	layout  rows.Layout
	unitKW  float64
	across  int     // modules of a unit
	offsetM float64 // from the fence to the first panel
}

// The ground that rows take where the option does not say. Source of all: common practice.
const (
	verticalWidthM = 2.2 // height of an upright row of two modules, one over the other
	verticalDepthM = 0.3 // of its posts
	leastDepthM    = 0.3 // of any row on the ground plan
	leastRunM      = 10  // shorter runs are not built
)

// rowsOf gives the rows of an option; ok is false where its settings are out of range.
func (f *fitter) rowsOf(o option, s site) (p panelRows, ok bool, err error) {
	lat, err := f.siteLat(s)
	if err != nil {
		return p, false, err
	}
	plant, err := f.plant(o, lat)
	if err != nil {
		return p, false, err
	}
	l, err := f.lie(s)
	if err != nil {
		return p, false, err
	}
	m := plant.Mount
	if err := l.on(&m); err != nil {
		return p, false, err
	}
	num := func(name string) float64 { x, _ := o.num(name); return x }
	eff, width, length := num("module_efficiency"), num("module_width_m"), num("module_length_m")
	collector, depth, faces := m.WidthM, m.WidthM, m.AzimuthDeg
	switch m.Kind {
	case solar.SingleAxis:
		faces = m.AxisAzimuthDeg + 90
	case solar.VerticalRows:
		collector, depth = verticalWidthM, verticalDepthM
	default:
		depth = m.WidthM * math.Cos(m.TiltDeg*math.Pi/180)
	}
	if !(m.GCR > 0 && eff > 0 && width > 0 && length > 0 && collector > 0) {
		return p, false, nil
	}
	// Along a row that climbs, a module is shorter on the ground plan.
	along := solar.AlongSlope(faces-90, m.SlopeDeg, m.AspectDeg)
	grid, err := f.w.frame.GridAzimuthDeg(s.box.Centre(), faces)
	if err != nil {
		return p, false, err
	}
	pitch := collector / m.GCR
	p = panelRows{
		layout: rows.Layout{AzimuthDeg: grid, PitchM: pitch, DepthM: min(pitch, max(leastDepthM, depth)), UnitM: width * along, LeastUnits: max(1, int(math.Ceil(leastRunM/width))), BlockM: num("lane_every_m"), LaneM: num("lane_m")},
		// Full sun of 1 kW/m2 on the modules, less what gives room to inverters.
		unitKW: eff * collector * width * num("usable_share"), across: max(1, int(math.Round(collector/length))), offsetM: num("fence_offset_m"),
	}
	return p, p.unitKW > 0, nil
}

// in lays rows in ground inside a fence, up to so many units; 0 is no limit.
func (p panelRows) in(e *overlay.Engine, fence geo.XYGeometry, most int) ([]rows.Row, error) {
	inner := fence
	if p.offsetM > 0 {
		var err error
		if inner, err = e.Buffer(fence, -p.offsetM); err != nil {
			return nil, err
		}
	}
	p.layout.MostUnits = most
	return rows.Lay(inner, p.layout)
}

func unitsOf(rs []rows.Row) (n int) {
	for _, r := range rs {
		n += r.Units
	}
	return n
}

// fencing is ground with rows.
type fencing struct {
	fence geo.XYGeometry
	ha    float64
	units int
}

// fill lays rows in the largest patches first, up to so many units; 0 is no limit. The patch that takes the last of
// them is cut by a line from west to east, so that little more ground is fenced than they need. Patches without
// room for a row are not fenced.
func (p panelRows) fill(e *overlay.Engine, area geo.XYGeometry, most int) (out fencing, err error) {
	out.fence.Kind = geo.Polygons
	take := func(g geo.XYGeometry, n int) {
		out.fence.Parts = append(out.fence.Parts, g.Parts...)
		out.ha += measure.AreaM2(g) / units.M2PerHa
		out.units += n
	}
	for _, part := range largestFirst(area) {
		if most > 0 && out.units >= most {
			break
		}
		one := geo.XYGeometry{Kind: geo.Polygons, Parts: [][][]geo.XY{part}}
		rs, err := p.in(e, one, 0)
		if err != nil {
			return out, err
		}
		n, left := unitsOf(rs), most-out.units
		switch {
		case n == 0:
		case most == 0 || n <= left:
			take(one, n)
		default:
			cut, err := p.cut(e, one, measure.AreaM2(one)*float64(left)/float64(n), left)
			if err != nil {
				return out, err
			}
			take(cut, left)
		}
	}
	return out, nil
}

// cut finds the part of a patch that has room for so many units, beginning with a guess of its area.
func (p panelRows) cut(e *overlay.Engine, patch geo.XYGeometry, wantM2 float64, most int) (geo.XYGeometry, error) {
	whole := measure.AreaM2(patch)
	for range 12 {
		if wantM2 >= whole {
			break
		}
		g, _, err := firstHectares(e, patch, wantM2/units.M2PerHa)
		if err != nil {
			return g, err
		}
		rs, err := p.in(e, g, 0)
		if err != nil {
			return g, err
		}
		n := unitsOf(rs)
		if n >= most {
			return g, nil
		}
		// A little more than in proportion, since a narrow rest of ground has no room for a row.
		wantM2 *= max(1.01, min(2, float64(most)/float64(max(n, 1))*1.005))
	}
	return patch, nil
}
