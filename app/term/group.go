package term

import (
	"strings"

	"groundtally/app/study"
)

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
