package main

import (
	"bytes"
	"context"
	"encoding/json"
	"fmt"
	"go/ast"
	"go/parser"
	"go/token"
	"path/filepath"
	"slices"
	"strings"
	"time"
)

// A target is one test function, found by its name.
type target struct {
	pkg  string // import path
	name string
}

// targets finds functions of test files whose name begins with prefix, under the build tags
// given, without compiling anything.
func (w workshop) targets(ctx context.Context, tags, prefix string) ([]target, error) {
	// With -e a package that does not compile hides no other; testing it will tell.
	c := command{dir: w.root, argv: []string{"go", "list", "-e", "-tags", tags, "-json=ImportPath,Dir,TestGoFiles,XTestGoFiles", "./..."}}
	var out, said bytes.Buffer
	if err := w.m.stream(ctx, c, &out, &said); err != nil {
		return nil, &failure{what: "could not list the packages", typed: c.String(), said: said.String(), err: err, advice: "mend what the answer names, then run this again"}
	}
	var found []target
	dec := json.NewDecoder(&out)
	for dec.More() {
		var p struct {
			ImportPath, Dir           string
			TestGoFiles, XTestGoFiles []string
		}
		if err := dec.Decode(&p); err != nil {
			return nil, fmt.Errorf("read what %s printed: %w", c, err)
		}
		for _, f := range append(p.TestGoFiles, p.XTestGoFiles...) {
			names, err := functions(filepath.Join(p.Dir, f), nil, prefix)
			if err != nil {
				return nil, err
			}
			for _, n := range names {
				found = append(found, target{p.ImportPath, n})
			}
		}
	}
	return found, nil
}

// functions lists the plain functions in a Go file whose name begins with prefix; src is its
// text, or nil for the file's own.
func functions(path string, src any, prefix string) ([]string, error) {
	f, err := parser.ParseFile(token.NewFileSet(), path, src, parser.SkipObjectResolution)
	if err != nil {
		return nil, fmt.Errorf("look for tests: %w", err)
	}
	var names []string
	for _, d := range f.Decls {
		if fn, ok := d.(*ast.FuncDecl); ok && fn.Recv == nil && strings.HasPrefix(fn.Name.Name, prefix) {
			names = append(names, fn.Name.Name)
		}
	}
	return names, nil
}

// fuzz gives every fuzz target its time, one after the other, and goes on after a failure.
func (w workshop) fuzz(ctx context.Context, pattern string, each time.Duration) error {
	all, err := w.targets(ctx, buildTags, "Fuzz")
	if err != nil {
		return err
	}
	all = slices.DeleteFunc(all, func(t target) bool { return !strings.Contains(t.pkg+"."+t.name, pattern) })
	if len(all) == 0 {
		return &failure{what: fmt.Sprintf("no fuzz target has %q in its name", pattern), advice: "all of them: go run ./cmd/dev fuzz"}
	}
	var failed []string
	for i, t := range all {
		fmt.Fprintf(w.stderr, "fuzz: %d of %d: %s in %s, for %s\n", i+1, len(all), t.name, t.pkg, each)
		err := w.goTest(ctx, "-vet=off", "-run", "^$", "-fuzz", "^"+t.name+"$", "-fuzztime", each.String(), t.pkg)
		if ctx.Err() != nil {
			return err
		}
		if err != nil {
			fmt.Fprintf(w.stderr, "%v\n", err)
			failed = append(failed, t.pkg+"."+t.name)
		}
	}
	if len(failed) > 0 {
		return &failure{what: fmt.Sprintf("%d of %d fuzz targets failed: %s", len(failed), len(all), strings.Join(failed, ", ")),
			advice: "the input that failed was written to testdata/fuzz of that package; keep it as a test, then mend the code"}
	}
	fmt.Fprintf(w.stderr, "fuzz: all %d targets held for %s each\n", len(all), each)
	return nil
}

// A special is a family of tests with a name, run by a command of its own.
type special struct {
	prefix string   // of the test functions
	tag    string   // the build tag that switches them on; empty when they run always
	env    []string // tells the tests how much
	args   []string
}

// special runs a family of tests, and refuses when there is none: an empty run is no proof.
func (w workshop) special(ctx context.Context, s special) error {
	tags := buildTags
	if s.tag != "" {
		tags += "," + s.tag
	}
	all, err := w.targets(ctx, tags, s.prefix)
	if err != nil {
		return err
	}
	if len(all) == 0 {
		what := "no test has a name that begins with " + s.prefix
		if s.tag != "" {
			what += " (behind the build tag " + s.tag + ")"
		}
		return &failure{what: what, advice: "write one; nothing was run"}
	}
	var pkgs []string
	for _, t := range all {
		if !slices.Contains(pkgs, t.pkg) {
			pkgs = append(pkgs, t.pkg)
		}
	}
	argv := append([]string{"go", "test", "-tags", tags, "-vet=off", "-v", "-run", "^" + s.prefix, "-timeout", "0"}, s.args...)
	return w.testLines(ctx, command{dir: w.root, env: s.env, argv: append(argv, pkgs...)})
}
