package chart

import (
	"fmt"
	"math"
	"slices"
	"strings"

	"groundtally/app/draw"
)

// Boundary is where energy spent is counted first. Each boundary holds those before it.
type Boundary int

// The boundaries, from the narrowest.
const (
	AtPlant Boundary = iota
	AtGrid
	WholeLife
	WithStocks
)

var boundaryNames = [4]string{"at plant", "at grid", "whole life", "with stocks"}

// ElectricOverPrimary is how energy return is counted where a ladder does not say otherwise.
const ElectricOverPrimary = "electricity out over primary energy spent"

// stocksWords names the last rung as what it is.
const stocksWords = "this program's own ratio: the energy in soil, peat and plant carbon that is lost counts as spent too"

// Boundaries is the energy account of one candidate by boundary.
type Boundaries struct {
	Title string // for readers who cannot see the picture
	ID    string // tells its hatching from that of other pictures on one page
	Name  string // the candidate
	Kind  string // how the return is counted; ElectricOverPrimary where it is empty. Each kind has a picture of its own
	Unit  string // of all energies: "TJ"

	Rungs    [4]Rung // by Boundary
	Parts    []EnergyPart
	NoStocks bool   // leaves the last rung out, with its parts
	Caption  string // in as many parts as it has lines
}

// Rung is one boundary. Its return is given and not reckoned here, so that it is the same number everywhere.
type Rung struct {
	Item   string
	Out    Amount // energy over the life
	Return Amount // pure number
}

// EnergyPart is one row of the inventory. It is counted once, at its boundary and so in all wider ones.
type EnergyPart struct {
	Item  string
	Name  string
	At    Boundary
	Spent Amount // over the life
}

// spent is what is spent up to a boundary.
type spent struct {
	sum     float64
	missing int // parts without a number
	unknown bool
}

func (in Boundaries) kind() string {
	if in.Kind == "" {
		return ElectricOverPrimary
	}
	return in.Kind
}

// shown are the rungs that are drawn.
func (in Boundaries) shown() []Rung {
	if in.NoStocks {
		return in.Rungs[:WithStocks]
	}
	return in.Rungs[:]
}

func (in Boundaries) partsAt(b Boundary) (out []EnergyPart) {
	for _, q := range in.Parts {
		if q.At == b {
			out = append(out, q)
		}
	}
	return out
}

// spentTo adds up the parts up to a boundary, in their order.
func (in Boundaries) spentTo(b Boundary) (out spent) {
	for k := AtPlant; k <= b; k++ {
		for _, q := range in.partsAt(k) {
			switch {
			case q.Spent.ok():
				out.sum += q.Spent.X
			case q.Spent.State != None:
				out.missing++
				out.unknown = out.unknown || q.Spent.unknown()
			}
		}
	}
	return out
}

func (v spent) value(unit string) string {
	text := unitOf(figure(v.sum), unit)
	if v.missing > 0 {
		switch {
		case v.sum == 0 && v.unknown:
			return Amount{}.word()
		case v.sum == 0:
			return "not known in full"
		}
		return "at least " + text
	}
	return text
}

func (v spent) gaps() string {
	if v.missing == 0 {
		return ""
	}
	return plural(v.missing, "part") + " without a number"
}

// Ladder draws the energy return of one candidate at each boundary, energy out against energy spent on one scale,
// and below it the parts of what is spent, each once, on a scale of their own.
func Ladder(in Boundaries, p draw.Palette, width float64) *draw.Scene {
	if len(in.Parts) == 0 {
		return newSheet(width, in.Title, in.ID, p).nothing("The energy spent is unknown")
	}
	s := newSheet(width, titled(in.Title, in.words()), in.ID, p)
	y := pad + 10.0
	if in.Name != "" {
		s.bold(pad, y, draw.Fit(in.Name, body, true, s.Width-2*pad), body, p.Ink, draw.Start)
		y += 16
	}
	y = s.notes(y, p.Ink, "Energy return: "+in.kind()) - 6
	y, a, room := s.rungs(in, y)
	y, anyUnknown := s.energyParts(in, y+6, a, room)
	for _, r := range in.shown() {
		anyUnknown = anyUnknown || r.Out.unknown()
	}
	keys := []key{{style: draw.Style{Fill: p.Accent}, text: "out"}, {style: draw.Style{Fill: p.Ramp(spentShade)}, text: "spent"}, {style: draw.Style{Stroke: p.Ink, Width: 1.2}, text: "spent up to a boundary"}}
	if anyUnknown {
		keys = append(keys, key{style: s.unknown(), text: "unknown"})
	}
	y += s.legend(y-4, keys) + 8
	notes := append([]string{"Only returns that are counted in the same way may be compared."}, strings.Split(in.Caption, "\n")...)
	return s.done(s.notes(y, p.Faint, notes...) - 4)
}

// spentShade is the place on the ramp of energy spent.
const spentShade = 0.45

// words is the picture in one sentence, for readers who cannot see it.
func (in Boundaries) words() string {
	out := in.kind()
	for b, r := range in.shown() {
		out += "; " + boundaryNames[b] + " " + r.Return.value(figure, "")
	}
	return out
}

// rungs draws out against spent for each boundary, and gives where they end, the scale and its length.
func (s *sheet) rungs(in Boundaries, y float64) (end float64, a axis, room float64) {
	hi, margin := 0.0, draw.TextWidth("unknown", small, false)
	for b, r := range in.shown() {
		if r.Out.ok() {
			hi = math.Max(hi, r.Out.most())
		}
		v := in.spentTo(Boundary(b))
		hi = math.Max(hi, v.sum)
		margin = math.Max(margin, math.Max(draw.TextWidth(v.value(in.Unit), small, false), draw.TextWidth(r.Out.value(figure, in.Unit), small, false)))
	}
	if hi == 0 {
		hi = 1
	}
	margin = math.Min(margin, 0.4*s.Width)
	left, right := pad+draw.TextWidth("spent", small, false)+gap, s.Width-pad-margin-gap
	a = levelAxis(0, hi, right-left-endLabels, false).tightened(0, hi)
	const bar, each = 13.0, 17.0
	var bars sheet // drawn after the guide lines, whose length is not known yet
	bars.Scene, bars.p = &draw.Scene{Width: s.Width}, s.p
	var bands []band
	for b, r := range in.shown() {
		v := in.spentTo(Boundary(b))
		at := len(bars.Items)
		top := y
		pieces := []piece{{text: boundaryNames[b], colour: s.p.Ink, bold: true}, {text: "energy return " + r.Return.value(figure, ""), colour: s.p.Ink, bold: true}, {text: r.Return.span(figure) + r.Return.reason(), colour: s.p.Faint}}
		if Boundary(b) == WithStocks {
			bars.line(s.p.Faint, 1, pad, y+4, s.Width-pad, y+4)
			y += 6
		}
		y += 16 + lineHeight*float64(bars.flow(pad, y+16, s.Width-2*pad, pieces)-1)
		if Boundary(b) == WithStocks {
			for _, l := range draw.Lines(stocksWords, small, false, s.Width-2*pad, 3) {
				y += lineHeight
				bars.write(pad, y, l, small, s.p.Faint, draw.Start)
			}
		}
		y += 5
		words := fmt.Sprintf("%s: energy return %s; out %s; spent %s", boundaryNames[b], r.Return.both(figure, ""), r.Out.both(figure, in.Unit), v.value(in.Unit))
		if g := v.gaps(); g != "" {
			words += ", " + g
		}
		bands = append(bands, band{y - 1, y + each + bar + 1})
		bars.write(pad, y+10.5, "out", small, s.p.Faint, draw.Start)
		bars.write(pad, y+each+10.5, "spent", small, s.p.Faint, draw.Start)
		bars.write(s.Width-pad, y+10.5, draw.Fit(r.Out.value(figure, in.Unit), small, false, margin), small, s.p.Ink, draw.End)
		bars.write(s.Width-pad, y+each+10.5, draw.Fit(v.value(in.Unit), small, false, margin), small, s.p.Ink, draw.End)
		bars.amount(a, left, right, y, bar, r.Out, s.p.Accent, r.Item, words)
		x := bars.spentBar(in, Boundary(b), a, left, right, y+each, bar, r.Item, words)
		if v.unknown { // nobody knows how far it goes on
			bars.Bar(x, y+each, math.Max(0, math.Min(right, x+14)-x), bar, s.unknown(), r.Item, words)
		}
		y += each + bar + 4
		if r.Item != "" { // under the marks of the rung
			over := draw.Path{Rings: [][]draw.Point{{{X: 0, Y: top + 2}, {X: s.Width, Y: top + 2}, {X: s.Width, Y: y}, {X: 0, Y: y}}}, Closed: true, Item: r.Item, Title: words}
			bars.Items = slices.Insert(bars.Items, at, any(over))
		}
	}
	s.levelTicks(a, left, right-left, y, bands...)
	s.Items = append(s.Items, bars.Items...)
	label := "energy over the life, " + in.Unit + "; " + in.kind()
	return y + 33 + s.centred((left+right)/2, y+33, math.Max(right-left, 280), label), a, right - left
}

// spentBar draws what is spent up to a boundary, parted where each boundary begins, and gives where it ends.
func (s *sheet) spentBar(in Boundaries, b Boundary, a axis, left, right, y, bar float64, item, words string) float64 {
	at := func(v float64) float64 { return left + (right-left)*a.share(v) }
	total := in.spentTo(b).sum
	end := at(total)
	if total > 0 {
		end = math.Max(end, left+1.5)
		s.Bar(left, y, end-left, bar, draw.Style{Fill: s.p.Ramp(spentShade)}, item, words)
	}
	for k := AtPlant; k < b; k++ {
		if x := at(in.spentTo(k).sum); x > left+2 && x < end-2 {
			s.line(s.p.Paper, 1.2, x, y, x, y+bar)
		}
	}
	return end
}

// energyParts draws each part where the one before it ended, with the sum at the end of each boundary.
func (s *sheet) energyParts(in Boundaries, y float64, above axis, roomAbove float64) (end float64, anyUnknown bool) {
	lo, hi, longest := 0.0, 0.0, draw.TextWidth("spent, with stocks", body, true)
	margin, sum := draw.TextWidth("unknown", small, false), 0.0
	for b := range in.shown() {
		for _, q := range in.partsAt(Boundary(b)) {
			longest = math.Max(longest, draw.TextWidth(q.Name, body, false))
			margin = math.Max(margin, draw.TextWidth(q.Spent.value(figure, in.Unit), small, false))
			if q.Spent.ok() {
				lo, hi = math.Min(lo, sum+q.Spent.X), math.Max(hi, sum+q.Spent.X)
				hi = math.Max(hi, sum+q.Spent.most())
				sum += q.Spent.X
			}
		}
		margin = math.Max(margin, draw.TextWidth(in.spentTo(Boundary(b)).value(in.Unit), small, true))
	}
	if hi == lo {
		hi = lo + 1
	}
	margin = math.Min(margin, 0.4*s.Width)
	wide := s.Width >= 560
	left, right := pad, s.Width-pad
	if wide {
		left, right = s.column(longest, 0.2, 0.42), s.Width-pad-margin-gap
	}
	a := levelAxis(lo, hi, right-left-endLabels, false).tightened(lo, hi)
	at := func(v float64) float64 { return left + (right-left)*a.share(v) }
	times := (right - left) / (a.hi - a.lo) * (above.hi - above.lo) / roomAbove
	y = s.notes(y+10, s.p.Ink, "What is spent, part by part, each counted once") - 6
	var bars sheet // drawn after the guide lines, whose length is not known yet
	bars.Scene, bars.p = &draw.Scene{Width: s.Width}, s.p
	var bands []band
	const bar = 13.0
	row := func(name, value string, strong bool) (barAt float64) {
		room := left - pad - gap
		value = draw.Fit(value, small, strong, 0.4*s.Width)
		if !wide {
			room = s.Width - 2*pad - gap - draw.TextWidth(value, small, strong)
		}
		bars.Text(draw.Text{At: draw.Point{X: pad, Y: y + 14}, Text: draw.Fit(name, body, strong, room), Size: body, Colour: s.p.Ink, Bold: strong})
		bars.Text(draw.Text{At: draw.Point{X: s.Width - pad, Y: y + 14}, Text: value, Size: small, Colour: s.p.Ink, Bold: strong, Anchor: draw.End})
		barAt = y + 4
		if !wide {
			barAt = y + 19
		}
		bands = append(bands, band{barAt - 2, barAt + bar + 2})
		return barAt
	}
	height := 21.0
	if !wide {
		height = 37
	}
	from := 0.0
	for b := range in.shown() {
		parts := in.partsAt(Boundary(b))
		for _, q := range parts {
			words := fmt.Sprintf("%s: %s, counted from %s on", q.Name, q.Spent.both(figure, in.Unit), boundaryNames[b])
			bars.hover(y, height, q.Item, words)
			barAt := row(q.Name, q.Spent.value(figure, in.Unit), false)
			switch {
			case q.Spent.unknown():
				anyUnknown = true
				x := math.Min(at(from), right-14) // nobody knows how far it goes
				bars.Bar(x, barAt, right-x, bar, s.unknown(), q.Item, words)
			case q.Spent.ok():
				x0, x1 := at(math.Min(from, from+q.Spent.X)), at(math.Max(from, from+q.Spent.X))
				if x1-x0 < 1.5 { // a part too small to see is still spent
					x1 = x0 + 1.5
				}
				bars.Bar(x0, barAt, x1-x0, bar, draw.Style{Fill: s.p.Ramp(spentShade)}, q.Item, words)
				start := from
				bars.span(func(v float64) float64 { return at(start + v) }, barAt, bar, q.Spent, q.Item, words)
				from += q.Spent.X
			}
			y += height
		}
		v := in.spentTo(Boundary(b))
		name := "spent, " + boundaryNames[b]
		words := name + ": " + v.value(in.Unit)
		if g := v.gaps(); g != "" {
			words += ", " + g
		}
		barAt := row(name, v.value(in.Unit), true)
		x0, x1 := at(math.Min(0, v.sum)), at(math.Max(0, v.sum))
		bars.Bar(x0, barAt, math.Max(1.5, x1-x0), bar, draw.Style{Stroke: s.p.Ink, Width: 1.2}, in.Rungs[b].Item, words)
		y += height
		var below []piece
		if len(parts) == 0 {
			below = append(below, piece{text: "nothing is added here", colour: s.p.Faint})
		}
		if g := v.gaps(); g != "" {
			below = append(below, piece{text: g, colour: s.p.Faint})
		}
		if len(below) > 0 {
			y += lineHeight*float64(bars.flow(pad, y+8, s.Width-2*pad, below)) + 2
		}
		if b < len(in.shown())-1 {
			bars.line(s.p.Rule, 1, pad, y+1, s.Width-pad, y+1)
			y += 3
		}
	}
	s.levelTicks(a, left, right-left, y, bands...)
	s.Items = append(s.Items, bars.Items...)
	label := "energy spent over the life, " + in.Unit
	if times > 1.05 || times < 0.95 {
		label += "; on this scale " + figure(times) + " times as long as above"
	}
	return y + 33 + s.centred((left+right)/2, y+33, math.Max(right-left, 280), label), anyUnknown
}
