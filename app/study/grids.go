package study

import (
	"fmt"
	"regexp"
	"slices"
	"sort"
	"strconv"
	"strings"

	"groundtally/scoring/units"
)

// GridUse says what a grid of a resource holds. A record keeps it as match and units, like columns: the field is
// matched to GridBand, which has the unit; height or month are matched to a number.
type GridUse struct {
	Field   string  // of the role, as mean_speed or ghi
	Unit    string  // of the values; empty for a plain number. A sum may be of a day: "kWh/(m2 day)"
	HeightM float64 // above the ground, above 0; of wind alone
	Month   int     // 1 to 12; of the sun alone
}

// GridBand names the values of a grid where a table has a column.
const GridBand = "band1"

// gridRoles gives for each role whose grids are read the fields that a grid can hold, and the field that is one
// number for the whole grid.
var gridRoles = map[string]struct {
	fields []string
	number string
}{
	"wind_resource":  {[]string{"mean_speed", "weibull_a", "weibull_k"}, "height"},
	"solar_resource": {[]string{"ghi", "dhi", "temperature", "albedo"}, "month"},
}

// gridWords are parts of file names by which the field of a grid is proposed. Source: common practice.
var gridWords = map[string][]string{
	"mean_speed": {"speed", "mean", "geschwindigkeit", "vitesse"}, "weibull_a": {"weibull_a", "weib_a", "weibull-a", "scale"}, "weibull_k": {"weibull_k", "weib_k", "weibull-k", "shape"},
	"ghi": {"ghi", "global", "radiation", "sunlight"}, "dhi": {"dhi", "diffus", "dif"}, "temperature": {"temp", "tavg", "t2m"}, "albedo": {"albedo"},
}

// GridUseOf reads what the record of a grid says that it holds. An error says in plain words what is missing and
// how it is given.
func GridUseOf(rec LayerRecord) (GridUse, error) {
	g, ok := gridRoles[rec.Role]
	if !ok {
		return GridUse{}, fmt.Errorf("a grid of the role %s holds no resource", rec.Role)
	}
	cure := func(what, option string) error {
		return fmt.Errorf("it is not said %s; add the file again with --replace %q %s", what, rec.Name, option)
	}
	u := GridUse{Unit: rec.Units[GridBand]}
	for _, f := range g.fields {
		if rec.Match[f] == GridBand {
			u.Field = f
		}
	}
	if u.Field == "" {
		return u, cure("what its values are", fmt.Sprintf("--match %s=%s", g.fields[0], GridBand))
	}
	x, err := gridNumber(g.number, rec.Match[g.number])
	if err != nil {
		return u, cure("of which "+g.number+" it is", "--match "+g.number+"=NUMBER")
	}
	if g.number == "height" {
		u.HeightM = x
	} else {
		u.Month = int(x)
	}
	return u, nil
}

// gridNumber reads the number of a grid: a height in metres, or a month.
func gridNumber(field, text string) (float64, error) {
	x, err := strconv.ParseFloat(text, 64)
	switch {
	case err != nil:
		return 0, fmt.Errorf("%q is not a number", text)
	case field == "height" && !(x > 0 && x <= 1000):
		return 0, fmt.Errorf("a height of %s m is not between 0 and 1000 m", text)
	case field == "month" && (x != float64(int(x)) || x < 1 || x > 12):
		return 0, fmt.Errorf("%s is not a month from 1 to 12", text)
	}
	return x, nil
}

// gridUnit gives the role's unit for a sum of a month where the unit is of a day.
func gridUnit(unit string) string { return strings.Replace(unit, "(m2 day)", "(m2 month)", 1) }

// PerMonth gives the unit of the values for a whole month, and whether they are sums of a day.
func (u GridUse) PerMonth() (unit string, daily bool) {
	m := gridUnit(u.Unit)
	return m, m != u.Unit
}

// DescribeGrid fills match and units of the record of a grid of wind or sun: what its values are, their unit, and
// the height or month that they are of. What was said of the layer that is replaced holds on. It gives a question
// for each thing that is open; a proposal from the file's name is taken only with AcceptProposals. Grids of other
// roles need no words, and have no question.
func DescribeGrid(rec *LayerRecord, in Import, role Role, snap *Snapshot) []Question {
	g, ok := gridRoles[role.Name]
	if !ok {
		return nil
	}
	match, unit := map[string]string{}, in.Units[GridBand]
	for _, l := range snap.LayersOf(role.Name) {
		if l.Name == in.Replace && l.Kind == "raster" {
			for f, c := range l.Match {
				match[f] = c
			}
			unit = first(unit, l.Units[GridBand])
		}
	}
	for _, c := range in.Match {
		if c == GridBand { // said anew, so what was said before of another field is void
			for old := range match {
				if match[old] == GridBand {
					delete(match, old)
				}
			}
		}
	}
	var qs []Question
	ask := func(option, format string, args ...any) {
		qs = append(qs, Question{Text: fmt.Sprintf(format, args...), Option: option})
	}
	for f, c := range in.Match {
		if f != g.number && (!slices.Contains(g.fields, f) || c != GridBand) {
			ask(fmt.Sprintf("--match %s=%s", g.fields[0], GridBand), "a grid of %s has one band of values, %s, which can be %s, and a %s; %s=%s is none of these", role.Title, GridBand, strings.Join(g.fields, ", "), g.number, f, c)
			continue
		}
		match[f] = c
	}
	for c, u := range in.Units {
		if c != GridBand {
			ask(fmt.Sprintf("--unit %s=%s", GridBand, u), "there is no column %q; the values of a grid are %s", c, GridBand)
		}
	}
	name := strings.ToLower(strings.TrimSuffix(in.Base, ext(in.Base)))
	var held []string
	for _, f := range g.fields {
		if match[f] == GridBand {
			held = append(held, f)
		}
	}
	proposed := gridField(g.fields, name)
	if len(held) == 0 && in.AcceptProposals && proposed != "" {
		held, match[proposed] = []string{proposed}, GridBand
	}
	switch len(held) {
	case 0:
		says := ""
		if proposed != "" {
			says = fmt.Sprintf(" The file's name says %s.", proposed)
		}
		ask(fmt.Sprintf("--match %s=%s", first(proposed, g.fields[0]), GridBand), "what are the values of the grid: %s?%s", strings.Join(g.fields, ", "), says)
	case 1:
		f, _ := role.Field(held[0])
		if !f.Physical() {
			unit = ""
			break
		}
		if unit == "" && in.AcceptProposals {
			unit = f.Unit
		}
		other := ""
		if strings.Contains(f.Unit, "month)") {
			other = " Sums of a day are " + strings.Replace(f.Unit, "month)", "day)", 1) + "."
		}
		if unit == "" {
			ask(fmt.Sprintf("--unit %s=%s, or --accept-proposals", GridBand, f.Unit), "in which unit are the values (field %s)?%s", f.Name, other)
		} else if _, err := units.Convert(1, gridUnit(unit), f.Unit); err != nil {
			ask(fmt.Sprintf("--unit %s=%s", GridBand, f.Unit), "the values (field %s): %q cannot be brought to %s.%s", f.Name, unit, f.Unit, other)
		}
	default:
		ask("--match FIELD="+GridBand+" once", "the grid cannot be %s at once", strings.Join(held, " and "))
	}
	number := gridNumberIn(g.number, name)
	if match[g.number] == "" && in.AcceptProposals {
		match[g.number] = number
	}
	what := map[string]string{"height": "at how many metres above the ground is the wind of the grid?", "month": "of which month, 1 to 12, is the grid?"}[g.number]
	if text := match[g.number]; text == "" {
		says := ""
		if number != "" {
			says = fmt.Sprintf(" The file's name says %s.", number)
		}
		ask(fmt.Sprintf("--match %s=%s", g.number, first(number, strings.ToUpper(g.number))), "%s%s", what, says)
	} else if _, err := gridNumber(g.number, text); err != nil {
		ask(fmt.Sprintf("--match %s=%s", g.number, strings.ToUpper(g.number)), "%s %v", what, err)
	}
	if len(qs) > 0 {
		sort.Slice(qs, func(i, j int) bool {
			return qs[i].Option < qs[j].Option || qs[i].Option == qs[j].Option && qs[i].Text < qs[j].Text
		})
		return qs
	}
	rec.Match = match
	if unit != "" {
		rec.Units[GridBand] = unit
	}
	return nil
}

// GridAsks are the questions about a grid of a resource, with what the file's name or the layer that it replaces
// proposes.
type GridAsks struct {
	Fields []RoleField // that the values can be
	Number RoleField   // height or month: one number for the whole grid
	Field  string      // proposed, or empty
	Unit   string
	Value  string // of Number
}

// GridUnits gives the units that the values of a grid can have: those of the field, and for sums of a month the
// mean sum of a day.
func GridUnits(f RoleField) []string {
	out := units.Alike(f.Unit)
	if day := strings.Replace(f.Unit, "month)", "day)", 1); day != f.Unit {
		out = append(out, day)
	}
	return out
}

// AskGrid gives the questions about a grid that is to serve in a role; ok is false where none is asked.
func AskGrid(in Import, role Role, before LayerRecord) (a GridAsks, ok bool) {
	g, ok := gridRoles[role.Name]
	if !ok || in.Layer != nil {
		return a, false
	}
	for _, name := range g.fields {
		if f, there := role.Field(name); there {
			a.Fields = append(a.Fields, f)
		}
		if before.Match[name] == GridBand {
			a.Field, a.Unit = name, before.Units[GridBand]
		}
	}
	a.Number, _ = role.Field(g.number)
	name := strings.ToLower(strings.TrimSuffix(in.Base, ext(in.Base)))
	a.Field = first(a.Field, gridField(g.fields, name))
	a.Value = first(before.Match[g.number], gridNumberIn(g.number, name))
	return a, true
}

// gridField proposes the field that a grid holds from its file's name; of several words the longest counts.
func gridField(fields []string, name string) string {
	best, length := "", 0
	for _, f := range fields {
		for _, w := range gridWords[f] {
			if len(w) > length && strings.Contains(name, w) {
				best, length = f, len(w)
			}
		}
	}
	return best
}

var (
	heightInName = regexp.MustCompile(`(\d+(?:\.\d+)?)[ _-]?m(?:[^a-z0-9]|$)`)
	monthInName  = regexp.MustCompile(`(?:^|[^0-9])0?([1-9]|1[0-2])$`)
)

// gridNumberIn proposes the height or the month of a grid from its file's name; empty when it says none.
func gridNumberIn(field, name string) string {
	r := heightInName
	if field == "month" {
		r = monthInName
	}
	if m := r.FindStringSubmatch(name); m != nil {
		return m[1]
	}
	return ""
}
