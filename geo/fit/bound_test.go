package fit

import (
	"math"
	"math/rand/v2"
	"slices"
	"testing"

	"groundtally/geo"
	"groundtally/geo/measure"
)

// arguments gives what each argument says of an area that is one cluster, in the spacing of a round metre.
func arguments(g geo.XYGeometry) map[string]int {
	j := newJob(Input{Buildable: g, Spacing: Spacing{AlongM: 1, AcrossM: 1}}, 1)
	b := &bounder{tau: j.boundTau(), parts: j.parts}
	var all []geo.XY
	polygons(j.parts).Each(func(p geo.XY) { all = append(all, p) })
	out := map[string]int{BoundByHull: b.oler(hullOf(all)), BoundByDiscs: b.discs(), BoundByCover: math.MaxInt, BoundByStrips: math.MaxInt}
	if b.near(hullOf(all)) {
		out[BoundByNearness] = 1
	}
	for _, deg := range boundTurns {
		edges, x := b.edges(deg)
		out[BoundByCover] = min(out[BoundByCover], b.cover(edges, x, math.MaxInt))
		out[BoundByStrips] = min(out[BoundByStrips], b.strips(edges, x))
	}
	edges, x := b.edges(0)
	if r, ok := b.cells(edges, x, measure.AreaM2(g)); ok {
		n := 0
		for n < 60 && r.holds(n+1) {
			n++
		}
		out[BoundByCells] = n
	}
	return out
}

// snake is a bent strip of random width.
func snake(r *rand.Rand, n int) [][]geo.XY {
	var left, right []geo.XY
	at, to := geo.XY{}, 0.0
	for range n {
		sin, cos := math.Sincos(to)
		w := 0.05 + 0.5*r.Float64()
		left = append(left, geo.XY{X: at.X - w*sin, Y: at.Y + w*cos})
		right = append(right, geo.XY{X: at.X + w*sin, Y: at.Y - w*cos})
		at = geo.XY{X: at.X + 1.5*cos, Y: at.Y + 1.5*sin}
		to += 0.5 * (r.Float64() - 0.5)
	}
	slices.Reverse(right)
	return [][]geo.XY{measure.Close(append(left, right...))}
}

// No layout that is found may exceed any argument.
func TestEveryBoundHolds(t *testing.T) {
	r := rand.New(rand.NewPCG(21, 4))
	lowest := map[string]int{}
	for i := range 250 {
		var g geo.XYGeometry
		switch i % 3 {
		case 0:
			g = area(star(r, 0.5+3*r.Float64()*r.Float64(), 4+r.IntN(30)))
		case 1:
			g = area(snake(r, 2+r.IntN(6)))
		case 2: // with a hole
			w, h := 1+3*r.Float64(), 1+3*r.Float64()
			g = area([][]geo.XY{box(0, 0, w, h)[0], box(w*0.1*r.Float64(), h*0.1*r.Float64(), w*0.85*r.Float64(), h*0.85*r.Float64())[0]})
		}
		out := machines(t, Input{Buildable: g, Spacing: Spacing{AlongM: 1, AcrossM: 1}})
		least := math.MaxInt
		for by, n := range arguments(g) {
			if n < len(out.At) {
				t.Errorf("case %d: %s allows %d machines, %d stand", i, by, n, len(out.At))
			}
			least = min(least, n)
		}
		// It may stop at the machines found before all are asked, no lower than them.
		if out.Bound < len(out.At) || out.Bound < least || out.BoundBy == "" {
			t.Errorf("case %d: bound %d by %q, arguments give %d", i, out.Bound, out.BoundBy, least)
		}
		lowest[out.BoundBy]++
	}
	for _, by := range []string{BoundByNearness, BoundByHull, BoundByDiscs, BoundByCover, BoundByStrips, BoundByCells} {
		if lowest[by] == 0 {
			t.Errorf("%s never gave the bound: %v", by, lowest)
		}
	}
}

// Any spacing, direction, several parts, with and without Max.
func TestBoundOfManyParts(t *testing.T) {
	r := rand.New(rand.NewPCG(22, 4))
	for range 60 {
		g := geo.XYGeometry{Kind: geo.Polygons}
		for i := range 1 + r.IntN(4) {
			part := star(r, 100+600*r.Float64(), 4+r.IntN(12))
			g.Parts = append(g.Parts, geo.Map(area(part), func(p geo.XY) geo.XY { return geo.XY{X: p.X + 1500*float64(i), Y: p.Y} }).Parts...)
		}
		in := Input{Buildable: g, Spacing: Spacing{AlongM: 200 + 500*r.Float64(), AcrossM: 150 + 300*r.Float64(), AzimuthDeg: 360 * r.Float64()}}
		out := machines(t, in)
		if out.Bound < len(out.At) {
			t.Errorf("%d machines, at most %d by %s", len(out.At), out.Bound, out.BoundBy)
		}
		in.Max = 1 + r.IntN(4)
		few := machines(t, in)
		if few.Bound != min(in.Max, out.Bound) || in.Max < out.Bound && few.BoundBy != BoundByMax {
			t.Errorf("at most %d wanted of %d: %d by %s", in.Max, out.Bound, few.Bound, few.BoundBy)
		}
	}
	if out := machines(t, Input{Buildable: geo.XYGeometry{Kind: geo.Polygons}, Spacing: Spacing{AlongM: 1, AcrossM: 1}}); out.Bound != 0 || out.BoundBy != "" {
		t.Errorf("nothing is bounded by %d, %s", out.Bound, out.BoundBy)
	}
}

// In an equilateral triangle with sides of k the triangular lattice has (k+1)(k+2)/2 points, and Oler's
// inequality is an equality (Oler 1961).
func TestOlerIsExactOnTriangles(t *testing.T) {
	for k := 1; k <= 8; k++ {
		for _, scale := range []float64{1, 1 + 3e-10, 1 - 3e-10} { // the last within the slack
			l := 400 * float64(k) * scale
			g := area([][]geo.XY{{{X: 7}, {X: 7 + l}, {X: 7 + l/2, Y: l * math.Sqrt(3) / 2}, {X: 7}}})
			out := machines(t, Input{Buildable: g, Spacing: Spacing{AlongM: 400, AcrossM: 400}})
			if want := (k + 1) * (k + 2) / 2; len(out.At) != want && scale >= 1 || out.Bound != want {
				t.Errorf("side %d: %d machines, at most %d by %s, want %d", k, len(out.At), out.Bound, out.BoundBy, want)
			}
		}
	}
}

// The parcel of 16 machines by hand: 3.0769 by 3 in the stretched plane, 2/√3·9.2308 + 12.1538/2 + 1 = 17.74.
func TestBoundByHand(t *testing.T) {
	out := machines(t, Input{Buildable: area(box(1000, -300, 2000, 1170)), Spacing: Spacing{AlongM: 650, AcrossM: 390, AzimuthDeg: 90}})
	if out.Bound < 16 || out.Bound > 17 {
		t.Errorf("at most %d by %s, want 16 or 17", out.Bound, out.BoundBy)
	}
	got := arguments(area(box(0, 0, 2000.0/650, 3)))
	// Discs: (9.2308 + 12.1538/2 + π/4)/(π/4) = 20.49.
	if got[BoundByHull] != 17 || got[BoundByDiscs] != 20 {
		t.Errorf("got %v, want 17 by the hull, 20 by discs", got)
	}
	// A strip 0.2 wide: neighbours stand √(1 − 0.04) = 0.980 apart along it, 4 lengths take 3.92 and 5 machines.
	for l, want := range map[float64]int{3.9: 4, 3.93: 5} {
		if got := arguments(area(box(0, 0, l, 0.2))); got[BoundByCover] < want || got[BoundByStrips] != want {
			t.Errorf("a strip of %v: %v, want %d", l, got, want)
		}
	}
	// Four squares with sides of 0.7, whose diagonal is 0.99.
	if got := arguments(area(box(0, 0, 1.4, 1.4))); got[BoundByCover] != 4 {
		t.Errorf("four squares: %v", got)
	}
}

// Where a bound is as low as what an exhaustive search finds it cannot be lower.
func TestBoundAgainstExhaustiveSearch(t *testing.T) {
	r := rand.New(rand.NewPCG(23, 4))
	exact := 0
	for range 40 {
		g := area(star(r, 280, 5+r.IntN(8)))
		in := Input{Buildable: g, Spacing: Spacing{AlongM: 300, AcrossM: 200, AzimuthDeg: 90}}
		out := machines(t, in)
		var ps []geo.XY
		for x := -280.0; x <= 280; x += 40 {
			for y := -280.0; y <= 280; y += 28 {
				if p := (geo.XY{X: x, Y: y}); measure.Inside(p, g) {
					ps = append(ps, p)
				}
			}
		}
		best := largest(in.Spacing, ps, nil, 0)
		if out.Bound < best {
			t.Errorf("at most %d by %s, a plain search finds %d", out.Bound, out.BoundBy, best)
		}
		if out.Bound == len(out.At) {
			exact++
		}
	}
	if exact < 25 {
		t.Errorf("the bound is met in %d of 40 small areas", exact)
	}
}

// The grown area against a count of squares.
func TestGrownArea(t *testing.T) {
	r := rand.New(rand.NewPCG(24, 4))
	const rad, step = 0.5, 1.0 / 64
	count := func(g geo.XYGeometry) float64 {
		x, n := geo.ExtentOf(g).Grow(rad+step), 0
		for y := x.MinY + 0.37*step; y < x.MaxY; y += step { // off the lines of the cases
			for at := x.MinX + 0.37*step; at < x.MaxX; at += step {
				if d, _ := measure.PointToM(geo.XY{X: at, Y: y}, g); d <= rad {
					n++
				}
			}
		}
		return float64(n) * step * step
	}
	for name, part := range map[string][][]geo.XY{
		"star":                star(r, 1.5, 17),
		"square":              box(0, 0, 2, 1),
		"ring road":           {box(0, 0, 3, 3)[0], box(0.2, 0.2, 2.6, 2.6)[0]},
		"hole within a disc":  {box(0, 0, 3, 3)[0], box(1, 1, 0.6, 0.6)[0]},
		"hole that is filled": {box(0, 0, 3, 3)[0], box(1, 0.2, 0.9, 2.6)[0]},
		"two holes":           {box(0, 0, 4, 3)[0], box(0.2, 0.2, 1.6, 2.6)[0], box(2, 0.2, 1.8, 2.6)[0]},
	} {
		got, want := grownArea(part, rad), count(area(part))
		if got < want-0.02 {
			t.Errorf("%s: at most %v, counted %v", name, got, want)
		}
		if name == "square" && math.Abs(got-want) > 0.02 { // convex: Steiner's formula
			t.Errorf("%s: %v, counted %v", name, got, want)
		}
	}
	// 9 − 2.6² + (12 + 10.4)/2 inside and out; the corners of the outside cost π/4, those of the hole save it.
	if got, want := grownArea([][]geo.XY{box(0, 0, 3, 3)[0], box(0.2, 0.2, 2.6, 2.6)[0]}, rad), 9-2.6*2.6+11.2; math.Abs(got-want) > 1e-12 {
		t.Errorf("a ring road grows to %v, want %v", got, want)
	}
}

// The clique search against all subsets, with pairs drawn at random.
func TestRoomHolds(t *testing.T) {
	r := rand.New(rand.NewPCG(25, 4))
	for range 200 {
		room := room{n: 1 + r.IntN(14)}
		room.with = make([]cellSet, room.n)
		share := r.Float64()
		for i := range room.n {
			for k := range i {
				if r.Float64() < share {
					room.with[i][0] |= 1 << k
					room.with[k][0] |= 1 << i
				}
			}
		}
		best := 0
		for set := range uint64(1) << room.n {
			n, clique := 0, true
			for i := range room.n {
				if set>>i&1 == 1 {
					n++
					clique = clique && set&^room.with[i][0] == 1<<i
				}
			}
			if clique {
				best = max(best, n)
			}
		}
		if !room.holds(best) || room.holds(best+1) {
			t.Fatalf("%d cells, want %d, holds %v, %v", room.n, best, room.holds(best), room.holds(best+1))
		}
	}
}

func BenchmarkBound(b *testing.B) {
	for _, corners := range []int{12, 200, 2000} {
		g := hectares(rand.New(rand.NewPCG(100, 1)), 100, corners)
		j := newJob(Input{Buildable: g, Spacing: Spacing{AlongM: 650, AcrossM: 390}}, 1)
		c := newCluster(j, j.parts, nil)
		b.Run(map[int]string{12: "12_corners", 200: "200_corners", 2000: "2000_corners"}[corners], func(b *testing.B) {
			for b.Loop() {
				c.bound(0)
			}
		})
	}
}
