package chart_test

import (
	"math"
	"strings"
	"testing"

	"groundtally/app/draw"
	"groundtally/app/draw/chart"
	"groundtally/app/draw/raster"
)

// yearSum runs over n years, with n of two digits in the red and begun again and again.
func yearSum(name func(int) string, n int) chart.YearSum {
	in := chart.YearSum{Title: "years", ID: "-years", Name: name(n), Item: "sum", What: name(2), Unit: "GWh", Caption: name(5) + "\n" + name(6), Why: name(1)}
	for t := range n {
		in.Points = append(in.Points, chart.YearPoint{Year: float64(t), Sum: 1234.5*float64(t) - 900*float64(n)})
		if t%10 == 9 {
			in.Begun = append(in.Begun, float64(t))
		}
	}
	switch {
	case n == 0:
	case n > 10:
		in.Points = append(in.Points, chart.YearPoint{Year: float64(n) - 0.5, Sum: in.Points[n-1].Sum})
		in.ByUse, in.Above = chart.Num(in.Points[n-1].Sum+0.1), chart.Amount{State: chart.Never}
	case n > 1:
		in.ByUse, in.Above = chart.Num(40000), chart.Num(3)
	}
	return in
}

// A plant that gives 1 a year and costs 2 each time it is built, over 10 years in two lives of 6 and 4.
func twoLives() chart.YearSum {
	in := chart.YearSum{Title: "t", Item: "sum", What: "out less spent, as electricity", Unit: "GWh", Begun: []float64{6}, ByUse: chart.Num(6 + 2.0/3), Above: chart.Num(2), Caption: "first\nsecond"}
	for t := range 11 {
		spent := 2.0
		if t > 6 {
			spent = 4
		}
		in.Points = append(in.Points, chart.YearPoint{Year: float64(t), Sum: float64(t) - spent})
	}
	return in
}

func TestYearLineIsTrue(t *testing.T) {
	s := chart.YearLine(twoLives(), draw.Light(), 760)
	line := lines(s, "out less spent, as electricity: after 10 yr 6.00 GWh")
	if len(line) != 1 || len(line[0].Rings[0]) != 11 {
		t.Fatal("no line of eleven corners")
	}
	q := line[0].Rings[0]
	step := q[0].Y - q[1].Y // 1 GWh
	for i, want := range []float64{1, 1, 1, 1, 1, 1, -1, 1, 1, 1} {
		if got := (q[i].Y - q[i+1].Y) / step; math.Abs(got-want) > 1e-6 {
			t.Errorf("year %d adds %v, want %v", i+1, got, want)
		}
		if got := (q[i+1].X - q[i].X) / (q[1].X - q[0].X); math.Abs(got-1) > 1e-6 {
			t.Errorf("year %d is %v years long", i+1, got)
		}
	}
	use := filled(find(s, "by use: 6.67 GWh"))
	if len(use) != 1 {
		t.Fatal("no mark by use")
	}
	if c := middleOfBox(use[0]); math.Abs(c.X-q[10].X) > 1e-6 || math.Abs((q[10].Y-c.Y)/step-2.0/3) > 1e-6 {
		t.Error("the mark by use does not stand at the horizon, two thirds above the line")
	}
	begun := 0
	for _, it := range s.Items {
		if p, ok := it.(draw.Path); ok && p.Style.Dash == "2 3" && math.Abs(p.Rings[0][0].X-q[6].X) < 1e-6 && p.Rings[0][0].X == p.Rings[0][1].X {
			begun++
		}
	}
	if begun != 1 {
		t.Errorf("%d lines where it is built again", begun)
	}
	if item, title := raster.Hit(s, q[3].X, q[3].Y+30); item != "sum" || title != "after 3 yr: 1.00 GWh" {
		t.Errorf("year 3 answers with %q, %q", item, title)
	}
	for _, want := range []string{"after 10 yr 6.00 GWh, by use 6.67 GWh; 0 or more from the end of year 2 on", "out less spent, as electricity, GWh", "years from the start", "built again", "first", "second"} {
		if !says(s, want) {
			t.Errorf("the picture says nowhere %q", want)
		}
	}
	if !strings.HasPrefix(s.Title, "t: after 10 yr") {
		t.Errorf("the title is %q", s.Title)
	}
}

func TestYearLineInEveryState(t *testing.T) {
	if s := chart.YearLine(chart.YearSum{Why: "life is not known"}, draw.Light(), 420); !says(s, "unknown: life is not known") {
		t.Error("a sum that nobody knows has a picture")
	}
	in := twoLives()
	in.ByUse, in.Above, in.Begun = chart.Amount{State: chart.None}, chart.Amount{State: chart.Never}, nil
	s := chart.YearLine(in, draw.Light(), 420)
	if says(s, "by use") || says(s, "built again") || !says(s, "never 0 or more for good") {
		t.Error("what is not there is told, or what is not")
	}
	// Two ends that read alike are written once.
	in.ByUse = chart.Num(6.001)
	n := 0
	for _, x := range textsOf(chart.YearLine(in, draw.Light(), 760)) {
		if x.Text == "6.00" {
			n++
		}
	}
	if n != 1 {
		t.Errorf("6.00 stands %d times at the end", n)
	}
}
