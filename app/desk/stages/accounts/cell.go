package accounts

import (
	"fmt"
	"image/color"

	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/canvas"
	"fyne.io/fyne/v2/driver/desktop"
	toolkit "fyne.io/fyne/v2/theme"
	"fyne.io/fyne/v2/widget"

	"groundtally/app/desk/theme"
	"groundtally/app/desk/widgets"
	"groundtally/app/draw"
)

// Sizes of the table, in the toolkit's units.
const (
	rowHeight   = 42
	nameWidth   = 158
	leastWidth  = 92
	mostWidth   = 148
	sideMargin  = 8
	valueSize   = 13
	smallSize   = 11
	headingSize = 11
)

// content is what a cell shows; cells that show the same are left alone.
type content struct {
	text, sub  string // sub stands under a name, and left of a value as its warm word
	name       bool   // the first column
	word       bool   // a state in place of a number
	letter     string // of a chosen candidate
	chosen     bool
	warm       bool
	unknown    bool
	bar        bool
	low, x, up float64 // from 0 to 1
	shade      string  // "#rrggbb"; empty for none
	look       string  // colours of the window, so that a change of them is seen
}

// cell is one cell of the table.
type cell struct {
	widget.BaseWidget
	g   *grid
	id  widget.TableCellID
	now content
}

func newCell(g *grid) *cell {
	c := &cell{g: g, id: widget.TableCellID{Row: -1, Col: -1}}
	c.ExtendBaseWidget(c)
	return c
}

func (c *cell) show(id widget.TableCellID, n content) {
	c.id = id
	if c.now == n {
		return
	}
	c.now = n
	c.Refresh()
}

// MouseDown implements desktop.Mouseable: which keys are held decides what the tap does.
func (c *cell) MouseDown(e *desktop.MouseEvent) { c.g.held = e.Modifier }

// MouseUp implements desktop.Mouseable.
func (c *cell) MouseUp(*desktop.MouseEvent) {}

// Tapped implements fyne.Tappable.
func (c *cell) Tapped(*fyne.PointEvent) {
	add := c.g.held&(fyne.KeyModifierShortcutDefault|fyne.KeyModifierControl|fyne.KeyModifierShift) != 0
	c.g.held = 0
	c.g.tapped(c.id, add)
}

// MouseIn implements desktop.Hoverable.
func (c *cell) MouseIn(e *desktop.MouseEvent) { explain(c, c.g.hint(c.id), e.AbsolutePosition) }

// MouseMoved implements desktop.Hoverable.
func (c *cell) MouseMoved(e *desktop.MouseEvent) { explain(c, c.g.hint(c.id), e.AbsolutePosition) }

// MouseOut implements desktop.Hoverable.
func (c *cell) MouseOut() { explain(c, "", fyne.Position{}) }

func explain(owner fyne.CanvasObject, text string, at fyne.Position) {
	if widgets.Explainer != nil {
		widgets.Explainer(owner, text, at)
	}
}

// CreateRenderer implements fyne.Widget.
func (c *cell) CreateRenderer() fyne.WidgetRenderer {
	r := &cellRenderer{c: c}
	for _, b := range []**canvas.Rectangle{&r.ground, &r.patch, &r.badge, &r.track, &r.span, &r.mark} {
		*b = canvas.NewRectangle(color.Transparent)
	}
	r.text, r.sub, r.letter = canvas.NewText("", color.Black), canvas.NewText("", color.Black), canvas.NewText("", color.Black)
	r.hatch = widgets.NewHatch()
	r.objects = []fyne.CanvasObject{r.ground, r.hatch, r.patch, r.track, r.span, r.mark, r.badge, r.letter, r.text, r.sub}
	r.Refresh()
	return r
}

type cellRenderer struct {
	c                    *cell
	ground, patch, badge *canvas.Rectangle
	track, span, mark    *canvas.Rectangle
	hatch                *widgets.Hatch
	text, sub, letter    *canvas.Text
	objects              []fyne.CanvasObject
}

func (r *cellRenderer) MinSize() fyne.Size           { return fyne.NewSize(leastWidth, rowHeight) }
func (r *cellRenderer) Objects() []fyne.CanvasObject { return r.objects }
func (r *cellRenderer) Destroy()                     {}

func (r *cellRenderer) Layout(s fyne.Size) {
	n := r.c.now
	r.ground.Resize(s)
	left, wide := float32(sideMargin), max(s.Width-2*sideMargin, 0)
	if n.letter != "" {
		r.badge.Move(fyne.NewPos(left, 4))
		r.badge.Resize(fyne.NewSize(17, 17))
		r.letter.Move(fyne.NewPos(left, 4))
		r.letter.Resize(fyne.NewSize(17, 17))
		left, wide = left+22, wide-22
	}
	r.text.Move(fyne.NewPos(left, 3))
	r.text.Resize(fyne.NewSize(wide, 19))
	r.text.Text = draw.Fit(n.text, valueSize, r.text.TextStyle.Bold, float64(wide))
	if n.name {
		left, wide = sideMargin, max(s.Width-2*sideMargin, 0)
		r.sub.Move(fyne.NewPos(left, 22))
		r.sub.Resize(fyne.NewSize(wide, 16))
		r.sub.Text = draw.Fit(n.sub, smallSize, false, float64(wide))
		return
	}
	r.sub.Move(fyne.NewPos(left, 4))
	r.sub.Resize(fyne.NewSize(wide, 18))
	r.sub.Text = n.sub
	if n.unknown {
		r.hatch.Move(fyne.NewPos(left, 7))
		r.hatch.Resize(fyne.NewSize(wide, rowHeight-14))
		w := min(float32(draw.TextWidth(n.text, valueSize, false))+10, wide)
		r.patch.Move(fyne.NewPos(left+(wide-w)/2, 11))
		r.patch.Resize(fyne.NewSize(w, 20))
		r.text.Move(fyne.NewPos(left, 11))
	}
	if n.word && !n.unknown {
		r.text.Move(fyne.NewPos(left, 11))
	}
	if n.bar {
		clamp := func(x float64) float32 { return float32(min(max(x, 0), 1)) * wide }
		y := float32(29)
		r.track.Move(fyne.NewPos(left, y))
		r.track.Resize(fyne.NewSize(wide, 3))
		x0, x1 := clamp(n.low), clamp(n.up)
		if x1-x0 < 3 {
			x0 = min(max((x0+x1)/2-1.5, 0), max(wide-3, 0))
			x1 = x0 + 3
		}
		r.span.Move(fyne.NewPos(left+x0, y))
		r.span.Resize(fyne.NewSize(x1-x0, 3))
		r.mark.Move(fyne.NewPos(left+min(max(clamp(n.x)-1, 0), max(wide-2, 0)), y-3))
		r.mark.Resize(fyne.NewSize(2, 9))
	}
}

func (r *cellRenderer) Refresh() {
	n := r.c.now
	ink, faint, warm := widgets.Colour(toolkit.ColorNameForeground), widgets.Colour(theme.Faint), widgets.Colour(theme.Warm)
	r.ground.FillColor = color.Transparent
	switch {
	case n.chosen && !n.warm:
		r.ground.FillColor = widgets.Colour(theme.Tint)
	case n.shade != "":
		r.ground.FillColor = theme.Colour(n.shade)
	}
	r.text.TextSize, r.text.TextStyle, r.text.Color, r.text.Alignment = valueSize, fyne.TextStyle{Bold: n.name}, ink, fyne.TextAlignTrailing
	r.sub.TextSize, r.sub.TextStyle, r.sub.Color, r.sub.Alignment = smallSize, fyne.TextStyle{Bold: n.warm}, faint, fyne.TextAlignLeading
	switch {
	case n.name:
		r.text.Alignment = fyne.TextAlignLeading
		if n.chosen {
			r.sub.Color = ink
		}
	case n.unknown:
		r.text.Color, r.text.Alignment = ink, fyne.TextAlignCenter
	case n.word:
		r.text.Color, r.text.Alignment = faint, fyne.TextAlignCenter
		if n.chosen {
			r.text.Color = ink
		}
	}
	if n.warm {
		r.sub.Color = warm
	}
	r.span.FillColor, r.mark.FillColor, r.track.FillColor = widgets.Colour(toolkit.ColorNamePrimary), ink, widgets.Colour(theme.Rule)
	if n.warm {
		r.span.FillColor = warm
	}
	r.patch.FillColor = widgets.Colour(toolkit.ColorNameBackground)
	if n.chosen {
		r.patch.FillColor = widgets.Colour(theme.Tint)
	}
	r.badge.FillColor, r.badge.CornerRadius = ink, 8.5
	r.letter.Text, r.letter.TextSize, r.letter.TextStyle, r.letter.Alignment = n.letter, smallSize, fyne.TextStyle{Bold: true}, fyne.TextAlignCenter
	r.letter.Color = widgets.Colour(toolkit.ColorNameBackground)
	shown(n.unknown, r.hatch, r.patch)
	shown(n.bar, r.track, r.span, r.mark)
	shown(n.letter != "", r.badge, r.letter)
	r.Layout(r.c.Size())
	if n.unknown {
		r.hatch.Refresh()
	}
	canvas.Refresh(r.c)
}

func shown(yes bool, objects ...fyne.CanvasObject) {
	for _, o := range objects {
		switch {
		case yes == o.Visible():
		case yes:
			o.Show()
		default:
			o.Hide()
		}
	}
}

// faintShare is how much of the ramp shades a cell; more would take the text's contrast away.
const faintShare = 0.3

// shadeOf gives the ground of a cell for a value from 0 to 1: one hue, from the paper on.
func shadeOf(p draw.Palette, v float64) string {
	paper, full := theme.Colour(p.Paper), theme.Colour(p.Ramp(1))
	mix := func(a, b uint8) uint8 {
		return uint8(float64(a) + (float64(b)-float64(a))*faintShare*min(max(v, 0), 1) + 0.5)
	}
	return fmt.Sprintf("#%02x%02x%02x", mix(paper.R, full.R), mix(paper.G, full.G), mix(paper.B, full.B))
}

// header is the head of a column: its title, unit and the arrow of the sorting.
type header struct {
	widget.BaseWidget
	g   *grid
	col int
	now heading
}

// heading is what a header shows.
type heading struct {
	title, unit string
	marked      bool // the column that the keyboard stands on
	shades      bool // the map shows it
	look        string
}

func newHeader(g *grid) *header {
	h := &header{g: g}
	h.ExtendBaseWidget(h)
	return h
}

func (h *header) show(col int, n heading) {
	h.col = col
	if h.now != n {
		h.now = n
		h.Refresh()
	}
}

// Tapped implements fyne.Tappable.
func (h *header) Tapped(*fyne.PointEvent) { h.g.sort(h.col) }

// TappedSecondary implements fyne.SecondaryTappable.
func (h *header) TappedSecondary(e *fyne.PointEvent) { h.g.menu(h.col, e.AbsolutePosition) }

// MouseIn implements desktop.Hoverable.
func (h *header) MouseIn(e *desktop.MouseEvent) { explain(h, h.g.sentence(h.col), e.AbsolutePosition) }

// MouseMoved implements desktop.Hoverable.
func (h *header) MouseMoved(e *desktop.MouseEvent) {
	explain(h, h.g.sentence(h.col), e.AbsolutePosition)
}

// MouseOut implements desktop.Hoverable.
func (h *header) MouseOut() { explain(h, "", fyne.Position{}) }

// CreateRenderer implements fyne.Widget.
func (h *header) CreateRenderer() fyne.WidgetRenderer {
	r := &headerRenderer{h: h, ground: canvas.NewRectangle(color.Transparent), line: canvas.NewRectangle(color.Transparent)}
	for i := range r.text {
		r.text[i] = canvas.NewText("", color.Black)
	}
	r.objects = []fyne.CanvasObject{r.ground, r.line, r.text[0], r.text[1], r.text[2]}
	r.Refresh()
	return r
}

type headerRenderer struct {
	h            *header
	ground, line *canvas.Rectangle
	text         [3]*canvas.Text
	objects      []fyne.CanvasObject
}

func (r *headerRenderer) MinSize() fyne.Size           { return fyne.NewSize(leastWidth, rowHeight) }
func (r *headerRenderer) Objects() []fyne.CanvasObject { return r.objects }
func (r *headerRenderer) Destroy()                     {}

func (r *headerRenderer) Layout(s fyne.Size) {
	r.ground.Resize(s)
	r.line.Move(fyne.NewPos(0, s.Height-2))
	r.line.Resize(fyne.NewSize(s.Width, 2))
	wide := max(s.Width-2*sideMargin, 0)
	lines := draw.Lines(r.h.now.title, headingSize, true, float64(wide), 2)
	for len(lines) < 2 {
		lines = append([]string{""}, lines...)
	}
	lines = append(lines, draw.Fit(r.h.now.unit, headingSize, false, float64(wide)))
	for i, t := range r.text {
		t.Text = lines[i]
		t.Move(fyne.NewPos(sideMargin, 1+13*float32(i)))
		t.Resize(fyne.NewSize(wide, 13))
	}
}

func (r *headerRenderer) Refresh() {
	n := r.h.now
	r.ground.FillColor = widgets.Colour(theme.Rail)
	r.line.FillColor = widgets.Colour(theme.Rule)
	if n.shades {
		r.line.FillColor = widgets.Colour(toolkit.ColorNamePrimary)
	}
	if n.marked {
		r.ground.FillColor = widgets.Colour(theme.Tint)
	}
	for i, t := range r.text {
		t.TextSize, t.TextStyle, t.Color = headingSize, fyne.TextStyle{Bold: i < 2}, widgets.Colour(toolkit.ColorNameForeground)
		t.Alignment = fyne.TextAlignTrailing
		if r.h.col == 0 {
			t.Alignment = fyne.TextAlignLeading
		}
	}
	if !n.marked {
		r.text[2].Color = widgets.Colour(theme.Faint)
	}
	r.Layout(r.h.Size())
	canvas.Refresh(r.h)
}
