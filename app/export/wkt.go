package export

import (
	"fmt"

	"groundtally/geo"
)

// checkGeometry refuses what has no place in longitude and latitude, or a shape that its kind does not
// allow.
func checkGeometry(g geo.LonLatGeometry) error {
	if g.Kind == geo.NoGeometry && len(g.Parts) > 0 {
		return fmt.Errorf("it has positions but no kind of geometry")
	}
	for i, part := range g.Parts {
		if g.Kind != geo.Polygons && len(part) != 1 {
			return fmt.Errorf("part %d: a %s has one ring, this has %d", i+1, g.Kind, len(part))
		}
		if g.Kind == geo.Points && len(part[0]) != 1 {
			return fmt.Errorf("part %d: a point has one position, this has %d", i+1, len(part[0]))
		}
		for _, ring := range part {
			for _, p := range ring {
				if !p.Finite() || p.Lon < -180 || p.Lon > 180 || p.Lat < -90 || p.Lat > 90 {
					return fmt.Errorf("the position %g, %g is not in degrees of longitude and latitude", p.Lon, p.Lat)
				}
			}
		}
	}
	return nil
}

// appendWKT writes a geometry as well-known text (OGC 06-103r4, clause 7).
func appendWKT(dst []byte, g geo.LonLatGeometry) []byte {
	name := [...]string{"", "POINT", "LINESTRING", "POLYGON"}[g.Kind]
	multi := len(g.Parts) > 1
	if multi {
		dst = append(dst, "MULTI"...)
	}
	dst = append(dst, name...)
	if g.Empty() {
		return append(dst, " EMPTY"...)
	}
	dst = append(dst, ' ')
	if multi {
		dst = append(dst, '(')
	}
	for i, part := range g.Parts {
		if i > 0 {
			dst = append(dst, ", "...)
		}
		if len(part) == 0 || len(part[0]) == 0 {
			dst = append(dst, "EMPTY"...)
			continue
		}
		if g.Kind == geo.Polygons {
			dst = append(dst, '(')
		}
		for j, ring := range part {
			if j > 0 {
				dst = append(dst, ", "...)
			}
			dst = appendRing(dst, ring)
		}
		if g.Kind == geo.Polygons {
			dst = append(dst, ')')
		}
	}
	if multi {
		dst = append(dst, ')')
	}
	return dst
}

func appendRing(dst []byte, ring []geo.LonLat) []byte {
	dst = append(dst, '(')
	for i, p := range ring {
		if i > 0 {
			dst = append(dst, ", "...)
		}
		dst = append(appendNumber(dst, p.Lon), ' ')
		dst = appendNumber(dst, p.Lat)
	}
	return append(dst, ')')
}
