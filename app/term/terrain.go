package term

import (
	"errors"
	"fmt"
	"math"

	"groundtally/app/run"
	"groundtally/app/study"
)

var verbTerrain = verb{
	name: "terrain", usage: "terrain STUDY.gpkg --site ID [--plant ID]", summary: "height, slope, aspect, roughness and horizon of a site", places: [2]int{1, 1},
	more:    "With --plant, of each buildable patch of that option too. Directions are from true north. The horizon is that\nof the site's middle, 1.5 m above the ground, with the earth's curvature and refraction, as far as 20 km.",
	options: []option{{name: "site", value: "ID", help: "the site"}, {name: "plant", value: "ID", help: "patches of this plant option"}},
	run: func(c *call) (int, error) {
		if !c.args.has("site") {
			return 0, usagef("usage: gtally %s", c.verb.usage)
		}
		return c.with(func(s *study.Study) (int, error) {
			snap, err := s.Snapshot()
			if err != nil {
				return 0, err
			}
			if p := c.args.get("plant"); p != "" && snap.Text("plant."+p+".technology") == "" {
				return 0, usagef("there is no plant option %q; the options are: %s", p, listed(snap.Plants()))
			}
			sv := run.NewSurveyor(snap, c.Params, run.StoreLoader(s.Store()), nil)
			list, err := sv.Relief(c.ctx, c.args.get("site"), c.args.get("plant"))
			switch {
			case errors.Is(err, run.ErrNoTerrain), errors.Is(err, study.ErrNotThere):
				return 0, &inputError{err}
			case err != nil:
				return 0, computing(err)
			}
			if c.json {
				c.printJSON(map[string]any{"study": c.args.places[0], "terrain": list})
				return ExitDone, nil
			}
			rows := [][]string{{"", "area", "height", "least", "greatest", "slope", "steepest", "falls to", "agreement", "roughness"}, {"", "ha", "m", "m", "m", "°", "°", "°", "0 to 1", "m"}}
			number := func(x *float64, digits int) string {
				if x == nil {
					return "unknown"
				}
				return fmt.Sprintf("%.*f", digits, *x)
			}
			for _, r := range list {
				name := "site " + r.Site
				if r.Patch > 0 {
					name = fmt.Sprintf("patch %d", r.Patch)
				}
				aspect := number(r.AspectDeg, 0)
				if r.AspectDeg == nil && r.SlopeDeg != nil {
					aspect = "no one way"
				}
				rows = append(rows, []string{name, ha(r.Ha), number(r.MeanM, 1), number(r.LeastM, 1), number(r.MostM, 1), number(r.SlopeDeg, 1), number(r.SteepestDeg, 1), aspect, fmt.Sprintf("%.2f", r.AspectShare), number(r.RoughnessM, 2)})
			}
			columns(c.out, rows, map[int]bool{1: true, 2: true, 3: true, 4: true, 5: true, 6: true, 7: true, 8: true, 9: true})
			for _, r := range list {
				if len(r.HorizonDeg) == 0 {
					continue
				}
				top, at := math.Inf(-1), 0
				for i, a := range r.HorizonDeg {
					if a != nil && *a > top {
						top, at = *a, i*360/len(r.HorizonDeg)
					}
				}
				c.say("Horizon: highest %.1f° towards %d°; heights are known for at least %.0f %% of the way in every direction. The JSON has all directions.", top, at, 100*r.HorizonKnown)
			}
			return ExitDone, nil
		})
	},
}
