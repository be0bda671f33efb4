package run

import (
	"cmp"
	"fmt"
	"slices"
	"strings"

	"groundtally/app/present"
	"groundtally/geo"
	"groundtally/scoring"
	"groundtally/scoring/energy"
	"groundtally/scoring/params"
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

// decided is a row of the inventory at one value of which two candidates change places.
type decided struct {
	leaf    int
	f       params.Factor
	at, far float64 // the value, and how far it lies from the central one, of the way to the end of the range
}

// decidedByDefault tells of places near the top that hang on a row of the inventory as shipped: within the range that
// the row states for itself the next candidate would come before the one above it. The range moves along with the
// value. A first guess takes all else central; the row whose guess is nearest to its central value is then tried in the
// trials themselves.
func (k *reckoner) decidedByDefault(sc []scale, lines []weigh.Line, at []int, cs []Candidate) ([]geo.Notice, error) {
	d := &decider{k: k, sc: sc, slots: make([]int, len(sc))}
	leaves := k.p.Graph.Leaves()
	for i, s := range sc {
		d.total += s.raw
		slot, ok := k.p.Graph.Slot(s.key)
		if d.slots[i] = slot; !ok {
			d.slots[i] = -1
			continue
		}
		for _, leaf := range k.p.Graph.Reaches(s.key) {
			if l := leaves[leaf]; l.Kind == scoring.FactorLeaf && inventoryRow(l.Name) && !k.user[l.Name] && !slices.Contains(d.rows, leaf) {
				d.rows = append(d.rows, leaf)
			}
		}
	}
	slices.Sort(d.rows)
	var top []*deciding
	for _, l := range lines {
		if c := at[l.Item]; c >= 0 && len(top) < decidingPlaces {
			top = append(top, &deciding{c: &cs[c], score: l.Score, v: k.vector(&cs[c])})
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
				"at": present.Exact(x), "central": present.Exact(one.f.Central), "low": present.Exact(one.f.Low), "high": present.Exact(one.f.High)}})
			break
		}
	}
	return out, nil
}

type decider struct {
	k     *reckoner
	sc    []scale
	slots []int // of each key; -1 outside the graph
	rows  []int
	total float64 // of the raw weights
}

type deciding struct {
	c     *Candidate
	score float64
	v     []scoring.Value
}

// guess lists the rows that may turn two candidates round, the nearest to its central value first.
func (d *decider) guess(above, below *deciding) ([]decided, error) {
	var out []decided
	for _, leaf := range d.rows {
		name := d.k.p.Graph.Leaves()[leaf].Name
		f, _, err := d.k.factor(name)
		if err != nil {
			return nil, err
		}
		if !(f.Low < f.High) || !above.v[leaf].OK() || !below.v[leaf].OK() {
			continue
		}
		pair := [2][]scoring.Value{slices.Clone(above.v), slices.Clone(below.v)}
		advantage := func(x float64) (float64, error) {
			a, err := d.central(pair[0], leaf, x)
			if err != nil {
				return 0, err
			}
			b, err := d.central(pair[1], leaf, x)
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
			return nil, fmt.Errorf("%s: %w", name, err)
		}
		if !found {
			continue
		}
		one := decided{leaf: leaf, f: f, at: x, far: (x - f.Central) / (f.High - f.Central)}
		if x < f.Central {
			one.far = (f.Central - x) / (f.Central - f.Low)
		}
		out = append(out, one)
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
	end := one.f.High
	if one.at < one.f.Central {
		end = one.f.Low
	}
	lead := func(x float64) (float64, error) {
		a, err := d.score(above, one.leaf, x/one.f.Central)
		if err != nil {
			return 0, err
		}
		b, err := d.score(below, one.leaf, x/one.f.Central)
		return a - b, err
	}
	lo, hi, yl := one.f.Central, end, above.score-below.score
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
	drawn := k.draws(one.c.Site, sigmas(one.c), v)
	for i := range drawn {
		if drawn[i].Slot == leaf {
			scaled := make([]float64, len(drawn[i].Values))
			for t, x := range drawn[i].Values {
				scaled[t] = x * times
			}
			drawn[i].Values, drawn[i].Shared = scaled, false
		}
	}
	var want, of []int
	for i, slot := range d.slots {
		if slot >= 0 {
			want, of = append(want, slot), append(of, i)
		}
	}
	spreads, err := k.p.Graph.Trials(v, drawn, want)
	if err != nil {
		return 0, err
	}
	mids := make([]float64, len(d.sc))
	for i, s := range d.sc { // what the row does not reach keeps its value
		q, _ := one.c.Consequence(s.key)
		part, err := s.part(q, false)
		if err != nil {
			return 0, err
		}
		if mids[i] = 0.5; part.Known {
			mids[i] = part.Mid
		}
	}
	for j, i := range of {
		q := scoring.Consequence{State: v[want[j]].State, Low: v[want[j]].X, High: v[want[j]].X}
		if spread := spreads[j]; spread.Moves && spread.Numbers > 0 {
			q.Low, q.High = min(spread.Low, q.Low), max(spread.High, q.High)
		}
		if q.State != scoring.Number {
			continue
		}
		part, err := d.sc[i].part(q, false)
		if err != nil {
			return 0, err
		}
		mids[i] = part.Mid
	}
	sum := 0.0
	for i, s := range d.sc {
		sum += float64(s.raw * mids[i])
	}
	return sum / d.total, nil
}
