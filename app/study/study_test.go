package study_test

import (
	"context"
	"errors"
	"os"
	"testing"
	"time"

	"groundtally/app/study"
	"groundtally/app/study/studytest"
	"groundtally/geo"
)

func open(t *testing.T) *study.Study {
	t.Helper()
	cat, err := study.LoadCatalog(os.DirFS("../../assets"))
	if err != nil {
		t.Fatal(err)
	}
	s, err := study.Open(context.Background(), studytest.New(), cat, study.Options{Who: "tester", Clock: func() time.Time { return time.Unix(0, 0) }})
	if err != nil {
		t.Fatal(err)
	}
	return s
}

func set(t *testing.T, s *study.Study, key, value string) {
	t.Helper()
	if _, err := s.Set(context.Background(), "set", "", study.SettingEdit{Key: key, Value: value}); err != nil {
		t.Fatal(err)
	}
}

func value(t *testing.T, s *study.Study, key string) string {
	t.Helper()
	n, err := s.Snapshot()
	if err != nil {
		t.Fatal(err)
	}
	v, _, _ := n.Lookup(key)
	return v.Value
}

func TestUndoAndRedo(t *testing.T) {
	ctx := context.Background()
	s := open(t)
	set(t, s, "run.seed", "2")
	set(t, s, "run.seed", "3")
	for _, want := range []string{"2", "1"} {
		if _, err := s.Undo(ctx); err != nil {
			t.Fatal(err)
		}
		if got := value(t, s, "run.seed"); got != want {
			t.Fatalf("after undo the seed is %s, want %s", got, want)
		}
	}
	if _, err := s.Undo(ctx); !errors.Is(err, study.ErrNothingToDo) {
		t.Fatalf("undo of nothing: %v", err)
	}
	if _, err := s.Redo(ctx); err != nil {
		t.Fatal(err)
	}
	if got := value(t, s, "run.seed"); got != "2" {
		t.Fatalf("after redo the seed is %s, want 2", got)
	}
	set(t, s, "run.trials", "50") // a new edit: what was taken back cannot come back
	if _, err := s.Redo(ctx); !errors.Is(err, study.ErrNothingToDo) {
		t.Fatalf("redo after a new edit: %v", err)
	}
	if n := len(s.Journal()); n != 6 {
		t.Fatalf("the journal has %d entries, want all 6", n)
	}
}

func TestSettingsAreChecked(t *testing.T) {
	ctx := context.Background()
	s := open(t)
	var key *study.UnknownKeyError
	if _, err := s.Set(ctx, "set", "", study.SettingEdit{Key: "run.sed", Value: "2"}); !errors.As(err, &key) || key.Nearest != "run.seed" {
		t.Errorf("unknown key: %v", err)
	}
	var val *study.ValueError
	for k, v := range map[string]string{"run.seed": "many", "plant.a.fit": "squeeze", "rule.exclude.habitat": "perhaps", "run.trials": "NaN"} {
		if _, err := s.Set(ctx, "set", "", study.SettingEdit{Key: k, Value: v}); !errors.As(err, &val) {
			t.Errorf("%s=%s was accepted: %v", k, v, err)
		}
	}
	if len(s.Journal()) != 0 {
		t.Error("a refused edit stands in the journal")
	}
	if got := value(t, s, "rule.setback.dwellings.wind_m"); got != study.NotSetText {
		t.Errorf("a legal distance nobody entered is %q, want not set", got)
	}
}

func TestDefinitionsAreFound(t *testing.T) {
	s := open(t)
	for key, pattern := range map[string]string{
		"rule.setback.dwellings.wind_large_m":     "rule.setback.dwellings.<plant>_m",
		"rule.setback.water.solar_fixed_m":        "rule.setback.<role>.<plant>_m",
		"rule.setback.roads.wind_tip":             "rule.setback.roads.wind_tip",
		"rule.exclude.habitat.class":              "rule.exclude.<role>.class",
		"voice.network operator.weight.noise_dba": "voice.<voice>.weight.<key>",
		"inventory.wind_turbine-mj.central":       "inventory.<row>.central",
	} {
		d, ok := s.Catalog().Definition(key)
		if !ok || d.Key != pattern {
			t.Errorf("%s: found %q, want %q", key, d.Key, pattern)
		}
	}
	if _, ok := s.Catalog().Definition("plant..title"); ok {
		t.Error("an empty name was accepted")
	}
}

func TestFreezeKeepsTheState(t *testing.T) {
	ctx := context.Background()
	s := open(t)
	set(t, s, "run.seed", "7")
	if _, err := s.Freeze(ctx, "as shown on 3 May", "abc"); err != nil {
		t.Fatal(err)
	}
	set(t, s, "run.seed", "8")
	n, err := study.NewSnapshot(s.Catalog(), s.FrozenStates()[0].Records)
	if err != nil {
		t.Fatal(err)
	}
	if v, _, _ := n.Lookup("run.seed"); v.Value != "7" {
		t.Errorf("the frozen seed is %s, want 7", v.Value)
	}
	if _, err := s.Freeze(ctx, "as shown on 3 May", ""); !errors.Is(err, study.ErrNameInUse) {
		t.Errorf("the same name twice: %v", err)
	}
}

// plain tools: no library, every polygon is taken as valid.
type plain struct{}

func (plain) Overlaps([]geo.XYGeometry, float64) ([]study.Overlap, error) { return nil, nil }

func (plain) Operation(string, geo.LonLat) (study.Operation, error) {
	return study.Operation{Known: true}, nil
}

func (plain) ToLonLat(code string) (func(geo.LonLat) (geo.LonLat, error), string, error) {
	if code != "OGC:CRS84" {
		return nil, "", errors.New("no such system")
	}
	return func(p geo.LonLat) (geo.LonLat, error) { return p, nil }, "none", nil
}

func (plain) Frame(geo.LonLat) (func(geo.LonLatGeometry) (geo.XYGeometry, error), func(geo.XYGeometry) (geo.LonLatGeometry, error), error) {
	return func(g geo.LonLatGeometry) (geo.XYGeometry, error) {
			return geo.Map(g, func(p geo.LonLat) geo.XY { return geo.XY{X: p.Lon, Y: p.Lat} }), nil
		}, func(g geo.XYGeometry) (geo.LonLatGeometry, error) {
			return geo.Map(g, func(p geo.XY) geo.LonLat { return geo.LonLat{Lon: p.X, Lat: p.Y} }), nil
		}, nil
}

func (plain) Repair(_ context.Context, gs []geo.XYGeometry) ([]study.Repaired, error) {
	out := make([]study.Repaired, len(gs))
	for i, g := range gs {
		out[i].Geometry = g
	}
	return out, nil
}

func square(x, y, side float64) geo.LonLatGeometry {
	return geo.LonLatGeometry{Kind: geo.Polygons, Parts: [][][]geo.LonLat{{{{Lon: x, Lat: y}, {Lon: x + side, Lat: y}, {Lon: x + side, Lat: y + side}, {Lon: x, Lat: y + side}, {Lon: x, Lat: y}}}}}
}

func parcels(columns []geo.Column, fs ...geo.Feature) study.Import {
	return study.Import{File: "p.geojson", Base: "p.geojson", Role: "parcels", Layer: &geo.Layer{Columns: columns, Features: fs}, Ledger: study.Ledger{Read: len(fs)}}
}

func TestAddAsksWhatOnlyTheUserKnows(t *testing.T) {
	ctx := context.Background()
	s := open(t)
	f := geo.Feature{ID: "1", Geometry: square(27, 47, 0.01), Values: []geo.Value{geo.TextValue("A")}}
	in := parcels([]geo.Column{{Name: "flurstueck"}}, f)
	var q *study.QuestionError
	if _, err := s.AddLayer(ctx, in, plain{}); !errors.As(err, &q) || q.Questions[0].Option != "--match parcel_id=flurstueck, or --accept-proposals" {
		t.Fatalf("a foreign column name: %v", err)
	}
	in.Match = map[string]string{"parcel_id": "flurstueck"}
	rec, err := s.AddLayer(ctx, in, plain{})
	if err != nil || rec.Count != 1 {
		t.Fatalf("answered: %+v, %v", rec, err)
	}
	far := parcels([]geo.Column{{Name: "parcel_id"}}, geo.Feature{ID: "1", Geometry: square(47, 27, 0.01), Values: []geo.Value{geo.TextValue("B")}})
	far.Name = "swapped"
	if _, err := s.AddLayer(ctx, far, plain{}); !errors.As(err, &q) || q.Questions[0].Option != "--swap-axes" {
		t.Fatalf("swapped coordinates: %v", err)
	}
	far.SwapAxes = true
	if _, err := s.AddLayer(ctx, far, plain{}); err != nil {
		t.Fatal(err)
	}
	metres := parcels([]geo.Column{{Name: "parcel_id"}}, geo.Feature{ID: "1", Geometry: square(500000, 5300000, 100), Values: []geo.Value{geo.TextValue("C")}})
	metres.Name = "metres"
	if _, err := s.AddLayer(ctx, metres, plain{}); !errors.As(err, &q) {
		t.Fatalf("metres without a system: %v", err)
	}
}

func TestAddLeavesNothingOutInSilence(t *testing.T) {
	ctx := context.Background()
	s := open(t)
	col := []geo.Column{{Name: "parcel_id"}, {Name: "owner"}}
	v := func(id string) []geo.Value { return []geo.Value{geo.TextValue(id), geo.TextValue("somebody")} }
	in := parcels(col,
		geo.Feature{ID: "1", Geometry: square(27, 47, 0.01), Values: v("A")},
		geo.Feature{ID: "2", Geometry: square(27, 47, 0.01), Values: v("B")},    // the same outline
		geo.Feature{ID: "3", Geometry: square(27.02, 47, 0.01), Values: v("A")}, // the same identifier
		geo.Feature{ID: "4", Geometry: geo.LonLatGeometry{}, Values: v("D")},    // no place
		geo.Feature{ID: "5", Geometry: geo.LonLatGeometry{Kind: geo.Points, Parts: [][][]geo.LonLat{{{{Lon: 27, Lat: 47}}}}}, Values: v("E")},
		geo.Feature{ID: "6", Geometry: square(27.04, 47, 0.01), Values: []geo.Value{{}, {}}}, // no identifier
	)
	rec, err := s.AddLayer(ctx, in, plain{})
	if err != nil {
		t.Fatal(err)
	}
	got := map[string]int{}
	for _, n := range rec.Notices {
		got[n.Code]++
	}
	for code, want := range map[string]int{"duplicate": 1, "same_identifier": 1, "no_geometry": 1, "wrong_geometry": 1, "missing_value": 1} {
		if got[code] != want {
			t.Errorf("%d notices %s, want %d", got[code], code, want)
		}
	}
	if rec.Ledger.LeftOut != 3 || rec.Count != 3 {
		t.Errorf("left out %d and kept %d, want 3 and 3", rec.Ledger.LeftOut, rec.Count)
	}
	if len(rec.Personal) != 1 || rec.Personal[0] != "owner" {
		t.Errorf("personal columns %v, want owner", rec.Personal)
	}
}

func TestNoTwoFeaturesShareAnIdentifier(t *testing.T) {
	s := open(t)
	var list []geo.Feature
	for i, id := range []string{"A", "A (2)", "A", "A", "A (3)"} {
		list = append(list, geo.Feature{ID: id, Geometry: square(27+float64(i)/50, 47, 0.01), Values: []geo.Value{geo.TextValue(id)}})
	}
	rec, err := s.AddLayer(context.Background(), parcels([]geo.Column{{Name: "parcel_id"}}, list...), plain{})
	if err != nil {
		t.Fatal(err)
	}
	v, _, err := s.Store().Version(context.Background(), rec.Digest)
	if err != nil {
		t.Fatal(err)
	}
	seen := map[string]bool{}
	for _, f := range v.Layer.Features {
		if seen[f.ID] {
			t.Errorf("two features are called %q", f.ID)
		}
		seen[f.ID] = true
	}
	if !seen["A"] || !seen["A (2)"] || len(seen) != 5 {
		t.Errorf("the features are called %v; the first of a name keeps it", seen)
	}
}

func TestAddIsStopped(t *testing.T) {
	s := open(t)
	ctx, stop := context.WithCancel(context.Background())
	tools := stopping{stop: stop}
	in := parcels([]geo.Column{{Name: "parcel_id"}},
		geo.Feature{ID: "1", Geometry: square(27, 47, 0.01), Values: []geo.Value{geo.TextValue("A")}},
		geo.Feature{ID: "2", Geometry: square(27.02, 47, 0.01), Values: []geo.Value{geo.TextValue("B")}})
	if _, err := s.AddLayer(ctx, in, &tools); !errors.Is(err, context.Canceled) {
		t.Fatalf("got %v, want a stop", err)
	}
	if tools.repairs != 1 {
		t.Errorf("polygons were made valid %d times; the stop came with the first", tools.repairs)
	}
	if len(s.Journal()) != 0 {
		t.Error("a stopped import left a change")
	}
}

// stopping is stopped by the user while polygons are made valid.
type stopping struct {
	plain
	stop    func()
	repairs int
}

func (s *stopping) Repair(ctx context.Context, gs []geo.XYGeometry) ([]study.Repaired, error) {
	s.repairs++
	s.stop()
	return s.plain.Repair(ctx, gs)
}

func TestGroups(t *testing.T) {
	ctx := context.Background()
	s := open(t)
	var fs []geo.Feature
	for i, id := range []string{"A", "B", "C", "D"} {
		fs = append(fs, geo.Feature{ID: id, Geometry: square(27+0.02*float64(i), 47, 0.01), Values: []geo.Value{geo.TextValue(id), geo.TextValue([]string{"north", "north", "south", "south"}[i])}})
	}
	if _, err := s.AddLayer(ctx, parcels([]geo.Column{{Name: "parcel_id"}, {Name: "farm"}}, fs...), plain{}); err != nil {
		t.Fatal(err)
	}
	if g, err := s.GroupBy(ctx, "farm", ""); err != nil || len(g) != 2 {
		t.Fatalf("groups %v, %v", g, err)
	}
	if _, err := s.GroupParcels(ctx, "middle", []string{"B", "C"}, ""); err != nil {
		t.Fatal(err)
	}
	n, err := s.Snapshot()
	if err != nil {
		t.Fatal(err)
	}
	if len(n.Groups) != 1 || n.Groups[0].Site != "middle" {
		t.Fatalf("groups %+v: north and south would have one parcel each and must be gone", n.Groups)
	}
	if _, err := s.GroupParcels(ctx, "x", []string{"Z"}, ""); !errors.Is(err, study.ErrNotThere) {
		t.Errorf("an unknown parcel: %v", err)
	}
}

func TestUndoSurvivesAnotherProgramsEdits(t *testing.T) {
	ctx := context.Background()
	cat, err := study.LoadCatalog(os.DirFS("../../assets"))
	if err != nil {
		t.Fatal(err)
	}
	store := studytest.New()
	a, err := study.Open(ctx, store, cat, study.Options{})
	if err != nil {
		t.Fatal(err)
	}
	set(t, a, "run.seed", "2")
	b, err := study.Open(ctx, store, cat, study.Options{})
	if err != nil {
		t.Fatal(err)
	}
	set(t, b, "run.trials", "50") // a does not know of it
	if _, err := a.Undo(ctx); err != nil {
		t.Fatal(err)
	}
	c, err := study.Open(ctx, store, cat, study.Options{})
	if err != nil {
		t.Fatal(err)
	}
	if _, err := c.Undo(ctx); err != nil {
		t.Fatalf("the other program's edit cannot be taken back: %v", err)
	}
	if got := value(t, c, "run.trials"); got != "200" {
		t.Errorf("trials are %s after undo, want the default", got)
	}
	if _, err := c.Undo(ctx); !errors.Is(err, study.ErrNothingToDo) {
		t.Errorf("nothing is left to undo: %v", err)
	}
	for range 2 {
		if _, err := c.Redo(ctx); err != nil {
			t.Fatal(err)
		}
	}
	if s, tr := value(t, c, "run.seed"), value(t, c, "run.trials"); s != "2" || tr != "50" {
		t.Errorf("after redo seed %s and trials %s, want 2 and 50", s, tr)
	}
}

func TestTheLastOfTwoChangesCounts(t *testing.T) {
	s := open(t)
	set(t, s, "run.seed", "5")
	if _, err := s.Set(context.Background(), "set", "", study.SettingEdit{Key: "run.seed", Value: "1"}, study.SettingEdit{Key: "run.seed", Value: "5"}); err != nil {
		t.Fatal(err)
	}
	if got := value(t, s, "run.seed"); got != "5" {
		t.Errorf("the seed is %s, want the last value 5", got)
	}
}

func TestPersonalColumnsNameNothing(t *testing.T) {
	ctx := context.Background()
	s := open(t)
	v := func(id, who string) []geo.Value { return []geo.Value{geo.TextValue(id), geo.TextValue(who)} }
	in := parcels([]geo.Column{{Name: "parcel_id"}, {Name: "Eigentuemer"}},
		geo.Feature{ID: "1", Geometry: square(27, 47, 0.01), Values: v("A", "somebody")},
		geo.Feature{ID: "2", Geometry: square(27.02, 47, 0.01), Values: v("B", "somebody")})
	in.Match = map[string]string{"owner": "Eigentuemer"}
	rec, err := s.AddLayer(ctx, in, plain{})
	if err != nil {
		t.Fatal(err)
	}
	if len(rec.Personal) != 1 || rec.Personal[0] != "Eigentuemer" {
		t.Errorf("personal columns %v: a column that serves as the owner is personal by any name", rec.Personal)
	}
	if _, err := s.GroupBy(ctx, "Eigentuemer", ""); err == nil {
		t.Error("owners' names became names of sites")
	}
	in.Name, in.Personal = "again", []string{"parcel_id"}
	var q *study.QuestionError
	if _, err := s.AddLayer(ctx, in, plain{}); !errors.As(err, &q) {
		t.Errorf("personal identifiers were accepted: %v", err)
	}
}

func TestReplacementsKeepTheirRole(t *testing.T) {
	ctx := context.Background()
	s := open(t)
	in := parcels([]geo.Column{{Name: "parcel_id"}}, geo.Feature{ID: "1", Geometry: square(27, 47, 0.01), Values: []geo.Value{geo.TextValue("A")}})
	if _, err := s.AddLayer(ctx, in, plain{}); err != nil {
		t.Fatal(err)
	}
	var q *study.QuestionError
	in.Role, in.Replace, in.AcceptProposals = "habitat", "p", true
	if _, err := s.AddLayer(ctx, in, plain{}); !errors.As(err, &q) {
		t.Errorf("the parcels became habitats: %v", err)
	}
	in.Role, in.Replace = "parcels", "elsewhere"
	if _, err := s.AddLayer(ctx, in, plain{}); !errors.As(err, &q) {
		t.Errorf("a layer that is not there was replaced: %v", err)
	}
}

// What another program writes while the study is open is neither lost nor overlooked.
func TestAnotherProgramWrites(t *testing.T) {
	ctx := context.Background()
	store := studytest.New()
	cat, err := study.LoadCatalog(os.DirFS("../../assets"))
	if err != nil {
		t.Fatal(err)
	}
	a, err := study.Open(ctx, store, cat, study.Options{})
	if err != nil {
		t.Fatal(err)
	}
	b, err := study.Open(ctx, store, cat, study.Options{})
	if err != nil {
		t.Fatal(err)
	}
	set := func(s *study.Study, key, value string) {
		t.Helper()
		if _, err := s.Set(ctx, "set", "", study.SettingEdit{Key: key, Value: value}); err != nil {
			t.Fatal(err)
		}
	}
	set(a, "study.name", "A")
	set(b, "study.place", "B") // b has not seen what a wrote
	set(a, "study.author", "C")
	for name, s := range map[string]*study.Study{"a": a, "b": b} {
		if _, err := s.Reload(ctx); err != nil {
			t.Fatal(err)
		}
		snap, err := s.Snapshot()
		if err != nil {
			t.Fatal(err)
		}
		if len(s.Journal()) != 3 || snap.Text("study.name") != "A" || snap.Text("study.place") != "B" || snap.Text("study.author") != "C" {
			t.Errorf("%s sees %d entries, name %q, place %q, author %q", name, len(s.Journal()), snap.Text("study.name"), snap.Text("study.place"), snap.Text("study.author"))
		}
	}
	if changed, err := a.Reload(ctx); err != nil || changed {
		t.Errorf("nothing was written: changed %v, error %v", changed, err)
	}
	set(b, "study.name", "D")
	if changed, err := a.Reload(ctx); err != nil || !changed {
		t.Errorf("something was written: changed %v, error %v", changed, err)
	}
}
