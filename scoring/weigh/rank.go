package weigh

import (
	"fmt"
	"math"
	"slices"
)

// tieStep is the grid on which scores count as equal. A fixed grid keeps the comparison of two
// candidates independent of all others, which a chain of small differences would not.
const tieStep = 1e-9

// cell gives a score's step on the tie grid. Scores of one cell differ by at most tieStep.
func cell(s float64) float64 { return math.Round(s / tieStep) }

// RankIntervals gives the best and the worst rank that each score interval allows.
//
//	best_i  = 1 + #{j : L_j > U_i}
//	worst_i = 1 + #{j != i : U_j >= L_i}
//
// L (low) and U (high) are the ends of the score intervals. Scores in one step of the tie grid (1e-9)
// are equal. An equal score counts against the item in the worst rank alone, so that its place in any
// order that the intervals allow lies between the two. Sorted ends and binary search: O(n log n).
func RankIntervals(low, high []float64) (best, worst []int, err error) {
	n := len(low)
	if len(high) != n {
		return nil, nil, fmt.Errorf("rank intervals: %d lows with %d highs", n, len(high))
	}
	if !finite(low...) || !finite(high...) {
		return nil, nil, fmt.Errorf("rank intervals: a score is not finite")
	}
	l, u := make([]float64, n), make([]float64, n)
	for i := range n {
		if low[i] > high[i] {
			return nil, nil, fmt.Errorf("rank intervals: interval %d runs from %v down to %v", i+1, low[i], high[i])
		}
		l[i], u[i] = cell(low[i]), cell(high[i])
	}
	sl, su := slices.Clone(l), slices.Clone(u)
	slices.Sort(sl)
	slices.Sort(su)
	best, worst = make([]int, n), make([]int, n)
	for i := range n {
		// The first L above U_i: cells are whole numbers, so U_i + 1 is the next one.
		above, _ := slices.BinarySearch(sl, u[i]+1)
		best[i] = 1 + n - above
		reach, _ := slices.BinarySearch(su, l[i])
		worst[i] = n - reach // the item itself is always among these
	}
	return best, worst, nil
}

// Tiers cuts an order into tiers of what cannot be told apart from the tier's first. low and high are
// the score intervals in the order of the places.
//
// A new tier starts at the first item whose high lies below the low of the tier's first item: such an
// item is surely beaten by that first item. Overlap is not transitive, so no cut can tell all pairs
// right. What a cut hides is given by earliest: the first tier whose first item this item cannot be
// told apart from. It is below the item's tier when a wide interval reaches up again.
func Tiers(low, high []float64) (tier, earliest []int) {
	tier, earliest = make([]int, len(low)), make([]int, len(low))
	var first []float64 // lowest end of each tier's first item; may rise again, so earliest is searched
	var least []float64 // least of first so far
	for p := range low {
		l, u := cell(low[p]), cell(high[p])
		if len(first) == 0 || u < first[len(first)-1] {
			first = append(first, l)
			if len(least) > 0 {
				l = min(l, least[len(least)-1])
			}
			least = append(least, l)
		}
		tier[p] = len(first)
		// least falls, so the first tier with least <= u is the first with first <= u.
		e, _ := slices.BinarySearchFunc(least, u, func(x, t float64) int {
			if x > t {
				return -1
			}
			return 1
		})
		earliest[p] = e + 1
	}
	return tier, earliest
}
