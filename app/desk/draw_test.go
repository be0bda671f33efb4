package desk

import (
	"math"
	"slices"
	"strings"
	"testing"
	"time"

	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/driver/desktop"
	"fyne.io/fyne/v2/test"
	"fyne.io/fyne/v2/widget"

	"groundtally/app/desk/desktest"
	"groundtally/app/desk/widgets"
	"groundtally/app/run"
	"groundtally/app/study"
	"groundtally/geo"
)

// over gives what of a kind is in the dialog or menu on top.
func over[T fyne.CanvasObject](s *stand, is func(T) bool) T {
	s.t.Helper()
	var none T
	top := s.w.window.Canvas().Overlays().Top()
	if top == nil {
		s.t.Fatal("nothing is open over the window")
	}
	for _, o := range test.LaidOutObjects(top) {
		if x, ok := o.(T); ok && is(x) {
			return x
		}
	}
	s.t.Fatalf("there is no such %T", none)
	return none
}

func (s *stand) tapOver(text string) {
	s.t.Helper()
	test.Tap(over(s, func(b *widget.Button) bool { return b.Text == text }))
	s.Pump()
}

func (s *stand) fillOver(hint, text string) {
	s.t.Helper()
	over(s, func(e *widget.Entry) bool { return strings.HasPrefix(e.PlaceHolder, hint) }).SetText(text)
}

// draw opens the menu of what can be drawn and takes an entry.
func (s *stand) draw(entry string) {
	s.t.Helper()
	var button *widget.Button
	for _, o := range test.LaidOutObjects(s.w.window.Canvas().Content()) {
		if b, ok := o.(*widget.Button); ok && b.Text == "Draw…" {
			button = b
		}
	}
	if button == nil {
		s.t.Fatal("there is no button to draw")
	}
	test.Tap(button)
	top := s.w.window.Canvas().Overlays().Top()
	if top == nil {
		s.t.Fatal("the button opens no menu")
	}
	for _, o := range test.LaidOutObjects(top) {
		item, ok := o.(fyne.Tappable)
		if _, hover := o.(desktop.Hoverable); !ok || !hover {
			continue
		}
		var said []string
		for _, x := range test.LaidOutObjects(o) {
			if w := wordsOf(x); w != "" {
				said = append(said, w)
			}
		}
		if len(said) == 1 && strings.Contains(said[0], entry) { // and not the menu as a whole
			item.Tapped(&fyne.PointEvent{})
			s.Pump()
			return
		}
	}
	s.t.Fatalf("the menu has no %q", entry)
}

// click clicks the map at a share of its width and height.
func (s *stand) click(x, y float32) geo.LonLat {
	s.t.Helper()
	m := s.w.picture.m
	at := fyne.NewPos(m.Size().Width*x, m.Size().Height*y)
	e := &desktop.MouseEvent{PointEvent: fyne.PointEvent{Position: at}, Button: desktop.MouseButtonPrimary}
	m.MouseMoved(e)
	m.MouseDown(e)
	m.MouseUp(e)
	m.Tapped(&e.PointEvent)
	s.Pump()
	time.Sleep(s.w.app.Driver().DoubleTapDelay() + 20*time.Millisecond) // so that the next is no second click
	v := m.View()
	plane := s.w.picture.ground.Plane()
	c := plane.To(v.Centre)
	return plane.From(geo.XY{X: c.X + float64(at.X-m.Size().Width/2)*v.MPerUnit, Y: c.Y - float64(at.Y-m.Size().Height/2)*v.MPerUnit})
}

func (s *stand) layer(name string) study.LayerRecord {
	s.t.Helper()
	for _, l := range s.w.core.View().Snap.Layers {
		if l.Name == name {
			return l
		}
	}
	s.t.Fatalf("there is no layer %q", name)
	return study.LayerRecord{}
}

// What is drawn on the map goes into the form with its reason, from there into the study as one journal entry, and
// undo takes it back.
func TestDrawing(t *testing.T) {
	s := open(t, 20)
	s.w.core.ShowStage("Ground")
	s.settle()
	exclusions := s.w.core.View().Snap.LayersOf("exclusion")
	if len(exclusions) == 0 {
		t.Fatal("the sample has no exclusion")
	}
	name := exclusions[0].Name
	before := s.layer(name)
	s.draw("An exclusion area")
	if !s.w.picture.m.Sketching() {
		t.Fatal("nothing can be drawn")
	}
	corners := []geo.LonLat{s.click(0.45, 0.4), s.click(0.6, 0.42), s.click(0.58, 0.55)}
	s.shoot("drawing")
	corners = append(corners, s.click(0.46, 0.56))
	s.w.picture.m.TypedKey(&fyne.KeyEvent{Name: fyne.KeyReturn})
	s.Pump()
	place := over(s, func(e *widget.Entry) bool { return strings.HasPrefix(e.PlaceHolder, "longitude") })
	if n := strings.Count(place.Text, ";"); n != 4 {
		t.Errorf("the place is %q", place.Text)
	}
	desktest.Save(t, "drawing-form-light.png", s.w.window.Canvas().Capture())
	s.tapOver("Change it")
	if said := over(s, func(l *widget.Label) bool {
		return strings.Contains(l.Text, "reason") && !strings.Contains(l.Text, "kept with")
	}); said.Text == "" {
		t.Error("without a reason nothing is said")
	}
	s.fillOver("needed; it goes", "told by the flying club")
	s.tapOver("Change it")
	over(s, func(l *widget.Label) bool { return strings.Contains(l.Text, "Write the value of the field Reason") })
	s.fillOver("its value", "flight path")
	entries := len(s.w.core.View().Journal)
	s.tapOver("Change it")
	s.until("it is in the study", func() bool { return s.layer(name).Count == before.Count+1 })
	if n := len(s.w.core.View().Journal); n != entries+1 {
		t.Errorf("%d journal entries were made", n-entries)
	}
	hand := s.layer(name).Hand[len(s.layer(name).Hand)-1]
	if hand.Verb != study.HandAdd || hand.Reason != "told by the flying club" || hand.Geometry == nil || hand.Geometry.Kind != geo.Polygons || hand.Values["reason"] != "flight path" {
		t.Fatalf("%+v", hand)
	}
	near := 1.5 * s.w.picture.m.View().MPerUnit / 111_000 // degrees, as tiles lie on whole pixels
	for i, c := range corners {
		found := false
		hand.Geometry.Each(func(p geo.LonLat) { found = found || math.Abs(p.Lat-c.Lat) < near && math.Abs(p.Lon-c.Lon) < 1.6*near })
		if !found {
			t.Errorf("corner %d, clicked at %v, is not in %v", i, c, hand.Geometry.Parts)
		}
	}
	s.w.core.Undo()
	s.until("it is taken back", func() bool { return s.layer(name).Count == before.Count })

	// A dwelling is one click, and giving up changes nothing.
	s.settle()
	s.draw("A dwelling")
	s.w.picture.m.TypedKey(&fyne.KeyEvent{Name: fyne.KeyEscape})
	s.Pump()
	if s.w.picture.m.Sketching() || s.w.window.Canvas().Overlays().Top() != nil {
		t.Error("giving up leaves something open")
	}
	homes := s.w.core.View().Snap.LayersOf("dwellings")[0]
	s.draw("A dwelling")
	house := s.click(0.5, 0.5)
	s.fillOver("needed; it goes", "seen on a walk")
	s.tapOver("Change it")
	s.until("the dwelling is there", func() bool { return s.layer(homes.Name).Count == homes.Count+1 })
	hands := s.layer(homes.Name).Hand
	id := hands[len(hands)-1].Feature

	// It is put elsewhere: picked near where it stands, which a click far from all is not.
	s.settle()
	s.draw("Move a point of " + homes.Name)
	s.click(0.02, 0.5)
	s.until("it is asked again", s.w.picture.m.Sketching)
	s.w.picture.showPlace(house)
	s.settle()
	s.click(0.505, 0.5)
	s.until("it is picked", func() bool { return s.w.picture.m.Sketching() })
	s.settle()
	to := s.click(0.6, 0.45)
	feature := over(s, func(e *widget.Entry) bool { return strings.HasPrefix(e.PlaceHolder, "its identifier") })
	if feature.Text != id {
		t.Errorf("picked %q, want %q", feature.Text, id)
	}
	s.fillOver("needed; it goes", "it stands further north")
	s.tapOver("Change it")
	s.until("it is moved", func() bool { return len(s.layer(homes.Name).Hand) == len(hands)+1 })
	moved := s.layer(homes.Name).Hand[len(hands)]
	if p := moved.Geometry.Parts[0][0][0]; moved.Verb != study.HandMove || math.Abs(p.Lat-to.Lat) > 6e-5 || math.Abs(p.Lon-to.Lon) > 1e-4 {
		t.Errorf("moved to %v, want %v", moved, to)
	}
}

// Turbines are dragged on the map with the parcels and the ground that it knows; taking back goes by moves while they
// are, and Escape leaves all as it was.
func TestTurbinesOnTheMap(t *testing.T) {
	s := open(t, 20)
	c := s.w.core
	at := slices.IndexFunc(c.View().Results.Candidates, func(x run.Candidate) bool { return x.Plant == "wind" && x.Status == run.Fitted })
	if at < 0 {
		t.Fatal("the sample has no wind")
	}
	cand := &c.View().Results.Candidates[at]
	c.ShowStage("Plant")
	c.Choose(cand.ID())
	s.settle()
	in := func(is func(fyne.CanvasObject) bool) fyne.CanvasObject {
		t.Helper()
		for _, o := range test.LaidOutObjects(s.w.window.Canvas().Content()) {
			if o.Visible() && is(o) {
				return o
			}
		}
		t.Fatal("the pane lacks something")
		return nil
	}
	tap := func(text string) {
		t.Helper()
		switch o := in(func(o fyne.CanvasObject) bool {
			b, ok := o.(*widget.Button)
			p, pill := o.(*widgets.Pill)
			return ok && b.Text == text || pill && p.Text == text
		}).(type) {
		case *widget.Button:
			test.Tap(o)
		case *widgets.Pill:
			test.Tap(o)
		}
		s.Pump()
	}
	in(func(o fyne.CanvasObject) bool {
		x, ok := o.(*widget.Select)
		ok = ok && slices.Contains(x.Options, c.PlantTitle("wind"))
		if ok {
			x.SetSelected(c.PlantTitle("wind"))
		}
		return ok
	})
	tap("Fitted")
	tap("Move turbines on the map")
	m := s.w.picture.m
	s.until("they can be moved", m.Sketching)
	s.settle()
	from := cand.Fit.Turbines[0]
	plane := s.w.picture.ground.Plane()
	position := func(p geo.LonLat) fyne.Position {
		v := m.View()
		d := plane.To(p).Sub(plane.To(v.Centre))
		return fyne.NewPos(m.Size().Width/2+float32(d.X/v.MPerUnit), m.Size().Height/2-float32(d.Y/v.MPerUnit))
	}
	a := position(from)
	press := &desktop.MouseEvent{PointEvent: fyne.PointEvent{Position: a}, Button: desktop.MouseButtonPrimary}
	m.MouseDown(press)
	for i := range 20 {
		s.Call(func() {
			m.Dragged(&fyne.DragEvent{PointEvent: fyne.PointEvent{Position: a.AddXY(float32(i)*4, -float32(i))}, Dragged: fyne.NewDelta(4, -1)})
		})
	}
	m.DragEnd()
	s.shoot("turbines-moved")
	entries := len(c.View().Journal)
	s.press(&fyne.ShortcutUndo{})
	s.settle()
	if len(c.View().Journal) != entries || !m.Sketching() {
		t.Fatal("taking a move back takes an edit back")
	}
	s.press(&fyne.ShortcutRedo{})
	tap("Done moving")
	over(s, func(l *widget.Label) bool { return strings.Contains(l.Text, "moved") })
	s.fillOver("needed; it goes", "further from the path")
	s.tapOver("Keep these places")
	s.until("it is in the study", func() bool { return len(c.View().Snap.Layouts()) == 1 })
	got := c.View().Snap.Layouts()[0]
	d := plane.To(got.At[0]).Sub(plane.To(from))
	if unit := m.View().MPerUnit; math.Abs(d.X-76*unit) > unit || math.Abs(d.Y-19*unit) > unit || got.Reason != "further from the path" {
		t.Errorf("moved by %v m, want %v, %v: %+v", d, 76*unit, 19*unit, got)
	}
	s.settle()
	tap("Move turbines on the map")
	s.until("they can be moved again", m.Sketching)
	m.TypedKey(&fyne.KeyEvent{Name: fyne.KeyDelete})
	m.TypedKey(&fyne.KeyEvent{Name: fyne.KeyEscape})
	s.settle()
	if m.Sketching() || s.w.window.Canvas().Overlays().Top() != nil || len(c.View().Snap.Layouts()) != 1 {
		t.Error("giving up leaves something open")
	}
	tap("Back to the program's own places")
	s.until("the program places them", func() bool { return len(c.View().Snap.Layouts()) == 0 })
	s.press(&fyne.ShortcutUndo{})
	s.until("those by hand are back", func() bool { return len(c.View().Snap.Layouts()) == 1 })
}
