package run

import (
	"groundtally/scoring/energy"
)

// longAssetYr is how long tracks, pads and the grid connection last. Source: common practice, 40 years for grid assets.
const longAssetYr = 40

// Ledger reckons a fitted candidate on the horizon that all candidates of a study share (energy.horizon_yr): machines
// are built again when their life ends, tracks and connection serve longer, upkeep runs. why tells in a code why there
// is none.
func (a *Accounts) Ledger(c *Candidate) (l *energy.Ledger, why string, err error) {
	if c.Status != Fitted {
		return nil, c.Status, nil
	}
	horizon, ok := a.snap.Number("energy.horizon_yr")
	if !ok {
		return nil, "not_set:energy.horizon_yr", nil
	}
	value := a.Values(c)
	var p energy.LedgerPlant
	var generator, works, connection float64
	for _, v := range []struct {
		name string
		to   *float64
	}{{"delivered_mwh_per_yr", &p.FirstYearMWh}, {"ageing_per_yr", &p.DegradationPerYr}, {"life_yr", &p.LifeYr}, {"input_upkeep_mj_per_yr", &p.UpkeepMJPerYr}, {"input_end_mj", &p.EndMJ},
		{"footprint_direct_ha", &p.OccupiedHa}, {"input_generator_mj", &generator}, {"input_works_mj", &works}, {"input_connection_mj", &connection}} {
		x := value(v.name)
		if !x.OK() {
			return nil, x.Why, nil
		}
		*v.to = x.X
	}
	p.Inputs = []energy.LedgerInput{{ItemID: "machines and panels", MJ: generator}, {ItemID: "tracks, pads and fence", MJ: works, LifeYr: longAssetYr}, {ItemID: "connection", MJ: connection, LifeYr: longAssetYr}}
	l, err = energy.NewLedger(p, horizon, a.k.gridEfficiency())
	return l, "", err
}
