package measure

import (
	"cmp"
	"math"
	"slices"

	"groundtally/geo"
)

// SignedRingAreaM2 gives the area of a closed ring in m², positive when the ring runs counter-clockwise.
//
//	A = ½ Σ (xᵢ·yᵢ₊₁ − xᵢ₊₁·yᵢ)
//
// with coordinates taken from the ring's first position, which keeps digits when the ring lies far from
// the origin. A ring that is not closed is closed by the sum; fewer than three positions give 0.
// Source: the shoelace formula (Meister 1769).
func SignedRingAreaM2(ring []geo.XY) float64 {
	if len(ring) < 3 {
		return 0
	}
	o := ring[0]
	sum := 0.0
	for i := 1; i+1 < len(ring); i++ {
		p, q := ring[i].Sub(o), ring[i+1].Sub(o)
		sum += float64(p.X*q.Y) - float64(q.X*p.Y)
	}
	return sum / 2
}

// AreaM2 gives the area of a polygon geometry in m²: outer rings less their holes, whatever way the
// rings run. Points and lines have the area 0. The parts are taken as not overlapping.
func AreaM2(g geo.XYGeometry) float64 {
	if g.Kind != geo.Polygons {
		return 0
	}
	sum := 0.0
	for _, part := range g.Parts {
		for i, ring := range part {
			a := math.Abs(SignedRingAreaM2(ring))
			if i > 0 {
				a = -a
			}
			sum += a
		}
	}
	return sum
}

// AreaBelowM2 is the area of what of g lies below a line from west to east at yM, in the square of the unit of the
// positions; 0 for points and lines. Rings are taken as AreaM2 takes them. By Green's theorem it is the
// integral of max(0, y - y(s)) dx along each ring.
func AreaBelowM2(g geo.XYGeometry, yM float64) float64 {
	if g.Kind != geo.Polygons {
		return 0
	}
	var sum float64
	for _, part := range g.Parts {
		for i, ring := range part {
			a := math.Abs(ringBelow(ring, yM))
			if i > 0 {
				a = -a
			}
			sum += a
		}
	}
	return sum
}

func ringBelow(ring []geo.XY, y float64) float64 {
	var sum float64
	for i := 1; i < len(ring); i++ {
		a, b := ring[i-1], ring[i]
		low, high := y-a.Y, y-b.Y // depths below the line
		dx := b.X - a.X
		switch {
		case low <= 0 && high <= 0:
		case low >= 0 && high >= 0:
			sum += float64(dx * (low + high) / 2)
		default:
			deep := math.Max(low, high)
			sum += float64(dx * deep * deep / (2 * math.Abs(low-high)))
		}
	}
	return sum
}

// LengthM gives the length of lines, or the length of all rings of polygons, in metres; 0 for points.
func LengthM(g geo.XYGeometry) float64 {
	if g.Kind != geo.Lines && g.Kind != geo.Polygons {
		return 0
	}
	sum := 0.0
	for _, part := range g.Parts {
		for _, ring := range part {
			for i := 1; i < len(ring); i++ {
				sum += ring[i].Dist(ring[i-1])
			}
		}
	}
	return sum
}

// Centroid gives the centre of mass: of the area for polygons, of the length for lines, of the positions
// for points. Polygons without area fall back to their rings' length, lines without length to their
// positions. It reports false for a geometry without positions. The centroid of a bent polygon may lie
// outside it: see InteriorPoint.
//
//	x̄ = Σ (xᵢ + xᵢ₊₁)(xᵢ·yᵢ₊₁ − xᵢ₊₁·yᵢ) / 6A, likewise ȳ
func Centroid(g geo.XYGeometry) (geo.XY, bool) {
	e := geo.ExtentOf(g)
	if e.Empty() {
		return geo.XY{}, false
	}
	o := e.Centre()
	if g.Kind == geo.Polygons {
		var sx, sy, sa float64
		for _, part := range g.Parts {
			for i, ring := range part {
				var rx, ry, ra float64
				for k := 0; k+1 < len(ring); k++ {
					p, q := ring[k].Sub(o), ring[k+1].Sub(o)
					c := float64(p.X*q.Y) - float64(q.X*p.Y)
					ra += c
					rx += float64((p.X + q.X) * c)
					ry += float64((p.Y + q.Y) * c)
				}
				sign := 1.0
				if (ra < 0) != (i > 0) {
					sign = -1
				}
				sa += sign * ra
				sx += sign * rx
				sy += sign * ry
			}
		}
		if sa > 0 {
			return geo.XY{X: o.X + sx/(3*sa), Y: o.Y + sy/(3*sa)}, true
		}
	}
	if g.Kind == geo.Polygons || g.Kind == geo.Lines {
		var sx, sy, sl float64
		for _, part := range g.Parts {
			for _, ring := range part {
				for k := 0; k+1 < len(ring); k++ {
					p, q := ring[k].Sub(o), ring[k+1].Sub(o)
					l := p.Dist(q)
					sl += l
					sx += float64((p.X + q.X) / 2 * l)
					sy += float64((p.Y + q.Y) / 2 * l)
				}
			}
		}
		if sl > 0 {
			return geo.XY{X: o.X + sx/sl, Y: o.Y + sy/sl}, true
		}
	}
	var sx, sy, n float64
	g.Each(func(p geo.XY) { sx += p.X - o.X; sy += p.Y - o.Y; n++ })
	return geo.XY{X: o.X + sx/n, Y: o.Y + sy/n}, true
}

// ConvexHull gives the smallest convex polygon around positions, counter-clockwise; empty when they lie on one
// line. It is Andrew's monotone chain (Andrew 1979, Information Processing Letters 9).
func ConvexHull(ps []geo.XY) geo.XYGeometry {
	out := geo.XYGeometry{Kind: geo.Polygons}
	ps = slices.Clone(ps)
	slices.SortFunc(ps, func(a, b geo.XY) int { return cmp.Or(cmp.Compare(a.X, b.X), cmp.Compare(a.Y, b.Y)) })
	ps = slices.Compact(ps)
	left := func(a, b, c geo.XY) bool {
		u, v := b.Sub(a), c.Sub(a)
		return float64(u.X*v.Y)-float64(u.Y*v.X) > 0
	}
	half := func(ps []geo.XY) []geo.XY {
		var h []geo.XY
		for _, p := range ps {
			for len(h) > 1 && !left(h[len(h)-2], h[len(h)-1], p) {
				h = h[:len(h)-1]
			}
			h = append(h, p)
		}
		return h
	}
	lower := half(ps)
	slices.Reverse(ps)
	upper := half(ps)
	if len(lower)+len(upper) < 5 { // a triangle has three corners, the first and last of which stand twice
		return out
	}
	out.Parts = [][][]geo.XY{{append(lower[:len(lower):len(lower)], upper[1:]...)}}
	return out
}
