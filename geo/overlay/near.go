package overlay

import (
	"math"

	"github.com/twpayne/go-geos"

	"groundtally/geo"
)

// How a polygon lies to a box.
type lying uint8

const (
	apart    lying = iota // no position of the box is in the polygon
	covering              // every position of the box is in the polygon
	meeting               // neither, or too close to tell
)

// lies tells how a part of a valid polygon lies to a box. Where an edge comes within a hair of the box the
// answer is meeting, so that the other two do not depend on rounding.
func lies(part [][]geo.XY, x geo.Extent) lying {
	const hairM = 1e-6
	x = x.Grow(hairM)
	mid := x.Centre()
	odd := false
	for _, ring := range part {
		for i := 1; i < len(ring); i++ {
			a, b := ring[i-1], ring[i]
			if touches(a, b, x, hairM) {
				return meeting
			}
			// No edge comes near the middle, so the crossings of a ray from it are certain.
			if (a.Y > mid.Y) != (b.Y > mid.Y) && a.X+(mid.Y-a.Y)/(b.Y-a.Y)*(b.X-a.X) > mid.X {
				odd = !odd
			}
		}
	}
	if odd {
		return covering
	}
	return apart
}

// touches reports whether an edge may come within a hair of a box; it errs towards yes.
func touches(a, b geo.XY, x geo.Extent, hairM float64) bool {
	if min(a.X, b.X) > x.MaxX || max(a.X, b.X) < x.MinX || min(a.Y, b.Y) > x.MaxY || max(a.Y, b.Y) < x.MinY {
		return false
	}
	// The corners of the box lie on one side of the edge's line: d is the distance of its middle from the
	// line, r that of its farthest corner from the parallel through the middle, both times the edge's length.
	mid, half := x.Centre(), geo.XY{X: (x.MaxX - x.MinX) / 2, Y: (x.MaxY - x.MinY) / 2}
	dx, dy := b.X-a.X, b.Y-a.Y
	d := math.Abs(dx*(mid.Y-a.Y) - dy*(mid.X-a.X))
	r := math.Abs(dx)*(half.Y+hairM) + math.Abs(dy)*(half.X+hairM)
	return d <= r
}

// large keeps polygons of many positions in the library from site to site: reading one again takes longer
// than cutting it to the site. Only polygons that nobody alters may be asked for.
type large struct {
	at    map[*[]geo.XY]kept // by where the rings are stored
	order []*[]geo.XY        // oldest first
	count int                // positions kept
}

type kept struct {
	g     *geos.Geom
	count int
}

const (
	largeFrom = 400     // positions that make a polygon large
	largeMost = 400_000 // positions kept, some 13 MB in the library
)

// of gives the one part of a polygon, which stays the engine's; nil when it is not large.
func (l *large) of(e *Engine, g geo.XYGeometry) *geos.Geom {
	n := g.Count()
	if n < largeFrom || n > largeMost {
		return nil
	}
	key := &g.Parts[0][0]
	if k, ok := l.at[key]; ok {
		return k.g
	}
	for l.count+n > largeMost {
		l.drop()
	}
	if l.at == nil {
		l.at = map[*[]geo.XY]kept{}
	}
	out := e.keep(e.raw(g))
	l.at[key] = kept{out, n}
	l.order = append(l.order, key)
	l.count += n
	return out
}

// drop destroys the oldest.
func (l *large) drop() {
	key := l.order[0]
	l.order = l.order[1:]
	l.count -= l.at[key].count
	l.at[key].g.Destroy()
	delete(l.at, key)
}

func (l *large) forget() {
	for len(l.order) > 0 {
		l.drop()
	}
	l.order = nil
}
