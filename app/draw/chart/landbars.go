package chart

import (
	"math"
	"slices"

	"groundtally/app/draw"
)

// Ground is the land that a plant takes, by kind.
type Ground struct {
	Title string // for readers who cannot see the picture
	ID    string // tells its hatching from that of other pictures on one page
	Name  string // the candidate

	Total, Permanent, Temporary     LandKind // no ground is both permanent and temporary
	Farmland, Habitat, Forest, Peat LandKind // may lie over each other, so they are never added

	HaYears Amount // ground times years, each kind of ground counted once
	Caption string
}

// LandKind is one kind of land.
type LandKind struct {
	Item   string
	Ha     Amount
	Years  Amount // for how long; None where it is not a matter of years
	Remark string // what is counted, in words
}

// inYears writes the years, and the hectares times the years.
func (k LandKind) inYears() string {
	switch {
	case !k.Ha.ok() || k.Years.State == None:
		return ""
	case !k.Years.ok():
		return "years " + k.Years.word()
	}
	return "for " + years(k.Years.X) + ": " + figure(k.Ha.X*k.Years.X) + " ha yr"
}

func years(x float64) string {
	if x >= 10 && math.Abs(x-math.Round(x)) < 0.05 {
		return number(x, 0) + " yr"
	}
	return number(x, 1) + " yr"
}

// landRow is one bar.
type landRow struct {
	LandKind
	name, fill string
	warm       string
	parts      []landRow // drawn inside the outline of the whole
}

func (r landRow) words() string {
	out := r.name + ": " + r.Ha.both(hectares, "ha")
	for _, w := range []string{r.inYears(), r.Remark, r.warm} {
		if w != "" {
			out += "; " + w
		}
	}
	return out
}

// most is how far the row reaches, hectares; 0 where it has no number.
func (r landRow) most() float64 {
	hi, parts := 0.0, 0.0
	if r.Ha.ok() {
		hi = r.Ha.most()
	}
	for _, q := range r.parts {
		if q.Ha.ok() {
			parts += q.Ha.X
		}
	}
	return math.Max(hi, parts)
}

const peatWords = "any peat is flagged, whatever the score"

// enlargedFrom is how many times larger than its largest part the whole must be for the parts to have a scale of
// their own.
const enlargedFrom = 8.0

// LandBars draws the land that a plant takes: its total ground as an outline with what it takes directly inside, then
// each kind by itself. Where the total is far larger than all kinds, these follow on a larger scale, which is said;
// both scales are straight and start at 0.
func LandBars(in Ground, p draw.Palette, width float64) *draw.Scene {
	s := newSheet(width, in.Title, in.ID, p)
	kinds := []landRow{
		{LandKind: in.Permanent, name: "sealed or built, permanent", fill: p.Ramp(0.95)},
		{LandKind: in.Temporary, name: "disturbed while building, temporary", fill: p.Ramp(0.4)},
		{LandKind: in.Farmland, name: "farmland taken", fill: p.Ramp(0.65)},
		{LandKind: in.Habitat, name: "habitat touched", fill: p.Ramp(0.65)},
		{LandKind: in.Forest, name: "forest cleared", fill: p.Ramp(0.65)},
		{LandKind: in.Peat, name: "peat touched", fill: p.Ramp(0.65)},
	}
	if in.Peat.Ha.ok() && in.Peat.Ha.most() > 0 {
		kinds[5].warm = peatWords
	}
	whole := landRow{LandKind: in.Total, name: "total ground", parts: kinds[:2]}
	largest := 0.0
	for _, k := range kinds {
		largest = math.Max(largest, k.most())
	}
	y := pad - 4.0
	if in.Name != "" {
		s.bold(pad, pad+10, draw.Fit(in.Name, body, true, s.Width-2*pad), body, p.Ink, draw.Start)
		y = pad + 16
	}
	if in.Total.Ha.ok() && largest > 0 && in.Total.Ha.X >= enlargedFrom*largest {
		var times float64
		y, times = s.landPanel([]landRow{whole}, y, 0)
		y, _ = s.landPanel(kinds, y+2, times)
	} else {
		y, _ = s.landPanel(append([]landRow{whole}, kinds...), y, 0)
	}
	keys := []key{{style: draw.Style{Stroke: p.Ink, Width: 1.4}, text: "total ground"}, {style: draw.Style{Fill: kinds[0].fill}, text: "permanent"}, {style: draw.Style{Fill: kinds[1].fill}, text: "temporary"}}
	if slices.ContainsFunc(append([]landRow{whole}, kinds...), func(r landRow) bool { return r.Ha.unknown() }) {
		keys = append(keys, key{style: s.unknown(), text: "unknown"})
	}
	y += s.legend(y-6, keys) + 8
	occupied := "Ground times years: " + in.HaYears.both(figure, "ha yr")
	if in.HaYears.ok() {
		occupied += "; each kind of ground counted once"
	}
	y = s.notes(y, p.Ink, occupied)
	return s.done(s.notes(y, p.Faint, "Kinds of land may lie over each other, so they are not added.", in.Caption) - 4)
}

// landPanel draws rows on one scale. It gives where they end, and the hectares of the whole length; the scale is told
// against those of another panel, if above 0.
func (s *sheet) landPanel(rows []landRow, y, other float64) (end, length float64) {
	longest, hi := 0.0, 0.01
	for _, r := range rows {
		longest = math.Max(longest, draw.TextWidth(r.name, body, false))
		hi = math.Max(hi, r.most())
	}
	// Both panels have the same column of names, so that their lengths compare.
	longest = math.Max(longest, draw.TextWidth("disturbed while building, temporary", body, false))
	wide := s.Width >= 600
	left, right := pad, s.Width-pad
	if wide {
		left, right = s.column(longest, 0.2, 0.42), s.Width-pad-150
	}
	a := levelAxis(0, hi, right-left-endLabels, false).tightened(0, hi)
	var bars sheet // drawn after the guide lines, whose length is not known yet
	bars.Scene, bars.p = &draw.Scene{Width: s.Width}, s.p
	var bands []band
	for _, r := range rows {
		height, at := bars.landRow(r, a, y, left, right, wide)
		bands = append(bands, band{at - 1, at + landBar + 1})
		y += height
	}
	s.levelTicks(a, left, right-left, y, bands...)
	s.Items = append(s.Items, bars.Items...)
	label := "area, ha"
	if other > 0 {
		label += "; on this scale a hectare is " + figure(other/(a.hi-a.lo)) + " times as long as above"
	}
	return y + 33 + s.centred((left+right)/2, y+33, math.Max(right-left, 260), label), a.hi - a.lo
}

const landBar = 15.0 // thickness

// landRow draws one row and gives its height and where its bar begins.
func (s *sheet) landRow(r landRow, a axis, y, left, right float64, wide bool) (height, bar float64) {
	at := len(s.Items)
	words := r.words()
	value := draw.Fit(r.Ha.value(hectares, "ha"), body, true, 0.4*s.Width)
	span := piece{text: r.Ha.span(hectares), colour: s.p.Faint}
	aside := draw.TextWidth(value, body, true) + gap
	room := s.Width - 2*pad
	if wide {
		room = left - pad - gap
	}
	named := room
	if !wide {
		named -= aside
	}
	s.write(pad, y+15, draw.Fit(r.name, body, false, named), body, s.p.Ink, draw.Start)
	s.bold(s.Width-pad, y+15, value, body, s.p.Ink, draw.End)
	pieces := []piece{{text: r.inYears() + r.Ha.reason(), colour: s.p.Faint}, {text: r.warm, colour: s.p.Warm, bold: true}, {text: r.Remark, colour: s.p.Faint}}
	switch {
	case !wide:
		pieces = append([]piece{span}, pieces...)
	case span.text != "":
		s.write(s.Width-pad, y+15+lineHeight, draw.Fit(span.text, small, false, 142), small, s.p.Faint, draw.End)
		height = 15 + lineHeight + 8
	}
	lines := 0
	if slices.ContainsFunc(pieces, func(p piece) bool { return p.text != "" }) {
		lines = s.flow(pad, y+29, room, pieces)
	}
	height = math.Max(height, 26+lineHeight*float64(lines))
	bar = y + 4
	if !wide {
		bar = y + height - 4
		height += 20
	}
	if r.Item != "" { // under the marks of the row
		over := draw.Path{Rings: [][]draw.Point{{{X: 0, Y: y}, {X: s.Width, Y: y}, {X: s.Width, Y: y + height}, {X: 0, Y: y + height}}}, Closed: true, Item: r.Item, Title: words}
		s.Items = slices.Insert(s.Items, at, any(over))
	}
	if len(r.parts) == 0 || !r.Ha.ok() {
		s.amount(a, left, right, bar, landBar, r.Ha, r.fill, r.Item, words)
		return height, bar
	}
	from := left
	for _, q := range r.parts {
		if q.Ha.ok() && q.Ha.X > 0 {
			w := math.Max(1.5, (right-left)*a.share(q.Ha.X))
			s.Bar(from, bar+2, w, landBar-4, draw.Style{Fill: q.fill}, q.Item, q.words())
			from += w
		}
	}
	whole := func(x float64) float64 { return left + (right-left)*a.share(x) }
	s.Bar(left, bar, math.Max(1.5, whole(r.Ha.X)-left), landBar, draw.Style{Stroke: s.p.Ink, Width: 1.4}, r.Item, words)
	s.span(whole, bar, landBar, r.Ha, r.Item, words)
	return height, bar
}
