package reckon

import (
	"fmt"
	"math"
	"slices"

	"groundtally/scoring"
)

// Drawn is a leaf that the trials vary: its slot and its value in each trial.
type Drawn struct {
	Slot   int
	Values []float64
}

// Spread is what the trials say of one quantity.
type Spread struct {
	Moves  bool    // some drawn leaf reaches the quantity
	Low    float64 // tenth percentile
	Median float64
	High   float64 // ninetieth percentile
	// Numbers and Nevers count the trials that gave a number or Never. When Never reaches into the
	// percentiles, Low, Median and High are those of the trials that gave a number, and the caller
	// says so.
	Numbers, Nevers int
}

// Trials evaluates the graph once per trial with the drawn leaves, on top of the central vector v,
// and gives the spread of the wanted slots in their order. Percentiles are linear between the order
// statistics (position (n-1)p, Hyndman and Fan 1996, type 7). All Values must have the same length.
// The vector v is left as it was.
func (g *Graph) Trials(v []scoring.Value, drawn []Drawn, want []int) ([]Spread, error) {
	out := make([]Spread, len(want))
	if len(drawn) == 0 {
		return out, nil
	}
	n := len(drawn[0].Values)
	leafSlots := make([]int, len(drawn))
	for i, d := range drawn {
		if len(d.Values) != n {
			return nil, fmt.Errorf("trials: leaf %q has %d draws, want %d", g.leaves[d.Slot].Name, len(d.Values), n)
		}
		leafSlots[i] = d.Slot
	}
	hot := g.dependents(leafSlots)
	moves := make([]bool, g.Size())
	for _, i := range hot {
		moves[len(g.leaves)+i] = true
	}
	for _, s := range leafSlots {
		moves[s] = true
	}
	work := g.bench(v)
	samples := make([][]float64, len(want))
	for i, s := range want {
		if moves[s] {
			out[i].Moves = true
			samples[i] = make([]float64, 0, n)
		}
	}
	for t := range n {
		work.trial(g, drawn, hot, t)
		for i, s := range want {
			if !moves[s] {
				continue
			}
			switch {
			case !work.odd[s]:
				samples[i] = append(samples[i], work.x[s])
			case work.val[s].State == scoring.Never:
				out[i].Nevers++
			}
		}
	}
	for i := range want {
		if s := samples[i]; len(s) > 0 {
			out[i].Numbers = len(s)
			out[i].Low, out[i].Median, out[i].High = percentile(s, 0.1), percentile(s, 0.5), percentile(s, 0.9)
		}
	}
	return out, nil
}

// bench is a value vector for trials: numbers apart from the few that are none, so that the usual case
// moves eight bytes a value.
type bench struct {
	x   []float64
	odd []bool
	val []scoring.Value // of those that are no number

	in  []scoring.Value // room for the inputs of one quantity
	buf [24]float64
}

func (g *Graph) bench(v []scoring.Value) *bench {
	b := &bench{x: make([]float64, len(v)), odd: make([]bool, len(v)), val: make([]scoring.Value, len(v)), in: make([]scoring.Value, 0, 24)}
	for i := range v {
		b.put(i, v[i])
	}
	return b
}

func (b *bench) put(slot int, v scoring.Value) {
	if v.OK() {
		b.x[slot], b.odd[slot] = v.X, false
		return
	}
	b.val[slot], b.odd[slot] = v, true
}

func (b *bench) value(slot int) scoring.Value {
	if b.odd[slot] {
		return b.val[slot]
	}
	return scoring.Value{X: b.x[slot]}
}

// trial sets the drawn leaves of trial t and evaluates what depends on them.
func (b *bench) trial(g *Graph, drawn []Drawn, hot []int, t int) {
	for _, d := range drawn {
		b.x[d.Slot], b.odd[d.Slot] = d.Values[t], false
	}
	in := b.in
	buf := &b.buf
	for _, i := range hot {
		q := &g.quantities[i]
		numbers := q.Eval.Numbers != nil
		x := buf[:0]
		for _, s := range g.inputs[i] {
			if b.odd[s] {
				numbers = false
				break
			}
			x = append(x, b.x[s])
		}
		slot := len(g.leaves) + i
		if numbers {
			if y, ok := q.Eval.Numbers(x); ok && !math.IsNaN(y) && !math.IsInf(y, 0) {
				b.x[slot], b.odd[slot] = y, false
				continue
			}
		}
		in = in[:0]
		for _, s := range g.inputs[i] {
			in = append(in, b.value(s))
		}
		b.put(slot, q.Eval.Values(in))
	}
}

// percentile gives the value at position (n-1)p of the sorted sample, linear between neighbours. It
// reorders the sample, which is cheaper than sorting it.
func percentile(a []float64, p float64) float64 {
	at := float64(len(a)-1) * p
	i := int(math.Floor(at))
	low := nth(a, i)
	if i+1 >= len(a) {
		return low
	}
	high := slices.Min(a[i+1:]) // nth leaves what is not less behind i
	return low + float64((at-float64(i))*(high-low))
}

// nth puts the k-th smallest value at index k, smaller ones before and larger ones behind it (Hoare 1961,
// algorithm 65), and gives it.
func nth(a []float64, k int) float64 {
	lo, hi := 0, len(a)-1
	for lo < hi {
		pivot := a[(lo+hi)/2]
		i, j := lo, hi
		for i <= j {
			for a[i] < pivot {
				i++
			}
			for a[j] > pivot {
				j--
			}
			if i <= j {
				a[i], a[j] = a[j], a[i]
				i++
				j--
			}
		}
		switch {
		case k <= j:
			hi = j
		case k >= i:
			lo = i
		default:
			return a[k]
		}
	}
	return a[k]
}

// Samples evaluates the graph in the first n trials and gives the wanted slots' values, per trial. The
// vector v is left as it was.
func (g *Graph) Samples(v []scoring.Value, drawn []Drawn, want []int, n int) [][]scoring.Value {
	leafSlots := make([]int, len(drawn))
	for i, d := range drawn {
		leafSlots[i] = d.Slot
		n = min(n, len(d.Values))
	}
	hot := g.dependents(leafSlots)
	work := g.bench(v)
	out := make([][]scoring.Value, n)
	for t := range n {
		work.trial(g, drawn, hot, t)
		row := make([]scoring.Value, len(want))
		for i, s := range want {
			row[i] = work.value(s)
		}
		out[t] = row
	}
	return out
}
