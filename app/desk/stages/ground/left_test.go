package ground

import (
	"math"
	"strings"
	"testing"

	"fyne.io/fyne/v2/test"

	"groundtally/app/study"
	"groundtally/geo"
)

// The land left is told with every rule's part and drawn; another state of the study is said to be another.
func TestLandLeft(t *testing.T) {
	b := open(t)
	var drawn []geo.LonLatGeometry
	b.Core.ShowZones = func(z []geo.LonLatGeometry) { drawn = z }
	b.s.tabs.Choose(4)
	p := b.s.left
	if p == nil {
		t.Fatal("there is no pane")
	}
	for i, id := range p.plants {
		if id == "wind" {
			p.plant.SetSelectedIndex(i)
		}
	}
	test.Tap(p.find)
	b.Until("the land left is found", func() bool { return len(p.left) == 1 && p.stop == nil })
	l := p.left[0]
	sum := l.LeftHa + l.ShapeHa + l.SharedHa
	for _, r := range l.Rules {
		sum += r.AloneHa
	}
	if math.Abs(sum-l.DistrictHa) > 1e-6*l.DistrictHa || len(l.Zones) == 0 || len(drawn) != len(l.Zones) {
		t.Errorf("%v of %v ha are accounted for; %d zones, %d drawn", sum, l.DistrictHa, len(l.Zones), len(drawn))
	}
	if !strings.Contains(p.said.Text, "are left, in") {
		t.Errorf("it says %q", p.said.Text)
	}
	for i, z := range l.Zones { // the island lies west of Greenwich
		if words := zoneWords(i, z); !strings.Contains(words, " W") || !strings.Contains(words, " N") || strings.ContainsAny(words, "-−") {
			t.Fatalf("a zone is told as %q", words)
		}
	}
	p.zones.Select(0)
	if n := len(b.places); n == 0 || b.places[n-1] != l.Zones[0].Centre {
		t.Errorf("shown %v, want %v", b.places, l.Zones[0].Centre)
	}
	b.shoot("left")
	b.Core.Set("distance", "test", study.SettingEdit{Key: "rule.setback.dwellings.wind_m", Value: "700"})
	b.Until("the change is seen", func() bool { return strings.Contains(p.said.Text, "has changed since") })
	test.Tap(p.clear)
	if drawn != nil {
		t.Error("the map was not cleared")
	}
}

// A sweep tells each value; what cannot be a sweep is said.
func TestSweepInTheWindow(t *testing.T) {
	b := open(t)
	b.s.tabs.Choose(4)
	p := b.s.left
	test.Tap(p.sweep)
	if !strings.Contains(p.said.Text, "Choose") {
		t.Errorf("it says %q", p.said.Text)
	}
	for i, id := range p.plants {
		if id == "wind" {
			p.plant.SetSelectedIndex(i)
		}
	}
	for i, key := range p.keys {
		if key == "rule.setback.forest.wind_m" {
			p.rule.SetSelectedIndex(i)
		}
	}
	if p.rule.SelectedIndex() < 0 {
		t.Fatalf("no such rule among %v", p.keys)
	}
	if p.from.Text != "25" || p.to.Text != "75" {
		t.Errorf("suggested from %s to %s around 50", p.from.Text, p.to.Text)
	}
	p.step.SetText("none")
	test.Tap(p.sweep)
	if !strings.Contains(p.said.Text, "as numbers") {
		t.Errorf("it says %q", p.said.Text)
	}
	p.step.SetText("50")
	test.Tap(p.sweep)
	b.Until("the values were tried", func() bool { return p.stop == nil && strings.Contains(p.said.Text, "Energy:") })
	b.shoot("sweep")
	if _, ok := b.Core.View().Snap.Explicit["rule.setback.forest.wind_m"]; !ok {
		t.Error("the study lost its rule")
	}
	if x, _ := b.Core.View().Snap.Number("rule.setback.forest.wind_m"); x != 50 {
		t.Errorf("the sweep changed the study to %v", x)
	}
}

// A change by hand needs a feature and a reason; what was typed stays in the form until it is taken.
func TestChangeByHand(t *testing.T) {
	b := open(t)
	p := b.s.layers
	rec, ok := b.layer("Dwellings")
	if !ok {
		t.Fatal("there are no dwellings")
	}
	p.open("Dwellings")
	f := newHandForm(b.s, rec)
	f.open()
	f.commit()
	if !strings.Contains(f.said.Text, "which feature") {
		t.Errorf("it says %q", f.said.Text)
	}
	f.feature.SetText("nobody")
	f.commit()
	if !strings.Contains(f.said.Text, "needs a reason") {
		t.Errorf("it says %q", f.said.Text)
	}
	f.reason.SetText("seen on site")
	for i, name := range f.fields {
		if name == "class" {
			f.field.SetSelectedIndex(i)
		}
	}
	f.value.SetText("not lived in")
	f.commit()
	b.Until("the feature is not found", func() bool { return strings.Contains(f.said.Text, "nobody") })
	b.shoot("byhand")
	id := ""
	v, _, err := b.Core.Session.Study().Store().Version(t.Context(), rec.Digest)
	if err != nil {
		t.Fatal(err)
	}
	id = v.Layer.Features[0].ID
	f.feature.SetText(id)
	f.commit()
	b.Until("it is changed", func() bool { now, _ := b.layer("Dwellings"); return len(now.Hand) == 1 })
	if now, _ := b.layer("Dwellings"); now.Hand[0].Reason != "seen on site" || now.Hand[0].Values["class"] != "not lived in" {
		t.Errorf("%+v", now.Hand)
	}
	f = newHandForm(b.s, rec)
	f.verb.SetSelectedIndex(2)
	for text, want := range map[string]string{"9": "no place", "9.1, 48.1": "", "9,48; 9.1,48; 9.1,48.1; 9,48": ""} {
		f.feature.SetText("x")
		f.reason.SetText("y")
		f.place.SetText(text)
		if _, err := f.edit(); (err == nil) != (want == "") || err != nil && !strings.Contains(err.Error(), want) {
			t.Errorf("%s: %v", text, err)
		}
	}
}
