package climate

import (
	"errors"
	"math"

	"groundtally/scoring/bounds"
	"groundtally/scoring/units"
)

// ErrInput is wrapped by every error about a number outside its range.
var ErrInput = bounds.ErrInput

// CO2FromCarbonT turns carbon into carbon dioxide by 44/12, t CO2.
func CO2FromCarbonT(carbonT float64) (float64, error) {
	if !bounds.Finite(carbonT) {
		return 0, bounds.Error("carbon", carbonT, "a finite number")
	}
	return carbonT * units.CO2PerC, nil
}

// GPerKWh is the greenhouse gas of the life for each kilowatt-hour delivered, g CO2e/kWh,
// g = (G_lc + G_land)/(E_del/3.6).
//
// G totalTCO2e, t CO2e, plant and land together, may be negative when gains are counted; E_del
// deliveredMJ, MJ, above 0.
func GPerKWh(totalTCO2e, deliveredMJ float64) (float64, error) {
	if !bounds.Finite(totalTCO2e) {
		return 0, bounds.Error("greenhouse gas", totalTCO2e, "a finite number")
	}
	if err := bounds.Positive("energy delivered", deliveredMJ); err != nil {
		return 0, err
	}
	return totalTCO2e * units.KgPerT * units.GPerKg / (deliveredMJ / units.MJPerKWh), nil
}

// LifeCycleT is the greenhouse gas of the plant from a published figure, G_lc = g_lc·E_gen/3.6, t CO2e.
//
// g_lc gPerKWh of energy generated; E_gen generatedMJ.
func LifeCycleT(gPerKWh, generatedMJ float64) (float64, error) {
	if err := errors.Join(bounds.NonNegative("life-cycle figure", gPerKWh), bounds.NonNegative("energy generated", generatedMJ)); err != nil {
		return 0, err
	}
	return gPerKWh * (generatedMJ / units.MJPerKWh) / units.GPerKg / units.KgPerT, nil
}

// RescaledSolarG carries a published solar figure to another place,
// g·(H_ref·PR_ref·T_ref)/(H·PR·T), g CO2e/kWh.
//
// H irradiation, kWh/(m2 yr); PR performance ratio; T life, yr. It holds where the plant itself is alike.
// Hsu et al. 2012, Kim et al. 2012.
func RescaledSolarG(gRef, hRef, prRef, lifeRef, h, pr, life float64) (float64, error) {
	if err := errors.Join(bounds.NonNegative("life-cycle figure", gRef), bounds.Positive("reference irradiation", hRef), bounds.Positive("reference performance ratio", prRef), bounds.Positive("reference life", lifeRef), bounds.Positive("irradiation", h), bounds.Positive("performance ratio", pr), bounds.Positive("life", life)); err != nil {
		return 0, err
	}
	return gRef * (hRef * prRef * lifeRef) / (h * pr * life), nil
}

// RescaledWindG carries a published wind figure to another place, g·(CF_ref·T_ref)/(CF·T), g CO2e/kWh.
//
// CF capacity factor; T life, yr. Dolan & Heath 2012 harmonise to CF 0.30 and 20 yr.
func RescaledWindG(gRef, cfRef, lifeRef, cf, life float64) (float64, error) {
	if err := errors.Join(bounds.NonNegative("life-cycle figure", gRef), bounds.Positive("reference capacity factor", cfRef), bounds.Positive("reference life", lifeRef), bounds.Positive("capacity factor", cf), bounds.Positive("life", life)); err != nil {
		return 0, err
	}
	return gRef * (cfRef * lifeRef) / (cf * life), nil
}

// Grid is what the plant displaces: a factor for the first year and how fast it falls.
type Grid struct {
	KgPerKWh     float64 // EF_0, kg CO2e/kWh in the first year
	DeclinePerYr float64 // δ, 0 to below 1
}

func (g Grid) check() error {
	if err := bounds.NonNegative("grid factor", g.KgPerKWh); err != nil {
		return err
	}
	if !(g.DeclinePerYr >= 0 && g.DeclinePerYr < 1) {
		return bounds.Error("decline of the grid factor", g.DeclinePerYr, "0 to below 1")
	}
	return nil
}

// DisplacedT is the greenhouse gas displaced in the first n years, t CO2e.
//
//	S(n) = Σ_{t=1..n} E_1·(1−d)^(t−1)·EF_0·(1−δ)^(t−1) = E_1·EF_0·(1−q^n)/(1−q),  q = (1−d)(1−δ)
//
// E_1 firstYearKWh delivered, kWh; d degradationPerYr, 0 to below 1; EF_0, δ in grid. Years that are not
// whole are interpolated by the closed form.
func DisplacedT(firstYearKWh, degradationPerYr, years float64, grid Grid) (float64, error) {
	if err := displacedInput(firstYearKWh, degradationPerYr, years, grid); err != nil {
		return 0, err
	}
	return declineOf(degradationPerYr, grid.DeclinePerYr).displacedT(firstYearT(firstYearKWh, grid.KgPerKWh), years), nil
}

// firstYearT is what the first year displaces, t CO2e.
func firstYearT(kWh, kgPerKWh float64) float64 { return kWh * kgPerKWh / units.KgPerT }

// decline is how what a plant displaces falls from year to year: the logarithm of q = (1−d)(1−δ), and q − 1.
type decline struct{ ln, fall float64 }

func declineOf(degradationPerYr, gridDeclinePerYr float64) decline {
	ln := math.Log1p(-degradationPerYr) + math.Log1p(-gridDeclinePerYr)
	return decline{ln, math.Expm1(ln)}
}

func (d decline) displacedT(firstYearT, years float64) float64 {
	if d.ln == 0 {
		return firstYearT * years
	}
	return firstYearT * math.Expm1(years*d.ln) / d.fall
}

func displacedInput(firstYearKWh, degradationPerYr, years float64, grid Grid) error {
	if !bounds.AllNonNegative(firstYearKWh, years, grid.KgPerKWh) || !(grid.DeclinePerYr >= 0 && grid.DeclinePerYr < 1) {
		return errors.Join(bounds.NonNegative("energy delivered", firstYearKWh), bounds.NonNegative("years", years), grid.check())
	}
	if !(degradationPerYr >= 0 && degradationPerYr < 1) {
		return bounds.Error("degradation", degradationPerYr, "0 to below 1")
	}
	return nil
}

// Payback is a time, or the statement that it never comes. Yr is zero when Never.
type Payback struct {
	Yr    float64
	Never bool
}

// Within reports whether the payback comes before the plant is taken down.
func (p Payback) Within(lifeYr float64) bool { return !p.Never && p.Yr <= lifeYr }

// PaybackYears is the time until the emissions displaced equal those caused,
//
//	N* = ln(1 − G·(1−q)/(E_1·EF_0))/ln q,  q = (1−d)(1−δ);   q = 1: N* = G/(E_1·EF_0)
//
// G causedTCO2e, t CO2e, all booked at the start, which is cautious; the other symbols as in DisplacedT.
// Never when G·(1−q) ≥ E_1·EF_0: the sum of all years to come stays below G. Zero when G is zero or less.
// lifeYr above zero also gives never when the time is longer than the life, since a plant that is gone
// displaces nothing; zero leaves the life out.
func PaybackYears(causedTCO2e, firstYearKWh, degradationPerYr float64, grid Grid, lifeYr float64) (Payback, error) {
	if !bounds.Finite(causedTCO2e) {
		return Payback{}, bounds.Error("greenhouse gas", causedTCO2e, "a finite number")
	}
	if err := bounds.NonNegative("life", lifeYr); err != nil {
		return Payback{}, err
	}
	if err := displacedInput(firstYearKWh, degradationPerYr, 1, grid); err != nil {
		return Payback{}, err
	}
	return declineOf(degradationPerYr, grid.DeclinePerYr).payback(causedTCO2e, firstYearT(firstYearKWh, grid.KgPerKWh), lifeYr), nil
}

// payback is PaybackYears of what was checked.
func (d decline) payback(causedTCO2e, firstYearT, lifeYr float64) Payback {
	if causedTCO2e <= 0 {
		return Payback{}
	}
	a := firstYearT
	if d.ln != 0 {
		a = a * d.fall / d.fall // displacedT of one year, to the digit
	}
	left := -d.fall * causedTCO2e // G·(1−q)
	if a <= 0 || left >= a {
		return Payback{Never: true}
	}
	n := causedTCO2e / a
	if d.ln != 0 {
		n = math.Log1p(-left/a) / d.ln
	}
	if !bounds.Finite(n) || (lifeYr > 0 && n > lifeYr) {
		return Payback{Never: true}
	}
	return Payback{Yr: n}
}
