package sun

import "math"

const radPerDeg = math.Pi / 180

func sind(deg float64) float64 { return math.Sin(deg * radPerDeg) }
func cosd(deg float64) float64 { return math.Cos(deg * radPerDeg) }
func tand(deg float64) float64 { return math.Tan(deg * radPerDeg) }

func clampUnit(x float64) float64 { return math.Max(-1, math.Min(1, x)) }

// wrap360 brings an angle into [0, 360), wrap180 into [-180, 180).
func wrap360(deg float64) float64 {
	d := math.Mod(deg, 360)
	if d < 0 {
		d += 360
	}
	if d >= 360 { // a tiny negative angle rounds up to the full circle
		d = 0
	}
	return d
}

func wrap180(deg float64) float64 { return wrap360(deg+180) - 180 }

// Vec is a direction or a normal in the local frame: X east, Y north, Z up.
type Vec struct{ X, Y, Z float64 }

// Dot gives the scalar product; of two unit vectors it is the cosine of the angle between them.
func (v Vec) Dot(w Vec) float64 {
	return float64(v.X*w.X) + float64(v.Y*w.Y) + float64(v.Z*w.Z)
}

// Cross gives the vector product v x w.
func (v Vec) Cross(w Vec) Vec {
	return Vec{
		float64(v.Y*w.Z) - float64(v.Z*w.Y),
		float64(v.Z*w.X) - float64(v.X*w.Z),
		float64(v.X*w.Y) - float64(v.Y*w.X),
	}
}

// ElevationDeg gives the angle above the horizontal of a unit vector, AzimuthDeg its bearing.
func (v Vec) ElevationDeg() float64 { return math.Asin(clampUnit(v.Z)) / radPerDeg }

// AzimuthDeg gives the bearing of the vector, clockwise from north, in [0, 360).
func (v Vec) AzimuthDeg() float64 { return wrap360(math.Atan2(v.X, v.Y) / radPerDeg) }

// Direction gives the unit vector towards a point of the sky:
// s = (cos e sin A, cos e cos A, sin e), e = elevationDeg, A = azimuthDeg.
func Direction(elevationDeg, azimuthDeg float64) Vec {
	ce := cosd(elevationDeg)
	return Vec{ce * sind(azimuthDeg), ce * cosd(azimuthDeg), sind(elevationDeg)}
}

// PlaneNormal gives the outward normal of a plane:
// n = (sin b sin A, sin b cos A, cos b), b = tiltDeg (0 flat, 90 vertical, to 180), A = azimuthDeg,
// the bearing that the plane faces.
func PlaneNormal(tiltDeg, azimuthDeg float64) Vec {
	sb := sind(tiltDeg)
	return Vec{sb * sind(azimuthDeg), sb * cosd(azimuthDeg), cosd(tiltDeg)}
}

// IncidenceDeg gives the angle between a direction and a normal, 0 to 180; over 90 the light is
// behind the plane.
func IncidenceDeg(s, n Vec) float64 { return math.Acos(clampUnit(s.Dot(n))) / radPerDeg }

// VectorAt gives the direction of the sun's centre without parallax or refraction:
//
//	s = (-cos d sin w, sin d cos p - cos d cos w sin p, sin p sin d + cos p cos d cos w)
//
// p = latDeg, d = declinationDeg, w = hourAngleDeg. Valid on both hemispheres without a change of
// sign. Source: spherical astronomy, as in Duffie and Beckman 2013, section 1.6.
func VectorAt(latDeg, declinationDeg, hourAngleDeg float64) Vec {
	sp, cp := math.Sincos(latDeg * radPerDeg)
	sd, cd := math.Sincos(declinationDeg * radPerDeg)
	sw, cw := math.Sincos(hourAngleDeg * radPerDeg)
	return Vec{
		X: -float64(cd * sw),
		Y: float64(sd*cp) - float64(float64(cd*cw)*sp),
		Z: float64(sp*sd) + float64(float64(cp*cd)*cw),
	}
}
