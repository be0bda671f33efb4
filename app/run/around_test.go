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
