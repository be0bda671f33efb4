package term

import (
	"strings"

	"groundtally/app/present"
	"groundtally/app/run"
	"groundtally/app/study"
)

var verbRegister = verb{
	name: "register", usage: "register STUDY.gpkg [--plant ID] [--site ID] [--near] [--frozen NAME]", summary: "every candidate that is out, by which rules and by how much", places: [2]int{1, 1},
	more: "With --near, the nearest misses too: for every candidate that is listed, the smallest change of one rule that\nwould give it a plant, all other rules as they are, found by halving. That takes seconds for each, so it asks for --site.",
	options: []option{{name: "plant", value: "ID", help: "only this plant option"}, {name: "site", value: "ID", help: "only this site"},
		{name: "near", help: "with the nearest misses"}, frozenOption, coresOption},
	run: func(c *call) (int, error) {
		if c.args.has("near") && !c.args.has("site") {
			return 0, usagef("--near needs --site ID")
		}
		return c.with(func(s *study.Study) (int, error) {
			r, err := c.compute(s)
			if err != nil {
				return 0, err
			}
			c.tell(r)
			if err := c.knownNames(r, c.args.get("site"), c.args.get("plant")); err != nil {
				return 0, err
			}
			snap, err := c.state(s)
			if err != nil {
				return 0, err
			}
			asked := func(site, plant string) bool {
				return (!c.args.has("plant") || plant == c.args.get("plant")) && (!c.args.has("site") || site == c.args.get("site"))
			}
			of := 0 // candidates that were asked for
			for i := range r.Candidates {
				if asked(r.Candidates[i].Site, r.Candidates[i].Plant) {
					of++
				}
			}
			var list []outRow
			for _, o := range run.Register(snap, r) {
				if asked(o.Site, o.Plant) {
					list = append(list, outRow{Out: o})
				}
			}
			if c.args.has("near") {
				sv := run.NewSurveyor(snap, c.Params, run.StoreLoader(s.Store()), nil)
				for i := range list {
					if list[i].Status != run.NoRoom {
						continue
					}
					cand, err := r.Find(list[i].Site, list[i].Plant)
					if err != nil {
						return 0, err
					}
					if list[i].Near, err = sv.NearestMiss(c.ctx, cand); err != nil {
						return 0, computing(err)
					}
					list[i].looked = true
				}
			}
			if c.json {
				if list == nil {
					list = []outRow{}
				}
				c.printJSON(map[string]any{"study": c.args.places[0], "out": list, "of": of})
				return ExitDone, nil
			}
			c.register(list, of)
			return ExitDone, nil
		})
	},
}

// outRow is a row of the register.
type outRow struct {
	run.Out
	Near   []run.Relaxed `json:"nearest_misses,omitempty"`
	looked bool
}

func (c *call) register(list []outRow, of int) {
	for _, o := range list {
		why := present.Named(o.Status)
		if o.Reason != "" {
			why += ", " + present.Reason(o.Reason)
		}
		c.say("%s with %s: %s. Of %s ha, %s ha are buildable; largest patch %s ha.", o.Site, o.Plant, why, ha(o.GrossHa), ha(o.BuildableHa), ha(o.LargestPatchHa))
		for _, t := range o.Rules {
			all := ""
			if t.TakesAll {
				all = ", the whole site"
			}
			data := ""
			if len(t.Data) > 0 {
				data = " (" + strings.Join(t.Data, "; ") + ")"
			}
			c.say("  %s takes %s ha%s: %s alone, %s shared%s", present.Rule(t.Rule), ha(t.AloneHa+t.SharedHa), all, ha(t.AloneHa), ha(t.SharedHa), data)
		}
		if o.ShapeHa > 0 {
			c.say("  smallest width and patch take %s ha", ha(o.ShapeHa))
		}
		if o.looked && len(o.Near) == 0 {
			c.say("  no change of a single rule would bring it back")
		}
		for i, n := range o.Near {
			lead := "nearest miss"
			if i > 0 {
				lead = "or"
			}
			c.say("  %s: %s", lead, present.Relaxation(n.Rule, n.Part, n.From, n.To, n.Unit, n.Lifted))
		}
	}
	c.say("%d of %d candidates are out.", len(list), of)
}

func ha(x float64) string { return present.Hectares(x) }
