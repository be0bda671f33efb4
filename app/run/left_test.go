package run

import (
	"context"
	"errors"
	"math"
	"testing"

	"groundtally/app/study"
)

// A district of 3.98 by 3.98 km, so that it has several tiles, with a road, a lake and a farm: every hectare is
// accounted for, and the areas are those of the hand.
func TestLandLeftOfAPlainDistrict(t *testing.T) {
	p := newPlain(t)
	p.add("parcels", []string{"parcel_id"}, thing{square(-500, -500, 1000), map[string]string{"parcel_id": "A"}})
	p.add("district", []string{"name"}, thing{square(-1990, -1990, 3980), nil})
	p.add("roads", []string{"class"}, thing{line(-3000, 100, 3000, 100), map[string]string{"class": "b"}})
	p.add("water", []string{"kind"}, thing{square(500, 0, 1000), map[string]string{"kind": "lake"}})
	p.set("plant.s.technology", "solar_fixed", "plant.s.title", "S", "rule.setback.roads.s_m", "50", "rule.exclude.roads", "no", "rule.exclude.dwellings", "no")
	snap, err := p.s.Snapshot()
	if err != nil {
		t.Fatal(err)
	}
	e := &Engine{Params: shipped(t), Load: StoreLoader(p.s.Store()), Cores: 2}
	list, err := e.LandLeft(context.Background(), snap, "s")
	if err != nil || len(list) != 1 {
		t.Fatal(list, err)
	}
	l := list[0]
	near := func(what string, got, want, tol float64) {
		t.Helper()
		if math.Abs(got-want) > tol {
			t.Errorf("%s: %v ha, want %v", what, got, want)
		}
	}
	near("district", l.DistrictHa, 1584.04, 0.03)
	// Strip of 3980 by 100 m, of which 1000 by 100 m (from y = 50 to 150) lie in the lake; 0.12 % for arcs.
	near("left", l.LeftHa, 1584.04-39.8-100+10, 0.1)
	near("shared", l.SharedHa, 10, 0.02)
	sum := l.LeftHa + l.ShapeHa + l.SharedHa
	for _, r := range l.Rules {
		sum += r.AloneHa
	}
	near("all parts", sum, l.DistrictHa, 1e-6*1584)
	if len(l.Zones) != 2 || l.Hull {
		t.Errorf("%d zones, hull %v: the road parts the district in two", len(l.Zones), l.Hull)
	}
	// North of the road: 3980 by 1840 m less the lake from y = 150 to 1000.
	near("north of the road", l.Zones[1].Ha, (3980*1840-1000*850)/1e4, 0.1)
}

// Without a boundary the hull of the parcels stands for the district, and that is said.
func TestLandLeftOfTheHull(t *testing.T) {
	p := newPlain(t)
	p.add("parcels", []string{"parcel_id"}, thing{square(0, 0, 100), map[string]string{"parcel_id": "A"}}, thing{square(900, 900, 100), map[string]string{"parcel_id": "B"}})
	p.set("plant.s.technology", "solar_fixed", "plant.s.title", "S")
	snap, err := p.s.Snapshot()
	if err != nil {
		t.Fatal(err)
	}
	e := &Engine{Params: shipped(t), Load: StoreLoader(p.s.Store()), Cores: 2}
	list, err := e.LandLeft(context.Background(), snap, "s")
	if err != nil {
		t.Fatal(err)
	}
	// A square of 1 km less two triangles of half of 900 by 900 m.
	if l := list[0]; !l.Hull || math.Abs(l.DistrictHa-(100-81)) > 0.001 {
		t.Errorf("hull %v, %v ha", l.Hull, l.DistrictHa)
	}
}

// Every step of a sweep is what the land left, and the candidates, are under that value alone.
func TestSweep(t *testing.T) {
	s := smallStudy(t, 40)
	snap, err := s.Snapshot()
	if err != nil {
		t.Fatal(err)
	}
	const key = "rule.setback.dwellings.wind_m"
	e := &Engine{Params: shipped(t), Load: StoreLoader(s.Store()), Cores: 2, Cache: &Memory{}}
	var steps []Step
	err = e.Sweep(context.Background(), snap, "wind", key, []float64{300, 600}, func(st Step) error {
		steps = append(steps, st)
		return nil
	})
	if err != nil || len(steps) != 2 {
		t.Fatal(len(steps), err)
	}
	for _, st := range steps {
		alone, err := snap.With(key, st.Value)
		if err != nil {
			t.Fatal(err)
		}
		list, err := e.LandLeft(context.Background(), alone, "wind")
		if err != nil {
			t.Fatal(err)
		}
		if list[0].LeftHa != st.LeftHa || len(list[0].Zones) != len(st.Zones) {
			t.Errorf("at %v: %v ha in %d zones, alone %v ha in %d", st.Value, st.LeftHa, len(st.Zones), list[0].LeftHa, len(list[0].Zones))
		}
		r, err := e.Compute(context.Background(), alone)
		if err != nil {
			t.Fatal(err)
		}
		fitted := 0
		for i := range r.Candidates {
			if r.Candidates[i].Plant == "wind" && r.Candidates[i].Status == Fitted {
				fitted++
			}
		}
		if fitted != st.Fitted || len(st.First) != len(r.Voices) {
			t.Errorf("at %v: %d fitted, alone %d; first %v", st.Value, st.Fitted, fitted, st.First)
		}
	}
	if steps[1].LeftHa >= steps[0].LeftHa || steps[1].Fitted > steps[0].Fitted {
		t.Errorf("a greater distance leaves %v of %v ha, %d of %d candidates", steps[1].LeftHa, steps[0].LeftHa, steps[1].Fitted, steps[0].Fitted)
	}
	var unknown *study.UnknownKeyError
	if err := e.Sweep(context.Background(), snap, "wind", "rule.nothing", []float64{1}, nil); err == nil || !errors.As(err, &unknown) {
		t.Errorf("error %v", err)
	}
}
