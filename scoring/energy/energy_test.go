package energy

import (
	"errors"
	"maps"
	"math"
	"math/rand/v2"
	"os"
	"strings"
	"testing"

	"groundtally/assets/citedtable"
	"groundtally/scoring"
	"groundtally/scoring/params"
	"groundtally/scoring/solar"
	"groundtally/scoring/units"
)

var shipped = os.DirFS("../../assets/params")

func inventory(t testing.TB) *params.Inventory {
	t.Helper()
	tab, err := params.OpenTable(shipped, ".", "inventory", "2026-01")
	if err != nil {
		t.Fatal(err)
	}
	inv, err := params.ParseInventory(tab)
	if err != nil {
		t.Fatal(err)
	}
	return inv
}

func must(t testing.TB) func(float64, error) float64 {
	return func(v float64, err error) float64 {
		t.Helper()
		if err != nil {
			t.Fatal(err)
		}
		return v
	}
}

// example is one of two worked plants.
type example struct {
	balance                                         Balance
	lifeYr, effective, firstYearMJ, upkeep, stockMJ float64
}

// plantExample builds A, 5 MWp of solar on arable land, or B, three 4 MW turbines on peat, from the
// shipped inventory.
func plantExample(t testing.TB, name string) example {
	t.Helper()
	inv, ok := inventory(t), must(t)
	item := func(id string, amount float64) Input {
		it, err := inv.Get(id)
		if err != nil {
			t.Fatal(err)
		}
		return Input{ItemID: id, Boundary: it.Boundary, MJ: it.Energy.Central * amount}
	}
	var e example
	var in []Input
	var loss, y1 float64
	switch name {
	case "A":
		e.lifeYr, loss, y1 = 30, 0.02, 5e6
		e.effective = ok(EffectiveYears(0.005, e.lifeYr))
		gen := item("pv_system_mono", 5000)
		in = []Input{gen, item("track", 0.5), item("cable_mv", 2), item("transformer", 6300),
			item("pv_upkeep", e.lifeYr*gen.MJ), item("pv_inverter_replacement", 5000), item("pv_decommissioning", gen.MJ)}
		e.upkeep = item("pv_upkeep", gen.MJ).MJ
		e.stockMJ = 3.26 * units.KgPerT * 37
	case "B":
		e.lifeYr, loss, y1 = 25, 0.03, 12000*0.35*units.HoursPerYear
		e.effective = ok(EffectiveYears(0, e.lifeYr))
		gen := item("wind_turbine", 12000)
		in = []Input{gen, item("track", 3), item("cable_mv", 5), item("transformer", 15000),
			item("wind_upkeep", e.lifeYr*gen.MJ), item("wind_decommissioning", gen.MJ)}
		e.upkeep = item("wind_upkeep", gen.MJ).MJ
		e.stockMJ = 2703 * units.KgPerT * 37
	default:
		t.Fatalf("no plant %q", name)
	}
	sum, err := Sum(in)
	if err != nil {
		t.Fatal(err)
	}
	e.firstYearMJ = y1 * units.MJPerKWh
	e.balance.Inputs = sum
	e.balance.GeneratedMJ = ok(GeneratedMJ(y1, e.effective))
	e.balance.DeliveredMJ = ok(DeliveredMJ(e.balance.GeneratedMJ, loss, 0))
	return e
}

func exampleValue(t testing.TB, quantity, plant string) float64 {
	e, ok := plantExample(t, plant), must(t)
	b := e.balance
	switch quantity {
	case "generated_tj":
		return b.GeneratedMJ / units.MJPerTJ
	case "input_b1_tj":
		return b.Inputs.B1MJ / units.MJPerTJ
	case "input_b2_tj":
		return b.Inputs.B2MJ / units.MJPerTJ
	case "input_b3_tj":
		return b.Inputs.B3MJ / units.MJPerTJ
	case "eroi_b1":
		return ok(b.EROI(params.Generation))
	case "eroi_b2":
		return ok(b.EROI(params.Delivered))
	case "eroi_b3":
		return ok(b.EROI(params.Extended))
	case "eroi_stock":
		return ok(b.EROIStock(e.stockMJ, 0))
	case "net_electric_tj":
		return ok(b.NetMJ(params.Extended, Electric, 0.35)) / units.MJPerTJ
	case "net_electric_gwh":
		return ok(b.NetMJ(params.Extended, Electric, 0.35)) / units.MJPerGWh
	case "net_to_gross_b3":
		return ok(b.NetShare(params.Extended, AsAccounted, 0))
	case "eroi_primary_b1":
		return ok(b.EROIPrimary(params.Generation, 0.35))
	case "payback_b1_no_upkeep_yr", "payback_b1_yr":
		up := e.upkeep
		if quantity == "payback_b1_no_upkeep_yr" {
			up = 0
		}
		p, err := PaybackYears(b.Inputs.B1MJ, e.firstYearMJ, up, 0.35)
		if err != nil || p.Never {
			t.Fatalf("payback %v, %v", p, err)
		}
		return p.Yr
	case "effective_years_of":
		return e.effective
	}
	t.Fatalf("unknown example quantity %q", quantity)
	return 0
}

func crowding(step, w float64) (DensityOptima, error) {
	var pts []DensityPoint
	for _, p := range crowdingPoints(step) {
		pts = append(pts, DensityPoint{UnitsPerHa: p.UnitsPerHa, EnergyMJPerHa: p.EnergyMJPerHa, InputMJPerHa: p.InputMJPerHa})
	}
	return FindDensityOptima(pts, w)
}

// crowdingPoints samples E = 100n/(1+n/4), I = 50+2n.
func crowdingPoints(step float64) []CrowdingPoint {
	var pts []CrowdingPoint
	for i := 1; float64(i)*step <= 120; i++ {
		n := float64(i) * step
		pts = append(pts, CrowdingPoint{UnitsPerHa: n, EnergyMJPerHa: 100 * n / (1 + n/4), InputMJPerHa: 50 + 2*n})
	}
	return pts
}

// inverse finds the input of a monotone function that gives the wanted value.
func inverse(t testing.TB, want, low, high float64, f func(x float64) (float64, error)) float64 {
	t.Helper()
	x, found, err := SwapWithin(low, high, func(x float64) (float64, error) {
		y, err := f(x)
		return y - want, err
	})
	if err != nil || !found {
		t.Fatalf("no input gives %v: %v", want, err)
	}
	return x
}

func without(in map[string]float64, name string) map[string]float64 {
	out := maps.Clone(in)
	delete(out, name)
	return out
}

// quantityValue evaluates one quantity of the graph.
func quantityValue(t testing.TB, name string, x ...float64) float64 {
	t.Helper()
	for _, q := range Quantities() {
		if q.Name == name {
			in := make([]scoring.Value, len(x))
			for i := range x {
				in[i] = scoring.Num(x[i])
			}
			v := q.Eval.Values(in)
			if len(in) != len(q.Inputs) || !v.OK() {
				t.Fatalf("%s of %v is %+v", name, x, v)
			}
			return v.X
		}
	}
	t.Fatalf("no quantity %q", name)
	return 0
}

func bill(t testing.TB, inv *params.Inventory, in map[string]float64) float64 {
	var ms []Mass
	for _, m := range [][2]string{{"steel", "steel"}, {"aluminium", "aluminium"}, {"copper", "copper"}, {"pvc_hdpe", "pvc"}, {"epdm", "epdm"},
		{"concrete", "concrete"}, {"cast_iron", "cast_iron"}, {"composite", "composite"}, {"polymer", "polyethylene"}, {"zinc", "zinc"}} {
		kg, there := in[m[0]]
		if !there {
			continue
		}
		it, err := inv.Get("material_" + m[1])
		if err != nil {
			t.Fatal(err)
		}
		ms = append(ms, Mass{Material: m[1], Kg: kg, MJPerKg: it.Energy.Central})
	}
	if len(ms) != len(in) {
		t.Fatalf("%d of %d materials are known", len(ms), len(in))
	}
	return must(t)(EmbodiedMJ(ms))
}

func TestCheckTable(t *testing.T) {
	tab, err := citedtable.ParseFS(os.DirFS("../../testdata/check"), "energy.csv")
	if err != nil {
		t.Fatal(err)
	}
	checks, err := tab.Checks()
	if err != nil {
		t.Fatal(err)
	}
	inv := inventory(t)
	for _, c := range checks {
		if strings.HasPrefix(c.Quantity, "factor_") {
			continue // run by scoring/params, which owns the distributions
		}
		t.Run(c.ID+"_"+c.Quantity, func(t *testing.T) {
			ok := must(t)
			in := c.In
			var got float64
			switch c.Quantity {
			case "effective_years":
				got = ok(EffectiveYears(in["d"], in["T"]))
			case "effective_years_linear":
				got = ok(EffectiveYearsLinear(in["d"], in["T"]))
			case "life_over_payback":
				// A plant with constant output whose inputs are all capital: its return is T/EPBT.
				capital := ok(CapitalFromPayback(in["epbt"], 1000, 1, 0.35)) * units.MJPerGJ
				g := ok(GeneratedMJ(1000, in["T"]))
				got = ok(Balance{GeneratedMJ: g, Inputs: Inputs{B1MJ: capital}}.EROIPrimary(params.Generation, 0.35))
			case "capital_from_payback":
				got = ok(CapitalFromPayback(in["epbt"], in["H"], in["PR"], in["eta"]))
			case "payback_to_mj_per_m2":
				got = ok(CapitalFromPayback(in["epbt"], in["H"], in["PR"], in["eta"])) * units.MJPerGJ * in["eff"]
			case "wind_life_gj_per_kw":
				got = ok(GeneratedMJ(in["CF"]*units.HoursPerYear, in["T"])) / units.MJPerGJ
			case "implied_gj_per_kw":
				got = ok(GeneratedMJ(in["CF"]*units.HoursPerYear, in["T"])) / units.MJPerGJ / in["eroi"]
			case "net_to_gross":
				got = ok(NetToGross(in["eroi"]))
			case "primary_equivalent":
				got = ok(Balance{GeneratedMJ: in["eroi"], Inputs: Inputs{B1MJ: 1}}.EROIPrimary(params.Generation, in["eta"]))
			case "bos_embodied":
				got = bill(t, inv, in)
			case "wind_materials_gj_per_mw":
				got = bill(t, inv, in) // t/MW times MJ/kg is GJ/MW
			case "power_density":
				got = ok(PowerDensityWPerM2(in["gwh_per_ha_yr"]*units.MJPerGWh, 1, 1))
			case "human_persons":
				got = ok(HumanPersons(in["kwh_per_yr"], in["w"]))
			case "density_return", "density_best_return", "density_net", "density_best_net":
				o, err := crowding(in["step"], in["w"])
				if err != nil {
					t.Fatal(err)
				}
				got = map[string]float64{"density_return": o.Return, "density_best_return": o.BestReturn, "density_net": o.Net, "density_best_net": o.BestNetMJPerHa}[c.Quantity]
			case "saving_equivalent":
				got = ok(SavingEquivalent(in["mwh"], in["dist_loss"], in["rebound"]))
			case "saving_span":
				r, err := Saving{DeliveredMWhPerYr: in["mwh"], DistributionLossFrac: Same(in["dist_loss"]), DirectRebound: Same(in["rebound"]), EconomyRebound: Same(in["rebound"])}.Equal()
				if err != nil || r.NetKnown {
					t.Fatalf("%+v, %v", r, err)
				}
				got = r.Direct.Central.MWhPerYr
			case "mj_of_kwh":
				got = in["kwh"] * units.MJPerKWh / units.MJPerTJ
			case "means_product":
				got = ok(PublishedMeans{ReturnPrimary: in["eroi"], PaybackYr: in["epbt"], LifeYr: in["T"]}.Product())
			case "means_sigma", "means_cv":
				// Two means of the same studies: their product alone tells the spread.
				sigma, cv, err := PublishedMeans{ReturnPrimary: in["eroi"], PaybackYr: in["epbt"], LifeYr: in["T"]}.Spread()
				if err != nil {
					t.Fatal(err)
				}
				if got = sigma; c.Quantity == "means_cv" {
					got = cv
				}
			case "yearly_behind_payback":
				got = inverse(t, in["epbt"], 1, 1e6, func(annual float64) (float64, error) {
					p, err := PaybackYears(in["mj"], annual, 0, 1)
					return p.Yr, err
				})
			case "conversion_behind_payback":
				got = inverse(t, in["mj"], 1e-3, 10, func(x float64) (float64, error) {
					gj, err := CapitalFromPayback(in["epbt"], in["H"], x, 1)
					return gj * units.MJPerGJ, err
				})
			case "bill_mass":
				var ms []Mass
				for _, name := range strings.Split(c.Text["of"], "+") {
					kg, there := in[name]
					if !there {
						t.Fatalf("no mass of %q", name)
					}
					ms = append(ms, Mass{Material: name, Kg: kg})
				}
				if len(ms) != len(in) {
					t.Fatalf("%d of %d masses are summed", len(ms), len(in))
				}
				got = ok(MassKg(ms))
			case "manufacture_share_gj_per_mw":
				got = bill(t, inv, without(in, "share")) / in["share"]
			case "conductor_kg_per_km":
				got = ok(ConductorKgPerKm(int(in["cores"]), in["mm2"], in["density"]))
			case "per_lane_km":
				got = in["per_lane_mile"] / units.KmPerMile
			case "mw_per_km2":
				got = units.MPerKm * units.MPerKm / units.M2PerHa / in["ha_per_mw"]
			case "specific_yield":
				got = quantityValue(t, "specific_yield_kwh_per_kw", in["gwh_per_ha_yr"]*units.MWhPerGWh, in["mw_per_ha"]*units.KWPerMW)
			case "matched_power":
				got = ok(MatchedPowerShare(in["eta"]))
			case "row_shade_limit_deg":
				// The lowest sun in the plane across the rows that shades nothing, from the solar engine.
				low := inverse(t, 0.5, 0, 89, func(height float64) (float64, error) {
					if solar.ShadedShare(90-height, in["tilt"], 0, in["gcr"]) > 0 {
						return 0, nil
					}
					return 1, nil
				})
				got = low
			case "crowding_net", "crowding_return", "crowding_best_net":
				cr, err := NewCrowding(crowdingPoints(in["step"]), in["eta"], false, false)
				if err != nil {
					t.Fatal(err)
				}
				o := map[string]DensityOptima{"mixed": cr.Mixed, "electric": cr.Electric}[c.Text["currency"]]
				got = map[string]float64{"crowding_net": o.Net, "crowding_return": o.Return, "crowding_best_net": o.BestNetMJPerHa}[c.Quantity]
			default:
				q, isExample := strings.CutPrefix(c.Quantity, "example_")
				if !isExample {
					t.Fatalf("unknown quantity %q", c.Quantity)
				}
				got = exampleValue(t, q, c.Text["plant"])
			}
			if !c.OK(got) {
				t.Errorf("got %v, want %v within %v (%s)", got, c.Expected, c.Tolerance, c.Source)
			}
		})
	}
}

func TestReturnIsUnchangedWhenAllEnergiesScale(t *testing.T) {
	ok := must(t)
	r := rand.New(rand.NewPCG(1, 2))
	for range 200 {
		b := Balance{GeneratedMJ: 1 + r.Float64()*1e6, DeliveredMJ: 1 + r.Float64()*1e6, Inputs: Inputs{B1MJ: 1 + r.Float64()*1e4, B2MJ: 2e4, B3MJ: 3e4}}
		s := math.Exp(r.NormFloat64() * 5)
		c := Balance{GeneratedMJ: s * b.GeneratedMJ, DeliveredMJ: s * b.DeliveredMJ, Inputs: Inputs{B1MJ: s * b.Inputs.B1MJ, B2MJ: s * b.Inputs.B2MJ, B3MJ: s * b.Inputs.B3MJ}}
		for _, at := range []params.Boundary{params.Generation, params.Delivered, params.Extended} {
			if x, y := ok(b.EROI(at)), ok(c.EROI(at)); math.Abs(x-y) > 1e-12*x {
				t.Fatalf("%s: %v became %v when all was scaled by %v", at, x, y, s)
			}
			if x, y := ok(b.NetShare(at, Electric, .35)), ok(c.NetShare(at, Electric, .35)); math.Abs(x-y) > 1e-12 {
				t.Fatalf("%s: net share %v became %v", at, x, y)
			}
		}
		if x, y := ok(b.EROIStock(500, 70)), ok(c.EROIStock(500*s, 70*s)); math.Abs(x-y) > 1e-12*x {
			t.Fatalf("stock return %v became %v", x, y)
		}
	}
}

// EROI in primary equivalents times payback is D(T) with ageing and first-year output, T without.
func TestReturnTimesPaybackIsEffectiveLife(t *testing.T) {
	ok := must(t)
	for _, d := range []float64{0, 0.005, 0.016} {
		D := ok(EffectiveYears(d, 25))
		b := Balance{GeneratedMJ: ok(GeneratedMJ(1e6, D)), Inputs: Inputs{B1MJ: 3e7}}
		p, err := PaybackYears(3e7, 1e6*units.MJPerKWh, 0, 0.35)
		if err != nil {
			t.Fatal(err)
		}
		if got := ok(b.EROIPrimary(params.Generation, 0.35)) * p.Yr; math.Abs(got-D) > 1e-9 {
			t.Errorf("d %v: %v, want %v", d, got, D)
		}
	}
}

func TestEffectiveYearsEqualsTheSum(t *testing.T) {
	for _, d := range []float64{0, 1e-12, 1e-6, 0.005, 0.3} {
		var want float64
		for y := range 30 {
			want += math.Pow(1-d, float64(y))
		}
		if got := must(t)(EffectiveYears(d, 30)); math.Abs(got-want) > 1e-9 {
			t.Errorf("d %v: %v, want %v", d, got, want)
		}
	}
}

func TestPaybackNever(t *testing.T) {
	for _, c := range []struct {
		capital, annual, upkeep float64
		want                    Payback
	}{{100, 35, 0, Payback{Yr: 1}}, {100, 35, 100, Payback{Never: true}}, {100, 0, 0, Payback{Never: true}}, {100, -5, 0, Payback{Never: true}}, {0, 35, 0, Payback{}}} {
		got, err := PaybackYears(c.capital, c.annual, c.upkeep, 0.35)
		if err != nil || math.Abs(got.Yr-c.want.Yr) > 1e-12 || got.Never != c.want.Never {
			t.Errorf("%+v: got %+v, %v", c, got, err)
		}
	}
}

func TestStockReturnNeverAboveStandard(t *testing.T) {
	e, ok := plantExample(t, "B"), must(t)
	std := ok(e.balance.EROI(params.Extended))
	for _, s := range []float64{0, 1, 1e6, 1e9} {
		if got := ok(e.balance.EROIStock(s, s)); got > std {
			t.Errorf("stock return %v above %v", got, std)
		}
	}
}

// The optima stand in the order return, net, energy; a mark at the end of the sweep is told.
func TestDensityOptimaOrder(t *testing.T) {
	o, err := crowding(0.5, 1)
	if err != nil {
		t.Fatal(err)
	}
	if !(o.Return < o.Net && o.Net < o.Energy) {
		t.Errorf("order broken: %+v", o)
	}
	if o.ReturnAtEnd || o.NetAtEnd || !o.EnergyMaxAtEnd {
		t.Errorf("ends: %+v", o)
	}
	if _, err := FindDensityOptima([]DensityPoint{{1, 1, 1}, {2, 1, 1}}, 1); !errors.Is(err, ErrInput) {
		t.Errorf("two points: %v", err)
	}
	if _, err := FindDensityOptima([]DensityPoint{{1, 1, 1}, {3, 1, 1}, {2, 1, 1}}, 1); !errors.Is(err, ErrInput) {
		t.Errorf("falling density: %v", err)
	}
}

func TestInputsAreCumulative(t *testing.T) {
	s, err := Sum([]Input{{"a", params.Extended, 4}, {"b", params.Generation, 1}, {"c", params.Delivered, 2}})
	if err != nil || s != (Inputs{1, 3, 7}) {
		t.Fatalf("got %+v, %v", s, err)
	}
	for _, in := range []Input{{"x", "", 1}, {"x", params.Generation, -1}, {"x", params.Generation, math.NaN()}} {
		if _, err := Sum([]Input{in}); !errors.Is(err, ErrInput) {
			t.Errorf("%+v: %v", in, err)
		}
	}
}

func TestNoNaNLeaves(t *testing.T) {
	nan, inf := math.NaN(), math.Inf(1)
	for name, f := range map[string]func(v float64) (float64, error){
		"EffectiveYears d": func(v float64) (float64, error) { return EffectiveYears(v, 30) },
		"EffectiveYears T": func(v float64) (float64, error) { return EffectiveYears(0.005, v) },
		"GeneratedMJ":      func(v float64) (float64, error) { return GeneratedMJ(v, 30) },
		"DeliveredMJ":      func(v float64) (float64, error) { return DeliveredMJ(v, 0.02, 0) },
		"DeliveredMJ loss": func(v float64) (float64, error) { return DeliveredMJ(1, v, 0) },
		"EROI":             func(v float64) (float64, error) { return Balance{Inputs: Inputs{B1MJ: v}}.EROI(params.Generation) },
		"EROIPrimary": func(v float64) (float64, error) {
			return Balance{Inputs: Inputs{B1MJ: 1}}.EROIPrimary(params.Generation, v)
		},
		"EROIStock":  func(v float64) (float64, error) { return Balance{Inputs: Inputs{B3MJ: 1}}.EROIStock(v, 0) },
		"NetToGross": NetToGross,
		"NetShare": func(v float64) (float64, error) {
			return Balance{GeneratedMJ: v}.NetShare(params.Generation, AsAccounted, 0)
		},
		"PowerDensity":      func(v float64) (float64, error) { return PowerDensityWPerM2(v, 30, 1) },
		"PowerDensity area": func(v float64) (float64, error) { return PowerDensityWPerM2(1, 30, v) },
		"Saving":            func(v float64) (float64, error) { return SavingEquivalent(v, 0.05, 0.2) },
		"Human":             func(v float64) (float64, error) { return HumanPersons(1, v) },
		"Reinvested":        func(v float64) (float64, error) { return ReinvestedShare(v, 1) },
	} {
		if v, err := f(nan); err == nil {
			t.Errorf("%s: NaN gave %v without an error", name, v)
		}
		if v, err := f(inf); err == nil && (math.IsNaN(v) || math.IsInf(v, 0)) {
			t.Errorf("%s: infinity gave %v without an error", name, v)
		}
	}
}

func BenchmarkBalance(b *testing.B) {
	e := plantExample(b, "A")
	for b.Loop() {
		for _, at := range []params.Boundary{params.Generation, params.Delivered, params.Extended} {
			if _, err := e.balance.EROI(at); err != nil {
				b.Fatal(err)
			}
		}
	}
}

func TestSmallFormulas(t *testing.T) {
	ok := must(t)
	b := Balance{GeneratedMJ: 1100, DeliveredMJ: 1000, Inputs: Inputs{100, 150, 200}}
	for name, c := range map[string]struct{ got, want float64 }{
		"net as accounted":      {ok(b.NetMJ(params.Extended, AsAccounted, 0)), 800},
		"net primary":           {ok(b.NetMJ(params.Extended, Primary, 0.5)), 1800},
		"net electric":          {ok(b.NetMJ(params.Extended, Electric, 0.5)), 900},
		"net at plant":          {ok(b.NetMJ(params.Generation, AsAccounted, 0)), 1000},
		"share primary":         {ok(b.NetShare(params.Extended, Primary, 0.5)), 0.9},
		"share electric":        {ok(b.NetShare(params.Extended, Electric, 0.5)), 0.9},
		"drawdown":              {ok(b.Drawdown(40, 10)), 0.05},
		"reinvested share":      {ok(ReinvestedShare(0.4, 1.5)), 0.6},
		"auxiliary is taken":    {ok(DeliveredMJ(1000, 0.02, 30)), 950},
		"saving without losses": {ok(SavingEquivalent(500, 0, 0)), 500},
	} {
		if math.Abs(c.got-c.want) > 1e-12*math.Abs(c.want) {
			t.Errorf("%s: %v, want %v", name, c.got, c.want)
		}
	}
	if _, err := b.NetMJ(params.Extended, Primary, 0); !errors.Is(err, ErrInput) {
		t.Errorf("grid efficiency 0: %v", err)
	}
	if _, err := b.NetMJ(params.Extended, Currency(9), 0.5); !errors.Is(err, ErrInput) {
		t.Errorf("unknown currency: %v", err)
	}
	if _, err := b.EROI("B4"); !errors.Is(err, ErrInput) {
		t.Errorf("unknown boundary: %v", err)
	}
	for c, want := range map[Currency]string{AsAccounted: "as accounted", Primary: "primary", Electric: "electric"} {
		if c.String() != want {
			t.Errorf("currency %d is called %q", c, c.String())
		}
	}
}
