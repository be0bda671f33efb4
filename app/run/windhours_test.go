package run

import (
	"context"
	"fmt"
	"math"
	"strings"
	"testing"
	"time"

	"groundtally/app/files"
	"groundtally/app/study"
	"groundtally/geo"
)

// blow adds a table of hours of wind: rows are made hour by hour, with the n-th number of a walk through 0 to 1 that
// meets all parts alike.
func (p *plain) blow(rows int, step time.Duration, row func(i int, u float64) (speed, from string)) {
	p.t.Helper()
	l := &geo.Layer{Columns: []geo.Column{{Name: "time"}, {Name: "wind_speed"}, {Name: "wind_direction"}, {Name: "wind_height"}}}
	at := time.Date(2023, 1, 1, 0, 0, 0, 0, time.UTC)
	for i := range rows {
		u := math.Mod((float64(i)+0.5)*0.6180339887498949, 1)
		v, d := row(i, u)
		value := func(text string) geo.Value {
			if text == "" {
				return geo.Value{}
			}
			return geo.TextValue(text)
		}
		l.Features = append(l.Features, geo.Feature{ID: fmt.Sprint(i + 1), Values: []geo.Value{geo.TextValue(at.Add(time.Duration(i) * step).Format(time.RFC3339)), value(v), value(d), geo.TextValue("80")}})
	}
	tools, done := files.NewTools()
	defer done()
	same := map[string]string{}
	for _, c := range l.Columns {
		same[c.Name] = c.Name
	}
	in := study.Import{File: "mast.csv", Base: "mast.csv", Layer: l, Role: study.HourlyRole, Name: "Mast", Ledger: study.Ledger{Read: len(l.Features)}, Match: same,
		Units: map[string]string{"wind_speed": "m/s", "wind_direction": "deg", "wind_height": "m"}, AcceptProposals: true, Stamp: "start"}
	if _, err := p.s.AddLayer(context.Background(), in, tools); err != nil {
		p.t.Fatal(err)
	}
}

// rayleighOf gives a speed of a Rayleigh distribution of mean 7 m/s.
func rayleighOf(u float64) string {
	return fmt.Sprintf("%.6f", 7*2/math.Sqrt(math.Pi)*math.Sqrt(-math.Log(1-u)))
}

// Hours drawn from the distribution that a typed mean speed stands for give its energy.
func TestHoursOfWindGiveTheEnergyOfTheirDistribution(t *testing.T) {
	typed := windYield(t)
	typed.set("wind.typed_mean_speed_m_per_s", "7", "wind.typed_height_m", "80")
	want := typed.leaf(typed.computed(nil), "wind_p50_mwh").X
	p := windYield(t)
	p.blow(8760, time.Hour, func(i int, u float64) (string, string) {
		return rayleighOf(u), fmt.Sprint(math.Mod(float64(i)*math.Sqrt2*100, 360))
	})
	c := p.computed(nil)
	got := p.leaf(c, "wind_p50_mwh")
	if math.Abs(got.X/want-1) > 5e-3 || !strings.Contains(got.Source, "the hours of Mast at 80 m (one year, 100.0 % covered") {
		t.Errorf("%v by hours, %v by the distribution; %q", got.X, want, got.Source)
	}
	for _, n := range []string{"wind_by_hours", "wind_place_unknown"} {
		if !p.said(c, n) {
			t.Errorf("%s is not said: %v", n, c.Notices)
		}
	}
	snap, err := p.s.Snapshot()
	if err != nil {
		t.Fatal(err)
	}
	course, err := NewSurveyor(snap, shipped(t), StoreLoader(p.s.Store()), nil).Course(t.Context(), c)
	if err != nil {
		t.Fatal(err)
	}
	sum := 0.0
	for _, m := range course.Months {
		sum += m.X
	}
	if math.Abs(sum/got.X-1) > 1e-7 || course.Wind.HoursMWh <= 0 || math.Abs(course.Wind.FitMWh/course.Wind.HoursMWh-1) > 0.01 {
		t.Errorf("months sum to %v of %v; %+v", sum, got.X, course.Wind)
	}
	// One year of hours errs by a year: the part is that between years.
	if part := course.Wind.Parts[1].Energy / course.Wind.Sensitivity; math.Abs(part-0.06) > 1e-12 {
		t.Errorf("one year stands for many to %v of speed", part)
	}
	// The typed speed stands aside, unless there are no hours.
	p.set("wind.typed_mean_speed_m_per_s", "9", "wind.typed_height_m", "80")
	if same := p.leaf(p.computed(nil), "wind_p50_mwh").X; same != got.X {
		t.Errorf("the typed speed changed %v to %v", got.X, same)
	}
	p.set("wind.series_factor", "1.1")
	if more := p.leaf(p.computed(nil), "wind_p50_mwh").X; more < 1.1*got.X || more > 1.3*got.X {
		t.Errorf("speeds times 1.1 give %v of %v", more, got.X)
	}
}

// Where layers of wind are loaded they serve, unless the study says that the hours do.
func TestHoursOrLayersOfWind(t *testing.T) {
	p := windYield(t)
	p.grid("wind_resource", "Map", 0, 0, 1000, at100, "m/s", all("5"))
	cache := &Memory{}
	before := p.leaf(p.computed(cache), "wind_p50_mwh")
	if before.Why != "" {
		t.Fatal(before)
	}
	p.blow(8760, time.Hour, func(_ int, u float64) (string, string) { return rayleighOf(u), "" })
	if same := p.leaf(p.computed(cache), "wind_p50_mwh"); same.X != before.X {
		t.Errorf("hours beside a map change its energy from %v to %v", before.X, same.X)
	}
	p.set("wind.source", "hours", "weather.latitude_deg", "48", "weather.longitude_deg", "9.2")
	c := p.computed(cache)
	if got := p.leaf(c, "wind_p50_mwh"); got.X <= before.X || !strings.Contains(got.Source, "km off") || !p.said(c, "wind_far") || p.said(c, "wind_place_unknown") {
		t.Errorf("%v by hours, %v by the map; %q %v", got.X, before.X, got.Source, c.Notices)
	}
}

func TestHoursOfWindThatCannotServe(t *testing.T) {
	for name, one := range map[string]struct {
		row  func(i int, u float64) (string, string)
		rows int
		want string
	}{
		"half of it empty": {func(i int, u float64) (string, string) {
			if i%2 == 0 {
				return "", ""
			}
			return rayleighOf(u), ""
		}, 8760, "wind.series_gaps"},
		"three months":    {func(_ int, u float64) (string, string) { return rayleighOf(u), "" }, 2000, "too many gaps"},
		"a broken column": {func(int, float64) (string, string) { return "600", "" }, 8760, "speed 600 m/s"},
	} {
		p := windYield(t)
		p.blow(one.rows, time.Hour, one.row)
		c := p.computed(nil)
		if l := p.leaf(c, "wind_p50_mwh"); l.Why == "" {
			t.Errorf("%s: energy %v", name, l.X)
		}
		snap, err := p.s.Snapshot()
		if err != nil {
			t.Fatal(err)
		}
		all, err := weatherNotices(context.Background(), p.s.Store(), snap)
		if err != nil || len(all) != 1 || all[0].Code != "wind_hours_not_read" || !strings.Contains(all[0].Args["why"], one.want) {
			t.Errorf("%s: %+v, %v", name, all, err)
		}
	}
	// Gaps that the user allows are used, and told.
	p := windYield(t)
	p.blow(8760, time.Hour, func(i int, u float64) (string, string) {
		if i%3 == 0 {
			return "", ""
		}
		return rayleighOf(u), ""
	})
	p.set("wind.series_gaps", "use")
	if c := p.computed(nil); p.leaf(c, "wind_p50_mwh").X <= 0 || !p.said(c, "wind_hours_missing") {
		t.Errorf("allowed gaps: %v", c.Notices)
	}
}

// Quarters of an hour are brought to hours; a typical year of months of several years is one year.
func TestStepsAndTypicalYears(t *testing.T) {
	p := windYield(t)
	p.blow(4*8760, 15*time.Minute, func(i int, u float64) (string, string) { return fmt.Sprint(4 + 3*(i%4)), "350" })
	snap, err := p.s.Snapshot()
	if err != nil {
		t.Fatal(err)
	}
	rec := snap.LayersOf(study.HourlyRole)[0]
	v, _, err := p.s.Store().Version(t.Context(), rec.Digest)
	if err != nil {
		t.Fatal(err)
	}
	h := readWindHours(v.Layer, rec, snap)
	if h.why != "" || len(h.hours) != 8760 || math.Abs(h.fit.MeanMPerS-8.5) > 1e-9 || math.Abs(h.hours[0].FromDeg-350) > 1e-9 {
		t.Errorf("%s, %d hours of mean %v from %v", h.why, len(h.hours), h.fit.MeanMPerS, h.hours[0].FromDeg)
	}
	year := func(of func(time.Month) int) bool {
		var at []time.Time
		for m := time.January; m <= time.December; m++ {
			at = append(at, time.Date(of(m), m, 1, 0, 0, 0, 0, time.UTC))
		}
		return typicalYear(at)
	}
	if !year(func(m time.Month) int { return 2001 + 3*int(m)%7 }) || year(func(time.Month) int { return 2020 }) {
		t.Error("a typical year is told by its months")
	}
}
