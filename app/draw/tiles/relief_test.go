package tiles

import (
	"bytes"
	"context"
	"errors"
	"fmt"
	"image"
	"image/color"
	"math"
	"sync"
	"testing"

	"groundtally/app/draw"
	"groundtally/geo"
	"groundtally/geo/raster"
)

// asPlane places a file whose coordinates are metres around the test's centre, moved by some metres.
type asPlane struct{ dx, dy float64 }

func (a asPlane) Forward(x, y float64) (geo.LonLat, error) {
	return NewPlane(testCentre).From(geo.XY{X: x - a.dx, Y: y - a.dy}), nil
}

func (a asPlane) Inverse(p geo.LonLat) (x, y float64, err error) {
	at := NewPlane(testCentre).To(p)
	return at.X + a.dx, at.Y + a.dy, nil
}

// heights gives a file of n by n cells around the test's centre, with the heights of a formula.
func heights(n int, cellM float64, f func(x, y float64) float64) *raster.Grid {
	g := &raster.Grid{NCols: n, NRows: n, XLL: -float64(n) / 2 * cellM, YLL: -float64(n) / 2 * cellM, CellX: cellM, CellY: cellM, NoData: -9999}
	for r := range n {
		for c := range n {
			g.Values = append(g.Values, float32(f(g.XLL+(float64(c)+0.5)*cellM, g.YLL+(float64(n-r)-0.5)*cellM)))
		}
	}
	return g
}

func hills(x, y float64) float64 { return 60 * math.Sin(x/300) * math.Cos(y/250) }

func mustRelief(t testing.TB, g *Ground, h *raster.Grid, at Placing) *Relief {
	t.Helper()
	r, err := NewRelief(context.Background(), g, h, at)
	if err != nil {
		t.Fatal(err)
	}
	if r == nil {
		t.Fatal("there is no relief")
	}
	return r
}

func drawn(t testing.TB, g *Ground, level int, rect image.Rectangle, style Style) *image.RGBA {
	t.Helper()
	tile, err := g.Draw(context.Background(), level, rect, style)
	if err != nil {
		t.Fatal(err)
	}
	return tile.Shade(NewPalette(everything(g.Parcels()), g.Parcels(), style), nil, nil)
}

func grey(c color.NRGBA) float64 {
	return 0.2126*float64(c.R) + 0.7152*float64(c.G) + 0.0722*float64(c.B)
}

// A hill is bright towards the north-west and dark towards the south-east, where it stands, in both looks; level
// ground and what lies beyond the terrain have no relief.
func TestReliefOfAHill(t *testing.T) {
	g := mustGround(t, Layer{Role: "district", Features: []Feature{{ID: "d", Geometry: local(geo.Polygons, square(0, 0, 2000))}}})
	for _, moved := range []asPlane{{}, {dx: 500_000, dy: 5_253_250}} {
		h := heights(120, 20, func(x, y float64) float64 { return math.Max(0, 100-0.3*math.Hypot(x-200, y-100)) })
		h.XLL, h.YLL = h.XLL+moved.dx, h.YLL+moved.dy
		r := mustRelief(t, g, h, moved)
		for name, look := range map[string]Look{"light": LightLook(), "dark": DarkLook()} {
			img := drawn(t, g, 8, image.Rect(-512, -512, 512, 512), Style{Look: look, Relief: r})
			seen := func(x, y float64) float64 {
				p := there(g, x, y)
				return grey(at(img, floor(p.X/4)+512, floor(-p.Y/4)+512))
			}
			land := grey(look.Land)
			for _, c := range []struct {
				what string
				x, y float64
				sign float64
			}{
				{"north-west", 100, 200, 1}, {"south-east", 300, 0, -1}, {"level", 800, -600, 0}, {"beyond", 1400, 1400, 0},
			} {
				if d := seen(c.x, c.y) - land; c.sign == 0 && d != 0 || c.sign*d < 0 || c.sign != 0 && math.Abs(d) < 3 {
					t.Errorf("%s: %s of the hill differs from level land by %.1f", name, c.what, d)
				}
			}
		}
	}
}

// Whatever the relief, the classes of a ramp keep their order of lightness, by half of what lies between two.
func TestReliefKeepsTheRampInOrder(t *testing.T) {
	for name, c := range map[string]struct {
		look    Look
		palette draw.Palette
	}{"light": {LightLook(), draw.Light()}, "dark": {DarkLook(), draw.Dark()}} {
		inks := reliefInks(c.look, reliefParcels)
		const classes = 6
		var lo, hi [classes]float64
		for i := range classes {
			var v uint32
			if _, err := fmt.Sscanf(c.palette.Ramp(float64(i)/(classes-1)), "#%06x", &v); err != nil {
				t.Fatal(err)
			}
			lo[i], hi[i] = math.Inf(1), math.Inf(-1)
			for _, k := range inks {
				o := k.over(inkOf(hex(v)))
				l := grey(color.NRGBA{R: uint8(o), G: uint8(o >> 8), B: uint8(o >> 16)})
				lo[i], hi[i] = math.Min(lo[i], l), math.Max(hi[i], l)
			}
			if plain := grey(hex(v)); inks[levelShade] != 0 || lo[i] > plain || hi[i] < plain {
				t.Errorf("%s: class %d is %.0f to %.0f, %.0f on level ground", name, i, lo[i], hi[i], plain)
			}
		}
		for i := 1; i < classes; i++ {
			a, b := i-1, i
			if lo[b] > lo[a] { // the dark ramp rises
				a, b = b, a
			}
			if lo[a]-hi[b] < 0.2*(lo[a]-lo[b]) {
				t.Errorf("%s: classes %d and %d are %.0f to %.0f and %.0f to %.0f", name, i-1, i, lo[i-1], hi[i-1], lo[i], hi[i])
			}
		}
	}
}

// What stands on the ground is read as well over the darkest and the lightest relief.
func TestReliefLeavesTextReadable(t *testing.T) {
	for name, l := range map[string]Look{"light": LightLook(), "dark": DarkLook()} {
		for _, k := range reliefInks(l, 1) {
			o := k.over(inkOf(l.Land))
			ground := color.NRGBA{R: uint8(o), G: uint8(o >> 8), B: uint8(o >> 16), A: 255}
			if r := contrast(l.Ink, ground); r < 4.5 {
				t.Fatalf("%s: ink over relief has a contrast of %.2f", name, r)
			}
			if r := contrast(l.Dwelling, ground); r < 4.5 {
				t.Fatalf("%s: dwellings over relief have a contrast of %.2f", name, r)
			}
		}
	}
}

func TestReliefHasNoSeams(t *testing.T) {
	g := mixed(t)
	style := Style{Look: DarkLook(), Relief: mustRelief(t, g, heights(300, 17, hills), asPlane{})}
	for _, level := range []int{-8, 0, 9, 14, 22} {
		whole := drawn(t, g, level, image.Rect(-256, -256, 256, 256), style)
		for _, k := range []Key{{level, -1, -1}, {level, 0, -1}, {level, -1, 0}, {level, 0, 0}} {
			tile := drawn(t, g, level, k.Rect(), style)
			for y := range SidePx {
				from := whole.PixOffset(256+k.X*SidePx, 256+k.Y*SidePx+y)
				if !bytes.Equal(tile.Pix[y*tile.Stride:(y+1)*tile.Stride], whole.Pix[from:from+tile.Stride]) {
					t.Fatalf("level %d: row %d of tile %v differs from the whole", level, y, k)
				}
			}
		}
	}
}

// Water and lines lie over the relief, unknown stays hatched, and nothing but the terrain hides it.
func TestReliefLiesUnderAll(t *testing.T) {
	g := mixed(t)
	r := mustRelief(t, g, heights(300, 17, hills), asPlane{})
	rect := image.Rect(-256, -256, 256, 256)
	plain := drawn(t, g, 8, rect, Style{Look: LightLook()})
	with := drawn(t, g, 8, rect, Style{Look: LightLook(), Relief: r})
	hidden := drawn(t, g, 8, rect, Style{Look: LightLook(), Relief: r, Hidden: []string{"terrain"}})
	if !bytes.Equal(hidden.Pix, plain.Pix) {
		t.Error("hidden terrain shows")
	}
	look, changed, water := LightLook(), 0, 0
	for y := range 512 {
		for x := range 512 {
			a, b := at(plain, x, y), at(with, x, y)
			if a != b {
				changed++
			}
			if a == look.Water {
				water++
				if b != a {
					t.Fatalf("water has a relief at %d, %d", x, y)
				}
			}
			if d := math.Abs(grey(a) - grey(b)); d > 30 {
				t.Fatalf("the relief changes %v to %v", a, b)
			}
		}
	}
	if changed < 512*512/3 || water < 100 {
		t.Errorf("%d pixels have a relief, %d are water", changed, water)
	}
	other := mustGround(t, Layer{Role: "district", Features: []Feature{{ID: "d", Geometry: local(geo.Polygons, square(400, 0, 2000))}}})
	if !bytes.Equal(drawn(t, other, 8, rect, Style{Look: LightLook(), Relief: r}).Pix, drawn(t, other, 8, rect, Style{Look: LightLook()}).Pix) {
		t.Error("the relief of another ground shows")
	}
}

func TestReliefIsBoundedAndTheSameAgain(t *testing.T) {
	g := mixed(t)
	fine := heights(2500, 2, hills)
	a, b := mustRelief(t, g, fine, asPlane{}), mustRelief(t, g, fine, asPlane{})
	if n := a.Bytes(); n > maxReliefCells*4/3+1000 || n < maxReliefCells/2 {
		t.Errorf("a relief of 6 million cells takes %d bytes", n)
	}
	for i, l := range a.levels {
		if !bytes.Equal(l.shade, b.levels[i].shade) {
			t.Fatal("the relief differs from one time to the next")
		}
	}
	// A terrain much larger than the district is kept around it only.
	far := mustRelief(t, g, heights(1000, 100, hills), asPlane{})
	if l := far.levels[0]; l.nx > 120 || l.ny > 120 {
		t.Errorf("around a district of 4.6 km there are %d by %d cells of 100 m", l.nx, l.ny)
	}
	oblong := heights(300, 17, hills)
	oblong.CellX /= 2
	oblong.XLL /= 2
	if l := mustRelief(t, g, oblong, asPlane{}).levels[0]; math.Abs(l.cellM-8.5) > 0.01 {
		t.Errorf("cells of 8.5 by 17 m give a relief of %v m", l.cellM)
	}
}

// nowhere fails for every position, as a system outside its area does.
type nowhere struct{ asPlane }

func (nowhere) Inverse(geo.LonLat) (x, y float64, err error) { return 0, 0, errors.New("outside") }

func TestNoRelief(t *testing.T) {
	g := mixed(t)
	empty := heights(100, 50, hills)
	for i := range empty.Values {
		empty.Values[i] = float32(empty.NoData)
	}
	for name, c := range map[string]struct {
		h  *raster.Grid
		at Placing
	}{
		"level ground":  {heights(100, 50, func(float64, float64) float64 { return 7 }), asPlane{}},
		"no heights":    {empty, asPlane{}},
		"elsewhere":     {heights(100, 50, hills), asPlane{dx: 1e6}},
		"one cell":      {heights(1, 5000, hills), asPlane{}},
		"unknown place": {heights(100, 50, hills), nowhere{}},
	} {
		if r, err := NewRelief(context.Background(), g, c.h, c.at); r != nil || err != nil {
			t.Errorf("%s: got %v, %v", name, r, err)
		}
	}
	ctx, stop := context.WithCancel(context.Background())
	stop()
	if _, err := NewRelief(ctx, g, heights(100, 50, hills), asPlane{}); !errors.Is(err, context.Canceled) {
		t.Errorf("stopped, it gave %v", err)
	}
}

// The painter shows a relief that comes later, and takes it away again.
func TestReliefComesLater(t *testing.T) {
	g := mixed(t)
	r := mustRelief(t, g, heights(300, 17, hills), asPlane{})
	p := NewPainter(Options{Workers: 2})
	defer p.Close()
	p.SetStyle(Style{Look: LightLook()})
	p.SetGround(g)
	keys := Keys(8, image.Rect(-256, -256, 256, 256))
	p.Want(keys)
	waitFor(t, "tiles", allFresh(p, keys))
	before, _ := p.Picture(keys[0])
	first := bytes.Clone(before.Pix)
	for _, c := range []struct {
		relief *Relief
		same   bool
	}{{r, false}, {nil, true}} {
		p.SetStyle(Style{Look: LightLook(), Relief: c.relief})
		waitFor(t, "new tiles", allFresh(p, keys))
		now, _ := p.Picture(keys[0])
		if bytes.Equal(now.Pix, first) != c.same {
			t.Errorf("relief %v: the picture is the first: %v", c.relief != nil, !c.same)
		}
	}
}

// wideRelief is a relief under the large district, of cells of 25 m.
var wideRelief = sync.OnceValue(func() *Relief {
	r, err := NewRelief(context.Background(), wide100k(), heights(1400, 50, hills), asPlane{})
	if err != nil || r == nil {
		panic(fmt.Sprint("no relief: ", err))
	}
	return r
})

func BenchmarkNewRelief(b *testing.B) {
	g, h := mixed(b), heights(240, 25, hills)
	b.Run("58 thousand cells", func(b *testing.B) {
		for b.Loop() {
			mustRelief(b, g, h, asPlane{})
		}
	})
	b.Run("2 million cells", func(b *testing.B) {
		g, h := wide100k(), heights(1400, 50, hills)
		for b.Loop() {
			mustRelief(b, g, h, asPlane{})
		}
	})
}

// BenchmarkRelief draws and colours tiles without a relief and with one.
func BenchmarkRelief(b *testing.B) {
	g, r := wide100k(), wideRelief()
	s := NewPalette(everything(g.Parcels()), g.Parcels(), Style{Look: LightLook()})
	for _, whole := range []bool{true, false} {
		keys, what := benchView(g, whole), map[bool]string{true: "overview", false: "close"}[whole]
		for _, relief := range []*Relief{nil, r} {
			style, name := Style{Look: LightLook(), Relief: relief}, map[bool]string{true: "without", false: "with"}[relief == nil]
			drawAll := func(b *testing.B) (out []*Tile) {
				for _, k := range keys {
					tile, err := g.Draw(context.Background(), k.Level, k.Rect(), style)
					if err != nil {
						b.Fatal(err)
					}
					out = append(out, tile)
				}
				return out
			}
			b.Run(what+"/draw/"+name, func(b *testing.B) {
				for b.Loop() {
					drawAll(b)
				}
			})
			b.Run(what+"/colour/"+name, func(b *testing.B) {
				tiles := drawAll(b)
				var into *image.RGBA
				for b.Loop() {
					for _, t := range tiles {
						into = t.Shade(s, nil, into)
					}
				}
			})
		}
	}
}
