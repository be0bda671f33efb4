// Package gpkgtest reads what ogrinfo -al prints about a GeoPackage, for tests that compare with it.
package gpkgtest

import (
	"fmt"
	"regexp"
	"slices"
	"strconv"
	"strings"
	"time"

	"groundtally/geo"
)

// A Field is an attribute of a feature as printed.
type Field struct {
	Name, Type, Value string
}

// A Feature is one feature as printed.
type Feature struct {
	FID    string
	Fields []Field
	WKT    string // empty without a geometry
}

// A Layer is one layer as printed.
type Layer struct {
	Name     string
	Count    int
	Key      string // FID Column
	Geometry string // Geometry Column
	Features []Feature
}

// Null is how a missing value is printed.
const Null = "(null)"

var (
	value = regexp.MustCompile(`^  (.+?) \(((?:Integer64|Integer|Real|String|DateTime|Date|Binary)(?:\(\w+\))?)\) = (.*)$`)
	shape = regexp.MustCompile(`^  ((?:MULTI)?(?:POINT|LINESTRING|POLYGON)|GEOMETRYCOLLECTION|CIRCULARSTRING|COMPOUNDCURVE|CURVEPOLYGON) .*$`)
	head  = regexp.MustCompile(`^OGRFeature\((.*)\):(-?\d+)$`)
)

// Parse reads the text. It does not read descriptions of reference systems.
func Parse(text string) ([]Layer, error) {
	var out []Layer
	var at *Feature
	for n, line := range strings.Split(text, "\n") {
		if name, ok := strings.CutPrefix(line, "Layer name: "); ok {
			out, at = append(out, Layer{Name: name}), nil
			continue
		}
		if len(out) == 0 {
			continue
		}
		l := &out[len(out)-1]
		if m := head.FindStringSubmatch(line); m != nil {
			l.Features = append(l.Features, Feature{FID: m[2]})
			at = &l.Features[len(l.Features)-1]
			continue
		}
		if at == nil {
			key, rest, _ := strings.Cut(line, ": ")
			if key == "Feature Count" {
				count, err := strconv.Atoi(rest)
				if err != nil {
					return nil, fmt.Errorf("line %d: %w", n+1, err)
				}
				l.Count = count
			}
			if s, ok := strings.CutPrefix(line, "FID Column = "); ok {
				l.Key = s
			}
			if s, ok := strings.CutPrefix(line, "Geometry Column = "); ok {
				l.Geometry = s
			}
			continue
		}
		if m := value.FindStringSubmatch(line); m != nil {
			at.Fields = append(at.Fields, Field{Name: m[1], Type: m[2], Value: m[3]})
		} else if shape.MatchString(line) {
			at.WKT = strings.TrimSpace(line)
		} else if line != "" && len(at.Fields) > 0 { // a value with a line break
			at.Fields[len(at.Fields)-1].Value += "\n" + line
		}
	}
	if len(out) == 0 {
		return nil, fmt.Errorf("the text names no layer")
	}
	return out, nil
}

var (
	dimensions = regexp.MustCompile(` (ZM|Z|M) `)
	tuple      = regexp.MustCompile(`-?[0-9][-+.0-9eE]*(?: -?[0-9][-+.0-9eE]*)+`)
)

// Flat writes a well-known text with two ordinates for each position, in the digits of Text.
func Flat(wkt string) string {
	wkt = dimensions.ReplaceAllString(wkt, " ")
	return tuple.ReplaceAllStringFunc(wkt, func(s string) string {
		parts := strings.Fields(s)[:2]
		for i, p := range parts {
			v, err := strconv.ParseFloat(p, 64)
			if err != nil {
				return s
			}
			parts[i] = Number(v)
		}
		return strings.Join(parts, " ")
	})
}

// Number writes a number with the fifteen digits that ogrinfo prints.
func Number(v float64) string { return strconv.FormatFloat(v, 'g', 15, 64) }

// WKT writes a geometry as Flat does; empty without a geometry. With multi, one part is written as a
// MULTI type too.
func WKT(g geo.LonLatGeometry, multi bool) string {
	name := [...]string{"", "POINT", "LINESTRING", "POLYGON"}[g.Kind]
	if name == "" {
		return ""
	}
	if multi = multi || len(g.Parts) > 1; multi {
		name = "MULTI" + name
	}
	if len(g.Parts) == 0 {
		return name + " EMPTY"
	}
	var parts []string
	for _, part := range g.Parts {
		var rings []string
		for _, ring := range part {
			var at []string
			for _, p := range ring {
				at = append(at, Number(p.Lon)+" "+Number(p.Lat))
			}
			rings = append(rings, "("+strings.Join(at, ",")+")")
		}
		s := strings.Join(rings, ",")
		if g.Kind == geo.Polygons {
			s = "(" + s + ")"
		}
		parts = append(parts, s)
	}
	if !multi {
		return name + " " + parts[0]
	}
	return name + " (" + strings.Join(parts, ",") + ")"
}

// Differences compares a layer with what was printed, in words. Features named in without are printed
// but not in the layer; columns of binary data never are.
func Differences(got *geo.Layer, want Layer, without ...string) []string {
	var out []string
	differ := func(format string, args ...any) {
		out = append(out, "layer "+want.Name+": "+fmt.Sprintf(format, args...))
	}
	features := slices.DeleteFunc(slices.Clone(want.Features), func(f Feature) bool { return slices.Contains(without, f.FID) })
	if len(got.Features) != len(features) {
		differ("%d features, want %d", len(got.Features), len(features))
		return out
	}
	for i, w := range features {
		g := got.Features[i]
		if g.ID != w.FID {
			differ("feature %d is %q, want %q", i, g.ID, w.FID)
		}
		expected := highest(Flat(w.WKT))
		if s := WKT(g.Geometry, strings.HasPrefix(expected, "MULTI")); s != expected {
			differ("feature %s: %s, want %s", g.ID, s, expected)
		}
		columns, values := got.Columns, g.Values
		if len(columns) > 0 && columns[0].Name == want.Key { // a key with a name of its own is a column too
			if s := printed(values[0], "Integer64"); s != w.FID {
				differ("feature %s: key %q", g.ID, s)
			}
			columns, values = columns[1:], values[1:]
		}
		fields := slices.DeleteFunc(slices.Clone(w.Fields), func(f Field) bool { return f.Type == "Binary" })
		if len(columns) != len(fields) {
			differ("%d columns, want %d", len(columns), len(fields))
			return out
		}
		for j, f := range fields {
			if columns[j].Name != f.Name {
				differ("column %d is %q, want %q", j, columns[j].Name, f.Name)
			}
			if s := printed(values[j], f.Type); s != f.Value {
				differ("feature %s, %s: %q, want %q", g.ID, f.Name, s, f.Value)
			}
		}
	}
	return out
}

// highest takes the last member of a collection, which in the fixtures is the one of the highest
// dimension.
func highest(wkt string) string {
	inside, ok := strings.CutPrefix(wkt, "GEOMETRYCOLLECTION (")
	if !ok {
		return wkt
	}
	at := strings.LastIndexAny(inside, "TGN") // the end of POINT, LINESTRING or POLYGON
	start := strings.LastIndex(inside[:at], ",") + 1
	return strings.TrimSuffix(inside[start:], ")")
}

// printed writes a value in the form of its type; a value of another type comes out marked.
func printed(v geo.Value, kind string) string {
	switch {
	case v.Kind == geo.Null:
		return Null
	case kind == "Integer(Boolean)" && v.Kind == geo.Bool:
		return map[bool]string{true: "1", false: "0"}[v.Bool]
	case kind == "Real" && v.Kind == geo.Number:
		return Number(v.Number)
	case (kind == "Integer" || kind == "Integer64") && v.Kind == geo.Number:
		return strconv.FormatFloat(v.Number, 'f', -1, 64)
	case v.Kind != geo.Text || kind == "Real" || kind == "Integer(Boolean)":
		return fmt.Sprintf("%+v in place of %s", v, kind)
	case kind == "Date":
		return strings.ReplaceAll(v.Text, "-", "/")
	case kind == "DateTime":
		at, err := time.Parse("2006-01-02T15:04:05.999Z07:00", v.Text)
		if err != nil {
			return err.Error()
		}
		if at.Nanosecond() > 0 {
			return at.Format("2006/01/02 15:04:05.000-07")
		}
		return at.Format("2006/01/02 15:04:05-07")
	}
	return v.Text
}
