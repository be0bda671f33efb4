//go:build scale

package run

import (
	"context"
	"fmt"
	"math/rand/v2"
	"os"
	"runtime"
	"strconv"
	"testing"
	"time"

	"groundtally/app/files"
	"groundtally/app/study"
	"groundtally/app/study/studytest"
	"groundtally/geo"
)

// TestScaleDistrict computes an invented district of GROUNDTALLY_SCALE_PARCELS parcels (100,000 unless told
// otherwise) with one wind and one solar option, and checks every candidate.
func TestScaleDistrict(t *testing.T) {
	parcels := 100_000
	if v := os.Getenv("GROUNDTALLY_SCALE_PARCELS"); v != "" {
		var err error
		if parcels, err = strconv.Atoi(v); err != nil {
			t.Fatal(err)
		}
	}
	s := wideDistrict(t, parcels)
	memory := func(when string) {
		var m runtime.MemStats
		runtime.ReadMemStats(&m)
		t.Logf("%s: %d MB in use, %d MB taken from the system", when, m.HeapAlloc>>20, m.Sys>>20)
	}
	memory("loaded")
	cache := &Memory{}
	r := compute(t, s, cache, runtime.NumCPU())
	memory("computed")
	if len(r.Candidates) != 2*parcels {
		t.Fatalf("%d candidates, want %d", len(r.Candidates), 2*parcels)
	}
	fitted := map[string]int{}
	for i := range r.Candidates {
		if r.Candidates[i].Status == Fitted {
			fitted[r.Candidates[i].Plant]++
		}
	}
	t.Log(fitted)
	if fitted["wind"] < parcels/100 || fitted["sun"] < parcels/10 || len(r.Voices) != 1 || len(r.Voices[0].Order) != fitted["wind"]+fitted["sun"]+1 {
		t.Errorf("fitted %v, voices %d: the district is not filled", fitted, len(r.Voices))
	}
	holds(t, r)
	if _, err := s.Set(context.Background(), "set", "", study.SettingEdit{Key: "voice.residents.weight.net_share", Value: "40"}); err != nil {
		t.Fatal(err)
	}
	for _, st := range compute(t, s, cache, runtime.NumCPU()).Steps {
		if st.Step != "order" && st.Computed != 0 {
			t.Errorf("a weight made %d of step %s compute again", st.Computed, st.Step)
		}
	}
	memory("ordered again")
}

// wideDistrict is a chequered district, 200 m to a parcel, with a dwelling on every fortieth, a road every
// 2 km and a power line every 10 km.
func wideDistrict(t *testing.T, parcels int) *study.Study {
	t.Helper()
	shipped(t)
	ctx := context.Background()
	s, err := study.Open(ctx, studytest.New(), catalog, study.Options{Clock: func() time.Time { return time.Unix(0, 0) }})
	if err != nil {
		t.Fatal(err)
	}
	side := 1
	for side*side < parcels {
		side++
	}
	const latStep, lonStep = 0.0018, 0.0026 // 200 m each at 46 degrees north
	at := func(x, y float64) geo.LonLat { return geo.LonLat{Lon: 10 + x*lonStep, Lat: 46 + y*latStep} }
	rng := rand.New(rand.NewPCG(1, 2))
	var land, dwellings, roads, lines []geo.Feature
	for i := range parcels {
		x, y := float64(i%side), float64(i/side)
		j := func() float64 { return 0.06 * rng.Float64() } // so that no two outlines are alike
		ring := []geo.LonLat{at(x+j(), y+j()), at(x+1-j(), y+j()), at(x+1-j(), y+1-j()), at(x+j(), y+1-j())}
		id := fmt.Sprintf("P-%06d", i)
		land = append(land, geo.Feature{ID: id, Geometry: geo.LonLatGeometry{Kind: geo.Polygons, Parts: [][][]geo.LonLat{{append(ring, ring[0])}}}, Values: []geo.Value{geo.TextValue(id)}})
		if rng.IntN(40) == 0 {
			dwellings = append(dwellings, geo.Feature{ID: fmt.Sprint(len(dwellings)), Geometry: geo.LonLatGeometry{Kind: geo.Points, Parts: [][][]geo.LonLat{{{at(x+rng.Float64(), y+rng.Float64())}}}}})
		}
	}
	across := func(n int, y float64, values ...geo.Value) geo.Feature {
		return geo.Feature{ID: fmt.Sprint(n), Geometry: geo.LonLatGeometry{Kind: geo.Lines, Parts: [][][]geo.LonLat{{{at(0, y), at(float64(side), y)}}}}, Values: values}
	}
	for y := 0; y <= side; y += 10 {
		roads = append(roads, across(len(roads), float64(y)+0.5, geo.TextValue("local")))
		if y%50 == 0 {
			lines = append(lines, across(len(lines), float64(y)+0.2, geo.NumberValue(33), geo.NumberValue(9000)))
		}
	}
	tools, done := files.NewTools()
	defer done()
	add := func(role string, columns []geo.Column, features []geo.Feature, units map[string]string) {
		t.Helper()
		_, err := s.AddLayer(ctx, study.Import{File: role, Base: role, Name: role, Role: role, Complete: role != "parcels", Layer: &geo.Layer{Columns: columns, Features: features}, Units: units, Ledger: study.Ledger{Read: len(features)}}, tools)
		if err != nil {
			t.Fatal(err)
		}
	}
	add("parcels", []geo.Column{{Name: "parcel_id"}}, land, nil)
	add("dwellings", nil, dwellings, nil)
	add("roads", []geo.Column{{Name: "class"}}, roads, nil)
	add("grid_lines", []geo.Column{{Name: "voltage"}, {Name: "spare_capacity"}}, lines, map[string]string{"voltage": "kV", "spare_capacity": "kW"})
	edits := []study.SettingEdit{{Key: "wind.typed_mean_speed_m_per_s", Value: "6.8"},
		{Key: "plant.wind.technology", Value: "wind"}, {Key: "plant.wind.hub_height_m", Value: "110"}, {Key: "plant.wind.rotor_diameter_m", Value: "130"}, {Key: "plant.wind.rated_kw", Value: "3370"},
		{Key: "plant.sun.technology", Value: "solar_fixed"}, {Key: "rule.setback.dwellings.wind_m", Value: "500"}, {Key: "rule.setback.dwellings.sun_m", Value: "50"},
		{Key: "voice.residents.weight.net_share", Value: "60"}, {Key: "voice.residents.weight.footprint_direct_ha_per_gwh", Value: "30"}, {Key: "voice.residents.weight.connection_km", Value: "10"}}
	for m, kwh := range []int{35, 55, 95, 125, 155, 165, 175, 150, 105, 65, 38, 28} {
		edits = append(edits, study.SettingEdit{Key: fmt.Sprintf("solar.typed_ghi_%d_kwh_per_m2", m+1), Value: fmt.Sprint(kwh)}, study.SettingEdit{Key: fmt.Sprintf("solar.typed_temperature_%d_degc", m+1), Value: "10"})
	}
	if _, err := s.Set(ctx, "set", "", edits...); err != nil {
		t.Fatal(err)
	}
	return s
}
