package term

import (
	"fmt"
	"slices"
	"strings"

	"groundtally/app/run"
	"groundtally/app/study"
)

// keyForms says how keys are made that have names in them.
const keyForms = `Keys with names in them. PLANT is a plant option, a technology, wind or solar; ROLE a role of layers:
  rule.setback.ROLE.PLANT_m          distance kept from a role's features, in metres
  rule.setback.ROLE.PLANT_tip        the same, as a multiple of tip height; PLANT_rotor of rotor diameters
  rule.setback.boundary.PLANT_m      distance kept from the site's own edge; also _rotor
  rule.setback.ROLE.class.CLASS.PLANT_m    distance kept from one class of a role; also _tip, _rotor
  rule.setback.ROLE.from_110_kv.PLANT_m    distance kept from lines of that voltage and above; also _tip
  rule.measured_to.PLANT             where distances end: mast or blade tip
  rule.measured_from.ROLE            where they begin: facade, centroid or plot
  rule.exclude.ROLE                  yes takes the role's polygons out
  rule.exclude.ROLE.class            only these classes of it, parted by |
  rule.slope_max.PLANT_deg           steeper ground is taken out
  rule.aspect_from.PLANT_deg, rule.aspect_to.PLANT_deg, rule.aspect_slope.PLANT_deg
                                     the directions towards which ground may fall, from which slope on
  rule.smallest_patch.PLANT_ha, rule.smallest_width.PLANT_m
  rule.except.RULE.SITE              yes lets a rule not hold on a site; needs --reason. RULE as setback:roads,
                                     exclude:habitat, slope, aspect, height_limit
  layer.tolerance.ROLE_m             how far features may lie from where they are drawn
  plant.ID.technology                makes a plant option; then plant.ID.hub_height_m and so on
  voice.NAME.weight.KEY              swing points of a consequence; makes the voice
  anchor.KEY.worst, anchor.KEY.best  ends of the value scale of a consequence
  limit.KEY                          a limit for a consequence
  inventory.ROW.central              own figure in place of a cited factor
Limits of height are no setting: they come as a layer of the role height_limit.`

var verbSet = verb{
	name: "set", usage: "set STUDY.gpkg KEY VALUE [--reason TEXT] [--source TEXT] [--accepted-by TEXT]", summary: "changes a setting",
	more: keyForms + `
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
		}
		return c.with(func(s *study.Study) (int, error) {
			load := run.StoreLoader(s.Store())
			if e.Value != "" {
				now, err := s.Snapshot()
				if err != nil {
					return 0, err
				}
				if err := run.CheckSetting(c.Catalog, c.Params, e.Key, e.Value, now.Turbines()...); err != nil {
					return 0, err
				}
				if e.Value != study.NotSetText {
					if err := run.CheckException(c.ctx, load, now, e.Key); err != nil {
						return 0, err
					}
				}
			}
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
			notices, err := run.SettingNotices(c.ctx, load, snap, e.Key)
			if err != nil {
				return 0, err
			}
			c.notices(notices)
			v, _, in := snap.Lookup(e.Key)
			text := strings.TrimSpace(fmt.Sprintf("%s is %s %s", e.Key, v.Value, unitWords(v.Unit))) + "."
			switch {
			case entry.Seq == 0:
				text = e.Key + " has that value already."
			case !in:
				text = e.Key + " is no longer in force."
			}
			c.answer(map[string]any{"study": c.args.places[0], "done": text, "notices": c.noticeList(notices)}, "%s", text)
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
