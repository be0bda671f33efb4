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
		case study.ChangeTitle(ch) != "":
			parts = append(parts, study.ChangeTitle(ch))
		case ch.Kind == study.LayerRecKind && byHand(ch) != "":
			parts = append(parts, byHand(ch))
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

// byHand says which features a change of a layer's record changed by hand; empty for a change of another kind.
func byHand(ch study.Change) string {
	var old, now study.LayerRecord
	for raw, to := range map[*json.RawMessage]*study.LayerRecord{&ch.Old: &old, &ch.New: &now} {
		if *raw != nil && json.Unmarshal(*raw, to) != nil {
			return "" // what cannot be read is told like any other change
		}
	}
	if len(old.Hand) == len(now.Hand) || old.File != now.File || old.Edition != now.Edition {
		if old.Name != "" || now.File != "drawn by hand" {
			return ""
		}
	}
	lead, list := ch.Key+", ", now.Hand[min(len(old.Hand), len(now.Hand)):]
	if len(now.Hand) < len(old.Hand) {
		lead, list = ch.Key+", no longer: ", old.Hand[len(now.Hand):]
	}
	var parts []string
	for _, h := range list {
		parts = append(parts, handWords(h))
	}
	return lead + strings.Join(parts, ", ")
}

// handWords tells a change by hand: which feature, and what became of it.
func handWords(h study.HandEdit) string {
	text := "feature " + h.Feature
	if h.Called != "" {
		text += " (" + h.Called + ")"
	}
	text += " " + map[string]string{study.HandAdd: "added", study.HandMove: "moved", study.HandSet: "changed", study.HandRemove: "taken out"}[h.Verb]
	var values []string
	for _, k := range sortedKeys(h.Values) {
		values = append(values, k+"="+h.Values[k])
	}
	if len(values) > 0 {
		text += ": " + strings.Join(values, ", ")
	}
	return text
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
