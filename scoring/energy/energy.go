package energy

import (
	"fmt"
	"math"

	"groundtally/scoring/bounds"
	"groundtally/scoring/params"
	"groundtally/scoring/units"
)

// ErrInput is wrapped by every error about a number outside its range.
var ErrInput = bounds.ErrInput

// EffectiveYears is the life counted in years of first-year output.
//
//	D(T) = Σ_{t=1..T} (1−d)^(t−1) = (1−(1−d)^T)/d,   d = 0: T
//
// d degradationPerYr, 1/yr, 0 ≤ d < 1; T lifeYr, yr, T > 0. A life that is not whole is interpolated by
// the closed form. Geometric degradation as in Jordan & Kurtz 2013.
func EffectiveYears(degradationPerYr, lifeYr float64) (float64, error) {
	d, T := degradationPerYr, lifeYr
	if !(d >= 0 && d < 1) {
		return 0, bounds.Error("degradation", d, "0 to below 1")
	}
	if !(T > 0) || !bounds.Finite(T) {
		return 0, bounds.Error("life", T, "above 0")
	}
	if d == 0 {
		return T, nil
	}
	return -math.Expm1(T*math.Log1p(-d)) / d, nil
}

// EffectiveYearsLinear is the same for output that falls by a fixed share of the first year.
//
//	Σ_{t=1..T} (1 − d(t−1)) = T − d·T(T−1)/2
//
// d degradationPerYr, 1/yr; T lifeYr, yr, T ≥ 1; d(T−1) ≤ 1, else the last years would give less than
// nothing. The rule of the IEA-PVPS Task 12 guidelines.
func EffectiveYearsLinear(degradationPerYr, lifeYr float64) (float64, error) {
	d, T := degradationPerYr, lifeYr
	if !(T >= 1) || !bounds.Finite(T) {
		return 0, bounds.Error("life", T, "1 or more")
	}
	if !(d >= 0 && d*(T-1) <= 1) {
		return 0, bounds.Error("degradation", d, "0 to 1/(life−1)")
	}
	return T - d*T*(T-1)/2, nil
}

// GeneratedMJ is the electricity of the life at the plant's terminals, E_gen = 3.6·Y1·D(T).
//
// Y1 firstYearKWh, kWh/yr; D effectiveYears, yr.
func GeneratedMJ(firstYearKWh, effectiveYears float64) (float64, error) {
	if !(firstYearKWh >= 0) || !bounds.Finite(firstYearKWh) {
		return 0, bounds.Error("first-year yield", firstYearKWh, "0 or more")
	}
	if !(effectiveYears > 0) || !bounds.Finite(effectiveYears) {
		return 0, bounds.Error("effective years", effectiveYears, "above 0")
	}
	return units.MJPerKWh * firstYearKWh * effectiveYears, nil
}

// DeliveredMJ is the electricity of the life at the grid connection, E_del = (1−λ)·E_gen − E_aux.
//
// λ lossFrac, share lost between plant and grid, 0 to 1; E_gen generatedMJ; E_aux auxiliaryMJ, standby
// electricity imported that the yield has not taken off. May be negative when a plant draws more than it
// gives.
func DeliveredMJ(generatedMJ, lossFrac, auxiliaryMJ float64) (float64, error) {
	if !(lossFrac >= 0 && lossFrac <= 1) {
		return 0, bounds.Error("loss", lossFrac, "0 to 1")
	}
	if !(generatedMJ >= 0) || !bounds.Finite(generatedMJ) {
		return 0, bounds.Error("generated energy", generatedMJ, "0 or more")
	}
	if !(auxiliaryMJ >= 0) || !bounds.Finite(auxiliaryMJ) {
		return 0, bounds.Error("auxiliary energy", auxiliaryMJ, "0 or more")
	}
	return float64((1-lossFrac)*generatedMJ) - auxiliaryMJ, nil
}

// Input is primary energy spent on one thing over the life, inside the boundary at which it first counts.
type Input struct {
	ItemID   string
	Boundary params.Boundary
	MJ       float64
}

// Inputs are the cumulative inputs at each boundary: B2 includes B1, B3 includes B2.
type Inputs struct {
	B1MJ, B2MJ, B3MJ float64
}

// Sum adds inputs in the given order into cumulative totals. An input without a boundary or below zero
// is refused; a recycling credit is no input.
func Sum(inputs []Input) (Inputs, error) {
	var own [3]float64
	for _, in := range inputs {
		if !(in.MJ >= 0) || !bounds.Finite(in.MJ) {
			return Inputs{}, fmt.Errorf("input %s: %w", in.ItemID, bounds.Error("energy", in.MJ, "0 or more"))
		}
		switch in.Boundary {
		case params.Generation:
			own[0] += in.MJ
		case params.Delivered:
			own[1] += in.MJ
		case params.Extended:
			own[2] += in.MJ
		default:
			return Inputs{}, fmt.Errorf("input %s: boundary %q: %w", in.ItemID, in.Boundary, ErrInput)
		}
	}
	return Inputs{B1MJ: own[0], B2MJ: own[0] + own[1], B3MJ: own[0] + own[1] + own[2]}, nil
}

// At gives the total at a boundary.
func (i Inputs) At(b params.Boundary) (float64, error) {
	switch b {
	case params.Generation:
		return i.B1MJ, nil
	case params.Delivered:
		return i.B2MJ, nil
	case params.Extended:
		return i.B3MJ, nil
	}
	return 0, fmt.Errorf("boundary %q: %w", b, ErrInput)
}

// Balance is what a plant gives and what it takes over its life.
type Balance struct {
	GeneratedMJ float64 // electricity at the plant's terminals
	DeliveredMJ float64 // electricity at the grid
	Inputs      Inputs  // primary energy
}

// Out gives the numerator of a boundary: generated for B1, delivered for B2 and B3.
func (b Balance) Out(at params.Boundary) float64 {
	if at == params.Generation {
		return b.GeneratedMJ
	}
	return b.DeliveredMJ
}

// EROI is the energy return of a boundary, EROI_b = E_b / I_b, electricity out over primary energy in.
//
// Murphy et al. 2011; IEA-PVPS T12 writes it EROI_el. Inputs must be above zero.
func (b Balance) EROI(at params.Boundary) (float64, error) {
	I, err := b.Inputs.At(at)
	if err != nil {
		return 0, err
	}
	if !(I > 0) || !bounds.Finite(I) {
		return 0, bounds.Error("energy spent", I, "above 0")
	}
	E := b.Out(at)
	if !bounds.Finite(E) {
		return 0, bounds.Error("energy given", E, "a finite number")
	}
	return E / I, nil
}

// EROIPrimary is the return with the output counted as the primary energy that the grid would spend,
// EROI_PEeq,b = (E_b/η_G) / I_b.
//
// η_G gridEfficiency, MJ electric per MJ primary, above 0 to 1. It shares no axis with EROI. IEA-PVPS T12.
func (b Balance) EROIPrimary(at params.Boundary, gridEfficiency float64) (float64, error) {
	if err := efficiency(gridEfficiency); err != nil {
		return 0, err
	}
	e, err := b.EROI(at)
	return e / gridEfficiency, err
}

// EROIStock is this program's own ratio: the whole-life return with the energy content of lost soil,
// peat and plant carbon counted as spent.
//
//	EROI_stock = E_del / (I_B3 + E_soil + E_bio)
//
// E_soil soilMJ, E_bio biomassMJ: energy content of net losses, MJ, 0 or more; gains are not netted. It
// is shown beside EROI, never in its place. Its relatives are the returns with environmental inputs of
// Murphy et al. 2011, Guzmán & González de Molina 2015 and Tello et al. 2015.
func (b Balance) EROIStock(soilMJ, biomassMJ float64) (float64, error) {
	if !(soilMJ >= 0) || !bounds.Finite(soilMJ) {
		return 0, bounds.Error("energy content of soil", soilMJ, "0 or more")
	}
	if !(biomassMJ >= 0) || !bounds.Finite(biomassMJ) {
		return 0, bounds.Error("energy content of plants", biomassMJ, "0 or more")
	}
	b.Inputs.B3MJ += soilMJ + biomassMJ
	return b.EROI(params.Extended)
}

// Drawdown is the energy content of lost stocks as a share of the energy delivered,
// (E_soil + E_bio)/E_del.
func (b Balance) Drawdown(soilMJ, biomassMJ float64) (float64, error) {
	if !(b.DeliveredMJ > 0) {
		return 0, bounds.Error("energy delivered", b.DeliveredMJ, "above 0")
	}
	if !(soilMJ >= 0 && biomassMJ >= 0) || !bounds.Finite(soilMJ+biomassMJ) {
		return 0, bounds.Error("energy content of stocks", soilMJ+biomassMJ, "0 or more")
	}
	return (soilMJ + biomassMJ) / b.DeliveredMJ, nil
}

// Currency is the kind of energy in which a net figure is stated.
type Currency uint8

// The currencies of net energy.
const (
	AsAccounted Currency = iota // electricity out less primary energy in, kinds mixed
	Primary                     // both as primary energy: E/η_G − I
	Electric                    // both as electricity: E − η_G·I, the headline
)

// String names the currency as it is printed beside a figure.
func (c Currency) String() string {
	switch c {
	case AsAccounted:
		return "as accounted"
	case Primary:
		return "primary"
	case Electric:
		return "electric"
	}
	return "unknown"
}

// NetMJ is the net energy of a boundary over the life.
//
//	AsAccounted NE = E − I;   Primary NE = E/η_G − I;   Electric NE = E − η_G·I
//
// η_G gridEfficiency, above 0 to 1; not used as accounted. May be negative.
func (b Balance) NetMJ(at params.Boundary, c Currency, gridEfficiency float64) (float64, error) {
	out, in, err := b.like(at, c, gridEfficiency)
	return out - in, err
}

// NetShare is the share of the energy given that is left after the energy spent, 1 − I/E, both in the
// given currency; as accounted it is 1 − 1/EROI. May be negative. E must be above zero.
func (b Balance) NetShare(at params.Boundary, c Currency, gridEfficiency float64) (float64, error) {
	out, in, err := b.like(at, c, gridEfficiency)
	if err != nil {
		return 0, err
	}
	if !(out > 0) {
		return 0, bounds.Error("energy given", out, "above 0")
	}
	return 1 - in/out, nil
}

func (b Balance) like(at params.Boundary, c Currency, eta float64) (out, in float64, err error) {
	if in, err = b.Inputs.At(at); err != nil {
		return 0, 0, err
	}
	out = b.Out(at)
	if !bounds.Finite(out) || !bounds.Finite(in) {
		return 0, 0, bounds.Error("balance", out+in, "finite numbers")
	}
	if c == AsAccounted {
		return out, in, nil
	}
	if err = efficiency(eta); err != nil {
		return 0, 0, err
	}
	switch c {
	case Primary:
		return out / eta, in, nil
	case Electric:
		return out, eta * in, nil
	}
	return 0, 0, fmt.Errorf("currency %d: %w", c, ErrInput)
}

func efficiency(eta float64) error {
	if !(eta > 0 && eta <= 1) {
		return bounds.Error("grid efficiency", eta, "above 0 to 1")
	}
	return nil
}

// NetToGross is the share left of a return, NTG = 1 − 1/EROI, for an EROI above zero.
func NetToGross(eroi float64) (float64, error) {
	if !(eroi > 0) || !bounds.Finite(eroi) {
		return 0, bounds.Error("energy return", eroi, "above 0")
	}
	return 1 - 1/eroi, nil
}

// Payback is a time, or the statement that it never comes. Yr is zero when Never.
type Payback struct {
	Yr    float64
	Never bool
}

// PaybackYears is the energy payback time.
//
//	EPBT = I_capital / (E_a/η_G − I_O&M,a)
//
// I_capital capitalMJ, primary energy of building; E_a annualMJ, electricity of the first (or mean) year,
// the caller states which; I_O&M,a upkeepMJPerYr, primary energy per year; η_G gridEfficiency. With η_G 1
// it is the electric payback, which is about 1/η_G longer and must be labelled. Never when the yearly
// surplus is zero or less. A payback beyond the life is given as it is. IEA-PVPS T12.
func PaybackYears(capitalMJ, annualMJ, upkeepMJPerYr, gridEfficiency float64) (Payback, error) {
	if err := efficiency(gridEfficiency); err != nil {
		return Payback{}, err
	}
	if !(capitalMJ >= 0) || !bounds.Finite(capitalMJ) {
		return Payback{}, bounds.Error("energy of building", capitalMJ, "0 or more")
	}
	if !bounds.Finite(annualMJ) {
		return Payback{}, bounds.Error("yearly energy", annualMJ, "a finite number")
	}
	if !(upkeepMJPerYr >= 0) || !bounds.Finite(upkeepMJPerYr) {
		return Payback{}, bounds.Error("upkeep", upkeepMJPerYr, "0 or more")
	}
	net := annualMJ/gridEfficiency - upkeepMJPerYr
	if net <= 0 {
		return Payback{Never: true}, nil
	}
	yr := capitalMJ / net
	if !bounds.Finite(yr) {
		return Payback{Never: true}, nil
	}
	return Payback{Yr: yr}, nil
}

// CapitalFromPayback turns a published payback back into primary energy per kilowatt, GJ/kWp.
//
//	I = EPBT·H·PR·3.6/η_G
//
// H irradiationKWhPerM2, kWh/(m2 yr), numerically kWh/kWp at PR 1; PR performanceRatio.
func CapitalFromPayback(paybackYr, irradiationKWhPerM2, performanceRatio, gridEfficiency float64) (float64, error) {
	if err := efficiency(gridEfficiency); err != nil {
		return 0, err
	}
	for _, v := range []float64{paybackYr, irradiationKWhPerM2, performanceRatio} {
		if !(v > 0) || !bounds.Finite(v) {
			return 0, bounds.Error("payback, irradiation or performance ratio", v, "above 0")
		}
	}
	return paybackYr * irradiationKWhPerM2 * performanceRatio * units.MJPerKWh / gridEfficiency / units.MJPerGJ, nil
}

// PowerDensityWPerM2 is the mean power delivered over the life per ground area,
// p = E_del/(T·3.1536e7 s)/A.
//
// E_del deliveredMJ; T lifeYr; A areaHa. State which area was taken: definitions explain most of the
// spread between published figures (van Zalk & Behrens 2018).
func PowerDensityWPerM2(deliveredMJ, lifeYr, areaHa float64) (float64, error) {
	if !(lifeYr > 0) || !bounds.Finite(lifeYr) {
		return 0, bounds.Error("life", lifeYr, "above 0")
	}
	if !(areaHa > 0) || !bounds.Finite(areaHa) {
		return 0, bounds.Error("area", areaHa, "above 0")
	}
	if !bounds.Finite(deliveredMJ) {
		return 0, bounds.Error("energy delivered", deliveredMJ, "a finite number")
	}
	return deliveredMJ * jPerMJ / (lifeYr * units.SecondsPerYear) / (areaHa * units.M2PerHa), nil
}

const jPerMJ = 1e6

// ReinvestedShare is the share of its gross output that a fleet growing at a steady rate spends on new
// plants, φ = r·EPBT; above 1 the fleet as a whole is a sink while it grows.
//
// r growthPerYr, 1/yr; EPBT paybackYr. Grimmer 1981; Dale & Benson 2013.
func ReinvestedShare(growthPerYr, paybackYr float64) (float64, error) {
	if !(growthPerYr >= 0) || !bounds.Finite(growthPerYr) {
		return 0, bounds.Error("growth", growthPerYr, "0 or more")
	}
	if !(paybackYr >= 0) || !bounds.Finite(paybackYr) {
		return 0, bounds.Error("payback", paybackYr, "0 or more")
	}
	return growthPerYr * paybackYr, nil
}

// SavingEquivalent is the yearly saving at the place of use that does the same as a site,
// S = E·(1−λ_dist)/(1−ρ).
//
// E deliveredMWhPerYr; λ_dist distributionLossFrac, 0 to 1; ρ reboundFrac, the share of a saving that is
// eaten by more use, 0 to below 1 (households 0.1 to 0.3, Sorrell et al. 2009).
func SavingEquivalent(deliveredMWhPerYr, distributionLossFrac, reboundFrac float64) (float64, error) {
	if !bounds.Finite(deliveredMWhPerYr) || deliveredMWhPerYr < 0 {
		return 0, bounds.Error("energy delivered", deliveredMWhPerYr, "0 or more")
	}
	if !(distributionLossFrac >= 0 && distributionLossFrac <= 1) {
		return 0, bounds.Error("distribution loss", distributionLossFrac, "0 to 1")
	}
	if !(reboundFrac >= 0 && reboundFrac < 1) {
		return 0, bounds.Error("rebound", reboundFrac, "0 to below 1")
	}
	return deliveredMWhPerYr * (1 - distributionLossFrac) / (1 - reboundFrac), nil
}

// HumanPersons is the number of people whose continuous bodily power the yearly energy equals,
// E/(P·8760 h).
//
// E deliveredKWhPerYr; P bodyW, W per person (100 W at rest).
func HumanPersons(deliveredKWhPerYr, bodyW float64) (float64, error) {
	if !bounds.Finite(deliveredKWhPerYr) || deliveredKWhPerYr < 0 {
		return 0, bounds.Error("energy delivered", deliveredKWhPerYr, "0 or more")
	}
	if !(bodyW > 0) || !bounds.Finite(bodyW) {
		return 0, bounds.Error("body power", bodyW, "above 0")
	}
	return deliveredKWhPerYr / (bodyW / units.WPerKW * units.HoursPerYear), nil
}

// Mass is an amount of one material with its embodied primary energy.
type Mass struct {
	Material string
	Kg       float64
	MJPerKg  float64
}

// EmbodiedMJ is the primary energy of a bill of materials, Σ m·e.
func EmbodiedMJ(bill []Mass) (float64, error) {
	var sum float64
	for _, m := range bill {
		if !(m.Kg >= 0) || !bounds.Finite(m.Kg) || !(m.MJPerKg >= 0) || !bounds.Finite(m.MJPerKg) {
			return 0, fmt.Errorf("material %s: %w", m.Material, bounds.Error("mass or factor", math.Min(m.Kg, m.MJPerKg), "0 or more"))
		}
		sum += float64(m.Kg * m.MJPerKg)
	}
	return sum, nil
}
