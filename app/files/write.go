package files

import (
	"bufio"
	"errors"
	"fmt"
	"io"
	"io/fs"
	"os"
	"path/filepath"
)

// Write puts what fn writes into the file at path, in place of what was there. Until fn and the disk
// have done all their work the old file stays as it is; when anything fails, or the program is killed,
// it stays for good. A link is followed, so that the file behind it is the one replaced.
func Write(path string, fn func(io.Writer) error) error {
	return write(real{}, path, true, fn)
}

// WriteNew is Write for a file that must not be there yet.
func WriteNew(path string, fn func(io.Writer) error) error {
	return write(real{}, path, false, fn)
}

// disk is what writing asks of the operating system, so that tests can make each call fail.
type disk interface {
	target(path string) (string, error)
	create(path string) (handle, error)
	mode(path string) (fs.FileMode, bool)
	exists(path string) error
	rename(from, to string) error
	link(from, to string) error
	remove(path string) error
	syncFolder(path string) error
}

type handle interface {
	io.Writer
	Sync() error
	Chmod(fs.FileMode) error
	Close() error
}

func write(d disk, path string, replace bool, fn func(io.Writer) error) error {
	to, err := d.target(path)
	if err != nil {
		return system(path, "written", err)
	}
	if !replace {
		// Looked at first so that a long export does not end with this; made sure of at the end.
		if err := d.exists(to); err != nil {
			return system(path, "written", err)
		}
	}
	temp, h, err := open(d, to)
	if err != nil {
		return system(path, "written", err)
	}
	closed, moved := false, false
	defer func() { // also when fn panics
		if !closed {
			_ = h.Close() // the error that matters is the one being returned
		}
		if !moved {
			_ = d.remove(temp) // likewise; what is left behind is named so that it can be told
		}
	}()
	b := bufio.NewWriterSize(h, headBytes)
	if err := fn(b); err != nil {
		return system(path, "written", err)
	}
	if err := b.Flush(); err != nil {
		return system(path, "written", err)
	}
	if mode, ok := d.mode(to); ok && replace {
		if err := h.Chmod(mode); err != nil {
			return system(path, "written", err)
		}
	}
	if err := h.Sync(); err != nil {
		return system(path, "written", err)
	}
	closed = true
	if err := h.Close(); err != nil {
		return system(path, "written", err)
	}
	if replace {
		if err := d.rename(temp, to); err != nil {
			return system(path, "written", err)
		}
		moved = true
	} else if err := d.link(temp, to); err != nil {
		return system(path, "written", err)
	}
	return system(path, "written", d.syncFolder(filepath.Dir(to)))
}

// open makes the temporary file beside the target. Its name tells what it belongs to; one that a
// killed program left is passed over.
func open(d disk, to string) (string, handle, error) {
	var err error
	for n := range 1000 {
		name := filepath.Join(filepath.Dir(to), fmt.Sprintf(".%s.%d.part", filepath.Base(to), n))
		var h handle
		if h, err = d.create(name); err == nil {
			return name, h, nil
		}
		if !errors.Is(err, fs.ErrExist) {
			break
		}
	}
	return "", nil, err
}

type real struct{}

func (real) target(path string) (string, error) {
	to, err := filepath.EvalSymlinks(path)
	if errors.Is(err, fs.ErrNotExist) {
		return filepath.Abs(path)
	}
	if err != nil {
		return "", err
	}
	info, err := os.Stat(to)
	if err != nil {
		return "", err
	}
	if !info.Mode().IsRegular() {
		return "", refuse(path, "it is a folder or a device, not a file", "Choose another name")
	}
	return filepath.Abs(to)
}

func (real) create(path string) (handle, error) {
	f, err := os.OpenFile(path, os.O_CREATE|os.O_EXCL|os.O_WRONLY, 0o666)
	if err != nil {
		return nil, err
	}
	return f, nil
}

func (real) mode(path string) (fs.FileMode, bool) {
	info, err := os.Stat(path)
	if err != nil {
		return 0, false // there is none yet, so the usual mode is right
	}
	return info.Mode().Perm(), true
}

func (real) exists(path string) error {
	_, err := os.Lstat(path)
	switch {
	case err == nil:
		return fs.ErrExist
	case errors.Is(err, fs.ErrNotExist):
		return nil
	}
	return err
}

func (real) rename(from, to string) error { return os.Rename(from, to) }

// link gives the finished file its name only where the name is free. Where the file system has no
// links, the name is taken with an empty file first, which the finished one then replaces.
func (r real) link(from, to string) error {
	err := os.Link(from, to)
	if err == nil || errors.Is(err, fs.ErrExist) {
		return err
	}
	f, err := os.OpenFile(to, os.O_CREATE|os.O_EXCL|os.O_WRONLY, 0o666)
	if err != nil {
		return err
	}
	if err := f.Close(); err != nil {
		return err
	}
	if err := os.Rename(from, to); err != nil {
		return errors.Join(err, os.Remove(to))
	}
	return nil
}

func (real) remove(path string) error { return os.Remove(path) }
