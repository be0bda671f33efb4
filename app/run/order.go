package run

import (
	"cmp"
	"context"
	"encoding/json"
	"fmt"
	"math"
	"slices"
	"strings"
	"sync"

	"groundtally/app/study"
	"groundtally/geo"
	"groundtally/scoring"
	"groundtally/scoring/criteria"
	"groundtally/scoring/weigh"
)

// NoSite is the site of the do-nothing row.
const NoSite = "none"

// Part is one key's part of a score.
type Part struct {
	Known     bool // the candidate has a value
	Outside   bool // of the ends of the value scale
	Weight    float64
	Value     float64 // when known
	Share     float64
	ShareLow  float64
	ShareHigh float64
}

// MarshalJSON writes a part; a value that is not known is null.
func (p Part) MarshalJSON() ([]byte, error) {
	var value *float64
	if p.Known {
		value = &p.Value
	}
	return json.Marshal(struct {
		Weight    float64  `json:"weight"`
		Value     *float64 `json:"value"`
		Share     float64  `json:"share"`
		ShareLow  float64  `json:"share_low"`
		ShareHigh float64  `json:"share_high"`
		Outside   bool     `json:"outside_anchors,omitempty"`
	}{p.Weight, value, p.Share, p.ShareLow, p.ShareHigh, p.Outside})
}

// Named are values by name. Their names are in order and shared by all rows, so that an order of a hundred
// thousand rows fits.
type Named[T any] struct {
	names []string
	list  []T
}

// Names gives the names in order.
func (n Named[T]) Names() []string { return n.names }

// Of gives the value of a name; the zero value when there is none.
func (n Named[T]) Of(name string) T {
	v, _ := n.Find(name)
	return v
}

// Find gives the value of a name; ok is false when there is none.
func (n Named[T]) Find(name string) (v T, ok bool) {
	i, ok := slices.BinarySearch(n.names, name)
	if !ok {
		return v, false
	}
	return n.list[i], true
}

// MarshalJSON writes an object.
func (n Named[T]) MarshalJSON() ([]byte, error) {
	m := make(map[string]T, len(n.names))
	for i, name := range n.names {
		m[name] = n.list[i]
	}
	return json.Marshal(m)
}

// set gives the value of a name, which must be there, in place.
func (n Named[T]) set(name string, v T) {
	i, _ := slices.BinarySearch(n.names, name)
	n.list[i] = v
}

// Row is a candidate in the order of a voice.
type Row struct {
	Place        int             `json:"place"`
	Tier         int             `json:"tier"`
	Site         string          `json:"site"`
	Plant        string          `json:"plant"`
	Score        float64         `json:"score"`
	ScoreLow     float64         `json:"score_low"`
	ScoreHigh    float64         `json:"score_high"`
	RankBest     int             `json:"rank_best"`
	RankWorst    int             `json:"rank_worst"`
	CanBeFirst   string          `json:"can_be_first"`
	Parts        Named[Part]     `json:"parts"`
	Accounts     Named[float64]  `json:"accounts"`
	OverLimit    []string        `json:"over_limit"`
	Unknown      []string        `json:"unknown"`
	Incomplete   []string        `json:"incomplete"`
	FirstIn100   float64         `json:"first_in_100"`
	DominatedBy  []string        `json:"dominated_by"`
	DominanceAll bool            `json:"dominance_known"`
	Alerts       []string        `json:"alerts,omitempty"`
	Gates        map[string]Gate `json:"gates"`
	// PlaceWithout is the place that it would take if no gate held anything back; 0 where none does.
	PlaceWithout int `json:"place_without_gates,omitempty"`
}

// ID names the candidate of a row, or NoSite for doing nothing.
func (r *Row) ID() string {
	if r.Site == NoSite {
		return NoSite
	}
	return r.Site + "/" + r.Plant
}

// TippingSide is where first place changes hands.
type TippingSide struct {
	At       float64 `json:"at"`
	NewFirst string  `json:"new_first"`
}

// TippingRow says between which weights of a key the first place stays.
type TippingRow struct {
	Key    string       `json:"key"`
	Weight float64      `json:"weight"`
	Below  *TippingSide `json:"below"`
	Above  *TippingSide `json:"above"`
}

// VoiceOrder is the order under one voice.
type VoiceOrder struct {
	Voice    string       `json:"voice"`
	Title    string       `json:"title"`
	Order    []Row        `json:"order"`
	Tipping  []TippingRow `json:"tipping"`
	HeldBack []Held       `json:"held_back"`
	Beside   []Beside     `json:"beside"`
	Mixes    int          `json:"mixes"`
	Notices  []geo.Notice `json:"notices"`
}

// AnchorError says that a weighed key has no anchors yet.
type AnchorError struct{ Voice, Key string }

func (e *AnchorError) Error() string {
	return fmt.Sprintf("voice %q weighs %s, whose value scale has no fixed ends; set anchor.%s.worst and anchor.%s.best first", e.Voice, e.Key, e.Key, e.Key)
}

// FamilyError says that a voice weighs two consequences that count one event, without a reason.
type FamilyError struct{ Voice, Family, Key, Other string }

func (e *FamilyError) Error() string {
	return fmt.Sprintf("voice %q weighs both %s and %s, which count the same event (%s); take the weight off one, or give the reason in voice.%s.both.%s", e.Voice, e.Other, e.Key, e.Family, e.Voice, e.Family)
}

// VoiceError says why a voice cannot order anything yet.
type VoiceError struct{ Err error }

func (e *VoiceError) Error() string { return e.Err.Error() }
func (e *VoiceError) Unwrap() error { return e.Err }

// scale is the value scale of one weighed key.
type scale struct {
	key    string
	info   KeyInfo
	better criteria.Better
	gain   bool // more of it is something the plant brings, and not the absence of a burden
	raw    float64
	curve  weigh.Linear
}

// scales collects what a voice weighs.
func scales(snap *study.Snapshot, p *Params, voice string) ([]scale, []geo.Notice, error) {
	var out []scale
	var notices []geo.Notice
	families := map[string]string{}
	for _, k := range p.Keys() {
		raw, ok := snap.Number("voice." + voice + ".weight." + k.Key)
		if !ok || raw == 0 {
			continue
		}
		if raw < 0 {
			return nil, nil, fmt.Errorf("voice %q: the weight of %s is below zero", voice, k.Key)
		}
		one, c, err := scaleOf(snap, voice, k)
		if err != nil {
			return nil, nil, err
		}
		if c == nil {
			continue
		}
		for _, f := range c.Families {
			if other, twice := families[f]; twice {
				reason := strings.TrimSpace(snap.Text("voice." + voice + ".both." + f))
				if reason == "" {
					return nil, nil, &FamilyError{Voice: voice, Family: f, Key: k.Key, Other: other}
				}
				notices = append(notices, geo.Notice{Code: "family_twice", Severity: geo.Warning, Field: k.Key, Args: map[string]string{"family": f, "other": other, "reason": reason}})
			}
			families[f] = k.Key
		}
		one.raw = raw
		out = append(out, one)
	}
	if len(out) == 0 {
		return nil, nil, fmt.Errorf("voice %q weighs nothing; set voice.%s.weight.KEY", voice, voice)
	}
	return out, notices, nil
}

// scaleOf finds the value scale of a key. The criterion is nil for a key that has none.
func scaleOf(snap *study.Snapshot, voice string, k KeyInfo) (scale, *criteria.Criterion, error) {
	c, known := snap.Catalog().Criterion(k.Key)
	if !known {
		if c, known = snap.Catalog().Criterion(strings.TrimSuffix(k.Key, criteria.BurdenSuffix)); !known {
			return scale{}, nil, nil
		}
		c.Worst, c.Best = criteria.Anchor{Ask: true}, criteria.Anchor{X: 0}
	}
	if c.Better == criteria.Neither {
		return scale{}, nil, fmt.Errorf("voice %q: %s is not scored: neither more nor less of it is better", voice, k.Key)
	}
	worst, okW := snap.Number("anchor." + k.Key + ".worst")
	if !okW && !c.Worst.Ask {
		worst, okW = c.Worst.X, true
	}
	best, okB := snap.Number("anchor." + k.Key + ".best")
	if !okB && !c.Best.Ask {
		best, okB = c.Best.X, true
	}
	if !okW || !okB {
		return scale{}, nil, &AnchorError{Voice: voice, Key: k.Key}
	}
	curve, err := weigh.NewLinear(worst, best)
	if err != nil {
		return scale{}, nil, fmt.Errorf("value scale of %s: %w", k.Key, err)
	}
	return scale{key: k.Key, info: k, better: c.Better, gain: brings(c), curve: curve}, &c, nil
}

// brings reports whether more of a consequence is something that the plant itself brings: energy, room on
// the grid, carbon laid down. A distance or light left is the absence of a burden.
func brings(c criteria.Criterion) bool {
	if c.Better != criteria.More {
		return false
	}
	for _, f := range c.Families {
		switch f {
		case "yield", "size", "grid_room", "land_carbon":
			return true
		}
	}
	return false
}

// part turns a consequence into a value.
func (s scale) part(c scoring.Consequence, over bool) (weigh.Part, error) {
	switch c.State {
	case scoring.Number:
		p, err := weigh.PartOf(s.curve, math.Min(c.Low, c.High), math.Max(c.Low, c.High))
		p.OverLimit = over
		return p, err
	case scoring.None:
		return weigh.Part{Known: true, Low: 1, Mid: 1, High: 1}, nil
	case scoring.Never:
		return weigh.Part{Known: true, OverLimit: over}, nil
	}
	return weigh.Part{}, nil
}

// trial gives the value of one drawn consequence.
func (s scale) trial(v scoring.Value) (float64, error) {
	switch v.State {
	case scoring.Number:
		x, _, err := s.curve.Value(v.X)
		return x, err
	case scoring.None:
		return 1, nil
	case scoring.Never:
		return 0, nil
	}
	return 0.5, nil // not used for an unknown part
}

// contest is what is put in order: the fitted candidates that no gate holds back, and doing nothing as the last.
type contest struct {
	items    []weigh.Item
	at       []int // by item: the candidate, -1 for doing nothing
	held     []Held
	heldBack []weigh.Item // the items of those held
}

// weighed lays out what is put in order.
func weighed(snap *study.Snapshot, sc []scale, cs []Candidate) (*contest, error) {
	gates := gatesOf(snap)
	f := &contest{}
	for i := range cs {
		c := &cs[i]
		if c.Status != Fitted {
			continue
		}
		item := weigh.Item{ID: c.ID(), Values: make([]weigh.Part, len(sc))}
		for k, s := range sc {
			q, _ := c.Consequence(s.key)
			var err error
			if item.Values[k], err = s.part(q, slices.Contains(c.OverLimit, s.key)); err != nil {
				return nil, fmt.Errorf("candidate %s, %s: %w", c.ID(), s.key, err)
			}
		}
		if by := heldBy(gates, c); len(by) > 0 {
			f.held, f.heldBack = append(f.held, Held{Site: c.Site, Plant: c.Plant, Gates: by}), append(f.heldBack, item)
			continue
		}
		f.items, f.at = append(f.items, item), append(f.at, i)
	}
	nothing := weigh.Item{ID: NoSite}
	for _, s := range sc {
		// Doing nothing spares every burden and brings no gain.
		if s.better == criteria.Less || !s.gain {
			nothing.Values = append(nothing.Values, weigh.Part{Known: true, Low: 1, Mid: 1, High: 1})
		} else {
			nothing.Values = append(nothing.Values, weigh.Part{Known: true})
		}
	}
	f.items, f.at = append(f.items, nothing), append(f.at, -1)
	return f, nil
}

// without puts everything in order as if no gate held anything back, and notes the places. It gives them by id.
func (f *contest) without(keys []weigh.Key, raw []float64) (map[string]int, error) {
	if len(f.held) == 0 {
		return nil, nil
	}
	b, err := weigh.NewBoard(keys, slices.Concat(f.items, f.heldBack))
	if err != nil {
		return nil, err
	}
	var s weigh.Standing
	if err := b.Weigh(raw, &s); err != nil {
		return nil, err
	}
	places := make(map[string]int, len(f.items))
	for i, item := range f.items {
		places[item.ID] = s.Place[i]
	}
	for i := range f.held {
		at := len(f.items) + i
		f.held[i].Place, f.held[i].Tier, f.held[i].Score = s.Place[at], s.Tier[at], s.Score[at]
	}
	slices.SortFunc(f.held, func(a, b Held) int { return cmp.Compare(a.Place, b.Place) })
	return places, nil
}

// order weighs the fitted candidates under one voice.
func order(ctx context.Context, snap *study.Snapshot, p *Params, k *reckoner, draw *draws, voice string, r *Results) (VoiceOrder, error) {
	cs := r.Candidates
	out := VoiceOrder{Voice: voice, Title: snap.Text("voice." + voice + ".title"), Order: []Row{}, Tipping: []TippingRow{}, HeldBack: []Held{}}
	sc, notices, err := scales(snap, p, voice)
	if err != nil {
		return out, &VoiceError{err}
	}
	out.Notices = notices
	if out.Notices == nil {
		out.Notices = []geo.Notice{}
	}
	mixes, _ := snap.Number("weigh.mixes")
	spread, _ := snap.Number("weigh.spread")
	in := weigh.Input{Seed: k.seed, Mixes: int(mixes), MixSpread: spread}
	for _, s := range sc {
		in.Keys = append(in.Keys, weigh.Key{Name: s.key, Account: string(s.info.Account), RawWeight: s.raw})
	}
	f, err := weighed(snap, sc, cs)
	if err != nil {
		return out, err
	}
	items, at := f.items, f.at
	in.Items = items
	raw := make([]float64, len(sc))
	for i, s := range sc {
		raw[i] = s.raw
	}
	places, err := f.without(in.Keys, raw)
	if err != nil {
		return out, fmt.Errorf("voice %q: %w", voice, err)
	}
	told, err := returnScale(snap, p, voice, sc, items, at, cs)
	if err != nil {
		return out, err
	}
	if told != nil {
		out.Notices = append(out.Notices, *told)
	}
	out.HeldBack = append(out.HeldBack, f.held...)

	contenders, err := weigh.Contenders(in)
	if err != nil {
		return out, err
	}
	column := make([]int, len(sc)) // of each key in the drawn samples; -1 outside the graph
	for i, s := range sc {
		column[i] = slices.Index(draw.keys, s.key)
	}
	n := min(in.Mixes, k.trials)
	var drawn, which []int
	for _, item := range contenders {
		if at[item] >= 0 {
			drawn, which = append(drawn, item), append(which, at[item])
		}
	}
	draw.mu.Lock()
	err = draw.ready(ctx, k, cs, which, n)
	draw.mu.Unlock()
	if err != nil {
		return out, err
	}
	if len(drawn) > 0 {
		in.Trials = &weigh.Trials{Count: n, Items: drawn, Row: func(trial, item int, row []float64) error {
			for i, s := range sc {
				v := scoring.UnknownBecause("not_assessed")
				if column[i] >= 0 {
					v = draw.samples[at[item]].value(trial*len(draw.keys) + column[i])
				}
				x, err := s.trial(v)
				if err != nil {
					return err
				}
				row[i] = x
			}
			return nil
		}}
	}
	res, err := weigh.Order(in)
	if err != nil {
		return out, fmt.Errorf("voice %q: %w", voice, err)
	}
	out.Mixes = res.Mixes
	var keys, accounts []string
	for _, s := range sc {
		keys = append(keys, s.key)
		if a := string(s.info.Account); !slices.Contains(accounts, a) {
			accounts = append(accounts, a)
		}
	}
	slices.Sort(keys)
	slices.Sort(accounts)
	out.Order = make([]Row, 0, len(res.Lines))
	for _, l := range res.Lines {
		r := Row{PlaceWithout: places[l.ID], Place: l.Place, Tier: l.Tier, Site: NoSite, Score: l.Score, ScoreLow: l.ScoreLow, ScoreHigh: l.ScoreHigh, RankBest: l.RankBest, RankWorst: l.RankWorst,
			CanBeFirst: canBeFirst(l.CanBeFirst), Parts: Named[Part]{keys, make([]Part, len(keys))}, Accounts: Named[float64]{accounts, make([]float64, len(accounts))}, OverLimit: orEmpty(l.OverLimit), Unknown: orEmpty(l.Unknown), Incomplete: []string{},
			FirstIn100: res.FirstInHundred(l), DominatedBy: []string{}, DominanceAll: l.DominanceKnown, Alerts: l.Alerts, Gates: map[string]Gate{}}
		for _, s := range res.Parts(l) {
			part := Part{Known: s.Known, Weight: s.Weight, Share: s.Share, ShareLow: s.ShareLow, ShareHigh: s.ShareHigh, Outside: s.OutsideAnchor}
			if s.Known {
				part.Value = s.Value
			}
			r.Parts.set(s.Key, part)
		}
		for _, a := range res.Accounts(l) {
			r.Accounts.set(a.Account, a.Share)
		}
		for _, d := range l.DominatedBy {
			r.DominatedBy = append(r.DominatedBy, d.ID)
		}
		if i := at[l.Item]; i >= 0 {
			c := &cs[i]
			r.Site, r.Plant, r.Incomplete, r.Gates = c.Site, c.Plant, orEmpty(c.Incomplete), c.Gates
			r.OverLimit = orEmpty(c.OverLimit) // every limit, weighed or not
		}
		out.Order = append(out.Order, r)
	}
	scores := make([]float64, len(res.Lines))
	for i, l := range res.Lines {
		scores[i] = l.Score
	}
	if out.Beside, err = besides(r.Alternatives, sc, raw, scores); err != nil {
		return out, fmt.Errorf("voice %q: %w", voice, err)
	}
	decided, err := k.decidedByDefault(sc, res.Lines, at, cs)
	if err != nil {
		return out, err
	}
	out.Notices = append(out.Notices, decided...)
	for _, t := range res.Tipping {
		row := TippingRow{Key: t.Key, Weight: t.Weight}
		if t.Below != nil {
			row.Below = &TippingSide{At: t.Below.At, NewFirst: t.Below.NewFirst}
		}
		if t.Above != nil {
			row.Above = &TippingSide{At: t.Above.At, NewFirst: t.Above.NewFirst}
		}
		out.Tipping = append(out.Tipping, row)
	}
	return out, nil
}

func canBeFirst(s weigh.Status) string {
	switch s {
	case weigh.Yes:
		return "yes"
	case weigh.No:
		return "no"
	}
	return "unknown"
}

// draws are the trials of all weighed keys, made for a candidate when a voice first needs it.
type draws struct {
	keys    []string
	slots   []int
	cores   int
	mu      sync.Mutex // voices fill it one after the other
	samples []sample   // by candidate
}

// sample holds the trials of a candidate, trial by trial.
type sample struct {
	x   []float64       // where the value is no number, oddBits and its place in odd
	odd []scoring.Value // most candidates have one or two that repeat
}

// oddBits are the bits of what is not a number; no computed number has them.
const oddBits = 0x7ff8_1000_0000_0000

func (s *sample) value(i int) scoring.Value {
	x := s.x[i]
	if bits := math.Float64bits(x); bits&^0xffff_ffff == oddBits {
		return s.odd[bits&0xffff_ffff]
	}
	return scoring.Value{X: x}
}

func (s *sample) add(v scoring.Value) {
	if v.State == scoring.Number {
		s.x = append(s.x, v.X)
		return
	}
	at := slices.Index(s.odd, v)
	if at < 0 {
		at = len(s.odd)
		s.odd = append(s.odd, v)
	}
	s.x = append(s.x, math.Float64frombits(oddBits|uint64(at)))
}

// newDraws begins the trials of results. Of earlier results those of candidates that are the same are taken
// over, where everything else that they depend on is the same too.
func newDraws(snap *study.Snapshot, p *Params, cores int, out, before *Results) *draws {
	d := &draws{cores: cores, samples: make([]sample, len(out.Candidates))}
	for _, k := range p.Keys() {
		slot, ok := p.Graph.Slot(k.Key)
		if !ok {
			continue
		}
		for _, v := range snap.Voices() {
			if x, set := snap.Number("voice." + v + ".weight." + k.Key); set && x > 0 {
				d.keys, d.slots = append(d.keys, k.Key), append(d.slots, slot)
				break
			}
		}
	}
	if before == nil || before.draws == nil || before.reckoner.inputs != out.reckoner.inputs || !slices.Equal(before.draws.keys, d.keys) {
		return d
	}
	known := map[digest]int{}
	for i, s := range before.draws.samples {
		if s.x != nil {
			known[before.digests[i]] = i
		}
	}
	for i, sum := range out.digests {
		if at, ok := known[sum]; ok {
			d.samples[i] = before.draws.samples[at]
		}
	}
	return d
}

// mostKeptDraws bounds the numbers that stay in memory for the next results, to 16 MB.
const mostKeptDraws = 2 << 20

func (d *draws) size() (n int) {
	for i := range d.samples {
		n += len(d.samples[i].x)
	}
	return n
}

func (d *draws) ready(ctx context.Context, k *reckoner, cs []Candidate, which []int, n int) error {
	return forEach(ctx, d.cores, len(which), noResource, func(struct{}) {}, func(_ struct{}, i int) error {
		c := which[i]
		if len(d.samples[c].x) >= n*len(d.keys) && d.samples[c].x != nil {
			return nil
		}
		v := k.vector(&cs[c])
		drawn := k.draws(cs[c].Site, sigmas(&cs[c]), v)
		s := sample{x: make([]float64, 0, n*len(d.keys))}
		for _, row := range k.p.Graph.Samples(v, drawn, d.slots, n) {
			for _, v := range row {
				s.add(v)
			}
		}
		d.samples[c] = s
		return nil
	}, nil)
}

// vector rebuilds the central values of a candidate.
func (k *reckoner) vector(c *Candidate) []scoring.Value {
	v := slices.Clone(k.central)
	for _, l := range c.Leaves() {
		if slot, ok := k.p.Graph.Slot(l.Name); ok {
			v[slot] = scoring.Value{State: l.State, X: l.X, Why: l.Why}
		}
	}
	if slot, ok := k.p.Graph.Slot("demand_mwh_per_yr"); ok && c.columns != nil && c.columns.demand.source != "" {
		v[slot] = c.columns.demand.v // which a reckoner without the study's tables does not know
	}
	k.cover(v)
	k.p.Graph.Central(v)
	return v
}

// sigmas brings back what siteDraws reads of a fit.
func sigmas(c *Candidate) fitResult {
	var r fitResult
	for _, l := range c.Leaves() {
		switch l.Name {
		case "wind_yield_sigma_shared":
			r.WindShared = l.X
		case "wind_yield_sigma_own":
			r.WindOwn = l.X
		case "solar_yield_sigma_shared":
			r.SolarShared = l.X
		case "solar_yield_sigma_own":
			r.SolarOwn = l.X
		case "wind_kw":
			r.WindKW = l.X
		case "solar_kw":
			r.SolarKW = l.X
		}
	}
	return r
}
