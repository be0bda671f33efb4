package run

import (
	"context"
	"crypto/sha256"
	"encoding/hex"
	"encoding/json"
	"errors"
	"fmt"
	"runtime"
	"slices"
	"sort"
	"strings"

	"groundtally/app/study"
	"groundtally/geo"
)

// Engine computes studies.
type Engine struct {
	Params   *Params
	Cache    Cache // nil computes everything
	Cores    int   // 0 takes all
	Progress Progress
	Load     Loader
	// Before are earlier results, nil for none. What of their candidates still holds is taken from them
	// instead of being read; the results are the same.
	Before *Results
}

// Editions are the formula editions of the steps; raised when their digits change.
func Editions() map[string]int {
	return map[string]int{"ground": groundEdition, "fit": fitEdition, "candidate": candidateEdition, "order": orderEdition, "lie": lieEdition}
}

const orderEdition = 3

// Code is the check code of results: what went in, what came out, and both together.
type Code struct {
	Inputs  string `json:"inputs"`
	Results string `json:"results"`
	Check   string `json:"check"`
}

// Compute carries a snapshot through all steps. Steps whose inputs did not change since they were
// stored are not computed again.
func (e *Engine) Compute(ctx context.Context, snap *study.Snapshot) (*Results, error) {
	w, err := newWorld(ctx, snap, e.Params, e.Load)
	if err != nil {
		return nil, err
	}
	cores := e.Cores
	if cores <= 0 {
		cores = runtime.NumCPU()
	}
	if e.Before != nil {
		w.kept.Store(e.Before.terrain)
	}
	r := &runner{w: w, cores: cores, cache: e.Cache, progress: e.Progress, prev: e.Before}
	r.before, r.settled = e.Before.byKey()
	if r.f, err = w.newFitter(ctx, e.Cache); err != nil {
		return nil, err
	}
	if e.Before != nil {
		r.f.years = e.Before.years.after()
	}
	if r.k, err = w.newReckoner(); err != nil {
		return nil, err
	}
	if err := r.makePlans(ctx); err != nil {
		return nil, err
	}
	out, err := r.run(ctx)
	if err != nil {
		return nil, err
	}
	out.terrain, out.years = w.kept.Load(), r.f.years.settled()
	if out.sealed, err = w.sealedGround(r.k, out); err != nil {
		return nil, err
	}
	out.Steps, out.Notices, out.made = r.counts(), w.notices, w.notices
	if err := e.weigh(ctx, snap, out, e.Before, cores); err != nil {
		return nil, err
	}
	return out, nil
}

// Reweigh puts the candidates of earlier results in order under another snapshot, without any other step.
// The snapshots may differ in what weighing alone reads; see OnlyWeighing. The results are those of
// Compute, bit for bit.
func (e *Engine) Reweigh(ctx context.Context, snap *study.Snapshot, prev *Results) (*Results, error) {
	cores := e.Cores
	if cores <= 0 {
		cores = runtime.NumCPU()
	}
	out := &Results{Candidates: prev.Candidates, Notices: prev.made, made: prev.made, digests: prev.digests, keys: prev.keys, contents: prev.contents, terrain: prev.terrain, years: prev.years, reckoner: prev.reckoner, sealed: prev.sealed}
	for _, c := range prev.Steps {
		if c.Step != orderStep {
			out.Steps = append(out.Steps, StepCount{Step: c.Step, Valid: c.Computed + c.Valid})
		}
	}
	if err := e.weigh(ctx, snap, out, prev, cores); err != nil {
		return nil, err
	}
	return out, nil
}

// OnlyWeighing reports whether two states of a study differ at most in what weighing alone reads: voices,
// ends of value scales, weight mixes, gates, the study's own titles.
func OnlyWeighing(a, b *study.Snapshot) bool {
	if !study.SameButSettings(a, b) {
		return false
	}
	weighing := func(key string) bool {
		for _, prefix := range []string{"voice.", "anchor.", "weigh.", "gate.", "saving.", "study."} {
			if strings.HasPrefix(key, prefix) {
				return true
			}
		}
		return false
	}
	same := func(a, b *study.Snapshot) bool {
		for key, s := range a.Explicit {
			if t, ok := b.Explicit[key]; (!ok || s != t) && !weighing(key) {
				return false
			}
		}
		return true
	}
	return same(a, b) && same(b, a)
}

const orderStep = "order"

// weigh fills in the orders of all voices with what belongs to them, and the check code.
func (e *Engine) weigh(ctx context.Context, snap *study.Snapshot, out, before *Results, cores int) error {
	if err := out.alternatives(snap, e.Params); err != nil {
		return err
	}
	draw := newDraws(snap, e.Params, cores, out, before)
	out.draws = draw
	voices := snap.Voices()
	orders := make([]VoiceOrder, len(voices))
	unready := make([]*VoiceError, len(voices))
	var report func(int)
	if e.Progress != nil {
		report = func(done int) { e.Progress("voices", done, len(voices)) }
		if len(voices) > 0 {
			report(0)
		}
	}
	err := forEach(ctx, cores, len(voices), noResource, func(struct{}) {}, func(_ struct{}, i int) error {
		var err error
		orders[i], err = order(ctx, snap, e.Params, out.reckoner, draw, voices[i], out)
		if errors.As(err, &unready[i]) {
			return nil // one unfinished voice does not keep the others from theirs
		}
		return err
	}, report)
	if err != nil {
		return err
	}
	if draw.size() > mostKeptDraws {
		out.draws = nil
	}
	out.Notices = slices.Clip(out.Notices)
	for i, voice := range voices {
		if unready[i] == nil {
			out.Voices = append(out.Voices, orders[i])
			continue
		}
		if out.Unready == nil {
			out.Unready = map[string]error{}
		}
		out.Unready[voice] = unready[i]
		out.Notices = append(out.Notices, geo.Notice{Code: "voice_unusable", Severity: geo.Warning, Field: "voice." + voice, Args: map[string]string{"error": unready[i].Error()}})
	}
	out.Steps = append(out.Steps, StepCount{Step: orderStep, Computed: len(out.Voices)})
	return out.code(snap, e.Params, out.digests)
}

// code fills in the check code. The canonical form of the inputs is JSON with sorted keys: settings in
// force by key (value, unit), layers by name (role, digest, match, units, completeness), groups, the
// frame's centre, parameter and formula editions. The results go in one after the other: for every
// candidate, by option and site, the digest of its JSON (written by encoding/json, which sorts keys and
// gives every number with the digits that bring its bits back), its gates, the limits it breaks; for every
// voice the rows of its order. Texts stand with their length before them and numbers as their IEEE 754
// bits, little-endian. All is hashed with SHA-256.
func (r *Results) code(snap *study.Snapshot, p *Params, digests []digest) error {
	type setting struct{ Key, Value, Unit string }
	type layer struct {
		Name, Role, Digest, CRS string
		Match, Units            map[string]string
		Complete                bool
	}
	in := struct {
		Settings []setting
		Layers   []layer
		Groups   []study.Group
		Frame    any
		Params   map[string]string
		Factors  string
		Editions map[string]int
	}{Groups: snap.Groups, Frame: snap.Frame, Params: p.DatesOf(snap), Factors: p.Digest, Editions: Editions()}
	for _, key := range snap.Keys() {
		if s, _, ok := snap.Lookup(key); ok {
			in.Settings = append(in.Settings, setting{key, s.Value, s.Unit})
		}
	}
	for _, l := range snap.Layers {
		if l.Role == study.BackdropRole {
			continue // drawn, and counted for nothing
		}
		in.Layers = append(in.Layers, layer{l.Name, l.Role, l.Digest, l.CRS, l.Match, l.Units, l.Complete})
	}
	b, err := json.Marshal(in)
	if err != nil {
		return fmt.Errorf("check code: %w", err)
	}
	r.Code.Inputs, r.Code.Results = sha(b), r.digest(digests)
	r.Code.Check = sha([]byte(r.Code.Inputs + r.Code.Results))
	return nil
}

// digest gives the digest of the results; see code.
func (r *Results) digest(candidates []digest) string {
	k := newKey("results", 1)
	for i := range r.Candidates {
		c := &r.Candidates[i]
		k.text(c.ID())
		k.bytes(candidates[i][:])
		for _, g := range sortedNames(c.Gates) {
			k.text(g)
			k.text(c.Gates[g].State)
		}
		k.texts(c.OverLimit)
	}
	for _, v := range r.Voices {
		k.text(v.Voice)
		for _, h := range v.HeldBack {
			k.text(h.ID())
			k.texts(h.Gates)
			k.int(h.Place)
		}
		for _, b := range v.Beside {
			k.text(b.ID)
			k.text(b.Why)
			k.int(b.Place)
			for _, x := range []float64{b.Score, b.ScoreLow, b.ScoreHigh} {
				k.num(x)
			}
		}
		for _, row := range v.Order {
			k.text(row.Site)
			k.text(row.Plant)
			k.int(row.Place)
			k.int(row.Tier)
			k.int(row.RankBest)
			k.int(row.RankWorst)
			k.text(row.CanBeFirst)
			for _, x := range []float64{row.Score, row.ScoreLow, row.ScoreHigh, row.FirstIn100} {
				k.num(x)
			}
			for _, key := range row.Parts.Names() {
				p := row.Parts.Of(key)
				k.text(key)
				k.num(p.Weight)
				k.num(p.Share)
				k.num(p.ShareLow)
				k.num(p.ShareHigh)
			}
			k.texts(row.DominatedBy)
			k.texts(row.Alerts)
		}
		for _, t := range v.Tipping {
			k.text(t.Key)
			for _, s := range []*TippingSide{t.Below, t.Above} {
				if s != nil {
					k.num(s.At)
					k.text(s.NewFirst)
				} else {
					k.text("none")
				}
			}
		}
	}
	return k.sum()
}

func sha(b []byte) string {
	h := sha256.Sum256(b)
	return hex.EncodeToString(h[:])
}

// Find gives a candidate by site and option.
func (r *Results) Find(site, plant string) (*Candidate, error) {
	for i := range r.Candidates {
		if c := &r.Candidates[i]; c.Site == site && c.Plant == plant {
			return c, nil
		}
	}
	return nil, fmt.Errorf("candidate %s with %s: %w", site, plant, study.ErrNotThere)
}

// Difference is one way in which two results differ.
type Difference struct {
	Where    string
	Old, New string
}

// Compare says how two results agree: "identical" (same digest), "agrees" (every value within 1e-6
// relative, same states, same tiers), or the first difference in words.
func Compare(a, b *Results) (verdict string, first *Difference) {
	if a.Code.Results == b.Code.Results {
		return "identical", nil
	}
	if d := differ(a, b); d != nil {
		return "", d
	}
	return "agrees", nil
}

func sortCandidates(cs []Candidate) []*Candidate {
	out := make([]*Candidate, len(cs))
	for i := range cs {
		out[i] = &cs[i]
	}
	sort.Slice(out, func(i, j int) bool { return out[i].ID() < out[j].ID() })
	return out
}
