package xlsx

import (
	"encoding/xml"
	"errors"
	"fmt"
	"math"
	"strconv"
	"strings"

	"groundtally/geo"
	"groundtally/geo/formats"
)

const lastColumn = 16_384 // of the standard

// read takes all rows of a sheet.
func (t *table) read(s sheet) error {
	x, err := t.book.part(s.part)
	if err != nil {
		return t.place(err)
	}
	defer x.close()
	r := row{}
	words := false
	column := 0 // of the cell read last, counted from 1
	inData := false
	for {
		start, end, err := x.next()
		switch {
		case err != nil:
			return t.place(err)
		case start == nil && end == "":
			return nil
		case start == nil:
			switch end {
			case "sheetData":
				inData = false
			case "row":
				if inData && (len(r.cells) > 0 || r.lost) {
					if err := t.add(r, words); err != nil {
						return err
					}
					r = row{line: r.line}
				}
			}
		case start.Name.Local == "sheetData":
			inData = true
		case start.Name.Local == "mergeCell":
			t.merged++
		case start.Name.Local == "row" && inData:
			r = row{line: r.line + 1}
			words, column = false, 0
			if n, err := strconv.Atoi(attr(start, "r")); err == nil && n > 0 {
				r.line = n
			}
		case start.Name.Local == "c" && inData:
			column++
			if err := t.cell(x, start, &r, &column, &words); err != nil {
				return t.place(err)
			}
		}
	}
}

// place says which sheet a fault of its part is in.
func (t *table) place(err error) error {
	var e *formats.Error
	if errors.As(err, &e) && !strings.HasPrefix(e.Where, "sheet ") {
		e.Where = where(t.sheet, "")
	}
	return err
}

func (t *table) fault(r *row, column int, code, what string) error {
	return &formats.Error{Where: where(t.sheet, fmt.Sprintf("cell %s%d", letters(column), r.line)), Code: code, What: what, Do: doSave}
}

// cell reads one cell up to the tag that closes it.
func (t *table) cell(x *stream, start *xml.StartElement, r *row, column *int, words *bool) error {
	var typ, style string
	for _, a := range start.Attr {
		switch a.Name.Local {
		case "r":
			n, ok := columnOf(a.Value)
			if !ok {
				return t.fault(r, *column, "damaged", fmt.Sprintf("a cell is called %q", short(a.Value)))
			}
			*column = n
		case "t":
			typ = a.Value
		case "s":
			style = a.Value
		}
	}
	outer := x.depth - 1
	x.text, x.want = x.text[:0], false
	inline, raw, formula, stored := "", "", false, false
	for x.depth > outer {
		start, end, err := x.next()
		switch {
		case err != nil:
			return err
		case start == nil && end == "":
			return x.fault(fmt.Errorf("cell without end"))
		case start == nil:
			if end == "v" && x.want {
				raw = string(x.text)
			}
			x.want = false
		case start.Name.Local == "v":
			x.text, x.want, stored = x.text[:0], true, true
		case start.Name.Local == "f":
			formula = true
		case start.Name.Local == "is":
			if inline, err = x.rich(); err != nil {
				return err
			}
		}
	}
	j := *column - 1
	put := func(v geo.Value) error {
		if v.Kind == geo.Null {
			return nil
		}
		if j >= t.o.MaxColumns {
			return t.tooMany(r.line, t.o.MaxColumns, "columns")
		}
		if t.values++; t.values > maxValues {
			return t.tooMany(r.line, maxValues, "cells")
		}
		for i := len(r.cells) - 1; i >= 0 && r.cells[i].column >= j; i-- {
			if r.cells[i].column == j {
				return t.fault(r, *column, "damaged", "the cell stands twice")
			}
		}
		t.column(j)
		r.cells = append(r.cells, place{j, v})
		return nil
	}
	count := func(code string) {
		if j < t.o.MaxColumns && t.header != nil {
			t.column(j).add(code, r.line)
		}
	}
	text := func(s string, kept bool) error {
		if s = strings.TrimSpace(s); s == "" {
			return nil
		}
		if !kept {
			if err := t.book.keep(s); err != nil {
				return err
			}
		}
		*words = true
		return put(geo.TextValue(s))
	}
	switch {
	case typ == "inlineStr":
		return text(inline, false)
	case !stored || raw == "" && typ != "str":
		if formula {
			r.lost = true
			count("formula_without_value")
		}
		return nil
	}
	switch typ {
	case "s":
		n, err := strconv.Atoi(strings.TrimSpace(raw))
		if err != nil || n < 0 || n >= len(t.book.shared) {
			return t.fault(r, *column, "damaged", fmt.Sprintf("the cell refers to a text %q that is not there", short(raw)))
		}
		return text(t.book.shared[n], true)
	case "str":
		return text(unescape(raw), false)
	case "b":
		return put(geo.BoolValue(truth(strings.TrimSpace(raw))))
	case "e":
		r.lost = true
		count("cell_error")
		return nil
	case "d":
		return put(geo.TextValue(strings.TrimSuffix(strings.TrimSpace(raw), "T00:00:00")))
	case "", "n":
	default:
		return t.fault(r, *column, "damaged", fmt.Sprintf("the cell is of a type %q that there is not", short(typ)))
	}
	raw = strings.TrimSpace(raw)
	f, err := strconv.ParseFloat(raw, 64)
	if err == nil && math.IsNaN(f) || math.IsInf(f, 0) { // some writers put it for a result that is none
		r.lost = true
		count("cell_error")
		return nil
	}
	if err != nil || strings.Trim(raw, "0123456789+-.eE") != "" {
		return t.fault(r, *column, "damaged", fmt.Sprintf("%q is not a number", short(raw)))
	}
	form := notDate
	if style != "" {
		if n, err := strconv.Atoi(style); err == nil && n >= 0 && n < len(t.book.styles) {
			form = t.book.styles[n]
		}
	}
	if s, ok := form.text(f, t.book.from); ok {
		return put(geo.TextValue(s))
	}
	if form == elapsed {
		count("time_in_days")
	}
	if math.Abs(f) >= 1<<53 && !strings.ContainsAny(raw, ".eE") {
		count("number_as_text")
		return put(geo.TextValue(raw))
	}
	return put(geo.NumberValue(f))
}

// columnOf gives the column of a cell's name, "AB12" for one, counted from 1.
func columnOf(name string) (int, bool) {
	n, i := 0, 0
	for ; i < len(name); i++ {
		c := name[i] &^ 0x20
		if c < 'A' || c > 'Z' {
			break
		}
		if n = n*26 + int(c-'A') + 1; n > lastColumn {
			return 0, false
		}
	}
	return n, n > 0 && i < len(name) && strings.Trim(name[i:], "0123456789") == ""
}

func letters(column int) string {
	s := ""
	for ; column > 0; column = (column - 1) / 26 {
		s = string(rune('A'+(column-1)%26)) + s
	}
	return s
}

func short(s string) string {
	if r := []rune(s); len(r) > 40 {
		return string(r[:40]) + "..."
	}
	return s
}
