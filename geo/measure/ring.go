package measure

import (
	"slices"

	"groundtally/geo"
)

// CounterClockwise reports whether a closed ring runs counter-clockwise; false for a ring without area.
func CounterClockwise(ring []geo.XY) bool { return SignedRingAreaM2(ring) > 0 }

// Wind gives the polygons with every outer ring counter-clockwise, every hole clockwise, as RFC 7946
// section 3.1.6 asks. Other kinds come back unchanged. The input is not altered; rings that already run
// the right way are shared with it.
func Wind[P geo.LonLat | geo.XY](g geo.Geometry[P]) geo.Geometry[P] {
	if g.Kind != geo.Polygons {
		return g
	}
	out := geo.Geometry[P]{Kind: g.Kind, Parts: make([][][]P, len(g.Parts))}
	for i, part := range g.Parts {
		out.Parts[i] = make([][]P, len(part))
		for j, ring := range part {
			a := signedArea(ring)
			if (j == 0 && a < 0) || (j > 0 && a > 0) {
				ring = slices.Clone(ring)
				slices.Reverse(ring)
			}
			out.Parts[i][j] = ring
		}
	}
	return out
}

// Close gives the ring with its first position repeated at the end when it is not there yet.
func Close[P geo.LonLat | geo.XY](ring []P) []P {
	if len(ring) == 0 || ring[0] == ring[len(ring)-1] {
		return ring
	}
	return append(slices.Clone(ring), ring[0])
}

func signedArea[P geo.LonLat | geo.XY](ring []P) float64 {
	xy := make([]geo.XY, len(ring))
	for i, p := range ring {
		switch q := any(p).(type) {
		case geo.XY:
			xy[i] = q
		case geo.LonLat:
			xy[i] = geo.XY{X: q.Lon, Y: q.Lat}
		}
	}
	return SignedRingAreaM2(xy)
}
