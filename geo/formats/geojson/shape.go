package geojson

import (
	"fmt"
	"slices"

	"groundtally/geo"
)

// gathered holds the parts of a geometry by dimension, so that collections come out flat.
type gathered struct {
	parts    [geo.Polygons + 1][][][]geo.LonLat
	seen     [geo.Polygons + 1]bool
	closed   int // rings closed
	tooShort int // rings and lines taken out
	heights  int
}

// geometry gives the parts of the dimension to keep, or of the highest one that has any.
func (g *gathered) geometry(keep geo.Kind) geo.LonLatGeometry {
	if keep != geo.NoGeometry && g.seen[keep] && len(g.parts[keep]) > 0 {
		return geo.LonLatGeometry{Kind: keep, Parts: g.parts[keep]}
	}
	for _, wantParts := range []bool{true, false} {
		for k := geo.Polygons; k >= geo.Points; k-- {
			if g.seen[k] && (len(g.parts[k]) > 0 || !wantParts) {
				return geo.LonLatGeometry{Kind: k, Parts: g.parts[k]}
			}
		}
	}
	return geo.LonLatGeometry{}
}

func (g *gathered) others(kept geo.Kind) int {
	n := 0
	for k, parts := range g.parts {
		if geo.Kind(k) != kept {
			n += len(parts)
		}
	}
	return n
}

// shape is a geometry object while its members are read. Coordinates that come before the type are
// held as bytes until the type is known.
type shape struct {
	typ        string
	raw        []byte
	rawAt      int64
	hasRaw     bool
	hasCoords  bool
	members    bool // a geometries member was there
	parsedInto gathered
}

func (d *decoder) geometry(into *gathered) error {
	if c, err := d.s.space(); err != nil {
		return err
	} else if c != '{' {
		return d.s.fault("not_geojson", "the geometry is not an object", doExport)
	}
	var seen memberNames
	var g shape
	if err := d.s.object(func(name string) error {
		if err := d.once(&seen, name); err != nil {
			return err
		}
		return d.shapeMember(name, &g)
	}); err != nil {
		return err
	}
	return d.closeShape(&g, into)
}

func (d *decoder) shapeMember(name string, g *shape) error {
	var err error
	switch name {
	case "type":
		g.typ, err = d.typeName()
	case "coordinates":
		if _, known := kinds[g.typ]; known {
			g.hasCoords = true
			return d.coordinates(g.typ, &g.parsedInto)
		}
		g.raw, g.rawAt, err = d.s.raw()
		g.hasRaw = true
	case "geometries":
		c, e := d.s.space()
		if e != nil {
			return e
		}
		if c != '[' {
			return d.s.fault("not_geojson", "geometries is not a list", doExport)
		}
		g.members = true
		return d.s.array(func(int) error { return d.geometry(&g.parsedInto) })
	default:
		err = d.s.skip()
	}
	return err
}

// closeShape adds a geometry whose members have all been read to into.
func (d *decoder) closeShape(g *shape, into *gathered) error {
	_, simple := kinds[g.typ]
	switch {
	case g.typ == "GeometryCollection":
		if !g.members {
			return d.s.fault("not_geojson", "a GeometryCollection has no geometries member", doExport)
		}
	case !simple:
		return d.s.fault("not_geojson", fmt.Sprintf("%q is not a type of geometry", g.typ), doExport)
	case g.members:
		return d.s.fault("not_geojson", "a "+g.typ+" has a geometries member", doExport)
	case g.hasRaw:
		outer := d.s
		d.s = d.within(g.raw, g.rawAt)
		d.s.depth = outer.depth
		err := d.coordinates(g.typ, &g.parsedInto)
		d.s = outer
		if err != nil {
			return err
		}
	case !g.hasCoords:
		return d.s.fault("not_geojson", "a "+g.typ+" has no coordinates", doExport)
	}
	p := &g.parsedInto
	for k := range p.parts {
		if into.parts[k] == nil {
			into.parts[k] = p.parts[k]
		} else {
			into.parts[k] = append(into.parts[k], p.parts[k]...)
		}
		into.seen[k] = into.seen[k] || p.seen[k]
	}
	into.closed += p.closed
	into.tooShort += p.tooShort
	into.heights += p.heights
	return nil
}

var kinds = map[string]geo.Kind{
	"Point": geo.Points, "MultiPoint": geo.Points,
	"LineString": geo.Lines, "MultiLineString": geo.Lines,
	"Polygon": geo.Polygons, "MultiPolygon": geo.Polygons,
}

func (d *decoder) coordinates(typ string, g *gathered) error {
	k := kinds[typ]
	g.seen[k] = true
	one := func(int) error {
		switch k {
		case geo.Points:
			p, err := d.position(g)
			if err != nil {
				return err
			}
			g.parts[k] = append(g.parts[k], [][]geo.LonLat{{p}})
			return nil
		case geo.Lines:
			return d.line(g)
		default:
			return d.polygon(g)
		}
	}
	if typ == "Point" {
		// Some programs write an empty point as an empty list.
		empty, err := d.emptyList()
		if empty || err != nil {
			return err
		}
	}
	if typ == "Point" || typ == "LineString" || typ == "Polygon" {
		return one(0)
	}
	if err := d.list("coordinates of a " + typ); err != nil {
		return err
	}
	return d.s.array(one)
}

// emptyList passes "[]" if that is what comes next; otherwise it leaves the list's first byte
// unread. It needs one byte of looking ahead, which a block boundary may hide.
func (d *decoder) emptyList() (bool, error) {
	if err := d.list("coordinates of a Point"); err != nil {
		return false, err
	}
	s := d.s
	s.pos++ // the bracket
	c, err := s.space()
	if err != nil {
		return false, err
	}
	if c == ']' {
		s.pos++
		return true, nil
	}
	s.opened = true
	return false, nil
}

// list makes sure that a list comes next.
func (d *decoder) list(what string) error {
	c, err := d.s.space()
	if err != nil {
		return err
	}
	if c != '[' {
		return d.s.fault("bad_coordinates", "a list of numbers was expected as "+what+", not "+byteName(c), doExport)
	}
	return nil
}

func (d *decoder) line(g *gathered) error {
	ring, err := d.ring(g)
	if err != nil {
		return err
	}
	switch len(ring) {
	case 0:
	case 1:
		g.tooShort++
	default:
		g.parts[geo.Lines] = append(g.parts[geo.Lines], [][]geo.LonLat{ring})
	}
	return nil
}

// polygon reads one polygon. A ring with fewer than three different neighbours in a row encloses
// nothing and is taken out; without its outer ring a polygon goes with its holes.
func (d *decoder) polygon(g *gathered) error {
	if err := d.list("rings of a polygon"); err != nil {
		return err
	}
	var part [][]geo.LonLat
	outer := true
	err := d.s.array(func(i int) error {
		ring, err := d.ring(g)
		if err != nil {
			return err
		}
		if n := len(ring); n > 0 && ring[0] != ring[n-1] {
			ring = append(ring, ring[0])
			g.closed++
		}
		if len(ring) < 4 {
			if len(ring) > 0 || i > 0 {
				g.tooShort++
			}
			if i == 0 {
				outer = false
			}
			return nil
		}
		if outer {
			part = append(part, ring)
		} else {
			g.tooShort++
		}
		return nil
	})
	if err == nil && len(part) > 0 {
		g.parts[geo.Polygons] = append(g.parts[geo.Polygons], part)
	}
	return err
}

func (d *decoder) ring(g *gathered) ([]geo.LonLat, error) {
	if err := d.list("list of positions"); err != nil {
		return nil, err
	}
	d.ringBuf = d.ringBuf[:0]
	err := d.s.array(func(int) error {
		p, err := d.position(g)
		d.ringBuf = append(d.ringBuf, p)
		return err
	})
	if len(d.ringBuf) == 0 {
		return nil, err
	}
	return slices.Clone(d.ringBuf), err
}

func (d *decoder) position(g *gathered) (geo.LonLat, error) {
	s := d.s
	if d.positions++; d.positions > d.o.MaxPositions {
		return geo.LonLat{}, s.fault("too_many", fmt.Sprintf("the file has more than %d positions", d.o.MaxPositions), doSplit)
	}
	if s.opened {
		s.opened = false
	} else {
		c, err := s.space()
		if err != nil {
			return geo.LonLat{}, err
		}
		if c != '[' {
			return geo.LonLat{}, s.fault("bad_coordinates", "a position was expected, not "+byteName(c), "coordinates are not nested as the geometry's type asks; "+doExport)
		}
		s.pos++
	}
	var at [2]float64
	n := 0
	for ; ; n++ {
		c, err := s.space()
		if err != nil {
			return geo.LonLat{}, err
		}
		if c == ']' && n < 2 {
			return geo.LonLat{}, s.fault("bad_coordinates", fmt.Sprintf("a position has %d of the 2 numbers it needs", n), doExport)
		}
		if c == ']' {
			s.pos++
			break
		}
		if n > 0 {
			if c != ',' {
				return geo.LonLat{}, s.unexpected(c, "',' or ']'")
			}
			s.pos++
			if c, err = s.space(); err != nil {
				return geo.LonLat{}, err
			}
		}
		switch {
		case c == '-' || c >= '0' && c <= '9':
		case c == '"':
			return geo.LonLat{}, s.fault("bad_coordinates", "a coordinate is a text, not a number", doExport)
		case c == '[':
			return geo.LonLat{}, s.fault("bad_coordinates", "coordinates are nested deeper than the geometry's type asks", doExport)
		default:
			return geo.LonLat{}, s.badNumber(c)
		}
		_, v, _, err := s.number()
		if err != nil {
			return geo.LonLat{}, err
		}
		if n < 2 {
			at[n] = v
		}
	}
	if n > 2 {
		g.heights++
	}
	return geo.LonLat{Lon: at[0], Lat: at[1]}, nil
}
