package term

import (
	"fmt"
	"slices"
	"strings"

	"groundtally/app/run"
	"groundtally/app/study"
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
			if err := run.CheckSetting(c.Catalog, c.Params, e.Key, e.Value); err != nil {
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
