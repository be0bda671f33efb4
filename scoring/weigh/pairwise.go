package weigh

import (
	"errors"
	"fmt"
	"math"
)

// Judgements is a complete set of pairwise judgements over the weights of n keys: a_ij says how many
// times the swing of key i is worth that of key j; a_ji = 1/a_ij. It serves weights alone, never the
// values of candidates, where it would make scores depend on the set.
type Judgements struct {
	n int
	a []float64 // row-major
}

// NewJudgements takes the judgements above the diagonal, row by row: a12, a13, …, a1n, a23, …. Each
// must lie between 1/9 and 9 (Saaty 1977).
func NewJudgements(n int, upper []float64) (Judgements, error) {
	if n < 1 || len(upper) != n*(n-1)/2 {
		return Judgements{}, fmt.Errorf("pairwise judgements: %d given for %d keys, want %d", len(upper), n, n*(n-1)/2)
	}
	j := Judgements{n, make([]float64, n*n)}
	m := 0
	for i := range n {
		j.a[i*n+i] = 1
		for k := i + 1; k < n; k++ {
			x := upper[m]
			m++
			if !(x >= 1.0/9*(1-1e-12) && x <= 9) {
				return Judgements{}, fmt.Errorf("pairwise judgements: key %d against key %d is %v, want 1/9 to 9", i+1, k+1, x)
			}
			j.a[i*n+k], j.a[k*n+i] = x, 1/x
		}
	}
	return j, nil
}

// GeometricMean gives the weights by logarithmic least squares.
//
//	w_i = c (prod_j a_ij)^(1/n)
//
// It equals the eigenvector for n <= 3 and for consistent judgements. Source: Crawford and Williams 1985.
func (j Judgements) GeometricMean() []float64 {
	w, sum := make([]float64, j.n), 0.0
	for i := range w {
		s := 0.0
		for k := range j.n {
			s += math.Log(j.a[i*j.n+k])
		}
		w[i] = math.Exp(s / float64(j.n))
		sum += w[i]
	}
	for i := range w {
		w[i] /= sum
	}
	return w
}

// Eigenvector gives the weights w and the principal eigenvalue lambda with A w = lambda w, by power
// iteration until no weight changes by 1e-12 or more, at most 1000 times. Source: Saaty 1977.
func (j Judgements) Eigenvector() (w []float64, lambda float64, err error) {
	n := j.n
	w = j.GeometricMean()
	next := make([]float64, n)
	for range 1000 {
		sum := 0.0
		for i := range n {
			s := 0.0
			for k := range n {
				s += float64(j.a[i*n+k] * w[k])
			}
			next[i] = s
			sum += s
		}
		change := 0.0
		for i := range n {
			next[i] /= sum
			change = max(change, math.Abs(next[i]-w[i]))
		}
		copy(w, next)
		if change < 1e-12 {
			// The weights sum to 1, so the sum of A w is the eigenvalue.
			return w, sum, nil
		}
	}
	return nil, 0, errors.New("pairwise judgements: the eigenvector did not settle in 1000 rounds")
}

// ConsistencyIndex gives CI = (lambda - n)/(n - 1); 0 for n < 2. Source: Saaty 1977.
func ConsistencyIndex(lambda float64, n int) float64 {
	if n < 2 {
		return 0
	}
	return (lambda - float64(n)) / float64(n-1)
}

// ConsistencyRatio gives CR = CI/RI, with RI (randomIndex) the mean CI of random judgements of the same
// n; 0 where RI is 0 (n <= 2, which cannot be inconsistent). CR up to 0.10 is accepted (0.05 for n = 3,
// 0.08 for n = 4), see ConsistencyLimit. Source: Saaty 1977, 1980.
func ConsistencyRatio(lambda float64, n int, randomIndex float64) float64 {
	if randomIndex == 0 {
		return 0
	}
	return ConsistencyIndex(lambda, n) / randomIndex
}

// RandomIndexSaaty gives RI for n = 1 to 10 as printed in Saaty 1980. ok is false for other n. The
// value 0.58 for n = 3 is high: random judgements on the 17-value scale give 0.52.
func RandomIndexSaaty(n int) (ri float64, ok bool) {
	if n < 1 || n > 10 {
		return 0, false
	}
	return [...]float64{0, 0, 0.58, 0.90, 1.12, 1.24, 1.32, 1.41, 1.45, 1.49}[n-1], true
}

// RandomIndexFit gives RI for any n >= 3 by the straight fit to mean eigenvalues.
//
//	RI = (2.7699 n - 4.3513 - n)/(n - 1)
//
// 0 for n < 3. Source: Alonso and Lamata 2006 (coefficients from memory).
func RandomIndexFit(n int) float64 {
	if n < 3 {
		return 0
	}
	f := float64(n)
	return (float64(2.7699*f) - 4.3513 - f) / (f - 1)
}

// ConsistencyLimit gives the highest accepted CR. Source: Saaty 1980 (0.05 and 0.08 from memory).
func ConsistencyLimit(n int) float64 {
	switch {
	case n <= 3:
		return 0.05
	case n == 4:
		return 0.08
	}
	return 0.10
}

// GeometricConsistency gives the index that belongs to the geometric mean.
//
//	GCI = 2/((n-1)(n-2)) sum_{i<j} ln^2(a_ij w_j/w_i)
//
// w are the weights of GeometricMean. 0 for n < 3. It is accepted up to 0.31 (n = 3), 0.35 (n = 4),
// 0.37 (n > 4), near CR = 0.1. Source: Aguaron and Moreno-Jimenez 2003.
func (j Judgements) GeometricConsistency() float64 {
	if j.n < 3 {
		return 0
	}
	w, s := j.GeometricMean(), 0.0
	for i := range j.n {
		for k := i + 1; k < j.n; k++ {
			e := math.Log(j.a[i*j.n+k] * w[k] / w[i])
			s += float64(e * e)
		}
	}
	return 2 * s / float64((j.n-1)*(j.n-2))
}

// Worst gives the judgement that fits the weights w least: the pair i < k with the largest
// |ln(a_ik w_k/w_i)|, and the ratio w_i/w_k that the weights imply in place of a_ik. ok is false for
// n < 2 or when w has not n entries above 0.
func (j Judgements) Worst(w []float64) (i, k int, given, implied float64, ok bool) {
	if j.n < 2 || len(w) != j.n {
		return 0, 0, 0, 0, false
	}
	worst := -1.0
	for a := range j.n {
		if !(w[a] > 0) {
			return 0, 0, 0, 0, false
		}
		for b := a + 1; b < j.n; b++ {
			if !(w[b] > 0) {
				return 0, 0, 0, 0, false
			}
			if e := math.Abs(math.Log(j.a[a*j.n+b] * w[b] / w[a])); e > worst {
				worst, i, k = e, a, b
			}
		}
	}
	return i, k, j.a[i*j.n+k], w[i] / w[k], true
}
