package measure

import (
	"math"
	"math/rand/v2"
	"os"
	"testing"

	"groundtally/assets/citedtable"
	"groundtally/geo"
)

func box(x, y, w, h float64) []geo.XY {
	return []geo.XY{{X: x, Y: y}, {X: x + w, Y: y}, {X: x + w, Y: y + h}, {X: x, Y: y + h}, {X: x, Y: y}}
}

func polygon(rings ...[]geo.XY) geo.XYGeometry {
	return geo.XYGeometry{Kind: geo.Polygons, Parts: [][][]geo.XY{rings}}
}

func shape(t *testing.T, c citedtable.Check) geo.XYGeometry {
	in := c.In
	switch c.Text["shape"] {
	case "square":
		return polygon(box(in["x"], in["y"], in["side"], in["side"]))
	case "holed":
		o := (in["side"] - in["hole"]) / 2
		return polygon(box(0, 0, in["side"], in["side"]), box(o, o, in["hole"], in["hole"]))
	case "ngon":
		n := int(in["n"])
		var ring []geo.XY
		for i := range n {
			s, cos := math.Sincos(2 * math.Pi * float64(i) / float64(n))
			ring = append(ring, geo.XY{X: in["radius"] * cos, Y: in["radius"] * s})
		}
		return polygon(Close(ring))
	case "triangle":
		return polygon(Close([]geo.XY{{X: 0, Y: 0}, {X: 12, Y: 0}, {X: 0, Y: 9}}))
	case "ell":
		return polygon(Close([]geo.XY{{}, {X: 3}, {X: 3, Y: 1}, {X: 1, Y: 1}, {X: 1, Y: 3}, {Y: 3}}))
	}
	t.Fatalf("unknown shape %q", c.Text["shape"])
	return geo.XYGeometry{}
}

func TestCheckTable(t *testing.T) {
	tab, err := citedtable.ParseFS(os.DirFS("../../testdata/check"), "measure.csv")
	if err != nil {
		t.Fatal(err)
	}
	checks, err := tab.Checks()
	if err != nil {
		t.Fatal(err)
	}
	for _, c := range checks {
		t.Run(c.ID, func(t *testing.T) {
			in := c.In
			var got float64
			switch c.Quantity {
			case "area_m2":
				got = AreaM2(shape(t, c))
			case "length_m":
				got = LengthM(shape(t, c))
			case "centroid_x_m", "centroid_y_m":
				p, ok := Centroid(shape(t, c))
				if !ok {
					t.Fatal("no centroid")
				}
				if got = p.X; c.Quantity == "centroid_y_m" {
					got = p.Y
				}
			case "segment_distance_m":
				got = PointToSegmentM(geo.XY{X: in["px"], Y: in["py"]}, geo.XY{X: in["ax"], Y: in["ay"]}, geo.XY{X: in["bx"], Y: in["by"]})
			case "polygon_distance_m":
				d, ok := PointToM(geo.XY{X: in["px"], Y: in["py"]}, shape(t, c))
				if !ok {
					t.Fatal("no distance")
				}
				got = d
			case "azimuth_deg":
				got = AzimuthDeg(geo.XY{X: in["px"], Y: in["py"]}, geo.XY{X: in["ax"], Y: in["ay"]})
			case "rough_distance_m":
				got = RoughDistanceM(geo.LonLat{Lon: in["lon1"], Lat: in["lat1"]}, geo.LonLat{Lon: in["lon2"], Lat: in["lat2"]})
			case "rough_area_m2":
				got = RoughAreaM2(lonLatBox(in["lon1"], in["lat1"], in["lon2"], in["lat2"]))
			default:
				t.Fatalf("unknown quantity %q", c.Quantity)
			}
			if !c.OK(got) {
				t.Errorf("%s(%v %v) = %.14g, want %.14g within %g (%s)", c.Quantity, c.In, c.Text, got, c.Expected, c.Tolerance, c.Source)
			}
		})
	}
}

func lonLatBox(w, s, e, n float64) geo.LonLatGeometry {
	return geo.Map(polygon(box(w, s, e-w, n-s)), func(p geo.XY) geo.LonLat { return geo.LonLat{Lon: p.X, Lat: p.Y} })
}

func TestWind(t *testing.T) {
	outer, hole := box(0, 0, 10, 10), box(2, 2, 3, 3)
	cw := func(r []geo.XY) []geo.XY {
		out := make([]geo.XY, len(r))
		for i, p := range r {
			out[len(r)-1-i] = p
		}
		return out
	}
	for _, g := range []geo.XYGeometry{polygon(outer, hole), polygon(cw(outer), hole), polygon(outer, cw(hole)), polygon(cw(outer), cw(hole))} {
		before := g.Parts[0][0][1]
		w := Wind(g)
		if !CounterClockwise(w.Parts[0][0]) || CounterClockwise(w.Parts[0][1]) {
			t.Errorf("wrong winding %v", w)
		}
		if g.Parts[0][0][1] != before {
			t.Error("the input was altered")
		}
		if math.Abs(AreaM2(w)-AreaM2(g)) > 1e-12 {
			t.Error("the area changed")
		}
	}
	ll := lonLatBox(9, 48, 10, 49)
	ll.Parts[0] = append(ll.Parts[0], lonLatBox(9.2, 48.2, 9.3, 48.3).Parts[0][0])
	w := Wind(ll)
	if w.Parts[0][1][1] != (geo.LonLat{Lon: 9.2, Lat: 48.3}) {
		t.Errorf("the hole was not turned: %v", w.Parts[0][1])
	}
	line := geo.XYGeometry{Kind: geo.Lines, Parts: [][][]geo.XY{{cw(outer)}}}
	if got := Wind(line); got.Parts[0][0][1] != line.Parts[0][0][1] {
		t.Error("a line was turned")
	}
}

func TestInsideEdges(t *testing.T) {
	g := polygon(box(0, 0, 10, 10), box(4, 4, 2, 2))
	for _, c := range []struct {
		p    geo.XY
		want bool
	}{{geo.XY{X: 1, Y: 1}, true}, {geo.XY{}, true}, {geo.XY{X: 10, Y: 10}, true}, {geo.XY{X: 5, Y: 10}, true}, {geo.XY{X: 5, Y: 5}, false}, {geo.XY{X: 4, Y: 5}, true}, {geo.XY{X: 4, Y: 6}, true}, {geo.XY{X: -1, Y: 0}, false}, {geo.XY{X: 11, Y: 10}, false}, {geo.XY{X: 10.0001, Y: 5}, false}, {geo.XY{X: -3, Y: 10}, false}} {
		if got := Inside(c.p, g); got != c.want {
			t.Errorf("Inside(%v) = %v", c.p, got)
		}
	}
	if Inside(geo.XY{}, geo.XYGeometry{Kind: geo.Lines, Parts: g.Parts}) {
		t.Error("a line holds a position")
	}
}

func TestEmpty(t *testing.T) {
	var none geo.XYGeometry
	if _, ok := Centroid(none); ok {
		t.Error("centroid of nothing")
	}
	if _, ok := PointToM(geo.XY{}, none); ok {
		t.Error("distance to nothing")
	}
	if AreaM2(none) != 0 || LengthM(none) != 0 {
		t.Error("nothing has a size")
	}
	if _, ok := InteriorPoint(nil); ok {
		t.Error("interior of nothing")
	}
	if _, ok := InteriorPoint([][]geo.XY{{{X: 0}, {X: 1}, {X: 2}, {X: 0}}}); ok {
		t.Error("interior of a flat ring")
	}
}

// star gives a simple polygon around the origin.
func star(r *rand.Rand, n int) geo.XYGeometry {
	var ring []geo.XY
	for i := range n {
		s, c := math.Sincos(2 * math.Pi * (float64(i) + 0.8*r.Float64()) / float64(n))
		d := 20 + 80*r.Float64()
		ring = append(ring, geo.XY{X: d * c, Y: d * s})
	}
	return polygon(Close(ring))
}

// Property: slices agree with the point test; the sum of slices agrees with the area.
func TestSliceAgainstInside(t *testing.T) {
	r := rand.New(rand.NewPCG(3, 4))
	for range 50 {
		g := star(r, 5+r.IntN(30))
		g.Parts[0] = append(g.Parts[0], box(-3, -3, 5, 7))
		s := NewSlicer(g)
		sum, lines := 0.0, 2000
		e := s.Extent()
		h := (e.MaxY - e.MinY) / float64(lines)
		for i := range lines {
			y := e.MinY + (float64(i)+0.5)*h
			spans := s.At(y, nil)
			for _, sp := range spans {
				sum += (sp.Hi - sp.Lo) * h
			}
			if i%50 == 0 {
				x := e.MinX + r.Float64()*(e.MaxX-e.MinX)
				in := false
				for _, sp := range spans {
					in = in || (x >= sp.Lo && x <= sp.Hi)
				}
				if in != Inside(geo.XY{X: x, Y: y}, g) {
					t.Fatalf("slice and point test differ at %v %v", x, y)
				}
			}
		}
		if a := AreaM2(g); math.Abs(sum-a) > 2e-3*a {
			t.Errorf("slices give %v m2, area %v m2", sum, a)
		}
		p, ok := InteriorPoint(g.Parts[0])
		if !ok || !Inside(p, g) {
			t.Errorf("interior point %v is outside", p)
		}
	}
}

func TestClosedSliceTakesEdges(t *testing.T) {
	s := NewSlicer(polygon(box(0, 0, 10, 10), box(4, 4, 2, 2)))
	for _, c := range []struct {
		y    float64
		want int
	}{{0, 1}, {10, 1}, {10 + 5e-7, 1}, {10.1, 0}, {5, 2}, {4, 1}, {6, 1}} {
		if got := s.Closed(c.y, 1e-6, nil); len(got) != c.want {
			t.Errorf("slice at %v: %v, want %d spans", c.y, got, c.want)
		}
	}
	p, _ := InteriorPoint([][]geo.XY{box(0, 0, 10, 4)})
	if p != (geo.XY{X: 5, Y: 2}) {
		t.Errorf("interior point of a box %v, want its centre", p)
	}
}

func TestCheckArea(t *testing.T) {
	g := lonLatBox(9, 48, 9.01, 48.01)
	a := RoughAreaM2(g)
	if err := CheckArea(a*1.005, g); err != nil {
		t.Error(err)
	}
	swapped := geo.Map(g, func(p geo.LonLat) geo.LonLat { return geo.LonLat{Lon: p.Lat, Lat: p.Lon} })
	if CheckArea(a, swapped) == nil {
		t.Error("swapped axes went unnoticed")
	}
	if CheckArea(math.NaN(), g) == nil {
		t.Error("NaN went unnoticed")
	}
}

func BenchmarkSliceAt(b *testing.B) {
	s := NewSlicer(star(rand.New(rand.NewPCG(1, 1)), 200))
	var buf []Span
	for b.Loop() {
		buf = s.At(3.3, buf[:0])
	}
}

func BenchmarkInside(b *testing.B) {
	g := star(rand.New(rand.NewPCG(1, 1)), 200)
	for b.Loop() {
		Inside(geo.XY{X: 3, Y: 4}, g)
	}
}

// A square of 10 by 10 with a hole of 4 by 4 in its middle, cut at heights whose areas are plain to see, and a star
// beside the sum of its slices.
func TestAreaBelow(t *testing.T) {
	g := polygon(box(0, 0, 10, 10), box(3, 3, 4, 4))
	for _, c := range [][2]float64{{-1, 0}, {0, 0}, {3, 30}, {5, 50 - 8}, {7, 70 - 16}, {10, 84}, {12, 84}} {
		if got := AreaBelowM2(g, c[0]); math.Abs(got-c[1]) > 1e-12 {
			t.Errorf("below %g lie %g, not %g", c[0], got, c[1])
		}
	}
	r := rand.New(rand.NewPCG(1, 2))
	for range 20 {
		g := star(r, 30)
		x, s := geo.ExtentOf(g), NewSlicer(g)
		y := x.MinY + r.Float64()*(x.MaxY-x.MinY)
		const n = 20000
		var sum float64
		for k := range n {
			for _, span := range s.At(x.MinY+(y-x.MinY)*(float64(k)+0.5)/n, nil) {
				sum += (span.Hi - span.Lo) * (y - x.MinY) / n
			}
		}
		if got := AreaBelowM2(g, y); math.Abs(got-sum) > 1e-4*AreaM2(g) {
			t.Errorf("below %g lie %g, by slices %g", y, got, sum)
		}
	}
}
