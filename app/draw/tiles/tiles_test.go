package tiles

import (
	"bytes"
	"context"
	"errors"
	"image"
	"image/color"
	"math"
	"math/rand/v2"
	"testing"

	"groundtally/geo"
	"groundtally/geo/measure"
)

// ecef gives geocentric coordinates in metres.
func ecef(p geo.LonLat) [3]float64 {
	s, c := math.Sincos(p.Lat * math.Pi / 180)
	sl, cl := math.Sincos(p.Lon * math.Pi / 180)
	n := 6378137.0 / math.Sqrt(1-0.00669437999014*s*s)
	return [3]float64{n * c * cl, n * c * sl, n * (1 - 0.00669437999014) * s}
}

func TestPlaneIsTrueToScale(t *testing.T) {
	r := rand.New(rand.NewPCG(1, 2))
	for _, lat := range []float64{-47.5, 0, 35, 47.5, 62, 70} {
		plane := NewPlane(geo.LonLat{Lon: 179.9, Lat: lat})
		for range 500 {
			a := geo.XY{X: (r.Float64() - 0.5) * 60000, Y: (r.Float64() - 0.5) * 60000}
			turn := r.Float64() * 2 * math.Pi
			b := geo.XY{X: a.X + 500*math.Cos(turn), Y: a.Y + 500*math.Sin(turn)}
			p, q := plane.From(a), plane.From(b)
			if back := plane.To(p); back.Dist(a) > 1e-3 {
				t.Fatalf("lat %v: %v comes back as %v", lat, a, back)
			}
			u, v := ecef(p), ecef(q)
			chord := math.Sqrt((u[0]-v[0])*(u[0]-v[0]) + (u[1]-v[1])*(u[1]-v[1]) + (u[2]-v[2])*(u[2]-v[2]))
			if math.Abs(chord-500) > 0.05 {
				t.Fatalf("lat %v: 500 m at %v are %.3f m on the ground", lat, a, chord)
			}
		}
	}
}

func TestPixels(t *testing.T) {
	g := mustGround(t,
		Layer{Role: "district", Features: []Feature{{ID: "d", Geometry: local(geo.Polygons, square(0, 0, 110))}}},
		Layer{Role: "parcels", Features: []Feature{
			{ID: "a", Geometry: local(geo.Polygons, square(-50, 0, 40), square(-50, 0, 15))},
			{ID: "b", Geometry: local(geo.Polygons, square(50, 0, 40))},
		}})
	look := LightLook()
	teal := hex(0x2f7d77)
	img := render(t, g, 0, image.Rect(-128, -128, 128, 128), Shading{Class: []uint8{0, Bare}, Colours: []color.NRGBA{teal}}, nil)
	for _, c := range []struct {
		what string
		x, y int
		want color.NRGBA
	}{
		{"inside a", -80, 0, teal}, {"the hole of a", -50, 0, look.Land}, {"b without candidate", 50, 0, look.Bare},
		{"between", 0, 0, look.Land}, {"beyond the district", 120, 0, look.Outside}, {"the line around a", -90, 20, blend(teal, look.Border)},
	} {
		got := at(img, c.x+128, c.y+128)
		if c.what == "the line around a" {
			if got == teal || got == look.Land {
				t.Errorf("%s: no line, got %v", c.what, got)
			}
			continue
		}
		if got != c.want {
			t.Errorf("%s: got %v, want %v", c.what, got, c.want)
		}
	}
	for i := 3; i < len(img.Pix); i += 4 {
		if img.Pix[i] != 255 {
			t.Fatal("a pixel is not opaque")
		}
	}
}

func blend(a, b color.NRGBA) color.NRGBA {
	return color.NRGBA{R: a.R/2 + b.R/2, G: a.G/2 + b.G/2, B: a.B/2 + b.B/2, A: 255}
}

func TestHatchMeansUnknownOnly(t *testing.T) {
	g := mustGround(t, Layer{Role: "parcels", Features: []Feature{
		{ID: "a", Geometry: local(geo.Polygons, square(-60, 0, 50))}, {ID: "b", Geometry: local(geo.Polygons, square(60, 0, 50))},
	}})
	img := render(t, g, 0, image.Rect(-128, -128, 128, 128), Shading{Class: []uint8{Unknown, 0}, Colours: []color.NRGBA{hex(0x5aa79f)}}, nil)
	kinds := func(x0 int) map[color.NRGBA]int {
		out := map[color.NRGBA]int{}
		for y := -40; y < 40; y++ {
			for x := x0 - 40; x < x0+40; x++ {
				out[at(img, x+128, y+128)]++
			}
		}
		return out
	}
	look := LightLook()
	hatch := kinds(-60)
	if len(hatch) != 3 || math.Abs(float64(hatch[look.Bare])-80*80*4.0/7) > 20 {
		t.Errorf("hatching is %v", hatch)
	}
	if plain := kinds(60); len(plain) != 1 {
		t.Errorf("a coloured parcel shows %v", plain)
	}
}

func TestOverLimitHasAWarmOutlineInside(t *testing.T) {
	g := mustGround(t, Layer{Role: "parcels", Features: []Feature{
		{ID: "a", Geometry: local(geo.Polygons, square(-50, 0, 50))}, {ID: "b", Geometry: local(geo.Polygons, square(50, 0, 50))},
	}})
	teal := hex(0x5aa79f)
	s := Shading{Class: []uint8{0, 0}, Colours: []color.NRGBA{teal}, Over: []bool{true}}
	img := render(t, g, 0, image.Rect(-128, -128, 128, 128), s, nil)
	warm := LightLook().Warm
	if got := at(img, 128-98, 128); got != warm {
		t.Errorf("inside the edge of a: %v, want the warm %v", got, warm)
	}
	if got := at(img, 128-50, 128); got != teal {
		t.Errorf("the middle of a: %v, want %v", got, teal)
	}
	for x := 2; x < 99; x++ {
		if got := at(img, 128+x, 128); got != teal && x < 97 {
			t.Errorf("b, not over its limit, has %v at %d m", got, x)
		}
	}
}

// TestSeams draws a square of four tiles at once and tile by tile.
func TestSeams(t *testing.T) {
	g := mixed(t)
	s, marks := everything(g.Parcels()), someMarks()
	for _, level := range []int{-8, 0, 5, 9, 14, 22} {
		whole := render(t, g, level, image.Rect(-256, -256, 256, 256), s, marks)
		for _, k := range []Key{{level, -1, -1}, {level, 0, -1}, {level, -1, 0}, {level, 0, 0}} {
			tile := render(t, g, level, k.Rect(), s, marks)
			for y := range SidePx {
				from := whole.PixOffset(256+k.X*SidePx, 256+k.Y*SidePx+y)
				if !bytes.Equal(tile.Pix[y*tile.Stride:(y+1)*tile.Stride], whole.Pix[from:from+tile.Stride]) {
					t.Fatalf("level %d: row %d of tile %v differs from the whole", level, y, k)
				}
			}
		}
	}
}

// TestNoGapBetweenNeighbours checks that on ground covered by parcels no pixel falls between two of them,
// at full detail and in every coarse copy.
func TestNoGapBetweenNeighbours(t *testing.T) {
	g := mustGround(t, parcelCells(2500))
	for _, level := range []int{0, 8, 12, 18, 24, 28} {
		m := MPerPx(level)
		half := int(23 * cellM / m)
		half = min(half, 300)
		tile, err := g.Draw(context.Background(), level, image.Rect(-half, -half, half, half), Style{Look: LightLook()})
		if err != nil {
			t.Fatal(err)
		}
		for i, n := range tile.parcel {
			if n == 0 {
				t.Fatalf("level %d: pixel %d, %d is in no parcel", level, i%(2*half), i/(2*half))
			}
		}
	}
}

func TestHitAgainstThePicture(t *testing.T) {
	g := wide100k()
	if g.Parcels() != 100_000 {
		t.Fatalf("%d parcels", g.Parcels())
	}
	const level = 8
	rect := image.Rect(1000, -2000, 1256, -1744)
	tile, err := g.Draw(context.Background(), level, rect, Style{Look: LightLook()})
	if err != nil {
		t.Fatal(err)
	}
	m := MPerPx(level)
	seen := map[int]bool{}
	for y := range 256 {
		for x := range 256 {
			p := geo.XY{X: (float64(rect.Min.X+x) + 0.5) * m, Y: -(float64(rect.Min.Y+y) + 0.5) * m}
			n, ok := g.Hit(p)
			if !ok || uint32(n+1) != tile.parcel[y*256+x] {
				t.Fatalf("hit gives %d, %v at %v where %d is drawn", n, ok, p, tile.parcel[y*256+x]-1)
			}
			seen[n] = true
		}
	}
	if len(seen) < 25 {
		t.Errorf("only %d parcels in the picture", len(seen))
	}
}

func TestHitRespectsHolesAndOverlaps(t *testing.T) {
	g := mustGround(t, Layer{Role: "parcels", Features: []Feature{
		{ID: "ring", Geometry: local(geo.Polygons, square(0, 0, 50), square(0, 0, 20))},
		{ID: "none"},
		{ID: "later", Geometry: local(geo.Polygons, square(45, 0, 10))},
	}})
	for _, c := range []struct {
		x, want float64
	}{{0, -1}, {30, 0}, {45, 2}, {54, 2}, {60, -1}} {
		n, ok := g.Hit(there(g, c.x, 0))
		if ok != (c.want >= 0) || ok && n != int(c.want) {
			t.Errorf("hit at %v gives %d, %v", c.x, n, ok)
		}
	}
	if n, ok := g.Number("later"); !ok || g.ID(n) != "later" {
		t.Error("identifier and number do not agree")
	}
	if _, ok := g.Anchor(1); ok {
		t.Error("a parcel without a geometry has an anchor")
	}
	if a, ok := g.Anchor(0); !ok || !measure.Inside(a, g.parcels.full[0]) {
		t.Errorf("the anchor %v lies outside its parcel", a)
	}
}

func TestWithin(t *testing.T) {
	g := mustGround(t, Layer{Role: "parcels", Features: []Feature{
		{ID: "a", Geometry: local(geo.Polygons, square(-50, 0, 40))},
		{ID: "b", Geometry: local(geo.Polygons, square(50, 0, 40))},
	}})
	if got := g.Within(geo.Extent{MinX: -95, MinY: -45, MaxX: 60, MaxY: 45}); len(got) != 1 || got[0] != 0 {
		t.Errorf("got %v, want the one parcel that lies wholly inside", got)
	}
	if got := g.Within(g.Extent()); len(got) != 2 {
		t.Errorf("the whole extent holds %v", got)
	}
}

func TestSmallParcelsAreSeen(t *testing.T) {
	g := mustGround(t, Layer{Role: "parcels", Features: []Feature{{ID: "dot", Geometry: local(geo.Polygons, square(3.3, 2.1, 1))}}})
	tile, err := g.Draw(context.Background(), 20, image.Rect(-128, -128, 128, 128), Style{Look: LightLook()})
	if err != nil {
		t.Fatal(err)
	}
	n := 0
	for _, v := range tile.parcel {
		n += int(v)
	}
	if n != 1 {
		t.Errorf("a lone parcel of 2 m covers %d pixels of 32 m", n)
	}
}

func TestNewGroundStopsAndRefuses(t *testing.T) {
	ctx, stop := context.WithCancel(context.Background())
	stop()
	if _, err := NewGround(ctx, []Layer{parcelCells(1000)}); !errors.Is(err, context.Canceled) {
		t.Errorf("got %v", err)
	}
	if _, err := NewGround(context.Background(), []Layer{{Role: "parcels", Features: []Feature{{ID: "a"}}}}); err == nil {
		t.Error("layers without a position made a ground")
	}
	g := mustGround(t, parcelCells(400))
	if _, err := g.Draw(ctx, 0, Key{0, 0, 0}.Rect(), Style{}); !errors.Is(err, context.Canceled) {
		t.Errorf("a stopped drawing gave %v", err)
	}
}

func TestNamesByRank(t *testing.T) {
	point := func(x float64) geo.LonLatGeometry { return local(geo.Points, []geo.XY{{X: x}}) }
	g := mustGround(t, parcelCells(4), Layer{Role: "place_names", Features: []Feature{
		{Name: "Farm", Rank: 5, Geometry: point(1)}, {Name: "Town", Rank: 1, Geometry: point(2)}, {Name: "", Rank: 1, Geometry: point(3)}, {Name: "Nowhere", Rank: 1},
	}})
	if n := g.Names(); len(n) != 2 || n[0].Text != "Town" || n[1].At.Dist(there(g, 1, 0)) > 1e-6 {
		t.Errorf("names are %v", n)
	}
}

func TestMarksAreDrawn(t *testing.T) {
	g := mustGround(t, parcelCells(400))
	style := Style{Look: LightLook()}
	rect := image.Rect(-512, -512, 512, 512)
	marks := someMarks()
	placed := g.Place(marks)
	ring := placed.Draw(0, rect, style)
	dark := func(x, y int) bool { c := ring[(y+512)*1024+x+512]; return c>>24 > 200 && c&255 < 120 }
	// The setback of 250 m around two turbines 298 m apart is one outline, with no arc inside the other.
	for _, c := range []struct {
		what string
		x, y int
		want bool
	}{{"north of the first", 3, 4 - 250, true}, {"south of the second", 301, -7 + 250, true}, {"inside both", 253, 8, false}, {"outside", 3, 4 - 270, false}} {
		found := false
		at := there(g, float64(c.x), float64(-c.y))
		c.x, c.y = int(math.Round(at.X)), int(math.Round(-at.Y))
		for d := -2; d <= 2; d++ {
			found = found || dark(c.x+d, c.y) || dark(c.x, c.y+d)
		}
		if found != c.want {
			t.Errorf("%s: line %v, want %v", c.what, found, c.want)
		}
	}
	if got := placed.Draw(0, image.Rect(5000, 5000, 5256, 5256), style); got != nil {
		t.Error("marks are drawn where none are")
	}
	for i := range marks[0].Parcels[:2] {
		n, _ := g.Number(marks[0].Parcels[i])
		if !placed.Extent().Meets(g.ParcelExtent(n)) {
			t.Error("the marks' extent leaves out a parcel")
		}
	}
}

func TestHiddenRolesAreLeftOut(t *testing.T) {
	g := mixed(t)
	style := Style{Look: LightLook(), Hidden: []string{"parcels", "peat", "water", "roads", "grid_lines", "dwellings", "substations", "viewpoints"}}
	tile, err := g.Draw(context.Background(), 0, Key{0, 0, 0}.Rect(), style)
	if err != nil {
		t.Fatal(err)
	}
	if tile.parcel != nil || tile.overlay != nil || tile.uniform != underLand {
		t.Error("a hidden layer was drawn")
	}
}

func TestLooksAreReadable(t *testing.T) {
	for name, l := range map[string]Look{"light": LightLook(), "dark": DarkLook()} {
		for what, c := range map[string]color.NRGBA{"ink": l.Ink, "faint": l.Faint, "warm": l.Warm} {
			if r := contrast(c, l.Paper); r < 4.5 {
				t.Errorf("%s: %s on paper has a contrast of %.2f", name, what, r)
			}
		}
		if r := contrast(l.Hatch, l.Bare); r < 3 {
			t.Errorf("%s: hatching has a contrast of %.2f", name, r)
		}
	}
}

func contrast(a, b color.NRGBA) float64 {
	l := func(c color.NRGBA) float64 {
		f := func(v uint8) float64 {
			x := float64(v) / 255
			if x <= 0.04045 {
				return x / 12.92
			}
			return math.Pow((x+0.055)/1.055, 2.4)
		}
		return 0.2126*f(c.R) + 0.7152*f(c.G) + 0.0722*f(c.B)
	}
	x, y := l(a), l(b)
	return (math.Max(x, y) + 0.05) / (math.Min(x, y) + 0.05)
}

func TestSwatchesDiffer(t *testing.T) {
	style := Style{Look: LightLook()}
	seen := map[string]Sample{}
	for s := Coloured; s <= SetbackLine; s++ {
		pix := string(Swatch(s, hex(0x5aa79f), 22, 14, style).Pix)
		if other, ok := seen[pix]; ok {
			t.Errorf("samples %d and %d look the same", s, other)
		}
		seen[pix] = s
	}
}

func TestKeysCoverTheRectangle(t *testing.T) {
	r := image.Rect(-300, -10, 300, 600)
	keys := Keys(3, r)
	covered := 0
	for _, k := range keys {
		covered += k.Rect().Intersect(r).Dx() * k.Rect().Intersect(r).Dy()
	}
	if covered != r.Dx()*r.Dy() || len(keys) != 4*4 {
		t.Errorf("%d tiles cover %d pixels of %d", len(keys), covered, r.Dx()*r.Dy())
	}
	if k := keys[0]; k.Y != 0 && k.Y != 1 || k.X != -1 && k.X != 0 {
		t.Errorf("the first tile is %v, not one in the middle", k)
	}
}
