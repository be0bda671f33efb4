package gpkgout

import (
	"bytes"
	"context"
	"database/sql"
	"encoding/binary"
	"errors"
	"fmt"
	"io/fs"
	"math"
	"os"
	"os/exec"
	"path/filepath"
	"reflect"
	"slices"
	"strconv"
	"strings"
	"testing"
	"time"

	"groundtally/app/store/gpkgin"
	"groundtally/app/store/gpkgin/gpkgtest"
	"groundtally/geo"
)

var (
	num  = geo.NumberValue
	text = geo.TextValue
	yes  = geo.BoolValue
	none = geo.Value{}
)

func ring(v ...float64) []geo.LonLat {
	out := make([]geo.LonLat, 0, len(v)/2)
	for i := 0; i+1 < len(v); i += 2 {
		out = append(out, geo.LonLat{Lon: v[i], Lat: v[i+1]})
	}
	return out
}

func shaped(k geo.Kind, parts ...[][]geo.LonLat) geo.LonLatGeometry {
	return geo.LonLatGeometry{Kind: k, Parts: parts}
}

// sample is invented.
func sample() []Layer {
	parcels := &geo.Layer{Name: "Parcels",
		Columns: []geo.Column{{Name: "select"}, {Name: "area", Unit: "ha"}, {Name: "Area"}, {Name: "owner", Personal: true}, {Name: `größe "m²"`, Unit: "m2"},
			{Name: "fid"}, {Name: "rowid"}, {Name: "owned"}, {Name: "mixed"}, {Name: "nothing"}, {Name: "geom"}},
		Features: []geo.Feature{
			{ID: "A/2", Geometry: shaped(geo.Polygons, [][]geo.LonLat{ring(9, 48, 9.1, 48, 9.1, 48.1, 9, 48), ring(9.04, 48.01, 9.05, 48.02, 9.05, 48.01, 9.04, 48.01)}),
				Values: []geo.Value{text("Grünland"), num(0.1), num(3), text("Mrs X"), num(1e-7), num(70), num(5), yes(true), text("a"), none, text("g1")}},
			{ID: "A/1", Geometry: shaped(geo.Polygons, [][]geo.LonLat{ring(-9, -48, -8.9, -48, -8.9, -47.9, -9, -48)}, [][]geo.LonLat{ring(10, 50, 10.5, 50, 10.5, 50.5, 10, 50)}),
				Values: []geo.Value{text(`"quoted", with comma`), num(1.0 / 3), num(-4), text("Mr Y"), num(123456789.125), num(71), num(6), yes(false), num(2.5), none, text("g2")}},
			{ID: "A/3",
				Values: []geo.Value{none, none, none, none, none, none, none, none, yes(true), none, none}},
			{ID: "A/4", Geometry: shaped(geo.Polygons),
				Values: []geo.Value{text(""), num(0), num(9007199254740992), none, num(-0.5), num(72), num(7), none, none, none, text("g4")}},
		}}
	machines := &geo.Layer{Name: `wind "order" by`, Columns: []geo.Column{{Name: "height", Unit: "m"}}}
	for i := range 100 { // enough for an index of several nodes
		machines.Features = append(machines.Features, geo.Feature{ID: strconv.Itoa(10 + 3*i), Values: []geo.Value{num(90 + float64(i)/8)},
			Geometry: shaped(geo.Points, [][]geo.LonLat{ring(9+float64(i%10)/7, 48+float64(i/10)/7)})})
	}
	lines := &geo.Layer{Name: "lines", Columns: []geo.Column{{Name: "kv"}}, Features: []geo.Feature{
		{ID: "1", Geometry: shaped(geo.Lines, [][]geo.LonLat{ring(179, 89, 180, 90)}), Values: []geo.Value{num(110)}},
		{ID: "2", Geometry: shaped(geo.Points, [][]geo.LonLat{ring(1, 2)}), Values: []geo.Value{num(20)}},
	}}
	prices := &geo.Layer{Name: "prices", Columns: []geo.Column{{Name: "year"}, {Name: "price", Unit: "EUR/MWh"}}, Features: []geo.Feature{
		{ID: "2022", Values: []geo.Value{num(2022), num(91.5)}}, {ID: "2024", Values: []geo.Value{num(2024), none}}}}
	return []Layer{{Layer: parcels, Title: "Parcels of the study"}, {Layer: machines}, {Name: "mixed lines", Layer: lines}, {Layer: prices}, {Name: "empty", Layer: &geo.Layer{Columns: []geo.Column{{Name: "a"}}}}}
}

var changed = time.Date(2024, 5, 6, 9, 8, 9, 0, time.FixedZone("", 7200))

func written(t testing.TB, layers []Layer, o Options) string {
	t.Helper()
	path := filepath.Join(t.TempDir(), "written.gpkg")
	if err := Write(t.Context(), path, layers, o); err != nil {
		t.Fatal(err)
	}
	return path
}

// query gives the rows of a query as text.
func query(t *testing.T, path, q string, args ...any) []string {
	t.Helper()
	db, err := sql.Open("sqlite", path)
	if err != nil {
		t.Fatal(err)
	}
	defer db.Close()
	rows, err := db.Query(q, args...)
	if err != nil {
		t.Fatalf("%s: %v", q, err)
	}
	defer rows.Close()
	columns, err := rows.Columns()
	if err != nil {
		t.Fatal(err)
	}
	var out []string
	for rows.Next() {
		cells, into := make([]any, len(columns)), make([]any, len(columns))
		for i := range cells {
			into[i] = &cells[i]
		}
		if err := rows.Scan(into...); err != nil {
			t.Fatal(err)
		}
		parts := make([]string, len(cells))
		for i, c := range cells {
			parts[i] = fmt.Sprint(c)
		}
		out = append(out, strings.Join(parts, "|"))
	}
	if err := rows.Err(); err != nil {
		t.Fatal(err)
	}
	return out
}

func wantRows(t *testing.T, path, q string, want ...string) {
	t.Helper()
	if got := query(t, path, q); !slices.Equal(got, want) {
		t.Errorf("%s\ngot  %q\nwant %q", q, got, want)
	}
}

func TestFileAsTheStandardSays(t *testing.T) {
	path := written(t, sample(), Options{Changed: changed})
	b, err := os.ReadFile(path)
	if err != nil {
		t.Fatal(err)
	}
	if string(b[:16]) != "SQLite format 3\x00" || string(b[68:72]) != "GPKG" || binary.BigEndian.Uint32(b[60:]) != 10300 || b[18] != 1 || b[19] != 1 {
		t.Errorf("header %q", b[:100])
	}
	wantRows(t, path, `PRAGMA integrity_check`, "ok")
	wantRows(t, path, `PRAGMA foreign_key_check`)
	wantRows(t, path, `SELECT name FROM sqlite_master WHERE type = 'table' AND name NOT LIKE 'sqlite_%' AND NOT (name GLOB 'rtree_*_node' OR name GLOB 'rtree_*_parent' OR name GLOB 'rtree_*_rowid') ORDER BY name`,
		"Parcels", "empty", "gpkg_contents", "gpkg_data_column_constraints", "gpkg_data_columns", "gpkg_extensions", "gpkg_geometry_columns",
		"gpkg_spatial_ref_sys", "mixed lines", "prices", "rtree_Parcels_geom_2", "rtree_mixed lines_geom", `rtree_wind "order" by_geom`, `wind "order" by`)
	wantRows(t, path, `SELECT name FROM sqlite_master WHERE type IN ('trigger', 'view')`)
	wantRows(t, path, `SELECT srs_id, organization, organization_coordsys_id FROM gpkg_spatial_ref_sys ORDER BY srs_id`, "-1|NONE|-1", "0|NONE|0", "4326|EPSG|4326")
	wantRows(t, path, `SELECT table_name, data_type, identifier, CAST(last_change AS TEXT), min_x, min_y, max_x, max_y, srs_id FROM gpkg_contents`,
		"Parcels|features|Parcels of the study|2024-05-06T07:08:09.000Z|-9|-48|10.5|50.5|4326",
		`wind "order" by|features|wind "order" by|2024-05-06T07:08:09.000Z|9|48|10.285714285714286|49.285714285714285|4326`,
		"mixed lines|features|mixed lines|2024-05-06T07:08:09.000Z|1|2|180|90|4326",
		"prices|attributes|prices|2024-05-06T07:08:09.000Z|<nil>|<nil>|<nil>|<nil>|<nil>",
		"empty|attributes|empty|2024-05-06T07:08:09.000Z|<nil>|<nil>|<nil>|<nil>|<nil>")
	wantRows(t, path, `SELECT * FROM gpkg_geometry_columns`,
		"Parcels|geom_2|MULTIPOLYGON|4326|0|0", `wind "order" by|geom|POINT|4326|0|0`, "mixed lines|geom|GEOMETRY|4326|0|0")
	wantRows(t, path, `SELECT table_name, column_name, extension_name, scope FROM gpkg_extensions`,
		"Parcels|geom_2|gpkg_rtree_index|write-only", `wind "order" by|geom|gpkg_rtree_index|write-only`, "mixed lines|geom|gpkg_rtree_index|write-only",
		"gpkg_data_columns|<nil>|gpkg_schema|read-write", "gpkg_data_column_constraints|<nil>|gpkg_schema|read-write")
	wantRows(t, path, `SELECT table_name, column_name, title, description FROM gpkg_data_columns`,
		"Parcels|area|area|unit: ha", `Parcels|größe "m²"|größe "m²"|unit: m2`, `wind "order" by|height|height|unit: m`, "prices|price|price|unit: EUR/MWh")
	wantRows(t, path, `SELECT name, type, "notnull", pk FROM pragma_table_info('Parcels')`,
		"fid_2|INTEGER|1|1", "geom_2|MULTIPOLYGON|0|0", "feature_id|TEXT|0|0", "select|TEXT|0|0", "area|DOUBLE|0|0", "Area_2|INTEGER|0|0", `größe "m²"|DOUBLE|0|0`,
		"fid|INTEGER|0|0", "rowid|INTEGER|0|0", "owned|BOOLEAN|0|0", "mixed|TEXT|0|0", "nothing|TEXT|0|0", "geom|TEXT|0|0")
	wantRows(t, path, `SELECT name, type FROM pragma_table_info('prices')`, "fid|INTEGER", "year|INTEGER", "price|DOUBLE")
	if bytes.Contains(b, []byte("Mrs X")) || bytes.Contains(b, []byte("owner")) {
		t.Error("a personal column was written")
	}
	b, err = os.ReadFile(written(t, sample(), Options{Personal: true}))
	if err != nil {
		t.Fatal(err)
	}
	if !bytes.Contains(b, []byte("Mrs X")) || !bytes.Contains(b, []byte("1970-01-01T00:00:00.000Z")) {
		t.Error("the personal column that was asked for is missing, or the time is another")
	}
}

// The index holds every geometry that has a position, in boxes of 32 bits rounded outwards.
func TestIndex(t *testing.T) {
	path := written(t, sample(), Options{})
	for table, l := range map[string]*geo.Layer{"Parcels_geom_2": sample()[0].Layer, `wind "order" by_geom`: sample()[1].Layer, "mixed lines_geom": sample()[2].Layer} {
		index := "rtree_" + table
		wantRows(t, path, `SELECT rtreecheck('`+index+`')`, "ok")
		var want []string
		for i, f := range l.Features {
			fid := i + 1
			if n, err := strconv.Atoi(f.ID); err == nil {
				fid = n
			}
			b := emptyBox()
			if b.add(f.Geometry); b.empty() {
				continue
			}
			want = append(want, strconv.Itoa(fid))
			rows := query(t, path, `SELECT minx, maxx, miny, maxy FROM "`+strings.ReplaceAll(index, `"`, `""`)+`" WHERE id = ?`, fid)
			if len(rows) != 1 {
				t.Fatalf("%s %d: %q", index, fid, rows)
			}
			for k, s := range strings.Split(rows[0], "|") {
				got, err := strconv.ParseFloat(s, 64)
				if err != nil {
					t.Fatal(err)
				}
				exact := [...]float64{b.minX, b.maxX, b.minY, b.maxY}[k]
				inside := got >= exact == (k%2 == 1) || got == exact
				if !inside || math.Abs(got-exact) > 2e-5 {
					t.Errorf("%s %d: side %d is %v, the geometry's %v", index, fid, k, got, exact)
				}
			}
		}
		wantRows(t, path, `SELECT id FROM "`+strings.ReplaceAll(index, `"`, `""`)+`" ORDER BY id`, want...)
	}
}

// Read back, everything is as it was but for what is documented.
func TestReadBack(t *testing.T) {
	f, err := gpkgin.Open(t.Context(), written(t, sample(), Options{Personal: true}))
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	tables := f.Tables()
	for i, l := range sample() {
		res, err := f.Read(t.Context(), tables[i].Name, gpkgin.Options{})
		if err != nil {
			t.Fatal(err)
		}
		want := *l.Layer
		want.Name = tables[i].Title
		switch i {
		case 0:
			want.Columns = slices.Insert(slices.Clone(want.Columns), 0, geo.Column{Name: "feature_id"})
			want.Columns[3].Name = "Area_2"
			want.Columns[4].Personal = false
			for j := range want.Features {
				ft := &want.Features[j]
				ft.Values = slices.Insert(slices.Clone(ft.Values), 0, text(ft.ID))
				ft.ID = strconv.Itoa(j + 1)
				if v := &ft.Values[9]; v.Kind != geo.Null {
					*v = text(v.String())
				}
			}
		}
		if want.Features == nil && len(res.Layer.Features) == 0 {
			res.Layer.Features = nil
		}
		if !reflect.DeepEqual(*res.Layer, want) {
			t.Errorf("%s:\ngot  %+v\nwant %+v", tables[i].Name, *res.Layer, want)
		}
		if crs := map[bool]string{true: "EPSG:4326"}[i < 3]; res.CRS != crs {
			t.Errorf("%s: %q", tables[i].Name, res.CRS)
		}
	}
}

// The dump is what ogrinfo of GDAL 3.6.2 printed of the file; where it is installed, it prints it again.
func TestAgainstGDAL(t *testing.T) {
	path := written(t, sample(), Options{Changed: changed})
	recorded, err := os.ReadFile("../../../testdata/formats/gpkg/written.txt")
	if err != nil {
		t.Fatal(err)
	}
	want, err := gpkgtest.Parse(string(recorded))
	if err != nil {
		t.Fatal(err)
	}
	if tool, err := exec.LookPath("ogrinfo"); err == nil {
		live, err := exec.Command(tool, "-al", path).Output()
		if err != nil {
			t.Fatal(err)
		}
		got, err := gpkgtest.Parse(string(live))
		if err != nil {
			t.Fatal(err)
		}
		if !reflect.DeepEqual(got, want) {
			t.Errorf("the recorded dump is not what the installed GDAL prints:\n%s", live)
		}
	}
	f, err := gpkgin.Open(t.Context(), path)
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	tables := f.Tables()
	if len(want) != len(tables) {
		t.Fatalf("%d layers, want %d", len(tables), len(want))
	}
	for i, l := range want {
		res, err := f.Read(t.Context(), tables[i].Name, gpkgin.Options{})
		if err != nil {
			t.Fatal(err)
		}
		for _, d := range gpkgtest.Differences(res.Layer, l) {
			t.Error(d)
		}
	}
}

// An index search of another program finds what the index should give it.
func TestIndexAgainstGDAL(t *testing.T) {
	tool, err := exec.LookPath("ogrinfo")
	if err != nil {
		t.Log("ogrinfo is not installed; TestIndex holds the index to its numbers")
		return
	}
	for _, triggers := range []bool{false, true} {
		path := written(t, sample(), Options{Triggers: triggers})
		count := func(args ...string) int {
			out, err := exec.Command(tool, args...).CombinedOutput()
			if err != nil {
				t.Fatalf("%v: %s", err, out)
			}
			return strings.Count(string(out), "OGRFeature(")
		}
		if n := count("-q", "-al", "-spat", "9.99", "47.99", "10.01", "48.31", path, `wind "order" by`); n != 3 {
			t.Errorf("%d machines found, want 3", n)
		}
		count("-q", path, "-sql", `INSERT INTO "wind ""order"" by" (geom, height) SELECT geom, 7 FROM "wind ""order"" by" WHERE fid = 10`)
		found := count("-q", "-al", "-spat", "8.99", "47.99", "9.01", "48.01", path, `wind "order" by`)
		if want := map[bool]int{false: 1, true: 2}[triggers]; found != want {
			t.Errorf("with triggers %v: %d machines found after an edit, want %d", triggers, found, want)
		}
	}
}

func TestTriggers(t *testing.T) {
	path := written(t, sample(), Options{Triggers: true})
	wantRows(t, path, `SELECT name FROM sqlite_master WHERE type = 'trigger' AND tbl_name = 'mixed lines' ORDER BY name`,
		"rtree_mixed lines_geom_delete", "rtree_mixed lines_geom_insert", "rtree_mixed lines_geom_update1", "rtree_mixed lines_geom_update2",
		"rtree_mixed lines_geom_update3", "rtree_mixed lines_geom_update4")
	db, err := sql.Open("sqlite", path)
	if err != nil {
		t.Fatal(err)
	}
	defer db.Close()
	if _, err := db.Exec(`UPDATE "mixed lines" SET geom = NULL`); err == nil || !strings.Contains(err.Error(), "ST_IsEmpty") {
		t.Errorf("a program without the functions is not refused: %v", err)
	}
}

func TestSameBytes(t *testing.T) {
	first, err := os.ReadFile(written(t, sample(), Options{Changed: changed, Triggers: true}))
	if err != nil {
		t.Fatal(err)
	}
	path := written(t, sample()[1:], Options{})
	for range 3 {
		if err := Write(t.Context(), path, sample(), Options{Changed: changed, Triggers: true, Replace: true}); err != nil {
			t.Fatal(err)
		}
		again, err := os.ReadFile(path)
		if err != nil {
			t.Fatal(err)
		}
		if !bytes.Equal(first, again) {
			t.Error("the bytes differ")
		}
	}
	entries, err := os.ReadDir(filepath.Dir(path))
	if err != nil {
		t.Fatal(err)
	}
	if len(entries) != 1 {
		t.Errorf("beside the file lie %v", entries)
	}
}

func TestNeverOverUnlessAsked(t *testing.T) {
	dir := t.TempDir()
	path := filepath.Join(dir, "mine.gpkg")
	if err := os.WriteFile(path, []byte("mine"), 0o600); err != nil {
		t.Fatal(err)
	}
	if err := Write(t.Context(), path, sample(), Options{}); !errors.Is(err, fs.ErrExist) {
		t.Errorf("%v", err)
	}
	ctx, cancel := context.WithCancel(t.Context())
	cancel()
	if err := Write(ctx, path, sample(), Options{Replace: true}); !errors.Is(err, context.Canceled) {
		t.Errorf("%v", err)
	}
	if b, err := os.ReadFile(path); err != nil || string(b) != "mine" {
		t.Errorf("%q, %v", b, err)
	}
	if err := Write(t.Context(), filepath.Join(dir, "none", "x.gpkg"), sample(), Options{}); !errors.Is(err, fs.ErrNotExist) {
		t.Errorf("%v", err)
	}
	if err := Write(t.Context(), path, sample(), Options{Replace: true}); err != nil {
		t.Fatal(err)
	}
	wantRows(t, path, `SELECT count(*) FROM gpkg_contents`, "5")
	entries, err := os.ReadDir(dir)
	if err != nil {
		t.Fatal(err)
	}
	if len(entries) != 1 {
		t.Errorf("beside the file lie %v", entries)
	}
}

func TestRefusals(t *testing.T) {
	one := func(f geo.Feature) []Layer {
		return []Layer{{Name: "x", Layer: &geo.Layer{Columns: []geo.Column{{Name: "a"}}, Features: []geo.Feature{f}}}}
	}
	wide := &geo.Layer{Columns: make([]geo.Column, maxColumns+1)}
	for name, c := range map[string]struct {
		layers []Layer
		says   string
	}{
		"nothing":      {nil, "no layer"},
		"no layer":     {[]Layer{{Name: "x"}}, "holds nothing"},
		"same name":    {[]Layer{{Name: "x", Layer: &geo.Layer{}}, {Name: "X", Layer: &geo.Layer{}}}, "two layers"},
		"reserved":     {[]Layer{{Name: "GPKG_contents", Layer: &geo.Layer{}}}, "gpkg_"},
		"values":       {one(geo.Feature{ID: "1"}), "0 values for 1 columns"},
		"not finite":   {one(geo.Feature{ID: "7", Values: []geo.Value{num(math.Inf(1))}}), `layer "x", feature 1 (7): column "a"`},
		"metres":       {one(geo.Feature{ID: "1", Values: []geo.Value{none}, Geometry: shaped(geo.Points, [][]geo.LonLat{ring(500000, 5300000)})}), "degrees"},
		"nowhere":      {one(geo.Feature{ID: "1", Values: []geo.Value{none}, Geometry: shaped(geo.Points, [][]geo.LonLat{ring(math.NaN(), 0)})}), "degrees"},
		"no kind":      {one(geo.Feature{ID: "1", Values: []geo.Value{none}, Geometry: shaped(geo.NoGeometry, [][]geo.LonLat{ring(1, 2)})}), "no kind"},
		"shape":        {one(geo.Feature{ID: "1", Values: []geo.Value{none}, Geometry: shaped(geo.Points, [][]geo.LonLat{ring(1, 2, 3, 4)})}), "one position"},
		"many columns": {[]Layer{{Name: "x", Layer: wide}}, "leave some out"},
	} {
		path := filepath.Join(t.TempDir(), "x.gpkg")
		err := Write(t.Context(), path, c.layers, Options{})
		if err == nil || !strings.Contains(err.Error(), c.says) {
			t.Errorf("%s: %v", name, err)
		}
		if _, err := os.Stat(path); !errors.Is(err, fs.ErrNotExist) {
			t.Errorf("%s: something was written: %v", name, err)
		}
	}
}

func TestNames(t *testing.T) {
	empty := &geo.Layer{}
	path := written(t, []Layer{{Name: "a\x00b\n", Title: "same", Layer: empty}, {Title: "same", Layer: empty}, {Name: "\xff", Title: "SAME", Layer: empty}}, Options{})
	wantRows(t, path, `SELECT table_name, identifier FROM gpkg_contents`, "a_b_|same", "layer|same (2)", "_|SAME (3)")
}

func BenchmarkWrite20000Polygons(b *testing.B) {
	l := &geo.Layer{Name: "many", Columns: []geo.Column{{Name: "name"}, {Name: "area_ha", Unit: "ha"}, {Name: "owned"}}}
	for i := range 20_000 {
		r := make([]geo.LonLat, 31)
		for k := range r {
			sin, cos := math.Sincos(2 * math.Pi * float64(k%30) / 30)
			r[k] = geo.LonLat{Lon: 9 + float64(i%200)/100 + cos/300, Lat: 48 + float64(i/200)/100 + sin/300}
		}
		l.Features = append(l.Features, geo.Feature{ID: strconv.Itoa(i + 1), Geometry: shaped(geo.Polygons, [][]geo.LonLat{r}),
			Values: []geo.Value{text("parcel " + strconv.Itoa(i)), num(float64(i) / 7), yes(i%2 == 0)}})
	}
	path := filepath.Join(b.TempDir(), "x.gpkg")
	b.ReportAllocs()
	for b.Loop() {
		if err := Write(b.Context(), path, []Layer{{Layer: l}}, Options{Replace: true}); err != nil {
			b.Fatal(err)
		}
	}
}
