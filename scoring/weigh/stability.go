package weigh

import (
	"errors"
	"fmt"
	"math"
	"slices"
)

// Change is a change of first place when one weight moves.
type Change struct {
	At       float64 // the weight at which the two are level
	NewFirst string  // who leads beyond it
	// Raw is the raw weight of the key at At while the raw weights of all other keys stay as they are,
	//
	//	u'_k = t/(1 - t) sum_{m != k} u_m
	//
	// It holds only when HasRaw: not at t = 1, not when the other raw weights are all zero.
	Raw    float64
	HasRaw bool
}

// Tipping says between which weights of one key the leader stays first while the other weights keep
// their proportions. Below and Above are nil when no weight on that side changes first place.
type Tipping struct {
	Key      string
	Weight   float64
	From, To float64
	Below    *Change
	Above    *Change
	// EqualOthers marks a key that has all the weight: the others then have no proportions, and equal
	// ones are assumed.
	EqualOthers bool
}

// lineEnds gives the score of row v at weight 0 and at weight 1 of key k:
//
//	S(t) = t v_k + (1 - t) r,   r = sum_{m != k} w_m v_m / (1 - w_k)
func lineEnds(w, v []float64, k int, equalOthers bool) (r, vk float64) {
	if len(w) == 1 {
		return v[0], v[0]
	}
	s, rest := 0.0, 0.0
	for m := range w {
		switch {
		case m == k:
		case equalOthers:
			s += v[m]
			rest++
		default:
			s += float64(w[m] * v[m])
			rest += w[m]
		}
	}
	return s / rest, v[k]
}

// allOnOne reports whether key k has practically all the weight.
func allOnOne(w []float64, k int) bool { return len(w) > 1 && 1-w[k] < tieStep }

// tippingState is what one pass over the rivals remembers for one key.
type tippingState struct {
	ra, va                 float64
	below, above           int // places of the rivals that take over, 0 for none
	slopeBelow, slopeAbove float64
}

// tipping finds Tipping for every key. For the leader a and each rival j, with d0 = r_a - r_j and
// d1 = v_ak - v_jk, the gap d0 + t (d1 - d0) is a straight line in t with the root d0/(d0 - d1). Where
// several rivals take over at the same weight, the one whose score changes fastest leads beyond it.
// It is exact. Source: the same sensitivity in Triantaphyllou and Sanchez 1997.
func (m *matrix) tipping(order []int, score []float64, keys []Key) []Tipping {
	out, state := make([]Tipping, m.d), make([]tippingState, m.d)
	rawSum := 0.0
	for k := range out {
		out[k] = Tipping{Key: keys[k].Name, Weight: m.w[k], From: 0, To: 1, EqualOthers: allOnOne(m.w, k)}
		rawSum += keys[k].RawWeight
		if len(order) > 0 {
			state[k].ra, state[k].va = lineEnds(m.w, m.midRow(order[0]), k, out[k].EqualOthers)
		}
	}
	if len(order) < 2 || m.d < 2 {
		return out
	}
	a := m.midRow(order[0])
	for p := 1; p < len(order); p++ {
		b := m.midRow(order[p])
		lead := score[order[0]] - score[order[p]]
		for k := range out {
			t, s := &out[k], &state[k]
			if 1-m.w[k] > 1e-3 {
				// The gaps from the scores, good to about 1e-12, tell most rivals off at once.
				const margin = 1e-9
				d1 := a[k] - b[k]
				d0 := (lead - float64(m.w[k]*d1)) / (1 - m.w[k])
				if d0 >= 0 && d1 >= 0 {
					continue
				}
				if at := d0 + float64(t.From*(d1-d0)); d0 < 0 && s.below > 0 && at > margin {
					continue
				}
				if at := d0 + float64(t.To*(d1-d0)); d0 >= 0 && s.above > 0 && at > margin {
					continue
				}
			}
			t.rival(s, m.w[k], b, p, m.w, k)
		}
	}
	for k := range out {
		t, s := &out[k], &state[k]
		others := rawSum - keys[k].RawWeight
		t.Below = m.change(t, t.From, s.below, order, others)
		t.Above = m.change(t, t.To, s.above, order, others)
	}
	return out
}

// rival takes the rival at place p into account. One that never leads by more than a tie takes nothing
// over.
func (t *Tipping) rival(s *tippingState, wk float64, row []float64, p int, w []float64, k int) {
	rj, vj := lineEnds(w, row, k, t.EqualOthers)
	d0, d1 := s.ra-rj, s.va-vj
	slope := math.Abs(d1 - d0)
	switch {
	case d1 > d0 && d0 < -tieStep:
		root := min(d0/(d0-d1), wk)
		if s.below == 0 || root > t.From+1e-12 || (root >= t.From-1e-12 && slope > s.slopeBelow) {
			t.From, s.below, s.slopeBelow = max(root, t.From), p, slope
		}
	case d1 < d0 && d1 < -tieStep:
		root := max(d0/(d0-d1), wk)
		if s.above == 0 || root < t.To-1e-12 || (root <= t.To+1e-12 && slope > s.slopeAbove) {
			t.To, s.above, s.slopeAbove = min(root, t.To), p, slope
		}
	}
}

func (m *matrix) change(t *Tipping, at float64, p int, order []int, othersRaw float64) *Change {
	if p == 0 {
		return nil
	}
	c := &Change{At: at, NewFirst: m.ids[order[p]]}
	if !t.EqualOthers && othersRaw > 0 && at < 1 {
		c.Raw, c.HasRaw = at/(1-at)*othersRaw, true
	}
	return c
}

// Lead is a stretch of weights of one key over which the same row leads.
type Lead struct {
	Row      int
	From, To float64
}

// Leaders gives, for key k, who leads at each weight t from 0 to 1 while the other weights keep their
// proportions: the upper envelope of the lines S_i(t). w are the weights, values is row-major with
// len(w) columns. Of rows that are level over a whole stretch the first is named. O(n log n).
func Leaders(w, values []float64, k int) ([]Lead, error) {
	d := len(w)
	if d == 0 || k < 0 || k >= d || len(values) == 0 || len(values)%d != 0 {
		return nil, fmt.Errorf("leaders: %d values, %d weights, key %d", len(values), d, k+1)
	}
	if err := checkWeights(w); err != nil {
		return nil, fmt.Errorf("leaders: %w", err)
	}
	if !finite(values...) {
		return nil, errors.New("leaders: a value is not finite")
	}
	type line struct {
		row    int
		r, end float64
	}
	n := len(values) / d
	lines := make([]line, n)
	for i := range lines {
		r, v := lineEnds(w, values[i*d:i*d+d], k, allOnOne(w, k))
		lines[i] = line{i, r, v}
	}
	slices.SortFunc(lines, func(a, b line) int {
		if c := compareFloat(a.end-a.r, b.end-b.r); c != 0 {
			return c
		}
		if c := compareFloat(b.r, a.r); c != 0 {
			return c
		}
		return a.row - b.row
	})
	var hull []line
	var from []float64
	for _, c := range lines {
		start := 0.0
		for len(hull) > 0 {
			top := hull[len(hull)-1]
			ds := (c.end - c.r) - (top.end - top.r)
			if ds <= 0 { // parallel: the one that came first lies above or is level
				start = 2
				break
			}
			t := (top.r - c.r) / ds
			if t > from[len(from)-1] {
				start = t
				break
			}
			hull, from = hull[:len(hull)-1], from[:len(from)-1]
			start = 0
		}
		if start < 1 {
			hull, from = append(hull, c), append(from, start)
		}
	}
	out := make([]Lead, len(hull))
	for i, h := range hull {
		to := 1.0
		if i+1 < len(hull) {
			to = from[i+1]
		}
		out[i] = Lead{h.row, from[i], to}
	}
	return out, nil
}

// ReversalFactor gives the factor by which the weights would have to be off for B to reach A.
//
//	rho = sqrt(N/P),   P = sum_{delta_k > 0} w_k delta_k,   N = sum_{delta_k < 0} w_k |delta_k|
//
// delta_k (delta) is v_Bk - v_Ak, w_k (w) the weights, in any scale. Raising every raw weight that
// favours B by rho and lowering every one that favours A by rho makes the two level; no smaller factor
// does, since the ends of the allowed range are the best B can get. ok is false when no key with a
// weight favours B: then no weights help. rho < 1 says that B leads already. Derivation: B reaches A
// when rho P >= N/rho.
func ReversalFactor(w, delta []float64) (rho float64, ok bool) {
	p, n := 0.0, 0.0
	for k, d := range delta {
		if x := float64(w[k] * d); x > 0 {
			p += x
		} else {
			n -= x
		}
	}
	if p <= 0 {
		return 0, false
	}
	return math.Sqrt(n / p), true
}

// ErrNoReversal says that no weights within the bounds put the rival level with the leader.
var ErrNoReversal = errors.New("no weights put the rival level with the leader")

func checkReversal(w, delta []float64) error {
	if len(w) != len(delta) || len(w) == 0 || !finite(delta...) {
		return errors.New("closest reversal: weights and finite differences of equal number are needed")
	}
	return checkWeights(w)
}

func sum(xs []float64) float64 {
	s := 0.0
	for _, x := range xs {
		s += x
	}
	return s
}

// ClosestReversal gives the weights nearest to w, in Euclidean distance, at which B is level with A.
//
//	min |w' - w|   such that   w'.delta = 0,  sum w' = 1,  w' >= 0
//
// delta is v_B - v_A. The solution is the projection of w + b delta onto the simplex for the one b at
// which w'.delta = 0; b is bracketed and halved, then w' is solved exactly on the keys that stay above
// 0. When B is not behind, w itself is the answer. ErrNoReversal when no key favours B.
func ClosestReversal(w, delta []float64) (nearest []float64, distance float64, err error) {
	if err := checkReversal(w, delta); err != nil {
		return nil, 0, err
	}
	if dot(w, delta) >= 0 {
		return slices.Clone(w), 0, nil
	}
	if slices.Max(delta) <= 0 {
		return nil, 0, ErrNoReversal
	}
	at := func(b float64) []float64 {
		x := make([]float64, len(w))
		for k := range x {
			x[k] = w[k] + float64(b*delta[k])
		}
		return projectSimplex(x)
	}
	lo, hi := 0.0, 1.0
	for dot(at(hi), delta) < 0 {
		if lo, hi = hi, hi*2; hi > 1e15 {
			return nil, 0, ErrNoReversal
		}
	}
	for range 200 {
		b := lo + (hi-lo)/2
		if b <= lo || b >= hi {
			break
		}
		if dot(at(b), delta) < 0 {
			lo = b
		} else {
			hi = b
		}
	}
	nearest = at(hi)
	// On the free keys w' = w + a + b delta with two equations for a and b.
	var n, sd, sdd, sw, swd float64
	for k := range w {
		if nearest[k] > 0 {
			n++
			sd += delta[k]
			sdd += float64(delta[k] * delta[k])
			sw += w[k]
			swd += float64(w[k] * delta[k])
		}
	}
	if det := float64(n*sdd) - float64(sd*sd); det > 1e-12 {
		a := (float64((1-sw)*sdd) + float64(swd*sd)) / det
		b := (float64(-swd*n) - float64((1-sw)*sd)) / det
		exact, fits := make([]float64, len(w)), true
		for k := range w {
			if nearest[k] > 0 {
				exact[k] = w[k] + a + float64(b*delta[k])
				fits = fits && exact[k] >= 0
			}
		}
		if fits {
			nearest = exact
		}
	}
	s := 0.0
	for k := range w {
		s += float64((nearest[k] - w[k]) * (nearest[k] - w[k]))
	}
	return nearest, math.Sqrt(s), nil
}

// projectSimplex gives the nearest point to x with entries of at least 0 that add up to 1: x less one
// common amount, cut at 0.
func projectSimplex(x []float64) []float64 {
	s := slices.Clone(x)
	slices.SortFunc(s, func(a, b float64) int { return compareFloat(b, a) })
	acc, theta := 0.0, 0.0
	for i, v := range s {
		acc += v
		if t := (acc - 1) / float64(i+1); v > t {
			theta = t
		}
	}
	out := make([]float64, len(x))
	for i, v := range x {
		out[i] = max(v-theta, 0)
	}
	return out
}

// WeightToMove gives the least amount of weight that must move from some keys to others for B to be
// level with A, and the weights after it. It takes from the keys with the smallest delta, down to l_k,
// and gives to those with the largest, up to h_k, which is exact. Half of the sum of |w' - w| is the
// amount. ErrNoReversal when the bounds do not allow it.
func WeightToMove(w, delta, l, h []float64) (mass float64, after []float64, err error) {
	if err := checkReversal(w, delta); err != nil {
		return 0, nil, err
	}
	if len(l) != len(w) || len(h) != len(w) {
		return 0, nil, errors.New("closest reversal: bounds and weights differ in length")
	}
	for k := range w {
		if !(l[k] >= 0 && l[k] <= w[k] && w[k] <= h[k] && h[k] <= 1) {
			return 0, nil, fmt.Errorf("closest reversal: weight %d lies outside its bounds", k+1)
		}
	}
	idx := make([]int, len(w))
	for k := range idx {
		idx[k] = k
	}
	slices.SortStableFunc(idx, func(a, b int) int { return compareFloat(delta[a], delta[b]) })
	after = slices.Clone(w)
	gap := dot(w, delta)
	from, to := 0, len(idx)-1
	for gap < 0 {
		for from < to && after[idx[from]] <= l[idx[from]] {
			from++
		}
		for from < to && after[idx[to]] >= h[idx[to]] {
			to--
		}
		a, b := idx[from], idx[to]
		gain := delta[b] - delta[a]
		if from >= to || gain <= 0 {
			return 0, nil, ErrNoReversal
		}
		x := min(after[a]-l[a], h[b]-after[b])
		if need := -gap / gain; need <= x {
			after[a] -= need
			after[b] += need
			return mass + need, after, nil
		}
		// Land on the bound itself, so that no rounding leaves a crumb to move.
		if after[a]-l[a] <= h[b]-after[b] {
			after[a], after[b] = l[a], after[b]+x
		} else {
			after[a], after[b] = after[a]-x, h[b]
		}
		mass += x
		gap += float64(x * gain)
	}
	return mass, after, nil
}

// LargestShift gives the smallest r such that some weights within r of w on every key put B level with
// A. The highest w'.delta within r is a continuous knapsack, growing with r; r is found by halving to
// 1e-13. ErrNoReversal when no key favours B.
func LargestShift(w, delta []float64) (r float64, err error) {
	if err := checkReversal(w, delta); err != nil {
		return 0, err
	}
	reach := func(r float64) (float64, error) {
		l, h := make([]float64, len(w)), make([]float64, len(w))
		for k := range w {
			l[k], h[k] = max(0, w[k]-r), min(1, w[k]+r)
		}
		v, _, err := BoxMax(l, h, delta)
		return v, err
	}
	if dot(w, delta) >= 0 {
		return 0, nil
	}
	if slices.Max(delta) <= 0 {
		return 0, ErrNoReversal
	}
	lo, hi := 0.0, 1.0
	for hi-lo > 1e-13 {
		mid := lo + (hi-lo)/2
		v, err := reach(mid)
		if err != nil {
			return 0, err
		}
		if v < 0 {
			lo = mid
		} else {
			hi = mid
		}
	}
	return hi, nil
}
