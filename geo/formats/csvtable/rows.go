package csvtable

import (
	"bufio"
	"context"
	"errors"
	"fmt"
	"io"
	"strings"
	"unicode/utf8"
)

const (
	blockBytes    = 64 << 10
	progressEvery = 1 << 20
	maxCell       = 1 << 20
)

// rows splits a stream into rows of cells.
type rows struct {
	ctx      context.Context
	r        *bufio.Reader
	comma    byte
	latin    bool
	maxBytes int64
	maxCells int
	progress func(int64)

	at       int64 // bytes read
	reported int64
	line     int // line that comes next
	cell     []byte
}

// row is one record with where it begins.
type row struct {
	line  int
	at    int64
	cells []string
}

func (s *rows) fault(line int, at int64, code, what, do string) *Error {
	return &Error{Line: line, Offset: at, Code: code, What: what, Do: do}
}

func (s *rows) next() (byte, error) {
	c, err := s.r.ReadByte()
	if err != nil {
		return 0, err
	}
	if s.at++; s.at > s.maxBytes {
		return 0, s.fault(s.line, s.at, "file_too_large", fmt.Sprintf("the file is larger than %d bytes", s.maxBytes), "split it")
	}
	if s.at-s.reported >= progressEvery {
		s.reported = s.at
		if s.progress != nil {
			s.progress(s.at)
		}
		if err := s.ctx.Err(); err != nil {
			return 0, err
		}
	}
	return c, nil
}

// read gives the next row that is not blank; io.EOF when there is none.
func (s *rows) read() (row, error) {
	for {
		rec := row{line: s.line, at: s.at}
		blank, last := true, false
		for !last {
			cell, quoted, end, err := s.readCell(rec)
			if err != nil {
				if errors.Is(err, io.EOF) && blank && len(rec.cells) == 0 {
					return row{}, io.EOF
				}
				return row{}, err
			}
			if len(rec.cells) >= s.maxCells {
				return row{}, s.fault(rec.line, rec.at, "too_many", fmt.Sprintf("a row has more than %d cells", s.maxCells), "check the delimiter, or leave columns out")
			}
			blank = blank && cell == "" && !quoted
			rec.cells = append(rec.cells, cell)
			last = end
		}
		if blank && len(rec.cells) == 1 {
			continue
		}
		return rec, nil
	}
}

// readCell reads one cell; last is true behind the last one of a row. io.EOF is only given when there
// is no byte left at all.
func (s *rows) readCell(rec row) (cell string, quoted, last bool, err error) {
	s.cell = s.cell[:0]
	first := true
	inside := false
	for {
		c, err := s.next()
		switch {
		case errors.Is(err, io.EOF):
			if inside {
				return "", false, false, s.fault(rec.line, rec.at, "quote_open", "a quote that opens in this row is never closed", "close it, or take it out")
			}
			if first && len(rec.cells) == 0 {
				return "", false, false, io.EOF
			}
			cell, err = s.finish(rec, quoted)
			return cell, quoted, true, err
		case err != nil:
			return "", false, false, s.ioFault(err)
		}
		switch {
		case c == 0:
			return "", false, false, s.fault(s.line, s.at-1, "not_text", "there is a zero byte, so the file is not a text table", "save the table as CSV")
		case inside && c == '"':
			next, err := s.r.Peek(1)
			if len(next) == 1 && next[0] == '"' {
				if _, err := s.next(); err != nil {
					return "", false, false, s.ioFault(err)
				}
				s.cell = append(s.cell, '"')
				break
			}
			if len(next) == 0 && !errors.Is(err, io.EOF) {
				return "", false, false, s.ioFault(err)
			}
			if len(next) == 1 && next[0] != s.comma && next[0] != '\n' && next[0] != '\r' {
				return "", false, false, s.fault(s.line, s.at, "quote_stray", "something stands behind a closing quote", "double the quotes that belong to the text")
			}
			inside = false
		case inside:
			if c == '\n' {
				s.line++
			}
			s.cell = append(s.cell, c)
		case c == '"' && first:
			inside, quoted = true, true
		case c == '"':
			return "", false, false, s.fault(s.line, s.at-1, "quote_stray", "a quote stands in the middle of a cell", "put the whole cell in quotes and double the one inside")
		case c == s.comma:
			cell, err := s.finish(rec, quoted)
			return cell, quoted, false, err
		case c == '\n' || c == '\r':
			if c == '\r' {
				if next, _ := s.r.Peek(1); len(next) == 1 && next[0] == '\n' {
					if _, err := s.next(); err != nil {
						return "", false, false, s.ioFault(err)
					}
				}
			}
			s.line++
			cell, err := s.finish(rec, quoted)
			return cell, quoted, true, err
		default:
			s.cell = append(s.cell, c)
		}
		first = false
		if len(s.cell) > maxCell {
			return "", false, false, s.fault(rec.line, rec.at, "cell_too_long", fmt.Sprintf("a cell is longer than %d bytes", maxCell), "check whether a quote is closed")
		}
	}
}

func (s *rows) ioFault(err error) error {
	var e *Error
	if errors.As(err, &e) || errors.Is(err, context.Canceled) || errors.Is(err, context.DeadlineExceeded) {
		return err
	}
	e = s.fault(s.line, s.at, "unreadable", "the file cannot be read on", "")
	e.Err = err
	return e
}

func (s *rows) finish(rec row, quoted bool) (string, error) {
	b := s.cell
	text := ""
	switch {
	case s.latin:
		text = fromWindows1252(b)
	case !utf8.Valid(b):
		return "", s.fault(rec.line, rec.at, "not_utf8", "a cell is not in UTF-8", "save the file as UTF-8, or say that it is in Windows-1252")
	default:
		text = string(b)
	}
	if !quoted {
		text = strings.TrimSpace(text)
	}
	return text, nil
}

// high are the characters of Windows-1252 from 0x80 to 0x9f; the others are those of Latin-1.
var high = [...]rune{
	0x20ac, 0xfffd, 0x201a, 0x0192, 0x201e, 0x2026, 0x2020, 0x2021, 0x02c6, 0x2030, 0x0160, 0x2039, 0x0152, 0xfffd, 0x017d, 0xfffd,
	0xfffd, 0x2018, 0x2019, 0x201c, 0x201d, 0x2022, 0x2013, 0x2014, 0x02dc, 0x2122, 0x0161, 0x203a, 0x0153, 0xfffd, 0x017e, 0x0178,
}

func fromWindows1252(b []byte) string {
	var out strings.Builder
	for _, c := range b {
		switch {
		case c >= 0x80 && c < 0xa0:
			out.WriteRune(high[c-0x80])
		default:
			out.WriteRune(rune(c))
		}
	}
	return out.String()
}
