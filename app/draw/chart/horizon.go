package chart

import (
	"fmt"
	"math"

	"groundtally/app/draw"
)

// Horizon is how high the ground stands around a place.
type Horizon struct {
	Title  string     // for readers who cannot see the picture
	ID     string     // tells its hatching from that of other pictures on one page
	Angles []*float64 // degrees above level, evenly clockwise from true north; nil for unknown
}

// compass names eight directions clockwise from north.
var compass = [8]string{"north", "north-east", "east", "south-east", "south", "south-west", "west", "north-west"}

// Direction names the one of eight directions that lies nearest to an azimuth in degrees.
func Direction(deg float64) string {
	return compass[(int(math.Round(deg/45))%8+8)%8]
}

// HorizonStrip draws the horizon all around from north over east, south and west to north again. Directions in
// which it is not known are hatched over the whole height.
func HorizonStrip(in Horizon, p draw.Palette, width float64) *draw.Scene {
	s := newSheet(width, in.Title, in.ID, p)
	n := len(in.Angles)
	if n == 0 {
		return s.nothing("The horizon is unknown")
	}
	hi, lo, unknown := 1.0, 0.0, false // a flat horizon must look flat
	for _, a := range in.Angles {
		if a == nil {
			unknown = true
			continue
		}
		lo, hi = math.Min(lo, *a), math.Max(hi, *a)
	}
	a := newAxis(lo, hi, 3, false)
	margin := 0.0
	for _, t := range a.ticks() {
		margin = math.Max(margin, draw.TextWidth(a.label(t)+"°", small, false))
	}
	left, right := pad+margin+6, s.Width-pad
	const top, tall = pad + 4.0, 96.0
	bottom := top + tall
	at := func(v float64) float64 { return bottom - tall*a.share(v) }
	each := (right - left) / float64(n)
	ground := at(math.Max(a.lo, 0))
	for _, t := range a.ticks() {
		s.line(p.Rule, 1, left, at(t), right, at(t))
		s.write(left-6, at(t)+3.8, a.label(t)+"°", small, p.Faint, draw.End)
	}
	for i, v := range in.Angles {
		// A direction stands for what lies around it, so the first and the last share north.
		x0, x1 := left+each*(float64(i)-0.5), left+each*(float64(i)+0.5)
		deg := 360 * float64(i) / float64(n)
		bar := func(x0, x1 float64) {
			where := fmt.Sprintf("%.0f°, %s", deg, Direction(deg))
			if v == nil {
				s.Bar(x0, top, x1-x0, tall, s.unknown(), "", where+": unknown")
				return
			}
			y := at(*v)
			s.Bar(x0, math.Min(y, bottom-0.5), x1-x0, math.Max(bottom-y, 0.5), draw.Style{Fill: p.Accent}, "", where+": "+aboveLevel(*v))
		}
		if i == 0 {
			bar(left, x1)
			bar(right-each/2, right)
			continue
		}
		bar(x0, x1)
	}
	s.line(p.Faint, 1, left, ground, right, ground)
	for i, name := range []string{"N", "E", "S", "W", "N"} {
		x := left + (right-left)*float64(i)/4
		s.line(p.Faint, 1, x, bottom, x, bottom+4)
		s.write(x, bottom+17, name, small, p.Ink, draw.Middle)
	}
	y := bottom + 24
	if unknown {
		y += s.legend(y+2, []key{{style: s.unknown(), text: "unknown: no heights that way"}}) + 2
	}
	return s.done(y + 4)
}

// aboveLevel writes the angle of a horizon.
func aboveLevel(deg float64) string {
	if deg < 0 {
		return fmt.Sprintf("%.1f° below level", -deg)
	}
	return fmt.Sprintf("%.1f° above level", deg)
}
