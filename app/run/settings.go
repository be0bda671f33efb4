package run

import (
	"fmt"
	"slices"
	"strconv"
	"strings"

	"groundtally/app/present"
	"groundtally/app/study"
	"groundtally/scoring/criteria"
)

// CheckSetting reports whether a study can mean a value of a setting: the key has a definition, the names
// in it are there, the value is possible. An error is a *study.UnknownKeyError or a *study.ValueError.
func CheckSetting(cat *study.Catalog, p *Params, key, value string) error {
	def, ok := cat.Definition(key)
	if !ok {
		return &study.UnknownKeyError{Key: key, Nearest: cat.Nearest(key)}
	}
	if err := CheckKey(cat, p, key); err != nil {
		return err
	}
	bad := func(format string, args ...any) error {
		return &study.ValueError{Key: key, Err: fmt.Errorf(format, args...)}
	}
	if value == study.NotSetText {
		return nil
	}
	if strings.HasPrefix(key, "plant.") && strings.HasSuffix(key, ".turbine") && !slices.Contains(p.TurbineIDs(), value) {
		return bad("there is no reference curve %q; the curves are: %s", value, strings.Join(p.TurbineIDs(), ", "))
	}
	form := func() error {
		if _, err := def.CheckValue(value); err != nil {
			return &study.ValueError{Key: key, Err: err}
		}
		return nil
	}
	x, err := strconv.ParseFloat(value, 64)
	if def.Kind != "number" || err != nil {
		return form()
	}
	whole := map[string][2]float64{"run.seed": {0, 1 << 53}, "run.trials": {10, 100_000}, "weigh.mixes": {1, 100_000}}
	if span, ok := whole[key]; ok && (x != float64(int64(x)) || x < span[0] || x > span[1]) {
		return bad("%s is not a whole number from %.0f to %.0f", value, span[0], span[1])
	}
	if x < 0 && neverNegative(def) {
		return bad("%s is below zero", strings.TrimSpace(value+" "+present.Unit(def.Unit)))
	}
	if x == 0 && slices.ContainsFunc([]string{".hub_height_m", ".rotor_diameter_m", ".rated_kw"}, func(end string) bool { return strings.HasSuffix(key, end) }) {
		return bad("it must be above zero")
	}
	return form()
}

// CheckKey reports whether the names inside a key, where they must be names that the program has, are
// such: a role, a consequence, a factor.
func CheckKey(cat *study.Catalog, p *Params, key string) error {
	parts := strings.Split(key, ".")
	bad := func(format string, args ...any) error {
		return &study.ValueError{Key: key, Err: fmt.Errorf(format, args...)}
	}
	consequence := func(name string) error {
		if names := p.keyNames(); !slices.Contains(names, name) {
			return bad("there is no consequence %q%s", name, LikeThis(name, names))
		}
		return nil
	}
	switch {
	case strings.HasPrefix(key, "rule.setback.") || strings.HasPrefix(key, "rule.exclude."):
		if _, ok := cat.Role(parts[2]); !ok && parts[2] != "boundary" {
			roles := make([]string, len(cat.Roles))
			for i, r := range cat.Roles {
				roles[i] = r.Name
			}
			return bad("there is no role %q; the roles are: %s, and boundary", parts[2], strings.Join(roles, ", "))
		}
	case parts[0] == "limit":
		if d, _ := cat.Definition(key); d.Key == key {
			return nil
		}
		return consequence(strings.TrimPrefix(key, "limit."))
	case parts[0] == "anchor":
		return consequence(parts[1])
	case parts[0] == "voice" && len(parts) == 4 && parts[2] == "weight":
		if err := consequence(parts[3]); err != nil {
			return err
		}
		cr, ok := cat.Criterion(parts[3])
		if !ok {
			cr, _ = cat.Criterion(strings.TrimSuffix(parts[3], criteria.BurdenSuffix))
		}
		if cr.Better == criteria.Neither {
			return bad("%s is not scored, since neither more nor less of it is better", parts[3])
		}
	case parts[0] == "inventory" && len(parts) >= 3:
		row := strings.TrimPrefix(key[:strings.LastIndexByte(key, '.')], "inventory.")
		if _, ok := p.Factors[row]; !ok {
			return bad("there is no factor %q%s", row, LikeThis(row, sortedNames(p.Factors)))
		}
	}
	return nil
}

func (p *Params) keyNames() []string {
	var out []string
	for _, k := range p.Keys() {
		out = append(out, k.Key)
	}
	return out
}

// TurbineIDs gives the names of the reference curves.
func (p *Params) TurbineIDs() []string {
	out := make([]string, len(p.Turbines))
	for i, t := range p.Turbines {
		out[i] = t.ID
	}
	return out
}

// neverNegative tells whether a setting's unit is one of which there is never less than nothing.
func neverNegative(d study.Definition) bool {
	switch d.Unit {
	case "m", "ha", "kW", "MWh/yr", "m/s", "rotor diameter", "tip height", "swing points", "kWh/(m2 month)", "dB(A)", "h/yr":
		return true
	}
	return false
}

// LikeThis proposes the name that is most like a word: by parts of words in common and a common
// beginning. It proposes nothing where nothing is alike.
func LikeThis(word string, names []string) string {
	best, most := "", 3
	for _, n := range names {
		score := 0
		for _, part := range strings.FieldsFunc(word, func(r rune) bool { return strings.ContainsRune("_.- ", r) }) {
			if len(part) > 1 && strings.Contains(n, part) {
				score += 2 * len(part)
			}
		}
		for i := 0; i < len(word) && i < len(n) && word[i] == n[i]; i++ {
			score++
		}
		if score > most || (score == most && best != "" && len(n) < len(best)) {
			best, most = n, score
		}
	}
	if best == "" {
		return ""
	}
	return fmt.Sprintf("; is %q meant?", best)
}
