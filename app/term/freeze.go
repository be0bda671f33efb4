package term

import (
	"strings"

	"groundtally/app/study"
)

var verbFreeze = verb{
	name: "freeze", usage: "freeze STUDY.gpkg NAME", summary: "keeps the present state under a name", places: [2]int{2, 2},
	run: func(c *call) (int, error) {
		if strings.TrimSpace(c.args.places[1]) == "" {
			return 0, usagef("a frozen state needs a name")
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
