package run

import (
	"math"
	"testing"

	"groundtally/scoring"
)

// The sweep computes each layout as any candidate: at the option's own value, filling the ground, it gives the candidate.
func TestCrowdingHoldsTheCandidate(t *testing.T) {
	s := smallStudy(t, 60)
	r := compute(t, s, nil, 2)
	snap, err := s.Snapshot()
	if err != nil {
		t.Fatal(err)
	}
	sv := NewSurveyor(snap, shipped(t), StoreLoader(s.Store()), nil)
	seen := map[string]int{}
	for i := range r.Candidates {
		c := &r.Candidates[i]
		if c.Status != Fitted || seen[c.Technology] >= 2 || c.Technology == "wind" && len(c.Fit.Turbines) < 1 {
			continue
		}
		got, err := sv.Crowding(t.Context(), c)
		if err != nil {
			t.Fatal(err)
		}
		if c.Technology == "wind_solar" {
			if got.Why == "" {
				t.Errorf("%s: a plant of both was swept", c.ID())
			}
			seen[c.Technology]++
			continue
		}
		if got.Why != "" {
			continue
		}
		seen[c.Technology]++
		for n := 1; n < len(got.Points); n++ {
			if got.Points[n].KWPerHa <= got.Points[n-1].KWPerHa {
				t.Errorf("%s: %+v after %+v", c.ID(), got.Points[n], got.Points[n-1])
			}
		}
		// Proven order: the best return is no denser than the most net energy, that no denser than the most energy.
		if m := [3]float64{got.BestReturn.MWhPerHaYr, got.MostNet.MWhPerHaYr, got.MostEnergy.MWhPerHaYr}; m[0] > m[1]*(1+1e-9) || m[1] > m[2]*(1+1e-9) {
			t.Errorf("%s: best return at %v MWh/ha, net at %v, energy at %v", c.ID(), m[0], m[1], m[2])
		}
		eroi, _ := c.Consequence("eroi_extended")
		if c.Technology != "wind" && eroi.State == scoring.Number && math.Abs(got.Chosen.EROI/eroi.Central-1) > 1e-9 {
			t.Errorf("%s: %v at its own ground cover, the candidate %v", c.ID(), got.Chosen.EROI, eroi.Central)
		}
	}
	if seen["solar_fixed"] == 0 || seen["wind_solar"] == 0 {
		t.Errorf("swept: %v", seen)
	}
}
