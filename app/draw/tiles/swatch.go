package tiles

import (
	"image"
	"image/color"
	"image/draw"

	"groundtally/geo"
)

// Sample is what a legend's swatch shows.
type Sample uint8

// The samples. Coloured is a parcel of a given colour.
const (
	Coloured Sample = iota
	UnknownParcel
	OverLimit
	BareParcel
	MainRoad
	PowerLine
	Substation
	Dwelling
	Turbine
	Route
	BuildableArea
	SetbackLine
)

// Swatch draws a sample of the map for its legend, with the same pens as the map.
func Swatch(sample Sample, c color.NRGBA, width, height int, style Style) *image.RGBA {
	rect := image.Rect(0, 0, width, height)
	w, h := float64(width), float64(height)
	line := func(kind geo.Kind, at ...geo.XY) geo.XYGeometry {
		return geo.XYGeometry{Kind: kind, Parts: [][][]geo.XY{{at}}}
	}
	// One metre a pixel, y to the south.
	at := func(x, y float64) geo.XY { return geo.XY{X: x, Y: -y} }
	level := line(geo.Lines, at(0, h/2), at(w, h/2))
	if sample >= Turbine {
		m := &Placed{corners: geo.EmptyExtent()}
		switch sample {
		case Turbine:
			m.shapes = []placed{{as: markTurbine, shape: line(geo.Points, at(w/2, h/2+1))}}
		case Route:
			m.shapes = []placed{{as: markRoute, shape: level}}
		case BuildableArea:
			box := line(geo.Polygons, at(2, 2), at(w-2, 2), at(w-2, h-2), at(2, h-2), at(2, 2))
			m.shapes = []placed{{as: markBuildable, shape: box}}
		case SetbackLine:
			m.shapes = []placed{{as: markSetback, shape: level}}
		}
		for i := range m.shapes {
			m.shapes[i].box = geo.ExtentOf(m.shapes[i].shape)
		}
		t := &Tile{rect: rect, uniform: underLand}
		return t.Shade(NewPalette(Shading{}, 0, style), m.Draw(0, rect, style), nil)
	}
	p := newPen(rect, 1)
	defer p.done()
	d := drawing{p: p, style: style, look: style.Look, k: style.ratio()}
	t := &Tile{rect: rect, uniform: underLand, overlay: p.overlay}
	switch sample {
	case MainRoad:
		p.stroke(level, 2*d.k)
		p.paint(inkOf(d.look.Road))
	case PowerLine:
		p.stroke(level, 1.4*d.k, 6*d.k, 3*d.k, 1.5*d.k, 3*d.k)
		p.paint(inkOf(d.look.Power))
	case Substation:
		p.station(geo.XY{X: w / 2, Y: h / 2}, d.look, d.k)
	case Dwelling:
		for _, dx := range []float64{-5, 0, 5} {
			p.box(geo.XY{X: w/2 + dx*d.k, Y: h / 2}, max(2, int(2*d.k+0.5)))
		}
		p.paint(inkOf(d.look.Dwelling))
	default:
		return parcelSwatch(sample, c, rect, style)
	}
	return t.Shade(NewPalette(Shading{}, 0, style), nil, nil)
}

// parcelSwatch draws one parcel that fills the swatch.
func parcelSwatch(sample Sample, c color.NRGBA, rect image.Rectangle, style Style) *image.RGBA {
	n := rect.Dx() * rect.Dy()
	t := &Tile{rect: rect, uniform: underLand, parcel: make([]uint32, n), edge: make([]uint8, n)}
	warm := int(2*style.ratio() + 0.5)
	for i := range n {
		x, y := i%rect.Dx(), i/rect.Dx()
		t.parcel[i] = 1
		if x < warm || y < warm || x >= rect.Dx()-warm || y >= rect.Dy()-warm {
			t.edge[i] = 255
		}
	}
	s := Shading{Class: []uint8{Bare}, Colours: []color.NRGBA{c}, Over: []bool{sample == OverLimit}}
	switch sample {
	case Coloured:
		s.Class[0] = 0
	case UnknownParcel:
		s.Class[0] = Unknown
	}
	img := t.Shade(NewPalette(s, 1, style), nil, nil)
	if sample == BareParcel {
		frame(img, style)
	}
	return img
}

// frame draws a thin line around a swatch that would be lost on paper.
func frame(img *image.RGBA, style Style) {
	c := image.NewUniform(style.Look.Area)
	b := img.Bounds()
	for _, side := range []image.Rectangle{
		image.Rect(b.Min.X, b.Min.Y, b.Max.X, b.Min.Y+1), image.Rect(b.Min.X, b.Max.Y-1, b.Max.X, b.Max.Y),
		image.Rect(b.Min.X, b.Min.Y, b.Min.X+1, b.Max.Y), image.Rect(b.Max.X-1, b.Min.Y, b.Max.X, b.Max.Y),
	} {
		draw.Draw(img, side, c, image.Point{}, draw.Src)
	}
}
