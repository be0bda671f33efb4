package mapview

import (
	"math"
	"time"

	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/canvas"
	"fyne.io/fyne/v2/driver/desktop"

	"groundtally/app/draw/tiles"
	"groundtally/geo"
)

const (
	levelsPerKey    = 2    // half an octave
	unitsPerLevel   = 12.5 // of the wheel; a notch is two levels
	panUnits        = 80   // per arrow key
	clickSlackUnits = 4    // a click may move so far
)

// zoom changes the level and keeps the place at a position where it is.
func (m *Map) zoom(levels int, keep fyne.Position) {
	if m.ground == nil || levels == 0 {
		return
	}
	l := m.lens
	l.level += levels
	// Limited first, or the place would slide when there is no closer level.
	l.level = l.limited(m.ground.Extent()).level
	if l.level == m.lens.level {
		return
	}
	m.fit = false
	m.setLens(m.lens.zoomed(l.level, keep))
}

func (m *Map) pan(dx, dy float64) {
	if m.ground == nil {
		return
	}
	l := m.lens
	px := l.mPerPx() * l.scale
	l.centre.X -= dx * px
	l.centre.Y += dy * px
	m.fit = false
	m.setLens(l)
}

func (m *Map) middle() fyne.Position {
	return fyne.NewPos(m.lens.size.Width/2, m.lens.size.Height/2)
}

// Scrolled zooms at the pointer.
func (m *Map) Scrolled(e *fyne.ScrollEvent) {
	m.wheelUnits += e.Scrolled.DY
	levels := int(m.wheelUnits / unitsPerLevel)
	m.wheelUnits -= float32(levels) * unitsPerLevel
	m.zoom(-levels, e.Position)
}

// MouseDown starts a click, a drag, or a box.
func (m *Map) MouseDown(e *desktop.MouseEvent) {
	if e.Button != desktop.MouseButtonPrimary {
		return
	}
	m.press.at, m.press.dragging, m.press.handled = e.Position, false, false
	m.press.box = e.Modifier&fyne.KeyModifierShift != 0 && !m.Sketching()
	m.showCross(false)
	if m.points.now != nil {
		m.grabPoint(e.Position)
	}
	if c := fyne.CurrentApp().Driver().CanvasForObject(m); c != nil && c.Focused() != fyne.Focusable(m) {
		c.Focus(m)
	}
}

// MouseUp ends a click. The toolkit's Tapped would come only after it has waited for a second click.
func (m *Map) MouseUp(e *desktop.MouseEvent) {
	if e.Button != desktop.MouseButtonPrimary {
		return
	}
	if !m.press.dragging {
		m.dropPoint()
	}
	if m.press.dragging || far(e.Position, m.press.at) {
		return
	}
	again := time.Since(m.press.last) < fyne.CurrentApp().Driver().DoubleTapDelay() && !far(e.Position, m.press.lastAt)
	m.press.handled, m.press.last, m.press.lastAt = true, time.Now(), e.Position
	switch {
	case !again:
		m.click(e.Position, adds(e.Modifier))
	case m.drawn.now != nil:
		m.finishSketch()
	case m.points.now != nil:
		m.clickAgain()
	}
}

func far(a, b fyne.Position) bool {
	return math.Abs(float64(a.X-b.X)) > clickSlackUnits || math.Abs(float64(a.Y-b.Y)) > clickSlackUnits
}

func adds(k fyne.KeyModifier) bool {
	return k&(fyne.KeyModifierShift|fyne.KeyModifierControl|fyne.KeyModifierSuper) != 0
}

// Tapped selects when the click did not come from a mouse.
func (m *Map) Tapped(e *fyne.PointEvent) {
	if m.press.handled {
		m.press.handled = false
		return
	}
	if time.Since(m.press.last) < 3*fyne.CurrentApp().Driver().DoubleTapDelay() && !far(e.Position, m.press.lastAt) {
		return // the toolkit's word on a click that was told already, late
	}
	var held fyne.KeyModifier
	if d, ok := fyne.CurrentApp().Driver().(desktop.Driver); ok {
		held = d.CurrentKeyModifiers()
	}
	m.click(e.Position, adds(held))
}

func (m *Map) click(at fyne.Position, add bool) {
	if m.drawn.now != nil {
		m.setPoint(at)
		return
	}
	if m.points.now != nil {
		m.clickPoint(at)
		return
	}
	if m.ground == nil || m.OnSelect == nil || m.furniture.covers(at) {
		return
	}
	id := m.parcelAt(at)
	if id == "" && add {
		return // a slip while adding must not lose what was selected
	}
	m.OnSelect(id, add)
}

func (m *Map) parcelAt(at fyne.Position) string {
	if m.ground == nil {
		return ""
	}
	n, ok := m.ground.Hit(m.lens.from(at))
	if !ok {
		return ""
	}
	return m.ground.ID(n)
}

// DoubleTapped shows the district whole.
func (m *Map) DoubleTapped(*fyne.PointEvent) {
	// The click that ends a line comes here too, a moment later.
	if !m.Sketching() && time.Since(m.drawn.ended) > 3*fyne.CurrentApp().Driver().DoubleTapDelay() {
		m.FitAll()
	}
}

// TappedSecondary tells of a click with the other button.
func (m *Map) TappedSecondary(e *fyne.PointEvent) {
	if m.ground != nil && m.OnSecondary != nil {
		m.OnSecondary(m.ground.Plane().From(m.lens.from(e.Position)), m.parcelAt(e.Position), e.AbsolutePosition)
	}
}

// Dragged pans, draws the box, or moves a point.
func (m *Map) Dragged(e *fyne.DragEvent) {
	if m.dragPoint(e.Position) {
		return
	}
	m.press.dragging = true
	m.setHover(-1)
	if !m.press.box {
		m.pan(float64(e.Dragged.DX), float64(e.Dragged.DY))
		return
	}
	a, b := m.press.at, e.Position
	m.box.Move(fyne.NewPos(min(a.X, b.X), min(a.Y, b.Y)))
	m.box.Resize(fyne.NewSize(max(a.X, b.X)-min(a.X, b.X), max(a.Y, b.Y)-min(a.Y, b.Y)))
	m.box.Show()
	m.box.Refresh()
}

// DragEnd ends the drag or the box.
func (m *Map) DragEnd() {
	boxed := m.press.box && m.press.dragging && m.box.Visible()
	m.press.dragging, m.press.box = false, false
	m.dropPoint()
	m.box.Hide()
	if !boxed || m.ground == nil || m.OnBox == nil {
		return
	}
	p := m.box.Position()
	a, b := m.lens.from(p), m.lens.from(p.AddXY(m.box.Size().Width, m.box.Size().Height))
	var ids []string
	for _, n := range m.ground.Within(geo.Extent{MinX: a.X, MaxX: b.X, MinY: b.Y, MaxY: a.Y}) {
		ids = append(ids, m.ground.ID(n))
	}
	m.OnBox(ids)
}

// MouseIn shows the place under the pointer and the parcel's words.
func (m *Map) MouseIn(e *desktop.MouseEvent) { m.MouseMoved(e) }

// MouseMoved follows the pointer.
func (m *Map) MouseMoved(e *desktop.MouseEvent) {
	m.pointed = true
	m.showCross(false)
	m.point(e.Position)
}

// MouseOut hides what was shown for the pointer.
func (m *Map) MouseOut() {
	m.pointed = false
	if m.drawn.now != nil {
		m.showSketch()
	}
	if m.points.now != nil {
		m.leavePoint()
	}
	m.setHover(-1)
	m.furniture.setPlace("")
	m.furniture.arrange(m.lens.size)
}

// point shows what lies at a position.
func (m *Map) point(at fyne.Position) {
	m.pointer = at
	if m.ground == nil {
		return
	}
	xy := m.lens.from(at)
	if m.furniture.setPlace(placeWords(m.ground.Plane().From(xy), m.lens.mPerPx()*m.lens.scale)) {
		m.furniture.arrange(m.lens.size)
	}
	n, ok := m.ground.Hit(xy)
	if m.drawn.now != nil {
		m.showSketch()
	}
	if m.points.now != nil {
		m.hoverPoint(at)
	}
	if !ok || m.press.dragging || m.Sketching() || m.furniture.covers(at) {
		n = -1
	}
	m.setHover(n)
}

// setHover shows the words of a parcel beside the pointer; none with -1.
func (m *Map) setHover(parcel int) {
	if parcel != m.hoverOver {
		m.hoverOver = parcel
		words := ""
		if parcel >= 0 && m.OnHover != nil {
			words = m.OnHover(m.ground.ID(parcel))
		}
		m.hover.setLines(words)
	}
	if m.hover.box.Visible() {
		m.hover.beside(m.pointer, m.lens.size)
	}
}

// FocusGained shows the ring.
func (m *Map) FocusGained() {
	m.ring.Show()
	canvas.Refresh(m.ring)
}

// FocusLost hides the ring and the cross.
func (m *Map) FocusLost() {
	m.shift, m.control = false, false
	m.ring.Hide()
	m.showCross(false)
	canvas.Refresh(m.backdrop)
}

// showCross shows the cross in the middle, which Enter chooses by.
func (m *Map) showCross(on bool) {
	if on == m.keyed {
		return
	}
	m.keyed = on
	for _, l := range m.cross {
		if on {
			l.Show()
		} else {
			l.Hide()
		}
		canvas.Refresh(l)
	}
}

// KeyDown notes the keys that add to a selection.
func (m *Map) KeyDown(e *fyne.KeyEvent) { m.held(e.Name, true) }

// KeyUp notes that they are released.
func (m *Map) KeyUp(e *fyne.KeyEvent) { m.held(e.Name, false) }

func (m *Map) held(key fyne.KeyName, down bool) {
	switch key {
	case desktop.KeyShiftLeft, desktop.KeyShiftRight:
		m.shift = down
	case desktop.KeyControlLeft, desktop.KeyControlRight:
		m.control = down
	}
}

// TypedRune zooms with + and −, and fits with 0.
func (m *Map) TypedRune(r rune) {
	switch r {
	case '+', '=':
		m.byKey(func() { m.zoom(-levelsPerKey, m.middle()) })
	case '-', '−', '_':
		m.byKey(func() { m.zoom(levelsPerKey, m.middle()) })
	case '0':
		m.byKey(m.FitAll)
	}
}

// TypedKey pans with the arrows, fits with Home, chooses with Enter, lets go with Escape.
func (m *Map) TypedKey(e *fyne.KeyEvent) {
	if m.sketchKey(e.Name) || m.pointsKey(e.Name) {
		return
	}
	switch e.Name {
	case fyne.KeyLeft:
		m.byKey(func() { m.pan(panUnits, 0) })
	case fyne.KeyRight:
		m.byKey(func() { m.pan(-panUnits, 0) })
	case fyne.KeyUp:
		m.byKey(func() { m.pan(0, panUnits) })
	case fyne.KeyDown:
		m.byKey(func() { m.pan(0, -panUnits) })
	case fyne.KeyPageUp:
		m.byKey(func() { m.zoom(-levelsPerKey, m.middle()) })
	case fyne.KeyPageDown:
		m.byKey(func() { m.zoom(levelsPerKey, m.middle()) })
	case fyne.KeyHome:
		m.byKey(m.FitAll)
	case fyne.KeyReturn, fyne.KeyEnter:
		if !m.keyed {
			// Without the cross nobody can know which parcel it would be.
			m.showCross(true)
			return
		}
		m.click(m.middle(), m.shift || m.control)
	case fyne.KeyEscape:
		m.showCross(false)
		if m.OnSelect != nil {
			m.OnSelect("", false)
		}
	}
}

func (m *Map) byKey(move func()) {
	m.showCross(true)
	move()
	if m.ground != nil && m.furniture.setPlace(placeWords(m.ground.Plane().From(m.lens.centre), m.lens.mPerPx()*m.lens.scale)) {
		m.furniture.arrange(m.lens.size)
	}
}

// markPlace gives the place of a candidate's letter.
func markPlace(g *tiles.Ground, mark tiles.Mark) (geo.XY, bool) {
	for _, id := range mark.Parcels {
		if n, ok := g.Number(id); ok {
			if at, ok := g.Anchor(n); ok {
				return at, true
			}
		}
	}
	if len(mark.Turbines) > 0 {
		return g.Plane().To(mark.Turbines[0]), true
	}
	return geo.XY{}, false
}
