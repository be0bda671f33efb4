package files

import (
	"context"
	"errors"
	"reflect"
	"strings"
	"testing"

	"groundtally/app/study"
	"groundtally/geo"
)

func (b *bench) content(name string) (study.LayerRecord, *geo.Layer) {
	b.t.Helper()
	snap, err := b.s.Snapshot()
	if err != nil {
		b.t.Fatal(err)
	}
	for _, l := range snap.Layers {
		if l.Name == name {
			v, _, err := b.s.Store().Version(context.Background(), l.Digest)
			if err != nil {
				b.t.Fatal(err)
			}
			return l, v.Layer
		}
	}
	b.t.Fatalf("there is no layer %s", name)
	return study.LayerRecord{}, nil
}

func (b *bench) byHand(layer, role string, edits ...study.HandEdit) error {
	b.t.Helper()
	tools, done := NewTools()
	defer done()
	_, err := b.s.EditByHand(context.Background(), layer, role, tools, edits...)
	return err
}

func point(lon, lat float64) *geo.LonLatGeometry {
	return &geo.LonLatGeometry{Kind: geo.Points, Parts: [][][]geo.LonLat{{{{Lon: lon, Lat: lat}}}}}
}

func field(rec study.LayerRecord, l *geo.Layer, id, name string) string {
	for _, f := range l.Features {
		if c := l.ColumnIndex(rec.Match[name]); f.ID == id && c >= 0 {
			return f.Values[c].String()
		}
	}
	return "no such feature"
}

// What people add to an edition is there in the next one: consents, changes by hand with their reasons; and
// what changed is listed, by identifier and then by overlap.
func TestANewEdition(t *testing.T) {
	b := newBench(t)
	if _, err := b.add("p1.geojson", "parcels", "", func(in *study.Import) { in.Name = "land" },
		box(9, 48, 9.002, 48.002)+`|{"parcel_id":"A","owner_consent":"yes","use_class":"field"}`,
		box(9.002, 48, 9.004, 48.002)+`|{"parcel_id":"B","owner_consent":"no","use_class":"field"}`,
		box(9.004, 48, 9.006, 48.002)+`|{"parcel_id":"C","use_class":"field"}`,
		box(9.006, 48, 9.008, 48.002)+`|{"parcel_id":"D","use_class":"wood"}`); err != nil {
		t.Fatal(err)
	}
	if err := b.byHand("land", "", study.HandEdit{Verb: study.HandSet, Feature: "C", Values: map[string]string{"use_class": "orchard"}, Reason: "seen on site"},
		study.HandEdit{Verb: study.HandSet, Feature: "D", Values: map[string]string{"use_class": "clearing"}, Reason: "felled"}); err != nil {
		t.Fatal(err)
	}
	rec, err := b.add("p2.geojson", "parcels", "", func(in *study.Import) { in.Replace = "land" },
		box(9, 48, 9.002, 48.0021)+`|{"parcel_id":"A","use_class":"meadow"}`,    // moved and altered
		box(9.002, 48, 9.004, 48.002)+`|{"parcel_id":"B2","use_class":"field"}`, // renamed
		box(9.004, 48, 9.006, 48.002)+`|{"parcel_id":"C","use_class":"field"}`,
		box(9.02, 48, 9.022, 48.002)+`|{"parcel_id":"E","use_class":"field"}`)
	if err != nil {
		t.Fatal(err)
	}
	want := &study.Changes{Added: []string{"E"}, Removed: []string{"D"}, Moved: []string{"A"}, Altered: []string{"A", "C"}, Renamed: map[string]string{"B": "B2"}, Same: 0}
	if !reflect.DeepEqual(rec.Changes, want) {
		t.Errorf("changes %+v, want %+v", rec.Changes, want)
	}
	now, l := b.content("land")
	for id, consent := range map[string]string{"A": "yes", "B2": "no", "C": "", "E": ""} {
		if got := field(now, l, id, "owner_consent"); got != consent {
			t.Errorf("consent of %s: %q, want %q", id, got, consent)
		}
	}
	if got := field(now, l, "C", "use_class"); got != "orchard" {
		t.Errorf("use of C: %q, want what was set by hand", got)
	}
	if got := codes(rec.Notices); !strings.Contains(got, "consents_kept") || !strings.Contains(got, "hand_edit_lost D") {
		t.Errorf("notices %s", got)
	}
	if len(now.Hand) != 1 || now.Hand[0].Reason != "seen on site" {
		t.Errorf("kept by hand: %+v", now.Hand)
	}
	if _, err := b.s.Undo(context.Background()); err != nil {
		t.Fatal(err)
	}
	if old, l := b.content("land"); len(l.Features) != 4 || len(old.Hand) != 2 {
		t.Errorf("after undo: %d features, %d changes by hand", len(l.Features), len(old.Hand))
	}
}

func TestChangesByHand(t *testing.T) {
	b := newBench(t)
	ctx := context.Background()
	place := study.HandEdit{Verb: study.HandAdd, Geometry: point(9.001, 48.001), Values: map[string]string{"class": "farm"}, Reason: "new house"}
	if err := b.byHand("houses", "dwellings", place); !errors.Is(err, study.ErrNotThere) {
		t.Errorf("without parcels there is no place: %v", err)
	}
	if _, err := b.add("p.geojson", "parcels", "", nil, box(9, 48, 9.002, 48.002)+`|{"parcel_id":"A"}`); err != nil {
		t.Fatal(err)
	}
	none := place
	none.Reason = " "
	if err := b.byHand("houses", "dwellings", none); !errors.Is(err, study.ErrReasonNeeded) {
		t.Errorf("without a reason: %v", err)
	}
	if err := b.byHand("houses", "", place); !errors.Is(err, study.ErrNotThere) {
		t.Errorf("without a role for a new layer: %v", err)
	}
	if err := b.byHand("houses", "dwellings", place); err != nil {
		t.Fatal(err)
	}
	rec, l := b.content("houses")
	if rec.Kind != "point" || rec.Count != 1 || field(rec, l, "hand-1", "class") != "farm" {
		t.Errorf("%+v", rec)
	}
	for _, e := range []study.HandEdit{
		{Verb: study.HandMove, Feature: "hand-1", Geometry: point(9.0015, 48.001), Reason: "measured"},
		{Verb: study.HandSet, Feature: "hand-1", Values: map[string]string{"class": "not lived in"}, Reason: "barn"},
	} {
		if err := b.byHand("houses", "", e); err != nil {
			t.Fatal(err)
		}
	}
	rec, l = b.content("houses")
	if got := l.Features[0].Geometry.Parts[0][0][0].Lon; got != 9.0015 || field(rec, l, "hand-1", "class") != "not lived in" || len(rec.Hand) != 3 {
		t.Errorf("at %v, %+v", got, rec.Hand)
	}
	line := &geo.LonLatGeometry{Kind: geo.Lines, Parts: [][][]geo.LonLat{{{{Lon: 9, Lat: 48}, {Lon: 9.1, Lat: 48}}}}}
	for what, e := range map[string]study.HandEdit{
		"a line as a dwelling":  {Verb: study.HandAdd, Geometry: line, Reason: "r"},
		"a field of no role":    {Verb: study.HandSet, Feature: "hand-1", Values: map[string]string{"colour": "red"}, Reason: "r"},
		"nobody":                {Verb: study.HandMove, Feature: "x", Geometry: point(9, 48), Reason: "r"},
		"the last one":          {Verb: study.HandRemove, Feature: "hand-1", Reason: "r"},
		"a place far away":      {Verb: study.HandAdd, Geometry: point(50, 48), Reason: "r"},
		"values of what goes":   {Verb: study.HandRemove, Feature: "hand-1", Values: map[string]string{"class": "farm"}, Reason: "r"},
		"a name that is in use": {Verb: study.HandAdd, Feature: "hand-1", Geometry: point(9, 48), Reason: "r"},
	} {
		before, _ := b.content("houses")
		if err := b.byHand("houses", "", e); err == nil {
			t.Errorf("%s was taken", what)
		}
		if after, _ := b.content("houses"); after.Digest != before.Digest {
			t.Errorf("%s changed the layer", what)
		}
	}
	// A polygon that crosses itself is made valid.
	tie := &geo.LonLatGeometry{Kind: geo.Polygons, Parts: [][][]geo.LonLat{{{{Lon: 9, Lat: 48}, {Lon: 9.002, Lat: 48.002}, {Lon: 9.002, Lat: 48}, {Lon: 9, Lat: 48.002}, {Lon: 9, Lat: 48}}}}}
	if err := b.byHand("no go", "exclusion", study.HandEdit{Verb: study.HandAdd, Geometry: tie, Values: map[string]string{"reason": "test"}, Reason: "r"}); err != nil {
		t.Fatal(err)
	}
	rec, l = b.content("no go")
	if len(l.Features[0].Geometry.Parts) != 2 {
		t.Errorf("%d parts, want the two triangles", len(l.Features[0].Geometry.Parts))
	}
	if len(rec.Notices) != 1 || rec.Notices[0].Code != "drawn_repaired_crossed" || rec.Notices[0].Args["area_after_ha"] == "0.0000" {
		t.Errorf("the repair is told as %+v", rec.Notices)
	}
	// Moved to a place where it is valid, it is no longer said to be repaired.
	whole := &geo.LonLatGeometry{Kind: geo.Polygons, Parts: [][][]geo.LonLat{{{{Lon: 9, Lat: 48}, {Lon: 9.002, Lat: 48}, {Lon: 9.002, Lat: 48.002}, {Lon: 9, Lat: 48}}}}}
	if err := b.byHand("no go", "", study.HandEdit{Verb: study.HandMove, Feature: "hand-1", Geometry: whole, Reason: "r"}); err != nil {
		t.Fatal(err)
	}
	if rec, _ := b.content("no go"); len(rec.Notices) != 0 {
		t.Errorf("after the move: %+v", rec.Notices)
	}
	if entries, err := b.s.Undo(ctx); err != nil {
		t.Error(entries, err)
	}
}

func TestColumnsTogether(t *testing.T) {
	b := newBench(t)
	rec, err := b.add("p.geojson", "parcels", "", func(in *study.Import) { in.Match = map[string]string{"parcel_id": "osm_id|way_id"} },
		box(9, 48, 9.002, 48.002)+`|{"osm_id":"1"}`, box(9.002, 48, 9.004, 48.002)+`|{"way_id":"7"}`, box(9.004, 48, 9.006, 48.002)+`|{"osm_id":"2","way_id":"9"}`)
	if err != nil {
		t.Fatal(err)
	}
	_, l := b.content(rec.Name)
	if l.Features[0].ID != "1" || l.Features[1].ID != "7" || l.Features[2].ID != "2" || strings.Contains(codes(rec.Notices), "missing_value") {
		t.Errorf("%s %s %s; %s", l.Features[0].ID, l.Features[1].ID, l.Features[2].ID, codes(rec.Notices))
	}
	if _, err := b.add("q.geojson", "parcels", "", func(in *study.Import) { in.Match = map[string]string{"parcel_id": "osm_id|nothing"} }, box(9, 48, 9.002, 48.002)+`|{"osm_id":"1"}`); err == nil {
		t.Error("a column that is not there")
	}
}

// The formats that hold several layers, and rows that are points.
func TestRowsThatArePoints(t *testing.T) {
	b := newBench(t)
	path := put(t, b.dir, "views.csv", "name,lon,lat\nhill,9.001,48.001\nnowhere,,\n")
	in, err := Import(context.Background(), path, study.ReadOptions{})
	if err != nil || len(in.Places) != 1 || in.Places[0].X != "lon" || !in.Places[0].Degrees {
		t.Fatalf("%v: %+v", err, in.Places)
	}
	in.Role = "viewpoints"
	tools, done := NewTools()
	defer done()
	var q *study.QuestionError
	if _, err := b.s.AddLayer(context.Background(), in, tools); !errors.As(err, &q) || !strings.Contains(err.Error(), "--at lon,lat") {
		t.Errorf("error %v", err)
	}
	in.At = &study.Place{X: "lon", Y: "lat"}
	rec, err := b.s.AddLayer(context.Background(), in, tools)
	if err != nil || rec.Count != 1 || rec.Ledger.LeftOut != 1 || !strings.Contains(codes(rec.Notices), "no_geometry") {
		t.Errorf("%v: %+v, %s", err, rec.Ledger, codes(rec.Notices))
	}
	in.At = &study.Place{X: "name", Y: "lat"}
	in.Name = "other"
	var fe *study.FileError
	if _, err := b.s.AddLayer(context.Background(), in, tools); !errors.As(err, &fe) {
		t.Errorf("a name as a place: %v", err)
	}
}

// A feature without an identifier of its own is found again by its place: its row may be another's.
func TestHandEditsFollowThePlace(t *testing.T) {
	b := newBench(t)
	if _, err := b.add("p.geojson", "parcels", "", nil, box(9, 48, 9.002, 48.002)+`|{"parcel_id":"A"}`); err != nil {
		t.Fatal(err)
	}
	house := func(lon string) string {
		return `{"type":"Point","coordinates":[` + lon + `,48.001]}|{"class":"house"}`
	}
	if _, err := b.add("d1.geojson", "dwellings", "", func(in *study.Import) { in.Name = "houses" }, house("9.0001"), house("9.0002"), house("9.0003")); err != nil {
		t.Fatal(err)
	}
	if err := b.byHand("houses", "", study.HandEdit{Verb: study.HandRemove, Feature: "1", Reason: "ruin"},
		study.HandEdit{Verb: study.HandSet, Feature: "3", Values: map[string]string{"class": "farm"}, Reason: "seen"}); err != nil {
		t.Fatal(err)
	}
	rec, err := b.add("d2.geojson", "dwellings", "", func(in *study.Import) { in.Replace = "houses" }, house("9.0002"), house("9.0003"), house("9.0009"))
	if err != nil {
		t.Fatal(err)
	}
	now, l := b.content("houses")
	if len(l.Features) != 3 || field(now, l, "1", "class") != "house" || field(now, l, "2", "class") != "farm" || field(now, l, "3", "class") != "house" {
		t.Errorf("%d features: %s, %s, %s", len(l.Features), field(now, l, "1", "class"), field(now, l, "2", "class"), field(now, l, "3", "class"))
	}
	if got := codes(rec.Notices); strings.Count(got, "hand_edit_lost") != 1 {
		t.Errorf("notices %s", got)
	}
}
