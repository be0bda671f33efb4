package energy

import (
	"math"

	"groundtally/scoring"
	"groundtally/scoring/bounds"
	"groundtally/scoring/params"
	"groundtally/scoring/units"
)

const murphy = "Murphy, Hall, Dale & Cleveland 2011, Order from Chaos"

// Quantities gives the energy account as a graph. Leaves: what fitting and connecting found, lives and
// ageing, inventory rows ("<row>.mj" per basis).
func Quantities() []scoring.Quantity {
	plain, guarded := scoring.Plain, scoring.Guarded
	return []scoring.Quantity{
		{Name: "rated_kw", Unit: "kW", Title: "Rated power", Formula: "wind_kw + solar_kw", Source: "identity",
			Inputs: []string{"wind_kw", "solar_kw"}, Eval: plain(func(x []float64) float64 { return x[0] + x[1] })},
		{Name: "wind_part", Unit: "1", Title: "Whether there are turbines", Formula: "1 where wind_kw is above 0, else 0", Source: "identity", Inputs: []string{"wind_kw"}, Eval: plain(above0)},
		{Name: "solar_part", Unit: "1", Title: "Whether there are panels", Formula: "1 where solar_kw is above 0, else 0", Source: "identity", Inputs: []string{"solar_kw"}, Eval: plain(above0)},
		{Name: "life_yr", Unit: "yr", Title: "Life of the plant", Formula: "life of its technology; of both, the shorter", Source: "choice of this program",
			Inputs: []string{"wind_part", "solar_part", "wind_life_yr", "pv_life_yr"}, Eval: plain(func(x []float64) float64 {
				switch {
				case x[0] > 0 && x[1] > 0:
					return math.Min(x[2], x[3])
				case x[0] > 0:
					return x[2]
				}
				return x[3]
			})},
		{Name: "wind_first_year_mwh", Unit: "MWh/yr", Title: "Wind energy of the first year", Formula: "wind_p50_mwh × wind_yield_error", Source: "identity",
			Inputs: []string{"wind_p50_mwh", "wind_yield_error"}, Eval: plain(product)},
		{Name: "solar_first_year_mwh", Unit: "MWh/yr", Title: "Solar energy of the first year", Formula: "solar_p50_mwh × solar_yield_error", Source: "identity",
			Inputs: []string{"solar_p50_mwh", "solar_yield_error"}, Eval: plain(product)},
		{Name: "energy_p50_mwh_per_yr", Unit: "MWh/yr", Title: "Yearly energy, even odds", Formula: "wind_first_year_mwh + solar_first_year_mwh", Source: "identity",
			Inputs: []string{"wind_first_year_mwh", "solar_first_year_mwh"}, Eval: plain(func(x []float64) float64 { return x[0] + x[1] })},
		{Name: "yield_sigma", Unit: "1", Title: "Standard deviation of the yearly energy", Formula: "√((σ_wind·E_wind)² + (σ_solar·E_solar)²) / E", Source: "root sum of squares of independent errors",
			Inputs: []string{"wind_p50_mwh", "solar_p50_mwh", "wind_yield_sigma", "solar_yield_sigma"}, Eval: plain(func(x []float64) float64 {
				return math.Hypot(x[0]*x[2], x[1]*x[3]) / (x[0] + x[1])
			})},
		exceedance("energy_p75_mwh_per_yr", "Yearly energy, three in four", 0.75),
		exceedance("energy_p90_mwh_per_yr", "Yearly energy, nine in ten", 0.90),
		exceedance("energy_p99_mwh_per_yr", "Yearly energy, bad year", 0.99),
		{Name: "curtailed_frac", Unit: "1", Title: "Share of the energy cut off", Formula: "curtailed_share; taken as none, and said so, while the spare capacity is unknown", Source: "identity",
			Inputs: []string{"curtailed_share"}, Eval: scoring.Custom(func(in []scoring.Value) scoring.Value {
				if in[0].State == scoring.Unknown {
					return scoring.Num(0)
				}
				return in[0]
			})},
		{Name: "delivered_mwh_per_yr", Unit: "MWh/yr", Title: "Energy delivered per year", Formula: "energy_p50 × (1 − curtailed_frac) × (1 − connection_loss_frac)", Source: "identity",
			Inputs: []string{"energy_p50_mwh_per_yr", "curtailed_frac", "connection_loss_frac"}, Eval: plain(func(x []float64) float64 { return x[0] * (1 - x[1]) * (1 - x[2]) })},
		{Name: "specific_yield_kwh_per_kw", Unit: "kWh/(kW yr)", Title: "Energy per installed kilowatt", Formula: "energy_p50 / rated_kw", Source: "identity",
			Inputs: []string{"energy_p50_mwh_per_yr", "rated_kw"}, Eval: plain(func(x []float64) float64 { return x[0] * units.KWhPerMWh / x[1] })},
		{Name: "capacity_factor", Unit: "1", Title: "Share of full output", Formula: "energy_p50 / (rated_kw × 8760 h)", Source: "identity",
			Inputs: []string{"energy_p50_mwh_per_yr", "rated_kw"}, Eval: plain(func(x []float64) float64 { return x[0] * units.KWhPerMWh / (x[1] * units.HoursPerYear) })},

		effectiveYears("wind_effective_yr", "Life of turbines in years of first-year output", "wind_degradation_per_yr"),
		effectiveYears("solar_effective_yr", "Life of panels in years of first-year output", "pv_degradation_per_yr"),
		{Name: "generated_mj_life", Unit: "MJ", Title: "Electricity of the life at the plant", Formula: "3.6·Y1·D(T) of each technology, less what is cut off", Source: "Jordan & Kurtz 2013 for geometric ageing",
			Inputs: []string{"wind_first_year_mwh", "solar_first_year_mwh", "wind_effective_yr", "solar_effective_yr", "curtailed_frac"},
			Eval: guarded("life_energy", func(x []float64) (float64, error) {
				sum := 0.0
				for i := range 2 {
					if x[i] == 0 { // a plant without that part
						continue
					}
					e, err := GeneratedMJ(x[i]*units.KWhPerMWh, x[2+i])
					if err != nil {
						return 0, err
					}
					sum += e
				}
				return sum * (1 - x[4]), nil
			})},
		{Name: "delivered_mj_life", Unit: "MJ", Title: "Electricity of the life at the grid", Formula: "(1 − λ)·E_gen", Source: "Raugei et al., IEA-PVPS T12 methodology guidelines",
			Inputs: []string{"generated_mj_life", "connection_loss_frac"}, Eval: guarded("life_energy", func(x []float64) (float64, error) { return DeliveredMJ(x[0], x[1], 0) })},

		{Name: "input_generator_mj", Unit: "MJ", Title: "Energy spent on machines and panels", Formula: "Σ row × kW: wind_turbine, pv_system_mono, and what tracking, vertical or elevated rows add", Source: "inventory",
			Inputs: []string{"wind_kw", "solar_kw", "tracking_kw", "vertical_kw", "elevated_kw", "wind_turbine.mj", "pv_system_mono.mj", "pv_tracker_surcharge.mj", "pv_vertical_surcharge.mj", "pv_elevated_surcharge.mj"},
			Eval:   scoring.Sum(5)},
		{Name: "input_works_mj", Unit: "MJ", Title: "Energy spent on pads, tracks and fence", Formula: "wind_crane_pad × turbines + track × km + pv_fence × kW", Source: "inventory",
			Inputs: []string{"turbines", "track_counted_km", "solar_kw", "wind_crane_pad.mj", "track.mj", "pv_fence.mj"}, Eval: scoring.Sum(3)},
		{Name: "input_plant_mj", Unit: "MJ", Title: "Energy spent up to the plant's terminals", Formula: "generator + works", Source: murphy,
			Inputs: []string{"input_generator_mj", "input_works_mj"}, Eval: plain(func(x []float64) float64 { return x[0] + x[1] })},
		{Name: "input_connection_mj", Unit: "MJ", Title: "Energy spent on the connection", Formula: "cable × km × circuits + transformer × kVA + switchgear", Source: "inventory",
			Inputs: []string{"cable_lv_km", "cable_mv_km", "cable_hv_km", "transformer_kva", "switchgear_count", "cable_lv.mj", "cable_mv.mj", "cable_hv.mj", "transformer.mj", "switchgear.mj"}, Eval: scoring.Sum(5)},
		{Name: "input_delivered_mj", Unit: "MJ", Title: "Energy spent up to the grid", Formula: "plant + connection", Source: murphy,
			Inputs: []string{"input_plant_mj", "input_connection_mj"}, Eval: plain(func(x []float64) float64 { return x[0] + x[1] })},
		{Name: "input_upkeep_mj_per_yr", Unit: "MJ/yr", Title: "Energy spent on upkeep in a year", Formula: "upkeep share × machines and panels", Source: "inventory",
			Inputs: upkeepInputs, Eval: plain(func(x []float64) float64 { return x[0]*x[2]*x[4] + x[1]*x[3]*x[5] })},
		{Name: "input_end_mj", Unit: "MJ", Title: "Energy spent on replacing, dismantling and restoring", Formula: "inverter change × kW_ac + dismantling share × machines and panels + restoration × ha", Source: "inventory",
			Inputs: []string{"wind_kw", "solar_kw", "wind_turbine.mj", "pv_system_mono.mj", "wind_decommissioning.mj", "pv_decommissioning.mj", "solar_ac_kw", "pv_inverter_replacement.mj", "footprint_direct_ha", "restoration.mj"},
			Eval: plain(func(x []float64) float64 {
				return x[0]*x[2]*x[4] + x[1]*x[3]*x[5] + x[6]*x[7] + x[8]*x[9]
			})},
		{Name: "input_extended_mj", Unit: "MJ", Title: "Energy spent over the whole life", Formula: "plant + connection + upkeep × life + replacing, dismantling, restoring", Source: murphy,
			Inputs: []string{"input_delivered_mj", "input_upkeep_mj_per_yr", "life_yr", "input_end_mj"}, Eval: plain(func(x []float64) float64 { return x[0] + x[1]*x[2] + x[3] })},

		eroi("eroi_generation", "Energy return, at plant", "E_gen / I_plant", params.Generation, "generated_mj_life", "input_plant_mj"),
		eroi("eroi_delivered", "Energy return, at grid", "E_del / (I_plant + I_connection)", params.Delivered, "delivered_mj_life", "input_delivered_mj"),
		eroi("eroi_extended", "Energy return, whole life", "E_del / I_extended", params.Extended, "delivered_mj_life", "input_extended_mj"),
		{Name: "stock_mj", Unit: "MJ", Title: "Energy content of lost soil, peat and plant carbon", Formula: "(soil_carbon_loss_tc + biomass_carbon_loss_tc) × e_C", Source: "Gorham & Sanger 1967",
			Inputs: []string{"soil_carbon_loss_tc", "biomass_carbon_loss_tc", "carbon_energy_mj_per_kgc"},
			Eval:   scoring.NoneIsZero(plain(func(x []float64) float64 { return (x[0] + x[1]) * units.KgPerT * x[2] }))},
		{Name: "eroi_stock", Unit: "1", Title: "Energy return with stocks", Formula: "E_del / (I_extended + E_stocks)", Source: "this program's own ratio; relatives in Guzmán & González de Molina 2015",
			Inputs: []string{"delivered_mj_life", "input_extended_mj", "stock_mj"}, Eval: guarded("eroi", func(x []float64) (float64, error) {
				if x[2] >= 0 {
					if r, ok := quotient(x[0], x[1]+x[2]); ok {
						return r, nil
					}
				}
				return Balance{DeliveredMJ: x[0], Inputs: Inputs{B1MJ: x[1], B2MJ: x[1], B3MJ: x[1]}}.EROIStock(x[2], 0)
			})},
		{Name: "net_share", Unit: "1", Title: "Share left after repayment", Formula: "1 − η_G·I_extended / E_del, both as electricity", Source: murphy,
			Inputs: []string{"delivered_mj_life", "input_extended_mj", "grid_efficiency"}, Eval: guarded("net_share", func(x []float64) (float64, error) {
				if in := x[2] * x[1]; x[2] > 0 && x[2] <= 1 && x[0] > 0 && bounds.Finite(x[0]) && bounds.Finite(x[1]) {
					return 1 - in/x[0], nil
				}
				return Balance{DeliveredMJ: x[0], Inputs: Inputs{B3MJ: x[1]}}.NetShare(params.Extended, Electric, x[2])
			})},
		{Name: "net_energy_gwh_life", Unit: "GWh", Title: "Net energy over life", Formula: "(E_del − η_G·I_extended) / 3.6, as electricity", Source: murphy,
			Inputs: []string{"delivered_mj_life", "input_extended_mj", "grid_efficiency"}, Eval: guarded("net_energy", func(x []float64) (float64, error) {
				if in := float64(x[2] * x[1]); x[2] > 0 && x[2] <= 1 && bounds.Finite(x[0]) && bounds.Finite(x[1]) {
					return (x[0] - in) / units.MJPerGWh, nil
				}
				mj, err := Balance{DeliveredMJ: x[0], Inputs: Inputs{B3MJ: x[1]}}.NetMJ(params.Extended, Electric, x[2])
				return mj / units.MJPerGWh, err
			})},
		{Name: "energy_payback_yr", Unit: "yr", Title: "Energy payback time", Formula: "I_delivered / (E_first year/η_G − I_upkeep), primary equivalent", Source: "IEA-PVPS T12 methodology guidelines",
			Inputs: []string{"input_delivered_mj", "delivered_mwh_per_yr", "input_upkeep_mj_per_yr", "grid_efficiency"}, Eval: scoring.Eval{Numbers: func(x []float64) (float64, bool) {
				p, err := PaybackYears(x[0], x[1]*units.MJPerMWh, x[2], x[3])
				return p.Yr, err == nil && !p.Never
			}, Values: func(in []scoring.Value) scoring.Value {
				if v, missing := scoring.FirstMissing(in); missing {
					return v
				}
				p, err := PaybackYears(in[0].X, in[1].X*units.MJPerMWh, in[2].X, in[3].X)
				switch {
				case err != nil:
					return scoring.UnknownBecause("energy_payback")
				case p.Never:
					return scoring.NeverValue()
				}
				return scoring.Num(p.Yr)
			}}},
		{Name: "power_density_w_per_m2", Unit: "W/m2", Title: "Power per square metre", Formula: "delivered_mwh_per_yr / 8760 h / footprint_total_ha", Source: "van Zalk & Behrens 2018 for the definition",
			Inputs: []string{"delivered_mwh_per_yr", "footprint_total_ha"}, Eval: plain(wattsPerM2)},
		{Name: "power_density_direct_w_per_m2", Unit: "W/m2", Title: "Power per square metre of ground taken directly", Formula: "delivered_mwh_per_yr / 8760 h / footprint_direct_ha", Source: "van Zalk & Behrens 2018 for the definition",
			Inputs: []string{"delivered_mwh_per_yr", "footprint_direct_ha"}, Eval: plain(wattsPerM2)},
		{Name: "demand_share_frac", Unit: "1", Title: "Share of local demand", Formula: "delivered_mwh_per_yr / demand_mwh_per_yr", Source: "identity",
			Inputs: []string{"delivered_mwh_per_yr", "demand_mwh_per_yr"}, Eval: plain(func(x []float64) float64 { return x[0] / x[1] })},
		{Name: "demand_met_frac", Unit: "1", Title: "Demand met at once", Formula: "delivered_mwh_per_yr × used_at_once_share / demand_mwh_per_yr; never above one", Source: "identity over the hours of a typical year",
			Inputs: []string{"delivered_mwh_per_yr", "used_at_once_share", "demand_mwh_per_yr"}, Eval: plain(func(x []float64) float64 { return math.Min(1, x[0]*x[1]/x[2]) })},
		{Name: "surplus_mwh_per_yr", Unit: "MWh/yr", Title: "Energy beyond local demand", Formula: "delivered_mwh_per_yr × (1 − used_at_once_share)", Source: "identity over the hours of a typical year",
			Inputs: []string{"delivered_mwh_per_yr", "used_at_once_share"}, Eval: plain(func(x []float64) float64 { return x[0] * (1 - x[1]) })},
		{Name: "eroi_used", Unit: "1", Title: "Return on energy used", Formula: "E_del·(1 − unsold_share × (1 − used_at_once_share)) / I_extended, electricity out over primary energy in; what is cut off is not in E_del", Source: murphy,
			Inputs: []string{"delivered_mj_life", "input_extended_mj", "used_at_once_share", "unsold_share"}, Eval: guarded("eroi", func(x []float64) (float64, error) {
				if surplus := x[0] * (1 - x[2]); surplus >= 0 && surplus <= x[0] && x[3] >= 0 && x[3] <= 1 {
					if r, ok := quotient(x[0]-float64(x[3]*surplus), x[1]); ok {
						return r, nil
					}
				}
				return Balance{DeliveredMJ: x[0], Inputs: Inputs{B3MJ: x[1]}}.EROIUsed(Unused{SurplusMJ: x[0] * (1 - x[2]), UnsoldFrac: x[3]})
			})},
		{Name: "saving_equivalent_mwh_per_yr", Unit: "MWh/yr", Title: "Saving that equals it", Formula: "delivered × (1 − λ_dist)/(1 − ρ)", Source: "Sorrell, Dimitropoulos & Sommerville 2009 for the rebound",
			Inputs: []string{"delivered_mwh_per_yr", "distribution_loss_frac", "rebound_frac"}, Eval: guarded("saving", func(x []float64) (float64, error) { return SavingEquivalent(x[0], x[1], x[2]) })},
		{Name: "households_equiv", Unit: "1", Title: "Households supplied", Formula: "delivered_mwh_per_yr / household_mwh_per_yr", Source: "identity",
			Inputs: []string{"delivered_mwh_per_yr", "household_mwh_per_yr"}, Eval: plain(func(x []float64) float64 { return x[0] / x[1] })},
		{Name: "human_power_persons", Unit: "1", Title: "Human power equivalent", Formula: "delivered / (100 W × 8760 h)", Source: "100 W at rest: textbook value of resting metabolism",
			Inputs: []string{"delivered_mwh_per_yr", "human_power_w"}, Eval: guarded("human_power", func(x []float64) (float64, error) { return HumanPersons(x[0]*units.KWhPerMWh, x[1]) })},
	}
}

var upkeepInputs = []string{"wind_kw", "solar_kw", "wind_turbine.mj", "pv_system_mono.mj", "wind_upkeep.mj", "pv_upkeep.mj"}

// wattsPerM2 is a year's energy in MWh as mean power on an area in hectares.
func wattsPerM2(x []float64) float64 {
	return x[0] * units.KWhPerMWh * units.WPerKW / units.HoursPerYear / (x[1] * units.M2PerHa)
}

func above0(x []float64) float64 {
	if x[0] > 0 {
		return 1
	}
	return 0
}

func effectiveYears(name, title, degradation string) scoring.Quantity {
	return scoring.Quantity{Name: name, Unit: "yr", Title: title, Formula: "D(T) = (1 − (1−d)^T)/d", Source: "Jordan & Kurtz 2013 for geometric ageing",
		Inputs: []string{degradation, "life_yr"}, Eval: scoring.Guarded("life_energy", func(x []float64) (float64, error) { return EffectiveYears(x[0], x[1]) })}
}

func product(x []float64) float64 { return x[0] * x[1] }

func exceedance(name, title string, p float64) scoring.Quantity {
	return scoring.Quantity{Name: name, Unit: "MWh/yr", Title: title, Formula: "E·(1 − z·σ), normal errors, long term with one year's variation", Source: "normal distribution",
		Inputs: []string{"wind_p50_mwh", "solar_p50_mwh", "yield_sigma"}, Eval: scoring.Plain(func(x []float64) float64 {
			z := math.Sqrt2 * math.Erfinv(2*p-1)
			return math.Max(0, (x[0]+x[1])*(1-float64(z*x[2])))
		})}
}

func eroi(name, title, formula string, at params.Boundary, out, in string) scoring.Quantity {
	return scoring.Quantity{Name: name, Unit: "1", Title: title, Formula: formula + ", electricity out over primary energy in", Source: murphy,
		Inputs: []string{out, in}, Eval: scoring.Guarded("eroi", func(x []float64) (float64, error) {
			if r, ok := quotient(x[0], x[1]); ok {
				return r, nil
			}
			return Balance{GeneratedMJ: x[0], DeliveredMJ: x[0], Inputs: Inputs{B1MJ: x[1], B2MJ: x[1], B3MJ: x[1]}}.EROI(at)
		})}
}

// quotient is what Balance.EROI gives where nothing is wrong with its input, without the way there: trials ask for it
// many million times. ok is false where EROI must be asked for the fault.
func quotient(out, in float64) (r float64, ok bool) {
	return out / in, in > 0 && in <= math.MaxFloat64 && bounds.Finite(out)
}
