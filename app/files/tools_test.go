package files

import (
	"context"
	"errors"
	"testing"

	"groundtally/geo"
)

// A stop ends the work on many polygons; without one every answer stands at its polygon's place, whatever the
// number of workers.
func TestManyPolygonsAreMadeValid(t *testing.T) {
	ring := func(x float64, crossed bool) geo.XYGeometry {
		r := []geo.XY{{X: x, Y: 0}, {X: x + 10, Y: 0}, {X: x + 10, Y: 10}, {X: x, Y: 10}, {X: x, Y: 0}}
		if crossed {
			r[2], r[3] = r[3], r[2]
		}
		return geo.XYGeometry{Kind: geo.Polygons, Parts: [][][]geo.XY{{r}}}
	}
	var gs []geo.XYGeometry
	for i := range 5000 {
		gs = append(gs, ring(float64(i)*20, i%7 == 3))
	}
	tools, done := NewTools()
	defer done()
	out, err := tools.Repair(context.Background(), gs)
	if err != nil || len(out) != len(gs) {
		t.Fatal(len(out), err)
	}
	for i, r := range out {
		want := 100.0
		if i%7 == 3 {
			want = 50 // the two triangles of the bow tie
		}
		if r.Err != nil || r.Changed != (i%7 == 3) || r.AfterM2 != want || r.Geometry.Parts[0][0][0].X < float64(i)*20 || r.Geometry.Parts[0][0][0].X > float64(i)*20+10 {
			t.Fatalf("polygon %d: %+v", i, r)
		}
	}
	stopped, stop := context.WithCancel(context.Background())
	stop()
	if _, err := tools.Repair(stopped, gs); !errors.Is(err, context.Canceled) {
		t.Errorf("stopped: %v", err)
	}
}
