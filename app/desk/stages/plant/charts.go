package plant

import (
	"groundtally/app/draw"
	"groundtally/app/draw/chart"
	"groundtally/app/pictures"
	"groundtally/app/run"
)

// landOf gives the picture of what the rules take of a candidate's site.
func landOf(c *run.Candidate) func(draw.Palette, float64) *draw.Scene {
	in := pictures.Land(c, "What the rules take of "+c.Site, "taken")
	return func(p draw.Palette, width float64) *draw.Scene { return chart.TakenBars(in, p, width) }
}

// lossOf gives the picture of the loss chain of a candidate; nil without one.
func lossOf(c *run.Candidate) func(draw.Palette, float64) *draw.Scene {
	in, ok := pictures.Losses(c, "Losses of "+c.Site, "losses")
	if !ok {
		return nil
	}
	return func(p draw.Palette, width float64) *draw.Scene { return chart.Waterfall(in, p, width) }
}

// monthsOf gives the picture of the energy of a candidate by month, and what keeps months unknown.
func monthsOf(c *run.Candidate, course *run.Course) (do func(draw.Palette, float64) *draw.Scene, why string) {
	in, why := pictures.Months(course.Months, "Energy of "+c.Site+" by month", "months")
	return func(p draw.Palette, width float64) *draw.Scene { return chart.Monthly(in, p, width) }, why
}

// hoursOf gives the picture of the energy of a candidate by month and hour, or of its wind by direction; nil where
// neither is known.
func hoursOf(c *run.Candidate, course *run.Course) func(draw.Palette, float64) *draw.Scene {
	if course.Rose != nil {
		in := pictures.Rose(course.Rose, "Wind and energy of "+c.Site+" by direction", "rose")
		return func(p draw.Palette, width float64) *draw.Scene { return chart.WindRose(in, p, width) }
	}
	if course.Hours == nil {
		return nil
	}
	in := pictures.Hours(course, "Energy of "+c.Site+" by month and hour of the day", "hours")
	return func(p draw.Palette, width float64) *draw.Scene { return chart.DayByMonth(in, p, width) }
}

// curveOf gives the picture of a machine's curve over the wind at a candidate; nil where it is not known.
func curveOf(c *run.Candidate, course *run.Course) func(draw.Palette, float64) *draw.Scene {
	v := viewOf(course)
	if v == nil || v.Curve == nil {
		return nil
	}
	in := pictures.Curve(v.Curve, "Power of a turbine of "+c.Site+" over the wind", "curve")
	return func(p draw.Palette, width float64) *draw.Scene { return chart.CurveOverWind(in, p, width) }
}

// wakesOf gives the picture of what the wakes take of the wind around a candidate; nil where it is not known.
func wakesOf(c *run.Candidate, course *run.Course) func(draw.Palette, float64) *draw.Scene {
	v := viewOf(course)
	if v == nil || v.Wakes == nil {
		return nil
	}
	in := pictures.Wakes(v.Wakes, "Wakes of "+c.Site+" from above", "wakes")
	return func(p draw.Palette, width float64) *draw.Scene { return chart.WakeMap(in, p, width) }
}
