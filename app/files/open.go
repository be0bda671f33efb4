package files

import (
	"bytes"
	"encoding/binary"
	"errors"
	"fmt"
	"io"
	"io/fs"
	"os"
	"path/filepath"
	"strings"
	"syscall"
	"unicode/utf8"

	"groundtally/app/study"
)

// Kind is what a file is.
type Kind string

// The kinds that some reader of the program may use.
const (
	GeoJSON     Kind = "geojson"  // a collection, a feature or a geometry
	GeoJSONText Kind = "geojsonl" // a text sequence, or a record on each line
	Table       Kind = "csv"      // delimited text
	ASCIIGrid   Kind = "asc"      // header of ncols and nrows, then values
	GeoPackage  Kind = "gpkg"     // a study is one too
	Shapefile   Kind = "shp"      // the .shp of a set
	GeoTIFF     Kind = "tif"      // any TIFF
	HGT         Kind = "hgt"      // known by its name and size alone
	Workbook    Kind = "xlsx"     // sheets of a workbook
	Zip         Kind = "zip"      // an archive that may hold a set of files
)

// Error says what is wrong with a file and what the user can do. It unwraps to a *study.FileError and
// to what the system reported.
type Error struct {
	study.FileError
	Err error // nil when the system reported nothing
}

func (e *Error) Error() string { return e.FileError.Error() }

// Unwrap gives the plain error and its cause.
func (e *Error) Unwrap() []error {
	out := []error{&e.FileError}
	if e.Err != nil {
		out = append(out, e.Err)
	}
	return out
}

func refuse(path, what, cure string) *Error {
	return &Error{FileError: study.FileError{File: path, What: what, Cure: cure}}
}

// system turns an error of the operating system into one with a cure.
func system(path, doing string, err error) error {
	if err == nil {
		return nil
	}
	var done *Error
	if errors.As(err, &done) {
		return err
	}
	e := refuse(path, fmt.Sprintf("it cannot be %s: %v", doing, plain(err)), "")
	e.Err = err
	switch {
	case errors.Is(err, fs.ErrNotExist):
		e.What, e.Cure, e.Err = "there is no such file or folder", "Check the name", errors.Join(study.ErrNotThere, err)
	case errors.Is(err, fs.ErrExist):
		e.What, e.Cure, e.Err = "there is a file of this name already", "Choose another name", errors.Join(study.ErrNameInUse, err)
	case doing == "read" && errors.Is(err, fs.ErrPermission):
		// No study.ErrReadOnly: what was asked for is a right to read, of the user's file.
		e.What, e.Cure = "you have no right to read it", "Change its permissions or its folder's, or have somebody who may read it make you a copy"
	case errors.Is(err, fs.ErrPermission), errors.Is(err, syscall.EROFS):
		e.What, e.Cure, e.Err = "you have no right to have it "+doing, "Change its permissions, or choose another folder", errors.Join(study.ErrReadOnly, err)
	case errors.Is(err, syscall.ENOSPC), errors.Is(err, syscall.EFBIG):
		e.What, e.Cure, e.Err = "the disk is full", "Free some space, or choose another disk; what was there before is unharmed", errors.Join(study.ErrDiskFull, err)
	}
	return e
}

// plain leaves the path out of a system error, since it is named already.
func plain(err error) error {
	var p *fs.PathError
	if errors.As(err, &p) {
		return p.Err
	}
	return err
}

// Input is an open file.
type Input struct {
	Path string
	Kind Kind
	Size int64
	f    *os.File
	r    io.Reader
}

// Read reads on. It gives an error where the file grows beyond its size while it is read.
func (in *Input) Read(p []byte) (int, error) { return in.r.Read(p) }

// ReadAt reads at an offset.
func (in *Input) ReadAt(p []byte, off int64) (int, error) { return in.f.ReadAt(p, off) }

// Close closes the file.
func (in *Input) Close() error { return in.f.Close() }

const headBytes = 64 << 10

// Open opens a file for reading, from its beginning. A file larger than maxBytes, an empty one, a
// folder, a device and any kind that no reader can use give an *Error.
func Open(path string, maxBytes int64) (*Input, error) {
	// Looked at before it is opened: opening a pipe would wait for somebody to write into it.
	info, err := os.Stat(path)
	if err != nil {
		return nil, system(path, "read", err)
	}
	switch {
	case info.IsDir():
		return nil, refuse(path, "it is a folder", "Choose a file in it")
	case !info.Mode().IsRegular():
		return nil, refuse(path, "it is not an ordinary file", "Copy what it gives into a file first")
	case info.Size() == 0:
		return nil, refuse(path, "the file is empty", "Download or export it again")
	case info.Size() > maxBytes:
		return nil, refuse(path, fmt.Sprintf("it has %d bytes, at most %d can be read", info.Size(), maxBytes), "Cut it to the district first, or split it")
	}
	f, err := os.Open(path)
	if err != nil {
		return nil, system(path, "read", err)
	}
	in, err := begin(path, f, info.Size())
	if err != nil {
		return nil, errors.Join(err, f.Close())
	}
	return in, nil
}

func begin(path string, f *os.File, size int64) (*Input, error) {
	head := make([]byte, min(size, headBytes))
	n, err := f.ReadAt(head, 0)
	if err != nil && !errors.Is(err, io.EOF) {
		return nil, system(path, "read", err)
	}
	kind, err := sniff(path, head[:n], size)
	if err != nil {
		return nil, err
	}
	return &Input{Path: path, Kind: kind, Size: size, f: f, r: &counted{path: path, r: f, left: size}}, nil
}

// counted stops a file that grows while it is read.
type counted struct {
	path string
	r    io.Reader
	left int64
}

func (c *counted) Read(p []byte) (int, error) {
	n, err := c.r.Read(p)
	if c.left -= int64(n); c.left < 0 {
		return 0, refuse(c.path, "it grew while it was read", "Wait until the other program has written it")
	}
	if err != nil && !errors.Is(err, io.EOF) {
		err = system(c.path, "read", err)
	}
	return n, err
}

// Sniff tells the kind of a file without keeping it open.
func Sniff(path string) (Kind, error) {
	in, err := Open(path, 1<<62)
	if err != nil {
		return "", err
	}
	return in.Kind, in.Close()
}

var magic = []struct {
	head string
	kind Kind
	what string // why it is refused
	cure string
}{
	{"II*\x00", GeoTIFF, "", ""}, {"MM\x00*", GeoTIFF, "", ""}, {"II+\x00", GeoTIFF, "", ""}, {"MM\x00+", GeoTIFF, "", ""},
	{"\x00\x00\x27\x0a", Shapefile, "", ""},
	{"\x1f\x8b", "", "it is compressed with gzip", "Unpack it first"},
	{"7z\xbc\xaf\x27\x1c", "", "it is a 7z archive", "Unpack it first"},
	{"Rar!", "", "it is a RAR archive", "Unpack it first"},
	{"%PDF", "", "it is a PDF", "Ask its publisher for the data behind it"},
	{"\x89PNG", "", "it is a picture", "Ask its publisher for the data behind it"},
	{"\xff\xd8\xff", "", "it is a picture", "Ask its publisher for the data behind it"},
	{"\xd0\xcf\x11\xe0", "", "it is a workbook or document in an old form", "Save the table as CSV"},
	{"\xff\xfe", "", "it is text in UTF-16", "Save it as UTF-8"},
	{"\xfe\xff", "", "it is text in UTF-16", "Save it as UTF-8"},
}

func sniff(path string, head []byte, size int64) (Kind, error) {
	ext := strings.ToLower(filepath.Ext(path))
	switch ext {
	case ".hgt":
		return HGT, nil
	case ".shx", ".dbf", ".prj", ".cpg":
		return "", refuse(path, "it is one of the side files of a shapefile", "Choose the .shp that lies beside it")
	}
	if bytes.HasPrefix(head, []byte("SQLite format 3\x00")) {
		return database(path, head)
	}
	if bytes.HasPrefix(head, []byte("PK\x03\x04")) {
		switch ext {
		case ".xlsx", ".xlsm":
			return Workbook, nil
		case ".ods", ".docx", ".odt":
			return "", refuse(path, "it is a workbook or document", "Save the table as .xlsx or CSV")
		}
		return Zip, nil
	}
	for _, m := range magic {
		if !bytes.HasPrefix(head, []byte(m.head)) {
			continue
		}
		if m.kind == "" {
			return "", refuse(path, m.what, m.cure)
		}
		return m.kind, nil
	}
	return text(path, ext, head, size)
}

// database tells a GeoPackage from another SQLite file by the application number at byte 68.
func database(path string, head []byte) (Kind, error) {
	const at, size = 68, 100
	if len(head) < size {
		return "", refuse(path, "the file is cut short", "Copy or download it again")
	}
	switch id := binary.BigEndian.Uint32(head[at:]); id {
	case 0x47504B47, 0x47503130, 0x47503131, 0x47503132: // GPKG, GP10, GP11, GP12
		return GeoPackage, nil
	}
	if strings.EqualFold(filepath.Ext(path), ".gpkg") { // some programs forget the number
		return GeoPackage, nil
	}
	return "", refuse(path, "it is a database, but not a GeoPackage", "Export the layer as GeoPackage or GeoJSON")
}

func text(path, ext string, head []byte, size int64) (Kind, error) {
	body := bytes.TrimPrefix(head, []byte("\xef\xbb\xbf"))
	body = bytes.TrimLeft(body, " \t\r\n")
	switch {
	case len(body) == 0 && int64(len(head)) == size:
		return "", refuse(path, "the file holds only blanks", "Download or export it again")
	case bytes.IndexByte(body, 0) >= 0:
		return "", refuse(path, "its form is not known", "Export it as GeoPackage, GeoJSON or CSV")
	case len(body) > 0 && body[0] == 0x1e:
		return GeoJSONText, nil
	case len(body) > 0 && body[0] == '{':
		if ext == ".geojsonl" || ext == ".geojsons" || ext == ".ndjson" || ext == ".jsonl" {
			return GeoJSONText, nil
		}
		return GeoJSON, nil
	case len(body) > 0 && body[0] == '[' && (ext == ".json" || ext == ".geojson"):
		return GeoJSON, nil // its reader says what is wrong with it
	case len(body) > 0 && body[0] == '<':
		low := bytes.ToLower(body[:min(len(body), 2000)])
		switch {
		case bytes.Contains(low, []byte("<html")), bytes.Contains(low, []byte("<!doctype html")):
			return "", refuse(path, "it is a web page", "The server may have sent an error page: download the file again")
		case bytes.Contains(low, []byte("<kml")):
			return "", refuse(path, "it is KML", "Export it as GeoPackage or GeoJSON")
		case bytes.Contains(low, []byte("opengis.net/gml")):
			return "", refuse(path, "it is GML", "Export it as GeoPackage or GeoJSON")
		}
		return "", refuse(path, "it is XML", "Export it as GeoPackage or GeoJSON")
	}
	if first, _, _ := bytes.Cut(body, []byte("\n")); gridKey(first) {
		return ASCIIGrid, nil
	}
	switch ext {
	case ".csv", ".tsv", ".txt", ".tab":
		return Table, nil
	case ".json", ".geojson":
		return "", refuse(path, "the name says GeoJSON, but it is not JSON", "Download or export it again")
	case ".asc":
		return "", refuse(path, "the name says ASCII grid, but it has no header of one", "Export it again as an ASCII grid")
	}
	if line, _, whole := bytes.Cut(body, []byte("\n")); whole && utf8.Valid(line) && bytes.ContainsAny(line, ",;\t|") {
		return Table, nil
	}
	return "", refuse(path, "its form is not known", "Export it as GeoPackage, GeoJSON or CSV")
}

// gridKey tells whether a line begins with a key of an ASCII grid and a number.
func gridKey(line []byte) bool {
	words := strings.Fields(strings.ToLower(string(line)))
	if len(words) < 2 {
		return false
	}
	switch words[0] {
	case "ncols", "nrows", "xllcorner", "yllcorner", "xllcenter", "yllcenter", "cellsize", "dx", "dy", "nodata_value":
		c := words[1][0]
		return c >= '0' && c <= '9' || c == '-' || c == '+' || c == '.' || words[1] == "nan"
	}
	return false
}
