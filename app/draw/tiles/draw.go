package tiles

import (
	"context"
	"image"
	"math"
	"slices"

	"groundtally/geo"
)

// SidePx is the side of a tile in pixels.
const SidePx = 256

// Levels of scale: four to an octave, 0 being one metre per pixel; a higher level shows more ground.
const (
	MinLevel = -12
	MaxLevel = 48
)

// MPerPx gives the metres per pixel of a level.
func MPerPx(level int) float64 { return math.Exp2(float64(level) / 4) }

// Key names a tile: its level, and its place counted east and south from the plane's origin.
type Key struct{ Level, X, Y int }

// Rect gives the pixels of the level that the tile covers, x to the east and y to the south of the
// plane's origin.
func (k Key) Rect() image.Rectangle {
	return image.Rect(k.X*SidePx, k.Y*SidePx, (k.X+1)*SidePx, (k.Y+1)*SidePx)
}

// Keys gives the tiles of a level that meet a rectangle of its pixels, nearest to its middle first.
func Keys(level int, r image.Rectangle) []Key {
	if r.Empty() {
		return nil
	}
	var out []Key
	for y := floorDiv(r.Min.Y, SidePx); y*SidePx < r.Max.Y; y++ {
		for x := floorDiv(r.Min.X, SidePx); x*SidePx < r.Max.X; x++ {
			out = append(out, Key{level, x, y})
		}
	}
	far := func(k Key) int {
		dx, dy := (2*k.X+1)*SidePx-r.Min.X-r.Max.X, (2*k.Y+1)*SidePx-r.Min.Y-r.Max.Y
		return dx*dx + dy*dy
	}
	slices.SortStableFunc(out, func(a, b Key) int { return far(a) - far(b) })
	return out
}

// Sizes on the map, in units of line width unless they say metres.
const (
	signReach     = 16  // how far a sign may reach out of its place
	smallestSide  = 3   // parcels smaller than this have no border
	fullSide      = 14  // from this side on a border has its full strength
	smallEdge     = 120 // share of warm, of 255, on parcels too small for an outline
	laneM, mainM  = 4, 7
	maxLaneWidth  = 9
	maxMainWidth  = 14
	lanesUpToMPx  = 60
	casedFromWide = 3
)

// under codes, numbers in Palette.under.
const (
	underPaper uint8 = iota
	underOutside
	underLand
)

// Draw draws the pixels of a rectangle of a level. It gives the context's error when stopped.
func (g *Ground) Draw(ctx context.Context, level int, rect image.Rectangle, style Style) (*Tile, error) {
	m := MPerPx(level)
	p := newPen(rect, m)
	defer p.done()
	t := &Tile{rect: rect}
	d := drawing{ctx: ctx, g: g, p: p, t: t, style: style, look: style.Look, k: style.ratio()}
	grow := signReach * d.k * m
	d.view = geo.Extent{
		MinX: float64(rect.Min.X)*m - grow, MaxX: float64(rect.Max.X)*m + grow,
		MinY: -float64(rect.Max.Y)*m - grow, MaxY: -float64(rect.Min.Y)*m + grow,
	}
	d.district()
	d.parcels()
	d.backdrop()
	d.relief()
	d.borders()
	d.coast()
	for _, s := range g.layers {
		if !slices.Contains(style.Hidden, s.role) {
			d.layer(s)
		}
	}
	if err := ctx.Err(); err != nil {
		clear(p.cover) // an abandoned layer may have left something
		p.dirty = image.Rectangle{}
		return nil, err
	}
	if p.drawn {
		t.overlay = p.overlay
	}
	return t, nil
}

// drawing is the work on one tile.
type drawing struct {
	ctx   context.Context
	g     *Ground
	p     *pen
	t     *Tile
	style Style
	look  Look
	k     float64 // pixels per unit of line width
	view  geo.Extent
	found []int

	number []uint32 // by pixel, as in Tile; nil when no parcel is near
	edge   []uint8
}

// each calls f with every shape that the tile may show, until the drawing is stopped.
func (d *drawing) each(s *shapes, f func(i int, shape geo.XYGeometry)) {
	d.found = s.tree.Search(d.view, d.found[:0])
	all := s.at(d.p.mPerPx)
	for k, i := range d.found {
		if k%64 == 0 && d.ctx.Err() != nil {
			return
		}
		f(i, all[i])
	}
}

func (d *drawing) district() {
	if len(d.g.district.full) == 0 {
		return
	}
	n := d.p.rect.Dx() * d.p.rect.Dy()
	under := make([]uint8, n)
	land := 0
	d.each(d.g.district, func(_ int, shape geo.XYGeometry) {
		d.p.inside(shape, func(row, from, to int) {
			for i := row*d.p.w + from; i < row*d.p.w+to; i++ {
				if under[i] == 0 {
					land++
				}
				under[i] = 1
			}
		})
	})
	switch land {
	case 0:
		d.t.uniform = underOutside
	case n:
		d.t.uniform = underLand
	default:
		for i, v := range under {
			under[i] = underOutside + v*(underLand-underOutside)
		}
		d.t.under = under
	}
}

func (d *drawing) coast() {
	d.each(d.g.district, func(_ int, shape geo.XYGeometry) { d.p.stroke(shape, 1.2*d.k) })
	d.p.paint(inkOf(d.look.Coast))
}

// parcels writes the parcels' numbers.
func (d *drawing) parcels() {
	p, s := d.p, d.g.parcels
	if slices.Contains(d.style.Hidden, s.role) || len(s.tree.Search(d.view, d.found[:0])) == 0 {
		return
	}
	n := p.rect.Dx() * p.rect.Dy()
	number, edge := make([]uint32, n), make([]uint8, n)
	d.number, d.edge = number, edge
	any := false
	d.each(s, func(i int, shape geo.XYGeometry) {
		box := s.boxes[i]
		if box.MaxX-box.MinX <= p.mPerPx && box.MaxY-box.MinY <= p.mPerPx {
			// Smaller than a pixel, it may hold no pixel's centre; a lone one must still be seen.
			c := box.Centre()
			x, y := floor(c.X/p.mPerPx)-p.rect.Min.X, floor(-c.Y/p.mPerPx)-p.rect.Min.Y
			if x >= 0 && y >= 0 && x < p.w && y < p.rect.Dy() && number[y*p.w+x] == 0 {
				number[y*p.w+x], edge[y*p.w+x], any = uint32(i+1), smallEdge, true
			}
			return
		}
		whole := uint8(0)
		if d.g.sizeM[i]/p.mPerPx < smallestSide*d.k {
			whole = smallEdge
		}
		p.inside(shape, func(row, from, to int) {
			any = true
			for at := row*p.w + from; at < row*p.w+to; at++ {
				number[at], edge[at] = uint32(i+1), whole
			}
		})
	})
	if any {
		d.t.parcel, d.t.edge = number, edge
	}
}

// borders draws the lines between parcels. All numbers must be written, as a parcel's edge is where its own
// pixels are near its outline.
func (d *drawing) borders() {
	p, s := d.p, d.g.parcels
	number, edge := d.number, d.edge
	if number == nil {
		return
	}
	d.each(s, func(i int, shape geo.XYGeometry) {
		side := d.g.sizeM[i] / p.mPerPx / d.k
		if side < smallestSide {
			return
		}
		b := border{
			half:     math.Max(0.5, math.Min(0.9, side*0.02)) * d.k,
			band:     math.Max(0.7, math.Min(2.4, side*0.1)) * d.k,
			strength: 255 * math.Min(1, 0.25+0.75*(side-smallestSide)/(fullSide-smallestSide)),
			parcel:   uint32(i + 1),
		}
		for _, rings := range shape.Parts {
			for _, ring := range rings {
				at := p.px(ring)
				for k := 1; k < len(at); k++ {
					p.border(at[k-1], at[k], b, number, edge)
				}
			}
		}
	})
	p.paint(inkOf(d.look.Border))
}

// border is how the outline of a parcel is drawn, in pixels.
type border struct {
	half, band float64
	strength   float64 // of the line, up to 255
	parcel     uint32
}

// border covers the line between parcels and marks the parcel's own pixels beside it as its edge.
func (p *pen) border(a, b geo.XY, o border, number []uint32, edge []uint8) {
	wide := o.half + o.band
	reach := wide + 0.5
	y0, y1 := max(floor(math.Min(a.Y, b.Y)-reach), p.rect.Min.Y), min(ceil(math.Max(a.Y, b.Y)+reach), p.rect.Max.Y)
	x0, x1 := max(floor(math.Min(a.X, b.X)-reach), p.rect.Min.X), min(ceil(math.Max(a.X, b.X)+reach), p.rect.Max.X)
	if y0 >= y1 || x0 >= x1 {
		return
	}
	d := b.Sub(a)
	len2 := d.X*d.X + d.Y*d.Y
	perLen2, slant := 1/len2, math.Inf(1)
	if d.Y != 0 {
		slant = reach * math.Sqrt(len2) / math.Abs(d.Y)
	}
	p.dirty = p.dirty.Union(image.Rect(x0, y0, x1, y1))
	for y := y0; y < y1; y++ {
		py := float64(y) + 0.5 - a.Y
		from, to := x0, x1
		if slant < float64(x1-x0) {
			x := a.X + py*d.X/d.Y
			from, to = max(from, floor(x-slant)), min(to, ceil(x+slant)+1)
		}
		for x := from; x < to; x++ {
			px, qy := float64(x)+0.5-a.X, py
			if t := px*d.X + qy*d.Y; t >= len2 {
				px, qy = px-d.X, qy-d.Y
			} else if t > 0 {
				t *= perLen2
				px, qy = px-t*d.X, qy-t*d.Y
			}
			d2 := px*px + qy*qy
			if d2 >= reach*reach {
				continue
			}
			at := (y-p.rect.Min.Y)*p.w + x - p.rect.Min.X
			near := reach - math.Sqrt(d2)
			if number[at] == o.parcel {
				if c := uint8(255 * min(near, 1)); c > edge[at] {
					edge[at] = c
				}
			}
			if near -= o.band; near > 0 {
				if c := uint8(o.strength * min(near, 1)); c > p.cover[at] {
					p.cover[at] = c
				}
			}
		}
	}
}

// layer draws one of the other layers.
func (d *drawing) layer(s *shapes) {
	switch {
	case s.role == "water":
		d.water(s)
	case s.role == "roads" && s.kind == geo.Lines:
		d.roads(s)
	case s.role == "grid_lines" && s.kind == geo.Lines:
		d.lines(s, 2.8, d.look.Casing.A/2)
		d.each(s, func(_ int, shape geo.XYGeometry) { d.p.stroke(shape, 1.4*d.k, 6*d.k, 3*d.k, 1.5*d.k, 3*d.k) })
		d.p.paint(inkOf(d.look.Power))
	case s.role == "dwellings":
		d.dwellings(s)
	case s.role == "substations":
		d.substations(s)
	case s.kind == geo.Points:
		side := max(2, int(3*d.k+0.5))
		d.each(s, func(_ int, shape geo.XYGeometry) {
			for _, part := range shape.Parts {
				d.p.box(d.p.px(part[0])[0], side)
			}
		})
		d.p.paint(inkOf(d.look.Area))
	default:
		// Thin and dotted: a fill would change the parcels' colours, and hatching means unknown.
		d.each(s, func(_ int, shape geo.XYGeometry) { d.p.stroke(shape, 1.1*d.k, 1.2*d.k, 2.6*d.k) })
		d.p.paint(inkOf(d.look.Area))
	}
}

// lines draws the light casing of a layer of lines.
func (d *drawing) lines(s *shapes, width float64, opacity uint8) {
	d.each(s, func(_ int, shape geo.XYGeometry) { d.p.stroke(shape, width*d.k) })
	c := d.look.Casing
	c.A = opacity
	d.p.paint(inkOf(c))
}

func (d *drawing) water(s *shapes) {
	if s.kind == geo.Polygons {
		d.each(s, func(_ int, shape geo.XYGeometry) { d.p.fill(shape) })
		d.p.paint(inkOf(d.look.Water))
	}
	d.each(s, func(_ int, shape geo.XYGeometry) { d.p.stroke(shape, 1.1*d.k) })
	d.p.paint(inkOf(d.look.Shore))
}

// roads draws lesser roads as plain lines, main roads with an edge on both sides once there is room.
func (d *drawing) roads(s *shapes) {
	metrePx := 1 / d.p.mPerPx / d.k
	lane := math.Max(0.9, math.Min(maxLaneWidth, laneM*metrePx))
	main := math.Max(2, math.Min(maxMainWidth, mainM*metrePx))
	pick := func(wantMain bool, width float64, c ink) {
		d.each(s, func(i int, shape geo.XYGeometry) {
			if (s.class[i] == "main") == wantMain {
				d.p.stroke(shape, width*d.k)
			}
		})
		d.p.paint(c)
	}
	road, fill := inkOf(d.look.Road), inkOf(d.look.RoadFill)
	if d.p.mPerPx*d.k <= lanesUpToMPx {
		pick(false, lane, road)
	}
	pick(true, main, road)
	if lane >= casedFromWide {
		pick(false, lane-1.6, fill)
	}
	if main >= casedFromWide {
		pick(true, main-1.6, fill)
	}
}

func (d *drawing) dwellings(s *shapes) {
	// A house is about 10 m wide; far out it stays a dot that can still be seen.
	side := max(2, min(int(10/d.p.mPerPx+0.5), int(6*d.k+0.5)))
	if d.p.mPerPx*d.k > 40 {
		side = max(1, int(d.k))
	}
	d.each(s, func(_ int, shape geo.XYGeometry) {
		if s.kind != geo.Points {
			d.p.fill(shape)
		}
		for _, part := range shape.Parts {
			d.p.box(d.p.px(part[0])[0], side)
		}
	})
	d.p.paint(inkOf(d.look.Dwelling))
}

func (d *drawing) substations(s *shapes) {
	d.each(s, func(i int, _ geo.XYGeometry) {
		c := s.boxes[i].Centre()
		d.p.station(geo.XY{X: c.X / d.p.mPerPx, Y: -c.Y / d.p.mPerPx}, d.look, d.k)
	})
}

// station paints the sign of a substation at a place in pixels.
func (p *pen) station(at geo.XY, look Look, k float64) {
	side := int(10*k + 0.5)
	p.box(at, side+2)
	p.paint(inkOf(look.Casing))
	p.box(at, side)
	p.paint(inkOf(look.Power))
	p.box(at, side-2*max(1, int(2*k)))
	p.paint(inkOf(look.Casing))
}
