package chart

import (
	"math"

	"groundtally/app/draw"
)

// State says what stands in place of a number, or that a number is there.
type State string

// The states of an amount. What nobody has filled in is unknown.
const (
	Unknown     State = "" // the data do not give it
	Number      State = "number"
	NotSet      State = "not set" // the user must enter it
	None        State = "none"    // there is no such effect
	Never       State = "never"   // a payback that never comes
	NotAssessed State = "not assessed"
)

// Amount is a number with its range, or the state in its place.
type Amount struct {
	State     State
	X         float64 // where the state is Number
	Low, High float64 // drawn and written where High is above Low
	Why       string  // why there is no number, in words
}

// Num is a number without a range.
func Num(x float64) Amount { return Amount{State: Number, X: x} }

// Ranged is a number with its range.
func Ranged(low, x, high float64) Amount { return Amount{State: Number, X: x, Low: low, High: high} }

func finite(x float64) bool { return !math.IsNaN(x) && !math.IsInf(x, 0) }

// ok tells whether there is a number that can be drawn.
func (a Amount) ok() bool { return a.State == Number && finite(a.X) }

// unknown tells whether it must be hatched. A number that is none is unknown.
func (a Amount) unknown() bool { return a.State == Unknown || a.State == Number && !finite(a.X) }

func (a Amount) ranged() bool {
	return a.ok() && a.High > a.Low && finite(a.Low) && finite(a.High)
}

// least and most are the ends of what is drawn.
func (a Amount) least() float64 {
	if a.ranged() {
		return math.Min(a.X, a.Low)
	}
	return a.X
}

func (a Amount) most() float64 {
	if a.ranged() {
		return math.Max(a.X, a.High)
	}
	return a.X
}

// word is the state, where there is no number.
func (a Amount) word() string {
	if a.unknown() {
		return "unknown"
	}
	return string(a.State)
}

// value writes the number with its unit, or the state.
func (a Amount) value(write func(float64) string, unit string) string {
	if !a.ok() {
		return a.word()
	}
	return unitOf(write(a.X), unit)
}

// span writes the range, or nothing.
func (a Amount) span(write func(float64) string) string {
	if !a.ranged() {
		return ""
	}
	return write(a.Low) + " to " + write(a.High)
}

// reason says why there is no number; nothing where there is one.
func (a Amount) reason() string {
	if a.ok() {
		return ""
	}
	return a.Why
}

// both writes the number with its range, or the state with its reason, for the pointer.
func (a Amount) both(write func(float64) string, unit string) string {
	out := a.value(write, unit)
	if r := a.span(write); r != "" {
		out += ", " + r
	}
	if why := a.reason(); why != "" {
		out += ": " + why
	}
	return out
}

// unitOf writes a number before its unit; a pure number has none.
func unitOf(number, unit string) string {
	if unit == "" || unit == "1" {
		return number
	}
	return number + " " + unit
}

// amount draws a bar from 0 to an amount with its range, between left and right; hatched over the whole length
// where it is unknown, and nothing at all in other states, for which words stand beside it.
func (s *sheet) amount(a axis, left, right, y, height float64, v Amount, fill, item, title string) {
	at := func(x float64) float64 { return left + (right-left)*a.share(x) }
	switch {
	case v.unknown():
		s.Bar(left, y, right-left, height, s.unknown(), item, title)
	case v.ok():
		x0, x1 := at(math.Min(0, v.X)), at(math.Max(0, v.X))
		if v.X != 0 && x1-x0 < 1.5 { // an amount too small to see is still there
			x1 = x0 + 1.5
		}
		if x1 > x0 {
			s.Bar(x0, y, x1-x0, height, draw.Style{Fill: fill}, item, title)
		}
		s.span(at, y, height, v, item, title)
	}
}

// span draws the range of an amount over its bar, with an edge of paper so that it shows on any bar.
func (s *sheet) span(at func(float64) float64, y, height float64, v Amount, item, title string) {
	if !v.ranged() {
		return
	}
	x0, x1, mid, end := at(v.Low), at(v.High), y+height/2, height/2-2
	rings := [][]draw.Point{{{X: x0, Y: mid}, {X: x1, Y: mid}}, {{X: x0, Y: mid - end}, {X: x0, Y: mid + end}}, {{X: x1, Y: mid - end}, {X: x1, Y: mid + end}}}
	s.Path(draw.Path{Rings: rings, Style: draw.Style{Stroke: s.p.Paper, Width: 3.6}})
	s.Path(draw.Path{Rings: rings, Style: draw.Style{Stroke: s.p.Ink, Width: 1.3}, Item: item, Title: title})
}

// notes writes texts below a picture, each in as many lines as it needs, at most three, and gives where they end.
func (s *sheet) notes(y float64, colour string, texts ...string) float64 {
	for _, t := range texts {
		for _, l := range draw.Lines(t, small, false, s.Width-2*pad, 3) {
			s.write(pad, y, l, small, colour, draw.Start)
			y += lineHeight
		}
	}
	return y
}

// free is the ground of a plot on which nothing stands yet.
type free struct {
	plot  draw.Box
	taken []draw.Box
	marks []draw.Box // those of taken that no line to another mark may cross
}

// line takes the ground under a line.
func (f *free) line(pts []draw.Point) {
	for i := 1; i < len(pts); i++ {
		a, b := pts[i-1], pts[i]
		n := math.Max(1, math.Ceil(math.Hypot(b.X-a.X, b.Y-a.Y)/4))
		for k := range int(n) + 1 {
			t := float64(k) / n
			x, y := a.X+(b.X-a.X)*t, a.Y+(b.Y-a.Y)*t
			f.taken = append(f.taken, draw.Box{X0: x - 2, Y0: y - 2, X1: x + 2, Y1: y + 2})
		}
	}
}

func (f *free) mark(c draw.Point, r float64) {
	b := draw.Box{X0: c.X - r, Y0: c.Y - r, X1: c.X + r, Y1: c.Y + r}
	f.taken, f.marks = append(f.taken, b), append(f.marks, b)
}

// open tells whether a line from a mark to its words crosses neither another mark nor other words.
func (f *free) open(from, to draw.Point, own draw.Point) bool {
	const n = 16
	for k := range n + 1 {
		t := float64(k) / n
		x, y := from.X+(to.X-from.X)*t, from.Y+(to.Y-from.Y)*t
		at := draw.Box{X0: x - 0.5, Y0: y - 0.5, X1: x + 0.5, Y1: y + 0.5}
		for _, o := range f.marks {
			if at.Meets(o) && !o.Meets(draw.Box{X0: own.X - 0.5, Y0: own.Y - 0.5, X1: own.X + 0.5, Y1: own.Y + 0.5}) {
				return false
			}
		}
	}
	return true
}

func (f *free) has(b draw.Box) bool {
	if b.X0 < f.plot.X0 || b.X1 > f.plot.X1 || b.Y0 < f.plot.Y0 || b.Y1 > f.plot.Y1 {
		return false
	}
	for _, o := range f.taken {
		if b.Meets(o) {
			return false
		}
	}
	return true
}

// label writes a text near a mark of radius r where nothing else stands, with a thin line to the mark where it is not
// close by; false where there is no room. The words must stand below the picture too.
func (s *sheet) label(f *free, c draw.Point, r float64, text string) bool {
	half := draw.TextWidth(text, small, false) / 2
	for _, far := range []float64{4, 14, 28, 44, 62} {
		for _, d := range []draw.Point{{X: 1}, {X: -1}, {Y: -1}, {Y: 1}, {X: 0.7, Y: -0.7}, {X: -0.7, Y: -0.7}, {X: 0.7, Y: 0.7}, {X: -0.7, Y: 0.7}} {
			o := draw.Point{X: c.X + d.X*(r+far), Y: c.Y + d.Y*(r+far)}
			t := draw.Text{At: draw.Point{X: o.X, Y: o.Y + 3.8}, Text: text, Size: small, Colour: s.p.Ink, Anchor: draw.Middle}
			switch {
			case d.X > 0:
				t.At.X += half
			case d.X < 0:
				t.At.X -= half
			case d.Y < 0:
				t.At.Y -= 5
			default:
				t.At.Y += 5
			}
			edge := draw.Point{X: c.X + d.X*r, Y: c.Y + d.Y*r}
			if b := t.Box().Grown(2, 1); f.has(b) && f.open(edge, o, c) {
				if far > 4 {
					s.line(s.p.Faint, 0.8, edge.X, edge.Y, o.X, o.Y)
				}
				s.clear(t)
				f.taken, f.marks = append(f.taken, b), append(f.marks, b)
				return true
			}
		}
	}
	return false
}
