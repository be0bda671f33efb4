package term

import (
	"testing"

	"groundtally/app/run"
	"groundtally/scoring"
)

// results has one candidate with one consequence and one voice.
func results(central, score float64) *run.Results {
	return &run.Results{
		Candidates: []run.Candidate{{Site: "A", Plant: "w", Status: run.Fitted, Consequences: []scoring.Consequence{
			{Key: "noise_dba", State: scoring.Number, Low: 30, Central: central, High: 50},
			{Key: "peat_ha", State: scoring.Unknown, Why: "no_layer:peat"}}}},
		Voices: []run.VoiceOrder{{Voice: "v", Order: []run.Row{{Site: "A", Plant: "w", Tier: 1, Score: score}}}},
	}
}

func TestSmallDifferencesAreNamed(t *testing.T) {
	old, now := results(40, 0.5), results(40.0000001, 0.5000000000000001)
	if got := lastDigits(old, old, 17); len(got) != 0 {
		t.Errorf("the same results differ: %+v", got)
	}
	got := lastDigits(old, now, 17)
	want := []run.Difference{{Where: "A with w, noise_dba", Old: "40", New: "40.000000100000001"}, {Where: "voice v, A with w, score", Old: "0.5", New: "0.50000000000000011"}}
	if len(got) != 2 || got[0] != want[0] || got[1] != want[1] {
		t.Errorf("%+v, want %+v", got, want)
	}
	// An appendix keeps nine digits: what differs beyond them it cannot tell.
	if got := lastDigits(old, now, 9); len(got) != 1 || got[0].New != "40.0000001" {
		t.Errorf("to nine digits: %+v", got)
	}
}
