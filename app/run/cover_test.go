package run

import (
	"testing"

	"groundtally/scoring"
)

// What nothing cited covers is unknown in every account that counts it, until the user enters a row.
func TestInventoryOfASizeThatNothingCovers(t *testing.T) {
	energy := []string{"eroi_generation", "eroi_extended", "net_share", "energy_payback_yr"}
	states := func(c *Candidate, keys []string) (known int) {
		for _, key := range keys {
			q, ok := c.Consequence(key)
			switch {
			case !ok:
				t.Fatalf("no %s; %s %s", key, c.Status, c.Reason)
			case q.State == scoring.Number:
				known++
			case q.State != scoring.Unknown || q.Why != "inventory_size":
				t.Errorf("%s: %+v", key, q)
			}
		}
		return known
	}
	make := func(kw string, own ...string) *Candidate {
		p := tracked(t)
		p.set("plant.wind.rated_kw", kw)
		p.set(own...)
		p.add("grid_lines", []string{"voltage", "spare_capacity"}, thing{line(-2000, 800, 2000, 800), map[string]string{"voltage": "20", "spare_capacity": "9000"}})
		return p.computed(nil)
	}
	for kw, known := range map[string]int{"999": 0, "1000": len(energy), "2000": len(energy), "8001": 0} {
		c := make(kw)
		if got := states(c, energy); got != known {
			t.Errorf("%s kW: %d of %d figures are known", kw, got, len(energy))
		}
		if q, _ := c.Consequence("ghg_g_per_kwh"); known == 0 && q.State == scoring.Number {
			t.Errorf("%s kW: greenhouse gas %+v", kw, q)
		}
	}
	for _, key := range []string{"inventory.wind_turbine-mj.central", "inventory.wind_turbine-kgco2e.high", "inventory.rebound_frac.low"} {
		if err := CheckSetting(catalog, shipped(t), key, "9000"); err != nil {
			t.Errorf("%s is refused: %v", key, err)
		}
	}
	if err := CheckSetting(catalog, shipped(t), "inventory.wind_turbin-mj.central", "9000"); err == nil {
		t.Error("a row that there is not is taken")
	}
	if got := states(make("300", "inventory.wind_turbine-mj.central", "9000"), energy); got != len(energy) {
		t.Errorf("with a row of one's own %d of %d figures are known", got, len(energy))
	}
}
