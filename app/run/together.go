package run

import (
	"math"

	"groundtally/scoring/grid"
	"groundtally/scoring/units"
)

// Together is what wind and sun of one plant need and deliver behind one connection, by the hours of a file. Energies
// are of the typical year, before the losses of the connection.
type Together struct {
	WindMWh      float64         `json:"wind_mwh"`
	SolarMWh     float64         `json:"solar_mwh"`
	PeakKW       float64         `json:"peak_kw"`         // greatest hour of both
	PeaksKW      float64         `json:"sum_of_peaks_kw"` // greatest hour of each, added
	SavedKW      float64         `json:"saved_kw"`        // connection that the two need less than one by one
	LosingFrac   float64         `json:"losing_frac"`     // of the energy, that a smaller connection may cut off
	LosingKW     float64         `json:"losing_kw"`       // the connection that cuts off so much of both
	LosingEachKW float64         `json:"losing_each_kw"`  // those that cut off so much of each, added
	Correlation  *float64        `json:"correlation,omitempty"`
	HoursKnown   float64         `json:"hours_known"`
	HoursUnknown float64         `json:"hours_unknown,omitempty"`
	Limits       []TogetherLimit `json:"limits"` // what may flow first, then shares of the power at the terminals
}

// TogetherLimit is what one size of the connection delivers.
type TogetherLimit struct {
	LimitKW      float64 `json:"limit_kw"`
	CurtailedMWh float64 `json:"curtailed_mwh"`
	WindCutMWh   float64 `json:"wind_cut_mwh"`
	SolarCutMWh  float64 `json:"solar_cut_mwh"`
	HoursAtLimit float64 `json:"hours_at_limit"`
	FullFrac     float64 `json:"full_frac"`       // of what the limit could carry in a year
	AloneFrac    float64 `json:"wind_alone_frac"` // the same with the wind alone
}

// togetherShares are the sizes of the connection that are told besides what may flow, as shares of the power at the
// terminals.
var togetherShares = []float64{0.8, 0.6, 0.4}

// together reckons what comes of wind and sun through limitKW; nil where there are no hours of both.
func together(power *powerHours, s site, r fitResult, limitKW float64) (*Together, error) {
	if power == nil || len(power.parts) < 2 {
		return nil, nil
	}
	parts, step := power.parts, power.stepH
	ac := r.WindKW + r.SolarACKW
	limits := []float64{math.Min(limitKW, ac)}
	for _, share := range togetherShares {
		limits = append(limits, share*ac)
	}
	if !(limits[0] > 0) {
		return nil, nil
	}
	js, err := grid.CurtailmentCurve(parts, limits, step)
	if err != nil {
		return nil, siteError(s, err)
	}
	j := js[0]
	out := &Together{WindMWh: j.Parts[0].EnergyMWh, SolarMWh: j.Parts[1].EnergyMWh, PeakKW: j.PeakKW, PeaksKW: j.SumOfPeaksKW, SavedKW: j.SavedKW, HoursKnown: j.KnownHours, HoursUnknown: j.UnknownHours}
	if j.Correlation.Known {
		out.Correlation = &j.Correlation.Value
	}
	out.LosingFrac = losingFrac
	if out.LosingKW, err = losing(parts, ac, step); err != nil {
		return nil, siteError(s, err)
	}
	for i, kw := range []float64{r.WindKW, r.SolarACKW} {
		one, err := losing(parts[i:i+1], kw, step)
		if err != nil {
			return nil, siteError(s, err)
		}
		out.LosingEachKW += one
	}
	for _, j := range js {
		out.Limits = append(out.Limits, TogetherLimit{LimitKW: j.LimitKW, CurtailedMWh: j.CurtailedMWh, WindCutMWh: j.Parts[0].CutMWh, SolarCutMWh: j.Parts[1].CutMWh, HoursAtLimit: j.HoursAtLimit, FullFrac: j.FullFrac, AloneFrac: j.Parts[0].AloneFullFrac})
	}
	return out, nil
}

// losingFrac is the share of the energy that a connection may cut off when the saved one is told. Source: assumption of
// this program.
const losingFrac = 0.01

// losing gives the connection that cuts off losingFrac of what parts of ratedKW together give: linear between
// hundredths of the rating.
func losing(parts [][]float64, ratedKW, hoursPerValue float64) (float64, error) {
	const steps = 100
	limits := make([]float64, steps)
	for i := range limits {
		limits[i] = ratedKW * float64(i+1) / steps
	}
	js, err := grid.CurtailmentCurve(parts, limits, hoursPerValue)
	if err != nil {
		return 0, err
	}
	for i := steps - 1; i >= 0; i-- {
		if js[i].CurtailedFrac <= losingFrac {
			continue
		}
		if i == steps-1 {
			return ratedKW, nil
		}
		a, b := js[i].CurtailedFrac, js[i+1].CurtailedFrac
		return limits[i] + float64((limits[i+1]-limits[i])*(a-losingFrac))/(a-b), nil
	}
	return limits[0], nil
}

// hoursOfWind reports whether the study has hours of wind that can be read.
func (f *fitter) hoursOfWind() bool { return f.blowing != nil && f.blowing.why == "" }

// hoursOfSun reports the same of sunlight.
func (f *fitter) hoursOfSun() bool { return f.hours != nil && f.hours.climate != nil }

// share gives the part of the energy that is cut off by what may flow.
func (t *Together) share() float64 {
	return t.Limits[0].CurtailedMWh / (t.WindMWh + t.SolarMWh)
}

// sunByHours gives the power of a kilowatt of panels by the intervals of the hours.
func (f *fitter) sunByHours(o option, s site) (kw []float64, ok bool, err error) {
	here, lat, l, err := f.underSun(o, s)
	if err != nil || here.hours == nil {
		return nil, false, err
	}
	c, p, _, good := f.under(o, lat, here, &l, f.sky())
	if !good {
		return nil, false, nil
	}
	kw, err = c.PowerSeries(p)
	return kw, err == nil, err
}

// windByHours gives the power of a plant's turbines by the hours of the wind file, not a number where an hour is not
// known.
//
// Where those hours are the source of the yield it is their power. Elsewhere they tell only when the wind blows: their
// speeds are multiplied by the factor that makes the energy of the free machines that of the site. What wakes and
// losses take of the year lowers every hour alike.
func (f *fitter) windByHours(o option, s site, r fitResult) (kw []float64, ok bool, err error) {
	p, machine, hub, err := f.windAndMachine(o, s)
	if err != nil || !p.known {
		return nil, false, err
	}
	h := f.blowing
	kw = make([]float64, len(h.hours))
	if p.hours != nil {
		in, err := f.farm(machine, hub, p, s)
		if err != nil {
			return nil, false, err
		}
		in.Existing = f.machinesOf(s, wholeOf(f.near(s)))
		in.At = f.positions(s, r.Turbines)
		y, err := yearOf(in, p)
		if err != nil || !(y.hours.WakedMWhPerYr > 0) {
			return nil, false, err
		}
		for i, x := range y.hours.PowerKW {
			kw[i] = x * y.hours.NetMWhPerYr / y.hours.WakedMWhPerYr
			if !h.hours[i].Valid {
				kw[i] = math.NaN()
			}
		}
		return kw, true, nil
	}
	if len(r.Chain) == 0 || !(r.Chain[0].Before > 0) {
		return nil, false, nil
	}
	n := float64(len(r.Turbines))
	wantKW := r.Chain[0].Before * units.KWhPerMWh / units.HoursPerYear / n // mean of a free machine
	mean := func(x float64) float64 {
		sum := 0.0
		for i := range h.hours {
			if h.hours[i].Valid {
				sum += machine.Curve.PowerKW(h.hours[i].SpeedMPerS * x)
			}
		}
		return sum / float64(h.fit.ValidHours)
	}
	x, ok := crossing(mean, wantKW, 0.1, 3)
	if !ok {
		return nil, false, nil
	}
	k := n * r.WindMWh.MWh / r.Chain[0].Before
	for i := range h.hours {
		if kw[i] = math.NaN(); h.hours[i].Valid {
			kw[i] = k * machine.Curve.PowerKW(h.hours[i].SpeedMPerS*x)
		}
	}
	return kw, true, nil
}

// crossing finds where a function that rises from low on first reaches a value, to a millionth of it; ok is false where
// it does not before high. Steps of a tenth bracket it, then false position after Dowell & Jarratt 1971 closes in.
func crossing(of func(float64) float64, want, low, high float64) (x float64, ok bool) {
	a, fa := low, of(low)-want
	if fa >= 0 {
		return low, fa == 0
	}
	b, fb := a, fa
	for fb < 0 {
		if b >= high {
			return 0, false
		}
		a, fa = b, fb
		b = math.Min(high, b+0.1)
		fb = of(b) - want
	}
	for range 60 {
		x = b - float64(fb*(b-a))/(fb-fa)
		fx := of(x) - want
		if math.Abs(fx) <= 1e-6*want {
			return x, true
		}
		if float64(fx*fb) < 0 {
			a, fa = b, fb
		} else {
			fa /= 2
		}
		b, fb = x, fx
	}
	return x, true
}
