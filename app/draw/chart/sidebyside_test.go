package chart_test

import (
	"fmt"
	"math"
	"testing"

	"groundtally/app/draw"
	"groundtally/app/draw/chart"
	"groundtally/app/draw/raster"
)

// accounts are three accounts of n rows each, at most fourteen; with more than one, in every state.
func accounts(name func(int) string, n int) chart.Accounts {
	in := chart.Accounts{Title: "accounts", ID: "-accounts", NameA: name(1), NameB: name(2), Caption: "low to high: 10th and 90th percentile of the trials"}
	states := []chart.State{chart.Unknown, chart.None, chart.Never, chart.NotSet, chart.NotAssessed}
	for g := range 3 {
		group := chart.AccountGroup{Name: []string{"energy", "land", name(3)}[g]}
		for i := range min(n, 14) {
			x := math.Pow(10, float64(i%8)) * 1.234
			r := chart.AccountRow{Item: fmt.Sprintf("row-%d-%d", g, i), Title: name(i), Unit: []string{"GWh/yr", "1", "g CO₂e/kWh", "ha yr"}[i%4], Better: []chart.Better{chart.More, chart.Less, chart.Either}[i%3],
				A: chart.Ranged(x*0.8, x, x*1.3), B: chart.Ranged(x*0.2, x*0.5, x*0.6), OverA: i%5 == 2, OverB: i%4 == 1}
			if i%3 == 1 {
				r.B = chart.Amount{State: states[(i+g)%len(states)], Why: name(i)}
			}
			if i%6 == 4 {
				r.A = chart.Amount{State: states[(i+1)%len(states)]}
			}
			if i%7 == 6 {
				r.A = chart.Ranged(-x, -x/2, x)
			}
			group.Rows = append(group.Rows, r)
		}
		in.Groups = append(in.Groups, group)
	}
	return in
}

func TestSideBySideIsTrue(t *testing.T) {
	in := chart.Accounts{NameA: "Ings", NameB: "Moss", Groups: []chart.AccountGroup{
		{Name: "energy", Rows: []chart.AccountRow{{Item: "net", Title: "Net energy", Unit: "GWh", Better: chart.More, A: chart.Ranged(80, 100, 120), B: chart.Num(50)}}},
		{Name: "climate", Rows: []chart.AccountRow{{Item: "gas", Title: "Greenhouse gas", Unit: "t CO₂e", A: chart.Num(3), B: chart.Num(30), OverB: true}}}}}
	for _, width := range []float64{360, 760} {
		s := chart.SideBySide(in, draw.Light(), width)
		net, gas := filled(find(s, "Net energy: A 100 GWh, 80.0 to 120; B 50.0 GWh")), filled(find(s, "Greenhouse gas: A 3.00 t CO₂e; B 30.0 t CO₂e, over the limit"))
		if len(net) != 2 || len(gas) != 2 {
			t.Fatalf("%d and %d bars", len(net), len(gas))
		}
		if math.Abs(long(net[0])/long(net[1])-2) > 1e-9 || math.Abs(long(gas[1])/long(gas[0])-10) > 1e-9 || left(net[0]) != left(gas[1]) {
			t.Error("the bars of a row are not as its amounts")
		}
		if long(net[0]) > 4*long(gas[1]) {
			t.Error("two rows share a scale")
		}
		var span []draw.Path
		for _, p := range find(s, "Net energy: A 100 GWh") {
			if !p.Closed {
				span = append(span, p)
			}
		}
		if len(span) != 1 || math.Abs(long(span[0])/long(net[0])-0.4) > 1e-9 || math.Abs((left(span[0])-left(net[0]))/long(net[0])-0.8) > 1e-9 {
			t.Error("the range does not reach from 80 to 120 where 100 is")
		}
		for _, want := range []string{"Net energy, GWh", "more is better", "100 GWh", "80.0 to 120", "over the limit", "Rows are never", "energy", "climate"} {
			if !says(s, want) {
				t.Errorf("%v: the picture says nowhere %q", width, want)
			}
		}
		if item, _ := raster.Hit(s, left(net[1])+1, net[1].Rings[0][0].Y+2); item != "net" {
			t.Errorf("the row answers with %q", item)
		}
	}
}

func TestSideBySideStates(t *testing.T) {
	if s := chart.SideBySide(chart.Accounts{Groups: []chart.AccountGroup{{Name: "land"}}}, draw.Light(), 420); !says(s, "nothing is accounted for") {
		t.Error("accounts of nothing have a picture")
	}
	for _, c := range []struct {
		state  chart.State
		word   string
		hatch  bool
		amount chart.Amount
	}{{chart.Unknown, "unknown", true, chart.Amount{Why: "no soil"}}, {chart.Number, "unknown", true, chart.Num(math.NaN())}, {chart.None, "none", false, chart.Amount{State: chart.None}}, {chart.Never, "never", false, chart.Amount{State: chart.Never}}, {chart.NotSet, "not set", false, chart.Amount{State: chart.NotSet}}} {
		for _, other := range []chart.Amount{chart.Num(7), c.amount} {
			s := chart.SideBySide(chart.Accounts{NameA: "a", NameB: "b", Groups: []chart.AccountGroup{{Name: "climate", Rows: []chart.AccountRow{{Title: "Carbon payback time", Unit: "yr", A: other, B: c.amount}}}}}, draw.Light(), 760)
			hatched, bars := 0, 0
			for _, p := range find(s, "Carbon payback time") {
				if p.Style.Hatch {
					hatched++
				} else {
					bars++
				}
			}
			want := map[bool]int{true: 1}[c.hatch]
			known := 1
			if other != chart.Num(7) {
				want, known = 2*want, 0
			}
			if hatched != want || bars != known || !says(s, c.word) {
				t.Errorf("%s beside %v: %d hatched, %d drawn", c.word, other.X, hatched, bars)
			}
			for _, x := range textsOf(s) {
				if x.Text == "0 yr" || x.Text == "0.00 yr" {
					t.Errorf("%s is shown as zero", c.word)
				}
			}
		}
	}
	// Nothing is a number too, and has no bar.
	s := chart.SideBySide(chart.Accounts{Groups: []chart.AccountGroup{{Rows: []chart.AccountRow{{Title: "Forest", Unit: "ha", A: chart.Num(0), B: chart.Num(2)}}}}}, draw.Light(), 760)
	if len(filled(find(s, "Forest"))) != 1 || !says(s, "0 ha") {
		t.Error("zero has a bar or no words")
	}
}
