package run

import (
	"context"
	"encoding/hex"
	"fmt"

	"groundtally/app/study"
	"groundtally/geo"
	"groundtally/geo/index"
	"groundtally/geo/overlay"
)

// runner carries one computation through the steps, in batches of sites: what a batch found is kept before
// the next begins, so that a stop or a kill loses one batch at most, and memory holds one batch of
// geometry.
type runner struct {
	w        *world
	k        *reckoner
	f        *fitter
	cores    int
	cache    Cache
	progress Progress
	prev     *Results
	before   map[digest]int // candidates of prev by what they were computed from

	plans  []plan
	assets []asset
	layers map[string]*overlay.Layer // widened once for all rulesets
	ready  map[*ruleset]bool

	computed map[string]int
	wanted   map[string]map[string]bool // digests of this state by step
}

// batchSites is the number of sites in a batch.
const batchSites = 500

// The steps whose results are kept.
const (
	groundStep    = "ground"
	fitStep       = "fit"
	candidateStep = "candidate"
)

// plan is what one option asks for: the rules of its parts, and the digest of each step for every site.
type plan struct {
	o      option
	sets   map[string]*ruleset // by part
	ground map[string][]string // by part, per site
	fit    []string
	cand   []string
}

// makePlans finds rules and digests without computing anything.
func (r *runner) makePlans(ctx context.Context) error {
	w := r.w
	r.layers, r.ready = map[string]*overlay.Layer{}, map[*ruleset]bool{}
	r.computed = map[string]int{}
	r.wanted = map[string]map[string]bool{groundStep: {}, fitStep: {}, candidateStep: {}}
	if len(w.gridKeys) > 0 {
		r.wanted[gridStep] = map[string]bool{}
	}
	for _, k := range w.gridKeys {
		r.wanted[gridStep][k] = true
	}
	r.assets = w.assets()
	common := r.k.key(w)
	known := newKey("machines", 1)
	for _, m := range w.machines() {
		known.text(m.ID)
		known.text(m.Name)
		known.num(m.TipM)
	}
	machines := known.sum()
	for _, o := range w.options {
		p := plan{o: o, sets: map[string]*ruleset{}, ground: map[string][]string{}, fit: make([]string, len(w.sites)), cand: make([]string, len(w.sites))}
		for _, part := range o.parts() {
			rs, err := w.rulesFor(o, part)
			if err != nil {
				return err
			}
			p.sets[part], p.ground[part] = rs, make([]string, len(w.sites))
		}
		legal := legalNotSet(w.snap, o)
		err := forEach(ctx, r.cores, len(w.sites), noResource, func(struct{}) {}, func(_ struct{}, i int) error {
			s := w.sites[i]
			var grounds []string
			for _, part := range o.parts() {
				p.ground[part][i] = p.sets[part].key(w, s)
				grounds = append(grounds, p.ground[part][i])
			}
			var err error
			if p.fit[i], err = r.f.key(o, s, grounds); err != nil {
				return err
			}
			h := newKey(candidateStep, candidateEdition)
			h.text(common)
			h.text(p.fit[i])
			for _, part := range o.parts() {
				h.texts(p.sets[part].incomplete)
				h.texts(p.sets[part].notApplied)
				if list := p.sets[part].excepted[s.id]; len(list) > 0 {
					h.texts(list)
				}
			}
			if o.wind {
				under := false
				p.sets[windPart].eachHeightLimit(s, func(heightLimit, int) { under = true })
				if under { // which machine would fit
					h.text(machines)
				}
			}
			h.texts(legal)
			h.text(s.id)
			h.texts(s.parcels)
			p.cand[i] = h.sum()
			return nil
		}, nil)
		if err != nil {
			return err
		}
		for i := range w.sites {
			for _, part := range o.parts() {
				r.wanted[groundStep][p.ground[part][i]] = true
			}
			r.wanted[fitStep][p.fit[i]] = true
			r.wanted[candidateStep][p.cand[i]] = true
		}
		r.plans = append(r.plans, p)
	}
	if w.plotless > 0 {
		w.notices = append(w.notices, geo.Notice{Code: "plot_unknown", Severity: geo.Warning, Args: map[string]string{"count": fmt.Sprint(w.plotless)}})
	}
	return nil
}

func (r *runner) cached(ctx context.Context, step string, keys []string) (map[string][]byte, error) {
	if r.cache == nil || len(keys) == 0 {
		return map[string][]byte{}, nil
	}
	have, err := r.cache.Results(ctx, step, keys)
	if err != nil {
		return nil, fmt.Errorf("read stored results of step %s: %w", step, err)
	}
	return have, nil
}

// stored are the kept results that a batch needs, by step and digest.
type stored map[string]map[string][]byte

// has reports whether a candidate need not be computed.
func (have stored) has(r *runner, key string) bool {
	if _, ok := have[candidateStep][key]; ok {
		return true
	}
	_, ok := r.held(key)
	return ok
}

// held finds a candidate among the earlier results.
func (r *runner) held(key string) (int, bool) {
	if r.before == nil {
		return 0, false
	}
	i, ok := r.before[keyDigest(key)]
	return i, ok
}

// keyDigest gives a step's key as bytes.
func keyDigest(key string) (d digest) {
	if n, err := hex.Decode(d[:], []byte(key)); err != nil || n != len(d) {
		panic("run: a key is no digest: " + key)
	}
	return d
}

// keys gives what each candidate was computed from, in the order of the candidates.
func (r *runner) keys() []digest {
	var out []digest
	for _, p := range r.plans {
		for _, k := range p.cand {
			out = append(out, keyDigest(k))
		}
	}
	return out
}

// byKey finds candidates by what they were computed from; nil results have none.
func (r *Results) byKey() map[digest]int {
	if r == nil || len(r.keys) != len(r.Candidates) {
		return nil
	}
	out := make(map[digest]int, len(r.keys))
	for i, k := range r.keys {
		out[k] = i
	}
	return out
}

// fetch reads what a batch needs: the candidates, the fits of those that are missing, and the grounds of
// those and of the candidates.
func (r *runner) fetch(ctx context.Context, from, to int) (stored, error) {
	out := stored{}
	var keys []string
	for _, p := range r.plans {
		for _, k := range p.cand[from:to] {
			if _, ok := r.held(k); !ok {
				keys = append(keys, k)
			}
		}
	}
	var err error
	if out[candidateStep], err = r.cached(ctx, candidateStep, keys); err != nil {
		return nil, err
	}
	var fits, grounds []string
	for _, p := range r.plans {
		for i := from; i < to; i++ {
			if out.has(r, p.cand[i]) {
				continue
			}
			fits = append(fits, p.fit[i])
			for _, part := range p.o.parts() {
				grounds = append(grounds, p.ground[part][i])
			}
		}
	}
	if out[fitStep], err = r.cached(ctx, fitStep, fits); err != nil {
		return nil, err
	}
	out[groundStep], err = r.cached(ctx, groundStep, grounds)
	return out, err
}

// prepare widens the layers of every ruleset that the batch must apply.
func (r *runner) prepare(ctx context.Context, have stored, from, to int) error {
	var e *overlay.Engine
	defer func() {
		if e != nil {
			closeEngine(e)
		}
	}()
	for _, p := range r.plans {
		for part, rs := range p.sets {
			if r.ready[rs] {
				continue
			}
			need := false
			for i := from; i < to && !need; i++ {
				_, kept := have[groundStep][p.ground[part][i]]
				need = !have.has(r, p.cand[i]) && !kept
			}
			if !need {
				continue
			}
			if e == nil {
				e = overlay.New()
				if r.w.terrain != nil {
					go func() { _, _ = r.w.terrain.get() }() // read beside; whoever needs it sees its error
				}
			}
			if err := rs.prepare(ctx, e, r.cores, r.layers); err != nil {
				return err
			}
			r.ready[rs] = true
		}
	}
	return nil
}

// siteResult is what one site gives: its candidates in the order of the plans, and what is to be kept.
type siteResult struct {
	candidates []Candidate
	digests    []digest
	fresh      []study.Result
}

// site carries one site through the steps for every option. The options share the geometry engine, what
// was cut out around the site, and grounds under equal rules.
func (r *runner) site(ctx context.Context, e *overlay.Engine, s int, have stored) (siteResult, error) {
	w, here := r.w, r.w.sites[s]
	out := siteResult{candidates: make([]Candidate, len(r.plans)), digests: make([]digest, len(r.plans))}
	grounds := map[string]*groundResult{}
	known := terrainCells{}
	keep := func(step, key string, data []byte) {
		out.fresh = append(out.fresh, study.Result{Step: step, Digest: key, Data: data})
	}
	groundOf := func(rs *ruleset, key string) (*groundResult, error) {
		if g, ok := grounds[key]; ok {
			return g, nil
		}
		var g groundResult
		if data, ok := have[groundStep][key]; ok {
			if err := unpack(data, &g); err != nil {
				return nil, err
			}
		} else {
			var err error
			if g, err = rs.compute(e, w, here, known); err != nil {
				return nil, err
			}
			data, err := pack(g)
			if err != nil {
				return nil, err
			}
			keep(groundStep, key, data)
		}
		grounds[key] = &g
		return &g, nil
	}
	var around *pieces
	for n, p := range r.plans {
		if err := ctx.Err(); err != nil {
			return out, err
		}
		if i, ok := r.held(p.cand[s]); ok {
			out.candidates[n], out.digests[n] = r.prev.Candidates[i], r.prev.digests[i]
			continue
		}
		var err error
		if data, ok := have[candidateStep][p.cand[s]]; ok {
			if out.digests[n], err = unpacked(data, &out.candidates[n]); err != nil {
				return out, err
			}
			continue
		}
		parts := map[string]groundResult{}
		for _, part := range p.o.parts() {
			g, err := groundOf(p.sets[part], p.ground[part][s])
			if err != nil {
				return out, err
			}
			parts[part] = *g
		}
		var fitted fitResult
		if data, ok := have[fitStep][p.fit[s]]; ok {
			err = unpack(data, &fitted)
		} else if fitted, err = r.f.compute(e, p.o, here, parts); err == nil {
			var data []byte
			if data, err = pack(fitted); err == nil {
				keep(fitStep, p.fit[s], data)
			}
		}
		if err != nil {
			return out, err
		}
		if around == nil {
			if around, err = w.newPieces(e, here); err != nil {
				return out, err
			}
		}
		c, err := r.k.candidate(e, w, around, r.f, r.assets, p.o, here, parts, p.sets, fitted)
		if err != nil {
			return out, err
		}
		out.candidates[n] = *c
		data, sum, err := packed(c)
		if err != nil {
			return out, err
		}
		out.digests[n] = sum
		keep(candidateStep, p.cand[s], data)
	}
	return out, nil
}

// run computes every candidate: by option, then site.
func (r *runner) run(ctx context.Context) ([]Candidate, []digest, error) {
	w := r.w
	n := len(w.sites)
	out := make([]Candidate, n*len(r.plans))
	digests := make([]digest, len(out))
	columns := make([]map[bool]*Columns, len(r.plans)) // a plant without room has few of the keys
	for i := range columns {
		columns[i] = map[bool]*Columns{true: newColumns(r.k.keys, r.k.p.facts), false: newColumns(r.k.keys, r.k.p.facts)}
	}
	limits := limitsOf(w.snap, r.k.keys)
	var writing background
	var engines enginePool
	defer engines.empty()
	for from := 0; from < n; from += batchSites {
		to := min(n, from+batchSites)
		have, err := r.fetch(ctx, from, to)
		if err != nil {
			return nil, nil, err
		}
		if err := r.prepare(ctx, have, from, to); err != nil {
			return nil, nil, err
		}
		found := make([]siteResult, to-from)
		var report func(int)
		if r.progress != nil {
			// Sites whose results are kept take next to no time, and say nothing of how long the others take.
			what := "kept sites"
			for _, p := range r.plans {
				for i := from; i < to; i++ {
					if !have.has(r, p.cand[i]) {
						what = "sites"
					}
				}
			}
			report = func(done int) { r.progress(what, from+done, n) }
		}
		// In an order in which neighbours follow each other, so that an engine meets again what it remembers.
		boxes := make([]geo.Extent, to-from)
		for i := range boxes {
			boxes[i] = w.sites[from+i].box
		}
		order := index.Curve(boxes)
		err = forEach(ctx, r.cores, to-from, engines.open, engines.close, func(e *overlay.Engine, i int) error {
			var err error
			found[order[i]], err = r.site(ctx, e, from+order[i], have)
			return err
		}, report)
		var fresh []study.Result
		for i := range found {
			fresh = append(fresh, found[i].fresh...)
		}
		if kerr := writing.wait(); err == nil {
			err = kerr
		}
		writing.start(func() error { return r.keepResults(ctx, fresh) })
		if err != nil {
			_ = writing.wait() // what is whole is kept; the first error counts
			return nil, nil, err
		}
		for i, f := range found {
			gates := w.gates(w.sites[from+i])
			for p := range f.candidates {
				at := p*n + from + i
				out[at], digests[at] = f.candidates[p], f.digests[p]
				c := &out[at]
				c.toColumns(columns[p][c.Status == Fitted])
				c.Gates = gates
				c.OverLimit = overLimit(limits, c)
			}
		}
	}
	if err := writing.wait(); err != nil {
		return nil, nil, err
	}
	return out, digests, r.prune(ctx)
}

// background does one thing beside the rest.
type background struct{ done chan error }

func (b *background) start(do func() error) {
	b.done = make(chan error, 1)
	go func(done chan error) { done <- do() }(b.done)
}

// wait gives the error of what was started last; nil when nothing was.
func (b *background) wait() error {
	if b.done == nil {
		return nil
	}
	err := <-b.done
	b.done = nil
	return err
}

func noResource() (struct{}, error) { return struct{}{}, nil }

// keepResults writes what a batch found. After a stop it writes what is whole, so that it need not be
// computed again.
func (r *runner) keepResults(ctx context.Context, fresh []study.Result) error {
	for _, f := range fresh {
		r.computed[f.Step]++
	}
	if r.cache == nil || len(fresh) == 0 {
		return nil
	}
	if err := r.cache.PutResults(context.WithoutCancel(ctx), fresh, nil); err != nil {
		return fmt.Errorf("keep results: %w", err)
	}
	return nil
}

// prune drops results that this state does not need, once more than half of everything was new. Until then
// older ones stay, so that undo finds them valid.
func (r *runner) prune(ctx context.Context) error {
	all, fresh := 0, 0
	for step, keys := range r.wanted {
		all += len(keys)
		fresh += r.computed[step]
	}
	if r.cache == nil || 2*fresh <= all {
		return nil
	}
	if err := r.cache.PutResults(ctx, nil, r.wanted); err != nil {
		return fmt.Errorf("drop old results: %w", err)
	}
	return nil
}

// counts says how much of each step was computed and how much was still valid.
func (r *runner) counts() []StepCount {
	var out []StepCount
	for _, step := range []string{groundStep, fitStep, candidateStep} {
		out = append(out, StepCount{Step: step, Computed: r.computed[step], Valid: len(r.wanted[step]) - r.computed[step]})
	}
	return out
}
