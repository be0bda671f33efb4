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

// weatherInput reads the rows.
func weatherInput(l *geo.Layer, rec study.LayerRecord, snap *study.Snapshot) (in solar.WeatherInput, err error) {
	column := func(field string) (at int, unit string) {
		name := rec.Match[field]
		if name == "" {
			return -1, ""
		}
		return l.ColumnIndex(name), rec.Units[name]
	}
	stamps, _ := column("time")
	ghi, ghiUnit := column("ghi")
	dhi, dhiUnit := column("dhi")
	dni, dniUnit := column("dni")
	temp, tempUnit := column("temperature")
	wind, windUnit := column("wind_speed")
	height, heightUnit := column("wind_height")
	switch {
	case stamps < 0:
		return in, errors.New("no column is matched to time")
	case ghi < 0 && (dhi < 0 || dni < 0):
		return in, errors.New("it has no column of sunlight on level ground (ghi), nor both of its parts (dhi, dni)")
	case temp < 0:
		return in, errors.New("no column is matched to temperature; the cells' loss by heat needs it")
	}
	stamp, _, _ := snap.Lookup("weather.stamp")
	offset, hasOffset := snap.Number("weather.utc_offset_h")
	if stamp.Value == "" {
		return in, errors.New("what its times mark is not said; set weather.stamp to start, centre or end (of the interval)")
	}
	split, _, _ := snap.Lookup("solar.split")
	in.Split = splits[split.Value]
	in.Albedo = solar.EveryMonth(defaultAlbedo)
	in.ClockOffset = time.Duration(offset * float64(time.Hour))
	clock := time.FixedZone("file", int(math.Round(offset*3600)))

	number := func(f *geo.Feature, at int, unit, of string) (float64, error) {
		if at < 0 {
			return math.NaN(), nil
		}
		x, ok := f.Values[at].Float()
		if !ok {
			return math.NaN(), nil
		}
		return units.Convert(x, unitOr(unit, of), of)
	}
	heights := map[float64]bool{}
	for i := range l.Features {
		f := &l.Features[i]
		var r solar.WeatherRow
		text := f.Values[stamps].String()
		t, hasZone, err := readStamp(text, clock)
		switch {
		case err != nil:
			return in, fmt.Errorf("row %d: %w", i+1, err)
		case !hasZone && !hasOffset:
			return in, errors.New("its times have no zone; set weather.utc_offset_h to the hours that its clock is ahead of UTC, without daylight saving time")
		}
		r.Start = t.UTC()
		for _, c := range []struct {
			to       *float64
			at       int
			unit, of string
		}{{&r.GHI, ghi, ghiUnit, "W/m2"}, {&r.DHI, dhi, dhiUnit, "W/m2"}, {&r.DNI, dni, dniUnit, "W/m2"}, {&r.TempC, temp, tempUnit, "degC"}, {&r.WindMS, wind, windUnit, "m/s"}} {
			if *c.to, err = number(f, c.at, c.unit, c.of); err != nil {
				return in, fmt.Errorf("row %d: %w", i+1, err)
			}
		}
		h, err := number(f, height, heightUnit, "m")
		if err != nil {
			return in, fmt.Errorf("row %d: %w", i+1, err)
		}
		if !math.IsNaN(h) {
			heights[h] = true
		}
		in.Rows = append(in.Rows, r)
	}
	if in.Step, err = stepOf(in.Rows); err != nil {
		return in, err
	}
	shift := map[string]time.Duration{"centre": -in.Step / 2, "end": -in.Step}[stamp.Value]
	for i := range in.Rows {
		in.Rows[i].Start = in.Rows[i].Start.Add(shift)
	}
	in.WindFactor = solar.WindAtPanelMS(1, panelWindM)
	if len(heights) == 1 {
		for h := range heights {
			// The same power law from another height than 10 m.
			in.WindFactor = math.Pow(panelWindM/min(max(h, panelWindM), 200), 0.2)
		}
	}
	return in, nil
}

// panelWindM is the height at which wind cools panels. Source: common practice.
const panelWindM = 2

// stepOf gives the middle one of the times between rows.
func stepOf(rows []solar.WeatherRow) (time.Duration, error) {
	var steps []time.Duration
	for i := 1; i < len(rows); i++ {
		if d := rows[i].Start.Sub(rows[i-1].Start); d > 0 {
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
		f := readWeather(v.Layer, rec, snap, *snap.Frame)
		return f.notices(), nil
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
