package worldfile

import (
	"fmt"
	"io"
	"math"
	"strconv"
	"strings"

	"groundtally/geo/formats"
)

// World places the pixels of a picture, in the units of a reference system that the file does not name.
// C, F is the middle of the upper left pixel; A, D lead from a pixel to the next in its row, B, E to the
// next in its column.
type World struct{ A, D, B, E, C, F float64 }

// maxBytes is far above what six numbers take.
const maxBytes = 4096

const doWorld = "a world file has six lines with a number each: export it again with the picture"

// Decode reads a world file. A decimal comma is taken.
func Decode(r io.Reader) (World, error) {
	b, err := io.ReadAll(io.LimitReader(r, maxBytes+1))
	if err != nil {
		return World{}, &formats.Error{Code: "unreadable", What: "the world file cannot be read", Err: err}
	}
	words := strings.Fields(strings.TrimPrefix(string(b), "\ufeff"))
	if len(b) > maxBytes || len(words) != 6 {
		return World{}, &formats.Error{Code: "not_a_world_file", What: fmt.Sprintf("there are %d words, not 6 numbers", len(words)), Do: doWorld}
	}
	var v [6]float64
	for i, s := range words {
		n, err := strconv.ParseFloat(strings.Replace(s, ",", ".", 1), 64)
		if err != nil || math.IsNaN(n) || math.IsInf(n, 0) || strings.ContainsAny(s, "_xXpP") {
			return World{}, &formats.Error{Where: fmt.Sprintf("number %d", i+1), Code: "not_a_number", What: fmt.Sprintf("%.40q is not a number", s), Do: doWorld}
		}
		v[i] = n
	}
	w := World{A: v[0], D: v[1], B: v[2], E: v[3], C: v[4], F: v[5]}
	if d := w.A*w.E - w.B*w.D; d == 0 || math.IsInf(d, 0) || math.IsNaN(d) {
		return World{}, &formats.Error{Code: "no_size", What: "the pixels have no size", Do: doWorld}
	}
	return w, nil
}

// At gives the place of a point of the picture, counted in pixels from its upper left corner to the
// right and down: whole numbers are corners of pixels, halves their middles.
func (w World) At(col, row float64) (x, y float64) {
	col, row = col-0.5, row-0.5
	return w.A*col + w.B*row + w.C, w.D*col + w.E*row + w.F
}

// Pixel gives the point of the picture at a place; it is the inverse of At.
func (w World) Pixel(x, y float64) (col, row float64) {
	d := w.A*w.E - w.B*w.D
	x, y = x-w.C, y-w.F
	return (w.E*x-w.B*y)/d + 0.5, (w.A*y-w.D*x)/d + 0.5
}

// Upright reports whether rows run from west to east and columns from north to south. A slant that moves
// a point by less than a thousandth of a pixel over 100,000 pixels is rounding.
func (w World) Upright() bool {
	const slant = 1e-8
	return w.A > 0 && w.E < 0 && math.Abs(w.B) <= slant*w.A && math.Abs(w.D) <= slant*-w.E
}

// Names gives the names that a world file beside a picture may have, the usual one first: map.pgw,
// map.pngw, map.wld for map.png. It is empty for a name without an ending.
func Names(picture string) []string {
	dot := strings.LastIndexByte(picture, '.')
	if dot < 0 || strings.ContainsAny(picture[dot:], `/\`) || len(picture)-dot < 3 {
		return nil
	}
	stem, end := picture[:dot+1], picture[dot+1:]
	w, wld := "w", "wld"
	if strings.ToUpper(end) == end {
		w, wld = "W", "WLD"
	}
	return []string{stem + end[:1] + end[len(end)-1:] + w, stem + end + w, stem + wld}
}
