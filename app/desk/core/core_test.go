package core_test

import (
	"context"
	"errors"
	"slices"
	"testing"

	"groundtally/app/desk/desktest"
	"groundtally/app/program"
	"groundtally/app/study"
)

// The weights of the study give its order; others are tried out without being saved, then saved.
func TestTryAndSaveWeights(t *testing.T) {
	b := desktest.New(t, 60)
	b.Settle()
	c := b.Core
	c.SetVoice("farmers")
	b.Settle()
	if c.Order() == nil || c.Ranking() == nil {
		t.Fatal("no order")
	}
	before := len(c.View().Journal)
	first := c.Ranking().Standing.Order[0]
	raw := c.Raw()
	for i := range raw {
		raw[i] = 0
	}
	raw[len(raw)-1] = 100
	c.Try(raw)
	b.Until("other weights give an order", func() bool { return c.Ranking().Raw[len(raw)-1] == 100 })
	if !c.Trying() || c.Order() != nil {
		t.Error("weights that are tried out pass for the saved ones")
	}
	if len(c.View().Journal) != before {
		t.Error("trying out was saved")
	}
	c.SaveWeights()
	b.Settle()
	if len(c.View().Journal) != before+1 || c.Trying() {
		t.Errorf("saving made %d entries", len(c.View().Journal)-before)
	}
	saved := c.View().Board.Raw(c.View().Snap, "farmers")
	if o := c.Order(); o == nil || !slices.Equal(saved, raw) || o.Order[0].Score != c.Ranking().Standing.Score[c.Ranking().Standing.Order[0]] {
		t.Fatalf("after saving %v the study has %v", raw, saved)
	}
	c.Undo()
	b.Settle()
	if got := c.Ranking().Standing.Order[0]; got != first {
		t.Errorf("after undo item %d leads, before it was %d", got, first)
	}
}

// An edit makes the results out of date, computing brings them up to date.
func TestEditIsComputed(t *testing.T) {
	b := desktest.New(t, 60)
	b.Settle()
	code := b.Core.View().Results.Code
	b.Core.Set("set the rule", "test", study.SettingEdit{Key: "rule.setback.dwellings.wind_m", Value: "900"})
	b.Until("the edit is seen", func() bool { return !b.Core.View().Current })
	b.Settle()
	if b.Core.View().Results.Code == code {
		t.Error("a larger setback changed nothing")
	}
	entries := len(b.Core.View().Journal)
	b.Core.Session.Edit(func(ctx context.Context, s *study.Study) error { panic("broken") }, nil)
	b.Core.Set("set the rule", "test", study.SettingEdit{Key: "rule.setback.dwellings.wind_m", Value: "901"})
	b.Settle()
	if got := len(b.Core.View().Journal); got != entries+1 {
		t.Errorf("after a fault and an edit there are %d new entries", got-entries)
	}
}

// Weights that cannot be saved stay tried out: nothing says that they were saved, and the order shown is
// theirs. Going back shows the saved order.
func TestWeightsThatCannotBeSaved(t *testing.T) {
	b := desktest.Over(t, &broken{Store: desktest.Sample(t, must(t), 60)})
	b.Settle()
	c := b.Core
	first := c.Raw()
	raw := slices.Clone(first)
	raw[0] += 13
	c.Try(raw)
	c.SaveWeights()
	b.Until("the failure is told", func() bool { return len(b.Window.Canvas().Overlays().List()) > 0 })
	b.Settle()
	if !c.Trying() || !slices.Equal(c.Ranking().Raw, raw) {
		t.Errorf("weights that could not be saved: tried out %v, the order is of %v", c.Trying(), c.Ranking().Raw)
	}
	c.Back()
	b.Until("the saved order is back", func() bool { return c.Ranking() != nil && slices.Equal(c.Ranking().Raw, first) })
}

// broken is a store that takes no edit.
type broken struct{ study.Store }

func (b *broken) Commit(context.Context, study.Entry, []study.Version) (study.Entry, error) {
	return study.Entry{}, errors.New("broken")
}

func must(t *testing.T) *program.Parts {
	t.Helper()
	p, err := desktest.Parts()
	if err != nil {
		t.Fatal(err)
	}
	return p
}
