package run

import (
	"fmt"
	"math"
	"sync"

	"groundtally/geo/crs"
	"groundtally/geo/terrain"
	"groundtally/scoring/solar"
)

// lie is how a site lies to the sun, in steps: sites that lie alike share a solar year. The steps move a year's
// yield by less than 0.2 % (TestStepsOfTheLie).
type lie struct {
	slope   uint8                  // of the mean ground, in slopeStepDeg
	aspect  uint8                  // where it falls to from true north, in aspectStepDeg; 0 on level ground
	horizon [horizonAzimuths]uint8 // height over the horizontal every 5 degrees from true north, in horizonStepDeg
	notice  string                 // what is not known
}

const (
	slopeStepDeg   = 0.2
	aspectStepDeg  = 2.0
	horizonStepDeg = 0.5
)

// lie gives how a site lies. Without heights the ground counts as level and the horizon as flat, which the notice
// says.
func (f *fitter) lie(s site) (lie, error) {
	if f.wide == nil {
		return lie{notice: "horizon_flat"}, nil
	}
	f.mu.Lock()
	known, done := f.lies[s.id]
	f.mu.Unlock()
	if !done && f.kept != nil {
		if known, done = f.kept(f.lieKey(s)); done {
			f.mu.Lock()
			f.lies[s.id] = known
			f.mu.Unlock()
		}
	}
	if done {
		return known, nil
	}
	t, err := f.wide.get()
	if err != nil {
		return lie{}, err
	}
	out, err := lieOn(t, f.w.frame, s)
	if err != nil {
		return lie{}, err
	}
	f.mu.Lock()
	f.lies[s.id], f.freshLies[s.id] = out, out
	f.mu.Unlock()
	return out, nil
}

// lieEdition is raised when the digits of the step change.
const lieEdition = 1

// lieKey gives what the lie of a site depends on; empty without heights, where there is nothing to find out.
func (f *fitter) lieKey(s site) string {
	if f.wide == nil {
		return ""
	}
	k := newKey(lieStep, lieEdition)
	k.text(f.wide.rec.Digest)
	k.text(f.wide.rec.CRS)
	k.num(f.w.frame.Centre().Lon)
	k.num(f.w.frame.Centre().Lat)
	k.geometry(s.geom)
	return k.sum()
}

// bytes gives a lie as it is kept.
func (l *lie) bytes() []byte {
	return append(append([]byte{l.slope, l.aspect}, l.horizon[:]...), l.notice...)
}

// lieOf reads a lie that was kept; ok is false for anything else.
func lieOf(data []byte) (l lie, ok bool) {
	if len(data) < 2+len(l.horizon) {
		return l, false
	}
	l.slope, l.aspect, l.notice = data[0], data[1], string(data[2+len(l.horizon):])
	copy(l.horizon[:], data[2:])
	return l, true
}

func lieOn(t *terrain.Grid, frame crs.Frame, s site) (out lie, err error) {
	p := middle(s).Parts[0][0][0]
	if _, ok := t.Sample(p); !ok {
		return lie{notice: "horizon_flat"}, nil
	}
	turn, err := frame.ConvergenceDeg(p)
	if err != nil {
		return lie{}, err
	}
	angles, known, err := t.Horizon(p, eyeM, horizonAzimuths, horizonReachM)
	if err != nil {
		return lie{}, siteError(s, err)
	}
	for i := range angles {
		if known[i] < 1 {
			// Beyond the heights that are known, the land counts as no higher than what is seen of it.
			out.notice = "horizon_partly"
		}
		if !(angles[i] > 0) || known[i] == 0 {
			angles[i] = 0
		}
	}
	h, err := solar.NewHorizon(angles)
	if err != nil {
		return lie{}, siteError(s, err)
	}
	for i := range out.horizon {
		out.horizon[i] = uint8(math.Round(h.HeightDeg(float64(i)*360/horizonAzimuths-turn) / horizonStepDeg))
	}
	sum, err := t.Over(s.geom, 90)
	if err != nil {
		return lie{}, siteError(s, err)
	}
	if sum.HasSlope && sum.HasAspect {
		// Where the ground falls several ways, the mean ground is less steep than its parts.
		slope := math.Atan(math.Tan(sum.MeanSlopeDeg*math.Pi/180)*sum.AspectLength) * 180 / math.Pi
		if out.slope = uint8(math.Round(min(slope, mostSlopeDeg) / slopeStepDeg)); out.slope > 0 {
			a, err := frame.TrueAzimuthDeg(p, sum.MeanAspectDeg)
			if err != nil {
				return lie{}, err
			}
			out.aspect = uint8(int(math.Round(a/aspectStepDeg)) % (360 / aspectStepDeg))
		}
	}
	return out, nil
}

// mostSlopeDeg is the steepest ground that the engine takes.
const mostSlopeDeg = 45

// on lays a plant on the ground.
func (l *lie) on(m *solar.Mount) error {
	m.SlopeDeg, m.AspectDeg = float64(l.slope)*slopeStepDeg, float64(l.aspect)*aspectStepDeg
	spaced(m)
	if l.notice == "horizon_flat" {
		return nil
	}
	heights := make([]float64, len(l.horizon))
	for i, h := range l.horizon {
		heights[i] = float64(h) * horizonStepDeg
	}
	var err error
	m.Horizon, err = solar.NewHorizon(heights)
	return err
}

// spaced sets the distance between fixed rows to what the slope asks; trackers turn back instead, and upright rows
// keep theirs.
func spaced(m *solar.Mount) {
	if m.GCR > 0 && m.WidthM > 0 && (m.Kind == solar.FixedTilt || m.Kind == solar.Elevated) {
		m.GCR = m.WidthM / solar.PitchOnSlope(m.WidthM/m.GCR, m.WidthM, m.TiltDeg, m.AzimuthDeg, m.SlopeDeg, m.AspectDeg)
	}
}

// Solar years and climates that are kept at a time.
const (
	mostYears    = 16384
	mostClimates = 512
)

// solarYear is the year of a plant.
type solarYear struct {
	y   solar.YearResult
	bad bool   // a setting of the plant is out of range
	why string // the numbers of grids are no sunlight
}

// yearYield is what fit and connection read of a year: small, so that the years of a district stay at hand.
type yearYield struct {
	kWhPerKWp, performance float64
	groundLight            float64 // between the rows, as a share of that on open ground
	chain                  []solar.Step
	powerHours             [solar.PowerBins]float64
	bad                    bool
	why                    string
}

func (y *solarYear) yield() *yearYield {
	out := &yearYield{kWhPerKWp: y.y.SpecificYieldKWhPerKWp, performance: y.y.PerformanceRatio, chain: y.y.Chain, powerHours: y.y.PowerHours, bad: y.bad, why: y.why}
	var ground, open float64
	for i := range 12 {
		ground += y.y.GroundKWhPerM2[i]
		open += y.y.GHIKWhPerM2[i]
	}
	out.groundLight = ground / open
	return out
}

// sunYears are the years of one computation, with those of the computation before.
type sunYears struct {
	mu          sync.Mutex
	now, before map[digest]*yearYield
}

// after begins the years of the next computation.
func (y *sunYears) after() *sunYears {
	out := &sunYears{now: map[digest]*yearYield{}}
	if y != nil {
		out.before = y.now
	}
	return out
}

// settled gives the years for the results: those of the computation before that it did not meet as well, while there is
// room, since it looked only at what had changed.
func (y *sunYears) settled() *sunYears {
	for k, one := range y.before {
		if _, met := y.now[k]; !met && len(y.now) < mostYears {
			y.now[k] = one
		}
	}
	y.before = nil
	return y
}

// of gives a year, computed once.
func (y *sunYears) of(key digest, find func() *yearYield) *yearYield {
	y.mu.Lock()
	one := y.now[key]
	if one == nil {
		one = y.before[key]
	}
	y.mu.Unlock()
	if one == nil {
		one = find()
	}
	y.mu.Lock()
	defer y.mu.Unlock()
	if len(y.now) < mostYears {
		y.now[key] = one
	}
	return one
}

// yieldAt gives what a fit reads of the solar year of an option on a site with the sunlight that serves it. bad says
// that a setting of the plant is out of range.
func (f *fitter) yieldAt(o option, s site) (y *yearYield, here sunHere, bad bool, err error) {
	here, lat, l, err := f.underSun(o, s)
	if err != nil || here.sunlight == nil {
		return nil, here, false, err
	}
	k := newKey("solar year", 4)
	k.text(f.w.p.Digest)
	k.num(f.w.frame.Centre().Lon)
	o.key(k)
	k.num(lat)
	k.text(f.sunKey)
	k.sunlight(here.sunlight)
	if here.hours != nil {
		k.text(here.hours.key)
	}
	if o.findsStand() {
		found, err := f.found(o)
		if err != nil {
			return nil, here, false, err
		}
		k.num(found.tiltDeg)
		k.num(found.azimuthDeg)
	}
	k.int(int(f.sky()))
	k.int(int(l.slope))
	k.int(int(l.aspect))
	k.text(l.notice)
	k.text(string(l.horizon[:]))
	y = f.years.of(k.d.Raw(), func() *yearYield {
		full := f.year(o, lat, here, &l, f.sky())
		return full.yield()
	})
	if y.why != "" {
		return nil, sunHere{why: y.why}, false, nil
	}
	return y, here, y.bad, nil
}

// yearAt gives the whole year of which yieldAt gives a part.
func (f *fitter) yearAt(o option, s site) (y solar.YearResult, here sunHere, bad bool, err error) {
	here, lat, l, err := f.underSun(o, s)
	if err != nil || here.sunlight == nil {
		return y, here, false, err
	}
	full := f.year(o, lat, here, &l, f.sky())
	if full.why != "" {
		return y, sunHere{why: full.why}, false, nil
	}
	return full.y, here, full.bad, nil
}

// underSun gives what a solar year depends on besides settings: the sunlight, the latitude, how the site lies.
func (f *fitter) underSun(o option, s site) (here sunHere, latDeg float64, l lie, err error) {
	if here, err = f.sunAt(s); err != nil || here.sunlight == nil {
		return here, 0, l, err
	}
	if latDeg, err = f.siteLat(s); err != nil {
		return here, 0, l, err
	}
	l, err = f.lie(s)
	return here, latDeg, l, err
}

// skyModels are the ways to bring the sky's light onto the panels, by the words of the setting.
var skyModels = map[string]solar.SkyModel{"Hay-Davies": solar.HayDavies, "isotropic": solar.Isotropic, "Perez": solar.Perez}

// sky gives the model of the study.
func (f *fitter) sky() solar.SkyModel {
	v, _, _ := f.w.snap.Lookup("solar.sky_model")
	return skyModels[v.Value]
}

// skies gives the yield of an option on a site under each model.
func (f *fitter) skies(o option, s site, here sunHere) ([]SkyYield, error) {
	lat, err := f.siteLat(s)
	if err != nil {
		return nil, err
	}
	l, err := f.lie(s)
	if err != nil {
		return nil, err
	}
	var out []SkyYield
	for _, m := range []solar.SkyModel{solar.Isotropic, solar.HayDavies, solar.Perez} {
		y := f.year(o, lat, here, &l, m)
		if y.bad || y.why != "" {
			return nil, nil // as the year itself
		}
		out = append(out, SkyYield{m.String(), y.y.SpecificYieldKWhPerKWp, m == f.sky()})
	}
	return out, nil
}

func (f *fitter) year(o option, latDeg float64, s sunHere, l *lie, sky solar.SkyModel) solarYear {
	c, p, why, ok := f.under(o, latDeg, s, l, sky)
	if !ok {
		return solarYear{why: why, bad: why == ""}
	}
	y, err := c.Yield(p)
	return solarYear{y: y, bad: err != nil}
}

// under gives the climate of the sunlight that serves a site, and the plant as it lies there. Without them ok is false,
// and why is empty where a setting of the plant is out of range.
func (f *fitter) under(o option, latDeg float64, s sunHere, l *lie, sky solar.SkyModel) (c *solar.Climate, p solar.Plant, why string, ok bool) {
	c, why, err := f.climateOf(latDeg, s)
	if err != nil {
		return nil, p, why, false
	}
	if p, err = f.plant(o, latDeg); err != nil {
		return nil, p, "", false
	}
	if err := l.on(&p.Mount); err != nil {
		return nil, p, "", false
	}
	p.Sky = sky
	f.monthlyLosses(s.sunlight, &p.Losses)
	return c, p, "", true
}

// climateOf gives the climate of the sunlight that serves a site; why says in words what an error means.
func (f *fitter) climateOf(latDeg float64, s sunHere) (c *solar.Climate, why string, err error) {
	if s.hours != nil {
		return s.hours.climate, "", nil
	}
	if c, err = f.climate(latDeg, s.sunlight); err != nil {
		return nil, fmt.Sprintf("what stands at the site in the %s is no sunlight: %v", s.sunlight.source, err), err
	}
	return c, "", nil
}

// climate gives the sunlight spread over the hours of a latitude.
func (f *fitter) climate(latDeg float64, s *sunlight) (*solar.Climate, error) {
	k := newKey("solar climate", 1)
	k.num(latDeg)
	k.sunlight(s)
	key := k.sum()
	f.mu.Lock()
	c, done := f.climates[key]
	f.mu.Unlock()
	if done {
		return c, nil
	}
	c, err := solar.NewClimate(solar.ClimateInput{LatDeg: latDeg, LonDeg: f.w.frame.Centre().Lon, GHIKWhPerM2: s.ghi, DHIKWhPerM2: s.dhi, TempC: s.temp, Albedo: s.albedo})
	if err != nil {
		return nil, err
	}
	f.mu.Lock()
	if len(f.climates) >= mostClimates {
		clear(f.climates)
	}
	f.climates[key] = c
	f.mu.Unlock()
	return c, nil
}
