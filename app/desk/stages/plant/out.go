package plant

import (
	"fmt"
	"slices"
	"strings"

	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/container"
	"fyne.io/fyne/v2/widget"

	"groundtally/app/desk/widgets"
	"groundtally/app/present"
	"groundtally/app/run"
)

// out lists the candidates of an option that are out, by which rule, and finds what would bring one back.
type out struct {
	s       *stage
	head    *widgets.Line
	filter  *field
	list    *widget.List
	title   *widgets.Line
	words   *widget.Label
	near    *widget.Button
	lines   *widget.Label
	body    fyne.CanvasObject
	all     []run.Out // of the option
	rows    []run.Out // that the filter lets through
	chosen  string    // site
	fitted  int       // candidates of the option with a plant
	of      *run.Results
	id      string
	looking string // site that is being looked at
}

func newOut(s *stage) *out {
	o := &out{s: s, head: widgets.Faint(""), title: widgets.Part(""), words: widgets.NewText(""), lines: widgets.NewText("")}
	o.filter = newField("Find a site or a rule", s.reached)
	o.filter.OnChanged = func(string) { o.search() }
	o.list = widget.NewList(func() int { return len(o.rows) }, func() fyne.CanvasObject {
		return widgets.Fields(8, []float32{96, 0}, widgets.NewLine(""), widgets.Faint(""))
	}, func(i widget.ListItemID, obj fyne.CanvasObject) {
		cells := obj.(*fyne.Container).Objects
		cells[0].(*widgets.Line).Set(o.rows[i].Site)
		cells[1].(*widgets.Line).Set(outWords(o.rows[i]))
	})
	o.list.HideSeparators = true
	o.list.OnSelected = func(i widget.ListItemID) { o.choose(o.rows[i]) }
	o.near = widget.NewButton("Find the nearest miss", o.find)
	detail := container.NewVBox(o.title, flush(o.words), container.NewHBox(o.near), flush(o.lines))
	scroll := container.NewVScroll(detail)
	scroll.SetMinSize(fyne.NewSize(1, 190))
	o.body = container.New(insets{2, 6, 16, 8}, container.NewBorder(container.NewVBox(o.head, o.filter), scroll, nil, nil, o.list))
	o.detail(nil)
	return o
}

// outWords says in a few words why a candidate is out.
func outWords(o run.Out) string {
	if o.Status != run.NoRoom || len(o.Rules) == 0 {
		words := present.Named(o.Status)
		if o.Reason != "" {
			words += ": " + present.Reason(o.Reason)
		}
		return words
	}
	t := o.Rules[0]
	words := fmt.Sprintf("%s takes %s of %s ha", present.Rule(t.Rule), short(t.AloneHa+t.SharedHa), short(o.GrossHa))
	if t.TakesAll {
		words = present.Rule(t.Rule) + " takes all of " + short(o.GrossHa) + " ha"
	}
	return words
}

func short(ha float64) string { return present.Hectares(ha) }

// update lists who is out under the present results.
func (o *out) update() {
	v := o.s.core.View()
	if v == nil || v.Results == nil {
		o.head.Set("Nothing is computed yet.")
		return
	}
	if o.of == v.Results && o.id == o.s.id {
		return
	}
	o.of, o.id = v.Results, o.s.id
	snap, results, id := v.Of, v.Results, o.s.id
	o.s.background(func() {
		var list []run.Out
		for _, one := range run.Register(snap, results) {
			if one.Plant == id {
				list = append(list, one)
			}
		}
		fitted := 0
		for i := range results.Candidates {
			if c := &results.Candidates[i]; c.Plant == id && c.Status == run.Fitted {
				fitted++
			}
		}
		o.s.core.Do(func() {
			if o.of != results || o.id != id {
				return
			}
			o.all, o.fitted = list, fitted
			o.search()
			at := slices.IndexFunc(list, func(x run.Out) bool { return x.Site == o.chosen })
			if at < 0 {
				o.detail(nil)
			} else {
				o.detail(&list[at])
			}
		})
	})
}

func (o *out) search() {
	want := strings.ToLower(strings.TrimSpace(o.filter.Text))
	o.rows = o.all
	if want != "" {
		o.rows = nil
		for _, x := range o.all {
			if strings.Contains(strings.ToLower(x.Site+" "+outWords(x)), want) {
				o.rows = append(o.rows, x)
			}
		}
	}
	words := fmt.Sprintf("%d candidates are out, %d have a plant. What takes most of each site:", len(o.all), o.fitted)
	if want != "" {
		words = fmt.Sprintf("%d of the %d candidates that are out fit what is searched for. What takes most of each site:", len(o.rows), len(o.all))
	}
	if o.of != nil {
		o.head.Set(words)
	}
	o.list.UnselectAll()
	o.list.Refresh()
}

// choose shows a site that is out, here and on the map.
func (o *out) choose(x run.Out) {
	o.chosen = x.Site
	o.detail(&x)
	o.s.core.Choose(x.Site + "/" + x.Plant)
	for _, c := range o.s.core.Chosen() {
		o.s.core.ShowParcels(c.Parcels)
	}
}

// detail tells all of one that is out.
func (o *out) detail(x *run.Out) {
	o.lines.SetText("")
	if x == nil {
		o.chosen = ""
		o.title.Set("")
		o.words.SetText("Choose one to see every rule that takes land of it, and what would bring it back.")
		o.near.Disable()
		return
	}
	o.title.Set(x.Site)
	words := fmt.Sprintf("%s. Of %s ha, %s ha are buildable; the largest patch has %s ha.", present.Upper(outWords(*x)), short(x.GrossHa), short(x.BuildableHa), short(x.LargestPatchHa))
	for _, t := range x.Rules {
		words += fmt.Sprintf("\n%s: %s ha, %s of it alone.", present.Upper(present.Rule(t.Rule)), short(t.AloneHa+t.SharedHa), short(t.AloneHa))
		if len(t.Data) > 0 {
			words += " " + strings.Join(t.Data, "; ") + "."
		}
	}
	if x.ShapeHa > 0 {
		words += fmt.Sprintf("\nToo narrow or too small: %s ha.", short(x.ShapeHa))
	}
	o.words.SetText(words)
	if x.Status == run.NoRoom && o.looking == "" {
		o.near.Enable()
	} else {
		o.near.Disable()
	}
}

// find looks for the smallest change of one rule that would bring the chosen site back.
func (o *out) find() {
	site, id := o.chosen, o.id
	if o.of == nil {
		return
	}
	c, err := o.of.Find(site, id)
	if err != nil {
		return
	}
	o.looking = site
	o.near.Disable()
	o.lines.SetText("Looking, rule by rule…")
	o.s.core.Session.NearestMiss(c, func(list []run.Relaxed, err error) {
		o.s.core.Do(func() {
			o.looking = ""
			if o.chosen != site || o.id != id {
				return
			}
			o.near.Enable()
			switch {
			case err != nil:
				o.lines.SetText(present.Problem(err))
			case len(list) == 0:
				o.lines.SetText("No change of a single rule would bring it back.")
			default:
				var words []string
				for i, r := range list {
					lead := "Or "
					if i == 0 {
						lead = "Nearest miss: "
					}
					words = append(words, lead+present.Relaxation(r.Rule, r.Part, r.From, r.To, r.Unit, r.Lifted)+".")
				}
				o.lines.SetText(strings.Join(words, "\n") + "\nEach alone, with all other rules as they are. Nothing was changed.")
			}
		})
	})
}
