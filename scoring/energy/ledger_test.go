package energy

import (
	"errors"
	"math"
	"math/rand/v2"
	"testing"

	"groundtally/scoring/params"
	"groundtally/scoring/units"
)

func near(a, b, rel float64) bool {
	return math.Abs(a-b) <= rel*math.Max(math.Abs(a), math.Abs(b))+1e-9*rel
}

func ledger(t testing.TB, p LedgerPlant, horizon float64) *Ledger {
	t.Helper()
	l, err := NewLedger(p, horizon, 0.35)
	if err != nil {
		t.Fatal(err)
	}
	return l
}

// Over one life without repowering the ledger is the balance at the extended boundary, on the worked plants.
func TestLedgerOfOneLifeIsTheBalance(t *testing.T) {
	ok := must(t)
	for _, name := range []string{"A", "B"} {
		e := plantExample(t, name)
		d, life := 0.0, e.lifeYr
		if name == "A" {
			d = 0.005
		}
		p := LedgerPlant{FirstYearMWh: e.balance.DeliveredMJ / e.effective / units.MJPerMWh, DegradationPerYr: d, LifeYr: life,
			Inputs:        []LedgerInput{{ItemID: "plant", MJ: e.balance.Inputs.B1MJ}, {ItemID: "grid", MJ: e.balance.Inputs.B2MJ - e.balance.Inputs.B1MJ}},
			UpkeepMJPerYr: e.upkeep, EndMJ: e.balance.Inputs.B3MJ - e.balance.Inputs.B2MJ - e.upkeep*life, OccupiedHa: 6}
		for _, lives := range []int{0, 1} {
			p.Lives = lives
			l := ledger(t, p, life)
			if !near(l.OutMJ, e.balance.DeliveredMJ, 1e-12) || !near(l.SpentMJ, e.balance.Inputs.B3MJ, 1e-12) {
				t.Errorf("%s: %v of %v out, %v of %v spent", name, l.OutMJ, e.balance.DeliveredMJ, l.SpentMJ, e.balance.Inputs.B3MJ)
			}
			for _, c := range []Currency{AsAccounted, Primary, Electric} {
				for _, byUse := range []bool{false, true} {
					if got, want := ok(l.NetMJ(c, byUse)), ok(e.balance.NetMJ(params.Extended, c, 0.35)); !near(got, want, 1e-12) {
						t.Errorf("%s, %v: net %v, want %v", name, c, got, want)
					}
				}
			}
			if got, want := ok(l.EROI(false)), ok(e.balance.EROI(params.Extended)); !near(got, want, 1e-12) {
				t.Errorf("%s: return %v, want %v", name, got, want)
			}
			if l.LivesBegun != 1 || l.RemainingMJ != 0 || l.RemainingShare != 0 || l.EndDueMJ != 0 || !near(l.OccupiedHaYr, 6*life, 1e-12) || l.OccupiedAfterHaYr != 0 {
				t.Errorf("%s: %+v", name, l)
			}
			last := l.Years[len(l.Years)-1]
			if len(l.Years) != int(life)+1 || !near(last.NetElectricMJ, ok(l.NetMJ(Electric, false)), 1e-12) || !near(last.NetMixedMJ, ok(l.NetMJ(AsAccounted, false)), 1e-12) {
				t.Errorf("%s: the last year says %+v", name, last)
			}
		}
	}
}

func TestLedgerRepowers(t *testing.T) {
	p := LedgerPlant{FirstYearMWh: 1000, LifeYr: 25, UpkeepMJPerYr: 10, EndMJ: 50, OccupiedHa: 2, RestorationYr: 3,
		Inputs: []LedgerInput{{ItemID: "machines", MJ: 1000}, {ItemID: "tracks", MJ: 400, LifeYr: 40}, {ItemID: "inverters", MJ: 60, LifeYr: 10}}}
	l := ledger(t, p, 60)
	// Machines at 0, 25, 50; tracks at 0 and 40; inverters at 0, 10, 20 of each life, the last life having begun 10 years ago.
	built := map[int]float64{0: 1460, 11: 60, 21: 60, 26: 1060, 36: 60, 41: 400, 46: 60, 51: 1060}
	ended := map[int]float64{25: 50, 50: 50}
	for _, y := range l.Years {
		if y.BuiltMJ != built[y.Year] || y.EndMJ != ended[y.Year] {
			t.Errorf("year %d: built %v, dismantled %v, want %v, %v", y.Year, y.BuiltMJ, y.EndMJ, built[y.Year], ended[y.Year])
		}
		if want := map[bool]float64{true: 0, false: 10}[y.Year == 0]; !near(y.UpkeepMJ, want, 1e-12) {
			t.Errorf("year %d: upkeep %v", y.Year, y.UpkeepMJ)
		}
	}
	if l.LivesBegun != 3 || !near(l.RemainingShare, 0.6, 1e-12) || !near(l.EndDueMJ, 20, 1e-12) {
		t.Errorf("lives %d, remaining share %v, due %v", l.LivesBegun, l.RemainingShare, l.EndDueMJ)
	}
	// 15 of 25 years of the machines, 20 of 40 of the tracks; the inverters of year 50 are worn out at 60.
	if want := 1000*0.6 + 400*0.5; !near(l.RemainingMJ, want, 1e-12) || !near(l.ByUseMJ, l.SpentMJ-want+20, 1e-12) {
		t.Errorf("remaining %v, want %v; by use %v of %v", l.RemainingMJ, want, l.ByUseMJ, l.SpentMJ)
	}
	if !near(l.OutMJ, 60*1000*units.MJPerMWh, 1e-12) || !near(l.OccupiedHaYr, 120, 1e-12) || !near(l.OccupiedAfterHaYr, 2*(15+3), 1e-12) {
		t.Errorf("out %v, occupied %v and %v", l.OutMJ, l.OccupiedHaYr, l.OccupiedAfterHaYr)
	}
}

// A plant that is not built again ends, is restored, and stands still; what outlasted it is lost with it.
func TestLedgerOfOneLifeInALongerHorizon(t *testing.T) {
	p := LedgerPlant{FirstYearMWh: 1000, LifeYr: 20, Lives: 1, EndMJ: 50, OccupiedHa: 2, RestorationYr: 2.5, Inputs: []LedgerInput{{ItemID: "tracks", MJ: 400, LifeYr: 40}}}
	l := ledger(t, p, 30)
	if l.RemainingMJ != 0 || l.SpentMJ != 450 || !near(l.OccupiedHaYr, 45, 1e-12) || l.OccupiedAfterHaYr != 0 || l.Years[21].OutMJ != 0 || l.Years[20].EndMJ != 50 || l.Years[23].OccupiedHaYr != 1 {
		t.Errorf("%+v", l)
	}
	if l = ledger(t, p, 10); !near(l.RemainingMJ, 200, 1e-12) || !near(l.OccupiedAfterHaYr, 2*12.5, 1e-12) {
		t.Errorf("cut short: %+v", l)
	}
}

// By use, what a plant costs in a year does not depend on where the horizon cuts it.
func TestLedgerByUseIsEvenOverTheYears(t *testing.T) {
	r := rand.New(rand.NewPCG(21, 22))
	for range 300 {
		T := 1 + 40*r.Float64()
		p := LedgerPlant{FirstYearMWh: 1e4 * r.Float64(), LifeYr: T, UpkeepMJPerYr: 1e3 * r.Float64(), EndMJ: 1e4 * r.Float64(), OccupiedHa: 3,
			Inputs: []LedgerInput{{ItemID: "machines", MJ: 1e6 * r.Float64()}, {ItemID: "tracks", MJ: 1e5, LifeYr: T * (1 + 2*r.Float64())}}}
		rate := p.UpkeepMJPerYr + (p.Inputs[0].MJ+p.EndMJ)/T + p.Inputs[1].MJ/p.Inputs[1].LifeYr
		H := 0.5 + 120*r.Float64()
		l := ledger(t, p, H)
		if !near(l.ByUseMJ, rate*H, 1e-9) {
			t.Fatalf("%+v over %v yr: by use %v, want %v", p, H, l.ByUseMJ, rate*H)
		}
		if !near(l.OutMJ, p.FirstYearMWh*units.MJPerMWh*H, 1e-9) || !near(l.OccupiedHaYr, 3*H, 1e-9) {
			t.Fatalf("%v yr: out %v, occupied %v", H, l.OutMJ, l.OccupiedHaYr)
		}
		sum := 0.0
		for _, y := range l.Years {
			sum += y.OutMJ - y.SpentMJ()
			if !near(y.NetMixedMJ, sum, 1e-9) && math.Abs(y.NetMixedMJ-sum) > 1e-3 {
				t.Fatalf("year %d: cumulative %v, want %v", y.Year, y.NetMixedMJ, sum)
			}
		}
	}
}

// Lives of 20 and 30 years compare over 60, where neither leaves anything.
func TestLedgerOnACommonMultiple(t *testing.T) {
	ok := must(t)
	for _, life := range []float64{20, 30} {
		p := LedgerPlant{FirstYearMWh: 1000, DegradationPerYr: 0.01, LifeYr: life, Inputs: []LedgerInput{{ItemID: "machines", MJ: 1e5}}, EndMJ: 3e3, UpkeepMJPerYr: 200}
		one, all := ledger(t, p, life), ledger(t, p, 60)
		if all.RemainingMJ != 0 || all.EndDueMJ != 0 || !near(all.OutMJ, one.OutMJ*60/life, 1e-12) || !near(ok(all.EROI(true)), ok(one.EROI(true)), 1e-12) {
			t.Errorf("life %v: %+v", life, all)
		}
	}
}

// The year in which the ledger turns is the first after the payback of the same numbers.
func TestLedgerCrossesAtThePayback(t *testing.T) {
	l := ledger(t, LedgerPlant{FirstYearMWh: 1000, LifeYr: 30, UpkeepMJPerYr: 9e4, Inputs: []LedgerInput{{ItemID: "plant", MJ: 5e7}}}, 30)
	p, err := PaybackYears(5e7, 1000*units.MJPerMWh, 9e4, 0.35)
	if err != nil {
		t.Fatal(err)
	}
	got, err := l.Crossed(Electric)
	if err != nil || got.Never || got.Yr != math.Ceil(p.Yr) {
		t.Errorf("crossed %+v, payback %+v, %v", got, p, err)
	}
	l = ledger(t, LedgerPlant{FirstYearMWh: 1, LifeYr: 30, Inputs: []LedgerInput{{ItemID: "plant", MJ: 5e7}}}, 30)
	if got, err = l.Crossed(AsAccounted); err != nil || !got.Never {
		t.Errorf("a sink: %+v, %v", got, err)
	}
	if _, err = l.Crossed(Primary); !errors.Is(err, ErrInput) {
		t.Errorf("a currency without a column: %v", err)
	}
}

func TestLedgerRefuses(t *testing.T) {
	good := LedgerPlant{FirstYearMWh: 1, LifeYr: 20, Inputs: []LedgerInput{{ItemID: "x", MJ: 1}}}
	for name, f := range map[string]func(p *LedgerPlant, h *float64){
		"energy":  func(p *LedgerPlant, _ *float64) { p.FirstYearMWh = math.NaN() },
		"ageing":  func(p *LedgerPlant, _ *float64) { p.DegradationPerYr = 1 },
		"life":    func(p *LedgerPlant, _ *float64) { p.LifeYr = math.NaN() },
		"lives":   func(p *LedgerPlant, _ *float64) { p.Lives = -1 },
		"input":   func(p *LedgerPlant, _ *float64) { p.Inputs = []LedgerInput{{MJ: math.Inf(1)}} },
		"worn":    func(p *LedgerPlant, _ *float64) { p.Inputs = []LedgerInput{{MJ: 1, LifeYr: 1e-6}} },
		"horizon": func(_ *LedgerPlant, h *float64) { *h = math.Inf(1) },
		"none":    func(_ *LedgerPlant, h *float64) { *h = 0 },
	} {
		p, h := good, 30.0
		f(&p, &h)
		if _, err := NewLedger(p, h, 0.35); !errors.Is(err, ErrInput) {
			t.Errorf("%s: %v", name, err)
		}
	}
	if _, err := NewLedger(good, 30, 0); !errors.Is(err, ErrInput) {
		t.Error("grid efficiency 0 was taken")
	}
}
