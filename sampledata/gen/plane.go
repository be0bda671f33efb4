package gen

import (
	"math"

	"groundtally/geo"
)

// The plane of the island: metres east and north of an origin in zone 26 of the universal transverse
// Mercator system on WGS 84, whose central meridian is 27 W. Plane and EPSG:32626 thus differ by a
// shift alone, and the terrain grid lies straight in both.
const (
	centralMeridianDeg = -27.0
	originEastingM     = 500000.0
	originNorthingM    = 5261000.0
)

// lonLat gives the position on WGS 84 of a point of the plane.
func lonLat(p geo.XY) geo.LonLat {
	return utmInverse(p.X+originEastingM, p.Y+originNorthingM, centralMeridianDeg)
}

// Ellipsoid WGS 84 and the constants of the universal transverse Mercator system.
const (
	semiMajorM   = 6378137.0
	flattening   = 1 / 298.257223563
	utmScale     = 0.9996
	utmFalseEast = 500000.0
)

// thirdFlattening is n = f / (2 - f); rectifyingRadius is A of the Krueger series.
var (
	thirdFlattening  = flattening / (2 - flattening)
	rectifyingRadius = semiMajorM / (1 + thirdFlattening) * (1 + math.Pow(thirdFlattening, 2)/4 + math.Pow(thirdFlattening, 4)/64)
)

// series gives Σ c_j·n^j for j from 1.
func series(c ...float64) float64 {
	n, sum := 1.0, 0.0
	for _, v := range c {
		n = n * thirdFlattening
		sum += float64(v * n)
	}
	return sum
}

// Coefficients of the Krueger series to the fourth order of n: alpha forward, beta inverse, delta from
// conformal to geodetic latitude.
var (
	kruegerAlpha = [4]float64{
		series(1.0/2, -2.0/3, 5.0/16, 41.0/180),
		series(0, 13.0/48, -3.0/5, 557.0/1440),
		series(0, 0, 61.0/240, -103.0/140),
		series(0, 0, 0, 49561.0/161280),
	}
	kruegerBeta = [4]float64{
		series(1.0/2, -2.0/3, 37.0/96, -1.0/360),
		series(0, 1.0/48, 1.0/15, -437.0/1440),
		series(0, 0, 17.0/480, -37.0/840),
		series(0, 0, 0, 4397.0/161280),
	}
	kruegerDelta = [4]float64{
		series(2, -2.0/3, -2, 116.0/45),
		series(0, 7.0/3, -8.0/5, -227.0/45),
		series(0, 0, 56.0/15, -136.0/35),
		series(0, 0, 0, 4279.0/630),
	}
)

// utmForward projects a position to the northern half of a transverse Mercator zone.
//
//	t  = sinh(artanh(sin φ) - s·artanh(s·sin φ)),  s = 2·sqrt(n)/(1+n)
//	ξ' = atan2(t, cos λ),  η' = artanh(sin λ / sqrt(1 + t²))
//	N  = k0·A·(ξ' + Σ α_j sin 2jξ' cosh 2jη'),  E = 500000 + k0·A·(η' + Σ α_j cos 2jξ' sinh 2jη')
//
// φ is latitude (Lat, degrees, 0 to 84), λ longitude from the central meridian (degrees, within 6).
// Outside that range the series loses accuracy without warning. Inside it the error is below a tenth of
// a millimetre. Source: L. Krueger, Konforme Abbildung des Erdellipsoids in der Ebene, 1912.
func utmForward(p geo.LonLat, meridianDeg float64) (eastingM, northingM float64) {
	phi, lambda := p.Lat*math.Pi/180, (p.Lon-meridianDeg)*math.Pi/180
	s := 2 * math.Sqrt(thirdFlattening) / (1 + thirdFlattening)
	t := math.Sinh(math.Atanh(math.Sin(phi)) - float64(s*math.Atanh(s*math.Sin(phi))))
	xi1 := math.Atan2(t, math.Cos(lambda))
	eta1 := math.Atanh(math.Sin(lambda) / math.Sqrt(1+float64(t*t)))
	xi, eta := xi1, eta1
	for j, a := range kruegerAlpha {
		k := 2 * float64(j+1)
		xi += float64(a * math.Sin(k*xi1) * math.Cosh(k*eta1))
		eta += float64(a * math.Cos(k*xi1) * math.Sinh(k*eta1))
	}
	return utmFalseEast + float64(utmScale*rectifyingRadius*eta), utmScale * rectifyingRadius * xi
}

// utmInverse is the inverse of utmForward, with the β and δ coefficients of the same source.
func utmInverse(eastingM, northingM, meridianDeg float64) geo.LonLat {
	xi := northingM / (utmScale * rectifyingRadius)
	eta := (eastingM - utmFalseEast) / (utmScale * rectifyingRadius)
	xi1, eta1 := xi, eta
	for j, b := range kruegerBeta {
		k := 2 * float64(j+1)
		xi1 -= float64(b * math.Sin(k*xi) * math.Cosh(k*eta))
		eta1 -= float64(b * math.Cos(k*xi) * math.Sinh(k*eta))
	}
	chi := math.Asin(math.Sin(xi1) / math.Cosh(eta1))
	phi := chi
	for j, d := range kruegerDelta {
		phi += float64(d * math.Sin(2*float64(j+1)*chi))
	}
	lambda := math.Atan2(math.Sinh(eta1), math.Cos(xi1))
	return geo.LonLat{Lon: meridianDeg + lambda*180/math.Pi, Lat: phi * 180 / math.Pi}
}
