package raster_test

import (
	"bytes"
	"fmt"
	"image"
	"image/color"
	"math"
	"sync"
	"testing"

	"groundtally/app/draw"
	"groundtally/app/draw/raster"
)

const black = "#000000"

func scene(w, h float64, paths ...draw.Path) *draw.Scene {
	s := &draw.Scene{Width: w, Height: h}
	for _, p := range paths {
		s.Path(p)
	}
	return s
}

func box(x0, y0, x1, y1 float64) []draw.Point {
	return []draw.Point{{X: x0, Y: y0}, {X: x1, Y: y0}, {X: x1, Y: y1}, {X: x0, Y: y1}}
}

func reversed(r []draw.Point) []draw.Point {
	out := make([]draw.Point, len(r))
	for i, p := range r {
		out[len(r)-1-i] = p
	}
	return out
}

// white is a palette in which ink can be weighed: paper is white.
func white() draw.Palette {
	p := draw.Light()
	p.Paper, p.Hatch = "#ffffff", black
	return p
}

// inkIn weighs the ink of a picture within a box, in whole pixels of black.
func inkIn(img *image.RGBA, r image.Rectangle) float64 {
	sum := 0.0
	r = r.Intersect(img.Rect)
	for y := r.Min.Y; y < r.Max.Y; y++ {
		for x := r.Min.X; x < r.Max.X; x++ {
			sum += 1 - float64(img.RGBAAt(x, y).R)/255
		}
	}
	return sum
}

func ink(img *image.RGBA) float64 { return inkIn(img, img.Rect) }

func at(img *image.RGBA, x, y int) color.RGBA { return img.RGBAAt(x, y) }

var (
	inked = color.RGBA{0, 0, 0, 255}
	blank = color.RGBA{255, 255, 255, 255}
)

// The ink of a shape is its area, wherever it lies and however it is turned.
func TestInkIsTheArea(t *testing.T) {
	fill := draw.Style{Fill: black}
	circle := make([]draw.Point, 90)
	for i := range circle {
		sin, cos := math.Sincos(2 * math.Pi * float64(i) / 90)
		circle[i] = draw.Point{X: 30.3 + 20*cos, Y: 31.7 + 20*sin}
	}
	circleArea := 90.0 / 2 * 400 * math.Sin(2*math.Pi/90)
	for _, c := range []struct {
		name  string
		path  draw.Path
		scale float64
		want  float64
	}{
		{"a box", draw.Path{Rings: [][]draw.Point{box(10, 10, 30, 20)}, Closed: true, Style: fill}, 1, 200},
		{"a box at twice the scale", draw.Path{Rings: [][]draw.Point{box(10, 10, 30, 20)}, Closed: true, Style: fill}, 2, 800},
		{"a small box between pixels", draw.Path{Rings: [][]draw.Point{box(10.3, 10.4, 12.1, 11.9)}, Closed: true, Style: fill}, 1, 2.7},
		{"a triangle", draw.Path{Rings: [][]draw.Point{{{X: 5, Y: 50}, {X: 55, Y: 50}, {X: 12.5, Y: 3.5}}}, Closed: true, Style: fill}, 1, 0.5 * 50 * 46.5},
		{"a triangle the other way round", draw.Path{Rings: [][]draw.Point{{{X: 12.5, Y: 3.5}, {X: 55, Y: 50}, {X: 5, Y: 50}}}, Closed: true, Style: fill}, 1, 0.5 * 50 * 46.5},
		{"a circle", draw.Path{Rings: [][]draw.Point{circle}, Closed: true, Style: fill}, 1, circleArea},
		{"a bow tie", draw.Path{Rings: [][]draw.Point{{{X: 10, Y: 10}, {X: 50, Y: 50}, {X: 50, Y: 10}, {X: 10, Y: 50}}}, Closed: true, Style: fill}, 1, 800},
		{"a level line", draw.Path{Rings: [][]draw.Point{{{X: 10, Y: 20}, {X: 50, Y: 20}}}, Style: draw.Style{Stroke: black, Width: 2}}, 1, 80},
		{"a slanting line", draw.Path{Rings: [][]draw.Point{{{X: 10, Y: 20}, {X: 40, Y: 60}}}, Style: draw.Style{Stroke: black, Width: 1.5}}, 1, 75},
		{"a fine slanting line", draw.Path{Rings: [][]draw.Point{{{X: 10, Y: 20}, {X: 40, Y: 60}}}, Style: draw.Style{Stroke: black, Width: 0.4}}, 1, 20},
		{"a hole", draw.Path{Rings: [][]draw.Point{box(10, 10, 50, 50), box(20, 20, 40, 40)}, Closed: true, Style: fill}, 1, 1200},
		{"a slanting hole", draw.Path{Rings: [][]draw.Point{box(10, 10, 50, 50), {{X: 30, Y: 15}, {X: 45, Y: 30}, {X: 30, Y: 45}, {X: 15, Y: 30}}}, Closed: true, Style: fill}, 1, 1150},
		{"an empty colour", draw.Path{Rings: [][]draw.Point{box(10, 10, 50, 50)}, Closed: true}, 1, 0},
		{"dashes", draw.Path{Rings: [][]draw.Point{{{X: 10, Y: 20}, {X: 50, Y: 20}}}, Style: draw.Style{Stroke: black, Width: 2, Dash: "6 4"}}, 1, 48},
		{"an odd number of dashes", draw.Path{Rings: [][]draw.Point{{{X: 10, Y: 20}, {X: 50, Y: 20}}}, Style: draw.Style{Stroke: black, Width: 2, Dash: "5"}}, 1, 40},
		{"a dash that cannot be read", draw.Path{Rings: [][]draw.Point{{{X: 10, Y: 20}, {X: 50, Y: 20}}}, Style: draw.Style{Stroke: black, Width: 2, Dash: "a b"}}, 1, 80},
		{"dashes round a corner", draw.Path{Rings: [][]draw.Point{{{X: 10, Y: 10}, {X: 23, Y: 10}, {X: 23, Y: 37}}}, Style: draw.Style{Stroke: black, Width: 1, Dash: "10 10"}}, 1, 20},
	} {
		got := ink(raster.Paint(scene(80, 80, c.path), c.scale, white()))
		if math.Abs(got-c.want) > 0.004*c.want+0.25 {
			t.Errorf("%s: ink of %.2f pixels, want %.2f", c.name, got, c.want)
		}
	}
}

func TestPixelsOfABox(t *testing.T) {
	img := raster.Paint(scene(40, 40, draw.Path{Rings: [][]draw.Point{box(10.2, 10.2, 20.3, 20.3)}, Closed: true, Style: draw.Style{Fill: black}}), 1, white())
	for y := range 40 {
		for x := range 40 {
			want := blank
			if x >= 10 && x < 20 && y >= 10 && y < 20 {
				want = inked
			}
			if got := at(img, x, y); got != want {
				t.Fatalf("pixel %d, %d is %v, want %v: upright boxes have sharp edges", x, y, got, want)
			}
		}
	}
}

// A hole stays open whichever way round it is written, and rings that touch leave no seam.
func TestHolesStayOpen(t *testing.T) {
	for _, hole := range [][]draw.Point{box(20, 20, 40, 40), reversed(box(20, 20, 40, 40))} {
		img := raster.Paint(scene(60, 60, draw.Path{Rings: [][]draw.Point{box(10, 10, 50, 50), hole}, Closed: true, Style: draw.Style{Fill: black}}), 1, white())
		if at(img, 30, 30) != blank || at(img, 15, 30) != inked || at(img, 45, 30) != inked || at(img, 5, 5) != blank {
			t.Error("the hole is filled, or what is around it is not")
		}
	}
	left, right := []draw.Point{{X: 5, Y: 5}, {X: 31.5, Y: 5}, {X: 24.5, Y: 55}, {X: 5, Y: 55}}, []draw.Point{{X: 31.5, Y: 5}, {X: 55, Y: 5}, {X: 55, Y: 55}, {X: 24.5, Y: 55}}
	for _, second := range [][]draw.Point{right, reversed(right)} {
		img := raster.Paint(scene(60, 60, draw.Path{Rings: [][]draw.Point{left, second}, Closed: true, Style: draw.Style{Fill: black}}), 1, white())
		for y := 6; y < 54; y++ {
			for x := 20; x < 40; x++ {
				if at(img, x, y).R > 2 {
					t.Fatalf("a seam at %d, %d: %v", x, y, at(img, x, y))
				}
			}
		}
	}
}

func TestStrokeFollowsItsLine(t *testing.T) {
	img := raster.Paint(scene(60, 60, draw.Path{Rings: [][]draw.Point{box(10, 10, 50, 50)}, Closed: true, Style: draw.Style{Stroke: black, Width: 4}}), 1, white())
	for _, p := range []image.Point{{30, 10}, {30, 9}, {10, 30}, {50, 30}, {30, 50}, {9, 9}} {
		if at(img, p.X, p.Y).R > 40 {
			t.Errorf("no line at %v: %v", p, at(img, p.X, p.Y))
		}
	}
	if at(img, 30, 30) != blank || at(img, 4, 30) != blank {
		t.Error("ink beside the line")
	}
}

// Hatching is paper with lines, everywhere the same, on any tile.
func TestHatching(t *testing.T) {
	s := scene(120, 120, draw.Path{Rings: [][]draw.Point{box(10, 10, 110, 110)}, Closed: true, Style: draw.Style{Hatch: true, Fill: "#00ff00"}})
	img := raster.Paint(s, 1, white())
	share := inkIn(img, image.Rect(12, 12, 108, 108)) / (96 * 96)
	if share < 0.12 || share > 0.26 {
		t.Errorf("hatching covers %.0f %%", 100*share)
	}
	if ink(img) != inkIn(img, image.Rect(10, 10, 110, 110)) {
		t.Error("hatching outside its shape")
	}
	if at(img, 50, 40) != at(img, 51, 39) || at(img, 50, 40) != at(img, 40, 50) {
		t.Error("the lines do not rise at 45 degrees")
	}
	for _, p := range []draw.Palette{draw.Light(), draw.Dark()} {
		if got := draw.Contrast(p.Hatch, p.Paper); got < 3 {
			t.Errorf("hatching has a contrast of %.2f to its ground", got)
		}
	}
}

// A tile is the same pixels as that part of the whole.
func TestTilesMakeTheWhole(t *testing.T) {
	s := busy()
	whole := raster.Paint(s, 1.5, draw.Light())
	for _, r := range []image.Rectangle{image.Rect(0, 0, 100, 90), image.Rect(100, 90, 217, 200), image.Rect(250, 33, 380, 171)} {
		tile := image.NewRGBA(r)
		raster.PaintOn(tile, s, 1.5, draw.Light())
		worst := 0
		for y := r.Min.Y; y < r.Max.Y; y++ {
			for x := r.Min.X; x < r.Max.X; x++ {
				a, b := tile.RGBAAt(x, y), whole.RGBAAt(x, y)
				worst = max(worst, absDiff(a.R, b.R), absDiff(a.G, b.G), absDiff(a.B, b.B))
			}
		}
		if worst > 2 { // sums of fractions in another order
			t.Errorf("tile %v differs from the whole by %d of 255", r, worst)
		}
	}
}

func absDiff(a, b uint8) int { return max(int(a), int(b)) - min(int(a), int(b)) }

// busy is a scene with something of everything.
func busy() *draw.Scene {
	s := &draw.Scene{Width: 300, Height: 200}
	s.Rect(0, 0, 300, 200, draw.Style{Fill: draw.Paper}, "")
	for i := range 12 {
		x, y := float64(i*23), float64(i*13)
		s.Path(draw.Path{Rings: [][]draw.Point{{{X: x, Y: y}, {X: x + 60, Y: y + 11}, {X: x + 31, Y: y + 70}}, {{X: x + 20, Y: y + 20}, {X: x + 40, Y: y + 20}, {X: x + 30, Y: y + 40}}}, Closed: true,
			Style: draw.Style{Fill: draw.Category(i), Stroke: draw.Ink, Width: 0.3 + float64(i)/3, Hatch: i%5 == 0}})
		s.Line(draw.Style{Stroke: draw.Ink, Width: 1.7, Dash: "7 3 1"}, draw.Point{X: -40, Y: y}, draw.Point{X: 150, Y: 190 - y}, draw.Point{X: 400, Y: y})
		s.Text(draw.Text{At: draw.Point{X: x + 10, Y: y + 30}, Text: fmt.Sprintf("Hollin %d ≥ Å", i), Size: 9 + float64(i), Colour: draw.Ink, Halo: i%2 == 0, Bold: i%3 == 0})
	}
	return s
}

func TestSameSceneSameBytes(t *testing.T) {
	a := raster.Paint(busy(), 1.25, draw.Light())
	if b := raster.Paint(busy(), 1.25, draw.Light()); !bytes.Equal(a.Pix, b.Pix) {
		t.Error("the same scene gave other pixels")
	}
	if b := raster.Paint(busy(), 1.25, draw.Dark()); bytes.Equal(a.Pix, b.Pix) {
		t.Error("the palette changes nothing")
	}
}

func TestSeveralGoroutinesPaintTheSame(t *testing.T) {
	want := raster.Paint(busy(), 2, draw.Light())
	var wg sync.WaitGroup
	for g := range 6 {
		wg.Go(func() {
			raster.Paint(busy(), 1+float64(g)/7, draw.Dark())
			if got := raster.Paint(busy(), 2, draw.Light()); !bytes.Equal(got.Pix, want.Pix) {
				t.Errorf("goroutine %d painted other pixels", g)
			}
		})
	}
	wg.Wait()
}

// Text has ink where its box says, and nowhere else.
func TestTextStandsInItsBox(t *testing.T) {
	for _, words := range []string{"Hollin Road 4", "ÅÉ çgjpqy ₂² · ≥ ≤ − α η →", "12 345 GWh/yr", "W", "日本"} {
		for _, size := range []float64{9, 12, 31} {
			for _, anchor := range []draw.Anchor{draw.Start, draw.Middle, draw.End} {
				for _, bold := range []bool{false, true} {
					s := &draw.Scene{Width: 800, Height: 80}
					text := draw.Text{At: draw.Point{X: 400.3, Y: 40.6}, Text: words, Size: size, Colour: black, Anchor: anchor, Bold: bold}
					s.Text(text)
					img := raster.Paint(s, 1, white())
					b := text.Box()
					grown := b.Grown(2, 2)
					in := image.Rect(int(math.Floor(grown.X0)), int(math.Floor(grown.Y0)), int(math.Ceil(grown.X1)), int(math.Ceil(grown.Y1)))
					if out := ink(img) - inkIn(img, in); out > 0.01 {
						t.Errorf("%q, %v, %s: %.2f pixels of ink outside the box", words, size, anchor, out)
					}
					// Ink reaches near both ends of the box, so the anchor is kept.
					edge := 0.35 * size
					for _, end := range []image.Rectangle{image.Rect(int(b.X0), 0, int(b.X0+edge)+1, 80), image.Rect(int(b.X1-edge), 0, int(b.X1)+1, 80)} {
						if inkIn(img, end) < 0.3 {
							t.Errorf("%q, %v, %s: no ink at an end of its box", words, size, anchor)
						}
					}
				}
			}
		}
	}
}

func TestBoldIsHeavierAndHaloIsPaper(t *testing.T) {
	weigh := func(bold bool) float64 {
		s := &draw.Scene{Width: 200, Height: 40}
		s.Text(draw.Text{At: draw.Point{X: 5, Y: 25}, Text: "Marsh", Size: 20, Colour: black, Bold: bold})
		return ink(raster.Paint(s, 1, white()))
	}
	if weigh(true) < 1.2*weigh(false) {
		t.Errorf("bold has %.0f pixels of ink, regular %.0f", weigh(true), weigh(false))
	}
	ground := func(halo bool) float64 {
		s := scene(200, 40, draw.Path{Rings: [][]draw.Point{box(0, 0, 200, 40)}, Closed: true, Style: draw.Style{Fill: "#808080"}})
		s.Text(draw.Text{At: draw.Point{X: 5, Y: 25}, Text: "Marsh", Size: 20, Colour: "#808080", Halo: halo})
		return ink(raster.Paint(s, 1, white()))
	}
	if ground(false)-ground(true) < 40 {
		t.Error("a halo takes nothing of the ground around the letters")
	}
}

func TestStrangeScenesDoNoHarm(t *testing.T) {
	nan, inf := math.NaN(), math.Inf(1)
	s := scene(50, 50,
		draw.Path{}, draw.Path{Rings: [][]draw.Point{nil, {{X: 1, Y: 1}}}, Closed: true, Style: draw.Style{Fill: black, Stroke: black, Width: 1}},
		draw.Path{Rings: [][]draw.Point{{{X: nan, Y: 1}, {X: 3, Y: inf}, {X: 4, Y: 4}}}, Closed: true, Style: draw.Style{Fill: black}},
		draw.Path{Rings: [][]draw.Point{{{X: -1e9, Y: -1e9}, {X: 1e9, Y: 1e9}}}, Style: draw.Style{Stroke: black, Width: 1, Dash: "1 1"}},
		draw.Path{Rings: [][]draw.Point{box(-1e9, -1e9, 1e9, 1e9)}, Closed: true, Style: draw.Style{Stroke: black, Width: 1, Dash: "0 2"}},
		draw.Path{Rings: [][]draw.Point{box(10, 10, 40, 40)}, Closed: true, Style: draw.Style{Fill: "red", Stroke: "#12", Width: 3}})
	s.Text(draw.Text{At: draw.Point{X: 1e9, Y: 5}, Text: "far", Size: 12, Colour: black})
	s.Text(draw.Text{At: draw.Point{X: 10, Y: 25}, Text: "bad", Size: 12, Colour: "ink"})
	img := raster.Paint(s, 1, white())
	if img.Rect != image.Rect(0, 0, 50, 50) {
		t.Fatalf("picture of %v", img.Rect)
	}
	// Of all these only the long dashed line, half ink half gap, crosses the picture.
	if got := ink(img); got < 30 || got > 42 {
		t.Errorf("%.1f pixels of ink", got)
	}
	for _, size := range []float64{0, -3, nan} {
		if img := raster.Paint(&draw.Scene{Width: size, Height: 10}, 1, white()); !img.Rect.Empty() {
			t.Errorf("width %v gave a picture of %v", size, img.Rect)
		}
	}
}

func TestHit(t *testing.T) {
	s := scene(100, 100,
		draw.Path{Rings: [][]draw.Point{box(10, 10, 90, 90), box(40, 40, 60, 60)}, Closed: true, Style: draw.Style{Fill: black}, Item: "P-1", Title: "ring"},
		draw.Path{Rings: [][]draw.Point{box(20, 20, 30, 30)}, Closed: true, Style: draw.Style{Fill: black}, Item: "P-2"},
		draw.Path{Rings: [][]draw.Point{box(0, 0, 100, 100)}, Closed: true, Style: draw.Style{Fill: black}}, // stands for nothing
		draw.Path{Rings: [][]draw.Point{{{X: 70, Y: 0}, {X: 70, Y: 100}}}, Style: draw.Style{Stroke: black, Width: 1}, Title: "line"})
	for _, c := range []struct {
		x, y        float64
		item, title string
	}{{15, 15, "P-1", "ring"}, {25, 25, "P-2", ""}, {50, 50, "", ""}, {5, 5, "", ""}, {70.5, 20, "", "line"}, {72, 95, "", "line"}, {77, 20, "P-1", "ring"}} {
		if item, title := raster.Hit(s, c.x, c.y); item != c.item || title != c.title {
			t.Errorf("at %v, %v: %q, %q, want %q, %q", c.x, c.y, item, title, c.item, c.title)
		}
	}
}

func BenchmarkPaint(b *testing.B) {
	s := busy()
	for b.Loop() {
		raster.Paint(s, 1, draw.Light())
	}
}

// Ten thousand parcels of twenty corners in a window's worth of pixels.
func BenchmarkPaintParcels(b *testing.B) {
	s := &draw.Scene{Width: 1000, Height: 1000}
	for i := range 100 {
		for j := range 100 {
			ring := make([]draw.Point, 20)
			for k := range ring {
				sin, cos := math.Sincos(2 * math.Pi * float64(k) / 20)
				ring[k] = draw.Point{X: 10*float64(i) + 5 + 4.5*cos, Y: 10*float64(j) + 5 + 4.5*sin}
			}
			s.Path(draw.Path{Rings: [][]draw.Point{ring}, Closed: true, Style: draw.Style{Fill: draw.Ramp(float64(i) / 100), Stroke: draw.Rule, Width: 0.5}, Item: "p"})
		}
	}
	for b.Loop() {
		raster.Paint(s, 1, draw.Light())
	}
}
