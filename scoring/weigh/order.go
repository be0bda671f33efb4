package weigh

import (
	"errors"
	"fmt"
	"slices"
	"strings"
)

// Part is the value of one item on one key.
type Part struct {
	// Known is false for an unknown part; its numbers must then be zero and are not used.
	Known bool
	// Low, Mid and High are values from 0 to 1, Low <= Mid <= High. Mid is what the share is built on;
	// with Mid in the middle, as PartOf gives it, the score is the middle of its interval.
	Low, Mid, High float64
	// OutsideAnchor marks a consequence beyond the anchors, whose value was clamped. OverLimit marks
	// one over a limit. Both are passed through and change no score.
	OutsideAnchor, OverLimit bool
}

// Item is one candidate, or the row of doing nothing, with one Part per key.
type Item struct {
	ID     string
	Values []Part
}

// Key is one consequence that a voice weighs. RawWeight is in swing points, at least 0.
type Key struct {
	Name, Account string
	RawWeight     float64
}

// Defaults of Input (common practice; all can be set).
const (
	DefaultMixes           = 100
	DefaultMixSpread       = 0.5
	DefaultAlertPlaces     = 10
	DefaultAlertBelow      = 0.1
	DefaultMaxDominators   = 3
	DefaultDominancePlaces = 20_000
	DefaultMaxPrograms     = 2_000
)

// MaxMixSpread is the widest spread: at 1 all weights could vanish together, and nothing would follow
// from comparing scores.
const MaxMixSpread = 0.99

// Input is what Order needs. A zero in a field from Mixes on stands for its default.
type Input struct {
	Items []Item
	Keys  []Key
	Seed  uint64
	// Mixes is the number of weight mixes. In each, every raw weight is multiplied by its own factor
	// between 1 - MixSpread and 1 + MixSpread. MixSpread lies above 0 and at most at MaxMixSpread.
	Mixes     int
	MixSpread float64
	Trials    *Trials // nil: known parts keep their middle values in all mixes
	// AlertPlaces and AlertBelow: a known value below AlertBelow on any key is an alert for the items
	// up to place AlertPlaces.
	AlertPlaces int
	AlertBelow  float64
	// MaxDominators is how many dominators are named for one item. DominancePlaces is how many places,
	// from the first down, are searched for dominators, MaxPrograms how many items are decided by a
	// linear program; what was not looked at is marked so. They count steps, not time, so that results
	// do not depend on the machine.
	MaxDominators, DominancePlaces, MaxPrograms int
}

// KeyWeight is a key with its weight, w = raw / sum of raw.
type KeyWeight struct {
	Key
	Weight float64
}

// Dominator names an item that is at least as good on every weighed key and better on one.
type Dominator struct {
	ID   string
	Sure bool // it dominates whatever values both take within their intervals
}

// Line is one item in the order.
type Line struct {
	Place int // 1 is the first
	Item  int // index in Input.Items
	ID    string
	// Tier and EarliestTier: see Tiers.
	Tier, EarliestTier         int
	Score, ScoreLow, ScoreHigh float64
	RankBest, RankWorst        int // see RankIntervals
	// CanBeFirst says whether weights within the spread, and values within the intervals, exist that
	// make the item first or level with the first. Witness are such weights, adding up to 1.
	CanBeFirst Status
	Proof      Proof
	Witness    []float64
	FirstIn    int // mixes in which the item came first, of Result.Mixes
	// DominatedBy names the best placed items that dominate this one. It is empty without meaning when
	// DominanceKnown is false: a weighed part is unknown, or the search ended above this line.
	DominatedBy    []Dominator
	DominanceKnown bool
	// Names of keys in the order of Result.Keys: over a limit, unknown, outside the anchors, and
	// (for the first places) with a very low value that others make up for in the score.
	OverLimit, Unknown, OutsideAnchor, Alerts []string
}

// Reversal names the rival that the smallest change of weights puts level with the leader.
type Reversal struct {
	ID     string
	Factor float64 // see ReversalFactor
}

// Result is an order with everything that belongs to it. Parts and Accounts unfold a line.
type Result struct {
	Keys    []KeyWeight
	Lines   []Line // by place
	Tipping []Tipping
	// Closest is nil when no rival can reach the leader by weights alone.
	Closest   *Reversal
	Seed      uint64
	Mixes     int
	MixSpread float64
	// Programs is how many items needed a linear program to answer CanBeFirst.
	Programs int
	items    []Item
}

// FirstInHundred gives in how many of 100 weight mixes the line came first; with another number of
// mixes it is their share, and need not be whole.
func (r Result) FirstInHundred(l Line) float64 {
	return 100 * float64(l.FirstIn) / float64(r.Mixes)
}

// PartShare is one key's part of a score. An unknown part (Known false) has no value; its share is half
// its weight, ShareLow 0 and ShareHigh its weight.
type PartShare struct {
	Key, Account               string
	Weight                     float64
	Known                      bool
	Low, Value, High           float64
	Share, ShareLow, ShareHigh float64
	OutsideAnchor, OverLimit   bool
}

// AccountShare is the sum of the shares of one account.
type AccountShare struct {
	Account          string
	Share, Low, High float64
}

// Parts gives a line's parts in the order of the keys. Its shares, added in that order, give the score
// bit for bit; so do ShareLow and ShareHigh for the ends of the interval.
func (r Result) Parts(l Line) []PartShare {
	out := make([]PartShare, len(r.Keys))
	for k, key := range r.Keys {
		p := r.items[l.Item].Values[k]
		s := PartShare{Key: key.Name, Account: key.Account, Weight: key.Weight, Known: p.Known,
			Low: p.Low, Value: p.Mid, High: p.High, OutsideAnchor: p.OutsideAnchor, OverLimit: p.OverLimit}
		low, mid, high := bounds(p)
		s.ShareLow, s.Share, s.ShareHigh = float64(key.Weight*low), float64(key.Weight*mid), float64(key.Weight*high)
		out[k] = s
	}
	return out
}

// Accounts gives the sum of a line's shares by account, in the order in which the accounts first appear
// among the keys.
func (r Result) Accounts(l Line) []AccountShare {
	var out []AccountShare
	for _, p := range r.Parts(l) {
		i := slices.IndexFunc(out, func(a AccountShare) bool { return a.Account == p.Account })
		if i < 0 {
			i = len(out)
			out = append(out, AccountShare{Account: p.Account})
		}
		out[i].Share += p.Share
		out[i].Low += p.ShareLow
		out[i].High += p.ShareHigh
	}
	return out
}

// bounds gives the values that a part stands for in a score.
func bounds(p Part) (low, mid, high float64) {
	if !p.Known {
		return 0, 0.5, 1
	}
	return p.Low, p.Mid, p.High
}

// matrix holds the values of all items row-major.
type matrix struct {
	n, d           int
	w              []float64
	weighed        []int // keys with a weight above 0
	low, mid, high []float64
	complete       []bool // every weighed part is known
	marked         []bool // a part is unknown, over its limit or outside its anchors
	anyUnknown     bool
	ids            []string
	items          []Item
}

func (m *matrix) midRow(i int) []float64  { return m.mid[i*m.d : i*m.d+m.d] }
func (m *matrix) lowRow(i int) []float64  { return m.low[i*m.d : i*m.d+m.d] }
func (m *matrix) highRow(i int) []float64 { return m.high[i*m.d : i*m.d+m.d] }
func (m *matrix) unknown(i, k int) bool   { return !m.items[i].Values[k].Known }
func (m *matrix) byID(a, b int) int       { return strings.Compare(m.ids[a], m.ids[b]) }

// newMatrix checks the input, puts the defaults into its zero fields, and lays out the values.
func newMatrix(in *Input) (*matrix, error) {
	for _, f := range []struct {
		name string
		p    *int
		def  int
	}{
		{"mixes", &in.Mixes, DefaultMixes}, {"alert places", &in.AlertPlaces, DefaultAlertPlaces},
		{"dominators", &in.MaxDominators, DefaultMaxDominators},
		{"places", &in.DominancePlaces, DefaultDominancePlaces}, {"programs", &in.MaxPrograms, DefaultMaxPrograms},
	} {
		if *f.p < 0 {
			return nil, fmt.Errorf("order: the number of %s is %d", f.name, *f.p)
		}
		if *f.p == 0 {
			*f.p = f.def
		}
	}
	if in.MixSpread == 0 {
		in.MixSpread = DefaultMixSpread
	}
	if in.AlertBelow == 0 {
		in.AlertBelow = DefaultAlertBelow
	}
	if !(in.MixSpread > 0 && in.MixSpread <= MaxMixSpread) {
		return nil, fmt.Errorf("order: the spread of the mixes is %v, want above 0 and at most %v", in.MixSpread, MaxMixSpread)
	}
	if !(in.AlertBelow > 0 && in.AlertBelow <= 1) {
		return nil, fmt.Errorf("order: the alert value is %v, want above 0 and at most 1", in.AlertBelow)
	}
	if len(in.Keys) == 0 {
		return nil, errors.New("order: no key")
	}
	raw, names := make([]float64, len(in.Keys)), make(map[string]bool, len(in.Keys))
	for k, key := range in.Keys {
		if names[key.Name] {
			return nil, fmt.Errorf("order: key %q stands twice", key.Name)
		}
		names[key.Name] = true
		raw[k] = key.RawWeight
	}
	w, err := Swing(raw)
	if err != nil {
		return nil, fmt.Errorf("order: %w", err)
	}
	n, d := len(in.Items), len(in.Keys)
	m := &matrix{n: n, d: d, w: w, items: in.Items, ids: make([]string, n), complete: make([]bool, n), marked: make([]bool, n),
		low: make([]float64, n*d), mid: make([]float64, n*d), high: make([]float64, n*d)}
	for k := range w {
		if w[k] > 0 {
			m.weighed = append(m.weighed, k)
		}
	}
	seen := make(map[string]bool, n)
	for i := range in.Items {
		it := &in.Items[i]
		if it.ID == "" || seen[it.ID] {
			return nil, fmt.Errorf("order: item %d has the id %q, which is empty or stands twice", i+1, it.ID)
		}
		seen[it.ID] = true
		if len(it.Values) != d {
			return nil, fmt.Errorf("order: item %q has %d values for %d keys", it.ID, len(it.Values), d)
		}
		m.ids[i], m.complete[i] = it.ID, true
		for k := range it.Values {
			p := &it.Values[k]
			if p.Known {
				// Written so that NaN fails too.
				if !(p.Low >= 0 && p.Low <= p.Mid && p.Mid <= p.High && p.High <= 1) {
					return nil, fmt.Errorf("order: item %q, key %q: values %v, %v, %v do not rise within 0 and 1", it.ID, in.Keys[k].Name, p.Low, p.Mid, p.High)
				}
			} else {
				if p.Low != 0 || p.Mid != 0 || p.High != 0 {
					return nil, fmt.Errorf("order: item %q, key %q is unknown, yet has a value", it.ID, in.Keys[k].Name)
				}
				m.anyUnknown = true
				m.complete[i] = m.complete[i] && w[k] == 0
			}
			m.marked[i] = m.marked[i] || !p.Known || p.OverLimit || p.OutsideAnchor
			m.low[i*d+k], m.mid[i*d+k], m.high[i*d+k] = bounds(*p)
		}
	}
	return m, nil
}

// Order orders the items under the weights of the keys.
//
//	S_i = sum_k share_ik,   share_ik = w_k v_ik,   w_k = raw_k / sum raw
//
// v_ik is the middle value of a known part; an unknown part has the share w_k/2. The score is the sum of
// the shares in key order, its interval the sums of w_k low_ik and w_k high_ik, with 0 and w_k for an
// unknown part. Items are placed by falling score. Scores in one step of a fixed grid of 1e-9 are
// level and placed by id, except that a dominated item always comes after its dominators. No item's
// score, interval or flags depend on any other item.
//
// In the mixes a known part has its middle value, or that of its trial; an unknown part gets a uniform
// draw from 0 to 1 by seed, mix and id. Level scores in a mix go to the item that stands higher in the
// order. All draws are independent of the order of the items and of the number of cores.
//
// Limits are flags: they neither change a score nor can a score make up for them.
// Sources: Keeney and Raiffa 1976 (score); Lahdelma, Hokkanen and Salminen 1998 (first in mixes).
func Order(in Input) (Result, error) {
	m, err := newMatrix(&in)
	if err != nil {
		return Result{}, err
	}
	r := Result{Seed: in.Seed, Mixes: in.Mixes, MixSpread: in.MixSpread, items: in.Items}
	for k, key := range in.Keys {
		r.Keys = append(r.Keys, KeyWeight{key, m.w[k]})
	}
	score, low, high := make([]float64, m.n), make([]float64, m.n), make([]float64, m.n)
	for i := range m.n {
		score[i], low[i], high[i] = dot(m.w, m.midRow(i)), dot(m.w, m.lowRow(i)), dot(m.w, m.highRow(i))
	}
	order := m.sorted(score)

	set := newSpread(m.w, in.MixSpread)
	firstIn, won, err := m.firstInMixes(&in, set, order)
	if err != nil {
		return Result{}, err
	}
	best, worst, err := RankIntervals(low, high)
	if err != nil {
		return Result{}, err
	}
	lowByPlace, highByPlace := make([]float64, m.n), make([]float64, m.n)
	for p, i := range order {
		lowByPlace[p], highByPlace[p] = low[i], high[i]
	}
	tier, earliest := Tiers(lowByPlace, highByPlace)
	dominators := m.dominators(order, in.DominancePlaces, in.MaxDominators)
	first := newFirstOf(m, set, order)

	r.Lines = make([]Line, m.n)
	for p, i := range order {
		l := &r.Lines[p]
		*l = Line{Place: p + 1, Item: i, ID: m.ids[i], Tier: tier[p], EarliestTier: earliest[p],
			Score: score[i], ScoreLow: low[i], ScoreHigh: high[i], RankBest: best[i], RankWorst: worst[i],
			FirstIn: firstIn[i], DominanceKnown: m.complete[i] && p < len(dominators)}
		if p < len(dominators) {
			for _, q := range dominators[p] {
				l.DominatedBy = append(l.DominatedBy, Dominator{m.ids[order[q]], m.surely(order[q], i)})
			}
		}
		if m.marked[i] || p < in.AlertPlaces {
			m.mark(l, &in)
		}
		r.Programs += first.answer(l, &in, won[i], in.MaxPrograms-r.Programs)
	}
	r.Tipping = m.tipping(order, score, in.Keys)
	r.Closest = m.closest(order)
	return r, nil
}

// mark lists the keys on which a line is over a limit, unknown, outside the anchors or an alert.
func (m *matrix) mark(l *Line, in *Input) {
	for k := range in.Items[l.Item].Values {
		part, name := &in.Items[l.Item].Values[k], in.Keys[k].Name
		if part.OverLimit {
			l.OverLimit = append(l.OverLimit, name)
		}
		if part.OutsideAnchor {
			l.OutsideAnchor = append(l.OutsideAnchor, name)
		}
		if !part.Known {
			l.Unknown = append(l.Unknown, name)
		} else if l.Place <= in.AlertPlaces && part.Mid < in.AlertBelow {
			l.Alerts = append(l.Alerts, name)
		}
	}
}

// answer fills in CanBeFirst and gives the number of programs used, 0 or 1.
func (f *firstOf) answer(l *Line, in *Input, wonMix, left int) int {
	i := l.Item
	if f.out[i] && l.FirstIn == 0 {
		l.CanBeFirst, l.Proof = No, Beaten
		return 0
	}
	if f.holdsOwn(i) {
		l.CanBeFirst, l.Proof, l.Witness = Yes, OwnWeights, f.m.w
		return 0
	}
	if l.FirstIn > 0 {
		l.CanBeFirst, l.Proof = Yes, Mix
		l.Witness = MixWeights(f.m.w, in.MixSpread, in.Seed, wonMix)
		return 0
	}
	if left <= 0 {
		l.CanBeFirst = Unknown
		return 0
	}
	l.CanBeFirst, l.Proof, l.Witness = f.decide(i, f.m.w)
	return 1
}

// sorted gives the item indexes by place.
func (m *matrix) sorted(score []float64) []int {
	order, step := make([]int, m.n), make([]float64, m.n)
	for i := range order {
		order[i], step[i] = i, cell(score[i])
	}
	slices.SortFunc(order, func(a, b int) int { return compareFloat(step[b], step[a]) })
	for p := 0; p < m.n; {
		q := p + 1
		for q < m.n && step[order[q]] == step[order[p]] {
			q++
		}
		m.settle(order[p:q])
		p = q
	}
	return order
}

// closest finds the rival with the smallest reversal factor; the higher place among equals.
func (m *matrix) closest(order []int) *Reversal {
	var out *Reversal
	delta := make([]float64, m.d)
	for p := 1; p < len(order); p++ {
		a, b := m.midRow(order[0]), m.midRow(order[p])
		for k := range delta {
			delta[k] = b[k] - a[k]
		}
		if rho, ok := ReversalFactor(m.w, delta); ok && (out == nil || rho < out.Factor) {
			out = &Reversal{m.ids[order[p]], max(rho, 1)}
		}
	}
	return out
}
