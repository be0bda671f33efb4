package widgets

import (
	"image"
	"image/color"

	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/canvas"
	toolkit "fyne.io/fyne/v2/theme"
	"fyne.io/fyne/v2/widget"

	"groundtally/app/desk/theme"
)

// RangeBar shows where a value and its low to high lie between the least and the greatest of all
// candidates. Unknown is hatched.
type RangeBar struct {
	widget.BaseWidget
	barState
}

type barState struct {
	low, central, high float64 // from 0 to 1
	unknown, warm, has bool
}

// NewRangeBar makes an empty bar.
func NewRangeBar() *RangeBar {
	b := &RangeBar{}
	b.ExtendBaseWidget(b)
	return b
}

// Set shows low, central and high as shares (0 to 1) of the way from the least to the greatest.
func (b *RangeBar) Set(low, central, high float64, warm bool) {
	b.change(barState{low: low, central: central, high: high, warm: warm, has: true})
}

// SetUnknown shows hatching.
func (b *RangeBar) SetUnknown() { b.change(barState{unknown: true, has: true}) }

// Clear shows the track alone.
func (b *RangeBar) Clear() { b.change(barState{}) }

func (b *RangeBar) change(n barState) {
	if b.barState != n {
		b.barState = n
		b.Refresh()
	}
}

// CreateRenderer implements fyne.Widget.
func (b *RangeBar) CreateRenderer() fyne.WidgetRenderer {
	r := &barRenderer{b: b, track: canvas.NewRectangle(color.Transparent), span: canvas.NewRectangle(color.Transparent), mark: canvas.NewRectangle(color.Transparent), hatch: NewHatch()}
	r.objects = []fyne.CanvasObject{r.track, r.span, r.mark, r.hatch}
	r.Refresh() // an empty bar shows neither mark nor hatching
	return r
}

type barRenderer struct {
	b                 *RangeBar
	track, span, mark *canvas.Rectangle
	hatch             *Hatch
	objects           []fyne.CanvasObject
}

func (r *barRenderer) Layout(s fyne.Size) {
	h := s.Height
	r.track.Move(fyne.NewPos(0, h/2-1.5))
	r.track.Resize(fyne.NewSize(s.Width, 3))
	r.hatch.Move(fyne.NewPos(0, 0))
	r.hatch.Resize(s)
	clamp := func(x float64) float32 { return float32(min(max(x, 0), 1)) * s.Width }
	x0, x1, m := clamp(r.b.low), clamp(r.b.high), clamp(r.b.central)
	if x1-x0 < 3 {
		x0 = min(max((x0+x1)/2-1.5, 0), s.Width-3)
		x1 = x0 + 3
	}
	r.span.Move(fyne.NewPos(x0, h/2-1.5))
	r.span.Resize(fyne.NewSize(x1-x0, 3))
	r.mark.Move(fyne.NewPos(min(max(m-1, 0), s.Width-2), 0))
	r.mark.Resize(fyne.NewSize(2, h))
}

func (r *barRenderer) MinSize() fyne.Size { return fyne.NewSize(30, 8) }

func (r *barRenderer) Refresh() {
	r.track.FillColor = Colour(theme.Track)
	r.span.FillColor, r.mark.FillColor = Colour(toolkit.ColorNamePrimary), Colour(toolkit.ColorNameForeground)
	if r.b.warm {
		r.span.FillColor = Colour(theme.Warm)
	}
	show(r.track, !r.b.unknown)
	show(r.span, r.b.has && !r.b.unknown)
	show(r.mark, r.b.has && !r.b.unknown)
	show(r.hatch, r.b.unknown)
	r.Layout(r.b.Size())
	r.track.Refresh()
	r.span.Refresh()
	r.mark.Refresh()
	r.hatch.Refresh()
}

func (r *barRenderer) Objects() []fyne.CanvasObject { return r.objects }
func (r *barRenderer) Destroy()                     {}

func show(o fyne.CanvasObject, yes bool) {
	if yes {
		o.Show()
	} else {
		o.Hide()
	}
}

// Hatch is a patch of hatching, which means unknown, nothing else.
type Hatch struct {
	widget.BaseWidget
}

// NewHatch makes a patch.
func NewHatch() *Hatch {
	h := &Hatch{}
	h.ExtendBaseWidget(h)
	return h
}

// CreateRenderer implements fyne.Widget.
func (h *Hatch) CreateRenderer() fyne.WidgetRenderer {
	i := canvas.NewImageFromImage(image.NewNRGBA(image.Rect(0, 0, 1, 1)))
	i.ScaleMode = canvas.ImageScalePixels
	return &hatchRenderer{h: h, i: i}
}

type hatchRenderer struct {
	h    *Hatch
	i    *canvas.Image
	size fyne.Size
	ink  color.Color
}

func (r *hatchRenderer) Layout(s fyne.Size) {
	ink := Colour(theme.Faint)
	r.i.Resize(s)
	if r.size == s && r.ink == ink || s.Width < 1 || s.Height < 1 {
		return
	}
	r.size, r.ink = s, ink
	w, h := int(s.Width), int(s.Height)
	img := image.NewNRGBA(image.Rect(0, 0, w, h))
	for y := range h {
		for x := range w {
			if (x+y)%5 == 0 {
				img.Set(x, y, ink)
			}
		}
	}
	r.i.Image = img
	r.i.Refresh()
}

func (r *hatchRenderer) MinSize() fyne.Size           { return fyne.NewSize(10, 8) }
func (r *hatchRenderer) Refresh()                     { r.Layout(r.h.Size()) }
func (r *hatchRenderer) Objects() []fyne.CanvasObject { return []fyne.CanvasObject{r.i} }
func (r *hatchRenderer) Destroy()                     {}
