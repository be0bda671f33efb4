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
	day := t.YearDay() - 1
	if t.Month() > time.February && isLeap(t.Year()) {
		day--
	}
	return 24*day + t.Hour()
}

func isLeap(year int) bool { return year%4 == 0 && (year%100 != 0 || year%400 == 0) }

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
func (f *fitter) matching(o option, s site, r fitResult, limitKW, lossFrac float64) (share scoring.Value, source string, err error) {
	u := f.used
	switch {
	case u == nil:
		return scoring.UnknownBecause("no_hours_of_demand"), "", nil
	case u.why != "":
		return scoring.UnknownBecause("the hours of demand are not read: " + u.why), u.source, nil
	case r.WindMWh.Why != "":
		return scoring.UnknownBecause(r.WindMWh.Why), "", nil
	case r.SolarMWh.Why != "":
		return scoring.UnknownBecause(r.SolarMWh.Why), "", nil
	}
	parts, at, _, ok, err := f.byHours(o, s, r)
	if err != nil {
		return scoring.Value{}, "", err
	}
	if !ok {
		return scoring.UnknownBecause("no_hours_of_plant"), "", nil
	}
	met, all, known := 0.0, 0.0, 0
	for i := range parts[0] {
		n, x := at(i), 0.0
		for _, p := range parts {
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
	if float64(known) < leastMatched*float64(len(parts[0])) || !(all > 0) {
		return scoring.UnknownBecause("too_few_hours"), "", nil
	}
	return scoring.Num(met / all), "hours of " + u.source + " and of " + f.hourNames(r), nil
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

// byHours gives the power of a plant's parts, wind first, by the intervals of a file of hours, not a number where it is
// not known; where each interval lies in the year, and how many hours it lasts. ok is false where the study has no hours
// of a part.
func (f *fitter) byHours(o option, s site, r fitResult) (parts [][]float64, at func(i int) int, stepH float64, ok bool, err error) {
	wind := r.WindKW > 0
	if wind && !f.hoursOfWind() || r.SolarKW > 0 && !f.hoursOfSun() {
		return nil, nil, 0, false, nil
	}
	var blown []float64
	if wind {
		if blown, ok, err = f.windByHours(o, s, r); err != nil || !ok {
			return nil, nil, 0, false, err
		}
	}
	if r.SolarKW == 0 {
		hours := f.blowing.hours
		return [][]float64{blown}, func(i int) int {
			return hourOfYear(time.Unix(hours[i].Hour*int64(units.SecondsPerHour), 0).UTC())
		}, 1, true, nil
	}
	sun, ok, err := f.sunByHours(o, s)
	if err != nil || !ok {
		return nil, nil, 0, false, err
	}
	hours, err := f.hours.climate.Hours()
	if err != nil {
		return nil, nil, 0, false, err
	}
	for i := range sun {
		sun[i] *= r.SolarKW
	}
	parts = [][]float64{sun}
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
	return parts, func(i int) int { return hourOfYear(hours.At(i).Start) }, hours.Step().Hours(), true, nil
}

// matchFacts gives how the plant meets the use of the district.
func (f *fitter) matchFacts(o option, s site, r fitResult, l link, facts facts) error {
	if !l.ok {
		facts.set("used_at_once_share", scoring.UnknownBecause(l.why), "")
		return nil
	}
	limit, _ := f.w.mayFlow(r.WindKW+r.SolarACKW, l.asset)
	share, source, err := f.matching(o, s, r, limit, l.best.LossFrac.Central)
	if err != nil {
		return err
	}
	facts.set("used_at_once_share", share, source)
	return nil
}
