package term

import (
	"cmp"
	"errors"
	"io/fs"
	"os"
	"path/filepath"
	"strings"

	"groundtally/app/appendix"
	"groundtally/app/run"
	"groundtally/app/study"
)

var verbVerify = verb{
	name: "verify", usage: "verify STUDY.gpkg [--code HEX] [--appendix FOLDER] [--frozen NAME]", summary: "re-runs from the inputs and compares",
	more: "identical: the same to the last digit. agrees: every value within 1e-6, the same tiers.\nOtherwise exit 1 with the first difference. A frozen state is compared with the check code that it was frozen with.",
	options: []option{{name: "code", value: "HEX", help: "check code to compare with, at least its first 8 characters"},
		{name: "appendix", value: "FOLDER", help: "folder of an appendix to compare with"}, frozenOption, coresOption},
	places: [2]int{1, 1},
	run: func(c *call) (int, error) {
		code := strings.ToLower(strings.TrimSpace(c.args.get("code")))
		if c.args.has("code") && (len(code) < 8 || strings.Trim(code, "0123456789abcdef") != "") {
			return 0, usagef("--code wants a check code, of 8 to 64 characters 0 to 9 and a to f, not %q", code)
		}
		var want *appendix.Stamp
		if folder := c.args.get("appendix"); c.args.has("appendix") {
			if _, err := os.Stat(filepath.Join(folder, appendix.StampFile)); errors.Is(err, fs.ErrNotExist) {
				return 0, usagef("--appendix: there is no %s in %s; give the folder that gtally appendix wrote", appendix.StampFile, folder)
			}
			var err error
			if want, err = appendix.ReadStamp(folder); err != nil {
				return 0, err
			}
		}
		return c.with(func(s *study.Study) (int, error) {
			frozen, err := c.frozen(s)
			if err != nil {
				return 0, err
			}
			fresh, err := c.computeWith(s, false)
			if err != nil {
				return 0, err
			}
			var verdict, where string
			var diff *run.Difference
			if frozen != nil {
				verdict, where = "identical", "the frozen state"
				if frozen.Code != fresh.Code.Check {
					diff = &run.Difference{Where: "check code", Old: cmp.Or(frozen.Code, "none"), New: fresh.Code.Check}
				}
			} else {
				stored, err := c.computeWith(s, true)
				if err != nil {
					return 0, err
				}
				verdict, diff = run.Compare(stored, fresh)
				where = "the stored results"
			}
			if diff == nil && want != nil {
				where = "the appendix"
				verdict, diff = want.Compare(fresh, c.Version)
			}
			if diff == nil && code != "" && !strings.HasPrefix(fresh.Code.Check, code) {
				where = "the check code"
				diff = &run.Difference{Where: "check code", Old: code, New: fresh.Code.Check}
			}
			if c.json {
				out := map[string]any{"study": c.args.places[0], "verdict": verdict, "code": fresh.Code, "exit": ExitDone, "engines": c.Engines}
				if diff != nil {
					out["verdict"], out["exit"], out["compared_with"] = "differs", ExitNo, where
					out["difference"] = map[string]string{"where": diff.Where, "expected": diff.Old, "found": diff.New}
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
