package run

import (
	"bytes"
	"context"
	"io/fs"
	"reflect"
	"testing"
	"testing/fstest"

	"groundtally/assets"
	"groundtally/scoring"
)

// later gives the shipped files with a newer inventory in which a turbine takes other energy.
func later(t *testing.T) fs.FS {
	t.Helper()
	out := fstest.MapFS{}
	err := fs.WalkDir(assets.FS(), ".", func(name string, d fs.DirEntry, err error) error {
		if err != nil || d.IsDir() {
			return err
		}
		b, err := fs.ReadFile(assets.FS(), name)
		out[name] = &fstest.MapFile{Data: b}
		if name == "params/inventory_2026_01.csv" {
			newer := bytes.Replace(b, []byte("wind_turbine,wind,B1,kW,yes,5000,7000,12000,"), []byte("wind_turbine,wind,B1,kW,yes,6000,9000,13000,"), 1)
			if bytes.Equal(newer, b) {
				t.Fatal("the row of turbines was not found")
			}
			out["params/inventory_2027_03.csv"] = &fstest.MapFile{Data: newer}
		}
		return err
	})
	if err != nil {
		t.Fatal(err)
	}
	return out
}

// A study that is held to an edition keeps its figures when the program has a newer one.
func TestAStudyHeldToAnEdition(t *testing.T) {
	now := shipped(t)
	then, err := LoadParams(later(t), catalog)
	if err != nil {
		t.Fatal(err)
	}
	if got := then.EditionDates(); !reflect.DeepEqual(got, []string{"2026-01", "2027-03"}) {
		t.Fatalf("editions %v", got)
	}
	compute := func(p *Params, set ...string) (map[string][]scoring.Consequence, map[string]string, string) {
		s := smallStudy(t, 120)
		if len(set) > 0 {
			setAll(t, s, set...)
		}
		snap, err := s.Snapshot()
		if err != nil {
			t.Fatal(err)
		}
		e := &Engine{Params: p, Load: StoreLoader(s.Store())}
		r, err := e.Compute(context.Background(), snap)
		if err != nil {
			t.Fatal(err)
		}
		out := map[string][]scoring.Consequence{}
		for i := range r.Candidates {
			out[r.Candidates[i].ID()] = r.Candidates[i].All()
		}
		return out, p.DatesOf(snap), r.Code.Check
	}
	old, _, _ := compute(now)
	fresh, dates, _ := compute(then)
	if reflect.DeepEqual(old, fresh) || dates["inventory"] != "2027-03" {
		t.Errorf("the newer inventory changes nothing; %v", dates)
	}
	held, dates, _ := compute(then, factorsEdition, "2026-01")
	if !reflect.DeepEqual(old, held) || dates["inventory"] != "2026-01" {
		t.Errorf("held to the older edition the figures differ; %v", dates)
	}
	for value, good := range map[string]bool{"2026-01": true, "2027-03": true, "2025-01": false, "newest": false} {
		if err := CheckSetting(catalog, then, factorsEdition, value); (err == nil) != good {
			t.Errorf("%s: %v", value, err)
		}
	}
}
