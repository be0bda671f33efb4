package mapview

import (
	"fmt"
	"image/color"
	"math"
	"slices"
	"strconv"
	"strings"
	"time"

	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/canvas"
	"fyne.io/fyne/v2/container"
	"fyne.io/fyne/v2/theme"

	"groundtally/app/draw/tiles"
	"groundtally/geo"
)

// Points asks the user to move points about on the map, to add some and to take some away.
type Points struct {
	Words       string // what is asked for
	One         string // what a point is called, as turbine
	Start       []geo.LonLat
	Least, Most int     // of points; no limit for zero
	RingM       float64 // radius of the ring around the chosen point; zero for none
	UnitM       float64 // distances are told in this too; zero for metres alone
	Unit        string  // its name, as rotor diameters
	// Check gives for each point what is wrong with it in a line of words, "" for nothing. It is asked at every
	// change, many times in a drag, so it must be quick. Nil finds nothing wrong.
	Check func(at []geo.LonLat) []string
	// Done is told the points; nil when the user gave up. The map shows them no more then.
	Done func(at []geo.LonLat)
}

const (
	handleUnits   = 9  // radius of a point
	grabUnits     = 12 // so far from its middle a point is still meant
	stepsAcross   = 200
	fineStepM     = 1
	viewUnits     = 28   // a point that keys move stays so far from the map's edge
	mostRingUnits = 3000 // a wider ring has no edge in view that tells anything
)

// point is one of the points.
type point struct {
	at   geo.LonLat
	from *geo.LonLat // where it stood at the start; nil for a new one
}

// moving is what is known of points that are being moved.
type moving struct {
	Points
	at          []point
	wrong       []string // by point; none where Check is nil
	chosen      int      // -1 for none
	next        int      // that Tab goes to when none is chosen
	over        int      // under the pointer, or -1
	grabbed     bool     // the chosen one follows the pointer
	grab        fyne.Position
	placed      bool   // the last click placed a point, which is taken back when a second click follows at once
	refused     string // why the last thing asked for was not done
	doing       string // the last change; like ones are taken back together
	back, forth [][]point
}

// pointLayer shows them. Its objects are kept from one drawing to the next, since the toolkit paints the words of
// new ones anew.
type pointLayer struct {
	box    *fyne.Container
	rings  []*canvas.Circle // around the chosen one: the casing, and the ring over it
	marks  []*handle
	beside *card // what is told of one point
	now    *moving
}

// handle is how a point is shown.
type handle struct {
	paths []*canvas.Line // from where it stood: the casing, and the line over it
	outer *canvas.Circle
	disc  *canvas.Circle
	text  *canvas.Text
	now   dressed
}

// dressed is all that the look of a handle depends on, wherever it stands.
type dressed struct {
	look          tiles.Look
	number        int
	chosen, wrong bool
	size          float32
}

func newPointLayer(look tiles.Look) *pointLayer {
	l := &pointLayer{box: container.NewWithoutLayout(), beside: newCard(look)}
	for _, width := range []float32{4, 1.5} {
		c := canvas.NewCircle(nil)
		c.StrokeWidth = width
		l.rings = append(l.rings, c)
	}
	return l
}

// MovePoints lets the user move points, in place of what was being drawn or moved, which is given up.
func (m *Map) MovePoints(p Points) {
	m.GiveUp()
	if m.ground == nil {
		p.Done(nil)
		return
	}
	now := &moving{Points: p, chosen: -1, over: -1}
	for _, at := range p.Start {
		now.at = append(now.at, point{at, &at})
	}
	m.points.now = now
	m.setHover(-1)
	m.checkPoints()
	if c := fyne.CurrentApp().Driver().CanvasForObject(m); c != nil {
		c.Focus(m)
	}
}

// EndPoints ends the moving, with what was done or as if nothing had been.
func (m *Map) EndPoints(take bool) {
	if m.points.now == nil {
		return
	}
	if take {
		m.finishPoints()
		return
	}
	m.endPoints(false)
}

func (m *Map) endPoints(take bool) bool {
	p := m.points.now
	if p == nil {
		return false
	}
	var at []geo.LonLat
	if take {
		at = p.places()
	}
	// The click that ends it comes to DoubleTapped too, a moment later.
	m.points.now, m.drawn.ended = nil, time.Now()
	m.showCross(false)
	m.showPoints()
	p.Done(at)
	return true
}

// finishPoints ends the moving unless there are too few points.
func (m *Map) finishPoints() {
	p := m.points.now
	if len(p.at) < p.Least {
		p.refused = fmt.Sprintf("At least %d %s must stand. Esc leaves all as it was.", p.Least, p.One)
		m.showPoints()
		return
	}
	m.endPoints(true)
}

func (p *moving) places() []geo.LonLat {
	out := make([]geo.LonLat, len(p.at))
	for i, one := range p.at {
		out[i] = one.at
	}
	return out
}

// keep keeps the points as they are before a change, so that it can be taken back. Changes of one kind that follow
// each other are one.
func (p *moving) keep(doing string) {
	p.refused, p.placed = "", false
	if doing != "" && doing == p.doing {
		return
	}
	p.doing = doing
	p.back, p.forth = append(p.back, slices.Clone(p.at)), nil
}

// TakeBack takes the last change of points back; it tells whether points are being moved.
func (m *Map) TakeBack() bool {
	return m.swapPoints(func(p *moving) (from, to *[][]point) { return &p.back, &p.forth })
}

// BringBack brings back what TakeBack took; it tells whether points are being moved.
func (m *Map) BringBack() bool {
	return m.swapPoints(func(p *moving) (from, to *[][]point) { return &p.forth, &p.back })
}

func (m *Map) swapPoints(of func(*moving) (from, to *[][]point)) bool {
	p := m.points.now
	if p == nil {
		return false
	}
	from, to := of(p)
	if n := len(*from); n > 0 && !p.grabbed {
		*to = append(*to, p.at)
		p.at, *from = (*from)[n-1], (*from)[:n-1]
		p.doing, p.refused, p.placed, p.over = "", "", false, -1
		if p.chosen >= len(p.at) {
			p.chosen = -1
		}
		m.checkPoints()
	}
	return true
}

// checkPoints asks what is wrong with the points, after a change, and shows them.
func (m *Map) checkPoints() {
	if p := m.points.now; p.Check != nil {
		p.wrong = p.Check(p.places())
	}
	m.showPoints()
}

// pointAt gives the point at a position of the map, or -1. The chosen one lies over the others.
func (m *Map) pointAt(at fyne.Position) int {
	p := m.points.now
	if p == nil || m.ground == nil {
		return -1
	}
	best, least := -1, float64(grabUnits)
	for i, one := range p.at {
		q := m.screen(one.at)
		d := math.Hypot(float64(at.X-q.X), float64(at.Y-q.Y))
		if i == p.chosen && d <= grabUnits {
			return i
		}
		if d <= least {
			best, least = i, d
		}
	}
	return best
}

// grabPoint takes hold of the point at a position.
func (m *Map) grabPoint(at fyne.Position) {
	p := m.points.now
	p.grabbed = false
	if i := m.pointAt(at); i >= 0 && !m.furniture.covers(at) {
		// What was placed by the click before is known yet: a second one at once ends the moving.
		p.chosen, p.next, p.grabbed, p.grab = i, i, true, m.screen(p.at[i].at)
		m.showPoints()
	}
}

// dragPoint moves the point that was taken hold of; it tells whether one was.
func (m *Map) dragPoint(to fyne.Position) bool {
	p := m.points.now
	if p == nil || !p.grabbed || m.ground == nil {
		return false
	}
	doing := "drag " + strconv.Itoa(p.chosen)
	if p.doing != doing || !m.press.dragging {
		if !far(to, m.press.at) {
			return true // a click that was not quite still
		}
		p.doing = ""
		p.keep(doing)
	}
	m.press.dragging = true
	moved := p.grab.Add(to.Subtract(m.press.at))
	moved.X, moved.Y = min(max(moved.X, 0), m.lens.size.Width), min(max(moved.Y, 0), m.lens.size.Height)
	p.at[p.chosen].at = m.ground.Plane().From(m.lens.from(moved))
	m.checkPoints()
	return true
}

// dropPoint lets go of the point that was taken hold of.
func (m *Map) dropPoint() {
	if p := m.points.now; p != nil && p.grabbed {
		p.grabbed, p.doing = false, ""
		m.showPoints()
	}
}

// clickPoint chooses the point at a position, or places one there.
func (m *Map) clickPoint(at fyne.Position) {
	p := m.points.now
	if m.furniture.covers(at) || m.ground == nil {
		return
	}
	if i := m.pointAt(at); i >= 0 {
		p.placed = false
		m.choosePoint(i)
		return
	}
	m.addPoint(m.ground.Plane().From(m.lens.from(at)))
	p.placed = p.refused == ""
}

// clickAgain is the second click of a double click: it ends the moving, without the point that the first placed.
func (m *Map) clickAgain() {
	if p := m.points.now; p.placed {
		m.TakeBack()
		p.forth = nil
	}
	m.finishPoints()
}

func (m *Map) addPoint(at geo.LonLat) {
	p := m.points.now
	if p.Most > 0 && len(p.at) >= p.Most {
		p.refused = fmt.Sprintf("No more than %d can be placed.", p.Most)
		m.showPoints()
		return
	}
	p.keep("")
	p.at = append(p.at, point{at: at})
	p.chosen, p.next = len(p.at)-1, len(p.at)-1
	m.showCross(false)
	m.checkPoints()
}

func (m *Map) choosePoint(i int) {
	p := m.points.now
	p.chosen, p.next, p.refused, p.doing = i, i, "", ""
	m.showCross(false)
	m.reveal(i)
	m.showPoints()
}

// reveal brings a point into view.
func (m *Map) reveal(i int) {
	at := m.screen(m.points.now.at[i].at)
	miss := func(x, size float32) float64 {
		edge := min(viewUnits, size/4)
		return float64(min(max(x, edge), size-edge) - x)
	}
	if dx, dy := miss(at.X, m.lens.size.Width), miss(at.Y, m.lens.size.Height); dx != 0 || dy != 0 {
		m.pan(dx, dy)
	}
}

// pointsKey does what a key means while points are moved; it tells whether the key means something then.
func (m *Map) pointsKey(key fyne.KeyName) bool {
	p := m.points.now
	if p == nil || m.ground == nil && key != fyne.KeyEscape {
		return false
	}
	switch key {
	case fyne.KeyTab:
		n := len(p.at)
		switch {
		case n == 0:
		case p.chosen < 0 && !m.shift:
			m.choosePoint(min(p.next, n-1))
		case m.shift:
			m.choosePoint((max(p.chosen, min(p.next, n-1)) + n - 1) % n)
		default:
			m.choosePoint((p.chosen + 1) % n)
		}
	case fyne.KeyLeft:
		m.stepPoint(-1, 0)
	case fyne.KeyRight:
		m.stepPoint(1, 0)
	case fyne.KeyUp:
		m.stepPoint(0, 1)
	case fyne.KeyDown:
		m.stepPoint(0, -1)
	case fyne.KeySpace:
		if !m.keyed || p.chosen >= 0 { // the arrows move the cross now, and all see where the point would stand
			p.chosen = -1
			m.showCross(true)
			m.showPoints()
			return true
		}
		m.addPoint(m.ground.Plane().From(m.lens.from(m.middle())))
	case fyne.KeyDelete, fyne.KeyBackspace:
		if p.chosen < 0 {
			p.refused = "Choose the " + p.One + " that is taken away first, with Tab or a click."
			m.showPoints()
			return true
		}
		p.keep("")
		p.at = slices.Delete(slices.Clone(p.at), p.chosen, p.chosen+1) // a clone, as the old ones may come back
		// None is chosen now, so that the key, held too long, takes no other.
		p.next, p.chosen, p.over, p.grabbed = p.chosen, -1, -1, false
		m.checkPoints()
	case fyne.KeyReturn, fyne.KeyEnter:
		m.finishPoints()
	case fyne.KeyEscape:
		m.GiveUp()
	default:
		return false
	}
	return true
}

// stepPoint moves the chosen point by a step east and north; without one, the map under the cross.
func (m *Map) stepPoint(east, north float64) {
	p := m.points.now
	if p.chosen < 0 {
		units := float64(panUnits)
		if m.shift {
			units = finePanUnits
		}
		m.byKey(func() { m.pan(-east*units, north*units) })
		m.showPoints()
		return
	}
	step := float64(m.lens.size.Width) / stepsAcross * m.lens.mPerPx() * m.lens.scale
	if m.shift {
		step = fineStepM
	}
	p.keep("step " + strconv.Itoa(p.chosen))
	plane := m.ground.Plane()
	at := plane.To(p.at[p.chosen].at)
	p.at[p.chosen].at = plane.From(geo.XY{X: at.X + east*step, Y: at.Y + north*step})
	m.showCross(false)
	m.reveal(p.chosen)
	m.checkPoints()
}

// AcceptsTab tells the toolkit that Tab goes from point to point while points are moved.
func (m *Map) AcceptsTab() bool { return m.points.now != nil }

// hoverPoint shows what is told of the point under the pointer.
func (m *Map) hoverPoint(at fyne.Position) {
	p := m.points.now
	if i := m.pointAt(at); i != p.over {
		p.over = i
		m.showPoints()
	}
}

// leavePoint shows nothing for the pointer any more.
func (m *Map) leavePoint() {
	if p := m.points.now; p.over >= 0 {
		p.over = -1
		m.showPoints()
	}
}

// showPoints draws the points over the map, and tells of one beside it.
func (m *Map) showPoints() {
	l, p := m.points, m.points.now
	if p == nil || m.ground == nil {
		l.box.Objects, l.marks = nil, nil
		l.box.Refresh()
		l.beside.setLines("")
		m.drawn.card.setLines("")
		return
	}
	if len(l.marks) != len(p.at) {
		for len(l.marks) < len(p.at) {
			l.marks = append(l.marks, newHandle())
		}
		l.marks = l.marks[:len(p.at)]
		l.box.Objects = nil
		for _, r := range l.rings {
			l.box.Objects = append(l.box.Objects, r)
		}
		for _, h := range l.marks {
			l.box.Objects = append(l.box.Objects, h.paths[0], h.paths[1])
		}
		for _, h := range l.marks {
			l.box.Objects = append(l.box.Objects, h.outer, h.disc, h.text)
		}
	}
	wrong, size := 0, theme.Size(theme.SizeNameCaptionText)
	for i, one := range p.at {
		bad := i < len(p.wrong) && p.wrong[i] != ""
		if bad {
			wrong++
		}
		h := l.marks[i]
		h.show(m.screen(one.at), dressed{m.look, i + 1, i == p.chosen, bad, size})
		for _, line := range h.paths {
			if line.Hidden = one.from == nil || *one.from == one.at; !line.Hidden {
				line.Position1, line.Position2 = m.screen(*one.from), m.screen(one.at)
			}
		}
	}
	for i, ring := range l.rings {
		ring.Hidden = true
		if r := float32(p.RingM / (m.lens.mPerPx() * m.lens.scale)); p.chosen >= 0 && r > 0 && r < mostRingUnits {
			ring.Hidden, ring.StrokeColor = false, []color.Color{m.look.Casing, m.look.Ink}[i]
			r += ring.StrokeWidth / 2 // strokes lie inside
			ring.Resize(fyne.NewSize(2*r, 2*r))
			ring.Move(m.screen(p.at[p.chosen].at).SubtractXY(r, r))
		}
	}
	canvas.Refresh(m.backdrop) // refreshing the box would paint the words of all anew

	words := []string{p.Words,
		"Drag to move; a click beside all adds one. Tab: the next; arrows move it,",
		"with Shift by 1 m; Delete takes it away. Space, twice: one more, at the cross.",
		"Enter or a double click ends it. Esc leaves all as it was."}
	if wrong > 0 {
		words = append(words, fmt.Sprintf("%d of %d with something wrong, ringed twice.", wrong, len(p.at)))
	}
	if p.refused != "" {
		words = append(words, p.refused)
	}
	m.drawn.card.setLines(strings.Join(words, "\n"))
	m.placeAsk()
	told := p.over
	if told < 0 || p.grabbed {
		told = p.chosen
	}
	if told < 0 || told >= len(p.at) {
		l.beside.setLines("")
		return
	}
	l.beside.setLines(p.told(m.ground.Plane(), told))
	m.placeBeside(told)
}

// placeBeside puts the card that tells of a point where it hides the fewest of the others, and not what is asked for.
func (m *Map) placeBeside(told int) {
	c, p := m.points.beside, m.points.now
	at, away := m.screen(p.at[told].at), float32(handleUnits+8)
	left, right := at.X-away-c.size.Width, at.X+away
	above, beside, below := at.Y-away-c.size.Height, at.Y-c.size.Height/2, at.Y+away
	ask := m.drawn.card
	best, least := fyne.Position{}, math.MaxInt
	for _, corner := range []fyne.Position{{X: right, Y: below}, {X: left, Y: below}, {X: right, Y: above}, {X: left, Y: above}, {X: left, Y: beside}, {X: right, Y: beside}} {
		corner.X = max(4, min(corner.X, m.lens.size.Width-c.size.Width-4))
		corner.Y = max(4, min(corner.Y, m.lens.size.Height-c.size.Height-4))
		hides := 0
		for i, one := range p.at {
			q := m.screen(one.at)
			if q.X > corner.X-away && q.X < corner.X+c.size.Width+away && q.Y > corner.Y-away && q.Y < corner.Y+c.size.Height+away {
				if hides++; i == told {
					hides += len(p.at)
				}
			}
		}
		if a, s := ask.box.Position(), ask.size; corner.X < a.X+s.Width && a.X < corner.X+c.size.Width && corner.Y < a.Y+s.Height && a.Y < corner.Y+c.size.Height {
			hides += len(p.at)
		}
		if hides < least {
			best, least = corner, hides
		}
	}
	c.box.Move(best)
	canvas.Refresh(c.sheet)
}

// told gives the words for one point: its number, how near the next one is, what is wrong.
func (p *moving) told(plane tiles.Plane, i int) string {
	words := []string{strings.ToUpper(p.One[:1]) + p.One[1:] + " " + strconv.Itoa(i+1)}
	here, nearest, least := plane.To(p.at[i].at), -1, math.Inf(1)
	for j, other := range p.at {
		if d := here.Dist(plane.To(other.at)); j != i && d < least {
			nearest, least = j, d
		}
	}
	if nearest >= 0 {
		far := lengthWords(least)
		if p.UnitM > 0 {
			far = fmt.Sprintf("%.1f %s, %s,", least/p.UnitM, p.Unit, far)
		}
		words = append(words, fmt.Sprintf("%s to the nearest, %s %d", far, p.One, nearest+1))
	}
	if i < len(p.wrong) && p.wrong[i] != "" {
		words = append(words, p.wrong[i])
	}
	return strings.Join(words, "\n")
}

func newHandle() *handle {
	h := &handle{paths: []*canvas.Line{canvas.NewLine(nil), canvas.NewLine(nil)}, outer: canvas.NewCircle(nil), disc: canvas.NewCircle(nil), text: canvas.NewText("", nil)}
	h.text.TextStyle.Bold, h.text.Alignment = true, fyne.TextAlignCenter
	h.disc.Resize(fyne.NewSize(2*handleUnits, 2*handleUnits))
	h.outer.Resize(fyne.NewSize(2*handleUnits+8, 2*handleUnits+8))
	return h
}

// show puts the handle where its point is: full when it is chosen, ringed twice when something is wrong with it, so
// that colour alone tells neither.
func (h *handle) show(at fyne.Position, d dressed) {
	if d != h.now {
		h.dress(d)
	}
	h.disc.Move(at.SubtractXY(handleUnits, handleUnits))
	h.outer.Move(at.SubtractXY(handleUnits+4, handleUnits+4))
	s := h.text.Size()
	h.text.Move(at.SubtractXY(s.Width/2, s.Height/2))
}

func (h *handle) dress(d dressed) {
	h.now = d
	fill, ink := d.look.Paper, d.look.Ink
	if d.chosen {
		fill, ink = ink, fill
	}
	h.paths[0].StrokeColor, h.paths[0].StrokeWidth = d.look.Casing, 3.5
	h.paths[1].StrokeColor, h.paths[1].StrokeWidth = d.look.Ink, 1
	h.disc.FillColor, h.disc.StrokeColor, h.disc.StrokeWidth = fill, d.look.Ink, 2
	h.outer.FillColor, h.outer.StrokeColor, h.outer.StrokeWidth = faded(d.look.Casing, 150), d.look.Casing, 2
	if d.wrong {
		h.disc.StrokeColor, h.outer.StrokeColor, h.outer.StrokeWidth = d.look.Warm, d.look.Warm, 2.5
	}
	h.text.Text, h.text.Color, h.text.TextSize = strconv.Itoa(d.number), ink, d.size
	h.text.Resize(h.text.MinSize())
	for _, o := range []fyne.CanvasObject{h.paths[0], h.paths[1], h.disc, h.outer, h.text} {
		canvas.Refresh(o)
	}
}
