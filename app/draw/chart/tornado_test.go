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

// drivers are n factor groups; with more than ten, some without a number.
func drivers(name func(int) string, n int) chart.Drivers {
	in := chart.Drivers{Title: "drivers", ID: "-drivers", What: name(n), Trials: 1000 * n}
	for i := range n {
		d := chart.Driver{Item: fmt.Sprintf("group-%d", i), Name: name(i), Rank: chart.Num(math.Cos(float64(i)*1.7) * (1 - float64(i)/50))}
		if n > 10 && i%5 == 3 || n == 11 {
			d.Rank = []chart.Amount{{Why: name(i)}, {State: chart.NotSet}, {State: chart.None}, chart.Num(1.2)}[i%4]
		}
		in.Groups = append(in.Groups, d)
	}
	return in
}

func TestTornadoIsTrue(t *testing.T) {
	in := chart.Drivers{What: "energy return", Trials: 4000, Groups: []chart.Driver{{Item: "steel", Name: "steel", Rank: chart.Num(-0.2)}, {Item: "wind", Name: "wind", Rank: chart.Num(0.8)}, {Item: "life", Name: "life", Rank: chart.Num(0.4)}, {Item: "paint", Name: "paint", Rank: chart.Num(0.001)}}}
	for _, width := range []float64{360, 760} {
		s := chart.Tornado(in, draw.Light(), width)
		steel, wind, life := find(s, "steel: rank correlation −0.20 lowers"), find(s, "wind: rank correlation +0.80 raises"), find(s, "life: rank correlation +0.40 raises")
		if len(steel) != 1 || len(wind) != 1 || len(life) != 1 {
			t.Fatalf("%d, %d, %d bars", len(steel), len(wind), len(life))
		}
		if math.Abs(long(wind[0])/long(life[0])-2) > 1e-9 || math.Abs(long(life[0])/long(steel[0])-2) > 1e-9 || math.Abs(right(steel[0])-left(wind[0])) > 1e-9 || left(wind[0]) != left(life[0]) {
			t.Error("the bars are not as long as the correlations, to the right and the left of one line")
		}
		y := func(p draw.Path) float64 { return p.Rings[0][0].Y }
		if y(wind[0]) >= y(life[0]) || y(life[0]) >= y(steel[0]) {
			t.Error("the strongest does not stand first")
		}
		for _, want := range []string{"+0.80 raises", "−0.20 lowers", "0.00 neither", "lowers it", "raises it", "What moves energy return", "pure number from −1 to 1", "over 4000 trials; not by how much"} {
			if !strings.Contains(allWords(s), want) {
				t.Errorf("%v: the picture says nowhere %q", width, want)
			}
		}
		if item, _ := raster.Hit(s, 20, y(steel[0])+3); item != "steel" {
			t.Errorf("the row of steel answers with %q", item)
		}
	}
}

// allWords joins the lines of a picture, so that it does not matter where they break.
func allWords(s *draw.Scene) string {
	var out []string
	for _, x := range textsOf(s) {
		out = append(out, x.Text)
	}
	return strings.Join(out, " ")
}

func TestTornadoCountsTheRest(t *testing.T) {
	in := chart.Drivers{What: "payback"}
	for i := range 20 {
		in.Groups = append(in.Groups, chart.Driver{Name: fmt.Sprintf("group %d", i), Rank: chart.Num(0.9 - 0.04*float64(i))})
	}
	in.Groups[19].Rank, in.Groups[0].Rank = chart.Amount{}, chart.Num(-0.9)
	s := chart.Tornado(in, draw.Light(), 760)
	if n := len(find(s, ": rank correlation")); n != 12 {
		t.Errorf("%d rows", n)
	}
	// The thirteenth has 0.9 − 0.04·12 = 0.42.
	if !says(s, "8 more groups not drawn: 7 with a correlation of 0.42 at most; 1 without a number") {
		t.Error("the rest is not counted")
	}
	if len(find(s, "group 0: rank correlation −0.90 lowers")) != 1 {
		t.Error("a strong one to the left is not among the first")
	}
}

func TestTornadoWithGaps(t *testing.T) {
	if s := chart.Tornado(chart.Drivers{}, draw.Light(), 420); !says(s, "unknown") {
		t.Error("drivers of nothing have a picture")
	}
	in := chart.Drivers{What: "x", Groups: []chart.Driver{{Name: "soil", Rank: chart.Amount{Why: "no soil"}}, {Name: "broken", Rank: chart.Num(1.4)}, {Name: "fixed", Rank: chart.Amount{State: chart.None}}, {Name: "wind", Rank: chart.Num(0.1)}}}
	s := chart.Tornado(in, draw.Light(), 760)
	for _, words := range []string{"soil: rank correlation unknown: no soil", "broken: rank correlation unknown"} {
		if p := find(s, words); len(p) != 1 || !p[0].Style.Hatch {
			t.Errorf("%q is not hatched", words)
		}
	}
	if len(find(s, "fixed: ")) != 0 || !says(s, "none") || says(s, "0.00") {
		t.Error("what is none has a bar, or is a number")
	}
}
