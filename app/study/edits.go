package study

import (
	"context"
	"errors"
	"fmt"
	"math"
	"slices"
	"sort"
	"strconv"
	"strings"

	"groundtally/geo"
	"groundtally/geo/measure"
)

// HandEdit is a change of one feature by hand, kept with its reason so that it can be made again in the next
// edition of the layer.
type HandEdit struct {
	Verb     string              `json:"verb"` // HandAdd, HandMove, HandSet, HandRemove
	Feature  string              `json:"feature"`
	Geometry *geo.LonLatGeometry `json:"geometry,omitempty"`
	Values   map[string]string   `json:"values,omitempty"` // by field of the role, or column
	Reason   string              `json:"reason"`
	Was      string              `json:"was,omitempty"` // digest of the geometry that was changed, by which a new edition finds it
}

// What can be done to a feature by hand.
const (
	HandAdd    = "add"
	HandMove   = "move"
	HandSet    = "set"
	HandRemove = "remove"
)

// ErrReasonNeeded says that a change by hand has no reason.
var ErrReasonNeeded = errors.New("a change by hand needs a reason; it goes into the appendix")

// apply makes a hand edit in a layer. Values of a field without a column get one.
func (h HandEdit) apply(l *geo.Layer, rec *LayerRecord, role Role) error {
	at := slices.IndexFunc(l.Features, func(f geo.Feature) bool { return f.ID == h.Feature })
	switch {
	case h.Verb == HandAdd && at >= 0:
		return fmt.Errorf("feature %q of layer %q: %w", h.Feature, rec.Name, ErrNameInUse)
	case h.Verb != HandAdd && at < 0:
		return fmt.Errorf("feature %q of layer %q: %w", h.Feature, rec.Name, ErrNotThere)
	}
	if (h.Verb == HandAdd || h.Verb == HandMove) && (h.Geometry == nil || h.Geometry.Empty() || !role.Accepts(h.Geometry.Kind.String())) {
		return fmt.Errorf("layer %q takes %s", rec.Name, strings.Join(role.Geometry, " or "))
	}
	switch h.Verb {
	case HandAdd:
		l.Features = append(l.Features, geo.Feature{ID: h.Feature, Geometry: *h.Geometry, Values: make([]geo.Value, len(l.Columns))})
		at = len(l.Features) - 1
		if col := l.ColumnIndex(rec.Match["parcel_id"]); role.Name == "parcels" && col >= 0 {
			l.Features[at].Values[col] = geo.TextValue(h.Feature)
		}
	case HandMove:
		l.Features[at].Geometry = *h.Geometry
	case HandRemove:
		l.Features = slices.Delete(l.Features, at, at+1)
		return nil
	case HandSet:
		if len(h.Values) == 0 {
			return errors.New("there is nothing to set")
		}
	default:
		return fmt.Errorf("%q is nothing that can be done by hand", h.Verb)
	}
	names := make([]string, 0, len(h.Values))
	for n := range h.Values {
		names = append(names, n)
	}
	sort.Strings(names)
	for _, n := range names {
		col, err := columnFor(l, rec, role, n)
		if err != nil {
			return err
		}
		l.Features[at].Values[col] = valueLike(l, col, h.Values[n])
	}
	return nil
}

// columnFor gives the column of a field or of its own name; a field of the role without a column gets one.
func columnFor(l *geo.Layer, rec *LayerRecord, role Role, name string) (int, error) {
	if c := l.ColumnIndex(rec.Match[name]); rec.Match[name] != "" && c >= 0 {
		return c, nil
	}
	f, known := role.Field(name)
	if c := l.ColumnIndex(name); c >= 0 && !known {
		return c, nil
	}
	if !known {
		return 0, fmt.Errorf("%s have no field %q and the layer no such column", role.Title, name)
	}
	if l.ColumnIndex(name) < 0 {
		l.Columns = append(l.Columns, geo.Column{Name: name, Personal: f.Personal})
		for i := range l.Features {
			l.Features[i].Values = append(l.Features[i].Values, geo.Value{})
		}
	}
	c := l.ColumnIndex(name)
	rec.Match[name] = name
	if f.Physical() {
		rec.Units[name], l.Columns[c].Unit = f.Unit, f.Unit
	}
	return c, nil
}

// valueLike gives a text as a value of the kind that the column holds.
func valueLike(l *geo.Layer, col int, text string) geo.Value {
	for _, f := range l.Features {
		switch f.Values[col].Kind {
		case geo.Number:
			if x, err := strconv.ParseFloat(text, 64); err == nil && !math.IsNaN(x) && !math.IsInf(x, 0) {
				return geo.NumberValue(x)
			}
		case geo.Bool:
			if b, err := strconv.ParseBool(text); err == nil {
				return geo.BoolValue(b)
			}
		case geo.Null:
			continue
		}
		break
	}
	return geo.TextValue(text)
}

// content gives a copy of a layer of the study with its record.
func (s *Study) content(ctx context.Context, name string) (*Snapshot, LayerRecord, *geo.Layer, error) {
	snap, err := s.Snapshot()
	if err != nil {
		return nil, LayerRecord{}, nil, err
	}
	for _, rec := range snap.Layers {
		if rec.Name != name {
			continue
		}
		v, _, err := s.store.Version(ctx, rec.Digest)
		if err != nil {
			return nil, rec, nil, fmt.Errorf("read layer %q: %w", name, err)
		}
		if v.Layer == nil {
			return nil, rec, nil, fmt.Errorf("layer %q is a grid of values: %w", name, ErrNotThere)
		}
		return snap, rec.clone(), cloned(v.Layer), nil
	}
	return snap, LayerRecord{}, nil, fmt.Errorf("layer %q: %w", name, ErrNotThere)
}

// clone gives a record whose maps and lists can be changed.
func (rec LayerRecord) clone() LayerRecord {
	match, unit := map[string]string{}, map[string]string{}
	for k, v := range rec.Match {
		match[k] = v
	}
	for k, v := range rec.Units {
		unit[k] = v
	}
	rec.Match, rec.Units, rec.Hand = match, unit, slices.Clone(rec.Hand)
	return rec
}

func cloned(l *geo.Layer) *geo.Layer {
	out := &geo.Layer{Name: l.Name, Columns: slices.Clone(l.Columns), Features: slices.Clone(l.Features)}
	for i := range out.Features {
		out.Features[i].Values = slices.Clone(out.Features[i].Values)
	}
	return out
}

// EditByHand changes features of a layer as one journal entry. Every change needs a reason. A layer that is
// not there is begun when newRole says what it means.
func (s *Study) EditByHand(ctx context.Context, layer, newRole string, tools Tools, edits ...HandEdit) (LayerRecord, error) {
	snap, rec, content, err := s.content(ctx, layer)
	if errors.Is(err, ErrNotThere) && rec.Name == "" && newRole != "" {
		rec, content, err = LayerRecord{Name: layer, Role: newRole, File: "drawn by hand", CRS: "OGC:CRS84", Match: map[string]string{}, Units: map[string]string{}}, &geo.Layer{Name: layer}, nil
	}
	if err != nil {
		return rec, err
	}
	role, ok := s.cat.Role(rec.Role)
	if !ok {
		return rec, fmt.Errorf("role %q: %w", rec.Role, ErrNotThere)
	}
	if snap.Frame == nil {
		return rec, fmt.Errorf("the study has no parcels yet, and so no place: %w", ErrNotThere)
	}
	for i := range edits {
		if strings.TrimSpace(edits[i].Reason) == "" {
			return rec, ErrReasonNeeded
		}
		if edits[i].Feature == "" && edits[i].Verb == HandAdd {
			edits[i].Feature = freeName(content)
		}
		if g := edits[i].Geometry; g != nil {
			if err := checkDrawn(g, *snap.Frame, tools); err != nil {
				return rec, err
			}
		}
		for _, f := range content.Features {
			if edits[i].Verb != HandAdd && f.ID == edits[i].Feature {
				edits[i].Was = shapeDigest(f.Geometry)
			}
		}
		if err := edits[i].apply(content, &rec, role); err != nil {
			return rec, err
		}
		rec.Hand = append(rec.Hand, edits[i])
	}
	if len(content.Features) == 0 {
		return rec, fmt.Errorf("layer %q would be empty; remove it instead", layer)
	}
	rec.Digest, rec.Count, rec.Extent = LayerDigest(content), len(content.Features), extent(content, role)
	kinds := map[string]int{}
	for _, f := range content.Features {
		kinds[f.Geometry.Kind.String()]++
	}
	rec.Kind = ""
	for _, k := range []string{"polygon", "line", "point"} {
		if kinds[k] > kinds[rec.Kind] {
			rec.Kind = k
		}
	}
	_, err = s.Edit(ctx, "edit by hand", edits[0].Reason, []Change{{Kind: LayerRecKind, Key: rec.Name, New: Canonical(rec)}}, []Version{{Digest: rec.Digest, Layer: content}})
	return rec, err
}

func freeName(l *geo.Layer) string {
	used := map[string]bool{}
	for _, f := range l.Features {
		used[f.ID] = true
	}
	for n := 1; ; n++ {
		if name := fmt.Sprintf("hand-%d", n); !used[name] {
			return name
		}
	}
}

// checkDrawn refuses a place outside the study's reach, and makes a polygon valid.
func checkDrawn(g *geo.LonLatGeometry, centre geo.LonLat, tools Tools) error {
	forward, inverse, err := tools.Frame(centre)
	if err != nil {
		return err
	}
	flat, err := forward(*g)
	if err != nil || g.Kind != geo.Polygons {
		return err
	}
	list, err := tools.Repair(context.Background(), []geo.XYGeometry{flat})
	if err != nil {
		return err
	}
	r := list[0]
	switch {
	case r.Err != nil:
		return r.Err
	case r.Geometry.Empty():
		return errors.New("the outline encloses no ground")
	case r.Changed:
		*g, err = inverse(r.Geometry)
	}
	return err
}

// JoinReport says how the rows of a table met the features of a layer.
type JoinReport struct {
	Matched  int      `json:"matched"`   // features that got values
	Without  []string `json:"without"`   // features whose key no row has
	LeftOver []string `json:"left_over"` // keys of rows that no feature has
	Doubled  []string `json:"doubled"`   // keys that stand in several rows; the first row counts
	Columns  []string `json:"columns"`   // that came in, under their names in the layer
}

// Join adds the columns of a table to the features of a layer that have the same key, as one journal entry.
// Keys are compared as text without blanks around them.
func (s *Study) Join(ctx context.Context, layer string, table *geo.Layer, key, tableKey, reason string) (JoinReport, error) {
	var rep JoinReport
	snap, rec, content, err := s.content(ctx, layer)
	if err != nil {
		return rep, err
	}
	role, _ := snap.Catalog().Role(rec.Role)
	own := func(f geo.Feature) string { return f.ID }
	if key != "" {
		c := content.ColumnIndex(key)
		if c < 0 {
			return rep, &QuestionError{File: layer, Questions: []Question{{Text: fmt.Sprintf("the layer has no column %q; the columns are: %s", key, columnNames(content)), Option: "--layer-key COLUMN"}}}
		}
		own = func(f geo.Feature) string { return f.Values[c].String() }
	}
	tc := table.ColumnIndex(tableKey)
	if tc < 0 {
		return rep, &QuestionError{File: layer, Questions: []Question{{Text: fmt.Sprintf("the table has no column %q; the columns are: %s", tableKey, columnNames(table)), Option: "--key COLUMN"}}}
	}
	rows, used := map[string]int{}, map[string]bool{}
	for i, f := range table.Features {
		k := strings.TrimSpace(f.Values[tc].String())
		if k == "" {
			continue
		}
		if _, twice := rows[k]; twice {
			rep.Doubled = append(rep.Doubled, k)
			continue
		}
		rows[k] = i
	}
	first := len(content.Columns)
	var from []int
	for i, c := range table.Columns {
		if i == tc {
			continue
		}
		name := c.Name
		for n := 2; content.ColumnIndex(name) >= 0; n++ {
			name = fmt.Sprintf("%s (%d)", c.Name, n)
		}
		content.Columns = append(content.Columns, geo.Column{Name: name, Unit: c.Unit, Personal: c.Personal})
		rep.Columns = append(rep.Columns, name)
		from = append(from, i)
	}
	if len(from) == 0 {
		return rep, errors.New("the table has no column beside its key")
	}
	for i := range content.Features {
		f := &content.Features[i]
		k := strings.TrimSpace(own(*f))
		row, ok := rows[k]
		for _, c := range from {
			v := geo.Value{}
			if ok {
				v = table.Features[row].Values[c]
			}
			f.Values = append(f.Values, v)
		}
		if ok {
			rep.Matched++
			used[k] = true
		} else {
			rep.Without = append(rep.Without, f.ID)
		}
	}
	for _, f := range table.Features {
		if k := strings.TrimSpace(f.Values[tc].String()); k != "" && !used[k] {
			used[k] = true
			rep.LeftOver = append(rep.LeftOver, k)
		}
	}
	if rep.Matched == 0 {
		return rep, &FileError{File: layer, What: fmt.Sprintf("no key of the table's column %q is one of the layer's", tableKey), Cure: "Check which columns hold the keys"}
	}
	// Columns that have the name of a field without one serve as that field.
	for _, c := range content.Columns[first:] {
		for _, f := range role.Fields {
			if strings.EqualFold(f.Name, c.Name) && rec.Match[f.Name] == "" && !f.Physical() {
				rec.Match[f.Name] = c.Name
			}
		}
	}
	rec.Digest = LayerDigest(content)
	if reason == "" {
		reason = "columns joined to " + layer
	}
	_, err = s.Edit(ctx, "join", reason, []Change{{Kind: LayerRecKind, Key: rec.Name, New: Canonical(rec)}}, []Version{{Digest: rec.Digest, Layer: content}})
	return rep, err
}

// Changes says how an edition of a layer differs from the one before.
type Changes struct {
	Added   []string          `json:"added"`
	Removed []string          `json:"removed"`
	Moved   []string          `json:"moved"`   // other outline or place
	Altered []string          `json:"altered"` // other values
	Renamed map[string]string `json:"renamed"` // old name to new, by overlap
	Same    int               `json:"same"`
}

// compare finds what changed between two editions: matched by identifier, then, of polygons, by overlap of
// more than half of both. Values are compared by the fields that both match.
func compare(old, now *geo.Layer, oldRec, rec LayerRecord, centre geo.LonLat, tools Tools) (Changes, error) {
	ch := Changes{Renamed: map[string]string{}}
	at := map[string]int{}
	for i, f := range now.Features {
		at[f.ID] = i
	}
	var gone []geo.Feature
	met := map[string]bool{}
	fields := func(i int, l *geo.Layer, r LayerRecord, other LayerRecord) string {
		var b strings.Builder
		names := make([]string, 0, len(r.Match))
		for n := range r.Match {
			if other.Match[n] != "" {
				names = append(names, n)
			}
		}
		sort.Strings(names)
		for _, n := range names {
			fmt.Fprintf(&b, "%s=%s;", n, l.Features[i].Values[l.ColumnIndex(r.Match[n])].String())
		}
		return b.String()
	}
	shape := func(g geo.LonLatGeometry) string {
		return LayerDigest(&geo.Layer{Features: []geo.Feature{{Geometry: g}}})
	}
	drawn := map[string]bool{} // by hand: no part of what the holder delivers
	for _, h := range oldRec.Hand {
		if h.Verb == HandAdd {
			drawn[h.Feature] = true
		}
	}
	for i, f := range old.Features {
		j, ok := at[f.ID]
		if !ok && drawn[f.ID] {
			continue
		}
		if !ok {
			gone = append(gone, f)
			continue
		}
		met[f.ID] = true
		moved, altered := shape(f.Geometry) != shape(now.Features[j].Geometry), fields(i, old, oldRec, rec) != fields(j, now, rec, oldRec)
		if moved {
			ch.Moved = append(ch.Moved, f.ID)
		}
		if altered {
			ch.Altered = append(ch.Altered, f.ID)
		}
		if !moved && !altered {
			ch.Same++
		}
	}
	var fresh []geo.Feature
	for _, f := range now.Features {
		if !met[f.ID] {
			fresh = append(fresh, f)
		}
	}
	named, err := byOverlap(gone, fresh, centre, tools)
	if err != nil {
		return ch, err
	}
	taken := map[string]bool{}
	for _, f := range gone {
		if n, ok := named[f.ID]; ok {
			ch.Renamed[f.ID], taken[n] = n, true
		} else {
			ch.Removed = append(ch.Removed, f.ID)
		}
	}
	for _, f := range fresh {
		if !taken[f.ID] {
			ch.Added = append(ch.Added, f.ID)
		}
	}
	return ch, nil
}

// byOverlap pairs polygons of two lists that share more than half of both.
func byOverlap(gone, fresh []geo.Feature, centre geo.LonLat, tools Tools) (map[string]string, error) {
	out := map[string]string{}
	forward, _, err := tools.Frame(centre)
	if err != nil {
		return nil, err
	}
	var flat []geo.XYGeometry
	var of []geo.Feature
	for _, f := range append(slices.Clone(gone), fresh...) {
		if f.Geometry.Kind != geo.Polygons {
			continue
		}
		g, err := forward(f.Geometry)
		if err != nil {
			return nil, err
		}
		flat, of = append(flat, g), append(of, f)
	}
	split := 0
	for _, f := range gone {
		if f.Geometry.Kind == geo.Polygons {
			split++
		}
	}
	pairs, err := tools.Overlaps(flat, 0)
	if err != nil {
		return nil, err
	}
	used := map[int]bool{}
	for _, p := range pairs {
		if p.I >= split || p.J < split || used[p.J] || out[of[p.I].ID] != "" {
			continue
		}
		if p.AreaM2 > 0.5*measure.AreaM2(flat[p.I]) && p.AreaM2 > 0.5*measure.AreaM2(flat[p.J]) {
			out[of[p.I].ID], used[p.J] = of[p.J].ID, true
		}
	}
	return out, nil
}

// renew compares a new edition with the one that it replaces and takes over what people added to that one.
func (s *Study) renew(ctx context.Context, rec *LayerRecord, now *geo.Layer, frame *geo.LonLat, role Role, snap *Snapshot, tools Tools) error {
	_, oldRec, old, err := s.content(ctx, rec.Name)
	if errors.Is(err, ErrNotThere) {
		return nil // it was a grid
	}
	if err != nil {
		return err
	}
	centre := snap.Frame
	if frame != nil {
		centre = frame
	}
	if centre == nil || rec.Kind == "table" {
		return nil
	}
	ch, err := compare(old, now, oldRec, *rec, *centre, tools)
	if err != nil {
		return err
	}
	rec.Changes = &ch
	carryOver(old, oldRec, now, rec, role)
	rec.Count = len(now.Features)
	return nil
}

// keptFields are fields that the user or the owners give and a register does not know; they stay when a new
// edition of the parcels lacks them.
var keptFields = []string{"owner_consent", "consent_date"}

// carryOver takes what people added to the old edition into the new one: consents, and changes by hand. What
// finds no feature any more is said.
func carryOver(old *geo.Layer, oldRec LayerRecord, now *geo.Layer, rec *LayerRecord, role Role) {
	name := func(id string) string {
		if rec.Changes != nil && rec.Changes.Renamed[id] != "" {
			return rec.Changes.Renamed[id]
		}
		return id
	}
	kept := 0
	for _, field := range keptFields {
		from := old.ColumnIndex(oldRec.Match[field])
		if oldRec.Match[field] == "" || from < 0 || rec.Match[field] != "" {
			continue
		}
		to, err := columnFor(now, rec, role, field)
		if err != nil {
			continue // the role has no such field
		}
		values := map[string]geo.Value{}
		for _, f := range old.Features {
			values[name(f.ID)] = f.Values[from]
		}
		for i := range now.Features {
			if v, ok := values[now.Features[i].ID]; ok && v.Kind != geo.Null {
				now.Features[i].Values[to] = v
				kept++
			}
		}
	}
	if kept > 0 {
		rec.Notices = append(rec.Notices, geo.Notice{Code: "consents_kept", Severity: geo.Info, Layer: rec.Name, Args: map[string]string{"count": strconv.Itoa(kept)}})
	}
	for _, h := range oldRec.Hand {
		found := true
		if h.Feature = name(h.Feature); role.Name != "parcels" && h.Verb != HandAdd {
			// Without an identifier of their own features are called by their row, which another edition gives to
			// another one: the place tells.
			at := slices.IndexFunc(now.Features, func(f geo.Feature) bool { return shapeDigest(f.Geometry) == h.Was })
			if found = at >= 0; found {
				h.Feature = now.Features[at].ID
			}
		}
		var err error
		if found {
			err = h.apply(now, rec, role)
		}
		if !found || err != nil {
			rec.Notices = append(rec.Notices, geo.Notice{Code: "hand_edit_lost", Severity: geo.Warning, Layer: rec.Name, Feature: h.Feature, Args: map[string]string{"verb": h.Verb, "reason": h.Reason}})
			continue
		}
		rec.Hand = append(rec.Hand, h)
	}
}
