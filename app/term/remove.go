package term

import "groundtally/app/study"

var verbRemove = verb{
	name: "remove", usage: "remove STUDY.gpkg LAYER [--reason TEXT]", summary: "takes a layer out; undo brings it back",
	options: []option{reasonOption}, places: [2]int{2, 2},
	run: func(c *call) (int, error) {
		name := c.args.places[1]
		return c.with(func(s *study.Study) (int, error) {
			snap, err := s.Snapshot()
			if err != nil {
				return 0, err
			}
			if !hasLayer(snap, name) {
				return 0, usagef("there is no layer %q; the layers are: %s", name, layerNames(snap))
			}
			if err := s.RemoveLayer(c.ctx, name, c.args.get("reason")); err != nil {
				return 0, err
			}
			c.done("Removed layer " + name + "; gtally undo brings it back.")
			return ExitDone, nil
		})
	},
}
