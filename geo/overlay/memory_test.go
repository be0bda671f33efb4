package overlay

import (
	"fmt"
	"math/rand/v2"
	"reflect"
	"testing"

	"github.com/twpayne/go-geos"

	"groundtally/geo"
)

// freshly computes in an engine that knows nothing.
func freshly(t testing.TB, in BuildableInput) BuildableResult {
	t.Helper()
	e := New()
	defer e.Close()
	return buildable(t, e, in)
}

// variants gives rulesets as plant options have them: mostly the same rules at the same or other distances.
func variants(r *rand.Rand, in BuildableInput) []BuildableInput {
	var out []BuildableInput
	for range 8 {
		v := shuffled(r, in)
		v.SmallestWidthM, v.SmallestPatchM2 = float64(r.IntN(3))*20, float64(r.IntN(3))*3000
		v.KeepTaken = r.IntN(4) == 0
		v.Rules = v.Rules[:len(v.Rules)-r.IntN(3)]
		if r.IntN(3) == 0 {
			k := &v.Rules[r.IntN(len(v.Rules))]
			k.SetbackM = float64(r.IntN(2)) * 30
		}
		out = append(out, v)
	}
	return out
}

// Property: what an engine remembers of a site changes no bit of a result, nor the counts in it.
func TestMemoryChangesNothing(t *testing.T) {
	e := New()
	r := rand.New(rand.NewPCG(91, 92))
	recalled := 0
	for n := range 40 {
		for k, in := range variants(r, random(r)) {
			known := len(e.memory.rules)
			got := buildable(t, e, in)
			if k > 0 && len(e.memory.rules)-known < len(in.Rules) {
				recalled++
			}
			if want := freshly(t, in); !reflect.DeepEqual(got, want) {
				t.Fatalf("site %d, ruleset %d: with memory %+v, without %+v", n, k, got, want)
			}
		}
	}
	if recalled < 200 {
		t.Errorf("only %d of 280 rulesets found anything in memory, so this test proves little", recalled)
	}
}

// The same with the regions of layers, made for each ruleset or shared by them.
func TestMemoryOfLayers(t *testing.T) {
	e := New()
	r := rand.New(rand.NewPCG(93, 94))
	for n := range 20 {
		base := random(r)
		shared := map[string]*Layer{}
		for k, in := range variants(r, base) {
			for i, rule := range in.Rules {
				if rule.Boundary {
					continue
				}
				name := fmt.Sprint(rule.Name, rule.SetbackM)
				l := shared[name]
				if l == nil || r.IntN(2) == 0 {
					var err error
					if l, err = e.NewLayer(rule.Features, rule.SetbackM); err != nil {
						t.Fatal(err)
					}
					shared[name] = l
				}
				in.Rules[i] = l.Rule(rule.Name, geo.ExtentOf(in.Site))
			}
			if got, want := buildable(t, e, in), freshly(t, in); !reflect.DeepEqual(got, want) {
				t.Fatalf("site %d, ruleset %d: with memory %+v, without %+v", n, k, got, want)
			}
		}
	}
}

// Operations that were tried again are counted alike whether they are computed or recalled, those that a
// shape is made from once; on a coarser grid nothing is recalled, nothing kept.
func TestMemoryCountsRetries(t *testing.T) {
	e := New()
	made := 0
	chain := func(grid int) (areaM2 float64, retries int) {
		before := e.retries
		err := e.do("chain", func() {
			e.grid = grid
			e.memory.at([]byte("site"))
			first := e.recall("first", func() *geos.Geom { made++; e.retries += 2; return e.raw(box(0, 0, 10, 10)) })
			second := e.recall("second", func() *geos.Geom {
				made++
				e.retries++
				return e.overlay(difference, first.g, e.raw(box(0, 0, 5, 5)))
			})
			if second.areaM2 != second.g.Area() {
				t.Errorf("area %v is kept for %v", second.areaM2, second.g.Area())
			}
			areaM2 = second.areaM2
		})
		if err != nil {
			t.Fatal(err)
		}
		return areaM2, e.retries - before
	}
	for _, c := range []struct{ grid, made int }{{1, 2}, {0, 4}, {0, 4}, {2, 6}, {0, 6}} {
		if a, n := chain(c.grid); a != 75 || n != 3 || made != c.made {
			t.Errorf("grid %d: %v m2 with %d retries after %d shapes made, want 75, 3, %d", c.grid, a, n, made, c.made)
		}
	}
}

// A caller may alter what it gave, unless it said that it was checked.
func TestMemoryNoticesChanges(t *testing.T) {
	e := New()
	f := box(-10, -10, 60, 200)
	in := BuildableInput{Site: box(0, 0, 100, 100), Rules: []Rule{{Name: "a", Features: []geo.XYGeometry{f}}}}
	if out := buildable(t, e, in); !near(out.BuildableM2, 5000) {
		t.Errorf("got %+v", out)
	}
	f.Parts[0][0][1].X, f.Parts[0][0][2].X = 30, 30
	if out := buildable(t, e, in); !near(out.BuildableM2, 7000) {
		t.Errorf("a feature that shrank: %+v", out)
	}
	for i := range 2 {
		in.Site.Parts[0][0][1+i].X = 200
	}
	out := buildable(t, e, in)
	if !near(out.BuildableM2, 17000) {
		t.Errorf("a site that grew: %+v", out)
	}
	// What was handed out is the caller's too.
	out.Buildable.Parts[0][0][0].X = -1e6
	if out = buildable(t, e, in); !near(out.BuildableM2, 17000) {
		t.Errorf("a result that was altered came back: %+v", out)
	}
}

// An error or a fault in the library leaves nothing wrong behind; what is kept has a bound.
func TestMemoryIsSafe(t *testing.T) {
	e := New()
	site := box(0, 0, 100, 100)
	broken := Rule{Name: "b", Features: []geo.XYGeometry{{Kind: geo.Polygons, Parts: [][][]geo.XY{{{{}, {X: 1}, {}}}}}}}
	good := Rule{Name: "a", Features: []geo.XYGeometry{box(0, 0, 50, 100)}}
	for range 2 {
		if _, err := e.Buildable(BuildableInput{Site: site, Rules: []Rule{good, broken}}); err == nil {
			t.Fatal("a broken feature was accepted")
		}
		if out := buildable(t, e, BuildableInput{Site: site, Rules: []Rule{good}}); !near(out.BuildableM2, 5000) {
			t.Errorf("got %+v", out)
		}
	}
	if err := e.do("fault", func() { panic("library") }); err == nil || len(e.memory.rules) != 0 {
		t.Errorf("after a fault %d rules are kept, error %v", len(e.memory.rules), err)
	}
	for i := range 2 * mostKnown {
		d := float64(i) / 10
		out := buildable(t, e, BuildableInput{Site: site, Rules: []Rule{{Name: "a", Features: []geo.XYGeometry{box(0, 0, d, 100)}}}})
		if !near(out.BuildableM2, 100*(100-d)) {
			t.Fatalf("%v m: got %+v", d, out)
		}
		if len(e.memory.rules) > mostKnown+1 {
			t.Fatalf("%d rules are kept", len(e.memory.rules))
		}
	}
}

// One site under four rulesets that differ in their steep ground, as four ways to mount modules do.
func BenchmarkRulesets(b *testing.B) {
	in := scene(64)
	e := New()
	for i, rule := range in.Rules[:3] {
		l, err := e.NewLayer(rule.Features, rule.SetbackM)
		if err != nil {
			b.Fatal(err)
		}
		in.Rules[i] = l.Rule(rule.Name, geo.ExtentOf(in.Site))
	}
	var ins []BuildableInput
	for k := range 4 {
		v := in
		var cells []geo.XYGeometry
		for i := range 3 + k {
			cells = append(cells, box(20*float64(i), 0, 20, 20*float64(1+i)))
		}
		v.Rules = append(append([]Rule(nil), in.Rules...), Rule{Name: "slope", Features: cells})
		ins = append(ins, v)
	}
	for _, keeps := range []bool{false, true} {
		b.Run(fmt.Sprintf("memory=%v", keeps), func(b *testing.B) {
			for b.Loop() {
				e.memory.forget()
				for _, v := range ins {
					if !keeps {
						e.memory.forget()
					}
					if _, err := e.Buildable(v); err != nil {
						b.Fatal(err)
					}
				}
			}
		})
	}
}
