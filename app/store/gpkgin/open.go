package gpkgin

import (
	"context"
	"database/sql"
	"encoding/binary"
	"errors"
	"fmt"
	"io"
	"net/url"
	"os"
	"path/filepath"
	"strconv"
	"strings"
	"time"

	"modernc.org/sqlite"

	"groundtally/geo"
	"groundtally/geo/formats"
)

// The kinds of table.
const (
	Features   = "features"
	Attributes = "attributes"
)

// Table is one that can be read.
type Table struct {
	Name     string
	Title    string // the name for people; Name where the file gives none
	Geometry string // name of the geometry column; empty in an attributes table
	Type     string // POLYGON, MULTIPOINT and so on; GEOMETRY for a mixture; empty without a geometry
	CRS      string // "EPSG:25832", or a definition in well-known text; empty when the file does not say
	Count    int    // rows; -1 for a view, which is computed only when it is read
	Kind     string // Features or Attributes
}

// File is an open GeoPackage. It serves one call at a time.
type File struct {
	path    string
	db      *sql.DB
	conn    *sql.Conn
	tables  []Table
	about   map[string]about // by name as in the contents
	units   map[string]map[string]string
	notices []geo.Notice
	study   bool        // it has the table by which a study is told
	stamp   os.FileInfo // how the file looked when it was opened; nil where SQLite looks after changes
}

// about is what reading a table takes beyond what its user sees.
type about struct {
	view  bool
	srs   int64
	noSRS bool // the reference system that is named is not described
}

const (
	busyTimeout = 5 * time.Second
	maxTables   = 10_000
	maxValue    = 256 << 20 // bytes of one value or row
	limitLength = 0         // SQLITE_LIMIT_LENGTH
)

// Open opens the GeoPackage at path for reading and lists its tables. A file that is none, that holds
// only tiles, or that is damaged or locked gives a *formats.Error.
func Open(ctx context.Context, path string) (*File, error) { return open(ctx, path, busyTimeout) }

func open(ctx context.Context, path string, busy time.Duration) (*File, error) {
	f := &File{path: path, about: map[string]about{}, units: map[string]map[string]string{}}
	info, err := f.sniff()
	if err != nil {
		return nil, plain(path, "", err)
	}
	if err := f.start(ctx, info, busy); err != nil {
		return nil, plain(path, "", errors.Join(err, f.Close()))
	}
	return f, nil
}

// start connects and lists the tables.
func (f *File) start(ctx context.Context, info os.FileInfo, busy time.Duration) error {
	wal, walThere := beside(f.path, "-wal")
	_, journalThere := beside(f.path, "-journal")
	alone := !walThere && !journalThere
	err := f.connect(ctx, alone, busy)
	if code := sqliteCode(err) & 0xff; walThere && (code == codeCantOpen || code == codeReadOnly) {
		// Reading the edits takes a file of its own beside them, which cannot be made here.
		f.note(geo.Notice{Code: "edits_not_read", Severity: geo.Fault, Args: map[string]string{"beside": filepath.Base(f.path) + "-wal"}})
		alone, wal = true, 0
		err = f.connect(ctx, true, busy)
	}
	if err != nil {
		return err
	}
	if wal > 0 {
		f.note(geo.Notice{Code: "edits_unmerged", Severity: geo.Warning, Args: map[string]string{"beside": filepath.Base(f.path) + "-wal"}})
	}
	if alone {
		f.stamp = info
	}
	return f.list(ctx)
}

func (f *File) note(n geo.Notice) { f.notices = append(f.notices, n) }

// Tables lists what can be read, in the order of the file.
func (f *File) Tables() []Table { return append([]Table(nil), f.tables...) }

// Study reports whether the file is a study, whose tables are no layers as somebody delivered them.
func (f *File) Study() bool { return f.study }

// Notices tells what was found when the file was opened. Every Result repeats it.
func (f *File) Notices() []geo.Notice { return append([]geo.Notice(nil), f.notices...) }

// Close closes the file.
func (f *File) Close() error {
	var err error
	if f.conn != nil {
		err = f.conn.Close()
		f.conn = nil
	}
	if f.db != nil {
		err = errors.Join(err, f.db.Close())
		f.db = nil
	}
	return err
}

// beside gives the size of a side file of the database.
func beside(path, ending string) (int64, bool) {
	info, err := os.Stat(path + ending)
	if err != nil {
		return 0, false
	}
	return info.Size(), true
}

func (f *File) fault(code, what, do string) error {
	return &formats.Error{File: f.path, Code: code, What: what, Do: do}
}

// sniff tells what can be told from the first bytes, in plain words.
func (f *File) sniff() (os.FileInfo, error) {
	info, err := os.Stat(f.path) // looked at before it is opened: opening a pipe would wait
	if err != nil {
		return nil, err
	}
	switch {
	case info.IsDir():
		return nil, f.fault("folder", "it is a folder", "choose a file in it")
	case !info.Mode().IsRegular():
		return nil, f.fault("not_a_file", "it is not an ordinary file", "copy what it gives into a file first")
	case info.Size() == 0:
		return nil, f.fault("empty_file", "the file is empty", doCopy)
	}
	h, err := os.Open(f.path)
	if err != nil {
		return nil, err
	}
	defer h.Close()
	head := make([]byte, 100)
	n, err := io.ReadFull(h, head)
	if err != nil && !errors.Is(err, io.ErrUnexpectedEOF) {
		return nil, err
	}
	const magic = "SQLite format 3\x00"
	switch {
	case !strings.HasPrefix(string(head[:n]), magic):
		return nil, f.fault("not_sqlite", "it is not a GeoPackage: it does not begin as an SQLite database does", "choose a file that ends in .gpkg, or read it as what it is")
	case n < len(head):
		return nil, f.fault("damaged", "the file is damaged or cut short", doCopy)
	}
	switch id := binary.BigEndian.Uint32(head[68:]); id {
	case 0x47504B47, 0x47503130, 0x47503131, 0x47503132: // GPKG, GP10, GP11, GP12
	default:
		// Some programs forget the number; whether it is a GeoPackage is then told by its tables.
		f.note(geo.Notice{Code: "application_number", Severity: geo.Info, Args: map[string]string{"number": strconv.FormatUint(uint64(id), 10)}})
	}
	return info, nil
}

// connect opens the database for reading alone. Where nobody else has a hand on the file it is
// declared unchanging, so that SQLite needs neither locks nor files beside it.
func (f *File) connect(ctx context.Context, alone bool, busy time.Duration) (err error) {
	abs, err := filepath.Abs(f.path)
	if err != nil {
		return err
	}
	p := filepath.ToSlash(abs)
	if !strings.HasPrefix(p, "/") {
		p = "/" + p // a drive letter
	}
	q := url.Values{"mode": {"ro"}, "_defensive": {"1"}}
	if alone {
		q.Set("immutable", "1")
	}
	for _, v := range []string{
		fmt.Sprintf("busy_timeout(%d)", busy.Milliseconds()),
		"query_only(1)",
		"trusted_schema(0)",
		"cell_size_check(1)",
		"mmap_size(0)", // a file that another program cuts must give an error, not a crash
	} {
		q.Add("_pragma", v)
	}
	u := url.URL{Scheme: "file", Path: p, RawQuery: q.Encode()}
	db, err := sql.Open("sqlite", u.String())
	if err != nil {
		return err
	}
	db.SetMaxOpenConns(1)
	conn, err := db.Conn(ctx)
	if err != nil {
		return errors.Join(err, db.Close())
	}
	_, err = sqlite.Limit(conn, limitLength, maxValue)
	if err == nil {
		var n int
		err = conn.QueryRowContext(ctx, `SELECT count(*) FROM sqlite_master`).Scan(&n) // the first look at the file
	}
	if err != nil {
		return errors.Join(err, conn.Close(), db.Close())
	}
	f.conn, f.db = conn, db
	return nil
}

// fold makes letters small as SQLite does when it compares names: those of ASCII alone.
func fold(s string) string {
	return strings.Map(func(r rune) rune {
		if r >= 'A' && r <= 'Z' {
			return r + 'a' - 'A'
		}
		return r
	}, s)
}

func quote(name string) string { return `"` + strings.ReplaceAll(name, `"`, `""`) + `"` }

// cell takes a value as the driver gives it.
type cell struct{ v any }

func (c *cell) Scan(v any) error {
	c.v = v
	return nil
}

func (c *cell) text() string {
	switch v := c.v.(type) {
	case string:
		return v
	case []byte:
		return string(v)
	case int64:
		return strconv.FormatInt(v, 10)
	case float64:
		return decimal(v)
	}
	return ""
}

func (c *cell) whole() int64 {
	n, ok := c.v.(int64)
	if !ok {
		n, _ = strconv.ParseInt(strings.TrimSpace(c.text()), 10, 64) // what is no number is 0: not said
	}
	return n
}

// each runs the query and calls fn for every row.
func (f *File) each(ctx context.Context, query string, width int, fn func([]cell) error, args ...any) (err error) {
	rows, err := f.conn.QueryContext(ctx, query, args...)
	if err != nil {
		return err
	}
	defer func() { err = errors.Join(err, rows.Close()) }()
	cells := make([]cell, width)
	into := make([]any, width)
	for i := range cells {
		into[i] = &cells[i]
	}
	for rows.Next() {
		if err := ctx.Err(); err != nil {
			return err
		}
		if err := rows.Scan(into...); err != nil {
			return err
		}
		if err := fn(cells); err != nil {
			return err
		}
	}
	return rows.Err()
}

// entry is a table or view of the database.
type entry struct {
	name          string
	view, virtual bool
}

// schema lists the tables and views by their folded names.
func (f *File) schema(ctx context.Context) (map[string]entry, error) {
	out := map[string]entry{}
	err := f.each(ctx, `SELECT type, name, rootpage FROM main.sqlite_master WHERE type IN ('table', 'view')`, 3, func(c []cell) error {
		name, view := c[1].text(), c[0].text() == "view"
		out[fold(name)] = entry{name: name, view: view, virtual: !view && c[2].whole() == 0}
		return nil
	})
	return out, err
}

// field is a column of a table as the database describes it.
type field struct {
	name, decl string
	pk         int64 // its place in the primary key, from 1; 0 when it is not of it
}

func (f *File) fields(ctx context.Context, table string) ([]field, error) {
	var out []field
	err := f.each(ctx, `SELECT name, type, pk, hidden FROM pragma_table_xinfo(?, 'main')`, 4, func(c []cell) error {
		if c[3].whole() != 1 { // hidden columns of a virtual table are no data
			out = append(out, field{name: c[0].text(), decl: strings.ToUpper(strings.TrimSpace(c[1].text())), pk: c[2].whole()})
		}
		return nil
	}, table)
	return out, err
}

// geometryColumn is a row of gpkg_geometry_columns.
type geometryColumn struct {
	column, kind string
	srs          int64
}

// list reads the tables in which a GeoPackage says what it holds.
func (f *File) list(ctx context.Context) error {
	there, err := f.schema(ctx)
	if err != nil {
		return err
	}
	real := func(name string) bool {
		e, ok := there[name]
		return ok && !e.view && !e.virtual
	}
	if !real("gpkg_contents") {
		return f.fault("not_geopackage", "it is a database, but not a GeoPackage: it has no table gpkg_contents", "export the layer as GeoPackage")
	}
	f.study = real("gt_schema")
	shapes := map[string]geometryColumn{}
	if real("gpkg_geometry_columns") {
		if err := f.each(ctx, `SELECT table_name, column_name, geometry_type_name, srs_id FROM main.gpkg_geometry_columns`, 4, func(c []cell) error {
			if name := fold(c[0].text()); shapes[name].column == "" {
				shapes[name] = geometryColumn{column: c[1].text(), kind: strings.ToUpper(c[2].text()), srs: c[3].whole()}
			}
			return nil
		}); err != nil {
			return err
		}
	}
	systems := map[int64]string{}
	if real("gpkg_spatial_ref_sys") {
		if systems, err = f.systems(ctx); err != nil {
			return err
		}
	}
	if real("gpkg_data_columns") {
		// Where this table is not as the standard says, layers can be read all the same.
		if err := f.readUnits(ctx); err != nil && sqliteCode(err) != codeError {
			return err
		}
	}
	pictures, err := f.contents(ctx, there, shapes, systems)
	if err != nil {
		return err
	}
	if len(f.tables) == 0 {
		if pictures > 0 {
			return f.fault("tiles_only", "it holds only pictures of a map (tiles), no layer", "ask its publisher for the data behind the map")
		}
		return f.fault("no_table", "it holds no layer", doExport)
	}
	for i, t := range f.tables {
		if t.Count < 0 {
			continue
		}
		if err := f.conn.QueryRowContext(ctx, `SELECT count(*) FROM main.`+quote(t.Name)).Scan(&f.tables[i].Count); err != nil {
			return plain(f.path, tableWord(t.Name), err)
		}
	}
	return nil
}

func tableWord(name string) string { return "table " + strconv.Quote(name) }

// contents lists the tables that can be read and counts those of pictures.
func (f *File) contents(ctx context.Context, there map[string]entry, shapes map[string]geometryColumn, systems map[int64]string) (pictures int, err error) {
	err = f.each(ctx, `SELECT table_name, data_type, identifier FROM main.gpkg_contents`, 3, func(c []cell) error {
		t := Table{Name: c[0].text(), Title: c[2].text()}
		kind := fold(c[1].text())
		switch kind {
		case Features:
			t.Kind = Features
		case Attributes, "aspatial": // the word before the standard had one
			t.Kind = Attributes
		default:
			pictures++
			return nil
		}
		e, ok := there[fold(t.Name)]
		if !ok || e.virtual || strings.HasPrefix(fold(t.Name), "sqlite_") {
			f.note(geo.Notice{Code: "table_not_there", Severity: geo.Warning, Layer: t.Name})
			return nil
		}
		if _, twice := f.about[e.name]; twice {
			return nil
		}
		if len(f.tables) == maxTables {
			return f.fault("too_many", fmt.Sprintf("it has more than %d tables", maxTables), "split it")
		}
		t.Name = e.name
		if t.Title == "" {
			t.Title = t.Name
		}
		a := about{view: e.view}
		if e.view {
			t.Count = -1
		}
		if t.Kind == Features {
			s := shapes[fold(t.Name)]
			t.Geometry, t.Type, a.srs = s.column, s.kind, s.srs
			var known bool
			t.CRS, known = systems[s.srs]
			a.noSRS = !known && s.srs > 0
		}
		f.about[t.Name] = a
		f.tables = append(f.tables, t)
		return nil
	})
	return pictures, err
}

// systems names the reference systems: by authority and number where other programs know them, else by
// their definition. The two undefined ones of the standard, 0 and -1, have no name.
func (f *File) systems(ctx context.Context) (map[int64]string, error) {
	fields, err := f.fields(ctx, "gpkg_spatial_ref_sys")
	if err != nil {
		return nil, err
	}
	newer := `''`
	for _, c := range fields {
		if fold(c.name) == "definition_12_063" { // well-known text of 2015, an extension
			newer = "s.definition_12_063"
		}
	}
	out := map[int64]string{0: "", -1: ""}
	err = f.each(ctx, `SELECT s.srs_id, s.organization, s.organization_coordsys_id, s.definition, `+newer+` FROM main.gpkg_spatial_ref_sys s`, 5, func(c []cell) error {
		if id := c[0].whole(); id > 0 {
			out[id] = system(c[1].text(), c[2].whole(), c[3].text(), c[4].text())
		}
		return nil
	})
	return out, err
}

// ogcNames are the systems of the OGC, whose names are not numbers.
var ogcNames = map[int64]string{27: "OGC:CRS27", 83: "OGC:CRS83", 84: "OGC:CRS84"}

func system(organization string, number int64, definition, newer string) string {
	organization = strings.ToUpper(strings.TrimSpace(organization))
	if number > 0 {
		switch organization {
		case "EPSG", "ESRI":
			return organization + ":" + strconv.FormatInt(number, 10)
		case "OGC":
			if name := ogcNames[number]; name != "" {
				return name
			}
		}
	}
	for _, text := range []string{definition, newer} {
		if text = strings.TrimSpace(text); text != "" && !strings.EqualFold(text, "undefined") {
			return text
		}
	}
	return ""
}

// readUnits takes the units out of the descriptions of columns.
func (f *File) readUnits(ctx context.Context) error {
	return f.each(ctx, `SELECT table_name, column_name, description FROM main.gpkg_data_columns`, 3, func(c []cell) error {
		unit, ok := strings.CutPrefix(c[2].text(), "unit: ")
		if !ok {
			return nil
		}
		table := fold(c[0].text())
		if f.units[table] == nil {
			f.units[table] = map[string]string{}
		}
		f.units[table][fold(c[1].text())] = unit
		return nil
	})
}
