package run

import (
	"math"
	"testing"

	"groundtally/app/study"
	"groundtally/geo"
	"groundtally/scoring"
)

// tracked is a plain study with one turbine by hand in the middle of its parcel and a road 1 km to the south.
func tracked(t *testing.T) *plain {
	t.Helper()
	p := windYield(t)
	p.set("wind.typed_mean_speed_m_per_s", "7", "wind.typed_height_m", "100")
	p.add("roads", []string{"class"}, thing{line(-2000, -1000, 2000, -1000), map[string]string{"class": "local"}})
	ll, err := p.frame.Inverse(geo.XY{})
	if err != nil {
		t.Fatal(err)
	}
	if err := p.s.PutLayout(t.Context(), study.HandLayout{Site: "DE.1", Plant: "wind", At: []geo.LonLat{ll}, Reason: "test"}); err != nil {
		t.Fatal(err)
	}
	return p
}

func box(x0, y0, x1, y1 float64) geo.XYGeometry {
	return geo.XYGeometry{Kind: geo.Polygons, Parts: [][][]geo.XY{{{{X: x0, Y: y0}, {X: x1, Y: y0}, {X: x1, Y: y1}, {X: x0, Y: y1}, {X: x0, Y: y0}}}}}
}

func TestTracksTakeTheShortestWayAroundWater(t *testing.T) {
	open := tracked(t).computed(nil)
	if q, _ := open.Consequence("track_km"); q.State != scoring.Number || math.Abs(q.Central-1) > 1e-3 || !open.Fit.TracksLaid || len(open.Fit.Tracks.Parts) != 1 {
		t.Fatalf("over open ground %+v, %+v", q, open.Fit.Tracks)
	}
	p := tracked(t)
	p.set("rule.exclude.water", "no", "rule.setback.water.wind_m", "0")
	p.add("water", nil, thing{box(-300, -400, 300, -200), nil})
	c := p.computed(nil)
	// Around a corner of the lake, by hand.
	want := (math.Hypot(300, 600) + 200 + math.Hypot(300, 200)) / 1000
	if q, _ := c.Consequence("track_km"); math.Abs(q.Central/want-1) > 0.02 || q.Central < want-1e-3 {
		t.Errorf("around the lake %v km, by hand %v", q.Central, want)
	}
	if !p.said(c, "tracks_laid") && len(c.Fit.Tracks.Parts) == 0 {
		t.Error("it is not told that a way was found")
	}
	// A moat leaves no way: the length is unknown, and what is counted is the usual share of sealed ground.
	moat := box(-300, -300, 300, 300)
	moat.Parts[0] = append(moat.Parts[0], box(-200, -200, 200, 200).Parts[0][0])
	p = tracked(t)
	p.set("rule.exclude.water", "no", "rule.setback.water.wind_m", "0")
	p.add("water", nil, thing{moat, nil})
	c = p.computed(nil)
	if q, _ := c.Consequence("track_km"); q.State != scoring.Unknown || q.Why != "no_way_for_tracks" || c.Fit.TracksLaid {
		t.Errorf("behind a moat %+v", q)
	}
	// 0.3 ha for each of 2 MW (Denholm et al. 2009, as in the wind defaults) on tracks of 5 m.
	if km := c.Fit.TrackKm; math.Abs(km-0.3*2*10000/5/1000) > 1e-9 {
		t.Errorf("%v km are counted", km)
	}
}

// What lies under a track is known once its place is.
func TestTracksTouchWhatTheyCross(t *testing.T) {
	p := tracked(t)
	p.set("rule.exclude.habitat", "no", "rule.setback.habitat.wind_m", "0", "land.habitat_edge_m", "0")
	p.add("habitat", []string{"class"}, thing{box(-400, -450, 400, -300), map[string]string{"class": "meadow"}})
	c := p.computed(nil)
	width := shipped(t).Factors["track_width_m"].Central
	if q, _ := c.Consequence("habitat_ha"); q.State != scoring.Number || math.Abs(q.Central-150*width/10000) > 1e-3 {
		t.Errorf("the track takes %+v of the meadow", q)
	}
}

// A plant of panels is reached at its fence.
func TestTracksReachTheFence(t *testing.T) {
	p := newPlain(t)
	p.add("parcels", []string{"parcel_id"}, thing{square(-200, -200, 400), map[string]string{"parcel_id": "DE.1"}})
	p.add("roads", []string{"class"}, thing{line(-2000, -700, 2000, -700), map[string]string{"class": "local"}})
	p.set("plant.sun.technology", "solar_fixed")
	c := p.computed(nil)
	road, _ := c.Consequence("road_m")
	if q, _ := c.Consequence("track_km"); road.State != scoring.Number || math.Abs(q.Central*1000-road.Central) > 1 {
		t.Errorf("track %v km, road %v m", q, road)
	}
}
