package geo

import (
	"errors"
	"fmt"
)

// Kind is the dimension of a geometry.
type Kind uint8

// The kinds of geometry. Every geometry may have many parts.
const (
	NoGeometry Kind = iota
	Points
	Lines
	Polygons
)

func (k Kind) String() string {
	switch k {
	case Points:
		return "point"
	case Lines:
		return "line"
	case Polygons:
		return "polygon"
	}
	return "none"
}

// Geometry holds parts of rings of positions.
//
// Points: each part has one ring with one position. Lines: each part has one ring, the line.
// Polygons: each part is an outer ring followed by its holes; every ring is closed, its last position
// equal to its first.
type Geometry[P LonLat | XY] struct {
	Kind  Kind
	Parts [][][]P
}

// LonLatGeometry is a geometry in degrees; XYGeometry one in metres of the local frame.
type (
	LonLatGeometry = Geometry[LonLat]
	XYGeometry     = Geometry[XY]
)

// Empty reports whether the geometry has no position.
func (g Geometry[P]) Empty() bool {
	for _, part := range g.Parts {
		for _, ring := range part {
			if len(ring) > 0 {
				return false
			}
		}
	}
	return true
}

// Each calls f for every position in order.
func (g Geometry[P]) Each(f func(P)) {
	for _, part := range g.Parts {
		for _, ring := range part {
			for _, p := range ring {
				f(p)
			}
		}
	}
}

// Count gives the number of positions.
func (g Geometry[P]) Count() int {
	n := 0
	for _, part := range g.Parts {
		for _, ring := range part {
			n += len(ring)
		}
	}
	return n
}

// Map gives a geometry of the same shape with every position replaced by f's answer.
func Map[P, Q LonLat | XY](g Geometry[P], f func(P) Q) Geometry[Q] {
	out := Geometry[Q]{Kind: g.Kind, Parts: make([][][]Q, len(g.Parts))}
	for i, part := range g.Parts {
		out.Parts[i] = make([][]Q, len(part))
		for j, ring := range part {
			r := make([]Q, len(ring))
			for k, p := range ring {
				r[k] = f(p)
			}
			out.Parts[i][j] = r
		}
	}
	return out
}

// ExtentOf gives the extent of a geometry in the local frame.
func ExtentOf(g XYGeometry) Extent {
	e := EmptyExtent()
	g.Each(func(p XY) { e = e.Add(p) })
	return e
}

// Shape gives the geometry that positions make: one a point, several a line, four or more that end where they
// began a polygon. Positions beyond 180 by 90 degrees and none at all are errors.
func Shape(ps []LonLat) (LonLatGeometry, error) {
	for _, p := range ps {
		if !p.Finite() || p.Lon < -180 || p.Lon > 180 || p.Lat < -90 || p.Lat > 90 {
			return LonLatGeometry{}, fmt.Errorf("longitude %v, latitude %v is no place in degrees", p.Lon, p.Lat)
		}
	}
	g := LonLatGeometry{Kind: Lines, Parts: [][][]LonLat{{ps}}}
	switch n := len(ps); {
	case n == 0:
		return LonLatGeometry{}, errors.New("there is no position")
	case n == 1:
		g.Kind = Points
	case n > 3 && ps[0] == ps[n-1]:
		g.Kind = Polygons
	}
	return g, nil
}
