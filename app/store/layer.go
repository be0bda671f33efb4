package store

import (
	"context"
	"database/sql"
	"encoding/json"
	"errors"
	"fmt"
	"math"
	"strconv"
	"strings"
	"time"

	"groundtally/app/study"
	"groundtally/geo"
	"groundtally/geo/formats/gpkggeom"
)

const (
	wgs84ID      = 4326
	maxColumns   = 1990 // SQLite holds 2,000 by default, some are ours
	fidColumn    = "fid"
	geomColumn   = "geom"
	idColumn     = "feature_id"
	contentsTime = "2006-01-02T15:04:05.000Z"
)

// The kinds of stored column. A mixed column is TEXT, with the kinds of its values that are not text
// in gt_value_kind.
const (
	textColumn   = "text"
	numberColumn = "number"
	boolColumn   = "bool"
	mixedColumn  = "mixed"
)

// column is how gt_layer.columns describes one attribute.
type column struct {
	Name     string `json:"name"`
	Unit     string `json:"unit,omitempty"`
	Personal bool   `json:"personal,omitempty"`
	SQL      string `json:"sql"` // its name in the table
	Kind     string `json:"kind"`
}

func (c column) sqlType() string {
	switch c.Kind {
	case numberColumn:
		return "DOUBLE"
	case boolColumn:
		return "BOOLEAN"
	}
	return "TEXT"
}

// columnsOf names the columns for SQL and finds out what they hold. SQL names are compared without
// regard to case, so a name that is taken gets a number.
func columnsOf(l *geo.Layer) ([]column, error) {
	if len(l.Columns) > maxColumns {
		return nil, fmt.Errorf("layer %q has %d columns, a study file holds %d; leave some out", l.Name, len(l.Columns), maxColumns)
	}
	used := map[string]bool{fidColumn: true, geomColumn: true, idColumn: true, "rowid": true, "oid": true, "_rowid_": true}
	cols := make([]column, len(l.Columns))
	for i, c := range l.Columns {
		base := strings.Map(func(r rune) rune {
			if r < ' ' || r == 0x7f {
				return '_'
			}
			return r
		}, strings.ToValidUTF8(c.Name, "_"))
		if base == "" {
			base = "column"
		}
		name := base
		for n := 2; used[strings.ToLower(name)]; n++ {
			name = base + "_" + strconv.Itoa(n)
		}
		used[strings.ToLower(name)] = true
		cols[i] = column{Name: c.Name, Unit: c.Unit, Personal: c.Personal, SQL: name, Kind: kindOf(l, i)}
	}
	return cols, nil
}

func kindOf(l *geo.Layer, i int) string {
	var seen [geo.Bool + 1]bool
	for _, f := range l.Features {
		seen[f.Values[i].Kind] = true
	}
	switch [3]bool{seen[geo.Text], seen[geo.Number], seen[geo.Bool]} {
	case [3]bool{false, true, false}:
		return numberColumn
	case [3]bool{false, false, true}:
		return boolColumn
	case [3]bool{true, false, false}, [3]bool{false, false, false}:
		return textColumn
	}
	return mixedColumn
}

// checkLayer refuses what could not be read back the same.
func checkLayer(l *geo.Layer) error {
	for i, f := range l.Features {
		fault := func(format string, args ...any) error {
			return fmt.Errorf("layer %q, feature %d (%s): %s", l.Name, i+1, f.ID, fmt.Sprintf(format, args...))
		}
		if len(f.Values) != len(l.Columns) {
			return fault("it has %d values for %d columns", len(f.Values), len(l.Columns))
		}
		for j, v := range f.Values {
			if v.Kind > geo.Bool {
				return fault("column %q holds a value of unknown kind %d", l.Columns[j].Name, v.Kind)
			}
			if v.Kind == geo.Number && (math.IsNaN(v.Number) || math.IsInf(v.Number, 0)) {
				return fault("column %q holds a number that is not finite", l.Columns[j].Name)
			}
		}
		if f.Geometry.Kind == geo.NoGeometry && len(f.Geometry.Parts) > 0 {
			return fault("it has positions but no kind of geometry")
		}
	}
	return nil
}

func quote(name string) string { return `"` + strings.ReplaceAll(name, `"`, `""`) + `"` }

// putVersion stores a content under its digest. A content that is there already and unchanged is left
// alone; one that another program changed is written anew.
func (f *file) putVersion(ctx context.Context, c *sql.Conn, v study.Version, at time.Time) error {
	if v.Layer == nil {
		return f.putBlob(ctx, c, v)
	}
	if err := checkLayer(v.Layer); err != nil {
		return err
	}
	// The content is digested on another core while it is written; a fault rolls the writing back.
	got := make(chan string, 1)
	go func() { got <- study.LayerDigest(v.Layer) }()
	err := f.putNew(ctx, c, v, at)
	digest := <-got // the content is not read any more once this is back
	if err != nil {
		return err
	}
	if digest != v.Digest {
		return fmt.Errorf("layer %q: content has digest %s, not %s", v.Layer.Name, digest, v.Digest)
	}
	return nil
}

// putNew stores a layer's content unless it is there unchanged.
func (f *file) putNew(ctx context.Context, c *sql.Conn, v study.Version, at time.Time) error {
	old, err := f.layer(ctx, c, v.Digest)
	switch {
	case err == nil && study.LayerDigest(old) == v.Digest:
		return nil
	case err == nil, errors.Is(err, study.ErrDamaged):
		if err := f.dropLayer(ctx, c, v.Digest); err != nil {
			return err
		}
	case !errors.Is(err, study.ErrNotThere):
		return err
	}
	return f.putLayer(ctx, c, v, at)
}

func (f *file) putBlob(ctx context.Context, c *sql.Conn, v study.Version) error {
	if got := study.BlobDigest(v.Media, v.Blob); got != v.Digest {
		return fmt.Errorf("%s file: content has digest %s, not %s", v.Media, got, v.Digest)
	}
	data := v.Blob
	if data == nil {
		data = []byte{}
	}
	err := f.exec(ctx, c, `INSERT INTO gt_blob (digest, media, data) VALUES (?, ?, ?)
		ON CONFLICT (digest) DO UPDATE SET media = excluded.media, data = excluded.data`, v.Digest, v.Media, data)
	if primaryCode(err) == codeTooBig {
		return fmt.Errorf("file of %d bytes is too large for a study; cut it to the district first: %w", len(v.Blob), err)
	}
	return err
}

func (f *file) dropLayer(ctx context.Context, c *sql.Conn, digest string) error {
	var table string
	if err := c.QueryRowContext(ctx, `SELECT table_name FROM gt_layer WHERE digest = ?`, digest).Scan(&table); err != nil {
		return err
	}
	if err := f.exec(ctx, c, `DROP TABLE IF EXISTS `+quote(table)); err != nil {
		return err
	}
	for _, from := range []string{"gt_layer", "gt_value_kind", "gpkg_extensions", "gpkg_geometry_columns", "gpkg_contents"} {
		if err := f.exec(ctx, c, `DELETE FROM `+from+` WHERE table_name = ?`, table); err != nil {
			return err
		}
	}
	return nil
}

// unusedName tries ever longer heads of the digest until taken has no row for the name.
func unusedName(ctx context.Context, c *sql.Conn, taken, digest string, form func(short string) string, lengths ...int) (string, error) {
	for _, n := range append(lengths, len(digest)) {
		name := form(digest[:n])
		var rows int
		if err := c.QueryRowContext(ctx, taken, name).Scan(&rows); err != nil {
			return "", err
		}
		if rows == 0 {
			return name, nil
		}
	}
	return "", fmt.Errorf("%w: a table stands under the name of layer version %s", study.ErrDamaged, digest)
}

func (f *file) putLayer(ctx context.Context, c *sql.Conn, v study.Version, at time.Time) error {
	l := v.Layer
	cols, err := columnsOf(l)
	if err != nil {
		return err
	}
	table, err := unusedName(ctx, c, `SELECT count(*) FROM sqlite_master WHERE lower(name) = ?`, v.Digest,
		func(s string) string { return "layer_" + s }, 12, 24)
	if err != nil {
		return err
	}
	title := strings.ToValidUTF8(l.Name, "_")
	if title == "" {
		title = "layer"
	}
	title, err = unusedName(ctx, c, `SELECT count(*) FROM gpkg_contents WHERE identifier = ?`, v.Digest,
		func(s string) string { return title + " (" + s + ")" }, 8, 16)
	if err != nil {
		return err
	}
	shape := shapeOf(l)
	create := `CREATE TABLE ` + quote(table) + ` (` + fidColumn + ` INTEGER NOT NULL PRIMARY KEY AUTOINCREMENT`
	insert := `INSERT INTO ` + quote(table) + ` (` + fidColumn + `, ` + idColumn
	if shape.any {
		create += `, ` + geomColumn + ` ` + shape.typeName()
		insert += `, ` + geomColumn
	}
	create += `, ` + idColumn + ` TEXT`
	for _, col := range cols {
		create += `, ` + quote(col.SQL) + ` ` + col.sqlType()
		insert += `, ` + quote(col.SQL)
	}
	fixed := 2
	if shape.any {
		fixed = 3
	}
	insert += `) VALUES `
	row := `(?` + strings.Repeat(`, ?`, fixed-1+len(cols)) + `)`
	if err := f.exec(ctx, c, create+`)`); err != nil {
		return err
	}
	dataType := "attributes"
	var srs any
	extent := [4]any{}
	if shape.any {
		dataType, srs = "features", wgs84ID
		if shape.minX <= shape.maxX {
			extent = [4]any{shape.minX, shape.minY, shape.maxX, shape.maxY}
		}
	}
	if err := f.exec(ctx, c, `INSERT INTO gpkg_contents
		(table_name, data_type, identifier, description, last_change, min_x, min_y, max_x, max_y, srs_id)
		VALUES (?, ?, ?, ?, ?, ?, ?, ?, ?, ?)`, table, dataType, title, "Layer version "+v.Digest,
		at.UTC().Format(contentsTime), extent[0], extent[1], extent[2], extent[3], srs); err != nil {
		return err
	}
	if shape.any {
		if err := f.exec(ctx, c, `INSERT INTO gpkg_geometry_columns (table_name, column_name, geometry_type_name, srs_id, z, m)
			VALUES (?, ?, ?, ?, 0, 0)`, table, geomColumn, shape.typeName(), wgs84ID); err != nil {
			return err
		}
	}
	described, err := json.Marshal(cols)
	if err != nil {
		return err
	}
	if err := f.exec(ctx, c, `INSERT INTO gt_layer (digest, table_name, name, columns) VALUES (?, ?, ?, ?)`,
		v.Digest, table, l.Name, string(described)); err != nil {
		return err
	}
	return f.putFeatures(ctx, c, l, table, insert, row, cols, shape)
}

// Rows are put in groups: one statement for many costs less than many statements.
const (
	groupRows   = 64
	groupValues = 4096 // SQLite takes 32,766 in a statement
	groupBytes  = 4 << 20
)

func (f *file) putFeatures(ctx context.Context, c *sql.Conn, l *geo.Layer, table, insert, row string, cols []column, shape shape) (err error) {
	kind, err := c.PrepareContext(ctx, `INSERT INTO gt_value_kind (table_name, fid, pos, kind) VALUES (?, ?, ?, ?)`)
	if err != nil {
		return err
	}
	defer func() { err = errors.Join(err, kind.Close()) }()
	size := max(1, min(groupRows, groupValues/(len(cols)+3), len(l.Features)))
	group, err := c.PrepareContext(ctx, insert+row+strings.Repeat(`, `+row, size-1))
	if err != nil {
		return err
	}
	defer func() { err = errors.Join(err, group.Close()) }()
	var blobs []byte
	waiting := 0 // rows of the group
	args := make([]any, 0, size*(len(cols)+3))
	for i, ft := range l.Features {
		if err := f.mayFail(); err != nil {
			return err
		}
		fid := i + 1
		args = append(args, fid, ft.ID)
		if shape.any {
			if ft.Geometry.Kind == geo.NoGeometry {
				args = append(args, nil)
			} else {
				from := len(blobs)
				if blobs, err = gpkggeom.Append(blobs, ft.Geometry, wgs84ID, shape.multi); err != nil {
					return fmt.Errorf("layer %q, feature %d (%s): %w", l.Name, fid, ft.ID, err)
				}
				args = append(args, blobs[from:])
			}
		}
		for j, v := range ft.Values {
			switch {
			case v.Kind == geo.Null:
				args = append(args, nil)
			case v.Kind == geo.Text || cols[j].Kind == mixedColumn:
				args = append(args, v.String()) // 'g' with the shortest digits reads back to the same bits
			case v.Kind == geo.Number:
				args = append(args, v.Number)
			default:
				args = append(args, v.Bool)
			}
			if cols[j].Kind == mixedColumn && v.Kind != geo.Null && v.Kind != geo.Text {
				if _, err := kind.ExecContext(ctx, table, fid, j, int(v.Kind)); err != nil {
					return err
				}
			}
		}
		switch waiting++; {
		case waiting == size:
			_, err = group.ExecContext(ctx, args...)
		case fid == len(l.Features) || len(blobs) > groupBytes:
			_, err = c.ExecContext(ctx, insert+row+strings.Repeat(`, `+row, waiting-1), args...)
		default:
			continue
		}
		if err != nil {
			return err
		}
		args, blobs, waiting = args[:0], blobs[:0], 0
	}
	return nil
}

// shape is what the geometries of a layer have in common.
type shape struct {
	any                    bool
	kind                   geo.Kind // NoGeometry when kinds are mixed
	multi                  bool     // every blob is of a MULTI type
	minX, minY, maxX, maxY float64
}

func (s shape) typeName() string { return gpkggeom.TypeName(s.kind, s.multi) }

func shapeOf(l *geo.Layer) shape {
	s := shape{minX: math.Inf(1), minY: math.Inf(1), maxX: math.Inf(-1), maxY: math.Inf(-1)}
	mixed := false
	for _, f := range l.Features {
		g := f.Geometry
		if g.Kind == geo.NoGeometry {
			continue
		}
		if s.any && s.kind != g.Kind {
			mixed = true
		}
		s.any, s.kind = true, g.Kind
		if len(g.Parts) != 1 {
			s.multi = true
		}
		g.Each(func(p geo.LonLat) {
			s.minX, s.maxX = math.Min(s.minX, p.Lon), math.Max(s.maxX, p.Lon)
			s.minY, s.maxY = math.Min(s.minY, p.Lat), math.Max(s.maxY, p.Lat)
		})
	}
	if mixed {
		s.kind, s.multi = geo.NoGeometry, false
	}
	return s
}

// Version reads the content with the digest.
func (f *file) Version(ctx context.Context, digest string) (v study.Version, changed bool, err error) {
	err = f.read(ctx, func(c *sql.Conn) error {
		l, err := f.layer(ctx, c, digest)
		if err == nil {
			v = study.Version{Digest: digest, Layer: l}
			changed = study.LayerDigest(l) != digest
			return nil
		}
		if !errors.Is(err, study.ErrNotThere) {
			return err
		}
		v = study.Version{Digest: digest}
		err = c.QueryRowContext(ctx, `SELECT media, data FROM gt_blob WHERE digest = ?`, digest).Scan(&v.Media, &v.Blob)
		if errors.Is(err, sql.ErrNoRows) {
			return fmt.Errorf("layer version %s: %w", digest, study.ErrNotThere)
		}
		changed = study.BlobDigest(v.Media, v.Blob) != digest
		return err
	})
	if err != nil {
		return study.Version{}, false, wrap(f.path, "read study", err)
	}
	return v, changed, nil
}

// layer reads a layer as it stands, also where another program changed it: columns that are gone read
// as missing values, and a value of another type than the column's is taken as it is.
func (f *file) layer(ctx context.Context, c *sql.Conn, digest string) (*geo.Layer, error) {
	var table, described string
	l := &geo.Layer{}
	err := c.QueryRowContext(ctx, `SELECT table_name, name, columns FROM gt_layer WHERE digest = ?`, digest).Scan(&table, &l.Name, &described)
	if errors.Is(err, sql.ErrNoRows) {
		return nil, fmt.Errorf("layer version %s: %w", digest, study.ErrNotThere)
	}
	if err != nil {
		return nil, err
	}
	var cols []column
	if err := json.Unmarshal([]byte(described), &cols); err != nil {
		return nil, fmt.Errorf("%w: the columns of layer version %s are not described: %w", study.ErrDamaged, digest, err)
	}
	there := map[string]bool{}
	if err := each(ctx, c, `SELECT name FROM pragma_table_info(?)`, func(r *sql.Rows) error {
		var name string
		err := r.Scan(&name)
		there[name] = true
		return err
	}, table); err != nil {
		return nil, err
	}
	if !there[fidColumn] {
		return nil, fmt.Errorf("%w: table %s of layer %q is gone", study.ErrDamaged, table, l.Name)
	}
	kinds, err := valueKinds(ctx, c, table)
	if err != nil {
		return nil, err
	}
	pick := func(name string) string {
		if there[name] {
			return quote(name)
		}
		return "NULL"
	}
	query := `SELECT ` + fidColumn + `, ` + pick(idColumn) + `, ` + pick(geomColumn)
	for _, col := range cols {
		l.Columns = append(l.Columns, geo.Column{Name: col.Name, Unit: col.Unit, Personal: col.Personal})
		query += `, ` + pick(col.SQL)
	}
	cells := make([]any, len(cols)+3)
	into := make([]any, len(cells))
	for i := range cells {
		into[i] = &cells[i]
	}
	return l, each(ctx, c, query+` FROM `+quote(table)+` ORDER BY `+fidColumn, func(r *sql.Rows) error {
		if err := r.Scan(into...); err != nil {
			return err
		}
		fid, _ := cells[0].(int64)
		ft := geo.Feature{Values: make([]geo.Value, len(cols))}
		switch id := cells[1].(type) {
		case string:
			ft.ID = id
		default:
			ft.ID = fmt.Sprintf("fid:%d", fid)
		}
		if b, ok := cells[2].([]byte); ok {
			blob, err := gpkggeom.Decode(b)
			if err != nil {
				return fmt.Errorf("%w: layer %q, feature %d: %w", study.ErrDamaged, l.Name, fid, err)
			}
			ft.Geometry = blob.Geometry
		}
		for j, col := range cols {
			v, err := readValue(cells[j+3], col.Kind, kinds[cell{fid, j}])
			if err != nil {
				return fmt.Errorf("%w: layer %q, feature %d, column %q: %w", study.ErrDamaged, l.Name, fid, col.Name, err)
			}
			ft.Values[j] = v
		}
		l.Features = append(l.Features, ft)
		return nil
	})
}

type cell struct {
	fid int64
	pos int
}

func valueKinds(ctx context.Context, c *sql.Conn, table string) (map[cell]geo.ValueKind, error) {
	kinds := map[cell]geo.ValueKind{}
	err := each(ctx, c, `SELECT fid, pos, kind FROM gt_value_kind WHERE table_name = ?`, func(r *sql.Rows) error {
		var at cell
		var k geo.ValueKind
		err := r.Scan(&at.fid, &at.pos, &k)
		kinds[at] = k
		return err
	}, table)
	return kinds, err
}

func readValue(raw any, column string, kind geo.ValueKind) (geo.Value, error) {
	switch x := raw.(type) {
	case nil:
		return geo.Value{}, nil
	case bool:
		return geo.BoolValue(x), nil
	case float64:
		return geo.NumberValue(x), nil
	case int64:
		if column == boolColumn && (x == 0 || x == 1) {
			return geo.BoolValue(x == 1), nil
		}
		return geo.NumberValue(float64(x)), nil
	case []byte:
		return geo.TextValue(string(x)), nil
	case string:
		switch kind {
		case geo.Number:
			if n, err := strconv.ParseFloat(x, 64); err == nil {
				return geo.NumberValue(n), nil
			}
		case geo.Bool:
			if b, err := strconv.ParseBool(x); err == nil {
				return geo.BoolValue(b), nil
			}
		}
		return geo.TextValue(x), nil
	}
	return geo.Value{}, fmt.Errorf("value of type %T", raw)
}
