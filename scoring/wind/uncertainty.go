package wind

import (
	"fmt"
	"math"
)

// RootSumSquare joins independent standard deviations: sqrt(sum s_i^2).
func RootSumSquare(sigmas ...float64) float64 {
	var sum float64
	for _, s := range sigmas {
		sum += float64(s * s)
	}
	return math.Sqrt(sum)
}

// Uncertainty names the independent standard deviations of a yield, after the categories of
// IEC 61400-15. Those of speed become energy by the farm's sensitivity.
type Uncertainty struct {
	// of mean speed, shares
	MeasurementFrac, LongTermFrac, VerticalFrac, HorizontalFrac float64
	// of energy, shares
	PerformanceFrac float64 // wakes, curve, losses
	// InterannualSpeedFrac is the standard deviation of one year's mean speed.
	InterannualSpeedFrac float64
}

// SigmaEnergy is the standard deviation of the mean energy of a span of years, as a share:
// sigma_N^2 = sum (s u_speed)^2 + u_performance^2 + (s u_year)^2/N with s the sensitivity (percent
// energy per percent speed) and N the years, at least 1.
func (u Uncertainty) SigmaEnergy(sensitivity, years float64) (float64, error) {
	all := []float64{u.MeasurementFrac, u.LongTermFrac, u.VerticalFrac, u.HorizontalFrac, u.PerformanceFrac, u.InterannualSpeedFrac}
	for _, x := range all {
		if !(x >= 0 && x <= 1) {
			return 0, fmt.Errorf("a standard deviation of %g lies outside 0 to 1", x)
		}
	}
	if !(sensitivity >= 0 && sensitivity <= 5) || !(years >= 1) {
		return 0, fmt.Errorf("sensitivity %g must lie within 0 to 5, years %g be at least 1", sensitivity, years)
	}
	return RootSumSquare(sensitivity*u.MeasurementFrac, sensitivity*u.LongTermFrac, sensitivity*u.VerticalFrac,
		sensitivity*u.HorizontalFrac, u.PerformanceFrac, sensitivity*u.InterannualSpeedFrac/math.Sqrt(years)), nil
}

// SigmaOverYears adds the variation between years to a standard deviation of the long-term energy,
// all as shares of energy: sigma_N = sqrt(sigma^2 + sigma_year^2/N).
func SigmaOverYears(sigmaFrac, sigmaYearFrac, years float64) (float64, error) {
	if !(sigmaFrac >= 0) || !(sigmaYearFrac >= 0) || !(years >= 1) || math.IsInf(sigmaFrac+sigmaYearFrac, 0) {
		return 0, fmt.Errorf("standard deviations %g and %g must not be below 0, years %g be at least 1", sigmaFrac, sigmaYearFrac, years)
	}
	return RootSumSquare(sigmaFrac, sigmaYearFrac/math.Sqrt(years)), nil
}

// Exceedance is the energy exceeded with a probability p (0.9 for P90): P_x = P50 (1 - z_p sigma), z_p
// the standard normal quantile of p, sigma the standard deviation as a share. Not below 0. It assumes
// a normal distribution, which Hammond et al. 2026, Wind Energy Science 11:1251, find not conservative
// enough. p from 0.001 to 0.999; an error outside.
func Exceedance(p50MWh, sigmaFrac, p float64) (float64, error) {
	if !(p >= 0.001 && p <= 0.999) || !(sigmaFrac >= 0) || math.IsInf(sigmaFrac, 0) || !(p50MWh >= 0) || math.IsInf(p50MWh, 0) {
		return 0, fmt.Errorf("exceedance %g of %g MWh with standard deviation %g: outside 0.001 to 0.999, or below 0", p, p50MWh, sigmaFrac)
	}
	z := math.Sqrt2 * math.Erfinv(float64(2*p)-1)
	return math.Max(0, p50MWh*(1-float64(z*sigmaFrac))), nil
}

// BiasAdjusted is P50 (1 + b), b the published long-run bias of predictions (-0.074 to -0.066, Hammond
// et al. 2026, Wind Energy Science 11:1251): what such predictions gave on average. To be shown beside
// P50, not in its place.
func BiasAdjusted(p50MWh, biasFrac float64) float64 { return p50MWh * (1 + biasFrac) }
