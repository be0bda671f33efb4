package ground

import (
	"context"
	"errors"
	"fmt"
	"path/filepath"
	"runtime/debug"
	"strings"
	"time"

	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/container"
	"fyne.io/fyne/v2/dialog"
	"fyne.io/fyne/v2/widget"

	"groundtally/app/desk/widgets"
	"groundtally/app/live"
	"groundtally/app/present"
	"groundtally/app/study"
)

// job is a file that waits to be read; replace names the layer in whose place it goes, if any.
// table names one of several tables of the file.
type job struct{ path, table, replace string }

// Import reads files one after the other and asks for each what only the user knows. It is for files
// chosen in the pane or dropped on the window, and must be called on the window's goroutine.
func (s *Stage) Import(paths ...string) {
	if len(paths) > 0 {
		s.c.ShowStage(s.Title())
	}
	for _, p := range paths {
		s.queue = append(s.queue, job{path: p})
	}
	s.next()
}

func (s *Stage) enqueue(j job) {
	s.queue = append(s.queue, j)
	s.next()
}

// next takes the next file that waits, once the one before is done with.
func (s *Stage) next() {
	if s.busy || len(s.queue) == 0 {
		return
	}
	s.busy = true
	j := s.queue[0]
	s.queue = s.queue[1:]
	ctx, cancel := context.WithCancel(context.Background())
	done := s.progress("Reading "+filepath.Base(j.path), cancel)
	go func() {
		in, err := s.read(ctx, j)
		cancel()
		s.c.Do(func() {
			done()
			var q *study.QuestionError
			if errors.As(err, &q) && len(q.Tables) > 0 && j.replace != "" {
				s.chooseTable(j, q.Tables)
				return
			}
			if errors.As(err, &q) && len(q.Tables) > 0 { // each is asked about by itself
				var more []job
				for _, t := range q.Tables {
					more = append(more, job{j.path, t, j.replace})
				}
				s.queue = append(more, s.queue...)
				s.finished()
				return
			}
			if err != nil {
				s.refused(err)
				return
			}
			s.form = newForm(s, in, j.replace)
			s.form.open()
		})
	}()
}

// read reads a file. One whose coordinate system cannot be understood is read without it, and asked about.
func (s *Stage) read(ctx context.Context, j job) (in study.Import, err error) {
	defer func() {
		if p := recover(); p != nil { // a file must not end the program
			err = &live.FaultError{What: fmt.Sprint(p), Details: string(debug.Stack())}
		}
	}()
	in, err = s.c.Parts.Read(ctx, j.path, study.ReadOptions{Table: j.table})
	var file *study.FileError
	if err == nil || ctx.Err() != nil || !errors.As(err, &file) {
		return in, err
	}
	if again, other := s.c.Parts.Read(ctx, j.path, study.ReadOptions{Table: j.table, CRSGiven: true}); other == nil {
		again.CRS = ""
		return again, nil
	}
	if file.Where == "" {
		shown := *file
		shown.Cure = strings.TrimSuffix(shown.Cure, ".") + ". Files that are read: GeoJSON (.geojson, .json, .geojsonl), GeoPackage (.gpkg), shapefile (.shp with the files beside it, or .zip), tables (.csv, .tsv, .txt, .xlsx), grids of values (.tif, .asc, .hgt), pictures (.png, .jpg with a world file, .tif)"
		return in, &shown
	}
	return in, err
}

// refused says why a file cannot be read, then goes on to the next.
func (s *Stage) refused(err error) {
	if errors.Is(err, context.Canceled) {
		s.finished()
		return
	}
	if len(s.queue) == 0 {
		s.c.Fail("read the file", err)
		s.finished()
		return
	}
	body := container.NewVBox(widgets.NewText(inWindow.Replace(present.Problem(err))), widgets.Faint(fmt.Sprintf("Next: %s", filepath.Base(s.queue[0].path))))
	d := dialog.NewCustom("Could not read the file", "Go on", body, s.c.Window)
	d.SetOnClosed(s.finished)
	d.Resize(dialogSize(s.c, 520, 200))
	d.Show()
}

// finished is called when a file is done with, added or not.
func (s *Stage) finished() {
	s.busy, s.form = false, nil
	s.next()
}

// slow is how long something may take before its progress is shown.
const slow = 200 * time.Millisecond

// progress shows, after a moment, that something is under way and lets the user stop it. The function
// that it gives ends it; both are for the window's goroutine.
func (s *Stage) progress(words string, stop func()) (end func()) {
	bar := widget.NewProgressBarInfinite()
	d := dialog.NewCustomWithoutButtons(words, container.NewVBox(bar, container.NewCenter(widget.NewButton("Stop", stop))), s.c.Window)
	over, shown := false, false
	timer := time.AfterFunc(slow, func() {
		s.c.Do(func() {
			if !over {
				shown = true
				d.Resize(fyne.NewSize(360, 130))
				d.Show()
			}
		})
	})
	return func() {
		timer.Stop()
		over = true
		bar.Stop()
		if shown {
			d.Hide()
		}
	}
}
