package gen

import (
	"bytes"
	"encoding/json"
	"math"
	"strconv"

	"groundtally/geo"
)

// prop is one property of a feature; a nil value is written as null.
type prop struct {
	key   string
	value any
}

// collection writes one GeoJSON file (RFC 7946): a feature a line, positions with 7 decimals of a degree.
type collection struct {
	buf   bytes.Buffer
	count int
	// projected writes metres of EPSG:32626 with two decimals and names the system in a crs member, as
	// files did before RFC 7946. swapped writes latitude before longitude, which no standard allows.
	projected, swapped bool
}

func (c *collection) position(p geo.XY) {
	x, y, decimals := p.X+originEastingM, p.Y+originNorthingM, 2
	if !c.projected {
		ll := lonLat(p)
		x, y, decimals = ll.Lon, ll.Lat, 7
	}
	if c.swapped {
		x, y = y, x
	}
	c.buf.WriteByte('[')
	c.buf.WriteString(decimal(x, decimals))
	c.buf.WriteByte(',')
	c.buf.WriteString(decimal(y, decimals))
	c.buf.WriteByte(']')
}

// decimal writes a number with at most n decimals and no trailing zeros.
func decimal(v float64, n int) string {
	s := strconv.FormatFloat(v, 'f', n, 64)
	if n > 0 {
		s = string(bytes.TrimRight([]byte(s), "0"))
		s = string(bytes.TrimRight([]byte(s), "."))
	}
	if s == "-0" {
		return "0"
	}
	return s
}

func (c *collection) positions(l []geo.XY, closed bool) {
	c.buf.WriteByte('[')
	for i, p := range l {
		if i > 0 {
			c.buf.WriteByte(',')
		}
		c.position(p)
	}
	if closed {
		c.buf.WriteByte(',')
		c.position(l[0])
	}
	c.buf.WriteByte(']')
}

func (c *collection) begin(kind string, props []prop) {
	if c.count > 0 {
		c.buf.WriteString(",\n")
	}
	c.count++
	c.buf.WriteString(`{"type":"Feature","properties":{`)
	for i, p := range props {
		if i > 0 {
			c.buf.WriteByte(',')
		}
		c.buf.WriteString(quote(p.key))
		c.buf.WriteByte(':')
		switch v := p.value.(type) {
		case nil:
			c.buf.WriteString("null")
		case string:
			c.buf.WriteString(quote(v))
		case int:
			c.buf.WriteString(strconv.Itoa(v))
		case float64:
			c.buf.WriteString(decimal(v, 4))
		case bool:
			c.buf.WriteString(strconv.FormatBool(v))
		}
	}
	c.buf.WriteString(`},"geometry":{"type":"` + kind + `","coordinates":`)
}

func quote(s string) string {
	b, err := json.Marshal(s)
	if err != nil {
		return `""` // a string always marshals
	}
	return string(b)
}

func (c *collection) point(p geo.XY, props ...prop) {
	c.begin("Point", props)
	c.position(p)
	c.buf.WriteString("}}")
}

func (c *collection) line(l []geo.XY, props ...prop) {
	c.begin("LineString", props)
	c.positions(l, false)
	c.buf.WriteString("}}")
}

// polygon writes an outer ring turned left and holes turned right, whatever way they come.
func (c *collection) polygon(outer []geo.XY, holes [][]geo.XY, props ...prop) {
	c.begin("Polygon", props)
	c.buf.WriteByte('[')
	c.positions(turned(outer, true), true)
	for _, h := range holes {
		c.buf.WriteByte(',')
		c.positions(turned(h, false), true)
	}
	c.buf.WriteString("]}}")
}

func turned(r []geo.XY, toLeft bool) []geo.XY {
	if (ringArea(r) > 0) == toLeft {
		return r
	}
	out := make([]geo.XY, len(r))
	for i, p := range r {
		out[len(r)-1-i] = p
	}
	return out
}

func (c *collection) bytes() []byte {
	head := `{"type":"FeatureCollection",`
	if c.projected {
		head += `"crs":{"type":"name","properties":{"name":"urn:ogc:def:crs:EPSG::32626"}},`
	}
	return []byte(head + "\"features\":[\n" + c.buf.String() + "\n]}\n")
}

// round rounds to n decimals.
func round(v float64, n int) float64 {
	f := math.Pow(10, float64(n))
	return math.Round(v*f) / f
}
