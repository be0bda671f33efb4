package strip

import (
	"strings"
	"testing"

	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/test"

	"groundtally/app/desk/desktest"
)

// Every consequence has its cell; a tap unfolds it down to its sources; the strip cannot be shut.
func TestStripShowsAndUnfolds(t *testing.T) {
	b := desktest.New(t, 60)
	s := New(b.Core)
	b.Show(s, 1200, 240)
	b.Settle()
	if got, want := len(s.grid.cells), len(b.Core.Parts.Params.Keys()); got != want {
		t.Fatalf("%d cells for %d consequences", got, want)
	}
	if len(b.Core.Chosen()) != 1 {
		t.Fatal("the first of the order is not chosen")
	}
	b.Shoot("strip-one")
	for i := range s.grid.cells {
		c := &s.grid.cells[i]
		if c.at.X < 0 || c.at.X+s.grid.wide() > s.grid.Size().Width+1 {
			t.Errorf("cell %s lies outside the strip", c.info.Key)
		}
		for j := range s.grid.cells[:i] {
			o := &s.grid.cells[j]
			if o.at.X < c.at.X+s.grid.wide() && c.at.X < o.at.X+s.grid.wide() && o.at.Y < c.at.Y+s.grid.rowHeight() && c.at.Y < o.at.Y+s.grid.rowHeight() {
				t.Fatalf("cells %s and %s overlap", c.info.Key, o.info.Key)
			}
		}
	}
	at := -1
	for i, c := range s.grid.cells {
		if c.info.Key == "eroi_delivered" {
			at = i
		}
	}
	test.TapAt(s.grid, s.grid.cells[at].at.AddXY(4, 4))
	b.Until("it is unfolded", func() bool { return len(s.unfold.rows) > 5 })
	all := ""
	for _, r := range s.unfold.rows {
		all += r.title + r.value + r.formula + r.source + "\n"
	}
	for _, want := range []string{"eroi_delivered = ", "source: ", "P10 to P90"} {
		if !strings.Contains(all, want) {
			t.Errorf("the unfolding has no %q:\n%s", want, all)
		}
	}
	b.Show(s, 1200, 420)
	b.Shoot("strip-unfolded")
	s.fold()
	if s.MinSize().Height < 100 {
		t.Error("the strip can be shut")
	}
}

// Up to four candidates stand side by side, each with place and score.
func TestStripFour(t *testing.T) {
	b := desktest.New(t, 60)
	s := New(b.Core)
	b.Show(s, 1366, 260)
	b.Settle()
	r := b.Core.Ranking()
	n := 0
	for _, item := range r.Standing.Order {
		if r.Board.At[item] >= 0 && n < 4 {
			if n > 0 {
				b.Core.Toggle(r.Board.IDs[item])
			}
			n++
		}
	}
	if len(b.Core.Chosen()) != 4 || len(s.grid.cells[0].values) != 4 {
		t.Fatalf("%d chosen, %d values in a cell", len(b.Core.Chosen()), len(s.grid.cells[0].values))
	}
	for i, cand := range b.Core.Chosen() {
		if got := s.score(cand, false); !strings.Contains(got, "score ") {
			t.Errorf("candidate %d stands without its score: %q", i, got)
		}
	}
	b.Shoot("strip-four")
}

// The keyboard moves between consequences and unfolds one.
func TestStripKeyboard(t *testing.T) {
	b := desktest.New(t, 60)
	s := New(b.Core)
	b.Show(s, 1200, 240)
	b.Settle()
	b.Window.Canvas().Focus(s.grid)
	from := s.grid.cursor
	s.grid.TypedKey(&fyne.KeyEvent{Name: fyne.KeyDown})
	if s.grid.cursor == from {
		t.Error("the arrow did not move")
	}
	s.grid.TypedKey(&fyne.KeyEvent{Name: fyne.KeyReturn})
	b.Until("it is unfolded", func() bool { return len(s.unfold.rows) > 0 })
}
