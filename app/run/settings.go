package run

import (
	"context"
	"errors"
	"fmt"
	"maps"
	"math"
	"slices"
	"strconv"
	"strings"

	"groundtally/app/present"
	"groundtally/app/study"
	"groundtally/geo"
	"groundtally/scoring/criteria"
)

// CheckSetting reports whether a study can mean a value of a setting: the key has a definition, the names
// in it are there, the value is possible; own are the study's own turbines. An error is a *study.UnknownKeyError or a *study.ValueError.
func CheckSetting(cat *study.Catalog, p *Params, key, value string, own ...study.OwnTurbine) error {
	def, ok := cat.Definition(key)
	if !ok {
		return &study.UnknownKeyError{Key: key, Nearest: cat.Nearest(key)}
	}
	if err := CheckKey(cat, p, key); err != nil {
		return err
	}
	bad := func(format string, args ...any) error {
		return &study.ValueError{Key: key, Err: fmt.Errorf(format, args...)}
	}
	if value == study.NotSetText {
		return nil
	}
	if strings.HasPrefix(key, "plant.") && strings.HasSuffix(key, ".turbine") && !slices.Contains(p.TurbineIDs(), value) {
		var names []string
		for _, t := range own {
			names = append(names, t.ID)
		}
		switch {
		case slices.Contains(names, value):
		case len(names) > 0:
			return bad("there is no reference curve %q; the curves are: %s; the study's own are: %s", value, strings.Join(p.TurbineIDs(), ", "), strings.Join(names, ", "))
		default:
			return bad("there is no reference curve %q; the curves are: %s", value, strings.Join(p.TurbineIDs(), ", "))
		}
	}
	if key == factorsEdition && value != study.NotSetText && !slices.Contains(p.EditionDates(), value) {
		return bad("the program has no edition %q of the factors; it has: %s", value, strings.Join(p.EditionDates(), ", "))
	}
	form := func() error {
		if _, err := def.CheckValue(value); err != nil {
			return &study.ValueError{Key: key, Err: err}
		}
		return nil
	}
	x, err := strconv.ParseFloat(value, 64)
	if def.Kind != "number" || err != nil {
		return form()
	}
	whole := map[string][2]float64{"run.seed": {0, 1 << 53}, "run.trials": {10, 100_000}, "weigh.mixes": {1, 100_000}}
	if span, ok := whole[key]; ok && (x != float64(int64(x)) || x < span[0] || x > span[1]) {
		return bad("%s is not a whole number from %.0f to %.0f", value, span[0], span[1])
	}
	if x < 0 && neverNegative(def) {
		return bad("%s is below zero", strings.TrimSpace(value+" "+present.Unit(def.Unit)))
	}
	if x == 0 && slices.ContainsFunc([]string{".hub_height_m", ".rotor_diameter_m", ".rated_kw"}, func(end string) bool { return strings.HasSuffix(key, end) }) {
		return bad("it must be above zero")
	}
	return form()
}

// CheckKey reports whether the names inside a key, where they must be names that the program has, are
// such: a role, a consequence, a factor.
func CheckKey(cat *study.Catalog, p *Params, key string) error {
	parts := strings.Split(key, ".")
	bad := func(format string, args ...any) error {
		return &study.ValueError{Key: key, Err: fmt.Errorf(format, args...)}
	}
	consequence := func(name string) error {
		if names := p.keyNames(); !slices.Contains(names, name) {
			return bad("there is no consequence %q%s", name, LikeThis(name, names))
		}
		return nil
	}
	switch {
	case strings.HasPrefix(key, study.ExceptPrefix):
		if name := parts[2]; !slices.Contains(RuleNames(cat), name) {
			return bad("there is no rule %q; %s", name, ruleList(cat, name))
		}
	case strings.HasPrefix(key, "rule.setback.") || strings.HasPrefix(key, "rule.exclude.") || strings.HasPrefix(key, "rule.measured_from."):
		if _, ok := cat.Role(parts[2]); !ok && parts[2] != "boundary" {
			return bad("there is no role %q; the roles are: %s, and boundary", parts[2], strings.Join(roleNames(cat), ", "))
		}
	case strings.HasPrefix(key, tolerancePrefix):
		if role := strings.TrimSuffix(parts[2], "_m"); !slices.Contains(roleNames(cat), role) {
			return bad("there is no role %q; the roles are: %s", role, strings.Join(roleNames(cat), ", "))
		}
	case parts[0] == "limit":
		if d, _ := cat.Definition(key); d.Key == key {
			return nil
		}
		return consequence(strings.TrimPrefix(key, "limit."))
	case parts[0] == "anchor":
		return consequence(parts[1])
	case parts[0] == "voice" && len(parts) == 4 && parts[2] == "weight":
		if err := consequence(parts[3]); err != nil {
			return err
		}
		cr, ok := cat.Criterion(parts[3])
		if !ok {
			cr, _ = cat.Criterion(strings.TrimSuffix(parts[3], criteria.BurdenSuffix))
		}
		if cr.Better == criteria.Neither {
			return bad("%s is not scored, since neither more nor less of it is better", parts[3])
		}
	case parts[0] == "voice" && len(parts) == 4 && parts[2] == "both":
		var names []string
		for _, c := range cat.Criteria {
			names = append(names, c.Families...)
		}
		slices.Sort(names)
		if names = slices.Compact(names); !slices.Contains(names, parts[3]) {
			return bad("there is no family %q; the families are: %s", parts[3], strings.Join(names, ", "))
		}
	case parts[0] == "inventory" && len(parts) >= 3:
		row := strings.ReplaceAll(strings.TrimPrefix(key[:strings.LastIndexByte(key, '.')], "inventory."), "-", ".") // as UserFactor reads it
		if _, ok := p.Factors[row]; !ok {
			return bad("there is no factor %q%s", row, LikeThis(row, sortedNames(p.Factors)))
		}
	}
	return nil
}

const tolerancePrefix = "layer.tolerance."

func roleNames(cat *study.Catalog) []string {
	out := make([]string, len(cat.Roles))
	for i, r := range cat.Roles {
		out[i] = r.Name
	}
	return out
}

// RuleNames lists the rules that can take land of a site, in the order of the roles, those without a role last.
func RuleNames(cat *study.Catalog) []string {
	var out []string
	for _, kind := range []string{"setback:", "exclude:"} {
		for _, r := range cat.Roles {
			if r.Name != "parcels" && r.Name != "district" && r.Name != heightRule && (r.Accepts("point") || r.Accepts("line") || r.Accepts("polygon")) {
				out = append(out, kind+r.Name)
			}
		}
	}
	return append(out, boundaryRule, slopeRule, aspectRule, heightRule)
}

// RuleInForce reports whether a rule can take land of any site in a state of a study: it is set for some plant
// option, and there is a layer that it is about.
func RuleInForce(snap *study.Snapshot, name string) bool {
	some := func(prefix string, atLeast func(x float64) bool) bool {
		return slices.ContainsFunc(snap.Keys(), func(key string) bool {
			x, ok := snap.Number(key)
			return ok && strings.HasPrefix(key, prefix) && atLeast(x)
		})
	}
	whatever := func(float64) bool { return true }
	positive := func(x float64) bool { return x > 0 }
	switch name {
	case boundaryRule:
		return some("rule.setback.boundary.", positive)
	case slopeRule:
		return some("rule.slope_max.", whatever) && len(snap.LayersOf("terrain")) > 0
	case aspectRule:
		return some("rule.aspect_from.", whatever) && some("rule.aspect_to.", whatever) && len(snap.LayersOf("terrain")) > 0
	case heightRule:
		return len(snap.LayersOf(heightRule)) > 0
	}
	kind, role, _ := strings.Cut(name, ":")
	if len(snap.LayersOf(role)) == 0 {
		return false
	}
	return kind == "exclude" && snap.Yes("rule.exclude."+role) || kind == "setback" && some("rule.setback."+role+".", positive)
}

// ruleList names the rules that there are, those like a word first.
func ruleList(cat *study.Catalog, like string) string {
	names := RuleNames(cat)
	var alone, roles []string
	for _, n := range names {
		role, ok := strings.CutPrefix(n, "setback:")
		switch {
		case n == boundaryRule || !strings.Contains(n, ":"):
			alone = append(alone, n)
		case ok:
			roles = append(roles, role)
		}
	}
	near := ""
	if list := study.Near(like, names, 5); len(list) > 0 {
		near = "near it are: " + strings.Join(list, ", ") + "; "
	}
	return near + "the rules are: " + strings.Join(alone, ", ") + ", and setback:ROLE or exclude:ROLE with one of the roles " + strings.Join(roles, ", ")
}

// Sites gives the sites of a state of a study, in order, and which group of several parcels holds a parcel.
// Parcels are read, nothing is computed.
func Sites(ctx context.Context, load Loader, snap *study.Snapshot) (ids []string, in map[string]string, err error) {
	w := &world{snap: snap, byRole: map[string][]*layer{}}
	for _, rec := range snap.LayersOf("parcels") {
		l, err := contentOf(ctx, load, rec)
		if err != nil {
			return nil, nil, err
		}
		w.byRole["parcels"] = append(w.byRole["parcels"], l)
	}
	w.makeSites()
	for _, s := range w.sites {
		ids = append(ids, s.id)
	}
	in = map[string]string{}
	for _, g := range snap.Groups {
		for _, p := range g.Parcels {
			in[p] = g.Site
		}
	}
	return ids, in, nil
}

// contentOf reads a layer without bringing it into the frame.
func contentOf(ctx context.Context, load Loader, rec study.LayerRecord) (*layer, error) {
	v, err := load(ctx, rec.Digest)
	if err != nil {
		return nil, fmt.Errorf("read layer %q: %w", rec.Name, err)
	}
	if v.Layer == nil {
		return nil, fmt.Errorf("layer %q: %w", rec.Name, study.ErrRaster)
	}
	return &layer{rec: rec, src: v.Layer, xy: make([]geo.XYGeometry, len(v.Layer.Features))}, nil
}

// CheckException reports whether the site of an exception is there. A study without parcels cannot tell, and
// any site is taken. An error is a *study.ValueError.
func CheckException(ctx context.Context, load Loader, snap *study.Snapshot, key string) error {
	rest, ok := strings.CutPrefix(key, study.ExceptPrefix)
	if !ok || len(snap.LayersOf("parcels")) == 0 {
		return nil
	}
	ids, in, err := Sites(ctx, load, snap)
	if err != nil {
		return err
	}
	_, site, _ := strings.Cut(rest, ".")
	if what := noSite(site, ids, in); what != "" {
		return &study.ValueError{Key: key, Err: errors.New(what)}
	}
	return nil
}

// noSite says why a site is not there; empty for one that is.
func noSite(site string, ids []string, in map[string]string) string {
	switch {
	case slices.Contains(ids, site):
		return ""
	case in[site] != "":
		return fmt.Sprintf("parcel %s is part of the site %s; name that", site, in[site])
	}
	text := fmt.Sprintf("there is no site %q among the %d", site, len(ids))
	if near := study.Near(site, ids, 5); len(near) > 0 {
		return text + "; near it are: " + strings.Join(near, ", ")
	}
	return text
}

// SettingNotices tells of the user's settings that have no effect on what the study holds: exceptions of sites
// or rules that are not there, and rules for roles without a layer, for classes that no feature has, for
// voltages that nothing falls under. With keys, only these are looked at.
func SettingNotices(ctx context.Context, load Loader, snap *study.Snapshot, keys ...string) ([]geo.Notice, error) {
	if len(keys) == 0 {
		keys = slices.Sorted(maps.Keys(snap.Explicit))
	}
	var out []geo.Notice
	c := settingCheck{ctx: ctx, load: load, snap: snap, layers: map[string][]*layer{}}
	for _, key := range keys {
		set, ok := snap.Explicit[key]
		if !ok || set.Value == study.NotSetText || set.Value == "false" {
			continue
		}
		code, args, err := c.look(key)
		if err != nil {
			return nil, err
		}
		if code != "" {
			out = append(out, geo.Notice{Code: string(code), Severity: geo.Warning, Field: key, Args: args})
		}
	}
	return out, nil
}

// settingCheck reads what settings are compared with, each once.
type settingCheck struct {
	ctx    context.Context
	load   Loader
	snap   *study.Snapshot
	layers map[string][]*layer // by role, those with features
	ids    []string
	in     map[string]string
}

// noEffect is the code of a notice on a setting.
type noEffect string

// Codes of settings without an effect.
const (
	exceptNoRule     noEffect = "except_no_rule"
	exceptNoSite     noEffect = "except_no_site"
	exceptIdle       noEffect = "except_rule_idle"
	exceptNoParcels  noEffect = "except_no_parcels"
	settingNoLayer   noEffect = "setting_no_layer"
	settingRaster    noEffect = "setting_only_raster"
	settingNoClass   noEffect = "setting_no_class"
	settingNoVoltage noEffect = "setting_no_voltage"
	settingVoltageUp noEffect = "setting_voltage_taken"
)

// look finds out why a setting has no effect; the code is empty where it has one, or may have.
func (c *settingCheck) look(key string) (noEffect, map[string]string, error) {
	if rest, ok := strings.CutPrefix(key, study.ExceptPrefix); ok {
		return c.exception(rest)
	}
	parts := strings.Split(key, ".")
	if len(parts) < 3 {
		return "", nil, nil
	}
	role := parts[2]
	switch {
	case strings.HasPrefix(key, tolerancePrefix):
		role = strings.TrimSuffix(role, "_m")
		parts = parts[:3]
	case parts[0] != "rule" || !slices.Contains([]string{"setback", "exclude", "measured_from"}, parts[1]) || role == "boundary":
		return "", nil, nil
	}
	ls, err := c.ofRole(role)
	if err != nil {
		return "", nil, err
	}
	title := role
	if r, ok := c.snap.Catalog().Role(role); ok {
		title = strings.ToLower(r.Title)
	}
	if len(ls) == 0 {
		code := settingNoLayer
		if len(c.snap.LayersOf(role)) > 0 {
			code = settingRaster
		}
		return code, map[string]string{"role": title}, nil
	}
	switch {
	case len(parts) > 4 && parts[3] == "class":
		return noClass(ls, title, parts[4])
	case len(parts) == 4 && parts[1] == "exclude" && parts[3] == "class":
		return noClass(ls, title, strings.Split(c.snap.Text(key), "|")...)
	case len(parts) > 4:
		if kv, ok := fromKV(parts[3]); ok {
			code, args := c.noVoltage(ls, title, role, parts[4], kv)
			return code, args, nil
		}
	}
	return "", nil, nil
}

func (c *settingCheck) exception(rest string) (noEffect, map[string]string, error) {
	name, site, _ := strings.Cut(rest, ".")
	if !slices.Contains(RuleNames(c.snap.Catalog()), name) {
		return exceptNoRule, map[string]string{"rule": name, "rules": ruleList(c.snap.Catalog(), name)}, nil
	}
	if len(c.snap.LayersOf("parcels")) == 0 {
		return exceptNoParcels, map[string]string{"site": site}, nil
	}
	if c.in == nil {
		var err error
		if c.ids, c.in, err = Sites(c.ctx, c.load, c.snap); err != nil {
			return "", nil, err
		}
	}
	if what := noSite(site, c.ids, c.in); what != "" {
		return exceptNoSite, map[string]string{"what": what}, nil
	}
	if !RuleInForce(c.snap, name) {
		return exceptIdle, map[string]string{"rule": present.Rule(name)}, nil
	}
	return "", nil, nil
}

func (c *settingCheck) ofRole(role string) ([]*layer, error) {
	if ls, ok := c.layers[role]; ok {
		return ls, nil
	}
	var out []*layer
	for _, rec := range c.snap.LayersOf(role) {
		if rec.Kind == "raster" || rec.Kind == "table" {
			continue
		}
		l, err := contentOf(c.ctx, c.load, rec)
		if err != nil {
			return nil, err
		}
		out = append(out, l)
	}
	c.layers[role] = out
	return out, nil
}

// noClass finds the classes that no feature has.
func noClass(ls []*layer, title string, classes ...string) (noEffect, map[string]string, error) {
	there := map[string]bool{}
	for _, l := range ls {
		for i := range l.xy {
			if class := l.class(i); class != "" {
				there[class] = true
			}
		}
	}
	var missing []string
	for _, class := range classes {
		if class = strings.TrimSpace(class); class != "" && !there[strings.ToLower(class)] {
			missing = append(missing, class)
		}
	}
	if len(missing) == 0 {
		return "", nil, nil
	}
	return settingNoClass, map[string]string{"class": strings.Join(missing, ", "), "role": title, "there": someOf(slices.Sorted(maps.Keys(there)))}, nil
}

// noVoltage finds out whether no feature reaches a voltage, or all that reach it fall under a higher one
// that is set for the same plants.
func (c *settingCheck) noVoltage(ls []*layer, title, role, plant string, leastKV float64) (noEffect, map[string]string) {
	above := math.Inf(1)
	for key, set := range c.snap.Explicit {
		parts := strings.Split(key, ".")
		if len(parts) != 5 || parts[0] != "rule" || parts[1] != "setback" || parts[2] != role || parts[4] != plant || set.Value == study.NotSetText {
			continue
		}
		if kv, ok := fromKV(parts[3]); ok && kv > leastKV {
			above = min(above, kv)
		}
	}
	there := map[float64]bool{}
	reached := false
	for _, l := range ls {
		for i := range l.xy {
			kv, ok := l.number(i, "voltage", "kV")
			if !ok {
				continue
			}
			there[kv] = true
			reached = reached || kv >= leastKV
			if kv >= leastKV && kv < above {
				return "", nil
			}
		}
	}
	var words []string
	for _, kv := range slices.Sorted(maps.Keys(there)) {
		words = append(words, present.Exact(kv)+" kV")
	}
	args := map[string]string{"kv": present.Exact(leastKV), "role": title, "there": someOf(words)}
	if reached {
		args["above"] = present.Exact(above)
		return settingVoltageUp, args
	}
	return settingNoVoltage, args
}

// someOf joins the first of many words; "none" for no word.
func someOf(words []string) string {
	const most = 20
	switch {
	case len(words) == 0:
		return "none"
	case len(words) > most:
		return strings.Join(words[:most], ", ") + fmt.Sprintf(" and %d more", len(words)-most)
	}
	return strings.Join(words, ", ")
}

func (p *Params) keyNames() []string {
	var out []string
	for _, k := range p.Keys() {
		out = append(out, k.Key)
	}
	return out
}

// TurbineIDs gives the names of the reference curves.
func (p *Params) TurbineIDs() []string {
	out := make([]string, len(p.Turbines))
	for i, t := range p.Turbines {
		out[i] = t.ID
	}
	return out
}

// neverNegative tells whether a setting's unit is one of which there is never less than nothing.
func neverNegative(d study.Definition) bool {
	switch d.Unit {
	case "m", "ha", "kW", "MWh/yr", "m/s", "rotor diameter", "tip height", "swing points", "kWh/(m2 month)", "dB(A)", "h/yr":
		return true
	}
	return false
}

// LikeThis proposes the name that is most like a word: by parts of words in common and a common
// beginning. It proposes nothing where nothing is alike.
func LikeThis(word string, names []string) string {
	best, most := "", 3
	for _, n := range names {
		score := 0
		for _, part := range strings.FieldsFunc(word, func(r rune) bool { return strings.ContainsRune("_.- ", r) }) {
			if len(part) > 1 && strings.Contains(n, part) {
				score += 2 * len(part)
			}
		}
		for i := 0; i < len(word) && i < len(n) && word[i] == n[i]; i++ {
			score++
		}
		if score > most || (score == most && best != "" && len(n) < len(best)) {
			best, most = n, score
		}
	}
	if best == "" {
		return ""
	}
	return fmt.Sprintf("; is %q meant?", best)
}
