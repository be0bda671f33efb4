package mapview

import (
	"fmt"
	"math"
	"strconv"
	"time"

	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/canvas"
	"fyne.io/fyne/v2/container"

	"groundtally/app/draw/tiles"
	"groundtally/geo"
	"groundtally/geo/measure"
	"groundtally/scoring/units"
)

// Sketch asks the user for places on the map: one for points, several for lines and outlines.
type Sketch struct {
	Kind  geo.Kind
	Words string      // what is asked for
	From  *geo.LonLat // where a feature stood that is put elsewhere; nil for none
	// Done is told the places, an outline ending where it began, and how many metres are a hair's breadth on
	// the map; no places when the user gave up. The map takes no more of them then.
	Done func(at []geo.LonLat, nearM float64)
}

const (
	closeUnits   = 10 // to its first point a click closes an outline; so near is a feature that is meant
	finePanUnits = 8  // per arrow key with shift
)

// sketch is a shape that is being drawn.
type sketch struct {
	Sketch
	at []geo.LonLat
}

// sketchLayer shows it.
type sketchLayer struct {
	box  *fyne.Container
	card *card
	now  *sketch
	// ended is when the last shape was ended.
	ended time.Time
}

func newSketchLayer(look tiles.Look) *sketchLayer {
	return &sketchLayer{box: container.NewWithoutLayout(), card: newCard(look)}
}

// Sketch lets the user draw, in place of what was being drawn, which is given up.
func (m *Map) Sketch(s Sketch) {
	m.GiveUp()
	if m.ground == nil {
		s.Done(nil, 0)
		return
	}
	m.drawn.now = &sketch{Sketch: s}
	m.setHover(-1)
	if c := fyne.CurrentApp().Driver().CanvasForObject(m); c != nil {
		c.Focus(m)
	}
	m.showSketch()
}

// GiveUp ends the drawing without a shape, or the moving of points; it tells whether there was any.
func (m *Map) GiveUp() bool { return m.endSketch(false) || m.endPoints(false) }

// Sketching tells whether the user is drawing, or moving points.
func (m *Map) Sketching() bool { return m.drawn.now != nil || m.points.now != nil }

func (m *Map) endSketch(take bool) bool {
	s := m.drawn.now
	if s == nil {
		return false
	}
	var at []geo.LonLat
	if take {
		at = s.at
		if s.Kind == geo.Polygons {
			at = append(at, at[0])
		}
	}
	m.drawn.now, m.drawn.ended = nil, time.Now()
	m.showCross(false)
	m.showSketch()
	s.Done(at, closeUnits*m.lens.mPerPx()*m.lens.scale)
	return true
}

// fewest is how many points the shape needs.
func (s *sketch) fewest() int {
	switch s.Kind {
	case geo.Lines:
		return 2
	case geo.Polygons:
		return 3
	}
	return 1
}

// setPoint adds a point to the shape at a position; a point by itself and one that closes an outline end it.
func (m *Map) setPoint(at fyne.Position) {
	s := m.drawn.now
	if m.furniture.covers(at) {
		return
	}
	if s.Kind == geo.Polygons && len(s.at) >= s.fewest() {
		if first := m.screen(s.at[0]); math.Hypot(float64(at.X-first.X), float64(at.Y-first.Y)) <= closeUnits {
			m.endSketch(true)
			return
		}
	}
	s.at = append(s.at, m.ground.Plane().From(m.lens.from(at)))
	if s.Kind == geo.Points {
		m.endSketch(true)
		return
	}
	m.showSketch()
}

// finishSketch ends a shape that has enough points.
func (m *Map) finishSketch() {
	if s := m.drawn.now; len(s.at) >= s.fewest() {
		m.endSketch(true)
	}
}

// sketchKey does what a key means while the user draws; it tells whether the key means something then.
func (m *Map) sketchKey(key fyne.KeyName) bool {
	s := m.drawn.now
	if s == nil {
		return false
	}
	step := float64(panUnits)
	if m.shift {
		step = finePanUnits
	}
	move := func(dx, dy float64) {
		m.byKey(func() { m.pan(dx, dy) })
		m.showSketch()
	}
	switch key {
	case fyne.KeyLeft:
		move(step, 0)
	case fyne.KeyRight:
		move(-step, 0)
	case fyne.KeyUp:
		move(0, step)
	case fyne.KeyDown:
		move(0, -step)
	case fyne.KeySpace:
		if !m.keyed { // without the cross nobody can know where the point would be
			m.showCross(true)
			m.showSketch()
			return true
		}
		m.setPoint(m.middle())
	case fyne.KeyReturn, fyne.KeyEnter:
		m.finishSketch()
	case fyne.KeyBackspace, fyne.KeyDelete:
		s.at = s.at[:max(len(s.at)-1, 0)]
		m.showSketch()
	case fyne.KeyEscape:
		m.GiveUp()
	default:
		return false
	}
	return true
}

// screen gives where a place is in the widget.
func (m *Map) screen(p geo.LonLat) fyne.Position { return m.lens.to(m.ground.Plane().To(p)) }

// showSketch draws the shape over the map, with a line on to the pointer or the cross.
func (m *Map) showSketch() {
	l := m.drawn
	s := l.now
	l.box.Objects = nil
	defer l.box.Refresh()
	if s == nil || m.ground == nil {
		l.card.setLines("")
		m.hoverOver = -1
		m.hover.setLines("")
		return
	}
	var next *fyne.Position
	switch mid := m.middle(); {
	case m.keyed:
		next = &mid
	case m.pointed && !m.furniture.covers(m.pointer):
		next = &m.pointer
	}
	var path []fyne.Position
	for _, p := range s.at {
		path = append(path, m.screen(p))
	}
	set := len(path)
	if s.From != nil {
		path, set = append([]fyne.Position{m.screen(*s.From)}, path...), set+1
	}
	if next != nil && (s.Kind != geo.Points || s.From != nil) {
		path = append(path, *next)
	}
	line := func(a, b fyne.Position, width float32) {
		under, over := canvas.NewLine(m.look.Casing), canvas.NewLine(m.look.Ink)
		under.StrokeWidth, over.StrokeWidth = width+2.5, width
		for _, o := range []*canvas.Line{under, over} {
			o.Position1, o.Position2 = a, b
			l.box.Objects = append(l.box.Objects, o)
		}
	}
	for i := 1; i < len(path); i++ {
		width := float32(2)
		if i >= set {
			width = 1 // not set yet
		}
		line(path[i-1], path[i], width)
	}
	if s.Kind == geo.Polygons && len(path) > 2 {
		line(path[len(path)-1], path[0], 1)
	}
	for i, p := range path[:set] {
		dot := canvas.NewCircle(m.look.Paper)
		dot.StrokeColor, dot.StrokeWidth = m.look.Ink, 2
		r := float32(4)
		if i == 0 && s.Kind == geo.Polygons {
			r = 6 // it closes the outline
		}
		dot.Resize(fyne.NewSize(2*r, 2*r))
		dot.Move(p.SubtractXY(r, r))
		l.box.Objects = append(l.box.Objects, dot)
	}
	l.card.setLines(s.Words + "\n" + s.help())
	m.placeAsk()
	m.hover.setLines(m.measured(next))
	if beside := next; m.hover.box.Visible() {
		if beside == nil {
			beside = &path[len(path)-1]
		}
		m.hover.beside(*beside, m.lens.size)
	}
}

// placeAsk puts the card that says what is asked for at the top of the map.
func (m *Map) placeAsk() {
	c, top := m.drawn.card, float32(edgeUnits)
	if f := m.furniture; f.ground.Visible() {
		top += f.ground.Size().Height + 4
	}
	c.box.Move(fyne.NewPos(max(float32(edgeUnits), (m.lens.size.Width-c.size.Width)/2), top))
}

// help says in a line or two which keys do what.
func (s *sketch) help() string {
	words := "Arrows move the cross, Space sets a point there. Esc gives up."
	switch {
	case s.Kind == geo.Points:
		return words
	case s.Kind == geo.Lines:
		return "Enter or a double click ends the line. Backspace takes a point back.\n" + words
	}
	return "Enter, or a click on the first point, closes it. Backspace takes a point back.\n" + words
}

// measured writes the size of the shape, with the next point where the pointer or the cross is.
func (m *Map) measured(next *fyne.Position) string {
	s := m.drawn.now
	var ring []geo.XY
	if s.From != nil {
		ring = append(ring, m.ground.Plane().To(*s.From))
	}
	for _, p := range s.at {
		ring = append(ring, m.ground.Plane().To(p))
	}
	if next != nil {
		ring = append(ring, m.lens.from(*next))
	}
	if len(ring) < 2 || s.Kind == geo.Points && s.From == nil {
		return ""
	}
	lengthM := measure.LengthM(geo.XYGeometry{Kind: geo.Lines, Parts: [][][]geo.XY{{ring}}})
	if s.Kind != geo.Polygons {
		return lengthWords(lengthM)
	}
	ring = append(ring, ring[0])
	g := geo.XYGeometry{Kind: geo.Polygons, Parts: [][][]geo.XY{{ring}}}
	words := lengthWords(measure.LengthM(geo.XYGeometry{Kind: geo.Lines, Parts: [][][]geo.XY{{ring}}})) + " around"
	if len(ring) > 3 {
		words = strconv.FormatFloat(measure.AreaM2(g)/units.M2PerHa, 'f', 2, 64) + " ha\n" + words
	}
	return words
}

// lengthWords writes a length that was drawn by hand.
func lengthWords(m float64) string {
	if m >= 1000 {
		return fmt.Sprintf("%.2f km", m/1000)
	}
	return fmt.Sprintf("%.0f m", m)
}
