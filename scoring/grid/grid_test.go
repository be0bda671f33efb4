package grid

import (
	"errors"
	"math"
	"math/rand/v2"
	"os"
	"strconv"
	"strings"
	"testing"

	"groundtally/assets/citedtable"
	"groundtally/scoring/params"
	"groundtally/scoring/units"
)

var shipped = os.DirFS("../../assets/params")

func table(t testing.TB, family string) *citedtable.Table {
	t.Helper()
	tab, err := params.OpenTable(shipped, ".", family, "2026-01")
	if err != nil {
		t.Fatal(err)
	}
	return tab
}

func model(t testing.TB) *Model {
	t.Helper()
	def, err := params.ParseEdition(table(t, "grid_defaults"))
	if err != nil {
		t.Fatal(err)
	}
	m, err := NewModel(def, conductors(t), transformers(t))
	if err != nil {
		t.Fatal(err)
	}
	return m
}

func conductors(t testing.TB) []Conductor {
	t.Helper()
	c, err := ParseConductors(table(t, "conductors"))
	if err != nil {
		t.Fatal(err)
	}
	return c
}

func transformers(t testing.TB) *Transformers {
	t.Helper()
	tr, err := ParseTransformers(table(t, "transformers"))
	if err != nil {
		t.Fatal(err)
	}
	return tr
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

// vector reads an input of the form "v 1 2 3".
func vector(t testing.TB, s string) []float64 {
	t.Helper()
	fields := strings.Fields(strings.TrimPrefix(s, "v"))
	out := make([]float64, len(fields))
	for i, f := range fields {
		v, err := strconv.ParseFloat(f, 64)
		if err != nil {
			t.Fatal(err)
		}
		out[i] = v
	}
	return out
}

// rayleigh gives the power of a curve and the share of time in narrow bins of a Rayleigh wind.
func rayleigh(t testing.TB, c citedtable.Check) (power, weight []float64) {
	curve := vector(t, c.Text["curve"])
	from, step, bin, mean := c.In["from"], c.In["step"], c.In["bin"], c.In["mean"]
	cdf := func(v float64) float64 { return 1 - math.Exp(-math.Pi/4*v*v/(mean*mean)) }
	to := from + step*float64(len(curve)-1)
	for i := 0; from+float64(i)*bin < to-bin/2; i++ {
		lo := from + float64(i)*bin
		x := (lo + bin/2 - from) / step
		j := min(int(x), len(curve)-2)
		power = append(power, curve[j]+(x-float64(j))*(curve[j+1]-curve[j]))
		weight = append(weight, cdf(lo+bin)-cdf(lo))
	}
	return power, weight
}

func halfSine(t testing.TB, amplitude float64) Factors {
	const n = 200000
	p := make([]float64, n)
	for i := range p {
		p[i] = math.Max(0, amplitude*math.Sin(2*math.Pi*(float64(i)+0.5)/n))
	}
	f, err := ProfileFactors(p, 1)
	if err != nil {
		t.Fatal(err)
	}
	return f
}

func TestCheckTable(t *testing.T) {
	tab, err := citedtable.ParseFS(os.DirFS("../../testdata/check"), "grid.csv")
	if err != nil {
		t.Fatal(err)
	}
	checks, err := tab.Checks()
	if err != nil {
		t.Fatal(err)
	}
	tr := transformers(t)
	byID := map[string]Conductor{}
	for _, c := range conductors(t) {
		byID[c.ID] = c
	}
	for _, c := range checks {
		t.Run(c.ID+"_"+c.Quantity, func(t *testing.T) {
			ok, in := must(t), c.In
			path := Path{VoltageKV: in["kv"], ROhm: in["r"], XOhm: in["x"]}
			flow := Flow{ExportKW: in["p_mw"] * units.KWPerMW, InjectedKVAr: in["q_mvar"] * units.KWPerMW}
			metal := Material(c.Text["metal"])
			loss := func() TransformerLoss {
				l, err := tr.Loss("liquid", int(in["tier"]), in["kva"], 0.12)
				if err != nil {
					t.Fatal(err)
				}
				return l
			}
			var got float64
			switch c.Quantity {
			case "current":
				got = ok(CurrentA(in["p_kw"], in["kv"], in["cos"]))
			case "apparent_mva":
				got = ok(ApparentMVA(in["a"], in["kv"], in["k"]))
			case "r_at":
				m := Aluminium
				if in["alpha"] == alphaCu {
					m = Copper
				}
				got = ok(ResistanceAt(in["r20"], m, in["t"]))
			case "r_at_id":
				con := byID[c.Text["id"]]
				got = ok(ResistanceAt(con.R20OhmPerKm, con.Material, in["t"]))
			case "ac_factor":
				got = ok(ACFactor(in["r"], in["kp"], in["dc"], in["s"], 50))
			case "reactance":
				got = ok(ReactanceOhmPerKm(in["gmd"], in["r"], 50))
			case "rise_linear":
				got = ok(path.RiseLinear(flow))
			case "rise_exact":
				got = ok(path.RiseExact(flow))
			case "max_power_mw":
				kw, unlimited, err := path.MaxPowerKW(in["limit"], in["q_over_p"])
				if err != nil || unlimited {
					t.Fatalf("unlimited %v, %v", unlimited, err)
				}
				got = kw / units.KWPerMW
			case "zero_rise_cos":
				got = ok(ZeroRiseCosPhi(in["r_over_x"]))
			case "peak_loss_kw":
				got = ok(path.PeakLossKW(flow))
			case "peak_loss_frac":
				got = ok(path.PeakLossKW(flow)) / flow.ExportKW
			case "power_length":
				got = ok(PowerLengthMWKm(in["kv"], in["r"], in["limit"]))
			case "profile_lf", "profile_llf":
				f, err := ProfileFactors(vector(t, c.Text["v"]), 1)
				if err != nil {
					t.Fatal(err)
				}
				got = f.Load
				if c.Quantity == "profile_llf" {
					got = f.LossLoad
				}
			case "llf_k":
				got = ok(LossLoadWeight(in["lf"], in["llf"]))
			case "llf":
				got = ok(LossLoadFactor(in["lf"], in["k"]))
			case "half_sine_lf":
				got = halfSine(t, in["amplitude"]).Load
			case "half_sine_llf":
				got = halfSine(t, in["amplitude"]).LossLoad
			case "wind_lf", "wind_llf", "wind_k":
				p, w := rayleigh(t, c)
				f, err := DistributionFactors(p, w, 1)
				if err != nil {
					t.Fatal(err)
				}
				switch c.Quantity {
				case "wind_lf":
					got = f.Load
				case "wind_llf":
					got = f.LossLoad
				default:
					got = ok(LossLoadWeight(f.Load, f.LossLoad))
				}
			case "wind_lost":
				p, w := rayleigh(t, c)
				r, err := LimitedShare(p, w, in["limit"])
				if err != nil {
					t.Fatal(err)
				}
				got = r.LostFrac
			case "loss_share":
				got = ok(LossShare(in["peak"], Factors{Load: in["lf"], LossLoad: in["llf"]}))
			case "temperature":
				got = ok(OperatingC(in["i"], in["iz"], in["ambient"], in["max"]))
			case "r_hot":
				got = ok(ResistanceAt(in["r20"], Aluminium, ok(OperatingC(in["i"], in["iz"], in["ambient"], in["max"])))) * in["km"]
			case "tr_no_load_kwh", "tr_load_kwh":
				p0, pk, err := loss().YearKWh(in["llf"], 1)
				if err != nil {
					t.Fatal(err)
				}
				got = p0
				if c.Quantity == "tr_load_kwh" {
					got = pk
				}
			case "tr_pei":
				got = ok(loss().PeakEfficiency(in["kva"]))
			case "tr_best_load":
				got = ok(loss().BestLoad())
			case "tr_load_w":
				got = loss().LoadW
			case "tr_no_load_w":
				got = loss().NoLoadW
			case "pei":
				got = ok(TransformerLoss{in["p0"], in["pk"]}.PeakEfficiency(in["mva"] * units.KWPerMW))
			case "charging_mvar":
				got = ok(ChargingMVAr(in["c"], in["kv"], in["km"], 50))
			case "charging_a_per_km":
				got = ok(ChargingAPerKm(in["c"], in["kv"], 50))
			case "charging_rise":
				got = ok(ChargingRise(in["x"], ok(ChargingMVAr(in["c"], in["kv"], in["km"], 50)), in["kv"]))
			case "scr":
				got = ok(ShortCircuitRatio(in["sk"], in["p"]*units.KWPerMW))
			case "sk_behind":
				net, err := NetworkImpedance(in["kv"], in["sk"], in["xr"])
				if err != nil {
					t.Fatal(err)
				}
				got = ok(ShortCircuitBehindMVA(net, path))
			case "half_sine_lost":
				got = ok(HalfSineLost(in["c"]))
			case "share":
				g, err := ShareSpare(in["spare"], vector(t, c.Text["r"]), nil, ShareRule(c.Text["rule"]))
				if err != nil {
					t.Fatal(err)
				}
				got = g[int(in["i"])]
			case "mass_t_per_km":
				got = ok(MassTPerKm(int(in["n"]), in["mm2"], metal))
			case "mass_electrical_t_per_km":
				got = ok(MassTPerKm(int(in["n"]), ok(ElectricalSectionMM2(in["r20"], metal)), metal))
			case "acsr_kg_per_km":
				got = ok(ACSRMassKgPerKm(in["al"], in["st"]))
			case "detour":
				got = in["length"] / in["straight"]
				r, err := model(t).Route(in["straight"]*1e4, Number{})
				if err != nil {
					t.Fatal(err)
				}
				// The published ratios lie inside the shipped range of detours.
				if f := got * in["straight"] * 10; f < r.Low || f > r.High {
					t.Errorf("detour %v km outside %v", f, r)
				}
			case "max_transfer_mw":
				kw, unlimited, err := path.MaxTransferKW()
				if err != nil || unlimited {
					t.Fatalf("unlimited %v, %v", unlimited, err)
				}
				got = kw / units.KWPerMW
			case "transfer_possible":
				got = 1
				if _, err := path.RiseExact(flow); errors.Is(err, ErrTransferImpossible) {
					got = 0
				} else if err != nil {
					t.Fatal(err)
				}
			case "correlation":
				n, err := Correlation(vector(t, c.Text["a"]), vector(t, c.Text["b"]))
				if err != nil || !n.Known {
					t.Fatal(n, err)
				}
				got = n.Value
			default:
				quantity, ok := strings.CutPrefix(c.Quantity, "joint_")
				f := jointQuantities[quantity]
				if !ok || f == nil {
					t.Fatalf("unknown quantity %q", c.Quantity)
				}
				j, err := JointExport([][]float64{vector(t, c.Text["a"]), vector(t, c.Text["b"])}, in["limit"], 1)
				if err != nil {
					t.Fatal(err)
				}
				got = f(j)
			}
			if !c.OK(got) {
				t.Errorf("got %v, want %v within %v (%s)", got, c.Expected, c.Tolerance, c.Source)
			}
		})
	}
}

// sure is a plant and an asset about which all facts are known.
func sure() AssessInput {
	return AssessInput{ID: "a", Kind: Substation, VoltageKV: Known(20), Spare: Known(6000), ShortCircuitMVA: Known(150),
		StraightM: 2000, PlantKW: 5000, Technology: "wind", LoadFactor: 0.35}
}

func assess(t testing.TB, m *Model, in AssessInput) Assessment {
	t.Helper()
	a, err := m.Assess(in)
	if err != nil {
		t.Fatal(err)
	}
	return a
}

func TestStatuses(t *testing.T) {
	m := model(t)
	for name, c := range map[string]struct {
		change func(*AssessInput)
		status Status
		reason Reason
	}{
		"all known":          {func(*AssessInput) {}, Adequate, ""},
		"spare unknown":      {func(in *AssessInput) { in.Spare = Number{} }, Unknown, SpareUnknown},
		"spare old":          {func(in *AssessInput) { in.SpareAge = Known(13) }, Unknown, SpareOld},
		"spare fresh":        {func(in *AssessInput) { in.SpareAge = Known(12) }, Adequate, ""},
		"spare part":         {func(in *AssessInput) { in.Spare = Known(3000) }, Partly, SparePart},
		"spare none":         {func(in *AssessInput) { in.Spare = Known(0) }, NotAdequate, SpareNone},
		"spare just enough":  {func(in *AssessInput) { in.Spare = Known(5000) }, Adequate, ""},
		"tap unknown":        {func(in *AssessInput) { in.Kind, in.RiseLimit = Line, Known(0.05) }, Unknown, TapUnknown},
		"tap allowed":        {func(in *AssessInput) { in.Kind, in.TapAllowed, in.RiseLimit = Line, Yes, Known(0.05) }, Adequate, ""},
		"tap forbidden":      {func(in *AssessInput) { in.Kind, in.TapAllowed = Line, No }, NotAdequate, TapForbidden},
		"upstream unknown":   {func(in *AssessInput) { in.Kind, in.TapAllowed, in.ShortCircuitMVA = Line, Yes, Number{} }, Unknown, UpstreamUnknown},
		"upstream rise":      {func(in *AssessInput) { in.Kind, in.TapAllowed, in.ShortCircuitMVA = Line, Yes, Known(60) }, NotAdequate, RiseExceeded},
		"too far":            {func(in *AssessInput) { in.StraightM = 60000 }, NotAdequate, RiseExceeded},
		"too much for 20 kV": {func(in *AssessInput) { in.PlantKW, in.Spare = 16000, Known(50000) }, NotAdequate, AboveBand},
		"extra high voltage": {func(in *AssessInput) { in.VoltageKV = Known(220) }, NotAdequate, VoltageOutOfScope},
		"voltage unknown":    {func(in *AssessInput) { in.VoltageKV = Number{} }, Unknown, VoltageUnknown},
		"66 kV cable":        {func(in *AssessInput) { in.VoltageKV, in.PlantKW, in.Spare = Known(66), 20000, Known(30000) }, Unknown, NoConductor},
		"66 kV line": {func(in *AssessInput) {
			in.VoltageKV, in.PlantKW, in.Spare, in.Overhead = Known(66), 20000, Known(30000), true
		}, Adequate, ""},
		"110 kV untold tap":   {func(in *AssessInput) { in.Kind, in.VoltageKV, in.PlantKW = Line, Known(110), 30000 }, NotAdequate, TapHighVoltage},
		"failure beats doubt": {func(in *AssessInput) { in.Spare, in.StraightM = Number{}, 60000 }, NotAdequate, RiseExceeded},
	} {
		t.Run(name, func(t *testing.T) {
			in := sure()
			c.change(&in)
			a := assess(t, m, in)
			if a.Status != c.status || a.Reason != c.reason {
				t.Errorf("got %q for %q (failed %v, missing %v, rise %v of %v), want %q for %q", a.Status, a.Reason, a.Failed, a.Missed, a.RiseFrac, a.RiseLimitFrac, c.status, c.reason)
			}
		})
	}
}

// Whatever else is known, an asset with a missing fact is never adequate.
func TestUnknownNeverCountsAsPass(t *testing.T) {
	m := model(t)
	r := rand.New(rand.NewPCG(7, 8))
	for range 3000 {
		in := randomInput(r)
		a := assess(t, m, in)
		missing := !in.Spare.Known || !in.VoltageKV.Known || (in.Kind == Line && in.TapAllowed == NotKnown) || (in.Kind != Substation && !in.ShortCircuitMVA.Known)
		if missing && a.Status == Adequate {
			t.Fatalf("%+v is adequate with a missing fact", in)
		}
		if a.Status == Adequate && (in.Spare.Value < in.PlantKW || a.RiseFrac > a.RiseLimitFrac || a.LoadingFrac > 1) {
			t.Fatalf("%+v is adequate: %+v", in, a)
		}
		if a.Status != Adequate && a.Reason == "" {
			t.Fatalf("%+v: %q without a reason", in, a.Status)
		}
		for _, v := range []float64{a.RiseFrac, a.RiseExactFrac, a.LoadingFrac, a.LossFrac.Low, a.LossFrac.High, a.Effort.Low, a.Effort.High, a.CurrentA} {
			if math.IsNaN(v) || math.IsInf(v, 0) {
				t.Fatalf("%+v gave %+v", in, a)
			}
		}
	}
}

func randomInput(r *rand.Rand) AssessInput {
	in := AssessInput{ID: strconv.Itoa(r.IntN(1000)), Kind: []AssetKind{Substation, Line, TransformerStation}[r.IntN(3)], TapAllowed: Answer(r.IntN(3)),
		StraightM: math.Exp(r.Float64()*10) - 1, Overhead: r.IntN(2) == 0, PlantKW: math.Exp(3 + r.Float64()*8),
		Technology: []string{"wind", "solar_fixed", "wind_solar"}[r.IntN(3)], LoadFactor: 0.05 + r.Float64()*0.6}
	if r.IntN(4) > 0 {
		in.VoltageKV = Known([]float64{0.4, 10, 15, 20, 33, 66, 110, 220}[r.IntN(8)])
	}
	if r.IntN(2) == 0 {
		in.Spare = Known(r.Float64() * 2 * in.PlantKW)
	}
	if r.IntN(2) == 0 {
		in.ShortCircuitMVA = Known(10 + r.Float64()*2000)
	}
	return in
}

func TestMoreDistanceNeverLessLoss(t *testing.T) {
	m := model(t)
	for _, kv := range []float64{0.4, 10, 20, 33, 110} {
		in := sure()
		in.VoltageKV = Known(kv)
		in.PlantKW = map[float64]float64{0.4: 60, 10: 2000, 20: 5000, 33: 12000, 110: 40000}[kv]
		in.Spare = Known(1e6)
		var last Assessment
		for i, d := range []float64{0, 10, 100, 250, 299, 300, 301, 330, 350, 500, 1000, 2000, 4000} {
			in.StraightM = d
			a := assess(t, m, in)
			// A longer way may ask for a thicker conductor, which loses less: compare like with like.
			if i > 0 && a.Conductor.ID == last.Conductor.ID && a.Circuits == last.Circuits {
				if a.LossFrac.Central < last.LossFrac.Central || a.LossFrac.Low < last.LossFrac.Low || a.LossFrac.High < last.LossFrac.High {
					t.Errorf("%v kV: %v m loses %v, less than before %v", kv, d, a.LossFrac, last.LossFrac)
				}
			}
			if i > 0 && a.RouteKm.Central < last.RouteKm.Central {
				t.Errorf("%v m: route %v shorter than %v", d, a.RouteKm, last.RouteKm)
			}
			if a.LossFrac.Low > a.LossFrac.Central || a.LossFrac.Central > a.LossFrac.High {
				t.Errorf("%v m: loss out of order %v", d, a.LossFrac)
			}
			last = a
		}
	}
}

func TestLossLoadFactorStaysBetween(t *testing.T) {
	ok := must(t)
	r := rand.New(rand.NewPCG(9, 10))
	for range 500 {
		lf, k := r.Float64(), r.Float64()
		if got := ok(LossLoadFactor(lf, k)); got < lf*lf-1e-15 || got > lf+1e-15 {
			t.Fatalf("LF %v, k %v: LLF %v", lf, k, got)
		}
		p := make([]float64, 50)
		for i := range p {
			p[i] = math.Pow(r.Float64(), 1+3*r.Float64())
		}
		f, err := ProfileFactors(p, 1)
		if err != nil {
			t.Fatal(err)
		}
		if f.LossLoad < f.Load*f.Load-1e-15 || f.LossLoad > f.Load+1e-15 {
			t.Fatalf("profile: %+v", f)
		}
	}
}

func TestLinearNeverUnderstates(t *testing.T) {
	r := rand.New(rand.NewPCG(11, 12))
	for range 2000 {
		p := Path{VoltageKV: 20, ROhm: r.Float64() * 5, XOhm: r.Float64() * 5}
		f := Flow{ExportKW: r.Float64() * 2e4, InjectedKVAr: (r.Float64() - .5) * 1e4}
		lin, err := p.RiseLinear(f)
		if err != nil {
			t.Fatal(err)
		}
		ex, err := p.RiseExact(f)
		if errors.Is(err, ErrTransferImpossible) {
			continue
		}
		if err != nil {
			t.Fatal(err)
		}
		if ex > lin+1e-12 {
			t.Fatalf("%+v %+v: exact %v above linear %v", p, f, ex, lin)
		}
	}
}

// The chosen conductor is the smallest: the next smaller one of the list breaks a test.
func TestSmallestConductorIsChosen(t *testing.T) {
	m := model(t)
	in := sure()
	for _, d := range []float64{500, 3000, 6000} {
		in.StraightM = d
		a := assess(t, m, in)
		list := m.list(MV20, Cable, "")
		for i, c := range list {
			if c.ID != a.Conductor.ID || i == 0 {
				continue
			}
			s, err := m.size(in, list[i-1], a.Circuits, m.derateBuried, 20, Path{VoltageKV: 20}, &a)
			if err != nil {
				t.Fatal(err)
			}
			if s.fits {
				t.Errorf("%v m: %s fits, %s was chosen", d, list[i-1].ID, a.Conductor.ID)
			}
		}
	}
	// Where no single cable will do, two are tried from the smallest on.
	in.StraightM = 14000
	a := assess(t, m, in)
	if a.Status != Adequate || a.Circuits != 2 {
		t.Fatalf("14 km: %s x %d, %q %q", a.Conductor.ID, a.Circuits, a.Status, a.Reason)
	}
	in.MaxCircuits = 1
	if b := assess(t, m, in); b.Status != NotAdequate || b.Reason != RiseExceeded || b.Circuits != 1 {
		t.Errorf("one circuit: %q %q", b.Status, b.Reason)
	}
}

func TestRoutedLengthGetsNoDetour(t *testing.T) {
	m := model(t)
	in := sure()
	in.RoutedM = Known(2345)
	a := assess(t, m, in)
	if a.RouteKm != (Range{2.345, 2.345, 2.345}) || !a.Routed {
		t.Errorf("route %v", a.RouteKm)
	}
	in.RoutedM = Number{}
	if a = assess(t, m, in); math.Abs(a.RouteKm.Low-2.4) > 1e-12 || math.Abs(a.RouteKm.Central-2.6) > 1e-12 || math.Abs(a.RouteKm.High-2.8) > 1e-12 {
		t.Errorf("detour %v", a.RouteKm)
	}
	in.StraightM = 100
	if a = assess(t, m, in); math.Abs(a.RouteKm.Central-0.2) > 1e-12 {
		t.Errorf("short distance %v", a.RouteKm)
	}
}

// The factor form of the line loss equals the hourly sum where the profile has those factors.
func TestHourlyLossAgreesWithFactors(t *testing.T) {
	c := m20(t)
	profile := []float64{5000, 2500, 2500, 0}
	l := HourlyLine{Conductor: c, Circuits: 1, LengthKm: 8, VoltageKV: 20, RatedA: 421, MaxTheta: true}
	hourly, err := l.LossFrac(profile)
	if err != nil {
		t.Fatal(err)
	}
	f, err := ProfileFactors(profile, 5000)
	if err != nil {
		t.Fatal(err)
	}
	r := must(t)(c.ResistanceOhmPerKm(c.ThetaMaxC))
	p := Path{VoltageKV: 20, ROhm: r * 8, XOhm: 0}
	share := must(t)(LossShare(must(t)(p.RiseLinear(Flow{ExportKW: 5000})), f))
	if math.Abs(hourly-share) > 1e-12 {
		t.Errorf("hourly %v, factors %v", hourly, share)
	}
	l.MaxTheta = false
	if cool := must(t)(l.LossFrac(profile)); !(cool < hourly && cool > hourly*0.75) {
		t.Errorf("at operating temperature %v, at the highest %v", cool, hourly)
	}
}

func m20(t testing.TB) Conductor {
	for _, c := range conductors(t) {
		if c.ID == "mv20_cable_al_240" {
			return c
		}
	}
	t.Fatal("no 240 mm2 conductor")
	return Conductor{}
}

func TestChoose(t *testing.T) {
	m := model(t)
	a := func(id string, s Status, effort, loss float64) Assessment {
		return Assessment{ID: id, Status: s, Computed: true, Effort: Range{Central: effort}, LossFrac: Range{Central: loss}, RouteKm: Range{Central: effort}}
	}
	voltageUnknown := a("v", Unknown, 1, .01)
	voltageUnknown.VoltageAssumed = true
	for name, c := range map[string]struct {
		list   []Assessment
		picked string
		status Status
	}{
		"least effort adequate":       {[]Assessment{a("a", Adequate, 5, .01), a("b", Adequate, 3, .02), a("c", Unknown, 1, .01)}, "b", Adequate},
		"tie by loss":                 {[]Assessment{a("a", Adequate, 10, .02), a("b", Adequate, 10.4, .01)}, "b", Adequate},
		"no tie beyond 5 %":           {[]Assessment{a("a", Adequate, 10, .02), a("b", Adequate, 10.6, .01)}, "a", Adequate},
		"tie by id":                   {[]Assessment{a("b", Adequate, 10, .02), a("a", Adequate, 10, .02)}, "a", Adequate},
		"unknown when none adequate":  {[]Assessment{a("a", NotAdequate, 1, .01), a("b", Unknown, 9, .01), a("c", Partly, 2, .01)}, "b", Unknown},
		"unknown voltage stands last": {[]Assessment{voltageUnknown, a("b", Unknown, 9, .01)}, "b", Unknown},
		"unknown voltage if need be":  {[]Assessment{voltageUnknown, a("b", NotAdequate, 9, .01)}, "v", Unknown},
		"partly":                      {[]Assessment{a("a", NotAdequate, 1, .01), a("c", Partly, 2, .01)}, "c", Partly},
		"nothing":                     {[]Assessment{a("a", NotAdequate, 1, .01)}, "", ""},
		"empty":                       {nil, "", ""},
	} {
		t.Run(name, func(t *testing.T) {
			for range 2 {
				ch := m.Choose(c.list)
				id := ""
				if ch.Picked >= 0 {
					id = c.list[ch.Picked].ID
				}
				if id != c.picked || ch.Status != c.status {
					t.Errorf("picked %q as %q, want %q as %q", id, ch.Status, c.picked, c.status)
				}
				for i, j := 0, len(c.list)-1; i < j; i, j = i+1, j-1 { // again in reverse
					c.list[i], c.list[j] = c.list[j], c.list[i]
				}
			}
		})
	}
}

func TestShareInvariants(t *testing.T) {
	r := rand.New(rand.NewPCG(13, 14))
	for range 1000 {
		n := 1 + r.IntN(6)
		req, least := make([]float64, n), make([]float64, n)
		for i := range req {
			req[i], least[i] = r.Float64()*10, r.Float64()*4
		}
		spare := r.Float64() * 25
		for _, rule := range []ShareRule{InOrder, ProRata, Equal} {
			g, err := ShareSpare(spare, req, least, rule)
			if err != nil {
				t.Fatal(err)
			}
			var sum float64
			for i := range g {
				sum += g[i]
				if g[i] > req[i]+1e-12 || (g[i] != 0 && g[i] < least[i]-1e-12) {
					t.Fatalf("%s: grant %v of %v, least %v", rule, g[i], req[i], least[i])
				}
			}
			if sum > spare*(1+1e-12)+1e-12 {
				t.Fatalf("%s: %v granted of %v", rule, sum, spare)
			}
			if rule == InOrder {
				continue
			}
			back, leastBack := make([]float64, n), make([]float64, n)
			for i := range req {
				back[n-1-i], leastBack[n-1-i] = req[i], least[i]
			}
			h, err := ShareSpare(spare, back, leastBack, rule)
			if err != nil {
				t.Fatal(err)
			}
			for i := range g {
				if math.Abs(g[i]-h[n-1-i]) > 1e-9 {
					t.Fatalf("%s depends on the order: %v and %v", rule, g, h)
				}
			}
		}
	}
	if g, err := ShareSpare(100, []float64{100, 100}, []float64{60, 45}, ProRata); err != nil || g[0] != 0 || g[1] != 100 {
		t.Errorf("the grant that is too small goes back to the pool: %v, %v", g, err)
	}
	if _, err := ShareSpare(1, []float64{1}, nil, "by lot"); !errors.Is(err, ErrInput) {
		t.Errorf("an unknown rule: %v", err)
	}
}

func TestTransformerTable(t *testing.T) {
	tr := transformers(t)
	last := TransformerLoss{}
	for _, kva := range []float64{10, 25, 50, 75, 630, 1000, 2500, 3150} {
		l, err := tr.Loss("liquid", 2, kva, .12)
		if err != nil || l.NoLoadW < last.NoLoadW || l.LoadW < last.LoadW {
			t.Errorf("%v kVA: %+v after %+v, %v", kva, l, last, err)
		}
		last = l
	}
	for kva, pei := range map[float64]float64{4000: .99532, 4500: .9954, 25000: .99700, 200000: .99770} {
		l, err := tr.Loss("liquid", 2, kva, .12)
		if err != nil {
			t.Fatal(err)
		}
		if got := must(t)(l.PeakEfficiency(kva)); math.Abs(got-pei) > 1e-9 || math.Abs(l.NoLoadW/l.LoadW-.12) > 1e-12 {
			t.Errorf("%v kVA: peak efficiency %v, want %v; split %v", kva, got, pei, l.NoLoadW/l.LoadW)
		}
	}
	if _, err := tr.Loss("dry", 2, 5000, .12); !errors.Is(err, ErrInput) {
		t.Errorf("a dry transformer beyond the table: %v", err)
	}
	if _, err := tr.Loss("gas", 2, 500, .12); !errors.Is(err, ErrInput) {
		t.Errorf("an unknown kind: %v", err)
	}
	// 20/0.4 kV 630 kVA, 6 %: the impedance triangle closes.
	p, err := TransformerImpedance(.4, 630, .06, 7600)
	if err != nil || math.Abs(math.Hypot(p.ROhm, p.XOhm)-.06*.4*.4/.63) > 1e-12 {
		t.Errorf("impedance %+v, %v", p, err)
	}
}

func TestOwnSubstationLossCounts(t *testing.T) {
	in := sure()
	in.VoltageKV, in.PlantKW, in.Spare = Known(110), 40000, Known(50000)
	a := assess(t, model(t), in)
	if !a.OwnSubstation || a.LossFrac.Central <= a.LineLossFrac.Central || a.LossFrac.Central > .05 {
		t.Errorf("loss %v, line %v", a.LossFrac, a.LineLossFrac)
	}
	in = sure()
	if a = assess(t, model(t), in); a.OwnSubstation || a.LossFrac != a.LineLossFrac || !a.NeedsTransformer {
		t.Errorf("20 kV: %+v", a)
	}
}

func TestEffort(t *testing.T) {
	m := model(t)
	in := sure()
	in.RoutedM = Known(2000)
	mva := 5 / m.cosPhi
	sub := assess(t, m, in)
	if want := 2 + 2 + .4 + .3*mva; math.Abs(sub.Effort.Central-want) > 1e-12 || math.Abs(sub.Effort.Low-want/2) > 1e-12 || math.Abs(sub.Effort.High-2*want) > 1e-12 {
		t.Errorf("bay: %v, want %v", sub.Effort, want)
	}
	in.Kind, in.TapAllowed, in.RiseLimit = Line, Yes, Known(.05)
	tee := assess(t, m, in)
	if want := 2 + .5 + .4 + .3*mva; math.Abs(tee.Effort.Central-want) > 1e-12 {
		t.Errorf("tee: %v, want %v", tee.Effort, want)
	}
	in.LoopIn = true
	loop := assess(t, m, in)
	if want := 2*2 + 1 + .4 + .3*mva; math.Abs(loop.Effort.Central-want) > 1e-12 {
		t.Errorf("loop: %v, want %v", loop.Effort, want)
	}
	if math.Abs(loop.CircuitKm.Central-2*tee.CircuitKm.Central) > 1e-12 || math.Abs(tee.CircuitKm.Central-(2*1.03+.03)) > 1e-12 {
		t.Errorf("built: loop %v, tee %v", loop.CircuitKm, tee.CircuitKm)
	}
	if loop.LossFrac != tee.LossFrac {
		t.Errorf("loss: loop %v, tee %v", loop.LossFrac, tee.LossFrac)
	}
}

// At the power that the spare capacity allows the asset is adequate.
func TestPartlyBecomesAdequateUnderItsLimit(t *testing.T) {
	m := model(t)
	in := sure()
	in.Spare = Known(3000)
	a := assess(t, m, in)
	if a.Status != Partly || a.ExportLimitKW != Known(3000) {
		t.Fatalf("%q, limit %v", a.Status, a.ExportLimitKW)
	}
	in.PlantKW = a.ExportLimitKW.Value
	if a = assess(t, m, in); a.Status != Adequate {
		t.Errorf("%q for %q", a.Status, a.Reason)
	}
}

func TestShortCircuitNotes(t *testing.T) {
	m := model(t)
	for sk, want := range map[float64]Reason{12: WeakRed, 45: WeakAmber, 98: WeakNote} {
		in := sure()
		in.StraightM, in.ShortCircuitMVA = 100, Known(sk)
		a := assess(t, m, in)
		found := false
		for _, n := range a.Notes {
			found = found || n == want
		}
		if !found || !a.SCRAtPoint.Known || a.SCRAtPlant.Value >= a.SCRAtPoint.Value {
			t.Errorf("%v MVA: notes %v, ratio %v, behind the line %v", sk, a.Notes, a.SCRAtPoint, a.SCRAtPlant)
		}
	}
	if got := must(t)(WeightedShortCircuitRatio([]float64{100, 100}, []float64{5000, 5000})); math.Abs(got-10) > 1e-12 {
		t.Errorf("two plants on one point: %v, want 10", got)
	}
}

func TestRefusedInput(t *testing.T) {
	m := model(t)
	for name, f := range map[string]func(*AssessInput){
		"power":       func(in *AssessInput) { in.PlantKW = 0 },
		"NaN":         func(in *AssessInput) { in.StraightM = math.NaN() },
		"technology":  func(in *AssessInput) { in.Technology = "tidal" },
		"kind":        func(in *AssessInput) { in.Kind = "socket" },
		"load factor": func(in *AssessInput) { in.LoadFactor = 0 },
		"voltage":     func(in *AssessInput) { in.VoltageKV = Known(-20) },
		"loss load":   func(in *AssessInput) { in.LossLoad = Known(.9) },
		"spare":       func(in *AssessInput) { in.Spare = Known(math.Inf(1)) },
	} {
		in := sure()
		f(&in)
		if _, err := m.Assess(in); !errors.Is(err, ErrInput) {
			t.Errorf("%s: %v", name, err)
		}
	}
}

func TestLevels(t *testing.T) {
	m := model(t)
	for kv, want := range map[float64]LevelID{.4: LV, .69: LV, 1: LV, 6: MV11, 10: MV11, 11: MV11, 15: MV20, 20: MV20, 22: MV20, 30: MV33, 36: MV33, 66: HV66, 110: HV110, 132: HV110} {
		if l, ok := m.LevelAt(kv); !ok || l.ID != want {
			t.Errorf("%v kV is %q, want %q", kv, l.ID, want)
		}
	}
	for _, kv := range []float64{0, .1, 170, 220, 380} {
		if l, ok := m.LevelAt(kv); ok {
			t.Errorf("%v kV is %q", kv, l.ID)
		}
	}
	l, _ := m.LevelAt(20)
	for kw, want := range map[float64]Band{100: BandBelow, 5000: BandUsual, 12000: BandPossible, 20000: BandAbove} {
		if got := l.BandOf(kw); got != want {
			t.Errorf("%v kW at 20 kV: %q, want %q", kw, got, want)
		}
	}
}

func BenchmarkAssess(b *testing.B) {
	m, in := model(b), sure()
	for b.Loop() {
		if _, err := m.Assess(in); err != nil {
			b.Fatal(err)
		}
	}
}

func BenchmarkHourlyLoss(b *testing.B) {
	l := HourlyLine{Conductor: m20(b), Circuits: 1, LengthKm: 8, VoltageKV: 20, RatedA: 421}
	p := make([]float64, int(units.HoursPerYear))
	for i := range p {
		p[i] = float64(i % 5000)
	}
	for b.Loop() {
		if _, err := l.LossFrac(p); err != nil {
			b.Fatal(err)
		}
	}
}
