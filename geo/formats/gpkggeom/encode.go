package gpkggeom

import (
	"encoding/binary"
	"fmt"
	"math"

	"groundtally/geo"
)

// Codes of well-known binary, OGC 06-103r4, clause 8.2.3.
const (
	wkbPoint = 1 + iota
	wkbLineString
	wkbPolygon
	wkbMultiPoint
	wkbMultiLineString
	wkbMultiPolygon
	wkbCollection
)

// TypeName gives the name of the geometry type that a table of such geometries declares: POINT,
// LINESTRING, POLYGON, their MULTI forms, or GEOMETRY for NoGeometry, which stands for a mixture.
func TypeName(k geo.Kind, multi bool) string {
	name := "GEOMETRY"
	switch k {
	case geo.Points:
		name = "POINT"
	case geo.Lines:
		name = "LINESTRING"
	case geo.Polygons:
		name = "POLYGON"
	default:
		return name
	}
	if multi {
		return "MULTI" + name
	}
	return name
}

// Append writes the blob of g behind dst. multi asks for a MULTI type even where g has one part; a
// geometry with another number of parts always gets one. The envelope is written for lines and
// polygons. A geometry without a kind, with a coordinate that is not finite, or of a shape that its
// kind does not allow (a point part with other than one position, a line part with other than one
// ring) is refused.
func Append(dst []byte, g geo.LonLatGeometry, srs int32, multi bool) ([]byte, error) {
	if err := check(g); err != nil {
		return dst, err
	}
	multi = multi || len(g.Parts) != 1
	flags := byte(0x01) // little-endian
	empty := g.Empty()
	envelope := !empty && g.Kind != geo.Points
	if envelope {
		flags |= 1 << 1
	}
	if empty {
		flags |= 1 << 4
	}
	dst = append(dst, 'G', 'P', 0, flags)
	dst = binary.LittleEndian.AppendUint32(dst, uint32(srs))
	if envelope {
		minX, maxX, minY, maxY := math.Inf(1), math.Inf(-1), math.Inf(1), math.Inf(-1)
		g.Each(func(p geo.LonLat) {
			minX, maxX = math.Min(minX, p.Lon), math.Max(maxX, p.Lon)
			minY, maxY = math.Min(minY, p.Lat), math.Max(maxY, p.Lat)
		})
		for _, v := range [...]float64{minX, maxX, minY, maxY} {
			dst = appendFloat(dst, v)
		}
	}
	single := uint32(g.Kind) // Points, Lines, Polygons are 1, 2, 3 as in well-known binary
	if multi {
		dst = appendHead(dst, single+3)
		dst = appendCount(dst, len(g.Parts))
	}
	for _, part := range g.Parts {
		dst = appendHead(dst, single)
		switch g.Kind {
		case geo.Points:
			dst = appendPosition(dst, part[0][0])
		case geo.Lines:
			dst = appendRing(dst, part[0])
		default:
			dst = appendCount(dst, len(part))
			for _, ring := range part {
				dst = appendRing(dst, ring)
			}
		}
	}
	return dst, nil
}

func check(g geo.LonLatGeometry) error {
	if g.Kind != geo.Points && g.Kind != geo.Lines && g.Kind != geo.Polygons {
		return fmt.Errorf("geometry kind %d cannot be written as a blob", g.Kind)
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
				if !p.Finite() {
					return fmt.Errorf("part %d: a coordinate is not a finite number", i+1)
				}
			}
		}
	}
	return nil
}

func appendHead(dst []byte, code uint32) []byte {
	return binary.LittleEndian.AppendUint32(append(dst, 1), code)
}

func appendCount(dst []byte, n int) []byte {
	return binary.LittleEndian.AppendUint32(dst, uint32(n))
}

func appendFloat(dst []byte, v float64) []byte {
	return binary.LittleEndian.AppendUint64(dst, math.Float64bits(v))
}

func appendPosition(dst []byte, p geo.LonLat) []byte {
	return appendFloat(appendFloat(dst, p.Lon), p.Lat)
}

func appendRing(dst []byte, ring []geo.LonLat) []byte {
	dst = appendCount(dst, len(ring))
	for _, p := range ring {
		dst = appendPosition(dst, p)
	}
	return dst
}
