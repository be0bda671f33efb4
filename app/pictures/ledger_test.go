package pictures

import (
	"strings"
	"testing"

	"groundtally/scoring/energy"
)

func TestLedgerWords(t *testing.T) {
	l, err := energy.NewLedger(energy.LedgerPlant{FirstYearMWh: 1000, LifeYr: 25, Inputs: []energy.LedgerInput{{ItemID: "machines", MJ: 3.6e6}}, OccupiedHa: 2}, 60, 0.35)
	if err != nil {
		t.Fatal(err)
	}
	got := Ledger(l, "")
	// 60 GWh in 60 years; three times 1 GWh spent, of which 15 of the last 25 years lie beyond.
	for _, want := range []string{"horizon of 60 years", "built 3 times", "60 GWh of electricity", "for 3 GWh", "of which 0.600 GWh serve beyond", "return of 25", "120 ha years"} {
		if !strings.Contains(got, want) {
			t.Errorf("%q is not in %q", want, got)
		}
	}
	if got := Ledger(nil, "no_room"); !strings.Contains(got, "No account on a common horizon: ") {
		t.Error(got)
	}
}
