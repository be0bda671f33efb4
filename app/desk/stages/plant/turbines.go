package plant

import (
	"cmp"
	"fmt"
	"math"

	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/container"
	"fyne.io/fyne/v2/widget"

	"groundtally/app/desk/chartview"
	"groundtally/app/desk/widgets"
	"groundtally/app/pictures"
	"groundtally/app/present"
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
		for _, words := range layoutWords(l, len(c.Fit.Turbines)) {
			t.words.Add(flush(caption(words)))
		}
		for _, b := range l.Broken {
			t.words.Add(widgets.Warm(brokenWords(b)))
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

// layoutWords tells of a layout of some turbines, a line for each thing.
func layoutWords(l *run.Layout, n int) []string {
	var out []string
	if l.How != "" && l.How != byHand { // that is said with its reason above
		out = append(out, "Found by: "+l.How+".")
	}
	if l.MostByRule > 0 {
		words := fmt.Sprintf("Most that the spacing allows: %d at most", l.MostByRule)
		if l.MostBy != "" {
			words += " (" + l.MostBy + ")"
		}
		out = append(out, words+".")
	}
	if l.Asked > 0 {
		words := fmt.Sprintf("Wanted at most: %d", l.Asked)
		if by := cmp.Or(askers[l.AskedBy], l.AskedBy); by != "" {
			words += " (" + by + ")"
		}
		out = append(out, words+".")
	}
	if l.SpacingMet > 0 {
		out = append(out, fmt.Sprintf("The two nearest to each other stand at %.2f times the distance of the spacing rule.", l.SpacingMet))
	}
	if l.BoundMWh > 0 && l.WakedMWh > 0 {
		less := math.Max(0, 1-l.WakedMWh/l.BoundMWh)
		out = append(out, fmt.Sprintf("Energy behind wakes: %.1f %% below the bound of %s MWh a year (%s without any wake), before losses.", 100*less, present.Figure(l.BoundMWh, l.BoundMWh, l.BoundMWh), soMany(cmp.Or(l.MostByRule, n))))
	}
	return out
}

// askers says in words who wants no more turbines than so many.
var askers = map[string]string{"setting": "set for the option", "power": "by the power that is asked for", "spare capacity": "by the spare capacity of the network", "usual limit": "the usual limit"}

// byHand is what a layout says of itself that the user made.
const byHand = "by hand"

func soMany(n int) string {
	if n == 1 {
		return "one turbine"
	}
	return fmt.Sprintf("%d turbines", n)
}

// brokenWords tells of a rule that a turbine placed by hand does not keep.
func brokenWords(b run.Broken) string {
	who, m := fmt.Sprintf("Turbine %d", b.Turbine), ""
	if b.ByM > 0 {
		m = fmt.Sprintf("%.0f m ", math.Ceil(b.ByM))
	}
	another := "another"
	if b.Other > 0 {
		another = fmt.Sprintf("turbine %d", b.Other)
	}
	switch b.Rule {
	case "outside_ground":
		return who + " stands " + m + "outside the buildable ground"
	case "outside_site":
		return who + " stands " + m + "outside the site"
	case "too_near":
		return who + " stands " + m + "nearer to " + another + " than the spacing allows"
	case "near_existing":
		return who + " stands " + m + "nearer to a turbine of others than the spacing allows"
	case "touching":
		return who + ": its rotor could touch that of " + another
	}
	return who + ": " + present.Rule(b.Rule) + " is not kept"
}
