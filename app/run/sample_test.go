package run

import (
	"context"
	"strconv"
	"sync"
	"testing"
	"time"

	"groundtally/app/files"
	"groundtally/app/study"
	"groundtally/app/study/studytest"
	"groundtally/assets"
	"groundtally/sampledata"
)

var loaded = sync.OnceValues(func() (*Params, error) {
	cat, err := study.LoadCatalog(assets.FS())
	if err != nil {
		return nil, err
	}
	catalog = cat
	return LoadParams(assets.FS(), cat)
})

var catalog *study.Catalog

func shipped(t testing.TB) *Params {
	t.Helper()
	p, err := loaded()
	if err != nil {
		t.Fatal(err)
	}
	return p
}

// sampleStudy is the Isle of Marram in memory.
func sampleStudy(t testing.TB) *study.Study {
	t.Helper()
	shipped(t)
	s, err := study.Open(context.Background(), studytest.New(), catalog, study.Options{Clock: func() time.Time { return time.Unix(0, 0) }})
	if err != nil {
		t.Fatal(err)
	}
	tools, done := files.NewTools()
	defer done()
	if err := s.LoadSample(context.Background(), sampledata.FS(), files.ImportFS, tools, func(study.LayerRecord) {}); err != nil {
		t.Fatal(err)
	}
	return s
}

func compute(t testing.TB, s *study.Study, cache Cache, cores int) *Results {
	t.Helper()
	return computeAfter(t, s, cache, cores, nil)
}

// computeAfter has earlier results at hand.
func computeAfter(t testing.TB, s *study.Study, cache Cache, cores int, before *Results) *Results {
	t.Helper()
	snap, err := s.Snapshot()
	if err != nil {
		t.Fatal(err)
	}
	e := &Engine{Params: shipped(t), Cache: cache, Cores: cores, Load: StoreLoader(s.Store()), Before: before}
	r, err := e.Compute(context.Background(), snap)
	if err != nil {
		t.Fatal(err)
	}
	return r
}

func TestSampleComputes(t *testing.T) {
	s := sampleStudy(t)
	r := compute(t, s, nil, 2)
	fitted := map[string]int{}
	for _, c := range r.Candidates {
		if c.Status == Fitted {
			fitted[c.Plant]++
		}
	}
	t.Log(fitted, r.Steps)
	// What the sample is there to show: three voices, three first candidates.
	first := map[string]string{}
	for _, v := range r.Voices {
		for _, row := range v.Order {
			if row.Site != NoSite {
				first[row.Site+"/"+row.Plant] = v.Voice
				break
			}
		}
	}
	if len(r.Voices) != 3 || len(first) != 3 {
		t.Errorf("the voices' first candidates are %v: three voices must disagree", first)
	}
	checkGolden(t, r)
	for _, o := range []string{"solar_fixed", "solar_tracking", "solar_vertical", "solar_agri", "wind", "wind_large", "wind_solar"} {
		if fitted[o] == 0 {
			t.Errorf("option %s fits nowhere", o)
		}
	}
}

// BenchmarkSampleAtHand computes a sample of which nothing changed, with its results at hand.
func BenchmarkSampleAtHand(b *testing.B) {
	s := sampleStudy(b)
	cache := &Memory{}
	r := compute(b, s, cache, 2)
	for b.Loop() {
		r = computeAfter(b, s, cache, 2, r)
	}
}

func BenchmarkSampleFromStored(b *testing.B) {
	s := sampleStudy(b)
	cache := &Memory{}
	compute(b, s, cache, 2)
	for b.Loop() {
		compute(b, s, cache, 2)
	}
}

// BenchmarkOneDistance changes the distance of one layer after the other, with the results before at hand: a
// tenth of the layers each time.
func BenchmarkOneDistance(b *testing.B) {
	s := sampleStudy(b)
	cache := &Memory{}
	r := compute(b, s, cache, 2)
	for _, role := range []string{"dwellings", "sensitive", "habitat", "heritage", "water", "forest", "exclusion", "roads", "grid_lines", "boundary"} {
		b.Run(role, func(b *testing.B) {
			for b.Loop() {
				widen(b, s, role)
				r = computeAfter(b, s, cache, 2, r)
			}
		})
	}
}

// widen adds 5 m to a distance of fixed panels.
func widen(t testing.TB, s *study.Study, role string) {
	t.Helper()
	snap, err := s.Snapshot()
	if err != nil {
		t.Fatal(err)
	}
	key := "rule.setback." + role + ".solar_fixed_m"
	m, ok := snap.Number(key)
	if !ok {
		t.Fatalf("%s is not set", key)
	}
	if _, err := s.Set(context.Background(), "set", "", study.SettingEdit{Key: key, Value: strconv.FormatFloat(m+5, 'g', -1, 64)}); err != nil {
		t.Fatal(err)
	}
}

// A rule that changes near a site and takes no other ground than before leaves the site's plants valid, whether the
// results are at hand or stored; the results are those of a study that knew nothing before.
func TestOnlyWhatARuleTouchesIsComputed(t *testing.T) {
	s := sampleStudy(t)
	cache := &Memory{}
	r := compute(t, s, cache, 2)
	step := func(r *Results, name string) int {
		for _, c := range r.Steps {
			if c.Step == name {
				return c.Computed
			}
		}
		t.Fatalf("no step %q in %v", name, r.Steps)
		return 0
	}
	widen(t, s, "sensitive")
	hand := computeAfter(t, s, cache, 2, r)
	if g, f := step(hand, groundStep), step(hand, fitStep); g == 0 || f >= g {
		t.Errorf("%d grounds and %d fits were computed: %v", g, f, hand.Steps)
	}
	if f := step(hand, fitStep); f > len(r.Candidates)/100 {
		t.Errorf("%d plants of %d were fitted anew", f, len(r.Candidates))
	}
	kept := compute(t, s, cache, 2)
	if f := step(kept, fitStep) + step(kept, groundStep) + step(kept, candidateStep); f != 0 {
		t.Errorf("from stored results %d were computed: %v", f, kept.Steps)
	}
	if fresh := compute(t, s, nil, 2); fresh.Code != hand.Code || fresh.Code != kept.Code {
		_, d := Compare(fresh, hand)
		t.Errorf("what is at hand or stored differs from what is computed anew: %+v", d)
	}
}
