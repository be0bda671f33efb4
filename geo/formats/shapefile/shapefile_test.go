package shapefile

import (
	"bytes"
	"context"
	"encoding/binary"
	"errors"
	"fmt"
	"io"
	"math"
	"math/rand/v2"
	"reflect"
	"runtime"
	"strconv"
	"strings"
	"testing"

	"groundtally/geo"
	"groundtally/geo/formats"
)

func be(b []byte) int32 { return int32(binary.BigEndian.Uint32(b)) }
func le(b []byte) int32 { return int32(binary.LittleEndian.Uint32(b)) }

func putBE(b []byte, v int) { binary.BigEndian.PutUint32(b, uint32(int32(v))) }
func putLE(b []byte, v int) { binary.LittleEndian.PutUint32(b, uint32(int32(v))) }

// ints and floats append numbers as they stand in shapes.
func ints(b []byte, n ...int) []byte {
	for _, v := range n {
		b = binary.LittleEndian.AppendUint32(b, uint32(int32(v)))
	}
	return b
}

func floats(b []byte, n ...float64) []byte {
	for _, v := range n {
		b = binary.LittleEndian.AppendUint64(b, math.Float64bits(v))
	}
	return b
}

// shapeOf makes the content of a record of lines or polygons; each part is a list of x and y.
func shapeOf(typ int, parts ...[]float64) []byte {
	positions := 0
	for _, p := range parts {
		positions += len(p) / 2
	}
	b := floats(ints(nil, typ), 0, 0, 0, 0)
	b = ints(b, len(parts), positions)
	at := 0
	for _, p := range parts {
		b = ints(b, at)
		at += len(p) / 2
	}
	for _, p := range parts {
		b = floats(b, p...)
	}
	return b
}

func pointAt(x, y float64) []byte { return floats(ints(nil, 1), x, y) }

// build makes a .shp with its .shx of the contents of records.
func build(typ int, contents ...[]byte) files {
	head := make([]byte, 100)
	putBE(head, 9994)
	putLE(head[28:], 1000)
	putLE(head[32:], typ)
	f := files{shp: bytes.Clone(head), shx: bytes.Clone(head)}
	for i, c := range contents {
		f.shx = binary.BigEndian.AppendUint32(f.shx, uint32(len(f.shp)/2))
		f.shx = binary.BigEndian.AppendUint32(f.shx, uint32(len(c)/2))
		f.shp = binary.BigEndian.AppendUint32(f.shp, uint32(i+1))
		f.shp = binary.BigEndian.AppendUint32(f.shp, uint32(len(c)/2))
		f.shp = append(f.shp, c...)
	}
	putBE(f.shp[24:], len(f.shp)/2)
	putBE(f.shx[24:], len(f.shx)/2)
	return f
}

// tableOf makes a .dbf. A column is its name, its type and its width, as "NAME:C:10"; a row is its mark of
// deletion and its cells.
func tableOf(language byte, columns []string, rows ...[]string) []byte {
	b := make([]byte, 32)
	b[0], b[29] = 3, language
	width := 1
	var widths []int
	for _, c := range columns {
		part := strings.Split(c, ":")
		n, err := strconv.Atoi(part[2])
		if err != nil {
			panic(err)
		}
		f := make([]byte, 32)
		copy(f[:11], part[0])
		f[11], f[16] = part[1][0], byte(n)
		b = append(b, f...)
		width += n
		widths = append(widths, n)
	}
	b = append(b, '\r')
	putLE(b[4:], len(rows))
	binary.LittleEndian.PutUint16(b[8:], uint16(len(b)))
	binary.LittleEndian.PutUint16(b[10:], uint16(width))
	for _, r := range rows {
		b = append(b, r[0]...)
		for j, w := range widths {
			b = append(b, r[j+1]...)
			b = append(b, strings.Repeat(" ", w-len(r[j+1]))...)
		}
	}
	return append(b, 0x1a)
}

func counts(r Result) map[string]int {
	m := map[string]int{}
	for _, n := range r.Notices {
		c, err := strconv.Atoi(n.Args["count"])
		if err != nil {
			panic(err)
		}
		m[n.Code] += c
	}
	return m
}

func wantNotices(t *testing.T, r Result, want map[string]int) {
	t.Helper()
	if got := counts(r); !reflect.DeepEqual(got, want) {
		t.Errorf("notices %v, want %v", got, want)
	}
	for _, n := range r.Notices {
		if _, ok := notices[n.Code]; !ok {
			t.Errorf("the severity of %s is not told", n.Code)
		}
	}
}

func wantError(t *testing.T, err error, code, where string) {
	t.Helper()
	var e *formats.Error
	if !errors.As(err, &e) || e.Code != code || e.Where != where || e.Do == "" || e.What == "" {
		t.Errorf("%v (%+v), want code %s at %q", err, e, code, where)
	}
}

const noTable = "attributes_missing"

func TestMissingParts(t *testing.T) {
	whole := fixture(t, "points")
	want := decode(t, whole, Options{})

	f := whole
	f.shx = nil
	if got := decode(t, f, Options{}); !reflect.DeepEqual(got, want) {
		t.Errorf("without .shx: %+v, want %+v", got, want)
	}
	f = whole
	f.prj = nil
	if got := decode(t, f, Options{}); got.CRS != "" || !reflect.DeepEqual(got.Layer, want.Layer) {
		t.Errorf("without .prj: %+v", got)
	}
	f = files{shp: whole.shp}
	got := decode(t, f, Options{File: "x.shp"})
	if len(got.Layer.Columns) != 0 || got.Encoding != "" || len(got.Layer.Features) != 4 {
		t.Errorf("without .dbf: %+v", got)
	}
	for i, ft := range got.Layer.Features {
		if ft.ID != strconv.Itoa(i+1) || len(ft.Values) != 0 || !reflect.DeepEqual(ft.Geometry, want.Layer.Features[i].Geometry) {
			t.Errorf("without .dbf: feature %+v", ft)
		}
	}
	wantNotices(t, got, map[string]int{noTable: 1, "geometry_missing": 1})
	if n := got.Notices[1]; n.File != "x.shp" || n.Feature != "3" || n.Args["features"] != "3" || n.Severity != geo.Warning {
		t.Errorf("notice %+v", n)
	}
	_, err := Decode(t.Context(), Set{DBF: part(whole.dbf)}, Options{File: "x.dbf"})
	wantError(t, err, "shp_missing", "")
}

func TestEdited(t *testing.T) {
	f := fixture(t, "edited")
	r := decode(t, f, Options{})
	if want := (Ledger{Read: 3, LeftOut: 1}); r.Ledger != want {
		t.Errorf("ledger %+v, want %+v", r.Ledger, want)
	}
	wantNotices(t, r, map[string]int{"record_deleted": 1})
	// Without the index the record that was replaced cannot be told from the others.
	f.shx = nil
	r = decode(t, f, Options{})
	if r.Ledger.Read != 4 {
		t.Errorf("ledger %+v", r.Ledger)
	}
	wantNotices(t, r, map[string]int{"record_deleted": 1, "rows_disagree": 1})
}

func square(x, y, size float64) []float64 {
	return []float64{x, y, x, y + size, x + size, y + size, x + size, y, x, y}
}

// The index leads; where it cannot be the file's own, the records do.
func TestIndex(t *testing.T) {
	a, b, c := pointAt(1, 1), pointAt(2, 2), pointAt(3, 3)
	xs := func(r Result) string {
		s := ""
		for _, f := range r.Layer.Features {
			f.Geometry.Each(func(p geo.LonLat) { s += fmt.Sprint(p.Lon, " ") })
		}
		return strings.TrimSpace(s)
	}
	entry := func(f files, i int) []byte { return f.shx[100+8*i:] }
	for name, c := range map[string]struct {
		change func(f *files)
		want   string
		broken bool // the index is passed over
	}{
		"as it is":       {func(f *files) {}, "1 2 3", false},
		"another order":  {func(f *files) { putBE(entry(*f, 0), 50+28); putBE(entry(*f, 2), 50) }, "3 2 1", false},
		"no header":      {func(f *files) { f.shx = f.shx[:60] }, "1 2 3", true},
		"another magic":  {func(f *files) { f.shx[3]++ }, "1 2 3", true},
		"cut":            {func(f *files) { f.shx = f.shx[:len(f.shx)-3] }, "1 2 3", true},
		"half entries":   {func(f *files) { f.shx = append(f.shx, 1, 2); putBE(f.shx[24:], len(f.shx)/2) }, "1 2 3", true},
		"one short":      {func(f *files) { f.shx = f.shx[:len(f.shx)-8]; putBE(f.shx[24:], len(f.shx)/2) }, "1 2 3", true},
		"outside":        {func(f *files) { putBE(entry(*f, 1), 5000) }, "1 2 3", true},
		"in the header":  {func(f *files) { putBE(entry(*f, 1), 10) }, "1 2 3", true},
		"negative":       {func(f *files) { putBE(entry(*f, 1)[4:], -10) }, "1 2 3", true},
		"twice the same": {func(f *files) { copy(entry(*f, 1)[:8], entry(*f, 0)[:8]) }, "1 2 3", true},
		"beside":         {func(f *files) { putBE(entry(*f, 1), 50+14+1); putBE(entry(*f, 1)[4:], 9) }, "1 2 3", true},
		"no entry":       {func(f *files) { f.shx = f.shx[:100]; putBE(f.shx[24:], 50) }, "1 2 3", true},
	} {
		t.Run(name, func(t *testing.T) {
			f := build(1, a, b, pointAt(3, 3))
			c.change(&f)
			r := decode(t, f, Options{})
			want := map[string]int{noTable: 1}
			if c.broken {
				want["index_broken"] = 1
			}
			wantNotices(t, r, want)
			if got := xs(r); got != c.want {
				t.Errorf("read %s, want %s", got, c.want)
			}
			if r.Ledger != (Ledger{Read: 3}) {
				t.Errorf("ledger %+v", r.Ledger)
			}
		})
	}

	// A gap with rubbish, over which only the index leads.
	f := build(1, a, b, c)
	at := 100 + 28
	f.shp = append(append(bytes.Clone(f.shp[:at]), "rubbish."...), f.shp[at:]...)
	putBE(f.shp[24:], len(f.shp)/2)
	putBE(entry(f, 1), (at+8)/2)
	putBE(entry(f, 2), (at+8+28)/2)
	r := decode(t, f, Options{})
	if got := xs(r); got != "1 2 3" {
		t.Errorf("read %s over a gap", got)
	}
	wantNotices(t, r, map[string]int{noTable: 1})

	// One record with a broken length; the index leads past it. Without the index it cannot be passed.
	f = build(1, a, b, c)
	putBE(f.shp[at+4:], 5000)
	r = decode(t, f, Options{})
	if got := xs(r); got != "1 3" || r.Layer.Features[1].ID != "3" || r.Ledger != (Ledger{Read: 2, LeftOut: 1}) {
		t.Errorf("read %s, ledger %+v", got, r.Ledger)
	}
	wantNotices(t, r, map[string]int{noTable: 1, "record_left_out": 1})
	f.shx = nil
	_, err := Decode(t.Context(), f.set(), Options{})
	wantError(t, err, "bad_length", "feature 2")
	putBE(f.shp[at+4:], -10)
	_, err = Decode(t.Context(), f.set(), Options{})
	wantError(t, err, "bad_length", "feature 2")
}

// The header's length is compared with the file's.
func TestLengthOfFile(t *testing.T) {
	f := build(1, pointAt(1, 1), pointAt(2, 2))
	shx := f.shx
	f.shx = nil
	said := func(n int) { putBE(f.shp[24:], n/2) }
	for _, n := range []int{0, 100, 128, 140, len(f.shp) - 2} {
		said(n)
		r := decode(t, f, Options{})
		if r.Ledger.Read != 2 {
			t.Errorf("header says %d: ledger %+v", n, r.Ledger)
		}
		wantNotices(t, r, map[string]int{noTable: 1, "length_disagrees": 1})
	}
	said(len(f.shp) + 28)
	_, err := Decode(t.Context(), f.set(), Options{})
	wantError(t, err, "truncated", "feature 3")
	f.shx = shx // knows that there is no third
	wantNotices(t, decode(t, f, Options{}), map[string]int{noTable: 1, "length_disagrees": 1})

	for _, fill := range []int{1, 8, 500} {
		for _, index := range [][]byte{nil, shx} {
			f = build(1, pointAt(1, 1), pointAt(2, 2))
			f.shx = index
			f.shp = append(f.shp, make([]byte, fill)...)
			r := decode(t, f, Options{})
			if r.Ledger.Read != 2 {
				t.Errorf("%d zeros behind the end: ledger %+v", fill, r.Ledger)
			}
			wantNotices(t, r, map[string]int{noTable: 1, "length_disagrees": 1})
		}
	}
}

// Single records are broken; the others are read.
func TestBrokenRecords(t *testing.T) {
	good := shapeOf(5, square(0, 0, 1))
	change := func(f func(b []byte)) []byte {
		b := shapeOf(5, square(0, 0, 10), square(2, 2, 1))
		f(b)
		return b
	}
	for name, bad := range map[string][]byte{
		"nothing":             {},
		"no type":             {5, 0},
		"unknown type":        change(func(b []byte) { putLE(b, 7) }),
		"multipatch":          change(func(b []byte) { putLE(b, 31) }),
		"a line":              shapeOf(3, square(0, 0, 1)),
		"a point":             pointAt(1, 2),
		"no counts":           ints(nil, 5, 0, 0, 0),
		"negative parts":      change(func(b []byte) { putLE(b[36:], -1) }),
		"negative positions":  change(func(b []byte) { putLE(b[40:], -1) }),
		"many parts":          change(func(b []byte) { putLE(b[36:], math.MaxInt32) }),
		"many positions":      change(func(b []byte) { putLE(b[40:], math.MaxInt32) }),
		"one position more":   change(func(b []byte) { putLE(b[40:], 11) }),
		"one part more":       change(func(b []byte) { putLE(b[36:], 3) }),
		"parts out of order":  change(func(b []byte) { putLE(b[44:], 5); putLE(b[48:], 0) }),
		"first part later":    change(func(b []byte) { putLE(b[44:], 1) }),
		"negative part":       change(func(b []byte) { putLE(b[48:], -5) }),
		"part beyond the end": change(func(b []byte) { putLE(b[48:], 11) }),
		"no part":             change(func(b []byte) { putLE(b[36:], 0) }),
		"not a number":        change(func(b []byte) { floats(b[52:52], math.NaN()) }),
		"infinite":            change(func(b []byte) { floats(b[60:60], math.Inf(-1)) }),
		"no data":             change(func(b []byte) { floats(b[60:60], -1e39) }),
	} {
		t.Run(name, func(t *testing.T) {
			for _, index := range []bool{true, false} {
				f := build(5, good, bad, good)
				f.dbf = tableOf(0, []string{"N:C:1"}, []string{" ", "a"}, []string{" ", "b"}, []string{" ", "c"})
				if !index {
					f.shx = nil
				}
				r := decode(t, f, Options{})
				if r.Ledger != (Ledger{Read: 2, LeftOut: 1}) {
					t.Fatalf("ledger %+v", r.Ledger)
				}
				if last := r.Layer.Features[1]; last.ID != "3" || last.Values[0].Text != "c" || last.Geometry.Count() != 5 {
					t.Errorf("the third feature is %+v", last)
				}
				wantNotices(t, r, map[string]int{"record_left_out": 1})
				if n := r.Notices[0]; n.Severity != geo.Fault || n.Feature != "2" || n.Args["what"] == "" {
					t.Errorf("notice %+v", n)
				}
				// Where none can be read, nothing is taken.
				f = build(5, bad)
				_, err := Decode(t.Context(), f.set(), Options{})
				wantError(t, err, "bad_record", "feature 1")
			}
		})
	}
}

func TestRefused(t *testing.T) {
	for name, c := range map[string]struct {
		f    files
		code string
	}{
		"empty":         {files{shp: []byte{}}, "empty_file"},
		"short":         {files{shp: build(1).shp[:99]}, "truncated"},
		"something":     {files{shp: []byte("{}")}, "truncated"},
		"another magic": {files{shp: []byte(`{"type":"FeatureCollection","features":[]}`)}, "not_shapefile"},
		"multipatch":    {build(31), "multipatch"},
		"unknown type":  {build(2), "unknown_type"},
	} {
		_, err := Decode(t.Context(), c.f.set(), Options{File: "a.shp"})
		wantError(t, err, c.code, "")
		if err == nil || !strings.HasPrefix(err.Error(), "a.shp: ") {
			t.Errorf("%s: %v", name, err)
		}
	}
	r := decode(t, build(5), Options{})
	wantNotices(t, r, map[string]int{noTable: 1, "layer_empty": 1})
}

func TestRings(t *testing.T) {
	open := square(0, 0, 10)[:8]
	for name, c := range map[string]struct {
		parts  [][]float64
		shape  string // numbers of rings of the parts
		notes  map[string]int
		repair int
	}{
		"plain":                  {[][]float64{square(0, 0, 10)}, "1", nil, 0},
		"not closed":             {[][]float64{open}, "1", map[string]int{"ring_closed": 1}, 1},
		"two positions":          {[][]float64{square(0, 0, 10), {1, 1, 2, 2}}, "1", map[string]int{"part_too_short": 1}, 1},
		"three with the first":   {[][]float64{{0, 0, 1, 1, 0, 0}, square(0, 0, 10)}, "1", map[string]int{"part_too_short": 1}, 1},
		"three without":          {[][]float64{{0, 0, 1, 1, 1, 0}}, "1", map[string]int{"ring_closed": 1}, 1},
		"empty part":             {[][]float64{square(0, 0, 10), {}}, "1", map[string]int{"part_too_short": 1}, 1},
		"nothing":                {nil, "", map[string]int{"geometry_empty": 1}, 0},
		"nothing left":           {[][]float64{{1, 1, 2, 2}}, "", map[string]int{"part_too_short": 1, "geometry_empty": 1}, 1},
		"hole":                   {[][]float64{square(0, 0, 10), square(2, 2, 2)}, "2", nil, 0},
		"hole first":             {[][]float64{square(2, 2, 2), square(0, 0, 10)}, "2", nil, 0},
		"beside":                 {[][]float64{square(0, 0, 10), square(20, 0, 10)}, "1 1", nil, 0},
		"sharing an edge":        {[][]float64{square(0, 0, 10), square(10, 0, 10)}, "1 1", nil, 0},
		"hole along the edge":    {[][]float64{square(0, 0, 10), square(0, 0, 5)}, "2", nil, 0},
		"hole a little over":     {[][]float64{square(0, 0, 10), square(-0.01, 2, 5)}, "2", nil, 0},
		"hole touching all over": {[][]float64{square(0, 0, 10), {5, 0, 10, 5, 5, 10, 0, 5, 5, 0}}, "2", nil, 0},
		"island in a hole":       {[][]float64{square(4, 4, 1), square(0, 0, 10), square(2, 2, 6)}, "1 2", nil, 0},
		"hole in the island":     {[][]float64{square(0, 0, 40), square(2, 2, 30), square(4, 4, 20), square(6, 6, 10)}, "2 2", nil, 0},
		"twice the same":         {[][]float64{square(0, 0, 10), square(0, 0, 10)}, "1", map[string]int{"ring_repeated": 1}, 1},
		"thrice, turned":         {[][]float64{square(0, 0, 10), {0, 10, 10, 10, 10, 0, 0, 0, 0, 10}, square(0, 0, 10), square(2, 2, 2)}, "2", map[string]int{"ring_repeated": 2}, 1},
		"flat":                   {[][]float64{square(0, 0, 10), {1, 1, 3, 1, 2, 1, 1, 1}}, "2", nil, 0},
		"flat one alone":         {[][]float64{{1, 1, 3, 1, 2, 1, 1, 1}, {1, 5, 3, 5, 2, 5, 1, 5}}, "1 1", nil, 0},
		"hole of a hook":         {[][]float64{{0, 0, 10, 0, 10, 10, 8, 10, 8, 2, 0, 2, 0, 0}, square(2, 4, 3)}, "1 1", nil, 0},
	} {
		t.Run(name, func(t *testing.T) {
			f := build(5, shapeOf(5, c.parts...))
			r := decode(t, f, Options{})
			want := map[string]int{noTable: 1}
			for k, v := range c.notes {
				want[k] = v
			}
			wantNotices(t, r, want)
			if r.Ledger.Repaired != c.repair {
				t.Errorf("ledger %+v", r.Ledger)
			}
			g := r.Layer.Features[0].Geometry
			var shape []string
			for _, p := range g.Parts {
				shape = append(shape, strconv.Itoa(len(p)))
				for _, ring := range p {
					if len(ring) < 4 || ring[0] != ring[len(ring)-1] {
						t.Errorf("ring %v", ring)
					}
				}
			}
			if got := strings.Join(shape, " "); got != c.shape || g.Kind != geo.Polygons {
				t.Errorf("rings %s of %v, want %s", got, g, c.shape)
			}
		})
	}
}

// Nesting by the tree and the strips against the plain way, on many rings in many depths.
func TestNestAgainstPlainWay(t *testing.T) {
	r := rand.New(rand.NewPCG(1, 2))
	for round := range 30 {
		var rings [][]geo.LonLat
		var grow func(x, y, radius float64, depth int)
		grow = func(x, y, radius float64, depth int) {
			n := 8 + r.IntN(100)
			ring := make([]geo.LonLat, 0, n+1)
			for i := range n {
				d := radius * (0.9 + 0.1*r.Float64())
				s, c := math.Sincos(2 * math.Pi * float64(i) / float64(n))
				ring = append(ring, geo.LonLat{Lon: x + d*c, Lat: y + d*s})
			}
			ring = append(ring, ring[0])
			if r.IntN(2) == 0 {
				for a, b := 0, len(ring)-1; a < b; a, b = a+1, b-1 {
					ring[a], ring[b] = ring[b], ring[a]
				}
			}
			rings = append(rings, ring)
			if depth < 4 {
				for k := range 4 {
					s, c := math.Sincos(math.Pi * (0.25 + 0.5*float64(k)))
					if r.IntN(3) > 0 {
						grow(x+radius*0.45*c, y+radius*0.45*s, radius*0.25, depth+1)
					}
				}
			}
		}
		for k := range 5 {
			grow(2.6e6+300*float64(k), 1.2e6, 100, 0)
		}
		r.Shuffle(len(rings), func(i, j int) { rings[i], rings[j] = rings[j], rings[i] })
		got, repeated, err := nest(t.Context(), rings)
		if err != nil || repeated != 0 {
			t.Fatal(repeated, err)
		}
		if want := plainNest(rings); !reflect.DeepEqual(got, want) {
			t.Fatalf("round %d, %d rings: %d parts, want %d", round, len(rings), len(got), len(want))
		}
	}
}

func plainNest(rings [][]geo.LonLat) [][][]geo.LonLat {
	inside := func(p geo.LonLat, ring []geo.LonLat) bool {
		in := false
		for i := 1; i < len(ring); i++ {
			a, b := ring[i-1], ring[i]
			if (a.Lat > p.Lat) != (b.Lat > p.Lat) && p.Lon < (b.Lon-a.Lon)*(p.Lat-a.Lat)/(b.Lat-a.Lat)+a.Lon {
				in = !in
			}
		}
		return in
	}
	depth := make([]int, len(rings))
	around := make([][]int, len(rings))
	for i, r := range rings {
		for j, o := range rings {
			if i != j && inside(r[0], o) {
				depth[i]++
				around[i] = append(around[i], j)
			}
		}
	}
	part := map[int]int{}
	var out [][][]geo.LonLat
	for i, r := range rings {
		if depth[i]%2 == 0 {
			part[i] = len(out)
			out = append(out, [][]geo.LonLat{r})
		}
	}
	for i, r := range rings {
		if depth[i]%2 == 1 {
			for _, j := range around[i] {
				if depth[j] == depth[i]-1 {
					out[part[j]] = append(out[part[j]], r)
				}
			}
		}
	}
	return out
}

func TestHeightsAndMeasures(t *testing.T) {
	xy := floats(ints(nil, 0), 0, 0, 0, 0)
	multi := func(typ int, tail ...float64) []byte {
		b := ints(bytes.Clone(xy), 2)
		putLE(b, typ)
		return floats(floats(b, 1, 2, 3, 4), tail...)
	}
	line := func(typ int, tail ...float64) []byte { return floats(shapeOf(typ, []float64{1, 2, 3, 4}), tail...) }
	none := math.Inf(-1)
	for name, c := range map[string]struct {
		typ     int
		content []byte
		notes   map[string]int
	}{
		"point with height":                 {11, floats(ints(nil, 11), 1, 2, 9), map[string]int{"height_left_out": 1}},
		"point with both":                   {11, floats(ints(nil, 11), 1, 2, 9, 7), map[string]int{"height_left_out": 1, "measure_left_out": 1}},
		"point whose measure is none":       {11, floats(ints(nil, 11), 1, 2, 9, -2e38), map[string]int{"height_left_out": 1}},
		"point with measure":                {21, floats(ints(nil, 21), 1, 2, 7), map[string]int{"measure_left_out": 1}},
		"point that lacks its measure":      {21, floats(ints(nil, 21), 1, 2), nil},
		"points with height":                {18, multi(18, 0, 0, 5, 6), map[string]int{"height_left_out": 2}},
		"points with both":                  {18, multi(18, 0, 0, 5, 6, 0, 0, 1, none), map[string]int{"height_left_out": 2, "measure_left_out": 1}},
		"points with measure":               {28, multi(28, 0, 0, 1, 2), map[string]int{"measure_left_out": 2}},
		"points that lack measures":         {28, multi(28), nil},
		"line with height":                  {13, line(13, 0, 0, 5, 6), map[string]int{"height_left_out": 2}},
		"line with both":                    {13, line(13, 0, 0, 5, 6, 0, 0, none, 2), map[string]int{"height_left_out": 2, "measure_left_out": 1}},
		"line with measure":                 {23, line(23, 0, 0, 1, 2), map[string]int{"measure_left_out": 2}},
		"line that lacks measures":          {23, line(23), nil},
		"line with something more":          {3, line(3, 1), map[string]int{"record_longer": 1}},
		"line with half its measures":       {23, line(23, 0, 0, 1), map[string]int{"record_longer": 1}},
		"point in space in a file of plain": {1, floats(ints(nil, 11), 1, 2, 9), map[string]int{"height_left_out": 1}},
	} {
		t.Run(name, func(t *testing.T) {
			r := decode(t, build(c.typ, c.content), Options{})
			want := map[string]int{noTable: 1}
			for k, v := range c.notes {
				want[k] = v
			}
			wantNotices(t, r, want)
			g := r.Layer.Features[0].Geometry
			if first := g.Parts[0][0][0]; first != (geo.LonLat{Lon: 1, Lat: 2}) {
				t.Errorf("%v", g)
			}
		})
	}
	// Heights are no choice: without them the record is too short.
	for _, b := range [][]byte{floats(ints(nil, 11), 1, 2), multi(18, 0, 0, 5), line(13)} {
		_, err := Decode(t.Context(), build(int(le(b)), b).set(), Options{})
		wantError(t, err, "bad_record", "feature 1")
	}
}

func TestShortLine(t *testing.T) {
	r := decode(t, build(3, shapeOf(3, []float64{1, 2}, []float64{1, 2, 3, 4}), shapeOf(3, []float64{1, 2})), Options{})
	wantNotices(t, r, map[string]int{noTable: 1, "part_too_short": 2, "geometry_empty": 1})
	if r.Ledger != (Ledger{Read: 2, Repaired: 2}) || len(r.Layer.Features[0].Geometry.Parts) != 1 || r.Layer.Features[1].Geometry.Kind != geo.Lines {
		t.Errorf("%+v", r.Layer)
	}
}

// Cells as different writers leave them.
func TestCells(t *testing.T) {
	null, text, number, yes, no := geo.Value{}, geo.TextValue, geo.NumberValue, geo.BoolValue(true), geo.BoolValue(false)
	for name, c := range map[string]struct {
		typ   string
		cells []string
		want  []geo.Value
		notes map[string]int
	}{
		"text":           {"C", []string{"a", " b ", "", "c\x00rest", "\x00"}, []geo.Value{text("a"), text("b"), null, text("c"), null}, nil},
		"numbers":        {"N", []string{"12", "  -3.50", "", "****", "+1e3", "007", "\x00"}, []geo.Value{number(12), number(-3.5), null, null, number(1000), number(7), null}, nil},
		"floats":         {"F", []string{" 1.500e+02", "nan", "-1.#IND", "inf", ".5"}, []geo.Value{number(150), null, null, null, number(.5)}, nil},
		"commas":         {"N", []string{"12,5", "1"}, []geo.Value{number(12.5), number(1)}, map[string]int{"decimal_comma": 1}},
		"long":           {"N", []string{"9007199254740993", "9007199254740991", "1"}, []geo.Value{text("9007199254740993"), text("9007199254740991"), text("1")}, map[string]int{"number_as_text": 1}},
		"long fractions": {"N", []string{"9007199254740993.0"}, []geo.Value{number(9007199254740992)}, nil},
		"words":          {"N", []string{"12", "1.5", "many", "0x1p4", "1_0", "1e999"}, []geo.Value{text("12"), text("1.5"), text("many"), text("0x1p4"), text("1_0"), text("1e999")}, map[string]int{"column_not_numbers": 4}},
		"small":          {"N", []string{"0.00000001", "x"}, []geo.Value{text("1e-08"), text("x")}, map[string]int{"column_not_numbers": 1}},
		"dates":          {"D", []string{"20240229", "", "00000000", "0"}, []geo.Value{text("2024-02-29"), null, null, null}, nil},
		"other dates":    {"D", []string{"20241301", "2024-1-2", "20240132"}, []geo.Value{text("20241301"), text("2024-1-2"), text("20240132")}, map[string]int{"date_as_written": 3}},
		"truth":          {"L", []string{"T", "y", "1", "F", "n", "0", "?", ""}, []geo.Value{yes, yes, yes, no, no, no, null, null}, nil},
		"other truth":    {"L", []string{"T", "X", "?"}, []geo.Value{text("true"), text("X"), null}, map[string]int{"column_mixed": 2}},
	} {
		t.Run(name, func(t *testing.T) {
			var shapes [][]byte
			var rows [][]string
			for _, cell := range c.cells {
				shapes = append(shapes, pointAt(1, 2))
				rows = append(rows, []string{" ", cell})
			}
			f := build(1, shapes...)
			f.dbf = tableOf(0, []string{"A:" + c.typ + ":20"}, rows...)
			r := decode(t, f, Options{})
			var got []geo.Value
			for _, ft := range r.Layer.Features {
				got = append(got, ft.Values[0])
			}
			if !reflect.DeepEqual(got, c.want) {
				t.Errorf("%+v, want %+v", got, c.want)
			}
			if c.notes == nil {
				c.notes = map[string]int{}
			}
			wantNotices(t, r, c.notes)
			for _, n := range r.Notices {
				if n.Field != "A" {
					t.Errorf("notice %+v", n)
				}
			}
		})
	}
}

func TestColumns(t *testing.T) {
	f := build(1, pointAt(1, 2))
	f.dbf = tableOf(0, []string{"A:C:1", "A:C:1", ":C:1", "MEMO:M:10", "abcdefghij:n:2", "T:@:8"}, []string{" ", "1", "2", "3", "x", "42", ""})
	r := decode(t, f, Options{})
	var names []string
	for _, c := range r.Layer.Columns {
		names = append(names, c.Name)
	}
	if want := []string{"A", "A (2)", "column 3", "abcdefghij"}; !reflect.DeepEqual(names, want) {
		t.Errorf("columns %q, want %q", names, want)
	}
	if v := r.Layer.Features[0].Values; len(v) != 4 || v[2].Text != "3" || v[3].Number != 42 {
		t.Errorf("values %+v", v)
	}
	wantNotices(t, r, map[string]int{"column_repeated": 1, "column_type_left_out": 2})
	for _, n := range r.Notices {
		if n.Code == "column_repeated" && (n.Field != "A (2)" || n.Args["name"] != "A") || n.Code == "column_type_left_out" && n.Args["type"] == "" {
			t.Errorf("notice %+v", n)
		}
	}
}

func TestDeletedRecords(t *testing.T) {
	f := build(1, pointAt(1, 1), pointAt(2, 2), pointAt(3, 3))
	f.dbf = tableOf(0, []string{"A:C:1"}, []string{"*", "a"}, []string{" ", "b"}, []string{"*", "c"}, []string{"*", "d"})
	r := decode(t, f, Options{})
	if r.Ledger != (Ledger{Read: 1, LeftOut: 3}) || r.Layer.Features[0].ID != "2" || r.Layer.Features[0].Values[0].Text != "b" {
		t.Errorf("%+v, ledger %+v", r.Layer.Features, r.Ledger)
	}
	wantNotices(t, r, map[string]int{"record_deleted": 3, "rows_disagree": 1})
	if n := r.Notices[0]; n.Args["features"] != "1, 3, 4" {
		t.Errorf("notice %+v", n)
	}
}

func TestRowsDisagree(t *testing.T) {
	f := build(1, pointAt(1, 1), pointAt(2, 2), pointAt(3, 3))
	columns := []string{"A:C:1"}
	f.dbf = tableOf(0, columns, []string{" ", "a"})
	r := decode(t, f, Options{})
	if r.Ledger.Read != 3 || r.Layer.Features[0].Values[0].Text != "a" || !reflect.DeepEqual(r.Layer.Features[2].Values, []geo.Value{{}}) {
		t.Errorf("fewer rows: %+v", r.Layer.Features)
	}
	wantNotices(t, r, map[string]int{"rows_disagree": 1})
	if n := r.Notices[0]; n.Args["shapes"] != "3" || n.Args["rows"] != "1" {
		t.Errorf("notice %+v", n)
	}
	f = build(1, pointAt(1, 1))
	f.dbf = tableOf(0, columns, []string{" ", "a"}, []string{" ", "b"})
	r = decode(t, f, Options{})
	if r.Ledger.Read != 2 || r.Layer.Features[1].Values[0].Text != "b" || r.Layer.Features[1].Geometry.Kind != geo.NoGeometry {
		t.Errorf("more rows: %+v", r.Layer.Features)
	}
	wantNotices(t, r, map[string]int{"rows_disagree": 1, "geometry_missing": 1})
}

func TestBadTables(t *testing.T) {
	f := build(1, pointAt(1, 1))
	good := tableOf(0, []string{"A:C:5"}, []string{" ", "a"})
	for name, c := range map[string]struct {
		change func(b []byte) []byte
		code   string
		where  string
	}{
		"empty":             {func(b []byte) []byte { return []byte{} }, "truncated", ""},
		"version 7":         {func(b []byte) []byte { b[0] = 0x8c; return b }, "bad_table", ""},
		"no header":         {func(b []byte) []byte { b[8], b[9] = 0, 0; return b }, "bad_table", ""},
		"no width":          {func(b []byte) []byte { b[10], b[11] = 0, 0; return b }, "bad_table", ""},
		"header beyond":     {func(b []byte) []byte { b[9] = 255; return b }, "truncated", ""},
		"rows beyond":       {func(b []byte) []byte { b[7] = 255; return b }, "truncated", "feature 2"},
		"columns too wide":  {func(b []byte) []byte { b[10] = 3; return b }, "bad_table", ""},
		"column of nothing": {func(b []byte) []byte { b[32+16] = 0; return b }, "bad_table", ""},
	} {
		t.Run(name, func(t *testing.T) {
			f.dbf = c.change(bytes.Clone(good))
			_, err := Decode(t.Context(), f.set(), Options{})
			wantError(t, err, c.code, c.where)
		})
	}
	f.dbf = bytes.Clone(good)
	f.dbf[64] = 0 // the mark of the end is missing
	if r := decode(t, f, Options{}); len(r.Layer.Columns) != 1 {
		t.Errorf("columns %+v", r.Layer.Columns)
	}
}

func TestEncodings(t *testing.T) {
	for name, c := range map[string]struct {
		cpg      string
		language byte
		cell     string // in a cell of 5 bytes
		ask      string
		text     string
		encoding string
		notes    map[string]int
	}{
		"ascii":                    {"", 0, "abc", "", "abc", "UTF-8", nil},
		"valid as UTF-8":           {"", 0, "gr\xc3\xbcn", "", "grün", "UTF-8", nil},
		"not valid as UTF-8":       {"", 0, "gr\xfcn", "", "grün", "Windows-1252", map[string]int{"encoding_assumed": 1}},
		"cut in a character":       {"UTF-8", 0, "abcd\xc3", "", "abcd", "UTF-8", nil},
		"cut, found out":           {"", 0, "abc\xe2\x82", "", "abc", "UTF-8", nil},
		"cut, but in a wide cell":  {"", 0, "ab\xe2\x82", "", "abâ‚", "Windows-1252", map[string]int{"encoding_assumed": 1}},
		"not what the .cpg says":   {"UTF-8", 0, "gr\xfcn", "", "gr\ufffdn", "UTF-8", map[string]int{"text_unreadable": 1}},
		"looks like UTF-8":         {"1252", 0, "gr\xc3\xbcn", "", "grÃ¼n", "Windows-1252", map[string]int{"encoding_doubtful": 1}},
		"language byte":            {"", 0x57, "gr\xfcn", "", "grün", "Windows-1252", nil},
		"language byte 850":        {"", 0x02, "gr\x81n", "", "grün", "CP850", nil},
		"the .cpg first":           {"850", 0x57, "gr\x81n", "", "grün", "CP850", nil},
		"the user first":           {"UTF-8", 0x57, "gr\x81n", "oem 850", "grün", "CP850", nil},
		"unknown .cpg":             {"Klingon", 0x02, "gr\x81n", "", "grün", "CP850", map[string]int{"encoding_unknown": 1}},
		"unknown language":         {"", 0x13, "gr\xfcn", "", "grün", "Windows-1252", map[string]int{"encoding_unknown": 1, "encoding_assumed": 1}},
		"both unknown":             {"?", 0xff, "grun", "", "grun", "UTF-8", map[string]int{"encoding_unknown": 2}},
		"Central European":         {"1250", 0, "\xf8\xeda", "", "řía", "Windows-1250", nil},
		"Cyrillic":                 {"windows-1251", 0, "\xe4\xe0", "", "да", "Windows-1251", nil},
		"Greek":                    {"", 0xcb, "\xe1", "", "α", "Windows-1253", nil},
		"852":                      {"852", 0, "\xa8", "", "Ę", "CP852", nil},
		"437":                      {"CP437", 0, "\x84", "", "ä", "CP437", nil},
		"65001":                    {"65001", 0, "\xc3\xa4", "", "ä", "UTF-8", nil},
		"88591":                    {"88591", 0, "\xe4", "", "ä", "ISO-8859-1", nil},
		"ISO 8859-15":              {"ISO 8859-15\r\n", 0, "\xa4", "", "€", "ISO-8859-15", nil},
		"mark of byte order":       {"\xef\xbb\xbfutf8", 0, "\xc3\xa4", "", "ä", "UTF-8", nil},
		"ANSI 1252":                {"ANSI 1252", 0, "\x80", "", "€", "Windows-1252", nil},
		"no character there":       {"1252", 0, "a\x81", "", "a\ufffd", "Windows-1252", map[string]int{"text_unreadable": 1}},
		"very long name":           {strings.Repeat("x", 100_000), 0, "a", "", "a", "UTF-8", map[string]int{"encoding_unknown": 1}},
		"zeros instead of a name":  {"UTF\x008", 0, "a", "", "a", "UTF-8", map[string]int{"encoding_unknown": 1}},
		"blank .cpg":               {" \n", 0, "a", "", "a", "UTF-8", nil},
		"name of a line and a bit": {"utf-8\n", 0, "\xc3\xa4", "", "ä", "UTF-8", nil},
	} {
		t.Run(name, func(t *testing.T) {
			f := build(1, pointAt(1, 2))
			f.dbf = tableOf(c.language, []string{"A:C:5"}, []string{" ", c.cell})
			if c.cpg != "" {
				f.cpg = []byte(c.cpg)
			}
			r := decode(t, f, Options{Encoding: c.ask})
			if got := r.Layer.Features[0].Values[0]; got != geo.TextValue(c.text) || r.Encoding != c.encoding {
				t.Errorf("%q in %s, want %q in %s", got.Text, r.Encoding, c.text, c.encoding)
			}
			if c.notes == nil {
				c.notes = map[string]int{}
			}
			wantNotices(t, r, c.notes)
		})
	}
	f := build(1, pointAt(1, 2))
	_, err := Decode(t.Context(), f.set(), Options{Encoding: "Klingon"})
	wantError(t, err, "encoding_unknown", "")
	if !strings.Contains(err.Error(), "CP850") {
		t.Errorf("the cure names no encoding: %v", err)
	}
	for name, e := range encodings {
		if encodingOf(e.name) == nil || encodingOf(e.name).name != e.name {
			t.Errorf("%s is called %s, which is not known", name, e.name)
		}
	}
	for b, name := range languages {
		if encodings[name] == nil {
			t.Errorf("language %x names %s, which is not known", b, name)
		}
	}
}

func TestPRJText(t *testing.T) {
	f := build(1, pointAt(1, 2))
	for text, want := range map[string]string{"": "", "\xef\xbb\xbfGEOGCS[\"x\"]\r\n": `GEOGCS["x"]`, "a\x00b": "", strings.Repeat("x", 70_000): ""} {
		f.prj = []byte(text)
		r := decode(t, f, Options{})
		if r.CRS != want {
			t.Errorf("%.20q: %q", text, r.CRS)
		}
		if _, said := counts(r)["crs_not_understood"]; said != (want == "" && text != "") {
			t.Errorf("%.20q: %v", text, r.Notices)
		}
	}
}

// A file that is cut anywhere is an error that says so, and never a shorter layer.
func TestTruncatedAnywhere(t *testing.T) {
	for _, name := range []string{"points", "areas", "heights_lines", "measures_multipoints", "edited", "words_utf8"} {
		whole := fixture(t, name)
		want := decode(t, whole, Options{})
		refuse := func(f files, n int, ending string) {
			t.Helper()
			r, err := Decode(t.Context(), f.set(), Options{File: name})
			var e *formats.Error
			if !errors.As(err, &e) || e.Code != "truncated" && e.Code != "empty_file" || e.Do == "" || e.File != name {
				t.Fatalf("%s%s cut after %d bytes: %v, %d features", name, ending, n, err, r.Ledger.Read)
			}
			if ending == ".shp" && n >= 100 && e.Where == "" {
				t.Fatalf("%s cut after %d bytes: %v names no feature", name, n, err)
			}
		}
		for n := range len(whole.shp) {
			f := whole
			f.shp = whole.shp[:n:n]
			refuse(f, n, ".shp")
			refuse(files{shp: f.shp}, n, ".shp")
		}
		for n := range len(whole.dbf) - 1 { // the last byte is only a mark
			f := whole
			f.dbf = whole.dbf[:n:n]
			refuse(f, n, ".dbf")
		}
		if name == "edited" {
			continue // only its index leads to the record that was replaced
		}
		for n := range len(whole.shx) {
			f := whole
			f.shx = whole.shx[:n:n]
			r := decode(t, f, Options{})
			if !reflect.DeepEqual(r.Layer, want.Layer) || counts(r)["index_broken"] != 1 {
				t.Fatalf("%s.shx cut after %d bytes: %v", name, n, r.Notices)
			}
		}
	}
}

// Nothing that stands in a file makes the reader panic or use much memory.
func TestRandomBytes(t *testing.T) {
	r := rand.New(rand.NewPCG(3, 4))
	for _, name := range []string{"points", "areas", "heights", "both_lines", "multipoints", "edited", "words_850"} {
		whole := fixture(t, name)
		for range 3000 {
			f := files{bytes.Clone(whole.shp), bytes.Clone(whole.dbf), bytes.Clone(whole.shx), whole.prj, bytes.Clone(whole.cpg)}
			for range 1 + r.IntN(4) {
				b := [][]byte{f.shp, f.dbf, f.shx, f.shp}[r.IntN(4)]
				at := r.IntN(len(b))
				switch r.IntN(3) {
				case 0:
					b[at] ^= 1 << r.IntN(8)
				case 1:
					b[at] = byte(r.Uint32())
				default:
					b[at] = []byte{0, 1, 0x7f, 0x80, 0xff}[r.IntN(5)]
				}
			}
			check(t, f)
		}
	}
}

// check decodes a set that may be broken and looks at what must hold of any answer.
func check(t *testing.T, f files) {
	t.Helper()
	res, err := Decode(t.Context(), f.set(), Options{MaxFeatures: 10_000, MaxPositions: 100_000})
	if err != nil {
		var e *formats.Error
		if !errors.As(err, &e) || e.Code == "" || e.What == "" || e.Do == "" {
			t.Fatalf("%v", err)
		}
		return
	}
	if res.Ledger.Read != len(res.Layer.Features) {
		t.Fatalf("ledger %+v for %d features", res.Ledger, len(res.Layer.Features))
	}
	for _, n := range res.Notices {
		if _, ok := notices[n.Code]; !ok {
			t.Fatalf("notice %+v", n)
		}
	}
	last := 0
	for _, ft := range res.Layer.Features {
		id, err := strconv.Atoi(ft.ID)
		if err != nil || id <= last {
			t.Fatalf("identifier %q after %d", ft.ID, last)
		}
		last = id
		if len(ft.Values) != len(res.Layer.Columns) {
			t.Fatalf("%d values, %d columns", len(ft.Values), len(res.Layer.Columns))
		}
		ft.Geometry.Each(func(p geo.LonLat) {
			if !p.Finite() {
				t.Fatalf("position %v", p)
			}
		})
		if ft.Geometry.Kind == geo.Polygons {
			for _, part := range ft.Geometry.Parts {
				for _, ring := range part {
					if len(ring) < 4 || ring[0] != ring[len(ring)-1] {
						t.Fatalf("ring %v", ring)
					}
				}
			}
		}
	}
	for j := range res.Layer.Columns {
		kind := geo.Null
		for _, ft := range res.Layer.Features {
			if k := ft.Values[j].Kind; k != geo.Null {
				if kind != geo.Null && k != kind {
					t.Fatalf("column %d is of several kinds", j)
				}
				kind = k
			}
		}
	}
}

// Headers that promise much cost nothing.
func TestBombs(t *testing.T) {
	big := shapeOf(5, square(0, 0, 1))
	putLE(big[36:], 1<<28)
	putLE(big[40:], 1<<30)
	cut := build(5, big)
	cut.shx = nil
	putBE(cut.shp[104:], 1<<30)
	putBE(cut.shp[24:], 1<<30)
	rows := build(1, pointAt(1, 1))
	rows.dbf = tableOf(0, []string{"A:C:250"}, []string{" ", "a"})
	putLE(rows.dbf[4:], math.MaxInt32)
	for name, f := range map[string]files{"counts": build(5, big), "lengths": cut, "rows": rows} {
		var before, after runtime.MemStats
		runtime.ReadMemStats(&before)
		_, err := Decode(t.Context(), f.set(), Options{})
		runtime.ReadMemStats(&after)
		if err == nil {
			t.Errorf("%s: no error", name)
		}
		if grown := after.TotalAlloc - before.TotalAlloc; grown > 2<<20 {
			t.Errorf("%s: %d bytes were allocated", name, grown)
		}
	}
	// An index that leads many times to one large record would make much of little.
	f := build(5, shapeOf(5, square(0, 0, 1)))
	for range 1000 {
		f.shx = append(f.shx, f.shx[100:108]...)
	}
	putBE(f.shx[24:], len(f.shx)/2)
	if r := decode(t, f, Options{}); r.Ledger.Read != 1 || counts(r)["index_broken"] != 1 {
		t.Errorf("ledger %+v", r.Ledger)
	}
}

func TestLimits(t *testing.T) {
	f := build(1, pointAt(1, 1), pointAt(2, 2))
	_, err := Decode(t.Context(), f.set(), Options{MaxFeatures: 1})
	wantError(t, err, "too_many", "feature 2")
	_, err = Decode(t.Context(), f.set(), Options{MaxPositions: 1})
	wantError(t, err, "too_many", "feature 2")
	decode(t, f, Options{MaxFeatures: 2, MaxPositions: 2})
}

func many(n int) files {
	contents := make([][]byte, n)
	rows := make([][]string, n)
	for i := range contents {
		x, y := float64(i%1000)*20, float64(i/1000)*20
		contents[i] = shapeOf(5, square(x, y, 10), square(x+2, y+2, 2))
		rows[i] = []string{" ", strconv.Itoa(i), "Gr\xc3\xbcn " + strconv.Itoa(i), "20240101", "1.25"}
	}
	f := build(5, contents...)
	f.dbf = tableOf(0, []string{"ID:N:10", "NAME:C:40", "DAY:D:8", "AREA:F:12"}, rows...)
	return f
}

func TestProgressAndCancel(t *testing.T) {
	f := many(40_000)
	var seen []int64
	decode(t, f, Options{Progress: func(n int64) { seen = append(seen, n) }})
	if want := int64(len(f.shp)+len(f.dbf)+len(f.shx)) - progressEvery; len(seen) < 3 || seen[len(seen)-1] < want {
		t.Errorf("progress %v of %d", seen, want)
	}
	for i := 1; i < len(seen); i++ {
		if seen[i] < seen[i-1] {
			t.Errorf("progress goes back: %v", seen)
		}
	}
	ctx, cancel := context.WithCancel(t.Context())
	_, err := Decode(ctx, f.set(), Options{Progress: func(int64) { cancel() }})
	if !errors.Is(err, context.Canceled) {
		t.Errorf("error %v", err)
	}
	_, err = Decode(ctx, f.set(), Options{})
	if !errors.Is(err, context.Canceled) {
		t.Errorf("error %v", err)
	}
}

type faulty struct{ err error }

func (f faulty) ReadAt([]byte, int64) (int, error) { return 0, f.err }

func TestUnreadable(t *testing.T) {
	disk := errors.New("input/output error")
	_, err := Decode(t.Context(), Set{SHP: &Part{faulty{disk}, 1000}}, Options{})
	wantError(t, err, "unreadable", "")
	if !errors.Is(err, disk) {
		t.Errorf("the cause is lost: %v", err)
	}
	_, err = Decode(t.Context(), Set{SHP: &Part{faulty{io.EOF}, 1000}}, Options{})
	wantError(t, err, "truncated", "")
}

// Many rings in one shape, beside each other, in one another, and as holes of one large ring of many
// positions: none may take time by the square of their number.
func TestManyRings(t *testing.T) {
	const n = 60_000
	around := make([]geo.LonLat, 0, n)
	for i := range n {
		s, c := math.Sincos(2 * math.Pi * float64(i) / n)
		around = append(around, geo.LonLat{Lon: 3000 + 10000*c, Lat: 3000 + 10000*s})
	}
	around = append(around, around[0])
	ring := func(p []float64) []geo.LonLat {
		var out []geo.LonLat
		for i := 0; i < len(p); i += 2 {
			out = append(out, geo.LonLat{Lon: p[i], Lat: p[i+1]})
		}
		return out
	}
	var beside, nested [][]geo.LonLat
	for i := range n {
		beside = append(beside, ring(square(float64(i%250)*20, float64(i/250)*20, 10)))
	}
	for i := range 3000 {
		nested = append(nested, ring(square(float64(i), float64(i), 10000-2*float64(i))))
	}
	for name, c := range map[string]struct {
		rings [][]geo.LonLat
		parts int
	}{
		"beside": {beside, n},
		"holes":  {append([][]geo.LonLat{around}, beside...), 1},
		"nested": {nested, 1500},
	} {
		parts, _, err := nest(t.Context(), c.rings)
		if err != nil || len(parts) != c.parts {
			t.Errorf("%s: %d parts, want %d, %v", name, len(parts), c.parts, err)
		}
	}
	ctx, cancel := context.WithCancel(t.Context())
	cancel()
	if _, _, err := nest(ctx, beside); !errors.Is(err, context.Canceled) {
		t.Errorf("error %v", err)
	}
}

func TestMembers(t *testing.T) {
	got := Members([]string{
		"readme.txt", "Roads.SHP", "roads.dbf", "ROADS.Shx", "roads.prj", "roads.shp.xml", "roads.sbn",
		"in/areas.shp", "in/areas.cpg", "areas.dbf", "table.dbf", "__MACOSX/in/._areas.shp", "in/.shp",
		"a.shp", "A.shp", "a.dbf", "A.DBF", "b.x.shp", "b.x.dbf", "b.dbf",
	})
	want := []Names{
		{Base: "A", SHP: "A.shp", DBF: "A.DBF"},
		{Base: "Roads", SHP: "Roads.SHP", DBF: "roads.dbf", SHX: "ROADS.Shx", PRJ: "roads.prj"},
		{Base: "a", SHP: "a.shp", DBF: "a.dbf"},
		{Base: "b.x", SHP: "b.x.shp", DBF: "b.x.dbf"},
		{Base: "in/areas", SHP: "in/areas.shp", CPG: "in/areas.cpg"},
	}
	if !reflect.DeepEqual(got, want) {
		t.Errorf("got  %+v\nwant %+v", got, want)
	}
	if Members(nil) != nil {
		t.Error("sets of nothing")
	}
}

func FuzzDecode(f *testing.F) {
	for _, name := range []string{"points", "areas", "heights", "both_lines", "measures_multipoints", "edited", "words_850"} {
		s := fixture(f, name)
		f.Add(s.shp, s.dbf, s.shx, s.cpg)
	}
	f.Fuzz(func(t *testing.T, shp, dbf, shx, cpg []byte) {
		check(t, files{shp: shp, dbf: dbf, shx: shx, cpg: cpg})
		check(t, files{shp: shp, dbf: dbf})
	})
}

func BenchmarkDecode(b *testing.B) {
	for _, n := range []int{1_000, 10_000, 100_000} {
		f := many(n)
		b.Run(strconv.Itoa(n), func(b *testing.B) {
			b.SetBytes(int64(len(f.shp) + len(f.dbf)))
			b.ReportAllocs()
			for b.Loop() {
				if _, err := Decode(b.Context(), f.set(), Options{}); err != nil {
					b.Fatal(err)
				}
			}
		})
	}
}
