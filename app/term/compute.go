package term

import (
	"context"
	"errors"
	"fmt"
	"strings"

	"groundtally/app/run"
	"groundtally/app/study"
)

// frozen finds the frozen state that --frozen names; without the option it gives nil.
func (c *call) frozen(s *study.Study) (*study.Frozen, error) {
	if !c.args.has("frozen") {
		return nil, nil
	}
	name := c.args.get("frozen")
	states := s.FrozenStates()
	names := make([]string, len(states))
	for i := range states {
		if names[i] = states[i].Name; names[i] == name {
			return &states[i], nil
		}
	}
	if len(names) == 0 {
		return nil, usagef("the study has no frozen state yet; gtally freeze %s NAME makes one", shellWord(c.args.places[0]))
	}
	return nil, usagef("there is no frozen state %q; the frozen states are: %s", name, strings.Join(names, ", "))
}

// state gives the state of the study that the verb answers for: the present one, or a frozen one.
func (c *call) state(s *study.Study) (*study.Snapshot, error) {
	f, err := c.frozen(s)
	switch {
	case err != nil:
		return nil, err
	case f != nil:
		return study.NewSnapshot(c.Catalog, f.Records)
	}
	return s.Snapshot()
}

// compute carries the study through all steps, keeping step results in the study file.
func (c *call) compute(s *study.Study) (*run.Results, error) {
	return c.computeWith(s, true)
}

// computeWith computes; without stored step results everything is computed from the inputs.
func (c *call) computeWith(s *study.Study, stored bool) (*run.Results, error) {
	snap, err := c.state(s)
	if err != nil {
		return nil, err
	}
	if qs := c.unanswered(snap); len(qs) > 0 {
		return nil, &questionsError{qs}
	}
	e, err := c.engine(s, stored)
	if err != nil {
		return nil, err
	}
	r, err := e.Compute(c.ctx, snap)
	if err != nil {
		return nil, computing(err)
	}
	return r, nil
}

// computing parts errors of the steps: faults of the program, errors of the file, and data or settings
// that cannot be used as they are.
func computing(err error) error {
	if what, details, ok := strings.Cut(err.Error(), "\ngoroutine "); ok { // a worker's caught panic carries its stack
		return &faultError{what: what, details: details}
	}
	for _, known := range []error{context.Canceled, study.ErrDamaged, study.ErrDiskFull, study.ErrReadOnly, study.ErrBusy, study.ErrNotThere} {
		if errors.Is(err, known) {
			return err
		}
	}
	return &inputError{err}
}

// engine wires an engine to the study.
func (c *call) engine(s *study.Study, stored bool) (*run.Engine, error) {
	cores, err := c.args.whole("cores", 1, 0)
	if err != nil {
		return nil, err
	}
	e := &run.Engine{Params: c.Params, Load: run.StoreLoader(s.Store()), Cores: cores}
	switch {
	case stored && c.args.has("frozen"):
		e.Cache = &keeping{store: s.Store(), c: c, lookOnly: true}
	case stored:
		e.Cache = &keeping{store: s.Store(), c: c}
	}
	if c.Terminal && !c.calm {
		last := ""
		e.Progress = func(step string, done, total int) {
			if done == total || step != last || done%50 == 0 {
				fmt.Fprintf(c.Err, "\r%s: %d of %d", step, done, total)
			}
			if done == total {
				fmt.Fprintln(c.Err)
			}
			last = step
		}
	}
	return e, nil
}

// keeping keeps step results in the study. They can always be made again, so a study that cannot be
// written, as a copy that somebody else is only to read, still gives its answers.
type keeping struct {
	store    study.Store
	c        *call
	lookOnly bool // keeps nothing: the study keeps the results of one state, which is the present one
}

func (k *keeping) Results(ctx context.Context, step string, digests []string) (map[string][]byte, error) {
	return k.store.Results(ctx, step, digests)
}

func (k *keeping) PutResults(ctx context.Context, add []study.Result, keep map[string]map[string]bool) error {
	if k.lookOnly {
		return nil
	}
	err := k.store.PutResults(ctx, add, keep)
	for _, only := range []error{study.ErrReadOnly, study.ErrDiskFull, study.ErrBusy} {
		if errors.Is(err, only) {
			k.c.note("The results are not kept in the study, so the next verb computes them again: %v.", err)
			return nil
		}
	}
	return err
}

// tell says on standard error what was stale and was computed.
func (c *call) tell(r *run.Results) {
	var parts []string
	for _, st := range r.Steps {
		if st.Computed > 0 && st.Step != "order" {
			parts = append(parts, fmt.Sprintf("%s %d", st.Step, st.Computed))
		}
	}
	if len(parts) > 0 {
		c.note("Computed first what was stale: %s.", strings.Join(parts, ", "))
	}
}

var verbCompute = verb{
	name: "compute", usage: "compute STUDY.gpkg [--cores N] [--seed N]", summary: "computes all candidates and consequences",
	options: []option{coresOption, {name: "seed", value: "N", help: "sets the seed of the trials first, as an edit"}},
	places:  [2]int{1, 1},
	run: func(c *call) (int, error) {
		if _, err := c.args.whole("cores", 1, 0); err != nil {
			return 0, err
		}
		if _, err := c.args.whole("seed", 0, 0); err != nil {
			return 0, err
		}
		return c.with(func(s *study.Study) (int, error) {
			if v := c.args.get("seed"); v != "" {
				if _, err := s.Set(c.ctx, "set", "seed given with compute", study.SettingEdit{Key: "run.seed", Value: v}); err != nil {
					return 0, err
				}
			}
			r, err := c.compute(s)
			if err != nil {
				return 0, err
			}
			status := map[string]map[string]int{}
			for _, cand := range r.Candidates {
				if status[cand.Plant] == nil {
					status[cand.Plant] = map[string]int{}
				}
				status[cand.Plant][cand.Status]++
			}
			if c.json {
				c.printJSON(map[string]any{"study": c.args.places[0], "steps": r.Steps, "candidates": status, "code": r.Code, "notices": c.noticeList(r.Notices)})
				return ExitDone, nil
			}
			rows := [][]string{{"step", "computed", "still valid"}}
			for _, st := range r.Steps {
				rows = append(rows, []string{st.Step, fmt.Sprint(st.Computed), fmt.Sprint(st.Valid)})
			}
			columns(c.out, rows, map[int]bool{1: true, 2: true})
			c.say("")
			rows = [][]string{{"plant option", "fitted", "no room", "not computed"}}
			for _, plant := range sortedKeys(status) {
				m := status[plant]
				rows = append(rows, []string{plant, fmt.Sprint(m[run.Fitted]), fmt.Sprint(m[run.NoRoom]), fmt.Sprint(m[run.NotComputed])})
			}
			columns(c.out, rows, map[int]bool{1: true, 2: true, 3: true})
			c.notices(r.Notices)
			c.say("A typical year has 8,760 hours. Check code %s", r.Code.Check)
			return ExitDone, nil
		})
	},
}
