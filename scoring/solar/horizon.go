package solar

import (
	"fmt"
	"math"

	"groundtally/scoring/sun"
)

// Horizon is how high the land stands around a site, at bearings evenly spaced from true north over east.
type Horizon struct {
	heightDeg []float64 // the first stands again at the end
	perDeg    float64   // bearings for a degree
	cos, sin  []float64 // of the bearings
}

// Bounds of a horizon.
const (
	leastBearings = 8
	mostBearings  = 3600
)

// NewHorizon takes heights over the horizontal in degrees, -90 to 90, at 8 to 3600 bearings. What lies below
// the horizontal hides nothing and counts as 0. It is drawn straight between bearings.
func NewHorizon(heightsDeg []float64) (*Horizon, error) {
	n := len(heightsDeg)
	if err := within("horizon bearings", float64(n), leastBearings, mostBearings); err != nil {
		return nil, err
	}
	h := &Horizon{heightDeg: make([]float64, n+1), perDeg: float64(n) / 360, cos: make([]float64, n), sin: make([]float64, n)}
	for i, deg := range heightsDeg {
		if err := within(fmt.Sprintf("horizon height %d", i+1), deg, -90, 90); err != nil {
			return nil, err
		}
		h.heightDeg[i] = max(0, deg)
		h.sin[i], h.cos[i] = math.Sincos(2 * math.Pi * float64(i) / float64(n))
	}
	h.heightDeg[n] = h.heightDeg[0]
	return h, nil
}

// HeightDeg gives the height at a bearing.
func (h *Horizon) HeightDeg(bearingDeg float64) float64 {
	b := math.Mod(bearingDeg, 360)
	if b < 0 {
		b += 360
	}
	return h.at(b)
}

// at wants a bearing from 0 to 360.
func (h *Horizon) at(bearingDeg float64) float64 {
	x := bearingDeg * h.perDeg
	i := min(int(x), len(h.heightDeg)-2)
	return h.heightDeg[i] + float64((x-float64(i))*(h.heightDeg[i+1]-h.heightDeg[i]))
}

// seen tells whether the middle of the sun stands over the horizon, as 0 or 1.
func (h *Horizon) seen(s *sunAt) float64 {
	if s.height > h.at(s.bearing) {
		return 1
	}
	return 0
}

// seenBetween gives the share of a way that the sun goes over the horizon, when it climbs evenly against it.
func (h *Horizon) seenBetween(a, b *sunAt) float64 {
	from, to := a.height-h.at(a.bearing), b.height-h.at(b.bearing)
	if from > to {
		from, to = to, from
	}
	switch {
	case from >= 0:
		return 1
	case to <= 0:
		return 0
	}
	return to / (to - from)
}

// SkyView gives the share of the sky's even light that a plane gets past the horizon and past itself, n its
// normal:
//
//	V = (1/2 pi) sum over bearings A of [n_z sin^2 H + n_A (H - sin H cos H)] dA
//	H = 90 degrees - max(h(A), atan(-n_A/n_z), 0), n_A = n_x sin A + n_y cos A
//
// (1 + cos tilt)/2 without a horizon; for the horizontal the mean of cos^2 h. Planes that face down see what
// lies between the horizon and their own. Source: Dozier and Frew 1990, IEEE Transactions on Geoscience and
// Remote Sensing 28:963, written with the normal.
func (h *Horizon) SkyView(n sun.Vec) float64 {
	sum := 0.0
	for i := range h.cos {
		na := float64(n.X*h.sin[i]) + float64(n.Y*h.cos[i])
		// Of the sky from low to high on this bearing, as angles from the horizontal; own is where the plane
		// itself stands before it.
		low, high := h.heightDeg[i]*radPerDeg, math.Pi/2
		own := math.Atan2(-na, n.Z)
		switch {
		case n.Z >= 0:
			low = max(low, own)
		case na > 0:
			// The plane leans over: it sees up to its own edge, behind which own lies from -180 to -90 degrees.
			high = min(high, own+math.Pi)
		default:
			continue
		}
		if high <= low {
			continue
		}
		// The light from dH at height e counts (n_z sin e + n_A cos e) cos e.
		part := func(e float64) float64 {
			s, c := math.Sincos(e)
			return float64(n.Z*s*s) + float64(na*(e+float64(s*c)))
		}
		sum += part(high) - part(low)
	}
	return max(0, sum/float64(len(h.cos)))
}
