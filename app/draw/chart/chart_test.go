package chart_test

import (
	"bytes"
	"fmt"
	"image"
	"image/png"
	"math"
	"math/rand/v2"
	"os"
	"path/filepath"
	"strconv"
	"strings"
	"testing"

	"groundtally/app/draw"
	"groundtally/app/draw/chart"
	"groundtally/app/draw/raster"
	"groundtally/app/draw/svg"
)

var widths = []float64{320, 480, 760, 1000}

var palettes = map[string]draw.Palette{"light": draw.Light(), "dark": draw.Dark()}

// names are short, of sixty letters, and of letters beyond English.
var names = map[string]func(i int) string{
	"short": func(i int) string { return fmt.Sprintf("Ings %d", i) },
	"long": func(i int) string {
		return (fmt.Sprintf("Parcel %d behind the old waterworks at Upper Hollin Moss ", i) + strings.Repeat("x", 60))[:60]
	},
	"letters": func(i int) string { return fmt.Sprintf("Åsgårđ Ñandú Łąka ≥ α 日本 Żółć %d", i) },
}

func scores(name func(int) string, n int) chart.Scores {
	in := chart.Scores{Title: "scores", ID: "-1"}
	for k := range 6 {
		in.Keys = append(in.Keys, chart.ScoreKey{Category: k, Title: name(k), Weight: []float64{0.24, 0.22, 0.17, 0.15, 0.12, 0.1}[k]})
	}
	for i := range n {
		r := chart.ScoreRow{Item: fmt.Sprintf("P-%d", i), Name: fmt.Sprintf("%d. %s", i+1, name(i))}
		for k := range in.Keys {
			share := in.Keys[k].Weight * float64((i*7+k*5)%10) / 10
			unknown := (i+k)%5 == 4
			if unknown {
				share = in.Keys[k].Weight / 2
			}
			r.Parts = append(r.Parts, chart.ScorePart{Share: share, Unknown: unknown})
			r.Score += share
		}
		r.Low, r.High = math.Max(0, r.Score-0.08), math.Min(1, r.Score+0.06)
		if i%2 == 1 {
			r.Detail = name(i + 1)
		}
		if i%3 == 1 {
			r.Over = "over the limit: " + name(2)
		}
		in.Rows = append(in.Rows, r)
	}
	return in
}

func pair(name func(int) string, n int) chart.Pair {
	in := chart.Pair{Title: "pair", NameA: name(1), NameB: name(2)}
	for i := range n {
		in.Keys = append(in.Keys, chart.PairKey{Item: fmt.Sprintf("key-%d", i), Title: name(i), A: fmt.Sprintf("%d.9 GWh/yr", i*7), B: "12 345 g CO₂e/kWh", Difference: 0.09 * math.Sin(float64(i)*1.9), Unknown: i%4 == 3, OverA: i%5 == 2, OverB: i%3 == 1})
		if i%4 == 3 {
			in.Keys[i].B = "unknown"
		}
	}
	return in
}

func chain(name func(int) string, n int) chart.Chain {
	in := chart.Chain{Title: "chain", What: "yield of a year"}
	v := 15_482.3
	for i := range n {
		share := []float64{0.041, 0.03, 0.0002, -0.012, 0.083}[i%5]
		in.Steps = append(in.Steps, chart.Step{Item: fmt.Sprintf("step-%d", i), Name: name(i), Unit: "MWh/yr", Before: v, Share: share, After: v * (1 - share)})
		v *= 1 - share
	}
	if n > 2 { // a plant of two parts has two chains
		in.Steps[1].Unknown = true
		in.Steps = append(in.Steps, chart.Step{Name: name(9), Unit: "kWh/kWp", Before: 1100, Share: 0.5, After: 550}, chart.Step{Name: name(8), Unit: "kWh/kWp", Before: 550, Share: 0.6, After: 220})
	}
	return in
}

func land(name func(int) string, n int) chart.Land {
	in := chart.Land{Title: "land", GrossHa: 23.4, SharedHa: 6.1, ShapeHa: 0.35}
	rest := in.GrossHa - in.SharedHa - in.ShapeHa
	for i := range n {
		take := rest * 0.3
		rest -= take
		in.Rules = append(in.Rules, chart.TakenRule{Item: fmt.Sprintf("rule-%d", i), Name: name(i), AloneHa: take, SharedHa: float64(i) * 1.4})
	}
	if n > 2 {
		in.Rules = append(in.Rules, chart.TakenRule{Name: name(4), Unknown: true}, chart.TakenRule{Name: name(5), TakesAll: true, SharedHa: 23.4})
	}
	in.BuildableHa = rest
	return in
}

func months(name func(int) string, n int) chart.Months {
	in := chart.Months{Title: "months", What: name(1), Unit: "MWh"}
	for i := range in.Values {
		in.Values[i] = chart.Month{Item: fmt.Sprint(i), Value: float64(n) * 100 * (1.3 + math.Cos(float64(i)/1.9)), Unknown: n > 2 && i%5 == 3}
	}
	return in
}

// dayMonths are days that are longer and brighter in summer; without any energy for 0.
func dayMonths(n int) chart.DayMonths {
	in := chart.DayMonths{Title: "Energy by month and hour", ID: "hours", What: "energy at the plant by hour of the day", Unit: "MWh"}
	for m := range in.Values {
		long := 4 + 3*math.Sin(math.Pi*float64(m+1)/13)
		for h := range in.Values[m] {
			in.Values[m][h] = math.Max(0, float64(n)*(long-math.Abs(float64(h)-11.5)))
		}
	}
	return in
}

// rose is wind from the south-west mostly; without any for 0.
func rose(n int) chart.Rose {
	in := chart.Rose{Title: "Wind by direction", ID: "rose", Even: n == 1}
	for i := range n {
		w := 1 + math.Cos(2*math.Pi*float64(i)/float64(n)-4)
		in.Sectors = append(in.Sectors, chart.RoseSector{Time: (1 + w) / float64(3*n), Energy: w * w / float64(2*n), SpeedMPerS: 5 + w})
	}
	return in
}

func cloud(name func(int) string, n int) chart.Cloud {
	random := rand.New(rand.NewPCG(1, 2))
	in := chart.Cloud{Title: "cloud", X: chart.Quantity{Title: name(1), Unit: "MWh/yr", Better: chart.More}, Y: chart.Quantity{Title: name(2), Unit: "homes", Better: chart.Less, Whole: true}, LeftOut: n % 7}
	for i := range n {
		x := 9000 + 9000*random.Float64()
		in.Points = append(in.Points, chart.CloudPoint{Item: fmt.Sprintf("P-%d", i), Name: name(i), X: x, Y: math.Round(math.Max(0, x/300-20+30*random.NormFloat64())), Over: i%50 == 7})
	}
	for i, m := range []string{"A", "B", "C", "Do nothing"} {
		if i < n {
			p := &in.Points[i]
			p.Mark, p.XLow, p.XHigh, p.YLow, p.YHigh = m, p.X*0.9, p.X*1.12, p.Y-3, p.Y+5
			if i > 0 && i < 3 {
				p.X, p.Y = in.Points[0].X, in.Points[0].Y
			}
		}
	}
	return in
}

// each gives every chart with few rows and with many.
func each(name func(int) string, p draw.Palette, width float64) map[string]*draw.Scene {
	out := map[string]*draw.Scene{}
	for _, n := range []int{0, 1, 6, 40} {
		out[fmt.Sprintf("scores-%d", n)] = chart.ScoreBars(scores(name, n), p, width)
		out[fmt.Sprintf("pair-%d", n)] = chart.PairBars(pair(name, n), p, width)
		out[fmt.Sprintf("chain-%d", n)] = chart.Waterfall(chain(name, n), p, width)
		out[fmt.Sprintf("land-%d", n)] = chart.TakenBars(land(name, n), p, width)
		out[fmt.Sprintf("months-%d", n)] = chart.Monthly(months(name, n), p, width)
		out[fmt.Sprintf("daymonths-%d", n)] = chart.DayByMonth(dayMonths(n), p, width)
		out[fmt.Sprintf("rose-%d", n)] = chart.WindRose(rose(n), p, width)
		out[fmt.Sprintf("horizon-%d", n)] = chart.HorizonStrip(horizon(n), p, width)
		out[fmt.Sprintf("curve-%d", n)] = chart.CurveOverWind(curve(name, n), p, width)
		out[fmt.Sprintf("wakes-%d", n)] = chart.WakeMap(wakes(name, n), p, width)
		out[fmt.Sprintf("ladder-%d", n)] = chart.Ladder(boundaries(name, n), p, width)
		out[fmt.Sprintf("accounts-%d", n)] = chart.SideBySide(accounts(name, n), p, width)
		out[fmt.Sprintf("ground-%d", n)] = chart.LandBars(ground7(name, n), p, width)
		out[fmt.Sprintf("balances-%d", n)] = chart.PaybackLine(balances(name, n), p, width)
		out[fmt.Sprintf("years-%d", n)] = chart.YearLine(yearSum(name, n), p, width)
		out[fmt.Sprintf("sweep-%d", n)] = chart.Crowding(sweep(name, n), p, width)
		out[fmt.Sprintf("drivers-%d", n)] = chart.Tornado(drivers(name, n), p, width)
		out[fmt.Sprintf("cloud-%d", n*n)] = chart.Scatter(cloud(name, n*n), p, width)
	}
	for i, s := range []chart.Span{{Low: 3, Central: 4, High: 6, Least: 0, Greatest: 10}, {Low: 3, Central: 3, High: 3, Least: 3, Greatest: 3}, {Unknown: true}, {Low: 9, Central: 10, High: 10, Least: 0, Greatest: 10, Over: true}} {
		s.Item, s.Title = "P-1", name(i)
		out[fmt.Sprintf("span-%d", i)] = chart.RangeBar(s, p, width/4)
	}
	return out
}

func textsOf(s *draw.Scene) []draw.Text {
	var out []draw.Text
	for _, it := range s.Items {
		if t, ok := it.(draw.Text); ok {
			out = append(out, t)
		}
	}
	return out
}

// ground gives the colour under the middle of a text, and whether it is hatched.
func ground(s *draw.Scene, before int, at draw.Point) (colour string, hatched bool) {
	for i := before - 1; i >= 0; i-- {
		p, ok := s.Items[i].(draw.Path)
		if !ok || !p.Closed || p.Style.Fill == "" && !p.Style.Hatch {
			continue
		}
		probe := &draw.Scene{}
		p.Item = "probe"
		probe.Path(p)
		if item, _ := raster.Hit(probe, at.X, at.Y); item == "probe" {
			return p.Style.Fill, p.Style.Hatch
		}
	}
	return "", false
}

func TestChartsAtEveryWidthNameAndPalette(t *testing.T) {
	for paletteName, p := range palettes {
		for kind, name := range names {
			for _, width := range widths {
				for what, s := range each(name, p, width) {
					where := fmt.Sprintf("%s, %s, %s, %v", what, kind, paletteName, width)
					if s.Height <= 0 || s.Height > 6000 {
						t.Errorf("%s: height %v", where, s.Height)
					}
					holdTexts(t, where, s)
					holdShapes(t, where, s)
				}
			}
		}
	}
}

func holdTexts(t *testing.T, where string, s *draw.Scene) {
	t.Helper()
	texts := textsOf(s)
	for i, x := range texts {
		b := x.Box()
		if b.X0 < 0 || b.Y0 < 0 || b.X1 > s.Width || b.Y1 > s.Height {
			t.Errorf("%s: %q leaves the picture: %v of %v × %v", where, x.Text, b, s.Width, s.Height)
		}
		for _, y := range texts[i+1:] {
			if b.Meets(y.Box()) {
				t.Errorf("%s: %q and %q overlap", where, x.Text, y.Text)
			}
		}
	}
	for i, it := range s.Items {
		x, ok := it.(draw.Text)
		if !ok {
			continue
		}
		b := x.Box()
		on, hatched := ground(s, i, draw.Point{X: (b.X0 + b.X1) / 2, Y: (b.Y0 + b.Y1) / 2})
		if hatched || on == "" {
			t.Errorf("%s: %q stands on no ground or on hatching", where, x.Text)
		} else if c := draw.Contrast(x.Colour, on); c < 4.5 {
			t.Errorf("%s: %q has a contrast of %.2f on %s", where, x.Text, c, on)
		}
	}
	if len(texts) == 0 && !strings.HasPrefix(where, "span") {
		t.Errorf("%s: no words at all", where)
	}
}

// holdShapes looks that every shape lies in the picture and has sound numbers, and that hatching, where it
// is, says unknown when the pointer rests on it or in the legend.
func holdShapes(t *testing.T, where string, s *draw.Scene) {
	t.Helper()
	for _, it := range s.Items {
		p, ok := it.(draw.Path)
		if !ok {
			continue
		}
		for _, r := range p.Rings {
			for _, q := range r {
				if !(q.X >= -0.5 && q.Y >= -0.5 && q.X <= s.Width+0.5 && q.Y <= s.Height+0.5) {
					t.Errorf("%s: a shape (%q) reaches %v, outside the picture of %v × %v", where, p.Title, q, s.Width, s.Height)
					return
				}
			}
		}
	}
}

// The pictures of the accounts hold at every width of a pane, on both sides of where their layout changes.
func TestAccountsAtManyWidths(t *testing.T) {
	for kind, name := range names {
		for _, width := range []float64{300, 400, 540, 560, 580, 600, 620, 640, 900, 1200} {
			for _, n := range []int{0, 1, 2, 3, 11, 40} {
				for what, s := range map[string]*draw.Scene{"ladder": chart.Ladder(boundaries(name, n), draw.Light(), width), "accounts": chart.SideBySide(accounts(name, n), draw.Light(), width), "ground": chart.LandBars(ground7(name, n), draw.Light(), width),
					"years": chart.YearLine(yearSum(name, n), draw.Light(), width), "balances": chart.PaybackLine(balances(name, n), draw.Light(), width), "sweep": chart.Crowding(sweep(name, n), draw.Light(), width), "drivers": chart.Tornado(drivers(name, n), draw.Light(), width)} {
					where := fmt.Sprintf("%s-%d, %s, %v", what, n, kind, width)
					holdTexts(t, where, s)
					holdShapes(t, where, s)
				}
			}
		}
	}
}

func TestSameChartSameBytes(t *testing.T) {
	for what, s := range each(names["letters"], draw.Light(), 760) {
		again := each(names["letters"], draw.Light(), 760)[what]
		if !bytes.Equal(svg.Write(s), svg.Write(again)) {
			t.Errorf("%s: other bytes the second time", what)
		}
	}
}

// find looks for the shapes whose hover words hold a text.
func find(s *draw.Scene, words string) []draw.Path {
	var out []draw.Path
	for _, it := range s.Items {
		if p, ok := it.(draw.Path); ok && strings.Contains(p.Title, words) && (p.Style.Fill != "" || p.Style.Hatch || p.Style.Stroke != "") {
			out = append(out, p)
		}
	}
	return out
}

func left(p draw.Path) float64  { return math.Min(p.Rings[0][0].X, p.Rings[0][1].X) }
func right(p draw.Path) float64 { return math.Max(p.Rings[0][0].X, p.Rings[0][1].X) }
func long(p draw.Path) float64  { return right(p) - left(p) }

func says(s *draw.Scene, words string) bool {
	for _, x := range textsOf(s) {
		if strings.Contains(x.Text, words) {
			return true
		}
	}
	return false
}

func TestScoreBarsAreTrue(t *testing.T) {
	in := chart.Scores{Keys: []chart.ScoreKey{{Title: "Energy", Weight: 0.6}, {Category: 1, Title: "Noise", Weight: 0.4}}, Rows: []chart.ScoreRow{
		{Item: "P-1", Name: "1. Ings", Score: 0.5, Low: 0.3, High: 0.7, Parts: []chart.ScorePart{{Share: 0.3}, {Share: 0.2, Unknown: true}}, Over: "over the limit: Noise"}}}
	s := chart.ScoreBars(in, draw.Light(), 760)
	energy, noise := find(s, "1. Energy: 0.300 of weight 0.600"), find(s, "2. Noise: unknown")
	if len(energy) != 1 || len(noise) == 0 {
		t.Fatalf("%d and %d parts", len(energy), len(noise))
	}
	if r := long(energy[0]) / long(noise[0]); math.Abs(r-1.5) > 1e-9 {
		t.Errorf("the parts are as %v, want 1.5", r)
	}
	if energy[0].Style.Hatch || !noise[0].Style.Hatch || energy[0].Item != "P-1" {
		t.Error("unknown is not hatched, or known is, or a part stands for nothing")
	}
	if span := find(s, "score 0.500, from 0.300 to 0.700"); len(span) != 1 || math.Abs(long(span[0])/long(energy[0])-4.0/3) > 1e-9 {
		t.Error("the range of the score is not 0.4 long where 0.3 is")
	}
	for _, x := range textsOf(s) {
		if strings.HasPrefix(x.Text, "over the limit") && x.Colour != draw.Warm {
			t.Error("the word on the limit is not in the warm colour")
		}
	}
	if !says(s, "over the limit: Noise") || !says(s, "pure number") {
		t.Error("the limit or the unit is not told")
	}
}

func TestPairBarsAreTrue(t *testing.T) {
	in := chart.Pair{NameA: "Ings", NameB: "Moss", Keys: []chart.PairKey{
		{Item: "k1", Title: "Energy", A: "12 GWh/yr", B: "13 GWh/yr", Difference: -0.02}, {Item: "k2", Title: "Noise", A: "31 dB(A)", B: "43 dB(A)", Difference: 0.08, OverB: true}, {Item: "k3", Title: "Peat", A: "4 t C", B: "unknown", Difference: 0.01, Unknown: true}}}
	s := chart.PairBars(in, draw.Light(), 760)
	energy, noise, peat := find(s, "Energy: A 12 GWh/yr, B 13 GWh/yr")[0], find(s, "Noise: A")[0], find(s, "Peat: A")[0]
	if math.Abs(long(noise)/long(energy)-4) > 1e-9 || right(noise) != left(energy) {
		t.Error("the bars are not 0.08 to the left and 0.02 to the right of one line")
	}
	if noise.Rings[0][0].Y >= energy.Rings[0][0].Y || energy.Rings[0][0].Y >= peat.Rings[0][0].Y {
		t.Error("the rows do not stand by the size of the difference")
	}
	if !peat.Style.Hatch || noise.Style.Hatch {
		t.Error("unknown is not hatched, or known is")
	}
	for _, want := range []string{"Sum: A leads by 0.070", "A better", "B 43 dB(A), over the limit", "pure number"} {
		if !says(s, want) {
			t.Errorf("the picture says nowhere %q", want)
		}
	}
	if item, _ := raster.Hit(s, 20, noise.Rings[0][0].Y+3); item != "k2" {
		t.Errorf("the row of noise answers with %q", item)
	}
}

func TestWaterfallIsTrue(t *testing.T) {
	in := chart.Chain{What: "yield of a year", Steps: []chart.Step{
		{Name: "wakes", Unit: "MWh/yr", Before: 10000, Share: 0.1, After: 9000}, {Name: "gain", Unit: "MWh/yr", Before: 9000, Share: -0.05, After: 9450}, {Name: "wires", Unit: "kWh/kWp", Before: 1000, Share: 0.5, After: 500}}}
	s := chart.Waterfall(in, draw.Light(), 760)
	wakes, gain, wires := find(s, "wakes: −10.00 %")[0], find(s, "gain: +5.00 %")[0], find(s, "wires: −50.00 %")[0]
	if math.Abs(long(wakes)/long(gain)-1000.0/450) > 1e-9 || math.Abs(left(wakes)-left(gain)) > 1e-9 {
		t.Error("the bars are not as long as the losses, or do not join")
	}
	if wires.Rings[0][0].Y < gain.Rings[0][0].Y+40 || !says(s, "yield of a year, kWh/kWp") {
		t.Error("the second unit has no picture of its own")
	}
	if !says(s, "not at 0") {
		t.Error("an axis that does not start at 0 does not say so")
	}
}

func TestTakenBarsAreTrue(t *testing.T) {
	in := chart.Land{GrossHa: 10, BuildableHa: 4, SharedHa: 2, ShapeHa: 1, Rules: []chart.TakenRule{{Name: "roads", AloneHa: 3, SharedHa: 2}, {Name: "noise", Unknown: true}}}
	s := chart.TakenBars(in, draw.Light(), 760)
	whole, roads, several, shape, rest := find(s, "whole site: 10.00 ha")[0], find(s, "roads: 3.00 ha")[0], find(s, "several rules together: 2.00 ha")[0], find(s, "too small or too narrow: 1.00 ha")[0], find(s, "buildable area: 4.00 ha")[0]
	for what, d := range map[string]float64{"roads": long(roads)/long(whole) - 0.3, "several": long(several)/long(whole) - 0.2, "shape": long(shape)/long(whole) - 0.1, "buildable": long(rest)/long(whole) - 0.4,
		"roads end": right(roads) - right(whole), "several end": right(several) - left(roads), "shape end": right(shape) - left(several), "buildable end": right(rest) - left(shape)} {
		if math.Abs(d) > 1e-6 {
			t.Errorf("%s is off by %v", what, d)
		}
	}
	if n := find(s, "noise: unknown"); len(n) != 1 || !n[0].Style.Hatch {
		t.Error("a rule that is not known is not hatched")
	}
	if !says(s, "area, ha") {
		t.Error("the axis has no unit")
	}
}

func TestMonthlyIsTrue(t *testing.T) {
	var in chart.Months
	in.What, in.Unit = "energy", "MWh"
	for i := range in.Values {
		in.Values[i].Value = 100
	}
	in.Values[5].Value, in.Values[7].Unknown = 200, true
	s := chart.Monthly(in, draw.Light(), 760)
	height := func(p draw.Path) float64 { return p.Rings[0][2].Y - p.Rings[0][0].Y }
	may, june, august := find(s, "May: 100 MWh")[0], find(s, "June: 200 MWh")[0], find(s, "August: unknown")
	if math.Abs(height(june)/height(may)-2) > 1e-9 {
		t.Error("twice the energy is not twice as high")
	}
	if len(august) != 1 || !august[0].Style.Hatch || !says(s, "energy, MWh in each month") {
		t.Error("an unknown month is not hatched, or the unit is missing")
	}
}

func TestDayByMonthIsTrue(t *testing.T) {
	in := chart.DayMonths{Title: "t", ID: "i", What: "energy", Unit: "MWh"}
	in.Values[0][12], in.Values[6][5], in.Values[6][12] = 5, 2.5, 10
	s := chart.DayByMonth(in, draw.Light(), 760)
	most, half := find(s, "July, 12 to 13 h: 10.0 MWh"), find(s, "July, 5 to 6 h: 2.50 MWh")
	winter := find(s, "January, 12 to 13 h: 5.00 MWh")
	if len(most) != 1 || len(half) != 1 || len(winter) != 1 {
		t.Fatal("a field is missing")
	}
	if most[0].Style.Fill != draw.Light().Ramp(1) || winter[0].Style.Fill != draw.Light().Ramp(0.5) || half[0].Style.Fill != draw.Light().Ramp(0.25) {
		t.Error("fields are not as dark as they have energy")
	}
	if left(most[0]) != left(half[0]) || left(winter[0]) >= left(most[0]) || winter[0].Rings[0][0].Y != most[0].Rings[0][0].Y {
		t.Error("fields stand in other months or hours")
	}
	if !says(chart.DayByMonth(chart.DayMonths{}, draw.Light(), 760), "There is none in any hour") {
		t.Error("a plant without energy has a picture")
	}
}

func TestScatterShowsTheFront(t *testing.T) {
	in := chart.Cloud{X: chart.Quantity{Title: "energy", Unit: "GWh/yr", Better: chart.More}, Y: chart.Quantity{Title: "homes", Unit: "homes", Better: chart.Less, Whole: true}, LeftOut: 2, Points: []chart.CloudPoint{
		{Item: "a", Name: "a", X: 10, Y: 8}, {Item: "b", Name: "b", X: 6, Y: 3}, {Item: "c", Name: "c", X: 6, Y: 5}, {Item: "d", Name: "d", X: 2, Y: 3}, {Item: "e", Name: "e", X: math.NaN(), Y: 1}}}
	s := chart.Scatter(in, draw.Light(), 760)
	front := find(s, "better in both: 2 candidates")
	if len(front) != 1 || len(front[0].Rings[0]) != 3 {
		t.Fatal("the front is not a line in steps through two points")
	}
	for i, name := range []string{"a: energy 10.0 GWh/yr; homes 8.00 homes", "b: energy 6.00"} {
		mark := find(s, name)
		if len(mark) != 1 {
			t.Fatalf("%d marks for %q", len(mark), name)
		}
		at := front[0].Rings[0][2*i]
		if got, _ := raster.Hit(s, at.X, at.Y); got != in.Points[i].Item {
			t.Errorf("end %d of the front hits %q", i, got)
		}
	}
	if !says(s, "4 candidates; 3 candidates without a number") || !says(s, "energy, GWh/yr; more is better") {
		t.Error("what is left out, or an axis, is not told")
	}
	in.Y.Better = chart.Either
	if len(find(chart.Scatter(in, draw.Light(), 760), "better in both")) != 0 {
		t.Error("a front without a better way")
	}
}

func TestScatterTicksOfWholeNumbers(t *testing.T) {
	in := chart.Cloud{X: chart.Quantity{Title: "x", Unit: "m", Whole: true}, Y: chart.Quantity{Title: "homes", Unit: "homes", Whole: true}, Points: []chart.CloudPoint{{X: 1, Y: 0}, {X: 2, Y: 1}}}
	for _, width := range widths {
		for _, x := range textsOf(chart.Scatter(in, draw.Light(), width)) {
			if strings.Contains(x.Text, ".") {
				t.Errorf("%q between whole numbers", x.Text)
			}
		}
	}
}

func TestScatterOfTenThousand(t *testing.T) {
	s := chart.Scatter(cloud(names["short"], 10_000), draw.Light(), 760)
	marks := 0
	for _, it := range s.Items {
		if p, ok := it.(draw.Path); ok && p.Item != "" {
			marks++
		}
	}
	if marks < 500 || marks > 8000 {
		t.Errorf("%d marks", marks)
	}
	if !says(s, "10 000 candidates in ") || !says(s, "10 or more") || len(find(s, "candidates here: ")) == 0 {
		t.Error("how many points stand behind the marks is not told")
	}
}

func TestRangeBarIsTrue(t *testing.T) {
	s := chart.RangeBar(chart.Span{Item: "P-1", Title: "noise", Low: 2, Central: 3, High: 6, Least: 0, Greatest: 10}, draw.Light(), 104)
	bars := find(s, "noise")
	if len(bars) != 3 || math.Abs(long(bars[1])/long(bars[0])-0.4) > 1e-9 || math.Abs(left(bars[1])-22) > 1e-9 || math.Abs(left(bars[2])+1-32) > 1e-9 {
		t.Errorf("%d bars, not from 2 to 6 of 10 with a mark at 3", len(bars))
	}
	over := chart.RangeBar(chart.Span{Low: 2, Central: 3, High: 6, Least: 0, Greatest: 10, Over: true}, draw.Light(), 104)
	if !says(over, "over the limit") || says(s, "over") {
		t.Error("the word on the limit is missing, or stands where none is broken")
	}
	unknown := chart.RangeBar(chart.Span{Title: "unknown: no layer of soil", Unknown: true}, draw.Light(), 104)
	if b := find(unknown, "unknown"); len(b) != 1 || !b[0].Style.Hatch {
		t.Error("unknown is not hatched")
	}
}

// Hatching means unknown, nothing else: no chart without an unknown value has any.
func TestHatchingMeansUnknown(t *testing.T) {
	known := map[string]*draw.Scene{"scatter": chart.Scatter(cloud(names["short"], 400), draw.Light(), 760), "chain": chart.Waterfall(chain(names["short"], 2), draw.Light(), 760),
		"land": chart.TakenBars(land(names["short"], 2), draw.Light(), 760), "months": chart.Monthly(months(names["short"], 2), draw.Light(), 760), "pair": chart.PairBars(pair(names["short"], 3), draw.Light(), 760),
		"ladder": chart.Ladder(boundaries(names["short"], 6), draw.Light(), 760), "accounts": chart.SideBySide(accounts(names["short"], 1), draw.Light(), 760), "ground": chart.LandBars(ground7(names["short"], 6), draw.Light(), 760),
		"balances": chart.PaybackLine(balances(names["short"], 6), draw.Light(), 760), "sweep": chart.Crowding(sweep(names["short"], 6), draw.Light(), 760), "drivers": chart.Tornado(drivers(names["short"], 6), draw.Light(), 760),
		"curve": chart.CurveOverWind(curve(names["short"], 26), draw.Light(), 760), "wakes": chart.WakeMap(wakes(names["short"], 6), draw.Light(), 760)}
	for what, s := range known {
		for _, it := range s.Items {
			if p, ok := it.(draw.Path); ok && p.Style.Hatch {
				t.Errorf("%s: hatching (%q) where all is known", what, p.Title)
			}
		}
	}
}

// What is written can be read in the painted picture: no shape that comes later covers it. With
// GROUNDTALLY_PICTURES=DIR the pictures are written there, for a look with one's own eyes.
func TestPaintedTextIsSeen(t *testing.T) {
	dir := os.Getenv("GROUNDTALLY_PICTURES")
	for paletteName, p := range palettes {
		for _, width := range []float64{320, 760} {
			for what, s := range each(names["long"], p, width) {
				const scale = 1.5
				img := raster.Paint(s, scale, p)
				for _, x := range textsOf(s) {
					if !hasColour(img, x, scale) {
						t.Errorf("%s, %s, %v: %q cannot be seen", what, paletteName, width, x.Text)
					}
				}
				if dir == "" {
					continue
				}
				var b bytes.Buffer
				if err := png.Encode(&b, img); err != nil {
					t.Fatal(err)
				}
				if err := os.WriteFile(filepath.Join(dir, fmt.Sprintf("%s-%s-%v.png", what, paletteName, width)), b.Bytes(), 0o600); err != nil {
					t.Fatal(err)
				}
			}
		}
	}
}

// hasColour looks for a text's colour in its box.
func hasColour(img *image.RGBA, x draw.Text, scale float64) bool {
	n, err := strconv.ParseUint(x.Colour[1:], 16, 32)
	if err != nil {
		return false
	}
	b := x.Box()
	for py := int(b.Y0 * scale); py < int(b.Y1*scale); py++ {
		for px := int(b.X0 * scale); px < int(b.X1*scale)+1; px++ {
			c := img.RGBAAt(px, py)
			if math.Abs(float64(c.R)-float64(n>>16))+math.Abs(float64(c.G)-float64(n>>8&255))+math.Abs(float64(c.B)-float64(n&255)) < 60 {
				return true
			}
		}
	}
	return false
}

func BenchmarkScatter(b *testing.B) {
	in := cloud(names["short"], 10_000)
	for b.Loop() {
		chart.Scatter(in, draw.Light(), 760)
	}
}

func BenchmarkScoreBars(b *testing.B) {
	in := scores(names["long"], 40)
	for b.Loop() {
		chart.ScoreBars(in, draw.Light(), 760)
	}
}
