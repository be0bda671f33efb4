package solar

import (
	"math"

	"groundtally/scoring/sun"
)

// Frame is the frame of long parallel rows. X lies across the rows, Y along the axis, Z across both,
// upwards. A rotation t > 0 tips the panel's normal towards X: n = sin t X + cos t Z.
type Frame struct {
	X, Y, Z      sun.Vec
	AxisTiltDeg  float64 // positive: the axis descends towards its azimuth
	CrossTiltDeg float64 // positive: the ground rises towards X
}

// NewFrame gives the frame of rows whose axis points to axisAzimuthDeg, laid on ground of a slope that
// falls towards aspectDeg. X points to axisAzimuthDeg + 90, so rows that face A have the axis A - 90.
//
//	X = (cos A, -sin A, 0), Y = (cos ba sin A, cos ba cos A, -sin ba), Z = X x Y
//	ba = atan(tan slope cos(A - aspect)), bc = atan2(u.Z, u.X), u = Y x ground normal
//
// A = axisAzimuthDeg, ba = AxisTiltDeg, bc = CrossTiltDeg; slope from 0 to below 90. Source: Anderson
// and Mikofski 2020, NREL/TP-5K00-76626, derived again with vectors; the sign of bc is opposite there.
func NewFrame(axisAzimuthDeg, slopeDeg, aspectDeg float64) Frame {
	A := axisAzimuthDeg
	ba := math.Atan(float64(tand(slopeDeg)*cosd(A-aspectDeg))) / radPerDeg
	f := Frame{
		X:           sun.Vec{X: cosd(A), Y: -sind(A)},
		Y:           sun.Vec{X: float64(cosd(ba) * sind(A)), Y: float64(cosd(ba) * cosd(A)), Z: -sind(ba)},
		AxisTiltDeg: ba,
	}
	f.Z = f.X.Cross(f.Y)
	u := f.Y.Cross(sun.PlaneNormal(slopeDeg, aspectDeg))
	f.CrossTiltDeg = math.Atan2(u.Dot(f.Z), u.Dot(f.X)) / radPerDeg
	return f
}

// Normal gives the normal of panels at a rotation.
func (f Frame) Normal(rotationDeg float64) sun.Vec {
	st, ct := sind(rotationDeg), cosd(rotationDeg)
	return sun.Vec{
		X: float64(st*f.X.X) + float64(ct*f.Z.X),
		Y: float64(st*f.X.Y) + float64(ct*f.Z.Y),
		Z: float64(st*f.X.Z) + float64(ct*f.Z.Z),
	}
}

// SunAngleDeg gives the angle of the sun seen along the rows, from Z towards X:
// atan2(s.X, s.Z), -180 to 180. For rows on flat ground 90 less its size is the profile angle. A
// tracker that follows the sun has this rotation.
func (f Frame) SunAngleDeg(s sun.Vec) float64 { return math.Atan2(s.Dot(f.X), s.Dot(f.Z)) / radPerDeg }

// spacing gives cos t - tan bc sin t, the height of the sun's ray over the ground line between rows.
func spacing(sunAngleDeg, crossTiltDeg float64) float64 {
	return cosd(sunAngleDeg) - float64(tand(crossTiltDeg)*sind(sunAngleDeg))
}

// SunOverGround reports whether the sun stands over the ground plane that the rows stand on, seen along
// the rows: cos(t + bc) > 0.
func SunOverGround(sunAngleDeg, crossTiltDeg float64) bool {
	return cosd(sunAngleDeg+crossTiltDeg) > 0
}

// TrackerAngleDeg gives the rotation of a tracker with the sun at sunAngleDeg: the angle itself, or
// when it must not shade its neighbour
//
//	X = |cos(t + bc)|/(GCR cos bc);  X >= 1: t;  else t - sign(t) acos X
//
// drawn into [-maxDeg, maxDeg]. gcr is collector width over horizontal pitch; 0 is a single row. With
// the sun behind the ground it lies parallel to it, at -bc. Source: Lorenzo, Narvarte and Munoz 2011,
// Progress in Photovoltaics 19:747; on slopes Anderson and Mikofski 2020, NREL/TP-5K00-76626.
func TrackerAngleDeg(sunAngleDeg, crossTiltDeg, gcr, maxDeg float64, backtrack bool) float64 {
	if !SunOverGround(sunAngleDeg, crossTiltDeg) {
		return clamp(-crossTiltDeg, -maxDeg, maxDeg)
	}
	t := sunAngleDeg
	if backtrack && gcr > 0 {
		if X := math.Abs(cosd(t+crossTiltDeg)) / float64(gcr*cosd(crossTiltDeg)); X < 1 {
			t -= math.Copysign(math.Acos(X)/radPerDeg, t)
		}
	}
	return clamp(t, -maxDeg, maxDeg)
}

// shadeNoise is the shaded share below which rounding, not shade, is at work.
const shadeNoise = 1e-9

// ShadedShare gives the share of a row's width that its neighbour on the sun's side shades:
//
//	f = 1 - |cos t - tan bc sin t| / (GCR |cos(t - r)|), drawn into [0, 1]
//
// t = sunAngleDeg, bc = crossTiltDeg, r = rotationDeg; the same for the front and the rear of the row.
// 0 for a single row, 1 with the sun behind the ground. Long rows: light around their ends is not
// counted. Source: plane geometry, as in Anderson and Jensen 2024, Journal of Renewable and
// Sustainable Energy 16:023504.
func ShadedShare(sunAngleDeg, rotationDeg, crossTiltDeg, gcr float64) float64 {
	if !SunOverGround(sunAngleDeg, crossTiltDeg) {
		return 1
	}
	w := float64(gcr * math.Abs(cosd(sunAngleDeg-rotationDeg)))
	if w <= 0 {
		return 0
	}
	f := clamp(1-math.Abs(spacing(sunAngleDeg, crossTiltDeg))/w, 0, 1)
	if f < shadeNoise {
		return 0
	}
	return f
}

// meanShade gives the means of the shaded share and of ShadePowerLoss while the shadow's edge moves
// evenly from one reach to another, so that the yearly energy has no jumps where a block goes dark.
func meanShade(from, to float64, blocks int) (shaded, power float64) {
	if from > to {
		from, to = to, from
	}
	if to-from < shadeNoise {
		f := clamp(to, 0, 1)
		if f < shadeNoise {
			return 0, 0
		}
		return f, ShadePowerLoss(f, blocks)
	}
	sq := func(x float64) float64 { return float64(x*x) / 2 }
	a, b := clamp(from, 0, 1), clamp(to, 0, 1)
	over := max(0, to-1) - max(0, from-1)
	span := to - from
	shaded = (sq(b) - sq(a) + over) / span
	if blocks < 1 {
		return shaded, shaded
	}
	power = over
	n := float64(blocks)
	for s := 1.0; s <= n; s++ {
		low, high := max(a, (s-1)/n), min(b, s/n)
		if high <= low {
			continue
		}
		c := 1 - s/(n+1)
		power += high - low - float64(c*(high-sq(high)-low+sq(low)))
	}
	return shaded, power / span
}

// GroundShadeShare gives the share of the ground that rows shade from the beam:
// min(1, GCR |cos(t - r)| / |cos t - tan bc sin t|), symbols as in ShadedShare.
func GroundShadeShare(sunAngleDeg, rotationDeg, crossTiltDeg, gcr float64) float64 {
	if gcr <= 0 {
		return 0
	}
	w := float64(gcr * math.Abs(cosd(sunAngleDeg-rotationDeg)))
	h := math.Abs(spacing(sunAngleDeg, crossTiltDeg))
	if w >= h {
		return 1
	}
	return w / h
}

// ShadePowerLoss gives the share of beam power that a row loses when a share of its width is shaded:
//
//	1 - (1 - f)(1 - N_s/(N_b + 1)), N_s = ceil(f N_b)
//
// f = shadedShare, N_b = blocks, the parts across the row that bypass diodes part from each other; 0
// blocks means that only the shaded width is lost. Source: Martinez-Moreno, Munoz and Lorenzo 2010,
// Solar Energy Materials and Solar Cells 94:2298.
func ShadePowerLoss(shadedShare float64, blocks int) float64 {
	if shadedShare <= 0 {
		return 0
	}
	f := min(1, shadedShare)
	nb := float64(max(0, blocks))
	ns := math.Ceil(float64(f * nb))
	return 1 - float64((1-f)*(1-ns/(nb+1)))
}

// RowView holds the shares of sky, ground and neighbouring row in what a panel and the ground see,
// means over the width.
type RowView struct {
	FrontSky, FrontGround, FrontRow float64
	RearSky, RearGround             float64
	GroundSky                       float64
}

// ViewOfRows gives the shares for long rows on flat ground, with crossed strings:
//
//	front sky = (L + p - d)/2L, front ground = (L + p - d')/2L, front row = (d + d' - 2p)/2L
//	rear sky = front ground, rear ground = front sky, ground sky = (d + d' - 2L)/2p
//	d = sqrt(p^2 - 2 p L cos b + L^2), d' = sqrt(p^2 + 2 p L cos b + L^2)
//
// L/p = gcr, b the tilt from 0 to 90. They do not depend on the height over the ground. gcr 0 gives
// the open field, (1 + cos b)/2 of sky. Source: Hottel's rule, as used by Passias and Kallback 1984,
// Solar Cells 11:361.
func ViewOfRows(cosTilt, gcr float64) RowView {
	c, L := cosTilt, gcr // p = 1
	q := 1 + float64(L*L)
	d := math.Sqrt(max(0, q-2*float64(L*c)))
	e := math.Sqrt(max(0, q+2*float64(L*c)))
	var v RowView
	v.FrontSky = (1 + (2*c-L)/(1+d)) / 2
	v.FrontGround = (1 - (2*c+L)/(1+e)) / 2
	v.FrontRow = max(0, 1-v.FrontSky-v.FrontGround)
	v.RearSky, v.RearGround = v.FrontGround, v.FrontSky
	v.GroundSky = max(0, (d+e-2*L)/2)
	return v
}
