package run

import (
	"context"
	"fmt"
	"math"

	"groundtally/geo"
	"groundtally/geo/overlay"
	"groundtally/geo/terrain"
	"groundtally/scoring/units"
)

// groundEdition is raised when the digits of the step change.
const groundEdition = 3

// widened are a source's features, widened by its distance for one bound of the tolerance.
type widened = overlay.Layer

// prepare widens the features of every rule once for all sites.
//
// Layers that were widened alike before are taken from made, so that rulesets share them.
func (rs *ruleset) prepare(ctx context.Context, e *overlay.Engine, cores int, made map[string]*widened) error {
	bounds := []bound{asDrawn}
	if rs.tolerant {
		bounds = append(bounds, leastLand, mostLand)
	}
	for i := range rs.rules {
		r := &rs.rules[i]
		for j := range r.sources {
			s := &r.sources[j]
			for _, b := range bounds {
				if err := ctx.Err(); err != nil {
					return err
				}
				shiftM := b.shift(r.toleranceM)
				name := s.id(shiftM)
				l, there := made[name]
				if !there {
					var err error
					if l, err = s.widen(ctx, e, cores, shiftM); err != nil {
						return ruleError(r, s, err)
					}
					made[name] = l
				}
				s.prepared[b] = l
			}
		}
	}
	return nil
}

// on gives what a rule has widened near an extent.
func (r *rule) on(x geo.Extent, b bound) overlay.Rule {
	layers := make([]*widened, len(r.sources))
	for i := range r.sources {
		layers[i] = r.sources[i].prepared[b]
	}
	return overlay.RuleOf(r.name, x, layers...)
}

// widen widens the features that count by the source's distance and a shift of their edges outwards. With
// a shift inwards that is greater than the distance, polygons shrink; points and lines take nothing.
func (s *ruleSource) widen(ctx context.Context, e *overlay.Engine, cores int, shiftM float64) (*widened, error) {
	m := s.distM + shiftM
	var fs []geo.XYGeometry
	for k, g := range s.layer.xy {
		if !s.keep[k] || g.Kind != geo.Polygons && (s.distM <= 0 || m <= 0) {
			continue
		}
		if m < 0 {
			var err error
			if g, err = e.Buffer(g, m); err != nil {
				return nil, err
			}
		}
		fs = append(fs, g)
	}
	return overlay.NewLayer(ctx, cores, fs, math.Max(0, m))
}

// bufferReach is how far a widened feature may reach beyond its distance: arcs are drawn around the true
// circle, and the geometry engine fills shallow hollows.
const bufferReach = 1.02

// key writes what the ground of a site depends on: the site, each rule that has features within its
// reach with those features, and the shape steps. A rule without features near by does not take part,
// so that changing it leaves far sites valid.
func (rs *ruleset) key(w *world, s site) string {
	k := newKey("ground", groundEdition)
	k.geometry(s.geom)
	k.num(rs.widthM)
	k.num(rs.patchM2)
	if rs.slopeDeg > 0 && !rs.excepts(s.id, slopeRule) {
		k.num(rs.slopeDeg)
		k.text(w.terrain.rec.Digest)
		k.text(w.terrain.rec.CRS)
	}
	var buf []int
	for _, r := range rs.rules {
		if rs.excepts(s.id, r.name) {
			continue
		}
		if r.boundary {
			k.text(r.name)
			k.num(r.distM)
			k.tolerance(r.toleranceM)
			continue
		}
		near := false
		for _, src := range r.sources {
			buf = src.layer.tree.Search(s.box.Grow((src.distM+r.toleranceM)*bufferReach+1), buf[:0])
			for _, i := range buf {
				if !src.keep[i] {
					continue
				}
				if !near {
					k.text(r.name)
					k.tolerance(r.toleranceM)
					near = true
				}
				k.num(src.distM)
				k.bytes(src.layer.hash[i][:])
			}
		}
	}
	if f := rs.facing; f != nil && !rs.excepts(s.id, aspectRule) {
		k.text(aspectRule)
		for _, x := range []float64{f.fromDeg, f.toDeg, f.slopeDeg} {
			k.num(x)
		}
		k.text(w.terrain.rec.Digest)
		k.text(w.terrain.rec.CRS)
	}
	rs.keyHeights(k, w, s)
	return k.sum()
}

// keyHeights writes the height limits near a site.
func (rs *ruleset) keyHeights(k *keyer, w *world, s site) {
	rs.eachHeightLimit(s, func(h heightLimit, i int) {
		k.text(heightRule)
		k.num(rs.tipM)
		k.num(rs.rotorM)
		k.bytes(h.layer.hash[i][:])
		if h.layer.aboveSea(i) {
			k.text(w.terrain.rec.Digest)
			k.text(w.terrain.rec.CRS)
		}
	})
}

// keyBeyond gives what the steps behind the ground read of the site and of the rules that its result does
// not hold.
func (rs *ruleset) keyBeyond(w *world, s site) string {
	k := newKey("beyond the ground", groundEdition)
	k.geometry(s.geom)
	k.num(rs.patchM2)
	k.num(rs.tipM)
	k.num(rs.rotorM)
	rs.keyHeights(k, w, s)
	return k.sum()
}

// tolerance writes a tolerance where there is one.
func (k *keyer) tolerance(m float64) {
	if m > 0 {
		k.text("tolerance")
		k.num(m)
	}
}

// eachHeightLimit calls f for every height limit near a site where the rule holds.
func (rs *ruleset) eachHeightLimit(s site, f func(h heightLimit, i int)) {
	if rs.excepts(s.id, heightRule) {
		return
	}
	for _, h := range rs.heights {
		for _, i := range h.layer.tree.Search(s.box.Grow(rs.rotorM/2*bufferReach+1), nil) {
			if h.keep[i] {
				f(h, i)
			}
		}
	}
}

// groundResult is what is left of a site for a part of an option.
type groundResult struct {
	GrossM2       float64
	BuildableM2   float64
	LargestM2     float64
	Taken         []Taken
	TakenSharedM2 float64
	ShapeM2       float64
	Area          geo.XYGeometry
	Repaired      int
	Tolerant      bool    `json:",omitempty"` // the two that follow are known
	LeastM2       float64 `json:",omitempty"` // buildable if every feature lies as near as its tolerance allows
	MostM2        float64 `json:",omitempty"` // if as far
}

// terrainCells are the parts of terrain rules around a site, kept while its options are computed.
type terrainCells map[string]geo.XYGeometry

func (rs *ruleset) compute(e *overlay.Engine, w *world, s site, known terrainCells) (groundResult, error) {
	in, err := rs.input(e, w, s, known, asDrawn)
	if err != nil {
		return groundResult{}, err
	}
	out, err := e.Buildable(in)
	if err != nil {
		return groundResult{}, siteError(s, err)
	}
	g := groundResult{GrossM2: out.GrossM2, BuildableM2: out.BuildableM2, TakenSharedM2: out.TakenSharedM2, ShapeM2: out.ShapeM2, Area: out.Buildable, Repaired: out.Repaired}
	for _, r := range out.Rules {
		if r.AloneM2 > 0 || r.SharedM2 > 0 {
			g.Taken = append(g.Taken, Taken{Rule: r.Name, AloneHa: r.AloneM2 / units.M2PerHa, SharedHa: r.SharedM2 / units.M2PerHa, TakesAll: r.TakesAll})
		}
	}
	for _, part := range out.Buildable.Parts {
		a, err := e.AreaM2(geo.XYGeometry{Kind: geo.Polygons, Parts: [][][]geo.XY{part}})
		if err != nil {
			return groundResult{}, err
		}
		g.LargestM2 = max(g.LargestM2, a)
	}
	if g.Tolerant = rs.tolerantOn(s); !g.Tolerant {
		return g, nil
	}
	for b, m2 := range map[bound]*float64{leastLand: &g.LeastM2, mostLand: &g.MostM2} {
		if in, err = rs.input(e, w, s, known, b); err != nil {
			return groundResult{}, err
		}
		if out, err = e.Buildable(in); err != nil {
			return groundResult{}, siteError(s, err)
		}
		*m2 = out.BuildableM2
	}
	g.LeastM2, g.MostM2 = math.Min(g.LeastM2, g.BuildableM2), math.Max(g.MostM2, g.BuildableM2)
	return g, nil
}

// tolerantOn reports whether a rule whose layer has a position tolerance has anything near a site. Elsewhere the
// tolerance changes nothing, not even what is said of the area.
func (rs *ruleset) tolerantOn(s site) bool {
	if !rs.tolerant {
		return false
	}
	for _, r := range rs.rules {
		if r.toleranceM == 0 || r.gone || rs.excepts(s.id, r.name) {
			continue
		}
		if r.boundary || len(r.on(s.box, asDrawn).Features) > 0 || len(r.on(s.box, leastLand).Features) > 0 {
			return true
		}
	}
	return false
}

func siteError(s site, err error) error { return fmt.Errorf("site %s: %w", s.id, err) }

// input gives the rules that hold on a site in the form of the geometry engine.
func (rs *ruleset) input(e *overlay.Engine, w *world, s site, known terrainCells, b bound) (overlay.BuildableInput, error) {
	in := overlay.BuildableInput{Site: s.geom, SmallestWidthM: rs.widthM, SmallestPatchM2: rs.patchM2}
	for _, r := range rs.rules {
		if r.gone || rs.excepts(s.id, r.name) {
			continue
		}
		if r.boundary {
			in.Rules = append(in.Rules, overlay.Rule{Name: r.name, SetbackM: math.Max(0, r.distM+b.shift(r.toleranceM)), Boundary: true})
			continue
		}
		if r.scaled > 0 {
			in.Rules = append(in.Rules, r.nearby(s)...)
			continue
		}
		if or := r.on(s.box, b); len(or.Features) > 0 {
			in.Rules = append(in.Rules, or)
		}
	}
	ground := func(name, about string, find func(*terrain.Grid) (geo.XYGeometry, error)) error {
		if rs.excepts(s.id, name) {
			return nil
		}
		g, done := known[about]
		if !done {
			t, err := w.terrain.get()
			if err != nil {
				return err
			}
			if g, err = find(t); err != nil {
				return err
			}
			known[about] = g
		}
		if !g.Empty() {
			in.Rules = append(in.Rules, overlay.Rule{Name: name, Features: []geo.XYGeometry{g}})
		}
		return nil
	}
	if rs.slopeDeg > 0 {
		err := ground(slopeRule, newKey(slopeRule, 1).of(rs.slopeDeg), func(t *terrain.Grid) (geo.XYGeometry, error) { return t.Steep(s.box, rs.slopeDeg) })
		if err != nil {
			return in, err
		}
	}
	if f := rs.facing; f != nil {
		err := ground(aspectRule, newKey(aspectRule, 1).of(f.fromDeg, f.toDeg, f.slopeDeg), func(t *terrain.Grid) (geo.XYGeometry, error) {
			turn, err := w.frame.ConvergenceDeg(s.box.Centre())
			if err != nil {
				return geo.XYGeometry{}, err
			}
			return t.Turned(s.box, f.fromDeg-turn, f.toDeg-turn, f.slopeDeg)
		})
		if err != nil {
			return in, err
		}
	}
	return in, rs.tooHigh(e, w, s, &in)
}

// tooHigh adds the ground on which the machine would stand higher than a mapped limit allows. Since no
// blade may reach into a limited area, masts keep the rotor's radius from it.
func (rs *ruleset) tooHigh(e *overlay.Engine, w *world, s site, in *overlay.BuildableInput) error {
	or := overlay.Rule{Name: heightRule, SetbackM: rs.rotorM / 2}
	var bad error
	rs.eachHeightLimit(s, func(h heightLimit, i int) {
		m, _ := h.layer.number(i, "limit_value", "m")
		g := h.layer.xy[i]
		switch {
		case bad != nil:
			return
		case h.layer.aboveSea(i):
			var t *terrain.Grid
			if t, bad = w.terrain.get(); bad != nil {
				return
			}
			var high geo.XYGeometry
			if high, bad = t.Above(s.box.Grow(rs.rotorM), m-rs.tipM); bad != nil || high.Empty() {
				return
			}
			blocks := make([]geo.XYGeometry, len(high.Parts))
			for n := range blocks {
				blocks[n] = geo.XYGeometry{Kind: geo.Polygons, Parts: high.Parts[n : n+1]}
			}
			if high, bad = e.Union(blocks...); bad == nil {
				g, bad = e.Intersection(high, g)
			}
		case m >= rs.tipM:
			return
		}
		if bad == nil && !g.Empty() {
			or.Features = append(or.Features, g)
		}
	})
	if bad == nil && len(or.Features) > 0 {
		in.Rules = append(in.Rules, or)
	}
	return bad
}
