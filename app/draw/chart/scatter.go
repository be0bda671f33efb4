package chart

import (
	"cmp"
	"fmt"
	"math"
	"slices"
	"strings"

	"groundtally/app/draw"
)

// Better says which way a quantity is better.
type Better string

// The directions. Either is a quantity without a better way.
const (
	Either Better = ""
	More   Better = "more"
	Less   Better = "less"
)

// Quantity is what an axis shows.
type Quantity struct {
	Title  string
	Unit   string
	Better Better
	Whole  bool // counted in whole numbers
}

func (q Quantity) label() string {
	out := q.Title + ", " + q.Unit
	if q.Better != Either {
		out += "; " + string(q.Better) + " is better"
	}
	return out
}

// Cloud are two quantities of many candidates.
type Cloud struct {
	Title   string // for readers who cannot see the picture
	X, Y    Quantity
	Points  []CloudPoint
	LeftOut int // candidates without a number in one of the two
}

// CloudPoint is one candidate. Low and high are drawn for selected points, where high is above low.
type CloudPoint struct {
	Item  string
	Name  string
	X, Y  float64
	XLow  float64
	XHigh float64
	YLow  float64
	YHigh float64
	Mark  string // a letter; the point is selected
	Over  bool   // over a limit
}

func (p CloudPoint) finite() bool {
	for _, v := range [...]float64{p.X, p.Y, p.XLow, p.XHigh, p.YLow, p.YHigh} {
		if math.IsNaN(v) || math.IsInf(v, 0) {
			return false
		}
	}
	return true
}

const (
	dotRadius = 3.2
	cellSize  = 4.0 // at most one mark in a square of this side
)

// Scatter draws two quantities against each other. Where many points lie close together one darker mark
// stands for them. Where both quantities have a better way, a line joins the points to which no other is
// better in both.
func Scatter(in Cloud, p draw.Palette, width float64) *draw.Scene {
	s := newSheet(width, in.Title, "", p)
	points := make([]CloudPoint, 0, len(in.Points))
	for _, q := range in.Points {
		if q.finite() {
			points = append(points, q)
		}
	}
	leftOut := in.LeftOut + len(in.Points) - len(points)
	if len(points) == 0 {
		return s.nothing("no candidate has both numbers")
	}
	lo, hi := [2]float64{math.Inf(1), math.Inf(1)}, [2]float64{math.Inf(-1), math.Inf(-1)}
	over, ranges := false, false
	for _, q := range points {
		vs := [2][]float64{{q.X}, {q.Y}}
		if q.Mark != "" {
			vs[0], vs[1] = whisker(q.X, q.XLow, q.XHigh), whisker(q.Y, q.YLow, q.YHigh)
		}
		over = over || q.Over
		ranges = ranges || len(vs[0])+len(vs[1]) > 2
		for k := range vs {
			for _, v := range vs[k] {
				lo[k], hi[k] = math.Min(lo[k], v), math.Max(hi[k], v)
			}
		}
	}
	top := pad + 4.0
	for i, l := range draw.Lines(in.Y.label(), small, false, s.Width-2*pad, 2) {
		top = pad + 8 + lineHeight*float64(i)
		s.write(pad, top, l, small, p.Faint, draw.Start)
	}
	top += 14
	ay := newAxis(lo[1], hi[1], 5, in.Y.Whole).tightened(lo[1], hi[1])
	margin := 0.0
	for _, t := range ay.ticks() {
		margin = math.Max(margin, draw.TextWidth(ay.label(t), small, false))
	}
	left, right := pad+margin+8, s.Width-pad-10
	ax := levelAxis(lo[0], hi[0], right-left, in.X.Whole).tightened(lo[0], hi[0])
	tall := math.Round(math.Min(440, math.Max(200, 0.62*(right-left))))
	bottom := top + tall
	at := func(x, y float64) draw.Point {
		return draw.Point{X: left + (right-left)*ax.share(x), Y: bottom - tall*ay.share(y)}
	}
	s.levelTicks(ax, left, right-left, bottom, band{top, bottom})
	for _, t := range ay.ticks() {
		y := at(ax.lo, t).Y
		s.line(p.Rule, 1, left, y, right, y)
		s.write(left-6, y+3.8, ay.label(t), small, p.Faint, draw.End)
	}
	var front []CloudPoint
	if in.X.Better != Either && in.Y.Better != Either {
		front = frontOf(points, in.X.Better, in.Y.Better)
		s.front(front, in, at)
	}
	marks := s.marks(points, in, left, top, right, at)
	s.selected(points, in, at, draw.Box{X0: left, Y0: top, X1: right, Y1: bottom})
	y := bottom + 33
	y += s.centred((left+right)/2, y, right-left, in.X.label()) - 2

	keys := []key{{dot: true, style: draw.Style{Fill: p.Ramp(one)}, text: "1 candidate"}}
	if marks < len(points) {
		keys = append(keys, key{dot: true, style: draw.Style{Fill: p.Ramp(few)}, text: "2 to 9"}, key{dot: true, style: draw.Style{Fill: p.Ramp(many)}, text: "10 or more at one place"})
	}
	if over {
		keys = append(keys, key{dot: true, style: draw.Style{Fill: p.Paper, Stroke: p.Warm, Width: 1.8}, text: "over a limit"})
	}
	if ranges {
		keys = append(keys, key{line: true, style: draw.Style{Stroke: p.Ink, Width: 1.2}, text: "low to high"})
	}
	if len(front) > 1 {
		keys = append(keys, key{line: true, style: s.frontStyle(), text: "no other is better in both"})
	}
	y += s.legend(y, keys)
	note := plural(len(points), "candidate")
	if marks < len(points) {
		note += " in " + plural(marks, "mark")
	}
	if leftOut > 0 {
		note += "; " + plural(leftOut, "candidate") + " without a number in one of the two left out"
	}
	for _, l := range draw.Lines(note, small, false, s.Width-2*pad, 2) {
		y += lineHeight
		s.write(pad, y, l, small, p.Faint, draw.Start)
	}
	return s.done(y + 8)
}

func plural(n int, what string) string {
	if n == 1 {
		return "1 " + what
	}
	return number(float64(n), 0) + " " + what + "s"
}

func whisker(v, low, high float64) []float64 {
	if high > low {
		return []float64{v, low, high}
	}
	return []float64{v}
}

// Where the shades of marks lie on the ramp: one candidate, a few, many.
const (
	one  = 0.4
	few  = 0.7
	many = 1.0
)

// frontOf gives the points to which no other is at least as good in both and better in one, from the
// best in x to the best in y; of equal ones the first.
func frontOf(points []CloudPoint, x, y Better) []CloudPoint {
	sign := func(b Better, v float64) float64 {
		if b == More {
			return -v
		}
		return v
	}
	type burden struct {
		x, y float64
		i    int
	}
	sorted := make([]burden, len(points))
	for i, q := range points {
		sorted[i] = burden{sign(x, q.X), sign(y, q.Y), i}
	}
	slices.SortFunc(sorted, func(a, b burden) int {
		return cmp.Or(cmp.Compare(a.x, b.x), cmp.Compare(a.y, b.y), cmp.Compare(a.i, b.i))
	})
	var out []CloudPoint
	best := math.Inf(1)
	for _, q := range sorted {
		if q.y < best {
			best = q.y
			out = append(out, points[q.i])
		}
	}
	return out
}

func (s *sheet) frontStyle() draw.Style { return draw.Style{Stroke: s.p.Accent, Width: 1.6} }

// front draws the line in steps, for between two candidates there is none.
func (s *sheet) front(front []CloudPoint, in Cloud, at func(x, y float64) draw.Point) {
	var pts []draw.Point
	for i, q := range front {
		if i > 0 {
			pts = append(pts, at(q.X, front[i-1].Y))
		}
		pts = append(pts, at(q.X, q.Y))
	}
	if len(pts) > 1 {
		s.Path(draw.Path{Rings: [][]draw.Point{pts}, Style: s.frontStyle(), Title: fmt.Sprintf("no other candidate is better in both: %s", plural(len(front), "candidate"))})
	}
}

// marks draws at most one mark for each cell of the picture and gives their number. A mark stands where
// the middle of its points is.
func (s *sheet) marks(points []CloudPoint, in Cloud, left, top, right float64, at func(x, y float64) draw.Point) int {
	type cell struct {
		n     int
		sum   draw.Point
		first []int
		over  bool
	}
	columns := int((right-left)/cellSize) + 2
	cells := map[int]*cell{}
	for i, q := range points {
		o := at(q.X, q.Y)
		k := int((o.Y-top)/cellSize)*columns + int((o.X-left)/cellSize)
		c := cells[k]
		if c == nil {
			c = &cell{}
			cells[k] = c
		}
		c.n++
		c.sum.X, c.sum.Y = c.sum.X+o.X, c.sum.Y+o.Y
		c.over = c.over || q.Over
		if len(c.first) < 3 {
			c.first = append(c.first, i)
		}
	}
	order := make([]int, 0, len(cells))
	for k := range cells {
		order = append(order, k)
	}
	// Marks of many points come last, so that they are not covered.
	slices.SortFunc(order, func(a, b int) int { return cmp.Or(cmp.Compare(cells[a].n, cells[b].n), cmp.Compare(a, b)) })
	for _, k := range order {
		c := cells[k]
		shade := one
		if c.n >= 10 {
			shade = many
		} else if c.n > 1 {
			shade = few
		}
		st := draw.Style{Fill: s.p.Ramp(shade), Stroke: s.p.Paper, Width: 0.6}
		if c.over {
			st.Stroke, st.Width = s.p.Warm, 1.8
		}
		s.Path(draw.Path{Rings: [][]draw.Point{ringAround(draw.Point{X: c.sum.X / float64(c.n), Y: c.sum.Y / float64(c.n)}, dotRadius)}, Closed: true, Style: st,
			Item: points[c.first[0]].Item, Title: titleOf(points, c.first, c.n, in)})
	}
	return len(cells)
}

// titleOf names the points behind a mark: one with its numbers, of many the first few.
func titleOf(points []CloudPoint, firstOnes []int, n int, in Cloud) string {
	if n == 1 {
		return pointWords(points[firstOnes[0]], in)
	}
	names := make([]string, len(firstOnes))
	for i, j := range firstOnes {
		names[i] = points[j].Name
	}
	words := plural(n, "candidate") + " here: " + strings.Join(names, "; ")
	if n > len(firstOnes) {
		words += fmt.Sprintf("; and %s more", number(float64(n-len(firstOnes)), 0))
	}
	return words
}

func pointWords(q CloudPoint, in Cloud) string {
	words := fmt.Sprintf("%s: %s %s %s; %s %s %s", q.Name, in.X.Title, figure(q.X), in.X.Unit, in.Y.Title, figure(q.Y), in.Y.Unit)
	if q.Over {
		words += "; over a limit"
	}
	return words
}

const badgeRadius = 8.5

// selected draws the selected points with their ranges and a letter close by, where it covers no other
// letter.
func (s *sheet) selected(points []CloudPoint, in Cloud, at func(x, y float64) draw.Point, plot draw.Box) {
	var taken []draw.Box
	for _, q := range points {
		if q.Mark == "" {
			continue
		}
		o := at(q.X, q.Y)
		if q.XHigh > q.XLow {
			s.line(s.p.Ink, 1.2, at(q.XLow, q.Y).X, o.Y, at(q.XHigh, q.Y).X, o.Y)
		}
		if q.YHigh > q.YLow {
			s.line(s.p.Ink, 1.2, o.X, at(q.X, q.YLow).Y, o.X, at(q.X, q.YHigh).Y)
		}
		half := math.Max(badgeRadius, draw.TextWidth(q.Mark, body, true)/2+4)
		c := o
		for try := range 400 {
			angle, r := -1.2+2.4*float64(try), 15+1.5*float64(try)/4
			c = draw.Point{X: o.X + r*math.Cos(angle), Y: o.Y + r*math.Sin(angle)}
			b := draw.Box{X0: c.X - half, Y0: c.Y - badgeRadius, X1: c.X + half, Y1: c.Y + badgeRadius}
			if b.X0 < plot.X0 || b.X1 > plot.X1 || b.Y0 < plot.Y0 || b.Y1 > plot.Y1 || slices.ContainsFunc(taken, b.Meets) {
				continue
			}
			taken = append(taken, b.Grown(1, 1))
			break
		}
		words := q.Mark + " " + pointWords(q, in)
		s.line(s.p.Ink, 1.2, o.X, o.Y, c.X, c.Y)
		ring := draw.Style{Fill: s.p.Accent, Stroke: s.p.Ink, Width: 1.4}
		if q.Over {
			ring.Stroke, ring.Width = s.p.Warm, 1.8
		}
		s.Path(draw.Path{Rings: [][]draw.Point{ringAround(o, dotRadius+0.8)}, Closed: true, Style: ring, Item: q.Item, Title: words})
		badge := ringAround(c, badgeRadius)
		if half > badgeRadius {
			badge = []draw.Point{{X: c.X - half, Y: c.Y - badgeRadius}, {X: c.X + half, Y: c.Y - badgeRadius}, {X: c.X + half, Y: c.Y + badgeRadius}, {X: c.X - half, Y: c.Y + badgeRadius}}
		}
		s.Path(draw.Path{Rings: [][]draw.Point{badge}, Closed: true, Style: draw.Style{Fill: s.p.Ink}, Item: q.Item, Title: words})
		s.bold(c.X, c.Y+4, q.Mark, 11, s.p.Paper, draw.Middle)
	}
}
