package tiles

import (
	"context"
	"math"
	"slices"

	"groundtally/geo"
	"groundtally/geo/raster"
	"groundtally/geo/terrain"
)

// The light of the relief: from the north-west, half-way up, as relief is read rightly (Horn 1981).
const (
	lightAzimuthDeg  = 315
	lightAltitudeDeg = 45
	levelShade       = 181 // of level ground in that light: 1 + 254·sin 45°, rounded
)

// maxReliefCells bounds the memory of a relief to 2 MB, with its coarse copies to 2.8 MB.
const maxReliefCells = 2 << 20

// Placing relates positions to the coordinates of a file, as a crs.Transform does.
type Placing interface {
	Forward(x, y float64) (geo.LonLat, error)
	Inverse(geo.LonLat) (x, y float64, err error)
}

// Relief is the light on the slopes of a district's terrain, a byte a cell. It never changes, so any number
// of goroutines may use it.
type Relief struct {
	plane  Plane
	levels []reliefLevel
}

// reliefLevel is a copy of the relief, each with half as many cells to a side as the one before.
type reliefLevel struct {
	cellM  float64
	nw     geo.XY // centre of the first cell
	nx, ny int
	shade  []uint8 // rows from north to south, each from west to east; levelShade where nothing is known
}

// NewRelief lights the terrain of a file around a ground. Cells are as fine as those of the file, or coarser
// where those would be more than two million. It gives nil when the file has nothing there, and the context's
// error when stopped. Cells whose place the file's system does not know stay without relief.
func NewRelief(ctx context.Context, g *Ground, heights *raster.Grid, at Placing) (*Relief, error) {
	box, cellM := reliefBox(g, heights, at)
	if box.Empty() {
		return nil, nil
	}
	cellM = math.Max(cellM, math.Sqrt((box.MaxX-box.MinX)*(box.MaxY-box.MinY)/maxReliefCells))
	nx, ny := max(1, int((box.MaxX-box.MinX)/cellM)), max(1, int((box.MaxY-box.MinY)/cellM))
	// North row first, as the file has it: a grid of cells of size one, counted from its upper left corner.
	own, err := terrain.New(geo.XY{X: 0.5, Y: 0.5}, 1, heights.NCols, heights.NRows, heights.Values, float32(heights.NoData))
	if err != nil {
		return nil, err
	}
	origin := geo.XY{X: box.MinX + cellM/2, Y: box.MinY + cellM/2}
	nodes, err := newNodes(ctx, g.plane, at, func(x, y float64) geo.XY {
		return geo.XY{X: (x - heights.XLL) / heights.CellX, Y: float64(heights.NRows) - (y-heights.YLL)/heights.CellY}
	}, origin, cellM, nx, ny)
	if err != nil {
		return nil, err
	}
	var stopped error
	local, err := terrain.Fill(origin, cellM, nx, ny, func(p geo.XY) (float64, bool) {
		if p.X == origin.X && stopped == nil {
			stopped = ctx.Err()
		}
		if stopped != nil {
			return 0, false
		}
		return own.Sample(nodes.place(p))
	})
	if err == nil {
		err = stopped
	}
	if err != nil {
		return nil, err
	}
	shade, err := local.Shade(ctx, lightAzimuthDeg, lightAltitudeDeg)
	if err != nil {
		return nil, err
	}
	r := &Relief{plane: g.plane}
	one := reliefLevel{cellM: cellM, nw: local.Centre(0, ny-1), nx: nx, ny: ny, shade: make([]uint8, 0, nx*ny)}
	plain := true
	for row := range ny {
		one.shade = append(one.shade, shade[(ny-1-row)*nx:(ny-row)*nx]...)
	}
	for i, v := range one.shade {
		if v == terrain.Unshaded {
			one.shade[i] = levelShade
		}
		plain = plain && one.shade[i] == levelShade
	}
	if plain {
		return nil, nil
	}
	for r.levels = append(r.levels, one); one.nx > 1 && one.ny > 1; r.levels = append(r.levels, one) {
		one = one.halved()
	}
	return r, nil
}

// around gives what of a file of so many columns and rows lies around the ground; to brings these to the plane.
func (g *Ground) around(columns, rows float64, to func(column, row float64) (geo.XY, bool)) geo.Extent {
	box := geo.EmptyExtent()
	const pieces = 16 // of a side, which may be bent in the plane
	for i := range pieces + 1 {
		f := float64(i) / pieces
		for _, c := range [...][2]float64{{f * columns, 0}, {f * columns, rows}, {0, f * rows}, {columns, f * rows}} {
			if q, ok := to(c[0], c[1]); ok {
				box = box.Add(q)
			}
		}
	}
	near := g.near()
	if box.Empty() || !box.Meets(near) {
		return geo.EmptyExtent()
	}
	return geo.Extent{
		MinX: math.Max(box.MinX, near.MinX), MinY: math.Max(box.MinY, near.MinY),
		MaxX: math.Min(box.MaxX, near.MaxX), MaxY: math.Min(box.MaxY, near.MaxY),
	}
}

// reliefBox gives what of a file lies around a ground in its plane, with the lesser side of its cells.
func reliefBox(g *Ground, heights *raster.Grid, at Placing) (box geo.Extent, cellM float64) {
	to := func(col, row float64) (geo.XY, bool) {
		p, err := at.Forward(heights.XLL+col*heights.CellX, heights.YLL+(float64(heights.NRows)-row)*heights.CellY)
		if err != nil {
			return geo.XY{}, false
		}
		q := g.plane.To(p)
		return q, q.Finite()
	}
	w, h := float64(heights.NCols), float64(heights.NRows)
	if box = g.around(w, h, to); box.Empty() {
		return box, 0
	}
	// Cells are measured in the middle of what is shown.
	x, y, err := at.Inverse(g.plane.From(box.Centre()))
	if err != nil {
		return geo.EmptyExtent(), 0
	}
	col, row := (x-heights.XLL)/heights.CellX, float64(heights.NRows)-(y-heights.YLL)/heights.CellY
	a, okA := to(col-0.5, row-0.5)
	b, okB := to(col+0.5, row-0.5)
	c, okC := to(col-0.5, row+0.5)
	cellM = math.Min(a.Dist(b), a.Dist(c))
	if !okA || !okB || !okC || !(cellM > 0) || box.MaxX-box.MinX < 3*cellM || box.MaxY-box.MinY < 3*cellM {
		return geo.EmptyExtent(), 0
	}
	return box, cellM
}

// nodes are places of the plane in the columns and rows of a file, every nodeCells cells. Between them the way
// from one to the other is straight to a hundredth of a cell, and asking the file's system for every cell would
// take a second.
type nodes struct {
	origin geo.XY
	stepM  float64
	nx     int
	at     []geo.XY // columns to the east, rows to the south
}

const nodeCells = 16

// newNodes places nodes for nx by ny cells from an origin to the north-east. inFile gives the columns and rows of
// a place in the file's own coordinates.
func newNodes(ctx context.Context, plane Plane, at Placing, inFile func(x, y float64) geo.XY, origin geo.XY, cellM float64, nx, ny int) (*nodes, error) {
	n := &nodes{origin: origin, stepM: cellM * nodeCells, nx: nx/nodeCells + 2}
	rows := ny/nodeCells + 2
	n.at = make([]geo.XY, 0, n.nx*rows)
	for j := range rows {
		if err := ctx.Err(); err != nil {
			return nil, err
		}
		for i := range n.nx {
			p := plane.From(geo.XY{X: origin.X + float64(i)*n.stepM, Y: origin.Y + float64(j)*n.stepM})
			x, y, err := at.Inverse(p)
			if err != nil {
				x, y = math.NaN(), math.NaN() // nothing is sampled there
			}
			n.at = append(n.at, inFile(x, y))
		}
	}
	return n, nil
}

// place gives where a place lies in the file.
func (n *nodes) place(p geo.XY) geo.XY {
	x, y := (p.X-n.origin.X)/n.stepM, (p.Y-n.origin.Y)/n.stepM
	i, j := int(x), int(y)
	u, v := x-float64(i), y-float64(j)
	a := n.at[j*n.nx+i : j*n.nx+i+2]
	b := n.at[(j+1)*n.nx+i : (j+1)*n.nx+i+2]
	return between(between(a[0], a[1], u), between(b[0], b[1], u), v)
}

// halved gives the relief on cells of twice the side.
func (l reliefLevel) halved() reliefLevel {
	h := reliefLevel{
		cellM: 2 * l.cellM, nx: l.nx / 2, ny: l.ny / 2,
		nw: geo.XY{X: l.nw.X + l.cellM/2, Y: l.nw.Y - l.cellM/2},
	}
	h.shade = make([]uint8, 0, h.nx*h.ny)
	for r := range h.ny {
		above, below := l.shade[2*r*l.nx:(2*r+1)*l.nx], l.shade[(2*r+1)*l.nx:(2*r+2)*l.nx]
		for c := range h.nx {
			h.shade = append(h.shade, uint8((int(above[2*c])+int(above[2*c+1])+int(below[2*c])+int(below[2*c+1])+2)/4))
		}
	}
	return h
}

// Bytes gives the memory that the relief holds.
func (r *Relief) Bytes() int64 {
	n := 0
	for _, l := range r.levels {
		n += cap(l.shade)
	}
	return int64(n)
}

// at gives the copy whose cells are the largest that are no larger than a pixel.
func (r *Relief) at(mPerPx float64) *reliefLevel {
	best := &r.levels[0]
	for i := range r.levels {
		if r.levels[i].cellM <= mPerPx {
			best = &r.levels[i]
		}
	}
	return best
}

// How strong the relief is.
const (
	fullSlope     = 0.15 // gradient towards the light from which on the relief is as strong as it gets
	reliefParcels = 0.25 // of its strength over parcels, whose colours must stay as the legend has them
)

// reliefInks gives the ink of every shade.
func reliefInks(look Look, strength float64) (inks [256]ink) {
	shadow, light := inkOf(opaque(look.Shadow)), inkOf(opaque(look.Light))
	for v := range inks {
		// Near level ground the light changes by the gradient towards it, as its altitude is 45 degrees.
		d := (float64(v) - levelShade) / levelShade / fullSlope
		c, most := light, look.Light.A
		if d < 0 {
			c, most = shadow, look.Shadow.A
		}
		inks[v] = c.part(part(uint8(math.Min(1, math.Abs(d))*strength*float64(most) + 0.5)))
	}
	return inks
}

// relief lays light and shade under everything that is drawn over the ground.
func (d *drawing) relief() {
	r := d.style.Relief
	if r == nil || r.plane != d.g.plane || slices.Contains(d.style.Hidden, "terrain") {
		return
	}
	p := d.p
	l := r.at(p.mPerPx)
	// Places of pixels come from the level's own count, so that tiles meet without a seam.
	columns := newCellLine(p.rect.Min.X, p.w, l.nw.X, p.mPerPx, l.cellM, l.nx)
	rows := newCellLine(p.rect.Min.Y, p.rect.Dy(), -l.nw.Y, p.mPerPx, l.cellM, l.ny)
	if columns.from >= columns.to || rows.from >= rows.to {
		return
	}
	ground, parcels := reliefInks(d.look, 1), reliefInks(d.look, reliefParcels)
	first := int(columns.cell[columns.from])
	last := min(int(columns.cell[columns.to-1])+1, l.nx-1)
	var any ink
	line := make([]uint32, last-first+2) // a row of cells between two of the relief, in 1/256
	for y := rows.from; y < rows.to; y++ {
		row, f := int(rows.cell[y]), rows.part[y]
		above := l.shade[row*l.nx : (row+1)*l.nx]
		below := above
		if row+1 < l.ny {
			below = l.shade[(row+1)*l.nx : (row+2)*l.nx]
		}
		for i := first; i <= last; i++ {
			line[i-first] = uint32(above[i])*(256-f) + uint32(below[i])*f
		}
		line[last-first+1] = line[last-first]
		out := p.overlay[y*p.w : (y+1)*p.w]
		var number []uint32
		if d.t.parcel != nil {
			number = d.t.parcel[y*p.w : (y+1)*p.w]
		}
		for x := columns.from; x < columns.to; x++ {
			if out[x] != 0 {
				continue // a picture of the ground has its own light
			}
			i, u := int(columns.cell[x])-first, columns.part[x]
			v := uint8((line[i]*(256-u) + line[i+1]*u + 1<<15) >> 16)
			c := ground[v]
			if number != nil && number[x] != 0 {
				c = parcels[v]
			}
			out[x] = c
			any |= c
		}
	}
	p.drawn = p.drawn || any != 0 // the sea needs no overlay
}

// cellLine says which cells lie beside the pixels of a line.
type cellLine struct {
	from, to int      // pixels that lie within the cells
	cell     []int32  // of the pixel: the cell before it
	part     []uint32 // of the pixel: how far it is to the next cell, in 1/256
}

// newCellLine places n pixels, the first at a count of pixels from the plane's origin, among cells whose
// first centre lies at a place in metres.
func newCellLine(first, n int, centre, mPerPx, cellM float64, cells int) cellLine {
	l := cellLine{from: n, cell: make([]int32, n), part: make([]uint32, n)}
	for i := range n {
		at := ((float64(first+i)+0.5)*mPerPx - centre) / cellM
		if at < -0.5 || at > float64(cells)-0.5 {
			continue
		}
		l.from, l.to = min(l.from, i), i+1
		at = math.Max(0, math.Min(at, float64(cells-1)))
		l.cell[i] = int32(at)
		l.part[i] = uint32((at - math.Floor(at)) * 256)
	}
	return l
}
