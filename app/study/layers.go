package study

import (
	"context"
	"crypto/sha256"
	"errors"
	"fmt"
	"math"
	"runtime"
	"slices"
	"sort"
	"strconv"
	"strings"
	"sync"
	"sync/atomic"

	"groundtally/geo"
	"groundtally/geo/measure"
	"groundtally/scoring/units"
)

// LayerRecord says what a layer of the study is and how it came in. The content is a Version.
type LayerRecord struct {
	Name     string            `json:"name"`
	Role     string            `json:"role"`
	Digest   string            `json:"digest"`
	Media    string            `json:"media,omitempty"` // for a raster kept whole
	Count    int               `json:"count"`
	Kind     string            `json:"kind"`            // point, line, polygon, table, raster
	File     string            `json:"file"`            // base name of the file it came from
	Table    string            `json:"table,omitempty"` // of the file
	CRS      string            `json:"crs"`             // as delivered
	Pipeline string            `json:"pipeline,omitempty"`
	Database string            `json:"projection_data,omitempty"` // editions of the projection library and its database
	Swapped  bool              `json:"swapped,omitempty"`
	Edition  string            `json:"edition,omitempty"`
	Holder   string            `json:"holder,omitempty"`
	Complete bool              `json:"complete"` // covers the whole place, so that "nothing there" is known
	Match    map[string]string `json:"match,omitempty"`
	Units    map[string]string `json:"units,omitempty"` // by column
	Personal []string          `json:"personal,omitempty"`
	Ledger   Ledger            `json:"ledger"`
	Hand     []HandEdit        `json:"by_hand,omitempty"` // changes of features by hand, in order
	Changes  *Changes          `json:"changes,omitempty"` // since the edition that this one replaced
	Only     []Wanted          `json:"only,omitempty"`    // the part of the file that was asked for
	Notices  []geo.Notice      `json:"notices,omitempty"`
	Extent   [4]float64        `json:"extent"` // west, south, east, north in degrees
}

// Ledger counts what became of the features of a file.
type Ledger struct {
	Read     int `json:"read"`
	Repaired int `json:"repaired"`
	LeftOut  int `json:"left_out"`
	NotAsked int `json:"not_asked,omitempty"` // features outside the part that was asked for
}

// ReadOptions say how a file is read.
type ReadOptions struct {
	CRSGiven bool   // the user names the coordinate system, so one that the file states badly is passed over
	Table    string // which table, sheet or set of the file; empty for the only one
}

// Place names two columns that hold the position of a row.
type Place struct {
	X, Y    string
	Degrees bool // their names say longitude and latitude
}

// Import is one file, read but not yet given a meaning, with the user's answers.
type Import struct {
	File    string // path as given, for messages
	Base    string // file name, kept in the study
	Layer   *geo.Layer
	Blob    []byte // for a raster; Layer is nil then
	Media   string
	Corner  *geo.LonLat // of a raster, in its own coordinates
	Table   string      // of the file, where it has several
	Places  []Place     // columns that look like positions, for the user to confirm
	CRS     string      // found in the file, empty if it does not say
	Notices []geo.Notice
	Ledger  Ledger

	Role            string
	Name            string
	CRSOption       string
	Match           map[string]string // field to column
	Units           map[string]string // column to unit
	Personal        []string
	At              *Place // rows are points there
	SwapAxes        bool
	Only            []Wanted // features that fit any; none for all
	Replace         string
	AcceptProposals bool
	Complete        bool
	Stamp           string // of a table of hours: what its times mark, as StampKey
	OffsetH         string // and how far its clock is ahead of UTC, as OffsetKey; empty leaves both as they are
	Edition, Holder string
	Reason          string
}

// Tools are the geometry services that an import needs.
type Tools interface {
	// ToLonLat gives the way from a coordinate system to longitude and latitude on WGS 84.
	ToLonLat(crs string) (transform func(geo.LonLat) (geo.LonLat, error), pipeline string, err error)
	// Operation says by which operation positions near one in the source system come to WGS 84, and how true
	// that is.
	Operation(crs string, at geo.LonLat) (Operation, error)
	// Frame gives the local metric frame around a centre.
	Frame(centre geo.LonLat) (forward func(geo.LonLatGeometry) (geo.XYGeometry, error), inverse func(geo.XYGeometry) (geo.LonLatGeometry, error), err error)
	// Overlaps gives the pairs of polygons that share more than leastM2, in order.
	Overlaps(polygons []geo.XYGeometry, leastM2 float64) ([]Overlap, error)
	// Repair makes polygons valid, on all cores; the answers are in the order of the polygons.
	Repair(ctx context.Context, gs []geo.XYGeometry) ([]Repaired, error)
}

// Repaired is what became of a polygon geometry.
type Repaired struct {
	Geometry geo.XYGeometry // as it was when it was valid already
	Changed  bool
	BeforeM2 float64
	AfterM2  float64
	Err      error // why it cannot be made valid
}

// Operation is a way between two coordinate systems.
type Operation struct {
	Name      string
	AccuracyM float64
	Known     bool   // AccuracyM is stated
	Ballpark  bool   // the shift between the two datums is not known: positions may be off by 100 m and more
	Database  string // editions of the projection library and its database
}

// Overlap is a pair of polygons by their numbers, and the area that they share.
type Overlap struct {
	I, J   int
	AreaM2 float64
}

// Question is something that only the user can answer, with the exact option that answers it.
type Question struct {
	Text   string `json:"text"`
	Option string `json:"option"`
}

// QuestionError says that an import waits for answers. Nothing was changed.
type QuestionError struct {
	File      string
	Questions []Question
	Tables    []string // that the file holds, when the question is which of them
}

func (e *QuestionError) Error() string {
	var b strings.Builder
	fmt.Fprintf(&b, "%s: please answer first:", e.File)
	for _, q := range e.Questions {
		fmt.Fprintf(&b, "\n  %s\n    %s", q.Text, q.Option)
	}
	return b.String()
}

// FileError says what is wrong with a file, where, and what the user can do.
type FileError struct {
	File, Where, What, Cure string
}

func (e *FileError) Error() string {
	s := e.File
	if e.Where != "" {
		s += ", " + e.Where
	}
	s += ": " + e.What
	if e.Cure != "" {
		s += ". " + e.Cure
	}
	return s
}

// synonyms are column names, in several languages, that are proposed for a field and never taken
// without the user's word.
var synonyms = map[string][]string{
	"parcel_id":            {"id", "parcel", "parcelle", "flurstueck", "flurstück", "cadastral_id", "@id", "osm_id", "fid", "nationalcadastralreference"},
	"class":                {"highway", "type", "kind", "fclass", "klasse", "building", "code", "protect_class", "designation", "landuse", "natural"},
	"voltage":              {"voltage_kv", "kv", "spannung", "tension", "volt"},
	"reason":               {"grund", "motif", "type", "kind", "name"},
	"kind":                 {"type", "class", "art", "landuse", "natural", "waterway", "amenity"},
	"zone":                 {"class", "type", "schutzzone"},
	"soil_class":           {"soil", "boden", "class", "type"},
	"depth":                {"depth_m", "tiefe", "profondeur"},
	"height":               {"height_m", "hoehe", "hauteur"},
	"month":                {"monat", "mois"},
	"ghi":                  {"ghi_kwh_per_m2", "globalstrahlung", "radiation"},
	"load":                 {"load_kw", "last", "charge", "demand_kw"},
	"time":                 {"timestamp", "datetime", "zeit", "date"},
	"technology":           {"type", "source", "energietraeger"},
	"rated_power":          {"power_kw", "capacity_kw", "leistung"},
	"limit_value":          {"limit", "height", "max_height"},
	"limit_kind":           {"datum", "reference"},
	"name":                 {"title", "label", "bezeichnung", "nom"},
	"quality":              {"grade", "points", "bodenzahl"},
	"attribution":          {"source", "copyright"},
	"spare_capacity":       {"spare_kw", "free_capacity", "headroom_kw"},
	"organic_carbon_stock": {"soc", "carbon_t_ha", "soc_t_ha"},
}

// AddLayer gives a read file its role and puts it into the study as one journal entry. It answers
// with a *QuestionError when something only the user knows is missing, and with a *FileError when
// the file cannot serve.
func (s *Study) AddLayer(ctx context.Context, in Import, tools Tools) (LayerRecord, error) {
	role, ok := s.cat.Role(in.Role)
	if !ok {
		names := make([]string, len(s.cat.Roles))
		for i, r := range s.cat.Roles {
			names[i] = r.Name
		}
		return LayerRecord{}, &QuestionError{File: in.File, Questions: []Question{{Text: fmt.Sprintf("%q is no role; the roles are: %s", in.Role, strings.Join(names, ", ")), Option: "--as ROLE"}}}
	}
	snap, err := s.Snapshot()
	if err != nil {
		return LayerRecord{}, err
	}
	rec := LayerRecord{Name: in.Name, Role: role.Name, File: in.Base, Table: in.Table, Swapped: in.SwapAxes, Edition: in.Edition, Holder: in.Holder, Complete: in.Complete, Match: map[string]string{}, Units: map[string]string{}, Ledger: in.Ledger, Notices: in.Notices}
	ask := func(text, option string) error {
		return &QuestionError{File: in.File, Questions: []Question{{Text: text, Option: option}}}
	}
	if rec.Name == "" {
		rec.Name = strings.TrimSuffix(in.Base, ext(in.Base))
		if in.Table != "" && ext(in.Base) != ".zip" {
			rec.Name = in.Table
		}
	}
	if in.Replace != "" {
		if in.Name != "" && in.Name != in.Replace {
			return LayerRecord{}, ask("a replacement keeps the name of the layer it replaces", fmt.Sprintf("--replace %q without --name", in.Replace))
		}
		rec.Name = in.Replace
	}
	there := false
	for _, l := range snap.Layers {
		if l.Name != rec.Name {
			continue
		}
		there = true
		switch {
		case in.Replace == "":
			return LayerRecord{}, ask(fmt.Sprintf("a layer %q is there already", rec.Name), fmt.Sprintf("--replace %q, or --name with another name", rec.Name))
		case l.Role != role.Name:
			return LayerRecord{}, ask(fmt.Sprintf("the layer %q has the role %s; a replacement keeps its role", rec.Name, l.Role), fmt.Sprintf("--as %s, or remove the layer first", l.Role))
		}
	}
	if in.Replace != "" && !there {
		return LayerRecord{}, ask(fmt.Sprintf("there is no layer %q to replace", in.Replace), fmt.Sprintf("--name %q", in.Replace))
	}
	var changes []Change
	var version Version
	if in.Layer == nil {
		if !role.Accepts("raster") {
			return LayerRecord{}, &FileError{File: in.File, What: fmt.Sprintf("a raster (a grid of values) cannot serve as %s", role.Name), Cure: "The role takes " + strings.Join(role.Geometry, " or ")}
		}
		rec.CRS = first(in.CRSOption, in.CRS)
		if rec.CRS == "" {
			return LayerRecord{}, &QuestionError{File: in.File, Questions: []Question{{Text: "the file does not say in which coordinate system its corners are", Option: "--crs EPSG:32626 (for one)"}}}
		}
		if _, rec.Pipeline, err = tools.ToLonLat(rec.CRS); err != nil {
			return LayerRecord{}, badSystem(in.File, rec.CRS, err)
		}
		if in.Corner != nil {
			op, err := tools.Operation(rec.CRS, *in.Corner)
			if err != nil {
				return LayerRecord{}, &FileError{File: in.File, What: "its corner is not in " + CRSWords(rec.CRS) + ": " + err.Error(), Cure: "Give the coordinate system with --crs AUTH:CODE"}
			}
			rec.operated(op, in.Base)
		}
		if qs := DescribeGrid(&rec, in, role, snap); len(qs) > 0 {
			return LayerRecord{}, &QuestionError{File: in.File, Questions: qs}
		}
		version = Version{Digest: BlobDigest(in.Media, in.Blob), Blob: in.Blob, Media: in.Media}
		rec.Kind, rec.Media, rec.Count = "raster", in.Media, 1
	} else {
		layer, frame, err := s.prepare(ctx, &rec, in, role, snap, tools)
		if err != nil {
			return LayerRecord{}, err
		}
		if in.Replace != "" {
			if err := s.renew(ctx, &rec, layer, frame, role, snap, tools); err != nil {
				return LayerRecord{}, err
			}
		}
		if role.Name == HourlyRole {
			more, qs, err := s.hours(in, rec, snap)
			if err != nil {
				return LayerRecord{}, err
			}
			if len(qs) > 0 {
				return LayerRecord{}, &QuestionError{File: in.File, Questions: qs}
			}
			changes = append(changes, more...)
		}
		version = Version{Digest: LayerDigest(layer), Layer: layer}
		if frame != nil {
			changes = append(changes, Change{Kind: MetaRecord, Key: FrameKey, New: Canonical(*frame)})
		}
	}
	rec.Digest = version.Digest
	changes = append(changes, Change{Kind: LayerRecKind, Key: rec.Name, New: Canonical(rec)})
	reason := in.Reason
	if reason == "" {
		reason = fmt.Sprintf("%s as %s", in.Base, role.Name)
	}
	_, err = s.Edit(ctx, "add", reason, changes, []Version{version})
	return rec, err
}

// RemoveLayer takes a layer out; its content stays for undo.
func (s *Study) RemoveLayer(ctx context.Context, name, reason string) error {
	snap, err := s.Snapshot()
	if err != nil {
		return err
	}
	for _, l := range snap.Layers {
		if l.Name == name {
			_, err := s.Edit(ctx, "remove", reason, []Change{{Kind: LayerRecKind, Key: name}}, nil)
			return err
		}
	}
	return fmt.Errorf("layer %q: %w", name, ErrNotThere)
}

func first(texts ...string) string {
	for _, t := range texts {
		if t != "" {
			return t
		}
	}
	return ""
}

func ext(name string) string {
	if i := strings.LastIndexByte(name, '.'); i >= 0 {
		return name[i:]
	}
	return ""
}

// prepare brings the coordinates to WGS 84, matches fields, checks and repairs the features. It
// returns the frame centre when this import fixes it.
func (s *Study) prepare(ctx context.Context, rec *LayerRecord, in Import, role Role, snap *Snapshot, tools Tools) (*geo.Layer, *geo.LonLat, error) {
	if len(in.Layer.Features) == 0 {
		return nil, nil, &FileError{File: in.File, What: "the layer holds no feature", Cure: "Check that the export was not filtered to nothing"}
	}
	for _, w := range in.Only {
		if in.Layer.ColumnIndex(w.Column) < 0 {
			return nil, nil, &QuestionError{File: in.File, Questions: []Question{{Text: fmt.Sprintf("there is no column %q; the columns are: %s", w.Column, columnNames(in.Layer)), Option: "--only COLUMN=VALUE"}}}
		}
	}
	Remember(&in, role, snap)
	if q := joined(&in); q != nil {
		return nil, nil, &QuestionError{File: in.File, Questions: []Question{*q}}
	}
	var questions []Question
	questions = append(questions, matchFields(rec, in, role)...)
	rec.Personal = personal(rec, in, role)
	for _, p := range rec.Personal {
		if p == rec.Match["parcel_id"] && role.Name == "parcels" {
			questions = append(questions, Question{Text: fmt.Sprintf("column %q holds the parcels' identifiers, which every table and map shows, and cannot be personal", p), Option: "leave out --personal " + p + ", or --match parcel_id=ANOTHER COLUMN"})
		}
	}

	layer := &geo.Layer{Name: rec.Name, Columns: append([]geo.Column(nil), in.Layer.Columns...), Features: append([]geo.Feature(nil), in.Layer.Features...)}
	missed := absent(layer, in.Only)
	rec.Only, rec.Ledger.NotAsked = in.Only, only(layer, in.Only)
	if len(layer.Features) == 0 {
		var there []string
		for _, n := range missed {
			if words := "column " + n.Field + " holds: " + n.Args["there"]; !slices.Contains(there, words) {
				there = append(there, words)
			}
		}
		return nil, nil, &FileError{File: in.File, What: "no feature has the values that were asked for; " + strings.Join(there, "; "), Cure: "Check --only; several values are parted by |"}
	}
	for _, n := range missed {
		n.File, n.Layer = in.Base, rec.Name
		rec.Notices = append(rec.Notices, n)
	}
	for i := range layer.Columns {
		layer.Columns[i].Unit = rec.Units[layer.Columns[i].Name]
		for _, p := range rec.Personal {
			if layer.Columns[i].Name == p {
				layer.Columns[i].Personal = true
			}
		}
	}
	if q, err := placed(layer, in, role); err != nil {
		return nil, nil, err
	} else if q != nil {
		return nil, nil, &QuestionError{File: in.File, Questions: append(questions, *q)}
	}
	located := false
	for _, f := range layer.Features {
		if !f.Geometry.Empty() {
			located = true
			break
		}
	}
	if !located {
		if !role.Accepts("table") {
			return nil, nil, &FileError{File: in.File, What: "no feature has a place on the map", Cure: fmt.Sprintf("Layers of the role %s need %s", role.Name, strings.Join(role.Geometry, " or "))}
		}
		if len(questions) > 0 {
			return nil, nil, &QuestionError{File: in.File, Questions: questions}
		}
		rec.Kind, rec.Count = "table", len(layer.Features)
		for _, n := range unfit(rec, role, layer) {
			n.File, n.Layer = in.Base, rec.Name
			rec.Notices = append(rec.Notices, n)
		}
		return layer, nil, nil
	}

	if qs, err := toDegrees(ctx, rec, in, layer, questions, tools); err != nil {
		return nil, nil, err
	} else if len(qs) > 0 {
		return nil, nil, &QuestionError{File: in.File, Questions: qs}
	}
	rec.Extent = extent(layer, role)
	if q := meets(rec, in, snap); q != nil {
		questions = append(questions, *q)
	}
	if len(questions) > 0 {
		return nil, nil, &QuestionError{File: in.File, Questions: questions}
	}

	centre := snap.Frame
	var fixed *geo.LonLat
	if role.Name == "parcels" {
		only := true
		for _, l := range snap.LayersOf("parcels") {
			only = only && l.Name == rec.Name
		}
		if only {
			centre = nil // the only parcels of the study fix its frame, anew if need be
		}
	}
	if centre == nil {
		c := geo.LonLat{Lon: math.Round((rec.Extent[0]+rec.Extent[2])/2*10) / 10, Lat: math.Round((rec.Extent[1]+rec.Extent[3])/2*10) / 10}
		centre = &c
		if role.Name == "parcels" {
			fixed = &c
		}
	}
	if err := s.checkFeatures(ctx, rec, in, role, layer, *centre, tools); err != nil {
		return nil, nil, err
	}
	rec.Count = len(layer.Features)
	return layer, fixed, nil
}

// roughM is the accuracy from which on a change of datum is worth a word.
const roughM = 0.5

// operation records how the coordinates come to WGS 84, and says so where that is not exact.
func operation(rec *LayerRecord, in Import, layer *geo.Layer, tools Tools) error {
	for _, f := range layer.Features {
		if f.Geometry.Empty() {
			continue
		}
		at := anyPosition(f.Geometry)
		op, err := tools.Operation(rec.CRS, at)
		if err != nil {
			return &FileError{File: in.File, Where: "feature " + f.ID, What: err.Error(), Cure: "Check --crs"}
		}
		rec.operated(op, in.Base)
		return nil
	}
	return nil
}

// operated takes over what is known of the way to WGS 84.
func (rec *LayerRecord) operated(op Operation, file string) {
	rec.Database = op.Database
	if op.Name != "" {
		rec.Pipeline += " by " + op.Name
	}
	switch {
	case op.Ballpark:
		rec.Notices = append(rec.Notices, geo.Notice{Code: "datum_unknown", Severity: geo.Warning, File: file, Layer: rec.Name, Args: map[string]string{"crs": CRSWords(rec.CRS)}})
	case op.Known && op.AccuracyM > roughM:
		rec.Notices = append(rec.Notices, geo.Notice{Code: "datum_approximate", Severity: geo.Info, File: file, Layer: rec.Name, Args: map[string]string{"crs": CRSWords(rec.CRS), "metres": strconv.FormatFloat(op.AccuracyM, 'g', -1, 64)}})
	}
}

// CRSWords writes a coordinate system for a sentence: its code, or of a definition the name and the beginning.
func CRSWords(crs string) string {
	const most = 40
	crs = strings.TrimSpace(crs)
	if !strings.Contains(crs, "[") && len([]rune(crs)) <= most {
		return crs
	}
	start := strings.Join(strings.Fields(crs), " ")
	if r := []rune(start); len(r) > most {
		start = string(r[:most]) + "..."
	}
	if _, rest, ok := strings.Cut(crs, `["`); ok {
		if name, _, ok := strings.Cut(rest, `"`); ok && name != "" {
			return fmt.Sprintf("%q (%s)", name, start)
		}
	}
	return start
}

// badSystem says that a coordinate system is not understood.
func badSystem(file, crs string, err error) error {
	what := err.Error()
	if cause := errors.Unwrap(err); cause != nil && CRSWords(crs) != crs {
		what = "coordinate system " + CRSWords(crs) + ": " + cause.Error()
	}
	return &FileError{File: file, What: what, Cure: "Give the coordinate system with --crs AUTH:CODE"}
}

// toDegrees brings the coordinates of a layer to WGS 84 in place. It gives the questions that are open before
// that can be done.
func toDegrees(ctx context.Context, rec *LayerRecord, in Import, layer *geo.Layer, questions []Question, tools Tools) ([]Question, error) {
	if in.SwapAxes {
		for i := range layer.Features {
			layer.Features[i].Geometry = geo.Map(layer.Features[i].Geometry, func(p geo.LonLat) geo.LonLat { return geo.LonLat{Lon: p.Lat, Lat: p.Lon} })
		}
	}
	rec.CRS = first(in.CRSOption, in.CRS)
	if rec.CRS == "" {
		if f, bad := outOfDegrees(layer); bad {
			questions = append(questions, Question{Text: fmt.Sprintf("feature %s has coordinates that are no degrees; in which coordinate system is the file?", f), Option: "--crs EPSG:25832 (for one)"})
			return questions, nil
		}
		rec.CRS = "OGC:CRS84"
	}
	transform, pipeline, err := tools.ToLonLat(rec.CRS)
	if err != nil {
		return nil, badSystem(in.File, rec.CRS, err)
	}
	rec.Pipeline = pipeline
	if q := degreesAsMetres(rec, in, layer, transform); q != nil {
		return append(questions, *q), nil
	}
	if err := operation(rec, in, layer, tools); err != nil {
		return nil, err
	}
	for i := range layer.Features {
		if err := ctx.Err(); err != nil {
			return nil, err
		}
		if unmoved(layer.Features[i].Geometry, transform) {
			continue
		}
		var bad error
		layer.Features[i].Geometry = geo.Map(layer.Features[i].Geometry, func(p geo.LonLat) geo.LonLat {
			q, err := transform(p)
			if err != nil && bad == nil {
				bad = err
			}
			return q
		})
		if bad != nil {
			return nil, &FileError{File: in.File, Where: "feature " + layer.Features[i].ID, What: fmt.Sprintf("its coordinates cannot be taken from %s to longitude and latitude: %v", CRSWords(rec.CRS), bad), Cure: "Check --crs"}
		}
	}
	if f, bad := outOfDegrees(layer); bad {
		return nil, &FileError{File: in.File, Where: "feature " + f, What: fmt.Sprintf("its coordinates are no longitude and latitude in %s", CRSWords(rec.CRS)), Cure: "Give the right coordinate system with --crs AUTH:CODE"}
	}
	return nil, nil
}

// unmoved reports whether a transform leaves every position where it is, so that no copy is needed.
func unmoved(g geo.LonLatGeometry, transform func(geo.LonLat) (geo.LonLat, error)) bool {
	for _, part := range g.Parts {
		for _, ring := range part {
			for _, p := range ring {
				if q, err := transform(p); err != nil || q != p {
					return false
				}
			}
		}
	}
	return true
}

// ToDegrees gives the layer of a read file in longitude and latitude on WGS 84, without a role.
func ToDegrees(ctx context.Context, in Import, tools Tools) (*geo.Layer, error) {
	l := cloned(in.Layer)
	rec := LayerRecord{Name: in.Base}
	if q, err := placed(l, in, Role{}); err != nil {
		return nil, err
	} else if q != nil {
		return nil, &QuestionError{File: in.File, Questions: []Question{*q}}
	}
	if qs, err := toDegrees(ctx, &rec, in, l, nil, tools); err != nil {
		return nil, err
	} else if len(qs) > 0 {
		return nil, &QuestionError{File: in.File, Questions: qs}
	}
	return l, nil
}

// placed makes points of the rows of a table where the user says which columns hold their places, and asks
// where a role needs places and columns look like them.
func placed(l *geo.Layer, in Import, role Role) (*Question, error) {
	if in.At == nil {
		some := func(f geo.Feature) bool { return !f.Geometry.Empty() }
		if len(in.Places) == 0 || role.Accepts("table") || !role.Accepts("point") || slices.ContainsFunc(l.Features, some) {
			return nil, nil
		}
		p := in.Places[0]
		return &Question{Text: fmt.Sprintf("the rows have no place on the map; are columns %s and %s their places?", p.X, p.Y), Option: fmt.Sprintf("--at %s,%s", p.X, p.Y)}, nil
	}
	x, y := l.ColumnIndex(in.At.X), l.ColumnIndex(in.At.Y)
	if x < 0 || y < 0 {
		return &Question{Text: fmt.Sprintf("there is no column %q or no column %q; the columns are: %s", in.At.X, in.At.Y, columnNames(l)), Option: "--at COLUMN,COLUMN"}, nil
	}
	for i := range l.Features {
		f := &l.Features[i]
		a, okA := f.Values[x].Float()
		b, okB := f.Values[y].Float()
		switch {
		case okA && okB:
			f.Geometry = geo.LonLatGeometry{Kind: geo.Points, Parts: [][][]geo.LonLat{{{{Lon: a, Lat: b}}}}}
		case f.Values[x].Kind != geo.Null || f.Values[y].Kind != geo.Null:
			return nil, &FileError{File: in.File, Where: "row " + f.ID, What: fmt.Sprintf("%q, %q is no place", f.Values[x], f.Values[y]), Cure: "Correct the row, or name other columns"}
		}
	}
	return nil, nil
}

// joined makes one column of those that a field is matched to together, as osm_id|osm_way_id: each feature has
// the value of the first that is filled.
func joined(in *Import) *Question {
	fields := make([]string, 0, len(in.Match))
	for f := range in.Match {
		fields = append(fields, f)
	}
	sort.Strings(fields)
	for _, field := range fields {
		name := in.Match[field]
		if !strings.Contains(name, "|") || in.Layer.ColumnIndex(name) >= 0 {
			continue
		}
		var from []int
		own := geo.Column{Name: name}
		for _, col := range strings.Split(name, "|") {
			c := in.Layer.ColumnIndex(strings.TrimSpace(col))
			if c < 0 {
				return &Question{Text: fmt.Sprintf("there is no column %q; the columns are: %s", col, columnNames(in.Layer)), Option: fmt.Sprintf("--match %s=COLUMN|COLUMN", field)}
			}
			from = append(from, c)
			own.Personal = own.Personal || in.Layer.Columns[c].Personal || slices.Contains(in.Personal, in.Layer.Columns[c].Name)
		}
		if own.Personal {
			in.Personal = append(slices.Clone(in.Personal), name)
		}
		in.Layer = cloned(in.Layer)
		in.Layer.Columns = append(in.Layer.Columns, own)
		for i := range in.Layer.Features {
			f := &in.Layer.Features[i]
			v := geo.Value{}
			for _, c := range from {
				if v.Kind == geo.Null || v.Kind == geo.Text && strings.TrimSpace(v.Text) == "" {
					v = f.Values[c]
				}
			}
			f.Values = append(f.Values, v)
		}
	}
	return nil
}

// personal gives the columns that are personal: those the user says, those that are or serve as a personal
// field of the role.
func personal(rec *LayerRecord, in Import, role Role) []string {
	seen := map[string]bool{}
	for _, f := range role.Fields {
		if f.Personal && rec.Match[f.Name] != "" {
			seen[rec.Match[f.Name]] = true
		}
	}
	for _, p := range in.Personal {
		seen[p] = true
	}
	for _, c := range in.Layer.Columns {
		for _, f := range role.Fields {
			if f.Personal && strings.EqualFold(f.Name, c.Name) {
				seen[c.Name] = true
			}
		}
	}
	out := make([]string, 0, len(seen))
	for p := range seen {
		out = append(out, p)
	}
	sort.Strings(out)
	return out
}

// matchFields fills the record's match and units and asks for what is missing.
func matchFields(rec *LayerRecord, in Import, role Role) []Question {
	var qs []Question
	column := func(name string) string {
		for _, c := range in.Layer.Columns {
			if strings.EqualFold(c.Name, name) {
				return c.Name
			}
		}
		return ""
	}
	for _, f := range role.Fields {
		col := in.Match[f.Name]
		if col != "" && column(col) == "" {
			qs = append(qs, Question{Text: fmt.Sprintf("there is no column %q; the columns are: %s", col, columnNames(in.Layer)), Option: fmt.Sprintf("--match %s=COLUMN", f.Name)})
			continue
		}
		if col == "" {
			col = column(f.Name)
		}
		if col == "" {
			for _, syn := range synonyms[f.Name] {
				if c := column(syn); c != "" && mostlyFilled(in.Layer, c) {
					if in.AcceptProposals {
						col = c
					} else if f.Required {
						qs = append(qs, Question{Text: fmt.Sprintf("is column %q the field %s that %s needs?", c, f.Name, role.Title), Option: fmt.Sprintf("--match %s=%s, or --accept-proposals", f.Name, c)})
					}
					break
				}
			}
		}
		if col == "" {
			switch {
			case !f.Required:
			case f.Name == "parcel_id":
				rec.Notices = append(rec.Notices, geo.Notice{Code: "parcels_numbered", Severity: geo.Warning, File: in.Base, Layer: rec.Name})
			case in.AcceptProposals:
				rec.Notices = append(rec.Notices, geo.Notice{Code: "missing_field", Severity: geo.Warning, File: in.Base, Layer: rec.Name, Field: f.Name})
			case len(qs) == 0:
				qs = append(qs, Question{Text: fmt.Sprintf("%s need a field %s (%s); the columns are: %s", role.Title, f.Name, f.Unit, columnNames(in.Layer)), Option: fmt.Sprintf("--match %s=COLUMN", f.Name)})
			}
			continue
		}
		rec.Match[f.Name] = col
		unit := in.Units[col]
		if f.Physical() {
			proposed, why := ProposeUnit(in.Layer, col, f)
			if unit == "" && in.AcceptProposals {
				unit = proposed
			}
			if unit == "" {
				if why != "" {
					why = fmt.Sprintf(" It looks like %s: %s.", proposed, why)
				}
				qs = append(qs, Question{Text: fmt.Sprintf("in which unit is column %q (field %s)?%s", col, f.Name, why), Option: fmt.Sprintf("--unit %s=%s, or --accept-proposals", col, proposed)})
			}
		}
		if unit != "" && f.Physical() {
			if _, err := units.Convert(1, unit, f.Unit); err != nil {
				qs = append(qs, Question{Text: fmt.Sprintf("column %q: %v", col, err), Option: fmt.Sprintf("--unit %s=%s", col, f.Unit)})
			}
			rec.Units[col] = unit
		}
	}
	matched := map[string]bool{}
	for _, c := range rec.Match {
		matched[c] = true
	}
	for c, u := range in.Units {
		switch {
		case column(c) == "":
			qs = append(qs, Question{Text: fmt.Sprintf("there is no column %q; the columns are: %s", c, columnNames(in.Layer)), Option: fmt.Sprintf("--unit COLUMN=%s", u)})
		case !matched[c] && rec.Units[c] == "":
			rec.Units[c] = u // kept with the column, though no field uses it
		}
	}
	sort.Slice(qs, func(i, j int) bool { return qs[i].Option < qs[j].Option })
	return qs
}

// mostlyFilled reports whether at least half of the features have a value in a column; an empty one is
// not worth proposing.
func mostlyFilled(l *geo.Layer, column string) bool {
	c, n := l.ColumnIndex(column), 0
	for _, f := range l.Features {
		if f.Values[c].Kind != geo.Null {
			n++
		}
	}
	return 2*n >= len(l.Features)
}

func columnNames(l *geo.Layer) string {
	names := make([]string, len(l.Columns))
	for i, c := range l.Columns {
		names[i] = c.Name
	}
	if len(names) == 0 {
		return "none"
	}
	return strings.Join(names, ", ")
}

func outOfDegrees(l *geo.Layer) (feature string, bad bool) {
	for _, f := range l.Features {
		f.Geometry.Each(func(p geo.LonLat) {
			if !bad && !(math.Abs(p.Lon) <= 180 && math.Abs(p.Lat) <= 90) {
				feature, bad = f.ID, true
			}
		})
		if bad {
			return feature, true
		}
	}
	return "", false
}

// extent gives the box of the features that the role takes; a stray one of another kind does not count.
func extent(l *geo.Layer, role Role) [4]float64 {
	e := [4]float64{math.Inf(1), math.Inf(1), math.Inf(-1), math.Inf(-1)}
	some := false
	for _, f := range l.Features {
		some = some || (!f.Geometry.Empty() && role.Accepts(f.Geometry.Kind.String()))
	}
	for _, f := range l.Features {
		if some && !role.Accepts(f.Geometry.Kind.String()) {
			continue
		}
		f.Geometry.Each(func(p geo.LonLat) {
			e[0], e[1] = math.Min(e[0], p.Lon), math.Min(e[1], p.Lat)
			e[2], e[3] = math.Max(e[2], p.Lon), math.Max(e[3], p.Lat)
		})
	}
	return e
}

func boxesMeet(a, b [4]float64) bool {
	return a[0] <= b[2] && b[0] <= a[2] && a[1] <= b[3] && b[1] <= a[3]
}

// meets compares the layer's place with that of the layers that are there. A layer that would meet
// them only with swapped axes is asked about; one that does not meet them at all gets a notice.
func meets(rec *LayerRecord, in Import, snap *Snapshot) *Question {
	var all [4]float64
	n := 0
	for _, l := range snap.Layers {
		if l.Kind == "table" || l.Kind == "raster" || l.Name == rec.Name {
			continue
		}
		if n == 0 {
			all = l.Extent
		} else {
			all = [4]float64{math.Min(all[0], l.Extent[0]), math.Min(all[1], l.Extent[1]), math.Max(all[2], l.Extent[2]), math.Max(all[3], l.Extent[3])}
		}
		n++
	}
	for i, d := range []float64{-nearDeg, -nearDeg, nearDeg, nearDeg} {
		all[i] += d
	}
	if n == 0 || boxesMeet(all, rec.Extent) {
		return nil
	}
	swapped := [4]float64{rec.Extent[1], rec.Extent[0], rec.Extent[3], rec.Extent[2]}
	if !in.SwapAxes && boxesMeet(all, swapped) {
		return &Question{Text: "the layer lies far from the others, but would meet them with latitude and longitude swapped", Option: "--swap-axes"}
	}
	rec.Notices = append(rec.Notices, geo.Notice{Code: "layer_apart", Severity: geo.Warning, File: in.Base, Layer: rec.Name, Args: map[string]string{
		"west": deg(rec.Extent[0]), "south": deg(rec.Extent[1]), "east": deg(rec.Extent[2]), "north": deg(rec.Extent[3])}})
	return nil
}

// nearDeg is how far a layer may lie from the others without a word: about 5 km.
const nearDeg = 0.05

func deg(x float64) string { return strconv.FormatFloat(x, 'f', 4, 64) }

// checkFeatures drops features that cannot serve (each with a notice), repairs polygons, finds
// duplicates and missing values, and gives parcels their identifiers.
func (s *Study) checkFeatures(ctx context.Context, rec *LayerRecord, in Import, role Role, layer *geo.Layer, centre geo.LonLat, tools Tools) error {
	forward, inverse, err := tools.Frame(centre)
	if err != nil {
		return fmt.Errorf("%s: %w", in.File, err)
	}
	note := func(n geo.Notice) {
		n.File, n.Layer = in.Base, rec.Name
		rec.Notices = append(rec.Notices, n)
	}
	idColumn := -1
	if role.Name == "parcels" && rec.Match["parcel_id"] != "" {
		idColumn = layer.ColumnIndex(rec.Match["parcel_id"])
	}
	required := map[string]int{}
	for _, f := range role.Fields {
		if f.Required && rec.Match[f.Name] != "" {
			required[f.Name] = layer.ColumnIndex(rec.Match[f.Name])
		}
	}
	fieldNames := make([]string, 0, len(required))
	for n := range required {
		fieldNames = append(fieldNames, n)
	}
	sort.Strings(fieldNames)

	seenShape := make(map[shapeSum]string, len(layer.Features))
	seenID := make(map[string]int, len(layer.Features))
	kinds := map[string]int{}
	kept := layer.Features[:0] // the list is this layer's own
	var flats []geo.XYGeometry // of parcels
	ready, err := readied(ctx, in, layer, role, forward, tools)
	if err != nil {
		return err
	}
	for i, f := range layer.Features {
		if err := ctx.Err(); err != nil {
			return err
		}
		if idColumn >= 0 && f.Values[idColumn].Kind != geo.Null {
			f.ID = f.Values[idColumn].String()
		}
		if f.Geometry.Empty() {
			rec.Ledger.LeftOut++
			note(geo.Notice{Code: "no_geometry", Severity: geo.Warning, Feature: f.ID})
			continue
		}
		if !role.Accepts(f.Geometry.Kind.String()) {
			rec.Ledger.LeftOut++
			note(geo.Notice{Code: "wrong_geometry", Severity: geo.Warning, Feature: f.ID, Args: map[string]string{"kind": f.Geometry.Kind.String(), "wanted": strings.Join(role.Geometry, " or ")}})
			continue
		}
		at := anyPosition(f.Geometry)
		flat, shape := ready[i].Geometry, ready[i].shape
		if f.Geometry.Kind == geo.Polygons {
			r := ready[i]
			if r.Err != nil || flat.Empty() {
				rec.Ledger.LeftOut++
				args := map[string]string{}
				if r.Err != nil {
					args["error"] = r.Err.Error()
				}
				note(geo.Notice{Code: "not_repairable", Severity: geo.Fault, Feature: f.ID, At: &at, Args: args})
				continue
			}
			if r.Changed {
				if f.Geometry, err = inverse(flat); err != nil {
					return &FileError{File: in.File, Where: "feature " + f.ID, What: err.Error()}
				}
				shape = shapeSumOf(f.Geometry)
				rec.Ledger.Repaired++
				code, args := repairWords("repaired", r.Repaired)
				note(geo.Notice{Code: code, Severity: geo.Warning, Feature: f.ID, At: &at, Args: args})
			}
		}
		// A resource point stands once per sector, so equal places are no mistake there.
		if role.Name != "wind_resource" && role.Name != "solar_resource" {
			if earlier, dup := seenShape[shape]; dup {
				rec.Ledger.LeftOut++
				note(geo.Notice{Code: "duplicate", Severity: geo.Warning, Feature: f.ID, At: &at, Args: map[string]string{"of": earlier}})
				continue
			}
			seenShape[shape] = f.ID
		}
		if old := f.ID; seenID[old] > 0 {
			for seenID[f.ID] > 0 { // the name made here may be another feature's own
				seenID[old]++
				f.ID = fmt.Sprintf("%s (%d)", old, seenID[old])
			}
			note(geo.Notice{Code: "same_identifier", Severity: geo.Warning, Feature: old, At: &at, Args: map[string]string{"now": f.ID}})
		}
		seenID[f.ID] = 1
		for _, name := range fieldNames {
			if v := f.Values[required[name]]; v.Kind == geo.Null || (v.Kind == geo.Text && strings.TrimSpace(v.Text) == "") {
				note(geo.Notice{Code: "missing_value", Severity: geo.Warning, Feature: f.ID, Field: name, At: &at})
			}
		}
		kinds[f.Geometry.Kind.String()]++
		kept = append(kept, f)
		if role.Name == "parcels" {
			flats = append(flats, flat)
		}
	}
	clear(layer.Features[len(kept):])
	layer.Features = kept
	for _, n := range unfit(rec, role, layer) {
		note(n)
	}
	if len(flats) > 0 {
		size := func(g geo.XYGeometry) (float64, float64) { return measure.AreaM2(g), measure.LengthM(g) }
		if err := parcelChecks(rec, layer, flats, size, tools, note); err != nil {
			return err
		}
	}
	if len(kept) == 0 {
		return &FileError{File: in.File, What: fmt.Sprintf("no feature of the file can serve as %s: %d were read, all were left out", role.Name, rec.Ledger.Read), Cure: fmt.Sprintf("The role takes %s: check that this is the right file, and that its outlines enclose ground", strings.Join(role.Geometry, " or "))}
	}
	for _, k := range []string{"polygon", "line", "point"} {
		if kinds[k] > kinds[rec.Kind] {
			rec.Kind = k
		}
	}
	return nil
}

// unfit looks through the values of matched columns for those that a field cannot have: one notice for a field,
// with the first of them.
func unfit(rec *LayerRecord, role Role, layer *geo.Layer) []geo.Notice {
	var out []geo.Notice
	for _, field := range role.Fields {
		column := layer.ColumnIndex(rec.Match[field.Name])
		if rec.Match[field.Name] == "" || column < 0 {
			continue
		}
		good := map[string]bool{} // classes repeat
		n := geo.Notice{Code: "value_unfit", Severity: geo.Warning, Field: field.Name}
		count := 0
		for _, f := range layer.Features {
			v := f.Values[column]
			text := v.String()
			if v.Kind == geo.Null || good[text] || strings.TrimSpace(text) == "" {
				continue
			}
			err := field.fits(v, rec.Units[rec.Match[field.Name]])
			if err == nil {
				if v.Kind == geo.Text && len(good) < 1000 {
					good[text] = true
				}
				continue
			}
			if count++; count == 1 {
				n.Feature = f.ID
				n.Args = map[string]string{"column": rec.Match[field.Name], "error": err.Error()}
				if layer.Columns[column].Personal {
					n.Args["error"] = "a value that is personal and not shown"
				}
				if !f.Geometry.Empty() {
					at := anyPosition(f.Geometry)
					n.At = &at
				}
			}
		}
		if count > 0 {
			n.Args["count"] = strconv.Itoa(count)
			out = append(out, n)
		}
	}
	return out
}

// repairWords gives code and words of a repair. Rings that cross themselves may enclose as much one way round as
// the other; their area before tells nothing then, and is not given.
func repairWords(code string, r Repaired) (string, map[string]string) {
	after := map[string]string{"area_after_ha": hectares(r.AfterM2)}
	if r.BeforeM2 < 0.01*r.AfterM2 {
		return code + "_crossed", after
	}
	after["area_before_ha"] = hectares(r.BeforeM2)
	return code, after
}

// ready is a feature with what can be found out of it by itself.
type ready struct {
	Repaired          // of polygons
	shape    shapeSum // of the geometry as delivered
}

// readied projects and repairs the features that the role takes, and digests their shapes, on all cores.
func readied(ctx context.Context, in Import, layer *geo.Layer, role Role, forward func(geo.LonLatGeometry) (geo.XYGeometry, error), tools Tools) ([]ready, error) {
	out := make([]ready, len(layer.Features))
	faults := make([]error, len(out))
	var next atomic.Int64
	var wg sync.WaitGroup
	const block = 256
	for range runtime.GOMAXPROCS(0) {
		wg.Go(func() {
			for ctx.Err() == nil {
				from := int(next.Add(block)) - block
				if from >= len(out) {
					return
				}
				for i := from; i < min(from+block, len(out)); i++ {
					f := &layer.Features[i]
					if f.Geometry.Empty() || !role.Accepts(f.Geometry.Kind.String()) {
						continue
					}
					out[i].shape = shapeSumOf(f.Geometry)
					if f.Geometry.Kind == geo.Polygons {
						out[i].Geometry, faults[i] = forward(f.Geometry)
					}
				}
			}
		})
	}
	wg.Wait()
	if err := ctx.Err(); err != nil {
		return nil, err
	}
	var at []int
	var flat []geo.XYGeometry
	for i := range out {
		if faults[i] != nil {
			return nil, &FileError{File: in.File, Where: "feature " + layer.Features[i].ID, What: faults[i].Error()}
		}
		if !out[i].Geometry.Empty() {
			at, flat = append(at, i), append(flat, out[i].Geometry)
		}
	}
	repaired, err := tools.Repair(ctx, flat)
	if err != nil {
		return nil, err
	}
	for n, i := range at {
		out[i].Repaired = repaired[n]
	}
	return out, nil
}

// shapeSum tells equal geometries.
type shapeSum [sha256.Size]byte

func shapeSumOf(g geo.LonLatGeometry) shapeSum {
	d := NewDigester()
	d.lonLats(g)
	return d.Raw()
}

// shapeDigest is what a geometry is remembered by.
func shapeDigest(g geo.LonLatGeometry) string {
	return LayerDigest(&geo.Layer{Features: []geo.Feature{{Geometry: g}}})
}

func anyPosition(g geo.LonLatGeometry) geo.LonLat {
	for _, part := range g.Parts {
		for _, ring := range part {
			if len(ring) > 0 {
				return ring[0]
			}
		}
	}
	return geo.LonLat{}
}
