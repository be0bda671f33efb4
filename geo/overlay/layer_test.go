package overlay

import (
	"bytes"
	"context"
	"errors"
	"fmt"
	"math"
	"math/rand/v2"
	"reflect"
	"strings"
	"testing"

	"groundtally/geo"
	"groundtally/geo/measure"
)

// things gives features of every kind, some broken, some empty.
func things(r *rand.Rand, n int) []geo.XYGeometry {
	at := func() geo.XY { return geo.XY{X: 3000 * r.Float64(), Y: 3000 * r.Float64()} }
	var out []geo.XYGeometry
	for i := range n {
		switch i % 6 {
		case 0:
			out = append(out, points(at(), at()))
		case 1:
			out = append(out, line(at(), at(), at()))
		case 2:
			out = append(out, star(r, at(), 150, 5+r.IntN(20), true))
		case 3:
			p := at()
			out = append(out, box(p.X, p.Y, 12, 9))
		case 4:
			out = append(out, star(r, at(), 150, 5+r.IntN(20), false))
		default:
			out = append(out, geo.XYGeometry{Kind: geo.Polygons})
		}
	}
	return out
}

func TestLayerDoesNotDependOnWorkers(t *testing.T) {
	r := rand.New(rand.NewPCG(111, 112))
	fs := things(r, 3*widenBlock+100)
	for _, d := range []float64{0, 35} {
		want := must[*Layer](t)(New().NewLayer(fs, d))
		if want.Len() < widenBlock {
			t.Fatalf("only %d regions", want.Len())
		}
		for _, cores := range []int{0, 1, 3, 100} {
			got := must[*Layer](t)(NewLayer(t.Context(), cores, fs, d))
			if !reflect.DeepEqual(got, want) {
				t.Errorf("%v m on %d workers: another layer", d, cores)
			}
		}
		for i, x := range want.extents {
			if x != geo.ExtentOf(want.regions[i]) {
				t.Errorf("the extent of region %d is %v, want %v", i, x, geo.ExtentOf(want.regions[i]))
			}
		}
	}
	if l := must[*Layer](t)(NewLayer(t.Context(), 2, nil, 5)); l.Len() != 0 || len(l.Rule("a", geo.Extent{MaxX: 1, MaxY: 1}).Features) != 0 {
		t.Error("nothing gives something")
	}
}

func TestLayerNamesTheFirstBrokenFeature(t *testing.T) {
	fs := things(rand.New(rand.NewPCG(1, 2)), 4*widenBlock)
	open := geo.XYGeometry{Kind: geo.Polygons, Parts: [][][]geo.XY{{{{}, {X: 1}, {X: 1, Y: 1}, {X: 2}}}}}
	fs[widenBlock+6], fs[3*widenBlock+12] = open, open
	want := fmt.Sprintf("feature %d: ", widenBlock+7)
	for _, cores := range []int{1, 4} {
		if _, err := NewLayer(t.Context(), cores, fs, 5); err == nil || !strings.HasPrefix(err.Error(), want) {
			t.Errorf("got %v, want %s", err, want)
		}
	}
	ctx, cancel := context.WithCancel(t.Context())
	cancel()
	if _, err := NewLayer(ctx, 2, fs, 5); !errors.Is(err, context.Canceled) {
		t.Errorf("got %v", err)
	}
	for _, d := range []float64{-1, math.NaN(), math.Inf(1)} {
		if _, err := NewLayer(t.Context(), 2, fs, d); err == nil {
			t.Errorf("a setback of %v m was accepted", d)
		}
	}
}

// A rule of layers gives bit for bit what the same features give when nothing is known of them.
func TestRuleOfChangesNothing(t *testing.T) {
	r := rand.New(rand.NewPCG(121, 122))
	for n := range 40 {
		in := random(r)
		big := must[*Layer](t)(New().NewLayer([]geo.XYGeometry{star(r, geo.XY{X: 300 * r.Float64()}, 2500*r.Float64(), 600, false), box(-3000, -3000, 6000, 3000-800*r.Float64())}, 0))
		small := must[*Layer](t)(New().NewLayer(in.Rules[0].Features, 60))
		known := RuleOf("layers", geo.ExtentOf(in.Site), big, small)
		bare := Rule{Name: "layers", Features: known.Features, Checked: true}
		with, without := in, in
		with.Rules = append(append([]Rule(nil), in.Rules...), known)
		without.Rules = append(append([]Rule(nil), in.Rules...), bare)
		if got, want := freshly(t, with), freshly(t, without); !reflect.DeepEqual(got, want) {
			t.Fatalf("case %d: %+v, unknown features give %+v", n, got, want)
		}
		// A rule whose features were changed by hand is not taken for what it was.
		if len(known.Features) > 1 {
			known.Features = append([]geo.XYGeometry(nil), known.Features[1:]...)
			with.Rules[len(with.Rules)-1], without.Rules[len(with.Rules)-1].Features = known, known.Features
			if got, want := freshly(t, with), freshly(t, without); !reflect.DeepEqual(got, want) {
				t.Fatalf("case %d: with one less %+v, want %+v", n, got, want)
			}
		}
	}
}

// Property: what is told without the library is what the library tells.
func TestAroundAgainstLibrary(t *testing.T) {
	e := New()
	r := rand.New(rand.NewPCG(131, 132))
	counts := map[lying]int{}
	for range 3000 {
		g := star(r, geo.XY{}, 1000, 3+r.IntN(60), false)
		if r.IntN(2) == 0 {
			g = must[geo.XYGeometry](t)(e.Difference(g, star(r, geo.XY{}, 300, 12, false)))
		}
		x := geo.EmptyExtent().Add(geo.XY{X: 1200 * r.NormFloat64() / 2, Y: 1200 * r.NormFloat64() / 2}).Grow(200 * r.Float64())
		site := geo.XYGeometry{Kind: geo.Polygons, Parts: [][][]geo.XY{boxOf(x)}}
		for _, part := range g.Parts {
			own := geo.XYGeometry{Kind: geo.Polygons, Parts: [][][]geo.XY{part}}
			got := lies(part, x)
			counts[got]++
			covers, meets := must[bool](t)(e.Covers(own, site)), must[bool](t)(e.Intersects(own, site))
			if (got == covering) != covers || (got == apart) == meets {
				// A hair's breadth is left to the library.
				if got != meeting || measure.AreaM2(must[geo.XYGeometry](t)(e.Intersection(own, site))) > 1e-3 && !covers {
					t.Fatalf("%v to %v: %v, the library says covers %v, meets %v", own, x, got, covers, meets)
				}
			}
		}
	}
	if counts[apart] < 300 || counts[covering] < 300 || counts[meeting] < 300 {
		t.Errorf("few cases of a kind: %v", counts)
	}
	square := box(0, 0, 100, 100).Parts[0]
	for _, c := range []struct {
		x    geo.Extent
		want lying
	}{
		{geo.Extent{MinX: 1, MinY: 1, MaxX: 99, MaxY: 99}, covering}, {geo.Extent{MinX: 0, MinY: 1, MaxX: 99, MaxY: 99}, meeting},
		{geo.Extent{MinX: 100, MinY: 1, MaxX: 199, MaxY: 99}, meeting}, {geo.Extent{MinX: 100.1, MinY: 1, MaxX: 199, MaxY: 99}, apart},
		{geo.Extent{MinX: -50, MinY: -50, MaxX: 150, MaxY: 150}, meeting}, {geo.Extent{MinX: 50, MinY: 50, MaxX: 50, MaxY: 50}, covering},
	} {
		if got := lies(square, c.x); got != c.want {
			t.Errorf("%v: got %v, want %v", c.x, got, c.want)
		}
	}
}

// Property: what is called plainly valid is valid.
func TestPlainlyValidIsValid(t *testing.T) {
	e := New()
	r := rand.New(rand.NewPCG(141, 142))
	plain := 0
	for n := range 6000 {
		var ring []geo.XY
		k := 3 + r.IntN(6)
		for i := range k {
			a := 2 * math.Pi * (float64(i) + 0.9*r.Float64()) / float64(k)
			if n%3 == 0 {
				a = 2 * math.Pi * r.Float64() // often crosses itself
			}
			d := 1 - 0.4*r.Float64()*float64(n%2)
			ring = append(ring, geo.XY{X: 5e5 + 20*d*math.Cos(a), Y: 5e6 + 20*d*math.Sin(a)})
		}
		if r.IntN(4) == 0 { // the pentagram's kind: every corner turns the same way
			for i := range ring {
				a := 4 * math.Pi * float64(i) / float64(k)
				ring[i] = geo.XY{X: 20 * math.Cos(a), Y: 20 * math.Sin(a)}
			}
		}
		g := geo.XYGeometry{Kind: geo.Polygons, Parts: [][][]geo.XY{{append(ring, ring[0])}}}
		if plainlyValid(g) {
			plain++
			if ok, why, err := e.Valid(g); !ok || err != nil {
				t.Fatalf("%v is not valid: %s %v", g, why, err)
			}
		}
	}
	if plain < 500 {
		t.Errorf("only %d of 6000 are plainly valid", plain)
	}
	if !plainlyValid(box(5e5, 5e6, 12, 9)) {
		t.Error("a house is not plainly valid")
	}
	for _, g := range []geo.XYGeometry{{}, points(geo.XY{}), box(0, 0, 0, 5), wkt(t, "POLYGON((0 0,10 10,10 0,0 10,0 0))"), wkt(t, "POLYGON((0 0,4 0,4 4,0 4,0 0),(1 1,2 1,2 2,1 1))")} {
		if plainlyValid(g) {
			t.Errorf("%v is plainly valid", g)
		}
	}
}

// What is cut to a box is not cut to it again, since that changes no bit.
func TestClipTwiceIsClip(t *testing.T) {
	e := New()
	r := rand.New(rand.NewPCG(151, 152))
	cuts := 0
	for range 2000 {
		g := star(r, geo.XY{X: 100 * r.Float64(), Y: 100 * r.Float64()}, 150, 4+r.IntN(40), false)
		if r.IntN(2) == 0 {
			g = must[geo.XYGeometry](t)(e.Buffer(points(geo.XY{X: 200*r.Float64() - 50, Y: 200*r.Float64() - 50}), 100))
		}
		x := geo.Extent{MinX: -20, MinY: -30, MaxX: 60 + 50*r.Float64(), MaxY: 80 * r.Float64()}
		err := e.do("clip", func() {
			once := e.clip(e.raw(g), x)
			if once.IsEmpty() {
				return
			}
			cuts++
			if twice := e.clip(once, x); !bytes.Equal(once.ToWKB(), twice.ToWKB()) {
				t.Fatalf("%s is cut again to %s", once.ToWKT(), twice.ToWKT())
			}
		})
		if err != nil {
			t.Fatal(err)
		}
	}
	if cuts < 1000 {
		t.Errorf("only %d cuts", cuts)
	}
}

// The large polygons kept have a bound; the oldest go first.
func TestLargePolygonsHaveABound(t *testing.T) {
	e := New()
	const corners = largeMost / 10
	for n := range 15 {
		var ring []geo.XY
		for i := range corners {
			s, c := math.Sincos(2 * math.Pi * float64(i) / corners)
			ring = append(ring, geo.XY{X: 1500 * c, Y: 1500 * s})
		}
		g := geo.XYGeometry{Kind: geo.Polygons, Parts: [][][]geo.XY{{append(ring, ring[0])}}}
		for range 2 {
			if _, err := e.LandLeft(TileInput{Tile: geo.Extent{MinX: 800, MinY: -900, MaxX: 2000, MaxY: 800}, District: g}); err != nil {
				t.Fatal(err)
			}
		}
		if want := min(n+1, 9); len(e.large.at) != want || len(e.large.order) != want || e.large.count > largeMost {
			t.Fatalf("%d polygons of %d positions are kept after %d", len(e.large.at), e.large.count, n+1)
		}
	}
}

func BenchmarkNewLayer(b *testing.B) {
	r := rand.New(rand.NewPCG(1, 1))
	for _, n := range []int{100, 1000, 10000} {
		var houses []geo.XYGeometry
		for range n {
			houses = append(houses, box(60000*r.Float64(), 60000*r.Float64(), 12, 9))
		}
		for _, cores := range []int{1, 2} {
			b.Run(fmt.Sprintf("%d_houses/%d_cores", n, cores), func(b *testing.B) {
				for b.Loop() {
					if _, err := NewLayer(b.Context(), cores, houses, 250); err != nil {
						b.Fatal(err)
					}
				}
			})
		}
	}
}

// A small site beside one large polygon, by its positions.
func BenchmarkLargePolygon(b *testing.B) {
	for _, n := range []int{100, 1000, 10000, 100000} {
		b.Run(fmt.Sprint(n), func(b *testing.B) {
			e, r := New(), rand.New(rand.NewPCG(1, 1))
			l, err := e.NewLayer([]geo.XYGeometry{star(r, geo.XY{}, 3000, n, false)}, 0)
			if err != nil {
				b.Fatal(err)
			}
			site := star(r, geo.XY{X: 1800}, 200, 20, false)
			in := BuildableInput{Site: site, Rules: []Rule{RuleOf("wood", geo.ExtentOf(site), l)}}
			for b.Loop() {
				e.memory.forget()
				if _, err := e.Buildable(in); err != nil {
					b.Fatal(err)
				}
			}
		})
	}
}

func BenchmarkAround(b *testing.B) {
	for _, n := range []int{100, 10000} {
		b.Run(fmt.Sprint(n), func(b *testing.B) {
			part := star(rand.New(rand.NewPCG(1, 1)), geo.XY{}, 3000, n, false).Parts[0]
			for b.Loop() {
				lies(part, geo.Extent{MinX: -100, MinY: -100, MaxX: 100, MaxY: 100})
			}
		})
	}
}
