package plant

import (
	"slices"
	"strings"
	"testing"

	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/test"
	"fyne.io/fyne/v2/widget"

	"groundtally/app/desk/desktest"
	"groundtally/app/desk/mapview"
	"groundtally/app/draw/tiles"
	"groundtally/app/run"
	"groundtally/app/study"
	"groundtally/geo"
)

// mapStub stands for the map: it keeps what is asked for, and answers as the test tells.
type mapStub struct {
	asked []mapview.Points
	ended []bool
}

func (s *mapStub) in(b *desktest.Bench) {
	b.Core.MovePoints = func(p mapview.Points) func(bool) {
		s.asked = append(s.asked, p)
		return func(take bool) {
			s.ended = append(s.ended, take)
			if p.Done(nil); take {
				b.T.Error("the stub takes nothing")
			}
		}
	}
}

func (s *mapStub) last() mapview.Points { return s.asked[len(s.asked)-1] }

func form[T fyne.CanvasObject](b *desktest.Bench, is func(T) bool) T {
	b.T.Helper()
	var none T
	top := b.Window.Canvas().Overlays().Top()
	if top == nil {
		b.T.Fatal("no form is open")
	}
	for _, o := range test.LaidOutObjects(top) {
		if x, ok := o.(T); ok && is(x) {
			return x
		}
	}
	b.T.Fatalf("the form has no such %T", none)
	return none
}

func button(b *desktest.Bench, text string) *widget.Button {
	return form(b, func(o *widget.Button) bool { return o.Text == text })
}

// Turbines are moved on the map, the form asks why, the study gets one journal entry, the plant stands where it was
// put; the program's own places come back, and undo brings those by hand back.
func TestTurbinesByHand(t *testing.T) {
	b, s := open(t, 60, 520, 480)
	var stub mapStub
	stub.in(b)
	s.choose("wind")
	s.tabs.Choose(tabFitted)
	id := s.of.Candidates[s.tallies["wind"].best].ID()
	b.Core.Choose(id)
	b.Pump()
	m := s.fitted.mover
	own := slices.Clone(b.Core.Chosen()[0].Fit.Turbines)
	if !m.all.Visible() || !m.move.Visible() || m.move.Text != "Move turbines on the map" || m.own.Visible() || m.done.Visible() || m.room.Visible() {
		t.Fatal("what is offered at first is wrong")
	}
	test.Tap(m.move)
	test.Tap(m.move) // impatience
	b.Until("the map is asked", func() bool { return len(stub.asked) > 0 })
	b.Pump()
	ask := stub.last()
	if len(stub.asked) != 1 || !slices.Equal(ask.Start, own) || ask.Check == nil || !(ask.UnitM > 0) || ask.RingM < ask.UnitM || !strings.Contains(ask.Words, b.Core.Chosen()[0].Site) {
		t.Fatalf("%d asked; %+v", len(stub.asked), ask)
	}
	if !m.done.Visible() || !m.leave.Visible() || m.move.Visible() || !strings.Contains(m.said.Text, "being moved") {
		t.Error("the pane does not say that they are being moved")
	}
	test.Tap(m.leave)
	if !slices.Equal(stub.ended, []bool{false}) || m.under != nil || !m.move.Visible() {
		t.Error("giving up by the button leaves something open")
	}

	test.Tap(m.move)
	b.Until("the map is asked again", func() bool { return len(stub.asked) == 2 })
	stub.last().Done(own)
	if m.under != nil || b.Window.Canvas().Overlays().Top() != nil {
		t.Error("without a change a reason is asked for")
	}
	test.Tap(m.move)
	b.Until("the map is asked again", func() bool { return len(stub.asked) == 3 })
	there := slices.Clone(own)
	there[0].Lat += 0.0002
	stub.last().Done(there)
	test.Tap(button(b, "Go on moving"))
	if len(stub.asked) != 4 || !slices.Equal(stub.last().Start, there) || stub.last().Check == nil || b.Window.Canvas().Overlays().Top() != nil {
		t.Fatal("it does not go on where it was")
	}
	there[0].Lat += 0.0001
	stub.last().Done(slices.Clone(there))
	entries := len(b.Core.View().Journal)
	test.Tap(button(b, "Keep these places"))
	form(b, func(l *widget.Label) bool { return strings.Contains(l.Text, "need a reason") })
	form(b, func(e *widget.Entry) bool { return true }).SetText("the spring must stay dry")
	desktest.Save(t, "plant-hand-form-light.png", b.Window.Canvas().Capture())
	test.Tap(button(b, "Keep these places"))
	settled(b, s)
	if b.Window.Canvas().Overlays().Top() != nil || m.under != nil {
		t.Error("the form stays open")
	}
	if n := len(b.Core.View().Journal) - entries; n != 1 {
		t.Errorf("%d journal entries were made", n)
	}
	c := b.Core.Chosen()[0]
	if c.Fit == nil || len(c.Fit.Turbines) != len(own) || far(c.Fit.Turbines[0], there[0]) {
		t.Fatalf("the turbines stand at %v, by %+v, want %v", c.Fit.Turbines, c.Fit.Layout, there)
	}
	if m.said.Text != "Placed by hand: the spring must stay dry" || !m.own.Visible() || !m.move.Visible() {
		t.Errorf("the pane says %q", m.said.Text)
	}
	b.Shoot("plant-by-hand-520")

	// Going on starts from the places by hand, with the reason given before.
	test.Tap(m.move)
	b.Until("the map is asked", func() bool { return len(stub.asked) == 5 })
	if far(stub.last().Start[0], there[0]) {
		t.Errorf("it starts from %v", stub.last().Start)
	}
	stub.last().Done(append(slices.Clone(stub.last().Start), geo.LonLat{Lon: there[0].Lon, Lat: there[0].Lat + 0.001}))
	if got := form(b, func(e *widget.Entry) bool { return true }).Text; got != "the spring must stay dry" {
		t.Errorf("the reason is %q", got)
	}
	test.Tap(button(b, "Leave all as it was"))
	if m.under != nil {
		t.Error("it is not left")
	}

	test.Tap(m.own)
	settled(b, s)
	if c := b.Core.Chosen()[0]; !slices.Equal(c.Fit.Turbines, own) || m.own.Visible() || m.room.Visible() {
		t.Errorf("the program places them at %v, was %v", c.Fit.Turbines, own)
	}
	b.Core.Undo()
	settled(b, s)
	if _, ok := b.Core.View().Snap.Layout(c.Site, c.Plant); !ok || !m.own.Visible() {
		t.Error("undo does not bring the places by hand back")
	}
	b.Core.Undo()
	settled(b, s)
	if _, ok := b.Core.View().Snap.Layout(c.Site, c.Plant); ok || m.own.Visible() {
		t.Error("undo does not take the places by hand back")
	}

	// Rotors that could touch: nothing is computed, and the way out is still offered.
	test.Tap(m.move)
	b.Until("the map is asked", func() bool { return len(stub.asked) == 6 })
	at := append(slices.Clone(own), geo.LonLat{Lon: own[0].Lon, Lat: own[0].Lat + 0.0001})
	if words := stub.last().Check(at); !strings.Contains(words[0], "could touch") {
		t.Errorf("it is said: %q", words)
	}
	stub.last().Done(at)
	form(b, func(e *widget.Entry) bool { return true }).SetText("a trial")
	test.Tap(button(b, "Keep these places"))
	settled(b, s)
	if c := s.fitted.candidate(); c == nil || c.Status != run.NotComputed || !m.all.Visible() || !m.own.Visible() {
		t.Errorf("it is %+v", c)
	}
	b.Shoot("plant-hand-touching-520")

	s.choose("solar_agri")
	b.Pump()
	if m.all.Visible() {
		t.Error("turbines of panels can be moved")
	}
}

func far(p, q geo.LonLat) bool {
	return tiles.NewPlane(p).To(q).Dist(geo.XY{}) > 0.05
}

// While a turbine is dragged, it is said when it stands beside the site, beside the buildable ground, or nearer to
// another than the spacing; whatever is not known is not said.
func TestChecker(t *testing.T) {
	centre := geo.LonLat{Lon: 9, Lat: 48}
	plane := tiles.NewPlane(centre)
	ring := func(half float64) [][]geo.LonLat {
		var out []geo.LonLat
		for _, p := range []geo.XY{{X: -half, Y: -half}, {X: half, Y: -half}, {X: half, Y: half}, {X: -half, Y: half}, {X: -half, Y: -half}} {
			out = append(out, plane.From(p))
		}
		return [][]geo.LonLat{out}
	}
	looks := 0
	inSite := func(p geo.LonLat) bool {
		looks++
		xy := plane.To(p)
		return max(xy.X, -xy.X) < 1500 && max(xy.Y, -xy.Y) < 1500
	}
	places := func(xy ...geo.XY) (out []geo.LonLat) {
		for _, p := range xy {
			out = append(out, plane.From(p))
		}
		return out
	}
	a := &run.Surroundings{Buildable: geo.LonLatGeometry{Kind: geo.Polygons, Parts: [][][]geo.LonLat{ring(1000)}}}
	c := newChecker(centre, 400, 120, a, inSite)
	at := places(geo.XY{}, geo.XY{X: 399.8}, geo.XY{X: -349.5}, geo.XY{Y: 1000.2}, geo.XY{Y: 1040}, geo.XY{X: 1599.5}, geo.XY{X: -950, Y: -950}, geo.XY{X: -870, Y: -950})
	want := []string{
		"349 m from turbine 3, and the spacing is 400 m or more", "", "349 m from turbine 1, and the spacing is 400 m or more",
		"its rotor could touch that of turbine 5; so nothing can be computed", "its rotor could touch that of turbine 4; so nothing can be computed",
		"outside the site, 600 m from its buildable ground",
		"its rotor could touch that of turbine 8; so nothing can be computed", "its rotor could touch that of turbine 7; so nothing can be computed",
	}
	got := c.check(at)
	for i := range want {
		if got[i] != want[i] {
			t.Errorf("turbine %d: %q, want %q", i+1, got[i], want[i])
		}
	}
	if n := looks; n != len(at) {
		t.Errorf("%d looks at the ground", n)
	}
	at[5] = places(geo.XY{X: 1039.5})[0]
	if got := c.check(at)[5]; got != "40 m outside the buildable ground" || looks != len(at)+1 {
		t.Errorf("%q, %d looks", got, looks)
	}
	if got := newChecker(centre, 0, 0, nil, inSite).check(places(geo.XY{}, geo.XY{X: 1}, geo.XY{Y: 2000})); got[0] != "" || got[1] != "" || got[2] != "outside the site" {
		t.Errorf("with nothing known: %q", got)
	}
	none := &run.Surroundings{Buildable: geo.LonLatGeometry{Kind: geo.Polygons}}
	if got := newChecker(centre, 0, 0, none, inSite).check(places(geo.XY{}, geo.XY{Y: 2000})); got[0] != "the site has no buildable ground" || got[1] != "outside the site, which has no buildable ground" {
		t.Errorf("without ground: %q", got)
	}
}

func BenchmarkChecker(b *testing.B) {
	centre := geo.LonLat{Lon: 9, Lat: 48}
	plane := tiles.NewPlane(centre)
	ground := [][]geo.LonLat{nil}
	for i := range 4000 {
		ground[0] = append(ground[0], plane.From(geo.XY{X: float64(i % 2000), Y: float64(i / 2000 * 900)}))
	}
	c := newChecker(centre, 400, 120, &run.Surroundings{Buildable: geo.LonLatGeometry{Kind: geo.Polygons, Parts: [][][]geo.LonLat{ground}}}, func(geo.LonLat) bool { return true })
	var at []geo.LonLat
	for i := range study.MostHandTurbines {
		at = append(at, plane.From(geo.XY{X: float64(i%20) * 100, Y: float64(i/20) * 90}))
	}
	for i := 0; b.Loop(); i++ {
		at[7] = plane.From(geo.XY{X: 500 + float64(i%1000), Y: 77})
		c.check(at)
	}
}
