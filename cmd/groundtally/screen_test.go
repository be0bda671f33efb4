package main

import (
	"bytes"
	"context"
	"encoding/binary"
	"errors"
	"fmt"
	"image"
	"image/color"
	"io"
	"math/bits"
	"os"
	"os/exec"
	"path/filepath"
	"runtime"
	"slices"
	"strconv"
	"strings"
	"testing"
	"time"
)

// Size of the screen that the window is tried on: the smallest that it is made for.
const (
	screenWidthPx  = 1366
	screenHeightPx = 768
)

// onLinux skips a test elsewhere. On Linux nothing is skipped: what is missing there can be installed.
func onLinux(t *testing.T) {
	t.Helper()
	if runtime.GOOS != "linux" {
		t.Skipf("the window is tried on an X server without a screen, which %s does not bring", runtime.GOOS)
	}
}

// tool finds a program that a test needs.
func tool(t *testing.T, name string) string {
	t.Helper()
	path, err := exec.LookPath(name)
	if err != nil {
		t.Fatalf("%s is not installed; go run ./cmd/dev test installs it", name)
	}
	return path
}

// screen is an X server without a screen, with a frame buffer that can be read.
type screen struct {
	t       *testing.T
	display string
	frames  string // folder of the frame buffer
}

// newScreen starts an X server on a free display. It ends with the test.
func newScreen(t *testing.T, more ...string) *screen {
	t.Helper()
	s := &screen{t: t, frames: t.TempDir()}
	said, free, err := os.Pipe()
	if err != nil {
		t.Fatal(err)
	}
	defer said.Close()
	args := []string{"-displayfd", "3", "-screen", "0", fmt.Sprintf("%dx%dx24", screenWidthPx, screenHeightPx), "-fbdir", s.frames, "-nolisten", "tcp"}
	cmd := exec.Command(tool(t, "Xvfb"), append(args, more...)...)
	var errs bytes.Buffer
	cmd.Stderr = &errs
	cmd.ExtraFiles = []*os.File{free}
	if err := cmd.Start(); err != nil {
		t.Fatal(err)
	}
	if err := free.Close(); err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() {
		_ = cmd.Process.Kill()
		_ = cmd.Wait()
		number := strings.TrimPrefix(s.display, ":")
		_ = os.Remove("/tmp/.X" + number + "-lock") // a killed server leaves them
		_ = os.Remove("/tmp/.X11-unix/X" + number)
	})
	if err := said.SetReadDeadline(time.Now().Add(30 * time.Second)); err != nil {
		t.Fatal(err)
	}
	number, err := io.ReadAll(io.LimitReader(said, 16))
	if err != nil || len(bytes.TrimSpace(number)) == 0 {
		t.Fatalf("Xvfb did not start: %v\n%s", err, errs.String())
	}
	s.display = ":" + string(bytes.TrimSpace(number))
	return s
}

// do has xdotool work mouse and keyboard.
func (s *screen) do(words ...string) error {
	ctx, stop := context.WithTimeout(context.Background(), 30*time.Second)
	defer stop()
	cmd := exec.CommandContext(ctx, tool(s.t, "xdotool"), words...)
	cmd.Env = append(plainEnv(), "DISPLAY="+s.display)
	if out, err := cmd.CombinedOutput(); err != nil {
		return fmt.Errorf("xdotool %s: %w\n%s", strings.Join(words, " "), err, out)
	}
	return nil
}

// frame gives what the screen shows.
func (s *screen) frame() *image.RGBA {
	s.t.Helper()
	b, err := os.ReadFile(filepath.Join(s.frames, "Xvfb_screen0"))
	if err != nil {
		s.t.Fatal(err)
	}
	img, err := readXWD(b)
	if err != nil {
		s.t.Fatal(err)
	}
	return img
}

// still gives what the screen shows once it has stopped changing, or after some seconds as it is.
func (s *screen) still() *image.RGBA {
	s.t.Helper()
	last := s.frame()
	for same, n := 0, 0; same < 2 && n < 40; n++ {
		time.Sleep(120 * time.Millisecond)
		now := s.frame()
		if bytes.Equal(now.Pix, last.Pix) {
			same++
		} else {
			same = 0
		}
		last = now
	}
	return last
}

// Words of the header of an X window dump, each of four bytes, the most significant first.
const (
	xwdHeaderBytes = iota
	xwdVersion
	xwdFormat
	xwdDepth
	xwdWidth
	xwdHeight
	_
	xwdByteOrder
	_
	_
	_
	xwdBitsPerPixel
	xwdBytesPerLine
	_
	xwdRedMask
	xwdGreenMask
	xwdBlueMask
	_
	_
	xwdColours
	xwdWords = 25
)

// readXWD reads an X window dump of 32 bits per pixel.
func readXWD(b []byte) (*image.RGBA, error) {
	if len(b) < 4*xwdWords {
		return nil, errors.New("the dump of the screen has no header")
	}
	head := func(i int) int { return int(binary.BigEndian.Uint32(b[4*i:])) }
	if head(xwdVersion) != 7 || head(xwdFormat) != 2 || head(xwdBitsPerPixel) != 32 {
		return nil, fmt.Errorf("a dump of version %d, format %d, %d bits per pixel", head(xwdVersion), head(xwdFormat), head(xwdBitsPerPixel))
	}
	width, height, stride := head(xwdWidth), head(xwdHeight), head(xwdBytesPerLine)
	start := head(xwdHeaderBytes) + 12*head(xwdColours)
	if width <= 0 || height <= 0 || stride < 4*width || start < 0 || len(b)-start < stride*height {
		return nil, fmt.Errorf("a dump of %d by %d pixels in %d bytes", width, height, len(b))
	}
	var order binary.ByteOrder = binary.BigEndian
	if head(xwdByteOrder) == 0 {
		order = binary.LittleEndian
	}
	shift := func(mask int) int { return bits.TrailingZeros32(uint32(head(mask))) }
	red, green, blue := shift(xwdRedMask), shift(xwdGreenMask), shift(xwdBlueMask)
	img := image.NewRGBA(image.Rect(0, 0, width, height))
	for y := range height {
		for x := range width {
			p := order.Uint32(b[start+y*stride+4*x:])
			img.SetRGBA(x, y, color.RGBA{uint8(p >> red), uint8(p >> green), uint8(p >> blue), 255})
		}
	}
	return img, nil
}

// A dump is read by its own header: where the pixels begin, in which order their bytes are.
func TestReadXWD(t *testing.T) {
	const width, height, stride, colours, headBytes = 2, 2, 12, 1, 4*xwdWords + 8
	for _, order := range []binary.ByteOrder{binary.LittleEndian, binary.BigEndian} {
		b := make([]byte, headBytes+12*colours+stride*height)
		set := func(word, value int) { binary.BigEndian.PutUint32(b[4*word:], uint32(value)) }
		for word, value := range map[int]int{xwdHeaderBytes: headBytes, xwdVersion: 7, xwdFormat: 2, xwdDepth: 24, xwdWidth: width, xwdHeight: height,
			xwdBitsPerPixel: 32, xwdBytesPerLine: stride, xwdRedMask: 0xff0000, xwdGreenMask: 0xff00, xwdBlueMask: 0xff, xwdColours: colours} {
			set(word, value)
		}
		if order == binary.BigEndian {
			set(xwdByteOrder, 1)
		}
		order.PutUint32(b[headBytes+12*colours+stride+4:], 0x102030)
		img, err := readXWD(b)
		if err != nil {
			t.Fatal(err)
		}
		if got := img.RGBAAt(1, 1); got != (color.RGBA{0x10, 0x20, 0x30, 255}) || img.RGBAAt(0, 1) != (color.RGBA{0, 0, 0, 255}) {
			t.Errorf("%v: %v and %v", order, got, img.RGBAAt(0, 1))
		}
		if _, err := readXWD(b[:len(b)-1]); err == nil {
			t.Error("a dump that is cut off is read")
		}
	}
	if _, err := readXWD(nil); err == nil {
		t.Error("an empty dump is read")
	}
}

// plainEnv is the environment without what would lead a program to another screen or to somebody's own
// folders, in plain words.
func plainEnv() []string {
	env := slices.DeleteFunc(os.Environ(), func(v string) bool {
		name, _, _ := strings.Cut(v, "=")
		return name == "DISPLAY" || name == "WAYLAND_DISPLAY" || name == "HOME" || name == "LANG" || name == "LANGUAGE" ||
			strings.HasPrefix(name, "XDG_") || strings.HasPrefix(name, "LC_") || strings.HasPrefix(name, "FYNE_") || strings.HasPrefix(name, "GROUNDTALLY_")
	})
	return append(env, "LANG=C")
}

// childOf finds the one child of a process.
func childOf(t *testing.T, pid int) *os.Process {
	t.Helper()
	files, err := filepath.Glob("/proc/[0-9]*/status")
	if err != nil {
		t.Fatal(err)
	}
	var found []int
	for _, f := range files {
		b, err := os.ReadFile(f)
		if err != nil {
			continue // it has ended meanwhile
		}
		for line := range strings.Lines(string(b)) {
			if v, ok := strings.CutPrefix(line, "PPid:"); ok && strings.TrimSpace(v) == strconv.Itoa(pid) {
				n, err := strconv.Atoi(filepath.Base(filepath.Dir(f)))
				if err != nil {
					t.Fatal(err)
				}
				found = append(found, n)
			}
		}
	}
	if len(found) != 1 {
		t.Fatalf("process %d has the children %v, want one", pid, found)
	}
	p, err := os.FindProcess(found[0])
	if err != nil {
		t.Fatal(err)
	}
	return p
}
