package solar

import "math"

// Glass is the front of a panel as light at a slant sees it. Ar is the angular loss coefficient: 0.16
// for plain glass, 0.14 for anti-reflective glass, in (0, 1).
type Glass struct{ Ar float64 }

// Beam gives the share of beam that passes relative to light from straight ahead:
// (1 - e^(-cos i/a_r))/(1 - e^(-1/a_r)); 0 from behind. Source: Martin and Ruiz 2001, Solar Energy
// Materials and Solar Cells 70:25.
func (g Glass) Beam(cosIncidence float64) float64 {
	if cosIncidence <= 0 {
		return 0
	}
	return g.beam(cosIncidence, g.straight())
}

// straight is what Beam measures against, kept where many moments are reckoned.
func (g Glass) straight() float64 { return math.Expm1(-1 / g.Ar) }

func (g Glass) beam(cosIncidence, straight float64) float64 {
	return math.Expm1(-cosIncidence/g.Ar) / straight
}

func (g Glass) diffuse(q float64) float64 {
	c1, c2 := 4/(3*math.Pi), float64(0.5*g.Ar)-0.154
	return -math.Expm1(-(float64(c1*q) + float64(c2*float64(q*q))) / g.Ar)
}

// Sky gives the same for isotropic sky light on a plane of a tilt:
// 1 - exp{-(1/a_r)[c1 q + c2 q^2]}, q = sin b + (pi - b - sin b)/(1 + cos b), c1 = 4/(3 pi),
// c2 = 0.5 a_r - 0.154, b = tiltDeg from 0 to 180. Within 0.008 of the hemisphere integrated
// numerically. Source: Martin and Ruiz 2001 with the correction of 2013, Solar Energy Materials and
// Solar Cells 70:25 and 110:134.
func (g Glass) Sky(tiltDeg float64) float64 {
	b := tiltDeg * radPerDeg
	return g.diffuse(math.Sin(b) + lune(math.Pi-b))
}

// Ground gives the same for light from the ground: q = sin b + (b - sin b)/(1 - cos b). Within 0.011
// of the hemisphere integrated numerically. Source as for Sky.
func (g Glass) Ground(tiltDeg float64) float64 {
	b := tiltDeg * radPerDeg
	return g.diffuse(math.Sin(b) + lune(b))
}

// lune gives (x - sin x)/(1 - cos x) with its limit x/3 at 0.
func lune(x float64) float64 {
	if math.Abs(x) < 1e-4 {
		return x / 3
	}
	return (x - math.Sin(x)) / (1 - math.Cos(x))
}

// ASHRAEBeam gives 1 - b0 (1/cos i - 1) with b0 = 0.05, at least 0; an alternative to Glass.Beam.
// Source: Souka and Safwat 1966, Solar Energy 10:170; ASHRAE Standard 93.
func ASHRAEBeam(cosIncidence float64) float64 {
	if cosIncidence <= 0 {
		return 0
	}
	return max(0, 1-float64(0.05*(1/cosIncidence-1)))
}

// FresnelTransmission gives the light that reaches the cells through one pane:
//
//	tau = e^(-K L/cos r) {1 - [sin^2(r-i)/sin^2(r+i) + tan^2(r-i)/tan^2(r+i)]/2}, sin r = sin i/n
//	tau(0) = e^(-K L) {1 - [(n-1)/(n+1)]^2}
//
// n = 1.526, K = 4 per m, L = 2 mm, i = incidenceDeg from 0 to 90; 0 at 90 and beyond. Source: De Soto,
// Klein and Beckman 2006, Solar Energy 80:78.
func FresnelTransmission(incidenceDeg float64) float64 {
	const n, K, L = 1.526, 4.0, 0.002
	if incidenceDeg >= 90 {
		return 0
	}
	if incidenceDeg < 1e-3 {
		s := (n - 1) / (n + 1)
		return math.Exp(-K*L) * (1 - s*s)
	}
	i := incidenceDeg * radPerDeg
	r := math.Asin(math.Sin(i) / n)
	sq := func(x float64) float64 { return float64(x * x) }
	parallel := sq(math.Sin(r-i)) / sq(math.Sin(r+i))
	across := sq(math.Tan(r-i)) / sq(math.Tan(r+i))
	return math.Exp(-K*L/math.Cos(r)) * (1 - float64(0.5*(parallel+across)))
}

// FresnelBeam gives FresnelTransmission relative to light from straight ahead; an alternative to
// Glass.Beam.
func FresnelBeam(incidenceDeg float64) float64 {
	return FresnelTransmission(incidenceDeg) / FresnelTransmission(0)
}
