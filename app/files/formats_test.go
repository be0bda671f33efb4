package files

import (
	"archive/zip"
	"context"
	"errors"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"testing"

	"groundtally/app/study"
)

const fixtures = "../../testdata/formats/"

// zipped puts files into an archive under names of its own.
func zipped(t *testing.T, names map[string]string) string {
	t.Helper()
	path := filepath.Join(t.TempDir(), "delivery.zip")
	f, err := os.Create(path)
	if err != nil {
		t.Fatal(err)
	}
	z := zip.NewWriter(f)
	for _, name := range sorted(names) {
		w, err := z.Create(name)
		if err != nil {
			t.Fatal(err)
		}
		b, err := os.ReadFile(names[name])
		if err != nil {
			t.Fatal(err)
		}
		if _, err := w.Write(b); err != nil {
			t.Fatal(err)
		}
	}
	if err := errors.Join(z.Close(), f.Close()); err != nil {
		t.Fatal(err)
	}
	return path
}

func sorted(m map[string]string) []string {
	var out []string
	for k := range m {
		out = append(out, k)
	}
	slices.Sort(out)
	return out
}

// Grids of every kind come in whole, with their place.
func TestGridsAreImported(t *testing.T) {
	for name, crs := range map[string]string{"geotiff/float32-def3-strips-ii.tif": "EPSG:", "geotiff/degrees.tif": "EPSG:4326", "geotiff/int16-lzw2-tiles-ii.tif": "EPSG:"} {
		in, err := Import(context.Background(), fixtures+name, study.ReadOptions{})
		if err != nil || in.Layer != nil || len(in.Blob) == 0 || in.Media != "image/tiff" || in.Corner == nil || !strings.HasPrefix(in.CRS, crs) {
			t.Errorf("%s: %v, %d bytes of %s in %q", name, err, len(in.Blob), in.Media, in.CRS)
		}
	}
	for _, name := range []string{"geotiff/refused-zstd.tif", "geotiff/refused-picture.tif", "geotiff/refused-no-place.tif"} {
		_, err := Import(context.Background(), fixtures+name, study.ReadOptions{})
		var fe *study.FileError
		if !errors.As(err, &fe) || fe.Cure == "" || !strings.Contains(err.Error(), name) {
			t.Errorf("%s: %v", name, err)
		}
	}
}

// An archive holds sets and files; which one is meant is asked, and each comes in as it does outside.
func TestArchives(t *testing.T) {
	sets, err := filepath.Glob(fixtures + "shapefile/*.shp")
	if err != nil || len(sets) < 3 {
		t.Fatal(sets, err)
	}
	names := map[string]string{}
	base := strings.TrimSuffix(sets[0], ".shp")
	for _, ending := range []string{".shp", ".dbf", ".shx", ".prj", ".cpg"} {
		if _, err := os.Stat(base + ending); err == nil {
			names["data/first"+ending] = base + ending
		}
	}
	alone, err := Import(context.Background(), sets[0], study.ReadOptions{})
	if err != nil {
		t.Fatal(err)
	}
	in, err := Import(context.Background(), zipped(t, names), study.ReadOptions{})
	if err != nil || len(in.Layer.Features) != len(alone.Layer.Features) || in.CRS != alone.CRS || in.Table != "data/first" {
		t.Errorf("%v: %+v", err, in.Ledger)
	}
	names["grid.tif"] = fixtures + "geotiff/degrees.tif"
	path := zipped(t, names)
	var q *study.QuestionError
	if _, err := Import(context.Background(), path, study.ReadOptions{}); !errors.As(err, &q) || len(q.Tables) != 2 {
		t.Fatalf("error %v", err)
	}
	for _, table := range q.Tables {
		if in, err := Import(context.Background(), path, study.ReadOptions{Table: table}); err != nil || in.Table != table {
			t.Errorf("%s: %v", table, err)
		}
	}
	if _, err := Import(context.Background(), zipped(t, map[string]string{"readme.txt": fixtures + "geotiff/README.md"}), study.ReadOptions{}); err == nil || !strings.Contains(err.Error(), "nothing that can be read") {
		t.Errorf("error %v", err)
	}
	b, err := os.ReadFile(path)
	if err != nil {
		t.Fatal(err)
	}
	cut := put(t, t.TempDir(), "cut.zip", string(b[:len(b)/2]))
	if _, err := Import(context.Background(), cut, study.ReadOptions{}); err == nil || !strings.Contains(err.Error(), "no whole archive") {
		t.Errorf("error %v", err)
	}
}

// A GeoPackage with several tables asks which; its coordinate system goes with each.
func TestGeoPackages(t *testing.T) {
	files, err := filepath.Glob(fixtures + "gpkg/*.gpkg")
	if err != nil || len(files) == 0 {
		t.Fatal(files, err)
	}
	several, tables := 0, 0
	for _, f := range files {
		_, err := Import(context.Background(), f, study.ReadOptions{})
		var q *study.QuestionError
		if !errors.As(err, &q) {
			continue // one table, or one of the hostile files, whose reader has tests of its own
		}
		several++
		for _, name := range q.Tables {
			if in, err := Import(context.Background(), f, study.ReadOptions{Table: name}); err == nil {
				tables++
				if in.Table != name || in.Layer == nil {
					t.Errorf("%s, %s: %+v", f, name, in.Ledger)
				}
			}
		}
	}
	if several == 0 || tables < 3 {
		t.Errorf("%d files with several tables, %d tables read", several, tables)
	}
}

func TestWorkbooks(t *testing.T) {
	files, err := filepath.Glob(fixtures + "xlsx/*.xlsx")
	if err != nil || len(files) == 0 {
		t.Fatal(files, err)
	}
	read := 0
	for _, f := range files {
		in, err := Import(context.Background(), f, study.ReadOptions{})
		var q *study.QuestionError
		if errors.As(err, &q) {
			in, err = Import(context.Background(), f, study.ReadOptions{Table: q.Tables[0]})
		}
		if err == nil && len(in.Layer.Features) > 0 {
			read++
		}
	}
	if read == 0 {
		t.Error("no workbook was read")
	}
}
