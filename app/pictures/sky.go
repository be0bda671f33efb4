package pictures

import (
	"fmt"
	"math"
	"strings"

	"groundtally/app/present"
	"groundtally/app/run"
	"groundtally/scoring/solar"
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

// causes are the names of what makes a solar yield unsure.
var causes = map[string]string{
	"sunlight": "sunlight", "model": "models of the sky", "incidence": "reflection and spectrum", "module": "modules", "temperature": "cell temperature", "soiling": "dirt and snow",
	"shading": "shading", "inverter": "inverters and wiring", "availability": "availability", "degradation": "degradation",
}

// odds are the shares of a year's energy that are reached with the usual odds.
var odds = [...]struct {
	name string
	p    float64
}{{"P75", 0.75}, {"P90", 0.90}, {"P99", 0.99}}

// Spread tells by how much a solar yield may be another, and why; empty without an answer.
func Spread(d *run.Doubt) string {
	if d == nil {
		return ""
	}
	var each []string
	for _, c := range d.Components {
		words := fmt.Sprintf("%s %.1f", causes[c.Name], 100*c.Sigma)
		if c.Name == "sunlight" {
			words += " (" + d.Source
			if !d.Said {
				words += ", taken because its source is not stated"
			}
			words += ")"
		}
		if !c.Shared {
			words += " (of this site alone)"
		}
		each = append(each, words)
	}
	text := fmt.Sprintf("How sure the yield is, standard deviations in %%: %s; together %.1f. From one year to another %.1f, apart from these.", strings.Join(each, ", "), 100*d.LongTerm, 100*d.BetweenYears)
	var reached []string
	for _, o := range odds {
		if x, ok := solar.ExceededWith(100, d.OneYear, o.p); ok {
			reached = append(reached, fmt.Sprintf("%s %.0f %%", o.name, x))
		}
	}
	return text + " Of the middle value (P50) a single year reaches " + strings.Join(reached, ", ") + ". All but what is of this site alone is common to all sites, and hardly changes their order."
}

// WindSpread tells by how much the yield of the wind part may be another; empty without an answer.
func WindSpread(d *run.WindDoubt) string {
	if d == nil {
		return ""
	}
	source := map[string]string{"mast": "a mast near by with a year of measurements", "model": "an atlas or model without a mast"}[d.Source]
	if !d.Said {
		source += ", taken because its source is not stated"
	}
	var each, long, single []string
	for _, p := range d.Parts {
		words := fmt.Sprintf("%s %.1f", p.Title, 100*p.Energy)
		if !p.Shared {
			words += " (of this site alone)"
		}
		each = append(each, words)
	}
	for _, e := range d.Exceeded {
		name := fmt.Sprintf("P%.0f", 100*e.ProbabilityFrac)
		long = append(long, name+" "+mwh(e.LongTermMWhPerYr))
		single = append(single, name+" "+mwh(e.SingleYearMWhPerYr))
	}
	text := fmt.Sprintf("How sure the wind yield is (%s), standard deviations in %% of the energy: %s; together %.1f, where %.0f to %.0f are usual for such data. From one year to another %.1f, apart from these: %.1f of the mean speed, and %.2f %% of energy for each per cent of speed. What is not of this site alone is common to all sites, and hardly changes their order. ",
		source, strings.Join(each, ", "), 100*d.LongTerm, 100*d.Band[0], 100*d.Band[1], 100*d.BetweenYears, 100*d.YearSpeed, d.Sensitivity)
	text += fmt.Sprintf("The mean of many years reaches, in MWh/yr: %s. A single year: %s; normal errors. In the long run plants gave %+.0f %% against such forecasts (Hammond et al. 2026, Wind Energy Science 11:1251); the yearly energy with that bias taken off stands beside.",
		strings.Join(long, ", "), strings.Join(single, ", "), 100*d.Bias)
	if d.HoursMWh > 0 {
		text += fmt.Sprintf(" Behind wakes and before losses the hours give %s MWh/yr, the distributions fitted to them %s (%+.1f %%).", mwh(d.HoursMWh), mwh(d.FitMWh), 100*(d.FitMWh/d.HoursMWh-1))
	}
	return text
}

func mwh(x float64) string { return present.Figure(x, x, x) }
