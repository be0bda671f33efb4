package weigh

import (
	"image"
	"image/color"

	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/canvas"
	"fyne.io/fyne/v2/driver/desktop"
	"fyne.io/fyne/v2/widget"

	"groundtally/app/desk/core"
	"groundtally/app/desk/widgets"
	"groundtally/app/draw"
	"groundtally/app/draw/chart"
	"groundtally/app/draw/raster"
)

// picture shows a scene. It is made and painted off the window's goroutine, anew for another width.
type picture struct {
	widget.BaseWidget
	c       *core.Core
	make    func(p draw.Palette, width float64) *draw.Scene
	pressed func(item string, add bool) // a shape with an item was clicked; may be nil
	sized   func()                      // the height changed
	fit     func(width float32) float32 // how much of the width the scene takes; may be nil

	work     latest
	width    float32
	scene    *draw.Scene
	img      image.Image
	palette  draw.Palette // that the picture is painted in
	modifier fyne.KeyModifier
}

func newPicture(c *core.Core, sized func()) *picture {
	p := &picture{c: c, sized: sized}
	p.ExtendBaseWidget(p)
	return p
}

// set shows what make gives; make runs on another goroutine.
func (p *picture) set(make func(p draw.Palette, width float64) *draw.Scene) {
	p.make = make
	p.paint()
}

func (p *picture) paint() {
	if p.make == nil || p.width < 1 {
		return
	}
	scale := float64(p.c.Window.Canvas().Scale())
	build, palette, width := p.make, p.c.Palette(), float64(p.width)
	if p.img != nil && p.palette != palette { // nothing rather than light paper in the dark
		p.img = nil
		p.Refresh()
	}
	p.work.ask(p.c, nil, func() func() {
		scene := build(palette, width)
		img := raster.Paint(scene, scale, palette)
		return func() {
			taller := p.scene == nil || p.scene.Height != scene.Height
			p.scene, p.img, p.palette = scene, img, palette
			p.Refresh()
			if taller {
				p.sized()
			}
		}
	})
}

func (p *picture) hit(at fyne.Position) (item, title string) {
	if p.scene == nil {
		return "", ""
	}
	return raster.Hit(p.scene, float64(at.X), float64(at.Y))
}

// MouseIn implements desktop.Hoverable.
func (p *picture) MouseIn(e *desktop.MouseEvent) { p.MouseMoved(e) }

// MouseMoved implements desktop.Hoverable.
func (p *picture) MouseMoved(e *desktop.MouseEvent) {
	if widgets.Explainer != nil {
		_, title := p.hit(e.Position)
		widgets.Explainer(p, title, e.AbsolutePosition)
	}
}

// MouseOut implements desktop.Hoverable.
func (p *picture) MouseOut() {
	if widgets.Explainer != nil {
		widgets.Explainer(p, "", fyne.Position{})
	}
}

// MouseDown implements desktop.Mouseable.
func (p *picture) MouseDown(e *desktop.MouseEvent) { p.modifier = e.Modifier }

// MouseUp implements desktop.Mouseable.
func (p *picture) MouseUp(*desktop.MouseEvent) {}

// Tapped implements fyne.Tappable.
func (p *picture) Tapped(e *fyne.PointEvent) {
	add := adding(p.modifier)
	p.modifier = 0
	if item, _ := p.hit(e.Position); item != "" && p.pressed != nil {
		p.pressed(item, add)
	}
}

// adding tells whether a click adds to the chosen candidates.
func adding(m fyne.KeyModifier) bool {
	return m&(fyne.KeyModifierControl|fyne.KeyModifierShift|fyne.KeyModifierSuper) != 0
}

// CreateRenderer implements fyne.Widget.
func (p *picture) CreateRenderer() fyne.WidgetRenderer {
	r := &pictureRenderer{p: p, img: canvas.NewImageFromImage(image.NewUniform(color.Transparent))}
	r.img.FillMode, r.img.ScaleMode = canvas.ImageFillStretch, canvas.ImageScaleFastest
	return r
}

type pictureRenderer struct {
	p   *picture
	img *canvas.Image
}

func (r *pictureRenderer) MinSize() fyne.Size {
	h := float32(120)
	if r.p.scene != nil {
		h = float32(r.p.scene.Height)
	}
	return fyne.NewSize(chart.Narrowest, h)
}

func (r *pictureRenderer) Layout(size fyne.Size) {
	if r.p.scene != nil {
		r.img.Resize(fyne.NewSize(float32(r.p.scene.Width), float32(r.p.scene.Height)))
	}
	width := size.Width
	if r.p.fit != nil {
		width = r.p.fit(width)
	}
	if width != r.p.width {
		r.p.width = width
		r.p.paint()
	}
}

func (r *pictureRenderer) Refresh() {
	if r.p.img != nil {
		r.img.Image = r.p.img
	}
	show(r.img, r.p.img != nil)
	r.Layout(r.p.Size())
	r.img.Refresh()
}

func (r *pictureRenderer) Objects() []fyne.CanvasObject { return []fyne.CanvasObject{r.img} }
func (r *pictureRenderer) Destroy()                     {}
