package export

import (
	"bufio"
	"context"
	"fmt"
	"io"
	"math"
	"strconv"
	"strings"

	"groundtally/geo"
)

// encodeCSV writes a layer as a table: the identifier, the geometry, then the layer's columns. Where
// every geometry is a single point it stands in two columns, lon and lat, else in one, wkt. A missing
// value is an empty cell, an empty text a pair of quotes.
func encodeCSV(ctx context.Context, w io.Writer, l *geo.Layer, personal bool) error {
	b := bufio.NewWriter(w)
	t := csvTable{layer: l}
	used := map[string]bool{}
	for i, c := range l.Columns {
		if c.Personal && !personal {
			continue
		}
		t.columns = append(t.columns, i)
		used[c.Name] = true
	}
	t.settle(used)
	var row []byte
	for i, name := range t.head {
		if i > 0 {
			row = append(row, ',')
		}
		row = appendText(row, name)
	}
	for _, i := range t.columns {
		row = appendText(append(row, ','), l.Columns[i].Name)
	}
	if _, err := b.Write(append(row, "\r\n"...)); err != nil {
		return err
	}
	for i := range l.Features {
		if err := ctx.Err(); err != nil {
			return err
		}
		f := &l.Features[i]
		var err error
		if row, err = t.row(row[:0], f); err != nil {
			return fmt.Errorf("layer %q, feature %d (%s): %w", l.Name, i+1, f.ID, err)
		}
		if _, err := b.Write(append(row, "\r\n"...)); err != nil {
			return err
		}
	}
	return b.Flush()
}

type csvTable struct {
	layer   *geo.Layer
	columns []int
	head    []string // names of the columns in front of the layer's
	shape   shape
}

// shape is how the geometries of a table are written.
type shape uint8

const (
	noShape shape = iota
	pointShape
	textShape
)

// settle picks the columns in front. Their names make room for the layer's own.
func (t *csvTable) settle(used map[string]bool) {
	free := func(name string) string {
		got := name
		for n := 2; used[got]; n++ {
			got = name + "_" + strconv.Itoa(n)
		}
		used[got] = true
		return got
	}
	t.head = []string{free("feature_id")}
	for _, f := range t.layer.Features {
		switch g := f.Geometry; {
		case g.Kind == geo.NoGeometry:
		case g.Kind == geo.Points && len(g.Parts) == 1 && t.shape != textShape:
			t.shape = pointShape
		default:
			t.shape = textShape
		}
	}
	switch t.shape {
	case pointShape:
		t.head = append(t.head, free("lon"), free("lat"))
	case textShape:
		t.head = append(t.head, free("wkt"))
	}
}

func (t *csvTable) row(row []byte, f *geo.Feature) ([]byte, error) {
	if len(f.Values) != len(t.layer.Columns) {
		return row, fmt.Errorf("it has %d values for %d columns", len(f.Values), len(t.layer.Columns))
	}
	if err := checkGeometry(f.Geometry); err != nil {
		return row, err
	}
	row = appendText(row, f.ID)
	switch {
	case t.shape == pointShape && f.Geometry.Kind == geo.NoGeometry:
		row = append(row, ",,"...)
	case t.shape == pointShape:
		p := f.Geometry.Parts[0][0][0]
		row = appendNumber(append(row, ','), p.Lon)
		row = appendNumber(append(row, ','), p.Lat)
	case t.shape == textShape:
		row = append(row, ',')
		if f.Geometry.Kind != geo.NoGeometry {
			row = append(appendWKT(append(row, '"'), f.Geometry), '"') // it has commas and no quotes
		}
	}
	for _, i := range t.columns {
		row = append(row, ',')
		switch v := f.Values[i]; v.Kind {
		case geo.Text:
			row = appendText(row, v.Text)
		case geo.Number:
			if math.IsNaN(v.Number) || math.IsInf(v.Number, 0) {
				return row, fmt.Errorf("column %q holds a number that is not finite", t.layer.Columns[i].Name)
			}
			row = appendNumber(row, v.Number)
		case geo.Bool:
			row = strconv.AppendBool(row, v.Bool)
		}
	}
	return row, nil
}

// appendText writes a cell of text. What a spreadsheet would take for a formula gets an apostrophe.
func appendText(row []byte, s string) []byte {
	s = strings.ToValidUTF8(s, "\ufffd")
	if s != "" && strings.ContainsRune("=+-@\t\r", rune(s[0])) {
		s = "'" + s
	}
	if s != "" && !strings.ContainsAny(s, "\",\r\n") && s[0] != ' ' && s[len(s)-1] != ' ' {
		return append(row, s...)
	}
	row = append(row, '"')
	row = append(row, strings.ReplaceAll(s, `"`, `""`)...)
	return append(row, '"')
}

// appendNumber writes the fewest digits that read as the same number, without an exponent where a
// person would.
func appendNumber(dst []byte, v float64) []byte {
	form := byte('f')
	if a := math.Abs(v); a != 0 && (a < 1e-6 || a > 1<<53) {
		form = 'g'
	}
	return strconv.AppendFloat(dst, v, form, -1, 64)
}
