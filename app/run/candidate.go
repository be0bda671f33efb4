package run

import (
	"cmp"
	"fmt"
	"maps"
	"math"
	"slices"
	"sort"
	"strings"

	"groundtally/app/study"
	"groundtally/assets/citedtable"
	"groundtally/geo"
	"groundtally/geo/overlay"
	"groundtally/scoring"
	"groundtally/scoring/criteria"
	"groundtally/scoring/params"
	"groundtally/scoring/reckon"
	"groundtally/scoring/units"
)

// candidateEdition is raised when the digits of connection, facts or consequences change.
const candidateEdition = 8

// reckoner evaluates the graph for candidates with one set of factors and draws.
type reckoner struct {
	p       *Params
	snap    *study.Snapshot
	seed    uint64
	trials  int
	central []scoring.Value // factors and settings; facts are filled in per candidate
	drawn   []reckon.Drawn
	user    map[string]bool // factors that the user changed
	keys    []KeyInfo
	want    []int // slots of the keys that the graph gives
	wantKey []int // their place in keys
	demand  fact
	size    params.Factor    // of one machine, that the rows of turbines stand for
	shipped map[int][]string // notices of factors that the user did not change, by slot
	inputs  string           // what every candidate depends on
}

func (w *world) newReckoner() (*reckoner, error) {
	k := &reckoner{p: w.p, snap: w.snap, user: map[string]bool{}, keys: w.p.Keys(), shipped: map[int][]string{}}
	seed, ok := w.snap.Number("run.seed")
	if !ok || seed < 0 || seed != math.Floor(seed) || seed > 1<<53 {
		return nil, fmt.Errorf("run.seed must be a whole number from 0")
	}
	k.seed = uint64(seed)
	n, ok := w.snap.Number("run.trials")
	if !ok || n < 10 || n > 100000 || n != math.Floor(n) {
		return nil, fmt.Errorf("run.trials must be a whole number from 10 to 100000")
	}
	k.trials = int(n)
	g := w.p.Graph
	groups := map[string][]float64{} // the draws that all factors of a group share
	k.central = make([]scoring.Value, g.Size())
	needed := map[int]bool{}
	for _, key := range k.keys {
		for _, s := range w.p.reaches[key.Key] {
			needed[s] = true
		}
	}
	for slot, l := range g.Leaves() {
		if l.Kind != scoring.FactorLeaf {
			continue
		}
		f, changed, err := k.factor(l.Name)
		if err != nil {
			return nil, err
		}
		k.user[l.Name] = changed
		if !changed && inventoryRow(l.Name) {
			k.shipped[slot] = append(k.shipped[slot], "inventory_default")
		}
		if !changed && f.Provenance == citedtable.Memory {
			k.shipped[slot] = append(k.shipped[slot], "memory_parameter")
		}
		if l.Name == sizeFactor {
			k.size = f
		}
		k.central[slot] = scoring.Num(f.Central)
		if f.Dist == params.Fixed || f.Low == f.High || !needed[slot] {
			continue
		}
		d := reckon.Drawn{Slot: slot, Values: make([]float64, k.trials), Shared: true}
		group := f.Group
		if group == "" {
			group = f.ID
		}
		if groups[group] == nil {
			u := make([]float64, k.trials)
			for t := range u {
				u[t] = params.Draw(k.seed, group, t)
			}
			groups[group] = stratify(u)
		}
		for t, u := range groups[group] {
			d.Values[t] = f.Quantile(u)
		}
		k.drawn = append(k.drawn, d)
	}
	for _, s := range settingLeaves {
		slot, _ := g.Slot(s.leaf)
		x, ok := w.snap.Number(s.setting)
		switch {
		case ok:
			k.central[slot] = scoring.Num(x)
		case s.leaf == "agreed_limit_kw":
			k.central[slot] = scoring.Num(math.MaxFloat64) // no limit agreed
		default:
			k.central[slot] = scoring.NotSetKey(s.setting)
		}
	}
	if x, source, ok := w.demand(); ok {
		slot, _ := g.Slot("demand_mwh_per_yr")
		k.central[slot] = scoring.Num(x)
		k.demand = fact{scoring.Num(x), source}
	} else if slot, _ := g.Slot("demand_mwh_per_yr"); !k.central[slot].OK() {
		k.central[slot] = scoring.UnknownBecause("no_layer:demand")
	}
	if w.snap.Text("energy.human_power") != "on" {
		slot, _ := g.Slot("human_power_w")
		k.central[slot] = scoring.NotSetKey("energy.human_power")
		k.drawn = slices.DeleteFunc(k.drawn, func(d reckon.Drawn) bool { return d.Slot == slot })
	}
	for i, key := range k.keys {
		if slot, ok := g.Slot(key.Key); ok {
			k.want = append(k.want, slot)
			k.wantKey = append(k.wantKey, i)
		}
	}
	k.inputs = k.key(w)
	return k, nil
}

// factor gives a factor with the user's values in place of the shipped ones.
func (k *reckoner) factor(id string) (params.Factor, bool, error) {
	return UserFactor(k.p, k.snap, id)
}

// UserFactor gives a factor with the user's values in place of the shipped ones; changed tells whether
// there are any. Settings are inventory.<row>.low, .central and .high.
func UserFactor(p *Params, snap *study.Snapshot, id string) (f params.Factor, changed bool, err error) {
	f, ok := p.Factor(snap, id)
	if !ok {
		return f, false, fmt.Errorf("no factor %q", id)
	}
	if id == croplandUse {
		zone := strings.ReplaceAll(snap.Text("climate.zone"), " ", "_")
		v, err := p.Soil.Lookup("land_use", "2019", zone, "cropland")
		if err != nil {
			return f, false, fmt.Errorf("climate.zone: %w", err)
		}
		f.Low, f.Central, f.High, f.Source, f.Provenance = v.Value, v.Value, v.Value, v.Source, v.Provenance
	}
	name := strings.ReplaceAll(id, ".", "-")
	for _, s := range []struct {
		level string
		to    *float64
	}{{"low", &f.Low}, {"central", &f.Central}, {"high", &f.High}} {
		if x, in := snap.Number("inventory." + name + "." + s.level); in {
			*s.to, changed = x, true
			if v, _, _ := snap.Lookup("inventory." + name + "." + s.level); v.Source != "" {
				f.Source = v.Source
			}
		}
	}
	if changed {
		f.Low, f.High = math.Min(f.Low, f.Central), math.Max(f.High, f.Central)
		if f.Low <= 0 && f.Dist == params.Lognormal {
			f.Dist = params.Triangular
		}
		f.Provenance = ""
	}
	return f, changed, f.Validate()
}

// demand gives the yearly use from the demand table, else the typed one.
func (w *world) demand() (mwh float64, source string, ok bool) {
	t, there := w.tables["demand"]
	if !there {
		return 0, "", false
	}
	rec := w.snap.LayersOf("demand")[0]
	if c := t.ColumnIndex(rec.Match["load"]); rec.Match["load"] != "" && c >= 0 {
		sum, n := 0.0, 0
		for _, f := range t.Features {
			if x, ok := f.Values[c].Float(); ok {
				if y, err := units.Convert(x, unitOr(rec.Units[rec.Match["load"]], "kW"), "kW"); err == nil {
					sum += y
					n++
				}
			}
		}
		if n == 0 {
			return 0, "", false
		}
		return sum / float64(n) * units.HoursPerYear / units.KWhPerMWh, rec.Name, true
	}
	if c := t.ColumnIndex(rec.Match["energy"]); rec.Match["energy"] != "" && c >= 0 {
		sum := 0.0
		for _, f := range t.Features {
			if x, ok := f.Values[c].Float(); ok {
				if y, err := units.Convert(x, unitOr(rec.Units[rec.Match["energy"]], "MWh/yr"), "MWh/yr"); err == nil {
					sum += y
				}
			}
		}
		return sum, rec.Name, sum > 0
	}
	return 0, "", false
}

// key writes what connection, facts and consequences of any candidate depend on besides its fit.
func (k *reckoner) key(w *world) string {
	h := newKey("candidate", candidateEdition)
	for _, l := range w.snap.Layers {
		if l.Role == "parcels" || l.Role == "wind_resource" || l.Role == "place_names" || l.Role == "backdrop" {
			continue
		}
		h.text(l.Name) // stands in the sources
		h.text(l.Role)
		h.text(l.Digest)
		h.text(fmt.Sprint(l.Complete))
		for _, f := range sortedNames(l.Match) {
			h.text(f)
			h.text(l.Match[f])
			h.text(l.Units[l.Match[f]])
		}
	}
	h.int(k.trials)
	h.int(int(k.seed))
	h.text(w.snap.Text(factorsEdition))
	for _, key := range w.snap.Keys() {
		for _, prefix := range []string{"climate.", "land.", "grid.", "energy.", "inventory.", "wind.", "solar.", "weather."} {
			if strings.HasPrefix(key, prefix) && key != "energy.primary_equivalent" { // it only draws what is there
				if s, _, in := w.snap.Lookup(key); in {
					h.text(key)
					h.text(s.Value)
					h.text(s.Reason)
				}
			}
		}
	}
	h.text(w.p.Digest)
	return h.sum()
}

func sortedNames[V any](m map[string]V) []string {
	out := make([]string, 0, len(m))
	for n := range m {
		out = append(out, n)
	}
	sort.Strings(out)
	return out
}

// candidate connects, measures and reckons one fitted site.
func (k *reckoner) candidate(e *overlay.Engine, w *world, around *pieces, fr *fitter, assets []asset, o option, s site, grounds map[string]groundResult, sets map[string]*ruleset, r fitResult) (*Candidate, error) {
	c := &Candidate{Site: s.id, Parcels: s.parcels, Plant: o.id, Technology: o.technology, Status: r.Status, Reason: r.Reason, Notices: []string{}, Incomplete: []string{}}
	main := windPart
	if !o.wind {
		main = solarPart
	}
	g := grounds[main]
	seen := map[string]bool{}
	for _, part := range o.parts() {
		for _, n := range append(slices.Clone(sets[part].incomplete), legalNotSet(w.snap, o)...) {
			if !seen[n] {
				seen[n] = true
				c.Incomplete = append(c.Incomplete, n)
			}
		}
		c.Notices = append(c.Notices, sets[part].notApplied...)
	}
	c.Taken, c.TakenSharedHa, c.ShapeHa = g.Taken, g.TakenSharedM2/units.M2PerHa, g.ShapeM2/units.M2PerHa
	f := facts{}
	f.num("gross_area_ha", g.GrossM2/units.M2PerHa, "parcels")
	f.num("buildable_area_ha", g.BuildableM2/units.M2PerHa, "parcels, rules")
	f.num("largest_patch_ha", g.LargestM2/units.M2PerHa, "parcels, rules")
	if c.Excepted = sets[main].excepted[s.id]; len(c.Excepted) > 0 {
		c.Notices = append(c.Notices, "rule_excepted")
	}
	defer c.bounds(g)
	if r.Status != Fitted {
		c.Notices = append(c.Notices, r.Notices...)
		for _, key := range k.keys {
			if v, ok := f[key.Key]; ok {
				c.Consequences = append(c.Consequences, scoring.Consequence{Key: key.Key, Account: key.Account, Unit: key.Unit, Low: v.v.X, Central: v.v.X, High: v.v.X, Median: v.v.X, Range: scoring.NoRange, Quality: "measured"})
			}
		}
		if r.Status == NoRoom {
			c.Miss = miss(g, sets[main])
			if err := c.tooTall(e, w, around, o, s, grounds, sets); err != nil {
				return nil, fmt.Errorf("site %s, option %s: %w", s.id, o.id, err)
			}
		}
		return c, nil
	}

	noted := map[string]bool{}
	tracks, habitat, err := w.measureFacts(e, around, o, s, g.Area, r, f, noted)
	if err != nil {
		return nil, fmt.Errorf("site %s, option %s: %w", s.id, o.id, err)
	}
	if o.wind && !sets[windPart].excepts(s.id, heightRule) {
		if c.Headroom, err = w.headroom(e, f["height_limit_m"].v, sets[windPart].tipM, false, s); err != nil {
			return nil, err
		}
	}
	fitFacts(o, r, f)
	f.set("existing_loss_mwh", fr.lostNearby(o, around, s, r), "wind yield")
	power, err := fr.byHours(o, s, r)
	if err != nil {
		return nil, err
	}
	l, err := w.connect(fr, o, s, r, power, assets)
	if err != nil {
		return nil, err
	}
	linkFacts(l, f)
	fr.matchFacts(power, r, l, f)
	c.Connection, c.Habitat = l.conn, habitat
	c.Chain = r.Chain
	for _, n := range r.Notices {
		noted[n] = true
	}
	c.Notices = append(c.Notices, sortedNames(noted)...)

	v := slices.Clone(k.central)
	for _, name := range k.p.facts {
		slot, _ := k.p.Graph.Slot(name)
		got, ok := f[name]
		if !ok {
			return nil, fmt.Errorf("site %s, option %s: nobody gave the fact %q", s.id, o.id, name)
		}
		v[slot] = got.v
	}
	k.cover(v)
	drawn := k.draws(s.id, r, v)
	k.p.Graph.Central(v)
	spreads, err := k.p.Graph.Trials(v, drawn, k.want)
	if err != nil {
		return nil, err
	}
	k.fill(c, v, spreads, k.leafNotices(r, l, tracks))
	for _, name := range k.p.facts {
		c.Facts = append(c.Facts, Leaf{Name: name, State: f[name].v.State, X: f[name].v.X, Why: f[name].v.Why, Source: f[name].source})
	}
	if c.Fit, err = w.fitView(r, tracks); err != nil {
		return nil, err
	}
	return c, nil
}

// tooTall says of a candidate without room which machine would fit under the height limits that take ground of it.
func (c *Candidate) tooTall(e *overlay.Engine, w *world, around *pieces, o option, s site, grounds map[string]groundResult, sets map[string]*ruleset) error {
	if !o.wind {
		return nil
	}
	most, high := 0.0, Taken{}
	for _, t := range grounds[windPart].Taken {
		most = math.Max(most, t.AloneHa+t.SharedHa)
		if t.Rule == heightRule {
			high = t
		}
	}
	if high.Rule == "" {
		return nil
	}
	allowed, err := w.heightAllowed(e, around, o, s)
	if err != nil {
		return err
	}
	if c.Headroom, err = w.headroom(e, allowed, sets[windPart].tipM, true, s); err != nil || c.Headroom == nil {
		return err
	}
	if c.Reason == "" && (high.TakesAll || high.AloneHa+high.SharedHa == most) {
		c.Reason = c.Headroom.words()
	}
	return nil
}

// bounds gives the buildable area the low and high that the position tolerance of the layers makes.
func (c *Candidate) bounds(g groundResult) {
	if !g.Tolerant {
		return
	}
	for i := range c.Consequences {
		if q := &c.Consequences[i]; q.Key == "buildable_area_ha" && q.State == scoring.Number {
			q.Low, q.High, q.Range = g.LeastM2/units.M2PerHa, g.MostM2/units.M2PerHa, scoring.LayerTolerance
		}
	}
}

// legalNotSet lists the legal limits that apply to an option and are not set.
func legalNotSet(snap *study.Snapshot, o option) []string {
	if !o.wind {
		return nil
	}
	var out []string
	for _, d := range snap.Catalog().Definitions {
		if d.Legal && strings.HasPrefix(d.Key, "limit.") {
			if s, _, in := snap.Lookup(d.Key); in && s.Value == study.NotSetText {
				out = append(out, d.Key)
			}
		}
	}
	return out
}

func miss(g groundResult, rs *ruleset) *Nearest {
	m := &Nearest{LargestPatchHa: g.LargestM2 / units.M2PerHa, BuildableHa: g.BuildableM2 / units.M2PerHa, NeedsPatchHa: rs.patchM2 / units.M2PerHa}
	for _, t := range g.Taken {
		if a := t.AloneHa + t.SharedHa; a > m.TakesHa {
			m.LargestTaker, m.TakesHa = t.Rule, a
		}
	}
	return m
}

// fitFacts gives the facts that follow from the fit.
func fitFacts(o option, r fitResult, f facts) {
	const fitted = "fit"
	energy := func(y yieldValue) scoring.Value {
		if y.Why != "" {
			return scoring.UnknownBecause(y.Why)
		}
		return scoring.Num(y.MWh)
	}
	n := float64(len(r.Turbines))
	f.num("wind_kw", r.WindKW, fitted)
	f.num("solar_kw", r.SolarKW, fitted)
	f.num("solar_ac_kw", r.SolarACKW, fitted)
	f.num("ac_kw", r.WindKW+r.SolarACKW, fitted)
	for name, technology := range map[string]string{"tracking_kw": "solar_tracking", "vertical_kw": "solar_vertical", "elevated_kw": "solar_agri"} {
		x := 0.0
		if o.technology == technology {
			x = r.SolarKW
		}
		f.num(name, x, fitted)
	}
	f.num("turbines", n, fitted)
	f.num("turbine_count", n, fitted)
	f.num("fence_ha", r.FenceHa, fitted)
	f.num("plant_ground_ha", r.TotalHa, fitted)
	f.set("wind_p50_mwh", energy(r.WindMWh), cmp.Or(r.WindSource, "wind yield"))
	f.set("solar_p50_mwh", energy(r.SolarMWh), cmp.Or(r.SunSource, "solar yield"))
	f.num("wind_yield_sigma", r.WindSigma, "root sum of squares")
	f.num("solar_yield_sigma", r.SolarSigma, "root sum of squares")
	f.num("wind_yield_sigma_shared", r.WindShared, "root sum of squares")
	f.num("wind_yield_sigma_own", r.WindOwn, "root sum of squares")
	f.num("solar_yield_sigma_shared", r.SolarShared, "root sum of squares")
	f.num("solar_yield_sigma_own", r.SolarOwn, "root sum of squares")
	f.num("wind_yield_error", 1, "even odds")
	f.num("solar_yield_error", 1, "even odds")
	f.set("wind_load_factor", loadFactor(r.WindMWh, r.WindKW), fitted)
	f.set("solar_load_factor", loadFactor(r.SolarMWh, r.SolarACKW), fitted)
	if n > 0 {
		f.set("wake_loss_frac", knownIf(r.WakeLoss, r.WindMWh.Why), "wind yield")
	} else {
		f.set("turbine_count", scoring.NoneBecause("no rotor"), fitted)
		f.set("wake_loss_frac", scoring.NoneBecause("no rotor"), fitted)
	}
	if r.SolarKW > 0 {
		f.set("performance_ratio_frac", knownIf(r.PR, r.SolarMWh.Why), "solar yield")
		f.set("crop_light_frac", knownIf(r.CropLight, r.SolarMWh.Why), "solar yield")
	} else {
		f.set("performance_ratio_frac", scoring.NoneBecause("no panels"), fitted)
		f.set("crop_light_frac", scoring.NoneBecause("no panels over the crop"), fitted)
	}
}

func knownIf(x float64, why string) scoring.Value {
	if why != "" {
		return scoring.UnknownBecause(why)
	}
	return scoring.Num(x)
}

func loadFactor(y yieldValue, kw float64) scoring.Value {
	switch {
	case y.Why != "":
		return scoring.UnknownBecause(y.Why)
	case kw == 0:
		return scoring.Num(0)
	}
	return scoring.Num(y.MWh * units.KWhPerMWh / (kw * units.HoursPerYear))
}

// linkFacts gives the facts that follow from the connection.
func linkFacts(l link, f facts) {
	names := []string{"connection_straight_km", "connection_route_km", "connection_route_loss_frac", "connection_route_rise_frac", "circuits_lv", "circuits_mv", "circuits_hv", "transformer_kva", "switchgear_count"}
	if !l.ok {
		for _, n := range append(names, "connection_spare_kw", "curtailed_share") {
			f.set(n, scoring.UnknownBecause(l.why), "")
		}
		return
	}
	src := l.conn.Asset
	f.num("connection_straight_km", l.conn.StraightKm, src)
	f.num("connection_route_km", l.best.RouteKm.Central, src)
	f.num("connection_route_loss_frac", l.best.LossFrac.Central, "conductor "+l.conn.Conductor)
	if l.energyWhy != "" {
		f.set("connection_route_loss_frac", scoring.UnknownBecause(l.energyWhy), "")
	}
	f.num("connection_route_rise_frac", l.best.RiseFrac, "conductor "+l.conn.Conductor)
	f.num("circuits_lv", l.circ[0], src)
	f.num("circuits_mv", l.circ[1], src)
	f.num("circuits_hv", l.circ[2], src)
	f.num("transformer_kva", l.kva, src)
	f.num("switchgear_count", l.gear, src)
	if l.asset.spare.Known {
		told := src
		if l.asset.toldBy != "" {
			told = strings.TrimSpace(src + ", told by " + l.asset.toldBy + " " + l.asset.toldOn)
		}
		f.num("connection_spare_kw", l.asset.spare.Value, told)
	} else {
		f.set("connection_spare_kw", scoring.UnknownBecause("spare_unknown"), src)
	}
	if l.shareK {
		f.num("curtailed_share", l.share, src)
	} else {
		f.set("curtailed_share", scoring.UnknownBecause("spare_unknown"), src)
	}
}

// stratify keeps the order of draws and spreads their values evenly: the k-th smallest of n becomes
// (k+½)/n (Latin hypercube sampling, McKay, Beckman & Conover 1979), so that percentiles of few trials are
// steady.
func stratify(u []float64) []float64 {
	at := make([]int, len(u))
	for i := range at {
		at[i] = i
	}
	sort.SliceStable(at, func(i, j int) bool { return u[at[i]] < u[at[j]] })
	out := make([]float64, len(u))
	for k, i := range at {
		out[i] = (float64(k) + 0.5) / float64(len(u))
	}
	return out
}

// siteDraws draws the yield errors of a site: normal around 1, cut at zero. Options of one technology on
// one site share their draw, because they share the wind or the sun; what errs alike on all sites is drawn once for
// them all.
func (k *reckoner) siteDraws(site string, r fitResult) []reckon.Drawn {
	var out []reckon.Drawn
	for _, d := range []struct {
		leaf        string
		shared, own float64
		on          bool
	}{{"wind_yield_error", r.WindShared, r.WindOwn, r.WindKW > 0}, {"solar_yield_error", r.SolarShared, r.SolarOwn, r.SolarKW > 0}} {
		if !d.on || d.shared == 0 && d.own == 0 {
			continue
		}
		slot, _ := k.p.Graph.Slot(d.leaf)
		v := make([]float64, k.trials)
		for t := range v {
			v[t] = 1
		}
		spread := func(sigma float64, draw func(trial int) float64) {
			if sigma == 0 {
				return
			}
			u := make([]float64, k.trials)
			for t := range u {
				u[t] = draw(t)
			}
			for t, x := range stratify(u) {
				v[t] += float64(sigma * math.Sqrt2 * math.Erfinv(2*x-1))
			}
		}
		spread(d.shared, func(t int) float64 { return params.Draw(k.seed, d.leaf+" of all sites", t) })
		spread(d.own, func(t int) float64 { return params.DrawSite(k.seed, site, d.leaf, t) })
		for t := range v {
			v[t] = math.Max(0, v[t])
		}
		out = append(out, reckon.Drawn{Slot: slot, Values: v})
	}
	return out
}

// turbineRows are what the inventory says of turbines, and sizeFactor the sizes of one machine that it stands for.
var turbineRows = []string{"wind_turbine.mj", "wind_turbine.kgco2e"}

const sizeFactor = "wind_inventory_size_kw"

// cover makes a row of the inventory unknown where the machines of a candidate are of a size that nothing cited
// covers. A row that the user entered covers what the user says.
func (k *reckoner) cover(v []scoring.Value) {
	at := func(name string) float64 {
		slot, _ := k.p.Graph.Slot(name)
		return v[slot].X
	}
	n := at("turbines")
	if n == 0 {
		return
	}
	one := at("wind_kw") / n
	const rounding = 1e-9
	if one >= k.size.Low*(1-rounding) && one <= k.size.High*(1+rounding) {
		return
	}
	for _, row := range turbineRows {
		if slot, ok := k.p.Graph.Slot(row); ok && !k.user[row] {
			v[slot] = scoring.UnknownBecause("inventory_size")
		}
	}
}

// draws gives what varies in the trials of a site: the factors that have a value there, and the errors of its yields.
func (k *reckoner) draws(site string, r fitResult, v []scoring.Value) []reckon.Drawn {
	out := make([]reckon.Drawn, 0, len(k.drawn)+2)
	for _, d := range k.drawn {
		if v[d.Slot].OK() {
			out = append(out, d)
		}
	}
	return append(out, k.siteDraws(site, r)...)
}

// leafNotices gives the notices that a leaf brings to every consequence that depends on it.
func (k *reckoner) leafNotices(r fitResult, l link, t laid) map[int][]string {
	out := maps.Clone(k.shipped)
	put := func(leaf string, codes ...string) {
		if slot, ok := k.p.Graph.Slot(leaf); ok {
			out[slot] = append(slices.Clip(out[slot]), codes...) // the notices of factors serve all candidates
		}
	}
	code := "tracks_rule"
	if t.km.OK() {
		code = "tracks_laid"
	}
	put("track_counted_km", code)
	put("track_km", code)
	put("detour_ratio", "route_straight")
	if l.ok && !l.asset.spare.Known {
		put("curtailed_share", "spare_unknown")
		put("connection_spare_kw", "spare_unknown")
	}
	if l.shareK && l.share > 0 {
		put("curtailed_share", "export_limited", map[bool]string{true: "curtailment_by_hours", false: "curtailment_bound"}[l.byHours])
	}
	for _, n := range r.Notices {
		if strings.HasPrefix(n, "horizon_") {
			put("solar_p50_mwh", n)
		} else {
			put("wind_p50_mwh", n)
		}
	}
	return out
}

// fill turns values and spreads into consequences, every key in its place.
func (k *reckoner) fill(c *Candidate, v []scoring.Value, spreads []reckon.Spread, notices map[int][]string) {
	spread := make([]int, len(k.keys))
	for i := range spread {
		spread[i] = -1
	}
	for i, at := range k.wantKey {
		spread[at] = i
	}
	for i, key := range k.keys {
		q := scoring.Consequence{Key: key.Key, Account: key.Account, Unit: key.Unit}
		if spread[i] < 0 {
			q.State = scoring.NotAssessed
			if reason, ok := noneFor(key, c.Technology); ok {
				q.State, q.Why = notHere(key), reason
			}
			c.Consequences = append(c.Consequences, q)
			continue
		}
		val := v[k.want[spread[i]]]
		q.State, q.Why = val.State, val.Why
		codes := map[string]bool{}
		reach := k.p.reaches[key.Key]
		for _, slot := range reach {
			for _, n := range notices[slot] {
				codes[n] = true
			}
		}
		if reason, ok := noneFor(key, c.Technology); ok && val.State != scoring.Number {
			q.State, q.Why = notHere(key), reason
		}
		if q.State == scoring.Number {
			q.Central, q.Low, q.High, q.Median, q.Range = val.X, val.X, val.X, val.X, scoring.NoRange
			if s := spreads[spread[i]]; s.Moves && s.Numbers > 0 {
				q.Low, q.High, q.Median, q.Range = s.Low, s.High, s.Median, scoring.P10P90
				if q.Central < q.Low || q.Central > q.High {
					// A factor whose likeliest value is an end of its range can do this.
					q.Low, q.High = math.Min(q.Low, q.Central), math.Max(q.High, q.Central)
					codes["central_outside"] = true
				}
				if s.Nevers > 0 {
					codes["may_never"] = true
				}
				if q.Central != 0 && math.Abs(q.Median/q.Central-1) > 0.02 {
					codes["median_differs"] = true
				}
			}
		}
		q.Quality = quality(codes, reach, k.p)
		q.Notices = sortedNames(codes)
		c.Consequences = append(c.Consequences, q)
	}
}

func quality(codes map[string]bool, reach []int, p *Params) string {
	switch {
	case codes["inventory_default"]:
		return "default inventory"
	case codes["memory_parameter"]:
		return "default, unverified"
	case len(reach) == 1 && p.Graph.Leaves()[reach[0]].Kind == scoring.FactLeaf:
		return "measured"
	}
	return "computed"
}

// notHere gives the state of a key that does not belong to a technology: none where there is no such
// effect, not assessed where the figure is merely not used.
func notHere(key KeyInfo) scoring.State {
	if strings.HasPrefix(key.NotApplicable, "none: ") {
		return scoring.None
	}
	return scoring.NotAssessed
}

// noneFor gives the reason why a key does not arise for a technology.
func noneFor(key KeyInfo, technology string) (string, bool) {
	hasWind, hasSun := technology == "wind" || technology == "wind_solar", technology != "wind"
	reason := strings.TrimPrefix(key.NotApplicable, "none: ")
	if i := strings.IndexAny(reason, ";("); i > 0 {
		reason = strings.TrimSpace(reason[:i])
	}
	switch {
	case key.Technologies == "wind" && !hasWind, key.Technologies == "solar" && !hasSun:
		if !strings.HasPrefix(key.NotApplicable, "none: ") {
			return "not used for this technology", true
		}
		return reason, true
	}
	return "", false
}

func (w *world) fitView(r fitResult, tracks laid) (*Fit, error) {
	f := &Fit{Mode: r.Mode, RatedKW: r.WindKW + r.SolarKW, WindKW: r.WindKW, SolarKW: r.SolarKW, ACKW: r.WindKW + r.SolarACKW, FencedHa: r.FenceHa, Modules: r.Modules, TiltDeg: r.TiltDeg, RowPitchM: r.PitchM, Layout: r.Layout, SpacingHa: r.SpacingHa, TrackKm: tracks.counted, TracksLaid: tracks.km.OK()}
	for _, p := range r.Turbines {
		ll, err := w.frame.Inverse(p)
		if err != nil {
			return nil, err
		}
		f.Turbines = append(f.Turbines, ll.Rounded())
	}
	panels, err := w.frame.Unproject(r.Fence)
	if err != nil {
		return nil, err
	}
	f.Panels = geo.Map(panels, geo.LonLat.Rounded)
	ways, err := w.frame.Unproject(tracks.ways)
	if err != nil {
		return nil, err
	}
	f.Tracks = geo.Map(ways, geo.LonLat.Rounded)
	return f, nil
}

// limit is a threshold that the user entered for a consequence.
type limit struct {
	x    float64
	more bool // more is better, so less than x breaks it
}

func limitsOf(snap *study.Snapshot, keys []KeyInfo) map[string]limit {
	out := map[string]limit{}
	for _, k := range keys {
		x, ok := snap.Number("limit." + k.Key)
		if !ok {
			continue
		}
		c, known := snap.Catalog().Criterion(k.Key)
		if !known {
			c, _ = snap.Catalog().Criterion(strings.TrimSuffix(k.Key, criteria.BurdenSuffix))
		}
		out[k.Key] = limit{x: x, more: c.Better == criteria.More}
	}
	return out
}

// overLimit lists the keys whose central value breaks a limit that the user entered.
func overLimit(limits map[string]limit, c *Candidate) []string {
	if len(limits) == 0 {
		return nil
	}
	var out []string
	for _, key := range sortedNames(limits) {
		l := limits[key]
		q, ok := c.Consequence(key)
		if !ok {
			continue
		}
		never := q.State == scoring.Never
		if q.State != scoring.Number && !never {
			continue
		}
		if never || l.more && q.Central < l.x || !l.more && q.Central > l.x {
			out = append(out, q.Key)
		}
	}
	return out
}
