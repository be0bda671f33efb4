package overlay

import (
	"fmt"
	"math"

	"github.com/twpayne/go-geos"

	"groundtally/geo"
	"groundtally/geo/measure"
)

// FlagShare is the share of a polygon's area above which a repair deserves a look.
const FlagShare = 1e-3

// RepairReport says what Repair did.
type RepairReport struct {
	Changed      bool
	Reason       string  // why the polygon was not valid; empty when only rings were closed or dropped
	ClosedRings  int     // rings whose last position was missing
	DroppedRings int     // rings or lines too short to have an area or a length
	BeforeM2     float64 // area of the rings as they came
	AfterM2      float64
	ChangeShare  float64 // |after − before| / before; 1 when an area came out of nothing
	Flagged      bool    // ChangeShare is above FlagShare
}

// Repair gives a valid geometry. Open rings are closed, rings of fewer than three different positions are
// dropped, polygons that cross themselves or overlap are rebuilt by the library's structure method with
// collapsed pieces discarded, which keeps the area that the rings bound; parts that share edges are
// joined. Positions that are not finite are an error. Lines that have no length and empty parts are
// dropped.
func (e *Engine) Repair(g geo.XYGeometry) (out geo.XYGeometry, rep RepairReport, err error) {
	err = e.do("repair", func() {
		var tidy geo.XYGeometry
		tidy, rep.ClosedRings, rep.DroppedRings = tidied(g)
		rep.Changed = rep.ClosedRings+rep.DroppedRings > 0
		rep.BeforeM2 = measure.AreaM2(tidy)
		out = tidy
		if tidy.Kind == geo.Polygons && plainlyValid(tidy) {
			rep.AfterM2 = rep.BeforeM2
			return
		}
		if !tidy.Empty() {
			raw := e.raw(tidy)
			if tidy.Kind == geo.Polygons && !raw.IsValid() {
				rep.Changed, rep.Reason = true, raw.IsValidReason()
				raw = e.makeValid(raw)
			}
			out = e.give(raw, tidy.Kind)
		}
		rep.AfterM2 = measure.AreaM2(out)
		switch {
		case rep.BeforeM2 > 0:
			rep.ChangeShare = math.Abs(rep.AfterM2-rep.BeforeM2) / rep.BeforeM2
		case rep.AfterM2 > 0:
			rep.ChangeShare = 1
		}
		rep.Flagged = rep.ChangeShare > FlagShare
	})
	return out, rep, err
}

func (e *Engine) makeValid(g *geos.Geom) *geos.Geom {
	return e.own(g.MakeValidWithParams(geos.MakeValidStructure, geos.MakeValidDiscardCollapsed), "make valid")
}

// tidied gives the geometry with rings closed, with rings dropped that cannot be read at all.
func tidied(g geo.XYGeometry) (out geo.XYGeometry, closed, dropped int) {
	out.Kind = g.Kind
	for _, part := range g.Parts {
		var rings [][]geo.XY
		for j, ring := range part {
			switch g.Kind {
			case geo.Polygons:
				if c := measure.Close(ring); len(c) != len(ring) {
					ring = c
					closed++
				}
				if distinct(ring, 3) {
					rings = append(rings, ring)
					continue
				}
			case geo.Lines:
				if distinct(ring, 2) {
					rings = append(rings, ring)
					continue
				}
			default:
				if len(ring) > 0 {
					rings = append(rings, ring)
					continue
				}
			}
			dropped++
			if j == 0 {
				break // holes without an outer ring go with it
			}
		}
		if len(rings) > 0 {
			out.Parts = append(out.Parts, rings)
		}
	}
	return out, closed, dropped
}

// distinct reports whether a ring has at least n different positions.
func distinct(ring []geo.XY, n int) bool {
	var seen []geo.XY
next:
	for _, p := range ring {
		for _, q := range seen {
			if p == q {
				continue next
			}
		}
		if seen = append(seen, p); len(seen) >= n {
			return true
		}
	}
	return false
}

// Valid reports whether the geometry is valid; if not, why.
func (e *Engine) Valid(g geo.XYGeometry) (ok bool, reason string, err error) {
	err = e.do("validity", func() {
		if g.Empty() {
			ok = true
			return
		}
		raw := e.raw(g)
		if ok = raw.IsValid(); !ok {
			reason = raw.IsValidReason()
		}
	})
	return ok, reason, err
}

// Buffer gives the polygons within d metres of the geometry, or for negative d the part of a polygon
// further than −d from its edge. Arcs are polygons with at least SegmentsPerQuadrant segments a quarter
// circle; the radius is enlarged by 0.12 % so that a buffer never holds less, nor an inward one more, than
// the true one. The library fills hollows of an outline that are shallower than 1 % of d, which widens a
// buffer there by up to as much.
func (e *Engine) Buffer(g geo.XYGeometry, d float64) (out geo.XYGeometry, err error) {
	err = e.do("buffer", func() {
		if math.IsNaN(d) || math.IsInf(d, 0) {
			fail("the distance %v is not a number of metres", d)
		}
		out = geo.XYGeometry{Kind: geo.Polygons}
		if g.Empty() {
			return
		}
		out = e.give(e.setback(e.load(g), d), geo.Polygons)
	})
	return out, err
}

// Union joins geometries of one kind.
func (e *Engine) Union(gs ...geo.XYGeometry) (out geo.XYGeometry, err error) {
	err = e.do("union", func() {
		var members []*geos.Geom
		for i, g := range gs {
			if g.Empty() {
				continue
			}
			if out.Kind != geo.NoGeometry && g.Kind != out.Kind {
				fail("geometry %d is a %v, the others are a %v", i+1, g.Kind, out.Kind)
			}
			out.Kind = g.Kind
			members = append(members, e.load(g))
		}
		if len(members) > 0 {
			out = e.give(e.unary(e.collect(members)), out.Kind)
		}
	})
	return out, err
}

// Difference gives the part of a outside b.
func (e *Engine) Difference(a, b geo.XYGeometry) (geo.XYGeometry, error) {
	return e.binary(difference, a, b)
}

// Intersection gives the part of a inside b. Where the shapes only touch nothing remains: the result has
// the lesser of the two kinds.
func (e *Engine) Intersection(a, b geo.XYGeometry) (geo.XYGeometry, error) {
	return e.binary(intersection, a, b)
}

func (e *Engine) binary(op operation, a, b geo.XYGeometry) (out geo.XYGeometry, err error) {
	err = e.do(op.String(), func() {
		out.Kind = a.Kind
		if op == intersection {
			out.Kind = min(a.Kind, b.Kind)
		}
		switch {
		case a.Empty(), op == intersection && b.Empty():
			return
		case b.Empty():
			out = e.give(e.load(a), a.Kind)
			return
		}
		out = e.give(e.overlay(op, e.load(a), e.load(b)), out.Kind)
	})
	return out, err
}

// Clip cuts a geometry to an extent.
func (e *Engine) Clip(g geo.XYGeometry, x geo.Extent) (geo.XYGeometry, error) {
	return e.clipped(g, x, e.load)
}

// ClipValid is Clip of a geometry that Valid has found to be valid, which it does not ask again: of a large
// geometry that is cut to many small extents, asking is most of the work.
func (e *Engine) ClipValid(g geo.XYGeometry, x geo.Extent) (geo.XYGeometry, error) {
	return e.clipped(g, x, e.raw)
}

func (e *Engine) clipped(g geo.XYGeometry, x geo.Extent, load func(geo.XYGeometry) *geos.Geom) (out geo.XYGeometry, err error) {
	err = e.do("clip", func() {
		out.Kind = g.Kind
		if g.Empty() || !x.Meets(geo.ExtentOf(g)) {
			return
		}
		out = e.give(e.clip(load(g), x), g.Kind)
	})
	return out, err
}

// AreaM2 gives the area in m² by the library, parts that overlap counted once.
func (e *Engine) AreaM2(g geo.XYGeometry) (a float64, err error) {
	err = e.do("area", func() {
		if !g.Empty() {
			a = e.load(g).Area()
		}
	})
	return a, err
}

// DistanceM gives the least distance in metres between two geometries, 0 when they meet. Empty geometries
// have no distance: an error.
func (e *Engine) DistanceM(a, b geo.XYGeometry) (d float64, err error) {
	err = e.do("distance", func() {
		if a.Empty() || b.Empty() {
			fail("an empty geometry has no distance")
		}
		d = e.load(a).Distance(e.load(b))
		if math.IsNaN(d) || math.IsInf(d, 0) {
			fail("%w: the distance is %v", ErrNotComputed, d)
		}
	})
	return d, err
}

// Covers reports whether every position of b lies in a or on its edge. An empty b is covered by nothing.
func (e *Engine) Covers(a, b geo.XYGeometry) (yes bool, err error) {
	err = e.do("covers", func() {
		if !a.Empty() && !b.Empty() {
			yes = e.covers(e.load(a), e.load(b))
		}
	})
	return yes, err
}

// Intersects reports whether two geometries share at least a position.
func (e *Engine) Intersects(a, b geo.XYGeometry) (yes bool, err error) {
	err = e.do("intersects", func() {
		if !a.Empty() && !b.Empty() {
			yes = e.load(a).Intersects(e.load(b))
		}
	})
	return yes, err
}

// Outline gives the rings of polygons as lines.
func Outline(g geo.XYGeometry) (geo.XYGeometry, error) {
	if g.Kind != geo.Polygons {
		return geo.XYGeometry{}, fmt.Errorf("a %v has no outline", g.Kind)
	}
	out := geo.XYGeometry{Kind: geo.Lines}
	for _, part := range g.Parts {
		for _, ring := range part {
			out.Parts = append(out.Parts, [][]geo.XY{ring})
		}
	}
	return out, nil
}
