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
	work := slices.Clone(v)
	samples := make([][]float64, len(want))
	for i, s := range want {
		if moves[s] {
			out[i].Moves = true
			samples[i] = make([]float64, 0, n)
		}
	}
	var buf [16]scoring.Value
	for t := range n {
		for _, d := range drawn {
			work[d.Slot] = scoring.Num(d.Values[t])
		}
		for _, i := range hot {
			work[len(g.leaves)+i] = g.eval(i, work, buf[:0])
		}
		for i, s := range want {
			if !moves[s] {
				continue
			}
			switch w := work[s]; w.State {
			case scoring.Number:
				samples[i] = append(samples[i], w.X)
			case scoring.Never:
				out[i].Nevers++
			}
		}
	}
	for i := range want {
		if s := samples[i]; len(s) > 0 {
			slices.Sort(s)
			out[i].Numbers = len(s)
			out[i].Low, out[i].Median, out[i].High = percentile(s, 0.1), percentile(s, 0.5), percentile(s, 0.9)
		}
	}
	return out, nil
}

func percentile(sorted []float64, p float64) float64 {
	at := float64(len(sorted)-1) * p
	i := int(math.Floor(at))
	if i+1 >= len(sorted) {
		return sorted[len(sorted)-1]
	}
	f := at - float64(i)
	return sorted[i] + float64(f*(sorted[i+1]-sorted[i]))
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
	work := slices.Clone(v)
	out := make([][]scoring.Value, n)
	var buf [16]scoring.Value
	for t := range n {
		for _, d := range drawn {
			work[d.Slot] = scoring.Num(d.Values[t])
		}
		for _, i := range hot {
			work[len(g.leaves)+i] = g.eval(i, work, buf[:0])
		}
		row := make([]scoring.Value, len(want))
		for i, s := range want {
			row[i] = work[s]
		}
		out[t] = row
	}
	return out
}
