package run

import (
	"cmp"
	"context"
	"fmt"
	"math"
	"runtime"
	"slices"
	"strings"

	"groundtally/app/study"
	"groundtally/geo"
	"groundtally/geo/overlay"
	"groundtally/scoring"
	"groundtally/scoring/units"
)

// Out is a candidate that is out, and why.
type Out struct {
	Site           string    `json:"site"`
	Plant          string    `json:"plant"`
	Status         string    `json:"status"` // NoRoom, NotComputed, or HeldBack
	Reason         string    `json:"reason,omitempty"`
	GrossHa        float64   `json:"gross_ha"`
	BuildableHa    float64   `json:"buildable_ha"`
	LargestPatchHa float64   `json:"largest_patch_ha"`
	NeedsPatchHa   float64   `json:"needs_patch_ha,omitempty"`
	ShapeHa        float64   `json:"shape_ha"`
	Rules          []OutRule `json:"rules"`              // what takes most first
	Headroom       *Headroom `json:"headroom,omitempty"` // where height limits hold
}

// HeldBack is the status of a fitted candidate that a gate keeps out of every order.
const HeldBack = "held_back"

// OutRule is a rule that takes land of a site that is out.
type OutRule struct {
	Taken
	Data []string `json:"data"` // layers that the rule rests on, with their editions
}

// Register lists every candidate that is out, by which rules and by how much, with the editions of the data
// behind them.
func Register(snap *study.Snapshot, r *Results) []Out {
	gates := gatesOf(snap)
	data := map[string][]string{}
	for _, l := range snap.Layers {
		words := l.Name
		if l.Edition != "" {
			words += ", edition " + l.Edition
		}
		if l.Holder != "" {
			words += ", " + l.Holder
		}
		data[l.Role] = append(data[l.Role], words)
	}
	var out []Out
	for i := range r.Candidates {
		c := &r.Candidates[i]
		o := Out{Site: c.Site, Plant: c.Plant, Status: c.Status, Reason: c.Reason, ShapeHa: c.ShapeHa, Headroom: c.Headroom}
		if c.Status == Fitted {
			by := heldBy(gates, c)
			if len(by) == 0 {
				continue
			}
			o.Status = HeldBack
			for i, g := range by {
				by[i] = GateTitle(g) + ": " + c.Gate(g).State
			}
			o.Reason = strings.Join(by, "; ")
		}
		for key, x := range map[string]*float64{"gross_area_ha": &o.GrossHa, "buildable_area_ha": &o.BuildableHa, "largest_patch_ha": &o.LargestPatchHa} {
			if q, ok := c.Consequence(key); ok && q.State == scoring.Number {
				*x = q.Central
			}
		}
		if c.Miss != nil {
			o.NeedsPatchHa = c.Miss.NeedsPatchHa
		}
		for _, t := range c.Taken {
			o.Rules = append(o.Rules, OutRule{Taken: t, Data: data[roleOf(t.Rule)]})
		}
		slices.SortStableFunc(o.Rules, func(a, b OutRule) int {
			return cmp.Or(cmp.Compare(b.AloneHa+b.SharedHa, a.AloneHa+a.SharedHa), cmp.Compare(a.Rule, b.Rule))
		})
		out = append(out, o)
	}
	return out
}

// roleOf gives the role whose layers a rule rests on.
func roleOf(rule string) string {
	switch rule {
	case slopeRule, aspectRule:
		return "terrain"
	case boundaryRule:
		return "parcels"
	}
	if _, role, ok := strings.Cut(rule, ":"); ok {
		return role
	}
	return rule
}

// Relaxed is a change of one rule that would bring a candidate back.
type Relaxed struct {
	Rule   string  `json:"rule"`
	Part   string  `json:"part,omitempty"` // of a plant of both: wind or solar
	From   float64 `json:"from"`
	To     float64 `json:"to"`
	Unit   string  `json:"unit"`
	Lifted bool    `json:"lifted,omitempty"` // no number to change: the rule would have to go
	share  float64 // of its value that the rule gives up
}

// missSteps halve the change of a rule so often: to a 16,000th of its value.
const missSteps = 14

// NearestMiss looks, rule by rule, for the smallest change that would give a candidate without room a plant,
// all other rules as they are, and lists those that would, the smallest share of its own value first; a rule
// that would have to go altogether comes last. It is empty when no single rule is enough. Distances of one
// rule shrink together. The change is found by halving, so it takes for granted that what fits under a rule
// also fits under a weaker one.
func (s *Surveyor) NearestMiss(ctx context.Context, c *Candidate) ([]Relaxed, error) {
	s.mu.Lock()
	defer s.mu.Unlock()
	if c.Status != NoRoom {
		return nil, fmt.Errorf("candidate %s is %s; only one without room has a nearest miss", c.ID(), c.Status)
	}
	here, err := s.site(ctx, c)
	if err != nil {
		return nil, err
	}
	f, err := s.fitted(ctx)
	if err != nil {
		return nil, err
	}
	m := misser{ctx: ctx, w: s.world, f: f, here: here, e: overlay.New()}
	defer closeEngine(m.e)
	for _, o := range s.world.options {
		if o.id == c.Plant {
			return m.option(o)
		}
	}
	return nil, fmt.Errorf("plant option %q: %w", c.Plant, study.ErrNotThere)
}

// misser tries rules on one site.
type misser struct {
	ctx   context.Context
	w     *world
	f     *fitter
	e     *overlay.Engine
	here  site
	known terrainCells
}

func (m *misser) option(o option) ([]Relaxed, error) {
	grounds := map[string]groundResult{}
	sets := map[string]*ruleset{}
	m.known = terrainCells{}
	for _, part := range o.parts() {
		rs, err := m.w.rulesFor(o, part)
		if err != nil {
			return nil, err
		}
		rs.tolerant = false // the least and the most land play no part
		if err := rs.prepare(m.ctx, m.e, runtime.NumCPU(), map[string]*widened{}); err != nil {
			return nil, err
		}
		if sets[part] = rs; err != nil {
			return nil, err
		}
		if grounds[part], err = rs.compute(m.e, m.w, m.here, m.known); err != nil {
			return nil, err
		}
	}
	var out []Relaxed
	for _, part := range o.parts() {
		for _, rule := range sets[part].relaxable(m.here) {
			if err := m.ctx.Err(); err != nil {
				return nil, err
			}
			r, ok, err := m.least(o, part, sets[part], rule, grounds)
			if err != nil {
				return nil, err
			}
			if ok {
				if len(o.parts()) > 1 {
					r.Part = part
				}
				out = append(out, r)
			}
		}
	}
	slices.SortStableFunc(out, func(a, b Relaxed) int {
		lifted := func(r Relaxed) int {
			if r.Lifted {
				return 1
			}
			return 0
		}
		return cmp.Or(cmp.Compare(lifted(a), lifted(b)), cmp.Compare(a.share, b.share), cmp.Compare(a.Rule, b.Rule), cmp.Compare(a.Part, b.Part))
	})
	return out, nil
}

// The rules on shape, by name.
const (
	patchRule = "smallest_patch"
	widthRule = "smallest_width"
)

// relaxable names the rules that hold on a site.
func (rs *ruleset) relaxable(s site) []string {
	var out []string
	for _, r := range rs.rules {
		if !rs.excepts(s.id, r.name) {
			out = append(out, r.name)
		}
	}
	if rs.slopeDeg > 0 {
		out = append(out, slopeRule)
	}
	if rs.facing != nil {
		out = append(out, aspectRule)
	}
	if len(rs.heights) > 0 {
		out = append(out, heightRule)
	}
	if rs.patchM2 > 0 {
		out = append(out, patchRule)
	}
	if rs.widthM > 0 {
		out = append(out, widthRule)
	}
	return out
}

// relaxed gives the rules with one of them weaker: at 0 as it is, at 1 gone. Features keep to their distance
// times 1 − by; what has no number is gone as soon as by is above 0.
func (rs *ruleset) relaxed(name string, by float64) *ruleset {
	out := *rs
	out.rules = slices.Clone(rs.rules)
	for i, r := range out.rules {
		if r.name == name {
			out.rules[i].distM *= 1 - by
			out.rules[i].scaled, out.rules[i].gone = 1-by, by >= 1 || by > 0 && r.distM == 0
		}
	}
	keep := 1 - by
	switch name {
	case slopeRule:
		if out.slopeDeg += by * (90 - rs.slopeDeg); by >= 1 {
			out.slopeDeg = 0
		}
	case aspectRule:
		out.facing = nil
	case heightRule:
		out.heights = nil
	case patchRule:
		out.patchM2 *= keep
	case widthRule:
		out.widthM *= keep
	}
	return &out
}

// number gives the value of a rule with its unit; ok is false for one without a number.
func (rs *ruleset) number(name string) (x float64, unit string, ok bool) {
	switch name {
	case slopeRule:
		return rs.slopeDeg, "deg", true
	case patchRule:
		return rs.patchM2 / units.M2PerHa, "ha", true
	case widthRule:
		return rs.widthM, "m", true
	}
	for _, r := range rs.rules {
		if r.name == name {
			return r.distM, "m", r.distM > 0
		}
	}
	return 0, "", false
}

// least finds the smallest change of a rule that brings the candidate back.
func (m *misser) least(o option, part string, rs *ruleset, name string, grounds map[string]groundResult) (r Relaxed, ok bool, err error) {
	fits := func(by float64) (bool, error) {
		g, err := rs.relaxed(name, by).compute(m.e, m.w, m.here, m.known)
		if err != nil {
			return false, err
		}
		with := map[string]groundResult{}
		for p, old := range grounds {
			with[p] = old
		}
		with[part] = g
		f, err := m.f.compute(m.e, o, m.here, with)
		return f.Status == Fitted, err
	}
	if ok, err = fits(1); err != nil || !ok {
		return r, false, err
	}
	from, unit, numbered := rs.number(name)
	r = Relaxed{Rule: name, From: from, Unit: unit, Lifted: !numbered}
	if !numbered {
		r.share = 1
		return r, true, nil
	}
	lo, hi := 0.0, 1.0
	for range missSteps {
		mid := (lo + hi) / 2
		yes, err := fits(mid)
		if err != nil {
			return r, false, err
		}
		if yes {
			hi = mid
		} else {
			lo = mid
		}
	}
	r.share = hi
	if r.To, _, _ = rs.relaxed(name, hi).number(name); name == slopeRule && hi >= 1 {
		r.To = 90
	}
	return r, true, nil
}

// nearby gives the features of a rule near a site as rules of their own distance, for a rule whose distances
// were scaled after the layers were widened.
func (r *rule) nearby(s site) []overlay.Rule {
	var out []overlay.Rule
	for n, src := range r.sources {
		m := src.distM * r.scaled
		or := overlay.Rule{Name: fmt.Sprintf("%s %d", r.name, n), SetbackM: m}
		for _, i := range src.layer.tree.Search(s.box.Grow(math.Max(m*bufferReach, 1)), nil) {
			if g := src.layer.xy[i]; src.keep[i] && (m > 0 || src.distM == 0 && g.Kind == geo.Polygons) {
				or.Features = append(or.Features, g)
			}
		}
		if len(or.Features) > 0 {
			out = append(out, or)
		}
	}
	return out
}
