package index

import (
	"cmp"
	"math"
	"slices"

	"groundtally/geo"
)

// fanOut is the number of children of a node; 16 boxes of 32 bytes fill eight cache lines.
const fanOut = 16

// Tree is a packed tree of extents. It is read-only after New, so any number of goroutines may search it.
//
// It is built by sort-tile-recursive packing (Leutenegger, Lopez, Edgington 1997, "STR: a simple and
// efficient algorithm for R-tree packing"): boxes are sorted by the X of their centres, cut into √(n/16)
// upright slices, each slice sorted by Y, sixteen neighbours to a node; the levels above group the nodes
// in that order.
type Tree struct {
	n      int
	boxes  []geo.Extent // level by level, leaves first
	levels []int        // where each level starts in boxes; the last entry is len(boxes)
	ids    []int32      // number of each leaf's box in the slice given to New
}

// New packs the extents. Their numbers are their positions in the slice. Empty extents are kept out and
// never found.
func New(extents []geo.Extent) *Tree {
	t := &Tree{}
	order := make([]int32, 0, len(extents))
	for i, e := range extents {
		if !e.Empty() && e == e { // a box with a NaN is unequal to itself
			order = append(order, int32(i))
		}
	}
	n := len(order)
	t.n = n
	if n == 0 {
		return t
	}
	byX := func(a, b int32) int {
		return cmp.Or(cmp.Compare(extents[a].Centre().X, extents[b].Centre().X), cmp.Compare(a, b))
	}
	byY := func(a, b int32) int {
		return cmp.Or(cmp.Compare(extents[a].Centre().Y, extents[b].Centre().Y), cmp.Compare(a, b))
	}
	slices.SortFunc(order, byX)
	nodes := (n + fanOut - 1) / fanOut
	perSlice := int(math.Ceil(math.Sqrt(float64(nodes)))) * fanOut
	for i := 0; i < n; i += perSlice {
		slices.SortFunc(order[i:min(i+perSlice, n)], byY)
	}
	t.ids = order
	t.boxes = make([]geo.Extent, 0, n+n/(fanOut-1)+8)
	for _, id := range order {
		t.boxes = append(t.boxes, extents[id])
	}
	t.levels = []int{0}
	for from, to := 0, n; ; from, to = to, len(t.boxes) {
		t.levels = append(t.levels, to)
		if to-from == 1 {
			break
		}
		for i := from; i < to; i += fanOut {
			b := geo.EmptyExtent()
			for _, c := range t.boxes[i:min(i+fanOut, to)] {
				b = b.Union(c)
			}
			t.boxes = append(t.boxes, b)
		}
	}
	return t
}

// Of packs the extents of geometries, each grown by growM metres.
func Of(geometries []geo.XYGeometry, growM float64) *Tree {
	es := make([]geo.Extent, len(geometries))
	for i, g := range geometries {
		es[i] = geo.ExtentOf(g)
		if !es[i].Empty() {
			es[i] = es[i].Grow(growM)
		}
	}
	return New(es)
}

// Len gives the number of extents that can be found.
func (t *Tree) Len() int { return t.n }

// Extent gives the extent of everything in the tree.
func (t *Tree) Extent() geo.Extent {
	if t.n == 0 {
		return geo.EmptyExtent()
	}
	return t.boxes[len(t.boxes)-1]
}

// Search appends to buf the numbers of all extents that share at least a point with e, in rising order,
// and gives buf. The answer does not depend on how the tree was packed.
func (t *Tree) Search(e geo.Extent, buf []int) []int {
	if t.n == 0 || e.Empty() {
		return buf
	}
	from := len(buf)
	buf = t.search(e, len(t.levels)-2, 0, buf)
	slices.Sort(buf[from:])
	return buf
}

func (t *Tree) search(e geo.Extent, level, node int, buf []int) []int {
	if !t.boxes[t.levels[level]+node].Meets(e) {
		return buf
	}
	if level == 0 {
		return append(buf, int(t.ids[node]))
	}
	size := t.levels[level] - t.levels[level-1]
	for c := node * fanOut; c < min((node+1)*fanOut, size); c++ {
		buf = t.search(e, level-1, c, buf)
	}
	return buf
}
