package gpkggeom

import (
	"encoding/binary"
	"errors"
	"fmt"
	"math"

	"groundtally/geo"
)

// Errors of Decode, wrapped with the byte position.
var (
	ErrNotABlob = errors.New("not a GeoPackage geometry blob")
	ErrExtended = errors.New("extended geometry blob is not supported")
	ErrCurved   = errors.New("curved geometry is not supported; convert it to straight lines first")
	ErrCut      = errors.New("geometry blob is cut short")
	ErrTooDeep  = errors.New("collections are nested too deeply")
)

// maxNesting bounds how deep collections may lie in one another.
const maxNesting = 32

// Blob is a decoded geometry blob.
type Blob struct {
	SRS      int32
	Geometry geo.LonLatGeometry // X, Y as they stand in the blob, whatever the SRS
	Dropped  bool               // there were heights or measures, which were read over
	LeftOut  int                // parts of a mixed collection that are not of the dimension kept
}

// Decode reads a blob of either byte order, with ISO or extended codes for heights and measures.
// A collection is flattened: the parts of its highest dimension are kept, the others are counted in
// LeftOut. A point whose coordinates are both NaN is an empty point; any other coordinate that is not
// finite is an error.
func Decode(b []byte) (Blob, error) {
	var out Blob
	if len(b) < 8 || b[0] != 'G' || b[1] != 'P' {
		return out, ErrNotABlob
	}
	flags := b[3]
	if flags&(1<<5) != 0 {
		return out, ErrExtended
	}
	envelope := [...]int{0, 32, 48, 48, 64}
	code := int(flags >> 1 & 7)
	if b[2] != 0 || code >= len(envelope) {
		return out, fmt.Errorf("version %d, envelope code %d: %w", b[2], code, ErrNotABlob)
	}
	var order binary.ByteOrder = binary.BigEndian
	if flags&1 == 1 {
		order = binary.LittleEndian
	}
	out.SRS = int32(order.Uint32(b[4:]))
	d := decoder{b: b, at: 8 + envelope[code]}
	if d.at > len(b) {
		return out, ErrCut
	}
	if err := d.geometry(0); err != nil {
		return out, fmt.Errorf("byte %d of the geometry blob: %w", d.at, err)
	}
	if d.at != len(b) {
		return out, fmt.Errorf("byte %d of the geometry blob: %d bytes stand behind the geometry: %w", d.at, len(b)-d.at, ErrNotABlob)
	}
	for k := geo.Polygons; k >= geo.Points; k-- {
		if !d.seen[k] || (len(d.parts[k]) == 0 && d.anyParts()) {
			continue
		}
		out.Geometry = geo.LonLatGeometry{Kind: k, Parts: d.parts[k]}
		for lower := geo.Points; lower < k; lower++ {
			out.LeftOut += len(d.parts[lower])
		}
		break
	}
	out.Dropped = d.dropped
	return out, nil
}

type decoder struct {
	b       []byte
	at      int
	parts   [geo.Polygons + 1][][][]geo.LonLat
	seen    [geo.Polygons + 1]bool
	dropped bool
}

func (d *decoder) anyParts() bool {
	for _, p := range d.parts {
		if len(p) > 0 {
			return true
		}
	}
	return false
}

// head reads byte order and type code; extra is the number of ordinates behind x and y.
func (d *decoder) head() (order binary.ByteOrder, code uint32, extra int, err error) {
	if len(d.b)-d.at < 5 {
		return nil, 0, 0, ErrCut
	}
	switch d.b[d.at] {
	case 0:
		order = binary.BigEndian
	case 1:
		order = binary.LittleEndian
	default:
		return nil, 0, 0, fmt.Errorf("byte order mark %d: %w", d.b[d.at], ErrNotABlob)
	}
	raw := order.Uint32(d.b[d.at+1:])
	d.at += 5
	const hasZ, hasM, hasSRS = 1 << 31, 1 << 30, 1 << 29
	if raw&hasZ != 0 {
		extra++
	}
	if raw&hasM != 0 {
		extra++
	}
	if raw&hasSRS != 0 {
		if len(d.b)-d.at < 4 {
			return nil, 0, 0, ErrCut
		}
		d.at += 4
	}
	code = raw &^ uint32(hasZ|hasM|hasSRS)
	switch code / 1000 {
	case 0:
	case 1, 2:
		extra = 1
	case 3:
		extra = 2
	default:
		return nil, 0, 0, fmt.Errorf("geometry type %d is not known: %w", raw, ErrNotABlob)
	}
	code %= 1000
	if extra > 0 {
		d.dropped = true
	}
	return order, code, extra, nil
}

func (d *decoder) geometry(depth int) error {
	if depth > maxNesting {
		return ErrTooDeep
	}
	order, code, extra, err := d.head()
	if err != nil {
		return err
	}
	switch {
	case code == wkbPoint:
		d.seen[geo.Points] = true
		return d.point(order, extra)
	case code == wkbLineString:
		d.seen[geo.Lines] = true
		ring, err := d.ring(order, extra)
		if err != nil {
			return err
		}
		d.parts[geo.Lines] = append(d.parts[geo.Lines], [][]geo.LonLat{ring})
		return nil
	case code == wkbPolygon:
		d.seen[geo.Polygons] = true
		n, err := d.count(order, 4)
		if err != nil {
			return err
		}
		part := make([][]geo.LonLat, n)
		for i := range part {
			if part[i], err = d.ring(order, extra); err != nil {
				return err
			}
		}
		d.parts[geo.Polygons] = append(d.parts[geo.Polygons], part)
		return nil
	case code >= wkbMultiPoint && code <= wkbCollection:
		n, err := d.count(order, 5)
		if err != nil {
			return err
		}
		if code < wkbCollection {
			d.seen[geo.Kind(code-3)] = true
		}
		for range n {
			if code < wkbCollection {
				at := d.at
				_, member, _, err := d.head()
				if err != nil {
					return err
				}
				if member != code-3 {
					return fmt.Errorf("type %d inside type %d: %w", member, code, ErrNotABlob)
				}
				d.at = at
			}
			if err := d.geometry(depth + 1); err != nil {
				return err
			}
		}
		return nil
	case code >= 8 && code <= 14:
		return ErrCurved
	}
	return fmt.Errorf("geometry type %d is not supported: %w", code, ErrNotABlob)
}

func (d *decoder) point(order binary.ByteOrder, extra int) error {
	size := 16 + 8*extra
	if len(d.b)-d.at < size {
		return ErrCut
	}
	p := geo.LonLat{Lon: d.float(order, 0), Lat: d.float(order, 8)}
	if math.IsNaN(p.Lon) && math.IsNaN(p.Lat) {
		d.at += size
		return nil
	}
	if !p.Finite() {
		return errors.New("a coordinate is not a finite number")
	}
	d.at += size
	d.parts[geo.Points] = append(d.parts[geo.Points], [][]geo.LonLat{{p}})
	return nil
}

func (d *decoder) float(order binary.ByteOrder, off int) float64 {
	return math.Float64frombits(order.Uint64(d.b[d.at+off:]))
}

// count reads a number of things of at least size bytes each, so that no more is allocated than the
// blob can hold.
func (d *decoder) count(order binary.ByteOrder, size int) (int, error) {
	if len(d.b)-d.at < 4 {
		return 0, ErrCut
	}
	n := order.Uint32(d.b[d.at:])
	d.at += 4
	if int64(n)*int64(size) > int64(len(d.b)-d.at) {
		return 0, ErrCut
	}
	return int(n), nil
}

func (d *decoder) ring(order binary.ByteOrder, extra int) ([]geo.LonLat, error) {
	size := 16 + 8*extra
	n, err := d.count(order, size)
	if err != nil {
		return nil, err
	}
	ring := make([]geo.LonLat, n)
	for i := range ring {
		ring[i] = geo.LonLat{Lon: d.float(order, 0), Lat: d.float(order, 8)}
		if !ring[i].Finite() {
			return nil, errors.New("a coordinate is not a finite number")
		}
		d.at += size
	}
	return ring, nil
}
