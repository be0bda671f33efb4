package sun

import (
	"math"
	"time"
)

// SolarConstantWPerM2 is the irradiance of the sun at one astronomical unit, standard uncertainty
// 0.5. Source: Gueymard 2018, Solar Energy 168:434.
const SolarConstantWPerM2 = 1361.1

// TypicalYear is the year whose sun stands for a typical year of 365 days.
const TypicalYear = 2025

// polarGuardDeg keeps tan(latitude) finite at the poles.
const polarGuardDeg = 89.999

func guardLat(latDeg float64) float64 {
	return math.Max(-polarGuardDeg, math.Min(polarGuardDeg, latDeg))
}

// NormalWPerM2 gives the irradiance above the atmosphere on a plane that faces the sun,
// G_on = G_sc / R^2, R = distanceAU.
func NormalWPerM2(distanceAU float64) float64 {
	return SolarConstantWPerM2 / float64(distanceAU*distanceAU)
}

// SunsetHourAngleDeg gives w_s = acos(-tan p tan d), p = latDeg, d = declinationDeg, for the sun's
// centre on a flat horizon without refraction: 0 in the polar night, 180 under the midnight sun.
func SunsetHourAngleDeg(latDeg, declinationDeg float64) float64 {
	x := -tand(guardLat(latDeg)) * tand(declinationDeg)
	return math.Acos(clampUnit(x)) / radPerDeg
}

// DailyWhPerM2 gives the light of a day above the atmosphere on the horizontal:
//
//	H_o = (24/pi) G_on (cos p cos d sin w_s + (pi w_s/180) sin p sin d)
//
// G_on = normalWPerM2, p = latDeg, d = declinationDeg. Source: Duffie and Beckman 2013, eq. 1.10.3.
func DailyWhPerM2(normalWPerM2, latDeg, declinationDeg float64) float64 {
	ws := SunsetHourAngleDeg(latDeg, declinationDeg)
	return HourlyWhPerM2(normalWPerM2, latDeg, declinationDeg, -ws, ws)
}

// HourlyWhPerM2 gives the light above the atmosphere on the horizontal between two hour angles:
//
//	I_o = (12/pi) G_on [cos p cos d (sin w2 - sin w1) + (pi/180)(w2 - w1) sin p sin d]
//
// with both limits drawn in to sunrise and sunset. Source: Duffie and Beckman 2013, eq. 1.10.4.
func HourlyWhPerM2(normalWPerM2, latDeg, declinationDeg, fromDeg, toDeg float64) float64 {
	ws := SunsetHourAngleDeg(latDeg, declinationDeg)
	w1, w2 := math.Max(-ws, fromDeg), math.Min(ws, toDeg)
	if w2 <= w1 {
		return 0
	}
	lat := guardLat(latDeg)
	cc := float64(cosd(lat) * cosd(declinationDeg))
	ss := float64(sind(lat) * sind(declinationDeg))
	v := float64(cc*(sind(w2)-sind(w1))) + float64(radPerDeg*(w2-w1)*ss)
	return math.Max(0, 12/math.Pi*normalWPerM2*v)
}

// monthDays gives the days of each month of the typical year, January first.
var monthDays = [12]int{31, 28, 31, 30, 31, 30, 31, 31, 30, 31, 30, 31}

// DaysInMonth gives the days of a month of the typical year; month 1 is January.
func DaysInMonth(month time.Month) int { return monthDays[month-1] }

// MonthMean gives means over all days of a month of the typical year, with the sun at local mean noon:
// declination, normal irradiance above the atmosphere in W/m2, and H_o in Wh/m2 for each day. The light
// of one day with the first two stays within 0.2 % of the third to 43 degrees of latitude and within
// 1.1 % to 60 degrees.
func MonthMean(latDeg, lonDeg float64, month time.Month) (declinationDeg, normalWPerM2, dailyWhPerM2 float64) {
	days := DaysInMonth(month)
	for day := 1; day <= days; day++ {
		a := NoonOf(month, day, lonDeg)
		g := NormalWPerM2(a.DistanceAU)
		declinationDeg += a.DeclinationDeg
		normalWPerM2 += g
		dailyWhPerM2 += DailyWhPerM2(g, latDeg, a.DeclinationDeg)
	}
	n := float64(days)
	return declinationDeg / n, normalWPerM2 / n, dailyWhPerM2 / n
}

// MonthMeanDailyWhPerM2 gives the mean over all days of a month of the typical year of H_o.
func MonthMeanDailyWhPerM2(latDeg, lonDeg float64, month time.Month) float64 {
	_, _, h := MonthMean(latDeg, lonDeg, month)
	return h
}

// NoonOf gives the sun at local mean noon of a day of the typical year.
func NoonOf(month time.Month, day int, lonDeg float64) Apparent {
	return At(JulianDay(time.Date(TypicalYear, month, day, 12, 0, 0, 0, time.UTC)) - lonDeg/360)
}

var kleinDays = [12]int{17, 16, 16, 15, 15, 11, 17, 16, 15, 15, 14, 10}

// KleinDay gives the day of a month whose sun stands for the month's mean. Not usable beyond 66.5
// degrees of latitude. Source: Klein 1977, Solar Energy 19:325.
func KleinDay(month time.Month) int { return kleinDays[month-1] }

// KleinDeclinationDeg gives the declination of the Klein day by Cooper's series, as the table of the
// source does. The true declination of the date differs by up to 0.9 degrees; the engine works with
// MonthMean, which meets the light of the month better. Source: Klein 1977, Solar Energy 19:325.
func KleinDeclinationDeg(month time.Month) float64 {
	n := KleinDay(month)
	for _, d := range monthDays[:month-1] {
		n += d
	}
	return CooperDeclinationDeg(float64(n))
}

// AirMass gives the relative optical air mass:
//
//	m = 1 / (cos z + 0.50572 (96.07995 - z)^-1.6364)
//
// z = zenithDeg, 0 to 90; a z beyond 90 counts as 90. Source: Kasten and Young 1989, Applied Optics
// 28:4735.
func AirMass(zenithDeg float64) float64 {
	z := math.Max(0, math.Min(90, zenithDeg))
	return 1 / (cosd(z) + float64(0.50572*math.Pow(96.07995-z, -1.6364)))
}
