package overlay

import (
	"math"
	"os"
	"testing"

	"github.com/twpayne/go-geos"

	"groundtally/assets/citedtable"
	"groundtally/geo"
	"groundtally/geo/measure"
)

func checks(t *testing.T, name string) []citedtable.Check {
	t.Helper()
	tab, err := citedtable.ParseFS(os.DirFS("../../testdata/check"), name)
	if err != nil {
		t.Fatal(err)
	}
	out, err := tab.Checks()
	if err != nil {
		t.Fatal(err)
	}
	return out
}

// wkt reads a geometry of a check row. It may be invalid.
func wkt(t testing.TB, s string) geo.XYGeometry {
	t.Helper()
	g, err := geos.NewContext().NewGeomFromWKT(s)
	if err != nil {
		t.Fatalf("%s: %v", s, err)
	}
	kind := geo.Polygons
	switch g.TypeID() {
	case geos.TypeIDPoint, geos.TypeIDMultiPoint:
		kind = geo.Points
	case geos.TypeIDLineString, geos.TypeIDMultiLineString:
		kind = geo.Lines
	}
	out := geo.XYGeometry{Kind: kind}
	d := decoder{b: g.ToWKB()}
	if err := d.decode(&out); err != nil {
		t.Fatal(err)
	}
	return out
}

// rawBuffer is the library's own buffer without the enlarged radius.
func rawBuffer(t testing.TB, e *Engine, g geo.XYGeometry, d float64, q int) (out geo.XYGeometry) {
	t.Helper()
	if err := e.do("buffer", func() { out = e.give(e.widen(e.load(g), d, q), geo.Polygons) }); err != nil {
		t.Fatal(err)
	}
	return out
}

func must[T any](t testing.TB) func(T, error) T {
	return func(v T, err error) T {
		t.Helper()
		if err != nil {
			t.Fatal(err)
		}
		return v
	}
}

func TestCheckTable(t *testing.T) {
	e := New()
	for _, c := range checks(t, "overlay.csv") {
		t.Run(c.ID, func(t *testing.T) {
			in := c.In
			var a, b geo.XYGeometry
			if s := c.Text["a"]; s != "" {
				a = wkt(t, s)
			}
			if s := c.Text["b"]; s != "" {
				b = wkt(t, s)
			}
			point := geo.XYGeometry{Kind: geo.Points, Parts: [][][]geo.XY{{{{}}}}}
			var got float64
			switch c.Quantity {
			case "raw_buffer_area_m2":
				got = measure.AreaM2(rawBuffer(t, e, a, in["d"], int(in["q"])))
			case "raw_disc_deficit_percent":
				got = 100 * (1 - measure.AreaM2(rawBuffer(t, e, point, in["d"], int(in["q"])))/(math.Pi*in["d"]*in["d"]))
			case "raw_disc_sagitta_m":
				_, d := measure.NearestOnOutline(geo.XY{}, rawBuffer(t, e, point, in["d"], int(in["q"])))
				got = in["d"] - d
			case "buffer_area_m2":
				got = measure.AreaM2(must[geo.XYGeometry](t)(e.Buffer(a, in["d"])))
			case "distance_m":
				got = must[float64](t)(e.DistanceM(a, b))
			case "repaired_area_m2":
				g, _, err := e.Repair(a)
				if err != nil {
					t.Fatal(err)
				}
				got = measure.AreaM2(g)
			default:
				t.Fatalf("unknown quantity %q", c.Quantity)
			}
			if !c.OK(got) {
				t.Errorf("%s(%v %v) = %.12g, want %.12g within %g (%s)", c.Quantity, c.In, c.Text, got, c.Expected, c.Tolerance, c.Source)
			}
		})
	}
}

// Another engine's areas of the same figures.
func TestAgainstBoost(t *testing.T) {
	e := New()
	for _, c := range checks(t, "boost_overlay.csv") {
		t.Run(c.ID, func(t *testing.T) {
			a := wkt(t, c.Text["a"])
			var b geo.XYGeometry
			if s := c.Text["b"]; s != "" {
				b = wkt(t, s)
			}
			var got float64
			area := func(g geo.XYGeometry, err error) float64 { return measure.AreaM2(must[geo.XYGeometry](t)(g, err)) }
			switch c.Quantity {
			case "area_m2":
				got = must[float64](t)(e.AreaM2(a))
				if m := measure.AreaM2(a); !c.OK(m) {
					t.Errorf("package measure gives %v, want %v", m, c.Expected)
				}
			case "buffer_area_m2":
				d := c.In["d"]
				got = measure.AreaM2(rawBuffer(t, e, a, d, 180))
				// The enlarged one takes more, by no more than 0.13 % of the radius along the outline.
				safe, slack := area(e.Buffer(a, d)), 1.3e-3*math.Abs(d)*(measure.LengthM(a)*2+2*math.Pi*math.Abs(d))
				if lo, hi := c.Expected*(1-2e-5), c.Expected+slack; d > 0 && (safe < lo || safe > hi) {
					t.Errorf("Buffer takes %v, want %v to %v", safe, lo, hi)
				}
				if lo, hi := c.Expected-slack, c.Expected*(1+2e-5); d < 0 && (safe < lo || safe > hi) {
					t.Errorf("Buffer leaves %v, want %v to %v", safe, lo, hi)
				}
			case "union_area_m2":
				got = area(e.Union(a, b))
			case "difference_area_m2":
				got = area(e.Difference(a, b))
			case "intersection_area_m2":
				got = area(e.Intersection(a, b))
			default:
				t.Fatalf("unknown quantity %q", c.Quantity)
			}
			if !c.OK(got) {
				t.Errorf("%s(%v %v) = %.12g, want %.12g within %g (%s)", c.Quantity, c.In, c.Text, got, c.Expected, c.Tolerance, c.Source)
			}
		})
	}
}
