package terrain

import (
	"fmt"
	"math"

	"groundtally/geo"
	"groundtally/geo/measure"
)

// Summary describes the terrain of polygons, every cell weighed by the area of it that they hold.
type Summary struct {
	AreaM2 float64 // of the polygons, as summed

	MeanM, MinM, MaxM float64 // heights of the cells met
	HeightShare       float64 // share of the area with a height; below 1 the figures stand for that share
	HasHeight         bool    // whether any height is known

	MeanSlopeDeg float64
	MaxSlopeDeg  float64 // of the cells met
	SteepShare   float64 // share steeper than the limit, of the area with a slope
	SlopeShare   float64 // share of the area with a slope
	HasSlope     bool

	// RoughnessM is the mean ruggedness index, see Grid.RoughnessM, of the area with a slope. It stands for
	// this size of cells only.
	RoughnessM float64

	// MeanAspectDeg is the direction of the sum of the unit vectors of aspect, clockwise from grid north, 0 to
	// under 360. AspectLength is that sum by the area with an aspect: 1 when all of it falls one way, near 0
	// when the ways cancel out, and then the mean says nothing of the site. Source: Mardia and Jupp 2000,
	// "Directional statistics", section 2.2.
	MeanAspectDeg float64
	AspectLength  float64
	AspectShare   float64 // share of the area with an aspect; level cells have none
	HasAspect     bool    // whether there is a mean: some area has an aspect, and the ways do not cancel out
}

// linesPerCell is how many level lines measure the share of a cell inside a polygon; within a line the
// lengths are exact.
const linesPerCell = 8

// Over summarises the terrain of polygons whose parts do not overlap. A cell is steep when its slope is
// above limitDeg. Areas come from level lines, at least 8 to a cell row, at least 32 to a polygon: true to
// about a thousandth. Polygons that reach beyond the grid lower HeightShare, SlopeShare.
func (g *Grid) Over(polygons geo.XYGeometry, limitDeg float64) (Summary, error) {
	var s Summary
	if polygons.Kind != geo.Polygons || polygons.Empty() {
		return s, fmt.Errorf("terrain over a %v: want polygons", polygons.Kind)
	}
	if math.IsNaN(limitDeg) || limitDeg < 0 || limitDeg > 90 {
		return s, fmt.Errorf("slope limit %v degrees: want 0 to 90", limitDeg)
	}
	finite := true
	polygons.Each(func(p geo.XY) { finite = finite && p.Finite() })
	if !finite {
		return s, fmt.Errorf("terrain over polygons with a position that is not finite")
	}
	slicer := measure.NewSlicer(polygons)
	x := slicer.Extent()
	lines := math.Max(32, math.Ceil((x.MaxY-x.MinY)/g.CellM*linesPerCell))
	if lines > 1e7 {
		return s, fmt.Errorf("terrain over polygons %.0f m high with cells of %v m: too large", x.MaxY-x.MinY, g.CellM)
	}
	h := (x.MaxY - x.MinY) / lines
	left := g.Origin.X - g.CellM/2
	var buf []measure.Span
	var known, sloped, steep, sumZ, sumSlope float64
	var sumRough, turned, east, north float64
	var z [3][3]float64
	s.MinM, s.MaxM = math.Inf(1), math.Inf(-1)
	for k := range int(lines) {
		y := x.MinY + float64((float64(k)+0.5)*h)
		buf = slicer.At(y, buf[:0])
		_, row := g.cell(geo.XY{X: g.Origin.X, Y: y})
		for _, sp := range buf {
			s.AreaM2 += (sp.Hi - sp.Lo) * h
			if row < 0 || row >= g.NY {
				continue
			}
			from := max(0, int(math.Floor((sp.Lo-left)/g.CellM)))
			for c := from; c < g.NX; c++ {
				west := left + float64(float64(c)*g.CellM)
				if west >= sp.Hi {
					break
				}
				w := (math.Min(sp.Hi, west+g.CellM) - math.Max(sp.Lo, west)) * h
				if w <= 0 {
					continue
				}
				if z, ok := g.Height(c, row); ok {
					known += w
					sumZ += float64(w * z)
					s.MinM, s.MaxM = math.Min(s.MinM, z), math.Max(s.MaxM, z)
				}
				if g.nine(c, row, &z) {
					p, q := horn(&z, g.CellM)
					a := slopeDeg(p, q)
					sloped += w
					sumSlope += float64(w * a)
					s.MaxSlopeDeg = math.Max(s.MaxSlopeDeg, a)
					if a > limitDeg {
						steep += w
					}
					sumRough += float64(w * ruggedness(&z))
					if steepness := math.Hypot(p, q); steepness > 0 {
						turned += w
						east -= float64(w * p / steepness)
						north -= float64(w * q / steepness)
					}
				}
			}
		}
	}
	if s.AreaM2 <= 0 {
		return Summary{}, fmt.Errorf("terrain over polygons without area")
	}
	if s.HasHeight = known > 0; s.HasHeight {
		s.MeanM, s.HeightShare = sumZ/known, math.Min(1, known/s.AreaM2)
	} else {
		s.MinM, s.MaxM = 0, 0
	}
	if s.HasSlope = sloped > 0; s.HasSlope {
		s.MeanSlopeDeg, s.SteepShare, s.SlopeShare = sumSlope/sloped, steep/sloped, math.Min(1, sloped/s.AreaM2)
		s.RoughnessM = sumRough / sloped
	}
	if turned > 0 {
		s.AspectShare = math.Min(1, turned/s.AreaM2)
		s.AspectLength = math.Min(1, math.Hypot(east, north)/turned)
		// Below this the direction is what rounding left.
		if s.HasAspect = s.AspectLength > 1e-9; s.HasAspect {
			s.MeanAspectDeg = bearingDeg(east, north)
		} else {
			s.AspectLength = 0
		}
	}
	return s, nil
}

// Steep gives the cells within the extent whose slope is above limitDeg as polygons for a rule that takes
// land; see blocks. Cells without a slope are left out.
func (g *Grid) Steep(within geo.Extent, limitDeg float64) (geo.XYGeometry, error) {
	if math.IsNaN(limitDeg) || limitDeg < 0 || limitDeg > 90 {
		return geo.XYGeometry{Kind: geo.Polygons}, fmt.Errorf("slope limit %v degrees: want 0 to 90", limitDeg)
	}
	return g.blocks(within, func(c, r int) bool {
		a, ok := g.SlopeDeg(c, r)
		return ok && a > limitDeg
	}), nil
}

// Turned gives the cells within the extent that fall in a direction outside of those from fromDeg clockwise
// to toDeg, both clockwise from grid north, where the slope is above slopeDeg. Level cells, cells without a
// slope are left out; a sweep of 360 degrees or more takes nothing.
func (g *Grid) Turned(within geo.Extent, fromDeg, toDeg, slopeDeg float64) (geo.XYGeometry, error) {
	for _, x := range []float64{fromDeg, toDeg, slopeDeg} {
		if math.IsNaN(x) || math.IsInf(x, 0) {
			return geo.XYGeometry{Kind: geo.Polygons}, fmt.Errorf("aspect from %v to %v degrees above a slope of %v: want numbers", fromDeg, toDeg, slopeDeg)
		}
	}
	if toDeg-fromDeg >= 360 {
		return geo.XYGeometry{Kind: geo.Polygons}, nil
	}
	sweep := clockwise(toDeg - fromDeg)
	return g.blocks(within, func(c, r int) bool {
		if s, ok := g.SlopeDeg(c, r); !ok || s <= slopeDeg {
			return false
		}
		a, ok := g.AspectDeg(c, r)
		return ok && clockwise(a-fromDeg) > sweep
	}), nil
}

// clockwise brings an angle into 0 to under 360 degrees.
func clockwise(deg float64) float64 {
	if deg = math.Mod(deg, 360); deg < 0 {
		deg += 360
	}
	return deg
}

// Above gives the cells within the extent whose height is above heightM, as polygons; see blocks. Cells
// without a height are left out.
func (g *Grid) Above(within geo.Extent, heightM float64) (geo.XYGeometry, error) {
	if math.IsNaN(heightM) {
		return geo.XYGeometry{Kind: geo.Polygons}, fmt.Errorf("height limit %v m: want a number", heightM)
	}
	return g.blocks(within, func(c, r int) bool {
		h, ok := g.Height(c, r)
		return ok && h > heightM
	}), nil
}

// blocks gives the cells within the extent that are taken as polygons: cells side by side are merged to
// rows, equal rows above each other to blocks. Blocks may share edges; the overlay joins them.
func (g *Grid) blocks(within geo.Extent, takes func(c, r int) bool) geo.XYGeometry {
	out := geo.XYGeometry{Kind: geo.Polygons}
	c0, r0, c1, r1, ok := g.Window(within)
	if !ok {
		return out
	}
	type run struct{ c0, c1, r0 int } // columns c0 to c1, begun in row r0
	var open []run                    // blocks that the last row could continue, by rising c0
	end := func(b run, r int) {
		sw, ne := g.Centre(b.c0, b.r0), g.Centre(b.c1, r)
		d := g.CellM / 2
		w, s, o, n := sw.X-d, sw.Y-d, ne.X+d, ne.Y+d
		out.Parts = append(out.Parts, [][]geo.XY{{{X: w, Y: s}, {X: o, Y: s}, {X: o, Y: n}, {X: w, Y: n}, {X: w, Y: s}}})
	}
	for r := r0; r <= r1; r++ {
		var row []run
		for c := c0; c <= c1; c++ {
			if !takes(c, r) {
				continue
			}
			if n := len(row); n > 0 && row[n-1].c1 == c-1 {
				row[n-1].c1 = c
				continue
			}
			row = append(row, run{c, c, r})
		}
		i := 0
		for _, b := range open {
			for i < len(row) && row[i].c0 < b.c0 {
				i++
			}
			if i < len(row) && row[i].c0 == b.c0 && row[i].c1 == b.c1 {
				row[i].r0 = b.r0
				continue
			}
			end(b, r-1)
		}
		open = row
	}
	for _, b := range open {
		end(b, r1)
	}
	return out
}

// Window gives the columns, rows of the cells that meet an extent; false when none does.
func (g *Grid) Window(within geo.Extent) (c0, r0, c1, r1 int, ok bool) {
	e := g.Extent()
	if within.Empty() || !within.Meets(e) {
		return 0, 0, 0, 0, false
	}
	c0, r0 = g.cell(geo.XY{X: math.Max(within.MinX, e.MinX), Y: math.Max(within.MinY, e.MinY)})
	c1, r1 = g.cell(geo.XY{X: math.Min(within.MaxX, e.MaxX), Y: math.Min(within.MaxY, e.MaxY)})
	return c0, r0, min(c1, g.NX-1), min(r1, g.NY-1), true
}
