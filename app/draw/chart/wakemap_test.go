package chart_test

import (
	"fmt"
	"math"
	"math/rand/v2"
	"strings"
	"testing"

	"groundtally/app/draw"
	"groundtally/app/draw/chart"
	"groundtally/app/draw/raster"
	"groundtally/app/draw/svg"
)

// wakes is a plant of n turbines in a slanting grid, with the loss of a simple spreading wake in 36 directions.
func wakes(name func(int) string, n int) chart.Wakes {
	return wakesIn(name, n, 40, 30, 100)
}

func wakesIn(name func(int) string, n, columns, rows int, step float64) chart.Wakes {
	const rotor = 126.0
	in := chart.Wakes{Title: "wakes", ID: "-wakes", Columns: columns, Rows: rows, StepM: step, X0M: -1000, Y0M: 500, NorthDeg: float64(n%7) * 8}
	if n > 1 {
		in.Caption = name(n)
	}
	wide, high := step*float64(columns), step*float64(rows)
	across := int(math.Ceil(math.Sqrt(float64(n))))
	for i := range n {
		u, v := (float64(i%across)+0.5)/float64(across), (float64(i/across)+0.5)/float64(across)
		in.Turbines = append(in.Turbines, chart.WakeTurbine{X: in.X0M + wide*(0.2+0.5*u+0.1*v), Y: in.Y0M + high*(0.25+0.5*v), RotorM: rotor, Label: fmt.Sprint(i + 1), Loss: 0.03 + 0.01*float64(i%5)})
		if i%6 == 4 {
			in.Turbines[i].Loss = math.NaN()
		}
	}
	place := func(u, v float64) chart.Metres { return chart.Metres{X: in.X0M + wide*u, Y: in.Y0M + high*v} }
	if n > 0 {
		in.Site = [][]chart.Metres{{place(0.12, 0.15), place(0.85, 0.2), place(0.9, 0.7), place(0.55, 0.9), place(0.15, 0.8)}}
		in.Buildable = [][]chart.Metres{{place(0.17, 0.2), place(0.8, 0.25), place(0.84, 0.68), place(0.54, 0.83), place(0.2, 0.76)}, {place(0.4, 0.4), place(0.45, 0.4), place(0.45, 0.6)}}
		in.Existing = []chart.Rotor{{X: in.X0M + 0.93*wide, Y: in.Y0M + 0.1*high, RotorM: 90}, {X: 9e4, Y: 0, RotorM: 90}}
	}
	for r := range rows {
		for c := range columns {
			x, y, sum := in.X0M+step*(float64(c)+0.5), in.Y0M+step*(float64(r)+0.5), 0.0
			for d := range 36 {
				sin, cos := math.Sincos(2 * math.Pi * float64(d) / 36)
				weight := (1 + 0.9*math.Cos(2*math.Pi*float64(d)/36-0.8)) / 36
				lost := 0.0
				for _, t := range in.Turbines {
					along, aside := (x-t.X)*cos+(y-t.Y)*sin, (y-t.Y)*cos-(x-t.X)*sin
					if along <= 0 {
						continue
					}
					sigma := 0.04*along + 0.26*rotor
					one := (1 - math.Sqrt(math.Max(0, 1-0.8/(8*sigma*sigma/rotor/rotor)))) * math.Exp(-aside*aside/2/sigma/sigma)
					lost += one * one
				}
				sum += weight * math.Sqrt(lost)
			}
			if n > 6 && c > columns*9/10 && r > rows*4/5 {
				sum = math.NaN()
			}
			in.Lost = append(in.Lost, sum)
		}
	}
	return in
}

// shapesOf gives the shapes that say just this.
func shapesOf(s *draw.Scene, title string) (out []draw.Path) {
	for _, p := range find(s, title) {
		if p.Title == title {
			out = append(out, p)
		}
	}
	return out
}

func TestWakeMapIsTrue(t *testing.T) {
	nan := math.NaN()
	in := chart.Wakes{Columns: 4, Rows: 3, StepM: 100, X0M: 1000, Y0M: 2000, Lost: []float64{
		0, 0, 0.03, nan,
		0, 0.12, 0.03, 0,
		0, 0, 0.12, 0},
		Turbines: []chart.WakeTurbine{{X: 1050, Y: 2050, RotorM: 60, Label: "1", Loss: 0.02}, {X: 1350, Y: 2250, RotorM: 60, Label: "2", Loss: 0.071}},
		Existing: []chart.Rotor{{X: 1250, Y: 2150, RotorM: 40}, {X: 9000, Y: 2150, RotorM: 40}}}
	s := chart.WakeMap(in, draw.Light(), 424)
	if !says(s, "mean wind speed lost behind the rotors, over all directions of the year") || !says(s, "of the wind speed lost") || !says(s, "12 %") {
		t.Error("what is drawn, its unit or the greatest loss is not told")
	}
	scale := 400 / 400.0
	top, middle := shapesOf(s, "5 % of the wind speed lost or more"), shapesOf(s, "2 % to 5 % of the wind speed lost")
	if len(top) != 2 || len(middle) != 2 { // on the map, in the legend
		t.Fatalf("%d and %d shapes of two steps", len(top), len(middle))
	}
	if len(top[0].Rings) != 2 {
		t.Errorf("two cells that touch in a corner have %d outlines", len(top[0].Rings))
	}
	low := func(r []draw.Point) (b draw.Box) {
		b = draw.Box{X0: math.Inf(1), Y0: math.Inf(1), X1: math.Inf(-1), Y1: math.Inf(-1)}
		for _, q := range r {
			b = draw.Box{X0: math.Min(b.X0, q.X), Y0: math.Min(b.Y0, q.Y), X1: math.Max(b.X1, q.X), Y1: math.Max(b.Y1, q.Y)}
		}
		return b
	}
	first, second := low(top[0].Rings[0]), low(top[0].Rings[1])
	if first.X0 != 12+100*scale || first.X1 != 12+200*scale || second.X0 != 12+200*scale || second.Y1 != first.Y0 {
		t.Errorf("the cells lie at %v, %v", first, second)
	}
	if top[0].Style.Fill != draw.Light().Ramp(1) {
		t.Error("the greatest loss is not the darkest")
	}
	south := first.Y1 + 50 // the middle of the row furthest south
	if _, title := raster.Hit(s, 12+250, south); title != "2 % to 5 % of the wind speed lost" {
		t.Errorf("a cell in the south says %q", title)
	}
	if _, title := raster.Hit(s, 12+350, south); title != "unknown" {
		t.Errorf("an unknown cell says %q", title)
	}
	if item, title := raster.Hit(s, 12+350, first.Y1-150); item != "turbine-1" || title != "turbine 2: 7.1 % of its energy lost to wakes" {
		t.Errorf("the second turbine answers with %q, %q", item, title)
	}
	if !says(s, "loses most: 7.1 % of its energy, turbine 2") || !says(s, "1 of 2 beyond the picture") || !says(s, "100 m") {
		t.Error("the most troubled turbine, those out of sight or the scale is not told")
	}
	two := find(s, "turbine 2: ")[0]
	if b := low(two.Rings[0]); math.Abs(b.X1-b.X0-60*scale) > 1e-9 || two.Style.Stroke != draw.Warm {
		t.Error("the rotor is not to scale, or not marked")
	}
	if !strings.Contains(s.Title, "at most 12 %") {
		t.Errorf("the title says %q", s.Title)
	}
}

func TestWakeMapOfLittle(t *testing.T) {
	nan := math.NaN()
	for words, in := range map[string]chart.Wakes{
		"is unknown":                        {},
		"behind the rotors is unknown":      {Columns: 2, Rows: 2, StepM: 10, Lost: []float64{1}},
		"the loss is unknown everywhere":    {Columns: 2, Rows: 1, StepM: 10, Lost: []float64{nan, nan}},
		"nowhere 0.05 % or more":            {Columns: 2, Rows: 1, StepM: 10, Lost: []float64{0, nan}},
		"of the wind speed lost":            {Columns: 1, Rows: 1, StepM: 10, Lost: []float64{0.031}},
		"0.12 %":                            {Columns: 2, Rows: 1, StepM: 10, Lost: []float64{0.0012, -0.2}},
		"100 %":                             {Columns: 2, Rows: 1, StepM: 10, Lost: []float64{3, 0}},
		"turbine, larger than its rotor":    {Columns: 1, Rows: 1, StepM: 9000, Lost: []float64{0.1}, Turbines: []chart.WakeTurbine{{X: 5000, Y: 5000, RotorM: 5, Loss: nan}}},
		"turbine that stands already; 1 of": {Columns: 1, Rows: 1, StepM: 9000, Lost: []float64{0.1}, Existing: []chart.Rotor{{X: -1}}},
	} {
		s := chart.WakeMap(in, draw.Light(), 420)
		if !says(s, words) {
			t.Errorf("nowhere %q", words)
		}
		holdTexts(t, words, s)
		holdShapes(t, words, s)
	}
}

// A site that reaches beyond the cells is hatched there, because nothing is known of it.
func TestWakeMapBeyondTheCells(t *testing.T) {
	in := wakes(names["short"], 1)
	hatched := func() bool { return len(find(chart.WakeMap(in, draw.Light(), 640), "unknown: beyond the cells")) > 0 }
	if hatched() {
		t.Error("hatching where all is known")
	}
	in.Site[0][0].X -= 2000
	if !hatched() {
		t.Error("ground without cells is not hatched")
	}
}

// Not the number of cells but what there is to see makes the picture large.
func TestWakeMapStaysSmall(t *testing.T) {
	const most = 400_000
	field := wakesIn(names["short"], 30, 160, 120, 50)
	random := rand.New(rand.NewPCG(3, 4))
	specks := field
	specks.Lost = nil
	for range field.Lost {
		v := 0.3 * math.Pow(random.Float64(), 3)
		if v < 0.0001 {
			v = math.NaN()
		}
		specks.Lost = append(specks.Lost, v)
	}
	for what, in := range map[string]chart.Wakes{"field": field, "specks": specks} {
		s := chart.WakeMap(in, draw.Light(), 640)
		if n := len(svg.Write(s)); n > most {
			t.Errorf("%s: %d bytes", what, n)
		} else {
			t.Logf("%s: %d bytes", what, n)
		}
		holdShapes(t, what, s)
	}
}

// The outlines hold just the cells that they ought to: each place of the map says the step of its cell.
func TestWakeMapSaysEachCell(t *testing.T) {
	random := rand.New(rand.NewPCG(5, 6))
	in := chart.Wakes{Columns: 13, Rows: 9, StepM: 10}
	for range in.Columns * in.Rows {
		v := []float64{0, 0.0015, 0.003, 0.007, 0.015, 0.03}[random.IntN(6)]
		if random.IntN(5) == 0 {
			v = math.NaN()
		}
		in.Lost = append(in.Lost, v)
	}
	says := map[float64]string{0: "less than 0.1 %", 0.0015: "0.1 % to 0.2 %", 0.003: "0.2 % to 0.5 %", 0.007: "0.5 % to 1 %", 0.015: "1 % to 2 %", 0.03: "2 % of"}
	s := chart.WakeMap(in, draw.Light(), 13*20+24+200)
	west, north, each := 12.0, 28.0, (s.Width-24)/13
	for i, v := range in.Lost {
		c, r := i%in.Columns, i/in.Columns
		_, title := raster.Hit(s, west+each*(float64(c)+0.5), north+each*(float64(in.Rows-r)-0.5))
		want := says[v]
		if math.IsNaN(v) {
			want = "unknown"
		}
		if !strings.HasPrefix(title, want) {
			t.Fatalf("cell %d, %d says %q, want %q", c, r, title, want)
		}
	}
}

func TestWakeMapInEveryState(t *testing.T) {
	for paletteName, p := range palettes {
		for _, width := range []float64{320, 420, 640} {
			for _, n := range []int{2, 25, 90} {
				for _, shape := range [][2]int{{60, 6}, {8, 50}} {
					in := wakesIn(names["short"], n, shape[0], shape[1], 120)
					s := chart.WakeMap(in, p, width)
					where := fmt.Sprintf("%s, %v, %d turbines on %v", paletteName, width, n, shape)
					holdTexts(t, where, s)
					holdShapes(t, where, s)
					if n == 90 && !says(s, "numbers are left out") {
						t.Errorf("%s: all numbers have room", where)
					}
				}
			}
		}
	}
}

func BenchmarkWakeMap(b *testing.B) {
	in := wakesIn(names["short"], 30, 160, 120, 50)
	for b.Loop() {
		chart.WakeMap(in, draw.Light(), 420)
	}
}
