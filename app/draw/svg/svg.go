package svg

import (
	"bytes"
	"fmt"
	"html"
	"math"
	"strconv"
	"strings"

	"groundtally/app/draw"
)

// Write gives the scene as an svg element that needs nothing from outside. The same scene gives the same
// bytes. It is made for paper: hatching and the edge around names have the colours of the light palette.
func Write(s *draw.Scene) []byte {
	var b bytes.Buffer
	fmt.Fprintf(&b, `<svg xmlns="http://www.w3.org/2000/svg" viewBox="0 0 %s %s" role="img" aria-label="%s" font-family="Lato, sans-serif" font-kerning="none">`, num(s.Width), num(s.Height), html.EscapeString(clean(s.Title)))
	hatch := "unknown" + html.EscapeString(s.ID)
	for _, it := range s.Items {
		if p, ok := it.(draw.Path); ok && p.Style.Hatch {
			hatching(&b, hatch)
			break
		}
	}
	for _, it := range s.Items {
		switch v := it.(type) {
		case draw.Path:
			path(&b, v, hatch)
		case draw.Text:
			text(&b, v)
		}
	}
	b.WriteString("</svg>")
	return b.Bytes()
}

func hatching(b *bytes.Buffer, id string) {
	fmt.Fprintf(b, `<defs><pattern id="%s" width="6" height="6" patternUnits="userSpaceOnUse" patternTransform="rotate(45)"><rect width="6" height="6" fill="%s"/><line x1="3" y1="0" x2="3" y2="6" stroke="%s" stroke-width="1.1"/></pattern></defs>`, id, draw.Paper, draw.Light().Hatch)
}

func path(b *bytes.Buffer, p draw.Path, hatch string) {
	b.WriteString(`<path d="`)
	for _, ring := range p.Rings {
		last := ""
		for i, q := range ring {
			at := num(q.X) + " " + num(q.Y)
			switch {
			case i == 0:
				b.WriteString("M" + at)
			case at != last:
				b.WriteString("L" + at)
			}
			last = at
		}
		if p.Closed {
			b.WriteByte('Z')
		}
	}
	b.WriteByte('"')
	fill := "none"
	if p.Style.Hatch {
		fill = "url(#" + hatch + ")"
	} else if p.Style.Fill != "" {
		fill = p.Style.Fill
	}
	fmt.Fprintf(b, ` fill="%s" fill-rule="evenodd"`, fill)
	if p.Style.Stroke != "" {
		fmt.Fprintf(b, ` stroke="%s" stroke-width="%s" stroke-linejoin="round"`, p.Style.Stroke, num(p.Style.Width))
		if p.Style.Dash != "" {
			fmt.Fprintf(b, ` stroke-dasharray="%s"`, p.Style.Dash)
		}
	}
	if p.Title != "" {
		if fill == "none" && p.Closed { // an open shape answers to the pointer all over its inside
			b.WriteString(` pointer-events="all"`)
		}
		fmt.Fprintf(b, `><title>%s</title></path>`, html.EscapeString(clean(p.Title)))
		return
	}
	b.WriteString("/>")
}

func text(b *bytes.Buffer, t draw.Text) {
	weight := ""
	if t.Bold {
		weight = ` font-weight="700"`
	}
	halo := ""
	if t.Halo {
		halo = fmt.Sprintf(` paint-order="stroke" stroke="%s" stroke-width="3" stroke-linejoin="round"`, draw.Paper)
	}
	words := strings.Join(strings.Fields(clean(t.Text)), " ") // as a reader of SVG does with blanks
	length := ""
	if words != "" && draw.HasLetters(words) {
		// Where the shipped face is not installed another steps in; it is set as wide as the scene reckons with.
		length = fmt.Sprintf(` textLength="%s" lengthAdjust="spacingAndGlyphs"`, num(draw.TextWidth(words, t.Size, t.Bold)))
	}
	fmt.Fprintf(b, `<text x="%s" y="%s" font-size="%s" fill="%s" text-anchor="%s"%s%s%s>%s</text>`, num(t.At.X), num(t.At.Y), num(t.Size), t.Colour, t.Anchor, weight, halo, length, html.EscapeString(words))
}

// clean takes out what XML does not allow in a text.
func clean(s string) string {
	return strings.Map(func(r rune) rune {
		if r < 0x20 && r != '\t' && r != '\n' && r != '\r' || r == 0xfffe || r == 0xffff {
			return -1
		}
		return r
	}, strings.ToValidUTF8(s, "\ufffd"))
}

// num writes a tenth of a unit at most, which no eye can tell from more.
func num(x float64) string {
	x = math.Round(x*10) / 10
	if x == 0 {
		x = 0 // no minus zero
	}
	return strconv.FormatFloat(x, 'f', -1, 64)
}
