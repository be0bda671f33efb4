package geotiff

import (
	"fmt"
	"math"
	"strings"

	"groundtally/geo"
)

// place reads where the cells lie.
func (f *file) place(h *header, _ Options) error {
	scale, err := f.floats(h.img, tagPixelScale, 3)
	if err != nil {
		return err
	}
	ties, err := f.floats(h.img, tagTiepoint, 12)
	if err != nil {
		return err
	}
	m, err := f.floats(h.img, tagMatrix, 16)
	if err != nil {
		return err
	}
	t := &h.Transform
	switch {
	case len(scale) >= 2 && scale[0] != 0 && scale[1] != 0 && len(ties) >= 6:
		if scale[0] < 0 || scale[1] < 0 {
			// By the standard a height below 0 puts south at the top; widespread programs take it as
			// above 0. Whichever is taken, some files come out upside down.
			h.refuse("mirrored", fmt.Sprintf("the cells are %g by %g, and programs do not agree on which way up sizes below 0 are", scale[0], scale[1]), "open it in another program, see that north is up, save it again")
			return nil
		}
		*t = [6]float64{ties[3] - ties[0]*scale[0], scale[0], 0, ties[4] + ties[1]*scale[1], 0, -scale[1]}
	case len(m) == 16:
		*t = [6]float64{m[3], m[0], m[1], m[7], m[4], m[5]}
	case len(ties) >= 12:
		h.refuse("control_points", "the grid is placed by control points", "warp it to an upright grid first")
		return nil
	default:
		h.refuse("no_place", "the file does not say where its cells lie", doPlace)
		return nil
	}
	point, err := f.cellsArePoints(h)
	if err != nil {
		return err
	}
	if point {
		t[0] -= (t[1] + t[2]) / 2
		t[3] -= (t[4] + t[5]) / 2
	}
	h.Placed = true
	minX, minY, maxX, maxY := h.Extent()
	if size := maxX - minX + maxY - minY; math.IsNaN(size) || math.IsInf(size, 0) || t[1]*t[5]-t[2]*t[4] == 0 {
		*t, h.Placed = [6]float64{}, false
		h.refuse("no_place", "the cells have no size or lie nowhere", doPlace)
		return nil
	}
	// A slant that moves no cell by a thousandth of itself is rounding.
	const slant = 1e-3
	switch {
	case math.Abs(t[2])*float64(h.Rows) > slant*math.Abs(t[1]) || math.Abs(t[4])*float64(h.Cols) > slant*math.Abs(t[5]):
		h.refuse("turned", "the rows of the grid do not run from west to east", "warp it to an upright grid first")
	case t[1] < 0:
		h.refuse("mirrored", "the columns of the grid run from east to west", "warp it to an upright grid first")
	case minX+t[1] == minX || minY+math.Abs(t[5]) == minY || maxX-t[1] == maxX || maxY-math.Abs(t[5]) == maxY:
		h.refuse("no_place", fmt.Sprintf("the cells of %g by %g are too small for their place", t[1], math.Abs(t[5])), doPlace)
	}
	return nil
}

// Keys of the reference system.
const (
	keyModel       = 1024
	keyRaster      = 1025
	keyCitation    = 1026
	keyGeographic  = 2048
	keyGeogText    = 2049
	keyProjected   = 3072
	keyProjText    = 3073
	keyLinearUnit  = 3076
	keyVertical    = 4096
	keyVertUnit    = 4099
	userDefined    = 32767
	modelProjected = 1
	modelGeog      = 2
)

const metre = "metre"

var units = map[uint64]struct {
	name string
	toM  float64
}{9001: {metre, 1}, 9002: {"foot", 0.3048}, 9003: {"US survey foot", 1200.0 / 3937}}

// verticalFeet gives the unit of the vertical systems of the EPSG dataset (10.076) that are in feet;
// files that state such a system often leave the key of the unit out.
var verticalFeet = map[uint64]uint64{
	5614: 9002, 6130: 9002, 6131: 9002, 6132: 9002, 8050: 9002, 8051: 9002, 8228: 9002,
	5702: 9003, 6358: 9003, 6359: 9003, 6360: 9003, 8052: 9003, 8053: 9003,
}

// unitByName knows the ways in which units are written beside the keys.
func unitByName(s string) (name string, toM float64) {
	switch strings.ToLower(s) {
	case "m", "metre", "meter", "metres", "meters":
		return metre, 1
	case "ft", "foot", "feet", "international foot":
		return "foot", units[9002].toM
	case "us survey foot", "us survey feet", "us-ft", "ftus", "us foot", "foot_us":
		return "US survey foot", units[9003].toM
	}
	return short(s), 0
}

// keys reads the numbers of the directory of keys. Texts and floating-point numbers are not among them.
func (f *file) keys(h *header) (numbers map[uint16]uint64, texts map[uint16][2]int, err error) {
	t, err := f.numbers(h.img, tagGeoKeys, math.MaxUint16)
	if err != nil || t.len() == 0 {
		return nil, nil, err
	}
	if t.len() < 4 || t.at(3)*4+4 > uint64(t.len()) {
		return nil, nil, fault("bad_header", fmt.Sprintf("tag %d", tagGeoKeys), "the keys of the reference system are cut short", doCopy)
	}
	numbers, texts = map[uint16]uint64{}, map[uint16][2]int{}
	for i := 4; i < 4+4*int(t.at(3)); i += 4 {
		key := uint16(t.at(i))
		switch t.at(i + 1) {
		case 0:
			numbers[key] = t.at(i + 3)
		case tagGeoTexts:
			texts[key] = [2]int{int(t.at(i + 3)), int(t.at(i + 2))}
		}
	}
	return numbers, texts, nil
}

// cellsArePoints reports whether places are those of the middle of cells.
func (f *file) cellsArePoints(h *header) (bool, error) {
	numbers, _, err := f.keys(h)
	return numbers[keyRaster] == 2, err
}

// epsg gives the code of a key, or "" where it is none or one of the file's own.
func epsg(n uint64) string {
	if n < 1024 || n >= userDefined {
		return ""
	}
	return fmt.Sprintf("EPSG:%d", n)
}

// geoKeys reads the reference system.
func (f *file) geoKeys(h *header, _ Options) error {
	numbers, texts, err := f.keys(h)
	if err != nil {
		return err
	}
	words, err := f.text(h.img, tagGeoTexts)
	if err != nil {
		return err
	}
	for _, key := range []uint16{keyProjText, keyCitation, keyGeogText} {
		at, ok := texts[key]
		if !ok || at[0] >= len(words) {
			continue
		}
		if s := short(strings.Trim(words[at[0]:min(len(words), at[0]+at[1])], "| ")); s != "" {
			h.Citation = s
			break
		}
	}
	projected, isProjected := numbers[keyProjected]
	geographic, isGeographic := numbers[keyGeographic]
	stated := isProjected || isGeographic
	switch model := numbers[keyModel]; {
	case model == modelProjected || model == 0 && isProjected:
		h.CRS = epsg(projected)
	case model == modelGeog || model == 0 && isGeographic:
		h.CRS = epsg(geographic)
	case model != 0:
		stated = true
	}
	if h.CRS == "" {
		if stated || h.Citation != "" {
			h.note("crs_user_defined", geo.Warning, "citation", h.Citation)
		} else {
			h.note("crs_not_stated", geo.Warning)
		}
	}
	if n, ok := numbers[keyLinearUnit]; ok {
		if u, known := units[n]; known {
			h.HorizontalUnit = u.name
		} else {
			h.HorizontalUnit = fmt.Sprintf("unit %d", n)
		}
		if h.HorizontalUnit != metre {
			h.note("horizontal_unit", geo.Info, "unit", h.HorizontalUnit)
		}
	}
	h.VerticalCRS = epsg(numbers[keyVertical])
	unit := numbers[keyVertUnit]
	if unit == 0 {
		unit = verticalFeet[numbers[keyVertical]]
	}
	if u, known := units[unit]; known {
		h.VerticalUnit, h.VerticalToM = u.name, u.toM
	} else if unit != 0 {
		h.VerticalUnit = fmt.Sprintf("unit %d", unit)
	}
	return nil
}
