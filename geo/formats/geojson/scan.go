package geojson

import (
	"context"
	"errors"
	"fmt"
	"io"
	"math"
	"strconv"
	"unicode/utf16"
	"unicode/utf8"
)

const (
	blockBytes    = 64 << 10
	progressEvery = 1 << 20
	recordMark    = 0x1e
)

// scanner reads JSON from a stream, byte by byte out of a block. Before a fault is reported the byte
// that caused it has not been consumed.
type scanner struct {
	ctx      context.Context
	r        io.Reader
	buf      []byte
	pos, end int
	base     int64 // offset of buf[0] in the file
	failed   error // why no more can be read; io.EOF at the end

	maxBytes int64
	maxValue int
	maxDepth int
	depth    int

	capturing bool
	capFrom   int
	captured  []byte

	progress func(int64)
	reported int64

	opened  bool // the bracket of a position has been passed already
	scratch []byte
	names   map[string]string // member names met so far, to hold each once
}

// They bound the member names that are kept, for files that never repeat one.
const (
	maxNames     = 4096
	maxNameBytes = 256
)

// intern gives the text that the bytes spell, as one string for all members of that name.
func (s *scanner) intern(b []byte) string {
	if name, ok := s.names[string(b)]; ok {
		return name
	}
	name := string(b)
	if len(s.names) < maxNames && len(name) <= maxNameBytes {
		s.names[name] = name
	}
	return name
}

func (s *scanner) offset() int64 { return s.base + int64(s.pos) }

func (s *scanner) fault(code, what, do string) *Error {
	return &Error{Offset: s.offset(), Code: code, What: what, Do: do}
}

// fill reads the next block; it is only called when the block is used up.
func (s *scanner) fill() bool {
	if s.failed != nil {
		return false
	}
	if err := s.ctx.Err(); err != nil {
		s.failed = err
		return false
	}
	if s.capturing {
		s.captured = append(s.captured, s.buf[s.capFrom:s.end]...)
		s.capFrom = 0
		if len(s.captured) > s.maxValue {
			s.failed = s.fault("value_too_long", fmt.Sprintf("a value is longer than %d bytes", s.maxValue), doSplit)
			return false
		}
	}
	s.base += int64(s.end)
	s.pos, s.end = 0, 0
	if s.base >= s.maxBytes {
		// One more byte tells a file of exactly the limit from a longer one.
		n, err := io.ReadFull(s.r, s.buf[:1])
		s.failed = err
		if n > 0 {
			s.failed = s.fault("file_too_large", fmt.Sprintf("the file is larger than %d bytes", s.maxBytes), doSplit)
		}
		return false
	}
	for range 100 {
		n, err := s.r.Read(s.buf[:min(int64(len(s.buf)), s.maxBytes-s.base)])
		s.end = n
		if err != nil {
			s.failed = err
		}
		if n > 0 {
			if at := s.base + int64(n); s.progress != nil && (at-s.reported >= progressEvery || err != nil) {
				s.reported = at
				s.progress(at)
			}
			return true
		}
		if err != nil {
			return false
		}
	}
	s.failed = io.ErrNoProgress
	return false
}

// peek gives the next byte; ok is false at the end of what can be read.
func (s *scanner) peek() (c byte, ok bool) {
	if s.pos < s.end || s.fill() {
		return s.buf[s.pos], true
	}
	return 0, false
}

// ended says why there is no next byte.
func (s *scanner) ended() error {
	var e *Error
	switch {
	case errors.As(s.failed, &e):
		return e
	case errors.Is(s.failed, io.EOF), errors.Is(s.failed, io.ErrUnexpectedEOF):
		return s.fault("truncated", "the file ends in the middle", "copy or download it again; nothing was taken from it")
	case errors.Is(s.failed, context.Canceled), errors.Is(s.failed, context.DeadlineExceeded):
		return s.failed
	}
	e = s.fault("unreadable", "the file cannot be read on", "")
	e.Err = s.failed
	return e
}

// space passes white space and gives the byte behind it.
func (s *scanner) space() (byte, error) {
	for {
		c, ok := s.peek()
		if !ok {
			return 0, s.ended()
		}
		if c != ' ' && c != '\n' && c != '\r' && c != '\t' {
			return c, nil
		}
		s.pos++
	}
}

func (s *scanner) unexpected(c byte, wanted string) error {
	return s.fault("not_json", fmt.Sprintf("%s was expected, not %s", wanted, byteName(c)), doExport)
}

func byteName(c byte) string {
	if c > ' ' && c < 0x7f {
		return strconv.QuoteRune(rune(c))
	}
	return fmt.Sprintf("byte %#02x", c)
}

func (s *scanner) take(want byte) error {
	c, err := s.space()
	if err != nil {
		return err
	}
	if c != want {
		return s.unexpected(c, byteName(want))
	}
	s.pos++
	return nil
}

func (s *scanner) enter(open byte) error {
	if err := s.take(open); err != nil {
		return err
	}
	if s.depth++; s.depth > s.maxDepth {
		s.pos--
		return s.fault("too_deep", fmt.Sprintf("values are nested more than %d deep", s.maxDepth), doExport)
	}
	return nil
}

// more passes a comma or the closing byte behind member number i of an object or array.
func (s *scanner) more(i int, closing byte) (bool, error) {
	c, err := s.space()
	if err != nil {
		return false, err
	}
	if c == closing {
		s.pos++
		s.depth--
		return false, nil
	}
	if i == 0 {
		return true, nil
	}
	if c != ',' {
		return false, s.unexpected(c, "',' or "+byteName(closing))
	}
	s.pos++
	return true, nil
}

// object calls fn with each member name; fn reads the value.
func (s *scanner) object(fn func(name string) error) error {
	if err := s.enter('{'); err != nil {
		return err
	}
	for i := 0; ; i++ {
		more, err := s.more(i, '}')
		if err != nil || !more {
			return err
		}
		if c, err := s.space(); err != nil {
			return err
		} else if c != '"' {
			return s.unexpected(c, "a member name in double quotes")
		}
		b, err := s.textBytes()
		if err != nil {
			return err
		}
		name := s.intern(b)
		if err := s.take(':'); err != nil {
			return err
		}
		if err := fn(name); err != nil {
			return err
		}
	}
}

// array calls fn before each element; fn reads it.
func (s *scanner) array(fn func(i int) error) error {
	if err := s.enter('['); err != nil {
		return err
	}
	for i := 0; ; i++ {
		more, err := s.more(i, ']')
		if err != nil || !more {
			return err
		}
		if err := fn(i); err != nil {
			return err
		}
	}
}

// text reads a string. Broken escapes and bytes that are not UTF-8 are faults, since what they stood
// for cannot be known.
func (s *scanner) text() (string, error) {
	b, err := s.textBytes()
	return string(b), err
}

// textBytes reads a string as text does; the bytes stay valid until the next call.
func (s *scanner) textBytes() ([]byte, error) {
	if err := s.take('"'); err != nil {
		return nil, err
	}
	// Most texts are plain and lie in the block whole.
	for i := s.pos; i < s.end; i++ {
		c := s.buf[i]
		if c == '"' && i-s.pos <= s.maxValue {
			b := s.buf[s.pos:i]
			s.pos = i + 1
			return b, nil
		}
		if c < ' ' || c == '\\' || c >= utf8.RuneSelf {
			break
		}
	}
	s.scratch = s.scratch[:0]
	ascii := true
	for {
		c, ok := s.peek()
		if !ok {
			return nil, s.ended()
		}
		switch {
		case c == '"':
			if !ascii && !utf8.Valid(s.scratch) {
				return nil, s.fault("not_utf8", "a text is not in UTF-8", "save the file as UTF-8")
			}
			s.pos++
			return s.scratch, nil
		case c == '\\':
			if err := s.escape(); err != nil {
				return nil, err
			}
			ascii = false
		case c < ' ':
			return nil, s.unexpected(c, "the end of a text or an escape")
		default:
			s.pos++
			if c >= utf8.RuneSelf {
				ascii = false
			}
			s.scratch = append(s.scratch, c)
		}
		if len(s.scratch) > s.maxValue {
			return nil, s.fault("value_too_long", fmt.Sprintf("a text is longer than %d bytes", s.maxValue), doExport)
		}
	}
}

var escapes = map[byte]byte{'"': '"', '\\': '\\', '/': '/', 'b': '\b', 'f': '\f', 'n': '\n', 'r': '\r', 't': '\t'}

func (s *scanner) escape() error {
	s.pos++
	c, ok := s.peek()
	if !ok {
		return s.ended()
	}
	if p, ok := escapes[c]; ok {
		s.pos++
		s.scratch = append(s.scratch, p)
		return nil
	}
	if c != 'u' {
		return s.unexpected(c, "a letter of an escape")
	}
	s.pos++
	r, err := s.hex4()
	if err != nil {
		return err
	}
	if utf16.IsSurrogate(r) {
		for _, want := range []byte(`\u`) {
			c, ok := s.peek()
			if !ok {
				return s.ended()
			}
			if c != want {
				return s.fault("not_utf8", "half a character was escaped", doExport)
			}
			s.pos++
		}
		low, err := s.hex4()
		if err != nil {
			return err
		}
		if r = utf16.DecodeRune(r, low); r == utf8.RuneError {
			return s.fault("not_utf8", "half a character was escaped", doExport)
		}
	}
	s.scratch = utf8.AppendRune(s.scratch, r)
	return nil
}

func (s *scanner) hex4() (rune, error) {
	var r rune
	for range 4 {
		c, ok := s.peek()
		if !ok {
			return 0, s.ended()
		}
		var d byte
		switch {
		case c >= '0' && c <= '9':
			d = c - '0'
		case c >= 'a' && c <= 'f':
			d = c - 'a' + 10
		case c >= 'A' && c <= 'F':
			d = c - 'A' + 10
		default:
			return 0, s.unexpected(c, "a hexadecimal digit")
		}
		r = r<<4 | rune(d)
		s.pos++
	}
	return r, nil
}

// maxNumber bounds the length of a number, in digits; the longest exact decimal form of a double has
// 767 significant ones.
const maxNumber = 1200

// number reads a number by the grammar of RFC 8259; whole is true when it has neither fraction nor
// exponent. The literal stays valid until the next call.
func (s *scanner) number() (literal []byte, value float64, whole bool, err error) {
	if literal, value, whole, ok := plainNumber(s.buf[s.pos:s.end]); ok {
		s.pos += len(literal)
		return literal, value, whole, nil
	}
	at := s.offset()
	s.scratch = s.scratch[:0]
	next := func() byte {
		c, ok := s.peek()
		if !ok {
			return 0
		}
		return c
	}
	keep := func(c byte) {
		s.pos++
		s.scratch = append(s.scratch, c)
	}
	digits := func() error {
		n := 0
		for c := next(); c >= '0' && c <= '9'; c = next() {
			keep(c)
			if n++; n > maxNumber {
				return s.fault("number_too_long", "a number has too many digits", doExport)
			}
		}
		if n == 0 {
			if _, ok := s.peek(); !ok {
				return s.ended()
			}
			return s.unexpected(next(), "a digit")
		}
		return nil
	}
	if next() == '-' {
		keep('-')
	}
	if next() == '0' {
		keep('0')
		if c := next(); c >= '0' && c <= '9' {
			return nil, 0, false, s.fault("not_json", "a number begins with a needless zero", doExport)
		}
	} else if err := digits(); err != nil {
		return nil, 0, false, err
	}
	whole = true
	if next() == '.' {
		whole = false
		keep('.')
		if err := digits(); err != nil {
			return nil, 0, false, err
		}
	}
	if c := next(); c == 'e' || c == 'E' {
		whole = false
		keep(c)
		if c := next(); c == '+' || c == '-' {
			keep(c)
		}
		if err := digits(); err != nil {
			return nil, 0, false, err
		}
	}
	value, err = strconv.ParseFloat(string(s.scratch), 64)
	if err != nil || math.IsInf(value, 0) {
		e := s.fault("number_too_large", "a number is too large: "+short(s.scratch), doExport)
		e.Offset = at
		return nil, 0, false, e
	}
	return s.scratch, value, whole, nil
}

// pow10 are the powers of ten that a double holds exactly.
var pow10 = [...]float64{1e0, 1e1, 1e2, 1e3, 1e4, 1e5, 1e6, 1e7, 1e8, 1e9, 1e10, 1e11, 1e12, 1e13, 1e14, 1e15, 1e16, 1e17, 1e18, 1e19, 1e20, 1e21, 1e22}

// plainNumber reads a number without an exponent that lies whole in the bytes and whose digits, read as a
// whole number, and whose power of ten are doubles exactly: one division then gives the nearest double
// (W. D. Clinger, How to read floating point numbers accurately, 1990). It is not ok for any other, good
// or bad.
func plainNumber(b []byte) (literal []byte, value float64, whole, ok bool) {
	i := 0
	negative := len(b) > 0 && b[0] == '-'
	if negative {
		i = 1
	}
	first := i
	var m uint64
	point := -1
	for ; i < len(b); i++ {
		c := b[i]
		if c-'0' <= 9 {
			if m = m*10 + uint64(c-'0'); m > maxWhole {
				return nil, 0, false, false
			}
			continue
		}
		if c != '.' || point >= 0 {
			break
		}
		point = i
	}
	// The byte behind must be there, and end the number for sure.
	if i >= len(b) || i == first || point == first || point == i-1 || b[i] != ',' && b[i] != ']' && b[i] != '}' && b[i] > ' ' {
		return nil, 0, false, false
	}
	if b[first] == '0' && i-first > 1 && point != first+1 {
		return nil, 0, false, false // a needless zero
	}
	value = float64(m)
	if point >= 0 {
		places := i - point - 1
		if places >= len(pow10) {
			return nil, 0, false, false
		}
		value /= pow10[places]
	}
	if negative {
		value = -value
	}
	return b[:i], value, point < 0, true
}

func short(b []byte) string {
	if len(b) > 40 {
		return string(b[:40]) + "..."
	}
	return string(b)
}

func (s *scanner) word(w string) error {
	at := s.offset()
	for i := range len(w) {
		c, ok := s.peek()
		if !ok {
			return s.ended()
		}
		if c != w[i] {
			e := s.fault("not_json", "a value was expected", doExport)
			e.Offset = at
			return e
		}
		s.pos++
	}
	return nil
}

// skip reads over a value of any kind, checking its grammar.
func (s *scanner) skip() error {
	c, err := s.space()
	if err != nil {
		return err
	}
	switch {
	case c == '{':
		return s.object(func(string) error { return s.skip() })
	case c == '[':
		return s.array(func(int) error { return s.skip() })
	case c == '"':
		_, err := s.text()
		return err
	case c == 't':
		return s.word("true")
	case c == 'f':
		return s.word("false")
	case c == 'n':
		return s.word("null")
	case c == '-' || c >= '0' && c <= '9':
		_, _, _, err := s.number()
		return err
	}
	return s.notAValue(c)
}

func (s *scanner) notAValue(c byte) error {
	if c == 'N' || c == 'I' {
		return s.fault("not_a_number", "NaN and Infinity are no numbers in JSON", "write null where a value is missing")
	}
	return s.unexpected(c, "a value")
}

// raw reads over a value and gives its bytes with the offset of the first.
func (s *scanner) raw() ([]byte, int64, error) {
	if _, err := s.space(); err != nil {
		return nil, 0, err
	}
	at := s.offset()
	s.capturing, s.capFrom, s.captured = true, s.pos, nil
	err := s.skip()
	b := append(s.captured, s.buf[s.capFrom:s.pos]...)
	s.capturing, s.captured = false, nil
	if err == nil && len(b) > s.maxValue {
		err = s.fault("value_too_long", fmt.Sprintf("a value is longer than %d bytes", s.maxValue), doSplit)
	}
	return b, at, err
}

func (s *scanner) badNumber(c byte) error {
	if c == 'N' || c == 'I' {
		return s.notAValue(c)
	}
	if c == 'n' {
		return s.fault("bad_coordinates", "a coordinate is null", "take the position out, or write null for the whole geometry")
	}
	return s.fault("bad_coordinates", "a coordinate was expected, not "+byteName(c), doExport)
}

// null passes a null if there is one.
func (s *scanner) null() (bool, error) {
	c, err := s.space()
	if err != nil || c != 'n' {
		return false, err
	}
	return true, s.word("null")
}
