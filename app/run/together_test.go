package run

import (
	"math"
	"testing"

	"groundtally/app/study"
	"groundtally/scoring"
)

// What wind and sun give hour by hour sums to the yields of the plant, and what is cut off to the share that the
// results take.
func TestTogetherKeepsTheYields(t *testing.T) {
	s := smallStudy(t, 60)
	if _, err := s.Set(t.Context(), "set", "", study.SettingEdit{Key: "grid.export_limit_kw", Value: "3000", Source: "test"}, study.SettingEdit{Key: "plant.wind_solar.fit", Value: "fill", Source: "test"}); err != nil {
		t.Fatal(err)
	}
	r := compute(t, s, nil, 2)
	seen, cut := 0, 0
	for i := range r.Candidates {
		c := &r.Candidates[i]
		if c.Technology != "wind_solar" {
			if c.Connection != nil && c.Connection.Together != nil {
				t.Errorf("%s has one part alone", c.ID())
			}
			continue
		}
		if c.Status != Fitted || c.Connection == nil {
			continue
		}
		seen++
		j := c.Connection.Together
		if j == nil {
			t.Fatalf("%s: the hours of the sample tell of both", c.ID())
		}
		of := map[string]Leaf{}
		for _, l := range c.Leaves() {
			of[l.Name] = l
		}
		// The file's year has its own gaps and the yield by hours its own rounding, no more.
		if math.Abs(j.WindMWh/of["wind_p50_mwh"].X-1) > 1e-4 || math.Abs(j.SolarMWh/of["solar_p50_mwh"].X-1) > 1e-4 {
			t.Errorf("%s: %v and %v MWh by hours, %v and %v by the year", c.ID(), j.WindMWh, j.SolarMWh, of["wind_p50_mwh"].X, of["solar_p50_mwh"].X)
		}
		if j.PeakKW > j.PeaksKW+1e-9 || j.SavedKW != j.PeaksKW-j.PeakKW || j.PeaksKW > c.Fit.ACKW*1.0001 {
			t.Errorf("%s: %+v of %v kW", c.ID(), j, c.Fit.ACKW)
		}
		if j.LosingKW > j.LosingEachKW+1e-9 || j.LosingKW > j.PeakKW || !(j.LosingKW > 0) {
			t.Errorf("%s: %+v", c.ID(), j)
		}
		for n, l := range j.Limits {
			if n > 1 && l.CurtailedMWh < j.Limits[n-1].CurtailedMWh || math.Abs(l.WindCutMWh+l.SolarCutMWh-l.CurtailedMWh) > 1e-6*(1+l.CurtailedMWh) {
				t.Errorf("%s: %+v", c.ID(), j.Limits)
			}
		}
		if l := of["curtailed_share"]; l.State == scoring.Number {
			if math.Abs(l.X-j.Limits[0].CurtailedMWh/(j.WindMWh+j.SolarMWh)) > 1e-12 {
				t.Errorf("%s: share %v, %+v", c.ID(), l.X, j.Limits[0])
			}
			if l.X > 0 {
				cut++
			}
		}
	}
	if seen < 3 || cut == 0 {
		t.Errorf("%d plants of wind and sun, %d of them limited", seen, cut)
	}
	// Without the hours nothing is told of them.
	if err := s.RemoveLayer(t.Context(), "Hourly year", ""); err != nil {
		t.Fatal(err)
	}
	for _, c := range compute(t, s, nil, 2).Candidates {
		if c.Connection != nil && c.Connection.Together != nil {
			t.Fatal("hours are told of that are not there")
		}
	}
}

func TestCrossing(t *testing.T) {
	cube := func(x float64) float64 { return x * x * x }
	if x, ok := crossing(cube, 2, 0.1, 3); !ok || math.Abs(x-math.Cbrt(2)) > 1e-6 {
		t.Errorf("%v, %v", x, ok)
	}
	if _, ok := crossing(cube, 100, 0.1, 3); ok {
		t.Error("a value that is not reached was found")
	}
	// Of a hill the first place counts.
	if x, ok := crossing(func(x float64) float64 { return math.Sin(x) }, 0.5, 0, 3); !ok || math.Abs(x-math.Pi/6) > 1e-6 {
		t.Errorf("%v, %v", x, ok)
	}
}

// Of one hour in a hundred at full power and the others at half, a hundredth of the energy is cut off by a limit
// known by hand.
func TestLosingAHundredth(t *testing.T) {
	kw := make([]float64, 1000)
	sum := 0.0
	for i := range kw {
		if kw[i] = 500; i%100 == 0 {
			kw[i] = 1000
		}
		sum += kw[i]
	}
	got, err := losing([][]float64{kw}, 1000, 1)
	if want := 500 - (losingFrac*sum-10*500)/1000; err != nil || math.Abs(got-want) > 1e-6 {
		t.Errorf("%v, by hand %v; %v", got, want, err)
	}
}
