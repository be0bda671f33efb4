package accounts

import (
	"image/color"

	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/canvas"
	"fyne.io/fyne/v2/container"

	"groundtally/app/desk/core"
	"groundtally/app/desk/widgets"
	"groundtally/app/present"
	"groundtally/app/run"
	"groundtally/scoring"
)

// family is a few consequences that are read together.
type family struct {
	title, words string
	keys         []string
}

// families are the figures that mislead when one of them stands alone.
var families = []family{
	{"Energy return under every boundary", "Energy given for each unit of energy spent. What is counted as given and as spent differs from line to line, so no line stands for the others.",
		[]string{"eroi_generation", "eroi_delivered", "eroi_extended", "eroi_stock", "eroi_used", "net_share", "energy_payback_yr"}},
	{"Carbon of soil and plants", "Greenhouse gas counts the carbon that soil and plants lose. A gain is shown apart and never set off against losses.",
		[]string{"ghg_g_per_kwh", "ghg_life_tco2e", "soil_carbon_loss_tc", "soil_carbon_gain_tc", "biomass_carbon_loss_tc", "peat_ha"}},
}

// figureRow is one consequence of the chosen candidates, with its sentence.
type figureRow struct {
	key   string
	unit  *widgets.Line
	lines [core.MostChosen]figureLine
}

type figureLine struct {
	all           *fyne.Container
	letter, value *widgets.Line
	note          *widgets.Line
	bar           *widgets.RangeBar
}

// returns shows the families for the chosen candidates.
type returns struct {
	core *core.Core
	who  *fyne.Container
	rows []*figureRow
	body fyne.CanvasObject
}

func newReturns(c *core.Core) *returns {
	r := &returns{core: c, who: container.NewVBox()}
	all := container.NewVBox(r.who)
	for _, f := range families {
		all.Add(space(4))
		all.Add(widgets.Part(f.title))
		all.Add(paragraph(f.words))
		for _, key := range f.keys {
			row := &figureRow{key: key}
			info := c.Info(key)
			title := widgets.NewLine(info.Title)
			title.Bold = true
			row.unit = widgets.Faint(unitOf(info))
			row.unit.Align, row.unit.TextSize = fyne.TextAlignTrailing, smallSize
			all.Add(space(4))
			all.Add(widgets.Fields(8, []float32{0, 220}, title.Hinted(info.Sentence), row.unit))
			for i := range row.lines {
				l := &row.lines[i]
				l.letter, l.value, l.note, l.bar = widgets.Faint(""), widgets.NewLine(""), widgets.Faint(""), widgets.NewRangeBar()
				l.value.Bold, l.value.Align = true, fyne.TextAlignTrailing
				l.all = widgets.Fields(10, []float32{16, 84, 0, 110}, l.letter, l.value, l.bar, l.note)
				l.all.Hide()
				all.Add(l.all)
			}
			all.Add(paragraph(info.Sentence))
			r.rows = append(r.rows, row)
		}
	}
	r.body = container.NewVScroll(pad(all))
	return r
}

// update shows the chosen candidates; spans gives where a value lies among all.
func (r *returns) update(spans map[string]*column) {
	chosen := r.core.Chosen()
	r.who.Objects = nil
	if len(chosen) == 0 {
		r.who.Add(widgets.Faint("Choose a candidate in the table or on the map."))
	}
	for i, c := range chosen {
		l := widgets.NewLine(core.Letter(i) + "  " + r.core.CandidateTitle(c))
		l.Bold = true
		r.who.Add(l)
	}
	for _, row := range r.rows {
		unit := unitOf(r.core.Info(row.key))
		for _, c := range chosen {
			if q, ok := c.Consequence(row.key); ok && q.State == scoring.Number {
				unit += ", " + present.RangeWords(q.Range)
				break
			}
		}
		row.unit.Set(unit)
		for i := range row.lines {
			l := &row.lines[i]
			if i >= len(chosen) {
				l.all.Hide()
				continue
			}
			l.letter.Set(core.Letter(i))
			r.line(l, chosen[i], row.key, spans[row.key])
			l.all.Show()
		}
	}
	r.body.Refresh()
}

func (r *returns) line(l *figureLine, c *run.Candidate, key string, col *column) {
	l.value.Hint, l.note.Hint = inFull(r.core, c, key), inFull(r.core, c, key)
	q, ok := c.Consequence(key)
	switch {
	case !ok:
		l.value.Set(present.Named(c.Status))
		l.note.Set("")
		l.bar.Clear()
	case q.State == scoring.Number:
		l.value.Set(present.Cell(q))
		l.note.Set("")
		if present.Span(q) != "" { // what it means stands over the line
			l.note.Set(present.Figure(q.Low, q.Low, q.High) + " to " + present.Figure(q.High, q.Low, q.High))
		}
		if col != nil && col.numbers > 0 {
			l.bar.Set(col.share(q.Low), col.share(q.Central), col.share(q.High), overLimit(c, key))
		}
	case q.State == scoring.Unknown:
		l.value.Set(present.Cell(q))
		l.note.Set(present.WhyNot(q))
		l.bar.SetUnknown()
	default:
		l.value.Set(present.Cell(q))
		l.note.Set(present.WhyNot(q))
		l.bar.Clear()
	}
}

// notAssessed lists in words what the program does not look at.
func (s *stage) notAssessed() fyne.CanvasObject {
	all := container.NewVBox(
		widgets.Part("What this program does not look at"),
		paragraph("These consequences may matter on the ground all the same. Nothing in the table, the order or the score speaks of them."),
	)
	for _, k := range s.all {
		if s.assessed(k.Key) || k.Derived {
			continue
		}
		title := widgets.NewLine(k.Title)
		title.Bold = true
		all.Add(title)
		all.Add(paragraph(k.Sentence))
	}
	all.Add(space(6))
	all.Add(widgets.Part("What every figure here is"))
	all.Add(paragraph(caution))
	return container.NewVScroll(pad(all))
}

// brief stands under the table.
const brief = "Screening only; a grid offer needs the network operator's own study."

// caution is the whole of it, shown on hovering and at the end of what is not assessed.
const caution = "Screening figures, to choose where to look closer. Noise, ice throw and structure need qualified assessments under local law; only the network operator's study can offer a connection; power lines are live. An unknown value is unknown and not zero."

func pad(o fyne.CanvasObject) fyne.CanvasObject {
	return container.New(insets{2, 6, 14, 8}, o)
}

// insets keeps room around an object: left, top, right, bottom.
type insets [4]float32

func (i insets) Layout(objects []fyne.CanvasObject, size fyne.Size) {
	for _, o := range objects {
		o.Move(fyne.NewPos(i[0], i[1]))
		o.Resize(size.SubtractWidthHeight(i[0]+i[2], i[1]+i[3]))
	}
}

func (i insets) MinSize(objects []fyne.CanvasObject) fyne.Size {
	var out fyne.Size
	for _, o := range objects {
		out = out.Max(o.MinSize())
	}
	return out.AddWidthHeight(i[0]+i[2], i[1]+i[3])
}

// paragraph is a text that wraps, set flush with the lines above it.
func paragraph(text string) fyne.CanvasObject {
	return container.New(insets{-6, -4, -6, -2}, widgets.NewText(text))
}

func space(height float32) fyne.CanvasObject {
	r := canvas.NewRectangle(color.Transparent)
	r.SetMinSize(fyne.NewSize(1, height))
	return r
}
