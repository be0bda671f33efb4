package terrain

import (
	"math"
	"math/rand/v2"
	"testing"

	"groundtally/geo"
	"groundtally/geo/measure"
)

func grid(t testing.TB, nx, ny int, f func(geo.XY) (float64, bool)) *Grid {
	t.Helper()
	g, err := Fill(geo.XY{X: 1000, Y: -500}, 10, nx, ny, f)
	if err != nil {
		t.Fatal(err)
	}
	return g
}

func plane(a, b, c float64) func(geo.XY) (float64, bool) {
	return func(p geo.XY) (float64, bool) { return a + b*(p.X-1000) + c*(p.Y+500), true }
}

func box(x, y, w, h float64) geo.XYGeometry {
	return geo.XYGeometry{Kind: geo.Polygons, Parts: [][][]geo.XY{{{{X: x, Y: y}, {X: x + w, Y: y}, {X: x + w, Y: y + h}, {X: x, Y: y + h}, {X: x, Y: y}}}}}
}

// On a plane every answer is known: slope atan √(b² + c²), aspect down the gradient.
func TestPlanes(t *testing.T) {
	for _, c := range []struct{ b, c, slope, aspect float64 }{
		{0.1, 0, 5.7105931, 270}, {-0.1, 0, 5.7105931, 90}, {0, 1, 45, 180}, {0, -1, 45, 0},
		{-0.3, -0.3, 22.9893, 45}, {0.3, -0.3, 22.9893, 315},
	} {
		g := grid(t, 20, 15, plane(100, c.b, c.c))
		s, ok := g.SlopeDeg(7, 8)
		if !ok || math.Abs(s-c.slope) > 1e-3 {
			t.Errorf("slope %v, want %v", s, c.slope)
		}
		a, ok := g.AspectDeg(7, 8)
		if !ok || math.Abs(math.Remainder(a-c.aspect, 360)) > 1e-2 || a < 0 || a >= 360 {
			t.Errorf("aspect %v, want %v", a, c.aspect)
		}
		p := geo.XY{X: 1043.7, Y: -448.1}
		z, ok := g.Sample(p)
		if want, _ := plane(100, c.b, c.c)(p); !ok || math.Abs(z-want) > 1e-4 {
			t.Errorf("height %v, want %v", z, want)
		}
	}
	flat := grid(t, 5, 5, plane(7, 0, 0))
	if s, ok := flat.SlopeDeg(2, 2); !ok || s != 0 {
		t.Errorf("slope of level ground %v %v", s, ok)
	}
	if a, ok := flat.AspectDeg(2, 2); ok {
		t.Errorf("level ground falls to %v", a)
	}
}

// The nine heights 1 to 9 by hand: rows from north 1 2 3 / 4 5 6 / 7 8 9 on cells of 10 m.
func TestHornByHand(t *testing.T) {
	g, err := New(geo.XY{}, 10, 3, 3, []float32{7, 8, 9, 4, 5, 6, 1, 2, 3}, -1)
	if err != nil {
		t.Fatal(err)
	}
	// ∂z/∂x = ((3+12+9) − (1+8+7))/80 = 0.1, ∂z/∂y = ((1+4+3) − (7+16+9))/80 = −0.3.
	s, ok := g.SlopeDeg(1, 1)
	if want := math.Atan(math.Sqrt(0.1)) * 180 / math.Pi; !ok || math.Abs(s-want) > 1e-9 {
		t.Errorf("slope %v, want %v", s, want)
	}
	a, ok := g.AspectDeg(1, 1)
	if want := 360 - math.Atan(1.0/3)*180/math.Pi; !ok || math.Abs(a-want) > 1e-9 {
		t.Errorf("aspect %v, want %v", a, want)
	}
	if z, ok := g.Sample(geo.XY{X: 5, Y: 15}); !ok || z != (4+5+1+2)/4.0 {
		t.Errorf("height %v", z)
	}
}

func TestEdgesAndGaps(t *testing.T) {
	g := grid(t, 6, 6, func(p geo.XY) (float64, bool) { return p.X, p != (geo.XY{X: 1030, Y: -470}) })
	if _, ok := g.Height(3, 3); ok {
		t.Error("the gap has a height")
	}
	if _, ok := g.SlopeDeg(2, 2); ok {
		t.Error("a cell beside the gap has a slope")
	}
	if _, ok := g.SlopeDeg(0, 2); ok {
		t.Error("a cell at the edge has a slope")
	}
	if _, ok := g.SlopeDeg(1, 1); !ok {
		t.Error("a cell away from the gap has no slope")
	}
	if _, ok := g.Sample(geo.XY{X: 1025, Y: -475}); ok {
		t.Error("a height between centres of which one is missing")
	}
	if z, ok := g.Sample(geo.XY{X: 1020, Y: -470}); !ok || z != 1020 {
		t.Errorf("a centre beside the gap gives %v %v", z, ok)
	}
	for _, p := range []geo.XY{{X: 994.9, Y: -500}, {X: 1055.1, Y: -500}, {X: 1000, Y: -505.1}, {X: math.NaN()}, {X: math.Inf(1)}} {
		if z, ok := g.Sample(p); ok {
			t.Errorf("%v outside gives %v", p, z)
		}
		if _, ok := g.SlopeAtDeg(p); ok {
			t.Errorf("%v outside has a slope", p)
		}
	}
	if z, ok := g.Sample(geo.XY{X: 995.1, Y: -504.9}); !ok || z != 1000 {
		t.Errorf("the outer half cell gives %v %v", z, ok)
	}
	if s, ok := g.SlopeAtDeg(geo.XY{X: 1014.9, Y: -494.9}); !ok || math.Abs(s-45) > 1e-6 {
		t.Errorf("slope %v %v", s, ok)
	}
	if a, ok := g.AspectAtDeg(geo.XY{X: 1014.9, Y: -494.9}); !ok || math.Abs(a-270) > 1e-6 {
		t.Errorf("aspect %v %v", a, ok)
	}
}

func TestNewRefuses(t *testing.T) {
	for name, f := range map[string]func() (*Grid, error){
		"count":  func() (*Grid, error) { return New(geo.XY{}, 1, 2, 2, make([]float32, 3), 0) },
		"cell":   func() (*Grid, error) { return New(geo.XY{}, 0, 1, 1, make([]float32, 1), 0) },
		"NaN":    func() (*Grid, error) { return New(geo.XY{X: math.NaN()}, 1, 1, 1, make([]float32, 1), 0) },
		"empty":  func() (*Grid, error) { return New(geo.XY{}, 1, 0, 1, nil, 0) },
		"memory": func() (*Grid, error) { return Fill(geo.XY{}, 1, 1<<20, 1<<20, plane(0, 0, 0)) },
	} {
		if _, err := f(); err == nil {
			t.Errorf("%s was accepted", name)
		}
	}
}

// A ridge: west of X 1200 level, east of it 20 degrees.
func TestOver(t *testing.T) {
	slope := math.Tan(20 * math.Pi / 180)
	g := grid(t, 60, 40, func(p geo.XY) (float64, bool) { return 50 + math.Max(0, p.X-1195)*slope, true })
	s, err := g.Over(box(1105, -445, 200, 100), 10)
	if err != nil {
		t.Fatal(err)
	}
	// The cell at the foot of the slope, X 1190 to 1200 has its centre at 1195... cells are centred on tens:
	// the cell at 1190 sees half a step, atan(slope·5/20) = 5.2 degrees; that at 1200 sees 15/20, 15.3 degrees.
	if want := (1305.0 - 1195) / 200; math.Abs(s.SteepShare-want) > 1e-9 || s.SlopeShare < 1-1e-9 || s.HeightShare < 1-1e-9 {
		t.Errorf("got %+v, want a steep share of %v", s, want)
	}
	if math.Abs(s.AreaM2-20000) > 1e-6 || s.MinM != 50 || !s.HasHeight || !s.HasSlope {
		t.Errorf("got %+v", s)
	}
	sum := 0.0
	for c := 11; c <= 30; c++ {
		z, _ := g.Height(c, 10)
		sum += z / 20
	}
	if math.Abs(s.MeanM-sum) > 1e-4 {
		t.Errorf("mean height %v, want %v", s.MeanM, sum)
	}
	// A site much smaller than a cell.
	s, err = g.Over(box(1401, -401, 0.5, 0.5), 10)
	if err != nil || s.SteepShare != 1 || math.Abs(s.MeanSlopeDeg-20) > 1e-3 || math.Abs(s.MaxSlopeDeg-20) > 1e-3 || math.Abs(s.AreaM2-0.25) > 1e-9 {
		t.Errorf("got %+v %v", s, err)
	}
	// Half outside the grid, wholly outside, the edge without slope.
	s, err = g.Over(box(895, -445, 200, 100), 10)
	if err != nil || math.Abs(s.HeightShare-0.5) > 1e-9 || math.Abs(s.SlopeShare-0.45) > 1e-9 {
		t.Errorf("got %+v %v", s, err)
	}
	if s, err = g.Over(box(0, 0, 10, 10), 10); err != nil || s.HasHeight || s.HasSlope || s.MinM != 0 || s.HeightShare != 0 {
		t.Errorf("got %+v %v", s, err)
	}
	holed := box(1105, -445, 200, 100)
	holed.Parts[0] = append(holed.Parts[0], box(1195, -425, 110, 50).Parts[0][0])
	if s, err = g.Over(holed, 10); err != nil || math.Abs(s.SteepShare-5500.0/14500) > 2e-3 {
		t.Errorf("got %+v %v", s, err)
	}
}

func TestOverRefuses(t *testing.T) {
	g := grid(t, 5, 5, plane(0, 0, 0))
	for name, f := range map[string]func() (Summary, error){
		"lines": func() (Summary, error) {
			return g.Over(geo.XYGeometry{Kind: geo.Lines, Parts: box(0, 0, 1, 1).Parts}, 5)
		},
		"empty": func() (Summary, error) { return g.Over(geo.XYGeometry{Kind: geo.Polygons}, 5) },
		"limit": func() (Summary, error) { return g.Over(box(0, 0, 1, 1), math.NaN()) },
		"NaN":   func() (Summary, error) { return g.Over(box(0, math.NaN(), 1, 1), 5) },
		"flat":  func() (Summary, error) { return g.Over(box(0, 0, 10, 0), 5) },
		"huge":  func() (Summary, error) { return g.Over(box(0, 0, 10, 1e12), 5) },
	} {
		if s, err := f(); err == nil {
			t.Errorf("%s was accepted: %+v", name, s)
		}
	}
	if _, err := g.Steep(g.Extent(), -1); err == nil {
		t.Error("a negative limit was accepted")
	}
}

// Property: the blocks have the area of the steep cells, do not overlap, hold just the steep centres; the
// share over the whole grid agrees.
func TestSteep(t *testing.T) {
	r := rand.New(rand.NewPCG(1, 9))
	for range 20 {
		g := grid(t, 40, 30, func(geo.XY) (float64, bool) { return 4 * r.Float64(), r.IntN(200) > 0 })
		limit := 4 + 4*r.Float64()
		blocks, err := g.Steep(g.Extent(), limit)
		if err != nil {
			t.Fatal(err)
		}
		cells := 0
		for row := range g.NY {
			for c := range g.NX {
				a, ok := g.SlopeDeg(c, row)
				want := ok && a > limit
				if want {
					cells++
				}
				in := 0
				for _, part := range blocks.Parts {
					if measure.Inside(g.Centre(c, row), geo.XYGeometry{Kind: geo.Polygons, Parts: [][][]geo.XY{part}}) {
						in++
					}
				}
				if (in == 1) != want || in > 1 {
					t.Fatalf("cell %d %d lies in %d blocks, steep %v", c, row, in, want)
				}
			}
		}
		if a := measure.AreaM2(blocks); math.Abs(a-float64(cells)*100) > 1e-6 {
			t.Errorf("blocks have %v m2, %d cells are steep", a, cells)
		}
		x := g.Extent()
		s, err := g.Over(box(x.MinX, x.MinY, x.MaxX-x.MinX, x.MaxY-x.MinY), limit)
		if err != nil || math.Abs(s.SteepShare*s.SlopeShare*s.AreaM2-float64(cells)*100) > 1e-3 {
			t.Errorf("share gives %v m2 of %v", s.SteepShare*s.SlopeShare*s.AreaM2, cells*100)
		}
	}
	g := grid(t, 60, 60, plane(0, 1, 0))
	blocks, err := g.Steep(g.Extent(), 10)
	if err != nil || len(blocks.Parts) != 1 || measure.AreaM2(blocks) != 58*58*100 {
		t.Errorf("an even slope gave %d blocks of %v m2", len(blocks.Parts), measure.AreaM2(blocks))
	}
	blocks, err = g.Steep(geo.Extent{MinX: 1100, MinY: -400, MaxX: 1149, MaxY: -351}, 10)
	if err != nil || measure.AreaM2(blocks) != 36*100 {
		t.Errorf("within an extent: %v m2", measure.AreaM2(blocks))
	}
	if blocks, err = g.Steep(geo.Extent{MinX: 1e6, MinY: 0, MaxX: 2e6, MaxY: 1}, 10); err != nil || !blocks.Empty() {
		t.Errorf("far away: %v %v", blocks, err)
	}
}

func BenchmarkOver(b *testing.B) {
	g := grid(b, 400, 400, func(p geo.XY) (float64, bool) { return 30 * math.Sin(p.X/90) * math.Cos(p.Y/70), true })
	site := box(1500, 0, 700, 500)
	for b.Loop() {
		if _, err := g.Over(site, 10); err != nil {
			b.Fatal(err)
		}
	}
}

func BenchmarkSteep(b *testing.B) {
	g := grid(b, 400, 400, func(p geo.XY) (float64, bool) { return 30 * math.Sin(p.X/90) * math.Cos(p.Y/70), true })
	for b.Loop() {
		if _, err := g.Steep(g.Extent(), 10); err != nil {
			b.Fatal(err)
		}
	}
}

func BenchmarkSample(b *testing.B) {
	g := grid(b, 400, 400, plane(0, 0.1, 0.2))
	for b.Loop() {
		g.Sample(geo.XY{X: 2344.5, Y: 777.7})
	}
}
