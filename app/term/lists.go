package term

import (
	"fmt"

	"groundtally/app/appendix"
	"groundtally/app/present"
	"groundtally/app/run"
	"groundtally/app/study"
)

var verbRequests = verb{
	name: "requests", usage: "requests STUDY.gpkg [--all] [--to FILE.html [--replace]]", summary: "data to ask for: per role its use, fields, usual holder, what stays unknown without it", places: [2]int{1, 1},
	options: []option{{name: "all", help: "roles that the study has, too"}, {name: "to", value: "FILE.html", help: "write a page to print"}, replaceOption},
	run: func(c *call) (int, error) {
		if err := c.freeFile(c.args.get("to")); err != nil {
			return 0, err
		}
		return c.with(func(s *study.Study) (int, error) {
			snap, err := s.Snapshot()
			if err != nil {
				return 0, err
			}
			if to := c.args.get("to"); to != "" {
				b, err := appendix.Requests(snap, c.Params, c.args.has("all"))
				if err != nil {
					return 0, err
				}
				if err := c.Write(to, b); err != nil {
					return 0, err
				}
				c.done("Wrote " + to + ".")
				return ExitDone, nil
			}
			type request struct {
				Role    string   `json:"role"`
				Purpose string   `json:"purpose"`
				Needed  []string `json:"needed"`
				Useful  []string `json:"useful"`
				Holder  string   `json:"holder"`
				Without string   `json:"without"`
			}
			titles := c.Params.Titled()
			list := []request{}
			for _, r := range c.Catalog.Roles {
				if len(snap.LayersOf(r.Name)) > 0 && !c.args.has("all") {
					continue
				}
				q := request{Role: r.Name, Purpose: r.Purpose, Needed: []string{}, Useful: []string{}, Holder: r.Holder, Without: titles(r.WithoutIt)}
				for _, f := range r.Fields {
					if f.Required {
						q.Needed = append(q.Needed, f.Name)
					} else {
						q.Useful = append(q.Useful, f.Name)
					}
				}
				list = append(list, q)
				c.say("%s (%s): %s\n  needed: %s\n  useful besides: %s\n  usually held by: %s\n  without it: %s", r.Title, r.Name, r.Purpose, listed(q.Needed), listed(q.Useful), r.Holder, q.Without)
			}
			if c.json {
				c.printJSON(map[string]any{"study": c.args.places[0], "requests": list})
			}
			return ExitDone, nil
		})
	},
}

var verbCoverage = verb{
	name: "coverage", usage: "coverage STUDY.gpkg [--to FILE.html [--replace]] [--frozen NAME]", summary: "for how many candidates each consequence is known", places: [2]int{1, 1},
	options: []option{{name: "to", value: "FILE.html", help: "write a page to print"}, replaceOption, frozenOption, coresOption},
	run: func(c *call) (int, error) {
		if err := c.freeFile(c.args.get("to")); err != nil {
			return 0, err
		}
		return c.with(func(s *study.Study) (int, error) {
			r, err := c.compute(s)
			if err != nil {
				return 0, err
			}
			c.tell(r)
			if to := c.args.get("to"); to != "" {
				snap, err := c.state(s)
				if err != nil {
					return 0, err
				}
				b, err := appendix.CoveragePage(snap, c.Params, r)
				if err != nil {
					return 0, err
				}
				if err := c.Write(to, b); err != nil {
					return 0, err
				}
				c.done("Wrote " + to + ".")
				return ExitDone, nil
			}
			list := run.Covered(c.Params, r)
			if c.json {
				c.printJSON(map[string]any{"study": c.args.places[0], "coverage": list})
				return ExitDone, nil
			}
			rows := [][]string{{"consequence", "known", "none", "unknown", "not set", "not assessed", "most frequent reason"}}
			for _, k := range list {
				why := ""
				if len(k.Why) > 0 {
					why = present.Reason(k.Why[0].Why)
				}
				row := []string{k.Key}
				for _, n := range []int{k.Known, k.None, k.Unknown, k.NotSet, k.Not} {
					row = append(row, fmt.Sprint(n))
				}
				rows = append(rows, append(row, why))
			}
			columns(c.out, rows, map[int]bool{1: true, 2: true, 3: true, 4: true, 5: true})
			return ExitDone, nil
		})
	},
}
