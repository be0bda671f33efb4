package study

import (
	"context"
	"errors"
	"fmt"
	"maps"
	"math"
	"slices"
	"sort"
	"strconv"
	"strings"

	"groundtally/geo"
	"groundtally/geo/measure"
	"groundtally/scoring/units"
)

// HandEdit is a change of one feature by hand, kept with its reason so that it can be made again in the next
// edition of the layer.
type HandEdit struct {
	Verb     string              `json:"verb"` // HandAdd, HandMove, HandSet, HandRemove
	Feature  string              `json:"feature"`
	Called   string              `json:"called,omitempty"` // what people call it, where that is another name than Feature
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

// ErrRaster says that a layer is a grid of values, where features are asked for.
var ErrRaster = errors.New("it is a raster (a grid of values), which has no features")

// ErrReasonNeeded says that a change by hand has no reason.
var ErrReasonNeeded = errors.New("a change by hand needs a reason; it goes into the appendix")

// apply makes a hand edit in a layer. Values of a field without a column get one.
func (h HandEdit) apply(l *geo.Layer, rec *LayerRecord, role Role) error {
	at := slices.IndexFunc(l.Features, func(f geo.Feature) bool { return f.ID == h.Feature })
	switch {
	case h.Verb == HandAdd && at >= 0:
		return fmt.Errorf("feature %q of layer %q: %w", h.Feature, rec.Name, ErrNameInUse)
	case h.Verb != HandAdd && at < 0:
		return noFeature(l, rec, role, h.Feature)
	}
	if h.Verb == HandAdd || h.Verb == HandMove {
		given := "nothing"
		if h.Geometry != nil && !h.Geometry.Empty() {
			given = "a " + h.Geometry.Kind.String()
		}
		if given == "nothing" || !role.Accepts(h.Geometry.Kind.String()) {
			return fmt.Errorf("layer %q takes %s, and %s was given", rec.Name, drawable(role), given)
		}
	}
	switch h.Verb {
	case HandAdd:
		l.Features = append(l.Features, geo.Feature{ID: h.Feature, Geometry: *h.Geometry, Values: make([]geo.Value, len(l.Columns))})
		at = len(l.Features) - 1
		if col := identifierColumn(l, rec, role); strings.HasSuffix(role.Identifier(), "_id") && col >= 0 {
			l.Features[at].Values[col] = valueLike(l, col, h.Feature)
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

// drawable lists the kinds of geometry of a role that can be drawn, and how.
func drawable(role Role) string {
	var out []string
	for _, k := range role.Geometry {
		switch k {
		case "point":
			out = append(out, "a point (one position)")
		case "line":
			out = append(out, "a line (two positions or more)")
		case "polygon":
			out = append(out, "a polygon (which ends where it began)")
		}
	}
	if len(out) == 0 {
		return "nothing that can be drawn"
	}
	return strings.Join(out, " or ")
}

// FeatureError says that a layer has no feature of a name, or several. It is an ErrNotThere.
type FeatureError struct {
	Layer, Feature string
	Near           []string // names that the given one can be a slip of
	Some           []string // the first names that there are
	Count          int      // of features
	Meant          []string // the features that the name can mean, where these are several, as they can be called
}

func (e *FeatureError) Error() string {
	switch {
	case len(e.Meant) > 0:
		return fmt.Sprintf("%q can mean several features of layer %q; say which: %s", e.Feature, e.Layer, strings.Join(e.Meant, ", or "))
	case len(e.Near) > 0:
		return fmt.Sprintf("layer %q has no feature %q; near it are: %s", e.Layer, e.Feature, strings.Join(e.Near, ", "))
	case len(e.Some) == 0:
		return fmt.Sprintf("layer %q has no feature %q", e.Layer, e.Feature)
	}
	return fmt.Sprintf("layer %q has no feature %q; its %d features are called %s and so on", e.Layer, e.Feature, e.Count, strings.Join(e.Some, ", "))
}

// Is makes the error one of what is not there.
func (e *FeatureError) Is(target error) bool { return target == ErrNotThere }

// identifierColumn gives the column by which people call the features; -1 without one.
func identifierColumn(l *geo.Layer, rec *LayerRecord, role Role) int {
	if col := rec.Match[role.Identifier()]; col != "" {
		return l.ColumnIndex(col)
	}
	return -1
}

func calledBy(f geo.Feature, col int) string {
	if col < 0 {
		return ""
	}
	return strings.TrimSpace(f.Values[col].String())
}

func noFeature(l *geo.Layer, rec *LayerRecord, role Role, name string) error {
	col := identifierColumn(l, rec, role)
	var names []string
	for _, f := range l.Features {
		if called := calledBy(f, col); called != "" {
			names = append(names, called)
		} else {
			names = append(names, f.ID)
		}
	}
	e := &FeatureError{Layer: rec.Name, Feature: name, Near: Near(name, names, 5), Count: len(l.Features)}
	e.Some = names[:min(len(names), 5)]
	return e
}

// rowWord stands before the name by which the program calls a feature, where that could also be another's
// identifier: "row=3".
const rowWord = "row"

// featureNamed finds the feature that a name means: its row in the file, or what it is called by the identifier
// of its role. Where that can be several, "row=3" and "dwelling_id=3" tell them apart.
func featureNamed(l *geo.Layer, rec *LayerRecord, role Role, name string) (int, error) {
	col, field := identifierColumn(l, rec, role), role.Identifier()
	find := func(row, called string) []int {
		var out []int
		for i, f := range l.Features {
			if row != "" && f.ID == row || called != "" && calledBy(f, col) == called {
				out = append(out, i)
			}
		}
		return out
	}
	at := find(name, name)
	if word, rest, ok := strings.Cut(name, "="); len(at) == 0 && ok {
		switch word {
		case rowWord:
			at = find(rest, "")
		case field:
			at = find("", rest)
		}
	}
	switch len(at) {
	case 1:
		return at[0], nil
	case 0:
		return -1, noFeature(l, rec, role, name)
	}
	e := &FeatureError{Layer: rec.Name, Feature: name}
	for _, i := range at[:min(len(at), 5)] {
		word := rowWord + "=" + l.Features[i].ID
		if called := calledBy(l.Features[i], col); called != "" && called != l.Features[i].ID {
			word += " (" + field + " " + called + ")"
		}
		e.Meant = append(e.Meant, word)
	}
	if len(find("", name)) == 1 && len(at) == 2 {
		e.Meant = append(e.Meant, field+"="+name)
	}
	return -1, e
}

// checkValues looks at the values of a change by hand as fields of the role and columns of the layer, and
// gives them as the layer keeps them. A text that its field has nowhere else is noted: it may be a slip.
func checkValues(l *geo.Layer, rec *LayerRecord, role Role, given map[string]string, feature string) (map[string]string, []geo.Notice, error) {
	if len(given) == 0 {
		return given, nil, nil
	}
	out := make(map[string]string, len(given))
	var notices []geo.Notice
	names := make([]string, 0, len(given))
	for n := range given {
		names = append(names, n)
	}
	sort.Strings(names)
	for _, n := range names {
		out[n] = strings.TrimSpace(given[n])
		name := first(rec.Match[n], n)
		col := l.ColumnIndex(name)
		f, known := role.Field(n)
		if known {
			v, err := f.Check(given[n], rec.Units[name])
			if err != nil {
				return nil, nil, fmt.Errorf("field %s: %w", n, err)
			}
			out[n] = v
		} else if col >= 0 {
			if _, err := strconv.ParseFloat(out[n], 64); err != nil && onlyNumbers(l, col) {
				return nil, nil, fmt.Errorf("column %s holds numbers, and %q is none", n, out[n])
			}
		}
		if f.Unit == "text" && n != role.Identifier() && repeated(n) {
			if there := otherValues(l, col); len(there) > 0 && !slices.ContainsFunc(there, func(t string) bool { return strings.EqualFold(t, out[n]) }) {
				notices = append(notices, geo.Notice{Code: "hand_value_new", Severity: geo.Warning, Layer: rec.Name, Feature: feature, Field: n, Args: map[string]string{"value": out[n], "there": few(there, 12)}})
			}
		}
	}
	return out, notices, nil
}

// repeated tells whether a text field sorts features into classes, so that a value of its own is odd.
func repeated(field string) bool {
	switch field {
	case "class", "kind", "use_class", "soil_class", "zone", "condition", "protection":
		return true
	}
	return false
}

func onlyNumbers(l *geo.Layer, col int) bool {
	some := false
	for _, f := range l.Features {
		switch f.Values[col].Kind {
		case geo.Number:
			some = true
		case geo.Null:
		default:
			return false
		}
	}
	return some
}

// otherValues lists the values of a column in order.
func otherValues(l *geo.Layer, col int) []string {
	if col < 0 {
		return nil
	}
	seen := map[string]bool{}
	for _, f := range l.Features {
		if t := strings.TrimSpace(f.Values[col].String()); t != "" {
			seen[t] = true
		}
	}
	return slices.Sorted(maps.Keys(seen))
}

// few joins the first of many words.
func few(words []string, most int) string {
	if len(words) > most {
		return strings.Join(words[:most], ", ") + fmt.Sprintf(" and %d more", len(words)-most)
	}
	return strings.Join(words, ", ")
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
		fields := make([]string, len(role.Fields))
		for i, f := range role.Fields {
			fields[i] = f.Name
		}
		return 0, fmt.Errorf("%s have no field %q and the layer no such column; the fields are: %s", role.Title, name, strings.Join(fields, ", "))
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
			if b, err := strconv.ParseBool(text); err == nil || text == "yes" || text == "no" {
				return geo.BoolValue(b || text == "yes")
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
			return nil, rec, nil, fmt.Errorf("layer %q: %w", name, ErrRaster)
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
		if err := s.byHand(snap, content, &rec, role, &edits[i], tools); err != nil {
			return rec, err
		}
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

// byHand makes one change by hand in a layer and notes it in its record.
func (s *Study) byHand(snap *Snapshot, content *geo.Layer, rec *LayerRecord, role Role, h *HandEdit, tools Tools) error {
	if h.Verb == HandAdd {
		if role.Name == "district" {
			if old := outline(snap, content, rec); old != "" {
				return fmt.Errorf("%s is the district's outline already, and a second one would make the district larger; move that one instead, or add a file that holds all parts of the district in its place", old)
			}
		}
		if h.Feature == "" {
			h.Feature = freeName(content)
		} else if _, err := featureNamed(content, rec, role, h.Feature); err == nil {
			return fmt.Errorf("feature %q of layer %q: %w", h.Feature, rec.Name, ErrNameInUse)
		}
	} else {
		at, err := featureNamed(content, rec, role, h.Feature)
		if err != nil {
			return err
		}
		h.Feature, h.Was = content.Features[at].ID, shapeDigest(content.Features[at].Geometry)
		if called := calledBy(content.Features[at], identifierColumn(content, rec, role)); called != h.Feature {
			h.Called = called
		}
	}
	if h.Verb == HandRemove && len(h.Values) > 0 {
		return fmt.Errorf("layer %q, feature %s: what is taken out can have no values set", rec.Name, first(h.Called, h.Feature))
	}
	values, notices, err := checkValues(content, rec, role, h.Values, h.Feature)
	if err != nil {
		return fmt.Errorf("layer %q, feature %s: %w", rec.Name, first(h.Called, h.Feature), err)
	}
	h.Values = values
	if h.Geometry != nil {
		r, err := checkDrawn(h.Geometry, *snap.Frame, tools)
		if err != nil {
			return err
		}
		if r.Changed {
			at := anyPosition(*h.Geometry)
			code, args := repairWords("drawn_repaired", r)
			notices = append(notices, geo.Notice{Code: code, Severity: geo.Warning, Layer: rec.Name, Feature: h.Feature, At: &at, Args: args})
		}
	}
	if err := h.apply(content, rec, role); err != nil {
		return err
	}
	// What was said of an earlier change by hand of the feature is no longer so.
	rec.Notices = slices.DeleteFunc(slices.Clone(rec.Notices), func(n geo.Notice) bool {
		_, again := h.Values[n.Field]
		return n.Feature == h.Feature && (strings.HasPrefix(n.Code, "drawn_repaired") && (h.Geometry != nil || h.Verb == HandRemove) || n.Code == "hand_value_new" && (again || h.Verb == HandRemove))
	})
	rec.Notices = append(rec.Notices, notices...)
	rec.Hand = append(rec.Hand, *h)
	return nil
}

func hectares(m2 float64) string { return strconv.FormatFloat(m2/units.M2PerHa, 'f', 4, 64) }

// outline names the polygon that is the district's outline: of this layer, or of another of the role; empty
// without one.
func outline(snap *Snapshot, content *geo.Layer, rec *LayerRecord) string {
	for _, f := range content.Features {
		if f.Geometry.Kind == geo.Polygons {
			return fmt.Sprintf("feature %q of layer %q", f.ID, rec.Name)
		}
	}
	for _, l := range snap.LayersOf("district") {
		if l.Name != rec.Name {
			return fmt.Sprintf("layer %q", l.Name)
		}
	}
	return ""
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
func checkDrawn(g *geo.LonLatGeometry, centre geo.LonLat, tools Tools) (Repaired, error) {
	forward, inverse, err := tools.Frame(centre)
	if err != nil {
		return Repaired{}, err
	}
	flat, err := forward(*g)
	if err != nil || g.Kind != geo.Polygons {
		return Repaired{}, err
	}
	list, err := tools.Repair(context.Background(), []geo.XYGeometry{flat})
	if err != nil {
		return Repaired{}, err
	}
	r := list[0]
	switch {
	case r.Err != nil:
		return r, r.Err
	case r.Geometry.Empty():
		return r, errors.New("the outline encloses no ground")
	case r.Changed:
		*g, err = inverse(r.Geometry)
	}
	return r, err
}

// JoinReport says how the rows of a table met the features of a layer.
type JoinReport struct {
	Matched  int      `json:"matched"`   // features that got values
	Without  []string `json:"without"`   // features whose key no row has
	LeftOver []string `json:"left_over"` // keys of rows that no feature has
	Doubled  []string `json:"doubled"`   // keys that stand in several rows; the first row counts
	Columns  []string `json:"columns"`   // that came in, under their names in the layer
	Replaced []string `json:"replaced"`  // of these, the ones that stood in the layer already
}

// Twice says what becomes of a joined column whose name the layer has already.
type Twice int

// Ways with a column that is there already.
const (
	AskTwice     Twice = iota // the join answers with a *QuestionError
	ReplaceTwice              // the table's column stands in the place of the layer's
	BesideTwice               // the table's gets a number behind its name
)

// Join adds the columns of a table to the features of a layer that have the same key, as one journal entry.
// Keys are compared as text without blanks around them. Columns that the layer has already are treated as
// twice says.
func (s *Study) Join(ctx context.Context, layer string, table *geo.Layer, key, tableKey string, twice Twice, reason string) (JoinReport, error) {
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
	if key != "" && twice == ReplaceTwice && table.ColumnIndex(key) >= 0 && key != tableKey {
		return rep, &QuestionError{File: layer, Questions: []Question{{Text: fmt.Sprintf("column %q holds the layer's keys, which cannot be replaced by the join that uses them", key), Option: "--layer-key ANOTHER COLUMN, or --beside"}}}
	}
	old := len(content.Columns)
	var from, to []int
	for i, c := range table.Columns {
		if i == tc {
			continue
		}
		name, at := c.Name, content.ColumnIndex(c.Name)
		switch {
		case at >= 0 && twice == BesideTwice:
			for n := 2; content.ColumnIndex(name) >= 0; n++ {
				name = fmt.Sprintf("%s (%d)", c.Name, n)
			}
		case at >= 0:
			rep.Replaced = append(rep.Replaced, name)
			content.Columns[at].Unit, content.Columns[at].Personal = c.Unit, content.Columns[at].Personal || c.Personal
		}
		if at = content.ColumnIndex(name); at < 0 {
			at = len(content.Columns)
			content.Columns = append(content.Columns, geo.Column{Name: name, Unit: c.Unit, Personal: c.Personal})
		}
		rep.Columns = append(rep.Columns, name)
		from, to = append(from, i), append(to, at)
	}
	if len(from) == 0 {
		return rep, errors.New("the table has no column beside its key")
	}
	if twice == AskTwice && len(rep.Replaced) > 0 {
		return rep, &QuestionError{File: layer, Questions: []Question{{Text: "the layer has the columns already: " + strings.Join(rep.Replaced, ", ") + "; shall the table's stand in their place, or beside them under another name?", Option: "--replace, or --beside"}}}
	}
	for i := range content.Features {
		f := &content.Features[i]
		k := strings.TrimSpace(own(*f))
		row, ok := rows[k]
		f.Values = append(f.Values, make([]geo.Value, len(content.Columns)-len(f.Values))...)
		for n, c := range from {
			f.Values[to[n]] = geo.Value{}
			if ok {
				f.Values[to[n]] = table.Features[row].Values[c]
			}
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
	for _, c := range content.Columns[old:] {
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
	if errors.Is(err, ErrRaster) {
		return nil
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
