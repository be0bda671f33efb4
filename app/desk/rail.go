package desk

import (
	"fmt"
	"image/color"

	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/canvas"
	"fyne.io/fyne/v2/container"
	"fyne.io/fyne/v2/driver/desktop"
	"fyne.io/fyne/v2/layout"
	toolkit "fyne.io/fyne/v2/theme"
	"fyne.io/fyne/v2/widget"

	"groundtally/app/desk/core"
	"groundtally/app/desk/theme"
	"groundtally/app/desk/widgets"
	"groundtally/geo"
)

// railButton is one entry of the rail: a word and two lines of state.
type railButton struct {
	widget.BaseWidget
	title, first, second string
	warn, chosen         bool
	hovered, focused     bool
	tapped               func()
}

func newRailButton(title string, tapped func()) *railButton {
	b := &railButton{title: title, tapped: tapped}
	b.ExtendBaseWidget(b)
	return b
}

func (b *railButton) set(first, second string, warn, chosen bool) {
	if b.first != first || b.second != second || b.warn != warn || b.chosen != chosen {
		b.first, b.second, b.warn, b.chosen = first, second, warn, chosen
		b.Refresh()
	}
}

// Tapped implements fyne.Tappable.
func (b *railButton) Tapped(*fyne.PointEvent) { b.tapped() }

// MouseIn implements desktop.Hoverable.
func (b *railButton) MouseIn(*desktop.MouseEvent) { b.hovered = true; b.Refresh() }

// MouseMoved implements desktop.Hoverable.
func (b *railButton) MouseMoved(*desktop.MouseEvent) {}

// MouseOut implements desktop.Hoverable.
func (b *railButton) MouseOut() { b.hovered = false; b.Refresh() }

// FocusGained implements fyne.Focusable.
func (b *railButton) FocusGained() { b.focused = true; b.Refresh() }

// FocusLost implements fyne.Focusable.
func (b *railButton) FocusLost() { b.focused = false; b.Refresh() }

// TypedRune implements fyne.Focusable.
func (b *railButton) TypedRune(rune) {}

// TypedKey implements fyne.Focusable.
func (b *railButton) TypedKey(e *fyne.KeyEvent) {
	if e.Name == fyne.KeyReturn || e.Name == fyne.KeyEnter || e.Name == fyne.KeySpace {
		b.tapped()
	}
}

// CreateRenderer implements fyne.Widget.
func (b *railButton) CreateRenderer() fyne.WidgetRenderer {
	r := &railRenderer{b: b, ground: canvas.NewRectangle(color.Transparent), edge: canvas.NewRectangle(color.Transparent), title: widgets.Part(""), first: widgets.Faint(""), second: widgets.Faint("")}
	r.first.TextSize, r.second.TextSize = 11, 11
	r.objects = []fyne.CanvasObject{r.ground, r.edge, r.title, r.first, r.second}
	r.Refresh()
	return r
}

type railRenderer struct {
	b                    *railButton
	ground, edge         *canvas.Rectangle
	title, first, second *widgets.Line
	objects              []fyne.CanvasObject
}

func (r *railRenderer) Layout(s fyne.Size) {
	r.ground.Resize(s)
	r.edge.Resize(fyne.NewSize(4, s.Height))
	for i, l := range []*widgets.Line{r.title, r.first, r.second} {
		l.Move(fyne.NewPos(14, 8+float32(i)*18+float32(min(i, 1))*3))
		l.Resize(fyne.NewSize(s.Width-18, 18))
	}
}

func (r *railRenderer) MinSize() fyne.Size { return fyne.NewSize(120, 70) }

func (r *railRenderer) Refresh() {
	b := r.b
	r.ground.FillColor, r.edge.FillColor = color.Transparent, color.Transparent
	r.ground.StrokeWidth, r.ground.StrokeColor = 0, color.Transparent
	colour := toolkit.ColorNameForeground
	switch {
	case b.chosen:
		r.ground.FillColor, r.edge.FillColor = widgets.Colour(toolkit.ColorNameBackground), widgets.Colour(toolkit.ColorNamePrimary)
		colour = toolkit.ColorNamePrimary
	case b.hovered:
		r.ground.FillColor = widgets.Colour(toolkit.ColorNameHover)
	}
	if b.focused {
		r.ground.StrokeWidth, r.ground.StrokeColor = 2, widgets.Colour(toolkit.ColorNamePrimary)
	}
	r.title.SetLook(b.title, colour, true)
	r.first.SetLook(b.first, theme.Faint, false)
	second := theme.Faint
	if b.warn {
		second = theme.Warm
	}
	r.second.SetLook(b.second, second, false)
	r.ground.Refresh()
	r.edge.Refresh()
}

func (r *railRenderer) Objects() []fyne.CanvasObject { return r.objects }
func (r *railRenderer) Destroy()                     {}

// rail is the narrow column at the left: the five stages, problems, the look.
type rail struct {
	w        *Window
	buttons  []*railButton
	problems *railButton
	all      fyne.CanvasObject
}

const railWidth = 160

func newRail(w *Window) *rail {
	r := &rail{w: w}
	column := container.New(layout.NewCustomPaddedVBoxLayout(2))
	for i, s := range w.stages {
		b := newRailButton(s.Title(), func() { w.choose(i) })
		r.buttons = append(r.buttons, b)
		column.Add(b)
	}
	r.problems = newRailButton("Problems", func() { w.showProblems() })
	look := widget.NewButtonWithIcon("Light or dark", toolkit.ColorPaletteIcon(), w.switchLook)
	look.Importance, look.Alignment = widget.LowImportance, widget.ButtonAlignLeading
	foot := container.New(layout.NewCustomPaddedVBoxLayout(2), r.problems, look)
	r.all = container.NewStack(widgets.NewGround(theme.Rail, fyne.NewSize(railWidth, 10)),
		container.New(layout.NewCustomPaddedLayout(8, 6, 0, 0), container.NewBorder(nil, foot, nil, nil, container.NewVScroll(column))))
	return r
}

func (r *rail) update() {
	for i, s := range r.w.stages {
		first, second, warn := s.State()
		r.buttons[i].set(first, second, warn, i == r.w.at)
	}
	n, faults := 0, 0
	if v := r.w.core.View(); v != nil {
		for _, notice := range v.Notices {
			if notice.Severity != geo.Info {
				n++
			}
			if notice.Severity == geo.Fault {
				faults++
			}
		}
		if v.Problem != nil {
			n++
			faults++
		}
	}
	second := ""
	if faults > 0 {
		second = fmt.Sprintf("%d keep something back", faults)
	}
	r.problems.set(fmt.Sprintf("%s to look at", core.Count(n)), second, faults > 0, false)
}
