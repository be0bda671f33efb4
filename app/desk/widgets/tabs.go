package widgets

import (
	"image/color"

	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/canvas"
	"fyne.io/fyne/v2/container"
	"fyne.io/fyne/v2/driver/desktop"
	toolkit "fyne.io/fyne/v2/theme"
	"fyne.io/fyne/v2/widget"

	"groundtally/app/desk/theme"
	"groundtally/app/draw"
)

// Pill is a small button with rounded ends; a chosen one is filled.
type Pill struct {
	widget.BaseWidget
	Text     string
	Chosen   bool
	OnTapped func()

	hovered, focused bool
}

// NewPill makes a pill.
func NewPill(text string, tapped func()) *Pill {
	p := &Pill{Text: text, OnTapped: tapped}
	p.ExtendBaseWidget(p)
	return p
}

// Tapped implements fyne.Tappable.
func (p *Pill) Tapped(*fyne.PointEvent) {
	if p.OnTapped != nil {
		p.OnTapped()
	}
}

// MouseIn implements desktop.Hoverable.
func (p *Pill) MouseIn(*desktop.MouseEvent) { p.hovered = true; p.Refresh() }

// MouseMoved implements desktop.Hoverable.
func (p *Pill) MouseMoved(*desktop.MouseEvent) {}

// MouseOut implements desktop.Hoverable.
func (p *Pill) MouseOut() { p.hovered = false; p.Refresh() }

// FocusGained implements fyne.Focusable.
func (p *Pill) FocusGained() { p.focused = true; p.Refresh() }

// FocusLost implements fyne.Focusable.
func (p *Pill) FocusLost() { p.focused = false; p.Refresh() }

// TypedRune implements fyne.Focusable.
func (p *Pill) TypedRune(rune) {}

// TypedKey implements fyne.Focusable: space and return press the pill.
func (p *Pill) TypedKey(e *fyne.KeyEvent) {
	if e.Name == fyne.KeySpace || e.Name == fyne.KeyReturn || e.Name == fyne.KeyEnter {
		p.Tapped(nil)
	}
}

// CreateRenderer implements fyne.Widget.
func (p *Pill) CreateRenderer() fyne.WidgetRenderer {
	r := &pillRenderer{p: p, ground: canvas.NewRectangle(color.Transparent), text: canvas.NewText(p.Text, color.Black)}
	r.Refresh()
	return r
}

type pillRenderer struct {
	p      *Pill
	ground *canvas.Rectangle
	text   *canvas.Text
}

func (r *pillRenderer) Layout(s fyne.Size) {
	r.ground.Resize(s)
	r.text.Move(fyne.NewPos(0, 0))
	r.text.Resize(s)
}

func (r *pillRenderer) MinSize() fyne.Size {
	return fyne.NewSize(float32(draw.TextWidth(r.p.Text, 12.5, true))+22, 26) // chosen or not, so that no pill moves
}

func (r *pillRenderer) Refresh() {
	r.ground.CornerRadius = 13
	r.text.Text, r.text.TextSize, r.text.Alignment = r.p.Text, 12.5, fyne.TextAlignCenter
	r.text.TextStyle = fyne.TextStyle{Bold: r.p.Chosen}
	r.ground.FillColor, r.text.Color = Colour(theme.Track), Colour(toolkit.ColorNameForeground)
	if r.p.Chosen {
		r.ground.FillColor, r.text.Color = Colour(toolkit.ColorNamePrimary), Colour(toolkit.ColorNameForegroundOnPrimary)
	}
	r.ground.StrokeWidth, r.ground.StrokeColor = 0, color.Transparent
	if r.p.focused || r.p.hovered {
		r.ground.StrokeWidth, r.ground.StrokeColor = 2, Colour(toolkit.ColorNamePrimary)
		if !r.p.focused {
			r.ground.StrokeWidth, r.ground.StrokeColor = 1, Colour(theme.Faint)
		}
	}
	r.ground.Refresh()
	r.text.Refresh()
}

func (r *pillRenderer) Objects() []fyne.CanvasObject {
	return []fyne.CanvasObject{r.ground, r.text}
}
func (r *pillRenderer) Destroy() {}

// Tabs is a row of pills over the content of the chosen one. Contents are made when first shown.
type Tabs struct {
	widget.BaseWidget
	OnChosen func(i int)

	pills  []*Pill
	makers []func() fyne.CanvasObject
	made   []fyne.CanvasObject
	at     int
	body   *fyne.Container
	all    *fyne.Container
}

// Tab is one part of Tabs.
type Tab struct {
	Text string
	Make func() fyne.CanvasObject
}

// NewTabs makes tabs and shows the first.
func NewTabs(tabs ...Tab) *Tabs {
	t := &Tabs{body: container.NewStack(), made: make([]fyne.CanvasObject, len(tabs))}
	row := container.NewHBox()
	for i, tab := range tabs {
		p := NewPill(tab.Text, func() { t.Choose(i) })
		t.pills, t.makers = append(t.pills, p), append(t.makers, tab.Make)
		row.Add(p)
	}
	t.all = container.NewBorder(container.NewHScroll(row), nil, nil, nil, t.body)
	t.ExtendBaseWidget(t)
	t.Choose(0)
	return t
}

// Choose shows a tab.
func (t *Tabs) Choose(i int) {
	if i < 0 || i >= len(t.pills) {
		return
	}
	t.at = i
	if t.made[i] == nil {
		t.made[i] = t.makers[i]()
	}
	for j, p := range t.pills {
		if p.Chosen != (i == j) {
			p.Chosen = i == j
			p.Refresh()
		}
	}
	t.body.Objects = []fyne.CanvasObject{t.made[i]}
	t.body.Refresh()
	if t.OnChosen != nil {
		t.OnChosen(i)
	}
}

// Chosen tells which tab is shown.
func (t *Tabs) Chosen() int { return t.at }

// CreateRenderer implements fyne.Widget.
func (t *Tabs) CreateRenderer() fyne.WidgetRenderer { return widget.NewSimpleRenderer(t.all) }
