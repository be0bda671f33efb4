package strip

import (
	"image/color"
	"math"
	"slices"
	"strings"

	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/canvas"
	"fyne.io/fyne/v2/driver/desktop"
	toolkit "fyne.io/fyne/v2/theme"
	"fyne.io/fyne/v2/widget"

	"groundtally/app/desk/core"
	"groundtally/app/desk/theme"
	"groundtally/app/desk/widgets"
	"groundtally/app/draw"
	"groundtally/app/present"
	"groundtally/app/run"
	"groundtally/scoring"
)

// Sizes of the grid, in the toolkit's units.
const (
	cellWidth  = 104
	cellGap    = 12
	blockGap   = 22
	headHeight = 22
	labelSize  = 11
	valueSize  = 13
	labelLine  = 13
	labelRow   = 2*labelLine + 3
	valueRow   = 26
	scrollRoom = 14 // for the bar of the scroll at the right
)

// value is what a cell shows of one candidate.
type value struct {
	text, unit, word   string
	warm, unknown, has bool // has: there is a place on the bar
	low, mid, high     float64
}

// cell is one consequence.
type cell struct {
	info   run.KeyInfo
	values []value
	at     fyne.Position
}

// grid lays out all cells by account and answers the mouse and the keyboard.
type grid struct {
	widget.BaseWidget
	c        *core.Core
	cells    []cell
	heads    []head
	opened   func(key string, candidate int)
	width    float32
	height   float32
	cellWide float32
	cursor   int
	focused  bool
	perCell  int // candidates
	revision int
}

type head struct {
	account scoring.Account
	at      fyne.Position
	width   float32
}

func newGrid(c *core.Core, opened func(key string, candidate int)) *grid {
	g := &grid{c: c, opened: opened}
	g.ExtendBaseWidget(g)
	return g
}

// fill takes over the chosen candidates.
func (g *grid) fill() {
	v := g.c.View()
	chosen := g.c.Chosen()
	g.perCell = max(1, len(chosen))
	weighed := map[string]bool{}
	if v != nil && v.Board != nil {
		raw := g.c.Raw()
		for i, k := range v.Board.Keys {
			weighed[k.Info.Key] = i < len(raw) && raw[i] > 0
		}
	}
	cells := make([]cell, 0, 96)
	for _, k := range g.c.Parts.Params.Keys() {
		one := cell{info: k, values: make([]value, len(chosen))}
		for i, cand := range chosen {
			one.values[i] = valueOf(g.c, cand, k)
		}
		cells = append(cells, one)
	}
	rank := func(c cell) int {
		switch {
		case weighed[c.info.Key]:
			return 0
		case len(c.values) > 0 && c.values[0].text == scoring.NotAssessed.String():
			return 2
		}
		return 1
	}
	slices.SortStableFunc(cells, func(a, b cell) int { return rank(a) - rank(b) })
	g.cells = cells
	g.arrange(g.width)
	g.revision++
	g.Refresh()
}

// valueOf writes a consequence of a candidate.
func valueOf(c *core.Core, cand *run.Candidate, k run.KeyInfo) value {
	q, ok := cand.Consequence(k.Key)
	if !ok {
		return value{text: scoring.Unknown.String(), unknown: true}
	}
	out := value{text: present.Cell(q)}
	switch q.State {
	case scoring.Number:
		out.unit = present.Unit(q.Unit)
		if s, ok := c.View().Index.Spans[k.Key]; ok && s[1] > s[0] {
			lo, hi := q.Central, q.Central
			if q.Range != scoring.NoRange && q.Range != "" {
				lo, hi = q.Low, q.High
			}
			share := func(x float64) float64 { return (x - s[0]) / (s[1] - s[0]) }
			out.low, out.mid, out.high, out.has = share(lo), share(q.Central), share(hi), true
		}
		if slices.Contains(cand.OverLimit, k.Key) {
			out.warm, out.word = true, "over"
			if x, ok := c.View().Of.Number("limit." + k.Key); ok { // as it stood when it was computed
				out.word = "over " + present.Figure(x, x, x)
			}
		}
	case scoring.Unknown, scoring.NotSet, scoring.NotAssessed:
		out.unknown = true
	}
	return out
}

// arrange gives every account columns in proportion to its cells, so that all end at about the same
// height.
func (g *grid) arrange(width float32) {
	g.width = width
	if width <= 0 {
		return
	}
	byAccount := map[scoring.Account][]int{}
	var accounts []scoring.Account
	for i, c := range g.cells {
		if byAccount[c.info.Account] == nil {
			accounts = append(accounts, c.info.Account)
		}
		byAccount[c.info.Account] = append(byAccount[c.info.Account], i)
	}
	slices.SortFunc(accounts, func(a, b scoring.Account) int {
		return slices.Index(scoring.Accounts(), a) - slices.Index(scoring.Accounts(), b)
	})
	columns := make([]int, len(accounts))
	room := int((width - float32(len(accounts)-1)*(blockGap-cellGap) + cellGap) / (cellWidth + cellGap))
	for i := range columns {
		columns[i] = 1
	}
	for used := len(accounts); used < room; used++ { // the tallest block gets the next column
		tallest := 0
		for i, a := range accounts {
			if rows(len(byAccount[a]), columns[i]) > rows(len(byAccount[accounts[tallest]]), columns[tallest]) {
				tallest = i
			}
		}
		if len(accounts) == 0 {
			break
		}
		columns[tallest]++
	}
	step := g.rowHeight()
	total := 0
	for _, n := range columns {
		total += n
	}
	gaps := float32(total-len(columns))*cellGap + float32(max(len(columns)-1, 0))*blockGap
	wide := max(cellWidth, (width-gaps)/float32(max(total, 1)))
	g.cellWide = wide
	g.heads = g.heads[:0]
	x, tallest := float32(0), 0
	for i, a := range accounts {
		g.heads = append(g.heads, head{account: a, at: fyne.NewPos(x, 0), width: float32(columns[i])*(wide+cellGap) - cellGap})
		for j, at := range byAccount[a] {
			g.cells[at].at = fyne.NewPos(x+float32(j%columns[i])*(wide+cellGap), headHeight+float32(j/columns[i])*step)
		}
		x += float32(columns[i])*(wide+cellGap) - cellGap + blockGap
		tallest = max(tallest, rows(len(byAccount[a]), columns[i]))
	}
	g.height = headHeight + float32(tallest)*step
}

func rows(n, columns int) int { return (n + columns - 1) / columns }

func (g *grid) rowHeight() float32 { return labelRow + valueRow*float32(g.perCell) + 8 }

// wide gives the width of a cell.
func (g *grid) wide() float32 { return g.cellWide }

// find gives the cell and the candidate under a place.
func (g *grid) find(p fyne.Position) (at, candidate int, ok bool) {
	w := g.wide()
	for i, c := range g.cells {
		if p.X >= c.at.X && p.X < c.at.X+w && p.Y >= c.at.Y && p.Y < c.at.Y+g.rowHeight() {
			n := int((p.Y - c.at.Y - labelRow) / valueRow)
			return i, min(max(n, 0), max(len(c.values)-1, 0)), true
		}
	}
	return 0, 0, false
}

// Tapped implements fyne.Tappable: it unfolds the consequence.
func (g *grid) Tapped(e *fyne.PointEvent) {
	if at, cand, ok := g.find(e.Position); ok {
		g.cursor = at
		g.open(cand)
	}
	if c := fyne.CurrentApp().Driver().CanvasForObject(g); c != nil {
		c.Focus(g)
	}
}

func (g *grid) open(candidate int) {
	if g.cursor < len(g.cells) && len(g.cells[g.cursor].values) > 0 {
		g.opened(g.cells[g.cursor].info.Key, candidate)
	}
}

// MouseIn implements desktop.Hoverable.
func (g *grid) MouseIn(e *desktop.MouseEvent) { g.MouseMoved(e) }

// MouseMoved implements desktop.Hoverable: it tells what the consequence is.
func (g *grid) MouseMoved(e *desktop.MouseEvent) {
	text := ""
	if at, cand, ok := g.find(e.Position); ok {
		text = g.words(at, cand)
	}
	widgets.Explain(g, text, e.AbsolutePosition)
}

// MouseOut implements desktop.Hoverable.
func (g *grid) MouseOut() { widgets.Explain(g, "", fyne.Position{}) }

// words says what a cell is, its full value, and where it lies.
func (g *grid) words(at, candidate int) string {
	k := g.cells[at].info
	text := k.Title + ". " + k.Sentence
	chosen := g.c.Chosen()
	if candidate >= len(chosen) {
		return text
	}
	q, ok := chosen[candidate].Consequence(k.Key)
	if !ok {
		return text
	}
	text += "\n" + full(q)
	if s, ok := g.c.View().Index.Spans[k.Key]; ok && q.State == scoring.Number {
		text += "\nAmong all candidates: " + present.Figure(s[0], s[0], s[0]) + " to " + withUnit(present.Figure(s[1], s[1], s[1]), q.Unit)
	}
	return text
}

// full writes a consequence with all that is known of it.
func full(q scoring.Consequence) string {
	if q.State != scoring.Number {
		return present.WhyNot(q)
	}
	text := withUnit(present.Exact(q.Central), q.Unit)
	if s := present.Span(q); s != "" {
		text += ", " + s
	} else {
		text += ", " + present.RangeWords(q.Range)
	}
	if q.Quality != "" {
		text += "; " + q.Quality
	}
	return text
}

// FocusGained implements fyne.Focusable.
func (g *grid) FocusGained() { g.focused = true; g.Refresh() }

// FocusLost implements fyne.Focusable.
func (g *grid) FocusLost() { g.focused = false; g.Refresh() }

// TypedRune implements fyne.Focusable.
func (g *grid) TypedRune(rune) {}

// TypedKey implements fyne.Focusable: arrows move between consequences, return unfolds.
func (g *grid) TypedKey(e *fyne.KeyEvent) {
	if len(g.cells) == 0 {
		return
	}
	from := g.cells[g.cursor].at
	best, least := g.cursor, math.Inf(1)
	look := func(ahead func(d fyne.Position) bool) {
		for i, c := range g.cells {
			d := fyne.NewPos(c.at.X-from.X, c.at.Y-from.Y)
			if !ahead(d) {
				continue
			}
			if dist := math.Hypot(float64(d.X), float64(d.Y)); dist < least {
				best, least = i, dist
			}
		}
	}
	switch e.Name {
	case fyne.KeyRight:
		look(func(d fyne.Position) bool { return d.X > 1 && d.Y > -1 && d.Y < 1 })
	case fyne.KeyLeft:
		look(func(d fyne.Position) bool { return d.X < -1 && d.Y > -1 && d.Y < 1 })
	case fyne.KeyDown:
		look(func(d fyne.Position) bool { return d.Y > 1 && d.X > -1 && d.X < 1 })
	case fyne.KeyUp:
		look(func(d fyne.Position) bool { return d.Y < -1 && d.X > -1 && d.X < 1 })
	case fyne.KeyReturn, fyne.KeyEnter, fyne.KeySpace:
		g.open(0)
		return
	default:
		return
	}
	g.cursor = best
	g.Refresh()
}

// CreateRenderer implements fyne.Widget.
func (g *grid) CreateRenderer() fyne.WidgetRenderer {
	return &gridRenderer{g: g, ring: canvas.NewRectangle(color.Transparent), drawn: -1}
}

// pieces are the objects of one cell.
type pieces struct {
	label  [2]*canvas.Text
	values []valuePieces
}

type valuePieces struct {
	letter, text, unit, word *canvas.Text
	bar                      *widgets.RangeBar
}

type gridRenderer struct {
	g       *grid
	heads   []*canvas.Text
	rules   []*canvas.Rectangle
	cells   []pieces
	ring    *canvas.Rectangle
	objects []fyne.CanvasObject
	drawn   int
}

func text(size float32, bold bool) *canvas.Text {
	t := canvas.NewText("", color.Black)
	t.TextSize, t.TextStyle = size, fyne.TextStyle{Bold: bold}
	return t
}

func (r *gridRenderer) Layout(s fyne.Size) {
	if w := s.Width - scrollRoom; w != r.g.width {
		r.g.arrange(w)
		r.drawn = -1
	}
	r.draw()
}

func (r *gridRenderer) MinSize() fyne.Size { return fyne.NewSize(cellWidth*3, max(r.g.height, 60)) }

func (r *gridRenderer) Refresh() { r.drawn = -1; r.draw() }

// draw puts everything in its place; objects are made once and used again.
func (r *gridRenderer) draw() {
	g := r.g
	r.focus()
	if r.drawn == g.revision {
		return
	}
	r.drawn = g.revision
	ink, faint, warm := widgets.Colour(toolkit.ColorNameForeground), widgets.Colour(theme.Faint), widgets.Colour(theme.Warm)
	accent, rule := widgets.Colour(toolkit.ColorNamePrimary), widgets.Colour(theme.Rule)
	for len(r.heads) < len(g.heads) {
		r.heads, r.rules = append(r.heads, text(11, true)), append(r.rules, canvas.NewRectangle(color.Transparent))
	}
	for i, h := range g.heads {
		set(r.heads[i], capitals(string(h.account)), accent, h.at, h.width)
		r.rules[i].FillColor = rule
		r.rules[i].Move(fyne.NewPos(h.at.X, headHeight-5))
		r.rules[i].Resize(fyne.NewSize(h.width, 1))
		r.rules[i].Refresh()
	}
	for len(r.cells) < len(g.cells) {
		r.cells = append(r.cells, pieces{label: [2]*canvas.Text{text(labelSize, false), text(labelSize, false)}})
	}
	wide := g.wide()
	for i := range g.cells {
		c, p := &g.cells[i], &r.cells[i]
		one, two := twoLines(c.info.Title, float64(wide))
		if two == "" { // a short label stands right above its figure
			one, two = "", one
		}
		set(p.label[0], one, faint, c.at, wide)
		set(p.label[1], two, faint, c.at.AddXY(0, labelLine), wide)
		for len(p.values) < len(c.values) {
			p.values = append(p.values, valuePieces{letter: text(10, true), text: text(valueSize, true), unit: text(labelSize, false), word: text(labelSize, true), bar: widgets.NewRangeBar()})
		}
		for j := range p.values {
			q := &p.values[j]
			there := j < len(c.values)
			visible(there, q.letter, q.text, q.unit, q.word, q.bar)
			if !there {
				continue
			}
			v := c.values[j]
			at := c.at.AddXY(0, labelRow+float32(j)*valueRow)
			x := at.X
			if len(c.values) > 1 {
				set(q.letter, core.Letter(j), faint, fyne.NewPos(x, at.Y+3), 12)
				x += 12
			} else {
				set(q.letter, "", faint, at, 0)
			}
			colour := ink
			switch {
			case v.warm:
				colour = warm
			case v.unknown:
				colour = faint
			}
			q.text.TextStyle.Bold = !v.unknown
			// What there is room for: value, unit, word, in this order.
			left := at.X + wide - x
			shown := draw.Fit(v.text, valueSize, !v.unknown, float64(left))
			set(q.text, shown, colour, fyne.NewPos(x, at.Y), left)
			x += float32(draw.TextWidth(shown, valueSize, !v.unknown)) + 4
			left = at.X + wide - x
			unit := ""
			if v.unit != "" && left > 12 {
				unit = draw.Fit(v.unit, labelSize, false, float64(left))
			}
			set(q.unit, unit, faint, fyne.NewPos(x, at.Y+2), left)
			if unit != "" {
				x += float32(draw.TextWidth(unit, labelSize, false)) + 4
			}
			word := ""
			if left = at.X + wide - x; v.word != "" && left > 24 {
				word = draw.Fit(v.word, labelSize, true, float64(left))
			}
			set(q.word, word, warm, fyne.NewPos(x, at.Y+2), left)
			q.bar.Move(fyne.NewPos(at.X, at.Y+17))
			q.bar.Resize(fyne.NewSize(wide, 6))
			switch {
			case v.unknown:
				q.bar.SetUnknown()
			case v.has:
				q.bar.Set(v.low, v.mid, v.high, v.warm)
			default:
				q.bar.Clear()
			}
		}
	}
	r.collect()
	canvas.Refresh(g)
}

// focus draws the ring around the cell that the keyboard stands on.
func (r *gridRenderer) focus() {
	g := r.g
	if !g.focused || g.cursor >= len(g.cells) {
		r.ring.Hide()
		return
	}
	r.ring.StrokeColor, r.ring.StrokeWidth, r.ring.CornerRadius = widgets.Colour(toolkit.ColorNamePrimary), 2, 4
	r.ring.Move(g.cells[g.cursor].at.AddXY(-4, -3))
	r.ring.Resize(fyne.NewSize(g.wide()+8, g.rowHeight()-2))
	r.ring.Show()
	r.ring.Refresh()
}

func (r *gridRenderer) collect() {
	r.objects = append(r.objects[:0], r.ring)
	for i := range r.g.heads {
		r.objects = append(r.objects, r.heads[i], r.rules[i])
	}
	for i := range r.g.cells {
		r.objects = append(r.objects, r.cells[i].label[0], r.cells[i].label[1])
		for j := range r.g.cells[i].values {
			q := &r.cells[i].values[j]
			r.objects = append(r.objects, q.letter, q.text, q.unit, q.word, q.bar)
		}
	}
}

func (r *gridRenderer) Objects() []fyne.CanvasObject { return r.objects }
func (r *gridRenderer) Destroy()                     {}

// twoLines breaks a label at a blank so that it fits; what is still too long ends in dots.
func twoLines(label string, width float64) (first, second string) {
	words := strings.Fields(label)
	for n := len(words); n > 0; n-- {
		first = strings.Join(words[:n], " ")
		if n == 1 || draw.TextWidth(first, labelSize, false) <= width {
			second = strings.Join(words[n:], " ")
			break
		}
	}
	return draw.Fit(first, labelSize, false, width), draw.Fit(second, labelSize, false, width)
}

// set changes a text when it must.
func set(t *canvas.Text, words string, c color.Color, at fyne.Position, width float32) {
	t.Move(at)
	t.Resize(fyne.NewSize(width, t.TextSize*1.4))
	if t.Text != words || t.Color != c {
		t.Text, t.Color = words, c
		t.Refresh()
	}
}

func visible(yes bool, objects ...fyne.CanvasObject) {
	for _, o := range objects {
		if yes {
			o.Show()
		} else {
			o.Hide()
		}
	}
}
