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
		parts := CrowdingParts(c)
		if (len(parts) == 2) != (c.Technology == "wind_solar") {
			t.Fatalf("%s: %v can be swept", c.ID(), parts)
		}
		var got *Crowded
		for _, part := range parts {
			if got, err = sv.Crowding(t.Context(), c, part); err != nil {
				t.Fatal(err)
			}
			if got.Part != part || (part == windPart) != (got.Swept == "spacing along the wind") && part != "" {
				t.Errorf("%s, %s: %+v", c.ID(), part, got)
			}
			if got.Why != "" {
				t.Log(c.ID(), part, got.Why)
				continue
			}
			seen[c.Technology+part]++
			inOrder(t, c, got)
		}
		if got.Why != "" {
			continue
		}
		seen[c.Technology]++
		eroi, _ := c.Consequence("eroi_extended")
		if c.Technology != "wind" && c.Technology != "wind_solar" && eroi.State == scoring.Number && math.Abs(got.Chosen.EROI/eroi.Central-1) > 1e-9 {
			t.Errorf("%s: %v at its own ground cover, the candidate %v", c.ID(), got.Chosen.EROI, eroi.Central)
		}
	}
	if seen["solar_fixed"] == 0 || seen["wind_solarsolar"] == 0 {
		t.Errorf("swept: %v", seen)
	}
}

// inOrder checks that a curve grows denser, and the proven order of its marks: the best return is no denser than the
// most net energy, that no denser than the most energy.
func inOrder(t *testing.T, c *Candidate, got *Crowded) {
	t.Helper()
	for n := 1; n < len(got.Points); n++ {
		if got.Points[n].KWPerHa <= got.Points[n-1].KWPerHa {
			t.Errorf("%s: %+v after %+v", c.ID(), got.Points[n], got.Points[n-1])
		}
	}
	if m := [3]float64{got.BestReturn.MWhPerHaYr, got.MostNet.MWhPerHaYr, got.MostEnergy.MWhPerHaYr}; m[0] > m[1]*(1+1e-9) || m[1] > m[2]*(1+1e-9) {
		t.Errorf("%s: best return at %v MWh/ha, net at %v, energy at %v", c.ID(), m[0], m[1], m[2])
	}
}
