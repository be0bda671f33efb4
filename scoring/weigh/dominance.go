package weigh

import (
	"container/heap"
	"errors"
	"fmt"
	"math"
	"math/bits"
	"slices"
)

// Dominates reports whether a is at least as good as b on every key and better on one. Equal vectors do
// not dominate each other. a and b must be of equal length.
func Dominates(a, b []float64) bool {
	better := false
	for k := range a {
		if a[k] < b[k] {
			return false
		}
		better = better || a[k] > b[k]
	}
	return better
}

// SurelyDominates reports whether a dominates b whatever values both take within their intervals:
// low_a >= high_b on every key, with > on one.
func SurelyDominates(lowA, highB []float64) bool { return Dominates(lowA, highB) }

// Front gives the rows that no other row dominates, in rising order of index. values is row-major with
// d columns. Rows are sorted by falling sum and compared with the front found so far, since a row's
// dominator has the higher sum (Chomicki et al. 2003). The time grows with rows times front.
func Front(values []float64, d int) ([]int, error) {
	if d < 1 || len(values)%d != 0 {
		return nil, fmt.Errorf("front: %d values do not fill rows of %d", len(values), d)
	}
	if !finite(values...) {
		return nil, errors.New("front: a value is not finite")
	}
	n := len(values) / d
	row := func(i int) []float64 { return values[i*d : i*d+d] }
	sum, idx := make([]float64, n), make([]int, n)
	for i := range idx {
		idx[i] = i
		for _, v := range row(i) {
			sum[i] += v
		}
	}
	slices.SortFunc(idx, func(a, b int) int {
		if c := compareFloat(sum[b], sum[a]); c != 0 {
			return c
		}
		// Rounding can make the sums of a row and its dominator equal; the dominator still comes first.
		if c := slices.Compare(row(b), row(a)); c != 0 {
			return c
		}
		return a - b
	})
	var front []int
	for _, i := range idx {
		if !slices.ContainsFunc(front, func(f int) bool { return Dominates(row(f), row(i)) }) {
			front = append(front, i)
		}
	}
	slices.Sort(front)
	return front, nil
}

// ExpectedFront gives the mean size of the front of n rows with d independent continuous keys.
//
//	E(n, 1) = 1,   E(n, d) = sum_{i=1..n} E(i, d-1)/i
//
// It shows why the front is no filter for many keys. Source: Bentley et al. 1978; Godfrey 2004.
func ExpectedFront(n, d int) (float64, error) {
	if n < 1 || d < 1 {
		return 0, fmt.Errorf("expected front: %d rows of %d keys", n, d)
	}
	e := make([]float64, n)
	for i := range e {
		e[i] = 1
	}
	for range d - 1 {
		s := 0.0
		for i := range e {
			s += e[i] / float64(i+1)
			e[i] = s
		}
	}
	return e[n-1], nil
}

// dominanceBlock is how many ranks one cumulative bit set covers.
const dominanceBlock = 128

// dominators looks, for the items at the first places, for items that dominate them, and gives their
// places in rising order, at most few of each. Dominators always stand above, so a look at the first
// places alone is exact for these. Items that are not complete take no part.
//
// For every key the items are sorted by falling value, and the set of the best 128, 256, … is kept as
// bits by place. Whatever dominates an item lies in the set that reaches down to the item's value, for
// every key at once; the few that lie in all sets are compared in full. The time is at worst
// places^2 keys/128 word operations, whatever the data.
func (m *matrix) dominators(order []int, places, few int) [][]int {
	places = min(places, len(order))
	by := make([][]int, places)
	var rows []int // places of the complete items; a bit stands for a position in this list
	for p, i := range order[:places] {
		if m.complete[i] {
			rows = append(rows, p)
		}
	}
	n, words := len(rows), (len(rows)+63)/64
	type column struct {
		sets  [][]uint64
		block []int32 // the set to look in, by position
	}
	cols := make([]column, 0, len(m.weighed))
	value, sorted := make([]float64, n), make([]int, n)
	for _, k := range m.weighed {
		for b, p := range rows {
			value[b], sorted[b] = m.mid[order[p]*m.d+k], b
		}
		slices.SortFunc(sorted, func(a, b int) int { return compareFloat(value[b], value[a]) })
		c := column{block: make([]int32, n)}
		set := make([]uint64, words)
		for start := 0; start < n; start += dominanceBlock {
			for _, b := range sorted[start:min(start+dominanceBlock, n)] {
				set[b/64] |= 1 << (b % 64)
			}
			c.sets = append(c.sets, slices.Clone(set))
		}
		for r := 0; r < n; {
			end := r + 1 // equal values reach down together
			for end < n && value[sorted[end]] == value[sorted[r]] {
				end++
			}
			for ; r < end; r++ {
				c.block[sorted[r]] = int32((end - 1) / dominanceBlock)
			}
		}
		cols = append(cols, c)
	}
	sets := make([][]uint64, len(cols))
	for b, p := range rows {
		for c := range cols {
			sets[c] = cols[c].sets[cols[c].block[b]]
		}
	search:
		for w := 0; w <= b/64; w++ {
			x := ^uint64(0)
			if w == b/64 {
				x = 1<<(b%64) - 1 // only what stands above
			}
			for _, set := range sets {
				if x &= set[w]; x == 0 {
					continue search
				}
			}
			for ; x != 0; x &= x - 1 {
				q := rows[w*64+bits.TrailingZeros64(x)]
				if m.dominatesRow(order[q], order[p]) {
					if by[p] = append(by[p], q); len(by[p]) == few {
						break search
					}
				}
			}
		}
	}
	return by
}

// settle orders items of equal score by id, except that a dominated one comes after its dominators.
// Within one step of the tie grid this can only concern differences too small for the score to show.
func (m *matrix) settle(items []int) {
	slices.SortFunc(items, m.byID)
	if len(items) < 2 {
		return
	}
	// A projection with uneven factors: a dominator in the same step of the grid lies at most 1.5
	// steps above, while other vectors of equal score are scattered, so that few pairs need a look.
	proj := make(map[int]float64, len(items))
	var whole []int
	for _, i := range items {
		if !m.complete[i] {
			continue
		}
		s := 0.0
		for _, k := range m.weighed {
			_, frac := math.Modf(float64(k+1) * 0.6180339887498949)
			s += float64(float64((1+frac/2)*m.w[k]) * m.mid[i*m.d+k])
		}
		proj[i] = s
		whole = append(whole, i)
	}
	slices.SortStableFunc(whole, func(a, b int) int {
		if c := compareFloat(proj[a], proj[b]); c != 0 {
			return c
		}
		return m.compareRows(a, b)
	})
	// Classes of equal vectors, so that many copies of one candidate cost nothing.
	var class [][]int
	for _, i := range whole {
		if n := len(class); n > 0 && m.compareRows(class[n-1][0], i) == 0 {
			class[n-1] = append(class[n-1], i)
		} else {
			class = append(class, []int{i})
		}
	}
	above := make([][]int, len(class)) // classes that a class dominates
	open := make([]int, len(class))    // dominating items not yet placed
	any := false
	for a := range class {
		for b := a + 1; b < len(class); b++ {
			i, j := class[a][0], class[b][0]
			if proj[j]-proj[i] > 2*tieStep {
				break
			}
			if m.dominatesRow(j, i) {
				above[b] = append(above[b], a)
				open[a] += len(class[b])
				any = true
			}
		}
	}
	if !any {
		return
	}
	classOf := make(map[int]int, len(whole))
	for c, is := range class {
		for _, i := range is {
			classOf[i] = c
		}
	}
	ready := &idHeap{m: m}
	for _, i := range items {
		if c, ok := classOf[i]; !ok || open[c] == 0 {
			heap.Push(ready, i)
		}
	}
	for p := range items {
		i := heap.Pop(ready).(int)
		items[p] = i
		c, ok := classOf[i]
		if !ok {
			continue
		}
		for _, a := range above[c] {
			if open[a]--; open[a] == 0 {
				for _, j := range class[a] {
					heap.Push(ready, j)
				}
			}
		}
	}
}

func (m *matrix) compareRows(a, b int) int {
	for _, k := range m.weighed {
		if c := compareFloat(m.mid[a*m.d+k], m.mid[b*m.d+k]); c != 0 {
			return c
		}
	}
	return 0
}

func (m *matrix) dominatesRow(a, b int) bool {
	better := false
	for _, k := range m.weighed {
		va, vb := m.mid[a*m.d+k], m.mid[b*m.d+k]
		if va < vb {
			return false
		}
		better = better || va > vb
	}
	return better
}

// surely reports SurelyDominates for two items over the weighed keys.
func (m *matrix) surely(a, b int) bool {
	better := false
	for _, k := range m.weighed {
		la, hb := m.low[a*m.d+k], m.high[b*m.d+k]
		if la < hb {
			return false
		}
		better = better || la > hb
	}
	return better
}

type idHeap struct {
	m     *matrix
	items []int
}

func (h *idHeap) Len() int           { return len(h.items) }
func (h *idHeap) Less(a, b int) bool { return h.m.byID(h.items[a], h.items[b]) < 0 }
func (h *idHeap) Swap(a, b int)      { h.items[a], h.items[b] = h.items[b], h.items[a] }
func (h *idHeap) Push(x any)         { h.items = append(h.items, x.(int)) }
func (h *idHeap) Pop() any {
	n := len(h.items) - 1
	x := h.items[n]
	h.items = h.items[:n]
	return x
}
