package energy

import (
	"errors"
	"math"

	"groundtally/scoring/bounds"
	"groundtally/scoring/units"
)

// PublishedMeans are the mean return in primary equivalents and the mean payback of a set of studies, both
// harmonised to one life and constant output.
type PublishedMeans struct {
	ReturnPrimary float64
	PaybackYr     float64
	LifeYr        float64
}

func (m PublishedMeans) check() error {
	return errors.Join(bounds.Positive("return", m.ReturnPrimary), bounds.Positive("payback", m.PaybackYr), bounds.Positive("life", m.LifeYr))
}

// Product is the mean return times the mean payback, yr. For one plant it is its life; for means it is the life
// or more (Jensen's inequality, since the return is life over payback). Below the life, the means cannot belong
// together, which is an error.
func (m PublishedMeans) Product() (float64, error) {
	if err := m.check(); err != nil {
		return 0, err
	}
	p := m.ReturnPrimary * m.PaybackYr
	if p < m.LifeYr*(1-1e-12) {
		return 0, bounds.Error("mean return × mean payback", p, "the life or more")
	}
	return p, nil
}

// Spread is how far the studies behind two means lie apart, if their energy spent is lognormal:
//
//	mean(R)·mean(P) = T·exp(σ²)   ⇒   σ = √ln(R·P/T),   CV = √(exp(σ²) − 1)
//
// σ sigma, of the logarithm; CV cv, standard deviation over mean. Closed form of the lognormal distribution.
func (m PublishedMeans) Spread() (sigma, cv float64, err error) {
	p, err := m.Product()
	if err != nil {
		return 0, 0, err
	}
	s2 := math.Max(0, math.Log(p/m.LifeYr))
	return math.Sqrt(s2), math.Sqrt(math.Expm1(s2)), nil
}

// MassKg is the mass of a bill of materials, kg.
func MassKg(bill []Mass) (float64, error) {
	var sum float64
	for _, m := range bill {
		if err := bounds.NonNegative("mass of "+m.Material, m.Kg); err != nil {
			return 0, err
		}
		sum += m.Kg
	}
	return sum, nil
}

// ConductorKgPerKm is the mass of the cores of a cable, n·S·ρ·1000 m, kg/km.
//
// n cores; S sectionMM2, mm2 each; ρ densityKgPerM3. Geometry; a stranded core is a little heavier for its lay.
func ConductorKgPerKm(cores int, sectionMM2, densityKgPerM3 float64) (float64, error) {
	if err := errors.Join(bounds.Positive("cores", float64(cores)), bounds.Positive("section", sectionMM2), bounds.Positive("density", densityKgPerM3)); err != nil {
		return 0, err
	}
	return float64(cores) * sectionMM2 / mm2PerM2 * units.MPerKm * densityKgPerM3, nil
}

const mm2PerM2 = 1e6

// MatchedPowerShare is the power of two linearly coupled processes over its maximum, P/P_max = 4·η·(1−η).
//
// η efficiency, 0 to 1. Highest at one half: more power costs efficiency. It is an analogy to the crowding curve,
// not a law of wind farms. Algebra of Odum & Pinkerton 1955.
func MatchedPowerShare(efficiency float64) (float64, error) {
	if !(efficiency >= 0 && efficiency <= 1) {
		return 0, bounds.Error("efficiency", efficiency, "0 to 1")
	}
	return 4 * efficiency * (1 - efficiency), nil
}
