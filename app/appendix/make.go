package appendix

import (
	"context"
	"encoding/json"
	"errors"
	"io/fs"
	"os"
	"path/filepath"
	"slices"
	"syscall"

	"groundtally/app/run"
	"groundtally/app/study"
)

// PageFile is the page in the folder of an appendix.
const PageFile = "appendix.html"

// Made says what was written and where.
type Made struct {
	Files []string // the page first
	Bytes int      // of all files together
	Code  run.Code
}

// Make writes the appendix of results into a folder, which is made when it is not there: the page, and
// beside it the stamp that verify reads. Layers and notices that the input lacks are read from the store.
// write must put a file there wholly or not at all; step, which may be nil, is told what is done next, and
// how many of the steps are done.
func Make(ctx context.Context, in Input, store study.Store, folder string, write func(path string, data []byte) error, step func(what string, done, total int)) (Made, error) {
	if step == nil {
		step = func(string, int, int) {}
	}
	made := Made{Files: []string{filepath.Join(folder, PageFile), filepath.Join(folder, StampFile)}, Code: in.Results.Code}
	var page, stamp []byte
	steps := []struct {
		what string
		do   func() error
	}{
		{"folder", func() error { return makeFolder(folder) }},
		{"layers of the map", func() (err error) {
			if in.Layers == nil {
				in.Layers, err = MapLayers(ctx, in.Snapshot, run.StoreLoader(store))
			}
			return err
		}},
		{"notices", func() (err error) {
			if in.Notices == nil {
				in.Notices, err = run.Check(ctx, store, in.Snapshot, in.Params)
			}
			return err
		}},
		{"page", func() (err error) {
			sv := run.NewSurveyor(in.Snapshot, in.Params, run.StoreLoader(store), store)
			if in.Course == nil {
				in.Course = func(c *run.Candidate) (*run.Course, error) { return sv.Course(ctx, c) }
			}
			if in.Crowding == nil {
				in.Crowding = func(c *run.Candidate, part string) (*run.Crowded, error) { return sv.Crowding(ctx, c, part) }
			}
			page, err = Page(in)
			return err
		}},
		{"check code", func() (err error) {
			stamp, err = json.MarshalIndent(NewStamp(in.Results, in.Version), "", " ")
			stamp = append(stamp, '\n')
			return err
		}},
		{"files", func() error {
			if err := write(made.Files[0], page); err != nil {
				return err
			}
			return write(made.Files[1], stamp)
		}},
	}
	for i, s := range steps {
		if err := ctx.Err(); err != nil {
			return Made{}, err
		}
		step(s.what, i, len(steps))
		if err := s.do(); err != nil {
			return Made{}, err
		}
	}
	made.Bytes = len(page) + len(stamp)
	return made, nil
}

// makeFolder makes the folder of an appendix.
func makeFolder(folder string) error {
	err := os.MkdirAll(folder, 0o755)
	if err == nil {
		return nil
	}
	e := &study.FileError{File: folder, What: "the folder cannot be made: " + err.Error(), Cure: "Choose another folder"}
	switch {
	case errors.Is(err, fs.ErrPermission), errors.Is(err, syscall.EROFS):
		return errors.Join(e, study.ErrReadOnly)
	case errors.Is(err, syscall.ENOSPC):
		return errors.Join(e, study.ErrDiskFull)
	case errors.Is(err, syscall.ENOTDIR), errors.Is(err, fs.ErrExist):
		e.What = "it is a file, or lies in one"
	}
	return e
}

// Cautions gives what is printed in every appendix as a warning.
func Cautions() []string { return slices.Clone(cautions) }

// NotAssessed gives what the program does not look at, whatever the data.
func NotAssessed() []string { return slices.Clone(alwaysNotAssessed) }
