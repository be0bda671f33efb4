package present

import (
	"math"
	"strconv"
	"strings"
	"unicode"
	"unicode/utf8"

	"groundtally/scoring"
)

// Figure writes a number with as many digits as its range bears: the last digit shown is worth about
// a tenth of the distance from low to high. Without a range three significant digits are shown, and a whole
// number below a thousand as it is.
func Figure(central, low, high float64) string {
	if central == 0 {
		return "0"
	}
	digits := 2 - int(math.Floor(math.Log10(math.Abs(central))))
	w := high - low
	if w == 0 && central == math.Trunc(central) && math.Abs(central) < 1000 {
		return group(central, 0) // a count
	}
	if w > 0 {
		digits = 1 - int(math.Floor(math.Log10(w)))
		if top := 3 - int(math.Floor(math.Log10(math.Abs(central)))); digits > top {
			digits = top
		}
	}
	return group(roundTo(central, digits), max(digits, 0))
}

func roundTo(x float64, digits int) float64 {
	p := math.Pow(10, float64(digits))
	if digits < 0 {
		p = math.Pow(10, float64(-digits))
		return math.Round(x/p) * p
	}
	return math.Round(x*p) / p
}

// group writes thousands apart with a narrow comma-free blank, so that 12 345 reads the same in every
// country.
func group(x float64, decimals int) string {
	s := strconv.FormatFloat(x, 'f', decimals, 64)
	if s == "-0" {
		s = "0"
	}
	sign := ""
	if strings.HasPrefix(s, "-") {
		sign, s = "-", s[1:]
	}
	whole, frac, dot := strings.Cut(s, ".")
	var b strings.Builder
	for i, r := range whole {
		if i > 0 && (len(whole)-i)%3 == 0 && len(whole) > 4 {
			b.WriteByte(' ')
		}
		b.WriteRune(r)
	}
	if dot {
		b.WriteByte('.')
		b.WriteString(frac)
	}
	return sign + b.String()
}

// Hectares writes an area. What is less than half a square metre is dust that rounding leaves where two outlines
// meet, and written as none.
func Hectares(x float64) string {
	if math.Abs(x) < 5e-5 {
		return "0"
	}
	return Figure(x, x, x)
}

// Unit writes a unit for people, with raised and lowered figures; a pure number has none.
func Unit(u string) string {
	switch u {
	case "1":
		return ""
	case "deg":
		return "°"
	}
	return signs.Replace(u)
}

var signs = strings.NewReplacer("m2", "m²", "m3", "m³", "CO2e", "CO₂e", "degC", "°C")

// UnitWords writes a unit for a column of units; a pure number says so.
func UnitWords(u string) string {
	if u == "1" {
		return "pure number"
	}
	return Unit(u)
}

// Cell writes a consequence in a few characters: its central value, or the state in its place.
func Cell(c scoring.Consequence) string {
	switch c.State {
	case scoring.Number:
		return Figure(c.Central, c.Low, c.High)
	case scoring.Class:
		return c.Why
	}
	return c.State.String()
}

// Value writes a consequence with its unit and its low to high, or the state in its place.
func Value(c scoring.Consequence) string {
	if c.State != scoring.Number {
		return Cell(c)
	}
	out := strings.TrimSpace(Cell(c) + " " + Unit(c.Unit))
	if c.Range != scoring.NoRange && c.Range != "" && c.Low != c.High {
		out += " (" + Figure(c.Low, c.Low, c.High) + " to " + Figure(c.High, c.Low, c.High) + ")"
	}
	return out
}

// Span writes low to high with the meaning of the range; empty when no range is stated.
func Span(c scoring.Consequence) string {
	if c.State != scoring.Number || c.Range == scoring.NoRange || c.Range == "" {
		return ""
	}
	return Figure(c.Low, c.Low, c.High) + " to " + Figure(c.High, c.Low, c.High) + " (" + RangeWords(c.Range) + ")"
}

// Upper begins a text with a capital.
func Upper(text string) string {
	r, n := utf8.DecodeRuneInString(text)
	if n == 0 {
		return ""
	}
	return string(unicode.ToUpper(r)) + text[n:]
}

// RangeWords says what a range means.
func RangeWords(r scoring.Range) string {
	switch r {
	case scoring.P10P90:
		return "P10 to P90 of the trials"
	case scoring.Bounds:
		return "bounds"
	case scoring.Corners:
		return "all inputs low to all inputs high"
	case scoring.LayerTolerance:
		return "position tolerance of the layers"
	}
	return "no uncertainty stated"
}

// Exact writes a number for redoing a sum by hand: six significant digits, thousands apart.
func Exact(x float64) string {
	a := math.Abs(x)
	if x == 0 {
		return "0"
	}
	if a < 1e-4 || a >= 1e15 {
		return strconv.FormatFloat(x, 'g', 6, 64)
	}
	decimals := 5 - int(math.Floor(math.Log10(a)))
	if decimals < 0 {
		p := math.Pow(10, float64(-decimals))
		x, decimals = math.Round(x/p)*p, 0
	}
	s := strconv.FormatFloat(x, 'f', decimals, 64)
	if strings.Contains(s, ".") {
		s = strings.TrimRight(strings.TrimRight(s, "0"), ".")
	}
	sign := ""
	if s[0] == '-' {
		sign, s = "-", s[1:]
	}
	whole, rest, dot := strings.Cut(s, ".")
	if len(whole) > 4 {
		var b strings.Builder
		for i, r := range whole {
			if i > 0 && (len(whole)-i)%3 == 0 {
				b.WriteByte(' ')
			}
			b.WriteRune(r)
		}
		whole = b.String()
	}
	if dot {
		whole += "." + rest
	}
	return sign + whole
}

// Signed writes a number with two decimals and its sign; what rounds to nothing has none.
func Signed(x float64) string {
	s := strconv.FormatFloat(x, 'f', 2, 64)
	switch {
	case s == "0.00" || s == "-0.00":
		return "0.00"
	case x > 0:
		return "+" + s
	}
	return s
}

// Rounded writes a number with so many decimals (rounded to tens and more for fewer than none), thousands
// apart.
func Rounded(x float64, decimals int) string {
	return group(roundTo(x, decimals), max(decimals, 0))
}
