package run

import (
	"strings"

	"groundtally/app/study"
	"groundtally/geo"
	"groundtally/scoring/weigh"
)

// netShareKey is the consequence that stands in for ratios of energy return: from 10 to 20 such a ratio changes little
// of what is left after repayment, from 2 to 3 much.
const netShareKey = "net_share"

// returnScale tells when the first place under a voice hangs on weighing ratios of energy return on a straight scale:
// with the share left after repayment in their place another candidate would be first.
func returnScale(snap *study.Snapshot, p *Params, voice string, sc []scale, items []weigh.Item, at []int, cs []Candidate) (*geo.Notice, error) {
	var ratios []int
	for i, s := range sc {
		if strings.HasPrefix(s.key, "eroi_") {
			ratios = append(ratios, i)
		}
	}
	if len(ratios) == 0 || len(items) < 2 {
		return nil, nil
	}
	var share scale
	for _, k := range p.Keys() {
		if k.Key == netShareKey {
			one, c, err := scaleOf(snap, voice, k)
			if err != nil || c == nil {
				return nil, err
			}
			share = one
		}
	}
	first := func(value func(item int, k int) (weigh.Part, error)) (int, error) {
		best, score := -1, 0.0
		for i := range items {
			sum := 0.0
			for k, s := range sc {
				part, err := value(i, k)
				if err != nil {
					return 0, err
				}
				mid := 0.5 // as the order counts what is not known
				if part.Known {
					mid = part.Mid
				}
				sum += float64(s.raw * mid)
			}
			if best < 0 || sum > score {
				best, score = i, sum
			}
		}
		return best, nil
	}
	now, err := first(func(i, k int) (weigh.Part, error) { return items[i].Values[k], nil })
	if err != nil {
		return nil, err
	}
	then, err := first(func(i, k int) (weigh.Part, error) {
		if !strings.HasPrefix(sc[k].key, "eroi_") || at[i] < 0 { // doing nothing brings no return on either scale
			return items[i].Values[k], nil
		}
		q, _ := cs[at[i]].Consequence(netShareKey)
		return share.part(q, false)
	})
	if err != nil || now == then {
		return nil, err
	}
	return &geo.Notice{Code: "return_scale", Severity: geo.Warning, Field: sc[ratios[0]].key, Args: map[string]string{"first": items[now].ID, "other": items[then].ID}}, nil
}
