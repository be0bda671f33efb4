package weigh

import (
	"fmt"
	"math"
	"math/rand/v2"
	"reflect"
	"slices"
	"testing"
)

// randomInput makes items with coarse and fine values, wide and narrow intervals, duplicates, unknown
// parts and weights of very different size, so that ties and dominance occur.
func randomInput(r *rand.Rand, n, d int, unknowns bool) Input {
	in := Input{Seed: r.Uint64(), Mixes: 40}
	for k := range d {
		u := []float64{0, 1e-10, 1, 50, 100 * r.Float64()}[r.IntN(5)]
		if k == 0 {
			u = 20
		}
		in.Keys = append(in.Keys, Key{fmt.Sprintf("k%02d", k), []string{"energy", "land", "grid"}[k%3], u})
	}
	coarse := r.IntN(2) == 0
	for i := range n {
		it := Item{ID: fmt.Sprintf("s%03d", (i+n/2)%n)}
		for range d {
			v := r.Float64()
			if coarse {
				v = float64(r.IntN(4)) / 3
			}
			width := r.Float64() * 0.1 * float64(r.IntN(2))
			lo, hi := max(v-width, 0), min(v+width, 1)
			it.Values = append(it.Values, Part{Known: true, Low: lo, Mid: lo + (hi-lo)/2, High: hi, OverLimit: r.IntN(20) == 0, OutsideAnchor: r.IntN(20) == 0})
		}
		if unknowns && r.IntN(4) == 0 {
			it.Values[r.IntN(d)] = Part{}
		}
		if i > 0 && r.IntN(5) == 0 {
			it.Values = slices.Clone(in.Items[r.IntN(i)].Values)
			if r.IntN(2) == 0 { // all but equal: a dominated copy
				k := r.IntN(d)
				p := it.Values[k]
				p.Low, p.Mid = max(p.Low-1e-10, 0), max(p.Mid-1e-10, 0)
				it.Values[k] = p
				if !p.Known {
					it.Values[k] = Part{}
				}
			}
		}
		in.Items = append(in.Items, it)
	}
	return in
}

func mustOrder(t testing.TB, in Input) Result {
	t.Helper()
	r, err := Order(in)
	if err != nil {
		t.Fatal(err)
	}
	return r
}

func eachRandom(t *testing.T, unknowns bool, f func(t *testing.T, r *rand.Rand, in Input)) {
	for seed := range uint64(60) {
		r := rand.New(rand.NewPCG(seed, 7))
		in := randomInput(r, 2+r.IntN(40), 2+r.IntN(6), unknowns)
		f(t, r, in)
		if t.Failed() {
			t.Fatalf("with the random input %d", seed)
		}
	}
}

func TestSharesAddUpExactly(t *testing.T) {
	eachRandom(t, true, func(t *testing.T, _ *rand.Rand, in Input) {
		r := mustOrder(t, in)
		for _, l := range r.Lines {
			var s, lo, hi, acc float64
			for k, p := range r.Parts(l) {
				s += p.Share
				lo += p.ShareLow
				hi += p.ShareHigh
				if !p.Known && (p.Value != 0 || p.Share != p.Weight/2 || p.ShareLow != 0 || p.ShareHigh != p.Weight) {
					t.Errorf("unknown part %+v", p)
				}
				if p.Known != in.Items[l.Item].Values[k].Known || p.Known == slices.Contains(l.Unknown, p.Key) {
					t.Errorf("line %s: part %s and the list of unknown keys disagree", l.ID, p.Key)
				}
			}
			if s != l.Score || lo != l.ScoreLow || hi != l.ScoreHigh {
				t.Errorf("line %s: parts give %v (%v, %v), the line says %v (%v, %v)", l.ID, s, lo, hi, l.Score, l.ScoreLow, l.ScoreHigh)
			}
			if math.Abs(l.Score-(l.ScoreLow+l.ScoreHigh)/2) > 1e-9 {
				t.Errorf("line %s: the score %v is not the middle of %v and %v", l.ID, l.Score, l.ScoreLow, l.ScoreHigh)
			}
			for _, a := range r.Accounts(l) {
				acc += a.Share
			}
			if math.Abs(acc-l.Score) > 1e-12 {
				t.Errorf("line %s: accounts give %v, the score is %v", l.ID, acc, l.Score)
			}
		}
	})
}

func TestDominatedNeverStandsAbove(t *testing.T) {
	found := 0
	eachRandom(t, true, func(t *testing.T, _ *rand.Rand, in Input) {
		r := mustOrder(t, in)
		for p, a := range r.Lines {
			dominators := []string{}
			known := true
			for q, b := range r.Lines {
				all, better, sure, surer := true, false, true, false
				for k, key := range r.Keys {
					va, vb := in.Items[a.Item].Values[k], in.Items[b.Item].Values[k]
					if key.Weight == 0 {
						continue
					}
					known = known && va.Known
					all = all && va.Known && vb.Known && vb.Mid >= va.Mid
					better = better || vb.Mid > va.Mid
					sure, surer = sure && vb.Low >= va.High, surer || vb.Low > va.High
				}
				if !all || !better {
					continue
				}
				found++
				dominators = append(dominators, b.ID)
				if q > p {
					t.Errorf("%s at place %d stands above its dominator %s at %d", a.ID, p+1, b.ID, q+1)
				}
				for _, d := range a.DominatedBy {
					if d.ID == b.ID && d.Sure != (sure && surer) {
						t.Errorf("%s is dominated by %s, sure %v", a.ID, b.ID, d.Sure)
					}
				}
			}
			if known != a.DominanceKnown {
				t.Errorf("%s: dominance known %v, want %v", a.ID, a.DominanceKnown, known)
			}
			var named []string
			for _, d := range a.DominatedBy {
				named = append(named, d.ID)
			}
			if !slices.Equal(named, dominators[:min(len(dominators), DefaultMaxDominators)]) {
				t.Errorf("%s is dominated by %v, the line says %v", a.ID, dominators, named)
			}
		}
	})
	if found < 100 {
		t.Fatalf("only %d dominated pairs were tried", found)
	}
}

func TestDominatorsOfManyAgreeWithFront(t *testing.T) {
	for _, d := range []int{2, 4, 9} {
		in := benchInput(1500, d == 2)
		for i := range in.Items {
			in.Items[i].Values = in.Items[i].Values[:d]
			for k := range d {
				// Few different values, so that equal ones reach across the blocks of the search.
				v := math.Round(in.Items[i].Values[k].Mid*20) / 20
				in.Items[i].Values[k] = Part{Known: true, Low: v, Mid: v, High: v}
			}
		}
		in.Keys = in.Keys[:d]
		r := mustOrder(t, in)
		values := make([]float64, 0, 1500*d)
		for _, it := range in.Items {
			for _, p := range it.Values {
				values = append(values, p.Mid)
			}
		}
		front := must(Front(values, d))
		for _, l := range r.Lines {
			if !l.DominanceKnown || (len(l.DominatedBy) == 0) != slices.Contains(front, l.Item) {
				t.Fatalf("%d keys: %s dominated by %v, on the front %v", d, l.ID, l.DominatedBy, slices.Contains(front, l.Item))
			}
		}
		in.DominancePlaces = 10
		for _, l := range mustOrder(t, in).Lines {
			if l.DominanceKnown != (l.Place <= 10) {
				t.Fatalf("place %d: known %v", l.Place, l.DominanceKnown)
			}
		}
	}
}

func TestDominatedByTooLittleToShow(t *testing.T) {
	// B is dominated by Z by less than a score can show, and would come first by id.
	in := plainInput([][]float64{{0.5, 0.5}, {0.5, 0.5 + 1e-12}, {0.5, 0.5}}, []float64{1, 1})
	in.Items[0].ID, in.Items[1].ID, in.Items[2].ID = "B", "Z", "A"
	r := mustOrder(t, in)
	var ids []string
	for _, l := range r.Lines {
		ids = append(ids, l.ID)
	}
	if !slices.Equal(ids, []string{"Z", "A", "B"}) {
		t.Fatalf("order %v", ids)
	}
}

func TestTiesById(t *testing.T) {
	in := plainInput([][]float64{{1, 0}, {0, 1}, {0.1 + 0.2, 0.7}, {0.5, 0.5}}, []float64{1, 1})
	in.Items[0].ID, in.Items[1].ID, in.Items[2].ID, in.Items[3].ID = "d", "c", "b", "a"
	r := mustOrder(t, in)
	for p, id := range []string{"a", "b", "c", "d"} {
		l := r.Lines[p]
		if l.ID != id || l.Place != p+1 || l.RankBest != 1 || l.RankWorst != 4 || l.Tier != 1 || l.CanBeFirst != Yes {
			t.Errorf("line %+v, want %s", l, id)
		}
	}
}

func TestOtherItemsChangeNothing(t *testing.T) {
	eachRandom(t, true, func(t *testing.T, r *rand.Rand, in Input) {
		all := mustOrder(t, in)
		drop := r.IntN(len(in.Items))
		less := in
		less.Items = slices.Delete(slices.Clone(in.Items), drop, drop+1)
		few := mustOrder(t, less)
		p := 0
		for _, a := range all.Lines {
			if a.Item == drop {
				continue
			}
			b := lineOf(t, few, a.ID)
			if a.Score != b.Score || a.ScoreLow != b.ScoreLow || a.ScoreHigh != b.ScoreHigh {
				t.Errorf("%s: score %v became %v", a.ID, a.Score, b.Score)
			}
			if a.RankBest < b.RankBest || a.RankWorst < b.RankWorst || a.RankBest > b.RankBest+1 || a.RankWorst > b.RankWorst+1 {
				t.Errorf("%s: ranks %d to %d became %d to %d", a.ID, a.RankBest, a.RankWorst, b.RankBest, b.RankWorst)
			}
			if cell(few.Lines[p].Score) != cell(a.Score) {
				t.Errorf("place %d: score %v became %v", p+1, a.Score, few.Lines[p].Score)
			}
			p++
		}
	})
}

func TestItemOrderChangesNothing(t *testing.T) {
	eachRandom(t, true, func(t *testing.T, r *rand.Rand, in Input) {
		a := mustOrder(t, in)
		other := in
		other.Items = slices.Clone(in.Items)
		r.Shuffle(len(other.Items), func(i, j int) { other.Items[i], other.Items[j] = other.Items[j], other.Items[i] })
		b := mustOrder(t, other)
		for p := range a.Lines {
			a.Lines[p].Item, b.Lines[p].Item = 0, 0
		}
		a.items, b.items = nil, nil
		if !reflect.DeepEqual(a, b) {
			t.Errorf("another order of the items gives another result")
		}
	})
}

func TestLimitsAreNeverNettedOff(t *testing.T) {
	eachRandom(t, true, func(t *testing.T, _ *rand.Rand, in Input) {
		a := mustOrder(t, in)
		other := in
		other.Items = nil
		for _, it := range in.Items {
			it.Values = slices.Clone(it.Values)
			for k := range it.Values {
				it.Values[k].OverLimit, it.Values[k].OutsideAnchor = true, true
			}
			other.Items = append(other.Items, it)
		}
		b := mustOrder(t, other)
		for p := range a.Lines {
			over := 0
			for _, v := range in.Items[a.Lines[p].Item].Values {
				if v.OverLimit {
					over++
				}
			}
			if len(a.Lines[p].OverLimit) != over || len(b.Lines[p].OverLimit) != len(in.Keys) || len(b.Lines[p].OutsideAnchor) != len(in.Keys) {
				t.Errorf("line %d: limits %v", p+1, a.Lines[p].OverLimit)
			}
			a.Lines[p].OverLimit, b.Lines[p].OverLimit = nil, nil
			a.Lines[p].OutsideAnchor, b.Lines[p].OutsideAnchor = nil, nil
		}
		a.items, b.items = nil, nil
		if !reflect.DeepEqual(a, b) {
			t.Error("flags changed the order")
		}
	})
}

func TestRanksAndTiersAgreeWithIntervals(t *testing.T) {
	eachRandom(t, true, func(t *testing.T, _ *rand.Rand, in Input) {
		r := mustOrder(t, in)
		firstOfTier := map[int]Line{}
		for p, l := range r.Lines {
			best, worst := 1, 1
			for _, o := range r.Lines {
				if o.ID == l.ID {
					continue
				}
				if cell(o.ScoreLow) > cell(l.ScoreHigh) {
					best++
				}
				if cell(o.ScoreHigh) >= cell(l.ScoreLow) {
					worst++
				}
			}
			if l.RankBest != best || l.RankWorst != worst || l.Place < best || l.Place > worst {
				t.Errorf("%s at place %d: ranks %d to %d, want %d to %d", l.ID, l.Place, l.RankBest, l.RankWorst, best, worst)
			}
			if p > 0 && l.Tier != r.Lines[p-1].Tier && l.Tier != r.Lines[p-1].Tier+1 {
				t.Errorf("tier %d follows tier %d", l.Tier, r.Lines[p-1].Tier)
			}
			if _, ok := firstOfTier[l.Tier]; !ok {
				firstOfTier[l.Tier] = l
				if p > 0 && cell(l.ScoreHigh) >= cell(firstOfTier[l.Tier-1].ScoreLow) {
					t.Errorf("%s opens tier %d, yet may reach the first of the tier before", l.ID, l.Tier)
				}
			} else if cell(l.ScoreHigh) < cell(firstOfTier[l.Tier].ScoreLow) {
				t.Errorf("%s is surely below the first of its tier", l.ID)
			}
			earliest := 1
			for cell(l.ScoreHigh) < cell(firstOfTier[earliest].ScoreLow) {
				earliest++
			}
			if l.EarliestTier != earliest {
				t.Errorf("%s: earliest tier %d, want %d", l.ID, l.EarliestTier, earliest)
			}
		}
	})
}

func TestTippingAgreesWithOrdering(t *testing.T) {
	tried := 0
	eachRandom(t, false, func(t *testing.T, _ *rand.Rand, in Input) {
		r := mustOrder(t, in)
		rawSum := 0.0
		for _, k := range in.Keys {
			rawSum += k.RawWeight
		}
		leader := r.Lines[0].ID
		at := func(k int, w float64) (first string, gap float64) {
			other := in
			other.Keys = slices.Clone(in.Keys)
			other.Keys[k].RawWeight = w / (1 - w) * (rawSum - in.Keys[k].RawWeight)
			o := mustOrder(t, other)
			return o.Lines[0].ID, o.Lines[0].Score - lineOf(t, o, leader).Score
		}
		for k, tip := range r.Tipping {
			if tip.From > tip.Weight || tip.To < tip.Weight {
				t.Errorf("%+v", tip)
			}
			if tip.EqualOthers { // no raw weights stand for these
				continue
			}
			for _, w := range []float64{tip.From + 1e-6, tip.To - 1e-6} {
				if w >= tip.From && w <= tip.To && w < 1 {
					if id, gap := at(k, w); gap > 2e-9 {
						t.Errorf("%s at %v: %s leads %s by %v within %v to %v", tip.Key, w, id, leader, gap, tip.From, tip.To)
					}
				}
			}
			for _, c := range []struct {
				*Change
				step float64
			}{{tip.Below, -1e-5}, {tip.Above, 1e-5}} {
				if c.Change == nil {
					continue
				}
				w := c.At + c.step
				if w <= 0 || w >= 1 {
					continue
				}
				tried++
				id, gap := at(k, w)
				if gap <= 0 {
					t.Errorf("%s at %v: %s still leads, want %s", tip.Key, w, id, c.NewFirst)
				}
				// Between the tipping weight and the step another may have taken over, or be level.
				if id != c.NewFirst {
					o := in
					o.Keys = slices.Clone(in.Keys)
					o.Keys[k].RawWeight = w / (1 - w) * (rawSum - in.Keys[k].RawWeight)
					res := mustOrder(t, o)
					if res.Lines[0].Score-lineOf(t, res, c.NewFirst).Score > 2e-5 {
						t.Errorf("%s at %v: %s leads, want %s", tip.Key, w, id, c.NewFirst)
					}
				}
				if c.HasRaw {
					got := c.Raw / (c.Raw + rawSum - in.Keys[k].RawWeight)
					if math.Abs(got-c.At) > 1e-9 {
						t.Errorf("raw weight %v is the weight %v, want %v", c.Raw, got, c.At)
					}
				}
			}
		}
	})
	if tried < 50 {
		t.Fatalf("only %d tipping weights were tried", tried)
	}
}

func TestLeadersAgreeWithScores(t *testing.T) {
	for seed := range uint64(40) {
		r := rand.New(rand.NewPCG(seed, 3))
		n, d := 1+r.IntN(30), 2+r.IntN(5)
		v, w := make([]float64, n*d), make([]float64, d)
		for i := range v {
			v[i] = float64(r.IntN(6)) / 5
		}
		for k := range w {
			w[k] = r.Float64() + 0.01
		}
		w, err := Swing(w)
		if err != nil {
			t.Fatal(err)
		}
		k := r.IntN(d)
		leads, err := Leaders(w, v, k)
		if err != nil {
			t.Fatal(err)
		}
		end := 0.0
		for _, l := range leads {
			if l.From != end || l.To <= l.From {
				t.Fatalf("stretches %v do not join", leads)
			}
			end = l.To
			x := (l.From + l.To) / 2
			score := func(i int) float64 {
				a, b := lineEnds(w, v[i*d:i*d+d], k, false)
				return x*b + (1-x)*a
			}
			for i := range n {
				if score(i) > score(l.Row)+1e-12 {
					t.Fatalf("row %d leads at %v, not row %d", i, x, l.Row)
				}
			}
		}
		if end != 1 {
			t.Fatalf("stretches %v end early", leads)
		}
	}
}

// firstUnder reports whether an item at its best is first under u, all others at their worst.
func firstUnder(in Input, u []float64, id string) bool {
	score := func(it Item, best bool) float64 {
		s := 0.0
		for k, p := range it.Values {
			lo, _, hi := bounds(p)
			if best {
				lo = hi
			}
			s += u[k] * lo
		}
		return s
	}
	var own float64
	for _, it := range in.Items {
		if it.ID == id {
			own = score(it, true)
		}
	}
	for _, it := range in.Items {
		if it.ID != id && score(it, false) > own+1e-9 {
			return false
		}
	}
	return true
}

func TestCanBeFirst(t *testing.T) {
	proofs := map[Proof]int{}
	eachRandom(t, true, func(t *testing.T, r *rand.Rand, in Input) {
		in.MixSpread = []float64{0.1, 0.5, 0.9}[r.IntN(3)]
		in.Mixes = 1 // leave the work to the programs
		res := mustOrder(t, in)
		w := make([]float64, len(res.Keys))
		for k := range w {
			w[k] = res.Keys[k].Weight
		}
		for _, l := range res.Lines {
			proofs[l.Proof]++
			switch l.CanBeFirst {
			case Yes:
				if !firstUnder(in, l.Witness, l.ID) {
					t.Errorf("%s is not first under its witness %v (%s)", l.ID, l.Witness, l.Proof)
				}
				// Some common factor must bring every weight into its range.
				lo, hi := 0.0, math.Inf(1)
				for k, u := range l.Witness {
					if u > 0 {
						lo, hi = max(lo, w[k]*(1-in.MixSpread)/u), min(hi, w[k]*(1+in.MixSpread)/u)
					} else if w[k] > 0 {
						t.Errorf("%s: the witness drops key %d", l.ID, k)
					}
				}
				if lo > hi*(1+1e-9) {
					t.Errorf("%s: the witness %v lies outside the spread", l.ID, l.Witness)
				}
			case No:
				for mix := range 300 {
					if firstUnder(in, MixWeights(w, in.MixSpread, 99, mix), l.ID) {
						t.Errorf("%s is said never to be first (%s), but is in mix %d", l.ID, l.Proof, mix)
						break
					}
				}
			default:
				t.Errorf("%s: no answer", l.ID)
			}
		}
	})
	for _, p := range []Proof{OwnWeights, Witness, Beaten, Mixture} {
		if proofs[p] == 0 {
			t.Errorf("no item was decided by %q: %v", p, proofs)
		}
	}
}

func TestUnsupportedIsNeverFirst(t *testing.T) {
	// C is dominated by neither A nor B, but by their mixture under any weights.
	in := plainInput([][]float64{{1, 0}, {0, 1}, {0.45, 0.45}}, []float64{1, 1})
	in.MixSpread = 0.9
	r := mustOrder(t, in)
	l := lineOf(t, r, "C")
	if l.CanBeFirst != No || l.Proof != Mixture || len(l.DominatedBy) != 0 {
		t.Fatalf("%+v", l)
	}
	// Without programs the answer is open, and says so.
	in.MaxPrograms = 1
	in.Items = append(in.Items, Item{ID: "D", Values: in.Items[2].Values})
	r = mustOrder(t, in)
	if r.Programs != 1 || lineOf(t, r, "C").CanBeFirst != No || lineOf(t, r, "D").CanBeFirst != Unknown {
		t.Fatalf("%+v", r.Lines)
	}
}

func TestMixes(t *testing.T) {
	// A leads B exactly when w1 > w2: by symmetry in half of the mixes.
	in := plainInput([][]float64{{1, 0}, {0, 1}, {0, 0}}, []float64{1, 1})
	in.Mixes = 20000
	r := mustOrder(t, in)
	a, b := lineOf(t, r, "A"), lineOf(t, r, "B")
	if a.FirstIn+b.FirstIn != in.Mixes || math.Abs(r.FirstInHundred(a)-50) > 1.5 {
		t.Errorf("first in %d and %d of %d", a.FirstIn, b.FirstIn, in.Mixes)
	}
	// With w1 = 0.55 and factors from 0.9 to 1.1, B leads when 0.55 x < 0.45 y: never, since
	// 0.55 * 0.9 = 0.45 * 1.1 is the corner itself.
	in.Keys[0].RawWeight, in.Keys[1].RawWeight, in.MixSpread = 55, 45, 0.1
	if r = mustOrder(t, in); lineOf(t, r, "A").FirstIn != in.Mixes {
		t.Errorf("A first in %d", lineOf(t, r, "A").FirstIn)
	}
	// An unknown part is drawn from 0 to 1: B beats A's 0.3 with the chance 0.7.
	one := plainInput([][]float64{{0.3}, {math.NaN()}}, []float64{1})
	one.Mixes = 20000
	if r = mustOrder(t, one); math.Abs(r.FirstInHundred(lineOf(t, r, "B"))-70) > 1.5 {
		t.Errorf("the unknown item is first in %v of 100", r.FirstInHundred(lineOf(t, r, "B")))
	}
	for k, f := range MixWeights([]float64{0.5, 0.3, 0.2}, 0.2, 4, 9) {
		if w := []float64{0.5, 0.3, 0.2}[k]; f < w*0.8/1.2 || f > w*1.2/0.8 {
			t.Errorf("weight %v of key %d leaves the spread", f, k)
		}
	}
}

func TestMixDrawsAreUniform(t *testing.T) {
	const n = 20000
	var mean, square, lag, prev float64
	for mix := range n {
		x := mixRaw([]float64{1}, 1, 5, mix)[0] - 1
		mean += x / n
		square += x * x / n
		lag += x * prev / n
		prev = x
	}
	// A uniform draw from -1 to 1 has mean 0 and mean square 1/3; neighbours are independent.
	if math.Abs(mean) > 0.02 || math.Abs(square-1.0/3) > 0.01 || math.Abs(lag) > 0.01 {
		t.Fatalf("mean %v, square %v, with its neighbour %v", mean, square, lag)
	}
}

func TestTrialsTakePart(t *testing.T) {
	in := plainInput([][]float64{{0.5}, {0.6}}, []float64{1})
	in.Mixes = 100
	in.Trials = &Trials{Count: 4, Items: []int{0}, Row: func(trial, item int, out []float64) error {
		out[0] = []float64{0.1, 0.7, 0.2, 0.3}[trial]
		return nil
	}}
	r := mustOrder(t, in)
	if a := lineOf(t, r, "A"); a.FirstIn != 25 || a.CanBeFirst != Yes || a.Proof != Mix {
		t.Errorf("%+v", a)
	}
	if b := lineOf(t, r, "B"); b.FirstIn != 75 || b.Place != 1 {
		t.Errorf("%+v", b)
	}
	in.Trials.Row = func(_, _ int, out []float64) error { out[0] = math.NaN(); return nil }
	if _, err := Order(in); err == nil {
		t.Error("NaN from a trial was accepted")
	}
	in.Trials.Row = func(_, _ int, out []float64) error { return ErrNoInverse }
	if _, err := Order(in); err == nil {
		t.Error("the error of a trial was lost")
	}
	in.Trials.Items = []int{0, 0}
	if _, err := Order(in); err == nil {
		t.Error("an item named twice was accepted")
	}
}

func TestContendersLeaveNoFirstOut(t *testing.T) {
	eachRandom(t, true, func(t *testing.T, _ *rand.Rand, in Input) {
		c, err := Contenders(in)
		if err != nil {
			t.Fatal(err)
		}
		for _, l := range mustOrder(t, in).Lines {
			if l.CanBeFirst == Yes && !slices.Contains(c, l.Item) {
				t.Errorf("%s can be first, but is no contender", l.ID)
			}
		}
	})
}

func TestAlerts(t *testing.T) {
	in := plainInput([][]float64{{1, 0.05}, {0.1, 0.2}, {0.05, 0}}, []float64{9, 0})
	in.AlertPlaces = 2
	r := mustOrder(t, in)
	for id, want := range map[string][]string{"A": {"k2"}, "B": nil, "C": nil} {
		if got := lineOf(t, r, id).Alerts; !slices.Equal(got, want) {
			t.Errorf("%s: alerts %v, want %v", id, got, want)
		}
	}
}

func TestClosest(t *testing.T) {
	r := mustOrder(t, plainInput([][]float64{{.9, .3, .5}, {.5, .8, .6}, {.2, .9, .9}}, []float64{.5, .3, .2}))
	if r.Closest == nil || r.Closest.ID != "B" || math.Abs(r.Closest.Factor-1.084652) > 1e-6 {
		t.Errorf("%+v", r.Closest)
	}
	if r = mustOrder(t, plainInput([][]float64{{.9, .3}, {.5, .3}}, []float64{1, 1})); r.Closest != nil {
		t.Errorf("a dominated rival cannot come level: %+v", r.Closest)
	}
}

func TestOrderEnds(t *testing.T) {
	if r := mustOrder(t, Input{Keys: []Key{{"a", "x", 1}}}); len(r.Lines) != 0 || len(r.Tipping) != 1 {
		t.Errorf("%+v", r)
	}
	one := plainInput([][]float64{{0.4, 0.2}}, []float64{1, 0})
	r := mustOrder(t, one)
	if l := r.Lines[0]; l.CanBeFirst != Yes || l.FirstIn != r.Mixes || l.Tier != 1 || l.RankWorst != 1 {
		t.Errorf("%+v", l)
	}
	two := mustOrder(t, plainInput([][]float64{{0.4, 0.2}, {0.3, 0.9}}, []float64{1, 0}))
	if tip := two.Tipping[0]; !tip.EqualOthers || tip.Below == nil || tip.Below.HasRaw || math.Abs(tip.From-0.7/0.8) > 1e-12 {
		t.Errorf("%+v", tip)
	}
}

func TestOrderRefuses(t *testing.T) {
	good := func() Input { return plainInput([][]float64{{0.4, 0.2}, {0.3, 0.9}}, []float64{1, 1}) }
	for name, spoil := range map[string]func(*Input){
		"no key":          func(in *Input) { in.Keys = nil },
		"key twice":       func(in *Input) { in.Keys[1].Name = in.Keys[0].Name },
		"no weight":       func(in *Input) { in.Keys[0].RawWeight, in.Keys[1].RawWeight = 0, 0 },
		"negative weight": func(in *Input) { in.Keys[0].RawWeight = -1 },
		"NaN weight":      func(in *Input) { in.Keys[0].RawWeight = math.NaN() },
		"no id":           func(in *Input) { in.Items[0].ID = "" },
		"id twice":        func(in *Input) { in.Items[0].ID = "B" },
		"short row":       func(in *Input) { in.Items[0].Values = in.Items[0].Values[:1] },
		"NaN value":       func(in *Input) { in.Items[0].Values[0].Mid = math.NaN() },
		"falling values":  func(in *Input) { in.Items[0].Values[0].Low = 0.5 },
		"value above 1":   func(in *Input) { in.Items[0].Values[0].High = 1.5 },
		"unknown value":   func(in *Input) { in.Items[0].Values[0].Known = false },
		"negative mixes":  func(in *Input) { in.Mixes = -1 },
		"wide spread":     func(in *Input) { in.MixSpread = 1 },
		"empty trials":    func(in *Input) { in.Trials = &Trials{} },
	} {
		in := good()
		spoil(&in)
		if _, err := Order(in); err == nil {
			t.Errorf("%s: accepted", name)
		}
	}
	if _, err := Order(good()); err != nil {
		t.Fatal(err)
	}
}
