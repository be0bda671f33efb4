package mapview

import (
	"image"
	"slices"

	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/canvas"

	"groundtally/app/draw/tiles"
)

// tileLayer shows tiles of one level. Its objects are used again and again.
type tileLayer struct {
	box      *fyne.Container
	tiles    []*tileObject // shown
	free     []*tileObject
	complete bool // every tile of the view has a picture
}

type tileObject struct {
	key   tiles.Key
	image *canvas.Image
	shown *image.RGBA
}

// swap exchanges the objects' containers after the layers were exchanged, so that the front stays in
// front.
func (l *tileLayer) swap(other *tileLayer) {
	l.box.Objects, other.box.Objects = other.box.Objects, l.box.Objects
}

// clear hides all tiles.
func (l *tileLayer) clear() {
	for _, t := range l.tiles {
		t.image.Hide()
	}
	l.free = append(l.free, l.tiles...)
	l.tiles, l.complete = nil, false
}

// show shows the tiles with these keys.
func (l *tileLayer) show(p *tiles.Painter, keys []tiles.Key, lens lens) {
	wanted := make(map[tiles.Key]bool, len(keys))
	for _, k := range keys {
		wanted[k] = true
	}
	kept := make([]*tileObject, 0, len(keys))
	for _, t := range l.tiles {
		if wanted[t.key] {
			delete(wanted, t.key)
			kept = append(kept, t)
		} else {
			t.image.Hide()
			l.free = append(l.free, t)
		}
	}
	l.tiles = kept
	for _, k := range keys {
		if wanted[k] {
			l.tiles = append(l.tiles, l.take(k))
		}
	}
	l.complete = true
	for _, t := range l.tiles {
		if !t.update(p) {
			l.complete = false
			continue
		}
		t.place(lens)
		t.image.Show()
	}
}

// take gives an object for a key, still without a picture.
func (l *tileLayer) take(k tiles.Key) *tileObject {
	if n := len(l.free); n > 0 {
		t := l.free[n-1]
		l.free = l.free[:n-1]
		t.key, t.shown = k, nil
		return t
	}
	t := &tileObject{key: k, image: &canvas.Image{ScaleMode: canvas.ImageScaleFastest}}
	t.image.Hide()
	l.box.Objects = append(l.box.Objects, t.image)
	return t
}

// move keeps the tiles over their ground in a lens of another level.
func (l *tileLayer) move(p *tiles.Painter, lens lens) {
	for _, t := range l.tiles {
		if t.update(p) {
			t.place(lens)
		}
	}
}

// update gives the object its newest picture, and tells whether it has one.
func (t *tileObject) update(p *tiles.Painter) bool {
	if picture, _ := p.Picture(t.key); picture != nil && picture != t.shown {
		t.shown = picture
		t.image.Image = picture
		t.image.Refresh() // else the former texture stays
	}
	return t.shown != nil
}

// place puts the object over its ground.
func (t *tileObject) place(lens lens) {
	f := tiles.MPerPx(t.key.Level) / lens.mPerPx()
	r, view := t.key.Rect(), lens.rect()
	// Both edges are computed, so that neighbours that are stretched still meet.
	edge := func(at, from int) float32 { return float32((float64(at)*f - float64(from)) / lens.scale) }
	x0, y0 := edge(r.Min.X, view.Min.X), edge(r.Min.Y, view.Min.Y)
	t.image.Move(fyne.NewPos(x0, y0))
	t.image.Resize(fyne.NewSize(edge(r.Max.X, view.Min.X)-x0, edge(r.Max.Y, view.Min.Y)-y0))
}

func sameKeys(a, b []tiles.Key) bool {
	if len(a) != len(b) {
		return false
	}
	for _, k := range a {
		if !slices.Contains(b, k) {
			return false
		}
	}
	return true
}

func without(keys, others []tiles.Key) []tiles.Key {
	return slices.DeleteFunc(slices.Clone(keys), func(k tiles.Key) bool { return slices.Contains(others, k) })
}
