package term

import (
	"errors"
	"fmt"
	"os"
	"strings"

	"groundtally/app/present"
	"groundtally/app/study"
	"groundtally/geo"
)

var verbNew = verb{
	name: "new", usage: "new STUDY.gpkg [--sample] [--name TEXT]", summary: "makes a study, empty or the Isle of Marram",
	options: []option{{name: "sample", help: "fill it with the Isle of Marram, an invented district"}, {name: "name", value: "TEXT", help: "name of the study"}},
	places:  [2]int{1, 1},
	run: func(c *call) (int, error) {
		path := c.args.places[0]
		store, err := c.Create(c.ctx, path)
		if err != nil {
			return 0, err
		}
		done := false
		defer func() {
			store.Close()
			if !done { // a half-made sample must not stay behind as if it were whole
				os.Remove(path)
			}
		}()
		s, err := study.Open(c.ctx, store, c.Catalog, study.Options{Who: c.Who, Clock: c.Clock})
		if err != nil {
			return 0, err
		}
		var layers []study.LayerRecord
		if c.args.has("sample") {
			tools, closeTools, err := c.Tools()
			if err != nil {
				return 0, err
			}
			defer closeTools()
			err = c.Sample(c.ctx, s, tools, func(r study.LayerRecord) {
				layers = append(layers, r)
				c.say("%-24s as %-18s %s", r.Name, r.Role, ledgerWords(r.Ledger))
				c.notices(r.Notices)
			})
			if err != nil {
				return 0, err
			}
		}
		if name := c.args.get("name"); name != "" {
			if _, err := s.Set(c.ctx, "set", "name of the study", study.SettingEdit{Key: "study.name", Value: name}); err != nil {
				return 0, err
			}
		}
		done = true
		if c.json {
			if layers == nil {
				layers = []study.LayerRecord{}
			}
			c.printJSON(map[string]any{"study": path, "layers": layers})
		}
		c.say("Made %s.", path)
		return ExitDone, nil
	},
}

func ledgerWords(l study.Ledger) string {
	return fmt.Sprintf("%d read, %d repaired, %d left out", l.Read, l.Repaired, l.LeftOut)
}

// notices writes notices to standard error; many of one code are counted after the third.
func (c *call) notices(ns []geo.Notice) {
	if c.calm {
		return
	}
	shown := map[string]int{}
	for _, n := range ns {
		shown[n.Code]++
		if shown[n.Code] <= 3 {
			fmt.Fprintf(c.Err, "  %s: %s\n", n.Severity, present.Notice(n))
		}
	}
	for _, code := range sortedKeys(shown) {
		if shown[code] > 3 {
			fmt.Fprintf(c.Err, "  and %d more of the kind %q; gtally check lists all\n", shown[code]-3, code)
		}
	}
}

var verbAdd = verb{
	name: "add", usage: "add STUDY.gpkg FILE --as ROLE [options]", summary: "adds a file as a layer",
	options: []option{
		{name: "as", value: "ROLE", help: "what the layer means here"},
		{name: "name", value: "TEXT", help: "name of the layer"},
		{name: "crs", value: "AUTH:CODE", help: "coordinate system of the file"},
		{name: "match", value: "FIELD=COLUMN", many: true, help: "which column is which field"},
		{name: "unit", value: "COLUMN=UNIT", many: true, help: "unit of a column"},
		{name: "personal", value: "COLUMN", many: true, help: "column that must never be drawn or exported unasked"},
		{name: "swap-axes", help: "the file has latitude before longitude"},
		{name: "replace", value: "LAYER", help: "put the file in place of this layer"},
		{name: "accept-proposals", help: "take the proposed columns and units"},
		{name: "complete", help: "the layer covers the whole place: nothing there means nothing is there"},
		{name: "edition", value: "TEXT", help: "edition or date of the data"},
		{name: "holder", value: "TEXT", help: "who holds the data"},
		{name: "reason", value: "TEXT", help: "why, for the journal"},
	},
	places: [2]int{2, 2},
	run: func(c *call) (int, error) {
		if !c.args.has("as") {
			return 0, &study.QuestionError{File: c.args.places[1], Questions: []study.Question{{Text: "what does the file mean here? The roles are: " + c.roleNames(), Option: "--as ROLE"}}}
		}
		match, err := c.args.pairs("match")
		if err != nil {
			return 0, err
		}
		unit, err := c.args.pairs("unit")
		if err != nil {
			return 0, err
		}
		return c.with(func(s *study.Study) (int, error) {
			in, err := c.ReadFile(c.ctx, c.args.places[1])
			if err != nil {
				return 0, err
			}
			in.Role, in.Name, in.CRSOption, in.Match, in.Units = c.args.get("as"), c.args.get("name"), c.args.get("crs"), match, unit
			in.Personal, in.SwapAxes, in.Replace = c.args.values["personal"], c.args.has("swap-axes"), c.args.get("replace")
			in.AcceptProposals, in.Complete = c.args.has("accept-proposals"), c.args.has("complete")
			in.Edition, in.Holder, in.Reason = c.args.get("edition"), c.args.get("holder"), c.args.get("reason")
			tools, closeTools, err := c.Tools()
			if err != nil {
				return 0, err
			}
			defer closeTools()
			r, err := s.AddLayer(c.ctx, in, tools)
			if err != nil {
				return 0, err
			}
			if c.json {
				c.printJSON(map[string]any{"study": c.args.places[0], "layer": r})
			}
			c.say("%s as %s: %s.", r.Name, r.Role, ledgerWords(r.Ledger))
			if len(r.Match) > 0 {
				for _, f := range sortedKeys(r.Match) {
					u := ""
					if r.Units[r.Match[f]] != "" {
						u = " in " + r.Units[r.Match[f]]
					}
					c.say("  field %s is column %s%s", f, r.Match[f], u)
				}
			}
			c.notices(r.Notices)
			if r.Ledger.LeftOut > 0 {
				return ExitLeftOut, nil
			}
			return ExitDone, nil
		})
	},
}

func (c *call) roleNames() string {
	names := make([]string, len(c.Catalog.Roles))
	for i, r := range c.Catalog.Roles {
		names[i] = r.Name
	}
	return strings.Join(names, ", ")
}

var reasonOption = option{name: "reason", value: "TEXT", help: "why, for the journal"}

var verbRemove = verb{
	name: "remove", usage: "remove STUDY.gpkg LAYER [--reason TEXT]", summary: "takes a layer out; undo brings it back",
	options: []option{reasonOption}, places: [2]int{2, 2},
	run: func(c *call) (int, error) {
		return c.with(func(s *study.Study) (int, error) {
			if err := s.RemoveLayer(c.ctx, c.args.places[1], c.args.get("reason")); err != nil {
				return 0, err
			}
			c.done("Removed layer " + c.args.places[1] + ".")
			return ExitDone, nil
		})
	},
}

// done answers a verb whose answer is only that it was done.
func (c *call) done(text string) {
	if c.json {
		c.printJSON(map[string]any{"study": c.args.places[0], "done": text})
	}
	c.say("%s", text)
}

var verbGroup = verb{
	name: "group", usage: "group STUDY.gpkg (--by FIELD | SITE PARCEL PARCEL ... | SITE --alone) [--reason TEXT]", summary: "groups parcels into sites",
	options: []option{{name: "by", value: "FIELD", help: "one site for every value of this column of the parcels"}, {name: "alone", help: "undo the group: each of its parcels is a site again"}, reasonOption},
	places:  [2]int{1, 100000},
	run: func(c *call) (int, error) {
		return c.with(func(s *study.Study) (int, error) {
			var groups []study.Group
			var err error
			switch {
			case c.args.has("by"):
				groups, err = s.GroupBy(c.ctx, c.args.get("by"), c.args.get("reason"))
			case c.args.has("alone") && len(c.args.places) == 2:
				err = s.Ungroup(c.ctx, c.args.places[1], c.args.get("reason"))
			case len(c.args.places) >= 3:
				groups, err = s.GroupParcels(c.ctx, c.args.places[1], c.args.places[2:], c.args.get("reason"))
			default:
				return 0, usagef("usage: gtally %s", c.verb.usage)
			}
			if err != nil {
				return 0, err
			}
			if c.json {
				if groups == nil {
					groups = []study.Group{}
				}
				c.printJSON(map[string]any{"study": c.args.places[0], "groups": groups})
			}
			for _, g := range groups {
				c.say("%s: %s", g.Site, strings.Join(g.Parcels, ", "))
			}
			return ExitDone, nil
		})
	},
}

var verbSet = verb{
	name: "set", usage: "set STUDY.gpkg KEY VALUE [--reason TEXT] [--source TEXT] [--accepted-by TEXT]", summary: "changes a setting",
	options: []option{reasonOption, {name: "source", value: "TEXT", help: "where the value stands"}, {name: "accepted-by", value: "TEXT", help: "who answers for the value"}, {name: "default", help: "take the value out, so that the default holds again"}},
	places:  [2]int{2, 3},
	run: func(c *call) (int, error) {
		if c.args.has("default") != (len(c.args.places) == 2) {
			return 0, usagef("usage: gtally %s, or gtally set STUDY.gpkg KEY --default", c.verb.usage)
		}
		return c.with(func(s *study.Study) (int, error) {
			e := study.SettingEdit{Key: c.args.places[1], Source: c.args.get("source"), Reason: c.args.get("reason"), AcceptedBy: c.args.get("accepted-by")}
			if len(c.args.places) == 3 {
				if e.Value = c.args.places[2]; e.Value == "" {
					return 0, usagef("an empty value is none; to take a setting out say gtally set STUDY.gpkg %s --default", e.Key)
				}
			}
			entry, err := s.Set(c.ctx, "set", e.Reason, e)
			if err != nil {
				return 0, err
			}
			if entry.Seq == 0 {
				c.done(e.Key + " has that value already.")
				return ExitDone, nil
			}
			snap, err := s.Snapshot()
			if err != nil {
				return 0, err
			}
			v, _, in := snap.Lookup(e.Key)
			if !in {
				c.done(e.Key + " is no longer in force.")
				return ExitDone, nil
			}
			c.done(strings.TrimSpace(fmt.Sprintf("%s is %s %s", e.Key, v.Value, present.Unit(v.Unit))) + ".")
			return ExitDone, nil
		})
	},
}

var verbGet = verb{
	name: "get", usage: "get STUDY.gpkg [KEY]", summary: "reads one setting, or lists all", places: [2]int{1, 2},
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
			var list []map[string]any
			rows := [][]string{{"key", "value", "unit", "from", "source"}}
			for _, k := range keys {
				def, known := c.Catalog.Definition(k)
				if !known {
					return 0, &study.UnknownKeyError{Key: k, Nearest: c.Catalog.Nearest(k)}
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
				rows = append(rows, []string{k, state, def.Unit, from, v.Source})
			}
			if c.json {
				c.printJSON(map[string]any{"study": c.args.places[0], "settings": list})
				return ExitDone, nil
			}
			if len(keys) == 1 {
				s := list[0]
				c.say("%s\n  value: %v %v\n  what: %v\n  default: %v\n  source: %v\n  accepted by: %v\n  reason: %v", s["key"], s["state"], s["unit"], s["what"], orDash(s["default"]), orDash(s["source"]), orDash(s["accepted_by"]), orDash(s["reason"]))
				return ExitDone, nil
			}
			columns(c.Out, rows)
			return ExitDone, nil
		})
	},
}

func orDash(v any) any {
	if v == "" {
		return "none"
	}
	return v
}

var verbUndo = verb{name: "undo", usage: "undo STUDY.gpkg", summary: "takes back the last edit", places: [2]int{1, 1}, run: stepVerb((*study.Study).Undo, "Took back")}
var verbRedo = verb{name: "redo", usage: "redo STUDY.gpkg", summary: "brings back the edit last taken back", places: [2]int{1, 1}, run: stepVerb((*study.Study).Redo, "Brought back")}

var verbJournal = verb{
	name: "journal", usage: "journal STUDY.gpkg", summary: "lists every change made to the study", places: [2]int{1, 1},
	run: func(c *call) (int, error) {
		return c.with(func(s *study.Study) (int, error) {
			entries := s.Journal()
			if c.json {
				c.printJSON(map[string]any{"study": c.args.places[0], "journal": entries, "frozen": frozenList(s)})
				return ExitDone, nil
			}
			rows := [][]string{}
			for _, e := range entries {
				rows = append(rows, []string{fmt.Sprint(e.Seq), e.At.Format("2006-01-02 15:04"), e.Who, e.Verb, changeWords(e), e.Reason})
			}
			columns(c.Out, rows)
			for _, f := range s.FrozenStates() {
				c.say("frozen %q after change %d, check code %s", f.Name, f.Seq, orDash(f.Code))
			}
			return ExitDone, nil
		})
	},
}

func frozenList(s *study.Study) []map[string]any {
	out := []map[string]any{}
	for _, f := range s.FrozenStates() {
		out = append(out, map[string]any{"name": f.Name, "at": f.At, "seq": f.Seq, "code": f.Code})
	}
	return out
}

func changeWords(e study.Entry) string {
	if e.Of != 0 {
		return fmt.Sprintf("change %d", e.Of)
	}
	if len(e.Changes) == 1 {
		ch := e.Changes[0]
		return fmt.Sprintf("%s %s", ch.Kind, ch.Key)
	}
	return fmt.Sprintf("%d records", len(e.Changes))
}

var errUsageFreeze = errors.New("a frozen state needs a name")

var verbFreeze = verb{
	name: "freeze", usage: "freeze STUDY.gpkg NAME", summary: "keeps the present state under a name", places: [2]int{2, 2},
	run: func(c *call) (int, error) {
		if strings.TrimSpace(c.args.places[1]) == "" {
			return 0, &usageError{errUsageFreeze.Error()}
		}
		return c.with(func(s *study.Study) (int, error) {
			r, err := c.compute(s)
			if err != nil {
				return 0, err
			}
			f, err := s.Freeze(c.ctx, c.args.places[1], r.Code.Check)
			if err != nil {
				return 0, err
			}
			if c.json {
				c.printJSON(map[string]any{"study": c.args.places[0], "name": f.Name, "seq": f.Seq, "code": f.Code})
			}
			c.say("Frozen as %q with check code %s.", f.Name, f.Code)
			return ExitDone, nil
		})
	},
}
