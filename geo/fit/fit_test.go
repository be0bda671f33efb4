package fit

import (
	"fmt"
	"math"
	"math/rand/v2"
	"reflect"
	"testing"

	"groundtally/geo"
	"groundtally/geo/measure"
)

func box(x, y, w, h float64) [][]geo.XY {
	return [][]geo.XY{{{X: x, Y: y}, {X: x + w, Y: y}, {X: x + w, Y: y + h}, {X: x, Y: y + h}, {X: x, Y: y}}}
}

func area(parts ...[][]geo.XY) geo.XYGeometry {
	return geo.XYGeometry{Kind: geo.Polygons, Parts: parts}
}

func star(r *rand.Rand, radius float64, n int) [][]geo.XY {
	var ring []geo.XY
	for i := range n {
		s, c := math.Sincos(2 * math.Pi * (float64(i) + 0.8*r.Float64()) / float64(n))
		d := radius * (0.3 + 0.7*r.Float64())
		ring = append(ring, geo.XY{X: d * c, Y: d * s})
	}
	return [][]geo.XY{measure.Close(ring)}
}

func machines(t testing.TB, in Input) Result {
	t.Helper()
	out, err := Machines(in)
	if err != nil {
		t.Fatal(err)
	}
	least := math.Inf(1)
	for i, p := range out.At {
		if d, _ := measure.PointToM(p, in.Buildable); d > 2e-6 {
			t.Errorf("a machine stands %v m outside", d)
		}
		for _, q := range out.At[:i] {
			least = math.Min(least, in.Spacing.Metric(p, q))
		}
	}
	if least < 1-1e-6 {
		t.Errorf("two machines have the metric %v", least)
	}
	if len(out.At) > 1 && math.Abs(least-out.MinMetric) > 1e-6 {
		t.Errorf("the least metric is %v, stated is %v", least, out.MinMetric)
	}
	if in.Max > 0 && len(out.At) > in.Max {
		t.Errorf("%d machines, wanted at most %d", len(out.At), in.Max)
	}
	return out
}

// Pairs at 5 by 3 diameters of 100 m, computed by hand from (Δp/500)² + (Δc/300)².
func TestMetric(t *testing.T) {
	s := Spacing{AlongM: 500, AcrossM: 300, AzimuthDeg: 90}
	for _, c := range []struct {
		d    geo.XY
		want float64
	}{{geo.XY{X: 200, Y: 280}, 1.0311}, {geo.XY{X: 300, Y: 260}, 1.1111}, {geo.XY{Y: 299}, 0.9933}, {geo.XY{X: -500}, 1}, {geo.XY{Y: -300}, 1}} {
		if got := s.Metric(geo.XY{X: 7, Y: 9}, geo.XY{X: 7 + c.d.X, Y: 9 + c.d.Y}); math.Abs(got-c.want) > 1e-4 {
			t.Errorf("metric of %v is %v, want %v", c.d, got, c.want)
		}
	}
	north := Spacing{AlongM: 500, AcrossM: 300}
	if got := north.Metric(geo.XY{}, geo.XY{Y: 500}); math.Abs(got-1) > 1e-12 {
		t.Errorf("along north: %v", got)
	}
	slant := Spacing{AlongM: 500, AcrossM: 300, AzimuthDeg: 45}
	if got := slant.Metric(geo.XY{}, geo.XY{X: 300 / math.Sqrt2, Y: -300 / math.Sqrt2}); math.Abs(got-1) > 1e-12 {
		t.Errorf("across south-east: %v", got)
	}
}

// 2,000 by 1,170 m with machines of 130 m at 5 by 3 diameters: columns at 0, 650, 1300, 1950 m, rows at 0,
// 390, 780, 1170 m, the edge included: 16 on the square lattice.
func TestSquareLatticeByHand(t *testing.T) {
	in := Input{Buildable: area(box(1000, -300, 2000, 1170)), Spacing: Spacing{AlongM: 650, AcrossM: 390, AzimuthDeg: 90}}
	j := newJob(in, 1)
	c := newCluster(j, j.parts, nil)
	if n := len(lattice{}.nodes(c)); n != 16 {
		t.Errorf("the square lattice has %d machines, want 16", n)
	}
	if out := machines(t, in); len(out.At) < 16 {
		t.Errorf("%d machines, want 16 or more", len(out.At))
	}
	// A centimetre less loses a row.
	in.Buildable = area(box(1000, -300, 2000, 1169.99))
	j = newJob(in, 1)
	if n := len(lattice{}.nodes(newCluster(j, j.parts, nil))); n != 12 {
		t.Errorf("the square lattice has %d machines, want 12", n)
	}
}

// In a large area the hexagonal lattice needs √3/2 of a·b for a machine.
func TestDensityOfLargeArea(t *testing.T) {
	s := Spacing{AlongM: 50, AcrossM: 30, AzimuthDeg: 30}
	out := machines(t, Input{Buildable: area(box(0, 0, 1500, 1500)), Spacing: s})
	per := 1500.0 * 1500 / float64(len(out.At)) / (s.AlongM * s.AcrossM)
	if per > math.Sqrt(3)/2 || per < 0.75 || out.How != ByHexagonalLattice {
		t.Errorf("%d machines by %s, %.3f a·b each", len(out.At), out.How, per)
	}
}

// Small parcels against counts that can be seen by eye.
func TestSmallParcels(t *testing.T) {
	s := Spacing{AlongM: 500, AcrossM: 300, AzimuthDeg: 90}
	narrow := [][]geo.XY{{{X: 0}, {X: 3}, {X: 4, Y: 400}, {X: 1, Y: 400}, {X: 0}}}
	for name, c := range map[string]struct {
		g    geo.XYGeometry
		want int
	}{
		"tiny":             {area(box(12345, 777, 0.5, 0.5)), 1},
		"two tiny, near":   {area(box(0, 0, 1, 1), box(50, 50, 1, 1)), 1},
		"two tiny, far":    {area(box(0, 0, 1, 1), box(600, 50, 1, 1)), 2},
		"exactly across":   {area(box(0, 0, 10, 300)), 2},
		"not quite":        {area(box(0, 0, 10, 299.9)), 1},
		"exactly along":    {area(box(0, 0, 500, 10)), 2},
		"a slanted strip":  {area(narrow), 2},
		"four corners":     {area(box(0, 0, 500, 300)), 4},
		"big with islands": {area(box(0, 0, 500, 300), box(1100, 0, 2, 2), box(0, 700, 2, 2), box(520, 20, 1, 1)), 6},
		"an ell":           {area([][]geo.XY{{{}, {X: 1010}, {X: 1010, Y: 10}, {X: 10, Y: 10}, {X: 10, Y: 610}, {Y: 610}, {}}}), 5},
	} {
		if got := machines(t, Input{Buildable: c.g, Spacing: s}); len(got.At) != c.want {
			t.Errorf("%s: %d machines by %s at %v, want %d", name, len(got.At), got.How, got.At, c.want)
		}
	}
	out := machines(t, Input{Spacing: s, Buildable: geo.XYGeometry{Kind: geo.Polygons}})
	if len(out.At) != 0 || out.How != "" {
		t.Errorf("nothing holds %+v", out)
	}
}

func TestHoleStaysFree(t *testing.T) {
	g := area([][]geo.XY{box(0, 0, 1000, 1000)[0], box(100, 100, 800, 800)[0]})
	out := machines(t, Input{Buildable: g, Spacing: Spacing{AlongM: 200, AcrossM: 200}})
	if len(out.At) < 16 {
		t.Errorf("%d machines on a ring road that holds 20 at its edge", len(out.At))
	}
}

// wind is a plain judge: every machine counts 100, less what neighbours up- and downwind cost; machines in
// the east count a little more.
type wind struct{ calls int }

func (w *wind) Total(at []geo.XY) float64 {
	w.calls++
	sum := 0.0
	for i, p := range at {
		sum += 100 + p.X*1e-3
		for _, q := range at[:i] {
			sum -= 1e6 / (1e4 + p.Sub(q).X*p.Sub(q).X + 25*p.Sub(q).Y*p.Sub(q).Y)
		}
	}
	return sum
}

func (w *wind) Add(at []geo.XY, p geo.XY) float64 {
	return w.Total(append(append([]geo.XY(nil), at...), p)) - w.Total(at)
}

func (w *wind) Move(at []geo.XY, i int, p geo.XY) float64 {
	b := append([]geo.XY(nil), at...)
	b[i] = p
	return w.Total(b) - w.Total(at)
}

func TestGainBreaksTies(t *testing.T) {
	r := rand.New(rand.NewPCG(3, 3))
	for range 6 {
		in := Input{Buildable: area(star(r, 1200, 14)), Spacing: Spacing{AlongM: 500, AcrossM: 300, AzimuthDeg: 90}}
		plain := machines(t, in)
		w := &wind{}
		in.Gain = w
		judged := machines(t, in)
		if len(judged.At) < len(plain.At) {
			t.Errorf("the judge lost machines: %d of %d", len(judged.At), len(plain.At))
		}
		if len(judged.At) == len(plain.At) && judged.Total < w.Total(plain.At) {
			t.Errorf("judged %v, unjudged %v", judged.Total, w.Total(plain.At))
		}
		if judged.Judged == 0 || math.Abs(judged.Total-w.Total(judged.At)) > 1e-9 {
			t.Errorf("got %+v", judged)
		}
	}
	// A single machine goes where the judge wants it: to the east edge.
	in := Input{Buildable: area(box(0, 0, 200, 100)), Spacing: Spacing{AlongM: 500, AcrossM: 300}, Gain: &wind{}}
	if out := machines(t, in); len(out.At) != 1 || out.At[0].X < 199 {
		t.Errorf("got %v", out.At)
	}
}

type broken struct{ wind }

func (*broken) Total([]geo.XY) float64 { return math.NaN() }

func TestGainNotANumber(t *testing.T) {
	if out, err := Machines(Input{Buildable: area(box(0, 0, 900, 900)), Spacing: Spacing{AlongM: 500, AcrossM: 300}, Gain: &broken{}}); err == nil {
		t.Errorf("got %v", out)
	}
}

func TestMaxSpreads(t *testing.T) {
	in := Input{Buildable: area(box(0, 0, 4000, 3000)), Spacing: Spacing{AlongM: 500, AcrossM: 300, AzimuthDeg: 70}}
	all := machines(t, in)
	for _, n := range []int{1, 2, 3, 7, 20, len(all.At), len(all.At) + 5} {
		in.Max = n
		for _, in.Gain = range []Gain{nil, &wind{}} {
			out := machines(t, in)
			if len(out.At) != min(n, len(all.At)) {
				t.Errorf("max %d gave %d machines", n, len(out.At))
			}
			if n > 1 && n <= 20 && in.Gain == nil && out.MinMetric < 1.5 {
				t.Errorf("%d of %d machines stand no further apart than they must: %v", n, len(all.At), out.MinMetric)
			}
			if n > 20 && in.Gain != nil {
				break
			}
		}
	}
}

// Properties: the same input gives the same output; moving everything or turning the
// wind about changes the count by rounding alone, one machine at most.
func TestProperties(t *testing.T) {
	r := rand.New(rand.NewPCG(5, 5))
	for range 25 {
		g := area(star(r, 900, 5+r.IntN(20)))
		s := Spacing{AlongM: 300 + 300*r.Float64(), AcrossM: 200 + 100*r.Float64(), AzimuthDeg: 360 * r.Float64()}
		out := machines(t, Input{Buildable: g, Spacing: s})
		if again := machines(t, Input{Buildable: g, Spacing: s}); !reflect.DeepEqual(out, again) {
			t.Error("two runs differ")
		}
		if len(out.At) == 0 {
			t.Error("an area holds no machine")
		}
		moved := geo.Map(g, func(p geo.XY) geo.XY { return geo.XY{X: p.X + 4096, Y: p.Y - 8192} })
		if m := machines(t, Input{Buildable: moved, Spacing: s}); abs(len(m.At)-len(out.At)) > 1 {
			t.Errorf("%d machines became %d by moving", len(out.At), len(m.At))
		}
		back := s
		back.AzimuthDeg += 180
		if m := machines(t, Input{Buildable: g, Spacing: back}); abs(len(m.At)-len(out.At)) > 1 {
			t.Errorf("%d machines became %d with the wind reversed", len(out.At), len(m.At))
		}
	}
}

func abs(n int) int { return max(n, -n) }

// Against the exact answer for few machines: the most points of a fine grid that keep the distance.
func TestAgainstExhaustiveSearch(t *testing.T) {
	r := rand.New(rand.NewPCG(9, 9))
	for range 30 {
		g := area(star(r, 320, 5+r.IntN(8)))
		in := Input{Buildable: g, Spacing: Spacing{AlongM: 300, AcrossM: 200, AzimuthDeg: 90}}
		got := len(machines(t, in).At)
		// Its own points, its own search.
		var ps []geo.XY
		for x := -320.0; x <= 320; x += 40 {
			for y := -320.0; y <= 320; y += 27 {
				if p := (geo.XY{X: x, Y: y}); measure.Inside(p, g) {
					ps = append(ps, p)
				}
			}
		}
		if best := largest(in.Spacing, ps, nil, 0); got < best {
			t.Errorf("%d machines, a plain search finds %d", got, best)
		}
	}
}

func largest(s Spacing, open, chosen []geo.XY, best int) int {
	best = max(best, len(chosen))
	if len(chosen) == 4 { // deep enough for these areas
		return best
	}
	for i, p := range open {
		var rest []geo.XY
		for _, q := range open[i+1:] {
			if s.Metric(p, q) >= 1 {
				rest = append(rest, q)
			}
		}
		if len(chosen)+1+len(rest) > best {
			best = largest(s, rest, append(chosen, p), best)
		}
		if best == 4 {
			return best
		}
	}
	return best
}

func TestEllipse(t *testing.T) {
	s := Spacing{AlongM: 500, AcrossM: 300, AzimuthDeg: 90}
	for _, scale := range []float64{1, 0.5} {
		g, err := s.Ellipse(geo.XY{X: 1000, Y: -200}, scale)
		if err != nil {
			t.Fatal(err)
		}
		want := math.Pi * 500 * 300 * scale * scale
		if a := measure.AreaM2(g); math.Abs(a-want) > 1e-9*want {
			t.Errorf("area %v, want %v", a, want)
		}
		if len(g.Parts[0][0]) != 65 || !measure.CounterClockwise(g.Parts[0][0]) || g.Parts[0][0][0] != g.Parts[0][0][64] {
			t.Error("wrong ring")
		}
		x := geo.ExtentOf(g)
		if w, h := x.MaxX-x.MinX, x.MaxY-x.MinY; math.Abs(w-1000*scale*1.0008) > 0.1 || math.Abs(h-600*scale*1.0008) > 0.1 {
			t.Errorf("%v by %v m", w, h)
		}
	}
	for _, scale := range []float64{0, -1, math.NaN(), math.Inf(1)} {
		if _, err := s.Ellipse(geo.XY{}, scale); err == nil {
			t.Errorf("scale %v was accepted", scale)
		}
	}
}

func TestRefuses(t *testing.T) {
	ok := Input{Buildable: area(box(0, 0, 100, 100)), Spacing: Spacing{AlongM: 500, AcrossM: 300}}
	for name, change := range map[string]func(*Input){
		"no spacing":  func(in *Input) { in.Spacing.AlongM = 0 },
		"NaN spacing": func(in *Input) { in.Spacing.AcrossM = math.NaN() },
		"azimuth":     func(in *Input) { in.Spacing.AzimuthDeg = math.Inf(1) },
		"max":         func(in *Input) { in.Max = -1 },
		"lines":       func(in *Input) { in.Buildable.Kind = geo.Lines },
		"NaN":         func(in *Input) { in.Buildable = area(box(0, 0, math.NaN(), 1)) },
		"too many": func(in *Input) {
			in.Buildable = area(box(0, 0, 1e5, 1e5))
			in.Spacing = Spacing{AlongM: 10, AcrossM: 10}
		},
	} {
		in := ok
		change(&in)
		if out, err := Machines(in); err == nil {
			t.Errorf("%s was accepted: %v", name, out)
		}
	}
}

func BenchmarkMachines(b *testing.B) {
	for _, radius := range []float64{300, 1000, 3000} {
		in := Input{Buildable: area(star(rand.New(rand.NewPCG(1, 1)), radius, 200)), Spacing: Spacing{AlongM: 650, AcrossM: 390, AzimuthDeg: 60}}
		out, err := Machines(in)
		if err != nil {
			b.Fatal(err)
		}
		b.Run(fmt.Sprintf("%d_machines", len(out.At)), func(b *testing.B) {
			for b.Loop() {
				if _, err := Machines(in); err != nil {
					b.Fatal(err)
				}
			}
		})
	}
}
