package mapview

import (
	"math"
	"strings"
	"testing"
	"time"

	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/driver/desktop"

	"groundtally/app/draw/tiles"
	"groundtally/geo"
)

// sketching begins to draw and gives what the map tells.
func (b *table) sketching(kind geo.Kind, from *geo.LonLat) (told *[][]geo.LonLat) {
	told = new([][]geo.LonLat)
	b.m.Sketch(Sketch{Kind: kind, Words: "Draw it", From: from, Done: func(at []geo.LonLat, nearM float64) {
		*told = append(*told, at)
		if want := 10 * b.m.View().MPerUnit; nearM != want {
			b.t.Errorf("near is %v m, want %v", nearM, want)
		}
	}})
	return told
}

func (b *table) point(at fyne.Position) {
	b.m.MouseMoved(&desktop.MouseEvent{PointEvent: fyne.PointEvent{Position: at}})
	b.click(at, 0)
}

func (b *table) twice(at fyne.Position) {
	e := &desktop.MouseEvent{PointEvent: fyne.PointEvent{Position: at}, Button: desktop.MouseButtonPrimary}
	for range 2 {
		b.m.MouseDown(e)
		b.m.MouseUp(e)
	}
	b.m.DoubleTapped(&e.PointEvent)
}

func (b *table) keys(names ...fyne.KeyName) {
	for _, n := range names {
		b.m.TypedKey(&fyne.KeyEvent{Name: n})
	}
}

func (b *table) cardWords() string {
	if !b.m.drawn.card.box.Visible() {
		return ""
	}
	var out []string
	for _, c := range []*card{b.m.drawn.card, b.m.hover} {
		for _, t := range c.lines {
			if c.box.Visible() && t.Visible() {
				out = append(out, t.Text)
			}
		}
	}
	return strings.Join(out, "\n")
}

// metres gives the places of a shape in the test's plane.
func metres(ps []geo.LonLat) (out []geo.XY) {
	plane := tiles.NewPlane(geo.LonLat{Lon: -27, Lat: 47.5})
	for _, p := range ps {
		out = append(out, plane.To(p))
	}
	return out
}

// A point is one click, where it was clicked; nothing is selected by it.
func TestSketchPoint(t *testing.T) {
	b := lay(t, squares(t, 10), 600, 500)
	told := b.sketching(geo.Points, nil)
	if !strings.Contains(b.cardWords(), "Draw it") || b.w.Canvas().Focused() != fyne.Focusable(b.m) {
		t.Errorf("the card says %q", b.cardWords())
	}
	b.point(b.at("P34"))
	if len(*told) != 1 || len((*told)[0]) != 1 || b.m.Sketching() || b.cardWords() != "" || b.m.hover.box.Visible() || len(b.selected) != 0 {
		t.Fatalf("told %v, selected %v, the card says %q", *told, b.selected, b.cardWords())
	}
	// P34 is the fifth of the fourth row: its middle lies 100 m west and 300 m south.
	if p := metres((*told)[0])[0]; math.Hypot(p.X+100, p.Y+300) > 3 {
		t.Errorf("the point is at %v", p)
	}
	b.point(b.at("P35"))
	if len(b.selected) != 1 {
		t.Errorf("after it, a click selects %v", b.selected)
	}
}

// A line ends with Enter or a double click, without the map being fitted; its length stands beside it, a point can
// be taken back.
func TestSketchLine(t *testing.T) {
	b := lay(t, squares(t, 10), 600, 500)
	told := b.sketching(geo.Lines, nil)
	b.keys(fyne.KeyReturn)
	b.point(b.at("P30"))
	b.keys(fyne.KeyReturn) // one point is no line
	b.point(b.at("P99"))
	b.keys(fyne.KeyBackspace)
	b.point(b.at("P33"))
	if !strings.Contains(b.cardWords(), "600 m") {
		t.Errorf("the card says %q", b.cardWords())
	}
	b.point(b.at("P63"))
	if !strings.Contains(b.cardWords(), "1.20 km") || !b.m.Sketching() {
		t.Errorf("the card says %q", b.cardWords())
	}
	b.keys(fyne.KeyReturn)
	if len(*told) != 1 || len((*told)[0]) != 3 {
		t.Fatalf("told %v", *told)
	}
	if p := metres((*told)[0]); math.Abs(p[0].Dist(p[1])-600) > 5 || math.Abs(p[1].Dist(p[2])-600) > 5 {
		t.Errorf("the line is %v", p)
	}
	told = b.sketching(geo.Lines, nil)
	b.m.zoom(-4, b.m.middle())
	view := b.m.View()
	b.point(b.at("P44"))
	b.twice(b.at("P46"))
	if len(*told) != 1 || len((*told)[0]) != 2 || b.m.View() != view {
		t.Errorf("told %v, the view went from %v to %v", *told, view, b.m.View())
	}
	b.m.drawn.ended = time.Time{}
	b.m.DoubleTapped(nil)
	if b.m.View() == view {
		t.Error("a double click fits no longer")
	}
}

// An outline closes with Enter or a click on its first point, and tells its area; Escape gives up.
func TestSketchOutline(t *testing.T) {
	b := lay(t, squares(t, 10), 600, 500)
	for _, how := range []string{"enter", "first point", "escape", "another"} {
		told := b.sketching(geo.Polygons, nil)
		b.point(b.at("P22"))
		b.point(b.at("P27"))
		b.keys(fyne.KeyReturn) // two points enclose nothing
		if len(*told) != 0 {
			t.Fatalf("two points are told as %v", *told)
		}
		b.point(b.at("P77"))
		b.point(b.at("P72"))
		if w := b.cardWords(); !strings.Contains(w, " km around") || !strings.Contains(w, "100.") && !strings.Contains(w, "99.") {
			t.Errorf("the card says %q", b.cardWords())
		}
		switch how {
		case "enter":
			b.keys(fyne.KeyReturn)
		case "first point":
			b.point(b.at("P22").AddXY(4, -4))
		case "escape":
			b.keys(fyne.KeyEscape)
		case "another":
			b.sketching(geo.Points, nil)
			b.m.GiveUp()
		}
		want := 5
		if how == "escape" || how == "another" {
			want = 0
		}
		if len(*told) != 1 || len((*told)[0]) != want || want > 0 && (*told)[0][0] != (*told)[0][4] {
			t.Errorf("%s: told %v", how, *told)
		}
	}
	if len(b.selected) != 0 {
		t.Errorf("selected %v", b.selected)
	}
}

// All of it can be done by keys: arrows move the cross, shift in small steps, Space sets a point.
func TestSketchByKeys(t *testing.T) {
	b := lay(t, squares(t, 10), 600, 500)
	from := b.m.View().Centre
	told := b.sketching(geo.Lines, &from)
	b.keys(fyne.KeySpace) // it shows the cross first
	b.keys(fyne.KeySpace, fyne.KeyRight)
	b.m.KeyDown(&fyne.KeyEvent{Name: desktop.KeyShiftLeft})
	b.keys(fyne.KeyUp)
	b.m.KeyUp(&fyne.KeyEvent{Name: desktop.KeyShiftLeft})
	b.keys(fyne.KeySpace, fyne.KeyReturn)
	if len(*told) != 1 || len((*told)[0]) != 2 {
		t.Fatalf("told %v", *told)
	}
	p, unit := metres((*told)[0]), b.m.View().MPerUnit
	if dx, dy := p[1].X-p[0].X, p[1].Y-p[0].Y; math.Abs(dx-80*unit) > unit || math.Abs(dy-8*unit) > unit {
		t.Errorf("the line goes %v, %v m, want %v, %v", dx, dy, 80*unit, 8*unit)
	}
}
