package fit

import (
	"math"
	"slices"

	"groundtally/geo"
	"groundtally/geo/measure"
)

// cluster is the part of a job that can be filled for itself.
type cluster struct {
	*job
	parts  [][][]geo.XY
	before []geo.XY // machines of other clusters, all far enough
	area   *measure.Slicer
	buf    []measure.Span
	points []geo.XY
	turns  map[float64]*measure.Slicer // turned areas, by degrees
	tied   []lattice                   // the lattices with the most nodes
}

func newCluster(j *job, parts [][][]geo.XY, before []geo.XY) *cluster {
	c := &cluster{job: j, parts: parts, before: before, area: measure.NewSlicer(polygons(parts))}
	c.points = c.candidates()
	return c
}

// found is what filling a cluster gave.
type found struct {
	at      []geo.XY
	how     string
	tried   map[string][]geo.XY // best layout of each producer
	bound   int                 // machines that no layout exceeds; a rough one in jobs that only count
	boundBy string

	early    []geo.XY // best layout before walks and the greedy by energy
	earlyHow string
}

// best gives the best layout of the cluster.
func (c *cluster) best() found {
	f := found{tried: map[string][]geo.XY{}}
	gain := math.Inf(-1)
	gains := map[string]float64{} // of the best layout of each producer, where judged
	take := func(got []geo.XY, by string) {
		if len(got) == 0 {
			return
		}
		if len(got) > len(f.tried[by]) {
			f.tried[by] = got
			gains[by] = math.Inf(-1)
		}
		if len(got) < len(f.at) {
			return
		}
		if c.in.Gain == nil {
			if len(got) > len(f.at) {
				f.at, f.how = got, by
			}
			return
		}
		t := c.total(c.with(got))
		if t > gains[by] {
			f.tried[by], gains[by] = got, t
		}
		if len(got) > len(f.at) || t > gain+1e-9*math.Abs(gain) {
			f.at, f.how, gain = got, by, t
		}
	}
	for _, l := range c.lattices() {
		by := BySquareLattice
		if l.hex {
			by = ByHexagonalLattice
		}
		take(c.filled(l.nodes(c)), by)
	}
	for k := range 16 {
		take(c.sweep(k), BySweep)
	}
	if c.counts {
		f.bound = c.quickBound(c.parts)
	} else {
		f.bound, f.boundBy = c.bound(len(f.at))
	}
	for len(f.at) <= searchUpTo && len(f.at) < f.bound {
		got := c.search(len(f.at) + 1)
		if got == nil {
			break
		}
		take(got, BySearch)
	}
	f.early, f.earlyHow = f.at, f.how
	if len(f.at) <= walkUpTo && (!c.counts || c.mayWalk && len(f.at)+len(c.before) < c.in.Max) {
		for _, got := range c.walks(len(f.tried[ByBoundary])) {
			take(got, ByBoundary)
		}
	}
	if c.in.Gain != nil && len(f.at) <= greedyFill && (c.in.Max == 0 || len(f.at) <= c.in.Max) {
		take(c.greedy(c.points, c.before, math.MaxInt), ByGreedy)
	}
	return f
}

func (c *cluster) with(at []geo.XY) []geo.XY {
	return append(slices.Clone(c.before), at...)
}

// lattice is one of the lattices tried.
type lattice struct {
	hex    bool
	turned float64 // degrees
	iy, ix int     // offsets in eighths
}

const offsets = 8

func (l lattice) height() float64 {
	if l.hex {
		return math.Sqrt(3) / 2
	}
	return 1
}

func turned(p geo.XY, deg float64) geo.XY {
	sin, cos := math.Sincos(deg * math.Pi / 180)
	return geo.XY{X: float64(p.X*cos) + float64(p.Y*sin), Y: float64(p.Y*cos) - float64(p.X*sin)}
}

// lattices gives the lattices with the most nodes in the cluster, in a fixed order: the first without a
// Gain, else at most maxJudged, evenly drawn.
func (c *cluster) lattices() []lattice {
	if c.tied != nil {
		return c.tied
	}
	var ties []lattice
	most := 0
	var buf []measure.Span
	for _, hex := range []bool{true, false} {
		limit := 90
		if hex {
			limit = 60
		}
		for deg := 0; deg < limit; deg += 5 {
			area := c.turnedArea(float64(deg))
			for iy := range offsets {
				var counts [offsets]int
				l := lattice{hex: hex, turned: float64(deg), iy: iy}
				buf = l.rows(area, c.tol, buf, func(spans []measure.Span, _, x0 float64) {
					for ix := range counts {
						o := x0 + float64(ix)/offsets
						for _, s := range spans {
							counts[ix] += max(0, int(math.Floor(s.Hi-o))-int(math.Ceil(s.Lo-o))+1)
						}
					}
				})
				for ix, n := range counts {
					l.ix = ix
					if n > most {
						most, ties = n, ties[:0]
					}
					if n == most && n > 0 && (c.in.Gain != nil || len(ties) == 0) {
						ties = append(ties, l)
					}
				}
			}
		}
	}
	if len(ties) > maxJudged {
		drawn := make([]lattice, maxJudged)
		for i := range drawn {
			drawn[i] = ties[i*len(ties)/maxJudged]
		}
		ties = drawn
	}
	c.tied = ties
	return ties
}

func (c *cluster) turnedArea(deg float64) *measure.Slicer {
	if deg == 0 {
		return c.area
	}
	if s := c.turns[deg]; s != nil {
		return s
	}
	s := measure.NewSlicer(geo.Map(polygons(c.parts), func(p geo.XY) geo.XY { return turned(p, deg) }))
	if c.turns == nil {
		c.turns = map[float64]*measure.Slicer{}
	}
	c.turns[deg] = s
	return s
}

// rows calls f for every row of the lattice with the row's spans inside the area, its Y, the X of one of
// its nodes for the offset 0.
func (l lattice) rows(area *measure.Slicer, tol float64, buf []measure.Span, f func(spans []measure.Span, y, x0 float64)) []measure.Span {
	x := area.Extent()
	h := l.height()
	for k := 0; ; k++ {
		y := x.MinY + (float64(k)+float64(l.iy)/offsets)*h
		if y > x.MaxY+tol {
			return buf
		}
		buf = area.Closed(y, tol, buf[:0])
		x0 := x.MinX
		if l.hex && k%2 == 1 {
			x0 += 0.5
		}
		f(buf, y, x0)
	}
}

// nodes gives the lattice's positions in the cluster.
func (l lattice) nodes(c *cluster) []geo.XY {
	var out []geo.XY
	l.rows(c.turnedArea(l.turned), c.tol, nil, func(spans []measure.Span, y, x0 float64) {
		o := x0 + float64(l.ix)/offsets
		for _, s := range spans {
			for k := math.Ceil(s.Lo - o); k <= math.Floor(s.Hi-o); k++ {
				out = append(out, turned(geo.XY{X: o + k, Y: y}, -l.turned))
			}
		}
	})
	return out
}

// candidates gives positions at which single machines may stand: an interior point of every part, its
// corners, points on its edges, a grid through the cluster.
func (c *cluster) candidates() []geo.XY {
	var out []geo.XY
	for _, part := range c.parts {
		if p, ok := measure.InteriorPoint(part); ok {
			out = append(out, p)
		}
	}
	if len(out) > maxPoints {
		return out
	}
	fixed := len(out)
	for step := 1.0 / 6; ; step *= 1.5 {
		out = out[:fixed]
		for _, part := range c.parts {
			for _, ring := range part {
				gone := math.Inf(1) // way since the last point taken
				for i := 1; i < len(ring); i++ {
					a, b := ring[i-1], ring[i]
					l := a.Dist(b)
					if gone >= step/4 {
						out, gone = append(out, a), 0
					}
					for n := 1; float64(n)*step < l && len(out) <= maxPoints; n++ {
						t := float64(n) * step / l
						out, gone = append(out, geo.XY{X: a.X + float64(t*(b.X-a.X)), Y: a.Y + float64(t*(b.Y-a.Y))}), 0
					}
					gone += l
				}
			}
		}
		x := c.area.Extent()
		for y := x.MinY + step/2; y < x.MaxY && len(out) <= maxPoints; y += step {
			c.buf = c.area.At(y, c.buf[:0])
			for _, s := range c.buf {
				for k := math.Ceil((s.Lo - x.MinX) / step); x.MinX+k*step <= s.Hi && len(out) <= maxPoints; k++ {
					out = append(out, geo.XY{X: x.MinX + k*step, Y: y})
				}
			}
		}
		if len(out) <= maxPoints {
			return out
		}
		if step > 1 { // many small parts: keep what is there
			return out[:maxPoints]
		}
	}
}

// filled adds machines at candidate positions that keep their distance: with a Gain the best first.
func (c *cluster) filled(at []geo.XY) []geo.XY {
	at = slices.Clone(at)
	var open []geo.XY
	for _, p := range c.points {
		if free(p, at, -1) {
			open = append(open, p)
		}
	}
	for len(open) > 0 {
		k := 0
		if c.in.Gain != nil {
			now := c.metres(c.with(at))
			best := math.Inf(-1)
			for i, p := range open {
				if d := c.in.Gain.Add(now, c.f.metres(p)); d > best {
					best, k = d, i
				}
			}
		}
		p := open[k]
		at = append(at, p)
		open = slices.DeleteFunc(open, func(q geo.XY) bool { return !apart(p, q) })
	}
	return at
}

// sweep fills the candidates greedily from one of 16 sides.
func (c *cluster) sweep(side int) []geo.XY {
	var at []geo.XY
	for _, p := range c.fromSide(side) {
		if free(p, at, -1) {
			at = append(at, p)
		}
	}
	return at
}

// search looks for n candidates that keep their distance from each other; nil when it finds none.
func (c *cluster) search(n int) []geo.XY {
	points := thinned(c.points, searchPoints)
	nodes := 0
	var chosen []geo.XY
	var deeper func(open []geo.XY) bool
	deeper = func(open []geo.XY) bool {
		if len(chosen) == n {
			return true
		}
		for i, p := range open {
			if len(open)-i < n-len(chosen) {
				return false
			}
			if nodes++; nodes > searchNodes {
				return false
			}
			var rest []geo.XY
			for _, q := range open[i+1:] {
				if apart(p, q) {
					rest = append(rest, q)
				}
			}
			chosen = append(chosen, p)
			if deeper(rest) {
				return true
			}
			chosen = chosen[:len(chosen)-1]
		}
		return false
	}
	if deeper(points) {
		return slices.Clone(chosen)
	}
	return nil
}
