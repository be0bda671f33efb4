package store

import (
	"context"
	"database/sql"
	"errors"
	"math/rand/v2"
	"os"
	"os/exec"
	"path/filepath"
	"regexp"
	"runtime"
	"strconv"
	"strings"
	"testing"
	"time"

	"groundtally/app/study"
	"groundtally/geo"
)

// run executes statements in a file as another program would.
func run(t *testing.T, path string, statements ...string) {
	t.Helper()
	db, err := sql.Open("sqlite", path2uri(path))
	if err != nil {
		t.Fatal(err)
	}
	defer func() {
		if err := db.Close(); err != nil {
			t.Fatal(err)
		}
	}()
	db.SetMaxOpenConns(1)
	for _, s := range statements {
		if _, err := db.Exec(s); err != nil {
			t.Fatalf("%s: %v", s, err)
		}
	}
}

func TestCreateRefusesToOverwrite(t *testing.T) {
	path := filepath.Join(t.TempDir(), "kept.gpkg")
	if err := os.WriteFile(path, []byte("precious"), 0o600); err != nil {
		t.Fatal(err)
	}
	if _, err := Create(ctx, path); !errors.Is(err, study.ErrNameInUse) || !strings.Contains(err.Error(), path) {
		t.Errorf("error %v", err)
	}
	if b, err := os.ReadFile(path); err != nil || string(b) != "precious" {
		t.Errorf("the file now holds %q, %v", b, err)
	}
	if _, err := Create(ctx, filepath.Join(t.TempDir(), "no", "such", "folder.gpkg")); !errors.Is(err, study.ErrNotThere) {
		t.Errorf("no folder: %v", err)
	}
}

func TestCreateLeavesNothingBehindWhenItFails(t *testing.T) {
	for n := 1; ; n++ {
		path := filepath.Join(t.TempDir(), "new.gpkg")
		o := usual()
		o.pragmas = []string{"max_page_count(" + strconv.Itoa(n) + ")"}
		f, err := create(ctx, path, o)
		if err == nil {
			closeStore(t, f)
			if n < 5 {
				t.Errorf("a study fits into %d pages", n)
			}
			return
		}
		if !errors.Is(wrap(path, "create", err), study.ErrDiskFull) {
			t.Fatalf("%d pages: %v", n, err)
		}
		left, err := os.ReadDir(filepath.Dir(path))
		if err != nil || len(left) != 0 {
			t.Fatalf("%d pages: %v is left, %v", n, left, err)
		}
	}
}

func TestFilesThatAreNoStudies(t *testing.T) {
	dir := t.TempDir()
	_, good := newStudy(t)
	whole, err := os.ReadFile(good)
	if err != nil {
		t.Fatal(err)
	}
	cases := []struct {
		name    string
		content []byte
		want    error
		says    string
	}{
		{"empty.gpkg", nil, study.ErrNotAStudy, "empty"},
		{"text.gpkg", []byte("lon,lat\n9,48\n"), study.ErrNotAStudy, "not a GeoPackage"},
		{"short.gpkg", []byte("SQL"), study.ErrNotAStudy, "not a GeoPackage"},
		{"head only.gpkg", whole[:16], study.ErrNotAStudy, ""},
		{"cut.gpkg", whole[:len(whole)/2], study.ErrDamaged, ""},
		{"cut by a page.gpkg", whole[:len(whole)-4096], study.ErrDamaged, ""},
		{"cut in the first page.gpkg", whole[:1000], study.ErrDamaged, ""},
	}
	for _, c := range cases {
		t.Run(c.name, func(t *testing.T) {
			path := filepath.Join(dir, c.name)
			if err := os.WriteFile(path, c.content, 0o600); err != nil {
				t.Fatal(err)
			}
			_, err := Open(ctx, path)
			if !errors.Is(err, c.want) || !strings.Contains(err.Error(), c.says) || !strings.Contains(err.Error(), c.name) {
				t.Errorf("error %v", err)
			}
		})
	}
	if _, err := Open(ctx, filepath.Join(dir, "nothing.gpkg")); !errors.Is(err, study.ErrNotThere) {
		t.Errorf("no file: %v", err)
	}
	if _, err := os.Stat(filepath.Join(dir, "nothing.gpkg")); !errors.Is(err, os.ErrNotExist) {
		t.Errorf("opening made a file: %v", err)
	}
	if _, err := Open(ctx, dir); !errors.Is(err, study.ErrNotAStudy) || !strings.Contains(err.Error(), "folder") {
		t.Errorf("folder: %v", err)
	}
	foreign := filepath.Join(dir, "foreign.gpkg")
	run(t, foreign, `CREATE TABLE gpkg_contents (table_name TEXT)`)
	if _, err := Open(ctx, foreign); !errors.Is(err, study.ErrNotAStudy) {
		t.Errorf("foreign: %v", err)
	}
	noNumber := filepath.Join(dir, "number gone.gpkg")
	if err := os.WriteFile(noNumber, whole, 0o600); err != nil {
		t.Fatal(err)
	}
	run(t, noNumber, `DELETE FROM gt_schema`)
	if _, err := Open(ctx, noNumber); !errors.Is(err, study.ErrDamaged) {
		t.Errorf("schema number gone: %v", err)
	}
}

func TestNewerStudy(t *testing.T) {
	s, path := newStudy(t)
	closeStore(t, s)
	run(t, path, `UPDATE gt_schema SET version = 99`)
	if _, err := Open(ctx, path); !errors.Is(err, study.ErrNewerStudy) || !strings.Contains(err.Error(), "99") {
		t.Errorf("error %v", err)
	}
}

func TestMigrations(t *testing.T) {
	s, path := newStudy(t)
	if _, err := s.Commit(ctx, entry("set", set("a", "", `1`)), nil); err != nil {
		t.Fatal(err)
	}
	broken := errors.New("broken on purpose")
	fail := true
	o := usual()
	o.migrations = append(o.migrations[:len(o.migrations):len(o.migrations)],
		func(ctx context.Context, c *sql.Conn) error {
			_, err := c.ExecContext(ctx, `ALTER TABLE gt_record ADD COLUMN extra TEXT DEFAULT 'x'`)
			return err
		},
		func(ctx context.Context, c *sql.Conn) error {
			if _, err := c.ExecContext(ctx, `CREATE TABLE gt_more (a TEXT)`); err != nil {
				return err
			}
			if fail {
				return broken
			}
			return nil
		})
	if _, err := open(ctx, path, o); !errors.Is(err, broken) || !strings.Contains(err.Error(), "schema 3") {
		t.Fatalf("failing migration: %v", err)
	}
	closeStore(t, reopen(t, path)) // still of the first schema
	fail = false
	for range 2 {
		f, err := open(ctx, path, o)
		if err != nil {
			t.Fatal(err)
		}
		if v, err := f.version(ctx); err != nil || v != 3 {
			t.Errorf("schema %d, %v", v, err)
		}
		if st, err := f.Load(ctx); err != nil || len(st.Records) != 1 {
			t.Errorf("records %+v, %v", st.Records, err)
		}
		closeStore(t, f)
	}
	if _, err := Open(ctx, path); !errors.Is(err, study.ErrNewerStudy) {
		t.Errorf("the older program opens it: %v", err)
	}
}

func TestWriteAheadLoggingIsTurnedOff(t *testing.T) {
	s, path := newStudy(t)
	closeStore(t, s)
	run(t, path, `PRAGMA journal_mode = WAL`, `CREATE TABLE other (a)`)
	f := reopen(t, path).(*file)
	for pragma, want := range map[string]string{"journal_mode": "delete", "synchronous": "2", "foreign_keys": "1", "application_id": strconv.Itoa(applicationID), "user_version": "10300"} {
		var got string
		if err := f.db.QueryRow(`PRAGMA ` + pragma).Scan(&got); err != nil || got != want {
			t.Errorf("%s = %s, %v, want %s", pragma, got, err, want)
		}
	}
}

func TestReadOnly(t *testing.T) {
	dir := t.TempDir()
	path := filepath.Join(dir, "study.gpkg")
	s, err := Create(ctx, path)
	if err != nil {
		t.Fatal(err)
	}
	layer := version(awkward()["many parts"])
	if _, err := s.Commit(ctx, entry("add", set("a", "", `1`)), []study.Version{layer}); err != nil {
		t.Fatal(err)
	}
	closeStore(t, s)
	asOrdinaryUser(t, dir)
	try := func(name string) {
		t.Helper()
		s, err := Open(ctx, path)
		if err != nil {
			t.Fatalf("%s: it cannot even be read: %v", name, err)
		}
		defer closeStore(t, s)
		if _, changed, err := s.Version(ctx, layer.Digest); err != nil || changed {
			t.Errorf("%s: changed=%t, %v", name, changed, err)
		}
		if _, err := s.Commit(ctx, entry("set", set("b", "", `1`)), nil); !errors.Is(err, study.ErrReadOnly) || !strings.Contains(err.Error(), path) {
			t.Errorf("%s: %v", name, err)
		}
		if st, err := s.Load(ctx); err != nil || len(st.Journal) != 1 {
			t.Errorf("%s: %+v, %v", name, st, err)
		}
	}
	chmod := func(p string, mode os.FileMode) {
		t.Helper()
		if err := os.Chmod(p, mode); err != nil {
			t.Fatal(err)
		}
	}
	chmod(path, 0o444)
	try("read-only file")
	chmod(path, 0o644)
	if runtime.GOOS != "windows" { // a folder's read-only mark means something else there
		chmod(dir, 0o555)
		try("read-only folder")
		if _, err := Create(ctx, filepath.Join(dir, "new.gpkg")); !errors.Is(err, study.ErrReadOnly) {
			t.Errorf("new study in a read-only folder: %v", err)
		}
		chmod(dir, 0o755)
		chmod(path, 0)
		if _, err := Open(ctx, path); !errors.Is(err, study.ErrReadOnly) || !strings.Contains(err.Error(), "right to read") {
			t.Errorf("unreadable: %v", err)
		}
		chmod(path, 0o644)
	}
}

// Another program changes a layer's table: the content comes as it stands, marked as changed, and
// adding the version again restores it.
func TestChangedOutside(t *testing.T) {
	base := bigLayer(3)
	digest := study.LayerDigest(base)
	table := "layer_" + digest[:12]
	for name, c := range map[string]struct {
		statement string
		look      func(l *geo.Layer) bool
	}{
		"value":      {`UPDATE ` + table + ` SET owner = 'Eve' WHERE fid = 2`, func(l *geo.Layer) bool { return l.Features[1].Values[0] == geo.TextValue("Eve") }},
		"type":       {`UPDATE ` + table + ` SET area_ha = 'n/a' WHERE fid = 2`, func(l *geo.Layer) bool { return l.Features[1].Values[1] == geo.TextValue("n/a") }},
		"truth":      {`UPDATE ` + table + ` SET free = 7 WHERE fid = 2`, func(l *geo.Layer) bool { return len(l.Features) == 3 }},
		"blob":       {`UPDATE ` + table + ` SET owner = x'41' WHERE fid = 2`, func(l *geo.Layer) bool { return l.Features[1].Values[0] == geo.TextValue("A") }},
		"number":     {`UPDATE ` + table + ` SET fid = 9 WHERE fid = 1`, func(l *geo.Layer) bool { return l.Features[2].ID == "P-0" }},
		"row gone":   {`DELETE FROM ` + table + ` WHERE fid = 1`, func(l *geo.Layer) bool { return len(l.Features) == 2 }},
		"row added":  {`INSERT INTO ` + table + ` (owner) VALUES ('new')`, func(l *geo.Layer) bool { return len(l.Features) == 4 && l.Features[3].ID == "fid:4" }},
		"geometry":   {`UPDATE ` + table + ` SET geom = NULL WHERE fid = 1`, func(l *geo.Layer) bool { return l.Features[0].Geometry.Kind == geo.NoGeometry }},
		"column":     {`ALTER TABLE ` + table + ` DROP COLUMN free`, func(l *geo.Layer) bool { return l.Features[0].Values[2].Kind == geo.Null }},
		"index":      {`CREATE VIRTUAL TABLE rtree_` + table + `_geom USING rtree(id, minx, maxx, miny, maxy); CREATE TRIGGER other AFTER INSERT ON ` + table + ` BEGIN INSERT INTO rtree_` + table + `_geom VALUES (NEW.fid, ST_MinX(NEW.geom), 0, 0, 0); END; DELETE FROM ` + table, func(l *geo.Layer) bool { return len(l.Features) == 0 }},
		"table gone": {`DROP TABLE ` + table, nil},
		"no blob":    {`UPDATE ` + table + ` SET geom = x'00' WHERE fid = 1`, nil},
	} {
		t.Run(name, func(t *testing.T) {
			s, path := newStudy(t)
			if _, err := s.Commit(ctx, entry("add"), []study.Version{version(base)}); err != nil {
				t.Fatal(err)
			}
			run(t, path, c.statement)
			v, changed, err := s.Version(ctx, digest)
			if c.look == nil {
				if !errors.Is(err, study.ErrDamaged) {
					t.Errorf("error %v", err)
				}
			} else if err != nil || !changed || !c.look(v.Layer) {
				t.Errorf("changed=%t, %v, %+v", changed, err, v.Layer)
			}
			if _, err := s.Commit(ctx, entry("add"), []study.Version{version(base)}); err != nil {
				t.Fatal(err)
			}
			if _, changed, err := s.Version(ctx, digest); err != nil || changed {
				t.Errorf("after adding it again: changed=%t, %v", changed, err)
			}
			if err := s.Check(ctx); err != nil {
				t.Error(err)
			}
		})
	}
}

// An independent program lists the layers and counts their features. Where GDAL is not installed, the
// tables that it would read are read here.
func TestAnotherProgramReadsIt(t *testing.T) {
	s, path := newStudy(t)
	want := map[string]string{} // table to "count type"
	for name, what := range map[string]string{"many parts": "2 MULTIPOLYGON", "one part each": "2 POLYGON", "mixed kinds": "4 GEOMETRY", "no column": "1 POINT", "table only": "1 ", "kinds": "5 ", "own names": "1 POINT"} {
		v := version(awkward()[name])
		if _, err := s.Commit(ctx, entry("add"), []study.Version{v}); err != nil {
			t.Fatal(err)
		}
		want["layer_"+v.Digest[:12]] = what
	}
	closeStore(t, s)
	got := map[string]string{}
	if tool, err := exec.LookPath("ogrinfo"); err == nil {
		out, err := exec.Command(tool, "-ro", "-so", "-al", path).CombinedOutput()
		if err != nil || strings.Contains(string(out), "Warning") || strings.Contains(string(out), "ERROR") {
			t.Errorf("%v: %s", err, out)
		}
		re := regexp.MustCompile(`(?m)^Layer name: (\S+)\n(?:Metadata:\n(?:  .*\n)*)?Geometry: (.*)\nFeature Count: (\d+)`)
		names := map[string]string{"None": "", "Point": "POINT", "Polygon": "POLYGON", "Multi Polygon": "MULTIPOLYGON", "Unknown (any)": "GEOMETRY"}
		for _, m := range re.FindAllStringSubmatch(string(out), -1) {
			got[m[1]] = m[3] + " " + names[m[2]]
		}
	} else {
		db, err := sql.Open("sqlite", path2uri(path))
		if err != nil {
			t.Fatal(err)
		}
		defer db.Close()
		db.SetMaxOpenConns(1)
		rows, err := db.Query(`SELECT c.table_name, coalesce(g.geometry_type_name, '') FROM gpkg_contents c LEFT JOIN gpkg_geometry_columns g USING (table_name)`)
		if err != nil {
			t.Fatal(err)
		}
		for rows.Next() {
			var table, kind string
			if err := rows.Scan(&table, &kind); err != nil {
				t.Fatal(err)
			}
			got[table] = kind
		}
		if err := rows.Close(); err != nil {
			t.Fatal(err)
		}
		for table, kind := range got {
			var n string
			if err := db.QueryRow(`SELECT count(*) FROM ` + quote(table)).Scan(&n); err != nil {
				t.Fatal(err)
			}
			got[table] = n + " " + kind
		}
	}
	if _, ok := got["gt_journal"]; !ok {
		t.Error("the journal is not listed")
	}
	delete(got, "gt_journal")
	for table, what := range want {
		if got[table] != what {
			t.Errorf("%s: %q, want %q", table, got[table], what)
		}
	}
	if len(got) != len(want) {
		t.Errorf("listed %v", got)
	}
}

// What OGC 12-128r18 asks of the tables, for every layer.
func TestRequiredTables(t *testing.T) {
	s, _ := newStudy(t)
	for _, l := range awkward() {
		if _, err := s.Commit(ctx, entry("add"), []study.Version{version(l)}); err != nil {
			t.Fatal(err)
		}
	}
	db := s.(*file).db
	for rule, query := range map[string]string{
		"reference systems -1, 0, 4326":            `SELECT 3 - count(*) FROM gpkg_spatial_ref_sys WHERE srs_id IN (-1, 0, 4326)`,
		"contents without a table":                 `SELECT count(*) FROM gpkg_contents WHERE table_name NOT IN (SELECT name FROM sqlite_master)`,
		"features without a geometry column":       `SELECT count(*) FROM gpkg_contents WHERE data_type = 'features' AND table_name NOT IN (SELECT table_name FROM gpkg_geometry_columns)`,
		"geometry columns without features":        `SELECT count(*) FROM gpkg_geometry_columns WHERE table_name NOT IN (SELECT table_name FROM gpkg_contents WHERE data_type = 'features')`,
		"features in another system":               `SELECT count(*) FROM gpkg_contents WHERE data_type = 'features' AND srs_id IS NOT 4326`,
		"titles that do not name the version":      `SELECT count(*) FROM gt_layer l JOIN gpkg_contents c USING (table_name) WHERE instr(c.identifier, substr(l.digest, 1, 8)) = 0`,
		"own tables that are not registered":       `SELECT count(*) FROM sqlite_master WHERE type = 'table' AND name LIKE 'gt\_%' ESCAPE '\' AND name NOT IN (SELECT table_name FROM gpkg_extensions)`,
		"registered tables that are not there":     `SELECT count(*) FROM gpkg_extensions WHERE table_name NOT IN (SELECT name FROM sqlite_master)`,
		"tables of an unknown prefix":              `SELECT count(*) FROM sqlite_master WHERE type = 'table' AND name NOT GLOB 'gt_*' AND name NOT GLOB 'gpkg_*' AND name NOT GLOB 'layer_*' AND name NOT GLOB 'sqlite_*'`,
		"layers with positions without an extent":  `SELECT count(*) FROM gpkg_contents WHERE identifier LIKE 'multi%' AND (min_x, min_y, max_x, max_y) IS NOT (0.0, 0.0, 10.0, 10.0)`,
		"layers without positions with an extent":  `SELECT count(*) FROM gpkg_contents WHERE identifier LIKE 'table%' AND min_x IS NOT NULL`,
		"times of change that are not of the form": `SELECT count(*) FROM gpkg_contents WHERE last_change NOT GLOB '????-??-??T??:??:??.???Z'`,
	} {
		var n int
		if err := db.QueryRow(query).Scan(&n); err != nil || n != 0 {
			t.Errorf("%s: %d, %v", rule, n, err)
		}
	}
}

// Bytes of the file are changed at random: every call gives an answer or an error, and none panics.
func TestMalformedFiles(t *testing.T) {
	s, path := newStudy(t)
	v := version(awkward()["kinds"])
	if _, err := s.Commit(ctx, entry("add", set("a", "", `1`)), []study.Version{v}); err != nil {
		t.Fatal(err)
	}
	closeStore(t, s)
	whole, err := os.ReadFile(path)
	if err != nil {
		t.Fatal(err)
	}
	r := rand.New(rand.NewPCG(11, 3))
	bad := filepath.Join(t.TempDir(), "bad.gpkg")
	refused := 0
	for range 150 {
		b := append([]byte(nil), whole...)
		for range 1 + r.IntN(8) {
			b[16+r.IntN(len(b)-16)] = byte(r.Uint32())
		}
		at := r.IntN(len(b) - 200)
		if r.IntN(3) == 0 {
			clear(b[at : at+200])
		}
		if err := os.WriteFile(bad, b, 0o600); err != nil {
			t.Fatal(err)
		}
		limited, cancel := context.WithTimeout(ctx, 10*time.Second)
		s, err := Open(limited, bad)
		if err != nil {
			refused++
			cancel()
			continue
		}
		_, errLoad := s.Load(limited)
		_, changed, errVersion := s.Version(limited, v.Digest)
		errCheck := s.Check(limited)
		if errLoad != nil || errVersion != nil || changed || errCheck != nil {
			refused++
		}
		cancel()
		closeStore(t, s)
	}
	if refused < 20 {
		t.Errorf("only %d of 150 malformed files were noticed", refused)
	}
}

func BenchmarkWrite10kFeatures(b *testing.B) {
	v := version(bigLayer(10_000))
	dir := b.TempDir()
	n := 0
	for b.Loop() {
		n++
		s, err := Create(ctx, filepath.Join(dir, strconv.Itoa(n)+".gpkg"))
		if err != nil {
			b.Fatal(err)
		}
		if _, err := s.Commit(ctx, entry("add"), []study.Version{v}); err != nil {
			b.Fatal(err)
		}
		closeStore(b, s)
	}
}

func BenchmarkRead10kFeatures(b *testing.B) {
	s, _ := newStudy(b)
	v := version(bigLayer(10_000))
	if _, err := s.Commit(ctx, entry("add"), []study.Version{v}); err != nil {
		b.Fatal(err)
	}
	for b.Loop() {
		if _, changed, err := s.Version(ctx, v.Digest); err != nil || changed {
			b.Fatal(changed, err)
		}
	}
}

func BenchmarkCommitOneSetting(b *testing.B) {
	s, _ := newStudy(b)
	before := ""
	n := 0
	for b.Loop() {
		n++
		after := strconv.Itoa(n)
		if _, err := s.Commit(ctx, entry("set", set("a", before, after)), nil); err != nil {
			b.Fatal(err)
		}
		before = after
	}
}
