package main

import (
	"bytes"
	"errors"
	"slices"
	"strings"
	"testing"
	"time"
)

const aptInstall = "DEBIAN_FRONTEND=noninteractive apt-get install -y --no-install-recommends -o DPkg::Lock::Timeout=300 "

// geosArrives makes the package names given bring GEOS.
func geosArrives(names ...string) func(*described) {
	return func(d *described) {
		d.brings = map[string]func(*described){}
		for _, n := range names {
			d.brings[n] = func(d *described) {
				d.modules["geos"] = "3.12.0"
				d.headers = append(d.headers, "geos_c.h")
			}
		}
	}
}

func system(id string, program string) func(*described) {
	return func(d *described) {
		d.files["/etc/os-release"] = "ID=" + id + "\n"
		d.programs = slices.DeleteFunc(d.programs, func(p string) bool { return p == "apt-get" })
		d.programs = append(d.programs, program)
	}
}

func user(d *described) { d.uid = 1000 }

func TestSetUp(t *testing.T) {
	tests := []struct {
		name    string
		machine *described
		change  []func(*described)
		ran     []string // commands, in order
		says    []string // parts of the error; none: success
	}{
		{"nothing missing", whole(), nil, nil, nil},
		{"Debian as root", whole().without("GEOS"), []func(*described){geosArrives("libgeos-dev")},
			[]string{aptInstall + "libgeos-dev"}, nil},
		{"Ubuntu by ID_LIKE", whole().without("GEOS"), []func(*described){geosArrives("libgeos-dev"), func(d *described) {
			d.files["/etc/os-release"] = "ID=linuxmint\nID_LIKE=\"ubuntu debian\"\n"
		}}, []string{aptInstall + "libgeos-dev"}, nil},
		{"an old list is refreshed before", whole().without("GEOS"), []func(*described){geosArrives("libgeos-dev"), func(d *described) {
			d.offered, d.onUpdate = nil, []string{"libgeos-dev"}
		}}, []string{"DEBIAN_FRONTEND=noninteractive apt-get update", aptInstall + "libgeos-dev"}, nil},
		{"a failed installation is tried again with a fresh list", whole().without("GEOS"), []func(*described){geosArrives("libgeos-dev"), func(d *described) {
			d.fails["apt-get install"] = 1
		}}, []string{aptInstall + "libgeos-dev", "DEBIAN_FRONTEND=noninteractive apt-get update", aptInstall + "libgeos-dev"}, nil},
		{"a second failure is told", whole().without("GEOS"), []func(*described){func(d *described) { d.fails["apt-get install"] = 2 }},
			[]string{aptInstall + "libgeos-dev", "DEBIAN_FRONTEND=noninteractive apt-get update", aptInstall + "libgeos-dev"},
			[]string{"could not install the packages", "command: " + aptInstall + "libgeos-dev", "E: it went wrong", "type yourself"}},
		{"no network for the list", whole().without("GEOS"), []func(*described){func(d *described) {
			d.offered = nil
			d.fails["apt-get update"] = 1
		}}, []string{"DEBIAN_FRONTEND=noninteractive apt-get update"}, []string{"could not refresh the list of packages", "no network"}},
		{"not offered even after refreshing", whole().without("GEOS"), []func(*described){func(d *described) { d.offered = nil }},
			[]string{"DEBIAN_FRONTEND=noninteractive apt-get update"}, []string{"does not offer: libgeos-dev", "universe"}},
		{"the alternative where the first is not offered", whole().without("OpenGL"), []func(*described){func(d *described) {
			d.offered = slices.DeleteFunc(d.offered, func(p string) bool { return p == "libgl1-mesa-dev" })
			d.brings = map[string]func(*described){"libgl-dev": func(d *described) { d.modules["gl"] = "1.2" }}
		}}, []string{aptInstall + "libgl-dev"}, nil},
		{"installed and still not found", whole().without("GEOS"), nil,
			[]string{aptInstall + "libgeos-dev"}, []string{"still not found", "GEOS", "apt-get says: libgeos-dev not installed", "PKG_CONFIG_PATH"}},
		{"installed but too old", whole(), []func(*described){func(d *described) { d.modules["geos"] = "3.9.0" }},
			[]string{aptInstall + "libgeos-dev"}, []string{"still not found", "at least 3.10", "newer release"}},
		{"a user with sudo that asks nothing", whole().without("GEOS"), []func(*described){geosArrives("libgeos-dev"), user, func(d *described) {
			d.programs = append(d.programs, "sudo", "sudo-free")
		}}, []string{"sudo -n env DEBIAN_FRONTEND=noninteractive " + strings.TrimPrefix(aptInstall, "DEBIAN_FRONTEND=noninteractive ") + "libgeos-dev"}, nil},
		{"a user whose sudo asks for a password", whole().without("GEOS"), []func(*described){user, func(d *described) { d.programs = append(d.programs, "sudo") }},
			nil, []string{"sudo asks for a password", "type: sudo apt-get update && sudo apt-get install -y --no-install-recommends -o DPkg::Lock::Timeout=300 libgeos-dev\n"}},
		{"a user without sudo", whole().without("GEOS"), []func(*described){user},
			nil, []string{"there is no sudo", "as root, type: apt-get update && apt-get install -y"}},
		{"Fedora", whole().without("GEOS"), []func(*described){system("fedora", "dnf"), geosArrives("geos-devel")},
			[]string{"dnf install -y geos-devel"}, nil},
		{"Arch", whole().without("GEOS"), []func(*described){system("arch", "pacman"), geosArrives("geos")},
			[]string{"pacman -S --needed --noconfirm geos"}, nil},
		{"openSUSE by its family", whole().without("GEOS"), []func(*described){system("opensuse-tumbleweed", "zypper"), geosArrives("geos-devel")},
			[]string{"zypper --non-interactive install geos-devel"}, nil},
		{"an unknown system with a known manager", whole().without("GEOS"), []func(*described){system("solo", "dnf"), geosArrives("geos-devel")},
			[]string{"dnf install -y geos-devel"}, nil},
		{"an unknown system with none", whole().without("GEOS"), []func(*described){system("solo", "solopkg")},
			nil, []string{"no package manager", "by hand: GEOS"}},
		{"Homebrew as a user", mac().without("GEOS"), []func(*described){geosArrives("geos"), user, func(d *described) { d.programs = append(d.programs, "brew") }},
			[]string{"brew install geos"}, nil},
		{"Homebrew as root", mac().without("GEOS"), []func(*described){func(d *described) { d.programs = append(d.programs, "brew") }},
			nil, []string{"does not install as root", "brew install geos"}},
		{"macOS without Homebrew", mac().without("GEOS"), []func(*described){user}, nil, []string{"https://brew.sh"}},
		{"macOS without a compiler", mac(), []func(*described){user, func(d *described) {
			d.programs = []string{"pkg-config", "brew"}
		}}, nil, []string{"no known package for: C compiler", "xcode-select --install"}},
		{"Windows", whole(), []func(*described){func(d *described) { d.system = "windows" }}, nil, []string{"no set-up for the system windows", "GEOS 3.10"}},
	}
	for _, tt := range tests {
		t.Run(tt.name, func(t *testing.T) {
			for _, c := range tt.change {
				c(tt.machine)
			}
			var out bytes.Buffer
			err := setup{m: tt.machine, out: &out, every: time.Hour}.ready(t.Context(), true)
			if (err == nil) != (len(tt.says) == 0) {
				t.Fatalf("error %v, want one with %q", err, tt.says)
			}
			for _, s := range tt.says {
				if !strings.Contains(err.Error(), s) {
					t.Errorf("error does not hold %q:\n%v", s, err)
				}
			}
			if !slices.Equal(tt.machine.ran, tt.ran) {
				t.Errorf("ran %q\nwant %q", tt.machine.ran, tt.ran)
			}
		})
	}
}

// mac gives a Mac with all that is needed but Homebrew.
func mac() *described {
	d := whole()
	d.system = "darwin"
	d.programs = []string{"clang", "pkg-config"}
	return d
}

// On a bare machine everything is asked for in one command, each package once.
func TestSetUpBareMachine(t *testing.T) {
	d := whole()
	for _, n := range needs {
		d.without(n.name)
	}
	full := whole()
	var all []string
	for _, n := range needs {
		for _, e := range n.packages["apt"] {
			first, _, _ := strings.Cut(e, "|")
			all = append(all, first)
		}
	}
	d.brings = map[string]func(*described){"gcc": func(d *described) {
		d.modules, d.headers, d.programs, d.files = full.modules, full.headers, full.programs, full.files
	}}
	var out bytes.Buffer
	if err := (setup{m: d, out: &out, every: time.Hour}).ready(t.Context(), true); err != nil {
		t.Fatal(err)
	}
	if want := []string{aptInstall + strings.Join(all, " ")}; !slices.Equal(d.ran, want) {
		t.Errorf("ran %q\nwant %q", d.ran, want)
	}
}

// Package names that nobody has tried are marked wherever they are used.
func TestUntriedIsSaid(t *testing.T) {
	d := with(whole().without("GEOS"), system("fedora", "dnf"))
	geosArrives("geos-devel")(d)
	var out bytes.Buffer
	if err := (setup{m: d, out: &out, every: time.Hour}).ready(t.Context(), false); err != nil {
		t.Fatal(err)
	}
	if !strings.Contains(out.String(), "were not tried") {
		t.Errorf("nothing says that the names were not tried:\n%s", out.String())
	}
	for _, g := range managers {
		if g.tried == strings.Contains(g.String(), "not tried") {
			t.Errorf("%s: tried is %v", g, g.tried)
		}
	}
}

func TestDoctor(t *testing.T) {
	var out bytes.Buffer
	if n := doctor(t.Context(), whole(), &out); n != 0 || !strings.Contains(out.String(), "nothing is missing") {
		t.Errorf("a whole machine lacks %d:\n%s", n, out.String())
	}
	out.Reset()
	d := whole().without("GEOS").without("Xvfb")
	if n := doctor(t.Context(), d, &out); n != 2 || !strings.Contains(out.String(), "MISSING  GEOS") || !strings.Contains(out.String(), "MISSING  Xvfb (for the tests)") {
		t.Errorf("2 needs are missing, doctor counts %d:\n%s", n, out.String())
	}
	if len(d.ran) > 0 {
		t.Errorf("doctor ran %q", d.ran)
	}
}

func TestShellQuote(t *testing.T) {
	for in, want := range map[string]string{"plain-1.0": "plain-1.0", "": "''", "a b": "'a b'", "it's": `'it'\''s'`, "a|b": "'a|b'", "^$": "'^$'"} {
		if got := shellQuote(in); got != want {
			t.Errorf("shellQuote(%q) = %s, want %s", in, got, want)
		}
	}
}

func TestFailureKeepsItsCause(t *testing.T) {
	err := error(&failure{what: "x", err: errExit})
	if !errors.Is(err, errExit) {
		t.Error("the cause is lost")
	}
}
