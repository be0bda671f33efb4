package tiles

import (
	"image"
	"math"
	"sync"

	"groundtally/geo"
)

// pen draws shapes into buffers for the pixels of one tile. All geometry is computed in the pixels of the
// level, never of the tile, so that neighbouring tiles agree to the bit.
type pen struct {
	rect    image.Rectangle
	w       int
	mPerPx  float64
	cover   []uint8         // by pixel: how much is covered by what is being drawn
	dirty   image.Rectangle // the part of cover that may not be 0
	flags   []uint8         // crossings of a polygon's edges, always 0 between shapes
	pts     []geo.XY
	overlay []ink
	drawn   bool // something is in overlay
}

var pens = sync.Pool{New: func() any { return &pen{} }}

func newPen(rect image.Rectangle, mPerPx float64) *pen {
	p := pens.Get().(*pen)
	n := rect.Dx() * rect.Dy()
	if len(p.cover) != n {
		p.cover, p.flags = make([]uint8, n), make([]uint8, n)
	}
	p.rect, p.w, p.mPerPx = rect, rect.Dx(), mPerPx
	p.overlay, p.drawn = make([]ink, n), false
	return p
}

func (p *pen) done() {
	p.overlay = nil
	pens.Put(p)
}

// px gives a ring in pixels of the level. The answer is valid until the next call.
func (p *pen) px(ring []geo.XY) []geo.XY {
	out := p.pts[:0]
	for _, q := range ring {
		out = append(out, geo.XY{X: q.X / p.mPerPx, Y: -q.Y / p.mPerPx})
	}
	p.pts = out
	return out
}

// inside calls put with every span of pixels whose centres lie in a polygon; holes, and parts that
// overlap, count by the even-odd rule. Along an edge that two polygons share, every pixel falls to
// exactly one of them.
func (p *pen) inside(shape geo.XYGeometry, put func(row, from, to int)) {
	r := p.rect
	top, bottom, left, right := r.Max.Y, r.Min.Y, r.Max.X, r.Min.X
	for _, part := range shape.Parts {
		for _, ring := range part {
			for i := 1; i < len(ring); i++ {
				a := geo.XY{X: ring[i-1].X / p.mPerPx, Y: -ring[i-1].Y / p.mPerPx}
				b := geo.XY{X: ring[i].X / p.mPerPx, Y: -ring[i].Y / p.mPerPx}
				// The same edge must give the same crossings whichever way it is walked.
				if a.Y > b.Y || (a.Y == b.Y && a.X > b.X) {
					a, b = b, a
				}
				if b.Y <= float64(r.Min.Y) || a.Y >= float64(r.Max.Y) {
					continue
				}
				y0, y1 := max(ceil(a.Y-0.5), r.Min.Y), min(ceil(b.Y-0.5), r.Max.Y)
				if y0 >= y1 {
					continue
				}
				slope := (b.X - a.X) / (b.Y - a.Y)
				top, bottom = min(top, y0), max(bottom, y1)
				for y := y0; y < y1; y++ {
					x := ceil(a.X + (float64(y)+0.5-a.Y)*slope - 0.5)
					if x >= r.Max.X {
						right = r.Max.X
						continue
					}
					x = max(x, r.Min.X)
					left, right = min(left, x), max(right, x)
					p.flags[(y-r.Min.Y)*p.w+x-r.Min.X] ^= 1
				}
			}
		}
	}
	for y := top; y < bottom; y++ {
		row := p.flags[(y-r.Min.Y)*p.w : (y-r.Min.Y+1)*p.w]
		in, from := uint8(0), 0
		for x := left - r.Min.X; x <= right-r.Min.X && x < p.w; x++ {
			if row[x] == 0 {
				continue
			}
			row[x] = 0
			if in == 1 {
				put(y-r.Min.Y, from, x)
			}
			in, from = in^1, x
		}
		if in == 1 {
			put(y-r.Min.Y, from, p.w)
		}
	}
}

func ceil(v float64) int { return int(math.Ceil(v)) }

// capsule covers what lies within half of the straight line from a to b, in pixels of the level. What was
// covered before stays so, hence neither order nor repetition matters.
func (p *pen) capsule(a, b geo.XY, half float64) {
	reach := half + 0.5
	y0, y1 := max(floor(math.Min(a.Y, b.Y)-reach), p.rect.Min.Y), min(ceil(math.Max(a.Y, b.Y)+reach), p.rect.Max.Y)
	x0, x1 := max(floor(math.Min(a.X, b.X)-reach), p.rect.Min.X), min(ceil(math.Max(a.X, b.X)+reach), p.rect.Max.X)
	if y0 >= y1 || x0 >= x1 {
		return
	}
	d := b.Sub(a)
	len2 := d.X*d.X + d.Y*d.Y
	slant := 0.0 // half the width of the line along a row
	if d.Y != 0 {
		slant = reach * math.Sqrt(len2) / math.Abs(d.Y)
	}
	p.dirty = p.dirty.Union(image.Rect(x0, y0, x1, y1))
	for y := y0; y < y1; y++ {
		py := float64(y) + 0.5 - a.Y
		from, to := x0, x1
		if d.Y != 0 && slant < float64(x1-x0) {
			x := a.X + py*d.X/d.Y
			from, to = max(from, floor(x-slant)), min(to, ceil(x+slant)+1)
		}
		for x := from; x < to; x++ {
			at := (y-p.rect.Min.Y)*p.w + x - p.rect.Min.X
			if p.cover[at] == 255 {
				continue
			}
			px := float64(x) + 0.5 - a.X
			if c := coverage(half, dist2(px, py, d, len2)); c > p.cover[at] {
				p.cover[at] = c
			}
		}
	}
}

// dist2 gives the square of the distance from (x, y) to the line from the origin to d.
func dist2(x, y float64, d geo.XY, len2 float64) float64 {
	t := x*d.X + y*d.Y
	if t > 0 {
		if t >= len2 {
			x, y = x-d.X, y-d.Y
		} else {
			t /= len2
			x, y = x-t*d.X, y-t*d.Y
		}
	}
	return x*x + y*y
}

// coverage gives how much of a pixel a line of a half width covers at a squared distance.
func coverage(half, d2 float64) uint8 {
	if d2 >= (half+0.5)*(half+0.5) {
		return 0
	}
	c := half + 0.5 - math.Sqrt(d2)
	if c >= 1 {
		return 255
	}
	return uint8(c*255 + 0.5)
}

func floor(v float64) int { return int(math.Floor(v)) }

// stroke covers the lines of a shape, dashed when dash names lengths of line and gap in turn.
func (p *pen) stroke(shape geo.XYGeometry, widthPx float64, dash ...float64) {
	for _, part := range shape.Parts {
		for _, ring := range part {
			p.strokeRing(p.px(ring), widthPx/2, dash)
		}
	}
}

func (p *pen) strokeRing(at []geo.XY, half float64, dash []float64) {
	if len(at) == 1 {
		p.capsule(at[0], at[0], half)
	}
	left, on, k := 0.0, true, 0
	if len(dash) > 0 {
		left = dash[0]
	}
	for i := 1; i < len(at); i++ {
		a, b := at[i-1], at[i]
		if len(dash) == 0 {
			p.capsule(a, b, half)
			continue
		}
		length, gone := a.Dist(b), 0.0
		for gone < length {
			step := math.Min(left, length-gone)
			if on {
				u, v := gone/length, (gone+step)/length
				p.capsule(between(a, b, u), between(a, b, v), half)
			}
			gone += step
			if left -= step; left <= 1e-9 {
				k = (k + 1) % len(dash)
				left, on = dash[k], !on
			}
		}
	}
}

func between(a, b geo.XY, t float64) geo.XY {
	return geo.XY{X: a.X + (b.X-a.X)*t, Y: a.Y + (b.Y-a.Y)*t}
}

// fill covers the inside of a shape.
func (p *pen) fill(shape geo.XYGeometry) {
	p.inside(shape, func(row, from, to int) {
		p.dirty = p.dirty.Union(image.Rect(p.rect.Min.X+from, p.rect.Min.Y+row, p.rect.Min.X+to, p.rect.Min.Y+row+1))
		for x := from; x < to; x++ {
			p.cover[row*p.w+x] = 255
		}
	})
}

// box covers whole pixels around a place: a square of side pixels.
func (p *pen) box(at geo.XY, side int) {
	x, y := floor(at.X-float64(side)/2+0.5), floor(at.Y-float64(side)/2+0.5)
	r := image.Rect(x, y, x+side, y+side).Intersect(p.rect)
	if r.Empty() {
		return
	}
	p.dirty = p.dirty.Union(r)
	for y := r.Min.Y; y < r.Max.Y; y++ {
		for x := r.Min.X; x < r.Max.X; x++ {
			p.cover[(y-p.rect.Min.Y)*p.w+x-p.rect.Min.X] = 255
		}
	}
}

// paint lays a colour over the overlay where something was covered, and clears the cover.
func (p *pen) paint(c ink) {
	r := p.dirty.Intersect(p.rect)
	for y := r.Min.Y; y < r.Max.Y; y++ {
		from := (y - p.rect.Min.Y) * p.w
		for i := from + r.Min.X - p.rect.Min.X; i < from+r.Max.X-p.rect.Min.X; i++ {
			if v := p.cover[i]; v != 0 {
				p.overlay[i] = c.part(part(v)).over(p.overlay[i])
				p.cover[i] = 0
				p.drawn = true
			}
		}
	}
	p.dirty = image.Rectangle{}
}
