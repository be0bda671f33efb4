package accounts

import (
	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/container"
	"fyne.io/fyne/v2/layout"

	"groundtally/app/desk/core"
	"groundtally/app/desk/widgets"
	"groundtally/app/pictures"
	"groundtally/app/present"
	"groundtally/app/run"
	"groundtally/scoring"
)

// besideTable sets doing nothing, saving the same and roofs and sealed ground beside the chosen candidate, consequence
// by consequence.
type besideTable struct {
	core *core.Core
	rows *fyne.Container
	body fyne.CanvasObject
	of   *run.Results
	id   string // of the chosen candidate
}

func newBesideTable(c *core.Core) *besideTable {
	t := &besideTable{core: c, rows: container.New(layout.NewCustomPaddedVBoxLayout(2))}
	t.body = container.NewVScroll(pad(t.rows))
	t.update()
	return t
}

// update follows the results and the first chosen candidate.
func (t *besideTable) update() {
	v := t.core.View()
	if v == nil || v.Results == nil {
		t.of, t.rows.Objects = nil, []fyne.CanvasObject{widgets.NewText("The table stands here once the study is computed.")}
		t.rows.Refresh()
		return
	}
	var chosen *run.Candidate
	id := ""
	if list := t.core.Chosen(); len(list) > 0 {
		chosen, id = list[0], list[0].ID()
	}
	if t.of == v.Results && t.id == id {
		return
	}
	t.of, t.id = v.Results, id
	t.rows.Objects = nil
	all := v.Results.Alternatives
	for i := range all {
		t.rows.Add(widgets.NewText(pictures.About(&all[i])))
	}
	heads := []string{"", "", "Nothing", "Saving", "Roofs"}
	if chosen != nil {
		heads = append(heads, core.Letter(0)+" "+chosen.Site)
	}
	t.rows.Add(besideRow(heads, true, ""))
	for _, a := range scoring.Accounts() {
		first := true
		for _, k := range t.core.Parts.Params.Keys() {
			if k.Account != a || k.Derived {
				continue
			}
			cells, told := t.cells(all, chosen, k.Key)
			if !told {
				continue
			}
			if first {
				t.rows.Add(widgets.Part(accountTitle(a)))
				first = false
			}
			t.rows.Add(besideRow(append([]string{k.Title, present.Unit(k.Unit)}, cells...), false, k.Sentence))
		}
	}
	t.rows.Refresh()
}

// cells gives the figures of a consequence; told is false where no alternative has one.
func (t *besideTable) cells(all []run.Alternative, chosen *run.Candidate, key string) (out []string, told bool) {
	out = []string{"none"} // doing nothing has no consequence
	for i := range all {
		q := all[i].Consequence(key)
		told = told || q.State == scoring.Number
		out = append(out, present.Cell(q))
	}
	if chosen != nil {
		cell := "."
		if q, ok := chosen.Consequence(key); ok {
			cell = present.Cell(q)
		}
		out = append(out, cell)
	}
	return out, told
}

// besideRow lays a title, its unit and figures out in columns.
func besideRow(texts []string, bold bool, hint string) fyne.CanvasObject {
	widths := []float32{0, 78}
	title := widgets.NewLine(texts[0])
	title.Hint = hint
	objects := []fyne.CanvasObject{title, widgets.Faint(texts[1])}
	for _, text := range texts[2:] {
		l := widgets.NewLine(text)
		l.Align, l.Bold = fyne.TextAlignTrailing, bold
		widths, objects = append(widths, 76), append(objects, l)
	}
	return widgets.Fields(6, widths, objects...)
}
