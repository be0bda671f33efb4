package study

import (
	"bytes"
	"context"
	"encoding/json"
	"errors"
	"fmt"
	"reflect"
	"sort"
	"strconv"
	"strings"
	"sync"
	"time"

	"groundtally/assets/citedtable"
	"groundtally/geo"
)

// Setting is the value of one key with where it comes from.
type Setting struct {
	Value      string                `json:"value"`
	Unit       string                `json:"unit,omitempty"`
	Source     string                `json:"source,omitempty"`
	Provenance citedtable.Provenance `json:"provenance,omitempty"` // of a default; empty for a user's value
	AcceptedBy string                `json:"accepted_by,omitempty"`
	Reason     string                `json:"reason,omitempty"`
}

// Group is a site made of several parcels.
type Group struct {
	Site    string   `json:"site"`
	Parcels []string `json:"parcels"`
}

// Study is an open study. It may be used from several goroutines.
type Study struct {
	cat   *Catalog
	store Store
	clock func() time.Time
	who   string

	mu      sync.Mutex
	records map[RecordKind]map[string]json.RawMessage
	journal []Entry
	frozen  []Frozen
}

// Options say who edits and how the time is told; both go into the journal and into nothing else.
type Options struct {
	Who   string
	Clock func() time.Time
}

// Open reads a study from its store.
func Open(ctx context.Context, store Store, cat *Catalog, o Options) (*Study, error) {
	st, err := store.Load(ctx)
	if err != nil {
		return nil, err
	}
	s := &Study{cat: cat, store: store, clock: o.Clock, who: o.Who, records: map[RecordKind]map[string]json.RawMessage{}, journal: st.Journal, frozen: st.Frozen}
	if s.clock == nil {
		s.clock = time.Now
	}
	for _, r := range st.Records {
		s.put(r.Kind, r.Key, r.Value)
	}
	return s, nil
}

// Catalog gives the words and defaults the study was opened with.
func (s *Study) Catalog() *Catalog { return s.cat }

// Store gives the store that keeps the study.
func (s *Study) Store() Store { return s.store }

// Close closes the study's file.
func (s *Study) Close() error { return s.store.Close() }

func (s *Study) put(kind RecordKind, key string, value json.RawMessage) {
	m := s.records[kind]
	if m == nil {
		m = map[string]json.RawMessage{}
		s.records[kind] = m
	}
	if value == nil {
		delete(m, key)
	} else {
		m[key] = value
	}
}

// Edit commits changes as one journal entry. Old values are filled in from the present state, and
// changes that change nothing are dropped; an edit without any change is not written.
func (s *Study) Edit(ctx context.Context, verb, reason string, changes []Change, add []Version) (Entry, error) {
	s.mu.Lock()
	defer s.mu.Unlock()
	return s.edit(ctx, verb, reason, 0, changes, add)
}

// recordName names a record.
type recordName struct {
	kind RecordKind
	key  string
}

func (s *Study) edit(ctx context.Context, verb, reason string, of int64, changes []Change, add []Version) (Entry, error) {
	last := map[recordName]int{} // of changes to the same record the last one counts
	key := func(c Change) recordName { return recordName{c.Kind, c.Key} }
	for i, c := range changes {
		last[key(c)] = i
	}
	var kept []Change
	for i, c := range changes {
		c.Old = s.records[c.Kind][c.Key]
		if last[key(c)] != i || bytes.Equal(c.Old, c.New) {
			continue
		}
		kept = append(kept, c)
	}
	if len(kept) == 0 && of == 0 { // undo and redo are written even so: they move through the journal
		return Entry{}, nil
	}
	e, err := s.store.Commit(ctx, Entry{At: s.clock().UTC().Truncate(time.Second), Who: s.who, Verb: verb, Reason: reason, Of: of, Changes: kept}, add)
	if err != nil {
		return Entry{}, err
	}
	if n := len(s.journal); n > 0 && e.Seq != s.journal[n-1].Seq+1 || n == 0 && e.Seq != 1 {
		return e, s.reload(ctx) // another program wrote in between
	}
	for _, c := range kept {
		s.put(c.Kind, c.Key, c.New)
	}
	s.journal = append(s.journal, e)
	return e, nil
}

// Reload reads the study anew when another program has changed it since; it tells whether one has.
func (s *Study) Reload(ctx context.Context) (changed bool, err error) {
	s.mu.Lock()
	defer s.mu.Unlock()
	n, frozen := len(s.journal), len(s.frozen)
	if err := s.reload(ctx); err != nil {
		return false, err
	}
	return len(s.journal) != n || len(s.frozen) != frozen, nil
}

func (s *Study) reload(ctx context.Context) error {
	st, err := s.store.Load(ctx)
	if err != nil {
		return fmt.Errorf("read the study: %w", err)
	}
	s.records, s.journal, s.frozen = map[RecordKind]map[string]json.RawMessage{}, st.Journal, st.Frozen
	for _, r := range st.Records {
		s.put(r.Kind, r.Key, r.Value)
	}
	return nil
}

// Canonical gives the JSON form in which records are kept.
func Canonical(v any) json.RawMessage {
	b, err := json.Marshal(v)
	if err != nil {
		panic(fmt.Sprintf("study: a record cannot be written as JSON: %v", err)) // only for a type that has no JSON form
	}
	return b
}

// UnknownKeyError says that no setting has the key. Nearest is empty when no key is near.
type UnknownKeyError struct{ Key, Nearest string }

func (e *UnknownKeyError) Error() string {
	if e.Nearest == "" {
		return fmt.Sprintf("no setting is called %q, and none has a name like it", e.Key)
	}
	return fmt.Sprintf("no setting is called %q; the nearest is %q", e.Key, e.Nearest)
}

// ValueError says that a setting cannot have the value.
type ValueError struct {
	Key string
	Err error
}

func (e *ValueError) Error() string { return fmt.Sprintf("setting %s: %v", e.Key, e.Err) }
func (e *ValueError) Unwrap() error { return e.Err }

// SettingEdit is one setting to change. An empty Value takes the user's value out, so that the
// default holds again.
type SettingEdit struct {
	Key        string
	Value      string
	Source     string
	Reason     string
	AcceptedBy string
}

// ExceptPrefix begins the keys of exceptions: rules that do not hold on a site by the user's word.
const ExceptPrefix = "rule.except."

// Set changes settings as one journal entry. An exception needs a reason.
func (s *Study) Set(ctx context.Context, verb, reason string, edits ...SettingEdit) (Entry, error) {
	changes := make([]Change, 0, len(edits))
	for _, e := range edits {
		def, ok := s.cat.Definition(e.Key)
		if !ok {
			return Entry{}, &UnknownKeyError{Key: e.Key, Nearest: s.cat.Nearest(e.Key)}
		}
		c := Change{Kind: SettingRecord, Key: e.Key}
		if e.Value != "" {
			v, err := def.CheckValue(e.Value)
			if err != nil {
				return Entry{}, &ValueError{Key: e.Key, Err: err}
			}
			if strings.HasPrefix(e.Key, ExceptPrefix) && v == "true" && strings.TrimSpace(e.Reason) == "" {
				return Entry{}, &ValueError{Key: e.Key, Err: errors.New("an exception needs a reason; it goes into the appendix")}
			}
			c.New = Canonical(Setting{Value: v, Unit: def.Unit, Source: e.Source, AcceptedBy: e.AcceptedBy, Reason: e.Reason})
		}
		changes = append(changes, c)
	}
	return s.Edit(ctx, verb, reason, changes, nil)
}

// Undo takes back the last edit that is in force; Redo brings back the last one taken back.
func (s *Study) Undo(ctx context.Context) (Entry, error) { return s.step(ctx, "undo") }

// Redo brings back the edit that was last taken back, as long as no new edit came after.
func (s *Study) Redo(ctx context.Context) (Entry, error) { return s.step(ctx, "redo") }

func (s *Study) step(ctx context.Context, verb string) (Entry, error) {
	s.mu.Lock()
	defer s.mu.Unlock()
	done, undone := stacks(s.journal)
	from := done
	if verb == "redo" {
		from = undone
	}
	if len(from) == 0 {
		return Entry{}, ErrNothingToDo
	}
	of := from[len(from)-1]
	changes := make([]Change, 0, len(of.Changes))
	for _, c := range of.Changes {
		to := c.Old
		if verb == "redo" {
			to = c.New
		}
		changes = append(changes, Change{Kind: c.Kind, Key: c.Key, New: to})
	}
	return s.edit(ctx, verb, of.Verb, of.Seq, changes, nil)
}

// Undoable gives the verbs of the edits that Undo would take back, Redo bring back; empty when there are none.
func (s *Study) Undoable() (undo, redo string) {
	s.mu.Lock()
	defer s.mu.Unlock()
	done, undone := stacks(s.journal)
	if n := len(done); n > 0 {
		undo = done[n-1].Verb
	}
	if n := len(undone); n > 0 {
		redo = undone[n-1].Verb
	}
	return undo, redo
}

// SameInputs reports whether two states hold the same settings, layers, groups, turbines of the user's own and
// layouts by hand, so that the same results follow from both.
func SameInputs(a, b *Snapshot) bool {
	return a == b || reflect.DeepEqual(a.Explicit, b.Explicit) && SameButSettings(a, b)
}

// SameButSettings is SameInputs for all but the settings.
func SameButSettings(a, b *Snapshot) bool {
	return reflect.DeepEqual(a.Layers, b.Layers) && reflect.DeepEqual(a.Groups, b.Groups) && reflect.DeepEqual(a.Frame, b.Frame) && reflect.DeepEqual(a.turbines, b.turbines) && reflect.DeepEqual(a.layouts, b.layouts)
}

// stacks gives the entries in force and those taken back, last one last. An undo or redo moves the entry
// that it names; one that names an entry which is not there, as two programs at once may leave behind,
// moves nothing.
func stacks(journal []Entry) (done, undone []Entry) {
	move := func(from, to []Entry, seq int64) ([]Entry, []Entry) {
		for i := len(from) - 1; i >= 0; i-- {
			if from[i].Seq == seq {
				to = append(to, from[i])
				return append(from[:i:i], from[i+1:]...), to
			}
		}
		return from, to
	}
	for _, e := range journal {
		switch e.Verb {
		case "undo":
			done, undone = move(done, undone, e.Of)
		case "redo":
			undone, done = move(undone, done, e.Of)
		default:
			done, undone = append(done, e), nil
		}
	}
	return done, undone
}

// Journal gives all entries, oldest first.
func (s *Study) Journal() []Entry {
	s.mu.Lock()
	defer s.mu.Unlock()
	return append([]Entry(nil), s.journal...)
}

// Freeze keeps the present state under a name. The code may be empty.
func (s *Study) Freeze(ctx context.Context, name, code string) (Frozen, error) {
	s.mu.Lock()
	defer s.mu.Unlock()
	if strings.TrimSpace(name) == "" {
		return Frozen{}, errors.New("a frozen state needs a name")
	}
	f := Frozen{Name: name, At: s.clock().UTC().Truncate(time.Second), Code: code, Records: s.list()}
	if n := len(s.journal); n > 0 {
		f.Seq = s.journal[n-1].Seq
	}
	if err := s.store.Freeze(ctx, f); err != nil {
		return Frozen{}, err
	}
	s.frozen = append(s.frozen, f)
	return f, nil
}

// FrozenStates gives the frozen states, oldest first.
func (s *Study) FrozenStates() []Frozen {
	s.mu.Lock()
	defer s.mu.Unlock()
	return append([]Frozen(nil), s.frozen...)
}

func (s *Study) list() []Record {
	var out []Record
	kinds := make([]string, 0, len(s.records))
	for k := range s.records {
		kinds = append(kinds, string(k))
	}
	sort.Strings(kinds)
	for _, k := range kinds {
		m := s.records[RecordKind(k)]
		keys := make([]string, 0, len(m))
		for key := range m {
			keys = append(keys, key)
		}
		sort.Strings(keys)
		for _, key := range keys {
			out = append(out, Record{Kind: RecordKind(k), Key: key, Value: m[key]})
		}
	}
	return out
}

// Snapshot gives the present state for computing: a plain copy that later edits do not touch.
func (s *Study) Snapshot() (*Snapshot, error) {
	s.mu.Lock()
	records := s.list()
	s.mu.Unlock()
	return NewSnapshot(s.cat, records)
}

// Snapshot is a state of a study, read-only and free of its store.
type Snapshot struct {
	cat      *Catalog
	Explicit map[string]Setting // the user's settings
	Layers   []LayerRecord      // by name
	Groups   []Group            // by site
	Frame    *geo.LonLat        // centre of the local frame; nil before the first parcels
	turbines []OwnTurbine       // by name
	layouts  []HandLayout       // by site, then plant option
}

// FrameKey is the meta record that holds the centre of the local frame.
const FrameKey = "frame_centre"

// NewSnapshot reads records, as of a frozen state for one.
func NewSnapshot(cat *Catalog, records []Record) (*Snapshot, error) {
	n := &Snapshot{cat: cat, Explicit: map[string]Setting{}}
	for _, r := range records {
		var err error
		switch r.Kind {
		case SettingRecord:
			var v Setting
			if err = json.Unmarshal(r.Value, &v); err == nil {
				n.Explicit[r.Key] = v
			}
		case LayerRecKind:
			var v LayerRecord
			if err = json.Unmarshal(r.Value, &v); err == nil {
				n.Layers = append(n.Layers, v)
			}
		case GroupRecord:
			var v Group
			if err = json.Unmarshal(r.Value, &v); err == nil {
				n.Groups = append(n.Groups, v)
			}
		case TurbineRecord:
			var v OwnTurbine
			if err = json.Unmarshal(r.Value, &v); err == nil {
				n.turbines = append(n.turbines, v)
			}
		case LayoutRecord:
			var v HandLayout
			if err = json.Unmarshal(r.Value, &v); err == nil {
				n.layouts = append(n.layouts, v)
			}
		case MetaRecord:
			if r.Key == FrameKey {
				var v geo.LonLat
				if err = json.Unmarshal(r.Value, &v); err == nil {
					n.Frame = &v
				}
			}
		}
		if err != nil {
			return nil, fmt.Errorf("record %s %q: %w: %w", r.Kind, r.Key, ErrDamaged, err)
		}
	}
	sort.Slice(n.Layers, func(i, j int) bool { return n.Layers[i].Name < n.Layers[j].Name })
	sort.Slice(n.Groups, func(i, j int) bool { return n.Groups[i].Site < n.Groups[j].Site })
	sort.Slice(n.turbines, func(i, j int) bool { return n.turbines[i].ID < n.turbines[j].ID })
	sort.Slice(n.layouts, func(i, j int) bool {
		a, b := n.layouts[i], n.layouts[j]
		return a.Site < b.Site || a.Site == b.Site && a.Plant < b.Plant
	})
	return n, nil
}

// Catalog gives the words and defaults of the snapshot.
func (n *Snapshot) Catalog() *Catalog { return n.cat }

// Lookup gives the setting in force: the user's, else the default. ok is false when the setting is
// neither set nor has a default ("not in force").
func (n *Snapshot) Lookup(key string) (s Setting, byUser, ok bool) {
	if s, ok := n.Explicit[key]; ok {
		return s, true, true
	}
	d, known := n.cat.Definition(key)
	if !known || d.Default == "" {
		return Setting{}, false, false
	}
	return Setting{Value: d.Default, Unit: d.Unit, Source: d.Source, Provenance: d.Provenance}, false, true
}

// With gives the snapshot as it would be with a number for one setting.
func (n *Snapshot) With(key string, x float64) (*Snapshot, error) {
	def, ok := n.cat.Definition(key)
	if !ok {
		return nil, &UnknownKeyError{Key: key, Nearest: n.cat.Nearest(key)}
	}
	v, err := def.CheckValue(strconv.FormatFloat(x, 'g', -1, 64))
	if err != nil {
		return nil, &ValueError{Key: key, Err: err}
	}
	out := *n
	out.Explicit = make(map[string]Setting, len(n.Explicit)+1)
	for k, s := range n.Explicit {
		out.Explicit[k] = s
	}
	s := out.Explicit[key]
	s.Value, s.Unit = v, def.Unit
	out.Explicit[key] = s
	return &out, nil
}

// Number gives a numeric setting; ok is false when it is not in force or not set.
func (n *Snapshot) Number(key string) (x float64, ok bool) {
	s, _, in := n.Lookup(key)
	if !in {
		return 0, false
	}
	return s.Number()
}

// Number gives the value as a number; ok is false when it is empty or not set.
func (s Setting) Number() (x float64, ok bool) {
	x, err := strconv.ParseFloat(s.Value, 64)
	return x, err == nil
}

// Text gives a text setting; empty when it is not in force or not set.
func (n *Snapshot) Text(key string) string {
	s, _, in := n.Lookup(key)
	if !in || s.Value == NotSetText {
		return ""
	}
	return s.Value
}

// Yes reports whether a yes-or-no setting is on.
func (n *Snapshot) Yes(key string) bool { return n.Text(key) == "true" }

// Names gives, sorted, the middle names of the user's settings prefix.<name>.suffix.
func (n *Snapshot) Names(prefix, suffix string) []string {
	var out []string
	for k := range n.Explicit {
		rest, ok := strings.CutPrefix(k, prefix+".")
		if !ok {
			continue
		}
		if name, ok := strings.CutSuffix(rest, "."+suffix); ok && !strings.Contains(name, ".") {
			out = append(out, name)
		}
	}
	sort.Strings(out)
	return out
}

// Plants gives the plant option ids, sorted.
func (n *Snapshot) Plants() []string { return n.Names("plant", "technology") }

// Voices gives the voice names, sorted: every voice with a weight or a title.
func (n *Snapshot) Voices() []string {
	seen := map[string]bool{}
	for k := range n.Explicit {
		if rest, ok := strings.CutPrefix(k, "voice."); ok {
			name, _, _ := strings.Cut(rest, ".")
			seen[name] = true
		}
	}
	out := make([]string, 0, len(seen))
	for v := range seen {
		out = append(out, v)
	}
	sort.Strings(out)
	return out
}

// LayersOf gives the layers of a role, by name.
func (n *Snapshot) LayersOf(role string) []LayerRecord {
	var out []LayerRecord
	for _, l := range n.Layers {
		if l.Role == role {
			out = append(out, l)
		}
	}
	return out
}

// Keys lists every key in force or settable without a name in it, sorted: the definitions without
// angle brackets and the user's own.
func (n *Snapshot) Keys() []string {
	seen := map[string]bool{}
	for _, d := range n.cat.Definitions {
		if !strings.Contains(d.Key, "<") {
			seen[d.Key] = true
		}
	}
	for k := range n.Explicit {
		seen[k] = true
	}
	out := make([]string, 0, len(seen))
	for k := range seen {
		out = append(out, k)
	}
	sort.Strings(out)
	return out
}
