package weigh

import (
	"fmt"
	"math/rand/v2"
	"testing"
)

// Under any weights, with zeros and ties among them, a board gives the scores, places and tiers of Order.
func TestBoardIsOrder(t *testing.T) {
	r := rand.New(rand.NewPCG(7, 7))
	for _, uniform := range []bool{false, true} {
		in := benchInput(300, uniform)
		for i := 0; i < 40; i++ { // ties, and places within one step of the tie grid where one dominates
			in.Items[i+100].Values = in.Items[i].Values
			near := append([]Part(nil), in.Items[i].Values...)
			for k := range near {
				if near[k].Known && near[k].Mid < near[k].High {
					near[k].Mid = min(near[k].Mid+1e-12, near[k].High)
				}
			}
			in.Items[i+200].Values = near
		}
		b, err := NewBoard(in.Keys, in.Items)
		if err != nil {
			t.Fatal(err)
		}
		var s Standing
		for range 20 {
			raw := make([]float64, len(in.Keys))
			for k := range raw {
				if r.IntN(3) > 0 {
					raw[k] = float64(r.IntN(101))
				}
				in.Keys[k].RawWeight = raw[k]
			}
			raw[0]++
			in.Keys[0].RawWeight++
			want, err := Order(in)
			if err != nil {
				t.Fatal(err)
			}
			if err := b.Weigh(raw, &s); err != nil {
				t.Fatal(err)
			}
			for p, l := range want.Lines {
				i := s.Order[p]
				if i != l.Item || s.Place[i] != l.Place || s.Tier[i] != l.Tier || s.Score[i] != l.Score || s.Low[i] != l.ScoreLow || s.High[i] != l.ScoreHigh {
					t.Fatalf("place %d: item %d tier %d score %v (%v to %v), want item %d tier %d score %v (%v to %v)", p+1, i, s.Tier[i], s.Score[i], s.Low[i], s.High[i], l.Item, l.Tier, l.Score, l.ScoreLow, l.ScoreHigh)
				}
				for k, part := range want.Parts(l) {
					low, mid, high := b.Share(&s, i, k)
					if low != part.ShareLow || mid != part.Share || high != part.ShareHigh {
						t.Fatalf("item %d key %d: share %v %v %v, want %v %v %v", i, k, low, mid, high, part.ShareLow, part.Share, part.ShareHigh)
					}
				}
			}
		}
	}
}

func TestBoardRefuses(t *testing.T) {
	in := benchInput(3, true)
	b, err := NewBoard(in.Keys, in.Items)
	if err != nil {
		t.Fatal(err)
	}
	var s Standing
	if b.Weigh(make([]float64, len(in.Keys)), &s) == nil {
		t.Error("weights that are all 0 were taken")
	}
	if b.Weigh([]float64{1}, &s) == nil {
		t.Error("too few weights were taken")
	}
}

func BenchmarkBoard(b *testing.B) {
	for _, n := range []int{1_000, 10_000, 100_000} {
		in := benchInput(n, false)
		board, err := NewBoard(in.Keys, in.Items)
		if err != nil {
			b.Fatal(err)
		}
		raw := make([]float64, len(in.Keys))
		for k := range raw {
			raw[k] = in.Keys[k].RawWeight
		}
		var s Standing
		b.Run(fmt.Sprint(n), func(b *testing.B) {
			x := 0.0
			for b.Loop() {
				x += 0.37
				raw[0] = 10 + float64(int(x)%90)
				if err := board.Weigh(raw, &s); err != nil {
					b.Fatal(err)
				}
			}
		})
	}
}
