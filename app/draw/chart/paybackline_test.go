package chart_test

import (
	"fmt"
	"math"
	"strings"
	"testing"

	"groundtally/app/draw"
	"groundtally/app/draw/chart"
	"groundtally/app/draw/raster"
)

// balances has up to five grid factors over n years; from 11 on with gaps.
func balances(name func(int) string, n int) chart.Balances {
	in := chart.Balances{Title: "balances", ID: "-balances", Name: name(n), LifeYr: float64(n), Caption: name(5)}
	for c := range min(n, 5) {
		displaced := make([]chart.Amount, n)
		for t := range displaced {
			x := 9000 / []float64{1, 2, 20, 4, 5}[c] * math.Pow(0.9, float64(t))
			displaced[t] = chart.Ranged(0.7*x, x, 1.2*x)
		}
		b := chart.Balance{Item: fmt.Sprintf("case-%d", c), Name: name(c), Tonnes: chart.BalanceOf(chart.Ranged(15000, 20029, 30000), displaced), Payback: chart.Ranged(1.5, 2.3*float64(c+1), 9)}
		switch {
		case n > 10 && c == 0:
			b.Tonnes[7], b.Tonnes[8] = chart.Amount{Why: name(7)}, chart.Amount{}
		case n > 10 && c == 1:
			b.Tonnes, b.Payback = chart.BalanceOf(chart.Amount{Why: name(8)}, displaced), chart.Amount{Why: name(8)}
		case c == 2:
			b.Payback = chart.Amount{State: chart.Never}
		}
		in.Cases = append(in.Cases, b)
	}
	return in
}

// A plant that causes 100 and displaces 40 in the first year, a tenth less in each that follows.
func declining(years int) (displaced []chart.Amount) {
	x := 40.0
	for range years {
		displaced = append(displaced, chart.Ranged(x/2, x, 2*x))
		x *= 0.9
	}
	return displaced
}

func TestBalanceOfAddsUp(t *testing.T) {
	got := chart.BalanceOf(chart.Ranged(80, 100, 130), declining(3))
	want := [][3]float64{{-130, -100, -80}, {-110, -60, 0}, {-92, -24, 72}, {-75.8, 8.4, 136.8}}
	if len(got) != len(want) {
		t.Fatalf("%d years", len(got))
	}
	for i, w := range want {
		if g := got[i]; g.State != chart.Number || math.Abs(g.Low-w[0])+math.Abs(g.X-w[1])+math.Abs(g.High-w[2]) > 1e-9 {
			t.Errorf("after %d years %+v, want %v", i, g, w)
		}
	}
	gap := declining(4)
	gap[1] = chart.Amount{State: chart.NotSet, Why: "factor"}
	got = chart.BalanceOf(chart.Num(100), gap)
	if got[1].State != chart.Number || got[1].X != -60 || got[1].Low != -80 || got[2].State != chart.NotSet || got[4].State != chart.NotSet || got[4].Why != "factor" {
		t.Errorf("years after a gap have numbers: %+v", got)
	}
	for _, g := range chart.BalanceOf(chart.Amount{Why: "peat"}, declining(2)) {
		if g.State != chart.Unknown || g.Why != "peat" {
			t.Errorf("a balance of unknown beginnings is %+v", g)
		}
	}
}

// xs and ys are the corners of a line.
func ys(p draw.Path) (out []float64) {
	for _, q := range p.Rings[0] {
		out = append(out, q.Y)
	}
	return out
}

func lines(s *draw.Scene, words string) (out []draw.Path) {
	for _, p := range find(s, words) {
		if !p.Closed {
			out = append(out, p)
		}
	}
	return out
}

func TestPaybackLineIsTrue(t *testing.T) {
	// −100, −60, −24, 8.4: it comes to 0 at 2 + 24/32.4 = 2.741 years.
	in := chart.Balances{Title: "t", LifeYr: 5, Cases: []chart.Balance{{Item: "a", Name: "average", Tonnes: chart.BalanceOf(chart.Num(100), declining(5)), Payback: chart.Ranged(1.2, 2+24/32.4, 8)}}}
	s := chart.PaybackLine(in, draw.Light(), 760)
	line := lines(s, "average: paid back after 2.7 yr, 1.2 to 8.0 yr")
	if len(line) != 1 || len(line[0].Rings[0]) != 6 {
		t.Fatal("no line of six corners")
	}
	y := ys(line[0])
	if math.Abs((y[0]-y[1])/(y[1]-y[2])-40.0/36) > 1e-9 || math.Abs((y[0]-y[1])/(y[2]-y[3])-40/32.4) > 1e-9 {
		t.Error("the line does not rise as is displaced")
	}
	mark := filled(find(s, "average: paid back"))
	if len(mark) != 1 {
		t.Fatalf("%d marks", len(mark))
	}
	c := draw.Point{X: mark[0].Rings[0][0].X, Y: mark[0].Rings[0][1].Y}
	a, b := line[0].Rings[0][2], line[0].Rings[0][3]
	if on := a.Y + (b.Y-a.Y)*(c.X-a.X)/(b.X-a.X); math.Abs(on-c.Y) > 1e-6 || math.Abs((c.X-a.X)/(b.X-a.X)-24/32.4) > 1e-6 {
		t.Error("the mark does not stand where the line comes to 0")
	}
	if item, title := raster.Hit(s, line[0].Rings[0][5].X-1, y[5]+40); item != "a" || !strings.HasPrefix(title, "after 5 yr: ") {
		t.Errorf("the last year answers with %q, %q", item, title)
	}
	for _, want := range []string{"2.7 yr", "paid back after 2.7 yr, 1.2 to 8.0 yr", "displaced less caused, t CO₂e", "years from the start; life 5.0 yr", "1 average", "low to high", "assumption"} {
		if !says(s, want) {
			t.Errorf("the picture says nowhere %q", want)
		}
	}
	if says(s, "never") || says(s, "−0") {
		t.Error("what is paid back is never")
	}
	if !strings.Contains(s.Title, "paid back after 2.7 yr") {
		t.Error("the sentence does not tell the payback")
	}
}

func TestPaybackLineOfSeveralGrids(t *testing.T) {
	in := chart.Balances{LifeYr: 5, Cases: []chart.Balance{
		{Item: "a", Name: "average", Tonnes: chart.BalanceOf(chart.Num(100), declining(5)), Payback: chart.Num(2.74)},
		{Item: "b", Name: "clean", Tonnes: []chart.Amount{chart.Num(-100), chart.Num(-90), chart.Num(-80), chart.Num(-75), chart.Num(-71), chart.Num(-68)}, Payback: chart.Amount{State: chart.Never}},
		{Item: "c", Name: "marginal", Tonnes: []chart.Amount{chart.Num(-100), chart.Num(0), chart.Num(80), chart.Num(150), chart.Num(200), chart.Num(240)}, Payback: chart.Num(1)},
		{Item: "d", Name: "fourth", Payback: chart.Num(1)}}}
	for _, width := range []float64{360, 760} {
		s := chart.PaybackLine(in, draw.Light(), width)
		dashes := map[string]bool{}
		for i, name := range []string{"average: ", "clean: never within the life", "marginal: paid back after 1.0 yr"} {
			line := lines(s, name)
			if len(line) != 1 {
				t.Fatalf("%d lines of %s", len(line), name)
			}
			dashes[line[0].Style.Dash] = true
			// At its end a line has its number and, where there is room, its name.
			end, near := line[0].Rings[0][5], false
			for _, x := range textsOf(s) {
				near = near || strings.HasPrefix(x.Text, fmt.Sprint(i+1)) && math.Abs(x.At.Y-end.Y) < 16 && x.At.X > end.X && x.At.X < end.X+12 && (width < 500 || strings.Contains(x.Text, strings.Split(name, ":")[0]))
			}
			if !near {
				t.Errorf("%v: %s is not named at its end", width, name)
			}
		}
		if len(dashes) != 3 {
			t.Error("the lines are not told apart by their dashes")
		}
		if !says(s, "never within the life") || !says(s, "1 more grid factor not drawn") || len(filled(find(s, "clean: never"))) != 0 {
			t.Error("never is not written, or has a mark, or a line left out is not counted")
		}
	}
	late := chart.Balances{LifeYr: 25, Cases: []chart.Balance{{Name: "clean", Tonnes: in.Cases[1].Tonnes, Payback: chart.Num(31)}}}
	if s := chart.PaybackLine(late, draw.Light(), 760); !says(s, "not within the life of 25 yr; it would take 31 yr") {
		t.Error("a payback after the life is not called so")
	}
}

func TestPaybackLineWithGaps(t *testing.T) {
	if s := chart.PaybackLine(chart.Balances{}, draw.Light(), 420); !says(s, "not set") {
		t.Error("balances of nothing have a picture")
	}
	in := chart.Balances{LifeYr: 5, Cases: []chart.Balance{{Name: "average", Tonnes: chart.BalanceOf(chart.Num(100), declining(5)), Payback: chart.Amount{Why: "no soil"}}}}
	in.Cases[0].Tonnes[2] = chart.Amount{Why: "no soil"}
	s := chart.PaybackLine(in, draw.Light(), 760)
	gap := find(s, "after 2 yr: unknown: no soil")
	if len(gap) != 1 || !gap[0].Style.Hatch || len(lines(s, "average: payback unknown: no soil")) != 2 {
		t.Error("an unknown year is not hatched, or the line goes through it")
	}
	in.Cases[0].Tonnes = nil
	s = chart.PaybackLine(in, draw.Light(), 760)
	if len(lines(s, "average")) != 0 || !says(s, "payback unknown: no soil") || says(s, "years from") {
		t.Error("an unknown balance has a line")
	}
	in.Cases[0] = chart.Balance{Name: "average", Tonnes: chart.BalanceOf(chart.Num(100), []chart.Amount{{State: chart.NotSet}}), Payback: chart.Amount{State: chart.NotSet}}
	s = chart.PaybackLine(in, draw.Light(), 760)
	if !says(s, "payback not set") || says(s, "paid back after") {
		t.Error("a payback that is not set is a number")
	}
}
