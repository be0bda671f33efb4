package run

import (
	"context"
	"math"
	"strconv"
	"testing"
)

// A square of 1 km with a house in its middle: a distance of 800 m takes all of it, and what is left of a
// smaller one are four corners, whose size follows from circle and square.
func TestNearestMiss(t *testing.T) {
	p := newPlain(t)
	p.add("parcels", []string{"parcel_id"}, thing{square(-500, -500, 1000), map[string]string{"parcel_id": "A"}})
	p.add("dwellings", []string{"class"}, thing{square(-1, -1, 2), nil})
	p.add("exclusion", []string{"reason"}, thing{square(-500, -500, 100), map[string]string{"reason": "test"}})
	p.set("plant.s.technology", "solar_fixed", "plant.s.title", "S", "rule.exclude.dwellings", "no",
		"rule.setback.dwellings.s_m", "800", "rule.smallest_patch.s_ha", "1")
	r := compute(t, p.s, nil, 1)
	c := &r.Candidates[0]
	if c.Status != NoRoom {
		t.Fatalf("status %s %s", c.Status, c.Reason)
	}
	snap, err := p.s.Snapshot()
	if err != nil {
		t.Fatal(err)
	}
	sv := NewSurveyor(snap, shipped(t), StoreLoader(p.s.Store()), nil)
	list, err := sv.NearestMiss(context.Background(), c)
	if err != nil {
		t.Fatal(err)
	}
	if len(list) != 1 || list[0].Rule != "setback:dwellings" || list[0].From != 800 || list[0].Unit != "m" {
		t.Fatalf("%+v", list)
	}
	// A corner cut off by a circle of radius r about the middle: quadrant minus circle, for r between 500 and
	// 707 m; the house's own size adds up to 1.4 m, the arcs 0.12 %.
	corner := func(r float64) float64 {
		a := math.Acos(500 / r)
		return 500*500 - 500*math.Sqrt(r*r-500*500) - r*r*(math.Pi/4-a)
	}
	lo, hi := 500.0, 707.0
	for range 60 {
		if mid := (lo + hi) / 2; corner(mid) >= 1e4 {
			lo = mid
		} else {
			hi = mid
		}
	}
	if math.Abs(list[0].To-lo) > 2.5 {
		t.Errorf("brought back at %.2f m, want %.2f", list[0].To, lo)
	}
	// What was found is enough, and a little more is not.
	for m, want := range map[float64]string{list[0].To: Fitted, list[0].To + 0.2: NoRoom} {
		p.set("rule.setback.dwellings.s_m", num(m))
		if got := compute(t, p.s, nil, 1).Candidates[0].Status; got != want {
			t.Errorf("at %v m: %s, want %s", m, got, want)
		}
	}
}

// Two rules that each take all leave no single one to change; the register names both.
func TestRegister(t *testing.T) {
	p := newPlain(t)
	p.add("parcels", []string{"parcel_id"}, thing{square(0, 0, 300), map[string]string{"parcel_id": "A"}}, thing{square(1000, 0, 300), map[string]string{"parcel_id": "B"}})
	p.add("exclusion", []string{"reason"}, thing{square(-10, -10, 320), map[string]string{"reason": "test"}})
	p.add("water", []string{"kind"}, thing{square(-10, -10, 330), map[string]string{"kind": "lake"}})
	p.set("plant.s.technology", "solar_fixed", "plant.s.title", "S")
	r := compute(t, p.s, nil, 1)
	snap, err := p.s.Snapshot()
	if err != nil {
		t.Fatal(err)
	}
	list := Register(snap, r)
	if len(list) != 1 || list[0].Site != "A" || list[0].Status != NoRoom || len(list[0].Rules) != 2 {
		t.Fatalf("%+v", list)
	}
	for _, rule := range list[0].Rules {
		if !rule.TakesAll || math.Abs(rule.SharedHa-9) > 0.001 || rule.AloneHa != 0 || len(rule.Data) != 1 {
			t.Errorf("%+v", rule)
		}
	}
	sv := NewSurveyor(snap, shipped(t), StoreLoader(p.s.Store()), nil)
	misses, err := sv.NearestMiss(context.Background(), &r.Candidates[0])
	if err != nil || len(misses) != 0 {
		t.Errorf("%+v, %v", misses, err)
	}
	if _, err := sv.NearestMiss(context.Background(), &r.Candidates[1]); err == nil {
		t.Error("a fitted candidate has no nearest miss")
	}
}

func num(x float64) string { return strconv.FormatFloat(x, 'g', -1, 64) }
