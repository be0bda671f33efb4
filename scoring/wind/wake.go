package wind

import (
	"fmt"
	"math"
)

// WakeModel names the formula of a single wake.
type WakeModel uint8

// The wake models.
const (
	WakeGaussian WakeModel = iota // Bastankhah & Porte-Agel 2014: the default for yield
	WakeJensen                    // Jensen 1983 with partial overlap: the cross check
	WakeIEA37                     // the simplified Gaussian of the IEA Wind Task 37 case studies: a test bed
)

var wakeNames = [...]string{"gaussian", "jensen", "iea37"}

func (m WakeModel) String() string {
	if int(m) < len(wakeNames) {
		return wakeNames[m]
	}
	return fmt.Sprintf("wake model %d", uint8(m))
}

// ParseWakeModel reads "gaussian", "jensen" or "iea37".
func ParseWakeModel(s string) (WakeModel, error) {
	for i, n := range wakeNames {
		if s == n {
			return WakeModel(i), nil
		}
	}
	return 0, fmt.Errorf("wake model %q is not gaussian, jensen or iea37", s)
}

// JensenDeficit is the share of speed lost in the wake x metres behind a rotor of diameter D (m):
// delta = (1 - sqrt(1 - Ct))/(1 + 2 k x/D)^2, Ct 0 to MaxCt, k the decay of the wake (0.075 onshore,
// 0.04 to 0.05 offshore); 0 for x <= 0. The wake radius is D/2 + k x. Meant for x of several D.
// Source: Jensen 1983, Riso-M-2411.
func JensenDeficit(ct, k, xM, rotorDiameterM float64) float64 {
	if xM <= 0 {
		return 0
	}
	return (1 - math.Sqrt(1-ct)) * jensenGrowth(k, xM, rotorDiameterM)
}

func jensenGrowth(k, x, d float64) float64 {
	g := 1 + 2*k*x/d
	return 1 / (g * g)
}

// JensenDecay is k = 0.5/ln(H/z0), hub height H and roughness length z0 in m, H > z0. Source: Frandsen
// 1992.
func JensenDecay(hubHeightM, z0M float64) (float64, error) {
	if !(z0M > 0) || !(hubHeightM > z0M) {
		return 0, fmt.Errorf("hub height %g m must exceed the roughness length %g m", hubHeightM, z0M)
	}
	return 0.5 / math.Log(hubHeightM/z0M), nil
}

// OverlapArea is the area that circles of radii R and R_w with centres c apart have in common, in the
// square of the length unit: all of the smaller one if c <= |R_w - R|, nothing if c >= R + R_w, else
// R^2 acos((c^2+R^2-R_w^2)/2cR) + R_w^2 acos((c^2+R_w^2-R^2)/2cR_w)
// - sqrt((-c+R+R_w)(c+R-R_w)(c-R+R_w)(c+R+R_w))/2. Used for partly waked rotors after Katic et al. 1986.
func OverlapArea(r, rw, c float64) float64 {
	if c >= r+rw {
		return 0
	}
	if c <= math.Abs(rw-r) {
		m := math.Min(r, rw)
		return math.Pi * m * m
	}
	cosR := (float64(c*c) + float64(r*r) - float64(rw*rw)) / (2 * c * r)
	cosW := (float64(c*c) + float64(rw*rw) - float64(r*r)) / (2 * c * rw)
	clamp := func(x float64) float64 { return math.Max(-1, math.Min(1, x)) }
	root := (-c + r + rw) * (c + r - rw) * (c - r + rw) * (c + r + rw)
	return float64(r*r*math.Acos(clamp(cosR))) + float64(rw*rw*math.Acos(clamp(cosW))) - float64(0.5*math.Sqrt(math.Max(0, root)))
}

// WakeGrowth is k* = 0.3837 TI + 0.003678, the growth of the Gaussian wake, from the ambient turbulence
// intensity TI (share). Fitted for TI from 0.065 to 0.15. Source: Niayifar & Porte-Agel 2016.
func WakeGrowth(tiFrac float64) float64 { return float64(0.3837*tiFrac) + 0.003678 }

// GaussianDeficit is the share of speed lost x/D behind and r/D beside a rotor's axis:
// delta = (1 - sqrt(1 - Ct/(8 s^2))) exp(-r^2/2 s^2), s = sigma/D = k* x/D + 0.2 sqrt(beta),
// beta = (1 + sqrt(1-Ct))/(2 sqrt(1-Ct)), lengths in rotor diameters, Ct 0 to MaxCt. Close behind the
// rotor, where the first root has no real value, it is taken as 0 (wind on the axis fully stopped);
// 0 for x <= 0. Meant for x above about 3 D. Source: Bastankhah & Porte-Agel 2014.
func GaussianDeficit(ct, kStar, xPerD, rPerD float64) float64 {
	if xPerD <= 0 || ct <= 0 {
		return 0
	}
	return gaussian(ct, float64(kStar*xPerD)+gaussianEpsilon(ct), rPerD*rPerD)
}

// gaussianEpsilon is the width of the wake at the rotor in diameters.
func gaussianEpsilon(ct float64) float64 {
	q := math.Sqrt(1 - ct)
	return 0.2 * math.Sqrt(0.5*(1+q)/q)
}

// Beyond 8 sigma a wake is below 2e-14 of the speed and counts as none.
const gaussianReach = 8.0

func gaussian(ct, s, r2 float64) float64 {
	s2 := s * s
	peak := 1.0
	if root := 1 - ct/(8*s2); root > 0 {
		peak = 1 - math.Sqrt(root)
	}
	return peak * math.Exp(-r2/(2*s2))
}

// Constants of the IEA Wind Task 37 case studies, which fix thrust and turbulence (0.075).
const (
	iea37Ct = 8.0 / 9
	iea37K  = 0.0324555
)

// IEA37Deficit is the share of speed lost x m behind and y m beside a rotor's axis in the case studies
// of IEA Wind Task 37: sigma = 0.0324555 x + D/sqrt(8),
// delta = (1 - sqrt(1 - Ct/(8 sigma^2/D^2))) exp(-(y/sigma)^2/2), Ct = 8/9 at every speed, stopped
// machines included; 0 for x <= 0. Source: Baker et al. 2019, wind farm layout optimisation case
// studies of IEA Wind Task 37.
func IEA37Deficit(xM, yM, rotorDiameterM float64) float64 {
	if xM <= 0 {
		return 0
	}
	s := float64(iea37K*xM)/rotorDiameterM + 1/math.Sqrt(8)
	y := yM / rotorDiameterM
	return gaussian(iea37Ct, s, y*y)
}
