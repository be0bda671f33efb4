package chart

import (
	"cmp"
	"fmt"
	"math"
	"slices"

	"groundtally/app/draw"
)

// Drivers are the factor groups behind the uncertainty of one quantity.
type Drivers struct {
	Title  string // for readers who cannot see the picture
	ID     string // tells its hatching from that of other pictures on one page
	What   string // the quantity: "energy return, whole life"
	Trials int    // 0 where it is not told
	Groups []Driver
}

// Driver is one group of factors that are drawn together in each trial.
type Driver struct {
	Item string
	Name string
	Rank Amount // rank correlation with the quantity over all trials, −1 to 1; beyond that it is unknown
}

func (d Driver) known() bool { return d.Rank.ok() && math.Abs(d.Rank.X) <= 1+1e-9 }

func (d Driver) unknown() bool { return d.Rank.unknown() || d.Rank.ok() && !d.known() }

// says tells the correlation with its way in words.
func (d Driver) says() string {
	switch {
	case d.unknown():
		return "unknown"
	case !d.known():
		return d.Rank.word()
	case d.Rank.X >= 0.005:
		return signed(d.Rank.X, 2) + " raises"
	case d.Rank.X <= -0.005:
		return signed(d.Rank.X, 2) + " lowers"
	}
	return "0.00 neither"
}

// mostDrivers bounds the rows.
const mostDrivers = 12

// driverOrder sorts by size; of equal ones by name. Those without a number come last.
func driverOrder(a, b Driver) int {
	size := func(d Driver) float64 {
		if d.known() {
			return math.Abs(d.Rank.X)
		}
		return -1
	}
	return cmp.Or(cmp.Compare(size(b), size(a)), cmp.Compare(a.Name, b.Name), cmp.Compare(a.Item, b.Item))
}

// Tornado draws which factor groups move a quantity most: to the right what raises it, to the left what lowers it, by
// rank correlation, the strongest first.
func Tornado(in Drivers, p draw.Palette, width float64) *draw.Scene {
	s := newSheet(width, in.Title, in.ID, p)
	if len(in.Groups) == 0 {
		return s.nothing("what moves it is unknown: no trials")
	}
	all := slices.Clone(in.Groups)
	slices.SortStableFunc(all, driverOrder)
	shown := all[:min(len(all), mostDrivers)]
	wide := s.Width >= 560
	longest, label := 0.0, draw.TextWidth("−0.00 lowers", small, false)+6
	for _, d := range shown {
		longest = math.Max(longest, draw.TextWidth(d.Name, body, false))
		label = math.Max(label, draw.TextWidth(d.says(), small, false)+6)
	}
	left, right := pad, s.Width-pad
	if wide {
		left = s.column(longest, 0.2, 0.42)
	}
	middle := (left + right) / 2
	half := (right-left)/2 - label
	y := pad + 6
	for _, l := range draw.Lines("What moves "+in.What, body, true, s.Width-2*pad, 2) {
		s.bold(pad, y+4, l, body, p.Ink, draw.Start)
		y += 16
	}
	y += 6
	s.write(middle-gap, y, draw.Fit("lowers it", small, false, middle-left-gap), small, p.Faint, draw.End)
	s.write(middle+gap, y, draw.Fit("raises it", small, false, right-middle-gap), small, p.Faint, draw.Start)
	y += 8
	row, at := 24.0, 4.0
	if !wide {
		row, at = 40, 20
	}
	top := y
	a := axis{lo: -1, hi: 1, step: 0.5, decimals: 1}
	bottom := top + row*float64(len(shown))
	var bands []band
	for i := range shown {
		bands = append(bands, band{top + row*float64(i) + at - 1, top + row*float64(i) + at + 16})
	}
	s.levelTicks(a, middle-half, 2*half, bottom, bands...)
	unknown := false
	for _, d := range shown {
		words := d.Name + ": rank correlation " + d.says()
		if d.unknown() && d.Rank.Why != "" {
			words += ": " + d.Rank.Why
		}
		s.hover(y, row, d.Item, words)
		room := s.Width - 2*pad
		if wide {
			room = left - pad - gap
		}
		s.write(pad, y+15, draw.Fit(d.Name, body, false, room), body, p.Ink, draw.Start)
		unknown = s.driver(d, y+at, middle, half, words) || unknown
		y += row
	}
	y = bottom + 33 + s.centred(middle, bottom+33, math.Max(right-left, 290), "rank correlation, a pure number from −1 to 1") + 4
	if unknown {
		y += s.legend(y-8, []key{{style: s.unknown(), text: "unknown"}}) + 8
	}
	notes := []string{leftOut(all[len(shown):])}
	trials := "over all trials"
	if in.Trials > 0 {
		trials = "over " + plural(in.Trials, "trial")
	}
	notes = append(notes, "How closely each group and the quantity go together in rank, "+trials+"; not by how much.")
	return s.done(s.notes(y, p.Faint, notes...) - 4)
}

// driver draws the bar of a group with its words at the end; true where it is unknown.
func (s *sheet) driver(d Driver, y, middle, half float64, words string) (unknown bool) {
	const bar = 14.0
	s.line(s.p.Faint, 1, middle, y-2, middle, y+bar+2)
	text := draw.Text{At: draw.Point{X: middle + 6, Y: y + 11}, Text: d.says(), Size: small, Colour: s.p.Ink, Anchor: draw.Start}
	switch {
	case d.unknown(): // it may be anywhere
		s.Bar(middle-half, y, 2*half, bar, s.unknown(), d.Item, words)
		text.At.X = middle + half + 6
	case d.known():
		x := middle + half*math.Max(-1, math.Min(1, d.Rank.X))
		if x < middle {
			s.Bar(x, y, middle-x, bar, draw.Style{Fill: s.p.Ramp(0.45)}, d.Item, words)
			text.At.X, text.Anchor = x-5, draw.End
		} else {
			s.Bar(middle, y, x-middle, bar, draw.Style{Fill: s.p.Accent}, d.Item, words)
			text.At.X = x + 5
		}
	}
	if d.says() == "0.00 neither" {
		text.At.X, text.Anchor = middle+6, draw.Start
	}
	s.clear(text)
	return d.unknown()
}

// leftOut counts in words the groups that have no row.
func leftOut(rest []Driver) string {
	if len(rest) == 0 {
		return ""
	}
	largest, known := 0.0, 0
	for _, d := range rest {
		if d.known() {
			known++
			largest = math.Max(largest, math.Abs(d.Rank.X))
		}
	}
	out := plural(len(rest), "more group") + " not drawn"
	if known > 0 {
		out += fmt.Sprintf(": %d with a correlation of %s at most", known, number(largest, 2))
	}
	if n := len(rest) - known; n > 0 {
		out += fmt.Sprintf("; %d without a number", n)
	}
	return out
}
