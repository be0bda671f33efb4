package terrain

import (
	"fmt"
	"math"

	"groundtally/geo"
	"groundtally/geo/measure"
)

// RefractionK is the coefficient of refraction of sight lines by day: light bends downward with a radius of
// Earth's radius divided by k. 0.13 is common practice in surveying, the mean of Gauss's survey of Hanover
// (from memory). The air of the day may make it several tenths more or less, close to the ground more;
// at 10 km a change of 0.1 moves a horizon by 0.004 degrees.
const RefractionK = 0.13

// Limits of Horizon.
const (
	maxAzimuths = 36_000
	maxReachM   = 200e3 // farther, the drop is no parabola any more
)

// Horizon gives the elevation angles of the terrain's horizon in degrees, seen from so many metres above
// the ground at a place, for azimuths that are evenly spaced clockwise from grid north: the angle at index
// i belongs to 360·i/azimuths degrees. For azimuths from true north see crs.Frame.TrueAzimuthDeg.
//
//	angle = max over 0 < d ≤ reachM of atan((z(d) − z_eye − (1 − k)·d²/2R) / d)
//
// with k = RefractionK and R Earth's mean radius. The sea from above is below level; that angle is kept as
// it is, and so is one that only the reach has cut.
//
// Heights are bilinear as in Sample, and the greatest angle on that surface is found exactly, cell by cell,
// near and far: a lone crest far away counts. The drop is a parabola for small angles: where the ground
// rises z above the sea the angle is too large by a share of z/R, 0.05 % for a summit of 3 km.
//
// Missing heights are skipped, what they would hide is not known: known gives for every azimuth the share
// of the reach whose heights are known. The true horizon may be higher where it is below 1. Where it is
// 0, the angle is not a number.
//
// Valid for 1 to 36,000 azimuths, a reach up to 200 km, a place with a height. Source: the correction for
// curvature and refraction of trigonometric levelling, as Gaifillia and others 2016, Journal of Geosciences
// and Geomatics 4(1).
func (g *Grid) Horizon(at geo.XY, heightAboveGroundM float64, azimuths int, reachM float64) (angleDeg, known []float64, err error) {
	switch {
	case azimuths < 1 || azimuths > maxAzimuths:
		return nil, nil, fmt.Errorf("horizon: %d azimuths, want 1 to %d", azimuths, maxAzimuths)
	case !(heightAboveGroundM >= 0) || math.IsInf(heightAboveGroundM, 0):
		return nil, nil, fmt.Errorf("horizon: a height above ground of %v m, want 0 or more", heightAboveGroundM)
	case !(reachM > 0 && reachM <= maxReachM):
		return nil, nil, fmt.Errorf("horizon: a reach of %v m, want above 0 to %.0f", reachM, maxReachM)
	}
	z, ok := g.Sample(at)
	if !ok {
		return nil, nil, fmt.Errorf("horizon: the terrain has no height at %.1f, %.1f", at.X, at.Y)
	}
	r := ray{g: g, groundM: z, eyeM: heightAboveGroundM, reachM: reachM, x: onLine((at.X - g.Origin.X) / g.CellM), y: onLine((at.Y - g.Origin.Y) / g.CellM)}
	angleDeg, known = make([]float64, azimuths), make([]float64, azimuths)
	for i := range azimuths {
		angleDeg[i], known[i] = r.horizon(direction(i, azimuths))
	}
	return angleDeg, known, nil
}

// direction gives east, north of the i-th of n azimuths; those along the axes are exact.
func direction(i, n int) (east, north float64) {
	quarter, rest := 4*i/n, 4*i%n
	s, c := math.Sincos(math.Pi / 2 * float64(rest) / float64(n))
	if rest == 0 {
		s, c = 0, 1
	}
	switch quarter {
	case 0:
		return s, c
	case 1:
		return c, -s
	case 2:
		return -s, -c
	}
	return -c, s
}

// onLine moves what is next to a line of cell centres onto it, so that no ray begins with a piece too short
// to have a direction.
func onLine(cells float64) float64 {
	if whole := math.Round(cells); math.Abs(cells-whole) < 1e-6 {
		return whole
	}
	return cells
}

// ray looks from a place of the grid.
type ray struct {
	g       *Grid
	groundM float64
	eyeM    float64 // above the ground
	reachM  float64
	x, y    float64 // in cells from the south-western centre
}

// horizon gives the elevation angle in a direction, in degrees, with the share of the reach known.
func (r ray) horizon(east, north float64) (angleDeg, known float64) {
	g := r.g
	// Lengths along the ray are in cells.
	end := math.Min(r.reachM/g.CellM, math.Min(leaves(r.x, east, g.NX), leaves(r.y, north, g.NY)))
	drop := (1 - RefractionK) * g.CellM * g.CellM / (2 * measure.MeanEarthRadiusM)
	column, row := crossings(r.x, east), crossings(r.y, north)
	top, sum := math.Inf(-1), 0.0
	for from := 0.0; from < end; {
		to := math.Min(end, math.Min(column.t, row.t))
		for column.t <= to {
			column.on()
		}
		for row.t <= to {
			row.on()
		}
		if s, ok := r.piece(east, north, (from+to)/2); ok {
			sum += to - from
			s.c -= drop
			if from > 0 {
				top = math.Max(top, s.at(from))
			} else if s.a = -r.eyeM; s.a == 0 { // in the grass, what lies at one's feet counts
				top = math.Max(top, s.b)
			}
			top = math.Max(top, s.at(to))
			if s.a < 0 && s.c < 0 {
				if t := math.Sqrt(s.a / s.c); t > from && t < to {
					top = math.Max(top, s.at(t))
				}
			}
		}
		from = to
	}
	if math.IsInf(top, -1) {
		return math.NaN(), 0
	}
	return math.Atan(top/g.CellM) * 180 / math.Pi, math.Min(1, sum*g.CellM/r.reachM)
}

// sight is the height above the eye along a ray within a cell, a + b·t + c·t².
type sight struct{ a, b, c float64 }

// at gives the height by the distance.
func (s sight) at(t float64) float64 { return s.a/t + s.b + float64(s.c*t) }

// piece gives the heights along a ray in the cell, between four centres, where the ray is at t; false when
// a centre that has weight is missing. Along a straight line u = u₀ + e·t, v = v₀ + n·t the bilinear surface
// z₀₀ + A·u + B·v + D·u·v is a parabola.
func (r ray) piece(east, north, t float64) (sight, bool) {
	u0, c0, c1 := beside(r.x, east, t, r.g.NX)
	v0, r0, r1 := beside(r.y, north, t, r.g.NY)
	z00, ok00 := r.g.Height(c0, r0)
	z10, ok10 := r.g.Height(c1, r0)
	z01, ok01 := r.g.Height(c0, r1)
	z11, ok11 := r.g.Height(c1, r1)
	if !ok00 || !ok10 || !ok01 || !ok11 {
		return sight{}, false
	}
	a, b, d := z10-z00, z01-z00, z11-z10-z01+z00
	return sight{
		a: z00 - r.groundM - r.eyeM + float64(a*u0) + float64(b*v0) + float64(d*float64(u0*v0)),
		b: float64(a*east) + float64(b*north) + float64(d*(float64(u0*north)+float64(v0*east))),
		c: float64(d * float64(east*north)),
	}, true
}

// leaves gives how far along a ray the outer edge of n cells is reached.
func leaves(from, step float64, n int) float64 {
	switch {
	case step > 0:
		return math.Max(0, (float64(n)-0.5-from)/step)
	case step < 0:
		return math.Max(0, (-0.5-from)/step)
	}
	return math.Inf(1)
}

// crossing is where a ray next crosses one of the lines at whole numbers.
type crossing struct {
	from, perLine float64
	line, turn    int
	t             float64
}

func crossings(from, step float64) crossing {
	c := crossing{from: from, t: math.Inf(1)}
	switch {
	case step > 0:
		c.line, c.turn = int(math.Floor(from))+1, 1
	case step < 0:
		c.line, c.turn = int(math.Ceil(from))-1, -1
	default:
		return c
	}
	c.perLine = 1 / step
	c.t = (float64(c.line) - from) * c.perLine
	return c
}

// on goes to the next line. Distances come from the line's number, so that no error adds up.
func (c *crossing) on() {
	c.line += c.turn
	c.t = (float64(c.line) - c.from) * c.perLine
}

// beside gives the lines of cell centres on both sides of a ray at t, of n lines, with where the ray begins,
// counted from the first. Outside all lines, and on a line that the ray runs along, both are the same.
func beside(from, step, t float64, n int) (start float64, lo, hi int) {
	at := math.Floor(from + float64(t*step))
	lo, hi = int(at), int(at)+1
	if step == 0 && from == at {
		hi = lo
	}
	return from - at, max(0, min(lo, n-1)), max(0, min(hi, n-1))
}
