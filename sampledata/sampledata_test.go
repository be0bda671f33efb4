package sampledata_test

import (
	"bytes"
	"encoding/csv"
	"encoding/json"
	"io/fs"
	"os"
	"regexp"
	"strings"
	"testing"

	"groundtally/assets/citedtable"
	"groundtally/sampledata"
	"groundtally/sampledata/gen"
)

// What is embedded is what the generator makes, byte for byte.
func TestFilesAreAsGenerated(t *testing.T) {
	made, err := gen.Generate(gen.Seed)
	if err != nil {
		t.Fatal(err)
	}
	if n := len(read(t, "sensitive.geojson").Features); n != 4 {
		t.Errorf("%d sensitive places, want 4", n)
	}
	total := 0
	err = fs.WalkDir(sampledata.FS(), ".", func(path string, d fs.DirEntry, err error) error {
		if err != nil || d.IsDir() {
			return err
		}
		b, err := fs.ReadFile(sampledata.FS(), path)
		if err != nil {
			return err
		}
		if !bytes.Equal(b, made[path]) {
			t.Errorf("%s differs from what the generator makes; run go generate", path)
		}
		if len(b) > 5<<20 {
			t.Errorf("%s has %d bytes", path, len(b))
		}
		total += len(b)
		delete(made, path)
		return nil
	})
	if err != nil {
		t.Fatal(err)
	}
	for path := range made {
		t.Errorf("%s is generated but not there", path)
	}
	if total > 9<<20 {
		t.Errorf("all files have %d bytes", total)
	}
}

// Another seed gives another island by the same rules.
func TestOtherSeeds(t *testing.T) {
	a, err := gen.Generate(7)
	if err != nil {
		t.Fatal(err)
	}
	b, err := fs.ReadFile(sampledata.FS(), "parcels.geojson")
	if err != nil {
		t.Fatal(err)
	}
	if bytes.Equal(a["parcels.geojson"], b) {
		t.Error("two seeds give the same parcels")
	}
}

type collection struct {
	Features []struct {
		Properties map[string]any
		Geometry   struct {
			Type        string
			Coordinates json.RawMessage
		}
	}
}

func read(t *testing.T, path string) (c collection) {
	t.Helper()
	b, err := fs.ReadFile(sampledata.FS(), path)
	if err != nil {
		t.Fatal(err)
	}
	if err := json.Unmarshal(b, &c); err != nil {
		t.Fatalf("%s: %v", path, err)
	}
	if len(c.Features) == 0 {
		t.Fatalf("%s has no features", path)
	}
	return c
}

// Every file but the licence and the manifest itself is listed, and what the manifest says of columns holds.
func TestManifestMatchesFiles(t *testing.T) {
	m, err := sampledata.Manifest()
	if err != nil {
		t.Fatal(err)
	}
	listed := map[string]bool{"manifest.json": true, "LICENCE.txt": true}
	for _, f := range m.Files {
		listed[f.Path] = true
		columns := map[string]bool{}
		switch {
		case strings.HasSuffix(f.Path, ".geojson"):
			for k := range read(t, f.Path).Features[0].Properties {
				columns[k] = true
			}
		case strings.HasSuffix(f.Path, ".csv"):
			b, err := fs.ReadFile(sampledata.FS(), f.Path)
			if err != nil {
				t.Fatal(err)
			}
			rows, err := csv.NewReader(bytes.NewReader(b)).ReadAll()
			if err != nil {
				t.Fatalf("%s: %v", f.Path, err)
			}
			for _, k := range rows[0] {
				columns[k] = true
			}
		default:
			continue
		}
		for k := range f.Units {
			if !columns[k] {
				t.Errorf("%s: unit for column %q, which is not there", f.Path, k)
			}
		}
		for _, k := range f.Match {
			if !columns[k] {
				t.Errorf("%s: match with column %q, which is not there", f.Path, k)
			}
		}
		for _, k := range f.Personal {
			if !columns[k] {
				t.Errorf("%s: personal column %q is not there", f.Path, k)
			}
		}
	}
	entries, err := fs.ReadDir(sampledata.FS(), ".")
	if err != nil {
		t.Fatal(err)
	}
	for _, e := range entries {
		if !listed[e.Name()] {
			t.Errorf("%s is not in the manifest", e.Name())
		}
		delete(listed, e.Name())
	}
	for path := range listed {
		t.Errorf("%s is in the manifest but not there", path)
	}
}

// The flaws that the manifest names are really there.
func TestFlawsAreThere(t *testing.T) {
	m, err := sampledata.Manifest()
	if err != nil {
		t.Fatal(err)
	}
	what := map[string]string{}
	for _, f := range m.Flaws {
		what[f.What] = f.Feature
	}
	count, noUse := map[string]int{}, []string{}
	for _, f := range read(t, "parcels.geojson").Features {
		id, _ := f.Properties["parcel_id"].(string)
		count[id]++
		if f.Properties["use_class"] == nil {
			noUse = append(noUse, id)
		}
	}
	for id, n := range count {
		if (n == 2) != (id == what["the parcel stands twice, the second time as the last feature"]) {
			t.Errorf("parcel %s stands %d times", id, n)
		}
	}
	if len(noUse) != 1 || noUse[0] != what["use_class is missing"] {
		t.Errorf("use_class is missing on %v", noUse)
	}
	var noVoltage []string
	for _, f := range read(t, "grid_lines.geojson").Features {
		if f.Properties["voltage"] == nil {
			noVoltage = append(noVoltage, f.Properties["name"].(string))
		}
	}
	if len(noVoltage) != 1 || noVoltage[0] != what["voltage is missing"] {
		t.Errorf("voltage is missing on %v", noVoltage)
	}
	for _, f := range read(t, "viewpoints.geojson").Features {
		var p [2]float64
		if err := json.Unmarshal(f.Geometry.Coordinates, &p); err != nil {
			t.Fatal(err)
		}
		if p[0] < 47 || p[1] > -26 {
			t.Errorf("viewpoint at %v is not latitude, longitude", p)
		}
	}
	b, err := fs.ReadFile(sampledata.FS(), "heritage.geojson")
	if err != nil {
		t.Fatal(err)
	}
	if !bytes.Contains(b, []byte("urn:ogc:def:crs:EPSG::32626")) {
		t.Error("heritage.geojson names no coordinate system")
	}
}

// Every setting of the sample is one that the program knows, and every machine has a curve.
func TestSettingsAreKnown(t *testing.T) {
	params := os.DirFS("../assets/params")
	known, err := citedtable.ParseFS(params, "settings.csv")
	if err != nil {
		t.Fatal(err)
	}
	var patterns []*regexp.Regexp
	for _, r := range known.Rows {
		p := regexp.QuoteMeta(r.Text("key"))
		patterns = append(patterns, regexp.MustCompile("^"+regexp.MustCompile("<[a-z]+>").ReplaceAllString(p, "[a-z0-9_]+")+"$"))
	}
	machines, err := citedtable.ParseFS(params, "turbines.csv")
	if err != nil {
		t.Fatal(err)
	}
	curve := map[string]bool{}
	for _, r := range machines.Rows {
		curve[r.Text("turbine")] = true
	}
	b, err := fs.ReadFile(sampledata.FS(), "settings.csv")
	if err != nil {
		t.Fatal(err)
	}
	rows, err := csv.NewReader(bytes.NewReader(b)).ReadAll()
	if err != nil {
		t.Fatal(err)
	}
	seen := map[string]bool{}
	for _, r := range rows[1:] {
		ok := false
		for _, p := range patterns {
			ok = ok || p.MatchString(r[0])
		}
		if !ok {
			t.Errorf("setting %s is not known", r[0])
		}
		if seen[r[0]] {
			t.Errorf("setting %s stands twice", r[0])
		}
		seen[r[0]] = true
		if r[3] == "" {
			t.Errorf("setting %s has no source", r[0])
		}
		if strings.HasSuffix(r[0], ".turbine") && !curve[r[1]] {
			t.Errorf("setting %s names the machine %q, which has no curve", r[0], r[1])
		}
	}
}
