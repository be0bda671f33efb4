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

// curve is a machine of 4.2 MW in n bands of wind speed; with more than ten, each seventh is unknown in one of its numbers.
func curve(name func(int) string, n int) chart.PowerCurve {
	in := chart.PowerCurve{Title: "curve", ID: "-curve", Machine: name(n), Published: n%2 == 1, RatedKW: 4200, MeanSpeedMPerS: 7.13, CutInMPerS: 3, CutOutMPerS: 25}
	sum := 0.0
	for i := range n {
		v := float64(i) + 0.5
		b := chart.SpeedBin{SpeedMPerS: v, Time: math.Pi / 2 * v / 49 * math.Exp(-math.Pi/4*v*v/49)}
		if v > 3 && v < 25 {
			b.PowerKW = math.Min(4200, 4.1*v*v*v-60)
		}
		b.Energy = b.Time * b.PowerKW
		sum += b.Energy
		in.Bins = append(in.Bins, b)
	}
	for i := range in.Bins {
		if sum > 0 {
			in.Bins[i].Energy /= sum
		}
		if n%2 == 0 && n > 30 && i%7 == 5 {
			*[]*float64{&in.Bins[i].Time, &in.Bins[i].PowerKW, &in.Bins[i].Energy}[i%3] = math.NaN()
		}
	}
	return in
}

func TestCurveOverWindIsTrue(t *testing.T) {
	in := chart.PowerCurve{Title: "t", Machine: "Ings 120", RatedKW: 2000, MeanSpeedMPerS: 7, CutInMPerS: 3, CutOutMPerS: 25}
	for i, energy := range []float64{0, 0.25, 0.5, 0.25} {
		in.Bins = append(in.Bins, chart.SpeedBin{SpeedMPerS: 4 + 2*float64(i), Time: 0.1 * float64(i+1), PowerKW: 500 * float64(i+1), Energy: energy})
	}
	s := chart.CurveOverWind(in, draw.Light(), 420)
	height := func(p draw.Path) float64 { return p.Rings[0][2].Y - p.Rings[0][0].Y }
	two, three := find(s, "5 to 7 m/s: 20.0 % of the year, power 1000 kW, 25.0 % of the energy"), find(s, "7 to 9 m/s: 30.0 % of the year")
	if len(two) != 2 || len(three) != 2 {
		t.Fatalf("%d and %d bars of two bands", len(two), len(three))
	}
	if math.Abs(height(three[0])/height(two[0])-1.5) > 1e-9 || math.Abs(height(three[1])/height(two[1])-2) > 1e-9 || math.Abs(height(two[1])/height(two[0])-1.25) > 1e-9 {
		t.Error("the bars are not as high as their shares")
	}
	const words = "half of the energy between 7.0 and 9.0 m/s"
	if !says(s, words) || !strings.Contains(s.Title, words) || !says(s, "mean 7 m/s") || !says(s, "runs from 3 to 25 m/s") || !says(s, "rated 2000 kW") || !says(s, "power, kW") || !says(s, "%") {
		t.Error("half of the energy, the mean, the range or a unit is not told")
	}
	if b := find(s, words); len(b) != 1 || math.Abs(left(b[0])-(left(two[0])+long(two[0]))) > 3 {
		t.Error("the middle half does not lie over its bars")
	}
	if item, title := raster.Hit(s, (left(two[0])+right(two[0]))/2, two[0].Rings[0][2].Y-1); item != "bin-1" || !strings.HasPrefix(title, "5 to 7 m/s") {
		t.Errorf("the second band answers with %q, %q", item, title)
	}
	for _, x := range textsOf(s) {
		if strings.HasPrefix(x.Text, "generic estimate") != (x.Colour == draw.Warm) {
			t.Errorf("%q is in %s", x.Text, x.Colour)
		}
	}
	in.Published = true
	if s := chart.CurveOverWind(in, draw.Light(), 420); says(s, "generic") || !says(s, "from a table, not an estimate") {
		t.Error("a published curve is not called so")
	}
}

func TestCurveOverWindWithGaps(t *testing.T) {
	if s := chart.CurveOverWind(chart.PowerCurve{}, draw.Light(), 420); !says(s, "unknown") {
		t.Error("a curve of nothing has a picture")
	}
	calm := chart.PowerCurve{Bins: []chart.SpeedBin{{SpeedMPerS: 3, Time: 1}}}
	if s := chart.CurveOverWind(calm, draw.Light(), 420); says(s, "half") || says(s, "mean") || !says(s, "share of the year") {
		t.Error("a calm has energy or a mean")
	}
	in := curve(names["short"], 30)
	whole := len(find(chart.CurveOverWind(in, draw.Light(), 640), "m/s: "))
	in.Bins[8].Energy = math.NaN()
	s := chart.CurveOverWind(in, draw.Light(), 640)
	hatched := 0
	for _, p := range find(s, "8 to 9 m/s: ") {
		if p.Style.Hatch {
			hatched++
		}
	}
	if hatched != 1 || says(s, "half of the energy") || !says(s, "unknown") || len(find(s, "m/s: ")) != whole {
		t.Error("an unknown share is not hatched, or half of the energy is known without it")
	}
}

// A table of speeds that goes on far beyond the wind does not press the picture together.
func TestCurveOverWindLeavesOutTheEmptyEnd(t *testing.T) {
	in := curve(names["short"], 60)
	for i := range in.Bins {
		if in.Bins[i].SpeedMPerS > 24 || math.IsNaN(in.Bins[i].Time+in.Bins[i].PowerKW+in.Bins[i].Energy) {
			in.Bins[i] = chart.SpeedBin{SpeedMPerS: in.Bins[i].SpeedMPerS}
		}
	}
	labels := map[string]bool{}
	for _, x := range textsOf(chart.CurveOverWind(in, draw.Light(), 420)) {
		labels[x.Text] = true
	}
	for _, beyond := range []string{"30", "40", "50", "60"} {
		if !labels["20"] || labels[beyond] {
			t.Errorf("the axis goes on beyond the wind: %v", labels)
		}
	}
}

func TestCurveOverWindInEveryState(t *testing.T) {
	for paletteName, p := range palettes {
		for _, width := range []float64{320, 420, 640} {
			for _, mean := range []float64{0.2, 3, 11, 24.9, 40} {
				for _, n := range []int{1, 2, 3, 26, 34} {
					in := curve(names["short"], n)
					in.MeanSpeedMPerS = mean
					s := chart.CurveOverWind(in, p, width)
					where := fmt.Sprintf("%s, %v, mean %v of %d bands", paletteName, width, mean, n)
					holdTexts(t, where, s)
					holdShapes(t, where, s)
				}
			}
		}
	}
}
