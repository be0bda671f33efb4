package grid

import (
	"slices"
	"strings"
)

// Choice points into the list of assessments; -1 where there is none.
type Choice struct {
	Picked   int    // the asset to use
	Status   Status // its status, to be printed with it; empty when nothing is picked
	Adequate int    // least effort among the adequate
	Unknown  int    // least effort among the unknown: might be cheaper, ask
	Partly   int    // least effort among those that take a part
}

// Choose picks the asset of least effort.
//
// Adequate assets come first; without one the best unknown is picked and labelled, then the best that
// takes a part. Assets of unknown voltage stand behind the other unknowns. Efforts within 5 % of the
// least are a tie: the lower loss wins, then the shorter route, then the id. An asset that is not adequate
// is never picked. The result does not depend on the order of the list.
func (m *Model) Choose(list []Assessment) Choice {
	c := Choice{Picked: -1}
	c.Adequate = m.least(list, func(a Assessment) bool { return a.Status == Adequate })
	c.Unknown = m.least(list, func(a Assessment) bool { return a.Status == Unknown && !a.VoltageAssumed })
	if c.Unknown < 0 {
		c.Unknown = m.least(list, func(a Assessment) bool { return a.Status == Unknown })
	}
	c.Partly = m.least(list, func(a Assessment) bool { return a.Status == Partly })
	for _, i := range []int{c.Adequate, c.Unknown, c.Partly} {
		if i >= 0 {
			c.Picked, c.Status = i, list[i].Status
			break
		}
	}
	return c
}

func (m *Model) least(list []Assessment, ok func(Assessment) bool) int {
	lowest, found := 0.0, false
	for _, a := range list {
		if ok(a) && (!found || a.Effort.Central < lowest) {
			lowest, found = a.Effort.Central, true
		}
	}
	if !found {
		return -1
	}
	var tied []int
	for i, a := range list {
		if ok(a) && a.Effort.Central <= lowest*(1+m.tie) {
			tied = append(tied, i)
		}
	}
	return slices.MinFunc(tied, func(i, j int) int {
		a, b := list[i], list[j]
		// A figure that was not computed cannot win a tie.
		if a.Computed != b.Computed {
			if a.Computed {
				return -1
			}
			return 1
		}
		for _, p := range [][2]float64{{a.LossFrac.Central, b.LossFrac.Central}, {a.RouteKm.Central, b.RouteKm.Central}} {
			switch {
			case p[0] < p[1]:
				return -1
			case p[0] > p[1]:
				return 1
			}
		}
		if d := strings.Compare(a.ID, b.ID); d != 0 {
			return d
		}
		return strings.Compare(string(a.Level), string(b.Level))
	})
}
