package run

import (
	"context"
	"fmt"
	"slices"
	"sort"
	"strings"

	"groundtally/geo"
	"groundtally/geo/overlay"
	"groundtally/scoring/units"
)

// groundEdition is raised when the digits of the step change.
const groundEdition = 1

// rule is one thing that takes land, for one part of an option.
type rule struct {
	name     string // "setback:dwellings", "exclude:water", "setback:boundary", "slope"
	distM    float64
	boundary bool
	sources  []ruleSource
}

type ruleSource struct {
	layer    *layer
	keep     []bool // features that count
	distM    float64
	prepared *overlay.Layer
}

// ruleset is what a part of an option keeps to. Options with the same rules share it.
type ruleset struct {
	rules      []rule
	widthM     float64
	patchM2    float64
	incomplete []string // legal rules that are not set
	notApplied []string // codes of rules that could not be applied
	slopeDeg   float64
}

// notLived is the class of dwellings that are none: barns and workplaces.
const notLived = "not lived in"

// rulesFor collects the rules of a part of an option.
func (w *world) rulesFor(o option, part string) (*ruleset, error) {
	rs := &ruleset{}
	tip, rotor := 0.0, 0.0
	if part == windPart {
		hub, ok1 := o.num("hub_height_m")
		d, ok2 := o.num("rotor_diameter_m")
		if ok1 && ok2 {
			tip, rotor = hub+d/2, d
		} // without them the option is not computed: see fitWind
	}
	distance := func(role string) (float64, bool, bool) { // metres, in force, not set
		best, in, unset := 0.0, false, false
		for _, u := range []struct {
			suffix string
			factor float64
		}{{"_m", 1}, {"_tip", tip}, {"_rotor", rotor}} {
			x, key, ok := w.cascadeNumber("rule.setback."+role+".", o, part, u.suffix)
			if ok {
				in = true
				best = max(best, x*u.factor)
			} else if key != "" {
				unset = true
			}
		}
		return best, in, unset && !in
	}
	for _, role := range w.snap.Catalog().Roles {
		ls := w.byRole[role.Name]
		if role.Name == "parcels" || role.Name == "district" {
			continue
		}
		d, in, unset := distance(role.Name)
		switch {
		case unset:
			rs.incomplete = append(rs.incomplete, "setback:"+role.Name)
		case in && d > 0 && len(ls) == 0:
			// A distance that is in force and cannot be kept for want of a layer is not a distance of zero.
			rs.incomplete = append(rs.incomplete, "setback:"+role.Name)
			rs.notApplied = append(rs.notApplied, "rule_without_layer")
		case in && d > 0:
			r := rule{name: "setback:" + role.Name, distM: d}
			for _, l := range ls {
				r.sources = append(r.sources, ruleSource{layer: l, keep: w.counted(l, role.Name, "", part), distM: d})
			}
			rs.rules = append(rs.rules, r)
		}
		if !w.snap.Yes("rule.exclude." + role.Name) {
			continue
		}
		if len(ls) == 0 {
			if _, byUser, _ := w.snap.Lookup("rule.exclude." + role.Name); byUser {
				rs.incomplete = append(rs.incomplete, "exclude:"+role.Name)
			}
			rs.notApplied = append(rs.notApplied, "rule_without_layer")
			continue
		}
		r := rule{name: "exclude:" + role.Name}
		classes := w.snap.Text("rule.exclude." + role.Name + ".class")
		for _, l := range ls {
			keep := w.counted(l, role.Name, classes, part)
			for own, some := range l.byOwnSetback(keep) {
				r.sources = append(r.sources, ruleSource{layer: l, keep: some, distM: own})
				r.distM = max(r.distM, own)
			}
			if role.Name == "exclusion" && l.thin(keep) {
				rs.notApplied = append(rs.notApplied, "exclusion_needs_width")
			}
		}
		sort.SliceStable(r.sources, func(i, j int) bool { return r.sources[i].distM < r.sources[j].distM })
		rs.rules = append(rs.rules, r)
	}
	if d, in, _ := distance("boundary"); in && d > 0 {
		rs.rules = append(rs.rules, rule{name: "setback:boundary", distM: d, boundary: true})
	}
	if x, _, ok := w.cascadeNumber("rule.slope_max.", o, part, "_deg"); ok {
		if w.terrain == nil {
			rs.notApplied = append(rs.notApplied, "slope_rule_not_applied")
		} else {
			rs.slopeDeg = x
		}
	}
	sort.Strings(rs.incomplete)
	rs.notApplied = unique(rs.notApplied)
	rs.widthM, _, _ = w.cascadeNumber("rule.smallest_width.", o, part, "_m")
	if x, _, ok := w.cascadeNumber("rule.smallest_patch.", o, part, "_ha"); ok {
		rs.patchM2 = x * units.M2PerHa
	}
	return rs, nil
}

// counted marks the features of a layer that a rule looks at.
func (w *world) counted(l *layer, role, classes, part string) []bool {
	keep := make([]bool, len(l.xy))
	var want map[string]bool
	if classes != "" {
		want = map[string]bool{}
		for _, c := range strings.Split(classes, "|") {
			want[strings.ToLower(strings.TrimSpace(c))] = true
		}
	}
	for i := range keep {
		class := l.text(i, "class")
		if class == "" {
			class = l.text(i, "kind")
		}
		class = strings.ToLower(class)
		switch {
		case role == "dwellings" && class == notLived:
		case want != nil && !want[class]:
		case role == "exclusion" && !appliesTo(l.text(i, "applies_to"), part):
		default:
			keep[i] = true
		}
	}
	return keep
}

// byOwnSetback parts the counted features by the distance that each brings itself, as an exclusion line
// or a listed site may; 0 for those that bring none.
func (l *layer) byOwnSetback(keep []bool) map[float64][]bool {
	out := map[float64][]bool{}
	for i := range keep {
		if !keep[i] {
			continue
		}
		d := l.ownM(i)
		if out[d] == nil {
			out[d] = make([]bool, len(keep))
		}
		out[d][i] = true
	}
	return out
}

// ownM gives the distance that a feature brings itself: its setback, or half the width of a road or a
// stream that is drawn as its middle line.
func (l *layer) ownM(i int) float64 {
	if d, ok := l.number(i, "setback", "m"); ok && d > 0 {
		return d
	}
	if d, ok := l.number(i, "width", "m"); ok && d > 0 && l.xy[i].Kind == geo.Lines {
		return d / 2
	}
	return 0
}

// thin reports whether a counted point or line brings no distance, so that it takes no ground.
func (l *layer) thin(keep []bool) bool {
	for i := range keep {
		if keep[i] && l.xy[i].Kind != geo.Polygons {
			if l.ownM(i) == 0 {
				return true
			}
		}
	}
	return false
}

func unique(list []string) []string {
	sort.Strings(list)
	return slices.Compact(list)
}

func appliesTo(text, part string) bool { return text == "" || text == "all" || text == part }

// prepare widens the features of every rule once for all sites.
//
// Layers that were widened alike before are taken from made, so that rulesets share them.
func (rs *ruleset) prepare(ctx context.Context, e *overlay.Engine, made map[string]*overlay.Layer) error {
	for i := range rs.rules {
		r := &rs.rules[i]
		for j := range r.sources {
			if err := ctx.Err(); err != nil {
				return err
			}
			s := &r.sources[j]
			name := s.id()
			if l, there := made[name]; there {
				s.prepared = l
				continue
			}
			var fs []geo.XYGeometry
			for k, g := range s.layer.xy {
				if s.keep[k] && (s.distM > 0 || g.Kind == geo.Polygons) {
					fs = append(fs, g)
				}
			}
			l, err := e.NewLayer(fs, s.distM)
			if err != nil {
				return fmt.Errorf("rule %s, layer %q: %w", r.name, s.layer.rec.Name, err)
			}
			s.prepared, made[name] = l, l
		}
	}
	return nil
}

// id names a source by what makes its widened layer.
func (s ruleSource) id() string {
	k := newKey("source", 1)
	k.text(s.layer.rec.Name)
	k.num(s.distM)
	for i, keep := range s.keep {
		if keep {
			k.int(i)
		}
	}
	return k.sum()
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
	if rs.slopeDeg > 0 {
		k.num(rs.slopeDeg)
		k.text(w.terrain.rec.Digest)
		k.text(w.terrain.rec.CRS)
	}
	var buf []int
	for _, r := range rs.rules {
		if r.boundary {
			k.text(r.name)
			k.num(r.distM)
			continue
		}
		near := false
		for _, src := range r.sources {
			buf = src.layer.tree.Search(s.box.Grow(src.distM*bufferReach+1), buf[:0])
			for _, i := range buf {
				if !src.keep[i] {
					continue
				}
				if !near {
					k.text(r.name)
					near = true
				}
				k.num(src.distM)
				k.h.Write(src.layer.hash[i][:])
			}
		}
	}
	return k.sum()
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
}

func (rs *ruleset) compute(e *overlay.Engine, w *world, s site, steep map[float64]geo.XYGeometry) (groundResult, error) {
	in := overlay.BuildableInput{Site: s.geom, SmallestWidthM: rs.widthM, SmallestPatchM2: rs.patchM2}
	for _, r := range rs.rules {
		or := overlay.Rule{Name: r.name, SetbackM: r.distM, Boundary: r.boundary}
		if !r.boundary {
			or = overlay.Rule{Name: r.name, Checked: true}
			for _, src := range r.sources {
				or.Features = append(or.Features, src.prepared.Rule(r.name, s.box).Features...)
			}
			if len(or.Features) == 0 {
				continue
			}
		}
		in.Rules = append(in.Rules, or)
	}
	if rs.slopeDeg > 0 {
		over, done := steep[rs.slopeDeg]
		if !done {
			var err error
			if over, err = w.steep(s.box, rs.slopeDeg); err != nil {
				return groundResult{}, err
			}
			steep[rs.slopeDeg] = over
		}
		if !over.Empty() {
			in.Rules = append(in.Rules, overlay.Rule{Name: "slope", Features: []geo.XYGeometry{over}})
		}
	}
	out, err := e.Buildable(in)
	if err != nil {
		return groundResult{}, fmt.Errorf("site %s: %w", s.id, err)
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
	return g, nil
}
