package crs

/*
#cgo pkg-config: proj
#include <stdlib.h>
#include <proj.h>

// With a directory, only that directory is searched; without one, the library's own paths.
static PJ_CONTEXT *gt_context(const char *dir) {
	PJ_CONTEXT *ctx = proj_context_create();
	if (ctx == NULL) return NULL;
	proj_log_level(ctx, PJ_LOG_NONE);
	proj_context_set_enable_network(ctx, 0);
	if (dir != NULL) proj_context_set_search_paths(ctx, 1, &dir);
	return ctx;
}

// 1 when the name is a system with plane or geographic axes, 0 for anything else.
static int gt_plane(const char *dir, const char *name) {
	PJ_CONTEXT *ctx = gt_context(dir);
	if (ctx == NULL) return 0;
	int plane = 0;
	PJ *p = proj_create(ctx, name);
	if (p != NULL) {
		switch (proj_get_type(p)) {
		case PJ_TYPE_GEOGRAPHIC_2D_CRS:
		case PJ_TYPE_GEOGRAPHIC_3D_CRS:
		case PJ_TYPE_PROJECTED_CRS:
		case PJ_TYPE_COMPOUND_CRS:
		case PJ_TYPE_BOUND_CRS:
			plane = 1;
		default:
			break;
		}
		proj_destroy(p);
	}
	proj_context_destroy(ctx);
	return plane;
}
*/
import "C"

import (
	"errors"
	"fmt"
	"os"
	"sync"
	"unsafe"

	proj "github.com/twpayne/go-proj/v11"
)

// ErrNoDatabase is wrapped by the error when the projection database proj.db cannot be found or read.
var ErrNoDatabase = errors.New("the projection database proj.db was not found")

// Library is the projection library with one database, opened with its network access switched off.
// It may be used from any goroutine.
type Library struct {
	ctx      *proj.Context
	mu       sync.Mutex
	cache    map[string]*Transform
	editions Editions
	path     string
	dir      string
}

// Editions names what positions of foreign systems depend on, for the appendix.
type Editions struct {
	Library  string // such as "9.1.1"
	Database string // edition of the EPSG data, such as "v10.076 (2022-08-31)"; empty without a database
}

// openMu guards the process environment while a library is opened.
var openMu sync.Mutex

// Open opens the library with the database in the directory dir, or with the system's database when dir
// is empty. The network is switched off first. Without a database it gives an error that wraps
// ErrNoDatabase together with a Library that still reads WGS 84.
func Open(dir string) (*Library, error) {
	openMu.Lock()
	defer openMu.Unlock()
	// The context that go-proj makes reads this when it first looks for the network; a variable of the
	// process outranks the library's own settings file.
	if err := os.Setenv("PROJ_NETWORK", "OFF"); err != nil {
		return nil, fmt.Errorf("switch the projection library's network off: %w", err)
	}
	l := &Library{
		cache:    map[string]*Transform{},
		dir:      dir,
		editions: Editions{Library: fmt.Sprintf("%d.%d.%d", proj.VersionMajor, proj.VersionMinor, proj.VersionPatch)},
	}
	var cdir *C.char
	if dir != "" {
		cdir = C.CString(dir)
		defer C.free(unsafe.Pointer(cdir))
	}
	ctx := C.gt_context(cdir)
	if ctx == nil {
		return nil, errors.New("the projection library could not be started")
	}
	defer C.proj_context_destroy(ctx)
	meta := func(key string) string {
		k := C.CString(key)
		defer C.free(unsafe.Pointer(k))
		return C.GoString(C.proj_context_get_database_metadata(ctx, k)) // nil gives ""
	}
	version := meta("EPSG.VERSION")
	if version == "" {
		where := "the system's directories"
		if dir != "" {
			where = dir
		}
		return l, fmt.Errorf("%w in %s: data in longitude and latitude on WGS 84 can still be read, other coordinate systems cannot", ErrNoDatabase, where)
	}
	l.editions.Database = fmt.Sprintf("%s (%s)", version, meta("EPSG.DATE"))
	l.path = C.GoString(C.proj_context_get_database_path(ctx))
	l.ctx = proj.NewContext()
	if dir != "" {
		l.ctx.SetSearchPaths([]string{dir})
	}
	return l, nil
}

// plane reports whether the name is a system whose coordinates are plane or geographic: geocentric,
// vertical and local engineering systems are not.
func (l *Library) plane(name string) bool {
	var cdir *C.char
	if l.dir != "" {
		cdir = C.CString(l.dir)
		defer C.free(unsafe.Pointer(cdir))
	}
	cname := C.CString(name)
	defer C.free(unsafe.Pointer(cname))
	return C.gt_plane(cdir, cname) == 1
}

// Editions gives the editions of the library with its database.
func (l *Library) Editions() Editions { return l.editions }

// DatabasePath gives the file of the projection database; empty without one.
func (l *Library) DatabasePath() string { return l.path }

var system = sync.OnceValues(func() (*Library, error) { return Open("") })

// NewTransform makes a transform with the system's database. See Library.NewTransform.
func NewTransform(code string) (*Transform, error) {
	l, err := system()
	if l == nil {
		return nil, err
	}
	return l.NewTransform(code)
}
