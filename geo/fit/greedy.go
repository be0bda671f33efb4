package fit

import (
	"math"

	"groundtally/geo"
)

const (
	greedyUpTo   = 30  // machines wanted up to which the greedy by energy is tried
	greedyFill   = 12  // machines up to which it is tried on a whole cluster
	greedyPoints = 300 // candidates that it takes
)

// thinned gives at most n of the positions, evenly drawn.
func thinned(ps []geo.XY, n int) []geo.XY {
	if len(ps) <= n {
		return ps
	}
	out := make([]geo.XY, n)
	for i := range out {
		out[i] = ps[i*len(ps)/n]
	}
	return out
}

// greedy adds to before, one after the other, the candidate that the Gain wants most of those that keep
// their distance, up to most machines; it gives the added ones.
//
// A gain worked out earlier in the layout's growth is taken as the most that it can be now (accelerated
// greedy: Minoux 1978, Lecture Notes in Control and Information Sciences 7), so that only the candidates in
// front are worked out again. That is exact for a Gain whose additions are worth less the more machines
// stand. Wakes added as squares bend that a little; the layout is then another greedy one.
func (j *job) greedy(candidates, before []geo.XY, most int) []geo.XY {
	type seat struct {
		p    geo.XY
		gain float64
		at   int // machines that stood when gain was worked out; -1 for never
	}
	var open []seat
	for _, p := range thinned(candidates, greedyPoints) {
		if free(p, before, -1) {
			open = append(open, seat{p, math.Inf(1), -1})
		}
	}
	all := append([]geo.XY(nil), before...)
	for len(open) > 0 && len(all)-len(before) < most {
		now := j.metres(all)
		best := 0
		for {
			best = 0
			for i, s := range open {
				if s.gain > open[best].gain {
					best = i
				}
			}
			if open[best].at == len(all) {
				break
			}
			d := j.in.Gain.Add(now, j.f.metres(open[best].p))
			if math.IsNaN(d) {
				d = math.Inf(-1)
			}
			open[best].gain, open[best].at = d, len(all)
		}
		p := open[best].p
		all = append(all, p)
		k := 0
		for _, s := range open {
			if apart(p, s.p) {
				open[k] = s
				k++
			}
		}
		open = open[:k]
	}
	return all[len(before):]
}
