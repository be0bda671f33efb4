package grid

import (
	"errors"
	"groundtally/scoring/bounds"
	"math"
)

// LossLoadFactor is the mean squared load over the squared peak, from the load factor,
// LLF = k·LF + (1−k)·LF².
//
// LF loadFactor, mean over peak power; k weight, 0 to 1, so that LF² ≤ LLF ≤ LF. The published k of 0.3
// (Buller & Woodrow 1928) describes demand and understates the losses of generation by a fifth; the
// shipped values for wind and solar are derived.
func LossLoadFactor(loadFactor, weight float64) (float64, error) {
	if err := errors.Join(unitShare("load factor", loadFactor), unitShare("weight", weight)); err != nil {
		return 0, err
	}
	return float64(weight*loadFactor) + float64((1-weight)*loadFactor*loadFactor), nil
}

// LossLoadWeight is the k that gives a known pair, (LLF − LF²)/(LF − LF²). LF must lie inside (0,1).
func LossLoadWeight(loadFactor, lossLoadFactor float64) (float64, error) {
	if !(loadFactor > 0 && loadFactor < 1) {
		return 0, bounds.Error("load factor", loadFactor, "inside 0 to 1")
	}
	lf2 := loadFactor * loadFactor
	const slack = 1e-9
	if !(lossLoadFactor >= lf2-slack && lossLoadFactor <= loadFactor+slack) {
		return 0, bounds.Error("loss load factor", lossLoadFactor, "between LF squared and LF")
	}
	return (lossLoadFactor - lf2) / (loadFactor - lf2), nil
}

// Factors are the load factor and loss load factor of a distribution of power.
type Factors struct{ Load, LossLoad float64 }

// ProfileFactors gives LF = mean(P)/peak and LLF = mean(P²)/peak² of equal time steps. Add the profiles
// of several plants on one line first: the loss of a sum is not the sum of losses.
func ProfileFactors(power []float64, peak float64) (Factors, error) {
	return DistributionFactors(power, nil, peak)
}

// DistributionFactors gives the same for power values with weights (shares of time). Without weights all
// count alike. Weights need not sum to 1: what is missing is time without power. With weights that sum to
// more than 1 by rounding the sum is used.
func DistributionFactors(power, weight []float64, peak float64) (Factors, error) {
	if err := bounds.Positive("peak", peak); err != nil {
		return Factors{}, err
	}
	if len(power) == 0 {
		return Factors{}, bounds.Error("number of steps", 0, "1 or more")
	}
	if weight != nil && len(weight) != len(power) {
		return Factors{}, bounds.Error("number of weights", float64(len(weight)), "as many as power values")
	}
	var s1, s2, w float64
	for i, p := range power {
		if !(p >= 0 && p <= peak*(1+1e-12)) {
			return Factors{}, bounds.Error("power", p, "0 to the peak")
		}
		q := p / peak
		wi := 1.0
		if weight != nil {
			if wi = weight[i]; !(wi >= 0) || !bounds.Finite(wi) {
				return Factors{}, bounds.Error("weight", wi, "0 or more")
			}
		}
		s1 += float64(wi * q)
		s2 += float64(wi * q * q)
		w += wi
	}
	if weight != nil {
		w = math.Max(w, 1)
	}
	return Factors{Load: s1 / w, LossLoad: s2 / w}, nil
}

// LossShare is the share of the year's energy that a resistance takes, (p/P)·LLF/LF.
//
// p/P peakLossFrac, loss at peak over peak power.
func LossShare(peakLossFrac float64, f Factors) (float64, error) {
	if err := errors.Join(bounds.NonNegative("peak loss", peakLossFrac), bounds.Positive("load factor", f.Load), unitShare("load factor", f.Load), unitShare("loss load factor", f.LossLoad)); err != nil {
		return 0, err
	}
	return peakLossFrac * f.LossLoad / f.Load, nil
}

// HourlyLine is a line whose loss is summed step by step.
type HourlyLine struct {
	Conductor Conductor
	Circuits  int
	LengthKm  float64
	VoltageKV float64
	RatedA    float64 // derated rating of one circuit
	ScreenAdd float64 // share added for screens
	MaxTheta  bool    // true: highest temperature throughout, an upper bound
}

// LossFrac is the share of the energy of a profile that the line takes,
// Σ R(θ_t)·(P_t² + Q_t²)/U² over Σ P_t, with θ_t from the current of the step.
//
// exportKW are equal time steps after export limiting; the plant runs at cos phi 1. Hourly means hide
// peaks within the hour: solar losses come out 1 to 3 % of the loss too low.
func (l HourlyLine) LossFrac(exportKW []float64) (float64, error) {
	if err := errors.Join(bounds.Positive("length", l.LengthKm), bounds.Positive("voltage", l.VoltageKV), bounds.Positive("rating", l.RatedA), bounds.NonNegative("screen loss", l.ScreenAdd)); err != nil {
		return 0, err
	}
	if l.Circuits < 1 {
		return 0, bounds.Error("number of circuits", float64(l.Circuits), "1 or more")
	}
	n := float64(l.Circuits)
	c := l.Conductor
	var loss, energy float64
	for _, p := range exportKW {
		if err := bounds.NonNegative("power", p); err != nil {
			return 0, err
		}
		theta := c.ThetaMaxC
		if !l.MaxTheta {
			var err error
			if theta, err = OperatingC(p/(sqrt3*l.VoltageKV*n), l.RatedA, c.ThetaAmbientC, c.ThetaMaxC); err != nil {
				return 0, err
			}
		}
		r, err := c.ResistanceOhmPerKm(theta)
		if err != nil {
			return 0, err
		}
		path := Path{VoltageKV: l.VoltageKV, ROhm: r * l.LengthKm / n * (1 + l.ScreenAdd)}
		loss += float64(path.riseLinear(Flow{ExportKW: p}) * p)
		energy += p
	}
	if energy == 0 {
		return 0, bounds.Error("energy of the profile", energy, "above 0")
	}
	return loss / energy, nil
}
