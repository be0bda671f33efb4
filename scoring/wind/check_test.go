package wind

import (
	"fmt"
	"math"
	"os"
	"strconv"
	"strings"
	"testing"

	"groundtally/assets/citedtable"
	"groundtally/scoring/units"
)

var root = os.DirFS("../..")

func table(t testing.TB, name string) *citedtable.Table {
	t.Helper()
	tab, err := citedtable.ParseFS(root, name)
	if err != nil {
		t.Fatal(err)
	}
	return tab
}

func turbines(t testing.TB) []Turbine {
	t.Helper()
	all, err := ParseTurbines(table(t, "assets/params/turbine_curves.csv"), table(t, "assets/params/turbines.csv"))
	if err != nil {
		t.Fatal(err)
	}
	return all
}

func turbine(t testing.TB, id string) Turbine {
	t.Helper()
	m, err := FindTurbine(turbines(t), id)
	if err != nil {
		t.Fatal(err)
	}
	return m
}

func defaults(t testing.TB) Defaults {
	t.Helper()
	d, err := ParseDefaults(table(t, "assets/params/wind_defaults.csv"))
	if err != nil {
		t.Fatal(err)
	}
	return d
}

func settings(t testing.TB) Settings {
	t.Helper()
	s, err := defaults(t).Settings()
	if err != nil {
		t.Fatal(err)
	}
	return s
}

func numbers(s string) []float64 {
	var out []float64
	for _, f := range strings.Fields(s) {
		x, err := strconv.ParseFloat(f, 64)
		if err != nil {
			return nil
		}
		out = append(out, x)
	}
	return out
}

func TestCheckTable(t *testing.T) {
	checks, err := table(t, "testdata/check/wind.csv").Checks()
	if err != nil {
		t.Fatal(err)
	}
	if len(checks) < 40 {
		t.Fatalf("only %d check values", len(checks))
	}
	seen := map[string]bool{}
	for _, c := range checks {
		if seen[c.ID] {
			t.Errorf("check %s stands twice", c.ID)
		}
		seen[c.ID] = true
		t.Run(c.ID+"_"+c.Quantity, func(t *testing.T) {
			got, err := compute(t, c)
			if err != nil {
				t.Fatal(err)
			}
			if !c.OK(got) {
				t.Errorf("got %.8g, want %.8g within %g (%s)", got, c.Expected, c.Tolerance, c.Source)
			}
		})
	}
}

func compute(t *testing.T, c citedtable.Check) (float64, error) {
	in := func(name string) float64 {
		x, ok := c.In[name]
		if !ok {
			t.Fatalf("check %s has no input %s", c.ID, name)
		}
		return x
	}
	rayleigh := func() Weibull {
		w, err := Rayleigh(in("mean"))
		if err != nil {
			t.Fatal(err)
		}
		return w
	}
	pick := func(w Weibull, err error) (float64, error) {
		if strings.HasSuffix(c.Quantity, "_k") {
			return w.K, err
		}
		return w.AMPerS, err
	}
	generic := func() (*PowerCurve, error) {
		g, err := defaults(t).Generic(in("rated_kw"), in("d"))
		if err != nil {
			return nil, err
		}
		g.TurbulenceFrac = in("ti")
		return g.Curve()
	}
	curve := func() Turbine { return turbine(t, c.Text["turbine"]) }

	switch c.Quantity {
	case "weibull_mean":
		return Weibull{in("a"), in("k")}.Mean(), nil
	case "weibull_variation":
		w := Weibull{1, in("k")}
		return w.Std() / w.Mean(), nil
	case "pattern_factor":
		return Weibull{1, in("k")}.EnergyPatternFactor(), nil
	case "rayleigh_a":
		return rayleigh().AMPerS, nil
	case "rayleigh_above":
		return rayleigh().Above(in("v")), nil
	case "rayleigh_between":
		return rayleigh().CDF(in("hi")) - rayleigh().CDF(in("lo")), nil
	case "rayleigh_power_density":
		return rayleigh().PowerDensity(in("rho")), nil
	case "mean_std_k", "mean_std_a":
		return pick(FromMeanAndStd(in("mean"), in("std")))
	case "mle_k", "mle_a":
		w, _, err := FitMaximumLikelihood(numbers(c.Text["samples"]))
		return pick(w, err)
	case "energy_fit_k", "energy_fit_a":
		return pick(FitEnergyPreserving(numbers(c.Text["samples"])))
	case "sample_moments_k", "sample_moments_a":
		vs := numbers(c.Text["samples"])
		var m, s float64
		for _, v := range vs {
			m += v / float64(len(vs))
		}
		for _, v := range vs {
			s += (v - m) * (v - m) / float64(len(vs)-1)
		}
		return pick(FromMeanAndStd(m, math.Sqrt(s)))
	case "combine_mean", "combine_k", "combine_a":
		w, err := CombineSectors([]Sector{{in("f1"), Weibull{in("a1"), in("k1")}}, {in("f2"), Weibull{in("a2"), in("k2")}}})
		if c.Quantity == "combine_mean" {
			return w.Mean(), err
		}
		return pick(w, err)
	case "log_law":
		return LogLaw(in("v"), in("zr"), in("z"), in("z0"), in("d"))
	case "weibull_log_a":
		w, err := Weibull{in("a"), in("k")}.AtHeightLog(in("zr"), in("z"), in("z0"), in("d"))
		return w.AMPerS, err
	case "power_law":
		return PowerLaw(in("v"), in("zr"), in("z"), in("alpha"))
	case "roughness_class":
		return RoughnessClass(in("z0"))
	case "isa_density":
		a, err := StandardAtmosphere(in("h"))
		return a.DensityKgPerM3, err
	case "isa_temperature":
		a, err := StandardAtmosphere(in("h"))
		return a.TemperatureK, err
	case "isa_pressure":
		a, err := StandardAtmosphere(in("h"))
		return a.PressurePa, err
	case "moist_density":
		return MoistAirDensity(in("t"), in("p"), in("phi"))
	case "normalised_speed":
		return NormalisedSpeed(in("v"), in("rho")), nil
	case "momentum_ct":
		return MomentumCt(in("cp"))
	case "gross_a":
		return GrossMWhPerYr(curve().Curve, rayleigh()), nil
	case "gross_bins":
		return GrossBinsMWhPerYr(curve().Curve, rayleigh()), nil
	case "gross_exact":
		return GrossExactMWhPerYr(curve().Curve, rayleigh()), nil
	case "gross_quadrature":
		return GrossQuadratureMWhPerYr(curve().Curve, rayleigh()), nil
	case "gross_quadrature_per_exact":
		w, err := FromMeanAndK(in("mean"), in("k"))
		return GrossQuadratureMWhPerYr(curve().Curve, w) / GrossExactMWhPerYr(curve().Curve, w), err
	case "capacity_factor":
		m := curve()
		return CapacityFactor(GrossMWhPerYr(m.Curve, rayleigh()), m.RatedKW), nil
	case "rated_speed":
		return RatedSpeed(in("rated_kw"), in("d"), in("cp")), nil
	case "generic_gross":
		g, err := generic()
		if err != nil {
			return 0, err
		}
		return GrossMWhPerYr(g, rayleigh()), nil
	case "generic_power":
		g, err := generic()
		if err != nil {
			return 0, err
		}
		return g.PowerKW(in("v")), nil
	case "jensen":
		return JensenDeficit(in("ct"), in("k"), in("x"), in("d")), nil
	case "jensen_speed":
		return in("v") * (1 - JensenDeficit(in("ct"), in("k"), in("x"), in("d"))), nil
	case "jensen_power_ratio":
		return math.Pow(1-JensenDeficit(in("ct"), in("k"), in("x"), in("d")), 3), nil
	case "jensen_rss_left":
		return 1 - RootSumSquare(JensenDeficit(in("ct"), in("k"), in("x1"), 1), JensenDeficit(in("ct"), in("k"), in("x2"), 1)), nil
	case "jensen_decay":
		return JensenDecay(in("h"), in("z0"))
	case "overlap_area":
		return OverlapArea(in("r"), in("rw"), in("c")), nil
	case "overlap_frac":
		return OverlapArea(in("r"), in("rw"), in("c")) / discArea(2*in("r")), nil
	case "gaussian_epsilon":
		return gaussianEpsilon(in("ct")), nil
	case "gaussian":
		return GaussianDeficit(in("ct"), in("kstar"), in("x"), in("y")), nil
	case "wake_along":
		// A machine with one thrust at all speeds, wind from the north.
		c, err := NewPowerCurve([]CurvePoint{{SpeedMPerS: 3, PowerKW: 1, Ct: in("ct"), HasCt: true}, {SpeedMPerS: 25, PowerKW: 1, Ct: in("ct"), HasCt: true}})
		if err != nil {
			return 0, err
		}
		set := settings(t)
		set.AmbientTIFrac = in("ti")
		out, err := WakeAlong(FarmInput{Site: Site{Rose: []Sector{{1, Weibull{8, 2}}}, RefHeightM: 100},
			Turbine: Turbine{ID: "disc", RatedKW: 1, RotorDiameterM: 100, Curve: c}, HubHeightM: 100, At: []Position{{}}, Settings: set},
			[]Position{{100 * in("y"), -100 * in("x")}}, 0, 8)
		if err != nil {
			return 0, err
		}
		return out[0], nil
	case "wake_growth":
		return WakeGrowth(in("ti")), nil
	case "iea37_aep", "iea37_bin":
		bins := iea37(t, int(in("turbines")))
		if c.Quantity == "iea37_bin" {
			return bins[int(in("direction"))], nil
		}
		var sum float64
		for _, b := range bins {
			sum += b
		}
		return sum, nil
	case "exceedance":
		return Exceedance(in("p50"), in("sigma"), in("p"))
	case "exceedance_single_year":
		ls, err := Exceedances(in("p50"), in("sigma"), in("sigma_year"))
		for _, l := range ls {
			if l.ProbabilityFrac == in("p") {
				return l.SingleYearMWhPerYr, err
			}
		}
		return 0, err
	case "uncertainty_shared", "uncertainty_own", "uncertainty_total":
		cs := Components{{Name: "shared", SpeedFrac: in("shared_speed"), Shared: true}, {Name: "shared too", EnergyFrac: in("shared_energy"), Shared: true},
			{Name: "own", SpeedFrac: in("own_speed")}, {Name: "own too", EnergyFrac: in("own_energy")}}
		shared, own, err := cs.Parts(in("sensitivity"))
		switch c.Quantity {
		case "uncertainty_shared":
			return shared, err
		case "uncertainty_own":
			return own, err
		}
		return cs.Total(in("sensitivity"))
	case "land_permanent", "land_temporary", "land_tracks":
		l, err := Works{Turbines: int(in("n")), FoundationM2: in("foundation"), CranePadM2: in("pad"), LaydownM2: in("laydown"), CompoundM2: in("compound"),
			TrackWidthM: in("track_width"), TrackLengthM: in("track_length"), SubstationM2: in("substation")}.Land()
		switch c.Quantity {
		case "land_permanent":
			return l.PermanentHa, err
		case "land_temporary":
			return l.TemporaryHa, err
		}
		return l.TracksHa, err
	case "root_sum_square":
		return RootSumSquare(numbers(c.Text["values"])...), nil
	case "chain":
		var ls []Loss
		for i, x := range numbers(c.Text["losses"]) {
			ls = append(ls, Loss{fmt.Sprint("loss ", i), x})
		}
		_, net, err := Chain(1, ls)
		return net, err
	case "spacing_density":
		return SpacingDensityMWPerKm2(in("rated_kw"), in("d"), in("a"), in("b"))
	case "density":
		return DensityMWPerKm2(in("ha_per_mw")), nil
	case "sensitivity":
		m := curve()
		r, err := FarmYear(FarmInput{Site: Site{Rose: []Sector{{1, rayleigh()}}, RefHeightM: m.HubHeightM, ElevationM: -m.HubHeightM},
			Turbine: m, HubHeightM: m.HubHeightM, At: []Position{{}}, Settings: settings(t)})
		return r.SpeedSensitivity, err
	}
	return 0, fmt.Errorf("unknown quantity %q", c.Quantity)
}

// iea37 gives the energy of each of the 16 directions of the case study's example layout.
func iea37(t *testing.T, n int) []float64 {
	const ratedKW, cutIn, rated, cutOut, d, hub, v = 3350.0, 4.0, 9.8, 25.0, 130.0, 110.0, 9.8
	power := func(v float64) float64 {
		switch {
		case v < cutIn || v >= cutOut:
			return 0
		case v > rated:
			return ratedKW
		}
		return ratedKW * math.Pow((v-cutIn)/(rated-cutIn), 3)
	}
	curve, err := NewPowerCurve([]CurvePoint{{SpeedMPerS: cutIn, Ct: 8.0 / 9, HasCt: true}, {SpeedMPerS: rated, PowerKW: ratedKW, Ct: 8.0 / 9, HasCt: true}, {SpeedMPerS: cutOut, PowerKW: ratedKW, Ct: 8.0 / 9, HasCt: true}})
	if err != nil {
		t.Fatal(err)
	}
	machine := Turbine{ID: "iea37", RatedKW: ratedKW, RotorDiameterM: d, Curve: curve}
	set := settings(t)
	set.Wake = WakeIEA37
	var at []Position
	var bins []float64
	round := func(x float64) float64 { return math.Round(x*1e4) / 1e4 }
	for _, r := range table(t, "testdata/check/iea37.csv").Rows {
		switch r.Text("fact") {
		case "ring":
			if r.Text("turbines") != strconv.Itoa(n) {
				continue
			}
			count, err1 := r.Float("count")
			radius, err2 := r.Float("radius_m")
			if err1 != nil || err2 != nil {
				t.Fatal(err1, err2)
			}
			for i := range int(count) {
				s, c := math.Sincos(2 * math.Pi * float64(i) / count)
				at = append(at, Position{round(radius * c), round(radius * s)})
			}
		case "direction":
			deg, err1 := r.Float("from_deg")
			f, err2 := r.Float("frequency_frac")
			if err1 != nil || err2 != nil {
				t.Fatal(err1, err2)
			}
			speeds, err := WakeSpeeds(machine, hub, at, set, deg, v)
			if err != nil {
				t.Fatal(err)
			}
			var p float64
			for _, u := range speeds {
				p += power(u)
			}
			bins = append(bins, f*p*units.HoursPerYear/units.KWPerMW)
		default:
			t.Fatalf("unknown fact %q", r.Text("fact"))
		}
	}
	if len(at) != n {
		t.Fatalf("%d positions, want %d", len(at), n)
	}
	return bins
}
