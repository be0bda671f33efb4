package files

import (
	"archive/zip"
	"bytes"
	"context"
	"errors"
	"fmt"
	"io"
	"io/fs"
	"os"
	"path"
	"path/filepath"
	"slices"
	"strings"

	"groundtally/app/store/gpkgin"
	"groundtally/app/study"
	"groundtally/geo"
	"groundtally/geo/formats"
	"groundtally/geo/formats/asciigrid"
	"groundtally/geo/formats/csvtable"
	"groundtally/geo/formats/geojson"
	"groundtally/geo/formats/gridfile"
	"groundtally/geo/formats/shapefile"
	"groundtally/geo/formats/xlsx"
)

// MaxImportBytes is the largest file that is read.
const MaxImportBytes = 8 << 30

// maxWholeBytes is the largest file, or member of an archive, that is read into memory.
const maxWholeBytes = 2 << 30

// Import reads a file of the user as far as that is possible without knowing what it means. A file with
// several tables, sheets or sets asks which one is meant, unless the options say so.
func Import(ctx context.Context, name string, o study.ReadOptions) (study.Import, error) {
	f, err := Open(name, MaxImportBytes)
	if err != nil {
		return study.Import{}, err
	}
	defer func() { _ = f.Close() }() // only read
	src := source{Reader: f, at: f, size: f.Size, kind: f.Kind, file: name, base: filepath.Base(name)}
	return decode(ctx, src, o)
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
	return decode(ctx, source{Reader: f, kind: kind, file: name, base: path.Base(name)}, study.ReadOptions{})
}

// source is where a file is read from.
type source struct {
	io.Reader
	at   io.ReaderAt // nil where it can only be read through
	size int64
	kind Kind
	file string // as given, for messages
	base string // kept in the study
}

// decode picks the reader: one line a format.
func decode(ctx context.Context, src source, o study.ReadOptions) (study.Import, error) {
	in := study.Import{File: src.file, Base: src.base}
	var err error
	switch src.kind {
	case GeoJSON, GeoJSONText:
		err = fromGeoJSON(ctx, src, o, &in)
	case Table:
		err = fromTable(ctx, src, &in)
	case ASCIIGrid:
		err = fromGrid(ctx, src, gridfile.ASCIIGrid, &in)
	case GeoTIFF:
		err = fromGrid(ctx, src, gridfile.GeoTIFF, &in)
	case HGT:
		err = fromGrid(ctx, src, gridfile.HGT, &in)
	case GeoPackage:
		err = fromGeoPackage(ctx, src, o, &in)
	case Shapefile:
		err = fromShapefile(ctx, src, &in)
	case Workbook:
		err = fromWorkbook(ctx, src, o, &in)
	case Zip:
		return fromZip(ctx, src, o)
	default:
		err = &study.FileError{File: src.file, What: fmt.Sprintf("it is of the kind %s, which this version does not read as a layer", src.kind), Cure: "Save it as GeoJSON or GeoPackage and add that"}
	}
	if err != nil {
		return in, readerError(src.file, err)
	}
	for i := range in.Notices {
		in.Notices[i].File = src.base
	}
	return in, nil
}

func fromGeoJSON(ctx context.Context, src source, o study.ReadOptions, in *study.Import) error {
	res, err := geojson.Decode(ctx, src, geojson.Options{File: src.file, IgnoreCRS: o.CRSGiven})
	if err != nil {
		return err
	}
	in.Layer, in.CRS, in.Notices = res.Layer, res.CRS, res.Notices
	in.Ledger = study.Ledger{Read: res.Ledger.Read + res.Ledger.LeftOut, Repaired: res.Ledger.Repaired, LeftOut: res.Ledger.LeftOut}
	return nil
}

func fromTable(ctx context.Context, src source, in *study.Import) error {
	res, err := csvtable.Decode(ctx, src, csvtable.Options{File: src.file})
	if err != nil {
		return err
	}
	in.Layer, in.Notices = res.Layer, res.Notices
	in.Ledger = study.Ledger{Read: res.Ledger.Read}
	for _, p := range res.Positions {
		in.Places = append(in.Places, study.Place{X: p.X, Y: p.Y, Degrees: p.Degrees})
	}
	return nil
}

func fromGrid(ctx context.Context, src source, media string, in *study.Import) error {
	b, err := io.ReadAll(io.LimitReader(src, maxWholeBytes+1))
	if err != nil {
		return fmt.Errorf("read %s: %w", src.file, err)
	}
	if len(b) > maxWholeBytes {
		return &study.FileError{File: src.file, What: "the grid is larger than 2 GB", Cure: "Cut it to the district first"}
	}
	grid, crs, notices, err := gridfile.Decode(ctx, media, src.base, b)
	if err != nil {
		return err
	}
	in.Blob, in.Media, in.CRS, in.Notices = b, media, crs, notices
	in.Corner = &geo.LonLat{Lon: grid.XLL, Lat: grid.YLL}
	in.Ledger = study.Ledger{Read: 1}
	return nil
}

// choose gives the table that is meant, or asks.
func choose(file, what string, names []string, o study.ReadOptions) (string, error) {
	option := "--table NAME"
	if len(names) > 0 {
		option = fmt.Sprintf("--table %q (for one)", names[0])
	}
	switch {
	case o.Table != "" && slices.Contains(names, o.Table):
		return o.Table, nil
	case o.Table != "":
		return "", &study.QuestionError{File: file, Questions: []study.Question{{Text: fmt.Sprintf("there is no %s %q; there are: %s", what, o.Table, strings.Join(names, ", ")), Option: option}}, Tables: names}
	case len(names) == 1:
		return names[0], nil
	}
	return "", &study.QuestionError{File: file, Questions: []study.Question{{Text: fmt.Sprintf("the file holds %d %ss: %s; which one?", len(names), what, strings.Join(names, ", ")), Option: option}}, Tables: names}
}

func fromGeoPackage(ctx context.Context, src source, o study.ReadOptions, in *study.Import) error {
	f, err := gpkgin.Open(ctx, src.file)
	if err != nil {
		return err
	}
	defer func() { _ = f.Close() }() // only read
	if f.Study() {
		return &study.FileError{File: src.file, What: "it is a study, and its tables are the program's own", Cure: "Write the layer out of it, with gtally export " + src.base + " LAYER --to FILE or from its window, and take that file"}
	}
	var names []string
	for _, t := range f.Tables() {
		names = append(names, t.Name)
	}
	name, err := choose(src.file, "table", names, o)
	if err != nil {
		return err
	}
	res, err := f.Read(ctx, name, gpkgin.Options{File: src.file})
	if err != nil {
		return err
	}
	in.Layer, in.CRS, in.Table = res.Layer, res.CRS, name
	in.Notices = append(f.Notices(), res.Notices...)
	in.Ledger = study.Ledger{Read: res.Ledger.Read + res.Ledger.LeftOut, Repaired: res.Ledger.Repaired, LeftOut: res.Ledger.LeftOut}
	return nil
}

// fromShapefile reads the set of a .shp: the files beside it with its name.
func fromShapefile(ctx context.Context, src source, in *study.Import) error {
	dir := filepath.Dir(src.file)
	entries, err := os.ReadDir(dir)
	if err != nil {
		return system(dir, "read", err)
	}
	var names []string
	for _, e := range entries {
		names = append(names, e.Name())
	}
	for _, m := range shapefile.Members(names) {
		if m.SHP != filepath.Base(src.file) {
			continue
		}
		var set shapefile.Set
		for _, part := range []struct {
			name string
			to   **shapefile.Part
		}{{m.SHP, &set.SHP}, {m.DBF, &set.DBF}, {m.SHX, &set.SHX}, {m.PRJ, &set.PRJ}, {m.CPG, &set.CPG}} {
			if part.name == "" {
				continue
			}
			f, err := os.Open(filepath.Join(dir, part.name))
			if err != nil {
				return system(filepath.Join(dir, part.name), "read", err)
			}
			defer func() { _ = f.Close() }() // only read
			info, err := f.Stat()
			if err != nil {
				return system(filepath.Join(dir, part.name), "read", err)
			}
			*part.to = &shapefile.Part{ReaderAt: f, Size: info.Size()}
		}
		return fromSet(ctx, set, src.file, in)
	}
	return &study.FileError{File: src.file, What: "the file is not in its folder any longer", Cure: "Choose it again"}
}

func fromSet(ctx context.Context, set shapefile.Set, file string, in *study.Import) error {
	res, err := shapefile.Decode(ctx, set, shapefile.Options{File: file})
	if err != nil {
		return err
	}
	in.Layer, in.CRS, in.Notices = res.Layer, res.CRS, res.Notices
	in.Ledger = study.Ledger{Read: res.Ledger.Read + res.Ledger.LeftOut, Repaired: res.Ledger.Repaired, LeftOut: res.Ledger.LeftOut}
	return nil
}

func fromWorkbook(ctx context.Context, src source, o study.ReadOptions, in *study.Import) error {
	names, err := xlsx.Sheets(src.at, src.size, xlsx.Options{File: src.file})
	if err != nil {
		return err
	}
	name, err := choose(src.file, "sheet", names, o)
	if err != nil {
		return err
	}
	res, err := xlsx.Decode(ctx, src.at, src.size, xlsx.Options{File: src.file, Sheet: name})
	if err != nil {
		return err
	}
	in.Layer, in.Notices, in.Table = res.Layer, res.Notices, name
	in.Ledger = study.Ledger{Read: res.Ledger.Read}
	for _, p := range csvtable.Places(res.Layer) {
		in.Places = append(in.Places, study.Place{X: p.X, Y: p.Y, Degrees: p.Degrees})
	}
	return nil
}

// fromZip reads one layer of an archive: a set of a shapefile, or a file of a kind that can be read alone.
func fromZip(ctx context.Context, src source, o study.ReadOptions) (study.Import, error) {
	in := study.Import{File: src.file, Base: src.base}
	z, err := zip.NewReader(src.at, src.size)
	if err != nil {
		return in, readerError(src.file, &study.FileError{File: src.file, What: "it is no whole archive: " + err.Error(), Cure: "Download or copy it again"})
	}
	members := map[string]*zip.File{}
	var all, names []string
	for _, f := range z.File {
		if !f.FileInfo().IsDir() {
			members[f.Name] = f
			all = append(all, f.Name)
		}
	}
	sets := map[string]shapefile.Names{}
	for _, m := range shapefile.Members(all) {
		sets[m.Base] = m
		names = append(names, m.Base)
	}
	alone := map[string]Kind{".geojson": GeoJSON, ".json": GeoJSON, ".geojsonl": GeoJSONText, ".geojsons": GeoJSONText, ".csv": Table, ".asc": ASCIIGrid, ".tif": GeoTIFF, ".tiff": GeoTIFF, ".hgt": HGT}
	for _, n := range all {
		if _, ok := alone[strings.ToLower(path.Ext(n))]; ok && !strings.HasPrefix(path.Base(n), "._") {
			names = append(names, n)
		}
	}
	slices.Sort(names)
	if len(names) == 0 {
		return in, &study.FileError{File: src.file, What: "the archive holds nothing that can be read", Cure: "It may hold shapefile sets, GeoJSON, CSV, GeoTIFF, ASCII grids or HGT; unpack others first"}
	}
	name, err := choose(src.file, "layer", names, o)
	if err != nil {
		return in, err
	}
	read := func(member string) (*bytes.Reader, error) {
		f := members[member]
		if f.UncompressedSize64 > maxWholeBytes {
			return nil, &study.FileError{File: src.file, Where: member, What: "it is larger than 2 GB", Cure: "Unpack it and add the file itself"}
		}
		r, err := f.Open()
		if err != nil {
			return nil, damaged(src.file, member, err)
		}
		defer func() { _ = r.Close() }() // only read
		// No more than the archive says, so that a small file cannot fill the memory.
		b, err := io.ReadAll(io.LimitReader(r, int64(f.UncompressedSize64)+1))
		if err != nil || uint64(len(b)) != f.UncompressedSize64 {
			return nil, damaged(src.file, member, err)
		}
		return bytes.NewReader(b), nil
	}
	if m, ok := sets[name]; ok {
		var set shapefile.Set
		for _, part := range []struct {
			name string
			to   **shapefile.Part
		}{{m.SHP, &set.SHP}, {m.DBF, &set.DBF}, {m.SHX, &set.SHX}, {m.PRJ, &set.PRJ}, {m.CPG, &set.CPG}} {
			if part.name == "" {
				continue
			}
			r, err := read(part.name)
			if err != nil {
				return in, err
			}
			*part.to = &shapefile.Part{ReaderAt: r, Size: r.Size()}
		}
		if err := fromSet(ctx, set, src.file, &in); err != nil {
			return in, readerError(src.file, err)
		}
	} else {
		r, err := read(name)
		if err != nil {
			return in, err
		}
		member := source{Reader: r, at: r, size: r.Size(), kind: alone[strings.ToLower(path.Ext(name))], file: src.file, base: path.Base(name)}
		if in, err = decode(ctx, member, study.ReadOptions{CRSGiven: o.CRSGiven}); err != nil {
			return in, err
		}
	}
	in.Table = name
	for i := range in.Notices {
		in.Notices[i].File = src.base
	}
	return in, nil
}

func damaged(file, member string, err error) error {
	what := "it is not as long as the archive says"
	if err != nil {
		what = "it cannot be unpacked: " + err.Error()
	}
	return &study.FileError{File: file, Where: member, What: what, Cure: "Download or copy the archive again"}
}

// readerError turns a reader's error into one that names the file and the cure; a stop by the user, a question
// and what is plain already stay what they are.
func readerError(file string, err error) error {
	var plain *study.FileError
	var question *study.QuestionError
	if errors.Is(err, context.Canceled) || errors.Is(err, context.DeadlineExceeded) || errors.As(err, &plain) || errors.As(err, &question) {
		return err
	}
	var g *geojson.Error
	var c *csvtable.Error
	var a *asciigrid.Error
	var f *formats.Error
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
	case errors.As(err, &f):
		out.Where, out.What, out.Cure = f.Where, f.What, f.Do
		if f.Err != nil {
			out.What += ": " + f.Err.Error()
		}
	}
	return out
}
