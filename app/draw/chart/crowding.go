package chart

import (
	"fmt"
	"math"
	"strings"

	"groundtally/app/draw"
)

// Sweep is a plant at several spacings or ground covers.
type Sweep struct {
	Title     string // for readers who cannot see the picture
	ID        string // tells its hatching from that of other pictures on one page
	Swept     string // what is varied: "spacing", "ground cover"
	SweptUnit string // "rotor diameters"; "" for a pure number
	Unit      string // of energy per hectare: "MWh/(ha yr)"
	Currency  string // how the return is counted, on its axis: ElectricOverPrimary where it is empty
	EnergyAs  string // what energy per hectare is, on its axis; ElectricEnergy where both this and Currency are empty
	NetAs     string // how net energy is counted, for its mark: "as electricity"

	Points []CrowdPoint // in the order of the sweep; a line joins them

	BestReturn, MostNet, MostEnergy, Chosen CrowdMark
	Caption                                 string
}

// ElectricEnergy is what energy per hectare is where a sweep does not say otherwise.
const ElectricEnergy = "electricity at the grid"

// CrowdPoint is the plant at one value of the sweep.
type CrowdPoint struct {
	Item       string
	Swept      float64
	Energy     Amount // per hectare
	Return     Amount // whole life
	WithStocks Amount
}

// CrowdMark is a place on the curve that is told by name. It need not be one of the points.
type CrowdMark struct {
	Item           string
	State          State // Number where the place is known
	Swept          float64
	Energy, Return float64
	AtEnd          bool   // it lies at an end of the sweep, so the true one may lie beyond
	Why            string // why it is not known
}

func (m CrowdMark) ok() bool {
	return m.State == Number && finite(m.Energy) && finite(m.Return) && finite(m.Swept)
}

// crowdShape is how a mark looks, around its middle.
type crowdShape struct {
	name, short string
	outline     []draw.Point
}

// crowdShapes are those of best return, most net energy, most energy, the choice.
var crowdShapes = [4]crowdShape{
	{"best return", "best return", []draw.Point{{X: 0, Y: -6.4}, {X: 6, Y: 4.6}, {X: -6, Y: 4.6}}},
	{"most net energy", "most net", []draw.Point{{X: -5, Y: -5}, {X: 5, Y: -5}, {X: 5, Y: 5}, {X: -5, Y: 5}}},
	{"most energy per hectare", "most per ha", []draw.Point{{X: 0, Y: -6.6}, {X: 6.6, Y: 0}, {X: 0, Y: 6.6}, {X: -6.6, Y: 0}}},
	{"your choice", "your choice", plus(6.4, 2.1)},
}

// plus is a cross of two beams of half so long and half so thick.
func plus(l, w float64) []draw.Point {
	return []draw.Point{{X: -w, Y: -l}, {X: w, Y: -l}, {X: w, Y: -w}, {X: l, Y: -w}, {X: l, Y: w}, {X: w, Y: w}, {X: w, Y: l}, {X: -w, Y: l}, {X: -w, Y: w}, {X: -l, Y: w}, {X: -l, Y: -w}, {X: -w, Y: -w}}
}

func (in Sweep) marks() [4]CrowdMark {
	return [4]CrowdMark{in.BestReturn, in.MostNet, in.MostEnergy, in.Chosen}
}

func (in Sweep) currency() string {
	if in.Currency == "" {
		return ElectricOverPrimary
	}
	return in.Currency
}

func (in Sweep) energyLabel() string {
	out := "energy per hectare, " + in.Unit
	switch {
	case in.EnergyAs != "":
		out += "; " + in.EnergyAs
	case in.Currency == "":
		out += "; " + ElectricEnergy
	}
	return out
}

func (in Sweep) swept(x float64) string {
	return in.Swept + " " + unitOf(strings.TrimSuffix(number(x, 2), ".00"), in.SweptUnit)
}

// says tells where a mark lies, in words.
func (in Sweep) says(i int) string {
	m, name := in.marks()[i], crowdShapes[i].name
	if i == 1 && in.NetAs != "" {
		name += " " + in.NetAs
	}
	if !m.ok() {
		a := Amount{State: m.State, X: math.NaN()}
		if m.Why != "" {
			return name + ": " + a.word() + ": " + m.Why
		}
		return name + ": " + a.word()
	}
	out := fmt.Sprintf("%s: %s, %s, return %s", name, in.swept(m.Swept), unitOf(figure(m.Energy), in.Unit), figure(m.Return))
	if m.AtEnd {
		out += "; at the end of the sweep, so the true one may lie beyond"
	}
	return out
}

func (in Sweep) pointWords(q CrowdPoint) string {
	return fmt.Sprintf("%s: %s; energy return %s; with stocks %s", in.swept(q.Swept), q.Energy.both(figure, in.Unit), q.Return.both(figure, ""), q.WithStocks.both(figure, ""))
}

// Crowding draws energy per hectare against energy return for a sweep, with and without stocks, and marks where each
// of three aims is best, and the choice. No aim is picked as the right one.
func Crowding(in Sweep, p draw.Palette, width float64) *draw.Scene {
	lo, hi := [2]float64{math.Inf(1), math.Inf(1)}, [2]float64{math.Inf(-1), math.Inf(-1)}
	grow := func(k int, v float64) { lo[k], hi[k] = math.Min(lo[k], v), math.Max(hi[k], v) }
	nowhere, partly, stocks, unknown := 0, 0, false, false
	for _, q := range in.Points {
		unknown = unknown || q.Energy.unknown() || q.Return.unknown()
		if !q.Energy.ok() || !q.Return.ok() && !q.WithStocks.ok() {
			nowhere++
			continue
		}
		if !q.Return.ok() {
			partly++
		}
		grow(0, q.Energy.X)
		for k, v := range []Amount{q.Return, q.WithStocks} {
			if v.ok() {
				grow(1, v.X)
				stocks = stocks || k == 1
			}
		}
	}
	if math.IsInf(lo[0], 1) {
		return newSheet(width, in.Title, in.ID, p).nothing("What another " + in.Swept + " would give is unknown")
	}
	words := ""
	for i, m := range in.marks() {
		if m.ok() {
			grow(0, m.Energy)
			grow(1, m.Return)
		}
		words += in.says(i) + ". "
	}
	s := newSheet(width, titled(in.Title, strings.TrimSpace(words)), in.ID, p)
	fromZero := func(k int) { // where little is left out, the axis starts at 0
		if lo[k] > 0 && lo[k] < 0.4*hi[k] {
			lo[k] = 0
		}
	}
	fromZero(0)
	fromZero(1)
	air := (hi[1] - lo[1]) / 12 // for marks and their words
	ay := newAxis(lo[1], hi[1]+air, 5, false).tightened(lo[1], hi[1]+air)
	margin := 0.0
	for _, t := range ay.ticks() {
		margin = math.Max(margin, draw.TextWidth(ay.label(t), small, false))
	}
	left, right := pad+margin+8, s.Width-pad-10
	ax := levelAxis(lo[0], hi[0], right-left, false).tightened(lo[0], hi[0])
	notZero := func(a axis, label string) string {
		if a.lo > 0 {
			label += "; the axis starts at " + number(a.lo, a.decimals+1) + ", not at 0"
		}
		return label
	}
	y := pad + 8.0
	for _, l := range draw.Lines(notZero(ay, "energy return, whole life: "+in.currency()), small, false, s.Width-2*pad, 3) {
		s.write(pad, y, l, small, p.Faint, draw.Start)
		y += lineHeight
	}
	top := y + 2
	tall := math.Round(math.Min(360, math.Max(190, 0.5*(right-left))))
	bottom := top + tall
	at := func(x, y float64) draw.Point {
		return draw.Point{X: left + (right-left)*ax.share(x), Y: bottom - tall*ay.share(y)}
	}
	s.levelTicks(ax, left, right-left, bottom, band{top, bottom})
	for _, t := range ay.ticks() {
		s.line(p.Rule, 1, left, at(0, t).Y, right, at(0, t).Y)
		s.write(left-6, at(0, t).Y+3.8, ay.label(t), small, p.Faint, draw.End)
	}
	f := &free{plot: draw.Box{X0: left, Y0: top, X1: right, Y1: bottom}}
	for _, q := range in.Points { // a place in x whose return nobody knows
		if q.Energy.ok() && q.Return.unknown() {
			c := at(q.Energy.X, 0)
			s.Bar(c.X-4, top, 8, tall, draw.Style{Hatch: true}, q.Item, in.pointWords(q))
			f.taken = append(f.taken, draw.Box{X0: c.X - 4, Y0: top, X1: c.X + 4, Y1: bottom})
		}
	}
	s.crowdLine(in, func(q CrowdPoint) Amount { return q.WithStocks }, draw.Style{Stroke: p.Ink, Width: 1.6, Dash: "6 4"}, p.Paper, at, f)
	s.crowdLine(in, func(q CrowdPoint) Amount { return q.Return }, draw.Style{Stroke: p.Accent, Width: 2.2}, p.Accent, at, f)
	s.crowdMarks(in, at, f)
	s.line(p.Faint, 1, left, bottom, right, bottom)
	y = bottom + 33 + s.centred((left+right)/2, bottom+33, right-left, notZero(ax, in.energyLabel())) - 4
	keys := []key{{line: true, style: draw.Style{Stroke: p.Accent, Width: 2.2}, text: "energy return, whole life"}}
	if stocks {
		keys = append(keys, key{line: true, style: draw.Style{Stroke: p.Ink, Width: 1.6, Dash: "6 4"}, text: "with stocks, this program's own ratio"})
	}
	if unknown {
		keys = append(keys, key{style: s.unknown(), text: "unknown"})
	}
	y += s.legend(y, keys) + 6
	for i := range in.marks() {
		y = s.markWords(i, in.marks()[i], in.says(i), y)
	}
	notes := []string{"Each point is the plant at another " + in.Swept + ". Which aim is the right one is for you to say."}
	if !stocks {
		notes = append(notes, "The return with stocks is unknown.")
	}
	if nowhere > 0 {
		notes = append(notes, fmt.Sprintf("%d of %s cannot be placed.", nowhere, plural(len(in.Points), "point")))
	}
	if partly > 0 {
		notes = append(notes, plural(partly, "point")+" without a whole-life return.")
	}
	return s.done(s.notes(y+14, p.Faint, append(notes, in.Caption)...) - 4)
}

// crowdLine joins the points by one of their returns, in pieces where one of them has none, and marks each.
func (s *sheet) crowdLine(in Sweep, of func(CrowdPoint) Amount, st draw.Style, fill string, at func(x, y float64) draw.Point, f *free) {
	var run []draw.Point
	finish := func() {
		if len(run) > 1 {
			s.Line(draw.Style{Stroke: s.p.Paper, Width: st.Width + 2}, run...)
			s.Line(st, run...)
			f.line(run)
		}
		run = nil
	}
	for _, q := range in.Points {
		if v := of(q); q.Energy.ok() && v.ok() {
			run = append(run, at(q.Energy.X, v.X))
		} else {
			finish()
		}
	}
	finish()
	for _, q := range in.Points {
		if v := of(q); q.Energy.ok() && v.ok() {
			c := at(q.Energy.X, v.X)
			s.Path(draw.Path{Rings: [][]draw.Point{ringAround(c, dotRadius)}, Closed: true, Style: draw.Style{Fill: fill, Stroke: st.Stroke, Width: 1.2}, Item: q.Item, Title: in.pointWords(q)})
			f.mark(c, dotRadius+1)
		}
	}
}

// crowdMarks draws the named places. Those that share one stand around each other, the widest below.
func (s *sheet) crowdMarks(in Sweep, at func(x, y float64) draw.Point, f *free) {
	type placed struct {
		i     int
		c     draw.Point
		times float64
	}
	var all []placed
	for i, m := range in.marks() {
		if !m.ok() {
			continue
		}
		q := placed{i, at(m.Energy, m.Return), 1}
		for _, o := range all {
			if math.Hypot(o.c.X-q.c.X, o.c.Y-q.c.Y) < 12 {
				q.times += 0.8
			}
		}
		all = append(all, q)
	}
	for k := len(all) - 1; k >= 0; k-- {
		q := all[k]
		m := in.marks()[q.i]
		words := in.says(q.i)
		f.mark(q.c, 6.5*q.times+1)
		st := s.crowdStyle(q.i)
		if q.times > 1 {
			st.Fill = ""
		}
		ring := moved(crowdShapes[q.i].outline, q.c, q.times)
		s.Path(draw.Path{Rings: [][]draw.Point{ring}, Closed: true, Style: draw.Style{Stroke: s.p.Paper, Width: 4}})
		s.Path(draw.Path{Rings: [][]draw.Point{ring}, Closed: true, Style: st, Item: m.Item, Title: words})
	}
	for k := len(all) - 1; k >= 0; k-- { // where room is scarce the choice has its words first
		q := all[k]
		s.label(f, q.c, 6.5*q.times, crowdShapes[q.i].short)
	}
}

func (s *sheet) crowdStyle(i int) draw.Style {
	st := draw.Style{Fill: s.p.Paper, Stroke: s.p.Ink, Width: 1.6}
	if i == 3 {
		st.Fill = s.p.Ink
	}
	return st
}

// markWords writes a named place below the picture and gives where it ends; hatched beside the word where it is
// unknown.
func (s *sheet) markWords(i int, m CrowdMark, words string, y float64) float64 {
	c := draw.Point{X: pad + 9, Y: y + 8}
	switch {
	case m.ok():
		s.Path(draw.Path{Rings: [][]draw.Point{moved(crowdShapes[i].outline, c, 1)}, Closed: true, Style: s.crowdStyle(i), Item: m.Item, Title: words})
	case m.State == Unknown || m.State == Number:
		s.Rect(pad, y+2, 18, 12, s.unknown(), words)
	}
	lines := draw.Lines(words, small, false, s.Width-2*pad-keyWidth, 4)
	for k, l := range lines {
		s.write(pad+keyWidth, y+12+lineHeight*float64(k), l, small, s.p.Ink, draw.Start)
	}
	return y + 6 + lineHeight*float64(len(lines))
}
