package fit

import (
	"cmp"
	"math"
	"slices"

	"groundtally/geo"
)

const (
	walkStarts = 16  // starting points on each ring
	walkUpTo   = 300 // machines up to which walks are tried
	walkJudged = 8   // walks that the Gain judges
)

// walks gives layouts of at least least machines, those with the most, that begin with machines along the
// boundary, in a fixed order.
func (c *cluster) walks(least int) [][]geo.XY {
	var rings [][]geo.XY // outer ones first
	for _, part := range c.parts {
		if len(part) > 0 {
			rings = append(rings, part[0])
		}
	}
	for _, part := range c.parts {
		if len(part) > 0 {
			rings = append(rings, part[1:]...)
		}
	}
	var sides [4][]geo.XY
	for k := range sides {
		sides[k] = c.fromSide(4 * k)
	}
	var nodes []geo.XY
	if ls := c.lattices(); len(ls) > 0 {
		nodes = ls[0].nodes(c)
	}
	var out [][]geo.XY
	keep := func(at []geo.XY) {
		if len(at) < max(least, 1) {
			return
		}
		if len(at) > least {
			least, out = len(at), nil
		}
		limit := walkJudged
		if c.in.Gain == nil {
			limit = 1
		}
		if len(out) < limit && !slices.ContainsFunc(out, func(o []geo.XY) bool { return slices.Equal(o, at) }) {
			out = append(out, slices.Clone(at))
		}
	}
	var edge, at, open []geo.XY
	for start := range walkStarts {
		for _, back := range []bool{false, true} {
			edge = edge[:0]
			for _, ring := range rings {
				if back {
					ring = slices.Clone(ring)
					slices.Reverse(ring)
				}
				edge = walk(ring, startOf(ring, start), edge)
			}
			for _, side := range sides {
				at = append(at[:0], edge...)
				for _, p := range side {
					if free(p, at, -1) {
						at = append(at, p)
					}
				}
				keep(at)
			}
			// What the lattice leaves open is filled in the order of the candidates.
			at = append(at[:0], edge...)
			open = append(append(open[:0], nodes...), c.points...)
			for _, p := range open {
				if free(p, at, -1) {
					at = append(at, p)
				}
			}
			keep(at)
		}
	}
	return out
}

// startOf gives the way along a ring at which walk number k starts: for the first four the corner
// furthest to the west, east, south, north, then evenly spaced places.
func startOf(ring []geo.XY, k int) float64 {
	if k >= 4 {
		return ringLength(ring) * float64(k-4) / (walkStarts - 4)
	}
	best, at, gone := math.Inf(-1), 0.0, 0.0
	for i, p := range ring {
		if i > 0 {
			gone += ring[i-1].Dist(p)
		}
		if key := [4]float64{-p.X, p.X, -p.Y, p.Y}[k]; key > best {
			best, at = key, gone
		}
	}
	return at
}

// walk goes once around a closed ring from the way start and adds a machine to at wherever it has come far
// enough from all that stand.
func walk(ring []geo.XY, start float64, at []geo.XY) []geo.XY {
	if len(ring) < 2 {
		return at
	}
	first := 1 // edge number, ending at ring[first]
	for gone := 0.0; first < len(ring); first++ {
		l := ring[first-1].Dist(ring[first])
		if gone+l > start {
			start -= gone
			break
		}
		gone += l
	}
	if first >= len(ring) {
		first, start = 1, 0
	}
	n := len(ring) - 1
	for i := range n + 1 {
		k := (first-1+i)%n + 1
		a, b := ring[k-1], ring[k]
		l := a.Dist(b)
		from, to := 0.0, l
		if i == 0 {
			from = start
		}
		if i == n {
			to = start
		}
		if !(l > 0) {
			continue
		}
		u := geo.XY{X: (b.X - a.X) / l, Y: (b.Y - a.Y) / l}
		for from <= to {
			p := geo.XY{X: a.X + float64(from*u.X), Y: a.Y + float64(from*u.Y)}
			clear := true
			for _, q := range at {
				if apart(p, q) {
					continue
				}
				// The circle around q is left at m + √(1 − off²) along the edge.
				v := q.Sub(a)
				m := float64(v.X*u.X) + float64(v.Y*u.Y)
				off := float64(v.Y*u.X) - float64(v.X*u.Y)
				from = math.Max(m+math.Sqrt(math.Max(0, 1-float64(off*off))), from+metricSlack)
				clear = false
				break
			}
			if clear {
				at = append(at, p)
			}
		}
	}
	return at
}

// fromSide gives the candidates in the order in which they are met from one of 16 sides.
func (c *cluster) fromSide(side int) []geo.XY {
	sin, cos := math.Sincos(float64(side) * math.Pi / 8)
	type ranked struct {
		p          geo.XY
		key, cross float64
	}
	order := make([]ranked, len(c.points))
	for i, p := range c.points {
		order[i] = ranked{p, float64(p.X*cos) + float64(p.Y*sin), float64(p.Y*cos) - float64(p.X*sin)}
	}
	slices.SortStableFunc(order, func(a, b ranked) int {
		return cmp.Or(cmp.Compare(a.key, b.key), cmp.Compare(a.cross, b.cross))
	})
	out := make([]geo.XY, len(order))
	for i, o := range order {
		out[i] = o.p
	}
	return out
}
