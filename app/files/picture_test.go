package files

import (
	"context"
	"errors"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"groundtally/app/study"
)

// A picture comes in as it stands with its place, whatever says it; other files are left to Import.
func TestPicturesAreImported(t *testing.T) {
	const world = `world="25 0 0 -25 500012.5 5316862.5"`
	for name, want := range map[string]struct{ media, crs string }{
		"rgb.png":            {"image/png; " + world, ""},
		"rgb.jpg":            {"image/jpeg; " + world, ""},
		"rgb.tif":            {"image/tiff; " + world, "EPSG:25832"},
		"rgba-deflate.tif":   {"image/tiff; " + world, "EPSG:25832"},
		"grey.tif":           {"image/tiff; " + world, "EPSG:25832"}, // in a compression that is not read as a grid
		"refused-jpeg.tif":   {"", "JPEG compression is not read in a TIFF picture"},
		"refused-big.tif":    {"", "big TIFF"},
		"../../formats":      {},
		"README.md":          {},
		"nothing.png":        {},
		"../hgt/README.md":   {},
		"refused-values.tif": {},
	} {
		in, ok, err := ImportPicture(context.Background(), fixtures+"worldfile/"+name)
		switch {
		case want.media != "":
			b, rerr := os.ReadFile(fixtures + "worldfile/" + name)
			if err != nil || rerr != nil || !ok || in.Media != want.media || in.CRS != want.crs || string(in.Blob) != string(b) || !in.Picture() || in.Layer != nil {
				t.Errorf("%s: %t, %v, %s in %q", name, ok, err, in.Media, in.CRS)
			}
		case want.crs != "":
			if err == nil || !ok || !strings.Contains(err.Error(), want.crs) {
				t.Errorf("%s: %t, %v", name, ok, err)
			}
		case ok || err != nil:
			t.Errorf("%s: %t, %v", name, ok, err)
		}
	}
}

// A world file is found whatever the case of its name; without one the error names those that are looked for.
func TestWorldFileBeside(t *testing.T) {
	b, err := os.ReadFile(fixtures + "worldfile/rgb.png")
	if err != nil {
		t.Fatal(err)
	}
	dir := t.TempDir()
	path := filepath.Join(dir, "plan.png")
	if err := os.WriteFile(path, b, 0o600); err != nil {
		t.Fatal(err)
	}
	_, ok, err := ImportPicture(context.Background(), path)
	var file *study.FileError
	if !ok || !errors.As(err, &file) || !strings.Contains(file.Cure, "plan.pgw, plan.pngw or plan.wld") {
		t.Errorf("%t, %v", ok, err)
	}
	if err := os.WriteFile(filepath.Join(dir, "Plan.PGW"), []byte("2\n0\n0\n-2\n10\n20\n"), 0o600); err != nil {
		t.Fatal(err)
	}
	in, ok, err := ImportPicture(context.Background(), path)
	if !ok || err != nil || in.Media != `image/png; world="2 0 0 -2 10 20"` {
		t.Errorf("%t, %v, %s", ok, err, in.Media)
	}
	big := filepath.Join(dir, "big.png")
	if err := os.WriteFile(big, b, 0o600); err != nil {
		t.Fatal(err)
	}
	if err := os.Truncate(big, MaxPictureBytes+1); err != nil {
		t.Fatal(err)
	}
	if _, ok, err := ImportPicture(context.Background(), big); !ok || err == nil || !strings.Contains(err.Error(), "at most 256") {
		t.Errorf("%t, %v", ok, err)
	}
}
