package gpkgout

import (
	"fmt"
	"math"
	"strconv"
	"strings"

	"groundtally/geo"
	"groundtally/geo/formats/gpkggeom"
)

const (
	wgs84ID    = 4326
	maxColumns = 1990    // SQLite holds 2,000, some are ours
	maxExact   = 1 << 53 // whole numbers up to this size are exact in a float64
)

// The SQL types of columns.
const (
	textType    = "TEXT"
	booleanType = "BOOLEAN"
	integerType = "INTEGER"
	doubleType  = "DOUBLE"
)

// table is a layer on its way into the file.
type table struct {
	name, title string
	layer       *geo.Layer
	fid, geom   string // names of the key and of the geometry column
	id          string // name of the column of identifiers; empty where the key holds them
	columns     []column
	shape       shape
}

// column is one attribute of a table.
type column struct {
	from    int // its place in the layer
	name    string
	sqlType string
	unit    string
}

// plan settles names and types and refuses what cannot be written, before anything is.
func plan(layers []Layer, o Options) ([]table, error) {
	if len(layers) == 0 {
		return nil, fmt.Errorf("there is no layer to write")
	}
	names, titles := map[string]bool{}, map[string]bool{}
	out := make([]table, len(layers))
	for i, l := range layers {
		if l.Layer == nil {
			return nil, fmt.Errorf("layer %d holds nothing", i+1)
		}
		name := l.Name
		if name == "" {
			name = l.Layer.Name
		}
		t := table{name: printable(name, "layer"), layer: l.Layer}
		folded := fold(t.name)
		for _, head := range []string{"gpkg_", "sqlite_", "rtree_"} {
			if strings.HasPrefix(folded, head) {
				return nil, fmt.Errorf("layer %q: names that begin with %s belong to the file itself; give it another name", t.name, head)
			}
		}
		if names[folded] {
			return nil, fmt.Errorf("two layers are called %q; give one another name", t.name)
		}
		names[folded] = true
		title := l.Title
		if title == "" {
			title = t.name
		}
		t.title = free(titles, printable(title, "layer"), func(s string, n int) string { return s + " (" + strconv.Itoa(n) + ")" })
		if err := t.settle(o); err != nil {
			return nil, err
		}
		out[i] = t
	}
	return out, nil
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

// printable takes what no program can show out of a name.
func printable(s, instead string) string {
	s = strings.Map(func(r rune) rune {
		if r < ' ' || r == 0x7f {
			return '_'
		}
		return r
	}, strings.ToValidUTF8(s, "_"))
	if s == "" {
		return instead
	}
	return s
}

// free gives the name, or one with a number where it is taken, and takes it.
func free(used map[string]bool, name string, numbered func(string, int) string) string {
	got := name
	for n := 2; used[fold(got)]; n++ {
		got = numbered(name, n)
	}
	used[fold(got)] = true
	return got
}

func underscored(s string, n int) string { return s + "_" + strconv.Itoa(n) }

// settle plans the columns of a table. The names of the layer's columns stay; the columns that the
// format needs make room for them.
func (t *table) settle(o Options) error {
	l := t.layer
	if err := t.check(); err != nil {
		return err
	}
	used := map[string]bool{}
	for i, c := range l.Columns {
		if c.Personal && !o.Personal {
			continue
		}
		t.columns = append(t.columns, column{from: i, name: free(used, printable(c.Name, "column"), underscored), sqlType: typeOf(l, i), unit: strings.ToValidUTF8(c.Unit, "_")})
	}
	if len(t.columns) > maxColumns {
		return fmt.Errorf("layer %q has %d columns, a GeoPackage holds %d; leave some out", t.name, len(t.columns), maxColumns)
	}
	t.shape = shapeOf(l)
	t.fid = free(used, "fid", underscored)
	if t.shape.any {
		t.geom = free(used, "geom", underscored)
	}
	if !keys(l) {
		t.id = free(used, "feature_id", underscored)
	}
	return nil
}

// check refuses what other programs would read as something else.
func (t *table) check() error {
	for i, f := range t.layer.Features {
		fault := func(format string, args ...any) error {
			return fmt.Errorf("layer %q, feature %d (%s): %s", t.name, i+1, f.ID, fmt.Sprintf(format, args...))
		}
		if len(f.Values) != len(t.layer.Columns) {
			return fault("it has %d values for %d columns", len(f.Values), len(t.layer.Columns))
		}
		for j, v := range f.Values {
			if v.Kind == geo.Number && (math.IsNaN(v.Number) || math.IsInf(v.Number, 0)) {
				return fault("column %q holds a number that is not finite", t.layer.Columns[j].Name)
			}
		}
		if f.Geometry.Kind == geo.NoGeometry && len(f.Geometry.Parts) > 0 {
			return fault("it has positions but no kind of geometry")
		}
		var bad *geo.LonLat
		f.Geometry.Each(func(p geo.LonLat) {
			if bad == nil && (!p.Finite() || math.Abs(p.Lon) > 180 || math.Abs(p.Lat) > 90) {
				bad = &p
			}
		})
		if bad != nil {
			return fault("the position %g, %g is not in degrees of longitude and latitude", bad.Lon, bad.Lat)
		}
	}
	return nil
}

// keys tells whether the identifiers are whole numbers in rising order, so that they can be the key.
func keys(l *geo.Layer) bool {
	last := int64(0)
	for _, f := range l.Features {
		n, err := strconv.ParseInt(f.ID, 10, 64)
		if err != nil || n <= last || strconv.FormatInt(n, 10) != f.ID {
			return false
		}
		last = n
	}
	return true
}

// typeOf tells what a column holds. One with values of several kinds is of text.
func typeOf(l *geo.Layer, i int) string {
	var seen [geo.Bool + 1]bool
	whole := true
	for _, f := range l.Features {
		v := f.Values[i]
		if v.Kind <= geo.Bool {
			seen[v.Kind] = true
		}
		if v.Kind == geo.Number {
			whole = whole && v.Number == math.Trunc(v.Number) && math.Abs(v.Number) <= maxExact && !(v.Number == 0 && math.Signbit(v.Number))
		}
	}
	switch [3]bool{seen[geo.Text], seen[geo.Number], seen[geo.Bool]} {
	case [3]bool{false, true, false}:
		if whole {
			return integerType
		}
		return doubleType
	case [3]bool{false, false, true}:
		return booleanType
	}
	return textType
}

// bind gives a value as the column holds it.
func (c column) bind(v geo.Value) any {
	switch {
	case v.Kind == geo.Null || v.Kind > geo.Bool:
		return nil
	case c.sqlType == integerType:
		return int64(v.Number)
	case c.sqlType == doubleType:
		return v.Number
	case c.sqlType == booleanType:
		return v.Bool
	}
	return strings.ToValidUTF8(v.String(), "\ufffd")
}

// shape is what the geometries of a layer have in common.
type shape struct {
	any   bool
	kind  geo.Kind // NoGeometry when kinds are mixed
	multi bool     // every blob is of a MULTI type
	box   box
}

func (s shape) typeName() string { return gpkggeom.TypeName(s.kind, s.multi) }

func shapeOf(l *geo.Layer) shape {
	s := shape{box: emptyBox()}
	mixed := false
	for _, f := range l.Features {
		g := f.Geometry
		if g.Kind == geo.NoGeometry {
			continue
		}
		mixed = mixed || s.any && s.kind != g.Kind
		s.any, s.kind = true, g.Kind
		s.multi = s.multi || len(g.Parts) != 1
		s.box.add(g)
	}
	if mixed {
		s.kind, s.multi = geo.NoGeometry, false
	}
	return s
}

// box is an extent in degrees.
type box struct{ minX, minY, maxX, maxY float64 }

func emptyBox() box { return box{math.Inf(1), math.Inf(1), math.Inf(-1), math.Inf(-1)} }

func (b *box) add(g geo.LonLatGeometry) {
	g.Each(func(p geo.LonLat) {
		b.minX, b.maxX = math.Min(b.minX, p.Lon), math.Max(b.maxX, p.Lon)
		b.minY, b.maxY = math.Min(b.minY, p.Lat), math.Max(b.maxY, p.Lat)
	})
}

func (b box) empty() bool { return b.minX > b.maxX }
