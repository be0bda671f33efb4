package files

import (
	"bytes"
	"context"
	"errors"
	"fmt"
	"io"
	"io/fs"
	"path"
	"path/filepath"

	"groundtally/app/study"
	"groundtally/geo/formats/asciigrid"
	"groundtally/geo/formats/csvtable"
	"groundtally/geo/formats/geojson"
)

// ASCIIGridMedia is the media type under which a study keeps an ASCII grid whole.
const ASCIIGridMedia = "text/x-ascii-grid"

// MaxImportBytes is the largest file that is read.
const MaxImportBytes = 8 << 30

// Import reads a file of the user as far as that is possible without knowing what it means. With crsGiven
// a coordinate system that the file states badly is passed over, because the user has named it.
func Import(ctx context.Context, name string, crsGiven bool) (study.Import, error) {
	f, err := Open(name, MaxImportBytes)
	if err != nil {
		return study.Import{}, err
	}
	defer func() { _ = f.Close() }() // only read
	return decode(ctx, f, f.Kind, name, filepath.Base(name), crsGiven)
}

// ImportFS reads a file of a file system, as of the sample district. The kind follows from the name.
func ImportFS(ctx context.Context, fsys fs.FS, name string) (study.Import, error) {
	f, err := fsys.Open(name)
	if err != nil {
		return study.Import{}, err
	}
	defer f.Close()
	kinds := map[string]Kind{".geojson": GeoJSON, ".csv": Table, ".asc": ASCIIGrid}
	kind, ok := kinds[path.Ext(name)]
	if !ok {
		return study.Import{}, &study.FileError{File: name, What: "the kind of the file cannot be told from its name"}
	}
	return decode(ctx, f, kind, name, path.Base(name), false)
}

// decode picks the reader: one line a format.
func decode(ctx context.Context, r io.Reader, kind Kind, file, base string, crsGiven bool) (study.Import, error) {
	in := study.Import{File: file, Base: base}
	switch kind {
	case GeoJSON, GeoJSONText:
		res, err := geojson.Decode(ctx, r, geojson.Options{File: file, IgnoreCRS: crsGiven})
		if err != nil {
			return in, readerError(file, err)
		}
		in.Layer, in.CRS, in.Notices = res.Layer, res.CRS, res.Notices
		in.Ledger = study.Ledger{Read: res.Ledger.Read + res.Ledger.LeftOut, Repaired: res.Ledger.Repaired, LeftOut: res.Ledger.LeftOut}
	case Table:
		res, err := csvtable.Decode(ctx, r, csvtable.Options{File: file})
		if err != nil {
			return in, readerError(file, err)
		}
		in.Layer, in.Notices = res.Layer, res.Notices
		in.Ledger = study.Ledger{Read: res.Ledger.Read}
	case ASCIIGrid:
		b, err := io.ReadAll(r)
		if err != nil {
			return in, fmt.Errorf("read %s: %w", file, err)
		}
		res, err := asciigrid.Decode(ctx, bytes.NewReader(b), asciigrid.Options{File: file})
		if err != nil {
			return in, readerError(file, err)
		}
		in.Blob, in.Media, in.Notices = b, ASCIIGridMedia, res.Notices
		in.Ledger = study.Ledger{Read: 1}
	default:
		return in, &study.FileError{File: file, What: fmt.Sprintf("it is of the kind %s, which this version does not read as a layer", kind), Cure: "Save it as GeoJSON and add that"}
	}
	for i := range in.Notices {
		in.Notices[i].File = base
	}
	return in, nil
}

// readerError turns a reader's error into one that names the file and the cure; a stop by the user stays what
// it is.
func readerError(file string, err error) error {
	if errors.Is(err, context.Canceled) || errors.Is(err, context.DeadlineExceeded) {
		return err
	}
	var g *geojson.Error
	var c *csvtable.Error
	var a *asciigrid.Error
	out := &Error{FileError: study.FileError{File: file, What: err.Error()}, Err: err}
	switch {
	case errors.As(err, &g):
		out.What, out.Cure = g.What, g.Do
		if g.Feature > 0 {
			out.Where = fmt.Sprintf("feature %d, byte %d", g.Feature, g.Offset)
		} else {
			out.Where = fmt.Sprintf("byte %d", g.Offset)
		}
	case errors.As(err, &c):
		out.What, out.Cure = c.What, c.Do
		if c.Line > 0 {
			out.Where = fmt.Sprintf("line %d", c.Line)
		}
		if c.Column != "" {
			out.Where += ", column " + c.Column
		}
	case errors.As(err, &a):
		out.What, out.Cure = a.What, a.Do
		if a.Line > 0 {
			out.Where = fmt.Sprintf("line %d", a.Line)
		}
	}
	return out
}
