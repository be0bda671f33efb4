package weigh

import (
	"cmp"
	"fmt"
	"slices"
	"strings"

	"groundtally/app/desk/core"
	"groundtally/app/draw"
	"groundtally/app/draw/chart"
)

// barRows is how many places the picture of the order shows.
const barRows = 20

// scoresOf gives what the picture of an order shows of the items: what has a weight, the heaviest first.
func scoresOf(c *core.Core, sh *shown, items []int) chart.Scores {
	st := &sh.Standing
	in := chart.Scores{ID: "order", Title: fmt.Sprintf("Scores by part, %d places", len(items))}
	var keys []int
	for k := range sh.Board.Keys {
		if st.Weights[k] > 0 {
			keys = append(keys, k)
		}
	}
	slices.SortFunc(keys, func(a, b int) int {
		return cmp.Or(cmp.Compare(st.Weights[b], st.Weights[a]), cmp.Compare(sh.Board.Keys[a].Info.Key, sh.Board.Keys[b].Info.Key))
	})
	for _, k := range keys {
		in.Keys = append(in.Keys, chart.ScoreKey{Category: k, Title: sh.Board.Keys[k].Info.Title, Weight: st.Weights[k]})
	}
	for _, item := range items {
		id := sh.Board.IDs[item]
		row := chart.ScoreRow{Item: id, Name: fmt.Sprintf("%d. %s", st.Place[item], c.IDTitle(id)), Score: st.Score[item], Low: st.Low[item], High: st.High[item]}
		if cand := sh.candidate(item); cand != nil && len(cand.OverLimit) > 0 {
			var titles []string
			for _, key := range cand.OverLimit {
				titles = append(titles, c.Info(key).Title)
			}
			row.Over = "over the limit: " + strings.Join(titles, ", ")
		}
		for _, k := range keys {
			_, mid, _ := sh.Board.Share(st, item, k)
			row.Parts = append(row.Parts, chart.ScorePart{Share: mid, Unknown: !sh.Board.Part(item, k).Known})
		}
		in.Rows = append(in.Rows, row)
	}
	return in
}

// drawBars shows the first places as a picture, the one of the appendix, where that is asked for.
func (o *order) drawBars() {
	if !o.pictured || o.filtered == nil {
		return
	}
	rows := o.rows()
	in := scoresOf(o.s.c, o.filtered, rows[:min(len(rows), barRows)])
	o.bars.set(func(p draw.Palette, width float64) *draw.Scene { return chart.ScoreBars(in, p, width) })
}
