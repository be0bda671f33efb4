package present

import "fmt"

// publishedMWpPerHa are published direct-current ratings per hectare of array, by technology: medians of 736
// plants in the United States, 0.35 and 0.24 MW an acre. Source: Bolinger and Bolinger 2022, IEEE Journal of
// Photovoltaics 12:589.
var publishedMWpPerHa = map[string]float64{"solar_fixed": 0.87, "solar_tracking": 0.59}

// Density gives the rating of panels by the ground inside their fence.
func Density(solarKW, fencedHa float64) string {
	if fencedHa <= 0 {
		return "unknown"
	}
	return fmt.Sprintf("%.2f MWp/ha", solarKW/1000/fencedHa)
}

// PublishedDensity gives the published figure beside it; empty where there is none.
func PublishedDensity(technology string) string {
	if x, ok := publishedMWpPerHa[technology]; ok {
		return fmt.Sprintf("Published: %.2f MWp/ha, median of plants in the United States up to 2019 (Bolinger and Bolinger 2022), without the ground between arrays and fence.", x)
	}
	return ""
}

// PanelDensity gives number, density and the published figure in one phrase; empty without panels.
func PanelDensity(technology string, modules int, solarKW, fencedHa float64) string {
	if modules == 0 {
		return ""
	}
	words := fmt.Sprintf("%d modules, %s", modules, Density(solarKW, fencedHa))
	if x, ok := publishedMWpPerHa[technology]; ok {
		words += fmt.Sprintf(" (published median %.2f)", x)
	}
	return words
}

// PanelRows tells how rows of panels stand; empty for a plant without.
func PanelRows(pitchM, tiltDeg float64) string {
	if pitchM == 0 {
		return ""
	}
	words := fmt.Sprintf("rows %.1f m apart, measured horizontally", pitchM)
	if tiltDeg > 0 {
		words += fmt.Sprintf(", tilted by %.0f degrees", tiltDeg)
	}
	return words
}
