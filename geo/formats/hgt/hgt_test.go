package hgt

import (
	"bytes"
	"compress/gzip"
	"context"
	"encoding/binary"
	"encoding/csv"
	"errors"
	"io"
	"math"
	"os"
	"path/filepath"
	"strconv"
	"strings"
	"testing"

	"groundtally/geo/formats"
)

const folder = "../../../testdata/formats/hgt"

func decodeBytes(b []byte, name string) (Result, error) {
	return Decode(context.Background(), bytes.NewReader(b), int64(len(b)), Options{File: name})
}

// tile makes a tile of a formula; void where it gives none.
func tile(n int, at func(col, row int) int16) []byte {
	b := make([]byte, 0, 2*n*n)
	for r := range n {
		for c := range n {
			b = binary.BigEndian.AppendUint16(b, uint16(at(c, r)))
		}
	}
	return b
}

func TestEveryCell(t *testing.T) {
	at := func(c, r int) int16 {
		if (c*31+r*17)%101 == 0 {
			return void
		}
		return int16((c*7+r*13)%9000 - 430)
	}
	for _, side := range []int{coarse, fine} {
		got, err := decodeBytes(tile(side, at), "N47E009.hgt")
		if err != nil {
			t.Fatal(err)
		}
		g, missing := got.Grid, 0
		for r := range side {
			for c := range side {
				v, ok := g.At(c, r)
				if want := at(c, r); ok != (want != void) || ok && v != float32(want) {
					t.Fatalf("column %d, row %d: %g, %t, want %d", c, r, v, ok, want)
				}
				if !ok {
					missing++
				}
			}
		}
		if got.Missing != missing || got.CRS != "EPSG:4326" || len(got.Notices) != 0 || g.NCols != side || g.NRows != side {
			t.Errorf("%d missing, %q, %v", got.Missing, got.CRS, got.Notices)
		}
		// The middle of the corner cells are the corners of the tile.
		west, south := g.XLL+g.CellX/2, g.YLL+g.CellY/2
		east, north := g.XLL+(float64(side)-0.5)*g.CellX, g.YLL+(float64(side)-0.5)*g.CellY
		for _, p := range [][2]float64{{west, 9}, {south, 47}, {east, 10}, {north, 48}} {
			if math.Abs(p[0]-p[1]) > 1e-12 {
				t.Errorf("corner at %.15g, want %g", p[0], p[1])
			}
		}
	}
}

func load(t *testing.T, name string) []byte {
	t.Helper()
	b, err := os.ReadFile(filepath.Join(folder, name))
	if err != nil {
		t.Fatal(err)
	}
	return b
}

func rows(t *testing.T, name string) (out [][]float64) {
	t.Helper()
	lines, err := csv.NewReader(bytes.NewReader(load(t, name))).ReadAll()
	if err != nil || len(lines) == 0 {
		t.Fatal(err)
	}
	for _, l := range lines {
		var row []float64
		for _, s := range l {
			v, err := strconv.ParseFloat(s, 64)
			if err != nil {
				t.Fatal(err)
			}
			row = append(row, v)
		}
		out = append(out, row)
	}
	return out
}

func TestAsGDALReads(t *testing.T) {
	z, err := gzip.NewReader(bytes.NewReader(load(t, "N38W028.hgt.gz")))
	if err != nil {
		t.Fatal(err)
	}
	b, err := io.ReadAll(z)
	if err != nil {
		t.Fatal(err)
	}
	got, err := decodeBytes(b, "N38W028.hgt")
	if err != nil {
		t.Fatal(err)
	}
	for _, w := range rows(t, "values.csv") {
		v, ok := got.Grid.At(int(w[0]), int(w[1]))
		if ok != (w[2] != void) || ok && float64(v) != w[2] {
			t.Errorf("column %g, row %g: %g, %t, want %g", w[0], w[1], v, ok, w[2])
		}
	}
	c, g := rows(t, "corners.csv"), got.Grid
	for _, p := range [][2]float64{{g.XLL, c[0][0]}, {g.YLL + g.CellY*float64(g.NRows), c[0][1]}, {g.XLL + g.CellX*float64(g.NCols), c[1][0]}, {g.YLL, c[1][1]}} {
		if math.Abs(p[0]-p[1]) > 1e-7 {
			t.Errorf("corner at %.10g, want %.10g", p[0], p[1])
		}
	}
}

func TestCorner(t *testing.T) {
	for name, want := range map[string][2]int{
		"N47E009.hgt": {9, 47}, "n47e009.hgt": {9, 47}, "S33W070.hgt": {-70, -33}, "N00E000.hgt": {0, 0}, "S90W180.hgt": {-180, -90},
		"N47E009": {9, 47}, "N47E009.SRTMGL1.hgt": {9, 47}, "N47E009_dsm.hgt": {9, 47}, "a/N10E020/N47E009.hgt": {9, 47}, `c:\maps\N47E009.HGT`: {9, 47}, "N89E179.hgt": {179, 89},
	} {
		if lon, lat, err := Corner(name); err != nil || lon != want[0] || lat != want[1] {
			t.Errorf("%s: %d %d, %v", name, lon, lat, err)
		}
	}
	for _, name := range []string{"", "heights.hgt", "N47.hgt", "N47E9.hgt", "N90E009.hgt", "S91E009.hgt", "N47E180.hgt", "N47W181.hgt", "N47E0090.hgt", "X47E009.hgt", "aN47E009.hgt", "N47E009/heights.hgt"} {
		_, _, err := Corner(name)
		var e *formats.Error
		if !errors.As(err, &e) || e.Code != "no_place" || e.Do == "" {
			t.Errorf("%s: error %v", name, err)
		}
	}
}

func TestRefused(t *testing.T) {
	for _, n := range []int{0, 1, 2*coarse*coarse - 1, 2*coarse*coarse + 1, 2 * 1801 * 3601, 2*fine*fine + 2} {
		_, err := Decode(context.Background(), bytes.NewReader(nil), int64(n), Options{File: "N47E009.hgt"})
		var e *formats.Error
		if !errors.As(err, &e) || e.Code != "wrong_size" || e.Do == "" || !strings.Contains(e.What, "2884802") || !strings.Contains(e.What, "25934402") || !strings.Contains(e.What, strconv.Itoa(n)) {
			t.Errorf("%d bytes: error %v", n, err)
		}
	}
	if _, err := decodeBytes(nil, "heights.hgt"); err == nil || !strings.Contains(err.Error(), "N47E009.hgt") {
		t.Errorf("error %v", err)
	}
	var e *formats.Error
	if _, err := Decode(context.Background(), bytes.NewReader(make([]byte, 5000)), 2*coarse*coarse, Options{File: "N47E009.hgt"}); !errors.As(err, &e) || e.Code != "truncated" || e.Where != "row 3" {
		t.Errorf("error %v", err)
	}
	out := errors.New("pulled out")
	if _, err := Decode(context.Background(), failing{out}, 2*coarse*coarse, Options{File: "N47E009.hgt"}); !errors.Is(err, out) || !errors.As(err, &e) || e.Code != "unreadable" {
		t.Errorf("error %v", err)
	}
}

type failing struct{ err error }

func (f failing) ReadAt([]byte, int64) (int, error) { return 0, f.err }

func TestVoidAndCancel(t *testing.T) {
	b := tile(coarse, func(int, int) int16 { return void })
	got, err := decodeBytes(b, "N47E009.hgt")
	if err != nil || got.Missing != coarse*coarse || len(got.Notices) != 1 || got.Notices[0].Code != "mostly_missing" {
		t.Errorf("%d missing, %v, %v", got.Missing, got.Notices, err)
	}
	stop, cancel := context.WithCancel(context.Background())
	defer cancel()
	if _, err := Decode(stop, bytes.NewReader(b), int64(len(b)), Options{File: "N47E009.hgt", Progress: func(n int64) { cancel() }}); !errors.Is(err, context.Canceled) {
		t.Errorf("error %v", err)
	}
}

func FuzzCorner(f *testing.F) {
	f.Add("N47E009.hgt")
	f.Add(`a\S01w170`)
	f.Fuzz(func(t *testing.T, name string) {
		lon, lat, err := Corner(name)
		if err == nil && (lon < -180 || lon > 179 || lat < -90 || lat > 89) {
			t.Fatalf("%q: %d %d", name, lon, lat)
		}
	})
}

func BenchmarkDecode(b *testing.B) {
	in := tile(coarse, func(c, r int) int16 { return int16(c + r) })
	b.SetBytes(int64(len(in)))
	b.ReportAllocs()
	for b.Loop() {
		if _, err := decodeBytes(in, "N47E009.hgt"); err != nil {
			b.Fatal(err)
		}
	}
}
