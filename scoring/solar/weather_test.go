package solar

import (
	"errors"
	"math"
	"testing"
	"time"

	"groundtally/scoring/sun"
	"groundtally/scoring/units"
)

var unknown = math.NaN()

// rows gives hours of a year whose light is a share of that above the atmosphere at the middle of ten-minute
// pieces; f gives the share.
func rows(latDeg, lonDeg float64, year int, f func(t time.Time) float64) []WeatherRow {
	var out []WeatherRow
	air := sun.StandardAir(0)
	for at := time.Date(year, 1, 1, 0, 0, 0, 0, time.UTC); at.Year() == year; at = at.Add(time.Hour) {
		ghi := 0.0
		for k := range 6 {
			t := at.Add(time.Duration(k)*10*time.Minute + 5*time.Minute)
			a := sun.At(sun.JulianDay(t))
			ghi += max(0, sind(a.Seen(latDeg, lonDeg, air).GeometricDeg)) * sun.NormalWPerM2(a.DistanceAU) / 6
		}
		out = append(out, WeatherRow{Start: at, GHI: ghi * f(at), DHI: unknown, DNI: unknown, TempC: 10, WindMS: unknown})
	}
	return out
}

func even(share float64) func(time.Time) float64 { return func(time.Time) float64 { return share } }

func weatherOf(lat float64, rs []WeatherRow) WeatherInput {
	return WeatherInput{LatDeg: lat, Step: time.Hour, Rows: rs, Albedo: EveryMonth(0.2), WindFactor: 1}
}

func mustWeather(t testing.TB, in WeatherInput) (*Climate, WeatherReport) {
	t.Helper()
	c, r, err := NewWeather(in)
	if err != nil {
		t.Fatal(err)
	}
	return c, r
}

func sumOf(a [12]float64) (s float64) {
	for _, x := range a {
		s += x
	}
	return s
}

// The light of the file is the light of the climate, and a level plane without glass, rows, ground has it all.
func TestWeatherKeepsTheLight(t *testing.T) {
	for _, lat := range []float64{-38, 0, 43, 69, 89} {
		rs := rows(lat, 0, 2025, even(0.55))
		want := 0.0
		for _, r := range rs {
			want += r.GHI / units.WPerKW
		}
		c, rep := mustWeather(t, weatherOf(lat, rs))
		if got := sumOf(c.GHIKWhPerM2()); math.Abs(got-want) > 1e-9*want || rep.Years != 1 || rep.Missing != 0 || rep.Typical {
			t.Errorf("latitude %v: %v kWh/m2, want %v; %+v", lat, got, want, rep)
		}
		// Against the light above the atmosphere by another way: 0.55 of the sum over days.
		extra := 0.0
		for m := time.January; m <= time.December; m++ {
			extra += sun.MonthMeanDailyWhPerM2(lat, 0, m) * float64(sun.DaysInMonth(m)) / units.WPerKW
		}
		if math.Abs(want/extra/0.55-1) > 2e-3 {
			t.Errorf("latitude %v: %v kWh/m2, %v above the atmosphere", lat, want, extra)
		}
		p := defaultPlant(Mount{})
		p.Sky = Isotropic
		r, err := c.Yield(p)
		if err != nil {
			t.Fatal(err)
		}
		if math.Abs(r.PlaneKWhPerM2/want-1) > 3e-3 { // refraction lifts the beam
			t.Errorf("latitude %v: the level plane gets %v of %v", lat, r.PlaneKWhPerM2, want)
		}
		hours := 0.0
		for m := range r.HourKWhPerKWp {
			for _, kwh := range r.HourKWhPerKWp[m] {
				hours += kwh
			}
		}
		if math.Abs(hours-r.SpecificYieldKWhPerKWp) > 1e-9*hours {
			t.Errorf("hours add up to %v of %v", hours, r.SpecificYieldKWhPerKWp)
		}
	}
}

// Hours put together by the published laws of days and hours, parted by Erbs, fall on the plane as in another
// engine over the same monthly sums: 1662.9 kWh/m2, diffuse share 0.453 (Madison of Duffie and Beckman 2013, table
// 2.19.1; tilt 35, no rows, Hay-Davies, ten day types, hourly shares not brought to the daily ones).
func TestWeatherAgainstAnotherEngine(t *testing.T) {
	in := madison()
	var rs []WeatherRow
	for m := range 12 {
		month := time.Month(m + 1)
		decl, _, extra := sun.MonthMean(in.LatDeg, in.LonDeg, month)
		n := sun.DaysInMonth(month)
		K := DayClearness(in.GHIKWhPerM2[m] * units.WPerKW / float64(n) / extra)
		ws := sun.SunsetHourAngleDeg(in.LatDeg, decl)
		sum := 0.0
		for h := range 24 {
			sum += HourShare(float64(h)*15-172.5, ws)
		}
		typed := 0.0
		for d := range n {
			typed += K[d%DayTypes] / float64(n)
		}
		scale := in.GHIKWhPerM2[m] * units.WPerKW / float64(n) / extra / typed
		for d := range n {
			for h := range 24 {
				r := WeatherRow{Start: time.Date(2025, month, d+1, h, 0, 0, 0, time.UTC), DHI: unknown, DNI: unknown, TempC: 10, WindMS: unknown}
				r.GHI = K[d%DayTypes] * scale * extra * HourShare(float64(h)*15-172.5, ws) / sum
				rs = append(rs, r)
			}
		}
	}
	w := weatherOf(in.LatDeg, rs) // at longitude 0, so that the clock is nearly solar time
	w.Albedo = in.Albedo
	c, _ := mustWeather(t, w)
	if got, want := sumOf(c.GHIKWhPerM2()), sumOf(in.GHIKWhPerM2); math.Abs(got/want-1) > 2e-3 {
		t.Errorf("%v kWh/m2 on the horizontal, want %v", got, want)
	}
	r, err := c.Yield(defaultPlant(Mount{TiltDeg: 35, AzimuthDeg: 180}))
	if err != nil {
		t.Fatal(err)
	}
	t.Logf("plane %.1f, diffuse %.3f", r.PlaneKWhPerM2, r.DiffuseShare)
	if math.Abs(r.PlaneKWhPerM2/1662.9-1) > 0.01 || math.Abs(r.DiffuseShare-0.453) > 0.012 {
		t.Errorf("plane %.1f, diffuse share %.3f", r.PlaneKWhPerM2, r.DiffuseShare)
	}
}

func TestWeatherOfSeveralYears(t *testing.T) {
	var rs []WeatherRow
	for y := 2023; y <= 2025; y++ { // 2024 has a leap day
		rs = append(rs, rows(48, 10, y, even(0.5))...)
	}
	in := weatherOf(48, rs)
	in.LonDeg = 10
	c, rep := mustWeather(t, in)
	if rep.Years != 3 || rep.LeapDropped != 24 || rep.Missing != 0 || rep.Typical {
		t.Errorf("%+v", rep)
	}
	one := weatherOf(48, rows(48, 10, 2025, even(0.5)))
	one.LonDeg = 10
	d, _ := mustWeather(t, one)
	if a, b := sumOf(c.GHIKWhPerM2()), sumOf(d.GHIKWhPerM2()); math.Abs(a/b-1) > 1e-3 {
		t.Errorf("the mean of three equal years is %v, of one %v", a, b)
	}
	// A leap year of its own, and one that begins at local midnight west of Greenwich.
	if _, rep := mustWeather(t, weatherOf(48, rows(48, 0, 2024, even(0.5)))); rep.Years != 1 || rep.LeapDropped != 24 || rep.Missing != 0 {
		t.Errorf("leap year: %+v", rep)
	}
	late := rows(48, -90, 2025, even(0.5))
	for i := range late {
		late[i].Start = late[i].Start.Add(6 * time.Hour)
	}
	if _, rep := mustWeather(t, weatherOf(48, late)); rep.Years != 1 || rep.Missing != 0 || rep.Twice != 0 {
		t.Errorf("year from 6 h UTC: %+v", rep)
	}
	// Months of different years.
	var mixed []WeatherRow
	for m := 1; m <= 12; m++ {
		for _, r := range rows(48, 0, 2004+m*7%10, even(0.5)) {
			if int(r.Start.Month()) == m {
				mixed = append(mixed, r)
			}
		}
	}
	e, rep := mustWeather(t, weatherOf(48, mixed))
	if !rep.Typical || rep.Years != 1 || rep.Missing != 0 {
		t.Errorf("typical year: %+v", rep)
	}
	if a, b := sumOf(e.GHIKWhPerM2()), sumOf(d.GHIKWhPerM2()); math.Abs(a/b-1) > 2e-3 {
		t.Errorf("a typical year has %v, a year %v", a, b)
	}
}

func TestWeatherGaps(t *testing.T) {
	rs := rows(48, 0, 2025, even(0.5))
	full, _ := mustWeather(t, weatherOf(48, rs))
	gone := append([]WeatherRow(nil), rs...)
	cut := func(day, hour, n int) {
		for i := range n {
			gone[day*24+hour+i].GHI = unknown
		}
	}
	cut(100, 11, 3)
	cut(200, 6, 30)
	c, rep := mustWeather(t, weatherOf(48, gone))
	if rep.Missing != 33 || rep.FilledShort != 3 || rep.FilledLong != 30 {
		t.Errorf("%+v", rep)
	}
	// Of a sky of even clearness nothing is lost: what is filled keeps it.
	if a, b := sumOf(c.GHIKWhPerM2()), sumOf(full.GHIKWhPerM2()); math.Abs(a/b-1) > 1e-9 {
		t.Errorf("filled %v, whole %v", a, b)
	}
	// Rows that are not there at all are missing just so.
	short := append(append([]WeatherRow(nil), rs[:2000]...), rs[2050:]...)
	if _, rep := mustWeather(t, weatherOf(48, short)); rep.Missing != 50 || rep.FilledLong != 50 {
		t.Errorf("%+v", rep)
	}
	cut(10, 0, 8760*11/100)
	var e *InputError
	if _, _, err := NewWeather(weatherOf(48, gone)); !errors.As(err, &e) {
		t.Errorf("with a tenth and more missing: %v", err)
	}
	for name, bad := range map[string][]WeatherRow{"none": nil, "half a year": rs[:4380], "half more": append(append([]WeatherRow(nil), rs...), rows(48, 0, 2026, even(0.5))[:4380]...)} {
		if _, _, err := NewWeather(weatherOf(48, bad)); !errors.As(err, &e) {
			t.Errorf("%s: %v", name, err)
		}
	}
}

func TestWeatherTests(t *testing.T) {
	change := func(f func(rs []WeatherRow)) WeatherReport {
		rs := rows(40, 0, 2025, even(0.5))
		f(rs)
		_, rep := mustWeather(t, weatherOf(40, rs))
		return rep
	}
	noon := 180*24 + 12
	if r := change(func(rs []WeatherRow) { rs[noon].GHI = 2200 }); r.TooBright != 1 {
		t.Errorf("too bright: %+v", r)
	}
	if r := change(func(rs []WeatherRow) { rs[180*24].GHI = 20 }); r.AtNight != 1 {
		t.Errorf("light at night: %+v", r)
	}
	if r := change(func(rs []WeatherRow) { rs[3].GHI = -2 }); r.Negative != 1 {
		t.Errorf("below zero: %+v", r)
	}
	if r := change(func(rs []WeatherRow) { rs[5].Start = rs[4].Start }); r.Twice != 1 || r.Missing != 1 {
		t.Errorf("twice: %+v", r)
	}
	agree := func(rs []WeatherRow) {
		rs[noon].DHI, rs[noon].DNI = 200, 0
		rs[noon].GHI = 200
	}
	base := change(agree)
	if base.NotClosing != 0 {
		t.Errorf("lights that agree: %+v", base)
	}
	if r := change(func(rs []WeatherRow) { agree(rs); rs[noon].DNI = 500 }); r.NotClosing != 1 || r.Parted != base.Parted+1 {
		t.Errorf("lights that do not: %+v", r)
	}
	// Two of three give the third.
	rs := rows(40, 0, 2025, even(0.5))
	for i := range rs {
		rs[i].DHI = 0.3 * rs[i].GHI
	}
	a, _ := mustWeather(t, weatherOf(40, rs))
	if share := sumOf(a.DHIKWhPerM2()) / sumOf(a.GHIKWhPerM2()); math.Abs(share-0.3) > 0.01 {
		t.Errorf("diffuse light as given: share %v", share)
	}
	sum := sumOf(a.GHIKWhPerM2())
	for i := range rs { // beam and diffuse light alone
		s := 0.0
		for k := range 6 {
			p := sun.Where(rs[i].Start.Add(time.Duration(k)*10*time.Minute+5*time.Minute), 40, 0, sun.StandardAir(0))
			s += max(0, sind(p.GeometricDeg)) / 6
		}
		if s > 0 {
			rs[i].DNI = (rs[i].GHI - rs[i].DHI) / s
		} else {
			rs[i].DNI = 0
		}
		rs[i].GHI = unknown
	}
	b, _ := mustWeather(t, weatherOf(40, rs))
	if got := sumOf(b.GHIKWhPerM2()); math.Abs(got/sum-1) > 1e-6 {
		t.Errorf("beam and diffuse light add up to %v of %v", got, sum)
	}
}

// Times that are wrong by an hour or a half are found out on clear days.
func TestWeatherShift(t *testing.T) {
	for _, shift := range []int{-60, -30, 0, 30, 60} {
		clear := func(at time.Time) float64 { return 0.35 + 0.4*float64(at.YearDay()*7%10)/10 }
		rs := rows(44, 8, 2025, clear)
		for i := range rs {
			rs[i].Start = rs[i].Start.Add(time.Duration(shift) * time.Minute)
		}
		in := weatherOf(44, rs)
		in.LonDeg = 8
		if shift%60 != 0 {
			in.Step = 30 * time.Minute
			var halves []WeatherRow
			for _, r := range rs {
				halves = append(halves, r)
				r.Start = r.Start.Add(30 * time.Minute)
				halves = append(halves, r)
			}
			in.Rows = halves
		}
		_, rep := mustWeather(t, in)
		if !rep.ShiftKnown || math.Abs(float64(rep.ShiftMin+shift)) > 5 {
			t.Errorf("moved by %d min: the times fit best moved by %d, known %v", shift, rep.ShiftMin, rep.ShiftKnown)
		}
	}
}

func TestWeatherRefuses(t *testing.T) {
	good := weatherOf(48, rows(48, 0, 2025, even(0.5)))
	var e *InputError
	for name, f := range map[string]func(in *WeatherInput){
		"latitude": func(in *WeatherInput) { in.LatDeg = 91 },
		"step":     func(in *WeatherInput) { in.Step = 7 * time.Minute },
		"no step":  func(in *WeatherInput) { in.Step = 0 },
		"albedo":   func(in *WeatherInput) { in.Albedo[3] = 2 },
		"split":    func(in *WeatherInput) { in.Split = 9 },
		"wind":     func(in *WeatherInput) { in.WindFactor = unknown },
	} {
		in := good
		f(&in)
		if _, _, err := NewWeather(in); !errors.As(err, &e) {
			t.Errorf("%s: %v", name, err)
		}
	}
}

// In no place does an hour give more than it can: polar night and midnight sun, both hemispheres, the equator,
// the antimeridian.
func TestWeatherEverywhere(t *testing.T) {
	for _, lat := range []float64{-90, -70, -33, 0, 51, 78} {
		for _, lon := range []float64{-180, 0, 179.9} {
			in := weatherOf(lat, rows(lat, lon, 2025, even(0.6)))
			in.LonDeg = lon
			c, _ := mustWeather(t, in)
			for _, p := range plants(t) {
				r, err := c.Yield(p)
				if err != nil {
					t.Fatal(err)
				}
				if y := r.SpecificYieldKWhPerKWp; !(y >= 0 && y < 4000) || r.PlaneKWhPerM2 < 0 {
					t.Errorf("latitude %v, %v: yield %v", lat, p.Mount.Kind, y)
				}
				at := r.PlaneKWhPerM2
				for _, s := range r.Chain {
					if s.BeforeKWhPerKWp != at {
						t.Fatalf("the chain breaks at %s", s.Name)
					}
					at = s.AfterKWhPerKWp
				}
				if at != r.SpecificYieldKWhPerKWp {
					t.Errorf("the chain ends at %v, the yield is %v", at, r.SpecificYieldKWhPerKWp)
				}
			}
		}
	}
}

// Mirrored to the south half a year later, a plant gives the same but for the orbit.
func TestWeatherMirror(t *testing.T) {
	north := rows(45, 0, 2025, even(0.5))
	south := rows(-45, 0, 2025, even(0.5))
	c, _ := mustWeather(t, weatherOf(45, north))
	d, _ := mustWeather(t, weatherOf(-45, south))
	p := defaultPlant(Mount{TiltDeg: 35, AzimuthDeg: 180, GCR: 0.4})
	a, err := c.Yield(p)
	if err != nil {
		t.Fatal(err)
	}
	p.Mount.AzimuthDeg = 0
	b, err := d.Yield(p)
	if err != nil {
		t.Fatal(err)
	}
	if math.Abs(a.SpecificYieldKWhPerKWp/b.SpecificYieldKWhPerKWp-1) > 0.006 {
		t.Errorf("north %v, south %v", a.SpecificYieldKWhPerKWp, b.SpecificYieldKWhPerKWp)
	}
}

func benchmarkHours(b *testing.B, m Mount, h *Horizon) {
	c, _ := mustWeather(b, weatherOf(45, rows(45, 0, 2025, even(0.5))))
	p := defaultPlant(m)
	p.Mount.Horizon = h
	b.ReportAllocs()
	for b.Loop() {
		if _, err := c.Yield(p); err != nil {
			b.Fatal(err)
		}
	}
}

func BenchmarkHoursFixed(b *testing.B)    { benchmarkHours(b, mounts()[0], nil) }
func BenchmarkHoursHorizon(b *testing.B)  { benchmarkHours(b, mounts()[0], ring(5)) }
func BenchmarkHoursTracking(b *testing.B) { benchmarkHours(b, mounts()[2], nil) }
func BenchmarkHoursVertical(b *testing.B) { benchmarkHours(b, mounts()[4], nil) }

func BenchmarkNewWeather(b *testing.B) {
	in := weatherOf(45, rows(45, 0, 2025, even(0.5)))
	for b.Loop() {
		if _, _, err := NewWeather(in); err != nil {
			b.Fatal(err)
		}
	}
}
