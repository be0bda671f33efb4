package pictures

import (
	"slices"

	"groundtally/app/draw/chart"
	"groundtally/app/present"
	"groundtally/app/run"
	"groundtally/scoring"
)

// Cloud shows the fitted candidates by two consequences; those without a number in both are counted. An
// empty plant takes all options. Titles are those of plant options, marks stand at candidates by id.
func Cloud(results *run.Results, keys [2]run.KeyInfo, better [2]chart.Better, plant string, titles, marks map[string]string) chart.Cloud {
	quantity := func(i int) chart.Quantity {
		return chart.Quantity{Title: keys[i].Title, Unit: present.UnitWords(keys[i].Unit), Better: better[i]}
	}
	out := chart.Cloud{Title: keys[0].Title + " against " + keys[1].Title, X: quantity(0), Y: quantity(1)}
	for i := range results.Candidates {
		c := &results.Candidates[i]
		if c.Status != run.Fitted || plant != "" && c.Plant != plant {
			continue
		}
		x, _ := c.Consequence(keys[0].Key)
		y, _ := c.Consequence(keys[1].Key)
		if x.State != scoring.Number || y.State != scoring.Number {
			out.LeftOut++
			continue
		}
		out.Points = append(out.Points, chart.CloudPoint{Item: c.ID(), Name: c.Site + ", " + titles[c.Plant], X: x.Central, Y: y.Central, XLow: x.Low, XHigh: x.High, YLow: y.Low, YHigh: y.High,
			Mark: marks[c.ID()], Over: slices.Contains(c.OverLimit, keys[0].Key) || slices.Contains(c.OverLimit, keys[1].Key)})
	}
	return out
}

// Pair shows two rows of an order against each other, consequence by consequence. The candidates are nil
// for doing nothing.
func Pair(rows [2]run.Row, candidates [2]*run.Candidate, names [2]string, keys []run.KeyInfo, title, id string) chart.Pair {
	out := chart.Pair{Title: title, ID: id, NameA: names[0], NameB: names[1]}
	for _, k := range keys {
		a, b := rows[0].Parts.Of(k.Key), rows[1].Parts.Of(k.Key)
		one := chart.PairKey{Item: k.Key, Title: k.Title, Difference: a.Share - b.Share, Unknown: !a.Known || !b.Known,
			OverA: slices.Contains(rows[0].OverLimit, k.Key), OverB: slices.Contains(rows[1].OverLimit, k.Key)}
		for i, words := range []*string{&one.A, &one.B} {
			*words = "nothing is built"
			if c := candidates[i]; c != nil {
				q, _ := c.Consequence(k.Key)
				*words = present.Value(q)
			}
		}
		out.Keys = append(out.Keys, one)
	}
	return out
}
