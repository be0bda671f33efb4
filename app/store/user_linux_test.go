package store

import (
	"errors"
	"fmt"
	"os"
	"os/signal"
	"path/filepath"
	"runtime"
	"strings"
	"syscall"
	"testing"

	"groundtally/app/study"
)

const nobody = 65534

// asOrdinaryUser makes the rest of the test subject to file permissions, which the superuser is not:
// the file access of this thread becomes that of the user nobody. Folders above dir stay passable.
func asOrdinaryUser(t *testing.T, dir string) {
	t.Helper()
	if os.Geteuid() != 0 {
		return
	}
	for p := dir; len(p) >= len(os.TempDir()) && p != os.TempDir(); p = filepath.Dir(p) {
		if err := os.Chmod(p, 0o755); err != nil {
			t.Fatal(err)
		}
	}
	entries, err := os.ReadDir(dir)
	if err != nil {
		t.Fatal(err)
	}
	for _, e := range entries {
		if err := os.Chown(filepath.Join(dir, e.Name()), nobody, nobody); err != nil {
			t.Fatal(err)
		}
	}
	if err := os.Chown(dir, nobody, nobody); err != nil {
		t.Fatal(err)
	}
	runtime.LockOSThread()
	setfsuid := func(uid uintptr) {
		// The call reports the old user and no error, so what counts is the second answer.
		syscall.RawSyscall(syscall.SYS_SETFSUID, uid, 0, 0)
		if now, _, _ := syscall.RawSyscall(syscall.SYS_SETFSUID, ^uintptr(0), 0, 0); now != uid {
			t.Fatalf("files are accessed as user %d, not %d", now, uid)
		}
	}
	setfsuid(nobody)
	t.Cleanup(func() {
		setfsuid(0)
		runtime.UnlockOSThread()
	})
}

// The system refuses to let any file grow beyond a size, for sizes from nothing to enough: the
// journal and the study are both cut off at every place.
func TestSystemRefusesToWrite(t *testing.T) {
	s, path := newStudy(t)
	first := version(awkward()["many parts"])
	if _, err := s.Commit(ctx, entry("add", set("a", "", `1`)), []study.Version{first}); err != nil {
		t.Fatal(err)
	}
	before, err := s.Load(ctx)
	if err != nil {
		t.Fatal(err)
	}
	second := version(bigLayer(60))
	signal.Ignore(syscall.SIGXFSZ)
	defer signal.Reset(syscall.SIGXFSZ)
	var usually syscall.Rlimit
	if err := syscall.Getrlimit(syscall.RLIMIT_FSIZE, &usually); err != nil {
		t.Fatal(err)
	}
	failures := 0
	for size := uint64(0); ; size += 1000 {
		err := limited(size, usually, func() error {
			_, err := s.Commit(ctx, entry("add", set("a", `1`, fmt.Sprint(size))), []study.Version{second})
			return err
		})
		if err == nil {
			break
		}
		failures++
		if !errors.Is(err, study.ErrDiskFull) && !errors.Is(err, ErrDrive) && !errors.Is(err, study.ErrReadOnly) {
			t.Fatalf("%d bytes: %v", size, err)
		}
		if !strings.Contains(err.Error(), path) {
			t.Fatalf("%d bytes: %v does not name the file", size, err)
		}
		unchanged(t, path, before, first.Digest, second.Digest, nil, false)
	}
	if failures < 20 {
		t.Errorf("only %d sizes were too small", failures)
	}
}

func limited(size uint64, usually syscall.Rlimit, fn func() error) error {
	tight := usually
	tight.Cur = size
	if err := syscall.Setrlimit(syscall.RLIMIT_FSIZE, &tight); err != nil {
		return err
	}
	err := fn()
	return errors.Join(err, syscall.Setrlimit(syscall.RLIMIT_FSIZE, &usually))
}
