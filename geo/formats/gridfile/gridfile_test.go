package gridfile

import (
	"compress/gzip"
	"context"
	"errors"
	"io"
	"math"
	"os"
	"path/filepath"
	"testing"

	"groundtally/geo/formats"
)

const folder = "../../../testdata/formats"

func load(t testing.TB, name string) []byte {
	t.Helper()
	f, err := os.Open(filepath.Join(folder, name))
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	var r io.Reader = f
	if filepath.Ext(name) == ".gz" {
		if r, err = gzip.NewReader(f); err != nil {
			t.Fatal(err)
		}
	}
	b, err := io.ReadAll(r)
	if err != nil {
		t.Fatal(err)
	}
	return b
}

// The same cells come out of the text and of what GDAL made of it.
func TestOneGridInTwoKinds(t *testing.T) {
	text, crs, notices, err := Decode(context.Background(), ASCIIGrid, "float32.asc", load(t, "geotiff/float32.asc"))
	if err != nil || crs != "" || len(notices) != 0 {
		t.Fatal(crs, notices, err)
	}
	tiff, crs, notices, err := Decode(context.Background(), GeoTIFF, "f.tif", load(t, "geotiff/float32-def3-strips-ii.tif"))
	if err != nil || crs != "EPSG:25832" || len(notices) != 0 {
		t.Fatal(crs, notices, err)
	}
	if text.NCols != tiff.NCols || text.NRows != tiff.NRows || text.XLL != tiff.XLL || text.YLL != tiff.YLL || text.CellX != tiff.CellX || text.CellY != tiff.CellY {
		t.Errorf("%+v, %+v", text, tiff)
	}
	for r := range text.NRows {
		for c := range text.NCols {
			v, ok := text.At(c, r)
			if w, has := tiff.At(c, r); ok != has || ok && v != w {
				t.Fatalf("column %d, row %d: %g, %t and %g, %t", c, r, v, ok, w, has)
			}
		}
	}
}

func TestHGT(t *testing.T) {
	b := load(t, "hgt/N38W028.hgt.gz")
	g, crs, _, err := Decode(context.Background(), HGT, "N38W028.hgt", b)
	if err != nil || crs != "EPSG:4326" || g.NCols != 1201 || math.Abs(g.XLL+28) > 1e-3 || math.Abs(g.YLL-38) > 1e-3 {
		t.Errorf("%q, %v", crs, err)
	}
	var e *formats.Error
	if _, _, _, err := Decode(context.Background(), HGT, "heights.hgt", b); !errors.As(err, &e) || e.Code != "no_place" {
		t.Errorf("error %v", err)
	}
}

func TestFeetComeInMetres(t *testing.T) {
	plain, _, _, err := Decode(context.Background(), GeoTIFF, "i.tif", load(t, "geotiff/one-strip.tif"))
	if err != nil {
		t.Fatal(err)
	}
	feet, _, notices, err := Decode(context.Background(), GeoTIFF, "f.tif", load(t, "geotiff/feet.tif"))
	if err != nil || len(notices) != 1 || notices[0].Code != "values_to_metres" || notices[0].File != "f.tif" {
		t.Fatal(notices, err)
	}
	v, ok := plain.At(5, 9)
	if w, has := feet.At(5, 9); !ok || !has || w != float32(float64(v)*0.3048) {
		t.Errorf("%g feet are %g", v, w)
	}
}

func TestFaults(t *testing.T) {
	for media, b := range map[string][]byte{ASCIIGrid: []byte("ncols 3\n"), GeoTIFF: []byte("ncols 3\n"), HGT: []byte("ncols 3\n"), "": nil, "text/plain": nil} {
		g, _, _, err := Decode(context.Background(), media, "N38W028.hgt", b)
		var e *formats.Error
		if g != nil || !errors.As(err, &e) || e.File != "N38W028.hgt" || e.Code == "" || e.Do == "" {
			t.Errorf("%q: error %v", media, err)
		}
	}
	stop, cancel := context.WithCancel(context.Background())
	cancel()
	if _, _, _, err := Decode(stop, GeoTIFF, "f.tif", load(t, "geotiff/one-strip.tif")); !errors.Is(err, context.Canceled) {
		t.Errorf("error %v", err)
	}
}

func TestMediaOf(t *testing.T) {
	for name, want := range map[string]string{"a.asc": ASCIIGrid, "A.TIF": GeoTIFF, "a.b.tiff": GeoTIFF, "N38W028.hgt": HGT, "a.png": "", "a": "", "": ""} {
		if got := MediaOf(name); got != want {
			t.Errorf("%q: %q", name, got)
		}
	}
}
