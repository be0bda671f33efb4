package desk

import (
	"bufio"
	"cmp"
	"errors"
	"fmt"
	"io"
	"os"
	"os/exec"
	"os/signal"
	"path/filepath"
	"runtime"
	"runtime/debug"
	"strings"
	"sync"
	"syscall"

	"fyne.io/fyne/v2"
	fyneapp "fyne.io/fyne/v2/app"
	"fyne.io/fyne/v2/driver"

	"groundtally/app/program"
)

// AppID names the program to the desktop and where it keeps its preferences.
const AppID = "groundtally"

// childMark in the environment says that this process is the one with the window.
const childMark = "GROUNDTALLY_WINDOW"

// Exit codes of the window program, as those of the terminal program.
const (
	exitDone       = 0
	exitUsage      = 2
	exitUnexpected = 5
)

const usage = `groundtally opens the window.

  groundtally               the last study, the sample study or a new one
  groundtally STUDY.gpkg    opens a study
  groundtally --sample      opens the sample study, the Isle of Marram

gtally does the same work in the terminal.
`

// Main runs the program and gives its exit code.
//
// The window lives in a child process: what the toolkit and the graphics driver write when they cannot
// start, or when they fail later, is caught and put into plain words.
func Main(args []string, stdout, stderr io.Writer) int {
	sample, path := false, ""
	for _, a := range args {
		switch {
		case a == "-h" || a == "--help" || a == "help":
			fmt.Fprint(stdout, usage)
			return exitDone
		case a == "--sample":
			sample = true
		case strings.HasPrefix(a, "-"):
			fmt.Fprintf(stderr, "groundtally: there is no option %s\n%s", a, usage)
			return exitUsage
		case path != "":
			fmt.Fprintf(stderr, "groundtally: one study at a time; %s and %s were given\n", path, a)
			return exitUsage
		default:
			path = a
		}
	}
	if os.Getenv(childMark) != "" {
		return window(sample, path)
	}
	if runtime.GOOS == "linux" && os.Getenv("DISPLAY") == "" && os.Getenv("WAYLAND_DISPLAY") == "" {
		fmt.Fprintf(stderr, "groundtally: there is no screen to open a window on (neither DISPLAY nor WAYLAND_DISPLAY is set).\n%s", wayOut(path))
		return exitUnexpected
	}
	return supervise(args, path, stdout, stderr)
}

// wayOut says how to go on without a window.
func wayOut(path string) string {
	if path == "" {
		path = "STUDY.gpkg"
	}
	return fmt.Sprintf("The terminal program does the same work: gtally order %s, gtally appendix %s --to FOLDER; gtally help lists the rest.\n", path, path)
}

// upWord is what the child writes to its standard output when the window is there.
const upWord = "window open"

// supervise runs the window in a child process and puts its failure into words.
func supervise(args []string, path string, stdout, stderr io.Writer) int {
	self, err := os.Executable()
	if err != nil {
		fmt.Fprintf(stderr, "groundtally: %v\n", err)
		return exitUnexpected
	}
	cmd := exec.Command(self, args...)
	cmd.Env = append(os.Environ(), childMark+"=1")
	cmd.Stdin = os.Stdin
	if os.Getenv("MALLOC_ARENA_MAX") == "" {
		// The geometry library frees memory on many threads; with an arena for each, little of it comes back.
		cmd.Env = append(cmd.Env, "MALLOC_ARENA_MAX=2")
	}
	out, err := cmd.StdoutPipe()
	if err != nil {
		fmt.Fprintf(stderr, "groundtally: %v\n", err)
		return exitUnexpected
	}
	errs := &tail{}
	cmd.Stderr = errs
	if err := cmd.Start(); err != nil {
		fmt.Fprintf(stderr, "groundtally: %v\n", err)
		return exitUnexpected
	}
	signals := make(chan os.Signal, 1)
	signal.Notify(signals, os.Interrupt, syscall.SIGTERM)
	go func() {
		for s := range signals {
			_ = cmd.Process.Signal(s) // the child saves and ends
		}
	}()
	up := false
	lines := bufio.NewScanner(out)
	lines.Buffer(nil, 1<<20)
	for lines.Scan() {
		up = up || lines.Text() == upWord
		if os.Getenv(probeMark) != "" {
			fmt.Fprintln(stdout, lines.Text())
		}
	}
	_, _ = io.Copy(io.Discard, out) // should a line be too long for the scanner, the child must not wait for a reader
	err = cmd.Wait()
	signal.Stop(signals)
	said := errs.String()
	var exit *exec.ExitError
	switch {
	case err == nil && up:
		return exitDone
	case !up:
		fmt.Fprint(stderr, explainStart(said, path))
		return exitUnexpected
	case errors.As(err, &exit) && exit.ExitCode() > 0 && exit.ExitCode() != 2: // 2 is a Go panic
		fmt.Fprint(stderr, said)
		return exit.ExitCode()
	}
	fmt.Fprintf(stderr, "groundtally: the window was closed by a fault or from outside. Every change made before is saved; start the program again and go on.\n")
	if where := keepReport(said); where != "" {
		fmt.Fprintf(stderr, "What it wrote is in %s\n", where)
	}
	return exitUnexpected
}

// explainStart puts into words why no window came.
func explainStart(said, path string) string {
	low := strings.ToLower(said)
	what := "the window could not be opened."
	cure := "Update the graphics driver, or start it on another screen."
	switch {
	case strings.Contains(low, "platformunavailable") || strings.Contains(low, "display") && (strings.Contains(low, "failed to open") || strings.Contains(low, "platformerror")):
		what = "the screen " + cmp.Or(os.Getenv("WAYLAND_DISPLAY"), os.Getenv("DISPLAY")) + " cannot be reached."
		cure = "Start the program in a session that has a screen."
	case strings.Contains(low, "apiunavailable") || strings.Contains(low, "versionunavailable") || strings.Contains(low, "formatunavailable") || strings.Contains(low, "opengl") || strings.Contains(low, "glx") || strings.Contains(low, "egl"):
		what = "the screen offers no OpenGL, which the window is drawn with."
		cure = "Update the graphics driver, or install software rendering (on Debian: libgl1-mesa-dri)."
	}
	text := "groundtally: " + what + " " + cure + "\n" + wayOut(path)
	if where := keepReport(said); where != "" {
		text += "What the graphics system said is in " + where + "\n"
	}
	return text
}

// keepReport writes what a failed window said to a file, and gives its name; empty when that failed or
// there is nothing.
func keepReport(said string) string {
	if strings.TrimSpace(said) == "" {
		return ""
	}
	dir, err := os.UserCacheDir()
	if err != nil {
		dir = os.TempDir()
	}
	dir = filepath.Join(dir, "groundtally")
	if os.MkdirAll(dir, 0o755) != nil {
		return ""
	}
	name := filepath.Join(dir, "window-report.txt")
	if os.WriteFile(name, []byte(said), 0o600) != nil {
		return ""
	}
	return name
}

// tail keeps the end of what was written.
type tail struct {
	mu  sync.Mutex
	buf []byte
}

const tailBytes = 64 << 10

// Write implements io.Writer.
func (t *tail) Write(b []byte) (int, error) {
	t.mu.Lock()
	defer t.mu.Unlock()
	t.buf = append(t.buf, b...)
	if n := len(t.buf) - tailBytes; n > 0 {
		t.buf = append(t.buf[:0], t.buf[n:]...)
	}
	return len(b), nil
}

// String gives what was kept.
func (t *tail) String() string {
	t.mu.Lock()
	defer t.mu.Unlock()
	return string(t.buf)
}

// window opens the window and stays until it is closed.
func window(sample bool, path string) int {
	program.UseCores()
	parts, err := program.Load()
	if err != nil {
		fmt.Fprintln(os.Stderr, err)
		return exitUnexpected
	}
	a := fyneapp.NewWithID(AppID)
	w := New(a, parts)
	if os.Getenv("GOGC") == "" {
		// A window shares its machine with other programs: at rest it keeps little more than it needs. While
		// it computes it may have more, since collecting so often would cost time.
		w.Busy = func(busy bool) { debug.SetGCPercent(map[bool]int{true: 60, false: 12}[busy]) }
		w.Busy(true) // starting is work, too
	}
	w.window.Show()
	if !there(w.window) {
		return exitUnexpected // the toolkit has said why; left to itself it would run on without a window
	}
	w.watch(os.Stdin, os.Stdout)
	a.Lifecycle().SetOnStarted(func() { fmt.Println(upWord) })
	signals := make(chan os.Signal, 1)
	signal.Notify(signals, os.Interrupt, syscall.SIGTERM)
	go func() {
		<-signals
		w.End()
	}()
	switch {
	case sample:
		if path == "" {
			path = SamplePath()
		}
		w.Sample(path)
	case path != "":
		w.Open(path)
	case a.Preferences().String(lastKey) == "":
		w.Sample(SamplePath()) // a first start
	default:
		w.Offer()
	}
	a.Run()
	return exitDone
}

// there reports whether the system made the window.
func there(w fyne.Window) bool {
	n, ok := w.(driver.NativeWindow)
	made := !ok
	if ok {
		n.RunNative(func(c any) {
			switch c := c.(type) {
			case driver.X11WindowContext:
				made = c.WindowHandle != 0
			case driver.WaylandWindowContext:
				made = c.WaylandSurface != 0
			case driver.WindowsWindowContext:
				made = c.HWND != 0
			case driver.MacWindowContext:
				made = c.NSWindow != 0
			default:
				made = true
			}
		})
	}
	return made
}
