package overlay

import (
	"bytes"
	"encoding/binary"
	"math"
	"slices"

	"github.com/twpayne/go-geos"

	"groundtally/geo"
)

// memory holds what Buildable found out about one site, so that the next call for the same site under
// rules that are partly the same need not compute it again. Its geometries outlive the call that made them
// and are destroyed with the memory: at the next site, at a fault, when the engine is closed.
//
// Only results of the first attempt, in floating precision, are kept. A result that failed to close the
// account fails again in the same way.
type memory struct {
	site   []byte // what the site was read from
	rules  []*known
	shapes map[string]*shape
	held   []*geos.Geom
}

// mostKnown bounds the rules that are kept for one site.
const mostKnown = 256

// known is what one rule takes from the site.
type known struct {
	id       uint32 // number among the site's rules
	setbackM float64
	boundary bool
	checked  bool
	features []geo.XYGeometry // of a checked rule, which nobody alters
	pieces   []piece          // parts that reach the site

	whole             bool         // one piece covers the whole site
	region            *geos.Geom   // what the rule takes in and around the site; nil when nothing or whole
	parts             [][][]geo.XY // the polygons of the region, of a boundary rule those of what it leaves; not of an asIs rule
	repaired, retries int
}

// shape is a geometry with its area.
type shape struct {
	g       *geos.Geom
	areaM2  float64
	retries int // of its own making, not of what it was made from
}

// at forgets everything unless the site, as written in well-known binary, is the one known.
func (m *memory) at(site []byte) {
	if len(m.rules) <= mostKnown && bytes.Equal(m.site, site) {
		return
	}
	m.forget()
	m.site = append(m.site[:0], site...)
}

// forget destroys everything.
func (m *memory) forget() {
	for _, g := range m.held {
		g.Destroy()
	}
	clear(m.held)
	clear(m.rules)
	if m.shapes == nil {
		m.shapes = map[string]*shape{}
	}
	clear(m.shapes)
	m.site, m.rules, m.held = m.site[:0], m.rules[:0], m.held[:0]
}

// given finds a rule by the features that it was given. Only features that are never altered can be told
// by where they are stored.
func (m *memory) given(r Rule) *known {
	for _, k := range m.rules {
		if k.boundary != r.Boundary || k.setbackM != r.SetbackM || k.checked != r.Checked {
			continue
		}
		if r.Boundary || r.Checked && slices.EqualFunc(k.features, r.Features, sameStore) {
			return k
		}
	}
	return nil
}

func sameStore(a, b geo.XYGeometry) bool {
	return a.Kind == b.Kind && len(a.Parts) == len(b.Parts) && (len(a.Parts) == 0 || &a.Parts[0] == &b.Parts[0])
}

// alike finds a rule by the positions of the pieces that reach the site.
func (m *memory) alike(r Rule, ps []piece) *known {
	for _, k := range m.rules {
		if k.boundary == r.Boundary && k.setbackM == r.SetbackM && k.checked == r.Checked && slices.EqualFunc(k.pieces, ps, samePiece) {
			return k
		}
	}
	return nil
}

func samePiece(a, b piece) bool {
	return a.x == b.x && a.g.Kind == b.g.Kind && slices.EqualFunc(a.g.Parts[0], b.g.Parts[0], slices.Equal[[]geo.XY])
}

// add takes in a rule. Features that the caller may alter are copied.
func (m *memory) add(k *known, r Rule, ps []piece) {
	k.id = uint32(len(m.rules))
	k.setbackM, k.boundary, k.checked = r.SetbackM, r.Boundary, r.Checked
	if r.Checked {
		k.features, k.pieces = slices.Clone(r.Features), ps
	} else {
		for _, p := range ps {
			part := make([][]geo.XY, len(p.g.Parts[0]))
			for i, ring := range p.g.Parts[0] {
				part[i] = slices.Clone(ring)
			}
			k.pieces = append(k.pieces, piece{geo.XYGeometry{Kind: p.g.Kind, Parts: [][][]geo.XY{part}}, p.x})
		}
	}
	m.rules = append(m.rules, k)
}

// name identifies a shape that follows from rules taken in that order, a number.
func name(step byte, ks []*known, x float64) string {
	b := make([]byte, 0, 9+4*len(ks))
	b = append(b, step)
	b = binary.LittleEndian.AppendUint64(b, math.Float64bits(x))
	for _, k := range ks {
		b = binary.LittleEndian.AppendUint32(b, k.id)
	}
	return string(b)
}

// recall gives a shape from memory, or makes it. What it is made from must have been recalled before, so
// that operations tried again are counted once.
func (e *Engine) recall(name string, compute func() *geos.Geom) *shape {
	if s, ok := e.memory.shapes[name]; ok && e.grid == 0 {
		e.retries += s.retries
		return s
	}
	before := e.retries
	g := compute()
	s := &shape{g: g, areaM2: g.Area(), retries: e.retries - before}
	if e.grid == 0 {
		e.memory.hold(e.keep(g))
		e.memory.shapes[name] = s
	}
	return s
}

// hold makes the memory the owner of a geometry.
func (m *memory) hold(g *geos.Geom) { m.held = append(m.held, g) }
