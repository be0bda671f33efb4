package csvtable

import (
	"context"
	"errors"
	"io"
	"reflect"
	"strconv"
	"strings"
	"testing"
	"testing/iotest"

	"groundtally/geo"
)

var ctx = context.Background()

// show writes a layer as "name: values | name: values".
func show(l *geo.Layer) string {
	var cols []string
	for j, c := range l.Columns {
		var v []string
		for _, f := range l.Features {
			switch x := f.Values[j]; x.Kind {
			case geo.Text:
				v = append(v, strconv.Quote(x.Text))
			case geo.Null:
				v = append(v, "null")
			default:
				v = append(v, x.String())
			}
		}
		cols = append(cols, c.Name+": "+strings.Join(v, " "))
	}
	return strings.Join(cols, " | ")
}

func TestRead(t *testing.T) {
	for name, c := range map[string]struct {
		in    string
		o     Options
		want  string
		comma byte
		dec   Decimal
	}{
		"plain":                {"a,b\n1,x\n2.5,y\n", Options{}, `a: 1 2.5 | b: "x" "y"`, ',', Point},
		"no last newline":      {"a,b\n1,x", Options{}, `a: 1 | b: "x"`, ',', Point},
		"carriage returns":     {"a,b\r\n1,x\r\n\r\n2,y\r\n", Options{}, `a: 1 2 | b: "x" "y"`, ',', Point},
		"old line ends":        {"a,b\r1,x\r2,y", Options{}, `a: 1 2 | b: "x" "y"`, ',', Point},
		"byte order mark":      {"\xef\xbb\xbfa;b\n1;2\n", Options{}, `a: 1 | b: 2`, ';', Point},
		"decimal comma":        {"a;b\n1,5;x\n-0,123;y\n1234,5;\n", Options{}, `a: 1.5 -0.123 1234.5 | b: "x" "y" null`, ';', Comma},
		"quoted comma":         {"a,b\n\"1,5\",x\n\"2,25\",y\n", Options{}, `a: 1.5 2.25 | b: "x" "y"`, ',', Comma},
		"comma settled once":   {"a;b\n1,234;1,5\n", Options{}, `a: 1.234 | b: 1.5`, ';', Comma},
		"comma as told":        {"a;b\n1,234;x\n", Options{Decimal: Comma}, `a: 1.234 | b: "x"`, ';', Comma},
		"tabulators":           {"a\tb\n1,5\tx y\n", Options{}, `a: 1.5 | b: "x y"`, '\t', Comma},
		"bars":                 {"a|b\n1|2\n", Options{}, `a: 1 | b: 2`, '|', Point},
		"one column":           {"a\n1\n2\n", Options{}, `a: 1 2`, ',', Point},
		"named delimiter":      {"sep=;\na;b\n1;2\n", Options{}, `a: 1 | b: 2`, ';', Point},
		"delimiter as told":    {"a;b,c\n1;2,3\n", Options{Delimiter: ','}, `a;b: "1;2" | c: 3`, ',', Point},
		"quotes":               {"a,b\n\"x\n\"\"y\"\" , z\",1\n\"\",2\n", Options{}, `a: "x\n\"y\" , z" null | b: 1 2`, ',', Point},
		"line breaks in names": {"\"a\nb\",c\n1,2\n", Options{}, `a b: 1 | c: 2`, ',', Point},
		"leading zeros":        {"a,b\n007,1\n12,2\n", Options{}, `a: "007" "12" | b: 1 2`, ',', Point},
		"zero itself":          {"a,b,c\n0,0.5,-0.25\n0,0,00\n", Options{}, `a: 0 0 | b: 0.5 0 | c: "-0.25" "00"`, ',', Point},
		"exponents":            {"a,b\n1e3,.5\n2E-2,+7\n", Options{}, `a: 1000 0.02 | b: 0.5 7`, ',', Point},
		"long numbers":         {"a,b\n12345678901234567890,1\n", Options{}, `a: "12345678901234567890" | b: 1`, ',', Point},
		"truth":                {"a,b\ntrue,TRUE\nFalse,1\n", Options{}, `a: true false | b: "TRUE" "1"`, ',', Point},
		"no numbers":           {"a,b,c\nNaN,1e999,Inf\n", Options{}, `a: "NaN" | b: "1e999" | c: "Inf"`, ',', Point},
		"dates and versions":   {"a,b,c\n2026-05-03,1.2.3,12:30\n", Options{}, `a: "2026-05-03" | b: "1.2.3" | c: "12:30"`, ',', Point},
		"as text":              {"a,b\n\"1,234\",2\n", Options{Text: []string{"A"}}, `a: "1,234" | b: 2`, ',', Point},
		"no header":            {"1,x\n2,y\n", Options{NoHeader: true}, `column 1: 1 2 | column 2: "x" "y"`, ',', Point},
		"names":                {"a,,a,a\n1,2,3,4\n", Options{}, `a: 1 | column 2: 2 | a (2): 3 | a (3): 4`, ',', Point},
		"empty cells behind":   {"a,b\n1,2,,\n", Options{}, `a: 1 | b: 2`, ',', Point},
		"header only":          {"a,b\n", Options{}, `a:  | b: `, ',', Point},
		"other encoding":       {"a,b\nGr\xfc\xdfe,\x80\n", Options{Encoding: Windows1252}, `a: "Grüße" | b: "€"`, ',', Point},
		"three-digit points":   {"a,b\n1.234,x\n", Options{}, `a: 1.234 | b: "x"`, ',', Point},
	} {
		t.Run(name, func(t *testing.T) {
			for how, r := range map[string]io.Reader{"whole": strings.NewReader(c.in), "by bytes": iotest.OneByteReader(strings.NewReader(c.in))} {
				got, err := Decode(ctx, r, c.o)
				if err != nil {
					t.Fatalf("%s: %v", how, err)
				}
				if s := show(got.Layer); s != c.want || got.Delimiter != c.comma || got.Decimal != c.dec {
					t.Errorf("%s:\n got %s (%q, %d)\nwant %s (%q, %d)", how, s, got.Delimiter, got.Decimal, c.want, c.comma, c.dec)
				}
			}
		})
	}
}

func TestRefused(t *testing.T) {
	for name, c := range map[string]struct {
		in   string
		o    Options
		code string
		line int
		col  string
	}{
		"empty":                 {"", Options{}, "empty_file", 0, ""},
		"only lines":            {"\n \n\n", Options{}, "empty_file", 0, ""},
		"thousands":             {"a,b\n1.5,12\n2.5,\"550,950\"\n", Options{}, "thousands", 3, "b"},
		"thousands twice":       {"a;b\n12;x\n1,234,567;y\n", Options{}, "thousands", 3, "a"},
		"thousands with points": {"a;b\n1,5;x\n2;y\n\n1.234;z\n", Options{}, "thousands", 5, "a"},
		"thousands, both":       {"a;b\n1.234,56;x\n", Options{}, "thousands", 2, "a"},
		"thousands by spaces":   {"a;b\n1 234;x\n", Options{}, "thousands", 2, "a"},
		"narrow spaces":         {"a;b\n1\u202f234,5;x\n", Options{}, "thousands", 2, "a"},
		"apostrophes":           {"a;b\n1'234;x\n", Options{}, "thousands", 2, "a"},
		"unclear":               {"a;b\n1,234;x\n", Options{}, "decimal_unclear", 2, "a"},
		"mixed":                 {"a;b\n1,5;2.5\n", Options{}, "decimal_mixed", 2, "a"},
		"comma, not as told":    {"a;b\n1,5;2\n", Options{Decimal: Point}, "decimal_mixed", 2, "a"},
		"point, not as told":    {"a;b\n1.5;2\n", Options{Decimal: Comma}, "decimal_mixed", 2, "a"},
		"thousands as told":     {"a;b\n1,234;2\n", Options{Decimal: Point}, "thousands", 2, "a"},
		"too few cells":         {"a,b\n1,2\n3\n", Options{}, "cells", 3, ""},
		"too many cells":        {"a,b\n1,2\n3,4,5\n", Options{}, "cells", 3, ""},
		"row after a long cell": {"a,b\n\"x\n\ny\",2\n3\n", Options{}, "cells", 5, ""},
		"open quote":            {"a,b\n1,\"x\n2,y\n", Options{}, "quote_open", 2, ""},
		"stray quote":           {"a,b\n1,x\"y\n", Options{}, "quote_stray", 2, ""},
		"behind a quote":        {"a,b\n1,\"x\"y\n", Options{}, "quote_stray", 2, ""},
		"not UTF-8":             {"a,b\n1,x\n2,Gr\xfc\xdfe\n", Options{}, "not_utf8", 3, ""},
		"UTF-16":                {"\xff\xfea\x00", Options{}, "not_utf8", 0, ""},
		"zero byte":             {"a,b\n1,\x00\n", Options{}, "not_text", 2, ""},
		"workbook":              {"PK\x03\x04....", Options{}, "not_text", 0, ""},
		"no header":             {"9,48\n10,49\n", Options{}, "header_missing", 1, ""},
		"delimiter unclear":     {"a,b;c\n1,2;3\n", Options{}, "delimiter", 1, ""},
		"long cell":             {"a\n" + strings.Repeat("x", maxCell+1), Options{}, "cell_too_long", 2, ""},
		"rows":                  {"a\n1\n2\n", Options{MaxRows: 1}, "too_many", 3, ""},
		"columns":               {"a,b\n1,2\n", Options{MaxColumns: 1}, "too_many", 1, ""},
		"bytes":                 {"a,b\n1,2\n", Options{MaxBytes: 7}, "file_too_large", 2, ""},
		"no such column":        {"lon,lat\n9,48\n", Options{X: "lon", Y: "breite"}, "column_unknown", 0, "breite"},
		"only one named":        {"lon,lat\n9,48\n", Options{X: "lon"}, "column_unknown", 0, ""},
		"bad coordinate":        {"lon,lat\n9,48\n9,north\n", Options{X: "lon", Y: "lat"}, "bad_coordinate", 3, "lat"},
		"half a position":       {"lon,lat\n9,48\n9,\n", Options{X: "lon", Y: "lat"}, "bad_coordinate", 3, "lat"},
		"NaN coordinate":        {"lon,lat\n9,NaN\n", Options{X: "lon", Y: "lat"}, "bad_coordinate", 2, "lat"},
	} {
		t.Run(name, func(t *testing.T) {
			c.o.File = "t.csv"
			_, err := Decode(ctx, strings.NewReader(c.in), c.o)
			var e *Error
			if !errors.As(err, &e) || e.Code != c.code || e.Line != c.line || e.Column != c.col || e.File != "t.csv" || e.Do == "" || !strings.HasPrefix(err.Error(), "t.csv: ") {
				t.Errorf("error %v: %+v", err, e)
			}
		})
	}
}

func TestPoints(t *testing.T) {
	in := "name;Lon;Lat\nA;9,5;48\nB;;\nC;-27,01;47,51\n"
	r, err := Decode(ctx, strings.NewReader(in), Options{X: "lon", Y: "lat", File: "t.csv"})
	if err != nil {
		t.Fatal(err)
	}
	var got []geo.LonLat
	for _, f := range r.Layer.Features {
		f.Geometry.Each(func(p geo.LonLat) { got = append(got, p) })
	}
	if want := []geo.LonLat{{Lon: 9.5, Lat: 48}, {Lon: -27.01, Lat: 47.51}}; !reflect.DeepEqual(got, want) || r.Layer.Features[1].Geometry.Kind != geo.NoGeometry {
		t.Errorf("%+v", r.Layer.Features)
	}
	if r.Ledger != (Ledger{Read: 3, NoGeometry: 1}) || len(r.Notices) != 1 || r.Notices[0].Code != "geometry_missing" {
		t.Errorf("%+v %+v", r.Ledger, r.Notices)
	}
	if want := []Pair{{"Lon", "Lat", true}}; !reflect.DeepEqual(r.Positions, want) {
		t.Errorf("%+v", r.Positions)
	}
	r, err = Decode(ctx, strings.NewReader("Easting,Northing,x,y\n1,2,3,4\n"), Options{})
	if want := []Pair{{"Easting", "Northing", false}, {"x", "y", false}}; err != nil || !reflect.DeepEqual(r.Positions, want) || r.Layer.Features[0].Geometry.Kind != geo.NoGeometry {
		t.Errorf("%+v, %v", r, err)
	}
}

func TestNotices(t *testing.T) {
	r, err := Decode(ctx, strings.NewReader("id,n,a,a,m\n01,12345678901234567890,1,1,1\n02,1,1,1,n/a\n03,1,1,1,3\n"), Options{File: "t.csv"})
	if err != nil {
		t.Fatal(err)
	}
	var got []string
	for _, n := range r.Notices {
		got = append(got, n.Code+" "+n.Field+" "+strconv.Itoa(n.Line)+" "+n.Args["count"])
		if n.File != "t.csv" {
			t.Errorf("%+v", n)
		}
	}
	want := []string{"column_repeated a (2) 1 ", "leading_zeros id 2 3", "number_as_text n 2 1", "column_not_numbers m 3 1"}
	if !reflect.DeepEqual(got, want) {
		t.Errorf("%q", got)
	}
	if r, err = Decode(ctx, strings.NewReader("a\n"), Options{}); err != nil || len(r.Notices) != 1 || r.Notices[0].Code != "layer_empty" {
		t.Errorf("%+v, %v", r.Notices, err)
	}
}

func TestForms(t *testing.T) {
	for s, want := range map[string]form{
		"": emptyCell, " ": emptyCell, "1": wholeForm, "-1": wholeForm, "+1": wholeForm, "--1": notNumber, "-": notNumber, "1-2": notNumber,
		"1.5": pointForm, ".5": pointForm, "5.": notNumber, "1e5": pointForm, "1.5e-5": pointForm, "1e": notNumber, "e5": notNumber, "1e5.5": notNumber,
		"1,5": commaForm, "0,123": commaForm, "1234,567": commaForm, ",5": commaForm, "1,23456": commaForm, "1,5e3": commaForm,
		"1,234": commaOrGroups, "123,456": commaOrGroups, "1.234": pointOrGroups, "0.123": pointForm, "1234.567": pointForm, "1.234e5": pointForm,
		"1,234,567": groupsForm, "1.234.567": groupsForm, "1,234.5": groupsForm, "1.234,5": groupsForm, "1 234": groupsForm, "1\u00a0234,50": groupsForm, "1'234'567.8": groupsForm,
		"1,23,456": notNumber, "1234,567,890": notNumber, "12 34": notNumber, "1.2.3": notNumber, "1,,2": notNumber, "1:30": notNumber, "2026-05-03": notNumber,
		"007": zerosForm, "00": zerosForm, "0": wholeForm, "-07": zerosForm, "01.5": zerosForm, "9007199254740993000": longForm, "9007199254740992": wholeForm, "9007199254740993": longForm,
		"true": boolForm, "FALSE": boolForm, "0x10": notNumber, "1_000": notNumber, "NaN": notNumber, "inf": notNumber, "1e999": notNumber, "١": notNumber,
	} {
		if got := formOf(s); got != want {
			t.Errorf("%q: %d, want %d", s, got, want)
		}
	}
}

func TestReaderFailsAndCancel(t *testing.T) {
	broken := errors.New("pulled out")
	var e *Error
	_, err := Decode(ctx, io.MultiReader(strings.NewReader("a,b\n1,2\n"), iotest.ErrReader(broken)), Options{})
	if !errors.Is(err, broken) || !errors.As(err, &e) || e.Code != "unreadable" {
		t.Errorf("error %v", err)
	}
	stop, cancel := context.WithCancel(ctx)
	defer cancel()
	seen := int64(0)
	_, err = Decode(stop, strings.NewReader("a,b\n"+strings.Repeat("1,2\n", 1<<20)), Options{Progress: func(n int64) {
		if seen = n; n > 2<<20 {
			cancel()
		}
	}})
	if !errors.Is(err, context.Canceled) || seen > 4<<20 {
		t.Errorf("%v after %d bytes", err, seen)
	}
}

func FuzzDecode(f *testing.F) {
	for _, s := range []string{"a,b\n1,2\n", "a;b\n\"1,5\n\";\"\"\"\"\n", "sep=;\r\na;b", "\xef\xbb\xbflon\tlat\n9\t48", "a\n1.234,5"} {
		f.Add([]byte(s))
	}
	f.Fuzz(func(t *testing.T, b []byte) {
		r, err := Decode(ctx, strings.NewReader(string(b)), Options{})
		again, err2 := Decode(ctx, iotest.OneByteReader(strings.NewReader(string(b))), Options{})
		if (err == nil) != (err2 == nil) || !reflect.DeepEqual(r, again) {
			t.Fatalf("byte by byte it reads otherwise: %v, %v", err, err2)
		}
		if err != nil {
			return
		}
		for _, ft := range r.Layer.Features {
			if len(ft.Values) != len(r.Layer.Columns) {
				t.Fatalf("%+v", ft)
			}
		}
	})
}

func BenchmarkDecode(b *testing.B) {
	var s strings.Builder
	s.WriteString("name,lon,lat,height\n")
	for i := range 20_000 {
		s.WriteString("house " + strconv.Itoa(i) + ",9." + strconv.Itoa(i) + ",48." + strconv.Itoa(i) + ",7.5\n")
	}
	b.SetBytes(int64(s.Len()))
	b.ReportAllocs()
	for b.Loop() {
		if _, err := Decode(ctx, strings.NewReader(s.String()), Options{X: "lon", Y: "lat"}); err != nil {
			b.Fatal(err)
		}
	}
}
