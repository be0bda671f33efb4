package plant

import (
	"errors"
	"strconv"
	"strings"

	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/container"
	"fyne.io/fyne/v2/dialog"
	"fyne.io/fyne/v2/widget"

	"groundtally/app/desk/widgets"
	"groundtally/app/run"
	"groundtally/app/study"
)

// asking is the form for a new option, or for a copy of one.
type asking struct {
	s          *stage
	from       string // option that is copied; empty for a new one
	id, title  *widget.Entry
	technology *widget.Select
	curve      *widget.Select
	curveRow   *fyne.Container
	fault      *widget.Label
	dialog     *dialog.CustomDialog
}

// ask opens the form.
func (s *stage) ask(from string) *asking {
	a := &asking{s: s, from: from, id: widget.NewEntry(), title: widget.NewEntry(), fault: widgets.NewText("")}
	a.id.SetPlaceHolder("letters, digits and _")
	a.title.SetPlaceHolder("as people read it")
	a.fault.Importance = widget.WarningImportance
	a.fault.Hide()
	words := make([]string, len(technologies))
	for i, t := range technologies {
		words[i] = t.words
	}
	a.technology = widget.NewSelect(words, func(string) { visible(a.curveRow, a.wind()) })
	curves := []string{"None; sizes follow later"}
	for _, t := range s.core.Parts.Params.Turbines {
		curves = append(curves, t.Name)
	}
	a.curve = widget.NewSelect(curves, nil)
	a.curve.SetSelectedIndex(0)
	line := func(label string, o fyne.CanvasObject) *fyne.Container {
		return widgets.Fields(8, []float32{120, 0}, widgets.NewLine(label), o)
	}
	a.curveRow = line("Reference curve", a.curve)
	a.curveRow.Hide()
	body := container.NewVBox(line("Short name", a.id), line("Name", a.title))
	head, yes := "New option", "Make it"
	if from == "" {
		body.Add(line("Technology", a.technology))
		body.Add(a.curveRow)
	} else {
		head, yes = "Copy and vary "+s.core.PlantTitle(from), "Copy"
		body.Add(flush(caption("All sizes and own rules of " + s.core.PlantTitle(from) + " are copied; change what shall differ afterwards.")))
		a.title.SetText(s.core.PlantTitle(from) + ", varied")
	}
	body.Add(a.fault)
	a.dialog = dialog.NewCustomWithoutButtons(head, body, s.core.Window)
	ok := widget.NewButton(yes, a.commit)
	ok.Importance = widget.HighImportance
	a.dialog.SetButtons([]fyne.CanvasObject{widget.NewButton("Cancel", a.dialog.Hide), ok})
	a.id.OnSubmitted = func(string) { a.commit() }
	a.title.OnSubmitted = a.id.OnSubmitted
	a.dialog.Resize(fyne.NewSize(min(s.core.Window.Canvas().Size().Width-30, 440), 260))
	a.dialog.Show()
	s.core.Window.Canvas().Focus(a.id)
	return a
}

func (a *asking) wind() bool {
	i := a.technology.SelectedIndex()
	return i >= 0 && hasWind(technologies[i].name)
}

// commit makes the option as one edit, or says in the form what is wrong.
func (a *asking) commit() {
	edits, err := a.edits()
	for _, e := range edits {
		if err == nil {
			err = run.CheckSetting(a.s.core.Parts.Catalog, a.s.core.Parts.Params, e.Key, e.Value, a.s.core.View().Snap.Turbines()...)
		}
	}
	if err != nil {
		a.fault.SetText(refusal(err))
		a.fault.Show()
		return
	}
	a.dialog.Hide()
	id := strings.TrimSpace(a.id.Text)
	what := "made the plant option " + strings.TrimSpace(a.title.Text)
	a.s.wanted = id
	a.s.core.Set("make the option", what, edits...)
}

func (a *asking) edits() ([]study.SettingEdit, error) {
	snap := a.s.core.View().Snap
	id, title := strings.TrimSpace(a.id.Text), strings.TrimSpace(a.title.Text)
	if err := checkID(snap, id); err != nil {
		return nil, err
	}
	if title == "" {
		return nil, errors.New("give the option a name")
	}
	if a.from != "" {
		return copied(snap, a.from, id, title), nil
	}
	i := a.technology.SelectedIndex()
	if i < 0 {
		return nil, errors.New("choose a technology")
	}
	key := "plant." + id + "."
	out := []study.SettingEdit{{Key: key + "title", Value: title}, {Key: key + "technology", Value: technologies[i].name}}
	if j := a.curve.SelectedIndex() - 1; a.wind() && j >= 0 {
		t := a.s.core.Parts.Params.Turbines[j]
		number := func(name string, x float64) {
			out = append(out, study.SettingEdit{Key: key + name, Value: strconv.FormatFloat(x, 'g', -1, 64), Source: t.Source, Reason: "of the reference curve " + t.Name})
		}
		out = append(out, study.SettingEdit{Key: key + "turbine", Value: t.ID, Source: t.Source, Reason: "chosen with the option"})
		number("rated_kw", t.RatedKW)
		number("rotor_diameter_m", t.RotorDiameterM)
		if t.HubHeightKnown {
			number("hub_height_m", t.HubHeightM)
		}
	}
	return out, nil
}
