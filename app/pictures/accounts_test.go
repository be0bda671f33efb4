package pictures

import (
	"math"
	"strings"
	"testing"

	"groundtally/app/draw/chart"
	"groundtally/app/run"
	"groundtally/scoring"
	"groundtally/scoring/climate"
)

// valuesOf gives values by name; what it lacks is unknown.
func valuesOf(m map[string]scoring.Value) func(string) scoring.Value {
	return func(name string) scoring.Value {
		if v, ok := m[name]; ok {
			return v
		}
		return scoring.UnknownBecause("no_soil_type")
	}
}

func TestAmountsKeepTheirStates(t *testing.T) {
	for _, c := range []struct {
		q    scoring.Consequence
		want chart.State
	}{
		{scoring.Consequence{State: scoring.Number, Low: 1, Central: 2, High: 3}, chart.Number},
		{scoring.Consequence{State: scoring.Unknown, Why: "no_layer:soil"}, chart.Unknown},
		{scoring.Consequence{State: scoring.NotSet, Why: "climate.grid_factor_g_per_kwh"}, chart.NotSet},
		{scoring.Consequence{State: scoring.None, Why: "no forest touched"}, chart.None},
		{scoring.Consequence{State: scoring.Never}, chart.Never},
		{scoring.Consequence{State: scoring.NotAssessed}, chart.NotAssessed},
	} {
		got := AmountOf(c.q)
		if got.State != c.want {
			t.Errorf("%v becomes %q", c.q.State, got.State)
		}
		if c.want == chart.Number {
			if got != chart.Ranged(1, 2, 3) {
				t.Errorf("%+v", got)
			}
			continue
		}
		if got.X != 0 || got.Why == "" || strings.HasPrefix(got.Why, c.q.State.String()) || strings.Contains(got.Why, "_") && c.want != chart.NotSet {
			t.Errorf("%v says %q", c.q.State, got.Why)
		}
	}
}

func TestLadderPartsAddUpToTheReturns(t *testing.T) {
	m := map[string]scoring.Value{"generated_mj_life": scoring.Num(100e6), "delivered_mj_life": scoring.Num(90e6), "input_generator_mj": scoring.Num(4e6), "input_works_mj": scoring.Num(1e6),
		"input_connection_mj": scoring.Num(1e6), "input_upkeep_mj_per_yr": scoring.Num(0.1e6), "life_yr": scoring.Num(20), "input_end_mj": scoring.Num(1e6)}
	c := &run.Candidate{Status: run.Fitted, Consequences: []scoring.Consequence{{Key: "eroi_generation", Low: 15, Central: 20, High: 25}, {Key: "eroi_delivered", Central: 15}, {Key: "eroi_extended", Central: 10}, {Key: "eroi_stock", State: scoring.Unknown, Why: "no_layer:soil"}}}
	in := Boundaries(c, valuesOf(m), "", "")
	sum := 0.0
	for b, want := range []float64{20, 15, 10} {
		for _, p := range in.Parts {
			if p.At == chart.Boundary(b) {
				sum += p.Spent.X
			}
		}
		r := in.Rungs[b]
		if math.Abs(r.Out.X/sum-want) > 1e-9 || r.Return.X != want {
			t.Errorf("boundary %d: %v out, %v spent, return %v, want %v", b, r.Out.X, sum, r.Return.X, want)
		}
	}
	if got := in.Parts[5].Spent; got.State != chart.Unknown || got.Why == "" || in.Rungs[3].Return.State != chart.Unknown {
		t.Errorf("unknown stocks became %+v and %+v", got, in.Rungs[3].Return)
	}
	delete(m, "life_yr")
	if got := Boundaries(c, valuesOf(m), "", "").Parts[3].Spent; got.State != chart.Unknown {
		t.Errorf("upkeep over an unknown life is %+v", got)
	}
}

// Example A of the accounts' methods: 502.617 TJ generated over 90.4 TJ at the plant, 492.565 delivered over 92.2725 and
// 111.5725. With a grid efficiency of 0.35 the returns 5.560, 5.338 and 4.415 become 15.886, 15.252 and 12.613.
func TestPrimaryEquivalentOfTheExample(t *testing.T) {
	m := map[string]scoring.Value{"generated_mj_life": scoring.Num(502.617e6), "delivered_mj_life": scoring.Num(502.617e6 * 0.98), "input_generator_mj": scoring.Num(90e6), "input_works_mj": scoring.Num(0.4e6),
		"input_connection_mj": scoring.Num(1.8725e6), "input_upkeep_mj_per_yr": scoring.Num(0.45e6), "life_yr": scoring.Num(30), "input_end_mj": scoring.Num(5.8e6), "stock_mj": scoring.Num(0.1206e6), "grid_efficiency": scoring.Num(0.35)}
	c := &run.Candidate{Status: run.Fitted}
	for i, key := range []string{"eroi_generation", "eroi_delivered", "eroi_extended", "eroi_stock"} {
		x := 502.617 * []float64{1, 0.98, 0.98, 0.98}[i] / []float64{90.4, 92.2725, 111.5725, 111.6931}[i]
		c.Consequences = append(c.Consequences, scoring.Consequence{Key: key, Low: x / 2, Central: x, High: 2 * x})
	}
	in := PrimaryBoundaries(c, valuesOf(m), "", "")
	spent := 0.0
	for b, want := range []float64{15.886, 15.252, 12.613} {
		for _, p := range in.Parts {
			if p.At == chart.Boundary(b) {
				spent += p.Spent.X
			}
		}
		r := in.Rungs[b]
		if math.Abs(r.Return.X/want-1) > 1e-3 || math.Abs(r.Out.X/spent/want-1) > 1e-3 || r.Return.High != 0 || r.Return.Low != 0 {
			t.Errorf("boundary %d: %+v, %v spent, want a return of %v", b, r, spent, want)
		}
	}
	if math.Abs(in.Rungs[0].Out.X-502.617/0.35) > 1e-6 || !in.NoStocks || in.Rungs[3] != (chart.Rung{}) || len(in.Parts) != 5 {
		t.Errorf("%+v", in)
	}
	if !strings.Contains(in.Kind, "primary equivalent") || !strings.Contains(in.Kind, "0.35") || !strings.Contains(in.Caption, "EROI_PE-eq") || !strings.Contains(in.Caption, "0.35") || !strings.Contains(in.Caption, "Central values only") || !strings.Contains(in.Caption, "Not to be set beside the electric return") {
		t.Errorf("%q, %q", in.Kind, in.Caption)
	}
	words := BoundariesWords(in)
	for _, want := range []string{"primary equivalent out", "at plant 15.9", "whole life 12.6", "Not to be set beside"} {
		if !strings.Contains(words, want) {
			t.Errorf("%q is not in %q", want, words)
		}
	}
	if strings.Contains(words, "stocks") || strings.Contains(words, "electricity out over") || strings.Contains(words, "\n") {
		t.Errorf("%q", words)
	}
	// The electric ladder is untouched, and what is unknown stays so.
	if e := Boundaries(c, valuesOf(m), "", ""); math.Abs(e.Rungs[0].Return.X-5.560) > 1e-3 || e.NoStocks || len(e.Parts) != 6 {
		t.Errorf("%+v", e)
	}
	delete(m, "grid_efficiency")
	if got := PrimaryBoundaries(c, valuesOf(m), "", ""); got.Rungs[0].Return.State != chart.Unknown || got.Rungs[0].Out.State != chart.Unknown || !strings.Contains(got.Kind, "unknown") {
		t.Errorf("without a grid efficiency %+v", got.Rungs[0])
	}
	c.Consequences[0] = scoring.Consequence{Key: "eroi_generation", State: scoring.Unknown, Why: "no_layer:soil"}
	m["grid_efficiency"] = scoring.Num(0.35)
	if got := PrimaryBoundaries(c, valuesOf(m), "", "").Rungs[0].Return; got.State != chart.Unknown || got.Why == "" {
		t.Errorf("an unknown return becomes %+v", got)
	}
}

func TestGroundKeepsWhatIsUnknown(t *testing.T) {
	c := &run.Candidate{Status: run.Fitted, Consequences: []scoring.Consequence{{Key: "footprint_total_ha", Low: 8, Central: 10, High: 12}, {Key: "forest_ha", State: scoring.None, Why: "no forest touched"}}}
	in := GroundTaken(c, valuesOf(map[string]scoring.Value{"life_yr": scoring.Num(25), "farmland_lost_ha": scoring.Num(3)}), "", "")
	if in.Total.Ha != chart.Ranged(8, 10, 12) || in.Total.Years.X != 25 || in.Farmland.Ha.X != 3 || in.Farmland.Years.State != chart.None {
		t.Errorf("%+v", in)
	}
	if in.Forest.Ha.State != chart.None || in.Peat.Ha.State != chart.Unknown || in.Temporary.Years.State != chart.Unknown || in.HaYears.State != chart.Unknown {
		t.Errorf("%+v", in)
	}
}

func TestPaybacksGoByTheLines(t *testing.T) {
	span := func(low, x, high float64) climate.Span { return climate.Span{Low: low, Central: x, High: high} }
	lines, err := climate.Lines(climate.LineInput{CausedTCO2e: span(800, 1000, 5000), FirstYearKWh: span(0.9e6, 1e6, 1.1e6), LifeYr: 20.5, DisplacedShare: span(0.5, 1, 1)},
		[]climate.NamedGrid{{Name: "yours", Grid: climate.Grid{KgPerKWh: 0.2}}, {Name: "clean", Grid: climate.Grid{KgPerKWh: 0.01}}})
	if err != nil {
		t.Fatal(err)
	}
	c := &run.Candidate{Status: run.Fitted, Consequences: []scoring.Consequence{{Key: "carbon_payback_yr", State: scoring.NotSet, Why: "climate.grid_factor_g_per_kwh"}}}
	value := valuesOf(map[string]scoring.Value{"life_yr": scoring.Num(20.5)})
	in := Paybacks(c, lines, "", value, "", "")
	first := in.Cases[0]
	// 1000 t at 200 t in a year.
	if len(first.Tonnes) != 21 || first.Tonnes[0] != chart.Ranged(-5000, -1000, -800) || math.Abs(first.Payback.X-5) > 1e-9 || first.Payback.High != 0 {
		t.Errorf("%+v", first)
	}
	if in.Cases[1].Payback.State != chart.Never || !strings.Contains(in.Caption, "never paid back within the life with yours") || !strings.Contains(in.Caption, "not a whole one") {
		t.Errorf("%+v, %q", in.Cases[1].Payback, in.Caption)
	}
	none := Paybacks(c, nil, "not_set:climate.grid_factor_g_per_kwh", value, "", "").Cases
	if len(none) != 1 || none[0].Payback.State != chart.NotSet || !strings.Contains(none[0].Payback.Why, "must be entered") {
		t.Errorf("%+v", none)
	}
}

func TestDriversThatDoNotVaryMoveNothing(t *testing.T) {
	in := DriversOf([]run.Driver{{Name: "a", Title: "A", Rho: -0.4, Known: true}, {Name: "b", Title: "B"}}, 500, "x", "", "")
	if in.Trials != 500 || in.Groups[0].Rank != chart.Num(-0.4) || in.Groups[1].Rank.State != chart.None {
		t.Errorf("%+v", in)
	}
}

func TestAccountsSetTwoSideBySide(t *testing.T) {
	a := &run.Candidate{Status: run.Fitted, OverLimit: []string{"peat_ha"}, Consequences: []scoring.Consequence{{Key: "peat_ha", Low: 1, Central: 2, High: 3, Range: scoring.P10P90}, {Key: "carbon_payback_yr", State: scoring.Never}}}
	b := &run.Candidate{Status: run.Fitted, Consequences: []scoring.Consequence{{Key: "peat_ha", State: scoring.None, Why: "no peat touched"}}}
	in := Accounts([2]*run.Candidate{a, b}, [2]string{"one", "other"}, func(k string) run.KeyInfo { return run.KeyInfo{Title: k, Unit: "1"} }, func(string) chart.Better { return chart.Less }, "", "")
	rows := map[string]chart.AccountRow{}
	for _, g := range in.Groups {
		for _, r := range g.Rows {
			rows[r.Item] = r
		}
	}
	if r := rows["peat_ha"]; len(rows) != 15 || r.A != chart.Ranged(1, 2, 3) || r.B.State != chart.None || !r.OverA || r.OverB || r.Unit != "" {
		t.Errorf("%d rows, %+v", len(rows), r)
	}
	if r := rows["carbon_payback_yr"]; r.A.State != chart.Never || r.B.State != chart.Unknown {
		t.Errorf("%+v", r)
	}
	if !strings.Contains(in.Caption, "P10") {
		t.Errorf("the caption says %q", in.Caption)
	}
}

func TestAccountsInWordsHideNothing(t *testing.T) {
	unknown := chart.Amount{Why: "no layer of soil"}
	in := chart.Boundaries{Unit: "TJ", Parts: []chart.EnergyPart{{Name: "stocks", Spent: unknown}}}
	for b := range in.Rungs {
		in.Rungs[b] = chart.Rung{Out: chart.Num(90), Return: chart.Ranged(8, 10, 12)}
	}
	in.Rungs[3].Return = unknown
	drivers := chart.Drivers{What: "it", Trials: 200, Groups: []chart.Driver{{Name: "still", Rank: chart.Amount{State: chart.None}}, {Name: "weak", Rank: chart.Num(0.1)}, {Name: "strong", Rank: chart.Num(-0.8)}}}
	for text, wants := range map[string][]string{
		BoundariesWords(in): {"at plant 10", "8.0 to 12", "with stocks unknown (no layer of soil)", "90 TJ at the grid", "stocks unknown"},
		GroundWords(chart.Ground{Total: chart.LandKind{Ha: chart.Num(5)}, Peat: chart.LandKind{Ha: chart.Amount{State: chart.None}}}):                           {"total ground 5 ha", "habitat unknown", "peat none", "Ground times years: unknown"},
		PaybackWords(chart.Balances{Cases: []chart.Balance{{Name: "mine", Payback: chart.Amount{State: chart.Never}}, {Name: "other", Payback: chart.Num(6)}}}): {"mine: never", "other: 6 yr"},
		DriversWords(drivers): {"200 trials: strong -0.80; weak +0.10."},
	} {
		for _, want := range wants {
			if !strings.Contains(text, want) {
				t.Errorf("%q is not said in %q", want, text)
			}
		}
	}
}
