package run

import (
	"cmp"
	"context"
	"fmt"
	"maps"
	"runtime"
	"slices"

	"groundtally/app/study"
	"groundtally/geo/overlay"
	"groundtally/scoring"
	"groundtally/scoring/energy"
	"groundtally/scoring/units"
)

// Crowded is a plant at several spacings or ground covers: what a hectare gives, and what comes back for what is spent.
// Turbines fill the buildable ground, and a hectare is one of that; panels are fitted as their option says, and a hectare
// is one inside their fence. Where the panels of a plant of both are swept, a hectare is one of the ground of the whole plant.
type Crowded struct {
	Part      string // wind or solar: what is swept of a plant of both; empty for others
	Swept     string // what is varied
	SweptUnit string
	Points    []CrowdedPoint // the emptiest first
	// Marks on the curve; none where Why says so.
	BestReturn, MostNet, MostEnergy, Chosen CrowdedMark
	GroundHa                                float64 // buildable, that turbines fill; 0 for panels
	Beyond                                  string  // why values that were tried are not on the curve; empty where all are
	Why                                     string  // a code or words
}

// CrowdedPoint is one layout, computed as any candidate is.
type CrowdedPoint struct {
	Swept           float64
	KWPerHa         float64 // rated power per hectare
	MWhPerHaYr      float64 // delivered in a year, mean of the life
	EROI            float64 // whole life
	WithStocks      scoring.Value
	NetMWhPerHaYr   float64 // less what is spent, as electricity
	MWhPerKWYr      float64 // delivered for each kilowatt that may flow
	TurbinesOrUnits int     // turbines, or modules of a plant of panels
}

// CrowdedMark is a place on the curve.
type CrowdedMark struct {
	Swept, MWhPerHaYr, EROI float64
	AtEnd                   bool // the best may lie beyond the sweep
	Known                   bool
}

// The values that are tried: along the wind in rotor diameters, across it in the ratio of the option; ground cover as a
// share. mostCrowded bounds the machines of a layout.
var (
	crowdedSpacings = []float64{12, 11, 10, 9, 8, 7, 6, 5, 4, 3.5, 3}
	crowdedCovers   = []float64{0.15, 0.2, 0.25, 0.3, 0.35, 0.4, 0.45, 0.5, 0.55, 0.6, 0.65, 0.7}
)

const mostCrowded = 60

// at gives the option with one value of the sweep; turbines fill the ground. Of a plant of both, fitted as was, the
// other part stays: as many turbines, as much power of panels.
func (o option) at(part string, swept float64, was *Fit) option {
	out := o
	out.settings = maps.Clone(o.settings)
	if o.wind {
		out.fit = fitFill
		out.settings["fit"] = fitFill
		delete(out.settings, "fit_power_kw")
		out.settings["fit_machines"] = fmt.Sprint(mostCrowded)
	}
	if o.wind && o.solar {
		out.settings["fit_power_kw"] = fmt.Sprint(was.SolarKW * (1 + 1e-9))
	}
	if part == solarPart {
		out.settings["gcr"] = fmt.Sprint(swept)
		if o.wind {
			out.settings["fit_machines"] = fmt.Sprint(len(was.Turbines))
		}
		return out
	}
	along, _ := o.num("spacing_along_d")
	across, _ := o.num("spacing_across_d")
	out.settings["spacing_along_d"] = fmt.Sprint(swept)
	out.settings["spacing_across_d"] = fmt.Sprint(swept * across / along)
	return out
}

// CrowdingParts gives what can be swept of a candidate: both parts of a plant of wind and sun, else one without a name.
func CrowdingParts(c *Candidate) []string {
	if c.Technology == "wind_solar" {
		return []string{windPart, solarPart}
	}
	return []string{""}
}

// Crowding sweeps the spacing or the ground cover of a fitted candidate, by fitting and reckoning it anew at each value.
// The part, one of CrowdingParts, says what is swept of a plant of both.
func (s *Surveyor) Crowding(ctx context.Context, c *Candidate, part string) (*Crowded, error) {
	out := &Crowded{Part: part}
	if c.Status != Fitted {
		out.Why = c.Status
		return out, nil
	}
	s.mu.Lock()
	defer s.mu.Unlock()
	here, err := s.site(ctx, c)
	if err != nil {
		return nil, err
	}
	f, err := s.fitted(ctx)
	if err != nil {
		return nil, err
	}
	w := s.world
	i := slices.IndexFunc(w.options, func(o option) bool { return o.id == c.Plant })
	if i < 0 {
		return nil, fmt.Errorf("plant option %q: %w", c.Plant, study.ErrNotThere)
	}
	o := w.options[i]
	if part == "" {
		part = o.parts()[0]
	}
	values, now := crowdedCovers, "gcr"
	out.Swept = "ground cover"
	if part == windPart {
		values, now = crowdedSpacings, "spacing_along_d"
		out.Swept, out.SweptUnit = "spacing along the wind", "rotor diameters"
	}
	grounds, sets := map[string]groundResult{}, map[string]*ruleset{}
	for _, p := range o.parts() {
		if sets[p], err = w.rulesFor(o, p); err != nil {
			return nil, err
		}
		if grounds[p], err = s.ground(ctx, sets[p], here); err != nil {
			return nil, err
		}
	}
	if part == windPart {
		out.GroundHa = grounds[windPart].BuildableM2 / units.M2PerHa
	}
	k, err := w.newReckoner()
	if err != nil {
		return nil, err
	}
	e := overlay.New()
	defer closeEngine(e)
	for _, p := range o.parts() {
		if err := sets[p].prepare(ctx, e, runtime.NumCPU(), map[string]*widened{}); err != nil {
			return nil, err
		}
	}
	around, err := w.newPieces(e, here)
	if err != nil {
		return nil, err
	}
	sample := func(x float64) (CrowdedPoint, string, error) {
		if err := ctx.Err(); err != nil {
			return CrowdedPoint{}, "", err
		}
		one := o.at(part, x, c.Fit)
		r, err := f.compute(e, one, here, grounds)
		if err != nil || r.Status != Fitted {
			return CrowdedPoint{}, cmp.Or(r.Reason, r.Status), err
		}
		cand, err := k.candidate(e, w, around, f, f.assets, one, here, grounds, sets, r)
		if err != nil {
			return CrowdedPoint{}, "", err
		}
		ground := out.GroundHa
		switch {
		case o.wind && part == solarPart:
			ground = r.TotalHa
		case !o.wind:
			ground = r.FenceHa
		}
		return k.crowded(cand, x, ground)
	}
	why := ""
	for _, x := range values {
		p, missing, err := sample(x)
		if err != nil {
			return nil, err
		}
		switch n := len(out.Points); {
		case missing != "":
			why = missing
		case n == 0 || p.KWPerHa > out.Points[n-1].KWPerHa: // the same machines at two spacings are one layout
			out.Points = append(out.Points, p)
		}
	}
	if len(out.Points) < 3 {
		if out.Why = why; why == "" {
			out.Why = "the ground has room for fewer than three different layouts"
		}
		out.Points = nil
		return out, nil
	}
	out.Beyond = why
	if err := out.mark(k.gridEfficiency()); err != nil {
		return nil, err
	}
	if x, ok := o.num(now); ok {
		p, missing, err := sample(x)
		if err != nil {
			return nil, err
		}
		out.Chosen = CrowdedMark{Swept: x, MWhPerHaYr: p.MWhPerHaYr, EROI: p.EROI, Known: missing == ""}
	}
	return out, nil
}

// gridEfficiency gives the electricity that a unit of primary energy stands for.
func (k *reckoner) gridEfficiency() float64 {
	slot, _ := k.p.Graph.Slot("grid_efficiency")
	return k.central[slot].X
}

// crowded reads a point of the sweep from a candidate; missing is why it is not known.
func (k *reckoner) crowded(c *Candidate, swept, groundHa float64) (p CrowdedPoint, missing string, err error) {
	v := k.vector(c)
	get := func(name string) scoring.Value {
		slot, _ := k.p.Graph.Slot(name)
		return v[slot]
	}
	num := func(name string) float64 {
		x := get(name)
		if !x.OK() && missing == "" {
			missing = cmp.Or(x.Why, x.State.String())
		}
		return x.X
	}
	life, out, in := num("life_yr"), num("delivered_mj_life"), num("input_extended_mj")
	rated, export := num("rated_kw"), num("export_kw")
	p = CrowdedPoint{Swept: swept, KWPerHa: rated / groundHa, EROI: num("eroi_extended"), WithStocks: get("eroi_stock"), TurbinesOrUnits: len(c.Fit.Turbines) + c.Fit.Modules}
	if missing != "" {
		return p, missing, nil
	}
	yearly := out / units.MJPerMWh / life
	p.MWhPerHaYr = yearly / groundHa
	p.NetMWhPerHaYr = (out - k.gridEfficiency()*in) / units.MJPerMWh / life / groundHa
	p.MWhPerKWYr = yearly / export
	return p, "", nil
}

// mark finds the three best places of the curve; net energy counts as electricity.
func (c *Crowded) mark(gridEfficiency float64) error {
	points := make([]energy.CrowdingPoint, len(c.Points))
	for i, p := range c.Points {
		points[i] = energy.CrowdingPoint{UnitsPerHa: p.KWPerHa, EnergyMJPerHa: p.MWhPerHaYr * units.MJPerMWh, InputMJPerHa: p.MWhPerHaYr * units.MJPerMWh / p.EROI}
	}
	found, err := energy.NewCrowding(points, gridEfficiency, false, false)
	if err != nil {
		return err
	}
	o := found.Electric
	c.BestReturn, c.MostNet, c.MostEnergy = c.place(o.Return, o.ReturnAtEnd), c.place(o.Net, o.NetAtEnd), c.place(o.Energy, o.EnergyMaxAtEnd)
	return nil
}

// place finds a density on the curve, linear between its points.
func (c *Crowded) place(kwPerHa float64, end bool) CrowdedMark {
	i := slices.IndexFunc(c.Points, func(p CrowdedPoint) bool { return p.KWPerHa >= kwPerHa })
	if i < 0 {
		i = len(c.Points) - 1
	}
	b := c.Points[i]
	m := CrowdedMark{Swept: b.Swept, MWhPerHaYr: b.MWhPerHaYr, EROI: b.EROI, AtEnd: end, Known: true}
	if i > 0 && kwPerHa < b.KWPerHa {
		a := c.Points[i-1]
		t := (b.KWPerHa - kwPerHa) / (b.KWPerHa - a.KWPerHa)
		m.Swept += float64(t * (a.Swept - b.Swept))
		m.MWhPerHaYr += float64(t * (a.MWhPerHaYr - b.MWhPerHaYr))
		m.EROI += float64(t * (a.EROI - b.EROI))
	}
	return m
}

// At finds a value of the sweep on the curve, linear between its points; not known outside of it.
func (c *Crowded) At(swept float64) CrowdedMark {
	for i := 1; i < len(c.Points); i++ {
		a, b := c.Points[i-1], c.Points[i]
		low, high := min(a.Swept, b.Swept), max(a.Swept, b.Swept)
		if swept < low || swept > high || low == high {
			continue
		}
		t := (swept - a.Swept) / (b.Swept - a.Swept)
		return CrowdedMark{Swept: swept, MWhPerHaYr: a.MWhPerHaYr + float64(t*(b.MWhPerHaYr-a.MWhPerHaYr)), EROI: a.EROI + float64(t*(b.EROI-a.EROI)), Known: true}
	}
	return CrowdedMark{Swept: swept}
}
