package files

import (
	"context"
	"errors"
	"fmt"
	"io"
	"os"
	"path/filepath"
	"strings"

	"groundtally/app/study"
	"groundtally/geo"
	"groundtally/geo/formats/geotiff"
	"groundtally/geo/formats/worldfile"
)

// MaxPictureBytes is the largest picture that is kept in a study. A study with one can still be copied and
// sent; an aerial picture of a district in JPEG has a few tens of megabytes.
const MaxPictureBytes = 256 << 20

// ImportPicture reads a picture as it stands, with the place that it or a world file beside it says. Ok is
// false for a file that is no picture, which Import reads: a TIFF of values for one.
func ImportPicture(ctx context.Context, path string) (in study.Import, ok bool, err error) {
	info, err := os.Stat(path)
	if err != nil || !info.Mode().IsRegular() || info.Size() < 8 {
		return in, false, nil // Import says what is wrong with it
	}
	f, err := os.Open(path)
	if err != nil {
		return in, false, nil
	}
	defer func() { _ = f.Close() }() // only read
	head := make([]byte, 8)
	if _, err := f.ReadAt(head, 0); err != nil {
		return in, true, system(path, "read", err)
	}
	beside, names, err := worldBeside(path)
	if err != nil {
		return in, true, err
	}
	switch {
	case string(head) == "\x89PNG\r\n\x1a\n", string(head[:3]) == "\xff\xd8\xff":
	case string(head[:2]) == "II" || string(head[:2]) == "MM":
		h, err := geotiff.Info(f, info.Size(), geotiff.Options{File: path})
		// Values of one byte may be a grey picture, and the study is told which by the role. Without a place
		// of its own, or in a form that is not read as a grid, such a file can only be a picture.
		if err != nil || h.Kind != geotiff.Picture && (h.Sample != "Byte" || h.Refused == nil && (h.Placed || beside == "")) {
			return in, false, nil
		}
	default:
		return in, false, nil
	}
	if info.Size() > MaxPictureBytes {
		return in, true, refuse(path, fmt.Sprintf("the picture has %d MB, at most %d are kept in a study", info.Size()>>20, MaxPictureBytes>>20), "Cut it to the district, or save it as JPEG")
	}
	if err := ctx.Err(); err != nil {
		return in, true, err
	}
	look, err := worldfile.Look(f, info.Size(), worldfile.Options{})
	if err != nil {
		return in, true, readerError(path, err)
	}
	if !look.Placed {
		if beside == "" {
			return in, true, refuse(path, "the picture does not say where it lies, and no world file stands beside it", fmt.Sprintf("Put the world file %s into the same folder; the program that made the map exports it with the picture", orOf(names)))
		}
		w, err := os.Open(beside)
		if err != nil {
			return in, true, system(beside, "read", err)
		}
		world, err := worldfile.Decode(w)
		_ = w.Close() // only read
		if err != nil {
			return in, true, readerError(beside, err)
		}
		look.World = world
	}
	blob, err := io.ReadAll(io.NewSectionReader(f, 0, info.Size()))
	if err != nil {
		return in, true, system(path, "read", err)
	}
	in = study.Import{File: path, Base: filepath.Base(path), Blob: blob, Media: look.Media(), CRS: look.CRS, Ledger: study.Ledger{Read: 1}}
	x, y := look.World.At(0, float64(look.Height))
	in.Corner = &geo.LonLat{Lon: x, Lat: y}
	return in, true, nil
}

// worldBeside finds the world file beside a picture, whatever the case of its letters, and gives the names
// that it may have.
func worldBeside(path string) (file string, names []string, err error) {
	dir := filepath.Dir(path)
	names = worldfile.Names(filepath.Base(path))
	entries, err := os.ReadDir(dir)
	if err != nil && !errors.Is(err, os.ErrPermission) {
		return "", names, system(dir, "read", err)
	}
	for _, n := range names {
		for _, e := range entries {
			if !e.IsDir() && strings.EqualFold(e.Name(), n) {
				return filepath.Join(dir, e.Name()), names, nil
			}
		}
	}
	return "", names, nil
}

// orOf joins names with or.
func orOf(names []string) string {
	if len(names) == 0 {
		return "of the picture's name with the ending .wld"
	}
	if len(names) == 1 {
		return names[0]
	}
	return strings.Join(names[:len(names)-1], ", ") + " or " + names[len(names)-1]
}
