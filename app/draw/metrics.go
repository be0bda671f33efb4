package draw

import "strconv"

// TextWidth estimates how wide a line of text is, on the wide side, from classes of letters of a plain
// sans-serif face. It serves to keep texts apart, not to set type.
func TextWidth(text string, size float64, bold bool) float64 {
	em := 0.0
	for _, r := range text {
		switch {
		case r == ' ' || r == 'i' || r == 'j' || r == 'l' || r == '\'' || r == '.' || r == ',' || r == ':' || r == ';' || r == '|' || r == 'I':
			em += 0.33
		case r == 'f' || r == 't' || r == 'r' || r == '(' || r == ')' || r == '-':
			em += 0.42
		case r == 'm' || r == 'w' || r == 'M' || r == 'W' || r == '%':
			em += 0.97
		case r >= 'A' && r <= 'Z':
			em += 0.73
		default:
			em += 0.63
		}
	}
	if bold {
		em *= 1.1
	}
	return em * size
}

// Box is a rectangle of a scene, from its upper left to its lower right.
type Box struct{ X0, Y0, X1, Y1 float64 }

// Meets reports whether two boxes share any ground.
func (b Box) Meets(o Box) bool { return b.X0 < o.X1 && o.X0 < b.X1 && b.Y0 < o.Y1 && o.Y0 < b.Y1 }

// Grown gives the box with a margin.
func (b Box) Grown(x, y float64) Box { return Box{b.X0 - x, b.Y0 - y, b.X1 + x, b.Y1 + y} }

// Box gives the room that a text takes.
func (t Text) Box() Box {
	w := TextWidth(t.Text, t.Size, t.Bold)
	x := t.At.X
	switch t.Anchor {
	case Middle:
		x -= w / 2
	case End:
		x -= w
	}
	return Box{x, t.At.Y - 0.78*t.Size, x + w, t.At.Y + 0.24*t.Size}
}

// Fit shortens a text with three dots until it is no wider than asked.
func Fit(text string, size float64, bold bool, width float64) string {
	if TextWidth(text, size, bold) <= width {
		return text
	}
	r := []rune(text)
	for len(r) > 0 && TextWidth(string(r)+"...", size, bold) > width {
		r = r[:len(r)-1]
	}
	return string(r) + "..."
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
