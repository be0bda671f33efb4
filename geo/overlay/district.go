package overlay

import (
	"cmp"
	"fmt"
	"maps"
	"math"
	"slices"

	"github.com/twpayne/go-geos"

	"groundtally/geo"
	"groundtally/geo/index"
	"groundtally/geo/measure"
)

// Tiles gives the squares of a grid through the frame's origin that share more than an edge with the extent,
// from south to north, from west to east in each row. The side is a whole number of metres, so that the edges
// of neighbours are equal to the last bit, on every grid that an overlay may be done on. There are none for
// an empty extent, for one that is not finite, for a side that is not as asked.
func Tiles(extent geo.Extent, sizeM float64) []geo.Extent {
	finite := geo.XY{X: extent.MinX, Y: extent.MinY}.Finite() && geo.XY{X: extent.MaxX, Y: extent.MaxY}.Finite()
	if extent.Empty() || !finite || !(sizeM >= 1) || sizeM != math.Trunc(sizeM) || math.IsInf(sizeM, 0) {
		return nil
	}
	span := func(lo, hi float64) (from, to float64) {
		from, to = math.Floor(lo/sizeM), math.Ceil(hi/sizeM)
		return from, max(to, from+1) // an extent without width lies in one tile
	}
	x0, x1 := span(extent.MinX, extent.MaxX)
	y0, y1 := span(extent.MinY, extent.MaxY)
	out := make([]geo.Extent, 0, int((x1-x0)*(y1-y0)))
	for y := y0; y < y1; y++ {
		for x := x0; x < x1; x++ {
			out = append(out, geo.Extent{MinX: x * sizeM, MinY: y * sizeM, MaxX: (x + 1) * sizeM, MaxY: (y + 1) * sizeM})
		}
	}
	return out
}

// TileInput is a tile of a district with the rules that take land in it.
type TileInput struct {
	Tile geo.Extent // one of Tiles
	// District is valid. Nobody may alter it from then on: an Engine remembers large polygons.
	District geo.XYGeometry
	// Rules are those of RuleOf, or of polygons without a setback: a rule that were widened tile by tile would
	// not fit together at the edges. For the distance from the district's own edge see EdgeLayer.
	Rules     []Rule
	KeepTaken bool
}

// LandLeft gives what the rules leave of a district in one tile and what each took there, as Buildable does
// for a site. Nothing is dropped for being narrow or small, which at a tile's edge would mean nothing: that is
// for Zones. A tile outside the district gives a result without area.
func (e *Engine) LandLeft(in TileInput) (BuildableResult, error) {
	none := BuildableResult{Buildable: geo.XYGeometry{Kind: geo.Polygons}, Rules: make([]RuleTaken, len(in.Rules))}
	for i, r := range in.Rules {
		if r.Boundary || r.SetbackM != 0 {
			return BuildableResult{}, fmt.Errorf("land left: rule %q is not widened: make it a layer", r.Name)
		}
		none.Rules[i] = RuleTaken{Name: r.Name, Taken: geo.XYGeometry{Kind: geo.Polygons}}
	}
	if in.District.Kind != geo.Polygons {
		return BuildableResult{}, fmt.Errorf("land left: the district is a %v, want polygons", in.District.Kind)
	}
	site, err := e.inTile(in.District, in.Tile)
	if err != nil {
		return BuildableResult{}, err
	}
	if !(measure.AreaM2(site) > 0) {
		return none, nil
	}
	return e.Buildable(BuildableInput{Site: site, Rules: in.Rules, KeepTaken: in.KeepTaken})
}

// inTile cuts a valid district to a tile.
func (e *Engine) inTile(district geo.XYGeometry, tile geo.Extent) (out geo.XYGeometry, err error) {
	out.Kind = geo.Polygons
	err = e.do("district in tile", func() {
		for i, part := range district.Parts {
			x, finite := extentOf(part)
			if !finite {
				fail("part %d of the district has a position that is not finite", i+1)
			}
			if !x.Meets(tile) {
				continue
			}
			out.Parts = append(out.Parts, e.give(e.cutPart(part, x, tile), geo.Polygons).Parts...)
		}
		slices.SortFunc(out.Parts, compareParts)
	})
	return out, err
}

// boxOf gives the part of a polygon that fills an extent, in normal form.
func boxOf(x geo.Extent) [][]geo.XY {
	return [][]geo.XY{{{X: x.MinX, Y: x.MinY}, {X: x.MaxX, Y: x.MinY}, {X: x.MaxX, Y: x.MaxY}, {X: x.MinX, Y: x.MaxY}, {X: x.MinX, Y: x.MinY}}}
}

// EdgeLayer gives the strip of setbackM metres inside the edge of a valid district as a layer, so that it is
// the same in all tiles.
func (e *Engine) EdgeLayer(district geo.XYGeometry, setbackM float64) (*Layer, error) {
	var strip geo.XYGeometry
	err := e.do("edge of the district", func() {
		if bad(setbackM) {
			fail("the setback %v m must be 0 or more", setbackM)
		}
		if setbackM == 0 || district.Empty() {
			return
		}
		g := e.load(district)
		// The strip reaches beyond the district, so that its outer edge does not run along the district's.
		x := geo.ExtentOf(district).Grow(2)
		rim := e.own(e.ctx.NewGeomFromBounds(x.MinX, x.MinY, x.MaxX, x.MaxY), "box")
		strip = e.give(e.overlay(difference, rim, e.setback(g, -setbackM)), geo.Polygons)
	})
	if err != nil {
		return nil, err
	}
	if strip.Empty() {
		return packed(nil), nil
	}
	return packed([]geo.XYGeometry{strip}), nil
}

// Zones joins what is left in the tiles of a district into connected zones, each one polygon, in the order of
// their least positions, without the corners that tiles have made on straight edges; then drops from each what is narrower than widthM metres, as Buildable does, which
// may part it, and of the rest what is smaller than patchM2 square metres. Zero keeps everything.
//
// The parts are polygons that do not overlap, as those that LandLeft gives; their order does not matter, bit
// for bit. Patches are joined where they share a stretch of an upright or level edge, as tiles cut them;
// touching at a point joins nothing. Widths are worked out square by square; the library holds one square, then
// one zone at a time.
func (e *Engine) Zones(parts []geo.XYGeometry, widthM, patchM2 float64) ([]geo.XYGeometry, error) {
	if bad(widthM) || bad(patchM2) {
		return nil, fmt.Errorf("zones: smallest width %v m, smallest patch %v m2: want 0 or more", widthM, patchM2)
	}
	var patches [][][]geo.XY
	for i, g := range parts {
		if g.Kind != geo.Polygons && !g.Empty() {
			return nil, fmt.Errorf("zones: geometry %d is a %v, want polygons", i+1, g.Kind)
		}
		for _, part := range g.Parts {
			if _, finite := extentOf(part); !finite {
				return nil, fmt.Errorf("zones: geometry %d has a position that is not finite", i+1)
			}
			if len(part) > 0 {
				patches = append(patches, part)
			}
		}
	}
	slices.SortFunc(patches, compareParts)
	if widthM > 0 {
		var err error
		if patches, err = e.wideIn(patches, widthM); err != nil {
			return nil, err
		}
	}

	var out []geo.XYGeometry
	for _, members := range touching(patches) {
		err := e.do("zone", func() {
			gs := make([]*geos.Geom, len(members))
			sumM2 := 0.0
			for i, m := range members {
				gs[i] = e.raw(geo.XYGeometry{Kind: geo.Polygons, Parts: patches[m : m+1]})
				sumM2 += partArea(patches[m])
			}
			// Pieces that only touch at a point are zones of their own.
			for _, part := range e.give(e.joinApart(gs, sumM2), geo.Polygons).Parts {
				if part = e.even(part); partArea(part) >= patchM2 {
					out = append(out, geo.XYGeometry{Kind: geo.Polygons, Parts: [][][]geo.XY{part}})
				}
			}
		})
		if err != nil {
			return nil, err
		}
	}
	slices.SortFunc(out, func(a, b geo.XYGeometry) int { return compareParts(a.Parts[0], b.Parts[0]) })
	return out, nil
}

// cellM is the side in metres of the squares in which patches are held against a width.
const cellM = 2000

// wideIn gives what is at least widthM wide of patches that may touch each other, cut along the edges of
// squares. It is worked out square by square with as much around as bears on it, in a time that grows with
// the land: of one large zone with many holes the library's buffers take very much longer.
func (e *Engine) wideIn(patches [][][]geo.XY, widthM float64) (out [][][]geo.XY, err error) {
	side := cellM * math.Ceil(math.Max(1, 4*widthM/cellM))
	// Square corners reach a whole width beyond the core, which lies half a width inside the edge.
	reach := 2*widthM + 1
	extents := make([]geo.Extent, len(patches))
	cells := map[geo.Extent]bool{}
	for i, p := range patches {
		extents[i], _ = extentOf(p)
		for _, c := range Tiles(extents[i], side) {
			cells[c] = true
		}
	}
	order := slices.SortedFunc(maps.Keys(cells), func(a, b geo.Extent) int {
		return cmp.Or(cmp.Compare(a.MinY, b.MinY), cmp.Compare(a.MinX, b.MinX))
	})
	// Patches are the caller's again when all is done.
	defer func() {
		if e := e.do("zones", e.large.forget); err == nil {
			err = e
		}
	}()
	tree := index.New(extents)
	var near []int
	for _, cell := range order {
		err := e.do("width of zones", func() {
			near = tree.Search(cell.Grow(reach), near[:0])
			gs, sumM2 := make([]*geos.Geom, 0, len(near)), 0.0
			for _, i := range near {
				if g := e.cutPart(patches[i], extents[i], cell.Grow(reach)); !g.IsEmpty() {
					gs = append(gs, g)
					sumM2 += g.Area()
				}
			}
			if len(gs) == 0 {
				return
			}
			for _, part := range e.give(e.joinApart(gs, sumM2), geo.Polygons).Parts {
				// The library's buffers depend on corners that only the tiles have made.
				g := e.wideEnough(e.raw(geo.XYGeometry{Kind: geo.Polygons, Parts: [][][]geo.XY{e.even(part)}}), widthM)
				if g.IsEmpty() {
					continue
				}
				out = append(out, e.give(e.clip(g, cell), geo.Polygons).Parts...)
			}
		})
		if err != nil {
			return nil, err
		}
	}
	slices.SortFunc(out, compareParts)
	return out, nil
}

// cutPart gives what lies of a valid polygon's part in a box; empty when nothing does.
func (e *Engine) cutPart(part [][]geo.XY, own, x geo.Extent) *geos.Geom {
	g := geo.XYGeometry{Kind: geo.Polygons, Parts: [][][]geo.XY{part}}
	if within(own, x) {
		return e.raw(g)
	}
	switch lies(part, x) {
	case apart:
		return e.own(e.ctx.NewEmptyPolygon(), "clip")
	case covering:
		return e.own(e.ctx.NewGeomFromBounds(x.MinX, x.MinY, x.MaxX, x.MaxY), "clip")
	}
	whole := e.large.of(e, g)
	if whole == nil {
		whole = e.raw(g)
	}
	return e.clip(whole, x)
}

// even gives a valid part without corners that are none, or the part itself where that is not valid.
func (e *Engine) even(part [][]geo.XY) [][]geo.XY {
	out := geo.XYGeometry{Kind: geo.Polygons, Parts: [][][]geo.XY{straight(part)}}
	if len(out.Parts[0]) == 0 || !e.raw(out).IsValid() {
		return part
	}
	return normal(out).Parts[0]
}

// straightM is how far a corner may lie off the line between its neighbours to be none, ten times the finest
// grid.
const straightM = 1e-5

// straight gives the part without corners that are none; nothing when a ring has too few others.
func straight(part [][]geo.XY) [][]geo.XY {
	var out [][]geo.XY
	for _, ring := range part {
		n := len(ring) - 1
		if n < 3 {
			return nil
		}
		keep := make([]geo.XY, 0, n+1)
		for i := range n {
			a, p, b := ring[(i+n-1)%n], ring[i], ring[i+1]
			if len(keep) > 0 {
				a = keep[len(keep)-1]
			}
			u, v := p.Sub(a), b.Sub(p)
			along := u.X*v.X + u.Y*v.Y
			if off := math.Abs(u.X*v.Y - u.Y*v.X); along > 0 && off <= straightM*b.Dist(a) {
				continue
			}
			keep = append(keep, p)
		}
		if len(keep) < 3 {
			return nil
		}
		out = append(out, append(keep, keep[0]))
	}
	return out
}

// joinApart gives the union of polygons that do not overlap, whose areas add up to sumM2; it uses them up. As
// with every overlay, an area that cannot be is tried again on coarser grids.
func (e *Engine) joinApart(gs []*geos.Geom, sumM2 float64) *geos.Geom {
	if len(gs) == 1 {
		return gs[0]
	}
	all := e.collect(gs)
	defer func(before int) { e.grid = before }(e.grid)
	for ; e.grid < len(gridsM); e.grid++ {
		g := e.unary(all)
		if math.Abs(g.Area()-sumM2) <= closeShare*sumM2 {
			return g
		}
		e.retries++
	}
	fail("%w: the areas of joined patches do not add up; do they overlap?", ErrNotComputed)
	return nil
}

// stretch is an upright or level edge of a patch.
type stretch struct {
	level  bool
	at     float64 // its X when upright, its Y when level
	lo, hi float64
	low    bool // the patch lies on the side of lesser X or Y
	patch  int
}

// touching groups the patches that share a stretch of an upright or level edge, directly or by others. Groups
// and their members are in rising order.
func touching(patches [][][]geo.XY) [][]int {
	var all []stretch
	for n, part := range patches {
		for j, ring := range part {
			a := measure.SignedRingAreaM2(ring)
			left := (j == 0) == (a > 0) // the patch lies on the left of the ring's way
			for i := 1; i < len(ring); i++ {
				p, q := ring[i-1], ring[i]
				switch {
				case p.X == q.X && p.Y != q.Y:
					all = append(all, stretch{at: p.X, lo: min(p.Y, q.Y), hi: max(p.Y, q.Y), low: (q.Y > p.Y) == left, patch: n})
				case p.Y == q.Y && p.X != q.X:
					all = append(all, stretch{level: true, at: p.Y, lo: min(p.X, q.X), hi: max(p.X, q.X), low: (q.X < p.X) == left, patch: n})
				}
			}
		}
	}
	slices.SortFunc(all, func(a, b stretch) int {
		side := func(s stretch) int {
			if s.low {
				return 0
			}
			return 1
		}
		line := func(s stretch) int {
			if s.level {
				return 1
			}
			return 0
		}
		return cmp.Or(line(a)-line(b), cmp.Compare(a.at, b.at), side(a)-side(b), cmp.Compare(a.lo, b.lo), cmp.Compare(a.hi, b.hi), a.patch-b.patch)
	})
	root := make([]int, len(patches))
	for i := range root {
		root[i] = i
	}
	find := func(i int) int {
		for root[i] != i {
			root[i] = root[root[i]]
			i = root[i]
		}
		return i
	}
	for from := 0; from < len(all); {
		to := from
		for to < len(all) && all[to].level == all[from].level && all[to].at == all[from].at {
			to++
		}
		mid := from
		for mid < to && all[mid].low {
			mid++
		}
		// The stretches of one side of a line do not overlap, so two hands run along them.
		for i, j := from, mid; i < mid && j < to; {
			if min(all[i].hi, all[j].hi) > max(all[i].lo, all[j].lo) {
				a, b := find(all[i].patch), find(all[j].patch)
				root[max(a, b)] = min(a, b)
			}
			if all[i].hi < all[j].hi {
				i++
			} else {
				j++
			}
		}
		from = to
	}
	byRoot := make([][]int, len(patches))
	for i := range patches {
		r := find(i)
		byRoot[r] = append(byRoot[r], i)
	}
	return slices.DeleteFunc(byRoot, func(g []int) bool { return len(g) == 0 })
}
