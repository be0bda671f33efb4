package csvtable

import (
	"bufio"
	"bytes"
	"context"
	"errors"
	"fmt"
	"io"
	"strconv"
	"strings"

	"groundtally/geo"
)

// Decimal is the mark between whole and fraction.
type Decimal uint8

// The decimal marks. Auto finds out from the cells.
const (
	Auto Decimal = iota
	Point
	Comma
)

// Encoding is how characters are written.
type Encoding uint8

// The encodings. Windows1252 contains Latin-1.
const (
	UTF8 Encoding = iota
	Windows1252
)

// Options say what is read and how. The zero value finds out what it can.
type Options struct {
	File      string
	Progress  func(bytes int64)
	Delimiter byte // ',', ';', tabulator or '|'; 0 finds out
	Decimal   Decimal
	Encoding  Encoding
	NoHeader  bool     // the first row holds values; columns are called "column 1" and so on
	X, Y      string   // columns that hold the position; empty for a table without geometry
	Text      []string // columns kept as text whatever they hold

	MaxBytes   int64 // 2 GiB
	MaxRows    int   // 5,000,000
	MaxColumns int   // 1,000
}

// Pair names two columns that look like a position.
type Pair struct {
	X, Y    string
	Degrees bool // their names say longitude and latitude
}

// Ledger counts what became of the rows.
type Ledger struct {
	Read       int
	NoGeometry int // rows whose position is empty; they stay, without a geometry
}

// Result is what a file holds.
type Result struct {
	Layer     *geo.Layer
	Delimiter byte
	Decimal   Decimal // Point where no number has a fraction
	Positions []Pair  // for the user to confirm; nothing is done with them
	Notices   []geo.Notice
	Ledger    Ledger
}

// Decode reads a table. The first row names the columns. A column is of numbers when every cell that
// is not empty is one, of truth values when every one is true or false, else of text; an empty cell is
// a missing value. A column with leading zeros, or with whole numbers that no double holds exactly,
// stays text. Features are identified by the number of their row of values.
func Decode(ctx context.Context, r io.Reader, o Options) (Result, error) {
	if o.MaxBytes <= 0 {
		o.MaxBytes = 2 << 30
	}
	if o.MaxRows <= 0 {
		o.MaxRows = 5_000_000
	}
	if o.MaxColumns <= 0 {
		o.MaxColumns = 1_000
	}
	t := table{o: o, in: &rows{ctx: ctx, r: bufio.NewReaderSize(r, blockBytes), latin: o.Encoding == Windows1252,
		maxBytes: o.MaxBytes, maxCells: o.MaxColumns, progress: o.Progress, line: 1}}
	res, err := t.decode()
	if err != nil {
		var e *Error
		if errors.As(err, &e) {
			e.File = o.File
		}
		return Result{}, err
	}
	return res, nil
}

type table struct {
	o       Options
	in      *rows
	names   []string
	body    []row
	notices []geo.Notice
}

func (t *table) note(code string, s geo.Severity, field string, line int, args map[string]string) {
	t.notices = append(t.notices, geo.Notice{Code: code, Severity: s, File: t.o.File, Field: field, Line: line, Args: args})
}

func (t *table) decode() (Result, error) {
	if err := t.start(); err != nil {
		return Result{}, err
	}
	if err := t.read(); err != nil {
		return Result{}, err
	}
	l := &geo.Layer{Features: make([]geo.Feature, len(t.body))}
	for i := range l.Features {
		l.Features[i] = geo.Feature{ID: strconv.Itoa(i + 1), Values: make([]geo.Value, len(t.names))}
	}
	forms := t.classify()
	decimal, err := t.decimal(forms)
	if err != nil {
		return Result{}, err
	}
	for j, name := range t.names {
		l.Columns = append(l.Columns, geo.Column{Name: name})
		t.fill(l, j, forms[j], decimal)
	}
	res := Result{Layer: l, Delimiter: t.in.comma, Decimal: decimal, Positions: Places(l)}
	res.Ledger.Read = len(l.Features)
	if t.o.X != "" || t.o.Y != "" {
		if res.Ledger.NoGeometry, err = t.points(l, decimal); err != nil {
			return Result{}, err
		}
		if res.Ledger.NoGeometry > 0 {
			t.note("geometry_missing", geo.Warning, "", 0, map[string]string{"count": strconv.Itoa(res.Ledger.NoGeometry)})
		}
	}
	if len(l.Features) == 0 {
		t.note("layer_empty", geo.Warning, "", 0, map[string]string{"count": "1"})
	}
	res.Notices = t.notices
	return res, nil
}

// start passes a byte order mark and settles the delimiter.
func (t *table) start() error {
	in := t.in
	head, err := in.r.Peek(blockBytes)
	if err != nil && !errors.Is(err, io.EOF) && !errors.Is(err, bufio.ErrBufferFull) {
		return in.ioFault(err)
	}
	switch {
	case len(bytes.TrimSpace(head)) == 0 && len(head) < blockBytes:
		return in.fault(0, 0, "empty_file", "the file is empty", "export the table again")
	case bytes.HasPrefix(head, []byte("PK\x03\x04")):
		return in.fault(0, 0, "not_text", "the file is a workbook or an archive", "save the table as CSV")
	case bytes.HasPrefix(head, []byte{0xff, 0xfe}), bytes.HasPrefix(head, []byte{0xfe, 0xff}):
		return in.fault(0, 0, "not_utf8", "the file is in UTF-16", "save it as UTF-8")
	}
	if mark := []byte{0xef, 0xbb, 0xbf}; bytes.HasPrefix(head, mark) {
		head = head[len(mark):]
		if err := t.discard(len(mark)); err != nil {
			return err
		}
	}
	in.comma = t.o.Delimiter
	if bytes.HasPrefix(bytes.ToLower(head[:min(4, len(head))]), []byte("sep=")) && len(head) > 5 && (head[5] == '\n' || head[5] == '\r') {
		if in.comma == 0 {
			in.comma = head[4]
		}
		n := 6
		if head[5] == '\r' && len(head) > 6 && head[6] == '\n' {
			n = 7
		}
		in.line++
		return t.discard(n)
	}
	if in.comma == 0 {
		c, err := delimiter(head)
		if err != nil {
			return in.fault(1, 0, "delimiter", err.Error(), "say which character stands between the cells")
		}
		in.comma = c
	}
	return nil
}

func (t *table) discard(n int) error {
	got, err := t.in.r.Discard(n)
	t.in.at += int64(got)
	if err != nil {
		return t.in.ioFault(err)
	}
	return nil
}

// delimiter counts the cells that each candidate would make of the rows at the head of the file. The
// one under which most rows have as many cells as the first wins; with equal merits the one that makes
// more cells.
func delimiter(head []byte) (byte, error) {
	best, bestEqual, bestCells, tie := byte(','), 0.0, 1, false
	for _, c := range []byte(",;\t|") {
		cells := cellCounts(head, c)
		if len(cells) == 0 || cells[0] < 2 {
			continue
		}
		same := 0
		for _, n := range cells {
			if n == cells[0] {
				same++
			}
		}
		share := float64(same) / float64(len(cells))
		switch {
		case share > bestEqual, share == bestEqual && cells[0] > bestCells:
			best, bestEqual, bestCells, tie = c, share, cells[0], false
		case share == bestEqual && cells[0] == bestCells:
			tie = true
		}
	}
	if tie {
		return 0, fmt.Errorf("the character between the cells cannot be told: %s and another one fit alike", name(best))
	}
	return best, nil
}

func name(c byte) string {
	if c == '\t' {
		return "the tabulator"
	}
	return strconv.Quote(string(rune(c)))
}

func cellCounts(head []byte, comma byte) []int {
	var out []int
	n, quoted, any := 1, false, false
	for _, c := range head {
		switch {
		case c == '"':
			quoted = !quoted
			any = true
		case quoted:
		case c == comma:
			n++
			any = true
		case c == '\n' || c == '\r':
			if any {
				out = append(out, n)
			}
			n, any = 1, false
		default:
			any = true
		}
	}
	if any && !quoted && len(head) < blockBytes { // a row that the block cuts does not count
		out = append(out, n)
	}
	return out
}

func (t *table) read() error {
	first, err := t.in.read()
	if errors.Is(err, io.EOF) {
		return t.in.fault(0, 0, "empty_file", "the file is empty", "export the table again")
	}
	if err != nil {
		return err
	}
	if t.o.NoHeader {
		t.body = append(t.body, first)
		t.names = make([]string, len(first.cells))
	} else {
		t.names = first.cells
		if valuesOnly(first.cells) {
			return t.in.fault(first.line, first.at, "header_missing", "the first row holds numbers, not names of columns", "say that the table has no header, or add one")
		}
	}
	t.nameColumns(first.line)
	for {
		rec, err := t.in.read()
		if errors.Is(err, io.EOF) {
			return nil
		}
		if err != nil {
			return err
		}
		for len(rec.cells) > len(t.names) && rec.cells[len(rec.cells)-1] == "" {
			rec.cells = rec.cells[:len(rec.cells)-1]
		}
		if len(rec.cells) != len(t.names) {
			return t.in.fault(rec.line, rec.at, "cells", fmt.Sprintf("there are %d cells, the first row has %d", len(rec.cells), len(t.names)), "put cells that contain the delimiter in quotes, and take out lines that are not of the table")
		}
		if len(t.body) >= t.o.MaxRows {
			return t.in.fault(rec.line, rec.at, "too_many", fmt.Sprintf("the table has more than %d rows", t.o.MaxRows), "split it")
		}
		t.body = append(t.body, rec)
	}
}

func valuesOnly(cells []string) bool {
	some := false
	for _, c := range cells {
		switch formOf(c) {
		case emptyCell:
		case notNumber, boolForm:
			return false
		default:
			some = true
		}
	}
	return some
}

// nameColumns gives every column a name of its own.
func (t *table) nameColumns(line int) {
	used := map[string]bool{}
	for j, name := range t.names {
		name = strings.Join(strings.Fields(name), " ") // names with line breaks come from workbooks
		if name == "" {
			name = "column " + strconv.Itoa(j+1)
		}
		got := name
		for n := 2; used[got]; n++ {
			got = name + " (" + strconv.Itoa(n) + ")"
		}
		if got != name {
			t.note("column_repeated", geo.Info, got, line, map[string]string{"name": name})
		}
		used[got] = true
		t.names[j] = got
	}
}

// forms tells what the cells of a column look like.
type forms struct {
	count [boolForm + 1]int
	line  [boolForm + 1]int // first row of each form
	text  bool              // the user wants text
}

func (t *table) classify() []forms {
	out := make([]forms, len(t.names))
	for _, name := range t.o.Text {
		if j := t.column(name); j >= 0 {
			out[j].text = true
		}
	}
	for _, rec := range t.body {
		for j, c := range rec.cells {
			f := formOf(c)
			if out[j].count[f]++; out[j].line[f] == 0 {
				out[j].line[f] = rec.line
			}
		}
	}
	return out
}

// numbers tells whether every cell of the column that is not empty reads as a number.
func (f forms) numbers() bool {
	if f.text {
		return false
	}
	n := 0
	for k, c := range f.count {
		if c > 0 && !form(k).numeric() {
			return false
		}
		if form(k) != emptyCell {
			n += c
		}
	}
	return n > 0
}

// decimal settles the decimal mark for the whole file and refuses thousand separators.
func (t *table) decimal(cols []forms) (Decimal, error) {
	where := func(f form) (line int, column string) {
		for j, c := range cols {
			if c.numbers() && c.count[f] > 0 && (line == 0 || c.line[f] < line) {
				line, column = c.line[f], t.names[j]
			}
		}
		return line, column
	}
	refuse := func(f form, code, what, do string) error {
		line, column := where(f)
		e := &Error{Line: line, Column: column, Code: code, What: what, Do: do}
		for _, rec := range t.body {
			if rec.line == line {
				e.Offset = rec.at
			}
		}
		return e
	}
	has := func(f form) bool { line, _ := where(f); return line > 0 }
	const take = "take the thousand separators out"
	d := t.o.Decimal
	if d == Auto {
		switch {
		case has(commaForm) && has(pointForm):
			return 0, refuse(commaForm, "decimal_mixed", "a number has a decimal comma, while others have a decimal point", "write all with the same mark, or name the columns to keep as text")
		case has(commaForm):
			d = Comma
		case has(commaOrGroups) && !has(pointForm):
			return 0, refuse(commaOrGroups, "decimal_unclear", "a comma stands before three digits: it can be a decimal comma or a thousand separator", "say which; "+take)
		default:
			d = Point
		}
	}
	switch {
	case has(groupsForm):
		return 0, refuse(groupsForm, "thousands", "a number has thousand separators", take)
	case d == Point && has(commaOrGroups):
		return 0, refuse(commaOrGroups, "thousands", "a number has a thousand separator", take)
	case d == Point && has(commaForm):
		return 0, refuse(commaForm, "decimal_mixed", "a number has a decimal comma", "write it with a point, or say that the comma is decimal")
	case d == Comma && has(pointOrGroups):
		return 0, refuse(pointOrGroups, "thousands", "a number has a point before three digits, while the comma is decimal", take)
	case d == Comma && has(pointForm):
		return 0, refuse(pointForm, "decimal_mixed", "a number has a decimal point", "write it with a comma, or say that the point is decimal")
	}
	return d, nil
}

// fill gives a column its values.
func (t *table) fill(l *geo.Layer, j int, f forms, d Decimal) {
	name := t.names[j]
	whole := f.numbers()
	if whole && f.count[zerosForm] > 0 {
		t.note("leading_zeros", geo.Info, name, f.line[zerosForm], map[string]string{"count": strconv.Itoa(f.count[zerosForm])})
		whole = false
	}
	if whole && f.count[longForm] > 0 {
		t.note("number_as_text", geo.Info, name, f.line[longForm], map[string]string{"count": strconv.Itoa(f.count[longForm])})
		whole = false
	}
	filled := len(t.body) - f.count[emptyCell]
	truth := !f.text && filled > 0 && f.count[boolForm] == filled
	if other := f.count[notNumber] + f.count[boolForm]; !f.text && !truth && other > 0 && filled-other > other {
		t.note("column_not_numbers", geo.Warning, name, f.line[notNumber], map[string]string{"count": strconv.Itoa(other), "numbers": strconv.Itoa(filled - other)})
	}
	for i, rec := range t.body {
		c := rec.cells[j]
		if formOf(c) == emptyCell {
			continue
		}
		v := geo.TextValue(c)
		switch {
		case whole:
			if n, ok := parse(c, d); ok {
				v = geo.NumberValue(n)
			}
		case truth:
			v = geo.BoolValue(strings.EqualFold(strings.TrimSpace(c), "true"))
		}
		l.Features[i].Values[j] = v
	}
}

// column finds a column by its name, if need be without regard to case.
func (t *table) column(name string) int {
	for j, n := range t.names {
		if n == name {
			return j
		}
	}
	for j, n := range t.names {
		if strings.EqualFold(n, name) {
			return j
		}
	}
	return -1
}

// points makes point features of the rows.
func (t *table) points(l *geo.Layer, d Decimal) (missing int, err error) {
	x, y := t.column(t.o.X), t.column(t.o.Y)
	for _, c := range []struct {
		j    int
		name string
	}{{x, t.o.X}, {y, t.o.Y}} {
		if c.name == "" {
			return 0, &Error{Code: "column_unknown", What: "only one of the two columns of the position is named", Do: "name both"}
		}
		if c.j < 0 {
			return 0, &Error{Column: c.name, Code: "column_unknown", What: "there is no such column", Do: "the columns are " + strings.Join(t.names, ", ")}
		}
	}
	for i, rec := range t.body {
		ex, ey := formOf(rec.cells[x]) == emptyCell, formOf(rec.cells[y]) == emptyCell
		if ex && ey {
			missing++
			continue
		}
		var at [2]float64
		for k, j := range []int{x, y} {
			v, ok := parse(rec.cells[j], d)
			if !ok {
				return 0, &Error{Line: rec.line, Offset: rec.at, Column: t.names[j], Code: "bad_coordinate", What: fmt.Sprintf("%q is not a coordinate", short(rec.cells[j])), Do: "write it as a plain number in degrees or metres"}
			}
			at[k] = v
		}
		l.Features[i].Geometry = geo.LonLatGeometry{Kind: geo.Points, Parts: [][][]geo.LonLat{{{{Lon: at[0], Lat: at[1]}}}}}
	}
	return missing, nil
}

func short(s string) string {
	if r := []rune(s); len(r) > 40 {
		return string(r[:40]) + "..."
	}
	return s
}

var pairNames = []Pair{
	{"longitude", "latitude", true}, {"lon", "lat", true}, {"long", "lat", true}, {"lng", "lat", true},
	{"easting", "northing", false}, {"east", "north", false}, {"x", "y", false},
	{"rechtswert", "hochwert", false}, {"x_coord", "y_coord", false}, {"coord_x", "coord_y", false},
}

// Places lists the columns of a table whose names are those of positions.
func Places(l *geo.Layer) []Pair {
	at := map[string]string{}
	for i := len(l.Columns) - 1; i >= 0; i-- { // the first of two counts
		at[strings.ToLower(l.Columns[i].Name)] = l.Columns[i].Name
	}
	var out []Pair
	for _, p := range pairNames {
		if x, y := at[p.X], at[p.Y]; x != "" && y != "" {
			out = append(out, Pair{x, y, p.Degrees})
		}
	}
	return out
}
