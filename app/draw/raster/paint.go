package raster

import (
	"image"
	"math"
	"strconv"

	"golang.org/x/image/font/sfnt"

	"groundtally/app/draw"
)

// Paint paints a scene, so many pixels for one of its units. The ground is the palette's paper, and so is
// the edge around names; hatching has the palette's colours. The same scene gives the same bytes. It may
// be called from several goroutines.
func Paint(s *draw.Scene, scale float64, p draw.Palette) *image.RGBA {
	img := image.NewRGBA(image.Rect(0, 0, pixels(s.Width*scale), pixels(s.Height*scale)))
	PaintOn(img, s, scale, p)
	return img
}

// most bounds the side of a picture, so that a slip in a scene cannot ask for all memory.
const most = 1 << 14

func pixels(x float64) int {
	if !(x > 0) {
		return 0
	}
	return int(math.Min(math.Ceil(x-1e-6), most))
}

// PaintOn paints a scene on a picture whose pixels are counted from the scene's upper left: a picture that
// covers only part of it, a tile, gets that part.
func PaintOn(img *image.RGBA, s *draw.Scene, scale float64, p draw.Palette) {
	w := &painter{img: img, scale: scale, palette: p}
	if ground, ok := w.ink(p.Paper); ok {
		w.span = w.solid(ground)
		for y := img.Rect.Min.Y; y < img.Rect.Max.Y; y++ {
			w.span(y, img.Rect.Min.X, img.Rect.Max.X, 1)
		}
	}
	for _, it := range s.Items {
		switch v := it.(type) {
		case draw.Path:
			w.path(v)
		case draw.Text:
			w.text(v)
		}
	}
}

// painter holds what is used again from shape to shape.
type painter struct {
	img     *image.RGBA
	scale   float64
	palette draw.Palette
	shapes  cover
	glyphs  cover
	font    sfnt.Buffer
	rings   [][]draw.Point
	points  []draw.Point
	colours map[string][3]uint8
	span    func(y, x0, x1 int, cover float32)
}

// ink reads "#rrggbb".
func (p *painter) ink(colour string) ([3]uint8, bool) {
	if c, ok := p.colours[colour]; ok {
		return c, true
	}
	if len(colour) != 7 || colour[0] != '#' {
		return [3]uint8{}, false
	}
	n, err := strconv.ParseUint(colour[1:], 16, 32)
	if err != nil {
		return [3]uint8{}, false
	}
	c := [3]uint8{uint8(n >> 16), uint8(n >> 8), uint8(n)}
	if p.colours == nil {
		p.colours = map[string][3]uint8{}
	}
	p.colours[colour] = c
	return c, true
}

// blend lays ink over a pixel, a from 0 to 255.
func (p *painter) blend(i int, ink [3]uint8, a uint32) {
	pix := p.img.Pix[i : i+4 : i+4]
	for k := range 3 {
		pix[k] = uint8((uint32(pix[k])*(255-a) + uint32(ink[k])*a + 127) / 255)
	}
	pix[3] = uint8(uint32(pix[3]) + (255-uint32(pix[3]))*a/255)
}

func (p *painter) solid(ink [3]uint8) func(y, x0, x1 int, cover float32) {
	return func(y, x0, x1 int, cover float32) {
		a := uint32(cover*255 + 0.5)
		i := p.img.PixOffset(x0, y)
		if a < 255 {
			for range x1 - x0 {
				p.blend(i, ink, a)
				i += 4
			}
			return
		}
		row := p.img.Pix[i : i+4*(x1-x0)]
		for len(row) > 0 {
			row[0], row[1], row[2], row[3] = ink[0], ink[1], ink[2], 255
			row = row[4:]
		}
	}
}

// Hatching: lines at 45 degrees, in units of the scene.
const (
	hatchEvery = 6.0
	hatchWidth = 1.1
)

// hatched lays paper with slanting lines. The lines are fixed to the scene, so that they go on from one
// tile to the next.
func (p *painter) hatched(paper, line [3]uint8) func(y, x0, x1 int, cover float32) {
	every, half := hatchEvery*p.scale, math.Max(hatchWidth*p.scale, 1)/2
	return func(y, x0, x1 int, cover float32) {
		for x := x0; x < x1; x++ {
			d := math.Mod((float64(x)+float64(y)+1)/math.Sqrt2, every)
			if d < 0 {
				d += every
			}
			on := math.Max(0, math.Min(1, half+0.5-math.Abs(d-every/2)))
			var c [3]uint8
			for k := range c {
				c[k] = uint8(math.Round(float64(paper[k]) + (float64(line[k])-float64(paper[k]))*on))
			}
			p.blend(p.img.PixOffset(x, y), c, uint32(cover*255+0.5))
		}
	}
}

// path paints a path: its inside, then its line.
func (p *painter) path(v draw.Path) {
	width := v.Style.Width * p.scale
	if v.Style.Stroke == "" {
		width = 0
	}
	rings := p.pixelRings(v, width)
	if len(rings) == 0 {
		return
	}
	box := boundsOf(rings)
	grow := width/2 + 1
	clip := image.Rect(floorPx(box.X0-grow), floorPx(box.Y0-grow), floorPx(box.X1+grow)+1, floorPx(box.Y1+grow)+1).Intersect(p.img.Rect)
	if clip.Empty() {
		return
	}
	paint := p.insideOf(v)
	if paint != nil {
		p.shapes.reset(clip)
		for _, r := range rings {
			p.shapes.ring(turned(r))
		}
		p.shapes.each(evenOdd, paint)
	}
	ink, ok := p.ink(v.Style.Stroke)
	if !ok || width <= 0 {
		return
	}
	p.shapes.reset(clip)
	within := draw.Box{X0: float64(clip.Min.X), Y0: float64(clip.Min.Y), X1: float64(clip.Max.X), Y1: float64(clip.Max.Y)}.Grown(grow, grow)
	if lengths := dashLengths(v.Style.Dash, p.scale); lengths != nil {
		for _, r := range rings {
			for _, d := range dashed(r, v.Closed, lengths, within) {
				p.shapes.stroke(d, width/2, false)
			}
		}
	} else {
		for _, r := range rings {
			p.shapes.stroke(r, width/2, v.Closed && len(r) > 2)
		}
	}
	p.shapes.each(nonZero, p.solid(ink))
}

// insideOf gives what fills a path; nil for nothing. Open lines with a fill are closed, as in SVG.
func (p *painter) insideOf(v draw.Path) func(y, x0, x1 int, cover float32) {
	if v.Style.Hatch {
		paper, ok1 := p.ink(p.palette.Paper)
		line, ok2 := p.ink(p.palette.Hatch)
		if ok1 && ok2 {
			return p.hatched(paper, line)
		}
	}
	if ink, ok := p.ink(v.Style.Fill); ok {
		return p.solid(ink)
	}
	return nil
}

// floorPx bounds a place so that it fits an int.
func floorPx(x float64) int { return int(math.Floor(math.Max(-1e6, math.Min(1e6, x)))) }

// finest is how near two corners of a shape may lie, in pixels, before one is left out.
const finest = 0.2

// pixelRings puts the rings of a path into pixels, in memory that the next path uses again. Upright boxes
// and level or upright lines are moved to whole pixels, so that their edges are sharp; corners that no
// eye could part are left out. A place that is no number leaves the ring out.
func (p *painter) pixelRings(v draw.Path, width float64) [][]draw.Point {
	p.rings, p.points = p.rings[:0], p.points[:0]
	total := 0
	for _, r := range v.Rings {
		total += len(r)
	}
	if cap(p.points) < total {
		p.points = make([]draw.Point, 0, 2*total)
	}
	for _, r := range v.Rings {
		start := len(p.points)
		sound := true
		for i, q := range r {
			x, y := q.X*p.scale, q.Y*p.scale
			if math.IsNaN(x-x) || math.IsNaN(y-y) {
				sound = false
				break
			}
			if n := len(p.points); n > start && i < len(r)-1 && math.Abs(x-p.points[n-1].X) < finest && math.Abs(y-p.points[n-1].Y) < finest {
				continue
			}
			p.points = append(p.points, draw.Point{X: x, Y: y})
		}
		ring := p.points[start:]
		if v.Closed && len(ring) > 1 && ring[0] == ring[len(ring)-1] {
			ring = ring[:len(ring)-1]
		}
		if !sound || len(ring) < 2 {
			p.points = p.points[:start]
			continue
		}
		sharpen(ring, v.Closed, width)
		p.rings = append(p.rings, ring)
	}
	return p.rings
}

// sharpen moves upright boxes, level lines, upright lines to whole pixels.
func sharpen(ring []draw.Point, closed bool, width float64) {
	shift := 0.0 // an odd line runs along the middle of pixels
	if w := math.Round(width); width > 0 && (w < 1 || int(w)%2 == 1) {
		shift = 0.5
	}
	snap := func(x float64) float64 { return math.Floor(x-shift+0.5) + shift }
	switch {
	case !closed && len(ring) == 2 && ring[0].X == ring[1].X:
		ring[0].X = snap(ring[0].X)
		ring[1].X = ring[0].X
	case !closed && len(ring) == 2 && ring[0].Y == ring[1].Y:
		ring[0].Y = snap(ring[0].Y)
		ring[1].Y = ring[0].Y
	case closed && len(ring) == 4 && ring[0].Y == ring[1].Y && ring[1].X == ring[2].X && ring[2].Y == ring[3].Y && ring[3].X == ring[0].X:
		// Small boxes stay as they are, for moving would change their size.
		if math.Abs(ring[1].X-ring[0].X) < 3 || math.Abs(ring[2].Y-ring[1].Y) < 3 {
			return
		}
		for i := range ring {
			ring[i] = draw.Point{X: snap(ring[i].X), Y: snap(ring[i].Y)}
		}
	}
}

func rect(x0, y0, x1, y1 float64) []draw.Point {
	return []draw.Point{{X: x0, Y: y0}, {X: x1, Y: y0}, {X: x1, Y: y1}, {X: x0, Y: y1}}
}

func boundsOf(rings [][]draw.Point) draw.Box {
	b := draw.Box{X0: math.Inf(1), Y0: math.Inf(1), X1: math.Inf(-1), Y1: math.Inf(-1)}
	for _, r := range rings {
		for _, q := range r {
			b = draw.Box{X0: math.Min(b.X0, q.X), Y0: math.Min(b.Y0, q.Y), X1: math.Max(b.X1, q.X), Y1: math.Max(b.Y1, q.Y)}
		}
	}
	return b
}
