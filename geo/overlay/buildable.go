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
//	gross       = area S
//	left        = S − ∪Rᵢ
//	aloneᵢ      = area(S − ∪_{j≠i} Rⱼ) − area left,  sharedᵢ = area(Rᵢ ∩ S) − aloneᵢ
//	takenShared = area(∪Rᵢ ∩ S) − Σ aloneᵢ
//	buildable   = the patches of width(left) of at least the smallest size
//	shape       = area left − area buildable
//
// where width(L) is L ∩ ((L eroded by w/2) dilated by w/2 with square corners), w the smallest width: a
// strip narrower than w goes, a part wide enough keeps its own outline, corners sharper than 60 degrees
// lose their tip. A part exactly w wide stays. What is left and what is taken are computed apart; when they
// do not add up to gross within 1e-6, or a part is out of its bounds, the site is computed again on a grid of
// 1 micrometre, then 1 mm, then 1 cm, then refused with ErrNotComputed.
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
	if !site.IsValid() {
		site = e.makeValid(site)
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

	var active []int // rules that take anything, in that order
	var taking []*known
	all := 0
	for _, i := range order {
		t := &out.Rules[i]
		t.Name, t.Taken = in.Rules[i].Name, geo.XYGeometry{Kind: geo.Polygons}
		k := e.takes(in.Rules[i], site, box)
		out.Repaired += k.repaired
		if !k.taken || !k.whole && k.areaM2 <= 0 {
			continue
		}
		t.SharedM2 = k.areaM2 // until the part taken alone is known
		if k.whole || out.GrossM2-k.areaM2 <= allShare*out.GrossM2 {
			t.TakesAll, t.SharedM2 = true, out.GrossM2
			all++
		}
		if in.KeepTaken {
			own := site
			if !t.TakesAll {
				own = e.overlay(intersection, k.region, site)
			}
			t.Taken = e.give(own, geo.Polygons)
		}
		active = append(active, i)
		taking = append(taking, k)
	}
	left, takenM2 := e.alone(site, taking, active, all, &out)
	leftM2 := left.areaM2
	off = out.GrossM2 - leftM2 - takenM2
	sumAlone := 0.0
	for _, i := range active {
		r := &out.Rules[i]
		// Out of bounds by more than rounding, these fail the account.
		off = worse(off, math.Min(0, r.AloneM2))
		off = worse(off, math.Min(0, r.SharedM2-r.AloneM2))
		r.AloneM2 = math.Max(0, r.AloneM2)
		r.SharedM2 = math.Max(0, r.SharedM2-r.AloneM2)
		sumAlone += r.AloneM2
	}
	off = worse(off, math.Min(0, takenM2-sumAlone))
	out.TakenSharedM2 = math.Max(0, takenM2-sumAlone)

	kept := left
	if w := in.SmallestWidthM; w > 0 && leftM2 > 0 {
		kept = e.recall(name('w', taking, w), func() *geos.Geom { return e.wideEnough(left.g, w) })
	}
	out.Buildable = e.give(kept.g, geo.Polygons)
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
	off = worse(off, out.GrossM2-out.BuildableM2-sumAlone-out.TakenSharedM2-out.ShapeM2)
	return out, off
}

func worse(a, b float64) float64 {
	if math.Abs(b) > math.Abs(a) {
		return b
	}
	return a
}

// alone finds the land left, the area taken by all rules together, what each takes alone. One or more
// rules that take all leave nothing: two of them share everything.
func (e *Engine) alone(site *geos.Geom, taking []*known, active []int, all int, out *BuildableResult) (left *shape, takenM2 float64) {
	n := len(taking)
	if n == 0 {
		return &shape{g: site, areaM2: out.GrossM2}, 0
	}
	nothing := &shape{g: e.own(e.ctx.NewEmptyPolygon(), "empty")}
	if all > 1 {
		return nothing, out.GrossM2
	}
	if n == 1 && all == 1 {
		out.Rules[active[0]].AloneM2 = out.GrossM2
		return nothing, out.GrossM2
	}
	// Rules first to last may take something alone; their land is asked for with after[from:].
	first, last, from := 0, n-1, 0
	if all == 1 { // only the one that takes all
		first = slices.IndexFunc(active, func(i int) bool { return out.Rules[i].TakesAll })
		last, from = first, first+1
	}
	// before[k] is the site without the regions before k.
	before := make([]*shape, n)
	before[0] = &shape{g: site, areaM2: out.GrossM2}
	for k := 1; k <= last; k++ {
		before[k] = e.recall(name('b', taking[:k], 0), func() *geos.Geom {
			return e.overlay(difference, before[k-1].g, taking[k-1].region)
		})
	}
	left = nothing
	if all == 0 {
		// The last difference is done on a grid, where gaps, spikes without area collapse that rounding
		// left between regions side by side.
		left = e.recall(name('l', taking, 0), func() *geos.Geom {
			return e.overlayFrom(max(e.grid, finest), difference, before[n-1].g, taking[n-1].region)
		})
	}
	if n == 1 {
		r := &out.Rules[active[0]]
		r.AloneM2 = r.SharedM2 // which is still all that the rule takes
		return left, r.AloneM2
	}
	// after[k] is the union of regions[k:].
	after := make([]*shape, n)
	after[n-1] = &shape{g: taking[n-1].region}
	for k := n - 2; k >= from; k-- {
		after[k] = e.recall(name('u', taking[k:], 0), func() *geos.Geom {
			return e.overlay(union, taking[k].region, after[k+1].g)
		})
	}
	for k := first; k <= last; k++ {
		lifted := before[k].areaM2 // area left if the rule were lifted
		if k+1 < n {
			lifted = e.recall(name('a', taking, float64(k)), func() *geos.Geom {
				return e.overlay(difference, before[k].g, after[k+1].g)
			}).areaM2
		}
		out.Rules[active[k]].AloneM2 = lifted - left.areaM2
	}
	if all == 1 {
		return left, out.GrossM2
	}
	return left, e.recall(name('t', taking, 0), func() *geos.Geom {
		return e.overlay(intersection, after[0].g, site)
	}).areaM2
}

// takes gives what a rule takes from the site, from memory if it is known.
func (e *Engine) takes(r Rule, site *geos.Geom, box geo.Extent) *known {
	remember := e.grid == 0
	if remember {
		if k := e.memory.given(r); k != nil {
			e.retries += k.retries
			return k
		}
	}
	var ps []piece
	reach := box.Grow(r.SetbackM*arcFactor + 1)
	if !r.Boundary {
		ps = pieces(r, reach)
		if remember {
			if k := e.memory.alike(r, ps); k != nil {
				e.retries += k.retries
				return k
			}
		}
	}
	before := e.retries
	k := &known{}
	k.region, k.whole = e.region(r, ps, reach, site, box, &k.repaired)
	k.taken = k.whole || k.region != nil
	if k.taken && !k.whole {
		k.areaM2 = e.overlay(intersection, k.region, site).Area()
	}
	k.retries = e.retries - before
	if remember {
		if k.region != nil {
			e.memory.hold(e.keep(k.region))
		}
		e.memory.add(k, r, ps)
	}
	return k
}

// region gives what a rule takes in the neighbourhood of the site, nil for nothing; whole says that it
// covers the site, which needs no region. Regions reach beyond the site, so that their edges do not run
// along the site's.
func (e *Engine) region(r Rule, ps []piece, reach geo.Extent, site *geos.Geom, box geo.Extent, repaired *int) (region *geos.Geom, whole bool) {
	if r.Boundary {
		if r.SetbackM == 0 {
			return nil, false
		}
		x := box.Grow(2)
		rim := e.own(e.ctx.NewGeomFromBounds(x.MinX, x.MinY, x.MaxX, x.MaxY), "box")
		inner := e.setback(site, -r.SetbackM)
		if inner.IsEmpty() {
			return nil, true
		}
		return e.overlay(difference, rim, inner), false
	}
	// Pieces that are taken as they are need not go to the library when they cover the site's surroundings or
	// stay out of them: of large ones next to small sites most do.
	asIs := r.Checked && r.SetbackM == 0
	if asIs {
		near := ps[:0:0]
		for _, p := range ps {
			switch around(p.g.Parts[0], reach) {
			case covering:
				return nil, true
			case meeting:
				near = append(near, p)
			}
		}
		ps = near
	}
	// What may cover the site comes first: then the others need no work.
	wide := make([]*geos.Geom, len(ps))
	for i, p := range ps {
		if !within(box, p.x.Grow(r.SetbackM*arcFactor)) {
			continue
		}
		if wide[i] = e.widened(r, p, reach, repaired); !wide[i].IsEmpty() && e.covers(wide[i], site) {
			return nil, true
		}
	}
	var members []*geos.Geom
	for i, p := range ps {
		g := wide[i]
		if g == nil {
			g = e.widened(r, p, reach, repaired)
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
		return nil, false
	}
	return e.join(members), false
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

// pieces gives the parts of the rule's features that can reach the site, in an order that does not depend
// on that of the features. Positions that are not finite end the job even when they lie far away.
func pieces(r Rule, reach geo.Extent) []piece {
	var out []piece
	for i, f := range r.Features {
		if f.Kind != geo.Polygons && r.SetbackM == 0 {
			continue
		}
		// A layer knows the extents of its regions, which are finite.
		known := i < len(r.regions) && sameStore(r.regions[i].g, f)
		if known && !r.regions[i].x.Meets(reach) {
			continue
		}
		for k, part := range f.Parts {
			var x geo.Extent
			finite := true
			if known && len(f.Parts) == 1 {
				x = r.regions[i].x
			} else {
				x, finite = extentOf(part)
			}
			if !finite {
				fail("rule %q, feature %d: a position is not finite", r.Name, i+1)
			}
			if !x.Empty() && x.Meets(reach) {
				own := f
				if len(f.Parts) > 1 {
					own.Parts = f.Parts[k : k+1 : k+1]
				}
				out = append(out, piece{own, x})
			}
		}
	}
	slices.SortFunc(out, func(a, b piece) int {
		return cmp.Or(
			cmp.Compare(a.x.MinX, b.x.MinX), cmp.Compare(a.x.MinY, b.x.MinY),
			cmp.Compare(a.x.MaxX, b.x.MaxX), cmp.Compare(a.x.MaxY, b.x.MaxY),
			cmp.Compare(a.g.Kind, b.g.Kind), compareParts(a.g.Parts[0], b.g.Parts[0]))
	})
	return out
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
