package climate

import (
	"errors"
	"math"
	"math/rand/v2"
	"os"
	"testing"

	"groundtally/assets/citedtable"
	"groundtally/scoring/units"
)

func must(t testing.TB) func(float64, error) float64 {
	return func(v float64, err error) float64 {
		t.Helper()
		if err != nil {
			t.Fatal(err)
		}
		return v
	}
}

func TestCheckTable(t *testing.T) {
	tab, err := citedtable.ParseFS(os.DirFS("../../testdata/check"), "climate.csv")
	if err != nil {
		t.Fatal(err)
	}
	checks, err := tab.Checks()
	if err != nil {
		t.Fatal(err)
	}
	for _, c := range checks {
		t.Run(c.ID+"_"+c.Quantity, func(t *testing.T) {
			ok, in := must(t), c.In
			var got float64
			switch c.Quantity {
			case "payback_from_g":
				const kwh = 1e6
				p, err := PaybackYears(ok(LifeCycleT(in["g"], kwh*in["T"]*units.MJPerKWh)), kwh, 0, Grid{KgPerKWh: in["grid"] / units.GPerKg}, in["T"])
				if err != nil || p.Never {
					t.Fatalf("%+v, %v", p, err)
				}
				got = p.Yr
			case "drained_gas":
				got = ok(DrainedGas{CO2: in["co2"], CH4: in["ch4"], N2O: in["n2o"], Dissolved: in["dissolved"], DitchCH4: in["ditch"]}.TotalTCO2ePerHaYr())
			case "line_crossing":
				same := func(x float64) Span { return Span{x, x, x} }
				lines, err := Lines(LineInput{CausedTCO2e: same(in["G"]), FirstYearKWh: same(in["kwh"]), LifeYr: in["life"], DisplacedShare: same(1)},
					[]NamedGrid{{Name: "user", Grid: Grid{KgPerKWh: in["ef"], DeclinePerYr: in["decline"]}}})
				if err != nil {
					t.Fatal(err)
				}
				got = lines[0].Central.Yr
			case "co2_from_carbon":
				got = ok(CO2FromCarbonT(in["t"]))
			case "rescaled_solar":
				got = ok(RescaledSolarG(in["g"], in["h_ref"], in["pr_ref"], in["life_ref"], in["h"], in["pr"], in["life"]))
			case "payback", "payback_never":
				p, err := PaybackYears(in["G"], in["kwh"], in["d"], Grid{KgPerKWh: in["ef"], DeclinePerYr: in["decline"]}, in["life"])
				if err != nil {
					t.Fatal(err)
				}
				got = p.Yr
				if c.Quantity == "payback_never" {
					got = 0
					if p.Never {
						got = 1
					}
				}
			case "life_cycle_t":
				got = ok(LifeCycleT(in["g"], in["tj"]*units.MJPerTJ))
			case "land_g_per_kwh":
				got = ok(GPerKWh(in["t"], in["tj"]*units.MJPerTJ))
			default:
				t.Fatalf("unknown quantity %q", c.Quantity)
			}
			if !c.OK(got) {
				t.Errorf("got %v, want %v within %v (%s)", got, c.Expected, c.Tolerance, c.Source)
			}
		})
	}
}

// At the payback time the emissions displaced equal those caused; a little less is not enough.
func TestPaybackSolvesItsEquation(t *testing.T) {
	ok := must(t)
	r := rand.New(rand.NewPCG(5, 6))
	never := 0
	for range 2000 {
		G, kwh, d := 1+r.Float64()*2e4, 1e5+r.Float64()*1e7, r.Float64()*0.02
		grid := Grid{KgPerKWh: 0.02 + r.Float64()*0.8, DeclinePerYr: r.Float64() * 0.1}
		p, err := PaybackYears(G, kwh, d, grid, 0)
		if err != nil {
			t.Fatal(err)
		}
		if p.Never {
			never++
			if s := ok(DisplacedT(kwh, d, 1e5, grid)); s > G*(1+1e-9) {
				t.Fatalf("never, but %v t displaced against %v", s, G)
			}
			continue
		}
		if s := ok(DisplacedT(kwh, d, p.Yr, grid)); math.Abs(s-G) > 1e-9*G {
			t.Fatalf("displaced %v at payback %v, caused %v", s, p.Yr, G)
		}
	}
	if never == 0 || never == 2000 {
		t.Errorf("%d of 2000 never pay back: one branch is not tried", never)
	}
}

func TestDisplacedEqualsTheSum(t *testing.T) {
	grid := Grid{KgPerKWh: .3, DeclinePerYr: .04}
	var want float64
	for y := range 25 {
		want += 1000 * math.Pow(1-.005, float64(y)) * .3 * math.Pow(1-.04, float64(y)) / units.KgPerT
	}
	if got := must(t)(DisplacedT(1000, .005, 25, grid)); math.Abs(got-want) > 1e-12 {
		t.Errorf("got %v, want %v", got, want)
	}
}

func TestPaybackBeyondLifeIsNever(t *testing.T) {
	grid := Grid{KgPerKWh: .3}
	p, err := PaybackYears(9100, 1e6, 0, grid, 30)
	if err != nil || !p.Never {
		t.Errorf("30.3 yr in a life of 30: %+v, %v", p, err)
	}
	if p, err = PaybackYears(9100, 1e6, 0, grid, 31); err != nil || p.Never || !p.Within(31) || p.Within(30) {
		t.Errorf("30.3 yr in a life of 31: %+v, %v", p, err)
	}
	if p, err = PaybackYears(10, 1e6, 0, Grid{}, 0); err != nil || !p.Never {
		t.Errorf("a grid without emissions: %+v, %v", p, err)
	}
	if p, err = PaybackYears(-5, 1e6, 0, grid, 0); err != nil || p.Never || p.Yr != 0 {
		t.Errorf("nothing caused: %+v, %v", p, err)
	}
}

func TestRescalingToItselfChangesNothing(t *testing.T) {
	ok := must(t)
	if got := ok(RescaledWindG(11, .3, 20, .3, 20)); got != 11 {
		t.Errorf("wind %v", got)
	}
	if got := ok(RescaledWindG(11, .3, 20, .45, 25)); math.Abs(got-11*6/11.25) > 1e-12 {
		t.Errorf("wind %v", got)
	}
	if got := ok(RescaledSolarG(40, 1700, .75, 30, 1700, .75, 30)); got != 40 {
		t.Errorf("solar %v", got)
	}
}

func TestNoNaNLeaves(t *testing.T) {
	nan := math.NaN()
	for name, f := range map[string]func() error{
		"GPerKWh":       func() error { _, err := GPerKWh(nan, 1); return err },
		"GPerKWh zero":  func() error { _, err := GPerKWh(1, 0); return err },
		"LifeCycleT":    func() error { _, err := LifeCycleT(nan, 1); return err },
		"DisplacedT":    func() error { _, err := DisplacedT(nan, 0, 1, Grid{}); return err },
		"DisplacedT d":  func() error { _, err := DisplacedT(1, nan, 1, Grid{}); return err },
		"grid":          func() error { _, err := DisplacedT(1, 0, 1, Grid{KgPerKWh: nan}); return err },
		"decline":       func() error { _, err := DisplacedT(1, 0, 1, Grid{DeclinePerYr: 1}); return err },
		"Payback":       func() error { _, err := PaybackYears(nan, 1, 0, Grid{}, 0); return err },
		"Payback life":  func() error { _, err := PaybackYears(1, 1, 0, Grid{}, nan); return err },
		"RescaledSolar": func() error { _, err := RescaledSolarG(1, 1, 1, 1, 0, 1, 1); return err },
		"RescaledWind":  func() error { _, err := RescaledWindG(1, 1, 1, nan, 1); return err },
		"CO2":           func() error { _, err := CO2FromCarbonT(nan); return err },
	} {
		if err := f(); !errors.Is(err, ErrInput) {
			t.Errorf("%s: %v", name, err)
		}
	}
}

func BenchmarkPayback(b *testing.B) {
	for b.Loop() {
		if _, err := PaybackYears(1000, 1e6, .005, Grid{KgPerKWh: .3, DeclinePerYr: .05}, 30); err != nil {
			b.Fatal(err)
		}
	}
}
