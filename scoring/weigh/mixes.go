package weigh

import (
	"fmt"
	"math"
	"math/rand/v2"
)

// Trials are draws of uncertain consequences, turned into values by the caller. A trial is one state of
// the world: what all candidates share must be drawn once per trial for all of them.
type Trials struct {
	// Count is the number of trials, at least 1. Mix number m uses trial m modulo Count.
	Count int
	// Items are the indexes, in Input.Items, of the items that have draws; Contenders says for which
	// they can matter. All others keep their middle values.
	Items []int
	// Row fills out with the values of one item in one trial, one per key, each from 0 to 1. What it
	// gives for an unknown part is not used: see Order.
	Row func(trial, item int, out []float64) error
}

// MixWeights gives the weights of weight mix number mix: every weight multiplied by its own draw from
// 1 - f to 1 + f, uniform, then divided by the new sum. f is spread, from 0 to MaxMixSpread. The draws depend on
// seed, mix and the position of the key alone, so that a mix is the same for any items, in any order,
// on any number of cores.
func MixWeights(w []float64, spread float64, seed uint64, mix int) []float64 {
	return normalised(mixRaw(w, spread, seed, mix))
}

func mixRaw(w []float64, spread float64, seed uint64, mix int) []float64 {
	r := rand.New(rand.NewPCG(seed, uint64(mix)))
	u := make([]float64, len(w))
	for k := range u {
		u[k] = float64(w[k] * (1 - spread + float64(2*spread*r.Float64())))
	}
	return u
}

// DrawsFor gives how many draws keep the error of a share within e (halfWidth) in the worst case.
//
//	N = z^2/(4 e^2)
//
// z is 1.96 for 95 % (normal approximation of the binomial, worst at a share of one half). The result
// is rounded up, with 1e-9 taken off for rounding noise. Source: Tervonen and Lahdelma 2007.
func DrawsFor(halfWidth, z float64) (int, error) {
	if !finite(halfWidth, z) || halfWidth <= 0 || z <= 0 {
		return 0, fmt.Errorf("draws: half width %v and z %v must be above 0", halfWidth, z)
	}
	n := z * z / (4 * halfWidth * halfWidth)
	if n > 1e15 {
		return 0, fmt.Errorf("draws: a half width of %v needs more draws than can be counted", halfWidth)
	}
	return int(math.Ceil(n - 1e-9)), nil
}

// unknownStream keeps the streams of unknown values apart from those of the weights.
const unknownStream = 0x6b65795f756e6b6e

// seedUnknown sets the stream of unknown values in one mix. A key's unknown value is one state of the
// world for all items that lack it: with a draw for each item the luckiest of a thousand would win.
func seedUnknown(p *rand.PCG, seed uint64, mix int) {
	p.Seed(seed^unknownStream, uint64(mix)*0x9e3779b97f4a7c15+1)
}

// firstInMixes counts in how many mixes each item comes first, and keeps the first mix that it won.
// Level scores go to the item that stands higher in the order.
func (m *matrix) firstInMixes(in *Input, set spread, order []int) (count []int, won []int, err error) {
	count, won = make([]int, m.n), make([]int, m.n)
	drawn := make([]bool, m.n)
	buf := make([]float64, m.d)
	if in.Trials != nil {
		t := in.Trials
		if t.Count < 1 || t.Row == nil {
			return nil, nil, fmt.Errorf("order: trials need a count of at least 1 and a row function")
		}
		for _, i := range t.Items {
			if i < 0 || i >= m.n || drawn[i] {
				return nil, nil, fmt.Errorf("order: trials name item %d, which is not there or named twice", i)
			}
			drawn[i] = true
		}
	}
	// Without draws an item has its middle values, and anything where a part is unknown: what another
	// such item beats under every weight never wins a mix.
	high, low := m.mid, m.mid
	if m.anyUnknown {
		high, low = make([]float64, len(m.mid)), make([]float64, len(m.mid))
		copy(high, m.mid)
		copy(low, m.mid)
		for i := range m.n {
			for k := range m.d {
				if m.unknown(i, k) {
					high[i*m.d+k], low[i*m.d+k] = 1, 0
				}
			}
		}
	}
	var refs []int
	for _, i := range m.references(low, referenceRows) {
		if !drawn[i] {
			refs = append(refs, i)
		}
	}
	out := make([]bool, m.n)
	set.prune(high, low, m.d, refs, out)
	var field []int
	for _, i := range order {
		if drawn[i] || !out[i] {
			field = append(field, i)
		}
	}
	var stream rand.PCG
	draw := rand.New(&stream)
	missing := make([]float64, m.d) // one draw a key and mix, shared by all that lack the key
	for mix := range in.Mixes {
		u := mixRaw(m.w, in.MixSpread, in.Seed, mix)
		seedUnknown(&stream, in.Seed, mix)
		for k := range missing {
			missing[k] = draw.Float64()
		}
		best, top := -1, 0.0
		for _, i := range field {
			row := m.midRow(i)
			if drawn[i] {
				trial := mix % in.Trials.Count
				if err := in.Trials.Row(trial, i, buf); err != nil {
					return nil, nil, fmt.Errorf("order: trial %d of item %q: %w", trial, m.ids[i], err)
				}
				for k, v := range buf {
					if !m.unknown(i, k) && !(v >= 0 && v <= 1) {
						return nil, nil, fmt.Errorf("order: trial %d of item %q, key %q: %v is not between 0 and 1", trial, m.ids[i], in.Keys[k].Name, v)
					}
				}
				row = buf
			}
			if !m.complete[i] {
				copy(buf, row)
				row = buf
				for k := range buf {
					if m.unknown(i, k) {
						buf[k] = missing[k]
					}
				}
			}
			if s := dot(u, row); best < 0 || s > top {
				best, top = i, s
			}
		}
		if best >= 0 {
			if count[best] == 0 {
				won[best] = mix
			}
			count[best]++
		}
	}
	return count, won, nil
}

// Contenders gives the indexes of the items that could come first under some weights of the mixes and
// some values within their intervals, as far as comparison with the best items can tell: whoever is
// left out is surely beaten. Trials are needed for these alone, unless a trial may leave the interval.
func Contenders(in Input) ([]int, error) {
	m, err := newMatrix(&in)
	if err != nil {
		return nil, err
	}
	set := newSpread(m.w, in.MixSpread)
	out := make([]bool, m.n)
	set.prune(m.high, m.low, m.d, m.references(m.low, referenceRows), out)
	var left []int
	for i, gone := range out {
		if !gone {
			left = append(left, i)
		}
	}
	return left, nil
}
