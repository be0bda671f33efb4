package term

import (
	"bytes"
	"context"
	"encoding/json"
	"errors"
	"fmt"
	"io"
	"math"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"testing"
	"time"

	"groundtally/app/files"
	"groundtally/app/present"
	"groundtally/app/run"
	"groundtally/app/store"
	"groundtally/app/study"
)

// bench is a terminal program with buffers, over the small district.
type bench struct {
	t        *testing.T
	app      *App
	out, err bytes.Buffer
	study    string
}

func newBench(t *testing.T) *bench {
	t.Helper()
	fsys := os.DirFS("../../assets")
	catalog, err := study.LoadCatalog(fsys)
	if err != nil {
		t.Fatal(err)
	}
	params, err := run.LoadParams(fsys, catalog)
	if err != nil {
		t.Fatal(err)
	}
	b := &bench{t: t, study: filepath.Join(t.TempDir(), "s.gpkg")}
	b.app = &App{
		Out: &b.out, Err: &b.err, Create: store.Create, OpenFile: store.Open, ReadFile: files.Import,
		Write: func(path string, data []byte) error {
			return files.Write(path, func(w io.Writer) error {
				_, err := w.Write(data)
				return err
			})
		},
		Catalog: catalog, Params: params, Tools: files.NewTools,
		Clock: func() time.Time { return time.Date(2025, 5, 3, 12, 0, 0, 0, time.UTC) }, Who: "tester", Version: "test",
	}
	return b
}

// run runs a verb on the study; the study's name is put behind the verb.
func (b *bench) run(want int, verb string, args ...string) string {
	b.t.Helper()
	return b.runWith(b.t.Context(), want, append([]string{verb, b.study}, args...)...)
}

func (b *bench) runWith(ctx context.Context, want int, words ...string) string {
	b.t.Helper()
	b.out.Reset()
	b.err.Reset()
	if code := b.app.Run(ctx, words); code != want {
		b.t.Fatalf("gtally %s: exit %d, want %d\n%s\n%s", strings.Join(words, " "), code, want, b.out.String(), b.err.String())
	}
	return b.out.String()
}

const small = "../../testdata/scripts/small/"

// district fills the study with the small district, two plant options and a voice.
func (b *bench) district() {
	b.t.Helper()
	b.run(0, "new", "--quiet")
	for _, l := range []string{"parcels", "dwellings", "roads", "grid_lines", "substations", "soil", "habitat"} {
		b.run(0, "add", small+l+".geojson", "--as", l, "--accept-proposals", "--complete", "--quiet")
	}
	set := map[string]string{"wind.typed_mean_speed_m_per_s": "7.2", "plant.wind.technology": "wind", "plant.wind.hub_height_m": "110", "plant.wind.rotor_diameter_m": "130", "plant.wind.rated_kw": "3370",
		"plant.sun.technology": "solar_fixed", "rule.setback.dwellings.wind_m": "500", "rule.exclude.habitat": "yes", "run.trials": "50",
		"voice.a.weight.nearest_dwelling_m": "100", "voice.a.weight.net_share": "50", "voice.a.weight.noise_dba": "50", "voice.a.both.noise": "test"}
	for i, sun := range []int{22, 40, 80, 118, 150, 155, 152, 130, 90, 52, 27, 17} {
		set[fmt.Sprintf("solar.typed_ghi_%d_kwh_per_m2", i+1)] = fmt.Sprint(sun)
		set[fmt.Sprintf("solar.typed_temperature_%d_degc", i+1)] = "9"
	}
	for _, k := range sortedKeys(set) {
		b.run(0, "set", k, set[k], "--quiet")
	}
}

func object(t *testing.T, text string) map[string]any {
	t.Helper()
	var m map[string]any
	if err := json.Unmarshal([]byte(text), &m); err != nil {
		t.Fatalf("%v in %s", err, text)
	}
	return m
}

func number(t *testing.T, m map[string]any, key string) float64 {
	t.Helper()
	x, ok := m[key].(float64)
	if !ok {
		t.Fatalf("%s is %v, not a number", key, m[key])
	}
	return x
}

// The JSON of a candidate has the fields and meanings that scripts of others rely on.
func TestTableJSON(t *testing.T) {
	b := newBench(t)
	b.district()
	table := object(t, b.run(0, "table", "--json"))
	if number(t, table, "hours_per_year") != 8760 || table["study"] != b.study {
		t.Errorf("study %v, hours %v", table["study"], table["hours_per_year"])
	}
	candidates := table["candidates"].([]any)
	if len(candidates) != 24 || number(t, table, "of") != 24 {
		t.Fatalf("%d candidates of %v", len(candidates), table["of"])
	}
	ranges := []string{"p10_p90", "bounds", "corners", "layer_tolerance", "none"}
	accounts := []string{"energy", "land", "climate", "neighbours", "grid", "own"}
	states := map[string]int{}
	for _, x := range candidates {
		c := x.(map[string]any)
		id := fmt.Sprint(c["site"], "/", c["plant"])
		for _, field := range []string{"site", "parcels", "plant", "technology", "status", "consequences", "gates", "incomplete", "taken", "taken_shared_ha", "shape_ha"} {
			if c[field] == nil {
				t.Errorf("%s has no %s", id, field)
			}
		}
		if !slices.Contains([]string{"fitted", "no_room", "not_computed"}, c["status"].(string)) {
			t.Errorf("%s: status %v", id, c["status"])
		}
		if c["gates"].(map[string]any)["owner_consent"].(map[string]any)["state"] == nil {
			t.Errorf("%s: the owner's consent has no state", id)
		}
		cons := c["consequences"].(map[string]any)
		for key, y := range cons {
			q := y.(map[string]any)
			var kinds []string
			for _, kind := range []string{"central", "unknown", "not_set", "none", "never", "class"} {
				if _, ok := q[kind]; ok {
					kinds = append(kinds, kind)
				}
			}
			if len(kinds) != 1 {
				t.Errorf("%s %s is %v, want exactly one kind", id, key, kinds)
				continue
			}
			states[kinds[0]]++
			if _, ok := q["unit"].(string); !ok || !slices.Contains(accounts, q["account"].(string)) || q["notices"] == nil {
				t.Errorf("%s %s: %v", id, key, q)
			}
			if kinds[0] == "central" {
				if !slices.Contains(ranges, q["range"].(string)) {
					t.Errorf("%s %s: range %v", id, key, q["range"])
				}
				if number(t, q, "low") > number(t, q, "high") {
					t.Errorf("%s %s: low above high", id, key)
				}
			}
		}
		gross := number(t, cons["gross_area_ha"].(map[string]any), "central")
		sum := number(t, cons["buildable_area_ha"].(map[string]any), "central") + number(t, c, "taken_shared_ha") + number(t, c, "shape_ha")
		for _, y := range c["taken"].([]any) {
			sum += number(t, y.(map[string]any), "alone_ha")
		}
		if math.Abs(gross-sum) > 1e-6*gross {
			t.Errorf("%s: the parts add up to %v ha, the site has %v ha", id, sum, gross)
		}
		if c["status"] == "fitted" {
			fit := c["fit"].(map[string]any)
			if number(t, fit, "rated_kw") <= 0 || fit["mode"] != "fill" || fit["turbines"] == nil {
				t.Errorf("%s: fit %v", id, fit)
			}
			for _, y := range fit["turbines"].([]any) {
				number(t, y.(map[string]any), "lon")
				number(t, y.(map[string]any), "lat")
			}
		}
	}
	for _, kind := range []string{"central", "unknown", "none", "not_set"} {
		if states[kind] == 0 {
			t.Errorf("no consequence is %q", kind)
		}
	}
}

// Shares add up to the score; an unknown part has no value, counts half its weight and spans it.
func TestOrderJSON(t *testing.T) {
	b := newBench(t)
	b.district()
	order := object(t, b.run(0, "order", "--json"))
	voices := order["voices"].([]any)
	if len(voices) != 1 {
		t.Fatalf("%d voices", len(voices))
	}
	v := voices[0].(map[string]any)
	for _, field := range []string{"voice", "title", "order", "tipping", "held_back", "notices"} {
		if v[field] == nil {
			t.Errorf("the voice has no %s", field)
		}
	}
	nothing, unknown := 0, 0
	last := math.Inf(1)
	for i, x := range v["order"].([]any) {
		r := x.(map[string]any)
		for _, field := range []string{"place", "tier", "site", "plant", "score", "score_low", "score_high", "rank_best", "rank_worst", "can_be_first", "parts", "accounts", "over_limit", "unknown", "incomplete", "first_in_100", "dominated_by"} {
			if r[field] == nil {
				t.Errorf("row %d has no %s", i+1, field)
			}
		}
		if r["site"] == "none" {
			nothing++
		}
		score := number(t, r, "score")
		if score > last {
			t.Errorf("row %d scores more than the one before", i+1)
		}
		last = score
		sum, accounts := 0.0, 0.0
		for key, y := range r["parts"].(map[string]any) {
			p := y.(map[string]any)
			sum += number(t, p, "share")
			if p["value"] == nil {
				unknown++
				w := number(t, p, "weight")
				if math.Abs(number(t, p, "share")-w/2) > 1e-12 || number(t, p, "share_low") != 0 || number(t, p, "share_high") != w || !slices.Contains(r["unknown"].([]any), any(key)) {
					t.Errorf("row %d, unknown part %s: %v", i+1, key, p)
				}
			}
		}
		for _, y := range r["accounts"].(map[string]any) {
			accounts += y.(float64)
		}
		if math.Abs(sum-score) > 1e-9 || math.Abs(accounts-score) > 1e-9 {
			t.Errorf("row %d: score %v, parts %v, accounts %v", i+1, score, sum, accounts)
		}
	}
	if nothing != 1 || unknown == 0 {
		t.Errorf("%d rows for doing nothing, %d unknown parts", nothing, unknown)
	}
	top := object(t, b.run(0, "order", "--json", "--top", "2", "--voice", "a"))
	if n := len(top["voices"].([]any)[0].(map[string]any)["order"].([]any)); n != 2 {
		t.Errorf("--top 2 gives %d rows", n)
	}
}

// A figure that why prints can be done again from the figures printed below it.
func TestWhyCanBeRedone(t *testing.T) {
	b := newBench(t)
	b.district()
	u := object(t, b.run(0, "why", "S-06", "wind", "eroi_delivered", "--json"))["unfolding"].(map[string]any)
	in := map[string]float64{}
	for _, x := range u["inputs"].([]any) {
		i := x.(map[string]any)
		in[i["name"].(string)] = number(t, i, "value")
	}
	want := in["delivered_mj_life"] / in["input_delivered_mj"]
	if got := number(t, u, "value"); math.Abs(got-want) > 1e-9*want || want == 0 {
		t.Errorf("EROI %v, from its inputs %v", got, want)
	}
	text := b.run(0, "why", "S-06", "wind", "eroi_delivered")
	for _, line := range []string{"eroi_delivered = " + figure(want), "delivered_mj_life = " + figure(in["delivered_mj_life"]) + " MJ", "input_delivered_mj = " + figure(in["input_delivered_mj"]) + " MJ"} {
		if !strings.Contains(text, line) {
			t.Errorf("no %q in\n%s", line, text)
		}
	}
	// The loss chain: each step is the one before times one minus its share, up to the yield that is used.
	cand := object(t, b.run(0, "why", "S-06", "wind", "--json"))["candidate"].(map[string]any)
	after := 0.0
	for i, x := range cand["chain"].([]any) {
		st := x.(map[string]any)
		if i > 0 && number(t, st, "before") != after {
			t.Errorf("step %v begins with %v, the one before ends with %v", st["name"], st["before"], after)
		}
		after = number(t, st, "after")
		if redone := number(t, st, "before") * (1 - number(t, st, "share")); math.Abs(redone-after) > 1e-9*after {
			t.Errorf("step %v: %v, redone %v", st["name"], after, redone)
		}
	}
	if p50 := number(t, cand["consequences"].(map[string]any)["energy_p50_mwh_per_yr"].(map[string]any), "central"); math.Abs(p50-after) > 1e-9*after {
		t.Errorf("yield %v, chain ends with %v", p50, after)
	}
}

// A candidate with turbines says how they came to stand where they stand, right below its fit; the figures are
// those of the layout in JSON.
func TestWhyTellsTheLayout(t *testing.T) {
	b := newBench(t)
	b.district()
	b.run(0, "group", "four", "S-05", "S-06", "S-07", "S-08")
	layoutOf := func(site, plant string) (layout map[string]any, turbines int) {
		fit := object(t, b.run(0, "why", site, plant, "--json"))["candidate"].(map[string]any)["fit"].(map[string]any)
		layout, _ = fit["layout"].(map[string]any)
		return layout, len(fit["turbines"].([]any))
	}
	tells := func(site string, want ...string) {
		t.Helper()
		text := b.run(0, "why", site, "wind")
		_, rest, _ := strings.Cut(text, "\n  fit (")
		_, rest, _ = strings.Cut(rest, "\n")
		got, _, ok := strings.Cut(rest, "  connection: ")
		if said := "    " + strings.Join(want, "\n    ") + "\n"; !ok || got != said {
			t.Errorf("%s tells of its layout\n%s\nwant\n%s\nin\n%s", site, got, said, text)
		}
	}
	wanted := func(l map[string]any) string {
		if l["asked_by"] != "spare capacity" {
			t.Errorf("asked by %v", l["asked_by"])
		}
		return fmt.Sprintf("Wanted at most: %.0f (by the spare capacity of the network).", number(t, l, "asked"))
	}
	nearest := func(l map[string]any) string {
		return fmt.Sprintf("The two nearest to each other stand at %.2f times the distance of the spacing rule.", number(t, l, "spacing_met"))
	}

	l, n := layoutOf("four", "wind")
	if n < 2 {
		t.Fatalf("%d turbines, so this test shows little", n)
	}
	bound := number(t, l, "bound_mwh")
	tells("four", fmt.Sprintf("Found by: %s.", l["how"]), wanted(l), nearest(l),
		fmt.Sprintf("Energy behind wakes: %.1f %% below the bound of %s MWh a year (%.0f turbines without any wake), before losses.", 100*(1-number(t, l, "waked_mwh")/bound), present.Figure(bound, bound, bound), number(t, l, "most_by_rule")))

	// One turbine is as good as its bound, which says nothing.
	if l, n = layoutOf("S-01", "wind"); n != 1 || number(t, l, "bound_mwh") != number(t, l, "waked_mwh") {
		t.Fatalf("%d turbines, %v", n, l)
	}
	tells("S-01", fmt.Sprintf("Found by: %s.", l["how"]), fmt.Sprintf("Most that the spacing allows: 1 at most (%s).", l["most_by"]), wanted(l))

	b.run(0, "place", "S-01", "wind", "--turbines", "-19.998,50.002 -19.996,50.003", "--reason", "off the path")
	l, _ = layoutOf("S-01", "wind")
	broken := l["broken"].([]any)
	if l["how"] != "by hand" || l["reason"] != "off the path" || len(broken) != 3 {
		t.Fatalf("%v", l)
	}
	by := func(i int) float64 { return math.Ceil(number(t, broken[i].(map[string]any), "by_m")) }
	tells("S-01", "Placed by hand: off the path", wanted(l), nearest(l),
		fmt.Sprintf("rule not kept: Turbine 1 stands %.0f m outside the buildable ground", by(0)),
		fmt.Sprintf("rule not kept: Turbine 2 stands %.0f m outside the buildable ground", by(1)),
		fmt.Sprintf("rule not kept: Turbine 2 stands %.0f m nearer to turbine 1 than the spacing allows", by(2)))

	if l, n = layoutOf("S-01", "sun"); l != nil || n != 0 {
		t.Errorf("%d turbines of panels, %v", n, l)
	}
	for _, args := range [][]string{{"S-01", "sun"}, {"S-01", "wind", "turbine_count"}} {
		if text := b.run(0, "why", args...); strings.Contains(text, "Placed by hand") || strings.Contains(text, "Found by") || strings.Contains(text, "spacing") {
			t.Errorf("%v: a layout in\n%s", args, text)
		}
	}
}

// Where no plant was fitted there is no figure, and above all no zero.
func TestWhyWithoutRoom(t *testing.T) {
	b := newBench(t)
	b.district()
	b.run(0, "set", "rule.setback.dwellings.wind_m", "5000")
	text := b.run(0, "why", "S-06", "wind", "eroi_delivered")
	if !strings.Contains(text, "no figure, since no plant was fitted (without room)") || strings.Contains(text, "= 0") {
		t.Errorf("%s", text)
	}
	u := object(t, b.run(0, "why", "S-06", "wind", "eroi_delivered", "--json"))["unfolding"].(map[string]any)
	if u["state"] != "no_room" || u["value"] != nil {
		t.Errorf("%v", u)
	}
	for _, want := range []string{"S-06 with wind: without room", "nearest miss: 0.00 ha buildable", "distance from dwellings takes most", "it would take the whole site"} {
		if text := b.run(0, "why", "S-06", "wind"); !strings.Contains(text, want) {
			t.Errorf("no %q in\n%s", want, text)
		}
	}
	table := b.run(0, "table", "--plant", "wind", "--keys", "eroi_delivered", "--top", "1")
	if !strings.Contains(table, "no room          .") {
		t.Errorf("%s", table)
	}
}

// What is disputed and the formulas are told account by account.
func TestMethods(t *testing.T) {
	b := newBench(t)
	b.district()
	text := b.run(0, "methods", "--account", "land")
	for _, want := range []string{"LAND", "Soil under panels", "Here: ", "Source: ", "Formulas in force", "footprint_direct_ha: "} {
		if !strings.Contains(text, want) {
			t.Errorf("no %q in\n%s", want, text)
		}
	}
	if strings.Contains(text, "Average or marginal grid") {
		t.Error("climate is told under land")
	}
	accounts := object(t, b.run(0, "methods", "--json"))["accounts"].([]any)
	if len(accounts) != 3 {
		t.Fatalf("%d accounts", len(accounts))
	}
	for _, a := range accounts {
		if m := a.(map[string]any); len(m["disputed"].([]any)) == 0 || len(m["formulas"].([]any)) == 0 {
			t.Errorf("nothing of %v", m["account"])
		}
	}
	b.run(2, "methods", "--account", "money")
}

// Every verb answers in JSON and in text, with nothing else on standard output.
func TestEveryVerbInJSON(t *testing.T) {
	b := newBench(t)
	b.district()
	out := filepath.Join(t.TempDir(), "out")
	notes := filepath.Join(t.TempDir(), "notes.csv")
	rows := "parcel,note\n"
	for n := range 12 {
		rows += fmt.Sprintf("S-%02d,seen\n", n+1)
	}
	if err := os.WriteFile(notes, []byte(rows), 0o600); err != nil {
		t.Fatal(err)
	}
	heights := filepath.Join(t.TempDir(), "heights.asc")
	if err := os.WriteFile(heights, []byte("ncols 40\nnrows 40\nxllcorner -20.1\nyllcorner 49.95\ncellsize 0.005\n"+strings.Repeat("1 2 3 4 5 6 7 8 9 10 ", 160)+"\n"), 0o600); err != nil {
		t.Fatal(err)
	}
	b.run(0, "add", heights, "--as", "terrain", "--crs", "EPSG:4326", "--quiet")
	runs := map[string][]string{
		"add": {small + "soil.geojson", "--as", "soil", "--name", "more"}, "remove": {"more"}, "group": {"--by", "farm"},
		"set": {"run.seed", "7"}, "get": nil, "undo": nil, "redo": nil, "journal": nil, "freeze": {"now"}, "check": nil, "compute": nil, "table": {"--top", "1"},
		"why": {"south", "sun"}, "register": nil, "requests": nil, "coverage": nil, "methods": nil, "terrain": {"--site", "south"}, "left": {"--plant", "wind"}, "join": {"parcels", notes, "--key", "parcel"}, "draw": {"barns", "--as", "exclusion", "--shape", "-20.0,50.0", "--set", "reason=test", "--set", "setback=10", "--reason", "test"},
		"place": {"barns", "hand-1", "--shape", "-20.001,50.0", "--reason", "test"}, "turbine": nil, "export": {"parcels", "--to", filepath.Join(t.TempDir(), "p.gpkg")}, "order": nil, "appendix": {"--to", out}, "verify": {"--appendix", out},
	}
	for _, v := range verbs()[1:] { // new comes first by itself
		if v.name == "convert" { // it needs no study
			continue
		}
		args, ok := runs[v.name]
		if !ok {
			t.Fatalf("the verb %s is not tried", v.name)
		}
		m := object(t, b.run(0, v.name, append(slices.Clone(args), "--json", "--quiet")...))
		if m["study"] != b.study {
			t.Errorf("%s: study %v", v.name, m["study"])
		}
		if b.err.Len() > 0 {
			t.Errorf("%s --quiet says: %s", v.name, b.err.String())
		}
	}
	m := object(t, b.runWith(t.Context(), 0, "new", filepath.Join(t.TempDir(), "n.gpkg"), "--json"))
	if m["study"] == nil || m["layers"] == nil {
		t.Errorf("new: %v", m)
	}
	if text := b.run(0, "verify", "--appendix", out); !strings.HasPrefix(text, "identical\n") {
		t.Errorf("verify says %q", text)
	}
}

// An error in JSON is an object with the exit code, and questions where there are some.
func TestErrorsInJSON(t *testing.T) {
	b := newBench(t)
	b.run(0, "new")
	m := object(t, b.run(2, "compute", "--json"))
	if number(t, m, "exit") != 2 || len(m["questions"].([]any)) != 2 || m["error"] == nil {
		t.Errorf("%v", m)
	}
	if q := m["questions"].([]any)[0].(map[string]any); q["option"] != "gtally add "+shellWord(b.study)+" FILE --as parcels" {
		t.Errorf("%v", q)
	}
	for _, words := range [][]string{{"nothing", "--json"}, {"get", "--json"}, {"get", b.study, "--frob", "--json"}, {"help", "nothing", "--json"}} {
		if m := object(t, b.runWith(t.Context(), 2, words...)); number(t, m, "exit") != 2 || m["error"] == "" {
			t.Errorf("%v: %v", words, m)
		}
	}
}

func TestInterrupted(t *testing.T) {
	b := newBench(t)
	b.district()
	ctx, cancel := context.WithCancel(t.Context())
	cancel()
	b.runWith(ctx, ExitInterrupted, "compute", b.study)
	if !strings.Contains(b.err.String(), "stopped; the study is as it was") {
		t.Errorf("%s", b.err.String())
	}
	fresh := filepath.Join(t.TempDir(), "n.gpkg")
	b.app.Sample = func(context.Context, *study.Study, study.Tools, func(study.LayerRecord)) error {
		return context.Canceled
	}
	b.runWith(t.Context(), ExitInterrupted, "new", fresh, "--sample")
	if _, err := os.Stat(fresh); !errors.Is(err, os.ErrNotExist) {
		t.Errorf("a half-made study was left: %v", err)
	}
}

// A fault of the program is caught: the study stays, and the details lie in a file.
func TestFaultIsCaught(t *testing.T) {
	t.Setenv("TMPDIR", t.TempDir())
	b := newBench(t)
	b.run(0, "new")
	b.app.ReadFile = func(context.Context, string, study.ReadOptions) (study.Import, error) { panic("broken on purpose") }
	b.run(ExitUnexpected, "add", small+"soil.geojson", "--as", "soil")
	said := b.err.String()
	_, path, ok := strings.Cut(strings.TrimSpace(said), "The details are in ")
	if !ok || !strings.Contains(said, "broken on purpose") || strings.Contains(said, "goroutine") {
		t.Fatalf("%s", said)
	}
	if details, err := os.ReadFile(path); err != nil || !strings.Contains(string(details), "goroutine") {
		t.Errorf("%v: %s", err, details)
	}
	b.run(0, "get", "run.seed")
	err := computing(errors.New("fault in item 3: index out of range\ngoroutine 7 [running]:\nmain.main()"))
	var fault *faultError
	if !errors.As(err, &fault) || fault.what != "fault in item 3: index out of range" {
		t.Errorf("%v", err)
	}
}

// shut is a writer that takes nothing.
type shut struct{}

func (shut) Write([]byte) (int, error) { return 0, errors.New("no space left") }

func TestAnswerThatDoesNotArrive(t *testing.T) {
	b := newBench(t)
	b.run(0, "new")
	b.app.Out = shut{}
	b.run(ExitUnexpected, "get")
	if !strings.Contains(b.err.String(), "the answer could not be written: no space left") {
		t.Errorf("%s", b.err.String())
	}
}

// Results that cannot be kept are still given.
func TestResultsThatCannotBeKept(t *testing.T) {
	b := newBench(t)
	b.district()
	plain := b.run(0, "table", "--json")
	b.run(0, "set", "run.seed", "1", "--reason", "nothing but a reason")
	for _, kind := range []error{study.ErrReadOnly, study.ErrDiskFull, study.ErrBusy} {
		b.app.OpenFile = func(ctx context.Context, path string) (study.Store, error) {
			s, err := store.Open(ctx, path)
			return &stubborn{s, kind}, err
		}
		if got := b.run(0, "table", "--json"); got != plain {
			t.Errorf("%v: the table differs", kind)
		}
		if !strings.Contains(b.err.String(), "The results are not kept in the study") {
			t.Errorf("%v: nothing is said: %s", kind, b.err.String())
		}
	}
	b.app.OpenFile = func(ctx context.Context, path string) (study.Store, error) {
		s, err := store.Open(ctx, path)
		return &stubborn{s, study.ErrDamaged}, err
	}
	b.run(ExitUnreadable, "table")
}

// stubborn is a store that has no results and keeps none.
type stubborn struct {
	study.Store
	err error
}

func (s *stubborn) Results(context.Context, string, []string) (map[string][]byte, error) {
	return map[string][]byte{}, nil
}

func (s *stubborn) PutResults(context.Context, []study.Result, map[string]map[string]bool) error {
	return fmt.Errorf("keep: %w", s.err)
}

// What stands in the way of computing is asked for with the exact lines that answer.
func TestUnanswered(t *testing.T) {
	b := newBench(t)
	b.district()
	for _, c := range []struct{ take, value, asks, option string }{
		{"plant.wind.hub_height_m", "", "how large is the machine", "plant.wind.hub_height_m NUMBER"},
		{"plant.sun.technology", "not set", `which technology has the plant option "sun"`, "plant.sun.technology TECHNOLOGY"},
		{"solar.typed_temperature_7_degc", "", "all twelve months", "solar.typed_temperature_7_degc NUMBER"},
		{"solar.typed_ghi_1_kwh_per_m2", "", "all twelve months", "solar.typed_ghi_1_kwh_per_m2 NUMBER"},
		{"plant.wind.fit", "machines", "fitted by machines; up to how much", "plant.wind.fit_machines NUMBER"},
	} {
		if c.value == "" {
			b.run(0, "set", c.take, "--default")
		} else {
			b.run(0, "set", c.take, c.value)
		}
		b.run(2, "compute")
		if said := b.err.String(); !strings.Contains(said, c.asks) || !strings.Contains(said, "gtally set "+shellWord(b.study)+" "+c.option) {
			t.Errorf("%s: %s", c.take, said)
		}
		if out := b.run(1, "check"); !strings.Contains(out, c.asks) {
			t.Errorf("%s: check does not ask", c.take)
		}
		b.run(0, "undo")
	}
	b.run(0, "compute")
}

func TestFigure(t *testing.T) {
	for x, want := range map[float64]string{0: "0", 1: "1", 6.601361e9: "6 601 360 000", 206049123: "206 049 000", 12345.678: "12 345.7", 1234.5678: "1234.57", 0.0035: "0.0035", 32.03781: "32.0378",
		-12345.6: "-12 345.6", 1e-7: "1e-07", 0.00706862166: "0.00706862", 999999.6: "1 000 000"} {
		if got := figure(x); got != want {
			t.Errorf("figure(%v) = %q, want %q", x, got, want)
		}
	}
}

func TestStacked(t *testing.T) {
	got := stacked([]string{"rated_kw", "footprint_direct_ha_per_gwh"}, 12)
	want := [][]string{{"", "footprint_"}, {"", "direct_ha_"}, {"rated_kw", "per_gwh"}}
	if fmt.Sprint(got) != fmt.Sprint(want) {
		t.Errorf("%v", got)
	}
}

func TestParse(t *testing.T) {
	options := []option{{name: "top", value: "N"}, {name: "json"}, {name: "match", value: "A=B", many: true}}
	a, err := parse([]string{"one", "--match", "a=b", "--top=3", "--match=c=d", "--", "--json"}, options)
	if err != nil || fmt.Sprint(a.places) != "[one --json]" || a.get("top") != "3" || a.has("json") {
		t.Errorf("%v, %v", a, err)
	}
	if m, err := a.pairs("match"); err != nil || m["a"] != "b" || m["c"] != "d" {
		t.Errorf("%v, %v", m, err)
	}
	for _, bad := range [][]string{{"--frob"}, {"--top"}, {"--top", "--json"}, {"--json=1"}, {"--top", "1", "--top", "2"}, {"-j"}} {
		var usage *usageError
		if _, err := parse(bad, options); !errors.As(err, &usage) {
			t.Errorf("%v: %v", bad, err)
		}
	}
	if a, err := parse([]string{"-5"}, options); err != nil || len(a.places) != 1 {
		t.Errorf("a negative number: %v, %v", a, err)
	}
}

func TestShellWord(t *testing.T) {
	for in, want := range map[string]string{"a.gpkg": "a.gpkg", "a b": "'a b'", "it's": `'it'\''s'`, "": "''"} {
		if got := shellWord(in); got != want {
			t.Errorf("%q: %s, want %s", in, got, want)
		}
	}
}

// Help, summaries and options are plain words without typographic dashes.
func TestHelpOfEveryVerb(t *testing.T) {
	b := newBench(t)
	for _, v := range verbs() {
		for _, words := range [][]string{{"help", v.name}, {v.name, "--help"}} {
			text := b.runWith(t.Context(), 0, words...)
			if !strings.HasPrefix(text, "gtally "+v.usage) || !strings.Contains(text, "--json") || strings.ContainsAny(text, "\u2013\u2014") {
				t.Errorf("%v: %s", words, text)
			}
			for _, o := range v.options {
				if o.help == "" || !strings.Contains(text, "--"+o.name) {
					t.Errorf("%s: option %s", v.name, o.name)
				}
			}
		}
	}
}
