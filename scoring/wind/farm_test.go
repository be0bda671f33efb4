package wind

import (
	"fmt"
	"math"
	"math/rand/v2"
	"slices"
	"strings"
	"testing"

	"groundtally/scoring/units"
)

// rose12 is a rose of twelve sectors that leans to the south-west.
func rose12() []Sector {
	f := []float64{.05, .05, .05, .04, .05, .06, .09, .14, .18, .14, .09, .06}
	out := make([]Sector, len(f))
	for i := range f {
		out[i] = Sector{f[i], Weibull{6.5 + 2*f[i]/.18, 1.9 + f[i]}}
	}
	return out
}

func farm(t testing.TB, id string, at ...Position) FarmInput {
	m := turbine(t, id)
	ls, err := defaults(t).Losses(m.RatedKW)
	if err != nil {
		t.Fatal(err)
	}
	return FarmInput{Site: Site{Rose: rose12(), RefHeightM: 100, ShearAlpha: 0.15, ElevationM: 150},
		Turbine: m, HubHeightM: m.HubHeightM, At: at, Settings: settings(t), Losses: ls}
}

func year(t testing.TB, in FarmInput) FarmResult {
	t.Helper()
	r, err := FarmYear(in)
	if err != nil {
		t.Fatal(err)
	}
	return r
}

func scatter(n int, seed uint64, half float64) []Position {
	r := rand.New(rand.NewPCG(seed, 1))
	var out []Position
	for len(out) < n {
		p := Position{(2*r.Float64() - 1) * half, (2*r.Float64() - 1) * half}
		if !slices.ContainsFunc(out, func(q Position) bool { return math.Hypot(p.X-q.X, p.Y-q.Y) < 300 }) {
			out = append(out, p)
		}
	}
	return out
}

func near(a, b, rel float64) bool { return math.Abs(a-b) <= rel*math.Max(math.Abs(a), math.Abs(b)) }

func TestOneMachineHasNoWake(t *testing.T) {
	in := farm(t, "iea_3_4mw_130", Position{123, -45})
	r := year(t, in)
	if r.WakeLossFrac > 1e-12 || !near(r.Turbines[0].WakedMWhPerYr, r.GrossMWhPerYr, 1e-12) {
		t.Errorf("a single machine loses %g by wakes", r.WakeLossFrac)
	}
	// The gross energy is that of the sectors one by one, in the air of the place.
	air, err := StandardAtmosphere(in.Site.ElevationM + in.HubHeightM)
	if err != nil {
		t.Fatal(err)
	}
	var want float64
	for _, s := range in.Site.Rose {
		w, err := s.Weibull.AtHeight(100, in.HubHeightM, 0.15)
		if err != nil {
			t.Fatal(err)
		}
		w.AMPerS = NormalisedSpeed(w.AMPerS, air.DensityKgPerM3)
		want += s.FrequencyFrac * GrossExactMWhPerYr(in.Turbine.Curve, w)
	}
	if !near(r.GrossMWhPerYr, want, 5e-5) {
		t.Errorf("gross %g, sector by sector %g", r.GrossMWhPerYr, want)
	}
	for _, n := range []int{4, 12, 16, 36, 100, 360} {
		in.Settings.Directions = n
		if g := year(t, in).GrossMWhPerYr; !near(g, r.GrossMWhPerYr, 1e-12) {
			t.Errorf("with %d directions gross is %g, with 72 %g", n, g, r.GrossMWhPerYr)
		}
	}
}

func TestChainMultipliesExactly(t *testing.T) {
	for _, id := range []string{"iea_3_4mw_130", "dw100_27_6"} {
		in := farm(t, id, Position{0, 0}, Position{310, 250}, Position{700, 20})
		r := year(t, in)
		e := r.GrossMWhPerYr
		for _, s := range r.Chain {
			if s.BeforeMWh != e || s.AfterMWh != s.BeforeMWh*(1-s.Share) {
				t.Errorf("%s, step %s: %g -> %g -> %g", id, s.Name, e, s.BeforeMWh, s.AfterMWh)
			}
			e = s.AfterMWh
		}
		if e != r.NetMWhPerYr {
			t.Errorf("%s: the chain ends at %g, net is %g", id, e, r.NetMWhPerYr)
		}
		var sum, waked float64
		for _, m := range r.Turbines {
			sum += m.NetMWhPerYr
			waked += m.WakedMWhPerYr
		}
		if !near(sum, r.NetMWhPerYr, 1e-12) || !near(waked, r.Chain[0].AfterMWh, 1e-12) {
			t.Errorf("%s: machines sum to %g, net is %g", id, sum, r.NetMWhPerYr)
		}
		if want := 1 + len(in.Losses); len(r.Chain) != want || r.Chain[0].Name != LossWake {
			t.Errorf("%s: chain %v", id, r.Chain)
		}
	}
}

// TestFarmAgainstDirectSum integrates every direction and a fine grid of speeds anew, from WakeSpeeds.
func TestFarmAgainstDirectSum(t *testing.T) {
	for _, model := range []WakeModel{WakeGaussian, WakeJensen} {
		in := farm(t, "iea_3_4mw_130", Position{0, 0}, Position{520, 90}, Position{900, 500})
		in.Settings.Wake = model
		in.Settings.Directions = 12 // sector centres, so that no rose is interpolated
		in.Site.ShearAlpha = 0
		in.Site.ElevationM = -in.HubHeightM
		var want float64
		const dv = 0.02
		for s, sec := range in.Site.Rose {
			for v := 3.0; v < 25-dv/2; v += dv {
				mid := v + dv/2
				us, err := WakeSpeeds(in.Turbine, in.HubHeightM, in.At, in.Settings, float64(s)*30, mid)
				if err != nil {
					t.Fatal(err)
				}
				p := sec.FrequencyFrac * (sec.Weibull.CDF(v+dv) - sec.Weibull.CDF(v))
				for _, u := range us {
					want += p * in.Turbine.Curve.PowerKW(u) * units.HoursPerYear / units.KWhPerMWh
				}
			}
		}
		got := year(t, in).Chain[0].AfterMWh
		if !near(got, want, 5e-4) {
			t.Errorf("%v: %g MWh by nodes, %g by direct sum (%.2g)", model, got, want, got/want-1)
		}
	}
}

func TestMoreDistanceNeverMoreWakeLoss(t *testing.T) {
	in := farm(t, "iea_3_4mw_130")
	for _, model := range []WakeModel{WakeGaussian, WakeJensen, WakeIEA37} {
		for bearing := 0.0; bearing < 180; bearing += 13 {
			s, c := math.Sincos(bearing * math.Pi / 180)
			last := math.Inf(1)
			for d := 150.0; d < 8000; d *= 1.25 {
				in.At = []Position{{0, 0}, {d * s, d * c}}
				in.Settings.Wake = model
				loss := year(t, in).WakeLossFrac
				if loss > last+1e-12 {
					t.Fatalf("%v, bearing %g: loss %g at %g m, more than the %g nearer", model, bearing, loss, d, last)
				}
				last = loss
			}
			if !(last < 0.01) {
				t.Errorf("%v, bearing %g: loss %g at 8 km", model, bearing, last)
			}
		}
	}
}

func TestRotatingLayoutAndRoseTogether(t *testing.T) {
	for _, model := range []WakeModel{WakeGaussian, WakeJensen, WakeIEA37} {
		in := farm(t, "iea_3_4mw_130", scatter(6, 5, 900)...)
		in.Settings.Wake = model
		want := year(t, in)
		for turn := 1; turn < 12; turn++ {
			rot := in
			rot.Site.Rose = make([]Sector, 12)
			for i, s := range in.Site.Rose {
				rot.Site.Rose[(i+turn)%12] = s
			}
			s, c := math.Sincos(float64(turn) * 30 * math.Pi / 180)
			rot.At = nil
			for _, p := range in.At { // clockwise from north
				rot.At = append(rot.At, Position{p.X*c + p.Y*s + 1e4, p.Y*c - p.X*s - 2e4})
			}
			if got := year(t, rot); !near(got.NetMWhPerYr, want.NetMWhPerYr, 1e-9) {
				t.Errorf("%v, turned by %d sectors: %g, was %g", model, turn, got.NetMWhPerYr, want.NetMWhPerYr)
			}
		}
		wrong := in
		wrong.Site.Rose = append(slices.Clone(in.Site.Rose[5:]), in.Site.Rose[:5]...)
		if got := year(t, wrong); near(got.WakeLossFrac, want.WakeLossFrac, 1e-6) {
			t.Errorf("%v: turning the rose alone changes nothing", model)
		}
	}
}

func TestOrderOfMachinesDoesNotMatter(t *testing.T) {
	in := farm(t, "nrel_5mw_126", scatter(7, 9, 1000)...)
	want := year(t, in)
	slices.Reverse(in.At)
	got := year(t, in)
	if !near(got.NetMWhPerYr, want.NetMWhPerYr, 1e-12) {
		t.Errorf("reversed: %v, was %v", got.NetMWhPerYr, want.NetMWhPerYr)
	}
	for i, m := range got.Turbines {
		if !near(m.NetMWhPerYr, want.Turbines[len(want.Turbines)-1-i].NetMWhPerYr, 1e-12) {
			t.Errorf("machine %d has another yield", i)
		}
	}
}

func TestMoreWindNeverLess(t *testing.T) {
	last := 0.0
	for mean := 3.0; mean <= 9; mean += 0.25 {
		in := farm(t, "iea_3_4mw_130", scatter(4, 2, 700)...)
		w, err := Rayleigh(mean)
		if err != nil {
			t.Fatal(err)
		}
		in.Site.Rose = []Sector{{1, w}}
		r := year(t, in)
		if r.NetMWhPerYr <= last {
			t.Errorf("mean %g m/s gives %g MWh, less wind gave %g", mean, r.NetMWhPerYr, last)
		}
		if !(r.SpeedSensitivity > 0 && r.SpeedSensitivity < 4) {
			t.Errorf("mean %g m/s: sensitivity %g", mean, r.SpeedSensitivity)
		}
		last = r.NetMWhPerYr
	}
}

func TestSpeedStepIsFineEnough(t *testing.T) {
	for _, model := range []WakeModel{WakeGaussian, WakeJensen} {
		in := farm(t, "iea_3_4mw_130", scatter(5, 3, 600)...)
		in.Settings.Wake = model
		coarse := year(t, in)
		in.Settings.SpeedStepMPerS = 0.1
		fine := year(t, in)
		if !near(coarse.NetMWhPerYr, fine.NetMWhPerYr, 1e-3) {
			t.Errorf("%v: %g MWh by 1 m/s, %g by 0.1 m/s", model, coarse.NetMWhPerYr, fine.NetMWhPerYr)
		}
		t.Logf("%v: wake loss %.4f; %+.1e by the coarse speed step", model, fine.WakeLossFrac, coarse.NetMWhPerYr/fine.NetMWhPerYr-1)
	}
}

func TestSectorsKeepTheirTime(t *testing.T) {
	for _, sectors := range []int{1, 4, 8, 12, 16, 36, 72} {
		for _, directions := range []int{4, 12, 16, 36, 72, 360} {
			sum := make([]float64, sectors)
			for d, shares := range sectorShares(sectors, directions) {
				for _, s := range shares {
					sum[s.sector] += s.frac
					gap := math.Abs(math.Mod(float64(d)/float64(directions)-float64(s.sector)/float64(sectors)+1.5, 1) - 0.5)
					if sectors > 1 && gap >= 1/float64(min(sectors, directions)) {
						t.Errorf("%d sectors, %d directions: sector %d reaches direction %d", sectors, directions, s.sector, d)
					}
				}
			}
			for s, x := range sum {
				if !near(x, 1, 1e-12) {
					t.Errorf("%d sectors, %d directions: sector %d keeps %g of its time", sectors, directions, s, x)
				}
			}
		}
	}
}

func TestExistingMachines(t *testing.T) {
	in := farm(t, "iea_3_4mw_130", Position{0, 0})
	alone := year(t, in)
	small := turbine(t, "dw100_27_6")
	in.Existing = []Machine{{Position{-500, -700}, in.Turbine, in.HubHeightM}, {Position{400, 300}, small, 40}}
	r := year(t, in)
	if !(r.WakeLossFrac > 0) || !(r.NetMWhPerYr < alone.NetMWhPerYr) || r.GrossMWhPerYr != alone.GrossMWhPerYr && !near(r.GrossMWhPerYr, alone.GrossMWhPerYr, 1e-4) {
		t.Errorf("existing machines: loss %g, net %g, alone %g", r.WakeLossFrac, r.NetMWhPerYr, alone.NetMWhPerYr)
	}
	if !(r.ExistingLossMWhPerYr > 0) {
		t.Error("the existing machines lose nothing")
	}
	// Two like machines: what the new one loses by the old one, and the old one by the new one, are
	// what both lose when both are new.
	in.Existing = in.Existing[:1]
	r = year(t, in)
	both := in
	both.Existing, both.At = nil, []Position{in.Existing[0].At, in.At[0]}
	b := year(t, both)
	lost := r.GrossMWhPerYr - r.Turbines[0].WakedMWhPerYr + r.ExistingLossMWhPerYr
	if want := b.GrossMWhPerYr - b.Chain[0].AfterMWh; !near(lost, want, 1e-9) {
		t.Errorf("lost %g with one existing, %g with both new", lost, want)
	}
	in.Existing[0].At = Position{1e6, 0}
	if far := year(t, in); far.ExistingLossMWhPerYr > 1e-3 || far.WakeLossFrac > 1e-5 {
		t.Errorf("a machine 1000 km away: loss %g, %g MWh", far.WakeLossFrac, far.ExistingLossMWhPerYr)
	}
}

func TestAirAndControl(t *testing.T) {
	in := farm(t, "iea_3_4mw_130", Position{})
	low := year(t, in)
	in.Site.ElevationM = 2000
	high := year(t, in)
	if !(high.NetMWhPerYr < low.NetMWhPerYr && high.AirKgPerM3 < low.AirKgPerM3) {
		t.Error("thin air gives no less energy")
	}
	in.Turbine.Stall = true
	stall := year(t, in)
	ratio := high.AirKgPerM3 / ReferenceDensityKgPerM3
	in.Site.ElevationM = -in.HubHeightM
	sea := year(t, in)
	if !near(stall.GrossMWhPerYr, sea.GrossMWhPerYr*ratio, 1e-6) {
		t.Errorf("stall machine: %g, want %g", stall.GrossMWhPerYr, sea.GrossMWhPerYr*ratio)
	}
	in.Site.TempC, in.Site.TempKnown = 40, true
	if hot := year(t, in); !(hot.GrossMWhPerYr < sea.GrossMWhPerYr) {
		t.Error("hot air gives no less energy")
	}
}

func TestNotices(t *testing.T) {
	has := func(r FarmResult, n Notice) bool { return slices.Contains(r.Notices, n) }
	r := year(t, farm(t, "iea_3_4mw_130", Position{}))
	if len(r.Notices) != 0 {
		t.Errorf("a plain single machine has notices %v", r.Notices)
	}
	in := farm(t, "dw20_12_4", Position{}, Position{30, 0})
	r = year(t, in)
	for _, n := range []Notice{NoticeFarFromRef, NoticeCtEstimated, NoticeCloseSpacing, NoticeNoBlockage, NoticeSmallTotal, NoticeRatedExceeded} {
		if !has(r, n) {
			t.Errorf("no notice %s in %v", n, r.Notices)
		}
	}
	in = farm(t, "iea_15mw_240", Position{}, Position{2000, 0})
	in.HubHeightM = 160
	in.Settings.AmbientTIFrac = 0.2
	r = year(t, in)
	if !has(r, NoticeHighHub) || !has(r, NoticeUncertainTI) || has(r, NoticeSmallTotal) {
		t.Errorf("notices %v", r.Notices)
	}
}

func TestFarmRefusesBadInput(t *testing.T) {
	nan := math.NaN()
	for name, spoil := range map[string]func(*FarmInput){
		"no positions":       func(in *FarmInput) { in.At = nil },
		"not a position":     func(in *FarmInput) { in.At = []Position{{nan, 0}} },
		"touching rotors":    func(in *FarmInput) { in.At = []Position{{0, 0}, {100, 0}} },
		"no curve":           func(in *FarmInput) { in.Turbine.Curve = nil },
		"hub too low":        func(in *FarmInput) { in.HubHeightM = 50 },
		"hub not a number":   func(in *FarmInput) { in.HubHeightM = nan },
		"elevation":          func(in *FarmInput) { in.Site.ElevationM = nan },
		"temperature":        func(in *FarmInput) { in.Site.TempC, in.Site.TempKnown = nan, true },
		"shear":              func(in *FarmInput) { in.Site.ShearAlpha = nan },
		"reference height":   func(in *FarmInput) { in.Site.RefHeightM = 0 },
		"no rose":            func(in *FarmInput) { in.Site.Rose = nil },
		"frequencies":        func(in *FarmInput) { in.Site.Rose = in.Site.Rose[:6] },
		"frequency nan":      func(in *FarmInput) { in.Site.Rose = []Sector{{nan, Weibull{7, 2}}} },
		"shape":              func(in *FarmInput) { in.Site.Rose = []Sector{{1, Weibull{7, nan}}} },
		"scale":              func(in *FarmInput) { in.Site.Rose = []Sector{{1, Weibull{0, 2}}} },
		"loss":               func(in *FarmInput) { in.Losses = []Loss{{"x", nan}} },
		"turbulence":         func(in *FarmInput) { in.Settings.AmbientTIFrac = 0 },
		"directions":         func(in *FarmInput) { in.Settings.Directions = 0 },
		"speed step":         func(in *FarmInput) { in.Settings.SpeedStepMPerS = nan },
		"decay":              func(in *FarmInput) { in.Settings.JensenK = -1 },
		"wake model":         func(in *FarmInput) { in.Settings.Wake = 77 },
		"existing position":  func(in *FarmInput) { in.Existing = []Machine{{Position{nan, 0}, in.Turbine, 110}} },
		"existing machine":   func(in *FarmInput) { in.Existing = []Machine{{Position{900, 0}, Turbine{}, 110}} },
		"on an existing one": func(in *FarmInput) { in.Existing = []Machine{{Position{50, 0}, in.Turbine, 110}} },
		"wind too weak":      func(in *FarmInput) { in.Site.Rose = []Sector{{1, Weibull{1e-6, 2}}} },
	} {
		in := farm(t, "iea_3_4mw_130", Position{})
		spoil(&in)
		if r, err := FarmYear(in); err == nil {
			t.Errorf("%s: accepted, net %g", name, r.NetMWhPerYr)
		}
	}
}

func TestEvaluatorAgreesWithFullSolution(t *testing.T) {
	for _, model := range []WakeModel{WakeGaussian, WakeJensen, WakeIEA37} {
		in := farm(t, "iea_3_4mw_130", Position{})
		in.Settings.Wake, in.Settings.Directions = model, LayoutDirections
		in.Existing = []Machine{{Position{-900, -300}, in.Turbine, 110}, {Position{1200, 900}, turbine(t, "dw100_27_6"), 40}}
		ev, err := NewEvaluator(in)
		if err != nil {
			t.Fatal(err)
		}
		fresh := func(at []Position) float64 {
			e, err := NewEvaluator(in)
			if err != nil {
				t.Fatal(err)
			}
			return e.Total(at)
		}
		if ev.Total(nil) != 0 {
			t.Error("no machines have energy")
		}
		at := scatter(8, 21, 1000)
		in.At = at
		if got, want := ev.Total(at), year(t, in).Chain[0].AfterMWh; !near(got, want, 1e-12) {
			t.Errorf("%v: total %g, farm year %g", model, got, want)
		}
		r := rand.New(rand.NewPCG(3, 4))
		for range 40 {
			p := Position{(2*r.Float64() - 1) * 1200, (2*r.Float64() - 1) * 1200}
			i := r.IntN(len(at))
			if got, want := ev.Add(at, p), fresh(append(slices.Clone(at), p))-fresh(at); got != want {
				t.Fatalf("%v: adding %v gives %.12g, anew %.12g", model, p, got, want)
			}
			moved := slices.Clone(at)
			moved[i] = p
			if got, want := ev.Move(at, i, p), fresh(moved)-fresh(at); got != want {
				t.Fatalf("%v: moving %d to %v gives %.12g, anew %.12g", model, i, p, got, want)
			}
		}
		if got, want := ev.Add(nil, Position{5, 5}), fresh([]Position{{5, 5}}); got != want || !(got > 0) {
			t.Errorf("%v: the first machine gains %g, anew %g", model, got, want)
		}
		bad := Position{math.Inf(1), 0}
		if ev.Add(at, bad) != -ev.Total(at) || ev.Move(at, 0, bad) != -ev.Total(at) || ev.Total([]Position{bad}) != 0 || ev.Move(at, 99, Position{}) != 0 {
			t.Errorf("%v: a position that is not finite, or a machine that is not there, is not refused", model)
		}
		if got, want := ev.Total(at), fresh(at); got != want {
			t.Errorf("%v: after all that the total is %g, anew %g", model, got, want)
		}
	}
}

func TestShippedDefaults(t *testing.T) {
	d := defaults(t)
	ls, err := d.Losses(3370)
	if err != nil {
		t.Fatal(err)
	}
	_, net, err := Chain(1, ls)
	if err != nil || !near(net, 0.93*0.97*0.98*0.98*0.98*0.99/0.93, 1e-12) {
		t.Errorf("default losses leave %g: %v", net, err)
	}
	if ls, err = d.Losses(100); err != nil || len(ls) != 1 || ls[0].Frac != 0.17 {
		t.Errorf("small machine: %v, %v", ls, err)
	}
	if _, err := d.Get("no such"); err == nil {
		t.Error("an unknown default was found")
	}
	if _, err := (Defaults{}).Settings(); err == nil {
		t.Error("settings without defaults")
	}
	lo, err1 := d.Works(Low, 3, 1200, 400)
	mid, err2 := d.Works(Central, 3, 1200, 400)
	hi, err3 := d.Works(High, 3, 1200, 400)
	if err1 != nil || err2 != nil || err3 != nil {
		t.Fatal(err1, err2, err3)
	}
	a, _ := lo.Land()
	b, _ := mid.Land()
	c, _ := hi.Land()
	// by hand: 3 x (314 + 1800) + 1200 x 5 + 400 = 12742 m2; 3 x 2000 + 2500 = 8500 m2
	if !near(b.PermanentHa, 1.2742, 1e-12) || !near(b.TemporaryHa, 0.85, 1e-12) || !(a.PermanentHa < b.PermanentHa && b.PermanentHa < c.PermanentHa) {
		t.Errorf("land %+v %+v %+v", a, b, c)
	}
	if _, err := (Works{}).Land(); err == nil {
		t.Error("works without turbines were accepted")
	}
}

// TestFormulasRefuseWhatLiesOutside holds each formula to its stated range.
func TestFormulasRefuseWhatLiesOutside(t *testing.T) {
	nan, inf := math.NaN(), math.Inf(1)
	second := func(_ float64, err error) error { return err }
	air := func(_ Atmosphere, err error) error { return err }
	fit := func(_ Weibull, err error) error { return err }
	m := turbine(t, "iea_3_4mw_130")
	wake := func(deg, v float64, at ...Position) error {
		_, err := WakeSpeeds(m, 110, at, settings(t), deg, v)
		return err
	}
	for name, err := range map[string]error{
		"momentum above Betz":    second(MomentumCt(0.6)),
		"moist air, humidity":    second(MoistAirDensity(290, 1e5, 1.2)),
		"moist air, nan":         second(MoistAirDensity(nan, 1e5, .5)),
		"atmosphere above 11 km": air(StandardAtmosphere(12000)),
		"temperature of the sun": air(AtmosphereAt(0, 5500)),
		"log law, roughness 0":   second(LogLaw(5, 10, 100, 0, 0)),
		"exponent at one height": second(AlphaFromSpeeds(5, 10, 6, 10)),
		"exponent, roughness":    second(AlphaFromRoughness(1, 1, 2)),
		"roughness class of 0":   second(RoughnessClass(0)),
		"decay of a low hub":     second(JensenDecay(0.1, 0.2)),
		"density of nothing":     second(SpacingDensityMWPerKm2(0, 1, 1, 1)),
		"sigma nan":              second(Uncertainty{PerformanceFrac: nan}.SigmaEnergy(1, 1)),
		"half a year":            second(Uncertainty{}.SigmaEnergy(1, 0.5)),
		"sensitivity":            second(Uncertainty{}.SigmaEnergy(nan, 1)),
		"infinite sigma":         second(SigmaOverYears(inf, 0, 1)),
		"mean below 0":           fit(Rayleigh(-1)),
		"infinite mean":          fit(Rayleigh(inf)),
		"deviation 0":            fit(FromMeanAndStd(5, 0)),
		"frequency below 0":      fit(CombineSectors([]Sector{{-1, Weibull{7, 2}}})),
		"no sectors":             fit(CombineSectors(nil)),
		"sector without a scale": fit(CombineSectors([]Sector{{1, Weibull{}}})),
		"wake, no positions":     wake(0, 8),
		"wake, no wind":          wake(0, nan, Position{}),
		"wake, no direction":     wake(nan, 8, Position{}),
		"wake, position":         wake(0, 8, Position{nan, 0}),
	} {
		if err == nil {
			t.Errorf("%s: accepted", name)
		}
	}
	if FrandsenCt(0) != 0 || FrandsenCt(1) != 0 || FrandsenCt(3) != 0.9 || !near(FrandsenCt(14), 3.5*24.5/196, 1e-12) {
		t.Error("thrust estimate")
	}
	if JensenDeficit(.8, .075, -1, 100) != 0 || GaussianDeficit(.8, .03, 0, 0) != 0 || IEA37Deficit(0, 0, 130) != 0 {
		t.Error("a wake upwind of its rotor")
	}
	if c := OverlapArea(50, 60, 5); !near(c, math.Pi*2500, 1e-12) || OverlapArea(50, 60, 110) != 0 {
		t.Error("overlap of circles within, or outside, each other")
	}
}

func TestUncertainty(t *testing.T) {
	u := Uncertainty{MeasurementFrac: .03, LongTermFrac: .02, VerticalFrac: .03, HorizontalFrac: .04, PerformanceFrac: .05, InterannualSpeedFrac: .06}
	one, err1 := u.SigmaEnergy(1, 1)
	many, err2 := u.SigmaEnergy(1, 1e9)
	twice, err3 := u.SigmaEnergy(2, 1)
	if err1 != nil || err2 != nil || err3 != nil {
		t.Fatal(err1, err2, err3)
	}
	if !near(one*one-many*many, .06*.06, 1e-6) || !near(twice*twice-.05*.05, 4*(one*one-.05*.05), 1e-12) {
		t.Errorf("sigma %g in one year, %g in many, %g at double sensitivity", one, many, twice)
	}
	if s, err := SigmaOverYears(many, .06, 4); err != nil || !near(s*s, many*many+.0009, 1e-12) {
		t.Errorf("over four years %g, %v", s, err)
	}
	if p, err := Exceedance(100, 0.9, 0.99); err != nil || p != 0 {
		t.Errorf("P99 at sigma 0.9 is %g, %v", p, err)
	}
	if p, err := Exceedance(100, 0.2, 0.5); err != nil || p != 100 {
		t.Errorf("P50 is %g, %v", p, err)
	}
	if _, err := Exceedance(100, math.NaN(), 0.9); err == nil {
		t.Error("a sigma that is no number was accepted")
	}
	if !near(BiasAdjusted(1000, -.07), 930, 1e-12) {
		t.Error("bias")
	}
}

func TestCurves(t *testing.T) {
	for _, m := range turbines(t) {
		c := m.Curve
		if c.PowerKW(c.First()-1e-9) != 0 || c.PowerKW(c.Last()+1e-9) != 0 || c.Ct(c.Last()+1e-9) != 0 || c.PowerKW(math.NaN()) != 0 {
			t.Errorf("%s runs outside its curve", m.ID)
		}
		for _, p := range c.Points() {
			if !near(c.PowerKW(p.SpeedMPerS), p.PowerKW, 1e-12) || c.Ct(p.SpeedMPerS) > MaxCt {
				t.Errorf("%s at %g m/s: %g kW, Ct %g", m.ID, p.SpeedMPerS, c.PowerKW(p.SpeedMPerS), c.Ct(p.SpeedMPerS))
			}
		}
		if !near(c.MaxKW(), m.RatedKW, 0.33) || m.LicenceNote == "" {
			t.Errorf("%s: top %g kW, rated %g kW", m.ID, c.MaxKW(), m.RatedKW)
		}
		// A rotor cannot take more than the Betz share of the wind.
		for v := 4.0; v < c.Last(); v += 0.25 {
			if cp := c.PowerKW(v) * units.WPerKW / (0.5 * ReferenceDensityKgPerM3 * discArea(m.RotorDiameterM) * v * v * v); cp > 16.0/27 {
				t.Errorf("%s takes %g of the wind at %g m/s", m.ID, cp, v)
			}
		}
	}
	if m := turbine(t, "iea_10mw_198"); !near(m.Curve.MaxKW(), m.RatedKW, 1e-4) {
		t.Errorf("IEA 10 MW reaches %g kW: rotor power?", m.Curve.MaxKW())
	}
	if nrel := turbine(t, "nrel_5mw_126"); nrel.Curve.Ct(3) != MaxCt {
		t.Errorf("thrust at 3 m/s is %g", nrel.Curve.Ct(3))
	}
	half, err := turbine(t, "composite_class_2").Curve.Scaled(0.5)
	if err != nil || !near(half.MaxKW(), 499.95, 1e-3) || half.HasCt() {
		t.Errorf("scaled composite: %v", err)
	}
	for name, pts := range map[string][]CurvePoint{
		"one point": {{SpeedMPerS: 3, PowerKW: 1}},
		"falling":   {{SpeedMPerS: 3, PowerKW: 1}, {SpeedMPerS: 3, PowerKW: 2}},
		"negative":  {{SpeedMPerS: 3, PowerKW: -1}, {SpeedMPerS: 4, PowerKW: 2}},
		"nan":       {{SpeedMPerS: 3, PowerKW: math.NaN()}, {SpeedMPerS: 4, PowerKW: 2}},
		"mixed Ct":  {{SpeedMPerS: 3, PowerKW: 1, Ct: .8, HasCt: true}, {SpeedMPerS: 4, PowerKW: 2}},
		"no power":  {{SpeedMPerS: 3}, {SpeedMPerS: 4}},
	} {
		if _, err := NewPowerCurve(pts); err == nil {
			t.Errorf("%s: accepted", name)
		}
	}
}

func TestQuadratureAgreesWithTheClosedForm(t *testing.T) {
	worst := 0.0
	for _, m := range turbines(t) {
		for mean := 4.0; mean <= 11; mean += 0.5 {
			for k := 1.5; k < 3.01; k += 0.25 {
				w, err := FromMeanAndK(mean, k)
				if err != nil {
					t.Fatal(err)
				}
				a, b := GrossQuadratureMWhPerYr(m.Curve, w), GrossExactMWhPerYr(m.Curve, w)
				if worst = math.Max(worst, math.Abs(a/b-1)); !near(a, b, 1e-6) {
					t.Errorf("%s, mean %g, k %g: quadrature %g, closed form %g", m.ID, mean, k, a, b)
				}
			}
		}
	}
	t.Logf("they differ by %.1e at most", worst)
	// The rule is exact for polynomials to degree 15, on -1 to 1 2/(n+1) for even n.
	for n := 0; n < 16; n += 2 {
		var sum float64
		for g, x := range gaussNode {
			sum += 2 * gaussWeight[g] * math.Pow(x, float64(n))
		}
		if !near(sum, 2/float64(n+1), 1e-13) {
			t.Errorf("degree %d: %.16g", n, sum)
		}
	}
	// Hardly any wind at all costs neither memory nor hours.
	if e := GrossQuadratureMWhPerYr(turbine(t, "iea_3_4mw_130").Curve, Weibull{1e-9, 2}); e != 0 {
		t.Errorf("no wind gives %g MWh", e)
	}
}

func TestThreeWaysToTheEnergyAgree(t *testing.T) {
	for _, m := range turbines(t) {
		for mean := 5.0; mean <= 9; mean++ {
			for _, k := range []float64{1.6, 2, 2.6} {
				w, err := FromMeanAndK(mean, k)
				if err != nil {
					t.Fatal(err)
				}
				a, b, c := GrossMWhPerYr(m.Curve, w), GrossBinsMWhPerYr(m.Curve, w), GrossExactMWhPerYr(m.Curve, w)
				if !near(a, c, 5e-5) || !near(b, c, 1e-2) {
					t.Errorf("%s, mean %g, k %g: fine bins %g, half metre bins %g, closed form %g", m.ID, mean, k, a, b, c)
				}
			}
		}
	}
}

func TestGenericCurve(t *testing.T) {
	g, err := defaults(t).Generic(4200, 150)
	if err != nil {
		t.Fatal(err)
	}
	smooth, err := g.Curve()
	if err != nil {
		t.Fatal(err)
	}
	g.TurbulenceFrac = 0
	sharp, err := g.Curve()
	if err != nil {
		t.Fatal(err)
	}
	for v := 0.0; v < 30; v += 0.1 {
		if smooth.PowerKW(v) > g.RatedKW || sharp.PowerKW(v) > g.RatedKW {
			t.Errorf("above rated power at %g m/s", v)
		}
	}
	vr := RatedSpeed(g.RatedKW, g.RotorDiameterM, g.Cp)
	if sharp.PowerKW(vr) != g.RatedKW || !(smooth.PowerKW(vr) < g.RatedKW) || !(smooth.PowerKW(6) > sharp.PowerKW(6)) {
		t.Errorf("at the knee %g and %g kW", sharp.PowerKW(vr), smooth.PowerKW(vr))
	}
	for name, bad := range map[string]func(*Generic){
		"power": func(g *Generic) { g.RatedKW = math.NaN() }, "rotor": func(g *Generic) { g.RotorDiameterM = 0 },
		"cp": func(g *Generic) { g.Cp = 0.7 }, "turbulence": func(g *Generic) { g.TurbulenceFrac = -1 },
		"cut-out": func(g *Generic) { g.CutOutMPerS = 2 }, "step": func(g *Generic) { g.SpeedStepMPerS = 0 },
		"points": func(g *Generic) { g.IntegrationPoints = 3 },
	} {
		h := g
		bad(&h)
		if _, err := h.Curve(); err == nil {
			t.Errorf("%s: accepted", name)
		}
	}
}

func TestWeibullProperties(t *testing.T) {
	for k := 0.8; k < 6; k += 0.3 {
		w := Weibull{7.3, k}
		if back, err := FromMeanAndStd(w.Mean(), w.Std()); err != nil || !near(back.K, k, 1e-9) || !near(back.AMPerS, 7.3, 1e-9) {
			t.Errorf("k %g came back as %v, %v", k, back, err)
		}
		if !near(w.CDF(w.Median()), 0.5, 1e-12) || !near(w.Moment(1), w.Mean(), 1e-12) {
			t.Errorf("k %g: median or moment", k)
		}
		if m := w.Mode(); k > 1 && !(w.Density(m) >= w.Density(m*1.01) && w.Density(m) >= w.Density(m*0.99)) {
			t.Errorf("k %g: the mode %g is not the top", k, m)
		}
		var sum float64
		for v := 0.0; v < 60; v += 0.001 {
			sum += w.Density(v+0.0005) * 0.001
		}
		if k > 1 && !near(sum, 1, 1e-4) { // below, the density has a pole at 0
			t.Errorf("k %g: density sums to %g", k, sum)
		}
	}
	if _, err := FromMeanAndStd(5, 20); err == nil {
		t.Error("a spread that no distribution has was fitted")
	}
	if _, calm, err := FitMaximumLikelihood([]float64{0, 0, 3, 5, 6, 4}); err != nil || !near(calm, 2.0/6, 1e-12) {
		t.Errorf("calm share %g, %v", calm, err)
	}
	if _, err := FitEnergyPreserving([]float64{1, math.NaN(), 3}); err == nil {
		t.Error("a speed that is no number was fitted")
	}
	same, err := CombineSectors([]Sector{{.3, Weibull{8, 2.2}}, {.7, Weibull{8, 2.2}}, {0, Weibull{}}})
	if err != nil || !near(same.K, 2.2, 1e-9) || !near(same.AMPerS, 8, 1e-9) {
		t.Errorf("like sectors combine to %v, %v", same, err)
	}
}

func TestComponents(t *testing.T) {
	cs := Components{
		{Name: "measurement", SpeedFrac: .07, Shared: true}, {Name: "long_term", SpeedFrac: .03, Shared: true}, {Name: "vertical", SpeedFrac: .045, Shared: true},
		{Name: "curve", EnergyFrac: .05, Shared: true}, {Name: "horizontal", SpeedFrac: .065}, {Name: "wakes", EnergyFrac: .03},
	}
	total, err1 := cs.Total(1.5)
	shared, own, err2 := cs.Parts(1.5)
	if err1 != nil || err2 != nil || !near(total*total, shared*shared+own*own, 1e-12) || !near(own, math.Hypot(1.5*.065, .03), 1e-12) {
		t.Errorf("total %g, shared %g, own %g; %v %v", total, shared, own, err1, err2)
	}
	u := Uncertainty{MeasurementFrac: .03, LongTermFrac: .02, VerticalFrac: .03, HorizontalFrac: .04, PerformanceFrac: .05}
	want, err1 := u.SigmaEnergy(1.4, 1)
	got, err2 := u.Components().Total(1.4)
	if err1 != nil || err2 != nil || !near(got, want, 1e-12) {
		t.Errorf("the same components give %g and %g; %v %v", got, want, err1, err2)
	}
	if shared, own, err := (Components{}).Parts(1); shared != 0 || own != 0 || err != nil {
		t.Errorf("nothing gives %g and %g, %v", shared, own, err)
	}
	for name, bad := range map[string]Components{
		"nan": {{SpeedFrac: math.NaN()}}, "above 1": {{EnergyFrac: 1.5}}, "both": {{SpeedFrac: .1, EnergyFrac: .1}},
	} {
		if _, _, err := bad.Parts(1); err == nil {
			t.Errorf("%s: accepted", name)
		}
	}
	if _, err := cs.Total(6); err == nil {
		t.Error("a sensitivity of 6 was accepted")
	}
}

func TestExceedances(t *testing.T) {
	ls, err := Exceedances(1000, .1, .06)
	if err != nil || len(ls) != 5 || ls[0].LongTermMWhPerYr != 1000 || ls[0].SingleYearMWhPerYr != 1000 {
		t.Fatalf("%v, %v", ls, err)
	}
	for i, l := range ls {
		want, err := Exceedance(1000, .1, l.ProbabilityFrac)
		single, err2 := Exceedance(1000, math.Hypot(.1, .06), l.ProbabilityFrac)
		if err != nil || err2 != nil || l.LongTermMWhPerYr != want || !near(l.SingleYearMWhPerYr, single, 1e-12) {
			t.Errorf("P%g: %+v", 100*l.ProbabilityFrac, l)
		}
		if i > 0 && !(l.LongTermMWhPerYr < ls[i-1].LongTermMWhPerYr && l.SingleYearMWhPerYr < l.LongTermMWhPerYr) {
			t.Errorf("P%g is not less than the one before, or one year is not", 100*l.ProbabilityFrac)
		}
	}
	if _, err := Exceedances(1000, math.NaN(), 0); err == nil {
		t.Error("a sigma that is no number was accepted")
	}
	if _, err := Exceedances(-1, .1, 0); err == nil {
		t.Error("an energy below 0 was accepted")
	}
}

func TestLogLawCarriesTheWindToTheHub(t *testing.T) {
	in := farm(t, "iea_3_4mw_130", scatter(4, 2, 700)...)
	in.Site.RefHeightM = 60
	power := year(t, in)
	if !near(power.ExtrapolationRatio, in.HubHeightM/60, 1e-12) {
		t.Errorf("extrapolated by %g", power.ExtrapolationRatio)
	}
	in.Site.DisplacementM = 7 // plays no part without a roughness
	if r := year(t, in); r.NetMWhPerYr != power.NetMWhPerYr {
		t.Errorf("power law: %g, with a displacement %g", power.NetMWhPerYr, r.NetMWhPerYr)
	}
	in.Site.RoughnessM, in.Site.DisplacementM = 0.4, 8
	r := year(t, in)
	factor, err := LogLaw(1, 60, in.HubHeightM, 0.4, 8)
	if err != nil {
		t.Fatal(err)
	}
	var mean float64
	for _, s := range in.Site.Rose {
		mean += s.FrequencyFrac * s.Weibull.Mean() * factor
	}
	if !near(r.MeanSpeedMPerS, mean, 1e-9) {
		t.Errorf("at the hub %g m/s, want %g", r.MeanSpeedMPerS, mean)
	}
	// The exponent that gives the same factor gives the same year.
	same := in
	same.Site.RoughnessM = 0
	if same.Site.ShearAlpha, err = AlphaFromSpeeds(1, 60, factor, in.HubHeightM); err != nil {
		t.Fatal(err)
	}
	if s := year(t, same); !near(s.NetMWhPerYr, r.NetMWhPerYr, 1e-9) {
		t.Errorf("log law %g MWh, the same factor by the power law %g", r.NetMWhPerYr, s.NetMWhPerYr)
	}
	// Existing machines of another height follow the same law.
	in.Existing = []Machine{{Position{0, -900}, turbine(t, "dw100_27_6"), 40}}
	f, _, err := prepareFarm(in)
	if err != nil {
		t.Fatal(err)
	}
	down, err := LogLaw(1, in.HubHeightM, 40, 0.4, 8)
	if err != nil || !near(f.kinds[1].s/f.kinds[0].s, down, 1e-12) {
		t.Errorf("an existing machine at 40 m sees %g of the hub's speed, want %g; %v", f.kinds[1].s/f.kinds[0].s, down, err)
	}
	for _, bad := range []float64{-1, math.NaN(), 80} {
		in.Site.RoughnessM = bad
		if _, err := FarmYear(in); err == nil {
			t.Errorf("roughness length %g m was accepted", bad)
		}
	}
}

func TestCompareWakes(t *testing.T) {
	in := farm(t, "iea_3_4mw_130", scatter(6, 3, 700)...)
	in.Settings.Wake = WakeIEA37
	cs, err := CompareWakes(in)
	if err != nil || len(cs) != 2 || cs[0].Wake != WakeGaussian || cs[1].Wake != WakeJensen {
		t.Fatalf("%v, %v", cs, err)
	}
	for _, c := range cs {
		in.Settings.Wake = c.Wake
		if r := year(t, in); r.NetMWhPerYr != c.NetMWhPerYr || r.WakeLossFrac != c.WakeLossFrac || c.WakedMWhPerYr != r.Chain[0].AfterMWh {
			t.Errorf("%v: %g MWh, alone %g", c.Wake, c.NetMWhPerYr, r.NetMWhPerYr)
		}
	}
	if cs[0].WakeLossFrac == cs[1].WakeLossFrac || cs[0].Year.GrossMWhPerYr != cs[1].Year.GrossMWhPerYr {
		t.Errorf("losses %g and %g of %g and %g", cs[0].WakeLossFrac, cs[1].WakeLossFrac, cs[0].Year.GrossMWhPerYr, cs[1].Year.GrossMWhPerYr)
	}
	in.At = nil
	if _, err := CompareWakes(in); err == nil {
		t.Error("no positions were accepted")
	}
}

func TestDirectionsAddUp(t *testing.T) {
	in := farm(t, "iea_3_4mw_130", Position{}, Position{X: 600})
	r := year(t, in)
	var free, waked, time float64
	worst := 0
	for i, d := range r.Directions {
		free += d.FreeMWhPerYr
		waked += d.WakedMWhPerYr
		time += d.TimeFrac
		if d.FromDeg != float64(i)*5 || d.WakedMWhPerYr > d.FreeMWhPerYr*(1+1e-12) {
			t.Errorf("direction %d: %+v", i, d)
		}
		if 1-d.WakedMWhPerYr/d.FreeMWhPerYr > 1-r.Directions[worst].WakedMWhPerYr/r.Directions[worst].FreeMWhPerYr {
			worst = i
		}
	}
	if len(r.Directions) != 72 || !near(free, r.GrossMWhPerYr, 1e-12) || !near(waked, r.Chain[0].AfterMWh, 1e-9) || !near(time, 1, 1e-12) {
		t.Errorf("%d directions with %g, %g MWh in %g of the time", len(r.Directions), free, waked, time)
	}
	if d := r.Directions[worst].FromDeg; d != 90 && d != 270 {
		t.Errorf("machines in a line from west to east lose most from %g degrees", d)
	}
}

func TestShearAgreesWithLogLaw(t *testing.T) {
	alpha, err := AlphaFromRoughness(90, 110, 0.1)
	if err != nil {
		t.Fatal(err)
	}
	v1, err1 := LogLaw(1, 90, 110, 0.1, 0)
	v2, err2 := PowerLaw(1, 90, 110, alpha)
	a, err3 := AlphaFromSpeeds(1, 90, v1, 110)
	if err1 != nil || err2 != nil || err3 != nil || !near(v1, v2, 1e-5) || !near(a, alpha, 1e-3) {
		t.Errorf("log law %g, power law %g, exponents %g and %g", v1, v2, a, alpha)
	}
	if _, err := LogLaw(5, 10, 0.05, 0.1, 0); err == nil {
		t.Error("the log law below the roughness length was accepted")
	}
}

func TestParseRefusesWhatDoesNotFit(t *testing.T) {
	curves, facts := table(t, "assets/params/turbine_curves.csv"), table(t, "assets/params/turbines.csv")
	if _, err := ParseTurbines(facts, facts); err == nil {
		t.Error("facts were read as curves")
	}
	short := *facts
	short.Rows = facts.Rows[1:]
	if _, err := ParseTurbines(curves, &short); err == nil || !strings.Contains(err.Error(), "iea_3_4mw_130") {
		t.Errorf("a curve without facts: %v", err)
	}
	cut := *curves
	cut.Rows = curves.Rows[:len(curves.Rows)-1]
	if _, err := ParseTurbines(&cut, facts); err == nil {
		t.Error("a curve that ends before cut-out was accepted")
	}
	if _, err := FindTurbine(nil, "x"); err == nil {
		t.Error("found a turbine in nothing")
	}
	if _, err := ParseWakeModel("cubic"); err == nil {
		t.Error("an unknown wake model was read")
	}
	for _, m := range []WakeModel{WakeGaussian, WakeJensen, WakeIEA37} {
		if back, err := ParseWakeModel(m.String()); err != nil || back != m {
			t.Errorf("%v came back as %v", m, back)
		}
	}
}

func BenchmarkFarmYear(b *testing.B) {
	for _, n := range []int{1, 2, 3, 5, 10, 25, 50} {
		b.Run(fmt.Sprint(n), func(b *testing.B) {
			in := farm(b, "iea_3_4mw_130", scatter(n, 7, 300*math.Sqrt(float64(n))+300)...)
			f, _, err := prepareFarm(in)
			if err != nil {
				b.Fatal(err)
			}
			for b.Loop() {
				year(b, in)
			}
			b.ReportMetric(float64(len(f.shares)), "directions")
			b.ReportMetric(float64(len(f.nodes)), "speeds")
		})
	}
}

func BenchmarkEvaluatorAdd(b *testing.B) {
	for _, n := range []int{1, 4, 9, 24} {
		b.Run(fmt.Sprint(n), func(b *testing.B) {
			in := farm(b, "iea_3_4mw_130", Position{})
			in.Settings.Directions = LayoutDirections
			ev, err := NewEvaluator(in)
			if err != nil {
				b.Fatal(err)
			}
			at := scatter(n, 7, 300*math.Sqrt(float64(n))+300)
			ps := scatter(30, 8, 1500)
			i := 0
			for b.Loop() {
				ev.Add(at, ps[i%len(ps)])
				i++
			}
		})
	}
}

func BenchmarkNewEvaluator(b *testing.B) {
	in := farm(b, "iea_3_4mw_130", Position{})
	in.Settings.Directions = LayoutDirections
	for b.Loop() {
		if _, err := NewEvaluator(in); err != nil {
			b.Fatal(err)
		}
	}
}

// The sectors hold all of the year's energy, in the free stream and behind the wakes, each by its own wind.
func TestSectorsAddUp(t *testing.T) {
	r := year(t, farm(t, "iea_3_4mw_130", Position{}, Position{X: 500}, Position{X: 300, Y: 450}))
	free, waked := 0.0, 0.0
	for i, s := range r.Sectors {
		if s.WakedMWhPerYr > s.FreeMWhPerYr*(1+1e-12) {
			t.Errorf("sector %d gives more behind wakes, %v, than before them, %v", i, s.WakedMWhPerYr, s.FreeMWhPerYr)
		}
		free += s.FreeMWhPerYr
		waked += s.WakedMWhPerYr
	}
	if len(r.Sectors) != len(rose12()) || !near(free, r.GrossMWhPerYr, 1e-12) || !near(waked, r.Chain[0].AfterMWh, 1e-9) {
		t.Errorf("%d sectors give %v and %v MWh, the farm %v and %v", len(r.Sectors), free, waked, r.GrossMWhPerYr, r.Chain[0].AfterMWh)
	}
	// One sector alone is the farm in a wind from there.
	in := farm(t, "iea_3_4mw_130", Position{})
	alone := year(t, in)
	for i := range in.Site.Rose {
		if i != 3 {
			in.Site.Rose[i].FrequencyFrac = 0
		}
	}
	share := rose12()[3].FrequencyFrac
	in.Site.Rose[3].FrequencyFrac = 1
	if only := year(t, in); !near(alone.Sectors[3].FreeMWhPerYr, share*only.GrossMWhPerYr, 1e-9) {
		t.Errorf("sector 3 gives %v of the farm, %v as the only one", alone.Sectors[3].FreeMWhPerYr, share*only.GrossMWhPerYr)
	}
}
