package weigh

import (
	"errors"
	"math"
	"slices"
)

// Contribution is what one key adds to the lead of one candidate over another.
type Contribution struct {
	Key    int     // index of the key
	Amount float64 // w_k delta_k
}

// Contributions takes a lead apart: w_k (v_Ak - v_Bk) for every key, the largest amount first whatever
// its sign, by key where amounts are equal, and their sum, the lead of A over B.
func Contributions(w, a, b []float64) (parts []Contribution, lead float64, err error) {
	if err := checkPair(w, a, b); err != nil {
		return nil, 0, err
	}
	for k := range w {
		x := float64(w[k] * (a[k] - b[k]))
		parts = append(parts, Contribution{k, x})
		lead += x
	}
	slices.SortStableFunc(parts, func(x, y Contribution) int {
		return compareFloat(math.Abs(y.Amount), math.Abs(x.Amount))
	})
	return parts, lead, nil
}

func checkPair(w, a, b []float64) error {
	if len(w) == 0 || len(w) != len(a) || len(w) != len(b) {
		return errors.New("comparison of two: weights and values differ in number")
	}
	if err := checkWeights(w); err != nil {
		return err
	}
	for k := range a {
		if !(a[k] >= 0 && a[k] <= 1 && b[k] >= 0 && b[k] <= 1) {
			return errors.New("comparison of two: a value is not between 0 and 1")
		}
	}
	return nil
}

// WeightNeeded gives the weights t of key k, from lo to hi, at which B scores at least as much as A
// while the other weights keep their proportions (see Tipping). ok is false when there are none.
func WeightNeeded(w, a, b []float64, k int) (lo, hi float64, ok bool, err error) {
	if err := checkPair(w, a, b); err != nil {
		return 0, 0, false, err
	}
	if k < 0 || k >= len(w) {
		return 0, 0, false, errors.New("comparison of two: no such key")
	}
	ra, va := lineEnds(w, a, k, allOnOne(w, k))
	rb, vb := lineEnds(w, b, k, allOnOne(w, k))
	d0, d1 := rb-ra, vb-va // B's lead at t = 0 and t = 1
	switch {
	case d0 >= 0 && d1 >= 0:
		return 0, 1, true, nil
	case d0 < 0 && d1 < 0:
		return 0, 0, false, nil
	case d0 < 0:
		return d0 / (d0 - d1), 1, true, nil
	}
	return 0, d0 / (d0 - d1), true, nil
}

// ValueNeeded gives the value that B would need on key k alone to score as much as A.
//
//	v'_Bk = v_Bk + gap/w_k,   gap = sum_m w_m (v_Am - v_Bm)
//
// ok is false when that is impossible through k alone: v' above 1, or w_k = 0. When B is not behind, its
// own value is enough and returned. A value curve's Inverse turns v' into natural units.
func ValueNeeded(w, a, b []float64, k int) (v float64, ok bool, err error) {
	_, gap, err := Contributions(w, a, b)
	if err != nil {
		return 0, false, err
	}
	if k < 0 || k >= len(w) {
		return 0, false, errors.New("comparison of two: no such key")
	}
	if gap <= 0 {
		return b[k], true, nil
	}
	if w[k] == 0 {
		return 0, false, nil
	}
	v = b[k] + gap/w[k]
	return v, v <= 1, nil
}

// ReachableWithin reports whether B scores at least as much as A when all of B's uncertain values stand
// at their high ends and all of A's at their low ends, and B's lead then.
func ReachableWithin(w, lowA, highB []float64) (lead float64, ok bool, err error) {
	_, lead, err = Contributions(w, highB, lowA)
	return lead, err == nil && lead >= 0, err
}

// EvenSwap gives the value on key m that makes up for a change on key k.
//
//	v'_m = v_m - w_k (v'_k - v_k)/w_m
//
// vk and newVk are the value of k before and after. ok is false when v'_m leaves 0 to 1. Source:
// Hammond, Keeney and Raiffa 1998.
func EvenSwap(wk, vk, newVk, wm, vm float64) (newVm float64, ok bool, err error) {
	if !finite(wk, vk, newVk, wm, vm) || wk < 0 || wm <= 0 {
		return 0, false, errors.New("even swap: weights must be finite, that of the second key above 0")
	}
	newVm = vm - wk*(newVk-vk)/wm
	return newVm, newVm >= 0 && newVm <= 1, nil
}
