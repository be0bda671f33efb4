package main

import (
	"path"
	"strings"
	"testing"
)

func TestDetect(t *testing.T) {
	tests := []struct {
		name    string
		machine *described
		need    string
		through string // empty: missing
		detail  string // part of it
	}{
		{"pkg-config knows GEOS", whole(), "GEOS", byPkgConfig, "geos 3.11.1"},
		{"GEOS is too old", with(whole(), func(d *described) { d.modules["geos"] = "3.9.0" }), "GEOS", "", "at least 3.10"},
		{"GEOS is just new enough", with(whole(), func(d *described) { d.modules["geos"] = "3.10.0" }), "GEOS", byPkgConfig, "3.10.0"},
		{"GEOS headers without its entry do not help", with(whole(), func(d *described) { delete(d.modules, "geos") }), "GEOS", "", "the build asks pkg-config"},
		{"no GEOS at all", whole().without("GEOS"), "GEOS", "", "geos_c.h"},
		{"Wayland by headers alone", with(whole(), func(d *described) { delete(d.modules, "wayland-egl") }), "Wayland", byHeader, "wayland-egl.h"},
		{"X11 with one header lacking", with(whole().without("X11"), func(d *described) {
			d.headers = append(d.headers, "X11/Xlib.h", "X11/extensions/Xrandr.h")
		}), "X11", "", "X11/Xcursor/Xcursor.h"},
		{"X11 by headers alone", with(whole(), func(d *described) { delete(d.modules, "xi") }), "X11", byHeader, "XInput2.h"},
		{"no pkg-config", whole().without(needPkgConfig), needPkgConfig, "", "not on the PATH"},
		{"no pkg-config, so no OpenGL", whole().without(needPkgConfig), "OpenGL", "", "pkg-config is not on the PATH"},
		{"another pkg-config", with(whole(), func(d *described) { d.env["PKG_CONFIG"] = "pkgconf" }), needPkgConfig, "", "pkgconf"},
		{"gcc", whole(), needCompiler, byProgram, "gcc"},
		{"no gcc", whole().without(needCompiler), needCompiler, "", "gcc is not on the PATH"},
		{"gcc without the C library's headers", with(whole(), func(d *described) { d.headers = nil }), needCompiler, "", "stdio.h"},
		{"another compiler", with(whole(), func(d *described) { d.env["CC"] = "clang -m64" }), needCompiler, "", "clang"},
		{"C switched off", with(whole(), func(d *described) { d.env["CGO_ENABLED"] = "0" }), needCompiler, "", "unset"},
		{"proj.db in the usual place", whole(), needProjData, byFile, "/usr/share/proj/proj.db"},
		{"proj.db by the environment", with(whole().without(needProjData), func(d *described) {
			d.env["PROJ_DATA"] = "/srv/proj"
			d.files["/srv/proj/proj.db"] = ""
		}), needProjData, byFile, "/srv/proj/proj.db"},
		{"proj.db by PROJ's own entry", with(whole().without(needProjData), func(d *described) { d.files["/opt/share/proj/proj.db"] = "" }), needProjData, byFile, "/opt/share/proj/proj.db"},
		{"no proj.db", whole().without(needProjData), needProjData, "", "none of these is there"},
		{"Xvfb", whole(), "Xvfb", byProgram, "Xvfb"},
		{"no Xvfb", whole().without("Xvfb"), "Xvfb", "", "Xvfb is not on the PATH"},
		{"no xdotool", whole().without("xdotool"), "xdotool", "", "xdotool is not on the PATH"},
		{"no software OpenGL", whole().without("software OpenGL"), "software OpenGL", "", "swrast_dri.so"},
	}
	for _, tt := range tests {
		t.Run(tt.name, func(t *testing.T) {
			f := look(t.Context(), tt.machine, needNamed(t, tt.need))
			if f.found != (tt.through != "") || f.through != tt.through {
				t.Fatalf("found %v %q (%s), want through %q", f.found, f.through, f.detail, tt.through)
			}
			if !strings.Contains(f.detail, tt.detail) {
				t.Errorf("detail %q does not hold %q", f.detail, tt.detail)
			}
		})
	}
}

func with(d *described, change func(*described)) *described {
	change(d)
	return d
}

func TestAtLeast(t *testing.T) {
	tests := []struct {
		have, want string
		ok         bool
	}{
		{"3.10.0", "3.10", true}, {"3.9.9", "3.10", false}, {"3.11.1", "3.10", true}, {"4", "3.10", true},
		{"3", "3.10", false}, {"3.10dev", "3.10", true}, {"9.1.1", "8.2", true}, {"8.1", "8.2", false}, {"", "8.2", false},
	}
	for _, tt := range tests {
		if got := atLeast(tt.have, tt.want); got != tt.ok {
			t.Errorf("atLeast(%q, %q) = %v", tt.have, tt.want, got)
		}
	}
}

// Every need can be recognised and, on Linux, installed by every package manager.
func TestNeedsTable(t *testing.T) {
	names := map[string]bool{}
	for _, n := range needs {
		if names[n.name] {
			t.Errorf("%s stands twice", n.name)
		}
		names[n.name] = true
		if n.purpose == "" || len(n.modules)+len(n.headers)+len(n.programs)+len(n.files) == 0 {
			t.Errorf("%s has no purpose or no way to be recognised", n.name)
		}
		if len(n.modules) > 0 && len(n.headers) == 0 {
			t.Errorf("%s has modules but no headers", n.name)
		}
		for _, pattern := range n.files {
			if _, err := path.Match(pattern, "x"); err != nil {
				t.Errorf("%s: pattern %q: %v", n.name, pattern, err)
			}
		}
		for _, g := range managers {
			if g.name == "brew" && (n.linux || n.name == needCompiler) {
				continue // comes with the system or with its developer tools
			}
			if len(n.packages[g.name]) == 0 {
				t.Errorf("%s has no package for %s", n.name, g.name)
			}
		}
	}
	for _, name := range []string{needCompiler, needPkgConfig, needProjData} {
		if !names[name] {
			t.Errorf("no need is named %q", name)
		}
	}
	for _, n := range needsFor("darwin", true) {
		if n.linux {
			t.Errorf("%s is asked of macOS", n.name)
		}
	}
	if all, some := len(needsFor("linux", true)), len(needsFor("linux", false)); all != len(needs) || some >= all {
		t.Errorf("Linux needs %d with tests and %d without, of %d", all, some, len(needs))
	}
}
