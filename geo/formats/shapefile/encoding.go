package shapefile

import (
	"fmt"
	"slices"
	"strings"
	"unicode/utf8"

	"golang.org/x/text/encoding/charmap"
)

// encoding is how text is written in the .dbf.
type encoding struct {
	name  string
	table *charmap.Charmap // nil for UTF-8
}

var utf8Encoding = &encoding{"UTF-8", nil}

// windows1252 also reads Latin-1: it only differs where Latin-1 has no characters.
var windows1252 = &encoding{"Windows-1252", charmap.Windows1252}

// encodings stand under their names in capitals without what varies: hyphens, "WINDOWS", "CP" and so on.
var encodings = map[string]*encoding{
	"UTF8": utf8Encoding, "65001": utf8Encoding,
	"437": {"CP437", charmap.CodePage437}, "850": {"CP850", charmap.CodePage850}, "852": {"CP852", charmap.CodePage852},
	"855": {"CP855", charmap.CodePage855}, "858": {"CP858", charmap.CodePage858}, "860": {"CP860", charmap.CodePage860},
	"862": {"CP862", charmap.CodePage862}, "863": {"CP863", charmap.CodePage863}, "865": {"CP865", charmap.CodePage865},
	"866": {"CP866", charmap.CodePage866}, "874": {"Windows-874", charmap.Windows874},
	"1250": {"Windows-1250", charmap.Windows1250}, "1251": {"Windows-1251", charmap.Windows1251}, "1252": windows1252,
	"1253": {"Windows-1253", charmap.Windows1253}, "1254": {"Windows-1254", charmap.Windows1254}, "1255": {"Windows-1255", charmap.Windows1255},
	"1256": {"Windows-1256", charmap.Windows1256}, "1257": {"Windows-1257", charmap.Windows1257}, "1258": {"Windows-1258", charmap.Windows1258},
	"88591": {"ISO-8859-1", charmap.Windows1252}, "88592": {"ISO-8859-2", charmap.ISO8859_2}, "88593": {"ISO-8859-3", charmap.ISO8859_3},
	"88594": {"ISO-8859-4", charmap.ISO8859_4}, "88595": {"ISO-8859-5", charmap.ISO8859_5}, "88596": {"ISO-8859-6", charmap.ISO8859_6},
	"88597": {"ISO-8859-7", charmap.ISO8859_7}, "88598": {"ISO-8859-8", charmap.ISO8859_8}, "88599": {"ISO-8859-9", charmap.ISO8859_9},
	"885910": {"ISO-8859-10", charmap.ISO8859_10}, "885913": {"ISO-8859-13", charmap.ISO8859_13}, "885914": {"ISO-8859-14", charmap.ISO8859_14},
	"885915": {"ISO-8859-15", charmap.ISO8859_15}, "885916": {"ISO-8859-16", charmap.ISO8859_16},
	"KOI8R": {"KOI8-R", charmap.KOI8R}, "KOI8U": {"KOI8-U", charmap.KOI8U}, "MACINTOSH": {"Macintosh", charmap.Macintosh},
}

// encodingOf finds an encoding by one of the many ways to write its name; nil if it is not known.
func encodingOf(name string) *encoding {
	s := strings.Map(func(r rune) rune {
		if r >= '0' && r <= '9' || r >= 'A' && r <= 'Z' {
			return r
		}
		return -1
	}, strings.ToUpper(name))
	for _, prefix := range []string{"WINDOWS", "ANSI", "OEM", "IBM", "CP", "ISO"} {
		s = strings.TrimPrefix(s, prefix)
	}
	switch s {
	case "LATIN1", "L1":
		s = "88591"
	case "USASCII", "ASCII":
		s = "UTF8"
	case "MACROMAN", "MAC":
		s = "MACINTOSH"
	}
	return encodings[s]
}

func encodingNames() string {
	var names []string
	for _, e := range encodings {
		if !slices.Contains(names, e.name) {
			names = append(names, e.name)
		}
	}
	slices.Sort(names)
	return strings.Join(names, ", ")
}

// languages gives the encoding for the language byte of a .dbf.
var languages = map[byte]string{
	0x01: "437", 0x02: "850", 0x03: "1252", 0x04: "MACINTOSH", 0x08: "865", 0x09: "437", 0x0a: "850", 0x0b: "437",
	0x0d: "437", 0x0e: "850", 0x0f: "437", 0x10: "850", 0x11: "437", 0x12: "850", 0x14: "850", 0x15: "437",
	0x16: "850", 0x17: "865", 0x18: "437", 0x19: "437", 0x1a: "850", 0x1b: "437", 0x1c: "863", 0x1d: "850",
	0x1f: "852", 0x22: "852", 0x23: "852", 0x24: "860", 0x25: "850", 0x26: "866", 0x37: "850", 0x40: "852",
	0x50: "874", 0x57: "1252", 0x58: "1252", 0x59: "1252", 0x64: "852", 0x65: "866", 0x66: "865", 0x6c: "863",
	0x7c: "874", 0x87: "852", 0xc8: "1250", 0xc9: "1251", 0xca: "1254", 0xcb: "1253", 0xcc: "1257",
}

// encoding settles the encoding: what the user says, the .cpg, the language byte, or the text itself.
func (d *decoder) encoding(cpg *Part) (*encoding, error) {
	if d.o.Encoding != "" {
		return encodingOf(d.o.Encoding), nil
	}
	some, valid := d.looks()
	doubtful := func(e *encoding) *encoding {
		// Text in another encoding is hardly ever valid UTF-8 by chance.
		if some && valid && e != utf8Encoding {
			d.book.note("encoding_doubtful", 0, 1).with("encoding", e.name)
		}
		return e
	}
	text, what, err := d.side(cpg)
	if err != nil {
		return nil, err
	}
	if e := encodingOf(text); e != nil {
		return doubtful(e), nil
	} else if text != "" && what == "" {
		what = short(text)
	}
	if what != "" {
		d.book.add(key{code: "encoding_unknown", what: ".cpg: " + what}, 0, 1)
	}
	if b := d.dbf.language; b != 0 {
		if name, ok := languages[b]; ok {
			return doubtful(encodings[name]), nil
		}
		d.book.add(key{code: "encoding_unknown", what: fmt.Sprintf(".dbf: language byte %d", b)}, 0, 1)
	}
	if valid {
		return utf8Encoding, nil
	}
	d.book.note("encoding_assumed", 0, 1).with("encoding", windows1252.name)
	return windows1252, nil
}

func short(s string) string {
	if r := []rune(s); len(r) > 40 {
		return string(r[:40]) + "..."
	}
	return s
}

// looks tells whether some text is more than ASCII, and whether all of it is valid UTF-8.
func (d *decoder) looks() (some, valid bool) {
	valid = true
	look := func(s string, width int) {
		if ascii(s) {
			return
		}
		some = true
		valid = valid && utf8.ValidString(uncut(s, width))
	}
	for j, f := range d.dbf.fields {
		look(f.name, nameBytes)
		for i := range d.features {
			look(d.features[i].Values[j].Text, f.width)
		}
	}
	return some, valid
}

func ascii(s string) bool {
	for i := range len(s) {
		if s[i] >= utf8.RuneSelf {
			return false
		}
	}
	return true
}

// uncut takes off the bytes of a character whose end did not find room in the cell.
func uncut(s string, width int) string {
	if len(s) < width {
		return s
	}
	for n := 1; n < utf8.UTFMax && n <= len(s); n++ {
		if tail := s[len(s)-n:]; utf8.RuneStart(tail[0]) {
			if !utf8.FullRuneInString(tail) {
				return s[:len(s)-n]
			}
			break
		}
	}
	return s
}

// decode gives text in UTF-8; ok is false if it has characters that are none in the encoding.
func (e *encoding) decode(s string, width int) (text string, ok bool) {
	if ascii(s) {
		return s, true
	}
	if e.table == nil {
		s = uncut(s, width)
		return strings.ToValidUTF8(s, string(utf8.RuneError)), utf8.ValidString(s)
	}
	var out strings.Builder
	out.Grow(len(s) + len(s)/4)
	ok = true
	for i := range len(s) {
		r := e.table.DecodeByte(s[i])
		ok = ok && r != utf8.RuneError
		out.WriteRune(r)
	}
	return out.String(), ok
}
