package study_test

import (
	"context"
	"errors"
	"math"
	"reflect"
	"strings"
	"testing"

	"groundtally/app/study"
	"groundtally/geo"
)

// placing gives a study with the sites A, B and north (of N1 and N2), a wind option and a solar one.
func placing(t *testing.T) *study.Study {
	t.Helper()
	s := open(t)
	var fs []geo.Feature
	for i, id := range []string{"A", "B", "N1", "N2"} {
		fs = append(fs, geo.Feature{ID: id, Geometry: square(9+0.01*float64(i), 48, 0.01), Values: []geo.Value{geo.TextValue(id)}})
	}
	if _, err := s.AddLayer(context.Background(), parcels([]geo.Column{{Name: "parcel_id"}}, fs...), plain{}); err != nil {
		t.Fatal(err)
	}
	if _, err := s.GroupParcels(context.Background(), "north", []string{"N1", "N2"}, ""); err != nil {
		t.Fatal(err)
	}
	set(t, s, "plant.wind_3mw.technology", "wind")
	set(t, s, "plant.both.technology", "wind_solar")
	set(t, s, "plant.sun.technology", "solar_fixed")
	return s
}

func TestTurbinesArePlacedByHand(t *testing.T) {
	ctx := context.Background()
	s := placing(t)
	before := snapshot(t, s)
	n := len(s.Journal())
	h := study.HandLayout{Site: "north", Plant: "wind_3mw", At: []geo.LonLat{{Lon: 9.021234567891, Lat: 48.005}, {Lon: 9.03, Lat: 48.005}}, Reason: "agreed with the owner"}
	for _, x := range []study.HandLayout{h, {Site: "A", Plant: "wind_3mw", At: []geo.LonLat{{Lon: 9.005, Lat: 48.005}}, Reason: "r"}, {Site: "A", Plant: "both", At: []geo.LonLat{{Lon: 9.005, Lat: 48.005}}, Reason: "r"}} {
		if err := s.PutLayout(ctx, x); err != nil {
			t.Fatal(err)
		}
	}
	now := snapshot(t, s)
	var names []string
	for _, l := range now.Layouts() {
		names = append(names, l.Site+" "+l.Plant)
	}
	if want := []string{"A both", "A wind_3mw", "north wind_3mw"}; !reflect.DeepEqual(names, want) {
		t.Errorf("layouts %v, want %v", names, want)
	}
	got, ok := now.Layout("north", "wind_3mw")
	if !ok || got.At[0] != (geo.LonLat{Lon: 9.0212346, Lat: 48.005}) || got.Reason != "agreed with the owner" {
		t.Errorf("kept as %+v", got)
	}
	if study.SameInputs(before, now) {
		t.Error("a layout by hand counts as the same inputs")
	}
	if h.At[0].Lon != 9.021234567891 {
		t.Error("the caller's positions were changed")
	}
	j := s.Journal()[n:]
	if len(j) != 3 || study.ChangeTitle(j[0].Changes[0]) != "turbines of north, plant wind_3mw, placed by hand" || j[0].Reason != "agreed with the owner" {
		t.Errorf("journal %+v", j)
	}
	if err := s.DropLayout(ctx, "north", "wind_3mw", ""); err != nil {
		t.Fatal(err)
	}
	j = s.Journal()
	if title := study.ChangeTitle(j[len(j)-1].Changes[0]); title != "turbines of north, plant wind_3mw, placed by the program again" {
		t.Errorf("the title is %q", title)
	}
	if err := s.DropLayout(ctx, "north", "wind_3mw", ""); !errors.Is(err, study.ErrNotThere) {
		t.Errorf("dropping twice: %v", err)
	}
	if _, err := s.Undo(ctx); err != nil {
		t.Fatal(err)
	}
	if back, ok := snapshot(t, s).Layout("north", "wind_3mw"); !ok || !reflect.DeepEqual(back, got) {
		t.Errorf("after undo %+v", back)
	}
}

func TestTurbinesThatCannotBePlaced(t *testing.T) {
	ctx := context.Background()
	s := placing(t)
	n := len(s.Journal())
	in := geo.LonLat{Lon: 9.005, Lat: 48.005}
	var many []geo.LonLat
	for i := range 201 {
		many = append(many, geo.LonLat{Lon: 9 + 0.00001*float64(i), Lat: 48})
	}
	for _, c := range []struct {
		site, plant string
		at          []geo.LonLat
		want        string
		missing     bool
	}{
		{"C", "wind_3mw", []geo.LonLat{in}, `there is no site "C" among the 3`, true},
		{"N1", "wind_3mw", []geo.LonLat{in}, "the parcel N1 is part of the site north", true},
		{"A", "wind", []geo.LonLat{in}, `there is no plant option "wind"; those with turbines are: both, wind_3mw`, true},
		{"A", "sun", []geo.LonLat{in}, "has no turbines (its technology is solar_fixed)", true},
		{"A", "wind_3mw", nil, "at least one turbine", false},
		{"A", "wind_3mw", many, "there are 201 turbines, and at most 200", false},
		{"A", "wind_3mw", []geo.LonLat{in, {Lon: math.NaN(), Lat: 48}}, "turbine 2: NaN,48 is no position", false},
		{"A", "wind_3mw", []geo.LonLat{{Lon: 9, Lat: math.Inf(1)}}, "no position in degrees", false},
		{"A", "wind_3mw", []geo.LonLat{{Lon: 48.005, Lat: 9.005}}, "longitude comes before latitude", false},
		{"A", "wind_3mw", []geo.LonLat{in, {Lon: 9.006, Lat: 48.005}, {Lon: 9.00500001, Lat: 48.005}}, "turbines 1 and 3 stand at the same place", false},
	} {
		err := s.PutLayout(ctx, study.HandLayout{Site: c.site, Plant: c.plant, At: c.at, Reason: "r"})
		if err == nil || !strings.Contains(err.Error(), c.want) || errors.Is(err, study.ErrNotThere) != c.missing {
			t.Errorf("want %q, got %v", c.want, err)
		}
	}
	if err := s.PutLayout(ctx, study.HandLayout{Site: "A", Plant: "wind_3mw", At: []geo.LonLat{in}, Reason: " "}); !errors.Is(err, study.ErrReasonNeeded) {
		t.Errorf("without a reason: %v", err)
	}
	if len(s.Journal()) != n {
		t.Error("a refused layout stands in the journal")
	}
	// What planning forbids is no slip: a place outside the site is kept, for the computation to show.
	if err := s.PutLayout(ctx, study.HandLayout{Site: "A", Plant: "wind_3mw", At: []geo.LonLat{{Lon: 9.1, Lat: 48.05}}, Reason: "r"}); err != nil {
		t.Error(err)
	}
}
