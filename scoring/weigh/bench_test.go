package weigh

import (
	"fmt"
	"math/rand/v2"
	"testing"
)

// benchInput has 20 keys. The uniform kind has independent point values: the hardest for dominance and
// first places. The usual kind has a common factor, intervals and some unknown parts.
func benchInput(n int, uniform bool) Input {
	r := rand.New(rand.NewPCG(1, uint64(n)))
	in := Input{Seed: 5}
	for k := range 20 {
		in.Keys = append(in.Keys, Key{fmt.Sprintf("k%02d", k), []string{"energy", "land", "grid", "neighbours"}[k%4], 10 + 90*r.Float64()})
	}
	for i := range n {
		it := Item{ID: fmt.Sprintf("M-%06d", i), Values: make([]Part, 20)}
		common := r.Float64()
		for k := range it.Values {
			v, width := r.Float64(), 0.0
			if !uniform {
				v, width = (v+common)/2, 0.05*r.Float64()
				if r.IntN(50) == 0 {
					continue
				}
			}
			lo, hi := max(v-width, 0), min(v+width, 1)
			it.Values[k] = Part{Known: true, Low: lo, Mid: lo + (hi-lo)/2, High: hi}
		}
		in.Items = append(in.Items, it)
	}
	return in
}

func BenchmarkOrder(b *testing.B) {
	for _, kind := range []string{"usual", "uniform"} {
		for _, n := range []int{1_000, 10_000, 100_000} {
			in := benchInput(n, kind == "uniform")
			b.Run(fmt.Sprintf("%s/%d", kind, n), func(b *testing.B) {
				for b.Loop() {
					if _, err := Order(in); err != nil {
						b.Fatal(err)
					}
				}
			})
		}
	}
}

func BenchmarkScore(b *testing.B) {
	in := benchInput(100_000, true)
	m, err := newMatrix(&in)
	if err != nil {
		b.Fatal(err)
	}
	var s float64
	for b.Loop() {
		for i := range m.n {
			s += dot(m.w, m.midRow(i))
		}
	}
	if s <= 0 {
		b.Fatal("no score")
	}
}
