package mapview

import (
	"image/color"
	"math"
	"strings"

	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/canvas"
	"fyne.io/fyne/v2/container"
	"fyne.io/fyne/v2/theme"

	"groundtally/app/draw/tiles"
	"groundtally/geo"
)

// haloAround are the places of the copies of a name in the colour of the paper, by which it can be read
// on any parcel.
var haloAround = []fyne.Position{{X: -1.2}, {X: 1.2}, {Y: -1.2}, {Y: 1.2}, {X: -0.9, Y: -0.9}, {X: 0.9, Y: 0.9}, {X: -0.9, Y: 0.9}, {X: 0.9, Y: -0.9}}

// mostNames bounds the names on the screen.
const mostNames = 60

// nameLayer shows place names. Which of them find room is decided once for each scale, for the whole
// district, so that names do not come and go while the map is moved.
type nameLayer struct {
	box    *fyne.Container
	ground *tiles.Ground
	look   tiles.Look
	labels []*nameLabel
	chosen []int // numbers of the names that found room
	level  int
	scale  float64
}

type nameLabel struct {
	halo []*canvas.Text
	text *canvas.Text
}

func newNameLayer() *nameLayer { return &nameLayer{box: container.NewWithoutLayout()} }

func (n *nameLayer) setGround(g *tiles.Ground) {
	n.ground, n.chosen, n.scale = g, nil, 0
	for _, l := range n.labels {
		l.hide()
	}
}

func (n *nameLayer) dress(look tiles.Look) {
	n.look = look
	for _, l := range n.labels {
		l.dress(look)
	}
}

func (l *nameLabel) hide() {
	for _, t := range append(l.halo, l.text) {
		t.Hide()
	}
}

func (l *nameLabel) dress(look tiles.Look) {
	l.text.Color = look.Ink
	l.text.Refresh()
	for _, t := range l.halo {
		t.Color = faded(look.Paper, 190)
		t.Refresh()
	}
}

// nameStyle gives the size and weight of a name by its rank.
func nameStyle(rank float64) (size float32, style fyne.TextStyle) {
	base := theme.Size(theme.SizeNameCaptionText)
	switch {
	case rank > 0 && rank <= 1:
		return base + 4, fyne.TextStyle{Bold: true}
	case rank > 0 && rank <= 2:
		return base + 1, fyne.TextStyle{Bold: true}
	}
	return base, fyne.TextStyle{}
}

// choose finds the names that have room at the lens's scale.
func (n *nameLayer) choose(l lens) {
	n.chosen, n.level, n.scale = n.chosen[:0], l.level, l.scale
	unitM := l.mPerPx() * l.scale
	taken := newRoom()
	for i, name := range n.ground.Names() {
		size, style := nameStyle(name.Rank)
		// Measuring the text of thousands of names would take too long.
		wide := float64(size) * 0.56 * float64(len([]rune(name.Text)))
		gapX, gapY := 24.0, 15.0
		if style.Bold {
			gapX, gapY = 6, 4
		}
		x, y := name.At.X/unitM, -name.At.Y/unitM
		if taken.take(x-wide/2-gapX, y-float64(size)*0.7-gapY, x+wide/2+gapX, y+float64(size)*0.7+gapY) {
			n.chosen = append(n.chosen, i)
		}
	}
}

// place shows the names in view.
func (n *nameLayer) place(l lens) {
	if n.ground == nil {
		return
	}
	if n.level != l.level || n.scale != l.scale {
		n.choose(l)
	}
	used := 0
	for _, i := range n.chosen {
		name := n.ground.Names()[i]
		at := l.to(name.At)
		if at.X < -120 || at.Y < -20 || at.X > l.size.Width+120 || at.Y > l.size.Height+20 || used == mostNames {
			continue
		}
		if used == len(n.labels) {
			n.labels = append(n.labels, n.newLabel())
		}
		n.labels[used].set(name.Text, name.Rank, at)
		used++
	}
	for _, label := range n.labels[used:] {
		label.hide()
	}
}

func (n *nameLayer) newLabel() *nameLabel {
	l := &nameLabel{text: &canvas.Text{Alignment: fyne.TextAlignCenter}}
	for range haloAround {
		t := &canvas.Text{Alignment: fyne.TextAlignCenter}
		l.halo = append(l.halo, t)
		n.box.Objects = append(n.box.Objects, t)
	}
	n.box.Objects = append(n.box.Objects, l.text)
	l.dress(n.look)
	return l
}

func (l *nameLabel) set(words string, rank float64, at fyne.Position) {
	size, style := nameStyle(rank)
	if l.text.Text != words || l.text.TextSize != size {
		for _, t := range append(l.halo, l.text) {
			t.Text, t.TextSize, t.TextStyle = words, size, style
			t.Resize(t.MinSize())
		}
	}
	min := l.text.Size()
	corner := at.SubtractXY(min.Width/2, min.Height/2)
	for i, t := range l.halo {
		t.Move(corner.Add(haloAround[i]))
		t.Show()
	}
	l.text.Move(corner)
	l.text.Show()
}

// room keeps boxes that do not overlap, in a grid of cells so that thousands are no burden.
type room struct{ cells map[[2]int][][4]float64 }

const roomCell = 96.0

func newRoom() *room { return &room{cells: map[[2]int][][4]float64{}} }

// take keeps a box if it overlaps none that was kept.
func (r *room) take(x0, y0, x1, y1 float64) bool {
	each := func(f func(cell [2]int) bool) bool {
		for cx := int(math.Floor(x0 / roomCell)); float64(cx)*roomCell < x1; cx++ {
			for cy := int(math.Floor(y0 / roomCell)); float64(cy)*roomCell < y1; cy++ {
				if !f([2]int{cx, cy}) {
					return false
				}
			}
		}
		return true
	}
	free := each(func(cell [2]int) bool {
		for _, b := range r.cells[cell] {
			if x0 < b[2] && b[0] < x1 && y0 < b[3] && b[1] < y1 {
				return false
			}
		}
		return true
	})
	if free {
		each(func(cell [2]int) bool {
			r.cells[cell] = append(r.cells[cell], [4]float64{x0, y0, x1, y1})
			return true
		})
	}
	return free
}

// badgeLayer shows the letters of the selected candidates.
type badgeLayer struct {
	box    *fyne.Container
	badges []*badge
}

type badge struct {
	at    geo.XY
	plate *canvas.Rectangle
	text  *canvas.Text
}

func newBadgeLayer() *badgeLayer { return &badgeLayer{box: container.NewWithoutLayout()} }

const badgeUnits = 20

func (b *badgeLayer) set(g *tiles.Ground, marks []tiles.Mark, look tiles.Look) {
	b.badges, b.box.Objects = nil, nil
	if g == nil {
		return
	}
	for _, mark := range marks {
		at, ok := markPlace(g, mark)
		if !ok || mark.Letter == "" {
			continue
		}
		one := &badge{at: at, plate: canvas.NewRectangle(look.Ink), text: canvas.NewText(mark.Letter, look.Paper)}
		one.plate.CornerRadius, one.plate.StrokeColor, one.plate.StrokeWidth = badgeUnits/2, look.Casing, 1.5
		one.text.TextStyle, one.text.TextSize, one.text.Alignment = fyne.TextStyle{Bold: true}, theme.Size(theme.SizeNameCaptionText)+1, fyne.TextAlignCenter
		wide := max(badgeUnits, one.text.MinSize().Width+10)
		one.plate.Resize(fyne.NewSize(wide, badgeUnits))
		one.text.Resize(one.text.MinSize())
		b.badges = append(b.badges, one)
		b.box.Objects = append(b.box.Objects, one.plate, one.text)
	}
}

// place puts the letters at their parcels, beside each other where parcels lie too close.
func (b *badgeLayer) place(l lens) {
	taken := newRoom()
	for _, one := range b.badges {
		at, size := l.to(one.at), one.plate.Size()
		for range len(b.badges) {
			if taken.take(float64(at.X), float64(at.Y), float64(at.X+size.Width+2), float64(at.Y+badgeUnits)) {
				break
			}
			at.X += size.Width + 3
		}
		corner := at.SubtractXY(size.Width/2, badgeUnits/2)
		one.plate.Move(corner)
		words := one.text.Size()
		one.text.Move(corner.AddXY((size.Width-words.Width)/2, (badgeUnits-words.Height)/2))
	}
}

// card is a small sheet with lines of words.
type card struct {
	box   *fyne.Container
	sheet *canvas.Rectangle
	lines []*canvas.Text
	look  tiles.Look
	size  fyne.Size
}

const mostLines = 6

func newCard(look tiles.Look) *card {
	c := &card{sheet: canvas.NewRectangle(nil), look: look}
	c.sheet.CornerRadius, c.sheet.StrokeWidth = 4, 1
	c.box = container.NewWithoutLayout(c.sheet)
	for i := range mostLines {
		t := &canvas.Text{TextStyle: fyne.TextStyle{Bold: i == 0}}
		c.lines = append(c.lines, t)
		c.box.Objects = append(c.box.Objects, t)
	}
	c.box.Hide()
	return c
}

func (c *card) dress(look tiles.Look) {
	c.look = look
	c.sheet.FillColor, c.sheet.StrokeColor = faded(look.Paper, 240), faded(look.Faint, 110)
	for i, t := range c.lines {
		t.Color = look.Ink
		if i > 0 {
			t.Color = look.Faint
		}
	}
	canvas.Refresh(c.sheet)
}

// setLines shows words line by line, the first in bold; none hides the card.
func (c *card) setLines(words string) {
	if words == "" {
		c.box.Hide()
		canvas.Refresh(c.sheet)
		return
	}
	given := strings.Split(words, "\n")
	size := theme.Size(theme.SizeNameCaptionText)
	wide, y := float32(0), float32(5)
	for i, t := range c.lines {
		if i >= len(given) {
			t.Hide()
			continue
		}
		t.Text, t.TextSize = given[i], size
		t.Resize(t.MinSize())
		t.Move(fyne.NewPos(8, y))
		t.Show()
		wide, y = max(wide, t.MinSize().Width), y+t.MinSize().Height
	}
	c.size = fyne.NewSize(wide+16, y+5)
	c.sheet.Resize(c.size)
	c.box.Resize(c.size)
	c.box.Show()
	canvas.Refresh(c.sheet)
}

// beside puts the card near a position, inside the map and not under the pointer.
func (c *card) beside(at fyne.Position, within fyne.Size) {
	p := at.AddXY(14, 16)
	if p.X+c.size.Width > within.Width-4 {
		p.X = at.X - 10 - c.size.Width
	}
	if p.Y+c.size.Height > within.Height-4 {
		p.Y = at.Y - 10 - c.size.Height
	}
	c.box.Move(fyne.NewPos(max(4, p.X), max(4, p.Y)))
	canvas.Refresh(c.sheet)
}

func faded(c color.NRGBA, opacity uint8) color.NRGBA {
	c.A = opacity
	return c
}
