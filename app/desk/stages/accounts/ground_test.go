package accounts

import (
	"context"
	"math"
	"strings"
	"testing"

	"fyne.io/fyne/v2"

	"groundtally/app/run"
	"groundtally/app/study"
)

// told gives what the tab says beside the figures.
func (g *groundHere) told() string {
	out := ""
	if g.saidBox.Visible() {
		out = g.said.Text
	}
	return out
}

// The terrain of the chosen candidate is what the surveyor gives, from which layer; another choice brings another;
// without heights it is unknown, with the reason.
func TestGroundHere(t *testing.T) {
	b, s := open(t, 20, 560, 520)
	s.Content()
	b.Show(s.content, 560, 520)
	tabs := s.tabs
	tabs.Choose(5)
	g := s.ground
	if g == nil {
		t.Fatal("the tab makes nothing")
	}
	cands := b.Core.View().Results.Candidates
	var two []*run.Candidate
	for i := range cands {
		if cands[i].Status == run.Fitted && (len(two) == 0 || cands[i].Site != two[0].Site) {
			if two = append(two, &cands[i]); len(two) == 2 {
				break
			}
		}
	}
	b.Core.Choose()
	if !strings.Contains(g.told(), "Choose a candidate") {
		t.Errorf("without a candidate it says %q", g.told())
	}
	// The newest selection wins: the first is asked for and given up.
	b.Core.Choose(two[0].ID())
	if g.told() != "…" {
		t.Errorf("until it is known it says %q", g.told())
	}
	b.Core.Choose(two[1].ID())
	b.Until("the terrain is there", func() bool { return len(g.list) > 0 })
	if g.list[0].Site != two[1].Site {
		t.Errorf("it is of %s, want %s", g.list[0].Site, two[1].Site)
	}
	sv := run.NewSurveyor(b.Core.View().Of, b.Core.Parts.Params, run.StoreLoader(b.Core.Session.Study().Store()), nil)
	want, err := sv.Relief(context.Background(), two[1].Site, two[1].Plant)
	if err != nil || len(want) != len(g.list) {
		t.Fatalf("%v: %d, want %d", err, len(g.list), len(want))
	}
	if *g.list[0].MeanM != *want[0].MeanM || len(g.list[0].HorizonDeg) != 72 {
		t.Errorf("%+v, want %+v", g.list[0], want[0])
	}
	if layer := b.Core.View().Of.LayersOf("terrain")[0]; !strings.Contains(g.source.Text, layer.Name) || !g.source.Visible() {
		t.Errorf("the source is %q", g.source.Text)
	}
	if scene := g.picture.Scene(); scene == nil || !strings.Contains(scene.Title, g.words.Text) || !strings.Contains(g.words.Text, "Highest towards") {
		t.Errorf("the horizon says %q", g.words.Text)
	}
	b.Window.Resize(fyne.NewSize(560, 700))
	b.Until("the horizon is painted", func() bool {
		scene := g.picture.Scene()
		return scene != nil && g.picture.Painted().Bounds().Dx() >= int(scene.Width)
	})
	b.Shoot("accounts-ground-560")
	b.Core.Toggle(two[0].ID())
	if len(g.who.Options) != 2 || !strings.HasPrefix(g.who.Options[1], "B  "+two[0].Site) {
		t.Errorf("to choose from: %q", g.who.Options)
	}
	g.who.SetSelectedIndex(1)
	b.Until("the other is there", func() bool { return len(g.list) > 0 && g.list[0].Site == two[0].Site })

	b.Core.Edit("test", func(ctx context.Context, st *study.Study) error {
		return st.RemoveLayer(ctx, b.Core.View().Of.LayersOf("terrain")[0].Name, "test")
	}, nil)
	settled(b, s)
	b.Until("it is unknown", func() bool { return strings.Contains(g.told(), "no layer of ground heights") })
	if len(g.list) != 0 || g.head.Visible() || g.source.Visible() {
		t.Error("figures of the former heights stay")
	}
	b.Shoot("accounts-ground-unknown")
}

// What is not known says so, and why; figures have their units.
func TestGroundFigures(t *testing.T) {
	x := func(v float64) *float64 { return &v }
	all := func(r run.Relief) string {
		var out []string
		for _, f := range figures(r) {
			out = append(out, f.label+": "+f.value)
		}
		return strings.Join(out, "\n")
	}
	whole := run.Relief{HeightShare: 1, MeanM: x(84.24), LeastM: x(71), MostM: x(97.5), SlopeDeg: x(4.06), SteepestDeg: x(11.2), AspectDeg: x(359.7), AspectShare: 0.853, RoughnessM: x(0.516)}
	if got := all(whole); got != "Height: 84.2 m on average, from 71.0 to 97.5 m\nSlope: 4.1° on average, at most 11.2°\nFalls to: 0°, north; agreement 0.85\nRuggedness: 0.52 m" {
		t.Error(got)
	}
	level := whole
	level.AspectDeg = nil
	if got := all(level); !strings.Contains(got, "Falls to: no one way") {
		t.Error(got)
	}
	narrow := run.Relief{HeightShare: 0.5, MeanM: x(84.24), LeastM: x(71), MostM: x(97.5)}
	if got := all(narrow); !strings.Contains(got, "Slope: unknown: too few heights") || !strings.Contains(got, "heights for 50 %") {
		t.Error(got)
	}
	if got := all(run.Relief{}); strings.Count(got, "unknown: there are no heights here") != 4 || strings.Contains(got, "0.0") {
		t.Error(got)
	}
	if got := horizonWords(run.Relief{}); !strings.HasPrefix(got, "Unknown") {
		t.Error(got)
	}
	r := run.Relief{HorizonKnown: 0.4, HorizonDeg: []*float64{x(1), nil, x(2.34), x(math.Inf(-1))}}
	if got := horizonWords(r); got != "Highest towards 180°, south: 2.3° above level. Unknown in 1 of 4 directions. Heights are known for at least 40 % of the 20 km in every direction; beyond them it may be higher." {
		t.Error(got)
	}
}
