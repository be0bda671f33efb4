package index

import (
	"fmt"
	"math"
	"math/rand/v2"
	"slices"
	"sync"
	"testing"

	"groundtally/geo"
)

func random(r *rand.Rand, n int) []geo.Extent {
	out := make([]geo.Extent, n)
	for i := range out {
		x, y := r.Float64()*60000, r.Float64()*60000
		out[i] = geo.Extent{MinX: x, MinY: y, MaxX: x + r.ExpFloat64()*300, MaxY: y + r.ExpFloat64()*300}
	}
	return out
}

func brute(es []geo.Extent, q geo.Extent) []int {
	var out []int
	for i, e := range es {
		if !e.Empty() && e.Meets(q) {
			out = append(out, i)
		}
	}
	return out
}

func TestAgainstLinearSearch(t *testing.T) {
	r := rand.New(rand.NewPCG(5, 6))
	for _, n := range []int{0, 1, 2, 15, 16, 17, 255, 256, 257, 3000, 20000} {
		es := random(r, n)
		if n > 10 {
			es[3] = geo.EmptyExtent()
			es[5] = es[6]                                                   // twice the same box
			es[7] = geo.Extent{MinX: 5, MinY: 5, MaxX: 5, MaxY: 5}          // a point
			es[8] = geo.Extent{MinX: math.NaN(), MinY: 0, MaxX: 1, MaxY: 1} // never found
		}
		tree := New(es)
		for range 200 {
			q := random(r, 1)[0].Grow(r.Float64() * 2000)
			got, want := tree.Search(q, nil), brute(es, q)
			if !slices.Equal(got, want) {
				t.Fatalf("n %d: got %v, want %v", n, got, want)
			}
		}
		if n > 10 {
			if got := tree.Search(geo.Extent{MinX: 5, MinY: 5, MaxX: 5, MaxY: 5}, nil); !slices.Contains(got, 7) {
				t.Error("touching boxes do not meet")
			}
			if tree.Len() != n-2 {
				t.Errorf("%d boxes packed, want %d", tree.Len(), n-2)
			}
		}
		all := tree.Search(tree.Extent(), nil)
		if len(all) != tree.Len() || !slices.IsSorted(all) {
			t.Errorf("the whole extent finds %d of %d", len(all), tree.Len())
		}
	}
}

func TestSearchAppends(t *testing.T) {
	tree := New([]geo.Extent{{MinX: 0, MinY: 0, MaxX: 1, MaxY: 1}})
	if got := tree.Search(tree.Extent(), []int{9}); !slices.Equal(got, []int{9, 0}) {
		t.Errorf("got %v", got)
	}
	if got := tree.Search(geo.EmptyExtent(), nil); got != nil {
		t.Errorf("an empty box found %v", got)
	}
}

func TestOfGrows(t *testing.T) {
	g := geo.XYGeometry{Kind: geo.Points, Parts: [][][]geo.XY{{{{X: 100, Y: 0}}}}}
	tree := Of([]geo.XYGeometry{g, {}}, 50)
	if got := tree.Search(geo.Extent{MaxX: 49, MaxY: 1}, nil); len(got) != 0 {
		t.Errorf("found %v", got)
	}
	if got := tree.Search(geo.Extent{MaxX: 50, MaxY: 1}, nil); !slices.Equal(got, []int{0}) {
		t.Errorf("found %v", got)
	}
}

func TestSharedByGoroutines(t *testing.T) {
	r := rand.New(rand.NewPCG(8, 8))
	es := random(r, 5000)
	tree := New(es)
	q := geo.Extent{MinX: 1000, MinY: 1000, MaxX: 9000, MaxY: 9000}
	want := brute(es, q)
	var wg sync.WaitGroup
	for range 8 {
		wg.Go(func() {
			for range 100 {
				if !slices.Equal(tree.Search(q, nil), want) {
					t.Error("a shared search differs")
					return
				}
			}
		})
	}
	wg.Wait()
}

func BenchmarkNew(b *testing.B) {
	es := random(rand.New(rand.NewPCG(1, 1)), 100000)
	for b.Loop() {
		New(es)
	}
}

func BenchmarkSearch(b *testing.B) {
	for _, n := range []int{1000, 10000, 100000} {
		b.Run(fmt.Sprint(n), func(b *testing.B) {
			r := rand.New(rand.NewPCG(1, 1))
			tree := New(random(r, n))
			var buf []int
			for b.Loop() {
				buf = tree.Search(geo.Extent{MinX: 30000, MinY: 30000, MaxX: 30700, MaxY: 30700}, buf[:0])
			}
		})
	}
}

// Each step of the curve goes to a cell beside; every cell is reached once.
func TestCurveIsOneWalk(t *testing.T) {
	const side = 32
	es := make([]geo.Extent, 0, side*side+1)
	for y := range side {
		for x := range side {
			es = append(es, geo.Extent{MinX: float64(x), MinY: float64(y), MaxX: float64(x), MaxY: float64(y)})
		}
	}
	es = append(es, geo.EmptyExtent())
	order := Curve(es)
	if last := order[len(order)-1]; last != side*side {
		t.Errorf("the empty extent is not last: %d", last)
	}
	seen := map[int]bool{}
	steps := 0.0
	for i, n := range order[:side*side] {
		seen[n] = true
		if i > 0 {
			steps += es[n].Centre().Dist(es[order[i-1]].Centre())
		}
	}
	if len(seen) != side*side {
		t.Errorf("%d cells of %d", len(seen), side*side)
	}
	if mean := steps / (side*side - 1); mean != 1 {
		t.Errorf("a step is %v cells long", mean)
	}
	if got := Curve(nil); len(got) != 0 {
		t.Errorf("got %v", got)
	}
	if got := Curve(es[:1]); !slices.Equal(got, []int{0}) {
		t.Errorf("got %v", got)
	}
}
