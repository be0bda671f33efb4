package tiles

import "image/color"

// Look is a set of colours for the map. The ramp of the parcels is no part of it: it comes with the
// Shading.
type Look struct {
	Paper    color.NRGBA // cards and halos, under text
	Outside  color.NRGBA // beyond the district, where there is one: sea or other ground
	Land     color.NRGBA // ground without parcels
	Bare     color.NRGBA // parcels without any candidate
	Coast    color.NRGBA // the district's edge
	Water    color.NRGBA
	Shore    color.NRGBA // rivers and the edge of water
	Road     color.NRGBA // edges of main roads, and lesser roads
	RoadFill color.NRGBA
	Power    color.NRGBA // power lines and substations
	Dwelling color.NRGBA
	Border   color.NRGBA // between parcels
	Area     color.NRGBA // outlines of any other area or line
	Warm     color.NRGBA // outline of parcels over a limit
	Hatch    color.NRGBA // lines that mean unknown
	Ink      color.NRGBA // text, outlines of what is selected
	Faint    color.NRGBA // text of lesser weight
	Casing   color.NRGBA // under outlines and signs, so that they show on light and dark parcels
	Shadow   color.NRGBA // on slopes that fall from the light, at their darkest as opaque as it is
	Light    color.NRGBA // on slopes that fall towards it
}

// LightLook gives colours like paper.
func LightLook() Look {
	return Look{
		Paper: hex(0xfbf9f4), Outside: hex(0xdae5e6), Land: hex(0xf1ece0), Bare: hex(0xf8f4ea), Coast: hex(0x8d8574),
		Water: hex(0xcfe0e6), Shore: hex(0x7fa6b5), Road: hex(0x8d8574), RoadFill: hex(0xf3eee3), Power: hex(0x4b3f72),
		Dwelling: hex(0x5b4f45), Border: hex(0xf3eee2), Area: hex(0x77705f), Warm: hex(0xb4500f), Hatch: hex(0x8a8576),
		Ink: hex(0x26302f), Faint: hex(0x5f6b69), Casing: hex(0xffffff),
		Shadow: faded(0x4f4636, 60), Light: faded(0xffffff, 120),
	}
}

// DarkLook gives colours for dim rooms.
func DarkLook() Look {
	return Look{
		Paper: hex(0x1a201f), Outside: hex(0x1d2a2f), Land: hex(0x2b322f), Bare: hex(0x232927), Coast: hex(0x6d7570),
		Water: hex(0x22363d), Shore: hex(0x54808f), Road: hex(0x8f8b7e), RoadFill: hex(0x343a36), Power: hex(0xb9aee0),
		Dwelling: hex(0xd8c8ae), Border: hex(0x1c2220), Area: hex(0x9a9788), Warm: hex(0xf0945a), Hatch: hex(0x77827e),
		Ink: hex(0xe9e5da), Faint: hex(0xa5afab), Casing: hex(0x10140f),
		Shadow: faded(0x000000, 96), Light: faded(0xd9e2da, 40),
	}
}

func hex(v uint32) color.NRGBA {
	return color.NRGBA{R: uint8(v >> 16), G: uint8(v >> 8), B: uint8(v), A: 255}
}

func faded(v uint32, alpha uint8) color.NRGBA {
	c := hex(v)
	c.A = alpha
	return c
}

func opaque(c color.NRGBA) color.NRGBA {
	c.A = 255
	return c
}

// Style says how a ground is drawn.
type Style struct {
	Look       Look
	PixelRatio float64   // pixels per unit of line width, the screen's scale; 0 is 1
	Hidden     []string  // roles that are left out
	Relief     *Relief   // of the same ground, under all that is drawn; nil is none
	Backdrop   *Backdrop // of the same ground, under all that is drawn and in place of the relief; nil is none
}

func (s Style) ratio() float64 {
	if s.PixelRatio <= 0 {
		return 1
	}
	return s.PixelRatio
}

// ink is a colour of a pixel, red in the lowest byte, multiplied by its opacity in the highest.
type ink uint32

func inkOf(c color.NRGBA) ink {
	full := ink(c.R) | ink(c.G)<<8 | ink(c.B)<<16 | 255<<24
	return full.part(part(c.A))
}

// part gives a coverage of 0 to 255 as a share of 0 to 256.
func part(cover uint8) uint32 { return uint32(cover) + uint32(cover>>7) }

// part gives the colour covering share/256 of its pixel.
func (c ink) part(share uint32) ink {
	low := (uint32(c) & 0x00ff00ff * share >> 8) & 0x00ff00ff
	high := (uint32(c) >> 8 & 0x00ff00ff * share) & 0xff00ff00
	return ink(low | high)
}

// over gives c laid over under.
func (c ink) over(under ink) ink {
	if c>>24 == 255 {
		return c
	}
	return c + under.part(256-part(uint8(c>>24)))
}
