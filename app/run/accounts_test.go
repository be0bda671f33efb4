package run

import (
	"fmt"
	"math"
	"testing"

	"groundtally/app/study"
	"groundtally/scoring"
)

// accountsOf computes a study and prepares its accounts.
func accountsOf(t *testing.T, s *study.Study) (*Results, *Accounts) {
	t.Helper()
	snap, err := s.Snapshot()
	if err != nil {
		t.Fatal(err)
	}
	a, err := NewAccounts(shipped(t), snap)
	if err != nil {
		t.Fatal(err)
	}
	return compute(t, s, nil, 2), a
}

func TestAccountsOfACandidate(t *testing.T) {
	s := smallStudy(t, 120)
	if _, err := s.Set(t.Context(), "set", "", study.SettingEdit{Key: "climate.grid_factor_g_per_kwh", Value: "300", Source: "test"},
		study.SettingEdit{Key: "climate.grid_factor_marginal_g_per_kwh", Value: "600", Source: "test"}); err != nil {
		t.Fatal(err)
	}
	r, a := accountsOf(t, s)
	lines, fitted := 0, 0
	for i := range r.Candidates {
		c := &r.Candidates[i]
		if c.Status != Fitted || fitted > 12 {
			continue
		}
		fitted++
		// The values behind are those of the consequences.
		value := a.Values(c)
		for _, key := range []string{"eroi_generation", "eroi_extended", "delivered_mwh_per_yr"} {
			if q, _ := c.Consequence(key); q.State == scoring.Number && value(key).X != q.Central {
				t.Errorf("%s: %s is %v, the consequence %v", c.ID(), key, value(key), q.Central)
			}
		}
		drivers, used, err := a.Drivers(c, "eroi_extended")
		if err != nil {
			t.Fatal(err)
		}
		if q, _ := c.Consequence("eroi_extended"); q.State == scoring.Number {
			if used < 100 || len(drivers) < 3 || !drivers[0].Known {
				t.Fatalf("%s: %d trials, %+v", c.ID(), used, drivers)
			}
			for n := 1; n < len(drivers); n++ {
				if drivers[n].Known && math.Abs(drivers[n].Rho) > math.Abs(drivers[n-1].Rho) {
					t.Errorf("%s: %+v before %+v", c.ID(), drivers[n-1], drivers[n])
				}
			}
			for _, d := range drivers {
				// More energy brings a higher return, whatever else happens.
				if (d.Name == "wind_yield_error" || d.Name == "solar_yield_error") && d.Known && d.Rho < 0.1 {
					t.Errorf("%s: the return follows the yield by %v", c.ID(), d.Rho)
				}
				if d.Title == "" {
					t.Errorf("%s: %+v has no title", c.ID(), d)
				}
			}
		}
		if d, err := a.Beats(c, c, "eroi_extended", true); err != nil || d.Known && d.Beats != 0.5 {
			t.Errorf("%s against itself: %+v, %v", c.ID(), d, err)
		}
		got, why, err := a.PaybackLines(c)
		if err != nil {
			t.Fatal(err)
		}
		q, _ := c.Consequence("carbon_payback_yr")
		if why != "" {
			if q.State == scoring.Number {
				t.Errorf("%s: %s, and yet a payback of %v", c.ID(), why, q.Central)
			}
			continue
		}
		lines++
		if len(got) != 2 {
			t.Fatalf("%s: %d grid factors", c.ID(), len(got))
		}
		if q.State == scoring.Number && math.Abs(got[0].Central.Yr/q.Central-1) > 1e-9 {
			t.Errorf("%s: the line crosses after %v years, the consequence says %v", c.ID(), got[0].Central.Yr, q.Central)
		}
		if !got[1].Central.Never && !(got[1].Central.Yr < got[0].Central.Yr) {
			t.Errorf("%s: twice the factor pays back after %v, once after %v", c.ID(), got[1].Central.Yr, got[0].Central.Yr)
		}
		if !got[0].Low.Never && got[0].Low.Yr < got[0].Central.Yr {
			t.Errorf("%s: the careful corner is faster: %+v", c.ID(), got[0])
		}
	}
	if lines == 0 {
		t.Error("no candidate has a payback line")
	}
}

// At the value that is found the two are equal, and on its two sides different ones are ahead.
func TestSwapsAreWhereTheyChangePlaces(t *testing.T) {
	s := smallStudy(t, 120)
	r, a := accountsOf(t, s)
	var fitted []*Candidate
	for i := range r.Candidates {
		if c := &r.Candidates[i]; c.Status == Fitted && len(fitted) < 14 {
			fitted = append(fitted, c)
		}
	}
	seen := 0
	for i, one := range fitted {
		for _, other := range fitted[i+1:] {
			list, err := a.Swaps(one, other, "eroi_extended")
			if err != nil {
				t.Fatal(err)
			}
			for _, w := range list {
				seen++
				at := func(x float64) float64 {
					slot, _ := shipped(t).Graph.Slot(w.Name)
					key, _ := shipped(t).Graph.Slot("eroi_extended")
					var got [2]float64
					for n, c := range []*Candidate{one, other} {
						v := a.k.vector(c)
						v[slot] = scoring.Num(x)
						shipped(t).Graph.Central(v)
						got[n] = v[key].X
					}
					return got[0]/got[1] - 1
				}
				if math.Abs(at(w.At)) > 1e-9 || at(w.Low)*at(w.High) > 0 || w.At < w.Low || w.At > w.High {
					t.Errorf("%s and %s at %+v: %v, %v at its ends", one.ID(), other.ID(), w, at(w.Low), at(w.High))
				}
			}
		}
	}
	if seen == 0 {
		t.Error("no factor changes the order of any two")
	}
}

// On a horizon of one life what is spent is what the whole-life return counts.
func TestLedgerOfOneLifeIsTheReturn(t *testing.T) {
	s := smallStudy(t, 120)
	r, a := accountsOf(t, s)
	seen := 0
	for i := range r.Candidates {
		c := &r.Candidates[i]
		q, _ := c.Consequence("eroi_extended")
		if c.Status != Fitted || q.State != scoring.Number || c.Technology == "wind_solar" { // of both parts the ageing is a mean
			continue
		}
		life := a.Values(c)("life_yr").X
		if _, err := s.Set(t.Context(), "set", "", study.SettingEdit{Key: "energy.horizon_yr", Value: fmt.Sprint(life), Source: "test"}); err != nil {
			t.Fatal(err)
		}
		snap, err := s.Snapshot()
		if err != nil {
			t.Fatal(err)
		}
		one, err := NewAccounts(shipped(t), snap)
		if err != nil {
			t.Fatal(err)
		}
		l, why, err := one.Ledger(c)
		if err != nil || l == nil {
			t.Fatalf("%s: %s, %v", c.ID(), why, err)
		}
		if got, err := l.EROI(false); err != nil || math.Abs(got/q.Central-1) > 1e-9 {
			t.Errorf("%s: %v over one life, the return is %v; %v", c.ID(), got, q.Central, err)
		}
		if seen++; seen == 6 {
			return
		}
	}
	t.Errorf("%d candidates", seen)
}

// What is unfolded of a candidate, and what its accounts tell, is what stands in the table, for the share of demand too,
// which rests on a table of the study.
func TestUnfoldingAgreesWithTheTable(t *testing.T) {
	s := smallStudy(t, 60)
	r, a := accountsOf(t, s)
	snap, err := s.Snapshot()
	if err != nil {
		t.Fatal(err)
	}
	told := 0
	for i := range r.Candidates {
		c := &r.Candidates[i]
		if c.Status != Fitted {
			continue
		}
		for _, q := range c.All() {
			if _, inGraph := a.k.p.Graph.Slot(q.Key); !inGraph || q.State != scoring.Number {
				continue
			}
			u, err := Unfold(shipped(t), snap, c, q.Key)
			if err != nil {
				t.Fatal(err)
			}
			if u.State != scoring.Number.String() || u.Value != q.Central || a.Values(c)(q.Key).X != q.Central {
				t.Errorf("%s, %s: the table has %v, the unfolding %s %v, the accounts %v", c.ID(), q.Key, q.Central, u.State, u.Value, a.Values(c)(q.Key))
			}
			if q.Key == "demand_share_frac" {
				told++
			}
		}
		if told == 3 {
			return
		}
	}
	t.Errorf("the share of demand was compared %d times", told)
}
