package run

import (
	"cmp"
	"math"
	"slices"

	"groundtally/scoring/solar"
)

// mostTiltDeg is the steepest tilt that is tried. Source: common practice; steeper rows stand upright.
const mostTiltDeg = 70

// How the direction is looked for. Source: assumption of this program; sunlight by the hour seldom moves the best by
// more.
const (
	mostTurnDeg = 40 // from the equator
	turnStepDeg = 5
)

// stand is how fixed panels stand.
type stand struct{ tiltDeg, azimuthDeg float64 }

// plant gives the solar plant of an option at a latitude, with its stand found where that is asked.
func (f *fitter) plant(o option, latDeg float64) (solar.Plant, error) {
	p, err := f.w.solarPlant(o, latDeg)
	if err == nil && o.findsStand() {
		var found stand
		if found, err = f.found(o); err == nil {
			p.Mount.TiltDeg, p.Mount.AzimuthDeg = found.tiltDeg, found.azimuthDeg
		}
	}
	return p, err
}

// findsStand reports whether an option asks for the stand with the most energy.
func (o option) findsStand() bool {
	return o.settings["tilt_rule"] == "most energy" && (o.technology == "solar_fixed" || o.technology == "solar_agri" || o.technology == "wind_solar")
}

// tiltDeg gives the tilt of fixed panels, found or set.
func (f *fitter) tiltDeg(o option) (float64, error) {
	if o.findsStand() {
		s, err := f.found(o)
		return s.tiltDeg, err
	}
	tilt, _ := o.num("tilt_deg")
	return tilt, nil
}

// found finds tilt and direction with the most energy on level ground behind a flat horizon, under the sunlight of the
// site nearest to the middle of the district of those whose sunlight is known; a direction that is set stays, and so
// does everything where no sunlight is known.
func (f *fitter) found(o option) (stand, error) {
	f.standMu.Lock()
	defer f.standMu.Unlock()
	if s, done := f.stands[o.id]; done {
		return s, nil
	}
	var out stand
	for i, s := range f.w.fromTheMiddle() {
		lat, err := f.siteLat(s)
		if err != nil {
			return out, err
		}
		p, err := f.w.solarPlant(o, lat)
		if err != nil {
			break // the option is out of range, and every site says so
		}
		if i == 0 {
			out = stand{p.Mount.TiltDeg, p.Mount.AzimuthDeg}
		}
		here, err := f.sunAt(s)
		if err != nil {
			return out, err
		}
		if here.sunlight == nil {
			continue
		}
		c, _, err := f.climateOf(lat, here)
		if err != nil {
			continue // what stands there is no sunlight, and the site says so
		}
		f.monthlyLosses(here.sunlight, &p.Losses)
		p.Sky = f.sky()
		_, turned := o.num("azimuth_deg")
		out = bestStand(c, p, !turned)
		break
	}
	f.stands[o.id] = out
	return out, nil
}

// bestStand gives the whole degree of tilt that yields most, and with turn the direction that does then, in steps from
// the equator; of equals the flattest, and the nearest to the equator. A plant that cannot be reckoned stays as it is.
func bestStand(c *solar.Climate, p solar.Plant, turn bool) stand {
	tilted := func(azimuthDeg float64) (stand, float64) {
		p.Mount.AzimuthDeg = azimuthDeg
		curve, best, err := c.TiltCurve(p, 1, mostTiltDeg)
		if err != nil {
			return stand{p.Mount.TiltDeg, azimuthDeg}, 0
		}
		return stand{curve[best].TiltDeg, azimuthDeg}, curve[best].YieldKWhPerKWp
	}
	equator := p.Mount.AzimuthDeg
	best, most := tilted(equator)
	if !turn || most == 0 {
		return best
	}
	p.Mount.TiltDeg = best.tiltDeg
	at := equator
	for by := float64(turnStepDeg); by <= mostTurnDeg; by += turnStepDeg {
		for _, side := range []float64{-by, by} {
			p.Mount.AzimuthDeg = equator + side
			if y, err := c.Yield(p); err == nil && y.SpecificYieldKWhPerKWp > most*(1+1e-9) {
				at, most = equator+side, y.SpecificYieldKWhPerKWp
			}
		}
	}
	if at != equator {
		best, _ = tilted(at)
	}
	return best
}

// fromTheMiddle gives the sites by the distance of their middles from that of the frame.
func (w *world) fromTheMiddle() []site {
	out := slices.Clone(w.sites)
	far := func(s site) float64 {
		c := s.box.Centre()
		return math.Hypot(c.X, c.Y)
	}
	slices.SortStableFunc(out, func(a, b site) int { return cmp.Compare(far(a), far(b)) })
	return out
}
