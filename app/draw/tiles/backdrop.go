package tiles

import (
	"context"
	"image"
	"image/color"
	"math"

	"groundtally/geo"
	"groundtally/geo/formats/worldfile"
)

// maxBackdropCells bounds the memory of a backdrop to 24 MB, with its coarser copies to 32 MB. While it is made,
// one picture at a time is held besides in its full size.
const maxBackdropCells = 6 << 20

// Sheet is a picture of the ground with its place.
type Sheet struct {
	Info worldfile.Info // with its place, from the picture or from a world file
	At   Placing
	Open func() (image.Image, error)
}

// Backdrop is what pictures show of a district, in its plane. It never changes, so any number of goroutines may
// use it.
type Backdrop struct {
	plane  Plane
	levels []backdropLevel
}

// backdropLevel is a copy of the backdrop, each with half as many cells to a side as the one before.
type backdropLevel struct {
	cellM  float64
	nw     geo.XY // centre of the first cell
	nx, ny int
	cell   []ink // rows from north to south, each from west to east; opacity 0 where no picture is
}

// NewBackdrop brings pictures into a ground's plane, later ones over earlier ones. Cells are as fine as the finest
// picture, or coarser where those would be more than six million. It gives nil when no picture lies there, and
// the context's error when stopped.
func NewBackdrop(ctx context.Context, g *Ground, sheets []Sheet) (*Backdrop, error) {
	box, cellM := geo.EmptyExtent(), math.Inf(1)
	var near []Sheet
	for _, s := range sheets {
		b, m := s.box(g)
		if b.Empty() {
			continue
		}
		near, box, cellM = append(near, s), box.Union(b), math.Min(cellM, m)
	}
	if box.Empty() {
		return nil, nil
	}
	cellM = math.Max(cellM, math.Sqrt((box.MaxX-box.MinX)*(box.MaxY-box.MinY)/maxBackdropCells))
	one := backdropLevel{cellM: cellM, nx: max(1, int((box.MaxX-box.MinX)/cellM)), ny: max(1, int((box.MaxY-box.MinY)/cellM))}
	one.nw = geo.XY{X: box.MinX + cellM/2, Y: box.MinY + (float64(one.ny)-0.5)*cellM}
	one.cell = make([]ink, one.nx*one.ny)
	for _, s := range near {
		if err := one.fill(ctx, g.plane, s); err != nil {
			return nil, err
		}
	}
	out := &Backdrop{plane: g.plane}
	for out.levels = append(out.levels, one); one.nx > 1 && one.ny > 1; out.levels = append(out.levels, one) {
		one = one.halved()
	}
	return out, nil
}

// box gives what of a picture lies around a ground in its plane, with the lesser side of its pixels.
func (s Sheet) box(g *Ground) (box geo.Extent, pixelM float64) {
	w, h := float64(s.Info.Width), float64(s.Info.Height)
	to := func(col, row float64) (geo.XY, bool) {
		x, y := s.Info.World.At(col, row)
		p, err := s.At.Forward(x, y)
		if err != nil {
			return geo.XY{}, false
		}
		q := g.plane.To(p)
		return q, q.Finite()
	}
	if box = g.around(w, h, to); box.Empty() {
		return box, 0
	}
	// Pixels are measured in the middle of what is shown.
	x, y, err := s.At.Inverse(g.plane.From(box.Centre()))
	if err != nil {
		return geo.EmptyExtent(), 0
	}
	col, row := s.Info.World.Pixel(x, y)
	a, okA := to(col, row)
	b, okB := to(col+1, row)
	c, okC := to(col, row+1)
	pixelM = math.Min(a.Dist(b), a.Dist(c))
	if !okA || !okB || !okC || !(pixelM > 0) {
		return geo.EmptyExtent(), 0
	}
	return box, pixelM
}

// near is the ground with half its size around, as far as the map can be moved.
func (g *Ground) near() geo.Extent {
	e := g.extent
	return e.Grow(math.Max(e.MaxX-e.MinX, e.MaxY-e.MinY) / 2)
}

// fill lays a picture over the cells. Each cell is the mean of spots in it, as far apart as the pixels where
// there is room for that.
func (l *backdropLevel) fill(ctx context.Context, plane Plane, s Sheet) error {
	origin := geo.XY{X: l.nw.X, Y: l.nw.Y - float64(l.ny-1)*l.cellM}
	n, err := newNodes(ctx, plane, s.At, func(x, y float64) geo.XY {
		col, row := s.Info.World.Pixel(x, y)
		return geo.XY{X: col, Y: row}
	}, origin, l.cellM, l.nx, l.ny)
	if err != nil {
		return err
	}
	img, err := s.Open()
	if err != nil {
		return err
	}
	look, w, h := pixels(img), float64(s.Info.Width), float64(s.Info.Height)
	const mostSpots = 6
	for r := range l.ny {
		if err := ctx.Err(); err != nil {
			return err
		}
		y := l.nw.Y - float64(r)*l.cellM
		out := l.cell[r*l.nx : (r+1)*l.nx]
		for c := range out {
			p := geo.XY{X: origin.X + float64(c)*l.cellM, Y: y}
			a := n.place(p)
			if !(a.X > -1 && a.Y > -1 && a.X < w+1 && a.Y < h+1) {
				continue
			}
			// The spots of a cell lie on a straight grid between its middle and the next ones.
			right := n.place(geo.XY{X: p.X + l.cellM, Y: p.Y}).Sub(a)
			down := n.place(geo.XY{X: p.X, Y: p.Y - l.cellM}).Sub(a)
			side := math.Max(math.Hypot(right.X, right.Y), math.Hypot(down.X, down.Y))
			k := max(2, min(mostSpots, int(math.Ceil(side))))
			var sum [4]uint32
			for i := range k {
				v := (float64(i)+0.5)/float64(k) - 0.5
				for j := range k {
					u := (float64(j)+0.5)/float64(k) - 0.5
					x, y := a.X+u*right.X+v*down.X, a.Y+u*right.Y+v*down.Y
					if x < 0 || y < 0 || x >= w || y >= h {
						continue
					}
					o := look(int(x), int(y))
					sum[0], sum[1], sum[2], sum[3] = sum[0]+uint32(o&255), sum[1]+uint32(o>>8&255), sum[2]+uint32(o>>16&255), sum[3]+uint32(o>>24)
				}
			}
			half, all := uint32(k*k/2), uint32(k*k)
			if sum[3] == 0 {
				continue
			}
			mean := ink((sum[0]+half)/all) | ink((sum[1]+half)/all)<<8 | ink((sum[2]+half)/all)<<16 | ink((sum[3]+half)/all)<<24
			out[c] = mean.over(out[c])
		}
	}
	return nil
}

// pixels gives a quick way to the colours of a picture, counted from its upper left corner.
func pixels(img image.Image) func(x, y int) ink {
	from := img.Bounds().Min
	switch m := img.(type) {
	case *image.YCbCr:
		return func(x, y int) ink {
			c := m.YCbCrAt(x+from.X, y+from.Y)
			r, g, b := color.YCbCrToRGB(c.Y, c.Cb, c.Cr)
			return ink(r) | ink(g)<<8 | ink(b)<<16 | 255<<24
		}
	case *image.Gray:
		return func(x, y int) ink {
			v := ink(m.GrayAt(x+from.X, y+from.Y).Y)
			return v | v<<8 | v<<16 | 255<<24
		}
	case *image.NRGBA:
		return func(x, y int) ink { return inkOf(m.NRGBAAt(x+from.X, y+from.Y)) }
	case *image.RGBA:
		return func(x, y int) ink {
			c := m.RGBAAt(x+from.X, y+from.Y)
			return ink(c.R) | ink(c.G)<<8 | ink(c.B)<<16 | ink(c.A)<<24
		}
	case *image.Paletted:
		inks := make([]ink, len(m.Palette))
		for i, c := range m.Palette {
			inks[i] = inkOf(color.NRGBAModel.Convert(c).(color.NRGBA))
		}
		return func(x, y int) ink {
			if i := int(m.ColorIndexAt(x+from.X, y+from.Y)); i < len(inks) {
				return inks[i]
			}
			return 0
		}
	}
	return func(x, y int) ink {
		return inkOf(color.NRGBAModel.Convert(img.At(x+from.X, y+from.Y)).(color.NRGBA))
	}
}

// halved gives the backdrop on cells of twice the side.
func (l backdropLevel) halved() backdropLevel {
	h := backdropLevel{
		cellM: 2 * l.cellM, nx: l.nx / 2, ny: l.ny / 2,
		nw: geo.XY{X: l.nw.X + l.cellM/2, Y: l.nw.Y - l.cellM/2},
	}
	h.cell = make([]ink, 0, h.nx*h.ny)
	for r := range h.ny {
		above, below := l.cell[2*r*l.nx:(2*r+1)*l.nx], l.cell[(2*r+1)*l.nx:(2*r+2)*l.nx]
		for c := range h.nx {
			h.cell = append(h.cell, between4(above[2*c], above[2*c+1], below[2*c], below[2*c+1]))
		}
	}
	return h
}

// between4 gives the mean of four inks.
func between4(a, b, c, d ink) ink {
	low := (uint32(a)&0x00ff00ff + uint32(b)&0x00ff00ff + uint32(c)&0x00ff00ff + uint32(d)&0x00ff00ff + 0x00020002) >> 2 & 0x00ff00ff
	high := (uint32(a)>>8&0x00ff00ff + uint32(b)>>8&0x00ff00ff + uint32(c)>>8&0x00ff00ff + uint32(d)>>8&0x00ff00ff + 0x00020002) >> 2 & 0x00ff00ff
	return ink(low | high<<8)
}

// toward gives the ink share/256 of the way to another.
func (c ink) toward(o ink, share uint32) ink {
	low := (uint32(c)&0x00ff00ff*(256-share) + uint32(o)&0x00ff00ff*share + 0x00800080) >> 8 & 0x00ff00ff
	high := (uint32(c)>>8&0x00ff00ff*(256-share) + uint32(o)>>8&0x00ff00ff*share + 0x00800080) & 0xff00ff00
	return ink(low | high)
}

// Bytes gives the memory that the backdrop holds.
func (b *Backdrop) Bytes() int64 {
	n := 0
	for _, l := range b.levels {
		n += 4 * cap(l.cell)
	}
	return int64(n)
}

// How strong the backdrop is, in 1/256.
const (
	backdropTone    = 128 // of the picture's own colours; the rest is paper, so that what lies over it can be read
	backdropParcels = 50  // of the toned picture over parcels, whose colours must keep the order that the legend has
)

// backdrop lays the toned pictures under everything that is drawn over the ground.
func (d *drawing) backdrop() {
	b := d.style.Backdrop
	if b == nil || b.plane != d.g.plane {
		return
	}
	p := d.p
	l := &b.levels[0] // the copy whose cells are the largest that are no larger than a pixel
	for i := range b.levels {
		if b.levels[i].cellM <= p.mPerPx {
			l = &b.levels[i]
		}
	}
	columns := newCellLine(p.rect.Min.X, p.w, l.nw.X, p.mPerPx, l.cellM, l.nx)
	rows := newCellLine(p.rect.Min.Y, p.rect.Dy(), -l.nw.Y, p.mPerPx, l.cellM, l.ny)
	paper := inkOf(d.look.Paper)
	for y := rows.from; y < rows.to; y++ {
		row, f := int(rows.cell[y]), rows.part[y]
		above := l.cell[row*l.nx : (row+1)*l.nx]
		below := above
		if row+1 < l.ny {
			below = l.cell[(row+1)*l.nx : (row+2)*l.nx]
		}
		out := p.overlay[y*p.w : (y+1)*p.w]
		var number []uint32
		if d.t.parcel != nil {
			number = d.t.parcel[y*p.w : (y+1)*p.w]
		}
		for x := columns.from; x < columns.to; x++ {
			i, u := int(columns.cell[x]), columns.part[x]
			j := min(i+1, l.nx-1)
			c := above[i].toward(above[j], u).toward(below[i].toward(below[j], u), f)
			if c == 0 {
				continue
			}
			c = paper.part(part(uint8(c>>24))).toward(c, backdropTone)
			if number != nil && number[x] != 0 {
				c = c.part(backdropParcels)
			}
			out[x] = c
			p.drawn = true
		}
	}
}
