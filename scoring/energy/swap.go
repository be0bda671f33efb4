package energy

import (
	"fmt"
	"math"

	"groundtally/scoring/bounds"
)

// SwapSide is one of two candidates whose return depends on the value x of one inventory row,
// EROI(x) = E/(I + m·x).
type SwapSide struct {
	OutMJ   float64 // E, above 0
	OtherMJ float64 // I, energy spent on all but the row, 0 or more
	Amount  float64 // m, how much of the row it takes, 0 or more; for a share, the energy that it is a share of
}

// Swap gives the value of the row at which two candidates change places.
//
//	E_a/(I_a + m_a·x) = E_b/(I_b + m_b·x)   ⇒   x = (E_b·I_a − E_a·I_b)/(E_a·m_b − E_b·m_a)
//
// found is false where no value above zero makes them equal, and where they are equal at every value.
func Swap(a, b SwapSide) (x float64, found bool, err error) {
	for _, s := range []SwapSide{a, b} {
		if err := bounds.Positive("energy given", s.OutMJ); err != nil {
			return 0, false, err
		}
		if err := bounds.NonNegative("energy spent", s.OtherMJ); err != nil {
			return 0, false, err
		}
		if err := bounds.NonNegative("amount", s.Amount); err != nil {
			return 0, false, err
		}
	}
	num := float64(b.OutMJ*a.OtherMJ) - float64(a.OutMJ*b.OtherMJ)
	den := float64(a.OutMJ*b.Amount) - float64(b.OutMJ*a.Amount)
	if den == 0 {
		return 0, false, nil
	}
	if x = num / den; !(x > 0) || !bounds.Finite(x) {
		return 0, false, nil
	}
	return x, true, nil
}

// SwapWithin finds where the advantage of one candidate over another, as a function of one value, changes its
// sign between low and high, by bisection down to neighbouring numbers.
//
// advantage must be monotone: of a function that is not, one of several crossings is found or none. found is
// false when it has the same sign at both ends. An error of advantage, or a value of it that is no number, ends
// the search with an error.
func SwapWithin(low, high float64, advantage func(x float64) (float64, error)) (x float64, found bool, err error) {
	if !bounds.Finite(low) || !bounds.Finite(high) || !(low < high) {
		return 0, false, bounds.Error("range", low, "finite numbers in rising order")
	}
	at := func(x float64) (float64, error) {
		y, err := advantage(x)
		if err != nil {
			return 0, fmt.Errorf("advantage at %v: %w", x, err)
		}
		if math.IsNaN(y) {
			return 0, bounds.Error("advantage", y, "a number")
		}
		return y, nil
	}
	yl, err := at(low)
	if err != nil {
		return 0, false, err
	}
	yh, err := at(high)
	if err != nil {
		return 0, false, err
	}
	switch {
	case yl == 0 && yh == 0:
		return 0, false, nil
	case yl == 0:
		return low, true, nil
	case yh == 0:
		return high, true, nil
	case (yl < 0) == (yh < 0):
		return 0, false, nil
	}
	for {
		mid := low + (high-low)/2
		if mid <= low || mid >= high {
			return mid, true, nil
		}
		y, err := at(mid)
		if err != nil {
			return 0, false, err
		}
		switch {
		case y == 0:
			return mid, true, nil
		case (y < 0) == (yl < 0):
			low = mid
		default:
			high = mid
		}
	}
}
