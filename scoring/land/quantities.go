package land

import (
	"groundtally/scoring"
	"groundtally/scoring/units"
)

// Quantities gives the land account as a graph. Leaves: areas found by fitting and by laying the
// plant's ground over the layers, land-take numbers, soil, peat and forest factors.
func Quantities() []scoring.Quantity {
	plain, guarded := scoring.Plain, scoring.Guarded
	const denholm = "build-up of pads, foundations and tracks; compare Denholm et al. 2009, NREL/TP-6A2-45834"
	return []scoring.Quantity{
		{Name: "footprint_permanent_ha", Unit: "ha", Title: "Ground sealed or built", Formula: "turbines × (crane pad + foundation) + track × width + sealed share × fenced ground", Source: denholm,
			Inputs: []string{"turbines", "crane_pad_m2", "foundation_m2", "track_counted_km", "track_width_m", "fence_ha", "pv_sealed_frac"}, Eval: plain(func(x []float64) float64 {
				return (x[0]*(x[1]+x[2])+x[3]*units.MPerKm*x[4])/units.M2PerHa + float64(x[5]*x[6])
			})},
		{Name: "footprint_temporary_ha", Unit: "ha", Title: "Ground disturbed while building", Formula: "turbines × laydown + compound, for wind; trenches are not counted yet", Source: denholm,
			Inputs: []string{"turbines", "laydown_m2", "compound_m2"}, Eval: plain(func(x []float64) float64 {
				if x[0] == 0 {
					return 0
				}
				return (x[0]*x[1] + x[2]) / units.M2PerHa
			})},
		{Name: "footprint_direct_ha", Unit: "ha", Title: "Ground taken directly", Formula: "pads, foundations and tracks of wind + everything inside the solar fence", Source: denholm,
			Inputs: []string{"footprint_permanent_ha", "fence_ha", "pv_sealed_frac"}, Eval: plain(func(x []float64) float64 { return x[0] + x[1]*(1-x[2]) })},
		{Name: "footprint_total_ha", Unit: "ha", Title: "Total ground of plant", Formula: "union of the spacing ellipses inside the site, or the fence; never less than the ground taken directly", Source: "area definitions as in van Zalk & Behrens 2018",
			Inputs: []string{"plant_ground_ha", "footprint_direct_ha"}, Eval: plain(func(x []float64) float64 { return max(x[0], x[1]) })},
		{Name: "capacity_density_kw_per_ha", Unit: "kW/ha", Title: "Power per hectare", Formula: "rated_kw / footprint_total_ha", Source: "identity",
			Inputs: []string{"rated_kw", "footprint_total_ha"}, Eval: plain(func(x []float64) float64 { return x[0] / x[1] })},
		{Name: "occupation_ha_yr", Unit: "ha yr", Title: "Ground times years", Formula: "footprint_direct × life + footprint_temporary × years disturbed", Source: "land occupation as in life cycle assessment",
			Inputs: []string{"footprint_direct_ha", "life_yr", "footprint_temporary_ha", "disturbed_years"}, Eval: guarded("occupation", func(x []float64) (float64, error) {
				return OccupationHaYr([]Use{{AreaHa: x[0], Years: x[1]}, {AreaHa: x[2], Years: x[3]}})
			})},
		{Name: "crop_energy_forgone_gj_per_yr", Unit: "GJ/yr", Title: "Harvest given up", Formula: "farmland out of use × yield × energy of wheat, as long as no crop is given", Source: "yield: FAO statistics, order of magnitude; energy 334 kcal/100 g",
			Inputs: []string{"farmland_lost_ha", "crop_wheat_yield_t_per_ha", "crop_wheat_energy_mj_per_kg"}, Eval: guarded("crop", func(x []float64) (float64, error) { return CropEnergyGJPerYr(x[0], 0, x[1], x[2]) }).Where(0)},

		{Name: "soil_counted_tc_per_ha", Unit: "t C/ha", Title: "Soil carbon counted", Formula: "stock, times soil_reference_ratio where it goes by soil class", Source: "IPCC 2006 Guidelines vol. 4, Tier 1",
			Inputs: []string{"soil_stock_tc_per_ha", "soil_by_class", "soil_reference_ratio"}, Eval: plain(func(x []float64) float64 {
				if x[1] == 0 {
					return x[0]
				}
				return x[0] * x[2]
			})},
		{Name: "soil_loss_mineral_tc", Unit: "t C", Title: "Carbon lost from mineral soil", Formula: "stock × (sealed ground × f_sealed + disturbed ground × f_restored + fenced grassland × f_panels), off peat", Source: "stock: soil layer; loss shares: assumptions of this program",
			Inputs: []string{"soil_counted_tc_per_ha", "footprint_permanent_ha", "footprint_temporary_ha", "fence_grass_ha", "peat_share", "loss_sealed_kept_frac", "loss_restored_frac", "loss_pv_grassland_frac", "pv_sealed_frac"},
			Eval: scoring.NoneIsZero(guarded("soil", func(x []float64) (float64, error) {
				off := 1 - x[4]
				sum := Change{}
				for _, p := range [3][2]float64{{x[1] * off, x[5]}, {x[2] * off, x[6]}, {x[3] * off * (1 - x[8]), x[7]}} {
					if p[0] == 0 {
						continue
					}
					c, err := DisturbanceChange(p[0], x[0], p[1])
					if err != nil {
						return 0, err
					}
					sum = sum.Add(c)
				}
				return sum.LossTC, nil
			}))},
		{Name: "peat_dug_ha", Unit: "ha", Title: "Peat dug away", Formula: "sealed ground × share on peat", Source: "identity",
			Inputs: []string{"footprint_permanent_ha", "peat_share"}, Eval: scoring.NoneIsZero(plain(func(x []float64) float64 { return x[0] * x[1] }))},
		{Name: "peat_drained_ha", Unit: "ha", Title: "Peat drained", Formula: "strips beside tracks and around pits on peat, fenced peat that is not dug", Source: "strips after Nayak et al. 2008; fenced peat taken as drained: assumption of this program",
			Inputs: []string{"peat_share", "track_counted_km", "turbines", "fence_ha", "peat_drain_width_m", "pv_sealed_frac"},
			Eval: scoring.NoneIsZero(guarded("peat", func(x []float64) (float64, error) {
				if x[0] == 0 {
					return 0, nil
				}
				strips, err := DrainedAreaHa(x[1]*units.MPerKm*x[0], nil, x[4])
				if err != nil {
					return 0, err
				}
				ring, err := DrainedAreaHa(0, []float64{pitPerimeterM}, x[4])
				if err != nil {
					return 0, err
				}
				return strips + float64(x[2]*x[0]*ring) + float64(x[3]*x[0]*(1-x[5])), nil
			})).Where(0)},
		{Name: "soil_loss_peat_tc", Unit: "t C", Title: "Carbon lost from peat", Formula: "dug: area × depth × carbon × share oxidised; drained: area × emission × life; never more than the stock", Source: "IPCC 2013 Wetlands Supplement",
			Inputs: []string{"peat_dug_ha", "peat_drained_ha", "peat_depth_m", "peat_carbon_kg_per_m3", "peat_oxidised_share", "peat_drained_tc_per_ha_yr", "life_yr"},
			Eval: scoring.NoneIsZero(guarded("peat", func(x []float64) (float64, error) {
				if x[0] == 0 && x[1] == 0 { // no peat is touched
					return 0, nil
				}
				loss, err := Peat{DepthM: x[2], CarbonKgPerM3: x[3], ExcavatedHa: x[0], ExcavatedDepthM: x[2], OxidisedFrac: x[4],
					DrainedHa: x[1], DrainDepthM: x[2], EmissionTCPerHaYr: x[5], DrainYears: x[6]}.Loss()
				return loss.TotalTC, err
			})).Where(0, 1)},
		{Name: "soil_carbon_loss_tc", Unit: "t C", Title: "Soil carbon lost", Formula: "mineral soil + peat", Source: "IPCC 2006 Guidelines vol. 4, Tier 1 form",
			Inputs: []string{"soil_loss_mineral_tc", "soil_loss_peat_tc"}, Eval: plain(func(x []float64) float64 { return x[0] + x[1] })},
		{Name: "soil_carbon_gain_tc", Unit: "t C", Title: "Soil carbon gained", Formula: "fenced ploughland × stock/F_LU × (1 − F_LU) × shade factor × min(1, T/20)", Source: "IPCC 2019 Refinement vol. 4, F_LU of long-term cropland",
			Inputs: []string{"fence_arable_ha", "soil_counted_tc_per_ha", "cropland_use_factor", "gain_pv_shade_multiplier", "life_yr", "soc_transition_yr", "peat_share"},
			Eval: scoring.Eval{Numbers: func(x []float64) (float64, bool) {
				if x[0] == 0 {
					return 0, false
				}
				y, err := GrassGainTC(x[0]*(1-x[6]), x[1]/x[2], x[2], x[3], x[4], x[5])
				return y, err == nil
			}, Values: func(in []scoring.Value) scoring.Value {
				if in[0].OK() && in[0].X == 0 {
					return scoring.NoneBecause("no change of land use that gains")
				}
				return scoring.NoneIsZero(guarded("soil_gain", func(x []float64) (float64, error) {
					return GrassGainTC(x[0]*(1-x[6]), x[1]/x[2], x[2], x[3], x[4], x[5])
				})).Values(in)
			}}},
		{Name: "biomass_carbon_loss_tc", Unit: "t C", Title: "Plant carbon lost", Formula: "forest cleared × dry matter × (1 + root share) × carbon share", Source: "IPCC 2006 Guidelines vol. 4 tables 4.4 and 4.7",
			Inputs: []string{"forest_ha", "forest_biomass_tdm_per_ha", "forest_root_ratio", "biomass_carbon_frac"}, Eval: guarded("biomass", func(x []float64) (float64, error) { return ForestCarbonTC(x[0], x[1], x[2], x[3]) }).Where(0)},
		{Name: "regrowth_yr", Unit: "yr", Title: "Years to grow back", Formula: "the longer of: peat carbon lost / ((peat dug + drained) × growth of a bog); 20 yr for mineral soil", Source: "Nayak et al. 2008 for the growth of a bog; IPCC 2006 for the 20 yr",
			Inputs: []string{"soil_loss_mineral_tc", "soil_loss_peat_tc", "peat_dug_ha", "peat_drained_ha", "regrowth_peat_tc_per_ha_yr", "soc_transition_yr"}, Eval: scoring.NoneIsZero(scoring.Eval{Numbers: func(x []float64) (float64, bool) {
				mineral, peat := x[0], x[1]
				if mineral <= 0 && peat <= 0 {
					return 0, false
				}
				yr := 0.0
				if mineral > 0 {
					yr = x[5]
				}
				if peat > 0 {
					r, err := RegrowthYears(peat, x[2]+x[3], x[4])
					if err != nil || r.Never {
						return 0, false
					}
					yr = max(yr, r.Yr)
				}
				return yr, true
			}, Values: func(in []scoring.Value) scoring.Value {
				if v, missing := scoring.FirstMissing(in); missing {
					return v
				}
				mineral, peat := in[0].X, in[1].X
				if mineral <= 0 && peat <= 0 {
					return scoring.NoneBecause("no carbon lost")
				}
				yr := 0.0
				if mineral > 0 {
					yr = in[5].X
				}
				if peat > 0 {
					r, err := RegrowthYears(peat, in[2].X+in[3].X, in[4].X)
					switch {
					case err != nil:
						return scoring.UnknownBecause("regrowth")
					case r.Never:
						return scoring.NeverValue()
					}
					yr = max(yr, r.Yr)
				}
				return scoring.Num(yr)
			}})},
	}
}

// pitPerimeterM is the outline of a turbine's foundation pit, a circle of 20 m across.
const pitPerimeterM = 62.8
