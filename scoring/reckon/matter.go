package reckon

import (
	"fmt"
	"math"
	"slices"
	"sort"

	"groundtally/scoring"
)

// Ranks gives each value's place in rising order from 1; equal values share the mean of their places (mid-ranks).
// O(n log n).
func Ranks(x []float64) []float64 {
	at := make([]int, len(x))
	for i := range at {
		at[i] = i
	}
	sort.Slice(at, func(i, j int) bool { return x[at[i]] < x[at[j]] })
	out := make([]float64, len(x))
	for i := 0; i < len(at); {
		j := i + 1
		for j < len(at) && x[at[j]] == x[at[i]] {
			j++
		}
		mid := float64(i+j+1) / 2 // places i+1 to j
		for _, k := range at[i:j] {
			out[k] = mid
		}
		i = j
	}
	return out
}

// Spearman is the rank correlation of two samples, -1 to 1: the product-moment correlation of their mid-ranks.
//
// ok is false with fewer than three pairs, with a value that is not finite, or where all values of one sample are
// the same: then there is none, which is not a correlation of zero. Spearman 1904, American Journal of
// Psychology 15:72-101; without ties it equals 1 − 6·Σd²/(n(n²−1)). O(n log n).
func Spearman(x, y []float64) (rho float64, ok bool) {
	if len(x) != len(y) || len(x) < 3 || !finite(x) || !finite(y) {
		return 0, false
	}
	return product(Ranks(x), Ranks(y))
}

func finite(x []float64) bool {
	for _, v := range x {
		if v-v != 0 {
			return false
		}
	}
	return true
}

// product is the product-moment correlation of two samples of ranks, whose mean is known.
func product(a, b []float64) (float64, bool) {
	mean := float64(len(a)+1) / 2
	var ab, aa, bb float64
	for i := range a {
		da, db := a[i]-mean, b[i]-mean
		ab += float64(da * db)
		aa += float64(da * da)
		bb += float64(db * db)
	}
	if aa == 0 || bb == 0 {
		return 0, false
	}
	return math.Max(-1, math.Min(1, ab/math.Sqrt(aa*bb))), true
}

// GroupDraw is one group of factors with the number it drew in each trial. Any number that rises with the draw
// will do, since only its rank counts; a factor's own values are such a number.
type GroupDraw struct {
	Group  string
	Values []float64
}

// Influence is how strongly a result follows a group of factors.
type Influence struct {
	Group string
	Rho   float64 // Spearman's rank correlation
	Known bool    // false where group or result does not vary
}

// Influences ranks groups by how strongly a result follows them, strongest first, equal ones by name; unknown ones
// last. Trials in which the result is no number are left out of all of them; used says how many remained. All
// groups and the result have the same length. O(groups · n log n).
func Influences(groups []GroupDraw, result []scoring.Value) (out []Influence, used int, err error) {
	var kept []int
	var y []float64
	for t, v := range result {
		if v.OK() {
			kept = append(kept, t)
			y = append(y, v.X)
		}
	}
	usable := len(y) >= 3 && finite(y)
	var ry []float64
	if usable {
		ry = Ranks(y)
	}
	x := make([]float64, len(kept))
	for _, g := range groups {
		if len(g.Values) != len(result) {
			return nil, 0, fmt.Errorf("group %q has %d draws, want %d", g.Group, len(g.Values), len(result))
		}
		for i, t := range kept {
			x[i] = g.Values[t]
		}
		in := Influence{Group: g.Group}
		if usable && finite(x) {
			in.Rho, in.Known = product(Ranks(x), ry)
		}
		out = append(out, in)
	}
	slices.SortStableFunc(out, func(a, b Influence) int {
		switch {
		case a.Known != b.Known:
			if a.Known {
				return -1
			}
			return 1
		case math.Abs(a.Rho) > math.Abs(b.Rho):
			return -1
		case math.Abs(a.Rho) < math.Abs(b.Rho):
			return 1
		case a.Group < b.Group:
			return -1
		case a.Group > b.Group:
			return 1
		}
		return 0
	})
	return out, len(y), nil
}

// Duel is what paired trials say of two candidates in one quantity.
type Duel struct {
	Beats float64 // share of the compared trials in which A is better, an equal one counted half
	Equal int     // trials in which both are the same
	Used  int     // trials compared
	Left  int     // trials left out because one of the two is missing
	Known bool    // false when no trial could be compared
}

// Beats compares two candidates trial by trial; both must come from the same draws, so that what errs alike for
// both cancels. more says that more is better. An effect that does not arise counts as best and a payback that
// never comes as worst, as in the order; other states leave the trial out. The standard error of the share is
// about √(p(1−p)/n).
func Beats(a, b []scoring.Value, more bool) (Duel, error) {
	if len(a) != len(b) {
		return Duel{}, fmt.Errorf("%d trials against %d", len(a), len(b))
	}
	var d Duel
	wins := 0
	for t := range a {
		la, oka := level(a[t])
		lb, okb := level(b[t])
		if !oka || !okb {
			d.Left++
			continue
		}
		d.Used++
		xa, xb := a[t].X, b[t].X
		switch {
		case la != lb:
			if la > lb {
				wins++
			}
		case la != 0 || xa == xb:
			d.Equal++
		case (xa > xb) == more:
			wins++
		}
	}
	if d.Used > 0 {
		d.Known = true
		d.Beats = (float64(wins) + float64(d.Equal)/2) / float64(d.Used)
	}
	return d, nil
}

// level tells what stands above every number, 1, and below every number, -1.
func level(v scoring.Value) (int, bool) {
	switch v.State {
	case scoring.Number:
		return 0, v.X-v.X == 0
	case scoring.None:
		return 1, true
	case scoring.Never:
		return -1, true
	}
	return 0, false
}
