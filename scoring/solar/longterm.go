package solar

import "math"

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
