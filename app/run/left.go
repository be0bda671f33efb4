package run

import (
	"cmp"
	"context"
	"fmt"
	"maps"
	"math"
	"runtime"
	"slices"

	"groundtally/app/study"
	"groundtally/geo"
	"groundtally/geo/measure"
	"groundtally/geo/overlay"
	"groundtally/geo/terrain"
	"groundtally/scoring"
	"groundtally/scoring/units"
)

// Left is the land that the rules of a plant option leave in the whole district, parcels aside.
type Left struct {
	Plant      string   `json:"plant"`
	Part       string   `json:"part,omitempty"` // of a plant of both: wind or solar
	Hull       bool     `json:"hull,omitempty"` // there is no district boundary: the hull of the parcels stands for it
	DistrictHa float64  `json:"district_ha"`
	LeftHa     float64  `json:"left_ha"` // in zones
	Rules      []Taken  `json:"rules"`   // what takes most first
	SharedHa   float64  `json:"taken_shared_ha"`
	ShapeHa    float64  `json:"shape_ha"` // too narrow or too small
	Incomplete []string `json:"incomplete"`
	Zones      []Zone   `json:"zones"` // the largest first
}

// Zone is a connected piece of land that is left.
type Zone struct {
	Ha      float64            `json:"ha"`
	Centre  geo.LonLat         `json:"centre"`
	Outline geo.LonLatGeometry `json:"-"`
}

// Step is the land left at one value of a rule, with what follows for the candidates.
type Step struct {
	Value float64 `json:"value"`
	Left
	Fitted      int               `json:"fitted"` // candidates of the plant option
	EnergyMWh   float64           `json:"energy_mwh_per_yr"`
	EnergyKnown int               `json:"energy_known"` // candidates whose energy is in the sum
	First       map[string]string `json:"first"`        // place by voice
	Unready     []string          `json:"unready,omitempty"`
}

// dustM2 is an area that is none in a district: a hundredth of a square metre.
const dustM2 = 0.01

// tileM is the side of the squares that a district is worked in.
const tileM = 2000

// LandLeft finds the land left in the district for every part of a plant option. The distance from a site's
// own boundary plays no part: it belongs to parcels.
func (e *Engine) LandLeft(ctx context.Context, snap *study.Snapshot, plant string) ([]Left, error) {
	d, err := e.district(ctx, snap)
	if err != nil {
		return nil, err
	}
	lists, err := d.left(ctx, plant, []*study.Snapshot{snap})
	if err != nil {
		return nil, err
	}
	return lists[0], nil
}

// Sweep finds the land left at each value of one setting, all else as it is, for the first part of a plant
// option that the setting bears on, and computes the candidates at each. What takes no part in the change is
// reckoned once. Candidates that were computed before are taken from the engine's cache; nothing is kept there.
func (e *Engine) Sweep(ctx context.Context, snap *study.Snapshot, plant, key string, values []float64, each func(Step) error) error {
	states := make([]*study.Snapshot, len(values))
	for i, v := range values {
		var err error
		if states[i], err = snap.With(key, v); err != nil {
			return err
		}
	}
	d, err := e.district(ctx, snap)
	if err != nil {
		return err
	}
	lists, err := d.left(ctx, plant, states)
	if err != nil {
		return err
	}
	part := 0 // the part that changes
	for i := range lists[0] {
		for _, l := range lists[1:] {
			if l[i].LeftHa != lists[0][i].LeftHa {
				part = i
			}
		}
	}
	look := *e
	look.Progress = nil
	if e.Cache != nil {
		look.Cache = &lookingOn{below: e.Cache}
	}
	for i, v := range values {
		st := Step{Value: v, Left: lists[i][part], First: map[string]string{}}
		r, err := look.Compute(ctx, states[i])
		if err != nil {
			return err
		}
		for n := range r.Candidates {
			c := &r.Candidates[n]
			if c.Plant != plant || c.Status != Fitted {
				continue
			}
			st.Fitted++
			if q, ok := c.Consequence("delivered_mwh_per_yr"); ok && q.State == scoring.Number {
				st.EnergyMWh += q.Central
				st.EnergyKnown++
			}
		}
		for _, o := range r.Voices {
			if len(o.Order) > 0 {
				st.First[o.Voice] = o.Order[0].Site
				if o.Order[0].Plant != "" {
					st.First[o.Voice] += "/" + o.Order[0].Plant
				}
			}
		}
		st.Unready = slices.Sorted(maps.Keys(r.Unready))
		if err := each(st); err != nil {
			return err
		}
	}
	return nil
}

// lookingOn reads another cache and keeps what is new in memory.
type lookingOn struct {
	below Cache
	own   Memory
}

func (c *lookingOn) Results(ctx context.Context, step string, digests []string) (map[string][]byte, error) {
	out, err := c.own.Results(ctx, step, digests)
	if err != nil {
		return nil, err
	}
	var rest []string
	for _, d := range digests {
		if _, there := out[d]; !there {
			rest = append(rest, d)
		}
	}
	have, err := c.below.Results(ctx, step, rest)
	maps.Copy(out, have)
	return out, err
}

func (c *lookingOn) PutResults(ctx context.Context, add []study.Result, _ map[string]map[string]bool) error {
	return c.own.PutResults(ctx, add, nil)
}

// district is a study made ready for work on the whole district.
type district struct {
	e       *Engine
	w       *world
	cores   int
	outline geo.XYGeometry
	hull    bool
	tiles   []geo.Extent
}

func (e *Engine) district(ctx context.Context, snap *study.Snapshot) (*district, error) {
	w, err := newWorld(ctx, snap, e.Params, e.Load)
	if err != nil {
		return nil, err
	}
	d := &district{e: e, w: w, cores: e.Cores}
	if d.cores <= 0 {
		d.cores = runtime.NumCPU()
	}
	engine := overlay.New()
	defer closeEngine(engine)
	var parts []geo.XYGeometry
	for _, l := range w.byRole["district"] {
		for _, g := range l.xy {
			if g.Kind == geo.Polygons {
				parts = append(parts, g)
			}
		}
	}
	if len(parts) == 0 {
		d.hull = true
		var all []geo.XY
		for _, s := range w.sites {
			s.geom.Each(func(p geo.XY) { all = append(all, p) })
		}
		parts = []geo.XYGeometry{measure.ConvexHull(all)}
	}
	if d.outline, err = engine.Union(parts...); err != nil {
		return nil, fmt.Errorf("district: %w", err)
	}
	d.tiles = overlay.Tiles(geo.ExtentOf(d.outline), tileM)
	// The heights may be asked for anywhere in the district.
	if w.terrain != nil {
		w.terrain.reach = geo.ExtentOf(d.outline)
	}
	return d, nil
}

// tileRules are the rules of one part of an option in one state, ready for every tile.
type tileRules struct {
	rs      *ruleset
	heights *widened
}

// left finds what the rules of the states leave. A tile is worked in all states one after the other, so that
// what a rule takes there is found once for all states in which the rule is the same.
func (d *district) left(ctx context.Context, plant string, states []*study.Snapshot) ([][]Left, error) {
	var parts []string
	sets := make([][]tileRules, len(states)) // by state, part
	made := map[string]*widened{}
	prep := overlay.New()
	defer closeEngine(prep)
	for i, snap := range states {
		w := *d.w
		w.snap, w.options = snap, nil
		if err := w.makeOptions(); err != nil {
			return nil, err
		}
		at := slices.IndexFunc(w.options, func(o option) bool { return o.id == plant })
		if at < 0 {
			return nil, fmt.Errorf("plant option %q: %w", plant, study.ErrNotThere)
		}
		o := w.options[at]
		parts = o.parts()
		for _, part := range parts {
			rs, err := w.rulesFor(o, part)
			if err != nil {
				return nil, err
			}
			rs.tolerant, rs.excepted = false, nil
			if err := rs.prepare(ctx, prep, d.cores, made); err != nil {
				return nil, err
			}
			t := tileRules{rs: rs}
			if t.heights, err = d.tooHigh(prep, rs); err != nil {
				return nil, err
			}
			sets[i] = append(sets[i], t)
		}
	}
	type tileResult struct {
		grossM2, sharedM2 float64
		rules             map[string][3]float64 // alone, shared, share of tiles taken whole
		left              geo.XYGeometry
	}
	found := make([][]tileResult, len(d.tiles)) // by tile, then state and part
	n := len(states) * len(parts)
	var report func(int)
	if d.e.Progress != nil {
		report = func(done int) { d.e.Progress("tiles", done, len(d.tiles)) }
	}
	err := forEach(ctx, d.cores, len(d.tiles), openEngine, closeEngine, func(e *overlay.Engine, i int) error {
		found[i] = make([]tileResult, n)
		for k := range n {
			in, err := d.tile(e, d.tiles[i], sets[k/len(parts)][k%len(parts)])
			if err != nil {
				return err
			}
			out, err := e.LandLeft(in)
			if err != nil {
				return fmt.Errorf("district, tile at %.0f, %.0f: %w", d.tiles[i].MinX, d.tiles[i].MinY, err)
			}
			r := &found[i][k]
			r.grossM2, r.sharedM2, r.left = out.GrossM2, out.TakenSharedM2, out.Buildable
			r.rules = make(map[string][3]float64, len(out.Rules))
			for _, t := range out.Rules {
				r.rules[t.Name] = [3]float64{t.AloneM2, t.SharedM2}
			}
		}
		return nil
	}, report)
	if err != nil {
		return nil, err
	}
	out := make([][]Left, len(states))
	for k := range n {
		t := sets[k/len(parts)][k%len(parts)]
		l := Left{Plant: plant, Hull: d.hull, Incomplete: orEmpty(t.rs.incomplete), Rules: []Taken{}, Zones: []Zone{}}
		if len(parts) > 1 {
			l.Part = parts[k%len(parts)]
		}
		var pieces []geo.XYGeometry
		taken := map[string][2]float64{}
		leftM2 := 0.0
		for i := range found {
			r := &found[i][k]
			l.DistrictHa += r.grossM2 / units.M2PerHa
			l.SharedHa += r.sharedM2 / units.M2PerHa
			for _, name := range sortedNames(r.rules) {
				x := r.rules[name]
				taken[name] = [2]float64{taken[name][0] + x[0], taken[name][1] + x[1]}
			}
			leftM2 += measure.AreaM2(r.left)
			pieces = append(pieces, r.left)
		}
		for _, name := range sortedNames(taken) {
			x := taken[name]
			if x[0] < dustM2 { // what rounding leaves where two rules end on one line
				x[1] += x[0]
				x[0] = 0
			}
			l.Rules = append(l.Rules, Taken{Rule: name, AloneHa: x[0] / units.M2PerHa, SharedHa: x[1] / units.M2PerHa})
		}
		slices.SortStableFunc(l.Rules, func(a, b Taken) int { return cmp.Compare(b.AloneHa+b.SharedHa, a.AloneHa+a.SharedHa) })
		zones, err := prep.Zones(pieces, t.rs.widthM, t.rs.patchM2)
		if err != nil {
			return nil, err
		}
		for _, z := range zones {
			one := Zone{Ha: measure.AreaM2(z) / units.M2PerHa}
			if one.Outline, err = d.w.frame.Unproject(z); err != nil {
				return nil, err
			}
			if p, ok := measure.InteriorPoint(z.Parts[0]); ok {
				if one.Centre, err = d.w.frame.Inverse(p); err != nil {
					return nil, err
				}
			}
			l.Zones = append(l.Zones, one)
			l.LeftHa += one.Ha
		}
		slices.SortStableFunc(l.Zones, func(a, b Zone) int { return cmp.Compare(b.Ha, a.Ha) })
		l.ShapeHa = math.Max(0, leftM2/units.M2PerHa-l.LeftHa)
		out[k/len(parts)] = append(out[k/len(parts)], l)
	}
	return out, nil
}

// tile gives the rules in one tile.
func (d *district) tile(e *overlay.Engine, tile geo.Extent, t tileRules) (overlay.TileInput, error) {
	in := overlay.TileInput{Tile: tile, District: d.outline}
	add := func(r overlay.Rule) {
		if len(r.Features) > 0 {
			in.Rules = append(in.Rules, r)
		}
	}
	for _, r := range t.rs.rules {
		if r.boundary {
			continue
		}
		add(r.on(tile, asDrawn))
	}
	if t.heights != nil {
		add(t.heights.Rule(heightRule, tile))
	}
	ground := func(name string, find func(*terrain.Grid) (geo.XYGeometry, error)) error {
		g, err := d.w.terrain.get()
		if err != nil {
			return err
		}
		cells, err := find(g)
		if err == nil && !cells.Empty() {
			add(overlay.Rule{Name: name, Features: []geo.XYGeometry{cells}})
		}
		return err
	}
	if limit := t.rs.slopeDeg; limit > 0 {
		if err := ground(slopeRule, func(g *terrain.Grid) (geo.XYGeometry, error) { return g.Steep(tile, limit) }); err != nil {
			return in, err
		}
	}
	if f := t.rs.facing; f != nil {
		turn, err := d.w.frame.ConvergenceDeg(tile.Centre())
		if err != nil {
			return in, err
		}
		if err := ground(aspectRule, func(g *terrain.Grid) (geo.XYGeometry, error) {
			return g.Turned(tile, f.fromDeg-turn, f.toDeg-turn, f.slopeDeg)
		}); err != nil {
			return in, err
		}
	}
	return in, nil
}

// tooHigh gives the ground of the whole district on which the machine would break a height limit.
func (d *district) tooHigh(e *overlay.Engine, rs *ruleset) (*widened, error) {
	all := site{id: "", box: geo.ExtentOf(d.outline), geom: d.outline}
	var in overlay.BuildableInput
	if err := rs.tooHigh(e, d.w, all, &in); err != nil || len(in.Rules) == 0 {
		return nil, err
	}
	return e.NewLayer(in.Rules[0].Features, in.Rules[0].SetbackM)
}

// ZonesLayer gives the zones as a layer.
func ZonesLayer(all []Left) *geo.Layer {
	l := &geo.Layer{Name: "land left", Columns: []geo.Column{{Name: "plant"}, {Name: "part"}, {Name: "zone"}, {Name: "area_ha", Unit: "ha"}}}
	for _, left := range all {
		for i, z := range left.Zones {
			l.Features = append(l.Features, geo.Feature{ID: fmt.Sprintf("%s%s-%d", left.Plant, left.Part, i+1), Geometry: z.Outline,
				Values: []geo.Value{geo.TextValue(left.Plant), geo.TextValue(left.Part), geo.NumberValue(float64(i + 1)), geo.NumberValue(z.Ha)}})
		}
	}
	return l
}
