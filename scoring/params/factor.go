package params

import (
	"fmt"
	"math"
	"strings"

	"groundtally/assets/citedtable"
)

// Dist names the distribution of an uncertain factor.
type Dist string

// The distributions.
const (
	Lognormal  Dist = "lognormal"  // positive quantities; low and high are the 5th and 95th percentile
	Triangular Dist = "triangular" // shares and judgements; low and high are hard bounds, central the mode
	Fixed      Dist = "fixed"      // not drawn: always central
)

// Boundary says where along the chain an input of energy is spent.
type Boundary string

// The boundaries, each of which includes the ones before it when inputs are summed.
const (
	Generation Boundary = "B1" // plant up to its own terminals
	Delivered  Boundary = "B2" // plus cable or line, switchgear and substation up to the grid
	Extended   Boundary = "B3" // plus upkeep, replacement, dismantling, restoration
	NoBoundary Boundary = ""   // the factor is not an input of energy
)

// Account names the family of consequences that a factor feeds.
type Account string

// The accounts that factors feed.
const (
	EnergyAccount  Account = "energy"
	LandAccount    Account = "land"
	ClimateAccount Account = "climate"
	GridAccount    Account = "grid"
)

// Z95 is the standard normal quantile at 0.95.
const Z95 = 1.6448536269514722

// splitShare is how far central may lie from the geometric mean of low and high before the two halves
// of a lognormal get their own spread.
const splitShare = 0.25

// Factor is one number with its range, distribution and source.
type Factor struct {
	ID, Unit           string
	Low, Central, High float64
	Dist               Dist
	Group              string // factors of one group share their draw within a trial
	Boundary           Boundary
	Account            Account
	Technology         string // "all", "wind", "solar" (every kind of solar) or one technology of the program
	Source             string
	Provenance         citedtable.Provenance
	Year               int // year that the number describes, 0 when timeless
}

// Assumption reports whether the factor is an assumption of this project, which must be shown as such.
func (f Factor) Assumption() bool { return strings.HasPrefix(strings.ToLower(f.Source), "assumption") }

// Validate tells what makes a factor unusable: numbers that are not finite, low above central, central
// above high, a lognormal that is not positive, an unknown distribution or boundary.
func (f Factor) Validate() error {
	if f.ID == "" {
		return fmt.Errorf("factor without id")
	}
	for _, v := range []float64{f.Low, f.Central, f.High} {
		if math.IsNaN(v) || math.IsInf(v, 0) {
			return fmt.Errorf("factor %s: %v is not a finite number", f.ID, v)
		}
	}
	if f.Low > f.Central || f.Central > f.High {
		return fmt.Errorf("factor %s: low %v, central %v, high %v are not in order", f.ID, f.Low, f.Central, f.High)
	}
	switch f.Dist {
	case Lognormal:
		if f.Low <= 0 {
			return fmt.Errorf("factor %s: a lognormal needs low > 0, got %v", f.ID, f.Low)
		}
	case Triangular, Fixed:
	default:
		return fmt.Errorf("factor %s: distribution %q is not lognormal, triangular or fixed", f.ID, f.Dist)
	}
	switch f.Boundary {
	case Generation, Delivered, Extended, NoBoundary:
	default:
		return fmt.Errorf("factor %s: boundary %q is not B1, B2, B3 or empty", f.ID, f.Boundary)
	}
	return nil
}

// RangeMeans says what low and high of the factor are: "p5_p95", "bounds" or "none".
func (f Factor) RangeMeans() string {
	switch f.Dist {
	case Lognormal:
		return "p5_p95"
	case Triangular:
		return "bounds"
	}
	return "none"
}

// Sigmas gives the standard deviations of ln(x) below and above the median of a lognormal factor.
//
//	σ = ln(high/low) / (2·z95)                          when |central/√(low·high) − 1| ≤ 0.25
//	σ_left = ln(central/low)/z95, σ_right = ln(high/central)/z95   otherwise
//
// The median is always central; with one σ, low and high are the 5th and 95th percentile only as far as
// central is their geometric mean. Not a lognormal: both are zero.
func (f Factor) Sigmas() (left, right float64) {
	if f.Dist != Lognormal {
		return 0, 0
	}
	if math.Abs(f.Central/math.Sqrt(f.Low*f.High)-1) <= splitShare {
		s := math.Log(f.High/f.Low) / (2 * Z95)
		return s, s
	}
	return math.Log(f.Central/f.Low) / Z95, math.Log(f.High/f.Central) / Z95
}

// Quantile is the inverse distribution function of the factor.
//
//	lognormal   x = central·exp(σ·Φ⁻¹(u)), with the σ of the half that u lies in
//	triangular  a = low, c = central (mode), b = high, F_c = (c−a)/(b−a):
//	            u < F_c: a + √(u·(b−a)·(c−a)), else b − √((1−u)·(b−a)·(b−c))
//	fixed       x = central
//
// Low and high of a triangular factor are taken as its bounds, so that a share never leaves [0, 1].
// u is meant to lie in (0,1); outside, and for NaN, the nearest value that a draw can have is taken.
func (f Factor) Quantile(u float64) float64 {
	if !(u > uMin) {
		u = uMin
	} else if u > uMax {
		u = uMax
	}
	if f.Low == f.High {
		return f.Central
	}
	switch f.Dist {
	case Lognormal:
		left, right := f.Sigmas()
		z := math.Sqrt2 * math.Erfinv(float64(2*u)-1)
		if z < 0 {
			return f.Central * math.Exp(left*z)
		}
		return f.Central * math.Exp(right*z)
	case Triangular:
		a, c, b := f.Low, f.Central, f.High
		if u < (c-a)/(b-a) {
			return a + math.Sqrt(u*(b-a)*(c-a))
		}
		return b - math.Sqrt((1-u)*(b-a)*(b-c))
	}
	return f.Central
}

// Mean is the expectation of the factor.
//
//	lognormal   central·[exp(σl²/2)·Φ(−σl) + exp(σr²/2)·Φ(σr)], which is central·exp(σ²/2) when σl = σr
//	triangular  (low + central + high)/3
func (f Factor) Mean() float64 { return f.moment(1) }

// Variance is the expected squared distance from the mean.
func (f Factor) Variance() float64 {
	if f.Dist == Triangular {
		a, c, b := f.Low, f.Central, f.High
		d1, d2, d3 := b-a, c-a, b-c
		return (float64(d1*d1) + float64(d2*d2) + float64(d3*d3)) / 36
	}
	m := f.moment(1)
	return f.moment(2) - float64(m*m)
}

func (f Factor) moment(n float64) float64 {
	switch f.Dist {
	case Lognormal:
		l, r := f.Sigmas()
		l, r = n*l, n*r
		return math.Pow(f.Central, n) * (float64(math.Exp(l*l/2)*phi(-l)) + float64(math.Exp(r*r/2)*phi(r)))
	case Triangular:
		return (f.Low + f.Central + f.High) / 3
	}
	return math.Pow(f.Central, n)
}

func phi(z float64) float64 { return math.Erfc(-z/math.Sqrt2) / 2 }

// AppliesTo reports whether the factor belongs to a technology of the program: wind, solar_fixed,
// solar_tracking, solar_vertical, solar_agri, wind_solar. A hybrid takes the wind rows, the common
// solar rows and the rows for all.
func (f Factor) AppliesTo(technology string) bool { return applies(f.Technology, technology) }

func applies(row, technology string) bool {
	switch {
	case row == "all", row == technology:
		return true
	case row == "solar":
		return strings.HasPrefix(technology, "solar") || technology == "wind_solar"
	case row == "wind":
		return technology == "wind_solar"
	}
	return false
}
