package chart

import (
	"fmt"
	"math"
	"strings"

	"groundtally/app/draw"
)

// PowerCurve is a machine's power at each wind speed, with how often the wind has that speed at its hub.
type PowerCurve struct {
	Title     string // for readers who cannot see the picture
	ID        string // tells its hatching from that of other pictures on one page
	Machine   string
	Published bool // a table of the machine; otherwise a generic estimate
	Bins      []SpeedBin
	RatedKW   float64
	MeanSpeedMPerS,
	CutInMPerS, CutOutMPerS float64 // 0 where they are not known
}

// SpeedBin is one band of wind speeds, by rising speed. A number that is not known is NaN.
type SpeedBin struct {
	SpeedMPerS float64 // in the middle of the band
	Time       float64 // share of the year
	PowerKW    float64
	Energy     float64 // share of what the machine would give where no other stands before it
}

// curveBins are the bins that are drawn, with their edges: one more than the bins.
type curveBins struct {
	bins  []SpeedBin
	edges []float64
}

// shown leaves out the bins beyond the last in which anything happens: a table of speeds goes on far beyond any
// wind, and would press the rest together.
func (in PowerCurve) shown() curveBins {
	last := len(in.Bins)
	for last > 0 {
		b := in.Bins[last-1]
		if b.Time >= 0.0005 || b.PowerKW > 0 || b.Energy >= 0.0005 || math.IsNaN(b.Time+b.PowerKW+b.Energy) {
			break
		}
		last--
	}
	out := curveBins{bins: in.Bins[:last]}
	for i, b := range out.bins {
		half := 0.5
		switch {
		case i > 0:
			half = (b.SpeedMPerS - out.bins[i-1].SpeedMPerS) / 2
		case last > 1:
			half = (out.bins[1].SpeedMPerS - b.SpeedMPerS) / 2
		}
		if i == 0 {
			out.edges = append(out.edges, math.Max(0, b.SpeedMPerS-half))
		} else {
			out.edges[i] = b.SpeedMPerS - half
		}
		out.edges = append(out.edges, b.SpeedMPerS+half)
	}
	return out
}

// middleHalf gives the speeds between which the middle half of the energy comes: a quarter comes below, a quarter
// above. Within a bin the energy is taken as even.
func (c curveBins) middleHalf() (from, to float64, ok bool) {
	sum := 0.0
	for _, b := range c.bins {
		sum += b.Energy
	}
	if !(sum > 0) {
		return 0, 0, false
	}
	at := func(share float64) float64 {
		below := 0.0
		for i, b := range c.bins {
			if b.Energy > 0 && below+b.Energy >= share*sum {
				return c.edges[i] + (c.edges[i+1]-c.edges[i])*(share*sum-below)/b.Energy
			}
			below += b.Energy
		}
		return c.edges[len(c.bins)]
	}
	return at(0.25), at(0.75), true
}

func speed(x float64) string { return strings.TrimSuffix(number(x, 1), ".0") }

func halfWords(from, to float64) string {
	return fmt.Sprintf("half of the energy between %s and %s m/s", number(from, 1), number(to, 1))
}

// curveNote tells where the curve comes from; warn where that wants attention.
func (in PowerCurve) curveNote() (words string, warn bool) {
	if in.Published {
		return "power curve from a table, not an estimate", false
	}
	return "generic estimate of the power curve, not the maker's own", true
}

// words is the picture in one sentence, for readers who cannot see it.
func (in PowerCurve) words(c curveBins) string {
	var out []string
	if from, to, ok := c.middleHalf(); ok {
		out = append(out, halfWords(from, to))
	}
	if in.MeanSpeedMPerS > 0 {
		out = append(out, "mean speed "+speed(in.MeanSpeedMPerS)+" m/s")
	}
	if in.RatedKW > 0 {
		out = append(out, "rated "+number(in.RatedKW, 0)+" kW")
	}
	if w := in.runs(); w != "" {
		out = append(out, w)
	}
	note, _ := in.curveNote()
	return strings.Join(append(out, note), "; ")
}

// runs tells between which speeds the machine turns.
func (in PowerCurve) runs() string {
	if !(in.CutOutMPerS > in.CutInMPerS && in.CutInMPerS > 0) {
		return ""
	}
	return "runs from " + speed(in.CutInMPerS) + " to " + speed(in.CutOutMPerS) + " m/s"
}

// titled joins the title of a picture and what it says in words.
func titled(title, words string) string {
	if title == "" || words == "" {
		return title + words
	}
	return title + ": " + words
}

// CurveOverWind draws the power of a machine as a line over bars of how often each wind speed blows, and how much of
// the energy comes at it.
func CurveOverWind(in PowerCurve, p draw.Palette, width float64) *draw.Scene {
	c := in.shown()
	if len(c.bins) == 0 {
		return newSheet(width, in.Title, in.ID, p).nothing("The wind speeds at the hub are unknown")
	}
	s := newSheet(width, titled(in.Title, in.words(c)), in.ID, p)
	highest, most, unknown, line := in.RatedKW, 0.0, false, false
	for _, b := range c.bins {
		unknown = unknown || math.IsNaN(b.Time+b.PowerKW+b.Energy)
		line = line || b.PowerKW >= 0
		for _, v := range []float64{b.Time, b.Energy} {
			if v > most {
				most = v
			}
		}
		if b.PowerKW > highest {
			highest = b.PowerKW
		}
	}
	if !(highest > 0) {
		highest = 1
	}
	kw := newAxis(0, highest, 5, false)
	steps := math.Round((kw.hi - kw.lo) / kw.step)
	share := axis{step: roundUp(100 * most / 0.85 / steps)}
	share.hi = share.step * steps
	share.decimals = decimalsOf(share.step)
	marginLeft, marginRight := 0.0, 0.0
	for i, t := range kw.ticks() {
		marginLeft = math.Max(marginLeft, draw.TextWidth(kw.label(t), small, false))
		marginRight = math.Max(marginRight, draw.TextWidth(share.label(share.step*float64(i)), small, false))
	}
	left, right := pad+marginLeft+6, s.Width-pad-marginRight-6
	x := func(v float64) float64 {
		lo, hi := c.edges[0], c.edges[len(c.bins)]
		return left + (right-left)*math.Max(0, math.Min(1, (v-lo)/(hi-lo)))
	}
	s.write(pad, 18, "power, kW", small, p.Faint, draw.Start)
	s.write(s.Width-pad, 18, "share of the year and of the energy, %", small, p.Faint, draw.End)
	top := 28.0
	from, to, half := c.middleHalf()
	over := top // where the ground of the middle half begins
	if half {
		top += 18
		over = top
	}
	mean := in.MeanSpeedMPerS > c.edges[0] && in.MeanSpeedMPerS < c.edges[len(c.bins)]
	if mean {
		top += 18
	}
	tall := math.Round(math.Min(240, math.Max(140, 0.36*s.Width)))
	bottom := top + tall
	yKW := func(v float64) float64 { return bottom - tall*kw.share(v) }
	yShare := func(v float64) float64 { return bottom - tall*share.share(100*v) }
	if half {
		s.Bar(x(from), over, x(to)-x(from), bottom-over, draw.Style{Fill: p.Land}, "", halfWords(from, to))
	}
	for i, t := range kw.ticks() {
		s.line(p.Rule, 1, left, yKW(t), right, yKW(t))
		s.write(left-6, yKW(t)+3.8, kw.label(t), small, p.Faint, draw.End)
		s.write(right+6, yKW(t)+3.8, share.label(share.step*float64(i)), small, p.Faint, draw.Start)
	}
	if half {
		s.line(p.Accent, 2, x(from), over, x(to), over)
		s.within(left, (x(from)+x(to))/2, over-8, halfWords(from, to), p.Ink)
	}
	for i, b := range c.bins {
		s.speedBar(i, b, band{top, bottom}, c.edges[i], c.edges[i+1], x, yShare)
	}
	if mean {
		m := x(in.MeanSpeedMPerS)
		s.Line(draw.Style{Stroke: p.Ink, Width: 1, Dash: "3 3"}, draw.Point{X: m, Y: top - 15}, draw.Point{X: m, Y: bottom})
		// To the left where there is room, because most of the energy comes above the mean.
		words, at, anchor := "mean "+speed(in.MeanSpeedMPerS)+" m/s", m-4, draw.End
		if at-draw.TextWidth(words, small, false) < left {
			at, anchor = m+4, draw.Start
		}
		s.write(at, top-8, words, small, p.Ink, anchor)
	}
	for _, run := range in.lines(c) {
		pts := make([]draw.Point, len(run))
		for i, q := range run {
			pts[i] = draw.Point{X: x(q.X), Y: yKW(q.Y)}
		}
		if len(pts) == 1 { // a line of one place would not be seen
			s.Path(draw.Path{Rings: [][]draw.Point{ringAround(pts[0], 2.5)}, Closed: true, Style: draw.Style{Fill: p.Ink}})
			continue
		}
		s.Line(draw.Style{Stroke: p.Paper, Width: 4.5}, pts...)
		s.Line(draw.Style{Stroke: p.Ink, Width: 2}, pts...)
	}
	s.line(p.Faint, 1, left, bottom, right, bottom)
	lo, hi := c.edges[0], c.edges[len(c.bins)]
	speeds := levelAxis(lo, hi, right-left, false)
	for _, t := range speeds.ticks() {
		if t >= lo-1e-9 && t <= hi+1e-9 {
			s.line(p.Faint, 1, x(t), bottom, x(t), bottom+4)
			s.write(x(t), bottom+17, speeds.label(t), small, p.Ink, draw.Middle)
		}
	}
	y := bottom + 33 + s.centred((left+right)/2, bottom+33, right-left, "wind speed at hub height, m/s") - 6
	keys := []key{{style: draw.Style{Fill: p.Ramp(timeShade)}, text: "share of the year"}, {style: draw.Style{Fill: p.Accent}, text: "share of the energy"}}
	if line {
		words := "power"
		if in.RatedKW > 0 {
			words += ", rated " + number(in.RatedKW, 0) + " kW"
		}
		keys = append(keys, key{line: true, style: draw.Style{Stroke: p.Ink, Width: 2}, text: words})
	}
	if unknown {
		keys = append(keys, key{style: s.unknown(), text: "unknown"})
	}
	y += s.legend(y, keys) + 16
	foot := in.Machine
	if w := in.runs(); w != "" {
		foot = strings.TrimPrefix(foot+"; "+w, "; ")
	}
	for _, l := range draw.Lines(foot, small, false, s.Width-2*pad, 3) {
		s.write(pad, y, l, small, p.Ink, draw.Start)
		y += lineHeight
	}
	note, warn := in.curveNote()
	colour := p.Faint
	if warn {
		colour = p.Warm
	}
	s.write(pad, y, draw.Fit(note, small, false, s.Width-2*pad), small, colour, draw.Start)
	return s.done(y + 10)
}

// timeShade is the place on the ramp of the bars of time: pale, so that the energy and the power stand before them.
const timeShade = 0.16

// speedBar draws how often a band of speeds blows, with the narrower bar of its energy before it; hatched over the
// whole height where either is not known.
func (s *sheet) speedBar(i int, b SpeedBin, within band, from, to float64, x, y func(float64) float64) {
	item := fmt.Sprintf("bin-%d", i)
	x0, x1 := x(from), x(to)
	air := math.Min(2, (x1-x0)/6)
	share := func(v float64) string {
		if math.IsNaN(v) {
			return "unknown share"
		}
		return number(100*v, 1) + " %"
	}
	power := "power unknown"
	if !math.IsNaN(b.PowerKW) {
		power = "power " + figure(b.PowerKW) + " kW"
	}
	words := fmt.Sprintf("%s to %s m/s: %s of the year, %s, %s of the energy", speed(from), speed(to), share(b.Time), power, share(b.Energy))
	s.Bar(x0, within.top, x1-x0, within.bottom-within.top, draw.Style{}, item, words)
	if math.IsNaN(b.Time) || math.IsNaN(b.Energy) {
		s.Bar(x0+air/2, within.top, x1-x0-air, within.bottom-within.top, s.unknown(), item, words)
	}
	if b.Time > 0 {
		s.Bar(x0+air/2, y(b.Time), x1-x0-air, within.bottom-y(b.Time), draw.Style{Fill: s.p.Ramp(timeShade)}, item, words)
	}
	if b.Energy > 0 {
		w := (x1 - x0) * 0.36
		s.Bar((x0+x1-w)/2, y(b.Energy), w, within.bottom-y(b.Energy), draw.Style{Fill: s.p.Accent}, item, words)
	}
}

// lines gives the power by speed, in pieces where it is unknown in between. Where the machine stops from full power
// the line falls at that speed and not on the way to the next bin, as the machine does.
func (in PowerCurve) lines(c curveBins) (out [][]draw.Point) {
	var run []draw.Point
	for i, b := range c.bins {
		if !(b.PowerKW >= 0) {
			if len(run) > 0 {
				out, run = append(out, run), nil
			}
			continue
		}
		stop := in.CutOutMPerS
		if len(run) > 0 && b.PowerKW == 0 && stop >= c.bins[i-1].SpeedMPerS && stop <= b.SpeedMPerS {
			if before := run[len(run)-1].Y; before > in.RatedKW/2 {
				run = append(run, draw.Point{X: stop, Y: before}, draw.Point{X: stop})
			}
		}
		run = append(run, draw.Point{X: b.SpeedMPerS, Y: b.PowerKW})
	}
	if len(run) == 0 {
		return out
	}
	if last := run[len(run)-1]; last.Y > 0 && in.CutOutMPerS > last.X && in.CutOutMPerS <= c.edges[len(c.bins)]+1e-9 {
		run = append(run, draw.Point{X: in.CutOutMPerS, Y: last.Y}, draw.Point{X: in.CutOutMPerS})
	}
	return append(out, run)
}

// within writes a text around x, moved so that it leaves neither the plot on its left nor the picture.
func (s *sheet) within(left, x, y float64, text, colour string) {
	text = draw.Fit(text, small, false, s.Width-pad-left)
	half := draw.TextWidth(text, small, false) / 2
	s.write(math.Max(left+half, math.Min(x, s.Width-pad-half)), y, text, small, colour, draw.Middle)
}

// roundUp gives the next round number, of a row fine enough that little room is lost.
func roundUp(x float64) float64 {
	if !(x > 0) {
		return 1
	}
	power := math.Pow(10, math.Floor(math.Log10(x)))
	for _, m := range []float64{1, 1.5, 2, 2.5, 3, 4, 5, 6, 8} {
		if m*power >= x*(1-1e-9) {
			return m * power
		}
	}
	return 10 * power
}

// decimalsOf gives how many decimals a round step needs.
func decimalsOf(step float64) int {
	for d := range 6 {
		if f := step * math.Pow10(d); math.Abs(f-math.Round(f)) < 1e-6 {
			return d
		}
	}
	return 6
}
