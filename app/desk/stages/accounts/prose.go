package accounts

import (
	"image/color"

	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/canvas"
	toolkit "fyne.io/fyne/v2/theme"
	"fyne.io/fyne/v2/widget"

	"groundtally/app/desk/theme"
	"groundtally/app/desk/widgets"
	"groundtally/app/draw"
)

// block is a paragraph of a text, with the room above it.
type block struct {
	text  string
	size  float32
	bold  bool
	faint bool
	above float32
}

func partBlock(text string) block  { return block{text: text, size: 14, bold: true, above: 16} }
func topicBlock(text string) block { return block{text: text, size: 13, bold: true, above: 12} }
func textBlock(text string) block  { return block{text: text, size: 13, above: 3} }
func faintBlock(text string) block { return block{text: text, size: 12, faint: true, above: 3} }

// prose shows paragraphs one below the other, as wide as there is room. One widget for a long text costs a small part
// of what a label for each paragraph would.
type prose struct {
	widget.BaseWidget
	blocks []block
	grew   func() // told when the height changes
	height float32
	lines  []proseLine
}

type proseLine struct {
	text string
	of   int // the block
	y    float32
}

const proseMost = 400 // lines of one paragraph

func newProse(grew func()) *prose {
	p := &prose{grew: grew}
	p.ExtendBaseWidget(p)
	return p
}

// set shows other paragraphs.
func (p *prose) set(blocks []block) {
	p.blocks = blocks
	p.flow()
}

// Resize implements fyne.CanvasObject: another width breaks lines elsewhere.
func (p *prose) Resize(s fyne.Size) {
	was := p.Size().Width
	p.BaseWidget.Resize(s)
	if s.Width != was {
		p.flow()
	}
}

// flow breaks the paragraphs into lines.
func (p *prose) flow() {
	width := p.Size().Width
	if width <= 1 {
		return
	}
	was := p.height
	p.lines, p.height = p.lines[:0], 0
	for i, b := range p.blocks {
		if i > 0 {
			p.height += b.above
		}
		for _, l := range draw.Lines(b.text, float64(b.size), b.bold, float64(width), proseMost) {
			p.lines = append(p.lines, proseLine{l, i, p.height})
			p.height += lineOf(b.size)
		}
	}
	p.Refresh()
	if p.height != was {
		p.grew()
	}
}

func lineOf(size float32) float32 { return size * 1.45 }

// CreateRenderer implements fyne.Widget.
func (p *prose) CreateRenderer() fyne.WidgetRenderer {
	r := &proseRenderer{p: p}
	r.Refresh()
	return r
}

type proseRenderer struct {
	p       *prose
	texts   []*canvas.Text
	objects []fyne.CanvasObject
}

func (r *proseRenderer) Layout(fyne.Size)             {}
func (r *proseRenderer) MinSize() fyne.Size           { return fyne.NewSize(8, r.p.height) }
func (r *proseRenderer) Objects() []fyne.CanvasObject { return r.objects }
func (r *proseRenderer) Destroy()                     {}

func (r *proseRenderer) Refresh() {
	for len(r.texts) < len(r.p.lines) {
		r.texts = append(r.texts, canvas.NewText("", color.Black))
	}
	r.objects = r.objects[:0]
	ink, faint := widgets.Colour(toolkit.ColorNameForeground), widgets.Colour(theme.Faint)
	for i, l := range r.p.lines {
		t, b := r.texts[i], r.p.blocks[l.of]
		t.Text, t.TextSize, t.TextStyle, t.Color = l.text, b.size, fyne.TextStyle{Bold: b.bold}, ink
		if b.faint {
			t.Color = faint
		}
		t.Move(fyne.NewPos(0, l.y))
		t.Resize(fyne.NewSize(r.p.Size().Width, lineOf(b.size)))
		r.objects = append(r.objects, t)
	}
	canvas.Refresh(r.p)
}
