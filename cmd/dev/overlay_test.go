package main

import (
	"encoding/json"
	"math"
	"strings"
	"testing"
)

func overlayOf(t *testing.T, text string) (r overlayReport) {
	t.Helper()
	if err := json.Unmarshal([]byte(text), &r); err != nil {
		t.Fatal(err)
	}
	return r
}

func TestCompareOverlays(t *testing.T) {
	const one = `{"library":"3.11.1","parcels":10,"features":5,"cores":2,"wideningS":1,"overlayS":2,"wideningCPU":2,"overlayCPU":4,"rssMB":300,
		"grossM2":1000000,"buildableM2":1000,"takenSharedM2":20,"digest":"ab","rules":[{"name":"a","aloneM2":1,"sharedM2":2,"takesAll":3}]}`
	ours, ref := overlayOf(t, one), overlayOf(t, one)
	ref.WideningCPU, ref.OverlayCPU = 1, 3.5
	var out strings.Builder
	ours.print(&out)
	if err := compareOverlays(&out, ours, ref); err != nil {
		t.Error(err)
	}
	for _, want := range []string{"10 parcels among 5 features, GEOS 3.11.1, 2 workers", "5 parcels/s", "peak memory 300 MB", "our rate per core: widening 0.50, overlay 0.88, both 0.75", "differ by at most 0.0e+00"} {
		if !strings.Contains(out.String(), want) {
			t.Errorf("%q is missing in\n%s", want, out.String())
		}
	}
	for name, change := range map[string]func(*overlayReport){
		"area":    func(r *overlayReport) { r.Rules[0].AloneM2 = 3 },
		"none":    func(r *overlayReport) { r.BuildableM2 = math.NaN() },
		"whole":   func(r *overlayReport) { r.Rules[0].TakesAll = 4 },
		"rules":   func(r *overlayReport) { r.Rules = nil },
		"parcels": func(r *overlayReport) { r.Parcels = 11 },
	} {
		bad := overlayOf(t, one)
		change(&bad)
		if err := compareOverlays(&out, ours, bad); err == nil {
			t.Errorf("a difference in %s passes", name)
		}
	}
}

// The whole way on a few parcels, with the compiler and the library of this machine, which the tests need
// anyhow.
func TestOverlayAgainstC(t *testing.T) {
	var out, said strings.Builder
	w := workshop{m: thisMachine{}, root: repoRoot(t), stdout: &sharedWriter{w: &out}, stderr: &sharedWriter{w: &said}, every: 60e9}
	if err := w.overlay(t.Context(), 40, 1, true, ""); err != nil {
		t.Fatalf("%v\n%s", err, said.String())
	}
	if !strings.Contains(out.String(), "40 parcels among 100000 features") {
		t.Errorf("printed\n%s", out.String())
	}
}
