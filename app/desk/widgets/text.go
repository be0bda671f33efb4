package widgets

import (
	"image/color"

	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/canvas"
	"fyne.io/fyne/v2/driver/desktop"
	toolkit "fyne.io/fyne/v2/theme"
	"fyne.io/fyne/v2/widget"

	"groundtally/app/desk/theme"
	"groundtally/app/draw"
)

// Colour gives a colour of the window's theme.
func Colour(n fyne.ThemeColorName) color.Color { return toolkit.Color(n) }

// Line is one line of text that is cut with dots rather than spilt, follows the theme, and may carry a
// sentence that is shown while the pointer rests on it.
type Line struct {
	widget.BaseWidget
	Text     string
	Hint     string // shown by Explainer; empty for none
	TextSize float32
	Bold     bool
	Align    fyne.TextAlign
	Colour   fyne.ThemeColorName
	// Natural makes the line at least as wide as its text; else it may be cut to nothing.
	Natural bool
}

// NewLine makes a line of body text.
func NewLine(text string) *Line {
	l := &Line{Text: text, TextSize: 13, Colour: toolkit.ColorNameForeground}
	l.ExtendBaseWidget(l)
	return l
}

// Heading makes a line that heads a pane or a part of one.
func Heading(text string) *Line {
	l := NewLine(text)
	l.TextSize, l.Bold = 18, true
	return l
}

// Part makes a line that heads a part of a pane.
func Part(text string) *Line {
	l := NewLine(text)
	l.TextSize, l.Bold = 14, true
	return l
}

// Faint makes a line of lesser weight.
func Faint(text string) *Line {
	l := NewLine(text)
	l.TextSize, l.Colour = 12, theme.Faint
	return l
}

// Warm makes a line that wants attention.
func Warm(text string) *Line {
	l := NewLine(text)
	l.TextSize, l.Colour = 12, theme.Warm
	return l
}

// Hinted sets the sentence and gives the line.
func (l *Line) Hinted(hint string) *Line {
	l.Hint = hint
	return l
}

// Wide makes the line at least as wide as its text and gives it.
func (l *Line) Wide() *Line {
	l.Natural = true
	return l
}

// Set changes the text.
func (l *Line) Set(text string) {
	if l.Text != text {
		l.Text = text
		l.Refresh()
	}
}

// SetLook changes text, colour and weight at once.
func (l *Line) SetLook(text string, colour fyne.ThemeColorName, bold bool) {
	if l.Text != text || l.Colour != colour || l.Bold != bold {
		l.Text, l.Colour, l.Bold = text, colour, bold
		l.Refresh()
	}
}

// MouseIn, MouseMoved and MouseOut show the hint.
func (l *Line) MouseIn(e *desktop.MouseEvent) { explain(l, l.hint(), e.AbsolutePosition) }

// MouseMoved implements desktop.Hoverable.
func (l *Line) MouseMoved(e *desktop.MouseEvent) { explain(l, l.hint(), e.AbsolutePosition) }

// MouseOut implements desktop.Hoverable.
func (l *Line) MouseOut() { explain(l, "", fyne.Position{}) }

// hint gives the sentence; a line that is cut says its whole text.
func (l *Line) hint() string {
	if l.Hint == "" && l.TextSize > 0 && float32(draw.TextWidth(l.Text, float64(l.TextSize), l.Bold)) > l.Size().Width+1 {
		return l.Text
	}
	return l.Hint
}

// CreateRenderer implements fyne.Widget.
func (l *Line) CreateRenderer() fyne.WidgetRenderer {
	t := canvas.NewText("", color.Black)
	return &lineRenderer{l: l, t: t}
}

type lineRenderer struct {
	l *Line
	t *canvas.Text
}

func (r *lineRenderer) Layout(size fyne.Size) {
	text := r.l.Text
	if float32(draw.TextWidth(text, float64(r.l.TextSize), r.l.Bold)) > size.Width+1 {
		text = draw.Fit(text, float64(r.l.TextSize), r.l.Bold, float64(size.Width))
	}
	r.t.Text, r.t.TextSize, r.t.TextStyle = text, r.l.TextSize, fyne.TextStyle{Bold: r.l.Bold}
	r.t.Color, r.t.Alignment = Colour(r.l.Colour), r.l.Align
	r.t.Resize(size)
	r.t.Refresh()
}

func (r *lineRenderer) MinSize() fyne.Size {
	w := float32(8)
	if r.l.Natural {
		w = float32(draw.TextWidth(r.l.Text, float64(r.l.TextSize), r.l.Bold)) + 2
	}
	return fyne.NewSize(w, r.l.TextSize*1.45)
}

func (r *lineRenderer) Refresh()                     { r.Layout(r.l.Size()) }
func (r *lineRenderer) Objects() []fyne.CanvasObject { return []fyne.CanvasObject{r.t} }
func (r *lineRenderer) Destroy()                     {}

// NewText makes a text of several lines that wraps.
func NewText(text string) *widget.Label {
	l := widget.NewLabel(text)
	l.Wrapping = fyne.TextWrapWord
	return l
}

// Explainer is told of the sentence under the pointer: owner is the object that it belongs to, an empty
// text hides it. The window sets it; without one nothing is shown.
var Explainer func(owner fyne.CanvasObject, text string, at fyne.Position)

func explain(owner fyne.CanvasObject, text string, at fyne.Position) {
	if Explainer != nil {
		Explainer(owner, text, at)
	}
}

// Explain shows a sentence beside the pointer, as Line does with its hint; an empty text hides it.
func Explain(owner fyne.CanvasObject, text string, at fyne.Position) { explain(owner, text, at) }
