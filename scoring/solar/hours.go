package solar

import "math"

// HourShare gives the share of a day's light that falls in the hour around an hour angle:
//
//	r_t = (pi/24) (a + b cos w) (cos w - cos ws) / (sin ws - (pi ws/180) cos ws)
//	a = 0.409 + 0.5016 sin(ws - 60), b = 0.6609 - 0.4767 sin(ws - 60)
//
// w = hourAngleDeg, ws = sunsetDeg in (0, 180]; 0 when the sun is down. The shares of a day add up to
// 0.994 to 1.008; NewClimate brings them to 1. Source: Collares-Pereira and Rabl 1979, Solar Energy
// 22:155.
func HourShare(hourAngleDeg, sunsetDeg float64) float64 {
	a := 0.409 + float64(0.5016*sind(sunsetDeg-60))
	b := 0.6609 - float64(0.4767*sind(sunsetDeg-60))
	return float64((a + float64(b*cosd(hourAngleDeg))) * DiffuseHourShare(hourAngleDeg, sunsetDeg))
}

// DiffuseHourShare gives the same for diffuse light:
// r_d = (pi/24) (cos w - cos ws) / (sin ws - (pi ws/180) cos ws). It is also the hour's share of the
// light above the atmosphere. Source: Liu and Jordan 1960, Solar Energy 4(3):1.
func DiffuseHourShare(hourAngleDeg, sunsetDeg float64) float64 {
	if sunsetDeg <= 0 || math.Abs(hourAngleDeg) >= sunsetDeg {
		return 0
	}
	cws := cosd(sunsetDeg)
	return math.Pi / 24 * (cosd(hourAngleDeg) - cws) / (sind(sunsetDeg) - float64(radPerDeg*sunsetDeg*cws))
}

// TemperatureSwing gives the course of the air temperature about its monthly mean, in K:
//
//	A [0.4632 cos(t - 3.805) + 0.0984 cos(2t - 0.360) + 0.0168 cos(3t - 0.822) + 0.0138 cos(4t - 3.513)]
//	t = 2 pi (h - 1)/24,  A = 25.8 K - 5.21, at least 0
//
// h = solarTimeH, K = the month's clearness. Coldest at 6 h, warmest at 15 h. Source: Erbs, Klein and
// Beckman 1983, ASHRAE Journal 25(6):60.
func TemperatureSwing(solarTimeH, K float64) float64 {
	A := max(0, float64(25.8*K)-5.21)
	t := 2 * math.Pi * (solarTimeH - 1) / 24
	return float64(A * (float64(0.4632*math.Cos(t-3.805)) + float64(0.0984*math.Cos(2*t-0.360)) +
		float64(0.0168*math.Cos(3*t-0.822)) + float64(0.0138*math.Cos(4*t-3.513))))
}
