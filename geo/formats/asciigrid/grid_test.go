package asciigrid

import (
	"bytes"
	"context"
	"errors"
	"io"
	"math"
	"os"
	"os/exec"
	"path/filepath"
	"reflect"
	"runtime"
	"strings"
	"testing"
	"testing/iotest"

	"groundtally/geo/raster"
)

var ctx = context.Background()

const head = "ncols 3\nnrows 2\nxllcorner 500000\nyllcorner 5316300\ncellsize 25\n"

func want() *raster.Grid {
	return &raster.Grid{NCols: 3, NRows: 2, XLL: 500000, YLL: 5316300, CellX: 25, CellY: 25, NoData: -9999, Values: []float32{1, 2.5, -9999, 4, 5e3, -6}}
}

func TestRead(t *testing.T) {
	const body = "1 2.5 -9999\n4 5e3 -6\n"
	centre := want()
	centre.XLL, centre.YLL = 499987.5, 5316287.5
	oblong := want()
	oblong.CellY = 10
	floats := want()
	floats.NoData = -math.MaxFloat32
	floats.Values[2] = -math.MaxFloat32
	for name, c := range map[string]struct {
		in      string
		want    *raster.Grid
		notices string
	}{
		"plain":             {head + "NODATA_value -9999\n" + body, want(), ""},
		"no nodata":         {head + body, want(), "nodata_assumed"},
		"upper case":        {strings.ToUpper(head+"NODATA_value -9999\n") + body, want(), ""},
		"other order":       {"nodata_value -9999 cellsize 25 yllcorner 5316300 xllcorner 500000 nrows 2 ncols 3\n" + body, want(), ""},
		"wrapped values":    {head + "nodata_value -9999\n1\n2.5 -9999 4\n5e3\t-6", want(), ""},
		"carriage returns":  {strings.ReplaceAll(head+"nodata_value -9999\n"+body, "\n", "\r\n"), want(), ""},
		"byte order mark":   {"\xef\xbb\xbf" + head + "nodata_value -9999\n" + body, want(), ""},
		"centre":            {strings.ReplaceAll(head, "corner", "center") + "nodata_value -9999\n" + body, centre, ""},
		"oblong":            {strings.Replace(head, "cellsize 25", "dx 25\ndy 10", 1) + "nodata_value -9999\n" + body, oblong, ""},
		"decimal comma":     {head + "nodata_value -9999\n1 2,5 -9999\n4 5e3 -6\n", want(), "decimal_comma"},
		"nan is missing":    {head + "nodata_value nan\n1 2.5 NaN\n4 5e3 -6\n", floats, ""},
		"first one missing": {head + "nodata_value nan\nnan nan nan\nnan 1 nan\n", &raster.Grid{NCols: 3, NRows: 2, XLL: 500000, YLL: 5316300, CellX: 25, CellY: 25, NoData: -math.MaxFloat32, Values: []float32{-math.MaxFloat32, -math.MaxFloat32, -math.MaxFloat32, -math.MaxFloat32, 1, -math.MaxFloat32}}, "mostly_missing"},
		"long lowest float": {head + "nodata_value -3.40282346639e+38\n1 2.5 -3.4028234663852886e+38\n4 5e3 -6\n", floats, ""},
	} {
		t.Run(name, func(t *testing.T) {
			for how, r := range map[string]io.Reader{"whole": strings.NewReader(c.in), "by bytes": iotest.OneByteReader(strings.NewReader(c.in))} {
				got, err := Decode(ctx, r, Options{})
				if err != nil {
					t.Fatalf("%s: %v", how, err)
				}
				var codes []string
				for _, n := range got.Notices {
					codes = append(codes, n.Code)
				}
				if !reflect.DeepEqual(got.Grid, c.want) || strings.Join(codes, " ") != c.notices {
					t.Errorf("%s:\n got %+v %v\nwant %+v %s", how, got.Grid, codes, c.want, c.notices)
				}
			}
		})
	}
}

func TestRefused(t *testing.T) {
	for name, c := range map[string]struct {
		in   string
		o    Options
		code string
		line int
	}{
		"empty":             {"", Options{}, "empty_file", 1},
		"blank":             {" \n\n", Options{}, "empty_file", 3},
		"other text":        {"lon,lat\n9,48\n", Options{}, "not_a_grid", 1},
		"unknown key":       {"ncols 3\nnrows 2\ncolour 7\n", Options{}, "not_a_grid", 3},
		"key twice":         {"ncols 3\nncols 3\n", Options{}, "key_twice", 2},
		"key at the end":    {"ncols 3\nnrows", Options{}, "truncated", 2},
		"numbers only":      {"1 2 3\n", Options{}, "key_missing", 1},
		"no nrows":          {"ncols 3\nxllcorner 0\nyllcorner 0\ncellsize 1\n1 2 3\n", Options{}, "key_missing", 5},
		"no corner":         {"ncols 1\nnrows 1\nyllcorner 0\ncellsize 1\n1\n", Options{}, "key_missing", 5},
		"corner and centre": {"ncols 1\nnrows 1\nxllcorner 0\nxllcenter 0\nyllcorner 0\ncellsize 1\n1\n", Options{}, "key_missing", 7},
		"no cell size":      {"ncols 1\nnrows 1\nxllcorner 0\nyllcorner 0\n1\n", Options{}, "key_missing", 5},
		"two cell sizes":    {"ncols 1\nnrows 1\nxllcorner 0\nyllcorner 0\ncellsize 1 dx 1 dy 1\n1\n", Options{}, "key_missing", 6},
		"half a column":     {strings.Replace(head, "3", "2.5", 1) + "1", Options{}, "bad_header", 6},
		"no column":         {strings.Replace(head, "3", "0", 1) + "1", Options{}, "bad_header", 6},
		"minus a row":       {strings.Replace(head, "2", "-2", 1) + "1", Options{}, "bad_header", 6},
		"cell of nothing":   {strings.Replace(head, "25", "0", 1) + "1", Options{}, "bad_header", 6},
		"endless corner":    {strings.Replace(head, "500000", "inf", 1), Options{}, "not_a_number", 3},
		"too few":           {head + "1 2 3\n4 5\n", Options{}, "values", 8},
		"none":              {head, Options{}, "values", 6},
		"too many":          {head + "1 2 3\n4 5 6\n7\n", Options{}, "values", 8},
		"text":              {head + "1 2 3\n4 x 6\n", Options{}, "not_a_number", 7},
		"nan":               {head + "1 2 3\n4 nan 6\n", Options{}, "not_a_number", 7},
		"hexadecimal":       {head + "1 2 3\n4 0x5 6\n", Options{}, "not_a_number", 7},
		"underscore":        {head + "1 2 3\n4 5_0 6\n", Options{}, "not_a_number", 7},
		"too large":         {head + "1 2 3\n4 1e39 6\n", Options{}, "number_too_large", 7},
		"lowest with nan":   {head + "nodata_value nan\n1 2 3\n4 -3.4028234663852886e+38 6\n", Options{}, "number_too_large", 8},
		"both marks":        {head + "1,5 2.5 3\n4 5 6\n", Options{}, "decimal_mixed", 6},
		"thousands":         {head + "1,234.5 2 3\n4 5 6\n", Options{}, "thousands", 6},
		"zero byte":         {head + "1 2 3\n4 \x00 6\n", Options{}, "not_text", 7},
		"long word":         {head + strings.Repeat("1", 5000), Options{}, "not_a_grid", 6},
		"bytes":             {head + "1 2 3\n4 5 6\n", Options{MaxBytes: 70}, "file_too_large", 7},
		"cells":             {head + "1 2 3\n4 5 6\n", Options{MaxCells: 5}, "too_many", 6},
		"cells overflow":    {"ncols 2147483647\nnrows 2147483647\nxllcorner 0\nyllcorner 0\ncellsize 1\n1\n", Options{}, "too_many", 6},
	} {
		t.Run(name, func(t *testing.T) {
			c.o.File = "t.asc"
			_, err := Decode(ctx, strings.NewReader(c.in), c.o)
			var e *Error
			if !errors.As(err, &e) || e.Code != c.code || e.Line != c.line || e.File != "t.asc" || e.Do == "" || e.Offset < 0 || e.Offset > int64(len(c.in)) {
				t.Errorf("error %v: %+v", err, e)
			}
		})
	}
}

// A header that promises a gigabyte of values must not make the program ask for it.
func TestPromisesAreNotAllocated(t *testing.T) {
	var before, after runtime.MemStats
	runtime.ReadMemStats(&before)
	_, err := Decode(ctx, strings.NewReader("ncols 15000\nnrows 15000\nxllcorner 0\nyllcorner 0\ncellsize 1\n1 2 3\n"), Options{})
	runtime.ReadMemStats(&after)
	var e *Error
	if !errors.As(err, &e) || e.Code != "values" {
		t.Errorf("error %v", err)
	}
	if n := after.TotalAlloc - before.TotalAlloc; n > 8<<20 {
		t.Errorf("%d bytes were allocated", n)
	}
}

func TestAt(t *testing.T) {
	g := want()
	if v, ok := g.At(1, 0); v != 2.5 || !ok {
		t.Errorf("%g, %t", v, ok)
	}
	for _, p := range [][2]int{{2, 0}, {-1, 0}, {0, -1}, {3, 0}, {0, 2}} {
		if _, ok := g.At(p[0], p[1]); ok {
			t.Errorf("%v has a value", p)
		}
	}
}

func TestReaderFailsAndCancel(t *testing.T) {
	broken := errors.New("pulled out")
	var e *Error
	if _, err := Decode(ctx, io.MultiReader(strings.NewReader(head+"1 2"), iotest.ErrReader(broken)), Options{}); !errors.Is(err, broken) || !errors.As(err, &e) || e.Code != "unreadable" {
		t.Errorf("error %v", err)
	}
	stop, cancel := context.WithCancel(ctx)
	defer cancel()
	seen := int64(0)
	big := "ncols 3000\nnrows 3000\nxllcorner 0\nyllcorner 0\ncellsize 1\n" + strings.Repeat("1 ", 9_000_000)
	if _, err := Decode(stop, strings.NewReader(big), Options{Progress: func(n int64) {
		if seen = n; n > 2<<20 {
			cancel()
		}
	}}); !errors.Is(err, context.Canceled) || seen > 4<<20 {
		t.Errorf("%v after %d bytes", err, seen)
	}
}

// What GDAL makes of a grid, where it is installed, must read as the same grid; else what GDAL 3.6.2
// wrote is read.
func TestFromGDAL(t *testing.T) {
	written := []byte("ncols        3\nnrows        2\nxllcorner    500000.000000000000\nyllcorner    5316300.000000000000\ncellsize     25.000000000000\nNODATA_value  -9999\n 1.0 2.5 -9999\n 4.0 5000 -6\n")
	if tool, err := exec.LookPath("gdal_translate"); err == nil {
		dir := t.TempDir()
		in, out := filepath.Join(dir, "in.asc"), filepath.Join(dir, "out.asc")
		if err := os.WriteFile(in, []byte(head+"nodata_value -9999\n1 2.5 -9999\n4 5e3 -6\n"), 0o600); err != nil {
			t.Fatal(err)
		}
		if msg, err := exec.Command(tool, "-q", "-of", "AAIGrid", in, out).CombinedOutput(); err != nil {
			t.Fatalf("%v: %s", err, msg)
		}
		if written, err = os.ReadFile(out); err != nil {
			t.Fatal(err)
		}
	}
	got, err := Decode(ctx, bytes.NewReader(written), Options{})
	if err != nil || !reflect.DeepEqual(got.Grid, want()) || got.Missing != 1 {
		t.Errorf("%+v, %v, from\n%s", got.Grid, err, written)
	}
}

func FuzzDecode(f *testing.F) {
	f.Add([]byte(head + "1 2.5 -9999\n4 5e3 -6\n"))
	f.Add([]byte(head + "nodata_value nan\nnan 2,5 1\n4 5e3 -6\n"))
	f.Fuzz(func(t *testing.T, b []byte) {
		r, err := Decode(ctx, bytes.NewReader(b), Options{MaxCells: 1 << 20})
		if err != nil {
			return
		}
		if len(r.Grid.Values) != r.Grid.NCols*r.Grid.NRows || r.Grid.CellX <= 0 || r.Grid.CellY <= 0 {
			t.Fatalf("%+v", r.Grid)
		}
		for _, v := range r.Grid.Values {
			if f := float64(v); math.IsNaN(f) || math.IsInf(f, 0) {
				t.Fatalf("value %g", v)
			}
		}
	})
}

func BenchmarkDecode(b *testing.B) {
	in := "ncols 1000\nnrows 1000\nxllcorner 0\nyllcorner 0\ncellsize 1\n" + strings.Repeat("123.45 ", 1_000_000)
	b.SetBytes(int64(len(in)))
	b.ReportAllocs()
	for b.Loop() {
		if _, err := Decode(ctx, strings.NewReader(in), Options{}); err != nil {
			b.Fatal(err)
		}
	}
}
