package weigh

import (
	"image/color"
	"math"

	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/canvas"
	"fyne.io/fyne/v2/driver/desktop"
	toolkit "fyne.io/fyne/v2/theme"
	"fyne.io/fyne/v2/widget"

	"groundtally/app/desk/theme"
	"groundtally/app/desk/widgets"
)

const (
	mostPoints = 100 // the end of a slider, in swing points
	knobSize   = 16
	markSize   = 8
)

// slider sets swing points from 0 to 100. Marks above the track show where first place changes hands.
type slider struct {
	widget.BaseWidget
	points  float64
	marks   []float64
	moved   func(points float64) // while it moves
	settled func()               // when a drag or a tap ends, or return is pressed
	dropped func()               // escape

	hovered, focused, dragged bool
}

func newSlider(moved func(float64), settled, dropped func()) *slider {
	s := &slider{moved: moved, settled: settled, dropped: dropped}
	s.ExtendBaseWidget(s)
	return s
}

// set shows points and marks without telling anybody.
func (s *slider) set(points float64, marks []float64) {
	same := s.points == points && len(marks) == len(s.marks)
	for i := 0; same && i < len(marks); i++ {
		same = marks[i] == s.marks[i]
	}
	if !same {
		s.points, s.marks = points, marks
		s.Refresh()
	}
}

func (s *slider) move(points float64) {
	points = math.Round(min(max(points, 0), max(mostPoints, s.points))) // typed points may lie beyond the end
	if points == s.points {
		return
	}
	s.points = points
	s.Refresh()
	s.moved(points)
}

func (s *slider) at(x float32) float64 {
	return mostPoints * float64(x-knobSize/2) / float64(max(s.Size().Width-knobSize, 1))
}

// Dragged implements fyne.Draggable.
func (s *slider) Dragged(e *fyne.DragEvent) {
	s.dragged = true
	s.move(min(s.at(e.Position.X), mostPoints))
}

// DragEnd implements fyne.Draggable.
func (s *slider) DragEnd() {
	if s.dragged {
		s.dragged = false
		s.settled()
	}
}

// Tapped implements fyne.Tappable.
func (s *slider) Tapped(e *fyne.PointEvent) {
	if c := fyne.CurrentApp().Driver().CanvasForObject(s); c != nil {
		c.Focus(s)
	}
	s.move(min(s.at(e.Position.X), mostPoints))
	s.settled()
}

// TypedKey implements fyne.Focusable: arrows try other weights, return keeps them, escape goes back.
func (s *slider) TypedKey(e *fyne.KeyEvent) {
	switch e.Name {
	case fyne.KeyLeft, fyne.KeyDown:
		s.move(s.points - 1)
	case fyne.KeyRight, fyne.KeyUp:
		s.move(s.points + 1)
	case fyne.KeyPageDown:
		s.move(s.points - 10)
	case fyne.KeyPageUp:
		s.move(s.points + 10)
	case fyne.KeyHome:
		s.move(0)
	case fyne.KeyEnd:
		s.move(max(mostPoints, s.points))
	case fyne.KeyReturn, fyne.KeyEnter:
		s.settled()
	case fyne.KeyEscape:
		s.dropped()
	}
}

// TypedRune implements fyne.Focusable.
func (s *slider) TypedRune(rune) {}

// FocusGained implements fyne.Focusable.
func (s *slider) FocusGained() { s.focused = true; s.Refresh() }

// FocusLost implements fyne.Focusable.
func (s *slider) FocusLost() { s.focused = false; s.Refresh() }

// MouseIn implements desktop.Hoverable.
func (s *slider) MouseIn(*desktop.MouseEvent) { s.hovered = true; s.Refresh() }

// MouseMoved implements desktop.Hoverable.
func (s *slider) MouseMoved(*desktop.MouseEvent) {}

// MouseOut implements desktop.Hoverable.
func (s *slider) MouseOut() { s.hovered = false; s.Refresh() }

// CreateRenderer implements fyne.Widget.
func (s *slider) CreateRenderer() fyne.WidgetRenderer {
	r := &sliderRenderer{s: s, track: canvas.NewRectangle(color.Transparent), done: canvas.NewRectangle(color.Transparent), halo: canvas.NewCircle(color.Transparent), knob: canvas.NewCircle(color.Transparent)}
	for i := range r.marks {
		r.marks[i] = newMark()
	}
	r.objects = []fyne.CanvasObject{r.track, r.done, r.halo, r.knob, r.marks[0], r.marks[1]}
	r.Refresh()
	return r
}

type sliderRenderer struct {
	s           *slider
	track, done *canvas.Rectangle
	halo, knob  *canvas.Circle
	marks       [2]*mark
	objects     []fyne.CanvasObject
}

func (r *sliderRenderer) MinSize() fyne.Size { return fyne.NewSize(80, 28) }

func (r *sliderRenderer) Layout(size fyne.Size) {
	x := func(points float64) float32 {
		return knobSize/2 + float32(min(points, mostPoints)/mostPoints)*(size.Width-knobSize)
	}
	y := size.Height - 12
	put(r.track, knobSize/2, y-2, size.Width-knobSize, 4)
	put(r.done, knobSize/2, y-2, x(r.s.points)-knobSize/2, 4)
	put(r.knob, x(r.s.points)-knobSize/2, y-knobSize/2, knobSize, knobSize)
	put(r.halo, x(r.s.points)-knobSize/2-4, y-knobSize/2-4, knobSize+8, knobSize+8)
	for i, m := range r.marks {
		if i < len(r.s.marks) {
			put(m, x(r.s.marks[i])-markSize/2, y-knobSize/2-markSize+2, markSize, markSize-2)
		}
		show(m, i < len(r.s.marks))
	}
}

func (r *sliderRenderer) Refresh() {
	accent := widgets.Colour(toolkit.ColorNamePrimary)
	r.track.FillColor, r.done.FillColor = widgets.Colour(theme.Track), accent
	r.track.CornerRadius, r.done.CornerRadius = 2, 2
	r.knob.FillColor, r.knob.StrokeColor, r.knob.StrokeWidth = widgets.Colour(toolkit.ColorNameBackground), accent, 2
	r.halo.FillColor = color.Transparent
	switch {
	case r.s.focused:
		r.halo.FillColor = widgets.Colour(toolkit.ColorNameFocus)
	case r.s.hovered:
		r.halo.FillColor = widgets.Colour(toolkit.ColorNameHover)
	}
	r.Layout(r.s.Size())
	for _, o := range r.objects {
		o.Refresh()
	}
}

func (r *sliderRenderer) Objects() []fyne.CanvasObject { return r.objects }
func (r *sliderRenderer) Destroy()                     {}
