package plant

import (
	"fmt"
	"math"
	"strconv"

	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/container"
	"fyne.io/fyne/v2/widget"

	"groundtally/app/desk/chartview"
	"groundtally/app/desk/widgets"
	"groundtally/app/draw"
	"groundtally/app/draw/chart"
	"groundtally/app/pictures"
	"groundtally/app/present"
	"groundtally/app/run"
	"groundtally/app/study"
)

// crowding shows what a hectare gives against what comes back for what is spent, as spacing or ground cover changes, and
// has one of them chosen. It is worked out when it is asked for, since every layout is fitted and reckoned anew.
type crowding struct {
	f       *fitted
	all     *fyne.Container
	part    *widget.Select // of a plant of both
	ask     *widget.Button
	words   *widget.Label
	picture *chartview.Picture
	handle  *widget.Slider
	at      *widgets.Line
	take    *widget.Button
	of      *run.Candidate // whose curve is shown or asked for
	curve   *run.Crowded   // nil while it is not there
}

func newCrowding(f *fitted) *crowding {
	c := &crowding{f: f, words: widgets.NewText(""), at: widgets.NewLine("")}
	background := func(do func()) { f.s.background(do) }
	c.picture = chartview.New(f.s.core, background, func() { f.body.Refresh() })
	c.part = widget.NewSelect([]string{"spacing of turbines", "ground cover of panels"}, nil)
	c.part.SetSelectedIndex(0)
	c.part.OnChanged = func(string) {
		c.of, c.curve = nil, nil
		c.show()
		c.f.body.Refresh()
	}
	c.ask = widget.NewButton("Work out the crowding curve", c.find)
	c.handle = widget.NewSlider(0, 1)
	c.handle.OnChanged = func(float64) { c.moved() }
	c.take = widget.NewButton("Use this value for the option", c.use)
	head := widgets.Part("Crowding curve").Hinted("Energy from a hectare against the energy return over the life, as the spacing of turbines or the ground cover of panels changes on the buildable ground of this site. Each layout is fitted and reckoned as any candidate is.")
	c.all = container.NewVBox(head, container.NewHBox(c.part, c.ask), flush(c.words), c.picture, c.at, c.handle, container.NewHBox(c.take))
	c.update(nil)
	return c
}

// update shows the part for a candidate, which may be nil.
func (c *crowding) update(cand *run.Candidate) {
	visible(c.all, cand != nil && cand.Status == run.Fitted)
	if cand == c.of && cand != nil {
		return
	}
	c.of, c.curve = nil, nil
	visible(c.part, cand != nil && len(run.CrowdingParts(cand)) > 1)
	c.show()
}

// find asks for the curve of the shown candidate.
func (c *crowding) find() {
	cand := c.f.candidate()
	if cand == nil || cand == c.of {
		return
	}
	c.of, c.curve = cand, nil
	part := run.CrowdingParts(cand)[0]
	if part != "" {
		part = run.CrowdingParts(cand)[c.part.SelectedIndex()]
	}
	c.show()
	c.words.SetText("Fitting the plant at each value …")
	visible(c.words, true)
	c.f.s.core.Session.Crowding(cand, part, func(curve *run.Crowded, err error) {
		c.f.s.core.Do(func() {
			switch {
			case c.of != cand || curve != nil && curve.Part != "" && curve.Part != run.CrowdingParts(cand)[c.part.SelectedIndex()]:
				return
			case err != nil:
				c.of = nil
				c.show()
				c.words.SetText(present.Problem(err))
				visible(c.words, true)
			default:
				c.curve = curve
				c.show()
			}
			c.f.body.Refresh()
		})
	})
}

// show brings the part in line with what is known.
func (c *crowding) show() {
	visible(c.ask, c.of == nil)
	known := c.curve != nil && c.curve.Why == ""
	for _, o := range []fyne.CanvasObject{c.picture, c.at, c.handle, c.take} {
		visible(o, known)
	}
	text := ""
	if c.curve != nil {
		text = pictures.CrowdingWords(c.curve)
	}
	c.words.SetText(text)
	visible(c.words, text != "")
	if !known {
		c.picture.Set(nil)
		return
	}
	low, high := math.Inf(1), math.Inf(-1)
	for _, p := range c.curve.Points {
		low, high = math.Min(low, p.Swept), math.Max(high, p.Swept)
	}
	c.handle.Min, c.handle.Max, c.handle.Step = low, high, (high-low)/100
	value := low
	if m := c.curve.Chosen; m.Known {
		value = math.Min(high, math.Max(low, m.Swept))
	}
	c.handle.SetValue(value)
	c.moved()
}

// held is the value at the handle, as it is written into the option.
func (c *crowding) held() float64 { return math.Round(c.handle.Value*100) / 100 }

// moved tells what the value at the handle gives, and marks it on the curve.
func (c *crowding) moved() {
	if c.curve == nil || c.curve.Why != "" {
		return
	}
	shown := *c.curve
	shown.Chosen = c.curve.At(c.held())
	unit := ""
	if c.curve.SweptUnit != "" {
		unit = " " + c.curve.SweptUnit
	}
	text := fmt.Sprintf("%s %g%s", present.Upper(c.curve.Swept), c.held(), unit)
	if m := shown.Chosen; m.Known {
		text += fmt.Sprintf(": %s MWh a year from a hectare, return %.3g", present.Figure(m.MWhPerHaYr, m.MWhPerHaYr, m.MWhPerHaYr), m.EROI)
	}
	c.at.Set(text)
	in := pictures.Crowding(&shown, "Energy from a hectare against energy return of "+c.of.Site, "crowding")
	c.picture.Set(func(p draw.Palette, width float64) *draw.Scene { return chart.Crowding(in, p, width) })
}

// use writes the value at the handle into the option.
func (c *crowding) use() {
	if c.curve == nil || c.of == nil {
		return
	}
	x := c.held()
	write := func(x float64) string { return strconv.FormatFloat(x, 'g', 6, 64) }
	const why = "chosen on the crowding curve"
	key := "plant." + c.of.Plant + "."
	if c.of.Technology != "wind" && c.curve.Part != "wind" {
		c.f.s.core.Set("use the ground cover", why, study.SettingEdit{Key: key + "gcr", Value: write(x), Source: "crowding curve of " + c.of.Site, Reason: why})
		return
	}
	snap := c.f.s.core.View().Snap
	along, ok1 := snap.Number(key + "spacing_along_d")
	across, ok2 := snap.Number(key + "spacing_across_d")
	edits := []study.SettingEdit{{Key: key + "spacing_along_d", Value: write(x), Source: "crowding curve of " + c.of.Site, Reason: why}}
	if ok1 && ok2 && along > 0 {
		edits = append(edits, study.SettingEdit{Key: key + "spacing_across_d", Value: write(math.Round(100*x*across/along) / 100), Source: "crowding curve of " + c.of.Site, Reason: why})
	}
	c.f.s.core.Set("use the spacing", why, edits...)
}
