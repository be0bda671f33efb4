package shapefile

import (
	"encoding/binary"
	"fmt"
	"math"
	"slices"
	"strconv"

	"groundtally/geo"
	"groundtally/geo/formats"
)

const (
	headBytes   = 100
	recordHead  = 8
	fileCode    = 9994
	multipatch  = 31
	noDataBelow = -1e38 // a measure below it is none, after the published layout
	beyond      = 1e38  // no coordinate lies there
)

// shapes is the .shp.
type shapes struct {
	w    window
	size int64
	said int64 // length after the header
	typ  int32
	kind geo.Kind
}

// span is the content of a record, behind its header.
type span struct{ at, n int64 }

type kindOf struct {
	kind            geo.Kind
	height, measure bool
}

// kinds are the types of shape that are read, but for 0, which has no shape.
var kinds = map[int32]kindOf{
	1: {geo.Points, false, false}, 3: {geo.Lines, false, false}, 5: {geo.Polygons, false, false}, 8: {geo.Points, false, false},
	11: {geo.Points, true, true}, 13: {geo.Lines, true, true}, 15: {geo.Polygons, true, true}, 18: {geo.Points, true, true},
	21: {geo.Points, false, true}, 23: {geo.Lines, false, true}, 25: {geo.Polygons, false, true}, 28: {geo.Points, false, true},
}

func single(typ int32) bool { return typ%10 == 1 }

func openShapes(f *feed, p *Part) (*shapes, error) {
	s := &shapes{w: window{feed: f, src: p}, size: p.Size}
	if p.Size == 0 {
		return nil, &formats.Error{Code: "empty_file", What: "the .shp is empty", Do: doCopy}
	}
	head, err := s.w.at(0, int(min(max(p.Size, 0), headBytes)))
	if err != nil {
		return nil, err
	}
	if len(head) >= 4 && binary.BigEndian.Uint32(head) != fileCode {
		return nil, &formats.Error{Code: "not_shapefile", What: "the .shp does not begin as a shapefile does", Do: "choose a shapefile"}
	}
	if len(head) < headBytes {
		return nil, &formats.Error{Code: "truncated", What: fmt.Sprintf("the .shp ends after %d bytes, within its header", len(head)), Do: doCopy}
	}
	s.said = 2 * int64(binary.BigEndian.Uint32(head[24:]))
	s.typ = int32(binary.LittleEndian.Uint32(head[32:]))
	k, ok := kinds[s.typ]
	switch {
	case s.typ == multipatch:
		return nil, &formats.Error{Code: "multipatch", What: "the .shp holds multipatches, surfaces in space", Do: "convert them to polygons and export the set again"}
	case !ok && s.typ != 0:
		return nil, &formats.Error{Code: "unknown_type", What: fmt.Sprintf("the .shp holds shapes of type %d, which there is not", s.typ), Do: doCopy}
	}
	s.kind = k.kind
	return s, nil
}

// head reads the header of a record.
func (s *shapes) head(at int64) (number int, n int64, err error) {
	b, err := s.w.at(at, recordHead)
	if err != nil {
		return 0, 0, err
	}
	return int(int32(binary.BigEndian.Uint32(b))), 2 * int64(int32(binary.BigEndian.Uint32(b[4:]))), nil
}

func (s *shapes) content(at span) ([]byte, error) { return s.w.at(at.at, int(at.n)) }

// told notes what was found about the file as a whole.
func (s *shapes) told(b book) {
	if s.said != s.size {
		b.note("length_disagrees", 0, 1).with("header", strconv.FormatInt(s.said, 10), "file", strconv.FormatInt(s.size, 10))
	}
}

// walk goes from record to record by their lengths.
type walk struct {
	pos   int64
	count int
}

func (g *walk) next(s *shapes) (span, string, bool, error) {
	if g.pos == 0 {
		g.pos = headBytes
	}
	fault := func(code, what string) error {
		return &formats.Error{Where: "feature " + strconv.Itoa(g.count+1), Code: code, What: what, Do: doCopy}
	}
	cut := fmt.Sprintf("the .shp ends here; by its header it has %d bytes, and it has %d", s.said, s.size)
	left := s.size - g.pos
	past := g.pos >= s.said // here may stand records that the header does not count, or bytes that fill up
	if left < recordHead {
		if !past {
			return span{}, "", false, fault("truncated", cut)
		}
		return span{}, "", false, nil
	}
	number, n, err := s.head(g.pos)
	if err != nil {
		return span{}, "", false, err
	}
	left -= recordHead
	fits := n >= 0 && n <= left
	switch {
	case past && (!fits || n < 4 || number != g.count+1):
		return span{}, "", false, nil
	case n < 0:
		return span{}, "", false, fault("bad_length", "the record has a negative length, so that the next one cannot be found")
	case !fits && s.said > s.size:
		return span{}, "", false, fault("truncated", cut)
	case !fits:
		return span{}, "", false, fault("bad_length", fmt.Sprintf("by its header the record has %d bytes, and the file has %d more, so that the next one cannot be found", n, left))
	}
	g.count++
	at := span{g.pos + recordHead, n}
	g.pos = at.at + n
	return at, "", true, nil
}

// byIndex goes by the .shx.
type byIndex struct {
	spans  []span
	strict bool // a record that is not as long as the index says ends the reading with errIndex
	i      int
}

func (g *byIndex) next(s *shapes) (span, string, bool, error) {
	if g.i >= len(g.spans) {
		return span{}, "", false, nil
	}
	at := g.spans[g.i]
	g.i++
	_, n, err := s.head(at.at - recordHead)
	if err != nil {
		return span{}, "", false, err
	}
	if n != at.n {
		if g.strict {
			return span{}, "", false, errIndex
		}
		return at, "the length of the record is not the one in the index", true, nil
	}
	return at, "", true, nil
}

// index reads the .shx. It is broken with a text saying why when it cannot be an index of this file.
func (s *shapes) index(p *Part) (spans []span, broken string, err error) {
	if p.Size < headBytes {
		return nil, "it has no whole header", nil
	}
	w := window{feed: s.w.feed, src: p}
	head, err := w.at(0, headBytes)
	if err != nil {
		return nil, "", err
	}
	if binary.BigEndian.Uint32(head) != fileCode {
		return nil, "it does not begin as an index does", nil
	}
	if said := 2 * int64(binary.BigEndian.Uint32(head[24:])); said != p.Size || (p.Size-headBytes)%8 != 0 {
		return nil, "it does not have the length that its header says", nil
	}
	const step = 1024
	for at := int64(headBytes); at < p.Size; {
		b, err := w.at(at, int(min(8*step, p.Size-at)))
		if err != nil {
			return nil, "", err
		}
		at += int64(len(b))
		for ; len(b) > 0; b = b[8:] {
			e := span{2*int64(binary.BigEndian.Uint32(b)) + recordHead, 2 * int64(int32(binary.BigEndian.Uint32(b[4:])))}
			if e.n < 0 || e.at < headBytes+recordHead || e.at+e.n > s.size {
				return nil, "it points outside of the .shp", nil
			}
			spans = append(spans, e)
		}
	}
	return spans, "", nil
}

// seamless tells whether the records of an index stand one behind the other and fill the file.
func (s *shapes) seamless(spans []span) bool {
	pos := int64(headBytes)
	for _, e := range spans {
		if e.at != pos+recordHead {
			return false
		}
		pos = e.at + e.n
	}
	return pos == s.size && s.size == s.said
}

// judge decides between an index and the records as they follow each other; why is the reason against the
// index. An edited file has gaps and records out of order, and only its index is right. An index that is
// left over from another state of the file disagrees with records that follow each other without a fault.
func (s *shapes) judge(spans []span) (why string, err error) {
	sorted := slices.Clone(spans)
	slices.SortFunc(sorted, func(a, b span) int { return int(min(max(a.at-b.at, -1), 1)) })
	for i := 1; i < len(sorted); i++ {
		if sorted[i].at-recordHead < sorted[i-1].at+sorted[i-1].n {
			return "its records overlap", nil
		}
	}
	wrong := 0
	for _, e := range spans {
		_, n, err := s.head(e.at - recordHead)
		if err != nil {
			return "", err
		}
		if n != e.n {
			wrong++
		}
	}
	clean, inOrder, count := true, true, 0
	pos := int64(headBytes)
	for pos < s.size {
		if s.size-pos < recordHead {
			clean = false
			break
		}
		number, n, err := s.head(pos)
		if err != nil {
			return "", err
		}
		if n < 4 || n > s.size-pos-recordHead {
			clean = false
			break
		}
		count++
		inOrder = inOrder && number == count
		pos += recordHead + n
	}
	switch {
	case clean && wrong > 0, 2*wrong > len(spans):
		return "it points beside the records", nil
	case clean && inOrder && count != len(spans):
		return fmt.Sprintf("it has %d entries, and the .shp has %d records", len(spans), count), nil
	case s.said > s.size && !(clean && count == len(spans)):
		return "the .shp is cut short", nil // walking tells where
	}
	return "", nil
}

// shape is one record's content.
type shape struct {
	null      bool
	kind      geo.Kind
	typ       int32
	positions int
	parts     int
	at        int // where the positions begin

	rings                      [][]geo.LonLat
	closed, tooShort           int
	heights, measures, surplus int
}

const doesNotFit = "its length does not fit its numbers of parts and positions"

// read looks at the head of a record. It gives why the record is broken, "" if it is not.
func (h *shape) read(b []byte, s *shapes) string {
	if len(b) < 4 {
		return "it is too short for a type"
	}
	h.typ = int32(binary.LittleEndian.Uint32(b))
	if h.typ == 0 {
		h.null = true
		h.surplus = min(len(b)-4, 1)
		return ""
	}
	k, ok := kinds[h.typ]
	switch {
	case h.typ == multipatch:
		return "it is a multipatch"
	case !ok:
		return "there is no such type of shape"
	case k.kind != s.kind:
		return "its type is not that of the file"
	}
	h.kind = k.kind
	switch {
	case single(h.typ):
		h.at, h.positions = 4, 1
	case k.kind == geo.Points:
		if len(b) < 40 {
			return doesNotFit
		}
		h.positions, h.at = int(int32(binary.LittleEndian.Uint32(b[36:]))), 40
	default:
		if len(b) < 44 {
			return doesNotFit
		}
		h.parts, h.positions, h.at = int(int32(binary.LittleEndian.Uint32(b[36:]))), int(int32(binary.LittleEndian.Uint32(b[40:]))), 44
	}
	if h.parts < 0 || h.positions < 0 {
		return "a number of parts or positions is negative"
	}
	if h.parts > len(b)/4 || h.positions > len(b)/16 {
		return doesNotFit
	}
	h.at += 4 * h.parts
	return h.fit(b, k)
}

// fit compares the length of a record with what it must hold. Measures may be missing with heights and,
// in the files of some writers, without.
func (h *shape) fit(b []byte, k kindOf) string {
	n := h.positions
	extra := 16 + 8*n // the range, then one number for each position
	if single(h.typ) {
		extra = 8
	}
	need := h.at + 16*n
	if k.height {
		need += extra
	}
	if len(b) < need {
		return doesNotFit
	}
	if k.height {
		h.heights = n
	}
	rest := b[need:]
	switch {
	case len(rest) == 0:
	case k.measure && len(rest) >= extra:
		for i := extra - 8*n; i < extra; i += 8 {
			if m := math.Float64frombits(binary.LittleEndian.Uint64(rest[i:])); m > noDataBelow {
				h.measures++
			}
		}
		h.surplus = min(len(rest)-extra, 1)
	default:
		h.surplus = 1
	}
	return ""
}

// build takes the positions. It is called when their number is known to be in bounds.
func (h *shape) build(b []byte) string {
	if h.null {
		return ""
	}
	all := make([]geo.LonLat, h.positions)
	for i := range all {
		c := b[h.at+16*i:]
		p := geo.LonLat{Lon: math.Float64frombits(binary.LittleEndian.Uint64(c)), Lat: math.Float64frombits(binary.LittleEndian.Uint64(c[8:]))}
		if !(math.Abs(p.Lon) < beyond && math.Abs(p.Lat) < beyond) { // also what is not a number
			return "a coordinate is not a number"
		}
		all[i] = p
	}
	if h.kind == geo.Points {
		for i := range all {
			h.rings = append(h.rings, all[i:i+1:i+1])
		}
		return ""
	}
	if h.parts == 0 && h.positions > 0 {
		return "it has positions and no part"
	}
	from := func(i int) int {
		if i == h.parts {
			return h.positions
		}
		return int(int32(binary.LittleEndian.Uint32(b[44+4*i:])))
	}
	if h.parts > 0 && from(0) != 0 {
		return "its first part does not begin with its first position"
	}
	for i := range h.parts {
		a, z := from(i), from(i+1)
		if a < 0 || a > z || z > h.positions {
			return "its parts are out of order"
		}
		ring := all[a:z:z]
		open := h.kind == geo.Polygons && len(ring) > 0 && ring[0] != ring[len(ring)-1]
		if open {
			ring = append(ring, ring[0])
		}
		if h.kind == geo.Polygons && len(ring) < 4 || len(ring) < 2 {
			h.tooShort++
			continue
		}
		if open {
			h.closed++
		}
		h.rings = append(h.rings, ring)
	}
	return ""
}
