package overlay

import (
	"cmp"
	"slices"

	"groundtally/geo"
	"groundtally/geo/measure"
)

func compareXY(a, b geo.XY) int { return cmp.Or(cmp.Compare(a.X, b.X), cmp.Compare(a.Y, b.Y)) }

func compareRings(a, b []geo.XY) int { return slices.CompareFunc(a, b, compareXY) }

func compareParts(a, b [][]geo.XY) int { return slices.CompareFunc(a, b, compareRings) }

// normal puts the geometry in the one form that does not depend on the way it was computed: outer rings
// counter-clockwise, holes clockwise, every ring starting at its least position, holes then parts in
// rising order. The geometry is altered.
func normal(g geo.XYGeometry) geo.XYGeometry {
	if g.Kind == geo.Polygons {
		g = measure.Wind(g)
		for _, part := range g.Parts {
			for j, ring := range part {
				part[j] = startAtLeast(ring)
			}
			if len(part) > 2 {
				slices.SortFunc(part[1:], compareRings)
			}
		}
	}
	slices.SortFunc(g.Parts, compareParts)
	return g
}

func startAtLeast(ring []geo.XY) []geo.XY {
	n := len(ring) - 1
	if n < 1 {
		return ring
	}
	k := 0
	for i := 1; i < n; i++ {
		if compareXY(ring[i], ring[k]) < 0 {
			k = i
		}
	}
	if k == 0 {
		return ring
	}
	out := make([]geo.XY, 0, n+1)
	out = append(out, ring[k:n]...)
	out = append(out, ring[:k]...)
	return append(out, ring[k])
}
