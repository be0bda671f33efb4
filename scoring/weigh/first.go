package weigh

import (
	"math"
	"slices"
)

// Status answers whether an item can be first: yes, no or unknown.
type Status string

// The answers. Yes comes with weights that prove it, no is proved, unknown says that the proof was
// not attempted (see Input.MaxPrograms) or did not close within rounding.
const (
	Yes     Status = "yes"
	No      Status = "no"
	Unknown Status = "unknown"
)

// Proof says how a Status was found.
type Proof string

// The proofs. OwnWeights: first, or level with the first, under the voice's own weights with its own
// values at their best and all others at their worst. Mix: came first in a weight mix. Witness: a
// linear program found weights. Beaten: one other item scores above it under every weight of the set.
// Mixture: a fixed mixture of other items scores above it under every weight of the set.
const (
	OwnWeights Proof = "own weights"
	Mix        Proof = "mix"
	Witness    Proof = "witness"
	Beaten     Proof = "beaten"
	Mixture    Proof = "mixture"
)

// firstOf decides for every item whether some weights of the spread and some values within the
// intervals make it first, ties included.
type firstOf struct {
	m      *matrix
	set    spread
	order  []int // item indexes by place
	rivals []int // items that no other keeps from the highest low score under every weight
	out    []bool
	// The strongest rival under the own weights and its low score, and the next best score.
	best              int
	bestLow, nextBest float64
}

// references gives the rows whose low ends score best under the own weights: good rows to compare with.
func (m *matrix) references(low []float64, count int) []int {
	s, idx := make([]float64, m.n), make([]int, m.n)
	for i := range idx {
		s[i] = dot(m.w, low[i*m.d:i*m.d+m.d])
		idx[i] = i
	}
	by := func(a, b int) int {
		if c := compareFloat(s[b], s[a]); c != 0 {
			return c
		}
		return m.byID(a, b)
	}
	// A bounded insertion keeps the pass linear.
	var top []int
	for _, i := range idx {
		if len(top) == count && by(i, top[count-1]) >= 0 {
			continue
		}
		p, _ := slices.BinarySearchFunc(top, i, by)
		top = slices.Insert(top, p, i)
		if len(top) > count {
			top = top[:count]
		}
	}
	return top
}

const referenceRows = 16

func newFirstOf(m *matrix, set spread, order []int) *firstOf {
	f := &firstOf{m: m, set: set, order: order, out: make([]bool, m.n)}
	refs := m.references(m.low, referenceRows)
	set.prune(m.high, m.low, m.d, refs, f.out)
	weak := make([]bool, m.n)
	set.prune(m.low, m.low, m.d, refs, weak)
	for _, i := range order {
		if !weak[i] {
			f.rivals = append(f.rivals, i)
		}
	}
	f.best, f.bestLow = f.strongest(m.w, -1)
	_, f.nextBest = f.strongest(m.w, f.best)
	return f
}

// strongest gives the rival with the highest low score under u, other than i; -1 when there is none.
func (f *firstOf) strongest(u []float64, i int) (rival int, score float64) {
	rival = -1
	for _, j := range f.rivals {
		if j == i {
			continue
		}
		if s := dot(u, f.m.lowRow(j)); rival < 0 || s > score {
			rival, score = j, s
		}
	}
	return rival, score
}

// holds reports whether item i at its best is first under u, all others at their worst.
func (f *firstOf) holds(u []float64, i int) (ok bool, rival int) {
	rival, s := f.strongest(u, i)
	return rival < 0 || reaches(u, f.m.highRow(i), s), rival
}

// reaches counts scores within a step of the tie grid as level, and allows for the rounding of sums.
func reaches(u, high []float64, s float64) bool {
	return dot(u, high) >= s-float64((tieStep+1e-12)*sum(u))
}

// holdsOwn is holds under the own weights, in one step.
func (f *firstOf) holdsOwn(i int) bool {
	s, others := f.bestLow, len(f.rivals)
	if i == f.best {
		s, others = f.nextBest, others-1
	}
	return others <= 0 || reaches(f.m.w, f.m.highRow(i), s)
}

// decide answers for item i by a linear program with growing rows:
//
//	max t   such that   l <= u <= h,   u.(high_i - low_j + e) >= t  for every rival j met so far
//
// with e one step of the tie grid, within which scores are level. Both answers are checked without trust in the program: a yes by scoring every rival under the
// weights found, a no by the closed form max_u u.g < 0 for the mixture g = sum lambda_j
// (high_i - low_j + e) of its dual. Source of the scheme: Clarkson 1994.
func (f *firstOf) decide(i int, first []float64) (Status, Proof, []float64) {
	ok, rival := f.holds(first, i)
	if ok {
		return Yes, OwnWeights, first
	}
	d := f.m.d
	high := f.m.highRow(i)
	var deltas [][]float64
	var met []int
	zero := make([]float64, d)
	for len(met) < 4*d+16 {
		if slices.Contains(met, rival) {
			return Unknown, "", nil
		}
		met = append(met, rival)
		low, delta := f.m.lowRow(rival), make([]float64, d)
		for k := range delta {
			delta[k] = high[k] - low[k] + tieStep
		}
		deltas = append(deltas, delta)
		u, lambda, solved := maximin(f.set, deltas)
		if !solved {
			return Unknown, "", nil
		}
		g := make([]float64, d)
		for j, x := range lambda {
			for k := range g {
				g[k] += float64(x * deltas[j][k])
			}
		}
		if f.set.maxDiff(g, zero) < -1e-12 {
			return No, Mixture, nil
		}
		if ok, rival = f.holds(u, i); ok {
			return Yes, Witness, normalised(u)
		}
	}
	return Unknown, "", nil
}

func normalised(u []float64) []float64 {
	s := sum(u)
	out := make([]float64, len(u))
	for k := range u {
		out[k] = u[k] / s
	}
	return out
}

// maximin solves max t, l <= u <= h, u.delta_j >= t, by the primal simplex method with bounded
// variables on a dense tableau. lambda are the dual weights of the rows, at least 0, with sum 1. ok is
// false when it did not end within its rounds.
//
// With u = l + x and t = t' - M, M >= |u.delta|, the rows read t' - x.delta_j + s_j = l.delta_j + M with
// a right side of at least 0: x = 0, t' = 0 is a corner to start from.
func maximin(set spread, deltas [][]float64) (u, lambda []float64, ok bool) {
	d, rows := len(set.l), len(deltas)
	cols := d + 1 + rows // x, t', slacks
	const eps = 1e-11
	upper := make([]float64, cols)
	bigM := 0.0
	for c := range upper {
		upper[c] = math.Inf(1)
		if c < d {
			upper[c] = set.h[c] - set.l[c]
			bigM += set.h[c]
		}
	}
	bigM++
	tab := make([][]float64, rows)
	rhs := make([]float64, rows)
	basis := make([]int, rows)
	for j, delta := range deltas {
		tab[j] = make([]float64, cols)
		for k := range delta {
			tab[j][k] = -delta[k]
		}
		tab[j][d], tab[j][d+1+j] = 1, 1
		rhs[j] = dot(set.l, delta) + bigM
		basis[j] = d + 1 + j
	}
	cost := make([]float64, cols) // reduced costs of the maximum
	cost[d] = 1
	flipped := make([]bool, cols) // the variable is counted down from its upper bound
	basic := make([]bool, cols)
	for _, b := range basis {
		basic[b] = true
	}
	flip := func(c int) { // a nonbasic variable changes its bound
		for j := range tab {
			rhs[j] -= float64(tab[j][c] * upper[c])
			tab[j][c] = -tab[j][c]
		}
		cost[c] = -cost[c]
		flipped[c] = !flipped[c]
	}
	limit := 60 * (cols + 10)
	for round := 0; ; round++ {
		if round == limit {
			return nil, nil, false
		}
		enter := -1
		for c := range cols {
			if basic[c] || cost[c] <= eps || upper[c] == 0 {
				continue
			}
			if enter < 0 || cost[c] > cost[enter] {
				enter = c
			}
			if round > limit/2 { // the smallest index cannot cycle
				break
			}
		}
		if enter < 0 {
			break
		}
		leave, step, toUpper := -1, upper[enter], false
		for j := range tab {
			a := tab[j][enter]
			var r float64
			switch {
			case a > eps:
				r = max(rhs[j], 0) / a
			case a < -eps && !math.IsInf(upper[basis[j]], 1):
				r = max(upper[basis[j]]-rhs[j], 0) / -a
			default:
				continue
			}
			if r < step || (r == step && leave >= 0 && basis[j] < basis[leave]) {
				leave, step, toUpper = j, r, a < 0
			}
		}
		if leave < 0 {
			if math.IsInf(step, 1) {
				return nil, nil, false
			}
			flip(enter)
			continue
		}
		out := basis[leave]
		if toUpper { // count the leaving variable down from its bound first
			for c := range cols {
				if c != out {
					tab[leave][c] = -tab[leave][c]
				}
			}
			rhs[leave] = upper[out] - rhs[leave]
			flipped[out] = !flipped[out]
		}
		p := tab[leave][enter]
		for c := range cols {
			tab[leave][c] /= p
		}
		rhs[leave] /= p
		for j := range tab {
			if f := tab[j][enter]; j != leave && f != 0 {
				for c := range cols {
					tab[j][c] -= float64(f * tab[leave][c])
				}
				rhs[j] -= float64(f * rhs[leave])
			}
		}
		f := cost[enter]
		for c := range cols {
			cost[c] -= float64(f * tab[leave][c])
		}
		basis[leave] = enter
		basic[enter], basic[out] = true, false
	}
	x := make([]float64, cols)
	for j, b := range basis {
		x[b] = rhs[j]
	}
	u = make([]float64, d)
	for k := range u {
		v := x[k]
		if flipped[k] {
			v = upper[k] - v
		}
		u[k] = min(max(set.l[k]+v, set.l[k]), set.h[k])
	}
	lambda = make([]float64, rows)
	s := 0.0
	for j := range lambda {
		lambda[j] = max(-cost[d+1+j], 0)
		s += lambda[j]
	}
	if s <= 0 {
		return nil, nil, false
	}
	for j := range lambda {
		lambda[j] /= s
	}
	return u, lambda, true
}
