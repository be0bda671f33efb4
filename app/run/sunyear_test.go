package run

import (
	"math"
	"math/rand/v2"
	"testing"
	"time"

	"groundtally/geo"
	"groundtally/geo/crs"
	"groundtally/geo/terrain"
	"groundtally/scoring/solar"
	"groundtally/scoring/sun"
	"groundtally/scoring/units"
)

// The steps of slope, aspect and horizon, each at its worst, move a year's yield by less than 0.2 %.
func TestStepsOfTheLie(t *testing.T) {
	p := shipped(t)
	mounts := []solar.Mount{
		{Kind: solar.FixedTilt, TiltDeg: 30, AzimuthDeg: 180, GCR: 0.45, WidthM: 4},
		{Kind: solar.SingleAxis, AxisAzimuthDeg: 180, MaxAngleDeg: 55, Backtrack: true, GCR: 0.35},
		{Kind: solar.VerticalRows, AzimuthDeg: 90, GCR: 0.22},
		{Kind: solar.Elevated, TiltDeg: 20, AzimuthDeg: 180, GCR: 0.35, WidthM: 4, ClearanceM: 3},
	}
	r := rand.New(rand.NewPCG(1, 2))
	worst := 0.0
	for _, lat := range []float64{40, 57} {
		in := solar.ClimateInput{LatDeg: lat, TempC: solar.EveryMonth(10), Albedo: solar.EveryMonth(0.2)}
		for m := range 12 {
			in.GHIKWhPerM2[m] = 0.5 * sun.MonthMeanDailyWhPerM2(lat, 0, time.Month(m+1)) * float64(sun.DaysInMonth(time.Month(m+1))) / units.WPerKW
		}
		c, err := solar.NewClimate(in)
		if err != nil {
			t.Fatal(err)
		}
		for _, m := range mounts {
			plant := p.Solar.Plant(m)
			of := func(l *lie, slope, aspect float64, heights []float64) float64 {
				plant.Mount = m
				if l != nil {
					if err := l.on(&plant.Mount); err != nil {
						t.Fatal(err)
					}
				} else {
					h, err := solar.NewHorizon(heights)
					if err != nil {
						t.Fatal(err)
					}
					plant.Mount.SlopeDeg, plant.Mount.AspectDeg, plant.Mount.Horizon = slope, aspect, h
					spaced(&plant.Mount)
				}
				y, err := c.Yield(plant)
				if err != nil {
					t.Fatal(err)
				}
				return y.SpecificYieldKWhPerKWp
			}
			for _, slope := range []uint8{2, 10, 25} {
				var l lie
				l.slope, l.aspect = slope, uint8(r.IntN(180))
				heights := make([]float64, horizonAzimuths)
				for i := range l.horizon {
					l.horizon[i] = uint8(r.IntN(14))
					// Rounding errors of neighbours are independent.
					heights[i] = math.Max(0, (float64(l.horizon[i])+r.Float64()-0.5)*horizonStepDeg)
				}
				stepped := of(&l, 0, 0, nil)
				for _, side := range []float64{-0.499, 0.499} {
					exact := of(nil, (float64(slope)+side)*slopeStepDeg, (float64(l.aspect)+side)*aspectStepDeg, heights)
					d := math.Abs(exact/stepped - 1)
					worst = max(worst, d)
					if d > 2e-3 {
						t.Errorf("latitude %v, %v, slope %v: steps move the yield by %.2g", lat, m.Kind, slope, d)
					}
				}
			}
		}
	}
	t.Logf("at most %.2g", worst)
}

// A slope to the south-west under a wall in the east: what is found is what was built, from true north.
func TestLieOfASlope(t *testing.T) {
	frame, err := crs.NewFrame(geo.LonLat{Lon: 9, Lat: 50})
	if err != nil {
		t.Fatal(err)
	}
	const n, cell = 401, 10.0
	// 6 degrees down towards 225, and 200 m higher from 1 km east of the middle on.
	down := math.Tan(6 * math.Pi / 180)
	g, err := terrain.Fill(geo.XY{X: -2000, Y: -2000}, cell, n, n, func(p geo.XY) (float64, bool) {
		z := 500 + down*(p.X+p.Y)*math.Sqrt2/2
		if p.X > 1000 {
			z += 200
		}
		return z, true
	})
	if err != nil {
		t.Fatal(err)
	}
	square := geo.XYGeometry{Kind: geo.Polygons, Parts: [][][]geo.XY{{{{X: -50, Y: -50}, {X: 50, Y: -50}, {X: 50, Y: 50}, {X: -50, Y: 50}, {X: -50, Y: -50}}}}}
	s := site{id: "a", geom: square, box: geo.ExtentOf(square)}
	l, err := lieOn(g, frame, s)
	if err != nil {
		t.Fatal(err)
	}
	if l.slope != 30 || math.Abs(float64(l.aspect)*aspectStepDeg-225) > 1.001 {
		t.Errorf("slope %v, aspect %v", float64(l.slope)*slopeStepDeg, float64(l.aspect)*aspectStepDeg)
	}
	if l.notice != "horizon_partly" {
		t.Errorf("heights end after 2 km, notice %q", l.notice)
	}
	at := func(bearing int) float64 { return float64(l.horizon[bearing/5]) * horizonStepDeg }
	// The wall is as much higher as the slope has climbed in 1 km eastward, and 200 m.
	if want := math.Atan((1000*down*math.Sqrt2/2+200)/1000) * 180 / math.Pi; math.Abs(at(90)-want) > 0.5 {
		t.Errorf("in the east %v degrees, want %.1f", at(90), want)
	}
	if at(225) != 0 || at(45) < 5.5 {
		t.Errorf("downhill %v degrees, uphill %v", at(225), at(45))
	}
	// A place without heights says so.
	far := geo.XYGeometry{Kind: geo.Polygons, Parts: [][][]geo.XY{{{{X: 9000}, {X: 9100}, {X: 9100, Y: 100}, {X: 9000}}}}}
	if l, err := lieOn(g, frame, site{id: "b", geom: far, box: geo.ExtentOf(far)}); err != nil || l.notice != "horizon_flat" {
		t.Errorf("%v, %v", l.notice, err)
	}
}
