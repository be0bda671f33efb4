package main

import (
	"bytes"
	"context"
	"errors"
	"fmt"
	"os"
	"os/exec"
	"path/filepath"
	"runtime"
	"strings"
	"sync"
	"testing"
	"time"
)

// built is the program, built once for all tests.
var built = sync.OnceValues(func() (string, error) {
	dir, err := os.MkdirTemp("", "groundtally-test-")
	if err != nil {
		return "", err
	}
	path := filepath.Join(dir, "groundtally")
	if runtime.GOOS == "windows" {
		path += ".exe"
	}
	if out, err := exec.Command("go", "build", "-tags", "migrated_fynedo", "-o", path, ".").CombinedOutput(); err != nil {
		return path, fmt.Errorf("build: %w\n%s", err, out)
	}
	return path, nil
})

func TestMain(m *testing.M) {
	code := m.Run()
	if path, err := built(); err == nil {
		_ = os.RemoveAll(filepath.Dir(path))
	}
	os.Exit(code)
}

func program(t *testing.T) string {
	t.Helper()
	path, err := built()
	if err != nil {
		t.Fatal(err)
	}
	return path
}

// said is what a program that ended by itself has left.
type said struct {
	code     int
	out, err string
}

// run runs the program to its end, with a home of its own.
func run(t *testing.T, env []string, args ...string) said {
	t.Helper()
	ctx, stop := context.WithTimeout(context.Background(), time.Minute)
	defer stop()
	cmd := exec.CommandContext(ctx, program(t), args...)
	home := t.TempDir()
	cmd.Env = append(append(plainEnv(), "HOME="+home, "XDG_CACHE_HOME="+home, "XDG_CONFIG_HOME="+home), env...)
	cmd.WaitDelay = 5 * time.Second
	var out, errs bytes.Buffer
	cmd.Stdout, cmd.Stderr = &out, &errs
	err := cmd.Run()
	var exit *exec.ExitError
	if ctx.Err() != nil {
		t.Fatalf("the program has not ended after a minute; it says:\n%s%s", out.String(), errs.String())
	}
	if err != nil && !errors.As(err, &exit) {
		t.Fatal(err)
	}
	return said{cmd.ProcessState.ExitCode(), out.String(), errs.String()}
}

// explained checks that no window came, that the reason is said in plain words, and what to do instead.
func explained(t *testing.T, s said, words ...string) {
	t.Helper()
	if s.code != 5 {
		t.Errorf("exit code %d, want 5", s.code)
	}
	for _, want := range append(words, "gtally order") {
		if !strings.Contains(s.err, want) {
			t.Errorf("it does not say %q:\n%s", want, s.err)
		}
	}
	for _, code := range []string{"goroutine", "panic", ".go:", "0x"} {
		if strings.Contains(s.err+s.out, code) {
			t.Errorf("it says %q, which helps nobody:\n%s%s", code, s.err, s.out)
		}
	}
}

// Without a screen the program says so, and names the program that needs none.
func TestNoScreen(t *testing.T) {
	onLinux(t)
	explained(t, run(t, nil), "no screen", "DISPLAY")
	explained(t, run(t, nil, "our place.gpkg"), "no screen", "gtally order our place.gpkg")
}

// A screen that does not answer is named.
func TestUnreachableScreen(t *testing.T) {
	onLinux(t)
	explained(t, run(t, []string{"DISPLAY=:9999"}), "the screen :9999 cannot be reached")
	explained(t, run(t, []string{"WAYLAND_DISPLAY=nowhere"}), "the screen nowhere cannot be reached")
}

// A screen without OpenGL is told apart from one that is not there, and nothing is begun on it.
func TestNoOpenGL(t *testing.T) {
	onLinux(t)
	s := newScreen(t, "-extension", "GLX")
	cache := t.TempDir()
	got := run(t, []string{"DISPLAY=" + s.display, "XDG_CACHE_HOME=" + cache})
	explained(t, got, "no OpenGL", "graphics driver", "window-report.txt")
	if report, err := os.ReadFile(filepath.Join(cache, "groundtally", "window-report.txt")); err != nil || !strings.Contains(string(report), "GLX") {
		t.Errorf("what the graphics system said is not kept: %v\n%s", err, report)
	}
	if _, err := os.Stat(filepath.Join(cache, "groundtally", "marram.gpkg")); !errors.Is(err, os.ErrNotExist) {
		t.Errorf("a study was begun without a window: %v", err)
	}
}

// What is typed wrongly is answered before anything is opened.
func TestUsage(t *testing.T) {
	for _, c := range []struct {
		args     []string
		code     int
		out, err []string
	}{
		{[]string{"--help"}, 0, []string{"opens the window", "--sample", "gtally"}, nil},
		{[]string{"-h"}, 0, []string{"opens the window"}, nil},
		{[]string{"help"}, 0, []string{"opens the window"}, nil},
		{[]string{"--colour"}, 2, nil, []string{"no option --colour", "groundtally STUDY.gpkg"}},
		{[]string{"one.gpkg", "two.gpkg"}, 2, nil, []string{"one study at a time", "one.gpkg", "two.gpkg"}},
	} {
		got := run(t, nil, c.args...)
		if got.code != c.code {
			t.Errorf("%q: exit code %d, want %d", c.args, got.code, c.code)
		}
		for _, w := range []struct {
			where, text string
			wants       []string
		}{{"output", got.out, c.out}, {"errors", got.err, c.err}} {
			if len(w.wants) == 0 && w.text != "" {
				t.Errorf("%q: %s %q, want none", c.args, w.where, w.text)
			}
			for _, want := range w.wants {
				if !strings.Contains(w.text, want) {
					t.Errorf("%q: %s without %q:\n%s", c.args, w.where, want, w.text)
				}
			}
		}
	}
}
