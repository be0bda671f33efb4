package weigh

import (
	"errors"
	"fmt"
	"math"
	"slices"
)

// Swing gives weights from raw swing points.
//
//	w_k = u_k / sum u
//
// u_k (points) >= 0 says how much it is worth to swing key k from its worst anchor to its best, against
// 100 for the swing that is worth most. The natural-unit swing belongs on the screen: weights mean
// nothing without the anchors. At least one u_k must be above 0. Source: Edwards and Barron 1994.
func Swing(points []float64) ([]float64, error) {
	if len(points) == 0 {
		return nil, errors.New("weights: no key")
	}
	sum := 0.0
	for k, u := range points {
		if !finite(u) || u < 0 {
			return nil, fmt.Errorf("weights: raw weight %d is %v, want a finite number of at least 0", k+1, u)
		}
		sum += u
	}
	if !finite(sum) || sum <= 0 {
		return nil, errors.New("weights: the raw weights add up to nothing that could be shared out")
	}
	w := make([]float64, len(points))
	for k, u := range points {
		w[k] = u / sum
	}
	return w, nil
}

// checkWeights refuses weights that are not finite, negative, or do not add up to 1.
func checkWeights(w []float64) error {
	if _, err := Swing(w); err != nil {
		return err
	}
	if s := sum(w); math.Abs(s-1) > 1e-9 {
		return fmt.Errorf("weights: they add up to %v, not to 1", s)
	}
	return nil
}

// AnchorMoved gives the raw weight that keeps every score difference as it was, up to one common
// factor, when the anchors of a linear value curve move.
//
//	u' = u r'/r
//
// r (oldRange) and r' (newRange) are the distances between the anchors, above 0, in the same unit.
func AnchorMoved(u, oldRange, newRange float64) (float64, error) {
	if !finite(u, oldRange, newRange) || u < 0 || oldRange <= 0 || newRange <= 0 {
		return 0, errors.New("weights: a moved anchor needs a raw weight of at least 0 and two ranges above 0")
	}
	return u * newRange / oldRange, nil
}

// RankOrderCentroid gives the weights of n ranked keys as the centroid of all weights in that order.
//
//	w_i = (1/n) sum_{k=i..n} 1/k
//
// i (position + 1) is the rank, 1 the most important. Source: Barron 1992; Edwards and Barron 1994.
func RankOrderCentroid(n int) []float64 {
	w := make([]float64, max(n, 0))
	s := 0.0
	for i := n; i >= 1; i-- {
		s += 1 / float64(i)
		w[i-1] = s / float64(n)
	}
	return w
}

// RankSum gives the weights of n ranked keys in equal steps.
//
//	w_i = 2 (n + 1 - i)/(n (n + 1))
//
// Source: Stillwell, Seaver and Edwards 1981.
func RankSum(n int) []float64 {
	w := make([]float64, max(n, 0))
	for i := 1; i <= n; i++ {
		w[i-1] = 2 * float64(n+1-i) / (float64(n) * float64(n+1))
	}
	return w
}

// RankReciprocal gives the weights of n ranked keys.
//
//	w_i = (1/i)/sum_{j=1..n} 1/j
//
// Source: Stillwell, Seaver and Edwards 1981.
func RankReciprocal(n int) []float64 {
	w := make([]float64, max(n, 0))
	s := 0.0
	for j := 1; j <= n; j++ {
		s += 1 / float64(j)
	}
	for i := 1; i <= n; i++ {
		w[i-1] = 1 / float64(i) / s
	}
	return w
}

// Ranked hands out the weights of places to keys by their ranks. byPlace holds the weight of place 1,
// 2, …; ranks holds each key's rank, smaller is more important, any numbers. Keys of equal rank share
// the mean of the places they take together (common practice).
func Ranked(byPlace []float64, ranks []int) ([]float64, error) {
	if len(byPlace) != len(ranks) {
		return nil, fmt.Errorf("weights: %d ranks for %d places", len(ranks), len(byPlace))
	}
	idx := make([]int, len(ranks))
	for i := range idx {
		idx[i] = i
	}
	slices.SortStableFunc(idx, func(a, b int) int { return ranks[a] - ranks[b] })
	w := make([]float64, len(ranks))
	for i := 0; i < len(idx); {
		j, s := i, 0.0
		for ; j < len(idx) && ranks[idx[j]] == ranks[idx[i]]; j++ {
			s += byPlace[j]
		}
		for m := i; m < j; m++ {
			w[idx[m]] = s / float64(j-i)
		}
		i = j
	}
	return w, nil
}

// GroupGeometric joins the weights of several groups by the weighted geometric mean.
//
//	w_k = c prod_g w_gk^mu_g,   mu_g = votes_g / sum votes,   c so that sum w = 1
//
// One group's zero makes the joint weight zero; that is refused, since it would let one group strike
// a key from the account of all others. Source: Aczel and Saaty 1983.
func GroupGeometric(groups [][]float64, votes []float64) ([]float64, error) {
	mu, err := groupShares(groups, votes)
	if err != nil {
		return nil, err
	}
	out := make([]float64, len(groups[0]))
	for k := range out {
		s := 0.0
		for g, w := range groups {
			if w[k] == 0 {
				return nil, fmt.Errorf("group weights: group %d gives key %d the weight 0, which a geometric mean cannot hold", g+1, k+1)
			}
			s += float64(mu[g] * math.Log(w[k]))
		}
		out[k] = math.Exp(s)
	}
	return Swing(out)
}

// GroupArithmetic joins the weights of several groups by the weighted mean.
//
//	w_k = sum_g mu_g w_gk,   mu_g = votes_g / sum votes
func GroupArithmetic(groups [][]float64, votes []float64) ([]float64, error) {
	mu, err := groupShares(groups, votes)
	if err != nil {
		return nil, err
	}
	out := make([]float64, len(groups[0]))
	for k := range out {
		for g, w := range groups {
			out[k] += float64(mu[g] * w[k])
		}
	}
	return Swing(out)
}

func groupShares(groups [][]float64, votes []float64) ([]float64, error) {
	if len(groups) == 0 || len(groups) != len(votes) {
		return nil, fmt.Errorf("group weights: %d groups with %d votes", len(groups), len(votes))
	}
	for g, w := range groups {
		if len(w) != len(groups[0]) {
			return nil, fmt.Errorf("group weights: group %d has %d keys, group 1 has %d", g+1, len(w), len(groups[0]))
		}
		if _, err := Swing(w); err != nil {
			return nil, fmt.Errorf("group weights: group %d: %w", g+1, err)
		}
	}
	mu, err := Swing(votes)
	if err != nil {
		return nil, fmt.Errorf("group weights: votes: %w", err)
	}
	return mu, nil
}

// Disagreement says where groups differ over a pair A, B.
//
//	D_g = sum_k w_gk delta_k
//	share_k = delta_k Cov_g(w_k, D)/Var_g(D)
//
// delta_k (delta) is v_Ak - v_Bk, w_gk (groups) the weights of group g. The shares add up to 1; a
// negative one belongs to a key that damps the quarrel. When all groups see the same difference there
// is nothing to share out, and shares is nil. The shares follow from Var(D) = sum_k delta_k Cov(w_k, D).
func Disagreement(groups [][]float64, delta []float64) (d, shares []float64, err error) {
	if len(groups) == 0 || !finite(delta...) {
		return nil, nil, errors.New("disagreement: no group, or a difference that is not finite")
	}
	d = make([]float64, len(groups))
	mean := 0.0
	for g, w := range groups {
		if len(w) != len(delta) || !finite(w...) {
			return nil, nil, fmt.Errorf("disagreement: group %d has %d finite weights, want %d", g+1, len(w), len(delta))
		}
		for k := range delta {
			d[g] += float64(w[k] * delta[k])
		}
		mean += d[g]
	}
	mean /= float64(len(groups))
	variance := 0.0
	for _, x := range d {
		variance += float64((x - mean) * (x - mean))
	}
	if variance <= tieStep*tieStep {
		return d, nil, nil
	}
	shares = make([]float64, len(delta))
	for k := range delta {
		wm := 0.0
		for _, w := range groups {
			wm += w[k]
		}
		wm /= float64(len(groups))
		cov := 0.0
		for g, w := range groups {
			cov += float64((w[k] - wm) * (d[g] - mean))
		}
		shares[k] = delta[k] * cov / variance
	}
	return d, shares, nil
}

// Regret gives, for each item, the largest regret of any group, and the lowest score of any group.
//
//	R_i = max_g (max_j S_gj - S_gi),   M_i = min_g S_gi
//
// scores holds one row per item with the score of each group. The item with the smallest R, and the one
// with the largest M, are two readings of "all can live with it".
func Regret(scores [][]float64) (maxRegret, lowest []float64, err error) {
	if len(scores) == 0 || len(scores[0]) == 0 {
		return nil, nil, errors.New("regret: no score")
	}
	best := slices.Clone(scores[0])
	for i, row := range scores {
		if len(row) != len(best) || !finite(row...) {
			return nil, nil, fmt.Errorf("regret: item %d has %d finite scores, want %d", i+1, len(row), len(best))
		}
		for g, s := range row {
			best[g] = max(best[g], s)
		}
	}
	for _, row := range scores {
		r, m := 0.0, row[0]
		for g, s := range row {
			r, m = max(r, best[g]-s), min(m, s)
		}
		maxRegret, lowest = append(maxRegret, r), append(lowest, m)
	}
	return maxRegret, lowest, nil
}
