package mapview

import (
	"image"
	"math"

	"fyne.io/fyne/v2"

	"groundtally/app/draw/tiles"
	"groundtally/geo"
)

// View says what part of the ground is shown.
type View struct {
	Centre   geo.LonLat
	MPerUnit float64 // metres per unit of the toolkit's lengths, which is a pixel on an ordinary screen
}

// lens turns places of the widget into places of the plane and back. Pixels are those of the screen.
type lens struct {
	centre geo.XY
	level  int
	size   fyne.Size
	scale  float64 // pixels per unit
}

func (l lens) mPerPx() float64 { return tiles.MPerPx(l.level) }

// rect gives the pixels of the level that are in view. Its corner is a whole pixel, so that tiles lie
// on the screen's pixels and stay sharp.
func (l lens) rect() image.Rectangle {
	m := l.mPerPx()
	w, h := float64(l.size.Width)*l.scale, float64(l.size.Height)*l.scale
	x, y := int(math.Round(l.centre.X/m-w/2)), int(math.Round(-l.centre.Y/m-h/2))
	return image.Rect(x, y, x+int(math.Ceil(w)), y+int(math.Ceil(h)))
}

// to gives where a place of the plane is in the widget.
func (l lens) to(p geo.XY) fyne.Position {
	m, r := l.mPerPx(), l.rect()
	return fyne.NewPos(float32((p.X/m-float64(r.Min.X))/l.scale), float32((-p.Y/m-float64(r.Min.Y))/l.scale))
}

// from gives the place of the plane at a position of the widget.
func (l lens) from(p fyne.Position) geo.XY {
	m, r := l.mPerPx(), l.rect()
	return geo.XY{X: (float64(r.Min.X) + float64(p.X)*l.scale) * m, Y: -(float64(r.Min.Y) + float64(p.Y)*l.scale) * m}
}

// zoomed gives the lens at another level with the same place under a position.
func (l lens) zoomed(level int, keep fyne.Position) lens {
	at := l.from(keep)
	l.level = level
	m := l.mPerPx()
	l.centre = geo.XY{
		X: at.X + (float64(l.size.Width)/2-float64(keep.X))*l.scale*m,
		Y: at.Y - (float64(l.size.Height)/2-float64(keep.Y))*l.scale*m,
	}
	return l
}

// levelFor gives the closest level at which so many metres per pixel are shown, or more.
func levelFor(mPerPx float64) int {
	if !(mPerPx > 0) {
		return tiles.MinLevel
	}
	return max(tiles.MinLevel, min(tiles.MaxLevel, int(math.Ceil(4*math.Log2(mPerPx)-1e-9))))
}

// insets is the room that is kept free along the edges, in units.
type insets struct{ left, top, right, bottom float64 }

// fitted gives the lens that shows an extent whole, clear of the insets, and how many metres a unit would
// have if every scale could be had.
func (l lens) fitted(e geo.Extent, free insets) (lens, float64) {
	if e.Empty() || l.size.Width <= 0 || l.size.Height <= 0 {
		return l, math.Inf(1)
	}
	w := math.Max(20, float64(l.size.Width)-free.left-free.right)
	h := math.Max(20, float64(l.size.Height)-free.top-free.bottom)
	exact := math.Max((e.MaxX-e.MinX)/w, (e.MaxY-e.MinY)/h)
	l.level = levelFor(exact / l.scale)
	mPerUnit := l.mPerPx() * l.scale
	l.centre = e.Centre()
	l.centre.X -= (free.left - free.right) / 2 * mPerUnit
	l.centre.Y += (free.top - free.bottom) / 2 * mPerUnit
	return l, exact
}

// fittedBeside fits clear of a card in the lower left corner, if that costs little, else under it.
func (l lens) fittedBeside(e geo.Extent, card fyne.Size) lens {
	const margin, worth = 18, 0.72
	best, whole := l.fitted(e, insets{margin, margin, margin, margin})
	if card.IsZero() {
		return best
	}
	limit := whole / worth
	for _, free := range []insets{
		{margin + float64(card.Width), margin, margin, margin},
		{margin, margin, margin, margin + float64(card.Height)},
	} {
		if one, exact := l.fitted(e, free); exact < limit {
			best, limit = one, exact
		}
	}
	return best
}

// stripUnits of the district stay in view however far the map is moved.
const stripUnits = 60

// limited keeps the lens where there is something to see.
func (l lens) limited(e geo.Extent) lens {
	if e.Empty() {
		return l
	}
	widest := levelFor(math.Max(e.MaxX-e.MinX, e.MaxY-e.MinY) / 120 / l.scale)
	l.level = max(tiles.MinLevel, min(l.level, widest))
	mPerUnit := l.mPerPx() * l.scale
	x := math.Max(0, float64(l.size.Width)/2-stripUnits) * mPerUnit
	y := math.Max(0, float64(l.size.Height)/2-stripUnits) * mPerUnit
	l.centre.X = math.Max(e.MinX-x, math.Min(e.MaxX+x, l.centre.X))
	l.centre.Y = math.Max(e.MinY-y, math.Min(e.MaxY+y, l.centre.Y))
	return l
}
