package draw

import (
	"fmt"
	"math"
)

// Colours of the light theme. Text on Paper has a contrast of at least 4.5:1.
const (
	Paper = "#fbf9f4"
	Ink   = "#26302f"
	Faint = "#5f6b69"
	Rule  = "#d9d4c7"
	Warm  = "#b4500f" // wants attention; always beside a word
	Water = "#cfe0e6"
	Land  = "#f1ece0"
)

// Ramp gives a teal from light to dark for a value from 0 to 1: one hue, ordered by lightness, so that
// it reads in grey too.
func Ramp(v float64) string {
	v = math.Max(0, math.Min(1, v))
	light := [3]float64{222, 236, 232}
	dark := [3]float64{8, 72, 72}
	c := [3]int{}
	for i := range c {
		c[i] = int(math.Round(light[i] + float64((dark[i]-light[i])*v)))
	}
	return fmt.Sprintf("#%02x%02x%02x", c[0], c[1], c[2])
}

// okabeIto is the published set of colours for categories that people with colour blindness tell apart
// (Okabe & Ito 2008); black, which is kept for text, is replaced by a grey.
var okabeIto = []string{"#0072b2", "#e69f00", "#009e73", "#cc79a7", "#56b4e9", "#d55e00", "#f0e442", "#999999"}

// linear undoes the gamma of a colour channel from 0 to 1 (WCAG 2.1).
func linear(c float64) float64 {
	if c <= 0.04045 {
		return c / 12.92
	}
	return math.Pow((c+0.055)/1.055, 2.4)
}

// Category gives the colour of the i-th category. Colours come again after eight, so a number or a word
// always goes with them.
func Category(i int) string { return okabeIto[i%len(okabeIto)] }
