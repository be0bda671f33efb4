package chart

import (
	"fmt"
	"math"

	"groundtally/app/draw"
)

// Accounts are the quantities of two candidates, by account.
type Accounts struct {
	Title        string // for readers who cannot see the picture
	ID           string // tells its hatching from that of other pictures on one page
	NameA, NameB string
	Groups       []AccountGroup
	Caption      string // what the ranges mean
}

// AccountGroup is one account.
type AccountGroup struct {
	Name string
	Rows []AccountRow
}

// AccountRow is one quantity. Rows are never added, within an account or over all.
type AccountRow struct {
	Item         string
	Title        string
	Unit         string // "" or "1" for a pure number
	Better       Better
	A, B         Amount
	OverA, OverB bool // over a limit
}

func (r AccountRow) words() string {
	side := func(letter string, v Amount, over bool) string {
		out := letter + " " + v.both(figure, r.Unit)
		if over {
			out += ", over the limit"
		}
		return out
	}
	return r.Title + ": " + side("A", r.A, r.OverA) + "; " + side("B", r.B, r.OverB)
}

// ownScale gives the scale of a row: from 0, so that twice the amount is twice as long.
func (r AccountRow) ownScale(room float64) (a axis, ok bool) {
	lo, hi := 0.0, 0.0
	for _, v := range []Amount{r.A, r.B} {
		if v.ok() {
			lo, hi, ok = math.Min(lo, v.least()), math.Max(hi, v.most()), true
		}
	}
	if lo == hi {
		hi = 1
	}
	return levelAxis(lo, hi, room-endLabels, false), ok
}

// endLabels is room for labels at the ends of a scale, which are moved inwards where they would leave the picture.
const endLabels = 60.0

const scaleWords = "Each row has a scale of its own from 0: lengths compare within a row only. Rows are never added."

// SideBySide draws the accounts of two candidates one under the other, each quantity in its own unit on its own scale.
func SideBySide(in Accounts, p draw.Palette, width float64) *draw.Scene {
	s := newSheet(width, in.Title, in.ID, p)
	rows := 0
	for _, g := range in.Groups {
		rows += len(g.Rows)
	}
	if rows == 0 {
		return s.nothing("nothing is accounted for")
	}
	y := pad + 10
	for i, n := range []string{in.NameA, in.NameB} {
		s.Rect(pad, y-10, 18, 12, draw.Style{Fill: s.sideFill(i)}, "")
		s.bold(pad+24, y, sideLetters[i], body, p.Ink, draw.Start)
		s.write(pad+40, y, draw.Fit(n, body, false, s.Width-2*pad-40), body, p.Ink, draw.Start)
		y += 18
	}
	y += 2
	for _, g := range in.Groups {
		if len(g.Rows) == 0 {
			continue
		}
		s.line(p.Faint, 1, pad, y, s.Width-pad, y)
		s.bold(pad, y+17, draw.Fit(g.Name, body, true, s.Width-2*pad), body, p.Ink, draw.Start)
		y += 24
		for _, r := range g.Rows {
			y += s.accountRow(r, y) + 6
		}
	}
	s.line(p.Faint, 1, pad, y, s.Width-pad, y)
	return s.done(s.notes(y+16, p.Faint, scaleWords, in.Caption) - 4)
}

var sideLetters = [2]string{"A", "B"}

func (s *sheet) sideFill(i int) string {
	if i == 0 {
		return s.p.Accent
	}
	return s.p.Ramp(0.35)
}

// accountRow draws one quantity and gives its height.
func (s *sheet) accountRow(r AccountRow, y float64) float64 {
	words := r.words()
	title := unitTitle(r.Title, r.Unit)
	better := ""
	if r.Better != Either {
		better = string(r.Better) + " is better"
	}
	wide := s.Width >= 640
	const bar = 13.0
	sides := [2]Amount{r.A, r.B}
	over := [2]bool{r.OverA, r.OverB}
	left, right := pad+16, s.Width-pad
	each, first := 30.0, 4.0
	if wide {
		left, right = math.Round(0.34*s.Width), math.Round(0.66*s.Width)
		each = 18
	}
	a, scaled := r.ownScale(right - left)
	lines := []string{draw.Fit(title, body, false, s.Width-2*pad)}
	if wide {
		lines = draw.Lines(title, body, false, left-16-pad-gap, 2)
	}
	named := 15 * float64(len(lines))
	if better != "" {
		named += 15
	}
	if !wide {
		first = named + 5
	}
	height := first + 2*each
	if scaled {
		height += 20
	}
	height = math.Max(height, named+6)
	s.hover(y, height, r.Item, words)
	for i, l := range lines {
		s.write(pad, y+14+15*float64(i), l, body, s.p.Ink, draw.Start)
	}
	if better != "" {
		s.write(pad, y+named-1, better, small, s.p.Faint, draw.Start)
	}
	at := func(i int) float64 { // where the bar of a side begins
		if wide {
			return y + first + each*float64(i)
		}
		return y + first + each*float64(i) + 15
	}
	if scaled {
		s.levelTicks(a, left, right-left, y+height-20, band{at(0) - 2, at(0) + bar + 2}, band{at(1) - 2, at(1) + bar + 2})
	}
	for i, v := range sides {
		pieces := []piece{{text: v.value(figure, r.Unit), colour: s.p.Ink, bold: v.ok()}}
		if over[i] {
			pieces = append(pieces, piece{text: "over the limit", colour: s.p.Warm, bold: true})
		}
		pieces = append(pieces, piece{text: v.span(figure) + v.reason(), colour: s.p.Faint})
		if wide {
			s.bold(left-14, at(i)+10.5, sideLetters[i], small, s.p.Ink, draw.Start)
			s.oneLine(right+gap, at(i)+10.5, s.Width-pad-right-gap, pieces)
		} else {
			s.bold(pad, at(i)-4, sideLetters[i], small, s.p.Ink, draw.Start)
			s.oneLine(left, at(i)-4, right-left, pieces)
		}
		s.amount(a, left, right, at(i), bar, v, s.sideFill(i), r.Item, words)
	}
	for i := range sides {
		if scaled { // the line from which both are measured
			zero := left + (right-left)*a.share(0)
			s.line(s.p.Faint, 1, zero, at(i)-2, zero, at(i)+bar+2)
		}
	}
	return height
}

func unitTitle(title, unit string) string {
	if unit == "" || unit == "1" {
		return title + ", pure number"
	}
	return fmt.Sprintf("%s, %s", title, unit)
}

// oneLine writes pieces in one line, as many as have room. What wants attention keeps its room; the first is shortened.
func (s *sheet) oneLine(x, y, room float64, pieces []piece) {
	at := 0.0
	for i, p := range pieces {
		if p.text == "" {
			continue
		}
		if i == 0 {
			left := room
			for _, q := range pieces[1:] {
				if q.colour == s.p.Warm {
					left -= q.width() + gap
				}
			}
			p.text = draw.Fit(p.text, small, p.bold, left)
		} else if at+p.width() > room {
			continue
		}
		s.Text(draw.Text{At: draw.Point{X: x + at, Y: y}, Text: p.text, Size: small, Colour: p.colour, Bold: p.bold})
		at += p.width() + gap
	}
}
