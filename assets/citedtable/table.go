package citedtable

import (
	"encoding/csv"
	"errors"
	"fmt"
	"io"
	"io/fs"
	"math"
	"path"
	"strconv"
	"strings"
)

// Provenance says how the project came to know a number.
type Provenance string

// The provenances a cited row may have.
const (
	Read           Provenance = "read"            // seen in the source itself or its abstract
	Secondary      Provenance = "secondary"       // seen quoted elsewhere
	Derived        Provenance = "derived"         // computed from stated inputs
	CommonPractice Provenance = "common practice" // usual in the trade, no single source
	Memory         Provenance = "memory"          // recalled, to be checked against the source
)

var provenances = map[Provenance]bool{Read: true, Secondary: true, Derived: true, CommonPractice: true, Memory: true}

// Table is a parsed cited table. Rows keep the order of the file.
type Table struct {
	Name    string
	Columns []string
	Rows    []Row
	index   map[string]int
}

// Row is one line of a Table with its source.
type Row struct {
	Line       int
	Source     string
	Provenance Provenance
	cells      []string
	table      *Table
}

// ErrNoSource is wrapped by the error for a row whose source column is empty.
var ErrNoSource = errors.New("row has no source")

// Parse reads a cited table: a header, then rows; the last two columns are named source and
// provenance. Lines that begin with # are comments. Rows without a source, with an unknown
// provenance or with a wrong number of cells are refused.
func Parse(name string, r io.Reader) (*Table, error) {
	cr := csv.NewReader(r)
	cr.Comment = '#'
	cr.FieldsPerRecord = -1
	head, err := cr.Read()
	if err != nil {
		return nil, fmt.Errorf("cited table %s: read header: %w", name, err)
	}
	n := len(head)
	if n < 3 || head[n-2] != "source" || head[n-1] != "provenance" {
		return nil, fmt.Errorf("cited table %s: the last two columns must be source,provenance", name)
	}
	t := &Table{Name: name, Columns: head, index: make(map[string]int, n)}
	for i, c := range head {
		if _, dup := t.index[c]; dup {
			return nil, fmt.Errorf("cited table %s: column %q stands twice", name, c)
		}
		t.index[c] = i
	}
	for {
		rec, err := cr.Read()
		if errors.Is(err, io.EOF) {
			return t, nil
		}
		if err != nil {
			return nil, fmt.Errorf("cited table %s: %w", name, err)
		}
		line, _ := cr.FieldPos(0)
		if len(rec) != n {
			return nil, fmt.Errorf("cited table %s, line %d: %d cells, want %d", name, line, len(rec), n)
		}
		row := Row{Line: line, Source: strings.TrimSpace(rec[n-2]), Provenance: Provenance(strings.TrimSpace(rec[n-1])), cells: rec, table: t}
		if row.Source == "" {
			return nil, fmt.Errorf("cited table %s, line %d: %w", name, line, ErrNoSource)
		}
		if !provenances[row.Provenance] {
			return nil, fmt.Errorf("cited table %s, line %d: provenance %q is not one of read, secondary, derived, common practice, memory", name, line, row.Provenance)
		}
		t.Rows = append(t.Rows, row)
	}
}

// ParseFS opens and parses the table at p in fsys; the table's name is p's base name.
func ParseFS(fsys fs.FS, p string) (*Table, error) {
	f, err := fsys.Open(p)
	if err != nil {
		return nil, err
	}
	defer f.Close()
	return Parse(path.Base(p), f)
}

// Has reports whether the table has the column.
func (t *Table) Has(column string) bool { _, ok := t.index[column]; return ok }

// Text gives the cell of a column, trimmed; empty when the column is not there.
func (r Row) Text(column string) string {
	i, ok := r.table.index[column]
	if !ok {
		return ""
	}
	return strings.TrimSpace(r.cells[i])
}

// Float gives the cell of a column as a finite number.
func (r Row) Float(column string) (float64, error) {
	s := r.Text(column)
	v, err := strconv.ParseFloat(s, 64)
	if err != nil || math.IsNaN(v) || math.IsInf(v, 0) {
		return 0, fmt.Errorf("cited table %s, line %d, column %s: %q is not a finite number", r.table.Name, r.Line, column, s)
	}
	return v, nil
}

// Check is one check value: what is computed, from which inputs, what is expected and how near.
type Check struct {
	ID         string
	Quantity   string             // which function the test calls
	In         map[string]float64 // numeric inputs by name
	Text       map[string]string  // inputs that are not numbers
	Expected   float64
	Tolerance  float64 // absolute, or relative when Relative
	Relative   bool
	Source     string
	Provenance Provenance
}

// OK reports whether got lies within the tolerance of the expected value.
func (c Check) OK(got float64) bool {
	tol := c.Tolerance
	if c.Relative {
		tol *= math.Abs(c.Expected)
	}
	return math.Abs(got-c.Expected) <= tol
}

// Checks reads a table of check values with the columns
// check,quantity,inputs,expected,tolerance,source,provenance. Inputs are name=value pairs parted by
// semicolons; a tolerance may end in " rel" to be relative.
func (t *Table) Checks() ([]Check, error) {
	for _, c := range []string{"check", "quantity", "inputs", "expected", "tolerance"} {
		if !t.Has(c) {
			return nil, fmt.Errorf("check table %s: no column %s", t.Name, c)
		}
	}
	out := make([]Check, 0, len(t.Rows))
	for _, r := range t.Rows {
		c := Check{ID: r.Text("check"), Quantity: r.Text("quantity"), In: map[string]float64{}, Text: map[string]string{}, Source: r.Source, Provenance: r.Provenance}
		for _, kv := range strings.Split(r.Text("inputs"), ";") {
			if kv = strings.TrimSpace(kv); kv == "" {
				continue
			}
			k, v, ok := strings.Cut(kv, "=")
			if !ok {
				return nil, fmt.Errorf("check table %s, line %d: input %q is not name=value", t.Name, r.Line, kv)
			}
			k, v = strings.TrimSpace(k), strings.TrimSpace(v)
			if f, err := strconv.ParseFloat(v, 64); err == nil {
				c.In[k] = f
			} else {
				c.Text[k] = v
			}
		}
		var err error
		if c.Expected, err = r.Float("expected"); err != nil {
			return nil, err
		}
		tol := r.Text("tolerance")
		if s, ok := strings.CutSuffix(tol, " rel"); ok {
			c.Relative, tol = true, s
		}
		if c.Tolerance, err = strconv.ParseFloat(tol, 64); err != nil {
			return nil, fmt.Errorf("check table %s, line %d: tolerance %q is not a number", t.Name, r.Line, tol)
		}
		out = append(out, c)
	}
	return out, nil
}
