package strip

import (
	"strings"

	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/container"
	"fyne.io/fyne/v2/layout"
	toolkit "fyne.io/fyne/v2/theme"
	"fyne.io/fyne/v2/widget"

	"groundtally/app/desk/core"
	"groundtally/app/desk/theme"
	"groundtally/app/desk/widgets"
	"groundtally/app/present"
	"groundtally/app/run"
	"groundtally/scoring"
)

// row is one quantity of an unfolding, as deep as it stands below the consequence.
type row struct {
	depth                         int
	title, value, formula, source string
	unknown                       bool
}

// unfolding shows a consequence with its formula, inputs, sources, uncertainty, down to facts and cited
// factors.
type unfolding struct {
	c                 *core.Core
	key               string
	at                int
	round             int // of the newest question; older answers are dropped
	shownKey, shownID string
	rows              []row
	title             *widgets.Line
	sub               *widgets.Line
	list              *widget.List
	all               fyne.CanvasObject
}

func newUnfolding(c *core.Core, fold func()) *unfolding {
	u := &unfolding{c: c, title: widgets.Part(""), sub: widgets.Faint("")}
	u.list = widget.NewList(func() int { return len(u.rows) }, newRow, func(i widget.ListItemID, o fyne.CanvasObject) { fillRow(o, u.rows[i]) })
	u.list.HideSeparators = true
	closer := widget.NewButtonWithIcon("Fold", toolkit.CancelIcon(), fold)
	closer.Importance = widget.LowImportance
	head := container.NewBorder(nil, nil, nil, closer, container.NewVBox(u.title, u.sub))
	u.all = container.New(layout.NewCustomPaddedLayout(0, 0, 10, 0), container.NewBorder(head, nil, nil, nil, u.list))
	return u
}

// show unfolds a key of a chosen candidate, off the window's goroutine.
func (u *unfolding) show(key string, candidate int) {
	u.key, u.at = key, candidate
	u.refill()
}

func (u *unfolding) refill() {
	chosen := u.c.Chosen()
	if u.key == "" || len(chosen) == 0 {
		return
	}
	u.at = min(u.at, len(chosen)-1)
	cand, v, key := chosen[u.at], u.c.View(), u.key
	info := u.c.Info(key)
	name := u.c.CandidateTitle(cand)
	if len(chosen) > 1 {
		name = core.Letter(u.at) + " " + name
	}
	u.title.Set(info.Title + " of " + name)
	u.title.Hint = info.Sentence
	u.sub.Set(info.Sentence)
	u.round++
	round := u.round
	go func() {
		tree, err := run.Unfold(u.c.Parts.Params, v.Of, cand, key)
		var rows []row
		if err == nil {
			seen := map[string]bool{}
			flatten(tree, 0, seen, &rows)
			rows = append(more(cand, key), rows...)
		}
		u.c.Do(func() {
			if round != u.round {
				return
			}
			if err != nil {
				rows = []row{{title: present.Problem(err)}}
			}
			u.rows = rows
			u.list.Refresh()
			if key != u.shownKey || cand.ID() != u.shownID {
				u.shownKey, u.shownID = key, cand.ID()
				u.list.ScrollToTop()
			}
		})
	}()
}

// more says what stands beside the formula: where the range is from, how the value was come by, notices.
func more(cand *run.Candidate, key string) []row {
	q, ok := cand.Consequence(key)
	if !ok {
		return nil
	}
	out := []row{{title: "Value", value: full(q), unknown: q.State == scoring.Unknown || q.State == scoring.NotSet || q.State == scoring.NotAssessed}}
	for _, n := range q.Notices {
		out[0].source = strings.TrimSpace(out[0].source + " " + present.Sentence(n, nil))
	}
	if key == "buildable_area_ha" && q.State == scoring.Number {
		for _, t := range cand.Taken {
			out = append(out, row{depth: 1, title: "Taken by " + present.Rule(t.Rule), value: present.Exact(t.AloneHa) + " ha alone, " + present.Exact(t.SharedHa) + " ha shared with other rules"})
		}
		out = append(out, row{depth: 1, title: "Taken by several rules together", value: present.Exact(cand.TakenSharedHa) + " ha, each counted once"},
			row{depth: 1, title: "Too small or too narrow", value: present.Exact(cand.ShapeHa) + " ha"})
	}
	unit := map[string]string{"wind_p50_mwh": "MWh/yr", "energy_p50_mwh_per_yr": "", "delivered_mwh_per_yr": ""}
	if want, ok := unit[key]; ok {
		for _, st := range cand.Chain {
			if want == "" || st.Unit == want {
				out = append(out, row{depth: 1, title: "After " + present.Step(st.Name), value: present.Exact(st.After) + " " + present.Unit(st.Unit), formula: present.Signed(-100*st.Share) + " %"})
			}
		}
	}
	return out
}

// flatten writes a tree as rows, each quantity unfolded once.
func flatten(u *run.Unfolding, depth int, seen map[string]bool, out *[]row) {
	r := row{depth: depth, title: u.Title}
	if r.title == "" {
		r.title = strings.ReplaceAll(u.Name, "_", " ")
	}
	r.title += "  (" + u.Name + ")"
	if u.State == scoring.Number.String() {
		r.value = withUnit(present.Exact(u.Value), u.Unit)
		if u.Range != "" {
			r.value += "  (" + present.Figure(u.Low, u.Low, u.High) + " to " + present.Figure(u.High, u.Low, u.High) + ")"
		}
	} else {
		r.value, r.unknown = u.State, u.State != scoring.None.String()
	}
	if u.Why != "" {
		r.value += ": " + present.Reason(u.Why)
	}
	if seen[u.Name] && len(u.Inputs) > 0 {
		r.formula = "unfolded above"
		*out = append(*out, r)
		return
	}
	seen[u.Name] = true
	if u.Formula != "" {
		r.formula = u.Name + " = " + u.Formula
	}
	if u.Source != "" {
		r.source = "source: " + u.Source
		if u.Provenance != "" {
			r.source += " (" + present.Provenance(u.Provenance) + ")"
		}
	}
	if u.State == scoring.Number.String() && u.Range != "" {
		r.source = strings.TrimSuffix("range: "+rangeWords(u.Range)+"; "+r.source, "; ")
	}
	*out = append(*out, r)
	for _, in := range u.Inputs {
		flatten(in, depth+1, seen, out)
	}
}

func rangeWords(r string) string {
	if r == "p5_p95" {
		return "P5 to P95 of the factor"
	}
	return present.RangeWords(scoring.Range(r))
}

// newRow makes the template of a row: title, value, formula, source, set in by depth.
func newRow() fyne.CanvasObject {
	title, value := widgets.NewLine(""), widgets.NewLine("")
	title.TextSize, value.TextSize, value.Bold = 12, 12, true
	hatch := widgets.NewHatch()
	inset := &inset{}
	return container.New(inset, title, value, widgets.Faint(""), widgets.Faint(""), hatch)
}

func fillRow(o fyne.CanvasObject, r row) {
	box := o.(*fyne.Container)
	in := box.Layout.(*inset)
	title, value := box.Objects[0].(*widgets.Line), box.Objects[1].(*widgets.Line)
	formula, source, hatch := box.Objects[2].(*widgets.Line), box.Objects[3].(*widgets.Line), box.Objects[4]
	title.Set(r.title)
	colour := toolkit.ColorNameForeground
	if r.unknown {
		colour = theme.Faint
	}
	value.SetLook(r.value, colour, !r.unknown)
	formula.Set(r.formula)
	source.Set(r.source)
	if r.unknown {
		hatch.Show()
	} else {
		hatch.Hide()
	}
	if in.depth != r.depth {
		in.depth = r.depth
	}
	box.Layout.Layout(box.Objects, box.Size())
}

// inset lays out a row: title and value beside each other, formula and source below.
type inset struct{ depth int }

const rowLine = 16

func (l *inset) Layout(o []fyne.CanvasObject, s fyne.Size) {
	x := float32(min(l.depth, 12)) * 14
	w := s.Width - x
	half := w * 0.5
	place := func(i int, x, y, w float32) {
		o[i].Move(fyne.NewPos(x, y))
		o[i].Resize(fyne.NewSize(max(w, 10), rowLine+2))
	}
	place(0, x, 2, half-8)
	place(1, x+half, 2, half)
	place(2, x+12, 2+rowLine, w-12)
	place(3, x+12, 2+2*rowLine, w-12)
	o[4].Move(fyne.NewPos(x+half-14, 6))
	o[4].Resize(fyne.NewSize(10, 10))
}

func (l *inset) MinSize([]fyne.CanvasObject) fyne.Size { return fyne.NewSize(200, 3*rowLine+8) }
