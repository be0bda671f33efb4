package sun

// The series of this file take the number of the day in the year. They are here to repeat published
// worked examples; the engine uses At.

// CooperDeclinationDeg gives d = 23.45 sin(360 (284+n)/365), n = dayOfYear; up to 1.4 degrees off
// the true declination. Source: Cooper 1969, Solar Energy 12:333.
func CooperDeclinationDeg(dayOfYear float64) float64 {
	return 23.45 * sind(360*(284+dayOfYear)/365)
}

// DistanceFactorOfDay gives E_0 = 1 + 0.033 cos(360 n/365), the light at the earth relative to that
// at one astronomical unit. Source: Duffie and Beckman 2013, eq. 1.4.1a.
func DistanceFactorOfDay(dayOfYear float64) float64 {
	return 1 + float64(0.033*cosd(360*dayOfYear/365))
}

// SpencerEquationOfTimeMin gives
//
//	E = 229.2 (0.000075 + 0.001868 cos G - 0.032077 sin G - 0.014615 cos 2G - 0.04089 sin 2G)
//
// G = 360 (n-1)/365, n = dayOfYear; up to 0.9 minutes off on calendar dates because of the leap
// cycle. Source: Spencer 1971, Search 2(5):172.
func SpencerEquationOfTimeMin(dayOfYear float64) float64 {
	g := 360 * (dayOfYear - 1) / 365
	return 229.2 * (0.000075 + float64(0.001868*cosd(g)) - float64(0.032077*sind(g)) - float64(0.014615*cosd(2*g)) - float64(0.04089*sind(2*g)))
}
