package main

import (
	"context"
	"errors"
	"fmt"
	"io"
	"os"
	"path/filepath"
	"strings"
	"time"
)

// buildTags are the build tags of every build: the window's toolkit takes the one given here
// as the promise that its objects are touched on its own thread alone.
const buildTags = "migrated_fynedo"

// heavyTags switch on the tests that take too long for every change; vet reads them always.
const heavyTags = "soak,scale"

// A workshop is the checkout with what is needed to run the go command in it.
type workshop struct {
	m      machine
	root   string
	stdout io.Writer
	stderr io.Writer
	every  time.Duration // between progress lines
}

// findRoot walks up from dir to the folder of this module's go.mod.
func findRoot(dir string) (string, error) {
	for d := dir; ; {
		data, err := os.ReadFile(filepath.Join(d, "go.mod"))
		if err == nil && strings.HasPrefix(string(data), "module groundtally\n") {
			return d, nil
		}
		up := filepath.Dir(d)
		if up == d {
			return "", &failure{what: "this is not a folder of Groundtally's source: " + dir, advice: "change into the checkout, then run this again"}
		}
		d = up
	}
}

func (w workshop) has(folder string) bool {
	info, err := os.Stat(filepath.Join(w.root, filepath.FromSlash(folder)))
	return err == nil && info.IsDir()
}

// build compiles packages with progress; args stand before them.
func (w workshop) build(ctx context.Context, packages []string, args ...string) error {
	argv := append([]string{"go", "build", "-v", "-tags", buildTags}, args...)
	return w.compile(ctx, "build", command{dir: w.root, argv: append(argv, packages...)})
}

// compile runs a go command that prints packages as it compiles them.
func (w workshop) compile(ctx context.Context, what string, c command) error {
	begun := time.Now()
	fmt.Fprintf(w.stderr, "%s: %s\n", what, c)
	state := &buildState{through: w.stderr}
	lines := &lineSplitter{take: state.line}
	stop := watch(w.stderr, w.every, func() string { return what + ": " + state.String() })
	err := w.m.stream(ctx, c, w.stdout, lines)
	stop()
	lines.close()
	if err != nil {
		return w.failed(ctx, "the "+what+" failed", c, err, "read the messages above: a missing header or library is looked for by: go run ./cmd/dev doctor\na module that cannot be fetched needs the module proxy (go env GOPROXY) or a filled module cache")
	}
	fmt.Fprintf(w.stderr, "%s: done in %s\n", what, elapsed(time.Since(begun)))
	return nil
}

// show runs a command whose output is for the user.
func (w workshop) show(ctx context.Context, what string, c command, advice string) error {
	fmt.Fprintf(w.stderr, "%s: %s\n", what, c)
	if err := w.m.stream(ctx, c, w.stdout, w.stderr); err != nil {
		return w.failed(ctx, what+" failed", c, err, advice)
	}
	return nil
}

func (w workshop) failed(ctx context.Context, what string, c command, err error, advice string) error {
	if ctx.Err() != nil {
		return fmt.Errorf("stopped during %s: %w", c, context.Cause(ctx))
	}
	return &failure{what: what, typed: c.String(), err: err, advice: advice}
}

// goTest runs go test, sending its lines on unchanged and progress to the other stream.
func (w workshop) goTest(ctx context.Context, args ...string) error {
	c := command{dir: w.root, argv: append([]string{"go", "test", "-tags", buildTags}, args...)}
	return w.testLines(ctx, c)
}

func (w workshop) testLines(ctx context.Context, c command) error {
	begun := time.Now()
	fmt.Fprintf(w.stderr, "test: %s\n", c)
	state := &testState{}
	lines := &lineSplitter{take: func(l string) {
		state.line(l)
		fmt.Fprintln(w.stdout, l)
	}}
	stop := watch(w.stderr, w.every, state.String)
	err := w.m.stream(ctx, c, lines, w.stderr)
	stop()
	lines.close()
	fmt.Fprintf(w.stderr, "test: %s, in %s\n", strings.TrimPrefix(state.String(), "testing: "), elapsed(time.Since(begun)))
	if err == nil && state.ok+state.failed == 0 {
		return &failure{what: "no package ran a test", typed: c.String(), advice: "look at the names of packages and tests given"}
	}
	if err == nil && state.failed > 0 { // never seen, and then not to be called a success
		err = errors.New("go test ended well although packages failed")
	}
	if err != nil {
		return w.failed(ctx, "tests failed", c, err, "read the lines above that begin with --- FAIL or FAIL\none test alone: go test -tags "+buildTags+" -run '^TestName$' -v ./folder")
	}
	return nil
}
