package chart

import (
	"fmt"
	"math"

	"groundtally/app/draw"
)

// DayMonths is a quantity by month and by hour of the day.
type DayMonths struct {
	Title  string // for readers who cannot see the picture
	ID     string // tells its hatching from that of other pictures on one page
	What   string // the quantity
	Unit   string
	Values [12][24]float64 // January first, the hour from 0 to 1 first; 0 or more
}

// DayByMonth draws a field for each month and hour, darker where there is more; fields without any are left empty.
func DayByMonth(in DayMonths, p draw.Palette, width float64) *draw.Scene {
	s := newSheet(width, in.Title, in.ID, p)
	most := 0.0
	for _, day := range in.Values {
		for _, v := range day {
			most = math.Max(most, v)
		}
	}
	if most <= 0 {
		return s.nothing("There is none in any hour")
	}
	top := pad + 4.0
	for i, l := range draw.Lines(in.What+", "+in.Unit+" in all days of the month together", small, false, s.Width-2*pad, 2) {
		s.write(pad, top+lineHeight*float64(i)+4, l, small, p.Faint, draw.Start)
		top = pad + 4 + lineHeight*float64(i)
	}
	top += 16
	left, right := pad+draw.TextWidth("24 h", small, false)+8, s.Width-pad
	const tall = 7.0
	bottom := top + 24*tall
	each := (right - left) / 12
	for h := 0; h <= 24; h += 6 {
		y := top + tall*float64(h)
		s.line(p.Rule, 1, left, y, right, y)
		s.write(left-6, y+3.8, fmt.Sprintf("%d h", h), small, p.Faint, draw.End)
	}
	for m, day := range in.Values {
		x := left + each*float64(m)
		for h, v := range day {
			if v <= 0 {
				continue
			}
			s.Bar(x+0.5, top+tall*float64(h)+0.5, each-1, tall-1, draw.Style{Fill: p.Ramp(v / most)}, "", fmt.Sprintf("%s, %d to %d h: %s %s", monthNames[m], h, h+1, figure(v), in.Unit))
		}
		name := monthNames[m][:3]
		if draw.TextWidth("May", small, false)*1.15 > each-4 {
			name = name[:1]
		}
		s.write(x+each/2, bottom+14, name, small, p.Ink, draw.Middle)
	}
	y := bottom + 26
	const swatch = 30.0
	x := left
	for i := range 5 {
		share := float64(i) / 4
		s.Bar(x, y, swatch, 9, draw.Style{Fill: p.Ramp(share)}, "", "")
		x += swatch
	}
	s.write(x+6, y+8.5, "0 to "+figure(most)+" "+in.Unit, small, p.Faint, draw.Start)
	return s.done(y + 18)
}
