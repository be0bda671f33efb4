package tiles

import (
	"encoding/binary"
	"image"
	"image/color"
)

// Classes of parcels that have no colour. Unknown is hatched, and nothing else is; Bare is a parcel
// without any candidate.
const (
	Unknown uint8 = 255 - iota
	Bare
)

// Shading gives every parcel its colour. It must not be changed after it was handed over.
type Shading struct {
	Class   []uint8       // by parcel: a number in Colours, Unknown or Bare; parcels beyond its end are Bare
	Colours []color.NRGBA // by class, ordered as the legend is
	Over    []bool        // by parcel: over a limit, which gives a warm outline; may be shorter
}

// Palette is a shading made ready for a look.
type Palette struct {
	fill  []ink // by parcel number + 1; opacity 0 for hatched and bare parcels
	over  []bool
	under [3]ink
	bare  ink
	hatch [hatchPeriodPx]ink
	warm  ink
	step  int // pixels per step of the hatching
}

// hatchPeriodPx is the distance of hatch lines along a row of pixels, in units of line width.
const hatchPeriodPx = 7

// hatchInk is how much of the hatch colour each column of the pattern has; the line's edge is softened.
var hatchInk = [hatchPeriodPx]uint8{200, 110, 0, 0, 0, 0, 110}

const hatched ink = 1 // a mark in Palette.fill

// NewPalette makes a shading of so many parcels ready.
func NewPalette(s Shading, parcels int, style Style) *Palette {
	look := style.Look
	p := &Palette{
		fill: make([]ink, parcels+1), over: make([]bool, parcels+1), bare: inkOf(look.Bare), warm: inkOf(look.Warm),
		under: [3]ink{inkOf(look.Paper), inkOf(look.Outside), inkOf(look.Land)},
		step:  max(1, int(style.ratio()+0.5)),
	}
	for i, a := range hatchInk {
		p.hatch[i] = inkOf(look.Hatch).part(part(a)).over(inkOf(look.Bare))
	}
	colours := make([]ink, len(s.Colours))
	for i, c := range s.Colours {
		c.A = 255
		colours[i] = inkOf(c)
	}
	for i := range parcels {
		class := Bare
		if i < len(s.Class) {
			class = s.Class[i]
		}
		switch {
		case int(class) < len(colours) && class != Bare && class != Unknown:
			p.fill[i+1] = colours[class]
		case class == Unknown:
			p.fill[i+1] = hatched
		}
		p.over[i+1] = i < len(s.Over) && s.Over[i]
	}
	return p
}

// hatchLine gives the hatching along a row, a period longer than the row so that it can be shifted.
func (p *Palette) hatchLine(width int) []ink {
	out := make([]ink, width+hatchPeriodPx*p.step)
	for i := range out {
		out[i] = p.hatch[i/p.step%hatchPeriodPx]
	}
	return out
}

// shift gives where in the hatch line the row at y begins, so that hatch lines go on across tiles.
func (p *Palette) shift(left, y int) int {
	period := hatchPeriodPx * p.step
	from := (left + floorDiv(y, p.step)*p.step) % period
	if from < 0 {
		from += period
	}
	return from
}

// floorDiv divides, rounding down below zero too.
func floorDiv(a, b int) int {
	if a < 0 {
		return -((-a + b - 1) / b)
	}
	return a / b
}

// Tile is a drawn piece of the map that still lacks the parcels' colours.
type Tile struct {
	rect    image.Rectangle // in pixels of its level
	parcel  []uint32        // by pixel: number of the parcel + 1, or 0; nil when there is none
	edge    []uint8         // by pixel: how much of it is edge of its parcel
	under   []uint8         // by pixel: what lies under the parcels, a number in Palette.under; nil when it is uniform
	uniform uint8
	overlay []ink // by pixel: borders, water, roads, signs; nil when there is nothing
}

// bytes gives the memory that the tile holds.
func (t *Tile) bytes() int64 {
	return int64(4*len(t.parcel) + len(t.edge) + len(t.under) + 4*len(t.overlay))
}

// Shade colours the tile. Marks, made by Placed.Draw for the same pixels, come on top; nil is none. The
// picture is drawn into the given one when its size fits, else into a new one.
func (t *Tile) Shade(p *Palette, marks []ink, into *image.RGBA) *image.RGBA {
	w, h := t.rect.Dx(), t.rect.Dy()
	if into == nil || into.Rect != image.Rect(0, 0, w, h) {
		into = image.NewRGBA(image.Rect(0, 0, w, h))
	}
	hatch := p.hatchLine(w)
	for y := range h {
		pix := into.Pix[y*into.Stride:][:4*w]
		from, to := y*w, (y+1)*w
		t.shadeRow(p, pix, from, to, hatch[p.shift(t.rect.Min.X, t.rect.Min.Y+y):])
		if t.overlay != nil {
			lay(pix, t.overlay[from:to])
		}
		if marks != nil {
			lay(pix, marks[from:to])
		}
	}
	return into
}

// shadeRow writes what lies under the overlay.
func (t *Tile) shadeRow(p *Palette, pix []byte, from, to int, hatch []ink) {
	if t.parcel == nil {
		for x := range to - from {
			under := t.uniform
			if t.under != nil {
				under = t.under[from+x]
			}
			binary.LittleEndian.PutUint32(pix[4*x:4*x+4], uint32(p.under[under]))
		}
		return
	}
	edges := t.edge[from:to]
	for x, n := range t.parcel[from:to] {
		c := p.fill[n]
		if c>>24 == 0 {
			switch {
			case c == hatched:
				c = hatch[x]
			case n != 0:
				c = p.bare
			case t.under != nil:
				c = p.under[t.under[from+x]]
			default:
				c = p.under[t.uniform]
			}
		}
		if e := edges[x]; e != 0 && p.over[n] {
			c = p.warm.part(part(e)).over(c)
		}
		binary.LittleEndian.PutUint32(pix[4*x:4*x+4], uint32(c)|255<<24)
	}
}

// lay lays a row over the pixels.
func lay(pix []byte, row []ink) {
	for x, o := range row {
		if o != 0 {
			at := pix[4*x : 4*x+4]
			binary.LittleEndian.PutUint32(at, uint32(o.over(ink(binary.LittleEndian.Uint32(at))))|255<<24)
		}
	}
}
