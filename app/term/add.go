package term

import (
	"fmt"
	"slices"
	"strings"

	"groundtally/app/study"
)

var verbAdd = verb{
	name: "add", usage: "add STUDY.gpkg FILE --as ROLE [options]", summary: "adds a file as a layer",
	more: "What the file does not say is asked for, never guessed: then nothing is added (exit 2).\nExit 1: the file cannot be added. Exit 3: added, but some features were left out.",
	options: []option{
		{name: "as", value: "ROLE", help: "what the layer means here"},
		{name: "name", value: "TEXT", help: "name of the layer"},
		{name: "table", value: "NAME", help: "which table, sheet or layer of the file"},
		{name: "at", value: "COLUMN,COLUMN", help: "the columns that hold longitude and latitude, or east and north"},
		{name: "crs", value: "AUTH:CODE", help: "coordinate system of the file"},
		{name: "match", value: "FIELD=COLUMN", many: true, help: "which column is which field"},
		{name: "unit", value: "COLUMN=UNIT", many: true, help: "unit of a column"},
		{name: "personal", value: "COLUMN", many: true, help: "column that must never be drawn or exported unasked"},
		{name: "only", value: "COLUMN=VALUE|VALUE", many: true, help: "only the features with one of these values; several are joined by or"},
		{name: "swap-axes", help: "the file has latitude before longitude"},
		{name: "replace", value: "LAYER", help: "put the file in place of this layer"},
		{name: "accept-proposals", help: "take the proposed columns and units"},
		{name: "complete", help: "the layer covers the whole place: nothing there means nothing is there"},
		{name: "edition", value: "TEXT", help: "edition or date of the data"},
		{name: "holder", value: "TEXT", help: "who holds the data"},
		reasonOption,
	},
	places: [2]int{2, 2},
	run: func(c *call) (int, error) {
		file := c.args.places[1]
		if !c.args.has("as") {
			option := "--as ROLE"
			if in, err := c.ReadFile(c.ctx, file, study.ReadOptions{CRSGiven: true, Table: c.args.get("table")}); err == nil {
				if proposed := study.ProposeRole(c.Catalog, in); proposed != "" {
					option = "--as " + proposed + " (proposed from the file's name)"
				}
			}
			return 0, &study.QuestionError{File: file, Questions: []study.Question{{Text: "what does the file mean here? The roles are: " + c.roleNames(), Option: option}}}
		}
		var only []study.Wanted
		for _, text := range c.args.values["only"] {
			w, err := study.ParseWanted(text)
			if err != nil {
				return 0, usagef("--only: %v", err)
			}
			only = append(only, w)
		}
		role, ok := c.Catalog.Role(c.args.get("as"))
		if !ok {
			return 0, usagef("there is no role %q; the roles are: %s", c.args.get("as"), c.roleNames())
		}
		match, err := c.args.pairs("match")
		if err != nil {
			return 0, err
		}
		for _, f := range sortedKeys(match) {
			if _, ok := role.Field(f); !ok {
				return 0, usagef("--match: %s have no field %q; the fields are: %s", role.Title, f, fieldNames(role))
			}
		}
		unit, err := c.args.pairs("unit")
		if err != nil {
			return 0, err
		}
		return c.with(func(s *study.Study) (int, error) {
			snap, err := s.Snapshot()
			if err != nil {
				return 0, err
			}
			if r := c.args.get("replace"); r != "" && !hasLayer(snap, r) {
				return 0, usagef("--replace: there is no layer %q; the layers are: %s", r, layerNames(snap))
			}
			in, err := c.ReadFile(c.ctx, file, study.ReadOptions{CRSGiven: c.args.has("crs"), Table: c.args.get("table")})
			if err != nil {
				return 0, err
			}
			in.Role, in.Name, in.CRSOption, in.Match, in.Units = role.Name, c.args.get("name"), c.args.get("crs"), match, unit
			in.Personal, in.SwapAxes, in.Replace = c.args.values["personal"], c.args.has("swap-axes"), c.args.get("replace")
			in.AcceptProposals, in.Complete = c.args.has("accept-proposals"), c.args.has("complete")
			in.Only = only
			if in.At, err = placeOf(c.args.get("at")); err != nil {
				return 0, err
			}
			in.Edition, in.Holder, in.Reason = c.args.get("edition"), c.args.get("holder"), c.args.get("reason")
			if in.Layer != nil {
				for _, opt := range [][]string{in.Personal, sortedKeys(unit)} {
					for _, col := range opt {
						if in.Layer.ColumnIndex(col) < 0 {
							return 0, usagef("%s has no column %q; the columns are: %s", file, col, columnNames(in))
						}
					}
				}
			}
			tools, closeTools := c.Tools()
			defer closeTools()
			r, err := s.AddLayer(c.ctx, in, tools)
			if err != nil {
				return 0, err
			}
			c.answer(map[string]any{"study": c.args.places[0], "layer": r}, "%s as %s: %s.", r.Name, r.Role, ledgerWords(r.Ledger))
			for _, f := range sortedKeys(r.Match) {
				u := ""
				if r.Units[r.Match[f]] != "" {
					u = " in " + r.Units[r.Match[f]]
				}
				c.say("  field %s is column %s%s", f, r.Match[f], u)
			}
			if in.Layer != nil {
				if left, spare := unmatched(role, r), notUsed(in, r); len(left) > 0 && len(spare) > 0 {
					c.note("  not used: columns %s; without a column: fields %s. Where one is the other, add again with --match FIELD=COLUMN --replace %s.",
						strings.Join(spare, ", "), strings.Join(left, ", "), shellWord(r.Name))
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

func ledgerWords(l study.Ledger) string {
	words := fmt.Sprintf("%d read, %d repaired, %d left out", l.Read, l.Repaired, l.LeftOut)
	if l.NotAsked > 0 {
		words += fmt.Sprintf(", %d not asked for", l.NotAsked)
	}
	return words
}

func (c *call) roleNames() string {
	names := make([]string, len(c.Catalog.Roles))
	for i, r := range c.Catalog.Roles {
		names[i] = r.Name
	}
	return strings.Join(names, ", ")
}

func fieldNames(r study.Role) string {
	names := make([]string, len(r.Fields))
	for i, f := range r.Fields {
		names[i] = f.Name
	}
	return strings.Join(names, ", ")
}

func columnNames(in study.Import) string {
	var names []string
	for _, col := range in.Layer.Columns {
		names = append(names, col.Name)
	}
	return listed(names)
}

// unmatched gives the fields of a role for which the file has no column.
func unmatched(role study.Role, r study.LayerRecord) []string {
	var out []string
	for _, f := range role.Fields {
		if r.Match[f.Name] == "" && !f.Personal {
			out = append(out, f.Name)
		}
	}
	return out
}

func notUsed(in study.Import, r study.LayerRecord) []string {
	var used, out []string
	for _, col := range r.Match {
		used = append(used, col)
	}
	for _, col := range in.Layer.Columns {
		if !slices.Contains(used, col.Name) && !slices.Contains(r.Personal, col.Name) {
			out = append(out, col.Name)
		}
	}
	return out
}

func hasLayer(snap *study.Snapshot, name string) bool {
	return slices.ContainsFunc(snap.Layers, func(l study.LayerRecord) bool { return l.Name == name })
}

func layerNames(snap *study.Snapshot) string {
	var names []string
	for _, l := range snap.Layers {
		names = append(names, l.Name)
	}
	return listed(names)
}

// listed joins names for a sentence.
func listed(names []string) string {
	if len(names) == 0 {
		return "none"
	}
	return strings.Join(names, ", ")
}

// placeOf reads COLUMN,COLUMN; nil for nothing.
func placeOf(text string) (*study.Place, error) {
	if text == "" {
		return nil, nil
	}
	x, y, ok := strings.Cut(text, ",")
	if !ok {
		return nil, usagef("--at: %q is not COLUMN,COLUMN", text)
	}
	return &study.Place{X: strings.TrimSpace(x), Y: strings.TrimSpace(y)}, nil
}
