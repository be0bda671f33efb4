package draw

import (
	"strings"
	"sync"
	"unicode"

	"golang.org/x/image/font"
	"golang.org/x/image/font/sfnt"
	"golang.org/x/image/math/fixed"

	"groundtally/assets/fonts"
)

// glyph is the room of one letter, in parts of the size of the text.
type glyph struct {
	advanceEm float64
	topEm     float64 // above the base line
	bottomEm  float64 // below the base line
	has       bool    // the face has the letter
}

// commonRunes are measured at once, so that looking them up takes no lock: Latin, Greek, Cyrillic.
const commonRunes = 0x530

// face is one weight of the shipped typeface, measured.
type face struct {
	font   *sfnt.Font
	common [commonRunes]glyph
	others sync.Map // rune to glyph
	widen  float64  // of the estimate for letters that are not there
}

// faces gives the regular and the bold weight. The files are part of the program, so a fault in them is a
// fault of the build.
var faces = sync.OnceValue(func() [2]*face {
	return [2]*face{newFace(fonts.Regular(), 1), newFace(fonts.Bold(), 1.1)}
})

func newFace(ttf []byte, widen float64) *face {
	f, err := sfnt.Parse(ttf)
	if err != nil {
		panic("the shipped typeface cannot be read: " + err.Error())
	}
	out := &face{font: f, widen: widen}
	var b sfnt.Buffer
	for r := range rune(commonRunes) {
		out.common[r] = out.measure(&b, r)
	}
	return out
}

// measure reads the room of a letter at one pixel for each unit of the face, where nothing is rounded.
func (f *face) measure(b *sfnt.Buffer, r rune) glyph {
	units := f.font.UnitsPerEm()
	em := func(x fixed.Int26_6) float64 { return float64(x) / 64 / float64(units) }
	if i, err := f.font.GlyphIndex(b, r); err == nil && i != 0 {
		bounds, advance, err := f.font.GlyphBounds(b, i, fixed.I(int(units)), font.HintingNone)
		if err == nil {
			return glyph{advanceEm: em(advance), topEm: em(-bounds.Min.Y), bottomEm: em(bounds.Max.Y), has: true}
		}
	}
	// Another face steps in; which one is not known, so the estimate is on the wide side.
	switch {
	case unicode.IsControl(r):
		return glyph{}
	case unicode.Is(unicode.Mn, r):
		return glyph{advanceEm: 0.35 * f.widen, topEm: 1, bottomEm: 0.3}
	case r >= 0x1100:
		return glyph{advanceEm: 1.1 * f.widen, topEm: 0.95, bottomEm: 0.25}
	}
	return glyph{advanceEm: 0.85 * f.widen, topEm: 0.95, bottomEm: 0.25}
}

func (f *face) glyph(r rune) glyph {
	if r >= 0 && r < commonRunes {
		return f.common[r]
	}
	if g, ok := f.others.Load(r); ok {
		return g.(glyph)
	}
	var b sfnt.Buffer
	g := f.measure(&b, r)
	f.others.Store(r, g)
	return g
}

func faceOf(bold bool) *face {
	if bold {
		return faces()[1]
	}
	return faces()[0]
}

// TextWidth gives how wide a line of text is in the shipped typeface: the sum of the advances of its
// letters, without kerning. A letter that the typeface lacks counts with a generous estimate. It may be
// called from several goroutines.
func TextWidth(text string, size float64, bold bool) float64 {
	f := faceOf(bold)
	em := 0.0
	for _, r := range text {
		em += f.glyph(r).advanceEm
	}
	return em * size
}

// HasLetters reports whether the shipped typeface has every letter of a text, so that its width is known
// and not estimated.
func HasLetters(text string) bool {
	f := faceOf(false)
	for _, r := range text {
		if !f.glyph(r).has {
			return false
		}
	}
	return true
}

// Box is a rectangle of a scene, from its upper left to its lower right.
type Box struct{ X0, Y0, X1, Y1 float64 }

// Meets reports whether two boxes share any ground.
func (b Box) Meets(o Box) bool { return b.X0 < o.X1 && o.X0 < b.X1 && b.Y0 < o.Y1 && o.Y0 < b.Y1 }

// Grown gives the box with a margin.
func (b Box) Grown(x, y float64) Box { return Box{b.X0 - x, b.Y0 - y, b.X1 + x, b.Y1 + y} }

// The room above and below the base line that every text keeps, whatever its letters, so that lines of
// text stand evenly; in parts of its size.
const (
	ascentEm  = 0.78
	descentEm = 0.24
)

// Box gives the room that a text takes.
func (t Text) Box() Box {
	f := faceOf(t.Bold)
	width, top, bottom := 0.0, ascentEm, descentEm
	for _, r := range t.Text {
		g := f.glyph(r)
		width += g.advanceEm
		top, bottom = max(top, g.topEm), max(bottom, g.bottomEm)
	}
	width *= t.Size
	x := t.At.X
	switch t.Anchor {
	case Middle:
		x -= width / 2
	case End:
		x -= width
	}
	return Box{x, t.At.Y - top*t.Size, x + width, t.At.Y + bottom*t.Size}
}

const dots = "..."

// Fit shortens a text with three dots until it is no wider than asked. Where not even the dots have room
// the dots alone are given.
func Fit(text string, size float64, bold bool, width float64) string {
	if TextWidth(text, size, bold) <= width {
		return text
	}
	f := faceOf(bold)
	left := width - TextWidth(dots, size, bold)
	end := 0
	for i, r := range text {
		if left -= f.glyph(r).advanceEm * size; left < 0 {
			break
		}
		end = i + len(string(r))
	}
	return strings.TrimRight(text[:min(end, len(text))], " ") + dots
}

// Lines breaks a text at its blanks into lines no wider than asked, at most as many as told; what does
// not fit is shortened with three dots.
func Lines(text string, size float64, bold bool, width float64, most int) []string {
	var out []string
	line := ""
	words := strings.Fields(text)
	for i, w := range words {
		longer := w
		if line != "" {
			longer = line + " " + w
		}
		if line == "" || TextWidth(longer, size, bold) <= width {
			line = longer
			continue
		}
		if len(out) == most-1 {
			line = strings.Join(append([]string{line}, words[i:]...), " ")
			break
		}
		out, line = append(out, line), w
	}
	if line != "" {
		out = append(out, line)
	}
	for i := range out {
		out[i] = Fit(out[i], size, bold, width)
	}
	return out
}
