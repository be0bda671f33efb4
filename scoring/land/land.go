package land

import (
	"errors"

	"groundtally/scoring/bounds"
	"groundtally/scoring/units"
)

// ErrInput is wrapped by every error about a number outside its range.
var ErrInput = bounds.ErrInput

func share(name string, v float64) error {
	if !(v >= 0 && v <= 1) {
		return bounds.Error(name, v, "0 to 1")
	}
	return nil
}

// Use is a piece of ground held for some years.
type Use struct {
	AreaHa  float64
	Years   float64
	Quality float64 // 0 to 1, soil rating over its best class
	CoUse   float64 // 0 to 1, share of farming that goes on
}

// OccupationHaYr is the ground times the years it is held, O = Σ A_i·T_i, ha yr. The pieces must not
// overlap.
func OccupationHaYr(uses []Use) (float64, error) {
	var o float64
	for _, u := range uses {
		if !bounds.AllNonNegative(u.AreaHa, u.Years) {
			return 0, errors.Join(bounds.NonNegative("area", u.AreaHa), bounds.NonNegative("years", u.Years))
		}
		o += float64(u.AreaHa * u.Years)
	}
	return o, nil
}

// QualityHectares is the farmland taken, each hectare counted by its quality and by what is not farmed
// any more, Q = Σ A_i·q_i·(1 − co_i), ha.
func QualityHectares(uses []Use) (float64, error) {
	var q float64
	for _, u := range uses {
		if err := errors.Join(bounds.NonNegative("area", u.AreaHa), share("quality", u.Quality), share("co-use", u.CoUse)); err != nil {
			return 0, err
		}
		q += float64(u.AreaHa * u.Quality * (1 - u.CoUse))
	}
	return q, nil
}

// CropEnergyGJPerYr is the energy of the harvest that is no longer grown in a year,
// F = A·(1 − co)·y·e, GJ/yr.
//
// A areaHa; co coUseFrac, 0 to 1; y yieldTPerHa, t/(ha yr); e energyMJPerKg, MJ/kg, which is numerically
// GJ/t. Food energy and gross heat differ: label which e was taken. A flow: never add it to a stock loss.
func CropEnergyGJPerYr(areaHa, coUseFrac, yieldTPerHa, energyMJPerKg float64) (float64, error) {
	if !bounds.AllNonNegative(areaHa, yieldTPerHa, energyMJPerKg) || !(coUseFrac >= 0 && coUseFrac <= 1) {
		return 0, errors.Join(bounds.NonNegative("area", areaHa), share("co-use", coUseFrac), bounds.NonNegative("yield", yieldTPerHa), bounds.NonNegative("energy content", energyMJPerKg))
	}
	return areaHa * (1 - coUseFrac) * yieldTPerHa * units.KgPerT * energyMJPerKg / units.MJPerGJ, nil
}

// FoodEnergyMJPerKg turns a nutrition figure into MJ/kg.
func FoodEnergyMJPerKg(kcalPer100g float64) (float64, error) {
	if err := bounds.NonNegative("food energy", kcalPer100g); err != nil {
		return 0, err
	}
	return kcalPer100g * 10 * units.JPerCal / kJPerMJ, nil
}

const kJPerMJ = 1e3

// HeatGJPerHaYr turns a mean power per area into a yearly harvest of heat, GJ/(ha yr).
func HeatGJPerHaYr(wPerM2 float64) (float64, error) {
	if err := bounds.NonNegative("power per area", wPerM2); err != nil {
		return 0, err
	}
	return wPerM2 * units.SecondsPerYear * units.M2PerHa / (units.MJPerGJ * jPerMJ), nil
}

const jPerMJ = 1e6

// Change is what happens to a stock of carbon: a loss and a gain, both 0 or more, never netted.
type Change struct {
	LossTC, GainTC float64
}

// Add sums two changes side by side.
func (c Change) Add(d Change) Change {
	return Change{LossTC: c.LossTC + d.LossTC, GainTC: c.GainTC + d.GainTC}
}

// CO2T is the loss as carbon dioxide, t CO2, by the ratio 44/12.
func (c Change) CO2T() float64 { return c.LossTC * units.CO2PerC }

func change(lossTC float64) Change {
	if lossTC >= 0 {
		return Change{LossTC: lossTC}
	}
	return Change{GainTC: -lossTC}
}

// ForestCarbonTC is the carbon of the trees on an area, C = A·B·(1+R)·CF, t C.
//
// A areaHa; B biomassTPerHa, above-ground dry matter; R rootRatio; CF carbonFrac, t C per t dry matter.
// IPCC 2006 Guidelines Vol 4, Tier 1.
func ForestCarbonTC(areaHa, biomassTPerHa, rootRatio, carbonFrac float64) (float64, error) {
	if err := errors.Join(bounds.NonNegative("area", areaHa), bounds.NonNegative("biomass", biomassTPerHa), bounds.NonNegative("root ratio", rootRatio), share("carbon share", carbonFrac)); err != nil {
		return 0, err
	}
	return areaHa * biomassTPerHa * (1 + rootRatio) * carbonFrac, nil
}

// ForestHeatMJ is the heat content of the same trees, A·B·(1+R)·e, MJ; e heatMJPerKg of dry matter.
// Timber that is used is still gone from the stock of the land.
func ForestHeatMJ(areaHa, biomassTPerHa, rootRatio, heatMJPerKg float64) (float64, error) {
	if err := errors.Join(bounds.NonNegative("area", areaHa), bounds.NonNegative("biomass", biomassTPerHa), bounds.NonNegative("root ratio", rootRatio), bounds.NonNegative("heat content", heatMJPerKg)); err != nil {
		return 0, err
	}
	return areaHa * biomassTPerHa * (1 + rootRatio) * units.KgPerT * heatMJPerKg, nil
}

// LostSinkTC is the carbon that felled forest would have taken up, A·s·T, t C. It is a flow forgone, not
// a stock lost.
func LostSinkTC(areaHa, sinkTCPerHaYr, years float64) (float64, error) {
	if err := errors.Join(bounds.NonNegative("area", areaHa), bounds.NonNegative("sink", sinkTCPerHaYr), bounds.NonNegative("years", years)); err != nil {
		return 0, err
	}
	return areaHa * sinkTCPerHaYr * years, nil
}

// CarbonEnergyMJ is the energy content of lost carbon, E = ΔC·e_C, MJ.
//
// ΔC lossTC, t C, 0 or more; e_C energyMJPerKgC, MJ/kg C (33 to 42; Gorham & Sanger 1967, floor 32.8 for
// pure carbon). It is low-grade heat, not fuel that anybody bought.
func CarbonEnergyMJ(lossTC, energyMJPerKgC float64) (float64, error) {
	if err := errors.Join(bounds.NonNegative("carbon loss", lossTC), bounds.NonNegative("energy content", energyMJPerKgC)); err != nil {
		return 0, err
	}
	return lossTC * units.KgPerT * energyMJPerKgC, nil
}

// Regrowth is the time land needs to lay down a lost stock again, or the statement that it never does.
type Regrowth struct {
	Yr    float64
	Never bool
}

// RegrowthYears is loss over yearly growth, ΔC/(A·g). Never when nothing grows and something was lost;
// zero when nothing was lost.
func RegrowthYears(lossTC, areaHa, growthTCPerHaYr float64) (Regrowth, error) {
	if err := errors.Join(bounds.NonNegative("carbon loss", lossTC), bounds.NonNegative("area", areaHa), bounds.NonNegative("growth", growthTCPerHaYr)); err != nil {
		return Regrowth{}, err
	}
	if lossTC == 0 {
		return Regrowth{}, nil
	}
	yr := lossTC / (areaHa * growthTCPerHaYr)
	if !bounds.Finite(yr) {
		return Regrowth{Never: true}, nil
	}
	return Regrowth{Yr: yr}, nil
}
