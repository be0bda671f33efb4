package measure

import (
	"cmp"
	"slices"
	"sort"

	"groundtally/geo"
)

// Span is a closed interval of X in metres.
type Span struct{ Lo, Hi float64 }

// Slicer answers where horizontal lines run inside polygons. It is read-only after NewSlicer, so
// goroutines may share it.
type Slicer struct {
	edges  []edge
	extent geo.Extent
}

type edge struct{ lo, hi geo.XY } // lo.Y < hi.Y

// NewSlicer prepares the polygons of g, whose parts must not overlap. Level edges carry no crossing and
// are left out; their line is found from the edges that end on it.
func NewSlicer(g geo.XYGeometry) *Slicer {
	s := &Slicer{extent: geo.ExtentOf(g)}
	if g.Kind != geo.Polygons {
		return s
	}
	for _, part := range g.Parts {
		for _, ring := range part {
			for i := 1; i < len(ring); i++ {
				a, b := ring[i-1], ring[i]
				if a.Y > b.Y {
					a, b = b, a
				}
				if a.Y < b.Y {
					s.edges = append(s.edges, edge{a, b})
				}
			}
		}
	}
	slices.SortFunc(s.edges, func(a, b edge) int {
		return cmp.Or(cmp.Compare(a.lo.Y, b.lo.Y), cmp.Compare(a.lo.X, b.lo.X), cmp.Compare(a.hi.Y, b.hi.Y), cmp.Compare(a.hi.X, b.hi.X))
	})
	return s
}

// Extent gives the extent of the prepared polygons.
func (s *Slicer) Extent() geo.Extent { return s.extent }

// At appends to buf the spans of the line Y = y inside the polygons by the even-odd rule, in rising
// order. On a level edge the inside above it counts.
func (s *Slicer) At(y float64, buf []Span) []Span {
	n := sort.Search(len(s.edges), func(i int) bool { return s.edges[i].lo.Y > y })
	var few [32]float64
	xs := few[:0]
	for _, e := range s.edges[:n] {
		if e.hi.Y <= y {
			continue
		}
		t := (y - e.lo.Y) / (e.hi.Y - e.lo.Y)
		xs = append(xs, e.lo.X+float64(t*(e.hi.X-e.lo.X)))
	}
	slices.Sort(xs)
	for i := 0; i+1 < len(xs); i += 2 {
		buf = append(buf, Span{xs[i], xs[i+1]})
	}
	return buf
}

// Closed appends to buf the spans of the line Y = y inside the polygons grown by tolM metres: the lines
// at y − tolM, y, y + tolM joined, each span longer by tolM at both ends. Positions on an edge, level
// or not, are inside in spite of rounding when tolM is larger than the rounding of the coordinates.
func (s *Slicer) Closed(y, tolM float64, buf []Span) []Span {
	from := len(buf)
	buf = s.At(y-tolM, buf)
	buf = s.At(y, buf)
	buf = s.At(y+tolM, buf)
	own := buf[from:]
	if len(own) == 0 {
		return buf
	}
	slices.SortFunc(own, func(a, b Span) int { return cmp.Or(cmp.Compare(a.Lo, b.Lo), cmp.Compare(a.Hi, b.Hi)) })
	k := 0
	for i := range own {
		sp := Span{own[i].Lo - tolM, own[i].Hi + tolM}
		if k > 0 && sp.Lo <= own[k-1].Hi {
			own[k-1].Hi = max(own[k-1].Hi, sp.Hi)
			continue
		}
		own[k] = sp
		k++
	}
	return buf[:from+k]
}

// InteriorPoint gives a position well inside one polygon part (an outer ring with its holes): the middle
// of the longest of 31 evenly spaced level spans. It reports false when the part has no area.
func InteriorPoint(part [][]geo.XY) (geo.XY, bool) {
	s := NewSlicer(geo.XYGeometry{Kind: geo.Polygons, Parts: [][][]geo.XY{part}})
	if s.extent.Empty() {
		return geo.XY{}, false
	}
	const lines = 31
	var buf []Span
	best, at := 0.0, geo.XY{}
	// From the middle outwards, so that a rectangle gives its centre.
	for k := range lines {
		step := float64((k + 1) / 2)
		if k%2 == 1 {
			step = -step
		}
		y := s.extent.MinY + (s.extent.MaxY-s.extent.MinY)*(0.5+step/(lines+1))
		buf = s.At(y, buf[:0])
		for _, sp := range buf {
			// A longer span must be clearly longer, or rounding would choose between equal ones.
			if l := sp.Hi - sp.Lo; l > best*(1+1e-9) {
				best, at = l, geo.XY{X: sp.Lo + l/2, Y: y}
			}
		}
	}
	return at, best > 0
}
