package gpkgin

import (
	"context"
	"errors"
	"fmt"
	"math"
	"os"
	"slices"
	"strconv"
	"strings"
	"unicode/utf8"

	"groundtally/geo"
	"groundtally/geo/formats"
	"groundtally/geo/formats/gpkggeom"
)

// Options say what is read and how much at most. A limit of zero is the default.
type Options struct {
	File         string             // name used in errors and notices; the path where it is empty
	Progress     func(done, of int) // of is -1 where the number of rows is not known
	MaxFeatures  int                // 5,000,000
	MaxPositions int                // 100,000,000
}

// Ledger counts what became of a table's rows.
type Ledger struct {
	Read       int // features in the layer
	LeftOut    int // rows whose geometry cannot be read, which are not in the layer
	Repaired   int // features in the layer whose geometry was changed: rings closed, parts taken out
	NoGeometry int // features in the layer without a geometry
}

// Result is what a table holds.
type Result struct {
	Layer   *geo.Layer
	CRS     string // as in Table
	Notices []geo.Notice
	Ledger  Ledger
}

const progressEvery = 1000 // rows

// Read reads a table of the file by its name. Features come in the order of the primary key, which as
// text is their identifier; where there is none, or it comes again, they get numbers. A feature whose
// geometry cannot be read is left out with a notice that says why; a fault of the file itself is an
// error, and nothing is taken.
//
// A whole number key that is called fid, id or the like is the identifier alone; any other key is a
// column too. A column with values of several kinds becomes text, a column of binary data is left out.
func (f *File) Read(ctx context.Context, table string, o Options) (Result, error) {
	if o.File == "" {
		o.File = f.path
	}
	if o.MaxFeatures <= 0 {
		o.MaxFeatures = 5_000_000
	}
	if o.MaxPositions <= 0 {
		o.MaxPositions = 100_000_000
	}
	if f.conn == nil {
		return Result{}, &formats.Error{File: o.File, Code: "closed", What: "the file was closed", Do: "open it again"}
	}
	t, err := f.table(table)
	if err != nil {
		return Result{}, placed(o.File, "", err)
	}
	r := &reader{f: f, t: t, about: f.about[t.Name], o: o, sums: map[sumKey]*sum{}}
	if err := r.read(ctx); err != nil {
		return Result{}, placed(o.File, tableWord(t.Name), err)
	}
	return r.result(), nil
}

// placed gives an error the name of the file that the caller uses.
func placed(file, where string, err error) error {
	err = plain(file, where, err)
	var e *formats.Error
	if errors.As(err, &e) {
		e.File = file
		if e.Where == "" {
			e.Where = where
		}
	}
	return err
}

// table finds a table, if need be without regard to case.
func (f *File) table(name string) (Table, error) {
	for _, same := range []func(string) bool{
		func(s string) bool { return s == name },
		func(s string) bool { return fold(s) == fold(name) },
	} {
		for _, t := range f.tables {
			if same(t.Name) {
				return t, nil
			}
		}
	}
	const shown = 20
	var names []string
	for i, t := range f.tables {
		if i == shown {
			names = append(names, fmt.Sprintf("or %d others", len(f.tables)-shown))
			break
		}
		names = append(names, strconv.Quote(t.Name))
	}
	return Table{}, &formats.Error{Code: "no_such_table", What: "there is no table " + strconv.Quote(name) + " in it", Do: "choose one of " + strings.Join(names, ", ")}
}

// reader reads one table.
type reader struct {
	f     *File
	t     Table
	about about
	o     Options

	keys    []string // SQL of the columns that order the rows
	shape   string   // SQL of the geometry; empty without one
	first   bool     // the first column of a view is no geometry and thus its key
	columns []column

	layer     geo.Layer
	named     []bool // the feature has a key of its own
	row       string // key of the row being read, for notices
	rows      int
	positions int
	lastKey   int64
	rising    bool // keys are whole numbers that must rise
	ledger    Ledger
	sums      map[sumKey]*sum
}

// column is one attribute on its way into the layer.
type column struct {
	field
	truth  bool // declared BOOLEAN
	binary int  // values of binary data
	seen   [geo.Bool + 1]int
}

func (r *reader) read(ctx context.Context) (err error) {
	// One transaction, so that all that is read is of one moment.
	if _, err := r.f.conn.ExecContext(ctx, `BEGIN`); err != nil {
		return err
	}
	defer func() {
		_, back := r.f.conn.ExecContext(context.WithoutCancel(ctx), `ROLLBACK`)
		if back != nil && !strings.Contains(back.Error(), "no transaction is active") { // SQLite may have ended it
			err = errors.Join(err, back)
		}
	}()
	query, err := r.plan(ctx)
	if err != nil {
		return err
	}
	width := len(r.keys) + len(r.columns)
	if r.shape != "" {
		width++
	}
	of := r.t.Count
	if err := r.f.each(ctx, query, width, func(c []cell) error {
		if r.o.Progress != nil && r.rows%progressEvery == 0 {
			r.o.Progress(r.rows, of)
		}
		return r.feature(c)
	}); err != nil {
		return err
	}
	if r.o.Progress != nil {
		r.o.Progress(r.rows, max(of, r.rows))
	}
	return r.unchanged()
}

// unchanged makes sure that a file taken as unchanging was so.
func (r *reader) unchanged() error {
	if r.f.stamp == nil {
		return nil
	}
	now, err := os.Stat(r.f.path)
	if err != nil {
		return err
	}
	if now.Size() != r.f.stamp.Size() || !now.ModTime().Equal(r.f.stamp.ModTime()) {
		return &formats.Error{Code: "changed", What: "another program changed the file while it was read", Do: "wait until it is done, then open it again"}
	}
	return nil
}

// plan settles columns and key and gives the query. Every column stands behind a plus sign, which
// changes no value but keeps the driver from making times of texts in columns declared DATE; and behind
// the table's name, because SQLite takes a lone quoted name that it does not know for a text.
func (r *reader) plan(ctx context.Context) (string, error) {
	fields, err := r.f.fields(ctx, r.t.Name)
	if err != nil {
		return "", err
	}
	if len(fields) == 0 {
		return "", &formats.Error{Code: "damaged", What: "the table has no columns", Do: doCopy}
	}
	if r.t.Kind == Features {
		at := slices.IndexFunc(fields, func(c field) bool { return fold(c.name) == fold(r.t.Geometry) })
		if r.t.Geometry == "" || at < 0 {
			return "", &formats.Error{Code: "no_geometry_column", What: "the file does not say in which column its geometry stands", Do: doExport}
		}
		r.shape = "+t." + quote(fields[at].name)
		r.first = at > 0
		fields = slices.Delete(fields, at, at+1)
	} else {
		r.first = true
	}
	r.settleKey(fields)
	if r.about.noSRS {
		r.count("reference_system_missing", strconv.FormatInt(r.about.srs, 10), "", 1)
	}
	for _, c := range fields {
		switch {
		case len(r.keys) == 1 && r.keys[0] == "t."+quote(c.name) && technical(c):
		case binaryType(c.decl):
			r.count("column_left_out", c.name, "", 1)
		default:
			r.columns = append(r.columns, column{field: c, truth: c.decl == "BOOLEAN" || c.decl == "BOOL"})
		}
	}
	for _, c := range r.columns {
		r.layer.Columns = append(r.layer.Columns, geo.Column{Name: r.clean(c.name, ""), Unit: r.f.units[fold(r.t.Name)][fold(c.name)]})
	}
	return r.query(), nil
}

func (r *reader) query() string {
	list := make([]string, 0, len(r.columns)+2)
	for _, k := range r.keys {
		list = append(list, "+"+k)
	}
	if r.shape != "" {
		list = append(list, r.shape)
	}
	for _, c := range r.columns {
		list = append(list, "+t."+quote(c.name))
	}
	from := ` FROM main.` + quote(r.t.Name) + ` AS t`
	if !r.about.view {
		return `SELECT ` + strings.Join(list, ", ") + from + orderBy(r.keys)
	}
	// A view may compute for ever. Sorting makes SQLite compute all of it for the first row, the only
	// one for which a context can stop it; the limit bounds what is kept meanwhile.
	for i := range list {
		list[i] += ` AS c` + strconv.Itoa(i)
	}
	return `SELECT q.* FROM (SELECT ` + strings.Join(list, ", ") + from + ` LIMIT ` + strconv.Itoa(r.o.MaxFeatures+1) + `) AS q ORDER BY +q.c0`
}

func orderBy(keys []string) string {
	if len(keys) == 0 {
		return ""
	}
	return ` ORDER BY ` + strings.Join(keys, ", ")
}

// settleKey finds what orders the rows: the primary key, the first column of a view as the standard
// asks, or else the row number that SQLite keeps.
func (r *reader) settleKey(fields []field) {
	if r.about.view {
		if r.first && len(fields) > 0 {
			r.keys = []string{"t." + quote(fields[0].name)}
		}
		return
	}
	parts := map[int64]string{}
	for _, c := range fields {
		if c.pk > 0 {
			parts[c.pk] = "t." + quote(c.name)
		}
	}
	for n := int64(1); parts[n] != ""; n++ {
		r.keys = append(r.keys, parts[n])
	}
	r.rising = len(r.keys) == 1
	if len(r.keys) > 0 {
		return
	}
	r.count("no_key", "", "", 1)
	for _, name := range []string{"rowid", "_rowid_", "oid"} {
		if !slices.ContainsFunc(fields, func(c field) bool { return fold(c.name) == name }) {
			r.keys, r.rising = []string{"t." + name}, true
			return
		}
	}
}

// technical tells whether a key only numbers the rows. A number behind fid is what writers put there
// when a column is called fid already.
func technical(c field) bool {
	name := fold(c.name)
	if rest, ok := strings.CutPrefix(name, "fid_"); ok && strings.Trim(rest, "0123456789") == "" {
		name = "fid"
	}
	return strings.Contains(c.decl, "INT") && slices.Contains([]string{"fid", "id", "gid", "ogc_fid", "objectid", "rowid", "pk"}, name)
}

// binaryType tells whether a column is declared to hold binary data: BLOB, or a geometry that is not
// the table's own.
func binaryType(decl string) bool {
	name, _, _ := strings.Cut(decl, "(")
	return slices.Contains([]string{"BLOB", "BINARY", "VARBINARY", "GEOMETRY", "POINT", "LINESTRING", "POLYGON", "MULTIPOINT",
		"MULTILINESTRING", "MULTIPOLYGON", "GEOMETRYCOLLECTION", "CURVE", "SURFACE", "CURVEPOLYGON", "COMPOUNDCURVE",
		"CIRCULARSTRING", "MULTICURVE", "MULTISURFACE"}, strings.TrimSpace(name))
}

// feature reads one row.
func (r *reader) feature(c []cell) error {
	r.rows++
	if r.rows > r.o.MaxFeatures {
		return &formats.Error{Code: "too_many", What: fmt.Sprintf("it has more than %d features", r.o.MaxFeatures), Do: doSplit}
	}
	id, named, err := r.key(c[:len(r.keys)])
	if err != nil {
		return err
	}
	r.row = id
	c = c[len(r.keys):]
	ft := geo.Feature{ID: id}
	if r.shape != "" {
		ok, err := r.geometry(&ft, c[0].v)
		if err != nil {
			return err
		}
		if !ok {
			r.ledger.LeftOut++
			return nil
		}
		c = c[1:]
	}
	if len(r.columns) > 0 {
		ft.Values = make([]geo.Value, len(r.columns))
	}
	for i := range r.columns {
		v := r.value(&r.columns[i], c[i].v)
		r.columns[i].seen[v.Kind]++
		ft.Values[i] = v
	}
	r.layer.Features = append(r.layer.Features, ft)
	r.named = append(r.named, named)
	return nil
}

// key gives the identifier of a row. Keys that do not rise mean that the table runs in a circle, as a
// damaged one may.
func (r *reader) key(c []cell) (id string, named bool, err error) {
	if n, whole := int64(0), false; r.rising {
		if n, whole = c[0].v.(int64); whole {
			if r.rows > 1 && n <= r.lastKey {
				return "", false, &formats.Error{Code: "damaged", Where: tableWord(r.t.Name) + ", row " + strconv.Itoa(r.rows), What: "the file is damaged: its keys do not rise", Do: doCopy}
			}
			r.lastKey = n
		}
		r.rising = whole
	}
	parts := make([]string, len(c))
	for i := range c {
		parts[i] = r.clean(c[i].text(), "")
		named = named || parts[i] != ""
	}
	if !named {
		return strconv.Itoa(r.rows), false, nil
	}
	return strings.Join(parts, "/"), true, nil
}

// geometry reads the geometry of a feature. It gives false where that cannot be done.
func (r *reader) geometry(ft *geo.Feature, v any) (bool, error) {
	if v == nil {
		r.ledger.NoGeometry++
		r.count("geometry_missing", "", r.row, 1)
		return true, nil
	}
	b, ok := v.([]byte)
	if !ok {
		r.unreadable(gpkggeom.ErrNotABlob)
		return false, nil
	}
	blob, err := gpkggeom.Decode(b)
	if err != nil {
		r.unreadable(err)
		return false, nil
	}
	if r.positions += blob.Geometry.Count(); r.positions > r.o.MaxPositions {
		return false, &formats.Error{Code: "too_many", What: fmt.Sprintf("it has more than %d positions", r.o.MaxPositions), Do: doSplit}
	}
	g, closed, short := tidy(blob.Geometry)
	ft.Geometry = g
	r.count("ring_closed", "", r.row, closed)
	r.count("part_too_short", "", r.row, short)
	r.count("collection_parted", "", r.row, blob.LeftOut)
	if closed+short+blob.LeftOut > 0 {
		r.ledger.Repaired++
	}
	if g.Empty() {
		r.count("geometry_empty", "", r.row, 1)
	}
	if blob.Dropped {
		r.count("height_left_out", "", r.row, 1)
	}
	if int64(blob.SRS) != r.about.srs {
		r.count("reference_system_differs", strconv.FormatInt(r.about.srs, 10), r.row, 1)
	}
	if degrees(r.t.CRS) && beyondDegrees(g) {
		r.count("coordinates_not_degrees", "", r.row, 1)
	}
	return true, nil
}

func degrees(crs string) bool { return crs == "EPSG:4326" || crs == "OGC:CRS84" }

func beyondDegrees(g geo.LonLatGeometry) bool {
	out := false
	g.Each(func(p geo.LonLat) { out = out || math.Abs(p.Lon) > 180 || math.Abs(p.Lat) > 90 })
	return out
}

// unreadable notes why a geometry cannot be read. The reason without the place groups the features.
func (r *reader) unreadable(err error) {
	reason := err
	for next := errors.Unwrap(reason); next != nil; next = errors.Unwrap(reason) {
		reason = next
	}
	code := "geometry_unreadable"
	if errors.Is(err, gpkggeom.ErrCurved) {
		code = "geometry_curved"
	}
	r.countWhat(code, reason.Error(), r.row, 1, err.Error())
}

// tidy closes open rings and takes out lines of one position and rings of fewer than three, as the
// reader of GeoJSON does. A polygon without its outer ring goes with its holes.
func tidy(g geo.LonLatGeometry) (out geo.LonLatGeometry, closed, short int) {
	out.Kind = g.Kind
	for _, part := range g.Parts {
		switch g.Kind {
		case geo.Lines:
			if len(part[0]) == 1 {
				short++
			}
			if len(part[0]) < 2 {
				continue
			}
		case geo.Polygons:
			var c, s int
			part, c, s = tidyRings(part)
			closed, short = closed+c, short+s
			if len(part) == 0 {
				continue
			}
		}
		out.Parts = append(out.Parts, part)
	}
	return out, closed, short
}

func tidyRings(part [][]geo.LonLat) (out [][]geo.LonLat, closed, short int) {
	outer := true
	for i, ring := range part {
		shut := len(ring) > 0 && ring[0] != ring[len(ring)-1]
		if shut {
			ring = append(ring, ring[0])
		}
		switch {
		case len(ring) < 4:
			if len(ring) > 0 || i > 0 {
				short++
			}
			outer = outer && i > 0
			continue
		case !outer:
			short++
			continue
		}
		if shut {
			closed++
		}
		out = append(out, ring)
	}
	return out, closed, short
}

const maxExact = 1 << 53 // whole numbers up to this size are exact in a float64

// value reads one attribute.
func (r *reader) value(c *column, v any) geo.Value {
	switch v := v.(type) {
	case int64:
		switch {
		case c.truth && (v == 0 || v == 1):
			return geo.BoolValue(v == 1)
		case v > maxExact || v < -maxExact:
			r.count("number_as_text", c.name, r.row, 1)
			return geo.TextValue(strconv.FormatInt(v, 10))
		}
		return geo.NumberValue(float64(v))
	case float64:
		if math.IsInf(v, 0) || math.IsNaN(v) {
			r.count("number_not_finite", c.name, r.row, 1)
			return geo.Value{}
		}
		return geo.NumberValue(v)
	case string:
		return geo.TextValue(r.clean(v, c.name))
	case []byte:
		c.binary++
		r.count("value_left_out", c.name, r.row, 1)
	}
	return geo.Value{}
}

// clean replaces bytes that are no characters, which a text of another encoding leaves behind.
func (r *reader) clean(s, column string) string {
	if utf8.ValidString(s) {
		return s
	}
	r.count("text_not_utf8", column, r.row, 1)
	return strings.ToValidUTF8(s, string(utf8.RuneError))
}
