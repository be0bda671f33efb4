package gen

import (
	"image"
	"image/color"
	"math"

	"groundtally/geo"
)

// Picture draws the island as a map, for people who change the generator and want to see what they did.
// One pixel is mPerPixel metres; the window is centred on a point of the plane given in metres.
func Picture(seed uint64, centreX, centreY float64, widthPx, heightPx int, mPerPixel float64) (image.Image, error) {
	s, err := makeIsle(seed)
	if err != nil {
		return nil, err
	}
	c := &canvas{img: image.NewRGBA(image.Rect(0, 0, widthPx, heightPx)), m: mPerPixel,
		x0: centreX - mPerPixel*float64(widthPx)/2, y1: centreY + mPerPixel*float64(heightPx)/2}
	g := s.land
	use := map[string]color.RGBA{"arable": {226, 210, 150, 255}, "pasture": {172, 203, 130, 255}, "meadow": {150, 205, 150, 255},
		"wood": {92, 140, 84, 255}, "moor": {176, 160, 128, 255}, "rough grazing": {196, 196, 140, 255}, "built up": {226, 200, 190, 255}, "garden": {200, 214, 160, 255}}
	fill := newSegments(200) // parcels by bucket of their extent
	boxes := make([]geo.Extent, len(s.parcels))
	for i, p := range s.parcels {
		boxes[i] = geo.EmptyExtent()
		for _, q := range p.ring {
			boxes[i] = boxes[i].Add(q)
		}
		fill.add(geo.XY{X: boxes[i].MinX, Y: boxes[i].MinY}, geo.XY{X: boxes[i].MaxX, Y: boxes[i].MaxY}, i)
	}
	for y := range heightPx {
		for x := range widthPx {
			p := c.back(x, y)
			col := color.RGBA{176, 204, 226, 255}
			if inRing(p, g.shore) {
				col = color.RGBA{205, 205, 165, 255}
				if d, _ := lineNearest(p, duneLine); d < 600 {
					col = color.RGBA{238, 226, 180, 255}
				}
				for _, k := range fill.near(geo.Extent{MinX: p.X, MinY: p.Y, MaxX: p.X, MaxY: p.Y}) {
					i := fill.tag[k]
					if b := boxes[i]; p.X >= b.MinX && p.X <= b.MaxX && p.Y >= b.MinY && p.Y <= b.MaxY && inRing(p, s.parcels[i].ring) {
						col = use[s.parcels[i].use]
						break
					}
				}
				sl := geo.XY{X: g.ground(geo.XY{X: p.X + 25, Y: p.Y}) - g.ground(geo.XY{X: p.X - 25, Y: p.Y}), Y: g.ground(geo.XY{X: p.X, Y: p.Y + 25}) - g.ground(geo.XY{X: p.X, Y: p.Y - 25})}
				f := clamp(1+(sl.X-sl.Y)/50*1.1, 0.55, 1.25)
				col = color.RGBA{uint8(math.Min(255, float64(col.R)*f)), uint8(math.Min(255, float64(col.G)*f)), uint8(math.Min(255, float64(col.B)*f)), 255}
			}
			for _, l := range g.lakes {
				if inRing(p, l.ring) {
					col = color.RGBA{120, 170, 215, 255}
				}
			}
			c.img.SetRGBA(x, y, col)
		}
	}
	for _, p := range s.parcels {
		c.line(append(append([]geo.XY(nil), p.ring...), p.ring[0]), color.RGBA{110, 105, 80, 255}, 0)
	}
	c.line(append(append([]geo.XY(nil), g.shore...), g.shore[0]), color.RGBA{60, 80, 100, 255}, 0)
	for _, w := range g.streams {
		c.line(w.line, color.RGBA{60, 120, 200, 255}, int(w.widthM/6/mPerPixel*4))
	}
	look := map[string]color.RGBA{"main": {190, 30, 20, 255}, "lane": {250, 248, 235, 255}, "street": {245, 240, 225, 255}, "track": {120, 90, 50, 255}}
	for _, class := range []string{"track", "street", "lane", "main"} {
		for _, w := range s.roads {
			if w.class == class {
				c.line(w.line, look[class], 0)
				if class == "main" {
					c.line(w.line, look[class], 1)
				}
			}
		}
	}
	for _, l := range ringLegs {
		c.line(l.way, color.RGBA{120, 40, 140, 255}, 0)
	}
	for _, p := range []geo.XY{southStation, northStation} {
		c.dot(p, color.RGBA{120, 40, 140, 255}, 3)
	}
	for _, d := range s.dwellings {
		col := color.RGBA{60, 40, 40, 255}
		if d.class == "not lived in" {
			col = color.RGBA{130, 110, 90, 255}
		}
		c.dot(d.at, col, int(6/mPerPixel))
	}
	return c.img, nil
}

type canvas struct {
	img       *image.RGBA
	x0, y1, m float64
}

func (c *canvas) back(x, y int) geo.XY {
	return geo.XY{X: c.x0 + c.m*(float64(x)+0.5), Y: c.y1 - c.m*(float64(y)+0.5)}
}

func (c *canvas) dot(p geo.XY, col color.RGBA, r int) {
	x, y := int((p.X-c.x0)/c.m), int((c.y1-p.Y)/c.m)
	for a := -r; a <= r; a++ {
		for b := -r; b <= r; b++ {
			if (image.Point{X: x + a, Y: y + b}).In(c.img.Rect) {
				c.img.SetRGBA(x+a, y+b, col)
			}
		}
	}
}

func (c *canvas) line(l []geo.XY, col color.RGBA, r int) {
	for i := 1; i < len(l); i++ {
		n := int(l[i-1].Dist(l[i])/c.m*1.5) + 1
		for k := 0; k <= n; k++ {
			c.dot(along(l[i-1], l[i], float64(k)/float64(n)), col, r)
		}
	}
}
