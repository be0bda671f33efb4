package gpkgin

import (
	"context"
	"errors"
	"io/fs"
	"regexp"
	"strings"

	"modernc.org/sqlite"

	"groundtally/geo/formats"
)

// Primary result codes of SQLite, https://www.sqlite.org/rescode.html.
const (
	codeError     = 1
	codePerm      = 3
	codeBusy      = 5
	codeLocked    = 6
	codeNoMemory  = 7
	codeReadOnly  = 8
	codeInterrupt = 9
	codeIOErr     = 10
	codeCorrupt   = 11
	codeCantOpen  = 14
	codeProtocol  = 15
	codeTooBig    = 18
	codeAuth      = 23
	codeNotADB    = 26

	codeReadOnlyRollback = codeReadOnly | 3<<8
	codeIOErrShortRead   = codeIOErr | 2<<8
	codeIOErrCorruptFS   = codeIOErr | 33<<8
)

const (
	doCopy   = "copy or download it again"
	doExport = "export the layer again from the program that made it"
	doSplit  = "cut the file to the district, or split it"
)

func sqliteCode(err error) int {
	var se *sqlite.Error
	if errors.As(err, &se) {
		return se.Code()
	}
	return 0
}

// plain turns what SQLite or the system reports into an error with a cure. A stop by the user stays
// what it is.
func plain(file, where string, err error) error {
	var done *formats.Error
	if err == nil || errors.As(err, &done) || errors.Is(err, context.Canceled) || errors.Is(err, context.DeadlineExceeded) {
		return err
	}
	e := &formats.Error{File: file, Where: where, Code: "not_readable", What: "it cannot be read", Do: doCopy, Err: worded{err}}
	switch code := sqliteCode(err); {
	case code == codeIOErrShortRead, code == codeIOErrCorruptFS, code&0xff == codeCorrupt, code&0xff == codeNotADB:
		e.Code, e.What = "damaged", "the file is damaged or cut short"
	case code == codeReadOnlyRollback:
		e.Code, e.What = "half_written", "another program was stopped while it wrote the file"
		e.Do = "open it once in that program, so that it can be mended"
	case code&0xff == codeBusy, code&0xff == codeLocked, code&0xff == codeProtocol:
		e.Code, e.What = "locked", "another program is writing the file"
		e.Do = "wait until it is done, or close the file there"
	case code&0xff == codeReadOnly, code&0xff == codeCantOpen, code&0xff == codePerm, code&0xff == codeAuth:
		e.What, e.Do = "the file or one beside it cannot be opened", "copy it into a folder of your own"
	case code&0xff == codeTooBig, code&0xff == codeNoMemory:
		e.Code, e.What, e.Do = "too_large", "a value of it is too large to be read", doSplit
	case code&0xff == codeIOErr:
		e.Code, e.What, e.Do = "drive", "the drive reported a fault", "copy the file to another drive"
	case code&0xff == codeError:
		e.Code, e.What, e.Do = "not_as_standard", "it is not made as the standard for GeoPackages asks", doExport
	case errors.Is(err, fs.ErrNotExist):
		e.Code, e.What, e.Do = "not_there", "there is no such file", "check the name"
	case errors.Is(err, fs.ErrPermission):
		e.What, e.Do = "you have no right to read the file", "change its permissions, or copy it into a folder of your own"
	}
	return e
}

// worded is an error whose text leaves out the number that SQLite's driver writes behind its words.
type worded struct{ error }

var driverCode = regexp.MustCompile(`( \(\d+\)| \(SQLITE_\w+\))+$`)

func (w worded) Error() string {
	text := w.error.Error()
	var se *sqlite.Error
	if errors.As(w.error, &se) {
		text = strings.ReplaceAll(text, se.Error(), driverCode.ReplaceAllString(se.Error(), ""))
	}
	return text
}

func (w worded) Unwrap() error { return w.error }
