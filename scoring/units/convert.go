package units

import (
	"fmt"
	"sort"
	"strings"
)

// Convert brings a number from one unit to another that measures the same.
func Convert(x float64, from, to string) (float64, error) {
	from, to = strings.TrimSpace(from), strings.TrimSpace(to)
	if from == to || to == "" {
		return x, nil
	}
	f, okFrom := unitTable[from]
	t, okTo := unitTable[to]
	if !okFrom || !okTo || f.of != t.of {
		return 0, fmt.Errorf("%q cannot be brought to %q", from, to)
	}
	return x * f.factor / t.factor, nil
}

// Alike lists the units that can be brought to one, itself first, the others in order of their names.
func Alike(unit string) []string {
	out := []string{unit}
	for u := range unitTable {
		if _, err := Convert(1, u, unit); err == nil && u != unit {
			out = append(out, u)
		}
	}
	sort.Strings(out[1:])
	return out
}

// unitTable holds the units a file may deliver, by what they measure. Exact by definition (SI; the
// international foot of 1959 is 0.3048 m).
var unitTable = map[string]struct {
	of     string
	factor float64
}{
	"m": {"length", 1}, "km": {"length", 1000}, "cm": {"length", 0.01}, "mm": {"length", 0.001}, "ft": {"length", MPerFoot},
	"V": {"voltage", 1}, "kV": {"voltage", 1000},
	"W": {"power", 1}, "kW": {"power", 1000}, "MW": {"power", 1e6},
	"kWh/yr": {"energy a year", 1}, "MWh/yr": {"energy a year", 1000}, "GWh/yr": {"energy a year", 1e6},
	"m/s": {"speed", 1}, "km/h": {"speed", 1 / KmPerHourPerMPerS},
	"t C/ha": {"stock", 1}, "kg C/m2": {"stock", 10},
	"kWh/(m2 month)": {"sunlight a month", 1}, "MJ/(m2 month)": {"sunlight a month", 1 / MJPerKWh},
	"MVA": {"apparent power", 1}, "kVA": {"apparent power", 0.001},
}
