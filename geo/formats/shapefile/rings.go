package shapefile

import (
	"cmp"
	"context"
	"math"
	"slices"

	"groundtally/geo"
	"groundtally/geo/index"
)

const (
	fewRings  = 12 // up to here every larger ring is looked at
	fewEdges  = 64 // up to here every edge is looked at
	stripFill = 4  // entries of strips for each edge, at most
)

// loop is one ring with what is needed to tell what lies in it.
type loop struct {
	ring   []geo.LonLat
	number int // in the file
	box    geo.Extent
	area   float64    // with sign
	inside geo.LonLat // a point well inside, if it has an inside
	strips *strips
	asked  int

	parent  *loop // the smallest ring around this one
	depth   int
	dropped bool
	part    int // of an outer ring
}

// nest makes polygons of closed rings by which lies in which: a ring inside an even number of others is an
// outer one, any other is a hole of the smallest ring around it. It is decided by one point well inside
// each ring, so that rings may touch, and a hole may reach a little over the edge of its outer ring. A ring
// that stands twice in the same direction is taken once; repeated counts the others.
func nest(ctx context.Context, rings [][]geo.LonLat) (parts [][][]geo.LonLat, repeated int, err error) {
	if len(rings) == 1 {
		return [][][]geo.LonLat{rings[:1:1]}, 0, nil
	}
	loops := make([]*loop, len(rings))
	for i, r := range rings {
		loops[i] = newLoop(r, i)
	}
	// A ring lies in larger ones only.
	slices.SortFunc(loops, func(a, b *loop) int {
		return cmp.Or(cmp.Compare(math.Abs(b.area), math.Abs(a.area)), cmp.Compare(a.number, b.number))
	})
	var tree *index.Tree
	if len(loops) > fewRings {
		boxes := make([]geo.Extent, len(loops))
		for i, l := range loops {
			boxes[i] = l.box
		}
		tree = index.New(boxes)
	}
	var around []int
	for i, l := range loops {
		if i%64 == 0 {
			if err := ctx.Err(); err != nil {
				return nil, 0, err
			}
		}
		at := geo.Extent{MinX: l.inside.Lon, MinY: l.inside.Lat, MaxX: l.inside.Lon, MaxY: l.inside.Lat}
		around = around[:0]
		if tree != nil {
			around = tree.Search(at, around)
			n, _ := slices.BinarySearch(around, i)
			around = around[:n]
		} else {
			for j := range i {
				around = append(around, j)
			}
		}
		for j := len(around) - 1; j >= 0; j-- {
			if o := loops[around[j]]; !o.dropped && o.box.Meets(at) && o.holds(l.inside) {
				l.parent, l.depth = o, o.depth+1
				break
			}
		}
		if l.parent != nil && l.same(l.parent) {
			l.dropped = true
			repeated++
		}
	}
	slices.SortFunc(loops, func(a, b *loop) int { return cmp.Compare(a.number, b.number) })
	for _, l := range loops {
		if !l.dropped && l.depth%2 == 0 {
			l.part = len(parts)
			parts = append(parts, [][]geo.LonLat{l.ring})
		}
	}
	for _, l := range loops {
		if !l.dropped && l.depth%2 == 1 {
			parts[l.parent.part] = append(parts[l.parent.part], l.ring)
		}
	}
	return parts, repeated, nil
}

func newLoop(ring []geo.LonLat, number int) *loop {
	l := &loop{ring: ring, number: number, box: geo.EmptyExtent(), inside: ring[0]}
	o := ring[0]
	for i, p := range ring {
		l.box = l.box.Add(geo.XY{X: p.Lon, Y: p.Lat})
		if i > 0 {
			// Differences to the first position, because coordinates are large against a ring's width.
			q := ring[i-1]
			l.area += ((q.Lon-o.Lon)*(p.Lat-o.Lat) - (p.Lon-o.Lon)*(q.Lat-o.Lat)) / 2
		}
	}
	// A level between the two positions next to the middle crosses edges and meets no position.
	middle := l.box.MinY + (l.box.MaxY-l.box.MinY)/2
	lo, hi := math.Inf(-1), math.Inf(1)
	for _, p := range ring {
		if p.Lat <= middle {
			lo = max(lo, p.Lat)
		} else {
			hi = min(hi, p.Lat)
		}
	}
	if math.IsInf(lo, 0) || math.IsInf(hi, 0) {
		return l // it has no height, so no inside
	}
	y := lo + (hi-lo)/2
	var xs []float64
	for i := 1; i < len(ring); i++ {
		if x, ok := crossing(ring[i-1], ring[i], y); ok {
			xs = append(xs, x)
		}
	}
	slices.Sort(xs)
	widest := -1.0
	for i := 1; i < len(xs); i += 2 {
		if w := xs[i] - xs[i-1]; w > widest {
			widest = w
			l.inside = geo.LonLat{Lon: xs[i-1] + w/2, Lat: y}
		}
	}
	return l
}

// crossing gives where an edge crosses a level; its upper end is outside of it.
func crossing(a, b geo.LonLat, y float64) (float64, bool) {
	if (a.Lat > y) == (b.Lat > y) {
		return 0, false
	}
	return a.Lon + (y-a.Lat)*((b.Lon-a.Lon)/(b.Lat-a.Lat)), true
}

// holds tells whether a point lies inside.
func (l *loop) holds(p geo.LonLat) bool {
	in := false
	look := func(i int) {
		if x, ok := crossing(l.ring[i], l.ring[i+1], p.Lat); ok && x > p.Lon {
			in = !in
		}
	}
	if l.asked++; l.asked > 1 && len(l.ring) > fewEdges {
		if l.strips == nil {
			l.strips = newStrips(l)
		}
		for _, i := range l.strips.at(p.Lat) {
			look(int(i))
		}
		return in
	}
	for i := range len(l.ring) - 1 {
		look(i)
	}
	return in
}

// same tells whether two rings run through the same positions in the same direction.
func (l *loop) same(o *loop) bool {
	n := len(l.ring) - 1
	if l.area != o.area && math.Abs(l.area-o.area) > 1e-9*math.Abs(l.area) || l.box != o.box || len(o.ring)-1 != n {
		return false
	}
	for start := range n {
		if o.ring[start] != l.ring[0] {
			continue
		}
		same := true
		for i := 0; i < n && same; i++ {
			same = l.ring[i] == o.ring[(start+i)%n]
		}
		return same // a position that stands twice in a ring is rare, and only costs the finding
	}
	return false
}

// strips sort the edges of a ring by level, so that few are looked at for a point.
type strips struct {
	low, per float64
	from     []int32 // where each strip begins in edges
	edges    []int32
}

func newStrips(l *loop) *strips {
	n := len(l.ring) - 1
	height := l.box.MaxY - l.box.MinY
	rise := 0.0
	for i := range n {
		rise += math.Abs(l.ring[i+1].Lat - l.ring[i].Lat)
	}
	// An edge stands in all strips that it passes: as many strips as keep the sum of that small.
	count := 1
	if height > 0 {
		count = max(1, int(min(float64(n)/2, (stripFill-1)*float64(n)*height/rise)))
	}
	s := &strips{low: l.box.MinY, per: float64(count) / height, from: make([]int32, count+1)}
	each := func(f func(edge, strip int)) {
		for i := range n {
			a, b := s.strip(l.ring[i].Lat), s.strip(l.ring[i+1].Lat)
			for k := min(a, b); k <= max(a, b); k++ {
				f(i, k)
			}
		}
	}
	each(func(_, k int) { s.from[k+1]++ })
	for k := range count {
		s.from[k+1] += s.from[k]
	}
	s.edges = make([]int32, s.from[count])
	next := slices.Clone(s.from)
	each(func(i, k int) {
		s.edges[next[k]] = int32(i)
		next[k]++
	})
	return s
}

func (s *strips) strip(y float64) int {
	f := (y - s.low) * s.per
	switch last := len(s.from) - 2; {
	case !(f > 0): // also where a ring without height makes it no number
		return 0
	case f >= float64(last):
		return last
	default:
		return int(f)
	}
}

func (s *strips) at(y float64) []int32 {
	k := s.strip(y)
	return s.edges[s.from[k]:s.from[k+1]]
}
