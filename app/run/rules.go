package run

import (
	"cmp"
	"fmt"
	"maps"
	"slices"
	"sort"
	"strconv"
	"strings"

	"groundtally/app/study"
	"groundtally/geo"
	"groundtally/scoring/units"
)

// rule is one thing that takes land, for one part of an option.
type rule struct {
	name       string // "setback:dwellings", "exclude:water", "setback:boundary"
	role       string // whose features it keeps to; empty for the boundary
	distM      float64
	boundary   bool
	toleranceM float64 // how far the features may lie from where they are drawn
	scaled     float64 // what is left of the distances, when they were made smaller; 0 for as they are
	gone       bool    // the rule was taken out
	sources    []ruleSource
}

type ruleSource struct {
	layer    *layer
	keep     []bool // features that count
	distM    float64
	prepared [3]*widened // by bound
}

// bound says for which end of the position tolerance land is reckoned.
type bound int

const (
	asDrawn bound = iota
	leastLand
	mostLand
)

func (b bound) shift(toleranceM float64) float64 {
	switch b {
	case leastLand:
		return toleranceM
	case mostLand:
		return -toleranceM
	}
	return 0
}

// ruleset is what a part of an option keeps to. Options with the same rules share it.
type ruleset struct {
	rules      []rule
	widthM     float64
	patchM2    float64
	incomplete []string // legal rules that are not set
	notApplied []string // codes of rules that could not be applied
	slopeDeg   float64
	facing     *facing
	heights    []heightLimit
	tipM       float64 // of the machine; 0 without one
	rotorM     float64
	tolerant   bool // some rule has a position tolerance
	excepted   map[string][]string
}

// facing says which way ground may fall where it is steep enough for that to matter.
type facing struct{ fromDeg, toDeg, slopeDeg float64 }

// heightLimit is a layer of height limits with the features that count for a part.
type heightLimit struct {
	layer *layer
	keep  []bool
}

// notLived is the class of dwellings that are none: barns and workplaces.
const notLived = "not lived in"

// Names of rules that are no distance from a layer.
const (
	slopeRule    = "slope"
	aspectRule   = "aspect"
	heightRule   = "height_limit"
	boundaryRule = "setback:boundary"
)

// rulesFor collects the rules of a part of an option.
func (w *world) rulesFor(o option, part string) (*ruleset, error) {
	rs := &ruleset{}
	if part == windPart {
		hub, ok1 := o.num("hub_height_m")
		d, ok2 := o.num("rotor_diameter_m")
		if ok1 && ok2 {
			rs.tipM, rs.rotorM = hub+d/2, d
		} // without them the option is not computed: see fitWind
	}
	_, to, _ := w.cascade("rule.measured_to.", o, part, "")
	bladesM := 0.0
	if part == windPart && to.Value == "blade tip" {
		bladesM = rs.rotorM / 2
	}
	for _, role := range w.snap.Catalog().Roles {
		if role.Name == "parcels" || role.Name == "district" || role.Name == heightRule {
			continue
		}
		w.setbackRule(rs, role, o, part, bladesM)
		w.excludeRule(rs, role, part)
	}
	if d, in, _ := w.distance("rule.setback.boundary.", o, part, rs); in && d > 0 {
		rs.rules = append(rs.rules, rule{name: boundaryRule, distM: d, boundary: true, toleranceM: w.tolerance("parcels")})
	}
	if x, _, ok := w.cascadeNumber("rule.slope_max.", o, part, "_deg"); ok {
		if w.terrain == nil {
			rs.notApplied = append(rs.notApplied, "slope_rule_not_applied")
		} else {
			rs.slopeDeg = x
		}
	}
	w.facingRule(rs, o, part)
	w.heightRule(rs, part)
	sort.Strings(rs.incomplete)
	rs.notApplied = unique(rs.notApplied)
	rs.widthM, _, _ = w.cascadeNumber("rule.smallest_width.", o, part, "_m")
	if x, _, ok := w.cascadeNumber("rule.smallest_patch.", o, part, "_ha"); ok {
		rs.patchM2 = x * units.M2PerHa
	}
	for _, r := range rs.rules {
		rs.tolerant = rs.tolerant || r.toleranceM > 0
	}
	rs.excepted = w.exceptions()
	return rs, nil
}

// distance gives the distance in metres that the settings under a prefix ask for, the greatest of the one in
// metres and the multiples of the machine's size; whether one is in force; whether one must be set and is not.
func (w *world) distance(prefix string, o option, part string, rs *ruleset) (m float64, in, unset bool) {
	for _, u := range []struct {
		suffix string
		factor float64
	}{{"_m", 1}, {"_tip", rs.tipM}, {"_rotor", rs.rotorM}} {
		x, key, ok := w.cascadeNumber(prefix, o, part, u.suffix)
		if ok {
			in = true
			m = max(m, x*u.factor)
		} else if key != "" {
			unset = true
		}
	}
	return m, in, unset && !in
}

// special is a distance of its own for some features of a role.
type special struct {
	class  string  // in lower case; empty for one by voltage
	fromKV float64 // least voltage
	distM  float64
}

// SpecialDistances lists the classes and voltages of a role that have a distance of their own, as they stand
// in the keys of settings behind rule.setback.<role>: "class.motorway.", "from_110_kv.". Classes come in
// order, then voltages from the highest, which is the order in which they are looked up.
func SpecialDistances(snap *study.Snapshot, role string) []string {
	prefix := "rule.setback." + role + "."
	classes, volts := map[string]bool{}, map[float64]string{}
	for key := range snap.Explicit {
		rest, ok := strings.CutPrefix(key, prefix)
		if !ok {
			continue
		}
		name, rest, more := strings.Cut(rest, ".")
		switch {
		case name == "class":
			class, _, _ := strings.Cut(rest, ".")
			classes["class."+class+"."] = true
		case more:
			if kv, ok := fromKV(name); ok {
				volts[-kv] = name + "."
			}
		}
	}
	out := slices.Sorted(maps.Keys(classes))
	for _, kv := range slices.Sorted(maps.Keys(volts)) {
		out = append(out, volts[kv])
	}
	return out
}

// fromKV reads the voltage of a name such as "from_110_kv".
func fromKV(name string) (float64, bool) {
	text, ok1 := strings.CutPrefix(name, "from_")
	text, ok2 := strings.CutSuffix(text, "_kv")
	kv, err := strconv.ParseFloat(text, 64)
	return kv, ok1 && ok2 && err == nil
}

// specials finds the distances that are set for classes and voltages of a role.
func (w *world) specials(role string, o option, part string, rs *ruleset) []special {
	var out []special
	for _, name := range SpecialDistances(w.snap, role) {
		d, in, _ := w.distance("rule.setback."+role+"."+name, o, part, rs)
		if !in {
			continue
		}
		sp := special{distM: d}
		if class, ok := strings.CutPrefix(name, "class."); ok {
			sp.class = strings.ToLower(strings.TrimSuffix(class, "."))
		} else {
			sp.fromKV, _ = fromKV(strings.TrimSuffix(name, "."))
		}
		out = append(out, sp)
	}
	return out
}

// holds reports whether a feature has the special distance.
func (s special) holds(l *layer, i int) bool {
	if s.class != "" {
		return l.class(i) == s.class
	}
	kv, ok := l.number(i, "voltage", "kV")
	return ok && kv >= s.fromKV
}

// setbackRule adds the distance that is kept from a role.
func (w *world) setbackRule(rs *ruleset, role study.Role, o option, part string, bladesM float64) {
	ls := w.byRole[role.Name]
	d, in, unset := w.distance("rule.setback."+role.Name+".", o, part, rs)
	some := w.specials(role.Name, o, part, rs)
	name := "setback:" + role.Name
	if unset {
		rs.incomplete = append(rs.incomplete, name)
	}
	if !(in && d > 0) && len(some) == 0 {
		return
	}
	if len(ls) == 0 {
		// A distance that is in force and cannot be kept for want of a layer is not a distance of zero.
		rs.incomplete = append(rs.incomplete, name)
		rs.notApplied = append(rs.notApplied, "rule_without_layer")
		return
	}
	r := rule{name: name, role: role.Name, toleranceM: w.tolerance(role.Name)}
	for _, l := range ls {
		l = w.measuredFrom(l, role.Name)
		keep := w.counted(l, role.Name, "", part)
		byDistance := map[float64][]bool{}
		for i := range keep {
			if !keep[i] {
				continue
			}
			own := d
			for _, s := range some {
				if s.holds(l, i) {
					own = s.distM
					break
				}
			}
			if own <= 0 {
				continue
			}
			own += bladesM
			if byDistance[own] == nil {
				byDistance[own] = make([]bool, len(keep))
			}
			byDistance[own][i] = true
		}
		if len(some) == 0 && len(byDistance) == 0 {
			byDistance[d+bladesM] = keep
		}
		for _, m := range slices.Sorted(maps.Keys(byDistance)) {
			r.sources = append(r.sources, ruleSource{layer: l, keep: byDistance[m], distM: m})
			r.distM = max(r.distM, m)
		}
	}
	rs.rules = append(rs.rules, r)
}

// excludeRule adds the ground of a role that is taken out.
func (w *world) excludeRule(rs *ruleset, role study.Role, part string) {
	if !w.snap.Yes("rule.exclude." + role.Name) {
		return
	}
	ls := w.byRole[role.Name]
	if len(ls) == 0 {
		if _, byUser, _ := w.snap.Lookup("rule.exclude." + role.Name); byUser {
			rs.incomplete = append(rs.incomplete, "exclude:"+role.Name)
		}
		rs.notApplied = append(rs.notApplied, "rule_without_layer")
		return
	}
	r := rule{name: "exclude:" + role.Name, role: role.Name, toleranceM: w.tolerance(role.Name)}
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
	slices.SortStableFunc(r.sources, func(a, b ruleSource) int { return cmp.Compare(a.distM, b.distM) })
	rs.rules = append(rs.rules, r)
}

// facingRule adds the way in which ground may fall.
func (w *world) facingRule(rs *ruleset, o option, part string) {
	from, _, ok1 := w.cascadeNumber("rule.aspect_from.", o, part, "_deg")
	to, _, ok2 := w.cascadeNumber("rule.aspect_to.", o, part, "_deg")
	if !ok1 || !ok2 {
		return
	}
	if w.terrain == nil {
		rs.notApplied = append(rs.notApplied, "aspect_rule_not_applied")
		return
	}
	least, _, _ := w.cascadeNumber("rule.aspect_slope.", o, part, "_deg")
	rs.facing = &facing{fromDeg: from, toDeg: to, slopeDeg: least}
}

// heightRule adds the mapped limits of height for a part with a tip.
func (w *world) heightRule(rs *ruleset, part string) {
	if part != windPart || rs.tipM == 0 {
		return
	}
	for _, l := range w.byRole[heightRule] {
		h := heightLimit{layer: l, keep: make([]bool, len(l.xy))}
		for i := range h.keep {
			_, ok := l.number(i, "limit_value", "m")
			h.keep[i] = ok && appliesTo(l.text(i, "applies_to"), part)
			if h.keep[i] && l.aboveSea(i) && w.terrain == nil {
				rs.incomplete = append(rs.incomplete, heightRule)
				rs.notApplied = append(rs.notApplied, "height_limit_needs_terrain")
				h.keep[i] = false
			}
		}
		rs.heights = append(rs.heights, h)
	}
	rs.incomplete = unique(rs.incomplete)
}

// aboveSea reports whether a height limit counts from the sea and not from the ground.
func (l *layer) aboveSea(i int) bool { return strings.EqualFold(l.text(i, "limit_kind"), "above sea") }

// tolerance gives how far the features of a role may lie from where they are drawn, in metres; 0 when it
// was not said.
func (w *world) tolerance(role string) float64 {
	x, _ := w.snap.Number("layer.tolerance." + role + "_m")
	return x
}

// exceptions gives, by site, the rules that do not hold there by the user's word.
func (w *world) exceptions() map[string][]string {
	out := map[string][]string{}
	for key := range w.snap.Explicit {
		rest, ok := strings.CutPrefix(key, study.ExceptPrefix)
		if !ok || !w.snap.Yes(key) {
			continue
		}
		if name, site, ok := strings.Cut(rest, "."); ok {
			out[site] = append(out[site], name)
		}
	}
	for _, rules := range out {
		sort.Strings(rules)
	}
	return out
}

// excepts reports whether a rule does not hold on a site.
func (rs *ruleset) excepts(site, rule string) bool { return slices.Contains(rs.excepted[site], rule) }

// measuredFrom gives a layer with the geometry that distances from its role are kept from.
func (w *world) measuredFrom(l *layer, role string) *layer {
	switch from := w.snap.Text("rule.measured_from." + role); from {
	case "centroid", "plot":
		return w.variant(l, from)
	}
	return l
}

// class gives the class of a feature in lower case: its class, else its kind.
func (l *layer) class(i int) string {
	class := l.text(i, "class")
	if class == "" {
		class = l.text(i, "kind")
	}
	return strings.ToLower(class)
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
		class := l.class(i)
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

// id names a source by what makes its widened layer.
func (s ruleSource) id(shiftM float64) string {
	k := newKey("source", 1)
	k.text(s.layer.rec.Name)
	k.text(s.layer.variant)
	k.num(s.distM)
	k.num(shiftM)
	for i, keep := range s.keep {
		if keep {
			k.int(i)
		}
	}
	return k.sum()
}

// ruleError names the rule and the layer.
func ruleError(r *rule, s *ruleSource, err error) error {
	return fmt.Errorf("rule %s, layer %q: %w", r.name, s.layer.rec.Name, err)
}
