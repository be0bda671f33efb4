package solar

import "math"

// The distance between rows on a slope stays between these. Source: assumption of this program.
const (
	leastAisleM  = 2.0 // for a vehicle between rows, on the ground plan, unless flat ground has less
	mostOfFlat   = 2.0 // times the distance on flat ground; where it rises more, rows shade each other more
	slopeNoticed = 1e-9
)

// PitchOnSlope gives the horizontal distance between rows of fixed panels on ground that falls by slopeDeg towards
// aspectDeg, such that the sun clears the row in front at the same height over the horizon as on flat ground. With
// the flat pitch p, the collector's width L and tilt b (facing azimuthDeg), tan e = L sin b/(p - L cos b), and ground
// that rises by s towards the front, it is p tan e/(tan e - s). It is no less than leaves an aisle of 2 m (or that of
// flat ground, if that is less) and holds the panels laid flat, and no more than twice p. Upright or flat rows keep their distance. Lengths in m, pitch
// above L cos b; derived from the geometry of two parallel edges.
func PitchOnSlope(flatPitchM, widthM, tiltDeg, azimuthDeg, slopeDeg, aspectDeg float64) float64 {
	depth, height := float64(widthM*cosd(tiltDeg)), float64(widthM*sind(tiltDeg))
	aisle := flatPitchM - depth
	rise := -float64(tand(slopeDeg) * cosd(azimuthDeg-aspectDeg))
	if aisle <= 0 || height <= slopeNoticed || depth <= slopeNoticed || math.Abs(rise) < slopeNoticed {
		return flatPitchM
	}
	least, most := depth+min(leastAisleM, aisle), float64(mostOfFlat*flatPitchM)
	least = min(max(least, widthM), flatPitchM) // panels laid flat must fit, as on flat ground
	clear := height / aisle
	if rise >= clear {
		return most
	}
	return clamp(float64(flatPitchM*clear)/(clear-rise), least, most)
}

// AlongSlope gives the horizontal length of a metre along a row that runs towards bearingDeg on ground that falls by
// slopeDeg towards aspectDeg.
func AlongSlope(bearingDeg, slopeDeg, aspectDeg float64) float64 {
	t := float64(tand(slopeDeg) * cosd(bearingDeg-aspectDeg))
	return 1 / math.Sqrt(1+float64(t*t))
}
