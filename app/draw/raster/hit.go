package raster

import (
	"math"

	"groundtally/app/draw"
)

// reach is how far from a line the pointer may be and still mean it, in units of the scene.
const reach = 3

// Hit gives the item and the title of the topmost shape at a place of a scene, among those that have one
// of them. A closed shape is hit anywhere inside, its holes excepted, whether it is filled or not; a line
// from close by.
func Hit(s *draw.Scene, x, y float64) (item, title string) {
	at := draw.Point{X: x, Y: y}
	for i := len(s.Items) - 1; i >= 0; i-- {
		p, ok := s.Items[i].(draw.Path)
		if !ok || p.Item == "" && p.Title == "" {
			continue
		}
		if p.Closed && contains(p.Rings, at) || !p.Closed && near(p, at) {
			return p.Item, p.Title
		}
	}
	return "", ""
}

// contains holds a place against rings by the even-odd rule.
func contains(rings [][]draw.Point, at draw.Point) bool {
	in := false
	for _, r := range rings {
		for i := range r {
			a, b := r[i], r[(i+1)%len(r)]
			if (a.Y > at.Y) != (b.Y > at.Y) && at.X < a.X+(b.X-a.X)*(at.Y-a.Y)/(b.Y-a.Y) {
				in = !in
			}
		}
	}
	return in
}

func near(p draw.Path, at draw.Point) bool {
	far := math.Max(reach, p.Style.Width/2)
	for _, r := range p.Rings {
		for i := 1; i < len(r); i++ {
			a, b := r[i-1], r[i]
			dx, dy := b.X-a.X, b.Y-a.Y
			t := 0.0
			if l := dx*dx + dy*dy; l > 0 {
				t = math.Max(0, math.Min(1, ((at.X-a.X)*dx+(at.Y-a.Y)*dy)/l))
			}
			if math.Hypot(at.X-a.X-t*dx, at.Y-a.Y-t*dy) <= far {
				return true
			}
		}
	}
	return false
}
