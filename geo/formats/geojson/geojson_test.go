package geojson

import (
	"bytes"
	"context"
	"encoding/csv"
	"encoding/json"
	"errors"
	"fmt"
	"io"
	"math"
	"math/rand/v2"
	"os"
	"os/exec"
	"path/filepath"
	"reflect"
	"runtime"
	"strconv"
	"strings"
	"testing"
	"testing/iotest"

	"groundtally/geo"
)

var ctx = context.Background()

const hostile = "../../../testdata/hostile"

func decode(t testing.TB, s string, o Options) Result {
	t.Helper()
	r, err := Decode(ctx, strings.NewReader(s), o)
	if err != nil {
		t.Fatalf("%.200s: %v", s, err)
	}
	return r
}

func counts(r Result) map[string]int {
	m := map[string]int{"read": r.Ledger.Read, "repaired": r.Ledger.Repaired, "left_out": r.Ledger.LeftOut}
	for _, n := range r.Notices {
		c, err := strconv.Atoi(n.Args["count"])
		if err != nil {
			panic(err)
		}
		m[n.Code] += c
	}
	for k, v := range m {
		if v == 0 && (k == "repaired" || k == "left_out") {
			delete(m, k)
		}
	}
	return m
}

func TestHostileFiles(t *testing.T) {
	list, err := os.Open(filepath.Join(hostile, "files.csv"))
	if err != nil {
		t.Fatal(err)
	}
	defer list.Close()
	rows, err := csv.NewReader(list).ReadAll()
	if err != nil {
		t.Fatal(err)
	}
	listed := map[string]bool{}
	for _, row := range rows[1:] {
		name, outcome, detail := row[0], row[1], row[2]
		if !strings.Contains(name, ".geojson") {
			continue
		}
		listed[name] = true
		feature, err := strconv.Atoi(row[3])
		if err != nil {
			t.Fatal(err)
		}
		t.Run(name, func(t *testing.T) {
			data, err := os.ReadFile(filepath.Join(hostile, name))
			if err != nil {
				t.Fatal(err)
			}
			// however the bytes arrive, the answer is the same
			for how, r := range map[string]io.Reader{"whole": bytes.NewReader(data), "by bytes": iotest.OneByteReader(bytes.NewReader(data)), "data with end": iotest.DataErrReader(bytes.NewReader(data))} {
				got, err := Decode(ctx, r, Options{File: name})
				switch outcome {
				case "error":
					var e *Error
					if !errors.As(err, &e) || e.Code != detail || e.Feature != feature || e.File != name || e.Do == "" {
						t.Errorf("%s: %v (%+v), want code %s, feature %d", how, err, e, detail, feature)
					}
					if e != nil && (e.Offset < 0 || e.Offset > int64(len(data))) {
						t.Errorf("%s: byte %d of %d", how, e.Offset, len(data))
					}
				case "read":
					if err != nil {
						t.Fatalf("%s: %v", how, err)
					}
					want := map[string]int{"read": 0}
					for _, kv := range strings.Split(detail, ";") {
						k, v, _ := strings.Cut(kv, "=")
						if want[k], err = strconv.Atoi(v); err != nil {
							t.Fatal(err)
						}
					}
					if c := counts(got); !reflect.DeepEqual(c, want) {
						t.Errorf("%s: %v, want %v", how, c, want)
					}
				default:
					t.Fatalf("unknown outcome %q", outcome)
				}
			}
		})
	}
	files, err := filepath.Glob(filepath.Join(hostile, "*.geojson*"))
	if err != nil {
		t.Fatal(err)
	}
	for _, f := range files {
		if !listed[filepath.Base(f)] {
			t.Errorf("%s is not in the list", f)
		}
	}
}

func TestTruncatedAnywhere(t *testing.T) {
	doc := `{"type":"FeatureCollection","features":[{"type":"Feature","id":"x","properties":{"a":[1,{"b":"é\n"}],"c":-1.5e3},"geometry":{"type":"Polygon","coordinates":[[[9,48,1],[9.1,48],[9.1,48.1],[9,48,1]]]}}]}`
	decode(t, doc, Options{})
	for n := 1; n < len(doc); n++ {
		_, err := Decode(ctx, strings.NewReader(doc[:n]), Options{})
		var e *Error
		if !errors.As(err, &e) || e.Code != "truncated" || e.Offset != int64(n) {
			t.Fatalf("cut after %d bytes: %v", n, err)
		}
	}
}

// Ten million levels must cost neither memory nor stack, wherever they stand.
func TestDeepNesting(t *testing.T) {
	const deep = 10_000_000
	for name, c := range map[string]struct{ before, level, code string }{
		"unknown member":       {`{"x":`, `[`, "too_deep"},
		"objects":              {`{"x":`, `{"x":`, "too_deep"},
		"property":             {`{"type":"Feature","properties":{"a":`, `[`, "too_deep"},
		"coordinates":          {`{"type":"Polygon","coordinates":`, `[`, "bad_coordinates"},
		"coordinates first":    {`{"coordinates":`, `[`, "too_deep"},
		"collections":          {`{"type":"GeometryCollection","geometries":[`, `{"type":"GeometryCollection","geometries":[`, "too_deep"},
		"collections in crs":   {`{"crs":`, `{"a":[`, "too_deep"},
		"features in features": {`{"type":"FeatureCollection","features":[`, `{"type":"Feature","geometry":`, "too_deep"},
	} {
		t.Run(name, func(t *testing.T) {
			var before, after runtime.MemStats
			runtime.ReadMemStats(&before)
			_, err := Decode(ctx, io.MultiReader(strings.NewReader(c.before), &repeated{text: c.level, left: deep}), Options{})
			runtime.ReadMemStats(&after)
			var e *Error
			if !errors.As(err, &e) || (e.Code != c.code && e.Code != "not_geojson") {
				t.Errorf("error %v", err)
			}
			if grown := after.TotalAlloc - before.TotalAlloc; grown > 4<<20 {
				t.Errorf("%d bytes were allocated", grown)
			}
		})
	}
}

// repeated is a reader of the same text many times.
type repeated struct {
	text string
	left int
	pos  int
}

func (r *repeated) Read(p []byte) (int, error) {
	n := 0
	for n < len(p) {
		if r.left == 0 {
			return n, io.EOF
		}
		c := copy(p[n:], r.text[r.pos:])
		n += c
		if r.pos += c; r.pos == len(r.text) {
			r.pos = 0
			r.left--
		}
	}
	return n, nil
}

func TestLimits(t *testing.T) {
	point := `{"type":"Feature","properties":{"a":1,"b":2},"geometry":{"type":"MultiPoint","coordinates":[[1,2],[3,4]]}}`
	doc := `{"type":"FeatureCollection","features":[` + point + `,` + point + `]}`
	for name, c := range map[string]struct {
		doc  string
		o    Options
		code string
	}{
		"features":      {doc, Options{MaxFeatures: 1}, "too_many"},
		"positions":     {doc, Options{MaxPositions: 3}, "too_many"},
		"columns":       {doc, Options{MaxColumns: 1}, "too_many"},
		"bytes":         {doc, Options{MaxBytes: int64(len(doc)) - 1}, "file_too_large"},
		"text":          {`{"x":"` + strings.Repeat("a", 200_000) + `"}`, Options{MaxValue: 100_000}, "value_too_long"},
		"held value":    {`{"coordinates":[` + strings.Repeat("[1,2],", 100_000) + `[1,2]],"type":"LineString"}`, Options{MaxValue: 100_000}, "value_too_long"},
		"short value":   {`{"coordinates":[` + strings.Repeat("[1,2],", 20) + `[1,2]],"type":"LineString"}`, Options{MaxValue: 100}, "value_too_long"},
		"line":          {point + "\n" + `{"x":"` + strings.Repeat("a", 200_000) + `"}`, Options{MaxValue: 100_000}, "value_too_long"},
		"digits":        {`{"x":` + strings.Repeat("1", 5000) + `}`, Options{}, "number_too_long"},
		"features, seq": {point + "\n" + point, Options{MaxFeatures: 1}, "too_many"},
	} {
		_, err := Decode(ctx, strings.NewReader(c.doc), c.o)
		var e *Error
		if !errors.As(err, &e) || e.Code != c.code {
			t.Errorf("%s: %v, want %s", name, err, c.code)
		}
	}
	decode(t, doc, Options{MaxFeatures: 2, MaxPositions: 4, MaxColumns: 2, MaxBytes: int64(len(doc))})
}

func TestGrammar(t *testing.T) {
	for _, v := range []string{"01", "-", "1.", ".5", "1e", "+1", "0x1", "1_000", "tru", "nul", "'a'", `"\x"`, `"\u12g4"`, "\"a\tb\"", "[1,]", "[,1]", `{"a":1,}`, `{a:1}`, `{"a" 1}`, "Infinity", "-Infinity", "", `"\ud800\u0041"`, `"\udc00"`} {
		if _, err := Decode(ctx, strings.NewReader(`{"type":"Feature","geometry":null,"properties":{"v":`+v+`}}`), Options{}); err == nil {
			t.Errorf("%s was read", v)
		}
	}
	for v, want := range map[string]geo.Value{
		`"\ud83d\ude00\/\"\\\b\f\n\r\té"`: geo.TextValue("😀/\"\\\b\f\n\r\té"),
		`0`:                               geo.NumberValue(0),
		`-0.5E-3`:                         geo.NumberValue(-0.5e-3),
		`9007199254740992`:                geo.NumberValue(9007199254740992),
		`12345678901234567890`:            geo.TextValue("12345678901234567890"),
		`1e20`:                            geo.NumberValue(1e20),
		`true`:                            geo.BoolValue(true),
		`null`:                            {},
		`{"a": [1, 2]}`:                   geo.TextValue(`{"a":[1,2]}`),
	} {
		r := decode(t, `{"type":"Feature","geometry":null,"properties":{"v":`+v+`}}`, Options{})
		if got := r.Layer.Features[0].Values[0]; got != want {
			t.Errorf("%s: %+v, want %+v", v, got, want)
		}
	}
}

func TestForms(t *testing.T) {
	p := `{"type":"Point","coordinates":[9,48]}`
	f := `{"type":"Feature","id":7,"properties":{"a":1},"geometry":` + p + `}`
	for name, c := range map[string]struct {
		doc string
		n   int
	}{
		"collection":            {`{"type":"FeatureCollection","features":[` + f + `]}`, 1},
		"features before type":  {`{"features":[` + f + `],"type":"FeatureCollection"}`, 1},
		"bare feature":          {f, 1},
		"feature, type last":    {`{"geometry":{"coordinates":[9,48],"type":"Point"},"properties":{"a":1},"id":7,"type":"Feature"}`, 1},
		"bare geometry":         {p, 1},
		"geometry, type last":   {`{"coordinates":[9,48],"type":"Point"}`, 1},
		"foreign members":       {`{"id":3,"properties":{"title":"x"},"geometry":5,"type":"FeatureCollection","coordinates":[[[]]],"bbox":[1,2],"features":[` + f + `]}`, 1},
		"text sequence":         {"\x1e" + f + "\n\x1e" + f + "\n", 2},
		"sequence, no newlines": {"\x1e\x1e" + f + "\x1e" + f, 2},
		"separator later":       {f + "\x1e" + f, 2},
		"lines":                 {f + "\n" + f + "\r\n\n" + f, 3},
		"lines of collections":  {`{"type":"FeatureCollection","features":[` + f + `]}` + "\n" + f, 2},
		"white space":           {" \n\t" + f + " \n", 1},
	} {
		t.Run(name, func(t *testing.T) {
			r := decode(t, c.doc, Options{})
			if len(r.Layer.Features) != c.n {
				t.Fatalf("%d features, want %d", len(r.Layer.Features), c.n)
			}
			for _, ft := range r.Layer.Features {
				if ft.Geometry.Kind != geo.Points || ft.Geometry.Parts[0][0][0] != (geo.LonLat{Lon: 9, Lat: 48}) {
					t.Errorf("geometry %+v", ft.Geometry)
				}
			}
			if len(r.Layer.Columns) > 1 {
				t.Errorf("columns %+v", r.Layer.Columns)
			}
		})
	}
}

func TestCRS(t *testing.T) {
	for said, want := range map[string]string{
		`{"type":"name","properties":{"name":"EPSG:25832"}}`:                                  "EPSG:25832",
		`{"type":"name","properties":{"name":"urn:ogc:def:crs:EPSG::3035"}}`:                  "EPSG:3035",
		`{"type":"name","properties":{"name":"urn:ogc:def:crs:EPSG:9.8:2154"}}`:               "EPSG:2154",
		`{"type":"name","properties":{"name":"urn:ogc:def:crs:OGC:1.3:CRS84"}}`:               "OGC:CRS84",
		`{"type":"name","properties":{"name":"http://www.opengis.net/def/crs/EPSG/0/27700"}}`: "EPSG:27700",
		`{"type":"EPSG","properties":{"code":4326}}`:                                          "EPSG:4326",
		`null`: "",
	} {
		if r := decode(t, `{"type":"FeatureCollection","features":[],"crs":`+said+`}`, Options{}); r.CRS != want {
			t.Errorf("%s: %q, want %q", said, r.CRS, want)
		}
	}
	for _, said := range []string{`{"type":"link","properties":{"href":"x"}}`, `{"type":"name","properties":{"name":"EPSG:abc"}}`, `"EPSG:4326"`, `{}`} {
		doc := `{"type":"FeatureCollection","crs":` + said + `,"features":[]}`
		var e *Error
		if _, err := Decode(ctx, strings.NewReader(doc), Options{}); !errors.As(err, &e) || e.Code != "crs_not_understood" {
			t.Errorf("%s: %v", said, err)
		}
		if r := decode(t, doc, Options{IgnoreCRS: true}); r.CRS != "" || counts(r)["crs_not_understood"] != 1 {
			t.Errorf("%s, passed over: %+v", said, r)
		}
	}
	two := `{"type":"Point","coordinates":[1,2],"crs":{"type":"name","properties":{"name":"EPSG:25832"}}}` + "\n" + `{"type":"Point","coordinates":[1,2],"crs":{"type":"name","properties":{"name":"EPSG:4326"}}}`
	if r := decode(t, two, Options{}); r.Ledger.LeftOut != 1 || r.CRS != "EPSG:25832" {
		t.Errorf("two systems: %+v", r)
	}
}

func TestLayer(t *testing.T) {
	r := decode(t, `{"type":"FeatureCollection","name":"parcels","features":[
		{"type":"Feature","id":"A","properties":{"b":"x","m":1234567},"geometry":null},
		{"type":"Feature","id":"A","properties":{"c":true,"b":null,"m":"q"}},
		{"type":"Feature","properties":null,"geometry":{"type":"Point","coordinates":[]}},
		{"type":"Feature","id":"4","properties":{},"geometry":{"type":"LineString","coordinates":[[0,0,5],[1,1]]}},
		{"type":"Feature","id":null,"properties":{"m":false}},
		{"type":"Feature","id":"6","properties":{}},
		{"type":"Feature","properties":{}},
		{"type":"Feature","id":7,"properties":{}}]}`, Options{File: "p.geojson"})
	l := r.Layer
	if want := []geo.Column{{Name: "b"}, {Name: "m"}, {Name: "c"}}; l.Name != "parcels" || !reflect.DeepEqual(l.Columns, want) {
		t.Errorf("%q %+v", l.Name, l.Columns)
	}
	var ids []string
	for _, f := range l.Features {
		ids = append(ids, f.ID)
		if len(f.Values) != 3 {
			t.Errorf("%s has %d values", f.ID, len(f.Values))
		}
	}
	if got := strings.Join(ids, " "); got != "A A-2 3 4 5 6 7-2 7" {
		t.Errorf("identifiers %s", got)
	}
	var m []string
	for _, f := range l.Features {
		m = append(m, f.Values[1].Text)
	}
	if got := strings.Join(m[:5], " "); got != "1234567 q   false" {
		t.Errorf("mixed column: %q", got)
	}
	want := map[string]int{"read": 8, "geometry_missing": 6, "geometry_empty": 1, "height_left_out": 1, "column_mixed": 2, "id_repeated": 1}
	if c := counts(r); !reflect.DeepEqual(c, want) {
		t.Errorf("%v, want %v", c, want)
	}
	for _, n := range r.Notices {
		if n.File != "p.geojson" || n.Layer != "parcels" {
			t.Errorf("notice %+v", n)
		}
		if n.Code == "geometry_missing" && (n.Feature != "1" || n.Args["features"] != "1, 2, 5, 6, 7, 8") {
			t.Errorf("notice %+v", n)
		}
	}
}

func TestCollections(t *testing.T) {
	doc := `{"type":"GeometryCollection","geometries":[{"type":"Point","coordinates":[1,1]},{"type":"MultiLineString","coordinates":[[[0,0],[1,1]],[[2,2],[3,3]]]},{"type":"GeometryCollection","geometries":[]}]}`
	for keep, want := range map[geo.Kind]geo.Kind{geo.NoGeometry: geo.Lines, geo.Points: geo.Points, geo.Polygons: geo.Lines} {
		r := decode(t, doc, Options{Keep: keep})
		if g := r.Layer.Features[0].Geometry; g.Kind != want {
			t.Errorf("keep %s: %s", keep, g.Kind)
		}
		if lost := r.Ledger.PartsLeftOut; lost != 3-len(r.Layer.Features[0].Geometry.Parts) {
			t.Errorf("keep %s: %d parts left out", keep, lost)
		}
	}
}

func TestRings(t *testing.T) {
	r := decode(t, `{"type":"MultiPolygon","coordinates":[
		[[[0,0],[9,0],[9,9]], [[1,1],[2,2],[2,1],[1,1]], [[3,3],[4,4]], []],
		[[[0,0],[1,1]], [[5,5],[6,6],[6,5],[5,5]]],
		[]]}`, Options{})
	g := r.Layer.Features[0].Geometry
	if len(g.Parts) != 1 || len(g.Parts[0]) != 2 || len(g.Parts[0][0]) != 4 {
		t.Errorf("%+v", g)
	}
	if r.Ledger.RingsClosed != 3 || r.Ledger.PartsLeftOut != 4 || r.Ledger.Repaired != 1 {
		t.Errorf("%+v", r.Ledger)
	}
}

func TestReaderFailsAndCancel(t *testing.T) {
	broken := errors.New("pulled out")
	doc := `{"type":"FeatureCollection","features":[` + strings.Repeat(`{"type":"Feature","properties":{},"geometry":null},`, 5000)
	_, err := Decode(ctx, io.MultiReader(strings.NewReader(doc), iotest.ErrReader(broken)), Options{})
	var e *Error
	if !errors.Is(err, broken) || !errors.As(err, &e) || e.Code != "unreadable" || e.Offset != int64(len(doc)) {
		t.Errorf("error %v", err)
	}
	stop, cancel := context.WithCancel(ctx)
	defer cancel()
	seen := int64(0)
	_, err = Decode(stop, io.MultiReader(strings.NewReader(doc), &repeated{text: `{"type":"Feature","properties":{},"geometry":null},`, left: 1 << 20}), Options{Progress: func(n int64) {
		if n <= seen {
			t.Errorf("progress went from %d to %d", seen, n)
		}
		if seen = n; n > 3<<20 {
			cancel()
		}
	}})
	if !errors.Is(err, context.Canceled) || seen > 5<<20 {
		t.Errorf("%v after %d bytes", err, seen)
	}
	if _, err := Decode(ctx, stuck{}, Options{}); !errors.Is(err, io.ErrNoProgress) {
		t.Errorf("a reader that gives nothing: %v", err)
	}
}

type stuck struct{}

func (stuck) Read([]byte) (int, error) { return 0, nil }

func TestAllRecordsBroken(t *testing.T) {
	var e *Error
	if _, err := Decode(ctx, strings.NewReader("\x1e{\"type\":1}\n\x1e{}\n"), Options{File: "f"}); !errors.As(err, &e) || e.Code != "not_geojson" || e.File != "f" {
		t.Errorf("error %v", err)
	}
}

func ring(v ...float64) []geo.LonLat {
	r := make([]geo.LonLat, 0, len(v)/2)
	for i := 0; i+1 < len(v); i += 2 {
		r = append(r, geo.LonLat{Lon: v[i], Lat: v[i+1]})
	}
	return r
}

func sample() *geo.Layer {
	type parts = [][][]geo.LonLat
	return &geo.Layer{Name: "sample \"1\"", Columns: []geo.Column{{Name: "a\"b"}, {Name: "n"}, {Name: "b"}, {Name: "owner", Personal: true}}, Features: []geo.Feature{
		{ID: "1", Values: []geo.Value{geo.TextValue("é<>&\n\u2028"), geo.NumberValue(0.1), geo.BoolValue(true), geo.TextValue("Ada")}, Geometry: geo.LonLatGeometry{Kind: geo.Points, Parts: parts{{ring(9.12345678, -48)}}}},
		{ID: "2", Values: []geo.Value{{}, {}, {}, {}}, Geometry: geo.LonLatGeometry{Kind: geo.Lines, Parts: parts{{ring(0, 0, 1, 1)}, {ring(2, 2, 3, 3, 4, 4)}}}},
		{ID: "3", Values: []geo.Value{geo.TextValue(""), geo.NumberValue(-1e300), geo.BoolValue(false), {}}, Geometry: geo.LonLatGeometry{Kind: geo.Polygons, Parts: parts{{ring(0, 0, 0, 9, 9, 9, 0, 0), ring(1, 2, 2, 3, 1, 3, 1, 2)}}}},
		{ID: "4", Values: []geo.Value{{}, {}, {}, {}}, Geometry: geo.LonLatGeometry{Kind: geo.Polygons}},
		{ID: "5", Values: []geo.Value{{}, {}, {}, {}}},
	}}
}

func TestEncode(t *testing.T) {
	for _, sequence := range []bool{false, true} {
		var b bytes.Buffer
		if err := Encode(ctx, &b, sample(), EncodeOptions{Personal: true, Sequence: sequence}); err != nil {
			t.Fatal(err)
		}
		got := decode(t, b.String(), Options{}).Layer
		want := sample()
		want.Columns[3].Personal = false
		want.Features[0].Geometry.Parts[0][0][0].Lon = 9.1234568
		p := want.Features[2].Geometry.Parts[0] // both rings stood the wrong way round
		p[0], p[1] = ring(0, 0, 9, 9, 0, 9, 0, 0), ring(1, 2, 1, 3, 2, 3, 1, 2)
		if sequence {
			want.Name = ""
		}
		if !reflect.DeepEqual(got, want) {
			t.Errorf("sequence=%t:\n got %+v\nwant %+v", sequence, got, want)
		}
	}
	var b bytes.Buffer
	if err := Encode(ctx, &b, sample(), EncodeOptions{}); err != nil || strings.Contains(b.String(), "Ada") || strings.Contains(b.String(), "owner") {
		t.Errorf("personal values were written: %v", err)
	}
	if err := Encode(ctx, &b, &geo.Layer{}, EncodeOptions{}); err != nil {
		t.Error(err)
	}
	for name, f := range map[string]geo.Feature{
		"metres":         {ID: "x", Geometry: geo.LonLatGeometry{Kind: geo.Points, Parts: [][][]geo.LonLat{{ring(500000, 1)}}}},
		"NaN":            {ID: "x", Geometry: geo.LonLatGeometry{Kind: geo.Points, Parts: [][][]geo.LonLat{{ring(math.NaN(), 1)}}}},
		"two positions":  {ID: "x", Geometry: geo.LonLatGeometry{Kind: geo.Points, Parts: [][][]geo.LonLat{{ring(1, 1, 2, 2)}}}},
		"too many rings": {ID: "x", Geometry: geo.LonLatGeometry{Kind: geo.Lines, Parts: [][][]geo.LonLat{{ring(1, 1), ring(2, 2)}}}},
		"values":         {ID: "x", Values: []geo.Value{{}}},
	} {
		if err := Encode(ctx, io.Discard, &geo.Layer{Name: "L", Features: []geo.Feature{f}}, EncodeOptions{}); err == nil || !strings.Contains(err.Error(), `"L", feature 1 (x)`) {
			t.Errorf("%s: %v", name, err)
		}
	}
	nan := &geo.Layer{Columns: []geo.Column{{Name: "n"}}, Features: []geo.Feature{{Values: []geo.Value{geo.NumberValue(math.Inf(1))}}}}
	if err := Encode(ctx, io.Discard, nan, EncodeOptions{}); err == nil {
		t.Error("an infinite number was written")
	}
}

// Every write fails in turn.
func TestEncodeReportsFailedWrites(t *testing.T) {
	l := &geo.Layer{}
	for i := range 5000 {
		l.Features = append(l.Features, geo.Feature{ID: strconv.Itoa(i)})
	}
	for n := 0; ; n++ {
		w := &failing{left: n}
		err := Encode(ctx, w, l, EncodeOptions{})
		if err == nil {
			if n < 3 {
				t.Errorf("only %d writes", n)
			}
			return
		}
		if !errors.Is(err, io.ErrShortWrite) {
			t.Fatalf("write %d: %v", n, err)
		}
	}
}

type failing struct{ left int }

func (f *failing) Write(p []byte) (int, error) {
	if f.left == 0 {
		return 0, io.ErrShortWrite
	}
	f.left--
	return len(p), nil
}

// Another program, where it is installed, must read what is written, and what it writes must be read.
// Where it is not, what GDAL 3.6.2 wrote is read from here.
func TestWithAnotherProgram(t *testing.T) {
	recorded := "{\n\"type\": \"FeatureCollection\",\n\"name\": \"in\",\n\"crs\": { \"type\": \"name\", \"properties\": { \"name\": \"urn:ogc:def:crs:EPSG::25832\" } },\n\"features\": [\n{ \"type\": \"Feature\", \"properties\": { \"a\": \"x\" }, \"geometry\": { \"type\": \"Point\", \"coordinates\": [ 500000.0, 5316300.224344 ] } }\n]\n}\n"
	sequence := "\x1e{ \"type\": \"Feature\", \"properties\": { \"a\": \"x\" }, \"geometry\": { \"type\": \"Point\", \"coordinates\": [ 9.0, 48.0 ] } }\n"
	if tool, err := exec.LookPath("ogr2ogr"); err == nil {
		dir := t.TempDir()
		in := filepath.Join(dir, "in.geojson")
		var b bytes.Buffer
		l := &geo.Layer{Name: "in", Columns: []geo.Column{{Name: "a"}}, Features: []geo.Feature{{ID: "1", Values: []geo.Value{geo.TextValue("x")}, Geometry: geo.LonLatGeometry{Kind: geo.Points, Parts: [][][]geo.LonLat{{ring(9, 48)}}}}}}
		if err := Encode(ctx, &b, l, EncodeOptions{}); err != nil {
			t.Fatal(err)
		}
		if err := os.WriteFile(in, b.Bytes(), 0o600); err != nil {
			t.Fatal(err)
		}
		run := func(name string, args ...string) string {
			out := filepath.Join(dir, name)
			if msg, err := exec.Command(tool, append(args, out, in)...).CombinedOutput(); err != nil {
				t.Fatalf("%v: %s", err, msg)
			}
			data, err := os.ReadFile(out)
			if err != nil {
				t.Fatal(err)
			}
			return string(data)
		}
		recorded = run("metres.geojson", "-t_srs", "EPSG:25832")
		sequence = run("seq.geojsons", "-f", "GeoJSONSeq", "-lco", "RS=YES")
	}
	r := decode(t, recorded, Options{})
	p := r.Layer.Features[0].Geometry.Parts[0][0][0]
	if r.CRS != "EPSG:25832" || r.Layer.Name != "in" || math.Abs(p.Lon-500000) > 1e-3 || math.Abs(p.Lat-5316300.224) > 1e-3 {
		t.Errorf("%q %q %+v", r.CRS, r.Layer.Name, p)
	}
	if r := decode(t, sequence, Options{}); len(r.Layer.Features) != 1 || r.Layer.Features[0].Values[0] != geo.TextValue("x") {
		t.Errorf("%+v", r.Layer)
	}
}

func FuzzDecode(f *testing.F) {
	files, err := filepath.Glob(filepath.Join(hostile, "*.geojson*"))
	if err != nil || len(files) < 20 {
		f.Fatal(files, err)
	}
	for _, name := range files {
		b, err := os.ReadFile(name)
		if err != nil {
			f.Fatal(err)
		}
		f.Add(b)
	}
	f.Add([]byte(`{"type":"Feature","id":7,"properties":{"a":[{}]},"geometry":{"type":"MultiPolygon","coordinates":[[[[0,0],[1,0],[1,1]]]]}}`))
	f.Fuzz(func(t *testing.T, b []byte) {
		r, err := Decode(ctx, bytes.NewReader(b), Options{})
		again, err2 := Decode(ctx, iotest.OneByteReader(bytes.NewReader(b)), Options{})
		if fmt.Sprint(err) != fmt.Sprint(err2) || !reflect.DeepEqual(r, again) {
			t.Fatalf("byte by byte it reads otherwise: %v, %v", err, err2)
		}
		if err != nil {
			return
		}
		ids := map[string]bool{}
		for _, ft := range r.Layer.Features {
			if ids[ft.ID] || len(ft.Values) != len(r.Layer.Columns) {
				t.Fatalf("feature %+v", ft)
			}
			ids[ft.ID] = true
			ft.Geometry.Each(func(p geo.LonLat) {
				if !p.Finite() {
					t.Fatalf("position %+v", p)
				}
			})
		}
		var out bytes.Buffer
		if err := Encode(ctx, &out, r.Layer, EncodeOptions{}); err != nil {
			return // coordinates in metres
		}
		back, err := Decode(ctx, &out, Options{})
		if err != nil || len(back.Layer.Features) != len(r.Layer.Features) {
			t.Fatalf("what was written cannot be read: %v", err)
		}
	})
}

func BenchmarkDecode(b *testing.B) {
	var doc bytes.Buffer
	l := &geo.Layer{Columns: []geo.Column{{Name: "owner"}, {Name: "area_ha"}, {Name: "free"}}}
	for i := range 10_000 {
		x, y := float64(i%100)/100, float64(i/100)/100
		r := make([]geo.LonLat, 0, 33)
		for k := range 32 {
			sin, cos := math.Sincos(float64(k) * math.Pi / 16)
			r = append(r, geo.LonLat{Lon: x + cos/200, Lat: y + sin/200})
		}
		r = append(r, r[0])
		l.Features = append(l.Features, geo.Feature{ID: strconv.Itoa(i), Values: []geo.Value{geo.TextValue("owner " + strconv.Itoa(i)), geo.NumberValue(float64(i) / 7), geo.BoolValue(true)}, Geometry: geo.LonLatGeometry{Kind: geo.Polygons, Parts: [][][]geo.LonLat{{r}}}})
	}
	if err := Encode(ctx, &doc, l, EncodeOptions{}); err != nil {
		b.Fatal(err)
	}
	b.SetBytes(int64(doc.Len()))
	b.ReportAllocs()
	for b.Loop() {
		if _, err := Decode(ctx, bytes.NewReader(doc.Bytes()), Options{}); err != nil {
			b.Fatal(err)
		}
	}
}

func BenchmarkEncode(b *testing.B) {
	l := &geo.Layer{}
	for i := range 10_000 {
		x, y := float64(i%100)/100, float64(i/100)/100
		l.Features = append(l.Features, geo.Feature{ID: strconv.Itoa(i), Geometry: geo.LonLatGeometry{Kind: geo.Polygons, Parts: [][][]geo.LonLat{{ring(x, y, x+0.01, y, x+0.01, y+0.01, x, y+0.01, x, y)}}}})
	}
	b.ReportAllocs()
	for b.Loop() {
		if err := Encode(ctx, io.Discard, l, EncodeOptions{}); err != nil {
			b.Fatal(err)
		}
	}
}

// The short way of reading a number gives the bits of the standard library's or leaves it alone.
func TestPlainNumberIsTheNearestDouble(t *testing.T) {
	r := rand.New(rand.NewPCG(1, 2))
	texts := []string{"0", "-0", "0.0", "1", "9007199254740992", "9007199254740993", "0.1", "-0.3", "179.99999999", "9.067682100000001", "00", "01", "-01.5", ".5", "1.", "-", "", "1e5", "1.5E3", "1..2", "1.2.3", "0.00000000000000000000001", "0.0000000000000000000001"}
	for range 200_000 {
		texts = append(texts, strconv.FormatFloat((r.Float64()-0.5)*math.Pow(10, float64(r.IntN(9))), 'f', r.IntN(18), 64))
	}
	read := 0
	for _, text := range texts {
		for _, end := range []string{",", "]", "}", " ", "\n"} {
			literal, v, whole, ok := plainNumber([]byte(text + end))
			if !ok {
				continue
			}
			read++
			want, err := strconv.ParseFloat(text, 64)
			if err != nil || !json.Valid([]byte(text)) || string(literal) != text || math.Float64bits(v) != math.Float64bits(want) || whole == strings.Contains(text, ".") {
				t.Fatalf("%q reads as %v (%q, whole %v), the standard library says %v (%v)", text, v, literal, whole, want, err)
			}
		}
	}
	if read < len(texts) {
		t.Errorf("only %d of %d texts went the short way", read, len(texts))
	}
	for _, open := range []string{"12", "1.5", "1x,", "1e5,", "1-,"} {
		if _, _, _, ok := plainNumber([]byte(open)); ok {
			t.Errorf("%q is taken, though it may not end there", open)
		}
	}
}
