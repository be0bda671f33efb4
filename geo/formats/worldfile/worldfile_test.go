package worldfile

import (
	"bytes"
	"encoding/binary"
	"encoding/csv"
	"errors"
	"fmt"
	"hash/crc32"
	"image"
	"image/color"
	"image/png"
	"io"
	"math"
	"math/rand/v2"
	"os"
	"path/filepath"
	"runtime"
	"slices"
	"strconv"
	"strings"
	"testing"
	"testing/iotest"

	"groundtally/geo/formats"
)

const folder = "../../../testdata/formats/worldfile"

func load(t testing.TB, name string) []byte {
	t.Helper()
	b, err := os.ReadFile(filepath.Join(folder, name))
	if err != nil {
		t.Fatal(err)
	}
	return b
}

func rows(t *testing.T, name string) map[string][][]float64 {
	t.Helper()
	r := csv.NewReader(bytes.NewReader(load(t, name)))
	lines, err := r.ReadAll()
	if err != nil || len(lines) == 0 {
		t.Fatal(err)
	}
	out := map[string][][]float64{}
	for _, l := range lines {
		var v []float64
		for _, s := range l[1:] {
			n, err := strconv.ParseFloat(s, 64)
			if err != nil {
				t.Fatal(err)
			}
			v = append(v, n)
		}
		out[l[0]] = append(out[l[0]], v)
	}
	return out
}

func code(err error) string {
	var e *formats.Error
	if errors.As(err, &e) && e.Do != "" {
		return e.Code
	}
	return fmt.Sprint(err)
}

func TestDecode(t *testing.T) {
	usual := World{A: 25, E: -25, C: 500012.5, F: 5316862.5}
	for name, c := range map[string]struct {
		in   string
		want World
		code string
	}{
		"usual":            {"25.0\n0.0\n0.0\n-25.0\n500012.5\n5316862.5\n", usual, ""},
		"decimal comma":    {"25,0\r\n0,0\r\n0,0\r\n-25,0\r\n500012,5\r\n5316862,5", usual, ""},
		"mark and blanks":  {"\ufeff 25\n\n0\n0\n-25 \n5.000125e5\n5316862.5\n\n", usual, ""},
		"turned":           {"3\n4\n4\n-3\n10\n20\n", World{A: 3, D: 4, B: 4, E: -3, C: 10, F: 20}, ""},
		"empty":            {"", World{}, "not_a_world_file"},
		"five":             {"25\n0\n0\n-25\n500012.5\n", World{}, "not_a_world_file"},
		"seven":            {"25\n0\n0\n-25\n500012.5\n5316862.5\n1\n", World{}, "not_a_world_file"},
		"endless":          {strings.Repeat(" ", maxBytes) + "1", World{}, "not_a_world_file"},
		"word":             {"25\n0\nx\n-25\n500012.5\n5316862.5\n", World{}, "not_a_number"},
		"thousands":        {"25\n0\n0\n-25\n500,012.5\n5,316,862.5\n", World{}, "not_a_number"},
		"nan":              {"25\n0\n0\n-25\nnan\n5316862.5\n", World{}, "not_a_number"},
		"infinite":         {"25\n0\n0\n-25\ninf\n5316862.5\n", World{}, "not_a_number"},
		"hexadecimal":      {"0x25\n0\n0\n-25\n0\n5316862.5\n", World{}, "not_a_number"},
		"no size":          {"0\n0\n0\n-25\n500012.5\n5316862.5\n", World{}, "no_size"},
		"on a line":        {"1\n2\n2\n4\n500012.5\n5316862.5\n", World{}, "no_size"},
		"size beyond all":  {"1e200\n0\n0\n-1e200\n0\n0\n", World{}, "no_size"},
		"the grid's words": {"ncols 3\nnrows 2\n1 2\n", World{}, "not_a_number"},
	} {
		t.Run(name, func(t *testing.T) {
			got, err := Decode(strings.NewReader(c.in))
			if got != c.want || err != nil && code(err) != c.code || (err == nil) != (c.code == "") {
				t.Errorf("%+v, %v", got, err)
			}
		})
	}
	out := errors.New("pulled out")
	if _, err := Decode(iotest.ErrReader(out)); !errors.Is(err, out) {
		t.Errorf("error %v", err)
	}
}

func TestAt(t *testing.T) {
	turned := World{A: 3, D: 4, B: 4, E: -3, C: 10, F: 20}
	if x, y := turned.At(0.5, 0.5); x != 10 || y != 20 {
		t.Errorf("%g %g", x, y)
	}
	if x, y := turned.At(1.5, 2.5); x != 10+3+2*4 || y != 20+4-2*3 {
		t.Errorf("%g %g", x, y)
	}
	for _, w := range []World{turned, {A: 25, E: -25, C: 500012.5, F: 5316862.5}, {A: -2, E: 3}} {
		for _, p := range [][2]float64{{0, 0}, {37, 23}, {1.25, 99}} {
			x, y := w.At(p[0], p[1])
			if col, row := w.Pixel(x, y); math.Abs(col-p[0]) > 1e-6 || math.Abs(row-p[1]) > 1e-6 {
				t.Errorf("%+v: %v comes back as %g %g", w, p, col, row)
			}
		}
	}
	for w, want := range map[World]bool{
		turned: false, {A: 1, E: -1}: true, {A: 1, E: 1}: false, {A: -1, E: -1}: false, {A: 1, E: -1, B: 1e-12, D: -1e-12}: true, {A: 1, E: -1, D: 0.01}: false, {B: 1, D: 1}: false,
	} {
		if w.Upright() != want {
			t.Errorf("%+v is upright: %t", w, !want)
		}
	}
}

func TestNames(t *testing.T) {
	for name, want := range map[string][]string{
		"map.png": {"map.pgw", "map.pngw", "map.wld"}, "a.b/map.jpeg": {"a.b/map.jgw", "a.b/map.jpegw", "a.b/map.wld"},
		"MAP.TIF": {"MAP.TFW", "MAP.TIFW", "MAP.WLD"}, "map": nil, "a.b/map": nil, "map.": nil, "map.p": nil,
	} {
		if got := Names(name); !slices.Equal(got, want) {
			t.Errorf("%s: %q", name, got)
		}
	}
}

func picture(b []byte, o Options) (image.Image, error) {
	return Picture(bytes.NewReader(b), int64(len(b)), o)
}

// near compares a pixel with its channels of 8 bits.
func near(c color.Color, off float64, want ...float64) bool {
	r, g, b, _ := c.RGBA()
	for i, v := range []uint32{r, g, b} {
		if math.Abs(float64(v>>8)-want[i]) > off {
			return false
		}
	}
	return true
}

func TestPicturesAsGDALReads(t *testing.T) {
	corners, pixels := rows(t, "corners.csv"), rows(t, "pixels.csv")
	if len(corners) != 4 || len(pixels) != 4 {
		t.Fatal(len(corners), len(pixels))
	}
	for name, lines := range pixels {
		b := load(t, name)
		img, err := picture(b, Options{})
		if err != nil {
			t.Fatal(err)
		}
		off := 0.0
		if strings.HasSuffix(name, "jpg") {
			off = 6 // decoders fill in the colours between their samples in their own ways
		}
		for _, l := range lines {
			if c := img.At(int(l[0]), int(l[1])); !near(c, off, l[2:]...) {
				t.Errorf("%s at %v: %v", name, l, c)
			}
		}
		in, err := Look(bytes.NewReader(b), int64(len(b)), Options{})
		if err != nil || in.Width != 37 || in.Height != 23 {
			t.Fatalf("%+v, %v", in, err)
		}
		worlds := []World{}
		if in.Placed {
			worlds = append(worlds, in.World)
		}
		if f, err := os.Open(filepath.Join(folder, Names(name)[0])); err == nil {
			w, err := Decode(f)
			if err != nil {
				t.Fatal(err)
			}
			worlds = append(worlds, w)
		}
		if len(worlds) == 0 || (in.CRS == "EPSG:25832") != in.Placed {
			t.Errorf("%s has no place, %+v", name, in)
		}
		for _, w := range worlds {
			x0, y0 := w.At(0, 0)
			x1, y1 := w.At(float64(in.Width), float64(in.Height))
			want := corners[name][0]
			for i, v := range []float64{x0, y0, x1, y1} {
				if math.Abs(v-want[i]) > 1e-6 {
					t.Errorf("%s: corners %g %g, %g %g, want %v", name, x0, y0, x1, y1, want)
				}
			}
			if !w.Upright() {
				t.Errorf("%s is not upright", name)
			}
		}
	}
}

// The other forms, against the formula of the README.
func TestForms(t *testing.T) {
	for name, c := range map[string]func(c, r int) color.Color{
		"grey.png": func(c, _ int) color.Color { return color.Gray{uint8(c * 6)} },
		"grey.tif": func(c, _ int) color.Color { return color.Gray{uint8(c * 6)} },
		"rgba-deflate.tif": func(c, r int) color.Color {
			return color.NRGBA{uint8(c * 6), uint8(r * 10), uint8(c*5 + r*3), uint8(255 - c)}
		},
		"palette.tif": func(c, _ int) color.Color {
			if c == 0 {
				return color.RGBA{9, 8, 7, 255}
			}
			return color.RGBA{0, 0, 0, 255}
		},
	} {
		img, err := picture(load(t, name), Options{})
		if err != nil {
			t.Errorf("%s: %v", name, err)
			continue
		}
		for r := range 23 {
			for col := range 37 {
				r1, g1, b1, a1 := img.At(col, r).RGBA()
				r2, g2, b2, a2 := c(col, r).RGBA()
				if r1>>8 != r2>>8 || g1>>8 != g2>>8 || b1>>8 != b2>>8 || a1>>8 != a2>>8 {
					t.Fatalf("%s, column %d, row %d: %v, want %v", name, col, r, img.At(col, r), c(col, r))
				}
			}
		}
	}
}

func chunk(kind string, data []byte) []byte {
	b := binary.BigEndian.AppendUint32(nil, uint32(len(data)))
	body := append([]byte(kind), data...)
	return binary.BigEndian.AppendUint32(append(b, body...), crc32.ChecksumIEEE(body))
}

// promise is a PNG whose head promises n by n pixels of 64 bits.
func promise(n uint32) []byte {
	head := binary.BigEndian.AppendUint32(binary.BigEndian.AppendUint32(nil, n), n)
	return slices.Concat([]byte("\x89PNG\r\n\x1a\n"), chunk("IHDR", append(head, 16, 6, 0, 0, 0)), chunk("IDAT", []byte{0x78, 0x9c, 3, 0, 0, 0, 0, 1}), chunk("IEND", nil))
}

func TestRefused(t *testing.T) {
	for name, c := range map[string]struct {
		in   []byte
		o    Options
		code string
	}{
		"empty":            {nil, Options{}, "not_a_picture"},
		"text":             {[]byte("25\n0\n0\n-25\n0\n0\n"), Options{}, "not_a_picture"},
		"big":              {load(t, "refused-big.tif"), Options{}, "picture_form"},
		"planar":           {load(t, "refused-planar.tif"), Options{}, "picture_form"},
		"JPEG in TIFF":     {load(t, "refused-jpeg.tif"), Options{}, "picture_form"},
		"values":           {load(t, "refused-values.tif"), Options{}, "picture_form"},
		"16 bits":          {load(t, "refused-16-bits.tif"), Options{}, "picture_form"},
		"many pixels":      {load(t, "rgb.png"), Options{MaxPixels: 850}, "too_many"},
		"many TIFF pixels": {load(t, "rgb.tif"), Options{MaxPixels: 850}, "too_many"},
		"promise":          {promise(7900), Options{}, "damaged"},
		"great promise":    {promise(1 << 16), Options{}, "too_many"},
		"TIFF cut short":   {load(t, "rgb.tif")[:100], Options{}, "truncated"},
	} {
		t.Run(name, func(t *testing.T) {
			c.o.File = "p"
			var before, after runtime.MemStats
			runtime.ReadMemStats(&before)
			img, err := picture(c.in, c.o)
			runtime.ReadMemStats(&after)
			if code(err) != c.code || img != nil || !strings.HasPrefix(err.Error(), "p: ") {
				t.Errorf("error %v", err)
			}
			if n := after.TotalAlloc - before.TotalAlloc; n > 1<<20 {
				t.Errorf("%d bytes were allocated", n)
			}
		})
	}
	out := errors.New("pulled out")
	if _, err := Look(failing{out}, 100, Options{}); !errors.Is(err, out) {
		t.Errorf("error %v", err)
	}
}

type failing struct{ err error }

func (f failing) ReadAt([]byte, int64) (int, error) { return 0, f.err }

var _ io.ReaderAt = failing{}

var names = []string{"rgb.png", "grey.png", "rgb.jpg", "rgb.tif", "rgb-lzw.tif", "rgba-deflate.tif", "grey.tif", "palette.tif"}

func TestCutAndFlipped(t *testing.T) {
	random := rand.New(rand.NewPCG(3, 5))
	for _, name := range names {
		whole := load(t, name)
		for n := 0; n < len(whole); n += 1 + len(whole)/150 {
			if _, err := picture(whole[:n], Options{}); err == nil && n < len(whole)*9/10 {
				t.Errorf("%s cut to %d of %d bytes is read", name, n, len(whole))
			}
		}
		for range 200 {
			b := bytes.Clone(whole)
			for range 1 + random.IntN(3) {
				b[random.IntN(len(b))] = byte(random.Uint32())
			}
			if img, err := picture(b, Options{MaxPixels: 1 << 16}); err == nil && img.Bounds().Dx()*img.Bounds().Dy() > 1<<16 {
				t.Errorf("%s: %v", name, img.Bounds())
			}
		}
	}
}

func FuzzDecode(f *testing.F) {
	f.Add("25.0\n0.0\n0.0\n-25.0\n500012.5\n5316862.5\n")
	f.Fuzz(func(t *testing.T, s string) {
		w, err := Decode(strings.NewReader(s))
		if err == nil && (w.A*w.E-w.B*w.D == 0 || math.IsNaN(w.C+w.F)) {
			t.Fatalf("%+v", w)
		}
	})
}

func FuzzPicture(f *testing.F) {
	for _, name := range names {
		f.Add(load(f, name))
	}
	f.Fuzz(func(t *testing.T, b []byte) {
		o := Options{MaxPixels: 1 << 16}
		img, err := picture(b, o)
		if err != nil {
			return
		}
		in, err := Look(bytes.NewReader(b), int64(len(b)), o)
		if s := img.Bounds().Size(); err != nil || s.X != in.Width || s.Y != in.Height || s.X*s.Y > o.MaxPixels {
			t.Fatalf("%v, %+v, %v", s, in, err)
		}
	})
}

func BenchmarkPicture(b *testing.B) {
	img := image.NewNRGBA(image.Rect(0, 0, 1000, 1000))
	for i := range img.Pix {
		img.Pix[i] = byte(i / 4000)
	}
	var buf bytes.Buffer
	if err := png.Encode(&buf, img); err != nil {
		b.Fatal(err)
	}
	b.SetBytes(4_000_000)
	b.ReportAllocs()
	for b.Loop() {
		if _, err := picture(buf.Bytes(), Options{}); err != nil {
			b.Fatal(err)
		}
	}
}
