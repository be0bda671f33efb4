package run

import (
	"context"
	"errors"
	"fmt"
	"math"
	"slices"
	"strings"
	"time"

	"groundtally/app/study"
	"groundtally/geo"
	"groundtally/scoring/solar"
	"groundtally/scoring/units"
)

// weatherFile is an hourly file brought to a year of sunlight for the middle of the district.
type weatherFile struct {
	rec     study.LayerRecord
	climate *solar.Climate // nil where it cannot be read
	report  solar.WeatherReport
	why     string  // it cannot be read
	offsetH float64 // its clock is ahead of UTC
	key     string  // of what it was read from
}

// stampFormats are the ways that a time is written.
var stampFormats = []string{
	time.RFC3339, "2006-01-02T15:04Z07:00", "2006-01-02T15:04:05", "2006-01-02T15:04", "2006-01-02 15:04:05Z07:00", "2006-01-02 15:04:05", "2006-01-02 15:04", "2006-01-02 15",
	"02.01.2006 15:04:05", "02.01.2006 15:04", "2006/01/02 15:04", "20060102:1504", "20060102T1504", "200601021504", "2006010215",
}

// zoned reports whether a format says its zone.
func zoned(format string) bool { return strings.Contains(format, "Z07:00") }

// readStamp reads a time; one without a zone is on the clock given.
func readStamp(text string, clock *time.Location) (t time.Time, hasZone bool, err error) {
	text = strings.TrimSpace(text)
	for _, f := range stampFormats {
		if t, err := time.ParseInLocation(f, text, clock); err == nil {
			return t, zoned(f), nil
		}
	}
	return t, false, fmt.Errorf("%q is not a time; write it as 2025-06-21 13:00", text)
}

// weatherMatters are the settings that say how a file of hours is read.
var weatherMatters = []string{"weather.stamp", "weather.utc_offset_h", "solar.split"}

var splits = map[string]solar.SplitModel{"Erbs": solar.Erbs, "Orgill-Hollands": solar.OrgillHollands, "Reindl": solar.Reindl}

// readWeather brings an hourly file to a climate. Why it cannot be read stands in the answer.
func readWeather(l *geo.Layer, rec study.LayerRecord, snap *study.Snapshot, at geo.LonLat) weatherFile {
	w := weatherFile{rec: rec}
	k := newKey("weather", 1)
	k.text(rec.Digest)
	for _, f := range []string{"time", "ghi", "dhi", "dni", "temperature", "wind_speed", "wind_height"} {
		k.text(rec.Match[f])
		k.text(rec.Units[rec.Match[f]])
	}
	for _, name := range weatherMatters {
		v, _, _ := snap.Lookup(name)
		k.text(v.Value)
	}
	k.num(at.Lon)
	k.num(at.Lat)
	w.key = k.sum()
	in, err := weatherInput(l, rec, snap)
	if err != nil {
		w.why = err.Error()
		return w
	}
	in.LatDeg, in.LonDeg, w.offsetH = at.Lat, at.Lon, in.ClockOffset.Hours()
	if w.climate, w.report, err = solar.NewWeather(in); err != nil {
		var input *solar.InputError
		if w.climate = nil; errors.As(err, &input) && input.Field == "Rows" {
			w.why = "it should hold " + input.Want
		} else {
			w.why = err.Error()
		}
	}
	return w
}

// hourTable reads the rows of a table of hours.
type hourTable struct {
	l     *geo.Layer
	rec   study.LayerRecord
	start []time.Time // of the intervals, in UTC
	step  time.Duration
	clock time.Duration // that the table's clock is ahead of UTC
}

// hoursOf reads the times of a table of hours.
func hoursOf(l *geo.Layer, rec study.LayerRecord, snap *study.Snapshot) (*hourTable, error) {
	h := &hourTable{l: l, rec: rec}
	stamps := h.at("time")
	if stamps < 0 {
		return nil, errors.New("no column is matched to time")
	}
	stamp, _, _ := snap.Lookup(study.StampKey)
	offset, hasOffset := snap.Number(study.OffsetKey)
	if stamp.Value == "" {
		return nil, errors.New("what its times mark is not said; set weather.stamp to start, centre or end (of the interval)")
	}
	h.clock = time.Duration(offset * float64(time.Hour))
	clock := time.FixedZone("file", int(math.Round(offset*3600)))
	for i := range l.Features {
		t, hasZone, err := readStamp(l.Features[i].Values[stamps].String(), clock)
		switch {
		case err != nil:
			return nil, fmt.Errorf("row %d: %w", i+1, err)
		case !hasZone && !hasOffset:
			return nil, errors.New("its times have no zone; set weather.utc_offset_h to the hours that its clock is ahead of UTC, without daylight saving time")
		}
		h.start = append(h.start, t.UTC())
	}
	var err error
	if h.step, err = stepOf(h.start); err != nil {
		return nil, err
	}
	shift := map[string]time.Duration{"centre": -h.step / 2, "end": -h.step}[stamp.Value]
	for i := range h.start {
		h.start[i] = h.start[i].Add(shift)
	}
	return h, nil
}

// at gives the column matched to a field; -1 without one.
func (h *hourTable) at(field string) int {
	if h.rec.Match[field] == "" {
		return -1
	}
	return h.l.ColumnIndex(h.rec.Match[field])
}

// column gives a field row by row in a unit; not a number where it is empty or has no column.
func (h *hourTable) column(field, unit string) ([]float64, error) {
	at := h.at(field)
	out := make([]float64, len(h.l.Features))
	for i := range out {
		out[i] = math.NaN()
		if at < 0 {
			continue
		}
		x, ok := h.l.Features[i].Values[at].Float()
		if !ok {
			continue
		}
		var err error
		if out[i], err = units.Convert(x, unitOr(h.rec.Units[h.rec.Match[field]], unit), unit); err != nil {
			return nil, fmt.Errorf("row %d: %w", i+1, err)
		}
	}
	return out, nil
}

// weatherInput reads the rows.
func weatherInput(l *geo.Layer, rec study.LayerRecord, snap *study.Snapshot) (in solar.WeatherInput, err error) {
	has := func(field string) bool { return rec.Match[field] != "" && l.ColumnIndex(rec.Match[field]) >= 0 }
	switch {
	case !has("time"):
		return in, errors.New("no column is matched to time")
	case !has("ghi") && !(has("dhi") && has("dni")):
		return in, errors.New("it has no column of sunlight on level ground (ghi), nor both of its parts (dhi, dni)")
	case !has("temperature"):
		return in, errors.New("no column is matched to temperature; the cells' loss by heat needs it")
	}
	h, err := hoursOf(l, rec, snap)
	if err != nil {
		return in, err
	}
	split, _, _ := snap.Lookup("solar.split")
	in.Split = splits[split.Value]
	in.Albedo = solar.EveryMonth(defaultAlbedo)
	in.ClockOffset, in.Step = h.clock, h.step
	in.Rows = make([]solar.WeatherRow, len(h.start))
	for i, t := range h.start {
		in.Rows[i].Start = t
	}
	for _, c := range []struct {
		field, unit string
		to          func(*solar.WeatherRow) *float64
	}{
		{"ghi", "W/m2", func(r *solar.WeatherRow) *float64 { return &r.GHI }},
		{"dhi", "W/m2", func(r *solar.WeatherRow) *float64 { return &r.DHI }},
		{"dni", "W/m2", func(r *solar.WeatherRow) *float64 { return &r.DNI }},
		{"temperature", "degC", func(r *solar.WeatherRow) *float64 { return &r.TempC }},
		{"wind_speed", "m/s", func(r *solar.WeatherRow) *float64 { return &r.WindMS }},
	} {
		xs, err := h.column(c.field, c.unit)
		if err != nil {
			return in, err
		}
		for i, x := range xs {
			*c.to(&in.Rows[i]) = x
		}
	}
	in.WindFactor = solar.WindAtPanelMS(1, panelWindM)
	height, one, err := h.height()
	if err != nil {
		return in, err
	}
	if one {
		// The same power law from another height than 10 m.
		in.WindFactor = math.Pow(panelWindM/min(max(height, panelWindM), 200), 0.2)
	}
	return in, nil
}

// height gives the height at which the wind was measured; one is false where none or several stand in the table.
func (h *hourTable) height() (m float64, one bool, err error) {
	xs, err := h.column("wind_height", "m")
	if err != nil {
		return 0, false, err
	}
	m = math.NaN()
	for _, x := range xs {
		switch {
		case math.IsNaN(x) || x == m:
		case math.IsNaN(m):
			m = x
		default:
			return 0, false, nil
		}
	}
	return m, !math.IsNaN(m), nil
}

// panelWindM is the height at which wind cools panels. Source: common practice.
const panelWindM = 2

// stepOf gives the middle one of the times between rows.
func stepOf(starts []time.Time) (time.Duration, error) {
	var steps []time.Duration
	for i := 1; i < len(starts); i++ {
		if d := starts[i].Sub(starts[i-1]); d > 0 {
			steps = append(steps, d)
		}
	}
	if len(steps) == 0 {
		return 0, errors.New("it has no two rows of different times")
	}
	slices.Sort(steps)
	step := steps[len(steps)/2]
	if step < time.Minute || step > time.Hour || time.Hour%step != 0 {
		return 0, fmt.Errorf("its rows are %s apart; they should be an hour or a whole part of one", step)
	}
	return step, nil
}

// weather reads the first table of hours; nil when there is none.
func (w *world) weather() *weatherFile {
	t, ok := w.tables[study.HourlyRole]
	if !ok {
		return nil
	}
	for _, rec := range w.snap.LayersOf(study.HourlyRole) {
		if rec.Kind == "table" {
			if !hasSun(t, rec) && hasWind(t, rec) {
				return nil // hours of wind alone
			}
			f := readWeather(t, rec, w.snap, w.frame.Centre())
			return &f
		}
	}
	return nil
}

// weatherNotices tells what was found in hourly files.
func weatherNotices(ctx context.Context, store study.Store, snap *study.Snapshot) ([]geo.Notice, error) {
	for _, rec := range snap.LayersOf(study.HourlyRole) {
		if rec.Kind != "table" || snap.Frame == nil {
			continue
		}
		v, _, err := store.Version(ctx, rec.Digest)
		if err != nil {
			return nil, fmt.Errorf("read layer %q: %w", rec.Name, err)
		}
		var out []geo.Notice
		wind := hasWind(v.Layer, rec)
		if hasSun(v.Layer, rec) || !wind {
			f := readWeather(v.Layer, rec, snap, *snap.Frame)
			out = f.notices()
		}
		if wind {
			out = append(out, readWindHours(v.Layer, rec, snap).notices()...)
		}
		return out, nil
	}
	return nil, nil
}

func (f *weatherFile) notices() []geo.Notice {
	if f.climate == nil {
		return []geo.Notice{{Code: "weather_not_read", Severity: geo.Warning, Layer: f.rec.Name, Args: map[string]string{"why": f.why}}}
	}
	r := &f.report
	var out []geo.Notice
	say := func(code string, severity geo.Severity, n int, args ...string) {
		if n == 0 {
			return
		}
		a := map[string]string{"count": fmt.Sprint(n)}
		for i := 0; i+1 < len(args); i += 2 {
			a[args[i]] = args[i+1]
		}
		out = append(out, geo.Notice{Code: code, Severity: severity, Layer: f.rec.Name, Args: a})
	}
	if r.ShiftKnown && max(r.ShiftMin, -r.ShiftMin) > solar.ShiftTolerableMin {
		say("weather_shift", geo.Warning, r.ShiftMin)
	}
	say("weather_night", geo.Warning, r.AtNight)
	say("weather_bright", geo.Warning, r.TooBright)
	say("weather_not_closing", geo.Warning, r.NotClosing)
	say("weather_twice", geo.Warning, r.Twice)
	say("weather_filled", geo.Info, r.Missing, "short", fmt.Sprint(r.FilledShort), "long", fmt.Sprint(r.FilledLong))
	say("weather_negative", geo.Info, r.Negative)
	say("weather_leap", geo.Info, r.LeapDropped)
	return out
}

// clock names the clock by which hours are told.
func (f *weatherFile) clock() string {
	if f.offsetH == 0 {
		return "UTC"
	}
	return fmt.Sprintf("UTC%+g h", f.offsetH)
}

// words name the file in a source.
func (f *weatherFile) words() string {
	years := fmt.Sprintf("%d years", f.report.Years)
	switch {
	case f.report.Typical:
		years = "a typical year"
	case f.report.Years == 1:
		years = "one year"
	}
	return fmt.Sprintf("the hours of %s (%s), sun of the district's middle", f.rec.Name, years)
}
