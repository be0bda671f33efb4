package pictures

import (
	"fmt"
	"math"
	"strings"

	"groundtally/app/run"
)

// SkySpread tells what each model of the sky gives, and how far they lie apart; empty without models.
func SkySpread(list []run.SkyYield) string {
	if len(list) == 0 {
		return ""
	}
	low, high, used := math.Inf(1), math.Inf(-1), 0.0
	var each []string
	for _, y := range list {
		low, high = math.Min(low, y.KWhPerKWp), math.Max(high, y.KWhPerKWp)
		words := fmt.Sprintf("%s %.0f", y.Model, y.KWhPerKWp)
		if y.Used {
			used = y.KWhPerKWp
			words += " (used)"
		}
		each = append(each, words)
	}
	text := "Under other models of the sky, kWh/kWp: " + strings.Join(each, ", ")
	if used > 0 {
		text += fmt.Sprintf("; from %+.1f to %+.1f %%", 100*(low/used-1), 100*(high/used-1))
	}
	return text + "."
}
