package track

import (
	"fmt"
	"math"
	"math/rand/v2"
	"reflect"
	"slices"
	"testing"

	"groundtally/geo"
	"groundtally/geo/measure"
)

func xy(x, y float64) geo.XY { return geo.XY{X: x, Y: y} }

func box(x, y, w, h float64) [][]geo.XY {
	return [][]geo.XY{{{X: x, Y: y}, {X: x + w, Y: y}, {X: x + w, Y: y + h}, {X: x, Y: y + h}, {X: x, Y: y}}}
}

func area(parts ...[][]geo.XY) geo.XYGeometry {
	return geo.XYGeometry{Kind: geo.Polygons, Parts: parts}
}

func input(towers ...geo.XY) Input {
	return Input{Towers: towers, StepM: 25, OffGround: 3, OffSite: 6}
}

// grow checks what holds of every tree.
func grow(t testing.TB, in Input) Tree {
	t.Helper()
	out, err := Grow(in)
	if err != nil {
		t.Fatal(err)
	}
	reached := map[int]bool{}
	if in.HasEntrance {
		reached[Entrance] = true
	} else if len(out.Ways) > 0 {
		reached[out.Ways[0].From] = true
	}
	sum, off := 0.0, 0.0
	for n, w := range out.Ways {
		first, last := w.Line[0], w.Line[len(w.Line)-1]
		if w.To < 0 || reached[w.To] || last != in.Towers[w.To] {
			t.Errorf("way %d to %d ends at %v", n, w.To, last)
		}
		switch {
		case w.From == Junction:
			near := math.Inf(1)
			for _, v := range out.Ways[:n] {
				_, d := measure.NearestOnOutline(first, geo.XYGeometry{Kind: geo.Lines, Parts: [][][]geo.XY{{v.Line}}})
				near = math.Min(near, d)
			}
			if near > 1e-6 {
				t.Errorf("way %d begins %v m off the tree", n, near)
			}
		case !reached[w.From]:
			t.Errorf("way %d begins at %d, which is not in the tree", n, w.From)
		case w.From == Entrance && first != in.Entrance, w.From >= 0 && first != in.Towers[w.From]:
			t.Errorf("way %d begins at %v", n, first)
		}
		reached[w.To] = true
		if l := measure.LengthM(geo.XYGeometry{Kind: geo.Lines, Parts: [][][]geo.XY{{w.Line}}}); math.Abs(l-w.LengthM) > 1e-9*(1+l) {
			t.Errorf("way %d is %v m long, says %v", n, l, w.LengthM)
		}
		sum += w.LengthM
		off += w.OffGroundM
		for i := 1; i < len(w.Line); i++ {
			for _, b := range in.Blocked {
				if m := within(w.Line[i-1], w.Line[i], b); m > 1e-3 {
					t.Errorf("way %d crosses %v m of blocked ground", n, m)
				}
			}
		}
	}
	if math.Abs(sum-out.LengthM) > 1e-9*(1+sum) || math.Abs(off-out.OffGroundM) > 1e-9*(1+off) || off > sum+1e-6 {
		t.Errorf("ways of %v m, off %v: the tree says %v, %v", sum, off, out.LengthM, out.OffGroundM)
	}
	if len(out.Ways) > 0 {
		for i := range in.Towers {
			if reached[i] == slices.Contains(out.Unreached, i) {
				t.Errorf("tower %d: reached %v, unreached %v", i, reached[i], out.Unreached)
			}
		}
	}
	return out
}

// within gives the metres of a segment inside polygons, from many samples: nothing of the package.
func within(a, b geo.XY, g geo.XYGeometry) float64 {
	const n = 500
	in := 0
	for i := range n {
		f := (float64(i) + 0.5) / n
		p := xy(a.X+f*(b.X-a.X), a.Y+f*(b.Y-a.Y))
		if _, d := measure.NearestOnOutline(p, g); d > 1e-4 && measure.Inside(p, g) {
			in++
		}
	}
	return float64(in) / n * a.Dist(b)
}

func near(t *testing.T, what string, got, want, tol float64) {
	t.Helper()
	if !(math.Abs(got-want) <= tol) {
		t.Errorf("%s is %v, want %v within %v", what, got, want, tol)
	}
}

func TestOpenGround(t *testing.T) {
	a, b := xy(12.3, 45.6), xy(812.9, 333.3)
	for _, in := range []Input{
		input(a, b),
		{Towers: []geo.XY{a, b}, StepM: 15, OffGround: 3, OffSite: 6, Site: area(box(-100, -100, 1000, 1000))},
		{Towers: []geo.XY{a, b}, StepM: 15, OffGround: 3, OffSite: 6, Preferred: area(box(-100, -100, 1000, 1000))},
		{Towers: []geo.XY{b}, Entrance: a, HasEntrance: true, StepM: 20, OffGround: 1, OffSite: 1},
	} {
		out := grow(t, in)
		near(t, "length", out.LengthM, a.Dist(b), 1e-9)
		near(t, "straight", out.StraightM, a.Dist(b), 1e-9)
		if len(out.Ways) != 1 || len(out.Ways[0].Line) != 2 {
			t.Errorf("ways %v", out.Ways)
		}
	}
	// Two corners of a triangle and one above the middle of its side: the third way branches in the middle.
	out := grow(t, input(xy(0, 0), xy(400, 0), xy(200, 390)))
	near(t, "with a branch", out.LengthM, 790, 1e-6)
	if out.Ways[1].From != Junction {
		t.Errorf("the second way begins at %d", out.Ways[1].From)
	}
}

func TestNothingToDo(t *testing.T) {
	for _, in := range []Input{input(), input(xy(1, 2)), {HasEntrance: true, StepM: 20, OffGround: 1, OffSite: 1}} {
		if out := grow(t, in); !reflect.DeepEqual(out, Tree{}) {
			t.Errorf("%+v", out)
		}
	}
	out := grow(t, input(xy(1, 2), xy(1, 2), xy(31, 42)))
	near(t, "two towers in one place", out.LengthM, 50, 1e-9)
	if len(out.Ways) != 2 {
		t.Errorf("%d ways", len(out.Ways))
	}
}

// A lake of 400 by 300 m between two towers: the shortest way bends at two of its corners.
func TestAroundLake(t *testing.T) {
	lake := area(box(300, -100, 400, 300))
	for _, step := range []float64{5, 15, 25, 40} {
		in := input(xy(100, 0), xy(950, 30))
		in.Blocked, in.StepM = []geo.XYGeometry{lake}, step
		out := grow(t, in)
		want := xy(100, 0).Dist(xy(300, -100)) + 400 + xy(700, -100).Dist(xy(950, 30))
		t.Logf("cells of %v m: %.5f of the shortest", step, out.LengthM/want)
		if out.LengthM < want-1e-3 || out.LengthM > want*1.002 {
			t.Errorf("cells of %v m: %v m around the lake, want %v", step, out.LengthM, want)
		}
	}
}

// Thin or small as it is, water is not crossed; two lakes side by side leave no passage in their seam.
func TestThinWater(t *testing.T) {
	in := input(xy(0, 0), xy(500, 0))
	in.Blocked = []geo.XYGeometry{area(box(250, -150, 1, 300))}
	out := grow(t, in)
	near(t, "around a ditch", out.LengthM, 2*math.Hypot(250, 150), 1)

	in.Blocked = []geo.XYGeometry{area(box(200, -150, 100, 150)), area(box(200, 0, 100, 120))}
	out = grow(t, in)
	near(t, "around two lakes", out.LengthM, 2*math.Hypot(200, 120)+100, 1)

	in.Blocked = []geo.XYGeometry{area(box(200, -150, 100, 150))}
	near(t, "along an edge", grow(t, in).LengthM, 500, 1e-6)

	in.Blocked = []geo.XYGeometry{area(box(200, -150, 100, 140), box(200, 10, 100, 140))}
	near(t, "through a gap of 20 m", grow(t, in).LengthM, 500, 1e-9)
}

// A belt of buildable ground in the form of a U: 900 m along it against 400 m straight.
func TestPrefersGround(t *testing.T) {
	in := input(xy(50, 450), xy(450, 450))
	in.Site = area(box(0, 0, 500, 500))
	in.Preferred = area(box(0, 100, 100, 400), box(100, 100, 300, 100), box(400, 100, 100, 400))
	long := 2*xy(50, 450).Dist(xy(100, 200)) + 300
	for _, off := range []float64{2, 2.5, 3.2, 5} {
		in.OffGround = off
		out := grow(t, in)
		straight := 100 + 300*off
		t.Logf("factor %v: cost %.1f, length %.1f, off %.1f", off, out.CostM, out.LengthM, out.OffGroundM)
		if straight < long {
			near(t, "straight across", out.LengthM, 400, 1e-9)
			near(t, "off ground", out.OffGroundM, 300, 1e-6)
			continue
		}
		if out.CostM > math.Min(long, straight)*1.01 {
			t.Errorf("factor %v: %v m, want at most %v", off, out.CostM, long)
		}
		if off > 4 {
			near(t, "off ground", out.OffGroundM, 0, 5)
			near(t, "along the belt", out.LengthM, long, 0.01*long)
		}
	}
}

// Crossing a straight border between ground of costs 1 and 3 bends the shortest way as light bends.
func TestBendsAtBorder(t *testing.T) {
	in := input(xy(0, 200), xy(400, -200))
	in.Preferred = area(box(-1000, 0, 3000, 1000))
	least := math.Inf(1)
	for x := 0.0; x <= 400; x += 0.1 {
		least = math.Min(least, math.Hypot(x, 200)+3*math.Hypot(400-x, 200))
	}
	out := grow(t, in)
	t.Logf("cost %.3f of the least", out.CostM/least)
	if out.CostM < least-0.01 || out.CostM > least*1.01 {
		t.Errorf("cost %v, the least is %v", out.CostM, least)
	}
}

func TestUnreached(t *testing.T) {
	// A ring of water around tower 1, tower 3 in the water itself.
	ring := [][]geo.XY{box(300, 300, 200, 200)[0], box(350, 350, 100, 100)[0]}
	in := input(xy(0, 0), xy(400, 400), xy(800, 700), xy(320, 320))
	in.Blocked = []geo.XYGeometry{area(ring)}
	out := grow(t, in)
	if !slices.Equal(out.Unreached, []int{1, 3}) || len(out.Ways) != 1 {
		t.Errorf("unreached %v, %d ways", out.Unreached, len(out.Ways))
	}
	// The first tower is the prisoner: the other two make the tree.
	in.Towers = []geo.XY{xy(400, 400), xy(0, 0), xy(800, 700)}
	out = grow(t, in)
	if !slices.Equal(out.Unreached, []int{0}) || len(out.Ways) != 1 {
		t.Errorf("unreached %v, %d ways", out.Unreached, len(out.Ways))
	}
	in.HasEntrance, in.Entrance = true, xy(410, 410)
	out = grow(t, in)
	if !slices.Equal(out.Unreached, []int{1, 2}) || len(out.Ways) != 1 || out.Ways[0].From != Entrance {
		t.Errorf("unreached %v, ways %v", out.Unreached, out.Ways)
	}
	in.Entrance = xy(320, 320)
	out = grow(t, in)
	if !slices.Equal(out.Unreached, []int{0, 1, 2}) || len(out.Ways) != 0 || out.StraightM != 0 {
		t.Errorf("from the water: unreached %v, ways %v", out.Unreached, out.Ways)
	}
}

// Three towers, a lake of 300 by 200 m, the ways between them by hand: 0–1 past the corner (200, 100), 0–2
// free, 1–2 past (500, 100). Joined at towers alone that is the best tree; branching may only shorten it.
func TestByHand(t *testing.T) {
	in := input(xy(100, 0), xy(350, 250), xy(600, 0))
	in.Blocked = []geo.XYGeometry{area(box(200, -100, 300, 200))}
	p := in.Towers
	way01 := p[0].Dist(xy(200, 100)) + xy(200, 100).Dist(p[1])
	way12 := p[1].Dist(xy(500, 100)) + xy(500, 100).Dist(p[2])
	way02 := math.Min(p[0].Dist(xy(200, 100))+300+xy(500, 100).Dist(p[2]), p[0].Dist(xy(200, -100))+300+xy(500, -100).Dist(p[2]))
	want := way01 + way12 + way02 - math.Max(way01, math.Max(way12, way02))
	out := grow(t, in)
	t.Logf("%.2f m, by hand %.2f", out.LengthM, want)
	if out.LengthM > want*1.002 || out.LengthM < 0.85*want {
		t.Errorf("%v m, by hand %v", out.LengthM, want)
	}
}

// The shortest way among rectangles runs over their corners: here it is found on the graph of all corners
// that see each other.
func TestVisibilityGraph(t *testing.T) {
	r := rand.New(rand.NewPCG(9, 10))
	worst := 0.0
	for n := range 40 {
		in := input(xy(0, 250+500*r.Float64()), xy(1000, 250+500*r.Float64()))
		at := slices.Clone(in.Towers)
		var boxes []geo.Extent
		for x := range 4 {
			for y := range 4 {
				e := geo.Extent{MinX: 40 + 240*float64(x) + 40*r.Float64(), MinY: 10 + 240*float64(y) + 60*r.Float64()}
				e.MaxX, e.MaxY = e.MinX+60+90*r.Float64(), e.MinY+80+80*r.Float64()
				boxes = append(boxes, e)
				in.Blocked = append(in.Blocked, area(box(e.MinX, e.MinY, e.MaxX-e.MinX, e.MaxY-e.MinY)))
				at = append(at, xy(e.MinX, e.MinY), xy(e.MaxX, e.MinY), xy(e.MaxX, e.MaxY), xy(e.MinX, e.MaxY))
			}
		}
		far := make([]float64, len(at))
		for i := range far {
			far[i] = math.Inf(1)
		}
		far[0] = 0
		for changed := true; changed; { // Bellman, Ford
			changed = false
			for i, p := range at {
				for k, q := range at {
					if d := far[i] + p.Dist(q); d < far[k]-1e-9 && sees(p, q, boxes) {
						far[k], changed = d, true
					}
				}
			}
		}
		out := grow(t, in)
		worst = math.Max(worst, out.LengthM/far[1]-1)
		if out.LengthM < far[1]-1e-3 || out.LengthM > far[1]*1.02 {
			t.Errorf("case %d: %v m, the shortest way has %v", n, out.LengthM, far[1])
		}
	}
	t.Logf("up to %.3f %% longer than the shortest", 100*worst)
}

// sees reports whether the segment misses the inside of all boxes (clipping of Liang, Barsky 1984).
func sees(a, b geo.XY, boxes []geo.Extent) bool {
	for _, e := range boxes {
		t0, t1 := 0.0, 1.0
		for _, s := range [][3]float64{{a.X, b.X - a.X, 0}, {a.Y, b.Y - a.Y, 1}} {
			lo, hi := e.MinX+1e-6, e.MaxX-1e-6
			if s[2] == 1 {
				lo, hi = e.MinY+1e-6, e.MaxY-1e-6
			}
			if s[1] == 0 {
				if s[0] < lo || s[0] > hi {
					t1 = -1
				}
				continue
			}
			u, v := (lo-s[0])/s[1], (hi-s[0])/s[1]
			t0, t1 = math.Max(t0, math.Min(u, v)), math.Min(t1, math.Max(u, v))
		}
		if t0 < t1 {
			return false
		}
	}
	return true
}

// random gives a plant of n towers on a site with buildable parts and lakes that stand apart.
func random(r *rand.Rand, n int) Input {
	in := input()
	in.StepM = 10 + 20*r.Float64()
	in.OffGround, in.OffSite = 1+3*r.Float64(), 1+9*r.Float64()
	in.Site = area(box(0, 0, 1000, 900))
	for x := range 4 {
		for y := range 4 {
			cx, cy := 30+250*float64(x), 20+225*float64(y)
			w, h := 40+120*r.Float64(), 40+120*r.Float64()
			switch r.IntN(3) {
			case 0:
				in.Blocked = append(in.Blocked, area(box(cx, cy, w, h)))
			case 1:
				in.Preferred.Kind = geo.Polygons
				in.Preferred.Parts = append(in.Preferred.Parts, box(cx, cy, w+60, h+50))
			}
		}
	}
	for len(in.Towers) < n {
		p := xy(1000*r.Float64(), 900*r.Float64())
		free := true
		for _, b := range in.Blocked {
			d, _ := measure.PointToM(p, b)
			free = free && d > 1
		}
		if free {
			in.Towers = append(in.Towers, p)
		}
	}
	in.HasEntrance, in.Entrance = r.IntN(2) == 0, xy(-150, 1000*r.Float64())
	return in
}

func TestRandomPlants(t *testing.T) {
	r := rand.New(rand.NewPCG(1, 2))
	worst, slant := 0.0, 0.0
	for n := range 40 {
		in := random(r, 2+n%14)
		out := grow(t, in)
		if len(out.Unreached) > 0 {
			t.Errorf("plant %d: unreached %v", n, out.Unreached)
		}

		// A star has a way of its own from the start to every tower.
		star := 0.0
		for i, p := range in.Towers {
			if one := in; in.HasEntrance || i > 0 {
				one.Towers = []geo.XY{in.Towers[0], p}
				if in.HasEntrance {
					one.Towers = []geo.XY{p}
				}
				star += grow(t, one).CostM
			}
		}
		if out.CostM > star*1.001 {
			t.Errorf("plant %d: cost %v, the star %v", n, out.CostM, star)
		}

		at := in.Towers
		if in.HasEntrance {
			at = append(slices.Clone(at), in.Entrance)
		}
		plain := newSearch(newGround(in, at), at, out.start(in), false)
		plain.run()
		if out.CostM > plain.costM()*(1+1e-9) {
			t.Errorf("plant %d: cost %v, with ways between towers %v", n, out.CostM, plain.costM())
		}

		// Open ground: never longer than the straight tree.
		open := in
		open.Blocked, open.Preferred, open.Site = nil, geo.XYGeometry{}, geo.XYGeometry{}
		if o := grow(t, open); o.LengthM > o.StraightM*(1+1e-12) {
			t.Errorf("plant %d: %v m on open ground, straight %v", n, o.LengthM, o.StraightM)
		}

		if again := grow(t, in); !reflect.DeepEqual(again, out) {
			t.Errorf("plant %d: a second run differs", n)
		}

		mixed := in
		mixed.Preferred.Parts = slices.Clone(in.Preferred.Parts)
		slices.Reverse(mixed.Preferred.Parts)
		mixed.Blocked = slices.Clone(in.Blocked)
		slices.Reverse(mixed.Blocked)
		if o := grow(t, mixed); !reflect.DeepEqual(o, out) {
			t.Errorf("plant %d: the order of parts matters", n)
		}

		for _, f := range []func(geo.XY) geo.XY{
			func(p geo.XY) geo.XY { return xy(p.X+431.7, p.Y-98.3) },
			func(p geo.XY) geo.XY { return xy(p.X+512345.678, p.Y+5412345.678) },
			func(p geo.XY) geo.XY { return xy(-p.Y, p.X) },
			func(p geo.XY) geo.XY { return xy(-p.X, -p.Y) },
		} {
			o := grow(t, moved(in, f))
			d := math.Abs(o.CostM/out.CostM - 1)
			worst = math.Max(worst, d)
			if d > 0.02 {
				t.Errorf("plant %d: moved it costs %v, else %v", n, o.CostM, out.CostM)
			}
		}
		sin, cos := math.Sincos(0.576)
		o := grow(t, moved(in, func(p geo.XY) geo.XY { return xy(p.X*cos-p.Y*sin, p.X*sin+p.Y*cos) }))
		slant += math.Abs(o.CostM/out.CostM-1) / 40
		if d := math.Abs(o.CostM/out.CostM - 1); d > 0.2 {
			t.Errorf("plant %d: turned by 33 degrees it costs %v, else %v", n, o.CostM, out.CostM)
		}
	}
	t.Logf("moving changes the cost by up to %.3f %%, turning by 33 degrees by %.3f %% in the mean", 100*worst, 100*slant)
	// Other cells may tip the choice between two ways of nearly equal cost, and all that branches from it.
	if slant > 0.01 {
		t.Errorf("turning changes the cost by %v in the mean", slant)
	}
}

func (t Tree) start(in Input) int {
	if in.HasEntrance {
		return len(in.Towers)
	}
	return t.Ways[0].From
}

func moved(in Input, f func(geo.XY) geo.XY) Input {
	out := in
	out.Towers = nil
	for _, p := range in.Towers {
		out.Towers = append(out.Towers, f(p))
	}
	out.Entrance = f(in.Entrance)
	out.Preferred, out.Site = geo.Map(in.Preferred, f), geo.Map(in.Site, f)
	out.Blocked = nil
	for _, b := range in.Blocked {
		out.Blocked = append(out.Blocked, geo.Map(b, f))
	}
	return out
}

// Costs of segments held against many samples of the polygons.
func TestAlong(t *testing.T) {
	r := rand.New(rand.NewPCG(3, 4))
	for range 40 {
		in := random(r, 2)
		in.Preferred.Kind = geo.Polygons
		in.Preferred.Parts = append(in.Preferred.Parts, box(400*r.Float64(), 300*r.Float64(), 300, 200)) // overlaps others
		g := newGround(in, []geo.XY{xy(0, 0), xy(1000, 900)})
		for range 20 {
			a, b := xy(1000*r.Float64(), 900*r.Float64()), xy(1000*r.Float64(), 900*r.Float64())
			const n = 4000
			want, wantOff, wet := 0.0, 0.0, 0
			for i := range n {
				f := (float64(i) + 0.5) / n
				p := xy(a.X+f*(b.X-a.X), a.Y+f*(b.Y-a.Y))
				c := in.OffSite
				switch {
				case measure.Inside(p, in.Preferred):
					c = 1
				case measure.Inside(p, in.Site):
					c = in.OffGround
				}
				for _, w := range in.Blocked {
					if measure.Inside(p, w) {
						wet++
					}
				}
				want += c * a.Dist(b) / n
				if c != 1 {
					wantOff += a.Dist(b) / n
				}
			}
			got, off := g.along(a, b, math.Inf(1))
			if wet > 0 {
				if !math.IsInf(got, 1) {
					t.Errorf("%v to %v crosses water and costs %v", a, b, got)
				}
				continue
			}
			// Each of a handful of borders may be a sample off.
			near(t, "cost", got, want, 100*a.Dist(b)/n)
			near(t, "off ground", off, wantOff, 10*a.Dist(b)/n)
			back, _ := g.along(b, a, math.Inf(1))
			near(t, "cost of the way back", back, got, 1e-6)
		}
	}
}

func TestLargeAreaGrowsCells(t *testing.T) {
	in := input(xy(0, 0), xy(60000, 40000))
	in.Blocked = []geo.XYGeometry{area(box(20000, 0, 10000, 39000))}
	out := grow(t, in)
	want := 30000 + xy(30000, 0).Dist(xy(60000, 40000))
	t.Logf("cells of %.1f m, %.5f of the shortest", out.StepM, out.LengthM/want)
	if out.StepM <= 25 || out.LengthM < want-1 || out.LengthM > want*1.005 {
		t.Errorf("cells of %v m, %v m long, want %v", out.StepM, out.LengthM, want)
	}
}

func TestRefuses(t *testing.T) {
	good := input(xy(0, 0), xy(100, 0))
	bad := []func(*Input){
		func(in *Input) { in.Towers = []geo.XY{xy(0, 0), xy(math.NaN(), 0)} },
		func(in *Input) { in.Towers = []geo.XY{xy(0, 0), xy(0, math.Inf(1))} },
		func(in *Input) { in.Towers = []geo.XY{xy(0, 0), xy(0, 1e200)} },
		func(in *Input) { in.HasEntrance, in.Entrance = true, xy(math.NaN(), 0) },
		func(in *Input) { in.Preferred = area(box(0, 0, math.NaN(), 1)) },
		func(in *Input) { in.Site = area(box(0, 0, math.Inf(1), 1)) },
		func(in *Input) { in.Site = geo.XYGeometry{Kind: geo.Lines, Parts: [][][]geo.XY{box(0, 0, 1, 1)}} },
		func(in *Input) { in.Blocked = []geo.XYGeometry{{}, area(box(0, math.NaN(), 1, 1))} },
		func(in *Input) { in.StepM = 0 },
		func(in *Input) { in.StepM = math.NaN() },
		func(in *Input) { in.StepM = math.Inf(1) },
		func(in *Input) { in.OffGround = 0.5 },
		func(in *Input) { in.OffSite = math.Inf(1) },
		func(in *Input) { in.OffSite = math.NaN() },
	}
	for i, f := range bad {
		in := good
		f(&in)
		if out, err := Grow(in); err == nil {
			t.Errorf("case %d is taken: %+v", i, out)
		}
	}
}

// plant is a parcel of 1 km² with 25 towers: half of it buildable in ragged parts, a lake, buildings.
func plant() Input {
	r := rand.New(rand.NewPCG(5, 6))
	in := input()
	in.Site = area(box(0, 0, 1000, 1000))
	for k := range 9 {
		cx, cy := 170+330*float64(k%3), 170+330*float64(k/3)
		var ring []geo.XY
		for i := range 40 {
			sin, cos := math.Sincos(2 * math.Pi * float64(i) / 40)
			d := 110 + 60*r.Float64()
			ring = append(ring, xy(cx+d*cos, cy+d*sin))
		}
		in.Preferred.Kind = geo.Polygons
		in.Preferred.Parts = append(in.Preferred.Parts, [][]geo.XY{measure.Close(ring)})
	}
	in.Blocked = []geo.XYGeometry{area(box(300, 450, 80, 300)), area(box(640, 300, 30, 20), box(690, 310, 20, 20))}
	for y := range 5 {
		for x := range 5 {
			in.Towers = append(in.Towers, xy(60+215*float64(x)+20*r.Float64(), 60+210*float64(y)+20*r.Float64()))
		}
	}
	in.HasEntrance, in.Entrance = true, xy(-300, 420)
	return in
}

func TestPlant(t *testing.T) {
	out := grow(t, plant())
	t.Logf("%.0f m, straight %.0f, off %.0f, cost %.0f", out.LengthM, out.StraightM, out.OffGroundM, out.CostM)
	if len(out.Unreached) > 0 || len(out.Ways) != 25 {
		t.Errorf("%d ways, unreached %v", len(out.Ways), out.Unreached)
	}
}

func BenchmarkGrow(b *testing.B) {
	run := func(name string, in Input) {
		b.Run(name, func(b *testing.B) {
			b.ReportAllocs()
			for b.Loop() {
				if _, err := Grow(in); err != nil {
					b.Fatal(err)
				}
			}
		})
	}
	in := plant()
	run("parcel of 1 km², 25 towers", in)
	for _, step := range []float64{15, 5} {
		fine := in
		fine.StepM = step
		run(fmt.Sprintf("cells of %v m", step), fine)
	}
	open := in
	open.Blocked, open.Preferred = nil, geo.XYGeometry{}
	run("open ground", open)
	far := in
	far.Entrance = xy(-12000, 3000)
	run("entrance 12 km off", far)
}
