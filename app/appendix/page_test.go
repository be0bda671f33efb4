package appendix_test

import (
	"bytes"
	"context"
	"encoding/json"
	"html/template"
	"io/fs"
	"os"
	"path/filepath"
	"regexp"
	"slices"
	"strconv"
	"strings"
	"sync"
	"testing"
	"time"

	"groundtally/app/appendix"
	"groundtally/app/files"
	"groundtally/app/run"
	"groundtally/app/study"
	"groundtally/app/study/studytest"
	"groundtally/assets"
	"groundtally/geo"
	"groundtally/sampledata"
	"groundtally/scoring"
	"groundtally/scoring/solar"
)

const (
	ownerName  = "Ottilie Quellmark"
	markupSite = `<script>alert("site")</script>&'`
	markupText = `</title></style><script>alert(1)</script>`
)

// made is a study of a few parcels of the sample, whose owners have a name and whose texts hold markup.
var made = sync.OnceValues(func() (appendix.Input, error) {
	ctx := context.Background()
	var none appendix.Input
	cat, err := study.LoadCatalog(assets.FS())
	if err != nil {
		return none, err
	}
	p, err := run.LoadParams(assets.FS(), cat)
	if err != nil {
		return none, err
	}
	s, err := study.Open(ctx, studytest.New(), cat, study.Options{Clock: func() time.Time { return time.Unix(0, 0) }})
	if err != nil {
		return none, err
	}
	tools, done := files.NewTools()
	defer done()
	read := func(ctx context.Context, fsys fs.FS, name string) (study.Import, error) {
		in, err := files.ImportFS(ctx, fsys, name)
		if err == nil && name == "parcels.geojson" {
			few(in.Layer)
		}
		return in, err
	}
	if err := s.LoadSample(ctx, sampledata.FS(), read, tools, func(study.LayerRecord) {}); err != nil {
		return none, err
	}
	if _, err := s.Set(ctx, "set", "to see marks", study.SettingEdit{Key: "limit.connection_km", Value: "0.3"}, study.SettingEdit{Key: "study.name", Value: markupText}, study.SettingEdit{Key: "plant.wind.title", Value: markupText}, study.SettingEdit{Key: "run.trials", Value: "50"}); err != nil {
		return none, err
	}
	return inputOf(ctx, s, p)
})

// few keeps every fortieth parcel, names an owner for each, and gives one an identifier with markup.
func few(l *geo.Layer) {
	owner := l.ColumnIndex("owner")
	if owner < 0 {
		owner = len(l.Columns)
		l.Columns = append(l.Columns, geo.Column{Name: "owner"})
	}
	id := l.ColumnIndex("parcel_id")
	var out []geo.Feature
	for i, f := range l.Features {
		if i%40 != 0 {
			continue
		}
		for len(f.Values) < len(l.Columns) {
			f.Values = append(f.Values, geo.Value{})
		}
		f.Values[owner] = geo.TextValue(ownerName)
		if len(out) == 20 {
			f.ID = markupSite
			if id >= 0 {
				f.Values[id] = geo.TextValue(markupSite)
			}
		}
		out = append(out, f)
	}
	l.Features = out
}

func inputOf(ctx context.Context, s *study.Study, p *run.Params) (appendix.Input, error) {
	var none appendix.Input
	snap, err := s.Snapshot()
	if err != nil {
		return none, err
	}
	r, err := (&run.Engine{Params: p, Cores: 2, Load: run.StoreLoader(s.Store())}).Compute(ctx, snap)
	if err != nil {
		return none, err
	}
	layers, err := appendix.MapLayers(ctx, snap, run.StoreLoader(s.Store()))
	if err != nil {
		return none, err
	}
	notices, err := run.Check(ctx, s.Store(), snap, p)
	return appendix.Input{Snapshot: snap, Results: r, Params: p, Layers: layers, Notices: notices, Engines: []string{"GEOS"}, Version: "groundtally test", Journal: s.Journal(), Frozen: s.FrozenStates()}, err
}

func input(t testing.TB) appendix.Input {
	t.Helper()
	in, err := made()
	if err != nil {
		t.Fatal(err)
	}
	return in
}

func page(t testing.TB, in appendix.Input) string {
	t.Helper()
	b, err := appendix.Page(in)
	if err != nil {
		t.Fatal(err)
	}
	return string(b)
}

func TestSamePageTwice(t *testing.T) {
	in := input(t)
	once, again := page(t, in), page(t, in)
	if once != again {
		t.Error("the same results gave two different pages")
	}
	a, err := json.Marshal(appendix.NewStamp(in.Results, in.Version))
	if err != nil {
		t.Fatal(err)
	}
	b, err := json.Marshal(appendix.NewStamp(in.Results, in.Version))
	if err != nil {
		t.Fatal(err)
	}
	if !bytes.Equal(a, b) {
		t.Error("the same results gave two different stamps")
	}
}

func TestNoPersonalColumnReachesThePage(t *testing.T) {
	in := input(t)
	personal := false
	for _, l := range in.Snapshot.LayersOf("parcels") {
		personal = personal || strings.Contains(strings.Join(l.Personal, " "), "owner")
	}
	if !personal {
		t.Fatal("the owner column was not marked personal, so this test shows nothing")
	}
	b, err := json.Marshal(appendix.NewStamp(in.Results, in.Version))
	if err != nil {
		t.Fatal(err)
	}
	for _, part := range strings.Fields(ownerName) {
		if strings.Contains(page(t, in), part) || bytes.Contains(b, []byte(part)) {
			t.Errorf("%q of an owner's name is in the appendix", part)
		}
	}
}

// A column of the word on spare capacity that was marked personal must not come through a candidate's
// connection either.
func TestWhoToldACapacityIsLeftOutWhenPersonal(t *testing.T) {
	in := input(t)
	const told = "planning desk"
	if !strings.Contains(page(t, in), told) {
		t.Fatalf("the page does not say who told a capacity, so this test shows nothing")
	}
	snap := *in.Snapshot
	snap.Layers = append([]study.LayerRecord(nil), snap.Layers...)
	for i, l := range snap.Layers {
		if col := l.Match["told_by"]; col != "" {
			snap.Layers[i].Personal = []string{col}
		}
	}
	in.Snapshot = &snap
	if strings.Contains(page(t, in), told) {
		t.Error("the page says who told a capacity although the column is personal")
	}
}

func TestEverythingIsEscaped(t *testing.T) {
	in := input(t)
	snap := *in.Snapshot
	snap.Layers = append([]study.LayerRecord(nil), snap.Layers...)
	snap.Layers[0].Name = markupText
	in.Snapshot = &snap
	in.Notices = append([]geo.Notice{{Code: "duplicate", Layer: markupText, Args: map[string]string{"of": markupText}}}, in.Notices...)
	in.Engines = []string{markupText}
	in.Frozen = []study.Frozen{{Name: markupText}}
	in.Journal = append([]study.Entry{{Reason: markupText, Who: markupText, Verb: markupText}}, in.Journal...)
	html := page(t, in)
	if strings.Contains(strings.ToLower(html), "<script") || strings.Count(html, "</title></style>") != 0 {
		t.Error("markup of a text came through")
	}
	for _, want := range []string{"&lt;script&gt;alert(1)", "&lt;script&gt;alert("} {
		if !strings.Contains(html, want) {
			t.Errorf("the text %q does not stand on the page", want)
		}
	}
	seen := false
	for i := range in.Results.Candidates {
		seen = seen || in.Results.Candidates[i].Site == markupSite
	}
	if !seen {
		t.Error("no site has an identifier with markup, so this test shows little")
	}
}

func TestPageNeedsNothingFromOutside(t *testing.T) {
	html := page(t, input(t))
	for _, bad := range []string{"<script", "<link", "<img", "<iframe", "@import", "url(http", `src="http`, `href="http`, " onload=", " onclick="} {
		if strings.Contains(strings.ToLower(html), bad) {
			t.Errorf("the page contains %s", bad)
		}
	}
}

func TestPageTellsItsParts(t *testing.T) {
	in := input(t)
	html := page(t, in)
	for _, want := range []string{"Cautions", "In short", "Maps", "What is not assessed", "Settings in force", "default, unverified", "gtally verify STUDY.gpkg --code " + in.Results.Code.Check, "over the limit", "not set", "not assessed", "tipping", "8,760 hours"} {
		if !strings.Contains(html, want) {
			t.Errorf("the page says nowhere %q", want)
		}
	}
	if strings.ContainsAny(html, "–—") {
		t.Error("a typographic dash stands on the page")
	}
	for _, v := range in.Results.Voices {
		if !strings.Contains(html, v.Title) {
			t.Errorf("voice %q is missing", v.Title)
		}
	}
	// Every fitted candidate has its row in the tables of all candidates.
	fitted := 0
	for i := range in.Results.Candidates {
		if in.Results.Candidates[i].Status == run.Fitted {
			fitted++
		}
	}
	for _, s := range []string{strconv.Itoa(fitted) + " candidates have room", "All " + strconv.Itoa(fitted) + " fitted candidates"} {
		if !strings.Contains(html, s) {
			t.Errorf("the page does not say %q", s)
		}
	}
}

// Every unfolded candidate has its land and, where a yield is known, its loss chain as pictures, told apart
// by the words that stand for them.
func TestUnfoldedCandidatesHaveTheirPictures(t *testing.T) {
	in := input(t)
	html := page(t, in)
	lands, chains := 0, 0
	for i := range in.Results.Candidates {
		c := &in.Results.Candidates[i]
		title := c.Site + ", " + in.Snapshot.Text("plant."+c.Plant+".title")
		land := strings.Count(html, `aria-label="Bar chart: area of the site of `+template.HTMLEscapeString(title)+`, taken`)
		chain := strings.Count(html, `aria-label="Bar chart: yield of `+template.HTMLEscapeString(title)+` step by step`)
		if land > 1 || chain > 1 || chain == 1 && land == 0 || land == 1 && chain != min(1, len(c.Chain)) {
			t.Errorf("%s has %d pictures of its land and %d of its %d steps of yield", c.ID(), land, chain, len(c.Chain))
		}
		lands, chains = lands+land, chains+chain
	}
	if lands < 3 || chains < 3 || lands != strings.Count(html, "Land taken from the site") {
		t.Errorf("%d pictures of land, %d of yields, for %d tables of land", lands, chains, strings.Count(html, "Land taken from the site"))
	}
	for _, want := range []string{"buildable area: ", "before losses", "area, ha", "yield of a year, kWh/kWp"} {
		if !strings.Contains(html, want) {
			t.Errorf("the pictures say nowhere %q", want)
		}
	}
}

var (
	tag     = regexp.MustCompile(`<(h[1-6])[ >]`)
	id      = regexp.MustCompile(` id="([^"]*)"`)
	href    = regexp.MustCompile(` href="#([^"]*)"`)
	header  = regexp.MustCompile(`<th( [^>]*)?>`)
	picture = regexp.MustCompile(`<svg[^>]*>`)
)

// TestPageCanBeReadByEveryone holds what a reader without eyes or without colours needs.
func TestPageCanBeReadByEveryone(t *testing.T) {
	html := page(t, input(t))
	level := 0
	for _, m := range tag.FindAllStringSubmatch(html, -1) {
		n := int(m[1][1] - '0')
		if n > level+1 {
			t.Errorf("heading h%d follows h%d", n, level)
		}
		level = n
	}
	for _, m := range header.FindAllString(html, -1) {
		if !strings.Contains(m, "scope=") {
			t.Errorf("table header without scope: %s", m)
			break
		}
	}
	pictures := picture.FindAllString(html, -1)
	if len(pictures) < 4 {
		t.Errorf("only %d pictures", len(pictures))
	}
	for _, p := range pictures {
		if !strings.Contains(p, `role="img"`) || !strings.Contains(p, `aria-label="`) || strings.Contains(p, `aria-label=""`) {
			t.Errorf("picture without words: %.100s", p)
		}
	}
	ids := map[string]bool{}
	for _, m := range id.FindAllStringSubmatch(html, -1) {
		if ids[m[1]] {
			t.Errorf("the id %q stands twice", m[1])
		}
		ids[m[1]] = true
	}
	for _, m := range href.FindAllStringSubmatch(html, -1) {
		if !ids[m[1]] && !strings.Contains(m[1], "%") {
			t.Errorf("a link leads to %q, which is not there", m[1])
		}
	}
}

func TestUnknownIsAWordAndNeverZero(t *testing.T) {
	html := page(t, input(t))
	hatched := regexp.MustCompile(`<td class="?n? ?u"?>(<b>)?([^<]*)`).FindAllStringSubmatch(html, -1)
	if len(hatched) == 0 {
		t.Fatal("no cell is unknown; the sample has some")
	}
	for _, m := range hatched {
		switch m[2] {
		case "unknown", "not set", "not assessed":
		default:
			t.Errorf("a hatched cell reads %q", m[2])
		}
	}
}

// bare are results without a cache or digests behind them, as Compare takes them.
func bare() *run.Results {
	return &run.Results{
		Code: run.Code{Inputs: "in", Results: "one", Check: "check one"},
		Candidates: []run.Candidate{
			{Site: "A", Plant: "wind", Status: run.Fitted, Fit: &run.Fit{Turbines: make([]geo.LonLat, 2)}, Consequences: []scoring.Consequence{
				{Key: "energy_p50_mwh_per_yr", Low: 900.5, Central: 1000.25, High: 1100.125},
				{Key: "noise_dba", State: scoring.NotAssessed},
				{Key: "flood_ha", State: scoring.None, Why: "no flood area touched"},
				{Key: "habitat_ha", Low: 0, Central: 0, High: 3.5},
			}},
			{Site: "B", Plant: "wind", Status: run.NoRoom},
		},
		Voices: []run.VoiceOrder{{Voice: "farmers", Order: []run.Row{{Place: 1, Tier: 1, Site: "A", Plant: "wind", Score: 0.75}, {Place: 2, Tier: 2, Site: run.NoSite, Score: 0.25}}}},
	}
}

// changed are bare results as a later run may find them: another digest, and what a test changes.
func changed(change func(*run.Results)) *run.Results {
	r := bare()
	r.Code.Results, r.Code.Check = "two", "check two"
	change(r)
	return r
}

func TestStampCompares(t *testing.T) {
	stamp := appendix.NewStamp(bare(), "v")
	if verdict, diff := stamp.Compare(bare(), "v"); verdict != "identical" || diff != nil {
		t.Errorf("the same results: %q, %v", verdict, diff)
	}
	agrees := changed(func(r *run.Results) {
		for i := range r.Candidates[0].Consequences {
			q := &r.Candidates[0].Consequences[i]
			q.Low, q.Central, q.High = q.Low*(1+1e-9), q.Central*(1-1e-9), q.High*(1+1e-9)
		}
		r.Voices[0].Order[0].Score *= 1 + 1e-9
	})
	if verdict, diff := stamp.Compare(agrees, "v"); verdict != "agrees" || diff != nil {
		t.Errorf("results a billionth off: %q, %v", verdict, diff)
	}
	for _, c := range []struct {
		name   string
		change func(*run.Results)
		where  string
	}{
		{"a value", func(r *run.Results) { r.Candidates[0].Consequences[0].Central *= 1.00001 }, "energy_p50_mwh_per_yr"},
		{"a low value", func(r *run.Results) { r.Candidates[0].Consequences[3].Low = 0.5 }, "habitat_ha"},
		{"a state", func(r *run.Results) { r.Candidates[0].Consequences[1].State = scoring.Unknown }, "noise_dba"},
		{"a reason", func(r *run.Results) { r.Candidates[0].Consequences[2].Why = "other" }, "flood_ha"},
		{"a status", func(r *run.Results) { r.Candidates[1].Status = run.NotComputed }, "B"},
		{"a turbine", func(r *run.Results) { r.Candidates[0].Fit.Turbines = make([]geo.LonLat, 3) }, "turbines"},
		{"a candidate", func(r *run.Results) { r.Candidates = r.Candidates[:1] }, "candidates"},
		{"a tier", func(r *run.Results) { r.Voices[0].Order[1].Tier = 1 }, "tier"},
		{"a score", func(r *run.Results) { r.Voices[0].Order[0].Score = 0.7 }, "score"},
		{"a voice", func(r *run.Results) { r.Voices = nil }, "voices"},
	} {
		verdict, diff := stamp.Compare(changed(c.change), "v")
		if diff == nil || !strings.Contains(diff.Where, c.where) || diff.Old == diff.New {
			t.Errorf("%s changed: %q, %+v", c.name, verdict, diff)
		}
	}
	inputs := bare()
	inputs.Code.Inputs, inputs.Code.Check = "other", "check three"
	if _, diff := stamp.Compare(inputs, "v"); diff == nil || !strings.Contains(diff.Where, "inputs or settings") {
		t.Errorf("other inputs with the same results: %+v", diff)
	}
}

// What stands beside the candidates, what gates hold back and the habitat touched are part of the stamp.
func TestStampHoldsAllThatIsCompared(t *testing.T) {
	in := input(t)
	with := func(change func(r *run.Results)) *run.Results {
		r := *in.Results
		r.Candidates, r.Voices = slices.Clone(r.Candidates), slices.Clone(r.Voices)
		r.Candidates[0].Habitat = &run.Habitat{Kinds: []run.HabitatKind{{Class: "heath", Irreplaceable: "no", LostHa: 0.123456789012}}, Pieces: &run.HabitatPieces{Before: 1, After: 2, LargestBeforeHa: 3, LargestAfterHa: 2}}
		r.Voices[0].HeldBack = []run.Held{{Site: "Z", Plant: "wind", Gates: []string{"peat"}, Place: 4}}
		r.Voices[0].Beside = slices.Clone(r.Voices[0].Beside)
		r.Code.Results, r.Code.Check = "other", "other"
		change(&r)
		return &r
	}
	s := appendix.NewStamp(with(func(*run.Results) {}), in.Version)
	fresh := with(func(r *run.Results) { r.Candidates[0].Habitat.Kinds[0].LostHa *= 1 + 1e-9 })
	fresh.Code.Results, fresh.Code.Check = "another", "another"
	if verdict, diff := s.Compare(fresh, in.Version); verdict != "agrees" || diff != nil {
		t.Errorf("results a billionth off: %q, %+v", verdict, diff)
	}
	if len(in.Results.Voices[0].Beside) == 0 {
		t.Fatal("nothing stands beside the candidates")
	}
	for _, c := range []struct {
		name, where string
		change      func(r *run.Results)
	}{
		{"an area of habitat", "habitat", func(r *run.Results) { r.Candidates[0].Habitat.Kinds[0].LostHa *= 1.001 }},
		{"a class of habitat", "habitat", func(r *run.Results) { r.Candidates[0].Habitat.Kinds[0].Class = "bog" }},
		{"a piece of habitat", "habitat", func(r *run.Results) { r.Candidates[0].Habitat.Pieces.After = 3 }},
		{"no habitat", "habitat", func(r *run.Results) { r.Candidates[0].Habitat = nil }},
		{"a place without gates", "held back", func(r *run.Results) { r.Voices[0].HeldBack[0].Place = 5 }},
		{"nothing held back", "held back", func(r *run.Results) { r.Voices[0].HeldBack = nil }},
		{"a score beside", "alternative", func(r *run.Results) { r.Voices[0].Beside[0].Score += 0.01 }},
		{"nothing beside", "alternative", func(r *run.Results) { r.Voices[0].Beside = nil }},
	} {
		fresh := with(c.change)
		fresh.Code.Results, fresh.Code.Check = "another", "another"
		if verdict, diff := s.Compare(fresh, in.Version); diff == nil || !strings.Contains(diff.Where, c.where) || diff.Old == diff.New {
			t.Errorf("%s: %q, %+v", c.name, verdict, diff)
		}
	}
}

func TestStampSurvivesItsFile(t *testing.T) {
	in := input(t)
	dir := t.TempDir()
	b, err := json.Marshal(appendix.NewStamp(in.Results, in.Version))
	if err != nil {
		t.Fatal(err)
	}
	if err := os.WriteFile(filepath.Join(dir, appendix.StampFile), b, 0o600); err != nil {
		t.Fatal(err)
	}
	s, err := appendix.ReadStamp(dir)
	if err != nil {
		t.Fatal(err)
	}
	if verdict, diff := s.Compare(in.Results, in.Version); verdict != "identical" || diff != nil {
		t.Errorf("after the file: %q, %v", verdict, diff)
	}
	// The values themselves must agree too, not only the digest.
	again := *in.Results
	again.Code.Results, again.Code.Check = "other", "other"
	if verdict, diff := s.Compare(&again, in.Version); verdict != "agrees" || diff != nil {
		t.Errorf("value by value: %q, %+v", verdict, diff)
	}
}

func TestDamagedStampIsAnErrorOrADifference(t *testing.T) {
	dir := t.TempDir()
	if _, err := appendix.ReadStamp(dir); err == nil {
		t.Error("a folder without a check code was read")
	}
	for _, text := range []string{"", "{", "[]", "{\"values\": 3}"} {
		if err := os.WriteFile(filepath.Join(dir, appendix.StampFile), []byte(text), 0o600); err != nil {
			t.Fatal(err)
		}
		if _, err := appendix.ReadStamp(dir); err == nil {
			t.Errorf("%q was read as a check code", text)
		}
	}
	for _, values := range []string{"", "???", "aGVsbG8="} {
		s := appendix.NewStamp(bare(), "v")
		s.Values = values
		if verdict, diff := s.Compare(changed(func(*run.Results) {}), "v"); diff == nil {
			t.Errorf("values %q: %q", values, verdict)
		}
	}
}

func TestOtherEditionIsNamed(t *testing.T) {
	s := appendix.NewStamp(bare(), "v")
	for step, n := range s.Editions {
		s.Editions = map[string]int{}
		for k, v := range run.Editions() {
			s.Editions[k] = v
		}
		s.Editions[step] = n + 1
		if _, diff := s.Compare(changed(func(*run.Results) {}), "v"); diff == nil || !strings.Contains(diff.Where, step) {
			t.Errorf("edition of %s: %+v", step, diff)
		}
	}
}

func BenchmarkPage(b *testing.B) {
	in := input(b)
	for b.Loop() {
		if _, err := appendix.Page(in); err != nil {
			b.Fatal(err)
		}
	}
}

func BenchmarkStamp(b *testing.B) {
	in := input(b)
	for b.Loop() {
		appendix.NewStamp(in.Results, in.Version)
	}
}

// The first of each voice has its months where somebody tells them; unknown months say so and show no
// figure.
func TestMonths(t *testing.T) {
	in := input(t)
	if html := page(t, in); strings.Contains(html, "by month") {
		t.Error("months stand on the page though nobody tells them")
	}
	in.Course = func(c *run.Candidate) (*run.Course, error) {
		course := &run.Course{Hours: &[12][24]float64{6: {12: 5}}, Sky: []run.SkyYield{{Model: "isotropic", KWhPerKWp: 970}, {Model: "Hay-Davies", KWhPerKWp: 1000, Used: true}},
			Doubt: &run.Doubt{Source: "satellite", Said: true, Components: []solar.Component{{Name: "sunlight", Sigma: 0.04, Shared: true}, {Name: "shading", Sigma: 0.01}}, BetweenYears: 0.04, LongTerm: 0.05, OneYear: 0.064}}
		out := &course.Months
		for m := range out {
			out[m] = scoring.Num(float64(111 + m))
		}
		out[4] = scoring.UnknownBecause("wind_by_year_alone")
		return course, nil
	}
	html := page(t, in)
	for _, want := range []string{"Map: energy of ", "July, 12 to 13 h: 5.00 MWh", "isotropic 970, Hay-Davies 1000 (used); from -3.0 to &#43;0.0 %", "sunlight 4.0 (satellite), shading 1.0 (of this site alone); together 5.0", "P75 96 %, P90 92 %, P99 85 %", "Column chart: energy of ", `<tr><th scope="row">May</th><td class="n">unknown</td></tr>`, `<tr><th scope="row">June</th><td class="n">116</td></tr>`, "Unknown: the wind is known for the year"} {
		if !strings.Contains(html, want) {
			t.Errorf("the page has no %q", want)
		}
	}
}

// The first of each voice has its crowding curve, and says why where it has none.
func TestCrowdingCurve(t *testing.T) {
	in := input(t)
	if html := page(t, in); strings.Contains(html, "Crowding curve") {
		t.Error("a crowding curve stands on the page though nobody tells it")
	}
	asked := 0
	in.Crowding = func(c *run.Candidate, part string) (*run.Crowded, error) {
		if asked++; asked > 1 {
			return &run.Crowded{Why: "too small a site"}, nil
		}
		return &run.Crowded{Swept: "ground cover", GroundHa: 10, Points: []run.CrowdedPoint{{Swept: 0.3, KWPerHa: 500, MWhPerHaYr: 600, EROI: 9}, {Swept: 0.4, KWPerHa: 700, MWhPerHaYr: 800, EROI: 8}, {Swept: 0.5, KWPerHa: 900, MWhPerHaYr: 900, EROI: 7}},
			BestReturn: run.CrowdedMark{Swept: 0.3, MWhPerHaYr: 600, EROI: 9, Known: true}}, nil
	}
	html := page(t, in)
	if asked == 0 || strings.Count(html, "Crowding curve. ") != asked || strings.Count(html, "Line chart: energy from a hectare against energy return of ") == 0 || !strings.Contains(html, "On 10.00 ha of buildable ground") {
		t.Errorf("asked %d times, told %d times", asked, strings.Count(html, "Crowding curve. "))
	}
	if asked > 1 && !strings.Contains(html, "No crowding curve: too small a site.") {
		t.Error("why there is no curve is not said")
	}
}

// Each voice has its first two places against each other as a picture; one cloud shows all candidates.
func TestComparingPictures(t *testing.T) {
	in := input(t)
	html := page(t, in)
	voices := 0
	for _, v := range in.Results.Voices {
		if len(v.Order) > 1 {
			voices++
		}
	}
	if got := strings.Count(html, `aria-label="Bar chart: the first two places under the voice `); got != voices || got == 0 {
		t.Errorf("%d pairs are drawn for %d voices", got, voices)
	}
	if got := strings.Count(html, `aria-label="Scatter chart: all fitted candidates`); got != 1 {
		t.Errorf("%d clouds are drawn", got)
	}
}

// section is what the page says of an unfolded candidate; empty where it is not unfolded.
func section(html, id string) string {
	for _, head := range []string{`<h3 id="`, `<details id="`} {
		if _, rest, ok := strings.Cut(html, head+template.HTMLEscapeString(id)+`"`); ok {
			end := len(rest)
			for _, next := range []string{`<h3 id="`, `<details id="`, `<h2 `} {
				if i := strings.Index(rest, next); i >= 0 {
					end = min(end, i)
				}
			}
			return rest[:end]
		}
	}
	return ""
}

// Every unfolded candidate with turbines says how they came to stand where they stand, below the map of its
// wakes where there is one; nothing else does.
func TestLayoutsAreTold(t *testing.T) {
	const heading, curve, wakes, month = "<p>Layout of the turbines:</p>", "Column chart: power of a turbine", "Map: wakes of ", "Column chart: energy of "
	in := input(t)
	html := page(t, in)
	told, without := 0, 0
	for i := range in.Results.Candidates {
		c := &in.Results.Candidates[i]
		part := section(html, c.ID())
		switch {
		case part == "":
		case c.Fit == nil || len(c.Fit.Turbines) == 0:
			without++
			if strings.Contains(part, heading) {
				t.Errorf("%s has no turbines and tells of their layout", c.ID())
			}
		default:
			told++
			if how := "<li>Found by: " + c.Fit.Layout.How + ".</li>"; c.Fit.Layout.How == "" || strings.Count(part, heading) != 1 || !strings.Contains(part, how) {
				t.Errorf("%s does not say %q once", c.ID(), how)
			}
			if bound := strings.Contains(part, "below the bound of"); bound != (len(c.Fit.Turbines) > 1) {
				t.Errorf("%s has %d turbines; bound told: %t", c.ID(), len(c.Fit.Turbines), bound)
			}
		}
	}
	if told == 0 || without == 0 || told != strings.Count(html, heading) {
		t.Fatalf("%d unfolded candidates have turbines, %d have none, and %d layouts are told", told, without, strings.Count(html, heading))
	}

	results := *in.Results
	results.Candidates = append([]run.Candidate(nil), results.Candidates...)
	in.Results = &results
	layouts := []struct {
		layout run.Layout
		want   []string
	}{
		{run.Layout{How: "square lattice", MostByRule: 8, MostBy: "cover by rectangles", SpacingMet: 1.02, BoundMWh: 80000, WakedMWh: 76000, Asked: 12, AskedBy: "usual limit"}, []string{
			"<li>Found by: square lattice.</li>", "<li>Most that the spacing allows: 8 at most (cover by rectangles).</li>", "<li>Wanted at most: 12 (the usual limit).</li>",
			"<li>The two nearest to each other stand at 1.02 times the distance of the spacing rule.</li>",
			"<li>Energy behind wakes: 5.0 % below the bound of 80 000 MWh a year (8 turbines without any wake), before losses.</li>",
		}},
		{run.Layout{How: "by hand", Reason: markupText, SpacingMet: 0.9, Broken: []run.Broken{{Turbine: 2, Rule: "too_near", Other: 1, ByM: 12}, {Turbine: 2, Rule: "outside_site", ByM: 7}}}, []string{
			"<li>Placed by hand: " + template.HTMLEscapeString(markupText) + "</li>", "<li>The two nearest to each other stand at 0.90 times the distance of the spacing rule.</li>",
			`<li class="over">Turbine 2 stands 12 m nearer to turbine 1 than the spacing allows</li>`, `<li class="over">Turbine 2 stands 7 m outside the site</li>`,
		}},
	}
	in.Course = func(*run.Candidate) (*run.Course, error) {
		return &run.Course{Turbines: &run.TurbineView{Curve: &run.WindCurve{RatedKW: 3370}, Wakes: &run.WakeField{Columns: 1, Rows: 1, StepM: 50, Lost: []float64{0.1}}}}, nil
	}
	for _, l := range layouts {
		for i := range results.Candidates {
			if c := &results.Candidates[i]; c.Fit != nil && c.Fit.Layout != nil {
				fit := *c.Fit
				fit.Turbines, fit.Layout = make([]geo.LonLat, 2), &l.layout
				c.Fit = &fit
			}
		}
		html := page(t, in)
		drawn, others := 0, 0
		for i := range results.Candidates {
			c := &results.Candidates[i]
			part := section(html, c.ID())
			if part == "" || c.Fit == nil || c.Fit.Layout == nil {
				continue
			}
			before, list, _ := strings.Cut(part, heading)
			list, _, _ = strings.Cut(list, "</ul>")
			if got, want := strings.TrimPrefix(list, `<ul class="small">`), strings.Join(l.want, ""); got != want {
				t.Errorf("%s tells of its layout\n%s\nwant\n%s", c.ID(), got, want)
			}
			if !strings.Contains(part, month) {
				others++
			} else if drawn++; !strings.Contains(before, wakes) || !strings.Contains(before, curve) || strings.Contains(list, "<svg") {
				t.Errorf("the layout of %s does not stand below its wakes", c.ID())
			}
		}
		if drawn == 0 || others == 0 {
			t.Fatalf("%d layouts stand below wakes, %d without", drawn, others)
		}
	}
}

// Every unfolded candidate has its accounts in pictures, each with a caption in words; the pictures do not swell the page.
func TestUnfoldedCandidatesHaveTheirAccountsInPictures(t *testing.T) {
	in := input(t)
	html := page(t, in)
	unfolded := strings.Count(html, "Land taken from the site")
	seen := 0
	for i := range in.Results.Candidates {
		c := &in.Results.Candidates[i]
		title := template.HTMLEscapeString(c.Site + ", " + in.Snapshot.Text("plant."+c.Plant+".title"))
		if !strings.Contains(html, `aria-label="Bar chart: area of the site of `+title+`, taken`) {
			continue
		}
		seen++
		for _, want := range []string{"Bar chart: energy return by boundary of " + title, "Bar chart: ground taken by " + title, "Line chart: carbon payback of " + title, "Bar chart: what moves the energy return of " + title} {
			// A title goes on with words of the figures, or ends.
			if strings.Count(html, `aria-label="`+want) == 0 {
				t.Errorf("%s has no picture %q", c.ID(), want)
			}
		}
	}
	if seen < 3 || seen != unfolded {
		t.Fatalf("%d candidates with pictures, %d unfolded", seen, unfolded)
	}
	for _, words := range []string{"<figcaption>Energy return, electricity out over primary energy spent: ", "<figcaption>Ground taken, kinds that may lie over each other: ", "<figcaption>Carbon payback under each grid factor: ", "<figcaption>What moves "} {
		if n := strings.Count(html, words); n != seen {
			t.Errorf("%d captions begin with %q, want %d", n, words, seen)
		}
	}
	size := 0
	for _, part := range strings.Split(html, "<figcaption>Energy return, electricity out over primary energy spent: ")[1:] {
		four, _, _ := strings.Cut(part, "<caption>Account: ")
		size += len(four)
	}
	if size > 120_000*seen {
		t.Errorf("the pictures of accounts take %d bytes of each of %d candidates", size/seen, seen)
	} else {
		t.Logf("%d bytes for each of %d candidates", size/seen, seen)
	}
}
