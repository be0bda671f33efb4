package term

import (
	"strings"

	"groundtally/app/methods"
	"groundtally/app/study"
	"groundtally/scoring"
)

var verbMethods = verb{
	name: "methods", usage: "methods STUDY.gpkg [--account NAME] [--frozen NAME]", summary: "formulas in force, and what the literature disputes",
	options: []option{{name: "account", value: "NAME", help: "only this account: energy, land or climate"}, frozenOption},
	places:  [2]int{1, 1},
	run: func(c *call) (int, error) {
		accounts := methods.Accounts
		if c.args.has("account") {
			accounts = nil
			for _, a := range methods.Accounts {
				if string(a) == c.args.get("account") {
					accounts = append(accounts, a)
				}
			}
			if accounts == nil {
				return 0, usagef("--account %q: methods are told of energy, land and climate", c.args.get("account"))
			}
		}
		list, err := methods.Shipped()
		if err != nil {
			return 0, err
		}
		return c.with(func(s *study.Study) (int, error) {
			snap, err := c.state(s)
			if err != nil {
				return 0, err
			}
			out := []map[string]any{}
			for _, a := range accounts {
				one, err := c.methods(snap, a, methods.Of(list, a))
				if err != nil {
					return 0, err
				}
				out = append(out, one)
			}
			if c.json {
				c.printJSON(map[string]any{"study": c.args.places[0], "accounts": out})
			}
			return ExitDone, nil
		})
	},
}

// methods prints what is disputed of an account and its formulas, and gives both for the JSON.
func (c *call) methods(snap *study.Snapshot, a scoring.Account, list []methods.Dispute) (map[string]any, error) {
	const width = 100
	say := func(text, edge string) {
		if !c.json {
			c.say("%s%s", edge, wrapped(text, width, "\n"+edge))
		}
	}
	say(strings.ToUpper(string(a)), "")
	disputes := []map[string]any{}
	for _, d := range list {
		now, err := methods.InForce(c.Params, snap, d)
		if err != nil {
			return nil, err
		}
		disputes = append(disputes, map[string]any{"topic": d.Topic, "disputed": d.Disputed, "here": d.Here, "in_force": now, "source": d.Source, "provenance": string(d.Provenance)})
		say(d.Topic, "")
		say(d.Disputed, "  ")
		say("Here: "+d.Here, "  ")
		if now != "" {
			say("In this study: "+now+".", "  ")
		}
		say("Source: "+d.SourceWords(), "  ")
	}
	formulas, _ := methods.Formulas(c.Params, a)
	told := []map[string]any{}
	say("Formulas in force", "")
	for _, f := range formulas {
		told = append(told, map[string]any{"key": f.Key, "title": f.Title, "unit": f.Unit, "formula": f.Text, "source": f.Source})
		say(f.Key+": "+f.Text, "  ")
		say("source: "+f.Source, "    ")
	}
	if !c.json {
		c.say("")
	}
	return map[string]any{"account": string(a), "disputed": disputes, "formulas": told}, nil
}
