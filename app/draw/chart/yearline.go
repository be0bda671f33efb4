package chart

import (
	"math"
	"strings"

	"groundtally/app/draw"
)

// YearSum is a sum that runs year by year to a horizon, which several plants may share.
type YearSum struct {
	Title string // for readers who cannot see the picture
	ID    string // tells its hatching from that of other pictures on one page
	Name  string // the candidate
	Item  string // of the line
	What  string // what is summed up, in which kind; it stands at the axis. Each kind has a picture of its own
	Unit  string

	Points  []YearPoint // from the start on
	Begun   []float64   // years at which the plant is built again
	ByUse   Amount      // the sum at the horizon when only what is used up by then counts
	Above   Amount      // the year from whose end on the sum is 0 or more; Never where it is not
	Why     string      // why there are no points, in words
	Caption string      // in as many parts as it has lines
}

// YearPoint is the sum at the end of a year; year 0 is the start.
type YearPoint struct{ Year, Sum float64 }

// says tells the end and when it is paid back, in words.
func (in YearSum) says() string {
	last := in.Points[len(in.Points)-1]
	out := "after " + years(last.Year) + " " + unitOf(figure(last.Sum), in.Unit)
	if in.ByUse.ok() && figure(in.ByUse.X) != figure(last.Sum) {
		out += ", by use " + unitOf(figure(in.ByUse.X), in.Unit)
	}
	switch {
	case in.Above.ok():
		out += "; 0 or more from the end of year " + number(in.Above.X, 0) + " on"
	case in.Above.State == Never:
		out += "; never 0 or more for good"
	}
	return out
}

// YearLine draws the sum over the years, with the years at which the plant is built again.
func YearLine(in YearSum, p draw.Palette, width float64) *draw.Scene {
	if len(in.Points) == 0 {
		words := "The sum over the years is unknown"
		if in.Why != "" {
			words += ": " + in.Why
		}
		return newSheet(width, titled(in.Title, words), in.ID, p).nothing(words)
	}
	words := in.says()
	s := newSheet(width, titled(in.Title, words), in.ID, p)
	y := pad + 10.0
	if in.Name != "" {
		s.bold(pad, y, draw.Fit(in.Name, body, true, s.Width-2*pad), body, p.Ink, draw.Start)
		y += 16
	}
	for _, l := range draw.Lines(words, small, true, s.Width-2*pad, 3) {
		s.bold(pad, y+2, l, small, p.Ink, draw.Start)
		y += lineHeight
	}
	y = s.yearPlot(in, y+4)
	keys := []key{{line: true, style: s.caseStyle(0), text: "with all that is spent by then"}}
	if in.ByUse.ok() {
		keys = append(keys, key{diamond: true, style: s.crossingStyle(), text: "by use"})
	}
	if len(in.Begun) > 0 {
		keys = append(keys, key{line: true, style: s.begunStyle(), text: "built again"})
	}
	y += s.legend(y+2, keys) + 12
	return s.done(s.notes(y+2, p.Faint, strings.Split(in.Caption, "\n")...) - 4)
}

func (s *sheet) begunStyle() draw.Style {
	return draw.Style{Stroke: s.p.Faint, Width: 1, Dash: "2 3"}
}

// yearPlot draws the line and gives where what is below begins.
func (s *sheet) yearPlot(in YearSum, y float64) float64 {
	p := s.p
	last := in.Points[len(in.Points)-1]
	lo, hi := 0.0, 0.0
	for _, q := range in.Points {
		lo, hi = math.Min(lo, q.Sum), math.Max(hi, q.Sum)
	}
	ends := []float64{last.Sum}
	if in.ByUse.ok() {
		lo, hi = math.Min(lo, in.ByUse.X), math.Max(hi, in.ByUse.X)
		ends = append(ends, in.ByUse.X)
	}
	a := newAxis(-1, 1, 2, false)
	if hi > lo {
		a = newAxis(lo, hi, 7, false).tightened(lo, hi)
	}
	margin, room := 0.0, 0.0
	for _, t := range a.ticks() {
		margin = math.Max(margin, draw.TextWidth(a.label(t), small, false))
	}
	for _, e := range ends {
		room = math.Max(room, draw.TextWidth(figure(e), small, true))
	}
	left, right := pad+margin+8, s.Width-pad-room-14
	for _, l := range draw.Lines(in.What+", "+in.Unit, small, false, s.Width-2*pad, 3) {
		s.write(pad, y+2, l, small, p.Faint, draw.Start)
		y += lineHeight
	}
	top := y + 6
	tall := math.Round(math.Min(280, math.Max(160, 0.36*s.Width)))
	bottom := top + tall
	horizon := math.Max(last.Year, 1)
	at := func(t, v float64) draw.Point {
		return draw.Point{X: left + (right-left)*math.Min(1, t/horizon), Y: bottom - tall*a.share(v)}
	}
	for _, t := range a.ticks() {
		s.line(p.Rule, 1, left, at(0, t).Y, right, at(0, t).Y)
		s.write(left-6, at(0, t).Y+3.8, a.label(t), small, p.Faint, draw.End)
	}
	for i, q := range in.Points { // unseen, for the pointer
		x0, x1 := left, right
		if i > 0 {
			x0 = (at(in.Points[i-1].Year, 0).X + at(q.Year, 0).X) / 2
		}
		if i < len(in.Points)-1 {
			x1 = (at(in.Points[i+1].Year, 0).X + at(q.Year, 0).X) / 2
		}
		s.Bar(x0, top, x1-x0, tall, draw.Style{}, in.Item, "after "+number(q.Year, decimalsOf(q.Year))+" yr: "+unitOf(figure(q.Sum), in.Unit))
	}
	for _, t := range in.Begun {
		if t > 0 && t < last.Year {
			x := at(t, 0).X
			s.Line(s.begunStyle(), draw.Point{X: x, Y: top}, draw.Point{X: x, Y: bottom})
		}
	}
	s.line(p.Ink, 1.2, left, at(0, 0).Y, right, at(0, 0).Y)
	run := make([]draw.Point, len(in.Points))
	for i, q := range in.Points {
		run[i] = at(q.Year, q.Sum)
	}
	if len(run) > 1 {
		s.Line(draw.Style{Stroke: p.Paper, Width: 4.4}, run...)
		s.Path(draw.Path{Rings: [][]draw.Point{run}, Style: s.caseStyle(0), Item: in.Item, Title: in.What + ": " + in.says()})
	} else {
		s.Path(draw.Path{Rings: [][]draw.Point{ringAround(run[0], 2.5)}, Closed: true, Style: draw.Style{Fill: p.Accent}, Item: in.Item, Title: in.says()})
	}
	labels := []float64{run[len(run)-1].Y}
	if in.ByUse.ok() {
		c := at(last.Year, in.ByUse.X)
		s.Path(draw.Path{Rings: [][]draw.Point{diamond(c, 5.5)}, Closed: true, Style: s.crossingStyle(), Item: in.Item, Title: "by use: " + unitOf(figure(in.ByUse.X), in.Unit)})
		labels = append(labels, c.Y)
	}
	if len(ends) > 1 && figure(ends[0]) == figure(ends[1]) {
		ends = ends[:1]
	}
	apart(labels[:len(ends)], lineHeight, bottom)
	for i, e := range ends {
		s.bold(right+10, labels[i]+3.8, figure(e), small, p.Ink, draw.Start)
	}
	s.line(p.Faint, 1, left, bottom, right, bottom)
	span := levelAxis(0, horizon, right-left, true)
	for _, t := range span.ticks() {
		if t <= horizon+1e-9 {
			x := at(t, 0).X
			s.line(p.Faint, 1, x, bottom, x, bottom+4)
			s.write(x, bottom+17, span.label(t), small, p.Ink, draw.Middle)
		}
	}
	return bottom + 33 + s.centred((left+right)/2, bottom+33, math.Max(right-left, 200), "years from the start")
}

// apart moves two heights so far apart that texts have room, above the least that is told.
func apart(at []float64, room, most float64) {
	if len(at) < 2 || math.Abs(at[0]-at[1]) >= room {
		return
	}
	up, down := 0, 1
	if at[1] < at[0] {
		up, down = 1, 0
	}
	middle := math.Min((at[0]+at[1])/2, most-room/2)
	at[up], at[down] = middle-room/2, middle+room/2
}
