package main

import (
	"bytes"
	"context"
	"errors"
	"fmt"
	"go/format"
	"io/fs"
	"os"
	"path/filepath"
	"strings"
	"time"
)

// testTimeout is how long the tests of one package may take.
const testTimeout = 25 * time.Minute

// test runs what every change must pass. All parts run even when one fails, so that a
// contributor sees everything at once; tests run last, so that their lines close the output.
func (w workshop) test(ctx context.Context, packages []string, limit time.Duration) error {
	var failed []string
	note := func(check string, err error) {
		if err != nil {
			fmt.Fprintf(w.stderr, "%v\n", err)
			failed = append(failed, check)
		}
	}
	note("formatting", w.formatting())
	built := w.build(ctx, packages)
	note("build", built)
	if built == nil { // vet would only say the same again
		note("vet", w.vet(ctx, packages))
	}
	if err := ctx.Err(); err != nil {
		return context.Cause(ctx)
	}
	timed, cancel := context.WithTimeoutCause(ctx, limit, fmt.Errorf("the tests took longer than %s", limit))
	defer cancel()
	// Results are never taken from the cache: some tests look at the whole checkout through
	// the go command, which the cache does not know of.
	args := []string{"-vet=off", "-count=1", "-timeout", min(testTimeout, limit).String()}
	note("tests", w.goTest(timed, append(args, packages...)...))
	if len(failed) > 0 {
		return &failure{what: "these checks failed, why stands above: " + strings.Join(failed, ", ")}
	}
	fmt.Fprintln(w.stderr, "all checks passed: formatting, build, vet, tests")
	return nil
}

func (w workshop) vet(ctx context.Context, packages []string) error {
	argv := []string{"go", "vet", "-v", "-tags", buildTags + "," + heavyTags}
	return w.compile(ctx, "vet", command{dir: w.root, argv: append(argv, packages...)})
}

// formatting compares every Go file with what gofmt writes.
func (w workshop) formatting() error {
	files, wrong, err := unformatted(os.DirFS(w.root))
	if err != nil {
		return fmt.Errorf("formatting: %w", err)
	}
	if len(wrong) > 0 {
		return &failure{what: "not formatted as gofmt does it: " + strings.Join(wrong, ", "), advice: "type: gofmt -w " + strings.Join(wrong, " ")}
	}
	fmt.Fprintf(w.stderr, "formatting: %d files, all as gofmt writes them\n", files)
	return nil
}

// unformatted gives the number of Go files and the names of those that gofmt would change.
// Folders that the go command passes over are passed over here.
func unformatted(fsys fs.FS) (files int, wrong []string, err error) {
	err = fs.WalkDir(fsys, ".", func(p string, d fs.DirEntry, err error) error {
		if err != nil {
			return err
		}
		name := d.Name()
		if d.IsDir() {
			if p != "." && (strings.HasPrefix(name, ".") || strings.HasPrefix(name, "_") || name == "testdata") {
				return fs.SkipDir
			}
			return nil
		}
		if filepath.Ext(name) != ".go" {
			return nil
		}
		have, err := fs.ReadFile(fsys, p)
		if err != nil {
			return err
		}
		files++
		want, err := format.Source(have)
		if err != nil || !bytes.Equal(have, want) {
			wrong = append(wrong, p)
		}
		return nil
	})
	return files, wrong, err
}

// linter is the pinned version of the linter.
const linter = "github.com/golangci/golangci-lint/v2/cmd/golangci-lint@v2.15.0"

// lint runs the linter over the rules in .golangci.yml.
func (w workshop) lint(ctx context.Context, packages []string) error {
	c := command{dir: w.root, argv: append([]string{"go", "run", linter, "run"}, packages...)}
	begun := time.Now()
	fmt.Fprintf(w.stderr, "lint: %s\n", c)
	stop := watch(w.stderr, w.every, func() string {
		return "lint: at work (the first time the linter itself is fetched and compiled, which takes some minutes)"
	})
	err := w.m.stream(ctx, c, w.stdout, w.stderr)
	stop()
	if err != nil {
		return w.failed(ctx, "the linter found faults or did not run", c, err, "read the lines above; rules and their reasons stand in .golangci.yml")
	}
	fmt.Fprintf(w.stderr, "lint: done in %s\n", elapsed(time.Since(begun)))
	return nil
}

// race runs the tests under the race detector.
func (w workshop) race(ctx context.Context, packages []string) error {
	return w.goTest(ctx, append([]string{"-race", "-vet=off", "-count=1", "-timeout", "60m"}, packages...)...)
}

// bench runs benchmarks alone.
func (w workshop) bench(ctx context.Context, packages []string, each time.Duration, pattern string) error {
	return w.goTest(ctx, append([]string{"-vet=off", "-run", "^$", "-bench", pattern, "-benchmem", "-benchtime", each.String(), "-timeout", "60m"}, packages...)...)
}

// regenerate makes the sample study's files anew.
func (w workshop) regenerate(ctx context.Context) error {
	if !w.has("sampledata") {
		return errors.New("this checkout has no sampledata folder")
	}
	c := command{dir: w.root, argv: []string{"go", "generate", "-x", "./sampledata/..."}}
	return w.show(ctx, "sample", c, "read the messages above; the generator lies in sampledata")
}
