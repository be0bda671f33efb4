package run

import (
	"context"
	"fmt"
	"math"
	"testing"
	"time"

	"groundtally/app/files"
	"groundtally/app/study"
	"groundtally/geo"
	"groundtally/scoring"
)

// uses adds a year of hourly demand.
func (p *plain) uses(load func(hour int) string) {
	p.t.Helper()
	l := &geo.Layer{Columns: []geo.Column{{Name: "time"}, {Name: "load"}}}
	at := time.Date(2024, 1, 1, 0, 0, 0, 0, time.UTC) // a leap year, one day of which stands aside
	for i := range 366 * 24 {
		l.Features = append(l.Features, geo.Feature{ID: fmt.Sprint(i + 1), Values: []geo.Value{geo.TextValue(at.Add(time.Duration(i) * time.Hour).Format(time.RFC3339)), geo.TextValue(load(i))}})
	}
	tools, done := files.NewTools()
	defer done()
	in := study.Import{File: "demand.csv", Base: "demand.csv", Layer: l, Role: "demand", Name: "Demand", Ledger: study.Ledger{Read: len(l.Features)}, Match: map[string]string{"time": "time", "load": "load"}, Units: map[string]string{"load": "kW"}, AcceptProposals: true}
	if _, err := p.s.AddLayer(context.Background(), in, tools); err != nil {
		p.t.Fatal(err)
	}
}

// A plant of even power meets an even demand of half of it with half of its energy, and one that uses nothing by day
// with a quarter.
func TestMatchingByHand(t *testing.T) {
	even := func(int, float64) (string, string) { return "15", "" }
	p := windYield(t)
	p.blow(8760, time.Hour, even)
	p.add("substations", []string{"voltage", "spare_capacity"}, thing{geo.XYGeometry{Kind: geo.Points, Parts: [][][]geo.XY{{{{X: 600, Y: 600}}}}}, map[string]string{"voltage": "20", "spare_capacity": "50000"}})
	c := p.computed(nil)
	if q, _ := c.Consequence("demand_met_frac"); q.State != scoring.Unknown || q.Why != "no_hours_of_demand" && q.Why != "no_layer:demand" {
		t.Fatalf("without demand %+v", q)
	}
	deliveredQ, _ := c.Consequence("delivered_mwh_per_yr")
	delivered := deliveredQ.Central
	kw := delivered / 8.760
	p.uses(func(int) string { return fmt.Sprint(kw / 2) })
	c = p.computed(nil)
	about := func(key string, want float64) {
		t.Helper()
		if q, _ := c.Consequence(key); q.State != scoring.Number || math.Abs(q.Central-want) > 2e-3*math.Max(1, want) {
			t.Errorf("%s: %+v, by hand %v", key, q, want)
		}
	}
	about("demand_met_frac", 1)
	about("surplus_mwh_per_yr", delivered/2)
	if q, _ := c.Consequence("eroi_used"); q.State != scoring.NotSet {
		t.Errorf("what nobody takes is not set, and yet %+v", q)
	}
	p.set("energy.unsold_surplus_share", "1")
	c = p.computed(nil)
	whole, _ := c.Consequence("eroi_extended")
	about("eroi_used", whole.Central/2)

	// By night the whole, by day nothing: half of the energy meets all of the demand.
	p = windYield(t)
	p.blow(8760, time.Hour, even)
	p.add("substations", []string{"voltage", "spare_capacity"}, thing{geo.XYGeometry{Kind: geo.Points, Parts: [][][]geo.XY{{{{X: 600, Y: 600}}}}}, map[string]string{"voltage": "20", "spare_capacity": "50000"}})
	p.uses(func(i int) string {
		if i%24 < 12 {
			return "0"
		}
		return fmt.Sprint(2 * kw)
	})
	c = p.computed(nil)
	about("demand_met_frac", 0.5)
	about("surplus_mwh_per_yr", delivered/2)
}

func TestHourOfYear(t *testing.T) {
	for text, want := range map[string]int{"2023-01-01T00:30": 0, "2023-03-01T00:00": 59 * 24, "2024-03-01T00:00": 59 * 24, "2024-02-29T12:00": -1, "2024-12-31T23:00": 8759} {
		at, err := time.Parse("2006-01-02T15:04", text)
		if err != nil {
			t.Fatal(err)
		}
		if got := hourOfYear(at); got != want {
			t.Errorf("%s is hour %d, not %d", text, got, want)
		}
	}
}
