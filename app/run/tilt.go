package run

import (
	"math"

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
// that is nearest to the middle of the district; the tilt set where no sunlight is known.
func (f *fitter) foundTilt(o option) (float64, error) {
	f.mu.Lock()
	tilt, done := f.tilts[o.id]
	f.mu.Unlock()
	if done {
		return tilt, nil
	}
	tilt, _ = o.num("tilt_deg")
	if s, ok := f.w.middleSite(); ok {
		lat, err := f.siteLat(s)
		if err != nil {
			return 0, err
		}
		here, err := f.sunAt(s)
		if err != nil {
			return 0, err
		}
		if here.sunlight != nil {
			p, perr := f.w.solarPlant(o, lat)
			c, _, _ := f.climateOf(lat, here)
			if perr == nil && c != nil {
				f.monthlyLosses(here.sunlight, &p.Losses)
				p.Sky = f.sky()
				if curve, best, err := c.TiltCurve(p, 1, mostTiltDeg); err == nil {
					tilt = curve[best].TiltDeg
				}
			}
		}
	}
	f.mu.Lock()
	f.tilts[o.id] = tilt
	f.mu.Unlock()
	return tilt, nil
}

// middleSite gives the site nearest to the middle of the frame, the first of equals.
func (w *world) middleSite() (site, bool) {
	best, at := math.Inf(1), -1
	for i, s := range w.sites {
		c := s.box.Centre()
		if d := math.Hypot(c.X, c.Y); d < best {
			best, at = d, i
		}
	}
	if at < 0 {
		return site{}, false
	}
	return w.sites[at], true
}
