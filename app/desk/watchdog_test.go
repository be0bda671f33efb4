package desk

import (
	"runtime"
	"runtime/debug"
	"testing"
	"time"

	"fyne.io/fyne/v2"

	"groundtally/app/study"
)

// blocked is the longest that a call of ours may keep the window from answering.
const blocked = 100 * time.Millisecond

// No call of ours keeps the window from answering: whatever is done, every piece of work on the window's
// goroutine is short.
func TestNothingBlocksTheWindow(t *testing.T) {
	s := open(t, 4)
	// The collector makes whoever allocates help it, in turns that chance deals out. Here our own work counts.
	defer debug.SetGCPercent(debug.SetGCPercent(-1))
	runtime.GC()
	n := 0
	did := func(what string, do func()) {
		t.Helper()
		if n++; n%25 == 0 {
			runtime.GC()
		}
		s.Longest = 0
		s.Call(do)
		s.settle()
		if s.Longest > blocked {
			t.Errorf("%s: a call took %v of the window's goroutine", what, s.Longest.Round(time.Millisecond))
		} else {
			t.Logf("%s: %v", what, s.Longest.Round(100*time.Microsecond))
		}
	}
	for i, st := range s.w.stages {
		did("open "+st.Title(), func() { s.w.choose(i) })
	}
	c := s.w.core
	ids := c.Ranking().Board.IDs
	for n := range 4 {
		did("choose another candidate", func() { c.Toggle(ids[n*7]) })
	}
	for i := range s.w.stages {
		did("choose one beside "+s.w.stages[i].Title(), func() { s.w.choose(i); c.Choose(ids[i*11]) })
		raw := c.Raw()
		for step := range 10 {
			raw[0] = float64(5 + 9*step)
			did("drag a weight beside "+s.w.stages[i].Title(), func() { c.Try(raw) })
		}
		did("let the weight go", c.SaveWeights)
	}
	did("shade by a consequence", func() { c.SetShade("connection_km") })
	did("another voice", func() { c.SetVoice("operator") })
	did("change a rule", func() {
		c.Set("set the rule", "test", study.SettingEdit{Key: "rule.setback.dwellings.solar_m", Value: "77"})
	})
	did("undo", c.Undo)
	s.w.switchLook() // the toolkit gives every object its new colours in this one call
	did("follow the look", func() {})
	did("unfold", func() { s.w.strip.SetHigh(true) })
	m := s.w.picture.m
	for range 30 {
		did("zoom and pan", func() {
			m.Scrolled(&fyne.ScrollEvent{PointEvent: fyne.PointEvent{Position: fyne.NewPos(200, 150)}, Scrolled: fyne.NewDelta(0, 25)})
			m.Dragged(&fyne.DragEvent{Dragged: fyne.NewDelta(40, 20)})
			m.DragEnd()
		})
	}
}
