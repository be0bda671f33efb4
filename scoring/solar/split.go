package solar

// ErbsHourly gives the diffuse share of an hour's light on the horizontal from its clearness
// kt = GHI/G_o:
//
//	kt <= 0.22: 1 - 0.09 kt
//	kt <= 0.80: 0.9511 - 0.1604 kt + 4.388 kt^2 - 16.638 kt^3 + 12.336 kt^4
//	above:      0.165
//
// kt is drawn into [0, 1]. Source: Erbs, Klein and Duffie 1982, Solar Energy 28:293.
func ErbsHourly(kt float64) float64 {
	kt = clamp(kt, 0, 1)
	switch {
	case kt <= 0.22:
		return 1 - float64(0.09*kt)
	case kt <= 0.80:
		return 0.9511 + float64(kt*(-0.1604+float64(kt*(4.388+float64(kt*(-16.638+float64(12.336*kt)))))))
	}
	return 0.165
}

// ErbsDaily gives the diffuse share of a day's light from the day's clearness K = H/H_o and the
// sunset hour angle ws = sunsetDeg:
//
//	ws <= 81.4: 1 - 0.2727 K + 2.4495 K^2 - 11.9514 K^3 + 9.3879 K^4, 0.143 from K = 0.715
//	ws >  81.4: 1 + 0.2832 K - 2.5557 K^2 + 0.8448 K^3, 0.175 from K = 0.722
//
// K is drawn into [0, 1]. The share is drawn into [0, 1]: at small K the second form exceeds 1 by up
// to 0.008. Source: Erbs, Klein and Duffie 1982, Solar Energy 28:293.
func ErbsDaily(K, sunsetDeg float64) float64 {
	K = clamp(K, 0, 1)
	if sunsetDeg <= 81.4 {
		if K >= 0.715 {
			return 0.143
		}
		return min(1, 1+float64(K*(-0.2727+float64(K*(2.4495+float64(K*(-11.9514+float64(9.3879*K))))))))
	}
	if K >= 0.722 {
		return 0.175
	}
	return min(1, 1+float64(K*(0.2832+float64(K*(-2.5557+float64(0.8448*K))))))
}

// ErbsMonthly gives the diffuse share of a month's light from the month's clearness K:
//
//	ws <= 81.4: 1.391 - 3.560 K + 4.189 K^2 - 2.137 K^3
//	ws >  81.4: 1.311 - 3.022 K + 3.427 K^2 - 1.821 K^3
//
// Valid for K from 0.3 to 0.8; K outside counts as the nearest limit. Source: Erbs, Klein and Duffie
// 1982, Solar Energy 28:293.
func ErbsMonthly(K, sunsetDeg float64) float64 {
	K = clamp(K, 0.3, 0.8)
	if sunsetDeg <= 81.4 {
		return 1.391 + float64(K*(-3.560+float64(K*(4.189-float64(2.137*K)))))
	}
	return 1.311 + float64(K*(-3.022+float64(K*(3.427-float64(1.821*K)))))
}
