package run

import (
	"math"
	"reflect"
	"slices"
	"strconv"
	"strings"
	"testing"

	"groundtally/app/study"
	"groundtally/geo"
	"groundtally/scoring/wind"
)

// What the study says of losses and wakes counts, in place of what ships.
func TestWindAsTheStudySaysIt(t *testing.T) {
	of := func(set ...string) (mwh, wakes float64, c *Candidate) {
		p := windYield(t)
		p.set("wind.typed_mean_speed_m_per_s", "7", "wind.typed_height_m", "100")
		p.set(set...)
		c = p.computed(nil)
		return p.leaf(c, "wind_p50_mwh").X, p.leaf(c, "wake_loss_frac").X, c
	}
	shipped, gaussian, _ := of()
	for key, was := range map[string]float64{"availability": 0.03, "electrical": 0.02, "performance": 0.02, "environment": 0.02, "stops": 0} {
		got, _, _ := of("wind."+key+"_frac", "0.1")
		if want := shipped * 0.9 / (1 - was); math.Abs(got/want-1) > 1e-12 {
			t.Errorf("a loss of 0.1 in place of %v by %s gives %v, not %v", was, key, got, want)
		}
	}
	if got, _, _ := of("wind.small_total_frac", "0.5"); got != shipped {
		t.Errorf("the loss of small machines changes large ones: %v, %v", got, shipped)
	}
	_, hat, _ := of("wind.wake_model", "top hat")
	_, wide, _ := of("wind.wake_model", "top hat", "wind.wake_decay", "0.15")
	_, calm, _ := of("wind.turbulence_frac", "0.05")
	if hat == gaussian || !(hat > 0) || wide >= hat || calm <= gaussian {
		t.Errorf("wakes: Gaussian %v, in calm air %v, top hat %v, fast growing %v", gaussian, calm, hat, wide)
	}
}

// Between points the wind is the mean by the inverse square of the distance; a point of another height or another
// number of sectors has no say.
func TestWindBetweenPoints(t *testing.T) {
	at := func(x, height float64, sectors int, mean, k float64) windPoint {
		wb, err := wind.FromMeanAndK(mean, k)
		if err != nil {
			t.Fatal(err)
		}
		p := windPoint{at: geo.XY{X: x}, heightM: height, layer: "points"}
		for range sectors {
			p.sectors = append(p.sectors, wind.Sector{FrequencyFrac: 1 / float64(sectors), Weibull: wb})
		}
		return p
	}
	points := []windPoint{at(0, 100, 12, 6, 1.8), at(3000, 100, 12, 8, 2.2), at(100, 50, 12, 3, 2), at(200, 100, 8, 3, 2)}
	mean := func(x float64) (speed, k float64, used int) {
		p, _, used := windBetween(points, geo.XY{X: x})
		return p.sectors[3].Weibull.Mean(), p.sectors[3].Weibull.K, used
	}
	// Two thirds of the way: weights 1/4 and 1, so a fifth of the first.
	if v, k, used := mean(2000); used != 2 || math.Abs(v-(6+8*4)/5.0) > 1e-9 || math.Abs(k-(1.8+2.2*4)/5) > 1e-9 {
		t.Errorf("between the points %v m/s, k %v, of %d points", v, k, used)
	}
	if v, _, _ := mean(0); math.Abs(v-6) > 1e-5 {
		t.Errorf("at a point %v m/s", v)
	}
	if v, _, used := mean(110); used != 1 || math.Abs(v-3) > 1e-9 {
		t.Errorf("beside the point of another height %v m/s, of %d points", v, used)
	}
	if _, _, used := windBetween(nil, geo.XY{}); used != 0 {
		t.Error("wind of no points")
	}
	// The shares of time stay a whole year.
	points[1].sectors[0].FrequencyFrac, points[1].sectors[6].FrequencyFrac = 0.5/12, 1.5/12
	p, _, _ := windBetween(points[:2], geo.XY{X: 1500})
	sum := 0.0
	for _, s := range p.sectors {
		sum += s.FrequencyFrac
	}
	if math.Abs(sum-1) > 1e-12 || math.Abs(p.sectors[6].FrequencyFrac-1.25/12) > 1e-12 {
		t.Errorf("%v of a year, %v of it from the south", sum, p.sectors[6].FrequencyFrac)
	}
}

// Where nothing is said, a site takes as many machines as the nearest spare capacity carries: one at least, 25 at most.
func TestAsManyAsTheGridCarries(t *testing.T) {
	for spare, want := range map[string]int{"100": 1, "1000": 2, "1400": 2, "1600": 3, "": 25, "90000": 25} {
		p := newPlain(t)
		p.add("parcels", []string{"parcel_id"}, thing{square(-500, -500, 1000), map[string]string{"parcel_id": "DE.1"}})
		p.set("plant.wind.technology", "wind", "plant.wind.hub_height_m", "60", "plant.wind.rotor_diameter_m", "40", "plant.wind.rated_kw", "500",
			"wind.typed_mean_speed_m_per_s", "7", "wind.typed_height_m", "100", "rule.setback.dwellings.wind_m", "0")
		if spare != "" {
			p.add("substations", []string{"name", "voltage", "spare_capacity"}, thing{dot(0, 1500), map[string]string{"name": "S", "voltage": "20", "spare_capacity": spare}})
		}
		c := p.computed(nil)
		if c.Fit == nil || len(c.Fit.Turbines) != want {
			t.Errorf("spare capacity %q carries %+v, not %d (%s)", spare, c.Fit, want, c.Reason)
		}
		p.set("plant.wind.fit_machines", "4")
		if c = p.computed(nil); c.Fit == nil || len(c.Fit.Turbines) != 4 {
			t.Errorf("four asked for: %+v", c.Fit)
		}
	}
}

// A curve of the user's own stands in place of a reference curve.
func TestOwnCurve(t *testing.T) {
	p := windYield(t)
	p.set("wind.typed_mean_speed_m_per_s", "7", "wind.typed_height_m", "100")
	generic := p.leaf(p.computed(nil), "wind_p50_mwh").X
	flat := study.OwnTurbine{ID: "flat", RatedKW: 2000, RotorDiameterM: 100, Points: []study.CurvePoint{{SpeedMPerS: 2, PowerKW: 0, HasCt: true}, {SpeedMPerS: 3, PowerKW: 2000, Ct: 0.1, HasCt: true}, {SpeedMPerS: 25, PowerKW: 2000, Ct: 0.1, HasCt: true}}}
	if err := p.s.PutTurbine(t.Context(), flat, "on offer"); err != nil {
		t.Fatal(err)
	}
	p.set("plant.wind.turbine", "flat")
	c := p.computed(nil)
	own := p.leaf(c, "wind_p50_mwh").X
	// At 7 m/s after Rayleigh the wind blows above 3 m/s for exp(-pi/4 (3/7)^2) of the time.
	most := 2 * 2 * 8760 * math.Exp(-math.Pi/4*9/49)
	if own <= 1.5*generic || own > most {
		t.Errorf("a machine that is always at full power gives %v MWh, the generic one %v; at most %v", own, generic, most)
	}
	if p.said(c, "wind_ct_estimated") {
		t.Error("the thrust of the user's curve is not taken")
	}
	half := flat
	half.Points = slices.Clone(flat.Points)
	for i := range half.Points {
		half.Points[i].PowerKW /= 2
	}
	half.RatedKW = 2000
	if err := p.s.PutTurbine(t.Context(), half, "the other offer"); err != nil {
		t.Fatal(err)
	}
	if got := p.leaf(p.computed(nil), "wind_p50_mwh").X; math.Abs(got/own-0.5) > 1e-9 {
		t.Errorf("half the power gives %v of the energy", got/own)
	}
}

// Turbines stand where the user puts them, whatever rule that breaks; the rules are named.
func TestPlacedByHand(t *testing.T) {
	p := windYield(t)
	p.set("wind.typed_mean_speed_m_per_s", "7", "wind.typed_height_m", "100", "rule.setback.boundary.wind_rotor", "0.5")
	cache := &Memory{}
	own := p.computed(cache)
	if own.Fit.Layout == nil || own.Fit.Layout.How == byHandWords || own.Fit.Layout.Asked != 2 || own.Fit.Layout.AskedBy != askedSetting {
		t.Fatalf("the program's own layout: %+v", own.Fit.Layout)
	}
	put := func(at ...geo.XY) *Candidate {
		l := study.HandLayout{Site: own.Site, Plant: "wind", Reason: "off the path"}
		for _, q := range at {
			ll, err := p.frame.Inverse(q)
			if err != nil {
				t.Fatal(err)
			}
			l.At = append(l.At, ll)
		}
		if err := p.s.PutLayout(t.Context(), l); err != nil {
			t.Fatal(err)
		}
		return p.computed(cache)
	}
	c := put(geo.XY{X: -200, Y: -200}, geo.XY{X: 200, Y: 200}, geo.XY{X: 200, Y: -200})
	if c.Status != Fitted || len(c.Fit.Turbines) != 3 || c.Fit.WindKW != 6000 {
		t.Fatalf("%s %s: %+v", c.Status, c.Reason, c.Fit)
	}
	// Even wind asks for 4 rotors of 100 m all round: 400 m apart is just enough.
	lay := c.Fit.Layout
	if lay.How != byHandWords || lay.Reason != "off the path" || len(lay.Broken) != 0 || math.Abs(lay.SpacingMet-1) > 1e-4 {
		t.Errorf("kept rules: %+v", lay)
	}
	c = put(geo.XY{X: 480, Y: 0}, geo.XY{X: 600, Y: 0}, geo.XY{X: 180, Y: 0})
	want := map[string]float64{brokenGround: 30, brokenSite: 100, brokenSpacing: 280}
	got := map[string]float64{}
	for _, b := range c.Fit.Layout.Broken {
		got[b.Rule] = math.Max(got[b.Rule], b.ByM)
	}
	for rule, m := range want {
		if math.Abs(got[rule]-m) > 0.5 {
			t.Errorf("%s by %v m, not %v: %+v", rule, got[rule], m, c.Fit.Layout.Broken)
		}
	}
	if c = put(geo.XY{X: 0, Y: 0}, geo.XY{X: 50, Y: 0}); c.Status != NotComputed || c.Reason != "turbines_touch" {
		t.Errorf("rotors in each other: %s %s", c.Status, c.Reason)
	}
	if err := p.s.DropLayout(t.Context(), own.Site, "wind", "as it was"); err != nil {
		t.Fatal(err)
	}
	if c = p.computed(cache); !reflect.DeepEqual(c.Fit, own.Fit) {
		t.Errorf("back again: %+v, before %+v", c.Fit, own.Fit)
	}
}

// The logarithmic law carries the wind over the roughness of the land cover around a site, else over the typed one.
func TestWindByTheLogarithmicLaw(t *testing.T) {
	p := windYield(t)
	p.set("wind.typed_mean_speed_m_per_s", "6", "wind.typed_height_m", "50", "wind.profile", "log law")
	if c := p.computed(nil); p.leaf(c, "wind_p50_mwh").Why != "not_set:wind.roughness_m" {
		t.Errorf("without roughness: %+v", p.leaf(c, "wind_p50_mwh"))
	}
	energy := func() float64 { return p.leaf(p.computed(nil), "wind_p50_mwh").X }
	p.set("wind.roughness_m", "0.4")
	typed := energy()
	// The same speed typed at the hub, 100 m up: 6 ln(100/0.4)/ln(50/0.4). Rounding may choose another of two equal layouts.
	q := windYield(t)
	q.set("wind.typed_mean_speed_m_per_s", strconv.FormatFloat(6*math.Log(250)/math.Log(125), 'g', -1, 64), "wind.typed_height_m", "100")
	if want := q.leaf(q.computed(nil), "wind_p50_mwh").X; math.Abs(typed/want-1) > 1e-4 {
		t.Errorf("over 0.4 m %v MWh, not %v", typed, want)
	}
	p.add("land_cover", []string{"class"}, thing{square(-5000, -5000, 10000), map[string]string{"class": "mixed forest"}})
	p.set("wind.roughness_m", "0.0002")
	c := p.computed(nil)
	if l := p.leaf(c, "wind_p50_mwh"); math.Abs(l.X/typed-1) > 1e-4 || !strings.Contains(l.Source, "land cover") {
		t.Errorf("over woods %+v, over 0.4 m %v MWh", l, typed)
	}
	p.set("wind.displacement_m", "50")
	if l := p.leaf(p.computed(nil), "wind_p50_mwh"); !strings.Contains(l.Why, "logarithmic law") {
		t.Errorf("data below the tops of the trees: %+v", l)
	}
}
