package climate

import (
	"errors"
	"math"
	"math/rand/v2"
	"testing"

	"groundtally/scoring/units"
)

func TestLines(t *testing.T) {
	in := LineInput{CausedTCO2e: Span{800, 1000, 2000}, FirstYearKWh: Span{9e5, 1e6, 1.1e6}, DegradationPerYr: 0.005, LifeYr: 24.5, DisplacedShare: Span{0.2, 0.6, 1}}
	grids := []NamedGrid{{"average", Grid{0.3, 0.05}}, {"marginal", Grid{0.5, 0.02}}, {"user", Grid{0.01, 0}}}
	lines, err := Lines(in, grids)
	if err != nil || len(lines) != 3 {
		t.Fatal(err)
	}
	for i, l := range lines {
		if l.Grid != grids[i] || len(l.Points) != 26 || l.Points[0] != (LinePoint{0, -2000, -1000, -800}) || l.Points[25].Year != 24.5 {
			t.Errorf("%s: %+v", l.Grid.Name, l.Points)
		}
		for k, p := range l.Points {
			if p.Low > p.Central || p.Central > p.High || k > 0 && p.Central < l.Points[k-1].Central {
				t.Errorf("%s: %+v", l.Grid.Name, p)
			}
		}
	}
	if l := lines[2]; !l.Low.Never || !l.Central.Never || !l.High.Never || l.Points[25].High > 0 {
		t.Errorf("a grid without emissions to displace pays back: %+v", l)
	}
	if l := lines[1]; l.High.Never || l.Central.Never || !(l.High.Yr < l.Central.Yr) {
		t.Errorf("%+v", l)
	}
	// A share of one half is a grid factor of one half.
	half, err := Lines(LineInput{CausedTCO2e: Span{5, 5, 5}, FirstYearKWh: Span{1e4, 1e4, 1e4}, LifeYr: 20, DisplacedShare: Span{0.5, 0.5, 0.5}}, []NamedGrid{{"g", Grid{0.4, 0.03}}})
	if err != nil {
		t.Fatal(err)
	}
	p, err := PaybackYears(5, 1e4, 0, Grid{0.2, 0.03}, 20)
	if err != nil || half[0].Central != p || half[0].Low != p || p.Never {
		t.Errorf("crossing %+v, payback %+v, %v", half[0], p, err)
	}
}

// The line is zero where it crosses, and never above zero before the end when it does not.
func TestLineCrossesWhereItIsZero(t *testing.T) {
	r := rand.New(rand.NewPCG(61, 62))
	never := 0
	for range 1000 {
		G, kwh, share := 4000*r.Float64(), 1e6*r.Float64(), r.Float64()
		in := LineInput{CausedTCO2e: Span{G, G, G}, FirstYearKWh: Span{kwh, kwh, kwh}, DegradationPerYr: 0.02 * r.Float64(), LifeYr: 1 + 39*r.Float64(), DisplacedShare: Span{share, share, share}}
		g := Grid{0.9 * r.Float64(), 0.1 * r.Float64()}
		lines, err := Lines(in, []NamedGrid{{"g", g}})
		if err != nil {
			t.Fatal(err)
		}
		l := lines[0]
		end := l.Points[len(l.Points)-1]
		if l.Central.Never {
			never++
			if end.Central > 1e-9*G {
				t.Fatalf("never, but %v at the end", end.Central)
			}
			continue
		}
		s, err := DisplacedT(kwh, in.DegradationPerYr, l.Central.Yr, Grid{g.KgPerKWh * share, g.DeclinePerYr})
		if err != nil || math.Abs(s-G) > 1e-9*G || l.Central.Yr > in.LifeYr {
			t.Fatalf("at %v the line is %v", l.Central.Yr, s-G)
		}
		for _, p := range l.Points {
			if p.Year < l.Central.Yr-1e-6 && p.Central > 0 || p.Year > l.Central.Yr+1e-6 && p.Central < 0 {
				t.Fatalf("crossing %v, but %+v", l.Central.Yr, p)
			}
		}
	}
	if never == 0 || never == 1000 {
		t.Errorf("%d of 1000 never cross: one branch is not tried", never)
	}
}

func TestLinesRefuse(t *testing.T) {
	same := func(x float64) Span { return Span{x, x, x} }
	good := LineInput{CausedTCO2e: same(1), FirstYearKWh: same(1), LifeYr: 20, DisplacedShare: same(1)}
	for name, f := range map[string]func(in *LineInput, g *Grid){
		"caused": func(in *LineInput, _ *Grid) { in.CausedTCO2e = same(math.NaN()) },
		"order":  func(in *LineInput, _ *Grid) { in.FirstYearKWh = Span{3, 2, 1} },
		"share":  func(in *LineInput, _ *Grid) { in.DisplacedShare = same(1.2) },
		"life":   func(in *LineInput, _ *Grid) { in.LifeYr = 0 },
		"long":   func(in *LineInput, _ *Grid) { in.LifeYr = 1e9 },
		"ageing": func(in *LineInput, _ *Grid) { in.DegradationPerYr = 1 },
		"grid":   func(_ *LineInput, g *Grid) { g.KgPerKWh = math.NaN() },
	} {
		in, g := good, Grid{0.3, 0}
		f(&in, &g)
		if _, err := Lines(in, []NamedGrid{{"g", g}}); !errors.Is(err, ErrInput) {
			t.Errorf("%s: %v", name, err)
		}
	}
	if _, err := (DrainedGas{N2O: math.NaN()}).TotalTCO2ePerHaYr(); !errors.Is(err, ErrInput) {
		t.Errorf("gas: %v", err)
	}
	if got := must(t)(DrainedGas{CO2: 1, CH4: -0.5}.TotalTCO2ePerHaYr()); got != 0.5 {
		t.Errorf("ground that takes methane up: %v", got)
	}
}

// Published figures for sunlight elsewhere come back to the place that they were stated for.
func TestRescalingComesBack(t *testing.T) {
	ok := must(t)
	there := ok(RescaledSolarG(45, 1700, .75, 30, 1100, .8, 25))
	if back := ok(RescaledSolarG(there, 1100, .8, 25, 1700, .75, 30)); math.Abs(back-45) > 1e-12 {
		t.Errorf("came back as %v", back)
	}
	// What a plant emits does not depend on its sunlight: figure × energy stays.
	if a, b := ok(LifeCycleT(45, 1700*.75*30*units.MJPerKWh)), ok(LifeCycleT(there, 1100*.8*25*units.MJPerKWh)); math.Abs(a-b) > 1e-12*a {
		t.Errorf("%v t there, %v t here", a, b)
	}
}
