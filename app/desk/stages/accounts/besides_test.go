package accounts

import (
	"strings"
	"testing"

	"fyne.io/fyne/v2"

	"groundtally/app/desk/widgets"
	"groundtally/app/present"
	"groundtally/app/study"
)

// The table holds what the results say of what stands beside, and the chosen candidate next to it.
func TestBesideTable(t *testing.T) {
	b, s := open(t, 60, 640, 480)
	s.tabs.Choose(besideTab)
	b.Settle()
	rows := func() map[string][]string {
		out := map[string][]string{}
		for _, o := range s.beside.rows.Objects {
			c, ok := o.(*fyne.Container)
			if !ok {
				continue
			}
			var texts []string
			for _, x := range c.Objects {
				if l, ok := x.(*widgets.Line); ok {
					texts = append(texts, l.Text)
				}
			}
			if len(texts) > 2 {
				out[texts[0]] = texts[2:]
			}
		}
		return out
	}
	r := b.Core.View().Results
	saving := r.Alternatives[0].Consequence("delivered_mwh_per_yr")
	sealed := r.Alternatives[1].Consequence("delivered_mwh_per_yr")
	title := b.Core.Info("delivered_mwh_per_yr").Title
	if got := rows()[title]; len(got) < 3 || got[0] != "none" || got[1] != present.Cell(saving) || got[2] != present.Cell(sealed) {
		t.Fatalf("%s: %v, want %s and %s", title, got, present.Cell(saving), present.Cell(sealed))
	}
	var id string
	for i := range r.Candidates {
		if q, ok := r.Candidates[i].Consequence("delivered_mwh_per_yr"); ok && q.Central > 0 {
			id = r.Candidates[i].ID()
			b.Core.Choose(id)
			b.Pump()
			if got := rows()[title]; len(got) != 4 || got[3] != present.Cell(q) {
				t.Errorf("beside %s: %v, want %s", id, got, present.Cell(q))
			}
			break
		}
	}
	b.Core.Set("test", "test", study.SettingEdit{Key: "saving.same_as", Value: id})
	b.Settle()
	if got := rows()[title]; got[1] != got[3] {
		t.Errorf("the saving that equals %s gives %s, it gives %s", id, got[1], got[3])
	}
	b.Core.Set("test", "test", study.SettingEdit{Key: "saving.same_as", Value: "nowhere/wind"})
	b.Settle()
	if got := rows()[title]; got[1] != "unknown" || !strings.Contains(present.Reason(b.Core.View().Results.Alternatives[0].Unknown), "no such candidate") {
		t.Errorf("a saving that equals nothing gives %v", got)
	}
}
