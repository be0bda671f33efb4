package program

import (
	"context"
	"fmt"
	"io"
	"os"
	"os/user"
	"runtime"

	"groundtally/app/export"
	"groundtally/app/files"
	"groundtally/app/run"
	"groundtally/app/store"
	"groundtally/app/study"
	"groundtally/assets"
	"groundtally/geo"
	"groundtally/geo/crs"
	"groundtally/geo/overlay"
	"groundtally/sampledata"
)

// Version is the program's own; it is printed in every appendix.
const Version = "groundtally 0.1"

// Parts are the pieces that both programs are made of.
type Parts struct {
	Catalog *study.Catalog
	Params  *run.Params
	Engines []string // libraries and editions that take part in results
	Who     string   // the person, for the journal
}

// Load reads what ships with the program.
func Load() (*Parts, error) {
	catalog, err := study.LoadCatalog(assets.FS())
	if err != nil {
		return nil, err
	}
	params, err := run.LoadParams(assets.FS(), catalog)
	if err != nil {
		return nil, err
	}
	return &Parts{Catalog: catalog, Params: params, Engines: engines(), Who: who()}, nil
}

func engines() []string {
	out := []string{"geometry: GEOS " + overlay.LibraryVersion()}
	lib, err := crs.Shared()
	if err != nil {
		return append(out, "projections: not available: "+err.Error())
	}
	e := lib.Editions()
	return append(out, fmt.Sprintf("projections: PROJ %s, database %s", e.Library, e.Database))
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

// UseCores gives the Go scheduler two places to run for each core, unless the environment says how many.
// Much of the time is spent in the geometry library, and a goroutine that comes back from C must wait for a
// place; with two for each core the cores are kept busy.
func UseCores() {
	if os.Getenv("GOMAXPROCS") == "" {
		runtime.GOMAXPROCS(2 * runtime.GOMAXPROCS(0))
	}
}

// Create makes an empty study file.
func (*Parts) Create(ctx context.Context, path string) (study.Store, error) {
	return store.Create(ctx, path)
}

// Open opens a study file.
func (*Parts) Open(ctx context.Context, path string) (study.Store, error) {
	return store.Open(ctx, path)
}

// Read reads a file of the user as far as that is possible without knowing what it means.
func (*Parts) Read(ctx context.Context, path string, o study.ReadOptions) (study.Import, error) {
	if in, ok, err := files.ImportPicture(ctx, path); ok {
		return in, err
	}
	return files.Import(ctx, path, o)
}

// Tools gives the geometry services of an import, to be closed after use.
func (*Parts) Tools() (study.Tools, func()) { return files.NewTools() }

// Sample fills a study with the Isle of Marram.
func (*Parts) Sample(ctx context.Context, s *study.Study, tools study.Tools, report func(study.LayerRecord)) error {
	return s.LoadSample(ctx, sampledata.FS(), files.ImportFS, tools, report)
}

// Export writes layers in the form that the ending of the file's name says.
func (*Parts) Export(ctx context.Context, path string, layers []*geo.Layer, replace bool) error {
	f, err := export.FormatOf(path)
	if err != nil {
		return err
	}
	return export.Layers(ctx, path, layers, export.Options{Format: f, Replace: replace, Triggers: true})
}

// Write puts data into a file, wholly or not at all.
func (*Parts) Write(path string, data []byte) error {
	return files.Write(path, func(w io.Writer) error {
		_, err := w.Write(data)
		return err
	})
}
