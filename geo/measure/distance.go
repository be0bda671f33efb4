package measure

import (
	"math"

	"groundtally/geo"
)

// NearestOnSegment gives the position of the segment from a to b that lies nearest to p.
//
//	t = (p − a)·(b − a) / |b − a|², held to 0..1
func NearestOnSegment(p, a, b geo.XY) geo.XY {
	d, v := b.Sub(a), p.Sub(a)
	l2 := float64(d.X*d.X) + float64(d.Y*d.Y)
	if l2 == 0 {
		return a
	}
	t := (float64(v.X*d.X) + float64(v.Y*d.Y)) / l2
	switch {
	case t <= 0:
		return a
	case t >= 1:
		return b
	}
	return geo.XY{X: a.X + float64(t*d.X), Y: a.Y + float64(t*d.Y)}
}

// PointToSegmentM gives the distance in metres from p to the segment from a to b.
func PointToSegmentM(p, a, b geo.XY) float64 { return p.Dist(NearestOnSegment(p, a, b)) }

// PointToM gives the distance in metres from p to the geometry: 0 inside a polygon or on its edge. It
// reports false for a geometry without positions.
func PointToM(p geo.XY, g geo.XYGeometry) (float64, bool) {
	if g.Empty() {
		return 0, false
	}
	if g.Kind == geo.Polygons && Inside(p, g) {
		return 0, true
	}
	_, d := NearestOnOutline(p, g)
	return d, true
}

// NearestOnOutline gives the position of the geometry's lines, rings or points that lies nearest to p
// with its distance in metres; +Inf for a geometry without positions. Of equally near positions the
// first in order counts.
func NearestOnOutline(p geo.XY, g geo.XYGeometry) (geo.XY, float64) {
	best, at := math.Inf(1), geo.XY{}
	for _, part := range g.Parts {
		for _, ring := range part {
			if len(ring) == 1 {
				if d := p.Dist(ring[0]); d < best {
					best, at = d, ring[0]
				}
			}
			for i := 1; i < len(ring); i++ {
				q := NearestOnSegment(p, ring[i-1], ring[i])
				if d := p.Dist(q); d < best {
					best, at = d, q
				}
			}
		}
	}
	return at, best
}

// Inside reports whether p lies in the polygons or exactly on their edge. Holes are outside, their edges
// inside. Parts may touch or overlap.
func Inside(p geo.XY, g geo.XYGeometry) bool {
	if g.Kind != geo.Polygons {
		return false
	}
	for _, part := range g.Parts {
		if insidePart(p, part) {
			return true
		}
	}
	return false
}

func insidePart(p geo.XY, part [][]geo.XY) bool {
	in := false
	for _, ring := range part {
		for i := 1; i < len(ring); i++ {
			a, b := ring[i-1], ring[i]
			if (a.Y < p.Y && b.Y < p.Y) || (a.Y > p.Y && b.Y > p.Y) {
				continue
			}
			// Sign of the turn from a over b to p: 0 means p lies on the line through a and b.
			turn := float64((b.X-a.X)*(p.Y-a.Y)) - float64((b.Y-a.Y)*(p.X-a.X))
			if turn == 0 && p.X >= math.Min(a.X, b.X) && p.X <= math.Max(a.X, b.X) {
				return true
			}
			if (a.Y > p.Y) != (b.Y > p.Y) && (turn > 0) == (b.Y > a.Y) {
				in = !in
			}
		}
	}
	return in
}

// AzimuthDeg gives the direction from a to b in degrees clockwise from grid north, 0 ≤ azimuth < 360; 0
// when a equals b. True north needs the convergence of package crs.
func AzimuthDeg(a, b geo.XY) float64 {
	d := b.Sub(a)
	if d == (geo.XY{}) {
		return 0
	}
	az := math.Atan2(d.X, d.Y) * 180 / math.Pi
	if az < 0 {
		az += 360
	}
	if az >= 360 {
		az = 0
	}
	return az
}
