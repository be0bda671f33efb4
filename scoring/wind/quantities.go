package wind

import "groundtally/scoring"

// Quantities gives what the wind family adds to the graph. Leaves: energies of the fit, the published
// long-run bias of forecasts, what existing machines lose.
func Quantities() []scoring.Quantity {
	return []scoring.Quantity{
		{Name: "existing_plant_loss_mwh_per_yr", Unit: "MWh/yr", Title: "Energy taken from neighbours", Formula: "existing_loss_mwh", Source: "identity",
			Inputs: []string{"existing_loss_mwh"}, Eval: scoring.Plain(func(x []float64) float64 { return x[0] })},
		{Name: "energy_p50_adjusted_mwh_per_yr", Unit: "MWh/yr", Title: "Yearly energy, bias taken off", Formula: "wind energy × (1 + long_run_bias_frac) + solar energy", Source: "Hammond et al. 2026, Wind Energy Science 11:1251",
			Inputs: []string{"wind_first_year_mwh", "solar_first_year_mwh", "turbine_count", "long_run_bias_frac"}, Eval: scoring.Plain(func(x []float64) float64 {
				return BiasAdjusted(x[0], x[3]) + x[1]
			})},
	}
}
