// Command gtally is the terminal program: flags, wiring, exit code.
package main

import (
	"context"
	"fmt"
	"io"
	"os"
	"os/signal"
	"os/user"
	"runtime"
	"syscall"
	"time"

	"groundtally/app/files"
	"groundtally/app/run"
	"groundtally/app/store"
	"groundtally/app/study"
	"groundtally/app/term"
	"groundtally/assets"
	"groundtally/geo/crs"
	"groundtally/geo/overlay"
	"groundtally/sampledata"
)

// version is the program's own; it is printed in every appendix.
const version = "groundtally 0.1"

func main() {
	os.Exit(realMain())
}

func realMain() int {
	if os.Getenv("GOMAXPROCS") == "" {
		// Much of the time is spent in the geometry library, and a goroutine that comes back from C must wait
		// for a place to run. With two places for each core the cores are kept busy.
		runtime.GOMAXPROCS(2 * runtime.GOMAXPROCS(0))
	}
	ctx, stop := signal.NotifyContext(context.Background(), os.Interrupt, syscall.SIGTERM)
	defer stop()
	context.AfterFunc(ctx, stop) // a second interrupt ends the program at once
	fail := func(err error) int {
		fmt.Fprintf(os.Stderr, "gtally: %v\n", err)
		return term.ExitUnexpected
	}
	catalog, err := study.LoadCatalog(assets.FS())
	if err != nil {
		return fail(err)
	}
	params, err := run.LoadParams(assets.FS(), catalog)
	if err != nil {
		return fail(err)
	}
	engines := []string{"geometry: GEOS " + overlay.LibraryVersion()}
	if lib, err := crs.Open(""); err != nil {
		engines = append(engines, "projections: not available: "+err.Error())
	} else {
		e := lib.Editions()
		engines = append(engines, fmt.Sprintf("projections: PROJ %s, database %s", e.Library, e.Database))
	}
	app := &term.App{
		Out: os.Stdout, Err: os.Stderr, Terminal: isTerminal(os.Stderr),
		Create: store.Create, OpenFile: store.Open, ReadFile: files.Import, Write: write,
		Catalog: catalog, Params: params, Tools: files.NewTools,
		Sample: func(ctx context.Context, s *study.Study, tools study.Tools, report func(study.LayerRecord)) error {
			return s.LoadSample(ctx, sampledata.FS(), files.ImportFS, tools, report)
		},
		Clock: time.Now, Who: who(), Version: version, Engines: engines,
	}
	return app.Run(ctx, os.Args[1:])
}

func isTerminal(f *os.File) bool {
	st, err := f.Stat()
	return err == nil && st.Mode()&os.ModeCharDevice != 0
}

func write(path string, data []byte) error {
	return files.Write(path, func(w io.Writer) error {
		_, err := w.Write(data)
		return err
	})
}

// who names the person in the journal.
func who() string {
	if u, err := user.Current(); err == nil {
		if u.Name != "" {
			return u.Name
		}
		return u.Username
	}
	return ""
}
