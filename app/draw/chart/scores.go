package chart

import (
	"fmt"
	"math"
	"strconv"

	"groundtally/app/draw"
)

// Scores are scores with the parts that they are made of.
type Scores struct {
	Title string // for readers who cannot see the picture
	ID    string // tells its hatching from that of other pictures on one page
	Keys  []ScoreKey
	Rows  []ScoreRow
}

// ScoreKey is one thing that is weighed; its number in the picture is its place in the list.
type ScoreKey struct {
	Category int // of its colour; the same key has the same one in all pictures
	Title    string
	Weight   float64 // share of all weights, 0 to 1
}

// ScoreRow is one score.
type ScoreRow struct {
	Item   string
	Name   string
	Detail string // a second line, fainter
	Over   string // words on limits that are broken, in the warm colour
	Score  float64
	Low    float64
	High   float64
	Parts  []ScorePart // one for each key
}

// ScorePart is what one key adds to a score.
type ScorePart struct {
	Share   float64
	Unknown bool // counts half its weight
}

func three(x float64) string { return strconv.FormatFloat(x, 'f', 3, 64) }

// ScoreBars draws scores as stacked parts, numbered as in the legend, with the range of the score under
// each; an unknown part is hatched.
func ScoreBars(in Scores, p draw.Palette, width float64) *draw.Scene {
	s := newSheet(width, in.Title, in.ID, p)
	if len(in.Rows) == 0 {
		return s.nothing("no scores")
	}
	top := pad - 2 + s.scoreLegend(in)
	wide := s.Width >= 600
	left, right := pad, s.Width-pad
	if wide {
		longest := 0.0
		for _, r := range in.Rows {
			longest = math.Max(longest, draw.TextWidth(r.Name, body, false))
			longest = math.Max(longest, draw.TextWidth(r.Over, small, true))
		}
		left, right = s.column(longest, 0.2, 0.36), s.Width-64
		s.write(s.Width-pad, top+16, "score", small, p.Faint, draw.End)
		top += 6
	}
	top += 20
	scale := right - left
	y := top
	heights := make([]float64, len(in.Rows))
	for i, r := range in.Rows {
		second := r.Detail != "" || r.Over != ""
		switch {
		case wide && second:
			heights[i] = 38
		case wide:
			heights[i] = 27
		case second:
			heights[i] = 62
		default:
			heights[i] = 48
		}
		y += heights[i]
	}
	bottom := y
	bands := []band{{top - 4, bottom + 2}}
	if !wide {
		bands = bands[:0]
		for i, at := 0, top; i < len(heights); i++ {
			at += heights[i]
			bands = append(bands, band{at - 31, at - 6})
		}
	}
	s.levelTicks(newAxis(0, 1, 5, false), left, scale, bottom, bands...)
	y = top
	for i, r := range in.Rows {
		s.scoreRow(in.Keys, r, y, heights[i], left, scale, wide)
		y += heights[i]
	}
	foot := s.centred(left+scale/2, bottom+33, math.Max(scale, 260), "score, pure number from 0 (worst in all weighed) to 1 (best)")
	return s.done(bottom + 33 + foot)
}

func (s *sheet) scoreLegend(in Scores) float64 {
	const row = 22.0
	columns := 2
	for _, k := range in.Keys {
		if draw.TextWidth(k.Title+", weight 0.000", body, false) > s.Width/2-60 {
			columns = 1
		}
	}
	width := (s.Width - 2*pad) / float64(columns)
	rows := (len(in.Keys) + columns - 1) / columns
	top := pad - 2
	for i, k := range in.Keys {
		x, y := pad+float64(i%columns)*width, top+row*float64(i/columns)
		s.Rect(x, y, 18, 14, draw.Style{Fill: draw.Category(k.Category)}, k.Title+", weight "+three(k.Weight))
		s.write(x+9, y+11, strconv.Itoa(i+1), 10, draw.TextOn(draw.Category(k.Category)), draw.Middle)
		weight := ", weight " + three(k.Weight)
		title := draw.Fit(k.Title, body, false, width-26-gap-draw.TextWidth(weight, body, false))
		s.write(x+26, y+11.5, title+weight, body, s.p.Ink, draw.Start)
	}
	height := row * float64(rows)
	return height + s.legend(top+height, []key{
		{style: s.unknown(), text: "unknown: counts half its weight"},
		{style: draw.Style{Stroke: s.p.Ink, Width: 1.4}, line: true, text: "from the lowest to the highest score"},
	})
}

func (s *sheet) scoreRow(keys []ScoreKey, r ScoreRow, y, height, left, scale float64, wide bool) {
	words := fmt.Sprintf("%s: score %s, from %s to %s", r.Name, three(r.Score), three(r.Low), three(r.High))
	s.hover(y, height, r.Item, words)
	score := three(r.Score)
	room, bar := left-pad-gap, y+3
	if !wide {
		room, bar = s.Width-2*pad-gap-draw.TextWidth(score, body, true), y+20
		s.bold(s.Width-pad, y+14, score, body, s.p.Ink, draw.End)
	} else {
		s.bold(s.Width-pad, y+14, score, body, s.p.Ink, draw.End)
	}
	s.write(pad, y+14, draw.Fit(r.Name, body, false, room), body, s.p.Ink, draw.Start)
	if r.Over != "" || r.Detail != "" {
		if !wide {
			room, bar = s.Width-2*pad, bar+13
		}
		over := draw.Fit(r.Over, small, true, room)
		at := pad
		if r.Over != "" {
			s.bold(at, y+27.5, over, small, s.p.Warm, draw.Start)
			at += draw.TextWidth(over, small, true) + gap
		}
		if left := pad + room - at; r.Detail != "" && left > 40 {
			s.write(at, y+27.5, draw.Fit(r.Detail, small, false, left), small, s.p.Faint, draw.Start)
		}
	}
	x := left
	for j, part := range r.Parts {
		w := part.Share * scale
		if w < 0.05 || j >= len(keys) {
			continue
		}
		k := keys[j]
		words := fmt.Sprintf("%d. %s: %s of weight %s", j+1, k.Title, three(part.Share), three(k.Weight))
		text := draw.TextOn(draw.Category(k.Category))
		st := draw.Style{Fill: draw.Category(k.Category), Stroke: s.p.Paper, Width: 0.8}
		if part.Unknown {
			st, text = s.unknown(), s.p.Ink
			words = fmt.Sprintf("%d. %s: unknown, counts half its weight of %s", j+1, k.Title, three(k.Weight))
		}
		s.Bar(x, bar, w, 14, st, r.Item, words)
		number := strconv.Itoa(j + 1)
		if n := draw.TextWidth(number, 10, false); w > n+5 {
			if part.Unknown { // a clear ground for the number on the hatching
				s.Bar(x+w/2-n/2-1.5, bar+1.5, n+3, 11, draw.Style{Fill: s.p.Paper}, r.Item, words)
			}
			s.write(x+w/2, bar+10.5, number, 10, text, draw.Middle)
		}
		x += w
	}
	s.Path(draw.Path{Rings: [][]draw.Point{{{X: left + r.Low*scale, Y: bar + 17.5}, {X: left + r.High*scale, Y: bar + 17.5}}},
		Style: draw.Style{Stroke: s.p.Ink, Width: 1.4}, Item: r.Item, Title: words})
}
