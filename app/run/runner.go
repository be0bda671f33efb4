package run

import (
	"context"
	"fmt"

	"groundtally/app/study"
)

// runner carries one computation through the steps.
type runner struct {
	w        *world
	cores    int
	cache    Cache
	progress Progress

	pending []study.Result
	kept    map[string]map[string]bool
	counts  []StepCount

	sets       map[string]*ruleset // by option/part
	groundKeys map[string][]string // by option/part, per site
	groundData map[string][]byte   // by key, those that were stored
	groundLive map[string]*groundResult
	fitLive    map[string]*fitResult
}

// groundOf gives the ground of a site under an option's part: computed just now, or stored.
func (r *runner) groundOf(name string, s int) (*groundResult, error) {
	key := r.groundKeys[name][s]
	if g, ok := r.groundLive[key]; ok {
		return g, nil
	}
	var g groundResult
	err := unpack(r.groundData[key], &g)
	return &g, err
}

// fitOf gives a fit: computed just now, or stored.
func (r *runner) fitOf(key string, stored map[string][]byte) (*fitResult, error) {
	if f, ok := r.fitLive[key]; ok {
		return f, nil
	}
	var f fitResult
	err := unpack(stored[key], &f)
	return &f, err
}

func (r *runner) cached(ctx context.Context, step string, keys []string) (map[string][]byte, error) {
	if r.cache == nil {
		return map[string][]byte{}, nil
	}
	have, err := r.cache.Results(ctx, step, keys)
	if err != nil {
		return nil, fmt.Errorf("read stored results of step %s: %w", step, err)
	}
	return have, nil
}

func (r *runner) add(res study.Result) { r.pending = append(r.pending, res) }

func (r *runner) keep(step string, keys []string) {
	if r.kept == nil {
		r.kept = map[string]map[string]bool{}
	}
	m := make(map[string]bool, len(keys))
	for _, k := range keys {
		m[k] = true
	}
	r.kept[step] = m
}

func (r *runner) count(step string, computed, valid int) {
	r.counts = append(r.counts, StepCount{Step: step, Computed: computed, Valid: valid})
}

func (r *runner) report(step string, total int) func(done int) {
	if r.progress == nil {
		return nil
	}
	return func(done int) { r.progress(step, done, total) }
}

// save writes new results. Older ones stay, so that undo finds them valid, until more than half of
// everything is new: then what this state does not need is dropped, which bounds the file.
func (r *runner) save(ctx context.Context) error {
	if r.cache == nil || len(r.pending) == 0 {
		return nil
	}
	all := 0
	for _, keys := range r.kept {
		all += len(keys)
	}
	keep := r.kept
	if 2*len(r.pending) <= all {
		keep = nil
	}
	if err := r.cache.PutResults(ctx, r.pending, keep); err != nil {
		return fmt.Errorf("keep results: %w", err)
	}
	return nil
}
