package overlay

import (
	"cmp"
	"fmt"
	"math"
	"slices"

	"github.com/twpayne/go-geos"

	"groundtally/geo"
	"groundtally/geo/measure"
)

// Rule takes land from a site.
type Rule struct {
	Name string // not empty, different from the other rules' names
	// Features take the land within SetbackM of them; with no setback only polygons take anything.
	// Features far from the site are passed over.
	Features []geo.XYGeometry
	SetbackM float64 // 0 or more
	// Boundary makes the rule take the strip of SetbackM inside the site's own edge; Features must be
	// empty.
	Boundary bool
	// Checked says that polygon features are known to be valid, as those of a Layer are, so that they
	// are not checked again. Nobody may alter them from then on: an Engine remembers what they take.
	Checked bool

	regions []piece // the features with their extents, when they come from layers
}

// BuildableInput is a site with its rules.
type BuildableInput struct {
	Site  geo.XYGeometry
	Rules []Rule
	// SmallestWidthM drops what is narrower; 0 keeps everything.
	SmallestWidthM float64
	// SmallestPatchM2 drops connected patches that are smaller, after the width; 0 keeps everything.
	SmallestPatchM2 float64
	// KeepTaken asks for the land that each rule takes, for the map.
	KeepTaken bool
}

// RuleTaken says what one rule takes from the site.
type RuleTaken struct {
	Name     string
	AloneM2  float64 // taken by this rule only
	SharedM2 float64 // taken by this rule while others take it too
	TakesAll bool    // the rule alone leaves nothing of the site
	Taken    geo.XYGeometry
}

// BuildableResult accounts for every square metre of the site:
//
//	GrossM2 = BuildableM2 + Σ Rules.AloneM2 + TakenSharedM2 + ShapeM2
//
// to 1e-6 of GrossM2. It does not depend on the order of rules or of their features.
type BuildableResult struct {
	Buildable     geo.XYGeometry
	GrossM2       float64
	BuildableM2   float64
	TakenSharedM2 float64     // taken by two or more rules, counted once
	ShapeM2       float64     // left by the rules but too narrow or too small
	Rules         []RuleTaken // in the order of the input
	Repaired      int         // site or feature parts that had to be made valid
	Retried       int         // operations that failed at first and were done on a coarser grid
}

// closeShare is how near the account must close, relative to the gross area.
const closeShare = 1e-6

// allShare: a rule that leaves less than this share takes all.
const allShare = 1e-9

// Buildable finds what the rules leave of a site and what each took.
//
// With S the site, Rᵢ the region that rule i takes in or out of S:
//
//	left        = S − ∪Rᵢ
//	aloneᵢ      = area of S that lies in Rᵢ and in no other region
//	sharedᵢ     = area(Rᵢ ∩ S) − aloneᵢ
//	takenShared = area of S that lies in two regions or more
//	buildable   = the patches of width(left) of at least the smallest size
//	shape       = area left − area buildable
//
// where width(L) is L ∩ ((L eroded by w/2) dilated by w/2 with square corners), w the smallest width: a
// strip narrower than w goes, a part wide enough keeps its own outline, corners sharper than 60 degrees
// lose their tip. A part exactly w wide stays.
//
// The areas taken are counted in strips (see tally), the polygon that is left is the library's: what is left
// and what is taken are computed in two ways that have nothing in common. When they do not add up to gross
// within 1e-6, the polygon is made again on a grid of 1 micrometre, then 1 mm, then 1 cm, then refused with
// ErrNotComputed. A site of which less than a billionth is left has nothing left.
//
// The Engine remembers what it found out about the last site. Calls for one site under several rulesets are
// therefore best made one after the other on one Engine; the results are the same in any other way.
func (e *Engine) Buildable(in BuildableInput) (out BuildableResult, err error) {
	if err := in.check(); err != nil {
		return out, fmt.Errorf("buildable area: %w", err)
	}
	err = e.do("buildable area", func() {
		before := e.retries
		for e.grid = 0; e.grid < len(gridsM); e.grid++ {
			var off float64
			out, off = e.buildable(in)
			if math.Abs(off) <= closeShare*out.GrossM2 {
				out.Retried = e.retries - before
				return
			}
			e.retries++
		}
		fail("%w: the areas do not add up", ErrNotComputed)
	})
	if err != nil {
		return BuildableResult{}, err
	}
	return out, nil
}

// bad reports whether v is no length or area: negative or not finite.
func bad(v float64) bool { return v < 0 || math.IsNaN(v) || math.IsInf(v, 0) }

func (in BuildableInput) check() error {
	if in.Site.Kind != geo.Polygons || in.Site.Empty() {
		return fmt.Errorf("the site is a %v, want polygons", in.Site.Kind)
	}
	if bad(in.SmallestWidthM) || bad(in.SmallestPatchM2) {
		return fmt.Errorf("smallest width %v m, smallest patch %v m2: want 0 or more", in.SmallestWidthM, in.SmallestPatchM2)
	}
	names := make(map[string]bool, len(in.Rules))
	for _, r := range in.Rules {
		switch {
		case r.Name == "" || names[r.Name]:
			return fmt.Errorf("rule name %q is empty or stands twice", r.Name)
		case bad(r.SetbackM):
			return fmt.Errorf("rule %q: the setback %v m must be 0 or more", r.Name, r.SetbackM)
		case r.Boundary && len(r.Features) > 0:
			return fmt.Errorf("rule %q keeps distance from the site's edge, so it takes no features", r.Name)
		}
		names[r.Name] = true
	}
	return nil
}

// buildable computes the result with the area by which the account fails to close.
func (e *Engine) buildable(in BuildableInput) (out BuildableResult, off float64) {
	out = BuildableResult{Rules: make([]RuleTaken, len(in.Rules))}
	site := e.raw(in.Site)
	if e.grid == 0 {
		e.memory.at(e.buf)
	}
	parts := in.Site.Parts
	if !site.IsValid() {
		site = e.makeValid(site)
		parts = e.give(site, geo.Polygons).Parts
		out.Repaired++
	}
	out.GrossM2 = site.Area()
	if !(out.GrossM2 > 0) {
		fail("the site has no area")
	}
	box := geo.ExtentOf(in.Site)

	// By name, so that rounding does not depend on the order of the input.
	order := make([]int, len(in.Rules))
	for i := range order {
		order[i] = i
	}
	slices.SortFunc(order, func(a, b int) int { return cmp.Compare(in.Rules[a].Name, in.Rules[b].Name) })

	t := &e.tally
	t.begin(box, len(order))
	t.add(siteEdge, parts, false)
	for n, i := range order {
		r := in.Rules[i]
		out.Rules[i] = RuleTaken{Name: r.Name, Taken: geo.XYGeometry{Kind: geo.Polygons}}
		if r.asIs() {
			if near, whole := around(r, box); whole {
				t.cover(n)
			} else {
				for _, p := range near {
					t.add(int32(n), p.g.Parts, false)
				}
			}
			continue
		}
		k := e.takes(r, site, box)
		out.Repaired += k.repaired
		switch {
		case k.whole:
			t.cover(n)
		case k.region == nil:
		case r.Boundary: // of which the region is made only where land is left
			t.cover(n)
			t.add(int32(n), k.parts, true)
		default:
			t.add(int32(n), k.parts, false)
		}
	}
	sums := t.count()
	taken := sums.shared
	for n, i := range order {
		r := &out.Rules[i]
		if r.AloneM2 = sums.alone[n]; sums.gross-sums.total[n] <= allShare*sums.gross {
			r.TakesAll, sums.total[n] = true, out.GrossM2
		}
		r.SharedM2 = math.Max(0, sums.total[n]-r.AloneM2)
		taken += r.AloneM2
		if in.KeepTaken && sums.total[n] > 0 {
			own := site
			if !r.TakesAll {
				own = e.overlay(intersection, e.takes(in.Rules[i], site, box).region, site)
			}
			r.Taken = e.give(own, geo.Polygons)
		}
	}
	out.TakenSharedM2 = sums.shared
	leftM2 := 0.0
	if sums.left > allShare*sums.gross {
		var taking []*known
		for n, i := range order {
			if sums.total[n] > 0 {
				taking = append(taking, e.takes(in.Rules[i], site, box))
			}
		}
		left := e.left(site, out.GrossM2, taking)
		leftM2 = left.areaM2
		if w := in.SmallestWidthM; w > 0 && leftM2 > 0 {
			left = e.recall(name('w', taking, w), func() *geos.Geom { return e.wideEnough(left.g, w) })
		}
		out.Buildable = e.give(left.g, geo.Polygons)
	}
	off = out.GrossM2 - leftM2 - taken
	out.Buildable.Kind = geo.Polygons
	if in.SmallestPatchM2 > 0 {
		out.Buildable.Parts = slices.DeleteFunc(out.Buildable.Parts, func(part [][]geo.XY) bool {
			return partArea(part) < in.SmallestPatchM2
		})
	}
	for _, part := range out.Buildable.Parts {
		out.BuildableM2 += partArea(part)
	}
	out.ShapeM2 = math.Max(0, leftM2-out.BuildableM2)
	if in.SmallestWidthM == 0 && in.SmallestPatchM2 == 0 {
		out.ShapeM2 = 0
	}
	if all := out.GrossM2 - out.BuildableM2 - taken - out.ShapeM2; math.Abs(all) > math.Abs(off) {
		off = all
	}
	return out, off
}

// left takes the regions from the site one after the other.
func (e *Engine) left(site *geos.Geom, siteM2 float64, taking []*known) *shape {
	left := &shape{g: site, areaM2: siteM2}
	for k, t := range taking {
		step, from := byte('b'), e.grid
		if k == len(taking)-1 {
			// The last difference is done on a grid, where gaps, spikes without area collapse that rounding
			// left between regions side by side.
			step, from = 'l', max(e.grid, finest)
		}
		whole := left
		left = e.recall(name(step, taking[:k+1], 0), func() *geos.Geom {
			return e.overlayFrom(from, difference, whole.g, t.region)
		})
	}
	return left
}

// asIs says that the rule takes polygons as they are.
func (r Rule) asIs() bool { return r.Checked && r.SetbackM == 0 && !r.Boundary }

// around gives the pieces of an asIs rule that lie in a site's surroundings, or that one covers them whole.
// Of large pieces next to small sites most cover them or stay out.
func around(r Rule, box geo.Extent) (near []piece, whole bool) {
	reach := reachOf(r, box)
	eachPiece(r, reach, func(p piece) bool {
		switch lies(p.g.Parts[0], reach) {
		case covering:
			whole = true
		case meeting:
			near = append(near, p)
		}
		return !whole
	})
	return near, whole
}

// reachOf is the box of which a rule's region is made.
func reachOf(r Rule, box geo.Extent) geo.Extent { return box.Grow(r.SetbackM*arcFactor + 1) }

// takes gives the region that a rule takes in and around the site, from memory if it is known.
func (e *Engine) takes(r Rule, site *geos.Geom, box geo.Extent) *known {
	remember := e.grid == 0
	if remember {
		if k := e.memory.given(r); k != nil {
			e.retries += k.retries
			return k
		}
	}
	var ps []piece
	switch {
	case r.Boundary:
	case r.asIs():
		ps, _ = around(r, box)
	default:
		eachPiece(r, reachOf(r, box), func(p piece) bool { ps = append(ps, p); return true })
	}
	sortPieces(ps)
	if remember && !r.Boundary {
		if k := e.memory.alike(r, ps); k != nil {
			e.retries += k.retries
			return k
		}
	}
	before := e.retries
	k := &known{}
	e.region(k, r, ps, site, box)
	k.retries = e.retries - before
	if remember {
		if k.region != nil {
			e.memory.hold(e.keep(k.region))
		}
		e.memory.add(k, r, ps)
	}
	return k
}

// region finds what a rule takes in the neighbourhood of the site. Regions reach beyond the site, so that
// their edges do not run along the site's.
func (e *Engine) region(k *known, r Rule, ps []piece, site *geos.Geom, box geo.Extent) {
	if r.Boundary {
		if r.SetbackM == 0 {
			return
		}
		inner := e.setback(site, -r.SetbackM)
		if k.whole = inner.IsEmpty(); k.whole {
			return
		}
		k.parts = e.give(inner, geo.Polygons).Parts
		x := box.Grow(2)
		k.region = e.overlay(difference, e.own(e.ctx.NewGeomFromBounds(x.MinX, x.MinY, x.MaxX, x.MaxY), "box"), inner)
		return
	}
	reach := reachOf(r, box)
	// What may cover the site comes first: then the others need no work. Of a rule that takes polygons as they
	// are it is known that it leaves something.
	wide := make([]*geos.Geom, len(ps))
	for i, p := range ps {
		if r.asIs() || !within(box, p.x.Grow(r.SetbackM*arcFactor)) {
			continue
		}
		if wide[i] = e.widened(r, p, reach, &k.repaired); !wide[i].IsEmpty() && e.covers(wide[i], site) {
			k.whole = true
			return
		}
	}
	var members []*geos.Geom
	for i, p := range ps {
		g := wide[i]
		if g == nil {
			g = e.widened(r, p, reach, &k.repaired)
		}
		if g.IsEmpty() {
			continue
		}
		// What is not widened was cut to this box already.
		if r.SetbackM > 0 && !within(p.x.Grow(r.SetbackM*arcFactor), box.Grow(1)) {
			cut := e.clip(g, box.Grow(1))
			g.Destroy()
			if g = cut; g.IsEmpty() {
				continue
			}
		}
		members = append(members, g)
	}
	if len(members) == 0 {
		return
	}
	k.region = e.join(members)
	if !r.asIs() {
		k.parts = e.give(k.region, geo.Polygons).Parts
	}
}

// widened takes a piece into the context: valid, cut to the reach, widened by the setback.
func (e *Engine) widened(r Rule, p piece, reach geo.Extent, repaired *int) *geos.Geom {
	if r.Checked && p.g.Kind == geo.Polygons && !within(p.x, reach) {
		if known := e.large.of(e, p.g); known != nil {
			g := e.clip(known, reach)
			if r.SetbackM > 0 {
				wide := e.setback(g, r.SetbackM)
				g.Destroy()
				g = wide
			}
			return g
		}
	}
	g := e.raw(p.g)
	if p.g.Kind == geo.Polygons && !r.Checked && !g.IsValid() {
		g = e.makeValid(g)
		*repaired++
	}
	if !within(p.x, reach) {
		cut := e.clip(g, reach)
		g.Destroy()
		g = cut
	}
	if r.SetbackM > 0 {
		wide := e.setback(g, r.SetbackM)
		g.Destroy()
		g = wide
	}
	return g
}

// piece is one part of a feature with its extent.
type piece struct {
	g geo.XYGeometry
	x geo.Extent
}

// eachPiece calls f for the parts of the rule's features that can reach the site until it says no. Positions
// that are not finite end the job even when they lie far away.
func eachPiece(r Rule, reach geo.Extent, f func(piece) bool) {
	for i, g := range r.Features {
		if g.Kind != geo.Polygons && r.SetbackM == 0 {
			continue
		}
		// A layer knows the extents of its regions, which are finite.
		known := i < len(r.regions) && sameStore(r.regions[i].g, g)
		if known && !r.regions[i].x.Meets(reach) {
			continue
		}
		for k, part := range g.Parts {
			var x geo.Extent
			finite := true
			if known && len(g.Parts) == 1 {
				x = r.regions[i].x
			} else {
				x, finite = extentOf(part)
			}
			if !finite {
				fail("rule %q, feature %d: a position is not finite", r.Name, i+1)
			}
			if x.Empty() || !x.Meets(reach) {
				continue
			}
			own := g
			if len(g.Parts) > 1 {
				own.Parts = g.Parts[k : k+1 : k+1]
			}
			if !f(piece{own, x}) {
				return
			}
		}
	}
}

// sortPieces puts pieces in an order that does not depend on that of the features.
func sortPieces(ps []piece) {
	slices.SortFunc(ps, func(a, b piece) int {
		return cmp.Or(
			cmp.Compare(a.x.MinX, b.x.MinX), cmp.Compare(a.x.MinY, b.x.MinY),
			cmp.Compare(a.x.MaxX, b.x.MaxX), cmp.Compare(a.x.MaxY, b.x.MaxY),
			cmp.Compare(a.g.Kind, b.g.Kind), compareParts(a.g.Parts[0], b.g.Parts[0]))
	})
}

// extentOf gives the extent of a part, whether its positions are finite, in one quick pass: the scan of large
// features is a good share of a site's work.
func extentOf(part [][]geo.XY) (x geo.Extent, finite bool) {
	x = geo.EmptyExtent()
	zero := 0.0 // v − v is not a number for a v that is none or is infinite
	for _, ring := range part {
		for _, p := range ring {
			zero += (p.X - p.X) + (p.Y - p.Y)
			if p.X < x.MinX {
				x.MinX = p.X
			}
			if p.X > x.MaxX {
				x.MaxX = p.X
			}
			if p.Y < x.MinY {
				x.MinY = p.Y
			}
			if p.Y > x.MaxY {
				x.MaxY = p.Y
			}
		}
	}
	return x, zero == 0
}

func within(x, y geo.Extent) bool {
	return x.MinX >= y.MinX && x.MinY >= y.MinY && x.MaxX <= y.MaxX && x.MaxY <= y.MaxY
}

// widthSlackM keeps parts that are exactly as wide as asked in spite of rounding.
const widthSlackM = 1e-3

// wideEnough gives the part of g that is at least w metres wide with its own outline.
func (e *Engine) wideEnough(g *geos.Geom, w float64) *geos.Geom {
	core := e.widen(g, -math.Max(w-widthSlackM, w/2)/2, askedSegments)
	if core.IsEmpty() {
		return core
	}
	// A mitre limit of 2 squares corners down to 60 degrees.
	back := e.sound(e.own(core.BufferWithStyle(w/2+widthSlackM, askedSegments, geos.BufCapStyleRound, geos.BufJoinStyleMitre, 2), "buffer"))
	return e.overlay(intersection, g, back)
}

// sound repairs what the library made wrong: of a large core with many holes a buffer with square corners is
// now and then shells within shells, with which an overlay fails or, worse, does not.
func (e *Engine) sound(g *geos.Geom) *geos.Geom {
	if g.IsValid() {
		return g
	}
	return e.makeValid(g)
}

func partArea(part [][]geo.XY) float64 {
	return measure.AreaM2(geo.XYGeometry{Kind: geo.Polygons, Parts: [][][]geo.XY{part}})
}
