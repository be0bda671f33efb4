package overlay

import (
	"math"
	"math/rand/v2"
	"reflect"
	"testing"

	"groundtally/geo"
)

// counted counts a site with the polygons of so many rules.
func counted(site geo.XYGeometry, rules ...[]geo.XYGeometry) tallied {
	var t tally
	t.begin(geo.ExtentOf(site), len(rules))
	t.add(siteEdge, site.Parts, false)
	for i, gs := range rules {
		for _, g := range gs {
			t.add(int32(i), g.Parts, false)
		}
	}
	return t.count()
}

func within1e9(a, b, of float64) bool { return math.Abs(a-b) <= 1e-9*math.Max(1, of) }

// Rectangles on a lattice meet in every way that two outlines can: edges upon edges, corners on edges, corners
// on corners. What they cover is counted here cell by cell, in whole numbers.
func TestTallyOnALattice(t *testing.T) {
	const n = 12
	r := rand.New(rand.NewPCG(701, 702))
	for k := range 400 {
		rules := make([][]geo.XYGeometry, 1+r.IntN(5))
		var cells [n][n]uint
		for i := range rules {
			for range r.IntN(5) {
				x, y := r.IntN(n), r.IntN(n)
				w, h := 1+r.IntN(n-x), 1+r.IntN(n-y)
				rules[i] = append(rules[i], box(float64(x), float64(y), float64(w), float64(h)))
				for a := x; a < x+w; a++ {
					for b := y; b < y+h; b++ {
						cells[a][b] |= 1 << i
					}
				}
			}
		}
		// The site leaves out a corner and has a hole, which meets its border in a corner now and then.
		site := geo.XYGeometry{Kind: geo.Polygons, Parts: [][][]geo.XY{{
			{{X: 1, Y: 1}, {X: 11, Y: 1}, {X: 11, Y: 6}, {X: 6, Y: 6}, {X: 6, Y: 11}, {X: 1, Y: 11}, {X: 1, Y: 1}},
			{{X: 3, Y: 3}, {X: 3, Y: 5}, {X: 5, Y: 5}, {X: 5, Y: 3}, {X: 3, Y: 3}},
		}}}
		want := tallied{total: make([]float64, len(rules)), alone: make([]float64, len(rules))}
		for a := 1; a < 11; a++ {
			for b := 1; b < 11; b++ {
				if a >= 6 && b >= 6 || a >= 3 && a < 5 && b >= 3 && b < 5 {
					continue
				}
				want.gross++
				one := -1
				for i := range rules {
					if cells[a][b]&(1<<i) != 0 {
						want.total[i]++
						one = i
					}
				}
				switch c := cells[a][b]; {
				case c == 0:
					want.left++
				case c&(c-1) == 0:
					want.alone[one]++
				default:
					want.shared++
				}
			}
		}
		if got := counted(site, rules...); !reflect.DeepEqual(got, want) {
			t.Fatalf("case %d: %+v, want %+v", k, got, want)
		}
	}
}

// The library makes polygons to find the same areas. Stars cross themselves before they are repaired; the
// last cases have so many edges that they are counted in halves of halves.
func TestTallyAgainstLibrary(t *testing.T) {
	r := rand.New(rand.NewPCG(703, 704))
	e := New()
	most := 0
	for k := range 48 {
		at := geo.XY{X: 5e5, Y: 5.4e6}
		if k%2 == 0 {
			at = geo.XY{}
		}
		near := func() geo.XY { return geo.XY{X: at.X + 800*r.Float64() - 400, Y: at.Y + 800*r.Float64() - 400} }
		site := must[geo.XYGeometry](t)(first(e.Repair(star(r, at, 300, 40, k%3 == 0))))
		rules := make([][]geo.XYGeometry, 1+k%4)
		unions := make([]geo.XYGeometry, len(rules))
		edges := 0
		for i := range rules {
			for range 1 + k*k/80 + r.IntN(4) {
				g := must[geo.XYGeometry](t)(first(e.Repair(star(r, near(), 40+160*r.Float64(), 20, true))))
				if r.IntN(2) == 0 {
					g = must[geo.XYGeometry](t)(e.Buffer(points(near(), near()), 60))
				}
				rules[i] = append(rules[i], g)
				edges += g.Count()
			}
			if r.IntN(4) == 0 { // the same again: every edge upon another
				rules[i] = append(rules[i], rules[i][0])
			}
			if i > 0 && r.IntN(4) == 0 {
				rules[i] = append(rules[i], rules[0][0])
			}
			unions[i] = must[geo.XYGeometry](t)(e.Union(rules[i]...))
		}
		most = max(most, edges)
		got := counted(site, rules...)
		area := func(g geo.XYGeometry) float64 { return must[float64](t)(e.AreaM2(g)) }
		gross := area(site)
		lifted := func(but int) float64 {
			g := site
			for i, u := range unions {
				if i != but {
					g = must[geo.XYGeometry](t)(e.Difference(g, u))
				}
			}
			return area(g)
		}
		left := lifted(-1)
		ok := within1e9(got.gross, gross, gross) && within1e9(got.left, left, gross)
		taken := got.shared
		for i, u := range unions {
			ok = ok && within1e9(got.total[i], area(must[geo.XYGeometry](t)(e.Intersection(site, u))), gross) &&
				within1e9(got.alone[i], lifted(i)-left, gross)
			taken += got.alone[i]
		}
		if !ok || !within1e9(taken, gross-left, gross) {
			t.Fatalf("case %d: %+v, the library says gross %v, left %v", k, got, gross, left)
		}
	}
	if most < 2*mostEdges {
		t.Errorf("at most %d edges: nothing was counted in halves of halves", most)
	}
}

func first[A, B any](a A, _ B, err error) (A, error) { return a, err }

// Bit for bit, nothing depends on the order in which regions come, nor on the corner that a ring begins at or
// the way that it runs.
func TestTallyKnowsNoOrder(t *testing.T) {
	r := rand.New(rand.NewPCG(705, 706))
	e := New()
	for k := range 60 {
		site := star(r, geo.XY{}, 300, 40, false)
		var gs []geo.XYGeometry
		for range 12 {
			gs = append(gs, must[geo.XYGeometry](t)(e.Buffer(points(geo.XY{X: 600*r.Float64() - 300, Y: 600*r.Float64() - 300}), 50+80*r.Float64())))
		}
		gs = append(gs, box(-100, -100, 50, 50), box(-50, -100, 50, 50), box(-100, -100, 50, 50))
		want := counted(site, gs[:8], gs[8:])
		other := make([]geo.XYGeometry, len(gs))
		for i, g := range gs {
			ring := append([]geo.XY(nil), g.Parts[0][0]...)
			if i%2 == 0 {
				for a, b := 0, len(ring)-1; a < b; a, b = a+1, b-1 {
					ring[a], ring[b] = ring[b], ring[a]
				}
			}
			n := 1 + r.IntN(len(ring)-1)
			ring = append(append([]geo.XY(nil), ring[n:]...), ring[1:n+1]...)
			other[i] = geo.XYGeometry{Kind: geo.Polygons, Parts: [][][]geo.XY{{ring}}}
		}
		a, b := append([]geo.XYGeometry(nil), other[:8]...), append([]geo.XYGeometry(nil), other[8:]...)
		r.Shuffle(len(a), func(i, j int) { a[i], a[j] = a[j], a[i] })
		r.Shuffle(len(b), func(i, j int) { b[i], b[j] = b[j], b[i] })
		if got := counted(site, a, b); !reflect.DeepEqual(got, want) {
			t.Fatalf("case %d: %+v, want %+v", k, got, want)
		}
	}
}

// A rule can take all but what is inside of its polygons.
func TestTallyOutside(t *testing.T) {
	var c tally
	c.begin(geo.Extent{MaxX: 10, MaxY: 10}, 2)
	c.add(siteEdge, box(0, 0, 10, 10).Parts, false)
	c.cover(0)
	c.add(0, box(2, 2, 6, 6).Parts, true)
	c.add(1, box(0, 0, 5, 10).Parts, false)
	want := tallied{gross: 100, left: 18, shared: 32, total: []float64{64, 50}, alone: []float64{32, 18}}
	if got := c.count(); !reflect.DeepEqual(got, want) {
		t.Errorf("got %+v, want %+v", got, want)
	}
}

// Edges that all meet in one place cannot be parted by halving.
func TestTallyEndsWhereAllEdgesMeet(t *testing.T) {
	site := box(-50, -50, 100, 100)
	var fan []geo.XYGeometry
	for i := range mostEdges {
		s, c := math.Sincos(2 * math.Pi * float64(i) / mostEdges)
		d, u := math.Sincos(2 * math.Pi * (float64(i) + 0.5) / mostEdges)
		fan = append(fan, geo.XYGeometry{Kind: geo.Polygons, Parts: [][][]geo.XY{{{{}, {X: 40 * c, Y: 40 * s}, {X: 40 * u, Y: 40 * d}, {}}}}})
	}
	got := counted(site, fan)
	// Triangles of two sides of 40 m with half a step between.
	want := mostEdges * 0.5 * 40 * 40 * math.Sin(math.Pi/mostEdges)
	if !within1e9(got.total[0], want, 1e4) || !within1e9(got.left, 1e4-want, 1e4) {
		t.Errorf("got %+v, want %v taken", got, want)
	}
}

func BenchmarkTally(b *testing.B) {
	r := rand.New(rand.NewPCG(707, 708))
	e := New()
	site := star(r, geo.XY{}, 200, 40, false)
	rules := make([][]geo.XYGeometry, 5)
	for i := range 27 { // as on the hard set of package overlaytest
		g, err := e.Buffer(points(geo.XY{X: 600*r.Float64() - 300, Y: 600*r.Float64() - 300}), 100)
		if err != nil {
			b.Fatal(err)
		}
		rules[i%5] = append(rules[i%5], g)
	}
	for b.Loop() {
		counted(site, rules...)
	}
}
