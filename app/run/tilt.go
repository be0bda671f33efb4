package run

import (
	"cmp"
	"math"
	"slices"

	"groundtally/scoring/solar"
)

// mostTiltDeg is the steepest tilt that is tried. Source: common practice; steeper rows stand upright.
const mostTiltDeg = 70

// plant gives the solar plant of an option at a latitude, with its tilt found where that is asked.
func (f *fitter) plant(o option, latDeg float64) (solar.Plant, error) {
	p, err := f.w.solarPlant(o, latDeg)
	if err == nil && o.findsTilt() {
		var tilt float64
		if tilt, err = f.foundTilt(o); err == nil {
			p.Mount.TiltDeg = tilt
		}
	}
	return p, err
}

// findsTilt reports whether an option asks for the tilt with the most energy.
func (o option) findsTilt() bool {
	return o.settings["tilt_rule"] == "most energy" && (o.technology == "solar_fixed" || o.technology == "solar_agri" || o.technology == "wind_solar")
}

// tiltDeg gives the tilt of fixed panels, found or set.
func (f *fitter) tiltDeg(o option) (float64, error) {
	if o.findsTilt() {
		return f.foundTilt(o)
	}
	tilt, _ := o.num("tilt_deg")
	return tilt, nil
}

// foundTilt finds the tilt with the most energy on level ground behind a flat horizon, under the sunlight of the site
// nearest to the middle of the district of those whose sunlight is known; the tilt set where none is.
func (f *fitter) foundTilt(o option) (float64, error) {
	f.tiltMu.Lock()
	defer f.tiltMu.Unlock()
	if tilt, done := f.tilts[o.id]; done {
		return tilt, nil
	}
	tilt, _ := o.num("tilt_deg")
	for _, s := range f.w.fromTheMiddle() {
		lat, err := f.siteLat(s)
		if err != nil {
			return 0, err
		}
		here, err := f.sunAt(s)
		if err != nil {
			return 0, err
		}
		if here.sunlight == nil {
			continue
		}
		c, _, err := f.climateOf(lat, here)
		if err != nil {
			continue // what stands there is no sunlight, and the site says so
		}
		p, err := f.w.solarPlant(o, lat)
		if err != nil {
			break // the option is out of range, and every site says so
		}
		f.monthlyLosses(here.sunlight, &p.Losses)
		p.Sky = f.sky()
		if curve, best, err := c.TiltCurve(p, 1, mostTiltDeg); err == nil {
			tilt = curve[best].TiltDeg
		}
		break
	}
	f.tilts[o.id] = tilt
	return tilt, nil
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
