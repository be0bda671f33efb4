package wind

import (
	"fmt"
	"math"
)

// SurfaceLayerTopM is the height above ground beyond which both shear laws are extrapolations; farm
// results for higher hubs carry NoticeHighHub. Common practice.
const SurfaceLayerTopM = 150.0

// PowerLaw carries a speed from height zr to z: v(z) = v(zr) (z/zr)^alpha, heights in m above ground,
// alpha dimensionless, -0.5 to 1. Valid in the surface layer, roughly to 150 m. An error outside.
func PowerLaw(vMPerS, zrM, zM, alpha float64) (float64, error) {
	f, err := powerFactor(zrM, zM, alpha)
	return vMPerS * f, err
}

func powerFactor(zrM, zM, alpha float64) (float64, error) {
	if !(zrM > 0) || !(zM > 0) || math.IsInf(zrM, 0) || math.IsInf(zM, 0) {
		return 0, fmt.Errorf("shear from %g m to %g m: heights must be above 0", zrM, zM)
	}
	if !(alpha >= -0.5 && alpha <= 1) {
		return 0, fmt.Errorf("shear exponent %g lies outside -0.5 to 1", alpha)
	}
	return math.Pow(zM/zrM, alpha), nil
}

// LogLaw carries a speed from height zr to z under neutral stratification:
// v(z) = v(zr) ln((z-d)/z0)/ln((zr-d)/z0), with z0 the roughness length and d the displacement height,
// all in m (d: 0 over open land, about 2/3 to 3/4 of canopy height over forest). Both heights must
// exceed d + z0, else an error; the law holds where zr - d exceeds about 10 z0.
func LogLaw(vMPerS, zrM, zM, z0M, dM float64) (float64, error) {
	if !(z0M > 0) || !(dM >= 0) {
		return 0, fmt.Errorf("roughness length %g m must be above 0, displacement %g m not below 0", z0M, dM)
	}
	if !(zrM > dM+z0M) || !(zM > dM+z0M) {
		return 0, fmt.Errorf("heights %g m and %g m must exceed displacement plus roughness length, %g m", zrM, zM, dM+z0M)
	}
	return vMPerS * math.Log((zM-dM)/z0M) / math.Log((zrM-dM)/z0M), nil
}

// AlphaFromSpeeds is the shear exponent between two measured heights, ln(v2/v1)/ln(z2/z1).
func AlphaFromSpeeds(v1MPerS, z1M, v2MPerS, z2M float64) (float64, error) {
	if !(v1MPerS > 0) || !(v2MPerS > 0) || !(z1M > 0) || !(z2M > 0) || z1M == z2M {
		return 0, fmt.Errorf("shear exponent from %g m/s at %g m and %g m/s at %g m: speeds above 0 at two heights are needed", v1MPerS, z1M, v2MPerS, z2M)
	}
	return math.Log(v2MPerS/v1MPerS) / math.Log(z2M/z1M), nil
}

// AlphaFromRoughness is the shear exponent whose slope equals the log law's at the geometric mean of
// the two heights: alpha = 1/ln(sqrt(z1 z2)/z0), heights and roughness length in m. An error when
// the mean height does not exceed z0.
func AlphaFromRoughness(z1M, z2M, z0M float64) (float64, error) {
	zg := math.Sqrt(z1M * z2M)
	if !(z0M > 0) || !(zg > z0M) {
		return 0, fmt.Errorf("shear exponent for roughness length %g m at %g m: the height must exceed it", z0M, zg)
	}
	return 1 / math.Log(zg/z0M), nil
}

// RoughnessClass gives the class of a roughness length z0 (m):
// 1.699823015 + ln z0/ln 150 up to z0 = 0.03, else 3.912489289 + ln z0/ln(10/3).
// Reproduces the European Wind Atlas list to class 3; at z0 0.8 and 1.6 it gives 3.73 and 4.30 where
// the list has 3.5 and 4.
func RoughnessClass(z0M float64) (float64, error) {
	if !(z0M > 0) || math.IsInf(z0M, 0) {
		return 0, fmt.Errorf("roughness length %g m must be above 0", z0M)
	}
	if z0M <= 0.03 {
		return 1.699823015 + math.Log(z0M)/math.Log(150), nil
	}
	return 3.912489289 + math.Log(z0M)/math.Log(10.0/3), nil
}

// AtHeight carries the distribution from height zr to z (m) by the power law: A scales as speed, k is
// kept. (Models that change k with height exist; they are not used here.)
func (w Weibull) AtHeight(zrM, zM, alpha float64) (Weibull, error) {
	a, err := PowerLaw(w.AMPerS, zrM, zM, alpha)
	return Weibull{AMPerS: a, K: w.K}, err
}

// AtHeightLog carries the distribution from height zr to z (m) by the log law over a roughness length
// z0 and a displacement d (m), see LogLaw: A scales as speed, k is kept.
func (w Weibull) AtHeightLog(zrM, zM, z0M, dM float64) (Weibull, error) {
	a, err := LogLaw(w.AMPerS, zrM, zM, z0M, dM)
	return Weibull{AMPerS: a, K: w.K}, err
}

// AtHub carries one of the rose's distributions to hub height (m) by the site's law. Errors are those of AtHeight, or
// of AtHeightLog where the roughness is given.
func (s Site) AtHub(w Weibull, hubM float64) (Weibull, error) {
	if s.RoughnessM != 0 {
		return w.AtHeightLog(s.RefHeightM, hubM, s.RoughnessM, s.DisplacementM)
	}
	return w.AtHeight(s.RefHeightM, hubM, s.ShearAlpha)
}

// speedFactor is the speed at height z per speed at height zr by the site's law.
func (s Site) speedFactor(zrM, zM float64) (float64, error) {
	if s.RoughnessM != 0 {
		return LogLaw(1, zrM, zM, s.RoughnessM, s.DisplacementM)
	}
	return powerFactor(zrM, zM, s.ShearAlpha)
}
