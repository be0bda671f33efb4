package weigh

import (
	"errors"
	"fmt"
	"slices"
)

// BoxMax gives the highest w.c over all weights in a box on the simplex, with a w that reaches it.
//
//	max { w.c : sum w = 1, l_k <= w_k <= h_k }
//
// It is a continuous knapsack: start at w = l, hand the rest 1 - sum l to the keys in falling order of
// c_k, each up to h_k. Equal c_k are served in key order. There is no such w when sum l > 1 or
// sum h < 1 (beyond 1e-12), which is an error.
func BoxMax(l, h, c []float64) (float64, []float64, error) {
	if len(l) != len(h) || len(l) != len(c) || len(c) == 0 {
		return 0, nil, errors.New("weight box: bounds and coefficients differ in length")
	}
	if !finite(l...) || !finite(h...) || !finite(c...) {
		return 0, nil, errors.New("weight box: a number is not finite")
	}
	w := slices.Clone(l)
	rest, sumH := 1.0, 0.0
	for k := range l {
		if l[k] < 0 || l[k] > h[k] {
			return 0, nil, fmt.Errorf("weight box: key %d has the bounds %v and %v", k+1, l[k], h[k])
		}
		rest -= l[k]
		sumH += h[k]
	}
	if rest < -1e-12 || sumH < 1-1e-12 {
		return 0, nil, errors.New("weight box: no weights within the bounds add up to 1")
	}
	idx := make([]int, len(c))
	for k := range idx {
		idx[k] = k
	}
	slices.SortStableFunc(idx, func(a, b int) int { return compareFloat(c[b], c[a]) })
	for _, k := range idx {
		give := min(max(rest, 0), h[k]-l[k])
		w[k] += give
		rest -= give
	}
	return dot(w, c), w, nil
}

// BoxMin is BoxMax for the lowest w.c.
func BoxMin(l, h, c []float64) (float64, []float64, error) {
	neg := make([]float64, len(c))
	for k := range c {
		neg[k] = -c[k]
	}
	v, w, err := BoxMax(l, h, neg)
	return -v, w, err
}

func compareFloat(a, b float64) int {
	switch {
	case a < b:
		return -1
	case a > b:
		return 1
	}
	return 0
}

// dot adds the products in index order, each rounded on its own, so that every processor gives the
// same bits.
func dot(a, b []float64) float64 {
	s := 0.0
	for k := range a {
		s += float64(a[k] * b[k])
	}
	return s
}

// spread is the set of weights near a voice's own: every weight may be off by its own factor between
// 1 - f and 1 + f. Only the sign of score differences matters, so the weights need not add up to 1,
// and the highest difference over the whole set has a closed form.
type spread struct{ l, h []float64 }

func newSpread(w []float64, f float64) spread {
	s := spread{make([]float64, len(w)), make([]float64, len(w))}
	for k := range w {
		s.l[k], s.h[k] = w[k]*(1-f), w[k]*(1+f)
	}
	return s
}

// maxDiff gives the highest u.(a - b) over u in the set, by taking each key at the bound that favours a.
func (s spread) maxDiff(a, b []float64) float64 {
	t := 0.0
	for k := range a {
		if d := a[k] - b[k]; d > 0 {
			t += float64(s.h[k] * d)
		} else {
			t += float64(s.l[k] * d)
		}
	}
	return t
}

// beaten reports whether b scores above a, by more than a tie, under every weight of the set. The weights
// of the set add up to less than 2.
func (s spread) beaten(a, b []float64) bool { return s.maxDiff(a, b) < -2*tieStep }

// prune marks the rows that some reference row beats under every weight of the set. high holds what a
// row could reach, low what a reference has at least; both row-major with d columns. A row is never
// compared with itself.
func (s spread) prune(high, low []float64, d int, refs []int, out []bool) {
	for i := range out {
		a := high[i*d : i*d+d]
		for _, r := range refs {
			if r != i && s.beaten(a, low[r*d:r*d+d]) {
				out[i] = true
				break
			}
		}
	}
}
