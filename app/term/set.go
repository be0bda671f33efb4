package term

import (
	"fmt"
	"slices"
	"strconv"
	"strings"

	"groundtally/app/study"
	"groundtally/scoring/criteria"
)

var verbSet = verb{
	name: "set", usage: "set STUDY.gpkg KEY VALUE [--reason TEXT] [--source TEXT] [--accepted-by TEXT]", summary: "changes a setting",
	more: `Keys with names in them:
  rule.setback.ROLE.PLANT_m          distance kept from a role's features, in metres
  rule.setback.ROLE.PLANT_tip        the same, as a multiple of tip height
  rule.exclude.ROLE                  yes takes the role's polygons out
  plant.ID.technology                makes a plant option; then plant.ID.hub_height_m and so on
  voice.NAME.weight.KEY              swing points of a consequence; makes the voice
  anchor.KEY.worst, anchor.KEY.best  ends of the value scale of a consequence
  limit.KEY                          a limit for a consequence
  inventory.ROW.central              own figure in place of a cited factor
"not set" says that a value must still be entered. gtally get lists the other keys.`,
	options: []option{reasonOption, {name: "source", value: "TEXT", help: "where the value stands"}, {name: "accepted-by", value: "TEXT", help: "who answers for the value"}, {name: "default", help: "take the value out, so that the default holds again"}},
	places:  [2]int{2, 3},
	run: func(c *call) (int, error) {
		if c.args.has("default") != (len(c.args.places) == 2) {
			return 0, usagef("usage: gtally %s, or gtally set STUDY.gpkg KEY --default", c.verb.usage)
		}
		e := study.SettingEdit{Key: c.args.places[1], Source: c.args.get("source"), Reason: c.args.get("reason"), AcceptedBy: c.args.get("accepted-by")}
		if len(c.args.places) == 3 {
			if e.Value = strings.TrimSpace(c.args.places[2]); e.Value == "" {
				return 0, usagef("an empty value is none; to take a setting out say gtally set STUDY.gpkg %s --default", e.Key)
			}
			if err := c.checkSetting(e.Key, e.Value); err != nil {
				return 0, err
			}
		}
		return c.with(func(s *study.Study) (int, error) {
			entry, err := s.Set(c.ctx, "set", e.Reason, e)
			if err != nil {
				return 0, err
			}
			snap, err := s.Snapshot()
			if err != nil {
				return 0, err
			}
			if plant := rulePlant(e.Key); plant != "" && !known(snap, plant) {
				c.note("no plant option %q yet; the rule holds once there is one.", plant)
			}
			if entry.Seq == 0 {
				c.done(e.Key + " has that value already.")
				return ExitDone, nil
			}
			v, _, in := snap.Lookup(e.Key)
			if !in {
				c.done(e.Key + " is no longer in force.")
				return ExitDone, nil
			}
			c.done(strings.TrimSpace(fmt.Sprintf("%s is %s %s", e.Key, v.Value, unitWords(v.Unit))) + ".")
			return ExitDone, nil
		})
	},
}

// checkKey reports whether the names inside a key, where they must be names that the program has, are
// such: a role, a consequence, a factor.
func (c *call) checkKey(key string) error {
	parts := strings.Split(key, ".")
	switch {
	case strings.HasPrefix(key, "rule.setback.") || strings.HasPrefix(key, "rule.exclude."):
		if _, ok := c.Catalog.Role(parts[2]); !ok && parts[2] != "boundary" {
			return usagef("setting %s: there is no role %q; the roles are: %s, and boundary", key, parts[2], c.roleNames())
		}
	case parts[0] == "limit":
		if d, _ := c.Catalog.Definition(key); d.Key == key {
			return nil
		}
		return c.consequence(key, strings.TrimPrefix(key, "limit."))
	case parts[0] == "anchor":
		return c.consequence(key, parts[1])
	case parts[0] == "voice" && len(parts) == 4 && parts[2] == "weight":
		if err := c.consequence(key, parts[3]); err != nil {
			return err
		}
		cr, ok := c.Catalog.Criterion(parts[3])
		if !ok {
			cr, _ = c.Catalog.Criterion(strings.TrimSuffix(parts[3], criteria.BurdenSuffix))
		}
		if cr.Better == criteria.Neither {
			return usagef("setting %s: %s is not scored, since neither more nor less of it is better", key, parts[3])
		}
	case parts[0] == "inventory" && len(parts) >= 3:
		row := strings.TrimPrefix(key[:strings.LastIndexByte(key, '.')], "inventory.")
		if _, ok := c.Params.Factors[row]; !ok {
			return usagef("setting %s: there is no factor %q%s", key, row, likeThis(row, sortedKeys(c.Params.Factors)))
		}
	}
	return nil
}

func (c *call) consequence(key, name string) error {
	if c.knownKey(name) {
		return nil
	}
	return usagef("setting %s: there is no consequence %q%s", key, name, likeThis(name, c.keyNames()))
}

// checkSetting checks a key's names, and values that no study can mean.
func (c *call) checkSetting(key, value string) error {
	def, ok := c.Catalog.Definition(key)
	if !ok {
		return &study.UnknownKeyError{Key: key, Nearest: c.Catalog.Nearest(key)}
	}
	if err := c.checkKey(key); err != nil {
		return err
	}
	if value == study.NotSetText {
		return nil
	}
	if strings.HasPrefix(key, "plant.") && strings.HasSuffix(key, ".turbine") && !slices.Contains(c.turbines(), value) {
		return usagef("setting %s: there is no reference curve %q; the curves are: %s", key, value, strings.Join(c.turbines(), ", "))
	}
	x, bad := strconv.ParseFloat(value, 64)
	if def.Kind != "number" || bad != nil {
		return nil //nolint:nilerr // Set judges the form
	}
	whole := map[string][2]float64{"run.seed": {0, 1 << 53}, "run.trials": {10, 100_000}, "weigh.mixes": {1, 100_000}}
	if span, ok := whole[key]; ok && (x != float64(int64(x)) || x < span[0] || x > span[1]) {
		return usagef("setting %s: %s is not a whole number from %.0f to %.0f", key, value, span[0], span[1])
	}
	if x < 0 && neverNegative(def) {
		return usagef("setting %s: %s %s is below zero", key, value, unitWords(def.Unit))
	}
	if x == 0 && slices.ContainsFunc([]string{".hub_height_m", ".rotor_diameter_m", ".rated_kw"}, func(end string) bool { return strings.HasSuffix(key, end) }) {
		return usagef("setting %s: it must be above zero", key)
	}
	return nil
}

// neverNegative tells whether a setting's unit is one of which there is never less than nothing.
func neverNegative(d study.Definition) bool {
	switch d.Unit {
	case "m", "ha", "kW", "MWh/yr", "m/s", "rotor diameter", "tip height", "swing points", "kWh/(m2 month)", "dB(A)", "h/yr":
		return true
	}
	return false
}

func (c *call) turbines() []string {
	var out []string
	for _, t := range c.Params.Turbines {
		out = append(out, t.ID)
	}
	return out
}

// rulePlant gives the plant name at the end of a rule's key.
func rulePlant(key string) string {
	if !strings.HasPrefix(key, "rule.") {
		return ""
	}
	last := key[strings.LastIndexByte(key, '.')+1:]
	for _, end := range []string{"_m", "_tip", "_rotor", "_deg", "_ha"} {
		if name, ok := strings.CutSuffix(last, end); ok {
			return name
		}
	}
	return ""
}

// known tells whether a rule's plant name is an option or a technology.
func known(snap *study.Snapshot, plant string) bool {
	def, _ := snap.Catalog().Definition("plant.x.technology")
	return plant == "solar" || slices.Contains(def.Choices, plant) || slices.Contains(snap.Plants(), plant)
}

// likeThis proposes the name that is most like a word: by parts of words in common and a common
// beginning. It proposes nothing where nothing is alike.
func likeThis(word string, names []string) string {
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
