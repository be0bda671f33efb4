package main

import (
	"bytes"
	"context"
	"errors"
	"fmt"
	"io"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"testing"
	"testing/fstest"
	"time"
)

// A script plays the go command: what it prints and how it ends, by the first words typed.
type script struct {
	described
	plays map[string]play
	typed []string
}

type play struct {
	out, errOut string
	err         error
	waits       bool // until stopped
}

func (s *script) stream(ctx context.Context, c command, stdout, stderr io.Writer) error {
	line := strings.Join(c.argv, " ")
	s.typed = append(s.typed, c.String())
	for begin, p := range s.plays {
		if !strings.HasPrefix(line, begin) {
			continue
		}
		io.WriteString(stdout, p.out)
		io.WriteString(stderr, p.errOut)
		if p.waits {
			<-ctx.Done()
			return errors.New("signal: terminated")
		}
		return p.err
	}
	return fmt.Errorf("the script has no %q", line)
}

// checkout makes a folder with a Go file and a workshop over it.
func checkout(t *testing.T, plays map[string]play) (w workshop, s *script, out, errOut *bytes.Buffer) {
	t.Helper()
	root := t.TempDir()
	write(t, root, "go.mod", "module groundtally\n")
	write(t, root, "geo/a.go", "package geo\n")
	s = &script{described: described{system: "linux"}, plays: plays}
	out, errOut = &bytes.Buffer{}, &bytes.Buffer{}
	return workshop{m: s, root: root, stdout: &sharedWriter{w: out}, stderr: &sharedWriter{w: errOut}, every: time.Hour}, s, out, errOut
}

func write(t *testing.T, root, name, text string) {
	t.Helper()
	p := filepath.Join(root, filepath.FromSlash(name))
	if err := os.MkdirAll(filepath.Dir(p), 0o755); err != nil {
		t.Fatal(err)
	}
	if err := os.WriteFile(p, []byte(text), 0o644); err != nil {
		t.Fatal(err)
	}
}

const passed = "ok  \tgroundtally/geo\t0.010s\n?   \tgroundtally/geo/x\t[no test files]\n"

func TestTestCommand(t *testing.T) {
	good := func() map[string]play {
		return map[string]play{"go build": {}, "go vet": {}, "go test": {out: passed}}
	}
	change := func(begin string, p play) map[string]play {
		m := good()
		m[begin] = p
		return m
	}
	tests := []struct {
		name  string
		plays map[string]play
		bad   string // part of what is said; empty: all passes
		tests bool   // go test is run
	}{
		{"all passes", good(), "", true},
		{"a test fails", change("go test", play{out: "--- FAIL: TestX (0.00s)\nFAIL\tgroundtally/geo\t0.010s\nFAIL\n", err: errExit}), "tests failed", true},
		{"a package fails though the command ends well", change("go test", play{out: "FAIL\tgroundtally/geo\t0.010s\n"}), "although packages failed", true},
		{"no test runs", change("go test", play{out: "?   \tgroundtally/geo\t[no test files]\n"}), "no package ran a test", true},
		{"vet finds a fault", change("go vet", play{errOut: "geo/a.go:1:1: fault\n", err: errExit}), "geo/a.go:1:1: fault", true},
		{"the build fails", change("go build", play{errOut: "geo/a.go:1:1: undefined\n", err: errExit}), "the build failed", true},
		{"the tests take too long", change("go test", play{out: passed, waits: true}), "took longer than", true},
	}
	for _, tt := range tests {
		t.Run(tt.name, func(t *testing.T) {
			w, s, out, errOut := checkout(t, tt.plays)
			limit := time.Hour
			if tt.plays["go test"].waits {
				limit = 20 * time.Millisecond
			}
			err := w.test(t.Context(), []string{"./..."}, limit)
			if (err == nil) != (tt.bad == "") {
				t.Fatalf("error %v", err)
			}
			if !strings.Contains(errOut.String(), tt.bad) {
				t.Errorf("nothing says %q:\n%s", tt.bad, errOut.String())
			}
			if err != nil && !strings.Contains(err.Error(), "these checks failed") {
				t.Errorf("the summary is %q", err)
			}
			if out.String() != tt.plays["go test"].out {
				t.Errorf("the lines of go test were changed: %q", out.String())
			}
			ran := slices.ContainsFunc(s.typed, func(c string) bool { return strings.HasPrefix(c, "go test -tags migrated_fynedo ") })
			if ran != tt.tests {
				t.Errorf("go test with the tag was run: %v; typed %q", ran, s.typed)
			}
		})
	}
}

func TestTestCommandSeesFormatting(t *testing.T) {
	w, _, _, errOut := checkout(t, map[string]play{"go build": {}, "go vet": {}, "go test": {out: passed}})
	write(t, w.root, "geo/b.go", "package geo\nvar  X = 1\n")
	if err := w.test(t.Context(), []string{"./..."}, time.Hour); err == nil {
		t.Error("a file that gofmt would change passes")
	}
	if !strings.Contains(errOut.String(), "gofmt -w geo/b.go") {
		t.Errorf("the file is not named:\n%s", errOut.String())
	}
}

func TestUnformatted(t *testing.T) {
	fsys := fstest.MapFS{
		"good.go":          {Data: []byte("package a\n")},
		"a/spaces.go":      {Data: []byte("package a\nvar  X int\n")},
		"a/broken.go":      {Data: []byte("package\n")},
		"a/text.md":        {Data: []byte("var  X int")},
		"testdata/skip.go": {Data: []byte("package\n")},
		".build/skip.go":   {Data: []byte("package\n")},
	}
	files, wrong, err := unformatted(fsys)
	if err != nil || files != 3 || !slices.Equal(wrong, []string{"a/broken.go", "a/spaces.go"}) {
		t.Errorf("%d files, wrong %q, error %v", files, wrong, err)
	}
}

func TestStart(t *testing.T) {
	all := map[string]play{"go build": {errOut: "groundtally/geo\n"}}
	tests := []struct {
		name     string
		folders  []string
		env      map[string]string
		terminal bool
		there    bool     // the study
		typed    []string // program and verb
		bad      string
	}{
		{"nothing to start", nil, nil, false, false, nil, "no cmd/gtally"},
		{"terminal program alone", []string{terminalFolder}, nil, false, false, []string{"gtally new", "gtally compute", "gtally order"}, ""},
		{"the study is used again", []string{terminalFolder}, nil, false, true, []string{"gtally compute", "gtally order"}, ""},
		{"window", []string{terminalFolder, windowFolder}, map[string]string{"DISPLAY": ":0"}, false, false, []string{"groundtally"}, ""},
		{"window on Wayland", []string{terminalFolder, windowFolder}, map[string]string{"WAYLAND_DISPLAY": "wayland-0"}, false, true, []string{"groundtally"}, ""},
		{"no screen", []string{terminalFolder, windowFolder}, nil, false, true, []string{"gtally compute", "gtally order"}, ""},
		{"terminal wanted", []string{terminalFolder, windowFolder}, map[string]string{"DISPLAY": ":0"}, true, true, []string{"gtally compute", "gtally order"}, ""},
	}
	for _, tt := range tests {
		t.Run(tt.name, func(t *testing.T) {
			w, s, _, _ := checkout(t, all)
			s.env = tt.env
			bin := filepath.Join(w.root, filepath.FromSlash(binFolder))
			plays := map[string]play{bin: {}}
			for k, v := range all {
				plays[k] = v
			}
			s.plays = plays
			for _, f := range tt.folders {
				write(t, w.root, f+"/main.go", "package main\n")
			}
			study := filepath.Join(t.TempDir(), "studies", "marram.gpkg")
			if tt.there {
				write(t, filepath.Dir(study), "marram.gpkg", "")
			}
			err := w.start(t.Context(), study, tt.terminal)
			if (err == nil) != (tt.bad == "") || err != nil && !strings.Contains(err.Error(), tt.bad) {
				t.Fatalf("error %v, want %q", err, tt.bad)
			}
			var got []string
			for _, c := range s.typed {
				rest, ours := strings.CutPrefix(c, bin+string(filepath.Separator))
				if !ours {
					continue
				}
				if !strings.Contains(rest, study) {
					t.Errorf("%q does not name the study", rest)
				}
				rest = strings.TrimSpace(strings.Replace(rest, study, "", 1))
				got = append(got, strings.TrimSpace(strings.TrimSuffix(rest, "--sample")))
			}
			if !slices.Equal(got, tt.typed) {
				t.Errorf("typed %q, want %q", got, tt.typed)
			}
		})
	}
}

func TestBuildState(t *testing.T) {
	var through bytes.Buffer
	b := &buildState{through: &through}
	if got := b.String(); got != "0 packages compiled, reading the sources" {
		t.Errorf("at first: %q", got)
	}
	l := &lineSplitter{take: b.line}
	for _, part := range []string{"go: downloading a.org/x v1.2.3\nfyne.io/fy", "ne/v2\ngroundtally/geo\n# groundtally/geo\ngeo/a.go:1:2: undefined: x"} {
		if _, err := io.WriteString(l, part); err != nil {
			t.Fatal(err)
		}
	}
	l.close()
	if got := b.String(); got != "1 modules fetched, 2 packages compiled, now compiling groundtally/geo" {
		t.Errorf("state: %q", got)
	}
	if got := through.String(); got != "# groundtally/geo\ngeo/a.go:1:2: undefined: x\n" {
		t.Errorf("compiler messages were lost: %q", got)
	}
}

// Progress comes in whole lines while work is silent, and ends when told.
func TestWatch(t *testing.T) {
	lines := make(chan string, 1000)
	out := &lineSplitter{take: func(l string) { lines <- l }}
	stop := watch(out, time.Millisecond, func() string { return "at work" })
	for range 3 {
		if l := <-lines; l != "[0 s] at work" {
			t.Errorf("line %q", l)
		}
	}
	stop()
	for len(lines) > 0 {
		<-lines
	}
	time.Sleep(5 * time.Millisecond)
	if len(lines) > 0 {
		t.Error("it goes on after stop")
	}
}

func TestElapsed(t *testing.T) {
	for d, want := range map[time.Duration]string{0: "0 s", 59400 * time.Millisecond: "59 s", time.Minute: "1 min 00 s", 65 * time.Second: "1 min 05 s", 61 * time.Minute: "61 min 00 s"} {
		if got := elapsed(d); got != want {
			t.Errorf("elapsed(%s) = %q, want %q", d, got, want)
		}
	}
}

func TestFunctions(t *testing.T) {
	src := "package a\nfunc FuzzOne(f *F) {}\nfunc (x T) FuzzMethod() {}\nfunc helper() {}\nfunc FuzzTwo(f *F) {}\n"
	got, err := functions("a_test.go", src, "Fuzz")
	if err != nil || !slices.Equal(got, []string{"FuzzOne", "FuzzTwo"}) {
		t.Errorf("%q, %v", got, err)
	}
	if _, err := functions("a_test.go", "not go", "Fuzz"); err == nil {
		t.Error("a broken file gives no error")
	}
}

// listed gives a checkout whose "go list" names one package with one test file.
func listed(t *testing.T, text string, plays map[string]play) (workshop, *script, *bytes.Buffer) {
	t.Helper()
	w, s, _, errOut := checkout(t, plays)
	write(t, w.root, "geo/a_test.go", text)
	s.plays["go list"] = play{out: fmt.Sprintf(`{"ImportPath":"groundtally/geo","Dir":%q,"XTestGoFiles":["a_test.go"]}`, filepath.Join(w.root, "geo"))}
	return w, s, errOut
}

func TestFuzzGoesOnAfterAFailure(t *testing.T) {
	text := "package geo_test\nfunc FuzzOne(f *F) {}\nfunc FuzzTwo(f *F) {}\n"
	w, s, _ := listed(t, text, map[string]play{
		"go test -tags migrated_fynedo -vet=off -run ^$ -fuzz ^FuzzOne$": {out: "FAIL\tgroundtally/geo\t1s\n", err: errExit},
		"go test -tags migrated_fynedo -vet=off -run ^$ -fuzz ^FuzzTwo$": {out: passed},
	})
	err := w.fuzz(t.Context(), "", 3*time.Second)
	if err == nil || !strings.Contains(err.Error(), "1 of 2 fuzz targets failed: groundtally/geo.FuzzOne") {
		t.Errorf("error %v", err)
	}
	if last := s.typed[len(s.typed)-1]; !strings.Contains(last, "'^FuzzTwo$' -fuzztime 3s groundtally/geo") {
		t.Errorf("last typed %q", last)
	}
	if err := w.fuzz(t.Context(), "Three", time.Second); err == nil || !strings.Contains(err.Error(), "no fuzz target") {
		t.Errorf("a name that no target has gives %v", err)
	}
}

func TestSpecialRefusesAnEmptyRun(t *testing.T) {
	w, s, _ := listed(t, "package geo_test\nfunc TestSoakLong(t *T) {}\n", map[string]play{"go test": {out: passed}})
	if err := w.special(t.Context(), special{prefix: "TestKill"}); err == nil || !strings.Contains(err.Error(), "TestKill") {
		t.Errorf("a family without a test gives %v", err)
	}
	soak := special{prefix: "TestSoak", tag: "soak", env: []string{"GROUNDTALLY_SOAK_TIME=1s"}}
	if err := w.special(t.Context(), soak); err != nil {
		t.Error(err)
	}
	want := "GROUNDTALLY_SOAK_TIME=1s go test -tags migrated_fynedo,soak -vet=off -v -run '^TestSoak' -timeout 0 groundtally/geo"
	if last := s.typed[len(s.typed)-1]; last != want {
		t.Errorf("typed %q\nwant  %q", last, want)
	}
}

func TestMemory(t *testing.T) {
	fsys := fstest.MapFS{
		"assets/params/a.csv":  {Data: []byte("key,value,source,provenance\nk1,1,Book,read\nk2,2,Paper,memory\n")},
		"testdata/check/b.csv": {Data: []byte("check,quantity,source,provenance\nc1,q,Hand,memory\n")},
		"testdata/check/x.md":  {Data: []byte("not a table")},
	}
	var out bytes.Buffer
	n, err := memory(fsys, &out)
	want := "assets/params/a.csv:3: key k2, value 2; source: Paper\ntestdata/check/b.csv:2: check c1, quantity q; source: Hand\n2 of 3 rows in 2 tables rest on memory\n"
	if err != nil || n != 2 || out.String() != want {
		t.Errorf("%d, %v:\n%s", n, err, out.String())
	}
	fsys["testdata/check/c.csv"] = &fstest.MapFile{Data: []byte("check,quantity,source,provenance\nc1,q,,memory\n")}
	if _, err := memory(fsys, io.Discard); err == nil {
		t.Error("a row without a source passes")
	}
}

func TestUsage(t *testing.T) {
	tests := []struct {
		args []string
		code int
		says string
	}{
		{nil, 2, "usage"},
		{[]string{"help"}, 0, "start"},
		{[]string{"nonsense"}, 2, `no command "nonsense"`},
		{[]string{"test", "-nonsense"}, 2, "usage: go run ./cmd/dev test"},
		{[]string{"memory", "extra"}, 2, `memory takes no argument "extra"`},
		{[]string{"fuzz", "-h"}, 0, "how long each target runs"},
	}
	for _, tt := range tests {
		var out bytes.Buffer
		if code := run(t.Context(), tt.args, &out, &out); code != tt.code || !strings.Contains(out.String(), tt.says) {
			t.Errorf("%q: exit code %d, want %d; printed:\n%s", tt.args, code, tt.code, out.String())
		}
	}
	var help bytes.Buffer
	usage(&help)
	for _, v := range verbs {
		if !strings.Contains(help.String(), "\n  "+v.name+" ") {
			t.Errorf("help does not list %s", v.name)
		}
	}
}

func TestFindRoot(t *testing.T) {
	root := t.TempDir()
	write(t, root, "go.mod", "module groundtally\n\ngo 1.26\n")
	write(t, root, "other/go.mod", "module other\n")
	deep := filepath.Join(root, "other", "deep")
	if err := os.MkdirAll(deep, 0o755); err != nil {
		t.Fatal(err)
	}
	if got, err := findRoot(deep); err != nil || got != root {
		t.Errorf("%q, %v", got, err)
	}
	if _, err := findRoot(t.TempDir()); err == nil {
		t.Error("a folder outside gives no error")
	}
}

// A stopped command takes along what it started.
func TestStreamStopsGrandchildren(t *testing.T) {
	ctx, cancel := context.WithCancel(t.Context())
	var once bool
	lines := &lineSplitter{take: func(l string) {
		if l == "begun" && !once {
			once = true
			cancel()
		}
	}}
	begun := time.Now()
	err := thisMachine{}.stream(ctx, command{argv: []string{"sh", "-c", "(echo begun; sleep 60); echo late"}}, lines, io.Discard)
	if err == nil || time.Since(begun) > 8*time.Second {
		t.Errorf("it ended after %s with %v", time.Since(begun), err)
	}
}
