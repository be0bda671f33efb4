package terrain

import (
	"math"
	"os"
	"path/filepath"
	"testing"

	"groundtally/geo"
	"groundtally/geo/formats/asciigrid"
	"groundtally/geo/raster"
)

// fixture reads a grid of testdata/formats/terrain, see the README there.
func fixture(t *testing.T, name string) *raster.Grid {
	t.Helper()
	f, err := os.Open(filepath.Join("..", "..", "testdata", "formats", "terrain", name+".asc"))
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	res, err := asciigrid.Decode(t.Context(), f, asciigrid.Options{File: name})
	if err != nil {
		t.Fatal(err)
	}
	return res.Grid
}

// fromNorth gives a grid of a file as a grid of the local frame.
func fromNorth(t *testing.T, f *raster.Grid) *Grid {
	t.Helper()
	heights := make([]float32, 0, len(f.Values))
	for r := f.NRows - 1; r >= 0; r-- {
		heights = append(heights, f.Values[r*f.NCols:(r+1)*f.NCols]...)
	}
	g, err := New(geo.XY{X: f.XLL + f.CellX/2, Y: f.YLL + f.CellY/2}, f.CellX, f.NCols, f.NRows, heights, float32(f.NoData))
	if err != nil {
		t.Fatal(err)
	}
	return g
}

// Slope, aspect, ruggedness and shade of every cell against an independent program.
func TestAgainstGDAL(t *testing.T) {
	g := fromNorth(t, fixture(t, "heights"))
	shade, err := g.Shade(t.Context(), 315, 45)
	if err != nil {
		t.Fatal(err)
	}
	for _, c := range []struct {
		name      string
		ours      func(c, r int) (float64, bool)
		tolerance float64
		turn      float64 // values this far apart are the same
	}{
		{"slope", g.SlopeDeg, 1e-3, 0},
		{"aspect", g.AspectDeg, 1e-3, 360},
		{"ruggedness", g.RoughnessM, 1e-4, 0},
		// A byte that is rounded may fall to either side.
		{"shade", func(c, r int) (float64, bool) { s := shade[r*g.NX+c]; return float64(s), s != Unshaded }, 1, 0},
	} {
		theirs := fixture(t, c.name)
		if theirs.NCols != g.NX || theirs.NRows != g.NY {
			t.Fatalf("%s: %d by %d cells", c.name, theirs.NCols, theirs.NRows)
		}
		compared, worst := 0, 0.0
		for r := range g.NY {
			for col := range g.NX {
				want, known := theirs.At(col, g.NY-1-r)
				got, ok := c.ours(col, r)
				if ok != known {
					t.Errorf("%s of column %d, row %d from south is known: %v, theirs: %v", c.name, col, r, ok, known)
					continue
				}
				if !ok {
					continue
				}
				d := math.Abs(got - float64(want))
				if c.turn > 0 {
					d = math.Abs(math.Remainder(d, c.turn))
				}
				if compared++; d > c.tolerance {
					t.Errorf("%s of column %d, row %d from south: %v, theirs %v", c.name, col, r, got, want)
				}
				worst = math.Max(worst, d)
			}
		}
		t.Logf("%s: %d cells, at most %.2g apart", c.name, compared, worst)
		if compared < 500 {
			t.Errorf("%s: only %d cells compared", c.name, compared)
		}
	}
}
