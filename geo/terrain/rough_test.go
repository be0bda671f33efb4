package terrain

import (
	"math"
	"math/rand/v2"
	"testing"

	"groundtally/geo"
)

// The example of the index's authors, figure 3 c: 200 210 220 / 210 225 225 / 205 210 220. The squares of the
// differences are 625 + 225 + 25 + 225 + 0 + 400 + 225 + 25 = 1750. (Their figure says 100, a known slip.)
func TestRoughnessByHand(t *testing.T) {
	g, err := New(geo.XY{}, 30, 3, 3, []float32{205, 210, 220, 210, 225, 225, 200, 210, 220}, -1)
	if err != nil {
		t.Fatal(err)
	}
	if got, ok := g.RoughnessM(1, 1); !ok || math.Abs(got-math.Sqrt(1750)) > 1e-12 {
		t.Errorf("got %v %v, want √1750", got, ok)
	}
	if _, ok := g.RoughnessM(0, 1); ok {
		t.Error("a cell at the edge has a roughness")
	}
}

// Properties: lifting the ground changes nothing, stretching it stretches the index, upside down is as
// rough; a plane of slope s has √6·s·CellM whichever way it falls.
func TestRoughnessProperties(t *testing.T) {
	r := rand.New(rand.NewPCG(4, 2))
	for range 50 {
		var z [9]float32
		for i := range z {
			z[i] = float32(r.IntN(4000)) / 4
		}
		rough := func(lift, stretch float32) float64 {
			h := make([]float32, 9)
			for i := range h {
				h[i] = stretch*z[i] + lift
			}
			g, err := New(geo.XY{}, 10, 3, 3, h, -1e9)
			if err != nil {
				t.Fatal(err)
			}
			out, ok := g.RoughnessM(1, 1)
			if !ok || out < 0 {
				t.Fatalf("got %v %v", out, ok)
			}
			return out
		}
		one := rough(0, 1)
		if math.Abs(rough(500, 1)-one) > 1e-9 || math.Abs(rough(0, 4)-4*one) > 1e-9 || math.Abs(rough(0, -1)-one) > 1e-9 {
			t.Errorf("heights %v: %v", z, one)
		}
		turn, s := 2*math.Pi*r.Float64(), r.Float64()
		g := grid(t, 5, 5, plane(0, s*math.Sin(turn), s*math.Cos(turn)))
		if got, ok := g.RoughnessM(2, 2); !ok || math.Abs(got-math.Sqrt(6)*s*10) > 1e-4 {
			t.Errorf("a slope of %v to %v: %v, want %v", s, turn, got, math.Sqrt(6)*s*10)
		}
	}
}

// Directions of a site: one way, two that cancel out, two at a right angle, level, none.
func TestOverAspectAndRoughness(t *testing.T) {
	site := box(1105, -445, 200, 100)
	ridge := func(west, east float64) func(geo.XY) (float64, bool) { // of gradients either side of X 1205
		return func(p geo.XY) (float64, bool) {
			return 500 + math.Min(0, p.X-1205)*west - math.Max(0, p.X-1205)*east, true
		}
	}
	for _, c := range []struct {
		name   string
		height func(geo.XY) (float64, bool)
		has    bool
		aspect float64
		length float64
		share  float64
	}{
		{"one way", plane(0, 0.1, 0.1), true, 225, 1, 1},
		{"north", plane(0, 0, -0.1), true, 0, 1, 1},
		// The cells at 1200 and 1210 see both sides alike, by halves: they fall west and east as well.
		{"two that cancel out", ridge(0.2, 0.2), false, 0, 0, 1},
		{"right angle", func(p geo.XY) (float64, bool) {
			if p.X < 1205 {
				return -0.2 * (p.Y + 500), true
			}
			return 0.2*(p.Y+500) + 1e6, true // so steep between that the cells there fall west alone
		}, true, 270, 0.1, 1},
		{"level", plane(9, 0, 0), false, 0, 0, 0},
	} {
		s, err := grid(t, 60, 40, c.height).Over(site, 10)
		if err != nil {
			t.Fatal(err)
		}
		if s.HasAspect != c.has || math.Abs(s.AspectLength-c.length) > 2e-3 || math.Abs(s.AspectShare-c.share) > 1e-9 {
			t.Errorf("%s: got %+v", c.name, s)
		}
		if c.has && math.Abs(math.Remainder(s.MeanAspectDeg-c.aspect, 360)) > 0.1 {
			t.Errorf("%s: aspect %v, want %v", c.name, s.MeanAspectDeg, c.aspect)
		}
		if s.MeanAspectDeg < 0 || s.MeanAspectDeg >= 360 {
			t.Errorf("%s: aspect %v", c.name, s.MeanAspectDeg)
		}
	}
	s, err := grid(t, 60, 40, plane(0, 0.1, 0.1)).Over(site, 10)
	if want := math.Sqrt(6) * math.Hypot(0.1, 0.1) * 10; err != nil || math.Abs(s.RoughnessM-want) > 1e-3 {
		t.Errorf("roughness %v %v, want %v", s.RoughnessM, err, want)
	}
	if s, err = grid(t, 60, 40, plane(0, 0.1, 0)).Over(box(0, 0, 10, 10), 10); err != nil || s.RoughnessM != 0 || s.HasAspect || s.AspectShare != 0 {
		t.Errorf("off the grid: %+v %v", s, err)
	}
}

// Property: over cells that are whole, the mean over polygons is the mean of the cells.
func TestOverIsTheMeanOfCells(t *testing.T) {
	r := rand.New(rand.NewPCG(8, 8))
	g := grid(t, 40, 30, func(geo.XY) (float64, bool) { return 40 * r.Float64(), r.IntN(100) > 0 })
	s, err := g.Over(box(1045, -455, 300, 200), 10)
	if err != nil {
		t.Fatal(err)
	}
	var rough, east, north, n float64
	for row := 5; row < 25; row++ {
		for c := 5; c < 35; c++ {
			v, ok := g.RoughnessM(c, row)
			if !ok {
				continue
			}
			a, _ := g.AspectDeg(c, row)
			e, no := math.Sincos(a * math.Pi / 180)
			rough, east, north, n = rough+v, east+e, north+no, n+1
		}
	}
	if math.Abs(s.RoughnessM-rough/n) > 1e-9 || math.Abs(s.AspectLength-math.Hypot(east, north)/n) > 1e-9 {
		t.Errorf("got %+v, want a roughness of %v, a length of %v", s, rough/n, math.Hypot(east, north)/n)
	}
	if want := math.Atan2(east, north) * 180 / math.Pi; math.Abs(math.Remainder(s.MeanAspectDeg-want, 360)) > 1e-6 {
		t.Errorf("aspect %v, want %v", s.MeanAspectDeg, want)
	}
}
