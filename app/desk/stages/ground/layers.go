package ground

import (
	"context"
	"fmt"
	"slices"
	"strings"

	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/canvas"
	"fyne.io/fyne/v2/container"
	"fyne.io/fyne/v2/dialog"
	"fyne.io/fyne/v2/layout"
	"fyne.io/fyne/v2/storage"
	"fyne.io/fyne/v2/widget"

	"groundtally/app/desk/core"
	"groundtally/app/desk/theme"
	"groundtally/app/desk/widgets"
	"groundtally/app/present"
	"groundtally/app/study"
	"groundtally/geo"
)

// layersPane lists the layers; one can be unfolded in its place. All rows have the same height, so that a
// list of 100,000 notices costs no more than a short one.
type layersPane struct {
	s       *Stage
	content fyne.CanvasObject
	list    *widget.List
	total   *widgets.Line
	replace *widget.Button
	takeOut *widget.Button
	byHand  *widget.Button
	draw    *widget.Button
	write   *widget.Button

	shown  []shownLayer
	rows   []layerRow
	opened string // name of the unfolded layer; wholeStudy for the notices of no layer
}

// wholeStudy stands for the row of notices that belong to no layer; no layer has an empty name.
const wholeStudy = ""

type shownLayer struct {
	rec     study.LayerRecord
	whole   bool
	notices []geo.Notice
	warm    int // notices that want attention
}

type rowKind uint8

const (
	headRow rowKind = iota
	pairsRow
	noticeRow
)

type layerRow struct {
	kind  rowKind
	layer int
	pairs []pair
	at    int // notice
}

type pair struct{ label, value, hint string }

const pairsEach = 3

func newLayersPane(s *Stage) *layersPane {
	p := &layersPane{s: s, total: widgets.Faint(""), opened: "\x00"}
	add := widget.NewButton("Add a file…", func() { p.choose("") })
	add.Importance = widget.HighImportance
	p.replace = widget.NewButton("Replace by a file…", func() { p.choose(p.opened) })
	p.takeOut = widget.NewButton("Take out", p.remove)
	p.byHand = widget.NewButton("Change by hand…", func() {
		if rec, ok := hasLayer(s.c.View().Snap, p.opened); ok {
			newHandForm(s, rec).open()
		}
	})
	p.write = widget.NewButton("Write…", p.writeLayer)
	p.list = widget.NewList(func() int { return len(p.rows) }, func() fyne.CanvasObject { return newLayerCell(p) },
		func(i widget.ListItemID, o fyne.CanvasObject) { o.(*layerCell).show(i) })
	p.list.HideSeparators = true
	p.list.OnSelected = func(i widget.ListItemID) {
		p.list.UnselectAll()
		if i < len(p.rows) && p.rows[i].kind == headRow {
			p.toggle(p.rows[i].layer)
		}
	}
	buttons := container.NewHBox(add, p.replace, p.takeOut)
	p.draw = widget.NewButton("Draw…", p.chooseDrawing)
	more := container.NewHBox(p.draw, p.byHand, p.write)
	head := container.NewVBox(buttons, more, gap(2), p.total)
	p.content = padded(container.NewBorder(head, nil, nil, nil, p.list))
	p.changed()
	return p
}

// changed takes over another state of the study.
func (p *layersPane) changed() {
	v := p.s.c.View()
	p.shown = p.shown[:0]
	features, left := 0, 0
	add := func(l shownLayer) {
		for _, n := range l.notices {
			if n.Severity >= geo.Warning {
				l.warm++
			}
		}
		p.shown = append(p.shown, l)
	}
	found := p.s.notices()
	for i, rec := range v.Snap.Layers {
		add(shownLayer{rec: rec, notices: found.layer[i]})
		features += rec.Count
		left += rec.Ledger.LeftOut
	}
	if len(found.whole) > 0 {
		add(shownLayer{whole: true, notices: found.whole})
	}
	switch {
	case len(v.Snap.Layers) == 0:
		p.total.Set("No layer yet. Begin with a file of parcels, by the button or dropped on the window.")
	default:
		p.total.Set(fmt.Sprintf("%s, %s, %s. Files may be dropped on the window.", core.Counted(len(v.Snap.Layers), "layer", "layers"), core.Counted(features, "feature", "features"), core.Counted(left, "left out", "left out")))
	}
	p.build()
}

// build makes the rows anew.
func (p *layersPane) build() {
	p.rows = p.rows[:0]
	found := false
	for i, l := range p.shown {
		p.rows = append(p.rows, layerRow{kind: headRow, layer: i})
		if l.rec.Name != p.opened {
			continue
		}
		found = true
		pairs := p.details(l)
		for len(pairs) > 0 {
			n := min(pairsEach, len(pairs))
			p.rows = append(p.rows, layerRow{kind: pairsRow, layer: i, pairs: pairs[:n]})
			pairs = pairs[n:]
		}
		for n := range l.notices {
			p.rows = append(p.rows, layerRow{kind: noticeRow, layer: i, at: n})
		}
	}
	if found && p.opened != wholeStudy {
		p.replace.Enable()
		p.takeOut.Enable()
		rec, _ := hasLayer(p.s.c.View().Snap, p.opened)
		if rec.Kind == "raster" || rec.Kind == "table" {
			p.byHand.Disable()
		} else {
			p.byHand.Enable()
		}
		if rec.Kind == "raster" {
			p.write.Disable()
		} else {
			p.write.Enable()
		}
	} else {
		p.replace.Disable()
		p.takeOut.Disable()
		p.byHand.Disable()
		p.write.Disable()
	}
	p.list.Refresh()
}

// toggle unfolds a layer, or folds it.
func (p *layersPane) toggle(i int) {
	if name := p.shown[i].rec.Name; p.opened == name {
		p.opened = "\x00"
	} else {
		p.opened = name
	}
	p.build()
}

// open unfolds a layer and brings it into view.
func (p *layersPane) open(name string) {
	p.opened = name
	p.build()
	for i, r := range p.rows {
		if r.kind == headRow && p.shown[r.layer].rec.Name == name && !p.shown[r.layer].whole {
			p.list.ScrollTo(min(i+pairsEach, len(p.rows)-1))
			p.list.ScrollTo(i)
			return
		}
	}
}

// details gives what an unfolded layer says of itself.
func (p *layersPane) details(l shownLayer) []pair {
	if l.whole {
		return nil
	}
	r := l.rec
	or := func(s, other string) string {
		if s == "" {
			return other
		}
		return s
	}
	complete := "not declared: nothing found does not mean that nothing is there"
	if r.Complete {
		complete = "declared: where nothing is drawn, nothing is there"
	}
	system := or(r.CRS, "none")
	if r.Swapped {
		system += ", latitude first"
	}
	out := []pair{
		{"File", r.File, ""},
		{"System of the file", system, "The coordinate system in which the file was delivered."},
		{"Way to degrees", or(r.Pipeline, "none needed"), "How coordinates were brought to longitude and latitude."},
		{"Projection data", or(r.Database, "none needed"), "Editions of the projection library and its database."},
		{"Edition", or(r.Edition, "not stated"), ""},
		{"Holder", or(r.Holder, "not stated"), "Who holds the data."},
		{"Whole place", complete, "Whether the layer covers the whole place."},
	}
	role, known := p.s.c.Parts.Catalog.Role(r.Role)
	if known && r.Kind != "raster" {
		for _, f := range role.Fields {
			col := r.Match[f.Name]
			switch {
			case col != "":
				text := "column " + col
				if u := r.Units[col]; u != "" {
					text += ", in " + u
				}
				out = append(out, pair{fieldWords(f), text, ""})
			case f.Required:
				out = append(out, pair{fieldWords(f), "no column: unknown", ""})
			}
		}
	}
	if r.Role == study.BackdropRole {
		out = append(out[:len(out)-1], pair{"Named with it", or(r.Credit().Attribution, "nobody"), "Who must be named where the picture is shown."}, pair{"Licence", or(r.Credit().Licence, "not stated"), "What may be done with the picture."})
	}
	personal := "none"
	if len(r.Personal) > 0 {
		personal = strings.Join(r.Personal, ", ")
	}
	if len(r.Only) > 0 {
		var words []string
		for _, w := range r.Only {
			words = append(words, w.Column+" "+strings.Join(w.Values, " or "))
		}
		out = append(out, pair{"Part of the file", strings.Join(words, "; or "), "The features that were asked for."})
	}
	if len(r.Hand) > 0 {
		out = append(out, pair{"Changed by hand", core.Counted(len(r.Hand), "change", "changes"), "Kept with their reasons for the next edition; the appendix lists them."})
	}
	if ch := r.Changes; ch != nil {
		out = append(out, pair{"Since the edition before", fmt.Sprintf("%d new, %d gone, %d renamed, %d moved, %d altered, %d the same", len(ch.Added), len(ch.Removed), len(ch.Renamed), len(ch.Moved), len(ch.Altered), ch.Same), "Matched by identifier, then by overlap of more than half."})
	}
	return append(out, pair{"Personal columns", personal, "Personal columns are never drawn, and never leave the study unasked."})
}

// fieldWords writes a field of a role for people.
func fieldWords(f study.RoleField) string {
	if words, ok := lightWords[f.Name]; ok {
		return words
	}
	s := strings.ReplaceAll(f.Name, "_", " ")
	return strings.ToUpper(s[:1]) + s[1:]
}

// lightWords name the fields that go by the trade's letters.
var lightWords = map[string]string{"ghi": "Light on level ground (GHI)", "dhi": "Diffuse light (DHI)", "dni": "Direct light (DNI)", "weibull_a": "Weibull A", "weibull_k": "Weibull k"}

// readable are the endings of files that can be added.
var readable = []string{".geojson", ".json", ".geojsonl", ".geojsons", ".gpkg", ".shp", ".zip", ".csv", ".txt", ".tsv", ".xlsx", ".tif", ".tiff", ".asc", ".hgt", ".png", ".jpg", ".jpeg"}

// choose asks for a file and adds it, or puts it in place of a layer.
func (p *layersPane) choose(replace string) {
	d := dialog.NewFileOpen(func(r fyne.URIReadCloser, err error) {
		if err != nil {
			p.s.c.Fail("open the file", err)
			return
		}
		if r == nil {
			return
		}
		path := r.URI().Path()
		_ = r.Close() // it is read from its path, in the background
		p.s.enqueue(job{path: path, replace: replace})
	}, p.s.c.Window)
	d.SetFilter(storage.NewExtensionFileFilter(readable))
	d.Resize(dialogSize(p.s.c, 820, 600))
	d.Show()
}

// remove takes the unfolded layer out.
func (p *layersPane) remove() {
	name := p.opened
	p.s.c.Ask("Take out "+name, fmt.Sprintf("The layer %q leaves the study, and everything that rests on it becomes unknown. Undo brings it back.", name), "Take out", func() {
		p.s.c.Edit("take out the layer", func(ctx context.Context, s *study.Study) error {
			return s.RemoveLayer(ctx, name, "taken out in the window")
		}, func() { p.s.c.Tell(name + " was taken out. Undo brings it back.") })
	})
}

// jump shows on the map what a notice is about.
func (p *layersPane) jump(l shownLayer, n geo.Notice) {
	c := p.s.c
	switch {
	case n.At != nil:
		c.ShowPlace(*n.At)
		return
	case l.rec.Role == "parcels" && n.Feature != "" && c.View().Index != nil:
		if _, ok := c.View().Index.SiteOfParcel(n.Feature); ok {
			c.ShowParcels([]string{n.Feature})
			return
		}
	}
	store := c.Session.Study().Store()
	go func() {
		at, ok, err := placeOf(context.Background(), store, l.rec, n.Feature)
		c.Do(func() {
			switch {
			case err != nil:
				c.Fail("find the feature", err)
			case ok:
				c.ShowPlace(at)
			default:
				c.Tell(fmt.Sprintf("Feature %s of %s has no place on the map: it was left out.", n.Feature, l.rec.Name))
			}
		})
	}()
}

// canJump tells whether a notice names a place or something that has one.
func canJump(l shownLayer, n geo.Notice) bool {
	return n.At != nil || !l.whole && n.Feature != "" && l.rec.Kind != "table" && l.rec.Kind != "raster"
}

// ledgerWords writes what became of the features of a file.
func ledgerWords(l study.Ledger) string {
	return fmt.Sprintf("%s read · %s repaired · %s left out", core.Count(l.Read), core.Count(l.Repaired), core.Count(l.LeftOut))
}

// kinds names what a layer is made of, one and many.
var kinds = map[string][2]string{"point": {"point", "points"}, "line": {"line", "lines"}, "polygon": {"area", "areas"}, "table": {"row", "rows"}, "raster": {"grid", "grids"}}

func countWords(r study.LayerRecord) string {
	if r.Role == study.BackdropRole {
		return core.Counted(r.Count, "picture", "pictures")
	}
	k, ok := kinds[r.Kind]
	if !ok {
		k = [2]string{"feature", "features"}
	}
	return core.Counted(r.Count, k[0], k[1])
}

// layerCell is one row of the list.
type layerCell struct {
	widget.BaseWidget
	p  *layersPane
	at int

	all, head, pairs, notice *fyne.Container
	rule                     *canvas.Rectangle
	name, count              *widgets.Line
	role, ledger, found      *widgets.Line
	labels, values           [pairsEach]*widgets.Line
	mark                     *widgets.Line
	what                     *widgets.Paragraph
	jump                     *widget.Button
}

func newLayerCell(p *layersPane) *layerCell {
	c := &layerCell{p: p, name: widgets.Part(""), count: widgets.NewLine("").Wide(), role: widgets.Faint(""), ledger: widgets.Faint(""), found: widgets.Faint("").Wide(),
		mark: widgets.Faint(""), what: widgets.NewParagraph("", 2), rule: canvas.NewRectangle(widgets.Colour(theme.Rule))}
	c.rule.SetMinSize(fyne.NewSize(1, 1))
	c.head = container.NewVBox(c.rule,
		container.NewBorder(nil, nil, nil, c.count, c.name),
		c.role,
		container.NewBorder(nil, nil, nil, c.found, c.ledger))
	table := container.New(columns{label: 132})
	for i := range pairsEach {
		c.labels[i], c.values[i] = widgets.Faint(""), widgets.NewLine("")
		c.values[i].TextSize = 12
		table.Add(c.labels[i])
		table.Add(c.values[i])
	}
	c.pairs = container.NewVBox(table)
	c.jump = widget.NewButton("Show on the map", func() {
		if r := c.p.rows[c.at]; r.kind == noticeRow {
			c.p.jump(c.p.shown[r.layer], c.p.shown[r.layer].notices[r.at])
		}
	})
	c.jump.Importance = widget.LowImportance
	c.notice = container.NewVBox(container.NewBorder(nil, nil, nil, c.jump, c.mark), c.what)
	c.all = container.NewStack(container.New(layout.NewCustomPaddedLayout(0, 0, 0, 14), c.head), inset(c.pairs), inset(c.notice))
	c.ExtendBaseWidget(c)
	return c
}

// inset moves what belongs to an unfolded layer to the right.
func inset(o fyne.CanvasObject) fyne.CanvasObject {
	return container.New(layout.NewCustomPaddedLayout(2, 2, 14, 14), o)
}

// CreateRenderer implements fyne.Widget.
func (c *layerCell) CreateRenderer() fyne.WidgetRenderer { return widget.NewSimpleRenderer(c.all) }

// MinSize implements fyne.CanvasObject; all rows are of one height.
func (c *layerCell) MinSize() fyne.Size { return fyne.NewSize(100, 68) }

func (c *layerCell) show(i int) {
	if i >= len(c.p.rows) {
		return
	}
	c.at = i
	r := c.p.rows[i]
	l := c.p.shown[r.layer]
	visible(c.all.Objects[0], r.kind == headRow)
	visible(c.all.Objects[1], r.kind == pairsRow)
	visible(c.all.Objects[2], r.kind == noticeRow)
	switch r.kind {
	case headRow:
		c.showHead(l)
	case pairsRow:
		for j := range pairsEach {
			var v pair
			if j < len(r.pairs) {
				v = r.pairs[j]
			}
			c.labels[j].Hint = v.hint
			c.labels[j].Set(v.label)
			c.values[j].Set(v.value)
		}
	default:
		n := l.notices[r.at]
		where, what := noticeWords(n, l.whole)
		text := severityWord(n.Severity)
		if where != "" {
			text += " · " + where
		}
		colour := theme.Faint
		if n.Severity >= geo.Warning {
			colour = theme.Warm
		}
		c.mark.SetLook(text, colour, false)
		c.what.Set(what)
		visible(c.jump, canJump(l, n))
	}
}

func (c *layerCell) showHead(l shownLayer) {
	if c.rule.FillColor != widgets.Colour(theme.Rule) {
		c.rule.FillColor = widgets.Colour(theme.Rule)
		c.rule.Refresh()
	}
	fold := "▸ "
	if l.rec.Name == c.p.opened {
		fold = "▾ "
	}
	if l.whole {
		c.name.Set(fold + "The study as a whole")
		c.count.Set("")
		c.role.Hint = ""
		c.role.Set("Notices that belong to no single layer")
		c.ledger.Set("")
	} else {
		role, _ := c.p.s.c.Parts.Catalog.Role(l.rec.Role)
		title := role.Title
		if title == "" {
			title = present.Named(l.rec.Role)
		}
		c.name.Set(fold + l.rec.Name)
		c.count.Set(countWords(l.rec))
		parts := []string{title}
		if l.rec.Edition != "" {
			parts = append(parts, "edition "+l.rec.Edition)
		}
		if l.rec.Holder != "" {
			parts = append(parts, l.rec.Holder)
		}
		c.role.Hint = role.Purpose
		c.role.Set(strings.Join(parts, " · "))
		c.ledger.Set(ledgerWords(l.rec.Ledger))
	}
	switch {
	case l.warm > 0:
		c.found.SetLook(core.Count(l.warm)+" to look at", theme.Warm, false)
	case len(l.notices) > 0:
		c.found.SetLook(core.Counted(len(l.notices), "note", "notes"), theme.Faint, false)
	default:
		c.found.SetLook("nothing to look at", theme.Faint, false)
	}
	c.head.Objects[1].Refresh() // the count has a width of its own
	c.head.Objects[3].Refresh()
}

func visible(o fyne.CanvasObject, yes bool) {
	if o.Visible() == yes {
		return
	}
	if yes {
		o.Show()
	} else {
		o.Hide()
	}
}

// columns lays out pairs of a label of fixed width and a value that takes the rest.
type columns struct{ label float32 }

// MinSize implements fyne.Layout.
func (l columns) MinSize(objects []fyne.CanvasObject) fyne.Size {
	h := float32(0)
	for i := 0; i+1 < len(objects); i += 2 {
		h += max(objects[i].MinSize().Height, objects[i+1].MinSize().Height) + 3
	}
	return fyne.NewSize(l.label+60, h)
}

// Layout implements fyne.Layout.
func (l columns) Layout(objects []fyne.CanvasObject, s fyne.Size) {
	y := float32(0)
	for i := 0; i+1 < len(objects); i += 2 {
		a, b := objects[i], objects[i+1]
		h := max(a.MinSize().Height, b.MinSize().Height)
		ah := min(a.MinSize().Height, h)
		a.Move(fyne.NewPos(0, y+(h-ah)/2))
		a.Resize(fyne.NewSize(l.label-8, ah))
		b.Move(fyne.NewPos(l.label, y))
		b.Resize(fyne.NewSize(s.Width-l.label, h))
		y += h + 3
	}
}

// hasLayer finds a layer by name.
func hasLayer(snap *study.Snapshot, name string) (study.LayerRecord, bool) {
	i := slices.IndexFunc(snap.Layers, func(l study.LayerRecord) bool { return l.Name == name })
	if i < 0 {
		return study.LayerRecord{}, false
	}
	return snap.Layers[i], true
}
