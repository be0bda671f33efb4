package pictures

import (
	"fmt"
	"strconv"
	"strings"

	"groundtally/app/draw/chart"
	"groundtally/app/present"
	"groundtally/app/run"
	"groundtally/geo"
	"groundtally/scoring"
)

// Land shows how the area of a candidate's site comes down to its buildable area. A rule that is not set
// takes an unknown area. id tells its hatching from that of other pictures on one page.
func Land(c *run.Candidate, title, id string) chart.Land {
	in := chart.Land{Title: title, ID: id, SharedHa: c.TakenSharedHa, ShapeHa: c.ShapeHa}
	sum := c.TakenSharedHa + c.ShapeHa
	for _, t := range c.Taken {
		in.Rules = append(in.Rules, chart.TakenRule{Item: t.Rule, Name: present.Rule(t.Rule), AloneHa: t.AloneHa, SharedHa: t.SharedHa, TakesAll: t.TakesAll})
		sum += t.AloneHa
	}
	for _, n := range c.Incomplete {
		if strings.Contains(n, ":") { // a rule and not a limit
			in.Rules = append(in.Rules, chart.TakenRule{Item: n, Name: present.Rule(n), Unknown: true})
		}
	}
	if q, ok := c.Consequence("buildable_area_ha"); ok && q.State == scoring.Number {
		in.BuildableHa = q.Central
	}
	in.GrossHa = sum + in.BuildableHa
	if q, ok := c.Consequence("gross_area_ha"); ok && q.State == scoring.Number {
		in.GrossHa = q.Central
	}
	return in
}

// Losses shows the loss chain of a candidate; ok is false where it has none.
func Losses(c *run.Candidate, title, id string) (in chart.Chain, ok bool) {
	in = chart.Chain{Title: title, ID: id, What: "yield of a year"}
	for _, st := range c.Chain {
		in.Steps = append(in.Steps, chart.Step{Item: st.Name, Name: present.Step(st.Name), Unit: st.Unit, Before: st.Before, Share: st.Share, After: st.After})
	}
	return in, len(c.Chain) > 0
}

// Hours shows the energy of a candidate by month and hour of the day.
func Hours(c *run.Course, title, id string) chart.DayMonths {
	return chart.DayMonths{Title: title, ID: id, What: "energy at the plant by hour of the day (" + c.Clock + ")", Unit: "MWh", Values: *c.Hours}
}

// Rose shows the wind of a candidate by direction.
func Rose(r *run.WindRose, title, id string) chart.Rose {
	out := chart.Rose{Title: title, ID: id, Even: r.Even}
	for _, x := range r.Sectors {
		out.Sectors = append(out.Sectors, chart.RoseSector{Time: x.Time, Energy: x.Energy, WakeLoss: x.WakeLoss, SpeedMPerS: x.SpeedMPerS})
	}
	return out
}

// Months shows the energy of a candidate by month, as run.Surveyor gives it. Why says what keeps months
// unknown; it is empty when all are known.
func Months(months [12]scoring.Value, title, id string) (in chart.Months, why string) {
	in = chart.Months{Title: title, ID: id, What: "energy at the plant", Unit: "MWh"}
	for m, v := range months {
		in.Values[m] = chart.Month{Item: fmt.Sprintf("month-%d", m+1), Value: v.X, Unknown: !v.OK()}
		if !v.OK() {
			why = present.Reason(v.Why)
		}
	}
	return in, why
}

// Curve gives a machine's power over the wind at hub height.
func Curve(c *run.WindCurve, title, id string) chart.PowerCurve {
	out := chart.PowerCurve{Title: title, ID: id, Machine: c.Machine, Published: c.Published, RatedKW: c.RatedKW, MeanSpeedMPerS: c.MeanSpeedMPerS, CutInMPerS: c.CutInMPerS, CutOutMPerS: c.CutOutMPerS}
	for _, b := range c.Bins {
		out.Bins = append(out.Bins, chart.SpeedBin(b))
	}
	return out
}

// Wakes gives what the wakes of a plant take of the wind around it.
func Wakes(w *run.WakeField, title, id string) chart.Wakes {
	out := chart.Wakes{Title: title, ID: id, Columns: w.Columns, Rows: w.Rows, StepM: w.StepM, X0M: w.X0M, Y0M: w.Y0M, Lost: w.Lost}
	for i, t := range w.Turbines {
		out.Turbines = append(out.Turbines, chart.WakeTurbine{X: t.X, Y: t.Y, RotorM: t.RotorM, Label: strconv.Itoa(i + 1), Loss: t.Loss})
	}
	for _, t := range w.Existing {
		out.Existing = append(out.Existing, chart.Rotor{X: t.X, Y: t.Y, RotorM: t.RotorM})
	}
	rings := func(from [][]geo.XY) (to [][]chart.Metres) {
		for _, r := range from {
			one := make([]chart.Metres, len(r))
			for i, p := range r {
				one[i] = chart.Metres(p)
			}
			to = append(to, one)
		}
		return to
	}
	out.Site, out.Buildable = rings(w.Site), rings(w.Buildable)
	return out
}

// WakeModels sets the losses by the models of wakes side by side; empty without any.
func WakeModels(models []run.WakeModelYield) string {
	if len(models) == 0 {
		return ""
	}
	var losses []string
	for _, m := range models {
		losses = append(losses, fmt.Sprintf("%s %.1f %%", strings.ReplaceAll(m.Model, "_", " "), 100*m.WakeLoss))
	}
	words := "Wake loss: " + strings.Join(losses, ", ") + "."
	if len(models) > 1 {
		words += " The results use the first; how far the others lie from it shows how well wakes are known."
	}
	return words
}
