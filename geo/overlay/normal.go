package overlay

import (
	"cmp"
	"slices"

	"groundtally/geo"
	"groundtally/geo/measure"
)

// compareXY orders positions by X, then Y. Positions are finite.
func compareXY(a, b geo.XY) int {
	switch {
	case a.X < b.X:
		return -1
	case a.X > b.X:
		return 1
	}
	return cmp.Compare(a.Y, b.Y)
}

func compareRings(a, b []geo.XY) int { return slices.CompareFunc(a, b, compareXY) }

func compareParts(a, b [][]geo.XY) int { return slices.CompareFunc(a, b, compareRings) }

// normal puts the geometry in the one form that does not depend on the way it was computed: outer rings
// counter-clockwise, holes clockwise, every ring starting at its least position, holes then parts in
// rising order. The geometry is altered in place: it must not share its rings with anything.
func normal(g geo.XYGeometry) geo.XYGeometry {
	if g.Kind == geo.Polygons {
		for _, part := range g.Parts {
			for j, ring := range part {
				if a := measure.SignedRingAreaM2(ring); (j == 0 && a < 0) || (j > 0 && a > 0) {
					slices.Reverse(ring)
				}
				startAtLeast(ring)
			}
			if len(part) > 2 {
				slices.SortFunc(part[1:], compareRings)
			}
		}
	}
	if len(g.Parts) > 1 {
		slices.SortFunc(g.Parts, compareParts)
	}
	return g
}

// startAtLeast turns a closed ring so that it starts and ends with its least position.
func startAtLeast(ring []geo.XY) {
	n := len(ring) - 1
	if n < 1 {
		return
	}
	k := 0
	for i := 1; i < n; i++ {
		if compareXY(ring[i], ring[k]) < 0 {
			k = i
		}
	}
	if k == 0 {
		return
	}
	slices.Reverse(ring[:k])
	slices.Reverse(ring[k:n])
	slices.Reverse(ring[:n])
	ring[n] = ring[0]
}
