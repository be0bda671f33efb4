package csvtable

import "fmt"

// Error says what is wrong with a table, where, and what to do about it.
type Error struct {
	File   string
	Line   int    // 1-based line of the file; 0 when the fault is of the whole file
	Column string // name of the column, where one is concerned
	Offset int64  // byte at which the row begins, or the fault where Column is empty
	Code   string // stable name of the fault
	What   string
	Do     string
	Err    error
}

func (e *Error) Error() string {
	s := ""
	if e.File != "" {
		s = e.File + ": "
	}
	if e.Line > 0 {
		s += fmt.Sprintf("row %d, ", e.Line)
	}
	if e.Column != "" {
		s += fmt.Sprintf("column %q, ", e.Column)
	}
	s += e.What
	if e.Err != nil {
		s += ": " + e.Err.Error()
	}
	if e.Do != "" {
		s += "; " + e.Do
	}
	return s
}

func (e *Error) Unwrap() error { return e.Err }
