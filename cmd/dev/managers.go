package main

import (
	"context"
	"fmt"
	"slices"
	"strings"
)

// A manager is a package manager of an operating system.
type manager struct {
	name    string // key in need.packages
	program string
	ids     []string // ID or ID_LIKE in /etc/os-release
	tried   bool     // whether its package names were tried on such a system
	root    bool     // installing needs root
	env     []string
	update  []string // refreshes the list of packages; nil where installing does that
	install []string
	offers  []string // asks whether a package is offered, see offered; nil where that is not asked
	query   []string // asks whether a package is installed; the package name is added
}

var managers = []manager{
	{
		name: "apt", program: "apt-get", ids: []string{"debian", "ubuntu"}, tried: true, root: true,
		env:    []string{"DEBIAN_FRONTEND=noninteractive"},
		update: []string{"apt-get", "update"},
		// Another package manager at work, unattended upgrades say, is waited for.
		install: []string{"apt-get", "install", "-y", "--no-install-recommends", "-o", "DPkg::Lock::Timeout=300"},
		offers:  []string{"apt-cache", "policy"},
		query:   []string{"dpkg-query", "-W", "-f=${db:Status-Status} ${Version}"},
	},
	{
		name: "dnf", program: "dnf", ids: []string{"fedora", "rhel", "centos"}, root: true,
		install: []string{"dnf", "install", "-y"}, query: []string{"rpm", "-q"},
	},
	{
		name: "pacman", program: "pacman", ids: []string{"arch"}, root: true,
		install: []string{"pacman", "-S", "--needed", "--noconfirm"}, query: []string{"pacman", "-Q"},
	},
	{
		name: "zypper", program: "zypper", ids: []string{"opensuse", "suse"}, root: true,
		install: []string{"zypper", "--non-interactive", "install"}, query: []string{"rpm", "-q"},
	},
	{
		name: "brew", program: "brew",
		install: []string{"brew", "install"}, query: []string{"brew", "list", "--versions"},
	},
}

// pickManager gives the package manager of the system: by the name in /etc/os-release, else
// the first that is on the PATH.
func pickManager(m machine) (manager, bool) {
	have := func(g manager) bool { _, ok := m.lookPath(g.program); return ok }
	if m.goos() == "darwin" {
		i := slices.IndexFunc(managers, func(g manager) bool { return g.name == "brew" })
		return managers[i], have(managers[i])
	}
	if m.goos() != "linux" {
		return manager{}, false
	}
	for _, id := range systemIDs(m) {
		for _, g := range managers {
			if slices.Contains(g.ids, id) && have(g) {
				return g, true
			}
		}
	}
	for _, g := range managers {
		if have(g) {
			return g, true
		}
	}
	return manager{}, false
}

// systemIDs reads ID, then ID_LIKE, of /etc/os-release; opensuse-leap counts as opensuse.
func systemIDs(m machine) []string {
	data, err := m.readFile("/etc/os-release")
	if err != nil {
		return nil
	}
	var id, like []string
	for l := range strings.Lines(string(data)) {
		key, value, _ := strings.Cut(strings.TrimSpace(l), "=")
		value = strings.Trim(value, `"'`)
		switch key {
		case "ID":
			id = append(id, value)
			if family, _, cut := strings.Cut(value, "-"); cut {
				id = append(id, family)
			}
		case "ID_LIKE":
			like = strings.Fields(value)
		}
	}
	return append(id, like...)
}

// recorded gives what the package manager says of a need's packages: installed versions, or
// that it has none.
func (g manager) recorded(ctx context.Context, m machine, n need) string {
	var out []string
	for _, entry := range n.packages[g.name] {
		state := entry + " not installed"
		for _, p := range strings.Split(entry, "|") {
			if v, ok := g.version(ctx, m, p); ok {
				state = strings.TrimSpace(p + " " + v)
				break
			}
		}
		out = append(out, state)
	}
	if len(out) == 0 {
		return "no package known"
	}
	return strings.Join(out, ", ")
}

func (g manager) version(ctx context.Context, m machine, pkg string) (string, bool) {
	out, err := m.output(ctx, command{argv: append(slices.Clone(g.query), pkg)})
	if err != nil {
		return "", false
	}
	out = strings.TrimSpace(out)
	if g.name == "apt" { // dpkg also lists packages that were removed
		state, v, _ := strings.Cut(out, " ")
		return v, state == "installed"
	}
	return strings.TrimSpace(strings.TrimPrefix(out, pkg)), true
}

// choose turns entries into names, taking the first alternative that is offered; lacking
// are the entries of which none is.
func (g manager) choose(ctx context.Context, m machine, entries []string) (names, lacking []string) {
	for _, e := range entries {
		alternatives := strings.Split(e, "|")
		i := 0
		if g.offers != nil {
			i = slices.IndexFunc(alternatives, func(p string) bool { return g.offered(ctx, m, p) })
		}
		if i < 0 {
			lacking = append(lacking, e)
			continue
		}
		names = append(names, alternatives[i])
	}
	return names, lacking
}

// offered reads "apt-cache policy NAME", which prints nothing for an unknown name and
// "Candidate: (none)" for one that cannot be installed.
func (g manager) offered(ctx context.Context, m machine, pkg string) bool {
	out, err := m.output(ctx, command{env: []string{"LC_ALL=C"}, argv: append(slices.Clone(g.offers), pkg)})
	return err == nil && strings.Contains(out, "Candidate: ") && !strings.Contains(out, "Candidate: (none)")
}

// packagesFor lists the entries for the needs, each once, and the needs without any.
func (g manager) packagesFor(found []finding) (entries []string, without []string) {
	for _, f := range found {
		ps := f.need.packages[g.name]
		if len(ps) == 0 {
			without = append(without, f.need.name)
		}
		for _, p := range ps {
			if !slices.Contains(entries, p) {
				entries = append(entries, p)
			}
		}
	}
	return entries, without
}

// byHand gives the line to type.
func (g manager) byHand(names []string) string {
	sudo := ""
	if g.root {
		sudo = "sudo "
	}
	line := sudo + strings.Join(g.install, " ")
	for _, n := range names {
		line += " " + shellQuote(n)
	}
	if g.update != nil {
		line = sudo + strings.Join(g.update, " ") + " && " + line
	}
	return line
}

// String names the manager, with a mark where its package names are unproven.
func (g manager) String() string {
	if g.tried {
		return g.program
	}
	return fmt.Sprintf("%s (not tried)", g.program)
}
