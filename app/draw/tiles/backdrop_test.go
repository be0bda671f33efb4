package tiles

import (
	"bytes"
	"context"
	"errors"
	"fmt"
	"image"
	"image/color"
	"math"
	"testing"

	"groundtally/app/draw"
	"groundtally/geo"
	"groundtally/geo/formats/worldfile"
)

// quarters is a picture of four colours: red north-west, green north-east, blue south-west, white south-east.
func quarters(side int) *image.NRGBA {
	img := image.NewNRGBA(image.Rect(0, 0, side, side))
	for y := range side {
		for x := range side {
			c := color.NRGBA{R: 255, A: 255}
			switch {
			case x >= side/2 && y >= side/2:
				c = color.NRGBA{R: 255, G: 255, B: 255, A: 255}
			case x >= side/2:
				c = color.NRGBA{G: 255, A: 255}
			case y >= side/2:
				c = color.NRGBA{B: 255, A: 255}
			}
			img.SetNRGBA(x, y, c)
		}
	}
	return img
}

// sheet is a square picture of pixels of so many metres around the test's centre, turned counter-clockwise.
func sheet(img image.Image, pixelM, turnDeg float64, at asPlane) Sheet {
	sin, cos := math.Sincos(turnDeg * math.Pi / 180)
	n := float64(img.Bounds().Dx())
	w := worldfile.World{A: pixelM * cos, D: pixelM * sin, B: pixelM * sin, E: -pixelM * cos}
	x, y := w.At(n/2, n/2)
	w.C, w.F = at.dx-x, at.dy-y
	return Sheet{Info: worldfile.Info{Width: img.Bounds().Dx(), Height: img.Bounds().Dy(), World: w, Placed: true}, At: at, Open: func() (image.Image, error) { return img, nil }}
}

func mustBackdrop(t testing.TB, g *Ground, sheets ...Sheet) *Backdrop {
	t.Helper()
	b, err := NewBackdrop(context.Background(), g, sheets)
	if err != nil {
		t.Fatal(err)
	}
	if b == nil {
		t.Fatal("there is no backdrop")
	}
	return b
}

func toned(look Look, c color.NRGBA) color.NRGBA {
	half := func(a, b uint8) uint8 { return uint8((int(a) + int(b) + 1) / 2) }
	return color.NRGBA{R: half(c.R, look.Paper.R), G: half(c.G, look.Paper.G), B: half(c.B, look.Paper.B), A: 255}
}

// Each colour lies where the picture's place says, upright and turned, near and far, in both looks, and what is
// beyond the picture stays as it is.
func TestBackdropLiesWhereItIs(t *testing.T) {
	g := mustGround(t, Layer{Role: "district", Features: []Feature{{ID: "d", Geometry: local(geo.Polygons, square(0, 0, 2000))}}})
	img := quarters(200)
	colours := []color.NRGBA{{R: 255, A: 255}, {G: 255, A: 255}, {B: 255, A: 255}, {R: 255, G: 255, B: 255, A: 255}}
	for _, turn := range []float64{0, 30, 180} {
		for _, moved := range []asPlane{{}, {dx: 500_000, dy: 5_253_250}} {
			b := mustBackdrop(t, g, sheet(img, 10, turn, moved))
			for name, look := range map[string]Look{"light": LightLook(), "dark": DarkLook()} {
				for _, level := range []int{4, 8, 14, 20} {
					rect := image.Rect(-256, -256, 256, 256)
					got := drawn(t, g, level, rect, Style{Look: look, Backdrop: b})
					sin, cos := math.Sincos(turn * math.Pi / 180)
					for i, c := range [][2]float64{{-400, 400}, {400, 400}, {-400, -400}, {400, -400}} {
						p := there(g, c[0]*cos-c[1]*sin, c[0]*sin+c[1]*cos)
						x, y := floor(p.X/MPerPx(level))+256, floor(-p.Y/MPerPx(level))+256
						if !(image.Point{x, y}).In(image.Rect(0, 0, 512, 512)) {
							continue
						}
						if have, want := at(got, x, y), toned(look, colours[i]); !near(have, want, 2) {
							t.Errorf("%s, turned %g, level %d: quarter %d is %v, want %v", name, turn, level, i, have, want)
						}
					}
					p := there(g, 1700, 0)
					if x, y := floor(p.X/MPerPx(level))+256, floor(-p.Y/MPerPx(level))+256; x < 512 && at(got, x, y) != look.Land {
						t.Errorf("%s, level %d: beyond the picture the land is %v", name, level, at(got, x, y))
					}
				}
			}
		}
	}
}

func near(a, b color.NRGBA, by float64) bool {
	d := func(x, y uint8) bool { return math.Abs(float64(x)-float64(y)) <= by }
	return d(a.R, b.R) && d(a.G, b.G) && d(a.B, b.B)
}

// Whatever the picture, the classes of a ramp keep their order of lightness, and outlines in the warm colour,
// text and the hatching stand out from what is under them.
func TestBackdropLeavesTheMapReadable(t *testing.T) {
	for name, c := range map[string]struct {
		look    Look
		palette draw.Palette
	}{"light": {LightLook(), draw.Light()}, "dark": {DarkLook(), draw.Dark()}} {
		paper := inkOf(c.look.Paper)
		veil := func(under color.NRGBA, seen color.NRGBA) color.NRGBA {
			o := paper.toward(inkOf(seen), backdropTone).part(backdropParcels).over(inkOf(under))
			return color.NRGBA{R: uint8(o), G: uint8(o >> 8), B: uint8(o >> 16), A: 255}
		}
		black, white := hex(0), hex(0xffffff)
		const classes = 6
		var lo, hi [classes]float64
		for i := range classes {
			var v uint32
			if _, err := fmt.Sscanf(c.palette.Ramp(float64(i)/(classes-1)), "#%06x", &v); err != nil {
				t.Fatal(err)
			}
			lo[i], hi[i] = grey(veil(hex(v), black)), grey(veil(hex(v), white))
			for _, seen := range []color.NRGBA{black, white} {
				if r := contrast(veil(c.look.Ink, seen), veil(c.look.Bare, seen)); r < 4.5 {
					t.Errorf("%s: ink has a contrast of %.2f on a bare parcel", name, r)
				}
				if r := contrast(veil(c.look.Warm, seen), veil(c.look.Bare, seen)); r < 3 {
					t.Errorf("%s: a warm outline has a contrast of %.2f on a bare parcel", name, r)
				}
				if r := contrast(veil(c.look.Hatch, seen), veil(c.look.Bare, seen)); r < 1.9 {
					t.Errorf("%s: the hatching has a contrast of %.2f", name, r)
				}
			}
		}
		for i := 1; i < classes; i++ {
			a, b := i-1, i
			if lo[b] > lo[a] {
				a, b = b, a
			}
			if lo[a] <= lo[b] || hi[a] <= hi[b] || lo[a] <= hi[b] {
				t.Errorf("%s: classes %d and %d are %.0f to %.0f and %.0f to %.0f", name, i-1, i, lo[i-1], hi[i-1], lo[i], hi[i])
			}
		}
	}
}

func TestBackdropHasNoSeams(t *testing.T) {
	g := mixed(t)
	style := Style{Look: DarkLook(), Backdrop: mustBackdrop(t, g, sheet(quarters(301), 7, 13, asPlane{}))}
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

// A picture of the ground takes the place of the relief.
func TestBackdropInPlaceOfRelief(t *testing.T) {
	g := mixed(t)
	r, b := mustRelief(t, g, heights(300, 17, hills), asPlane{}), mustBackdrop(t, g, sheet(quarters(100), 10, 0, asPlane{}))
	rect := image.Rect(-256, -256, 256, 256)
	alone := drawn(t, g, 8, rect, Style{Look: LightLook(), Backdrop: b})
	both := drawn(t, g, 8, rect, Style{Look: LightLook(), Backdrop: b, Relief: r})
	shade := drawn(t, g, 8, rect, Style{Look: LightLook(), Relief: r})
	inside, outside := 0, 0
	for y := range 512 {
		for x := range 512 {
			switch {
			case x > 256-110 && x < 256+110 && y > 256-110 && y < 256+110:
				if at(both, x, y) != at(alone, x, y) {
					t.Fatalf("at %d, %d the relief lies over the picture", x, y)
				}
				inside++
			case x < 256-140 || y < 256-140 || x > 256+140 || y > 256+140:
				if at(both, x, y) != at(shade, x, y) {
					t.Fatalf("at %d, %d the relief is missing beside the picture", x, y)
				}
				outside++
			}
		}
	}
	if inside == 0 || outside == 0 {
		t.Fatal("nothing was compared")
	}
}

// A picture far larger than the district, or of far more pixels than are kept, takes no more memory than said;
// one that lies elsewhere is none; a stop and a picture that cannot be read are told.
func TestBackdropKeepsWithinItsMemory(t *testing.T) {
	g := mixed(t)
	for name, s := range map[string]Sheet{"fine": sheet(image.NewGray(image.Rect(0, 0, 6000, 6000)), 0.4, 0, asPlane{}), "wide": sheet(image.NewPaletted(image.Rect(0, 0, 3000, 3000), color.Palette{color.White}), 100, 0, asPlane{})} {
		b := mustBackdrop(t, g, s)
		if n := b.Bytes(); n > 34<<20 {
			t.Errorf("%s: %d MB", name, n>>20)
		}
	}
	away := sheet(quarters(10), 1, 0, asPlane{})
	away.Info.World.C += 1e6
	if b, err := NewBackdrop(context.Background(), g, []Sheet{away}); b != nil || err != nil {
		t.Errorf("far away: %v, %v", b, err)
	}
	torn := sheet(quarters(10), 100, 0, asPlane{})
	out := errors.New("pulled out")
	torn.Open = func() (image.Image, error) { return nil, out }
	if _, err := NewBackdrop(context.Background(), g, []Sheet{torn}); !errors.Is(err, out) {
		t.Errorf("error %v", err)
	}
	ctx, stop := context.WithCancel(context.Background())
	stop()
	if _, err := NewBackdrop(ctx, g, []Sheet{sheet(quarters(10), 100, 0, asPlane{})}); !errors.Is(err, context.Canceled) {
		t.Errorf("stopped: %v", err)
	}
}
