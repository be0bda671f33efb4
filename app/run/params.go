package run

import (
	"fmt"
	"io/fs"
	"maps"
	"regexp"
	"slices"
	"sort"
	"strings"

	"groundtally/app/study"
	"groundtally/assets/citedtable"
	"groundtally/scoring"
	"groundtally/scoring/climate"
	"groundtally/scoring/criteria"
	"groundtally/scoring/energy"
	"groundtally/scoring/grid"
	"groundtally/scoring/land"
	"groundtally/scoring/params"
	"groundtally/scoring/reckon"
	"groundtally/scoring/solar"
	"groundtally/scoring/units"
	"groundtally/scoring/wind"
)

// Params is everything the program ships that takes part in results: cited factors, curves, tables,
// and the graph of quantities.
type Params struct {
	Factors  map[string]params.Factor // by leaf name, of the newest editions
	Dates    map[string]string        // parameter family to the date of its newest edition
	Turbines []wind.Turbine
	Wind     wind.Defaults
	Solar    *solar.Defaults

	roughness []roughClass
	Grid      *grid.Model
	Soil      *land.SoilTable
	Graph     *reckon.Graph
	Digest    string // of the shipped parameter files and keys; a new edition makes stored results stale

	older   []*edition // the oldest first
	keys    []criteria.Criterion
	facts   []string         // leaf names given by fitting, connecting and measuring
	reaches map[string][]int // key to the leaf slots it depends on
}

// families are the dated parameter tables that hold factors.
var families = []string{"land_defaults", "ghg_factors", "grid_defaults", "reckoning_defaults"}

// factLeaves are the leaves that app/run itself gives for every candidate.
var factLeaves = []scoring.Leaf{
	{Name: "gross_area_ha", Unit: "ha", Title: "Site area"},
	{Name: "buildable_area_ha", Unit: "ha", Title: "Buildable area"},
	{Name: "largest_patch_ha", Unit: "ha", Title: "Largest buildable patch"},
	{Name: "wind_kw", Unit: "kW", Title: "Rated power of the turbines"},
	{Name: "solar_kw", Unit: "kW", Title: "Direct-current power of the panels"},
	{Name: "solar_ac_kw", Unit: "kW", Title: "Power of the inverters"},
	{Name: "ac_kw", Unit: "kW", Title: "Power at the plant's terminals"},
	{Name: "tracking_kw", Unit: "kW", Title: "Panel power on trackers"},
	{Name: "vertical_kw", Unit: "kW", Title: "Panel power in vertical rows"},
	{Name: "elevated_kw", Unit: "kW", Title: "Panel power raised over crops"},
	{Name: "turbines", Unit: "1", Title: "Number of turbines, none counted as zero"},
	{Name: "turbine_count", Unit: "1", Title: "Number of turbines"},
	{Name: "track_km", Unit: "km", Title: "New track"},
	{Name: "track_counted_km", Unit: "km", Title: "New track that is counted, by a rule of thumb where no roads are known"},
	{Name: "fence_ha", Unit: "ha", Title: "Ground inside the solar fence"},
	{Name: "plant_ground_ha", Unit: "ha", Title: "Spacing ellipses inside the site, and the fence"},
	{Name: "fence_grass_ha", Unit: "ha", Title: "Fenced ground that is not ploughed"},
	{Name: "fence_arable_ha", Unit: "ha", Title: "Fenced ground that is ploughed"},
	{Name: "wind_p50_mwh", Unit: "MWh/yr", Title: "Wind energy of the first year, even odds"},
	{Name: "solar_p50_mwh", Unit: "MWh/yr", Title: "Solar energy of the first year, even odds"},
	{Name: "wind_yield_sigma", Unit: "1", Title: "Standard deviation of the wind energy"},
	{Name: "solar_yield_sigma", Unit: "1", Title: "Standard deviation of the solar energy"},
	{Name: "wind_yield_sigma_shared", Unit: "1", Title: "Standard deviation of the long-term wind energy, alike on all sites"},
	{Name: "wind_yield_sigma_own", Unit: "1", Title: "Standard deviation of the long-term wind energy of the site alone"},
	{Name: "solar_yield_sigma_shared", Unit: "1", Title: "Standard deviation of the long-term solar energy, alike on all sites"},
	{Name: "solar_yield_sigma_own", Unit: "1", Title: "Standard deviation of the long-term solar energy of the site alone"},
	{Name: "wind_yield_error", Unit: "1", Title: "Error of the wind yield, even odds 1"},
	{Name: "solar_yield_error", Unit: "1", Title: "Error of the solar yield, even odds 1"},
	{Name: "wind_load_factor", Unit: "1", Title: "Load factor of the wind part"},
	{Name: "solar_load_factor", Unit: "1", Title: "Load factor of the solar part"},
	{Name: "existing_loss_mwh", Unit: "MWh/yr", Title: "Energy that existing and permitted turbines lose to the new ones"},
	{Name: "wake_loss_frac", Unit: "1", Title: "Loss by wakes"},
	{Name: "performance_ratio_frac", Unit: "1", Title: "Solar performance ratio"},
	{Name: "crop_light_frac", Unit: "1", Title: "Light left for crops"},
	{Name: "nearest_dwelling_m", Unit: "m", Title: "Distance to nearest dwelling"},
	{Name: "heritage_m", Unit: "m", Title: "Distance to heritage"},
	{Name: "sensitive_m", Unit: "m", Title: "Distance to sensitive place"},
	{Name: "height_limit_m", Unit: "m", Title: "Height that the mapped limits allow"},
	{Name: "road_m", Unit: "m", Title: "Distance to a road"},
	{Name: "habitat_ha", Unit: "ha", Title: "Habitat touched"},
	{Name: "habitat_irreplaceable_ha", Unit: "ha", Title: "Irreplaceable habitat touched"},
	{Name: "habitat_fragments", Unit: "1", Title: "Habitat pieces added"},
	{Name: "forest_ha", Unit: "ha", Title: "Forest cleared"},
	{Name: "flood_ha", Unit: "ha", Title: "Ground that floods"},
	{Name: "water_protection_ha", Unit: "ha", Title: "Water protection area touched"},
	{Name: "sensitive_ha", Unit: "ha", Title: "Sensitive ground touched"},
	{Name: "farmland_quality_ha", Unit: "ha", Title: "Farmland, weighted by quality"},
	{Name: "farmland_lost_ha", Unit: "ha", Title: "Farmland out of use"},
	{Name: "soil_stock_tc_per_ha", Unit: "t C/ha", Title: "Soil carbon under the plant's ground"},
	{Name: "soil_by_class", Unit: "1", Title: "Whether soil carbon goes by soil class, as the layer gives no stock"},
	{Name: "peat_ha", Unit: "ha", Title: "Peat touched"},
	{Name: "peat_share", Unit: "1", Title: "Share of the plant's ground on peat"},
	{Name: "peat_depth_m", Unit: "m", Title: "Mean depth of the peat touched"},
	{Name: "connection_straight_km", Unit: "km", Title: "Straight distance to grid"},
	{Name: "connection_route_km", Unit: "km", Title: "Length of the connection at the central detour"},
	{Name: "connection_route_loss_frac", Unit: "1", Title: "Loss in the connection at the central detour"},
	{Name: "connection_route_rise_frac", Unit: "1", Title: "Voltage rise at the central detour"},
	{Name: "connection_spare_kw", Unit: "kW", Title: "Spare capacity at connection"},
	{Name: "used_at_once_share", Unit: "1", Title: "Share of the delivered energy that the district uses in the very hour"},
	{Name: "curtailed_share", Unit: "1", Title: "Share of the energy above what may flow"},
	{Name: "circuits_lv", Unit: "1", Title: "Low-voltage circuits"},
	{Name: "circuits_mv", Unit: "1", Title: "Medium-voltage circuits"},
	{Name: "circuits_hv", Unit: "1", Title: "High-voltage circuits"},
	{Name: "transformer_kva", Unit: "kVA", Title: "New transformers"},
	{Name: "switchgear_count", Unit: "1", Title: "New switchgear"},
}

// settingLeaves are the leaves that are settings, by leaf name.
var settingLeaves = []struct{ leaf, setting, unit, title string }{
	{"grid_factor_g_per_kwh", "climate.grid_factor_g_per_kwh", "g CO2e/kWh", "Greenhouse gas of the power displaced"},
	{"displacement_share", "climate.displacement_share", "1", "Share of the energy that displaces"},
	{"grid_decline_per_yr", "climate.grid_decline_per_yr", "1/yr", "Yearly decline of the grid factor"},
	{"household_mwh_per_yr", "energy.household_mwh_per_yr", "MWh/yr", "Yearly use of a household"},
	{"agreed_limit_kw", "grid.export_limit_kw", "kW", "Agreed export limit"},
	{"unsold_share", "energy.unsold_surplus_share", "1", "Share of the surplus that nobody takes"},
	{"demand_mwh_per_yr", "energy.demand_mwh_per_yr", "MWh/yr", "Yearly use of the district"},
}

// windWorks are the wind defaults that take part as factors.
var windWorks = []string{"crane_pad_m2", "foundation_m2", "laydown_m2", "compound_m2", "track_width_m", "long_run_bias_frac"}

// Quantities is the list of families, one line each.
func Quantities() []scoring.Quantity {
	var qs []scoring.Quantity
	qs = append(qs, energy.Quantities()...)
	qs = append(qs, land.Quantities()...)
	qs = append(qs, climate.Quantities()...)
	qs = append(qs, grid.Quantities()...)
	qs = append(qs, wind.Quantities()...)
	return qs
}

// LoadParams reads the shipped parameters and builds the graph.
func LoadParams(fsys fs.FS, cat *study.Catalog) (*Params, error) {
	p := &Params{Factors: map[string]params.Factor{}, keys: cat.Criteria}
	var err error
	if p.Digest, err = fileDigest(fsys); err != nil {
		return nil, err
	}
	shipped, err := editionAt(fsys, "")
	if err != nil {
		return nil, err
	}
	p.Dates = shipped.dates
	if p.older, err = olderEditions(fsys); err != nil {
		return nil, err
	}
	var leaves []scoring.Leaf
	add := func(f params.Factor) error {
		if _, dup := p.Factors[f.ID]; dup {
			return fmt.Errorf("factor %q stands in two tables", f.ID)
		}
		p.Factors[f.ID] = f
		leaves = append(leaves, scoring.Leaf{Name: f.ID, Unit: f.Unit, Title: strings.ReplaceAll(f.ID, "_", " "), Kind: scoring.FactorLeaf})
		return nil
	}
	for _, f := range shipped.list {
		if err := add(f); err != nil {
			return nil, err
		}
	}
	table := func(name string) (*citedtable.Table, error) { return citedtable.ParseFS(fsys, "params/"+name) }
	var curves, facts, t *citedtable.Table
	if curves, err = table("turbine_curves.csv"); err == nil {
		if facts, err = table("turbines.csv"); err == nil {
			p.Turbines, err = wind.ParseTurbines(curves, facts)
		}
	}
	if err != nil {
		return nil, err
	}
	if t, err = table("wind_defaults.csv"); err == nil {
		p.Wind, err = wind.ParseDefaults(t)
	}
	if err != nil {
		return nil, err
	}
	for _, name := range windWorks {
		d, err := p.Wind.Get(name)
		if err != nil {
			return nil, err
		}
		f := params.Factor{ID: name, Unit: d.Unit, Low: d.Low, Central: d.Central, High: d.High, Dist: params.Triangular, Group: "wind_" + name, Source: d.Source, Provenance: d.Provenance}
		if f.Low == f.High {
			f.Dist = params.Fixed
		}
		if err := add(f); err != nil {
			return nil, err
		}
	}
	if t, err = table("roughness.csv"); err == nil {
		p.roughness, err = roughnessOf(t)
	}
	if err != nil {
		return nil, err
	}
	if t, err = table("solar_defaults.csv"); err == nil {
		p.Solar, err = solar.ParseDefaults(t)
	}
	if err != nil {
		return nil, err
	}
	if t, err = params.OpenTable(fsys, "params", "soil", ""); err == nil {
		p.Soil, err = land.ParseSoil(t)
	}
	if err != nil {
		return nil, err
	}
	use, err := p.Soil.Lookup("land_use", "2019", "cool_temperate_moist", "cropland")
	if err != nil {
		return nil, err
	}
	if err := add(params.Factor{ID: croplandUse, Unit: "1", Low: use.Value, Central: use.Value, High: use.Value, Dist: params.Fixed, Source: use.Source, Provenance: use.Provenance}); err != nil {
		return nil, err
	}
	if p.Grid, err = gridModel(fsys); err != nil {
		return nil, err
	}
	for _, l := range factLeaves {
		l.Kind = scoring.FactLeaf
		leaves = append(leaves, l)
		p.facts = append(p.facts, l.Name)
	}
	for _, s := range settingLeaves {
		leaves = append(leaves, scoring.Leaf{Name: s.leaf, Unit: s.unit, Title: s.title, Kind: scoring.SettingLeaf})
	}
	qs := Quantities()
	qs = append(qs, burdens(cat.Criteria, leaves, qs)...)
	if p.Graph, err = reckon.New(leaves, qs); err != nil {
		return nil, fmt.Errorf("graph of quantities: %w", err)
	}
	p.reaches = map[string][]int{}
	for _, k := range p.Keys() {
		p.reaches[k.Key] = p.Graph.Reaches(k.Key)
	}
	return p, nil
}

// edition is the state of the dated tables of factors at a date.
type edition struct {
	date    string
	list    []params.Factor          // in the order of the tables
	factors map[string]params.Factor // the same by id
	dates   map[string]string        // by family
}

// inventoryFamily is the dated table whose rows count in energy and in greenhouse gas.
const inventoryFamily = "inventory"

// editionAt reads the newest editions that are no younger than a date; an empty date takes the newest of all. A family
// that is younger as a whole is left out.
func editionAt(fsys fs.FS, date string) (*edition, error) {
	e := &edition{date: date, factors: map[string]params.Factor{}, dates: map[string]string{}}
	for _, family := range append([]string{inventoryFamily}, families...) {
		dates, err := params.Dates(fsys, "params", family)
		if err != nil {
			return nil, err
		}
		at := ""
		for _, d := range dates {
			if date == "" || d <= date {
				at = d
			}
		}
		switch {
		case at == "" && date == "":
			return nil, fmt.Errorf("there is no table of the family %q", family)
		case at == "":
			continue
		}
		t, err := params.OpenTable(fsys, "params", family, at)
		if err != nil {
			return nil, err
		}
		e.dates[family] = at
		if family == inventoryFamily {
			inventory, err := params.ParseInventory(t)
			if err != nil {
				return nil, err
			}
			for _, it := range inventory.Items {
				e.list = append(e.list, it.Energy, it.Climate)
			}
			continue
		}
		parsed, err := params.ParseEdition(t)
		if err != nil {
			return nil, err
		}
		for _, f := range parsed.Factors {
			if f.ID != "connection_loss_frac" { // a default for plants without a connection; here the connection is computed
				e.list = append(e.list, f)
			}
		}
	}
	for _, f := range e.list {
		e.factors[f.ID] = f
	}
	return e, nil
}

// olderEditions reads every state of the dated tables before the newest, so that what was computed with one can be
// computed again.
func olderEditions(fsys fs.FS) ([]*edition, error) {
	var all []string
	for _, family := range append([]string{inventoryFamily}, families...) {
		dates, err := params.Dates(fsys, "params", family)
		if err != nil {
			return nil, err
		}
		all = append(all, dates...)
	}
	slices.Sort(all)
	all = slices.Compact(all)
	var out []*edition
	for _, date := range all[:max(0, len(all)-1)] {
		e, err := editionAt(fsys, date)
		if err != nil {
			return nil, err
		}
		out = append(out, e)
	}
	return out, nil
}

// factorsEdition is the setting that holds a study to an older edition of the cited factors.
const factorsEdition = "run.factors_edition"

// EditionDates lists the editions that a study can be held to, the oldest first; the last is the newest.
func (p *Params) EditionDates() []string {
	var out []string
	for _, e := range p.older {
		out = append(out, e.date)
	}
	newest := ""
	for _, d := range p.Dates {
		newest = max(newest, d)
	}
	return append(out, newest)
}

// heldTo gives the older edition that a study is held to; nil for the newest.
func (p *Params) heldTo(snap *study.Snapshot) *edition {
	if len(p.older) == 0 {
		return nil
	}
	date := snap.Text(factorsEdition)
	for _, e := range p.older {
		if e.date == date {
			return e
		}
	}
	return nil
}

// Factor gives a factor as shipped, in the edition that a study is held to. What that does not have yet is of the newest.
func (p *Params) Factor(snap *study.Snapshot, id string) (params.Factor, bool) {
	if e := p.heldTo(snap); e != nil {
		if f, ok := e.factors[id]; ok {
			return f, true
		}
	}
	f, ok := p.Factors[id]
	return f, ok
}

// DatesOf gives the dates of the editions in force for a study, by family.
func (p *Params) DatesOf(snap *study.Snapshot) map[string]string {
	e := p.heldTo(snap)
	if e == nil {
		return p.Dates
	}
	out := maps.Clone(p.Dates)
	maps.Copy(out, e.dates)
	return out
}

// fileDigest gives the digest of all shipped parameter files and of the keys with their anchors. The
// definitions of settings do not belong to it: their values are inputs of their own.
func fileDigest(fsys fs.FS) (string, error) {
	entries, err := fs.ReadDir(fsys, "params")
	if err != nil {
		return "", err
	}
	k := newKey("parameter files", 1)
	names := []string{"words/keys.csv"}
	for _, e := range entries { // sorted by name
		if e.Name() != "settings.csv" {
			names = append(names, "params/"+e.Name())
		}
	}
	for _, n := range names {
		b, err := fs.ReadFile(fsys, n)
		if err != nil {
			return "", err
		}
		k.text(n)
		k.text(string(b))
	}
	return k.sum(), nil
}

func gridModel(fsys fs.FS) (*grid.Model, error) {
	open := func(family string) (*citedtable.Table, error) { return params.OpenTable(fsys, "params", family, "") }
	t, err := open("grid_defaults")
	if err != nil {
		return nil, err
	}
	defaults, err := params.ParseEdition(t)
	if err != nil {
		return nil, err
	}
	if t, err = open("conductors"); err != nil {
		return nil, err
	}
	conductors, err := grid.ParseConductors(t)
	if err != nil {
		return nil, err
	}
	if t, err = open("transformers"); err != nil {
		return nil, err
	}
	transformers, err := grid.ParseTransformers(t)
	if err != nil {
		return nil, err
	}
	return grid.NewModel(defaults, conductors, transformers)
}

// croplandUse is the factor that follows the study's climate zone.
const croplandUse = "cropland_use_factor"

// burdens adds, for every key that is a burden, its quotient by the energy.
func burdens(keys []criteria.Criterion, leaves []scoring.Leaf, qs []scoring.Quantity) []scoring.Quantity {
	there := map[string]bool{}
	for _, l := range leaves {
		there[l.Name] = true
	}
	for _, q := range qs {
		there[q.Name] = true
	}
	var out []scoring.Quantity
	for _, k := range keys {
		name := k.Key + criteria.BurdenSuffix
		if !k.Burden || !there[k.Key] || there[name] {
			continue
		}
		in, per, word := "delivered_mwh_per_yr", units.MWhPerGWh, "(GWh/yr)"
		if k.PerLife() {
			in, per, word = "delivered_mj_life", units.MJPerGWh, "GWh"
		}
		out = append(out, scoring.Quantity{Name: name, Unit: k.Unit + "/" + word, Title: k.Title + " per GWh", Formula: k.Key + " / " + in, Source: "identity", Inputs: []string{k.Key, in},
			Eval: scoring.Plain(func(x []float64) float64 { return x[0] * per / x[1] })})
	}
	return out
}

// KeyInfo is a consequence key as it is shown: its criterion, or a burden's quotient.
type KeyInfo struct {
	Key, Title, Sentence, Unit string
	Account                    scoring.Account
	Technologies               string
	NotApplicable              string
	Derived                    bool // a quotient that has no row of its own
}

// Keys lists the consequence keys in the order of the vocabulary, each burden followed by its quotient.
func (p *Params) Keys() []KeyInfo {
	listed := map[string]bool{}
	for _, c := range p.keys {
		listed[c.Key] = true
	}
	var out []KeyInfo
	for _, c := range p.keys {
		out = append(out, KeyInfo{Key: c.Key, Title: c.Title, Sentence: c.Sentence, Unit: c.Unit, Account: c.Account, Technologies: c.Technologies, NotApplicable: c.NotApplicable})
		name := c.Key + criteria.BurdenSuffix
		if q, ok := p.Graph.Quantity(name); ok && c.Burden && !listed[name] {
			out = append(out, KeyInfo{Key: name, Title: q.Title, Sentence: c.Sentence, Unit: q.Unit, Account: c.Account, Technologies: c.Technologies, NotApplicable: c.NotApplicable, Derived: true})
		}
	}
	return out
}

// Memory lists the leaves that rest on a value from memory, sorted.
func (p *Params) Memory() []string {
	var out []string
	for id, f := range p.Factors {
		if f.Provenance == citedtable.Memory {
			out = append(out, id)
		}
	}
	sort.Strings(out)
	return out
}

// keyInText is the form of a consequence key within a sentence.
var keyInText = regexp.MustCompile(`[a-z0-9]+(_[a-z0-9]+)+`)

// Titled gives a function that puts the titles of consequences in place of their keys.
func (p *Params) Titled() func(text string) string {
	titles := map[string]string{}
	for _, k := range p.Keys() {
		titles[k.Key] = k.Title
	}
	return func(text string) string {
		return keyInText.ReplaceAllStringFunc(text, func(key string) string {
			if title := titles[key]; title != "" {
				return "'" + title + "'"
			}
			return key
		})
	}
}
