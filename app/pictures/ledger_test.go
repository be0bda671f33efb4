package pictures

import (
	"math"
	"strings"
	"testing"

	"groundtally/app/draw/chart"
	"groundtally/scoring"
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

// 1 GWh a year, 1 GWh of primary energy for each building, which is 0.35 GWh of electricity; built at 0, 25 and 50 years,
// of the last building 15 of 25 years lie beyond the horizon.
func TestHorizonSumRunsLikeTheLedger(t *testing.T) {
	l, err := energy.NewLedger(energy.LedgerPlant{FirstYearMWh: 1000, LifeYr: 25, Inputs: []energy.LedgerInput{{ItemID: "machines", MJ: 3.6e6}}}, 60, 0.35)
	if err != nil {
		t.Fatal(err)
	}
	value := valuesOf(map[string]scoring.Value{"life_yr": scoring.Num(25), "grid_efficiency": scoring.Num(0.35)})
	in := HorizonSum(l, "", value, "", "")
	if len(in.Points) != 61 || len(in.Begun) != 2 || in.Begun[0] != 25 || in.Begun[1] != 50 {
		t.Fatalf("%d points, begun %v", len(in.Points), in.Begun)
	}
	for year, want := range map[int]float64{0: -0.35, 1: 0.65, 25: 24.65, 26: 25.3, 60: 58.95} {
		if p := in.Points[year]; p.Year != float64(year) || math.Abs(p.Sum-want) > 1e-9 {
			t.Errorf("year %d: %+v, want %v", year, p, want)
		}
	}
	if in.ByUse.State != chart.Number || math.Abs(in.ByUse.X-(60-0.35*2.4)) > 1e-9 || in.Above != chart.Num(1) || in.Unit != "GWh" || !strings.Contains(in.What, "as electricity") || !strings.Contains(in.Caption, "0.35") || !strings.Contains(in.Caption, "By use") {
		t.Errorf("%+v", in)
	}
	// A horizon that ends within a year, and with nothing left over.
	if l, err = energy.NewLedger(energy.LedgerPlant{FirstYearMWh: 1000, LifeYr: 10.5, Inputs: []energy.LedgerInput{{MJ: 360e6}}}, 10.5, 0.35); err != nil {
		t.Fatal(err)
	}
	in = HorizonSum(l, "", value, "", "")
	if last := in.Points[len(in.Points)-1]; last.Year != 10.5 || math.Abs(last.Sum-(10.5-35)) > 1e-9 || in.ByUse.State != chart.None || in.Above.State != chart.Never || strings.Contains(in.Caption, "By use") || len(in.Begun) != 0 {
		t.Errorf("%+v", in)
	}
	if none := HorizonSum(nil, "no_room", value, "", ""); len(none.Points) != 0 || none.Why == "" || strings.Contains(none.Why, "_") {
		t.Errorf("%+v", none)
	}
}
