package mapview

import (
	"fmt"
	"math"
	"slices"
	"strings"
	"testing"

	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/driver/desktop"

	"groundtally/app/draw/tiles"
	"groundtally/geo"
)

// moving begins to move points that stand at some places of the test's plane.
func (b *table) moving(start ...geo.XY) (told *[][]geo.LonLat) {
	told = new([][]geo.LonLat)
	plane := tiles.NewPlane(geo.LonLat{Lon: -27, Lat: 47.5})
	var at []geo.LonLat
	for _, p := range start {
		at = append(at, plane.From(p))
	}
	b.m.MovePoints(Points{Words: "Move the masts", One: "mast", Start: at, Least: 1, Most: 5, RingM: 250, UnitM: 100, Unit: "mast widths",
		Check: func(at []geo.LonLat) []string {
			out := make([]string, len(at))
			for i, p := range metres(at) {
				if p.X > 400 {
					out[i] = fmt.Sprintf("%.0f m too far east", p.X-400)
				}
			}
			return out
		},
		Done: func(at []geo.LonLat) { *told = append(*told, at) }})
	return told
}

func (b *table) on(p geo.XY) fyne.Position { return b.m.lens.to(p) }

func (b *table) drag(from, to fyne.Position) {
	b.m.MouseDown(&desktop.MouseEvent{PointEvent: fyne.PointEvent{Position: from}, Button: desktop.MouseButtonPrimary})
	at := from
	for i := 1; i <= 5; i++ {
		share := float32(i) / 5
		next := from.AddXY((to.X-from.X)*share, (to.Y-from.Y)*share)
		b.m.Dragged(&fyne.DragEvent{PointEvent: fyne.PointEvent{Position: next}, Dragged: fyne.NewDelta(next.X-at.X, next.Y-at.Y)})
		at = next
	}
	b.m.MouseUp(&desktop.MouseEvent{PointEvent: fyne.PointEvent{Position: to}, Button: desktop.MouseButtonPrimary})
	b.m.DragEnd()
}

func (b *table) shifted(names ...fyne.KeyName) {
	b.m.KeyDown(&fyne.KeyEvent{Name: desktop.KeyShiftLeft})
	b.keys(names...)
	b.m.KeyUp(&fyne.KeyEvent{Name: desktop.KeyShiftLeft})
}

func (b *table) besideWords() string {
	if !b.m.points.beside.box.Visible() {
		return ""
	}
	var out []string
	for _, t := range b.m.points.beside.lines {
		if t.Visible() {
			out = append(out, t.Text)
		}
	}
	return strings.Join(out, "\n")
}

func near(t *testing.T, what string, got, want geo.XY, withinM float64) {
	t.Helper()
	if got.Dist(want) > withinM {
		t.Errorf("%s is at %.1f, want %.1f", what, got, want)
	}
}

var three = []geo.XY{{X: -200, Y: -100}, {X: 100, Y: 150}, {X: 300, Y: -200}}

// A point is dragged; the map stays, the card tells the distance to the nearest other and what is wrong, those not
// touched stay exactly where they were.
func TestPointsDrag(t *testing.T) {
	b := lay(t, squares(t, 10), 600, 500)
	told := b.moving(three...)
	start := b.m.points.now.places()
	if w := b.cardWords(); !b.m.Sketching() || !strings.Contains(w, "Move the masts") || strings.Contains(w, "wrong") || b.w.Canvas().Focused() != fyne.Focusable(b.m) {
		t.Fatalf("the card says %q", w)
	}
	view := b.m.View()
	b.drag(b.on(three[2]).AddXY(5, 3), b.on(geo.XY{X: 450, Y: 150}).AddXY(5, 3))
	if w := b.besideWords(); !strings.HasPrefix(w, "Mast 3\n3.5 mast widths, 350 m, to the nearest, mast 2\n") || !strings.Contains(w, "m too far east") {
		t.Errorf("beside it stands %q", w)
	}
	if w := b.cardWords(); !strings.Contains(w, "1 of 3 with something wrong") || !b.m.points.marks[2].now.wrong || b.m.points.marks[1].now.wrong || b.m.points.marks[2].paths[1].Hidden {
		t.Errorf("the card says %q", w)
	}
	b.drag(b.on(geo.XY{X: 1, Y: 1}), b.on(geo.XY{X: 1, Y: 1}).AddXY(2, -2)) // beside all of them, the map is panned
	if b.m.View() == view {
		t.Error("the map cannot be panned")
	}
	b.drag(b.on(three[0]), b.on(three[0]).AddXY(2, 1)) // a click that was not quite still
	if b.m.points.now.chosen != 0 || b.m.points.now.at[0].at != start[0] {
		t.Error("a slip moves a mast")
	}
	b.keys(fyne.KeyReturn)
	if len(*told) != 1 || len((*told)[0]) != 3 || b.m.Sketching() || b.cardWords() != "" || b.besideWords() != "" || len(b.selected)+len(b.boxes) != 0 {
		t.Fatalf("told %v, the card says %q", *told, b.cardWords())
	}
	if got := (*told)[0]; got[0] != start[0] || got[1] != start[1] {
		t.Error("masts that were not touched moved")
	}
	near(t, "mast 3", metres((*told)[0])[2], geo.XY{X: 450, Y: 150}, 3)
}

// A click on free ground adds a point, one on a point chooses it, Delete takes it away; no more than allowed are
// placed, no fewer than needed are told; each change can be taken back and brought back.
func TestPointsAddAndTakeAway(t *testing.T) {
	b := lay(t, squares(t, 10), 600, 500)
	told := b.moving(three...)
	p := b.m.points.now
	b.point(b.on(geo.XY{X: -300, Y: 300}))
	if len(p.at) != 4 || p.chosen != 3 || !b.m.points.marks[3].paths[1].Hidden {
		t.Fatalf("%d masts, chosen %d", len(p.at), p.chosen)
	}
	b.point(b.on(three[1]).AddXY(-6, 6))
	if len(p.at) != 4 || p.chosen != 1 {
		t.Fatalf("%d masts, chosen %d", len(p.at), p.chosen)
	}
	b.keys(fyne.KeyDelete, fyne.KeyDelete) // the second has none to take
	if len(p.at) != 3 || !strings.Contains(b.cardWords(), "Choose the mast") {
		t.Fatalf("%d masts, the card says %q", len(p.at), b.cardWords())
	}
	if got := metres(p.places()); got[1].Dist(three[2]) > 0.01 || got[2].Dist(geo.XY{X: -300, Y: 300}) > 3 {
		t.Errorf("left are %v", got)
	}
	b.m.TakeBack()
	if len(p.at) != 4 {
		t.Error("the mast does not come back")
	}
	b.m.TakeBack()
	b.m.TakeBack() // there is nothing more
	if !slices.Equal(p.places(), p.Start) {
		t.Error("not all was taken back")
	}
	b.m.BringBack()
	b.m.BringBack()
	b.m.BringBack()
	if len(p.at) != 3 || p.places()[0] != p.Start[0] {
		t.Errorf("%d masts", len(p.at))
	}
	b.point(b.on(geo.XY{X: 0, Y: 300}))
	b.point(b.on(geo.XY{X: 0, Y: -300}))
	b.point(b.on(geo.XY{X: 0, Y: -400}))
	if len(p.at) != 5 || !strings.Contains(b.cardWords(), "No more than 5") {
		t.Errorf("%d masts, the card says %q", len(p.at), b.cardWords())
	}
	for range 5 {
		b.keys(fyne.KeyTab, fyne.KeyBackspace)
	}
	b.keys(fyne.KeyReturn)
	if len(*told) != 0 || !strings.Contains(b.cardWords(), "At least 1 mast") {
		t.Errorf("told %v, the card says %q", *told, b.cardWords())
	}
	b.keys(fyne.KeyTab) // with none there
	b.keys(fyne.KeyEscape)
	if len(*told) != 1 || (*told)[0] != nil || b.m.Sketching() {
		t.Errorf("told %v", *told)
	}
	if b.m.TakeBack() || b.m.BringBack() {
		t.Error("afterwards, changes are taken back here")
	}
}

// All of it goes by keys: Tab from one to the next, arrows in steps of the map's width, with shift by a metre, Space
// for one more under the cross.
func TestPointsByKeys(t *testing.T) {
	b := lay(t, squares(t, 10), 600, 500)
	if b.m.AcceptsTab() {
		t.Error("Tab does not leave the map")
	}
	told := b.moving(three...)
	p := b.m.points.now
	if !b.m.AcceptsTab() {
		t.Error("Tab leaves the map")
	}
	b.keys(fyne.KeyTab, fyne.KeyTab)
	b.shifted(fyne.KeyTab, fyne.KeyTab)
	if p.chosen != 2 {
		t.Fatalf("chosen is %d", p.chosen)
	}
	step := 600 * b.m.View().MPerUnit / 200
	b.keys(fyne.KeyRight, fyne.KeyRight, fyne.KeyUp)
	b.shifted(fyne.KeyLeft, fyne.KeyDown)
	near(t, "mast 3", metres(p.places())[2], geo.XY{X: three[2].X + 2*step - 1, Y: three[2].Y + step - 1}, 0.01)
	b.m.TakeBack() // steps of one point are one change
	if !slices.Equal(p.places(), p.Start) {
		t.Error("the steps are not taken back together")
	}
	// A point that leaves the view takes the map along.
	b.m.CentreOn(p.places()[2], b.m.View().MPerUnit/4)
	b.keys(fyne.KeyTab)
	for i := range p.at {
		b.keys(fyne.KeyTab)
		if at := b.m.screen(p.at[(i+1)%3].at); at.X < 20 || at.Y < 20 || at.X > 580 || at.Y > 480 {
			t.Errorf("mast %d is at %v, out of view", i, at)
		}
	}
	for range 300 {
		b.keys(fyne.KeyLeft)
	}
	if at := b.m.screen(p.at[p.chosen].at); at.X < 20 {
		t.Errorf("it went out of view, to %v", at)
	}
	b.m.TakeBack()
	b.m.CentreOn(geo.LonLat{Lon: -27, Lat: 47.5}, 0)
	b.keys(fyne.KeySpace)
	if len(p.at) != 3 || !b.m.keyed || p.chosen != -1 {
		t.Fatal("Space does not show the cross first")
	}
	view := b.m.View()
	b.keys(fyne.KeyLeft, fyne.KeySpace)
	if len(p.at) != 4 || p.chosen != 3 {
		t.Fatalf("%d masts, chosen %d", len(p.at), p.chosen)
	}
	near(t, "the new mast", metres(p.places())[3], geo.XY{X: metres([]geo.LonLat{view.Centre})[0].X - 80*view.MPerUnit}, view.MPerUnit)
	b.keys(fyne.KeyEnter)
	if len(*told) != 1 || len((*told)[0]) != 4 {
		t.Errorf("told %v", *told)
	}
}

// A double click ends it, without the point that its first click placed; Escape and anything else that is begun
// leave all as it was.
func TestPointsEnd(t *testing.T) {
	b := lay(t, squares(t, 10), 600, 500)
	view := b.m.View()
	for _, how := range []string{"free ground", "mast", "escape", "sketch", "others", "button", "leave"} {
		told := b.moving(three...)
		b.drag(b.on(three[0]), b.on(geo.XY{X: -250, Y: -250}))
		switch how {
		case "free ground":
			b.twice(b.on(geo.XY{X: 0, Y: -300}))
		case "mast":
			b.twice(b.on(three[1]))
		case "escape":
			b.keys(fyne.KeyEscape)
		case "sketch":
			b.sketching(geo.Points, nil)
			b.m.GiveUp()
		case "others":
			b.moving(three...)
			b.m.GiveUp()
		case "button":
			b.m.EndPoints(true)
		case "leave":
			b.m.EndPoints(false)
			b.m.EndPoints(true)
		}
		want := 0
		if how == "free ground" || how == "mast" || how == "button" {
			want = 3
		}
		if len(*told) != 1 || len((*told)[0]) != want || b.m.Sketching() || b.m.View() != view {
			t.Errorf("%s: told %v", how, *told)
		}
	}
	if len(b.selected) != 0 {
		t.Errorf("selected %v", b.selected)
	}
}

// The pointer over a point shows its words; moving the pointer alone asks nothing of Check.
func TestPointsUnderThePointer(t *testing.T) {
	b := lay(t, squares(t, 10), 600, 500)
	b.moving(three...)
	asked := 0
	check := b.m.points.now.Check
	b.m.points.now.Check = func(at []geo.LonLat) []string { asked++; return check(at) }
	b.m.MouseMoved(&desktop.MouseEvent{PointEvent: fyne.PointEvent{Position: b.on(three[1])}})
	if w := b.besideWords(); !strings.HasPrefix(w, "Mast 2\n3.9 mast widths, 391 m, to the nearest, mast 1") {
		t.Errorf("beside it stands %q", w)
	}
	b.m.MouseMoved(&desktop.MouseEvent{PointEvent: fyne.PointEvent{Position: b.on(geo.XY{})}})
	if b.besideWords() != "" || asked != 0 || b.m.hover.box.Visible() {
		t.Errorf("beside nothing stands %q; asked %d times", b.besideWords(), asked)
	}
	if id := b.m.ParcelAt(tiles.NewPlane(geo.LonLat{Lon: -27, Lat: 47.5}).From(geo.XY{X: -100, Y: -300})); id == "" {
		t.Error("there is no parcel where there is one")
	}
	if r := b.m.points.rings[0]; !r.Hidden {
		t.Error("a ring is drawn without a chosen mast")
	}
	b.keys(fyne.KeyTab)
	if r := b.m.points.rings[0]; r.Hidden || math.Abs(float64(r.Size().Width)*b.m.View().MPerUnit-500) > 5*b.m.View().MPerUnit {
		t.Errorf("the ring is %v wide", r.Size().Width)
	}
	// The card hides neither its own mast nor another one, while there is room.
	for i := range 3 {
		c, size := b.m.points.beside.box.Position(), b.m.points.beside.size
		for j, p := range b.m.points.now.at {
			if q := b.m.screen(p.at); q.X > c.X-9 && q.X < c.X+size.Width+9 && q.Y > c.Y-9 && q.Y < c.Y+size.Height+9 {
				t.Errorf("the card of mast %d lies over mast %d", i+1, j+1)
			}
		}
		b.keys(fyne.KeyTab)
	}
	b.keys(fyne.KeyTab, fyne.KeyTab, fyne.KeyTab)
	b.m.SetLook(tiles.DarkLook())
	if h := b.m.points.marks[0]; h.disc.FillColor != tiles.DarkLook().Ink {
		t.Error("the masts do not follow the look")
	}
}
