package sun

import (
	"encoding/csv"
	"math"
	"os"
	"strconv"
	"testing"
	"time"
)

func TestMirrorOfHemispheres(t *testing.T) {
	// The sky of the south is the sky of the north with the sign of declination and north turned.
	for _, lat := range []float64{0, 23, 51, 69} {
		for decl := -23.4; decl < 24; decl += 7.8 {
			for w := -180.0; w < 180; w += 15 {
				n, s := VectorAt(lat, decl, w), VectorAt(-lat, -decl, w)
				if d := math.Abs(n.X-s.X) + math.Abs(n.Y+s.Y) + math.Abs(n.Z-s.Z); d > 1e-14 {
					t.Fatalf("lat %v decl %v w %v: %v and %v", lat, decl, w, n, s)
				}
			}
		}
	}
}

func TestVectorsHaveUnitLength(t *testing.T) {
	for e := -90.0; e <= 90; e += 15 {
		for a := 0.0; a < 360; a += 20 {
			v := Direction(e, a)
			if math.Abs(v.Dot(v)-1) > 1e-14 || math.Abs(v.ElevationDeg()-e) > 1e-5 {
				t.Fatalf("elevation %v azimuth %v gives %v", e, a, v)
			}
			if math.Abs(e) < 90 && math.Abs(wrap180(v.AzimuthDeg()-a)) > 1e-9 {
				t.Fatalf("azimuth %v came back as %v", a, v.AzimuthDeg())
			}
		}
	}
}

func TestHoursAddUpToTheDay(t *testing.T) {
	for _, lat := range []float64{-72, -38, 0, 43, 66, 80, 90} {
		for _, decl := range []float64{-23.4, -10, 0, 10, 23.4} {
			sum := 0.0
			for w := -180.0; w < 180; w += 15 {
				sum += HourlyWhPerM2(1361.1, lat, decl, w, w+15)
			}
			if day := DailyWhPerM2(1361.1, lat, decl); math.Abs(sum-day) > 1e-9*(1+day) {
				t.Errorf("lat %v decl %v: hours give %v, day %v", lat, decl, sum, day)
			}
		}
	}
}

func TestDailyLightAgainstNumericalIntegral(t *testing.T) {
	const n = 20000
	for _, lat := range []float64{-55, 12, 43, 68} {
		sum := 0.0
		for i := range n {
			sum += math.Max(0, VectorAt(lat, 20, -180+360*(float64(i)+0.5)/n).Z) * 24 / n
		}
		if got := DailyWhPerM2(1000, lat, 20); math.Abs(got-1000*sum) > 1e-4*got {
			t.Errorf("lat %v: %v, integral %v", lat, got, 1000*sum)
		}
	}
}

func TestRiseIsWhereTheSunStandsOnTheHorizon(t *testing.T) {
	for _, lat := range []float64{-60, -20, 0, 35, 62} {
		for m := time.January; m <= time.December; m++ {
			ev := RiseSet(2025, m, 9, lat, -37)
			if ev.State != Rising || !ev.Rise.Before(ev.Noon) || !ev.Noon.Before(ev.Set) {
				t.Fatalf("lat %v month %v: %+v", lat, m, ev)
			}
			// The equation of time is taken at terrestrial time, 69 s late: 0.2 s, under 0.001 degrees.
			for _, at := range []time.Time{ev.Rise, ev.Set} {
				if e := Where(at, lat, -37, StandardAir(0)).GeometricDeg; math.Abs(e-riseElevationDeg) > 1e-3 {
					t.Errorf("lat %v month %v: elevation %v at the event", lat, m, e)
				}
			}
		}
	}
}

func TestMomentReturnsWhatWasGiven(t *testing.T) {
	want := time.Date(2026, 2, 28, 23, 59, 59, 0, time.UTC)
	if got := Moment(JulianDay(want)); !got.Equal(want) {
		t.Fatalf("got %v, want %v", got, want)
	}
}

func TestMonthMeanMeetsTheLightOfTheMonth(t *testing.T) {
	for m := time.January; m <= time.December; m++ {
		for lat, tol := range map[float64]float64{43: 0.002, 60: 0.0111, -43: 0.002} {
			decl, normal, want := MonthMean(lat, 0, m)
			if got := DailyWhPerM2(normal, lat, decl); math.Abs(got/want-1) > tol {
				t.Errorf("month %v lat %v: %v, month's mean %v", m, lat, got, want)
			}
		}
	}
}

func TestPolesStayFinite(t *testing.T) {
	for _, lat := range []float64{-90, 90} {
		for m := time.January; m <= time.December; m++ {
			h := MonthMeanDailyWhPerM2(lat, 0, m)
			if math.IsNaN(h) || h < 0 {
				t.Errorf("lat %v month %v: %v", lat, m, h)
			}
		}
	}
	if MonthMeanDailyWhPerM2(90, 0, time.December) != 0 {
		t.Error("the north pole has light in December")
	}
}

func BenchmarkWhere(b *testing.B) {
	at := time.Date(2026, 6, 21, 9, 0, 0, 0, time.UTC)
	air := StandardAir(0)
	for b.Loop() {
		Where(at, 47, -27, air)
	}
}

func BenchmarkMonthMeanDaily(b *testing.B) {
	for b.Loop() {
		MonthMeanDailyWhPerM2(47, -27, time.June)
	}
}

// Against a general astronomy library at 400 instants and places of 2000 to 2049; how the table was made stands in
// testdata/check/tools/sun_reference.mjs.
func TestAgainstAstronomyLibrary(t *testing.T) {
	f, err := os.Open("../../testdata/check/sun_positions.csv")
	if err != nil {
		t.Fatal(err)
	}
	defer func() { _ = f.Close() }() // only read
	r := csv.NewReader(f)
	r.Comment = '#'
	rows, err := r.ReadAll()
	if err != nil || len(rows) != 401 {
		t.Fatalf("%d rows, %v", len(rows), err)
	}
	worst := map[string]float64{}
	for _, row := range rows[1:] {
		at, err := time.Parse(time.RFC3339, row[0])
		if err != nil {
			t.Fatal(err)
		}
		var x [7]float64
		for i := range x {
			if x[i], err = strconv.ParseFloat(row[i+1], 64); err != nil {
				t.Fatal(err)
			}
		}
		lat, lon, ra, decl, elevation, azimuth, au := x[0], x[1], x[2], x[3], x[4], x[5], x[6]
		a := At(JulianDay(at))
		p := a.Seen(lat, lon, Air{PressureHPa: 1013, TempC: 15})
		for what, d := range map[string]float64{
			"right ascension": wrap180(a.RightAscensionDeg-ra) * cosd(decl),
			"declination":     a.DeclinationDeg - decl,
			"elevation":       p.TopocentricDeg - elevation,
			"azimuth":         wrap180(p.AzimuthDeg-azimuth) * cosd(elevation),
			"distance":        (a.DistanceAU - au) * 100, // to 0.0001 astronomical units
		} {
			worst[what] = math.Max(worst[what], math.Abs(d))
			if math.Abs(d) > 0.01 {
				t.Errorf("%s at %v, %v: %s differs by %.4f degrees", row[0], lat, lon, what, d)
			}
		}
	}
	t.Logf("at most %v", worst)
}
