package xlsx

import (
	"archive/zip"
	"bytes"
	"context"
	"encoding/binary"
	"errors"
	"fmt"
	"hash/crc32"
	"io"
	"math"
	"math/rand/v2"
	"os"
	"path/filepath"
	"reflect"
	"runtime"
	"strconv"
	"strings"
	"testing"
	"time"

	"github.com/xuri/excelize/v2"

	"groundtally/geo"
	"groundtally/geo/formats"
)

const fixtures = "../../../testdata/formats/xlsx"

func decodeBytes(ctx context.Context, b []byte, o Options) (Result, error) {
	return Decode(ctx, bytes.NewReader(b), int64(len(b)), o)
}

func mustDecode(t testing.TB, b []byte, o Options) Result {
	t.Helper()
	r, err := decodeBytes(t.Context(), b, o)
	if err != nil {
		t.Fatal(err)
	}
	return r
}

func wantError(t *testing.T, err error, code, where string) {
	t.Helper()
	var e *formats.Error
	if !errors.As(err, &e) || e.Code != code || e.Where != where || e.Do == "" || e.What == "" {
		t.Errorf("%v (%+v), want code %s at %q", err, e, code, where)
	}
}

func counts(r Result) map[string]int {
	m := map[string]int{}
	for _, n := range r.Notices {
		c := 1
		if s, ok := n.Args["count"]; ok {
			var err error
			if c, err = strconv.Atoi(s); err != nil {
				panic(err)
			}
		}
		m[n.Code] += c
	}
	return m
}

func wantNotices(t *testing.T, r Result, want map[string]int) {
	t.Helper()
	if want == nil {
		want = map[string]int{}
	}
	if got := counts(r); !reflect.DeepEqual(got, want) {
		t.Errorf("notices %v, want %v", got, want)
	}
	for _, n := range r.Notices {
		if s, ok := notices[n.Code]; !ok || s != n.Severity || n.Layer != r.Sheet {
			t.Errorf("notice %+v", n)
		}
	}
}

func names(l *geo.Layer) []string {
	var out []string
	for _, c := range l.Columns {
		out = append(out, c.Name)
	}
	return out
}

// values gives a column by its name.
func values(t *testing.T, l *geo.Layer, name string) []geo.Value {
	t.Helper()
	j := l.ColumnIndex(name)
	if j < 0 {
		t.Fatalf("no column %q among %q", name, names(l))
	}
	var out []geo.Value
	for _, f := range l.Features {
		out = append(out, f.Values[j])
	}
	return out
}

var null = geo.Value{}

func text(s string) geo.Value         { return geo.TextValue(s) }
func number(f float64) geo.Value      { return geo.NumberValue(f) }
func list(v ...geo.Value) []geo.Value { return v }

// A workbook by another writer, against what its reader reads.
func TestAgainstOgrinfo(t *testing.T) {
	b, err := os.ReadFile(filepath.Join(fixtures, "readings.xlsx"))
	if err != nil {
		t.Fatal(err)
	}
	told, err := os.ReadFile(filepath.Join(fixtures, "readings.txt"))
	if err != nil {
		t.Fatal(err)
	}
	for _, sheet := range []string{"readings", "second"} {
		r := mustDecode(t, b, Options{Sheet: sheet})
		wantSheets := []string{"readings", "second"}
		if r.Sheet != sheet || !reflect.DeepEqual(r.Sheets, wantSheets) {
			t.Errorf("sheet %s of %q", r.Sheet, r.Sheets)
		}
		features := strings.Split(string(told), "OGRFeature("+sheet+"):")[1:]
		if len(r.Layer.Features) != len(features) || r.Ledger.Read != len(features) {
			t.Fatalf("%d features, want %d", len(r.Layer.Features), len(features))
		}
		for i, f := range features {
			got := r.Layer.Features[i]
			if got.ID != strconv.Itoa(i+1) || got.Geometry.Kind != geo.NoGeometry {
				t.Errorf("feature %+v", got)
			}
			f, _, _ = strings.Cut(f, "\n\n") // behind it comes the next sheet
			said := map[string]bool{}
			for _, attribute := range strings.Split("\n"+f, "\n  ")[1:] {
				label, want, _ := strings.Cut(attribute, ") = ")
				name, typ, _ := strings.Cut(label, " (")
				said[name] = true
				if err := agrees(values(t, r.Layer, name)[i], typ, want); err != nil {
					t.Errorf("feature %d, %s: %v", i+1, name, err)
				}
			}
			for j, c := range r.Layer.Columns {
				if v := got.Values[j]; !said[c.Name] && v.Kind != geo.Null {
					t.Errorf("feature %d, %s: %+v, want nothing", i+1, c.Name, v)
				}
			}
		}
		if sheet == "readings" {
			wantNotices(t, r, map[string]int{"number_as_text": 1})
		}
	}
	if got, err := Sheets(bytes.NewReader(b), int64(len(b)), Options{}); err != nil || !reflect.DeepEqual(got, []string{"readings", "second"}) {
		t.Errorf("sheets %q, %v", got, err)
	}
}

func agrees(v geo.Value, typ, want string) error {
	ok := false
	switch typ {
	case "String":
		ok = v == text(strings.TrimSpace(want))
	case "Integer64": // the column holds a number beyond 2^53
		ok = v == text(want)
	case "Integer(Boolean)":
		ok = v == geo.BoolValue(want == "1")
	case "Date":
		ok = v == text(strings.ReplaceAll(want, "/", "-"))
	case "DateTime":
		ok = v == text(strings.Replace(strings.ReplaceAll(want, "/", "-"), " ", "T", 1))
	case "Time":
		ok = v == text(want)
	case "Integer", "Real":
		f, err := strconv.ParseFloat(want, 64)
		ok = err == nil && v == number(f)
	}
	if !ok {
		return fmt.Errorf("%+v, want %s %s", v, typ, want)
	}
	return nil
}

// A workbook by a writing library, with what people put into sheets.
func TestWorkbookOfLibrary(t *testing.T) {
	f := excelize.NewFile()
	defer f.Close()
	must := func(err error) {
		t.Helper()
		if err != nil {
			t.Fatal(err)
		}
	}
	style := func(format string) int {
		s, err := f.NewStyle(&excelize.Style{CustomNumFmt: &format})
		must(err)
		return s
	}
	set := func(cell string, v any) { t.Helper(); must(f.SetCellValue("Sheet1", cell, v)) }
	head := []string{"Name\nof it", "number", "share", "day", "name", "name", "", "mixed", "sum", "open", "length", "truth"}
	must(f.SetSheetRow("Sheet1", "B3", &head))
	set("B4", "  Grün <&> \"x\" ")
	set("C4", 12)
	set("D4", 0.25)
	must(f.SetCellStyle("Sheet1", "D4", "D5", style("0%")))
	set("E4", time.Date(2024, 2, 29, 0, 0, 0, 0, time.UTC))
	set("E6", time.Date(2024, 2, 29, 12, 30, 0, 0, time.UTC))
	set("F4", "00123")
	set("G4", "first")
	set("H4", 1)
	set("I4", 1500000)
	set("I6", "many")
	must(f.SetCellFormula("Sheet1", "K4", "SUM(C4:C6)"))
	set("L4", 1.5)
	must(f.SetCellStyle("Sheet1", "L4", "L4", style("[h]:mm")))
	set("M4", true)
	set("M6", false)
	set("B6", "stays")
	set("C6", -1e-7)
	set("D6", -123456.789)
	must(f.MergeCell("Sheet1", "F6", "G7"))
	set("F6", "merged")
	_, err := f.NewSheet("Other")
	must(err)
	must(f.SetCellValue("Other", "A1", "x"))
	var buf bytes.Buffer
	must(f.Write(&buf))
	b := buf.Bytes()

	r := mustDecode(t, b, Options{File: "book.xlsx"})
	if r.Sheet != "Sheet1" || r.Layer.Name != "Sheet1" || r.Ledger.Read != 2 {
		t.Errorf("sheet %q, %d rows", r.Sheet, r.Ledger.Read)
	}
	if want := []string{"Name of it", "number", "share", "day", "name", "name (2)", "column 8", "mixed", "sum", "open", "length", "truth"}; !reflect.DeepEqual(names(r.Layer), want) {
		t.Fatalf("columns %q, want %q", names(r.Layer), want)
	}
	for name, want := range map[string][]geo.Value{
		"Name of it": list(text(`Grün <&> "x"`), text("stays")),
		"number":     list(number(12), number(-1e-7)),
		"share":      list(number(0.25), number(-123456.789)),
		"day":        list(text("2024-02-29"), text("2024-02-29T12:30:00")),
		"name":       list(text("00123"), text("merged")),
		"name (2)":   list(text("first"), null),
		"column 8":   list(number(1), null),
		"mixed":      list(text("1500000"), text("many")),
		"sum":        list(null, null),
		"open":       list(null, null),
		"length":     list(number(1.5), null),
		"truth":      list(geo.BoolValue(true), geo.BoolValue(false)),
	} {
		if got := values(t, r.Layer, name); !reflect.DeepEqual(got, want) {
			t.Errorf("%s: %+v, want %+v", name, got, want)
		}
	}
	wantNotices(t, r, map[string]int{"column_repeated": 1, "column_mixed": 1, "formula_without_value": 1, "time_in_days": 1, "cells_merged": 1, "sheet_chosen": 1})
	for _, n := range r.Notices {
		if n.File != "book.xlsx" {
			t.Errorf("notice %+v", n)
		}
		switch n.Code {
		case "formula_without_value":
			if n.Field != "open" || n.Line != 4 {
				t.Errorf("notice %+v", n)
			}
		case "column_repeated":
			if n.Field != "name (2)" || n.Line != 3 || n.Args["name"] != "name" {
				t.Errorf("notice %+v", n)
			}
		case "sheet_chosen":
			if n.Args["sheet"] != "Sheet1" || n.Args["sheets"] != "Sheet1, Other" {
				t.Errorf("notice %+v", n)
			}
		}
	}
	r = mustDecode(t, b, Options{Sheet: "other"})
	if r.Sheet != "Other" || r.Ledger.Read != 0 {
		t.Errorf("sheet %q, %d rows", r.Sheet, r.Ledger.Read)
	}
	wantNotices(t, r, map[string]int{"layer_empty": 1})
	_, err = decodeBytes(t.Context(), b, Options{Sheet: "third", File: "book.xlsx"})
	wantError(t, err, "sheet_unknown", "")
	if err == nil || !strings.Contains(err.Error(), "Sheet1, Other") || !strings.HasPrefix(err.Error(), "book.xlsx: ") {
		t.Errorf("error %v", err)
	}
}

// Streams of the library, with texts inside the cells, over more rows than one block holds.
func TestLongSheet(t *testing.T) {
	const n = 5000
	r := mustDecode(t, long(t, n), Options{})
	if r.Ledger.Read != n || len(r.Layer.Columns) != 5 {
		t.Fatalf("%d rows, %q", r.Ledger.Read, names(r.Layer))
	}
	for i, f := range r.Layer.Features {
		want := list(number(float64(i)), text("row "+strconv.Itoa(i)), number(float64(i)/8), geo.BoolValue(i%2 == 0), text("same"))
		if !reflect.DeepEqual(f.Values, want) || f.ID != strconv.Itoa(i+1) {
			t.Fatalf("row %d: %+v, want %+v", i, f, want)
		}
	}
}

func long(t testing.TB, n int) []byte {
	t.Helper()
	f := excelize.NewFile()
	defer f.Close()
	w, err := f.NewStreamWriter("Sheet1")
	if err != nil {
		t.Fatal(err)
	}
	row := func(i int, v ...any) {
		if err := w.SetRow("A"+strconv.Itoa(i), v); err != nil {
			t.Fatal(err)
		}
	}
	row(1, "id", "name", "share", "even", "same")
	for i := range n {
		row(i+2, i, "row "+strconv.Itoa(i), float64(i)/8, i%2 == 0, "same")
	}
	if err := w.Flush(); err != nil {
		t.Fatal(err)
	}
	var buf bytes.Buffer
	if err := f.Write(&buf); err != nil {
		t.Fatal(err)
	}
	return buf.Bytes()
}

// pack zips parts; names and contents alternate.
func pack(t testing.TB, parts ...string) []byte {
	t.Helper()
	var buf bytes.Buffer
	z := zip.NewWriter(&buf)
	for i := 0; i < len(parts); i += 2 {
		w, err := z.Create(parts[i])
		if err != nil {
			t.Fatal(err)
		}
		if _, err := io.WriteString(w, parts[i+1]); err != nil {
			t.Fatal(err)
		}
	}
	if err := z.Close(); err != nil {
		t.Fatal(err)
	}
	return buf.Bytes()
}

const (
	typeBase = "http://schemas.openxmlformats.org/officeDocument/2006/relationships/"
	rootRels = `<?xml version="1.0"?><Relationships xmlns="http://schemas.openxmlformats.org/package/2006/relationships"><Relationship Id="r" Type="` + typeBase + `officeDocument" Target="xl/workbook.xml"/></Relationships>`
	bookRels = `<?xml version="1.0"?><Relationships xmlns="http://schemas.openxmlformats.org/package/2006/relationships"><Relationship Id="rId1" Type="` + typeBase + `worksheet" Target="worksheets/sheet1.xml"/><Relationship Id="rId2" Type="` + typeBase + `sharedStrings" Target="/xl/sharedStrings.xml"/><Relationship Id="rId3" Type="` + typeBase + `styles" Target="styles.xml"/></Relationships>`
	bookXML  = `<?xml version="1.0" encoding="UTF-8" standalone="yes"?><workbook xmlns="http://schemas.openxmlformats.org/spreadsheetml/2006/main" xmlns:r="http://schemas.openxmlformats.org/officeDocument/2006/relationships"><sheets><sheet name="Data" sheetId="1" r:id="rId1"/></sheets></workbook>`
	shared   = `<sst xmlns="http://schemas.openxmlformats.org/spreadsheetml/2006/main"><si><t>name</t></si><si><t xml:space="preserve"> plain </t></si><si><r><rPr><b/></rPr><t>in </t></r><r><t>pieces</t></r><rPh sb="0" eb="1"><t>not this</t></rPh></si><si><t>a_x000A_b &amp; _x005F_x000A_ _xZZZZ_ _x12</t></si><si/></sst>`
	styles   = `<styleSheet xmlns="http://schemas.openxmlformats.org/spreadsheetml/2006/main"><numFmts count="2"><numFmt numFmtId="164" formatCode="dd\.mm\.yyyy"/><numFmt numFmtId="165" formatCode="[h]:mm:ss"/></numFmts><cellStyleXfs><xf numFmtId="14"/></cellStyleXfs><cellXfs><xf numFmtId="0"/><xf numFmtId="164"><alignment/></xf><xf numFmtId="14"/><xf numFmtId="22"/><xf numFmtId="20"/><xf numFmtId="165"/></cellXfs><cellStyles/></styleSheet>`
)

// sheetOf wraps rows of a sheet.
func sheetOf(rows string) string {
	return `<?xml version="1.0"?><worksheet xmlns="http://schemas.openxmlformats.org/spreadsheetml/2006/main"><dimension ref="A1:ZZ99"/><sheetData>` + rows + `</sheetData></worksheet>`
}

// byHand makes a workbook of a sheet's XML.
func byHand(t testing.TB, sheet string) []byte {
	t.Helper()
	return pack(t, "[Content_Types].xml", "<Types/>", "_rels/.rels", rootRels, "xl/workbook.xml", bookXML, "xl/_rels/workbook.xml.rels", bookRels,
		"xl/sharedStrings.xml", shared, "xl/styles.xml", styles, "xl/worksheets/sheet1.xml", sheet)
}

// Parts written by hand, in all ways that the standard has for a value.
func TestByHand(t *testing.T) {
	r := mustDecode(t, byHand(t, sheetOf(`
		<row r="2"><c r="A2" t="s"><v>0</v></c><c r="B2" t="inlineStr"><is><t>inline</t></is></c><c t="str"><f>"va"&amp;"lue"</f><v>value</v></c><c r="D2" t="s"><v>2</v></c><c r="F2" t="inlineStr"><is><r><t>two </t></r><r><t>runs</t></r></is></c></row>
		<row r="3" spans="1:3"/>
		<row><c r="A4" t="s"><v>1</v></c><c r="B4"><v>1.5E+2</v></c><c r="C4" t="b"><v>1</v></c><c r="D4" s="1"><v>45351</v></c><c r="F4" s="5"><v>1.25</v></c></row>
		<row r="7"><c t="s"><v>3</v></c><c><f>1/3</f><v>0.333333333333333</v></c><c t="b"><v>0</v></c><c s="3"><v>45351.5</v></c><c s="4" t="n"><v>0.75</v></c><c t="e"><v>#N/A</v></c></row>
		<row r="9"><c r="A9" t="s"><v>4</v></c><c r="B9" t="e"><f>1/0</f><v>#DIV/0!</v></c></row>
		<row r="10"><c r="A10" s="1"/><c r="B10" t="str"><f>""</f><v></v></c></row>
		<row r="11"><c r="D11" t="d"><v>2020-01-05T00:00:00</v></c><c r="E11" s="4"><v>0</v></c></row>`)), Options{})
	if want := []string{"name", "inline", "value", "in pieces", "column 5", "two runs"}; !reflect.DeepEqual(names(r.Layer), want) {
		t.Fatalf("columns %q, want %q", names(r.Layer), want)
	}
	for name, want := range map[string][]geo.Value{
		"name":      list(text("plain"), text("a\nb & _x000A_ _xZZZZ_ _x12"), null, null),
		"inline":    list(number(150), number(0.333333333333333), null, null),
		"value":     list(geo.BoolValue(true), geo.BoolValue(false), null, null),
		"in pieces": list(text("2024-02-29"), text("2024-02-29T12:00:00"), null, text("2020-01-05")),
		"column 5":  list(null, text("18:00:00"), null, text("00:00:00")),
		"two runs":  list(number(1.25), null, null, null),
	} {
		if got := values(t, r.Layer, name); !reflect.DeepEqual(got, want) {
			t.Errorf("%s: %+v, want %+v", name, got, want)
		}
	}
	wantNotices(t, r, map[string]int{"cell_error": 2, "time_in_days": 1})
	for _, n := range r.Notices {
		if n.Code == "cell_error" && n.Line != map[string]int{"inline": 9, "two runs": 7}[n.Field] {
			t.Errorf("notice %+v", n)
		}
	}
}

func TestDates(t *testing.T) {
	for _, c := range []struct {
		style  int
		days   string
		from04 bool
		want   geo.Value
	}{
		{2, "1", false, text("1900-01-01")},
		{2, "59", false, text("1900-02-28")},
		{2, "60", false, text("1900-02-29")},
		{2, "61", false, text("1900-03-01")},
		{2, "36526", false, text("2000-01-01")},
		{2, "2958465", false, text("9999-12-31")},
		{2, "2958466", false, number(2958466)},
		{2, "-1", false, number(-1)},
		{2, "1e300", false, number(1e300)},
		{2, "43831.999999999", false, text("2020-01-02")},
		{3, "43831", false, text("2020-01-01T00:00:00")},
		{3, "43831.0000115741", false, text("2020-01-01T00:00:01")},
		{3, "43831.5000000579", false, text("2020-01-01T12:00:00.005")},
		{4, "0.25", false, text("06:00:00")},
		{4, "1.25", false, text("1900-01-01T06:00:00")},
		{5, "1.25", false, number(1.25)},
		{2, "0.5", false, text("12:00:00")},
		{0, "43831", false, number(43831)},
		{99, "43831", false, number(43831)},
		{2, "0", true, text("1904-01-01")},
		{2, "42369", true, text("2020-01-01")},
		{4, "0.5", true, text("12:00:00")},
		{2, "2957003", true, text("9999-12-31")},
		{2, "2957004", true, number(2957004)},
	} {
		book := bookXML
		if c.from04 {
			book = strings.Replace(book, "<sheets>", `<workbookPr date1904="1"/><sheets>`, 1)
		}
		b := pack(t, "_rels/.rels", rootRels, "xl/workbook.xml", book, "xl/_rels/workbook.xml.rels", bookRels, "xl/styles.xml", styles, "xl/worksheets/sheet1.xml",
			sheetOf(fmt.Sprintf(`<row><c t="inlineStr"><is><t>a</t></is></c></row><row><c s="%d"><v>%s</v></c></row>`, c.style, c.days)))
		r := mustDecode(t, b, Options{})
		if got := r.Layer.Features[0].Values[0]; got != c.want {
			t.Errorf("style %d, %s days, 1904 %v: %+v, want %+v", c.style, c.days, c.from04, got, c.want)
		}
	}
	for code, want := range map[string]dateForm{
		"General": notDate, "GENERAL": notDate, "0.00": notDate, "#,##0.00 [$€-407]": notDate, "0.00E+00": notDate, "@": notDate, "": notDate,
		`0 "days"`: notDate, `0\d`: notDate, `#,##0;[Red]-#,##0`: notDate, `"yyyy"0`: notDate, "[Red]0": notDate, "Standard": notDate, `"open`: notDate, "[h": elapsed,
		"yyyy-mm-dd": date, "DD/MM/YYYY": date, "mmm": date, `[$-407]d\. mmmm yyyy`: date, "d/m/yy;@": date, "m/d": date,
		"yyyy-mm-dd hh:mm": moment, "m/d/yy h:mm": moment, `yyyy\-mm\-dd"T"hh:mm:ss.000`: moment,
		"h:mm": clock, "hh:mm:ss": clock, "h:mm AM/PM": clock, "mm:ss.0": clock,
		"[h]:mm": elapsed, "[mm]:ss": elapsed, "[ss]": elapsed,
	} {
		if got := formOf(code); got != want {
			t.Errorf("%q is of form %d, want %d", code, got, want)
		}
	}
	for id, want := range map[int]dateForm{0: notDate, 1: notDate, 13: notDate, 14: date, 17: date, 18: clock, 21: clock, 22: moment, 23: notDate, 37: notDate, 45: clock, 46: elapsed, 47: clock, 48: notDate, 49: notDate, 57: date, 59: notDate} {
		if got := builtIn(id); got != want {
			t.Errorf("format %d is of form %d, want %d", id, got, want)
		}
	}
}

// Days of the library's clock against ours.
func TestDatesAgainstLibrary(t *testing.T) {
	r := rand.New(rand.NewPCG(1, 2))
	for range 2000 {
		days := math.Floor(61+r.Float64()*2_900_000) + math.Floor(r.Float64()*86400)/86400
		for _, from := range []epoch{since1900, since1904} {
			if from == since1904 && days > 2_950_000 {
				continue
			}
			at, err := excelize.ExcelDateToTime(days, from == since1904)
			if err != nil {
				t.Fatal(err)
			}
			want := at.Round(time.Second).Format("2006-01-02T15:04:05")
			if got, ok := moment.text(days, from); !ok || got != want {
				t.Fatalf("%v days from %d: %s, want %s", days, from, got, want)
			}
		}
	}
}

func cell(s string) string { return `<c t="inlineStr"><is><t>` + s + `</t></is></c>` }

func TestColumns(t *testing.T) {
	head := `<row>` + cell("a") + cell("b") + `</row>`
	for name, c := range map[string]struct {
		rows   string
		names  []string
		values [][]geo.Value
		notes  map[string]int
	}{
		"only a header":      {head, []string{"a", "b"}, nil, map[string]int{"layer_empty": 1}},
		"more than a header": {head + `<row><c/><c/><c><v>1</v></c></row>`, []string{"a", "b", "column 3"}, [][]geo.Value{{null, null, number(1)}}, nil},
		"gap in the header":  {`<row><c r="B1" t="str"><v>b</v></c><c r="D1" t="str"><v>d</v></c></row><row><c r="B2"><v>1</v></c></row>`, []string{"b", "d"}, [][]geo.Value{{number(1), null}}, nil},
		"number as a name":   {`<row>` + cell("a") + `<c><v>2020</v></c><c t="b"><v>1</v></c></row><row><c><v>1</v></c></row>`, []string{"a", "2020", "true"}, [][]geo.Value{{number(1), null, null}}, nil},
		"long numbers":       {head + `<row><c><v>9007199254740993</v></c></row><row><c><v>9007199254740991</v></c></row>`, []string{"a", "b"}, [][]geo.Value{{text("9007199254740993"), null}, {text("9007199254740991"), null}}, map[string]int{"number_as_text": 1}},
		"truth among texts":  {head + `<row><c t="b"><v>true</v></c></row><row>` + cell("x") + `</row>`, []string{"a", "b"}, [][]geo.Value{{text("true"), null}, {text("x"), null}}, map[string]int{"column_mixed": 1}},
		"date among numbers": {head + `<row><c s="2"><v>45351</v></c></row><row><c><v>0.5</v></c></row>`, []string{"a", "b"}, [][]geo.Value{{text("2024-02-29"), null}, {text("0.5"), null}}, map[string]int{"column_mixed": 1}},
		"no numbers":         {head + `<row><c><v>NaN</v></c><c><v>-INF</v></c></row>`, []string{"a", "b"}, [][]geo.Value{{null, null}}, map[string]int{"cell_error": 2}},
		"error in a header":  {`<row>` + cell("a") + `<c t="e"><v>#REF!</v></c></row><row><c/><c><v>2</v></c></row>`, []string{"a", "column 2"}, [][]geo.Value{{null, number(2)}}, nil},
		"blanks":             {`<row>` + cell(" ") + `</row>` + head + `<row>` + cell("\n ") + `</row><row>` + cell("x") + `</row>`, []string{"a", "b"}, [][]geo.Value{{text("x"), null}}, nil},
		"out of order":       {head + `<row><c r="B2"><v>2</v></c><c r="A2"><v>1</v></c></row>`, []string{"a", "b"}, [][]geo.Value{{number(1), number(2)}}, nil},
		"other namespaces":   {strings.NewReplacer("<row", "<x:row", "</row", "</x:row").Replace(head), []string{"a", "b"}, nil, map[string]int{"layer_empty": 1}},
	} {
		t.Run(name, func(t *testing.T) {
			r := mustDecode(t, byHand(t, sheetOf(c.rows)), Options{})
			if !reflect.DeepEqual(names(r.Layer), c.names) {
				t.Errorf("columns %q, want %q", names(r.Layer), c.names)
			}
			var got [][]geo.Value
			for _, f := range r.Layer.Features {
				got = append(got, f.Values)
			}
			if !reflect.DeepEqual(got, c.values) {
				t.Errorf("%+v, want %+v", got, c.values)
			}
			wantNotices(t, r, c.notes)
		})
	}
}

func TestWhichSheet(t *testing.T) {
	rels := strings.Replace(bookRels, "</Relationships>", `<Relationship Id="rId4" Type="`+typeBase+`worksheet" Target="..\xl\worksheets\SHEET2.xml"/><Relationship Id="rId5" Type="`+typeBase+`worksheet" Target="worksheets/sheet3.xml"/><Relationship Id="rId6" Type="`+typeBase+`chartsheet" Target="chartsheets/sheet1.xml"/><Relationship Id="rId7" Type="`+typeBase+`worksheet" TargetMode="External" Target="http://example.org/"/></Relationships>`, 1)
	sheets := func(s string) string {
		return strings.Replace(bookXML, `<sheet name="Data" sheetId="1" r:id="rId1"/>`, s, 1)
	}
	all := `<sheet name="Empty" sheetId="1" r:id="rId1"/><sheet name="Chart" sheetId="4" r:id="rId6"/><sheet name="Lists" state="hidden" sheetId="2" r:id="rId4"/><sheet name="Data" sheetId="3" r:id="rId5"/><sheet name="Far" sheetId="5" r:id="rId7"/>`
	table := func(s string) string { return sheetOf(`<row>` + cell(s) + `</row><row><c><v>1</v></c></row>`) }
	b := pack(t, "_rels/.rels", rootRels, "xl/workbook.xml", sheets(all), "xl/_rels/workbook.xml.rels", rels,
		"xl/worksheets/sheet1.xml", sheetOf(`<row r="1"><c r="A1" s="1"/></row>`), "xl/worksheets/sheet2.xml", table("hidden"), "xl/worksheets/sheet3.xml", table("shown"))
	r := mustDecode(t, b, Options{})
	if want := []string{"Empty", "Lists", "Data"}; r.Sheet != "Data" || !reflect.DeepEqual(r.Sheets, want) || names(r.Layer)[0] != "shown" {
		t.Errorf("sheet %q of %q", r.Sheet, r.Sheets)
	}
	if r := mustDecode(t, b, Options{Sheet: "Lists"}); names(r.Layer)[0] != "hidden" {
		t.Errorf("columns %q", names(r.Layer))
	}
	_, err := decodeBytes(t.Context(), b, Options{Sheet: "Empty"})
	wantError(t, err, "empty_sheet", `sheet "Empty"`)
	_, err = decodeBytes(t.Context(), byHand(t, sheetOf("")), Options{})
	wantError(t, err, "empty_file", "")
}

func TestRefused(t *testing.T) {
	head := `<row>` + cell("a") + `</row>`
	protect := func() []byte {
		f := excelize.NewFile()
		defer f.Close()
		if err := f.SetCellValue("Sheet1", "A1", "secret"); err != nil {
			t.Fatal(err)
		}
		var buf bytes.Buffer
		if err := f.Write(&buf, excelize.Options{Password: "x"}); err != nil {
			t.Fatal(err)
		}
		return buf.Bytes()
	}
	old := make([]byte, 2048)
	copy(old, "\xd0\xcf\x11\xe0\xa1\xb1\x1a\xe1")
	binary.LittleEndian.PutUint16(old[30:], 9)
	copy(old[512:], "W\x00o\x00r\x00k\x00b\x00o\x00o\x00k\x00")
	whole := byHand(t, sheetOf(head))
	locked := bytes.Clone(whole)
	for i := 0; i+10 < len(locked); i++ { // the mark of encryption, in all headers
		switch {
		case bytes.HasPrefix(locked[i:], []byte("PK\x01\x02")):
			locked[i+8] |= 1
		case bytes.HasPrefix(locked[i:], []byte("PK\x03\x04")):
			locked[i+6] |= 1
		}
	}
	sheet := `sheet "Data"`
	for name, c := range map[string]struct {
		b           []byte
		code, where string
	}{
		"nothing":           {nil, "empty_file", ""},
		"text":              {[]byte("a,b\n1,2\n"), "not_workbook", ""},
		"old workbook":      {old, "old_workbook", ""},
		"old and short":     {old[:20], "old_workbook", ""},
		"protected":         {protect(), "password", ""},
		"locked archive":    {locked, "password", ""},
		"cut":               {whole[:len(whole)-30], "truncated", ""},
		"only the mark":     {[]byte("PK\x03\x04"), "truncated", ""},
		"another archive":   {pack(t, "readme.txt", "hello"), "not_workbook", ""},
		"OpenDocument":      {pack(t, "mimetype", "application/vnd.oasis.opendocument.spreadsheet", "content.xml", "<x/>"), "not_workbook", ""},
		"binary workbook":   {pack(t, "xl/workbook.bin", "x"), "not_workbook", ""},
		"text document":     {pack(t, "_rels/.rels", strings.Replace(rootRels, "xl/workbook.xml", "word/document.xml", 1), "word/document.xml", "<document/>"), "not_workbook", ""},
		"no sheet":          {pack(t, "xl/workbook.xml", "<workbook/>"), "no_sheet", ""},
		"sheet not there":   {pack(t, "xl/workbook.xml", bookXML, "xl/_rels/workbook.xml.rels", bookRels), "damaged", sheet},
		"no XML":            {byHand(t, "hello <"), "damaged", sheet},
		"XML cut":           {byHand(t, sheetOf(head)[:150]), "damaged", sheet},
		"XML cut at a tag":  {byHand(t, strings.TrimSuffix(sheetOf(head), "</worksheet>")), "damaged", sheet},
		"closed too often":  {byHand(t, sheetOf(head)+"</x>"), "damaged", sheet},
		"entity":            {byHand(t, `<!DOCTYPE x [<!ENTITY a "aaaaaaaaaa">]>`+sheetOf(`<row>`+cell("&a;&a;")+`</row>`)), "damaged", sheet},
		"UTF-16":            {byHand(t, strings.Replace(sheetOf(head), `version="1.0"`, `version="1.0" encoding="UTF-16"`, 1)), "damaged", sheet},
		"values first":      {byHand(t, sheetOf(`<row r="3"><c><v>1</v></c></row>`)), "header_missing", sheet + ", row 3"},
		"no number":         {byHand(t, sheetOf(head+`<row r="7"><c r="AB7"><v>12 m</v></c></row>`)), "damaged", sheet + ", cell AB7"},
		"hexadecimal":       {byHand(t, sheetOf(head+`<row><c><v>0x10</v></c></row>`)), "damaged", sheet + ", cell A2"},
		"shared beyond":     {byHand(t, sheetOf(head+`<row><c t="s"><v>5</v></c></row>`)), "damaged", sheet + ", cell A2"},
		"shared negative":   {byHand(t, sheetOf(head+`<row><c t="s"><v>-1</v></c></row>`)), "damaged", sheet + ", cell A2"},
		"unknown type":      {byHand(t, sheetOf(head+`<row><c t="x"><v>1</v></c></row>`)), "damaged", sheet + ", cell A2"},
		"twice":             {byHand(t, sheetOf(head+`<row><c r="A2"><v>1</v></c><c r="A2"><v>1</v></c></row>`)), "damaged", sheet + ", cell A2"},
		"no name of a cell": {byHand(t, sheetOf(head+`<row><c/><c r="12"><v>1</v></c></row>`)), "damaged", sheet + ", cell B2"},
		"beyond all":        {byHand(t, sheetOf(head+`<row><c r="ZZZZ2"><v>1</v></c></row>`)), "damaged", sheet + ", cell A2"},
	} {
		t.Run(name, func(t *testing.T) {
			_, err := decodeBytes(t.Context(), c.b, Options{File: "b.xlsx"})
			wantError(t, err, c.code, c.where)
			if err != nil && !strings.HasPrefix(err.Error(), "b.xlsx: ") {
				t.Errorf("error %v", err)
			}
		})
	}
	_, err := Sheets(bytes.NewReader(old), int64(len(old)), Options{File: "b.xls"})
	wantError(t, err, "old_workbook", "")
	disk := errors.New("input/output error")
	_, err = Decode(t.Context(), faulty{disk}, 1000, Options{})
	wantError(t, err, "unreadable", "")
	if !errors.Is(err, disk) {
		t.Errorf("the cause is lost: %v", err)
	}
}

type faulty struct{ err error }

func (f faulty) ReadAt([]byte, int64) (int, error) { return 0, f.err }

// A workbook that is cut or changed anywhere is never a shorter table: it is the same one, or an error.
func TestDamagedAnywhere(t *testing.T) {
	var rows strings.Builder
	rows.WriteString(`<row>` + cell("a") + cell("b") + `</row>`)
	for i := range 20 {
		fmt.Fprintf(&rows, `<row><c><v>%d</v></c><c t="s"><v>%d</v></c></row>`, i*i, i%4)
	}
	whole := byHand(t, sheetOf(rows.String()))
	want := mustDecode(t, whole, Options{})
	look := func(b []byte, how string, at int) {
		t.Helper()
		r, err := decodeBytes(t.Context(), b, Options{File: "b.xlsx"})
		var e *formats.Error
		if err != nil && (!errors.As(err, &e) || e.Code == "" || e.What == "" || e.Do == "" || e.File != "b.xlsx") {
			t.Fatalf("%s at %d: %v", how, at, err)
		}
		if err == nil && len(r.Layer.Features) != len(want.Layer.Features) {
			t.Fatalf("%s at %d: %d features", how, at, len(r.Layer.Features))
		}
	}
	for n := range whole {
		look(whole[:n], "cut", n)
		b := bytes.Clone(whole)
		b[n] ^= 0x10
		look(b, "changed", n)
	}
	if _, err := decodeBytes(t.Context(), whole[:len(whole)-1], Options{}); err == nil {
		t.Error("a cut workbook was read")
	}
}

func TestLimits(t *testing.T) {
	b := byHand(t, sheetOf(`<row>`+cell("a")+cell("b")+`</row><row><c><v>1</v></c></row><row><c><v>2</v></c></row>`))
	sheet := `sheet "Data"`
	_, err := decodeBytes(t.Context(), b, Options{MaxRows: 1})
	wantError(t, err, "too_many", sheet+", row 3")
	_, err = decodeBytes(t.Context(), b, Options{MaxColumns: 1})
	wantError(t, err, "too_many", sheet+", row 1")
	for most := int64(5000); ; most-- { // the sheet is read last
		if _, err = decodeBytes(t.Context(), b, Options{MaxBytes: most}); err != nil {
			wantError(t, err, "file_too_large", sheet)
			break
		}
	}
	_, err = decodeBytes(t.Context(), b, Options{MaxBytes: 300})
	wantError(t, err, "file_too_large", "xl/_rels/workbook.xml.rels")
	mustDecode(t, b, Options{MaxRows: 2, MaxColumns: 2, MaxBytes: 1 << 20})
	// A cell without a value is no column.
	r := mustDecode(t, byHand(t, sheetOf(`<row>`+cell("a")+`<c r="XFD1" s="1"/></row>`)), Options{MaxColumns: 1})
	if len(r.Layer.Columns) != 1 {
		t.Errorf("columns %q", names(r.Layer))
	}
}

// Little archives that make much are stopped early.
func TestBombs(t *testing.T) {
	zeros := strings.Repeat("0", 32<<20)
	wide := `<row>` + strings.Repeat(cell("a"), 1000) + `</row>` + strings.Repeat(`<row><c><v>1</v></c></row>`, maxValues/1000+1)
	for name, c := range map[string]struct {
		b    []byte
		o    Options
		code string
	}{
		"one text":         {byHand(t, sheetOf(`<row><c><v>`+zeros+`</v></c></row>`)), Options{}, "cell_too_long"},
		"one text, pieces": {byHand(t, sheetOf(`<row><c><v>`+strings.Repeat("0<!-- -->", 5<<20)+`</v></c></row>`)), Options{}, "cell_too_long"},
		"one name":         {byHand(t, "<"+zeros), Options{}, "cell_too_long"},
		"one comment":      {byHand(t, "<!--"+zeros), Options{}, "cell_too_long"},
		"depth":            {byHand(t, strings.Repeat("<a>", 1<<20)), Options{}, "too_deep"},
		"much":             {byHand(t, sheetOf(strings.Repeat(`<row></row>`, 1<<20))), Options{MaxBytes: 4 << 20}, "file_too_large"},
		"wide rows":        {byHand(t, sheetOf(wide)), Options{}, "too_many"},
	} {
		t.Run(name, func(t *testing.T) {
			var before, after runtime.MemStats
			runtime.ReadMemStats(&before)
			_, err := decodeBytes(t.Context(), c.b, c.o)
			runtime.ReadMemStats(&after)
			var e *formats.Error
			if !errors.As(err, &e) || e.Code != c.code {
				t.Errorf("error %v, want %s", err, c.code)
			}
			if grown := after.TotalAlloc - before.TotalAlloc; grown > 512<<20 {
				t.Errorf("%d bytes were allocated", grown)
			}
		})
	}
	// The size that the archive promises is not believed.
	b := byHand(t, sheetOf(`<row>`+cell("a")+`</row>`))
	for i := 0; i+30 < len(b); i++ {
		if bytes.HasPrefix(b[i:], []byte("PK\x01\x02")) {
			binary.LittleEndian.PutUint32(b[i+24:], 0xfffffff0)
		}
	}
	var before, after runtime.MemStats
	runtime.ReadMemStats(&before)
	_, err := decodeBytes(t.Context(), b, Options{})
	runtime.ReadMemStats(&after)
	if grown := after.TotalAlloc - before.TotalAlloc; err == nil || grown > 8<<20 {
		t.Errorf("%v, %d bytes were allocated", err, grown)
	}
}

func TestProgressAndCancel(t *testing.T) {
	b := long(t, 30_000)
	var seen []int64
	mustDecode(t, b, Options{Progress: func(n int64) { seen = append(seen, n) }})
	if len(seen) < 3 {
		t.Errorf("progress %v", seen)
	}
	for i := 1; i < len(seen); i++ {
		if seen[i] <= seen[i-1] {
			t.Errorf("progress %v", seen)
		}
	}
	ctx, cancel := context.WithCancel(t.Context())
	if _, err := decodeBytes(ctx, b, Options{Progress: func(int64) { cancel() }}); !errors.Is(err, context.Canceled) {
		t.Errorf("error %v", err)
	}
	if _, err := decodeBytes(ctx, b, Options{}); !errors.Is(err, context.Canceled) {
		t.Errorf("error %v", err)
	}
}

// stored zips one part without packing, with a right checksum, so that a fuzzer reaches the XML.
func stored(t testing.TB, shared, styles, sheet []byte) []byte {
	t.Helper()
	var buf bytes.Buffer
	z := zip.NewWriter(&buf)
	for _, p := range []struct {
		name    string
		content []byte
	}{
		{"_rels/.rels", []byte(rootRels)}, {"xl/workbook.xml", []byte(bookXML)}, {"xl/_rels/workbook.xml.rels", []byte(bookRels)},
		{"xl/sharedStrings.xml", shared}, {"xl/styles.xml", styles}, {"xl/worksheets/sheet1.xml", sheet},
	} {
		h := &zip.FileHeader{Name: p.name, Method: zip.Store, CRC32: crc32.ChecksumIEEE(p.content), CompressedSize64: uint64(len(p.content)), UncompressedSize64: uint64(len(p.content))}
		w, err := z.CreateRaw(h)
		if err != nil {
			t.Fatal(err)
		}
		if _, err := w.Write(p.content); err != nil {
			t.Fatal(err)
		}
	}
	if err := z.Close(); err != nil {
		t.Fatal(err)
	}
	return buf.Bytes()
}

// check decodes what may be broken and looks at what must hold of any answer.
func check(t *testing.T, b []byte) {
	t.Helper()
	r, err := decodeBytes(t.Context(), b, Options{MaxRows: 1000, MaxColumns: 50, MaxBytes: 4 << 20})
	if err != nil {
		var e *formats.Error
		if !errors.As(err, &e) || e.Code == "" || e.What == "" || e.Do == "" {
			t.Fatal(err)
		}
		return
	}
	if r.Ledger.Read != len(r.Layer.Features) || len(r.Layer.Columns) == 0 {
		t.Fatalf("%d rows, %d features, %d columns", r.Ledger.Read, len(r.Layer.Features), len(r.Layer.Columns))
	}
	seen := map[string]bool{}
	for _, c := range r.Layer.Columns {
		if c.Name == "" || seen[c.Name] {
			t.Fatalf("columns %q", names(r.Layer))
		}
		seen[c.Name] = true
	}
	for j := range r.Layer.Columns {
		kind := geo.Null
		for _, f := range r.Layer.Features {
			if len(f.Values) != len(r.Layer.Columns) {
				t.Fatalf("%d values, %d columns", len(f.Values), len(r.Layer.Columns))
			}
			if k := f.Values[j].Kind; k != geo.Null {
				if kind != geo.Null && k != kind {
					t.Fatalf("column %d is of several kinds", j)
				}
				kind = k
			}
		}
	}
	for _, n := range r.Notices {
		if _, ok := notices[n.Code]; !ok {
			t.Fatalf("notice %+v", n)
		}
	}
}

func FuzzSheet(f *testing.F) {
	for _, rows := range []string{
		`<row r="2">` + cell("a") + `<c r="B2" t="s"><v>2</v></c></row><row><c s="1"><v>45351</v></c><c t="b"><v>1</v></c><c t="e"><v>#N/A</v></c><c t="str"><f>x</f><v>y</v></c></row>`,
		`<row>` + cell("a") + `</row><row><c><f>1</f></c><c s="5"><v>1.5</v></c><c t="d"><v>2020-01-01</v></c></row></sheetData><mergeCells><mergeCell ref="A1:B1"/></mergeCells><sheetData>`,
	} {
		f.Add([]byte(shared), []byte(styles), []byte(sheetOf(rows)))
	}
	f.Fuzz(func(t *testing.T, shared, styles, sheet []byte) { check(t, stored(t, shared, styles, sheet)) })
}

func FuzzDecode(f *testing.F) {
	f.Add(byHand(f, sheetOf(`<row>`+cell("a")+`</row><row><c><v>1</v></c></row>`)))
	f.Add(stored(f, []byte(shared), []byte(styles), []byte(sheetOf(`<row>`+cell("a")+`</row>`))))
	f.Fuzz(check)
}

func BenchmarkDecode(b *testing.B) {
	for _, n := range []int{1_000, 10_000, 100_000} {
		book := long(b, n)
		b.Run(strconv.Itoa(n), func(b *testing.B) {
			b.SetBytes(int64(len(book)))
			b.ReportAllocs()
			for b.Loop() {
				if _, err := decodeBytes(b.Context(), book, Options{}); err != nil {
					b.Fatal(err)
				}
			}
		})
	}
}
