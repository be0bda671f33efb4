package overlay

import (
	"cmp"
	"math"
	"slices"

	"groundtally/geo"
	"groundtally/geo/measure"
)

// tally measures how much of a site each rule takes alone and with others, without making any polygon.
//
// The site is cut into level strips at the height of every position. Within a strip edges run straight
// through; where two of them cross it is cut again at the crossing. Between one edge and the next lies an
// area, the difference of the trapezoids to their left, in or out of the site and of each rule's regions by the
// number of their edges to the left. It is counted where edges cross, begin or end, not where outlines go on.
// Edges that lie upon each other, or that rounding has put in the wrong order, have nothing between them, so
// nothing depends on telling them apart: this way of counting has no special cases to get wrong, and it is
// exact but for rounding.
//
// It is independent of the library, which makes the polygon of what is left: each checks the other.
type tally struct {
	rules  int
	base   []int32 // by rule: how often it covers everything
	frame  frameBox
	edges  []edge
	beside []edge // left of the box, of which only the heights count
	sums   tallied

	// For one sweep.
	ys      []float64
	strips  []int32 // by edge: the strip that it begins in
	starts  []int32 // by strip: where the edges of the next begin in sorted
	sorted  []int32 // edges by strip
	active  []slot  // from left to right
	ended   []int32 // of active: those whose edge ends
	fresh   []int32 // edges that begin
	flushed float64 // the height up to which everything is counted
	part    []crossing
	cuts    []float64
	marks   []mark
	steps   []step

	// For one pass.
	winding []int32 // by rule: regions around the place in hand
	on      []int32 // rules that cover it
	at      []int32 // by rule: its place in on
}

// tallied are areas in m².
type tallied struct {
	gross  float64
	left   float64   // taken by no rule
	shared float64   // taken by two or more
	total  []float64 // by rule: taken by it
	alone  []float64 // by rule: taken by it only
}

// frameBox is the place of the box that is counted.
type frameBox struct{ x, y, w, h float64 }

// edge runs upwards; seen from below, w regions of its rule begin to its right.
type edge struct {
	x0, y0, x1, y1 float64
	rule, w        int32 // the site has the rule siteEdge
}

const siteEdge = -1

// slot is a place in the row of edges that a strip meets from left to right. One edge after the other of the
// same outline holds it.
type slot struct {
	x, y, slope, x1, y1 float64 // the edge in hand
	a, b                float64 // where it meets the lower and the upper border of the strip in hand
	sum                 float64 // the area to the left of the slot since the last count, up to the height from
	from                float64
	rule, w             int32
}

// crossing is a slot in a strip where edges cross.
type crossing struct {
	a, b, mid float64
	rule, w   int32
}

// mark is the area to the left of an edge.
type mark struct {
	m2      float64
	rule, w int32
}

type step struct {
	y    float64
	w    int32
	rule int32
}

// mostEdges is the number of edges from which a box is counted in halves: the work of a strip grows with
// the edges in it.
const mostEdges = 4000

// leastHalfM ends the halving: edges that all meet in one place would go on for ever.
const leastHalfM = 1.0

// begin starts the count of a box for so many rules.
func (t *tally) begin(x geo.Extent, rules int) {
	t.rules = rules
	t.frame = frameBox{x.MinX, x.MinY, x.MaxX - x.MinX, x.MaxY - x.MinY}
	t.edges, t.beside = t.edges[:0], t.beside[:0]
	t.base = zeroed(t.base, rules)
	t.winding = zeroed(t.winding, rules)
	t.at = zeroed(t.at, rules)
	t.sums = tallied{total: make([]float64, rules), alone: make([]float64, rules)}
}

func zeroed(s []int32, n int) []int32 {
	s = append(s[:0], make([]int32, n)...)
	return s
}

// cover lets a rule cover the whole box.
func (t *tally) cover(rule int) { t.base[rule]++ }

// add takes in valid polygons; out makes the rule take what is outside of them, once cover was called.
func (t *tally) add(rule int32, parts [][][]geo.XY, out bool) {
	for _, part := range parts {
		for j, ring := range part {
			t.ring(rule, ring, (j > 0) != out)
		}
	}
}

func (t *tally) ring(rule int32, ring []geo.XY, hollow bool) {
	w := int32(1)
	if (measure.SignedRingAreaM2(ring) < 0) != hollow {
		w = -1
	}
	f := t.frame
	n := len(ring) - 1
	start := slices.IndexFunc(ring, func(p geo.XY) bool { return p.X > f.x })
	if start < 0 {
		return
	}
	at := func(i int) geo.XY {
		if i += start; i >= n {
			i -= n
		}
		return ring[i]
	}
	for i := 1; i <= n; i++ {
		p, q := at(i-1), at(i)
		// Of a way to the left of the box only the ends count.
		for p.X <= f.x && q.X <= f.x && i < n && at(i+1).X <= f.x {
			i++
			q = at(i)
		}
		e := edge{p.X - f.x, p.Y - f.y, q.X - f.x, q.Y - f.y, rule, w}
		if e.y0 < e.y1 {
			// Round an outer ring counter-clockwise, edges that rise have the inside to their left.
			e.w = -w
		} else {
			e.x0, e.y0, e.x1, e.y1 = e.x1, e.y1, e.x0, e.y0
		}
		t.edges, t.beside = e.cut(f.w, f.h, t.edges, t.beside)
	}
}

// cut adds to inside the part of the edge that lies in a box from 0, 0 to w, h, to beside the part left of it
// at the heights of the box.
func (e edge) cut(w, h float64, inside, beside []edge) (in, left []edge) {
	if e.y1 <= 0 || e.y0 >= h || e.y0 == e.y1 || e.x0 >= w && e.x1 >= w {
		return inside, beside
	}
	if e.y0 < 0 || e.y1 > h {
		dx, dy := e.x1-e.x0, e.y1-e.y0
		x0, y0 := e.x0, e.y0
		if e.y0 < 0 {
			e.x0, e.y0 = x0-y0/dy*dx, 0
		}
		if e.y1 > h {
			e.x1, e.y1 = x0+(h-y0)/dy*dx, h
		}
	}
	if e.x0 < 0 || e.x1 < 0 {
		in, out, some := e.apart(0)
		if out.y0 < out.y1 {
			beside = append(beside, out)
		}
		if !some {
			return inside, beside
		}
		e = in
	}
	if e.x0 > w || e.x1 > w {
		_, in, _ := e.apart(w)
		e = in
	}
	if e.y0 < e.y1 {
		inside = append(inside, e)
	}
	return inside, beside
}

// apart cuts an edge at x into what lies to the right and to the left; some says that there is anything to
// the right.
func (e edge) apart(x float64) (right, left edge, some bool) {
	right, left = e, e
	switch {
	case e.x0 <= x && e.x1 <= x:
		right.y1 = right.y0
		return right, left, false
	case e.x0 >= x && e.x1 >= x:
		left.y1 = left.y0
		return right, left, true
	}
	y := min(max(e.y0+(x-e.x0)/(e.x1-e.x0)*(e.y1-e.y0), e.y0), e.y1)
	low, high := &left, &right // the parts below and above the cut
	if e.x0 > x {
		low, high = &right, &left
	}
	low.x1, low.y1 = x, y
	high.x0, high.y0 = x, y
	return right, left, true
}

// count gives the areas. The slices are the caller's.
func (t *tally) count() tallied {
	t.halve(t.edges, t.beside, t.frame.w, t.frame.h)
	return t.sums
}

func (t *tally) halve(edges, beside []edge, w, h float64) {
	if len(edges) <= mostEdges || max(w, h) < 2*leastHalfM {
		t.sweep(edges, beside, w, h)
		return
	}
	for _, half := range [2]float64{0, 1} {
		x, y, hw, hh := 0.0, 0.0, w, h
		if w > h {
			x, hw = half*w/2, w/2
		} else {
			y, hh = half*h/2, h/2
		}
		var in, out []edge
		for _, es := range [2][]edge{edges, beside} {
			for _, e := range es {
				e.x0, e.x1, e.y0, e.y1 = e.x0-x, e.x1-x, e.y0-y, e.y1-y
				in, out = e.cut(hw, hh, in, out)
			}
		}
		t.halve(in, out, hw, hh)
	}
}

// sweep counts one box.
func (t *tally) sweep(edges, beside []edge, w, h float64) {
	edges = t.upright(edges, beside)
	t.order(edges, h)
	t.active, t.ended, t.flushed = t.active[:0], t.ended[:0], 0
	from := int32(0)
	for k := range len(t.ys) - 1 {
		ya, yb := t.ys[k], t.ys[k+1]
		t.turn(edges, t.sorted[from:t.starts[k]], w, ya)
		from = t.starts[k]

		t.ended = t.ended[:0]
		before, apart := math.Inf(-1), true
		for i := range t.active {
			s := &t.active[i]
			s.a = s.b
			if s.b = s.x + (yb-s.y)*s.slope; s.y1 == yb {
				s.b = s.x1
				t.ended = append(t.ended, int32(i))
			}
			if s.b < before {
				apart = false
			}
			before = s.b
		}
		if !apart {
			t.crossed(w, ya, yb)
		}
	}
	t.flush(w, h)
}

// order finds the strips and puts the edges in the order in which they begin.
func (t *tally) order(edges []edge, h float64) {
	t.ys = append(t.ys[:0], 0, h)
	var low, high float64
	for i := range edges {
		e := &edges[i]
		// One edge mostly goes on where the one before ended.
		if e.y0 != low && e.y0 != high {
			t.ys = append(t.ys, e.y0)
		}
		if e.y1 != low && e.y1 != high {
			t.ys = append(t.ys, e.y1)
		}
		low, high = e.y0, e.y1
	}
	slices.Sort(t.ys)
	t.ys = slices.Compact(t.ys)

	// Edges are counted by the strip that they begin in, then placed.
	t.starts = zeroed(t.starts, len(t.ys)+1)
	t.strips = zeroed(t.strips, len(edges))
	t.sorted = zeroed(t.sorted, len(edges))
	for i := range edges {
		k, _ := slices.BinarySearch(t.ys, edges[i].y0)
		t.strips[i] = int32(k)
		t.starts[k+1]++
	}
	for k := range len(t.ys) {
		t.starts[k+1] += t.starts[k]
	}
	for i, k := range t.strips {
		t.sorted[t.starts[k]] = int32(i)
		t.starts[k]++
	}
}

// turn lets edges end, go on, begin at the height y.
func (t *tally) turn(edges []edge, begin []int32, w, y float64) {
	fresh := t.fresh[:0]
next:
	for _, i := range begin {
		e := &edges[i]
		for n, k := range t.ended {
			s := &t.active[k]
			if s.rule == e.rule && s.w == e.w && s.x1 == e.x0 {
				// The outline goes on, so nothing to its left or right has changed.
				s.advance(y)
				s.follow(e)
				t.ended = slices.Delete(t.ended, n, n+1)
				continue next
			}
		}
		fresh = append(fresh, i)
	}
	t.fresh = fresh
	if len(fresh) == 0 && len(t.ended) == 0 {
		return
	}
	t.flush(w, y)
	if len(t.ended) > 0 {
		kept := t.active[:t.ended[0]]
		ended := t.ended
		for i := int(ended[0]); i < len(t.active); i++ {
			if len(ended) > 0 && int(ended[0]) == i {
				ended = ended[1:]
				continue
			}
			kept = append(kept, t.active[i])
		}
		t.active = kept
	}
	for _, i := range fresh {
		s := slot{b: edges[i].x0, from: y}
		s.follow(&edges[i])
		t.active = append(t.active, s)
		j := len(t.active) - 1
		for ; j > 0 && (s.b < t.active[j-1].b || s.b == t.active[j-1].b && s.slope < t.active[j-1].slope); j-- {
			t.active[j] = t.active[j-1]
		}
		t.active[j] = s
	}
}

// follow lets a slot go along an edge from its lower end.
func (s *slot) follow(e *edge) {
	s.x, s.y, s.x1, s.y1 = e.x0, e.y0, e.x1, e.y1
	s.slope = (e.x1 - e.x0) / (e.y1 - e.y0)
	s.rule, s.w = e.rule, e.w
}

// advance adds the way up to the height y, where the slot is at its b.
func (s *slot) advance(y float64) {
	s.sum += (s.x + (s.from-s.y)*s.slope + s.b) / 2 * (y - s.from)
	s.from = y
}

// flush counts what lies between the edges since the last time.
func (t *tally) flush(w, y float64) {
	if y <= t.flushed {
		return
	}
	t.marks = t.marks[:0]
	for i := range t.active {
		s := &t.active[i]
		s.advance(y)
		t.marks = append(t.marks, mark{s.sum, s.rule, s.w})
		s.sum = 0
	}
	t.pass(w * (y - t.flushed))
	t.flushed = y
}

// upright adds to the edges what stands to the left of the box, put together to as few edges as can be.
func (t *tally) upright(edges, beside []edge) []edge {
	t.steps = t.steps[:0]
	for _, e := range beside {
		t.steps = append(t.steps, step{e.y0, e.w, e.rule}, step{e.y1, -e.w, e.rule})
	}
	slices.SortFunc(t.steps, func(a, b step) int { return cmp.Or(cmp.Compare(a.rule, b.rule), cmp.Compare(a.y, b.y)) })
	w := int32(0)
	for i, s := range t.steps {
		w += s.w
		if w == 0 {
			continue
		}
		if end := t.steps[i+1].y; end > s.y { // of one rule, since its steps add up to 0
			edges = append(edges, edge{y0: s.y, y1: end, rule: s.rule, w: w})
		}
	}
	return edges
}

// crossed counts a strip in which edges cross, from one crossing to the next.
func (t *tally) crossed(w, ya, yb float64) {
	for i := range t.active {
		s := &t.active[i]
		s.a, s.b = s.b, s.a // as flush wants it
	}
	t.flush(w, ya)
	t.part = t.part[:0]
	for i := range t.active {
		s := &t.active[i]
		s.a, s.b, s.from = s.b, s.a, yb
		t.part = append(t.part, crossing{a: s.a, b: s.b, rule: s.rule, w: s.w})
	}
	t.flushed = yb
	t.cuts = append(t.cuts[:0], 1)
	for i := 1; i < len(t.active); i++ {
		s := t.active[i]
		j := i
		for ; j > 0 && s.b < t.active[j-1].b; j-- {
			o := &t.active[j-1]
			if below, above := s.a-o.a, o.b-s.b; below > 0 {
				t.cuts = append(t.cuts, below/(below+above))
			}
			t.active[j] = *o
		}
		t.active[j] = s
	}
	slices.Sort(t.cuts)
	from := 0.0
	for _, to := range t.cuts {
		if to <= from {
			continue
		}
		at, h := (from+to)/2, (to-from)*(yb-ya)
		for i := range t.part {
			c := &t.part[i]
			c.mid = c.a + at*(c.b-c.a)
		}
		for i := 1; i < len(t.part); i++ {
			c := t.part[i]
			j := i
			for ; j > 0 && c.mid < t.part[j-1].mid; j-- {
				t.part[j] = t.part[j-1]
			}
			t.part[j] = c
		}
		t.marks = t.marks[:0]
		for i := range t.part {
			c := &t.part[i]
			t.marks = append(t.marks, mark{c.mid * h, c.rule, c.w})
		}
		t.pass(w * h)
		from = to
	}
	t.ended = t.ended[:0]
	for i := range t.active {
		if t.active[i].y1 == yb {
			t.ended = append(t.ended, int32(i))
		}
	}
}

// pass counts the areas between marks in order, the last of which is followed by the end of the box.
func (t *tally) pass(end float64) {
	copy(t.winding, t.base)
	t.on = t.on[:0]
	for rule, n := range t.base {
		if n > 0 {
			t.at[rule] = int32(len(t.on))
			t.on = append(t.on, int32(rule))
		}
	}
	site, before := int32(0), 0.0
	for _, m := range t.marks {
		if site > 0 && m.m2 != before {
			t.take(m.m2 - before)
		}
		before = m.m2
		if m.rule == siteEdge {
			site += m.w
			continue
		}
		was := t.winding[m.rule]
		is := was + m.w
		t.winding[m.rule] = is
		if (was > 0) == (is > 0) {
			continue
		}
		if is > 0 {
			t.at[m.rule] = int32(len(t.on))
			t.on = append(t.on, m.rule)
			continue
		}
		last := t.on[len(t.on)-1]
		t.on[t.at[m.rule]], t.at[last] = last, t.at[m.rule]
		t.on = t.on[:len(t.on)-1]
	}
	if site > 0 { // its right edge lies beyond the box
		t.take(end - before)
	}
}

func (t *tally) take(m2 float64) {
	s := &t.sums
	s.gross += m2
	switch len(t.on) {
	case 0:
		s.left += m2
		return
	case 1:
		s.alone[t.on[0]] += m2
	default:
		s.shared += m2
	}
	for _, rule := range t.on {
		s.total[rule] += m2
	}
}
