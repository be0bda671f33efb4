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
// (Okabe & Ito 2008), without black and yellow, which vanish on paper.
var okabeIto = []string{"#0072b2", "#d55e00", "#009e73", "#cc79a7", "#56b4e9", "#e69f00"}

// Category gives the colour of the i-th category.
func Category(i int) string { return okabeIto[i%len(okabeIto)] }
