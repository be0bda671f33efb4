package appendix

import (
	"encoding/json"
	"fmt"
	"slices"
	"strings"
	"time"

	"groundtally/app/desk/core"
	"groundtally/app/present"
	"groundtally/app/run"
	"groundtally/app/study"
)

// speaker writes journal entries in words. It holds only what never changes, so that it can be used off
// the window's goroutine.
type speaker struct {
	cat    *study.Catalog
	titles map[string]string
}

func newSpeaker(cat *study.Catalog, params *run.Params) *speaker {
	s := &speaker{cat: cat, titles: map[string]string{}}
	for _, k := range params.Keys() {
		s.titles[k.Key] = k.Title
	}
	return s
}

// setting names a setting for people.
func (s *speaker) setting(key string) string {
	parts := strings.Split(key, ".")
	title := func(key string) string {
		if t := s.titles[key]; t != "" {
			return t
		}
		return strings.ReplaceAll(key, "_", " ")
	}
	switch {
	case len(parts) == 4 && parts[0] == "voice" && parts[2] == "weight":
		return fmt.Sprintf("Weight of %s (voice %s)", lower(title(parts[3])), parts[1])
	case len(parts) == 2 && parts[0] == "limit" && s.titles[parts[1]] != "":
		return "Limit of " + lower(title(parts[1]))
	case parts[0] == "anchor" && len(parts) == 3:
		return fmt.Sprintf("Scale of %s, %s", lower(title(parts[1])), parts[2])
	}
	d, ok := s.cat.Definition(key)
	if !ok || d.What == "" {
		return key
	}
	what := strings.TrimSuffix(d.What, ".")
	if names := named(d.Key, key); names != "" {
		what += " (" + names + ")"
	}
	return what
}

// lower begins a title in the middle of a sentence; an abbreviation stays as it is.
func lower(s string) string {
	if len(s) > 1 && strings.ToUpper(s[1:2]) == s[1:2] && s[1:2] != " " {
		return s
	}
	return strings.ToLower(s[:1]) + s[1:]
}

// named gives the names that stand in a key where its definition has angle brackets.
func named(pattern, key string) string {
	a, b := strings.Split(pattern, "."), strings.Split(key, ".")
	if len(a) != len(b) {
		return ""
	}
	var out []string
	for i := range a {
		open, end := strings.IndexByte(a[i], '<'), strings.LastIndexByte(a[i], '>')
		if open < 0 || end < open || len(b[i]) < open+len(a[i])-end-1 {
			continue
		}
		out = append(out, strings.ReplaceAll(b[i][open:len(b[i])-(len(a[i])-end-1)], "_", " "))
	}
	return strings.Join(out, ", ")
}

// value writes the value of a setting with its unit.
func value(raw json.RawMessage) string {
	if raw == nil {
		return "default"
	}
	var v study.Setting
	if err := json.Unmarshal(raw, &v); err != nil {
		return string(raw)
	}
	switch v.Value {
	case "true":
		return "yes"
	case "false":
		return "no"
	}
	return strings.TrimSpace(v.Value + " " + present.Unit(v.Unit))
}

// mostChanges is how many changes of one entry are named.
const mostChanges = 3

// change says what one change did.
func (s *speaker) change(c study.Change) string {
	what := map[study.RecordKind]string{study.LayerRecKind: "Layer", study.GroupRecord: "Site"}[c.Kind]
	switch {
	case c.Kind == study.SettingRecord:
		return fmt.Sprintf("%s: %s → %s", s.setting(c.Key), value(c.Old), value(c.New))
	case c.Kind == study.MetaRecord && c.Key == study.FrameKey:
		return "Centre of the local frame"
	case what == "":
		return string(c.Kind) + " " + c.Key
	case c.Kind == study.GroupRecord:
		var g study.Group
		if c.New == nil {
			return "Site " + c.Key + " parted"
		}
		if err := json.Unmarshal(c.New, &g); err == nil {
			return fmt.Sprintf("Site %s of %s", c.Key, core.Counted(len(g.Parcels), "parcel", "parcels"))
		}
		return "Site " + c.Key
	case c.New == nil:
		return "Layer " + c.Key + " taken out"
	case c.Old == nil:
		return "Layer " + c.Key + " added"
	}
	return "Layer " + c.Key + " replaced"
}

// changes says what an entry changed.
func (s *speaker) changes(e study.Entry) string {
	var parts []string
	for i, c := range e.Changes {
		if i == mostChanges {
			parts = append(parts, fmt.Sprintf("and %s more", core.Count(len(e.Changes)-mostChanges)))
			break
		}
		parts = append(parts, s.change(c))
	}
	if len(parts) == 0 {
		return "Nothing"
	}
	return strings.Join(parts, "; ")
}

// journalLine is one entry of the journal in words.
type journalLine struct {
	seq    int64
	head   string // when, who
	what   string
	reason string
	search string
}

func (s *speaker) line(e study.Entry, now time.Time) journalLine {
	l := journalLine{seq: e.Seq, head: core.Clock(e.At, now), what: s.changes(e), reason: e.Reason}
	if e.Who != "" {
		l.head += " · " + e.Who
	}
	switch e.Verb {
	case "undo": // its reason is the verb of what it took back
		l.what = fmt.Sprintf("Took back change %d. %s", e.Of, l.what)
		l.reason = ""
	case "redo":
		l.what = fmt.Sprintf("Brought back change %d. %s", e.Of, l.what)
		l.reason = ""
	}
	keys := make([]string, 0, mostChanges)
	for i, c := range e.Changes {
		if i < mostChanges {
			keys = append(keys, c.Key)
		}
	}
	l.search = strings.ToLower(strings.Join([]string{l.head, l.what, e.Reason, e.Verb, strings.Join(keys, " ")}, "\n"))
	return l
}

// standing tells which entries are taken back, and which would be taken back or brought back next.
func standing(journal []study.Entry) (takenBack map[int64]bool, undo, redo int64) {
	takenBack = map[int64]bool{}
	var done, undone []int64
	// As the study itself does, an entry that names one which is not there moves nothing.
	move := func(from, to []int64, seq int64) ([]int64, []int64, bool) {
		i := slices.Index(from, seq)
		if i < 0 {
			return from, to, false
		}
		return slices.Delete(from, i, i+1), append(to, seq), true
	}
	for _, e := range journal {
		moved := false
		switch e.Verb {
		case "undo":
			if done, undone, moved = move(done, undone, e.Of); moved {
				takenBack[e.Of] = true
			}
		case "redo":
			if undone, done, moved = move(undone, done, e.Of); moved {
				delete(takenBack, e.Of)
			}
		default:
			done, undone = append(done, e.Seq), nil
		}
	}
	if n := len(done); n > 0 {
		undo = done[n-1]
	}
	if n := len(undone); n > 0 {
		redo = undone[n-1]
	}
	return takenBack, undo, redo
}
