package shapefile

import (
	"bytes"
	"fmt"
	"math"
	"os"
	"path/filepath"
	"reflect"
	"strconv"
	"strings"
	"testing"

	"groundtally/geo"
	"groundtally/geo/crs"
)

const fixtures = "../../../testdata/formats/shapefile"

func part(b []byte) *Part {
	if b == nil {
		return nil
	}
	return &Part{bytes.NewReader(b), int64(len(b))}
}

// files holds a set's bytes, nil for a file that is missing.
type files struct{ shp, dbf, shx, prj, cpg []byte }

func (f files) set() Set {
	return Set{SHP: part(f.shp), DBF: part(f.dbf), SHX: part(f.shx), PRJ: part(f.prj), CPG: part(f.cpg)}
}

func fixture(t testing.TB, name string) files {
	t.Helper()
	read := func(ending string) []byte {
		b, err := os.ReadFile(filepath.Join(fixtures, name+ending))
		if err != nil && !os.IsNotExist(err) {
			t.Fatal(err)
		}
		return b
	}
	f := files{read(".shp"), read(".dbf"), read(".shx"), read(".prj"), read(".cpg")}
	if f.shp == nil {
		t.Fatalf("there is no fixture %s", name)
	}
	return f
}

func decode(t testing.TB, f files, o Options) Result {
	t.Helper()
	r, err := Decode(t.Context(), f.set(), o)
	if err != nil {
		t.Fatal(err)
	}
	return r
}

// told is a feature as ogrinfo prints it.
type told struct {
	id    string
	attrs map[string]string // name and type to value
	wkt   string
}

func readTold(t *testing.T, path string) []told {
	t.Helper()
	b, err := os.ReadFile(path)
	if err != nil {
		t.Fatal(err)
	}
	var out []told
	for _, line := range strings.Split(string(b), "\n") {
		if rest, ok := strings.CutPrefix(line, "OGRFeature("); ok {
			n, err := strconv.Atoi(rest[strings.LastIndex(rest, ":")+1:])
			if err != nil {
				t.Fatal(err)
			}
			out = append(out, told{id: strconv.Itoa(n + 1), attrs: map[string]string{}}) // it counts from 0
			continue
		}
		if len(out) == 0 || !strings.HasPrefix(line, "  ") {
			continue
		}
		f := &out[len(out)-1]
		if name, value, ok := strings.Cut(line[2:], ") = "); ok {
			f.attrs[name+")"] = value
		} else {
			f.wkt = line[2:]
		}
	}
	if len(out) == 0 {
		t.Fatalf("%s has no feature", path)
	}
	return out
}

// parseWKT gives the geometry of well-known text, its heights and measures left out.
func parseWKT(t *testing.T, s string) geo.LonLatGeometry {
	t.Helper()
	if s == "" {
		return geo.LonLatGeometry{}
	}
	at := strings.IndexByte(s, '(')
	word := strings.Fields(s[:at])[0]
	multi := strings.HasPrefix(word, "MULTI")
	g := geo.LonLatGeometry{Kind: map[string]geo.Kind{"POINT": geo.Points, "LINESTRING": geo.Lines, "POLYGON": geo.Polygons}[strings.TrimPrefix(word, "MULTI")]}
	positions := func(s string) []geo.LonLat {
		var out []geo.LonLat
		for p := range strings.SplitSeq(strings.Trim(s, "()"), ",") {
			n := strings.Fields(strings.Trim(p, "()"))
			x, errX := strconv.ParseFloat(n[0], 64)
			y, errY := strconv.ParseFloat(n[1], 64)
			if errX != nil || errY != nil {
				t.Fatalf("%q: %v, %v", p, errX, errY)
			}
			out = append(out, geo.LonLat{Lon: x, Lat: y})
		}
		return out
	}
	body := s[at:]
	switch {
	case g.Kind == geo.Points:
		for _, p := range positions(body) {
			g.Parts = append(g.Parts, [][]geo.LonLat{{p}})
		}
	case g.Kind == geo.Lines:
		for line := range strings.SplitSeq(body, "),(") {
			g.Parts = append(g.Parts, [][]geo.LonLat{positions(line)})
		}
	default:
		polygons := []string{body}
		if multi {
			polygons = strings.Split(body, ")),((")
		}
		for _, polygon := range polygons {
			var part [][]geo.LonLat
			for ring := range strings.SplitSeq(polygon, "),(") {
				part = append(part, positions(ring))
			}
			g.Parts = append(g.Parts, part)
		}
	}
	return g
}

// near compares geometries; ogrinfo prints 15 digits.
func near(a, b geo.LonLatGeometry) bool {
	if a.Kind != b.Kind || len(a.Parts) != len(b.Parts) {
		return false
	}
	for i := range a.Parts {
		if len(a.Parts[i]) != len(b.Parts[i]) {
			return false
		}
		for j := range a.Parts[i] {
			if len(a.Parts[i][j]) != len(b.Parts[i][j]) {
				return false
			}
			for k, p := range a.Parts[i][j] {
				q := b.Parts[i][j][k]
				if math.Abs(p.Lon-q.Lon) > 1e-14*math.Abs(q.Lon) || math.Abs(p.Lat-q.Lat) > 1e-14*math.Abs(q.Lat) {
					return false
				}
			}
		}
	}
	return true
}

// Every set reads as the other reader read it.
func TestAgainstOgrinfo(t *testing.T) {
	list, err := filepath.Glob(filepath.Join(fixtures, "*.txt"))
	if err != nil || len(list) < 20 {
		t.Fatal(list, err)
	}
	for _, path := range list {
		name := strings.TrimSuffix(filepath.Base(path), ".txt")
		t.Run(name, func(t *testing.T) {
			f := fixture(t, name)
			r := decode(t, f, Options{})
			want := readTold(t, path)
			if len(r.Layer.Features) != len(want) || r.Ledger.Read != len(want) {
				t.Fatalf("%d features, want %d", len(r.Layer.Features), len(want))
			}
			if strings.TrimSpace(string(f.prj)) != r.CRS || r.CRS == "" {
				t.Errorf("coordinate system %q", r.CRS)
			}
			for i, w := range want {
				got := r.Layer.Features[i]
				if got.ID != w.id {
					t.Errorf("feature %s, want %s", got.ID, w.id)
				}
				if g := parseWKT(t, w.wkt); !near(got.Geometry, g) {
					t.Errorf("feature %s: %v, want %s", got.ID, got.Geometry, w.wkt)
				}
				if len(got.Values) != len(w.attrs) {
					t.Errorf("feature %s: %d values, want %d", got.ID, len(got.Values), len(w.attrs))
				}
				for label, value := range w.attrs {
					name, typ, _ := strings.Cut(label, " (")
					j := r.Layer.ColumnIndex(name)
					if j < 0 {
						t.Fatalf("no column %q", name)
					}
					if err := agrees(got.Values[j], strings.TrimSuffix(typ, ")"), value); err != nil {
						t.Errorf("feature %s, %s: %v", got.ID, name, err)
					}
				}
			}
		})
	}
}

func agrees(v geo.Value, typ, want string) error {
	if want == "(null)" {
		if v.Kind != geo.Null {
			return fmt.Errorf("%v, want null", v)
		}
		return nil
	}
	switch typ {
	case "String":
		if v.Kind == geo.Text && v.Text == want {
			return nil
		}
	case "Date":
		if v.Kind == geo.Text && v.Text == strings.ReplaceAll(want, "/", "-") {
			return nil
		}
	case "Integer64": // the column holds a number beyond 2^53, so it is text
		if v.Kind == geo.Text && v.Text == want {
			return nil
		}
	case "Integer", "Real":
		f, err := strconv.ParseFloat(want, 64)
		if err == nil && v.Kind == geo.Number && v.Number == f {
			return nil
		}
	}
	return fmt.Errorf("%+v, want %s %s", v, typ, want)
}

// In the bytes every ring runs the other way round; holes stay holes.
func TestReversedOrientation(t *testing.T) {
	want := decode(t, fixture(t, "areas"), Options{})
	f := fixture(t, "areas")
	for at := 100; at < len(f.shp); {
		n := 2 * int(be(f.shp[at+4:]))
		c := f.shp[at+8:][:n]
		parts, positions := int(le(c[36:])), int(le(c[40:]))
		from := func(i int) int {
			if i == parts {
				return positions
			}
			return int(le(c[44+4*i:]))
		}
		for i := range parts {
			ring := c[44+4*parts:][16*from(i) : 16*from(i+1)]
			for a, b := 0, len(ring)-16; a < b; a, b = a+16, b-16 {
				var keep [16]byte
				copy(keep[:], ring[a:])
				copy(ring[a:a+16], ring[b:b+16])
				copy(ring[b:b+16], keep[:])
			}
		}
		at += 8 + n
	}
	got := decode(t, f, Options{})
	for i := range got.Layer.Features {
		g, w := got.Layer.Features[i].Geometry, want.Layer.Features[i].Geometry
		for _, part := range g.Parts {
			for _, ring := range part {
				for a, b := 0, len(ring)-1; a < b; a, b = a+1, b-1 {
					ring[a], ring[b] = ring[b], ring[a]
				}
			}
		}
		if !reflect.DeepEqual(g, w) {
			t.Errorf("feature %d: %v, want %v", i+1, g, w)
		}
	}
}

// The .prj of the fixtures goes to the library for coordinate systems as it stands, and gives the same
// positions as the code.
func TestPRJ(t *testing.T) {
	for _, c := range []struct {
		name, code string
		x, y       float64
	}{
		{"points", "EPSG:4326", 8.25, 47.5},
		{"lines", "EPSG:25832", 500100.25, 5300050.5},
		{"areas", "EPSG:2056", 2600100, 1200100},
	} {
		r := decode(t, fixture(t, c.name), Options{})
		byText, err := crs.NewTransform(r.CRS)
		if err != nil {
			t.Errorf("%s: %v", c.code, err)
			continue
		}
		byCode, err := crs.NewTransform(c.code)
		if err != nil {
			t.Fatal(err)
		}
		p, err := byText.Forward(c.x, c.y)
		if err != nil {
			t.Errorf("%s: %v", c.code, err)
		}
		q, err := byCode.Forward(c.x, c.y)
		if err != nil {
			t.Fatal(err)
		}
		const millimetre = 1e-8 // degrees
		if math.Abs(p.Lon-q.Lon) > millimetre || math.Abs(p.Lat-q.Lat) > millimetre {
			t.Errorf("%s: the text of the .prj gives %v, the code %v", c.code, p, q)
		}
	}
}
