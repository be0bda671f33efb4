package run

import (
	"math"
	"time"

	"groundtally/scoring"
	"groundtally/scoring/units"
)

// usedHours is the use of the district by the hours of a typical year.
type usedHours struct {
	kw     [365 * 24]float64 // not a number where no row tells it
	source string
	why    string // it cannot be read
}

// hourOfYear gives the hour of a year of 365 days; -1 on 29 February.
func hourOfYear(t time.Time) int {
	if t.Month() == time.February && t.Day() == 29 {
		return -1
	}
	return 24*(time.Date(typicalIn, t.Month(), t.Day(), 0, 0, 0, 0, time.UTC).YearDay()-1) + t.Hour()
}

// usedHours reads the demand table by the hour; nil without one that has times and loads. Several years are averaged.
func (w *world) usedHours() *usedHours {
	t, there := w.tables["demand"]
	if !there {
		return nil
	}
	rec := w.snap.LayersOf("demand")[0]
	if rec.Match["time"] == "" || rec.Match["load"] == "" || t.ColumnIndex(rec.Match["time"]) < 0 || t.ColumnIndex(rec.Match["load"]) < 0 {
		return nil
	}
	out := &usedHours{source: rec.Name}
	h, err := hoursOf(t, rec, w.snap)
	if err != nil {
		out.why = err.Error()
		return out
	}
	load, err := h.column("load", "kW")
	if err != nil {
		out.why = err.Error()
		return out
	}
	var rows [365 * 24]int
	for i, start := range h.start {
		at := hourOfYear(start.Add(h.step / 2))
		if at >= 0 && load[i] >= 0 { // no load below zero, and none that is not a number
			out.kw[at] += load[i]
			rows[at]++
		}
	}
	for i, n := range rows {
		if n == 0 {
			out.kw[i] = math.NaN()
			continue
		}
		out.kw[i] /= float64(n)
	}
	return out
}

// leastMatched is the share of the hours of a year that must be known of plant and use. Source: common practice, as for
// series of wind.
const leastMatched = 0.8

// matching gives the share of a plant's delivered energy that the district uses in the very hour; and why it is not
// known. What comes beyond limitKW is cut off before; the loss of the connection lowers every hour alike, so that the
// energy is that of deliveredMWh.
func (f *fitter) matching(power *powerHours, r fitResult, limitKW, lossFrac float64) (share scoring.Value, source string) {
	u := f.used
	switch {
	case u == nil:
		return scoring.UnknownBecause("no_hours_of_demand"), ""
	case u.why != "":
		return scoring.UnknownBecause("the hours of demand are not read: " + u.why), u.source
	case r.WindMWh.Why != "":
		return scoring.UnknownBecause(r.WindMWh.Why), ""
	case r.SolarMWh.Why != "":
		return scoring.UnknownBecause(r.SolarMWh.Why), ""
	}
	if power == nil {
		return scoring.UnknownBecause("no_hours_of_plant"), ""
	}
	met, all, known := 0.0, 0.0, 0
	for i := range power.parts[0] {
		n, x := power.at(i), 0.0
		for _, p := range power.parts {
			x += p[i]
		}
		if n < 0 || math.IsNaN(x) || math.IsNaN(u.kw[n]) {
			continue
		}
		known++
		x = math.Min(x, limitKW) * (1 - lossFrac)
		all += x
		met += math.Min(x, u.kw[n])
	}
	if float64(known) < leastMatched*float64(len(power.parts[0])) || !(all > 0) {
		return scoring.UnknownBecause("too_few_hours"), ""
	}
	return scoring.Num(met / all), "hours of " + u.source + " and of " + f.hourNames(r)
}

// hourNames names the files of hours that a plant's power follows.
func (f *fitter) hourNames(r fitResult) string {
	switch {
	case r.SolarKW > 0:
		return f.hours.rec.Name
	default:
		return f.blowing.rec.Name
	}
}

// powerHours is the power of a plant by the intervals of a file of hours.
type powerHours struct {
	parts [][]float64     // kW, wind first; not a number where it is not known
	at    func(i int) int // where an interval lies in the year
	stepH float64         // how many hours it lasts
}

// byHours gives a plant's power by the hour; nil where a yield is not known, where the study has no hours of a part, or
// where nobody asks for them.
func (f *fitter) byHours(o option, s site, r fitResult) (*powerHours, error) {
	wind := r.WindKW > 0
	switch {
	case f.used == nil && !(wind && r.SolarKW > 0), r.WindMWh.Why != "", r.SolarMWh.Why != "", wind && !f.hoursOfWind(), r.SolarKW > 0 && !f.hoursOfSun():
		return nil, nil
	}
	var blown []float64
	if wind {
		var ok bool
		var err error
		if blown, ok, err = f.windByHours(o, s, r); err != nil || !ok {
			return nil, err
		}
	}
	if r.SolarKW == 0 {
		hours := f.blowing.hours
		return &powerHours{parts: [][]float64{blown}, at: func(i int) int {
			return hourOfYear(time.Unix(hours[i].Hour*int64(units.SecondsPerHour), 0).UTC())
		}, stepH: 1}, nil
	}
	sun, ok, err := f.sunByHours(o, s)
	if err != nil || !ok {
		return nil, err
	}
	hours, err := f.hours.climate.Hours()
	if err != nil {
		return nil, err
	}
	for i := range sun {
		sun[i] *= r.SolarKW
	}
	parts := [][]float64{sun}
	if wind {
		there := make([]float64, hours.Len())
		for i := range there {
			there[i] = math.NaN()
			if row := hours.At(i).Row; row >= 0 && f.blowing.byRow[row] >= 0 {
				there[i] = blown[f.blowing.byRow[row]]
			}
		}
		parts = [][]float64{there, sun}
	}
	return &powerHours{parts, func(i int) int { return hourOfYear(hours.At(i).Start) }, hours.Step().Hours()}, nil
}

// matchFacts gives how the plant meets the use of the district.
func (f *fitter) matchFacts(power *powerHours, r fitResult, l link, facts facts) {
	if !l.ok {
		facts.set("used_at_once_share", scoring.UnknownBecause(l.why), "")
		return
	}
	limit, _ := f.w.mayFlow(r.WindKW+r.SolarACKW, l.asset)
	share, source := f.matching(power, r, limit, l.best.LossFrac.Central)
	facts.set("used_at_once_share", share, source)
}
