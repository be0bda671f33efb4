package solar

import (
	"math"
	"slices"
	"testing"

	"groundtally/scoring/sun"
)

func horizon(t testing.TB, heights []float64) *Horizon {
	t.Helper()
	h, err := NewHorizon(heights)
	if err != nil {
		t.Fatal(err)
	}
	return h
}

// southern is a ridge of a height in the south, from 150 to 210 degrees.
func southern(deg float64) []float64 {
	h := make([]float64, 72)
	for i := 30; i <= 42; i++ {
		h[i] = deg
	}
	return h
}

func TestHorizonBetweenBearings(t *testing.T) {
	h := horizon(t, southern(12))
	for bearing, want := range map[float64]float64{180: 12, 150: 12, 147.5: 6, 145: 0, 540: 12, -180: 12, 0: 0, 360: 0, 359.9: 0, 212.5: 6} {
		if got := h.HeightDeg(bearing); math.Abs(got-want) > 1e-9 {
			t.Errorf("at %v degrees %v, want %v", bearing, got, want)
		}
	}
	// The first bearing stands again at the end.
	around := make([]float64, 72)
	around[0] = 8
	if got := horizon(t, around).HeightDeg(357.5); math.Abs(got-4) > 1e-9 {
		t.Errorf("between the last bearing and the first %v, want 4", got)
	}
	a := sunAt{height: 4, bearing: 180}
	b := sunAt{height: 20, bearing: 180}
	if got := h.seenBetween(&a, &b); math.Abs(got-0.5) > 1e-12 {
		t.Errorf("a sun that climbs from 8 degrees below to 8 above is seen %v of the time", got)
	}
	if h.seenBetween(&b, &a) != h.seenBetween(&a, &b) || h.seen(&a) != 0 || h.seen(&b) != 1 {
		t.Error("what is seen depends on the way")
	}
}

func TestHorizonRefuses(t *testing.T) {
	for _, bad := range [][]float64{nil, make([]float64, 7), make([]float64, 3601), slices.Repeat([]float64{91}, 72), slices.Repeat([]float64{math.NaN()}, 72)} {
		if _, err := NewHorizon(bad); err == nil {
			t.Errorf("%d heights were accepted", len(bad))
		}
	}
	below := slices.Repeat([]float64{-5}, 72)
	if got := horizon(t, below).HeightDeg(10); got != 0 {
		t.Errorf("a horizon below the horizontal hides %v", got)
	}
}

// Property: front and rear of a plane share the sky; turning horizon and plane together changes nothing.
func TestSkyViewProperties(t *testing.T) {
	h := horizon(t, southern(25))
	flat := h.SkyView(sun.Vec{Z: 1})
	if flat >= 1 || flat < 0.9 {
		t.Errorf("the horizontal sees %v", flat)
	}
	turned := make([]float64, 72)
	for i, deg := range southern(25) {
		turned[(i+18)%72] = deg
	}
	g := horizon(t, turned)
	for _, tilt := range []float64{0, 10, 35, 60, 90, 120, 150} {
		for _, az := range []float64{0, 77.5, 180, 265} {
			n := sun.PlaneNormal(tilt, az)
			v := h.SkyView(n)
			if open := (1 + n.Z) / 2; v < -1e-12 || v > open+1e-3 {
				t.Errorf("tilt %v towards %v: view %v of at most %v", tilt, az, v, open)
			}
			if w := g.SkyView(sun.PlaneNormal(tilt, az+90)); math.Abs(v-w) > 1e-9 {
				t.Errorf("tilt %v towards %v: %v, turned %v", tilt, az, v, w)
			}
		}
	}
	if north, south := h.SkyView(sun.PlaneNormal(40, 0)), h.SkyView(sun.PlaneNormal(40, 180)); south >= north {
		t.Errorf("a ridge in the south takes more from a plane to the north: %v, %v", north, south)
	}
}

func TestYieldBehindAHorizon(t *testing.T) {
	c, err := NewClimate(madison())
	if err != nil {
		t.Fatal(err)
	}
	for _, p := range plants(t) {
		of := func(h *Horizon) YearResult {
			p.Mount.Horizon = h
			r, err := c.Yield(p)
			if err != nil {
				t.Fatal(err)
			}
			return r
		}
		open := of(nil)
		level := of(ring(0))
		if level.Chain[0].Name != StepHorizon || open.Chain[0].Name == StepHorizon {
			t.Fatalf("steps %v, %v", level.Chain[0].Name, open.Chain[0].Name)
		}
		if d := level.SpecificYieldKWhPerKWp/open.SpecificYieldKWhPerKWp - 1; math.Abs(d) > 2e-3 {
			t.Errorf("%v: a level horizon changes the yield by %v", p.Mount.Kind, d)
		}
		before := level.SpecificYieldKWhPerKWp
		for _, deg := range []float64{3, 8, 20, 45} {
			y := of(ring(deg)).SpecificYieldKWhPerKWp
			if y >= before {
				t.Errorf("%v: %v within %v degrees, %v within less", p.Mount.Kind, y, deg, before)
			}
			before = y
		}
		r := of(ring(89.999))
		if r.SpecificYieldKWhPerKWp > 1e-3*open.SpecificYieldKWhPerKWp {
			t.Errorf("%v: in a shaft %v", p.Mount.Kind, r.SpecificYieldKWhPerKWp)
		}
	}
	// In winter the sun of Madison stands at most 23.5 degrees high: a ridge of 30 in the south takes its beam at
	// noon, one in the north takes none of it all year.
	p := defaultPlant(Mount{TiltDeg: 40, AzimuthDeg: 180})
	p.Sky = Isotropic
	open, _ := c.Yield(p)
	p.Mount.Horizon = horizon(t, southern(30))
	south, err := c.Yield(p)
	if err != nil {
		t.Fatal(err)
	}
	if s := south.MonthKWhPerKWp[11] / open.MonthKWhPerKWp[11]; s > 0.55 {
		t.Errorf("December behind the ridge keeps %v", s)
	}
	if s := south.MonthKWhPerKWp[5] / open.MonthKWhPerKWp[5]; s < 0.95 {
		t.Errorf("June behind the ridge keeps only %v", s)
	}
}

// Between the steps of a tracker's turn the views are true to 0.001.
func TestViewsOfATracker(t *testing.T) {
	p := defaultPlant(Mount{Kind: SingleAxis, AxisAzimuthDeg: 170, MaxAngleDeg: 57, GCR: 0.35, WidthM: 4, ClearanceM: 1.5, SlopeDeg: 6, AspectDeg: 120})
	p.Module = defaults(t).Module(true)
	p.Mount.Horizon = horizon(t, southern(25))
	v := newViewer(&p, 0.7)
	for deg := -57.0; deg <= 57; deg += 0.7 {
		v.sinR, v.cosR = math.Sincos(deg * radPerDeg)
		n := v.frame.Normal(deg)
		got, want := v.viewsAt(n), v.viewsOf(n)
		if math.Abs(got.front-want.front) > 1e-3 || math.Abs(got.rear-want.rear) > 1e-3 {
			t.Errorf("turned by %v: %+v, want %+v", deg, got, want)
		}
	}
}
