package plant

import (
	"fmt"
	"strings"
	"testing"

	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/test"

	"groundtally/app/run"
)

// Who is out is listed with the rule that takes most; what would bring one back is found on request.
func TestOut(t *testing.T) {
	b, s := open(t, 60, 520, 480)
	s.background = func(do func()) { do() }
	s.choose("wind")
	s.tabs.Choose(tabOut)
	o := s.out
	b.Until("the register is there", func() bool { return len(o.all) > 0 && strings.Contains(o.head.Text, "are out") })
	b.Shoot("plant-out-520")
	o.filter.SetText("dwellings")
	for _, x := range o.rows {
		if !strings.Contains(outWords(x), "dwellings") {
			t.Errorf("%s: %s", x.Site, outWords(x))
		}
	}
	if want := fmt.Sprintf("%d of the %d candidates", len(o.rows), len(o.all)); len(o.rows) == 0 || len(o.rows) == len(o.all) || !strings.HasPrefix(o.head.Text, want) {
		t.Errorf("with a search the head says %q, want %q", o.head.Text, want)
	}
	o.filter.SetText("nothing is called so")
	if !strings.HasPrefix(o.head.Text, "0 of the ") {
		t.Errorf("where nothing fits, the head says %q", o.head.Text)
	}
	o.filter.SetText("")
	if want := fmt.Sprintf("%d candidates are out", len(o.all)); !strings.HasPrefix(o.head.Text, want) {
		t.Errorf("without a search the head says %q", o.head.Text)
	}
	at := -1
	for i, x := range o.rows {
		if x.Status == run.NoRoom && len(x.Rules) > 0 && !x.Rules[0].TakesAll {
			at = i
			break
		}
	}
	if at < 0 {
		t.Fatal("no site is nearly in")
	}
	o.list.Select(at)
	if got := b.Core.ChosenIDs(); len(got) != 1 || got[0] != o.rows[at].Site+"/wind" {
		t.Errorf("chosen %v", got)
	}
	test.Tap(o.near)
	b.Until("the nearest miss is found", func() bool {
		return o.looking == "" && o.lines.Text != "" && !strings.Contains(o.lines.Text, "Looking")
	})
	if !strings.Contains(o.lines.Text, "Nearest miss:") && !strings.Contains(o.lines.Text, "No change of a single rule") {
		t.Errorf("it says %q", o.lines.Text)
	}
	b.Shoot("plant-out-near-520")
	b.Window.Resize(fyne.NewSize(760, 560))
	b.Shoot("plant-out-760")
	b.Window.Resize(fyne.NewSize(430, 470))
	b.Shoot("plant-out-430")
}
