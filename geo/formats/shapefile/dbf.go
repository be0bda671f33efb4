package shapefile

import (
	"bytes"
	"encoding/binary"
	"fmt"
	"math"
	"strconv"
	"strings"

	"groundtally/geo"
	"groundtally/geo/formats"
)

const (
	tableHead = 32
	fieldHead = 32
	nameBytes = 10
	doWithout = "copy or export the set again, or take the .dbf away to read the shapes alone"
)

// field is a column of the .dbf.
type field struct {
	name      string // as in the file, in its encoding
	typ       byte
	at, width int
}

// table is the .dbf.
type table struct {
	w        window
	rows     int
	head     int64
	width    int64
	language byte
	fields   []field
	skipped  []field // of types that are not read
}

func badTable(what string) error {
	return &formats.Error{Code: "bad_table", What: "the .dbf is not a table that can be read: " + what, Do: doWithout}
}

func openTable(f *feed, p *Part) (*table, error) {
	t := &table{w: window{feed: f, src: p}}
	if p.Size < tableHead+1 {
		return nil, &formats.Error{Code: "truncated", What: fmt.Sprintf("the .dbf ends after %d bytes, within its header", max(p.Size, 0)), Do: doWithout}
	}
	b, err := t.w.at(0, tableHead)
	if err != nil {
		return nil, err
	}
	if b[0]&7 == 4 {
		return nil, badTable("it is of version 7, which has another layout")
	}
	rows := int64(binary.LittleEndian.Uint32(b[4:]))
	t.head, t.width, t.language = int64(binary.LittleEndian.Uint16(b[8:])), int64(binary.LittleEndian.Uint16(b[10:])), b[29]
	switch {
	case t.head <= tableHead, t.width < 1:
		return nil, badTable("its header gives no room for columns")
	case t.head > p.Size:
		return nil, &formats.Error{Code: "truncated", What: fmt.Sprintf("the .dbf ends after %d bytes, within its header", p.Size), Do: doWithout}
	}
	if whole := (p.Size - t.head) / t.width; whole < rows {
		return nil, &formats.Error{Where: fmt.Sprintf("feature %d", whole+1), Code: "truncated", What: fmt.Sprintf("the .dbf ends here, after %d of %d rows", whole, rows), Do: doWithout}
	}
	t.rows = int(rows)
	if b, err = t.w.at(0, int(t.head)); err != nil {
		return nil, err
	}
	at := 1 // behind the mark of deletion
	for b = b[tableHead:]; len(b) >= fieldHead && b[0] != '\r'; b = b[fieldHead:] {
		name, _, _ := bytes.Cut(b[:11], []byte{0})
		c := field{name: string(bytes.Trim(name, " ")), typ: bytes.ToUpper(b[11:12])[0], at: at, width: int(b[16])}
		if c.name == "" && c.typ == 0 {
			break // zeros stand where the mark of the end should
		}
		at += c.width
		switch c.typ {
		case 'C', 'N', 'F', 'D', 'L':
			if c.width == 0 {
				return nil, badTable(fmt.Sprintf("its column %q has no width", c.name))
			}
			t.fields = append(t.fields, c)
		default:
			t.skipped = append(t.skipped, c)
		}
	}
	if int64(at) > t.width {
		return nil, badTable("its columns are wider than its rows")
	}
	return t, nil
}

// row gives the values of a row, counted from 1. Text stays in the encoding of the file.
func (t *table) row(row int, b book) (values []geo.Value, deleted bool, err error) {
	raw, err := t.w.at(t.head+int64(row-1)*t.width, int(t.width))
	if err != nil {
		return nil, false, err
	}
	if raw[0] == '*' {
		return nil, true, nil
	}
	values = make([]geo.Value, len(t.fields))
	for j := range t.fields {
		f := &t.fields[j]
		cell, _, _ := bytes.Cut(raw[f.at:][:f.width], []byte{0})
		if cell = bytes.Trim(cell, " \t\r\n"); len(cell) == 0 {
			continue
		}
		switch f.typ {
		case 'C':
			values[j] = geo.TextValue(string(cell))
		case 'D':
			date, ok := isoDate(cell)
			if !ok {
				b.add(key{code: "date_as_written", column: j + 1}, row, 1)
			}
			values[j] = date
		case 'L':
			values[j] = truth(cell)
		default:
			v, code := number(cell)
			if code != "" {
				b.add(key{code: code, column: j + 1}, row, 1)
			}
			values[j] = v
		}
	}
	return values, false, nil
}

// isoDate takes YYYYMMDD; ok is false for a date that is none.
func isoDate(cell []byte) (geo.Value, bool) {
	if len(bytes.Trim(cell, "0")) == 0 {
		return geo.Value{}, true
	}
	if len(cell) == 8 && len(bytes.Trim(cell, "0123456789")) == 0 {
		month, _ := strconv.Atoi(string(cell[4:6]))
		day, _ := strconv.Atoi(string(cell[6:]))
		if month >= 1 && month <= 12 && day >= 1 && day <= 31 {
			return geo.TextValue(string(cell[:4]) + "-" + string(cell[4:6]) + "-" + string(cell[6:])), true
		}
	}
	return geo.TextValue(string(cell)), false
}

// truth takes a logical cell; what is none stays as text and makes the column one of text.
func truth(cell []byte) geo.Value {
	if len(cell) == 1 {
		switch cell[0] {
		case 'T', 't', 'Y', 'y', '1':
			return geo.BoolValue(true)
		case 'F', 'f', 'N', 'n', '0':
			return geo.BoolValue(false)
		case '?':
			return geo.Value{}
		}
	}
	return geo.TextValue(string(cell))
}

// number takes a cell of digits and gives the code of what is worth a notice. Writers fill cells with
// asterisks for numbers that are missing or too wide, and some write the C library's words for what is no
// number. What cannot be read stays as text and makes the column one of text.
func number(cell []byte) (geo.Value, string) {
	if cell[0] == '*' || notANumber(cell) {
		return geo.Value{}, ""
	}
	s := string(cell)
	code := ""
	if strings.Count(s, ",") == 1 && !strings.Contains(s, ".") {
		s, code = strings.Replace(s, ",", ".", 1), "decimal_comma"
	}
	v, err := strconv.ParseFloat(s, 64)
	switch {
	case err != nil || math.IsInf(v, 0) || strings.Trim(s, "0123456789+-.eE") != "":
		return geo.TextValue(string(cell)), "column_not_numbers"
	case math.Abs(v) >= 1<<53 && !strings.ContainsAny(s, ".eE"):
		return geo.TextValue(s), "number_as_text"
	}
	return geo.NumberValue(v), code
}

func notANumber(cell []byte) bool {
	s := strings.TrimLeft(strings.ToLower(string(cell)), "+-")
	return s == "nan" || s == "inf" || s == "infinity" || strings.HasPrefix(s, "nan(") || strings.HasPrefix(s, "1.#")
}

// attributes names the columns of a layer and settles the values: text is decoded, and columns of several
// kinds become text.
func (d *decoder) attributes(l *geo.Layer, enc *encoding) error {
	d.nameColumns(l, enc)
	for j, f := range d.dbf.fields {
		bad := 0
		var seen [geo.Bool + 1]int
		for i := range l.Features {
			if i%(1<<20) == 0 {
				if err := d.ctx.Err(); err != nil {
					return err
				}
			}
			v := &l.Features[i].Values[j]
			seen[v.Kind]++
			if v.Kind == geo.Text {
				var ok bool
				if v.Text, ok = enc.decode(v.Text, f.width); !ok {
					bad++
				}
			}
		}
		if bad > 0 {
			d.book.add(key{code: "text_unreadable", column: j + 1}, 0, bad).with("encoding", enc.name)
		}
		if t := d.book[key{code: "column_not_numbers", column: j + 1}]; t != nil {
			t.with("numbers", strconv.Itoa(seen[geo.Number]))
		}
		if seen[geo.Text] == 0 || seen[geo.Number]+seen[geo.Bool] == 0 {
			continue
		}
		for i := range l.Features {
			switch v := &l.Features[i].Values[j]; v.Kind {
			case geo.Number:
				*v = geo.TextValue(plain(v.Number))
			case geo.Bool:
				*v = geo.TextValue(v.String())
			}
		}
		if f.typ == 'L' {
			d.book.add(key{code: "column_mixed", column: j + 1}, 0, seen[geo.Bool]+seen[geo.Text])
		}
	}
	return nil
}

// nameColumns gives every column a name of its own.
func (d *decoder) nameColumns(l *geo.Layer, enc *encoding) {
	used := map[string]bool{}
	for j, f := range d.dbf.fields {
		name, _ := enc.decode(f.name, nameBytes)
		if name == "" {
			name = "column " + strconv.Itoa(j+1)
		}
		got := name
		for n := 2; used[got]; n++ {
			got = name + " (" + strconv.Itoa(n) + ")"
		}
		if got != name {
			d.book.add(key{code: "column_repeated", column: j + 1}, 0, 1).with("name", name)
		}
		used[got] = true
		l.Columns = append(l.Columns, geo.Column{Name: got})
	}
	for _, f := range d.dbf.skipped {
		name, _ := enc.decode(f.name, nameBytes)
		d.book.add(key{code: "column_type_left_out", field: name}, 0, 1).with("type", strings.ToValidUTF8(string([]byte{f.typ}), "?"))
	}
}

// plain writes a number without an exponent where a person would, and a whole number always, because it may
// be an identifier.
func plain(f float64) string {
	if f != 0 && (math.Abs(f) > 1<<53 || math.Abs(f) < 1e-6) {
		return strconv.FormatFloat(f, 'g', -1, 64)
	}
	return strconv.FormatFloat(f, 'f', -1, 64)
}
