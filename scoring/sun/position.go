package sun

import (
	"math"
	"time"
)

const (
	jdJ2000 = 2451545.0 // 2000-01-01 12:00 TT
	jd1900  = 2415020.0 // 1899-12-31 12:00
	// deltaTS is terrestrial time minus universal time in seconds in the 2020s; 10 s move the sun
	// by 0.0001 degrees.
	deltaTS    = 69.0
	secsPerDay = 86400.0
)

// JulianDay gives the Julian day number with its fraction of a moment, taken in UTC.
//
// JD = floor(365.25 (y+4716)) + floor(30.6001 (m+1)) + d + B - 1524.5, B = 2 - floor(y/100) +
// floor(y/400), with January and February counted as months 13 and 14 of the year before. Gregorian
// dates only. The result resolves 0.04 ms. Source: Meeus 1998, Astronomical Algorithms, chapter 7.
func JulianDay(t time.Time) float64 {
	t = t.UTC()
	y, m, day := float64(t.Year()), float64(t.Month()), float64(t.Day())
	if m <= 2 {
		y, m = y-1, m+12
	}
	b := 2 - math.Floor(y/100) + math.Floor(y/400)
	seconds := float64(t.Hour()*3600+t.Minute()*60+t.Second()) + float64(t.Nanosecond())/1e9
	return math.Floor(float64(365.25*(y+4716))) + math.Floor(float64(30.6001*(m+1))) + day + b - 1524.5 + seconds/secsPerDay
}

// Moment gives the time of a Julian day, rounded to the millisecond.
func Moment(jd float64) time.Time {
	ms := math.Round(float64((jd - jdJ2000) * secsPerDay * 1e3))
	return time.Date(2000, 1, 1, 12, 0, 0, 0, time.UTC).Add(time.Duration(ms) * time.Millisecond)
}

// Apparent is the sun as seen from the centre of the earth.
type Apparent struct {
	DistanceAU        float64 // distance from the earth in astronomical units
	RightAscensionDeg float64 // apparent, 0 to 360
	DeclinationDeg    float64 // apparent
	SiderealDeg       float64 // apparent sidereal time at Greenwich, 0 to 360
	EquationOfTimeMin float64 // apparent minus mean solar time
}

// At gives the apparent place of the sun at the Julian day jdUT (universal time).
//
// Low-precision solar theory: mean longitude L0, mean anomaly M, equation of the centre C with five terms for
// what Venus, Jupiter, the moon and a long period add, apparent longitude with aberration and the main term of
// nutation, obliquity with the same. Largest errors for 2000 to 2049: right ascension 0.005 degrees,
// declination 0.002, altitude 0.006; they grow slowly outside. Source: Meeus 1998, Astronomical Algorithms,
// chapters 12, 22 and 25; the five terms: Meeus 1979, Astronomical Formulae for Calculators, chapter 18; check
// tables sun.csv, sun_positions.csv.
func At(jdUT float64) Apparent {
	T := (jdUT + deltaTS/secsPerDay - jdJ2000) / 36525
	T2 := float64(T * T)
	T3 := float64(T2 * T)
	L0 := 280.46646 + float64(36000.76983*T) + float64(0.0003032*T2)
	M := 357.52911 + float64(35999.05029*T) - float64(0.0001537*T2)
	ecc := 0.016708634 - float64(0.000042037*T) - float64(1.267e-7*T2)
	C := float64((1.914602-float64(0.004817*T)-float64(0.000014*T2))*sind(M)) +
		float64((0.019993-float64(0.000101*T))*sind(2*M)) + float64(0.000289*sind(3*M))
	t := (jdUT + deltaTS/secsPerDay - jd1900) / 36525
	C += float64(0.00134*cosd(153.23+float64(22518.7541*t))) + float64(0.00154*cosd(216.57+float64(45037.5082*t))) +
		float64(0.00200*cosd(312.69+float64(32964.3577*t))) + float64(0.00179*sind(350.74+float64(445267.1142*t)-float64(0.00144*float64(t*t)))) +
		float64(0.00178*sind(231.19+float64(20.20*t)))
	R := float64(1.000001018*(1-float64(ecc*ecc))) / (1 + float64(ecc*cosd(M+C)))
	omega := 125.04 - float64(1934.136*T)
	dpsi := -0.00478 * sind(omega)
	lambda := L0 + C - 0.00569 + dpsi
	eps := 23.43929111 - float64(0.013004167*T) - float64(1.639e-7*T2) + float64(5.036e-7*T3) + float64(0.00256*cosd(omega))
	sl, cl := math.Sincos(lambda * radPerDeg)
	se, ce := math.Sincos(eps * radPerDeg)
	alpha := wrap360(math.Atan2(float64(ce*sl), cl) / radPerDeg)
	delta := math.Asin(clampUnit(float64(se*sl))) / radPerDeg
	nut := float64(dpsi * ce)
	gst := wrap360(280.46061837 + float64(360.98564736629*(jdUT-jdJ2000)) + float64(0.000387933*T2) + nut)
	return Apparent{
		DistanceAU:        R,
		RightAscensionDeg: alpha,
		DeclinationDeg:    delta,
		SiderealDeg:       gst,
		EquationOfTimeMin: 4 * wrap180(L0-0.0057183-alpha+nut),
	}
}

// HourAngleDeg gives the local hour angle H = GST + longitude - right ascension, in [-180, 180).
func (a Apparent) HourAngleDeg(lonDeg float64) float64 {
	return wrap180(a.SiderealDeg + lonDeg - a.RightAscensionDeg)
}

// Place is where the sun stands for an observer.
type Place struct {
	HourAngleDeg         float64
	GeometricDeg         float64 // elevation from the earth's centre, for light above the atmosphere
	TopocentricDeg       float64 // elevation with parallax, without refraction
	ApparentElevationDeg float64 // elevation with parallax and refraction, for shadows and horizons
	AzimuthDeg           float64
}

// Vector gives the direction towards the sun as it is seen, with refraction.
func (p Place) Vector() Vec { return Direction(p.ApparentElevationDeg, p.AzimuthDeg) }

// Air is the state of the air at the observer, needed for refraction.
type Air struct{ PressureHPa, TempC float64 }

// StandardAir gives pressure and temperature of the standard atmosphere at a height above sea level:
// P = 1013.25 (1 - 2.25577e-5 h)^5.25588 hPa, T = 15 - 0.0065 h degrees C, h = elevationM, valid
// from -500 to 11,000 m; heights outside count as the nearest limit. Source: ISO 2533:1975.
func StandardAir(elevationM float64) Air {
	h := math.Max(-500, math.Min(11000, elevationM))
	return Air{
		PressureHPa: 1013.25 * math.Pow(1-float64(2.25577e-5*h), 5.25588),
		TempC:       15 - float64(0.0065*h),
	}
}

// RefractionDeg gives how much the air lifts a body:
//
//	de = (P/1010) (283/(273+T)) 1.02 / (60 tan(e + 10.3/(e+5.11)))
//
// e = elevationDeg without refraction, P = PressureHPa, T = TempC. It is 0 at e <= -0.8 degrees,
// where the sun is below the horizon even when lifted. Source: Saemundsson 1986 in the form of Reda
// and Andreas 2004, Solar Energy 76:577.
func RefractionDeg(elevationDeg float64, air Air) float64 {
	if elevationDeg <= -0.8 || elevationDeg >= 90 {
		return 0
	}
	return (air.PressureHPa / 1010) * (283 / (273 + air.TempC)) * 1.02 / (60 * tand(elevationDeg+10.3/(elevationDeg+5.11)))
}

// Seen gives where the sun stands for an observer:
//
//	e0 = asin(sin p sin d + cos p cos d cos H)
//	A  = 180 + atan2(sin H, cos H sin p - tan d cos p)
//	e1 = e0 - (0.0024428/R) cos e0   (parallax)
//
// p = latDeg, H from lonDeg, d and R from a. At the poles the azimuth follows from the longitude.
// Source: Meeus 1998, chapters 13 and 40.
func (a Apparent) Seen(latDeg, lonDeg float64, air Air) Place {
	H := a.HourAngleDeg(lonDeg)
	v := VectorAt(latDeg, a.DeclinationDeg, H)
	e0 := v.ElevationDeg()
	e1 := e0 - float64((0.0024428/a.DistanceAU)*cosd(e0))
	return Place{
		HourAngleDeg:         H,
		GeometricDeg:         e0,
		TopocentricDeg:       e1,
		ApparentElevationDeg: e1 + RefractionDeg(e1, air),
		AzimuthDeg:           v.AzimuthDeg(),
	}
}

// Where is At followed by Seen for a moment.
func Where(t time.Time, latDeg, lonDeg float64, air Air) Place {
	return At(JulianDay(t)).Seen(latDeg, lonDeg, air)
}

// SolarTimeH gives apparent solar time in hours, 0 to 24:
// ts = UTC + longitude/15 + EoT/60. Source: Duffie and Beckman 2013, section 1.5.
func SolarTimeH(utcH, lonDeg, equationOfTimeMin float64) float64 {
	return wrap360(15*(utcH+lonDeg/15+equationOfTimeMin/60)) / 15
}

// HourAngleOfSolarTime gives w = 15 (ts - 12) degrees in [-180, 180).
func HourAngleOfSolarTime(solarTimeH float64) float64 { return wrap180(15 * (solarTimeH - 12)) }
