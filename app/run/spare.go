package run

import (
	"fmt"

	"groundtally/scoring"
	"groundtally/scoring/energy"
)

// SparePlan is which sites would be built, in the order of a voice, and what saving would make needless of them.
type SparePlan struct {
	Sites     []energy.SpareSite
	WantedMWh float64 // a year; the sites together give at least that, or all there are
	Basis     string  // target, demand, or all: what is wanted
	LeftOut   int     // sites whose energy or ground is not known
	Short     bool    // all sites together give less than is wanted

	saving energy.Saving // of the whole; At puts the energy in
}

// SparePlan takes the best candidate of each site in an order (candidates of the results, the first first), until they
// give what the district wants in a year (energy.target_mwh_per_yr), without that what it uses, and without either
// all of them.
func (a *Accounts) SparePlan(r *Results, order []int) (*SparePlan, error) {
	p := &SparePlan{Basis: "all"}
	var err error
	if p.saving, err = a.savingOf(0); err != nil {
		return nil, err
	}
	if x, ok := a.snap.Number("energy.target_mwh_per_yr"); ok && x > 0 {
		p.WantedMWh, p.Basis = x, "target"
	} else if slot, ok := a.k.p.Graph.Slot("demand_mwh_per_yr"); ok && r.reckoner.central[slot].OK() {
		p.WantedMWh, p.Basis = r.reckoner.central[slot].X, "demand"
	}
	taken := map[string]bool{}
	sum := 0.0
	for _, i := range order {
		c := &r.Candidates[i]
		if taken[c.Site] {
			continue
		}
		taken[c.Site] = true
		s := energy.SpareSite{ID: c.ID(), StockKnown: true}
		known := true
		number := func(key string) float64 {
			q, ok := c.Consequence(key)
			known = known && ok && q.State == scoring.Number
			return q.Central
		}
		s.DeliveredMWhPerYr, s.DirectHa, s.TotalHa = number("delivered_mwh_per_yr"), number("footprint_direct_ha"), number("footprint_total_ha")
		if ha := number("occupation_ha_yr"); s.DirectHa > 0 {
			s.OccupationYr = ha / s.DirectHa
		}
		if !known {
			p.LeftOut++
			continue
		}
		for _, key := range []string{"soil_carbon_loss_tc", "biomass_carbon_loss_tc"} {
			switch q, ok := c.Consequence(key); {
			case ok && q.State == scoring.Number:
				s.StockTC += q.Central
			case ok && q.State == scoring.None:
			default:
				s.StockKnown = false
			}
		}
		p.Sites = append(p.Sites, s)
		if sum += s.DeliveredMWhPerYr; p.Basis != "all" && sum >= p.WantedMWh {
			return p, nil
		}
	}
	if p.Basis == "all" {
		p.WantedMWh = sum
	}
	p.Short = sum < p.WantedMWh
	return p, nil
}

// At tells what a saved share of the energy of all sites of the plan, 0 to 1 after rebound, spares, and how much must
// be saved at the place of use for it, with direct and with economy-wide rebound.
func (p *SparePlan) At(share float64) (energy.Spared, energy.SavingEquals, error) {
	s, err := energy.Spare(p.Sites, share)
	if err != nil {
		return s, energy.SavingEquals{}, fmt.Errorf("saved share: %w", err)
	}
	saving := p.saving
	saving.DeliveredMWhPerYr = s.SavedAtGridMWhPerYr
	e, err := saving.Equal()
	return s, e, err
}

// Ordered gives the candidates of an order, the first first, without doing nothing.
func (r *Results) Ordered(v *VoiceOrder) ([]int, error) {
	at := make(map[string]int, len(r.Candidates))
	for i := range r.Candidates {
		at[r.Candidates[i].ID()] = i
	}
	var out []int
	for _, row := range v.Order {
		id := row.ID()
		if id == NoSite {
			continue
		}
		i, ok := at[id]
		if !ok {
			return nil, fmt.Errorf("candidate %s stands in the order and not among the results", id)
		}
		out = append(out, i)
	}
	return out, nil
}
