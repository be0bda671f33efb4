package term

import (
	"groundtally/app/run"
	"groundtally/app/study"
)

var verbGet = verb{
	name: "get", usage: "get STUDY.gpkg [KEY]", summary: "reads one setting, or lists all", places: [2]int{1, 2},
	more: keyForms,
	run: func(c *call) (int, error) {
		return c.with(func(s *study.Study) (int, error) {
			snap, err := s.Snapshot()
			if err != nil {
				return 0, err
			}
			keys := snap.Keys()
			if len(c.args.places) == 2 {
				keys = []string{c.args.places[1]}
			}
			list := []map[string]any{}
			rows := [][]string{{"key", "value", "unit", "from", "source"}}
			for _, k := range keys {
				def, known := c.Catalog.Definition(k)
				if !known {
					return 0, &study.UnknownKeyError{Key: k, Nearest: c.Catalog.Nearest(k)}
				}
				if err := run.CheckKey(c.Catalog, c.Params, k); err != nil && len(c.args.places) == 2 {
					return 0, err
				}
				v, byUser, in := snap.Lookup(k)
				if !in {
					v = study.Setting{Unit: def.Unit, Source: def.Source}
				}
				state, from := v.Value, "default"
				if !in {
					state = "not in force"
				}
				if byUser {
					from = "user"
					if v.AcceptedBy != "" {
						from = v.AcceptedBy
					}
				} else if in && def.Provenance == "memory" {
					from = "default, unverified"
				}
				list = append(list, map[string]any{"key": k, "value": v.Value, "state": state, "unit": def.Unit, "default": def.Default, "source": v.Source,
					"provenance": v.Provenance, "by_user": byUser, "accepted_by": v.AcceptedBy, "reason": v.Reason, "legal": def.Legal, "what": def.What})
				rows = append(rows, []string{k, state, unitWords(def.Unit), from, v.Source})
			}
			switch {
			case c.json:
				c.printJSON(map[string]any{"study": c.args.places[0], "settings": list})
			case len(c.args.places) == 2:
				s := list[0]
				c.say("%s\n  value: %v %v\n  what: %v\n  default: %v\n  source: %v\n  accepted by: %v\n  reason: %v", s["key"], s["state"], rows[1][2], s["what"],
					orNone(s["default"]), orNone(s["source"]), orNone(s["accepted_by"]), orNone(s["reason"]))
			default:
				columns(c.out, rows, nil)
				c.say("Keys with a name in them (rule.setback.ROLE.PLANT_m, plant.ID.NAME, voice.NAME.weight.KEY and so on) are listed once they are set; gtally help set shows them.")
			}
			return ExitDone, nil
		})
	},
}

func orNone(v any) any {
	if v == "" {
		return "none"
	}
	return v
}
