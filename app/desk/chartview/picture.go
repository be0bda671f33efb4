package chartview

import (
	"image"

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

// Picture shows a chart as wide as there is room, painted off the window's goroutine, with the words of
// what the pointer rests on.
type Picture struct {
	widget.BaseWidget
	core *core.Core
	run  func(func())                                    // off the window's goroutine
	make func(p draw.Palette, width float64) *draw.Scene // nil for no picture
	grew func()                                          // told when the height changes

	scene *draw.Scene
	image *canvas.Image
	job   int // of the newest painting
}

// New makes a picture without a chart. Run does its work off the window's goroutine, grew is told when the height
// changes.
func New(c *core.Core, run func(func()), grew func()) *Picture {
	p := &Picture{core: c, run: run, grew: grew, image: canvas.NewImageFromImage(image.NewRGBA(image.Rect(0, 0, 1, 1)))}
	p.image.FillMode = canvas.ImageFillStretch
	p.ExtendBaseWidget(p)
	return p
}

// Set draws something else; nil shows nothing.
func (p *Picture) Set(do func(pal draw.Palette, width float64) *draw.Scene) {
	p.make = do
	p.draw()
}

// Repaint paints the chart anew, in another look for one.
func (p *Picture) Repaint() { p.draw() }

// Resize implements fyne.CanvasObject: another width is another picture.
func (p *Picture) Resize(s fyne.Size) {
	was := p.Size().Width
	p.BaseWidget.Resize(s)
	if s.Width != was {
		p.draw()
	}
}

// Scene gives what is shown; nil for nothing.
func (p *Picture) Scene() *draw.Scene { return p.scene }

// Painted gives the newest picture that was painted.
func (p *Picture) Painted() image.Image { return p.image.Image }

func (p *Picture) height() float32 {
	if p.scene == nil {
		return 0
	}
	return float32(p.scene.Height)
}

func (p *Picture) draw() {
	p.job++
	was := p.height()
	width := p.Size().Width
	p.scene = nil
	if p.make != nil && width > 1 {
		p.scene = p.make(p.core.Palette(), float64(width))
	}
	if scene := p.scene; scene != nil {
		job, pal, scale := p.job, p.core.Palette(), float64(p.core.Window.Canvas().Scale())
		p.run(func() {
			img := raster.Paint(scene, scale, pal)
			p.core.Do(func() {
				if job == p.job {
					p.image.Image = img
					p.image.Refresh()
				}
			})
		})
	}
	if p.height() != was {
		p.Refresh()
		p.grew()
	}
}

// MouseIn implements desktop.Hoverable.
func (p *Picture) MouseIn(e *desktop.MouseEvent) { p.MouseMoved(e) }

// MouseMoved implements desktop.Hoverable.
func (p *Picture) MouseMoved(e *desktop.MouseEvent) {
	words := ""
	if p.scene != nil {
		_, words = raster.Hit(p.scene, float64(e.Position.X), float64(e.Position.Y))
	}
	p.say(words, e.AbsolutePosition)
}

// MouseOut implements desktop.Hoverable.
func (p *Picture) MouseOut() { p.say("", fyne.Position{}) }

func (p *Picture) say(words string, at fyne.Position) {
	if widgets.Explainer != nil {
		widgets.Explainer(p, words, at)
	}
}

// CreateRenderer implements fyne.Widget.
func (p *Picture) CreateRenderer() fyne.WidgetRenderer { return &pictureRenderer{p} }

type pictureRenderer struct{ p *Picture }

func (r *pictureRenderer) Layout(s fyne.Size) {
	r.p.image.Hidden = r.p.scene == nil // the toolkit cannot paint a picture without height
	// A chart has a least width; what is narrower sees its left part.
	r.p.image.Resize(fyne.NewSize(max(s.Width, chart.Narrowest), r.p.height()))
}
func (r *pictureRenderer) MinSize() fyne.Size           { return fyne.NewSize(10, r.p.height()) }
func (r *pictureRenderer) Refresh()                     { r.Layout(r.p.Size()) }
func (r *pictureRenderer) Objects() []fyne.CanvasObject { return []fyne.CanvasObject{r.p.image} }
func (r *pictureRenderer) Destroy()                     {}
