package land

import (
	"errors"
	"math"

	"groundtally/scoring/bounds"
	"groundtally/scoring/units"
)

// PeatStockTCPerHa is the carbon in peat, c_v·depth, t C/ha.
//
// depth depthM, m; c_v carbonKgPerM3, kg C per cubic metre (37 to 80; 53 is a bulk density of 0.1 t/m3
// with a carbon share of 0.53).
func PeatStockTCPerHa(depthM, carbonKgPerM3 float64) (float64, error) {
	if !bounds.AllNonNegative(depthM, carbonKgPerM3) {
		return 0, errors.Join(bounds.NonNegative("depth", depthM), bounds.NonNegative("carbon density", carbonKgPerM3))
	}
	return depthM * units.M2PerHa * carbonKgPerM3 / units.KgPerT, nil
}

// ExcavatedPeatTC is the carbon lost from dug peat, V·c_v·s, t C.
//
// V volumeM3; c_v carbonKgPerM3; s oxidisedFrac, 0 to 1, the share that oxidises (1 unless restored wet).
func ExcavatedPeatTC(volumeM3, carbonKgPerM3, oxidisedFrac float64) (float64, error) {
	if !bounds.AllNonNegative(volumeM3, carbonKgPerM3) || !(oxidisedFrac >= 0 && oxidisedFrac <= 1) {
		return 0, errors.Join(bounds.NonNegative("volume", volumeM3), bounds.NonNegative("carbon density", carbonKgPerM3), share("oxidised share", oxidisedFrac))
	}
	return volumeM3 * carbonKgPerM3 / units.KgPerT * oxidisedFrac, nil
}

// DrainedPeatTC is the carbon lost from drained peat, min(EF·A·t, stock), t C.
//
// EF emissionTCPerHaYr, t C/(ha yr), IPCC 2013 Wetlands Supplement Table 2.1; A areaHa; t years, life plus
// restoration; stock stockTC, carbon down to the drains. The loss never exceeds the stock.
func DrainedPeatTC(emissionTCPerHaYr, areaHa, years, stockTC float64) (float64, error) {
	if !bounds.AllNonNegative(emissionTCPerHaYr, areaHa, years, stockTC) {
		return 0, errors.Join(bounds.NonNegative("emission factor", emissionTCPerHaYr), bounds.NonNegative("area", areaHa), bounds.NonNegative("years", years), bounds.NonNegative("stock", stockTC))
	}
	return min(emissionTCPerHaYr*areaHa*years, stockTC), nil
}

// DrainedAreaHa is the ground drained along tracks and around pits, Σ 2·L·w + Σ (p·w + π·w²), ha.
//
// L trackM, length of track through peat; w widthM, on each side; p pitPerimetersM, outlines of the pits,
// whose corners are taken round. Crossings and overlaps are counted twice: an upper bound. After Nayak et
// al. 2008.
func DrainedAreaHa(trackM float64, pitPerimetersM []float64, widthM float64) (float64, error) {
	if !bounds.AllNonNegative(trackM, widthM) {
		return 0, errors.Join(bounds.NonNegative("track", trackM), bounds.NonNegative("width", widthM))
	}
	a := 2 * trackM * widthM
	for _, p := range pitPerimetersM {
		if err := bounds.NonNegative("pit outline", p); err != nil {
			return 0, err
		}
		a += float64(p*widthM) + float64(math.Pi*widthM*widthM)
	}
	return a / units.M2PerHa, nil
}

// Peat describes peat that is dug on one area and drained on another; the two must not overlap.
type Peat struct {
	DepthM, CarbonKgPerM3         float64
	ExcavatedHa, ExcavatedDepthM  float64 // dug depth is cut to the depth of the peat
	OxidisedFrac                  float64
	DrainedHa, DrainDepthM        float64 // drained depth is cut to the depth of the peat
	EmissionTCPerHaYr, DrainYears float64
}

// PeatLoss is the carbon lost from peat with its two parts and the stocks they came from, t C.
type PeatLoss struct {
	DirectTC, DrainedTC, TotalTC      float64
	ExcavatedStockTC, DrainableTC     float64
	DrainedCapped, ExcavationCutShort bool
}

// Loss gives the carbon lost; no part exceeds the stock it comes from.
func (p Peat) Loss() (PeatLoss, error) {
	if !bounds.AllNonNegative(p.DepthM, p.ExcavatedHa, p.ExcavatedDepthM, p.DrainedHa, p.DrainDepthM) {
		for _, v := range []float64{p.DepthM, p.ExcavatedHa, p.ExcavatedDepthM, p.DrainedHa, p.DrainDepthM} {
			if err := bounds.NonNegative("peat area or depth", v); err != nil {
				return PeatLoss{}, err
			}
		}
	}
	dug := min(p.ExcavatedDepthM, p.DepthM)
	perM, err := PeatStockTCPerHa(1, p.CarbonKgPerM3)
	if err != nil {
		return PeatLoss{}, err
	}
	var l PeatLoss
	l.ExcavationCutShort = dug < p.ExcavatedDepthM
	l.ExcavatedStockTC = p.ExcavatedHa * dug * perM
	l.DrainableTC = p.DrainedHa * min(p.DrainDepthM, p.DepthM) * perM
	if l.DirectTC, err = ExcavatedPeatTC(p.ExcavatedHa*units.M2PerHa*dug, p.CarbonKgPerM3, p.OxidisedFrac); err != nil {
		return PeatLoss{}, err
	}
	if l.DrainedTC, err = DrainedPeatTC(p.EmissionTCPerHaYr, p.DrainedHa, p.DrainYears, l.DrainableTC); err != nil {
		return PeatLoss{}, err
	}
	l.DrainedCapped = l.DrainedTC < p.EmissionTCPerHaYr*p.DrainedHa*p.DrainYears
	l.TotalTC = l.DirectTC + l.DrainedTC
	return l, nil
}

// Regression limits: the published fit is offered for water tables down to half a metre.
const maxRegressionTableM = 0.5

func tableDepth(w float64) error {
	if !(w >= 0 && w <= maxRegressionTableM) {
		return bounds.Error("water table depth", w, "0 to 0.5 m")
	}
	return nil
}

// BogCO2TPerHaYr is the carbon dioxide from an acid bog by depth of its water table, t CO2/(ha yr).
//
//	R = 3.667/1000·{6700·exp[−0.26·exp(−0.05153·(100W − 50))] + 72.54·θ − 800}
//
// W tableM, m below ground, 0 to 0.5; θ airC, yearly mean air temperature, °C. An option beside the
// emission factors of the IPCC. Nayak et al. 2008, coefficients as transcribed in public code; the paper
// itself was not at hand.
func BogCO2TPerHaYr(tableM, airC float64) (float64, error) {
	if err := errors.Join(tableDepth(tableM), temperature(airC)); err != nil {
		return 0, err
	}
	W, θ := tableM, airC
	return 3.667 / 1000 * (float64(6700*math.Exp(-0.26*math.Exp(-0.05153*(float64(100*W)-50)))) + float64(72.54*θ) - 800), nil
}

// FenCO2TPerHaYr is the same for a fen.
//
//	R = 3.667/1000·{16244·exp[−0.17594·exp(−0.07346·(100W − 50))] + 153.234·θ}
func FenCO2TPerHaYr(tableM, airC float64) (float64, error) {
	if err := errors.Join(tableDepth(tableM), temperature(airC)); err != nil {
		return 0, err
	}
	W, θ := tableM, airC
	return 3.667 / 1000 * (float64(16244*math.Exp(-0.17594*math.Exp(-0.07346*(float64(100*W)-50)))) + float64(153.234*θ)), nil
}

// BogCH4TCO2ePerHaYr is the methane from an acid bog, t CO2e/(ha yr).
//
//	R = 30.67/1000·{500·exp(−12.34·W) + 3.529·θ − 36.67}
//
// Where the fit falls below zero, at deep water tables, zero is given and clamped is true.
func BogCH4TCO2ePerHaYr(tableM, airC float64) (t float64, clamped bool, err error) {
	if err := errors.Join(tableDepth(tableM), temperature(airC)); err != nil {
		return 0, false, err
	}
	W, θ := tableM, airC
	r := 30.67 / 1000 * (float64(500*math.Exp(-12.34*W)) + float64(3.529*θ) - 36.67)
	if r < 0 {
		return 0, true, nil
	}
	return r, false, nil
}

func temperature(c float64) error {
	if !(c >= -20 && c <= 40) {
		return bounds.Error("air temperature", c, "-20 to 40 °C")
	}
	return nil
}
