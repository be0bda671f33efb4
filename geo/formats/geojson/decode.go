package geojson

import (
	"bytes"
	"context"
	"encoding/json"
	"errors"
	"fmt"
	"io"
	"slices"
	"strconv"
	"strings"

	"groundtally/geo"
)

// Options say what is read and how much at most. A limit of zero is the default.
type Options struct {
	File     string // name used in errors and notices
	Progress func(bytes int64)

	MaxBytes     int64 // 8 GiB
	MaxFeatures  int   // 5,000,000
	MaxPositions int   // 100,000,000
	MaxColumns   int   // 1,000
	MaxValue     int   // bytes of one text, or of one value that must be held whole: 64 MiB
	MaxDepth     int   // nesting: 100

	// Keep is the dimension kept of a collection that mixes dimensions; NoGeometry keeps the highest
	// that it has.
	Keep geo.Kind
	// IgnoreCRS reads a file whose crs member cannot be understood, when the user has said what the
	// reference system is.
	IgnoreCRS bool
}

func (o Options) withDefaults() Options {
	def := func(v *int, d int) {
		if *v <= 0 {
			*v = d
		}
	}
	if o.MaxBytes <= 0 {
		o.MaxBytes = 8 << 30
	}
	def(&o.MaxFeatures, 5_000_000)
	def(&o.MaxPositions, 100_000_000)
	def(&o.MaxColumns, 1_000)
	def(&o.MaxValue, 64<<20)
	def(&o.MaxDepth, 100)
	return o
}

// Ledger counts what became of a file's content.
type Ledger struct {
	Read     int // features in the layer
	Repaired int // features among them whose geometry was changed: rings closed, parts taken out
	LeftOut  int // records of a sequence that are broken and not in the layer

	NoGeometry    int // features without a geometry
	Empty         int // features whose geometry has no position
	RingsClosed   int
	PartsLeftOut  int // rings and lines with too few positions, parts of another dimension in a collection
	HeightsLeft   int // positions whose third and further numbers were dropped
	NumbersAsText int // whole numbers too long for a double
}

// Result is what a file holds.
type Result struct {
	Layer   *geo.Layer
	CRS     string // "EPSG:25832" or "OGC:CRS84" where the file says so, else empty
	Notices []geo.Notice
	Ledger  Ledger
}

// Decode reads a file. Columns stand in the order of first appearance; one with values of several
// kinds becomes text. Features are identified by their id member, else by their number; an identifier
// that comes again gets "-2", "-3" and so on. In a sequence a broken record is left out with a notice;
// in any other file a fault anywhere means that nothing is taken.
func Decode(ctx context.Context, r io.Reader, o Options) (Result, error) {
	o = o.withDefaults()
	d := &decoder{
		o:     o,
		s:     &scanner{ctx: ctx, r: r, buf: make([]byte, blockBytes), maxBytes: o.MaxBytes, maxValue: o.MaxValue, maxDepth: o.MaxDepth, progress: o.Progress, names: map[string]string{}},
		index: map[string]int{},
	}
	if err := d.file(); err != nil {
		return Result{}, d.place(err)
	}
	return d.result(), nil
}

// event is something worth a notice, kept until the end because a broken record takes its events away
// with it.
type event struct {
	code  string
	field string
	row   int
	n     int
}

type decoder struct {
	o     Options
	s     *scanner
	layer geo.Layer
	index map[string]int // of columns by name
	rows  []int          // number in the file of each feature
	named []bool         // the feature has an id of its own

	events    []event
	positions int
	ringBuf   []geo.LonLat // of the ring being read
	setBuf    []bool       // properties of the feature that were there
	row       int          // number of the feature being read
	id        string       // its id as far as read
	inside    bool         // a feature is being read
	crs       string
	crsSaid   bool
	name      string
	leftOut   int
}

func (d *decoder) note(code, field string, n int) {
	d.events = append(d.events, event{code: code, field: field, row: d.row, n: n})
}

// place puts file and feature into an error.
func (d *decoder) place(err error) error {
	var e *Error
	if !errors.As(err, &e) {
		return err
	}
	e.File = d.o.File
	if e.Feature == 0 && d.inside {
		e.Feature, e.ID = d.row, d.id
	}
	return err
}

func (d *decoder) file() error {
	sequence, err := d.head()
	if err != nil {
		return err
	}
	if sequence {
		return d.sequence()
	}
	if err := d.document(); err != nil {
		return err
	}
	c, err := d.s.space()
	switch {
	case err != nil:
		return d.atEnd(err)
	case c == recordMark:
		return d.sequence()
	case c == '{':
		return d.lines()
	}
	return d.s.fault("not_json", "something stands behind the end of the JSON: "+byteName(c), doExport)
}

// atEnd turns the end of the file, where it may end, into no error.
func (d *decoder) atEnd(err error) error {
	if errors.Is(d.s.failed, io.EOF) {
		return nil
	}
	return err
}

// head looks at the first bytes and passes a byte order mark.
func (d *decoder) head() (sequence bool, err error) {
	c, ok := d.s.peek()
	if !ok {
		if errors.Is(d.s.failed, io.EOF) {
			return false, d.s.fault("empty_file", "the file is empty", doExport)
		}
		return false, d.s.ended()
	}
	switch c {
	case 0xfe, 0xff:
		return false, d.s.fault("not_utf8", "the file is in UTF-16", "save it as UTF-8")
	case 0xef:
		for _, want := range []byte{0xef, 0xbb, 0xbf} {
			c, ok := d.s.peek()
			if !ok || c != want {
				return false, d.s.fault("not_json", "the file does not begin as JSON does", "choose a GeoJSON file")
			}
			d.s.pos++
		}
	}
	if c, err = d.s.space(); err != nil {
		if errors.Is(d.s.failed, io.EOF) {
			return false, d.s.fault("empty_file", "the file is empty", doExport)
		}
		return false, err
	}
	switch c {
	case '{':
		return false, nil
	case recordMark:
		return true, nil
	case '<':
		return false, d.s.fault("not_json", "the file is a web page or XML, not JSON", "choose a GeoJSON file; where it was downloaded, the server may have sent an error page")
	case '[':
		return false, d.s.fault("not_geojson", "the file is a bare list", "GeoJSON begins with an object; "+doExport)
	}
	return false, d.s.fault("not_json", "the file is not JSON: it begins with "+byteName(c), "choose a GeoJSON file")
}

// mark is a point to which a broken record is taken back.
type mark struct {
	features, columns, events, positions int
	crs, name                            string
	crsSaid                              bool
}

func (d *decoder) mark() mark {
	return mark{len(d.layer.Features), len(d.layer.Columns), len(d.events), d.positions, d.crs, d.name, d.crsSaid}
}

func (d *decoder) back(m mark) {
	for _, c := range d.layer.Columns[m.columns:] {
		delete(d.index, c.Name)
	}
	d.layer.Columns = d.layer.Columns[:m.columns]
	clear(d.layer.Features[m.features:])
	d.layer.Features, d.rows, d.named = d.layer.Features[:m.features], d.rows[:m.features], d.named[:m.features]
	d.events, d.positions = d.events[:m.events], m.positions
	d.crs, d.name, d.crsSaid = m.crs, m.name, m.crsSaid
	d.inside = false
}

// record reads one record of a sequence; a broken one is left out. The first fault is kept for the
// case that no record can be read at all.
func (d *decoder) record(first *error) error {
	m, row := d.mark(), d.row
	err := d.document()
	if err == nil {
		c, end := d.s.space()
		if end != nil || c == recordMark {
			return nil //nolint:nilerr // the end of the record is what is hoped for
		}
		err = d.s.fault("not_json", "a second value stands in the record: "+byteName(c), doExport)
	}
	var e *Error
	if !errors.As(err, &e) || e.Code == "unreadable" || e.Code == "file_too_large" || e.Code == "too_many" {
		return err
	}
	if *first == nil {
		*first = d.place(err)
	}
	d.back(m)
	d.s.depth, d.s.opened = 0, false
	d.row = row + 1
	d.leftOut++
	d.note("record_left_out", e.What, 1)
	return nil
}

func (d *decoder) noneRead(first error) error {
	if len(d.layer.Features) == 0 && first != nil {
		return first
	}
	return nil
}

// sequence reads records that each begin with a record separator, RFC 8142.
func (d *decoder) sequence() error {
	var first error
	for {
		c, err := d.s.space()
		if err != nil {
			if err := d.atEnd(err); err != nil {
				return err
			}
			return d.noneRead(first)
		}
		if c == recordMark {
			d.s.pos++
			continue
		}
		if err := d.record(&first); err != nil {
			return err
		}
		// Up to the next separator there may only be white space; after a broken record there is more.
		for c, ok := d.s.peek(); ok && c != recordMark; c, ok = d.s.peek() {
			d.s.pos++
		}
	}
}

// lines reads records that stand on a line each. A line is held whole, so that a broken one does not
// take the next with it.
func (d *decoder) lines() error {
	var first error
	outer := d.s
	defer func() { d.s = outer }()
	for {
		if _, err := outer.space(); err != nil {
			if err := d.atEnd(err); err != nil {
				return err
			}
			return d.noneRead(first)
		}
		at := outer.offset()
		var line []byte
		for c, ok := outer.peek(); ok && c != '\n'; c, ok = outer.peek() {
			if len(line) >= d.o.MaxValue {
				return outer.fault("value_too_long", fmt.Sprintf("a line is longer than %d bytes", d.o.MaxValue), doSplit)
			}
			line = append(line, c)
			outer.pos++
		}
		if outer.failed != nil && !errors.Is(outer.failed, io.EOF) {
			return outer.ended()
		}
		d.s = d.within(line, at)
		err := d.record(&first)
		d.s = outer
		if err != nil {
			return err
		}
	}
}

// within gives a scanner for bytes that were read already and stand at the offset.
func (d *decoder) within(b []byte, at int64) *scanner {
	return &scanner{ctx: d.s.ctx, r: bytes.NewReader(nil), buf: b, end: len(b), base: at, failed: io.EOF, names: d.s.names,
		maxBytes: d.o.MaxBytes, maxValue: d.o.MaxValue, maxDepth: d.o.MaxDepth}
}

// held is a member that came before the type of its object was known.
type held struct {
	name string
	raw  []byte
	at   int64
}

// document reads a collection, a feature or a geometry.
func (d *decoder) document() error {
	start := d.s.offset()
	var seen memberNames
	var g shape
	var f pending
	var waiting []held
	name := ""
	d.inside = false
	first := len(d.layer.Features)
	err := d.s.object(func(member string) error {
		if err := d.once(&seen, member); err != nil {
			return err
		}
		collection := g.typ == "FeatureCollection"
		switch member {
		case "features":
			if g.typ != "" && !collection {
				return d.s.skip()
			}
			if c, err := d.s.space(); err != nil {
				return err
			} else if c != '[' {
				return d.s.fault("not_geojson", "features is not a list", doExport)
			}
			return d.s.array(func(int) error { return d.feature() })
		case "crs":
			return d.readCRS()
		case "name":
			c, err := d.s.space()
			if err != nil || c != '"' {
				return d.s.skip()
			}
			name, err = d.s.text()
			return err
		case "properties", "id", "geometry":
			switch g.typ {
			case "Feature":
				d.beginOnce()
				return d.member(member, &f)
			case "":
				raw, at, err := d.s.raw()
				waiting = append(waiting, held{member, raw, at})
				return err
			}
			return d.s.skip()
		case "coordinates", "geometries":
			if collection || g.typ == "Feature" {
				return d.s.skip()
			}
			if g.typ != "" {
				d.beginOnce()
			}
		}
		return d.shapeMember(member, &g)
	})
	if err != nil {
		return err
	}
	switch {
	case g.typ == "FeatureCollection":
		if !seen.has("features") {
			return d.fault(start, "not_geojson", "the collection has no features member", doExport)
		}
		d.name = name
		return nil
	case len(d.layer.Features) > first:
		return d.fault(start, "not_geojson", fmt.Sprintf("there are features, but the type is %q, not \"FeatureCollection\"", g.typ), doExport)
	case g.typ == "Feature":
		d.beginOnce()
		outer := d.s
		defer func() { d.s = outer }()
		for _, h := range waiting {
			d.s = d.within(h.raw, h.at)
			if err := d.member(h.name, &f); err != nil {
				return err
			}
		}
		return d.finish(&f)
	case g.typ == "Topology":
		return d.fault(start, "not_geojson", "the file is TopoJSON", "convert it to GeoJSON first")
	case g.typ == "":
		return d.fault(start, "not_geojson", "the object has no type", "choose a GeoJSON file")
	}
	d.beginOnce()
	if err := d.closeShape(&g, &f.geom); err != nil {
		return err
	}
	f.hasGeometry = true
	return d.finish(&f)
}

func (d *decoder) fault(at int64, code, what, do string) *Error {
	return &Error{Offset: at, Code: code, What: what, Do: do}
}

func (d *decoder) once(seen *memberNames, name string) error {
	if seen.has(name) {
		return d.s.fault("member_twice", fmt.Sprintf("the member %q stands twice", name), "which of the two is meant cannot be known; "+doExport)
	}
	seen.add(name)
	return nil
}

// memberNames are the names of an object's members so far: few as a rule, and then without a map.
type memberNames struct {
	few  [6]string
	n    int
	many map[string]bool
}

func (m *memberNames) has(name string) bool {
	return slices.Contains(m.few[:m.n], name) || m.many[name]
}

func (m *memberNames) add(name string) {
	if m.n < len(m.few) {
		m.few[m.n] = name
		m.n++
		return
	}
	if m.many == nil {
		m.many = map[string]bool{}
	}
	m.many[name] = true
}

// pending is a feature while it is read.
type pending struct {
	id          string
	hasID       bool
	values      []geo.Value
	geom        gathered
	hasGeometry bool
}

func (d *decoder) beginOnce() {
	if !d.inside {
		d.begin()
	}
}

func (d *decoder) begin() {
	d.row++
	d.id, d.inside = "", true
}

func (d *decoder) feature() error {
	d.begin()
	if len(d.layer.Features) >= d.o.MaxFeatures {
		return d.s.fault("too_many", fmt.Sprintf("the file has more than %d features", d.o.MaxFeatures), doSplit)
	}
	if c, err := d.s.space(); err != nil {
		return err
	} else if c != '{' {
		return d.s.fault("not_geojson", "a feature is not an object", doExport)
	}
	start := d.s.offset()
	var seen memberNames
	var f pending
	typ := ""
	err := d.s.object(func(name string) error {
		if err := d.once(&seen, name); err != nil {
			return err
		}
		if name == "type" {
			var err error
			typ, err = d.typeName()
			return err
		}
		return d.member(name, &f)
	})
	if err != nil {
		return err
	}
	if typ != "Feature" {
		return d.fault(start, "not_geojson", fmt.Sprintf("the type is %q, not \"Feature\"", typ), doExport)
	}
	if err := d.finish(&f); err != nil {
		return err
	}
	d.inside = false
	return nil
}

func (d *decoder) typeName() (string, error) {
	if c, err := d.s.space(); err != nil {
		return "", err
	} else if c != '"' {
		return "", d.s.fault("not_geojson", "the type is not a text", doExport)
	}
	return d.s.text()
}

func (d *decoder) member(name string, f *pending) error {
	switch name {
	case "id":
		return d.readID(f)
	case "properties":
		return d.properties(f)
	case "geometry":
		if null, err := d.s.null(); null || err != nil {
			return err
		}
		f.hasGeometry = true
		return d.geometry(&f.geom)
	}
	return d.s.skip()
}

func (d *decoder) readID(f *pending) error {
	c, err := d.s.space()
	if err != nil {
		return err
	}
	switch {
	case c == '"':
		f.id, err = d.s.text()
		f.hasID = f.id != ""
	case c == '-' || c >= '0' && c <= '9':
		var literal []byte
		literal, _, _, err = d.s.number()
		f.id, f.hasID = string(literal), true
	case c == 'n':
		err = d.s.word("null")
	default:
		return d.s.fault("not_geojson", "the id is neither a text nor a number", doExport)
	}
	d.id = f.id
	return err
}

func (d *decoder) properties(f *pending) error {
	if null, err := d.s.null(); null || err != nil {
		return err
	}
	if c, err := d.s.space(); err != nil {
		return err
	} else if c != '{' {
		return d.s.fault("not_geojson", "the properties are not an object", doExport)
	}
	if n := len(d.layer.Columns); n > 0 {
		f.values = make([]geo.Value, 0, n)
	}
	set := append(d.setBuf[:0], make([]bool, len(d.layer.Columns))...)
	defer func() { d.setBuf = set }()
	return d.s.object(func(name string) error {
		i, ok := d.index[name]
		if !ok {
			if i = len(d.layer.Columns); i >= d.o.MaxColumns {
				return d.s.fault("too_many", fmt.Sprintf("the file has more than %d properties", d.o.MaxColumns), "leave out the ones that are not needed")
			}
			d.index[name] = i
			d.layer.Columns = append(d.layer.Columns, geo.Column{Name: name})
		}
		for len(set) <= i {
			set = append(set, false)
		}
		if set[i] {
			return d.s.fault("member_twice", fmt.Sprintf("the property %q stands twice", name), "which of the two is meant cannot be known; "+doExport)
		}
		set[i] = true
		for len(f.values) <= i {
			f.values = append(f.values, geo.Value{})
		}
		var err error
		f.values[i], err = d.value(name)
		return err
	})
}

// maxWhole is the largest whole number up to which every whole number has a double of its own.
const maxWhole = 1 << 53

func (d *decoder) value(name string) (geo.Value, error) {
	c, err := d.s.space()
	if err != nil {
		return geo.Value{}, err
	}
	switch {
	case c == '"':
		t, err := d.s.text()
		return geo.TextValue(t), err
	case c == 't':
		return geo.BoolValue(true), d.s.word("true")
	case c == 'f':
		return geo.BoolValue(false), d.s.word("false")
	case c == 'n':
		return geo.Value{}, d.s.word("null")
	case c == '{' || c == '[':
		raw, _, err := d.s.raw()
		if err != nil {
			return geo.Value{}, err
		}
		var b bytes.Buffer
		if err := json.Compact(&b, raw); err != nil {
			return geo.Value{}, err
		}
		d.note("property_nested", name, 1)
		return geo.TextValue(b.String()), nil
	case c == '-' || c >= '0' && c <= '9':
		literal, v, whole, err := d.s.number()
		if err != nil {
			return geo.Value{}, err
		}
		if whole && (v > maxWhole || v < -maxWhole) {
			d.note("number_as_text", name, 1)
			return geo.TextValue(string(literal)), nil
		}
		return geo.NumberValue(v), nil
	}
	return geo.Value{}, d.s.notAValue(c)
}

func (d *decoder) finish(f *pending) error {
	if len(d.layer.Features) >= d.o.MaxFeatures {
		return d.s.fault("too_many", fmt.Sprintf("the file has more than %d features", d.o.MaxFeatures), doSplit)
	}
	ft := geo.Feature{ID: f.id, Values: f.values}
	if f.hasGeometry {
		ft.Geometry = f.geom.geometry(d.o.Keep)
		d.noteShape(&f.geom, ft.Geometry)
	} else {
		d.note("geometry_missing", "", 1)
	}
	if len(d.layer.Features) == cap(d.layer.Features) {
		d.layer.Features = slices.Grow(d.layer.Features, len(d.layer.Features)+1)
	}
	d.layer.Features = append(d.layer.Features, ft)
	d.rows = append(d.rows, d.row)
	d.named = append(d.named, f.hasID)
	return nil
}

func (d *decoder) noteShape(g *gathered, kept geo.LonLatGeometry) {
	for _, c := range [...]struct {
		code string
		n    int
	}{
		{"ring_closed", g.closed},
		{"part_too_short", g.tooShort},
		{"height_left_out", g.heights},
		{"collection_parted", g.others(kept.Kind)},
	} {
		if c.n > 0 {
			d.note(c.code, "", c.n)
		}
	}
	if kept.Kind == geo.NoGeometry || kept.Empty() {
		d.note("geometry_empty", "", 1)
	}
}

func (d *decoder) readCRS() error {
	at := d.s.offset()
	raw, _, err := d.s.raw()
	if err != nil {
		return err
	}
	if string(raw) == "null" {
		return nil
	}
	var c struct {
		Type       string `json:"type"`
		Properties struct {
			Name string      `json:"name"`
			Code json.Number `json:"code"`
		} `json:"properties"`
	}
	said := ""
	if err := json.Unmarshal(raw, &c); err == nil {
		if said = c.Properties.Name; said == "" && strings.EqualFold(c.Type, "EPSG") && c.Properties.Code != "" {
			said = "EPSG:" + c.Properties.Code.String()
		}
	}
	crs, ok := crsName(said)
	switch {
	case !ok && d.o.IgnoreCRS:
		d.note("crs_not_understood", said, 1)
		return nil
	case !ok:
		return d.fault(at, "crs_not_understood", "the reference system is given as "+short(raw)+", which is not understood", "say which it is, as authority and number")
	case d.crsSaid && crs != d.crs:
		return d.fault(at, "crs_twice", fmt.Sprintf("records name different reference systems, %s and %s", d.crs, crs), "split the file")
	}
	d.crs, d.crsSaid = crs, true
	return nil
}

// crsName gives "authority:code" for the forms of name in use: EPSG:4326,
// urn:ogc:def:crs:EPSG:[version]:4326, urn:ogc:def:crs:OGC:1.3:CRS84 and their web addresses.
func crsName(s string) (string, bool) {
	s = strings.TrimSpace(s)
	low := strings.ToLower(s)
	var p []string
	switch {
	case strings.HasPrefix(low, "urn:ogc:def:crs:"), strings.HasPrefix(low, "urn:x-ogc:def:crs:"):
		p = strings.Split(s, ":")[4:]
	case strings.HasPrefix(low, "http://www.opengis.net/def/crs/"), strings.HasPrefix(low, "https://www.opengis.net/def/crs/"):
		p = strings.Split(s, "/")[5:]
	default:
		p = strings.Split(s, ":")
	}
	if len(p) < 2 || len(p) > 3 {
		return "", false
	}
	authority, code := strings.ToUpper(p[0]), strings.ToUpper(p[len(p)-1])
	switch {
	case authority == "OGC" && (code == "CRS84" || code == "CRS83" || code == "CRS27"):
		return "OGC:" + code, true
	case authority == "EPSG" || authority == "ESRI":
		if n, err := strconv.Atoi(code); err == nil && n > 0 {
			return authority + ":" + strconv.Itoa(n), true
		}
	}
	return "", false
}
