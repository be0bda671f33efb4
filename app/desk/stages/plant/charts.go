package plant

import (
	"strings"

	"groundtally/app/draw"
	"groundtally/app/draw/chart"
	"groundtally/app/present"
	"groundtally/app/run"
	"groundtally/scoring"
)

// landOf gives the picture of what the rules take of a candidate's site.
func landOf(c *run.Candidate) func(draw.Palette, float64) *draw.Scene {
	number := func(key string) float64 {
		if q, ok := c.Consequence(key); ok && q.State == scoring.Number {
			return q.Central
		}
		return 0
	}
	land := chart.Land{Title: "What the rules take of " + c.Site, ID: "taken", GrossHa: number("gross_area_ha"), BuildableHa: number("buildable_area_ha"), SharedHa: c.TakenSharedHa, ShapeHa: c.ShapeHa}
	for _, t := range c.Taken {
		land.Rules = append(land.Rules, chart.TakenRule{Item: t.Rule, Name: present.Rule(t.Rule), AloneHa: t.AloneHa, SharedHa: t.SharedHa, TakesAll: t.TakesAll})
	}
	for _, r := range c.Incomplete {
		if strings.Contains(r, ":") { // a rule and not a limit
			land.Rules = append(land.Rules, chart.TakenRule{Item: r, Name: present.Rule(r), Unknown: true})
		}
	}
	return func(p draw.Palette, width float64) *draw.Scene { return chart.TakenBars(land, p, width) }
}

// lossOf gives the picture of the loss chain of a candidate; nil without one.
func lossOf(c *run.Candidate) func(draw.Palette, float64) *draw.Scene {
	if len(c.Chain) == 0 {
		return nil
	}
	chain := chart.Chain{Title: "Losses of " + c.Site, ID: "losses", What: "yield of a year"}
	for _, st := range c.Chain {
		chain.Steps = append(chain.Steps, chart.Step{Item: st.Name, Name: present.Step(st.Name), Unit: st.Unit, Before: st.Before, Share: st.Share, After: st.After})
	}
	return func(p draw.Palette, width float64) *draw.Scene { return chart.Waterfall(chain, p, width) }
}
