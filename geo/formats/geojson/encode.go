package geojson

import (
	"bufio"
	"context"
	"encoding/json"
	"fmt"
	"io"
	"strconv"

	"groundtally/geo"
)

// EncodeOptions say what is written.
type EncodeOptions struct {
	Personal bool // write columns marked personal too
	Sequence bool // records that begin with a record separator (RFC 8142) instead of a collection
}

// decimals is what RFC 7946, section 11.2, calls enough; the seventh is about a centimetre.
const decimals = 7

// Encode writes a layer by RFC 7946: longitude and latitude on WGS 84 with seven decimals, outer rings
// counter-clockwise, holes clockwise. A position outside 180 by 90 degrees, or a number that is not
// finite, is an error. Units have no place in the format and are not written.
func Encode(ctx context.Context, w io.Writer, l *geo.Layer, o EncodeOptions) error {
	b := bufio.NewWriterSize(w, blockBytes)
	e := encoder{layer: l}
	for i, c := range l.Columns {
		if c.Personal && !o.Personal {
			continue
		}
		name, err := quoted(c.Name)
		if err != nil {
			return err
		}
		e.columns = append(e.columns, i)
		e.names = append(e.names, name)
	}
	if !o.Sequence {
		e.out = append(e.out, `{"type":"FeatureCollection",`...)
		if l.Name != "" {
			name, err := quoted(l.Name)
			if err != nil {
				return err
			}
			e.out = append(append(append(e.out, `"name":`...), name...), ',')
		}
		e.out = append(e.out, `"features":[`...)
	}
	for i := range l.Features {
		if err := ctx.Err(); err != nil {
			return err
		}
		switch {
		case o.Sequence:
			e.out = append(e.out, recordMark)
		case i > 0:
			e.out = append(e.out, ",\n"...)
		default:
			e.out = append(e.out, '\n')
		}
		if err := e.feature(&l.Features[i]); err != nil {
			return fmt.Errorf("layer %q, feature %d (%s): %w", l.Name, i+1, l.Features[i].ID, err)
		}
		if o.Sequence {
			e.out = append(e.out, '\n')
		}
		if _, err := b.Write(e.out); err != nil {
			return err
		}
		e.out = e.out[:0]
	}
	if !o.Sequence {
		e.out = append(e.out, "\n]}\n"...)
	}
	if _, err := b.Write(e.out); err != nil {
		return err
	}
	return b.Flush()
}

type encoder struct {
	layer   *geo.Layer
	columns []int
	names   [][]byte
	out     []byte
}

func quoted(s string) ([]byte, error) { return json.Marshal(s) }

func (e *encoder) feature(f *geo.Feature) error {
	id, err := quoted(f.ID)
	if err != nil {
		return err
	}
	e.out = append(append(e.out, `{"type":"Feature","id":`...), id...)
	e.out = append(e.out, `,"properties":{`...)
	if len(f.Values) != len(e.layer.Columns) {
		return fmt.Errorf("it has %d values for %d columns", len(f.Values), len(e.layer.Columns))
	}
	for n, i := range e.columns {
		if n > 0 {
			e.out = append(e.out, ',')
		}
		e.out = append(append(e.out, e.names[n]...), ':')
		if err := e.value(f.Values[i]); err != nil {
			return fmt.Errorf("column %q: %w", e.layer.Columns[i].Name, err)
		}
	}
	e.out = append(e.out, `},"geometry":`...)
	if err := e.geometry(f.Geometry); err != nil {
		return err
	}
	e.out = append(e.out, '}')
	return nil
}

func (e *encoder) value(v geo.Value) error {
	var b []byte
	var err error
	switch v.Kind {
	case geo.Text:
		b, err = quoted(v.Text)
	case geo.Number:
		b, err = json.Marshal(v.Number)
	case geo.Bool:
		b = strconv.AppendBool(nil, v.Bool)
	default:
		b = []byte("null")
	}
	e.out = append(e.out, b...)
	return err
}

func (e *encoder) geometry(g geo.LonLatGeometry) error {
	name := ""
	switch g.Kind {
	case geo.Points:
		name = "Point"
	case geo.Lines:
		name = "LineString"
	case geo.Polygons:
		name = "Polygon"
	default:
		e.out = append(e.out, "null"...)
		return nil
	}
	multi := len(g.Parts) != 1
	if multi {
		name = "Multi" + name
	}
	e.out = append(append(append(e.out, `{"type":"`...), name...), `","coordinates":`...)
	if multi {
		e.out = append(e.out, '[')
	}
	for i, part := range g.Parts {
		if i > 0 {
			e.out = append(e.out, ',')
		}
		if err := e.part(g.Kind, part); err != nil {
			return fmt.Errorf("part %d: %w", i+1, err)
		}
	}
	if multi {
		e.out = append(e.out, ']')
	}
	e.out = append(e.out, '}')
	return nil
}

func (e *encoder) part(k geo.Kind, part [][]geo.LonLat) error {
	if k != geo.Polygons {
		if len(part) != 1 {
			return fmt.Errorf("a %s has one ring, this has %d", k, len(part))
		}
		if k == geo.Lines {
			return e.ring(part[0], false)
		}
		if len(part[0]) != 1 {
			return fmt.Errorf("a point has one position, this has %d", len(part[0]))
		}
		return e.position(part[0][0])
	}
	e.out = append(e.out, '[')
	for i, ring := range part {
		if i > 0 {
			e.out = append(e.out, ',')
		}
		if err := e.ring(ring, (twiceArea(ring) < 0) == (i == 0)); err != nil {
			return err
		}
	}
	e.out = append(e.out, ']')
	return nil
}

// twiceArea is the shoelace sum, positive for a counter-clockwise ring. It is taken from the ring's
// first position, so that far-away rings do not lose their digits.
func twiceArea(ring []geo.LonLat) float64 {
	sum := 0.0
	for i := 1; i+1 < len(ring); i++ {
		ax, ay := ring[i].Lon-ring[0].Lon, ring[i].Lat-ring[0].Lat
		bx, by := ring[i+1].Lon-ring[0].Lon, ring[i+1].Lat-ring[0].Lat
		sum += float64(ax*by) - float64(bx*ay)
	}
	return sum
}

func (e *encoder) ring(ring []geo.LonLat, backwards bool) error {
	e.out = append(e.out, '[')
	for i := range ring {
		p := ring[i]
		if backwards {
			p = ring[len(ring)-1-i]
		}
		if i > 0 {
			e.out = append(e.out, ',')
		}
		if err := e.position(p); err != nil {
			return err
		}
	}
	e.out = append(e.out, ']')
	return nil
}

func (e *encoder) position(p geo.LonLat) error {
	if !p.Finite() || p.Lon < -180 || p.Lon > 180 || p.Lat < -90 || p.Lat > 90 {
		return fmt.Errorf("the position %g, %g is not in degrees of longitude and latitude", p.Lon, p.Lat)
	}
	e.out = append(e.out, '[')
	e.out = appendDegrees(e.out, p.Lon)
	e.out = append(e.out, ',')
	e.out = appendDegrees(e.out, p.Lat)
	e.out = append(e.out, ']')
	return nil
}

func appendDegrees(dst []byte, v float64) []byte {
	from := len(dst)
	dst = strconv.AppendFloat(dst, v, 'f', decimals, 64)
	for dst[len(dst)-1] == '0' {
		dst = dst[:len(dst)-1]
	}
	if dst[len(dst)-1] == '.' {
		dst = dst[:len(dst)-1]
	}
	if string(dst[from:]) == "-0" {
		dst = append(dst[:from], '0')
	}
	return dst
}
