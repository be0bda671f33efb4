package pictures

import (
	"strings"
	"testing"

	"groundtally/app/run"
	"groundtally/scoring/reckon"
)

func TestDuel(t *testing.T) {
	names := [2]string{"A", "B"}
	got := Duel(names, reckon.Duel{Known: true, Beats: 0.87, Used: 200, Equal: 2}, []run.Swapped{{Title: "Energy spent on a turbine", Unit: "MJ/kW", At: 6800, Low: 5000, Central: 7000, High: 12000}})
	for _, want := range []string{"In 87 of 100 trials A is better than B", "200 trials, 2 of them equal", "Energy spent on a turbine at 6800 MJ/kW (central 7000, from 5000 to 12"} {
		if !strings.Contains(got, want) {
			t.Errorf("%q is not in %q", want, got)
		}
	}
	if got := Duel(names, reckon.Duel{Known: true, Beats: 1, Used: 10}, nil); !strings.Contains(got, "No factor alone changes that") {
		t.Error(got)
	}
	if got := Duel(names, reckon.Duel{}, nil); strings.Contains(got, "0 of 100") || !strings.Contains(got, "cannot be compared") {
		t.Error(got)
	}
}
