package run

import (
	"context"
	"fmt"
	"math"
	"runtime"
	"slices"
	"sync"

	"groundtally/app/study"
	"groundtally/geo"
	"groundtally/geo/overlay"
	"groundtally/geo/rows"
	"groundtally/scoring"
	"groundtally/scoring/solar"
	"groundtally/scoring/units"
	"groundtally/scoring/wind"
)

// KeptFrom is one distance that a candidate keeps, with what near the site it is kept from.
type KeptFrom struct {
	Rule      string // as in Taken
	DistanceM float64
	Features  geo.LonLatGeometry
}

// Surroundings are what a map shows around a candidate.
type Surroundings struct {
	Buildable geo.LonLatGeometry
	Rows      geo.LonLatGeometry // ground plans of the rows of panels; empty where there are none
	Kept      []KeptFrom
}

// Surveyor looks at the ground around candidates of one state of a study. It reads the layers once, when
// first asked, and may be used from several goroutines.
type Surveyor struct {
	snap   *study.Snapshot
	params *Params
	load   Loader
	cache  Cache // nil computes everything

	mu     sync.Mutex
	world  *world
	sites  map[string]int
	fitter *fitter // made when months or rows are first asked for
	wide   *world  // with heights as far as a horizon reaches
}

// NewSurveyor makes a surveyor.
func NewSurveyor(snap *study.Snapshot, p *Params, load Loader, cache Cache) *Surveyor {
	return &Surveyor{snap: snap, params: p, load: load, cache: cache}
}

// Around gives the buildable area of a candidate's site for its plant option, and the distances that were
// kept near by.
func (s *Surveyor) Around(ctx context.Context, c *Candidate) (*Surroundings, error) {
	s.mu.Lock()
	defer s.mu.Unlock()
	here, err := s.site(ctx, c)
	if err != nil {
		return nil, err
	}
	w := s.world
	out := &Surroundings{Buildable: geo.LonLatGeometry{Kind: geo.Polygons}}
	for _, o := range w.options {
		if o.id != c.Plant {
			continue
		}
		for _, part := range o.parts() {
			rs, err := w.rulesFor(o, part)
			if err != nil {
				return nil, err
			}
			g, err := s.ground(ctx, rs, here)
			if err != nil {
				return nil, err
			}
			ll, err := w.frame.Unproject(g.Area)
			if err != nil {
				return nil, err
			}
			out.Buildable.Parts = append(out.Buildable.Parts, ll.Parts...)
			out.keep(rs, here)
		}
		if c.Fit != nil && c.Fit.Modules > 0 {
			if out.Rows, err = s.rows(ctx, o, here, c.Fit); err != nil {
				return nil, err
			}
		}
	}
	return out, nil
}

// rows lays the rows of a fitted plant again, for the map: a fit keeps their number and its fence, to a centimetre.
func (s *Surveyor) rows(ctx context.Context, o option, here site, fit *Fit) (geo.LonLatGeometry, error) {
	none := geo.LonLatGeometry{}
	f, err := s.fitted(ctx)
	if err != nil {
		return none, err
	}
	p, ok, err := f.rowsOf(o, here)
	if err != nil || !ok {
		return none, err
	}
	fence, err := s.world.frame.Project(fit.Panels)
	if err != nil {
		return none, err
	}
	e := overlay.New()
	defer closeEngine(e)
	rs, err := p.in(e, fence, fit.Modules/p.across)
	if err != nil {
		return none, err
	}
	return s.world.frame.Unproject(rows.Polygons(rs, p.layout.DepthM))
}

// fitted makes the fitter where that was not done yet.
func (s *Surveyor) fitted(ctx context.Context) (*fitter, error) {
	if s.fitter == nil {
		f, err := s.world.newFitter(ctx, s.cache)
		if err != nil {
			return nil, err
		}
		if cache := s.cache; cache != nil {
			ctx := context.WithoutCancel(ctx)
			f.kept = func(key string) (lie, bool) {
				have, err := cache.Results(ctx, lieStep, []string{key})
				if err != nil {
					return lie{}, false // it is found out again
				}
				return lieOf(have[key])
			}
		}
		s.fitter = f
	}
	return s.fitter, nil
}

// site reads the layers where that was not done yet, and finds a candidate's site.
func (s *Surveyor) site(ctx context.Context, c *Candidate) (site, error) {
	if s.world == nil {
		w, err := newWorld(ctx, s.snap, s.params, s.load)
		if err != nil {
			return site{}, err
		}
		s.world, s.sites = w, map[string]int{}
		for i, one := range w.sites {
			s.sites[one.id] = i
		}
	}
	at, ok := s.sites[c.Site]
	if !ok {
		return site{}, fmt.Errorf("site %q: %w", c.Site, study.ErrNotThere)
	}
	return s.world.sites[at], nil
}

// Course is how the energy of a plant comes over the year that its solar yield rests on, before the bias of
// forecasts and the losses of the connection.
type Course struct {
	Months [12]scoring.Value // MWh; without hours of wind a plant with turbines has unknown months
	// Hours part the months by hour of the day, from 0 to 1 first, on the clock named. Nil where the months are
	// unknown.
	Hours *[12][24]float64 // MWh
	Clock string           // "solar time" where the sunlight is given by month, the clock of the file where by hour
	Sky   []SkyYield       // what each way to bring the sky's light onto the panels gives; nil as Hours
	Doubt *Doubt           // why the yield may be another; nil as Hours
	Wind  *WindDoubt       // the same of the wind part; nil where its energy is not known
	Rose  *WindRose        // the wind of a plant with turbines by direction; nil where it is not known
	// Turbines are what is shown of a plant's turbines; nil as Rose.
	Turbines *TurbineView

	windMonths *[12]float64 // MWh; nil where no hours of wind serve
}

// Doubt is the spread of a solar yield by its causes, as shares of the energy.
type Doubt struct {
	Source       string // of the sunlight: station, satellite or map
	Said         bool   // somebody said so; otherwise it counts as the least sure
	Components   []solar.Component
	BetweenYears float64 // from one year to another
	LongTerm     float64 // of the long-term mean, all components together
	OneYear      float64
}

// WindRose is the wind at hub height by the direction that it comes from, with what it gives.
type WindRose struct {
	Sectors []WindSector
	Even    bool // an even spread is assumed
}

// WindSector is one direction, the first around north and the others evenly clockwise.
type WindSector struct {
	Time       float64 // share of the year
	Energy     float64 // share of the plant's energy behind wakes
	WakeLoss   float64 // share of the sector's energy in the free stream
	SpeedMPerS float64 // mean, at hub height
}

// turbines computes the year of a fitted plant's turbines once more, by direction and place.
func (s *Surveyor) turbines(ctx context.Context, c *Candidate, here site, out *Course) error {
	f, err := s.fitted(ctx)
	if err != nil {
		return err
	}
	i := slices.IndexFunc(s.world.options, func(o option) bool { return o.id == c.Plant })
	if i < 0 {
		return fmt.Errorf("plant option %q: %w", c.Plant, study.ErrNotThere)
	}
	o := s.world.options[i]
	p, machine, hub, err := f.windAndMachine(o, here)
	if err != nil || !p.known {
		return err
	}
	in, err := f.farm(machine, hub, p, here)
	if err != nil {
		return err
	}
	in.Existing = f.machinesOf(here, wholeOf(f.near(here)))
	var at []geo.XY
	for _, ll := range c.Fit.Turbines {
		q, err := s.world.frame.Forward(ll)
		if err != nil {
			return err
		}
		at = append(at, q)
	}
	in.At = f.positions(here, at)
	year, err := yearOf(in, p)
	if err != nil {
		return err
	}
	if out.Wind, err = f.windDoubt(p, hub, year); err != nil {
		return err
	}
	if h := year.hours; h != nil && h.WakedMWhPerYr > 0 {
		months := &[12]float64{}
		for m, mwh := range h.MonthMWh {
			months[m] = mwh * h.NetMWhPerYr / h.WakedMWhPerYr
		}
		out.windMonths = months
	}
	models, err := wind.CompareWakes(in)
	if err != nil {
		return err
	}
	if models[0].Wake != in.Settings.Wake { // that of the results comes first
		slices.Reverse(models)
	}
	res := models[0].Year
	time := 0.0
	for _, sec := range p.sectors {
		time += sec.FrequencyFrac
	}
	hubRose := make([]wind.Sector, len(p.sectors))
	for i, sec := range p.sectors {
		hubRose[i].FrequencyFrac = sec.FrequencyFrac / time
		if hubRose[i].Weibull, err = p.wind.AtHub(sec.Weibull, hub); err != nil {
			return err
		}
	}
	view := &TurbineView{Curve: curveOver(in, res, hubRose)}
	for _, m := range models {
		view.Models = append(view.Models, WakeModelYield{wakeWords(m.Wake), m.WakeLossFrac, m.NetMWhPerYr})
	}
	rs, err := s.world.rulesFor(o, windPart)
	if err != nil {
		return err
	}
	g, err := s.ground(ctx, rs, here)
	if err != nil {
		return err
	}
	to := f.turn(here)
	view.Wakes, err = wakesAround(in, res, ringsOf(here.geom, to), ringsOf(g.Area, to))
	out.Rose, out.Turbines = roseOf(p, res, hubRose), view
	return err
}

// roseOf brings the sectors of the wind at hub height together with what they give.
func roseOf(p windHere, res wind.FarmResult, hub []wind.Sector) *WindRose {
	out := &WindRose{Sectors: make([]WindSector, len(hub)), Even: p.typed || p.grid}
	all := 0.0
	for _, x := range res.Sectors {
		all += x.WakedMWhPerYr
	}
	for i, x := range res.Sectors {
		o := &out.Sectors[i]
		o.Time, o.SpeedMPerS = hub[i].FrequencyFrac, hub[i].Weibull.Mean()
		if x.FreeMWhPerYr > 0 {
			o.WakeLoss = math.Max(0, 1-x.WakedMWhPerYr/x.FreeMWhPerYr)
		}
		if all > 0 {
			o.Energy = x.WakedMWhPerYr / all
		}
	}
	return out
}

// WindDoubt is the spread of the wind part's yield, as shares of the energy.
type WindDoubt struct {
	Source       string // of the wind: model or mast
	Said         bool   // somebody said so; otherwise it counts as the least sure
	Parts        []WindPart
	LongTerm     float64    // of the long-term energy, all parts together
	Band         [2]float64 // that is usual for such data
	YearSpeed    float64    // of a year's mean speed
	Sensitivity  float64    // per cent energy per cent speed
	BetweenYears float64    // of a year's energy
	OneYear      float64
	Bias         float64 // what such forecasts gave in the long run, less one
	Exceeded     []wind.ExceedanceLine
	FitMWh       float64 // what the distributions fitted to the hours give behind wakes, before losses; 0 without hours
	HoursMWh     float64 // and the hours themselves
}

// WindPart is one cause of the spread.
type WindPart struct {
	Title  string
	Energy float64 // share of the energy
	Shared bool    // by all sites, so that it hardly changes their order
}

// windDoubt tells the spread of the yield of a plant's turbines.
func (f *fitter) windDoubt(p windHere, hubM float64, y windYear) (*WindDoubt, error) {
	parts, err := f.windParts(p, hubM, y.wakeLoss)
	if err != nil {
		return nil, err
	}
	d := &WindDoubt{Sensitivity: y.sensitivity()}
	kind, _, _ := f.w.snap.Lookup("wind.data_kind")
	_, d.Said = f.w.snap.Explicit["wind.data_kind"]
	d.Source = kind.Value
	energy, err := parts.Energy(d.Sensitivity)
	if err != nil {
		return nil, err
	}
	for i, c := range parts {
		d.Parts = append(d.Parts, WindPart{c.Title, energy[i], c.Shared})
	}
	if d.LongTerm, err = parts.Total(d.Sensitivity); err != nil {
		return nil, err
	}
	if d.OneYear, _, _, err = f.windSpread(parts, d.Sensitivity); err != nil {
		return nil, err
	}
	get := func(name string) (v wind.Default) {
		if err == nil {
			v, err = f.w.p.Wind.Get(name)
		}
		return v
	}
	band := get(map[string]string{"mast": "sigma_one_year_mast_frac", "model": "sigma_no_mast_frac"}[d.Source])
	d.Band = [2]float64{band.Low, band.High}
	d.YearSpeed, d.Bias = get("interannual_speed_sigma_frac").Central, get("long_run_bias_frac").Central
	if err != nil {
		return nil, err
	}
	d.BetweenYears = d.YearSpeed * d.Sensitivity
	if y.hours != nil {
		d.FitMWh, d.HoursMWh = y.hours.FitMWhPerYr, y.hours.WakedMWhPerYr
	}
	d.Exceeded, err = wind.Exceedances(y.netMWh, d.LongTerm, d.BetweenYears)
	return d, err
}

// SkyYield is the yield under one model of the sky.
type SkyYield struct {
	Model     string
	KWhPerKWp float64
	Used      bool // by the results
}

// Course finds it for a candidate.
func (s *Surveyor) Course(ctx context.Context, c *Candidate) (*Course, error) {
	out := &Course{}
	every := func(v scoring.Value) *Course {
		for m := range out.Months {
			out.Months[m] = v
		}
		return out
	}
	if c.Fit == nil {
		return every(scoring.UnknownBecause(c.Status)), nil
	}
	s.mu.Lock()
	defer s.mu.Unlock()
	here, err := s.site(ctx, c)
	if err != nil {
		return nil, err
	}
	if c.Fit.WindKW > 0 {
		if err = s.turbines(ctx, c, here, out); err != nil {
			return nil, err
		}
		if out.windMonths != nil && c.Fit.SolarKW == 0 {
			for m, mwh := range out.windMonths {
				out.Months[m] = scoring.Num(mwh)
			}
			return out, nil
		}
		return every(scoring.UnknownBecause("wind_by_year_alone")), nil
	}
	f, err := s.fitted(ctx)
	if err != nil {
		return nil, err
	}
	for _, o := range s.world.options {
		if o.id != c.Plant {
			continue
		}
		y, sun, bad, err := f.yearAt(o, here)
		switch {
		case err != nil:
			return nil, err
		case sun.sunlight == nil:
			return every(scoring.UnknownBecause(sun.why)), nil
		case bad:
			return every(scoring.UnknownBecause("plant_out_of_range")), nil
		}
		mwh := c.Fit.SolarKW / units.KWhPerMWh
		out.Hours, out.Clock = &[12][24]float64{}, "solar time"
		if sun.hours != nil {
			out.Clock = sun.hours.clock()
		}
		for m := range out.Months {
			out.Months[m] = scoring.Num(y.MonthKWhPerKWp[m] * mwh)
			for h, kwh := range y.HourKWhPerKWp[m] {
				out.Hours[m][h] = kwh * mwh
			}
		}
		if out.Doubt, err = f.doubts(o, sun, y); err != nil {
			return nil, err
		}
		out.Sky, err = f.skies(o, here, sun)
		return out, err
	}
	return nil, fmt.Errorf("plant option %q: %w", c.Plant, study.ErrNotThere)
}

// ground takes the stored ground of a site, or computes it.
func (s *Surveyor) ground(ctx context.Context, rs *ruleset, here site) (groundResult, error) {
	var g groundResult
	key := rs.key(s.world, here)
	if s.cache != nil {
		have, err := s.cache.Results(ctx, groundStep, []string{key})
		if err != nil {
			return g, err
		}
		if data, ok := have[key]; ok {
			return g, unpack(data, &g)
		}
	}
	e := overlay.New()
	defer closeEngine(e)
	if err := rs.prepare(ctx, e, runtime.NumCPU(), map[string]*widened{}); err != nil {
		return g, err
	}
	return rs.compute(e, s.world, here, terrainCells{})
}

// keep adds the distances of a ruleset that reach the site, one entry for each kind of geometry.
func (o *Surroundings) keep(rs *ruleset, here site) {
	for _, r := range rs.rules {
		for _, src := range r.sources {
			if src.distM <= 0 {
				continue
			}
			byKind := map[geo.Kind]*KeptFrom{}
			for _, i := range src.layer.tree.Search(here.box.Grow(src.distM*bufferReach), nil) {
				if !src.keep[i] {
					continue
				}
				g := src.layer.src.Features[i].Geometry
				if byKind[g.Kind] == nil {
					byKind[g.Kind] = &KeptFrom{Rule: r.name, DistanceM: src.distM, Features: geo.LonLatGeometry{Kind: g.Kind}}
				}
				byKind[g.Kind].Features.Parts = append(byKind[g.Kind].Features.Parts, g.Parts...)
			}
			for _, kind := range []geo.Kind{geo.Points, geo.Lines, geo.Polygons} {
				if k := byKind[kind]; k != nil {
					o.Kept = append(o.Kept, *k)
				}
			}
		}
	}
}
