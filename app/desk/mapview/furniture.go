package mapview

import (
	"fmt"
	"image/color"
	"math"
	"strconv"

	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/canvas"
	"fyne.io/fyne/v2/container"
	"fyne.io/fyne/v2/theme"
	"fyne.io/fyne/v2/widget"

	"groundtally/app/draw"
	"groundtally/app/draw/tiles"
	"groundtally/geo"
)

const (
	edgeUnits    = 10 // from the map's edge to what lies on the glass
	longestScale = 110
	creditLines  = 3 // at most, of those who must be named
)

// furniture is what lies on the glass: scale bar, north, buttons, the pointer's place, the legend.
type furniture struct {
	box      *fyne.Container
	sheet    *canvas.Rectangle // under scale bar and place
	bar      []*canvas.Line
	length   *canvas.Text
	where    *canvas.Text
	north    *canvas.Rectangle
	arrow    []*canvas.Line
	letter   *canvas.Text
	buttons  []*widget.Button
	legend   *legend
	barUnits float32
	credit   string // who must be named for the backdrop; empty for none
	named    []*canvas.Text
	ground   *canvas.Rectangle // under those names
}

func newFurniture(m *Map) *furniture {
	f := &furniture{
		sheet: canvas.NewRectangle(nil), length: &canvas.Text{}, where: &canvas.Text{},
		north: canvas.NewRectangle(nil), letter: &canvas.Text{Text: "N", TextStyle: fyne.TextStyle{Bold: true}},
		legend: newLegend(), barUnits: longestScale, ground: canvas.NewRectangle(nil),
	}
	f.sheet.CornerRadius, f.north.CornerRadius, f.ground.CornerRadius = 4, 4, 4
	f.box = container.NewWithoutLayout(f.sheet, f.north, f.length, f.where, f.letter, f.ground)
	for range creditLines {
		f.named = append(f.named, &canvas.Text{})
		f.box.Objects = append(f.box.Objects, f.named[len(f.named)-1])
	}
	for range 3 {
		bar, arrow := &canvas.Line{StrokeWidth: 1.5}, &canvas.Line{StrokeWidth: 1.5}
		f.bar, f.arrow = append(f.bar, bar), append(f.arrow, arrow)
		f.box.Objects = append(f.box.Objects, bar, arrow)
	}
	f.buttons = []*widget.Button{
		widget.NewButtonWithIcon("", theme.ZoomInIcon(), func() { m.zoom(-levelsPerKey, m.middle()) }),
		widget.NewButtonWithIcon("", theme.ZoomOutIcon(), func() { m.zoom(levelsPerKey, m.middle()) }),
		widget.NewButtonWithIcon("", theme.ZoomFitIcon(), m.FitAll),
	}
	for _, b := range f.buttons {
		f.box.Objects = append(f.box.Objects, b)
	}
	f.box.Objects = append(f.box.Objects, f.legend.box)
	return f
}

func (f *furniture) dress(style tiles.Style) {
	look := style.Look
	f.sheet.FillColor, f.north.FillColor, f.ground.FillColor = faded(look.Paper, 225), faded(look.Paper, 225), faded(look.Paper, 225)
	for _, l := range append(append([]*canvas.Line(nil), f.bar...), f.arrow...) {
		l.StrokeColor = look.Ink
		canvas.Refresh(l)
	}
	for _, t := range append([]*canvas.Text{f.length, f.where, f.letter}, f.named...) {
		t.Color, t.TextSize = look.Ink, theme.Size(theme.SizeNameCaptionText)
		t.Refresh()
	}
	f.sheet.Refresh()
	f.north.Refresh()
	f.ground.Refresh()
	f.legend.dress(style)
}

// place makes the scale bar fit the lens; the scale is that of the middle of the map.
func (f *furniture) place(l lens) {
	m, words := scaleLength(l.mPerPx() * l.scale * longestScale)
	units := float32(m / (l.mPerPx() * l.scale))
	if words == f.length.Text && units == f.barUnits {
		return
	}
	f.length.Text, f.barUnits = words, units
	f.length.Refresh()
	f.arrange(l.size)
}

// scaleLength gives the longest of the lengths 1, 2, 5, 10 … that is no longer than most, in metres and
// in words.
func scaleLength(mostM float64) (metres float64, words string) {
	if !(mostM > 0) {
		return 0, ""
	}
	unit := math.Pow(10, math.Floor(math.Log10(mostM)))
	metres = unit
	for _, k := range []float64{2, 5} {
		if k*unit <= mostM {
			metres = k * unit
		}
	}
	if metres >= 1000 {
		return metres, strconv.FormatFloat(metres/1000, 'f', -1, 64) + " km"
	}
	return metres, strconv.FormatFloat(math.Round(metres*1000)/1000, 'f', -1, 64) + " m"
}

// placeWords gives a position as words, to about a tenth of what a finger's breadth of map shows.
func placeWords(p geo.LonLat, mPerUnit float64) string {
	digits := 4
	if mPerUnit > 20 {
		digits = 3
	}
	side := func(v float64, positive, negative string) string {
		if v < 0 {
			positive = negative
		}
		return fmt.Sprintf("%.*f %s", digits, math.Abs(v), positive)
	}
	return side(p.Lat, "N", "S") + " " + side(p.Lon, "E", "W")
}

// setPlace shows the pointer's place, and tells whether the room it takes has changed.
func (f *furniture) setPlace(words string) bool {
	if f.where.Text == words {
		return false
	}
	before := len(f.where.Text)
	f.where.Text = words
	f.where.Refresh()
	return before != len(words)
}

// arrange puts everything where it belongs on a map of this size.
func (f *furniture) arrange(size fyne.Size) {
	// North and the buttons, upper right.
	words := f.letter.MinSize()
	wide := f.buttons[0].MinSize().Width
	x, y := size.Width-edgeUnits-wide, float32(edgeUnits)
	f.north.Move(fyne.NewPos(x, y))
	f.north.Resize(fyne.NewSize(wide, 20+words.Height))
	mid := x + wide/2
	for i, end := range []fyne.Position{{X: mid, Y: y + 20}, {X: mid - 5, Y: y + 11}, {X: mid + 5, Y: y + 11}} {
		f.arrow[i].Position1, f.arrow[i].Position2 = fyne.NewPos(mid, y+5), end
	}
	f.letter.Resize(words)
	f.letter.Move(fyne.NewPos(mid-words.Width/2, y+18))
	y += 20 + words.Height + 8
	for _, b := range f.buttons {
		b.Resize(b.MinSize())
		b.Move(fyne.NewPos(x, y))
		y += b.MinSize().Height + 4
	}
	f.arrangeCredit(x - 2*edgeUnits)
	// Scale and place, lower right.
	length, where := f.length.MinSize(), f.where.MinSize()
	if f.where.Text == "" {
		where.Width = 0
	}
	sheet := fyne.NewSize(max(f.barUnits, length.Width, where.Width)+16, length.Height+where.Height+14)
	corner := fyne.NewPos(size.Width-edgeUnits-sheet.Width, size.Height-edgeUnits-sheet.Height)
	f.sheet.Move(corner)
	f.sheet.Resize(sheet)
	right := corner.X + sheet.Width - 8
	f.length.Resize(length)
	f.length.Move(fyne.NewPos(right-f.barUnits/2-length.Width/2, corner.Y+2))
	base := corner.Y + length.Height + 6
	for i, ends := range [][2]fyne.Position{
		{{X: right - f.barUnits, Y: base}, {X: right, Y: base}},
		{{X: right - f.barUnits, Y: base - 4}, {X: right - f.barUnits, Y: base}},
		{{X: right, Y: base - 4}, {X: right, Y: base}},
	} {
		f.bar[i].Position1, f.bar[i].Position2 = ends[0], ends[1]
		canvas.Refresh(f.bar[i])
	}
	f.where.Resize(where)
	f.where.Move(fyne.NewPos(right-where.Width, base+4))
	f.legend.arrange(size, size.Width-3*edgeUnits-max(sheet.Width, 150))
}

// setCredit names those to whom the backdrop belongs, in the upper left corner.
func (f *furniture) setCredit(credit string) { f.credit = credit }

// arrangeCredit writes the names in as many lines as they need, at most creditLines.
func (f *furniture) arrangeCredit(room float32) {
	size := theme.Size(theme.SizeNameCaptionText)
	var lines []string
	if f.credit != "" && room > 60 {
		lines = draw.Lines(f.credit, float64(size), false, float64(room-16), creditLines)
	}
	wide, high := float32(0), float32(0)
	for i, t := range f.named {
		t.Text = ""
		if i < len(lines) {
			t.Text = lines[i]
			t.Resize(t.MinSize())
			t.Move(fyne.NewPos(edgeUnits+8, edgeUnits+3+high))
			wide, high = max(wide, t.MinSize().Width), high+t.MinSize().Height
		}
		t.Refresh()
	}
	if len(lines) == 0 {
		f.ground.Hide()
		return
	}
	f.ground.Move(fyne.NewPos(edgeUnits, edgeUnits))
	f.ground.Resize(fyne.NewSize(wide+16, high+6))
	f.ground.Show()
}

// covers tells whether something lies on the map at a position, so that a click is not meant for the
// ground under it.
func (f *furniture) covers(at fyne.Position) bool {
	for _, o := range []fyne.CanvasObject{f.sheet, f.north, f.ground, f.legend.box} {
		p, s := o.Position(), o.Size()
		if o.Visible() && at.X >= p.X && at.Y >= p.Y && at.X < p.X+s.Width && at.Y < p.Y+s.Height {
			return true
		}
	}
	return false
}

// LegendEntry is one line of the legend.
type LegendEntry struct {
	Text   string
	Sample tiles.Sample
	Colour color.NRGBA // of tiles.Coloured
}

// legend is the card at the lower left.
type legend struct {
	box      *fyne.Container
	sheet    *canvas.Rectangle
	title    *canvas.Text
	words    []string // in full; what is shown may be shortened
	heading  string
	entries  []LegendEntry
	swatches []*canvas.Image
	texts    []*canvas.Text
}

const (
	swatchWide, swatchHigh = 22, 14
	legendRow              = 18
)

func newLegend() *legend {
	g := &legend{sheet: canvas.NewRectangle(nil), title: &canvas.Text{TextStyle: fyne.TextStyle{Bold: true}}}
	g.sheet.CornerRadius, g.sheet.StrokeWidth = 4, 1
	g.box = container.NewWithoutLayout(g.sheet, g.title)
	g.box.Hide()
	return g
}

func (g *legend) set(title string, entries []LegendEntry, style tiles.Style) {
	g.heading, g.entries = title, entries
	g.swatches, g.texts, g.words = nil, nil, nil
	g.box.Objects = []fyne.CanvasObject{g.sheet, g.title}
	for _, e := range entries {
		image, text := &canvas.Image{ScaleMode: canvas.ImageScaleFastest}, &canvas.Text{Text: e.Text}
		g.swatches, g.texts, g.words = append(g.swatches, image), append(g.texts, text), append(g.words, e.Text)
		g.box.Objects = append(g.box.Objects, image, text)
	}
	g.dress(style)
}

func (g *legend) dress(style tiles.Style) {
	look := style.Look
	ratio := style.PixelRatio
	g.sheet.FillColor, g.sheet.StrokeColor = faded(look.Paper, 240), faded(look.Faint, 70)
	g.sheet.Refresh()
	size := theme.Size(theme.SizeNameCaptionText)
	for _, t := range append([]*canvas.Text{g.title}, g.texts...) {
		t.Color, t.TextSize = look.Ink, size
		t.Refresh()
	}
	for i, s := range g.swatches {
		e := g.entries[i]
		s.Image = tiles.Swatch(e.Sample, e.Colour, int(swatchWide*ratio+0.5), int(swatchHigh*ratio+0.5), style)
		s.Refresh()
	}
}

// arrange puts the card at the lower left, in as many columns as the height demands and no wider than
// given.
func (g *legend) arrange(size fyne.Size, widest float32) {
	if g.heading == "" || len(g.entries) == 0 || widest < 60 {
		g.box.Hide()
		return
	}
	title := g.title.TextSize + 10
	rows := max(1, min(len(g.entries), int((size.Height*0.66-title-14)/legendRow)))
	columns := (len(g.entries) + rows - 1) / rows
	rows = (len(g.entries) + columns - 1) / columns
	room := (widest-10)/float32(columns) - swatchWide - 18
	x, wide := float32(10), float32(0)
	for i, t := range g.texts {
		if i > 0 && i%rows == 0 {
			x, wide = x+swatchWide+18+wide, 0
		}
		shorten(t, g.words[i], room)
		y := title + float32(i%rows)*legendRow
		g.swatches[i].Move(fyne.NewPos(x, y+(legendRow-swatchHigh)/2))
		g.swatches[i].Resize(fyne.NewSize(swatchWide, swatchHigh))
		t.Resize(t.MinSize())
		t.Move(fyne.NewPos(x+swatchWide+8, y+(legendRow-t.MinSize().Height)/2))
		wide = max(wide, t.MinSize().Width)
	}
	shorten(g.title, g.heading, widest-20)
	g.title.Resize(g.title.MinSize())
	g.title.Move(fyne.NewPos(10, 5))
	card := fyne.NewSize(max(x+swatchWide+18+wide, g.title.MinSize().Width+20), title+float32(rows)*legendRow+6)
	g.sheet.Resize(card)
	g.box.Resize(card)
	g.box.Move(fyne.NewPos(edgeUnits, size.Height-edgeUnits-card.Height))
	g.box.Show()
	canvas.Refresh(g.sheet)
}

// room gives the room that the card takes of the corner; none while it is hidden.
func (g *legend) room() fyne.Size {
	if !g.box.Visible() {
		return fyne.Size{}
	}
	return g.sheet.Size().AddWidthHeight(edgeUnits, edgeUnits)
}

// shorten cuts words that are too long for their room.
func shorten(t *canvas.Text, words string, room float32) {
	t.Text = words
	for runes := []rune(words); len(runes) > 1 && t.MinSize().Width > room; {
		runes = runes[:len(runes)-1]
		t.Text = string(runes) + "…"
	}
	t.Refresh()
}
