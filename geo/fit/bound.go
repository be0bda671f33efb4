package fit

import (
	"cmp"
	"math"
	"slices"

	"groundtally/geo"
	"groundtally/geo/measure"
)

// What bounds the number of machines from above. In a buildable area of several clusters it is what bounds
// most of the machines.
const (
	BoundByNearness = "whole area nearer than the spacing"
	BoundByHull     = "Oler's inequality on the convex hull"
	BoundByDiscs    = "discs in the grown area"
	BoundByCover    = "cover by rectangles"
	BoundByStrips   = "Oler's inequality in strips"
	BoundByCells    = "search of all places"
	BoundByMax      = "machines wanted"
)

var bounds = []string{BoundByNearness, BoundByHull, BoundByDiscs, BoundByCover, BoundByStrips, BoundByCells, BoundByMax}

const (
	// boundDistance is the distance in the stretched plane that is relied on: a little less than apart asks
	// for, so that no bound fails by rounding.
	boundDistance = 1 - metricSlack

	boundLevels = 8    // strips that an area is cut into
	boundEffort = 1000 // edges times directions; more corners, fewer directions
	coverShifts = 2    // of the rows of a cover
	coverRows   = 1000 // at most; covers with more are not worth their time
)

// Directions of strips and rows in degrees, those first that are furthest from all before.
var boundTurns = []float64{0, 90, 45, 135, 15, 105, 60, 150, 30, 120, 75, 165}

// Heights of the rows of a cover. The third makes squares; flat rows bound narrow strips of land, tall ones
// those a little narrower than the spacing.
var coverHeights = []float64{0.25, 0.5, math.Sqrt2 / 2, 0.85, 0.95}

// bound gives a number of machines that no layout of the cluster exceeds, and what shows it. It stops looking
// for a smaller one at found, the machines of a layout at hand. It is the least of:
//
//   - Nearness: an area whose corners are all nearer to each other than the spacing holds one machine, as
//     the diameter of a polygon is the distance of two of its corners.
//   - Hull: in a compact convex set of the area A, perimeter P stand at most 2/√3·A + P/2 + 1 points with
//     distances of 1 or more (Oler 1961, Acta Mathematica 105; Folkman, Graham 1969, Canadian Mathematical
//     Bulletin 12). Taken on the convex hull of the cluster, and on those of its parts, added up.
//   - Discs: discs of radius r = 1/2 around machines overlap nowhere and lie in the area grown by r; see
//     grownArea.
//   - Search of all places, where the others allow 16 machines or fewer: the area is cut into at most 512
//     cells too small for two machines. If no n cells can be found of which every two have corners as far
//     apart as the spacing, no n machines have room. A search that takes too long shows nothing.
//   - Cover: the area is cut into level rows, each covered by rectangles with a diagonal below 1, which hold
//     one machine each. A row of the height h needs them w = √(1 − h²) long; they are laid end to end over
//     the row's shadow on its lower edge, from the left, which takes the fewest (each starts at a place that
//     no earlier one covers). Least over up to 12 directions, 5 heights, 2 shifts.
//   - Strips: the area is cut into 8 strips. In a run of strips what stands over separate intervals is taken
//     for itself and bounded by nearness, Oler's inequality on its convex hull or, in flat runs, rectangles;
//     the numbers are added up. The best way to cut by dynamic programming. Least over up to 12 directions.
//
// All hold with machines up to τ outside and a distance of d instead of 1: sets are grown by τ (A + P·τ + π·τ²,
// P + 2π·τ for convex ones, by Steiner's formula), then lengths divided by d. Rings must not cross
// themselves and parts must not overlap.
func (c *cluster) bound(found int) (most int, by string) {
	b := &bounder{tau: c.boundTau(), parts: c.parts}
	most = math.MaxInt
	lower := func(n int, what string) bool {
		if n < most {
			most, by = n, what
		}
		return most <= found
	}
	var all []geo.XY
	polygons(c.parts).Each(func(p geo.XY) { all = append(all, p) })
	whole := hullOf(all)
	if b.near(whole) {
		lower(1, BoundByNearness)
		return most, by
	}
	if lower(b.oler(whole), BoundByHull) {
		return most, by
	}
	if len(c.parts) > 1 {
		sum := 0
		for _, part := range c.parts {
			sum += b.convex(hullOf(slices.Concat(part...)))
		}
		if lower(sum, BoundByHull) {
			return most, by
		}
	}
	if lower(b.discs(), BoundByDiscs) {
		return most, by
	}
	edges, x := b.edges(0)
	if most <= cellsUpTo {
		if r, ok := b.cells(edges, x, measure.AreaM2(polygons(c.parts))); ok {
			for most > 1 && !r.holds(most) {
				if lower(most-1, BoundByCells) {
					return most, by
				}
			}
		}
	}
	for _, deg := range boundTurns[:max(1, min(len(boundTurns), boundEffort/max(1, len(edges))))] {
		edges, x := b.edges(deg)
		if lower(b.cover(edges, x, most), BoundByCover) {
			return most, by
		}
		if lower(b.strips(edges, x), BoundByStrips) {
			return most, by
		}
	}
	return most, by
}

// quickBound is a bound that costs little.
func (j *job) quickBound(cluster [][][]geo.XY) int {
	b := &bounder{tau: j.boundTau(), parts: cluster}
	var all []geo.XY
	polygons(cluster).Each(func(p geo.XY) { all = append(all, p) })
	return min(b.convex(hullOf(all)), b.discs())
}

// boundTau is how far outside the stretched area machines may stand: on takes what is tol away in X and in Y.
func (j *job) boundTau() float64 { return 2*j.tol + metricSlack }

type bounder struct {
	tau   float64
	parts [][][]geo.XY

	rows      [][]chord // of layers, used again
	crossings [][]float64
}

// hullOf gives the convex hull as a closed ring; of positions on one line, the way there and back.
func hullOf(ps []geo.XY) []geo.XY {
	if len(ps) == 0 {
		return nil
	}
	if g := measure.ConvexHull(ps); len(g.Parts) > 0 {
		return g.Parts[0][0]
	}
	order := func(a, b geo.XY) int { return cmp.Or(cmp.Compare(a.X, b.X), cmp.Compare(a.Y, b.Y)) }
	a, b := slices.MinFunc(ps, order), slices.MaxFunc(ps, order)
	return []geo.XY{a, b, a}
}

func ringLength(ring []geo.XY) float64 {
	sum := 0.0
	for i := 1; i < len(ring); i++ {
		sum += ring[i-1].Dist(ring[i])
	}
	return sum
}

// near reports whether no two machines have room.
func (b *bounder) near(hull []geo.XY) bool {
	far := boundDistance - 2*b.tau
	if far <= 0 {
		return false
	}
	for i, p := range hull {
		for _, q := range hull[:i] {
			if metric(p, q) >= float64(far*far) {
				return false
			}
		}
	}
	return true
}

func (b *bounder) oler(hull []geo.XY) int {
	if len(hull) == 0 {
		return 0
	}
	a, p := math.Abs(measure.SignedRingAreaM2(hull)), ringLength(hull)
	a += float64(p*b.tau) + float64(math.Pi*b.tau*b.tau)
	p += 2 * math.Pi * b.tau
	const d = boundDistance
	return whole(float64(2/math.Sqrt(3)*a/(d*d)) + float64(p/(2*d)) + 1)
}

// whole rounds a bound down, but not over a number that rounding errors alone keep it from.
func whole(v float64) int { return int(math.Floor(float64(v*(1+1e-12)) + 1e-9)) }

// convex bounds what stands in a convex ring.
func (b *bounder) convex(hull []geo.XY) int {
	if len(hull) > 0 && b.near(hull) {
		return 1
	}
	return b.oler(hull)
}

// discs bounds by π·r²·N ≤ area of the parts grown by r.
func (b *bounder) discs() int {
	r := boundDistance / 2
	sum := 0.0
	for _, part := range b.parts {
		sum += grownArea(part, r+b.tau)
	}
	return whole(sum / float64(math.Pi*r*r))
}

// grownArea gives an upper bound of the area within r of a polygon, in the square of the unit of its
// positions: A + P·r + π·r²·χ with A the area, P the length of all rings, χ = 1 less the number of holes.
//
// By the principal kinematic formula of the plane (Santaló 1976, Integral Geometry and Geometric Probability)
// that sum is the integral, over all places of a disc of radius r, of the Euler characteristic of what disc
// and polygon share. The grown area is the measure of the places where they share something, and there the
// characteristic is 1 or more as long as no hole lies inside the disc. Holes that might (no wider and no
// higher than 2r), and those that cost more than their own area, are filled.
func grownArea(part [][]geo.XY, r float64) float64 {
	sum := 0.0
	for i, ring := range part {
		a, p := math.Abs(measure.SignedRingAreaM2(ring)), ringLength(ring)
		if i == 0 {
			sum += a + float64(p*r) + float64(math.Pi*r*r)
			continue
		}
		x := geo.ExtentOf(polygons([][][]geo.XY{{ring}}))
		if more := float64(p*r) - float64(math.Pi*r*r); math.Max(x.MaxX-x.MinX, x.MaxY-x.MinY) > 2*r && more < a {
			sum += more - a
		}
	}
	return sum
}

// chord is a stretch between two positions of an area, the left one first.
type chord struct{ a, b geo.XY }

func chordOf(p, q geo.XY) chord {
	if p.X > q.X {
		p, q = q, p
	}
	return chord{p, q}
}

// edges gives all edges with a direction turned to level, and their extent.
func (b *bounder) edges(deg float64) ([]chord, geo.Extent) {
	var out []chord
	x := geo.EmptyExtent()
	sin, cos := math.Sincos(deg * math.Pi / 180)
	for _, part := range b.parts {
		for _, ring := range part {
			var last geo.XY
			for i, p := range ring {
				p = geo.XY{X: float64(p.X*cos) + float64(p.Y*sin), Y: float64(p.Y*cos) - float64(p.X*sin)}
				x = x.Add(p)
				if i > 0 {
					out = append(out, chordOf(last, p))
				}
				last = p
			}
		}
	}
	return out, x
}

// layers cuts an area into n level rows of the height h from y upwards, which must reach over it, and gives for
// every row chords of it from left to right: the edges inside the row and the stretches of its two bounding
// lines inside the area. They hold the outline of what lies in the row, so that they have its shadow and its
// convex hull. The next call takes the rows back.
func (b *bounder) layers(edges []chord, y, h float64, n int) [][]chord {
	for len(b.crossings) <= n {
		b.rows, b.crossings = append(b.rows, nil), append(b.crossings, nil)
	}
	rows, crossings := b.rows[:n], b.crossings[:n+1]
	for k := range rows {
		rows[k] = rows[k][:0]
	}
	for k := range crossings {
		crossings[k] = crossings[k][:0]
	}
	level := func(k int) float64 { return y + float64(float64(k)*h) }
	for _, e := range edges {
		lo, hi := e.a, e.b
		if lo.Y > hi.Y {
			lo, hi = hi, lo
		}
		at := func(v float64) geo.XY {
			if v <= lo.Y {
				return lo
			}
			if v >= hi.Y {
				return hi
			}
			return geo.XY{X: lo.X + float64((v-lo.Y)/(hi.Y-lo.Y)*(hi.X-lo.X)), Y: v}
		}
		// A row earlier than the division says, as it rounds.
		for k := max(0, int((lo.Y-y)/h)-1); k <= n && level(k) <= hi.Y; k++ {
			if level(k) >= lo.Y && level(k) < hi.Y {
				crossings[k] = append(crossings[k], at(level(k)).X)
			}
			if k == n || level(k+1) < lo.Y {
				continue
			}
			if lo.Y == hi.Y {
				rows[k] = append(rows[k], e)
			} else {
				rows[k] = append(rows[k], chordOf(at(level(k)), at(level(k+1))))
			}
		}
	}
	for k, xs := range crossings {
		slices.Sort(xs)
		for i := 0; i+1 < len(xs); i += 2 {
			c := chord{geo.XY{X: xs[i], Y: level(k)}, geo.XY{X: xs[i+1], Y: level(k)}}
			if k > 0 {
				rows[k-1] = append(rows[k-1], c)
			}
			if k < n {
				rows[k] = append(rows[k], c)
			}
		}
	}
	for _, row := range rows {
		slices.SortFunc(row, func(p, q chord) int {
			switch {
			case p.a.X < q.a.X:
				return -1
			case p.a.X > q.a.X:
				return 1
			}
			return cmp.Compare(p.b.X, q.b.X)
		})
	}
	return rows
}

// cover counts rectangles that cover the area; it leaves out what cannot give fewer than most.
func (b *bounder) cover(edges []chord, x geo.Extent, most int) int {
	area := measure.AreaM2(polygons(b.parts))
	for _, h := range coverHeights {
		w := b.coverLength(h)
		n := int((x.MaxY-x.MinY)/h) + 2
		if !(w > 0) || n > coverRows || area/(w*h) >= float64(most) {
			continue
		}
		for shift := range coverShifts {
			rows := b.layers(edges, x.MinY-float64(h*float64(shift)/coverShifts), h, n)
			sum := 0
			for _, row := range rows {
				reach := math.Inf(-1)
				for _, c := range row {
					lo, hi := c.a.X-b.tau, c.b.X+b.tau
					if hi <= reach {
						continue
					}
					if lo > reach {
						sum++
						reach = lo + w
					}
					if more := math.Ceil((hi - reach) / w); more > 0 {
						sum += int(more)
						reach += more * w
					}
				}
			}
			most = min(most, sum)
		}
	}
	return most
}

// coverLength is how long a rectangle of the height h may be to hold one machine.
func (b *bounder) coverLength(h float64) float64 {
	h += 2 * b.tau
	w := boundDistance*boundDistance - float64(h*h)
	if w <= 0 {
		return 0
	}
	return math.Sqrt(w) * (1 - metricSlack)
}

// group is the part of a run of strips over an interval of X that nothing else in the run stands over.
type group struct {
	lo, hi float64
	hull   []geo.XY
	most   int
}

func (b *bounder) group(lo, hi float64, ps []geo.XY) group {
	g := group{lo: lo, hi: hi, hull: hullOf(ps)}
	g.most = b.convex(g.hull)
	least, top := math.Inf(1), math.Inf(-1)
	for _, p := range g.hull {
		least, top = math.Min(least, p.Y), math.Max(top, p.Y)
	}
	if w := b.coverLength(top - least); w > 0 {
		g.most = min(g.most, max(1, int(math.Ceil((hi-lo+2*b.tau)/w))))
	}
	return g
}

// joined merges groups in rising order of lo where they overlap.
func (b *bounder) joined(gs []group) []group {
	var out []group
	for i := 0; i < len(gs); {
		k, hi := i+1, gs[i].hi
		for k < len(gs) && gs[k].lo <= hi {
			hi = math.Max(hi, gs[k].hi)
			k++
		}
		if k == i+1 {
			out = append(out, gs[i])
		} else {
			var ps []geo.XY
			for _, g := range gs[i:k] {
				ps = append(ps, g.hull...)
			}
			out = append(out, b.group(gs[i].lo, hi, ps))
		}
		i = k
	}
	return out
}

// strips bounds by the best way to cut the area along level lines.
func (b *bounder) strips(edges []chord, x geo.Extent) int {
	h := (x.MaxY - x.MinY) / boundLevels
	if !(h > 0) {
		return math.MaxInt
	}
	h *= 1 + metricSlack // over the topmost corner in spite of rounding
	var own [boundLevels][]group
	for k, row := range b.layers(edges, x.MinY, h, boundLevels) {
		var gs []group
		for i := 0; i < len(row); {
			n, hi := i, row[i].b.X
			var ps []geo.XY
			for ; n < len(row) && row[n].a.X <= hi; n++ {
				hi = math.Max(hi, row[n].b.X)
				ps = append(ps, row[n].a, row[n].b)
			}
			gs = append(gs, b.group(row[i].a.X, hi, ps))
			i = n
		}
		own[k] = gs
	}
	var most [boundLevels + 1]int // of the strips below
	for k := 1; k <= boundLevels; k++ {
		most[k] = math.MaxInt
	}
	for from := range boundLevels {
		var run []group
		for k := from; k < boundLevels; k++ {
			run = append(run, own[k]...)
			slices.SortStableFunc(run, func(p, q group) int { return cmp.Compare(p.lo, q.lo) })
			run = b.joined(run)
			sum := 0
			for _, g := range run {
				sum += g.most
			}
			most[k+1] = min(most[k+1], most[from]+sum)
		}
	}
	return most[boundLevels]
}
