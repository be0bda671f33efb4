package weigh

import (
	"errors"
	"math"
	"math/rand/v2"
	"slices"
	"testing"
)

func must[T any](v T, err error) T {
	if err != nil {
		panic(err)
	}
	return v
}

func TestCurves(t *testing.T) {
	pw := must(NewPiecewise([]float64{0, 10, 20, 40}, []float64{0, 0.5, 0.5, 1}))
	down := must(NewPiecewise([]float64{40, 10, 0}, []float64{0, 0.9, 1}))
	exp := must(NewExponential(0, 10, 2))
	for _, c := range []struct {
		name    string
		curve   Curve
		x, v    float64
		outside bool
	}{
		{"linear", must(NewLinear(2, 4)), 2.5, 0.25, false},
		{"linear at its anchor", must(NewLinear(2, 4)), 4, 1, false},
		{"linear above", must(NewLinear(2, 4)), 5, 1, true},
		{"linear below", must(NewLinear(2, 4)), 1, 0, true},
		{"falling", must(NewLinear(15, 1)), 8, 0.5, false},
		{"falling above", must(NewLinear(15, 1)), 16, 0, true},
		{"falling below", must(NewLinear(15, 1)), 0, 1, true},
		{"piecewise", pw, 5, 0.25, false},
		{"piecewise at a knot", pw, 20, 0.5, false},
		{"piecewise at its end", pw, 40, 1, false},
		{"piecewise above", pw, 41, 1, true},
		{"piecewise below", pw, -1, 0, true},
		{"falling piecewise", down, 25, 0.45, false},
		{"falling piecewise above", down, 50, 0, true},
		{"falling piecewise below", down, -1, 1, true},
		{"threshold below", must(NewThreshold(3, true)), 2.9, 0, false},
		{"threshold at", must(NewThreshold(3, true)), 3, 1, false},
		{"falling threshold", must(NewThreshold(3, false)), 3, 1, false},
		{"falling threshold above", must(NewThreshold(3, false)), 3.1, 0, false},
		{"exponential", exp, 5, 1 / (1 + math.Exp(-1)), false}, // (1-e^-1)/(1-e^-2)
		{"exponential end", exp, 10, 1, false},
		{"exponential of no bend", must(NewExponential(10, 0, 0)), 2.5, 0.75, false},
		{"hill up", must(NewHill(0, 10, 20, 40)), 5, 0.5, false},
		{"hill top", must(NewHill(0, 10, 20, 40)), 15, 1, false},
		{"hill down", must(NewHill(0, 10, 20, 40)), 30, 0.5, false},
		{"hill outside", must(NewHill(0, 10, 20, 40)), 41, 0, true},
	} {
		v, outside, err := c.curve.Value(c.x)
		if err != nil || math.Abs(v-c.v) > 1e-15 || outside != c.outside {
			t.Errorf("%s: v(%v) = %v, outside %v, %v; want %v, %v", c.name, c.x, v, outside, err, c.v, c.outside)
		}
		for _, x := range []float64{math.NaN(), math.Inf(1)} {
			if _, _, err := c.curve.Value(x); err == nil {
				t.Errorf("%s: %v was accepted", c.name, x)
			}
		}
	}
}

func TestCurvesInvertExactly(t *testing.T) {
	for name, c := range map[string]Curve{
		"linear":      must(NewLinear(3, 17)),
		"falling":     must(NewLinear(17, -3)),
		"piecewise":   must(NewPiecewise([]float64{1, 2, 10, 11}, []float64{0, 0.1, 0.8, 1})),
		"falling pw":  must(NewPiecewise([]float64{11, 10, 2, 1}, []float64{0, 0.1, 0.8, 1})),
		"exponential": must(NewExponential(5, 0, 3)),
		"late":        must(NewExponential(0, 5, -3)),
		"nearly flat": must(NewExponential(0, 5, 1e-9)),
	} {
		last := -1.0
		for i := range 101 {
			v := float64(i) / 100
			lo, hi, err := c.Inverse(v)
			if err != nil || lo != hi {
				t.Fatalf("%s: inverse of %v is %v to %v, %v", name, v, lo, hi, err)
			}
			back, outside, err := c.Value(lo)
			if err != nil || outside || math.Abs(back-v) > 1e-12 || back < last {
				t.Errorf("%s: v(%v) = %v, want %v (outside %v, %v)", name, lo, back, v, outside, err)
			}
			last = back
		}
		for _, v := range []float64{-0.1, 1.1, math.NaN()} {
			if _, _, err := c.Inverse(v); err == nil {
				t.Errorf("%s: the value %v was accepted", name, v)
			}
		}
	}
	flat := must(NewPiecewise([]float64{0, 10, 20, 40}, []float64{0, 0.5, 0.5, 1}))
	if lo, hi, err := flat.Inverse(0.5); err != nil || lo != 10 || hi != 20 {
		t.Errorf("flat: %v to %v, %v", lo, hi, err)
	}
	fall := must(NewPiecewise([]float64{40, 20, 10, 0}, []float64{0, 0.5, 0.5, 1}))
	if lo, hi, err := fall.Inverse(0.5); err != nil || lo != 10 || hi != 20 {
		t.Errorf("falling flat: %v to %v, %v", lo, hi, err)
	}
	for _, c := range []Curve{must(NewThreshold(1, true)), must(NewHill(0, 1, 2, 3))} {
		if _, _, err := c.Inverse(0.5); !errors.Is(err, ErrNoInverse) {
			t.Errorf("%T: got %v", c, err)
		}
	}
}

func TestCurvesRefuse(t *testing.T) {
	for name, err := range map[string]error{
		"equal anchors": second(NewLinear(1, 1)),
		"NaN anchor":    second(NewLinear(1, math.NaN())),
		"one knot":      second(NewPiecewise([]float64{1}, []float64{0})),
		"turning knots": second(NewPiecewise([]float64{0, 2, 1}, []float64{0, .5, 1})),
		"falling value": second(NewPiecewise([]float64{0, 1, 2, 3}, []float64{0, .5, .4, 1})),
		"no full value": second(NewPiecewise([]float64{0, 1}, []float64{0, .9})),
		"strong bend":   second(NewExponential(0, 1, 51)),
		"NaN threshold": second(NewThreshold(math.NaN(), true)),
		"flat hill":     second(NewHill(0, 0, 1, 2)),
		"no label":      second(NewCategorical(nil)),
		"high label":    second(NewCategorical(map[string]float64{"a": 2})),
	} {
		if err == nil {
			t.Errorf("%s: accepted", name)
		}
	}
}

func second[T any](_ T, err error) error { return err }

func TestCategorical(t *testing.T) {
	c := must(NewCategorical(map[string]float64{"poor": 0, "b": 0.5, "a": 0.5, "good": 1}))
	if v, err := c.Value("good"); v != 1 || err != nil {
		t.Errorf("%v, %v", v, err)
	}
	if _, err := c.Value("other"); err == nil {
		t.Error("a label without value was accepted")
	}
	if got := c.Inverse(0.5); !slices.Equal(got, []string{"a", "b"}) {
		t.Errorf("%v", got)
	}
}

func TestPartOf(t *testing.T) {
	fall := must(NewLinear(10, 0))
	p, err := PartOf(fall, -2, 6)
	if want := (Part{Known: true, Low: 0.4, Mid: 0.7, High: 1, OutsideAnchor: true}); err != nil || math.Abs(p.Low-want.Low) > 1e-15 || math.Abs(p.Mid-want.Mid) > 1e-15 || p.High != 1 || !p.OutsideAnchor || !p.Known {
		t.Errorf("%+v, %v; want %+v", p, err, want)
	}
	p, err = CentralPart(fall, 1, 2, 6)
	if err != nil || math.Abs(p.Mid-0.8) > 1e-15 || p.OutsideAnchor {
		t.Errorf("%+v, %v", p, err)
	}
	// The best value of a hill lies inside the range, not at its ends.
	if p, err = PartOf(must(NewHill(0, 10, 10, 20)), 5, 15); err != nil || p.Low != 0.5 || p.High != 1 {
		t.Errorf("%+v, %v", p, err)
	}
	if _, err = PartOf(fall, 6, 2); err == nil {
		t.Error("a range from high to low was accepted")
	}
	if _, err = CentralPart(fall, 1, 7, 6); err == nil {
		t.Error("a central outside its range was accepted")
	}
}

func TestAnchorMovedKeepsDifferences(t *testing.T) {
	// Widen the first key's anchors from 0..10 to 0..25: with u' the score differences keep their ratio.
	x := [][]float64{{2, 0.3}, {7, 0.1}, {5, 0.9}}
	score := func(best, u float64) []float64 {
		c, w := must(NewLinear(0, best)), must(Swing([]float64{u, 40}))
		var s []float64
		for _, r := range x {
			v, _, _ := c.Value(r[0])
			s = append(s, w[0]*v+w[1]*r[1])
		}
		return s
	}
	a, b := score(10, 60), score(25, must(AnchorMoved(60, 10, 25)))
	r1, r2 := (a[0]-a[1])/(b[0]-b[1]), (a[1]-a[2])/(b[1]-b[2])
	if math.Abs(r1-r2) > 1e-12 {
		t.Errorf("differences changed by %v and %v", r1, r2)
	}
}

func TestRanked(t *testing.T) {
	w, err := Ranked(RankOrderCentroid(4), []int{2, 1, 2, 9})
	if err != nil {
		t.Fatal(err)
	}
	for k, want := range []float64{10.0 / 48, 25.0 / 48, 10.0 / 48, 3.0 / 48} {
		if math.Abs(w[k]-want) > 1e-15 {
			t.Errorf("key %d: %v, want %v", k+1, w[k], want)
		}
	}
}

func TestWorstJudgement(t *testing.T) {
	// A consistent matrix but for a13, which should be 4.
	j := must(NewJudgements(4, []float64{2, 9, 8, 2, 4, 2}))
	i, k, given, implied, ok := j.Worst(j.GeometricMean())
	if !ok || i != 0 || k != 2 || given != 9 || implied >= 9 || implied <= 4 {
		t.Errorf("%d %d: %v, implied %v, %v", i, k, given, implied, ok)
	}
	if _, err := NewJudgements(3, []float64{2, 10, 3}); err == nil {
		t.Error("a judgement above 9 was accepted")
	}
	if _, err := GroupGeometric([][]float64{{1, 0}, {1, 1}}, []float64{1, 1}); err == nil {
		t.Error("a zero in a geometric mean was accepted")
	}
}

func TestFrontAgreesWithPairs(t *testing.T) {
	for seed := range uint64(30) {
		r := rand.New(rand.NewPCG(seed, 1))
		n, d := 1+r.IntN(60), 1+r.IntN(4)
		v := make([]float64, n*d)
		for i := range v {
			v[i] = float64(r.IntN(5))
		}
		var want []int
		for i := range n {
			beaten := false
			for j := range n {
				beaten = beaten || Dominates(v[j*d:j*d+d], v[i*d:i*d+d])
			}
			if !beaten {
				want = append(want, i)
			}
		}
		if got := must(Front(v, d)); !slices.Equal(got, want) {
			t.Fatalf("front %v, want %v", got, want)
		}
	}
}

func TestFrontSizeIsAsExpected(t *testing.T) {
	const n, d, rounds = 200, 3, 200
	want := must(ExpectedFront(n, d))
	r := rand.New(rand.NewPCG(2, 2))
	mean := 0.0
	for range rounds {
		v := make([]float64, n*d)
		for i := range v {
			v[i] = r.Float64()
		}
		mean += float64(len(must(Front(v, d)))) / rounds
	}
	if math.Abs(mean-want) > 1 {
		t.Errorf("mean front %v, expected %v", mean, want)
	}
}

func TestBoxBoundsEveryWeight(t *testing.T) {
	r := rand.New(rand.NewPCG(8, 8))
	for range 200 {
		d := 2 + r.IntN(6)
		w := RankReciprocal(d)
		c, l, h := make([]float64, d), make([]float64, d), make([]float64, d)
		for k := range c {
			c[k], l[k], h[k] = r.Float64()*2-1, w[k]*0.5, min(1, w[k]*1.5)
		}
		hi, _, err := BoxMax(l, h, c)
		lo, _, err2 := BoxMin(l, h, c)
		if err != nil || err2 != nil {
			t.Fatal(err, err2)
		}
		for mix := range 20 {
			u := MixWeights(w, 0.2, 1, mix) // stays within a factor of 1.2/0.8 = 1.5
			if s := dot(u, c); s > hi+1e-12 || s < lo-1e-12 {
				t.Fatalf("%v outside %v to %v", s, lo, hi)
			}
		}
	}
	if _, _, err := BoxMax([]float64{0.6, 0.6}, []float64{1, 1}, []float64{1, 2}); err == nil {
		t.Error("a box without weights was accepted")
	}
}

func TestClosestReversalIsClosest(t *testing.T) {
	r := rand.New(rand.NewPCG(4, 4))
	cut := 0
	for range 300 {
		d := 2 + r.IntN(5)
		w, delta := MixWeights(RankReciprocal(d), 0.9, r.Uint64(), 0), make([]float64, d)
		for k := range delta {
			delta[k] = r.Float64()*2 - 1.6
		}
		near, dist, err := ClosestReversal(w, delta)
		if slices.Max(delta) <= 0 {
			if !errors.Is(err, ErrNoReversal) {
				t.Fatalf("got %v", err)
			}
			continue
		}
		if err != nil || math.Abs(sum(near)-1) > 1e-9 || slices.Min(near) < 0 || dot(near, delta) < -1e-9 {
			t.Fatalf("%v: %v", near, err)
		}
		if slices.Contains(near, 0) {
			cut++
		}
		// No other point of the simplex at which B is level or ahead lies nearer.
		for range 50 {
			x := make([]float64, d)
			for k := range x {
				x[k] = -math.Log(1 - r.Float64())
			}
			x = normalised(x)
			for range 40 { // towards w as far as B stays level
				y := make([]float64, d)
				for k := range y {
					y[k] = x[k] + 0.2*(w[k]-x[k])
				}
				if dot(y, delta) < 0 {
					break
				}
				x = y
			}
			s := 0.0
			for k := range x {
				s += (x[k] - w[k]) * (x[k] - w[k])
			}
			if dot(x, delta) >= 0 && math.Sqrt(s) < dist-1e-9 {
				t.Fatalf("%v is nearer to %v than %v", x, w, near)
			}
		}
		mass, after, err := WeightToMove(w, delta, make([]float64, d), slices.Repeat([]float64{1}, d))
		if err != nil {
			t.Fatal(err)
		}
		half := 0.0
		for k := range after {
			half += math.Abs(after[k]-w[k]) / 2
		}
		if math.Abs(half-mass) > 1e-12 || dot(after, delta) < -1e-12 {
			t.Fatalf("moved %v, said %v; lead %v", half, mass, dot(after, delta))
		}
		shift, err := LargestShift(w, delta)
		if err != nil || shift > mass+1e-9 || shift > dist+1e-9 {
			t.Fatalf("shift %v, mass %v, distance %v, %v", shift, mass, dist, err)
		}
	}
	if cut < 10 {
		t.Fatalf("only %d solutions lay on the edge of the simplex", cut)
	}
}

func TestReversalFactorIsSmallest(t *testing.T) {
	r := rand.New(rand.NewPCG(6, 6))
	for range 200 {
		w, delta := MixWeights(RankSum(5), 0.9, r.Uint64(), 0), make([]float64, 5)
		for k := range delta {
			delta[k] = r.Float64()*2 - 1.3
		}
		rho, ok := ReversalFactor(w, delta)
		if !ok || rho < 1 {
			continue
		}
		lead := func(f float64) float64 {
			s := 0.0
			for k := range w {
				if delta[k] > 0 {
					s += w[k] * f * delta[k]
				} else {
					s += w[k] / f * delta[k]
				}
			}
			return s
		}
		if math.Abs(lead(rho)) > 1e-9*rho || lead(rho*0.999) >= 0 {
			t.Fatalf("rho %v: lead %v", rho, lead(rho))
		}
	}
}

func TestRawWeightsAreRefusedWhereWeightsAreMeant(t *testing.T) {
	raw, a, b := []float64{50, 30}, []float64{1, 0}, []float64{0, 1}
	if _, _, err := Contributions(raw, a, b); err == nil {
		t.Error("Contributions took raw weights")
	}
	if _, err := Leaders(raw, a, 0); err == nil {
		t.Error("Leaders took raw weights")
	}
	if _, _, err := ClosestReversal(raw, []float64{-1, 1}); err == nil {
		t.Error("ClosestReversal took raw weights")
	}
}

func TestComparisonOfTwo(t *testing.T) {
	w, a, b := []float64{.5, .3, .2}, []float64{.9, .3, .5}, []float64{.5, .8, .6}
	parts, lead, err := Contributions(w, a, b)
	if err != nil || math.Abs(lead-.03) > 1e-12 {
		t.Fatalf("lead %v, %v", lead, err)
	}
	for i, want := range []Contribution{{0, .2}, {1, -.15}, {2, -.02}} {
		if parts[i].Key != want.Key || math.Abs(parts[i].Amount-want.Amount) > 1e-12 {
			t.Errorf("contribution %d: %+v, want %+v", i, parts[i], want)
		}
	}
	// The stability roots 17/37 and 18/53, seen from B.
	if lo, hi, ok, err := WeightNeeded(w, a, b, 0); !ok || err != nil || lo != 0 || math.Abs(hi-17.0/37) > 1e-12 {
		t.Errorf("%v to %v, %v, %v", lo, hi, ok, err)
	}
	if lo, hi, ok, err := WeightNeeded(w, a, b, 1); !ok || err != nil || math.Abs(lo-18.0/53) > 1e-12 || hi != 1 {
		t.Errorf("%v to %v, %v, %v", lo, hi, ok, err)
	}
	// 0.03 over 0.3 is 0.1 more on key 2; key 3 needs 0.15 more.
	for k, want := range []float64{.56, .9, .75} {
		v, ok, err := ValueNeeded(w, a, b, k)
		if err != nil || !ok || math.Abs(v-want) > 1e-12 {
			t.Errorf("key %d: %v, %v, %v; want %v", k+1, v, ok, err, want)
		}
		changed := slices.Clone(b)
		changed[k] = v
		if _, lead, _ := Contributions(w, a, changed); math.Abs(lead) > 1e-12 {
			t.Errorf("key %d: the lead is still %v", k+1, lead)
		}
	}
	if _, ok, err := ValueNeeded([]float64{.9, .1}, []float64{1, 0}, []float64{0, .5}, 1); ok || err != nil {
		t.Errorf("an impossible value was called possible, %v", err)
	}
	if _, _, ok, err := WeightNeeded(w, a, []float64{.8, .2, .4}, 0); ok || err != nil {
		t.Errorf("weights for a dominated item, %v", err)
	}
	if lead, ok, err := ReachableWithin(w, []float64{.85, .3, .5}, []float64{.5, .85, .6}); !ok || err != nil || math.Abs(lead-.01) > 1e-12 {
		t.Errorf("%v, %v, %v", lead, ok, err)
	}
	// Giving up 0.2 on a key of weight 0.3 is made up by 0.12 on one of weight 0.5.
	if v, ok, err := EvenSwap(.3, .8, .6, .5, .5); err != nil || !ok || math.Abs(v-.62) > 1e-12 {
		t.Errorf("%v, %v, %v", v, ok, err)
	}
}
