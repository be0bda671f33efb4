package run

import (
	"context"
	"fmt"
	"math"
	"strings"
	"sync"

	"groundtally/geo"
	"groundtally/geo/fit"
	"groundtally/geo/measure"
	"groundtally/geo/overlay"
	"groundtally/scoring/solar"
	"groundtally/scoring/units"
	"groundtally/scoring/wind"
)

// fitEdition is raised when the digits of the step change.
const fitEdition = 6

// fitResult is the plant fitted on a site.
type fitResult struct {
	Status, Reason string
	Mode           string
	Turbines       []geo.XY
	Layout         *Layout        `json:",omitempty"`
	Fence          geo.XYGeometry // ground inside the fence
	WindKW         float64
	SolarKW        float64
	SolarACKW      float64
	FenceHa        float64
	Modules        int
	PitchM         float64 // between rows of panels, on the ground plan
	TiltDeg        float64 // of fixed panels
	SpacingHa      float64 // union of the spacing ellipses inside the site
	TotalHa        float64 // union of spacing ellipses and fence
	WindMWh        yieldValue
	SolarMWh       yieldValue
	WakeLoss       float64
	NearbyLossMWh  float64 // what existing and permitted turbines lose to the new ones
	PR             float64
	CropLight      float64
	WindSigma      float64 // of one year's energy
	SolarSigma     float64
	WindShared     float64 // of the long-term mean, alike on all sites
	WindOwn        float64 // and of this site alone
	SolarShared    float64 // of the long-term mean, alike on all sites
	SolarOwn       float64 // and of this site alone
	SpareAsset     string  // the line or substation that a fit to its spare capacity was made for
	Chain          []ChainStep
	Notices        []string
	NeedsPatchHa   float64
	ResourceM      float64 // distance to the resource point; the size of a cell where a grid serves
	WindSource     string  `json:",omitempty"` // which layer served; empty in a study without grids of wind
	SunSource      string  `json:",omitempty"`
}

// yieldValue is an energy or the reason why it is missing.
type yieldValue struct {
	MWh float64
	Why string // empty when known
}

// fitter holds what all fits share.
type fitter struct {
	w       *world
	wind    []windPoint
	others  []neighbour // existing and permitted wind turbines
	sun     *sunlight
	points  []sunPoint   // of monthly sunlight
	sunKey  string       // digest of the settings that sunlight is read with
	sunWhy  string       // monthly sunlight that cannot be read
	hours   *weatherFile // nil without a file of hours of sun
	blowing *windHours   // nil without one of wind
	used    *usedHours   // nil without hours of demand
	hourly  *sunlight    // the months of hours
	windKey string       // digest of the settings of wind
	assets  []asset      // lines and substations
	gridKey string       // digest of the settings that a connection reads

	temps *sunlight // temperatures for grids of sunlight without such; nil without any
	wide  *heights  // as far as horizons are looked for; nil without terrain

	mu        sync.Mutex
	climates  map[string]*solar.Climate
	years     *sunYears
	lies      map[string]lie               // by site
	roughs    map[string]rough             // by site
	winds     map[geo.XY]windHere          // between points
	machines  map[string]wind.Turbine      // of the user, by name
	stands    map[string]stand             // found, by option
	nodes     map[geo.XY]betweenPoints     // of the lattice of sunlight
	freshLies map[string]lie               // those that are not kept yet
	kept      func(key string) (lie, bool) // finds one that is kept; nil where they were read before
	standMu   sync.Mutex                   // held while a stand is found
}

// latStep is how far latitude is rounded so that sites share a solar year: a hundredth of a degree
// changes the yield by less than 1e-4.
const latStep = 0.01

func (w *world) newFitter(ctx context.Context, cache Cache) (*fitter, error) {
	g := newKey("grid settings", 1)
	w.gridSettingsKey(g)
	f := &fitter{w: w, gridKey: g.sum(), climates: map[string]*solar.Climate{}, years: (*sunYears)(nil).after(), lies: map[string]lie{}, roughs: map[string]rough{}, winds: map[geo.XY]windHere{}, machines: map[string]wind.Turbine{}, stands: map[string]stand{}, nodes: map[geo.XY]betweenPoints{}, sunKey: sunSettings(w.snap), windKey: windSettings(w.snap), assets: w.assets(), freshLies: map[string]lie{}}
	if w.terrain != nil {
		f.wide = w.withHorizon(ctx, w.load).terrain
	}
	err := w.readGrids(ctx, cache)
	if err != nil {
		return nil, err
	}
	if f.wind, err = w.windPoints(); err != nil {
		return nil, err
	}
	f.blowing = w.windHours()
	f.used = w.usedHours()
	f.others = w.neighbours()
	// Sunlight that cannot be read leaves the sun unknown, and says why; wind goes on.
	if f.sun, err = w.sunlight(); err != nil {
		f.sunWhy = err.Error()
	}
	if f.points, err = w.sunPoints(); err != nil {
		f.sunWhy, f.points = err.Error(), nil
	}
	if f.hours = w.weather(); f.hours != nil && f.hours.climate != nil {
		dhi := f.hours.report.DHIKWhPerM2
		f.hourly = &sunlight{ghi: f.hours.report.GHIKWhPerM2, dhi: &dhi, temp: f.hours.report.MeanTempC, albedo: solar.EveryMonth(defaultAlbedo), snow: unsaid, soiling: unsaid, source: f.hours.rec.Name}
	}
	if f.temps = f.sun; f.sun == nil {
		f.temps = w.typedTemperatures()
		return f, nil
	}
	centre := w.frame.Centre()
	if _, err := f.climate(math.Round(centre.Lat/latStep)*latStep, f.sun); err != nil {
		f.sunWhy, f.sun = fmt.Sprintf("what stands in %s is no sunlight for this latitude: %v", f.sun.source, err), nil
	}
	return f, nil
}

func (f *fitter) siteLat(s site) (float64, error) {
	c := s.box.Centre()
	ll, err := f.w.frame.Inverse(c)
	if err != nil {
		return 0, err
	}
	return math.Round(ll.Lat/latStep) * latStep, nil
}

// key writes what the fit of a site depends on besides its ground.
func (f *fitter) key(o option, s site, ground []string) (string, error) {
	k := newKey("fit", fitEdition)
	for _, g := range ground {
		k.text(g)
	}
	k.text(f.w.p.Digest)
	k.num(f.w.frame.Centre().Lon)
	k.num(f.w.frame.Centre().Lat)
	o.key(k)
	if o.wind {
		k.text(f.windKey)
		f.keyOwn(k, o, s)
		if f.byLog() {
			k.num(f.roughness(s).z0M)
		}
		p, err := f.windAt(o, s)
		if err != nil {
			return "", err
		}
		if p.known {
			k.num(p.distM)
			k.num(p.heightM)
			k.text(fmt.Sprint(p.typed))
			for _, sec := range p.sectors {
				k.num(sec.FrequencyFrac)
				k.num(sec.Weibull.AMPerS)
				k.num(sec.Weibull.K)
			}
			if p.hours != nil {
				k.text(p.hours.key)
			}
		}
		k.said("wind", p.source, p.why)
		for _, n := range f.near(s) {
			k.text(n.key)
		}
		if f.w.terrain != nil {
			k.text(f.w.terrain.rec.Digest)
			k.text(f.w.terrain.rec.CRS)
		}
	}
	if o.solar {
		here, err := f.sunAt(s)
		if err != nil {
			return "", err
		}
		if here.sunlight != nil {
			k.sunlight(here.sunlight)
			if here.hours != nil {
				k.text(here.hours.key)
			}
			if lat, err := f.siteLat(s); err == nil {
				k.num(lat)
			}
		}
		k.said("sunlight", here.source, here.why)
		k.text(f.sunKey)
		k.int(lieEdition)
		if o.findsStand() {
			found, err := f.found(o)
			if err != nil {
				return "", err
			}
			k.num(found.tiltDeg)
			k.num(found.azimuthDeg)
		}
		if m := f.sky(); m != solar.HayDavies {
			k.text(m.String())
		}
		if f.w.terrain != nil {
			k.text(f.w.terrain.rec.Digest)
			k.text(f.w.terrain.rec.CRS)
		}
	}
	if _, said := o.num("fit_machines"); o.fit == "spare_capacity" || o.wind && o.fit == fitFill && !said {
		for _, role := range []string{"grid_lines", "substations"} {
			for _, l := range f.w.byRole[role] {
				k.text(l.rec.Name) // stands in the asset's name
				k.text(l.rec.Digest)
				for _, field := range sortedNames(l.rec.Match) {
					k.texts([]string{field, l.rec.Match[field], l.rec.Units[l.rec.Match[field]]})
				}
			}
		}
		k.text(f.gridKey)
	}
	return k.sum(), nil
}

// key writes an option but for its title.
func (o option) key(k *keyer) {
	k.text(o.id)
	for _, n := range sortedNames(o.settings) {
		if n != "title" {
			k.text(n)
			k.text(o.settings[n])
		}
	}
}

// said writes which grid served, or why none did; nothing in a study without grids.
func (k *keyer) said(of, source, why string) {
	if source != "" || strings.Contains(why, " ") {
		k.texts([]string{of, source, why})
	}
}

// compute fits an option on a site.
func (f *fitter) compute(e *overlay.Engine, o option, s site, ground map[string]groundResult) (fitResult, error) {
	r := fitResult{Mode: o.fit, Fence: geo.XYGeometry{Kind: geo.Polygons}}
	limit := math.Inf(1) // power that may be fitted
	limitAC := false
	if o.fit == "spare_capacity" {
		spare, asset, known := f.spare(s)
		if !known {
			r.Status, r.Reason = NotComputed, "spare_unknown"
			return r, nil
		}
		limit, limitAC, r.SpareAsset = spare, true, asset
	}
	if o.fit == "power" {
		x, ok := o.num("fit_power_kw")
		if !ok {
			r.Status, r.Reason = NotComputed, "not_set:plant."+o.id+".fit_power_kw"
			return r, nil
		}
		limit = x
	}
	target := math.Inf(1)
	if o.fit == "yearly_energy" {
		x, ok := o.num("fit_energy_mwh_per_yr")
		if !ok {
			r.Status, r.Reason = NotComputed, "not_set:plant."+o.id+".fit_energy_mwh_per_yr"
			return r, nil
		}
		target = x
	}
	if o.wind {
		if err := f.fitWind(e, o, s, ground[windPart], limit, target, &r); err != nil || r.Status == NotComputed {
			return r, err
		}
	}
	if o.solar {
		left := limit - r.WindKW
		if ratio, ok := o.num("dc_ac_ratio"); ok && limitAC {
			left *= ratio // what the connection takes is alternating current
		}
		if err := f.fitSolar(e, o, s, ground[solarPart], left, target-r.WindMWh.MWh, &r); err != nil || r.Status == NotComputed {
			return r, err
		}
	}
	switch {
	case o.wind && o.solar && (len(r.Turbines) == 0 || r.SolarKW == 0):
		r.Status = NoRoom // a plant of both needs both
		if r.Reason == "" {
			r.Reason = "one_part_without_room"
		}
	case len(r.Turbines) == 0 && r.SolarKW == 0:
		r.Status = NoRoom
	default:
		r.Status = Fitted
		if err := f.totals(e, o, s, &r); err != nil {
			return r, err
		}
	}
	return r, nil
}

// fitWind places turbines.
func (f *fitter) fitWind(e *overlay.Engine, o option, s site, g groundResult, limitKW, targetMWh float64, r *fitResult) error {
	hub, okH := o.num("hub_height_m")
	d, okD := o.num("rotor_diameter_m")
	rated, okR := o.num("rated_kw")
	for _, need := range []struct {
		name string
		ok   bool
	}{{"hub_height_m", okH}, {"rotor_diameter_m", okD}, {"rated_kw", okR}} {
		if !need.ok {
			r.Status, r.Reason = NotComputed, "not_set:plant."+o.id+"."+need.name
			return nil
		}
	}
	machine, unfit := f.turbine(o, rated, d)
	if unfit != nil {
		r.Status, r.Reason = NotComputed, "turbine_does_not_fit" // the option is at fault, not the computation
		return nil                                               //nolint:nilerr // said by the status
	}
	hand, byHand := f.w.snap.Layout(s.id, o.id)
	if g.BuildableM2 <= 0 && !byHand {
		return nil
	}
	most, askedBy := math.MaxInt32, "" // no limit but the room
	if o.fit == "machines" {
		n, ok := o.num("fit_machines")
		if !ok {
			r.Status, r.Reason = NotComputed, "not_set:plant."+o.id+".fit_machines"
			return nil
		}
		most, askedBy = int(n), askedSetting
	} else if n, ok := o.num("fit_machines"); ok {
		most, askedBy = int(n), askedSetting
	} else if o.fit == fitFill {
		most, askedBy = f.carried(s, rated)
	}
	if !math.IsInf(limitKW, 1) {
		if n := int(math.Floor(limitKW/rated + 1e-9)); n < most {
			most, askedBy = n, askedPower
		}
	}
	if most <= 0 && !byHand {
		r.Reason = "limit_below_one_machine"
		return nil
	}
	p, err := f.windAt(o, s)
	if err != nil {
		return err
	}
	known := p.known
	r.ResourceM, r.WindSource = p.distM, p.source
	if !known && !math.IsInf(targetMWh, 1) {
		r.Status, r.Reason = NotComputed, p.why
		return nil
	}
	along, _ := o.num("spacing_along_d")
	across, _ := o.num("spacing_across_d")
	if !(along > 0) || !(across > 0) || !(hub > 0) || !(d > 0) || !(rated > 0) {
		r.Status, r.Reason = NotComputed, "plant_out_of_range"
		return nil
	}
	el, err := f.spacing(o, p, s)
	if err != nil {
		return err
	}
	near := wholeOf(f.near(s))
	var in wind.FarmInput
	if known {
		if in, err = f.farm(machine, hub, p, s); err != nil {
			return err
		}
		in.Existing = f.machinesOf(s, near)
	}
	var gain fit.Gain
	if known {
		ev, err := wind.NewEvaluator(in)
		if err != nil {
			return fmt.Errorf("site %s, option %s: %w", s.id, o.id, err)
		}
		gain = judge{ev: ev, toTrue: f.turn(s)}
	}
	room, err := clearOf(e, g.Area, near, across, d)
	if err != nil {
		return siteError(s, err)
	}
	var at []geo.XY
	lay := &Layout{AskedBy: askedBy, Asked: capped(most)}
	if byHand {
		if at, err = f.placedByHand(hand, s, g.Area, el, near, across, d, lay); err != nil {
			return err
		}
		if lay.touches() {
			r.Status, r.Reason = NotComputed, "turbines_touch"
			return nil
		}
	} else {
		found, err := fit.Machines(fit.Input{Buildable: room, Spacing: el, Max: capped(most), Gain: gain})
		if err != nil {
			return fmt.Errorf("site %s, option %s: %w", s.id, o.id, err)
		}
		at, lay.How, lay.SpacingMet = found.At, found.How, math.Sqrt(found.MinMetric)
		lay.MostByRule, lay.MostBy = found.Bound, found.BoundBy
	}
	if len(at) == 0 {
		if len(near) > 0 && !g.Area.Empty() && room.Empty() {
			r.Reason = "existing_turbines_near"
		}
		return nil
	}
	energy := func(at []geo.XY) (windYear, error) {
		in.At = f.positions(s, at)
		return yearOf(in, p)
	}
	var res windYear
	if known {
		if res, err = energy(at); err != nil {
			return fmt.Errorf("site %s, option %s: %w", s.id, o.id, err)
		}
		if !math.IsInf(targetMWh, 1) && !byHand {
			for n := 1; n <= len(at); n++ {
				if res, err = energy(at[:n]); err != nil {
					return err
				}
				if res.netMWh >= targetMWh || n == len(at) {
					at = at[:n]
					break
				}
			}
		}
	}
	r.Turbines, r.Layout = at, lay
	r.WindKW = rated * float64(len(at))
	if known && lay.MostByRule > 0 {
		lay.BoundMWh, lay.WakedMWh = res.grossMWh/float64(len(at))*float64(lay.MostByRule), res.chain[0].AfterMWh
	}
	if !known {
		r.WindMWh.Why = p.why
		return nil
	}
	r.WindMWh.MWh, r.WakeLoss, r.NearbyLossMWh = res.netMWh, res.wakeLoss, res.farm.ExistingLossMWhPerYr
	if len(near) > 0 {
		r.Notices = append(r.Notices, "wakes_of_others")
	}
	if len(near) < len(f.near(s)) {
		r.Notices = append(r.Notices, "wakes_of_others_unknown")
	}
	for _, st := range res.chain {
		r.Chain = append(r.Chain, ChainStep{Name: st.Name, Unit: "MWh/yr", Before: st.BeforeMWh, Share: st.Share, After: st.AfterMWh})
	}
	for _, n := range res.farm.Notices {
		r.Notices = append(r.Notices, string(n))
	}
	r.Notices = append(r.Notices, p.notices(hub)...)
	switch {
	case p.grid, p.hours != nil:
	case p.used > 1:
		r.Notices = append(r.Notices, "between_resources")
	default:
		r.Notices = append(r.Notices, "nearest_resource")
	}
	if p.typed {
		r.Notices = append(r.Notices, "rayleigh")
	}
	if f.w.terrain != nil {
		if _, ok, err := f.w.heightM(s.box.Centre()); err != nil {
			return err
		} else if !ok {
			r.Notices = append(r.Notices, "height_unknown")
		}
	}
	parts, err := f.windParts(p, hub, res.wakeLoss)
	if err != nil {
		return err
	}
	r.WindSigma, r.WindShared, r.WindOwn, err = f.windSpread(parts, res.sensitivity())
	return err
}

// windYear is the year of a plant's turbines: by the hours where these serve, else by the distributions.
type windYear struct {
	netMWh, grossMWh, wakeLoss float64
	chain                      []wind.Step
	farm                       wind.FarmResult    // by the distributions
	hours                      *wind.SeriesResult // nil where no hours serve
}

func yearOf(in wind.FarmInput, p windHere) (windYear, error) {
	if p.hours == nil {
		y, err := wind.FarmYear(in)
		return windYear{netMWh: y.NetMWhPerYr, grossMWh: y.GrossMWhPerYr, wakeLoss: y.WakeLossFrac, chain: y.Chain, farm: y}, err
	}
	y, err := wind.SeriesYear(in, p.hours.hours, p.hours.fit)
	return windYear{netMWh: y.NetMWhPerYr, grossMWh: y.GrossMWhPerYr, wakeLoss: y.WakeLossFrac, chain: y.Chain, farm: y.FitYear, hours: &y}, err
}

// spacing gives the distances that the turbines of an option keep from each other: along the wind that brings most
// energy and across it, or evenly all round where no direction stands out.
func (f *fitter) spacing(o option, p windHere, s site) (fit.Spacing, error) {
	d, _ := o.num("rotor_diameter_m")
	along, _ := o.num("spacing_along_d")
	across, _ := o.num("spacing_across_d")
	el := fit.Spacing{AlongM: along * d, AcrossM: across * d}
	if !p.known {
		return el, nil
	}
	from, even := prevailingDeg(p.sectors)
	if even {
		el = fit.Spacing{AlongM: 4 * d, AcrossM: 4 * d}
	}
	var err error
	el.AzimuthDeg, err = f.w.frame.GridAzimuthDeg(s.box.Centre(), from)
	return el, err
}

// longTermYears is the span over which the long-term mean evens the variation between years out.
const longTermYears = 20

// turn gives the way from the frame to true east and north around the middle of a site.
func (f *fitter) turn(s site) func(geo.XY) wind.Position {
	c := s.box.Centre()
	conv, err := f.w.frame.ConvergenceDeg(c)
	if err != nil {
		conv = 0 // the centre of a projected site always has a convergence
	}
	sin, cos := math.Sincos(conv * math.Pi / 180)
	return func(p geo.XY) wind.Position {
		x, y := p.X-c.X, p.Y-c.Y
		return wind.Position{X: float64(x*cos) + float64(y*sin), Y: float64(y*cos) - float64(x*sin)}
	}
}

func (f *fitter) positions(s site, at []geo.XY) []wind.Position {
	to := f.turn(s)
	out := make([]wind.Position, len(at))
	for i, p := range at {
		out[i] = to(p)
	}
	return out
}

// judge passes the layout search the energy of a layout.
type judge struct {
	ev     *wind.Evaluator
	toTrue func(geo.XY) wind.Position
}

func (j judge) all(at []geo.XY) []wind.Position {
	out := make([]wind.Position, len(at))
	for i, p := range at {
		out[i] = j.toTrue(p)
	}
	return out
}

func (j judge) Total(at []geo.XY) float64 { return j.ev.Total(j.all(at)) }

func (j judge) Add(at []geo.XY, p geo.XY) float64 { return j.ev.Add(j.all(at), j.toTrue(p)) }

func (j judge) Move(at []geo.XY, i int, p geo.XY) float64 {
	return j.ev.Move(j.all(at), i, j.toTrue(p))
}

// fitSolar lays rows of panels: the largest patches first, the last one cut so that little more ground is fenced
// than the power needs.
func (f *fitter) fitSolar(e *overlay.Engine, o option, s site, g groundResult, limitKW, targetMWh float64, r *fitResult) error {
	if o.fit == "machines" && !o.wind {
		r.Status, r.Reason = NotComputed, "fit_machines_needs_wind"
		return nil
	}
	if g.BuildableM2 <= 0 {
		return nil
	}
	ratio, _ := o.num("dc_ac_ratio")
	panels, ok, err := f.rowsOf(o, s)
	if err != nil {
		return err
	}
	if !ok || !(ratio > 0) {
		r.Status, r.Reason = NotComputed, "plant_out_of_range"
		return nil
	}
	area := g.Area
	if len(r.Turbines) > 0 {
		clear, _ := o.num("tower_clear_m")
		discs := make([]geo.XYGeometry, len(r.Turbines))
		for i, p := range r.Turbines {
			var err error
			if discs[i], err = disc(p, clear); err != nil {
				return err
			}
		}
		all, err := e.Union(discs...)
		if err != nil {
			return err
		}
		if area, err = e.Difference(area, all); err != nil {
			return err
		}
	}
	if x, ok := o.num("fit_power_kw"); ok && o.fit != "power" {
		limitKW = math.Min(limitKW, x)
	}
	var specific float64 // kWh per kW
	y, here, bad, err := f.yieldAt(o, s)
	switch {
	case err != nil:
		return err
	case bad:
		r.Status, r.Reason = NotComputed, "plant_out_of_range"
		return nil
	case here.sunlight == nil:
		r.SolarMWh.Why = here.why
	default:
		r.SunSource = here.source
		specific, r.PR, r.CropLight = y.kWhPerKWp, y.performance, y.groundLight
		if !math.IsInf(targetMWh, 1) {
			limitKW = math.Min(limitKW, targetMWh*units.KWhPerMWh/specific)
		}
	}
	if here.sunlight == nil && !math.IsInf(targetMWh, 1) {
		r.Status, r.Reason = NotComputed, here.why
		return nil
	}
	most := 0 // units of a row; no limit but the room
	if !math.IsInf(limitKW, 1) {
		if most = int(math.Floor(limitKW/panels.unitKW + 1e-9)); most <= 0 {
			return nil
		}
	}
	laid, err := panels.fill(e, area, most)
	if err != nil {
		return siteError(s, err)
	}
	if laid.units == 0 {
		if r.Reason == "" {
			r.Reason = "no_row_fits"
		}
		return nil
	}
	r.Fence, r.FenceHa = laid.fence, laid.ha
	r.SolarKW = float64(laid.units) * panels.unitKW
	r.Modules, r.PitchM = laid.units*panels.across, panels.layout.PitchM
	if o.technology != "solar_vertical" && o.technology != "solar_tracking" {
		if r.TiltDeg, err = f.tiltDeg(o); err != nil {
			return err
		}
	}
	r.SolarACKW = r.SolarKW / ratio
	if here.sunlight == nil {
		return nil
	}
	r.SolarMWh.MWh = specific * r.SolarKW / units.KWhPerMWh
	for _, st := range y.chain {
		r.Chain = append(r.Chain, ChainStep{Name: st.Name, Unit: "kWh/kWp", Before: st.BeforeKWhPerKWp, Share: -st.Share, After: st.AfterKWhPerKWp})
	}
	doubt, err := f.doubt(o, here, y.chain)
	if err != nil {
		return err
	}
	sig, err := f.w.p.Solar.Sigmas(doubt)
	if err != nil {
		return err
	}
	r.SolarSigma = sig.Total(1)
	r.SolarShared, r.SolarOwn = sig.Parts(longTermYears)
	g0, err := f.lie(s)
	if err != nil {
		return err
	}
	if g0.notice != "" {
		r.Notices = append(r.Notices, g0.notice)
	}
	return nil
}

// firstHectares takes the largest patches first until the area is reached.
func firstHectares(e *overlay.Engine, g geo.XYGeometry, wantHa float64) (geo.XYGeometry, float64, error) {
	out := geo.XYGeometry{Kind: geo.Polygons}
	left := wantHa * units.M2PerHa
	taken := 0.0
	for _, part := range largestFirst(g) {
		if left <= 0 {
			break
		}
		one := geo.XYGeometry{Kind: geo.Polygons, Parts: [][][]geo.XY{part}}
		if m2 := measure.AreaM2(one); m2 <= left {
			out.Parts = append(out.Parts, part)
			taken += m2
			left -= m2
			continue
		}
		box := geo.ExtentOf(one)
		lo, hi := box.MinY, box.MaxY
		// Bisection to a hundredth of a millimetre; the lower side never fences more than is wanted.
		for hi-lo > 1e-5 {
			mid := (lo + hi) / 2
			if measure.AreaBelowM2(one, mid) <= left {
				lo = mid
			} else {
				hi = mid
			}
		}
		cut, err := e.Intersection(one, rectangle(geo.Extent{MinX: box.MinX - 1, MinY: box.MinY - 1, MaxX: box.MaxX + 1, MaxY: lo}))
		if err != nil {
			return out, 0, err
		}
		out.Parts = append(out.Parts, cut.Parts...)
		taken += measure.AreaM2(cut)
		left = 0
	}
	return out, taken / units.M2PerHa, nil
}

// capped turns "no limit" into the layout search's own word for it.
func capped(most int) int {
	if most == math.MaxInt32 {
		return 0
	}
	return most
}

// disc gives a circle as a polygon of the same area.
func disc(centre geo.XY, radiusM float64) (geo.XYGeometry, error) {
	return fit.Spacing{AlongM: radiusM, AcrossM: radiusM}.Ellipse(centre, 1)
}

func rectangle(x geo.Extent) geo.XYGeometry {
	return geo.XYGeometry{Kind: geo.Polygons, Parts: [][][]geo.XY{{{{X: x.MinX, Y: x.MinY}, {X: x.MaxX, Y: x.MinY}, {X: x.MaxX, Y: x.MaxY}, {X: x.MinX, Y: x.MaxY}, {X: x.MinX, Y: x.MinY}}}}}
}

// totals finds the ground of the plant: the union of spacing ellipses inside the site, and the fence.
func (f *fitter) totals(e *overlay.Engine, o option, s site, r *fitResult) error {
	var all []geo.XYGeometry
	if len(r.Turbines) > 0 {
		p, err := f.windAt(o, s)
		if err != nil {
			return err
		}
		el, err := f.spacing(o, p, s)
		if err != nil {
			return err
		}
		var ellipses []geo.XYGeometry
		for _, p := range r.Turbines {
			// Half the spacing on each side, so that ellipses of neighbours at the rule's distance touch.
			one, err := el.Ellipse(p, 0.5)
			if err != nil {
				return err
			}
			ellipses = append(ellipses, one)
		}
		u, err := e.Union(ellipses...)
		if err != nil {
			return err
		}
		if u, err = e.Intersection(u, s.geom); err != nil {
			return fmt.Errorf("site %s: %w", s.id, err)
		}
		r.SpacingHa = measure.AreaM2(u) / units.M2PerHa
		whole := math.Pi / 4 * el.AlongM * el.AcrossM / units.M2PerHa * float64(len(r.Turbines))
		if r.SpacingHa < 0.6*whole {
			r.Notices = append(r.Notices, "spacing_beyond_site")
		}
		all = append(all, u)
	}
	if !r.Fence.Empty() {
		all = append(all, r.Fence)
	}
	u, err := e.Union(all...)
	if err != nil {
		return err
	}
	r.TotalHa = measure.AreaM2(u) / units.M2PerHa
	return nil
}
