package climate

import (
	"math"

	"groundtally/scoring"
	"groundtally/scoring/bounds"
	"groundtally/scoring/units"
)

// Quantities gives the climate account as a graph over the same inventory rows as the energy account,
// in kg CO2e ("<row>.kgco2e" per basis).
func Quantities() []scoring.Quantity {
	plain, guarded := scoring.Plain, scoring.Guarded
	return []scoring.Quantity{
		{Name: "ghg_generator_kg", Unit: "kg CO2e", Title: "Greenhouse gas of machines and panels", Formula: "Σ row × kW: wind_turbine, pv_system_mono, and what tracking, vertical or elevated rows add", Source: "inventory",
			Inputs: []string{"wind_kw", "solar_kw", "tracking_kw", "vertical_kw", "elevated_kw", "wind_turbine.kgco2e", "pv_system_mono.kgco2e", "pv_tracker_surcharge.kgco2e", "pv_vertical_surcharge.kgco2e", "pv_elevated_surcharge.kgco2e"}, Eval: scoring.Sum(5)},
		{Name: "ghg_works_kg", Unit: "kg CO2e", Title: "Greenhouse gas of pads, tracks, fence and connection", Formula: "Σ row × amount", Source: "inventory",
			Inputs: []string{"turbines", "track_counted_km", "solar_kw", "cable_lv_km", "cable_mv_km", "cable_hv_km", "transformer_kva", "switchgear_count",
				"wind_crane_pad.kgco2e", "track.kgco2e", "pv_fence.kgco2e", "cable_lv.kgco2e", "cable_mv.kgco2e", "cable_hv.kgco2e", "transformer.kgco2e", "switchgear.kgco2e"}, Eval: scoring.Sum(8)},
		{Name: "ghg_running_kg", Unit: "kg CO2e", Title: "Greenhouse gas of upkeep and end of life", Formula: "upkeep share × machines × life + dismantling share × machines + inverter change × kW_ac + restoration × ha", Source: "inventory",
			Inputs: []string{"wind_kw", "solar_kw", "wind_turbine.kgco2e", "pv_system_mono.kgco2e", "wind_upkeep.kgco2e", "pv_upkeep.kgco2e", "life_yr", "wind_decommissioning.kgco2e", "pv_decommissioning.kgco2e",
				"solar_ac_kw", "pv_inverter_replacement.kgco2e", "footprint_direct_ha", "restoration.kgco2e"},
			Eval: plain(func(x []float64) float64 {
				wind, solar := x[0]*x[2], x[1]*x[3]
				return wind*(x[4]*x[6]+x[7]) + solar*(x[5]*x[6]+x[8]) + x[9]*x[10] + x[11]*x[12]
			})},
		{Name: "ghg_plant_tco2e", Unit: "t CO2e", Title: "Greenhouse gas of the plant without its land", Formula: "(machines + works + running) / 1000", Source: "identity",
			Inputs: []string{"ghg_generator_kg", "ghg_works_kg", "ghg_running_kg"}, Eval: plain(func(x []float64) float64 { return (x[0] + x[1] + x[2]) / units.KgPerT })},
		{Name: "ghg_land_tco2e", Unit: "t CO2e", Title: "Greenhouse gas of land carbon", Formula: "(soil_carbon_loss_tc + biomass_carbon_loss_tc) × 44/12, booked at once", Source: "molar masses",
			Inputs: []string{"soil_carbon_loss_tc", "biomass_carbon_loss_tc"}, Eval: scoring.NoneIsZero(guarded("land_carbon", func(x []float64) (float64, error) { return CO2FromCarbonT(x[0] + x[1]) }))},
		{Name: "ghg_life_tco2e", Unit: "t CO2e", Title: "Greenhouse gas over life", Formula: "plant + land", Source: "identity",
			Inputs: []string{"ghg_plant_tco2e", "ghg_land_tco2e"}, Eval: plain(func(x []float64) float64 { return x[0] + x[1] })},
		{Name: "ghg_g_per_kwh", Unit: "g CO2e/kWh", Title: "Greenhouse gas per kilowatt-hour", Formula: "ghg_life_tco2e / energy delivered over the life", Source: "identity",
			Inputs: []string{"ghg_life_tco2e", "delivered_mj_life"}, Eval: guarded("ghg", func(x []float64) (float64, error) { return GPerKWh(x[0], x[1]) })},
		{Name: "wind_energy_share", Unit: "1", Title: "Share of the wind in the energy of the first year", Formula: "E_wind / (E_wind + E_solar), even odds", Source: "identity",
			Inputs: []string{"wind_p50_mwh", "solar_p50_mwh"}, Eval: plain(func(x []float64) float64 { return x[0] / (x[0] + x[1]) })},
		{Name: "ageing_per_yr", Unit: "1/yr", Title: "Ageing of the plant", Formula: "d_wind × share of the wind + d_solar × share of the sun", Source: "identity",
			Inputs: []string{"wind_degradation_per_yr", "pv_degradation_per_yr", "wind_energy_share"}, Eval: plain(func(x []float64) float64 { return float64(x[0]*x[2]) + float64(x[1]*(1-x[2])) })},
		{Name: "displaced_tco2e_per_yr", Unit: "t CO2e/yr", Title: "Emissions displaced per year", Formula: "delivered_mwh_per_yr × grid factor × displacement share; a scenario", Source: "identity",
			Inputs: []string{"delivered_mwh_per_yr", "grid_factor_g_per_kwh", "displacement_share"}, Eval: plain(func(x []float64) float64 { return x[0] * units.KWhPerMWh * x[1] * x[2] / units.GPerKg / units.KgPerT })},
		{Name: "displacing_ln_per_yr", Unit: "1/yr", Title: "Decline of what is displaced, as a logarithm", Formula: "ln((1 − ageing_per_yr)·(1 − grid_decline_per_yr))", Source: "identity",
			Inputs: []string{"ageing_per_yr", "grid_decline_per_yr"}, Eval: guarded("displaced", func(x []float64) (float64, error) {
				if err := displacedInput(0, x[0], 0, Grid{DeclinePerYr: x[1]}); err != nil {
					return 0, err
				}
				return declineOf(x[0], x[1]).ln, nil
			})},
		{Name: "displacing_fall_per_yr", Unit: "1/yr", Title: "Change of what is displaced from year to year", Formula: "exp(displacing_ln_per_yr) − 1", Source: "identity",
			Inputs: []string{"displacing_ln_per_yr"}, Eval: plain(func(x []float64) float64 { return math.Expm1(x[0]) })},
		{Name: "displacing_yr", Unit: "yr", Title: "Years of the first year's displacement in the life", Formula: "(1 − q^T)/(1 − q), q = exp(displacing_ln_per_yr); T where q is 1", Source: "identity",
			Inputs: []string{"displacing_ln_per_yr", "displacing_fall_per_yr", "life_yr"}, Eval: plain(func(x []float64) float64 { return decline{x[0], x[1]}.displacedT(1, x[2]) })},
		{Name: "displaced_tco2e_life", Unit: "t CO2e", Title: "Emissions displaced over life", Formula: "E_1·EF × displacing_yr", Source: "identity",
			Inputs: []string{"delivered_mwh_per_yr", "displacing_yr", "grid_factor_g_per_kwh", "displacement_share"}, Eval: guarded("displaced", func(x []float64) (float64, error) {
				kWh, kg := x[0]*units.KWhPerMWh, x[2]*x[3]/units.GPerKg
				if !bounds.AllNonNegative(kWh, x[1], kg) {
					return 0, displacedInput(kWh, 0, x[1], Grid{KgPerKWh: kg})
				}
				return firstYearT(kWh, kg) * x[1], nil
			})},
		{Name: "net_displaced_tco2e_life", Unit: "t CO2e", Title: "Emissions spared, net", Formula: "displaced over life − ghg_life_tco2e", Source: "identity",
			Inputs: []string{"displaced_tco2e_life", "ghg_life_tco2e"}, Eval: plain(func(x []float64) float64 { return x[0] - x[1] })},
		{Name: "carbon_payback_yr", Unit: "yr", Title: "Carbon payback time", Formula: "years until the emissions displaced equal those caused, all booked at the start; never beyond the life", Source: "identity",
			Inputs: []string{"ghg_life_tco2e", "delivered_mwh_per_yr", "displacing_ln_per_yr", "displacing_fall_per_yr", "grid_factor_g_per_kwh", "displacement_share", "life_yr"}, Eval: scoring.Eval{Numbers: func(x []float64) (float64, bool) {
				p, err := paybackOf(x)
				return p.Yr, err == nil && !p.Never
			}, Values: func(in []scoring.Value) scoring.Value {
				if v, missing := scoring.FirstMissing(in); missing {
					return v
				}
				p, err := paybackOf([]float64{in[0].X, in[1].X, in[2].X, in[3].X, in[4].X, in[5].X, in[6].X})
				switch {
				case err != nil:
					return scoring.UnknownBecause("carbon_payback")
				case p.Never:
					return scoring.NeverValue()
				}
				return scoring.Num(p.Yr)
			}}},
	}
}

// paybackOf reads the inputs of carbon_payback_yr.
func paybackOf(x []float64) (Payback, error) {
	kWh, kg := x[1]*units.KWhPerMWh, x[4]*x[5]/units.GPerKg
	if !bounds.Finite(x[0]) || !bounds.AllNonNegative(kWh, kg, x[6]) {
		return PaybackYears(x[0], kWh, 0, Grid{KgPerKWh: kg}, x[6])
	}
	return decline{x[2], x[3]}.payback(x[0], firstYearT(kWh, kg), x[6]), nil
}
