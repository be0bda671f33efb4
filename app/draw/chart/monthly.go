package chart

import (
	"fmt"
	"math"

	"groundtally/app/draw"
)

// Months is a quantity by month.
type Months struct {
	Title  string // for readers who cannot see the picture
	ID     string // tells its hatching from that of other pictures on one page
	What   string // the quantity: "energy"
	Unit   string
	Values [12]Month
}

// Month is the value of one month.
type Month struct {
	Item    string
	Value   float64
	Unknown bool
}

var monthNames = [12]string{"January", "February", "March", "April", "May", "June", "July", "August", "September", "October", "November", "December"}

// Monthly draws a column for each month; an unknown month is hatched over its whole height.
func Monthly(in Months, p draw.Palette, width float64) *draw.Scene {
	s := newSheet(width, in.Title, in.ID, p)
	lo, hi, unknown := 0.0, 0.0, false
	for _, m := range in.Values {
		if m.Unknown {
			unknown = true
			continue
		}
		lo, hi = math.Min(lo, m.Value), math.Max(hi, m.Value)
	}
	if hi == lo {
		hi = lo + 1
	}
	a := newAxis(lo, hi, 4, false)
	margin := 0.0
	for _, t := range a.ticks() {
		margin = math.Max(margin, draw.TextWidth(a.label(t), small, false))
	}
	left, right := pad+margin+6, s.Width-pad
	top := pad + 4.0
	for i, l := range draw.Lines(in.What+", "+in.Unit+" in each month", small, false, s.Width-2*pad, 2) {
		s.write(pad, top+lineHeight*float64(i)+4, l, small, p.Faint, draw.Start)
		top = pad + 4 + lineHeight*float64(i)
	}
	top += 24
	tall := math.Round(math.Min(220, math.Max(120, 0.3*s.Width)))
	bottom := top + tall
	at := func(v float64) float64 { return bottom - tall*a.share(v) }
	for _, t := range a.ticks() {
		s.line(p.Rule, 1, left, at(t), right, at(t))
		s.write(left-6, at(t)+3.8, a.label(t), small, p.Faint, draw.End)
	}
	each := (right - left) / 12
	short := each-4 < draw.TextWidth("May", small, false)*1.15
	values := true
	for _, m := range in.Values {
		values = values && draw.TextWidth(figure(m.Value), 10, false)+4 < each
	}
	for i, m := range in.Values {
		x := left + each*float64(i)
		name := monthNames[i][:3]
		if short {
			name = name[:1]
		}
		s.write(x+each/2, bottom+14, name, small, p.Ink, draw.Middle)
		w := math.Round(each * 0.72)
		if m.Unknown {
			s.Bar(x+(each-w)/2, top, w, tall, s.unknown(), m.Item, monthNames[i]+": unknown")
			continue
		}
		y0, y1 := at(math.Max(m.Value, 0)), at(math.Min(m.Value, 0))
		s.Bar(x+(each-w)/2, y0, w, math.Max(y1-y0, 0.5), draw.Style{Fill: p.Accent}, m.Item, fmt.Sprintf("%s: %s %s", monthNames[i], figure(m.Value), in.Unit))
		if values {
			s.clear(draw.Text{At: draw.Point{X: x + each/2, Y: y0 - 4}, Text: figure(m.Value), Size: 10, Colour: p.Ink, Anchor: draw.Middle})
		}
	}
	s.line(p.Faint, 1, left, at(0), right, at(0))
	y := bottom + 22
	if unknown {
		y += s.legend(y+2, []key{{style: s.unknown(), text: "unknown"}}) + 2
	}
	return s.done(y + 4)
}

// clear writes a text on a ground of paper, so that no guide line runs through it.
func (s *sheet) clear(t draw.Text) {
	b := t.Box()
	s.Rect(b.X0-1, b.Y0, b.X1-b.X0+2, b.Y1-b.Y0, draw.Style{Fill: s.p.Paper}, "")
	s.Text(t)
}
