package pictures

import (
	"strings"
	"testing"

	"groundtally/app/draw/chart"
	"groundtally/app/run"
	"groundtally/scoring"
)

func TestCrowdingIsCarriedOver(t *testing.T) {
	c := &run.Crowded{Swept: "ground cover", GroundHa: 12.5, Points: []run.CrowdedPoint{
		{Swept: 0.3, KWPerHa: 600, MWhPerHaYr: 700, EROI: 9, WithStocks: scoring.Num(8), MWhPerKWYr: 1.2},
		{Swept: 0.4, KWPerHa: 800, MWhPerHaYr: 900, EROI: 8.8, WithStocks: scoring.UnknownBecause("no_layer:soil"), MWhPerKWYr: 1.1},
		{Swept: 0.5, KWPerHa: 1000, MWhPerHaYr: 1000, EROI: 8, WithStocks: scoring.Num(7), MWhPerKWYr: 1}},
		BestReturn: run.CrowdedMark{Swept: 0.3, MWhPerHaYr: 700, EROI: 9, AtEnd: true, Known: true}, MostNet: run.CrowdedMark{Swept: 0.5, MWhPerHaYr: 1000, EROI: 8, Known: true}, MostEnergy: run.CrowdedMark{Swept: 0.5, MWhPerHaYr: 1000, EROI: 8, Known: true}}
	in := Crowding(c, "title", "id")
	if len(in.Points) != 3 || in.Points[1].WithStocks.State == chart.Number || in.Points[1].WithStocks.Why == "" || in.Points[2].Return.X != 8 || in.BestReturn.State != chart.Number || !in.BestReturn.AtEnd || in.Chosen.State == chart.Number {
		t.Errorf("%+v", in)
	}
	words := CrowdingWords(c)
	for _, want := range []string{"On 12.50 ha", "the best return at 0.3 (700 MWh", "at the end of what was tried", "most net energy, as electricity, at 0.5", "most comes at 0.3, 1.2 MWh"} {
		if !strings.Contains(words, want) {
			t.Errorf("%q is not in %q", want, words)
		}
	}
	if strings.Contains(words, "Your option") {
		t.Errorf("a choice that is not known is told: %q", words)
	}
	if got := CrowdingWords(&run.Crowded{Why: "no_room"}); !strings.Contains(got, "No crowding curve") {
		t.Error(got)
	}
}
