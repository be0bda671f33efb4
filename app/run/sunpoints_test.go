package run

import (
	"fmt"
	"math"
	"strings"
	"testing"
	"time"

	"groundtally/geo"
	"groundtally/scoring"
	"groundtally/scoring/solar"
	"groundtally/scoring/sun"
)

func dot(x, y float64) geo.XYGeometry {
	return geo.XYGeometry{Kind: geo.Points, Parts: [][][]geo.XY{{{{X: x, Y: y}}}}}
}

var someGHI = [12]float64{24, 41, 82.4, 121, 155, 165, 170.2, 146, 102, 58, 28, 20}

// station gives the rows of a point of monthly sunlight; factor scales its light.
func station(x, y, factor float64, more map[string]string) (out []thing) {
	for m := range 12 {
		v := map[string]string{"month": fmt.Sprint(m + 1), "ghi": fmt.Sprint(someGHI[m] * factor), "temperature": fmt.Sprint(m - 2)}
		for k, x := range more {
			v[k] = x
		}
		out = append(out, thing{dot(x, y), v})
	}
	return out
}

func sunStudy(t *testing.T) *plain {
	p := newPlain(t)
	p.add("parcels", []string{"parcel_id"}, thing{square(-100, -100, 200), map[string]string{"parcel_id": "S.1"}})
	p.set("plant.sun.technology", "solar_fixed", "rule.exclude.dwellings", "no", "rule.exclude.roads", "no")
	return p
}

var sunColumns = []string{"month", "ghi", "temperature"}

func TestPointsOfMonthlySunlight(t *testing.T) {
	typed := func(factor float64) Leaf {
		p := sunStudy(t)
		for m := range 12 {
			p.set(fmt.Sprintf("solar.typed_temperature_%d_degc", m+1), fmt.Sprint(m-2), fmt.Sprintf("solar.typed_ghi_%d_kwh_per_m2", m+1), fmt.Sprint(someGHI[m]*factor))
		}
		return p.leaf(p.computed(nil), "solar_p50_mwh")
	}
	want := typed(1)

	one := sunStudy(t)
	one.add(sunRole, sunColumns, station(3000, 4000, 1, nil)...)
	got := one.leaf(one.computed(nil), "solar_p50_mwh")
	if got.X != want.X || !strings.Contains(got.Source, "the nearest lies 5.0 km off") {
		t.Errorf("one point: %v from %q, typed %v", got.X, got.Source, want.X)
	}

	// Twice as near counts four times: 4/5 of the nearer and 1/5 of the farther.
	two := sunStudy(t)
	two.add(sunRole, sunColumns, append(station(-2000, 0, 1, nil), station(4000, 0, 1.1, nil)...)...)
	got = two.leaf(two.computed(nil), "solar_p50_mwh")
	if by := got.X/typed(1.02).X - 1; math.Abs(by) > 0.001 || !strings.Contains(got.Source, "2 points of") || !strings.Contains(got.Source, "the nearest lies 2.0 km off") {
		t.Errorf("two points: %.4f from 1.02 times the light, from %q", by, got.Source)
	}

	short := sunStudy(t)
	short.add(sunRole, sunColumns, station(0, 0, 1, nil)[:11]...)
	x := short.leaf(short.computed(nil), "solar_p50_mwh")
	if x.State != scoring.Unknown || !strings.Contains(x.Why, "has no month 12; each place needs twelve rows") {
		t.Errorf("a point of eleven months: %+v", x)
	}
	for what, change := range map[string]func(map[string]string){
		`row 5: "13" is no month; write 1 to 12`:                                        func(v map[string]string) { v["month"] = "13" },
		"row 5: month 4 stands twice":                                                   func(v map[string]string) { v["month"] = "4" },
		`row 5, month 5: the sunlight is "lots", which is not a number`:                 func(v map[string]string) { v["ghi"] = "lots" },
		"row 5, month 5: there is no sunlight":                                          func(v map[string]string) { v["ghi"] = "" },
		"row 5, month 5: sunlight of -20 kWh/m2 is not from 0 to 1000":                  func(v map[string]string) { v["ghi"] = "-20" },
		"a temperature of 279 is not from -80 to 60; if it is in kelvin, give its unit": func(v map[string]string) { v["temperature"] = "279" },
		"a loss by snow of 5 is not from 0 to 1; write a share, 0.05 for 5 %":           func(v map[string]string) { v["snow_loss"] = "5" },
		`the loss by snow is "5%", which is not a number`:                               func(v map[string]string) { v["snow_loss"] = "5%" },
		"sun_hardly": func(v map[string]string) {},
	} {
		p := sunStudy(t)
		factor := 1.0
		if what == "sun_hardly" {
			factor = 1.0 / 30
		}
		rows := station(0, 0, factor, map[string]string{"snow_loss": "0"})
		change(rows[4].values)
		p.add(sunRole, append(sunColumns[:3:3], "snow_loss"), rows...)
		snap, err := p.s.Snapshot()
		if err != nil {
			t.Fatal(err)
		}
		all, err := sunNotices(t.Context(), p.s.Store(), snap)
		if err != nil || len(all) != 1 || !strings.Contains(all[0].Code+" "+all[0].Args["why"], what) {
			t.Errorf("%s: %+v, %v", what, all, err)
		}
	}
}

// Rounding the sunlight and sharing it over squares of a kilometre moves a year by less than 0.2 %, in a district
// whose light changes by a tenth over 40 km.
func TestStepsOfTheSunlight(t *testing.T) {
	p := shipped(t)
	points := []sunPoint{}
	for _, c := range [][3]float64{{-20_000, -20_000, 1}, {20_000, -20_000, 1.04}, {-20_000, 20_000, 1.06}, {20_000, 20_000, 1.1}} {
		s := &sunlight{albedo: solar.EveryMonth(0.2), snow: unsaid, soiling: unsaid}
		for m := range 12 {
			s.ghi[m], s.temp[m] = someGHI[m]*c[2], float64(m)*c[2]
		}
		points = append(points, sunPoint{geo.XY{X: c[0], Y: c[1]}, s})
	}
	year := func(s *sunlight) float64 {
		c, err := solar.NewClimate(solar.ClimateInput{LatDeg: 48, GHIKWhPerM2: s.ghi, TempC: s.temp, Albedo: s.albedo})
		if err != nil {
			t.Fatal(err)
		}
		y, err := c.Yield(p.Solar.Plant(solar.Mount{TiltDeg: 30, AzimuthDeg: 180, GCR: 0.45}))
		if err != nil {
			t.Fatal(err)
		}
		return y.SpecificYieldKWhPerKWp
	}
	worst := 0.0
	for i := range 40 {
		at := geo.XY{X: -15_000 + 749*float64(i), Y: 15_000 - 613*float64(i)}
		b := between(points, sunNode(at))
		if b.used != 4 {
			t.Fatalf("%d points", b.used)
		}
		s := b.sunlight
		// The same by hand, where the site stands and without rounding.
		exact := &sunlight{albedo: solar.EveryMonth(0.2)}
		total := 0.0
		for _, q := range points {
			w := 1 / math.Pow(math.Hypot(q.at.X-at.X, q.at.Y-at.Y), 2)
			total += w
			for m := range 12 {
				exact.ghi[m] += w * q.ghi[m]
				exact.temp[m] += w * q.temp[m]
			}
		}
		for m := range 12 {
			exact.ghi[m] /= total
			exact.temp[m] /= total
		}
		worst = max(worst, math.Abs(year(s)/year(exact)-1))
	}
	if worst > 2e-3 {
		t.Errorf("the steps move a year by %.2g", worst)
	}
	t.Logf("at most %.2g", worst)
}

// newTestFitter gives the fitter of a study.
func newTestFitter(p *plain) (*fitter, error) {
	snap, err := p.s.Snapshot()
	if err != nil {
		p.t.Fatal(err)
	}
	w, err := newWorld(p.t.Context(), snap, shipped(p.t), StoreLoader(p.s.Store()))
	if err != nil {
		p.t.Fatal(err)
	}
	return w.newFitter(p.t.Context(), nil)
}

// Dirt and snow go by month: typed before columns, columns before what is shipped.
func TestLossesByMonth(t *testing.T) {
	energy := func(more map[string]string, set ...string) float64 {
		p := sunStudy(t)
		columns := sunColumns
		for k := range more {
			columns = append(columns[:len(columns):len(columns)], k)
		}
		p.add(sunRole, columns, station(0, 0, 1, more)...)
		p.set(set...)
		x := p.leaf(p.computed(nil), "solar_p50_mwh")
		if x.State != scoring.Number {
			t.Fatalf("%v", x)
		}
		return x.X
	}
	shippedLoss := energy(nil)
	every := func(key, frac string) (out []string) {
		for m := range 12 {
			out = append(out, fmt.Sprintf("solar.%s_%d_frac", key, m+1), frac)
		}
		return out
	}
	if got := energy(nil, every("soiling", "0.02")...); got != shippedLoss {
		t.Errorf("2 %% of dirt as shipped, typed: %v, not %v", got, shippedLoss)
	}
	// Dirt takes light, so warmth and the inverter take a little less: 10 % more of it cost 9 to 10 %.
	if got := energy(map[string]string{"soiling_loss": "0.12"}); math.Abs(got/shippedLoss-0.88/0.98) > 0.012 {
		t.Errorf("12 %% of dirt leave %v of %v", got, shippedLoss)
	}
	if got := energy(map[string]string{"soiling_loss": "0.12"}, every("soiling", "0.02")...); got != shippedLoss {
		t.Errorf("typed values do not stand before columns: %v, not %v", got, shippedLoss)
	}
	snow := energy(map[string]string{"snow_loss": "0.1"})
	if math.Abs(snow/shippedLoss-0.9) > 1e-9 {
		t.Errorf("a tenth lost to snow leaves %v of %v", snow, shippedLoss)
	}
	// Losses behind the inverter multiply; those before it do nearly.
	if got := energy(nil, "solar.transformer_frac", "0.11"); math.Abs(got/shippedLoss-0.89/0.99) > 1e-9 {
		t.Errorf("11 %% in the transformer leave %v of %v", got, shippedLoss)
	}
	if got := energy(nil, "solar.mismatch_frac", "0.05"); got >= shippedLoss || math.Abs(got/shippedLoss-0.95/0.99) > 0.005 {
		t.Errorf("5 %% of mismatch leave %v of %v", got, shippedLoss)
	}
	// The months are cold, -2 to 9 degrees: what suffers more from heat gains more from cold.
	if got := energy(nil, "plant.sun.module_gamma_per_k", "-0.0045"); got <= shippedLoss {
		t.Errorf("modules that gain more from cold give %v, not more than %v", got, shippedLoss)
	}
	if got := energy(nil, "plant.sun.module_gamma_per_k", "-0.003"); got != shippedLoss {
		t.Errorf("the shipped figure, set, gives %v, not %v", got, shippedLoss)
	}
	if one, none := energy(nil, "plant.sun.shade_blocks", "1"), energy(nil, "plant.sun.shade_blocks", "0"); !(one < shippedLoss && shippedLoss < none) {
		t.Errorf("shade on one block leaves %v, on two %v, by width %v", one, shippedLoss, none)
	}
	june := energy(nil, "solar.snow_6_frac", "1")
	if share := 1 - june/shippedLoss; share < 0.1 || share > 0.2 {
		t.Errorf("June without energy takes %v of the year", share)
	}
}

// What errs alike on all sites moves them together: two sites keep their order in nearly every trial, and the spread
// of each is what it was.
func TestSharedErrorsMoveSitesTogether(t *testing.T) {
	p := sunStudy(t)
	p.add(sunRole, sunColumns, station(0, 0, 1, nil)...)
	f, err := newTestFitter(p)
	if err != nil {
		t.Fatal(err)
	}
	k, err := f.w.newReckoner()
	if err != nil {
		t.Fatal(err)
	}
	const shared, own = 0.06, 0.02
	r := fitResult{SolarKW: 1, SolarShared: shared, SolarOwn: own}
	a, b := k.siteDraws("A", r)[0].Values, k.siteDraws("B", r)[0].Values
	mean := func(x []float64) (m, sd float64) {
		for _, v := range x {
			m += v
		}
		m /= float64(len(x))
		for _, v := range x {
			sd += (v - m) * (v - m)
		}
		return m, math.Sqrt(sd / float64(len(x)))
	}
	ma, sa := mean(a)
	mb, sb := mean(b)
	cov := 0.0
	for i := range a {
		cov += (a[i] - ma) * (b[i] - mb) / float64(len(a))
	}
	want := shared * shared / (shared*shared + own*own)
	if got := cov / (sa * sb); math.Abs(got-want) > 0.03 {
		t.Errorf("the sites are correlated by %v, want %v", got, want)
	}
	for _, s := range []float64{sa, sb} {
		if math.Abs(s/math.Hypot(shared, own)-1) > 0.1 {
			t.Errorf("a site's spread is %v", s)
		}
	}
	if alone := k.siteDraws("A", fitResult{SolarKW: 1, SolarOwn: own})[0].Values; math.Abs(alone[0]-a[0]) < 1e-12 {
		t.Error("the shared part changes nothing")
	}
}

// The spread follows the sunlight that served.
func TestDoubtFollowsTheSource(t *testing.T) {
	sigma := func(set ...string) float64 {
		p := sunStudy(t)
		p.add(sunRole, sunColumns, station(0, 0, 1, nil)...)
		p.set(set...)
		return p.leaf(p.computed(nil), "solar_yield_sigma").X
	}
	said := sigma()
	if m := sigma("solar.data_kind", "map"); m != said {
		t.Errorf("what is not said counts as %v, a map as %v", said, m)
	}
	if s := sigma("solar.data_kind", "station"); s >= said {
		t.Errorf("a station is no surer: %v, map %v", s, said)
	}
	// By hand: map 6, months 4, 1, 2, 1, 1.5, 1, 1, 1, 1 and 4 % between years.
	if byHand := math.Sqrt(36+16+1+4+1+2.25+1+1+1+1+16) / 100; math.Abs(said-byHand) > 1e-12 {
		t.Errorf("%v, by hand %v", said, byHand)
	}
	if s := sigma("plant.sun.tilt_deg", "60", "solar.data_kind", "station"); s != sigma("solar.data_kind", "station") {
		t.Errorf("months are less sure than steep panels already: %v", s)
	}
}

// A found tilt is the best of all whole degrees, each computed as a tilt that is set.
func TestFoundTilt(t *testing.T) {
	at := func(set ...string) (mwh float64, c *Candidate) {
		p := sunStudy(t)
		p.add(sunRole, sunColumns, station(0, 0, 1, nil)...)
		p.set(set...)
		c = p.computed(nil)
		x := p.leaf(c, "solar_p50_mwh").X
		return x / c.Fit.SolarKW, c
	}
	got, c := at("plant.sun.tilt_rule", "most energy", "plant.sun.tilt_deg", "5")
	best, tilt := 0.0, 0.0
	for deg := 0.0; deg <= mostTiltDeg; deg += 1 {
		if y, _ := at("plant.sun.tilt_deg", fmt.Sprint(deg)); y > best {
			best, tilt = y, deg
		}
	}
	if c.Fit.TiltDeg != tilt || math.Abs(got/best-1) > 1e-12 {
		t.Errorf("found %v degrees with %v MWh/kW, the best is %v with %v", c.Fit.TiltDeg, got, tilt, best)
	}
	if tilt < 20 || tilt > 45 {
		t.Errorf("at 48 degrees north the best tilt among rows is %v", tilt)
	}
	if _, set := at("plant.sun.tilt_deg", "5"); set.Fit.TiltDeg != 5 {
		t.Errorf("a tilt of 5 degrees that is set stands at %v", set.Fit.TiltDeg)
	}
}

// On ground that rises to the sun the rows stand farther apart and hold less; on ground that falls to it, more.
func TestRowsOnASlope(t *testing.T) {
	fit := func(down float64) *Fit {
		p := sunStudy(t)
		p.add(sunRole, sunColumns, station(0, 0, 1, nil)...)
		p.terrain(func(_, y float64) float64 { return 500 + y*down }) // above 0 it falls to the south
		return p.computed(nil).Fit
	}
	flat, south, north := fit(0), fit(0.1), fit(-0.1)
	if flat.RowPitchM < 8.8 || flat.RowPitchM > 9 || south.RowPitchM > 0.85*flat.RowPitchM || north.RowPitchM < 1.2*flat.RowPitchM {
		t.Errorf("rows stand %v m apart on level ground, %v down and %v up to the sun", flat.RowPitchM, south.RowPitchM, north.RowPitchM)
	}
	if !(south.SolarKW > flat.SolarKW && flat.SolarKW > north.SolarKW) {
		t.Errorf("power %v, down %v, up %v", flat.SolarKW, south.SolarKW, north.SolarKW)
	}
}

// Points that tell nothing of snow do not silence those that do; grids take snow and temperatures from points beside
// them.
func TestLossesOfPointsThatTell(t *testing.T) {
	s := func(snow float64) *sunlight {
		return &sunlight{ghi: someGHI, temp: solar.EveryMonth(9), albedo: solar.EveryMonth(0.2), snow: solar.EveryMonth(snow), soiling: unsaid, source: "a"}
	}
	b := between([]sunPoint{{geo.XY{X: 1000}, s(0.04)}, {geo.XY{X: -1000}, s(math.NaN())}, {geo.XY{Y: 2000}, s(0.14)}}, geo.XY{})
	if got := b.snow[3]; math.Abs(got-0.06) > 1e-9 { // 4/5 of 0.04 and 1/5 of 0.14
		t.Errorf("snow takes %v", got)
	}
	if !math.IsNaN(b.soiling[3]) {
		t.Errorf("dirt takes %v, though nobody says so", b.soiling[3])
	}
}

// Under mornings in fog the best panels face west of the equator; a direction that is set stays.
func TestFoundDirection(t *testing.T) {
	const lat, lon = 48.0, 9.0
	in := solar.WeatherInput{LatDeg: lat, LonDeg: lon, Step: time.Hour, Albedo: solar.EveryMonth(0.2), WindFactor: 0.7}
	for at := time.Date(2025, 1, 1, 0, 0, 0, 0, time.UTC); at.Year() == 2025; at = at.Add(time.Hour) {
		a := sun.At(sun.JulianDay(at.Add(30 * time.Minute)))
		p := a.Seen(lat, lon, sun.StandardAir(0))
		share := 0.65
		if p.AzimuthDeg < 180 {
			share = 0.2
		}
		in.Rows = append(in.Rows, solar.WeatherRow{Start: at, GHI: share * sun.NormalWPerM2(a.DistanceAU) * math.Max(0, math.Sin(p.GeometricDeg*math.Pi/180)), DHI: math.NaN(), DNI: math.NaN(), TempC: 10, WindMS: 2})
	}
	c, _, err := solar.NewWeather(in)
	if err != nil {
		t.Fatal(err)
	}
	p := shipped(t).Solar.Plant(solar.Mount{TiltDeg: 30, AzimuthDeg: 180, GCR: 0.3, WidthM: 4})
	found := bestStand(c, p, true)
	if found.azimuthDeg < 200 || found.azimuthDeg > 180+mostTurnDeg {
		t.Errorf("found %+v", found)
	}
	yield := func(s stand) float64 {
		p.Mount.TiltDeg, p.Mount.AzimuthDeg = s.tiltDeg, s.azimuthDeg
		y, err := c.Yield(p)
		if err != nil {
			t.Fatal(err)
		}
		return y.SpecificYieldKWhPerKWp
	}
	for _, other := range []stand{{found.tiltDeg + 2, found.azimuthDeg}, {found.tiltDeg - 2, found.azimuthDeg}, {found.tiltDeg, 180}} {
		if yield(other) >= yield(found) {
			t.Errorf("%+v gives no less than %+v, which was found", other, found)
		}
	}
	if kept := bestStand(c, p, false); kept.azimuthDeg != p.Mount.AzimuthDeg {
		t.Errorf("a direction of %v that is set was turned to %v", p.Mount.AzimuthDeg, kept.azimuthDeg)
	}
}

// Months with more light than can fall at the place leave the sun unknown; they do not stop the study.
func TestTooMuchLightStopsNothing(t *testing.T) {
	p := sunStudy(t)
	for m := range 12 {
		p.set(fmt.Sprintf("solar.typed_temperature_%d_degc", m+1), "9", fmt.Sprintf("solar.typed_ghi_%d_kwh_per_m2", m+1), "400")
	}
	x := p.leaf(p.computed(nil), "solar_p50_mwh")
	if x.State != scoring.Unknown || !strings.Contains(x.Why, "is no sunlight for this latitude") {
		t.Errorf("%+v", x)
	}
}
