package main

import (
	"bytes"
	"context"
	"io"
	"os"
	"os/exec"
	"path/filepath"
	"runtime"
	"strings"
	"time"
)

// command is one program run.
type command struct {
	dir  string   // working directory; empty means the current one
	env  []string // added to the environment, as NAME=value
	in   string   // standard input
	argv []string
}

// String gives the command as it would be typed.
func (c command) String() string {
	parts := append([]string(nil), c.env...)
	for _, a := range c.argv {
		parts = append(parts, shellQuote(a))
	}
	return strings.Join(parts, " ")
}

// shellQuote quotes a for a POSIX shell where that is needed.
func shellQuote(a string) string {
	plain := a != "" && strings.IndexFunc(a, func(r rune) bool {
		return !(r >= 'a' && r <= 'z' || r >= 'A' && r <= 'Z' || r >= '0' && r <= '9' || strings.ContainsRune("-_./:=+,@%", r))
	}) < 0
	if plain {
		return a
	}
	return "'" + strings.ReplaceAll(a, "'", `'\''`) + "'"
}

// machine is what the set-up asks of the computer it runs on; tests put a described one in
// its place.
type machine interface {
	goos() string
	euid() int
	getenv(name string) string
	lookPath(program string) (string, bool)
	readFile(path string) ([]byte, error)
	glob(pattern string) []string
	// output runs c quietly; out is what it printed, errors included.
	output(ctx context.Context, c command) (out string, err error)
	// stream runs c and sends its lines on as they come.
	stream(ctx context.Context, c command, stdout, stderr io.Writer) error
}

// thisMachine is the real one.
type thisMachine struct{}

func (thisMachine) goos() string                         { return runtime.GOOS }
func (thisMachine) euid() int                            { return os.Geteuid() }
func (thisMachine) getenv(name string) string            { return os.Getenv(name) }
func (thisMachine) readFile(path string) ([]byte, error) { return os.ReadFile(path) }

func (thisMachine) lookPath(program string) (string, bool) {
	p, err := exec.LookPath(program)
	return p, err == nil
}

func (thisMachine) glob(pattern string) []string {
	found, err := filepath.Glob(pattern)
	if err != nil { // only a malformed pattern, which the test of the table of needs would show
		return nil
	}
	return found
}

func (m thisMachine) output(ctx context.Context, c command) (string, error) {
	var b bytes.Buffer
	err := m.stream(ctx, c, &b, &b)
	return b.String(), err
}

func (thisMachine) stream(ctx context.Context, c command, stdout, stderr io.Writer) error {
	cmd := exec.CommandContext(ctx, c.argv[0], c.argv[1:]...)
	cmd.Dir = c.dir
	cmd.Env = append(os.Environ(), c.env...)
	cmd.Stdin = strings.NewReader(c.in)
	cmd.Stdout, cmd.Stderr = stdout, stderr
	ownGroup(cmd)
	// After the end of the context, pipes that a grandchild still holds are given up.
	cmd.WaitDelay = 10 * time.Second
	return cmd.Run()
}
