package pictures

import (
	"fmt"

	"groundtally/scoring"
)

// Densities tells the mean power on all the ground of a plant and on what it takes directly. Value gives central values
// by name.
func Densities(value func(name string) scoring.Value) string {
	word := func(name string) string {
		if v := value(name); v.OK() {
			return mwh(v.X) + " W/m²"
		}
		return "unknown"
	}
	return fmt.Sprintf("Mean power of a year on the ground: %s on all of it, %s on what is taken directly. Published figures differ mostly by which ground they count.", word("power_density_w_per_m2"), word("power_density_direct_w_per_m2"))
}
