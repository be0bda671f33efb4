package run

import (
	"cmp"
	"errors"
	"fmt"
	"math"
	"slices"
	"strings"

	"groundtally/app/study"
	"groundtally/assets/citedtable"
	"groundtally/geo"
	"groundtally/geo/measure"
	"groundtally/scoring/units"
	"groundtally/scoring/wind"
)

// mostMachines is the number of machines that fill a site where the study says nothing else.
const mostMachines = 25

// fitFill is the way to fit that takes all the ground there is.
const fitFill = "fill"

// wakeModels are the shapes of a wake by the words of the setting.
var wakeModels = map[string]wind.WakeModel{"Gaussian": wind.WakeGaussian, "top hat": wind.WakeJensen}

// windSettings digests the settings that a fit reads of wind.
func windSettings(snap *study.Snapshot) string { return settingsOf(snap, "settings of wind", "wind.") }

// settingsOf digests the settings that begin so.
func settingsOf(snap *study.Snapshot, name string, begin ...string) string {
	k := newKey(name, 1)
	for _, key := range snap.Keys() {
		if !slices.ContainsFunc(begin, func(b string) bool { return strings.HasPrefix(key, b) }) {
			continue
		}
		if s, _, ok := snap.Lookup(key); ok {
			k.text(key)
			k.text(s.Value)
		}
	}
	return k.sum()
}

// farm gives a plant's turbines to the wind engine, but for their places and neighbours.
func (f *fitter) farm(machine wind.Turbine, hubM float64, p windHere, s site) (wind.FarmInput, error) {
	in := p.wind
	var known bool
	var err error
	if in.ElevationM, known, err = f.w.heightM(s.box.Centre()); err != nil {
		return wind.FarmInput{}, err
	}
	if !known {
		// Sea level unless a height is typed, which the notices say.
		in.ElevationM, _ = f.w.snap.Number("wind.typed_elevation_m")
	}
	set, err := f.wakeSettings()
	if err != nil {
		return wind.FarmInput{}, err
	}
	losses, err := f.windLosses(machine.RatedKW)
	if err != nil {
		return wind.FarmInput{}, err
	}
	return wind.FarmInput{
		Site:    in,
		Turbine: machine, HubHeightM: hubM, Settings: set, Losses: losses,
	}, nil
}

// wakeSettings gives the way that wakes are computed.
func (f *fitter) wakeSettings() (wind.Settings, error) {
	set, err := f.w.p.Wind.Settings()
	if err != nil {
		return set, err
	}
	model, _, _ := f.w.snap.Lookup("wind.wake_model")
	set.Wake = wakeModels[model.Value]
	if x, ok := f.w.snap.Number("wind.turbulence_frac"); ok {
		set.AmbientTIFrac = x
	}
	if x, ok := f.w.snap.Number("wind.wake_decay"); ok {
		set.JensenK = x
	}
	return set, nil
}

// windLosses gives the losses behind the wakes: as set, else as shipped.
func (f *fitter) windLosses(ratedKW float64) ([]wind.Loss, error) {
	losses, err := f.w.p.Wind.Losses(ratedKW)
	if err != nil {
		return nil, err
	}
	for i := range losses {
		l := &losses[i]
		key := "wind." + l.Name + "_frac"
		if l.Name == wind.LossCurtailment {
			key, l.Frac = "wind.stops_frac", 0 // what the grid does not take is reckoned at the connection
		}
		if x, ok := f.w.snap.Number(key); ok {
			l.Frac = x
		}
	}
	return losses, nil
}

// mostWindPoints is the number of points that have a say at a place. Source: assumption of this program.
const mostWindPoints = 4

// windBetween gives the wind at a place: of the nearest points, of those with the height and the sectors of the
// nearest one, each weighted by the inverse square of its distance (Shepard 1968). By sector, the shares of time are
// averaged; the mean speed and the shape as well, weighted by time.
func windBetween(points []windPoint, at geo.XY) (p windPoint, distM float64, used int) {
	near := slices.Clone(points)
	slices.SortStableFunc(near, func(a, b windPoint) int { return cmp.Compare(a.at.Dist(at), b.at.Dist(at)) })
	if len(near) == 0 {
		return windPoint{}, 0, 0
	}
	first := near[0]
	distM = first.at.Dist(at)
	near = slices.DeleteFunc(near, func(q windPoint) bool {
		return q.heightM != first.heightM || len(q.sectors) != len(first.sectors) || q.typed != first.typed
	})
	near = near[:min(len(near), mostWindPoints)]
	if len(near) == 1 {
		return first, distM, 1
	}
	weights, total := make([]float64, len(near)), 0.0
	for i, q := range near {
		d := math.Max(1, q.at.Dist(at))
		weights[i] = 1 / float64(d*d)
		total += weights[i]
	}
	p = first
	p.sectors = make([]wind.Sector, len(first.sectors))
	for n := range p.sectors {
		var time, speed, shape float64
		for i, q := range near {
			sec := q.sectors[n]
			w := float64(weights[i] / total * sec.FrequencyFrac)
			if w == 0 {
				continue
			}
			time += w
			speed += float64(w * sec.Weibull.Mean())
			shape += float64(w * sec.Weibull.K)
		}
		if time == 0 {
			continue
		}
		wb, err := wind.FromMeanAndK(speed/time, shape/time)
		if err != nil {
			return first, distM, 1 // a mean of distributions that can be is one
		}
		p.sectors[n] = wind.Sector{FrequencyFrac: time, Weibull: wb}
	}
	return p, distM, len(near)
}

// windNear is windBetween, found once for a place.
func (f *fitter) windNear(at geo.XY) (p windPoint, distM float64, used int) {
	f.mu.Lock()
	one, done := f.winds[at]
	f.mu.Unlock()
	if !done {
		one.windPoint, one.distM, one.used = windBetween(f.wind, at)
		f.mu.Lock()
		f.winds[at] = one
		f.mu.Unlock()
	}
	return one.windPoint, one.distM, one.used
}

// served says in words which points serve a place.
func (p windPoint) served(distM float64, used int) string {
	if used > 1 {
		return fmt.Sprintf("wind yield from %d points of %s, weighted by the inverse square of their distances; the nearest lies %.1f km off", used, p.layer, distM/units.MPerKm)
	}
	return fmt.Sprintf("wind yield from the point of %s, %.0f m off", p.id, distM)
}

// What limits the number of machines of a plant.
const (
	askedSetting = "setting"
	askedPower   = "power"
	askedSpare   = "spare capacity"
	askedUsual   = "usual limit"
)

// carried gives the number of machines that the nearest spare capacity carries, one at least and mostMachines at most.
func (f *fitter) carried(s site, ratedKW float64) (n int, by string) {
	kw, _, known := f.spare(s)
	if !known {
		return mostMachines, askedUsual
	}
	if n = max(1, int(math.Floor(kw/ratedKW+1e-9))); n < mostMachines {
		return n, askedSpare
	}
	return mostMachines, askedUsual
}

// roughClass is a roughness length with the words by which ground is of its class.
type roughClass struct {
	words []string
	z0M   float64
}

func roughnessOf(t *citedtable.Table) ([]roughClass, error) {
	var out []roughClass
	for _, r := range t.Rows {
		z0, err := r.Float("z0_m")
		if err != nil {
			return nil, err
		}
		c := roughClass{words: strings.Split(r.Text("words"), "|"), z0M: z0}
		if slices.Contains(c.words, "") || !(z0 > 0) {
			return nil, fmt.Errorf("cited table %s, line %d: words and a length above 0 are needed", t.Name, r.Line)
		}
		out = append(out, c)
	}
	return out, nil
}

// The ground that gives a site its roughness. Source: assumption of this program.
const (
	roughReachM = 3000
	roughStepM  = 250
	roughShare  = 0.5 // of it must be known
)

// rough is the roughness around a site.
type rough struct {
	z0M    float64
	source string
	known  bool
}

// roughness gives the roughness length around a site: the logarithmic mean over the land cover within 3 km, read every
// 250 m, else the typed one.
func (f *fitter) roughness(s site) rough {
	f.mu.Lock()
	r, done := f.roughs[s.id]
	f.mu.Unlock()
	if done {
		return r
	}
	if r = f.w.roughCover(s.box.Centre()); !r.known {
		if x, ok := f.w.snap.Number("wind.roughness_m"); ok {
			r = rough{x, fmt.Sprintf("the typed roughness of %g m", x), true}
		}
	}
	f.mu.Lock()
	f.roughs[s.id] = r
	f.mu.Unlock()
	return r
}

func (w *world) roughCover(at geo.XY) rough {
	ls := w.byRole["land_cover"]
	if len(ls) == 0 {
		return rough{}
	}
	all, known, sum := 0, 0, 0.0
	var buf []int
	for y := -roughReachM; y <= roughReachM; y += roughStepM {
		for x := -roughReachM; x <= roughReachM; x += roughStepM {
			if x*x+y*y > roughReachM*roughReachM {
				continue
			}
			all++
			p := geo.XY{X: at.X + float64(x), Y: at.Y + float64(y)}
			if z0 := w.coverAt(ls, p, &buf); z0 > 0 {
				known++
				sum += math.Log(z0)
			}
		}
	}
	if known == 0 || float64(known) < roughShare*float64(all) {
		return rough{}
	}
	z0 := math.Exp(sum / float64(known))
	return rough{z0, fmt.Sprintf("the roughness of %.2g m of the land cover within %g km (%s, known of %d %%)", z0, roughReachM/units.MPerKm, layerNames(ls), 100*known/all), true}
}

// coverAt gives the roughness length at a place; 0 where its cover or its class is not known.
func (w *world) coverAt(ls []*layer, p geo.XY, buf *[]int) float64 {
	for _, l := range ls {
		*buf = l.tree.Search(geo.EmptyExtent().Add(p), (*buf)[:0])
		slices.Sort(*buf)
		for _, i := range *buf {
			if l.xy[i].Kind != geo.Polygons || !measure.Inside(p, l.xy[i]) {
				continue
			}
			for _, c := range w.p.roughness {
				if hasWord(l.text(i, "class"), c.words...) {
					return c.z0M
				}
			}
		}
	}
	return 0
}

// withShear adds the law that carries the wind from its height to the hub.
func (f *fitter) withShear(p windHere, hubM float64, s site) (windHere, error) {
	p.wind = wind.Site{Rose: p.sectors, RefHeightM: p.heightM}
	if !f.byLog() {
		alpha, ok := f.w.snap.Number("wind.shear_alpha")
		if !ok {
			return p, errors.New("wind.shear_alpha is not set")
		}
		p.wind.ShearAlpha = alpha
		return p, nil
	}
	r := f.roughness(s)
	if !r.known {
		return windHere{why: "not_set:wind.roughness_m"}, nil
	}
	p.wind.RoughnessM = r.z0M
	p.wind.DisplacementM, _ = f.w.snap.Number("wind.displacement_m")
	if _, err := wind.LogLaw(1, p.heightM, hubM, r.z0M, p.wind.DisplacementM); err != nil {
		return windHere{why: fmt.Sprintf("the logarithmic law does not hold from %g m to %g m over %s: %v", p.heightM, hubM, r.source, err)}, nil
	}
	p.source = strings.TrimPrefix(p.source+"; carried to hub height by the logarithmic law over "+r.source, "; ")
	return p, nil
}

// byLog reports whether the study carries the wind to hub height by the logarithmic law.
func (f *fitter) byLog() bool {
	v, _, _ := f.w.snap.Lookup("wind.profile")
	return v.Value == "log law"
}

// turbine finds the machine of an option: one of the user's or a reference curve by name, else the generic curve for
// its power and rotor.
func (f *fitter) turbine(o option, ratedKW, rotorM float64) (wind.Turbine, error) {
	id := o.settings["turbine"]
	if id == "" || id == study.NotSetText {
		t, err := f.w.generic(ratedKW, rotorM)
		if err != nil {
			return t, fmt.Errorf("plant option %q: %w", o.id, err)
		}
		return t, nil
	}
	var t wind.Turbine
	var err error
	if own, there := f.w.snap.Turbine(id); there {
		t, err = f.own(own)
	} else {
		t, err = wind.FindTurbine(f.w.p.Turbines, id)
	}
	if err != nil {
		return t, fmt.Errorf("plant option %q: %w", o.id, err)
	}
	if math.Abs(t.RatedKW-ratedKW) > 0.02*t.RatedKW || math.Abs(t.RotorDiameterM-rotorM) > 0.02*t.RotorDiameterM {
		return t, fmt.Errorf("plant option %q: the curve %s is for %g kW and a rotor of %g m, the option says %g kW and %g m; take a curve that fits or set plant.%s.turbine to \"not set\" for the generic curve",
			o.id, id, t.RatedKW, t.RotorDiameterM, ratedKW, rotorM, o.id)
	}
	return t, nil
}

// own gives a machine of the user, made once.
func (f *fitter) own(t study.OwnTurbine) (wind.Turbine, error) {
	f.mu.Lock()
	defer f.mu.Unlock()
	if m, done := f.machines[t.ID]; done {
		return m, nil
	}
	m, err := t.Machine()
	if err == nil {
		f.machines[t.ID] = m
	}
	return m, err
}

// keyOwn writes what the user brings to the wind part of a plant: the curve of its machine, turbines placed by hand.
func (f *fitter) keyOwn(k *keyer, o option, s site) {
	if t, there := f.w.snap.Turbine(o.settings["turbine"]); there {
		k.text("own turbine")
		k.bytes(study.Canonical(t))
	}
	if l, there := f.w.snap.Layout(s.id, o.id); there {
		k.text("placed by hand")
		k.bytes(study.Canonical(l))
	}
}
