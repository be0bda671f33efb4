package export

import (
	"bytes"
	"context"
	"encoding/csv"
	"errors"
	"io/fs"
	"math"
	"os"
	"path/filepath"
	"reflect"
	"slices"
	"strconv"
	"strings"
	"testing"
	"time"

	"groundtally/app/store/gpkgin"
	"groundtally/app/study"
	"groundtally/geo"
	"groundtally/geo/formats/csvtable"
	"groundtally/geo/formats/geojson"
)

var (
	num  = geo.NumberValue
	text = geo.TextValue
	none = geo.Value{}
)

func at(lon, lat float64) geo.LonLatGeometry {
	return geo.LonLatGeometry{Kind: geo.Points, Parts: [][][]geo.LonLat{{{{Lon: lon, Lat: lat}}}}}
}

func ring(v ...float64) []geo.LonLat {
	out := make([]geo.LonLat, 0, len(v)/2)
	for i := 0; i+1 < len(v); i += 2 {
		out = append(out, geo.LonLat{Lon: v[i], Lat: v[i+1]})
	}
	return out
}

// dwellings are invented.
func dwellings() *geo.Layer {
	return &geo.Layer{Name: "dwellings", Columns: []geo.Column{{Name: "lon"}, {Name: "height", Unit: "m"}, {Name: "=note"}, {Name: "owner", Personal: true}, {Name: "used"}},
		Features: []geo.Feature{
			{ID: "D-1", Geometry: at(9.1, 48.00000001), Values: []geo.Value{text("a"), num(7.5), text("=1+1"), text("Mrs X"), geo.BoolValue(true)}},
			{ID: "-D2", Geometry: at(-0.1, 1.0/3), Values: []geo.Value{text(`say "so", then`), num(-2), text("line\nbreak"), none, geo.BoolValue(false)}},
			{ID: "3", Values: []geo.Value{text(""), num(1e21), none, none, none}},
		}}
}

func written(t *testing.T, l *geo.Layer, o Options) (path, content string) {
	t.Helper()
	path = filepath.Join(t.TempDir(), "x."+string(o.Format))
	if err := Layer(t.Context(), path, l, o); err != nil {
		t.Fatal(err)
	}
	b, err := os.ReadFile(path)
	if err != nil {
		t.Fatal(err)
	}
	return path, string(b)
}

func TestCSV(t *testing.T) {
	_, got := written(t, dwellings(), Options{Format: CSV})
	want := "feature_id,lon_2,lat,lon,height,'=note,used\r\n" +
		"D-1,9.1,48.00000001,a,7.5,'=1+1,true\r\n" +
		"'-D2,-0.1,0.3333333333333333,\"say \"\"so\"\", then\",-2,\"line\nbreak\",false\r\n" +
		"3,,,\"\",1e+21,,\r\n"
	if got != want {
		t.Errorf("got  %q\nwant %q", got, want)
	}
	if _, got := written(t, dwellings(), Options{Format: CSV, Personal: true}); !strings.Contains(got, "Mrs X") || !strings.Contains(got, ",owner,") {
		t.Errorf("%q", got)
	}
}

func TestFormulas(t *testing.T) {
	for in, want := range map[string]string{
		"=A1": "'=A1", "+49 30 1": "'+49 30 1", "-x": "'-x", "@SUM(1)": "'@SUM(1)", "\t=1": "'\t=1", "\r=1": "\"'\r=1\"",
		"=\"a\"": "\"'=\"\"a\"\"\"", "a=1": "a=1", "": `""`, " =1": `" =1"`, "'": "'", "größe": "größe", "a\xff": "a\ufffd",
	} {
		if got := string(appendText(nil, in)); got != want {
			t.Errorf("%q: %q, want %q", in, got, want)
		}
	}
}

func TestNumbers(t *testing.T) {
	for in, want := range map[float64]string{0: "0", 1e6: "1000000", 0.1: "0.1", 1e-6: "0.000001", 1e-7: "1e-07", -12.5: "-12.5", 9007199254740992: "9007199254740992", 1e300: "1e+300", 1.0 / 3: "0.3333333333333333"} {
		got := string(appendNumber(nil, in))
		if back, err := strconv.ParseFloat(got, 64); got != want || err != nil || back != in {
			t.Errorf("%g: %s, want %s", in, got, want)
		}
	}
}

func TestWKT(t *testing.T) {
	shaped := func(k geo.Kind, parts ...[][]geo.LonLat) geo.LonLatGeometry {
		return geo.LonLatGeometry{Kind: k, Parts: parts}
	}
	for want, g := range map[string]geo.LonLatGeometry{
		"POINT (1.5 -2)":                                       at(1.5, -2),
		"POINT EMPTY":                                          shaped(geo.Points),
		"MULTIPOINT ((1 2), (3 4))":                            shaped(geo.Points, [][]geo.LonLat{ring(1, 2)}, [][]geo.LonLat{ring(3, 4)}),
		"LINESTRING (1 2, 3 4)":                                shaped(geo.Lines, [][]geo.LonLat{ring(1, 2, 3, 4)}),
		"MULTILINESTRING ((1 2, 3 4), (5 6, 7 8))":             shaped(geo.Lines, [][]geo.LonLat{ring(1, 2, 3, 4)}, [][]geo.LonLat{ring(5, 6, 7, 8)}),
		"POLYGON ((0 0, 9 0, 9 9, 0 0), (1 1, 2 2, 2 1, 1 1))": shaped(geo.Polygons, [][]geo.LonLat{ring(0, 0, 9, 0, 9, 9, 0, 0), ring(1, 1, 2, 2, 2, 1, 1, 1)}),
		"MULTIPOLYGON (((0 0, 9 0, 9 9, 0 0)), EMPTY)":         shaped(geo.Polygons, [][]geo.LonLat{ring(0, 0, 9, 0, 9, 9, 0, 0)}, [][]geo.LonLat{}),
		"POLYGON EMPTY":                                        shaped(geo.Polygons, [][]geo.LonLat{}),
	} {
		if got := string(appendWKT(nil, g)); got != want {
			t.Errorf("%s, want %s", got, want)
		}
	}
}

// Where geometries are not all single points they stand as text; an independent reader finds them.
func TestCSVWithShapes(t *testing.T) {
	l := &geo.Layer{Name: "x", Columns: []geo.Column{{Name: "a"}}, Features: []geo.Feature{
		{ID: "1", Geometry: at(1, 2), Values: []geo.Value{num(1)}},
		{ID: "2", Values: []geo.Value{none}},
		{ID: "3", Geometry: geo.LonLatGeometry{Kind: geo.Lines, Parts: [][][]geo.LonLat{{ring(1, 2, 3, 4)}}}, Values: []geo.Value{text("x\r\ny")}},
	}}
	_, got := written(t, l, Options{Format: CSV})
	rows, err := csv.NewReader(strings.NewReader(got)).ReadAll()
	if err != nil {
		t.Fatal(err)
	}
	want := [][]string{{"feature_id", "wkt", "a"}, {"1", "POINT (1 2)", "1"}, {"2", "", ""}, {"3", "LINESTRING (1 2, 3 4)", "x\ny"}} // that reader makes \n of \r\n
	if !reflect.DeepEqual(rows, want) {
		t.Errorf("%q", rows)
	}
	l.Features = l.Features[1:2]
	if _, got := written(t, l, Options{Format: CSV}); got != "feature_id,a\r\n2,\r\n" {
		t.Errorf("%q", got)
	}
}

// Our own reader of tables gives the points back to the last bit.
func TestCSVReadBack(t *testing.T) {
	_, got := written(t, dwellings(), Options{Format: CSV})
	res, err := csvtable.Decode(t.Context(), strings.NewReader(got), csvtable.Options{X: "lon_2", Y: "lat"})
	if err != nil {
		t.Fatal(err)
	}
	for i, f := range dwellings().Features {
		if !reflect.DeepEqual(res.Layer.Features[i].Geometry, f.Geometry) {
			t.Errorf("%+v, want %+v", res.Layer.Features[i].Geometry, f.Geometry)
		}
	}
	if v := res.Layer.Features[1].Values[res.Layer.ColumnIndex("height")]; v != num(-2) {
		t.Errorf("%+v", v)
	}
}

func TestGeoJSON(t *testing.T) {
	_, got := written(t, dwellings(), Options{Format: GeoJSON})
	var want bytes.Buffer
	if err := geojson.Encode(t.Context(), &want, dwellings(), geojson.EncodeOptions{}); err != nil {
		t.Fatal(err)
	}
	if got != want.String() || strings.Contains(got, "Mrs X") {
		t.Errorf("%s", got)
	}
	if _, got := written(t, dwellings(), Options{Format: GeoJSON, Personal: true}); !strings.Contains(got, "Mrs X") {
		t.Errorf("%s", got)
	}
}

func TestGeoPackage(t *testing.T) {
	path := filepath.Join(t.TempDir(), "x.gpkg")
	nameless := &geo.Layer{}
	layers := []*geo.Layer{dwellings(), dwellings(), nameless, {Name: "Dwellings"}}
	if err := Layers(t.Context(), path, layers, Options{Format: GeoPackage, Changed: time.Unix(0, 0)}); err != nil {
		t.Fatal(err)
	}
	f, err := gpkgin.Open(t.Context(), path)
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	var names []string
	for _, table := range f.Tables() {
		names = append(names, table.Name)
	}
	if want := []string{"dwellings", "dwellings (2)", "layer", "Dwellings (3)"}; !slices.Equal(names, want) {
		t.Errorf("%q, want %q", names, want)
	}
	res, err := f.Read(t.Context(), "dwellings (2)", gpkgin.Options{})
	if err != nil {
		t.Fatal(err)
	}
	if res.CRS != "EPSG:4326" || len(res.Layer.Features) != 3 || res.Layer.ColumnIndex("owner") >= 0 || res.Layer.Columns[res.Layer.ColumnIndex("height")].Unit != "m" {
		t.Errorf("%+v", res)
	}
	if again := layers[0].Name; again != "dwellings" {
		t.Errorf("the layer was renamed: %q", again)
	}
}

func TestFormatOf(t *testing.T) {
	for path, want := range map[string]Format{"a.geojson": GeoJSON, "b/A.JSON": GeoJSON, "c.csv": CSV, "d.gpkg": GeoPackage} {
		if got, err := FormatOf(path); got != want || err != nil {
			t.Errorf("%s: %q, %v", path, got, err)
		}
	}
	var e *study.FileError
	if _, err := FormatOf("x.shp"); !errors.As(err, &e) || e.Cure == "" {
		t.Errorf("%v", err)
	}
}

func TestRefusals(t *testing.T) {
	dir := t.TempDir()
	bad := dwellings()
	bad.Features[1].Values[1] = num(math.NaN())
	far := dwellings()
	far.Features[0].Geometry = at(500_000, 5_300_000)
	short := dwellings()
	short.Features[2].Values = nil
	for _, format := range Formats() {
		path := filepath.Join(dir, "x."+string(format))
		for name, l := range map[string]*geo.Layer{"number": bad, "place": far, "values": short} {
			if err := Layer(t.Context(), path, l, Options{Format: format}); err == nil || !strings.Contains(err.Error(), "feature") && name != "number" {
				t.Errorf("%s, %s: %v", format, name, err)
			}
		}
		if err := Layers(t.Context(), path, nil, Options{Format: format}); err == nil {
			t.Errorf("%s: no layer, no error", format)
		}
		ctx, cancel := context.WithCancel(t.Context())
		cancel()
		if err := Layer(ctx, path, dwellings(), Options{Format: format}); !errors.Is(err, context.Canceled) {
			t.Errorf("%s: %v", format, err)
		}
		if _, err := os.Stat(path); !errors.Is(err, fs.ErrNotExist) {
			t.Errorf("%s: something was written: %v", format, err)
		}
		// Never over a file that is there, unless asked.
		if err := os.WriteFile(path, []byte("mine"), 0o600); err != nil {
			t.Fatal(err)
		}
		if err := Layer(t.Context(), path, dwellings(), Options{Format: format}); !errors.Is(err, study.ErrNameInUse) {
			t.Errorf("%s: %v", format, err)
		}
		if b, err := os.ReadFile(path); err != nil || string(b) != "mine" {
			t.Errorf("%s: %q, %v", format, b, err)
		}
		if err := Layer(t.Context(), path, dwellings(), Options{Format: format, Replace: true}); err != nil {
			t.Errorf("%s: %v", format, err)
		}
		var e *study.FileError
		if err := Layers(t.Context(), path, []*geo.Layer{dwellings(), dwellings()}, Options{Format: format, Replace: true}); (format == GeoPackage) != (err == nil) || err != nil && !errors.As(err, &e) {
			t.Errorf("%s: two layers: %v", format, err)
		}
	}
	if err := Layer(t.Context(), filepath.Join(dir, "x"), dwellings(), Options{Format: "shp"}); err == nil {
		t.Error("an unknown format was written")
	}
	entries, err := os.ReadDir(dir)
	if err != nil {
		t.Fatal(err)
	}
	if len(entries) != len(Formats()) {
		t.Errorf("left behind: %v", entries)
	}
}
