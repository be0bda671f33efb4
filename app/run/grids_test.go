package run

import (
	"context"
	"fmt"
	"math"
	"reflect"
	"slices"
	"strings"
	"testing"

	"groundtally/app/files"
	"groundtally/app/study"
	"groundtally/geo"
	"groundtally/geo/formats/gridfile"
	"groundtally/geo/raster"
	"groundtally/scoring"
)

// Between the centres of cells a grid is bilinear, and a constant grid gives its constant to the last digit; beside
// a void there is no value, save where the void has no weight; outside there is none.
func TestValuesOfAGrid(t *testing.T) {
	const nod = -9999
	g := &raster.Grid{NCols: 4, NRows: 3, XLL: 100, YLL: 50, CellX: 20, CellY: 10, NoData: nod, Values: []float32{
		6.7, 7.1, 8.2, nod, // centres at y = 75
		5.5, 6.25, 9, 4,
		3, 2, 1, 10,
	}}
	for _, c := range []struct {
		name string
		x, y float64
		want float64
		is   gridState
	}{
		{"a centre", 110, 75, 6.7, gridKnown},
		{"another centre", 150, 65, 9, gridKnown},
		{"the last centre", 170, 55, 10, gridKnown},
		{"amid four centres", 120, 70, (6.7 + 7.1 + 5.5 + 6.25) / 4, gridKnown},
		{"between two centres", 130, 60, (6.25 + 2) / 2, gridKnown},
		{"a quarter to the east", 115, 55, 2.75, gridKnown},
		{"beside a void", 160, 74, 0, gridVoid},
		{"in the void", 170, 75, 0, gridVoid},
		{"on the line of centres beside the void", 150, 75, 8.2, gridKnown},
		{"south of the void", 170, 65, 4, gridKnown},
		{"in the outer half cell", 101, 51, 3, gridKnown},
		{"west of it", 99.9, 60, 0, gridOutside},
		{"north of it", 120, 80.1, 0, gridOutside},
		{"nowhere", math.NaN(), 60, 0, gridOutside},
	} {
		if got, is := gridValue(g, c.x, c.y); is != c.is || math.Abs(got-c.want) > 1e-12 {
			t.Errorf("%s: %v, %v; want %v, %v", c.name, got, is, c.want, c.is)
		}
	}
	if got, _ := gridValue(g, 110, 75); got != 6.7 {
		t.Errorf("a file's 6.7 is %v", got)
	}
	for i := range g.Values {
		g.Values[i] = 6.7
	}
	for i := range 50 {
		if got, _ := gridValue(g, 101+float64(i)*1.53, 51+float64(i)*0.53); got != 6.7 {
			t.Fatalf("a constant grid of 6.7 gives %v", got)
		}
	}
}

// flat is the frame's own projection, so that cells stand where the hand reckons with them.
const flat = "+proj=laea +lat_0=48 +lon_0=9 +datum=WGS84 +units=m +type=crs"

// grid adds a grid of 8 by 8 cells around a centre in the frame. Without a match it is a grid of wind of which nothing
// was said, as in studies of earlier editions.
func (p *plain) grid(role, name string, x, y, cell float64, match map[string]string, unit string, value func(c, r int) string) {
	p.t.Helper()
	const n = 8
	var b strings.Builder
	fmt.Fprintf(&b, "ncols %d\nnrows %d\nxllcorner %v\nyllcorner %v\ncellsize %v\nNODATA_value -9999\n", n, n, x-n/2*cell, y-n/2*cell, cell)
	for r := range n {
		for c := range n {
			b.WriteString(value(c, r) + " ")
		}
		b.WriteByte('\n')
	}
	tools, done := files.NewTools()
	defer done()
	in := study.Import{File: name + ".asc", Base: name + ".asc", Blob: []byte(b.String()), Media: gridfile.ASCIIGrid, Role: role, Name: name, CRSOption: flat, Match: match, Ledger: study.Ledger{Read: 1}}
	if match == nil {
		in.Match, unit = at100, "m/s"
	}
	if unit != "" {
		in.Units = map[string]string{study.GridBand: unit}
	}
	snap, err := p.s.Snapshot()
	if err != nil {
		p.t.Fatal(err)
	}
	if slices.ContainsFunc(snap.Layers, func(l study.LayerRecord) bool { return l.Name == name }) {
		in.Replace = name
	}
	rec, err := p.s.AddLayer(context.Background(), in, tools)
	if err != nil {
		p.t.Fatal(err)
	}
	r, _ := catalog.Role(role)
	was := study.Canonical(rec)
	if match == nil {
		rec.Match, rec.Units = map[string]string{}, map[string]string{}
	} else if qs := study.DescribeGrid(&rec, in, r, snap); len(qs) > 0 {
		p.t.Fatal(qs)
	}
	if now := study.Canonical(rec); string(now) != string(was) {
		if _, err := p.s.Edit(context.Background(), "add", "test", []study.Change{{Kind: study.LayerRecKind, Key: name, Old: was, New: now}}, nil); err != nil {
			p.t.Fatal(err)
		}
	}
}

// elsewhere puts a layer's coordinates into another system.
func (p *plain) elsewhere(name string) {
	p.t.Helper()
	snap, err := p.s.Snapshot()
	if err != nil {
		p.t.Fatal(err)
	}
	for _, rec := range snap.Layers {
		if rec.Name != name {
			continue
		}
		was := study.Canonical(rec)
		rec.CRS = "EPSG:3035"
		if _, err := p.s.Edit(context.Background(), "add", "test", []study.Change{{Kind: study.LayerRecKind, Key: name, Old: was, New: study.Canonical(rec)}}, nil); err != nil {
			p.t.Fatal(err)
		}
	}
}

func all(text string) func(int, int) string { return func(int, int) string { return text } }

func (p *plain) results(cache Cache) *Results {
	p.t.Helper()
	snap, err := p.s.Snapshot()
	if err != nil {
		p.t.Fatal(err)
	}
	e := &Engine{Params: shipped(p.t), Load: StoreLoader(p.s.Store()), Cache: cache, Cores: 2}
	r, err := e.Compute(context.Background(), snap)
	if err != nil {
		p.t.Fatal(err)
	}
	return r
}

// computed gives the only candidate.
func (p *plain) computed(cache Cache) *Candidate {
	p.t.Helper()
	r := p.results(cache)
	if len(r.Candidates) != 1 {
		p.t.Fatalf("%d candidates", len(r.Candidates))
	}
	return &r.Candidates[0]
}

func (p *plain) leaf(c *Candidate, name string) Leaf {
	p.t.Helper()
	for _, l := range c.Leaves() {
		if l.Name == name {
			return l
		}
	}
	p.t.Fatalf("no fact %s; %s %s", name, c.Status, c.Reason)
	return Leaf{}
}

func windYield(t *testing.T) *plain {
	p := windStudy(t)
	p.set("plant.wind.rated_kw", "2000", "plant.wind.fit_machines", "2")
	return p
}

// numbers gives every consequence without the notices, which say where the wind is from.
func numbers(c *Candidate) []scoring.Consequence {
	out := c.All()
	for i := range out {
		out[i].Notices = nil
	}
	return out
}

var at100 = map[string]string{"mean_speed": study.GridBand, "height": "100"}

func TestAConstantGridOfWindIsTheTypedSpeed(t *testing.T) {
	typed := windYield(t)
	typed.set("wind.typed_mean_speed_m_per_s", "6.7", "wind.typed_height_m", "80")
	want := typed.computed(nil)
	if typed.leaf(want, "wind_p50_mwh").Source != "wind yield" {
		t.Errorf("without grids the source is %q", typed.leaf(want, "wind_p50_mwh").Source)
	}
	grid := windYield(t)
	grid.grid("wind_resource", "Wind 80 m", 30, -70, 250, map[string]string{"mean_speed": study.GridBand, "height": "80"}, "m/s", all("6.7"))
	got := grid.computed(nil)
	snap, err := grid.s.Snapshot()
	if err != nil {
		t.Fatal(err)
	}
	if a, b := numbers(want), numbers(got); !reflect.DeepEqual(a, b) {
		t.Errorf("%v\n%v", a, b)
	}
	if x := grid.leaf(got, "wind_p50_mwh"); x.State != scoring.Number || x.X <= 0 || x.Source != `wind yield from the grid "Wind 80 m" (mean_speed, 80 m above ground, cells of 250 m)` {
		t.Errorf("%+v", x)
	}
	if slices.Contains(got.Notices, "nearest_resource") || !slices.Contains(got.Notices, "rayleigh") {
		t.Errorf("notices %v", got.Notices)
	}
	u, err := Unfold(shipped(t), snap, got, "energy_p50_mwh_per_yr")
	if err != nil {
		t.Fatal(err)
	}
	named := false
	var walk func(u *Unfolding)
	walk = func(u *Unfolding) {
		named = named || strings.Contains(u.Source, `grid "Wind 80 m"`)
		for _, in := range u.Inputs {
			walk(in)
		}
	}
	if walk(u); !named {
		t.Error("the unfolded energy does not name the grid")
	}
}

func TestWhichWindServes(t *testing.T) {
	p := windYield(t)
	cache := &Memory{}
	look := func(what, source, why string) float64 {
		t.Helper()
		c := p.computed(cache)
		fresh := p.computed(nil)
		if !reflect.DeepEqual(c.All(), fresh.All()) || !reflect.DeepEqual(c.Leaves(), fresh.Leaves()) {
			t.Errorf("%s: kept results differ from a fresh run", what)
		}
		x := p.leaf(c, "wind_p50_mwh")
		if (why == "") != (x.State == scoring.Number) || !strings.Contains(x.Why, why) || !strings.Contains(x.Source, source) {
			t.Errorf("%s: %v %q, source %q; want %q, %q", what, x.State, x.Why, x.Source, why, source)
		}
		return x.X
	}
	look("nothing", "wind yield", "no_layer:wind_resource")
	p.grid("wind_resource", "Far", 9000, 9000, 250, at100, "m/s", all("7"))
	look("outside alone", "", `lies outside the grid "Far"`)
	p.set("wind.typed_mean_speed_m_per_s", "6", "wind.typed_height_m", "100")
	six := look("outside, and typed", "from the typed mean speed; the site lies outside", "")
	p.add("wind_resource", []string{"height", "mean_speed"}, thing{geo.XYGeometry{Kind: geo.Points, Parts: [][][]geo.XY{{{{X: 300, Y: 400}}}}}, map[string]string{"height": "100", "mean_speed": "6.5"}})
	if got := look("outside, and a point", "from the point of wind_resource at 300, 400, 500 m off; the site lies outside", ""); got <= six {
		t.Errorf("6.5 m/s give %v, 6 m/s %v", got, six)
	}
	p.grid("wind_resource", "Here", 0, 0, 250, at100, "m/s", all("7"))
	seven := look("inside", `from the grid "Here"`, "")
	p.elsewhere("Here") // the same bytes in another system
	look("in another system", "from the point of", "")
	p.grid("wind_resource", "Here", 0, 0, 250, at100, "km/h", all("25.2"))
	if got := look("in km/h", `from the grid "Here"`, ""); math.Abs(got/seven-1) > 1e-12 {
		t.Errorf("25.2 km/h give %v, 7 m/s %v", got, seven)
	}
	// The middle of the site is the corner of four cells.
	p.grid("wind_resource", "Here", 0, 0, 250, at100, "m/s", func(c, r int) string {
		return map[[2]int]string{{3, 3}: "6", {4, 3}: "6.5", {3, 4}: "7.5", {4, 4}: "8"}[[2]int{c, r}] + map[bool]string{true: "", false: "1"}[c >= 3 && c <= 4 && r >= 3 && r <= 4]
	})
	if got := look("amid four cells", `from the grid "Here"`, ""); math.Abs(got/seven-1) > 1e-9 {
		t.Errorf("the mean of the four, 7 m/s, gives %v, not %v", got, seven)
	}
	p.grid("wind_resource", "Higher", 0, 0, 500, map[string]string{"weibull_k": study.GridBand, "height": "120"}, "", all("2"))
	look("k alone", `from the grid "Here"`, "")
	p.grid("wind_resource", "Higher A", 0, 0, 250, map[string]string{"weibull_a": study.GridBand, "height": "120"}, "m/s", all("9"))
	look("further from the hub", `from the grid "Here"`, "")
	p.set("plant.wind.hub_height_m", "115")
	look("nearer to the hub", `from the grid "Higher A" (weibull_a, 120 m above ground, cells of 250 m) and grid "Higher" (weibull_k`, "")
	p.set("plant.wind.hub_height_m", "100")
	p.set("plant.wind.hub_height_m", "110") // as far from 100 m as from 120 m
	look("between two heights", `from the grid "Here"`, "")
	p.set("plant.wind.hub_height_m", "100")
	p.grid("wind_resource", "Unsaid", 0, 0, 250, nil, "", all("9"))
	look("a grid of which nothing was said", `the grid "Unsaid" is not read: it is not said what its values are`, "")
	p.grid("wind_resource", "Here", 0, 0, 250, at100, "m/s", func(c, r int) string { return map[bool]string{true: "-9999", false: "7"}[c == 4 && r == 4] })
	p.set("plant.wind.hub_height_m", "90") // the one at 120 m serves still
	look("a void, and another height", `grid "Higher A"`, "")
	for _, name := range []string{"Higher", "Higher A"} {
		if err := p.s.RemoveLayer(context.Background(), name, "test"); err != nil {
			t.Fatal(err)
		}
	}
	look("a void", "", `the grid "Here" (mean_speed, 100 m above ground, cells of 250 m) has no value at the site; it is not filled`)
	p.grid("wind_resource", "Here", 0, 0, 250, at100, "m/s", all("-3"))
	look("no wind", "", "is no wind")
}

func TestGridsOfSunlight(t *testing.T) {
	ghi := [12]float64{24, 41, 82.4, 121, 155, 165, 170.2, 146, 102, 58, 28, 20}
	study0 := func() *plain {
		p := newPlain(t)
		p.add("parcels", []string{"parcel_id"}, thing{square(-100, -100, 200), map[string]string{"parcel_id": "S.1"}})
		p.set("plant.sun.technology", "solar_fixed", "rule.exclude.dwellings", "no", "rule.exclude.roads", "no")
		return p
	}
	temps := func(p *plain) {
		for m := range 12 {
			p.set(fmt.Sprintf("solar.typed_temperature_%d_degc", m+1), fmt.Sprint(m-2))
		}
	}
	typed := study0()
	temps(typed)
	for m := range 12 {
		typed.set(fmt.Sprintf("solar.typed_ghi_%d_kwh_per_m2", m+1), fmt.Sprint(ghi[m]))
	}
	want := typed.computed(nil)
	if x := typed.leaf(want, "solar_p50_mwh"); x.State != scoring.Number || x.Source != "solar yield" {
		t.Fatalf("typed: %+v", x)
	}
	p := study0()
	sun := func(field string, m int, unit, value string) {
		p.grid("solar_resource", fmt.Sprintf("%s %02d", field, m+1), 0, 0, 250, map[string]string{field: study.GridBand, "month": fmt.Sprint(m + 1)}, unit, all(value))
	}
	cache := &Memory{}
	look := func(what, source, why string) *Candidate {
		t.Helper()
		c := p.computed(cache)
		x := p.leaf(c, "solar_p50_mwh")
		if (why == "") != (x.State == scoring.Number) || !strings.Contains(x.Why, why) || !strings.Contains(x.Source, source) {
			t.Errorf("%s: %v %q, source %q; want %q, %q", what, x.State, x.Why, x.Source, why, source)
		}
		return c
	}
	for m := range 12 {
		if m == 6 {
			look("six months", "", "not read, because none is of July")
		}
		sun("ghi", m, "kWh/(m2 month)", fmt.Sprint(ghi[m]))
	}
	look("no temperatures", "", "have no temperatures beside them")
	temps(p)
	if got := look("with typed temperatures", `from the grid "ghi 01" (ghi, January, cells of 250 m) and those of the other months, temperatures from typed monthly values`, ""); !reflect.DeepEqual(numbers(want), numbers(got)) {
		t.Error("constant grids of sunlight give other figures than the same typed values")
	}
	for m := range 12 {
		sun("temperature", m, "degC", fmt.Sprint(m-2))
	}
	if got := look("with grids of temperature", `temperatures from the grid "temperature 01"`, ""); !reflect.DeepEqual(numbers(want), numbers(got)) {
		t.Error("constant grids of sunlight and temperature give other figures than the same typed values")
	}
	// 30 days of 5.5 kWh/m2 are June's 165.
	sun("ghi", 5, "kWh/(m2 day)", "5.5")
	if got := look("a sum of a day", "", ""); !reflect.DeepEqual(numbers(want), numbers(got)) {
		t.Error("a June of 5.5 kWh/m2 a day is not one of 165 kWh/m2")
	}
	snap, err := p.s.Snapshot()
	if err != nil {
		t.Fatal(err)
	}
	c := p.computed(cache)
	course, err := NewSurveyor(snap, shipped(t), StoreLoader(p.s.Store()), cache).Course(context.Background(), c)
	if err != nil || !course.Months[6].OK() || course.Months[6].X <= course.Months[0].X {
		t.Errorf("months %v, %v", course, err)
	}
	sun("ghi", 2, "kWh/(m2 month)", "-9999")
	look("a void", "", `the grid "ghi 03" (ghi, March, cells of 250 m) has no value at the site`)
	sun("ghi", 2, "kWh/(m2 month)", "900")
	look("no sunlight", "", "is no sunlight")
	for m := range 12 {
		p.grid("solar_resource", fmt.Sprintf("ghi %02d", m+1), 9000, 9000, 250, map[string]string{"ghi": study.GridBand, "month": fmt.Sprint(m + 1)}, "kWh/(m2 month)", all("50"))
	}
	look("outside", "", `the site lies outside the grid "ghi 01"`)
	for m := range 12 {
		p.set(fmt.Sprintf("solar.typed_ghi_%d_kwh_per_m2", m+1), fmt.Sprint(ghi[m]))
	}
	if got := look("outside, and typed", `from typed monthly values; the site lies outside the grid "ghi 01"`, ""); !reflect.DeepEqual(numbers(want), numbers(got)) {
		t.Error("outside the grids the typed values give other figures")
	}
}
