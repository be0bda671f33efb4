package tiles

import (
	"image"
	"math"
	"slices"

	"groundtally/geo"
)

// Mark is what is drawn over the map for one selected candidate.
type Mark struct {
	Letter    string   // "A" to "D", shown by the widget at the first parcel
	Parcels   []string // identifiers; their outlines are drawn
	Buildable []geo.LonLatGeometry
	Panels    []geo.LonLatGeometry // fences, or areas of panels
	Rows      []geo.LonLatGeometry // rows of panels, drawn where they are wide enough to tell apart
	Turbines  []geo.LonLat
	Tracks    []geo.LonLatGeometry // new tracks
	Routes    []geo.LonLatGeometry // lines of the connection
	Setbacks  []Setback
}

// Setback is a distance kept from something: the outline of everything nearer than RadiusM to the
// geometry. With no radius the geometry's own outline is drawn.
type Setback struct {
	Geometry geo.LonLatGeometry
	RadiusM  float64
}

// Placed are marks in the plane of a ground.
type Placed struct {
	shapes  []placed
	corners geo.Extent
}

// placed is one shape to draw.
type placed struct {
	as    markKind
	shape geo.XYGeometry
	wideM float64
	box   geo.Extent
}

type markKind uint8

// The kinds of mark, in the order in which they are drawn.
const (
	markBuildable markKind = iota
	markSetback
	markPanels
	markRows
	markParcel
	markTrack
	markRoute
	markTurbine
	markKinds
)

// rowsFromMPerPx is the scale from which rows of panels, some 8 m apart, are drawn.
const rowsFromMPerPx = 2.5

// Place projects marks to the plane of the ground.
func (g *Ground) Place(marks []Mark) *Placed {
	out := &Placed{corners: geo.EmptyExtent()}
	put := func(as markKind, shape geo.XYGeometry, wideM float64) {
		if box := geo.ExtentOf(shape); !box.Empty() {
			box = box.Grow(wideM)
			out.shapes = append(out.shapes, placed{as, shape, wideM, box})
			out.corners = out.corners.Union(box)
		}
	}
	for _, m := range marks {
		for _, id := range m.Parcels {
			if n, ok := g.number[id]; ok {
				put(markParcel, g.parcels.full[n], 0)
			}
		}
		for _, b := range m.Buildable {
			put(markBuildable, project(g.plane, b), 0)
		}
		for _, b := range m.Panels {
			put(markPanels, project(g.plane, b), 0)
		}
		for _, r := range m.Rows {
			// A mark of its own for each row, so that only those in view are drawn.
			for i := range r.Parts {
				one := r
				one.Parts = r.Parts[i : i+1]
				put(markRows, project(g.plane, one), 0)
			}
		}
		for _, r := range m.Tracks {
			put(markTrack, project(g.plane, r), 0)
		}
		for _, r := range m.Routes {
			put(markRoute, project(g.plane, r), 0)
		}
		for _, s := range m.Setbacks {
			put(markSetback, project(g.plane, s.Geometry), s.RadiusM)
		}
		for _, t := range m.Turbines {
			put(markTurbine, geo.XYGeometry{Kind: geo.Points, Parts: [][][]geo.XY{{{g.plane.To(t)}}}}, 0)
		}
	}
	slices.SortStableFunc(out.shapes, func(a, b placed) int { return int(a.as) - int(b.as) })
	return out
}

// Extent gives the extent of all marks in the plane.
func (m *Placed) Extent() geo.Extent { return m.corners }

// Draw draws the marks for the pixels of a rectangle; nil when none falls there.
func (m *Placed) Draw(level int, rect image.Rectangle, style Style) []ink {
	k, px := style.ratio(), MPerPx(level)
	grow := signReach * k * px
	view := geo.Extent{
		MinX: float64(rect.Min.X)*px - grow, MaxX: float64(rect.Max.X)*px + grow,
		MinY: -float64(rect.Max.Y)*px - grow, MaxY: -float64(rect.Min.Y)*px + grow,
	}
	var by [markKinds][]placed
	any := false
	for _, s := range m.shapes {
		if s.box.Meets(view) {
			by[s.as] = append(by[s.as], s)
			any = true
		}
	}
	if !any {
		return nil
	}
	p := newPen(rect, px)
	defer p.done()
	look := style.Look
	line, casing := inkOf(look.Ink), inkOf(look.Casing)
	veil := look.Casing
	veil.A = 70
	each := func(as markKind, c ink, f func(placed)) {
		for _, s := range by[as] {
			f(s)
		}
		p.paint(c)
	}
	stroke := func(width float64, dash ...float64) func(placed) {
		for i := range dash {
			dash[i] *= k
		}
		return func(s placed) { p.stroke(s.shape, width*k, dash...) }
	}
	each(markBuildable, inkOf(veil), func(s placed) { p.fill(s.shape) })
	each(markBuildable, line, stroke(1.1))
	p.rings(by[markSetback], 1.4*k)
	p.paint(casing.part(150))
	p.rings(by[markSetback], 0.6*k)
	p.paint(line)
	each(markPanels, inkOf(veil), func(s placed) { p.fill(s.shape) })
	each(markPanels, casing, stroke(3))
	each(markPanels, line, stroke(1.3, 4, 3))
	if px < rowsFromMPerPx {
		each(markRows, inkOf(look.Ink).part(120), func(s placed) { p.fill(s.shape) })
	}
	each(markParcel, casing, stroke(5))
	each(markParcel, line, stroke(2.4))
	each(markTrack, casing, stroke(3))
	each(markTrack, line, stroke(1))
	each(markRoute, casing, stroke(3.6))
	each(markRoute, line, stroke(1.8, 3, 3.5))
	up := func(s placed) geo.XYGeometry { return p.triangle(s.shape.Parts[0][0][0], k) }
	each(markTurbine, casing, func(s placed) { p.stroke(up(s), 5*k) })
	each(markTurbine, casing, func(s placed) { p.fill(up(s)) })
	each(markTurbine, line, func(s placed) { p.stroke(up(s), 1.8*k) })
	if !p.drawn {
		return nil
	}
	return p.overlay
}

// triangle gives the sign of a turbine at a place, in the plane.
func (p *pen) triangle(at geo.XY, k float64) geo.XYGeometry {
	m := p.mPerPx * k
	a, b, c := geo.XY{X: at.X, Y: at.Y + 6*m}, geo.XY{X: at.X + 5.5*m, Y: at.Y - 4*m}, geo.XY{X: at.X - 5.5*m, Y: at.Y - 4*m}
	return geo.XYGeometry{Kind: geo.Polygons, Parts: [][][]geo.XY{{{a, b, c, a}}}}
}

// rings covers the outlines of setbacks, widthPx on both sides: what is nearer than the radius and half a
// width, less what is nearer than the radius without it. Setbacks of one radius melt into one outline.
func (p *pen) rings(setbacks []placed, halfPx float64) {
	radii := map[float64][]placed{}
	var order []float64
	for _, s := range setbacks {
		if len(radii[s.wideM]) == 0 {
			order = append(order, s.wideM)
		}
		radii[s.wideM] = append(radii[s.wideM], s)
	}
	slices.Sort(order)
	sum := make([]uint8, len(p.cover))
	whole := image.Rectangle{}
	for _, radiusM := range order {
		if radiusM <= 0 {
			for _, s := range radii[radiusM] {
				p.stroke(s.shape, 2*halfPx)
			}
			whole = whole.Union(p.lift(sum, nil))
			continue
		}
		r := radiusM / p.mPerPx
		p.near(radii[radiusM], math.Max(0, r-halfPx))
		inner := make([]uint8, len(p.cover))
		p.lift(inner, nil)
		p.near(radii[radiusM], r+halfPx)
		whole = whole.Union(p.lift(sum, inner))
	}
	copy(p.cover, sum)
	p.dirty = whole
}

// near covers everything within a radius of the shapes, and the inside of polygons.
func (p *pen) near(shapes []placed, radiusPx float64) {
	for _, s := range shapes {
		if s.shape.Kind == geo.Polygons {
			p.fill(s.shape)
		}
		p.stroke(s.shape, 2*radiusPx)
	}
}

// lift moves the cover, less what without has, into sum, and gives where that was.
func (p *pen) lift(sum, without []uint8) image.Rectangle {
	where := p.dirty.Intersect(p.rect)
	for y := where.Min.Y; y < where.Max.Y; y++ {
		for x := where.Min.X; x < where.Max.X; x++ {
			i := (y-p.rect.Min.Y)*p.w + x - p.rect.Min.X
			v := p.cover[i]
			if without != nil {
				v -= min(v, without[i])
			}
			sum[i] = max(sum[i], v)
			p.cover[i] = 0
		}
	}
	p.dirty = image.Rectangle{}
	return where
}
