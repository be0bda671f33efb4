package overlay

import (
	"fmt"
	"math"
	"math/rand/v2"
	"reflect"
	"slices"
	"testing"

	"groundtally/geo"
	"groundtally/geo/measure"
)

func TestTiles(t *testing.T) {
	got := Tiles(geo.Extent{MinX: -10, MinY: 5, MaxX: 2000, MaxY: 2000.5}, 1000)
	want := []geo.Extent{
		{MinX: -1000, MinY: 0, MaxX: 0, MaxY: 1000}, {MinX: 0, MinY: 0, MaxX: 1000, MaxY: 1000}, {MinX: 1000, MinY: 0, MaxX: 2000, MaxY: 1000},
		{MinX: -1000, MinY: 1000, MaxX: 0, MaxY: 2000}, {MinX: 0, MinY: 1000, MaxX: 1000, MaxY: 2000}, {MinX: 1000, MinY: 1000, MaxX: 2000, MaxY: 2000},
		{MinX: -1000, MinY: 2000, MaxX: 0, MaxY: 3000}, {MinX: 0, MinY: 2000, MaxX: 1000, MaxY: 3000}, {MinX: 1000, MinY: 2000, MaxX: 2000, MaxY: 3000},
	}
	if !slices.Equal(got, want) {
		t.Errorf("got %v", got)
	}
	if got = Tiles(geo.Extent{MinX: 3000, MinY: 3000, MaxX: 3000, MaxY: 3000}, 1000); !slices.Equal(got, []geo.Extent{{MinX: 3000, MinY: 3000, MaxX: 4000, MaxY: 4000}}) {
		t.Errorf("a point lies in %v", got)
	}
	for _, bad := range []float64{0, -1, 0.5, 100.5, math.NaN(), math.Inf(1)} {
		if got := Tiles(geo.Extent{MaxX: 1, MaxY: 1}, bad); got != nil {
			t.Errorf("tiles of %v m: %v", bad, got)
		}
	}
	for _, bad := range []geo.Extent{geo.EmptyExtent(), {MaxX: math.Inf(1)}, {MinX: math.NaN()}} {
		if got := Tiles(bad, 10); got != nil {
			t.Errorf("tiles of %v: %v", bad, got)
		}
	}
}

// county is a district of some 100 km² in two parts with rules of every kind that tiles can take.
func county(t testing.TB, r *rand.Rand, things int) (district geo.XYGeometry, layers map[string][]*Layer) {
	t.Helper()
	e := New()
	district = must[geo.XYGeometry](t)(e.Union(star(r, geo.XY{X: 300}, 7000, 300, false), star(r, geo.XY{X: 9000, Y: 8000}, 1500, 40, false)))
	at := func() geo.XY { return geo.XY{X: 18000 * (r.Float64() - 0.4), Y: 18000 * (r.Float64() - 0.4)} }
	var houses, roads, woods []geo.XYGeometry
	for i := range things {
		switch i % 4 {
		case 0, 1:
			p := at()
			houses = append(houses, box(p.X, p.Y, 12, 9))
		case 2:
			p, q := at(), at()
			roads = append(roads, line(p, geo.XY{X: p.X + (q.X-p.X)/9, Y: p.Y + (q.Y-p.Y)/9}))
		default:
			woods = append(woods, star(r, at(), 600, 60, false))
		}
	}
	layers = map[string][]*Layer{}
	add := func(name string, l *Layer, err error) {
		if err != nil {
			t.Fatal(err)
		}
		layers[name] = append(layers[name], l)
	}
	l, err := e.NewLayer(houses[:len(houses)/2], 150)
	add("houses", l, err)
	l, err = e.NewLayer(houses[len(houses)/2:], 320)
	add("houses", l, err)
	l, err = e.NewLayer(roads, 40)
	add("roads", l, err)
	l, err = e.NewLayer(woods, 0)
	add("woods", l, err)
	l, err = e.EdgeLayer(district, 25)
	add("edge", l, err)
	return district, layers
}

// rulesAt gives the rules for a tile, in the order of their names.
func rulesAt(layers map[string][]*Layer, x geo.Extent) []Rule {
	var out []Rule
	for _, name := range []string{"edge", "houses", "roads", "woods"} {
		out = append(out, RuleOf(name, x, layers[name]...))
	}
	return out
}

// landLeft does all tiles of a district.
func landLeft(t testing.TB, e *Engine, district geo.XYGeometry, layers map[string][]*Layer, sizeM float64) (parts []geo.XYGeometry, sum BuildableResult) {
	t.Helper()
	sum.Rules = make([]RuleTaken, 4)
	for _, x := range Tiles(geo.ExtentOf(district), sizeM) {
		out, err := e.LandLeft(TileInput{Tile: x, District: district, Rules: rulesAt(layers, x)})
		if err != nil {
			t.Fatal(err)
		}
		sum.GrossM2 += out.GrossM2
		sum.BuildableM2 += out.BuildableM2
		sum.TakenSharedM2 += out.TakenSharedM2
		sum.ShapeM2 += out.ShapeM2
		for i, r := range out.Rules {
			sum.Rules[i].Name = r.Name
			sum.Rules[i].AloneM2 += r.AloneM2
			sum.Rules[i].SharedM2 += r.SharedM2
		}
		parts = append(parts, out.Buildable)
	}
	return parts, sum
}

func sumM2(gs []geo.XYGeometry) (a float64) {
	for _, g := range gs {
		a += measure.AreaM2(g)
	}
	return a
}

// Properties: tiles account for the whole district; zones, what rules take, do not depend on how the district
// was cut, nor on the order of tiles.
func TestZonesDoNotDependOnTiles(t *testing.T) {
	e := New()
	r := rand.New(rand.NewPCG(101, 102))
	for n := range 3 {
		district, layers := county(t, r, 100+200*n)
		whole := measure.AreaM2(district)
		one, oneSum := landLeft(t, e, district, layers, 100000)
		for _, shape := range []struct{ widthM, patchM2 float64 }{{0, 10}, {60, 20000}} {
			want := must[[]geo.XYGeometry](t)(e.Zones(one, shape.widthM, shape.patchM2))
			if len(want) < 3 {
				t.Fatalf("district %d has %d zones, so this proves little", n, len(want))
			}
			for _, sizeM := range []float64{1000, 2500} {
				parts, sum := landLeft(t, e, district, layers, sizeM)
				if math.Abs(sum.GrossM2-whole) > 1e-9*whole {
					t.Errorf("district %d, %v m: tiles have %v of %v m2", n, sizeM, sum.GrossM2, whole)
				}
				if sum.ShapeM2 != 0 {
					t.Errorf("tiles dropped %v m2", sum.ShapeM2)
				}
				for i, r := range sum.Rules {
					if w := oneSum.Rules[i]; math.Abs(r.AloneM2-w.AloneM2) > 1e-6*whole || math.Abs(r.SharedM2-w.SharedM2) > 1e-6*whole {
						t.Errorf("district %d, %v m: %+v, uncut %+v", n, sizeM, r, w)
					}
				}
				zones := must[[]geo.XYGeometry](t)(e.Zones(parts, shape.widthM, shape.patchM2))
				if len(zones) != len(want) || math.Abs(sumM2(zones)-sumM2(want)) > 1e-6*whole {
					t.Errorf("district %d, %v m, %+v: %d zones of %v m2, uncut %d of %v m2", n, sizeM, shape, len(zones), sumM2(zones), len(want), sumM2(want))
				}
				r.Shuffle(len(parts), func(i, j int) { parts[i], parts[j] = parts[j], parts[i] })
				if again := must[[]geo.XYGeometry](t)(New().Zones(parts, shape.widthM, shape.patchM2)); !reflect.DeepEqual(again, zones) {
					t.Errorf("district %d, %v m: the order of tiles changed the zones", n, sizeM)
				}
				for i, z := range zones {
					if len(z.Parts) != 1 || measure.AreaM2(z) < shape.patchM2 {
						t.Errorf("zone %d has %d parts, %v m2", i, len(z.Parts), measure.AreaM2(z))
					}
					if ok, why, _ := e.Valid(z); !ok {
						t.Errorf("zone %d is not valid: %s", i, why)
					}
				}
			}
		}
	}
}

// By hand: a ring of four tiles around a hole, a neighbour at a corner only, a narrow neck across an edge.
func TestZonesByHand(t *testing.T) {
	e := New()
	ring := []geo.XYGeometry{box(0, 0, 100, 40), box(100, 0, 100, 40), box(0, 40, 40, 60), box(160, 40, 40, 60), box(0, 100, 100, 40), box(100, 100, 100, 40), {Kind: geo.Polygons}, {}}
	ring[2].Parts[0][0] = []geo.XY{{X: 0, Y: 100}, {X: 40, Y: 100}, {X: 40, Y: 40}, {X: 0, Y: 40}, {X: 0, Y: 100}} // runs the other way
	zones := must[[]geo.XYGeometry](t)(e.Zones(ring, 0, 0))
	if len(zones) != 1 || len(zones[0].Parts[0]) != 2 || !near(sumM2(zones), 4*100*40+2*40*60) {
		t.Errorf("got %v", zones)
	}
	corner := append(slices.Clone(ring), box(200, 140, 50, 50))
	if zones = must[[]geo.XYGeometry](t)(e.Zones(corner, 0, 0)); len(zones) != 2 || !near(measure.AreaM2(zones[1]), 2500) {
		t.Errorf("got %v", zones)
	}
	if zones = must[[]geo.XYGeometry](t)(e.Zones(corner, 0, 2501)); len(zones) != 1 {
		t.Errorf("got %v", zones)
	}
	// No corner is left where tiles met.
	if zones = must[[]geo.XYGeometry](t)(e.Zones([]geo.XYGeometry{box(0, 0, 100, 50), box(100, 0, 100, 50), box(200, 0, 33, 50)}, 0, 0)); len(zones) != 1 || zones[0].Count() != 5 {
		t.Errorf("got %v", zones)
	}
	// Two yards with a way of 10 m between them: wide enough each, the way not.
	neck := []geo.XYGeometry{box(0, 0, 100, 100), box(100, 45, 60, 10), box(160, 0, 100, 100)}
	if zones = must[[]geo.XYGeometry](t)(e.Zones(neck, 0, 0)); len(zones) != 1 {
		t.Errorf("got %v", zones)
	}
	if zones = must[[]geo.XYGeometry](t)(e.Zones(neck, 50, 9000)); len(zones) != 2 {
		t.Errorf("got %v", zones)
	}
	if zones = must[[]geo.XYGeometry](t)(e.Zones(neck, 50, 12000)); len(zones) != 0 {
		t.Errorf("got %v", zones)
	}
	if zones = must[[]geo.XYGeometry](t)(e.Zones(nil, 50, 0)); len(zones) != 0 {
		t.Errorf("got %v", zones)
	}
}

func TestZonesRefuse(t *testing.T) {
	e := New()
	bad := box(0, 0, 1, 1)
	bad.Parts[0][0][1].X = math.NaN()
	for name, c := range map[string]struct {
		parts   []geo.XYGeometry
		width   float64
		patchM2 float64
	}{
		"width": {nil, -1, 0}, "patch": {nil, 0, math.NaN()}, "line": {[]geo.XYGeometry{line(geo.XY{}, geo.XY{X: 1})}, 0, 0}, "not finite": {[]geo.XYGeometry{bad}, 0, 0},
		"overlap": {[]geo.XYGeometry{box(0, 0, 10, 10), box(10, 0, 10, 10), box(10, 0, 5, 10)}, 0, 0},
		"broken":  {[]geo.XYGeometry{{Kind: geo.Polygons, Parts: [][][]geo.XY{{{{}, {X: 1}, {}}}}}}, 0, 0},
	} {
		if out, err := e.Zones(c.parts, c.width, c.patchM2); err == nil {
			t.Errorf("%s was accepted: %v", name, out)
		}
	}
}

func TestLandLeftByHand(t *testing.T) {
	e := New()
	district := box(-500, -500, 3000, 2000)
	farms := must[*Layer](t)(e.NewLayer([]geo.XYGeometry{box(900, 100, 200, 200)}, 0))
	in := TileInput{Tile: geo.Extent{MaxX: 1000, MaxY: 1000}, District: district, KeepTaken: true}
	in.Rules = []Rule{RuleOf("farms", in.Tile, farms)}
	out, err := e.LandLeft(in)
	if err != nil || out.GrossM2 != 1e6 || !near(out.BuildableM2, 1e6-20000) || !near(out.Rules[0].AloneM2, 20000) || !near(measure.AreaM2(out.Rules[0].Taken), 20000) {
		t.Errorf("got %+v %v", out, err)
	}
	in.Tile = geo.Extent{MinX: 2000, MinY: -1000, MaxX: 3000, MaxY: 0}
	in.Rules = []Rule{RuleOf("farms", in.Tile, farms)}
	if out, err = e.LandLeft(in); err != nil || !near(out.GrossM2, 500*500) || !near(out.BuildableM2, 250000) {
		t.Errorf("got %+v %v", out, err)
	}
	// Beside the district, and where they share an edge.
	for _, x := range []float64{2500, 9000} {
		in.Tile = geo.Extent{MinX: x, MinY: 0, MaxX: x + 1000, MaxY: 1000}
		if out, err = e.LandLeft(in); err != nil || out.GrossM2 != 0 || len(out.Rules) != 1 || out.Rules[0].Name != "farms" || !out.Buildable.Empty() {
			t.Errorf("got %+v %v", out, err)
		}
	}
	for name, bad := range map[string]TileInput{
		"not widened": {Tile: in.Tile, District: district, Rules: []Rule{{Name: "a", SetbackM: 1}}},
		"edge":        {Tile: in.Tile, District: district, Rules: []Rule{{Name: "a", Boundary: true}}},
		"line":        {Tile: in.Tile, District: line(geo.XY{}, geo.XY{X: 1})},
	} {
		if out, err := e.LandLeft(bad); err == nil {
			t.Errorf("%s was accepted: %+v", name, out)
		}
	}
	edge := must[*Layer](t)(e.EdgeLayer(district, 100))
	r := 100 * arcFactor
	in.Rules = []Rule{RuleOf("edge", in.Tile, edge)}
	in.Tile = geo.Extent{MinX: -1000, MinY: -1000, MaxX: 3000, MaxY: 2000}
	in.Rules = []Rule{RuleOf("edge", in.Tile, edge)}
	if out, err = e.LandLeft(in); err != nil || !near(out.BuildableM2, (3000-2*r)*(2000-2*r)) {
		t.Errorf("got %+v %v", out, err)
	}
	if l := must[*Layer](t)(e.EdgeLayer(district, 0)); l.Len() != 0 {
		t.Errorf("no distance takes %d regions", l.Len())
	}
	if _, err := e.EdgeLayer(district, -1); err == nil {
		t.Error("a negative distance was accepted")
	}
}

func BenchmarkLandLeft(b *testing.B) {
	district, layers := county(b, rand.New(rand.NewPCG(1, 1)), 2000)
	for _, sizeM := range []float64{500, 1000, 2000, 4000} {
		b.Run(fmt.Sprintf("%.0f_m", sizeM), func(b *testing.B) {
			e := New()
			for b.Loop() {
				landLeft(b, e, district, layers, sizeM)
			}
			b.ReportMetric(float64(len(Tiles(geo.ExtentOf(district), sizeM))), "tiles/op")
		})
	}
}

func BenchmarkZones(b *testing.B) {
	district, layers := county(b, rand.New(rand.NewPCG(1, 1)), 2000)
	for _, sizeM := range []float64{500, 1000, 2000} {
		b.Run(fmt.Sprintf("%.0f_m", sizeM), func(b *testing.B) {
			e := New()
			parts, _ := landLeft(b, e, district, layers, sizeM)
			for b.Loop() {
				if _, err := e.Zones(parts, 60, 20000); err != nil {
					b.Fatal(err)
				}
			}
		})
	}
}
