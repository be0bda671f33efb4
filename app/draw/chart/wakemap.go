package chart

import (
	"fmt"
	"math"
	"strings"

	"groundtally/app/draw"
)

// Wakes is how much wind a plant takes from the ground around it. Places are in metres, east and north of one origin.
type Wakes struct {
	Title string // for readers who cannot see the picture
	ID    string // tells its hatching from that of other pictures on one page

	Columns, Rows int
	StepM         float64   // side of a cell
	X0M, Y0M      float64   // the south-west corner of the first cell
	Lost          []float64 // of each cell, share of the mean undisturbed wind speed; eastward from the south-west; NaN for unknown

	Turbines  []WakeTurbine
	Existing  []Rotor
	Site      [][]Metres // rings
	Buildable [][]Metres
	NorthDeg  float64 // where true north lies, clockwise from upwards
	Caption   string
}

// Metres is a place, east and north of an origin.
type Metres struct{ X, Y float64 }

// Rotor is a machine that stands already.
type Rotor struct{ X, Y, RotorM float64 }

// WakeTurbine is a machine of the plant.
type WakeTurbine struct {
	X, Y, RotorM float64
	Label        string
	Loss         float64 // share of its energy lost to the others; NaN where it is not known
}

// wakeHead says what is drawn, in every picture.
const wakeHead = "mean wind speed lost behind the rotors, over all directions of the year"

const (
	leastRadius = 4.0 // of a rotor that would be too small to see
	leastLost   = 0.05
	wakeSteps   = 5 // above the step that is left as paper
)

// lossBounds gives the lower bounds of the steps, in percent of wind speed, for a greatest loss. They widen from
// step to step, because the loss is great close behind a rotor and slight over most of the ground.
func lossBounds(greatest float64) []float64 {
	var out []float64
	power := math.Floor(math.Log10(math.Max(greatest, 1e-6)))
	for k := power; len(out) < wakeSteps && k >= power-2; k-- {
		for _, m := range []float64{5, 2, 1} {
			// A top step that hardly begins would look like nothing.
			if b := m * math.Pow(10, k); b <= 0.8*greatest && b >= leastLost*(1-1e-9) && len(out) < wakeSteps {
				out = append([]float64{b}, out...)
			}
		}
	}
	return out
}

// percent writes a bound of a step or a loss.
func percent(x float64) string { return number(x, decimalsOf(x)) + " %" }

func roughPercent(x float64) string {
	if x >= 10 {
		return number(x, 0) + " %"
	}
	return number(x, 1) + " %"
}

// frame places metres on the scene.
type frame struct {
	west, north, scale float64
	left, top          float64
	right, bottom      float64
}

func (f frame) to(m Metres) draw.Point {
	return draw.Point{X: f.left + (m.X-f.west)*f.scale, Y: f.top + (f.north-m.Y)*f.scale}
}

func (f frame) rings(rings [][]Metres) [][]draw.Point {
	var out [][]draw.Point
	for _, r := range rings {
		if len(r) < 3 {
			continue
		}
		pts := make([]draw.Point, len(r))
		for i, m := range r {
			pts[i] = f.to(m)
		}
		out = append(out, pts)
	}
	return out
}

// WakeMap draws the wind that is lost around the machines of a plant, from above.
func WakeMap(in Wakes, p draw.Palette, width float64) *draw.Scene {
	if in.Columns <= 0 || in.Rows <= 0 || !(in.StepM > 0) || len(in.Lost) != in.Columns*in.Rows {
		return newSheet(width, in.Title, in.ID, p).nothing("The wind behind the rotors is unknown")
	}
	field := newLossField(in)
	s := newSheet(width, titled(in.Title, in.words(field)), in.ID, p)
	y := 18.0
	for _, l := range draw.Lines(wakeHead, small, false, s.Width-2*pad, 2) {
		s.write(pad, y, l, small, p.Faint, draw.Start)
		y += lineHeight
	}
	f := in.frame(s.Width, y-4)
	s.lossCells(in, field, f)
	s.outline(f.rings(in.Buildable), draw.Style{Stroke: p.Ink, Width: 0.9}, 2.2, "buildable area")
	s.outline(f.rings(in.Site), draw.Style{Stroke: p.Ink, Width: 2.2}, 4.4, "site")
	outside := s.existing(in, f)
	worst := in.worst()
	missing := s.turbines(in, f, worst)
	y = f.bottom + 6
	s.mapFoot(f, y, in.NorthDeg)
	y += 40
	y += s.lossLegend(y, field)
	var keys []key
	if len(in.Site) > 0 {
		keys = append(keys, key{line: true, style: draw.Style{Stroke: p.Ink, Width: 2.2}, text: "site"})
	}
	if len(in.Buildable) > 0 {
		keys = append(keys, key{line: true, style: draw.Style{Stroke: p.Ink, Width: 0.9}, text: "buildable area"})
	}
	if field.unknown {
		keys = append(keys, key{style: s.unknown(), text: "unknown"})
	}
	if len(in.Turbines) > 0 {
		words := "turbine, rotor to scale"
		if in.smallest()/2*f.scale < leastRadius {
			words = "turbine, larger than its rotor"
		}
		keys = append(keys, key{dot: true, style: rotorStyle(p), text: words})
	}
	if worst >= 0 {
		t := in.Turbines[worst]
		keys = append(keys, key{dot: true, style: draw.Style{Fill: p.Paper, Stroke: p.Warm, Width: 2.4}, text: fmt.Sprintf("loses most: %s of its energy%s", roughPercent(100*t.Loss), named(t.Label))})
	}
	if len(in.Existing) > 0 {
		words := "turbine that stands already"
		if outside > 0 {
			words += fmt.Sprintf("; %d of %d beyond the picture", outside, len(in.Existing))
		}
		keys = append(keys, key{diamond: true, style: existingStyle(p), text: words})
	}
	y += s.legend(y, keys)
	y += 14
	if missing > 0 {
		s.write(pad, y, draw.Fit(fmt.Sprintf("%d of %d numbers are left out for want of room", missing, len(in.Turbines)), small, false, s.Width-2*pad), small, p.Faint, draw.Start)
		y += lineHeight
	}
	for _, l := range draw.Lines(in.Caption, small, false, s.Width-2*pad, 4) {
		s.write(pad, y, l, small, p.Faint, draw.Start)
		y += lineHeight
	}
	return s.done(y - 4)
}

func named(label string) string {
	if label == "" {
		return ""
	}
	return ", turbine " + label
}

// words is the picture in one sentence, for readers who cannot see it.
func (in Wakes) words(f lossField) string {
	out := []string{wakeHead}
	switch {
	case f.known == 0:
		out = append(out, "unknown everywhere")
	case len(f.bounds) == 0:
		out = append(out, "nowhere "+percent(leastLost)+" or more")
	default:
		out = append(out, "at most "+roughPercent(f.greatest)+", by cells; "+percent(f.bounds[0])+" or more over "+number(100*float64(f.above)/float64(f.known), 0)+" % of the ground drawn")
	}
	out = append(out, fmt.Sprintf("%d turbines of the plant, %d that stand already", len(in.Turbines), len(in.Existing)))
	if w := in.worst(); w >= 0 {
		t := in.Turbines[w]
		out = append(out, fmt.Sprintf("loses most: %s of its energy%s", roughPercent(100*t.Loss), named(t.Label)))
	}
	return strings.Join(out, "; ")
}

// worst gives the turbine that loses most; none where there is nothing to choose from, or nothing to speak of.
func (in Wakes) worst() int {
	at, known := -1, 0
	for i, t := range in.Turbines {
		if math.IsNaN(t.Loss) {
			continue
		}
		known++
		if at < 0 || t.Loss > in.Turbines[at].Loss {
			at = i
		}
	}
	if known < 2 || in.Turbines[at].Loss < 0.005 {
		return -1
	}
	return at
}

func (in Wakes) smallest() float64 {
	d := math.Inf(1)
	for _, t := range in.Turbines {
		d = math.Min(d, t.RotorM)
	}
	return d
}

// frame gives the plot below y: all cells, the whole site and the plant; what stands already only as far as it lies
// there, since it may be far away.
func (in Wakes) frame(width, y float64) frame {
	w, e := in.X0M, in.X0M+in.StepM*float64(in.Columns)
	so, n := in.Y0M, in.Y0M+in.StepM*float64(in.Rows)
	grow := func(x, y, r float64) {
		w, e, so, n = math.Min(w, x-r), math.Max(e, x+r), math.Min(so, y-r), math.Max(n, y+r)
	}
	for _, rings := range [][][]Metres{in.Site, in.Buildable} {
		for _, r := range rings {
			for _, m := range r {
				grow(m.X, m.Y, 0)
			}
		}
	}
	for _, t := range in.Turbines {
		grow(t.X, t.Y, t.RotorM/2)
	}
	room := width - 2*pad
	f := frame{west: w, north: n, top: y, scale: math.Min(room/(e-w), math.Min(room, 640)/(n-so))}
	f.left = (width - f.scale*(e-w)) / 2
	f.right, f.bottom = f.left+f.scale*(e-w), y+f.scale*(n-so)
	return f
}

// lossField is the loss in steps: 0 below the first bound, −1 where it is unknown.
type lossField struct {
	columns, rows int
	step          float64 // side of a cell in metres
	steps         []int8
	bounds        []float64 // percent
	greatest      float64   // percent
	known, above  int       // cells; those from the first bound on
	unknown       bool
}

// mostCorners bounds the corners of all shapes of the field, and so the size of the picture.
const mostCorners = 24_000

func newLossField(in Wakes) lossField {
	f := lossField{columns: in.Columns, rows: in.Rows, step: in.StepM}
	for _, v := range in.Lost {
		if !math.IsNaN(v) {
			f.greatest = math.Max(f.greatest, 100*math.Min(v, 1))
		}
	}
	f.bounds = lossBounds(f.greatest)
	lost := in.Lost
	for {
		f.sort(lost)
		corners := 0
		for k := -1; k <= len(f.bounds); k++ {
			for _, r := range f.region(k) {
				corners += len(r)
			}
		}
		if corners <= mostCorners || f.columns < 2 || f.rows < 2 {
			return f
		}
		lost = f.coarser(lost) // a field that is all specks would make a huge picture that shows no more
	}
}

// sort puts the cells into steps.
func (f *lossField) sort(lost []float64) {
	f.steps = make([]int8, len(lost))
	f.known, f.above, f.unknown = 0, 0, false
	for i, v := range lost {
		if math.IsNaN(v) {
			f.steps[i], f.unknown = -1, true
			continue
		}
		f.known++
		for _, b := range f.bounds {
			if 100*v >= b {
				f.steps[i]++
			}
		}
		if f.steps[i] > 0 {
			f.above++
		}
	}
}

// coarser gives the means of four cells each; unknown only where all four are.
func (f *lossField) coarser(lost []float64) []float64 {
	columns, rows := (f.columns+1)/2, (f.rows+1)/2
	out := make([]float64, 0, columns*rows)
	for r := range rows {
		for c := range columns {
			sum, n := 0.0, 0.0
			for y := 2 * r; y < min(2*r+2, f.rows); y++ {
				for x := 2 * c; x < min(2*c+2, f.columns); x++ {
					if v := lost[y*f.columns+x]; !math.IsNaN(v) {
						sum, n = sum+v, n+1
					}
				}
			}
			out = append(out, sum/n)
		}
	}
	f.columns, f.rows, f.step = columns, rows, 2*f.step
	return out
}

// corner is a corner of cells, columns and rows from the south-west.
type corner struct{ c, r int }

// region gives the outlines of all cells from a step on, or of the unknown ones for −1, holes too. Whole outlines,
// because boxes side by side would show seams where a painter smooths their edges.
func (f *lossField) region(step int) [][]corner {
	in := func(c, r int) bool {
		if c < 0 || r < 0 || c >= f.columns || r >= f.rows {
			return false
		}
		k := int(f.steps[r*f.columns+c])
		return step < 0 && k < 0 || step >= 0 && k >= step
	}
	// The sides that part inside from outside, by the corner where they begin, with the inside to their left: one bit
	// for each of east, north, west, south.
	wide := f.columns + 1
	sides := make([]uint8, wide*(f.rows+1))
	for r := range f.rows {
		for c := range f.columns {
			if !in(c, r) {
				continue
			}
			if !in(c, r-1) {
				sides[r*wide+c] |= 1
			}
			if !in(c+1, r) {
				sides[r*wide+c+1] |= 2
			}
			if !in(c, r+1) {
				sides[(r+1)*wide+c+1] |= 4
			}
			if !in(c-1, r) {
				sides[(r+1)*wide+c] |= 8
			}
		}
	}
	move := [4]int{1, wide, -1, -wide}
	var out [][]corner
	for i := range sides {
		for sides[i] != 0 {
			var ring []corner
			at, last := i, -1
			for sides[at] != 0 {
				d := 0
				for _, turn := range []int{1, 0, 3, 2} { // leftward first keeps cells that touch in a corner apart
					d = (max(last, 0) + turn) % 4
					if sides[at]&(1<<d) != 0 {
						break
					}
				}
				if d != last {
					ring = append(ring, corner{at % wide, at / wide})
				}
				sides[at] &^= 1 << d
				at, last = at+move[d], d
				if at == i && sides[at] == 0 {
					break
				}
			}
			out = append(out, ring)
		}
	}
	return out
}

// shade gives the colour of a step from 1 on.
func (f *lossField) shade(p draw.Palette, step int) string {
	if len(f.bounds) < 2 {
		return p.Ramp(0.5)
	}
	return p.Ramp(0.1 + 0.9*float64(step-1)/float64(len(f.bounds)-1))
}

// says names a step.
func (f *lossField) says(step int) string {
	switch {
	case len(f.bounds) == 0:
		return "less than " + percent(leastLost) + " of the wind speed lost"
	case step == 0:
		return "less than " + percent(f.bounds[0]) + " of the wind speed lost"
	case step == len(f.bounds):
		return percent(f.bounds[step-1]) + " of the wind speed lost or more"
	}
	return percent(f.bounds[step-1]) + " to " + percent(f.bounds[step]) + " of the wind speed lost"
}

// lossCells draws the field, each step on top of those below it.
func (s *sheet) lossCells(in Wakes, field lossField, f frame) {
	at := func(c corner) draw.Point {
		// The last cells of a coarser field reach beyond the true ones.
		return f.to(Metres{math.Min(in.X0M+field.step*float64(c.c), in.X0M+in.StepM*float64(in.Columns)), math.Min(in.Y0M+field.step*float64(c.r), in.Y0M+in.StepM*float64(in.Rows))})
	}
	shape := func(step int) (rings [][]draw.Point) {
		for _, r := range field.region(step) {
			pts := make([]draw.Point, len(r))
			for i, c := range r {
				pts[i] = at(c)
			}
			rings = append(rings, pts)
		}
		return rings
	}
	box := []draw.Point{{X: f.left, Y: f.top}, {X: f.right, Y: f.top}, {X: f.right, Y: f.bottom}, {X: f.left, Y: f.bottom}}
	for k := range len(field.bounds) + 1 {
		st := draw.Style{Fill: s.p.Paper}
		if k > 0 {
			st.Fill = field.shade(s.p, k)
		}
		if rings := shape(k); len(rings) > 0 {
			s.Path(draw.Path{Rings: rings, Closed: true, Style: st, Title: field.says(k)})
		}
	}
	hatch := draw.Style{Hatch: true, Stroke: s.p.Faint, Width: 0.6}
	if rings := shape(-1); len(rings) > 0 {
		s.Path(draw.Path{Rings: rings, Closed: true, Style: hatch, Title: "unknown"})
	}
	first, last := f.to(Metres{in.X0M, in.Y0M}), f.to(Metres{in.X0M + in.StepM*float64(in.Columns), in.Y0M + in.StepM*float64(in.Rows)})
	if first.X > f.left+0.5 || last.X < f.right-0.5 || last.Y > f.top+0.5 || first.Y < f.bottom-0.5 {
		cells := []draw.Point{first, {X: last.X, Y: first.Y}, last, {X: first.X, Y: last.Y}}
		s.Path(draw.Path{Rings: [][]draw.Point{box, cells}, Closed: true, Style: hatch, Title: "unknown: beyond the cells"})
	}
	s.Path(draw.Path{Rings: [][]draw.Point{box}, Closed: true, Style: draw.Style{Stroke: s.p.Rule, Width: 1}})
}

// outline draws rings with an edge of paper, so that they show on pale and dark cells.
func (s *sheet) outline(rings [][]draw.Point, st draw.Style, casing float64, title string) {
	if len(rings) == 0 {
		return
	}
	for i := range rings {
		rings[i] = append(rings[i], rings[i][0])
	}
	s.Path(draw.Path{Rings: rings, Style: draw.Style{Stroke: s.p.Paper, Width: casing}})
	s.Path(draw.Path{Rings: rings, Style: st, Title: title})
}

func rotorStyle(p draw.Palette) draw.Style {
	return draw.Style{Fill: p.Paper, Stroke: p.Ink, Width: 1.6}
}

func existingStyle(p draw.Palette) draw.Style {
	return draw.Style{Fill: p.Faint, Stroke: p.Paper, Width: 1}
}

func diamond(c draw.Point, r float64) []draw.Point {
	return []draw.Point{{X: c.X, Y: c.Y - r}, {X: c.X + r, Y: c.Y}, {X: c.X, Y: c.Y + r}, {X: c.X - r, Y: c.Y}}
}

// existing draws the machines that stand already, and gives how many lie beyond the picture.
func (s *sheet) existing(in Wakes, f frame) (outside int) {
	for _, t := range in.Existing {
		c := f.to(Metres{t.X, t.Y})
		if c.X < f.left || c.X > f.right || c.Y < f.top || c.Y > f.bottom {
			outside++
			continue
		}
		r := math.Min(pad, math.Max(leastRadius+1, t.RotorM/2*f.scale))
		s.Path(draw.Path{Rings: [][]draw.Point{diamond(c, r)}, Closed: true, Style: existingStyle(s.p), Title: "turbine that stands already, rotor " + figure(t.RotorM) + " m"})
	}
	return outside
}

// turbines draws the plant with its numbers, and gives how many numbers had no room.
func (s *sheet) turbines(in Wakes, f frame, worst int) (missing int) {
	var taken []draw.Box
	at, radius := make([]draw.Point, len(in.Turbines)), make([]float64, len(in.Turbines))
	for i, t := range in.Turbines {
		at[i], radius[i] = f.to(Metres{t.X, t.Y}), math.Max(leastRadius, t.RotorM/2*f.scale)
		r := radius[i] + 1
		taken = append(taken, draw.Box{X0: at[i].X - r, Y0: at[i].Y - r, X1: at[i].X + r, Y1: at[i].Y + r})
	}
	for _, t := range in.Existing {
		c := f.to(Metres{t.X, t.Y})
		taken = append(taken, draw.Box{X0: c.X, Y0: c.Y, X1: c.X, Y1: c.Y}.Grown(5, 5))
	}
	for i, t := range in.Turbines {
		words := "turbine " + t.Label
		if t.Label == "" {
			words = "turbine"
		}
		if math.IsNaN(t.Loss) {
			words += ": loss to wakes unknown"
		} else {
			words += ": " + roughPercent(100*t.Loss) + " of its energy lost to wakes"
		}
		st := rotorStyle(s.p)
		if i == worst {
			st.Stroke, st.Width = s.p.Warm, 2.4
		}
		ring := make([]draw.Point, 0, 28)
		for k := range cap(ring) {
			sin, cos := math.Sincos(2 * math.Pi * float64(k) / float64(cap(ring)))
			ring = append(ring, draw.Point{X: at[i].X + radius[i]*cos, Y: at[i].Y + radius[i]*sin})
		}
		s.Path(draw.Path{Rings: [][]draw.Point{ring}, Closed: true, Style: st, Item: fmt.Sprintf("turbine-%d", i), Title: words})
	}
	order := make([]int, 0, len(in.Turbines)) // the one that the legend names comes first
	if worst >= 0 {
		order = append(order, worst)
	}
	for i := range in.Turbines {
		if i != worst {
			order = append(order, i)
		}
	}
	for _, i := range order {
		if label := in.Turbines[i].Label; label != "" && !s.rotorLabel(label, i, at[i], radius[i], f, &taken) {
			missing++
		}
	}
	return missing
}

// rotorLabel writes a number in its rotor, or on paper beside it where nothing else is; ok is false where there is
// no room.
func (s *sheet) rotorLabel(label string, i int, c draw.Point, r float64, f frame, taken *[]draw.Box) (ok bool) {
	t := draw.Text{Text: label, Size: small, Colour: s.p.Ink, Anchor: draw.Middle}
	half := draw.TextWidth(label, small, false) / 2
	free := func(b draw.Box, skip int) bool {
		for k, o := range *taken {
			if k != skip && b.Meets(o) {
				return false
			}
		}
		return b.X0 >= f.left && b.X1 <= f.right && b.Y0 >= f.top && b.Y1 <= f.bottom
	}
	t.At = draw.Point{X: c.X, Y: c.Y + 3.8}
	if math.Hypot(half, 4) < r-1.5 && free(t.Box(), i) {
		s.Text(t)
		*taken = append(*taken, t.Box())
		return true
	}
	side := r + half + 4
	for _, d := range []draw.Point{{X: side, Y: 3.8}, {X: -side, Y: 3.8}, {Y: -r - 5}, {Y: r + 11.5}} {
		t.At = draw.Point{X: c.X + d.X, Y: c.Y + d.Y}
		if free(t.Box().Grown(1, 0), i) {
			s.clear(t)
			*taken = append(*taken, t.Box().Grown(2, 1))
			return true
		}
	}
	return false
}

// mapFoot draws the scale and where north lies, below the map, where neither covers a cell.
func (s *sheet) mapFoot(f frame, y, northDeg float64) {
	most := math.Min(160, s.Width/3) / f.scale
	length := math.Pow(10, math.Floor(math.Log10(most)))
	for _, m := range []float64{5, 2} {
		if m*length <= most {
			length *= m
			break
		}
	}
	words := number(length, decimalsOf(length)) + " m"
	if length >= 1000 {
		words = number(length/1000, 0) + " km"
	}
	w := length * f.scale
	s.Line(draw.Style{Stroke: s.p.Ink, Width: 1.6}, draw.Point{X: pad + 1, Y: y + 12}, draw.Point{X: pad + 1, Y: y + 17}, draw.Point{X: pad + 1 + w, Y: y + 17}, draw.Point{X: pad + 1 + w, Y: y + 12})
	s.write(pad+1+w+gap, y+18, words, small, s.p.Ink, draw.Start)
	sin, cos := math.Sincos(northDeg * math.Pi / 180)
	c := draw.Point{X: s.Width - pad - 30, Y: y + 16}
	turned := func(x, y float64) draw.Point { return draw.Point{X: c.X + x*cos - y*sin, Y: c.Y + x*sin + y*cos} }
	title := "true north"
	s.Path(draw.Path{Rings: [][]draw.Point{{turned(0, -12), turned(5, 9), turned(0, 5), turned(-5, 9)}}, Closed: true, Style: draw.Style{Fill: s.p.Ink}, Title: title})
	s.bold(c.X+15, c.Y+4, "N", small, s.p.Ink, draw.Start)
}

// lossLegend draws the steps side by side with their bounds below, and gives the height used.
func (s *sheet) lossLegend(y float64, f lossField) float64 {
	unit := "of the wind speed lost"
	if f.known == 0 {
		s.write(pad, y+10, "the loss is unknown everywhere", small, s.p.Ink, draw.Start)
		return 20
	}
	if len(f.bounds) == 0 {
		s.write(pad, y+10, "nowhere "+percent(leastLost)+" or more "+unit, small, s.p.Ink, draw.Start)
		return 20
	}
	n := len(f.bounds) + 1
	each := math.Min(44, (s.Width-2*pad-16)/float64(n))
	for k := range n {
		st := draw.Style{Fill: s.p.Paper, Stroke: s.p.Faint, Width: 0.8}
		if k > 0 {
			st.Fill = f.shade(s.p, k)
		}
		s.Rect(pad+each*float64(k), y, each, 12, st, f.says(k))
	}
	s.write(pad, y+25, "0", small, s.p.Ink, draw.Start)
	for k, b := range f.bounds {
		s.write(pad+each*float64(k+1), y+25, percent(b), small, s.p.Ink, draw.Middle)
	}
	end := pad + each*float64(n)
	greatest := roughPercent(f.greatest)
	if f.greatest < 1 {
		greatest = number(f.greatest, 2) + " %"
	}
	s.write(end, y+25, greatest, small, s.p.Ink, draw.Middle)
	if x := end + 14; x+draw.TextWidth(unit, small, false) <= s.Width-pad {
		s.write(x, y+10, unit, small, s.p.Faint, draw.Start)
		return 34
	}
	s.write(pad, y+25+lineHeight, unit, small, s.p.Faint, draw.Start)
	return 34 + lineHeight
}
