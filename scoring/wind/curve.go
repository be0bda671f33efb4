package wind

import (
	"fmt"
	"math"
	"sort"
)

// MaxCt is the greatest thrust coefficient used: published tables exceed 1 near cut-in, where the wake
// formulas have no real root. Common practice.
const MaxCt = 0.96

// CurvePoint is one line of a power curve.
type CurvePoint struct {
	SpeedMPerS float64
	PowerKW    float64 // electrical power at 1.225 kg/m3
	Ct         float64 // thrust coefficient, used only when HasCt
	HasCt      bool
}

// PowerCurve is a tabulated machine: between the points power and thrust are linear in speed; below the
// first and above the last point the machine stands still and both are 0. Build it with NewPowerCurve.
type PowerCurve struct {
	v, p, ct []float64
	hasCt    bool
	lookup   []int32 // segment that holds the start of each lookupStep of speed
	maxKW    float64
}

const lookupStep = 0.125 // m/s; a power of two, so that v/lookupStep is exact

// NewPowerCurve checks the points and makes a curve of them: at least two, speeds from 0 to 100 m/s
// strictly rising, powers not below 0, thrust coefficients (for all points or for none) from 0 to 2,
// clipped to MaxCt. Without thrust coefficients FrandsenCt is used.
func NewPowerCurve(points []CurvePoint) (*PowerCurve, error) {
	if len(points) < 2 {
		return nil, fmt.Errorf("a power curve needs at least two points, not %d", len(points))
	}
	c := &PowerCurve{hasCt: points[0].HasCt}
	for i, q := range points {
		if !(q.SpeedMPerS >= 0 && q.SpeedMPerS <= 100) {
			return nil, fmt.Errorf("power curve, point %d: speed %g m/s lies outside 0 to 100", i+1, q.SpeedMPerS)
		}
		if i > 0 && q.SpeedMPerS <= points[i-1].SpeedMPerS {
			return nil, fmt.Errorf("power curve, point %d: speed %g m/s does not exceed the one before", i+1, q.SpeedMPerS)
		}
		if !(q.PowerKW >= 0) || math.IsInf(q.PowerKW, 0) {
			return nil, fmt.Errorf("power curve, point %d: power %g kW is below 0 or not a number", i+1, q.PowerKW)
		}
		if q.HasCt != c.hasCt {
			return nil, fmt.Errorf("power curve, point %d: thrust coefficients must be given for all points or for none", i+1)
		}
		ct := FrandsenCt(q.SpeedMPerS)
		if q.HasCt {
			if !(q.Ct >= 0 && q.Ct <= 2) {
				return nil, fmt.Errorf("power curve, point %d: thrust coefficient %g lies outside 0 to 2", i+1, q.Ct)
			}
			ct = math.Min(q.Ct, MaxCt)
		}
		c.v, c.p, c.ct = append(c.v, q.SpeedMPerS), append(c.p, q.PowerKW), append(c.ct, ct)
		c.maxKW = math.Max(c.maxKW, q.PowerKW)
	}
	if c.maxKW == 0 {
		return nil, fmt.Errorf("a power curve needs a point with power above 0")
	}
	n := int(c.Last()/lookupStep) + 1
	c.lookup = make([]int32, n)
	for i := range c.lookup {
		s := sort.SearchFloat64s(c.v, float64(i)*lookupStep)
		if s > 0 {
			s--
		}
		c.lookup[i] = int32(s)
	}
	return c, nil
}

// First is the lowest speed at which the machine runs, m/s.
func (c *PowerCurve) First() float64 { return c.v[0] }

// Last is the highest speed at which the machine runs, m/s: its cut-out.
func (c *PowerCurve) Last() float64 { return c.v[len(c.v)-1] }

// MaxKW is the greatest power of the curve.
func (c *PowerCurve) MaxKW() float64 { return c.maxKW }

// knee is the lowest tabulated speed with 98 percent of the greatest power.
func (c *PowerCurve) knee() float64 {
	for i, p := range c.p {
		if p >= 0.98*c.maxKW {
			return c.v[i]
		}
	}
	return c.Last()
}

// HasCt reports whether thrust coefficients were given; otherwise Ct rests on FrandsenCt.
func (c *PowerCurve) HasCt() bool { return c.hasCt }

// Points gives the curve back as it is used: thrust clipped, or FrandsenCt where none was given.
func (c *PowerCurve) Points() []CurvePoint {
	out := make([]CurvePoint, len(c.v))
	for i := range out {
		out[i] = CurvePoint{SpeedMPerS: c.v[i], PowerKW: c.p[i], Ct: c.ct[i], HasCt: c.hasCt}
	}
	return out
}

// segment finds i with v[i] <= v <= v[i+1]; ok is false outside the curve.
func (c *PowerCurve) segment(v float64) (i int, t float64, ok bool) {
	if !(v >= c.v[0] && v <= c.v[len(c.v)-1]) {
		return 0, 0, false
	}
	i = int(c.lookup[int(v/lookupStep)])
	for i+2 < len(c.v) && v > c.v[i+1] {
		i++
	}
	return i, (v - c.v[i]) / (c.v[i+1] - c.v[i]), true
}

// PowerKW is the electrical power at a speed (m/s) in air of 1.225 kg/m3.
func (c *PowerCurve) PowerKW(vMPerS float64) float64 {
	i, t, ok := c.segment(vMPerS)
	if !ok {
		return 0
	}
	return c.p[i] + float64(t*(c.p[i+1]-c.p[i]))
}

// Ct is the thrust coefficient at a speed (m/s), 0 to MaxCt.
func (c *PowerCurve) Ct(vMPerS float64) float64 {
	i, t, ok := c.segment(vMPerS)
	if !ok {
		return 0
	}
	return c.ct[i] + float64(t*(c.ct[i+1]-c.ct[i]))
}

// Scaled gives the curve with every power multiplied by a factor above 0; speeds and thrust stay, so
// rated power per rotor area must stay alike for the result to mean a real machine.
func (c *PowerCurve) Scaled(factor float64) (*PowerCurve, error) {
	if !(factor > 0) || math.IsInf(factor, 0) {
		return nil, fmt.Errorf("power factor %g must be above 0", factor)
	}
	pts := c.Points()
	for i := range pts {
		pts[i].PowerKW *= factor
	}
	return NewPowerCurve(pts)
}

// FrandsenCt estimates the thrust coefficient of a machine for which none is published:
// Ct = 3.5 (2v - 3.5)/v^2, v in m/s, kept within 0 and 0.9. Conservative above rated speed (the wake
// comes out stronger than with published tables). Source: Frandsen's approximation as used in the
// wake annex of IEC 61400-1.
func FrandsenCt(vMPerS float64) float64 {
	if !(vMPerS > 0) {
		return 0
	}
	return math.Max(0, math.Min(0.9, 3.5*(float64(2*vMPerS)-3.5)/(vMPerS*vMPerS)))
}

// MomentumCt is the thrust coefficient 4a(1-a) that momentum theory gives for a rotor power
// coefficient Cp = 4a(1-a)^2 with axial induction a from 0 to 1/3. Cp above the limit 16/27 or below
// 0 is an error. Lower than published tables at the same Cp; a lower bound, not the default.
func MomentumCt(cpRotor float64) (float64, error) {
	const betz = 16.0 / 27
	if !(cpRotor >= 0 && cpRotor <= betz) {
		return 0, fmt.Errorf("rotor power coefficient %g lies outside 0 to 16/27", cpRotor)
	}
	a, ok := bisect(0, 1.0/3, func(a float64) float64 { return float64(4*a*(1-a)*(1-a)) - cpRotor })
	if !ok { // the limit itself, reached to rounding
		a = 1.0 / 3
	}
	return 4 * a * (1 - a), nil
}
