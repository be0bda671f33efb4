package plant

import (
	"context"
	"slices"
	"strings"
	"testing"

	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/test"

	"groundtally/app/desk/chartview"
	"groundtally/app/desk/core"
	"groundtally/app/desk/desktest"
	"groundtally/app/desk/widgets"
	"groundtally/app/draw/raster"
	"groundtally/app/run"
	"groundtally/app/study"
)

func open(t testing.TB, every int, width, height float32) (*desktest.Bench, *stage) {
	t.Helper()
	b := desktest.New(t, every)
	b.Settle()
	s := newStage(b.Core)
	b.Core.OnChange(s.Changed)
	b.Core.Ask = func(_, _, _ string, then func()) { then() }
	b.Show(s.Content(), width, height)
	settled(b, s)
	return b, s
}

// settled waits until everything is computed and counted.
func settled(b *desktest.Bench, s *stage) {
	b.T.Helper()
	b.Settle()
	b.Until("the options are counted", func() bool {
		s.counter.mu.Lock()
		defer s.counter.mu.Unlock()
		return !s.counter.running && s.of == b.Core.View().Results
	})
	b.Pump()
}

func explicit(b *desktest.Bench, key string) (study.Setting, bool) {
	s, ok := b.Core.View().Snap.Explicit[key]
	return s, ok
}

func TestPictures(t *testing.T) {
	b, s := open(t, 60, 520, 480)
	s.background = func(do func()) { do() } // so that charts are painted before each picture
	s.choose("wind")
	b.Shoot("plant-options-520")
	b.Core.Set("take out", "test", study.SettingEdit{Key: "rule.setback.dwellings.wind_m"}, study.SettingEdit{Key: "limit.noise_night_dba"})
	settled(b, s)
	s.tabs.Choose(tabSizes)
	s.settings.rows["plant.wind.hub_height_m"].entry.SetText("4")
	s.settings.rows["plant.wind.hub_height_m"].commit()
	s.settings.body.ScrollToOffset(fyne.NewPos(0, 300))
	b.Shoot("plant-sizes-520")
	s.tabs.Choose(tabRules)
	b.Shoot("plant-rules-520")
	s.rules.body.ScrollToOffset(fyne.NewPos(0, 700))
	b.Shoot("plant-rules2-520")
	s.tabs.Choose(tabFitted)
	b.Core.Choose(s.of.Candidates[s.tallies["wind"].best].ID())
	painted(b, s)
	b.Shoot("plant-fitted-520")
	b.Window.Resize(fyne.NewSize(760, 560))
	painted(b, s)
	b.Shoot("plant-fitted-760")
	s.fitted.body.ScrollToBottom()
	b.Shoot("plant-fitted2-760")
	s.tabs.Choose(tabOptions)
	b.Shoot("plant-options-760")
	s.tabs.Choose(tabRules)
	b.Shoot("plant-rules-760")
	s.tabs.Choose(tabSizes)
	b.Shoot("plant-sizes-760")
	b.Window.Resize(fyne.NewSize(430, 470))
	b.Shoot("plant-sizes-430")
	s.tabs.Choose(tabOptions)
	b.Shoot("plant-options-430")
	s.ask("")
	b.Shoot("plant-new-430")
}

// painted waits until the charts are painted.
func painted(b *desktest.Bench, s *stage) {
	b.T.Helper()
	b.Until("the charts are painted", func() bool {
		ok := true
		for _, p := range []*chartview.Picture{s.fitted.loss, s.fitted.taken} {
			ok = ok && (p.Scene() == nil || p.Painted().Bounds().Dx() >= int(p.Scene().Width) && p.Painted().Bounds().Dy() >= int(p.Scene().Height)-1)
		}
		return ok
	})
}

func TestOptionsSayWhereTheyFit(t *testing.T) {
	b, s := open(t, 60, 520, 480)
	if first, second, warn := s.State(); first != "7 options" || !strings.HasSuffix(second, "own rules") || warn {
		t.Errorf("the rail says %q, %q, %v", first, second, warn)
	}
	for _, id := range b.Core.View().Snap.Plants() {
		sites, fits := 0, 0
		for _, c := range b.Core.View().Results.Candidates {
			if c.Plant == id {
				sites++
				if c.Status == run.Fitted {
					fits++
				}
			}
		}
		title, n, technology, best := widgets.NewLine(""), widgets.NewLine(""), widgets.NewLine(""), widgets.NewLine("")
		s.line(id, title, n, technology, best)
		if want := "fits on " + core.Count(fits) + " of " + core.Count(sites) + " sites"; n.Text != want || title.Text != b.Core.PlantTitle(id) {
			t.Errorf("%s: %q, %q; want %q", id, title.Text, n.Text, want)
		}
		if fits > 0 && !strings.Contains(best.Text, b.Core.VoiceTitle(b.Core.Voice())) {
			t.Errorf("%s: %q does not say in whose order", id, best.Text)
		}
	}
	s.list.Select(slices.Index(s.ids, "wind"))
	if s.id != "wind" || s.option.Selected != b.Core.PlantTitle("wind") {
		t.Errorf("a tap in the list chooses %q", s.id)
	}
	s.option.SetSelected(b.Core.PlantTitle("solar_agri"))
	if s.id != "solar_agri" {
		t.Errorf("the choice at the top chooses %q", s.id)
	}
	s.chooseBest()
	got := b.Core.Chosen()
	if len(got) != 1 || got[0].Plant != "solar_agri" || got[0].ID() != s.of.Candidates[s.tallies["solar_agri"].best].ID() {
		t.Fatalf("chosen %v", b.Core.ChosenIDs())
	}
	// No other candidate of the option stands higher.
	r := b.Core.Ranking()
	for _, item := range r.Standing.Order {
		if at := r.Board.At[item]; at >= 0 && s.of.Candidates[at].Plant == "solar_agri" {
			if s.of.Candidates[at].ID() != got[0].ID() {
				t.Errorf("%s stands higher", s.of.Candidates[at].ID())
			}
			break
		}
	}
}

func TestNewOption(t *testing.T) {
	b, s := open(t, 60, 520, 480)
	before := len(b.Core.View().Journal)
	a := s.ask("")
	for _, wrong := range []struct{ id, title, technology, says string }{
		{"two words", "Small", "Wind", "letters, digits"},
		{"wind", "Small", "Wind", "already"},
		{"solar", "Small", "Wind", "whole technology"},
		{"farm", "", "Wind", "name"},
	} {
		a.id.SetText(wrong.id)
		a.title.SetText(wrong.title)
		a.technology.SetSelected(wrong.technology)
		a.commit()
		if !a.fault.Visible() || !strings.Contains(a.fault.Text, wrong.says) || a.id.Text != wrong.id {
			t.Errorf("%q is answered with %q", wrong.id, a.fault.Text)
		}
	}
	a.id.SetText("farm")
	a.title.SetText("Farm wind")
	if !a.curveRow.Visible() {
		t.Fatal("wind offers no curve")
	}
	i := slices.IndexFunc(b.Core.Parts.Params.TurbineIDs(), func(id string) bool { return id == "dw100_27_6" })
	curve := b.Core.Parts.Params.Turbines[i]
	a.curve.SetSelected(curve.Name)
	a.commit()
	settled(b, s)
	if got := len(b.Core.View().Journal) - before; got != 1 {
		t.Fatalf("making it wrote %d entries", got)
	}
	for key, want := range map[string]string{"title": "Farm wind", "technology": "wind", "turbine": curve.ID, "rated_kw": "100", "rotor_diameter_m": "27.6", "hub_height_m": "40"} {
		if v, _ := explicit(b, "plant.farm."+key); v.Value != want {
			t.Errorf("%s is %q, want %q", key, v.Value, want)
		}
	}
	if s.id != "farm" || s.tallies["farm"].fitted == 0 {
		t.Errorf("chosen is %q; it fits on %d sites", s.id, s.tallies["farm"].fitted)
	}
}

func TestCopyVaryTakeOutUndo(t *testing.T) {
	b, s := open(t, 60, 520, 480)
	s.tabs.Choose(tabSizes)
	s.choose("wind_large")
	a := s.ask("wind_large")
	a.id.SetText("wind_tall")
	a.title.SetText("Wind 5 MW, tall")
	before := len(b.Core.View().Journal)
	a.commit()
	settled(b, s)
	if got := len(b.Core.View().Journal) - before; got != 1 {
		t.Fatalf("copying wrote %d entries", got)
	}
	snap := b.Core.View().Snap
	n := 0
	for key, v := range snap.Explicit {
		to, ok := renamed(key, "wind_large", "wind_tall")
		if !ok {
			continue
		}
		n++
		got, there := snap.Explicit[to]
		switch {
		case !there:
			t.Errorf("%s was not copied", key)
		case key == "plant.wind_large.title":
			if got.Value != "Wind 5 MW, tall" {
				t.Errorf("the copy is called %q", got.Value)
			}
		case got != v:
			t.Errorf("%s was copied as %+v", key, got)
		}
	}
	if n < 20 {
		t.Errorf("only %d settings were copied", n)
	}
	if !slices.Equal(kinds(b, "wind_large"), kinds(b, "wind_tall")) {
		t.Error("the copy is not fitted as its original")
	}
	if s.id != "wind_tall" {
		t.Errorf("%q is chosen after copying", s.id)
	}
	r := s.settings.rows["plant.wind_tall.hub_height_m"]
	r.entry.SetText("120")
	r.why.SetText("taller tower")
	r.commit()
	settled(b, s)
	if v, _ := explicit(b, "plant.wind_tall.hub_height_m"); v.Value != "120" || v.Reason != "taller tower" {
		t.Errorf("the copy's hub is %+v", v)
	}
	if v, _ := explicit(b, "plant.wind_large.hub_height_m"); v.Value != "90" {
		t.Errorf("the original's hub is %+v", v)
	}
	before = len(b.Core.View().Journal)
	s.takeOut()
	settled(b, s)
	if slices.Contains(b.Core.View().Snap.Plants(), "wind_tall") || len(b.Core.View().Journal) != before+1 {
		t.Error("taking out left the option, or took more than one edit")
	}
	for key := range b.Core.View().Snap.Explicit {
		if of(key, "wind_tall") {
			t.Errorf("%s stays", key)
		}
	}
	if _, there := explicit(b, "rule.setback.dwellings.wind_large_m"); !there {
		t.Error("a rule of another option went with it")
	}
	b.Core.Undo()
	settled(b, s)
	if v, _ := explicit(b, "plant.wind_tall.hub_height_m"); v.Value != "120" {
		t.Error("undo does not bring it back")
	}
}

// kinds lists the outcome of an option on every site.
func kinds(b *desktest.Bench, id string) (out []string) {
	for _, c := range b.Core.View().Results.Candidates {
		if c.Plant == id {
			out = append(out, c.Site+c.Status)
		}
	}
	return out
}

func TestSettingsAreChangedRefusedAndGivenBack(t *testing.T) {
	b, s := open(t, 60, 520, 480)
	s.tabs.Choose(tabSizes)
	s.choose("wind")
	r := s.settings.rows["plant.wind.hub_height_m"]
	before := len(b.Core.View().Journal)
	if r.edit.Visible() || r.unit.Text != "m" {
		t.Errorf("at rest: unit %q, edit %v", r.unit.Text, r.edit.Visible())
	}
	r.entry.SetText("")
	test.Type(r.entry, "4")
	if !r.edit.Visible() {
		t.Fatal("typing offers no way to take it over")
	}
	r.entry.OnSubmitted(r.entry.Text)
	b.Settle()
	if !r.fault.Visible() || !strings.Contains(r.fault.Text, "less than 5 m") || r.entry.Text != "4" || len(b.Core.View().Journal) != before {
		t.Fatalf("a hub of 4 m: %q, field %q, %d entries", r.fault.Text, r.entry.Text, len(b.Core.View().Journal)-before)
	}
	// A change elsewhere does not take away what is typed.
	b.Core.Set("other", "test", study.SettingEdit{Key: "plant.solar_fixed.tilt_deg", Value: "25"})
	settled(b, s)
	if r.entry.Text != "4" {
		t.Errorf("what was typed is lost to %q", r.entry.Text)
	}
	before = len(b.Core.View().Journal)
	r.entry.SetText("95,5")
	test.Type(r.source, "tender")
	test.Type(r.why, "lower tower")
	r.why.OnSubmitted("")
	settled(b, s)
	if v, _ := explicit(b, "plant.wind.hub_height_m"); v.Value != "95.5" || v.Source != "tender" || v.Reason != "lower tower" {
		t.Errorf("the hub is %+v", v)
	}
	if len(b.Core.View().Journal) != before+1 || r.edit.Visible() || r.fault.Visible() {
		t.Errorf("%d entries, edit still open %v", len(b.Core.View().Journal)-before, r.edit.Visible())
	}
	if !strings.Contains(r.origin.Text, "by Tester") || !strings.Contains(r.origin.Text, "tender") || !strings.Contains(r.origin.Text, "lower tower") {
		t.Errorf("the origin reads %q", r.origin.Text)
	}
	along := s.settings.rows["plant.wind.spacing_along_d"]
	test.Tap(along.back)
	settled(b, s)
	if _, own := explicit(b, "plant.wind.spacing_along_d"); own || along.entry.Text != "5" || along.unit.Text != "rotor diameters" {
		t.Errorf("back to the default: own %v, shown %q %q", own, along.entry.Text, along.unit.Text)
	}
	if !strings.Contains(along.origin.Text, "Default") || !strings.Contains(along.origin.Text, "siting handbooks") || along.back.Visible() {
		t.Errorf("the origin of a default reads %q", along.origin.Text)
	}
	along.entry.SetText("6")
	along.giveUp()
	if along.entry.Text != "5" || along.edit.Visible() {
		t.Error("giving up keeps what was typed")
	}
}

// The form shows what the computing reads for a technology, and nothing else.
func TestSettingsFollowTheTechnology(t *testing.T) {
	b, s := open(t, 60, 520, 480)
	s.tabs.Choose(tabSizes)
	has := func(name string) bool { return slices.Contains(s.settings.shown, "plant."+s.id+"."+name) }
	s.choose("solar_vertical")
	for _, name := range []string{"rotor_diameter_m", "tilt_deg", "rotation_max_deg", "tower_clear_m", "fit_machines", "collector_width_m"} {
		if has(name) {
			t.Errorf("upright rows show %s", name)
		}
	}
	for _, name := range []string{"gcr", "azimuth_deg", "bifaciality", "fit_power_kw"} {
		if !has(name) {
			t.Errorf("upright rows do not show %s", name)
		}
	}
	s.choose("wind")
	if has("gcr") || has("fit_power_kw") || !has("turbine") || !has("fit_machines") {
		t.Errorf("wind shows %v", s.settings.shown)
	}
	fit := s.settings.rows["plant.wind.fit"]
	fit.pick.SetSelected("up to a yearly energy")
	fit.commit()
	settled(b, s)
	r := s.settings.rows["plant.wind.fit_energy_mwh_per_yr"]
	if !has("fit_energy_mwh_per_yr") || r == nil || !strings.HasPrefix(r.unit.Text, "not set") {
		t.Fatal("the number that the fit needs is not asked for")
	}
	r.entry.SetText("9000")
	r.commit()
	settled(b, s)
	if s.tallies["wind"].fitted == 0 {
		t.Error("with the number it fits nowhere")
	}
	curve := s.settings.rows["plant.wind.turbine"]
	curve.pick.SetSelected("generic curve")
	curve.commit()
	settled(b, s)
	if v, _ := explicit(b, "plant.wind.turbine"); v.Value != study.NotSetText {
		t.Errorf("the curve is %q", v.Value)
	}
	for _, d := range b.Core.Parts.Catalog.Definitions {
		if name, ok := strings.CutPrefix(d.Key, "plant.<plant>."); ok && !slices.ContainsFunc(labels, func(l struct{ name, words string }) bool { return l.name == name }) {
			t.Errorf("setting %s has no place in the form", name)
		}
	}
}

// What the form leaves out does not change any result, and what it shows of sizes does.
func TestReadsAgreesWithTheComputing(t *testing.T) {
	b, s := open(t, 200, 520, 480)
	for _, c := range []struct{ id, name, value string }{
		{"solar_vertical", "tilt_deg", "12"}, {"solar_vertical", "collector_width_m", "9"}, {"solar_tracking", "azimuth_deg", "120"}, {"solar_tracking", "tilt_deg", "22"},
		{"wind", "gcr", "0.2"}, {"solar_fixed", "rotor_diameter_m", "99"}, {"solar_fixed", "tower_clear_m", "99"}, {"solar_fixed", "rotation_max_deg", "20"},
		{"solar_vertical", "azimuth_deg", "20"}, {"solar_tracking", "rotation_max_deg", "20"}, {"solar_fixed", "tilt_deg", "5"}, {"wind", "spacing_along_d", "12"}, {"solar_agri", "usable_share", "0.5"},
	} {
		technology, fit := b.Core.View().Snap.Text("plant."+c.id+".technology"), b.Core.View().Snap.Text("plant."+c.id+".fit")
		before := energies(b, c.id)
		b.Core.Set("try", "test", study.SettingEdit{Key: "plant." + c.id + "." + c.name, Value: c.value})
		settled(b, s)
		if changed := !slices.Equal(before, energies(b, c.id)); changed != reads(technology, fit, c.name) {
			t.Errorf("%s: %s changes results: %v, shown: %v", c.id, c.name, changed, reads(technology, fit, c.name))
		}
		b.Core.Undo()
		settled(b, s)
	}
}

func energies(b *desktest.Bench, id string) (out []float64) {
	for _, c := range b.Core.View().Results.Candidates {
		if c.Plant == id {
			for _, key := range []string{"delivered_mwh_per_yr", "rated_kw", "footprint_total_ha"} {
				q, _ := c.Consequence(key)
				out = append(out, q.Central)
			}
		}
	}
	return out
}

func TestRulesAreAddedChangedTakenOut(t *testing.T) {
	b, s := open(t, 60, 520, 480)
	s.tabs.Choose(tabRules)
	s.choose("wind_large")
	r := s.rules.rows["rule.setback.dwellings.wind_large_m"]
	if r == nil || r.entry.Text != "500" {
		t.Fatal("the distance from dwellings is not shown")
	}
	r.entry.SetText("-5")
	r.commit()
	if !r.fault.Visible() || r.entry.Text != "-5" {
		t.Errorf("a distance below zero: %q", r.fault.Text)
	}
	r.entry.SetText("700")
	r.commit()
	settled(b, s)
	if v, _ := explicit(b, "rule.setback.dwellings.wind_large_m"); v.Value != "700" {
		t.Errorf("the distance is %q", v.Value)
	}
	road := s.rules.rows["rule.setback.roads.wind_large_tip"]
	if road == nil || road.unit.Text != "tip heights" || !strings.Contains(road.origin.Text, "168 m") {
		t.Errorf("the distance from roads shows %+v", road)
	}
	// Taking out the option's own lets the general one hold: that of plant.wind, which is named as its technology.
	test.Tap(r.back)
	settled(b, s)
	if _, own := explicit(b, "rule.setback.dwellings.wind_large_m"); own || r.entry.Text != "500" || !strings.Contains(r.origin.Text, "everything named wind") {
		t.Errorf("after taking out: %q, %q", r.entry.Text, r.origin.Text)
	}
	a := s.rules.adds["wind_large"]
	a.commit()
	if !a.fault.Visible() {
		t.Error("an empty form is taken")
	}
	a.role.SetSelected(roleTitle(b.Core.Parts.Catalog, "soil"))
	a.number.SetText("two")
	a.commit()
	if !strings.Contains(a.fault.Text, "not a number") || a.number.Text != "two" {
		t.Errorf("a word for a distance: %q", a.fault.Text)
	}
	before := len(b.Core.View().Journal)
	a.role.SetSelected(roleTitle(b.Core.Parts.Catalog, "substations"))
	a.number.SetText("1,5")
	a.unit.SetSelected("rotor diameters")
	a.source.SetText("operator's letter")
	a.why.SetText("clear of the yard")
	a.commit()
	settled(b, s)
	v, _ := explicit(b, "rule.setback.substations.wind_large_rotor")
	if v.Value != "1.5" || v.Source != "operator's letter" || v.Reason != "clear of the yard" || len(b.Core.View().Journal) != before+1 {
		t.Errorf("the new distance is %+v", v)
	}
	if s.rules.rows["rule.setback.substations.wind_large_rotor"] == nil || a.number.Text != "" {
		t.Error("the new distance is not shown, or the form not emptied")
	}
	slope := s.rules.rows["rule.slope_max.wind_large_deg"]
	slope.entry.SetText("8")
	slope.commit()
	settled(b, s)
	if v, _ := explicit(b, "rule.slope_max.wind_large_deg"); v.Value != "8" {
		t.Errorf("the slope is %+v", v)
	}
	s.rules.more.SetSelected("Farmland")
	if s.rules.more.SelectedIndex() >= 0 {
		t.Error("farmland is offered though a value of the user stands there")
	}
	s.rules.more.SetSelected("Corridors")
	s.rules.addExclusion()
	settled(b, s)
	if !b.Core.View().Snap.Yes("rule.exclude.corridors") || s.rules.rows["rule.exclude.corridors"] == nil {
		t.Error("ground of another kind is not excluded")
	}
	water := s.rules.rows["rule.exclude.water"]
	water.pick.SetSelected("may be built on")
	water.commit()
	settled(b, s)
	if b.Core.View().Snap.Yes("rule.exclude.water") {
		t.Error("water stays excluded")
	}
}

// What the rules tab says is in force is what the computing keeps to.
func TestCascadeAgreesWithTheComputing(t *testing.T) {
	b, s := open(t, 60, 520, 480)
	b.Core.Set("take out", "test", study.SettingEdit{Key: "rule.setback.dwellings.wind_m"}, study.SettingEdit{Key: "rule.setback.dwellings.wind_large_m"},
		study.SettingEdit{Key: "rule.setback.dwellings.wind_solar_m"}, study.SettingEdit{Key: "rule.setback.dwellings.solar_fixed_m"}, study.SettingEdit{Key: "rule.setback.soil.solar_m", Value: "1"})
	settled(b, s)
	checked := 0
	for _, c := range b.Core.View().Results.Candidates {
		if c.Status == run.NotComputed {
			continue
		}
		snap := b.Core.View().Snap
		parts := partsOf(c.Plant, c.Technology)
		if len(parts) != 1 {
			continue // what is taken is told for the masts alone
		}
		keeps := map[string]bool{}
		for _, d := range distances(snap, parts[0]) {
			keeps["setback:"+d.role] = keeps["setback:"+d.role] || !d.held.notSet()
			if d.held.notSet() != slices.Contains(c.Incomplete, "setback:"+d.role) && d.role == "dwellings" {
				t.Fatalf("%s: the distance from %s is not set here: %v, there: %v", c.ID(), d.role, d.held.notSet(), c.Incomplete)
			}
		}
		for _, taken := range c.Taken {
			if strings.HasPrefix(taken.Rule, "setback:") {
				checked++
				if !keeps[taken.Rule] {
					t.Fatalf("%s: %s takes land and is not shown", c.ID(), taken.Rule)
				}
			}
		}
	}
	if checked < 100 {
		t.Errorf("only %d rules were compared", checked)
	}
}

func TestLegalValuesNotSetAreSaid(t *testing.T) {
	b, s := open(t, 60, 520, 480)
	s.tabs.Choose(tabRules)
	s.choose("wind")
	b.Core.Set("take out", "test", study.SettingEdit{Key: "limit.noise_night_dba"})
	settled(b, s)
	if _, second, warn := s.State(); second != "1 legal value not set" || !warn {
		t.Errorf("the rail says %q", second)
	}
	r := s.rules.rows["limit.noise_night_dba"]
	if r.unit.Text != "not set (dB(A))" || r.entry.Text != "" {
		t.Errorf("the limit shows %q %q", r.entry.Text, r.unit.Text)
	}
	r.entry.SetText("38")
	r.source.SetText("local code, section 2")
	r.commit()
	settled(b, s)
	if _, second, warn := s.State(); !strings.HasSuffix(second, "own rules") || warn {
		t.Errorf("once it is entered the rail says %q", second)
	}
}

func TestFittedShowsTheCandidate(t *testing.T) {
	b, s := open(t, 60, 520, 480)
	s.choose("wind")
	s.tabs.Choose(tabFitted)
	b.Core.Choose()
	if s.fitted.candidate() != nil || s.fitted.loss.Scene() != nil {
		t.Error("without a chosen candidate something is shown")
	}
	s.chooseBest()
	painted(b, s)
	c := b.Core.Chosen()[0]
	if s.fitted.title.Text != b.Core.CandidateTitle(c) || s.fitted.loss.Scene() == nil || s.fitted.taken.Scene() == nil {
		t.Fatalf("shown is %q", s.fitted.title.Text)
	}
	said := map[string]bool{}
	p := s.fitted.loss
	for y := 0.0; y < p.Scene().Height; y += 4 {
		if _, words := raster.Hit(p.Scene(), p.Scene().Width/2, y); words != "" {
			said[words] = true
		}
	}
	if len(said) < len(c.Chain) {
		t.Errorf("resting on the losses says %d things of %d", len(said), len(c.Chain))
	}
	b.Until("the months of wind are known to be unknown", func() bool { return strings.HasPrefix(s.fitted.monthWords.Text, "Unknown: ") })
	// Another option: the same site is shown with it.
	s.choose("solar_fixed")
	if got := s.fitted.candidate(); got == nil || got.Plant != "solar_fixed" || got.Site != c.Site {
		t.Errorf("with another option %v is shown", got)
	}
	s.chooseBest()
	b.Until("the months of sun are drawn", func() bool {
		return s.fitted.month.Scene() != nil && strings.HasPrefix(s.fitted.monthWords.Text, "Of the year")
	})
}

func TestWithoutAnyOption(t *testing.T) {
	b, s := open(t, 60, 520, 480)
	b.Core.Edit("take all out", func(ctx context.Context, st *study.Study) error {
		snap, err := st.Snapshot()
		if err != nil {
			return err
		}
		var edits []study.SettingEdit
		for _, id := range snap.Plants() {
			edits = append(edits, emptied(snap, id)...)
		}
		_, err = st.Set(ctx, "set", "test", edits...)
		return err
	}, nil)
	b.Settle()
	if first, _, warn := s.State(); first != "no option yet" || !warn || !s.none.Visible() {
		t.Errorf("the rail says %q", first)
	}
	s.takeOut()
	s.chooseBest()
	b.Core.Undo()
	settled(b, s)
	if first, _, _ := s.State(); first != "7 options" || s.id == "" {
		t.Errorf("after undo %q", first)
	}
}

// With the tabulator alone every field of the form is reached, and is seen when it is.
func TestKeyboardWalksThroughTheForm(t *testing.T) {
	b, s := open(t, 200, 520, 480)
	s.choose("wind")
	s.tabs.Choose(tabSizes)
	want := map[fyne.Focusable]bool{}
	for _, key := range s.settings.shown {
		if r := s.settings.rows[key]; r.entry != nil {
			want[r.entry] = true
		} else {
			want[r.pick] = true
		}
	}
	n := len(want)
	for range 80 {
		b.Window.Canvas().FocusNext()
		f := b.Window.Canvas().Focused()
		if !want[f] {
			continue
		}
		delete(want, f)
		d := fyne.CurrentApp().Driver()
		o := f.(fyne.CanvasObject)
		top := d.AbsolutePositionForObject(o).Y - d.AbsolutePositionForObject(s.settings.body).Y
		if top < 0 || top+o.Size().Height > s.settings.body.Size().Height {
			t.Errorf("a field at %g of %g has the focus and is not seen; offset %g of %g", top, s.settings.body.Size().Height, s.settings.body.Offset.Y, s.settings.body.Content.Size().Height)
		}
	}
	if len(want) > 0 || n < 8 {
		t.Errorf("%d of %d fields are not reached", len(want), n)
	}
}

func TestRenamed(t *testing.T) {
	for key, want := range map[string]string{
		"plant.wind.hub_height_m": "plant.new.hub_height_m", "rule.setback.dwellings.wind_m": "rule.setback.dwellings.new_m", "rule.setback.roads.wind_tip": "rule.setback.roads.new_tip",
		"rule.slope_max.wind_deg": "rule.slope_max.new_deg", "rule.smallest_patch.wind_ha": "rule.smallest_patch.new_ha", "rule.setback.roads.wind_panels_m": "rule.setback.roads.new_panels_m",
		"land.farmland_coshare.wind":          "land.farmland_coshare.new",
		"rule.setback.dwellings.wind_large_m": "", "plant.wind_large.title": "", "rule.exclude.wind_m_x": "", "wind.shear_alpha": "", "voice.wind.title": "",
	} {
		if got, _ := renamed(key, "wind", "new"); got != want {
			t.Errorf("%s becomes %q, want %q", key, got, want)
		}
	}
}
