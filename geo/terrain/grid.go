package terrain

import (
	"fmt"
	"math"

	"groundtally/geo"
)

// Grid holds heights at the centres of square cells of the local frame, rows from south to north, each
// from west to east. It is read-only once made, so goroutines may share it.
type Grid struct {
	Origin  geo.XY // centre of the south-western cell
	CellM   float64
	NX, NY  int
	HeightM []float32 // NX·NY heights in metres; a missing one is NoData or not a number
	NoData  float32
}

// maxCells bounds the memory of a grid to 800 MB.
const maxCells = 200e6

// New gives a grid after a look at its shape.
func New(origin geo.XY, cellM float64, nx, ny int, heightM []float32, noData float32) (*Grid, error) {
	g := &Grid{Origin: origin, CellM: cellM, NX: nx, NY: ny, HeightM: heightM, NoData: noData}
	if err := g.check(); err != nil {
		return nil, err
	}
	if len(heightM) != nx*ny {
		return nil, fmt.Errorf("a terrain grid of %d by %d cells has %d heights", nx, ny, len(heightM))
	}
	return g, nil
}

func (g *Grid) check() error {
	switch {
	case !g.Origin.Finite():
		return fmt.Errorf("terrain grid: the origin %v is not finite", g.Origin)
	case !(g.CellM > 0) || math.IsInf(g.CellM, 0):
		return fmt.Errorf("terrain grid: the cell size %v m must be above 0", g.CellM)
	case g.NX < 1 || g.NY < 1 || float64(g.NX)*float64(g.NY) > maxCells:
		return fmt.Errorf("terrain grid: %d by %d cells, want 1 to %.0f in all", g.NX, g.NY, float64(maxCells))
	}
	return nil
}

// Fill makes a grid by asking height at every cell's centre; it gives false where there is none. This is
// how heights of another system come into the local frame.
func Fill(origin geo.XY, cellM float64, nx, ny int, height func(geo.XY) (float64, bool)) (*Grid, error) {
	g := &Grid{Origin: origin, CellM: cellM, NX: nx, NY: ny, NoData: -math.MaxFloat32}
	if err := g.check(); err != nil {
		return nil, err
	}
	g.HeightM = make([]float32, nx*ny)
	for r := range ny {
		for c := range nx {
			h, ok := height(g.Centre(c, r))
			if !ok || math.IsNaN(h) || math.Abs(h) > math.MaxFloat32 {
				g.HeightM[r*nx+c] = g.NoData
				continue
			}
			g.HeightM[r*nx+c] = float32(h)
		}
	}
	return g, nil
}

// Centre gives the centre of the cell in column c, row r.
func (g *Grid) Centre(c, r int) geo.XY {
	return geo.XY{X: g.Origin.X + float64(float64(c)*g.CellM), Y: g.Origin.Y + float64(float64(r)*g.CellM)}
}

// Extent gives the extent of all cells.
func (g *Grid) Extent() geo.Extent {
	ne := g.Centre(g.NX-1, g.NY-1)
	return geo.Extent{MinX: g.Origin.X, MinY: g.Origin.Y, MaxX: ne.X, MaxY: ne.Y}.Grow(g.CellM / 2)
}

// Height gives the height of a cell; false where it is missing or outside the grid.
func (g *Grid) Height(c, r int) (float64, bool) {
	if c < 0 || r < 0 || c >= g.NX || r >= g.NY {
		return 0, false
	}
	h := g.HeightM[r*g.NX+c]
	if h == g.NoData || h != h || math.IsInf(float64(h), 0) {
		return 0, false
	}
	return float64(h), true
}

// cell gives the column, row of the cell that holds p. Cells hold their western, southern edges.
func (g *Grid) cell(p geo.XY) (c, r int) {
	return int(math.Floor((p.X-g.Origin.X)/g.CellM + 0.5)), int(math.Floor((p.Y-g.Origin.Y)/g.CellM + 0.5))
}

// Sample gives the height at p, bilinear between the four nearest cell centres; in the outer half cell
// the outermost centres hold on. It gives false outside the grid, or where a centre that has weight is
// missing.
//
//	z = (1−u)(1−v)·z₀₀ + u(1−v)·z₁₀ + (1−u)v·z₀₁ + uv·z₁₁
//
// with u, v the way from the south-western centre in cells, 0 to 1.
func (g *Grid) Sample(p geo.XY) (float64, bool) {
	x, y := (p.X-g.Origin.X)/g.CellM, (p.Y-g.Origin.Y)/g.CellM
	if !(x >= -0.5 && y >= -0.5 && x <= float64(g.NX)-0.5 && y <= float64(g.NY)-0.5) {
		return 0, false
	}
	x, y = math.Max(0, math.Min(x, float64(g.NX-1))), math.Max(0, math.Min(y, float64(g.NY-1)))
	c, r := int(x), int(y)
	u, v := x-float64(c), y-float64(r)
	sum := 0.0
	for _, n := range [4]struct {
		c, r int
		w    float64
	}{{c, r, (1 - u) * (1 - v)}, {c + 1, r, u * (1 - v)}, {c, r + 1, (1 - u) * v}, {c + 1, r + 1, u * v}} {
		if n.w == 0 {
			continue
		}
		h, ok := g.Height(n.c, n.r)
		if !ok {
			return 0, false
		}
		sum += float64(n.w * h)
	}
	return sum, true
}

// nine fills in the heights of a cell and its eight neighbours, rows from south to north, each from west to
// east; false when one of them is missing, as at the edge of the grid.
func (g *Grid) nine(c, r int, z *[3][3]float64) bool {
	if c < 1 || r < 1 || c >= g.NX-1 || r >= g.NY-1 {
		return false
	}
	for j := range z {
		from := (r+j-1)*g.NX + c - 1
		row := g.HeightM[from : from+3 : from+3]
		for i := range z[j] {
			h := row[i]
			if h == g.NoData || h-h != 0 { // infinite or not a number
				return false
			}
			z[j][i] = float64(h)
		}
	}
	return true
}

// horn gives ∂z/∂x, ∂z/∂y by Horn's differences.
func horn(z *[3][3]float64, cellM float64) (dzdx, dzdy float64) {
	dzdx = ((z[0][2] + 2*z[1][2] + z[2][2]) - (z[0][0] + 2*z[1][0] + z[2][0])) / (8 * cellM)
	dzdy = ((z[2][0] + 2*z[2][1] + z[2][2]) - (z[0][0] + 2*z[0][1] + z[0][2])) / (8 * cellM)
	return dzdx, dzdy
}

// gradient gives ∂z/∂x, ∂z/∂y of a cell by Horn's differences over its eight neighbours; false when one
// of the nine is missing, as at the edge of the grid.
func (g *Grid) gradient(c, r int) (dzdx, dzdy float64, ok bool) {
	var z [3][3]float64
	if !g.nine(c, r, &z) {
		return 0, 0, false
	}
	dzdx, dzdy = horn(&z, g.CellM)
	return dzdx, dzdy, true
}

// slopeDeg gives the slope of a gradient in degrees.
func slopeDeg(p, q float64) float64 { return math.Atan(math.Hypot(p, q)) * 180 / math.Pi }

// SlopeDeg gives the slope of a cell in degrees, 0 to 90.
//
//	slope = atan √((∂z/∂x)² + (∂z/∂y)²)
//	∂z/∂x = [(z_NE + 2 z_E + z_SE) − (z_NW + 2 z_W + z_SW)] / 8·CellM, likewise ∂z/∂y to the north
//
// Cells at the edge of the grid or beside a missing height have no slope. Source: Horn 1981, "Hill
// shading and the reflectance map", Proceedings of the IEEE 69.
func (g *Grid) SlopeDeg(c, r int) (float64, bool) {
	p, q, ok := g.gradient(c, r)
	return slopeDeg(p, q), ok
}

// AspectDeg gives the direction in which a cell falls, in degrees clockwise from grid north, 0 to under
// 360; false for a cell without a slope or a level one.
//
//	aspect = atan2(−∂z/∂x, −∂z/∂y)
func (g *Grid) AspectDeg(c, r int) (float64, bool) {
	p, q, ok := g.gradient(c, r)
	if !ok || (p == 0 && q == 0) {
		return 0, false
	}
	return bearingDeg(-p, -q), true
}

// bearingDeg gives the direction of a vector clockwise from north, 0 to under 360.
func bearingDeg(east, north float64) float64 {
	a := math.Atan2(east, north) * 180 / math.Pi
	if a < 0 {
		a += 360
	}
	if a >= 360 {
		a = 0
	}
	return a
}

// RoughnessM gives the terrain ruggedness index of a cell in metres, 0 or more.
//
//	TRI = √ Σ (z_i − z)²  over the eight neighbours i
//
// It grows with the size of cells, so figures are comparable on one grid only; on an even slope of gradient
// s it is √6·s·CellM whichever way that falls. Cells at the edge of the grid or beside a missing height have
// none. Source: Riley, DeGloria, Elliot 1999, "A terrain ruggedness index that
// quantifies topographic heterogeneity", Intermountain Journal of Sciences 5.
func (g *Grid) RoughnessM(c, r int) (float64, bool) {
	var z [3][3]float64
	if !g.nine(c, r, &z) {
		return 0, false
	}
	return ruggedness(&z), true
}

func ruggedness(z *[3][3]float64) float64 {
	sum := 0.0
	for j := range z {
		for i := range z[j] {
			d := z[j][i] - z[1][1]
			sum += float64(d * d)
		}
	}
	return math.Sqrt(sum)
}

// SlopeAtDeg gives the slope of the cell that holds p.
func (g *Grid) SlopeAtDeg(p geo.XY) (float64, bool) {
	if !g.holds(p) {
		return 0, false
	}
	c, r := g.cell(p)
	return g.SlopeDeg(c, r)
}

// AspectAtDeg gives the aspect of the cell that holds p.
func (g *Grid) AspectAtDeg(p geo.XY) (float64, bool) {
	if !g.holds(p) {
		return 0, false
	}
	c, r := g.cell(p)
	return g.AspectDeg(c, r)
}

func (g *Grid) holds(p geo.XY) bool {
	e := g.Extent()
	return p.X >= e.MinX && p.X <= e.MaxX && p.Y >= e.MinY && p.Y <= e.MaxY
}
