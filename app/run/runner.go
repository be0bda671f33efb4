package run

import (
	"context"
	"encoding/hex"
	"fmt"
	"maps"

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
	before   map[digest]int // candidates of prev by their inputs
	settled  map[digest]int // and by what their last steps read

	plans    []plan
	machines string                    // what is known of machines, as a digest
	layers   map[string]*overlay.Layer // widened once for all rulesets
	ready    map[*ruleset]bool

	computed map[string]int
	wanted   map[string]map[string]bool // digests of this state by step
}

// batchSites is the number of sites in a batch.
const batchSites = 100

// The steps whose results are kept. Grounds are kept by their inputs. Fits and candidates are kept by what
// they read, the content of the grounds among it: a rule that is changed near a site and takes no other
// ground than before leaves them valid. settledStep leads from the inputs of a candidate to those keys, so
// that the ground need not be looked at while the inputs are the same. How a site lies in its terrain is kept
// by itself, since no rule changes it.
const (
	groundStep    = "ground"
	fitStep       = "fit"
	candidateStep = "candidate"
	settledStep   = "settled"
	lieStep       = "lie"
)

// plan is what one option asks for: the rules of its parts, and the digests of the inputs for every site.
type plan struct {
	o      option
	sets   map[string]*ruleset // by part
	ground map[string][]string // by part, per site
	cand   []string
	legal  []string
}

// contentKeys are the keys under which a candidate and its fit are kept.
type contentKeys struct{ fit, cand digest }

// makePlans finds rules and digests without computing anything.
func (r *runner) makePlans(ctx context.Context) error {
	w := r.w
	r.layers, r.ready = map[string]*overlay.Layer{}, map[*ruleset]bool{}
	r.computed = map[string]int{}
	r.wanted = map[string]map[string]bool{groundStep: {}, fitStep: {}, candidateStep: {}, settledStep: {}, lieStep: {}}
	if len(w.gridKeys) > 0 {
		r.wanted[gridStep] = map[string]bool{}
	}
	for _, k := range w.gridKeys {
		r.wanted[gridStep][k] = true
	}
	known := newKey("machines", 1)
	for _, m := range w.machines() {
		known.text(m.ID)
		known.text(m.Name)
		known.num(m.TipM)
	}
	r.machines = known.sum()
	for _, o := range w.options {
		p := plan{o: o, sets: map[string]*ruleset{}, ground: map[string][]string{}, cand: make([]string, len(w.sites)), legal: legalNotSet(w.snap, o)}
		for _, part := range o.parts() {
			rs, err := w.rulesFor(o, part)
			if err != nil {
				return err
			}
			p.sets[part], p.ground[part] = rs, make([]string, len(w.sites))
		}
		err := forEach(ctx, r.cores, len(w.sites), noResource, func(struct{}) {}, func(_ struct{}, i int) error {
			var grounds []string
			for _, part := range o.parts() {
				p.ground[part][i] = p.sets[part].key(w, w.sites[i])
				grounds = append(grounds, p.ground[part][i])
			}
			_, cand, err := r.stepKeys(p, i, grounds, "")
			p.cand[i] = cand
			return err
		}, nil)
		if err != nil {
			return err
		}
		for i := range w.sites {
			for _, part := range o.parts() {
				r.wanted[groundStep][p.ground[part][i]] = true
			}
			r.wanted[settledStep][p.cand[i]] = true
			if key := r.f.lieKey(w.sites[i]); key != "" && o.solar {
				r.wanted[lieStep][key] = true
			}
		}
		r.plans = append(r.plans, p)
	}
	if w.plotless > 0 {
		w.notices = append(w.notices, geo.Notice{Code: "plot_unknown", Severity: geo.Warning, Args: map[string]string{"count": fmt.Sprint(w.plotless)}})
	}
	return nil
}

// stepKeys gives the digests of what fit and candidate of a site read, by what stands for the grounds of the
// parts: their inputs, or what a fit reads of them and with it the whole content of the first part's, which a
// candidate shows.
func (r *runner) stepKeys(p plan, site int, grounds []string, shown string) (fit, cand string, err error) {
	s := r.w.sites[site]
	if fit, err = r.f.key(p.o, s, grounds); err != nil {
		return "", "", err
	}
	h := newKey(candidateStep, candidateEdition)
	h.text(r.k.inputs)
	h.text(fit)
	h.text(shown)
	for _, part := range p.o.parts() {
		h.texts(p.sets[part].incomplete)
		h.texts(p.sets[part].notApplied)
		if list := p.sets[part].excepted[s.id]; len(list) > 0 {
			h.texts(list)
		}
	}
	if p.o.wind {
		under := false
		p.sets[windPart].eachHeightLimit(s, func(heightLimit, int) { under = true })
		if under { // which machine would fit
			h.text(r.machines)
		}
	}
	h.texts(p.legal)
	h.text(s.id)
	h.texts(s.parcels)
	return fit, h.sum(), nil
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

// batch is some sites on their way through the steps.
type batch struct {
	from, to int
	stored   map[string]map[string][]byte // kept results that it needs, by step and key
	keys     [][]*contentKeys             // by plan and site of the batch; nil while not known
	told     [][]bool                     // the keys are kept for these inputs
	sites    []*siteWork
}

// siteWork is what is found out of a site before its candidates are made.
type siteWork struct {
	grounds map[string]*groundResult // by key
	content map[string]digest
	cells   terrainCells
	fresh   []study.Result
}

func (s *siteWork) keep(step, key string, data []byte) {
	s.fresh = append(s.fresh, study.Result{Step: step, Digest: key, Data: data})
}

// there reports whether a candidate need not be computed.
func (r *runner) there(b *batch, plan, site int) bool {
	if _, ok := r.before[keyDigest(r.plans[plan].cand[site])]; ok {
		return true
	}
	k := b.keys[plan][site-b.from]
	if k == nil {
		return false
	}
	if _, ok := r.settled[k.cand]; ok {
		return true
	}
	_, ok := b.stored[candidateStep][hex.EncodeToString(k.cand[:])]
	return ok
}

// keyDigest gives a step's key as bytes.
func keyDigest(key string) (d digest) {
	if n, err := hex.Decode(d[:], []byte(key)); err != nil || n != len(d) {
		panic("run: a key is no digest: " + key)
	}
	return d
}

// byKey finds candidates by their inputs, and by what their last steps read; nil results have none.
func (r *Results) byKey() (inputs, contents map[digest]int) {
	if r == nil || len(r.keys) != len(r.Candidates) || len(r.contents) != len(r.Candidates) {
		return nil, nil
	}
	inputs, contents = make(map[digest]int, len(r.keys)), make(map[digest]int, len(r.keys))
	for i, k := range r.keys {
		inputs[k], contents[r.contents[i].cand] = i, i
	}
	return inputs, contents
}

// fetch begins a batch with what is kept of it: the candidates whose inputs were met before, and the grounds
// of the others.
func (r *runner) fetch(ctx context.Context, from, to int) (*batch, error) {
	b := &batch{from: from, to: to, stored: map[string]map[string][]byte{}, sites: make([]*siteWork, to-from), keys: make([][]*contentKeys, len(r.plans)), told: make([][]bool, len(r.plans))}
	var inputs []string
	for _, p := range r.plans {
		for _, k := range p.cand[from:to] {
			if _, ok := r.before[keyDigest(k)]; !ok {
				inputs = append(inputs, k)
			}
		}
	}
	settled, err := r.cached(ctx, settledStep, inputs)
	if err != nil {
		return nil, err
	}
	var cands []string
	for n, p := range r.plans {
		b.keys[n], b.told[n] = make([]*contentKeys, to-from), make([]bool, to-from)
		for i, k := range p.cand[from:to] {
			data := settled[k]
			if len(data) != 2*len(digest{}) {
				continue
			}
			keys := &contentKeys{fit: digest(data[:len(digest{})]), cand: digest(data[len(digest{}):])}
			b.keys[n][i], b.told[n][i] = keys, true
			if _, ok := r.settled[keys.cand]; !ok {
				cands = append(cands, hex.EncodeToString(keys.cand[:]))
			}
		}
	}
	if b.stored[candidateStep], err = r.cached(ctx, candidateStep, cands); err != nil {
		return nil, err
	}
	var grounds []string
	for n, p := range r.plans {
		for i := from; i < to; i++ {
			if !r.there(b, n, i) {
				for _, part := range p.o.parts() {
					grounds = append(grounds, p.ground[part][i])
				}
			}
		}
	}
	b.stored[groundStep], err = r.cached(ctx, groundStep, grounds)
	return b, err
}

// fetchSettled reads what is kept of the candidates whose ground is known now.
func (r *runner) fetchSettled(ctx context.Context, b *batch) error {
	var cands []string
	for n := range r.plans {
		for i := b.from; i < b.to; i++ {
			if k := b.keys[n][i-b.from]; k != nil && !b.told[n][i-b.from] && !r.there(b, n, i) {
				cands = append(cands, hex.EncodeToString(k.cand[:]))
			}
		}
	}
	more, err := r.cached(ctx, candidateStep, cands)
	if err != nil {
		return err
	}
	maps.Copy(b.stored[candidateStep], more)
	var fits []string
	for n := range r.plans {
		for i := b.from; i < b.to; i++ {
			if k := b.keys[n][i-b.from]; k != nil && !r.there(b, n, i) {
				fits = append(fits, hex.EncodeToString(k.fit[:]))
			}
		}
	}
	if b.stored[fitStep], err = r.cached(ctx, fitStep, fits); err != nil {
		return err
	}
	return r.fetchLies(ctx, b)
}

// fetchLies reads how the sites lie whose plants with panels are to be fitted.
func (r *runner) fetchLies(ctx context.Context, b *batch) error {
	sites := map[string]string{} // by key
	for n, p := range r.plans {
		for i := b.from; i < b.to; i++ {
			k := b.keys[n][i-b.from]
			if !p.o.solar || k == nil || r.there(b, n, i) {
				continue
			}
			if _, kept := b.stored[fitStep][hex.EncodeToString(k.fit[:])]; !kept {
				if key := r.f.lieKey(r.w.sites[i]); key != "" {
					sites[key] = r.w.sites[i].id
				}
			}
		}
	}
	have, err := r.cached(ctx, lieStep, sortedNames(sites))
	for key, data := range have {
		if l, ok := lieOf(data); ok {
			r.f.lies[sites[key]] = l
		}
	}
	return err
}

// freshLies gives the lies of a batch that are to be kept.
func (r *runner) freshLies(b *batch) []study.Result {
	var out []study.Result
	for i := b.from; i < b.to; i++ {
		if l, fresh := r.f.freshLies[r.w.sites[i].id]; fresh {
			out = append(out, study.Result{Step: lieStep, Digest: r.f.lieKey(r.w.sites[i]), Data: l.bytes()})
		}
	}
	clear(r.f.freshLies)
	return out
}

// prepare widens the layers of every ruleset that the batch must apply.
func (r *runner) prepare(ctx context.Context, b *batch) error {
	var e *overlay.Engine
	defer func() {
		if e != nil {
			closeEngine(e)
		}
	}()
	for n, p := range r.plans {
		for part, rs := range p.sets {
			if r.ready[rs] {
				continue
			}
			need := false
			for i := b.from; i < b.to && !need; i++ {
				_, kept := b.stored[groundStep][p.ground[part][i]]
				need = !kept && !r.there(b, n, i)
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

// ground finds the grounds of a site's candidates that are not there, and with them the keys of their
// further steps. The options share the geometry engine, what was cut out around the site, and grounds under
// equal rules.
func (r *runner) ground(ctx context.Context, e *overlay.Engine, b *batch, s int) error {
	work := &siteWork{grounds: map[string]*groundResult{}, content: map[string]digest{}, cells: terrainCells{}}
	b.sites[s-b.from] = work
	for n, p := range r.plans {
		if err := ctx.Err(); err != nil {
			return err
		}
		if r.there(b, n, s) {
			continue
		}
		var read []string
		for _, part := range p.o.parts() {
			if err := r.groundOf(e, b, work, p.sets[part], s, p.ground[part][s]); err != nil {
				return err
			}
			g := work.grounds[p.ground[part][s]]
			k := newKey("ground that a fit reads", groundEdition)
			k.geometry(g.Area)
			k.num(g.BuildableM2)
			read = append(read, p.sets[part].keyBeyond(r.w, r.w.sites[s]), k.sum())
		}
		shown := work.content[p.ground[p.o.parts()[0]][s]]
		fit, cand, err := r.stepKeys(p, s, read, hex.EncodeToString(shown[:]))
		if err != nil {
			return err
		}
		b.keys[n][s-b.from], b.told[n][s-b.from] = &contentKeys{keyDigest(fit), keyDigest(cand)}, false
	}
	return nil
}

// groundOf takes a kept ground or computes it.
func (r *runner) groundOf(e *overlay.Engine, b *batch, work *siteWork, rs *ruleset, s int, key string) error {
	if _, ok := work.grounds[key]; ok {
		return nil
	}
	var g groundResult
	var sum digest
	var err error
	if data, ok := b.stored[groundStep][key]; ok {
		if sum, err = unpacked(data, &g); err != nil {
			return err
		}
	} else {
		if g, err = rs.compute(e, r.w, r.w.sites[s], work.cells); err != nil {
			return err
		}
		var data []byte
		if data, sum, err = packed(g); err != nil {
			return err
		}
		work.keep(groundStep, key, data)
	}
	work.grounds[key], work.content[key] = &g, sum
	return nil
}

// siteResult is what one site gives: its candidates in the order of the plans.
type siteResult struct {
	candidates []Candidate
	digests    []digest
	keys       []contentKeys
}

// site makes the candidates of a site for every option.
func (r *runner) site(ctx context.Context, e *overlay.Engine, b *batch, s int) (siteResult, error) {
	w, here, work := r.w, r.w.sites[s], b.sites[s-b.from]
	out := siteResult{candidates: make([]Candidate, len(r.plans)), digests: make([]digest, len(r.plans)), keys: make([]contentKeys, len(r.plans))}
	var around *pieces
	for n, p := range r.plans {
		if err := ctx.Err(); err != nil {
			return out, err
		}
		i, held := r.before[keyDigest(p.cand[s])]
		if held {
			out.keys[n] = r.prev.contents[i]
		} else {
			keys := *b.keys[n][s-b.from]
			out.keys[n] = keys
			if !b.told[n][s-b.from] {
				work.keep(settledStep, p.cand[s], append(keys.fit[:], keys.cand[:]...))
			}
			i, held = r.settled[keys.cand]
		}
		if held {
			out.candidates[n], out.digests[n] = r.prev.Candidates[i], r.prev.digests[i]
			continue
		}
		fitKey, candKey := hex.EncodeToString(out.keys[n].fit[:]), hex.EncodeToString(out.keys[n].cand[:])
		var err error
		if data, ok := b.stored[candidateStep][candKey]; ok {
			if out.digests[n], err = unpacked(data, &out.candidates[n]); err != nil {
				return out, err
			}
			continue
		}
		parts := map[string]groundResult{}
		for _, part := range p.o.parts() {
			parts[part] = *work.grounds[p.ground[part][s]]
		}
		var fitted fitResult
		if data, ok := b.stored[fitStep][fitKey]; ok {
			err = unpack(data, &fitted)
		} else if fitted, err = r.f.compute(e, p.o, here, parts); err == nil {
			var data []byte
			if data, err = pack(fitted); err == nil {
				work.keep(fitStep, fitKey, data)
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
		c, err := r.k.candidate(e, w, around, r.f, r.f.assets, p.o, here, parts, p.sets, fitted)
		if err != nil {
			return out, err
		}
		out.candidates[n] = *c
		data, sum, err := packed(c)
		if err != nil {
			return out, err
		}
		out.digests[n] = sum
		work.keep(candidateStep, candKey, data)
	}
	return out, nil
}

// run computes every candidate: by option, then site.
func (r *runner) run(ctx context.Context) (*Results, error) {
	w := r.w
	n := len(w.sites)
	out := make([]Candidate, n*len(r.plans))
	digests, inputs, contents := make([]digest, len(out)), make([]digest, len(out)), make([]contentKeys, len(out))
	columns := make([]map[bool]*Columns, len(r.plans)) // a plant without room has few of the keys
	for i := range columns {
		columns[i] = map[bool]*Columns{true: newColumns(r.k.keys, r.k.p.facts), false: newColumns(r.k.keys, r.k.p.facts)}
		columns[i][true].demand = r.k.demand
	}
	limits := limitsOf(w.snap, r.k.keys)
	var writing background
	defer func() { _ = writing.wait() }() // its error was told, or another one came before
	var engines enginePool
	defer engines.empty()
	for from := 0; from < n; from += batchSites {
		to := min(n, from+batchSites)
		b, err := r.fetch(ctx, from, to)
		if err != nil {
			return nil, err
		}
		if err := r.prepare(ctx, b); err != nil {
			return nil, err
		}
		found := make([]siteResult, to-from)
		var report func(int)
		if r.progress != nil {
			// Sites whose results are kept take next to no time, and say nothing of how long the others take.
			what := "kept sites"
			for p := range r.plans {
				for i := from; i < to; i++ {
					if !r.there(b, p, i) {
						what = "sites"
					}
				}
			}
			// Each site is met twice: for its ground, then for its plants.
			report = func(done int) { r.progress(what, from+done/2, n) }
		}
		// In an order in which neighbours follow each other, so that an engine meets again what it remembers.
		boxes := make([]geo.Extent, to-from)
		for i := range boxes {
			boxes[i] = w.sites[from+i].box
		}
		order := index.Curve(boxes)
		err = forEach(ctx, r.cores, to-from, engines.open, engines.close, func(e *overlay.Engine, i int) error {
			return r.ground(ctx, e, b, from+order[i])
		}, report)
		if err == nil {
			err = r.fetchSettled(ctx, b)
		}
		if err == nil {
			if report != nil {
				grounds := report
				report = func(done int) { grounds(to - from + done) }
			}
			err = forEach(ctx, r.cores, to-from, engines.open, engines.close, func(e *overlay.Engine, i int) error {
				var err error
				found[order[i]], err = r.site(ctx, e, b, from+order[i])
				return err
			}, report)
		}
		fresh := r.freshLies(b)
		for _, work := range b.sites {
			if work != nil {
				fresh = append(fresh, work.fresh...)
			}
		}
		if kerr := writing.wait(); err == nil {
			err = kerr
		}
		writing.start(func() error { return r.keepResults(ctx, fresh) })
		if err != nil {
			_ = writing.wait() // what is whole is kept; the first error counts
			return nil, err
		}
		for i, f := range found {
			gates := w.gates(w.sites[from+i])
			for p := range f.candidates {
				at := p*n + from + i
				out[at], digests[at], contents[at] = f.candidates[p], f.digests[p], f.keys[p]
				inputs[at] = keyDigest(r.plans[p].cand[from+i])
				r.wanted[fitStep][hex.EncodeToString(f.keys[p].fit[:])] = true
				r.wanted[candidateStep][hex.EncodeToString(f.keys[p].cand[:])] = true
				c := &out[at]
				c.toColumns(columns[p][c.Status == Fitted])
				c.Gates = gates
				c.OverLimit = overLimit(limits, c)
			}
		}
	}
	if err := writing.wait(); err != nil {
		return nil, err
	}
	return &Results{Candidates: out, digests: digests, keys: inputs, contents: contents, reckoner: r.k}, r.prune(ctx)
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
