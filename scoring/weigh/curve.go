package weigh

import (
	"errors"
	"fmt"
	"math"
	"slices"
)

// ErrNoInverse says that a curve has no inverse: a jump, or a curve that rises and falls.
var ErrNoInverse = errors.New("the value curve has no inverse")

// Curve turns a consequence in its natural unit into a value between 0 and 1.
//
// Value gives v(x); outside says that x lies beyond the anchors, so that v was clamped. Range gives
// the lowest and highest v(x) for lo <= x <= hi; outside says that lo or hi lies beyond the anchors.
// Inverse gives the x between the anchors with v(x) = v: one point (lo = hi), or a whole interval
// where the curve is flat. Numbers that are not finite are errors.
type Curve interface {
	Value(x float64) (v float64, outside bool, err error)
	Range(lo, hi float64) (vLow, vHigh float64, outside bool, err error)
	Inverse(v float64) (lo, hi float64, err error)
}

func finite(xs ...float64) bool {
	for _, x := range xs {
		if math.IsNaN(x) || math.IsInf(x, 0) {
			return false
		}
	}
	return true
}

func clamp01(v float64) float64 { return min(max(v, 0), 1) }

func errNotFinite(x float64) error { return fmt.Errorf("value curve: %v is not a finite number", x) }

func errNotValue(v float64) error { return fmt.Errorf("value curve: %v is not between 0 and 1", v) }

// monotoneRange is Range for every curve that never turns.
func monotoneRange(c Curve, lo, hi float64) (vLow, vHigh float64, outside bool, err error) {
	if lo > hi {
		return 0, 0, false, fmt.Errorf("value curve: low %v is above high %v", lo, hi)
	}
	a, outA, err := c.Value(lo)
	if err != nil {
		return 0, 0, false, err
	}
	b, outB, err := c.Value(hi)
	if err != nil {
		return 0, 0, false, err
	}
	return min(a, b), max(a, b), outA || outB, nil
}

// place gives z = (x - worst)/(best - worst), clamped to 0..1. Beyond the anchors the comparison is
// made on x itself, so that an x on an anchor is never called outside through rounding.
func place(x, worst, best float64) (z float64, outside bool) {
	outside = x < min(worst, best) || x > max(worst, best)
	return clamp01((x - worst) / (best - worst)), outside
}

// Linear is the straight value curve.
//
//	v(x) = (x - x0)/(x1 - x0)
//
// x0 (Worst) has value 0, x1 (Best) value 1, both in the unit of x. With Best below Worst the curve
// falls. Beyond the anchors v is clamped, and marked outside. A soft threshold that rises from an
// indifference point q to a full point p is this curve with x0 = q, x1 = p. Source: Keeney and
// Raiffa 1976.
type Linear struct{ Worst, Best float64 }

// NewLinear checks the anchors: finite, not equal.
func NewLinear(worst, best float64) (Linear, error) {
	if !finite(worst, best, best-worst) || worst == best {
		return Linear{}, fmt.Errorf("linear value curve: anchors %v and %v are not two finite numbers", worst, best)
	}
	return Linear{worst, best}, nil
}

// Value gives v(x), see Linear.
func (c Linear) Value(x float64) (float64, bool, error) {
	if !finite(x) {
		return 0, false, errNotFinite(x)
	}
	z, out := place(x, c.Worst, c.Best)
	return z, out, nil
}

// Range gives the values between v(lo) and v(hi).
func (c Linear) Range(lo, hi float64) (float64, float64, bool, error) {
	return monotoneRange(c, lo, hi)
}

// Inverse gives x = x0 + v (x1 - x0).
func (c Linear) Inverse(v float64) (float64, float64, error) {
	if !(v >= 0 && v <= 1) {
		return 0, 0, errNotValue(v)
	}
	x := unplace(v, c.Worst, c.Best)
	return x, x, nil
}

// unplace is exact at both anchors.
func unplace(z, worst, best float64) float64 {
	return float64((1-z)*worst) + float64(z*best)
}

// Piecewise is the value curve through knots.
//
//	v(x) = v_j + (v_{j+1} - v_j)(x - x_j)/(x_{j+1} - x_j)   for x between x_j and x_{j+1}
//
// X holds the x_j, strictly rising or strictly falling, V the v_j, from 0 to 1 and never falling.
// Falling X gives a curve that falls with x. Beyond the outer knots v is clamped, and marked outside.
// Source: Keeney and Raiffa 1976.
type Piecewise struct{ x, v []float64 }

// NewPiecewise checks and copies the knots.
func NewPiecewise(x, v []float64) (Piecewise, error) {
	if len(x) < 2 || len(x) != len(v) {
		return Piecewise{}, fmt.Errorf("piecewise value curve: %d knots with %d values, want at least 2 of each", len(x), len(v))
	}
	if !finite(x...) || !finite(v...) || v[0] != 0 || v[len(v)-1] != 1 {
		return Piecewise{}, errors.New("piecewise value curve: knots must be finite, the values from 0 to 1")
	}
	up := x[1] > x[0]
	for j := 1; j < len(x); j++ {
		if x[j] == x[j-1] || (x[j] > x[j-1]) != up {
			return Piecewise{}, fmt.Errorf("piecewise value curve: knot %d does not go on in the direction of the others", j+1)
		}
		if v[j] < v[j-1] {
			return Piecewise{}, fmt.Errorf("piecewise value curve: the value falls at knot %d", j+1)
		}
	}
	return Piecewise{slices.Clone(x), slices.Clone(v)}, nil
}

// Value gives v(x), see Piecewise.
func (c Piecewise) Value(x float64) (float64, bool, error) {
	if !finite(x) {
		return 0, false, errNotFinite(x)
	}
	n := len(c.x)
	up := c.x[n-1] > c.x[0]
	// j is the first knot at or beyond x, seen in the direction of rising value.
	j, _ := slices.BinarySearchFunc(c.x, x, func(k, t float64) int {
		if k == t {
			return 0
		}
		if (k < t) == up {
			return -1
		}
		return 1
	})
	switch {
	case j == n:
		return 1, true, nil
	case c.x[j] == x:
		return c.v[j], false, nil
	case j == 0:
		return 0, true, nil
	}
	z := (x - c.x[j-1]) / (c.x[j] - c.x[j-1])
	v := c.v[j-1] + float64((c.v[j]-c.v[j-1])*z)
	return min(max(v, c.v[j-1]), c.v[j]), false, nil
}

// Range gives the values between v(lo) and v(hi).
func (c Piecewise) Range(lo, hi float64) (float64, float64, bool, error) {
	return monotoneRange(c, lo, hi)
}

// Inverse gives the x with v(x) = v; where the curve is flat, all of them.
func (c Piecewise) Inverse(v float64) (float64, float64, error) {
	if !(v >= 0 && v <= 1) {
		return 0, 0, errNotValue(v)
	}
	at := func(j int) float64 { // the point with value v on the segment before knot j
		z := (v - c.v[j-1]) / (c.v[j] - c.v[j-1])
		return unplace(z, c.x[j-1], c.x[j])
	}
	first := slices.IndexFunc(c.v, func(k float64) bool { return k >= v })
	a := c.x[first]
	if c.v[first] != v {
		a = at(first)
		return a, a, nil
	}
	last := first
	for last+1 < len(c.v) && c.v[last+1] == v {
		last++
	}
	b := c.x[last]
	return min(a, b), max(a, b), nil
}

// Threshold is the value curve with a jump.
//
//	v(x) = 1 if x >= t, else 0        (Above)
//	v(x) = 1 if x <= t, else 0        (not Above)
//
// t is At. It has no anchors, so nothing lies outside, and no inverse.
type Threshold struct {
	At    float64
	Above bool
}

// NewThreshold checks the threshold.
func NewThreshold(at float64, above bool) (Threshold, error) {
	if !finite(at) {
		return Threshold{}, errNotFinite(at)
	}
	return Threshold{at, above}, nil
}

// Value gives v(x), see Threshold.
func (c Threshold) Value(x float64) (float64, bool, error) {
	if !finite(x) {
		return 0, false, errNotFinite(x)
	}
	if x == c.At || (x > c.At) == c.Above {
		return 1, false, nil
	}
	return 0, false, nil
}

// Range gives the values between v(lo) and v(hi).
func (c Threshold) Range(lo, hi float64) (float64, float64, bool, error) {
	return monotoneRange(c, lo, hi)
}

// Inverse is refused: a jump has none.
func (c Threshold) Inverse(float64) (float64, float64, error) { return 0, 0, ErrNoInverse }

// Exponential is the value curve of constant bend.
//
//	v(x) = (1 - e^(-c z))/(1 - e^(-c)),   z = (x - x0)/(x1 - x0)
//
// c (C) above 0 gives most of the value early, below 0 late; c = 0 is the straight line, its limit.
// |c| <= 50. Anchors as in Linear. Source: Kirkwood 1997.
type Exponential struct{ Worst, Best, C float64 }

// NewExponential checks anchors and bend.
func NewExponential(worst, best, c float64) (Exponential, error) {
	if _, err := NewLinear(worst, best); err != nil {
		return Exponential{}, err
	}
	if !finite(c) || math.Abs(c) > 50 {
		return Exponential{}, fmt.Errorf("exponential value curve: bend %v is not between -50 and 50", c)
	}
	return Exponential{worst, best, c}, nil
}

// Value gives v(x), see Exponential.
func (e Exponential) Value(x float64) (float64, bool, error) {
	if !finite(x) {
		return 0, false, errNotFinite(x)
	}
	z, out := place(x, e.Worst, e.Best)
	if e.C == 0 {
		return z, out, nil
	}
	return clamp01(math.Expm1(-e.C*z) / math.Expm1(-e.C)), out, nil
}

// Range gives the values between v(lo) and v(hi).
func (e Exponential) Range(lo, hi float64) (float64, float64, bool, error) {
	return monotoneRange(e, lo, hi)
}

// Inverse gives x from z = -ln(1 - v (1 - e^(-c)))/c.
func (e Exponential) Inverse(v float64) (float64, float64, error) {
	if !(v >= 0 && v <= 1) {
		return 0, 0, errNotValue(v)
	}
	z := v
	if e.C != 0 && v > 0 && v < 1 {
		z = clamp01(-math.Log1p(v*math.Expm1(-e.C)) / e.C)
	}
	x := unplace(z, e.Worst, e.Best)
	return x, x, nil
}

// Hill is the value curve with a preferred middle: 0 at Low, rising straight to 1 at BestFrom, 1 up to
// BestTo, falling straight to 0 at High. Beyond Low and High v is 0, and marked outside. It has no
// inverse, since most values stand on both slopes.
type Hill struct{ Low, BestFrom, BestTo, High float64 }

// NewHill checks Low < BestFrom <= BestTo < High.
func NewHill(low, bestFrom, bestTo, high float64) (Hill, error) {
	if !finite(low, bestFrom, bestTo, high) || !(low < bestFrom && bestFrom <= bestTo && bestTo < high) {
		return Hill{}, fmt.Errorf("hill value curve: %v, %v, %v, %v do not rise", low, bestFrom, bestTo, high)
	}
	return Hill{low, bestFrom, bestTo, high}, nil
}

// Value gives v(x), see Hill.
func (c Hill) Value(x float64) (float64, bool, error) {
	if !finite(x) {
		return 0, false, errNotFinite(x)
	}
	out := x < c.Low || x > c.High
	switch {
	case x < c.BestFrom:
		v, _ := place(x, c.Low, c.BestFrom)
		return v, out, nil
	case x > c.BestTo:
		v, _ := place(x, c.High, c.BestTo)
		return v, out, nil
	}
	return 1, false, nil
}

// Range gives the lowest and highest value between lo and hi; the highest is 1 when the preferred
// middle lies among them.
func (c Hill) Range(lo, hi float64) (float64, float64, bool, error) {
	vLow, vHigh, out, err := monotoneRange(c, lo, hi)
	if err == nil && lo <= c.BestTo && hi >= c.BestFrom {
		vHigh = 1
	}
	return vLow, vHigh, out, err
}

// Inverse is refused, see Hill.
func (c Hill) Inverse(float64) (float64, float64, error) { return 0, 0, ErrNoInverse }

// Categorical gives each label its value, elicited directly.
type Categorical struct{ values map[string]float64 }

// NewCategorical checks and copies the table: at least one label, values between 0 and 1.
func NewCategorical(values map[string]float64) (Categorical, error) {
	if len(values) == 0 {
		return Categorical{}, errors.New("categorical value curve: no label")
	}
	c := Categorical{make(map[string]float64, len(values))}
	for label, v := range values {
		if !(v >= 0 && v <= 1) {
			return Categorical{}, fmt.Errorf("categorical value curve, label %q: %w", label, errNotValue(v))
		}
		c.values[label] = v
	}
	return c, nil
}

// Value gives the value of a label.
func (c Categorical) Value(label string) (float64, error) {
	v, ok := c.values[label]
	if !ok {
		return 0, fmt.Errorf("categorical value curve: label %q has no value", label)
	}
	return v, nil
}

// Inverse gives the labels with value v, sorted.
func (c Categorical) Inverse(v float64) []string {
	var out []string
	for label, u := range c.values {
		if u == v {
			out = append(out, label)
		}
	}
	slices.Sort(out)
	return out
}

// PartOf gives the part of a known consequence: the lowest and highest value that its range from low
// to high can have, the middle between the two, and whether the range leaves the anchors. With a
// straight curve and a symmetric range the middle is the value at central; otherwise it is not, and
// CentralPart may be wanted instead.
func PartOf(c Curve, low, high float64) (Part, error) {
	vLow, vHigh, out, err := c.Range(low, high)
	if err != nil {
		return Part{}, err
	}
	return Part{Known: true, Low: vLow, Mid: vLow + float64((vHigh-vLow)*0.5), High: vHigh, OutsideAnchor: out}, nil
}

// CentralPart is PartOf with v(central) instead of the middle; the score is then no longer the middle
// of its interval.
func CentralPart(c Curve, low, central, high float64) (Part, error) {
	if !(low <= central && central <= high) {
		return Part{}, fmt.Errorf("value curve: central %v does not lie between %v and %v", central, low, high)
	}
	p, err := PartOf(c, low, high)
	if err != nil {
		return Part{}, err
	}
	v, _, err := c.Value(central)
	if err != nil {
		return Part{}, err
	}
	p.Mid = v
	return p, nil
}
