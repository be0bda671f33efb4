//go:build unix

package main

import (
	"bufio"
	"bytes"
	"context"
	"database/sql"
	"errors"
	"fmt"
	"os"
	"os/exec"
	"path/filepath"
	"strconv"
	"strings"
	"syscall"
	"testing"
	"time"

	_ "modernc.org/sqlite"
)

const nobody = 65534 // user and group without rights, for permissions that the superuser would not feel

// TestScripts runs the built program by the scripts of testdata/scripts; the README there says how
// they are written.
func TestScripts(t *testing.T) {
	root, err := filepath.Abs("../..")
	if err != nil {
		t.Fatal(err)
	}
	bin := passable(t)
	build := exec.Command("go", "build", "-o", filepath.Join(bin, "gtally"), ".")
	if out, err := build.CombinedOutput(); err != nil {
		t.Fatalf("build: %v\n%s", err, out)
	}
	scripts, err := filepath.Glob(filepath.Join(root, "testdata", "scripts", "*.txt"))
	if err != nil || len(scripts) == 0 {
		t.Fatal("no scripts", err)
	}
	made := map[string]map[string][]byte{}
	for _, path := range scripts {
		t.Run(strings.TrimSuffix(filepath.Base(path), ".txt"), func(t *testing.T) {
			s := &script{t: t, root: root, program: filepath.Join(bin, "gtally"), dir: passable(t), kept: map[string][]byte{}, made: made}
			s.run(path)
			s.judge()
			if s.commands == 0 {
				t.Fatal("the script runs nothing")
			}
		})
	}
}

// passable gives a folder that every user may pass through.
func passable(t *testing.T) string {
	t.Helper()
	dir := t.TempDir()
	for p := dir; p != os.TempDir() && p != string(filepath.Separator); p = filepath.Dir(p) {
		if err := os.Chmod(p, 0o755); err != nil { // the first folder that is not ours ends the way up
			break
		}
	}
	return dir
}

// script runs one script. Expectations gather behind a command and are judged when the next one comes.
type script struct {
	t             *testing.T
	root, program string
	dir           string
	kept          map[string][]byte
	made          map[string]map[string][]byte // files that an included script left, by its path
	commands      int

	where    string // of the command that is being judged
	line     string
	out, err string
	code     int
	want     int
	said     bool // an exit code was stated
	pending  bool
	outAt    int
}

func (s *script) run(path string) {
	f, err := os.Open(path)
	if err != nil {
		s.t.Fatal(err)
	}
	defer f.Close()
	scan := bufio.NewScanner(f)
	for n := 1; scan.Scan(); n++ {
		text := scan.Text()
		where := fmt.Sprintf("%s:%d", filepath.Base(path), n)
		if strings.TrimSpace(text) == "" || strings.HasPrefix(text, "#") {
			continue
		}
		mark, rest, _ := strings.Cut(text, " ")
		rest = s.expand(rest)
		switch mark {
		case "<":
			s.judge()
			s.include(filepath.Join(filepath.Dir(path), rest))
		case "$", "$nobody", "$small":
			s.judge()
			s.where, s.line = where, rest
			s.command(mark, rest)
		case "%":
			s.judge()
			s.helper(where, words(s.t, rest))
		case ">":
			at := strings.Index(s.out[s.outAt:], rest)
			if at < 0 {
				s.fail(where, "standard output has no %q after what was found before", rest)
				continue
			}
			s.outAt += at + len(rest)
		case "!":
			if !strings.Contains(s.err, rest) {
				s.fail(where, "standard error has no %q", rest)
			}
		case "~":
			if strings.Contains(s.out, rest) || strings.Contains(s.err, rest) {
				s.fail(where, "%q is said", rest)
			}
		case "=":
			if s.want, err = strconv.Atoi(rest); err != nil {
				s.t.Fatalf("%s: %v", where, err)
			}
			s.said = true
		default:
			s.t.Fatalf("%s: a line cannot begin with %q", where, mark)
		}
	}
	if err := scan.Err(); err != nil {
		s.t.Fatal(err)
	}
}

// include runs another file, the first time; later its files are put down as they were left.
func (s *script) include(path string) {
	if made, ok := s.made[path]; ok {
		for name, content := range made {
			if err := os.WriteFile(filepath.Join(s.dir, name), content, 0o644); err != nil {
				s.t.Fatal(err)
			}
		}
		return
	}
	before, err := os.ReadDir(s.dir)
	if err != nil {
		s.t.Fatal(err)
	}
	old := map[string]bool{}
	for _, e := range before {
		old[e.Name()] = true
	}
	s.run(path)
	s.judge()
	after, err := os.ReadDir(s.dir)
	if err != nil {
		s.t.Fatal(err)
	}
	made := map[string][]byte{}
	for _, e := range after {
		if old[e.Name()] {
			continue
		}
		if made[e.Name()], err = os.ReadFile(filepath.Join(s.dir, e.Name())); err != nil {
			s.t.Fatal(err)
		}
	}
	s.made[path] = made
}

func (s *script) expand(text string) string {
	return strings.NewReplacer("$SMALL", filepath.Join(s.root, "testdata", "scripts", "small"), "$HOSTILE", filepath.Join(s.root, "testdata", "hostile")).Replace(text)
}

func (s *script) fail(where, format string, args ...any) {
	s.t.Helper()
	s.t.Errorf("%s: %s\n%s\nexit %d\nstandard output:\n%s\nstandard error:\n%s", where, fmt.Sprintf(format, args...), s.line, s.code, s.out, s.err)
}

// command runs the program: as it is, as a user without rights, or allowed small files only.
func (s *script) command(mark, line string) {
	ws := words(s.t, line)
	if len(ws) == 0 || ws[0] != "gtally" {
		s.t.Fatalf("%s: only gtally is run, not %q", s.where, line)
	}
	ctx, cancel := context.WithTimeout(s.t.Context(), 10*time.Minute)
	defer cancel()
	cmd := exec.CommandContext(ctx, s.program, ws[1:]...)
	if mark == "$small" {
		cmd = exec.CommandContext(ctx, "sh", append([]string{"-c", `ulimit -f 212; exec "$@"`, "sh", s.program}, ws[1:]...)...)
	}
	if mark == "$nobody" && os.Geteuid() == 0 {
		cmd.SysProcAttr = &syscall.SysProcAttr{Credential: &syscall.Credential{Uid: nobody, Gid: nobody}}
	}
	cmd.Dir = s.dir
	var out, errs bytes.Buffer
	cmd.Stdout, cmd.Stderr = &out, &errs
	err := cmd.Run()
	var exit *exec.ExitError
	if err != nil && !errors.As(err, &exit) {
		s.t.Fatalf("%s: %v", s.where, err)
	}
	s.out, s.err, s.code = out.String(), errs.String(), cmd.ProcessState.ExitCode()
	s.want, s.said, s.outAt, s.pending = 0, false, 0, true
	s.commands++
}

// judge looks at what every command must keep to.
func (s *script) judge() {
	if !s.pending {
		return
	}
	s.pending = false
	if !s.said {
		s.fail(s.where, "the script states no exit code")
	}
	if s.code != s.want {
		s.fail(s.where, "exit code %d, want %d", s.code, s.want)
	}
	for _, bad := range []string{"\u2013", "\u2014", "goroutine ", "%!", "NaN", "<nil>"} {
		if strings.Contains(strings.ReplaceAll(s.out+s.err, "NaN and Infinity are no numbers", ""), bad) {
			s.fail(s.where, "%q is said", bad)
		}
	}
	if s.code != 0 && s.code != 3 && s.err == "" && s.out == "" {
		s.fail(s.where, "nothing is said")
	}
}

// helper prepares files and compares them.
func (s *script) helper(where string, ws []string) {
	must := func(err error) {
		s.t.Helper()
		if err != nil {
			s.t.Fatalf("%s: %v", where, err)
		}
	}
	at := func(i int) string {
		if i >= len(ws) {
			s.t.Fatalf("%s: %s needs more words", where, ws[0])
		}
		return ws[i]
	}
	file := func(i int) string {
		if filepath.IsAbs(at(i)) {
			return at(i)
		}
		return filepath.Join(s.dir, at(i))
	}
	switch at(0) {
	case "write":
		must(os.WriteFile(file(1), []byte(strings.ReplaceAll(at(2), `\n`, "\n")), 0o644))
	case "nested": // opening brackets behind a text
		n, err := strconv.Atoi(at(3))
		must(err)
		must(os.WriteFile(file(1), []byte(at(2)+strings.Repeat("[", n)), 0o644))
	case "copy":
		b, err := os.ReadFile(file(1))
		must(err)
		must(os.WriteFile(file(2), b, 0o644))
	case "cut":
		n, err := strconv.ParseInt(at(2), 10, 64)
		must(err)
		must(os.Truncate(file(1), n))
	case "keep":
		b, err := os.ReadFile(file(1))
		must(err)
		s.kept[at(1)] = b
	case "unchanged":
		b, err := os.ReadFile(file(1))
		must(err)
		old, ok := s.kept[at(1)]
		if !ok {
			s.t.Fatalf("%s: %s was not kept", where, at(1))
		}
		if !bytes.Equal(b, old) {
			s.t.Errorf("%s: %s is not what it was", where, at(1))
		}
	case "holds", "lacks":
		b, err := os.ReadFile(file(1))
		must(err)
		if bytes.Contains(b, []byte(at(2))) != (at(0) == "holds") {
			s.t.Errorf("%s: %s: %s %q is not so", where, at(1), at(0), at(2))
		}
	case "absent":
		if _, err := os.Stat(file(1)); !errors.Is(err, os.ErrNotExist) {
			s.t.Errorf("%s: %s is there", where, at(1))
		}
	case "folder":
		must(os.Mkdir(file(1), 0o755))
	case "mode":
		mode, err := strconv.ParseUint(at(2), 8, 32)
		must(err)
		must(os.Chmod(file(1), os.FileMode(mode)))
	case "sql": // what another program may do to a file
		db, err := sql.Open("sqlite", file(1))
		must(err)
		_, err = db.Exec(at(2))
		must(errors.Join(err, db.Close()))
	default:
		s.t.Fatalf("%s: there is no helper %q", where, ws[0])
	}
}

// words parts a line at blanks; quotes hold together.
func words(t *testing.T, line string) []string {
	t.Helper()
	var out []string
	var word strings.Builder
	var quote rune
	in := false
	for _, r := range line {
		switch {
		case quote != 0 && r == quote:
			quote = 0
		case quote == 0 && (r == '"' || r == '\''):
			quote, in = r, true
		case quote == 0 && r == ' ':
			if in {
				out = append(out, word.String())
			}
			word.Reset()
			in = false
		default:
			word.WriteRune(r)
			in = true
		}
	}
	if quote != 0 {
		t.Fatalf("a quote is open: %s", line)
	}
	if in {
		out = append(out, word.String())
	}
	return out
}

// An interrupt ends a long computation with code 130, and what was saved before is still there.
func TestInterrupt(t *testing.T) {
	dir := t.TempDir()
	program := filepath.Join(dir, "gtally")
	if out, err := exec.Command("go", "build", "-o", program, ".").CombinedOutput(); err != nil {
		t.Fatalf("build: %v\n%s", err, out)
	}
	run := func(args ...string) (int, string) {
		cmd := exec.Command(program, args...)
		cmd.Dir = dir
		out, err := cmd.CombinedOutput()
		var exit *exec.ExitError
		if err != nil && !errors.As(err, &exit) {
			t.Fatal(err)
		}
		return cmd.ProcessState.ExitCode(), string(out)
	}
	if code, out := run("new", "m.gpkg", "--sample", "--quiet"); code != 0 {
		t.Fatalf("exit %d: %s", code, out)
	}
	if code, out := run("set", "m.gpkg", "study.author", "before the interrupt"); code != 0 {
		t.Fatalf("exit %d: %s", code, out)
	}
	cmd := exec.Command(program, "compute", "m.gpkg", "--cores", "1")
	cmd.Dir = dir
	var errs bytes.Buffer
	cmd.Stderr = &errs
	if err := cmd.Start(); err != nil {
		t.Fatal(err)
	}
	time.Sleep(700 * time.Millisecond)
	if err := cmd.Process.Signal(os.Interrupt); err != nil {
		t.Fatal(err)
	}
	var exit *exec.ExitError
	if err := cmd.Wait(); !errors.As(err, &exit) || exit.ExitCode() != 130 {
		t.Fatalf("%v; %s", err, errs.String())
	}
	if !strings.Contains(errs.String(), "stopped; the study is as it was") {
		t.Errorf("standard error: %s", errs.String())
	}
	if code, out := run("get", "m.gpkg", "study.author"); code != 0 || !strings.Contains(out, "before the interrupt") {
		t.Errorf("exit %d: %s", code, out)
	}
}
