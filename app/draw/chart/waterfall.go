package chart

import (
	"fmt"
	"math"

	"groundtally/app/draw"
)

// Chain is a yield with what is lost from it step by step. Where the unit changes along the steps a new
// picture with an axis of its own begins.
type Chain struct {
	Title string // for readers who cannot see the picture
	ID    string // tells its hatching from that of other pictures on one page
	What  string // the quantity, for the axes: "yield of a year"
	Steps []Step
}

// Step is one loss.
type Step struct {
	Item    string
	Name    string
	Unit    string
	Before  float64
	Share   float64 // lost when positive, gained when negative
	After   float64
	Unknown bool
}

// Waterfall draws a loss chain: one bar for each step, from what there was before it to what there is after.
func Waterfall(in Chain, p draw.Palette, width float64) *draw.Scene {
	s := newSheet(width, in.Title, in.ID, p)
	if len(in.Steps) == 0 {
		return s.nothing("no losses are reckoned")
	}
	y := pad - 4
	for from := 0; from < len(in.Steps); {
		to := from + 1
		for to < len(in.Steps) && in.Steps[to].Unit == in.Steps[from].Unit {
			to++
		}
		y = s.fall(in.What, in.Steps[from:to], y)
		from = to
	}
	return s.done(y)
}

// fall draws the steps of one unit and gives where it ends.
func (s *sheet) fall(what string, steps []Step, y float64) float64 {
	unit := steps[0].Unit
	lo, hi, longest := math.Inf(1), math.Inf(-1), draw.TextWidth("before losses", body, true)
	for _, st := range steps {
		longest = math.Max(longest, draw.TextWidth(st.Name, body, false))
		lo, hi = math.Min(lo, math.Min(st.Before, st.After)), math.Max(hi, math.Max(st.Before, st.After))
	}
	if lo >= 0 && lo < 0.4*hi {
		lo = 0
	}
	wide := s.Width >= 560
	left, right, row := pad, s.Width-pad, 40.0
	if wide {
		left, right, row = s.column(longest, 0.2, 0.46), s.Width-pad-150, 24
	}
	a := levelAxis(lo, hi, right-left, false)
	at := func(v float64) float64 { return left + (right-left)*a.share(v) }
	if wide {
		s.write(s.Width-pad-78, y+12, "change", small, s.p.Faint, draw.End)
		s.write(s.Width-pad, y+12, "after it", small, s.p.Faint, draw.End)
		y += 12
	}
	y += 6
	n := len(steps)
	end := func(y float64, name string, v float64) float64 {
		value := figure(v) + " " + unit
		s.bold(pad, y+14, name, body, s.p.Ink, draw.Start)
		s.bold(s.Width-pad, y+14, draw.Fit(value, small, true, 140), small, s.p.Ink, draw.End)
		return y + 24
	}
	top := y
	bottom := y + 24 + float64(n)*row + 24
	bands := []band{{top + 20, bottom}}
	if !wide {
		bands = bands[:0]
		for i := range n {
			bands = append(bands, band{top + 24 + 40*float64(i) + 19, top + 24 + 40*float64(i) + 33})
		}
	}
	s.levelTicks(a, left, right-left, bottom, bands...)
	y = end(y, "before losses", steps[0].Before)
	for i, st := range steps {
		change, colour := signed(-100*st.Share, 2)+" %", s.p.Accent
		if st.Share < 0 {
			colour = s.p.Ramp(0.45)
		}
		if st.Unknown {
			change = "unknown"
		}
		words := fmt.Sprintf("%s: %s, from %s to %s %s", st.Name, change, figure(st.Before), figure(st.After), unit)
		s.hover(y, row, st.Item, words)
		room, bar := left-pad-gap, y+5
		changeAt := s.Width - pad - 78
		if !wide {
			changeAt = s.Width - pad
			room, bar = s.Width-2*pad-gap-draw.TextWidth(change, small, false), y+19
		} else {
			s.write(s.Width-pad, y+15.5, figure(st.After), small, s.p.Ink, draw.End)
		}
		s.write(changeAt, y+15.5, change, small, s.p.Ink, draw.End)
		s.write(pad, y+15.5, draw.Fit(st.Name, body, false, room), body, s.p.Ink, draw.Start)
		x0, x1 := math.Min(at(st.Before), at(st.After)), math.Max(at(st.Before), at(st.After))
		style := draw.Style{Fill: colour}
		if st.Unknown {
			style = s.unknown()
			x0, x1 = math.Max(left, x0-8), math.Min(right, x1+8)
		}
		if x1-x0 < 1.5 { // a loss too small to see is still a step
			x1 = x0 + 1.5
		}
		// What the next step starts from.
		if wide && i < n-1 {
			s.line(s.p.Faint, 0.7, at(st.After), bar+14, at(st.After), y+row+5)
		}
		s.Bar(x0, bar, x1-x0, 14, style, st.Item, words)
		y += row
	}
	end(y, "after losses", steps[len(steps)-1].After)
	label := what + ", " + unit
	if a.lo > 0 {
		label += "; the axis starts at " + a.label(a.lo) + ", not at 0"
	}
	return bottom + 32 + s.centred((left+right)/2, bottom+32, math.Max(right-left, 280), label)
}
