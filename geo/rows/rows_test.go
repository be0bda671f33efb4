package rows

import (
	"errors"
	"math"
	"math/rand/v2"
	"reflect"
	"testing"

	"groundtally/geo"
	"groundtally/geo/measure"
	"groundtally/geo/overlay"
)

func poly(rings ...[]geo.XY) geo.XYGeometry {
	return geo.XYGeometry{Kind: geo.Polygons, Parts: [][][]geo.XY{rings}}
}

func box(x, y, w, h float64) []geo.XY {
	return []geo.XY{{X: x, Y: y}, {X: x + w, Y: y}, {X: x + w, Y: y + h}, {X: x, Y: y + h}, {X: x, Y: y}}
}

func turned(g geo.XYGeometry, deg float64) geo.XYGeometry {
	s, c := math.Sincos(-deg * math.Pi / 180) // clockwise, as bearings run
	return geo.Map(g, func(p geo.XY) geo.XY { return geo.XY{X: 5e5 + c*p.X - s*p.Y, Y: 5.3e6 + s*p.X + c*p.Y} })
}

func lay(t testing.TB, g geo.XYGeometry, o Layout) []Row {
	t.Helper()
	rs, err := Lay(g, o)
	if err != nil {
		t.Fatal(err)
	}
	return rs
}

func count(rs []Row) (n int) {
	for _, r := range rs {
		n += r.Units
	}
	return n
}

// A field of 100 by 50 m, rows 4 m deep and 9 m apart: 6 rows of 80 units of 1.25 m, whichever way the field is
// turned, as long as the rows turn with it. With lanes of 5 m after 40 m: 32 + 32 + 8 units a row.
func TestLayByHand(t *testing.T) {
	o := Layout{AzimuthDeg: 180, PitchM: 9, DepthM: 4, UnitM: 1.25, LeastUnits: 4}
	field := poly(box(0, 0, 100, 50))
	for deg := 0.0; deg < 360; deg += 30 {
		o.AzimuthDeg = 180 + deg
		rs := lay(t, turned(field, deg), o)
		if len(rs) != 6 || count(rs) != 480 {
			t.Errorf("turned by %v: %d rows, %d units, want 6, 480", deg, len(rs), count(rs))
		}
	}
	o.AzimuthDeg, o.BlockM, o.LaneM = 0, 40, 5
	if rs := lay(t, field, o); len(rs) != 18 || count(rs) != 6*72 {
		t.Errorf("with lanes %d runs, %d units, want 18, 432", len(rs), count(rs))
	}
	o.BlockM, o.MostUnits = 0, 200
	if rs := lay(t, field, o); count(rs) != 200 || len(rs) != 3 {
		t.Errorf("at most 200: %d units in %d rows", count(rs), len(rs))
	}
	// A pond in the middle, 20 by 4 m, parts the row that it meets: 48 and 32 units are 2*(40/1.25).
	o.MostUnits = 0
	if rs := lay(t, poly(box(0, 0, 100, 50), box(40, 19, 20, 4)), o); len(rs) != 7 || count(rs) != 480-16 {
		t.Errorf("with a pond %d runs, %d units, want 7, 464", len(rs), count(rs))
	}
	// No row fits a strip that is narrower than it is deep; one fits a strip that is just as deep.
	if rs := lay(t, poly(box(0, 0, 100, 3.9)), o); len(rs) != 0 {
		t.Errorf("%d rows in a strip of 3.9 m", len(rs))
	}
	if rs := lay(t, poly(box(0, 0, 100, 4)), o); len(rs) != 1 || rs[0].Units != 80 {
		t.Errorf("in a strip of 4 m %v", rs)
	}
	if rs := lay(t, geo.XYGeometry{}, o); rs != nil {
		t.Error("rows in nothing")
	}
}

// Property: the library finds every row within the field, no two rows overlap, and rows fill at most their share.
func TestRowsLieInTheField(t *testing.T) {
	r := rand.New(rand.NewPCG(81, 82))
	e := overlay.New()
	some := 0
	for range 120 {
		n := 5 + r.IntN(20)
		ring := make([]geo.XY, 0, n+1)
		for i := range n {
			s, c := math.Sincos(2 * math.Pi * (float64(i) + 0.7*r.Float64()) / float64(n))
			d := 30 + 150*r.Float64()
			ring = append(ring, geo.XY{X: 5e5 + d*c, Y: 5.3e6 + d*s})
		}
		field := poly(append(ring, ring[0]))
		if r.IntN(2) == 0 {
			field.Parts[0] = append(field.Parts[0], box(5e5-8, 5.3e6-8, 16, 12))
		}
		fixed, _, err := e.Repair(field)
		if err != nil {
			t.Fatal(err)
		}
		pitch := 4 + 8*r.Float64()
		o := Layout{AzimuthDeg: 360 * r.Float64(), PitchM: pitch, DepthM: pitch * (0.2 + 0.6*r.Float64()), UnitM: 1.1, LeastUnits: 1 + r.IntN(12)}
		if r.IntN(2) == 0 {
			o.BlockM, o.LaneM = 20+40*r.Float64(), 4
		}
		rs := lay(t, fixed, o)
		some += len(rs)
		plans := Polygons(rs, o.DepthM)
		around, err := e.Buffer(fixed, 1e-4)
		if err != nil {
			t.Fatal(err)
		}
		if len(rs) > 0 {
			if in, err := e.Covers(around, plans); err != nil || !in {
				t.Fatalf("a row lies outside its field: %v", err)
			}
		}
		alone := 0.0
		for _, x := range rs {
			if x.Units < o.LeastUnits || math.Abs(x.From.Dist(x.To)-float64(x.Units)*o.UnitM) > 1e-6 {
				t.Fatalf("a row of %d units, %v m", x.Units, x.From.Dist(x.To))
			}
			alone += float64(x.Units) * o.UnitM * o.DepthM
		}
		if whole, err := e.Union(plans); len(rs) > 0 && (err != nil || math.Abs(measure.AreaM2(whole)-alone) > 1e-6*alone) {
			t.Fatalf("rows overlap: %v m2 of %v, %v", measure.AreaM2(whole), alone, err)
		}
		if again := lay(t, fixed, o); !reflect.DeepEqual(again, rs) {
			t.Fatal("the same field gives other rows")
		}
	}
	if some < 1000 {
		t.Errorf("only %d rows in all", some)
	}
}

func TestLayRefuses(t *testing.T) {
	good := Layout{AzimuthDeg: 180, PitchM: 9, DepthM: 4, UnitM: 1.25, LeastUnits: 1}
	for name, f := range map[string]func(o *Layout){
		"pitch": func(o *Layout) { o.PitchM = 0 }, "deeper than the pitch": func(o *Layout) { o.DepthM = 10 }, "no depth": func(o *Layout) { o.DepthM = 0 },
		"unit": func(o *Layout) { o.UnitM = 0 }, "least": func(o *Layout) { o.LeastUnits = 0 }, "azimuth": func(o *Layout) { o.AzimuthDeg = math.NaN() }, "lane": func(o *Layout) { o.LaneM = -1 },
	} {
		o := good
		f(&o)
		if _, err := Lay(poly(box(0, 0, 10, 10)), o); !errors.Is(err, ErrLayout) {
			t.Errorf("%s: %v", name, err)
		}
	}
	if _, err := Lay(poly([]geo.XY{{}, {X: math.NaN()}, {Y: 1}, {}}), good); !errors.Is(err, ErrLayout) {
		t.Errorf("a position that is none: %v", err)
	}
	if _, err := Lay(geo.XYGeometry{Kind: geo.Lines, Parts: [][][]geo.XY{{{{}, {X: 1}}}}}, good); !errors.Is(err, ErrLayout) {
		t.Errorf("a line: %v", err)
	}
}

func BenchmarkLay(b *testing.B) {
	r := rand.New(rand.NewPCG(81, 82))
	var ring []geo.XY
	for i := range 60 {
		s, c := math.Sincos(2 * math.Pi * float64(i) / 60)
		d := 150 + 100*r.Float64()
		ring = append(ring, geo.XY{X: d * c, Y: d * s})
	}
	field := poly(append(ring, ring[0]))
	o := Layout{AzimuthDeg: 170, PitchM: 9, DepthM: 4, UnitM: 1.13, LeastUnits: 8, BlockM: 80, LaneM: 5}
	for b.Loop() {
		lay(b, field, o)
	}
}
