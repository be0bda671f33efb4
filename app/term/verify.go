package term

import (
	"cmp"
	"errors"
	"fmt"
	"io/fs"
	"os"
	"path/filepath"
	"strconv"
	"strings"

	"groundtally/app/appendix"
	"groundtally/app/run"
	"groundtally/app/study"
	"groundtally/scoring"
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
			if want, err = appendix.ReadStamp(folder); errors.Is(err, fs.ErrPermission) {
				return 0, &study.FileError{File: filepath.Join(folder, appendix.StampFile), What: "you have no right to read it", Cure: "Change its permissions or its folder's"}
			} else if err != nil {
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
			old, digits := (*run.Results)(nil), 17 // that the verdict compares with, and how many of its digits are kept
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
				where, old = "the stored results", stored
			}
			if diff == nil && want != nil {
				where = "the appendix"
				if verdict, diff = want.Compare(fresh, c.Version); verdict == "agrees" {
					digits = 9
					if old, err = want.Results(); err != nil {
						return 0, err
					}
				}
			}
			var small []run.Difference
			if verdict == "agrees" && diff == nil && old != nil {
				small = lastDigits(old, fresh, digits)
			}
			if diff == nil && code != "" && !strings.HasPrefix(fresh.Code.Check, code) {
				where = "the check code"
				diff = &run.Difference{Where: "check code", Old: code, New: fresh.Code.Check}
			}
			if c.json {
				out := map[string]any{"study": c.args.places[0], "verdict": verdict, "code": fresh.Code, "exit": ExitDone, "engines": c.Engines}
				if len(small) > 0 {
					list := []map[string]string{}
					for _, d := range small[:min(len(small), fewDifferences)] {
						list = append(list, map[string]string{"where": d.Where, "expected": d.Old, "found": d.New})
					}
					out["small_differences"], out["small_differences_of"] = list, len(small)
				}
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
			for _, d := range small[:min(len(small), fewDifferences)] {
				c.say("  %s: expected %s, found %s", d.Where, d.Old, d.New)
			}
			if more := len(small) - fewDifferences; more > 0 {
				c.say("  and %s", counted(more, "more small difference"))
			}
			c.say("Check code %s", fresh.Code.Check)
			for _, e := range c.Engines {
				c.say("%s", e)
			}
			return ExitDone, nil
		})
	},
}

// fewDifferences is how many small differences are written out.
const fewDifferences = 5

// lastDigits lists the values that agree and are not the same, written with so many digits, by candidate and
// then by voice.
func lastDigits(old, now *run.Results, digits int) []run.Difference {
	var out []run.Difference
	put := func(where string, a, b float64) {
		x, y := strconv.FormatFloat(a, 'g', digits, 64), strconv.FormatFloat(b, 'g', digits, 64)
		if x != y {
			out = append(out, run.Difference{Where: where, Old: x, New: y})
		}
	}
	fresh := map[string]*run.Candidate{}
	for i := range now.Candidates {
		fresh[now.Candidates[i].ID()] = &now.Candidates[i]
	}
	for i := range old.Candidates {
		c := &old.Candidates[i]
		other := fresh[c.ID()]
		if other == nil {
			continue
		}
		values := map[string]scoring.Consequence{}
		for _, q := range other.All() {
			values[q.Key] = q
		}
		for _, q := range c.All() {
			p, ok := values[q.Key]
			if !ok || q.State != scoring.Number || p.State != scoring.Number {
				continue
			}
			at := fmt.Sprintf("%s with %s, %s", c.Site, c.Plant, q.Key)
			put(at, q.Central, p.Central)
			put(at+" (low)", q.Low, p.Low)
			put(at+" (high)", q.High, p.High)
		}
	}
	for _, v := range old.Voices {
		for _, u := range now.Voices {
			if u.Voice != v.Voice {
				continue
			}
			rows := map[string]run.Row{}
			for _, r := range u.Order {
				rows[r.Site+"/"+r.Plant] = r
			}
			for _, r := range v.Order {
				if other, ok := rows[r.Site+"/"+r.Plant]; ok {
					put(fmt.Sprintf("voice %s, %s with %s, score", v.Voice, r.Site, r.Plant), r.Score, other.Score)
				}
			}
		}
	}
	return out
}
