package weigh

import (
	"image/color"
	"slices"

	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/canvas"
	"fyne.io/fyne/v2/driver/desktop"
	toolkit "fyne.io/fyne/v2/theme"
	"fyne.io/fyne/v2/widget"

	"groundtally/app/desk/theme"
	"groundtally/app/desk/widgets"
	"groundtally/app/draw"
)

type barPart struct {
	share   float64
	unknown bool
}

// scoreBar shows a score as its parts one after the other on a scale from 0 to 1, with a thin line from
// the low to the high end of the score under them. Unknown parts are hatched.
type scoreBar struct {
	widget.BaseWidget
	parts     []barPart
	low, high float64
	words     func() string // what the pointer is told; may be nil
}

func newScoreBar() *scoreBar {
	b := &scoreBar{}
	b.ExtendBaseWidget(b)
	return b
}

// set takes parts over; the slice is copied.
func (b *scoreBar) set(parts []barPart, low, high float64) {
	if b.low != low || b.high != high || !slices.Equal(b.parts, parts) {
		b.parts, b.low, b.high = append(b.parts[:0], parts...), low, high
		b.Refresh()
	}
}

func (b *scoreBar) say(e *desktop.MouseEvent) {
	if widgets.Explainer != nil && b.words != nil {
		widgets.Explainer(b, b.words(), e.AbsolutePosition)
	}
}

// MouseIn implements desktop.Hoverable.
func (b *scoreBar) MouseIn(e *desktop.MouseEvent) { b.say(e) }

// MouseMoved implements desktop.Hoverable.
func (b *scoreBar) MouseMoved(e *desktop.MouseEvent) { b.say(e) }

// MouseOut implements desktop.Hoverable.
func (b *scoreBar) MouseOut() {
	if widgets.Explainer != nil {
		widgets.Explainer(b, "", fyne.Position{})
	}
}

// CreateRenderer implements fyne.Widget.
func (b *scoreBar) CreateRenderer() fyne.WidgetRenderer {
	r := &scoreBarRenderer{b: b, track: canvas.NewRectangle(color.Transparent), span: canvas.NewRectangle(color.Transparent)}
	r.Refresh()
	return r
}

type scoreBarRenderer struct {
	b           *scoreBar
	track, span *canvas.Rectangle
	parts       []*canvas.Rectangle
	hatches     []*widgets.Hatch
	objects     []fyne.CanvasObject
}

func (r *scoreBarRenderer) MinSize() fyne.Size { return fyne.NewSize(60, 14) }

func (r *scoreBarRenderer) Layout(size fyne.Size) {
	h := max(size.Height-4, 4)
	put(r.track, 0, 0, size.Width, h)
	x := float32(0)
	for i, p := range r.b.parts {
		w := float32(p.share) * size.Width
		put(r.parts[i], x, 0, max(w-1, min(w, 1)), h)
		put(r.hatches[i], x, 0, max(w-1, min(w, 1)), h)
		x += w
	}
	x0, x1 := float32(r.b.low)*size.Width, float32(r.b.high)*size.Width
	put(r.span, x0, size.Height-2, max(x1-x0, 2), 2)
}

func (r *scoreBarRenderer) Refresh() {
	for i := len(r.parts); i < len(r.b.parts); i++ {
		p, h := canvas.NewRectangle(theme.Colour(draw.Category(i))), widgets.NewHatch()
		r.parts, r.hatches = append(r.parts, p), append(r.hatches, h)
	}
	r.objects = append(r.objects[:0], r.track, r.span)
	for i := range r.parts {
		there := i < len(r.b.parts) && r.b.parts[i].share > 0
		unknown := there && r.b.parts[i].unknown
		show(r.parts[i], there && !unknown)
		show(r.hatches[i], unknown)
		if there && unknown {
			r.objects = append(r.objects, r.hatches[i])
		} else if there {
			r.objects = append(r.objects, r.parts[i])
		}
	}
	r.track.FillColor, r.span.FillColor = widgets.Colour(theme.Track), widgets.Colour(toolkit.ColorNameForeground)
	r.Layout(r.b.Size())
	for _, o := range r.objects {
		o.Refresh()
	}
}

func (r *scoreBarRenderer) Objects() []fyne.CanvasObject { return r.objects }
func (r *scoreBarRenderer) Destroy()                     {}

// shareBar shows one share of a whole.
type shareBar struct {
	widget.BaseWidget
	share float64
}

func newShareBar() *shareBar {
	b := &shareBar{}
	b.ExtendBaseWidget(b)
	return b
}

func (b *shareBar) set(share float64) {
	if b.share != share {
		b.share = share
		b.Refresh()
	}
}

// CreateRenderer implements fyne.Widget.
func (b *shareBar) CreateRenderer() fyne.WidgetRenderer {
	r := &shareBarRenderer{b: b, track: canvas.NewRectangle(color.Transparent), done: canvas.NewRectangle(color.Transparent)}
	r.Refresh()
	return r
}

type shareBarRenderer struct {
	b           *shareBar
	track, done *canvas.Rectangle
}

func (r *shareBarRenderer) MinSize() fyne.Size { return fyne.NewSize(30, 5) }

func (r *shareBarRenderer) Layout(size fyne.Size) {
	put(r.track, 0, 0, size.Width, size.Height)
	put(r.done, 0, 0, size.Width*float32(min(max(r.b.share, 0), 1)), size.Height)
}

func (r *shareBarRenderer) Refresh() {
	r.track.FillColor, r.done.FillColor = widgets.Colour(theme.Track), widgets.Colour(toolkit.ColorNamePrimary)
	r.Layout(r.b.Size())
	r.track.Refresh()
	r.done.Refresh()
}

func (r *shareBarRenderer) Objects() []fyne.CanvasObject {
	return []fyne.CanvasObject{r.track, r.done}
}
func (r *shareBarRenderer) Destroy() {}

// badge is the letter of a chosen candidate in a dark circle.
type badge struct {
	widget.BaseWidget
	letter string
}

func newBadge() *badge {
	b := &badge{}
	b.ExtendBaseWidget(b)
	return b
}

func (b *badge) set(letter string) {
	if b.letter != letter {
		b.letter = letter
		b.Refresh()
	}
	show(b, letter != "")
}

// CreateRenderer implements fyne.Widget.
func (b *badge) CreateRenderer() fyne.WidgetRenderer {
	r := &badgeRenderer{b: b, ground: canvas.NewCircle(color.Transparent), text: canvas.NewText("", color.Black)}
	r.Refresh()
	return r
}

type badgeRenderer struct {
	b      *badge
	ground *canvas.Circle
	text   *canvas.Text
}

func (r *badgeRenderer) MinSize() fyne.Size { return fyne.NewSize(17, 17) }

func (r *badgeRenderer) Layout(size fyne.Size) {
	put(r.ground, 0, 0, size.Width, size.Height)
	put(r.text, 0, 0, size.Width, size.Height)
}

func (r *badgeRenderer) Refresh() {
	r.ground.FillColor = widgets.Colour(toolkit.ColorNameForeground)
	r.text.Text, r.text.TextSize, r.text.TextStyle, r.text.Alignment = r.b.letter, 11, fyne.TextStyle{Bold: true}, fyne.TextAlignCenter
	r.text.Color = widgets.Colour(toolkit.ColorNameBackground)
	r.ground.Refresh()
	r.text.Refresh()
}

func (r *badgeRenderer) Objects() []fyne.CanvasObject { return []fyne.CanvasObject{r.ground, r.text} }
func (r *badgeRenderer) Destroy()                     {}
