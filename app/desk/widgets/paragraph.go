package widgets

import (
	"image/color"

	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/canvas"
	"fyne.io/fyne/v2/driver/desktop"
	toolkit "fyne.io/fyne/v2/theme"
	"fyne.io/fyne/v2/widget"

	"groundtally/app/draw"
)

// Paragraph is text that wraps within a fixed number of lines, for rows of equal height. What finds no room
// is cut with dots and shown whole while the pointer rests on it.
type Paragraph struct {
	widget.BaseWidget
	Text     string
	TextSize float32
	Colour   fyne.ThemeColorName
	Most     int // lines

	cut bool
}

// NewParagraph makes a paragraph of at most that many lines.
func NewParagraph(text string, most int) *Paragraph {
	p := &Paragraph{Text: text, TextSize: 12, Colour: toolkit.ColorNameForeground, Most: most}
	p.ExtendBaseWidget(p)
	return p
}

// Set changes the text.
func (p *Paragraph) Set(text string) {
	if p.Text != text {
		p.Text = text
		p.Refresh()
	}
}

// MouseIn implements desktop.Hoverable.
func (p *Paragraph) MouseIn(e *desktop.MouseEvent) { p.MouseMoved(e) }

// MouseMoved implements desktop.Hoverable.
func (p *Paragraph) MouseMoved(e *desktop.MouseEvent) {
	if p.cut {
		explain(p, p.Text, e.AbsolutePosition)
	}
}

// MouseOut implements desktop.Hoverable.
func (p *Paragraph) MouseOut() { explain(p, "", fyne.Position{}) }

// CreateRenderer implements fyne.Widget.
func (p *Paragraph) CreateRenderer() fyne.WidgetRenderer {
	r := &paragraphRenderer{p: p}
	for range p.Most {
		t := canvas.NewText("", color.Black)
		r.lines, r.objects = append(r.lines, t), append(r.objects, t)
	}
	return r
}

type paragraphRenderer struct {
	p       *Paragraph
	lines   []*canvas.Text
	objects []fyne.CanvasObject
}

func (r *paragraphRenderer) pitch() float32 { return r.p.TextSize * 1.4 }

func (r *paragraphRenderer) Layout(s fyne.Size) {
	var parts []string
	if r.p.Text != "" && s.Width > 1 {
		parts = draw.Lines(r.p.Text, float64(r.p.TextSize), false, float64(s.Width), r.p.Most+1)
	}
	if r.p.cut = len(parts) > r.p.Most; r.p.cut {
		parts = draw.Lines(r.p.Text, float64(r.p.TextSize), false, float64(s.Width), r.p.Most)
	}
	for i, t := range r.lines {
		t.Text = ""
		if i < len(parts) {
			t.Text = parts[i]
		}
		t.TextSize, t.Color = r.p.TextSize, Colour(r.p.Colour)
		t.Move(fyne.NewPos(0, float32(i)*r.pitch()))
		t.Resize(fyne.NewSize(s.Width, r.pitch()))
		t.Refresh()
	}
}

func (r *paragraphRenderer) MinSize() fyne.Size {
	return fyne.NewSize(8, r.pitch()*float32(r.p.Most))
}

func (r *paragraphRenderer) Refresh()                     { r.Layout(r.p.Size()) }
func (r *paragraphRenderer) Objects() []fyne.CanvasObject { return r.objects }
func (r *paragraphRenderer) Destroy()                     {}
