package crs

/*
#cgo pkg-config: proj
#include <stdlib.h>
#include <proj.h>

// With directories, only those are searched; without any, the library's own paths.
static PJ_CONTEXT *gt_context(int n, const char **dirs) {
	PJ_CONTEXT *ctx = proj_context_create();
	if (ctx == NULL) return NULL;
	proj_log_level(ctx, PJ_LOG_NONE);
	proj_context_set_enable_network(ctx, 0);
	if (n > 0) proj_context_set_search_paths(ctx, n, dirs);
	return ctx;
}

// 1 when the name is a system with plane or geographic axes, 0 for anything else.
static int gt_plane(int n, const char **dirs, const char *name) {
	PJ_CONTEXT *ctx = gt_context(n, dirs);
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

// Where the library looks by itself, as one text.
static const char *gt_paths(void) { return proj_info().searchpath; }
*/
import "C"

import (
	"errors"
	"fmt"
	"os"
	"path/filepath"
	"strings"
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
	dirs     []string // that are searched; the library's own when there is none
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
	if dir == "" {
		return open(nil)
	}
	return open([]string{dir})
}

// open opens the library with the database and the grids that are found in the directories, the first one first.
func open(dirs []string) (*Library, error) {
	openMu.Lock()
	defer openMu.Unlock()
	// The context that go-proj makes reads this when it first looks for the network; a variable of the
	// process outranks the library's own settings file.
	if err := os.Setenv("PROJ_NETWORK", "OFF"); err != nil {
		return nil, fmt.Errorf("switch the projection library's network off: %w", err)
	}
	l := &Library{
		cache:    map[string]*Transform{},
		dirs:     dirs,
		editions: Editions{Library: fmt.Sprintf("%d.%d.%d", proj.VersionMajor, proj.VersionMinor, proj.VersionPatch)},
	}
	n, list, free := cTexts(dirs)
	defer free()
	ctx := C.gt_context(n, list)
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
		if len(dirs) > 0 {
			where = strings.Join(dirs, ", ")
		}
		return l, fmt.Errorf("%w in %s: data in longitude and latitude on WGS 84 can still be read, other coordinate systems cannot", ErrNoDatabase, where)
	}
	l.editions.Database = fmt.Sprintf("%s (%s)", version, meta("EPSG.DATE"))
	l.path = C.GoString(C.proj_context_get_database_path(ctx))
	l.ctx = proj.NewContext()
	if len(dirs) > 0 {
		l.ctx.SetSearchPaths(dirs)
	}
	return l, nil
}

// cTexts gives texts to C, until free is called.
func cTexts(texts []string) (n C.int, list **C.char, free func()) {
	if len(texts) == 0 {
		return 0, nil, func() {}
	}
	list = (**C.char)(C.malloc(C.size_t(len(texts)) * C.size_t(unsafe.Sizeof(list))))
	all := unsafe.Slice(list, len(texts))
	for i, t := range texts {
		all[i] = C.CString(t)
	}
	return C.int(len(texts)), list, func() {
		for _, t := range all {
			C.free(unsafe.Pointer(t))
		}
		C.free(unsafe.Pointer(list))
	}
}

// ownPaths gives the directories in which the library looks by itself.
func ownPaths() []string {
	openMu.Lock()
	defer openMu.Unlock()
	return filepath.SplitList(C.GoString(C.gt_paths()))
}

// plane reports whether the name is a system whose coordinates are plane or geographic: geocentric,
// vertical and local engineering systems are not.
func (l *Library) plane(name string) bool {
	n, list, free := cTexts(l.dirs)
	defer free()
	cname := C.CString(name)
	defer C.free(unsafe.Pointer(cname))
	return C.gt_plane(n, list, cname) == 1
}

// Editions gives the editions of the library with its database.
func (l *Library) Editions() Editions { return l.editions }

// DatabasePath gives the file of the projection database; empty without one.
func (l *Library) DatabasePath() string { return l.path }
