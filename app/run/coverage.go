package run

import (
	"cmp"
	"slices"

	"groundtally/scoring"
)

// Coverage says for how many fitted candidates a consequence is known.
type Coverage struct {
	Key     string   `json:"key"`
	Known   int      `json:"known"` // a number, a class, never
	None    int      `json:"none"`  // no such effect
	Unknown int      `json:"unknown"`
	NotSet  int      `json:"not_set"`
	Not     int      `json:"not_assessed"`
	Why     []Reason `json:"why"` // of unknown and not set, the most frequent first
}

// Reason is a reason with the number of candidates that it holds for.
type Reason struct {
	Why   string `json:"why"`
	Count int    `json:"count"`
}

// Covered counts, for every consequence, for how many fitted candidates it is known.
func Covered(p *Params, r *Results) []Coverage {
	out := make([]Coverage, len(p.Keys()))
	whys := make([]map[string]int, len(out))
	for i, k := range p.Keys() {
		out[i].Key, whys[i] = k.Key, map[string]int{}
	}
	for n := range r.Candidates {
		c := &r.Candidates[n]
		if c.Status != Fitted {
			continue
		}
		for i := range out {
			q, ok := c.Consequence(out[i].Key)
			if !ok {
				out[i].Not++
				continue
			}
			switch q.State {
			case scoring.Number, scoring.Never, scoring.Class:
				out[i].Known++
			case scoring.None:
				out[i].None++
			case scoring.NotSet:
				out[i].NotSet++
				whys[i][q.Why]++
			case scoring.NotAssessed:
				out[i].Not++
			default:
				out[i].Unknown++
				whys[i][q.Why]++
			}
		}
	}
	for i := range out {
		out[i].Why = []Reason{}
		for _, w := range sortedNames(whys[i]) {
			out[i].Why = append(out[i].Why, Reason{w, whys[i][w]})
		}
		slices.SortStableFunc(out[i].Why, func(a, b Reason) int { return cmp.Compare(b.Count, a.Count) })
	}
	return out
}
