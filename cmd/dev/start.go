package main

import (
	"context"
	"errors"
	"fmt"
	"os"
	"path/filepath"
	"runtime"
)

const (
	terminalFolder = "cmd/gtally"
	windowFolder   = "cmd/groundtally"
	binFolder      = ".build/bin"
)

// start builds the programs and opens the sample study: in the window where there is a screen to
// show it on, else with the terminal program. Without a named file the window opens the sample at
// its first start, and later offers it beside the last study.
func (w workshop) start(ctx context.Context, study string, terminal bool) error {
	if !w.has(terminalFolder) {
		return &failure{what: "this checkout has no " + terminalFolder + ", so there is nothing to start", advice: "take a complete checkout"}
	}
	packages := []string{"./" + terminalFolder}
	window := w.has(windowFolder) && !terminal
	if window && !w.screen() {
		fmt.Fprintln(w.stderr, "start: no screen (neither DISPLAY nor WAYLAND_DISPLAY is set), so the terminal program is used")
		window = false
	}
	if window {
		packages = append(packages, "./"+windowFolder)
	}
	bin := filepath.Join(w.root, filepath.FromSlash(binFolder))
	if err := os.MkdirAll(bin, 0o755); err != nil {
		return fmt.Errorf("make the folder for the programs: %w", err)
	}
	// The separator at the end makes the go command take it as a folder.
	if err := w.build(ctx, packages, "-o", bin+string(filepath.Separator)); err != nil {
		return err
	}
	if window {
		argv := []string{program(bin, "groundtally")}
		if study != "" {
			argv = append(argv, "--sample", study)
		}
		return w.show(ctx, "start", command{argv: argv}, "start it without the window: go run ./cmd/dev start -terminal")
	}
	gtally := program(bin, "gtally")
	if study == "" {
		study = sampleStudy()
	}
	if err := w.sample(ctx, gtally, study); err != nil {
		return err
	}
	for _, verb := range []string{"compute", "order"} {
		// The program shows progress of its own on a terminal alone, and this is none for it.
		stop := watch(w.stderr, w.every, func() string { return "start: gtally " + verb + " is at work" })
		err := w.show(ctx, "start", command{argv: []string{gtally, verb, study}},
			"look for what the study lacks: "+command{argv: []string{gtally, "check", study}}.String()+"\na fresh study: delete "+shellQuote(study)+", then run this again")
		stop()
		if err != nil {
			return err
		}
	}
	fmt.Fprintf(w.stderr, "start: the study is %s, the program is %s (%s help lists its verbs)\n", study, gtally, gtally)
	return nil
}

// sample makes the sample study where it is not there yet. A study that is there is kept: it
// may hold what its user tried out.
func (w workshop) sample(ctx context.Context, gtally, study string) error {
	_, err := os.Stat(study)
	if err == nil {
		fmt.Fprintf(w.stderr, "start: the study is there already and is used again: %s\n", study)
		return nil
	}
	if !errors.Is(err, os.ErrNotExist) {
		return fmt.Errorf("look for the study: %w", err)
	}
	if err := os.MkdirAll(filepath.Dir(study), 0o755); err != nil {
		return fmt.Errorf("make the folder for the study: %w", err)
	}
	return w.show(ctx, "start", command{argv: []string{gtally, "new", study, "--sample"}},
		"name another file: go run ./cmd/dev start -study FILE")
}

// screen reports whether a window can be shown.
func (w workshop) screen() bool {
	return w.m.goos() != "linux" || w.m.getenv("DISPLAY") != "" || w.m.getenv("WAYLAND_DISPLAY") != ""
}

func program(folder, name string) string {
	if runtime.GOOS == "windows" {
		name += ".exe"
	}
	return filepath.Join(folder, name)
}

// sampleStudy gives where the sample study lies when no file is named: in the user's cache,
// since it can always be made again; without a home, in the system's temporary folder.
func sampleStudy() string {
	dir, err := os.UserCacheDir()
	if err != nil {
		dir = os.TempDir()
	}
	return filepath.Join(dir, "groundtally", "marram.gpkg")
}
