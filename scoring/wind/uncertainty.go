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

// Component is one independent standard deviation of a yield: of the mean speed, which the farm's
// sensitivity turns into energy, or of the energy itself.
type Component struct {
	Name, Title string
	SpeedFrac   float64 // share of mean speed, 0 to 1
	EnergyFrac  float64 // share of energy, 0 to 1; one of the two is 0
	// Shared: the same error acts on all sites of a district (measurement, long-term reference, vertical
	// extrapolation, curve and losses), so that it cancels when sites are compared. Otherwise each site
	// has its own (horizontal extrapolation, wakes).
	Shared bool
}

// Components are the standard deviations of one yield.
type Components []Component

// Energy gives each component as a share of energy, sensitivity (percent energy per percent speed, 0 to
// 5) times the share of speed. An error for shares outside 0 to 1 and for a component of both kinds.
func (cs Components) Energy(sensitivity float64) ([]float64, error) {
	if !(sensitivity >= 0 && sensitivity <= 5) {
		return nil, fmt.Errorf("sensitivity %g lies outside 0 to 5", sensitivity)
	}
	out := make([]float64, len(cs))
	for i, c := range cs {
		if !(c.SpeedFrac >= 0 && c.SpeedFrac <= 1) || !(c.EnergyFrac >= 0 && c.EnergyFrac <= 1) {
			return nil, fmt.Errorf("uncertainty %q: %g of speed, %g of energy lie outside 0 to 1", c.Name, c.SpeedFrac, c.EnergyFrac)
		}
		if c.SpeedFrac > 0 && c.EnergyFrac > 0 {
			return nil, fmt.Errorf("uncertainty %q: a share of speed and one of energy; one is possible", c.Name)
		}
		out[i] = c.EnergyFrac + float64(sensitivity*c.SpeedFrac)
	}
	return out, nil
}

// Parts gives the standard deviation of energy that all sites share and the one each site has for
// itself, each the root of the sum of squares of its components; shared^2 + own^2 is the square of Total.
// Errors as Energy.
func (cs Components) Parts(sensitivity float64) (sharedFrac, ownFrac float64, err error) {
	all, err := cs.Energy(sensitivity)
	if err != nil {
		return 0, 0, err
	}
	var shared, own []float64
	for i, c := range cs {
		if c.Shared {
			shared = append(shared, all[i])
		} else {
			own = append(own, all[i])
		}
	}
	return RootSumSquare(shared...), RootSumSquare(own...), nil
}

// Total is the standard deviation of the long-term energy, the root of the sum of squares of all
// components. Errors as Energy.
func (cs Components) Total(sensitivity float64) (float64, error) {
	all, err := cs.Energy(sensitivity)
	return RootSumSquare(all...), err
}

// Components gives the same standard deviations as a list, without the variation between years.
// PerformanceFrac counts as shared: where the wakes are known apart from curve and losses, list them.
func (u Uncertainty) Components() Components {
	return Components{
		{Name: "measurement", Title: "Measurement", SpeedFrac: u.MeasurementFrac, Shared: true},
		{Name: "long_term", Title: "Long-term reference", SpeedFrac: u.LongTermFrac, Shared: true},
		{Name: "vertical", Title: "Vertical extrapolation", SpeedFrac: u.VerticalFrac, Shared: true},
		{Name: "horizontal", Title: "Horizontal extrapolation", SpeedFrac: u.HorizontalFrac},
		{Name: "performance", Title: "Curve, wakes and losses", EnergyFrac: u.PerformanceFrac, Shared: true},
	}
}

// ExceedanceLine is the energy exceeded with one probability.
type ExceedanceLine struct {
	ProbabilityFrac    float64 // 0.9 for P90
	LongTermMWhPerYr   float64 // by the mean of many years
	SingleYearMWhPerYr float64 // by one year
}

// Exceedances gives P50, P75, P90, P95 and P99, see Exceedance: for the long-term mean with the standard
// deviation sigma, for a single year with sqrt(sigma^2 + sigma_year^2), all shares of energy.
func Exceedances(p50MWh, sigmaFrac, sigmaYearFrac float64) ([]ExceedanceLine, error) {
	single, err := SigmaOverYears(sigmaFrac, sigmaYearFrac, 1)
	if err != nil {
		return nil, err
	}
	ps := []float64{0.5, 0.75, 0.9, 0.95, 0.99}
	out := make([]ExceedanceLine, 0, len(ps))
	for _, p := range ps {
		l := ExceedanceLine{ProbabilityFrac: p}
		if l.LongTermMWhPerYr, err = Exceedance(p50MWh, sigmaFrac, p); err == nil {
			l.SingleYearMWhPerYr, err = Exceedance(p50MWh, single, p)
		}
		if err != nil {
			return nil, err
		}
		out = append(out, l)
	}
	return out, nil
}
