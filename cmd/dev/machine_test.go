package main

import (
	"context"
	"errors"
	"fmt"
	"io"
	"path"
	"slices"
	"strings"
	"testing"
)

// A described machine answers from tables. It also installs: a command of a package manager
// that succeeds brings what the packages named in it bring.
type described struct {
	system   string
	uid      int
	env      map[string]string
	programs []string          // names on the PATH
	files    map[string]string // by path
	modules  map[string]string // version by pkg-config name
	headers  []string          // that compile
	offered  []string          // packages with a candidate
	onUpdate []string          // packages offered after the list is refreshed
	fails    map[string]int    // how often a command that begins so fails
	brings   map[string]func(*described)
	ran      []string // every command that changes the machine, as typed
}

func (d *described) goos() string { return d.system }
func (d *described) euid() int    { return d.uid }

func (d *described) getenv(name string) string { return d.env[name] }

func (d *described) lookPath(p string) (string, bool) {
	return "/usr/bin/" + p, slices.Contains(d.programs, p)
}

func (d *described) readFile(p string) ([]byte, error) {
	s, ok := d.files[p]
	if !ok {
		return nil, errors.New("no such file")
	}
	return []byte(s), nil
}

func (d *described) glob(pattern string) []string {
	var out []string
	for p := range d.files {
		if ok, err := path.Match(pattern, p); ok && err == nil {
			out = append(out, p)
		}
	}
	slices.Sort(out)
	return out
}

func (d *described) output(ctx context.Context, c command) (string, error) {
	var b strings.Builder
	err := d.stream(ctx, c, &b, &b)
	return b.String(), err
}

var errExit = errors.New("exit status 1")

func (d *described) stream(_ context.Context, c command, stdout, _ io.Writer) error {
	argv := c.argv
	if argv[0] == "sudo" {
		if !slices.Contains(d.programs, "sudo-free") {
			fmt.Fprintln(stdout, "sudo: a password is required")
			return errExit
		}
		argv = argv[2:] // without sudo -n
		if argv[0] == "env" {
			argv = argv[2:]
		}
	}
	line := strings.Join(argv, " ")
	for prefix, n := range d.fails {
		if strings.HasPrefix(line, prefix) && n > 0 {
			d.fails[prefix]--
			d.ran = append(d.ran, c.String())
			fmt.Fprintln(stdout, "E: it went wrong")
			return errExit
		}
	}
	last := argv[len(argv)-1]
	switch {
	case argv[0] == "true":
		return nil
	case argv[0] == "pkg-config":
		v, ok := d.modules[last]
		switch {
		case !ok:
			fmt.Fprintf(stdout, "Package %s was not found\n", last)
			return errExit
		case argv[1] == "--modversion":
			fmt.Fprintln(stdout, v)
		case strings.HasPrefix(argv[1], "--variable"):
			fmt.Fprintln(stdout, "/opt/share/proj")
		}
		return nil
	case slices.Contains(argv, "-fsyntax-only"):
		for l := range strings.Lines(c.in) {
			h := strings.Trim(strings.TrimPrefix(strings.TrimSpace(l), "#include "), "<>")
			if !slices.Contains(d.headers, h) {
				fmt.Fprintf(stdout, "fatal error: %s: No such file or directory\n", h)
				return errExit
			}
		}
		return nil
	case argv[0] == "apt-cache":
		if slices.Contains(d.offered, last) {
			fmt.Fprintf(stdout, "%s:\n  Installed: (none)\n  Candidate: 1.0\n", last)
		} else if last == "libgl1-mesa-dev" {
			fmt.Fprintf(stdout, "%s:\n  Installed: (none)\n  Candidate: (none)\n", last)
		}
		return nil
	case argv[0] == "dpkg-query", argv[0] == "rpm", argv[0] == "pacman" && argv[1] == "-Q":
		return errExit
	case line == "apt-get update":
		d.ran = append(d.ran, c.String())
		d.offered = append(d.offered, d.onUpdate...)
		return nil
	case slices.Contains(argv, "install"), slices.Contains(argv, "-S"):
		d.ran = append(d.ran, c.String())
		for _, a := range argv {
			if bring := d.brings[a]; bring != nil {
				bring(d)
			}
		}
		return nil
	}
	return fmt.Errorf("the described machine does not know the command %q", line)
}

// whole gives a Debian machine with all that is needed, as root.
func whole() *described {
	d := &described{
		system:   "linux",
		programs: []string{"gcc", "pkg-config", "apt-get", "Xvfb", "xdotool"},
		files: map[string]string{
			"/etc/os-release":         "PRETTY_NAME=\"Debian GNU/Linux 12 (bookworm)\"\nID=debian\n",
			"/usr/share/proj/proj.db": "", "/usr/lib/x86_64-linux-gnu/dri/swrast_dri.so": "",
		},
		modules: map[string]string{},
		env:     map[string]string{},
		fails:   map[string]int{},
	}
	for _, n := range needs {
		for _, mod := range n.modules {
			d.modules[mod] = "99.1"
		}
		d.headers = append(d.headers, n.headers...)
		for _, entry := range n.packages["apt"] {
			d.offered = append(d.offered, strings.Split(entry, "|")...)
		}
	}
	d.modules["geos"], d.modules["proj"] = "3.11.1", "9.1.1"
	return d
}

// without takes a library away from the machine: its modules and its headers.
func (d *described) without(name string) *described {
	for _, n := range needs {
		if n.name != name {
			continue
		}
		for _, mod := range n.modules {
			delete(d.modules, mod)
		}
		d.headers = slices.DeleteFunc(d.headers, func(h string) bool { return slices.Contains(n.headers, h) })
		d.programs = slices.DeleteFunc(d.programs, func(p string) bool { return slices.Contains(n.programs, p) })
		if n.name == needCompiler {
			d.programs = slices.DeleteFunc(d.programs, func(p string) bool { return p == "gcc" })
		}
		for _, pattern := range n.files {
			for _, f := range d.glob(pattern) {
				delete(d.files, f)
			}
		}
	}
	return d
}

func needNamed(t *testing.T, name string) need {
	t.Helper()
	i := slices.IndexFunc(needs, func(n need) bool { return n.name == name })
	if i < 0 {
		t.Fatalf("no need is named %q", name)
	}
	return needs[i]
}
