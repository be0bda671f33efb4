package overlay

import (
	"errors"
	"fmt"
	"go/ast"
	"go/parser"
	"go/token"
	"math/rand/v2"
	"os"
	"path/filepath"
	"reflect"
	"regexp"
	"runtime"
	"slices"
	"strings"
	"sync"
	"testing"
	"time"

	"github.com/twpayne/go-geos"

	"groundtally/geo"
)

// One test for each way in which the binding fails without a word: see the list in doc.go. They go against
// the guards, not round them, so that each fails once its guard is gone.

// inTime runs f and fails when it hangs.
func inTime(t *testing.T, what string, f func()) {
	t.Helper()
	done := make(chan struct{})
	go func() { defer close(done); f() }()
	select {
	case <-done:
	case <-time.After(time.Minute):
		t.Fatalf("%s hangs", what)
	}
}

// Trap 1: a failed overlay is a nil geometry.
func TestNoNilGeometryGoesOn(t *testing.T) {
	e := New()
	if err := e.do("job", func() { e.own(nil, "difference") }); !errors.Is(err, ErrNotComputed) || !strings.Contains(err.Error(), "difference") {
		t.Errorf("a nil result gives %v", err)
	}
	r := rand.New(rand.NewPCG(5, 1))
	ends := map[error]int{}
	for range 40 {
		a, b := star(r, geo.XY{}, 100, 9, true), star(r, geo.XY{}, 100, 9, true)
		for _, job := range []func(){
			func() { e.overlay(difference, e.raw(a), e.raw(b)) },
			func() { e.overlay(intersection, e.raw(a), e.raw(b)) },
			func() { e.overlay(union, e.raw(a), e.raw(b)) },
		} {
			switch err := e.do("job", job); {
			case err == nil:
				ends[nil]++
			case errors.Is(err, ErrNotComputed):
				ends[ErrNotComputed]++
			default:
				t.Fatalf("got %v", err)
			}
		}
	}
	if ends[ErrNotComputed] == 0 {
		t.Errorf("nothing failed, so this proves nothing: %v", ends)
	}
}

// Trap 2: a prepared geometry that is destroyed and then collected ends the program.
func TestNoPreparedGeometryIsDestroyedTwice(t *testing.T) {
	e := New()
	for range 300 {
		if err := e.do("job", func() { e.covers(e.raw(box(0, 0, 10, 10)), e.raw(box(1, 1, 2, 2))) }); err != nil {
			t.Fatal(err)
		}
	}
	// Finalizers run on a goroutine of their own: give them every chance. A second destruction would not fail
	// this test but end it with all others.
	for range 5 {
		runtime.GC()
		sentinel := make(chan struct{})
		func() {
			p := new([16]byte)
			runtime.SetFinalizer(p, func(*[16]byte) { close(sentinel) })
		}()
		runtime.GC()
		select {
		case <-sentinel:
		case <-time.After(10 * time.Second):
		}
	}
}

// Trap 3: two contexts used crosswise lock each other out. Nothing of the library leaves an engine, so there
// is no way to cross them.
func TestNoGeometryLeavesItsEngine(t *testing.T) {
	var library func(reflect.Type, map[reflect.Type]bool) bool
	library = func(x reflect.Type, seen map[reflect.Type]bool) bool {
		if seen[x] {
			return false
		}
		seen[x] = true
		if strings.Contains(x.PkgPath(), "go-geos") {
			return true
		}
		switch x.Kind() {
		case reflect.Pointer, reflect.Slice, reflect.Array, reflect.Chan:
			return library(x.Elem(), seen)
		case reflect.Map:
			return library(x.Key(), seen) || library(x.Elem(), seen)
		case reflect.Struct:
			for i := range x.NumField() {
				if f := x.Field(i); f.IsExported() && library(f.Type, seen) {
					return true
				}
			}
		case reflect.Func:
			for i := range x.NumIn() {
				if library(x.In(i), seen) {
					return true
				}
			}
			for i := range x.NumOut() {
				if library(x.Out(i), seen) {
					return true
				}
			}
		}
		return false
	}
	if !library(reflect.TypeFor[map[string][]*geos.Geom](), map[reflect.Type]bool{}) {
		t.Fatal("the test is blind")
	}
	for _, x := range []reflect.Type{reflect.TypeFor[*Engine](), reflect.TypeFor[*Layer]()} {
		if x.NumMethod() == 0 {
			t.Fatalf("%v has no methods", x)
		}
		for i := range x.NumMethod() {
			if m := x.Method(i); library(m.Type, map[reflect.Type]bool{}) {
				t.Errorf("%v.%s takes or gives something of the library", x, m.Name)
			}
		}
	}
	// Two engines on the same two values, crosswise, at full speed.
	a, b := box(0, 0, 10, 10), box(5, 5, 10, 10)
	inTime(t, "a pair of engines", func() {
		var wg sync.WaitGroup
		for k := range 2 {
			wg.Go(func() {
				e := New()
				for range 2000 {
					x, y := a, b
					if k == 1 {
						x, y = b, a
					}
					if yes, err := e.Intersects(x, y); !yes || err != nil {
						t.Errorf("got %v %v", yes, err)
						return
					}
				}
			})
		}
		wg.Wait()
	})
	// After a fault the context is another one: nothing of the old one may be left in reach.
	e := New()
	l := must[*Layer](t)(e.NewLayer([]geo.XYGeometry{star(rand.New(rand.NewPCG(1, 1)), geo.XY{}, 900, 500, false), box(20, 20, 30, 30)}, 0))
	site := box(-50, -800, 600, 900)
	buildable(t, e, BuildableInput{Site: site, Rules: []Rule{l.Rule("a", geo.ExtentOf(site))}})
	if len(e.memory.held) == 0 || len(e.large.at) == 0 {
		t.Fatalf("%d shapes and %d large polygons are kept, so this proves nothing", len(e.memory.held), len(e.large.at))
	}
	_ = e.do("fault", func() { panic("library") })
	if len(e.memory.held)+len(e.memory.shapes)+len(e.memory.rules)+len(e.large.at)+len(e.live) != 0 {
		t.Error("geometries of a context that is given up are kept")
	}
	buildable(t, e, BuildableInput{Site: site, Rules: []Rule{l.Rule("a", geo.ExtentOf(site))}})
}

// Trap 4: the callback of the library's tree runs under its lock. Our tree has none, so that a search is
// possible in the middle of a job.
func TestSearchTakesNoLock(t *testing.T) {
	e := New()
	l := must[*Layer](t)(e.NewLayer([]geo.XYGeometry{box(0, 0, 10, 10), box(20, 0, 10, 10)}, 5))
	inTime(t, "a search in a job", func() {
		_ = e.do("job", func() {
			site := e.raw(box(0, 0, 100, 100))
			for _, f := range l.Rule("a", geo.Extent{MaxX: 100, MaxY: 100}).Features {
				site = e.overlay(difference, site, e.raw(f))
			}
			if a := site.Area(); !(a > 9000 && a < 10000) {
				t.Errorf("area %v", a)
			}
		})
	})
}

// Trap 5: a collection owns its members, so that a member used after it is destroyed ends the program.
func TestCollectionLeavesNoMemberBehind(t *testing.T) {
	e := New()
	err := e.do("job", func() {
		members := []*geos.Geom{e.raw(box(0, 0, 10, 10)), e.raw(box(5, 5, 10, 10)), e.raw(box(50, 0, 5, 5))}
		c := e.collect(members)
		if !slices.Equal(members, []*geos.Geom{nil, nil, nil}) {
			t.Error("members can still be used")
		}
		c.Destroy()
		members = []*geos.Geom{e.raw(box(0, 0, 10, 10)), e.raw(box(5, 5, 10, 10))}
		g := e.join(members)
		if members[0] != nil || g.Area() != 175 {
			t.Errorf("got %v with the members %v", g.Area(), members)
		}
		if one := []*geos.Geom{e.raw(box(0, 0, 3, 3))}; e.join(one).Area() != 9 {
			t.Error("one member is not its own union")
		}
	}) // its end destroys members and collections alike
	if err != nil {
		t.Fatal(err)
	}
	runtime.GC()
	if a := must[float64](t)(e.AreaM2(box(0, 0, 2, 2))); a != 4 {
		t.Errorf("area %v", a)
	}
}

// Trap 6: the collector knows nothing of the library's memory. It must have nothing to do: whatever a call
// makes is destroyed by the call, whatever is kept by Close.
func TestCollectorFreesNoGeometry(t *testing.T) {
	var mu sync.Mutex
	ended := 0
	e := &Engine{ctx: geos.NewContext(geos.WithGeomFinalizeFunc(func(*geos.Geom) { mu.Lock(); ended++; mu.Unlock() }))}
	r := rand.New(rand.NewPCG(7, 8))
	wild, calm := star(r, geo.XY{}, 100, 9, true), star(r, geo.XY{}, 400, 500, false)
	broken := geo.XYGeometry{Kind: geo.Polygons, Parts: [][][]geo.XY{{{{}, {X: 1}, {}}}}}
	l, err := e.NewLayer([]geo.XYGeometry{calm, box(20, 20, 30, 30), wild}, 0)
	if err != nil {
		t.Fatal(err)
	}
	for n := range 30 {
		x := geo.Extent{MinX: 10 * float64(n), MinY: -300, MaxX: 10*float64(n) + 200, MaxY: 300}
		in := random(r)
		in.Rules = append(in.Rules, l.Rule("layer", geo.ExtentOf(in.Site)))
		_, _ = e.Buildable(in)
		_, _ = e.Buildable(shuffled(r, in))
		in.Rules = append(in.Rules, Rule{Name: "broken", Features: []geo.XYGeometry{broken}})
		_, _ = e.Buildable(in)
		_, _ = e.LandLeft(TileInput{Tile: x, District: calm, Rules: []Rule{l.Rule("layer", x)}})
		_, _ = e.Zones([]geo.XYGeometry{box(0, 0, 10, 10), box(10, 0, 10, 10), box(5, 50, 2, 2)}, 1, 5)
		_, _ = e.EdgeLayer(calm, 5)
		_, _, _ = e.Repair(wild)
		_, _, _ = e.Valid(wild)
		_, _ = e.Covers(calm, box(0, 0, 1, 1))
		_, _ = e.DistanceM(calm, box(900, 0, 1, 1))
		_, _ = e.Union(calm, box(390, 0, 50, 50))
		_, _ = e.Union(calm, wild)
		_, _ = e.Clip(calm, x)
	}
	if err := e.Close(); err != nil {
		t.Fatal(err)
	}
	for range 5 {
		runtime.GC()
		time.Sleep(10 * time.Millisecond)
	}
	mu.Lock()
	defer mu.Unlock()
	if ended != 0 {
		t.Errorf("the collector had to free %d geometries", ended)
	}
}

// Trap 7: constructors panic. Geometry comes in by a reader that gives errors; a panic from elsewhere ends at
// the border of the call.
func TestNoPanicPassesTheBorder(t *testing.T) {
	e := New()
	bad := []geo.XYGeometry{
		{Kind: geo.Polygons, Parts: [][][]geo.XY{{{{}, {X: 1}, {X: 1, Y: 1}, {X: 2, Y: 2}}}}}, // open
		{Kind: geo.Polygons, Parts: [][][]geo.XY{{{{}, {X: 1}, {}}}}},
		{Kind: geo.Polygons, Parts: [][][]geo.XY{{}}},
		{Kind: geo.Polygons, Parts: [][][]geo.XY{{{{}}, {}}}},
		{Kind: geo.Lines, Parts: [][][]geo.XY{{{{X: 1}}}}},
		{Kind: geo.Points, Parts: [][][]geo.XY{{{{}, {}}}}},
		{Kind: 99, Parts: [][][]geo.XY{{{{}}}}},
	}
	good := box(0, 0, 10, 10)
	for i, g := range bad {
		for name, call := range map[string]func() error{
			"union":     func() error { _, err := e.Union(g); return err },
			"clip":      func() error { _, err := e.Clip(g, geo.Extent{MinX: -1, MinY: -1, MaxX: 1, MaxY: 1}); return err },
			"layer":     func() error { _, err := e.NewLayer([]geo.XYGeometry{good, g}, 10); return err },
			"layers":    func() error { _, err := NewLayer(t.Context(), 2, []geo.XYGeometry{good, g}, 10); return err },
			"buildable": func() error { _, err := e.Buildable(BuildableInput{Site: g}); return err },
			"rule": func() error {
				_, err := e.Buildable(BuildableInput{Site: good, Rules: []Rule{{Name: "a", SetbackM: 1, Features: []geo.XYGeometry{g}}}})
				return err
			},
			"zones": func() error { _, err := e.Zones([]geo.XYGeometry{good, g}, 1, 0); return err },
			"landleft": func() error {
				_, err := e.LandLeft(TileInput{Tile: geo.Extent{MaxX: 5, MaxY: 5}, District: g})
				return err
			},
		} {
			if err := call(); err == nil && !g.Empty() && name != "clip" && name != "landleft" && name != "rule" {
				t.Errorf("%s accepted the broken geometry %d", name, i)
			}
		}
		if a := must[float64](t)(e.AreaM2(good)); a != 100 {
			t.Errorf("after the broken geometry %d an area is %v", i, a)
		}
	}
	if err := e.do("job", func() { e.ctx.NewPolygon([][][]float64{{{0, 0}, {1, 1}}}) }); !errors.Is(err, ErrNotComputed) {
		t.Errorf("a constructor's panic gives %v", err)
	}
}

// Trap 8: the next versions of the binding need a newer library than the systems we build on have.
func TestBindingIsTheVersionThatWasTried(t *testing.T) {
	mod, err := os.ReadFile(filepath.Join("..", "..", "go.mod"))
	if err != nil {
		t.Fatal(err)
	}
	const tried = "v0.18.1"
	if m := regexp.MustCompile(`github\.com/twpayne/go-geos (v\S+)`).FindSubmatch(mod); m == nil || string(m[1]) != tried {
		t.Errorf("go.mod asks for another version than %s: try the eight traps by hand again, then raise it here: %q", tried, m)
	}
	var major, minor, patch int
	if _, err := fmt.Sscanf(LibraryVersion(), "%d.%d.%d", &major, &minor, &patch); err != nil || major != 3 || minor < 11 {
		t.Errorf("the library is %s, want 3.11 or later: %v", LibraryVersion(), err)
	}
}

// Calls of the binding that are traps stand in one guarded place each.
func TestTrapsAreCalledInOnePlace(t *testing.T) {
	allowed := map[string][]string{
		"NewContext": {"New", "do"}, "Prepare": {"covers"}, "NewCollection": {"collect"}, "NewGeomFromWKB": {"read"}, "SetFinalizer": {"covers"},
		"Difference": {"onGrid"}, "DifferencePrec": {"onGrid"}, "Intersection": {"onGrid"}, "IntersectionPrec": {"onGrid"}, "UnionPrec": {"onGrid"}, "Union": {"onGrid", "packed"},
		"UnaryUnion": {"unary"}, "UnaryUnionPrec": {"unary"}, "ClipByRect": {"clip"}, "MakeValidWithParams": {"makeValid"}, "BufferWithStyle": {"widen", "wideEnough"},
		// never
		"NewSTRtree": nil, "NewPolygon": nil, "NewLinearRing": nil, "NewLineString": nil, "NewPoint": nil, "NewPointFromXY": nil, "NewGeomFromWKT": nil, "NewGeomFromGeoJSON": nil,
		"Buffer": nil, "MakeValid": nil, "SymDifference": nil,
	}
	files, err := filepath.Glob("*.go")
	if err != nil {
		t.Fatal(err)
	}
	seen := map[string]bool{}
	for _, file := range files {
		if strings.HasSuffix(file, "_test.go") {
			continue
		}
		f, err := parser.ParseFile(token.NewFileSet(), file, nil, 0)
		if err != nil {
			t.Fatal(err)
		}
		for _, d := range f.Decls {
			fn, ok := d.(*ast.FuncDecl)
			if !ok {
				continue
			}
			ast.Inspect(fn, func(n ast.Node) bool {
				call, ok := n.(*ast.CallExpr)
				if !ok {
					return true
				}
				sel, ok := call.Fun.(*ast.SelectorExpr)
				if !ok {
					return true
				}
				if id, ok := sel.X.(*ast.Ident); ok && (id.Name == "e" || id.Name == "measure") {
					return true // our own
				}
				if where, trap := allowed[sel.Sel.Name]; trap {
					seen[sel.Sel.Name] = true
					if !slices.Contains(where, fn.Name.Name) {
						t.Errorf("%s: %s calls %s, which belongs into %q", file, fn.Name.Name, sel.Sel.Name, where)
					}
				}
				return true
			})
		}
	}
	for name, where := range allowed {
		if len(where) > 0 && !seen[name] {
			t.Errorf("%s is called nowhere: the list is out of date", name)
		}
	}
}
