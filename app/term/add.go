package term

import (
	"fmt"
	"slices"
	"strings"

	"groundtally/app/study"
)

var verbAdd = verb{
	name: "add", usage: "add STUDY.gpkg FILE --as ROLE [options]", summary: "adds a file as a layer",
	more: "What the file does not say is asked for, never guessed: then nothing is added (exit 2).\nA backdrop is a PNG or JPEG with its world file beside it, or a colour GeoTIFF; it is kept in the study as it stands.\nExit 1: the file cannot be added. Exit 3: added, but some features were left out.",
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
		{name: "stamp", value: "start|centre|end", help: "of a table of hours: what its times mark"},
		{name: "utc-offset", value: "HOURS", help: "of a table of hours: how far its clock is ahead of UTC"},
		{name: "edition", value: "TEXT", help: "edition or date of the data"},
		{name: "holder", value: "TEXT", help: "who holds the data"},
		{name: "attribution", value: "TEXT", help: "of a backdrop: who must be named where the picture is shown"},
		{name: "licence", value: "TEXT", help: "of a backdrop: its licence"},
		reasonOption,
	},
	places: [2]int{2, 2},
	run: func(c *call) (int, error) {
		file := c.args.places[1]
		if !c.args.has("as") {
			in, err := c.ReadFile(c.ctx, file, study.ReadOptions{CRSGiven: true, Table: c.args.get("table")})
			if err != nil {
				return 0, err
			}
			if in.Picture() {
				return 0, onlyBackdrop(file)
			}
			option := "--as ROLE"
			if proposed, word := study.ProposedRole(c.Catalog, in); proposed != "" {
				option = fmt.Sprintf("--as %s (proposed, since the file's name holds %q and the role takes what the file has)", proposed, word)
			}
			return 0, &study.QuestionError{File: file, Questions: []study.Question{{Text: "what does the file mean here? The roles are, by the account that needs them:" + c.rolesByAccount(), Option: option}}}
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
			return 0, c.noRole(c.args.get("as"))
		}
		if role.Name == study.BackdropRole {
			return c.addBackdrop()
		}
		for _, o := range []string{"attribution", "licence"} {
			if c.args.has(o) {
				return 0, usagef("--%s is for a backdrop alone", o)
			}
		}
		for _, o := range []string{"stamp", "utc-offset"} {
			if c.args.has(o) && role.Name != study.HourlyRole {
				return 0, usagef("--%s is for hourly weather alone", o)
			}
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
			if in.Picture() {
				return 0, onlyBackdrop(file)
			}
			in.Role, in.Name, in.CRSOption, in.Match, in.Units = role.Name, c.args.get("name"), c.args.get("crs"), match, unit
			in.Personal, in.SwapAxes, in.Replace = c.args.values["personal"], c.args.has("swap-axes"), c.args.get("replace")
			in.AcceptProposals, in.Complete = c.args.has("accept-proposals"), c.args.has("complete")
			in.Only = only
			in.Stamp, in.OffsetH = c.args.get("stamp"), c.args.get("utc-offset")
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

// noRole refuses a role that is not there.
func (c *call) noRole(name string) error {
	names := make([]string, len(c.Catalog.Roles))
	for i, r := range c.Catalog.Roles {
		names[i] = r.Name
	}
	near := ""
	if list := study.Near(strings.ReplaceAll(name, " ", "_"), names, 3); len(list) > 0 {
		near = " near it are: " + strings.Join(list, ", ") + ";"
	}
	return usagef("there is no role %q;%s the roles are, by the account that needs them:%s", name, near, c.rolesByAccount())
}

// rolesByAccount lists the roles on lines of their own account: that of which most consequences need them.
func (c *call) rolesByAccount() string {
	of := map[string]map[string]int{}
	var accounts []string
	for _, k := range c.Catalog.Criteria {
		account := string(k.Account)
		if !slices.Contains(accounts, account) {
			accounts = append(accounts, account)
		}
		for _, r := range c.Catalog.Roles {
			words := strings.FieldsFunc(k.NeedsRoles, func(r rune) bool { return strings.ContainsRune(";|:", r) })
			if slices.Contains(words, r.Name) {
				if of[r.Name] == nil {
					of[r.Name] = map[string]int{}
				}
				of[r.Name][account]++
			}
		}
	}
	lines := map[string][]string{}
	const all, none = "every account", "the map, rules and other models"
	for _, r := range c.Catalog.Roles {
		at := none
		if len(of[r.Name]) == len(accounts) {
			at = all
		} else {
			for _, a := range accounts {
				if of[r.Name][a] > of[r.Name][at] {
					at = a
				}
			}
		}
		lines[at] = append(lines[at], r.Name)
	}
	var b strings.Builder
	for _, a := range append(append([]string{all}, accounts...), none) {
		if len(lines[a]) > 0 {
			b.WriteString("\n    " + wrapped(a+": "+strings.Join(lines[a], ", "), 100, "\n      "))
		}
	}
	return b.String()
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
	if in.At != nil {
		used = append(used, in.At.X, in.At.Y)
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
