package run

import (
	"math"
	"slices"
	"testing"

	"groundtally/scoring"
)

// Reference stocks of cool temperate moist soils: IPCC 2006 Guidelines and 2019 Refinement, vol. 4 table 2.3 (from
// memory, as in soil_2026_01.csv): high-activity clay 95 and 81, sandy 71 and 51 t C/ha.
func TestSoilByClass(t *testing.T) {
	stock := func(class, given, use string, set ...string) (*Candidate, Leaf) {
		p := tracked(t)
		values := map[string]string{"soil_class": class}
		if given != "" {
			values["organic_carbon_stock"] = given
		}
		if use != "" {
			values["land_use_factor"] = use
		}
		p.add("soil", []string{"soil_class", "organic_carbon_stock", "land_use_factor"}, thing{square(-1000, -1100, 2100), values})
		p.set(set...)
		c := p.computed(nil)
		return c, p.leaf(c, "soil_stock_tc_per_ha")
	}
	for _, one := range []struct {
		class, given, use string
		set               []string
		want              float64
	}{
		{"HAC", "", "", nil, 81}, {"HAC", "", "", []string{"climate.soil_method", "2006"}, 95}, {"sandy", "", "", nil, 51}, {"Arenosol", "", "0.7", nil, 51 * 0.7}, {"HAC", "60", "", nil, 60},
	} {
		c, got := stock(one.class, one.given, one.use, one.set...)
		if got.State != scoring.Number || math.Abs(got.X-one.want) > 1e-6 {
			t.Errorf("%s, stock %q, %v: %+v, want %v", one.class, one.given, one.set, got, one.want)
		}
		byClass := one.given == ""
		if told := slices.Contains(c.Notices, "soil_by_class"); told != byClass {
			t.Errorf("%s, stock %q: told %v", one.class, one.given, told)
		}
		// The loss follows the stock, and its range is wider by what the class leaves open.
		q, _ := c.Consequence("soil_carbon_loss_tc")
		if q.State == scoring.Number && byClass && q.High < 1.5*q.Central {
			t.Errorf("%s: loss %v to %v about %v", one.class, q.Low, q.High, q.Central)
		}
	}
	for _, class := range []string{"sandy loam", "made ground", ""} {
		if _, got := stock(class, "", ""); got.State != scoring.Unknown {
			t.Errorf("%q: %+v", class, got)
		}
	}
	if _, got := stock("LAC", "", "", "climate.zone", "boreal"); got.State != scoring.Unknown {
		t.Errorf("a pair that the guidelines leave out: %+v", got)
	}
}
