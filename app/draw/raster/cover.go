package raster

import (
	"image"
	"math"

	"groundtally/app/draw"
)

// cover gathers how much of each pixel a shape covers. Each edge adds, to the pixels that it crosses, the
// area to its right, with its direction as sign; summed along a row that gives the winding number, with
// fractions where an edge runs through a pixel. The area is exact, so that no shape has steps.
type cover struct {
	w, h        int // of the clip
	x0, y0      int // where the clip lies in the picture
	acc         []float32
	left, right []int // of each row: the pixels that were added to, right excluded; none when left >= right
}

// reset makes room for a shape within a box of pixels.
func (c *cover) reset(clip image.Rectangle) {
	c.w, c.h, c.x0, c.y0 = clip.Dx(), clip.Dy(), clip.Min.X, clip.Min.Y
	if n := (c.w + 1) * c.h; n > len(c.acc) {
		c.acc = make([]float32, n) // rows are left at zero after use, so older ones need no clearing
	}
	if c.h > len(c.left) {
		c.left, c.right = make([]int, c.h), make([]int, c.h)
	}
	for y := range c.h {
		c.left[y], c.right[y] = c.w+1, 0
	}
}

// edge adds one edge, in pixels of the picture.
func (c *cover) edge(a, b draw.Point) {
	ax, ay, bx, by := a.X-float64(c.x0), a.Y-float64(c.y0), b.X-float64(c.x0), b.Y-float64(c.y0)
	if ay == by {
		return
	}
	sign := 1.0
	if ay > by {
		ax, ay, bx, by, sign = bx, by, ax, ay, -1
	}
	if by <= 0 || ay >= float64(c.h) {
		return
	}
	slope := (bx - ax) / (by - ay)
	if ay < 0 {
		ax, ay = ax-slope*ay, 0
	}
	if h := float64(c.h); by > h {
		bx, by = ax+slope*(h-ay), h
	}
	x, y := ax, ay
	for row := int(ay); row < c.h && y < by; row++ {
		nextY := math.Min(float64(row+1), by)
		nextX := x + slope*(nextY-y)
		if nextY == by {
			nextX = bx
		}
		c.inRow(row, x, nextX, sign*(nextY-y))
		x, y = nextX, nextY
	}
}

// inRow adds a piece of an edge that stays in one row, from x0 to x1, of signed height d. What lies beyond
// the left border counts as on the border; beyond the right one it covers nothing here.
func (c *cover) inRow(row int, x0, x1, d float64) {
	if x0 > x1 {
		x0, x1 = x1, x0
	}
	w := float64(c.w)
	if x0 >= w {
		return
	}
	acc := c.acc[row*(c.w+1) : (row+1)*(c.w+1)]
	if x0 < 0 {
		outside := d
		if x1 > 0 {
			outside = d * -x0 / (x1 - x0)
		}
		acc[0] += float32(outside)
		c.left[row], c.right[row] = 0, max(c.right[row], 1)
		if x1 <= 0 {
			return
		}
		x0, d = 0, d-outside
	}
	if x1 > w {
		d, x1 = d*(w-x0)/(x1-x0), w
	}
	first, last := int(x0), int(math.Ceil(x1))
	c.left[row] = min(c.left[row], first)
	if last <= first+1 { // within one pixel
		mid := (x0+x1)/2 - float64(first)
		acc[first] += float32(d * (1 - mid))
		acc[first+1] += float32(d * mid)
		c.right[row] = max(c.right[row], min(first+2, c.w))
		return
	}
	perX := d / (x1 - x0)
	before := 0.0 // what the pixels so far cover in all, as if it went on to the right
	total := 0.0
	for px := first; px < last; px++ {
		from, to := math.Max(x0, float64(px)), math.Min(x1, float64(px+1))
		piece := perX * (to - from)
		area := total + piece*(float64(px+1)-(from+to)/2)
		acc[px] += float32(area - before)
		before = area
		total += piece
	}
	acc[last] += float32(d - before)
	c.right[row] = max(c.right[row], min(last+1, c.w))
}

// ring adds a closed ring.
func (c *cover) ring(pts []draw.Point) {
	for i := range pts {
		c.edge(pts[i], pts[(i+1)%len(pts)])
	}
}

// rule says which winding numbers are inside.
type rule bool

const (
	nonZero rule = false
	evenOdd rule = true
)

// each hands over the covered pixels of each row, in runs of one cover from 0 to 1, and leaves the rows
// at zero.
func (c *cover) each(r rule, span func(y, x0, x1 int, cover float32)) {
	for y := range c.h {
		left, right := c.left[y], c.right[y]
		if left >= right {
			continue
		}
		acc := c.acc[y*(c.w+1) : (y+1)*(c.w+1)]
		sum := float32(0)
		from, value := left, float32(0)
		for x := left; x < right; x++ {
			if acc[x] != 0 {
				sum += acc[x]
				acc[x] = 0
				if v := inside(r, sum); v != value {
					if value > 0 && x > from {
						span(y+c.y0, from+c.x0, x+c.x0, value)
					}
					from, value = x, v
				}
			}
		}
		acc[c.w] = 0
		// What the shape still covers at its last edge within the clip goes on to the border of the clip.
		if value > 0 && from < c.w {
			span(y+c.y0, from+c.x0, c.w+c.x0, value)
		}
	}
}

// inside turns a winding number with fractions into a cover. Rings are turned the same way round before
// they are added, so a hole makes 2, which the even-odd rule folds back to nothing, and rings that touch
// add up to 1 along their common edge.
func inside(r rule, winding float32) float32 {
	v := winding
	if v < 0 {
		v = -v
	}
	if r == evenOdd {
		v -= 2 * float32(int(v/2))
		if v > 1 {
			v = 2 - v
		}
	} else if v > 1 {
		v = 1
	}
	if v < 1e-4 { // what rounding leaves
		return 0
	}
	if v > 1-1e-4 {
		return 1
	}
	return v
}

// turned gives a ring with a positive area, reversed if it has to be.
func turned(pts []draw.Point) []draw.Point {
	area := 0.0
	for i := range pts {
		a, b := pts[i], pts[(i+1)%len(pts)]
		area += a.X*b.Y - b.X*a.Y
	}
	if area >= 0 {
		return pts
	}
	for i, j := 0, len(pts)-1; i < j; i, j = i+1, j-1 {
		pts[i], pts[j] = pts[j], pts[i]
	}
	return pts
}
