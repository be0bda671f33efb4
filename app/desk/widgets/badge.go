package widgets

import (
	"image/color"

	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/canvas"
	toolkit "fyne.io/fyne/v2/theme"
	"fyne.io/fyne/v2/widget"
)

// Badge is the letter of a chosen candidate on a filled round.
type Badge struct {
	widget.BaseWidget
	letter string
}

// NewBadge makes a badge.
func NewBadge(letter string) *Badge {
	b := &Badge{letter: letter}
	b.ExtendBaseWidget(b)
	return b
}

// Set changes the letter; an empty one hides the badge.
func (b *Badge) Set(letter string) {
	if b.letter != letter {
		b.letter = letter
		b.Refresh()
	}
}

// CreateRenderer implements fyne.Widget.
func (b *Badge) CreateRenderer() fyne.WidgetRenderer {
	r := &badgeRenderer{b: b, ground: canvas.NewCircle(color.Transparent), text: canvas.NewText("", color.Black)}
	r.Refresh()
	return r
}

type badgeRenderer struct {
	b      *Badge
	ground *canvas.Circle
	text   *canvas.Text
}

const badgeSize = 18

func (r *badgeRenderer) Layout(s fyne.Size) {
	at := fyne.NewPos((s.Width-badgeSize)/2, (s.Height-badgeSize)/2)
	r.ground.Move(at)
	r.ground.Resize(fyne.NewSquareSize(badgeSize))
	r.text.Move(at)
	r.text.Resize(fyne.NewSquareSize(badgeSize))
}

func (r *badgeRenderer) MinSize() fyne.Size { return fyne.NewSquareSize(badgeSize) }

func (r *badgeRenderer) Refresh() {
	r.ground.FillColor, r.text.Color = Colour(toolkit.ColorNameForeground), Colour(toolkit.ColorNameBackground)
	r.text.Text, r.text.TextSize, r.text.TextStyle, r.text.Alignment = r.b.letter, 11, fyne.TextStyle{Bold: true}, fyne.TextAlignCenter
	show(r.ground, r.b.letter != "")
	show(r.text, r.b.letter != "")
	r.ground.Refresh()
	r.text.Refresh()
}

func (r *badgeRenderer) Objects() []fyne.CanvasObject { return []fyne.CanvasObject{r.ground, r.text} }
func (r *badgeRenderer) Destroy()                     {}
