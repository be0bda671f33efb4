package solar

import (
	"math"
	"os"
	"strings"
	"testing"

	"groundtally/assets/citedtable"
)

func TestDefaultsTable(t *testing.T) {
	d := defaults(t)
	if len(d.All()) != len(defaultNames) {
		t.Fatalf("%d defaults, want %d", len(d.All()), len(defaultNames))
	}
	for _, x := range d.All() {
		if got, ok := d.Get(x.Name); !ok || got != x {
			t.Errorf("%s: got %+v", x.Name, got)
		}
	}
	if _, ok := d.Get("no such name"); ok {
		t.Error("an unknown name was found")
	}
	inv := d.Inverter()
	if e := inv.EuropeanEfficiency(); e < 0.96 || e > 0.99 {
		t.Errorf("inverter of %v", e)
	}
	for _, m := range mounts() {
		p := d.Plant(m)
		if m.Kind != Elevated {
			if err := p.check(); err != nil {
				t.Errorf("%v: %v", m.Kind, err)
			}
		}
	}
}

func TestDefaultsRefuseBadTables(t *testing.T) {
	raw, err := os.ReadFile("../../assets/params/solar_defaults.csv")
	if err != nil {
		t.Fatal(err)
	}
	good := string(raw)
	lines := strings.Split(strings.TrimSpace(good), "\n")
	last := lines[len(lines)-1]
	for name, bad := range map[string]string{
		"missing":    strings.Replace(good, last, "", 1),
		"twice":      good + last + "\n",
		"unknown":    good + strings.Replace(last, "sigma_between_years", "sigma_of_luck", 1) + "\n",
		"unit":       strings.Replace(good, ",deg,", ",rad,", 1),
		"order":      strings.Replace(good, "tracker_max_angle_deg,50,55,60", "tracker_max_angle_deg,60,55,50", 1),
		"not number": strings.Replace(good, "tracker_max_angle_deg,50", "tracker_max_angle_deg,fifty", 1),
		"no column":  strings.Replace(good, "name,low,central", "name,least,central", 1),
	} {
		if bad == good {
			t.Fatalf("%s: the table was not changed", name)
		}
		tab, err := citedtable.Parse(name, strings.NewReader(bad))
		if err != nil {
			t.Fatalf("%s: %v", name, err)
		}
		if _, err := ParseDefaults(tab); err == nil {
			t.Errorf("%s: the table was accepted", name)
		}
	}
}

func TestSigmas(t *testing.T) {
	d := defaults(t)
	s, err := d.Sigmas(Doubt{Source: FromMap})
	if err != nil {
		t.Fatal(err)
	}
	// By hand: 6, 4, 1, 2, 1, 1.5, 1, 1, 1, 1 and 4 % between years.
	byHand := math.Sqrt(36+16+1+4+1+2.25+1+1+1+1+16) / 100
	if got := s.Total(1); math.Abs(got-byHand) > 1e-12 {
		t.Errorf("one year %v, by hand %v", got, byHand)
	}
	if long := s.Total(0); long >= s.Total(20) || s.Total(20) >= s.Total(1) {
		t.Errorf("long-term %v, 20 years %v, one year %v", long, s.Total(20), s.Total(1))
	}
	station, err := d.Sigmas(Doubt{Source: FromStation})
	if err != nil {
		t.Fatal(err)
	}
	if station.Total(1) >= s.Total(1) {
		t.Error("a station is no surer than a map")
	}
	// By hand: hours of a station, panels upright, a near horizon: 2.5, 3, 1, 2, 1, 1.5, 2, 1, 1, 1 and 4 %.
	hours, err := d.Sigmas(Doubt{Source: FromStation, Hourly: true, Steep: true, Hilly: true})
	if err != nil {
		t.Fatal(err)
	}
	if got, byHand := hours.Total(1), math.Sqrt(6.25+9+1+4+1+2.25+4+1+1+1+16)/100; math.Abs(got-byHand) > 1e-12 {
		t.Errorf("hours: one year %v, by hand %v", got, byHand)
	}
	shared, own := hours.Parts(20)
	if math.Abs(own-0.02) > 1e-15 || math.Abs(math.Hypot(shared, own)-hours.Total(20)) > 1e-15 {
		t.Errorf("shared %v and own %v of %v", shared, own, hours.Total(20))
	}
	if _, err := d.Sigmas(Doubt{Source: 9}); err == nil {
		t.Error("an unknown source was accepted")
	}
	if v, ok := ExceededWith(1000, 0.08, 0.5); !ok || v != 1000 {
		t.Errorf("P50 is %v", v)
	}
	for _, bad := range []float64{0, 1, -1, math.NaN()} {
		if _, ok := ExceededWith(1000, 0.08, bad); ok {
			t.Errorf("probability %v was accepted", bad)
		}
	}
}

func TestYearsOfDegradation(t *testing.T) {
	sum := 0.0
	for y := 1; y <= 25; y++ {
		sum += YearFactor(0.007, y)
	}
	if got := LifetimeMeanFactor(0.007, 25); math.Abs(got-sum/25) > 1e-12 {
		t.Errorf("%v, summed %v", got, sum/25)
	}
	if LifetimeMeanFactor(0, 25) != 1 || LifetimeMeanFactor(0.01, 0) != 1 {
		t.Error("no degradation, or no years, should give 1")
	}
}

func TestSplitsAreContinuous(t *testing.T) {
	for _, at := range []float64{0.22, 0.80} {
		if d := math.Abs(ErbsHourly(at+1e-9) - ErbsHourly(at-1e-9)); d > 5e-4 {
			t.Errorf("hourly jumps by %v at %v", d, at)
		}
	}
	for _, ws := range []float64{60, 100} {
		last := 1.0
		for K := 0.0; K <= 1; K += 0.01 {
			f := ErbsDaily(K, ws)
			if f > last+0.005 || f < 0.1 || f > 1 {
				t.Errorf("daily share %v at %v after %v", f, K, last)
			}
			last = f
		}
	}
}

func TestDayTypesKeepTheMean(t *testing.T) {
	for K := 0.05; K <= 0.80; K += 0.01 {
		k := DayClearness(K)
		sum := 0.0
		for i, v := range k {
			sum += v
			if v <= 0 || v > 0.9 || (i > 0 && v < k[i-1]) {
				t.Errorf("K %.2f: day types %v", K, k)
				break
			}
		}
		if math.Abs(sum/DayTypes-K) > 1e-12 {
			t.Errorf("K %.2f: mean %v", K, sum/DayTypes)
		}
	}
}

func TestTemperatureSwing(t *testing.T) {
	sum, low, high, lowAt, highAt := 0.0, 1e9, -1e9, 0, 0
	for h := 1; h <= 24; h++ {
		v := TemperatureSwing(float64(h), 0.5)
		sum += v
		if v < low {
			low, lowAt = v, h
		}
		if v > high {
			high, highAt = v, h
		}
	}
	amplitude := 25.8*0.5 - 5.21
	if math.Abs(sum) > 1e-3 || lowAt != 6 || highAt != 15 || math.Abs((high-low)/amplitude-0.976) > 0.001 {
		t.Errorf("sum %v, coldest at %d, warmest at %d, range %v", sum, lowAt, highAt, (high-low)/amplitude)
	}
}
