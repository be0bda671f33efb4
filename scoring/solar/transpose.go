package solar

import "math"

// SkyModel is a published way to bring diffuse light onto a tilted plane.
type SkyModel uint8

// The sky models. HayDavies is the default for comparing sites because it has no bins; Isotropic and
// Perez give the spread between models.
const (
	HayDavies SkyModel = iota
	Isotropic
	Perez
)

func (m SkyModel) String() string { return [...]string{"Hay-Davies", "isotropic", "Perez"}[m] }

// BeamRatio gives R_b = max(0, cos i)/max(cos z, cos 85), i the angle of incidence on the plane, z the
// zenith angle. Source: Duffie and Beckman 2013, section 1.8.
func BeamRatio(cosIncidence, cosZenith float64) float64 {
	return max(0, cosIncidence) / max(cosZenith, cosFloor)
}

// SkyLight is diffuse light from the sky on a plane in W/m2, parted by where it comes from. Around
// the sun it is shaded like the beam.
type SkyLight struct{ AroundSun, Dome, Horizon float64 }

// Sum gives the whole, not less than 0: the horizon part of Perez may be negative.
func (s SkyLight) Sum() float64 { return max(0, s.AroundSun+s.Dome+s.Horizon) }

// Light is the light at one moment. CosZenith and NormalWPerM2, the irradiance above the atmosphere
// on a plane facing the sun, are positive.
type Light struct {
	GHI, DHI, DNI float64 // W/m2
	NormalWPerM2  float64
	CosZenith     float64
}

// IsotropicSky gives DHI (1 + cos b)/2, b = tilt. Source: Liu and Jordan 1963, Solar Energy 7:53.
func IsotropicSky(l Light, cosTilt float64) SkyLight {
	return SkyLight{Dome: float64(l.DHI * (1 + cosTilt) / 2)}
}

// HayDaviesSky gives DHI [A R_b + (1 - A)(1 + cos b)/2], A = DNI/G_on drawn into [0, 1]. Source: Hay
// and Davies 1980, Proceedings of the First Canadian Solar Radiation Data Workshop:59.
func HayDaviesSky(l Light, cosIncidence, cosTilt float64) SkyLight {
	A := clamp(l.DNI/l.NormalWPerM2, 0, 1)
	return SkyLight{
		AroundSun: float64(l.DHI * A * BeamRatio(cosIncidence, l.CosZenith)),
		Dome:      float64(l.DHI * (1 - A) * (1 + cosTilt) / 2),
	}
}

// HDKRSky is HayDaviesSky with the dome times 1 + sqrt(B_h/GHI) sin^3(b/2), B_h = GHI - DHI the beam
// on the horizontal, which brightens the sky near the horizon. Source: Reindl, Beckman and Duffie
// 1990, Solar Energy 45:9.
func HDKRSky(l Light, cosIncidence, cosTilt float64) SkyLight {
	s := HayDaviesSky(l, cosIncidence, cosTilt)
	if l.GHI > 0 {
		f := math.Sqrt(clamp((l.GHI-l.DHI)/l.GHI, 0, 1))
		h := math.Sqrt(max(0, (1-cosTilt)/2))
		s.Dome *= 1 + float64(f*float64(h*h*h))
	}
	return s
}

// perezUpper are the upper limits of the bins of sky clearness; the last bin is open.
var perezUpper = [7]float64{1.065, 1.230, 1.500, 1.950, 2.800, 4.500, 6.200}

// perezF holds F11, F12, F13, F21, F22, F23 of each bin; seven digits as given by R. Perez in 1999,
// which round to Table 6 of Perez et al. 1990.
var perezF = [8][6]float64{
	{-0.0083117, 0.5877285, -0.0620636, -0.0596012, 0.0721249, -0.0220216},
	{0.1299457, 0.6825954, -0.1513752, -0.0189325, 0.0659650, -0.0288748},
	{0.3296958, 0.4868735, -0.2210958, 0.0554140, -0.0639588, -0.0260542},
	{0.5682053, 0.1874525, -0.2951290, 0.1088631, -0.1519229, -0.0139754},
	{0.8730280, -0.3920403, -0.3616149, 0.2255647, -0.4620442, 0.0012448},
	{1.1326077, -1.2367284, -0.4118494, 0.2877813, -0.8230357, 0.0558651},
	{1.0601591, -1.5999137, -0.3589221, 0.2642124, -1.1272340, 0.1310694},
	{0.6777470, -0.3272588, -0.2504286, 0.1561313, -1.3765031, 0.2506212},
}

// PerezSky holds the state of the sky in the model of Perez.
type PerezSky struct {
	Clearness  float64 // epsilon, 1 for an overcast sky
	Brightness float64 // Delta
	F1, F2     float64 // shares around the sun and at the horizon
}

// PerezState gives the state of the sky:
//
//	epsilon = [(DHI + DNI)/DHI + 1.041 z^3]/(1 + 1.041 z^3), Delta = m DHI/G_on
//	F1 = max(0, F11 + F12 Delta + F13 z), F2 = F21 + F22 Delta + F23 z
//
// z in radians, m = airMass; bins are closed below. Without diffuse light the state is zero. Source:
// Perez et al. 1990, Solar Energy 44:271.
func PerezState(l Light, airMass float64) PerezSky {
	return perezState(l, airMass, math.Acos(clamp(l.CosZenith, -1, 1)))
}

func perezState(l Light, airMass, z float64) PerezSky {
	if l.DHI <= 0 {
		return PerezSky{}
	}
	kz3 := 1.041 * float64(z*z*z)
	s := PerezSky{
		Clearness:  ((l.DHI+l.DNI)/l.DHI + kz3) / (1 + kz3),
		Brightness: airMass * l.DHI / l.NormalWPerM2,
	}
	bin := 0
	for bin < len(perezUpper) && s.Clearness >= perezUpper[bin] {
		bin++
	}
	f := perezF[bin]
	s.F1 = max(0, f[0]+float64(f[1]*s.Brightness)+float64(f[2]*z))
	s.F2 = f[3] + float64(f[4]*s.Brightness) + float64(f[5]*z)
	return s
}

// On gives the light of this sky on a plane:
// DHI [(1 - F1)(1 + cos b)/2 + F1 a/b' + F2 sin b], a = max(0, cos i), b' = max(cos 85, cos z).
func (s PerezSky) On(l Light, cosIncidence, cosTilt float64) SkyLight {
	sinTilt := math.Sqrt(max(0, 1-float64(cosTilt*cosTilt)))
	return SkyLight{
		AroundSun: float64(l.DHI * s.F1 * BeamRatio(cosIncidence, l.CosZenith)),
		Dome:      float64(l.DHI * (1 - s.F1) * (1 + cosTilt) / 2),
		Horizon:   float64(l.DHI * s.F2 * sinTilt),
	}
}

// GroundLight gives the light that the ground throws onto a plane: albedo GHI (1 - cos b)/2. Source:
// Liu and Jordan 1963, Solar Energy 7:53.
func GroundLight(ghi, albedo, cosTilt float64) float64 {
	return float64(albedo * ghi * (1 - cosTilt) / 2)
}

// MonthlyBeamRatio gives the mean ratio of beam on a plane facing the equator to beam on the
// horizontal over a day:
//
//	[cos(p-b) cos d sin w' + (pi/180) w' sin(p-b) sin d] / [cos p cos d sin ws + (pi/180) ws sin p sin d]
//	w' = min(ws, acos(-tan(p-b) tan d))
//
// p = latDeg, d = declinationDeg, b = tiltDeg; p + b instead of p - b in the south. Needs a sun that
// rises: ws > 0. Source: Liu and Jordan 1962; Klein 1977, Solar Energy 19:325.
func MonthlyBeamRatio(latDeg, declinationDeg, tiltDeg float64) (ratio float64, ok bool) {
	ws := sunsetDeg(latDeg, declinationDeg)
	den := float64(cosd(latDeg)*cosd(declinationDeg)*sind(ws)) + float64(radPerDeg*ws*sind(latDeg)*sind(declinationDeg))
	if ws <= 0 || den <= 0 {
		return 0, false
	}
	q := latDeg - tiltDeg
	if latDeg < 0 {
		q = latDeg + tiltDeg
	}
	w := min(ws, sunsetDeg(q, declinationDeg))
	num := float64(cosd(q)*cosd(declinationDeg)*sind(w)) + float64(radPerDeg*w*sind(q)*sind(declinationDeg))
	return max(0, num) / den, true
}

// MonthlyTilted gives a month's light on a plane facing the equator, in the unit of H:
// H [(1 - f) R + f (1 + cos b)/2 + albedo (1 - cos b)/2], f = ErbsMonthly, R = MonthlyBeamRatio. A
// check on the hourly engine. Source: Liu and Jordan 1962; Klein 1977, Solar Energy 19:325.
func MonthlyTilted(H, K, latDeg, declinationDeg, tiltDeg, albedo float64) (tilted float64, ok bool) {
	R, ok := MonthlyBeamRatio(latDeg, declinationDeg, tiltDeg)
	if !ok {
		return 0, false
	}
	f := ErbsMonthly(K, sunsetDeg(latDeg, declinationDeg))
	cb := cosd(tiltDeg)
	return float64(H * (float64((1-f)*R) + float64(f*(1+cb)/2) + float64(albedo*(1-cb)/2))), true
}
