package fit

import (
	"math"
	"math/bits"

	"groundtally/geo"
)

const (
	cellWords = 8              // of a set of cells
	cellsMost = 64 * cellWords // cells that an area is cut into
	cellsUpTo = 16             // machines up to which cells are tried
	cellSteps = 400            // of a search of cells
)

type cellSet [cellWords]uint64

func (s *cellSet) empty() bool { return *s == cellSet{} }

// room is a small area cut into cells: which pairs may hold a machine each.
type room struct {
	n    int
	with []cellSet // by cell, the cells that it goes with
}

// cells cuts an area of the size area, in the square of the spacing, into at most cellsMost rectangles over the
// shadows of its rows and finds the pairs with corners that are the spacing apart. No cell has room for two
// machines. It reports false when so few cells are too large for that.
func (b *bounder) cells(edges []chord, x geo.Extent, area float64) (room, bool) {
	for s := math.Max(math.Sqrt(area/cellsMost), 1.0/32); s < 0.5 && s+2*b.tau < 0.7*boundDistance; s *= 1.1 {
		var cs []geo.Extent
		n := int((x.MaxY-x.MinY)/s) + 1
		if n > cellsMost {
			continue
		}
		for k, row := range b.layers(edges, x.MinY, s, n) {
			y := x.MinY + float64(s*float64(k))
			for i := 0; i < len(row) && len(cs) <= cellsMost; {
				lo, hi := row[i].a.X, row[i].b.X
				for ; i < len(row) && row[i].a.X <= hi; i++ {
					hi = math.Max(hi, row[i].b.X)
				}
				m := math.Max(1, math.Ceil((hi-lo)/s))
				for c := range int(m) {
					cs = append(cs, geo.Extent{MinX: lo + (hi-lo)*float64(c)/m, MaxX: lo + (hi-lo)*float64(c+1)/m, MinY: y, MaxY: y + s})
				}
			}
		}
		if len(cs) > cellsMost {
			continue
		}
		r := room{n: len(cs), with: make([]cellSet, len(cs))}
		for i, p := range cs {
			for k, q := range cs[:i] {
				dx := math.Max(p.MaxX-q.MinX, q.MaxX-p.MinX) + 4*b.tau
				dy := math.Max(p.MaxY-q.MinY, q.MaxY-p.MinY) + 4*b.tau
				if float64(dx*dx)+float64(dy*dy) >= boundDistance*boundDistance {
					r.with[i][k/64] |= 1 << (k % 64)
					r.with[k][i/64] |= 1 << (i % 64)
				}
			}
		}
		return r, true
	}
	return room{}, false
}

// holds reports whether n cells may hold a machine each, or whether the search took too long to tell.
//
// It is a search for cliques with greedy colouring as a bound (Tomita, Seki 2003, Lecture Notes in Computer
// Science 2731): cells that go with none of each other hold one machine together.
func (r room) holds(n int) bool {
	steps := 0
	var deeper func(open cellSet, more int) bool
	deeper = func(open cellSet, more int) bool {
		if more == 0 {
			return true
		}
		if steps++; steps > cellSteps {
			return true
		}
		var order, colour []int
		left := open
		for c := 1; !left.empty(); c++ {
			class := left
			for w := range class {
				for class[w] != 0 {
					v := 64*w + bits.TrailingZeros64(class[w])
					left[w] &^= 1 << (v % 64)
					class[w] &^= 1 << (v % 64)
					for i := range class {
						class[i] &^= r.with[v][i]
					}
					if c >= more { // the others cannot begin a set that is large enough
						order, colour = append(order, v), append(colour, c)
					}
				}
			}
		}
		for i := len(order) - 1; i >= 0; i-- {
			if colour[i] < more {
				return false
			}
			v := order[i]
			var rest cellSet
			for w := range rest {
				rest[w] = open[w] & r.with[v][w]
			}
			if deeper(rest, more-1) {
				return true
			}
			open[v/64] &^= 1 << (v % 64)
		}
		return false
	}
	var all cellSet
	for v := range r.n {
		all[v/64] |= 1 << (v % 64)
	}
	return deeper(all, n)
}
