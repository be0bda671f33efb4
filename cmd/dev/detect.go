package main

import (
	"context"
	"path/filepath"
	"strconv"
	"strings"
)

// A finding says whether a need is met, and how that is known.
type finding struct {
	need    need
	found   bool
	through string // one of the ways below
	detail  string // what was found, or what was asked and what came back
}

// Ways in which a need is known to be met.
const (
	byPkgConfig = "through pkg-config:"
	byHeader    = "through its headers:"
	byProgram   = "as the program"
	byFile      = "as the file"
)

// detect looks for each need in turn.
func detect(ctx context.Context, m machine, wanted []need) []finding {
	out := make([]finding, 0, len(wanted))
	for _, n := range wanted {
		out = append(out, look(ctx, m, n))
	}
	return out
}

func missing(found []finding) []finding {
	var out []finding
	for _, f := range found {
		if !f.found {
			out = append(out, f)
		}
	}
	return out
}

func look(ctx context.Context, m machine, n need) finding {
	switch {
	case n.name == needCompiler:
		return lookCompiler(ctx, m, n)
	case n.name == needPkgConfig:
		return lookProgram(m, n, pkgConfig(m))
	case len(n.modules) > 0:
		return lookLibrary(ctx, m, n)
	case len(n.programs) > 0:
		return lookProgram(m, n, n.programs...)
	default:
		return lookFile(ctx, m, n)
	}
}

// compiler gives the C compiler that the go command takes when nothing else is set.
func compiler(m machine) []string {
	if cc := strings.Fields(m.getenv("CC")); len(cc) > 0 {
		return cc
	}
	if m.goos() == "darwin" {
		return []string{"clang"}
	}
	return []string{"gcc"}
}

// pkgConfig gives the program that the go command asks for the flags of a library.
func pkgConfig(m machine) string {
	if p := m.getenv("PKG_CONFIG"); p != "" {
		return p
	}
	return "pkg-config"
}

func lookCompiler(ctx context.Context, m machine, n need) finding {
	cc := compiler(m)
	if m.getenv("CGO_ENABLED") == "0" {
		return finding{need: n, detail: "CGO_ENABLED=0 is set, which switches C off: unset it"}
	}
	path, ok := m.lookPath(cc[0])
	if !ok {
		return finding{need: n, detail: cc[0] + " is not on the PATH"}
	}
	if bad, why := compiles(ctx, m, n.headers); bad != "" {
		return finding{need: n, detail: path + " does not compile <" + bad + ">: " + why}
	}
	return finding{need: n, found: true, through: byProgram, detail: path}
}

func lookProgram(m machine, n need, programs ...string) finding {
	for _, p := range programs {
		if path, ok := m.lookPath(p); ok {
			return finding{need: n, found: true, through: byProgram, detail: path}
		}
	}
	return finding{need: n, detail: strings.Join(programs, ", ") + " is not on the PATH"}
}

func lookLibrary(ctx context.Context, m machine, n need) finding {
	version, why := askPkgConfig(ctx, m, n.modules)
	if why == "" {
		if n.atLeast != "" && !atLeast(version, n.atLeast) {
			return finding{need: n, detail: "pkg-config finds " + n.modules[0] + " " + version + ", but at least " + n.atLeast + " is needed"}
		}
		return finding{need: n, found: true, through: byPkgConfig, detail: n.modules[0] + " " + version}
	}
	bad, whyNot := compiles(ctx, m, n.headers)
	switch {
	case bad != "":
		return finding{need: n, detail: why + "; the header <" + bad + "> does not compile: " + whyNot}
	case n.viaPkgConfig:
		return finding{need: n, detail: "the header <" + n.headers[0] + "> is there, but the build asks pkg-config, and " + why}
	}
	return finding{need: n, found: true, through: byHeader, detail: "<" + strings.Join(n.headers, ">, <") + ">"}
}

// askPkgConfig gives the version of the first module when pkg-config knows all of them, else
// why not. It asks for what the go command asks for, so that a broken entry shows here.
func askPkgConfig(ctx context.Context, m machine, modules []string) (version, why string) {
	pc := pkgConfig(m)
	if _, ok := m.lookPath(pc); !ok {
		return "", pc + " is not on the PATH"
	}
	for _, mod := range modules {
		if out, err := m.output(ctx, command{argv: []string{pc, "--cflags", "--libs", mod}}); err != nil {
			return "", pc + " does not know " + mod + ": " + firstLine(out, err)
		}
	}
	out, err := m.output(ctx, command{argv: []string{pc, "--modversion", modules[0]}})
	if err != nil {
		return "", pc + " has no version of " + modules[0] + ": " + firstLine(out, err)
	}
	return strings.TrimSpace(out), ""
}

// compiles tries each header with the compiler; bad is the first that does not compile.
func compiles(ctx context.Context, m machine, headers []string) (bad, why string) {
	cc := compiler(m)
	if _, ok := m.lookPath(cc[0]); !ok {
		return headers[0], cc[0] + " is not on the PATH"
	}
	for _, h := range headers {
		argv := append(append([]string(nil), cc...), "-fsyntax-only", "-x", "c", "-")
		src := "#include <X11/Xlib.h>\n#include <" + h + ">\n" // the X extensions do not stand alone
		if !strings.HasPrefix(h, "X11/") {
			src = "#include <" + h + ">\n"
		}
		if out, err := m.output(ctx, command{argv: argv, in: src}); err != nil {
			return h, firstLine(out, err)
		}
	}
	return "", ""
}

func lookFile(ctx context.Context, m machine, n need) finding {
	patterns := n.files
	if n.name == needProjData {
		patterns = append(projFolders(ctx, m), n.files...)
	}
	for _, p := range patterns {
		if found := m.glob(p); len(found) > 0 {
			return finding{need: n, found: true, through: byFile, detail: found[0]}
		}
	}
	return finding{need: n, detail: "none of these is there: " + strings.Join(patterns, ", ")}
}

// projFolders gives where proj.db lies by the environment or by PROJ's own entry.
func projFolders(ctx context.Context, m machine) []string {
	var out []string
	for _, name := range []string{"PROJ_DATA", "PROJ_LIB"} {
		for _, dir := range filepath.SplitList(m.getenv(name)) {
			out = append(out, filepath.Join(dir, "proj.db"))
		}
	}
	pc := pkgConfig(m)
	if _, ok := m.lookPath(pc); !ok {
		return out
	}
	dir, err := m.output(ctx, command{argv: []string{pc, "--variable=datadir", "proj"}})
	if dir = strings.TrimSpace(dir); err == nil && dir != "" {
		out = append(out, filepath.Join(dir, "proj.db"), filepath.Join(dir, "proj", "proj.db"))
	}
	return out
}

// atLeast compares versions part by part as numbers; a part that is no number counts by the
// digits it begins with ("0dev" is 0).
func atLeast(have, want string) bool {
	h, w := strings.Split(have, "."), strings.Split(want, ".")
	for i := range w {
		var hn int
		if i < len(h) {
			hn = leadingNumber(h[i])
		}
		if wn := leadingNumber(w[i]); hn != wn {
			return hn > wn
		}
	}
	return true
}

func leadingNumber(s string) int {
	end := strings.IndexFunc(s, func(r rune) bool { return r < '0' || r > '9' })
	if end < 0 {
		end = len(s)
	}
	n, err := strconv.Atoi(s[:end])
	if err != nil {
		return 0
	}
	return n
}

// firstLine gives the first line that a failed program printed, or its error where it
// printed nothing.
func firstLine(out string, err error) string {
	for l := range strings.Lines(out) {
		if l = strings.TrimSpace(l); l != "" {
			return l
		}
	}
	if err == nil {
		return "it printed nothing"
	}
	return err.Error()
}
