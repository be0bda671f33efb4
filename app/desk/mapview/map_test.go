package mapview

import (
	"context"
	"fmt"
	"image"
	"image/color"
	"math"
	"slices"
	"testing"
	"time"

	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/canvas"
	"fyne.io/fyne/v2/container"
	"fyne.io/fyne/v2/driver/desktop"
	"fyne.io/fyne/v2/test"
	"fyne.io/fyne/v2/widget"

	"groundtally/app/draw/tiles"
	"groundtally/geo"
)

const sideM = 200.0 // of the test's parcels

var teal = color.NRGBA{R: 47, G: 125, B: 119, A: 255}

// table is a window with a map of square parcels, and what the map told.
type table struct {
	t        testing.TB
	m        *Map
	w        fyne.Window
	ground   *tiles.Ground
	queue    chan func()
	selected []string
	boxes    [][]string
}

func squares(t testing.TB, across int, extra ...tiles.Layer) *tiles.Ground {
	t.Helper()
	plane := tiles.NewPlane(geo.LonLat{Lon: -27, Lat: 47.5})
	l := tiles.Layer{Role: "parcels"}
	for i := range across * across {
		x, y := float64(i%across-across/2)*sideM, float64(i/across-across/2)*sideM
		var ring []geo.LonLat
		for _, d := range [][2]float64{{0, 0}, {1, 0}, {1, 1}, {0, 1}, {0, 0}} {
			ring = append(ring, plane.From(geo.XY{X: x + d[0]*sideM, Y: y + d[1]*sideM}))
		}
		l.Features = append(l.Features, tiles.Feature{ID: fmt.Sprintf("P%d", i), Geometry: geo.LonLatGeometry{Kind: geo.Polygons, Parts: [][][]geo.LonLat{{ring}}}})
	}
	g, err := tiles.NewGround(context.Background(), append([]tiles.Layer{l}, extra...))
	if err != nil {
		t.Fatal(err)
	}
	return g
}

func lay(t testing.TB, g *tiles.Ground, width, height float32) *table {
	t.Helper()
	test.NewTempApp(t)
	b := &table{t: t, ground: g, queue: make(chan func(), 10_000)}
	b.m = New(Options{Workers: 2, Do: func(f func()) { b.queue <- f }})
	t.Cleanup(b.m.Close)
	b.m.OnSelect = func(id string, add bool) {
		if add {
			id += " added"
		}
		b.selected = append(b.selected, id)
	}
	b.m.OnBox = func(ids []string) { b.boxes = append(b.boxes, ids) }
	b.w = test.NewTempWindow(t, b.m)
	b.w.SetPadded(false)
	b.w.Resize(fyne.NewSize(width, height))
	b.m.SetGround(g)
	b.m.SetShading(tiles.Shading{Class: make([]uint8, g.Parcels()), Colours: []color.NRGBA{teal}})
	return b
}

// settle does what the workers asked for until everything in view is drawn.
func (b *table) settle() {
	b.t.Helper()
	for range 20_000 {
		for len(b.queue) > 0 {
			(<-b.queue)()
		}
		if b.m.Settled() {
			return
		}
		time.Sleep(time.Millisecond)
	}
	b.t.Fatal("the map was never drawn")
}

// at gives where the middle of a parcel is in the widget.
func (b *table) at(parcel string) fyne.Position {
	n, ok := b.ground.Number(parcel)
	if !ok {
		b.t.Fatalf("no parcel %s", parcel)
	}
	return b.m.lens.to(b.ground.ParcelExtent(n).Centre())
}

// scroll turns the wheel at a position, which the toolkit's own test call does not tell.
func (b *table) scroll(at fyne.Position, dy float32) {
	b.m.Scrolled(&fyne.ScrollEvent{PointEvent: fyne.PointEvent{Position: at}, Scrolled: fyne.NewDelta(0, dy)})
}

func (b *table) click(at fyne.Position, held fyne.KeyModifier) {
	e := &desktop.MouseEvent{PointEvent: fyne.PointEvent{Position: at}, Button: desktop.MouseButtonPrimary, Modifier: held}
	b.m.MouseDown(e)
	b.m.MouseUp(e)
	b.m.Tapped(&e.PointEvent) // the toolkit sends it too, later
	b.m.press.last = time.Time{}
}

func TestClickSelects(t *testing.T) {
	b := lay(t, squares(t, 10), 600, 500)
	b.click(b.at("P34"), 0)
	b.click(b.at("P35"), fyne.KeyModifierShift)
	b.click(b.at("P36"), fyne.KeyModifierControl)
	b.click(fyne.NewPos(300, 3), fyne.KeyModifierShift) // beside all parcels, by a slip
	b.click(fyne.NewPos(300, 3), 0)
	test.TapCanvas(b.w.Canvas(), b.at("P37")) // without a mouse
	if want := []string{"P34", "P35 added", "P36 added", "", "P37"}; !slices.Equal(b.selected, want) {
		t.Errorf("told %q, want %q", b.selected, want)
	}
	if b.w.Canvas().Focused() != fyne.Focusable(b.m) {
		t.Error("a click does not focus the map")
	}
}

func TestSecondClickOfTwoDoesNotSelectAgain(t *testing.T) {
	b := lay(t, squares(t, 10), 600, 500)
	e := &desktop.MouseEvent{PointEvent: fyne.PointEvent{Position: b.at("P34")}, Button: desktop.MouseButtonPrimary}
	for range 2 {
		b.m.MouseDown(e)
		b.m.MouseUp(e)
	}
	if len(b.selected) != 1 {
		t.Errorf("told %q", b.selected)
	}
	b.m.zoom(-8, e.Position)
	if b.m.fit {
		t.Fatal("still fitted after zooming")
	}
	test.DoubleTap(b.m)
	if r := b.m.lens.rect(); !b.m.fit || float64(r.Dx())*b.m.lens.mPerPx() < 10*sideM {
		t.Error("a double click does not show the district whole")
	}
}

func TestSecondaryTellsThePlace(t *testing.T) {
	b := lay(t, squares(t, 10), 600, 500)
	var id string
	var at geo.LonLat
	b.m.OnSecondary = func(where geo.LonLat, parcel string, _ fyne.Position) { at, id = where, parcel }
	test.TapSecondaryAt(b.m, b.at("P12"))
	n, _ := b.ground.Number("P12")
	if id != "P12" || b.ground.Plane().To(at).Dist(b.ground.ParcelExtent(n).Centre()) > 2*b.m.lens.mPerPx() {
		t.Errorf("told %q at %v", id, at)
	}
}

func TestBoxGivesParcels(t *testing.T) {
	b := lay(t, squares(t, 10), 600, 500)
	before := b.m.lens
	from, to := b.at("P11"), b.at("P33")
	down := &desktop.MouseEvent{PointEvent: fyne.PointEvent{Position: from}, Button: desktop.MouseButtonPrimary, Modifier: fyne.KeyModifierShift}
	b.m.MouseDown(down)
	b.m.Dragged(&fyne.DragEvent{PointEvent: fyne.PointEvent{Position: to}, Dragged: fyne.NewDelta(to.X-from.X, to.Y-from.Y)})
	if !b.m.box.Visible() {
		t.Error("the box is not shown while it is drawn")
	}
	up := &desktop.MouseEvent{PointEvent: fyne.PointEvent{Position: to}, Button: desktop.MouseButtonPrimary, Modifier: fyne.KeyModifierShift}
	b.m.MouseUp(up)
	b.m.DragEnd()
	if len(b.boxes) != 1 || !slices.Equal(b.boxes[0], []string{"P22"}) {
		t.Errorf("told %q, want the one parcel wholly inside", b.boxes)
	}
	if b.m.box.Visible() || b.m.lens != before || len(b.selected) != 0 {
		t.Error("after the box something else has changed")
	}
}

func TestWheelKeepsThePlaceUnderThePointer(t *testing.T) {
	b := lay(t, squares(t, 40), 640, 480)
	for _, at := range []fyne.Position{{X: 150, Y: 90}, {X: 450, Y: 300}, {X: 320, Y: 240}} {
		b.m.FitAll()
		for _, dy := range []float32{25, 25, 12.5, 100, -25, -50, 6, 7} {
			before, level := b.m.lens.from(at), b.m.lens.level
			b.scroll(at, dy)
			if now := b.m.lens.from(at); now.Dist(before) > 1.1*b.m.lens.mPerPx() {
				t.Fatalf("wheel by %v: the place under the pointer moved %.2f pixels", dy, now.Dist(before)/b.m.lens.mPerPx())
			}
			if math.Abs(float64(dy)) > 12 && (b.m.lens.level < level) != (dy > 0) {
				t.Fatalf("wheel by %v: level %d becomes %d", dy, level, b.m.lens.level)
			}
		}
	}
	level := b.m.lens.level
	b.scroll(fyne.NewPos(9, 9), 1e6)
	b.scroll(fyne.NewPos(9, 9), -1e7)
	if b.m.lens.level <= level || b.m.lens.level > tiles.MaxLevel {
		t.Errorf("level %d after zooming out for ever", b.m.lens.level)
	}
}

func TestDragPans(t *testing.T) {
	b := lay(t, squares(t, 10), 600, 500)
	b.settle()
	b.m.zoom(-4, b.m.middle())
	b.settle()
	before := b.at("P44")
	picture := b.m.front.tiles[0]
	corner := picture.image.Position()
	shown := picture.image.Image
	test.Drag(b.w.Canvas(), fyne.NewPos(200, 200), 37, -21)
	if after := b.at("P44"); math.Abs(float64(after.X-before.X-37)) > 1 || math.Abs(float64(after.Y-before.Y+21)) > 1 {
		t.Errorf("the ground moved from %v to %v", before, after)
	}
	if d := picture.image.Position().Subtract(corner); d != fyne.NewPos(37, -21) || picture.image.Image != shown {
		t.Errorf("the tile's object was not simply moved, but by %v", d)
	}
	if len(b.selected) != 0 {
		t.Error("a drag selects")
	}
	for range 100 {
		test.Drag(b.w.Canvas(), fyne.NewPos(200, 200), 500, 0)
	}
	if at := b.m.lens.to(b.ground.Extent().Centre()); b.m.lens.to(geo.XY{X: b.ground.Extent().MinX}).X > 600-stripUnits+1 || at.X < 300 {
		t.Error("the district can be dragged out of sight")
	}
}

func TestKeyboard(t *testing.T) {
	b := lay(t, squares(t, 10), 600, 500)
	c := b.w.Canvas()
	c.FocusNext()
	if c.Focused() != fyne.Focusable(b.m) || !b.m.ring.Visible() {
		t.Fatal("the map cannot be reached by Tab, or shows no ring")
	}
	if b.m.cross[0].Visible() {
		t.Error("the cross is shown before a key was used")
	}
	key := func(name fyne.KeyName) { b.m.TypedKey(&fyne.KeyEvent{Name: name}) }
	start := b.m.lens
	key(fyne.KeyRight)
	key(fyne.KeyDown)
	if d := b.m.lens.centre.Sub(start.centre); d.X <= 0 || d.Y >= 0 {
		t.Errorf("right and down move by %v", d)
	}
	if !b.m.cross[0].Visible() || b.m.furniture.where.Text == "" {
		t.Error("no cross, or no place, after a key")
	}
	test.Type(b.m, "++-")
	if b.m.lens.level != start.level-levelsPerKey {
		t.Errorf("level %d after ++-, from %d", b.m.lens.level, start.level)
	}
	key(fyne.KeyReturn)
	want, _ := b.ground.Hit(b.m.lens.from(b.m.middle()))
	b.m.KeyDown(&fyne.KeyEvent{Name: desktop.KeyShiftLeft})
	key(fyne.KeyEnter)
	b.m.KeyUp(&fyne.KeyEvent{Name: desktop.KeyShiftLeft})
	key(fyne.KeyEscape)
	id := b.ground.ID(want)
	if !slices.Equal(b.selected, []string{id, id + " added", ""}) {
		t.Errorf("told %q, want %s, the same added, nothing", b.selected, id)
	}
	test.Type(b.m, "0")
	if b.m.lens != start {
		t.Error("0 does not fit")
	}
	key(fyne.KeyUp)
	key(fyne.KeyHome)
	if b.m.lens != start {
		t.Error("Home does not fit")
	}
	c.FocusNext()
	if _, ok := c.Focused().(*widget.Button); !ok || b.m.ring.Visible() || b.m.cross[0].Visible() {
		t.Errorf("after Tab %T is focused", c.Focused())
	}
	c.Focused().TypedKey(&fyne.KeyEvent{Name: fyne.KeySpace})
	if b.m.lens.level != start.level-levelsPerKey {
		t.Error("the button does not zoom")
	}
}

func TestHoverShowsWordsAndPlace(t *testing.T) {
	b := lay(t, squares(t, 10), 600, 500)
	asked := 0
	b.m.OnHover = func(id string) string { asked++; return "Parcel " + id + "\nscore 0.5" }
	at := b.at("P77")
	test.MoveMouse(b.w.Canvas(), at)
	test.MoveMouse(b.w.Canvas(), at.AddXY(1, 1))
	if asked != 1 || !b.m.hover.box.Visible() || b.m.hover.lines[0].Text != "Parcel P77" || b.m.hover.lines[1].Text != "score 0.5" {
		t.Errorf("asked %d times, words %q", asked, b.m.hover.lines[0].Text)
	}
	p := b.ground.Plane().From(b.m.lens.from(at.AddXY(1, 1)))
	if want := fmt.Sprintf("%.4f N %.4f W", p.Lat, -p.Lon); b.m.furniture.where.Text != want {
		t.Errorf("place %q, want %q", b.m.furniture.where.Text, want)
	}
	test.MoveMouse(b.w.Canvas(), fyne.NewPos(300, 3))
	if b.m.hover.box.Visible() {
		t.Error("words beside all parcels")
	}
	b.m.MouseOut()
	if b.m.furniture.where.Text != "" {
		t.Error("a place without a pointer")
	}
}

func TestHoverStaysInside(t *testing.T) {
	c := newCard(tiles.LightLook())
	c.setLines("Parcel M-0001, a long name\nscore 0.50 of 1")
	for _, at := range []fyne.Position{{X: 0, Y: 0}, {X: 499, Y: 0}, {X: 499, Y: 399}, {X: 0, Y: 399}, {X: 250, Y: 200}} {
		c.beside(at, fyne.NewSize(500, 400))
		p, s := c.box.Position(), c.size
		if p.X < 0 || p.Y < 0 || p.X+s.Width > 500 || p.Y+s.Height > 400 {
			t.Errorf("pointer at %v: the card at %v, %v leaves the map", at, p, s)
		}
		if at.X >= p.X && at.X <= p.X+s.Width && at.Y >= p.Y && at.Y <= p.Y+s.Height {
			t.Errorf("pointer at %v lies under its card", at)
		}
	}
}

// shot gives the window's picture.
func (b *table) shot() image.Image { return b.w.Canvas().Capture() }

func pixel(img image.Image, x, y int) color.NRGBA {
	return color.NRGBAModel.Convert(img.At(x, y)).(color.NRGBA)
}

func TestPicture(t *testing.T) {
	b := lay(t, squares(t, 10), 600, 500)
	b.settle()
	at := b.at("P44")
	if got := pixel(b.shot(), int(at.X), int(at.Y)); got != teal {
		t.Errorf("the middle of a parcel is %v, want %v", got, teal)
	}
	warm := color.NRGBA{R: 200, G: 1, B: 2, A: 255}
	drawn := b.m.Counts().Drawn
	b.m.SetShading(tiles.Shading{Class: make([]uint8, 100), Colours: []color.NRGBA{warm}})
	b.settle()
	if got := pixel(b.shot(), int(at.X), int(at.Y)); got != warm {
		t.Errorf("after new colours it is %v", got)
	}
	if b.m.Counts().Drawn != drawn {
		t.Error("new colours drew tiles anew")
	}
	b.m.SetLook(tiles.DarkLook())
	b.settle()
	if got := pixel(b.shot(), 300, 3); got != tiles.DarkLook().Paper {
		t.Errorf("beyond the parcels it is %v in the dark look", got)
	}
}

func TestMarksAndLetters(t *testing.T) {
	b := lay(t, squares(t, 10), 600, 500)
	b.settle()
	before := b.shot()
	mark := func(letter, parcel string) tiles.Mark { return tiles.Mark{Letter: letter, Parcels: []string{parcel}} }
	b.m.SetMarks([]tiles.Mark{mark("A", "P44"), mark("B", "P44"), mark("C", "P99"), mark("D", "none")})
	b.settle()
	after := b.shot()
	n, _ := b.ground.Number("P44")
	e := b.ground.ParcelExtent(n)
	edge := b.m.lens.to(geo.XY{X: e.MinX, Y: e.Centre().Y})
	if c := pixel(after, int(edge.X), int(edge.Y)); c == pixel(before, int(edge.X), int(edge.Y)) || c.R > 90 {
		t.Errorf("the edge of the selected parcel is %v", c)
	}
	if len(b.m.badges.badges) != 3 {
		t.Fatalf("%d letters", len(b.m.badges.badges))
	}
	a, other := b.m.badges.badges[0].plate, b.m.badges.badges[1].plate
	if d := b.at("P44").Subtract(a.Position().AddXY(a.Size().Width/2, a.Size().Height/2)); math.Abs(float64(d.X)) > 2 || math.Abs(float64(d.Y)) > 2 {
		t.Errorf("the letter lies %v beside its parcel", d)
	}
	if overlap(a, other) {
		t.Error("two letters at one parcel overlap")
	}
	b.m.SetMarks(nil)
	b.settle()
	if c := pixel(b.shot(), int(edge.X), int(edge.Y)); c != pixel(before, int(edge.X), int(edge.Y)) {
		t.Error("a mark stays after it was taken away")
	}
}

func overlap(a, b fyne.CanvasObject) bool {
	p, q, s, u := a.Position(), b.Position(), a.Size(), b.Size()
	return p.X < q.X+u.Width && q.X < p.X+s.Width && p.Y < q.Y+u.Height && q.Y < p.Y+s.Height
}

func longLegend() []LegendEntry {
	out := []LegendEntry{}
	for i := range 5 {
		out = append(out, LegendEntry{Text: fmt.Sprintf("%d,000 to %d,999 kWh/yr", i, i), Colour: teal})
	}
	for s := tiles.UnknownParcel; s <= tiles.SetbackLine; s++ {
		out = append(out, LegendEntry{Text: "a rather long explanation of this sign, in words", Sample: s})
	}
	return out
}

// TestNothingOnTheGlassOverlaps looks at every size from the smallest that is promised.
func TestNothingOnTheGlassOverlaps(t *testing.T) {
	b := lay(t, squares(t, 10), 500, 400)
	b.m.SetLegend("Energy in a year with a title that is long", longLegend())
	for _, size := range []fyne.Size{{Width: 500, Height: 400}, {Width: 700, Height: 400}, {Width: 500, Height: 900}, {Width: 1200, Height: 800}} {
		b.w.Resize(size)
		test.MoveMouse(b.w.Canvas(), fyne.NewPos(250, 200))
		f := b.m.furniture
		all := []fyne.CanvasObject{f.sheet, f.north, f.legend.box}
		for _, button := range f.buttons {
			all = append(all, button)
		}
		if !f.legend.box.Visible() {
			t.Errorf("%v: no legend", size)
		}
		for i, o := range all {
			p, s := o.Position(), o.Size()
			if p.X < 0 || p.Y < 0 || p.X+s.Width > size.Width || p.Y+s.Height > size.Height {
				t.Errorf("%v: %T at %v, %v leaves the map", size, o, p, s)
			}
			for _, other := range all[:i] {
				if overlap(o, other) {
					t.Errorf("%v: %T at %v and %T at %v overlap", size, o, p, other, other.Position())
				}
			}
		}
		for i, text := range f.legend.texts {
			if right := text.Position().X + text.MinSize().Width; right > f.legend.sheet.Size().Width {
				t.Errorf("%v: entry %d of the legend leaves its card", size, i)
			}
			for _, swatch := range f.legend.swatches {
				if overlap(text, swatch) {
					t.Errorf("%v: an entry runs into a swatch", size)
				}
			}
		}
		for _, o := range []*canvas.Text{f.length, f.where} {
			if p := o.Position(); p.X < f.sheet.Position().X || p.X+o.MinSize().Width > f.sheet.Position().X+f.sheet.Size().Width {
				t.Errorf("%v: %q leaves its sheet", size, o.Text)
			}
		}
	}
	b.m.SetLegend("", nil)
	if b.m.furniture.legend.box.Visible() {
		t.Error("an empty legend is shown")
	}
}

func TestClickOnTheLegendIsNoneOnTheGround(t *testing.T) {
	b := lay(t, squares(t, 10), 600, 500)
	b.m.SetLegend("Score", longLegend())
	b.m.zoom(-8, b.m.middle())
	legend := b.m.furniture.legend.box
	at := legend.Position().AddXY(10, 10)
	if b.m.parcelAt(at) == "" {
		t.Fatal("no parcel under the legend, so the test tells nothing")
	}
	b.click(at, 0)
	if len(b.selected) != 0 {
		t.Errorf("a click on the legend told %q", b.selected)
	}
}

// TestNothingIsDrawnOutside puts the map beside another object and moves it far.
func TestNothingIsDrawnOutside(t *testing.T) {
	b := lay(t, squares(t, 40), 600, 500)
	plain := color.NRGBA{R: 1, G: 2, B: 3, A: 255}
	m := b.m
	b.w.SetContent(container.NewWithoutLayout(canvas.NewRectangle(plain), m))
	whole := b.w.Content().(*fyne.Container).Objects[0]
	whole.Resize(fyne.NewSize(600, 500))
	m.Move(fyne.NewPos(100, 80))
	m.Resize(fyne.NewSize(400, 300))
	m.zoom(-9, m.middle())
	b.settle()
	img := b.shot()
	for _, at := range []image.Point{{95, 200}, {505, 200}, {300, 75}, {300, 385}, {98, 78}, {503, 383}} {
		if got := pixel(img, at.X, at.Y); got != plain {
			t.Errorf("at %v, outside the map, there is %v", at, got)
		}
	}
	if got := pixel(img, 300, 230); got == plain {
		t.Error("inside the map nothing is drawn")
	}
}

func TestZoomShowsTheOldTilesStretched(t *testing.T) {
	b := lay(t, squares(t, 10), 600, 500)
	b.settle()
	old := b.m.front.tiles[0].image.Image
	b.m.painter.Pause()
	at := b.at("P44")
	b.m.zoom(-4, at)
	if len(b.m.back.tiles) == 0 || b.m.back.tiles[0].image.Image != old {
		t.Fatal("the old tiles are gone")
	}
	first := b.m.back.tiles[0]
	if w := first.image.Size().Width; math.Abs(float64(w)-2*tiles.SidePx) > 0.01 {
		t.Errorf("a tile of the old scale is %v wide, want twice its size", w)
	}
	if got := pixel(b.shot(), int(at.X), int(at.Y)); got != teal {
		t.Errorf("while nothing new is drawn the map shows %v", got)
	}
	b.m.pan(40, 0)
	b.m.painter.Resume()
	b.settle()
	if len(b.m.back.tiles) != 0 || first.image.Visible() {
		t.Error("the old tiles stay when the new ones are there")
	}
}

// TestTheWindowNeverDraws pans and zooms over a hundred thousand parcels while the workers rest: if any
// of these calls drew a tile, or waited for one, it would show.
func TestTheWindowNeverDraws(t *testing.T) {
	b := lay(t, squares(t, 316), 900, 700)
	b.settle()
	for slices.ContainsFunc(b.m.wanted, func(k tiles.Key) bool { _, fresh := b.m.painter.Picture(k); return !fresh }) {
		time.Sleep(time.Millisecond) // the margin is under way
	}
	b.m.painter.Pause()
	before := b.m.Counts()
	for i := range 200 {
		switch i % 5 {
		case 0, 1:
			test.Drag(b.w.Canvas(), fyne.NewPos(300, 300), float32(i%7*20-50), float32(i%3*30-20))
		case 2:
			b.scroll(fyne.NewPos(float32(100+i), 200), float32(i%4*25-30))
		case 3:
			test.MoveMouse(b.w.Canvas(), fyne.NewPos(float32(100+2*i), 300))
		case 4:
			b.m.SetShading(tiles.Shading{Class: make([]uint8, b.ground.Parcels()), Colours: []color.NRGBA{teal}})
		}
	}
	if after := b.m.Counts(); after.Drawn != before.Drawn || after.Shaded != before.Shaded {
		t.Errorf("%d tiles drawn, %d coloured while the workers rested", after.Drawn-before.Drawn, after.Shaded-before.Shaded)
	}
	b.m.painter.Resume()
	b.settle()
	if after := b.m.Counts(); after.Drawn == before.Drawn {
		t.Error("nothing was drawn when the workers went on")
	}
}

func TestReadyCallsAreFew(t *testing.T) {
	b := lay(t, squares(t, 40), 900, 700)
	b.m.zoom(-6, b.m.middle())
	for range 20_000 {
		if c := b.m.Counts(); c.Shaded >= 10 {
			break
		}
		time.Sleep(time.Millisecond)
	}
	if n := len(b.queue); n != 1 {
		t.Errorf("%d calls wait for the window, want one for all tiles", n)
	}
	b.settle()
}

func TestViewComesBack(t *testing.T) {
	b := lay(t, squares(t, 40), 600, 500)
	b.m.CentreOn(b.ground.Plane().From(geo.XY{X: 1000, Y: -700}), 3)
	v := b.m.View()
	if v.MPerUnit < 2.5 || v.MPerUnit > 3.6 || b.ground.Plane().To(v.Centre).Dist(geo.XY{X: 1000, Y: -700}) > 0.01 {
		t.Errorf("view %v", v)
	}
	lens := b.m.lens
	b.m.FitAll()
	b.m.SetView(v)
	if b.m.lens.level != lens.level || b.m.lens.centre.Dist(lens.centre) > 0.01 {
		t.Errorf("view %v became %v", lens, b.m.lens)
	}
	if !b.m.ShowParcel("P3") || b.m.ShowParcel("nobody") {
		t.Error("ShowParcel does not tell parcels from others")
	}
	if at := b.at("P3"); math.Abs(float64(at.X-300)) > 1 || math.Abs(float64(at.Y-250)) > 1 {
		t.Errorf("the parcel shown is at %v", at)
	}
	b.m.FitAll()
	for range 20 {
		b.m.zoom(4, b.m.middle())
	}
	b.m.ShowParcel("P3")
	if px := sideM / b.m.lens.mPerPx(); px < 30 {
		t.Errorf("the parcel shown is %.1f pixels wide", px)
	}
}

func TestScaleAndPlaceWords(t *testing.T) {
	for _, c := range []struct {
		most  float64
		m     float64
		words string
	}{{110, 100, "100 m"}, {1999, 1000, "1 km"}, {2000, 2000, "2 km"}, {7000, 5000, "5 km"}, {49, 20, "20 m"}, {23456, 20000, "20 km"}, {0.7, 0.5, "0.5 m"}, {0, 0, ""}} {
		if m, words := scaleLength(c.most); math.Abs(m-c.m) > 1e-9 || words != c.words {
			t.Errorf("at most %v m: %v, %q", c.most, m, words)
		}
	}
	if got := placeWords(geo.LonLat{Lon: -27.0312, Lat: 47.5124}, 30); got != "47.512 N 27.031 W" {
		t.Error(got)
	}
	if got := placeWords(geo.LonLat{Lon: 8.5, Lat: -3.25}, 2); got != "3.2500 S 8.5000 E" {
		t.Error(got)
	}
	b := lay(t, squares(t, 10), 600, 500)
	f := b.m.furniture
	m, _ := scaleLength(b.m.lens.mPerPx() * longestScale)
	a, c := b.m.lens.from(f.bar[0].Position1), b.m.lens.from(f.bar[0].Position2)
	if math.Abs(a.Dist(c)-m) > b.m.lens.mPerPx() {
		t.Errorf("the bar of %q spans %v m", f.length.Text, a.Dist(c))
	}
}

func TestNamesDoNotOverlap(t *testing.T) {
	plane := tiles.NewPlane(geo.LonLat{Lon: -27, Lat: 47.5})
	l := tiles.Layer{Role: "place_names"}
	for i := range 3000 {
		p := plane.From(geo.XY{X: float64(i*37%2000) - 1000, Y: float64(i*91%2000) - 1000})
		l.Features = append(l.Features, tiles.Feature{Name: fmt.Sprintf("Saltreath %d", i), Rank: float64(1 + i*7%5), Geometry: geo.LonLatGeometry{Kind: geo.Points, Parts: [][][]geo.LonLat{{{p}}}}})
	}
	b := lay(t, squares(t, 10, l), 800, 600)
	var seen []*canvas.Text
	for _, label := range b.m.names.labels {
		if label.text.Visible() {
			seen = append(seen, label.text)
		}
	}
	if len(seen) < 8 || len(seen) > mostNames {
		t.Fatalf("%d names in view", len(seen))
	}
	for i, a := range seen {
		for _, c := range seen[:i] {
			if overlap(a, c) {
				t.Errorf("%q and %q overlap", a.Text, c.Text)
			}
		}
	}
	if !seen[0].TextStyle.Bold {
		t.Error("the foremost name does not come first")
	}
	chosen := slices.Clone(b.m.names.chosen)
	b.m.pan(33, 12)
	if !slices.Equal(chosen, b.m.names.chosen) {
		t.Error("other names are chosen after a move")
	}
}

func TestWithoutAGround(t *testing.T) {
	b := lay(t, squares(t, 4), 600, 500)
	b.settle()
	b.m.SetGround(nil)
	b.click(fyne.NewPos(300, 250), 0)
	b.scroll(fyne.NewPos(300, 250), 50)
	test.Drag(b.w.Canvas(), fyne.NewPos(300, 250), 20, 20)
	test.MoveMouse(b.w.Canvas(), fyne.NewPos(300, 250))
	b.m.TypedKey(&fyne.KeyEvent{Name: fyne.KeyLeft})
	b.m.CentreOn(geo.LonLat{}, 4)
	b.m.SetMarks([]tiles.Mark{{Letter: "A", Parcels: []string{"P1"}}})
	if len(b.selected) != 0 || b.m.ShowParcel("P1") {
		t.Errorf("without a district told %q", b.selected)
	}
	for _, l := range [][]*tileObject{b.m.front.tiles, b.m.back.tiles} {
		for _, o := range l {
			if o.image.Visible() {
				t.Fatal("a tile of the former district is shown")
			}
		}
	}
}

func TestHiddenMapRests(t *testing.T) {
	b := lay(t, squares(t, 40), 600, 500)
	b.settle()
	b.m.Hide()
	before := b.m.Counts().Drawn
	b.m.zoom(-8, b.m.middle())
	time.Sleep(20 * time.Millisecond)
	if now := b.m.Counts().Drawn; now > before+2 { // what was under way is finished
		t.Errorf("a hidden map drew %d tiles", now-before)
	}
	b.m.Show()
	b.settle()
}

func TestHiddenRolesAndRefresh(t *testing.T) {
	b := lay(t, squares(t, 10), 600, 500)
	b.settle()
	at := b.at("P44")
	b.m.SetHidden("parcels")
	b.settle()
	if got := pixel(b.shot(), int(at.X), int(at.Y)); got == teal {
		t.Error("parcels are still shown")
	}
	b.m.SetHidden()
	b.settle()
	b.m.Refresh()
	if got := pixel(b.shot(), int(at.X), int(at.Y)); got != teal {
		t.Errorf("parcels do not come back: %v", got)
	}
}

// TestScreenScale moves the window to a screen with twice as many pixels.
func TestScreenScale(t *testing.T) {
	b := lay(t, squares(t, 10), 600, 500)
	b.m.SetLegend("Score", longLegend()[:3])
	b.m.zoom(-2, b.m.middle())
	b.settle()
	v := b.m.View()
	b.w.Canvas().(interface{ SetScale(float32) }).SetScale(2)
	b.m.Refresh()
	b.settle()
	if now := b.m.View(); math.Abs(now.MPerUnit/v.MPerUnit-1) > 0.001 {
		t.Errorf("%v m per unit before, %v after", v.MPerUnit, now.MPerUnit)
	}
	tile := b.m.front.tiles[0]
	if w := tile.image.Size().Width; w != tiles.SidePx/2 {
		t.Errorf("a tile of %d pixels is %v units wide", tiles.SidePx, w)
	}
	if w := b.m.furniture.legend.swatches[0].Image.Bounds().Dx(); w != 2*swatchWide {
		t.Errorf("a swatch has %d pixels for %d units", w, swatchWide)
	}
	at := b.at("P44")
	if got := pixel(b.shot(), int(2*at.X), int(2*at.Y)); got != teal {
		t.Errorf("the middle of a parcel is %v", got)
	}
}
