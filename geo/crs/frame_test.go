package crs

import (
	"errors"
	"math"
	"math/rand/v2"
	"os"
	"testing"

	"groundtally/assets/citedtable"
	"groundtally/geo"
	"groundtally/geo/measure"
)

func mustFrame(t testing.TB, lon, lat float64) Frame {
	t.Helper()
	f, err := NewFrame(geo.LonLat{Lon: lon, Lat: lat})
	if err != nil {
		t.Fatal(err)
	}
	return f
}

func mustXY(t testing.TB, f Frame, lon, lat float64) geo.XY {
	t.Helper()
	p, err := f.Forward(geo.LonLat{Lon: lon, Lat: lat})
	if err != nil {
		t.Fatal(err)
	}
	return p
}

func TestCheckTable(t *testing.T) {
	tab, err := citedtable.ParseFS(os.DirFS("../../testdata/check"), "crs.csv")
	if err != nil {
		t.Fatal(err)
	}
	checks, err := tab.Checks()
	if err != nil {
		t.Fatal(err)
	}
	for _, c := range checks {
		t.Run(c.ID, func(t *testing.T) {
			got := quantity(t, c)
			if !c.OK(got) {
				t.Errorf("%s(%v %v) = %.12g, want %.12g within %g (%s)", c.Quantity, c.In, c.Text, got, c.Expected, c.Tolerance, c.Source)
			}
		})
	}
}

func quantity(t *testing.T, c citedtable.Check) float64 {
	in := c.In
	switch c.Quantity {
	case "geodesic_area_m2":
		f := mustFrame(t, in["lon0"], in["lat0"])
		n := int(in["n"])
		ring := make([]geo.XY, 0, n+1)
		for i := range n {
			s, cos := math.Sincos(2 * math.Pi * float64(i) / float64(n))
			ring = append(ring, mustXY(t, f, in["lon"]+in["dlon"]*cos, in["lat"]+in["dlat"]*s))
		}
		return measure.SignedRingAreaM2(append(ring, ring[0]))
	case "geodesic_distance_m":
		f := mustFrame(t, in["lon0"], in["lat0"])
		return mustXY(t, f, in["lon1"], in["lat1"]).Dist(mustXY(t, f, in["lon2"], in["lat2"]))
	case "true_azimuth_deg":
		f := mustFrame(t, in["lon0"], in["lat0"])
		a, b := mustXY(t, f, in["lon"], in["lat"]), mustXY(t, f, in["lon2"], in["lat2"])
		az, err := f.TrueAzimuthDeg(a, measure.AzimuthDeg(a, b))
		if err != nil {
			t.Fatal(err)
		}
		if az-c.Expected > 180 {
			az -= 360
		}
		return az
	case "convergence_deg":
		f := mustFrame(t, in["lon0"], in["lat0"])
		g, err := f.ConvergenceDeg(mustXY(t, f, in["lon"], in["lat"]))
		if err != nil {
			t.Fatal(err)
		}
		return g
	case "frame_x_m":
		return mustXY(t, mustFrame(t, in["lon0"], in["lat0"]), in["lon"], in["lat"]).X
	case "frame_y_m":
		return mustXY(t, mustFrame(t, in["lon0"], in["lat0"]), in["lon"], in["lat"]).Y
	case "to_wgs84_lon_deg", "to_wgs84_lat_deg":
		tr, err := NewTransform(c.Text["code"])
		if err != nil {
			t.Fatal(err)
		}
		p, err := tr.Forward(in["x"], in["y"])
		if err != nil {
			t.Fatal(err)
		}
		if c.Quantity == "to_wgs84_lon_deg" {
			return p.Lon
		}
		return p.Lat
	}
	t.Fatalf("unknown quantity %q", c.Quantity)
	return 0
}

func TestRoundTrip(t *testing.T) {
	r := rand.New(rand.NewPCG(1, 2))
	for range 20000 {
		f := mustFrame(t, r.Float64()*360-180, r.Float64()*170-85)
		a, d := r.Float64()*2*math.Pi, r.Float64()*MaxRadiusM
		p := geo.XY{X: d * math.Sin(a), Y: d * math.Cos(a)}
		ll, err := f.Inverse(p)
		if err != nil {
			t.Fatal(err)
		}
		q, err := f.Forward(ll)
		if err != nil {
			if d < MaxRadiusM-1e-3 {
				t.Fatal(err)
			}
			continue
		}
		if p.Dist(q) > 1e-7 {
			t.Fatalf("centre %v: %v came back as %v, %g m off", f.Centre(), p, q, p.Dist(q))
		}
	}
}

func TestCentreIsOrigin(t *testing.T) {
	f := mustFrame(t, -28.3, 38.5)
	if p := mustXY(t, f, -28.3, 38.5); math.Hypot(p.X, p.Y) > 2e-9 {
		t.Errorf("the centre maps to %v", p)
	}
	if ll, err := f.Inverse(geo.XY{}); err != nil || ll != f.Centre() {
		t.Errorf("the origin maps to %v, %v", ll, err)
	}
	if g, err := f.ConvergenceDeg(geo.XY{Y: 50000}); err != nil || math.Abs(g) > 1e-12 {
		t.Errorf("convergence on the central meridian %v, %v", g, err)
	}
}

func TestAzimuthsInvert(t *testing.T) {
	f := mustFrame(t, 9, 60)
	at := geo.XY{X: 25000, Y: -12000}
	for az := 0.0; az < 360; az += 7 {
		tr, err := f.TrueAzimuthDeg(at, az)
		if err != nil {
			t.Fatal(err)
		}
		back, err := f.GridAzimuthDeg(at, tr)
		if err != nil {
			t.Fatal(err)
		}
		if d := math.Abs(math.Remainder(back-az, 360)); d > 1e-9 || back < 0 || back >= 360 {
			t.Errorf("grid azimuth %v came back as %v", az, back)
		}
	}
}

func TestFrameRefuses(t *testing.T) {
	for _, c := range []geo.LonLat{{Lon: 0, Lat: 86}, {Lon: 0, Lat: -90}, {Lon: math.NaN(), Lat: 0}, {Lon: 0, Lat: math.Inf(1)}, {Lon: 400, Lat: 0}} {
		if _, err := NewFrame(c); err == nil {
			t.Errorf("a frame centred on %v was accepted", c)
		}
	}
	f := mustFrame(t, 9, 48)
	for _, p := range []geo.LonLat{{Lon: math.NaN(), Lat: 48}, {Lon: 9, Lat: 91}, {Lon: 412801, Lat: 4261767}} {
		if _, err := f.Forward(p); err == nil {
			t.Errorf("%v was accepted", p)
		}
	}
	for _, p := range []geo.LonLat{{Lon: 9, Lat: 51}, {Lon: -171, Lat: -48}, {Lon: 100, Lat: 0}, {Lon: 13.2, Lat: 48}} {
		if _, err := f.Forward(p); !errors.Is(err, ErrTooFar) {
			t.Errorf("%v gave %v, want ErrTooFar", p, err)
		}
	}
	if _, err := f.Inverse(geo.XY{X: 400e3}); !errors.Is(err, ErrTooFar) {
		t.Errorf("got %v, want ErrTooFar", err)
	}
	if _, err := f.Inverse(geo.XY{X: math.NaN()}); err == nil {
		t.Error("NaN was accepted")
	}
}

func TestProjectDensifies(t *testing.T) {
	f := mustFrame(t, 9, 48)
	// A parallel is bent in the frame: 10 km in two positions would cut 2.2 m off.
	line := geo.LonLatGeometry{Kind: geo.Lines, Parts: [][][]geo.LonLat{{{{Lon: 9, Lat: 48}, {Lon: 9.134, Lat: 48}}}}}
	xy, err := f.Project(line)
	if err != nil {
		t.Fatal(err)
	}
	ring := xy.Parts[0][0]
	if len(ring) != 6 {
		t.Fatalf("an edge of 10 km became %d positions, want 6", len(ring))
	}
	worst := 0.0
	for k := 0.0; k <= 1; k += 1.0 / 512 {
		p := mustXY(t, f, 9+0.134*k, 48)
		_, d := measure.NearestOnOutline(p, xy)
		worst = math.Max(worst, d)
	}
	if worst > 0.1 || worst < 0.01 {
		t.Errorf("the projected edge departs by %.3f m, want between 0.01 and 0.1", worst)
	}
	// The neighbour's edge runs the other way with the very same positions.
	line.Parts[0][0][0], line.Parts[0][0][1] = line.Parts[0][0][1], line.Parts[0][0][0]
	back, err := f.Project(line)
	if err != nil {
		t.Fatal(err)
	}
	for i, p := range back.Parts[0][0] {
		if p != ring[len(ring)-1-i] {
			t.Errorf("position %d of the reversed edge is %v, want %v", i, p, ring[len(ring)-1-i])
		}
	}
	// Short edges and points keep their count; the shape of parts is kept.
	g := geo.LonLatGeometry{Kind: geo.Points, Parts: [][][]geo.LonLat{{{{Lon: 9, Lat: 48}}}, {{{Lon: 9.5, Lat: 48}}}}}
	if p, err := f.Project(g); err != nil || p.Count() != 2 || len(p.Parts) != 2 || p.Kind != geo.Points {
		t.Errorf("points became %v, %v", p, err)
	}
	if _, err := f.Project(geo.LonLatGeometry{Kind: geo.Points, Parts: [][][]geo.LonLat{{{{Lon: 90, Lat: 48}}}}}); !errors.Is(err, ErrTooFar) {
		t.Errorf("got %v, want ErrTooFar", err)
	}
	out, err := f.Unproject(xy)
	if err != nil {
		t.Fatal(err)
	}
	for _, p := range out.Parts[0][0] {
		if math.Abs(p.Lat-48) > 1e-9 {
			t.Errorf("unprojected latitude %v", p.Lat)
		}
	}
}

// Property: splitting a parcel keeps the total area.
func TestSplitKeepsArea(t *testing.T) {
	f := mustFrame(t, -4, 57)
	box := func(w, s, e, n float64) float64 {
		g, err := f.Project(geo.LonLatGeometry{Kind: geo.Polygons, Parts: [][][]geo.LonLat{{{{Lon: w, Lat: s}, {Lon: e, Lat: s}, {Lon: e, Lat: n}, {Lon: w, Lat: n}, {Lon: w, Lat: s}}}}})
		if err != nil {
			t.Fatal(err)
		}
		return measure.AreaM2(g)
	}
	whole := box(-4.2, 57, -3.9, 57.2)
	parts := box(-4.2, 57, -4.05, 57.2) + box(-4.05, 57, -3.9, 57.2)
	if math.Abs(whole-parts) > 1e-6*whole {
		t.Errorf("whole %v, parts %v", whole, parts)
	}
	if err := measure.CheckArea(whole, geo.LonLatGeometry{Kind: geo.Polygons, Parts: [][][]geo.LonLat{{{{Lon: -4.2, Lat: 57}, {Lon: -3.9, Lat: 57}, {Lon: -3.9, Lat: 57.2}, {Lon: -4.2, Lat: 57.2}, {Lon: -4.2, Lat: 57}}}}}); err != nil {
		t.Error(err)
	}
}

func BenchmarkForward(b *testing.B) {
	f := mustFrame(b, 9, 48)
	p := geo.LonLat{Lon: 9.31, Lat: 48.12}
	for b.Loop() {
		if _, err := f.Forward(p); err != nil {
			b.Fatal(err)
		}
	}
}

func BenchmarkInverse(b *testing.B) {
	f := mustFrame(b, 9, 48)
	p := geo.XY{X: 21000, Y: -8000}
	for b.Loop() {
		if _, err := f.Inverse(p); err != nil {
			b.Fatal(err)
		}
	}
}
