package chart

import (
	"cmp"
	"fmt"
	"math"
	"slices"
	"strconv"

	"groundtally/app/draw"
)

// Pair are two candidates against each other.
type Pair struct {
	Title string // for readers who cannot see the picture
	ID    string // tells its hatching from that of other pictures on one page
	NameA string
	NameB string
	Keys  []PairKey
}

// PairKey is one thing that is weighed.
type PairKey struct {
	Item       string
	Title      string
	A          string  // the value of A with its unit, or its state in words
	B          string  // of B
	Difference float64 // of the shares of the score: above zero A is better
	Unknown    bool    // the value of A or B is unknown, so the difference rests on half the weight
	OverA      bool    // A is over a limit
	OverB      bool
}

// PairBars draws where two candidates differ, the largest difference first: to the left where A is
// better, to the right where B is, with the sum at the foot.
func PairBars(in Pair, p draw.Palette, width float64) *draw.Scene {
	s := newSheet(width, in.Title, in.ID, p)
	if len(in.Keys) == 0 {
		return s.nothing("nothing is weighed")
	}
	keys := slices.Clone(in.Keys)
	slices.SortStableFunc(keys, func(a, b PairKey) int {
		return cmp.Or(cmp.Compare(math.Abs(b.Difference), math.Abs(a.Difference)), cmp.Compare(a.Title, b.Title))
	})
	sum, largest, anyUnknown := 0.0, 0.0, false
	for _, k := range keys {
		sum += k.Difference
		largest = math.Max(largest, math.Abs(k.Difference))
		anyUnknown = anyUnknown || k.Unknown
	}
	largest = math.Max(largest, math.Abs(sum))
	figures := fine{decimals: 3}
	if largest < smallDifference {
		// Those that can hardly be told apart must not look far apart, and their difference is still a number.
		figures.decimals, largest = 5, smallDifference
	}
	y := pad + 10
	for _, n := range [][2]string{{"A", in.NameA}, {"B", in.NameB}} {
		s.bold(pad, y, n[0], body, p.Ink, draw.Start)
		s.write(pad+18, y, draw.Fit(n[1], body, false, s.Width-2*pad-18), body, p.Ink, draw.Start)
		y += 18
	}
	wide := s.Width >= 600
	left, room := pad, s.Width-2*pad
	if wide {
		left = math.Round(0.5 * s.Width)
		room = left - pad - 2*gap
	}
	right := s.Width - pad
	middle := (left + right) / 2
	label := math.Max(draw.TextWidth("+"+figures.text(0), small, true), draw.TextWidth("unknown", small, false)) + 6
	half := (right-left)/2 - label
	y += 8
	s.write(middle-gap, y, "A better", small, p.Faint, draw.End)
	s.write(middle+gap, y, "B better", small, p.Faint, draw.Start)
	y += 8
	top := y
	var rows sheet // drawn after the middle line, whose length is not known yet
	rows.Scene, rows.p = &draw.Scene{Width: s.Width}, p
	for _, k := range keys {
		y += rows.pairRow(k, y, room, wide, func(y, height float64) {
			rows.difference(k.Difference, middle, half/largest, y, height, p.Accent, k.Unknown, k.Item, fmt.Sprintf("%s: A %s, B %s; difference in score %s", k.Title, k.A, k.B, figures.words(k.Difference)), figures)
		})
	}
	lead := "Sum: A and B have the same score"
	switch {
	case sum >= figures.least():
		lead = "Sum: A leads by " + figures.text(sum)
	case sum <= -figures.least():
		lead = "Sum: B leads by " + figures.text(-sum)
	}
	rows.line(p.Faint, 1, pad, y+2, right, y+2)
	rows.bold(pad, y+20, lead, body, p.Ink, draw.Start)
	bar := y + 9
	if !wide {
		bar = y + 28
	}
	rows.difference(sum, middle, half/largest, bar, 14, p.Ink, false, "", lead, figures)
	bottom := bar + 18
	if wide {
		s.line(p.Faint, 1, middle, top, middle, bottom)
	}
	s.Items = append(s.Items, rows.Items...)
	foot := s.centred(middle, bottom+14, math.Max(right-left, 260), "difference in score, a pure number")
	y = bottom + 14 + foot - lineHeight + 8
	if anyUnknown {
		y += s.legend(y, []key{{style: s.unknown(), text: "unknown in A or B: counts half its weight"}})
	}
	return s.done(y + 4)
}

// smallDifference is a difference in score below which figures are written finer and bars stay short.
const smallDifference = 0.01

// fine writes differences with so many decimals.
type fine struct{ decimals int }

func (f fine) text(x float64) string { return strconv.FormatFloat(x, 'f', f.decimals, 64) }

// least is the smallest difference that is not written as nothing.
func (f fine) least() float64 { return 0.5 * math.Pow10(-f.decimals) }

func (f fine) words(difference float64) string {
	switch {
	case difference >= f.least():
		return f.text(difference) + " for A"
	case difference <= -f.least():
		return f.text(-difference) + " for B"
	}
	return "none"
}

// pairRow writes the words of a row, has its bar drawn, and gives its height.
func (s *sheet) pairRow(k PairKey, y, room float64, wide bool, bar func(y, height float64)) float64 {
	at := len(s.Items)
	s.write(pad, y+14, draw.Fit(k.Title, body, false, room), body, s.p.Ink, draw.Start)
	side := func(letter, value string, over bool) piece {
		p := piece{text: letter + " " + value, colour: s.p.Faint}
		if over {
			p = piece{text: p.text + ", over the limit", colour: s.p.Warm, bold: true}
		}
		return p
	}
	lines := s.flow(pad, y+28, room, []piece{side("A", k.A, k.OverA), side("B", k.B, k.OverB)})
	height := 24 + lineHeight*float64(lines)
	if wide {
		bar(y+(height-14)/2-1, 14)
	} else {
		bar(y+height-4, 14)
		height += 18
	}
	if k.Item != "" { // under the marks of the row
		over := draw.Path{Rings: [][]draw.Point{{{X: 0, Y: y}, {X: s.Width, Y: y}, {X: s.Width, Y: y + height}, {X: 0, Y: y + height}}}, Closed: true, Item: k.Item, Title: k.Title}
		s.Items = slices.Insert(s.Items, at, any(over))
	}
	return height
}

// difference draws a bar to the left for A, to the right for B, with its length in words beside it.
func (s *sheet) difference(d, middle, scale, y, height float64, colour string, unknown bool, item, title string, figures fine) {
	w := math.Abs(d) * scale
	st := draw.Style{Fill: colour}
	s.line(s.p.Faint, 1, middle, y-2, middle, y+height+2)
	if unknown {
		st, w = s.unknown(), math.Max(w, 10)
	}
	text := figures.text(math.Abs(d))
	if unknown && math.Abs(d) < figures.least() {
		text = "unknown"
	}
	if d >= 0 {
		s.Bar(middle-w, y, w, height, st, item, title)
		s.write(middle-w-5, y+height/2+3.8, text, small, s.p.Ink, draw.End)
	} else {
		s.Bar(middle, y, w, height, st, item, title)
		s.write(middle+w+5, y+height/2+3.8, text, small, s.p.Ink, draw.Start)
	}
}
