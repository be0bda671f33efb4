package accounts

import (
	"strings"
	"testing"

	"fyne.io/fyne/v2"

	"groundtally/app/desk/core"
	"groundtally/app/desk/desktest"
	"groundtally/app/desk/theme"
	"groundtally/app/run"
	"groundtally/app/study"
)

// The pictures are those of the first chosen candidate; the newest choice wins; two stand side by side; what is not
// entered is said in words.
func TestAccountsInPictures(t *testing.T) {
	b, s := open(t, 20, 620, 900)
	b.Core.Choose()
	s.tabs.Choose(2)
	p := s.pictured
	if p == nil || !strings.Contains(p.said.Text, "Choose a candidate") {
		t.Fatal("without a candidate it does not ask for one")
	}
	var two []*run.Candidate
	cands := b.Core.View().Results.Candidates
	for i := range cands {
		if c := &cands[i]; c.Status == run.Fitted && (len(two) == 0 || c.Site != two[0].Site) {
			if two = append(two, c); len(two) == 2 {
				break
			}
		}
	}
	titled := func(one *part, words ...string) bool {
		scene := one.picture.Scene()
		if scene == nil {
			return false
		}
		for _, w := range words {
			if !strings.Contains(scene.Title, w) {
				return false
			}
		}
		return true
	}
	b.Core.Choose(two[0].ID())
	if p.said.Text != "…" {
		t.Errorf("until it is known it says %q", p.said.Text)
	}
	b.Core.Choose(two[1].ID())
	b.Until("the pictures are there", func() bool { return p.ladder.all.Visible() && !p.running })
	for _, one := range []*part{p.ladder, p.horizon, p.land, p.payback, p.moving} {
		if !one.all.Visible() || !titled(one, " of "+two[1].Site) && !titled(one, " by "+two[1].Site) {
			t.Errorf("a picture is missing or of another candidate: %+v", one.picture.Scene())
		}
	}
	if p.pair.all.Visible() || p.pair.picture.Scene() != nil {
		t.Error("one candidate stands beside nothing")
	}
	if !strings.HasPrefix(p.horizon.words.Text, "On a horizon of 60 years") || !titled(p.horizon, "after 60 yr") {
		t.Errorf("on the common horizon it says %q", p.horizon.words.Text)
	}
	if p.primary.all.Visible() || p.primary.picture.Scene() != nil || p.also.Checked {
		t.Error("the primary equivalent is shown unasked")
	}
	b.Core.Choose(two[0].ID(), two[1].ID())
	b.Until("two are side by side", func() bool { return p.pair.picture.Scene() != nil })
	b.Window.Resize(fyne.NewSize(620, 3200))
	b.Until("all is painted", func() bool {
		for _, one := range p.parts() {
			if one == p.primary {
				continue
			}
			scene := one.picture.Scene()
			if scene == nil || one.picture.Painted().Bounds().Dx() < int(scene.Width) {
				return false
			}
		}
		return true
	})
	b.Shoot("accounts-pictures-620")

	*b.Theme = *theme.New(theme.Dark)
	b.App.Settings().SetTheme(b.Theme)
	b.Core.Emit(core.LookChanged)
	b.Until("all is painted dark", func() bool {
		for _, one := range p.parts() {
			if one == p.primary {
				continue
			}
			if r, _, _, _ := one.picture.Painted().At(1, 1).RGBA(); r > 0x8000 {
				return false
			}
		}
		return true
	})
	desktest.Save(t, "accounts-pictures-620-painted-dark.png", b.Window.Canvas().Capture())

	p.key.SetSelectedIndex(1)
	b.Until("what moves greenhouse gas is there", func() bool { return titled(p.moving, b.Core.Info("ghg_g_per_kwh").Title) })
	// Without a grid factor nothing is displaced, and so nothing moves the payback.
	b.Core.Set("no grid factor", "test", study.SettingEdit{Key: "climate.grid_factor_g_per_kwh", Value: "not set"})
	settled(b, s)
	b.Until("the payback is not set", func() bool { return !p.running && titled(p.payback, "not set") })
	p.key.SetSelectedIndex(3)
	b.Until("the other consequence is there", func() bool { return !p.running && p.moving.words.Text != "…" })
	if p.moving.picture.Scene() != nil || !strings.Contains(p.moving.words.Text, "not set") {
		t.Errorf("it says %q", p.moving.words.Text)
	}
	b.Core.Choose()
	if p.ladder.all.Visible() || p.ladder.picture.Scene() != nil {
		t.Error("pictures of nobody stay")
	}
}

// The primary equivalent stands on an axis of its own while the study asks for it, by the grid efficiency of the study.
func TestPrimaryEquivalentHasItsOwnPicture(t *testing.T) {
	b, s := open(t, 20, 620, 900)
	s.tabs.Choose(2)
	p := s.pictured
	var id string
	for i := range b.Core.View().Results.Candidates {
		if c := &b.Core.View().Results.Candidates[i]; c.Status == run.Fitted {
			id = c.ID()
			break
		}
	}
	b.Core.Choose(id)
	b.Until("the ladder is there", func() bool { return p.ladder.picture.Scene() != nil && !p.running })
	electric := p.ladder.picture.Scene().Title
	p.also.SetChecked(true)
	settled(b, s)
	b.Until("the second ladder is there", func() bool { return p.primary.picture.Scene() != nil && !p.running })
	if v := b.Core.View(); v.Snap.Text("energy.primary_equivalent") != "on" || !p.also.Checked || !p.primary.all.Visible() {
		t.Error("the study does not say so, or the picture is hidden")
	}
	got := p.primary.picture.Scene().Title
	if !strings.Contains(got, "primary equivalent out, at a grid efficiency of 0.35") || strings.Contains(got, "with stocks") || !strings.Contains(electric, "with stocks") || p.ladder.picture.Scene().Title != electric {
		t.Errorf("one says %q, the other %q", electric, got)
	}
	b.Window.Resize(fyne.NewSize(620, 1700))
	b.Until("both are painted", func() bool {
		return p.primary.picture.Painted().Bounds().Dx() > 500 && p.horizon.picture.Painted().Bounds().Dx() > 500
	})
	b.Shoot("accounts-primary-620")
	b.Core.Set("another grid", "test", study.SettingEdit{Key: "inventory.grid_efficiency.central", Value: "0.42"})
	settled(b, s)
	b.Until("the other efficiency is told", func() bool {
		return !p.running && p.primary.picture.Scene() != nil && strings.Contains(p.primary.picture.Scene().Title, "0.42")
	})
	b.Core.Undo()
	settled(b, s)
	b.Core.Undo()
	settled(b, s)
	b.Until("the second ladder is gone", func() bool {
		return !p.running && p.ladder.picture.Scene() != nil && p.primary.picture.Scene() == nil && !p.primary.all.Visible() && !p.also.Checked
	})
}
