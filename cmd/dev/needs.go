package main

// A need is one thing that the system must have before the program builds or its tests run.
type need struct {
	name    string
	purpose string
	tests   bool // needed by the tests alone
	linux   bool // not needed elsewhere: there the system brings its own

	// How it is recognised. modules are asked of pkg-config, all must be known, and the first
	// must have at least the version atLeast. viaPkgConfig says that the build itself asks
	// pkg-config, so that headers alone do not help. Then headers, all of which must compile;
	// programs and files, one of which must be there.
	modules      []string
	atLeast      string
	viaPkgConfig bool
	headers      []string
	programs     []string
	files        []string

	// packages by package manager; "a|b" means b where a is not offered.
	packages map[string][]string
}

// Names of needs that the code looks up.
const (
	needCompiler  = "C compiler"
	needPkgConfig = "pkg-config"
	needProjData  = "PROJ database"
)

// needs lists what is looked for, in the order in which it is looked for: the compiler and
// pkg-config first, since the others are found by asking them.
var needs = []need{
	{
		name: needCompiler, purpose: "compiles the bindings to GEOS, PROJ and OpenGL",
		headers: []string{"stdio.h"}, // a compiler without the C library's headers is common
		packages: map[string][]string{
			"apt": {"gcc", "libc6-dev"}, "dnf": {"gcc", "glibc-devel"}, "pacman": {"gcc"}, "zypper": {"gcc", "glibc-devel"},
		},
	},
	{
		name: needPkgConfig, purpose: "tells the go command where GEOS, PROJ and OpenGL lie",
		programs: []string{"pkg-config"},
		packages: map[string][]string{
			"apt": {"pkg-config"}, "dnf": {"pkgconf-pkg-config"}, "pacman": {"pkgconf"}, "zypper": {"pkg-config"}, "brew": {"pkgconf"},
		},
	},
	{
		name: "GEOS", purpose: "buffers, clips and repairs polygons",
		modules: []string{"geos"}, atLeast: "3.10", viaPkgConfig: true, headers: []string{"geos_c.h"},
		packages: map[string][]string{
			"apt": {"libgeos-dev"}, "dnf": {"geos-devel"}, "pacman": {"geos"}, "zypper": {"geos-devel"}, "brew": {"geos"},
		},
	},
	{
		name: "PROJ", purpose: "converts between map projections",
		modules: []string{"proj"}, atLeast: "8.2", viaPkgConfig: true, headers: []string{"proj.h"},
		packages: map[string][]string{
			"apt": {"libproj-dev"}, "dnf": {"proj-devel"}, "pacman": {"proj"}, "zypper": {"proj-devel"}, "brew": {"proj"},
		},
	},
	{
		name: needProjData, purpose: "holds the definitions of map projections",
		files: []string{
			"/usr/share/proj/proj.db", "/usr/local/share/proj/proj.db", "/opt/homebrew/share/proj/proj.db",
			"/usr/share/proj*/proj.db",
		},
		packages: map[string][]string{
			"apt": {"proj-data"}, "dnf": {"proj", "proj-data"}, "pacman": {"proj"}, "zypper": {"proj"}, "brew": {"proj"},
		},
	},
	{
		name: "OpenGL", purpose: "draws the window", linux: true,
		modules: []string{"gl"}, viaPkgConfig: true, headers: []string{"GL/gl.h"},
		packages: map[string][]string{
			"apt": {"libgl1-mesa-dev|libgl-dev"}, "dnf": {"mesa-libGL-devel"}, "pacman": {"libglvnd"}, "zypper": {"Mesa-libGL-devel"},
		},
	},
	{
		name: "X11", purpose: "opens the window on an X server", linux: true,
		modules: []string{"x11", "xrandr", "xcursor", "xi", "xinerama", "xxf86vm"},
		headers: []string{"X11/Xlib.h", "X11/extensions/Xrandr.h", "X11/Xcursor/Xcursor.h", "X11/extensions/XInput2.h", "X11/extensions/Xinerama.h", "X11/extensions/xf86vmode.h"},
		packages: map[string][]string{
			"apt":    {"xorg-dev"},
			"dnf":    {"libX11-devel", "libXrandr-devel", "libXcursor-devel", "libXi-devel", "libXinerama-devel", "libXxf86vm-devel"},
			"pacman": {"libx11", "libxrandr", "libxcursor", "libxi", "libxinerama", "libxxf86vm"},
			"zypper": {"libX11-devel", "libXrandr-devel", "libXcursor-devel", "libXi-devel", "libXinerama-devel", "libXxf86vm-devel"},
		},
	},
	{
		name: "Wayland", purpose: "opens the window on a Wayland desktop", linux: true,
		modules: []string{"wayland-client", "wayland-cursor", "wayland-egl"},
		headers: []string{"wayland-client.h", "wayland-cursor.h", "wayland-egl.h"},
		packages: map[string][]string{
			"apt": {"libwayland-dev"}, "dnf": {"wayland-devel"}, "pacman": {"wayland"}, "zypper": {"wayland-devel"},
		},
	},
	{
		name: "libxkbcommon", purpose: "reads the keyboard on a Wayland desktop", linux: true,
		modules: []string{"xkbcommon"}, headers: []string{"xkbcommon/xkbcommon.h"},
		packages: map[string][]string{
			"apt": {"libxkbcommon-dev"}, "dnf": {"libxkbcommon-devel"}, "pacman": {"libxkbcommon"}, "zypper": {"libxkbcommon-devel"},
		},
	},
	{
		name: "Xvfb", purpose: "shows the window to the tests where there is no screen", tests: true, linux: true,
		programs: []string{"Xvfb"},
		packages: map[string][]string{
			"apt": {"xvfb"}, "dnf": {"xorg-x11-server-Xvfb"}, "pacman": {"xorg-server-xvfb"}, "zypper": {"xorg-x11-server-Xvfb"},
		},
	},
	{
		name: "xdotool", purpose: "works mouse and keyboard of the window in the tests", tests: true, linux: true,
		programs: []string{"xdotool"},
		packages: map[string][]string{
			"apt": {"xdotool"}, "dnf": {"xdotool"}, "pacman": {"xdotool"}, "zypper": {"xdotool"},
		},
	},
	{
		name: "software OpenGL", purpose: "draws the window for the tests without a graphics card", tests: true, linux: true,
		files: []string{"/usr/lib/*/dri/swrast_dri.so", "/usr/lib/dri/swrast_dri.so", "/usr/lib64/dri/swrast_dri.so"},
		packages: map[string][]string{
			"apt": {"libgl1-mesa-dri"}, "dnf": {"mesa-dri-drivers"}, "pacman": {"mesa"}, "zypper": {"Mesa-dri"},
		},
	},
}

// needsFor gives the needs of an operating system, with those of the tests or without.
func needsFor(goos string, tests bool) []need {
	var out []need
	for _, n := range needs {
		if n.linux && goos != "linux" || n.tests && !tests {
			continue
		}
		out = append(out, n)
	}
	return out
}
