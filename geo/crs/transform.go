package crs

import (
	"errors"
	"fmt"
	"math"
	"regexp"
	"strings"

	proj "github.com/twpayne/go-proj/v11"

	"groundtally/geo"
)

// ErrUnknownCRS is wrapped by the error for a code that the database does not have or that is not a
// coordinate reference system.
var ErrUnknownCRS = errors.New("unknown coordinate reference system")

// Transform takes coordinates of one coordinate reference system to longitude and latitude on WGS 84.
// Source coordinates are always given as east before north, or longitude before latitude, whatever order
// the system's definition states, as map files have them.
type Transform struct {
	code string
	lib  *Library
	pj   *proj.PJ // nil for WGS 84 itself
}

var (
	authority = regexp.MustCompile(`^(?i:(epsg|ogc|esri|ignf))::?([A-Za-z0-9_.]+)$`)
	urn       = regexp.MustCompile(`^(?i:urn:ogc:def:crs:)([A-Za-z]+):([0-9.]*):([A-Za-z0-9_.]+)$`)
	digits    = regexp.MustCompile(`^[0-9]{4,6}$`)
)

// Canonical gives the usual form AUTHORITY:CODE of a name of a coordinate reference system: "EPSG:32626"
// from "epsg:32626", "32626" or "urn:ogc:def:crs:EPSG::32626". Other text, such as a definition in
// well-known text, comes back trimmed.
func Canonical(code string) string {
	s := strings.TrimSpace(code)
	if digits.MatchString(s) {
		return "EPSG:" + s
	}
	if m := urn.FindStringSubmatch(s); m != nil {
		s = m[1] + ":" + m[3]
	}
	if m := authority.FindStringSubmatch(s); m != nil {
		return strings.ToUpper(m[1]) + ":" + strings.ToUpper(m[2])
	}
	return s
}

// NewTransform makes the transform from a coordinate reference system: an EPSG code in any form that
// Canonical knows, or a definition in well-known text. WGS 84 needs no database. Transforms are kept, so
// asking again is cheap.
func (l *Library) NewTransform(code string) (*Transform, error) {
	name := Canonical(code)
	switch name {
	case "EPSG:4326", "EPSG:4979", "OGC:CRS84":
		return &Transform{code: name, lib: l}, nil
	case "":
		return nil, fmt.Errorf("%w: no code was given", ErrUnknownCRS)
	}
	if strings.ContainsRune(name, 0) {
		return nil, fmt.Errorf("%w: the code holds a zero byte", ErrUnknownCRS)
	}
	l.mu.Lock()
	defer l.mu.Unlock()
	if t := l.cache[name]; t != nil {
		return t, nil
	}
	if l.ctx == nil {
		return nil, fmt.Errorf("coordinate system %q: %w", clip(name), ErrNoDatabase)
	}
	src, err := l.ctx.New(name)
	if err != nil {
		return nil, fmt.Errorf("coordinate system %q: %w: %v", clip(name), ErrUnknownCRS, err)
	}
	if !src.IsCRS() || !l.plane(name) {
		return nil, fmt.Errorf("coordinate system %q: %w: it has no east and north axes", clip(name), ErrUnknownCRS)
	}
	pj, err := l.operation(name)
	if err != nil {
		return nil, err
	}
	t := &Transform{code: name, lib: l, pj: pj}
	l.cache[name] = t
	return t, nil
}

func (l *Library) operation(name string) (*proj.PJ, error) {
	raw, err := l.ctx.NewCRSToCRS(name, "EPSG:4326", nil)
	if err != nil {
		return nil, fmt.Errorf("coordinate system %q cannot be taken to WGS 84: %w: %v", clip(name), ErrUnknownCRS, err)
	}
	pj, err := raw.NormalizeForVisualization()
	if err != nil {
		return nil, fmt.Errorf("coordinate system %q: put its axes in order: %w", clip(name), err)
	}
	return pj, nil
}

func clip(s string) string {
	if len(s) > 60 {
		return s[:60] + "..."
	}
	return s
}

// Code gives the canonical name of the source system.
func (t *Transform) Code() string { return t.code }

// Editions gives the editions of the library and the database that the transform comes from.
func (t *Transform) Editions() Editions { return t.lib.editions }

// Identity reports whether source coordinates are WGS 84 degrees already.
func (t *Transform) Identity() bool { return t.pj == nil }

// Forward gives the position of source coordinates: x east or longitude, y north or latitude.
func (t *Transform) Forward(x, y float64) (geo.LonLat, error) {
	ll := geo.LonLat{Lon: x, Lat: y}
	if !ll.Finite() {
		return geo.LonLat{}, fmt.Errorf("%s coordinates %v, %v are not finite", t.code, x, y)
	}
	if t.pj != nil {
		c, err := t.pj.Forward(proj.NewCoord(x, y, 0, math.Inf(1)))
		if err != nil {
			return geo.LonLat{}, fmt.Errorf("%s coordinates %v, %v lie outside the system: %v", t.code, x, y, err)
		}
		ll = geo.LonLat{Lon: c.X(), Lat: c.Y()}
	}
	if !ll.Finite() || math.Abs(ll.Lat) > 90 || math.Abs(ll.Lon) > 540 {
		return geo.LonLat{}, fmt.Errorf("%s coordinates %v, %v give no position on the earth", t.code, x, y)
	}
	return ll, nil
}

// Inverse gives the source system's coordinates, east before north, of a position.
func (t *Transform) Inverse(p geo.LonLat) (x, y float64, err error) {
	if !p.Finite() || math.Abs(p.Lat) > 90 || math.Abs(p.Lon) > 540 {
		return 0, 0, fmt.Errorf("longitude %v, latitude %v is not a position in degrees", p.Lon, p.Lat)
	}
	if t.pj == nil {
		return p.Lon, p.Lat, nil
	}
	c, err := t.pj.Inverse(proj.NewCoord(p.Lon, p.Lat, 0, math.Inf(1)))
	if err != nil || !(geo.XY{X: c.X(), Y: c.Y()}).Finite() {
		return 0, 0, fmt.Errorf("longitude %v, latitude %v lies outside %s", p.Lon, p.Lat, t.code)
	}
	return c.X(), c.Y(), nil
}

// Accuracy says how far a transform can be trusted at a position.
type Accuracy struct {
	Operation string  // the library's name for what it did
	Metres    float64 // stated accuracy
	Known     bool    // whether an accuracy is stated
	Ballpark  bool    // datum shift unknown: positions may be off by a hundred metres or more
}

// AccuracyAt gives the accuracy of the operation that the library chooses at source coordinates.
func (t *Transform) AccuracyAt(x, y float64) (Accuracy, error) {
	if t.pj == nil {
		return Accuracy{Operation: "none", Known: true}, nil
	}
	// The library remembers the last used operation of an object, so this question gets its own object.
	pj, err := t.lib.operation(t.code)
	if err != nil {
		return Accuracy{}, err
	}
	if _, err := (&Transform{code: t.code, lib: t.lib, pj: pj}).Forward(x, y); err != nil {
		return Accuracy{}, err
	}
	op, err := pj.GetLastUsedOperation()
	if err != nil {
		return Accuracy{}, fmt.Errorf("%s: accuracy of the transform: %w", t.code, err)
	}
	info := op.Info()
	a := Accuracy{Operation: info.Description, Metres: info.Accuracy, Known: info.Accuracy >= 0, Ballpark: op.HasBallparkTransformation()}
	if !a.Known {
		a.Metres = 0
	}
	return a, nil
}

// Geometry gives a geometry whose positions hold source coordinates (X or Lon to the east, Y or Lat to
// the north) in degrees on WGS 84. Edges that come out longer than about DensifyM are divided evenly in
// the source system first, where they are straight.
func Geometry[P geo.LonLat | geo.XY](t *Transform, g geo.Geometry[P]) (geo.LonLatGeometry, error) {
	long := func(p, q P, a, b geo.LonLat) float64 {
		if t.pj == nil {
			return 0 // an edge in degrees stays straight in degrees
		}
		// A degree of latitude is 111.7 km at most, of longitude as much by the cosine of latitude.
		const degM = 111700.0
		dx := wrap(b.Lon-a.Lon) * degM * math.Cos((a.Lat+b.Lat)/2*math.Pi/180)
		return math.Hypot(dx, (b.Lat-a.Lat)*degM)
	}
	return convert(g, func(p P) (geo.LonLat, error) {
		v := pair(p)
		return t.Forward(v[0], v[1])
	}, long)
}
