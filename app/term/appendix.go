package term

import (
	"errors"
	"fmt"
	"io/fs"
	"os"
	"slices"
	"strings"
	"syscall"

	"groundtally/app/appendix"
	"groundtally/app/study"
)

var verbAppendix = verb{
	name: "appendix", usage: "appendix STUDY.gpkg --to FOLDER [--form page] [--frozen NAME]", summary: "writes the appendix and prints its check code",
	options: []option{{name: "to", value: "FOLDER", help: "folder to write into"}, {name: "form", value: "page", help: "forms, parted by commas; this version writes page"}, frozenOption, coresOption},
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
			snap, err := c.state(s)
			if err != nil {
				return 0, err
			}
			r, err := c.compute(s)
			if err != nil {
				return 0, err
			}
			c.tell(r)
			journal, frozen, err := c.history(s)
			if err != nil {
				return 0, err
			}
			folder := c.args.get("to")
			if err := makeFolder(folder); err != nil { // first, for words on the option
				return 0, err
			}
			made, err := appendix.Make(c.ctx, appendix.Input{Snapshot: snap, Results: r, Params: c.Params, Engines: c.Engines, Version: c.Version, Journal: journal, Frozen: frozen}, s.Store(), folder, c.Write, nil)
			if err != nil {
				return 0, err
			}
			if c.json {
				c.printJSON(map[string]any{"study": c.args.places[0], "files": made.Files, "code": r.Code})
				return ExitDone, nil
			}
			for _, f := range made.Files {
				c.say("wrote %s", f)
			}
			c.say("Check code %s", r.Code.Check)
			return ExitDone, nil
		})
	},
}

// history gives the journal and the frozen states up to the state that the verb answers for.
func (c *call) history(s *study.Study) ([]study.Entry, []study.Frozen, error) {
	journal, states := s.Journal(), s.FrozenStates()
	f, err := c.frozen(s)
	if f == nil || err != nil {
		return journal, states, err
	}
	journal = slices.DeleteFunc(journal, func(e study.Entry) bool { return e.Seq > f.Seq })
	states = slices.DeleteFunc(states, func(z study.Frozen) bool { return z.Seq > f.Seq })
	return journal, states, nil
}

// makeFolder makes the folder of an appendix.
func makeFolder(folder string) error {
	err := os.MkdirAll(folder, 0o755)
	switch {
	case err == nil:
		return nil
	case errors.Is(err, fs.ErrPermission), errors.Is(err, syscall.EROFS):
		return fmt.Errorf("make folder %q: %w: %w", folder, study.ErrReadOnly, err)
	case errors.Is(err, syscall.ENOSPC):
		return fmt.Errorf("make folder %q: %w: %w", folder, study.ErrDiskFull, err)
	case errors.Is(err, syscall.ENOTDIR), errors.Is(err, fs.ErrExist):
		return usagef("--to: %s is a file, or lies in one; give a folder", folder)
	}
	return fmt.Errorf("make folder %q: %w", folder, err)
}
