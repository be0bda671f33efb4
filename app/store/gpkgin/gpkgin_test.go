package gpkgin

import (
	"bytes"
	"context"
	"database/sql"
	"encoding/hex"
	"errors"
	"fmt"
	"io/fs"
	"math"
	"math/rand/v2"
	"os"
	"path/filepath"
	"reflect"
	"slices"
	"strconv"
	"strings"
	"testing"
	"time"

	"groundtally/app/store"
	"groundtally/app/store/gpkgin/gpkgtest"
	"groundtally/app/study"
	"groundtally/geo"
	"groundtally/geo/formats"
	"groundtally/geo/formats/gpkggeom"
)

const fixtures = "../../../testdata/formats/gpkg"

func fixture(name string) string { return filepath.Join(fixtures, name) }

// copied puts a copy of a fixture into a folder of its own and runs statements on it.
func copied(t testing.TB, name string, statements ...string) string {
	t.Helper()
	b, err := os.ReadFile(fixture(name))
	if err != nil {
		t.Fatal(err)
	}
	path := filepath.Join(t.TempDir(), name)
	if err := os.WriteFile(path, b, 0o600); err != nil {
		t.Fatal(err)
	}
	run(t, path, statements...)
	return path
}

func run(t testing.TB, path string, statements ...string) {
	t.Helper()
	db, err := sql.Open("sqlite", path)
	if err != nil {
		t.Fatal(err)
	}
	defer db.Close()
	for _, s := range statements {
		if _, err := db.Exec(s); err != nil {
			t.Fatalf("%s: %v", s, err)
		}
	}
}

func opened(t testing.TB, path string) *File {
	t.Helper()
	f, err := Open(t.Context(), path)
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() {
		if err := f.Close(); err != nil {
			t.Error(err)
		}
	})
	return f
}

func read(t testing.TB, f *File, table string) Result {
	t.Helper()
	res, err := f.Read(t.Context(), table, Options{File: "x.gpkg"})
	if err != nil {
		t.Fatal(err)
	}
	return res
}

func notice(res Result, code string) *geo.Notice {
	for i := range res.Notices {
		if res.Notices[i].Code == code {
			return &res.Notices[i]
		}
	}
	return nil
}

func codes(notices []geo.Notice) []string {
	var out []string
	for _, n := range notices {
		out = append(out, n.Code)
	}
	return out
}

// wantFault checks that an error has a code, names the file and gives a cure.
func wantFault(t *testing.T, err error, code string) *formats.Error {
	t.Helper()
	var e *formats.Error
	if !errors.As(err, &e) {
		t.Fatalf("error %v, want one with the code %s", err, code)
	}
	if e.Code != code || e.File == "" || e.What == "" || e.Do == "" {
		t.Errorf("error %+v, want code %s with a file, what and a cure", *e, code)
	}
	return e
}

func dump(t testing.TB, name string) []gpkgtest.Layer {
	t.Helper()
	b, err := os.ReadFile(fixture(name))
	if err != nil {
		t.Fatal(err)
	}
	layers, err := gpkgtest.Parse(string(b))
	if err != nil {
		t.Fatal(err)
	}
	return layers
}

// same compares a layer with the dump of an independent program. Features named in without are not in
// the layer.
func same(t *testing.T, got *geo.Layer, want gpkgtest.Layer, without ...string) {
	t.Helper()
	for _, d := range gpkgtest.Differences(got, want, without...) {
		t.Error(d)
	}
}

func TestTables(t *testing.T) {
	f := opened(t, fixture("survey.gpkg"))
	got := f.Tables()
	for i := range got {
		if got[i].Name == "lines" {
			if !strings.HasPrefix(got[i].CRS, `PROJCS["unknown"`) || !strings.Contains(got[i].CRS, "Lambert_Azimuthal_Equal_Area") {
				t.Errorf("reference system of lines: %s", got[i].CRS)
			}
			got[i].CRS = "definition"
		}
	}
	want := []Table{
		{Name: "parcels", Title: "Parcels of the survey", Geometry: "geom", Type: "GEOMETRY", CRS: "EPSG:25832", Count: 4, Kind: Features},
		{Name: `wind "order" by`, Title: `wind "order" by`, Geometry: "where", Type: "GEOMETRY", CRS: "EPSG:4326", Count: 3, Kind: Features},
		{Name: "lines", Title: "lines", Geometry: "geom", Type: "GEOMETRY", CRS: "definition", Count: 3, Kind: Features},
		{Name: "unplaced", Title: "unplaced", Geometry: "geom", Type: "GEOMETRY", Count: 1, Kind: Features},
		{Name: "prices", Title: "prices", Count: 3, Kind: Attributes},
	}
	if !reflect.DeepEqual(got, want) {
		t.Errorf("got  %+v\nwant %+v", got, want)
	}
	for _, l := range dump(t, "survey.txt") {
		i := slices.IndexFunc(got, func(t Table) bool { return t.Name == l.Name })
		if i < 0 || got[i].Count != l.Count || got[i].Geometry != l.Geometry {
			t.Errorf("%+v, want %+v", got, l)
		}
	}
}

// Every feature, value and position as GDAL 3.6.2 prints it.
func TestAgainstGDAL(t *testing.T) {
	f := opened(t, fixture("survey.gpkg"))
	wantCodes := map[string][]string{
		"parcels":         {"column_left_out", "column_mixed", "geometry_missing", "number_as_text"},
		`wind "order" by`: {"height_left_out"},
		"lines":           {"collection_parted"},
		"unplaced":        nil,
		"prices":          nil,
	}
	for _, l := range dump(t, "survey.txt") {
		res := read(t, f, l.Name)
		same(t, res.Layer, l)
		if got := codes(res.Notices); !slices.Equal(got, wantCodes[l.Name]) {
			t.Errorf("%s: notices %q, want %q", l.Name, got, wantCodes[l.Name])
		}
		if want := (Ledger{Read: l.Count}); l.Name != "parcels" && l.Name != "lines" && res.Ledger != want {
			t.Errorf("%s: %+v, want %+v", l.Name, res.Ledger, want)
		}
	}
	res := read(t, f, "parcels")
	if want := (Ledger{Read: 4, NoGeometry: 1}); res.Ledger != want {
		t.Errorf("parcels: %+v, want %+v", res.Ledger, want)
	}
	if res.Layer.Name != "Parcels of the survey" || res.CRS != "EPSG:25832" {
		t.Errorf("name %q, system %q", res.Layer.Name, res.CRS)
	}
	missing := geo.Notice{Code: "geometry_missing", Severity: geo.Warning, File: "x.gpkg", Layer: "Parcels of the survey", Feature: "12", Args: map[string]string{"count": "1", "features": "12"}}
	if n := notice(res, "geometry_missing"); !reflect.DeepEqual(*n, missing) {
		t.Errorf("%+v, want %+v", *n, missing)
	}
	if n := notice(res, "column_left_out"); n.Field != "photo" {
		t.Errorf("%+v", *n)
	}
	if got := read(t, f, "lines").Ledger; got != (Ledger{Read: 3, Repaired: 1}) {
		t.Errorf("lines: %+v", got)
	}
	// Without regard to case, as SQLite has it.
	if res := read(t, f, "PRICES"); len(res.Layer.Features) != 3 {
		t.Errorf("%d features", len(res.Layer.Features))
	}
}

// A file of version 1.0, with curves, measures and an empty polygon.
func TestCurves(t *testing.T) {
	f := opened(t, fixture("curves.gpkg"))
	res := read(t, f, "curves")
	same(t, res.Layer, dump(t, "curves.txt")[0], "2", "3", "4")
	if want := (Ledger{Read: 4, LeftOut: 3}); res.Ledger != want {
		t.Errorf("%+v, want %+v", res.Ledger, want)
	}
	if want := []string{"geometry_curved", "geometry_empty", "height_left_out"}; !slices.Equal(codes(res.Notices), want) {
		t.Errorf("%q, want %q", codes(res.Notices), want)
	}
	n := notice(res, "geometry_curved")
	if n.Severity != geo.Fault || n.Feature != "2" || n.Args["features"] != "2, 3, 4" || !strings.Contains(n.Args["what"], "convert") {
		t.Errorf("%+v", *n)
	}
}

// Reading twice, from one opening or two, gives the same.
func TestDeterministic(t *testing.T) {
	f, g := opened(t, fixture("survey.gpkg")), opened(t, fixture("survey.gpkg"))
	for _, table := range f.Tables() {
		first := read(t, f, table.Name)
		for _, again := range []Result{read(t, f, table.Name), read(t, g, table.Name)} {
			if !reflect.DeepEqual(first, again) {
				t.Errorf("%s: %+v, then %+v", table.Name, first, again)
			}
		}
	}
}

func TestReferenceSystems(t *testing.T) {
	const text = `LOCAL_CS["site grid"]`
	for _, c := range []struct {
		organization      string
		number            int64
		definition, newer string
		want              string
	}{
		{"EPSG", 25832, text, "", "EPSG:25832"},
		{" epsg ", 3035, "undefined", "", "EPSG:3035"},
		{"ESRI", 102014, text, "", "ESRI:102014"},
		{"OGC", 84, "undefined", "", "OGC:CRS84"},
		{"OGC", 99, text, "", text},
		{"NONE", 100000, text, "", text},
		{"land registry", 7, text, "", text},
		{"EPSG", 0, text, "", text},
		{"NONE", 5, "undefined", `ENGCRS["site grid"]`, `ENGCRS["site grid"]`},
		{"NONE", 5, "Undefined", "undefined", ""},
		{"NONE", 5, " ", "", ""},
	} {
		if got := system(c.organization, c.number, c.definition, c.newer); got != c.want {
			t.Errorf("%+v: %q", c, got)
		}
	}
	path := copied(t, "survey.gpkg",
		`ALTER TABLE gpkg_spatial_ref_sys ADD COLUMN definition_12_063 TEXT NOT NULL DEFAULT 'undefined'`,
		`UPDATE gpkg_spatial_ref_sys SET definition = 'undefined', definition_12_063 = 'ENGCRS["site grid"]' WHERE srs_id = 100000`,
		`UPDATE gpkg_geometry_columns SET srs_id = 777 WHERE table_name = 'parcels'`,
		`UPDATE gpkg_geometry_columns SET srs_id = -1 WHERE table_name = 'unplaced'`)
	f := opened(t, path)
	for table, want := range map[string]string{"lines": `ENGCRS["site grid"]`, "parcels": "", "unplaced": "", "prices": ""} {
		if res := read(t, f, table); res.CRS != want {
			t.Errorf("%s: %q, want %q", table, res.CRS, want)
		}
	}
	res := read(t, f, "parcels")
	if n := notice(res, "reference_system_missing"); n == nil || n.Args["number"] != "777" {
		t.Errorf("%+v", res.Notices)
	}
	if n := notice(res, "reference_system_differs"); n == nil || n.Args["table"] != "777" || n.Args["count"] != "3" {
		t.Errorf("%+v", res.Notices)
	}
}

// No trigger runs and nothing is written, whatever the file asks for.
func TestTriggersDoNotRun(t *testing.T) {
	path := copied(t, "survey.gpkg",
		`CREATE TRIGGER alarm BEFORE INSERT ON prices BEGIN SELECT RAISE(FAIL, 'the alarm went off'); END`,
		`CREATE TRIGGER alarm2 BEFORE UPDATE ON parcels BEGIN SELECT RAISE(FAIL, 'the alarm went off'); END`,
		`CREATE TRIGGER alarm3 BEFORE DELETE ON parcels BEGIN SELECT no_such_function(); END`,
		`CREATE VIEW looks AS SELECT * FROM prices`,
		`CREATE TRIGGER alarm4 INSTEAD OF UPDATE ON looks BEGIN SELECT RAISE(FAIL, 'the alarm went off'); END`,
		`INSERT INTO gpkg_contents (table_name, data_type, identifier) VALUES ('looks', 'attributes', 'looks')`)
	before, err := os.ReadFile(path)
	if err != nil {
		t.Fatal(err)
	}
	f := opened(t, path)
	for _, table := range f.Tables() {
		read(t, f, table.Name)
	}
	if res := read(t, f, "looks"); len(res.Layer.Features) != 3 {
		t.Errorf("%d features", len(res.Layer.Features))
	}
	for _, statement := range []string{`UPDATE prices SET note = ''`, `DELETE FROM parcels`, `CREATE TABLE mine (a)`, `CREATE TEMP TABLE mine (a)`} {
		if _, err := f.conn.ExecContext(t.Context(), statement); err == nil {
			t.Errorf("%s went through", statement)
		}
	}
	if err := f.Close(); err != nil {
		t.Fatal(err)
	}
	after, err := os.ReadFile(path)
	if err != nil {
		t.Fatal(err)
	}
	if !bytes.Equal(before, after) {
		t.Error("the file was changed")
	}
	entries, err := os.ReadDir(filepath.Dir(path))
	if err != nil {
		t.Fatal(err)
	}
	if len(entries) != 1 {
		t.Errorf("beside the file lie now %v", entries)
	}
}

// A view is read when it is listed, and not otherwise; one that never ends stops with its context.
func TestViews(t *testing.T) {
	path := copied(t, "survey.gpkg",
		`CREATE VIEW dear AS SELECT fid, year, price_eur FROM prices WHERE price_eur > 80`,
		`CREATE VIEW hidden AS SELECT * FROM prices`,
		`CREATE VIEW twice AS SELECT fid, name FROM (SELECT fid, 'a' AS name FROM prices UNION ALL SELECT fid, 'b' FROM prices)`,
		`CREATE VIEW endless AS WITH RECURSIVE n(i) AS (SELECT 1 UNION ALL SELECT i + 1 FROM n) SELECT i AS fid FROM n WHERE i < 3 OR i < 0`,
		`CREATE VIEW harmful AS SELECT 1 AS fid, load_extension('evil') AS b`,
		`CREATE VIEW placed AS SELECT geom, fid, "select" FROM parcels`,
		`INSERT INTO gpkg_contents (table_name, data_type, identifier) VALUES
			('dear', 'attributes', 'dear'), ('twice', 'attributes', NULL), ('endless', 'attributes', 'endless'), ('harmful', 'attributes', 'harmful'),
			('placed', 'features', 'placed'), ('gone', 'attributes', 'gone'), ('sqlite_master', 'attributes', 'schema'), ('rtree_parcels_geom', 'attributes', 'index')`,
		`INSERT INTO gpkg_geometry_columns VALUES ('placed', 'geom', 'POLYGON', 25832, 0, 0)`)
	f := opened(t, path)
	var names []string
	for _, table := range f.Tables() {
		names = append(names, table.Name)
		if table.Name == "dear" && table.Count != -1 {
			t.Errorf("%+v", table)
		}
	}
	if want := []string{"parcels", `wind "order" by`, "lines", "unplaced", "prices", "dear", "twice", "endless", "harmful", "placed"}; !slices.Equal(names, want) {
		t.Errorf("%q, want %q", names, want)
	}
	if got := codes(f.Notices()); !slices.Equal(got, []string{"table_not_there", "table_not_there", "table_not_there"}) {
		t.Errorf("%q", got)
	}
	if res := read(t, f, "dear"); len(res.Layer.Features) != 1 || res.Layer.Features[0].ID != "1" || len(res.Layer.Columns) != 2 {
		t.Errorf("%+v", res.Layer)
	}
	res := read(t, f, "twice")
	var ids []string
	for _, ft := range res.Layer.Features {
		ids = append(ids, ft.ID+ft.Values[0].Text)
	}
	if want := []string{"1a", "1-2b", "2a", "2-2b", "3a", "3-2b"}; !slices.Equal(ids, want) || notice(res, "id_repeated") == nil {
		t.Errorf("%q, want %q", ids, want)
	}
	if res := read(t, f, "placed"); res.Ledger.NoGeometry != 1 || len(res.Layer.Columns) != 2 || res.Layer.Columns[0].Name != "fid" {
		t.Errorf("%+v %+v", res.Ledger, res.Layer.Columns)
	}
	_, err := f.Read(t.Context(), "harmful", Options{})
	wantFault(t, err, "not_as_standard")
	_, err = f.Read(t.Context(), "hidden", Options{})
	wantFault(t, err, "no_such_table")

	ctx, cancel := context.WithTimeout(t.Context(), 200*time.Millisecond)
	defer cancel()
	start := time.Now()
	if _, err := f.Read(ctx, "endless", Options{}); !errors.Is(err, context.DeadlineExceeded) {
		t.Errorf("error %v", err)
	}
	if d := time.Since(start); d > 20*time.Second {
		t.Errorf("it took %v to stop", d)
	}
	// The file serves on.
	if res := read(t, f, "prices"); len(res.Layer.Features) != 3 {
		t.Errorf("%+v", res.Layer)
	}
}

func TestFaultsOfFiles(t *testing.T) {
	dir := t.TempDir()
	put := func(name string, b []byte) string {
		path := filepath.Join(dir, name)
		if err := os.WriteFile(path, b, 0o600); err != nil {
			t.Fatal(err)
		}
		return path
	}
	whole, err := os.ReadFile(fixture("survey.gpkg"))
	if err != nil {
		t.Fatal(err)
	}
	bare := filepath.Join(dir, "bare.gpkg")
	run(t, bare, `CREATE TABLE a (b)`, `INSERT INTO a VALUES (1)`)
	hollow := copied(t, "tiles.gpkg", `DELETE FROM gpkg_contents`)
	fake := filepath.Join(dir, "fake.gpkg")
	run(t, fake, `CREATE VIEW gpkg_contents AS SELECT 'a' AS table_name, 'features' AS data_type, '' AS identifier`)
	poor := filepath.Join(dir, "poor.gpkg")
	run(t, poor, `CREATE TABLE gpkg_contents (table_name TEXT)`)
	for _, c := range []struct{ name, path, code, says string }{
		{"none", filepath.Join(dir, "none.gpkg"), "not_there", "no such file"},
		{"folder", dir, "folder", "folder"},
		{"empty", put("empty.gpkg", nil), "empty_file", "empty"},
		{"text", put("text.gpkg", []byte("just some words, more than sixteen bytes of them")), "not_sqlite", "not a GeoPackage"},
		{"head alone", put("head.gpkg", whole[:50]), "damaged", "cut short"},
		{"one page", put("page.gpkg", whole[:512]), "damaged", "cut short"},
		{"half", put("half.gpkg", whole[:len(whole)/2]), "damaged", "cut short"},
		{"last page missing", put("most.gpkg", whole[:len(whole)-512]), "damaged", "cut short"},
		{"database", bare, "not_geopackage", "gpkg_contents"},
		{"contents are a view", fake, "not_geopackage", "gpkg_contents"},
		{"contents lack columns", poor, "not_as_standard", "standard"},
		{"tiles", fixture("tiles.gpkg"), "tiles_only", "tiles"},
		{"nothing", hollow, "no_table", "no layer"},
	} {
		f, err := Open(t.Context(), c.path)
		if err == nil {
			t.Errorf("%s: no error; tables %+v", c.name, f.Tables())
			continue
		}
		if e := wantFault(t, err, c.code); !strings.Contains(e.Error(), c.says) || !strings.Contains(e.Error(), filepath.Base(c.path)) {
			t.Errorf("%s: %v", c.name, e)
		}
	}
	if _, err := Open(t.Context(), filepath.Join(dir, "none.gpkg")); !errors.Is(err, fs.ErrNotExist) {
		t.Errorf("%v", err)
	}
}

func TestNoSuchTable(t *testing.T) {
	f := opened(t, fixture("survey.gpkg"))
	_, err := f.Read(t.Context(), `parcels"; DROP TABLE parcels; --`, Options{File: "s.gpkg"})
	e := wantFault(t, err, "no_such_table")
	if want := `choose one of "parcels", "wind \"order\" by", "lines", "unplaced", "prices"`; e.Do != want || e.File != "s.gpkg" {
		t.Errorf("%+v", *e)
	}
	if err := f.Close(); err != nil {
		t.Fatal(err)
	}
	_, err = f.Read(t.Context(), "parcels", Options{})
	wantFault(t, err, "closed")
}

// survey holds a copy of the survey with an own attributes table "own".
func own(t *testing.T, create string, statements ...string) *File {
	t.Helper()
	return opened(t, copied(t, "survey.gpkg", append([]string{create,
		`INSERT INTO gpkg_contents (table_name, data_type, identifier) VALUES ('own', 'attributes', 'own')`}, statements...)...))
}

func TestValues(t *testing.T) {
	f := own(t, `CREATE TABLE own (id INTEGER PRIMARY KEY, n INTEGER, r REAL, s TEXT, b BOOLEAN, d DATE, at DATETIME, x, twice AS (n * 2), kept INTEGER AS (n + 1) STORED, raw, "ROWID" TEXT, shape POINT)`,
		`INSERT INTO own (id, n, r, s, b, d, at, x, raw, "ROWID", shape) VALUES
			(-5, 9007199254740992, 9e999, 'plain', 1, '2024-02-30', '2024-05-06T07:08:09.123Z', 1, x'01', 'a', x'01'),
			(9223372036854775807, 9007199254740993, -9e999, '', 0, 20240506, 'yesterday', 'text', NULL, 'b', NULL),
			(0, NULL, 1, CAST(x'4772fc6e' AS TEXT), 2, NULL, 5.5, x'00', x'02', 'c', NULL)`)
	res := read(t, f, "own")
	num, text := geo.NumberValue, geo.TextValue
	want := geo.Layer{
		Name: "own",
		Columns: []geo.Column{{Name: "n"}, {Name: "r"}, {Name: "s"}, {Name: "b"}, {Name: "d"}, {Name: "at"}, {Name: "x"},
			{Name: "twice"}, {Name: "kept"}, {Name: "ROWID"}},
		Features: []geo.Feature{
			{ID: "-5", Values: []geo.Value{text("9007199254740992"), {}, text("plain"), text("true"), text("2024-02-30"), text("2024-05-06T07:08:09.123Z"), text("1"), text("18014398509481984"), text("9007199254740993"), text("a")}},
			{ID: "0", Values: []geo.Value{{}, num(1), text("Gr\ufffdn"), text("2"), {}, text("5.5"), {}, {}, {}, text("c")}},
			{ID: "9223372036854775807", Values: []geo.Value{text("9007199254740993"), {}, text(""), text("false"), text("20240506"), text("yesterday"), text("text"), text("18014398509481986"), text("9007199254740994"), text("b")}},
		},
	}
	if !reflect.DeepEqual(*res.Layer, want) {
		t.Errorf("got  %+v\nwant %+v", *res.Layer, want)
	}
	var got []string
	for _, n := range res.Notices {
		got = append(got, n.Code+" "+n.Field+" "+n.Args["count"])
	}
	if want := []string{"column_left_out raw 1", "column_left_out shape 1", "column_mixed at 1", "column_mixed b 3", "column_mixed d 1", "column_mixed n 1",
		"column_mixed x 1", "number_as_text kept 2", "number_as_text n 1", "number_as_text twice 2", "number_not_finite r 2", "text_not_utf8 s 1", "value_left_out x 1"}; !slices.Equal(got, want) {
		t.Errorf("got  %q\nwant %q", got, want)
	}
}

func TestKeys(t *testing.T) {
	for name, c := range map[string]struct {
		create, insert string
		ids, columns   []string
		code           string
	}{
		"text": {`CREATE TABLE own (id TEXT PRIMARY KEY, a)`, `INSERT INTO own VALUES ('b', 1), ('a', 2), ('C', 3)`,
			[]string{"C", "a", "b"}, []string{"id", "a"}, ""},
		"text without row numbers": {`CREATE TABLE own (id TEXT PRIMARY KEY, a) WITHOUT ROWID`, `INSERT INTO own VALUES ('b', 1), ('a', 2)`,
			[]string{"a", "b"}, []string{"id", "a"}, ""},
		"number with a meaning": {`CREATE TABLE own (a, parcel_no INTEGER PRIMARY KEY)`, `INSERT INTO own VALUES (1, 12), (2, 3)`,
			[]string{"3", "12"}, []string{"a", "parcel_no"}, ""},
		"number": {`CREATE TABLE own (a, OBJECTID INTEGER PRIMARY KEY)`, `INSERT INTO own VALUES (1, 12), (2, 3)`,
			[]string{"3", "12"}, []string{"a"}, ""},
		"of two columns": {`CREATE TABLE own (a, b, PRIMARY KEY (b, a))`, `INSERT INTO own VALUES ('x', 2), ('y', 1), ('x', 1)`,
			[]string{"1/x", "1/y", "2/x"}, []string{"a", "b"}, ""},
		"none": {`CREATE TABLE own (a, rowid)`, `INSERT INTO own VALUES ('x', 2), ('y', 1)`,
			[]string{"1", "2"}, []string{"a", "rowid"}, "no_key"},
		"none at all": {`CREATE TABLE own (oid, _rowid_, rowid)`, `INSERT INTO own VALUES ('x', 2, 0), ('y', 1, 0)`,
			[]string{"1", "2"}, []string{"oid", "_rowid_", "rowid"}, "no_key"},
		"missing": {`CREATE TABLE own (code TEXT PRIMARY KEY, a)`, `INSERT INTO own VALUES (NULL, 1), ('2', 2), (NULL, 3), ('1', 3)`,
			[]string{"1-2", "2-2", "1", "2"}, []string{"code", "a"}, ""},
	} {
		f := own(t, c.create, c.insert)
		res := read(t, f, "own")
		var ids, columns []string
		for _, ft := range res.Layer.Features {
			ids = append(ids, ft.ID)
		}
		for _, col := range res.Layer.Columns {
			columns = append(columns, col.Name)
		}
		if !slices.Equal(ids, c.ids) || !slices.Equal(columns, c.columns) {
			t.Errorf("%s: %q in %q, want %q in %q", name, ids, columns, c.ids, c.columns)
		}
		if c.code != "" && notice(res, c.code) == nil || c.code == "" && len(res.Notices) > 0 {
			t.Errorf("%s: %+v, want %q", name, res.Notices, c.code)
		}
	}
	if res := read(t, own(t, `CREATE TABLE own (fid INTEGER PRIMARY KEY)`), "own"); notice(res, "layer_empty") == nil || len(res.Layer.Features) != 0 {
		t.Errorf("%+v", res)
	}
}

func blob(t *testing.T, g geo.LonLatGeometry, srs int32) string {
	t.Helper()
	b, err := gpkggeom.Append(nil, g, srs, false)
	if err != nil {
		t.Fatal(err)
	}
	return hex.EncodeToString(b)
}

func TestGeometries(t *testing.T) {
	nan := hex.EncodeToString([]byte{0, 0, 0, 0, 0, 0, 0xf8, 0x7f})
	inf := hex.EncodeToString([]byte{0, 0, 0, 0, 0, 0, 0xf0, 0x7f})
	one := hex.EncodeToString([]byte{0, 0, 0, 0, 0, 0, 0xf0, 0x3f})
	head := "4750000100000000" // little-endian, no envelope, system 0
	ring := func(v ...float64) (out []geo.LonLat) {
		for i := 0; i < len(v); i += 2 {
			out = append(out, geo.LonLat{Lon: v[i], Lat: v[i+1]})
		}
		return out
	}
	polygon := func(rings ...[]geo.LonLat) geo.LonLatGeometry {
		return geo.LonLatGeometry{Kind: geo.Polygons, Parts: [][][]geo.LonLat{rings}}
	}
	rows := []string{
		"x'" + head + "0101000000" + one + one + "'",                     // 1, a point
		"x'" + head + "0101000000" + nan + nan + "'",                     // 2, an empty point
		"x'" + head + "0101000000" + nan + one + "'",                     // 3, half a point
		"x'" + head + "010200000002000000" + one + one + inf + one + "'", // 4
		"'text'",  // 5
		"x''",     // 6
		"x'4750'", // 7
		"x'" + head + "010200000002000000" + one + "'", // 8, cut
		"NULL", // 9
		"x'" + blob(t, polygon(ring(0, 0, 1, 0, 1, 1)), 0) + "'",                                                                // 10, open
		"x'" + blob(t, polygon(ring(0, 0, 9, 0, 9, 9, 0, 0), ring(1, 1, 2, 2)), 0) + "'",                                        // 11, a hole of two positions
		"x'" + blob(t, polygon(ring(0, 0, 9, 0), ring(1, 1, 2, 1, 2, 2, 1, 1)), 0) + "'",                                        // 12, no outer ring
		"x'" + blob(t, geo.LonLatGeometry{Kind: geo.Lines, Parts: [][][]geo.LonLat{{ring(5, 5)}, {ring(0, 0, 1, 1)}}}, 0) + "'", // 13
		"x'" + blob(t, polygon(ring(0, 0, 1, 0, 1, 1, 0, 0)), 4326) + "'",                                                       // 14, of another system
		"7", // 15
	}
	statements := []string{}
	for i, r := range rows {
		statements = append(statements, fmt.Sprintf(`INSERT INTO shapes VALUES (%d, %s)`, i+1, r))
	}
	f := opened(t, copied(t, "survey.gpkg", append([]string{`CREATE TABLE shapes (fid INTEGER PRIMARY KEY, geom GEOMETRY)`,
		`INSERT INTO gpkg_contents (table_name, data_type, identifier) VALUES ('shapes', 'features', 'shapes')`,
		`INSERT INTO gpkg_geometry_columns VALUES ('shapes', 'geom', 'GEOMETRY', 0, 0, 0)`}, statements...)...))
	res := read(t, f, "shapes")
	got := map[string]string{}
	for _, ft := range res.Layer.Features {
		got[ft.ID] = gpkgtest.WKT(ft.Geometry, false)
	}
	want := map[string]string{
		"1": "POINT (1 1)", "2": "POINT EMPTY", "9": "", "10": "POLYGON ((0 0,1 0,1 1,0 0))", "11": "POLYGON ((0 0,9 0,9 9,0 0))",
		"12": "POLYGON EMPTY", "13": "LINESTRING (0 0,1 1)", "14": "POLYGON ((0 0,1 0,1 1,0 0))",
	}
	if !reflect.DeepEqual(got, want) {
		t.Errorf("got  %v\nwant %v", got, want)
	}
	if want := (Ledger{Read: 8, LeftOut: 7, Repaired: 4, NoGeometry: 1}); res.Ledger != want {
		t.Errorf("%+v, want %+v", res.Ledger, want)
	}
	var lines []string
	for _, n := range res.Notices {
		lines = append(lines, fmt.Sprintf("%s %s: %s", n.Severity, n.Code, n.Args["features"]))
	}
	if want := []string{
		"warning geometry_empty: 2, 12",
		"warning geometry_missing: 9",
		"fault geometry_unreadable: 3, 4",
		"fault geometry_unreadable: 8",
		"fault geometry_unreadable: 5, 6, 7, 15",
		"warning part_too_short: 11, 12, 13",
		"warning reference_system_differs: 14",
		"info ring_closed: 10",
	}; !slices.Equal(lines, want) {
		t.Errorf("got  %q\nwant %q", lines, want)
	}
	for _, n := range res.Notices {
		if n.Code == "geometry_unreadable" && n.Feature == "3" && !strings.Contains(n.Args["what"], "not a finite number") {
			t.Errorf("%+v", n)
		}
	}
}

func TestDegrees(t *testing.T) {
	path := copied(t, "survey.gpkg", `UPDATE gpkg_geometry_columns SET srs_id = 4326 WHERE table_name = 'unplaced'`)
	res := read(t, opened(t, path), "unplaced")
	if n := notice(res, "coordinates_not_degrees"); n == nil || n.Severity != geo.Fault || n.Feature != "1" {
		t.Errorf("%+v", res.Notices)
	}
}

func TestUnits(t *testing.T) {
	path := copied(t, "survey.gpkg",
		`INSERT INTO gpkg_data_columns (table_name, column_name, name, description) VALUES ('prices', 'price_eur', 'price', 'unit: EUR/MWh'), ('prices', 'note', 'n', 'free text')`)
	res := read(t, opened(t, path), "prices")
	if want := []geo.Column{{Name: "year"}, {Name: "price_eur", Unit: "EUR/MWh"}, {Name: "note"}}; !reflect.DeepEqual(res.Layer.Columns, want) {
		t.Errorf("%+v", res.Layer.Columns)
	}
}

func TestGeometryColumnUnknown(t *testing.T) {
	f := opened(t, copied(t, "survey.gpkg", `DELETE FROM gpkg_geometry_columns WHERE table_name = 'parcels'`))
	_, err := f.Read(t.Context(), "parcels", Options{})
	if e := wantFault(t, err, "no_geometry_column"); e.Where != `table "parcels"` {
		t.Errorf("%+v", *e)
	}
}

func TestApplicationNumber(t *testing.T) {
	for id, noted := range map[int]bool{0x47504B47: false, 0x47503130: false, 0x47503131: false, 0x47503132: false, 0: true, 7: true} {
		f := opened(t, copied(t, "survey.gpkg", fmt.Sprintf(`PRAGMA application_id = %d`, id)))
		if got := slices.Contains(codes(read(t, f, "prices").Notices), "application_number"); got != noted {
			t.Errorf("%x: noted %v", id, got)
		}
	}
}

func TestLimitsAndProgress(t *testing.T) {
	f := opened(t, fixture("survey.gpkg"))
	_, err := f.Read(t.Context(), "parcels", Options{MaxFeatures: 3})
	wantFault(t, err, "too_many")
	_, err = f.Read(t.Context(), "parcels", Options{MaxPositions: 10})
	wantFault(t, err, "too_many")
	var calls [][2]int
	if _, err := f.Read(t.Context(), "parcels", Options{MaxFeatures: 4, Progress: func(done, of int) { calls = append(calls, [2]int{done, of}) }}); err != nil {
		t.Fatal(err)
	}
	if want := [][2]int{{0, 4}, {4, 4}}; !reflect.DeepEqual(calls, want) {
		t.Errorf("%v, want %v", calls, want)
	}
	ctx, cancel := context.WithCancel(t.Context())
	_, err = f.Read(ctx, "parcels", Options{Progress: func(int, int) { cancel() }})
	if !errors.Is(err, context.Canceled) {
		t.Errorf("error %v", err)
	}
	if _, err := Open(ctx, fixture("survey.gpkg")); !errors.Is(err, context.Canceled) {
		t.Errorf("error %v", err)
	}
}

// A program that holds the file open in write-ahead mode has its edits beside it.
func TestEditsBeside(t *testing.T) {
	path := copied(t, "survey.gpkg")
	db, err := sql.Open("sqlite", path)
	if err != nil {
		t.Fatal(err)
	}
	defer db.Close()
	db.SetMaxOpenConns(1)
	for _, s := range []string{`PRAGMA journal_mode = WAL`, `PRAGMA wal_autocheckpoint = 0`, `INSERT INTO prices (year, price_eur) VALUES (2025, 70)`} {
		if _, err := db.Exec(s); err != nil {
			t.Fatal(err)
		}
	}
	f := opened(t, path)
	res := read(t, f, "prices")
	if n := notice(res, "edits_unmerged"); n == nil || n.Severity != geo.Warning || n.Args["beside"] != "survey.gpkg-wal" {
		t.Errorf("%+v", res.Notices)
	}
	if len(res.Layer.Features) != 4 {
		t.Errorf("%d features, want the 4 with the edit", len(res.Layer.Features))
	}
	// The other program writes on while the file is open.
	if _, err := db.Exec(`INSERT INTO prices (year, price_eur) VALUES (2026, 60)`); err != nil {
		t.Fatal(err)
	}
	if res := read(t, f, "prices"); len(res.Layer.Features) != 5 {
		t.Errorf("%d features", len(res.Layer.Features))
	}
	if err := f.Close(); err != nil {
		t.Fatal(err)
	}

	// Copied away with its edits, then where no file can be made beside it: in the place of SQLite's
	// shared memory stands a link that leads nowhere.
	dir := t.TempDir()
	for _, ending := range []string{"", "-wal"} {
		b, err := os.ReadFile(path + ending)
		if err != nil {
			t.Fatal(err)
		}
		if err := os.WriteFile(filepath.Join(dir, "copy.gpkg"+ending), b, 0o600); err != nil {
			t.Fatal(err)
		}
	}
	again := opened(t, filepath.Join(dir, "copy.gpkg"))
	if res := read(t, again, "prices"); len(res.Layer.Features) != 5 || notice(res, "edits_unmerged") == nil {
		t.Errorf("%d features, %+v", len(res.Layer.Features), res.Notices)
	}
	if err := again.Close(); err != nil {
		t.Fatal(err)
	}
	os.Remove(filepath.Join(dir, "copy.gpkg-shm"))
	if err := os.Symlink(filepath.Join(dir, "no folder", "x"), filepath.Join(dir, "copy.gpkg-shm")); err != nil {
		t.Fatal(err)
	}
	third := opened(t, filepath.Join(dir, "copy.gpkg"))
	res = read(t, third, "prices")
	if n := notice(res, "edits_not_read"); n == nil || n.Severity != geo.Fault {
		t.Errorf("%+v", res.Notices)
	}
	if len(res.Layer.Features) != 3 {
		t.Errorf("%d features, want the 3 without the edits", len(res.Layer.Features))
	}
}

// A file left in write-ahead mode with nothing beside it opens as any other.
func TestWriteAheadModeWithoutEdits(t *testing.T) {
	path := copied(t, "survey.gpkg", `PRAGMA journal_mode = WAL`)
	b, err := os.ReadFile(path)
	if err != nil {
		t.Fatal(err)
	}
	if b[18] != 2 {
		t.Fatalf("the mode is %d", b[18])
	}
	if res := read(t, opened(t, path), "prices"); len(res.Layer.Features) != 3 || len(res.Notices) != 0 {
		t.Errorf("%+v", res)
	}
}

func TestLocked(t *testing.T) {
	path := copied(t, "survey.gpkg")
	db, err := sql.Open("sqlite", path)
	if err != nil {
		t.Fatal(err)
	}
	defer db.Close()
	db.SetMaxOpenConns(1)
	for _, s := range []string{`BEGIN EXCLUSIVE`, `INSERT INTO prices (year) VALUES (1)`} {
		if _, err := db.Exec(s); err != nil {
			t.Fatal(err)
		}
	}
	_, err = open(t.Context(), path, 10*time.Millisecond)
	wantFault(t, err, "locked")
	if _, err := db.Exec(`ROLLBACK`); err != nil {
		t.Fatal(err)
	}
	opened(t, path)
}

// A program that was killed while it wrote leaves a journal from which the file must be mended first;
// one that keeps an empty journal leaves nothing to mend.
func TestJournalBeside(t *testing.T) {
	path := copied(t, "survey.gpkg")
	db, err := sql.Open("sqlite", path)
	if err != nil {
		t.Fatal(err)
	}
	defer db.Close()
	db.SetMaxOpenConns(1)
	for _, s := range []string{`PRAGMA cache_size = 1`, `BEGIN IMMEDIATE`, // a small cache makes the writer write before the end
		`WITH RECURSIVE n(i) AS (SELECT 1 UNION ALL SELECT i + 1 FROM n WHERE i < 5000) INSERT INTO prices (year, note) SELECT i, 'a note of some length' FROM n`} {
		if _, err := db.Exec(s); err != nil {
			t.Fatal(err)
		}
	}
	dir := t.TempDir()
	for _, ending := range []string{"", "-journal"} {
		b, err := os.ReadFile(path + ending)
		if err != nil {
			t.Fatal(err)
		}
		if err := os.WriteFile(filepath.Join(dir, "x.gpkg"+ending), b, 0o600); err != nil {
			t.Fatal(err)
		}
	}
	_, err = Open(t.Context(), filepath.Join(dir, "x.gpkg"))
	wantFault(t, err, "half_written")

	kept := copied(t, "survey.gpkg", `PRAGMA journal_mode = PERSIST`)
	if err := os.WriteFile(kept+"-journal", make([]byte, 1024), 0o600); err != nil {
		t.Fatal(err)
	}
	if res := read(t, opened(t, kept), "prices"); len(res.Layer.Features) != 3 || len(res.Notices) != 0 {
		t.Errorf("%+v", res)
	}
}

// A study of ours is a GeoPackage like any other.
func TestStudy(t *testing.T) {
	path := filepath.Join(t.TempDir(), "study.gpkg")
	s, err := store.Create(t.Context(), path)
	if err != nil {
		t.Fatal(err)
	}
	l := &geo.Layer{Name: "dwellings", Columns: []geo.Column{{Name: "height"}}, Features: []geo.Feature{
		{ID: "D-1", Geometry: geo.LonLatGeometry{Kind: geo.Points, Parts: [][][]geo.LonLat{{{{Lon: 9, Lat: 48}}}}}, Values: []geo.Value{geo.NumberValue(7.5)}}}}
	if _, err := s.Commit(t.Context(), study.Entry{At: time.Unix(0, 0).UTC(), Verb: "add"}, []study.Version{{Digest: study.LayerDigest(l), Layer: l}}); err != nil {
		t.Fatal(err)
	}
	if err := s.Close(); err != nil {
		t.Fatal(err)
	}
	f := opened(t, path)
	for _, table := range f.Tables() {
		if table.Kind != Features {
			continue
		}
		res := read(t, f, table.Name)
		if res.CRS != "EPSG:4326" || len(res.Layer.Features) != 1 || !reflect.DeepEqual(res.Layer.Features[0].Geometry, l.Features[0].Geometry) || len(res.Notices) > 0 {
			t.Errorf("%+v", res)
		}
		return
	}
	t.Errorf("no layer in %+v", f.Tables())
}

func TestChangedWhileOpen(t *testing.T) {
	path := copied(t, "survey.gpkg")
	f := opened(t, path)
	run(t, path, `INSERT INTO prices (year) VALUES (1)`)
	if err := os.Chtimes(path, time.Now(), time.Now().Add(time.Minute)); err != nil { // clocks of file systems are coarse
		t.Fatal(err)
	}
	_, err := f.Read(t.Context(), "prices", Options{})
	wantFault(t, err, "changed")
}

// Names with signs that have a meaning in addresses.
func TestAwkwardPaths(t *testing.T) {
	b, err := os.ReadFile(fixture("survey.gpkg"))
	if err != nil {
		t.Fatal(err)
	}
	for _, name := range []string{"a b.gpkg", "what?mode=rw.gpkg", "100%25#x.gpkg", "größe.gpkg", "file:x.gpkg"} {
		path := filepath.Join(t.TempDir(), name)
		if err := os.WriteFile(path, b, 0o600); err != nil {
			t.Fatal(err)
		}
		if res := read(t, opened(t, path), "prices"); len(res.Layer.Features) != 3 {
			t.Errorf("%s: %d features", name, len(res.Layer.Features))
		}
	}
}

// Damaged files give an error or a layer, in time, and never a panic. The seed is fixed.
func TestFlippedBytes(t *testing.T) {
	rnd := rand.New(rand.NewPCG(20240506, 1))
	path := filepath.Join(t.TempDir(), "x.gpkg")
	read, refused := 0, 0
	for _, name := range []string{"survey.gpkg", "curves.gpkg", "tiles.gpkg"} {
		whole, err := os.ReadFile(fixture(name))
		if err != nil {
			t.Fatal(err)
		}
		for range 150 {
			b := bytes.Clone(whole)
			for range 1 + rnd.IntN(20) {
				at := rnd.IntN(len(b))
				if rnd.IntN(3) == 0 {
					at = rnd.IntN(100) // the header
				}
				b[at] = byte(rnd.IntN(256))
			}
			if rnd.IntN(5) == 0 {
				b = b[:rnd.IntN(len(b))]
			}
			if err := os.WriteFile(path, b, 0o600); err != nil {
				t.Fatal(err)
			}
			ok, err := readAll(path)
			if err != nil {
				t.Error(err)
			}
			if ok {
				read++
			} else {
				refused++
			}
		}
	}
	if read == 0 || refused == 0 {
		t.Errorf("%d files read, %d refused: the test is blind", read, refused)
	}
}

// readAll reads every table of a file. It gives an error where something else than a fault of the file
// came of it.
func readAll(path string) (ok bool, err error) {
	ctx, cancel := context.WithTimeout(context.Background(), 20*time.Second)
	defer cancel()
	known := func(err error) error {
		var e *formats.Error
		if !errors.As(err, &e) || e.Code == "" || e.What == "" || e.Do == "" {
			return fmt.Errorf("%s: not in plain words: %w", path, err)
		}
		return nil
	}
	f, err := Open(ctx, path)
	if err != nil {
		return false, known(err)
	}
	defer f.Close()
	ok = true
	for _, table := range f.Tables() {
		res, err := f.Read(ctx, table.Name, Options{MaxFeatures: 1000})
		if err != nil {
			ok = false
			if err := known(err); err != nil {
				return false, err
			}
			continue
		}
		seen := map[string]bool{}
		for _, ft := range res.Layer.Features {
			if seen[ft.ID] || len(ft.Values) != len(res.Layer.Columns) {
				return false, fmt.Errorf("%s, %s: feature %q comes twice or has %d values for %d columns", path, table.Name, ft.ID, len(ft.Values), len(res.Layer.Columns))
			}
			seen[ft.ID] = true
			finite := true
			ft.Geometry.Each(func(p geo.LonLat) { finite = finite && p.Finite() })
			for _, v := range ft.Values {
				finite = finite && !math.IsNaN(v.Number) && !math.IsInf(v.Number, 0)
			}
			if !finite {
				return false, fmt.Errorf("%s, %s, feature %s: a number is not finite", path, table.Name, ft.ID)
			}
		}
	}
	return ok, nil
}

func BenchmarkRead20000Polygons(b *testing.B) {
	path := copied(b, "survey.gpkg")
	db, err := sql.Open("sqlite", path)
	if err != nil {
		b.Fatal(err)
	}
	defer db.Close()
	db.SetMaxOpenConns(1)
	for _, s := range []string{`CREATE TABLE many (fid INTEGER PRIMARY KEY, geom POLYGON, name TEXT, area_ha DOUBLE, owned BOOLEAN)`,
		`INSERT INTO gpkg_contents (table_name, data_type, identifier) VALUES ('many', 'features', 'many')`,
		`INSERT INTO gpkg_geometry_columns VALUES ('many', 'geom', 'POLYGON', 25832, 0, 0)`, `BEGIN`} {
		if _, err := db.Exec(s); err != nil {
			b.Fatal(err)
		}
	}
	for i := range 20_000 {
		x, y := 500_000+float64(i%200)*100, 5_300_000+float64(i/200)*100
		ring := make([]geo.LonLat, 31)
		for k := range ring {
			sin, cos := math.Sincos(2 * math.Pi * float64(k%30) / 30)
			ring[k] = geo.LonLat{Lon: x + 40*cos, Lat: y + 40*sin}
		}
		blob, err := gpkggeom.Append(nil, geo.LonLatGeometry{Kind: geo.Polygons, Parts: [][][]geo.LonLat{{ring}}}, 25832, false)
		if err != nil {
			b.Fatal(err)
		}
		if _, err := db.Exec(`INSERT INTO many VALUES (?, ?, ?, ?, ?)`, i+1, blob, "parcel "+strconv.Itoa(i), float64(i)/7, i%2 == 0); err != nil {
			b.Fatal(err)
		}
	}
	if _, err := db.Exec(`COMMIT`); err != nil {
		b.Fatal(err)
	}
	f := opened(b, path)
	b.ReportAllocs()
	for b.Loop() {
		res := read(b, f, "many")
		if res.Ledger.Read != 20_000 {
			b.Fatal(res.Ledger)
		}
	}
}

// What the driver says is kept in words, and what it is can still be asked.
func TestDriverNumbersAreLeftOut(t *testing.T) {
	db, err := sql.Open("sqlite", filepath.Join(t.TempDir(), "x.gpkg"))
	if err != nil {
		t.Fatal(err)
	}
	defer db.Close()
	_, raw := db.Exec("SELECT * FROM nothing")
	if raw == nil || !strings.Contains(raw.Error(), "(1)") {
		t.Fatalf("the driver says %v", raw)
	}
	var f *formats.Error
	if err := plain("x.gpkg", "", raw); !errors.As(err, &f) || strings.Contains(f.Err.Error(), "(1)") || !strings.Contains(f.Err.Error(), "nothing") || sqliteCode(err) != codeError {
		t.Errorf("it is said: %v", f.Err)
	}
}

func TestAStudyIsTold(t *testing.T) {
	path := filepath.Join(t.TempDir(), "s.gpkg")
	s, err := store.Create(context.Background(), path)
	if err != nil {
		t.Fatal(err)
	}
	if err := s.Close(); err != nil {
		t.Fatal(err)
	}
	for file, want := range map[string]bool{path: true, copied(t, "survey.gpkg"): false} {
		f, err := Open(context.Background(), file)
		if err != nil {
			t.Fatal(err)
		}
		if f.Study() != want {
			t.Errorf("%s is a study: %v", file, f.Study())
		}
		if err := f.Close(); err != nil {
			t.Error(err)
		}
	}
}
