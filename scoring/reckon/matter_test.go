package reckon

import (
	"fmt"
	"math"
	"math/rand/v2"
	"slices"
	"testing"

	"groundtally/scoring"
)

func TestRanksShareTheirPlaces(t *testing.T) {
	if got := Ranks([]float64{3, 1, 3, 2, 3}); !slices.Equal(got, []float64{4, 1, 4, 2, 4}) {
		t.Errorf("%v", got)
	}
}

// Against the definition by squared differences of ranks, which holds without ties.
func TestSpearmanWithoutTies(t *testing.T) {
	r := rand.New(rand.NewPCG(1, 2))
	for n := 3; n < 60; n++ {
		x, y := make([]float64, n), make([]float64, n)
		for i := range x {
			x[i], y[i] = r.NormFloat64(), r.NormFloat64()
		}
		rx, ry := Ranks(x), Ranks(y)
		d2 := 0.0
		for i := range rx {
			d2 += (rx[i] - ry[i]) * (rx[i] - ry[i])
		}
		want := 1 - 6*d2/float64(n*(n*n-1))
		if got, ok := Spearman(x, y); !ok || math.Abs(got-want) > 1e-12 {
			t.Fatalf("n %d: %v, want %v", n, got, want)
		}
	}
}

// Against mid-ranks counted pair by pair and the correlation written out, with many ties.
func TestSpearmanWithTies(t *testing.T) {
	r := rand.New(rand.NewPCG(3, 4))
	rank := func(x []float64, i int) float64 {
		less, same := 0, 0
		for _, v := range x {
			if v < x[i] {
				less++
			} else if v == x[i] {
				same++
			}
		}
		return float64(less) + float64(same+1)/2
	}
	for range 300 {
		n := 3 + r.IntN(40)
		x, y := make([]float64, n), make([]float64, n)
		for i := range x {
			x[i], y[i] = float64(r.IntN(5)), float64(r.IntN(5))
		}
		var sx, sy, sxx, syy, sxy float64
		for i := range x {
			a, b := rank(x, i), rank(y, i)
			sx, sy, sxx, syy, sxy = sx+a, sy+b, sxx+a*a, syy+b*b, sxy+a*b
		}
		N := float64(n)
		vx, vy := N*sxx-sx*sx, N*syy-sy*sy
		got, ok := Spearman(x, y)
		if ok != (vx > 0 && vy > 0) {
			t.Fatalf("known %v with variances %v, %v", ok, vx, vy)
		}
		if want := (N*sxy - sx*sy) / math.Sqrt(vx*vy); ok && math.Abs(got-want) > 1e-9 {
			t.Fatalf("%v, want %v", got, want)
		}
	}
}

func TestSpearmanLooksAtTheOrderAlone(t *testing.T) {
	r := rand.New(rand.NewPCG(5, 6))
	x := make([]float64, 500)
	up, down := make([]float64, 500), make([]float64, 500)
	for i := range x {
		x[i] = r.NormFloat64()
		up[i], down[i] = math.Exp(x[i]), -math.Pow(x[i], 3)
	}
	if rho, ok := Spearman(x, up); !ok || rho != 1 {
		t.Errorf("rising: %v", rho)
	}
	if rho, ok := Spearman(x, down); !ok || rho != -1 {
		t.Errorf("falling: %v", rho)
	}
	for name, y := range map[string][]float64{"still": make([]float64, 500), "short": x[:2], "no number": append(slices.Clone(x[:499]), math.NaN())} {
		if _, ok := Spearman(x[:len(y)], y); ok {
			t.Errorf("%s: a correlation was given", name)
		}
	}
}

func TestInfluences(t *testing.T) {
	r := rand.New(rand.NewPCG(7, 8))
	const n = 4000
	groups := []GroupDraw{{"steel", nil}, {"life", nil}, {"idle", nil}, {"still", make([]float64, n)}}
	for k := range 3 {
		for range n {
			groups[k].Values = append(groups[k].Values, r.Float64())
		}
	}
	result := make([]scoring.Value, n)
	for i := range result {
		result[i] = scoring.Num(3*groups[1].Values[i] - groups[0].Values[i])
		if i%10 == 0 {
			result[i] = scoring.NeverValue()
		}
	}
	out, used, err := Influences(groups, result)
	if err != nil || used != 3600 || len(out) != 4 {
		t.Fatalf("%+v, %d, %v", out, used, err)
	}
	if out[0].Group != "life" || out[1].Group != "steel" || out[2].Group != "idle" || out[3].Group != "still" || out[3].Known || !out[2].Known {
		t.Errorf("order %+v", out)
	}
	if !(out[0].Rho > 0.9) || !(out[1].Rho < -0.2) || !(math.Abs(out[2].Rho) < 0.06) {
		t.Errorf("%+v", out)
	}
	if _, _, err := Influences([]GroupDraw{{"x", []float64{1}}}, result); err == nil {
		t.Error("draws of another length were taken")
	}
	if out, used, err = Influences(groups[:1], make([]scoring.Value, n)); err != nil || used != n || out[0].Known {
		t.Errorf("a result that stands still: %+v, %v", out, err)
	}
	for i := range result {
		result[i] = scoring.UnknownBecause("no_layer:soil")
	}
	if out, used, err = Influences(groups[:1], result); err != nil || used != 0 || out[0].Known {
		t.Errorf("an unknown result: %+v, %d, %v", out, used, err)
	}
}

func TestBeats(t *testing.T) {
	num, never, none, unknown := scoring.Num, scoring.NeverValue(), scoring.NoneBecause("no rotor"), scoring.UnknownBecause("x")
	a := []scoring.Value{num(1), num(2), num(3), num(4), never, num(1), none, unknown, never, none}
	b := []scoring.Value{num(2), num(2), num(1), num(5), num(9), never, num(0), num(1), never, none}
	d, err := Beats(a, b, true)
	// Wins: 3 over 1, a number over never, none over a number; equal: 2 and 2, two nevers, two nones.
	if err != nil || d != (Duel{Beats: (3 + 1.5) / 9, Equal: 3, Used: 9, Left: 1, Known: true}) {
		t.Errorf("%+v, %v", d, err)
	}
	if d, err = Beats(a, b, false); err != nil || d.Beats != (4+1.5)/9 { // 1 under 2, 4 under 5, and the two states
		t.Errorf("less is better: %+v, %v", d, err)
	}
	back, err := Beats(b, a, true)
	if err != nil || math.Abs(back.Beats-(1-4.5/9)) > 1e-15 {
		t.Errorf("the other way round: %+v, %v", back, err)
	}
	if d, err = Beats([]scoring.Value{unknown}, []scoring.Value{num(1)}, true); err != nil || d.Known || d.Left != 1 {
		t.Errorf("nothing to compare: %+v, %v", d, err)
	}
	if _, err = Beats(a, b[:3], true); err == nil {
		t.Error("other trials were taken")
	}
}

// Two normal results with a shared error: the share is Φ of the difference over the spread of what is not shared.
func TestBeatsUsesThePairs(t *testing.T) {
	r := rand.New(rand.NewPCG(9, 10))
	const n = 100000
	a, b := make([]scoring.Value, n), make([]scoring.Value, n)
	for i := range a {
		shared := 50 * r.NormFloat64()
		a[i], b[i] = scoring.Num(1+shared+r.NormFloat64()), scoring.Num(shared+r.NormFloat64())
	}
	d, err := Beats(a, b, true)
	want := math.Erfc(-1/math.Sqrt2/math.Sqrt2) / 2
	if err != nil || math.Abs(d.Beats-want) > 4*math.Sqrt(want*(1-want)/n) {
		t.Errorf("%v, want %v", d.Beats, want)
	}
}

// BenchmarkInfluences ranks 30 groups by 4,000 trials; ten times the trials must not take much more than ten times.
func BenchmarkInfluences(b *testing.B) {
	for _, n := range []int{4000, 40000} {
		b.Run(fmt.Sprint(n), func(b *testing.B) {
			r := rand.New(rand.NewPCG(1, 1))
			groups := make([]GroupDraw, 30)
			for k := range groups {
				groups[k].Group = fmt.Sprint(k)
				for range n {
					groups[k].Values = append(groups[k].Values, r.Float64())
				}
			}
			result := make([]scoring.Value, n)
			for i := range result {
				result[i] = scoring.Num(groups[0].Values[i] + r.Float64())
			}
			for b.Loop() {
				if _, _, err := Influences(groups, result); err != nil {
					b.Fatal(err)
				}
			}
		})
	}
}

func BenchmarkBeats(b *testing.B) {
	r := rand.New(rand.NewPCG(1, 1))
	x, y := make([]scoring.Value, 4000), make([]scoring.Value, 4000)
	for i := range x {
		x[i], y[i] = scoring.Num(r.Float64()), scoring.Num(r.Float64())
	}
	for b.Loop() {
		if _, err := Beats(x, y, true); err != nil {
			b.Fatal(err)
		}
	}
}
