package chart_test

import (
	"fmt"
	"math"
	"testing"

	"groundtally/app/draw"
	"groundtally/app/draw/chart"
	"groundtally/app/draw/raster"
)

// sweep is a plant of rising density whose energy saturates; with more than ten points, with gaps.
func sweep(name func(int) string, n int) chart.Sweep {
	in := chart.Sweep{Title: "sweep", ID: "-sweep", Swept: "spacing", SweptUnit: "rotor diameters", Unit: "MWh/(ha yr)", NetAs: "as electricity", Caption: name(3)}
	if n%2 == 1 {
		in.Currency = name(4)
	}
	at := func(d float64) (energy, ret, stocks float64) {
		energy = 300 * d * (1 - 0.5*d)
		return energy, energy / (4 + 9*d), energy / (9 + 16*d)
	}
	for i := range n {
		d := 0.2 + float64(i)/float64(n)
		e, r, st := at(d)
		q := chart.CrowdPoint{Item: fmt.Sprintf("point-%d", i), Swept: 12 - 9*float64(i)/float64(n), Energy: chart.Num(e), Return: chart.Num(r), WithStocks: chart.Num(st)}
		if n > 10 && i%9 == 4 {
			*[]*chart.Amount{&q.Energy, &q.Return, &q.WithStocks}[i/9%3] = chart.Amount{Why: name(i)}
		}
		in.Points = append(in.Points, q)
	}
	for i, m := range []*chart.CrowdMark{&in.BestReturn, &in.MostNet, &in.MostEnergy, &in.Chosen} {
		e, r, _ := at([]float64{0.45, 0.86, 1, 0.45}[i])
		*m = chart.CrowdMark{Item: fmt.Sprintf("mark-%d", i), State: chart.Number, Swept: 3.5 + float64(i), Energy: e, Return: r, AtEnd: i == 2}
		if n > 10 && i == 1 {
			*m = chart.CrowdMark{Why: name(2)}
		}
	}
	return in
}

func TestCrowdingIsTrue(t *testing.T) {
	in := chart.Sweep{Title: "t", Swept: "spacing", SweptUnit: "rotor diameters", Unit: "MWh/(ha yr)", NetAs: "as electricity", Points: []chart.CrowdPoint{
		{Item: "p0", Swept: 9, Energy: chart.Num(10), Return: chart.Num(20), WithStocks: chart.Num(10)},
		{Item: "p1", Swept: 7, Energy: chart.Num(40), Return: chart.Num(30), WithStocks: chart.Num(14)},
		{Item: "p2", Swept: 5, Energy: chart.Num(70), Return: chart.Num(25), WithStocks: chart.Num(12)},
		{Item: "p3", Swept: 3, Energy: chart.Num(60), Return: chart.Num(5), WithStocks: chart.Num(3)}},
		BestReturn: chart.CrowdMark{Item: "return", State: chart.Number, Swept: 7, Energy: 40, Return: 30},
		MostNet:    chart.CrowdMark{Item: "net", State: chart.Number, Swept: 5.5, Energy: 66, Return: 26},
		MostEnergy: chart.CrowdMark{Item: "energy", State: chart.Number, Swept: 5, Energy: 70, Return: 25},
		Chosen:     chart.CrowdMark{Item: "chosen", State: chart.Number, Swept: 9, Energy: 10, Return: 20, AtEnd: true}}
	s := chart.Crowding(in, draw.Light(), 760)
	dots := map[string][2]draw.Point{}
	for i, want := range []string{"spacing 9 rotor diameters: 10.0 MWh/(ha yr); energy return 20.0; with stocks 10.0", "spacing 7 rotor diameters: ", "spacing 5 rotor diameters: ", "spacing 3 rotor diameters: "} {
		d := find(s, want)
		if len(d) != 2 {
			t.Fatalf("%d points for %q", len(d), want)
		}
		dots[fmt.Sprint(i)] = [2]draw.Point{middle(d[1]), middle(d[0])} // with stocks is drawn below
	}
	x := func(i int) float64 { return dots[fmt.Sprint(i)][0].X }
	y := func(i, k int) float64 { return dots[fmt.Sprint(i)][k].Y }
	if math.Abs((x(1)-x(0))/(x(2)-x(0))-0.5) > 1e-6 || math.Abs((x(3)-x(0))/(x(2)-x(0))-5.0/6) > 1e-6 {
		t.Error("the points do not stand by their energy")
	}
	if math.Abs((y(0, 0)-y(1, 0))/(y(2, 0)-y(1, 0))-2) > 1e-6 || math.Abs((y(0, 1)-y(0, 0))/(y(0, 0)-y(1, 0))-1) > 1e-6 {
		t.Error("the points do not stand by their return, or the two lines have two scales")
	}
	solid, dashed := 0, 0
	for _, it := range s.Items {
		if p, ok := it.(draw.Path); ok && !p.Closed && len(p.Rings[0]) == 4 && p.Style.Stroke != draw.Paper {
			if p.Style.Dash == "" {
				solid++
			} else {
				dashed++
			}
		}
	}
	if solid != 1 || dashed != 1 {
		t.Errorf("%d solid and %d dashed lines through all points", solid, dashed)
	}
	corners := map[int]bool{}
	for _, m := range []struct {
		words, item string
		at          int
	}{{"best return: spacing 7 rotor diameters, 40.0 MWh/(ha yr), return 30.0", "return", 1}, {"most net energy as electricity: spacing 5.50 rotor diameters", "net", -1}, {"most energy per hectare: spacing 5 ", "energy", 2}, {"your choice: spacing 9 ", "chosen", 0}} {
		marks := find(s, m.words)
		if len(marks) != 2 { // in the plot, and beside its words
			t.Fatalf("%d marks for %q", len(marks), m.words)
		}
		corners[len(marks[0].Rings[0])*10+int(math.Round(math.Abs(marks[0].Rings[0][0].X-middle(marks[0]).X)))] = true
		if m.at >= 0 && math.Hypot(middleOfBox(marks[0]).X-x(m.at), marks[0].Rings[0][0].Y-y(m.at, 0)) > 9 {
			t.Errorf("%s does not stand on its point", m.words)
		}
		if got, _ := raster.Hit(s, middleOfBox(marks[0]).X, middleOfBox(marks[0]).Y); got != m.item && m.at >= 0 {
			t.Errorf("%s answers with %q", m.words, got)
		}
	}
	if len(corners) != 4 {
		t.Errorf("the marks have %d shapes", len(corners))
	}
	for _, want := range []string{"energy per hectare, MWh/(ha yr); " + chart.ElectricEnergy, "energy return, whole life: " + chart.ElectricOverPrimary, "with stocks, this program's own ratio", "may lie beyond", "best return", "your choice", "for you to say"} {
		if !says(s, want) {
			t.Errorf("the picture says nowhere %q", want)
		}
	}
}

func middle(p draw.Path) (c draw.Point) {
	for _, q := range p.Rings[0] {
		c.X, c.Y = c.X+q.X/float64(len(p.Rings[0])), c.Y+q.Y/float64(len(p.Rings[0]))
	}
	return c
}

func middleOfBox(p draw.Path) draw.Point {
	x0, x1, y0, y1 := math.Inf(1), math.Inf(-1), math.Inf(1), math.Inf(-1)
	for _, q := range p.Rings[0] {
		x0, x1, y0, y1 = math.Min(x0, q.X), math.Max(x1, q.X), math.Min(y0, q.Y), math.Max(y1, q.Y)
	}
	return draw.Point{X: (x0 + x1) / 2, Y: (y0 + y1) / 2}
}

func TestCrowdingWithGaps(t *testing.T) {
	if s := chart.Crowding(chart.Sweep{Swept: "spacing"}, draw.Light(), 420); !says(s, "unknown") {
		t.Error("a sweep of nothing has a picture")
	}
	in := sweep(names["short"], 6)
	in.Points[2].Return, in.Points[4].Energy, in.MostNet = chart.Amount{Why: "no row"}, chart.Amount{}, chart.CrowdMark{Why: "too few points"}
	for i := range in.Points {
		in.Points[i].WithStocks = chart.Amount{Why: "no soil"}
	}
	s := chart.Crowding(in, draw.Light(), 760)
	hatched := 0
	for _, p := range find(s, "energy return unknown: no row") {
		if p.Style.Hatch {
			hatched++
		}
	}
	if hatched != 1 || !says(s, "most net energy as electricity: unknown: too few points") || !says(s, "The return with stocks is unknown") || says(s, "this program's own") {
		t.Error("what is unknown is not hatched or not told")
	}
	if !says(s, "2 of 6 points cannot be placed") {
		t.Error("points that cannot be placed are not counted")
	}
	in.MostNet.State = chart.NotSet
	if s := chart.Crowding(in, draw.Light(), 760); !says(s, "as electricity: not set") {
		t.Error("a state is not told")
	}
}

// Marks on one place are all seen.
func TestCrowdingMarksOnOnePlace(t *testing.T) {
	in := sweep(names["short"], 6)
	in.MostNet, in.MostEnergy, in.Chosen = in.BestReturn, in.BestReturn, in.BestReturn
	s := chart.Crowding(in, draw.Light(), 760)
	size := func(words string) float64 {
		p := find(s, words)[0]
		return math.Abs(p.Rings[0][0].Y - middleOfBox(p).Y)
	}
	if a, b, c := size("best return: "), size("most energy per hectare: "), size("your choice: "); !(a < b && b < c) {
		t.Errorf("marks cover each other: %v, %v, %v", a, b, c)
	}
}
