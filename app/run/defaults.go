package run

import (
	"cmp"
	"fmt"
	"math"
	"slices"
	"strings"

	"groundtally/app/present"
	"groundtally/geo"
	"groundtally/scoring"
	"groundtally/scoring/energy"
	"groundtally/scoring/params"
	"groundtally/scoring/reckon"
	"groundtally/scoring/weigh"
)

// decidingPlaces is how far down an order it is looked at whether a default decides a place, and decidingSteps how
// often the value is tried by trials.
const (
	decidingPlaces = 10
	decidingSteps  = 6
)

// inventoryRow reports whether a factor is a row of the inventory, which counts what is built in energy and gas.
func inventoryRow(name string) bool {
	return strings.HasSuffix(name, ".mj") || strings.HasSuffix(name, ".kgco2e")
}

// inventoryFactor is a row of the inventory as shipped, in the graph.
type inventoryFactor struct {
	leaf int
	params.Factor
}

// decided is a row at one value of which two candidates change places.
type decided struct {
	inventoryFactor
	at, far float64 // the value, and how far it lies from the central one, of the way to the end of the range
}

// awayFrom gives how far a value lies from the central one of a factor, as a share of the way to that end of its range.
func awayFrom(central, low, high, x float64) float64 {
	if x < central {
		return (central - x) / (central - low)
	}
	return (x - central) / max(high-central, math.SmallestNonzeroFloat64)
}

// decidedByDefault tells of places near the top that hang on a row of the inventory as shipped: within the range that
// the row states for itself the next candidate would come before the one above it. The range moves along with the
// value. A first guess takes all else central; the row whose guess is nearest to its central value is then tried in the
// trials themselves.
func (k *reckoner) decidedByDefault(sc []scale, lines []weigh.Line, at []int, cs []Candidate) ([]geo.Notice, error) {
	d := &decider{k: k, sc: sc, slots: make([]int, len(sc))}
	leaves := k.p.Graph.Leaves()
	var reached []int
	for i, s := range sc {
		d.total += s.raw
		d.slots[i] = -1
		if slot, ok := k.p.Graph.Slot(s.key); ok {
			d.slots[i] = slot
			reached = append(reached, k.p.reaches[s.key]...)
		}
	}
	slices.Sort(reached)
	for _, leaf := range slices.Compact(reached) {
		if name := leaves[leaf].Name; inventoryRow(name) && !k.user[name] {
			f, _, err := k.factor(name)
			if err != nil {
				return nil, err
			}
			if f.Low < f.High {
				d.rows = append(d.rows, inventoryFactor{leaf, f})
			}
		}
	}
	var top []*deciding
	for _, l := range lines {
		if c := at[l.Item]; c >= 0 && len(top) < decidingPlaces {
			one := &deciding{c: &cs[c], score: l.Score, v: k.vector(&cs[c])}
			one.drawn = k.draws(one.c.Site, sigmas(one.c), one.v)
			top = append(top, one)
		}
	}
	var out []geo.Notice
	for i := 1; i < len(top); i++ {
		above, below := top[i-1], top[i]
		list, err := d.guess(above, below)
		if err != nil {
			return nil, err
		}
		for _, one := range list[:min(2, len(list))] {
			x, found, err := d.try(above, below, one)
			if err != nil {
				return nil, err
			}
			if !found {
				continue
			}
			l := leaves[one.leaf]
			out = append(out, geo.Notice{Code: "default_decides", Severity: geo.Warning, Args: map[string]string{"factor": l.Name,
				"place": fmt.Sprint(i), "above": above.c.ID(), "below": below.c.ID(), "row": factorWords.Replace(l.Title), "unit": l.Unit,
				"at": present.Exact(x), "central": present.Exact(one.Central), "low": present.Exact(one.Low), "high": present.Exact(one.High)}})
			break
		}
	}
	return out, nil
}

type decider struct {
	k     *reckoner
	sc    []scale
	slots []int // of each key; -1 outside the graph
	rows  []inventoryFactor
	total float64 // of the raw weights
}

type deciding struct {
	c     *Candidate
	score float64
	v     []scoring.Value
	drawn []reckon.Drawn
}

// guess lists the rows that may turn two candidates round, the nearest to its central value first.
func (d *decider) guess(above, below *deciding) ([]decided, error) {
	var out []decided
	for _, f := range d.rows {
		if !above.v[f.leaf].OK() || !below.v[f.leaf].OK() {
			continue
		}
		pair := [2][]scoring.Value{slices.Clone(above.v), slices.Clone(below.v)}
		advantage := func(x float64) (float64, error) {
			a, err := d.central(pair[0], f.leaf, x)
			if err != nil {
				return 0, err
			}
			b, err := d.central(pair[1], f.leaf, x)
			return a - b, err
		}
		now, err := advantage(f.Central)
		if err != nil {
			return nil, err
		}
		x, found, err := energy.SwapWithin(f.Low, f.High, func(x float64) (float64, error) {
			then, err := advantage(x)
			return above.score - below.score + then - now, err
		})
		if err != nil {
			return nil, fmt.Errorf("%s: %w", f.ID, err)
		}
		if found {
			out = append(out, decided{f, x, awayFrom(f.Central, f.Low, f.High, x)})
		}
	}
	slices.SortStableFunc(out, func(a, b decided) int { return cmp.Compare(a.far, b.far) })
	return out, nil
}

// central gives the score of the central values with a leaf at x.
func (d *decider) central(v []scoring.Value, leaf int, x float64) (float64, error) {
	v[leaf] = scoring.Num(x)
	d.k.p.Graph.Central(v)
	sum := 0.0
	for i, s := range d.sc {
		mid := 0.5
		if d.slots[i] >= 0 {
			switch y := v[d.slots[i]]; y.State {
			case scoring.Number, scoring.None, scoring.Never:
				var err error
				if mid, err = s.trial(y); err != nil {
					return 0, err
				}
			}
		}
		sum += float64(s.raw * mid)
	}
	return sum / d.total, nil
}

// try finds by trials at which value of a row two candidates change places, between the central value and that end of
// its range to which the guess points.
func (d *decider) try(above, below *deciding, one decided) (x float64, found bool, err error) {
	end := one.High
	if one.at < one.Central {
		end = one.Low
	}
	lead := func(x float64) (float64, error) {
		a, err := d.score(above, one.leaf, x/one.Central)
		if err != nil {
			return 0, err
		}
		b, err := d.score(below, one.leaf, x/one.Central)
		return a - b, err
	}
	lo, hi, yl := one.Central, end, above.score-below.score
	yh, err := lead(hi)
	if err != nil || yh >= 0 || yl < 0 {
		return 0, false, err
	}
	for range decidingSteps {
		x := (lo + hi) / 2
		switch y, err := lead(x); {
		case err != nil:
			return 0, false, err
		case y < 0:
			hi, yh = x, y
		default:
			lo, yl = x, y
		}
	}
	return lo + (hi-lo)*yl/(yl-yh), true, nil
}

// score gives the score of a candidate with a row and its whole range times a factor.
func (d *decider) score(one *deciding, leaf int, times float64) (float64, error) {
	k := d.k
	v := slices.Clone(one.v)
	v[leaf] = scoring.Num(v[leaf].X * times)
	k.p.Graph.Central(v)
	drawn := slices.Clone(one.drawn)
	for i := range drawn {
		if drawn[i].Slot == leaf {
			scaled := make([]float64, len(drawn[i].Values))
			for t, x := range drawn[i].Values {
				scaled[t] = x * times
			}
			drawn[i] = reckon.Drawn{Slot: leaf, Values: scaled}
		}
	}
	spreads, err := k.p.Graph.Trials(v, drawn, slices.DeleteFunc(slices.Clone(d.slots), func(slot int) bool { return slot < 0 }))
	if err != nil {
		return 0, err
	}
	sum := 0.0
	for i, s := range d.sc {
		q, _ := one.c.Consequence(s.key) // what the graph does not give keeps its value
		if slot := d.slots[i]; slot >= 0 {
			if x := v[slot]; x.State == scoring.Number {
				q.State, q.Low, q.High = x.State, x.X, x.X
				if spread := spreads[0]; spread.Moves && spread.Numbers > 0 {
					q.Low, q.High = min(spread.Low, x.X), max(spread.High, x.X)
				}
			}
			spreads = spreads[1:]
		}
		part, err := s.part(q, false)
		if err != nil {
			return 0, err
		}
		mid := 0.5 // as the order counts what is not known
		if part.Known {
			mid = part.Mid
		}
		sum += float64(s.raw * mid)
	}
	return sum / d.total, nil
}
