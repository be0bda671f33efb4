package term

import (
	"fmt"
	"strconv"
	"strings"

	"groundtally/app/present"
	"groundtally/app/run"
	"groundtally/app/study"
	"groundtally/scoring"
)

// compute carries the study through all steps, keeping step results in the study file.
func (c *call) compute(s *study.Study) (*run.Results, error) {
	snap, err := s.Snapshot()
	if err != nil {
		return nil, err
	}
	return c.engine(s, true).Compute(c.ctx, snap)
}

// engine wires an engine to the study; without cache everything is computed from the inputs.
func (c *call) engine(s *study.Study, cached bool) *run.Engine {
	e := &run.Engine{Params: c.Params, Load: run.StoreLoader(s.Store())}
	if cached {
		e.Cache = s.Store()
	}
	if n, err := strconv.Atoi(c.args.get("cores")); err == nil {
		e.Cores = n
	}
	if c.Terminal && !c.calm {
		last := ""
		e.Progress = func(step string, done, total int) {
			line := fmt.Sprintf("\r%s: %d of %d", step, done, total)
			if done == total || step != last || done%50 == 0 {
				fmt.Fprint(c.Err, line)
			}
			if done == total {
				fmt.Fprintln(c.Err)
			}
			last = step
		}
	}
	return e
}

// tell says on standard error what was computed and what was still valid.
func (c *call) tell(r *run.Results) {
	var parts []string
	for _, st := range r.Steps {
		parts = append(parts, fmt.Sprintf("%s %d computed, %d still valid", st.Step, st.Computed, st.Valid))
	}
	c.note("%s.", strings.Join(parts, "; "))
}

var verbCompute = verb{
	name: "compute", usage: "compute STUDY.gpkg [--cores N] [--seed N]", summary: "computes all candidates and consequences",
	options: []option{{name: "cores", value: "N", help: "how many processor cores to use; the digits do not depend on it"}, {name: "seed", value: "N", help: "sets the seed of the trials first, as an edit"}},
	places:  [2]int{1, 1},
	run: func(c *call) (int, error) {
		if v := c.args.get("cores"); v != "" {
			if n, err := strconv.Atoi(v); err != nil || n < 1 {
				return 0, usagef("--cores wants a whole number from 1, not %q", v)
			}
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
				c.printJSON(map[string]any{"study": c.args.places[0], "steps": r.Steps, "candidates": status, "code": r.Code})
				return ExitDone, nil
			}
			for _, st := range r.Steps {
				c.say("%-10s %6d computed, %6d still valid", st.Step, st.Computed, st.Valid)
			}
			for _, plant := range sortedKeys(status) {
				m := status[plant]
				c.say("%-16s %5d fitted, %5d without room, %5d not computed", plant, m[run.Fitted], m[run.NoRoom], m[run.NotComputed])
			}
			c.notices(r.Notices)
			c.say("A typical year has 8,760 hours. Check code %s", r.Code.Check)
			return ExitDone, nil
		})
	},
}

var verbCheck = verb{
	name: "check", usage: "check STUDY.gpkg", summary: "all notices on data and settings", places: [2]int{1, 1},
	run: func(c *call) (int, error) {
		return c.with(func(s *study.Study) (int, error) {
			if err := s.Store().Check(c.ctx); err != nil {
				return 0, err
			}
			notices, err := run.Check(c.ctx, s, c.Params)
			if err != nil {
				return 0, err
			}
			bad := 0
			for _, n := range notices {
				if n.Severity > 1 {
					bad++
				}
			}
			if c.json {
				c.printJSON(map[string]any{"study": c.args.places[0], "notices": notices, "unreliable": bad})
			}
			for _, n := range notices {
				c.say("%-8s %s", n.Severity, present.Notice(n))
			}
			if bad > 0 {
				c.say("%d of %d notices make results unreliable.", bad, len(notices))
				return ExitNo, nil
			}
			c.say("%d notices; none makes results unreliable.", len(notices))
			return ExitDone, nil
		})
	},
}

var tableKeys = []string{"buildable_area_ha", "rated_kw", "delivered_mwh_per_yr", "eroi_delivered", "net_share", "footprint_direct_ha_per_gwh", "ghg_g_per_kwh", "nearest_dwelling_m", "habitat_ha", "connection_km"}

var verbTable = verb{
	name: "table", usage: "table STUDY.gpkg [--plant ID] [--site ID] [--sort KEY] [--top N] [--keys KEY,KEY]", summary: "the consequence table",
	options: []option{{name: "plant", value: "ID", help: "only this plant option"}, {name: "site", value: "ID", help: "only this site"},
		{name: "sort", value: "KEY", help: "best first by this consequence"}, {name: "top", value: "N", help: "only the first N rows"},
		{name: "keys", value: "KEY,KEY", help: "columns to print; all are in the JSON"}, {name: "cores", value: "N", help: "cores for computing what is stale"}},
	places: [2]int{1, 1},
	run: func(c *call) (int, error) {
		top := 0
		if v := c.args.get("top"); v != "" {
			var err error
			if top, err = strconv.Atoi(v); err != nil || top < 1 {
				return 0, usagef("--top wants a whole number from 1, not %q", v)
			}
		}
		keys := tableKeys
		if v := c.args.get("keys"); v != "" {
			keys = strings.Split(v, ",")
		}
		for _, k := range append(append([]string(nil), keys...), c.args.get("sort")) {
			if k != "" && !c.knownKey(k) {
				return 0, usagef("there is no consequence %q", k)
			}
		}
		return c.with(func(s *study.Study) (int, error) {
			r, err := c.compute(s)
			if err != nil {
				return 0, err
			}
			c.tell(r)
			var list []*run.Candidate
			for i := range r.Candidates {
				cand := &r.Candidates[i]
				if (c.args.has("plant") && cand.Plant != c.args.get("plant")) || (c.args.has("site") && cand.Site != c.args.get("site")) {
					continue
				}
				list = append(list, cand)
			}
			if len(list) == 0 {
				return 0, fmt.Errorf("no candidate of that plant or site: %w", study.ErrNotThere)
			}
			if k := c.args.get("sort"); k != "" {
				run.SortBy(list, c.Catalog, k)
			}
			all := len(list)
			if top > 0 && top < len(list) {
				list = list[:top]
			}
			if c.json {
				out := make([]map[string]any, len(list))
				for i, cand := range list {
					out[i] = cand.PublicJSON()
				}
				c.printJSON(map[string]any{"study": c.args.places[0], "candidates": out, "of": all, "code": r.Code, "hours_per_year": 8760})
				return ExitDone, nil
			}
			head := []string{"site", "plant", "status"}
			unit := []string{"", "", ""}
			for _, k := range keys {
				head = append(head, k)
				unit = append(unit, present.Unit(c.unitOf(k)))
			}
			rows := [][]string{head, unit}
			for _, cand := range list {
				row := []string{cand.Site, cand.Plant, strings.ReplaceAll(cand.Status, "_", " ")}
				for _, k := range keys {
					q, ok := cand.Consequence(k)
					if !ok {
						row = append(row, "")
						continue
					}
					row = append(row, present.Cell(q))
				}
				rows = append(rows, row)
			}
			columns(c.Out, rows)
			c.say("%d of %d candidates. %d of %d consequences are shown; the JSON holds all. A typical year has 8,760 hours.", len(list), all, len(keys), len(c.Params.Keys()))
			return ExitDone, nil
		})
	},
}

func (c *call) knownKey(key string) bool {
	for _, k := range c.Params.Keys() {
		if k.Key == key {
			return true
		}
	}
	return false
}

func (c *call) unitOf(key string) string {
	for _, k := range c.Params.Keys() {
		if k.Key == key {
			return k.Unit
		}
	}
	return ""
}

var verbWhy = verb{
	name: "why", usage: "why STUDY.gpkg SITE PLANT [KEY]", summary: "unfolds a candidate, or one consequence", places: [2]int{3, 4},
	options: []option{{name: "cores", value: "N", help: "cores for computing what is stale"}},
	run: func(c *call) (int, error) {
		return c.with(func(s *study.Study) (int, error) {
			r, err := c.compute(s)
			if err != nil {
				return 0, err
			}
			c.tell(r)
			cand, err := r.Find(c.args.places[1], c.args.places[2])
			if err != nil {
				return 0, err
			}
			snap, err := s.Snapshot()
			if err != nil {
				return 0, err
			}
			if len(c.args.places) == 3 {
				if c.json {
					c.printJSON(map[string]any{"study": c.args.places[0], "candidate": cand.PublicJSON()})
					return ExitDone, nil
				}
				c.candidate(cand)
				return ExitDone, nil
			}
			u, err := run.Unfold(c.Params, snap, cand, c.args.places[3])
			if err != nil {
				return 0, err
			}
			if c.json {
				c.printJSON(map[string]any{"study": c.args.places[0], "site": cand.Site, "plant": cand.Plant, "key": c.args.places[3], "unfolding": u})
				return ExitDone, nil
			}
			c.unfolding(u, 0, map[string]bool{})
			return ExitDone, nil
		})
	},
}

// candidate prints everything that follows from a candidate, by account.
func (c *call) candidate(cand *run.Candidate) {
	c.say("%s with %s: %s %s", cand.Site, cand.Plant, strings.ReplaceAll(cand.Status, "_", " "), cand.Reason)
	if m := cand.Miss; m != nil {
		c.say("  nearest miss: largest piece %.2f ha of %.2f ha buildable; at least %.2f ha is asked for; %s takes %.2f ha", m.LargestPatchHa, m.BuildableHa, m.NeedsPatchHa, m.LargestTaker, m.TakesHa)
	}
	for _, t := range cand.Taken {
		all := ""
		if t.TakesAll {
			all = "; alone it takes the whole site"
		}
		c.say("  taken by %-22s %8.2f ha alone, %8.2f ha shared%s", t.Rule, t.AloneHa, t.SharedHa, all)
	}
	c.say("  taken by several rules %.2f ha; by smallest width or patch %.2f ha", cand.TakenSharedHa, cand.ShapeHa)
	if f := cand.Fit; f != nil {
		c.say("  fit: %s, %.0f kW rated, %.0f kW at the terminals, %d turbines, %.2f ha fenced", f.Mode, f.RatedKW, f.ACKW, len(f.Turbines), f.FencedHa)
	}
	if n := cand.Connection; n != nil {
		c.say("  connection: %s (%s, %g kV), %s %s; %.2f km straight, %.2f km routed, %d × %s", n.Asset, n.Kind, n.VoltageKV, n.Status, n.Reason, n.StraightKm, n.RouteKm, n.Circuits, n.Conductor)
	}
	for _, st := range cand.Chain {
		c.say("  %-24s %12.1f %-8s %+7.2f %%", st.Name, st.After, st.Unit, -100*st.Share)
	}
	for _, a := range scoring.Accounts() {
		first := true
		for _, q := range cand.Consequences {
			if q.Account != a {
				continue
			}
			if first {
				c.say("account %s", a)
				first = false
			}
			why := ""
			if q.State != scoring.Number && q.Why != "" {
				why = "(" + q.Why + ")"
			}
			c.say("  %-36s %12s %-14s %s %s", q.Key, present.Cell(q), present.Unit(q.Unit), present.Span(q), why)
		}
	}
	for _, k := range cand.OverLimit {
		c.say("OVER THE LIMIT: %s", k)
	}
	for _, n := range cand.Notices {
		c.say("notice: %s", present.Sentence(n, nil))
	}
}

// unfolding prints a tree of formulas, each quantity once.
func (c *call) unfolding(u *run.Unfolding, depth int, seen map[string]bool) {
	pad := strings.Repeat("  ", depth)
	value := u.State
	if u.State == "number" {
		value = strconv.FormatFloat(u.Value, 'g', 6, 64)
	}
	line := fmt.Sprintf("%s%s = %s %s", pad, u.Name, value, present.Unit(u.Unit))
	if u.Range != "" {
		line += fmt.Sprintf("  [%.5g to %.5g, %s]", u.Low, u.High, u.Range)
	}
	if u.Why != "" {
		line += "  (" + u.Why + ")"
	}
	c.say("%s", line)
	if u.Formula != "" {
		c.say("%s  = %s", pad, u.Formula)
	}
	if u.Source != "" {
		p := ""
		if u.Provenance != "" {
			p = " [" + u.Provenance + "]"
		}
		c.say("%s  source: %s%s", pad, u.Source, p)
	}
	for _, n := range u.Notices {
		c.say("%s  notice: %s", pad, present.Sentence(n, nil))
	}
	if seen[u.Name] && len(u.Inputs) > 0 {
		c.say("%s  (unfolded above)", pad)
		return
	}
	seen[u.Name] = true
	for _, in := range u.Inputs {
		c.unfolding(in, depth+1, seen)
	}
}
