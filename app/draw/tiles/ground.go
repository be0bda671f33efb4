package tiles

import (
	"context"
	"errors"
	"math"
	"slices"
	"strings"

	"github.com/paulmach/orb"
	"github.com/paulmach/orb/simplify"

	"groundtally/geo"
	"groundtally/geo/index"
	"groundtally/geo/measure"
)

// Layer is what the map knows of one layer.
type Layer struct {
	Role     string
	Features []Feature
}

// Feature is one shape of a layer.
type Feature struct {
	ID, Name string
	Class    string
	Rank     float64 // of place names: 1 is the foremost
	Geometry geo.LonLatGeometry
}

// Name is a place name with its place.
type Name struct {
	Text string
	At   geo.XY
	Rank float64
}

// coarseMPerPx are the scales from which on a coarser copy of the shapes is drawn, and coarseCellPx the
// part of a pixel that such a copy may be off at its own finest scale.
var coarseMPerPx = [...]float64{6, 20, 60}

const coarseCellPx = 0.4

// Ground is a district made ready for drawing. It never changes, so any number of goroutines may use it.
type Ground struct {
	plane    Plane
	extent   geo.Extent
	ids      []string
	number   map[string]int
	parcels  *shapes
	sizeM    []float64 // side of a square of the parcel's area
	district *shapes
	layers   []*shapes // everything else that is drawn, lowest first
	names    []Name
}

// shapes are the drawn features of one role with one kind of geometry.
type shapes struct {
	role  string
	kind  geo.Kind
	class []string
	full  []geo.XYGeometry
	rough [len(coarseMPerPx)][]geo.XYGeometry
	boxes []geo.Extent
	tree  *index.Tree
}

// at gives the copy of the shapes that is fine enough at a scale.
func (s *shapes) at(mPerPx float64) []geo.XYGeometry {
	out := s.full
	for i, m := range coarseMPerPx {
		if mPerPx >= m {
			out = s.rough[i]
		}
	}
	return out
}

// order is the drawing order of the roles that have a look of their own; all others come first.
var order = []string{"water", "roads", "grid_lines", "dwellings", "substations"}

// NewGround projects layers, indexes them, makes their coarse copies. Positions that are not finite are
// left out. It stops with the context's error when told to.
func NewGround(ctx context.Context, layers []Layer) (*Ground, error) {
	centre, ok := middle(layers)
	if !ok {
		return nil, errors.New("the layers hold no position")
	}
	g := &Ground{plane: NewPlane(centre), extent: geo.EmptyExtent(), number: map[string]int{}}
	g.parcels, g.district = &shapes{role: "parcels", kind: geo.Polygons}, &shapes{role: "district", kind: geo.Polygons}
	made := map[string]*shapes{}
	for _, l := range layers {
		for i, f := range l.Features {
			if i%512 == 0 && ctx.Err() != nil {
				return nil, ctx.Err()
			}
			g.add(l.Role, f, made)
		}
	}
	all := slices.Concat([]*shapes{g.district, g.parcels}, g.layers)
	for _, s := range all {
		if err := s.finish(ctx); err != nil {
			return nil, err
		}
	}
	for _, s := range []*shapes{g.district, g.parcels} {
		g.extent = g.extent.Union(s.tree.Extent())
	}
	if g.extent.Empty() {
		for _, s := range g.layers {
			g.extent = g.extent.Union(s.tree.Extent())
		}
	}
	g.sizeM = make([]float64, len(g.parcels.full))
	for i, shape := range g.parcels.full {
		g.sizeM[i] = math.Sqrt(math.Abs(measure.AreaM2(shape)))
	}
	slices.SortStableFunc(g.layers, func(a, b *shapes) int { return slices.Index(order, a.role) - slices.Index(order, b.role) })
	slices.SortStableFunc(g.names, func(a, b Name) int {
		switch {
		case a.Rank < b.Rank:
			return -1
		case a.Rank > b.Rank:
			return 1
		}
		return strings.Compare(a.Text, b.Text)
	})
	return g, nil
}

// add puts a feature where it belongs.
func (g *Ground) add(role string, f Feature, made map[string]*shapes) {
	shape := project(g.plane, f.Geometry)
	switch {
	case role == "place_names":
		if at := geo.ExtentOf(shape); !at.Empty() && f.Name != "" {
			g.names = append(g.names, Name{Text: f.Name, At: at.Centre(), Rank: f.Rank})
		}
		return
	case role == "parcels":
		if shape.Kind != geo.Polygons {
			shape = geo.XYGeometry{Kind: geo.Polygons}
		}
		g.number[f.ID] = len(g.ids)
		g.ids = append(g.ids, f.ID)
		g.parcels.put(shape, f.Class)
		return
	case shape.Empty():
		return
	case role == "district" && shape.Kind == geo.Polygons:
		g.district.put(shape, f.Class)
		return
	}
	key := role + " " + shape.Kind.String()
	s := made[key]
	if s == nil {
		s = &shapes{role: role, kind: shape.Kind}
		made[key] = s
		g.layers = append(g.layers, s)
	}
	s.put(shape, f.Class)
}

func (s *shapes) put(shape geo.XYGeometry, class string) {
	s.full = append(s.full, shape)
	s.class = append(s.class, class)
	s.boxes = append(s.boxes, geo.ExtentOf(shape))
}

// finish indexes the shapes and makes their coarse copies.
func (s *shapes) finish(ctx context.Context) error {
	s.tree = index.New(s.boxes)
	for i, m := range coarseMPerPx {
		if s.kind == geo.Points {
			s.rough[i] = s.full
			continue
		}
		finer := s.full
		if i > 0 {
			finer = s.rough[i-1]
		}
		var store arena
		s.rough[i] = make([]geo.XYGeometry, len(finer))
		for j, shape := range finer {
			if j%512 == 0 && ctx.Err() != nil {
				return ctx.Err()
			}
			if s.role == "parcels" {
				s.rough[i][j] = store.snapped(shape, coarseCellPx*m)
			} else {
				s.rough[i][j] = simplified(shape, coarseCellPx*m)
			}
		}
	}
	return nil
}

// middle gives the centre of the district, else of the parcels, else of everything.
func middle(layers []Layer) (geo.LonLat, bool) {
	for _, roles := range [][]string{{"district"}, {"parcels"}, nil} {
		e := geo.EmptyExtent()
		for _, l := range layers {
			if roles != nil && !slices.Contains(roles, l.Role) {
				continue
			}
			for _, f := range l.Features {
				f.Geometry.Each(func(p geo.LonLat) {
					if p.Finite() && math.Abs(p.Lat) < 89 {
						e = e.Add(geo.XY{X: p.Lon, Y: p.Lat})
					}
				})
			}
		}
		if !e.Empty() {
			return geo.LonLat{Lon: e.Centre().X, Lat: e.Centre().Y}, true
		}
	}
	return geo.LonLat{}, false
}

func project(plane Plane, g geo.LonLatGeometry) geo.XYGeometry {
	out := geo.XYGeometry{Kind: g.Kind}
	at := make([]geo.XY, 0, g.Count()+len(g.Parts))
	for _, part := range g.Parts {
		rings := make([][]geo.XY, 0, len(part))
		for _, ring := range part {
			from := len(at)
			for _, p := range ring {
				if q := plane.To(p); q.Finite() {
					at = append(at, q)
				}
			}
			if g.Kind == geo.Polygons && len(at) > from && at[from] != at[len(at)-1] {
				at = append(at, at[from])
			}
			if len(at) > from {
				rings = append(rings, at[from:len(at):len(at)])
			}
		}
		if len(rings) > 0 {
			out.Parts = append(out.Parts, rings)
		}
	}
	return out
}

// arena holds many small slices end to end, so that a hundred thousand parcels are not a million
// allocations.
type arena struct {
	at    []geo.XY
	rings [][]geo.XY
	parts [][][]geo.XY
}

// snapped moves every position to a grid and drops what then falls together or lies on a straight line.
// Unlike a simplification ring by ring, it moves a corner that parcels share in the same way for each
// of them, so that no gap opens between neighbours.
func (a *arena) snapped(g geo.XYGeometry, cellM float64) geo.XYGeometry {
	rings := 0
	for _, part := range g.Parts {
		rings += len(part)
	}
	a.at, a.rings, a.parts = room(a.at, g.Count()), room(a.rings, rings), room(a.parts, len(g.Parts))
	firstPart := len(a.parts)
	for _, part := range g.Parts {
		firstRing := len(a.rings)
		for _, ring := range part {
			from := len(a.at)
			for _, p := range ring {
				q := geo.XY{X: math.Round(p.X/cellM) * cellM, Y: math.Round(p.Y/cellM) * cellM}
				n := len(a.at)
				if n > from && a.at[n-1] == q {
					continue
				}
				if n > from+1 && straight(a.at[n-2], a.at[n-1], q, cellM) {
					a.at[n-1] = q
					continue
				}
				a.at = append(a.at, q)
			}
			if len(a.at)-from < 4 { // a closed ring with an area has four positions
				a.at = a.at[:from]
				continue
			}
			a.rings = append(a.rings, a.at[from:len(a.at):len(a.at)])
		}
		if len(a.rings) > firstRing {
			a.parts = append(a.parts, a.rings[firstRing:len(a.rings):len(a.rings)])
		}
	}
	return geo.XYGeometry{Kind: geo.Polygons, Parts: a.parts[firstPart:len(a.parts):len(a.parts)]}
}

// room gives s with room for n more, or else an empty slice that has it, as what was put is never moved.
func room[T any](s []T, n int) []T {
	if cap(s)-len(s) >= n {
		return s
	}
	return make([]T, 0, max(n, 8192))
}

// straight reports whether b lies between a and c on a line, all three being on a grid.
func straight(a, b, c geo.XY, cellM float64) bool {
	u, v := b.Sub(a), c.Sub(b)
	return math.Abs(u.X*v.Y-u.Y*v.X) < cellM*cellM/2 && u.X*v.X+u.Y*v.Y > 0
}

// simplified thins out lines, and areas that share no border, by Douglas and Peucker's rule.
func simplified(g geo.XYGeometry, toleranceM float64) geo.XYGeometry {
	dp := simplify.DouglasPeucker(toleranceM)
	out := geo.XYGeometry{Kind: g.Kind, Parts: make([][][]geo.XY, 0, len(g.Parts))}
	for _, part := range g.Parts {
		rings := make([][]geo.XY, 0, len(part))
		for _, ring := range part {
			ls := make(orb.LineString, len(ring))
			for i, p := range ring {
				ls[i] = orb.Point{p.X, p.Y}
			}
			ls = dp.LineString(ls)
			if g.Kind == geo.Polygons && len(ls) < 4 {
				continue
			}
			thin := make([]geo.XY, len(ls))
			for i, p := range ls {
				thin[i] = geo.XY{X: p[0], Y: p[1]}
			}
			rings = append(rings, thin)
		}
		if len(rings) > 0 {
			out.Parts = append(out.Parts, rings)
		}
	}
	return out
}

// Plane gives the plane that the district is drawn in.
func (g *Ground) Plane() Plane { return g.plane }

// Extent gives the extent of district and parcels in the plane, or of everything when there are neither.
func (g *Ground) Extent() geo.Extent { return g.extent }

// Parcels gives the number of parcels; they are numbered from 0 in the order of their layer.
func (g *Ground) Parcels() int { return len(g.ids) }

// ID gives the identifier of a parcel.
func (g *Ground) ID(parcel int) string { return g.ids[parcel] }

// Number gives the number of the parcel with an identifier.
func (g *Ground) Number(id string) (int, bool) {
	n, ok := g.number[id]
	return n, ok
}

// ParcelExtent gives the extent of a parcel; it is empty when the parcel has no geometry.
func (g *Ground) ParcelExtent(parcel int) geo.Extent { return g.parcels.boxes[parcel] }

// Anchor gives a position well inside a parcel, for a sign; it reports false when the parcel has no area.
func (g *Ground) Anchor(parcel int) (geo.XY, bool) {
	shape := g.parcels.full[parcel]
	best, bestM2 := -1, 0.0
	for i, part := range shape.Parts {
		if a := math.Abs(measure.SignedRingAreaM2(part[0])); a > bestM2 {
			best, bestM2 = i, a
		}
	}
	if best < 0 {
		return geo.XY{}, false
	}
	return measure.InteriorPoint(shape.Parts[best])
}

// Names gives the place names, the foremost first.
func (g *Ground) Names() []Name { return g.names }

// Hit gives the parcel at a place. Holes are outside; of parcels that overlap the last counts, as it is
// the one that is seen.
func (g *Ground) Hit(at geo.XY) (int, bool) {
	found := g.parcels.tree.Search(geo.Extent{MinX: at.X, MinY: at.Y, MaxX: at.X, MaxY: at.Y}, nil)
	for _, n := range slices.Backward(found) {
		if measure.Inside(at, g.parcels.full[n]) {
			return n, true
		}
	}
	return 0, false
}

// Within gives the parcels that lie wholly inside a box, in rising order.
func (g *Ground) Within(box geo.Extent) []int {
	found := g.parcels.tree.Search(box, nil)
	return slices.DeleteFunc(found, func(n int) bool {
		b := g.parcels.boxes[n]
		return b.MinX < box.MinX || b.MaxX > box.MaxX || b.MinY < box.MinY || b.MaxY > box.MaxY
	})
}
