package study

import (
	"encoding/csv"
	"fmt"
	"io/fs"
	"math"
	"sort"
	"strconv"
	"strings"
	"time"

	"groundtally/assets/citedtable"
	"groundtally/geo"
	"groundtally/scoring/criteria"
	"groundtally/scoring/units"
)

// Catalog is what the program ships of words and defaults: definitions of settings, roles, keys.
type Catalog struct {
	Definitions []Definition
	Roles       []Role
	Criteria    []criteria.Criterion
	Turbines    []string // names of the machines that ship with the program
	exact       map[string]int
	patterns    []int // most literal first
}

// Definition describes a setting or, when its key holds names in angle brackets, a family of them.
type Definition struct {
	Key        string
	Kind       string   // number, text, choice, yesno
	Choices    []string // for choice
	Default    string   // "" means not in force, "not set" that the user must enter it
	Unit       string
	Min, Max   string // least and greatest number; empty for none
	Legal      bool   // a legal or policy value
	What       string
	Source     string
	Provenance citedtable.Provenance
}

// NotSetText stands in place of a value that the user must enter.
const NotSetText = "not set"

// Role is what a layer means in a study.
type Role struct {
	Name      string
	Title     string
	Geometry  []string // point, line, polygon, raster, table
	Fields    []RoleField
	Purpose   string
	Holder    string
	WithoutIt string
	Effect    string
	Notes     string
}

// RoleField is one attribute that a role knows.
type RoleField struct {
	Name     string
	Unit     string
	Required bool
	Personal bool
}

// LoadCatalog reads words/keys.csv, words/roles.csv, params/settings.csv and the names in params/turbines.csv.
func LoadCatalog(fsys fs.FS) (*Catalog, error) {
	c := &Catalog{exact: map[string]int{}}
	var err error
	if c.Criteria, err = criteria.Parse(fsys, "words/keys.csv"); err != nil {
		return nil, err
	}
	if c.Roles, err = parseRoles(fsys, "words/roles.csv"); err != nil {
		return nil, err
	}
	if c.Turbines, err = shippedTurbines(fsys); err != nil {
		return nil, err
	}
	t, err := citedtable.ParseFS(fsys, "params/settings.csv")
	if err != nil {
		return nil, err
	}
	for _, r := range t.Rows {
		d := Definition{Key: r.Text("key"), Kind: r.Text("kind"), Default: r.Text("value"), Unit: r.Text("unit"), Min: r.Text("min"), Max: r.Text("max"), Legal: r.Text("legal") == "yes",
			What: r.Text("what"), Source: r.Source, Provenance: r.Provenance}
		if list, ok := strings.CutPrefix(d.Kind, "choice("); ok {
			d.Kind, d.Choices = "choice", strings.Split(strings.TrimSuffix(list, ")"), "|")
		}
		i := len(c.Definitions)
		if strings.Contains(d.Key, "<") {
			c.patterns = append(c.patterns, i)
		} else {
			if _, dup := c.exact[d.Key]; dup {
				return nil, fmt.Errorf("settings table: key %q stands twice", d.Key)
			}
			c.exact[d.Key] = i
		}
		c.Definitions = append(c.Definitions, d)
	}
	sort.SliceStable(c.patterns, func(i, j int) bool {
		return literal(c.Definitions[c.patterns[i]].Key) > literal(c.Definitions[c.patterns[j]].Key)
	})
	return c, nil
}

func literal(key string) int {
	n, in := 0, false
	for _, r := range key {
		switch {
		case r == '<':
			in = true
		case r == '>':
			in = false
		case !in:
			n++
		}
	}
	return n
}

// Definition finds what defines a key; ok is false for a key that no setting has.
func (c *Catalog) Definition(key string) (Definition, bool) {
	if i, ok := c.exact[key]; ok {
		return c.Definitions[i], true
	}
	for _, i := range c.patterns {
		if matches(c.Definitions[i].Key, key) {
			return c.Definitions[i], true
		}
	}
	return Definition{}, false
}

// matches reports whether key fits a pattern in which each <name> stands for a run of characters without a
// dot. A <site> at the end may hold dots, because parcels have the identifiers that their register gave them.
func matches(pattern, key string) bool {
	open := strings.IndexByte(pattern, '<')
	if open < 0 {
		return pattern == key
	}
	if !strings.HasPrefix(key, pattern[:open]) {
		return false
	}
	end := strings.IndexByte(pattern, '>')
	rest, key := pattern[end+1:], key[open:]
	if pattern[open:] == "<site>" {
		return key != ""
	}
	for n := 1; n <= len(key); n++ {
		if key[n-1] == '.' {
			return false
		}
		if matches(rest, key[n:]) {
			return true
		}
	}
	return false
}

// Nearest gives the key of a setting that is most like the given one, for an error that helps; the names in
// it are those of the given key. It is empty when no key is near.
func (c *Catalog) Nearest(key string) string {
	best, dist := "", reach(key)+1
	for _, d := range c.Definitions {
		k := filled(d.Key, key)
		if n := editDistance(k, key); n < dist && !strings.Contains(k, "<") {
			best, dist = k, n
		}
	}
	return best
}

// filled puts the parts of a key in the place of the names in angle brackets that stand there in a pattern.
func filled(pattern, key string) string {
	parts, own := strings.Split(pattern, "."), strings.Split(key, ".")
	if len(parts) != len(own) {
		return pattern
	}
	for i, p := range parts {
		before, rest, named := strings.Cut(p, "<")
		if _, after, _ := strings.Cut(rest, ">"); named && own[i] != "" {
			parts[i] = before + strings.TrimSuffix(strings.TrimPrefix(own[i], before), after) + after
		}
	}
	return strings.Join(parts, ".")
}

// reach is how many letters may differ between words of which one can be a slip of the other.
func reach(word string) int { return min(1+len(word)/5, 5) }

// Near gives those of the names that a word can be a slip of, the nearest first, at most so many; case does
// not count.
func Near(word string, names []string, most int) []string {
	type near struct {
		name string
		dist int
	}
	var list []near
	word = strings.ToLower(word)
	for _, n := range names {
		low := strings.ToLower(n)
		d := editDistance(low, word)
		if len(word) > 2 && strings.Contains(low, word) {
			d = min(d, 1)
		}
		if d <= reach(word) {
			list = append(list, near{n, d})
		}
	}
	sort.SliceStable(list, func(i, j int) bool { return list[i].dist < list[j].dist })
	out := make([]string, 0, most)
	for _, n := range list[:min(len(list), most)] {
		out = append(out, n.name)
	}
	return out
}

func editDistance(a, b string) int {
	prev := make([]int, len(b)+1)
	for j := range prev {
		prev[j] = j
	}
	for i := range len(a) {
		cur := make([]int, len(b)+1)
		cur[0] = i + 1
		for j := range len(b) {
			cost := 1
			if a[i] == b[j] {
				cost = 0
			}
			cur[j+1] = min(prev[j]+cost, prev[j+1]+1, cur[j]+1)
		}
		prev = cur
	}
	return prev[len(b)]
}

// CheckValue reports whether a text is a possible value of the setting and gives its canonical form.
func (d Definition) CheckValue(text string) (string, error) {
	text = strings.TrimSpace(text)
	if text == NotSetText {
		return text, nil
	}
	switch d.Kind {
	case "number":
		f, err := strconv.ParseFloat(text, 64)
		if err != nil || f != f || f > 1e300 || f < -1e300 {
			return "", fmt.Errorf("%q is not a number; the value is given in %s", text, orPlain(d.Unit))
		}
		if lo, err := strconv.ParseFloat(d.Min, 64); err == nil && f < lo {
			return "", fmt.Errorf("%s is less than %s", text, strings.TrimSpace(d.Min+" "+unitWord(d.Unit)))
		}
		if hi, err := strconv.ParseFloat(d.Max, 64); err == nil && f > hi {
			return "", fmt.Errorf("%s is more than %s", text, strings.TrimSpace(d.Max+" "+unitWord(d.Unit)))
		}
		return strconv.FormatFloat(f, 'g', -1, 64), nil
	case "choice":
		for _, c := range d.Choices {
			if c == text {
				return text, nil
			}
		}
		return "", fmt.Errorf("%q is not one of: %s", text, strings.Join(d.Choices, ", "))
	case "yesno":
		switch strings.ToLower(text) {
		case "true", "yes":
			return "true", nil
		case "false", "no":
			return "false", nil
		}
		return "", fmt.Errorf("%q is neither yes nor no", text)
	}
	return text, nil
}

func unitWord(unit string) string {
	if unit == "1" {
		return ""
	}
	return unit
}

func orPlain(unit string) string {
	if unit == "" || unit == "1" {
		return "plain numbers"
	}
	return unit
}

// Role finds a role by name; "grid lines" and "grid_lines" are the same.
func (c *Catalog) Role(name string) (Role, bool) {
	name = strings.ReplaceAll(strings.ToLower(strings.TrimSpace(name)), " ", "_")
	for _, r := range c.Roles {
		if r.Name == name {
			return r, true
		}
	}
	return Role{}, false
}

// Criterion finds a key.
func (c *Catalog) Criterion(key string) (criteria.Criterion, bool) {
	for _, k := range c.Criteria {
		if k.Key == key {
			return k, true
		}
	}
	return criteria.Criterion{}, false
}

func parseRoles(fsys fs.FS, name string) ([]Role, error) {
	f, err := fsys.Open(name)
	if err != nil {
		return nil, err
	}
	defer f.Close()
	rows, err := csv.NewReader(f).ReadAll()
	if err != nil {
		return nil, fmt.Errorf("vocabulary %s: %w", name, err)
	}
	var out []Role
	for i, r := range rows {
		if i == 0 {
			continue
		}
		if len(r) != 9 {
			return nil, fmt.Errorf("vocabulary %s, row %d: %d cells, want 9", name, i+1, len(r))
		}
		role := Role{Name: r[0], Title: r[1], Geometry: strings.Split(r[2], "|"), Purpose: r[4], Holder: r[5], WithoutIt: r[6], Effect: r[7], Notes: r[8]}
		for _, part := range strings.Split(r[3], ";") {
			bits := strings.Split(part, ":")
			if len(bits) < 3 {
				return nil, fmt.Errorf("vocabulary %s, role %s: field %q is not name:unit:required|optional", name, r[0], part)
			}
			unit := strings.Join(bits[1:len(bits)-1], ":")
			field := RoleField{Name: bits[0], Required: bits[len(bits)-1] == "required"}
			if strings.Contains(unit, "(personal)") {
				field.Personal, unit = true, strings.TrimSpace(strings.ReplaceAll(unit, "(personal)", ""))
			}
			field.Unit = unit
			role.Fields = append(role.Fields, field)
		}
		out = append(out, role)
	}
	return out, nil
}

// Field finds a field of the role.
func (r Role) Field(name string) (RoleField, bool) {
	for _, f := range r.Fields {
		if f.Name == name {
			return f, true
		}
	}
	return RoleField{}, false
}

// Accepts reports whether the role takes a geometry of this kind ("point", "line", "polygon",
// "raster", "table").
func (r Role) Accepts(kind string) bool {
	for _, g := range r.Geometry {
		if g == kind {
			return true
		}
	}
	return false
}

// Physical reports whether a field's unit is one that must be asked for when the file does not give
// it: anything that is a measure and not text, a date, a choice or a plain number.
func (f RoleField) Physical() bool {
	switch f.Unit {
	case "", "1", "text", "date", "text or code", "grade or points", "month", "UTC or stated zone":
		return false
	}
	return !strings.Contains(f.Unit, "/") || strings.ContainsAny(f.Unit, "0123456789") || isRatioUnit(f.Unit)
}

func isRatioUnit(u string) bool {
	switch u {
	case "m/s", "t C/ha", "t/ha", "d/yr", "MWh/yr", "W/m2", "kg/m3", "kWh/(m2 month)", "t/(ha yr)":
		return true
	}
	return false
}

// Choices gives the values that a field may have; none for one that is free.
func (f RoleField) Choices() []string {
	if f.Physical() || !strings.Contains(f.Unit, "/") {
		return nil
	}
	return strings.Split(f.Unit, "/")
}

// Check reports whether a text is a possible value of the field and gives it as the layer keeps it: a measure as
// a number in the unit of its column. A measure may be given with another unit behind it.
func (f RoleField) Check(text, unit string) (string, error) {
	text = strings.TrimSpace(text)
	if list := f.Choices(); list != nil {
		if yes, err := strconv.ParseBool(text); err == nil && f.Unit == "yes/no" {
			text = map[bool]string{true: "yes", false: "no"}[yes]
		}
		for _, c := range list {
			if strings.EqualFold(c, text) {
				return c, nil
			}
		}
		return "", fmt.Errorf("%q is not one of: %s", text, strings.Join(list, ", "))
	}
	switch {
	case f.Unit == "date":
		for _, form := range []string{"2006-01-02", "2006-01", "2006"} {
			if _, err := time.Parse(form, text); err == nil {
				return text, nil
			}
		}
		return "", fmt.Errorf("%q is no date; write it as 2026-05-03", text)
	case f.Unit != "1" && !f.Physical():
		return text, nil
	}
	if unit == "" {
		unit = f.Unit
	}
	x, err := strconv.ParseFloat(text, 64)
	if number, given, ok := strings.Cut(text, " "); err != nil && ok && f.Physical() {
		if x, err = strconv.ParseFloat(number, 64); err == nil {
			if x, err = units.Convert(x, strings.TrimSpace(given), unit); err != nil {
				return "", fmt.Errorf("%q is not in %s: %w", text, unit, err)
			}
		}
	}
	if err != nil || math.IsNaN(x) || math.IsInf(x, 0) {
		return "", fmt.Errorf("%q is not a number; the value is given in %s", text, orPlain(unit))
	}
	lo, hi := f.span()
	switch {
	case x < lo && lo == 0:
		return "", fmt.Errorf("%s is below zero", text)
	case x < lo || x > hi:
		return "", fmt.Errorf("%s is not from %g to %g", text, lo, hi)
	}
	return strconv.FormatFloat(x, 'g', -1, 64), nil
}

// fits tells why a value of a file cannot be the field's; nil when it can. Several voltages may stand in one text,
// and a date may go on with a time.
func (f RoleField) fits(v geo.Value, unit string) error {
	texts := []string{v.String()}
	switch {
	case f.Name == "voltage":
		texts = strings.Split(texts[0], ";")
	case f.Unit == "date":
		texts[0], _, _ = strings.Cut(texts[0], "T")
	case f.Unit == "1" || f.Physical():
		if _, ok := v.Float(); !ok {
			return fmt.Errorf("%q is not a number", texts[0])
		}
	}
	for _, text := range texts {
		if _, err := f.Check(text, unit); err != nil {
			return err
		}
	}
	return nil
}

// span gives the least and the greatest value that a number of the field can be. Source: what the fields
// mean; a share is no more than the whole, a direction no more than a full turn.
func (f RoleField) span() (lo, hi float64) {
	switch {
	case f.Unit == "degC" || f.Unit == "m below ground" || f.Name == "limit_value":
		return math.Inf(-1), math.Inf(1)
	case f.Unit == "deg":
		return 0, 360
	case f.Name == "month":
		return 1, 12
	case f.Unit == "1" && (strings.HasSuffix(f.Name, "_share") || f.Name == "albedo" || f.Name == "humidity" || f.Name == "snow_loss" || f.Name == "soiling_loss"):
		return 0, 1
	}
	return 0, math.Inf(1)
}

// Identifier gives the field by which people call the features of the role: an identifier of its own, else the
// name; empty when it has neither.
func (r Role) Identifier() string {
	if n := r.Fields[0].Name; strings.HasSuffix(n, "_id") && (n != "parcel_id" || r.Name == "parcels") {
		return n
	}
	if _, ok := r.Field("name"); ok {
		return "name"
	}
	return ""
}
