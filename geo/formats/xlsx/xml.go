package xlsx

import (
	"archive/zip"
	"bufio"
	"context"
	"encoding/xml"
	"errors"
	"fmt"
	"io"
	"strings"

	"groundtally/geo/formats"
)

const (
	maxDepth      = 100
	maxToken      = 4 << 20 // bytes of one text or one tag; a cell has room for 32,767 characters
	progressEvery = 1 << 20
)

// stream is one part while it is read: the tags and the text between them.
type stream struct {
	b     *book
	name  string
	in    io.ReadCloser
	dec   *xml.Decoder
	depth int
	token int64 // bytes read since the last tag
	text  []byte
	want  bool // text is kept
}

// part opens one part of the archive.
func (b *book) part(name string) (*stream, error) {
	f := b.parts[strings.ToLower(name)]
	if f == nil {
		return nil, &formats.Error{Where: name, Code: "damaged", What: "the part is missing in the workbook", Do: doSave}
	}
	if f.Flags&1 != 0 {
		return nil, &formats.Error{Code: "password", What: "the archive is protected by a password", Do: "save the table without one, as .xlsx or CSV"}
	}
	x := &stream{b: b, name: name}
	in, err := f.Open()
	if err != nil {
		return nil, x.fault(err)
	}
	x.in = in
	x.dec = xml.NewDecoder(bufio.NewReaderSize(x, 64<<10))
	return x, nil
}

// Read counts what comes out of the archive.
func (x *stream) Read(p []byte) (int, error) {
	n, err := x.in.Read(p)
	b := x.b
	b.unzipped += int64(n)
	x.token += int64(n)
	switch {
	case b.unzipped > b.o.MaxBytes:
		return 0, &formats.Error{Where: x.name, Code: "file_too_large", What: fmt.Sprintf("unzipped, the workbook has more than %d bytes", b.o.MaxBytes), Do: "split it, or take out what is not needed"}
	case x.token > maxToken+128<<10: // and what the buffer held
		return 0, &formats.Error{Where: x.name, Code: "cell_too_long", What: fmt.Sprintf("a text has more than %d bytes", maxToken), Do: doSave}
	case b.unzipped-b.reported >= progressEvery:
		b.reported = b.unzipped
		if b.o.Progress != nil {
			b.o.Progress(b.unzipped)
		}
		if err := b.ctx.Err(); err != nil {
			return 0, err
		}
	}
	return n, err
}

func (x *stream) close() { x.in.Close() }

// fault turns what went wrong while reading into words.
func (x *stream) fault(err error) error {
	var e *formats.Error
	switch {
	case errors.As(err, &e), errors.Is(err, context.Canceled), errors.Is(err, context.DeadlineExceeded):
		return err
	case errors.Is(err, zip.ErrAlgorithm):
		return &formats.Error{Where: x.name, Code: "damaged", What: "the part is packed in a way that is not known", Do: doSave}
	case errors.Is(err, zip.ErrChecksum):
		return &formats.Error{Where: x.name, Code: "damaged", What: "the part was changed after it was written: its checksum is wrong", Do: "copy the file again, or " + doSave}
	}
	return &formats.Error{Where: x.name, Code: "damaged", What: "the part is damaged", Do: "copy the file again, or " + doSave, Err: err}
}

// next gives the next tag: one that opens, or the name of one that closes; neither at the end of the part.
// The text between is added to x.text where it is wanted.
func (x *stream) next() (start *xml.StartElement, end string, err error) {
	for {
		// Namespaces are not looked at: the two editions of the standard differ in nothing else here.
		tok, err := x.dec.RawToken()
		x.token = 0
		if errors.Is(err, io.EOF) {
			if x.depth != 0 {
				return nil, "", &formats.Error{Where: x.name, Code: "damaged", What: "the end of the part is missing", Do: "copy the file again, or " + doSave}
			}
			return nil, "", nil
		}
		if err != nil {
			return nil, "", x.fault(err)
		}
		switch t := tok.(type) {
		case xml.StartElement:
			if x.depth++; x.depth > maxDepth {
				return nil, "", &formats.Error{Where: x.name, Code: "too_deep", What: fmt.Sprintf("its tags are nested deeper than %d", maxDepth), Do: doSave}
			}
			return &t, "", nil
		case xml.EndElement:
			if x.depth--; x.depth < 0 {
				return nil, "", x.fault(fmt.Errorf("</%s> closes nothing", t.Name.Local))
			}
			return nil, t.Name.Local, nil
		case xml.CharData:
			if x.want {
				x.text = append(x.text, t...)
				if len(x.text) > maxToken {
					return nil, "", &formats.Error{Where: x.name, Code: "cell_too_long", What: fmt.Sprintf("a text has more than %d bytes", maxToken), Do: doSave}
				}
			}
		}
	}
}

// opening gives the next tag that opens, nil at the end of the part.
func (x *stream) opening() (*xml.StartElement, error) {
	for {
		if start, end, err := x.next(); start != nil || end == "" || err != nil {
			return start, err
		}
	}
}

// rich reads the text of the element that was just opened, which may be in pieces of different looks, up to
// the tag that closes it. Notes on pronunciation are left out.
func (x *stream) rich() (string, error) {
	outer := x.depth - 1
	said := 0 // depth of a note on pronunciation
	x.text = x.text[:0]
	for {
		start, end, err := x.next()
		switch {
		case err != nil:
			return "", err
		case start == nil && end == "":
			return "", x.fault(io.ErrUnexpectedEOF)
		case start != nil && start.Name.Local == "rPh" && said == 0:
			said = x.depth
		case start != nil:
			x.want = start.Name.Local == "t" && said == 0
		default:
			x.want = false
			if x.depth < said {
				said = 0
			}
			if x.depth == outer {
				return unescape(string(x.text)), nil
			}
		}
	}
}

// unescape takes the characters that XML cannot hold, which stand as _x000D_.
func unescape(s string) string {
	if !strings.Contains(s, "_x") {
		return s
	}
	var out strings.Builder
	for {
		i := strings.Index(s, "_x")
		if i < 0 || len(s) < i+7 {
			out.WriteString(s)
			return out.String()
		}
		c := 0
		for _, h := range []byte(s[i+2 : i+6]) {
			switch {
			case h >= '0' && h <= '9':
				c = c<<4 | int(h-'0')
			case h >= 'A' && h <= 'F':
				c = c<<4 | int(h-'A'+10)
			case h >= 'a' && h <= 'f':
				c = c<<4 | int(h-'a'+10)
			default:
				c = -1 << 20
			}
		}
		if c < 0 || s[i+6] != '_' {
			out.WriteString(s[:i+2])
			s = s[i+2:]
			continue
		}
		out.WriteString(s[:i])
		out.WriteRune(rune(c))
		s = s[i+7:]
	}
}

func attr(e *xml.StartElement, name string) string {
	for _, a := range e.Attr {
		if a.Name.Local == name && a.Name.Space == "" {
			return a.Value
		}
	}
	return ""
}

func truth(s string) bool { return s == "1" || strings.EqualFold(s, "true") }
