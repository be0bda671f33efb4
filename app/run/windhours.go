package run

import (
	"errors"
	"fmt"
	"math"
	"strings"
	"time"

	"groundtally/app/study"
	"groundtally/geo"
	"groundtally/scoring/params"
	"groundtally/scoring/units"
	"groundtally/scoring/wind"
)

// windHours is the wind of a table of hours.
type windHours struct {
	rec     study.LayerRecord
	hours   []wind.SeriesHour
	fit     wind.SeriesFit
	heightM float64
	years   float64 // of hours in force
	typical bool    // months of several years, laid into one
	factor  float64 // on all speeds, by the user
	place   *geo.LonLat
	byRow   rowsToHours
	why     string // it cannot serve
	key     string
}

// windMatters are the settings that say how the wind of a table of hours is read.
var windMatters = []string{study.StampKey, study.OffsetKey, "weather.latitude_deg", "weather.longitude_deg", "wind.series_factor", "wind.series_gaps"}

// hasWind reports whether a table of hours has columns of wind.
func hasWind(l *geo.Layer, rec study.LayerRecord) bool {
	return rec.Match["wind_speed"] != "" && rec.Match["wind_height"] != "" && l.ColumnIndex(rec.Match["wind_speed"]) >= 0 && l.ColumnIndex(rec.Match["wind_height"]) >= 0
}

// hasSun reports whether a table of hours has columns of sunlight.
func hasSun(l *geo.Layer, rec study.LayerRecord) bool {
	for _, f := range []string{"ghi", "dhi", "dni"} {
		if rec.Match[f] != "" && l.ColumnIndex(rec.Match[f]) >= 0 {
			return true
		}
	}
	return false
}

// readWindHours fits the wind of a table of hours. Why it cannot serve stands in the answer.
func readWindHours(l *geo.Layer, rec study.LayerRecord, snap *study.Snapshot) *windHours {
	w := &windHours{rec: rec, factor: 1}
	k := newKey("wind of hours", 1)
	k.text(rec.Digest)
	for _, f := range []string{"time", "temperature", "wind_speed", "wind_direction", "wind_height", "pressure"} {
		k.text(rec.Match[f])
		k.text(rec.Units[rec.Match[f]])
	}
	for _, name := range windMatters {
		v, _, _ := snap.Lookup(name)
		k.text(v.Value)
	}
	w.key = k.sum()
	if err := w.read(l, snap); err != nil {
		w.why = err.Error()
	}
	return w
}

func (w *windHours) read(l *geo.Layer, snap *study.Snapshot) error {
	h, err := hoursOf(l, w.rec, snap)
	if err != nil {
		return err
	}
	height, one, err := h.height()
	switch {
	case err != nil:
		return err
	case !one:
		return errors.New("its wind has no height, or several; one height above ground is needed")
	case !(height > 0):
		return fmt.Errorf("its wind is said to be measured %g m above ground", height)
	}
	w.heightM = height
	if x, ok := snap.Number("wind.series_factor"); ok {
		w.factor = x
	}
	lat, okLat := snap.Number("weather.latitude_deg")
	lon, okLon := snap.Number("weather.longitude_deg")
	if okLat && okLon {
		w.place = &geo.LonLat{Lon: lon, Lat: lat}
	}
	if err := w.gather(h); err != nil {
		return err
	}
	gaps, _, _ := snap.Lookup("wind.series_gaps")
	w.fit, err = wind.FitSeries(w.hours, wind.SeriesOptions{AllowGaps: gaps.Value == "use"})
	w.years = float64(w.fit.ValidHours) / units.HoursPerYear
	if errors.Is(err, wind.ErrSeriesGaps) {
		return fmt.Errorf("%w; wind.series_gaps set to use takes it all the same", err)
	}
	return err
}

// rowsToHours says of each row of a table into which of the hours it went; -1 for none.
type rowsToHours []int32

// hourNumber gives the hour since 1970 to which an interval belongs: that of its middle, so that clocks of half hours
// find their place.
func hourNumber(start time.Time, step time.Duration) int64 {
	return int64(math.Floor(float64(start.Add(step/2).Unix()) / units.SecondsPerHour))
}

// step is what the rows of one hour give together.
type step struct {
	hour                        int64
	speed, x, y, temp, pressure float64
	speeds, temps, pressures    int
}

// gather brings the rows to hours: of rows closer than that the means, where at least half of the hour is known.
func (w *windHours) gather(h *hourTable) error {
	cols := map[string][]float64{}
	for _, c := range [][2]string{{"wind_speed", "m/s"}, {"wind_direction", "deg"}, {"temperature", "degC"}, {"pressure", "Pa"}} {
		var err error
		if cols[c[0]], err = h.column(c[0], c[1]); err != nil {
			return err
		}
	}
	w.typical = typicalYear(h.start)
	var all []*step
	of := map[int64]int32{}
	w.byRow = make(rowsToHours, len(h.start))
	perHour := int(time.Hour / h.step)
	for i, t := range h.start {
		if w.typical {
			if t.Month() == time.February && t.Day() == 29 {
				w.byRow[i] = -1
				continue
			}
			t = t.AddDate(typicalIn-t.Year(), 0, 0)
		}
		hour := hourNumber(t, h.step)
		at, there := of[hour]
		if !there {
			at = int32(len(all))
			of[hour] = at
			all = append(all, &step{hour: hour})
		} else if perHour == 1 {
			return fmt.Errorf("row %d: its hour stands twice", i+1)
		}
		w.byRow[i] = at
		s := all[at]
		if v := cols["wind_speed"][i]; !math.IsNaN(v) {
			s.speed += v
			s.speeds++
		}
		if d := cols["wind_direction"][i]; !math.IsNaN(d) {
			sin, cos := math.Sincos(d * math.Pi / 180)
			s.x += sin
			s.y += cos
		}
		if c := cols["temperature"][i]; !math.IsNaN(c) {
			s.temp += c
			s.temps++
		}
		if p := cols["pressure"][i]; !math.IsNaN(p) {
			s.pressure += p
			s.pressures++
		}
	}
	for _, s := range all {
		one := wind.SeriesHour{Hour: s.hour, Valid: 2*s.speeds >= perHour && s.speeds > 0}
		if one.Valid {
			one.SpeedMPerS = w.factor * (s.speed / float64(s.speeds))
		}
		if math.Hypot(s.x, s.y) > 1e-9 {
			one.HasDir, one.FromDeg = true, math.Mod(math.Atan2(s.x, s.y)*180/math.Pi+units.DegreesPerCircle, units.DegreesPerCircle)
		}
		if s.temps > 0 {
			one.HasTemp, one.TempC = true, s.temp/float64(s.temps)
		}
		if s.pressures > 0 {
			one.HasPressure, one.PressurePa = true, s.pressure/float64(s.pressures)
		}
		w.hours = append(w.hours, one)
	}
	return nil
}

// typicalIn is the year into which a typical year is laid; it has no 29 February.
const typicalIn = 2001

// typicalYear reports whether rows are twelve months, each of one year and not all of the same.
func typicalYear(starts []time.Time) bool {
	var year [12]int
	for _, t := range starts {
		m := t.Month() - 1
		if year[m] != 0 && year[m] != t.Year() {
			return false
		}
		year[m] = t.Year()
	}
	first, last := 0, 0
	for _, y := range year {
		if y == 0 {
			return false
		}
		if first == 0 || y < first {
			first = y
		}
		last = max(last, y)
	}
	// A year that begins in another month than January lies in two years that follow each other.
	return last > first+1 || last == first+1 && !rising(starts)
}

func rising(starts []time.Time) bool {
	for i := 1; i < len(starts); i++ {
		if starts[i].Before(starts[i-1]) {
			return false
		}
	}
	return true
}

// windHours reads the wind of the first table of hours; nil when there is none.
func (w *world) windHours() *windHours {
	t, ok := w.tables[study.HourlyRole]
	if !ok {
		return nil
	}
	for _, rec := range w.snap.LayersOf(study.HourlyRole) {
		if rec.Kind == "table" {
			if !hasWind(t, rec) {
				return nil
			}
			return readWindHours(t, rec, w.snap)
		}
	}
	return nil
}

// rose gives the sectors that the hours fit; even without directions. A sector without hours has the shape of all.
func (w *windHours) rose() []wind.Sector {
	if len(w.fit.Rose) == 1 {
		return evenSectors(w.fit.Whole)
	}
	out := make([]wind.Sector, len(w.fit.Rose))
	for i, s := range w.fit.Rose {
		if out[i] = s; s.FrequencyFrac == 0 {
			out[i].Weibull = w.fit.Whole
		}
	}
	return out
}

// words name the hours and what stands behind them.
func (w *windHours) words() string {
	years := fmt.Sprintf("%.2g years", w.years)
	switch {
	case w.typical:
		years = "a typical year"
	case math.Abs(w.years-1) < 0.05:
		years = "one year"
	}
	out := fmt.Sprintf("the hours of %s at %g m (%s, %.1f %% covered, %.1f %% calm", w.rec.Name, w.heightM, years, 100*w.fit.CoverageFrac, 100*w.fit.CalmFrac)
	if w.factor != 1 {
		out += fmt.Sprintf(", speeds times %g", w.factor)
	}
	return out + ")"
}

// farKm is the distance beyond which wind is said to be far. Source: common practice, ten to twenty kilometres.
const farKm = 10

// The ratio of heights beyond which the wind at the hub is said to be extrapolated; the share of calm that is told.
// Source: common practice (a mast of at least two thirds of the hub height).
const (
	farHeight    = 1.5
	muchCalmFrac = 0.1
	leastCovered = 0.95
)

// windNotices tells what makes the wind of a site less sure.
func (p windHere) notices(hubM float64) []string {
	var out []string
	if r := hubM / p.heightM; r > farHeight || r < 1/farHeight {
		out = append(out, "wind_extrapolated")
	}
	if p.hours == nil {
		if !p.grid && p.id != typedWind && p.distM > farKm*units.MPerKm {
			out = append(out, "wind_far")
		}
		return out
	}
	switch {
	case p.distM < 0:
		out = append(out, "wind_place_unknown")
	case p.distM > farKm*units.MPerKm:
		out = append(out, "wind_far")
	}
	if p.hours.fit.CoverageFrac < leastCovered {
		out = append(out, "wind_hours_missing")
	}
	if p.hours.fit.CalmFrac > muchCalmFrac {
		out = append(out, "wind_calm")
	}
	return append(out, "wind_by_hours")
}

// windFromHours gives the wind of the hours at a place; it is known only where they can serve.
func (f *fitter) windFromHours(s site) (windHere, error) {
	h := f.blowing
	out := windHere{windPoint: windPoint{id: h.rec.Name, layer: h.rec.Name, heightM: h.heightM, sectors: h.rose()}, distM: -1, used: 1, known: true, hours: h}
	where := "of a place that is not said"
	if h.place != nil {
		at, err := f.w.frame.Forward(*h.place)
		if err != nil {
			return out, fmt.Errorf("weather.latitude_deg and weather.longitude_deg: %w", err)
		}
		out.distM = at.Dist(s.box.Centre())
		where = fmt.Sprintf("%.1f km off", out.distM/units.MPerKm)
	}
	out.source = "wind yield from " + h.words() + ", " + where
	return out, nil
}

// The names of the parts of a wind yield's spread.
const (
	partMeasurement = "measurement"
	partLongTerm    = "long_term"
	partVertical    = "vertical"
	partHorizontal  = "horizontal"
	partCurve       = "performance"
	partWakes       = "wakes"
	partCalm        = "calm"
)

// Distances between which the wind of a mast becomes as uncertain as that of a model. Source: assumption of this
// program.
const (
	mastNearM = 5000
	mastFarM  = 20000
)

// windParts gives the standard deviations of a wind yield by their causes.
//
// Height: ln(hub/height) times the spread of the exponent of the power law, taken from its range as 5th and 95th
// percentile. Long term: of n years of hours the variation between years over √n. Wakes: a share of what they take.
// Calm: speeds below what counts as calm are taken as spread evenly from 0.
func (f *fitter) windParts(p windHere, hubM, wakeLoss float64) (wind.Components, error) {
	kind, _, _ := f.w.snap.Lookup("wind.data_kind")
	var failed error
	get := func(name string) wind.Default {
		d, err := f.w.p.Wind.Get(name)
		failed = errors.Join(failed, err)
		return d
	}
	alpha := get("shear_alpha")
	measured, long := get("sigma_"+kind.Value+"_measurement_frac").Central, get("sigma_"+kind.Value+"_long_term_frac").Central
	across := get("sigma_" + kind.Value + "_horizontal_frac").Central
	out := wind.Components{
		{Name: partMeasurement, Title: "measurement or model", SpeedFrac: measured, Shared: true},
		{Name: partLongTerm, Title: "how well it stands for many years", SpeedFrac: long, Shared: true},
		{Name: partVertical, Title: "from its height to the hub", SpeedFrac: math.Abs(math.Log(hubM/p.heightM)) * (alpha.High - alpha.Low) / (2 * params.Z95), Shared: true},
		{Name: partHorizontal, Title: "from its place to the site", SpeedFrac: across},
		{Name: partCurve, Title: "power curve and losses", EnergyFrac: get("sigma_performance_frac").Central, Shared: true},
		{Name: partWakes, Title: "wakes", EnergyFrac: get("sigma_of_wake_loss").Central * wakeLoss},
	}
	if kind.Value == "mast" {
		far := get("sigma_model_horizontal_frac").Central
		share := min(1, max(0, (p.distM-mastNearM)/(mastFarM-mastNearM)))
		if p.distM < 0 || p.id == typedWind {
			share = 1
		}
		out[3].SpeedFrac = across + share*(far-across)
	}
	if h := p.hours; h != nil {
		if !h.typical {
			out[1].SpeedFrac = get("interannual_speed_sigma_frac").Central / math.Sqrt(h.years)
		}
		out = append(out, wind.Component{Name: partCalm, Title: "hours of calm", SpeedFrac: h.fit.CalmFrac * wind.CalmBelowMPerS / math.Sqrt(12) / h.fit.MeanMPerS, Shared: true})
	}
	return out, failed
}

// mostSensitive bounds the per cent of energy for each per cent of speed: where machines hardly run, the quotient says
// little.
const mostSensitive = 5

// sensitivity gives the per cent of energy for each per cent of speed, without its sign: where storms stop the machines,
// more wind gives less.
func (y windYear) sensitivity() float64 {
	return math.Min(mostSensitive, math.Abs(y.farm.SpeedSensitivity))
}

// windSpread gives the standard deviations of a wind yield: of one year, and of the long-term mean what all sites share
// and what is of this one. The weather of a year is shared.
func (f *fitter) windSpread(parts wind.Components, sensitivity float64) (oneYear, shared, own float64, err error) {
	year, err := f.w.p.Wind.Get("interannual_speed_sigma_frac")
	if err != nil {
		return 0, 0, 0, err
	}
	if shared, own, err = parts.Parts(sensitivity); err != nil {
		return 0, 0, 0, err
	}
	between := year.Central * sensitivity
	if oneYear, err = wind.SigmaOverYears(math.Hypot(shared, own), between, 1); err != nil {
		return 0, 0, 0, err
	}
	shared, err = wind.SigmaOverYears(shared, between, longTermYears)
	return oneYear, shared, own, err
}

// notices tells what was found in the wind of a table of hours.
func (w *windHours) notices() []geo.Notice {
	if w.why != "" {
		return []geo.Notice{{Code: "wind_hours_not_read", Severity: geo.Warning, Layer: w.rec.Name, Args: map[string]string{"why": w.why}}}
	}
	return []geo.Notice{{Code: "wind_hours_read", Severity: geo.Info, Layer: w.rec.Name, Args: map[string]string{
		"what": strings.TrimPrefix(w.words(), "the hours of "+w.rec.Name+" "),
		"mean": fmt.Sprintf("%.2f", w.fit.MeanMPerS), "shape": fmt.Sprintf("%.2f", w.fit.Whole.K), "sectors": fmt.Sprint(w.fit.FellBack),
	}}}
}
