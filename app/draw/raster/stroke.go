package raster

import (
	"math"
	"strconv"
	"strings"

	"groundtally/app/draw"
)

// roundFrom is the half width in pixels from which the corners of a stroke are rounded; in thinner ones
// no eye sees it.
const roundFrom = 0.6

// stroke adds a line of a half width, in pixels, with round joins and flat ends. Its pieces all turn the
// same way, to be filled by the non-zero rule.
func (c *cover) stroke(pts []draw.Point, half float64, closed bool) {
	n := len(pts)
	for i := 0; i < n; i++ {
		if i == n-1 && !closed {
			break
		}
		a, b := pts[i], pts[(i+1)%n]
		dx, dy := b.X-a.X, b.Y-a.Y
		length := math.Hypot(dx, dy)
		if length == 0 {
			continue
		}
		ox, oy := -dy/length*half, dx/length*half
		p := [4]draw.Point{{X: a.X - ox, Y: a.Y - oy}, {X: b.X - ox, Y: b.Y - oy}, {X: b.X + ox, Y: b.Y + oy}, {X: a.X + ox, Y: a.Y + oy}}
		c.ring(p[:])
		if half < roundFrom || (i == n-2 && !closed) {
			continue
		}
		next := pts[(i+2)%n]
		ex, ey := next.X-b.X, next.Y-b.Y
		// Where the line goes nearly straight on there is no gap to fill.
		if l := math.Hypot(ex, ey); l > 0 && (dx*ex+dy*ey)/(length*l) > 0.97 {
			continue
		}
		c.disc(b, half)
	}
}

// disc adds a round dot.
func (c *cover) disc(at draw.Point, r float64) {
	n := max(8, int(4*math.Sqrt(r)+6))
	prev := draw.Point{X: at.X + r, Y: at.Y}
	for i := 1; i <= n; i++ {
		sin, cos := math.Sincos(2 * math.Pi * float64(i) / float64(n))
		next := draw.Point{X: at.X + r*cos, Y: at.Y + r*sin}
		if i == n {
			next = draw.Point{X: at.X + r, Y: at.Y}
		}
		c.edge(prev, next)
		prev = next
	}
}

// dashLengths reads "4 3". An odd number of lengths is gone through twice, as in SVG; what cannot be read
// gives a line without gaps.
func dashLengths(dash string, scale float64) []float64 {
	var out []float64
	sum := 0.0
	for _, f := range strings.Fields(dash) {
		x, err := strconv.ParseFloat(f, 64)
		if err != nil || !(x >= 0) || math.IsInf(x, 1) {
			return nil
		}
		out, sum = append(out, x*scale), sum+x*scale
	}
	if sum < 0.1 { // finer than any pixel
		return nil
	}
	if len(out)%2 == 1 {
		out = append(out, out...)
	}
	return out
}

// dashed cuts a line into its dashes, as far as they touch a box: of a line that runs far beyond the
// picture only the part inside is cut.
func dashed(pts []draw.Point, closed bool, lengths []float64, within draw.Box) [][]draw.Point {
	if closed {
		pts = append(append([]draw.Point(nil), pts...), pts[0])
	}
	round := 0.0
	for _, l := range lengths {
		round += l
	}
	var out [][]draw.Point
	var dash []draw.Point
	flush := func() {
		if len(dash) > 1 {
			out = append(out, dash)
		}
		dash = nil
	}
	gone := 0.0 // length of the line so far
	for i := 1; i < len(pts); i++ {
		a, b := pts[i-1], pts[i]
		length := math.Hypot(b.X-a.X, b.Y-a.Y)
		along := func(d float64) draw.Point {
			return draw.Point{X: a.X + (b.X-a.X)*d/length, Y: a.Y + (b.Y-a.Y)*d/length}
		}
		from, to, ok := partWithin(a, b, within)
		if !ok || length == 0 {
			flush()
			gone += length
			continue
		}
		if from > 0 {
			flush()
		}
		at, end := from*length, to*length
		phase := math.Mod(gone+at, round)
		k := 0
		for phase >= lengths[k] && k < len(lengths)-1 {
			phase -= lengths[k]
			k++
		}
		left := math.Max(0, lengths[k]-phase)
		if k%2 == 0 && len(dash) == 0 {
			dash = []draw.Point{along(at)}
		}
		for end-at > left {
			at += left
			if k%2 == 0 {
				dash = append(dash, along(at))
				flush()
			} else {
				dash = []draw.Point{along(at)}
			}
			k = (k + 1) % len(lengths)
			left = lengths[k]
		}
		if k%2 == 0 {
			dash = append(dash, along(end))
		}
		if to < 1 {
			flush()
		}
		gone += length
	}
	flush()
	return out
}

// partWithin gives the part of a line from a to b that lies in a box, as shares of its length.
func partWithin(a, b draw.Point, box draw.Box) (from, to float64, ok bool) {
	from, to = 0, 1
	for _, side := range [4][2]float64{{a.X - b.X, a.X - box.X0}, {b.X - a.X, box.X1 - a.X}, {a.Y - b.Y, a.Y - box.Y0}, {b.Y - a.Y, box.Y1 - a.Y}} {
		step, room := side[0], side[1]
		switch {
		case step == 0 && room < 0:
			return 0, 0, false
		case step < 0:
			from = math.Max(from, room/step)
		case step > 0:
			to = math.Min(to, room/step)
		}
	}
	return from, to, from < to
}
