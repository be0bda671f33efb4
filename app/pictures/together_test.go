package pictures

import (
	"strings"
	"testing"

	"groundtally/app/run"
)

func TestTogetherTellsWhatIsSavedAndCutOff(t *testing.T) {
	r := -0.25
	n := &run.Connection{Together: &run.Together{WindMWh: 30000, SolarMWh: 10000, PeakKW: 15000, PeaksKW: 20000, SavedKW: 5000, LosingFrac: 0.01, LosingKW: 12000, LosingEachKW: 16000, Correlation: &r, HoursKnown: 8760,
		Limits: []run.TogetherLimit{{LimitKW: 10000, CurtailedMWh: 2000, WindCutMWh: 1500, SolarCutMWh: 500, HoursAtLimit: 700, FullFrac: 0.43, AloneFrac: 0.3}, {LimitKW: 16000}}}}
	got := strings.NewReplacer("\u00a0", "", "\u202f", "", " 000", "000").Replace(Together(n))
	for _, want := range []string{"12000 kW together and 16000 kW one by one, so that 4000 kW of connection (25 %) are saved", "at -0.25", "cuts off 2000 (5.0 %; wind 1500, sun 500) in 700 hours", "used to 43 %", "wind alone to 30 %", "16000 kW 0.0 %"} {
		if !strings.Contains(got, want) {
			t.Errorf("%q is not said in %q", want, got)
		}
	}
	if strings.Contains(got, "not known") || Together(nil) != "" || Together(&run.Connection{}) != "" {
		t.Error("what is not there is said")
	}
}
