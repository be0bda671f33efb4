package core_test

import (
	"context"
	"testing"

	"groundtally/app/desk/desktest"
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
	if o := c.Order(); o == nil || c.Ranking().Board.IDs[c.Ranking().Standing.Order[0]] == "" {
		t.Fatal("no order after saving")
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
	b.Core.Session.Edit(func(ctx context.Context, s *study.Study) error { panic("broken") }, nil)
	b.Settle() // a fault of one edit does not end the session
}
