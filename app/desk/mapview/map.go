package mapview

import (
	"math"
	"sync/atomic"
	"time"

	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/canvas"
	"fyne.io/fyne/v2/container"
	"fyne.io/fyne/v2/driver/desktop"
	"fyne.io/fyne/v2/widget"

	"groundtally/app/draw/tiles"
	"groundtally/geo"
)

// Options say how a Map works. Zero values are the defaults.
type Options struct {
	Workers      int   // goroutines that draw; the number of processors
	MaxTileBytes int64 // memory for tiles; 96 MB
	// Do runs a function on the window's goroutine; fyne.Do unless given. The toolkit's test driver runs
	// such functions on the caller's goroutine: a test gives a queue and empties it itself.
	Do func(func())
}

// Map shows a district. All its methods belong to the window's goroutine; none waits for drawing.
type Map struct {
	widget.BaseWidget

	// OnSelect is told of a parcel that was clicked, or chosen by Enter; add is set with shift or
	// control. An empty identifier means that nothing is to be selected any more.
	OnSelect func(parcelID string, add bool)
	// OnBox is told of the parcels that lie wholly in a box drawn with shift.
	OnBox func(parcelIDs []string)
	// OnHover gives the words to show beside the pointer over a parcel, line by line; none hides them.
	OnHover func(parcelID string) string
	// OnSecondary is told of a click with the other button; the identifier is empty beside parcels, and
	// the position is that in the window, for a menu.
	OnSecondary func(at geo.LonLat, parcelID string, absolute fyne.Position)
	// OnViewChanged is told after the view was moved or zoomed.
	OnViewChanged func()

	painter *tiles.Painter
	ground  *tiles.Ground
	look    tiles.Look
	hidden  []string
	relief  *tiles.Relief
	under   *tiles.Backdrop
	marks   []tiles.Mark
	lens    lens
	fit     bool // the district must be fitted as soon as the size is known
	ratio   float64
	pending atomic.Bool

	front, back tileLayer
	wanted      []tiles.Key

	clip       *container.Clip
	stage      *fyne.Container
	backdrop   *canvas.Rectangle
	names      *nameLayer
	badges     *badgeLayer
	furniture  *furniture
	drawn      *sketchLayer
	points     *pointLayer
	hover      *card
	hoverOver  int // parcel that the words belong to, or -1
	box        *canvas.Rectangle
	cross      []*canvas.Line
	ring       *canvas.Rectangle
	pointer    fyne.Position
	pointed    bool // the pointer is over the map
	keyed      bool // the map is moved by keys
	shift      bool
	control    bool
	press      press
	wheelUnits float32
}

// press is what is known of the mouse button that is down or was released last.
type press struct {
	at       fyne.Position
	box      bool
	dragging bool
	handled  bool // the click was already told
	last     time.Time
	lastAt   fyne.Position
}

var (
	_ fyne.Draggable         = (*Map)(nil)
	_ fyne.Scrollable        = (*Map)(nil)
	_ fyne.Tappable          = (*Map)(nil)
	_ fyne.SecondaryTappable = (*Map)(nil)
	_ fyne.DoubleTappable    = (*Map)(nil)
	_ desktop.Hoverable      = (*Map)(nil)
	_ desktop.Mouseable      = (*Map)(nil)
	_ desktop.Keyable        = (*Map)(nil)
	_ fyne.Tabbable          = (*Map)(nil)
)

// New makes a map without a district, in the light look. Close ends its workers.
func New(o Options) *Map {
	m := &Map{look: tiles.LightLook(), hoverOver: -1, fit: true, ratio: 1}
	do := o.Do
	if do == nil {
		do = fyne.Do
	}
	m.painter = tiles.NewPainter(tiles.Options{Workers: o.Workers, MaxBytes: o.MaxTileBytes, Ready: func() {
		// Many tiles may be ready before the window gets to look: one visit is enough.
		if m.pending.CompareAndSwap(false, true) {
			do(func() {
				m.pending.Store(false)
				m.place()
			})
		}
	}})
	m.lens = lens{level: 16, scale: 1}
	m.backdrop = canvas.NewRectangle(m.look.Paper)
	m.front.box, m.back.box = container.NewWithoutLayout(), container.NewWithoutLayout()
	m.names, m.badges = newNameLayer(), newBadgeLayer()
	m.furniture = newFurniture(m)
	m.hover = newCard(m.look)
	m.drawn, m.points = newSketchLayer(m.look), newPointLayer(m.look)
	m.box = canvas.NewRectangle(nil)
	m.box.StrokeWidth = 1.5
	m.box.Hide()
	for range 4 {
		m.cross = append(m.cross, &canvas.Line{StrokeWidth: 1.5})
	}
	m.ring = canvas.NewRectangle(nil)
	m.ring.StrokeWidth = 2
	m.ring.Hide()
	objects := []fyne.CanvasObject{m.backdrop, m.back.box, m.front.box, m.names.box, m.badges.box, m.drawn.box, m.points.box, m.box}
	for _, l := range m.cross {
		l.Hide()
		objects = append(objects, l)
	}
	objects = append(objects, m.furniture.box, m.drawn.card.box, m.points.beside.box, m.hover.box, m.ring)
	m.stage = container.NewWithoutLayout(objects...)
	m.clip = container.NewClip(m.stage)
	m.ExtendBaseWidget(m)
	m.dress()
	return m
}

// Close ends the workers that draw the tiles. The map keeps what it shows.
func (m *Map) Close() { m.painter.Close() }

// SetGround shows another district, whole, or none. Marks and colours of the former one are dropped.
func (m *Map) SetGround(g *tiles.Ground) {
	m.ground, m.marks = g, nil
	m.painter.SetShading(tiles.Shading{})
	m.painter.SetGround(g)
	m.front.clear()
	m.back.clear()
	m.wanted = nil
	m.names.setGround(g)
	m.badges.set(nil, nil, m.look)
	m.setHover(-1)
	m.FitAll()
}

// SetShading colours the parcels. What it holds must not be changed afterwards.
func (m *Map) SetShading(s tiles.Shading) { m.painter.SetShading(s) }

// SetMarks shows the selected candidates. What it holds must not be changed afterwards.
func (m *Map) SetMarks(marks []tiles.Mark) {
	m.marks = marks
	m.painter.SetMarks(marks)
	m.badges.set(m.ground, marks, m.look)
	m.place()
}

// SetLook changes all colours but those of the parcels.
func (m *Map) SetLook(l tiles.Look) {
	m.look = l
	m.dress()
	m.place()
}

// SetHidden leaves out the layers of some roles.
func (m *Map) SetHidden(roles ...string) {
	m.hidden = roles
	m.painter.SetStyle(m.style())
}

// SetRelief shows the light on the slopes of a district's terrain, or none. It is left out on any other
// district than the one it was made for.
func (m *Map) SetRelief(r *tiles.Relief) {
	m.relief = r
	m.painter.SetStyle(m.style())
}

// SetBackdrop shows pictures of the ground under the map with those who must be named, or none. They are left out
// on any other district than the one they were made for.
func (m *Map) SetBackdrop(b *tiles.Backdrop, credit string) {
	m.under = b
	m.painter.SetStyle(m.style())
	m.furniture.setCredit(credit)
	m.arrange()
}

// SetLegend explains the colours; entries without a title hide it.
func (m *Map) SetLegend(title string, entries []LegendEntry) {
	m.furniture.legend.set(title, entries, m.style())
	m.arrange()
	if m.fit {
		m.FitAll()
	}
}

// Counts tells what was drawn so far.
func (m *Map) Counts() tiles.Counts { return m.painter.Counts() }

// Settled tells whether all that is in view is drawn as it is now.
func (m *Map) Settled() bool {
	for _, k := range tiles.Keys(m.lens.level, m.lens.rect()) {
		if _, fresh := m.painter.Picture(k); !fresh {
			m.place() // what was given out must be shown
			return false
		}
	}
	m.place()
	return true
}

// ParcelAt names the parcel at a place; empty where there is none.
func (m *Map) ParcelAt(at geo.LonLat) string {
	if m.ground != nil {
		if n, ok := m.ground.Hit(m.ground.Plane().To(at)); ok {
			return m.ground.ID(n)
		}
	}
	return ""
}

// View gives what is shown.
func (m *Map) View() View {
	v := View{MPerUnit: m.lens.mPerPx() * m.lens.scale}
	if m.ground != nil {
		v.Centre = m.ground.Plane().From(m.lens.centre)
	}
	return v
}

// SetView shows what View gave; the scale is the nearest that the map has.
func (m *Map) SetView(v View) { m.CentreOn(v.Centre, v.MPerUnit) }

// CentreOn shows a place in the middle; a scale of zero keeps the scale.
func (m *Map) CentreOn(at geo.LonLat, mPerUnit float64) {
	if m.ground == nil || !at.Finite() {
		return
	}
	l := m.lens
	l.centre = m.ground.Plane().To(at)
	if mPerUnit > 0 {
		l.level = int(math.Round(4 * math.Log2(mPerUnit/l.scale)))
	}
	m.fit = false
	m.setLens(l)
}

// ShowParcel brings a parcel into the middle, and nearer when it would be too small to see. It reports
// false when there is no such parcel.
func (m *Map) ShowParcel(id string) bool {
	if m.ground == nil {
		return false
	}
	n, ok := m.ground.Number(id)
	if !ok || m.ground.ParcelExtent(n).Empty() {
		return false
	}
	e := m.ground.ParcelExtent(n)
	l := m.lens
	l.centre = e.Centre()
	side := math.Max(e.MaxX-e.MinX, e.MaxY-e.MinY)
	view := math.Min(float64(l.size.Width), float64(l.size.Height)) * l.scale
	if px := side / l.mPerPx(); view > 0 && (px < 30*l.scale || px > view) {
		l.level = levelFor(side / (view / 5))
	}
	m.fit = false
	m.setLens(l)
	return true
}

// FitAll shows the district whole.
func (m *Map) FitAll() {
	m.fit = true
	if m.ground != nil {
		m.setLens(m.fitted())
	}
}

func (m *Map) fitted() lens {
	return m.lens.fittedBeside(m.ground.Extent(), m.furniture.legend.room())
}

// Hide also lets the workers rest.
func (m *Map) Hide() {
	m.painter.Pause()
	m.BaseWidget.Hide()
}

// Show sets the workers to work again.
func (m *Map) Show() {
	m.painter.Resume()
	m.BaseWidget.Show()
}

func (m *Map) style() tiles.Style {
	return tiles.Style{Look: m.look, PixelRatio: m.ratio, Hidden: m.hidden, Relief: m.relief, Backdrop: m.under}
}

// setLens shows another part of the ground.
func (m *Map) setLens(l lens) {
	if m.ground != nil {
		l = l.limited(m.ground.Extent())
	}
	if l.level != m.lens.level || l.scale != m.lens.scale {
		// What is on the screen is stretched until the new scale is drawn. Half a screen is no better
		// than what it was to replace.
		if m.front.complete || len(m.back.tiles) == 0 {
			m.back.clear()
			m.front, m.back = m.back, m.front
			m.front.box, m.back.box = m.back.box, m.front.box
			m.front.swap(&m.back)
		}
		m.front.clear()
	}
	m.lens = l
	m.place()
	if m.pointed {
		m.point(m.pointer)
	}
	if m.OnViewChanged != nil {
		m.OnViewChanged()
	}
}

// place puts everything that lies on the ground where it belongs, with the newest pictures.
func (m *Map) place() {
	if m.lens.size.Width <= 0 || m.lens.size.Height <= 0 {
		return
	}
	m.watchScale()
	if m.ground == nil {
		return
	}
	r := m.lens.rect()
	keys := tiles.Keys(m.lens.level, r)
	m.front.show(m.painter, keys, m.lens)
	if m.front.complete {
		m.back.clear()
	} else {
		m.back.move(m.painter, m.lens)
	}
	if want := tiles.Keys(m.lens.level, r.Inset(-tiles.SidePx/2)); !sameKeys(want, m.wanted) {
		m.wanted = want
		// Those in view first, then a margin for the next step.
		m.painter.Want(append(keys, without(want, keys)...))
	}
	m.names.place(m.lens)
	m.badges.place(m.lens)
	if m.drawn.now != nil {
		m.showSketch()
	}
	if m.points.now != nil {
		m.showPoints()
	}
	m.furniture.place(m.lens)
	canvas.Refresh(m.backdrop) // objects that were only shown or hidden do not ask for a repaint
}

// watchScale follows the screen's scale, which changes when the window moves to another screen.
func (m *Map) watchScale() {
	scale := 1.0
	if c := fyne.CurrentApp().Driver().CanvasForObject(m); c != nil && c.Scale() > 0 {
		scale = float64(c.Scale())
	}
	if scale == m.lens.scale {
		return
	}
	mPerUnit := m.lens.mPerPx() * m.lens.scale
	m.lens.scale = scale
	m.lens.level = levelFor(mPerUnit / scale)
	m.ratio = scale
	m.front.clear()
	m.back.clear()
	if m.fit && m.ground != nil {
		m.lens = m.fitted().limited(m.ground.Extent())
	}
	m.dress()
}

// dress gives every object the colours of the look.
func (m *Map) dress() {
	m.painter.SetStyle(m.style())
	m.backdrop.FillColor = m.look.Outside
	m.names.dress(m.look)
	m.badges.set(m.ground, m.marks, m.look)
	m.furniture.dress(m.style())
	m.hover.dress(m.look)
	m.drawn.card.dress(m.look)
	m.points.beside.dress(m.look)
	m.box.StrokeColor, m.box.FillColor = m.look.Ink, faded(m.look.Ink, 30)
	for i, l := range m.cross {
		l.StrokeColor = m.look.Ink
		if i < 2 {
			l.StrokeColor, l.StrokeWidth = m.look.Casing, 4
		}
	}
	m.ring.StrokeColor = m.look.Ink
	canvas.Refresh(m.backdrop)
	m.arrange()
}

// arrange puts everything that lies on the glass where it belongs.
func (m *Map) arrange() {
	size := m.lens.size
	m.furniture.arrange(size)
	cx, cy := size.Width/2, size.Height/2
	for i, l := range m.cross {
		if i%2 == 0 {
			l.Position1, l.Position2 = fyne.NewPos(cx-9, cy), fyne.NewPos(cx+9, cy)
		} else {
			l.Position1, l.Position2 = fyne.NewPos(cx, cy-9), fyne.NewPos(cx, cy+9)
		}
	}
}

// MinSize leaves the window free to be small. From 500 by 400 units on, nothing on the glass overlaps.
func (m *Map) MinSize() fyne.Size {
	m.ExtendBaseWidget(m)
	return fyne.NewSize(240, 240)
}

// CreateRenderer is called by the toolkit.
func (m *Map) CreateRenderer() fyne.WidgetRenderer {
	m.ExtendBaseWidget(m)
	return &renderer{m: m, objects: []fyne.CanvasObject{m.clip}}
}

type renderer struct {
	m       *Map
	objects []fyne.CanvasObject
}

func (r *renderer) Destroy()                     {}
func (r *renderer) MinSize() fyne.Size           { return r.m.MinSize() }
func (r *renderer) Objects() []fyne.CanvasObject { return r.objects }

func (r *renderer) Layout(size fyne.Size) {
	m := r.m
	m.clip.Resize(size)
	m.backdrop.Resize(size)
	for _, o := range []fyne.CanvasObject{m.front.box, m.back.box, m.names.box, m.badges.box, m.drawn.box, m.points.box, m.furniture.box} {
		o.Resize(size)
	}
	m.ring.Move(fyne.NewPos(1, 1))
	m.ring.Resize(fyne.NewSize(size.Width-2, size.Height-2))
	m.lens.size = size
	m.arrange()
	if m.fit && m.ground != nil {
		m.lens = m.fitted().limited(m.ground.Extent())
		m.front.clear()
	}
	m.place()
}

// Refresh places the objects anew. It does not refresh the tiles: the toolkit would upload every picture
// again though none has changed.
func (r *renderer) Refresh() {
	r.m.place()
	canvas.Refresh(r.m.backdrop)
}
