package shapefile

import (
	"cmp"
	"maps"
	"slices"
	"strconv"
	"strings"

	"groundtally/geo"
)

// notices tells the severity of each code. Args: count; features, the numbers of the first ones.
var notices = map[string]geo.Severity{
	"geometry_missing":     geo.Warning, // a null shape, or a row of attributes without a shape
	"geometry_empty":       geo.Warning, // a shape without a position
	"ring_closed":          geo.Info,    // last position differed from the first
	"ring_repeated":        geo.Warning, // a ring stood twice in a shape; one was left out
	"part_too_short":       geo.Warning, // a line of one position, a ring of fewer than three
	"height_left_out":      geo.Info,    // third coordinates of positions
	"measure_left_out":     geo.Info,    // measures of positions
	"record_left_out":      geo.Fault,   // a broken record; Args what
	"record_deleted":       geo.Info,    // rows marked as deleted, left out with their shapes
	"record_longer":        geo.Warning, // bytes behind a shape in its record
	"length_disagrees":     geo.Warning, // the header says another length than the file has
	"index_broken":         geo.Warning, // the .shx was passed over; Args what
	"attributes_missing":   geo.Warning, // no .dbf
	"rows_disagree":        geo.Warning, // Args shapes, rows
	"encoding_assumed":     geo.Warning, // nothing tells the encoding; Args encoding
	"encoding_doubtful":    geo.Warning, // the text looks like UTF-8, the set says Args encoding
	"encoding_unknown":     geo.Warning, // Args what, where
	"text_unreadable":      geo.Warning, // characters that are none in the encoding; Args encoding; Field
	"column_type_left_out": geo.Warning, // a type of column that is not read; Args type; Field
	"column_repeated":      geo.Info,    // Args name; Field
	"column_mixed":         geo.Info,    // Field
	"column_not_numbers":   geo.Warning, // Args count, numbers; Field
	"number_as_text":       geo.Info,    // a whole number beyond 2^53 kept as text; Field
	"decimal_comma":        geo.Info,    // Field
	"date_as_written":      geo.Info,    // a date that is none was kept as it stands; Field
	"crs_not_understood":   geo.Warning, // the .prj is no text; Args what
	"layer_empty":          geo.Warning, // the file has no feature
}

const named = 10 // features named in a notice

// key sets notices apart: one is given for each code with each column, field or text.
type key struct {
	code   string
	column int    // counted from 1, because names are only known when the encoding is
	field  string // of what is not a column of the layer
	what   string
}

type total struct {
	n, features, last int
	rows              []string
	args              map[string]string
}

// book sums up what is worth a notice while it comes, so that its size does not grow with the file.
type book map[key]*total

// note counts n more for a code; row 0 is the whole set.
func (b book) note(code string, row, n int) *total { return b.add(key{code: code}, row, n) }

func (b book) add(k key, row, n int) *total {
	t := b[k]
	if t == nil {
		t = &total{}
		b[k] = t
	}
	t.n += n
	if row > 0 && row != t.last {
		t.last = row
		t.features++
		if len(t.rows) < named {
			t.rows = append(t.rows, strconv.Itoa(row))
		}
	}
	return t
}

// with sets arguments of a notice beside its count.
func (t *total) with(pairs ...string) {
	if t.args == nil {
		t.args = map[string]string{}
	}
	for i := 0; i+1 < len(pairs); i += 2 {
		t.args[pairs[i]] = pairs[i+1]
	}
}

// list gives the notices sorted by code, column, field and text.
func (b book) list(file string, columns []geo.Column) []geo.Notice {
	keys := make([]key, 0, len(b))
	for k := range b {
		keys = append(keys, k)
	}
	slices.SortFunc(keys, func(a, b key) int {
		return cmp.Or(strings.Compare(a.code, b.code), cmp.Compare(a.column, b.column), strings.Compare(a.field, b.field), strings.Compare(a.what, b.what))
	})
	out := make([]geo.Notice, 0, len(keys))
	for _, k := range keys {
		t := b[k]
		n := geo.Notice{Code: k.code, Severity: notices[k.code], File: file, Field: k.field, Args: map[string]string{"count": strconv.Itoa(t.n)}}
		if k.column > 0 {
			n.Field = columns[k.column-1].Name
		}
		maps.Copy(n.Args, t.args)
		if k.what != "" {
			n.Args["what"] = k.what
		}
		if len(t.rows) > 0 {
			n.Feature = t.rows[0]
			n.Args["features"] = strings.Join(t.rows, ", ")
			if more := t.features - len(t.rows); more > 0 {
				n.Args["more"] = strconv.Itoa(more)
			}
		}
		out = append(out, n)
	}
	return out
}
