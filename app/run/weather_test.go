package run

import (
	"context"
	"errors"
	"fmt"
	"math"
	"strings"
	"testing"
	"time"

	"groundtally/app/files"
	"groundtally/app/study"
	"groundtally/geo"
	"groundtally/scoring/sun"
)

// addHours adds a year of hours whose light is a share of that above the atmosphere, on a clock of its own.
func addHours(t *testing.T, s *study.Study, zone time.Duration, change func(i int, f *geo.Feature)) {
	t.Helper()
	snap, err := s.Snapshot()
	if err != nil {
		t.Fatal(err)
	}
	l := &geo.Layer{Columns: []geo.Column{{Name: "time"}, {Name: "ghi"}, {Name: "temperature"}}}
	for at := time.Date(2025, 1, 1, 0, 0, 0, 0, time.UTC).Add(-zone); len(l.Features) < 8760; at = at.Add(time.Hour) {
		mid := at.Add(30 * time.Minute)
		a := sun.At(sun.JulianDay(mid))
		p := a.Seen(snap.Frame.Lat, snap.Frame.Lon, sun.StandardAir(0))
		ghi := 0.5 * sun.NormalWPerM2(a.DistanceAU) * math.Max(0, math.Sin(p.GeometricDeg*math.Pi/180))
		f := geo.Feature{ID: fmt.Sprint(len(l.Features) + 1), Values: []geo.Value{geo.TextValue(at.Add(zone).Format("2006-01-02 15:04")), geo.NumberValue(ghi), geo.NumberValue(9)}}
		change(len(l.Features), &f)
		l.Features = append(l.Features, f)
	}
	if err := s.RemoveLayer(context.Background(), "Hourly year", ""); err != nil {
		t.Fatal(err)
	}
	unsay := func() {
		t.Helper()
		if _, err := s.Set(context.Background(), "set", "", study.SettingEdit{Key: study.StampKey}, study.SettingEdit{Key: study.OffsetKey}); err != nil {
			t.Fatal(err)
		}
	}
	unsay()
	tools, done := files.NewTools()
	defer done()
	in := study.Import{File: "hours.csv", Base: "hours.csv", Layer: l, Role: study.HourlyRole, Name: "Station", Ledger: study.Ledger{Read: len(l.Features)},
		Match: map[string]string{"time": "time", "ghi": "ghi", "temperature": "temperature"}, Units: map[string]string{"ghi": "W/m2", "temperature": "degC"}, AcceptProposals: true}
	var asked *study.QuestionError
	if _, err := s.AddLayer(context.Background(), in, tools); !errors.As(err, &asked) || len(asked.Questions) == 0 {
		t.Fatalf("what the times mean is asked as %v", err)
	}
	in.Stamp, in.OffsetH = "end", "3"
	if _, err := s.AddLayer(context.Background(), in, tools); err != nil {
		t.Fatal(err)
	}
	after, err := s.Snapshot()
	if err != nil || after.Explicit[study.StampKey].Value != "end" || after.Explicit[study.OffsetKey].Value != "3" {
		t.Fatalf("the answers are kept as %v, %v; %v", after.Explicit[study.StampKey], after.Explicit[study.OffsetKey], err)
	}
	unsay() // each test says it anew
}

func TestHoursServeTheYield(t *testing.T) {
	ctx := context.Background()
	s := smallStudy(t, 120)
	set := func(key, value string) {
		t.Helper()
		if _, err := s.Set(ctx, "set", "", study.SettingEdit{Key: key, Value: value}); err != nil {
			t.Fatal(err)
		}
	}
	solarOf := func(r *Results) (yield float64, source string) {
		for i := range r.Candidates {
			c := &r.Candidates[i]
			if c.Plant != "solar_fixed" || c.Status != Fitted {
				continue
			}
			for _, q := range c.All() {
				if q.Key == "specific_yield_kwh_per_kw" {
					yield = q.Central
				}
			}
			for _, l := range c.Leaves() {
				if l.Name == "solar_p50_mwh" {
					source = l.Source
				}
			}
			return yield, source
		}
		t.Fatal("no solar candidate is fitted")
		return 0, ""
	}
	if _, source := solarOf(compute(t, s, nil, 2)); !strings.Contains(source, "the hours of Hourly year (one year)") {
		t.Errorf("the sample's own hours do not serve: %q", source)
	}
	if err := s.RemoveLayer(ctx, "Hourly year", ""); err != nil {
		t.Fatal(err)
	}
	monthly, _ := solarOf(compute(t, s, nil, 2))
	if _, err := s.Undo(ctx); err != nil {
		t.Fatal(err)
	}
	addHours(t, s, -time.Hour, func(int, *geo.Feature) {})
	y, source := solarOf(compute(t, s, nil, 2))
	if y != monthly || !strings.Contains(source, "the hours of Station are not read: what its times mark is not said") {
		t.Errorf("without a word on its times: yield %v (%v by month), source %q", y, monthly, source)
	}
	set("weather.stamp", "start")
	if _, source = solarOf(compute(t, s, nil, 2)); !strings.Contains(source, "weather.utc_offset_h") {
		t.Errorf("without a zone: source %q", source)
	}
	set("weather.utc_offset_h", "-1")
	cache := &Memory{}
	hourly, source := solarOf(compute(t, s, cache, 2))
	if hourly == monthly || hourly < 500 || hourly > 2500 || !strings.Contains(source, "the hours of Station (one year)") || !strings.Contains(source, "monthly sunlight of the study stands aside") {
		t.Errorf("yield %v (%v by month), source %q", hourly, monthly, source)
	}
	snap, err := s.Snapshot()
	if err != nil {
		t.Fatal(err)
	}
	said := func() string {
		all, err := Check(ctx, s.Store(), snap, shipped(t))
		if err != nil {
			t.Fatal(err)
		}
		var out []string
		for _, n := range all {
			if strings.HasPrefix(n.Code, "weather_") {
				out = append(out, n.Code+" "+n.Args["count"])
			}
		}
		return strings.Join(out, "; ")
	}
	if got := said(); got != "" {
		t.Errorf("of a whole file: %s", got)
	}
	// With the clock taken wrong by three hours the year is another, stored results do not stand for it, and check
	// finds out.
	set("weather.utc_offset_h", "2")
	wrong, _ := solarOf(compute(t, s, cache, 2))
	if fresh, _ := solarOf(compute(t, s, nil, 2)); wrong != fresh || wrong == hourly {
		t.Errorf("clock off by three hours: %v, fresh %v, right %v", wrong, fresh, hourly)
	}
	if snap, err = s.Snapshot(); err != nil {
		t.Fatal(err)
	}
	if got := said(); !strings.Contains(got, "weather_night") || !strings.Contains(got, "weather_shift 90") {
		t.Errorf("clock off by three hours: %s", got)
	}
}

func TestHoursThatCannotBeRead(t *testing.T) {
	for name, c := range map[string]struct {
		change func(i int, f *geo.Feature)
		want   string
	}{
		"no time": {func(i int, f *geo.Feature) { f.Values[0] = geo.TextValue("noon") }, `row 1: "noon" is not a time`},
		"gaps":    {func(i int, f *geo.Feature) { f.Values[1] = map[bool]geo.Value{true: {}, false: f.Values[1]}[i%5 == 0] }, "at most 10 % can be filled"},
		"two hours": {func(i int, f *geo.Feature) {
			f.Values[0] = geo.TextValue(time.Date(2025, 1, 1, 2*i, 0, 0, 0, time.UTC).Format(time.RFC3339))
		}, "its rows are 2h0m0s apart"},
	} {
		s := smallStudy(t, 240)
		addHours(t, s, 0, c.change)
		for key, value := range map[string]string{"weather.stamp": "start", "weather.utc_offset_h": "0"} {
			if _, err := s.Set(context.Background(), "set", "", study.SettingEdit{Key: key, Value: value}); err != nil {
				t.Fatal(err)
			}
		}
		snap, err := s.Snapshot()
		if err != nil {
			t.Fatal(err)
		}
		all, err := weatherNotices(context.Background(), s.Store(), snap)
		if err != nil || len(all) != 1 || all[0].Code != "weather_not_read" || !strings.Contains(all[0].Args["why"], c.want) {
			t.Errorf("%s: %+v, %v", name, all, err)
		}
	}
}

func TestReadStamp(t *testing.T) {
	clock := time.FixedZone("", 3600)
	want := time.Date(2025, 6, 21, 12, 0, 0, 0, time.UTC)
	for _, text := range []string{"2025-06-21T12:00:00Z", "2025-06-21T14:00:00+02:00", "2025-06-21 13:00", "2025-06-21 13:00:00", " 21.06.2025 13:00 ", "2025/06/21 13:00", "20250621:1300", "202506211300", "2025062113", "2025-06-21T13:00", "2025-06-21 13"} {
		got, zoned, err := readStamp(text, clock)
		if err != nil || !got.Equal(want) || zoned != strings.ContainsAny(text, "Z+") {
			t.Errorf("%q: %v, %v, %v", text, got, zoned, err)
		}
	}
	for _, text := range []string{"", "13:00", "2025-13-01 00:00", "21/06/2025"} {
		if _, _, err := readStamp(text, clock); err == nil {
			t.Errorf("%q was read", text)
		}
	}
}
