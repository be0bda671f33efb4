package geotiff

import (
	"bytes"
	"context"
	"encoding/csv"
	"errors"
	"math"
	"os"
	"path/filepath"
	"strconv"
	"strings"
	"testing"

	"groundtally/geo/formats"
)

const folder = "../../../testdata/formats/geotiff"

func load(t testing.TB, name string) []byte {
	t.Helper()
	b, err := os.ReadFile(filepath.Join(folder, name))
	if err != nil {
		t.Fatal(err)
	}
	return b
}

func decodeBytes(b []byte, o Options) (Result, error) {
	return Decode(context.Background(), bytes.NewReader(b), int64(len(b)), o)
}

// A truth is a grid of text, NaN where it is missing.
type truth struct {
	cols, rows int
	v          []float64
}

// source reads an .asc of the folder by plain means, so that it depends on no reader of ours.
func asc(t testing.TB, name string) truth {
	t.Helper()
	words := strings.Fields(string(load(t, name+".asc")))
	head := map[string]string{}
	for ; len(words) > 1 && words[0][0] >= 'A'; words = words[2:] {
		head[words[0]] = words[1]
	}
	number := func(s string) float64 {
		v, err := strconv.ParseFloat(s, 64)
		if err != nil {
			t.Fatal(err)
		}
		return v
	}
	w := truth{cols: int(number(head["ncols"])), rows: int(number(head["nrows"]))}
	for _, s := range words {
		v := number(s)
		if s == head["NODATA_value"] {
			v = math.NaN()
		}
		w.v = append(w.v, v)
	}
	if len(w.v) != w.cols*w.rows || w.cols != 37 {
		t.Fatalf("%s: %d by %d cells, %d values", name, w.cols, w.rows, len(w.v))
	}
	return w
}

// made gives the truth after a change of each cell.
func (w truth) made(f func(v float64) float64) truth {
	out := truth{w.cols, w.rows, make([]float64, len(w.v))}
	for i, v := range w.v {
		out.v[i] = f(v)
	}
	return out
}

// placed gives a truth of other size whose cell at c, r is that of the old one that at gives.
func (w truth) placed(cols, rows int, at func(c, r int) (int, int)) truth {
	out := truth{cols: cols, rows: rows}
	for r := range rows {
		for c := range cols {
			v := math.NaN()
			if oc, or := at(c, r); oc >= 0 && or >= 0 && oc < w.cols && or < w.rows {
				v = w.v[or*w.cols+oc]
			}
			out.v = append(out.v, v)
		}
	}
	return out
}

func compare(t *testing.T, got Result, want truth) {
	t.Helper()
	g := got.Grid
	if g.NCols != want.cols || g.NRows != want.rows || len(g.Values) != len(want.v) {
		t.Fatalf("%d by %d cells with %d values, want %d by %d", g.NCols, g.NRows, len(g.Values), want.cols, want.rows)
	}
	if float64(float32(g.NoData)) != g.NoData || math.IsInf(g.NoData, 0) {
		t.Errorf("the mark of missing cells %g is not exact", g.NoData)
	}
	missing, wrong := 0, 0
	for i, w := range want.v {
		v, ok := g.At(i%want.cols, i/want.cols)
		if math.IsNaN(w) {
			missing++
		}
		if ok == math.IsNaN(w) || ok && v != float32(w) {
			if wrong++; wrong < 5 {
				t.Errorf("column %d, row %d: %g, %t, want %g", i%want.cols, i/want.cols, v, ok, w)
			}
		}
	}
	if wrong > 0 {
		t.Errorf("%d cells are wrong", wrong)
	}
	if got.Missing != missing {
		t.Errorf("%d cells are said to be missing, %d are", got.Missing, missing)
	}
}

func codes(r Result) string {
	var out []string
	for _, n := range r.Notices {
		out = append(out, n.Code)
	}
	return strings.Join(out, " ")
}

// Every way to pack each type of number gives the cells of the text.
func TestEveryPacking(t *testing.T) {
	seen := 0
	for _, kind := range []string{"byte", "uint16", "int16", "uint32", "int32", "float32", "float64"} {
		want := asc(t, kind)
		names, err := filepath.Glob(filepath.Join(folder, kind+"-*-*-*.tif"))
		if err != nil {
			t.Fatal(err)
		}
		for _, name := range names {
			base := filepath.Base(name)
			t.Run(strings.TrimSuffix(base, ".tif"), func(t *testing.T) {
				b := load(t, base)
				got, err := decodeBytes(b, Options{File: base})
				if err != nil {
					t.Fatal(err)
				}
				compare(t, got, want)
				notices := map[string]string{"uint32": "digits_lost", "int32": "digits_lost"}[kind]
				if codes(got) != notices || got.CRS != "EPSG:25832" || got.Bands != 1 {
					t.Errorf("notices %q, reference system %q, %d bands", codes(got), got.CRS, got.Bands)
				}
				// The name of the file says what GDAL was asked for; make sure that it did it.
				h, err := Info(bytes.NewReader(b), int64(len(b)), Options{})
				if err != nil || h.Refused != nil {
					t.Fatal(err, h.Refused)
				}
				if big := strings.Contains(base, "-big"); h.Big != big || (b[2] == 43 || b[3] == 43) != big {
					t.Errorf("big is %t", h.Big)
				}
				if (b[0] == 'M') != strings.Contains(base, "-mm") {
					t.Errorf("byte order %c", b[0])
				}
				_, inner, err := open(bytes.NewReader(b), int64(len(b)), &Options{})
				if err != nil {
					t.Fatal(err)
				}
				if inner.tiled != strings.Contains(base, "-tiles") || inner.across*inner.down < 4 {
					t.Errorf("tiles %t, %d by %d blocks", inner.tiled, inner.across, inner.down)
				}
				pack := strings.Split(base, "-")[1]
				if want := map[byte]string{'n': "none", 'l': "LZW", 'd': "Deflate"}[pack[0]]; h.Compression != want {
					t.Errorf("compression %s", h.Compression)
				}
				predictor := uint64(1)
				if last := pack[len(pack)-1]; last == '2' || last == '3' {
					predictor = uint64(last - '0')
				}
				if inner.predictor != predictor {
					t.Errorf("predictor %d", inner.predictor)
				}
			})
			seen++
		}
	}
	if seen != 7*8+2*2 {
		t.Errorf("%d files", seen)
	}
}

func TestOneProperty(t *testing.T) {
	f32, i16 := asc(t, "float32"), asc(t, "int16")
	shown := asc(t, "float32").made(func(v float64) float64 { // missing cells as numbers
		if math.IsNaN(v) {
			return -9999
		}
		return v
	})
	window := func(c, r int) (int, int) { return c - 20, r - 10 }
	feet := 1200.0 / 3937
	for name, c := range map[string]struct {
		o       Options
		want    truth
		crs     string
		noData  float64
		notices string
	}{
		"point":         {want: i16, noData: -32768},
		"one-strip":     {want: i16, noData: -32768},
		"bands-chunky":  {want: f32, noData: -9999, notices: "bands_left_out"},
		"bands-planar":  {want: f32, noData: -9999, notices: "bands_left_out"},
		"bands-chunky2": {want: i16, noData: -32768, notices: "bands_left_out"},
		"nodata-none":   {want: shown, noData: -math.MaxFloat32, notices: "nodata_not_stated"},
		"nodata-nan":    {want: f32, noData: -math.MaxFloat32},
		"nodata-lowest": {want: f32, noData: -math.MaxFloat32},
		"no-crs":        {want: f32, crs: "-", noData: -9999, notices: "crs_not_stated"},
		"user-crs":      {want: f32, crs: "-", noData: -9999, notices: "crs_user_defined"},
		"degrees":       {want: f32, crs: "EPSG:4326", noData: -9999},
		"oblong":        {want: f32, noData: -9999},
		"us-feet":       {want: f32, crs: "EPSG:2263", noData: -9999, notices: "values_not_metres"},
		"south-up":      {want: f32.placed(37, 23, func(c, r int) (int, int) { return c, 22 - r }), noData: -9999},
		"scaled":        {want: i16.made(func(v float64) float64 { return v*0.25 - 100 }), noData: -32768, notices: "values_scaled"},
		"sparse":        {want: f32.placed(70, 50, window), noData: -9999, notices: "mostly_missing"},
		"cog":           {want: f32.placed(296, 184, func(c, r int) (int, int) { return c / 8, r / 8 }), noData: -9999},
		"lzw-long":      {want: asc(t, "float64").placed(111, 69, func(c, r int) (int, int) { return c / 3, r / 3 }), noData: -math.MaxFloat32},
		"overviews":     {want: i16, noData: -32768},
		"mask":          {want: i16, noData: -32768, notices: "mask_left_out"},
		"two-images":    {want: i16, noData: -32768, notices: "images_left_out"},
		"feet":          {want: i16, noData: -32768, notices: "values_not_metres"},
		"coloured":      {want: asc(t, "byte"), noData: 255, notices: "values_with_colours"},
		"byte-signed": {want: asc(t, "byte").made(func(v float64) float64 {
			if math.IsNaN(v) {
				return -1
			}
			return float64(int8(uint8(v)))
		}), noData: -math.MaxFloat32},
	} {
		t.Run(name, func(t *testing.T) {
			if c.crs == "" {
				c.crs = "EPSG:25832"
			}
			got, err := decodeBytes(load(t, name+".tif"), c.o)
			if err != nil {
				t.Fatal(err)
			}
			compare(t, got, c.want)
			if got.CRS != strings.Trim(c.crs, "-") || got.Grid.NoData != c.noData || codes(got) != c.notices {
				t.Errorf("reference system %q, missing is %g, notices %q", got.CRS, got.Grid.NoData, codes(got))
			}
		})
	}

	t.Run("metres", func(t *testing.T) {
		for name, want := range map[string]truth{"us-feet": f32.made(func(v float64) float64 { return v * feet }), "feet": i16.made(func(v float64) float64 { return v * 0.3048 })} {
			got, err := decodeBytes(load(t, name+".tif"), Options{Metres: true})
			if err != nil {
				t.Fatal(err)
			}
			compare(t, got, want)
			if !strings.HasSuffix(codes(got), "values_to_metres") {
				t.Errorf("%s: notices %q", name, codes(got))
			}
		}
		got, err := decodeBytes(load(t, "us-feet.tif"), Options{})
		if err != nil || got.VerticalUnit != "US survey foot" || got.VerticalToM != feet || got.VerticalCRS != "EPSG:6360" {
			t.Errorf("%q of %g m, %q, %v", got.VerticalUnit, got.VerticalToM, got.VerticalCRS, err)
		}
	})
	// A block that was left out is missing even where no number is stated for it. In sparse-none the
	// blocks that are there hold 0 around the window.
	t.Run("sparse without a number for missing", func(t *testing.T) {
		got, err := decodeBytes(load(t, "sparse-none.tif"), Options{})
		if err != nil {
			t.Fatal(err)
		}
		want := shown.placed(70, 50, window)
		for i, v := range want.v {
			c, r := i%70, i/70
			if inside := c >= 16 && c < 64 && r < 48; math.IsNaN(v) && inside {
				want.v[i] = 0
			}
		}
		compare(t, got, want)
		if codes(got) != "blocks_left_out nodata_not_stated" && codes(got) != "mostly_missing blocks_left_out nodata_not_stated" {
			t.Errorf("notices %q", codes(got))
		}
	})
	t.Run("citation", func(t *testing.T) {
		got, err := decodeBytes(load(t, "user-crs.tif"), Options{})
		if err != nil || len(got.Notices) != 1 || got.Notices[0].Args["citation"] == "" {
			t.Errorf("%+v, %v", got.Notices, err)
		}
	})
}

func rows(t *testing.T, name string) [][]string {
	t.Helper()
	r, err := csv.NewReader(bytes.NewReader(load(t, name))).ReadAll()
	if err != nil || len(r) == 0 {
		t.Fatal(err)
	}
	return r
}

func numbers(t *testing.T, row []string) []float64 {
	t.Helper()
	var out []float64
	for _, s := range row {
		v, err := strconv.ParseFloat(s, 64)
		if err != nil {
			t.Fatal(err)
		}
		out = append(out, v)
	}
	return out
}

// The corners are those that gdalinfo prints, to the digits that it prints.
func TestCorners(t *testing.T) {
	checked := 0
	for _, row := range rows(t, "corners.csv") {
		want := numbers(t, row[1:])
		b := load(t, row[0])
		h, err := Info(bytes.NewReader(b), int64(len(b)), Options{})
		if err != nil {
			t.Fatal(err)
		}
		if !h.Placed {
			continue
		}
		tr := h.Transform
		at := func(c, r float64) (x, y float64) { return tr[0] + c*tr[1] + r*tr[2], tr[3] + c*tr[4] + r*tr[5] }
		ulx, uly := at(0, 0)
		lrx, lry := at(float64(h.Cols), float64(h.Rows))
		for i, v := range []float64{ulx, uly, lrx, lry} {
			if math.Abs(v-want[i]) > 1e-6 {
				t.Errorf("%s: corners %g %g, %g %g, want %v", row[0], ulx, uly, lrx, lry, want)
				break
			}
		}
		checked++
		if h.Refused != nil {
			continue
		}
		got, err := decodeBytes(b, Options{})
		if err != nil {
			t.Fatal(err)
		}
		g := got.Grid
		west, east, north, south := want[0], want[2], max(want[1], want[3]), min(want[1], want[3])
		if math.Abs(g.XLL-west) > 1e-6 || math.Abs(g.YLL-south) > 1e-6 || math.Abs(g.XLL+g.CellX*float64(g.NCols)-east) > 1e-6 || math.Abs(g.YLL+g.CellY*float64(g.NRows)-north) > 1e-6 || g.CellX <= 0 || g.CellY <= 0 {
			t.Errorf("%s: the grid lies at %g %g with cells of %g by %g, want %v", row[0], g.XLL, g.YLL, g.CellX, g.CellY, want)
		}
	}
	if checked < 95 {
		t.Errorf("%d files", checked)
	}
}

func TestScaledAsGDALScales(t *testing.T) {
	got, err := decodeBytes(load(t, "scaled.tif"), Options{})
	if err != nil {
		t.Fatal(err)
	}
	for _, row := range rows(t, "scaled.csv") {
		w := numbers(t, row)
		if v, ok := got.Grid.At(int(w[0]), int(w[1])); !ok || float64(v) != w[2] {
			t.Errorf("column %g, row %g: %g, %t, want %g", w[0], w[1], v, ok, w[2])
		}
	}
}

// GDAL 3.6.2 cannot read back what it writes most significant byte first with predictor 3: its writer
// puts the bytes the wrong way round. What it reads from such a file is by the standard, so that, and
// not what it was given, is what must come out here.
func TestPredictor3MostSignificantFirst(t *testing.T) {
	for _, row := range rows(t, "swapped3.csv") {
		got, err := decodeBytes(load(t, row[0]), Options{})
		if err != nil {
			t.Fatal(err)
		}
		w := numbers(t, row[1:])
		if math.Abs(w[2]) > math.MaxFloat32 {
			continue
		}
		if v, ok := got.Grid.At(int(w[0]), int(w[1])); !ok || v != float32(w[2]) {
			t.Errorf("%s, column %g, row %g: %g, %t, want %g", row[0], w[0], w[1], v, ok, w[2])
		}
	}
}

func TestRefused(t *testing.T) {
	for name, c := range map[string][2]string{
		"zstd": {"compression", "ZSTD"}, "lerc": {"compression", "LERC"}, "jpeg": {"compression", "JPEG"},
		"packbits": {"compression", "PackBits"}, "lzma": {"compression", "LZMA"},
		"picture": {"picture", "picture"}, "webp": {"picture", "picture"},
		"1-bit": {"sample", "1 bits"}, "4-bits": {"sample", "4 bits"}, "12-bits": {"sample", "12 bits"},
		"half": {"sample", "16 bits"}, "complex": {"sample", "complex"}, "64-bits": {"sample", "64 bits"},
		"no-place": {"no_place", "where its cells lie"}, "points": {"control_points", "control points"}, "turned": {"turned", "west to east"},
	} {
		t.Run(name, func(t *testing.T) {
			file := "refused-" + name + ".tif"
			b := load(t, file)
			got, err := decodeBytes(b, Options{File: file})
			var e *formats.Error
			if !errors.As(err, &e) || e.Code != c[0] || !strings.Contains(e.What, c[1]) || e.File != file || e.Do == "" || got.Grid != nil {
				t.Fatalf("error %v", err)
			}
			if c[0] == "compression" && !strings.Contains(e.Do, "Deflate") {
				t.Errorf("no cure in %v", err)
			}
			h, err := Info(bytes.NewReader(b), int64(len(b)), Options{File: file})
			if err != nil || h.Cols != 37 || h.Rows != 23 || h.Refused == nil || h.Refused.Error() != e.Error() {
				t.Errorf("%+v, %v", h, err)
			}
			if (h.Kind == Picture) != (c[0] == "picture") {
				t.Errorf("kind %s", h.Kind)
			}
		})
	}
	b := load(t, "float32-none-strips-ii.tif")
	_, err := decodeBytes(b, Options{MaxCells: 37*23 - 1})
	var e *formats.Error
	if !errors.As(err, &e) || e.Code != "too_many" {
		t.Errorf("error %v", err)
	}
}

func TestInfo(t *testing.T) {
	b := load(t, "float32-def3-strips-ii.tif")
	h, err := Info(bytes.NewReader(b), int64(len(b)), Options{})
	if err != nil || h.Refused != nil || h.Cols != 37 || h.Rows != 23 || h.Bands != 1 || h.Kind != Values || h.Sample != "Float32" || h.CRS != "EPSG:25832" || !h.Placed || !h.HasNoData || h.NoData != -9999 || h.HorizontalUnit != "metre" {
		t.Errorf("%+v, %v", h, err)
	}
	if minX, minY, maxX, maxY := h.Extent(); minX != 500000 || minY != 5316300 || maxX != 500925 || maxY != 5316875 {
		t.Errorf("extent %g %g %g %g", minX, minY, maxX, maxY)
	}
	b = load(t, "coloured.tif")
	if h, err = Info(bytes.NewReader(b), int64(len(b)), Options{}); err != nil || h.Kind != Coloured || h.Sample != "Byte" || h.Kind.String() == "" {
		t.Errorf("%+v, %v", h, err)
	}
	b = load(t, "bands-planar.tif")
	if h, err = Info(bytes.NewReader(b), int64(len(b)), Options{}); err != nil || !h.Planar || h.Bands != 3 {
		t.Errorf("%+v, %v", h, err)
	}
}
