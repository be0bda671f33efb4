package chart_test

import (
	"fmt"
	"math"
	"slices"
	"strconv"
	"strings"
	"testing"

	"groundtally/app/draw"
	"groundtally/app/draw/chart"
)

// boundaries is a plant of n parts; with more than ten, each seventh is unknown.
func boundaries(name func(int) string, n int) chart.Boundaries {
	in := chart.Boundaries{Title: "ladder", ID: "-ladder", Name: name(n), Unit: "TJ"}
	if n%2 == 1 {
		in.Kind = "primary energy that the electricity stands for, over primary energy spent; " + name(2)
	}
	sum := 0.0
	for i := range n {
		q := chart.EnergyPart{Item: fmt.Sprintf("part-%d", i), Name: name(i), At: chart.Boundary(i % 4), Spent: chart.Ranged(60/float64(i+1), 84/float64(i+1), 120/float64(i+1))}
		switch {
		case n > 10 && i%7 == 5:
			q.Spent = chart.Amount{Why: name(i)}
		case n > 10 && i%7 == 6:
			q.Spent = chart.Amount{State: chart.None}
		case n > 10 && i%7 == 4:
			q.Spent = chart.Amount{State: chart.NotSet}
		default:
			sum += q.Spent.X
		}
		in.Parts = append(in.Parts, q)
	}
	for b := range in.Rungs {
		in.Rungs[b] = chart.Rung{Item: fmt.Sprintf("rung-%d", b), Out: chart.Num(3311.28 - 99*float64(b)), Return: chart.Ranged(25, 3311.28/math.Max(sum, 1), 45)}
		if n > 10 && b > 1 {
			in.Rungs[b].Return = chart.Amount{Why: name(b)}
		}
	}
	if n == 40 {
		in.Rungs[0].Out = chart.Amount{}
	}
	if in.NoStocks = n == 3 || n == 11; in.NoStocks {
		in.Caption = name(1) + "\n" + name(4)
	}
	return in
}

// The ladder of example B of the accounts page, without its ranges.
func exampleB() chart.Boundaries {
	in := chart.Boundaries{Title: "t", Name: "B", Unit: "TJ", Parts: []chart.EnergyPart{
		{Item: "turbines", Name: "turbines", Spent: chart.Num(84)}, {Name: "roads", Spent: chart.Num(2.4)},
		{Name: "cable", At: chart.AtGrid, Spent: chart.Num(4.625)}, {Name: "upkeep", At: chart.WholeLife, Spent: chart.Num(13.02)}, {Item: "peat", Name: "peat", At: chart.WithStocks, Spent: chart.Num(100)}}}
	for b, r := range []float64{38.33, 35.29, 30.87, 15.74} {
		in.Rungs[b] = chart.Rung{Item: fmt.Sprintf("rung-%d", b), Out: chart.Num([]float64{3311.28, 3211.94, 3211.94, 3211.94}[b]), Return: chart.Num(r)}
	}
	return in
}

// filled leaves out what is not a filled bar.
func filled(ps []draw.Path) (out []draw.Path) {
	for _, p := range ps {
		if p.Closed && p.Style.Fill != "" {
			out = append(out, p)
		}
	}
	return out
}

func TestLadderIsTrue(t *testing.T) {
	s := chart.Ladder(exampleB(), draw.Light(), 760)
	for b, name := range []string{"at plant", "at grid", "whole life", "with stocks"} {
		bars := filled(find(s, name+": energy return"))
		if len(bars) != 2 {
			t.Fatalf("%s: %d bars, not energy out and energy spent", name, len(bars))
		}
		// The bars are as the return says: out over spent.
		want := []float64{38.33, 35.29, 30.87, 15.74}[b]
		if r := long(bars[0]) / long(bars[1]); math.Abs(r/want-1) > 0.001 {
			t.Errorf("%s: out is %v times as long as spent, want %v", name, r, want)
		}
		if left(bars[0]) != left(bars[1]) {
			t.Errorf("%s: out and spent do not begin together", name)
		}
	}
	turbines, roads, cable := filled(find(s, "turbines: 84.0 TJ"))[0], filled(find(s, "roads: 2.40 TJ"))[0], filled(find(s, "cable: 4.6"))[0]
	if r := long(turbines) / long(roads); math.Abs(r-35) > 1e-6 || math.Abs(right(turbines)-left(roads)) > 1e-9 || math.Abs(right(roads)-left(cable)) > 1e-9 {
		t.Error("the parts are not as long as what they spend, or do not join")
	}
	// Both scales are straight, and how much longer the second is, is what it says.
	for _, x := range textsOf(s) {
		if got := between(x.Text, "on this scale ", " times as long"); got != "" {
			longer := long(find(s, "spent, whole life: 104 TJ")[0]) / long(filled(find(s, "whole life: energy return"))[1])
			if n, err := strconv.ParseFloat(got, 64); err != nil || math.Abs(n/longer-1) > 0.01 {
				t.Errorf("the second scale is said to be %s times as long, want %v", got, longer)
			}
		}
	}
	for b, want := range []string{"38.3", "35.3", "30.9", "15.7"} {
		if !says(s, "energy return "+want) {
			t.Errorf("rung %d has no return", b)
		}
	}
	for _, want := range []string{"this program's own ratio", chart.ElectricOverPrimary, "energy over the life, TJ; electricity out", "spent, with stocks", "times as long as above"} {
		if !says(s, want) {
			t.Errorf("the picture says nowhere %q", want)
		}
	}
	sum := find(s, "spent, whole life: 104 TJ")
	if len(sum) != 1 || sum[0].Style.Fill != "" || math.Abs(right(sum[0])-right(filled(find(s, "upkeep: 13.0 TJ"))[0])) > 1e-9 {
		t.Error("the sum of a boundary does not end where its last part does")
	}
}

// Two ways of counting never share an axis: another kind is said at the head and at the axis, and the electric one
// nowhere.
func TestLadderOfAnotherKind(t *testing.T) {
	in := exampleB()
	in.Kind = "primary energy equivalent out over primary energy spent"
	s := chart.Ladder(in, draw.Light(), 760)
	if !says(s, "Energy return: "+in.Kind) || !says(s, "energy over the life, TJ; "+in.Kind) || says(s, chart.ElectricOverPrimary) || !strings.Contains(s.Title, in.Kind) {
		t.Error("the kind is not said everywhere, or another is")
	}
}

// Without stocks their rung and what is spent on them are nowhere; the rest is as before.
func TestLadderWithoutStocks(t *testing.T) {
	in := exampleB()
	in.NoStocks, in.Caption = true, "one thing\nand another"
	s := chart.Ladder(in, draw.Light(), 760)
	for _, not := range []string{"with stocks", "peat", "this program's own ratio"} {
		if says(s, not) || len(find(s, not)) > 0 || strings.Contains(s.Title, not) {
			t.Errorf("%q is still there", not)
		}
	}
	bars := filled(find(s, "whole life: energy return"))
	if len(bars) != 2 || math.Abs(long(bars[0])/long(bars[1])/30.87-1) > 0.001 || !says(s, "energy return 30.9") {
		t.Error("the last rung is not that of the whole life")
	}
	for _, want := range []string{"one thing", "and another"} {
		if !slices.ContainsFunc(textsOf(s), func(x draw.Text) bool { return x.Text == want }) {
			t.Errorf("%q has no line of its own", want)
		}
	}
}

func TestLadderWithGaps(t *testing.T) {
	if s := chart.Ladder(chart.Boundaries{}, draw.Light(), 420); !says(s, "unknown") {
		t.Error("a ladder of nothing has a picture")
	}
	in := exampleB()
	in.Parts[4].Spent = chart.Amount{Why: "no layer of peat"}
	in.Rungs[3].Return = chart.Amount{Why: "no layer of peat"}
	s := chart.Ladder(in, draw.Light(), 760)
	peat := find(s, "peat: unknown: no layer of peat")
	if len(peat) != 1 || !peat[0].Style.Hatch {
		t.Error("an unknown part is not hatched")
	}
	if !says(s, "energy return unknown") || !says(s, "at least 104 TJ") || !says(s, "1 part without a number") {
		t.Error("a sum without one of its parts does not say so")
	}
	hatched := 0
	for _, p := range find(s, "with stocks: energy return unknown") {
		if p.Style.Hatch {
			hatched++
		}
	}
	if hatched != 1 {
		t.Error("what is spent looks known")
	}
	// What is none is no gap.
	in.Parts[4].Spent, in.Rungs[3].Return = chart.Amount{State: chart.None}, in.Rungs[2].Return
	s = chart.Ladder(in, draw.Light(), 760)
	if says(s, "at least") || says(s, "without a number") || !says(s, "none") {
		t.Error("a part that does not exist is counted as missing")
	}
	for _, p := range find(s, "peat: ") {
		t.Errorf("a part that does not exist has a bar: %q", p.Title)
	}
	// What nobody filled in is unknown.
	in.Rungs = [4]chart.Rung{}
	if s := chart.Ladder(in, draw.Light(), 760); !says(s, "energy return unknown") || says(s, "energy return 0") {
		t.Error("a return that nobody gave is a number")
	}
}

// between gives what a text has between two others; nothing where it has not both.
func between(text, before, after string) string {
	_, rest, ok := strings.Cut(text, before)
	got, _, ok2 := strings.Cut(rest, after)
	if !ok || !ok2 {
		return ""
	}
	return got
}
