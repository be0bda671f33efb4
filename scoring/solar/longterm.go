package solar

import (
	"cmp"
	"math"
	"slices"
)

// LifetimeMeanFactor gives the mean energy of years 1 to N over that of the first year when each year
// gives a share d less than the year before: [1 - (1-d)^N]/(N d), d = degradationPerYr in [0, 1), N =
// years; 1 for N below 1. Source: geometric series.
func LifetimeMeanFactor(degradationPerYr float64, years int) float64 {
	d, n := degradationPerYr, float64(years)
	if years < 1 || d == 0 {
		return 1
	}
	return -math.Expm1(n*math.Log1p(-d)) / (n * d)
}

// YearFactor gives the energy of year n over that of the first year, (1-d)^(n-1); year 1 is the first.
func YearFactor(degradationPerYr float64, year int) float64 {
	return math.Pow(1-degradationPerYr, float64(max(1, year)-1))
}

// NormalQuantile gives z with the share p of a standard normal distribution below it, p in (0, 1).
func NormalQuantile(p float64) float64 { return math.Sqrt2 * math.Erfinv(2*p-1) }

// ExceededWith gives the energy that is reached or exceeded with a probability: P50 (1 - z sigma), z the
// normal quantile of the probability; P90 is probability 0.90. sigmaFrac is the relative standard
// deviation. ok is false for a probability outside (0, 1) or a negative sigma.
func ExceededWith(p50, sigmaFrac, probability float64) (value float64, ok bool) {
	if !(probability > 0 && probability < 1) || !(sigmaFrac >= 0) || !finite(sigmaFrac) {
		return 0, false
	}
	return float64(p50 * (1 - float64(NormalQuantile(probability)*sigmaFrac))), true
}

// Sigmas are relative standard deviations of the yearly energy by their cause.
type Sigmas struct {
	Sunlight     float64 // long-term light on the horizontal
	Model        float64 // parting of diffuse light, bringing it onto the plane
	Incidence    float64 // slanting light, spectrum
	Module       float64
	Temperature  float64
	Soiling      float64 // with snow
	Shading      float64
	Inverter     float64 // with wiring
	Availability float64
	Degradation  float64
	BetweenYears float64 // from one year to another
}

// Component is one cause of a yearly energy's spread.
type Component struct {
	Name   string // "sunlight", "model", ...
	Sigma  float64
	Shared bool // it errs alike for all sites that the same sunlight and the same kind of panels serve
}

// Components gives the causes apart from the variation between years, the largest first; equal ones stand in the
// order of the fields. Shade alone differs from site to site: the others come from one source, one model, one kind
// of panel. Source: assumption of this program.
func (s Sigmas) Components() []Component {
	out := []Component{
		{"sunlight", s.Sunlight, true}, {"model", s.Model, true}, {"incidence", s.Incidence, true}, {"module", s.Module, true}, {"temperature", s.Temperature, true},
		{"soiling", s.Soiling, true}, {"shading", s.Shading, false}, {"inverter", s.Inverter, true}, {"availability", s.Availability, true}, {"degradation", s.Degradation, true},
	}
	slices.SortStableFunc(out, func(a, b Component) int { return cmp.Compare(b.Sigma, a.Sigma) })
	return out
}

// Parts gives the standard deviation that all sites share and that of one site alone: their squares add up to that
// of Total. The variation between years is shared.
func (s Sigmas) Parts(years int) (shared, own float64) {
	for _, c := range s.Components() {
		if c.Shared {
			shared += float64(c.Sigma * c.Sigma)
		} else {
			own += float64(c.Sigma * c.Sigma)
		}
	}
	if years > 0 {
		shared += float64(s.BetweenYears*s.BetweenYears) / float64(years)
	}
	return math.Sqrt(shared), math.Sqrt(own)
}

// Total gives the root of the sum of squares. The variance between years is divided by the number of
// years over which the energy is averaged; 0 years stands for the long-term mean, without it.
func (s Sigmas) Total(years int) float64 {
	v := 0.0
	for _, x := range [...]float64{s.Sunlight, s.Model, s.Incidence, s.Module, s.Temperature, s.Soiling, s.Shading, s.Inverter, s.Availability, s.Degradation} {
		v += float64(x * x)
	}
	if years > 0 {
		v += float64(s.BetweenYears*s.BetweenYears) / float64(years)
	}
	return math.Sqrt(v)
}

// CapacityMWpPerHa gives the panel rating on a hectare inside the fence: 10 eta GCR f, eta =
// moduleEfficiency, GCR the collector width over horizontal pitch, f = usableShare after roads, edges
// and equipment. 1 ha under 1 kW/m2 is 10 MW.
func CapacityMWpPerHa(moduleEfficiency, gcr, usableShare float64) float64 {
	return 10 * moduleEfficiency * gcr * usableShare
}
