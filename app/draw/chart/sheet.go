package chart

import (
	"math"

	"groundtally/app/draw"
)

// Narrowest is the least width that the charts are made for, in units of the scene; a lesser one is taken
// as this. RangeBar alone goes below.
const Narrowest = 320

const (
	pad   = 12.0
	body  = 12.0 // size of most text
	small = 10.5 // size of axes, remarks
	gap   = 8.0  // least distance between texts in a line
)

// sheet is a scene that is being drawn.
type sheet struct {
	*draw.Scene
	p draw.Palette
}

func newSheet(width float64, title, id string, p draw.Palette) *sheet {
	return &sheet{Scene: &draw.Scene{Width: math.Max(width, Narrowest), Title: title, ID: id}, p: p}
}

// done sets the height, which follows from the content, and lays the ground under everything.
func (s *sheet) done(height float64) *draw.Scene {
	s.Height = math.Ceil(height)
	ground := draw.Path{Rings: [][]draw.Point{{{X: 0, Y: 0}, {X: s.Width, Y: 0}, {X: s.Width, Y: s.Height}, {X: 0, Y: s.Height}}}, Closed: true, Style: draw.Style{Fill: s.p.Paper}}
	s.Items = append([]any{ground}, s.Items...)
	return s.Scene
}

// nothing is the picture where there is nothing to draw.
func (s *sheet) nothing(words string) *draw.Scene {
	s.write(pad, 24, draw.Fit(words, body, false, s.Width-2*pad), body, s.p.Faint, draw.Start)
	return s.done(40)
}

func (s *sheet) write(x, y float64, text string, size float64, colour string, anchor draw.Anchor) {
	s.Text(draw.Text{At: draw.Point{X: x, Y: y}, Text: text, Size: size, Colour: colour, Anchor: anchor})
}

func (s *sheet) bold(x, y float64, text string, size float64, colour string, anchor draw.Anchor) {
	s.Text(draw.Text{At: draw.Point{X: x, Y: y}, Text: text, Size: size, Colour: colour, Anchor: anchor, Bold: true})
}

func (s *sheet) line(colour string, width, x0, y0, x1, y1 float64) {
	s.Line(draw.Style{Stroke: colour, Width: width}, draw.Point{X: x0, Y: y0}, draw.Point{X: x1, Y: y1})
}

// hover lays an unseen box over a row, so that the whole row answers to the pointer. It comes before the
// marks of the row, which stand above it.
func (s *sheet) hover(y, height float64, item, title string) {
	if item != "" {
		s.Bar(0, y, s.Width, height, draw.Style{}, item, title)
	}
}

// centred writes the title of an axis in as many lines as it needs, at most two, around x; it gives the
// height used.
func (s *sheet) centred(x, y, room float64, text string) float64 {
	lines := draw.Lines(text, small, false, room, 2)
	for i, l := range lines {
		half := draw.TextWidth(l, small, false) / 2
		at := math.Max(pad+half, math.Min(x, s.Width-pad-half))
		s.write(at, y+lineHeight*float64(i), l, small, s.p.Faint, draw.Middle)
	}
	return lineHeight * float64(len(lines))
}

// column gives where the bars begin beside a column of names: as wide as the longest name needs, within
// shares of the picture.
func (s *sheet) column(longest, least, most float64) float64 {
	return math.Round(math.Max(least*s.Width, math.Min(pad+longest+2*gap, most*s.Width)))
}

const lineHeight = 14.0

// unknown is how a thing that the data do not give is painted.
func (s *sheet) unknown() draw.Style { return draw.Style{Hatch: true, Stroke: s.p.Faint, Width: 1} }

// piece is a text with its colour, one of several in a line.
type piece struct {
	text, colour string
	bold         bool
}

func (p piece) width() float64 { return draw.TextWidth(p.text, small, p.bold) }

// flow writes pieces one after the other, in a new line where one has no room, and gives the number of
// lines. A piece wider than a whole line is shortened.
func (s *sheet) flow(x, y, room float64, pieces []piece) int {
	lines, at := 1, 0.0
	for _, p := range pieces {
		if p.text == "" {
			continue
		}
		p.text = draw.Fit(p.text, small, p.bold, room)
		if w := p.width(); at > 0 && at+w > room {
			lines, at = lines+1, 0
		}
		s.Text(draw.Text{At: draw.Point{X: x + at, Y: y + lineHeight*float64(lines-1)}, Text: p.text, Size: small, Colour: p.colour, Bold: p.bold})
		at += p.width() + gap
	}
	return lines
}

// key is one entry of a legend.
type key struct {
	style   draw.Style
	line    bool         // a line rather than a patch
	dot     bool         // a round mark rather than a patch
	diamond bool         // a mark of four corners rather than a patch
	mark    []draw.Point // a mark of this outline around its middle rather than a patch
	text    string
}

const keyWidth = 26.0 // patch with the blank beside it

// legend writes the entries one after the other, in a new line where one has no room, and gives the height
// used.
func (s *sheet) legend(y float64, keys []key) float64 {
	const row = 20.0
	room := s.Width - 2*pad
	at, lines := 0.0, 1
	for _, k := range keys {
		text := draw.Fit(k.text, small, false, room-keyWidth)
		w := keyWidth + draw.TextWidth(text, small, false)
		if at > 0 && at+w > room {
			at, lines = 0, lines+1
		}
		x, mid := pad+at, y+row*float64(lines-1)+8
		switch {
		case k.line:
			s.Line(k.style, draw.Point{X: x, Y: mid}, draw.Point{X: x + 18, Y: mid})
		case k.dot:
			s.Path(draw.Path{Rings: [][]draw.Point{ringAround(draw.Point{X: x + 9, Y: mid}, dotRadius)}, Closed: true, Style: k.style})
		case k.diamond:
			s.Path(draw.Path{Rings: [][]draw.Point{diamond(draw.Point{X: x + 9, Y: mid}, 5.5)}, Closed: true, Style: k.style})
		case len(k.mark) > 0:
			s.Path(draw.Path{Rings: [][]draw.Point{moved(k.mark, draw.Point{X: x + 9, Y: mid}, 1)}, Closed: true, Style: k.style})
		default:
			s.Rect(x, mid-6, 18, 12, k.style, "")
		}
		s.write(x+keyWidth, mid+3.8, text, small, s.p.Ink, draw.Start)
		at += w + 2*gap
	}
	return row * float64(lines)
}

// moved gives an outline around 0 as one around a place, so many times as large.
func moved(outline []draw.Point, c draw.Point, times float64) []draw.Point {
	out := make([]draw.Point, len(outline))
	for i, q := range outline {
		out[i] = draw.Point{X: c.X + times*q.X, Y: c.Y + times*q.Y}
	}
	return out
}

// circle is a round mark of radius 1.
var circle = func() (out [14]draw.Point) {
	for i := range out {
		sin, cos := math.Sincos(2 * math.Pi * float64(i) / float64(len(out)))
		out[i] = draw.Point{X: cos, Y: sin}
	}
	return out
}()

func ringAround(c draw.Point, r float64) []draw.Point {
	out := make([]draw.Point, len(circle))
	for i, q := range circle {
		out[i] = draw.Point{X: c.X + r*q.X, Y: c.Y + r*q.Y}
	}
	return out
}
