package solar

import (
	"errors"
	"math"
	"slices"
	"testing"
	"time"
)

// changing gives a clear share of light that differs from day to day.
func changing(t time.Time) float64 { return 0.25 + 0.5*float64(t.YearDay()*7%10)/10 }

// typicalRows are months of different years.
func typicalRows(lat float64) []WeatherRow {
	var out []WeatherRow
	for m := 1; m <= 12; m++ {
		for _, r := range rows(lat, 0, 2004+m*7%10, changing) {
			if int(r.Start.Month()) == m {
				out = append(out, r)
			}
		}
	}
	return out
}

func series(tb testing.TB, c *Climate, p Plant) (*Hours, []float64) {
	tb.Helper()
	h, err := c.Hours()
	if err != nil {
		tb.Fatal(err)
	}
	kw, err := c.PowerSeries(p)
	if err != nil {
		tb.Fatal(err)
	}
	if h.Len() != len(kw) {
		tb.Fatalf("%d values for %d hours", len(kw), h.Len())
	}
	return h, kw
}

// The hours add up to the year of Yield and to its months: derived, an identity.
func TestPowerSeriesAddsUp(t *testing.T) {
	var three, gone, halves []WeatherRow
	for y := 2023; y <= 2025; y++ {
		three = append(three, rows(48, 0, y, changing)...)
	}
	gone = append(append(gone, three[:2000]...), three[2050:8760]...)
	gone[100*24+11].GHI = unknown
	for _, r := range rows(40, 0, 2025, changing) {
		halves = append(halves, r)
		r.Start = r.Start.Add(30 * time.Minute)
		halves = append(halves, r)
	}
	half := weatherOf(40, halves)
	half.Step = 30 * time.Minute
	west := weatherOf(48, three)
	west.ClockOffset = -9 * time.Hour
	for name, in := range map[string]WeatherInput{
		"south": weatherOf(-38, rows(-38, 0, 2025, even(0.55))), "equator": weatherOf(0, rows(0, 0, 2025, even(0.55))), "north": weatherOf(43, rows(43, 0, 2025, even(0.55))),
		"polar": weatherOf(69, rows(69, 0, 2025, even(0.55))), "pole": weatherOf(89, rows(89, 0, 2025, even(0.55))), "leap": weatherOf(48, rows(48, 0, 2024, changing)),
		"three years": weatherOf(48, three), "gaps": weatherOf(48, gone), "typical": weatherOf(48, typicalRows(48)), "halves": half, "clock": west,
	} {
		c, rep := mustWeather(t, in)
		for _, p := range plants(t) {
			for m := range 12 {
				p.Losses.SoilingFrac[m], p.Losses.SnowFrac[m] = 0.01*float64(m), 0.2-0.015*float64(m)
			}
			p.Losses.CurtailmentFrac, p.Losses.AvailabilityFrac = 0.03, 0.02
			want, err := c.Yield(p)
			if err != nil {
				t.Fatal(err)
			}
			h, kw := series(t, c, p)
			if h.Years() != rep.Years || h.Step() != in.Step {
				t.Fatalf("%s: %d years in steps of %v", name, h.Years(), h.Step())
			}
			most := p.Losses.behindInverter() / p.Inverter.DCACRatio
			var months [12]float64
			sum := 0.0
			for i, v := range kw {
				if !(v >= 0 && v <= most) {
					t.Fatalf("%s: hour %d gives %v of %v", name, i, v, most)
				}
				kwh := v * h.Step().Hours() / float64(h.Years())
				sum += kwh
				months[h.At(i).Start.Add(in.ClockOffset).Month()-1] += kwh
			}
			if y := want.SpecificYieldKWhPerKWp; math.Abs(sum-y) > 1e-9*y {
				t.Errorf("%s, %v: hours give %v, the year %v", name, p.Mount.Kind, sum, y)
			}
			for m, kwh := range want.MonthKWhPerKWp {
				if math.Abs(months[m]-kwh) > 1e-9*want.SpecificYieldKWhPerKWp {
					t.Errorf("%s, %v: month %d has %v of %v", name, p.Mount.Kind, m+1, months[m], kwh)
				}
			}
		}
	}
}

// Each value stands at the hour of its row, in whatever order the rows are, and there is power just where there is light.
func TestPowerSeriesKnowsItsHours(t *testing.T) {
	var two []WeatherRow
	for y := 2024; y <= 2025; y++ {
		two = append(two, rows(45, 0, y, changing)...)
	}
	late := two[8784-18:][:8760] // a year that begins on 31 December
	backwards := append([]WeatherRow(nil), two...)
	slices.Reverse(backwards)
	over := append([]WeatherRow(nil), two[10:]...) // lacks the first hours, has some after the last
	for i := range 5 {
		r := two[i]
		r.Start = time.Date(2026, 1, 1, i, 0, 0, 0, time.UTC)
		over = append(over, r)
	}
	for name, rs := range map[string][]WeatherRow{"two years": two, "backwards": backwards, "from December": late, "typical": typicalRows(45), "over the end": over} {
		c, rep := mustWeather(t, weatherOf(45, rs))
		p := defaultPlant(Mount{TiltDeg: 20, AzimuthDeg: 180})
		h, kw := series(t, c, p)
		seen := map[int]bool{}
		none := 0
		for i := range kw {
			at := h.At(i)
			if at.Start.Month() == time.February && at.Start.Day() == 29 {
				t.Fatalf("%s: hour %d is of 29 February", name, i)
			}
			if at.Row < 0 {
				none++
				if !at.Filled {
					t.Fatalf("%s: hour %d has no row and was not filled", name, i)
				}
				continue
			}
			if seen[at.Row] || at.Filled {
				t.Fatalf("%s: row %d stands twice, or was filled", name, at.Row)
			}
			seen[at.Row] = true
			if r := rs[at.Row]; !r.Start.Equal(at.Start) {
				t.Fatalf("%s: hour %d is %v, its row %v", name, i, at.Start, r.Start)
			} else if r.GHI <= 0 && kw[i] > 0 || r.GHI > 50 && kw[i] <= 0 {
				t.Fatalf("%s: %v W/m2 give %v kW", name, r.GHI, kw[i])
			}
			if i > 0 && name != "typical" && name != "over the end" && !at.Start.After(h.At(i-1).Start) {
				t.Fatalf("%s: hour %d is not after the one before", name, i)
			}
		}
		if none != rep.Missing || len(seen) != len(rs)-rep.LeapDropped {
			t.Errorf("%s: %d hours without a row, %d missing; %d rows of %d", name, none, rep.Missing, len(seen), len(rs))
		}
	}
}

func TestPowerSeriesMarksWhatWasFilled(t *testing.T) {
	rs := rows(48, 0, 2025, even(0.5))
	rs[100*24+11].TempC = unknown
	rs = append(rs[:2000], rs[2004:]...)
	c, rep := mustWeather(t, weatherOf(48, rs))
	h, _ := series(t, c, defaultPlant(Mount{}))
	filled := 0
	for i := range h.Len() {
		if at := h.At(i); at.Filled {
			filled++
			if (at.Row < 0) != (i >= 2000 && i < 2004) {
				t.Errorf("hour %d has row %d", i, at.Row)
			}
		}
	}
	if filled != rep.Missing || filled != 5 {
		t.Errorf("%d filled, %d missing", filled, rep.Missing)
	}
	// A typical year keeps the year of the month for an hour that it lacks.
	typical := typicalRows(48)
	gap := typical[3000]
	typical = append(typical[:3000], typical[3001:]...)
	c, _ = mustWeather(t, weatherOf(48, typical))
	h, _ = series(t, c, defaultPlant(Mount{}))
	found := false
	for i := range h.Len() {
		if at := h.At(i); at.Row < 0 {
			found = at.Start.Equal(gap.Start)
		}
	}
	if !found {
		t.Errorf("the hour %v that the file lacks is not told", gap.Start)
	}
}

// Where the inverters are small, bright hours give their rating less what is lost behind them.
func TestPowerSeriesStopsAtTheInverter(t *testing.T) {
	c, _ := mustWeather(t, weatherOf(30, rows(30, 0, 2025, even(0.7))))
	p := defaultPlant(Mount{TiltDeg: 25, AzimuthDeg: 180})
	p.Inverter.DCACRatio = 4
	p.Losses.SnowFrac, p.Losses.AvailabilityFrac, p.Losses.CurtailmentFrac = [12]float64{}, 0, 0
	_, kw := series(t, c, p)
	want := 0.25 * (1 - p.Losses.ACWiringFrac) * (1 - p.Losses.TransformerFrac) * (1 - p.Losses.AuxiliaryFrac)
	if got := slices.Max(kw); math.Abs(got-want) > 1e-15 {
		t.Errorf("at most %v kW, want %v", got, want)
	}
}

func TestPowerSeriesNeedsHours(t *testing.T) {
	months, err := NewClimate(madison())
	if err != nil {
		t.Fatal(err)
	}
	if kw, err := months.PowerSeries(defaultPlant(Mount{})); !errors.Is(err, ErrNoHours) || kw != nil {
		t.Errorf("power of months: %v, %v", len(kw), err)
	}
	if h, err := months.Hours(); !errors.Is(err, ErrNoHours) || h != nil {
		t.Errorf("hours of months: %v, %v", h, err)
	}
	c, _ := mustWeather(t, weatherOf(48, rows(48, 0, 2025, even(0.5))))
	p := defaultPlant(Mount{})
	p.Inverter.DCACRatio = 0
	var e *InputError
	if _, err := c.PowerSeries(p); !errors.As(err, &e) {
		t.Errorf("an inverter without size: %v", err)
	}
}

func BenchmarkPowerSeries(b *testing.B) {
	c, _ := mustWeather(b, weatherOf(45, rows(45, 0, 2025, even(0.5))))
	p := defaultPlant(mounts()[0])
	b.ReportAllocs()
	for b.Loop() {
		if _, err := c.PowerSeries(p); err != nil {
			b.Fatal(err)
		}
	}
}
