package wind

import (
	"errors"
	"fmt"
	"math"
	"math/rand/v2"
	"slices"
	"testing"

	"groundtally/scoring/units"
)

// hours2001 is the hour that 2001, a year of 8,760 hours, begins.
const hours2001 = 271752

// drawn gives n hours whose speeds are quantiles of the sectors' distributions and whose directions are
// spread by the function over each sector's, all in an order that a seed fixes.
func drawn(rose []Sector, n int, spread func(sector int, share float64) float64) []SeriesHour {
	var out []SeriesHour
	for s, sec := range rose {
		m := int(math.Round(sec.FrequencyFrac * float64(n)))
		for i := range m {
			q := (float64(i) + 0.5) / float64(m)
			v := sec.Weibull.AMPerS * math.Pow(-math.Log1p(-q), 1/sec.Weibull.K)
			// Directions must not rise with speed: a stride that shares no factor with m mixes them.
			share := math.Mod(float64(i)*0.6180339887498949, 1)
			out = append(out, SeriesHour{SpeedMPerS: v, FromDeg: math.Mod(spread(s, share)+360, 360), HasDir: true, Valid: true})
		}
	}
	r := rand.New(rand.NewPCG(5, 6))
	r.Shuffle(len(out), func(i, j int) { out[i], out[j] = out[j], out[i] })
	for i := range out {
		out[i].Hour = hours2001 + int64(i)
	}
	return out
}

func centres(sector int, _ float64) float64 { return float64(sector) * 30 }

func constant(n int, v, deg float64) []SeriesHour {
	out := make([]SeriesHour, n)
	for i := range out {
		out[i] = SeriesHour{Hour: hours2001 + int64(i), SpeedMPerS: v, FromDeg: deg, HasDir: true, Valid: true}
	}
	return out
}

func fitted(t testing.TB, hours []SeriesHour) SeriesFit {
	t.Helper()
	fit, err := FitSeries(hours, SeriesOptions{})
	if err != nil {
		t.Fatal(err)
	}
	return fit
}

func series(t testing.TB, in FarmInput, hours []SeriesHour) SeriesResult {
	t.Helper()
	r, err := SeriesYear(in, hours, fitted(t, hours))
	if err != nil {
		t.Fatal(err)
	}
	return r
}

func TestSeriesAgreesWithTheRoseItWasDrawnFrom(t *testing.T) {
	for _, model := range []WakeModel{WakeGaussian, WakeJensen} {
		// The centres of twelve sectors are the directions computed, so no rose is interpolated.
		in := farm(t, "iea_3_4mw_130", scatter(6, 5, 700)...)
		in.Settings.Wake, in.Settings.Directions = model, 12
		in.Existing = []Machine{{Position{-1500, -300}, turbine(t, "dw100_27_6"), 40}}
		want := year(t, in)
		r := series(t, in, drawn(in.Site.Rose, 8760, centres))
		// What is left is the rounding of the sectors' hours, the width of the quantiles, and for the fit its own.
		if !near(r.GrossMWhPerYr, want.GrossMWhPerYr, 1e-3) || !near(r.WakedMWhPerYr, want.Chain[0].AfterMWh, 1e-3) || math.Abs(r.WakeLossFrac-want.WakeLossFrac) > 2e-4 {
			t.Errorf("%v: series %g and %g, rose %g and %g", model, r.GrossMWhPerYr, r.WakedMWhPerYr, want.GrossMWhPerYr, want.Chain[0].AfterMWh)
		}
		if !near(r.FitMWhPerYr, want.Chain[0].AfterMWh, 5e-3) || r.FitMWhPerYr != r.FitYear.Chain[0].AfterMWh {
			t.Errorf("%v: by the fit %g, by the rose %g", model, r.FitMWhPerYr, want.Chain[0].AfterMWh)
		}
		if !near(r.NetMWhPerYr, r.WakedMWhPerYr*want.NetMWhPerYr/want.Chain[0].AfterMWh, 1e-9) || r.NoDirHours != 0 || r.DensityHours != 0 || r.AirKgPerM3 == 0 {
			t.Errorf("%v: net %g of %g", model, r.NetMWhPerYr, r.WakedMWhPerYr)
		}
	}
	// An even rose is the same from everywhere, whatever the directions computed.
	in := farm(t, "iea_3_4mw_130", scatter(6, 5, 700)...)
	for i := range in.Site.Rose {
		in.Site.Rose[i] = Sector{1.0 / 12, Weibull{7.5, 2.1}}
	}
	want := year(t, in)
	r := series(t, in, drawn(in.Site.Rose, 87600, func(s int, x float64) float64 { return float64(s)*30 - 15 + 30*x }))
	if !near(r.WakedMWhPerYr, want.Chain[0].AfterMWh, 1e-3) || math.Abs(r.WakeLossFrac-want.WakeLossFrac) > 2e-4 {
		t.Errorf("even rose: series %g, rose %g; losses %g and %g", r.WakedMWhPerYr, want.Chain[0].AfterMWh, r.WakeLossFrac, want.WakeLossFrac)
	}
}

func TestConstantWindGivesItsPowerAllYear(t *testing.T) {
	in := farm(t, "iea_3_4mw_130", Position{})
	in.Site.RefHeightM = in.HubHeightM
	hours := constant(8760, 8.25, 210)
	r := series(t, in, hours)
	air, err := StandardAtmosphere(in.Site.ElevationM + in.HubHeightM)
	if err != nil {
		t.Fatal(err)
	}
	kw := in.Turbine.Curve.PowerKW(NormalisedSpeed(8.25, air.DensityKgPerM3))
	if want := kw * units.HoursPerYear / units.KWhPerMWh; !near(r.GrossMWhPerYr, want, 1e-12) || !near(r.WakedMWhPerYr, want, 1e-12) {
		t.Errorf("%g MWh, want %g", r.WakedMWhPerYr, want)
	}
	var months float64
	for m, e := range r.MonthMWh {
		if !near(e, kw*monthHours[m]/1000, 1e-12) || float64(r.MonthValidHours[m]) != monthHours[m] {
			t.Errorf("month %d: %g MWh of %d hours", m+1, e, r.MonthValidHours[m])
		}
		months += e
	}
	if !near(months, r.WakedMWhPerYr, 1e-12) {
		t.Errorf("months sum to %g, the year is %g", months, r.WakedMWhPerYr)
	}
	for _, p := range r.PowerKW {
		if !near(p, kw, 1e-12) {
			t.Fatalf("an hour of %g kW, want %g", p, kw)
		}
	}
	// Behind another machine, straight downwind: the speed that WakeSpeeds gives.
	in.At = []Position{{0, 0}, {600 * math.Sin(210*math.Pi/180), 600 * math.Cos(210*math.Pi/180)}}
	in.Site.ElevationM = -in.HubHeightM
	for i := range hours {
		hours[i].SpeedMPerS = 8 // a node of the table
	}
	us, err := WakeSpeeds(in.Turbine, in.HubHeightM, in.At, in.Settings, 210, 8)
	if err != nil {
		t.Fatal(err)
	}
	want := (in.Turbine.Curve.PowerKW(us[0]) + in.Turbine.Curve.PowerKW(us[1])) * units.HoursPerYear / units.KWhPerMWh
	if r := series(t, in, hours); !near(r.WakedMWhPerYr, want, 1e-5) || !(us[0] < 7) {
		t.Errorf("%g MWh, by the speeds %v %g", r.WakedMWhPerYr, us, want)
	}
}

func TestHoursWithoutDirection(t *testing.T) {
	in := farm(t, "iea_3_4mw_130", scatter(6, 5, 700)...)
	in.Settings.Directions = 12
	hours := drawn(in.Site.Rose, 8760, centres)
	with := series(t, in, hours)
	for i := range hours {
		hours[i].HasDir = i%3 != 0
	}
	some := series(t, in, hours)
	if some.NoDirHours != 2920 || math.Abs(some.WakeLossFrac-with.WakeLossFrac) > 0.003 {
		t.Errorf("%d hours without direction: loss %g, with all of them %g", some.NoDirHours, some.WakeLossFrac, with.WakeLossFrac)
	}
	for i := range hours {
		hours[i].HasDir = false
	}
	fit := fitted(t, hours)
	if len(fit.Rose) != 1 || fit.Rose[0].FrequencyFrac != 1 || fit.Rose[0].Weibull != fit.Whole || fit.DirectionHours != 0 || fit.FellBack != 0 {
		t.Errorf("no directions: %+v", fit)
	}
	if none := series(t, in, hours); none.NoDirHours != len(hours) || !(none.WakeLossFrac > 0) || !near(none.GrossMWhPerYr, with.GrossMWhPerYr, 1e-12) {
		t.Errorf("no directions: loss %g, gross %g, was %g", none.WakeLossFrac, none.GrossMWhPerYr, with.GrossMWhPerYr)
	}
}

func TestOrderOfHoursDoesNotMatter(t *testing.T) {
	in := farm(t, "iea_3_4mw_130", scatter(4, 5, 700)...)
	hours := drawn(in.Site.Rose, 8760, centres)
	want := series(t, in, hours)
	slices.Reverse(hours)
	got := series(t, in, hours)
	slices.Reverse(got.PowerKW)
	if !near(got.WakedMWhPerYr, want.WakedMWhPerYr, 1e-12) || !near(got.FitMWhPerYr, want.FitMWhPerYr, 1e-9) {
		t.Errorf("reversed %g and %g, was %g and %g", got.WakedMWhPerYr, got.FitMWhPerYr, want.WakedMWhPerYr, want.FitMWhPerYr)
	}
	for i := range got.PowerKW {
		if !near(got.PowerKW[i], want.PowerKW[i], 1e-9) {
			t.Fatalf("hour %d: %g kW, was %g", i, got.PowerKW[i], want.PowerKW[i])
		}
	}
	for m := range got.MonthMWh {
		if !near(got.MonthMWh[m], want.MonthMWh[m], 1e-9) {
			t.Errorf("month %d: %g MWh, was %g", m+1, got.MonthMWh[m], want.MonthMWh[m])
		}
	}
}

func TestDensityOfTheHour(t *testing.T) {
	for _, stall := range []bool{false, true} {
		in := farm(t, "iea_3_4mw_130", Position{})
		in.Turbine.Stall = stall
		hours := drawn(in.Site.Rose, 8760, centres)
		plain := series(t, in, hours)
		with := func(tempC float64, hasTemp bool, pa float64, hasPressure bool) SeriesResult {
			for i := range hours {
				hours[i].TempC, hours[i].HasTemp, hours[i].PressurePa, hours[i].HasPressure = tempC, hasTemp, pa, hasPressure
			}
			return series(t, in, hours)
		}
		cold, hot := with(-15, true, 0, false), with(35, true, 0, false)
		if !(cold.GrossMWhPerYr > plain.GrossMWhPerYr && plain.GrossMWhPerYr > hot.GrossMWhPerYr && cold.AirKgPerM3 > hot.AirKgPerM3) || cold.DensityHours != len(hours) {
			t.Errorf("stall %t: cold %g, plain %g, hot %g MWh", stall, cold.GrossMWhPerYr, plain.GrossMWhPerYr, hot.GrossMWhPerYr)
		}
		if low := with(15, true, 95000, true); !(low.GrossMWhPerYr < with(15, true, 103000, true).GrossMWhPerYr) {
			t.Errorf("stall %t: low pressure gives no less", stall)
		}
		// The standard atmosphere at the height of the series is that at the hub once carried there. The
		// gas constants of the two formulas differ by 1e-5.
		ref, err := StandardAtmosphere(in.Site.ElevationM + in.Site.RefHeightM)
		if err != nil {
			t.Fatal(err)
		}
		for _, same := range []SeriesResult{with(ref.TemperatureK-units.ZeroCelsiusK, true, ref.PressurePa, true), with(0, false, ref.PressurePa, true), with(ref.TemperatureK-units.ZeroCelsiusK, true, 0, false)} {
			if !near(same.GrossMWhPerYr, plain.GrossMWhPerYr, 2e-5) || !near(same.AirKgPerM3, plain.AirKgPerM3, 2e-5) {
				t.Errorf("stall %t: standard air gives %g MWh at %g kg/m3, %g at %g", stall, same.GrossMWhPerYr, same.AirKgPerM3, plain.GrossMWhPerYr, plain.AirKgPerM3)
			}
		}
	}
}

func TestCoverage(t *testing.T) {
	rose := rose12()
	for name, c := range map[string]struct {
		spoil    func(h []SeriesHour) []SeriesHour
		coverage float64
		missing  []int
		refused  bool
	}{
		"whole":         {func(h []SeriesHour) []SeriesHour { return h }, 1, nil, false},
		"a row in six":  {func(h []SeriesHour) []SeriesHour { return pickHours(h, func(i int) bool { return i%6 != 1 }) }, 5.0 / 6, nil, false},
		"a row in four": {func(h []SeriesHour) []SeriesHour { return pickHours(h, func(i int) bool { return i%4 != 1 }) }, 0.75, nil, true},
		"no February": {func(h []SeriesHour) []SeriesHour {
			return pickHours(h, func(i int) bool { return i < 744 || i >= 744+672 })
		}, 1 - 672.0/8760, []int{2}, true},
		"half a year": {func(h []SeriesHour) []SeriesHour { return h[:4344] }, 1, []int{7, 8, 9, 10, 11, 12}, true},
		"not valid":   {func(h []SeriesHour) []SeriesHour { return invalid(h, func(i int) bool { return i%4 == 1 }) }, 0.75, nil, true},
		"a single March": {func(h []SeriesHour) []SeriesHour {
			return pickHours(h, func(i int) bool { return i < 1416 || i >= 2159 })
		}, 1 - 743.0/8760, nil, false},
	} {
		hours := c.spoil(drawn(rose, 8760, centres))
		fit, err := FitSeries(hours, SeriesOptions{})
		if errors.Is(err, ErrSeriesGaps) != c.refused || fit.Usable == c.refused || fit.Gaps != c.refused || (err != nil) != c.refused {
			t.Errorf("%s: refused %v, usable %t", name, err, fit.Usable)
		}
		if !near(fit.CoverageFrac, c.coverage, 1e-3) || !slices.Equal(fit.MissingMonths, c.missing) {
			t.Errorf("%s: coverage %g, months without hours %v", name, fit.CoverageFrac, fit.MissingMonths)
		}
		in := farm(t, "iea_3_4mw_130", Position{})
		if _, err := SeriesYear(in, hours, fit); errors.Is(err, ErrSeriesGaps) != c.refused {
			t.Errorf("%s: the farm says %v", name, err)
		}
		fit, err = FitSeries(hours, SeriesOptions{AllowGaps: true})
		if err != nil || !fit.Usable || fit.Gaps != c.refused {
			t.Errorf("%s: gaps are allowed, and yet %v", name, err)
		}
		if r, err := SeriesYear(in, hours, fit); err != nil || !near(r.GrossMWhPerYr, year(t, in).GrossMWhPerYr, 0.02) {
			t.Errorf("%s: %g MWh, %v", name, r.GrossMWhPerYr, err)
		}
	}
}

func pickHours(h []SeriesHour, keep func(i int) bool) []SeriesHour {
	var out []SeriesHour
	for i := range h {
		if keep(i) {
			out = append(out, h[i])
		}
	}
	return out
}

func invalid(h []SeriesHour, out func(i int) bool) []SeriesHour {
	for i := range h {
		if out(i) {
			h[i] = SeriesHour{Hour: h[i].Hour, SpeedMPerS: math.NaN()}
		}
	}
	return h
}

func TestLeapDaysCount(t *testing.T) {
	hours := constant(8784, 8, 0) // 2004
	for i := range hours {
		hours[i].Hour += 3 * 8760
	}
	in := farm(t, "iea_3_4mw_130", Position{})
	r := series(t, in, hours)
	if r.MonthValidHours[1] != 696 || r.MonthValidHours[11] != 744 {
		t.Errorf("hours by month %v", r.MonthValidHours)
	}
	if want := series(t, in, constant(8760, 8, 0)); !near(r.WakedMWhPerYr, want.WakedMWhPerYr, 1e-12) || !near(r.MonthMWh[1], want.MonthMWh[1], 1e-12) {
		t.Errorf("a leap year gives %g, another %g", r.WakedMWhPerYr, want.WakedMWhPerYr)
	}
	var m months
	for hour, want := range map[int64]int{-1: 11, 0: 0, 31*24 - 1: 0, 31 * 24: 1, -24*31 - 1: 10} {
		if got := m.of(hour); got != want {
			t.Errorf("hour %d lies in month %d, want %d", hour, got, want)
		}
	}
}

func TestSeriesFits(t *testing.T) {
	w := Weibull{8, 2.2}
	rose := make([]Sector, 12)
	for i := range rose {
		rose[i] = Sector{1.0 / 12, w}
	}
	hours := drawn(rose, 8760, centres)
	fit := fitted(t, hours)
	if fit.WholeHow != FitEnergy || fit.FellBack != 0 || fit.DirectionHours != 8760 || fit.ValidHours != 8760 || fit.SpannedHours != 8760 {
		t.Errorf("%+v", fit)
	}
	for name, got := range map[string]Weibull{"energy": fit.EnergyPreserving, "likelihood": fit.MaximumLikelihood, "a sector": fit.Rose[4].Weibull, "whole": fit.Whole} {
		if !near(got.AMPerS, w.AMPerS, 0.01) || !near(got.K, w.K, 0.02) {
			t.Errorf("%s: %v, drawn from %v", name, got, w)
		}
	}
	if !near(fit.MeanMPerS, w.Mean(), 1e-3) || math.Abs(fit.CalmFrac-w.CDF(CalmBelowMPerS)) > 12.0/8760 || !near(fit.Rose[3].FrequencyFrac, 1.0/12, 1e-9) {
		t.Errorf("mean %g, calm %g, frequency %g", fit.MeanMPerS, fit.CalmFrac, fit.Rose[3].FrequencyFrac)
	}
	// Calms weigh on the fits that keep energy, not on the likelihood; they are told apart.
	for i := range hours {
		if i%10 == 0 {
			hours[i].SpeedMPerS = 0
		}
	}
	calm := fitted(t, hours)
	if !(calm.CalmFrac > 0.1 && calm.CalmFrac < 0.11) || !near(calm.MaximumLikelihood.K, fit.MaximumLikelihood.K, 0.02) || !(calm.Whole.Moment(3) < 0.92*fit.Whole.Moment(3)) {
		t.Errorf("calm share %g, likelihood %v, whole %v", calm.CalmFrac, calm.MaximumLikelihood, calm.Whole)
	}
	// A sector with few hours has the shape of the whole.
	few := drawn(rose, 8760, centres)
	kept := 0
	for i := range few {
		if few[i].FromDeg == 60 {
			if kept++; kept > 40 {
				few[i].FromDeg = 90
			}
		}
	}
	fit = fitted(t, few)
	if fit.FellBack != 1 || fit.SectorHow[2] != FitShape || fit.SectorHours[2] != 40 || fit.Rose[2].Weibull.K != fit.Whole.K || fit.SectorHow[3] != FitEnergy {
		t.Errorf("%d sectors fell back: %v with %v hours", fit.FellBack, fit.SectorHow, fit.SectorHours)
	}
	// No distribution is as steady as a constant wind.
	fit = fitted(t, constant(8760, 8, 359.9))
	if fit.WholeHow != FitRayleigh || !near(fit.Whole.Mean(), 8, 1e-12) || fit.Rose[0].FrequencyFrac != 1 || fit.FellBack != 1 || fit.SectorHow[1] != FitNone {
		t.Errorf("constant wind: %v %v, rose %v", fit.WholeHow, fit.Whole, fit.Rose)
	}
	// A share above the mean that no shape has, but one that is likeliest.
	var odd []float64
	for i := range 100 {
		odd = append(odd, 4+float64(i%10)/100)
	}
	odd = append(odd, 30)
	if _, err := FitEnergyPreserving(odd); err == nil {
		t.Fatal("the odd sample has a fit that keeps energy")
	}
	s := SeriesFit{Whole: w}
	got, how, err := s.fitSector(odd)
	var cube float64
	for _, v := range odd {
		cube += v * v * v / float64(len(odd))
	}
	if err != nil || how != FitLikelihood || !near(got.Moment(3), cube, 1e-9) {
		t.Errorf("odd sample: %v by %d, mean cube %g, want %g; %v", got, how, got.Moment(3), cube, err)
	}
}

func TestSeriesRefusesBadHours(t *testing.T) {
	nan := math.NaN()
	for name, spoil := range map[string]func(h []SeriesHour) []SeriesHour{
		"none":              func([]SeriesHour) []SeriesHour { return nil },
		"none valid":        func(h []SeriesHour) []SeriesHour { return invalid(h, func(int) bool { return true }) },
		"speed nan":         func(h []SeriesHour) []SeriesHour { h[3].SpeedMPerS = nan; return h },
		"speed below 0":     func(h []SeriesHour) []SeriesHour { h[3].SpeedMPerS = -1; return h },
		"direction 999":     func(h []SeriesHour) []SeriesHour { h[3].FromDeg = 999; return h },
		"direction nan":     func(h []SeriesHour) []SeriesHour { h[3].FromDeg = nan; return h },
		"temperature":       func(h []SeriesHour) []SeriesHour { h[3].TempC, h[3].HasTemp = 288, true; return h },
		"pressure in hPa":   func(h []SeriesHour) []SeriesHour { h[3].PressurePa, h[3].HasPressure = 1013, true; return h },
		"an hour twice":     func(h []SeriesHour) []SeriesHour { h[3].Hour = h[9].Hour; return h },
		"a hundred years":   func(h []SeriesHour) []SeriesHour { h[3].Hour += 1e7; return h },
		"outside the ages":  func(h []SeriesHour) []SeriesHour { h[3].Hour = math.MinInt64; return h },
		"nothing but calms": func([]SeriesHour) []SeriesHour { return constant(8760, 0, 0) },
	} {
		hours := spoil(drawn(rose12(), 8760, centres))
		fit, err := FitSeries(hours, SeriesOptions{})
		if err == nil {
			_, err = SeriesYear(farm(t, "iea_3_4mw_130", Position{}), hours, fit)
		}
		if err == nil {
			t.Errorf("%s: accepted", name)
		}
	}
	hours := drawn(rose12(), 8760, centres)
	fit := fitted(t, hours)
	in := farm(t, "iea_3_4mw_130", Position{})
	if _, err := SeriesYear(in, hours[1:], fit); err == nil {
		t.Error("the fit of other hours was accepted")
	}
	hours[0].Valid = false
	if _, err := SeriesYear(in, hours, fit); err == nil {
		t.Error("the fit of hours of which fewer were in force was accepted")
	}
	hours[0].Valid = true
	hours[7].FromDeg = nan
	if _, err := SeriesYear(in, hours, fit); err == nil {
		t.Error("a direction that is no number was accepted")
	}
	hours[7].FromDeg = 0
	for name, spoil := range map[string]func(*FarmInput){
		"no positions": func(in *FarmInput) { in.At = nil }, "elevation": func(in *FarmInput) { in.Site.ElevationM = 2e4 }, "height": func(in *FarmInput) { in.Site.RefHeightM = 0 },
		"loss": func(in *FarmInput) { in.Losses = []Loss{{"x", 2}} },
	} {
		in := farm(t, "iea_3_4mw_130", Position{})
		spoil(&in)
		if _, err := SeriesYear(in, hours, fit); err == nil {
			t.Errorf("%s: accepted", name)
		}
	}
}

func BenchmarkSeriesYear(b *testing.B) {
	for _, years := range []int{1, 10} {
		for _, n := range []int{1, 5, 25} {
			b.Run(fmt.Sprintf("%d_years_%d", years, n), func(b *testing.B) {
				in := farm(b, "iea_3_4mw_130", scatter(n, 7, 300*math.Sqrt(float64(n))+300)...)
				hours := drawn(in.Site.Rose, years*8760, centres)
				for i := range hours {
					hours[i].TempC, hours[i].HasTemp = float64(i%30), true
					hours[i].PressurePa, hours[i].HasPressure = 100000, true
				}
				fit := fitted(b, hours)
				b.ReportAllocs()
				for b.Loop() {
					if _, err := SeriesYear(in, hours, fit); err != nil {
						b.Fatal(err)
					}
				}
			})
		}
	}
}

func BenchmarkFitSeries(b *testing.B) {
	for _, years := range []int{1, 10} {
		b.Run(fmt.Sprintf("%d_years", years), func(b *testing.B) {
			hours := drawn(rose12(), years*8760, centres)
			for b.Loop() {
				fitted(b, hours)
			}
		})
	}
}
