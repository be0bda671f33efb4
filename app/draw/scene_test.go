package draw_test

import (
	"bytes"
	"encoding/xml"
	"errors"
	"fmt"
	"io"
	"math"
	"strings"
	"sync"
	"testing"

	"groundtally/app/draw"
	"groundtally/app/draw/svg"
	"groundtally/geo"
)

// square is a polygon with its lower left corner at a position, a side of d degrees long.
func square(lon, lat, d float64) geo.LonLatGeometry {
	return geo.LonLatGeometry{Kind: geo.Polygons, Parts: [][][]geo.LonLat{{{{Lon: lon, Lat: lat}, {Lon: lon + d, Lat: lat}, {Lon: lon + d, Lat: lat + d}, {Lon: lon, Lat: lat + d}, {Lon: lon, Lat: lat}}}}}
}

func point(lon, lat float64) geo.LonLatGeometry {
	return geo.LonLatGeometry{Kind: geo.Points, Parts: [][][]geo.LonLat{{{{Lon: lon, Lat: lat}}}}}
}

// crowded is a district with far more names than have room.
func crowded(n int) []draw.MapLayer {
	parcels, names, dwellings := draw.MapLayer{Role: "parcels"}, draw.MapLayer{Role: "place_names"}, draw.MapLayer{Role: "dwellings"}
	for i := range n {
		for j := range n {
			lon, lat := 8+0.01*float64(i), 50+0.01*float64(j)
			parcels.Features = append(parcels.Features, draw.MapFeature{ID: fmt.Sprintf("P-%d-%d", i, j), Geometry: square(lon, lat, 0.009)})
			names.Features = append(names.Features, draw.MapFeature{Name: fmt.Sprintf("Upper Marsh <%d> & Co", i*n+j), Rank: float64(1 + (i+j)%4), Geometry: point(lon, lat)})
			dwellings.Features = append(dwellings.Features, draw.MapFeature{Geometry: point(lon+0.004, lat+0.004)})
		}
	}
	return []draw.MapLayer{{Role: "district", Features: []draw.MapFeature{{Geometry: square(7.99, 49.99, 0.01*float64(n)+0.02)}}}, parcels, names, dwellings,
		{Role: "substations", Features: []draw.MapFeature{{ID: "S1", Geometry: point(8.02, 50.02)}}}}
}

func testMap(n int) *draw.Scene {
	shade := func(id string) (draw.Style, string) { return draw.Style{Fill: draw.Ramp(0.4)}, id }
	marks := draw.Marks{Turbines: []geo.LonLat{{Lon: 8.03, Lat: 50.03}, {Lon: 8.031, Lat: 50.031}}, Routes: [][2]geo.LonLat{{{Lon: 8.03, Lat: 50.03}, {Lon: 8.02, Lat: 50.02}}}}
	for i := range 3 {
		marks.Numbers = append(marks.Numbers, draw.Numbered{Text: fmt.Sprint(i + 1), Parcels: map[string]bool{"P-3-3": true}})
	}
	return draw.Map("District <A> & \"B\"", crowded(n), shade, marks, []draw.Legend{{Style: draw.Style{Fill: draw.Ramp(0)}, Text: "lowest"}, {Sign: "turbine", Text: "turbine"}}, 1000)
}

func TestMapTextsKeepApart(t *testing.T) {
	for _, n := range []int{4, 9, 20} {
		s := testMap(n)
		texts := textsOf(s)
		if len(texts) < 8 {
			t.Fatalf("%d parcels: only %d texts are on the map", n*n, len(texts))
		}
		for i, a := range texts {
			b := a.Box()
			if b.X0 < 0 || b.Y0 < 0 || b.X1 > s.Width || b.Y1 > s.Height {
				t.Errorf("%d parcels: %q leaves the picture", n*n, a.Text)
			}
			for _, c := range texts[i+1:] {
				if b.Meets(c.Box()) {
					t.Errorf("%d parcels: %q and %q overlap", n*n, a.Text, c.Text)
				}
			}
		}
	}
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

func TestMapHasScaleNorthAndLegend(t *testing.T) {
	var all []string
	for _, x := range textsOf(testMap(9)) {
		all = append(all, x.Text)
	}
	joined := strings.Join(all, "\n")
	for _, want := range []string{"N", "km", "dwelling", "substation", "turbine", "lowest"} {
		if !strings.Contains(joined, want) {
			t.Errorf("the map says nowhere %q", want)
		}
	}
}

func TestScaleBarIsTrue(t *testing.T) {
	s := testMap(9)
	// The district is 0.11 degrees of latitude high: 0.11 × 111.2 km on the picture's height without the edges.
	var bar draw.Path
	for i, it := range s.Items {
		if x, ok := it.(draw.Text); ok && strings.HasSuffix(x.Text, " km") {
			bar = s.Items[i-1].(draw.Path)
			var km float64
			if _, err := fmt.Sscanf(x.Text, "%g km", &km); err != nil {
				t.Fatal(err)
			}
			north, south := math.Inf(1), math.Inf(-1)
			for _, it := range s.Items {
				if p, ok := it.(draw.Path); ok && p.Style.Fill == draw.Land {
					for _, q := range p.Rings[0] {
						north, south = math.Min(north, q.Y), math.Max(south, q.Y)
					}
				}
			}
			got := (bar.Rings[0][2].X - bar.Rings[0][1].X) / km
			if want := (south - north) / (0.11 * 111.2); math.Abs(got/want-1) > 1e-9 {
				t.Errorf("the bar gives %v units for a kilometre, the map %v", got, want)
			}
			return
		}
	}
	t.Fatal("no scale bar")
}

func TestEmptyMapIsAPicture(t *testing.T) {
	for _, layers := range [][]draw.MapLayer{nil, {{Role: "parcels", Features: []draw.MapFeature{{ID: "p", Geometry: point(8, 50)}}}}} {
		s := draw.Map("none", layers, func(string) (draw.Style, string) { return draw.Style{}, "" }, draw.Marks{}, nil, 500)
		wellFormed(t, svg.Write(s))
	}
}

func TestSVGIsWellFormedAndRepeatable(t *testing.T) {
	a, b := svg.Write(testMap(9)), svg.Write(testMap(9))
	if !bytes.Equal(a, b) {
		t.Error("the same map gave different bytes")
	}
	wellFormed(t, a)
	s := &draw.Scene{Width: 10, Height: 10, Title: "a\x00b\xff<", ID: "-\"1"}
	s.Text(draw.Text{Text: "\x01<script>&", Colour: draw.Ink, Size: 10})
	s.Rect(0, 0, math.Copysign(0, -1), 3, draw.Style{Hatch: true}, "</title><script>")
	out := svg.Write(s)
	wellFormed(t, out)
	if bytes.Contains(out, []byte("<script")) || bytes.Contains(out, []byte(`"-0`)) {
		t.Errorf("not escaped, or minus zero: %s", out)
	}
}

func wellFormed(t *testing.T, b []byte) {
	t.Helper()
	d := xml.NewDecoder(bytes.NewReader(b))
	for {
		_, err := d.Token()
		if errors.Is(err, io.EOF) {
			return
		}
		if err != nil {
			t.Fatalf("not well-formed: %v", err)
		}
	}
}

// Check values of the contrast ratio: black on white is 21:1 by definition; #777777 on white is 4.48:1,
// the example known from WCAG 2.1 of a grey that just fails.
func TestContrast(t *testing.T) {
	for _, c := range []struct {
		a, b string
		want float64
	}{{"#000000", "#ffffff", 21}, {"#777777", "#ffffff", 4.48}, {"#ffffff", "#ffffff", 1}} {
		if got := draw.Contrast(c.a, c.b); math.Abs(got-c.want) > 0.005 {
			t.Errorf("Contrast(%s, %s) = %v, want %v", c.a, c.b, got, c.want)
		}
	}
}

func TestTextColoursCanBeRead(t *testing.T) {
	for name, p := range map[string]draw.Palette{"light": draw.Light(), "dark": draw.Dark()} {
		for _, c := range []string{p.Ink, p.Faint, p.Warm, p.Accent} {
			if got := draw.Contrast(c, p.Paper); got < 4.5 {
				t.Errorf("%s: %s on %s has a contrast of %.2f", name, c, p.Paper, got)
			}
		}
	}
	for _, c := range []string{draw.Ink, draw.Faint, draw.Warm, draw.Light().Accent} {
		if got := draw.Contrast(c, "#ffffff"); got < 4.5 {
			t.Errorf("%s on white has a contrast of %.2f", c, got)
		}
	}
	for i := range 8 {
		if got := draw.Contrast(draw.TextOn(draw.Category(i)), draw.Category(i)); got < 4.5 {
			t.Errorf("text on category %d has a contrast of %.2f", i, got)
		}
	}
}

// More stands out more from the ground, in either palette, and the order reads in grey.
func TestRampStandsOutMoreWithMore(t *testing.T) {
	for name, p := range map[string]draw.Palette{"light": draw.Light(), "dark": draw.Dark()} {
		for i := range 10 {
			if draw.Contrast(p.Ramp(float64(i)/10), p.Paper) >= draw.Contrast(p.Ramp(float64(i+1)/10), p.Paper) {
				t.Errorf("%s: the ramp does not stand out more after %d/10", name, i)
			}
		}
	}
	if draw.Ramp(0.3) != draw.Light().Ramp(0.3) || draw.Ramp(-1) != draw.Ramp(0) || draw.Ramp(2) != draw.Ramp(1) {
		t.Error("the ramp does not keep to its ends, or differs from that of the light palette")
	}
}

// Advances in the face's own files (hmtx table, 2000 units for an em): 1160 for figures, 998 for x, 1526
// for H in the regular weight.
func TestTextWidthIsThatOfTheFace(t *testing.T) {
	for _, c := range []struct {
		text string
		em   float64
	}{{"0", 0.58}, {"1234567890", 5.8}, {"−", 0.58}, {"", 0}, {"\x01", 0}, {"H", 0.763}} {
		if got := draw.TextWidth(c.text, 1, false); math.Abs(got-c.em) > 0.0011 {
			t.Errorf("TextWidth(%q) = %v em, want %v", c.text, got, c.em)
		}
	}
	if draw.TextWidth("Marsh", 12, true) <= draw.TextWidth("Marsh", 12, false) {
		t.Error("bold is no wider than regular")
	}
	if w := draw.TextWidth("日本", 10, false); w < 20 {
		t.Errorf("letters that the face lacks take %v, less than any face needs", w)
	}
	if !draw.HasLetters("CO₂ ² · ≥ ≤ − α η → Åß") || draw.HasLetters("日") {
		t.Error("HasLetters does not know the face")
	}
}

func TestTextWidthFromSeveralGoroutines(t *testing.T) {
	var wg sync.WaitGroup
	texts := []string{"plain", "≥ 40 dB(A)", "日本語のテキスト", "→ ₂ ²"}
	var got [8][4]float64
	for g := range got {
		wg.Go(func() {
			for i, x := range texts {
				got[g][i] = draw.TextWidth(x, 12, g%2 == 0)
			}
		})
	}
	wg.Wait()
	for g := 2; g < len(got); g++ {
		if got[g] != got[g-2] {
			t.Errorf("goroutine %d measured %v, another %v", g, got[g], got[g-2])
		}
	}
}

func TestAccentsAreInTheBox(t *testing.T) {
	plain, high := draw.Text{Text: "A", Size: 100}.Box(), draw.Text{Text: "Å", Size: 100}.Box()
	if high.Y0 > -93 || plain.Y0 != -78 {
		t.Errorf("boxes start at %v and %v", plain.Y0, high.Y0)
	}
}

func TestLines(t *testing.T) {
	text := "a long name of a site that has no room in a single line"
	for _, most := range []int{1, 2, 3} {
		got := draw.Lines(text, 12, false, 110, most)
		if len(got) != most {
			t.Errorf("at most %d lines gave %q", most, got)
		}
		for _, l := range got {
			if draw.TextWidth(l, 12, false) > 110 {
				t.Errorf("%q is too wide", l)
			}
		}
		if cut := strings.HasSuffix(got[len(got)-1], "..."); !cut && strings.Join(got, " ") != text {
			t.Errorf("%q lost words without saying so", got)
		}
	}
	if got := draw.Lines(text, 12, false, 1000, 3); len(got) != 1 || got[0] != text {
		t.Errorf("with room: %q", got)
	}
	if got := draw.Lines("unbreakablyLongWord", 12, false, 50, 3); len(got) != 1 || draw.TextWidth(got[0], 12, false) > 50 {
		t.Errorf("one long word: %q", got)
	}
}

func TestFit(t *testing.T) {
	if got := draw.Fit("short", 12, false, 200); got != "short" {
		t.Errorf("Fit changed a text that fits: %q", got)
	}
	got := draw.Fit("a very long name of a site that has no room", 12, false, 100)
	if !strings.HasSuffix(got, "...") || draw.TextWidth(got, 12, false) > 100 {
		t.Errorf("Fit = %q", got)
	}
}

func BenchmarkMap(b *testing.B) {
	layers := crowded(40)
	shade := func(id string) (draw.Style, string) { return draw.Style{Fill: draw.Ramp(0.4)}, id }
	for b.Loop() {
		svg.Write(draw.Map("m", layers, shade, draw.Marks{}, nil, 1000))
	}
}
