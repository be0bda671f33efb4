package term

import (
	"os"

	"groundtally/app/study"
)

var verbNew = verb{
	name: "new", usage: "new STUDY.gpkg [--sample] [--name TEXT]", summary: "makes a study, empty or the Isle of Marram",
	options: []option{{name: "sample", help: "fill it with the Isle of Marram, an invented district"}, {name: "name", value: "TEXT", help: "name of the study"}},
	places:  [2]int{1, 1},
	run: func(c *call) (int, error) {
		path := c.args.places[0]
		store, err := c.Create(c.ctx, path)
		if err != nil {
			return 0, err
		}
		done := false
		defer func() {
			_ = store.Close() // every change is committed by now
			if !done {        // a half-made sample must not stay behind as if it were whole
				_ = os.Remove(path)
			}
		}()
		s, err := study.Open(c.ctx, store, c.Catalog, study.Options{Who: c.Who, Clock: c.Clock})
		if err != nil {
			return 0, err
		}
		layers := []study.LayerRecord{}
		if c.args.has("sample") {
			tools, closeTools := c.Tools()
			defer closeTools()
			err = c.Sample(c.ctx, s, tools, func(r study.LayerRecord) {
				layers = append(layers, r)
				c.say("%-24s as %-18s %s", r.Name, r.Role, ledgerWords(r.Ledger))
				c.notices(r.Notices)
			})
			if err != nil {
				return 0, err
			}
		}
		if name := c.args.get("name"); name != "" {
			if _, err := s.Set(c.ctx, "set", "name of the study", study.SettingEdit{Key: "study.name", Value: name}); err != nil {
				return 0, err
			}
		}
		done = true
		c.answer(map[string]any{"study": path, "layers": layers}, "Made %s.", path)
		return ExitDone, nil
	},
}
