package solar

import "math"

// DayTypes is how many equally likely kinds of day stand for a month.
const DayTypes = 10

const clearnessLeast = 0.05

// ClearnessMost gives the clearness of the clearest day of a month of mean clearness K:
// K_max = 0.6313 + 0.267 K - 11.9 (K - 0.75)^8, K from 0.1 to 0.8. Source: Hollands and Huget 1983,
// Solar Energy 30:195.
func ClearnessMost(K float64) float64 {
	d := K - 0.75
	d2 := float64(d * d)
	d4 := float64(d2 * d2)
	return 0.6313 + float64(0.267*K) - float64(11.9*float64(d4*d4))
}

// bendtMean gives the mean of the distribution
// F(k) = (e^(g kmin) - e^(g k)) / (e^(g kmin) - e^(g kmax)) for the exponent g.
func bendtMean(g, kmin, kmax float64) float64 {
	if math.Abs(g) < 1e-6 {
		return (kmin + kmax) / 2
	}
	// Both exponentials are divided by the larger one, so that neither overflows.
	w := float64(g * (kmax - kmin))
	if g > 0 {
		e := math.Exp(-w)
		return (float64((kmin-1/g)*e) - (kmax - 1/g)) / (e - 1)
	}
	e := math.Exp(w)
	return ((kmin - 1/g) - float64((kmax-1/g)*e)) / (1 - e)
}

// BendtExponent gives the g at which the distribution of daily clearness has the mean K, by bisection
// on [-60, 60].
func BendtExponent(K, kmin, kmax float64) float64 {
	low, high := -60.0, 60.0
	for range 64 {
		g := (low + high) / 2
		if bendtMean(g, kmin, kmax) < K {
			low = g
		} else {
			high = g
		}
	}
	return (low + high) / 2
}

// DayClearness gives the clearness of DayTypes equally likely days, dullest first, whose mean is the
// month's clearness K exactly:
//
//	K(F) = ln[(1-F) e^(g kmin) + F e^(g kmax)] / g,  F_i = (i - 1/2)/N
//
// kmin = 0.05, kmax = ClearnessMost(K); the quantiles are then scaled to the mean. With K < 0.1 or
// K >= kmax - 0.02 all days have the clearness K. Source: Bendt, Collares-Pereira and Rabl 1981,
// Solar Energy 27:1.
func DayClearness(K float64) [DayTypes]float64 {
	var k [DayTypes]float64
	kmax := ClearnessMost(K)
	if K < 0.1 || K >= kmax-0.02 {
		for i := range k {
			k[i] = K
		}
		return k
	}
	g := BendtExponent(K, clearnessLeast, kmax)
	sum := 0.0
	for i := range k {
		F := (float64(i) + 0.5) / DayTypes
		if math.Abs(g) < 1e-6 {
			k[i] = clearnessLeast + float64(F*(kmax-clearnessLeast))
		} else {
			k[i] = clearnessLeast + math.Log1p(float64(F*math.Expm1(g*(kmax-clearnessLeast))))/g
		}
		sum += k[i]
	}
	for i := range k {
		k[i] *= K * DayTypes / sum
	}
	return k
}
