package overlay

import (
	"errors"
	"fmt"
	"math"
	"math/rand/v2"
	"reflect"
	"sync"
	"testing"

	"groundtally/geo"
	"groundtally/geo/measure"
)

func buildable(t testing.TB, e *Engine, in BuildableInput) BuildableResult {
	t.Helper()
	out, err := e.Buildable(in)
	if err != nil {
		t.Fatal(err)
	}
	closes(t, in, out)
	return out
}

// closes checks the account, with areas measured on the shapes themselves.
func closes(t testing.TB, in BuildableInput, out BuildableResult) {
	t.Helper()
	sum := out.BuildableM2 + out.TakenSharedM2 + out.ShapeM2
	for _, r := range out.Rules {
		sum += r.AloneM2
		if r.AloneM2 < 0 || r.SharedM2 < 0 {
			t.Errorf("rule %s has a negative area: %+v", r.Name, r)
		}
	}
	if math.Abs(sum-out.GrossM2) > 1e-6*out.GrossM2 {
		t.Errorf("the account gives %v of %v m2", sum, out.GrossM2)
	}
	if a := measure.AreaM2(out.Buildable); math.Abs(a-out.BuildableM2) > 1e-9*out.GrossM2 {
		t.Errorf("the buildable polygons have %v m2, stated are %v", a, out.BuildableM2)
	}
	if len(out.Rules) != len(in.Rules) {
		t.Errorf("%d rules in, %d out", len(in.Rules), len(out.Rules))
	}
}

func near(a, b float64) bool { return math.Abs(a-b) <= 1e-6*math.Max(1, math.Abs(b)) }

// Three rectangles on a square, by hand: a takes the west 300 m, b the south 200 m, c a square in both.
func TestBuildableByHand(t *testing.T) {
	e := New()
	in := BuildableInput{Site: box(0, 0, 1000, 1000), KeepTaken: true, Rules: []Rule{
		{Name: "a", Features: []geo.XYGeometry{box(-50, -50, 350, 1100)}},
		{Name: "b", Features: []geo.XYGeometry{box(-50, -50, 1100, 250)}},
		{Name: "c", Features: []geo.XYGeometry{box(100, 100, 50, 50), box(900, 900, 50, 50)}},
		{Name: "far", Features: []geo.XYGeometry{box(5000, 0, 50, 50)}},
		{Name: "line", Features: []geo.XYGeometry{line(geo.XY{}, geo.XY{X: 900, Y: 900})}},
	}}
	out := buildable(t, e, in)
	want := []RuleTaken{
		{Name: "a", AloneM2: 300 * 800, SharedM2: 300 * 200},
		{Name: "b", AloneM2: 700 * 200, SharedM2: 300 * 200},
		{Name: "c", AloneM2: 2500, SharedM2: 2500},
		{Name: "far"}, {Name: "line"},
	}
	for i, w := range want {
		g := out.Rules[i]
		if g.Name != w.Name || !near(g.AloneM2, w.AloneM2) || !near(g.SharedM2, w.SharedM2) || g.TakesAll {
			t.Errorf("got %+v, want %+v", g, w)
		}
		if a := measure.AreaM2(g.Taken); !near(a, w.AloneM2+w.SharedM2) {
			t.Errorf("rule %s shows %v m2 taken", g.Name, a)
		}
	}
	if !near(out.GrossM2, 1e6) || !near(out.TakenSharedM2, 60000) || !near(out.BuildableM2, 700*800-2500) || out.ShapeM2 != 0 {
		t.Errorf("got %+v", out)
	}
}

func TestTakesAll(t *testing.T) {
	e := New()
	big := Rule{Name: "big", Features: []geo.XYGeometry{box(-10, -10, 200, 200)}}
	half := Rule{Name: "half", Features: []geo.XYGeometry{box(-10, -10, 60, 200)}}
	wide := Rule{Name: "wide", SetbackM: 500, Features: []geo.XYGeometry{points(geo.XY{X: 50, Y: 50})}}
	site := box(0, 0, 100, 100)
	out := buildable(t, e, BuildableInput{Site: site, Rules: []Rule{big, half}})
	if !out.Rules[0].TakesAll || out.Rules[1].TakesAll || !near(out.Rules[0].AloneM2, 5000) || !near(out.TakenSharedM2, 5000) || !out.Buildable.Empty() || out.BuildableM2 != 0 {
		t.Errorf("got %+v", out)
	}
	out = buildable(t, e, BuildableInput{Site: site, Rules: []Rule{big, half, wide}})
	if !out.Rules[0].TakesAll || !out.Rules[2].TakesAll || !near(out.TakenSharedM2, 10000) || out.Rules[0].AloneM2 != 0 {
		t.Errorf("got %+v", out)
	}
	out = buildable(t, e, BuildableInput{Site: site, Rules: []Rule{wide}})
	if !out.Rules[0].TakesAll || !near(out.Rules[0].AloneM2, 10000) {
		t.Errorf("got %+v", out)
	}
	// Two halves take all together; neither does alone.
	other := Rule{Name: "other", Features: []geo.XYGeometry{box(50, -10, 60, 200)}}
	out = buildable(t, e, BuildableInput{Site: site, Rules: []Rule{half, other}})
	if out.Rules[0].TakesAll || out.Rules[1].TakesAll || !out.Buildable.Empty() || !near(out.TakenSharedM2, 0) {
		t.Errorf("got %+v", out)
	}
	out = buildable(t, e, BuildableInput{Site: site, Rules: []Rule{{Name: "edge", Boundary: true, SetbackM: 60}}})
	if !out.Rules[0].TakesAll {
		t.Errorf("got %+v", out)
	}
}

func TestBoundaryRule(t *testing.T) {
	e := New()
	r := 40 * arcFactor
	out := buildable(t, e, BuildableInput{Site: box(0, 0, 500, 300), Rules: []Rule{{Name: "edge", Boundary: true, SetbackM: 40}, {Name: "none", Boundary: true}}})
	if want := (500 - 2*r) * (300 - 2*r); !near(out.BuildableM2, want) || !near(out.Rules[0].AloneM2, 150000-want) || out.Rules[1].AloneM2 != 0 {
		t.Errorf("got %+v, want %v buildable", out, want)
	}
	// Two parcels of one site have no edge between them.
	two := geo.XYGeometry{Kind: geo.Polygons, Parts: append(box(0, 0, 250, 300).Parts, box(250, 0, 250, 300).Parts...)}
	again := buildable(t, e, BuildableInput{Site: two, Rules: []Rule{{Name: "edge", Boundary: true, SetbackM: 40}}})
	if !near(again.BuildableM2, out.BuildableM2) || again.Repaired != 1 {
		t.Errorf("got %+v", again)
	}
}

func TestShapeSteps(t *testing.T) {
	e := New()
	// A field of 200 by 200 m with a tail 20 m wide, a yard of 60 by 60 m apart.
	site := geo.XYGeometry{Kind: geo.Polygons, Parts: [][][]geo.XY{
		{{{}, {X: 200}, {X: 200, Y: 90}, {X: 400, Y: 90}, {X: 400, Y: 110}, {X: 200, Y: 110}, {X: 200, Y: 200}, {Y: 200}, {}}},
		box(600, 0, 60, 60).Parts[0],
	}}
	gross := 40000.0 + 4000 + 3600
	out := buildable(t, e, BuildableInput{Site: site})
	if !near(out.BuildableM2, gross) || out.ShapeM2 != 0 {
		t.Errorf("got %+v", out)
	}
	out = buildable(t, e, BuildableInput{Site: site, SmallestWidthM: 50})
	// The field keeps its corners; the tail goes but for what the round core reaches into its mouth:
	// a disc of 25 m radius cannot, so nothing but a few metres between the corner arcs.
	if out.BuildableM2 < 43600 || out.BuildableM2 > 43600+20*4 || len(out.Buildable.Parts) != 2 {
		t.Errorf("got %v m2 in %d parts", out.BuildableM2, len(out.Buildable.Parts))
	}
	// As wide as asked is wide enough, a centimetre less is not.
	if out = buildable(t, e, BuildableInput{Site: box(0, 0, 500, 50), SmallestWidthM: 50}); !near(out.BuildableM2, 25000) {
		t.Errorf("a strip as wide as asked: %+v", out)
	}
	if out = buildable(t, e, BuildableInput{Site: box(0, 0, 500, 49.99), SmallestWidthM: 50}); out.BuildableM2 != 0 || !near(out.ShapeM2, 500*49.99) {
		t.Errorf("a strip too narrow: %+v", out)
	}
	out = buildable(t, e, BuildableInput{Site: site, SmallestPatchM2: 3600.5})
	if !near(out.BuildableM2, 44000) || !near(out.ShapeM2, 3600) {
		t.Errorf("got %+v", out)
	}
	out = buildable(t, e, BuildableInput{Site: site, SmallestPatchM2: 3600})
	if !near(out.BuildableM2, gross) {
		t.Errorf("a patch as large as asked went: %+v", out)
	}
	// The width is applied first: the rest of the tail must not hold a patch together.
	bell := geo.XYGeometry{Kind: geo.Polygons, Parts: [][][]geo.XY{{{{}, {X: 60}, {X: 60, Y: 28}, {X: 160, Y: 28}, {X: 160}, {X: 220}, {X: 220, Y: 60}, {X: 160, Y: 60}, {X: 160, Y: 32}, {X: 60, Y: 32}, {X: 60, Y: 60}, {Y: 60}, {}}}}}
	if out = buildable(t, e, BuildableInput{Site: bell, SmallestWidthM: 20, SmallestPatchM2: 5000}); out.BuildableM2 != 0 {
		t.Errorf("two yards of 3,600 m2 passed as one: %+v", out)
	}
}

// Shells within shells, as the library's buffer now and then gives them: the outer counts, once.
func TestUnsoundBufferIsRepaired(t *testing.T) {
	e := New()
	nested := geo.XYGeometry{Kind: geo.Polygons, Parts: [][][]geo.XY{box(0, 0, 100, 100).Parts[0], box(10, 10, 20, 20).Parts[0]}}
	err := e.do("sound", func() {
		g := e.raw(nested)
		if g.IsValid() || g.Area() != 10400 {
			t.Error("this proves nothing")
		}
		if s := e.sound(g); !s.IsValid() || s.Area() != 10000 {
			t.Errorf("got %s", s.ToWKT())
		}
		if g = e.raw(box(0, 0, 10, 10)); e.sound(g) != g {
			t.Error("what is valid was made anew")
		}
	})
	if err != nil {
		t.Error(err)
	}
}

// random gives a site with rules of every kind, some broken.
func random(r *rand.Rand) BuildableInput {
	site := star(r, geo.XY{}, 400, 6+r.IntN(30), false)
	at := func() geo.XY { return geo.XY{X: 1200 * (r.Float64() - 0.5), Y: 1200 * (r.Float64() - 0.5)} }
	var houses, lines, woods []geo.XYGeometry
	for range r.IntN(12) {
		houses = append(houses, points(at(), at()))
	}
	for range r.IntN(4) {
		lines = append(lines, line(at(), at(), at()))
	}
	for range r.IntN(5) {
		woods = append(woods, star(r, at(), 150, 5+r.IntN(20), r.IntN(3) == 0))
	}
	// Cells side by side, as steep ground has them; a second rule takes some of the same again.
	var cells []geo.XYGeometry
	for range r.IntN(2) * 40 {
		cells = append(cells, box(20*float64(r.IntN(40)-20), 20*float64(r.IntN(40)-20), 20*float64(1+r.IntN(4)), 20))
	}
	return BuildableInput{
		Site: site, SmallestWidthM: float64(r.IntN(3)) * 30, SmallestPatchM2: float64(r.IntN(2)) * 8000,
		Rules: []Rule{
			{Name: "houses", Features: houses, SetbackM: 120 * r.Float64()},
			{Name: "lines", Features: lines, SetbackM: 60 * r.Float64()},
			{Name: "woods", Features: woods},
			{Name: "woods, wide", Features: woods, SetbackM: 40},
			{Name: "edge", Boundary: true, SetbackM: 30 * r.Float64()},
			{Name: "steep", Features: cells},
			{Name: "steep too", Features: cells[:len(cells)/2]},
		},
	}
}

func shuffled(r *rand.Rand, in BuildableInput) BuildableInput {
	out := in
	out.Rules = append([]Rule(nil), in.Rules...)
	r.Shuffle(len(out.Rules), func(i, j int) { out.Rules[i], out.Rules[j] = out.Rules[j], out.Rules[i] })
	for k := range out.Rules {
		fs := append([]geo.XYGeometry(nil), out.Rules[k].Features...)
		r.Shuffle(len(fs), func(i, j int) { fs[i], fs[j] = fs[j], fs[i] })
		out.Rules[k].Features = fs
	}
	return out
}

// Properties on random sites: the account closes; nothing depends on the order, bit for bit; positions
// are rightly inside or outside.
func TestBuildableProperties(t *testing.T) {
	e := New()
	r := rand.New(rand.NewPCG(41, 42))
	for n := range 120 {
		in := random(r)
		out := buildable(t, e, in)
		mixed := shuffled(r, in)
		again := buildable(t, New(), mixed)
		if !reflect.DeepEqual(out.Buildable, again.Buildable) || out.TakenSharedM2 != again.TakenSharedM2 || out.ShapeM2 != again.ShapeM2 {
			t.Fatalf("case %d: the order of rules or features changed the result", n)
		}
		by := map[string]RuleTaken{}
		for _, x := range again.Rules {
			by[x.Name] = x
		}
		for _, x := range out.Rules {
			if !reflect.DeepEqual(by[x.Name], x) {
				t.Fatalf("case %d: rule %s takes %+v or %+v", n, x.Name, x, by[x.Name])
			}
		}
		if ok, why, _ := e.Valid(out.Buildable); !ok {
			t.Fatalf("case %d: the buildable area is not valid: %s", n, why)
		}
		out.Buildable.Each(func(p geo.XY) {
			if d, ok := measure.PointToM(p, in.Site); !ok || d > 1e-5 {
				t.Fatalf("case %d: buildable %v m outside the site", n, d)
			}
			for _, rule := range in.Rules[:2] {
				for _, f := range rule.Features {
					if d, _ := measure.PointToM(p, f); d < rule.SetbackM-1e-5 {
						t.Fatalf("case %d: %s keep %v m, want %v", n, rule.Name, d, rule.SetbackM)
					}
				}
			}
		})
		if n < 40 {
			sample(t, r, in, out)
		}
	}
}

// sample compares areas with a count of positions judged by distance alone.
func sample(t *testing.T, r *rand.Rand, in BuildableInput, out BuildableResult) {
	t.Helper()
	if in.Rules[2].Features = valid(in.Rules[2].Features); len(in.Rules[2].Features) < len(in.Rules[3].Features) {
		return // crossing polygons have no plain inside to compare with
	}
	x := geo.ExtentOf(in.Site)
	const tries = 20000
	inSite, free, shared := 0, 0, 0
	for range tries {
		p := geo.XY{X: x.MinX + r.Float64()*(x.MaxX-x.MinX), Y: x.MinY + r.Float64()*(x.MaxY-x.MinY)}
		if !measure.Inside(p, in.Site) {
			continue
		}
		inSite++
		hits := 0
		for _, rule := range in.Rules {
			hit := false
			if rule.Boundary {
				_, d := measure.NearestOnOutline(p, in.Site)
				hit = d < rule.SetbackM*1.0006
			}
			for _, f := range rule.Features {
				d, _ := measure.PointToM(p, f)
				hit = hit || d < rule.SetbackM*1.0006 || (d == 0 && f.Kind == geo.Polygons)
			}
			if hit {
				hits++
			}
		}
		if hits == 0 {
			free++
		}
		if hits > 1 {
			shared++
		}
	}
	whole := (x.MaxX - x.MinX) * (x.MaxY - x.MinY)
	tol := 5 * whole * 0.5 / math.Sqrt(tries) // five standard deviations at most
	for _, c := range []struct {
		what string
		n    int
		want float64
	}{{"gross", inSite, out.GrossM2}, {"left", free, out.BuildableM2 + out.ShapeM2}, {"shared", shared, out.TakenSharedM2}} {
		if got := whole * float64(c.n) / tries; math.Abs(got-c.want) > tol {
			t.Errorf("%s: %v m2 by counting, %v m2 by overlay", c.what, got, c.want)
		}
	}
}

func valid(gs []geo.XYGeometry) (out []geo.XYGeometry) {
	e := New()
	for _, g := range gs {
		if ok, _, _ := e.Valid(g); ok {
			out = append(out, g)
		}
	}
	return out
}

// Property: more distance never leaves more land.
func TestMoreDistanceLeavesLess(t *testing.T) {
	e := New()
	r := rand.New(rand.NewPCG(51, 52))
	for range 40 {
		in := random(r)
		in.SmallestWidthM, in.SmallestPatchM2 = 0, 0
		last := math.Inf(1)
		for d := 0.0; d < 200; d += 25 {
			in.Rules[0].SetbackM = d
			out := buildable(t, e, in)
			if out.BuildableM2 > last*(1+1e-9) {
				t.Fatalf("%v m leave %v m2, less distance left %v", d, out.BuildableM2, last)
			}
			last = out.BuildableM2
		}
	}
}

func TestLayerAgreesWithRule(t *testing.T) {
	e := New()
	r := rand.New(rand.NewPCG(61, 62))
	for range 40 {
		in := random(r)
		direct := buildable(t, e, in)
		for i, rule := range in.Rules {
			if rule.Boundary {
				continue
			}
			l, err := e.NewLayer(rule.Features, rule.SetbackM)
			if err != nil {
				t.Fatal(err)
			}
			in.Rules[i] = l.Rule(rule.Name, geo.ExtentOf(in.Site))
		}
		out := buildable(t, e, in)
		// The library fills shallow hollows of the widened outline differently once a feature was cut to
		// the site's box, so areas agree to that, not to the last bit.
		if math.Abs(out.BuildableM2-direct.BuildableM2) > 2e-3*out.GrossM2 {
			t.Errorf("by layer %v m2, by rule %v m2", out.BuildableM2, direct.BuildableM2)
		}
	}
}

func TestBuildableRefuses(t *testing.T) {
	e := New()
	site := box(0, 0, 10, 10)
	for name, in := range map[string]BuildableInput{
		"no site":          {},
		"line site":        {Site: line(geo.XY{}, geo.XY{X: 1})},
		"flat site":        {Site: wkt(t, "POLYGON((0 0,10 0,5 0,0 0))")},
		"no name":          {Site: site, Rules: []Rule{{}}},
		"same name":        {Site: site, Rules: []Rule{{Name: "a"}, {Name: "a"}}},
		"negative setback": {Site: site, Rules: []Rule{{Name: "a", SetbackM: -1}}},
		"NaN setback":      {Site: site, Rules: []Rule{{Name: "a", SetbackM: math.NaN()}}},
		"edge, features":   {Site: site, Rules: []Rule{{Name: "a", Boundary: true, Features: []geo.XYGeometry{site}}}},
		"width":            {Site: site, SmallestWidthM: math.Inf(1)},
		"patch":            {Site: site, SmallestPatchM2: -1},
		"broken feature":   {Site: site, Rules: []Rule{{Name: "a", Features: []geo.XYGeometry{{Kind: geo.Polygons, Parts: [][][]geo.XY{{{{}, {X: 1}, {}}}}}}}}},
	} {
		if out, err := e.Buildable(in); err == nil {
			t.Errorf("%s was accepted: %+v", name, out)
		} else if errors.Is(err, ErrBusy) {
			t.Error(err)
		}
	}
	if _, err := e.NewLayer([]geo.XYGeometry{site}, -1); err == nil {
		t.Error("a negative setback was accepted")
	}
}

func TestWorkersAgree(t *testing.T) {
	r := rand.New(rand.NewPCG(71, 72))
	ins := make([]BuildableInput, 40)
	for i := range ins {
		ins[i] = random(r)
	}
	one := make([]BuildableResult, len(ins))
	e := New()
	for i, in := range ins {
		one[i] = buildable(t, e, in)
	}
	var wg sync.WaitGroup
	for w := range 4 {
		wg.Go(func() {
			e := New()
			for i := w; i < len(ins); i += 4 {
				out, err := e.Buildable(ins[i])
				if err != nil || !reflect.DeepEqual(out.Buildable, one[i].Buildable) {
					t.Errorf("site %d differs between workers: %v", i, err)
				}
			}
		})
	}
	wg.Wait()
}

// scene is a site of 20 ha with n features around it: half houses, a quarter lines, a quarter woods.
func scene(n int) BuildableInput {
	r := rand.New(rand.NewPCG(81, uint64(n)))
	site := star(r, geo.XY{}, 350, 30, false)
	at := func() geo.XY { return geo.XY{X: 1600 * (r.Float64() - 0.5), Y: 1600 * (r.Float64() - 0.5)} }
	var houses, lines, woods []geo.XYGeometry
	for i := range n {
		switch {
		case i%2 == 0:
			houses = append(houses, box(at().X, at().Y, 12, 9))
		case i%4 == 1:
			p := at()
			lines = append(lines, line(p, geo.XY{X: p.X + 300*r.Float64(), Y: p.Y + 300*r.Float64()}, at()))
		default:
			woods = append(woods, star(r, at(), 80, 40, false))
		}
	}
	return BuildableInput{Site: site, SmallestWidthM: 20, SmallestPatchM2: 5000, Rules: []Rule{
		{Name: "houses", Features: houses, SetbackM: 100}, {Name: "lines", Features: lines, SetbackM: 20},
		{Name: "woods", Features: woods}, {Name: "edge", Boundary: true, SetbackM: 10}}}
}

func BenchmarkBuildable(b *testing.B) {
	for _, n := range []int{4, 16, 64, 256} {
		b.Run(fmt.Sprint(n), func(b *testing.B) {
			e, in := New(), scene(n)
			for b.Loop() {
				e.memory.forget()
				if _, err := e.Buildable(in); err != nil {
					b.Fatal(err)
				}
			}
		})
	}
}

func BenchmarkBuildableFromLayers(b *testing.B) {
	for _, n := range []int{4, 16, 64, 256} {
		b.Run(fmt.Sprint(n), func(b *testing.B) {
			e, in := New(), scene(n)
			for i, rule := range in.Rules[:3] {
				l, err := e.NewLayer(rule.Features, rule.SetbackM)
				if err != nil {
					b.Fatal(err)
				}
				in.Rules[i] = l.Rule(rule.Name, geo.ExtentOf(in.Site))
			}
			for b.Loop() {
				e.memory.forget()
				if _, err := e.Buildable(in); err != nil {
					b.Fatal(err)
				}
			}
		})
	}
}

func BenchmarkRepair(b *testing.B) {
	e, g := New(), star(rand.New(rand.NewPCG(1, 1)), geo.XY{}, 100, 40, true)
	for b.Loop() {
		if _, _, err := e.Repair(g); err != nil {
			b.Fatal(err)
		}
	}
}
