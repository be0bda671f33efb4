package run

import (
	"context"
	"fmt"
	"io/fs"
	"math"
	"math/rand/v2"
	"slices"
	"testing"
	"time"

	"groundtally/app/files"
	"groundtally/app/study"
	"groundtally/app/study/studytest"
	"groundtally/geo"
	"groundtally/sampledata"
	"groundtally/scoring"
)

// smallStudy is the sample with a handful of its parcels, so that many states can be computed.
func smallStudy(t testing.TB, every int) *study.Study {
	t.Helper()
	shipped(t)
	s, err := study.Open(context.Background(), studytest.New(), catalog, study.Options{Clock: func() time.Time { return time.Unix(0, 0) }})
	if err != nil {
		t.Fatal(err)
	}
	tools, done := files.NewTools()
	defer done()
	read := func(ctx context.Context, fsys fs.FS, name string) (study.Import, error) {
		in, err := files.ImportFS(ctx, fsys, name)
		if err == nil && name == "parcels.geojson" {
			var few []geo.Feature
			for i, f := range in.Layer.Features {
				if i%every == 0 {
					few = append(few, f)
				}
			}
			in.Layer.Features = few
		}
		return in, err
	}
	if err := s.LoadSample(context.Background(), sampledata.FS(), read, tools, func(study.LayerRecord) {}); err != nil {
		t.Fatal(err)
	}
	return s
}

// addFarParcel adds a layer with one parcel at the island's edge, which widens the district's box.
func addFarParcel(ctx context.Context, s *study.Study) error {
	tools, done := files.NewTools()
	defer done()
	ring := []geo.LonLat{{Lon: -27.35, Lat: 47.52}, {Lon: -27.345, Lat: 47.52}, {Lon: -27.345, Lat: 47.524}, {Lon: -27.35, Lat: 47.524}, {Lon: -27.35, Lat: 47.52}}
	l := &geo.Layer{Columns: []geo.Column{{Name: "parcel_id"}}, Features: []geo.Feature{{ID: "1", Geometry: geo.LonLatGeometry{Kind: geo.Polygons, Parts: [][][]geo.LonLat{{ring}}}, Values: []geo.Value{geo.TextValue("FAR-1")}}}}
	_, err := s.AddLayer(ctx, study.Import{File: "far.geojson", Base: "far.geojson", Layer: l, Role: "parcels", Name: "Far parcel", Ledger: study.Ledger{Read: 1}}, tools)
	return err
}

// TestEditsAndUndosEqualAFreshRun is the property that stored results may never show: after any edits,
// undos and redos, results equal a run from nothing, bit for bit.
func TestEditsAndUndosEqualAFreshRun(t *testing.T) {
	steps := 37
	if testing.Short() {
		steps = 7
	}
	if checks := editsAndUndos(t, smallStudy(t, 60), 7, func(step int) bool { return step < steps }); checks < 3 {
		t.Fatalf("only %d states were compared", checks)
	}
}

// editsAndUndos edits, takes back and brings back by chance, as long as it is told to go on, and compares
// after every second step. It gives how many states were compared.
func editsAndUndos(t *testing.T, s *study.Study, seed uint64, goOn func(step int) bool) (checks int) {
	t.Helper()
	ctx := context.Background()
	cache := &Memory{}
	var before *Results // at hand at every other comparison
	rng := rand.New(rand.NewPCG(seed, 11))
	settings := []struct {
		key    string
		values []string
	}{
		{"rule.setback.dwellings.wind_m", []string{"400", "500", "900", "not set", ""}},
		{"rule.setback.water.solar_fixed_m", []string{"20", "60"}},
		{"rule.setback.dwellings.class.farm.wind_m", []string{"300", ""}},
		{"rule.setback.grid_lines.from_30_kv.wind_m", []string{"150", ""}},
		{"rule.measured_from.dwellings", []string{"centroid", "plot", ""}},
		{"rule.measured_to.wind", []string{"blade tip", ""}},
		{"rule.except.setback:boundary.M-0061", []string{"yes", ""}},
		{"layer.tolerance.dwellings_m", []string{"4", ""}},
		{"rule.aspect_from.solar_fixed_deg", []string{"90", ""}},
		{"rule.aspect_to.solar_fixed_deg", []string{"270", ""}},
		{"rule.slope_max.solar_fixed_deg", []string{"4", "12"}},
		{"rule.smallest_patch.solar_fixed_ha", []string{"1", "3"}},
		{"rule.exclude.farmland", []string{"yes", "no"}},
		{"plant.solar_fixed.tilt_deg", []string{"20", "35"}},
		{"plant.wind.fit_machines", []string{"1", "4"}},
		{"plant.wind.spacing_along_d", []string{"5", "7"}},
		{"wind.shear_alpha", []string{"0.14", "0.2"}},
		{"grid.export_limit_kw", []string{"2000", ""}},
		{"grid.voltage_rise_limit_frac", []string{"0.03", ""}},
		{"inventory.wind_turbine-mj.central", []string{"9000", ""}},
		{"inventory.pv_system_mono-mj.high", []string{"40000", ""}},
		{"land.habitat_edge_m", []string{"0", "80"}},
		{"climate.grid_factor_g_per_kwh", []string{"400", "not set", "250"}},
		{"climate.zone", []string{"boreal", "cool temperate moist"}},
		{"voice.residents.weight.net_share", []string{"5", "90"}},
		{"limit.connection_km", []string{"3", ""}},
		{"gate.owner_consent", []string{"off", "not_no", "yes"}},
		{"gate.critical.peat", []string{"off", "not_no", "yes"}},
		{"gate.critical.irreplaceable_habitat", []string{"not_no", "off"}},
		{"saving.investment_mj_per_mwh", []string{"200", "not set"}},
		{"sealed.kw_per_ha", []string{"800", ""}},
		{"run.seed", []string{"1", "5"}},
		{"run.trials", []string{"40", "60"}},
		{"plant.extra.technology", []string{"solar_vertical", ""}},
		{"energy.household_mwh_per_yr", []string{"3.5", "not set"}},
	}
	layers := []string{"Peat depth", "Flood areas", "Land cover", "Power lines", "Ground heights", "Wind grid", "Soils"}
	for step := 0; goOn(step); step++ {
		what := ""
		switch n := rng.IntN(10); {
		case n < 6:
			c := settings[rng.IntN(len(settings))]
			v := c.values[rng.IntN(len(c.values))]
			what = c.key + " = " + v
			if _, err := s.Set(ctx, "set", "", study.SettingEdit{Key: c.key, Value: v, Reason: "test"}); err != nil {
				t.Fatal(err)
			}
		case n == 6:
			what = "remove a layer"
			if err := s.RemoveLayer(ctx, layers[rng.IntN(len(layers))], ""); err != nil {
				continue // it is gone already
			}
		case n == 7 && rng.IntN(3) == 0:
			what = "a parcel far from the others"
			if err := addFarParcel(ctx, s); err != nil {
				continue // it is there already
			}
		case n == 7:
			what = "group"
			snap, err := s.Snapshot()
			if err != nil {
				t.Fatal(err)
			}
			parcels := snap.LayersOf("parcels")
			v, _, err := s.Store().Version(ctx, parcels[len(parcels)-1].Digest)
			if err != nil {
				t.Fatal(err)
			}
			i := rng.IntN(len(v.Layer.Features) - 1)
			if _, err := s.GroupParcels(ctx, fmt.Sprintf("pair %d", i), []string{v.Layer.Features[i].ID, v.Layer.Features[i+1].ID}, ""); err != nil {
				t.Fatal(err)
			}
		case n == 8:
			what = "undo"
			if _, err := s.Undo(ctx); err != nil {
				continue
			}
		default:
			what = "redo"
			if _, err := s.Redo(ctx); err != nil {
				continue
			}
		}
		if step%2 == 1 {
			continue // results are compared after one or two edits, so that steps pile up
		}
		kept := computeAfter(t, s, cache, 2, before)
		if before = kept; checks%2 == 1 {
			before = nil
		}
		fresh := compute(t, s, nil, 1)
		checks++
		if kept.Code != fresh.Code {
			_, d := Compare(fresh, kept)
			t.Fatalf("after step %d (%s) stored results differ from a fresh run: %+v", step, what, d)
		}
	}
	return checks
}

func TestOneCoreOrMany(t *testing.T) {
	s := smallStudy(t, 80)
	one := compute(t, s, nil, 1)
	many := compute(t, s, nil, 5)
	if one.Code != many.Code {
		_, d := Compare(one, many)
		t.Fatalf("one core and five differ: %+v", d)
	}
}

// asked counts the candidates that are read.
type asked struct {
	Memory
	candidates int
}

func (a *asked) Results(ctx context.Context, step string, keys []string) (map[string][]byte, error) {
	if step == candidateStep {
		a.candidates += len(keys)
	}
	return a.Memory.Results(ctx, step, keys)
}

func TestResultsAtHandAreNotRead(t *testing.T) {
	s := smallStudy(t, 120)
	cache := &asked{}
	first := compute(t, s, cache, 2)
	all := cache.candidates
	if all != len(first.Candidates) {
		t.Fatalf("%d of %d candidates were asked for", all, len(first.Candidates))
	}
	if _, err := s.Set(context.Background(), "set", "", study.SettingEdit{Key: "plant.solar_agri.gcr", Value: "0.28"}); err != nil {
		t.Fatal(err)
	}
	second := computeAfter(t, s, cache, 2, first)
	if got := cache.candidates - all; got == 0 || got > all/4 {
		t.Errorf("with one option of seven changed, %d of %d candidates were read", got, all)
	}
	if fresh := compute(t, s, nil, 2); fresh.Code != second.Code {
		t.Errorf("results at hand give %v, a fresh run %v", second.Code, fresh.Code)
	}
	// What was at hand is as it was.
	for i := range first.Candidates {
		if c := &first.Candidates[i]; c.columns == nil || len(c.All()) == 0 && c.Status == Fitted {
			t.Fatalf("candidate %s lost its consequences", c.ID())
		}
	}
}

func TestOnlyWhatChangedIsComputedAgain(t *testing.T) {
	ctx := context.Background()
	s := smallStudy(t, 60)
	cache := &Memory{}
	steps := func() map[string]StepCount {
		m := map[string]StepCount{}
		for _, c := range compute(t, s, cache, 2).Steps {
			m[c.Step] = c
		}
		return m
	}
	edit := func(key, value string) {
		t.Helper()
		if _, err := s.Set(ctx, "set", "", study.SettingEdit{Key: key, Value: value}); err != nil {
			t.Fatal(err)
		}
	}
	first := steps()
	if first["ground"].Valid != 0 || first["candidate"].Computed == 0 {
		t.Fatalf("first run: %+v", first)
	}
	edit("voice.residents.weight.net_share", "77")
	m := steps()
	for _, step := range []string{"ground", "fit", "candidate"} {
		if m[step].Computed != 0 {
			t.Errorf("a weight made %d of step %s compute again", m[step].Computed, step)
		}
	}
	edit("inventory.wind_turbine-mj.central", "8000")
	if m = steps(); m["ground"].Computed != 0 || m["fit"].Computed != 0 || m["candidate"].Computed == 0 {
		t.Errorf("an inventory row: %+v", m)
	}
	edit("rule.setback.forest.wind_m", "300")
	m = steps()
	if m["ground"].Computed == 0 || m["ground"].Computed > first["ground"].Computed/4 {
		t.Errorf("a setback from a dozen woods made %d of %d grounds compute again, want those near them", m["ground"].Computed, first["ground"].Computed)
	}
	if _, err := s.Undo(ctx); err != nil {
		t.Fatal(err)
	}
	if m = steps(); m["ground"].Computed+m["fit"].Computed+m["candidate"].Computed != 0 {
		t.Errorf("undo did not find its old results valid: %+v", m)
	}
	edit("plant.solar_agri.gcr", "0.28")
	if m = steps(); m["fit"].Computed == 0 || m["fit"].Computed > first["fit"].Computed/4 {
		t.Errorf("one option of seven made %d of %d fits compute again", m["fit"].Computed, first["fit"].Computed)
	}
}

func TestResultsHold(t *testing.T) {
	states := holds(t, compute(t, smallStudy(t, 12), nil, 2))
	for _, st := range []scoring.State{scoring.Number, scoring.NotAssessed, scoring.None, scoring.NotSet} {
		if states[st] == 0 {
			t.Errorf("no consequence is %v: the states are not exercised", st)
		}
	}
}

// holds checks what must be true of every candidate, whatever the data, and counts the states of their
// consequences.
func holds(t *testing.T, r *Results) map[scoring.State]int {
	t.Helper()
	p := shipped(t)
	states := map[scoring.State]int{}
	for i := range r.Candidates {
		c := &r.Candidates[i]
		sum := c.TakenSharedHa + c.ShapeHa
		for _, tk := range c.Taken {
			sum += tk.AloneHa
		}
		gross, _ := c.Consequence("gross_area_ha")
		left, _ := c.Consequence("buildable_area_ha")
		if math.Abs(gross.Central-left.Central-sum) > 1e-6*gross.Central {
			t.Errorf("%s: gross %v, buildable %v, taken %v: the parts do not add up", c.ID(), gross.Central, left.Central, sum)
		}
		if c.Status != Fitted {
			continue
		}
		if len(c.All()) != len(p.Keys()) {
			t.Fatalf("%s has %d consequences, want all %d", c.ID(), len(c.All()), len(p.Keys()))
		}
		for _, q := range c.All() {
			states[q.State]++
			for _, x := range []float64{q.Low, q.Central, q.High, q.Median} {
				if math.IsNaN(x) || math.IsInf(x, 0) {
					t.Errorf("%s, %s: %v", c.ID(), q.Key, x)
				}
			}
			if q.Low > q.High {
				t.Errorf("%s, %s: low %v above high %v", c.ID(), q.Key, q.Low, q.High)
			}
			if q.State != scoring.Number && (q.Low != 0 || q.Central != 0 || q.High != 0) {
				t.Errorf("%s, %s is %v and has a number", c.ID(), q.Key, q.State)
			}
			if (q.State == scoring.Unknown || q.State == scoring.NotSet || q.State == scoring.None) && q.Why == "" {
				t.Errorf("%s, %s is %v without a reason", c.ID(), q.Key, q.State)
			}
		}
		b1, _ := c.Consequence("eroi_generation")
		b2, _ := c.Consequence("eroi_delivered")
		b3, _ := c.Consequence("eroi_extended")
		if b1.State == scoring.Number && b3.State == scoring.Number && !(b1.Central > b2.Central && b2.Central > b3.Central) {
			t.Errorf("%s: returns %v, %v, %v do not fall as more is counted", c.ID(), b1.Central, b2.Central, b3.Central)
		}
	}
	for _, v := range r.Voices {
		at := map[string]Row{}
		for i, row := range v.Order {
			if row.Place != i+1 {
				t.Errorf("voice %s: place %d at position %d", v.Voice, row.Place, i+1)
			}
			sum, low, high := 0.0, 0.0, 0.0
			for _, k := range row.Parts.Names() {
				sum += row.Parts.Of(k).Share
				low += row.Parts.Of(k).ShareLow
				high += row.Parts.Of(k).ShareHigh
			}
			if math.Abs(sum-row.Score) > 1e-12 || math.Abs((low+high)/2-row.Score) > 1e-12 {
				t.Errorf("voice %s, %s: parts %v, interval %v to %v, score %v", v.Voice, row.Site, sum, low, high, row.Score)
			}
			at[row.Site+"/"+row.Plant] = row
		}
		for id, row := range at {
			for _, d := range row.DominatedBy {
				if at[d].Place > row.Place {
					t.Errorf("voice %s: %s stands above %s, which dominates it", v.Voice, id, d)
				}
			}
		}
	}
	return states
}

func TestMissingLayersAreUnknownAndNeverZero(t *testing.T) {
	ctx := context.Background()
	s := smallStudy(t, 12)
	for _, l := range []string{"Habitats", "Soils", "Power lines", "Substations", "Dwellings", "Hourly demand"} {
		if err := s.RemoveLayer(ctx, l, ""); err != nil {
			t.Fatal(err)
		}
	}
	r := compute(t, s, nil, 2)
	n := 0
	for i := range r.Candidates {
		c := &r.Candidates[i]
		if c.Status != Fitted {
			continue
		}
		n++
		for _, key := range []string{"habitat_ha", "soil_carbon_loss_tc", "eroi_delivered", "eroi_stock", "delivered_mwh_per_yr", "nearest_dwelling_m", "demand_share_frac", "connection_km", "ghg_g_per_kwh"} {
			if q, _ := c.Consequence(key); q.State != scoring.Unknown {
				t.Errorf("%s, %s is %v %v without its layer, want unknown", c.ID(), key, q.State, q.Central)
			}
		}
		if q, _ := c.Consequence("eroi_generation"); q.State != scoring.Number {
			t.Errorf("%s: the return at the plant needs no grid, but is %v (%s)", c.ID(), q.State, q.Why)
		}
	}
	if n == 0 {
		t.Fatal("nothing was fitted")
	}
}

func TestSitesDoNotDependOnEachOther(t *testing.T) {
	ctx := context.Background()
	s := smallStudy(t, 40)
	before := compute(t, s, nil, 2)
	if err := addFarParcel(ctx, s); err != nil {
		t.Fatal(err)
	}
	after := compute(t, s, nil, 2)
	for i := range before.Candidates {
		c := &before.Candidates[i]
		d, err := after.Find(c.Site, c.Plant)
		if err != nil {
			t.Fatal(err)
		}
		if diff := differCandidate(c, d); diff != nil {
			t.Fatalf("a parcel far away changed %s: %+v", c.ID(), diff)
		}
	}
	// What lies outside the district is not known to be free of anything.
	c, err := after.Find("FAR-1", "solar_fixed")
	if err != nil {
		t.Fatal(err)
	}
	if c.Status == Fitted {
		for _, key := range []string{"habitat_ha", "flood_ha", "peat_ha"} {
			if q, _ := c.Consequence(key); q.State != scoring.Unknown {
				t.Errorf("%s outside the district is %v, want unknown", key, q.State)
			}
		}
	}
}

func TestRulesWithoutTheirLayerAreTold(t *testing.T) {
	ctx := context.Background()
	s := smallStudy(t, 40)
	for _, l := range []string{"Dwellings", "Roads"} {
		if err := s.RemoveLayer(ctx, l, ""); err != nil {
			t.Fatal(err)
		}
	}
	r := compute(t, s, nil, 2)
	n := 0
	for i := range r.Candidates {
		c := &r.Candidates[i]
		if c.Status != Fitted {
			continue
		}
		n++
		if !slices.Contains(c.Incomplete, "setback:dwellings") {
			t.Fatalf("%s keeps no distance from dwellings and says nothing: %v", c.ID(), c.Incomplete)
		}
		if q, _ := c.Consequence("track_km"); q.State != scoring.Unknown {
			t.Errorf("%s: track_km without roads is %v %v, want unknown", c.ID(), q.State, q.Central)
		}
		if q, _ := c.Consequence("eroi_delivered"); q.State != scoring.Number {
			t.Errorf("%s: the return needs no roads, but is %v (%s)", c.ID(), q.State, q.Why)
		}
	}
	if n == 0 {
		t.Fatal("nothing was fitted")
	}
}

func TestMissingPeatDepthIsUnknown(t *testing.T) {
	ctx := context.Background()
	s := smallStudy(t, 12)
	snap, err := s.Snapshot()
	if err != nil {
		t.Fatal(err)
	}
	rec := snap.LayersOf("peat")[0]
	v, _, err := s.Store().Version(ctx, rec.Digest)
	if err != nil {
		t.Fatal(err)
	}
	blank := *v.Layer
	blank.Features = slices.Clone(v.Layer.Features)
	for i := range blank.Features {
		blank.Features[i].Values = make([]geo.Value, len(blank.Columns))
	}
	tools, done := files.NewTools()
	defer done()
	if _, err := s.AddLayer(ctx, study.Import{File: "peat.geojson", Base: "peat.geojson", Layer: &blank, Role: "peat", Replace: rec.Name, AcceptProposals: true, Complete: true}, tools); err != nil {
		t.Fatal(err)
	}
	r := compute(t, s, nil, 2)
	n := 0
	for i := range r.Candidates {
		c := &r.Candidates[i]
		q, ok := c.Consequence("peat_ha")
		if !ok || q.State != scoring.Number {
			continue
		}
		n++
		if loss, _ := c.Consequence("soil_carbon_loss_tc"); loss.State != scoring.Unknown {
			t.Errorf("%s touches %.2f ha of peat of unknown depth and loses %v %v", c.ID(), q.Central, loss.State, loss.Central)
		}
	}
	if n == 0 {
		t.Fatal("no candidate touches peat")
	}
}

func TestDoingNothingKeepsItsDistance(t *testing.T) {
	ctx := context.Background()
	s := smallStudy(t, 40)
	for _, kv := range [][2]string{{"voice.far.weight.nearest_dwelling_m", "100"}, {"voice.far.weight.net_share", "100"}} {
		if _, err := s.Set(ctx, "set", "", study.SettingEdit{Key: kv[0], Value: kv[1]}); err != nil {
			t.Fatal(err)
		}
	}
	r := compute(t, s, nil, 2)
	for _, v := range r.Voices {
		if v.Voice != "far" {
			continue
		}
		for _, row := range v.Order {
			if row.Site != NoSite {
				continue
			}
			if x := row.Parts.Of("nearest_dwelling_m"); !x.Known || x.Value != 1 {
				t.Errorf("doing nothing stands near no dwelling, but has the value %v", x)
			}
			if x := row.Parts.Of("net_share"); !x.Known || x.Value != 0 {
				t.Errorf("doing nothing brings no energy, but has the value %v", x)
			}
		}
	}
}
