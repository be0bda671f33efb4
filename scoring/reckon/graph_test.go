package reckon

import (
	"math/rand/v2"
	"slices"
	"testing"

	"groundtally/scoring"
)

func quantity(name string, inputs []string, f func(x []float64) float64) scoring.Quantity {
	return scoring.Quantity{Name: name, Unit: "1", Formula: name, Source: "identity", Inputs: inputs, Eval: scoring.Plain(f)}
}

func TestNewRefuses(t *testing.T) {
	sum := func(x []float64) float64 { return x[0] + x[1] }
	leaves := []scoring.Leaf{{Name: "a"}, {Name: "b"}}
	for name, qs := range map[string][]scoring.Quantity{
		"circle":       {quantity("c", []string{"d", "a"}, sum), quantity("d", []string{"c", "a"}, sum)},
		"missing":      {quantity("c", []string{"a", "z"}, sum)},
		"twice":        {quantity("c", []string{"a", "b"}, sum), quantity("c", []string{"a", "b"}, sum)},
		"also a leaf":  {quantity("a", []string{"a", "b"}, sum)},
		"without unit": {{Name: "c", Formula: "x", Source: "identity", Eval: scoring.Plain(sum)}},
	} {
		if _, err := New(leaves, qs); err == nil {
			t.Errorf("%s: accepted", name)
		}
	}
}

func TestMissingInputsAreCarried(t *testing.T) {
	g, err := New([]scoring.Leaf{{Name: "a"}, {Name: "b"}}, []scoring.Quantity{
		quantity("c", []string{"a", "b"}, func(x []float64) float64 { return x[0] / x[1] }),
		quantity("d", []string{"c"}, func(x []float64) float64 { return 2 * x[0] }),
	})
	if err != nil {
		t.Fatal(err)
	}
	at, _ := g.Slot("d")
	v := make([]scoring.Value, g.Size())
	v[0], v[1] = scoring.Num(3), scoring.UnknownBecause("no_layer:soil")
	g.Central(v)
	if v[at].State != scoring.Unknown || v[at].Why != "no_layer:soil" {
		t.Errorf("got %+v, want the cause of the missing input", v[at])
	}
	v[1] = scoring.Num(0)
	g.Central(v)
	if v[at].State != scoring.Unknown || v[at].Why != "not_finite" {
		t.Errorf("got %+v, want not_finite", v[at])
	}
	v[1] = scoring.NotSetKey("climate.grid_factor_g_per_kwh")
	g.Central(v)
	if v[at].State != scoring.NotSet {
		t.Errorf("got %+v, want not set", v[at])
	}
}

func TestTrialsGivePercentiles(t *testing.T) {
	g, err := New([]scoring.Leaf{{Name: "a"}, {Name: "b"}}, []scoring.Quantity{
		quantity("c", []string{"a"}, func(x []float64) float64 { return 2 * x[0] }),
		quantity("d", []string{"b"}, func(x []float64) float64 { return x[0] }),
	})
	if err != nil {
		t.Fatal(err)
	}
	v := make([]scoring.Value, g.Size())
	v[0], v[1] = scoring.Num(5), scoring.Num(7)
	g.Central(v)
	draws := make([]float64, 101)
	for i := range draws {
		draws[i] = float64(100 - i)
	}
	c, _ := g.Slot("c")
	d, _ := g.Slot("d")
	s, err := g.Trials(v, []Drawn{{Slot: 0, Values: draws}}, []int{c, d})
	if err != nil {
		t.Fatal(err)
	}
	if s[0].Low != 20 || s[0].Median != 100 || s[0].High != 180 || !s[0].Moves {
		t.Errorf("spread %+v, want 20, 100, 180", s[0])
	}
	if s[1].Moves {
		t.Error("a quantity that no draw reaches moves")
	}
	if v[0].X != 5 || v[c].X != 10 {
		t.Error("the central vector was changed")
	}
}

func BenchmarkTrialsOfAChain(b *testing.B) {
	var qs []scoring.Quantity
	for i := range 40 {
		in := "a"
		if i > 0 {
			in = qs[i-1].Name
		}
		qs = append(qs, quantity(string(rune('A'+i%26))+string(rune('a'+i/26)), []string{in, "b"}, func(x []float64) float64 { return x[0]*0.99 + x[1] }))
	}
	g, err := New([]scoring.Leaf{{Name: "a"}, {Name: "b"}}, qs)
	if err != nil {
		b.Fatal(err)
	}
	v := make([]scoring.Value, g.Size())
	v[0], v[1] = scoring.Num(5), scoring.Num(7)
	g.Central(v)
	draws := make([]float64, 400)
	for i := range draws {
		draws[i] = float64(i)
	}
	want := make([]int, 0, 40)
	for i := range 40 {
		want = append(want, 2+i)
	}
	for b.Loop() {
		if _, err := g.Trials(v, []Drawn{{Slot: 0, Values: draws}}, want); err != nil {
			b.Fatal(err)
		}
	}
}

func TestPercentileEqualsSorting(t *testing.T) {
	rng := rand.New(rand.NewPCG(1, 2))
	for n := 1; n < 60; n++ {
		a := make([]float64, n)
		for i := range a {
			a[i] = float64(rng.IntN(9))
		}
		sorted := slices.Clone(a)
		slices.Sort(sorted)
		for _, p := range []float64{0, 0.1, 0.5, 0.9, 1} {
			at := float64(n-1) * p
			i := int(at)
			want := sorted[i]
			if i+1 < n {
				want += (at - float64(i)) * (sorted[i+1] - sorted[i])
			}
			if got := percentile(slices.Clone(a), p); got != want {
				t.Fatalf("%d values, p %v: %v, want %v", n, p, got, want)
			}
		}
	}
}
