package overlay

import (
	"encoding/binary"
	"errors"
	"fmt"
	"math"

	"groundtally/geo"
)

// Type numbers of well-known binary (OGC 06-103r4, table 7).
const (
	wkbPoint = 1 + iota
	wkbLine
	wkbPolygon
	wkbMultiPoint
	wkbMultiLine
	wkbMultiPolygon
	wkbCollection
)

// encode appends the geometry in little-endian well-known binary: a polygon for one part, else a
// multi-geometry. Positions must be finite, rings closed.
func encode(buf []byte, g geo.XYGeometry) ([]byte, error) {
	one, many := byte(0), byte(0)
	switch g.Kind {
	case geo.Points:
		one, many = wkbPoint, wkbMultiPoint
	case geo.Lines:
		one, many = wkbLine, wkbMultiLine
	case geo.Polygons:
		one, many = wkbPolygon, wkbMultiPolygon
	default:
		return buf, errors.New("the feature has no geometry")
	}
	head := func(t byte) { buf = append(buf, 1, t, 0, 0, 0) }
	number := func(n int) { buf = binary.LittleEndian.AppendUint32(buf, uint32(n)) }
	if len(g.Parts) != 1 {
		head(many)
		number(len(g.Parts))
	}
	for i, part := range g.Parts {
		head(one)
		if g.Kind == geo.Polygons {
			if len(part) == 0 {
				return buf, fmt.Errorf("part %d has no ring", i+1)
			}
			number(len(part))
		} else if len(part) != 1 {
			return buf, fmt.Errorf("part %d has %d rings, want 1", i+1, len(part))
		}
		for _, ring := range part {
			switch {
			case g.Kind == geo.Points && len(ring) != 1:
				return buf, fmt.Errorf("part %d has %d positions, want 1", i+1, len(ring))
			case g.Kind == geo.Lines && len(ring) < 2:
				return buf, fmt.Errorf("line %d has %d positions, want 2 or more", i+1, len(ring))
			case g.Kind == geo.Polygons && len(ring) < 4:
				return buf, fmt.Errorf("a ring of part %d has %d positions, want 4 or more", i+1, len(ring))
			case g.Kind == geo.Polygons && ring[0] != ring[len(ring)-1]:
				return buf, fmt.Errorf("a ring of part %d is not closed", i+1)
			}
			if g.Kind != geo.Points {
				number(len(ring))
			}
			for _, p := range ring {
				if !p.Finite() {
					return buf, fmt.Errorf("part %d has a position that is not finite: %v", i+1, p)
				}
				buf = binary.LittleEndian.AppendUint64(buf, math.Float64bits(p.X))
				buf = binary.LittleEndian.AppendUint64(buf, math.Float64bits(p.Y))
			}
		}
	}
	return buf, nil
}

var errShort = errors.New("well-known binary ends early")

// decoder reads well-known binary into the slices of its store.
type decoder struct {
	b []byte
	store
}

// store hands out slices. With a chunk they are cut from slabs of so many positions and rings, so that the
// collector has few things to look after where geometries stay for long; without, each is made by itself.
type store struct {
	chunk int
	xy    []geo.XY
	rings [][]geo.XY
	parts [][][]geo.XY
}

// cut gives n items that nobody else has; appending to them copies them.
func cut[T any](slab *[]T, n, chunk int) []T {
	from := len(*slab)
	if cap(*slab)-from < n {
		*slab, from = make([]T, 0, max(n, chunk)), 0
	}
	*slab = (*slab)[:from+n]
	return (*slab)[from : from+n : from+n]
}

func (d *decoder) u32() (uint32, error) {
	if len(d.b) < 4 {
		return 0, errShort
	}
	v := binary.LittleEndian.Uint32(d.b)
	d.b = d.b[4:]
	return v, nil
}

// count reads a number of items of at least size bytes each.
func (d *decoder) count(size int) (int, error) {
	n, err := d.u32()
	if err == nil && int64(n)*int64(size) > int64(len(d.b)) {
		err = errShort
	}
	return int(n), err
}

func (d *decoder) positions(n int) ([]geo.XY, error) {
	if len(d.b) < 16*n {
		return nil, errShort
	}
	ring := cut(&d.xy, n, d.chunk)
	b := d.b[:16*n]
	d.b = d.b[16*n:]
	zero := 0.0 // v − v is not a number for a v that is none or is infinite
	for i := range ring {
		p := geo.XY{
			X: math.Float64frombits(binary.LittleEndian.Uint64(b[16*i:])),
			Y: math.Float64frombits(binary.LittleEndian.Uint64(b[16*i+8:])),
		}
		zero += (p.X - p.X) + (p.Y - p.Y)
		ring[i] = p
	}
	if zero != 0 {
		return nil, errors.New("a position is not finite")
	}
	return ring, nil
}

// decode appends to g all parts of g's kind; parts of lower dimension, which overlays leave where shapes
// only touch, are passed over.
func (d *decoder) decode(g *geo.XYGeometry) error {
	if len(d.b) < 5 {
		return errShort
	}
	if d.b[0] != 1 {
		return errors.New("well-known binary is not little-endian")
	}
	d.b = d.b[1:]
	t, err := d.u32()
	if err != nil {
		return err
	}
	add := func(kind geo.Kind, part [][]geo.XY) {
		if g.Kind != kind {
			return
		}
		if g.Parts == nil {
			g.Parts = cut(&d.parts, 1, d.chunk)[:0]
		}
		g.Parts = append(g.Parts, part)
	}
	switch t {
	case wkbPoint:
		if len(d.b) >= 16 && math.IsNaN(math.Float64frombits(binary.LittleEndian.Uint64(d.b))) {
			d.b = d.b[16:] // an empty point is written as NaN
			return nil
		}
		ring, err := d.positions(1)
		if err != nil {
			return err
		}
		add(geo.Points, [][]geo.XY{ring})
	case wkbLine:
		n, err := d.count(16)
		if err != nil {
			return err
		}
		ring, err := d.positions(n)
		if err != nil {
			return err
		}
		if n > 0 {
			add(geo.Lines, [][]geo.XY{ring})
		}
	case wkbPolygon:
		n, err := d.count(4)
		if err != nil {
			return err
		}
		part := cut(&d.rings, n, d.chunk)[:0]
		for range n {
			k, err := d.count(16)
			if err != nil {
				return err
			}
			ring, err := d.positions(k)
			if err != nil {
				return err
			}
			part = append(part, ring)
		}
		if n > 0 {
			add(geo.Polygons, part)
		}
	case wkbMultiPoint, wkbMultiLine, wkbMultiPolygon, wkbCollection:
		n, err := d.count(5)
		if err != nil {
			return err
		}
		if g.Parts == nil && n > 0 {
			g.Parts = cut(&d.parts, n, d.chunk)[:0]
		}
		for range n {
			if err := d.decode(g); err != nil {
				return err
			}
		}
	default:
		return fmt.Errorf("well-known binary has the unexpected type %d", t)
	}
	return nil
}
