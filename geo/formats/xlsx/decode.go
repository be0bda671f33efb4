package xlsx

import (
	"context"
	"errors"
	"fmt"
	"io"
	"math"
	"slices"
	"strconv"
	"strings"

	"groundtally/geo"
	"groundtally/geo/formats"
)

// Options say what is read and how much at most. A limit of zero is the default.
type Options struct {
	File     string            // name used in errors and notices
	Progress func(bytes int64) // bytes unzipped
	Sheet    string            // its name; empty for the first one with rows, one that is shown before one that is hidden

	MaxRows    int   // rows that are not empty: 1,048,576
	MaxColumns int   // 1,000
	MaxBytes   int64 // unzipped: 2 GiB
}

const maxValues = 50_000_000 // cells of the table

// Ledger counts the rows of values.
type Ledger struct{ Read int }

// Result is what a sheet holds.
type Result struct {
	Layer   *geo.Layer
	Sheet   string
	Sheets  []string // all sheets of cells, in the order of the workbook
	Notices []geo.Notice
	Ledger  Ledger
}

func (o Options) withDefaults() Options {
	if o.MaxRows <= 0 {
		o.MaxRows = 1 << 20
	}
	if o.MaxColumns <= 0 {
		o.MaxColumns = 1_000
	}
	if o.MaxBytes <= 0 {
		o.MaxBytes = 2 << 30
	}
	return o
}

// Sheets gives the names of the sheets of cells, hidden ones too.
func Sheets(r io.ReaderAt, size int64, o Options) ([]string, error) {
	o = o.withDefaults()
	b, err := open(context.Background(), r, size, o)
	if err != nil {
		return nil, named(err, o.File)
	}
	return b.names(), nil
}

// Decode reads a sheet. The first row that is not empty names the columns; empty rows are passed over.
// A column with values of several kinds becomes text. Features have no geometry and are identified by the
// number of their row of values.
func Decode(ctx context.Context, r io.ReaderAt, size int64, o Options) (Result, error) {
	o = o.withDefaults()
	res, err := decode(ctx, r, size, o)
	if err != nil {
		return Result{}, named(err, o.File)
	}
	return res, nil
}

func named(err error, file string) error {
	var e *formats.Error
	if errors.As(err, &e) {
		e.File = file
	}
	return err
}

func decode(ctx context.Context, r io.ReaderAt, size int64, o Options) (Result, error) {
	b, err := open(ctx, r, size, o)
	if err != nil {
		return Result{}, err
	}
	asked, err := b.choose(o.Sheet)
	if err != nil {
		return Result{}, err
	}
	if err := b.content(); err != nil {
		return Result{}, err
	}
	for _, s := range asked {
		t := &table{o: o, book: b, sheet: s.name}
		if err := t.read(s); err != nil {
			return Result{}, err
		}
		if t.header == nil {
			continue
		}
		if o.Sheet == "" && len(b.sheets) > 1 {
			t.note("sheet_chosen", "", 0, map[string]string{"sheet": s.name, "sheets": strings.Join(b.names(), ", ")})
		}
		l, err := t.layer()
		if err != nil {
			return Result{}, err
		}
		return Result{Layer: l, Sheet: s.name, Sheets: b.names(), Notices: t.notices, Ledger: Ledger{Read: len(l.Features)}}, nil
	}
	if o.Sheet != "" {
		return Result{}, &formats.Error{Where: where(asked[0].name, ""), Code: "empty_sheet", What: "the sheet has no value", Do: "choose another one of " + strings.Join(b.names(), ", ")}
	}
	return Result{}, &formats.Error{Code: "empty_file", What: "no sheet of the workbook has a value", Do: "save the table again"}
}

// choose gives the sheets to try, in order.
func (b *book) choose(name string) ([]sheet, error) {
	if name == "" {
		out := slices.Clone(b.sheets)
		slices.SortStableFunc(out, func(s, t sheet) int {
			switch {
			case s.hidden == t.hidden:
				return 0
			case t.hidden:
				return -1
			}
			return 1
		})
		return out, nil
	}
	for _, same := range []func(string) bool{
		func(s string) bool { return s == name },
		func(s string) bool { return strings.EqualFold(s, name) },
	} {
		for _, s := range b.sheets {
			if same(s.name) {
				return []sheet{s}, nil
			}
		}
	}
	return nil, &formats.Error{Code: "sheet_unknown", What: fmt.Sprintf("there is no sheet %q", name), Do: "the sheets are " + strings.Join(b.names(), ", ")}
}

func where(sheet, cell string) string {
	if cell == "" {
		return fmt.Sprintf("sheet %q", sheet)
	}
	return fmt.Sprintf("sheet %q, %s", sheet, cell)
}

// row is one row of the sheet that is not empty.
type row struct {
	line  int
	cells []place // those with a value
	lost  bool    // a cell is not empty and has no value
}

// place is a cell with its column, counted from 0.
type place struct {
	column int
	value  geo.Value
}

// tally counts what a column holds.
type tally struct {
	kinds [geo.Bool + 1]int
	found map[string]*finding // by the codes of notices
}

type finding struct{ n, line int }

// add counts a finding; the first line of each is kept.
func (c *tally) add(code string, line int) {
	if c.found == nil {
		c.found = map[string]*finding{}
	}
	f := c.found[code]
	if f == nil {
		f = &finding{line: line}
		c.found[code] = f
	}
	f.n++
}

// notices tells the severity of each code. Args: count; Line is the first row of the sheet concerned.
var notices = map[string]geo.Severity{
	"cell_error":            geo.Warning, // #N/A, #DIV/0! and so on: no value; Field
	"formula_without_value": geo.Warning, // its result is not stored: no value; Field
	"time_in_days":          geo.Info,    // a length of time, given in days; Field
	"number_as_text":        geo.Info,    // a whole number beyond 2^53 kept as text; Field
	"column_mixed":          geo.Info,    // values of several kinds made text; Field
	"column_repeated":       geo.Info,    // Args name; Field
	"cells_merged":          geo.Info,    // the value stands in the first cell of each
	"sheet_chosen":          geo.Info,    // nobody said which; Args sheet, sheets
	"layer_empty":           geo.Warning, // a header and no row
}

type table struct {
	o       Options
	book    *book
	sheet   string
	header  []string // nil until the first row that is not empty; "" where there is no name
	at      int      // line of the header
	rows    []row
	columns []tally
	values  int // cells read
	merged  int
	notices []geo.Notice
}

func (t *table) note(code, field string, line int, args map[string]string) {
	t.notices = append(t.notices, geo.Notice{Code: code, Severity: notices[code], File: t.o.File, Layer: t.sheet, Field: field, Line: line, Args: args})
}

func (t *table) tooMany(line int, limit int, of string) error {
	return &formats.Error{Where: where(t.sheet, fmt.Sprintf("row %d", line)), Code: "too_many", What: fmt.Sprintf("the sheet has more than %d %s", limit, of), Do: "split it, or take out what is not needed"}
}

// add takes a row. Words say whether a cell of the first row is a text in the sheet.
func (t *table) add(r row, words bool) error {
	if t.header == nil {
		if !words {
			return &formats.Error{Where: where(t.sheet, fmt.Sprintf("row %d", r.line)), Code: "header_missing", What: "the first row holds values, not names of columns", Do: "put a row of names above it"}
		}
		t.header, t.at = make([]string, len(t.columns)), r.line
		for _, c := range r.cells {
			if c.value.Kind == geo.Number {
				c.value = geo.TextValue(plain(c.value.Number))
			}
			t.header[c.column] = strings.Join(strings.Fields(c.value.String()), " ") // names may have line breaks
		}
		clear(t.columns) // what was found in the header is no matter of the values
		return nil
	}
	if len(t.rows) >= t.o.MaxRows {
		return t.tooMany(r.line, t.o.MaxRows, "rows")
	}
	for _, c := range r.cells {
		t.columns[c.column].kinds[c.value.Kind]++
	}
	t.rows = append(t.rows, r)
	return nil
}

// column gives the tally of a column.
func (t *table) column(j int) *tally {
	for len(t.columns) <= j {
		t.columns = append(t.columns, tally{})
	}
	return &t.columns[j]
}

// layer makes features of the rows.
func (t *table) layer() (*geo.Layer, error) {
	l := &geo.Layer{Name: t.sheet}
	used := map[string]bool{}
	to := make([]int, len(t.columns)) // the layer's column of each of the sheet
	for j := range t.columns {
		c := &t.columns[j]
		name := ""
		if j < len(t.header) {
			name = t.header[j]
		}
		if name == "" && c.kinds[geo.Text]+c.kinds[geo.Number]+c.kinds[geo.Bool]+len(c.found) == 0 {
			continue
		}
		if name == "" {
			name = "column " + strconv.Itoa(j+1)
		}
		got := name
		for n := 2; used[got]; n++ {
			got = name + " (" + strconv.Itoa(n) + ")"
		}
		if got != name {
			t.note("column_repeated", got, t.at, map[string]string{"name": name})
		}
		used[got] = true
		to[j] = len(l.Columns)
		l.Columns = append(l.Columns, geo.Column{Name: got})
		t.tell(got, c)
	}
	if len(t.rows)*len(l.Columns) > maxValues { // empty cells take room in a layer
		return nil, t.tooMany(t.rows[maxValues/len(l.Columns)].line, maxValues, "cells")
	}
	l.Features = make([]geo.Feature, len(t.rows))
	for i := range t.rows {
		if i%(1<<16) == 0 {
			if err := t.book.ctx.Err(); err != nil {
				return nil, err
			}
		}
		values := make([]geo.Value, len(l.Columns))
		for _, c := range t.rows[i].cells {
			v := c.value
			if t.columns[c.column].mixed() {
				switch v.Kind {
				case geo.Number:
					v = geo.TextValue(plain(v.Number))
				case geo.Bool:
					v = geo.TextValue(v.String())
				}
			}
			values[to[c.column]] = v
		}
		t.rows[i].cells = nil // so that the collector can have it
		l.Features[i] = geo.Feature{ID: strconv.Itoa(i + 1), Values: values}
	}
	if t.merged > 0 {
		t.note("cells_merged", "", 0, map[string]string{"count": strconv.Itoa(t.merged)})
	}
	if len(l.Features) == 0 {
		t.note("layer_empty", "", 0, map[string]string{"count": "1"})
	}
	return l, nil
}

// mixed tells whether a column holds values of several kinds.
func (c *tally) mixed() bool {
	kinds := 0
	for _, k := range []geo.ValueKind{geo.Text, geo.Number, geo.Bool} {
		if c.kinds[k] > 0 {
			kinds++
		}
	}
	return kinds > 1
}

// tell notes what was found in a column.
func (t *table) tell(name string, c *tally) {
	for _, code := range []string{"cell_error", "formula_without_value", "time_in_days", "number_as_text"} {
		if f := c.found[code]; f != nil {
			t.note(code, name, f.line, map[string]string{"count": strconv.Itoa(f.n)})
		}
	}
	words := c.kinds[geo.Text]
	if f := c.found["number_as_text"]; f != nil {
		words -= f.n
	}
	if c.mixed() && words+c.kinds[geo.Bool] > 0 {
		t.note("column_mixed", name, 0, map[string]string{"count": strconv.Itoa(c.kinds[geo.Number] + c.kinds[geo.Bool])})
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
