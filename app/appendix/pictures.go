package appendix

import (
	"fmt"
	"html/template"
	"strconv"

	"groundtally/app/draw"
	"groundtally/app/draw/chart"
	"groundtally/app/present"
	"groundtally/app/run"
	"groundtally/scoring"
)

// Widths of the pictures, in their own units: across the page, or half of it beside a table.
const (
	fullWidth = 1000
	halfWidth = 560
)

// bars draws the scores of a voice by their parts.
func (b *book) bars(rows []run.Row, keys []string, title string, index int) *draw.Scene {
	in := chart.Scores{ID: "-" + strconv.Itoa(index+1),
		Title: fmt.Sprintf("Bar chart: scores under the voice %s, by part, for %d places; the same figures stand in the table below it", title, len(rows))}
	for _, k := range keys {
		in.Keys = append(in.Keys, chart.ScoreKey{Title: b.title(k), Weight: rows[0].Parts[k].Weight})
	}
	for _, r := range rows {
		row := chart.ScoreRow{Name: fmt.Sprintf("%d. %s", r.Place, b.candidateName(rowID(r))), Score: r.Score, Low: r.ScoreLow, High: r.ScoreHigh}
		if len(r.OverLimit) > 0 {
			row.Over = "over the limit: " + b.titles(r.OverLimit)
		}
		for _, k := range keys {
			p := r.Parts[k]
			row.Parts = append(row.Parts, chart.ScorePart{Share: p.Share, Unknown: p.Value == nil})
		}
		in.Rows = append(in.Rows, row)
	}
	return chart.ScoreBars(in, draw.Light(), fullWidth)
}

// losses draws the loss chain of a candidate; nothing where it has none.
func losses(c *run.Candidate, title string) template.HTML {
	if len(c.Chain) == 0 {
		return ""
	}
	in := chart.Chain{Title: "Bar chart: yield of " + title + " step by step; the same steps stand in the table above it", What: "yield of a year"}
	for _, st := range c.Chain {
		in.Steps = append(in.Steps, chart.Step{Name: present.Step(st.Name), Unit: st.Unit, Before: st.Before, Share: st.Share, After: st.After})
	}
	return picture(chart.Waterfall(in, draw.Light(), halfWidth))
}

// land draws how the area of a candidate's site comes down to its buildable area. A rule that is not set
// takes an unknown area; its hatching needs a name of its own on the page.
func land(c *run.Candidate, title, id string) template.HTML {
	in := chart.Land{Title: "Bar chart: area of the site of " + title + ", taken by each rule or buildable; the same figures stand in the table above it", ID: id,
		SharedHa: c.TakenSharedHa, ShapeHa: c.ShapeHa}
	sum := c.TakenSharedHa + c.ShapeHa
	for _, t := range c.Taken {
		in.Rules = append(in.Rules, chart.TakenRule{Name: present.Rule(t.Rule), AloneHa: t.AloneHa, SharedHa: t.SharedHa, TakesAll: t.TakesAll})
		sum += t.AloneHa
	}
	for _, n := range c.Incomplete {
		in.Rules = append(in.Rules, chart.TakenRule{Name: present.Rule(n), Unknown: true})
	}
	if q, ok := c.Consequence("buildable_area_ha"); ok && q.State == scoring.Number {
		in.BuildableHa = q.Central
	}
	in.GrossHa = sum + in.BuildableHa
	if q, ok := c.Consequence("gross_area_ha"); ok && q.State == scoring.Number {
		in.GrossHa = q.Central
	}
	return picture(chart.TakenBars(in, draw.Light(), halfWidth))
}
