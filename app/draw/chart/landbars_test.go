package chart_test

import (
	"math"
	"strconv"
	"testing"

	"groundtally/app/draw"
	"groundtally/app/draw/chart"
	"groundtally/app/draw/raster"
)

// ground7 is a plant on seven kinds of land: for 0 nothing is known, from 11 on some of it is not, for 2 and for 40 the
// total is far larger than the rest.
func ground7(name func(int) string, n int) chart.Ground {
	in := chart.Ground{Title: "ground", ID: "-ground", Name: name(n)}
	if n == 0 {
		return in
	}
	x := float64(n)
	for i, k := range []*chart.LandKind{&in.Total, &in.Permanent, &in.Temporary, &in.Farmland, &in.Habitat, &in.Forest, &in.Peat} {
		k.Item, k.Ha, k.Years = "kind-"+name(i), chart.Ranged(x*0.7/float64(i+1), x/float64(i+1), x*1.4/float64(i+1)), chart.Num(25)
		if n%2 == 0 && i > 0 {
			k.Ha = chart.Num(k.Ha.X / 30)
		}
		if i%3 == 1 {
			k.Remark = name(i)
		}
		if i == 2 {
			k.Years = chart.Num(1.5)
		}
		if n > 10 && i > 2 {
			k.Ha = [...]chart.Amount{{Why: name(i)}, {State: chart.None}, chart.Num(0.0001), chart.Num(x / 50)}[i-3]
			k.Years = [...]chart.Amount{{}, {}, {}, {State: chart.NotSet}}[i-3]
		}
	}
	in.HaYears, in.Caption = chart.Num(90*x), name(6)
	if n == 11 {
		in.Total.Ha, in.HaYears = chart.Amount{}, chart.Amount{Why: name(4)}
	}
	return in
}

func kind(item string, ha float64) chart.LandKind {
	return chart.LandKind{Item: item, Ha: chart.Num(ha), Years: chart.Num(25)}
}

func TestLandBarsAreTrue(t *testing.T) {
	in := chart.Ground{Total: kind("total", 10), Permanent: kind("permanent", 2), Temporary: kind("temporary", 1), Farmland: kind("farmland", 4), Habitat: kind("habitat", 0.5), Forest: kind("forest", 0), Peat: kind("peat", 1), HaYears: chart.Num(52)}
	in.Temporary.Years = chart.Num(1.5)
	for _, width := range []float64{360, 760} {
		s := chart.LandBars(in, draw.Light(), width)
		total, permanent, temporary, farmland := find(s, "total ground: 10.00 ha"), find(s, "sealed or built, permanent: 2.00 ha"), find(s, "disturbed while building, temporary: 1.00 ha"), find(s, "farmland taken: 4.00 ha")
		if len(total) != 1 || len(permanent) != 2 || len(temporary) != 2 || len(farmland) != 1 {
			t.Fatalf("%d, %d, %d, %d shapes", len(total), len(permanent), len(temporary), len(farmland))
		}
		if total[0].Style.Fill != "" || total[0].Style.Stroke == "" || permanent[0].Style.Fill == "" || permanent[0].Style.Fill == temporary[0].Style.Fill {
			t.Error("the total is no outline, or its parts are no fills apart from each other")
		}
		for what, d := range map[string]float64{"permanent": long(permanent[0])/long(total[0]) - 0.2, "by itself": long(permanent[1])/long(total[0]) - 0.2, "temporary": long(temporary[0])/long(total[0]) - 0.1, "farmland": long(farmland[0])/long(total[0]) - 0.4,
			"inside": left(permanent[0]) - left(total[0]), "joined": left(temporary[0]) - right(permanent[0]), "straight": left(farmland[0]) - left(total[0])} {
			if math.Abs(d) > 1e-6 {
				t.Errorf("%s is off by %v", what, d)
			}
		}
		for _, want := range []string{"for 25 yr: 50.0 ha yr", "for 1.5 yr: 1.50 ha yr", "any peat is flagged", "Ground times years: 52.0 ha yr", "area, ha", "not added", "total ground"} {
			if !says(s, want) {
				t.Errorf("%v: the picture says nowhere %q", width, want)
			}
		}
		if says(s, "as long as above") || len(find(s, "forest cleared")) != 0 || !says(s, "forest cleared") {
			t.Error("there is a second scale, or forest of 0 ha has a bar, or no row")
		}
		if item, _ := raster.Hit(s, left(farmland[0])+1, farmland[0].Rings[0][0].Y+2); item != "farmland" {
			t.Errorf("the row of farmland answers with %q", item)
		}
	}
}

// A total far larger than its parts does not press them together, and the other scale is said.
func TestLandBarsOfAWidePlant(t *testing.T) {
	in := chart.Ground{Total: kind("total", 400), Permanent: kind("permanent", 4), Temporary: kind("temporary", 2), Farmland: kind("farmland", 3), Habitat: kind("habitat", 1), Forest: kind("forest", 1), Peat: chart.LandKind{Ha: chart.Amount{State: chart.None}}}
	s := chart.LandBars(in, draw.Light(), 760)
	total, permanent, temporary := find(s, "total ground")[0], find(s, "sealed or built"), find(s, "disturbed while building")
	if math.Abs(long(permanent[0])/long(total)-0.01) > 1e-6 || math.Abs(long(permanent[1])/long(temporary[1])-2) > 1e-6 {
		t.Error("a panel is not straight")
	}
	want := long(permanent[1]) / long(permanent[0])
	if want < 50 || !says(s, "on this scale a hectare is ") || says(s, "any peat") {
		t.Errorf("the parts are %v times as long, which is not said, or peat is flagged where there is none", want)
	}
	for _, x := range textsOf(s) {
		if got := between(x.Text, "a hectare is ", " times"); got != "" {
			if n, err := strconv.ParseFloat(got, 64); err != nil || math.Abs(n/want-1) > 0.01 {
				t.Errorf("a hectare is said to be %s times as long, want %v", got, want)
			}
		}
	}
}

func TestLandBarsWithGaps(t *testing.T) {
	s := chart.LandBars(chart.Ground{}, draw.Light(), 760)
	hatched := 0
	for _, p := range find(s, ": unknown") {
		if p.Style.Hatch {
			hatched++
		}
	}
	if hatched != 7 || !says(s, "Ground times years: unknown") || says(s, "0.00 ha") {
		t.Errorf("%d of 7 kinds that nobody gave are hatched", hatched)
	}
	in := chart.Ground{Total: kind("total", 10), Peat: chart.LandKind{Ha: chart.Num(1)}}
	if s := chart.LandBars(in, draw.Light(), 760); !says(s, "years unknown") || says(s, "1.00 ha yr") {
		t.Error("years that nobody gave are a number")
	}
}
