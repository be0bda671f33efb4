package solar

import (
	"math"
	"math/rand/v2"
	"testing"

	"groundtally/scoring/sun"
)

// shadedByRays finds the shaded share of a row by casting rays in the plane across the rows, without any
// formula of the package: rows are segments of width gcr about points on the ground line, one apart
// horizontally, the ground rising by the cross slope towards X.
func shadedByRays(sunDeg, rotDeg, crossDeg, gcr float64) float64 {
	const n = 4000
	sx, sz := math.Sin(sunDeg*radPerDeg), math.Cos(sunDeg*radPerDeg)
	wx, wz := math.Cos(rotDeg*radPerDeg), -math.Sin(rotDeg*radPerDeg) // along the width
	rise := math.Tan(crossDeg * radPerDeg)
	hits := 0
	for i := range n {
		u := ((float64(i)+0.5)/n - 0.5) * gcr
		px, pz := u*wx, u*wz
		for _, k := range []float64{-1, 1} {
			// p + a s = (k, k rise) + b w, solved for a and b.
			dx, dz := k-px, k*rise-pz
			det := -sx*wz + sz*wx
			if math.Abs(det) < 1e-12 {
				continue
			}
			a := (-dx*wz + dz*wx) / det
			b := (sx*dz - sz*dx) / det
			if a > 0 && math.Abs(b) <= gcr/2 {
				hits++
				break
			}
		}
	}
	return float64(hits) / n
}

func TestShadedShareAgainstRays(t *testing.T) {
	rng := rand.New(rand.NewPCG(7, 11))
	shaded := 0
	for range 400 {
		cross := 20*rng.Float64() - 10
		sunAngle := 170*rng.Float64() - 85
		rot := 180*rng.Float64() - 90
		gcr := 0.1 + 0.7*rng.Float64()
		if !SunOverGround(sunAngle, cross) || math.Abs(cosd(sunAngle-rot)) < 0.02 {
			continue
		}
		got, want := ShadedShare(sunAngle, rot, cross, gcr), shadedByRays(sunAngle, rot, cross, gcr)
		// Beyond the nearest neighbour no row reaches farther up on even ground, so one each side is enough.
		if math.Abs(got-want) > 6e-4 {
			t.Errorf("sun %v rotation %v cross %v gcr %v: %v, rays %v", sunAngle, rot, cross, gcr, got, want)
		}
		if want > 0 {
			shaded++
		}
	}
	if shaded < 50 {
		t.Fatalf("only %d cases with shade", shaded)
	}
}

func TestBacktrackingJustAvoidsShade(t *testing.T) {
	for _, cross := range []float64{-8, 0, 5} {
		for sunAngle := -80.0; sunAngle <= 80; sunAngle += 4 {
			r := TrackerAngleDeg(sunAngle, cross, 0.45, 90, true)
			if f := ShadedShare(sunAngle, r, cross, 0.45); f != 0 {
				t.Errorf("cross %v sun %v: shade %v", cross, sunAngle, f)
			}
			if math.Abs(r-sunAngle) > 1e-9 && ShadedShare(sunAngle, r+math.Copysign(0.5, sunAngle-r), cross, 0.45) <= 0 {
				t.Errorf("cross %v sun %v: half a degree more would not shade", cross, sunAngle)
			}
		}
	}
}

func TestViewsAddUp(t *testing.T) {
	for tilt := 0.0; tilt <= 90; tilt += 7.5 {
		open := ViewOfRows(cosd(tilt), 0)
		if math.Abs(open.FrontSky-(1+cosd(tilt))/2) > 1e-15 || open.GroundSky != 1 {
			t.Errorf("tilt %v open: %+v", tilt, open)
		}
		for g := 0.05; g < 1; g += 0.05 {
			v := ViewOfRows(cosd(tilt), g)
			if s := v.FrontSky + v.FrontGround + v.FrontRow; math.Abs(s-1) > 1e-12 {
				t.Errorf("tilt %v gcr %v: front sums to %v", tilt, g, s)
			}
			// Light from the sky lands on fronts, rears or the ground: widths times views add up.
			if s := g*(v.FrontSky+v.RearSky) + v.GroundSky; math.Abs(s-1) > 1e-12 {
				t.Errorf("tilt %v gcr %v: sky gives %v", tilt, g, s)
			}
		}
	}
}

func TestFrameIsRight(t *testing.T) {
	for _, f := range []Frame{NewFrame(180, 0, 0), NewFrame(33, 12, 200), NewFrame(90, 30, 90)} {
		for _, d := range []float64{f.X.Dot(f.Y), f.Y.Dot(f.Z), f.Z.Dot(f.X), f.X.Dot(f.X) - 1, f.Y.Dot(f.Y) - 1, f.Z.Dot(f.Z) - 1} {
			if math.Abs(d) > 1e-12 {
				t.Errorf("frame %+v: %v", f, d)
			}
		}
		if f.X.Z != 0 || f.Z.Z <= 0 {
			t.Errorf("frame %+v is not upright", f)
		}
	}
	if v := NewFrame(180, 0, 0).X; math.Abs(v.X+1) > 1e-12 {
		t.Errorf("an axis to the south has its X to %v, want west", v)
	}
}

func TestMeanShadeAgainstSum(t *testing.T) {
	const n = 200000
	for _, blocks := range []int{0, 1, 2, 3} {
		for _, span := range [][2]float64{{-1, 0.4}, {0.2, 0.3}, {-3, 1}, {0.9, 0.1}, {0.5, 0.5}, {-2, -1}, {1, 1}} {
			shaded, power := 0.0, 0.0
			for i := range n {
				f := clamp(span[0]+(span[1]-span[0])*(float64(i)+0.5)/n, 0, 1)
				shaded += f / n
				power += ShadePowerLoss(f, blocks) / n
			}
			s, p := meanShade(span[0], span[1], blocks)
			if math.Abs(s-shaded) > 1e-4 || math.Abs(p-power) > 1e-4 {
				t.Errorf("blocks %d from %v to %v: %v and %v, summed %v and %v", blocks, span[0], span[1], s, p, shaded, power)
			}
		}
	}
}

// The engine turns trackers and casts shadows by sines and cosines; the forms that the check table holds against
// published values work by angles. They are the same.
func TestEngineUsesThePublishedForms(t *testing.T) {
	r := rand.New(rand.NewPCG(91, 92))
	for range 4000 {
		p := defaultPlant(Mount{Kind: SingleAxis, AxisAzimuthDeg: 360 * r.Float64(), MaxAngleDeg: 30 + 60*r.Float64(), Backtrack: r.IntN(2) == 0,
			GCR: 0.1 + 0.8*r.Float64(), SlopeDeg: 20 * r.Float64(), AspectDeg: 360 * r.Float64()})
		m := &p.Mount
		v := newViewer(&p, 0)
		s := sun.Direction(1+88*r.Float64(), 360*r.Float64())
		x, z, up := v.over(s)
		angle, cross := v.frame.SunAngleDeg(s), v.frame.CrossTiltDeg
		if (up > 0) != SunOverGround(angle, cross) {
			t.Fatalf("sun at %v over ground tilted %v: %v", angle, cross, up)
		}
		sinR, cosR := v.turn(x, z, up, m.Backtrack)
		want := TrackerAngleDeg(angle, cross, m.GCR, m.MaxAngleDeg, m.Backtrack)
		if got := math.Atan2(sinR, cosR) / radPerDeg; math.Abs(got-want) > 1e-6 {
			t.Fatalf("%+v, sun at %v over ground tilted %v: turned by %v, want %v", *m, angle, cross, got, want)
		}
		m.Kind, v.sinR, v.cosR = FixedTilt, sinR, cosR
		if got, want := clamp(v.reach(x, z, up), 0, 1), ShadedShare(angle, want, cross, m.GCR); math.Abs(got-want) > 1e-6 {
			t.Fatalf("%+v, sun at %v: shaded %v, want %v", *m, angle, got, want)
		}
		if up > 0 {
			got := v.look([]sunAt{newSunAt(s)}, nil, s.Z).groundSin / s.Z
			if want := 1 - GroundShadeShare(angle, want, cross, m.GCR); math.Abs(got-want) > 1e-6 {
				t.Fatalf("%+v, sun at %v: open ground %v, want %v", *m, angle, got, want)
			}
		}
	}
}
