package overlay

import (
	"errors"
	"math"
	"math/rand/v2"
	"reflect"
	"runtime"
	"strings"
	"sync"
	"testing"

	"github.com/twpayne/go-geos"

	"groundtally/geo"
	"groundtally/geo/measure"
)

func box(x, y, w, h float64) geo.XYGeometry {
	return geo.XYGeometry{Kind: geo.Polygons, Parts: [][][]geo.XY{{{{X: x, Y: y}, {X: x + w, Y: y}, {X: x + w, Y: y + h}, {X: x, Y: y + h}, {X: x, Y: y}}}}}
}

func points(ps ...geo.XY) geo.XYGeometry {
	g := geo.XYGeometry{Kind: geo.Points}
	for _, p := range ps {
		g.Parts = append(g.Parts, [][]geo.XY{{p}})
	}
	return g
}

func line(ps ...geo.XY) geo.XYGeometry {
	return geo.XYGeometry{Kind: geo.Lines, Parts: [][][]geo.XY{{ps}}}
}

// star gives a simple polygon around c; with wild set it crosses itself.
func star(r *rand.Rand, c geo.XY, radius float64, n int, wild bool) geo.XYGeometry {
	var ring []geo.XY
	for i := range n {
		a := 2 * math.Pi * (float64(i) + 0.8*r.Float64()) / float64(n)
		if wild {
			a = 2 * math.Pi * r.Float64()
		}
		d := radius * (0.3 + 0.7*r.Float64())
		ring = append(ring, geo.XY{X: c.X + d*math.Cos(a), Y: c.Y + d*math.Sin(a)})
	}
	return geo.XYGeometry{Kind: geo.Polygons, Parts: [][][]geo.XY{{measure.Close(ring)}}}
}

// nearest gives the least distance from the outline of a buffer to the shape it keeps distance from.
func nearest(buffer, shape geo.XYGeometry) float64 {
	least := math.Inf(1)
	for _, part := range buffer.Parts {
		for _, ring := range part {
			for i := 1; i < len(ring); i++ {
				for k := range 9 {
					t := float64(k) / 8
					p := geo.XY{X: ring[i-1].X + t*(ring[i].X-ring[i-1].X), Y: ring[i-1].Y + t*(ring[i].Y-ring[i-1].Y)}
					_, d := measure.NearestOnOutline(p, shape)
					least = math.Min(least, d)
				}
			}
		}
	}
	return least
}

// The guarantee of Buffer at corners of every angle. With 16 segments asked, the same factor would fail:
// the library makes one step of up to 1.5 sixteenths.
func TestBufferNeverKeepsLess(t *testing.T) {
	e := New()
	const d = 500.0
	worstAsked16, worst, widest := d, d, 0.0
	for turn := 0.25; turn < 179; turn += 0.25 {
		s, c := math.Sincos(turn * math.Pi / 180)
		l := line(geo.XY{X: -3000}, geo.XY{}, geo.XY{X: 3000 * c, Y: 3000 * s})
		b := must[geo.XYGeometry](t)(e.Buffer(l, d))
		worst = math.Min(worst, nearest(b, l))
		// Away from the inner side of the corner nothing is kept further than 0.13 % either.
		for _, p := range b.Parts[0][0] {
			_, far := measure.NearestOnOutline(p, l)
			widest = math.Max(widest, far)
		}
		worstAsked16 = math.Min(worstAsked16, nearest(rawBuffer(t, e, l, d*arcFactor, SegmentsPerQuadrant), l))
	}
	if worst < d-1e-6 {
		t.Errorf("a buffer of %v m keeps only %v m", d, worst)
	}
	if widest > d*1.0013 {
		t.Errorf("a buffer of %v m keeps %v m", d, widest)
	}
	if worstAsked16 > d-0.1 {
		t.Errorf("16 segments asked keep %v m: the factor 1.5 in askedSegments has lost its reason", worstAsked16)
	}
}

func TestBufferNeverKeepsLessProperty(t *testing.T) {
	e := New()
	r := rand.New(rand.NewPCG(11, 12))
	for range 150 {
		g := star(r, geo.XY{X: 2e4 * r.Float64(), Y: 2e4 * r.Float64()}, 50+800*r.Float64(), 4+r.IntN(60), false)
		d := 5 + 300*r.Float64()
		b := must[geo.XYGeometry](t)(e.Buffer(g, d))
		if got := nearest(b, g); got < d-1e-6 {
			t.Fatalf("a buffer of %v m keeps %v m", d, got)
		}
		for _, p := range b.Parts[0][0] {
			if measure.Inside(p, g) {
				t.Fatal("a buffer's outline lies in the polygon")
			}
		}
		in := must[geo.XYGeometry](t)(e.Buffer(g, -d/4))
		if !in.Empty() {
			if got := nearest(in, g); got < d/4-1e-6 {
				t.Fatalf("an inward buffer of %v m keeps %v m", d/4, got)
			}
		}
	}
}

func TestFailedOverlayIsAnError(t *testing.T) {
	e := New()
	// Crossing polygons go straight to the overlay, past every check, where the library gives nil.
	r := rand.New(rand.NewPCG(2, 3))
	failed := 0
	for range 40 {
		a, b := star(r, geo.XY{}, 100, 8, true), star(r, geo.XY{}, 100, 8, true)
		err := e.do("test", func() { e.overlay(difference, e.raw(a), e.raw(b)) })
		if err != nil {
			failed++
			if !errors.Is(err, ErrNotComputed) {
				t.Fatalf("got %v", err)
			}
		}
	}
	if failed == 0 {
		t.Error("no overlay failed, so this test proves nothing")
	}
	if e.retries == 0 {
		t.Error("no overlay was tried again")
	}
	// The engine still works.
	if a := must[float64](t)(e.AreaM2(box(0, 0, 10, 10))); a != 100 {
		t.Errorf("area %v", a)
	}
}

func TestPlausible(t *testing.T) {
	for _, c := range []struct {
		op        operation
		got, a, b float64
		want      bool
	}{
		{difference, 60, 100, 40, true}, {difference, 100, 100, 40, true}, {difference, 59, 100, 40, false},
		{difference, 101, 100, 40, false}, {difference, -20, 100, 200, false}, {difference, 0, 100, 200, true},
		{intersection, 40, 100, 40, true}, {intersection, 41, 100, 40, false}, {intersection, math.NaN(), 1, 1, false},
		{union, 100, 100, 40, true}, {union, 140, 100, 40, true}, {union, 99, 100, 40, false}, {union, 141, 100, 40, false},
		{union, math.Inf(1), 1, 1, false},
	} {
		if got := plausible(c.op, c.got, c.a, c.b); got != c.want {
			t.Errorf("%v of %v, %v giving %v: %v", c.op, c.a, c.b, c.got, got)
		}
	}
}

func TestInvalidInputIsNamed(t *testing.T) {
	e := New()
	bow := wkt(t, "POLYGON((0 0,10 10,10 0,0 10,0 0))")
	if _, err := e.Difference(box(0, 0, 5, 5), bow); !errors.Is(err, ErrInvalid) || !strings.Contains(err.Error(), "Self-intersection") {
		t.Errorf("got %v", err)
	}
	if ok, reason, err := e.Valid(bow); ok || reason == "" || err != nil {
		t.Errorf("got %v %q %v", ok, reason, err)
	}
	g, rep, err := e.Repair(bow)
	if err != nil || !rep.Changed || rep.Reason == "" || rep.AfterM2 != 50 || !rep.Flagged {
		t.Errorf("got %+v %v", rep, err)
	}
	if ok, _, _ := e.Valid(g); !ok {
		t.Error("the repaired polygon is not valid")
	}
	// Valid parts that share an edge are joined.
	two := geo.XYGeometry{Kind: geo.Polygons, Parts: append(box(0, 0, 10, 10).Parts, box(10, 0, 10, 10).Parts...)}
	out := must[geo.XYGeometry](t)(e.Intersection(two, box(0, 0, 20, 5)))
	if len(out.Parts) != 1 || measure.AreaM2(out) != 100 {
		t.Errorf("got %v", out)
	}
}

func TestNotFinite(t *testing.T) {
	e := New()
	for _, v := range []float64{math.NaN(), math.Inf(1), math.Inf(-1)} {
		bad := box(0, 0, 10, 10)
		bad.Parts[0][0][2].Y = v
		if _, err := e.Union(bad); err == nil {
			t.Errorf("Union accepted %v", v)
		}
		if _, _, err := e.Repair(bad); err == nil {
			t.Errorf("Repair accepted %v", v)
		}
		if _, err := e.Buffer(box(0, 0, 1, 1), v); err == nil {
			t.Errorf("Buffer accepted %v m", v)
		}
		if _, err := e.Buildable(BuildableInput{Site: box(0, 0, 9, 9), Rules: []Rule{{Name: "r", SetbackM: 1, Features: []geo.XYGeometry{points(geo.XY{X: v, Y: 1e9})}}}}); err == nil {
			t.Errorf("Buildable accepted %v", v)
		}
	}
}

func TestBrokenRings(t *testing.T) {
	e := New()
	open := geo.XYGeometry{Kind: geo.Polygons, Parts: [][][]geo.XY{{{{}, {X: 10}, {X: 10, Y: 10}, {Y: 10}}}}}
	short := geo.XYGeometry{Kind: geo.Polygons, Parts: [][][]geo.XY{{{{}, {X: 10}, {}}}}}
	for _, g := range []geo.XYGeometry{open, short, {Kind: geo.Polygons, Parts: [][][]geo.XY{{}}}, {Kind: geo.Points, Parts: [][][]geo.XY{{{{}, {}}}}}, line(geo.XY{})} {
		if _, err := e.AreaM2(g); err == nil && !g.Empty() {
			t.Errorf("%v was accepted", g)
		}
	}
	g, rep, err := e.Repair(open)
	if err != nil || rep.ClosedRings != 1 || !rep.Changed || rep.Flagged || measure.AreaM2(g) != 100 {
		t.Errorf("got %v %+v %v", g, rep, err)
	}
	g, rep, err = e.Repair(short)
	if err != nil || rep.DroppedRings != 1 || !g.Empty() {
		t.Errorf("got %v %+v %v", g, rep, err)
	}
	holed := box(0, 0, 10, 10)
	holed.Parts[0] = append(holed.Parts[0], []geo.XY{{X: 1}, {X: 2}})
	if g, rep, err = e.Repair(holed); err != nil || rep.DroppedRings != 1 || measure.AreaM2(g) != 100 {
		t.Errorf("got %v %+v %v", g, rep, err)
	}
	if g, rep, err = e.Repair(box(0, 0, 10, 10)); err != nil || rep.Changed {
		t.Errorf("got %v %+v %v", g, rep, err)
	}
}

// A second destruction of a prepared geometry would end the program during the collection.
func TestPreparedSurvivesCollection(t *testing.T) {
	e := New()
	for range 200 {
		if yes := must[bool](t)(e.Covers(box(0, 0, 10, 10), box(1, 1, 2, 2))); !yes {
			t.Fatal("not covered")
		}
	}
	for range 5 {
		runtime.GC()
	}
	if must[bool](t)(e.Covers(box(0, 0, 10, 10), box(1, 1, 20, 2))) {
		t.Error("covered")
	}
}

func TestSecondGoroutineIsRefused(t *testing.T) {
	e := New()
	inside, done := make(chan bool), make(chan bool)
	var wg sync.WaitGroup
	wg.Go(func() {
		if err := e.do("long", func() { inside <- true; <-done }); err != nil {
			t.Error(err)
		}
	})
	<-inside
	if _, err := e.AreaM2(box(0, 0, 1, 1)); !errors.Is(err, ErrBusy) {
		t.Errorf("got %v, want ErrBusy", err)
	}
	if err := e.Close(); !errors.Is(err, ErrBusy) {
		t.Errorf("got %v, want ErrBusy", err)
	}
	done <- true
	wg.Wait()
	if err := e.Close(); err != nil {
		t.Fatal(err)
	}
	if _, err := e.AreaM2(box(0, 0, 1, 1)); !errors.Is(err, ErrClosed) {
		t.Errorf("got %v, want ErrClosed", err)
	}
}

func TestPanicEndsAtTheBorder(t *testing.T) {
	e := New()
	old := e.ctx
	err := e.do("job", func() {
		e.raw(box(0, 0, 1, 1))
		var g *geos.Geom
		g.Area() // what using a nil result would do
	})
	if !errors.Is(err, ErrNotComputed) || !strings.HasPrefix(err.Error(), "job: ") {
		t.Errorf("got %v", err)
	}
	if e.ctx == old {
		t.Error("the context was kept after a panic")
	}
	if len(e.live) != 0 {
		t.Error("geometries are left over")
	}
	if a := must[float64](t)(e.AreaM2(box(0, 0, 3, 3))); a != 9 {
		t.Errorf("area %v", a)
	}
}

func TestNothingIsLeftAlive(t *testing.T) {
	made, ended := 0, 0
	e := &Engine{ctx: geos.NewContext(geos.WithGeomFinalizeFunc(func(*geos.Geom) { ended++ }))}
	site := box(0, 0, 500, 500)
	rules := []Rule{{Name: "a", SetbackM: 60, Features: []geo.XYGeometry{points(geo.XY{X: 1, Y: 1}, geo.XY{X: 90, Y: 40})}}, {Name: "b", SetbackM: 20, Boundary: true}, {Name: "c", SetbackM: 5, Features: []geo.XYGeometry{line(geo.XY{}, geo.XY{X: 800, Y: 700})}}}
	for range 50 {
		if _, err := e.Buildable(BuildableInput{Site: site, Rules: rules, SmallestWidthM: 30}); err != nil {
			t.Fatal(err)
		}
		made++
	}
	if err := e.Close(); err != nil { // what it remembers of the site
		t.Fatal(err)
	}
	for range 5 {
		runtime.GC()
	}
	// The binding tells only of geometries that the collector, not Destroy, had to free.
	if made != 50 || ended != 0 {
		t.Errorf("the collector had to free %d geometries", ended)
	}
}

func TestNormalForm(t *testing.T) {
	e := New()
	a := must[geo.XYGeometry](t)(e.Union(box(0, 0, 10, 10), box(5, 5, 10, 10), box(100, 0, 5, 5)))
	b := must[geo.XYGeometry](t)(e.Union(box(100, 0, 5, 5), box(5, 5, 10, 10), box(0, 0, 10, 10)))
	if !reflect.DeepEqual(a, b) {
		t.Errorf("%v differs from %v", a, b)
	}
	if len(a.Parts) != 2 || a.Parts[0][0][0] != (geo.XY{}) || !measure.CounterClockwise(a.Parts[0][0]) {
		t.Errorf("got %v", a)
	}
	h := must[geo.XYGeometry](t)(e.Difference(box(0, 0, 10, 10), box(2, 2, 3, 3)))
	if len(h.Parts) != 1 || len(h.Parts[0]) != 2 || measure.CounterClockwise(h.Parts[0][1]) {
		t.Errorf("got %v", h)
	}
}

func TestOperations(t *testing.T) {
	e := New()
	g := must[geo.XYGeometry](t)(e.Intersection(line(geo.XY{X: -5, Y: 5}, geo.XY{X: 30, Y: 5}), box(0, 0, 10, 10)))
	if g.Kind != geo.Lines || measure.LengthM(g) != 10 {
		t.Errorf("got %v", g)
	}
	// Polygons that touch in an edge share no area.
	if g = must[geo.XYGeometry](t)(e.Intersection(box(0, 0, 10, 10), box(10, 0, 10, 10))); !g.Empty() || g.Kind != geo.Polygons {
		t.Errorf("got %v", g)
	}
	var none geo.XYGeometry
	if g = must[geo.XYGeometry](t)(e.Difference(box(0, 0, 1, 1), none)); measure.AreaM2(g) != 1 {
		t.Errorf("got %v", g)
	}
	if g = must[geo.XYGeometry](t)(e.Difference(none, box(0, 0, 1, 1))); !g.Empty() {
		t.Errorf("got %v", g)
	}
	if g = must[geo.XYGeometry](t)(e.Clip(box(0, 0, 10, 10), geo.Extent{MinX: 5, MinY: -5, MaxX: 50, MaxY: 5})); measure.AreaM2(g) != 25 {
		t.Errorf("got %v", g)
	}
	if g = must[geo.XYGeometry](t)(e.Clip(box(0, 0, 10, 10), geo.Extent{MinX: 50, MinY: 50, MaxX: 60, MaxY: 60})); !g.Empty() {
		t.Errorf("got %v", g)
	}
	if _, err := e.DistanceM(none, box(0, 0, 1, 1)); err == nil {
		t.Error("nothing has a distance")
	}
	if _, err := e.Union(box(0, 0, 1, 1), line(geo.XY{}, geo.XY{X: 1})); err == nil {
		t.Error("a polygon was joined with a line")
	}
	if !must[bool](t)(e.Intersects(box(0, 0, 10, 10), line(geo.XY{X: 10, Y: -1}, geo.XY{X: 10, Y: 1}))) {
		t.Error("touching shapes do not meet")
	}
	if o := must[geo.XYGeometry](t)(Outline(box(0, 0, 1, 1))); o.Kind != geo.Lines || measure.LengthM(o) != 4 {
		t.Errorf("got %v", o)
	}
	if _, err := Outline(points(geo.XY{})); err == nil {
		t.Error("a point has an outline")
	}
}

// Property: the quick clip agrees with the overlay.
func TestClipAgainstIntersection(t *testing.T) {
	e := New()
	r := rand.New(rand.NewPCG(21, 22))
	for range 400 {
		g := star(r, geo.XY{X: 100 * r.Float64(), Y: 100 * r.Float64()}, 150, 4+r.IntN(40), false)
		x := geo.Extent{MinX: -20, MinY: -30, MaxX: 60 + 50*r.Float64(), MaxY: 80 * r.Float64()}
		a := must[geo.XYGeometry](t)(e.Clip(g, x))
		b := must[geo.XYGeometry](t)(e.Intersection(g, box(x.MinX, x.MinY, x.MaxX-x.MinX, x.MaxY-x.MinY)))
		if math.Abs(measure.AreaM2(a)-measure.AreaM2(b)) > 1e-6*(1+measure.AreaM2(b)) {
			t.Fatalf("clip %v m2, intersection %v m2", measure.AreaM2(a), measure.AreaM2(b))
		}
		if ok, why, _ := e.Valid(a); !ok {
			t.Fatalf("the clip is not valid: %s", why)
		}
	}
}

// After Repair no overlay of wild stars fails, whatever they were.
func TestRepairMakesOverlaysPossible(t *testing.T) {
	e := New()
	r := rand.New(rand.NewPCG(31, 32))
	for range 300 {
		a, _, err := e.Repair(star(r, geo.XY{}, 100, 8, true))
		if err != nil {
			t.Fatal(err)
		}
		b, _, err := e.Repair(star(r, geo.XY{X: 30}, 100, 8, true))
		if err != nil {
			t.Fatal(err)
		}
		d := must[geo.XYGeometry](t)(e.Difference(a, b))
		x := must[geo.XYGeometry](t)(e.Intersection(a, b))
		if s, want := measure.AreaM2(d)+measure.AreaM2(x), measure.AreaM2(a); math.Abs(s-want) > 1e-6*want {
			t.Fatalf("difference and intersection give %v of %v m2", s, want)
		}
	}
}

func FuzzDecode(f *testing.F) {
	b, err := encode(nil, box(0, 0, 1, 1))
	if err != nil {
		f.Fatal(err)
	}
	f.Add(b)
	f.Add([]byte{1, 7, 0, 0, 0, 255, 255, 255, 255})
	f.Fuzz(func(t *testing.T, data []byte) {
		g := geo.XYGeometry{Kind: geo.Polygons}
		d := decoder{b: data}
		if d.decode(&g) == nil {
			g.Each(func(p geo.XY) {
				if !p.Finite() {
					t.Error("a position that is not finite came through")
				}
			})
		}
	})
}
