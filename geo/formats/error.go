package formats

// Error says what is wrong with a file, where, and what to do about it.
type Error struct {
	File  string // as given to the reader; may be empty
	Where string // "feature 12", "tile 3 of 40", "sheet 2, row 7"; may be empty
	Code  string // stable name of the fault, "truncated" for one
	What  string
	Do    string
	Err   error // what the file reported, if it was the file
}

func (e *Error) Error() string {
	s := e.What
	if e.Where != "" {
		s = e.Where + ": " + s
	}
	if e.File != "" {
		s = e.File + ": " + s
	}
	if e.Err != nil {
		s += ": " + e.Err.Error()
	}
	if e.Do != "" {
		s += "; " + e.Do
	}
	return s
}

func (e *Error) Unwrap() error { return e.Err }
