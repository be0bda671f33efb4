package plant

import (
	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/container"
	"fyne.io/fyne/v2/widget"

	"groundtally/app/desk/chartview"
	"groundtally/app/desk/widgets"
	"groundtally/app/pictures"
	"groundtally/app/run"
)

// turbines shows how the turbines of the candidate came to stand where they stand, and what their wakes take.
type turbines struct {
	words      *fyne.Container // of the layout
	all        *fyne.Container // pictures and models, once they are computed
	head       *widgets.Line
	models     *widget.Label
	room       *fyne.Container // of models
	curve, lee *chartview.Picture
}

func newTurbines(f *fitted) *turbines {
	t := &turbines{words: container.NewVBox(), head: widgets.Part("Wind and wakes"), models: widgets.NewText("")}
	background := func(do func()) { f.s.background(do) }
	grew := func() { f.body.Refresh() }
	t.curve, t.lee = chartview.New(f.s.core, background, grew), chartview.New(f.s.core, background, grew)
	t.room = container.NewStack(flush(t.models))
	t.all = container.NewVBox(t.head, t.room, t.curve, t.lee)
	t.all.Hide()
	return t
}

// update shows the words of a candidate's layout; nil for no candidate.
func (t *turbines) update(c *run.Candidate) {
	t.words.Objects = nil
	if c == nil {
		visible(t.all, false)
		return
	}
	if l := layoutOf(c); l != nil {
		for _, words := range pictures.LayoutWords(l, len(c.Fit.Turbines)) {
			t.words.Add(flush(caption(words)))
		}
		for _, b := range l.Broken {
			t.words.Add(widgets.Warm(pictures.BrokenWords(b)))
		}
	}
}

// course shows what is found of a candidate's wakes; nil while it is being found.
func (t *turbines) course(c *run.Candidate, course *run.Course) {
	if course == nil {
		t.curve.Set(nil)
		t.lee.Set(nil)
		visible(t.all, false)
		return
	}
	curve, lee, models := curveOf(c, course), wakesOf(c, course), ""
	if v := viewOf(course); v != nil {
		models = pictures.WakeModels(v.Models)
	}
	t.models.SetText(models)
	visible(t.room, models != "")
	visible(t.curve, curve != nil)
	visible(t.lee, lee != nil)
	visible(t.all, models != "" || curve != nil || lee != nil)
	t.curve.Set(curve)
	t.lee.Set(lee)
}

// layoutOf gives how the turbines of a candidate came to stand where they do; nil where that is not known.
func layoutOf(c *run.Candidate) *run.Layout {
	if c.Fit == nil {
		return nil
	}
	return c.Fit.Layout
}

// viewOf gives what is shown of the turbines over the year; nil where that is not known.
func viewOf(course *run.Course) *run.TurbineView {
	if course == nil {
		return nil
	}
	return course.Turbines
}

func soMany(n int) string { return pictures.SoMany(n) }
