package chart

import (
	"cmp"
	"math"
	"slices"
	"strconv"

	"groundtally/app/draw"
)

// Balances is what a plant has displaced less what it has caused, year by year, for one grid or for several.
type Balances struct {
	Title   string // for readers who cannot see the picture
	ID      string // tells its hatching from that of other pictures on one page
	Name    string // the candidate
	LifeYr  float64
	Cases   []Balance // the first is the one that the rest of the program goes by; at most mostCases
	Caption string    // what the range means
}

// Balance is the account under one grid factor.
type Balance struct {
	Item    string
	Name    string   // of the grid factor: "grid average of today"
	Tonnes  []Amount // t CO2e at the end of each year, from the start on: the first is minus what was caused
	Payback Amount   // years; Never where it does not come. Given and not reckoned here, so that it is the same everywhere
}

// BalanceOf adds what is displaced each year to minus what was caused, t CO2e, for the picture. Low takes all caused
// at its highest and all displaced at its lowest, high the other way: these are corners, not percentiles. From the
// first year without a number on all is in its state.
func BalanceOf(caused Amount, displaced []Amount) []Amount {
	ends := func(a Amount) (low, high float64) {
		if a.ranged() {
			return a.Low, a.High
		}
		return a.X, a.X
	}
	out := make([]Amount, 0, len(displaced)+1)
	low, high := ends(caused)
	now := Amount{State: caused.State, X: -caused.X, Low: -high, High: -low, Why: caused.Why}
	out = append(out, now)
	for _, d := range displaced {
		if now.ok() && d.ok() {
			low, high := ends(d)
			now.X, now.Low, now.High = now.X+d.X, now.Low+low, now.High+high
		} else if now.ok() {
			now = Amount{State: d.State, Why: d.Why}
		}
		out = append(out, now)
	}
	return out
}

// mostCases bounds the lines, so that they can be told apart by their dashes.
const mostCases = 3

var caseDashes = [mostCases]string{"", "7 4", "2 3"}

// says tells when it is paid back, in words.
func (b Balance) says(life float64) string {
	v := b.Payback
	switch {
	case v.State == Never:
		return "never within the life"
	case v.ok() && v.X > life && life > 0:
		return "not within the life of " + years(life) + "; it would take " + years(v.X)
	case v.ok():
		out := "paid back after " + years(v.X)
		if v.ranged() {
			out += ", " + number(v.Low, 1) + " to " + years(v.High)
		}
		return out
	}
	out := "payback " + v.word()
	if v.Why != "" {
		out += ": " + v.Why
	}
	return out
}

func (b Balance) drawn() bool { return slices.ContainsFunc(b.Tonnes, Amount.ok) }

// gap tells whether some of it is unknown.
func (b Balance) gap() bool {
	return len(b.Tonnes) == 0 || slices.ContainsFunc(b.Tonnes, Amount.unknown)
}

// PaybackLine draws the climate account over the years: it starts below 0 by what was caused and rises by what is
// displaced. Where the line comes to 0 the plant has paid back.
func PaybackLine(in Balances, p draw.Palette, width float64) *draw.Scene {
	cases := in.Cases[:min(len(in.Cases), mostCases)]
	words := ""
	lo, hi, last, drawn := 0.0, 0.0, in.LifeYr, false
	for i, c := range cases {
		if i > 0 {
			words += "; "
		}
		words += c.Name + ": " + c.says(in.LifeYr)
		for t, v := range c.Tonnes {
			if !v.ok() {
				continue
			}
			drawn, last = true, math.Max(last, float64(t))
			lo, hi = math.Min(lo, v.X), math.Max(hi, v.X)
			if i == 0 {
				lo, hi = math.Min(lo, v.least()), math.Max(hi, v.most())
			}
		}
	}
	s := newSheet(width, titled(in.Title, words), in.ID, p)
	if len(cases) == 0 {
		return s.nothing("What is displaced is not set: no grid factor")
	}
	y := pad + 10.0
	if in.Name != "" {
		s.bold(pad, y, draw.Fit(in.Name, body, true, s.Width-2*pad), body, p.Ink, draw.Start)
		y += 16
	}
	if drawn {
		y = s.balancePlot(cases, in.LifeYr, lo, hi, math.Max(last, 1), y)
	}
	unknown := false
	for i, c := range cases {
		y += s.balanceWords(i, c, in.LifeYr, y)
		unknown = unknown || c.gap()
	}
	keys := []key{}
	if slices.ContainsFunc(cases[0].Tonnes, Amount.ranged) {
		keys = append(keys, key{style: draw.Style{Fill: p.Ramp(bandShade)}, text: "low to high of line 1"})
	}
	if drawn {
		keys = append(keys, key{mark: crossing, style: s.crossingStyle(), text: "paid back"})
	}
	if unknown && drawn {
		keys = append(keys, key{style: s.unknown(), text: "unknown"})
	}
	if len(keys) > 0 {
		y += s.legend(y+2, keys) + 12
	}
	notes := []string{}
	if n := len(in.Cases) - len(cases); n > 0 {
		notes = append(notes, plural(n, "more grid factor")+" not drawn")
	}
	notes = append(notes, "What is displaced is an assumption about other power stations, not a measurement.", in.Caption)
	return s.done(s.notes(y+2, p.Faint, notes...) - 4)
}

const bandShade = 0.14

// crossing is the mark where a line comes to 0.
var crossing = []draw.Point{{X: 0, Y: -6}, {X: 6, Y: 0}, {X: 0, Y: 6}, {X: -6, Y: 0}}

func (s *sheet) crossingStyle() draw.Style {
	return draw.Style{Fill: s.p.Paper, Stroke: s.p.Ink, Width: 1.6}
}

func (s *sheet) caseStyle(i int) draw.Style {
	st := draw.Style{Stroke: s.p.Accent, Width: 2.2, Dash: caseDashes[i]}
	if i > 0 {
		st.Stroke, st.Width = s.p.Ink, 1.7
	}
	return st
}

// balancePlot draws the lines and gives where the words below begin.
func (s *sheet) balancePlot(cases []Balance, life, lo, hi, last, y float64) float64 {
	p := s.p
	a := newAxis(lo, hi, 7, false).tightened(lo, hi)
	if a.lo == 0 && a.hi == 0 || !(a.hi > a.lo) {
		a = newAxis(-1, 1, 2, false)
	}
	margin := 0.0
	for _, t := range a.ticks() {
		margin = math.Max(margin, draw.TextWidth(a.label(t), small, false))
	}
	// The lines are named at their ends; by number where a name has no room.
	names, ends := make([]string, len(cases)), 0.0
	for i, c := range cases {
		names[i] = strconv.Itoa(i + 1)
		if s.Width >= 560 {
			names[i] = draw.Fit(names[i]+" "+c.Name, small, false, 0.26*s.Width)
		}
		ends = math.Max(ends, draw.TextWidth(names[i], small, false))
	}
	left, right := pad+margin+8, s.Width-pad-ends-10
	for _, l := range draw.Lines("displaced less caused, t CO₂e", small, false, s.Width-2*pad, 2) {
		s.write(pad, y+2, l, small, p.Faint, draw.Start)
		y += lineHeight
	}
	top := y + 6
	tall := math.Round(math.Min(320, math.Max(180, 0.42*s.Width)))
	bottom := top + tall
	at := func(t, v float64) draw.Point {
		return draw.Point{X: left + (right-left)*math.Min(1, t/last), Y: bottom - tall*a.share(v)}
	}
	for _, t := range a.ticks() {
		s.line(p.Rule, 1, left, at(0, t).Y, right, at(0, t).Y)
		s.write(left-6, at(0, t).Y+3.8, a.label(t), small, p.Faint, draw.End)
	}
	for t, v := range cases[0].Tonnes { // unseen, for the pointer
		if x := at(float64(t), 0).X; v.ok() {
			w := (right - left) / last
			x0, x1 := math.Max(left, x-w/2), math.Min(right, x+w/2)
			s.Bar(x0, top, x1-x0, tall, draw.Style{}, cases[0].Item, "after "+number(float64(t), 0)+" yr: "+v.both(figure, "t CO₂e"))
		}
	}
	s.balanceBand(cases[0], at, draw.Box{X0: left, Y0: top, X1: right, Y1: bottom})
	s.line(p.Ink, 1.2, left, at(0, 0).Y, right, at(0, 0).Y)
	f := &free{plot: draw.Box{X0: left, Y0: top, X1: right, Y1: bottom}}
	f.line([]draw.Point{at(0, 0), at(last, 0)})
	type end struct {
		i int
		y float64
	}
	var named []end
	for i := len(cases) - 1; i >= 0; i-- { // the first stands above the others
		c := cases[i]
		var run []draw.Point
		finish := func() {
			if len(run) > 1 {
				s.Line(draw.Style{Stroke: p.Paper, Width: 4.4}, run...)
				s.Path(draw.Path{Rings: [][]draw.Point{run}, Style: s.caseStyle(i), Item: c.Item, Title: c.Name + ": " + c.says(life)})
				f.line(run)
			} else if len(run) == 1 {
				s.Path(draw.Path{Rings: [][]draw.Point{ringAround(run[0], 2.5)}, Closed: true, Style: draw.Style{Fill: p.Ink}, Item: c.Item, Title: c.Name})
			}
			run = nil
		}
		ended := math.NaN()
		for t, v := range c.Tonnes {
			if !v.ok() {
				finish()
				continue
			}
			run = append(run, at(float64(t), v.X))
			ended = at(float64(t), v.X).Y
		}
		finish()
		if finite(ended) {
			named = append(named, end{i, ended})
		}
	}
	type paid struct {
		c    Balance
		at   draw.Point
		text string
	}
	var marks []paid
	for i, c := range cases {
		if !c.drawn() || !c.Payback.ok() || c.Payback.X < 0 || c.Payback.X > last {
			continue
		}
		text := years(c.Payback.X)
		if len(cases) > 1 {
			text = strconv.Itoa(i+1) + ": " + text
		}
		marks = append(marks, paid{c, at(c.Payback.X, 0), text})
	}
	for _, m := range marks {
		s.Path(draw.Path{Rings: [][]draw.Point{moved(crossing, m.at, 1)}, Closed: true, Style: s.crossingStyle(), Item: m.c.Item, Title: m.c.Name + ": " + m.c.says(life)})
		f.mark(m.at, 7)
	}
	for _, m := range marks {
		s.label(f, m.at, 6, m.text)
	}
	if never := slices.IndexFunc(cases, func(c Balance) bool { return c.drawn() && c.Payback.State == Never }); never >= 0 {
		text := "never within the life"
		if len(cases) > 1 {
			text = strconv.Itoa(never+1) + ": " + text
		}
		for t := len(cases[never].Tonnes) - 1; t >= 0; t-- {
			if v := cases[never].Tonnes[t]; v.ok() {
				s.label(f, at(float64(t), v.X), 6, text)
				break
			}
		}
	}
	slices.SortFunc(named, func(a, b end) int { return cmp.Or(cmp.Compare(a.y, b.y), cmp.Compare(a.i, b.i)) })
	for k := range named { // apart, and then back up where the last has left the plot
		if k > 0 {
			named[k].y = math.Max(named[k].y, named[k-1].y+lineHeight)
		}
	}
	for k := len(named) - 1; k >= 0; k-- {
		most := bottom
		if k < len(named)-1 {
			most = named[k+1].y - lineHeight
		}
		named[k].y = math.Min(named[k].y, most)
	}
	for _, e := range named {
		s.write(right+8, e.y+3.8, names[e.i], small, p.Ink, draw.Start)
	}
	s.line(p.Faint, 1, left, bottom, right, bottom)
	span := levelAxis(0, last, right-left, true)
	for _, t := range span.ticks() {
		if t <= last+1e-9 {
			x := at(t, 0).X
			s.line(p.Faint, 1, x, bottom, x, bottom+4)
			s.write(x, bottom+17, span.label(t), small, p.Ink, draw.Middle)
		}
	}
	label := "years from the start"
	if life > 0 {
		label += "; life " + years(life)
	}
	return bottom + 33 + s.centred((left+right)/2, bottom+33, math.Max(right-left, 200), label)
}

// balanceBand draws the range of the first line, and hatches the years that are not known.
func (s *sheet) balanceBand(c Balance, at func(t, v float64) draw.Point, plot draw.Box) {
	if !c.drawn() {
		return
	}
	var low, high []draw.Point
	finish := func() {
		if len(low) > 1 {
			slices.Reverse(low)
			s.Path(draw.Path{Rings: [][]draw.Point{append(high, low...)}, Closed: true, Style: draw.Style{Fill: s.p.Ramp(bandShade)}})
		}
		low, high = nil, nil
	}
	for t, v := range c.Tonnes {
		if v.ranged() {
			low, high = append(low, at(float64(t), v.Low)), append(high, at(float64(t), v.High))
			continue
		}
		finish()
		if v.unknown() {
			x0, x1 := at(float64(t)-0.5, 0).X, at(float64(t)+0.5, 0).X
			x0, x1 = math.Max(plot.X0, x0), math.Min(plot.X1, x1)
			s.Bar(x0, plot.Y0, x1-x0, plot.Y1-plot.Y0, draw.Style{Hatch: true}, c.Item, "after "+number(float64(t), 0)+" yr: "+v.both(figure, "t CO₂e"))
		}
	}
	finish()
}

// balanceWords writes one case with its dashes, and gives the height used.
func (s *sheet) balanceWords(i int, c Balance, life, y float64) float64 {
	const indent = 34.0
	words := c.says(life)
	if c.drawn() {
		s.Line(s.caseStyle(i), draw.Point{X: pad, Y: y + 8}, draw.Point{X: pad + 28, Y: y + 8})
	} else if c.gap() {
		s.Rect(pad, y+2, 28, 12, s.unknown(), c.Name+": unknown")
	}
	s.write(pad+indent, y+12, draw.Fit(strconv.Itoa(i+1)+" "+c.Name, small, false, s.Width-2*pad-indent), small, s.p.Ink, draw.Start)
	at := y + 12
	for _, l := range draw.Lines(words, small, true, s.Width-2*pad-indent, 3) {
		at += lineHeight
		s.bold(pad+indent, at, l, small, s.p.Ink, draw.Start)
	}
	return at - y + 8
}
