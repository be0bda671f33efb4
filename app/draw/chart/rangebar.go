package chart

import (
	"math"

	"groundtally/app/draw"
)

// Span is one consequence of one candidate among those of all.
type Span struct {
	Item     string
	Title    string // what the bar shows, in full, for the pointer
	ID       string // tells its hatching from that of other pictures on one page
	Low      float64
	Central  float64
	High     float64
	Least    float64 // among all candidates
	Greatest float64
	Unknown  bool
	Over     bool // over the limit
}

// RangeBar draws the small bar of the consequence strip: from low to high, with a mark at the central value,
// on a scale from the least to the greatest among all candidates. It may be as narrow as a cell.
func RangeBar(in Span, p draw.Palette, width float64) *draw.Scene {
	const height, thick = 12.0, 4.0
	width = math.Max(width, 24)
	s := &sheet{Scene: &draw.Scene{Width: width, Title: in.Title, ID: in.ID}, p: p}
	s.Bar(0, 0, width, height, draw.Style{}, in.Item, in.Title)
	left, right := 2.0, width-2
	y := (height - thick) / 2
	if in.Unknown {
		s.Bar(left, y-2, right-left, thick+4, s.unknown(), in.Item, in.Title)
		return s.done(height)
	}
	s.Bar(left, y, right-left, thick, draw.Style{Fill: p.Rule}, in.Item, in.Title)
	at := func(v float64) float64 {
		if !(in.Greatest > in.Least) { // all candidates are alike
			return (left + right) / 2
		}
		return left + (right-left)*math.Max(0, math.Min(1, (v-in.Least)/(in.Greatest-in.Least)))
	}
	colour := p.Accent
	if in.Over {
		colour = p.Warm
	}
	// A range too small to see still has a place.
	x0, x1 := at(math.Min(in.Low, in.Central)), at(math.Max(in.High, in.Central))
	if x1-x0 < 2 {
		mid := math.Max(left+1, math.Min((x0+x1)/2, right-1))
		x0, x1 = mid-1, mid+1
	}
	s.Bar(x0, y, x1-x0, thick, draw.Style{Fill: colour}, in.Item, in.Title)
	c := math.Max(left+1, math.Min(at(in.Central), right-1))
	s.Bar(c-1, y-3, 2, thick+6, draw.Style{Fill: p.Ink}, in.Item, in.Title)
	if !in.Over {
		return s.done(height)
	}
	word := "over the limit"
	if draw.TextWidth(word, small, true) > width {
		word = draw.Fit("over", small, true, width)
	}
	s.bold(0, height+10, word, small, p.Warm, draw.Start)
	return s.done(height + 14)
}
