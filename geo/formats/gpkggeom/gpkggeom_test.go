package gpkggeom

import (
	"bytes"
	"encoding/hex"
	"errors"
	"math"
	"os"
	"os/exec"
	"path/filepath"
	"reflect"
	"strings"
	"testing"

	"github.com/twpayne/go-geom/encoding/wkb"

	"groundtally/geo"
)

func ring(v ...float64) []geo.LonLat {
	r := make([]geo.LonLat, 0, len(v)/2)
	for i := 0; i+1 < len(v); i += 2 {
		r = append(r, geo.LonLat{Lon: v[i], Lat: v[i+1]})
	}
	return r
}

type parts = [][][]geo.LonLat

var shapes = map[string]geo.LonLatGeometry{
	"point":              {Kind: geo.Points, Parts: parts{{ring(9, 48)}}},
	"points":             {Kind: geo.Points, Parts: parts{{ring(9, 48)}, {ring(-27.01, 47.51)}}},
	"no point":           {Kind: geo.Points},
	"line":               {Kind: geo.Lines, Parts: parts{{ring(0, 0, 1, 1, 2, 0)}}},
	"lines":              {Kind: geo.Lines, Parts: parts{{ring(0, 0, 1, 1)}, {ring(5, 5, 6, 6, 7, 7)}}},
	"line without point": {Kind: geo.Lines, Parts: parts{{ring()}}},
	"polygon with hole":  {Kind: geo.Polygons, Parts: parts{{ring(0, 0, 9, 0, 9, 9, 0, 0), ring(1, 1, 2, 2, 2, 1, 1, 1)}}},
	"polygons":           {Kind: geo.Polygons, Parts: parts{{ring(0, 0, 9, 0, 9, 9, 0, 0)}, {ring(20, 0, 29, 0, 29, 9, 20, 0)}}},
	"no polygon":         {Kind: geo.Polygons},
	"polygon no ring":    {Kind: geo.Polygons, Parts: parts{{}}},
	"awkward bits":       {Kind: geo.Lines, Parts: parts{{ring(0.1, 0.30000000000000004, math.SmallestNonzeroFloat64, math.MaxFloat64, math.Copysign(0, -1), 1.0/3)}}},
}

func sameBits(a, b geo.LonLatGeometry) bool {
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
				if math.Float64bits(p.Lon) != math.Float64bits(q.Lon) || math.Float64bits(p.Lat) != math.Float64bits(q.Lat) {
					return false
				}
			}
		}
	}
	return true
}

func TestRoundTripKeepsBits(t *testing.T) {
	for name, g := range shapes {
		for _, multi := range []bool{false, true} {
			b, err := Append(nil, g, 4326, multi)
			if err != nil {
				t.Fatalf("%s: %v", name, err)
			}
			back, err := Decode(b)
			if err != nil {
				t.Fatalf("%s multi=%t: %v", name, multi, err)
			}
			if back.SRS != 4326 || back.Dropped || back.LeftOut != 0 || !sameBits(back.Geometry, g) {
				t.Errorf("%s multi=%t: got %+v, want %+v", name, multi, back, g)
			}
		}
	}
}

// The first bytes of a polygon's blob as GDAL 3.6.2 writes them.
func TestHeadAsGDALWritesIt(t *testing.T) {
	b, err := Append(nil, shapes["polygon with hole"], 4326, false)
	if err != nil {
		t.Fatal(err)
	}
	if got := hex.EncodeToString(b[:8]); got != "47500003e6100000" {
		t.Errorf("head %s, want 47500003e6100000", got)
	}
}

// An independent decoder must find the same coordinates behind the header.
func TestAgainstAnIndependentDecoder(t *testing.T) {
	for _, name := range []string{"point", "points", "line", "lines", "polygon with hole", "polygons"} {
		g := shapes[name]
		b, err := Append(nil, g, 4326, false)
		if err != nil {
			t.Fatal(err)
		}
		at := 8
		if b[3]>>1&7 == 1 {
			at += 32
		}
		other, err := wkb.Unmarshal(b[at:])
		if err != nil {
			t.Fatalf("%s: %v", name, err)
		}
		var want []float64
		g.Each(func(p geo.LonLat) { want = append(want, p.Lon, p.Lat) })
		if !reflect.DeepEqual(other.FlatCoords(), want) {
			t.Errorf("%s: %v, want %v", name, other.FlatCoords(), want)
		}
	}
}

func TestOtherForms(t *testing.T) {
	head := "4750000000000000" // big-endian, no envelope, srs 0
	cases := []struct {
		name, hex string
		want      Blob
		err       error
	}{
		{name: "big-endian point", hex: head + "0000000001" + "3ff0000000000000" + "4000000000000000",
			want: Blob{Geometry: geo.LonLatGeometry{Kind: geo.Points, Parts: parts{{ring(1, 2)}}}}},
		{name: "ISO height", hex: head + "00000003e9" + "3ff0000000000000" + "4000000000000000" + "4008000000000000",
			want: Blob{Dropped: true, Geometry: geo.LonLatGeometry{Kind: geo.Points, Parts: parts{{ring(1, 2)}}}}},
		{name: "extended height with srs", hex: head + "00a0000001" + "000010e6" + "3ff0000000000000" + "4000000000000000" + "4008000000000000",
			want: Blob{Dropped: true, Geometry: geo.LonLatGeometry{Kind: geo.Points, Parts: parts{{ring(1, 2)}}}}},
		{name: "empty point", hex: head + "0000000001" + "7ff8000000000000" + "7ff8000000000000",
			want: Blob{Geometry: geo.LonLatGeometry{Kind: geo.Points}}},
		{name: "collection of point and line", hex: head + "0000000007" + "00000002" +
			"0000000001" + "3ff0000000000000" + "4000000000000000" +
			"0000000002" + "00000002" + "3ff0000000000000" + "4000000000000000" + "4000000000000000" + "4000000000000000",
			want: Blob{LeftOut: 1, Geometry: geo.LonLatGeometry{Kind: geo.Lines, Parts: parts{{ring(1, 2, 2, 2)}}}}},
		{name: "empty collection", hex: head + "0000000007" + "00000000", want: Blob{}},
		{name: "infinite", hex: head + "0000000001" + "7ff0000000000000" + "4000000000000000", err: errAny},
		{name: "curve", hex: head + "000000000a" + "00000000", err: ErrCurved},
		{name: "extended blob", hex: "4750002000000000" + "0000000001", err: ErrExtended},
		{name: "cut point", hex: head + "0000000001" + "3ff0", err: ErrCut},
		{name: "count beyond the blob", hex: head + "0000000002" + "ffffffff", err: ErrCut},
		{name: "line inside points", hex: head + "0000000004" + "00000001" + "0000000002" + "00000000", err: ErrNotABlob},
		{name: "bytes behind", hex: head + "0000000007" + "00000000" + "00", err: ErrNotABlob},
		{name: "envelope cut", hex: "4750000200000000", err: ErrCut},
		{name: "nothing", hex: "", err: ErrNotABlob},
		{name: "deep collections", hex: head + strings.Repeat("0000000007"+"00000001", 100) + "0000000007" + "00000000", err: ErrTooDeep},
	}
	for _, c := range cases {
		t.Run(c.name, func(t *testing.T) {
			b, err := hex.DecodeString(c.hex)
			if err != nil {
				t.Fatal(err)
			}
			got, err := Decode(b)
			if c.err != nil {
				if err == nil || (!errors.Is(c.err, errAny) && !errors.Is(err, c.err)) {
					t.Fatalf("error %v, want %v", err, c.err)
				}
				return
			}
			if err != nil {
				t.Fatal(err)
			}
			if !reflect.DeepEqual(got, c.want) {
				t.Errorf("got %+v, want %+v", got, c.want)
			}
		})
	}
}

var errAny = errors.New("any error")

func TestRefused(t *testing.T) {
	for name, g := range map[string]geo.LonLatGeometry{
		"no kind":             {},
		"NaN":                 {Kind: geo.Points, Parts: parts{{ring(math.NaN(), 0)}}},
		"infinite":            {Kind: geo.Lines, Parts: parts{{ring(0, 0, math.Inf(1), 0)}}},
		"point with two":      {Kind: geo.Points, Parts: parts{{ring(0, 0, 1, 1)}}},
		"line with two rings": {Kind: geo.Lines, Parts: parts{{ring(0, 0), ring(1, 1)}}},
	} {
		if _, err := Append(nil, g, 4326, false); err == nil {
			t.Errorf("%s: accepted", name)
		}
	}
}

// A blob made by GDAL, where it is installed, must read as what it was made from. Without it the same
// bytes, recorded from GDAL 3.6.2, are read.
func TestBlobFromGDAL(t *testing.T) {
	const recorded = "47500003e6100000000000000000000000000000000008400000000000000000000000000000084001030000000100000004000000000000000000000000000000000000000000000000000840000000000000000000000000000008400000000000000840" +
		"00000000000000000000000000000000"
	blob, err := hex.DecodeString(recorded)
	if err != nil {
		t.Fatal(err)
	}
	if tool, err := exec.LookPath("ogr2ogr"); err == nil {
		dir := t.TempDir()
		in, out := filepath.Join(dir, "in.json"), filepath.Join(dir, "out.gpkg")
		doc := `{"type":"Feature","properties":{},"geometry":{"type":"Polygon","coordinates":[[[0,0],[3,0],[3,3],[0,0]]]}}`
		if err := os.WriteFile(in, []byte(doc), 0o600); err != nil {
			t.Fatal(err)
		}
		if msg, err := exec.Command(tool, "-f", "GPKG", out, in).CombinedOutput(); err != nil {
			t.Fatalf("%v: %s", err, msg)
		}
		file, err := os.ReadFile(out)
		if err != nil {
			t.Fatal(err)
		}
		if !bytes.Contains(file, blob) {
			t.Error("the recorded blob is not what the installed GDAL writes")
		}
	}
	got, err := Decode(blob)
	if err != nil {
		t.Fatal(err)
	}
	want := geo.LonLatGeometry{Kind: geo.Polygons, Parts: parts{{ring(0, 0, 3, 0, 3, 3, 0, 0)}}}
	if !sameBits(got.Geometry, want) {
		t.Errorf("got %+v", got)
	}
	mine, err := Append(nil, want, 4326, false)
	if err != nil || !bytes.Equal(mine, blob) {
		t.Errorf("written %x (%v), GDAL writes %x", mine, err, blob)
	}
}

func FuzzDecode(f *testing.F) {
	for _, g := range shapes {
		b, err := Append(nil, g, 4326, false)
		if err != nil {
			f.Fatal(err)
		}
		f.Add(b)
	}
	f.Fuzz(func(t *testing.T, b []byte) {
		got, err := Decode(b)
		if err != nil || got.Geometry.Kind == geo.NoGeometry {
			return
		}
		again, err := Append(nil, got.Geometry, got.SRS, false)
		if err != nil {
			t.Fatalf("decoded but cannot be encoded: %v", err)
		}
		back, err := Decode(again)
		if err != nil || !sameBits(back.Geometry, got.Geometry) {
			t.Fatalf("second reading differs: %v", err)
		}
	})
}

func BenchmarkRoundTrip(b *testing.B) {
	g := shapes["polygon with hole"]
	var buf []byte
	for b.Loop() {
		var err error
		if buf, err = Append(buf[:0], g, 4326, false); err != nil {
			b.Fatal(err)
		}
		if _, err := Decode(buf); err != nil {
			b.Fatal(err)
		}
	}
}
