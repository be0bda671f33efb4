package term

import (
	"encoding/json"
	"fmt"
	"strings"

	"groundtally/app/study"
)

var verbJournal = verb{
	name: "journal", usage: "journal STUDY.gpkg", summary: "lists every change made to the study", places: [2]int{1, 1},
	run: func(c *call) (int, error) {
		return c.with(func(s *study.Study) (int, error) {
			entries := s.Journal()
			if c.json {
				if entries == nil {
					entries = []study.Entry{}
				}
				c.printJSON(map[string]any{"study": c.args.places[0], "journal": entries, "frozen": frozenList(s)})
				return ExitDone, nil
			}
			rows := [][]string{{"change", "when (UTC)", "who", "what", "changed", "reason"}}
			for _, e := range entries {
				what := changeWords(e)
				if e.Of != 0 {
					what = fmt.Sprintf("change %d: %s", e.Of, what)
				}
				rows = append(rows, []string{fmt.Sprint(e.Seq), e.At.Format("2006-01-02 15:04"), e.Who, e.Verb, what, e.Reason})
			}
			if len(entries) == 0 {
				c.say("No change yet.")
			} else {
				columns(c.out, rows, nil)
			}
			for _, f := range s.FrozenStates() {
				c.say("frozen %q after change %d, check code %s", f.Name, f.Seq, orNone(f.Code))
			}
			return ExitDone, nil
		})
	},
}

func frozenList(s *study.Study) []map[string]any {
	out := []map[string]any{}
	for _, f := range s.FrozenStates() {
		out = append(out, map[string]any{"name": f.Name, "at": f.At, "seq": f.Seq, "code": f.Code})
	}
	return out
}

// changeWords says what an entry changed: of a setting the old and the new value.
func changeWords(e study.Entry) string {
	const most = 3
	var parts []string
	for i, ch := range e.Changes {
		if i == most {
			parts = append(parts, fmt.Sprintf("and %d more", len(e.Changes)-most))
			break
		}
		switch {
		case ch.Kind == study.SettingRecord:
			parts = append(parts, fmt.Sprintf("%s from %s to %s", ch.Key, settingWords(ch.Old), settingWords(ch.New)))
		case ch.Kind == study.MetaRecord && ch.Key == study.FrameKey:
			parts = append(parts, "centre of the local frame")
		case ch.New == nil:
			parts = append(parts, fmt.Sprintf("%s %s out", ch.Kind, ch.Key))
		case ch.Old == nil:
			parts = append(parts, fmt.Sprintf("%s %s in", ch.Kind, ch.Key))
		default:
			parts = append(parts, fmt.Sprintf("%s %s changed", ch.Kind, ch.Key))
		}
	}
	return strings.Join(parts, "; ")
}

func settingWords(raw json.RawMessage) string {
	if raw == nil {
		return "its default"
	}
	var v study.Setting
	if err := json.Unmarshal(raw, &v); err != nil {
		return string(raw)
	}
	return strings.TrimSpace(v.Value + " " + unitWords(v.Unit))
}
