package files

import (
	"bytes"
	"errors"
	"fmt"
	"io"
	"io/fs"
	"os"
	"os/exec"
	"path/filepath"
	"runtime"
	"strings"
	"syscall"
	"testing"

	"groundtally/app/study"
)

func put(t *testing.T, dir, name, content string) string {
	t.Helper()
	path := filepath.Join(dir, name)
	if err := os.WriteFile(path, []byte(content), 0o600); err != nil {
		t.Fatal(err)
	}
	return path
}

func sqlite(id string) string {
	b := make([]byte, 100)
	copy(b, "SQLite format 3\x00")
	copy(b[68:], id)
	return string(b)
}

func TestKinds(t *testing.T) {
	dir := t.TempDir()
	for name, c := range map[string]struct {
		content string
		want    Kind
	}{
		"a.geojson":   {`{"type":"FeatureCollection"}`, GeoJSON},
		"mark.json":   {"\xef\xbb\xbf\n {}", GeoJSON},
		"b.geojsonl":  {"{}\n{}\n", GeoJSONText},
		"c.json":      {"\x1e{}\n", GeoJSONText},
		"list.json":   {"[1]", GeoJSON},
		"no ending":   {"{}", GeoJSON},
		"d.csv":       {"a,b\n1,2\n", Table},
		"latin.csv":   {"Gr\xfc\xdfe;b\n1;2\n", Table},
		"one.txt":     {"a\n1\n", Table},
		"table":       {"a;b\n1;2\n", Table},
		"e.asc":       {"ncols 3\nnrows 2\n", ASCIIGrid},
		"f.txt":       {"NCOLS         3\r\nNROWS 2\r\n", ASCIIGrid},
		"ncols.csv":   {"ncols,nrows\n1,2\n", Table},
		"g.gpkg":      {sqlite("GPKG"), GeoPackage},
		"h.gpkg":      {sqlite("GP10"), GeoPackage},
		"i.gpkg":      {sqlite("\x00\x00\x00\x00"), GeoPackage},
		"renamed.txt": {sqlite("GPKG"), GeoPackage},
		"j.zip":       {"PK\x03\x04......", Zip},
		"w.xlsx":      {"PK\x03\x04......", Workbook},
		"k.tif":       {"II*\x00....", GeoTIFF},
		"l.tif":       {"MM\x00+....", GeoTIFF},
		"m.shp":       {"\x00\x00\x27\x0a....", Shapefile},
		"N47E009.hgt": {"\x00\x01", HGT},
	} {
		got, err := Sniff(put(t, dir, name, c.content))
		if err != nil || got != c.want {
			t.Errorf("%s: %q, %v, want %q", name, got, err, c.want)
		}
	}
}

func TestRefusedKinds(t *testing.T) {
	dir := t.TempDir()
	for name, c := range map[string]struct{ content, says string }{
		"zero.geojson":  {"", "empty"},
		"blank.csv":     {" \n\t\n", "only blanks"},
		"page.geojson":  {"<!DOCTYPE html><html>", "web page"},
		"a.kml":         {`<?xml version="1.0"?><kml>`, "KML"},
		"a.gml":         {`<?xml version="1.0"?><x xmlns="http://www.opengis.net/gml">`, "GML"},
		"a.xml":         {`<a/>`, "XML"},
		"a.pdf":         {"%PDF-1.7", "PDF"},
		"a.geojson.gz":  {"\x1f\x8b\x08", "gzip"},
		"a.ods":         {"PK\x03\x04", "workbook"},
		"a.xls":         {"\xd0\xcf\x11\xe0", "workbook"},
		"a.png":         {"\x89PNG\r\n", "picture"},
		"utf16.csv":     {"\xff\xfea\x00", "UTF-16"},
		"a.dbf":         {"\x03", ".shp"},
		"a.sqlite":      {sqlite("\x00\x00\x00\x00"), "not a GeoPackage"},
		"short.gpkg":    {"SQLite format 3\x00", "cut short"},
		"prose.geojson": {"this is not JSON", "not JSON"},
		"prose.asc":     {"hello there", "no header"},
		"prose":         {"hello there\n", "not known"},
		"zeros.csv":     {"a,b\n\x00\x00", "not known"},
	} {
		path := put(t, dir, name, c.content)
		_, err := Open(path, 1<<20)
		var fe *study.FileError
		if !errors.As(err, &fe) || !strings.Contains(err.Error(), c.says) || !strings.Contains(err.Error(), path) || fe.Cure == "" {
			t.Errorf("%s: %v", name, err)
		}
	}
	if _, err := Open(filepath.Join(dir, "nothing"), 1); !errors.Is(err, study.ErrNotThere) || !errors.Is(err, fs.ErrNotExist) {
		t.Errorf("no file: %v", err)
	}
	if _, err := Open(dir, 1<<20); err == nil || !strings.Contains(err.Error(), "folder") {
		t.Errorf("folder: %v", err)
	}
	if _, err := Open(os.DevNull, 1<<20); err == nil || !strings.Contains(err.Error(), "ordinary") {
		t.Errorf("device: %v", err)
	}
	if _, err := Open(put(t, dir, "large.csv", "a,b\n1,2\n"), 7); err == nil || !strings.Contains(err.Error(), "8 bytes, at most 7") {
		t.Errorf("large: %v", err)
	}
}

// The shared hostile files: whatever is refused names the file, and none is taken for another kind.
func TestHostileFiles(t *testing.T) {
	names, err := filepath.Glob("../../testdata/hostile/*.geojson*")
	if err != nil || len(names) < 20 {
		t.Fatal(names, err)
	}
	for _, path := range names {
		in, err := Open(path, 1<<20)
		if err != nil {
			var fe *study.FileError
			if !errors.As(err, &fe) || fe.File != path || fe.Cure == "" {
				t.Errorf("%v", err)
			}
			continue
		}
		if in.Kind != GeoJSON && in.Kind != GeoJSONText {
			t.Errorf("%s is %s", path, in.Kind)
		}
		data, err := io.ReadAll(in)
		if err != nil || int64(len(data)) != in.Size {
			t.Errorf("%s: %d of %d bytes, %v", path, len(data), in.Size, err)
		}
		if err := in.Close(); err != nil {
			t.Error(err)
		}
	}
}

func TestFileThatGrows(t *testing.T) {
	path := put(t, t.TempDir(), "a.csv", "a,b\n1,2\n")
	in, err := Open(path, 1<<20)
	if err != nil {
		t.Fatal(err)
	}
	defer in.Close()
	put(t, filepath.Dir(path), "a.csv", "a,b\n1,2\n3,4\n")
	if _, err := io.ReadAll(in); err == nil || !strings.Contains(err.Error(), "grew") {
		t.Errorf("error %v", err)
	}
	b := make([]byte, 3)
	if _, err := in.ReadAt(b, 4); err != nil || string(b) != "1,2" {
		t.Errorf("%q, %v", b, err)
	}
}

func TestPipeIsNotWaitedFor(t *testing.T) {
	if runtime.GOOS == "windows" {
		return // it has no pipes among its files
	}
	path := filepath.Join(t.TempDir(), "pipe")
	if out, err := exec.Command("mkfifo", path).CombinedOutput(); err != nil {
		t.Fatalf("%v: %s", err, out)
	}
	if _, err := Open(path, 1); err == nil || !strings.Contains(err.Error(), "ordinary") {
		t.Errorf("error %v", err)
	}
}

func say(s string) func(io.Writer) error {
	return func(w io.Writer) error {
		_, err := io.WriteString(w, s)
		return err
	}
}

func content(t *testing.T, path string) string {
	t.Helper()
	b, err := os.ReadFile(path)
	if err != nil {
		t.Fatal(err)
	}
	return string(b)
}

func alone(t *testing.T, dir string, want ...string) {
	t.Helper()
	entries, err := os.ReadDir(dir)
	if err != nil {
		t.Fatal(err)
	}
	var names []string
	for _, e := range entries {
		names = append(names, e.Name())
	}
	if fmt.Sprint(names) != fmt.Sprint(want) {
		t.Fatalf("the folder holds %v, want %v", names, want)
	}
}

func TestWrite(t *testing.T) {
	dir := t.TempDir()
	path := filepath.Join(dir, "out.txt")
	for _, s := range []string{"first", "", strings.Repeat("long", 100_000)} {
		if err := Write(path, say(s)); err != nil {
			t.Fatal(err)
		}
		if content(t, path) != s {
			t.Errorf("wrong content after %d bytes", len(s))
		}
		alone(t, dir, "out.txt")
	}
	if runtime.GOOS != "windows" {
		if err := os.Chmod(path, 0o640); err != nil {
			t.Fatal(err)
		}
		if err := os.Symlink("out.txt", filepath.Join(dir, "link")); err != nil {
			t.Fatal(err)
		}
		if err := Write(filepath.Join(dir, "link"), say("through the link")); err != nil {
			t.Fatal(err)
		}
		info, err := os.Lstat(path)
		if err != nil || info.Mode() != 0o640 || content(t, path) != "through the link" {
			t.Errorf("%v, %v, %q", info.Mode(), err, content(t, path))
		}
		alone(t, dir, "link", "out.txt")
	}
	if err := Write(dir, say("x")); err == nil || !strings.Contains(err.Error(), "folder") {
		t.Errorf("onto a folder: %v", err)
	}
	if err := Write(filepath.Join(dir, "no", "x"), say("x")); !errors.Is(err, study.ErrNotThere) {
		t.Errorf("no folder: %v", err)
	}
}

func TestWriteNew(t *testing.T) {
	dir := t.TempDir()
	path := filepath.Join(dir, "out.txt")
	if err := WriteNew(path, say("first")); err != nil {
		t.Fatal(err)
	}
	if err := WriteNew(path, say("second")); !errors.Is(err, study.ErrNameInUse) || !strings.Contains(err.Error(), path) {
		t.Errorf("error %v", err)
	}
	if content(t, path) != "first" {
		t.Error("it was overwritten")
	}
	// another program takes the name meanwhile
	other := filepath.Join(dir, "other.txt")
	err := WriteNew(other, func(w io.Writer) error {
		put(t, dir, "other.txt", "theirs")
		return say("ours")(w)
	})
	if !errors.Is(err, study.ErrNameInUse) || content(t, other) != "theirs" {
		t.Errorf("%v, %q", err, content(t, other))
	}
	alone(t, dir, "other.txt", "out.txt")
}

func TestWriterFailsOrPanics(t *testing.T) {
	dir := t.TempDir()
	path := put(t, dir, "out.txt", "old")
	broken := errors.New("broken on purpose")
	err := Write(path, func(w io.Writer) error {
		if err := say("half")(w); err != nil {
			return err
		}
		return broken
	})
	if !errors.Is(err, broken) || !strings.Contains(err.Error(), path) {
		t.Errorf("error %v", err)
	}
	func() {
		defer func() {
			if recover() == nil {
				t.Error("the panic was swallowed")
			}
		}()
		if err := Write(path, func(io.Writer) error { panic("on purpose") }); err != nil {
			t.Error(err)
		}
	}()
	if content(t, path) != "old" {
		t.Error("the old file is gone")
	}
	alone(t, dir, "out.txt")
}

func TestLeftOverIsPassedOver(t *testing.T) {
	dir := t.TempDir()
	put(t, dir, ".out.txt.0.part", "of a killed program")
	if err := Write(filepath.Join(dir, "out.txt"), say("new")); err != nil {
		t.Fatal(err)
	}
	alone(t, dir, ".out.txt.0.part", "out.txt")
}

// faulty makes the n-th call to the operating system fail.
type faulty struct {
	real
	left int
	err  error
}

func (f *faulty) next() error {
	if f.left--; f.left == 0 {
		return f.err
	}
	return nil
}

func (f *faulty) target(path string) (string, error) {
	if err := f.next(); err != nil {
		return "", err
	}
	return f.real.target(path)
}

func (f *faulty) exists(path string) error {
	return errors.Join(f.next(), f.real.exists(path))
}

func (f *faulty) create(path string) (handle, error) {
	if err := f.next(); err != nil {
		return nil, err
	}
	h, err := f.real.create(path)
	return &faultyHandle{h, f}, err
}

func (f *faulty) rename(from, to string) error {
	if err := f.next(); err != nil {
		return err
	}
	return f.real.rename(from, to)
}

func (f *faulty) link(from, to string) error {
	if err := f.next(); err != nil {
		return err
	}
	return f.real.link(from, to)
}

func (f *faulty) syncFolder(path string) error {
	return errors.Join(f.next(), f.real.syncFolder(path))
}

type faultyHandle struct {
	handle
	f *faulty
}

func (h *faultyHandle) Write(p []byte) (int, error) {
	if err := h.f.next(); err != nil {
		n, _ := h.handle.Write(p[:len(p)/2]) // half of it arrives
		return n, err
	}
	return h.handle.Write(p)
}

func (h *faultyHandle) Sync() error { return errors.Join(h.f.next(), h.handle.Sync()) }

func (h *faultyHandle) Chmod(m fs.FileMode) error { return errors.Join(h.f.next(), h.handle.Chmod(m)) }

func (h *faultyHandle) Close() error { return errors.Join(h.handle.Close(), h.f.next()) }

func TestNthCallFails(t *testing.T) {
	full := bytes.Repeat([]byte("new"), 100_000)
	for _, replace := range []bool{true, false} {
		failures := 0
		for n := 1; ; n++ {
			dir := t.TempDir()
			path := filepath.Join(dir, "out.txt")
			if replace {
				put(t, dir, "out.txt", "old")
			}
			err := write(&faulty{left: n, err: syscall.ENOSPC}, path, replace, say(string(full)))
			if err == nil {
				break
			}
			failures++
			if !errors.Is(err, study.ErrDiskFull) || !strings.Contains(err.Error(), "disk is full") {
				t.Fatalf("call %d: %v", n, err)
			}
			got, err := os.ReadFile(path)
			switch {
			case replace && err == nil && (string(got) == "old" || bytes.Equal(got, full)):
				alone(t, dir, "out.txt")
			case !replace && errors.Is(err, fs.ErrNotExist):
				alone(t, dir)
			case !replace && err == nil && bytes.Equal(got, full): // only the folder could not be flushed
				alone(t, dir, "out.txt")
			default:
				t.Fatalf("replace=%t, call %d: %d bytes, %v", replace, n, len(got), err)
			}
		}
		if failures < 6 {
			t.Errorf("replace=%t: only %d calls can fail", replace, failures)
		}
	}
}

// A file that may not be read is bad input; one that may not be written is a right to write that is missing.
func TestNoRightToRead(t *testing.T) {
	var f *study.FileError
	denied := &fs.PathError{Op: "open", Path: "x", Err: fs.ErrPermission}
	if err := system("x", "read", denied); errors.Is(err, study.ErrReadOnly) || !errors.As(err, &f) || f.What != "you have no right to read it" || f.Cure == "" {
		t.Errorf("read: %v", err)
	}
	if err := system("x", "written", denied); !errors.Is(err, study.ErrReadOnly) {
		t.Errorf("written: %v", err)
	}
}
