package gpkgout

import (
	"context"
	"database/sql"
	"errors"
	"fmt"
	"io"
	"net/url"
	"os"
	"path/filepath"
	"strconv"
	"strings"
	"time"

	_ "modernc.org/sqlite" // the SQLite driver

	"groundtally/app/files"
	"groundtally/geo"
	"groundtally/geo/formats/gpkggeom"
)

// Layer is one to write, with a name for its table and a title for people. Where they are empty, the
// layer's own name stands for the name and the name for the title.
type Layer struct {
	Name, Title string
	Layer       *geo.Layer
}

// Options say how a file is written.
type Options struct {
	Replace  bool      // put it in the place of a file that is there; otherwise that is an error
	Personal bool      // write columns marked personal too
	Changed  time.Time // when the layers last changed; the beginning of 1970 where it is not given
	Triggers bool      // write the triggers of the spatial index; see the package's comment
}

// Write writes a new GeoPackage. Features stand in the order of the layer under a whole number as key.
// That number is the identifier where all identifiers of the layer are whole numbers from 1 in rising
// order; else the identifiers stand in the column feature_id. A column is of the type that all its
// values have, of text where they differ. Its unit stands in the column's description.
func Write(ctx context.Context, path string, layers []Layer, o Options) error {
	tables, err := plan(layers, o)
	if err != nil {
		return err
	}
	write := files.WriteNew
	if o.Replace {
		write = files.Write
	}
	return write(path, func(w io.Writer) error { return through(ctx, path, w, tables, o) })
}

// through builds the database in a file of its own beside the target, because SQLite writes here and
// there, and copies it whole.
func through(ctx context.Context, path string, w io.Writer, tables []table, o Options) (err error) {
	beside := path
	if to, err := filepath.EvalSymlinks(path); err == nil {
		beside = to
	}
	temp, err := os.CreateTemp(filepath.Dir(beside), "."+filepath.Base(beside)+".*.part")
	if err != nil {
		return err
	}
	defer func() { err = errors.Join(err, temp.Close(), os.Remove(temp.Name())) }()
	if err := build(ctx, temp.Name(), tables, o); err != nil {
		return err
	}
	_, err = io.Copy(w, temp)
	return err
}

// build makes the database. The file is thrown away when anything fails, so it needs no journal, no
// lock and no waiting for the disk.
func build(ctx context.Context, path string, tables []table, o Options) (err error) {
	abs, err := filepath.Abs(path)
	if err != nil {
		return err
	}
	p := filepath.ToSlash(abs)
	if !strings.HasPrefix(p, "/") {
		p = "/" + p // a drive letter
	}
	q := url.Values{"mode": {"rw"}, "nolock": {"1"}, "_pragma": {
		"page_size(4096)", "journal_mode(OFF)", "synchronous(OFF)", "locking_mode(EXCLUSIVE)", "cache_size(-65536)", "temp_store(MEMORY)", "trusted_schema(0)"}}
	u := url.URL{Scheme: "file", Path: p, RawQuery: q.Encode()}
	db, err := sql.Open("sqlite", u.String())
	if err != nil {
		return err
	}
	defer func() { err = errors.Join(err, db.Close()) }()
	db.SetMaxOpenConns(1)
	c, err := db.Conn(ctx)
	if err != nil {
		return err
	}
	defer func() { err = errors.Join(err, c.Close()) }()
	b := builder{c: c, o: o, changed: o.Changed}
	if b.changed.IsZero() {
		b.changed = time.Unix(0, 0)
	}
	if err := b.exec(ctx, `BEGIN`); err != nil {
		return err
	}
	if err := b.all(ctx, tables); err != nil {
		return err
	}
	return b.exec(ctx, `COMMIT`)
}

type builder struct {
	c       *sql.Conn
	o       Options
	changed time.Time
}

func (b *builder) exec(ctx context.Context, query string, args ...any) error {
	_, err := b.c.ExecContext(ctx, query, args...)
	return err
}

func (b *builder) all(ctx context.Context, tables []table) error {
	for _, s := range required {
		if err := b.exec(ctx, s); err != nil {
			return err
		}
	}
	for _, t := range tables {
		if err := b.table(ctx, t); err != nil {
			return fmt.Errorf("layer %q: %w", t.name, err)
		}
	}
	return b.units(ctx, tables)
}

func quote(name string) string { return `"` + strings.ReplaceAll(name, `"`, `""`) + `"` }

const contentsTime = "2006-01-02T15:04:05.000Z"

func (b *builder) table(ctx context.Context, t table) error {
	create := []string{quote(t.fid) + ` INTEGER PRIMARY KEY AUTOINCREMENT NOT NULL`}
	insert := []string{quote(t.fid)}
	add := func(name, sqlType string) {
		create = append(create, quote(name)+` `+sqlType)
		insert = append(insert, quote(name))
	}
	if t.shape.any {
		add(t.geom, t.shape.typeName())
	}
	if t.id != "" {
		add(t.id, textType)
	}
	for _, c := range t.columns {
		add(c.name, c.sqlType)
	}
	if err := b.exec(ctx, `CREATE TABLE `+quote(t.name)+` (`+strings.Join(create, `, `)+`)`); err != nil {
		return err
	}
	kind, srs, extent := "attributes", any(nil), [4]any{}
	if t.shape.any {
		kind, srs = "features", wgs84ID
		if e := t.shape.box; !e.empty() {
			extent = [4]any{e.minX, e.minY, e.maxX, e.maxY}
		}
	}
	if err := b.exec(ctx, `INSERT INTO gpkg_contents (table_name, data_type, identifier, description, last_change, min_x, min_y, max_x, max_y, srs_id)
		VALUES (?, ?, ?, '', ?, ?, ?, ?, ?, ?)`, t.name, kind, t.title, b.changed.UTC().Format(contentsTime), extent[0], extent[1], extent[2], extent[3], srs); err != nil {
		return err
	}
	if t.shape.any {
		if err := b.index(ctx, t); err != nil {
			return err
		}
	}
	if err := b.features(ctx, t, `INSERT INTO `+quote(t.name)+` (`+strings.Join(insert, `, `)+`) VALUES (?`+strings.Repeat(`, ?`, len(insert)-1)+`)`); err != nil {
		return err
	}
	if t.shape.any && b.o.Triggers {
		for _, s := range triggers(t) {
			if err := b.exec(ctx, s); err != nil {
				return err
			}
		}
	}
	return nil
}

// index registers the geometry column and makes its empty index.
func (b *builder) index(ctx context.Context, t table) error {
	if err := b.exec(ctx, `INSERT INTO gpkg_geometry_columns (table_name, column_name, geometry_type_name, srs_id, z, m)
		VALUES (?, ?, ?, ?, 0, 0)`, t.name, t.geom, t.shape.typeName(), wgs84ID); err != nil {
		return err
	}
	if err := b.exec(ctx, `INSERT INTO gpkg_extensions VALUES (?, ?, 'gpkg_rtree_index', ?, 'write-only')`, t.name, t.geom, rtreeDefinition); err != nil {
		return err
	}
	return b.exec(ctx, `CREATE VIRTUAL TABLE `+quote(t.rtree())+` USING rtree(id, minx, maxx, miny, maxy)`)
}

func (t table) rtree() string { return "rtree_" + t.name + "_" + t.geom }

func (b *builder) features(ctx context.Context, t table, insert string) (err error) {
	row, err := b.c.PrepareContext(ctx, insert)
	if err != nil {
		return err
	}
	defer func() { err = errors.Join(err, row.Close()) }()
	var index *sql.Stmt
	if t.shape.any {
		if index, err = b.c.PrepareContext(ctx, `INSERT INTO `+quote(t.rtree())+` VALUES (?, ?, ?, ?, ?)`); err != nil {
			return err
		}
		defer func() { err = errors.Join(err, index.Close()) }()
	}
	// A row is written in no time; watching for a stop within each would take longer than writing it.
	always := context.WithoutCancel(ctx)
	var blob []byte
	args := make([]any, 0, len(t.columns)+3)
	for i, f := range t.layer.Features {
		if err := ctx.Err(); err != nil {
			return err
		}
		fid := int64(i + 1)
		if t.id == "" {
			if fid, err = strconv.ParseInt(f.ID, 10, 64); err != nil {
				return err
			}
		}
		args = append(args[:0], fid)
		if t.shape.any {
			var geometry any
			if f.Geometry.Kind != geo.NoGeometry {
				if blob, err = gpkggeom.Append(blob[:0], f.Geometry, wgs84ID, t.shape.multi); err != nil {
					return fmt.Errorf("feature %d (%s): %w", i+1, f.ID, err)
				}
				geometry = blob
			}
			args = append(args, geometry)
		}
		if t.id != "" {
			args = append(args, strings.ToValidUTF8(f.ID, "\ufffd"))
		}
		for _, c := range t.columns {
			args = append(args, c.bind(f.Values[c.from]))
		}
		if _, err := row.ExecContext(always, args...); err != nil {
			return err
		}
		if e := emptyBox(); t.shape.any {
			if e.add(f.Geometry); e.empty() {
				continue // the index holds no empty geometries
			}
			if _, err := index.ExecContext(always, fid, e.minX, e.maxX, e.minY, e.maxY); err != nil {
				return err
			}
		}
	}
	return nil
}

// units describes the columns that have one, with the schema extension.
func (b *builder) units(ctx context.Context, tables []table) error {
	begun := false
	for _, t := range tables {
		for _, c := range t.columns {
			if c.unit == "" {
				continue
			}
			if !begun {
				begun = true
				for _, s := range schemaExtension {
					if err := b.exec(ctx, s); err != nil {
						return err
					}
				}
			}
			if err := b.exec(ctx, `INSERT INTO gpkg_data_columns (table_name, column_name, title, description) VALUES (?, ?, ?, ?)`,
				t.name, c.name, strings.ToValidUTF8(t.layer.Columns[c.from].Name, "_"), "unit: "+c.unit); err != nil {
				return err
			}
		}
	}
	return nil
}
