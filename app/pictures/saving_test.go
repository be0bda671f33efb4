package pictures

import (
	"strings"
	"testing"

	"groundtally/app/run"
	"groundtally/scoring"
	"groundtally/scoring/energy"
)

func TestSavingInWords(t *testing.T) {
	one := func(x float64) energy.SavedSpan {
		return energy.SavedSpan{Low: energy.Saved{MWhPerYr: x / 2}, Central: energy.Saved{MWhPerYr: x}, High: energy.Saved{Never: true}}
	}
	s := &run.Saving{Equal: energy.SavingEquals{Direct: one(100), Economy: one(200)}}
	words := Saving(s, "")
	for _, want := range []string{"100 MWh a year (50 to never)", "200 MWh a year (100 to never)", "saving.investment_mj_per_mwh"} {
		if !strings.Contains(words, want) {
			t.Errorf("no %q in %q", want, words)
		}
	}
	s.Equal.NetKnown, s.Equal.NetDirect, s.Equal.NetEconomy = true, one(300), energy.SavedSpan{Central: energy.Saved{Never: true}}
	if words = Saving(s, ""); !strings.Contains(words, "300 MWh a year") || !strings.Contains(words, "no saving does the same") || strings.Contains(words, "not counted") {
		t.Errorf("net: %q", words)
	}
	if words = Saving(nil, "no_layer:demand"); !strings.Contains(words, "unknown") || !strings.Contains(words, "demand") {
		t.Errorf("without: %q", words)
	}
}

func TestAlternativesInWords(t *testing.T) {
	title := func(key string) string { return "the " + key }
	known := run.Beside{Title: "Saving the same", About: "as much as X", Place: 3, Score: 0.5, ScoreLow: 0.25, ScoreHigh: 0.75, Unknown: []string{"a", "b"}}
	if words := Beside(known, title); !strings.Contains(words, "place 3") || !strings.Contains(words, "0.500 (0.250 to 0.750)") || !strings.Contains(words, "Unknown of it: the a, the b.") {
		t.Errorf("%q", words)
	}
	if words := Beside(run.Beside{Title: "Roofs", Why: "no_layer:sealed_ground"}, title); !strings.Contains(words, "Roofs: unknown") || strings.Contains(words, "place") {
		t.Errorf("%q", words)
	}
}

func TestSparedInWords(t *testing.T) {
	p := &run.SparePlan{Basis: "target", WantedMWh: 1000, Sites: make([]energy.SpareSite, 4), Short: true, LeftOut: 2}
	s := energy.Spared{Sites: []string{"a/wind"}, DirectHa: 2, TotalHa: 30, OccupationHaYr: 50, StockTC: 120, StockUnknown: 1, StillBuilt: 3}
	words := Spared(p, 0.25, s, energy.SavingEquals{})
	for _, want := range []string{"the energy that the district wants, 1000 MWh", "not enough", "25 % of that energy saved", "3 are still built and 1 of them spared", "2 ha of ground taken directly", "unknown for 1", "Left out", "2 of the sites"} {
		if !strings.Contains(strings.ReplaceAll(words, "2.00 ha", "2 ha"), want) {
			t.Errorf("no %q in %q", want, words)
		}
	}
	if words := Spared(p, 0, s, energy.SavingEquals{}); strings.Contains(words, "spared") {
		t.Errorf("nothing is saved: %q", words)
	}
}

func TestHabitatInWords(t *testing.T) {
	if Habitat(nil, 20) != nil {
		t.Error("words of no habitat")
	}
	lines := strings.Join(Habitat(&run.Habitat{Kinds: []run.HabitatKind{
		{Class: "bog", Condition: "good", Protection: "listed", Irreplaceable: "yes", LostHa: 2},
		{Class: "heath", Irreplaceable: "unknown", EdgeHa: 0.5},
	}, Pieces: &run.HabitatPieces{Before: 1, After: 3, LargestBeforeHa: 10, LargestAfterHa: 4}}, 25), "\n")
	for _, want := range []string{"bog, condition good, listed, IRREPLACEABLE: 2", "(50", "heath, not said whether it can be replaced: 0 ha lost, 0.5", "1 before, 3 after"} {
		if !strings.Contains(lines, want) {
			t.Errorf("no %q in %q", want, lines)
		}
	}
}

func TestDensitiesInWords(t *testing.T) {
	words := Densities(func(name string) scoring.Value {
		if name == "power_density_w_per_m2" {
			return scoring.Num(0.5)
		}
		return scoring.UnknownBecause("no_layer:soil")
	})
	if !strings.Contains(words, "0.5") || !strings.Contains(words, "unknown on what is taken directly") {
		t.Errorf("%q", words)
	}
}
