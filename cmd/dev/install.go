package main

import (
	"context"
	"errors"
	"fmt"
	"io"
	"slices"
	"strings"
	"time"
)

// A failure tells a person what went wrong, which command it was, and what can be done.
type failure struct {
	what   string
	typed  string // the exact command
	said   string // what it answered
	advice string
	err    error
}

func (f *failure) Error() string {
	var b strings.Builder
	b.WriteString(f.what)
	if f.typed != "" {
		b.WriteString("\n  command: " + f.typed)
	}
	if f.said != "" {
		b.WriteString("\n  answer:  " + strings.ReplaceAll(strings.TrimSpace(f.said), "\n", "\n           "))
	}
	if f.err != nil {
		b.WriteString("\n  error:   " + f.err.Error())
	}
	if f.advice != "" {
		b.WriteString("\n  you can: " + strings.ReplaceAll(f.advice, "\n", "\n           "))
	}
	return b.String()
}

func (f *failure) Unwrap() error { return f.err }

// A setup finds what the system lacks and installs it.
type setup struct {
	m     machine
	out   io.Writer // what is done
	every time.Duration
}

// ready returns nil when every need is met, after installing where that is possible.
func (s setup) ready(ctx context.Context, tests bool) error {
	goos := s.m.goos()
	if goos != "linux" && goos != "darwin" {
		return &failure{
			what:   "no set-up for the system " + goos,
			advice: "install by hand a C compiler, pkg-config, GEOS 3.10 or newer and PROJ 8.2 or newer with its database,\nthen run: go build -tags " + buildTags + " ./...",
		}
	}
	wanted := needsFor(goos, tests)
	found := detect(ctx, s.m, wanted)
	lacking := missing(found)
	if len(lacking) == 0 {
		fmt.Fprintf(s.out, "system: all %d needs are met (go run ./cmd/dev doctor lists them)\n", len(wanted))
		return nil
	}
	for _, f := range lacking {
		fmt.Fprintf(s.out, "system: %s is missing (%s): %s\n", f.need.name, f.need.purpose, f.detail)
	}
	if err := s.install(ctx, lacking); err != nil {
		return err
	}
	return s.again(ctx, lacking)
}

// again looks once more for what was missing before the installation.
func (s setup) again(ctx context.Context, before []finding) error {
	wanted := make([]need, 0, len(before))
	for _, f := range before {
		wanted = append(wanted, f.need)
	}
	still := missing(detect(ctx, s.m, wanted))
	if len(still) == 0 {
		fmt.Fprintf(s.out, "system: what was missing is there now\n")
		return nil
	}
	g, _ := pickManager(s.m)
	var lines []string
	for _, f := range still {
		lines = append(lines, f.need.name+": "+f.detail+"\n  "+g.program+" says: "+g.recorded(ctx, s.m, f.need))
	}
	return &failure{
		what:   "the packages are installed, yet this is still not found",
		said:   strings.Join(lines, "\n"),
		advice: "look whether PKG_CONFIG_PATH, CC, PROJ_DATA or a second installation hides them: go run ./cmd/dev doctor\nwhere the version is too old, take a newer release of the system or a newer library",
	}
}

func (s setup) install(ctx context.Context, lacking []finding) error {
	g, ok := pickManager(s.m)
	if !ok {
		var names []string
		for _, f := range lacking {
			names = append(names, f.need.name)
		}
		advice := "install these by hand: " + strings.Join(names, ", ")
		if s.m.goos() == "darwin" {
			advice = "install Homebrew (https://brew.sh), then run this again"
		}
		return &failure{what: "found no package manager that this program knows (apt-get, dnf, pacman, zypper, brew)", advice: advice}
	}
	entries, without := g.packagesFor(lacking)
	if len(without) > 0 {
		advice := "install it by hand, then run this again"
		if s.m.goos() == "darwin" && slices.Contains(without, needCompiler) {
			advice = "type: xcode-select --install"
		}
		return &failure{what: g.program + " has no known package for: " + strings.Join(without, ", "), advice: advice}
	}
	if !g.tried {
		fmt.Fprintf(s.out, "system: the package names for %s were not tried on such a system; if one is wrong, please tell us the right one\n", g.program)
	}
	prefix, err := s.privilege(ctx, g, entries)
	if err != nil {
		return err
	}
	names, unknown := g.choose(ctx, s.m, entries)
	updated := false
	if len(unknown) > 0 && g.update != nil {
		fmt.Fprintf(s.out, "system: %s does not offer %s yet; refreshing its list\n", g.program, strings.Join(unknown, ", "))
		if err := s.run(ctx, "refresh the list of packages", prefix, g, g.update); err != nil {
			return err
		}
		updated = true
		names, unknown = g.choose(ctx, s.m, entries)
	}
	if len(unknown) > 0 {
		return &failure{
			what:   g.program + " does not offer: " + strings.Join(unknown, ", "),
			advice: "look at the package sources of this system (/etc/apt/sources.list, /etc/apt/sources.list.d); on Ubuntu the component universe must be on",
		}
	}
	argv := append(slices.Clone(g.install), names...)
	err = s.run(ctx, "install the packages", prefix, g, argv)
	if err != nil && ctx.Err() == nil && g.update != nil && !updated {
		// An old list names versions that the server no longer has.
		fmt.Fprintf(s.out, "system: that failed; refreshing the list of packages and trying once more\n")
		if err := s.run(ctx, "refresh the list of packages", prefix, g, g.update); err != nil {
			return err
		}
		err = s.run(ctx, "install the packages", prefix, g, argv)
	}
	return err
}

// privilege gives what must stand before a command of the package manager: nothing for root
// and for a manager that needs none, else sudo where it works without a password.
func (s setup) privilege(ctx context.Context, g manager, entries []string) ([]string, error) {
	var names []string
	for _, e := range entries {
		first, _, _ := strings.Cut(e, "|")
		names = append(names, first)
	}
	if !g.root {
		if s.m.euid() == 0 {
			return nil, &failure{what: g.program + " does not install as root", advice: "run this as an ordinary user, or type as one: " + g.byHand(names)}
		}
		return nil, nil
	}
	if s.m.euid() == 0 {
		return nil, nil
	}
	advice := "type: " + g.byHand(names) + "\nthen run this again"
	if _, ok := s.m.lookPath("sudo"); !ok {
		return nil, &failure{what: "installing needs root, and there is no sudo", advice: "as root, " + strings.ReplaceAll(advice, "sudo ", "")}
	}
	probe := command{argv: []string{"sudo", "-n", "true"}}
	if out, err := s.m.output(ctx, probe); err != nil {
		return nil, &failure{what: "installing needs root, and sudo asks for a password", typed: probe.String(), said: firstLine(out, err), advice: advice}
	}
	return []string{"sudo", "-n"}, nil
}

// run shows and runs a command of the package manager, with a line of progress.
func (s setup) run(ctx context.Context, what string, prefix []string, g manager, argv []string) error {
	c := command{argv: argv, env: g.env}
	if len(prefix) > 0 { // sudo drops the environment
		c = command{argv: slices.Clone(prefix)}
		if len(g.env) > 0 {
			c.argv = append(append(c.argv, "env"), g.env...)
		}
		c.argv = append(c.argv, argv...)
	}
	fmt.Fprintf(s.out, "system: %s: %s\n", what, c)
	stop := watch(s.out, s.every, func() string { return what })
	var last lastLines
	both := io.MultiWriter(s.out, &last)
	err := s.m.stream(ctx, c, both, both)
	stop()
	if err == nil {
		return nil
	}
	if ctx.Err() != nil {
		return errors.Join(fmt.Errorf("%s was stopped", what), context.Cause(ctx))
	}
	advice := "look at the answer above: no network, no space left and a running package manager are the usual reasons\nthen type yourself: " + c.String()
	if g.name == "pacman" {
		advice += "\nan old package list is refreshed by: sudo pacman -Syu"
	}
	return &failure{what: "could not " + what, typed: c.String(), said: last.String(), err: err, advice: advice}
}

// lastLines keeps the last lines written to it.
type lastLines struct {
	buf []byte
}

const keptBytes = 2000

func (l *lastLines) Write(p []byte) (int, error) {
	l.buf = append(l.buf, p...)
	if over := len(l.buf) - keptBytes; over > 0 {
		l.buf = append(l.buf[:0], l.buf[over:]...)
	}
	return len(p), nil
}

func (l *lastLines) String() string {
	lines := strings.Split(strings.TrimSpace(string(l.buf)), "\n")
	if len(lines) > 5 {
		lines = lines[len(lines)-5:]
	}
	return strings.Join(lines, "\n")
}
