package store

import (
	"bufio"
	"bytes"
	"context"
	"database/sql"
	"encoding/json"
	"errors"
	"fmt"
	"math"
	"math/rand/v2"
	"os"
	"os/exec"
	"path/filepath"
	"reflect"
	"runtime"
	"sort"
	"strconv"
	"strings"
	"sync"
	"testing"
	"time"

	"groundtally/app/study"
	"groundtally/geo"
)

const childVariable = "GROUNDTALLY_STORE_TEST_CHILD"

func TestMain(m *testing.M) {
	if path := os.Getenv(childVariable); path != "" {
		commitForEver(path)
	}
	os.Exit(m.Run())
}

var (
	ctx  = context.Background()
	noon = time.Date(2026, 5, 3, 12, 0, 0, 0, time.UTC)
)

func newStudy(t testing.TB) (study.Store, string) {
	t.Helper()
	path := filepath.Join(t.TempDir(), "a study, 100% #1?.gpkg")
	s, err := Create(ctx, path)
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { closeStore(t, s) })
	return s, path
}

func closeStore(t testing.TB, s study.Store) {
	t.Helper()
	if err := s.Close(); err != nil {
		t.Error(err)
	}
}

func reopen(t testing.TB, path string) study.Store {
	t.Helper()
	s, err := Open(ctx, path)
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { closeStore(t, s) })
	return s
}

func set(key, before, after string) study.Change {
	c := study.Change{Kind: study.SettingRecord, Key: key}
	if before != "" {
		c.Old = json.RawMessage(before)
	}
	if after != "" {
		c.New = json.RawMessage(after)
	}
	return c
}

func entry(verb string, changes ...study.Change) study.Entry {
	return study.Entry{At: noon, Who: "Ada", Verb: verb, Reason: "because", Changes: changes}
}

func version(l *geo.Layer) study.Version {
	return study.Version{Digest: study.LayerDigest(l), Layer: l}
}

func ring(v ...float64) []geo.LonLat {
	r := make([]geo.LonLat, 0, len(v)/2)
	for i := 0; i+1 < len(v); i += 2 {
		r = append(r, geo.LonLat{Lon: v[i], Lat: v[i+1]})
	}
	return r
}

type parts = [][][]geo.LonLat

// awkward holds one layer for each thing that a table could lose.
func awkward() map[string]*geo.Layer {
	text, num, yes := geo.TextValue, geo.NumberValue, geo.BoolValue
	null := geo.Value{}
	square := geo.LonLatGeometry{Kind: geo.Polygons, Parts: parts{{ring(0, 0, 3, 0, 3, 3, 0, 0), ring(1, 1, 2, 2, 2, 1, 1, 1)}}}
	pair := geo.LonLatGeometry{Kind: geo.Polygons, Parts: append(parts{{ring(9, 9, 10, 9, 10, 10, 9, 9)}}, square.Parts...)}
	point := geo.LonLatGeometry{Kind: geo.Points, Parts: parts{{ring(-27.01, 47.51)}}}
	line := geo.LonLatGeometry{Kind: geo.Lines, Parts: parts{{ring(0.1, 0.30000000000000004, 1.0/3, 2)}}}
	cols := func(names ...string) []geo.Column {
		out := make([]geo.Column, len(names))
		for i, n := range names {
			out[i].Name = n
		}
		return out
	}
	wide := &geo.Layer{Name: "wide"}
	for i := range maxColumns {
		wide.Columns = append(wide.Columns, geo.Column{Name: fmt.Sprintf("c%d", i)})
	}
	wide.Features = []geo.Feature{{ID: "1", Values: make([]geo.Value, maxColumns)}}
	wide.Features[0].Values[maxColumns-1] = num(7)
	return map[string]*geo.Layer{
		"no feature":    {Name: "nothing", Columns: cols("a")},
		"no column":     {Name: "bare", Features: []geo.Feature{{ID: "x", Geometry: point}}},
		"table only":    {Name: "table", Columns: cols("a"), Features: []geo.Feature{{ID: "1", Values: []geo.Value{text("v")}}}},
		"units":         {Name: "units", Columns: []geo.Column{{Name: "height", Unit: "m"}, {Name: "owner", Personal: true}}, Features: []geo.Feature{{ID: "1", Values: []geo.Value{num(1.5), text("Ada")}, Geometry: point}}},
		"kinds":         {Name: "kinds", Columns: cols("t", "n", "b", "nothing", "mixed"), Features: []geo.Feature{{ID: "1", Values: []geo.Value{text(""), num(0), yes(false), null, text("1")}}, {ID: "2", Values: []geo.Value{null, null, null, null, num(1)}}, {ID: "3", Values: []geo.Value{text("null"), num(-1e300), yes(true), null, yes(true)}}, {ID: "4", Values: []geo.Value{text("007"), num(math.SmallestNonzeroFloat64), yes(true), null, null}}, {ID: "5", Values: []geo.Value{text("1e5"), num(9007199254740993), yes(true), null, text("true")}}}},
		"mixed numbers": {Name: "mixed", Columns: cols("m"), Features: []geo.Feature{{ID: "1", Values: []geo.Value{num(0.1 + 0.2)}}, {ID: "2", Values: []geo.Value{text("0.30000000000000004")}}, {ID: "3", Values: []geo.Value{num(math.Copysign(0, -1))}}, {ID: "4", Values: []geo.Value{num(1e21)}}, {ID: "5", Values: []geo.Value{yes(false)}}}},
		"bool, number":  {Name: "mixed", Columns: cols("m"), Features: []geo.Feature{{ID: "1", Values: []geo.Value{num(1)}}, {ID: "2", Values: []geo.Value{yes(true)}}}},
		"own names":     {Name: "names", Columns: cols("fid", "geom", "feature_id", "FID", "Name", "name", "NAME_2", "", "a\"b", "select", "rowid", "tab\there", "same", "same", "Straße", "STRASSE", "日本"), Features: []geo.Feature{{ID: "1", Geometry: point, Values: []geo.Value{num(7), text("g"), text("f"), text("F"), text("N"), text("n"), text("2"), text("empty"), text("q"), text("s"), num(3), text("tab"), text("1"), text("2"), text("ß"), text("SS"), text("j")}}}},
		"identifiers":   {Name: "ids", Features: []geo.Feature{{ID: ""}, {ID: "07"}, {ID: "7"}, {ID: "a'b\"c;--"}, {ID: "fid:1"}}},
		"odd text":      {Name: "a'b\"c\n", Columns: cols("t"), Features: []geo.Feature{{ID: "1", Values: []geo.Value{text("a\x00b")}}, {ID: "2", Values: []geo.Value{text("\xff\xfe")}}, {ID: "3", Values: []geo.Value{text("Größe 🜁\r\n")}}, {ID: "\x00", Values: []geo.Value{text("\x00")}}}},
		"many parts":    {Name: "multi", Features: []geo.Feature{{ID: "1", Geometry: pair}, {ID: "2", Geometry: square}}},
		"one part each": {Name: "single", Features: []geo.Feature{{ID: "1", Geometry: square}, {ID: "2", Geometry: square}}},
		"mixed kinds":   {Name: "all", Features: []geo.Feature{{ID: "1", Geometry: pair}, {ID: "2", Geometry: point}, {ID: "3", Geometry: line}, {ID: "4"}}},
		"empty shapes":  {Name: "empty", Features: []geo.Feature{{ID: "1", Geometry: geo.LonLatGeometry{Kind: geo.Polygons}}, {ID: "2", Geometry: square}, {ID: "3", Geometry: geo.LonLatGeometry{Kind: geo.Polygons, Parts: parts{{}}}}}},
		"only empty":    {Name: "empty", Features: []geo.Feature{{ID: "1", Geometry: geo.LonLatGeometry{Kind: geo.Lines}}, {ID: "2", Geometry: geo.LonLatGeometry{Kind: geo.Lines, Parts: parts{{{}}}}}}},
		"empty kinds":   {Name: "empty", Features: []geo.Feature{{ID: "1", Geometry: geo.LonLatGeometry{Kind: geo.Points}}, {ID: "2", Geometry: geo.LonLatGeometry{Kind: geo.Lines}}}},
		"no name":       {Name: "", Features: []geo.Feature{{ID: "1", Geometry: line}}},
		"wide":          wide,
	}
}

func TestLayersComeBackTheSame(t *testing.T) {
	s, path := newStudy(t)
	layers := awkward()
	names := make([]string, 0, len(layers))
	for name := range layers {
		names = append(names, name)
	}
	sort.Strings(names)
	for _, name := range names {
		if _, err := s.Commit(ctx, entry("add"), []study.Version{version(layers[name])}); err != nil {
			t.Fatalf("%s: %v", name, err)
		}
	}
	again := reopen(t, path)
	for _, name := range names {
		t.Run(name, func(t *testing.T) {
			want := layers[name]
			v, changed, err := again.Version(ctx, study.LayerDigest(want))
			if err != nil {
				t.Fatal(err)
			}
			if changed || study.LayerDigest(v.Layer) != study.LayerDigest(want) || v.Layer.Name != want.Name {
				t.Errorf("changed=%t\n got %+v\nwant %+v", changed, v.Layer, want)
			}
		})
	}
	if err := again.Check(ctx); err != nil {
		t.Error(err)
	}
}

// Any layer whatever, drawn with a fixed seed, keeps its digest.
func TestDrawnLayersKeepTheirDigest(t *testing.T) {
	s, _ := newStudy(t)
	for seed := range uint64(40) {
		l := drawLayer(seed)
		v := version(l)
		if _, err := s.Commit(ctx, entry("add"), []study.Version{v}); err != nil {
			t.Fatalf("seed %d: %v", seed, err)
		}
		back, changed, err := s.Version(ctx, v.Digest)
		if err != nil || changed {
			t.Fatalf("seed %d: changed=%t, %v\n got %+v\nwant %+v", seed, changed, err, back.Layer, l)
		}
	}
}

func drawLayer(seed uint64) *geo.Layer {
	r := rand.New(rand.NewPCG(seed, 1))
	l := &geo.Layer{Name: "drawn"}
	for i := range r.IntN(5) {
		l.Columns = append(l.Columns, geo.Column{Name: fmt.Sprintf("c%d", i)})
	}
	number := func() float64 {
		for {
			if f := math.Float64frombits(r.Uint64()); !math.IsNaN(f) && !math.IsInf(f, 0) {
				return f
			}
		}
	}
	position := func() geo.LonLat { return geo.LonLat{Lon: number(), Lat: number()} }
	for i := range r.IntN(12) {
		f := geo.Feature{ID: strconv.Itoa(i)}
		for range l.Columns {
			f.Values = append(f.Values, [...]geo.Value{{}, geo.TextValue(strconv.FormatFloat(number(), 'g', -1, 64)), geo.NumberValue(number()), geo.BoolValue(r.IntN(2) == 0)}[r.IntN(4)])
		}
		f.Geometry.Kind = geo.Kind(r.IntN(4))
		if f.Geometry.Kind != geo.NoGeometry {
			for range r.IntN(3) {
				rings := 1
				if f.Geometry.Kind == geo.Polygons {
					rings = r.IntN(3)
				}
				part := make([][]geo.LonLat, rings)
				for k := range part {
					n := 1
					if f.Geometry.Kind != geo.Points {
						n = r.IntN(5)
					}
					for range n {
						part[k] = append(part[k], position())
					}
				}
				f.Geometry.Parts = append(f.Geometry.Parts, part)
			}
		}
		l.Features = append(l.Features, f)
	}
	return l
}

func TestRefusedLayers(t *testing.T) {
	s, path := newStudy(t)
	one := func(f geo.Feature, cols ...geo.Column) *geo.Layer {
		return &geo.Layer{Name: "bad", Columns: cols, Features: []geo.Feature{f}}
	}
	cases := map[string]*geo.Layer{
		"too few values":   one(geo.Feature{ID: "1"}, geo.Column{Name: "a"}),
		"NaN":              one(geo.Feature{ID: "1", Values: []geo.Value{geo.NumberValue(math.NaN())}}, geo.Column{Name: "a"}),
		"infinite":         one(geo.Feature{ID: "1", Values: []geo.Value{geo.NumberValue(math.Inf(-1))}}, geo.Column{Name: "a"}),
		"unknown kind":     one(geo.Feature{ID: "1", Values: []geo.Value{{Kind: 9}}}, geo.Column{Name: "a"}),
		"NaN position":     one(geo.Feature{ID: "1", Geometry: geo.LonLatGeometry{Kind: geo.Points, Parts: parts{{ring(math.NaN(), 1)}}}}),
		"parts, no kind":   one(geo.Feature{ID: "1", Geometry: geo.LonLatGeometry{Parts: parts{{ring(1, 1)}}}}),
		"too many columns": {Name: "bad", Columns: make([]geo.Column, maxColumns+1)},
	}
	for name, l := range cases {
		_, err := s.Commit(ctx, entry("add", set("x", "", "1")), []study.Version{version(l)})
		if err == nil || !strings.Contains(err.Error(), `layer "bad"`) {
			t.Errorf("%s: error %v must name the layer", name, err)
		}
	}
	wrong := version(awkward()["units"])
	wrong.Digest = strings.Repeat("0", 64)
	if _, err := s.Commit(ctx, entry("add"), []study.Version{wrong}); err == nil {
		t.Error("a wrong digest was accepted")
	}
	if _, err := s.Commit(ctx, entry("add"), []study.Version{{Digest: "00", Blob: []byte("x")}}); err == nil {
		t.Error("a wrong digest of a blob was accepted")
	}
	st, err := reopen(t, path).Load(ctx)
	if err != nil || len(st.Journal) != 0 || len(st.Records) != 0 {
		t.Errorf("a refused commit left %+v, %v", st, err)
	}
}

func TestBlobs(t *testing.T) {
	s, _ := newStudy(t)
	for _, data := range [][]byte{nil, {}, []byte("ncols 2\x00\xff"), bytes.Repeat([]byte("long"), 300_000)} {
		v := study.Version{Digest: study.BlobDigest("text/x-ascii-grid", data), Blob: data, Media: "text/x-ascii-grid"}
		for range 2 { // the second time it is there already
			if _, err := s.Commit(ctx, entry("add"), []study.Version{v}); err != nil {
				t.Fatal(err)
			}
		}
		back, changed, err := s.Version(ctx, v.Digest)
		if err != nil || changed || back.Layer != nil || back.Media != v.Media || !bytes.Equal(back.Blob, data) {
			t.Errorf("%d bytes: changed=%t, %v", len(data), changed, err)
		}
	}
	if _, _, err := s.Version(ctx, "feed"); !errors.Is(err, study.ErrNotThere) {
		t.Errorf("unknown digest: %v", err)
	}
}

func TestStateComesBackTheSame(t *testing.T) {
	s, path := newStudy(t)
	var want study.State
	commit := func(e study.Entry) {
		t.Helper()
		got, err := s.Commit(ctx, e, nil)
		if err != nil {
			t.Fatal(err)
		}
		if got.Seq != int64(len(want.Journal)+1) {
			t.Fatalf("entry got number %d after %d entries", got.Seq, len(want.Journal))
		}
		want.Journal = append(want.Journal, got)
	}
	commit(entry("set", set("b", "", `{"x":"<&>","n":1.0}`), set("a", "", `null`)))
	commit(entry("set", set("b", `{"x":"<&>","n":1.0}`, `[1, 2]`), study.Change{Kind: study.MetaRecord, Key: "frame", New: json.RawMessage(`"z"`)}))
	commit(study.Entry{At: noon.Add(time.Nanosecond), Verb: "undo", Of: 2, Changes: []study.Change{set("b", `[1,2]`, `{"x":"<&>","n":1.0}`)}})
	commit(entry("take out", set("a", `null`, "")))
	commit(entry("nothing"))
	commit(entry("twice", set("t", "", `1`), set("t", `1`, `2`), set("u", "", `1`), set("u", "", `2`)))
	want.Records = []study.Record{
		{Kind: study.MetaRecord, Key: "frame", Value: json.RawMessage(`"z"`)},
		{Kind: study.SettingRecord, Key: "b", Value: json.RawMessage(`{"x":"<&>","n":1.0}`)},
		{Kind: study.SettingRecord, Key: "t", Value: json.RawMessage(`2`)},
		{Kind: study.SettingRecord, Key: "u", Value: json.RawMessage(`2`)},
	}
	want.Frozen = []study.Frozen{
		{Name: "z first", At: noon, Seq: 5, Code: "", Records: want.Records},
		{Name: "a later", At: noon.Add(time.Second / 2), Seq: 6, Code: "c0de"},
		{Name: "b later", At: noon.Add(time.Second / 2), Seq: 6},
	}
	for i := len(want.Frozen) - 1; i >= 0; i-- {
		if err := s.Freeze(ctx, want.Frozen[i]); err != nil {
			t.Fatal(err)
		}
	}
	if err := s.Freeze(ctx, study.Frozen{Name: "z first", At: noon}); !errors.Is(err, study.ErrNameInUse) {
		t.Errorf("second state of the same name: %v", err)
	}
	for name, st := range map[string]study.Store{"same": s, "reopened": reopen(t, path)} {
		got, err := st.Load(ctx)
		if err != nil {
			t.Fatal(err)
		}
		if !reflect.DeepEqual(got, want) {
			t.Errorf("%s:\n got %+v\nwant %+v", name, got, want)
		}
	}
}

func TestRefusedCommits(t *testing.T) {
	s, _ := newStudy(t)
	if _, err := s.Commit(ctx, entry("set", set("a", "", `{`)), nil); err == nil {
		t.Error("broken JSON was accepted")
	}
	if err := s.Freeze(ctx, study.Frozen{Name: "x", At: noon, Records: []study.Record{{Kind: "meta", Key: "k", Value: json.RawMessage(`{`)}}}); err == nil {
		t.Error("broken JSON was frozen")
	}
	if _, err := s.Commit(ctx, study.Entry{At: time.Date(10000, 1, 1, 0, 0, 0, 0, time.UTC)}, nil); err == nil {
		t.Error("a time that cannot be written was accepted")
	}
	gone, cancel := context.WithCancel(ctx)
	cancel()
	if _, err := s.Commit(gone, entry("set", set("a", "", `1`)), nil); !errors.Is(err, context.Canceled) {
		t.Errorf("cancelled commit: %v", err)
	}
	if st, err := s.Load(ctx); err != nil || len(st.Journal) != 0 || len(st.Frozen) != 0 {
		t.Errorf("something was written: %+v, %v", st, err)
	}
}

func TestResults(t *testing.T) {
	s, path := newStudy(t)
	put := func(keep map[string]map[string]bool, add ...study.Result) {
		t.Helper()
		if err := s.PutResults(ctx, add, keep); err != nil {
			t.Fatal(err)
		}
	}
	there := func() string {
		t.Helper()
		var out []string
		for _, step := range []string{"a", "b"} {
			got, err := reopen(t, path).Results(ctx, step, []string{"1", "2", "3", "4"})
			if err != nil {
				t.Fatal(err)
			}
			for d, v := range got {
				out = append(out, step+d+"="+string(v))
			}
		}
		sort.Strings(out)
		return strings.Join(out, " ")
	}
	step := func(s, d, v string) study.Result { return study.Result{Step: s, Digest: d, Data: []byte(v)} }
	put(nil, step("a", "1", "x"), step("a", "2", ""), step("b", "1", "y"), study.Result{Step: "b", Digest: "2"})
	if got := there(); got != "a1=x a2= b1=y b2=" {
		t.Fatal(got)
	}
	put(nil, step("a", "1", "new"))
	put(map[string]map[string]bool{"a": {"1": true, "3": true, "2": false}}, step("a", "3", "z"))
	if got := there(); got != "a1=new a3=z b1=y b2=" {
		t.Fatal(got)
	}
	put(map[string]map[string]bool{"b": {}})
	if got := there(); got != "a1=new a3=z" {
		t.Fatal(got)
	}
	put(nil)
	if got, err := s.Results(ctx, "a", nil); err != nil || len(got) != 0 {
		t.Errorf("no digest wanted: %v, %v", got, err)
	}
}

// Every statement of a commit fails in turn; after each failure the file is whole and as before.
func TestNthStatementFails(t *testing.T) {
	s, path := newStudy(t)
	f := s.(*file)
	first := version(awkward()["many parts"])
	if _, err := s.Commit(ctx, entry("add", set("a", "", `1`)), []study.Version{first}); err != nil {
		t.Fatal(err)
	}
	if err := s.PutResults(ctx, []study.Result{{Step: "s", Digest: "d", Data: []byte("r")}}, nil); err != nil {
		t.Fatal(err)
	}
	before, err := s.Load(ctx)
	if err != nil {
		t.Fatal(err)
	}
	second := version(awkward()["kinds"])
	blob := study.Version{Digest: study.BlobDigest("m", []byte("b")), Media: "m", Blob: []byte("b")}
	broken := errors.New("broken on purpose")
	writes := map[string]func() error{
		"commit": func() error {
			_, err := s.Commit(ctx, entry("set", set("a", `1`, `2`), set("b", "", `1`)), []study.Version{second, blob})
			return err
		},
		"freeze": func() error {
			return s.Freeze(ctx, study.Frozen{Name: "f", At: noon, Records: before.Records})
		},
		"results": func() error {
			return s.PutResults(ctx, []study.Result{{Step: "s", Digest: "e", Data: []byte("r")}, {Step: "s", Digest: "d", Data: []byte("other")}}, map[string]map[string]bool{"s": {"e": true}})
		},
	}
	for _, name := range []string{"results", "freeze", "commit"} {
		for n := 1; ; n++ {
			left := n
			f.fail = func() error {
				if left--; left == 0 {
					return broken
				}
				return nil
			}
			err := writes[name]()
			f.fail = nil
			if err == nil {
				if n < 3 {
					t.Errorf("%s: only %d places can fail", name, n-1)
				}
				break
			}
			if !errors.Is(err, broken) {
				t.Fatalf("%s, failure %d: %v", name, n, err)
			}
			unchanged(t, path, before, first.Digest, second.Digest, map[string][]byte{"d": []byte("r")}, name == "results")
		}
		if name == "freeze" {
			if before, err = s.Load(ctx); err != nil {
				t.Fatal(err)
			}
		}
	}
	after, err := reopen(t, path).Load(ctx)
	if err != nil || len(after.Journal) != len(before.Journal)+1 || len(after.Frozen) != 1 {
		t.Errorf("after the last, unbroken commit: %+v, %v", after, err)
	}
}

func unchanged(t *testing.T, path string, want study.State, there, notThere string, results map[string][]byte, withResults bool) {
	t.Helper()
	s, err := Open(ctx, path)
	if err != nil {
		t.Fatal(err)
	}
	defer closeStore(t, s)
	if err := s.Check(ctx); err != nil {
		t.Fatal(err)
	}
	got, err := s.Load(ctx)
	if err != nil || !reflect.DeepEqual(got, want) {
		t.Fatalf("state %+v, %v, want %+v", got, err, want)
	}
	if _, changed, err := s.Version(ctx, there); err != nil || changed {
		t.Fatalf("old version: changed=%t, %v", changed, err)
	}
	if _, _, err := s.Version(ctx, notThere); !errors.Is(err, study.ErrNotThere) {
		t.Fatalf("version of the failed commit: %v", err)
	}
	if !withResults {
		return
	}
	if r, err := s.Results(ctx, "s", []string{"d", "e"}); err != nil || !reflect.DeepEqual(r, results) {
		t.Fatalf("results %v, %v", r, err)
	}
}

// The file may not grow beyond n pages, for every n that is too small.
func TestFullAtEveryPage(t *testing.T) {
	s, path := newStudy(t)
	first := version(awkward()["many parts"])
	if _, err := s.Commit(ctx, entry("add", set("a", "", `1`)), []study.Version{first}); err != nil {
		t.Fatal(err)
	}
	before, err := s.Load(ctx)
	if err != nil {
		t.Fatal(err)
	}
	second := bigLayer(300)
	var pages int
	if err := s.(*file).db.QueryRow(`PRAGMA page_count`).Scan(&pages); err != nil {
		t.Fatal(err)
	}
	failures := 0
	for n := pages; ; n++ {
		o := usual()
		o.pragmas = []string{fmt.Sprintf("max_page_count(%d)", n)}
		tight, err := open(ctx, path, o)
		if err != nil {
			t.Fatal(err)
		}
		_, err = tight.Commit(ctx, entry("add", set("a", `1`, `2`)), []study.Version{version(second)})
		closeStore(t, tight)
		if err == nil {
			break
		}
		failures++
		if !errors.Is(err, study.ErrDiskFull) || !strings.Contains(err.Error(), path) {
			t.Fatalf("%d pages: %v", n, err)
		}
		unchanged(t, path, before, first.Digest, study.LayerDigest(second), nil, false)
	}
	if failures < 10 {
		t.Errorf("only %d sizes were too small", failures)
	}
}

func bigLayer(n int) *geo.Layer {
	l := &geo.Layer{Name: "parcels", Columns: []geo.Column{{Name: "owner"}, {Name: "area_ha", Unit: "ha"}, {Name: "free"}}}
	for i := range n {
		x, y := float64(i%100)/100, float64(i/100)/100
		l.Features = append(l.Features, geo.Feature{
			ID:       "P-" + strconv.Itoa(i),
			Values:   []geo.Value{geo.TextValue("owner " + strconv.Itoa(i)), geo.NumberValue(float64(i) / 7), geo.BoolValue(i%3 == 0)},
			Geometry: geo.LonLatGeometry{Kind: geo.Polygons, Parts: parts{{ring(x, y, x+0.01, y, x+0.01, y+0.01, x, y+0.01, x, y)}}},
		})
	}
	return l
}

// commitForEver is what the child process of TestKilledWhileCommitting does: commit n sets record
// "n", adds a layer of its own and one result, then says so.
func commitForEver(path string) {
	s, err := Open(ctx, path)
	if err != nil {
		fmt.Fprintln(os.Stderr, err)
		os.Exit(1)
	}
	st, err := s.Load(ctx)
	if err != nil {
		fmt.Fprintln(os.Stderr, err)
		os.Exit(1)
	}
	for n := len(st.Journal) + 1; ; n++ {
		before := ""
		if n > 1 {
			before = strconv.Itoa(n - 1)
		}
		if _, err := s.Commit(ctx, entry("set", set("n", before, strconv.Itoa(n))), []study.Version{version(numbered(n))}); err != nil {
			fmt.Fprintln(os.Stderr, err)
			os.Exit(1)
		}
		fmt.Println(n)
	}
}

func numbered(n int) *geo.Layer {
	l := bigLayer(20 + n%50)
	l.Features[0].ID = "layer of commit " + strconv.Itoa(n)
	return l
}

func TestKilledWhileCommitting(t *testing.T) {
	s, err := Create(ctx, filepath.Join(t.TempDir(), "killed.gpkg"))
	if err != nil {
		t.Fatal(err)
	}
	path := s.Path()
	closeStore(t, s)
	r := rand.New(rand.NewPCG(7, 7))
	for round := range 12 {
		child := exec.Command(os.Args[0])
		child.Env = append(os.Environ(), childVariable+"="+path)
		child.Stderr = os.Stderr
		out, err := child.StdoutPipe()
		if err != nil {
			t.Fatal(err)
		}
		if err := child.Start(); err != nil {
			t.Fatal(err)
		}
		lines := bufio.NewScanner(out)
		said := 0
		for range 1 + r.IntN(4) {
			if !lines.Scan() {
				t.Fatalf("round %d: the child stopped by itself", round)
			}
			if said, err = strconv.Atoi(lines.Text()); err != nil {
				t.Fatal(err)
			}
		}
		time.Sleep(time.Duration(r.IntN(12000)) * time.Microsecond)
		if err := child.Process.Kill(); err != nil {
			t.Fatal(err)
		}
		for lines.Scan() { // what it said before the kill
			if said, err = strconv.Atoi(lines.Text()); err != nil {
				t.Fatal(err)
			}
		}
		if err := child.Wait(); err == nil {
			t.Fatal("the child ended by itself")
		}
		after, err := Open(ctx, path)
		if err != nil {
			t.Fatalf("round %d: %v", round, err)
		}
		if err := after.Check(ctx); err != nil {
			t.Fatalf("round %d: %v", round, err)
		}
		st, err := after.Load(ctx)
		if err != nil {
			t.Fatal(err)
		}
		n := len(st.Journal)
		if n != said && n != said+1 {
			t.Fatalf("round %d: %d commits in the file, %d acknowledged", round, n, said)
		}
		if len(st.Records) != 1 || string(st.Records[0].Value) != strconv.Itoa(n) {
			t.Fatalf("round %d: records %+v after %d commits", round, st.Records, n)
		}
		for i := 1; i <= n+1; i++ {
			_, changed, err := after.Version(ctx, study.LayerDigest(numbered(i)))
			if i <= n && (err != nil || changed) {
				t.Fatalf("round %d: layer of commit %d of %d: changed=%t, %v", round, i, n, changed, err)
			}
			if i > n && !errors.Is(err, study.ErrNotThere) {
				t.Fatalf("round %d: a layer of a commit that did not happen: %v", round, err)
			}
		}
		closeStore(t, after)
	}
}

func TestTwoOpeners(t *testing.T) {
	a, path := newStudy(t)
	b := reopen(t, path)
	var wg sync.WaitGroup
	const each = 15
	for name, s := range map[string]study.Store{"a": a, "b": b} {
		wg.Go(func() {
			for i := range each {
				if _, err := s.Commit(ctx, entry("set", set(fmt.Sprintf("%s%d", name, i), "", strconv.Itoa(i))), nil); err != nil {
					t.Errorf("%s %d: %v", name, i, err)
				}
				if _, err := s.Load(ctx); err != nil {
					t.Errorf("%s %d: %v", name, i, err)
				}
			}
		})
	}
	wg.Wait()
	sa, err := a.Load(ctx)
	if err != nil {
		t.Fatal(err)
	}
	sb, err := b.Load(ctx)
	if err != nil {
		t.Fatal(err)
	}
	if !reflect.DeepEqual(sa, sb) || len(sa.Journal) != 2*each || len(sa.Records) != 2*each {
		t.Errorf("%d entries, %d records; the two openers agree: %t", len(sa.Journal), len(sa.Records), reflect.DeepEqual(sa, sb))
	}
	for i, e := range sa.Journal {
		if e.Seq != int64(i+1) {
			t.Errorf("entry %d has number %d", i+1, e.Seq)
		}
	}
	// b edits what a changed meanwhile
	if _, err := a.Commit(ctx, entry("set", set("a0", `0`, `1`)), nil); err != nil {
		t.Fatal(err)
	}
	for _, stale := range []study.Change{set("a0", `0`, `2`), set("a0", "", `2`), set("not there", `0`, `2`)} {
		if _, err := b.Commit(ctx, entry("set", stale), nil); !errors.Is(err, study.ErrBusy) {
			t.Errorf("stale edit: %v", err)
		}
	}
}

func TestBusy(t *testing.T) {
	_, path := newStudy(t)
	o := usual()
	o.busy = 20 * time.Millisecond
	s, err := open(ctx, path, o)
	if err != nil {
		t.Fatal(err)
	}
	defer closeStore(t, s)
	other, err := sql.Open("sqlite", path2uri(path))
	if err != nil {
		t.Fatal(err)
	}
	defer func() {
		if err := other.Close(); err != nil {
			t.Error(err)
		}
	}()
	other.SetMaxOpenConns(1)
	if _, err := other.Exec(`BEGIN IMMEDIATE`); err != nil {
		t.Fatal(err)
	}
	if _, err := s.Commit(ctx, entry("set", set("a", "", `1`)), nil); !errors.Is(err, study.ErrBusy) {
		t.Errorf("commit while another program writes: %v", err)
	}
	if _, err := s.Load(ctx); err != nil {
		t.Errorf("reading while another program prepares a write: %v", err)
	}
	if _, err := other.Exec(`ROLLBACK`); err != nil {
		t.Fatal(err)
	}
	// A reader that stays holds up the commit at its end; then nothing may be written.
	if _, err := other.Exec(`BEGIN`); err != nil {
		t.Fatal(err)
	}
	var n int
	if err := other.QueryRow(`SELECT count(*) FROM gt_record`).Scan(&n); err != nil {
		t.Fatal(err)
	}
	if _, err := s.Commit(ctx, entry("set", set("a", "", `1`)), nil); !errors.Is(err, study.ErrBusy) {
		t.Errorf("commit while another program reads: %v", err)
	}
	if _, err := other.Exec(`ROLLBACK`); err != nil {
		t.Fatal(err)
	}
	e, err := s.Commit(ctx, entry("set", set("a", "", `1`)), nil)
	if err != nil || e.Seq != 1 {
		t.Errorf("commit after the other program let go: %+v, %v", e, err)
	}
}

func path2uri(path string) string {
	return "file:" + strings.NewReplacer("%", "%25", "?", "%3f", "#", "%23").Replace(filepath.ToSlash(path))
}

// A reader that is cancelled at any moment, also while its transaction begins, leaves the file to the next one.
func TestCancelledReadsLeaveNoTransaction(t *testing.T) {
	f, _ := newStudy(t)
	for i := range 10_000 {
		gone, cancel := context.WithCancel(ctx)
		go func() {
			for begin := time.Now(); time.Since(begin) < time.Duration(i%200)*time.Microsecond/2; {
				runtime.Gosched()
			}
			cancel()
		}()
		_, _ = f.Load(gone) // whether it comes to an end does not matter
		cancel()
		if _, err := f.Load(ctx); err != nil {
			t.Fatalf("after reader %d was cancelled: %v", i, err)
		}
	}
}
