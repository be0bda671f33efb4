package files

import (
	"context"
	"errors"
	"fmt"
	"strings"
	"testing"
	"time"

	"groundtally/app/study"
	"groundtally/app/study/studytest"
	"groundtally/assets"
	"groundtally/geo"
)

// bench is an empty study to which files are added.
type bench struct {
	t   *testing.T
	s   *study.Study
	dir string
}

func newBench(t *testing.T) *bench {
	t.Helper()
	cat, err := study.LoadCatalog(assets.FS())
	if err != nil {
		t.Fatal(err)
	}
	s, err := study.Open(context.Background(), studytest.New(), cat, study.Options{Clock: func() time.Time { return time.Unix(0, 0) }})
	if err != nil {
		t.Fatal(err)
	}
	return &bench{t, s, t.TempDir()}
}

// add adds a file of the given features, each "GEOMETRY|{properties}".
func (b *bench) add(name, role, head string, change func(*study.Import), features ...string) (study.LayerRecord, error) {
	b.t.Helper()
	var list []string
	for _, f := range features {
		g, props, _ := strings.Cut(f, "|")
		if props == "" {
			props = "{}"
		}
		list = append(list, fmt.Sprintf(`{"type":"Feature","geometry":%s,"properties":%s}`, g, props))
	}
	path := put(b.t, b.dir, name, fmt.Sprintf(`{"type":"FeatureCollection",%s"features":[%s]}`, head, strings.Join(list, ",")))
	in, err := Import(context.Background(), path, study.ReadOptions{})
	if err != nil {
		return study.LayerRecord{}, err
	}
	in.Role, in.AcceptProposals = role, true
	if change != nil {
		change(&in)
	}
	tools, done := NewTools()
	defer done()
	return b.s.AddLayer(context.Background(), in, tools)
}

func codes(ns []geo.Notice) string {
	var out []string
	for _, n := range ns {
		out = append(out, n.Code+" "+n.Feature)
	}
	return strings.Join(out, "; ")
}

// box is a polygon in degrees; its sides are about 75 m to the east and 111 m to the north for 0.001 degrees.
func box(w, s, e, n float64, holes ...string) string {
	rings := append([]string{fmt.Sprintf("[[%v,%v],[%v,%v],[%v,%v],[%v,%v],[%v,%v]]", w, s, e, s, e, n, w, n, w, s)}, holes...)
	return fmt.Sprintf(`{"type":"Polygon","coordinates":[%s]}`, strings.Join(rings, ","))
}

func TestParcelsAreLookedAtAsAWhole(t *testing.T) {
	b := newBench(t)
	rec, err := b.add("parcels.geojson", "parcels", "", nil,
		box(9, 48, 9.002, 48.002)+`|{"parcel_id":"A"}`,
		box(9.0015, 48, 9.004, 48.002)+`|{"parcel_id":"B"}`, // 0.0005 by 0.002 degrees in common
		box(9.004, 48, 9.006, 48.002)+`|{"parcel_id":"C"}`,  // beside it
		box(9.006, 48, 9.006001, 48.002)+`|{"parcel_id":"D"}`,
		box(9.007, 48, 9.009, 48.002, "[[9.0075,48.0005],[9.0075,48.001],[9.008,48.001],[9.0075,48.0005]]")+`|{"parcel_id":"E"}`)
	if err != nil {
		t.Fatal(err)
	}
	got := codes(rec.Notices)
	for _, want := range []string{"sliver D", "has_holes", "parcels_overlap A"} {
		if !strings.Contains(got, want) {
			t.Errorf("no notice %q among %s", want, got)
		}
	}
	if strings.Count(got, "parcels_overlap") != 1 || strings.Count(got, "sliver") != 1 {
		t.Errorf("notices %s", got)
	}
	for _, n := range rec.Notices {
		// 0.0005 degrees of longitude by 0.002 of latitude at 48 N: 37.3 m by 222.4 m, from the lengths of a degree on WGS 84.
		if n.Code == "parcels_overlap" && (n.Args["other"] != "B" || n.Args["area_ha"][:4] != "0.82" && n.Args["area_ha"][:4] != "0.83") {
			t.Errorf("%+v", n.Args)
		}
	}
	if rec.Count != 5 {
		t.Errorf("%d parcels are kept, want all 5", rec.Count)
	}
}

func TestDegreesThatAreCalledMetres(t *testing.T) {
	b := newBench(t)
	head := `"crs":{"type":"name","properties":{"name":"urn:ogc:def:crs:EPSG::25832"}},`
	_, err := b.add("parcels.geojson", "parcels", head, nil, box(9, 48, 9.002, 48.002))
	var q *study.QuestionError
	if !errors.As(err, &q) || !strings.Contains(err.Error(), "look like degrees") || !strings.Contains(err.Error(), "--crs OGC:CRS84") {
		t.Fatalf("error %v", err)
	}
	rec, err := b.add("parcels.geojson", "parcels", head, func(in *study.Import) { in.CRSOption = "OGC:CRS84" }, box(9, 48, 9.002, 48.002))
	if err != nil || rec.Extent[0] != 9 {
		t.Errorf("%v, extent %v", err, rec.Extent)
	}
	// Real metres are not doubted, and the way to WGS 84 is recorded with the editions behind it.
	b = newBench(t)
	rec, err = b.add("parcels.geojson", "parcels", head, nil, box(500000, 5316300, 500200, 5316500))
	if err != nil || !strings.Contains(rec.Database, "EPSG") || !strings.Contains(rec.Pipeline, "EPSG:25832") {
		t.Errorf("%v: %q, %q", err, rec.Pipeline, rec.Database)
	}
}

// A datum whose shift is only known to some metres is said to be so: OSGB36 (EPSG:27700) without its grid.
func TestDatumIsSaidToBeApproximate(t *testing.T) {
	b := newBench(t)
	head := `"crs":{"type":"name","properties":{"name":"EPSG:27700"}},`
	rec, err := b.add("parcels.geojson", "parcels", head, nil, box(400000, 300000, 400300, 300300))
	if err != nil {
		t.Fatal(err)
	}
	if got := codes(rec.Notices); !strings.Contains(got, "datum_approximate") && !strings.Contains(got, "datum_unknown") {
		t.Errorf("notices %s, pipeline %s", got, rec.Pipeline)
	}
}

func TestUnitsAreProposedFromNamesAndNumbers(t *testing.T) {
	line := `{"type":"LineString","coordinates":[[9,48],[9.01,48.01]]}`
	for _, c := range []struct{ props, column, want string }{
		{`{"voltage":"132000"}`, "voltage", "V"},
		{`{"voltage":110}`, "voltage", "kV"},
		{`{"spannung_kv":20}`, "spannung_kv", "kV"},
		{`{"voltage_v":400}`, "voltage_v", "V"},
	} {
		b := newBench(t)
		match := map[string]string{"voltage": c.column}
		if _, err := b.add("lines.geojson", "grid_lines", "", func(in *study.Import) { in.AcceptProposals, in.Match = false, match }, line+"|"+c.props); err == nil || !strings.Contains(err.Error(), "--unit "+c.column+"="+c.want) {
			t.Errorf("%s: %v", c.props, err)
		}
		rec, err := b.add("lines.geojson", "grid_lines", "", func(in *study.Import) { in.Match = match }, line+"|"+c.props)
		if err != nil || rec.Units[c.column] != c.want {
			t.Errorf("%s: %v, units %v", c.props, err, rec.Units)
		}
	}
}

func TestAPartOfAFile(t *testing.T) {
	b := newBench(t)
	want := []study.Wanted{{Column: "natural", Values: []string{"wood"}}, {Column: "landuse", Values: []string{"forest"}}}
	rec, err := b.add("mixed.geojson", "forest", "", func(in *study.Import) { in.Only = want },
		box(9, 48, 9.002, 48.002)+`|{"natural":"wood"}`, box(9.01, 48, 9.012, 48.002)+`|{"landuse":"forest"}`, box(9.02, 48, 9.022, 48.002)+`|{"natural":"water"}`)
	if err != nil || rec.Count != 2 || rec.Ledger.NotAsked != 1 || rec.Ledger.Read != 3 || rec.Ledger.LeftOut != 0 {
		t.Errorf("%v: %+v", err, rec.Ledger)
	}
	if _, err := b.add("none.geojson", "forest", "", func(in *study.Import) { in.Only = []study.Wanted{{Column: "natural", Values: []string{"rock"}}} }, box(9, 48, 9.002, 48.002)+`|{"natural":"wood"}`); err == nil || !strings.Contains(err.Error(), "--only") {
		t.Errorf("error %v", err)
	}
	if _, err := study.ParseWanted("natural"); err == nil {
		t.Error("a part without a value")
	}
}

// What the user said of a column is remembered for the next file of the role.
func TestAnswersAreRemembered(t *testing.T) {
	b := newBench(t)
	line := `{"type":"LineString","coordinates":[[9,48],[9.01,48.01]]}|{"u":20}`
	said := func(in *study.Import) {
		in.AcceptProposals, in.Match, in.Units = false, map[string]string{"voltage": "u"}, map[string]string{"u": "kV"}
	}
	if _, err := b.add("one.geojson", "grid_lines", "", said, line); err != nil {
		t.Fatal(err)
	}
	rec, err := b.add("two.geojson", "grid_lines", "", func(in *study.Import) { in.AcceptProposals = false }, line)
	if err != nil || rec.Match["voltage"] != "u" || rec.Units["u"] != "kV" {
		t.Errorf("%v: %v, %v", err, rec.Match, rec.Units)
	}
	rec, err = b.add("three.geojson", "grid_lines", "", func(in *study.Import) { in.AcceptProposals, in.Units = false, map[string]string{"u": "V"} }, line)
	if err != nil || rec.Units["u"] != "V" {
		t.Errorf("what is said now counts: %v: %v", err, rec.Units)
	}
}

func TestRolesAreProposed(t *testing.T) {
	b := newBench(t)
	cat := func() *study.Catalog {
		snap, err := b.s.Snapshot()
		if err != nil {
			t.Fatal(err)
		}
		return snap.Catalog()
	}()
	polygon := geo.LonLatGeometry{Kind: geo.Polygons}
	way := geo.LonLatGeometry{Kind: geo.Lines}
	for name, c := range map[string]struct {
		g    geo.LonLatGeometry
		want string
	}{
		"Gebaeude_2026.geojson": {polygon, "dwellings"}, "strassen.shp": {way, "roads"}, "wasserschutzgebiete.gpkg": {polygon, "water_protection"},
		"flurstuecke.geojson": {polygon, "parcels"}, "forêt.geojson": {polygon, "forest"}, "power_lines.geojson": {way, "grid_lines"},
		"Parcels_2031.geojson": {polygon, "parcels"}, "water-protection.geojson": {polygon, "water_protection"}, "grid lines.geojson": {way, "grid_lines"},
		"roads.geojson": {polygon, ""}, "xyz.geojson": {polygon, ""},
	} {
		in := study.Import{Base: name, Layer: &geo.Layer{Features: []geo.Feature{{Geometry: c.g}}}}
		if got := study.ProposeRole(cat, in); got != c.want {
			t.Errorf("%s: %q, want %q", name, got, c.want)
		}
	}
	if got := study.ProposeRole(cat, study.Import{Base: "parcels.asc"}); got != "" {
		t.Errorf("a grid named parcels: %q", got)
	}
	for _, c := range [][3]string{{"rated_kw", "kW", "kW"}, {"ghi_kwh_per_m2_month", "kWh/(m2 month)", "kWh/(m2 month)"}, {"height_cm", "m", "cm"}, {"voltage", "kV", "kV"}} {
		l := &geo.Layer{Columns: []geo.Column{{Name: c[0]}}}
		if got, _ := study.ProposeUnit(l, c[0], study.RoleField{Unit: c[1]}); got != c[2] {
			t.Errorf("%s: %q, want %q", c[0], got, c[2])
		}
	}
	if got := study.ProposeRole(cat, study.Import{Base: "dgm25.tif"}); got != "terrain" {
		t.Errorf("a grid named dgm25: %q", got)
	}
}
