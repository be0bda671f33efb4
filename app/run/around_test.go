package run

import (
	"context"
	"math"
	"testing"

	"groundtally/geo/measure"
)

// What is drawn around a candidate has the area that was reckoned with, stored or computed anew.
func TestAroundHasTheBuildableArea(t *testing.T) {
	s := smallStudy(t, 60)
	cache := &Memory{}
	r := compute(t, s, cache, 2)
	snap, err := s.Snapshot()
	if err != nil {
		t.Fatal(err)
	}
	kept := 0
	for _, c := range []Cache{cache, nil} {
		sv := NewSurveyor(snap, shipped(t), StoreLoader(s.Store()), c)
		n := 0
		for i := range r.Candidates {
			cand := &r.Candidates[i]
			if cand.Status != Fitted || cand.Technology == "wind_solar" || i%3 != 0 {
				continue
			}
			a, err := sv.Around(context.Background(), cand)
			if err != nil {
				t.Fatal(err)
			}
			q, _ := cand.Consequence("buildable_area_ha")
			if got := measure.RoughAreaM2(a.Buildable) / 1e4; math.Abs(got-q.Central) > 0.01*q.Central+0.001 {
				t.Errorf("%s: %v ha are drawn, %v ha were reckoned", cand.ID(), got, q.Central)
			}
			kept += len(a.Kept)
			n++
		}
		if n < 5 {
			t.Fatalf("only %d candidates were looked at", n)
		}
	}
	if kept == 0 {
		t.Error("no distance is drawn")
	}
}

// The months of a solar plant add up to its yearly energy before the adjustments of the year; those of
// wind are unknown.
func TestMonthsAddUp(t *testing.T) {
	s := smallStudy(t, 60)
	r := compute(t, s, nil, 2)
	snap, err := s.Snapshot()
	if err != nil {
		t.Fatal(err)
	}
	sv := NewSurveyor(snap, shipped(t), StoreLoader(s.Store()), nil)
	solar, windy := 0, 0
	for i := range r.Candidates {
		c := &r.Candidates[i]
		if c.Status != Fitted || i%5 != 0 {
			continue
		}
		course, err := sv.Course(context.Background(), c)
		if err != nil {
			t.Fatal(err)
		}
		months := course.Months
		if c.Fit.WindKW > 0 {
			windy++
			if months[0].OK() || months[0].Why == "" {
				t.Errorf("%s: a month of wind is %+v", c.ID(), months[0])
			}
			continue
		}
		solar++
		sum := 0.0
		for m, v := range months {
			if !v.OK() || v.X <= 0 {
				t.Fatalf("%s: month %d is %+v", c.ID(), m+1, v)
			}
			sum += v.X
			hours := 0.0
			for _, mwh := range course.Hours[m] {
				hours += mwh
			}
			if math.Abs(hours-v.X) > 1e-9*v.X {
				t.Errorf("%s, month %d: hours add up to %v of %v", c.ID(), m+1, hours, v.X)
			}
		}
		want := 0.0
		for _, l := range c.Leaves() {
			if l.Name == "solar_p50_mwh" {
				want = l.X
			}
		}
		if math.Abs(sum-want) > 1e-9*want {
			t.Errorf("%s: the months add up to %v MWh, the year is %v", c.ID(), sum, want)
		}
	}
	if solar < 5 || windy < 2 {
		t.Fatalf("%d solar plants and %d with wind were looked at", solar, windy)
	}
}
