package wind

import (
	"testing"
)

// The shipped parts of the spread give together what is usual: 15 to 20 % of the energy without a mast, 8 to 12 % with
// a year of one (common practice), at the sensitivities of sites from 6.9 to 8.5 m/s.
func TestShippedPartsGiveTheUsualSpread(t *testing.T) {
	d, err := ParseDefaults(table(t, "assets/params/wind_defaults.csv"))
	if err != nil {
		t.Fatal(err)
	}
	get := func(name string) Default {
		v, err := d.Get(name)
		if err != nil {
			t.Fatal(err)
		}
		return v
	}
	for kind, band := range map[string]string{"model": "sigma_no_mast_frac", "mast": "sigma_one_year_mast_frac"} {
		parts := Components{{Name: "curve", EnergyFrac: get("sigma_performance_frac").Central}}
		for _, n := range []string{"measurement", "long_term", "horizontal"} {
			parts = append(parts, Component{Name: n, SpeedFrac: get("sigma_" + kind + "_" + n + "_frac").Central})
		}
		for _, s := range []float64{1.14, 1.3, 1.52} {
			got, err := parts.Total(s)
			if b := get(band); err != nil || got < b.Low || got > b.High {
				t.Errorf("%s at %v: %v, usual %v to %v; %v", kind, s, got, b.Low, b.High, err)
			}
		}
	}
}
