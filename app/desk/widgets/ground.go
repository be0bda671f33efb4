package widgets

import (
	"image/color"

	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/canvas"
	"fyne.io/fyne/v2/widget"
)

// Ground is a plain surface in a colour of the theme.
type Ground struct {
	widget.BaseWidget
	name  fyne.ThemeColorName
	least fyne.Size
}

// NewGround makes a surface that is at least so large.
func NewGround(name fyne.ThemeColorName, least fyne.Size) *Ground {
	g := &Ground{name: name, least: least}
	g.ExtendBaseWidget(g)
	return g
}

// CreateRenderer implements fyne.Widget.
func (g *Ground) CreateRenderer() fyne.WidgetRenderer {
	r := &groundRenderer{g: g, rect: canvas.NewRectangle(color.Transparent)}
	r.Refresh()
	return r
}

type groundRenderer struct {
	g    *Ground
	rect *canvas.Rectangle
}

func (r *groundRenderer) Layout(s fyne.Size)           { r.rect.Resize(s) }
func (r *groundRenderer) MinSize() fyne.Size           { return r.g.least }
func (r *groundRenderer) Refresh()                     { r.rect.FillColor = Colour(r.g.name); r.rect.Refresh() }
func (r *groundRenderer) Objects() []fyne.CanvasObject { return []fyne.CanvasObject{r.rect} }
func (r *groundRenderer) Destroy()                     {}
