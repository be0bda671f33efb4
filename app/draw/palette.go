package draw

import (
	"fmt"
	"math"
	"strconv"
)

// Colours of the light palette, for scenes that are drawn for paper.
const (
	Paper = "#fbf9f4"
	Ink   = "#26302f"
	Faint = "#5f6b69"
	Rule  = "#d9d4c7"
	Warm  = "#b4500f" // wants attention; always beside a word
	Water = "#cfe0e6"
	Land  = "#f1ece0"
)

// Palette is a set of colours that belong together. Ink, Faint, Warm, Accent are for text on Paper, with a
// contrast of at least 4.5:1; the others are for ground, lines.
type Palette struct {
	Paper  string // the ground of everything
	Ink    string // text
	Faint  string // text of lesser weight, axes
	Rule   string // thin lines that guide the eye
	Warm   string // wants attention; always beside a word
	Water  string
	Land   string
	Hatch  string // lines of the hatching that means unknown, on Paper
	Accent string // the one teal of marks, bars

	least, most [3]float64 // ends of the ramp
}

// Light gives the palette like paper.
func Light() Palette {
	return Palette{Paper: Paper, Ink: Ink, Faint: Faint, Rule: Rule, Warm: Warm, Water: Water, Land: Land, Hatch: "#8a8576", Accent: "#0e5c5c",
		least: [3]float64{222, 236, 232}, most: [3]float64{8, 72, 72}}
}

// Dark gives the palette for dim rooms. Its ramp grows lighter, so that more stands out more here too.
func Dark() Palette {
	return Palette{Paper: "#1a201f", Ink: "#e9e5da", Faint: "#a5afab", Rule: "#3c4644", Warm: "#f0945a", Water: "#22363d", Land: "#272e2b", Hatch: "#77827e", Accent: "#62c4b9",
		least: [3]float64{38, 66, 64}, most: [3]float64{190, 240, 230}}
}

// Ramp gives a teal for a value from 0 to 1: one hue, ordered by lightness, so that it reads in grey too.
// More stands out more from Paper.
func (p Palette) Ramp(v float64) string {
	v = math.Max(0, math.Min(1, v))
	c := [3]int{}
	for i := range c {
		c[i] = int(math.Round(p.least[i] + float64((p.most[i]-p.least[i])*v)))
	}
	return fmt.Sprintf("#%02x%02x%02x", c[0], c[1], c[2])
}

// Ramp gives the teal of the light palette for a value from 0 to 1.
func Ramp(v float64) string { return Light().Ramp(v) }

// okabeIto is the published set of colours for categories that people with colour blindness tell apart
// (Okabe & Ito 2008); black, which is kept for text, is replaced by a grey.
var okabeIto = []string{"#0072b2", "#e69f00", "#009e73", "#cc79a7", "#56b4e9", "#d55e00", "#f0e442", "#999999"}

// Category gives the colour of the i-th category. Colours come again after eight, so a number or a word
// always goes with them.
func Category(i int) string { return okabeIto[i%len(okabeIto)] }

// linear undoes the gamma of a colour channel from 0 to 1 (WCAG 2.1).
func linear(c float64) float64 {
	if c <= 0.04045 {
		return c / 12.92
	}
	return math.Pow((c+0.055)/1.055, 2.4)
}

// Luminance gives the relative luminance of a "#rrggbb" colour, from 0 to 1, as WCAG 2.1 defines it.
func Luminance(colour string) float64 {
	if len(colour) != 7 {
		return 0
	}
	weight := [3]float64{0.2126, 0.7152, 0.0722}
	l := 0.0
	for i := range 3 {
		n, err := strconv.ParseUint(colour[1+2*i:3+2*i], 16, 8)
		if err != nil {
			return 0
		}
		l += weight[i] * linear(float64(n)/255)
	}
	return l
}

// Contrast gives the contrast ratio of two colours, from 1 to 21, as WCAG 2.1 defines it.
func Contrast(a, b string) float64 {
	x, y := Luminance(a), Luminance(b)
	return (max(x, y) + 0.05) / (min(x, y) + 0.05)
}

// TextOn gives the darker or the lighter text colour, whichever reads better on a ground.
func TextOn(ground string) string {
	if Contrast("#000000", ground) >= Contrast("#ffffff", ground) {
		return "#000000"
	}
	return "#ffffff"
}
