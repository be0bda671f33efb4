package index

import (
	"cmp"
	"slices"

	"groundtally/geo"
)

// curveBits is the number of halvings of a side; 2^16 cells a side part a district of 60 km at 1 m.
const curveBits = 16

// Curve gives the numbers of the extents in an order in which neighbours mostly follow each other: that of
// their centres along a Hilbert curve through the square that holds them all, equal cells in rising order.
// Work done in that order finds what it needs in caches. Empty extents come last.
func Curve(extents []geo.Extent) []int {
	all := geo.EmptyExtent()
	for _, e := range extents {
		if !e.Empty() {
			c := e.Centre()
			all = all.Add(c)
		}
	}
	side := max(all.MaxX-all.MinX, all.MaxY-all.MinY)
	cell := func(v, from float64) uint32 {
		if !(side > 0) {
			return 0
		}
		return uint32(min((v-from)/side*(1<<curveBits), 1<<curveBits-1))
	}
	at := make([]uint64, len(extents))
	order := make([]int, len(extents))
	for i, e := range extents {
		order[i] = i
		if e.Empty() {
			at[i] = 1 << (2 * curveBits)
			continue
		}
		c := e.Centre()
		at[i] = along(cell(c.X, all.MinX), cell(c.Y, all.MinY))
	}
	slices.SortFunc(order, func(a, b int) int { return cmp.Or(cmp.Compare(at[a], at[b]), cmp.Compare(a, b)) })
	return order
}

// along gives how far along the curve a cell lies (Hilbert 1891; the turning of quadrants as in Warren,
// "Hacker's Delight", chapter 16).
func along(x, y uint32) uint64 {
	d := uint64(0)
	for s := uint32(1) << (curveBits - 1); s > 0; s /= 2 {
		var rx, ry uint32
		if x&s > 0 {
			rx = 1
		}
		if y&s > 0 {
			ry = 1
		}
		d = d*4 + uint64((3*rx)^ry)
		if ry == 0 {
			if rx == 1 {
				x, y = ^x, ^y
			}
			x, y = y, x
		}
	}
	return d
}
