package geojson

import (
	"fmt"
	"strconv"
)

// Error says what is wrong with a file, where, and what to do about it.
type Error struct {
	File    string // as given in Options; may be empty
	Feature int    // 1-based number of the feature, or of the record in a sequence; 0 outside of them
	ID      string // identifier of the feature, where it was read before the fault
	Offset  int64  // byte at which the fault was seen
	Code    string // stable name of the fault, "truncated" for one
	What    string
	Do      string
	Err     error // what the file reported, if it was the file
}

func (e *Error) Error() string {
	s := e.File
	if s != "" {
		s += ": "
	}
	if e.Feature > 0 {
		s += "feature " + strconv.Itoa(e.Feature)
		if e.ID != "" {
			s += " (" + e.ID + ")"
		}
		s += ", "
	}
	s += fmt.Sprintf("byte %d: %s", e.Offset, e.What)
	if e.Err != nil {
		s += ": " + e.Err.Error()
	}
	if e.Do != "" {
		s += "; " + e.Do
	}
	return s
}

func (e *Error) Unwrap() error { return e.Err }

const (
	doExport = "export the file again from the program that made it"
	doSplit  = "cut the file to the district, or split it"
)
