package weigh

import (
	"image"
	"image/color"
	"math"

	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/canvas"
	"fyne.io/fyne/v2/widget"

	"groundtally/app/desk/theme"
	"groundtally/app/desk/widgets"
)

// mark is a small warm triangle that points down.
type mark struct {
	widget.BaseWidget
}

func newMark() *mark {
	m := &mark{}
	m.ExtendBaseWidget(m)
	return m
}

// CreateRenderer implements fyne.Widget.
func (m *mark) CreateRenderer() fyne.WidgetRenderer {
	r := &markRenderer{m: m, img: canvas.NewImageFromImage(triangle(color.Transparent))}
	r.Refresh()
	return r
}

type markRenderer struct {
	m   *mark
	ink color.Color
	img *canvas.Image
}

// triangle is drawn four times as large as it is shown, so that its edges are smooth.
func triangle(ink color.Color) image.Image {
	const w, h = 4 * markSize, 4 * (markSize - 2)
	img := image.NewNRGBA(image.Rect(0, 0, w, h))
	for y := range h {
		half := float64(h-y) / h * w / 2
		for x := range w {
			if math.Abs(float64(x)+0.5-w/2) <= half {
				img.Set(x, y, ink)
			}
		}
	}
	return img
}

func (r *markRenderer) Layout(size fyne.Size) { r.img.Resize(size) }
func (r *markRenderer) MinSize() fyne.Size    { return fyne.NewSize(markSize, markSize-2) }

func (r *markRenderer) Refresh() {
	if ink := widgets.Colour(theme.Warm); ink != r.ink {
		r.ink, r.img.Image = ink, triangle(ink)
		r.img.Refresh()
	}
}

func (r *markRenderer) Objects() []fyne.CanvasObject { return []fyne.CanvasObject{r.img} }
func (r *markRenderer) Destroy()                     {}
