package wind

import (
	"errors"
	"fmt"
	"math"
)

// Weibull is the distribution of wind speed F(v) = 1 - exp(-(v/A)^k).
type Weibull struct {
	AMPerS float64 // scale A, m/s, above 0
	K      float64 // shape k, dimensionless, kMin to kMax
}

// Shapes outside this range do not occur in wind statistics; every solver searches inside it.
const (
	kMin = 0.5
	kMax = 10.0
)

// ErrNoFit is wrapped when no Weibull distribution with k from 0.5 to 10 has the asked properties.
var ErrNoFit = errors.New("no Weibull distribution with shape 0.5 to 10 fits")

// Check reports why w cannot be used, or nil.
func (w Weibull) Check() error {
	if !(w.AMPerS > 0) || math.IsInf(w.AMPerS, 0) {
		return fmt.Errorf("scale %g m/s of a Weibull distribution is not a positive number", w.AMPerS)
	}
	if !(w.K >= kMin && w.K <= kMax) {
		return fmt.Errorf("shape %g of a Weibull distribution lies outside %g to %g", w.K, kMin, kMax)
	}
	return nil
}

// Density is f(v) = (k/A) (v/A)^(k-1) exp(-(v/A)^k) per m/s; 0 for negative v. At v = 0 with k < 1
// the density is unbounded and 0 is given, so integrals must use CDF.
func (w Weibull) Density(vMPerS float64) float64 {
	if vMPerS < 0 || (vMPerS == 0 && w.K < 1) {
		return 0
	}
	r := vMPerS / w.AMPerS
	return w.K / w.AMPerS * math.Pow(r, w.K-1) * math.Exp(-math.Pow(r, w.K))
}

// CDF is F(v) = 1 - exp(-(v/A)^k), the share of time below v; 0 for negative v.
func (w Weibull) CDF(vMPerS float64) float64 {
	if vMPerS <= 0 {
		return 0
	}
	return -math.Expm1(-math.Pow(vMPerS/w.AMPerS, w.K))
}

// Above is exp(-(v/A)^k), the share of time above v.
func (w Weibull) Above(vMPerS float64) float64 {
	if vMPerS <= 0 {
		return 1
	}
	return math.Exp(-math.Pow(vMPerS/w.AMPerS, w.K))
}

// Moment is E[v^n] = A^n Gamma(1 + n/k) in (m/s)^n.
func (w Weibull) Moment(n float64) float64 {
	return math.Pow(w.AMPerS, n) * math.Gamma(1+n/w.K)
}

// Mean is A Gamma(1 + 1/k) in m/s.
func (w Weibull) Mean() float64 { return w.AMPerS * math.Gamma(1+1/w.K) }

// Std is the standard deviation A sqrt(Gamma(1+2/k) - Gamma(1+1/k)^2) in m/s.
func (w Weibull) Std() float64 { return w.Mean() * variation(w.K) }

// Mode is A ((k-1)/k)^(1/k) in m/s for k > 1; 0 otherwise, where the density falls from the start.
func (w Weibull) Mode() float64 {
	if w.K <= 1 {
		return 0
	}
	return w.AMPerS * math.Pow((w.K-1)/w.K, 1/w.K)
}

// Median is A (ln 2)^(1/k) in m/s.
func (w Weibull) Median() float64 { return w.AMPerS * math.Pow(math.Ln2, 1/w.K) }

// PowerDensity is the mean power of the wind W = rho/2 A^3 Gamma(1 + 3/k) in W/m2, with rho the air
// density in kg/m3.
func (w Weibull) PowerDensity(rhoKgPerM3 float64) float64 { return 0.5 * rhoKgPerM3 * w.Moment(3) }

// EnergyPatternFactor is E[v^3]/E[v]^3 = Gamma(1+3/k)/Gamma(1+1/k)^3; 6/pi for k = 2.
func (w Weibull) EnergyPatternFactor() float64 { return patternFactor(w.K) }

func patternFactor(k float64) float64 {
	g := math.Gamma(1 + 1/k)
	return math.Gamma(1+3/k) / (g * g * g)
}

// variation is std/mean = sqrt(Gamma(1+2/k)/Gamma(1+1/k)^2 - 1), strictly falling in k.
func variation(k float64) float64 {
	g := math.Gamma(1 + 1/k)
	return math.Sqrt(math.Gamma(1+2/k)/(g*g) - 1)
}

// FromMeanAndK gives the distribution with mean m (m/s) and shape k: A = m/Gamma(1 + 1/k).
func FromMeanAndK(meanMPerS, k float64) (Weibull, error) {
	w := Weibull{AMPerS: meanMPerS / math.Gamma(1+1/k), K: k}
	if err := w.Check(); err != nil {
		return Weibull{}, fmt.Errorf("mean %g m/s: %w", meanMPerS, err)
	}
	return w, nil
}

// Rayleigh gives the distribution with shape 2 and the given mean (m/s): A = 2m/sqrt(pi). It is the
// convention of IEC 61400-12-1 for yearly energy when nothing but a mean speed is known.
func Rayleigh(meanMPerS float64) (Weibull, error) { return FromMeanAndK(meanMPerS, 2) }

// FromMeanAndStd gives the distribution with mean m and standard deviation s, both m/s, by bisection
// on sqrt(Gamma(1+2/k)/Gamma(1+1/k)^2 - 1) = s/m, k from 0.5 to 10. ErrNoFit outside.
func FromMeanAndStd(meanMPerS, stdMPerS float64) (Weibull, error) {
	if !(meanMPerS > 0) || !(stdMPerS > 0) {
		return Weibull{}, fmt.Errorf("mean %g and standard deviation %g m/s must be above 0", meanMPerS, stdMPerS)
	}
	k, ok := bisect(kMin, kMax, func(k float64) float64 { return stdMPerS/meanMPerS - variation(k) })
	if !ok {
		return Weibull{}, fmt.Errorf("mean %g, standard deviation %g m/s: %w", meanMPerS, stdMPerS, ErrNoFit)
	}
	return FromMeanAndK(meanMPerS, k)
}

// Sector is one sector of a wind rose.
type Sector struct {
	FrequencyFrac float64 // share of the time that wind comes from this sector, 0 to 1
	Weibull       Weibull
}

// CombineSectors gives the one distribution that keeps the mean and the mean cube of all sectors:
// m = sum f_i A_i Gamma(1+1/k_i), M3 = sum f_i A_i^3 Gamma(1+3/k_i), k from Gamma(1+3/k)/Gamma(1+1/k)^3
// = M3/m^3, then A from m. Frequencies are divided by their sum; sectors with frequency 0 are passed
// over. Source: European Wind Atlas, Troen & Petersen 1989.
func CombineSectors(sectors []Sector) (Weibull, error) {
	var f, m, m3 float64
	for i, s := range sectors {
		if s.FrequencyFrac == 0 {
			continue
		}
		if !(s.FrequencyFrac > 0) || math.IsInf(s.FrequencyFrac, 0) {
			return Weibull{}, fmt.Errorf("sector %d: frequency %g is not a share", i, s.FrequencyFrac)
		}
		if err := s.Weibull.Check(); err != nil {
			return Weibull{}, fmt.Errorf("sector %d: %w", i, err)
		}
		f += s.FrequencyFrac
		m += float64(s.FrequencyFrac * s.Weibull.Mean())
		m3 += float64(s.FrequencyFrac * s.Weibull.Moment(3))
	}
	if f == 0 {
		return Weibull{}, errors.New("no sector has a frequency above 0")
	}
	m, m3 = m/f, m3/f
	k, ok := bisect(kMin, kMax, func(k float64) float64 { return m3/(m*m*m) - patternFactor(k) })
	if !ok {
		return Weibull{}, fmt.Errorf("combine %d sectors: %w", len(sectors), ErrNoFit)
	}
	return FromMeanAndK(m, k)
}

// FitMaximumLikelihood gives the most likely distribution of the samples (m/s):
// sum v^k ln v/sum v^k - 1/k - mean(ln v) = 0 by bisection, then A = (mean v^k)^(1/k).
// Calms (v <= 0) are left out of the fit; their share is given back, because a distribution without
// them over-states the energy by that share. Source: Stevens & Smulders 1979.
func FitMaximumLikelihood(speedsMPerS []float64) (w Weibull, calmFrac float64, err error) {
	vs, calm, err := positives(speedsMPerS)
	if err != nil {
		return Weibull{}, 0, err
	}
	var vMax, meanLn float64
	ln := make([]float64, len(vs))
	for i, v := range vs {
		vMax = math.Max(vMax, v)
		ln[i] = math.Log(v)
		meanLn += ln[i]
	}
	n := float64(len(vs))
	meanLn /= n
	// Speeds are scaled by the greatest so that v^k stays below 1 for every k searched.
	lnMax := math.Log(vMax)
	sums := func(k float64) (s0, s1 float64) {
		for _, l := range ln {
			p := math.Exp(k * (l - lnMax))
			s0 += p
			s1 += float64(p * l)
		}
		return s0, s1
	}
	k, ok := bisect(kMin, kMax, func(k float64) float64 {
		s0, s1 := sums(k)
		return s1/s0 - 1/k - meanLn
	})
	if !ok {
		return Weibull{}, 0, fmt.Errorf("%d samples: %w", len(vs), ErrNoFit)
	}
	s0, _ := sums(k)
	w = Weibull{AMPerS: vMax * math.Pow(s0/n, 1/k), K: k}
	return w, calm, w.Check()
}

// FitEnergyPreserving gives the distribution that keeps the samples' mean cube and the share X of
// samples above their mean m: A(k) = (mean v^3/Gamma(1+3/k))^(1/3), exp(-(m/A(k))^k) = X. All samples
// count, calms too. ErrNoFit when no k from 0.5 to 10 does it; FitMaximumLikelihood is then the
// usual way out. Source: European Wind Atlas, Troen & Petersen 1989.
func FitEnergyPreserving(speedsMPerS []float64) (Weibull, error) {
	if _, _, err := positives(speedsMPerS); err != nil {
		return Weibull{}, err
	}
	n := float64(len(speedsMPerS))
	var m, m3, above float64
	for _, v := range speedsMPerS {
		v = math.Max(v, 0)
		m += v
		m3 += float64(v * v * v)
	}
	m, m3 = m/n, m3/n
	for _, v := range speedsMPerS {
		if v > m {
			above++
		}
	}
	x := above / n
	scale := func(k float64) float64 { return math.Cbrt(m3 / math.Gamma(1+3/k)) }
	g := func(k float64) float64 { return math.Exp(-math.Pow(m/scale(k), k)) - x }
	// The share above the mean is not monotone over the whole range: take the first crossing.
	const step = 0.05
	for i := 0; i < int(math.Round((kMax-kMin)/step)); i++ {
		lo := kMin + float64(step*float64(i))
		if k, ok := bisect(lo, lo+step, g); ok {
			w := Weibull{AMPerS: scale(k), K: k}
			return w, w.Check()
		}
	}
	return Weibull{}, fmt.Errorf("%d samples, %.3f of them above the mean: %w", len(speedsMPerS), x, ErrNoFit)
}

func positives(vs []float64) (out []float64, calmFrac float64, err error) {
	for i, v := range vs {
		if math.IsNaN(v) || math.IsInf(v, 0) {
			return nil, 0, fmt.Errorf("sample %d is not a finite speed", i)
		}
		if v > 0 {
			out = append(out, v)
		}
	}
	if len(out) < 2 {
		return nil, 0, fmt.Errorf("%d speeds above 0: too few to fit", len(out))
	}
	return out, 1 - float64(len(out))/float64(len(vs)), nil
}

// bisect finds a root of g between lo and hi to the last bit that halving can give; ok is false when
// g has the same sign at both ends or is not a number there.
func bisect(lo, hi float64, g func(float64) float64) (root float64, ok bool) {
	glo, ghi := g(lo), g(hi)
	switch {
	case math.IsNaN(glo) || math.IsNaN(ghi):
		return 0, false
	case glo == 0:
		return lo, true
	case ghi == 0:
		return hi, true
	case (glo > 0) == (ghi > 0):
		return 0, false
	}
	for range 200 {
		mid := lo + (hi-lo)/2
		if mid <= lo || mid >= hi {
			break
		}
		if (g(mid) > 0) == (glo > 0) {
			lo = mid
		} else {
			hi = mid
		}
	}
	return lo + (hi-lo)/2, true
}
