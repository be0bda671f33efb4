package weigh

import (
	"math"
	"strings"
	"testing"

	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/test"
	"fyne.io/fyne/v2/widget"

	"groundtally/app/study"
)

// The slider spares no less as it moves on, keeps its share in the study when let go, and goes back on escape.
func TestSavingSlider(t *testing.T) {
	b, s := open(t, 20, 560, 640)
	s.tabs.Choose(besidesTab)
	p := s.panes[besidesTab].(*besides)
	b.Until("the plan is found", func() bool { return p.plan != nil })
	if !strings.Contains(p.spared.Text, "sites in this order are built") || strings.Contains(p.spared.Text, "spared") {
		t.Errorf("with nothing saved: %q", p.spared.Text)
	}
	if !strings.Contains(p.alternatives.Text, "Saving the same would stand at place") || !strings.Contains(p.alternatives.Text, "Roofs and sealed ground would stand at place") || !strings.Contains(p.alternatives.Text, "Doing nothing stands at place") {
		t.Errorf("beside the candidates: %q", p.alternatives.Text)
	}
	last := 0
	dragTo(b, p.share, 100, 5, func() {
		spared, _, err := p.plan.At(p.share.points / 100)
		if err != nil || len(spared.Sites) < last {
			t.Errorf("at %v %%: %d spared after %d, %v", p.share.points, len(spared.Sites), last, err)
		}
		last = len(spared.Sites)
		if !strings.Contains(p.spared.Text, "are still built") {
			t.Errorf("at %v %%: %q", p.share.points, p.spared.Text)
		}
	})
	settle(b, s)
	b.Until("the plan is found again", func() bool { return p.plan != nil })
	share := func() float64 { x, _ := b.Core.View().Snap.Number("saving.share"); return x }
	if last != len(p.plan.Sites) || share() != 1 {
		t.Errorf("all saved: %d of %d sites spared, %v in the study", last, len(p.plan.Sites), share())
	}
	p.share.TypedKey(&fyne.KeyEvent{Name: fyne.KeyPageDown})
	if p.percent.Text != "90 %" {
		t.Errorf("after page down %q", p.percent.Text)
	}
	p.share.TypedKey(&fyne.KeyEvent{Name: fyne.KeyEscape})
	if p.percent.Text != "100 %" || share() != 1 {
		t.Errorf("after escape %q, %v in the study", p.percent.Text, share())
	}
}

// A gate that is chosen holds back, and says where what it holds would stand.
func TestGatesInTheWindow(t *testing.T) {
	b, s := open(t, 8, 560, 640)
	s.tabs.Choose(besidesTab)
	p := s.panes[besidesTab].(*besides)
	if !strings.Contains(p.held.Text, "No gate holds anything back") {
		t.Errorf("without a gate: %q", p.held.Text)
	}
	var peat *gateRow
	for _, g := range p.gates {
		if g.key == "gate.critical.peat" {
			peat = g
		}
	}
	peat.choice.SetSelected(gateWords[1])
	b.Until("the gate is in force", func() bool {
		o := b.Core.Order()
		return b.Core.View().Snap.Text("gate.critical.peat") == "not_no" && o != nil && len(o.HeldBack) > 0
	})
	settle(b, s)
	o := b.Core.Order()
	if !strings.Contains(p.held.Text, "held back") || !strings.Contains(p.held.Text, b.Core.IDTitle(o.HeldBack[0].ID())) || !strings.Contains(p.held.Text, "mapped peat untouched") {
		t.Errorf("with a gate: %q", p.held.Text)
	}
	if words := s.panes[besidesTab].(*besides).s.shown.Board.Held; len(words) != len(o.HeldBack) {
		t.Errorf("the board holds back %d, the order %d", len(words), len(o.HeldBack))
	}
	b.Core.Undo()
	b.Until("the gate is off again", func() bool { return peat.choice.Selected == gateWords[0] })
}

// Two consequences of one family order nothing until a reason is given, and the window asks for it.
func TestAReasonIsAskedForTwoOfAFamily(t *testing.T) {
	b, s := open(t, 60, 520, 480)
	w := s.panes[weightsTab].(*weights)
	voice := b.Core.Voice()
	b.Core.Set("weigh", "test", study.SettingEdit{Key: "voice." + voice + ".weight.eroi_extended", Value: "20"})
	b.Until("the voice has no order", func() bool { return b.Core.View().Results.Unready[voice] != nil && w.reason.Visible() })
	if !strings.Contains(w.problem.Text, "count the same event (yield)") {
		t.Errorf("it says %q", w.problem.Text)
	}
	test.Tap(under[*widget.Button](w.reason)[0])
	b.Pump()
	entries, press := dialogParts(t, b)
	entries[0].SetText("asked for at the hearing")
	press("Weigh both")
	b.Until("the voice has an order", func() bool {
		return b.Core.View().Results.Unready[voice] == nil && b.Core.Order() != nil && !w.reason.Visible()
	})
	if got := b.Core.View().Snap.Text("voice." + voice + ".both.yield"); got != "asked for at the hearing" {
		t.Errorf("the study keeps %q", got)
	}
	if math.IsNaN(total(b.Core.Raw())) || w.problem.Visible() {
		t.Errorf("it still says %q", w.problem.Text)
	}
}
