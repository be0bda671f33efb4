package main

import (
	"bytes"
	"fmt"
	"io"
	"strings"
	"sync"
	"time"
)

// sharedWriter lets progress lines and a program's output share one place.
type sharedWriter struct {
	mu sync.Mutex
	w  io.Writer
}

func (s *sharedWriter) Write(p []byte) (int, error) {
	s.mu.Lock()
	defer s.mu.Unlock()
	return s.w.Write(p)
}

// watch prints a line with the time that has gone by and the state of the work, every so
// often until stop is called. It is the same on a terminal and in a log: whole lines.
func watch(out io.Writer, every time.Duration, state func() string) (stop func()) {
	begun := time.Now()
	quit, done := make(chan struct{}), make(chan struct{})
	go func() {
		defer close(done)
		tick := time.NewTicker(every)
		defer tick.Stop()
		for {
			select {
			case <-quit:
				return
			case <-tick.C:
				fmt.Fprintf(out, "[%s] %s\n", elapsed(time.Since(begun)), state())
			}
		}
	}()
	return func() { close(quit); <-done }
}

// elapsed prints a duration in minutes and whole seconds.
func elapsed(d time.Duration) string {
	s := int(d.Round(time.Second) / time.Second)
	if s < 60 {
		return fmt.Sprintf("%d s", s)
	}
	return fmt.Sprintf("%d min %02d s", s/60, s%60)
}

// A lineSplitter calls take for each whole line written to it; close gives it the rest.
type lineSplitter struct {
	take func(line string)
	rest []byte
}

func (l *lineSplitter) Write(p []byte) (int, error) {
	l.rest = append(l.rest, p...)
	for {
		i := bytes.IndexByte(l.rest, '\n')
		if i < 0 {
			return len(p), nil
		}
		l.take(string(l.rest[:i]))
		l.rest = l.rest[i+1:]
	}
}

func (l *lineSplitter) close() {
	if len(l.rest) > 0 {
		l.take(string(l.rest))
		l.rest = nil
	}
}

// A buildState follows "go build -v": names of packages as their compilation begins and
// modules as they are fetched. All else, compiler messages mostly, goes on to through.
type buildState struct {
	mu       sync.Mutex
	through  io.Writer
	packages int
	modules  int
	last     string
}

func (b *buildState) line(l string) {
	b.mu.Lock()
	defer b.mu.Unlock()
	switch {
	case strings.HasPrefix(l, "go: downloading "):
		b.modules++
		b.last = strings.TrimPrefix(l, "go: ")
	case l != "" && !strings.ContainsAny(l, " \t#:"):
		b.packages++
		b.last = "compiling " + l
	default:
		fmt.Fprintln(b.through, l)
	}
}

// String says how far the build is.
func (b *buildState) String() string {
	b.mu.Lock()
	defer b.mu.Unlock()
	s := fmt.Sprintf("%d packages compiled", b.packages)
	if b.modules > 0 {
		s = fmt.Sprintf("%d modules fetched, %s", b.modules, s)
	}
	if b.last == "" {
		return s + ", reading the sources"
	}
	return s + ", now " + b.last
}

// A testState follows the lines of "go test".
type testState struct {
	mu               sync.Mutex
	ok, failed, none int
	last             string
}

func (t *testState) line(l string) {
	t.mu.Lock()
	defer t.mu.Unlock()
	fields := strings.Fields(l)
	if len(fields) < 2 {
		return
	}
	switch {
	case strings.HasPrefix(l, "ok  \t"):
		t.ok++
		t.last = fields[1]
	case strings.HasPrefix(l, "FAIL\t"):
		t.failed++
		t.last = fields[1]
	case strings.HasPrefix(l, "?   \t"):
		t.none++
	}
}

// String says how many packages are through.
func (t *testState) String() string {
	t.mu.Lock()
	defer t.mu.Unlock()
	if t.ok+t.failed == 0 {
		return "testing: compiling, or in the first package"
	}
	s := fmt.Sprintf("testing: %d packages passed, %d failed", t.ok, t.failed)
	if t.last != "" {
		s += ", last " + t.last
	}
	return s
}
