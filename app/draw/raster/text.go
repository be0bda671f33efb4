package raster

import (
	"image"
	"math"
	"sync"

	"golang.org/x/image/font/sfnt"
	"golang.org/x/image/math/fixed"

	"groundtally/app/draw"
	"groundtally/assets/fonts"
)

// typefaces are the weights that ship with the program; the files are part of it, so a fault in them is a
// fault of the build.
var typefaces = sync.OnceValue(func() [2]*sfnt.Font {
	var out [2]*sfnt.Font
	for i, ttf := range [2][]byte{fonts.Regular(), fonts.Bold()} {
		f, err := sfnt.Parse(ttf)
		if err != nil {
			panic("the shipped typeface cannot be read: " + err.Error())
		}
		out[i] = f
	}
	return out
})

// mask is the cover of one letter around its place on the base line.
type mask struct {
	box   image.Rectangle
	cover []uint8
}

// maskKey is all that the look of a letter depends on. Letters stand at quarters of a pixel.
type maskKey struct {
	r       rune
	bold    bool
	sizePx  float32
	haloPx  float32 // half width of an edge around the letter; 0 is the letter itself
	quarter uint8
}

// masksKept bounds the memory of drawn letters; when it is full it is begun anew.
const masksKept = 8192

var (
	masksLock sync.RWMutex
	masks     = map[maskKey]*mask{}
)

// letter gives the mask of a letter, drawn once.
func (p *painter) letter(k maskKey) *mask {
	masksLock.RLock()
	m, ok := masks[k]
	masksLock.RUnlock()
	if ok {
		return m
	}
	m = p.drawLetter(k)
	masksLock.Lock()
	if len(masks) >= masksKept {
		clear(masks)
	}
	masks[k] = m
	masksLock.Unlock()
	return m
}

func (p *painter) drawLetter(k maskKey) *mask {
	rings := p.outline(k)
	box := boundsOf(rings)
	if len(rings) == 0 {
		return &mask{}
	}
	grow := float64(k.haloPx) + 1
	m := &mask{box: image.Rect(int(math.Floor(box.X0-grow)), int(math.Floor(box.Y0-grow)), int(math.Ceil(box.X1+grow)), int(math.Ceil(box.Y1+grow)))}
	m.cover = make([]uint8, m.box.Dx()*m.box.Dy())
	p.glyphs.reset(m.box)
	for _, ring := range rings {
		if k.haloPx > 0 {
			p.glyphs.stroke(ring, float64(k.haloPx), true)
		} else {
			p.glyphs.ring(ring)
		}
	}
	p.glyphs.each(nonZero, func(y, x0, x1 int, cover float32) {
		row := m.cover[(y-m.box.Min.Y)*m.box.Dx():]
		for x := x0 - m.box.Min.X; x < x1-m.box.Min.X; x++ {
			row[x] = uint8(cover*255 + 0.5)
		}
	})
	return m
}

// outline gives the rings of a letter in pixels around its place. A letter that the face lacks is a
// hollow box as wide as it was reckoned with.
func (p *painter) outline(k maskKey) [][]draw.Point {
	f := typefaces()[0]
	if k.bold {
		f = typefaces()[1]
	}
	shift := float64(k.quarter) / 4
	size := float64(k.sizePx)
	i, err := f.GlyphIndex(&p.font, k.r)
	var segments sfnt.Segments
	units := float64(f.UnitsPerEm())
	if err == nil && i != 0 {
		// Loaded at one pixel for each unit of the face, where nothing is rounded, and scaled here.
		segments, err = f.LoadGlyph(&p.font, i, fixed.I(int(units)), nil)
	}
	if err != nil || i == 0 {
		w := draw.TextWidth(string(k.r), size, k.bold)
		if w < size/8 {
			return nil
		}
		line := math.Max(1, size/16)
		outer := rect(shift+0.1*w, -0.7*size, shift+0.9*w, 0)
		inner := rect(shift+0.1*w+line, -0.7*size+line, shift+0.9*w-line, -line)
		inner[1], inner[3] = inner[3], inner[1] // the other way round: a hole under the non-zero rule
		return [][]draw.Point{outer, inner}
	}
	at := func(q fixed.Point26_6) draw.Point {
		return draw.Point{X: float64(q.X)/64/units*size + shift, Y: float64(q.Y) / 64 / units * size}
	}
	var rings [][]draw.Point
	var ring []draw.Point
	steps := 3 + int(size/16)
	for _, s := range segments {
		switch s.Op {
		case sfnt.SegmentOpMoveTo:
			if len(ring) > 2 {
				rings = append(rings, ring)
			}
			ring = []draw.Point{at(s.Args[0])}
		case sfnt.SegmentOpLineTo:
			ring = append(ring, at(s.Args[0]))
		case sfnt.SegmentOpQuadTo:
			a, b, c := ring[len(ring)-1], at(s.Args[0]), at(s.Args[1])
			for j := 1; j <= steps; j++ {
				t := float64(j) / float64(steps)
				u := 1 - t
				ring = append(ring, draw.Point{X: u*u*a.X + 2*u*t*b.X + t*t*c.X, Y: u*u*a.Y + 2*u*t*b.Y + t*t*c.Y})
			}
		case sfnt.SegmentOpCubeTo:
			a, b, c, d := ring[len(ring)-1], at(s.Args[0]), at(s.Args[1]), at(s.Args[2])
			for j := 1; j <= steps; j++ {
				t := float64(j) / float64(steps)
				u := 1 - t
				ring = append(ring, draw.Point{X: u*u*u*a.X + 3*u*u*t*b.X + 3*u*t*t*c.X + t*t*t*d.X, Y: u*u*u*a.Y + 3*u*u*t*b.Y + 3*u*t*t*c.Y + t*t*t*d.Y})
			}
		}
	}
	if len(ring) > 2 {
		rings = append(rings, ring)
	}
	return rings
}

// haloWidth is the width of the edge of paper colour around a name on a map, in units of the scene.
const haloWidth = 3

// text paints one line of text. Letters stand at whole pixels in height, so that a line is level, and at
// quarters of a pixel along it.
func (p *painter) text(t draw.Text) {
	size := t.Size * p.scale
	box := t.Box()
	if box.X1*p.scale < float64(p.img.Rect.Min.X)-size || box.X0*p.scale > float64(p.img.Rect.Max.X)+size || box.Y1*p.scale < float64(p.img.Rect.Min.Y)-size || box.Y0*p.scale > float64(p.img.Rect.Max.Y)+size {
		return
	}
	y := int(math.Round(t.At.Y * p.scale))
	run := func(halo float64, colour string) {
		ink, ok := p.ink(colour)
		if !ok {
			return
		}
		x := box.X0 * p.scale
		for _, r := range t.Text {
			quarters := int(math.Floor(x*4 + 0.5))
			px := floorDiv(quarters, 4)
			m := p.letter(maskKey{r: r, bold: t.Bold, sizePx: float32(size), haloPx: float32(halo), quarter: uint8(quarters - 4*px)})
			p.stamp(m, px, y, ink)
			x += draw.TextWidth(string(r), size, t.Bold)
		}
	}
	if t.Halo {
		run(haloWidth*p.scale/2, p.palette.Paper)
	}
	run(0, t.Colour)
}

func floorDiv(a, b int) int {
	if a < 0 && a%b != 0 {
		return a/b - 1
	}
	return a / b
}

// stamp paints a mask.
func (p *painter) stamp(m *mask, x, y int, ink [3]uint8) {
	box := m.box.Add(image.Pt(x, y)).Intersect(p.img.Rect)
	w := m.box.Dx()
	for py := box.Min.Y; py < box.Max.Y; py++ {
		row := m.cover[(py-y-m.box.Min.Y)*w:]
		for px := box.Min.X; px < box.Max.X; px++ {
			if a := row[px-x-m.box.Min.X]; a > 0 {
				p.blend(p.img.PixOffset(px, py), ink, uint32(a))
			}
		}
	}
}
