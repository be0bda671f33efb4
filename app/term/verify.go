package term

import (
	"encoding/json"
	"os"
	"path/filepath"
	"strings"

	"groundtally/app/appendix"
	"groundtally/app/run"
	"groundtally/app/study"
)

var verbAppendix = verb{
	name: "appendix", usage: "appendix STUDY.gpkg --to FOLDER [--form page]", summary: "writes the appendix and prints its check code",
	options: []option{{name: "to", value: "FOLDER", help: "folder to write into"}, {name: "form", value: "page", help: "forms, parted by commas; this version writes page"}, {name: "top", value: "N", help: "places of each voice on the page"}, {name: "cores", value: "N", help: "cores for computing what is stale"}},
	places:  [2]int{1, 1},
	run: func(c *call) (int, error) {
		if !c.args.has("to") {
			return 0, usagef("where to? Say --to FOLDER")
		}
		for _, f := range strings.Split(c.args.get("form"), ",") {
			if f != "" && f != "page" {
				return 0, usagef("there is no form %q yet; this version writes page", f)
			}
		}
		return c.with(func(s *study.Study) (int, error) {
			snap, err := s.Snapshot()
			if err != nil {
				return 0, err
			}
			r, err := c.compute(s)
			if err != nil {
				return 0, err
			}
			c.tell(r)
			layers, err := appendix.MapLayers(c.ctx, snap, run.StoreLoader(s.Store()))
			if err != nil {
				return 0, err
			}
			notices, err := run.Check(c.ctx, s, c.Params)
			if err != nil {
				return 0, err
			}
			page, err := appendix.Page(appendix.Input{Snapshot: snap, Results: r, Params: c.Params, Layers: layers, Notices: notices, Engines: c.Engines, Version: c.Version, Journal: s.Journal(), Frozen: s.FrozenStates()})
			if err != nil {
				return 0, err
			}
			folder := c.args.get("to")
			if err := os.MkdirAll(folder, 0o755); err != nil {
				return 0, &study.FileError{File: folder, What: "the folder cannot be made: " + err.Error(), Cure: "Choose a folder that you may write to"}
			}
			code, err := json.MarshalIndent(appendix.NewStamp(r, c.Version), "", " ")
			if err != nil {
				return 0, err
			}
			files := []string{filepath.Join(folder, "appendix.html"), filepath.Join(folder, appendix.StampFile)}
			if err := c.Write(files[0], page); err != nil {
				return 0, err
			}
			if err := c.Write(files[1], append(code, '\n')); err != nil {
				return 0, err
			}
			if c.json {
				c.printJSON(map[string]any{"study": c.args.places[0], "files": files, "code": r.Code})
				return ExitDone, nil
			}
			for _, f := range files {
				c.say("wrote %s", f)
			}
			c.say("Check code %s", r.Code.Check)
			return ExitDone, nil
		})
	},
}

var verbVerify = verb{
	name: "verify", usage: "verify STUDY.gpkg [--code HEX] [--appendix FOLDER]", summary: "re-runs from the inputs and compares",
	options: []option{{name: "code", value: "HEX", help: "check code to compare with"}, {name: "appendix", value: "FOLDER", help: "folder of an appendix to compare with"}, {name: "cores", value: "N", help: "how many processor cores to use"}},
	places:  [2]int{1, 1},
	run: func(c *call) (int, error) {
		var want *appendix.Stamp
		if c.args.has("appendix") {
			var err error
			if want, err = appendix.ReadStamp(c.args.get("appendix")); err != nil {
				return 0, err
			}
		}
		return c.with(func(s *study.Study) (int, error) {
			snap, err := s.Snapshot()
			if err != nil {
				return 0, err
			}
			stored, err := c.engine(s, true).Compute(c.ctx, snap)
			if err != nil {
				return 0, err
			}
			fresh, err := c.engine(s, false).Compute(c.ctx, snap)
			if err != nil {
				return 0, err
			}
			verdict, diff := run.Compare(stored, fresh)
			where := "the stored results"
			if diff == nil && want != nil {
				where = "the appendix"
				verdict, diff = want.Compare(fresh, c.Version)
			}
			if code := strings.ToLower(strings.TrimSpace(c.args.get("code"))); diff == nil && code != "" {
				where = "the check code"
				if len(code) < 8 || !strings.HasPrefix(fresh.Code.Check, code) {
					diff = &run.Difference{Where: "check code", Old: code, New: fresh.Code.Check}
				}
			}
			if c.json {
				out := map[string]any{"study": c.args.places[0], "verdict": verdict, "code": fresh.Code}
				if diff != nil {
					out["verdict"], out["difference"] = "differs", map[string]string{"where": diff.Where, "expected": diff.Old, "found": diff.New}
				}
				c.printJSON(out)
			}
			if diff != nil {
				c.say("differs from %s: %s: expected %s, found %s", where, diff.Where, diff.Old, diff.New)
				return ExitNo, nil
			}
			c.say("%s", verdict)
			c.say("Check code %s", fresh.Code.Check)
			for _, e := range c.Engines {
				c.say("%s", e)
			}
			return ExitDone, nil
		})
	},
}
