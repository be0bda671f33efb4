package store

import (
	"context"
	"errors"
	"fmt"
	"io/fs"
	"syscall"

	"modernc.org/sqlite"

	"groundtally/app/study"
)

// ErrDrive says that the drive reported a fault while it was read or written.
var ErrDrive = errors.New("drive reported a fault")

// Result codes of SQLite, https://www.sqlite.org/rescode.html. The low byte is the primary code.
const (
	codePerm     = 3
	codeBusy     = 5
	codeLocked   = 6
	codeReadOnly = 8
	codeIOErr    = 10
	codeCorrupt  = 11
	codeFull     = 13
	codeCantOpen = 14
	codeTooBig   = 18
	codeAuth     = 23
	codeNotADB   = 26

	codeReadOnlyMoved  = codeReadOnly | 4<<8
	codeIOErrShortRead = codeIOErr | 2<<8
	codeIOErrWrite     = codeIOErr | 3<<8
	codeIOErrCorruptFS = codeIOErr | 33<<8
)

// wrap names the file and puts the typed error of the study package in front of what SQLite says.
func wrap(path, doing string, err error) error {
	if err == nil {
		return nil
	}
	if kind := classify(err); kind != nil && !errors.Is(err, kind) {
		return fmt.Errorf("%s %q: %w: %w", doing, path, kind, err)
	}
	return fmt.Errorf("%s %q: %w", doing, path, err)
}

func classify(err error) error {
	if errors.Is(err, context.Canceled) || errors.Is(err, context.DeadlineExceeded) {
		return nil
	}
	var se *sqlite.Error
	if !errors.As(err, &se) {
		switch {
		case errors.Is(err, fs.ErrNotExist):
			return study.ErrNotThere
		case errors.Is(err, fs.ErrExist):
			return study.ErrNameInUse
		case errors.Is(err, fs.ErrPermission), errors.Is(err, syscall.EROFS):
			return study.ErrReadOnly
		case errors.Is(err, syscall.ENOSPC):
			return study.ErrDiskFull
		}
		return nil
	}
	switch se.Code() {
	case codeReadOnlyMoved:
		return study.ErrNotThere
	case codeIOErrShortRead, codeIOErrCorruptFS:
		return study.ErrDamaged
	case codeIOErrWrite:
		// SQLite reports "no space" as codeFull; what is left is a quota, a size limit of the file
		// system or a failing drive. The first two are far more common and have the same cure.
		return study.ErrDiskFull
	}
	switch se.Code() & 0xff {
	case codeBusy, codeLocked:
		return study.ErrBusy
	case codeReadOnly, codeCantOpen, codePerm, codeAuth:
		return study.ErrReadOnly
	case codeFull:
		return study.ErrDiskFull
	case codeCorrupt:
		return study.ErrDamaged
	case codeNotADB:
		return study.ErrNotAStudy
	case codeIOErr:
		return ErrDrive
	}
	return nil
}

func primaryCode(err error) int {
	var se *sqlite.Error
	if errors.As(err, &se) {
		return se.Code() & 0xff
	}
	return 0
}
