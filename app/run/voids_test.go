package run

import (
	"context"
	"math"
	"testing"
)

func TestVoidsInTheDistrict(t *testing.T) {
	p := windYield(t)
	look := func() []GridVoids {
		t.Helper()
		snap, err := p.s.Snapshot()
		if err != nil {
			t.Fatal(err)
		}
		list, err := Voids(context.Background(), snap, StoreLoader(p.s.Store()))
		if err != nil {
			t.Fatal(err)
		}
		return list
	}
	if list := look(); len(list) != 0 {
		t.Fatalf("without grids: %+v", list)
	}
	// 8 by 8 cells of 250 m; the parcel holds the 16 in the middle. Void are two of these and one outside.
	p.grid("wind_resource", "Wind", 0, 0, 250, at100, "m/s", func(c, r int) string {
		if c == 3 && r == 2 || c == 5 && r == 4 || c == 0 && r == 0 {
			return "-9999"
		}
		return "7"
	})
	p.grid("wind_resource", "Away", 9000, 0, 250, at100, "m/s", all("7"))
	p.terrain(func(x, y float64) float64 { return 10 })
	list := look()
	if len(list) != 3 || list[0].Layer != "Away" || !list[0].Apart || list[0].Voids != 0 {
		t.Fatalf("%+v", list)
	}
	w, h := list[1], list[2]
	if w.Layer != "Wind" || w.Cells != 16 || w.Voids != 2 || math.Abs(w.VoidHa-2*6.25) > 1e-6 || !w.Parcels || w.Apart {
		t.Errorf("%+v", w)
	}
	xy, err := p.frame.Forward(w.At)
	if err != nil || math.Abs(xy.X+125) > 0.01 || math.Abs(xy.Y-375) > 0.01 {
		t.Errorf("the first void is at %v, %v", xy, err)
	}
	if h.Layer != "heights" || h.Cells != 2500 || h.Voids != 0 || h.VoidHa != 0 {
		t.Errorf("%+v", h)
	}
	// A district of the western half has the western void alone.
	p.add("district", []string{"name"}, thing{square(-500, -500, 499), nil}, thing{square(-500, 0, 499), nil})
	if w = look()[1]; w.Cells != 8 || w.Voids != 1 || w.Parcels {
		t.Errorf("in the district: %+v", w)
	}
}
