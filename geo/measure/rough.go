package measure

import (
	"fmt"
	"math"

	"groundtally/geo"
)

// MeanEarthRadiusM is the mean radius R₁ = (2a + b)/3 of the WGS 84 ellipsoid in metres.
const MeanEarthRadiusM = 6371008.7714

// RoughDistanceM gives the great-circle distance in metres on a sphere of the mean radius, by the
// haversine formula. It is true to 0.6 %, so it serves to catch gross mistakes, never as a result.
//
//	hav = sin²(Δφ/2) + cos φ₁ · cos φ₂ · sin²(Δλ/2);  d = 2R·asin √hav
func RoughDistanceM(a, b geo.LonLat) float64 {
	const rad = math.Pi / 180
	sp, sl := math.Sin((b.Lat-a.Lat)*rad/2), math.Sin((b.Lon-a.Lon)*rad/2)
	hav := float64(sp*sp) + float64(math.Cos(a.Lat*rad)*math.Cos(b.Lat*rad))*float64(sl*sl)
	return 2 * MeanEarthRadiusM * math.Asin(math.Min(1, math.Sqrt(hav)))
}

// RoughAreaM2 gives the area in m² of polygons in degrees on a sphere of the mean radius, with edges
// straight in longitude against the sine of latitude. It is true to about 0.6 % for parcels, so it
// serves to catch gross mistakes such as swapped axes, never as a result.
//
//	A = R² · |½ Σ (λᵢ·sin φᵢ₊₁ − λᵢ₊₁·sin φᵢ)|
//
// Source: Lambert's cylindrical equal-area projection, Snyder 1987 (USGS PP 1395), equations 10-1, 10-2.
func RoughAreaM2(g geo.LonLatGeometry) float64 {
	const rad = math.Pi / 180
	flat := geo.Map(g, func(p geo.LonLat) geo.XY {
		return geo.XY{X: p.Lon * rad * MeanEarthRadiusM, Y: math.Sin(p.Lat*rad) * MeanEarthRadiusM}
	})
	return AreaM2(flat)
}

// CheckArea gives an error when an area measured in the frame differs by more than 2 % from the rough
// spherical area of the same polygons: the frame or the coordinates are then wrong.
func CheckArea(frameM2 float64, g geo.LonLatGeometry) error {
	rough := RoughAreaM2(g)
	if math.IsNaN(frameM2) || math.Abs(frameM2-rough) > 0.02*rough+1 {
		return fmt.Errorf("area %.0f m2 in the frame does not agree with %.0f m2 on the sphere", frameM2, rough)
	}
	return nil
}
