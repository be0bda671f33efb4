package accounts

import (
	"image/color"
	"strconv"
	"strings"

	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/canvas"
	"fyne.io/fyne/v2/container"
	toolkit "fyne.io/fyne/v2/theme"
	"fyne.io/fyne/v2/widget"

	"groundtally/app/desk/core"
	"groundtally/app/desk/widgets"
	"groundtally/app/draw"
	"groundtally/app/present"
	"groundtally/app/run"
	"groundtally/scoring"
	"groundtally/scoring/criteria"
)

// grid is the table of candidates. Up and down move the chosen row, space adds or takes out, left and right
// move over the columns, return sorts by the one that is marked, m opens
// its menu.
type grid struct {
	widget.Table
	core *core.Core

	list    *listed // nil before the first answer
	keys    []string
	chosen  map[int32]int // candidate to its place among the chosen
	look    string
	palette draw.Palette
	held    fyne.KeyModifier
	column  int // marked by the keyboard
	atRow   int // row that the keyboard moves from
	focused bool
	frame   *canvas.Rectangle
	empty   *widgets.Line

	onSort  func(key string)
	onShade func(key string)
	onHide  func(key string)
	onPick  func(id string, add bool)
}

func newGrid(c *core.Core) *grid {
	g := &grid{core: c, chosen: map[int32]int{}, frame: canvas.NewRectangle(color.Transparent), empty: widgets.Faint("No candidate passes the filter.").Wide()}
	g.empty.Hide()
	g.Length = func() (int, int) {
		if g.list == nil {
			return 0, 1 + len(g.keys)
		}
		return len(g.list.rows), 1 + len(g.keys)
	}
	g.CreateCell = func() fyne.CanvasObject { return newCell(g) }
	g.UpdateCell = func(id widget.TableCellID, o fyne.CanvasObject) { o.(*cell).show(id, g.content(id)) }
	g.ShowHeaderRow, g.StickyColumnCount = true, 1
	g.CreateHeader = func() fyne.CanvasObject { return newHeader(g) }
	g.UpdateHeader = func(id widget.TableCellID, o fyne.CanvasObject) { o.(*header).show(id.Col, g.heading(id.Col)) }
	g.ExtendBaseWidget(g)
	g.SetColumnWidth(0, nameWidth)
	g.frame.StrokeWidth = 2
	g.frame.Hide()
	return g
}

// object gives the table as it is put into the pane, with the frame that shows where the keyboard is.
func (g *grid) object() fyne.CanvasObject {
	return container.NewStack(container.NewThemeOverride(g, tight{}), container.NewCenter(g.empty), g.frame)
}

// tight is the window's theme with less room between the cells of a table.
type tight struct{}

func (tight) Color(n fyne.ThemeColorName, v fyne.ThemeVariant) color.Color {
	switch n {
	case toolkit.ColorNameSelection, toolkit.ColorNameHover: // rows are tinted by their cells
		return color.Transparent
	}
	return fyne.CurrentApp().Settings().Theme().Color(n, v)
}
func (tight) Font(s fyne.TextStyle) fyne.Resource {
	return fyne.CurrentApp().Settings().Theme().Font(s)
}
func (tight) Icon(n fyne.ThemeIconName) fyne.Resource {
	return fyne.CurrentApp().Settings().Theme().Icon(n)
}
func (tight) Size(n fyne.ThemeSizeName) float32 {
	if n == toolkit.SizeNamePadding {
		return gap
	}
	return fyne.CurrentApp().Settings().Theme().Size(n)
}

// gap is the room between the cells.
const gap = 1

// setKeys says which consequences are columns.
func (g *grid) setKeys(keys []string) {
	g.keys = keys
	for i, k := range keys {
		g.SetColumnWidth(i+1, widthFor(g.core.Info(k)))
	}
	g.column = min(g.column, len(keys))
	g.Refresh()
}

// widthFor gives the least width at which a title stands in two lines.
func widthFor(k run.KeyInfo) float32 {
	for w := float32(leastWidth); w < mostWidth; w += 4 {
		room := float64(w - 2*sideMargin)
		cut := draw.TextWidth(unitOf(k)+" ↓", headingSize, false) > room
		for _, l := range draw.Lines(k.Title, headingSize, true, room, 2) {
			cut = cut || strings.HasSuffix(l, "...")
		}
		if !cut {
			return w
		}
	}
	return mostWidth
}

func unitOf(k run.KeyInfo) string { return present.UnitWords(k.Unit) }

// setList shows an answer.
func (g *grid) setList(l *listed) {
	g.list = l
	g.mark()
	shown(len(l.rows) == 0, g.empty)
	if n := len(l.rows); g.atRow >= n {
		g.atRow = max(n-1, 0)
	}
	g.Refresh()
}

// mark takes over which candidates are chosen; it tells whether that changed.
func (g *grid) mark() bool {
	now := map[int32]int{}
	if v := g.core.View(); v != nil && v.Index != nil && g.list != nil && v.Results == g.list.results {
		for at, id := range g.core.ChosenIDs() {
			if i, ok := v.Index.ByID[id]; ok {
				now[int32(i)] = at
			}
		}
	}
	same := len(now) == len(g.chosen)
	for i, at := range now {
		if was, ok := g.chosen[i]; !ok || was != at {
			same = false
		}
	}
	g.chosen = now
	return !same
}

// setLook takes over the colours of the window.
func (g *grid) setLook() {
	g.palette = g.core.Palette()
	g.look = g.palette.Paper
	g.frame.StrokeColor = g.core.Theme.Color(toolkit.ColorNamePrimary, g.core.App.Settings().ThemeVariant())
	g.frame.Refresh()
	g.Refresh()
}

func (g *grid) candidate(row int) (*run.Candidate, int32, bool) {
	if g.list == nil || row < 0 || row >= len(g.list.rows) {
		return nil, 0, false
	}
	i := g.list.rows[row]
	return &g.list.results.Candidates[i], i, true
}

// content is what a cell shows.
func (g *grid) content(id widget.TableCellID) content {
	c, i, ok := g.candidate(id.Row)
	if !ok {
		return content{}
	}
	at, chosen := g.chosen[i]
	n := content{chosen: chosen, look: g.look}
	if id.Col == 0 {
		n.name, n.text, n.sub = true, c.Site, g.list.titles[c.Plant]
		if n.sub == "" {
			n.sub = c.Plant
		}
		if chosen {
			n.letter = core.Letter(at)
		}
		return n
	}
	if id.Col > len(g.keys) {
		return n
	}
	key := g.keys[id.Col-1]
	q, ok := c.Consequence(key)
	switch {
	case !ok:
		n.word, n.text = true, present.Named(c.Status)
		return n
	case q.State == scoring.Unknown:
		n.unknown, n.word, n.text = true, true, present.Cell(q)
		return n
	case q.State != scoring.Number:
		n.word, n.text = true, present.Cell(q)
		if q.State == scoring.Never && overLimit(c, key) {
			n.warm, n.sub = true, overWord
		}
		return n
	}
	n.text = present.Cell(q)
	if col := g.list.columns[key]; col != nil && col.numbers > 0 {
		n.bar, n.low, n.x, n.up = true, col.share(q.Low), col.share(q.Central), col.share(q.High)
		n.shade = shadeOf(g.palette, between(q.Central, col.least, col.greatest))
	}
	if overLimit(c, key) {
		n.warm, n.sub, n.shade = true, overWord, ""
	}
	return n
}

// overWord stands beside a value that breaks a limit.
const overWord = "over"

func overLimit(c *run.Candidate, key string) bool {
	for _, k := range c.OverLimit {
		if k == key {
			return true
		}
	}
	return false
}

// hint is the sentence of a cell: the value in full, what its range means, why there is none.
func (g *grid) hint(id widget.TableCellID) string {
	c, _, ok := g.candidate(id.Row)
	if !ok {
		return ""
	}
	if id.Col == 0 || id.Col > len(g.keys) {
		text := g.core.CandidateTitle(c) + ": " + present.Named(c.Status)
		if c.Reason != "" {
			text += ", " + present.Reason(c.Reason)
		}
		return text + "."
	}
	return inFull(g.core, c, g.keys[id.Col-1])
}

// inFull writes a consequence of a candidate out in full.
func inFull(c *core.Core, cand *run.Candidate, key string) string {
	info := c.Info(key)
	q, ok := cand.Consequence(key)
	if !ok {
		text := info.Title + ": " + present.Named(cand.Status)
		if cand.Reason != "" {
			text += ", " + present.Reason(cand.Reason)
		}
		return text + "."
	}
	text := info.Title + ": "
	if q.State != scoring.Number {
		text += present.WhyNot(q)
	} else {
		text += strings.TrimSpace(strconv.FormatFloat(q.Central, 'g', 6, 64) + " " + present.Unit(q.Unit))
		if span := present.Span(q); span != "" {
			text += ", range " + span
		}
	}
	if q.Quality != "" {
		text += "; " + q.Quality
	}
	if overLimit(cand, key) {
		l, _, _ := c.View().Snap.Lookup("limit." + key)
		text += "; over the limit of " + strings.TrimSpace(l.Value+" "+present.Unit(q.Unit))
		if better(c.Parts.Catalog, key) == criteria.More {
			text += " (less than it asks for)"
		}
	}
	return text + "."
}

func (g *grid) heading(col int) heading {
	n := heading{look: g.look, marked: g.focused && col == g.column}
	if col <= 0 || col > len(g.keys) {
		n.title, n.unit = "Site", "plant option"
		return n
	}
	k := g.core.Info(g.keys[col-1])
	n.title, n.unit = k.Title, unitOf(k)
	n.shades = g.core.Shade() == k.Key
	if g.list != nil && g.list.sortBy == k.Key && g.list.dir != studyOrder {
		n.unit += " " + g.arrow(k.Key, g.list.dir)
	}
	return n
}

// arrow points up where values grow down the table.
func (g *grid) arrow(key string, d direction) string {
	if (better(g.core.Parts.Catalog, key) == criteria.Less) == (d == bestFirst) {
		return "↑"
	}
	return "↓"
}

// sentence is the hint of a header.
func (g *grid) sentence(col int) string {
	if col <= 0 || col > len(g.keys) {
		return "Site with the plant option that is fitted on it. A tap brings the order of the study back."
	}
	k := g.core.Info(g.keys[col-1])
	text := k.Title + " (" + unitOf(k) + "): " + k.Sentence
	if g.list != nil && g.list.sortBy == k.Key {
		switch g.list.dir {
		case bestFirst:
			text += " Sorted with the best first."
		case worstFirst:
			text += " Sorted with the worst first; unknown ones stay at the end."
		}
	}
	return text
}

func (g *grid) sort(col int) {
	if col > 0 && col <= len(g.keys) {
		g.onSort(g.keys[col-1])
	} else {
		g.onSort("")
	}
}

// TypedRune implements fyne.Focusable: m opens the menu of the marked column.
func (g *grid) TypedRune(r rune) {
	if r == 'm' || r == 'M' {
		at := fyne.CurrentApp().Driver().AbsolutePositionForObject(g)
		g.menu(g.column, at.AddXY(nameWidth, rowHeight))
	}
}

// menu offers what can be done with a column.
func (g *grid) menu(col int, at fyne.Position) {
	if col <= 0 || col > len(g.keys) {
		return
	}
	key := g.keys[col-1]
	items := []*fyne.MenuItem{
		fyne.NewMenuItem("Sort by this", func() { g.onSort(key) }),
		fyne.NewMenuItem("Shade the map by this", func() { g.onShade(key) }),
		fyne.NewMenuItem("Hide this column", func() { g.onHide(key) }),
	}
	widget.ShowPopUpMenuAtPosition(fyne.NewMenu("", items...), g.core.Window.Canvas(), at)
}

func (g *grid) tapped(id widget.TableCellID, add bool) {
	c, _, ok := g.candidate(id.Row)
	if !ok {
		return
	}
	g.atRow = id.Row
	if id.Col > 0 {
		g.column = id.Col
	}
	g.core.Window.Canvas().Focus(g)
	g.onPick(c.ID(), add)
}

// FocusGained implements fyne.Focusable. The toolkit's own mark of a single cell is not used, since
// rows are chosen here.
func (g *grid) FocusGained() {
	g.focused = true
	g.frame.Show()
	g.Refresh()
}

// FocusLost implements fyne.Focusable.
func (g *grid) FocusLost() {
	g.focused = false
	g.frame.Hide()
	g.Refresh()
}

// TypedKey implements fyne.Focusable.
func (g *grid) TypedKey(e *fyne.KeyEvent) {
	row := g.atRow
	page := max(int((g.Size().Height-rowHeight)/(rowHeight+gap))-1, 1)
	switch e.Name {
	case fyne.KeyDown:
		row++
	case fyne.KeyUp:
		row--
	case fyne.KeyPageDown:
		row += page
	case fyne.KeyPageUp:
		row -= page
	case fyne.KeyHome:
		row = 0
	case fyne.KeyEnd:
		if g.list != nil {
			row = len(g.list.rows) - 1
		}
	case fyne.KeyLeft:
		g.toColumn(g.column - 1)
		return
	case fyne.KeyRight:
		g.toColumn(g.column + 1)
		return
	case fyne.KeyReturn, fyne.KeyEnter:
		g.sort(g.column)
		return
	case fyne.KeySpace:
		if c, _, ok := g.candidate(g.atRow); ok {
			g.onPick(c.ID(), true)
		}
		return
	default:
		return
	}
	if g.list == nil || len(g.list.rows) == 0 {
		return
	}
	g.atRow = min(max(row, 0), len(g.list.rows)-1)
	g.toRow(g.atRow)
	c, _, _ := g.candidate(g.atRow)
	g.onPick(c.ID(), false)
}

func (g *grid) toColumn(col int) {
	g.column = min(max(col, 0), len(g.keys))
	switch {
	case g.column <= 1:
		g.ScrollToLeading()
	default:
		g.ScrollTo(widget.TableCellID{Row: g.atRow, Col: g.column})
		g.toRow(g.atRow)
	}
	g.Refresh()
}

// toRow brings a row into view. The toolkit counts the header into the place of a row, so a row above the
// view is asked for by the one before it.
func (g *grid) toRow(row int) {
	if row <= 0 {
		g.ScrollToTop()
		return
	}
	g.ScrollTo(widget.TableCellID{Row: row - 1})
	g.ScrollTo(widget.TableCellID{Row: row})
}
