package terrain

import (
	"fmt"
	"math"
	"math/rand/v2"
	"testing"

	"groundtally/geo"
	"groundtally/geo/measure"
)

// wide gives a grid of n by n cells around the origin, n odd.
func wide(t testing.TB, n int, cellM float64, f func(geo.XY) (float64, bool)) *Grid {
	t.Helper()
	half := float64(n/2) * cellM
	g, err := Fill(geo.XY{X: -half, Y: -half}, cellM, n, n, f)
	if err != nil {
		t.Fatal(err)
	}
	return g
}

func horizon(t testing.TB, g *Grid, at geo.XY, eyeM float64, azimuths int, reachM float64) (angle, known []float64) {
	t.Helper()
	angle, known, err := g.Horizon(at, eyeM, azimuths, reachM)
	if err != nil {
		t.Fatal(err)
	}
	return angle, known
}

const deg = 180 / math.Pi

// effectiveM is the radius of the sphere on which light runs straight.
const effectiveM = measure.MeanEarthRadiusM / (1 - RefractionK)

// The sea from a height h: a tangent to the sphere of effective radius R' from R' + h dips by
// acos(R'/(R' + h)), about √(2h/R'). It touches at √(2hR'); a reach that ends before sees the sea there at
// atan((−h − d²/2R')/d).
func TestHorizonOfTheSea(t *testing.T) {
	g := wide(t, 801, 50, func(geo.XY) (float64, bool) { return 0, true })
	for _, h := range []float64{0.5, 1.6, 10, 20} {
		angle, known := horizon(t, g, geo.XY{X: 12, Y: -7}, h, 24, 19_000)
		want := -math.Acos(effectiveM/(effectiveM+h)) * deg
		for i := range angle {
			if math.Abs(angle[i]-want) > 2e-4 || known[i] < 1-1e-9 {
				t.Errorf("from %v m: %v at %d, want %v; known %v", h, angle[i], i, want, known[i])
			}
		}
	}
	angle, _ := horizon(t, g, geo.XY{}, 20, 8, 3000)
	if want := math.Atan((-20-3000*3000/(2*effectiveM))/3000) * deg; math.Abs(angle[3]-want) > 1e-9 {
		t.Errorf("a short reach gives %v, want %v", angle[3], want)
	}
}

// A tower of one cell at a distance D along the sphere, H high, seen from h: with θ = D/R',
// tan β = ((R' + H)·cos θ − (R' + h)) / ((R' + H)·sin θ). The parabola of the drop is an approach to it. The
// drops at 5, 20, 50 km are 1.707, 27.31, 170.7 m.
func TestHorizonCurvature(t *testing.T) {
	for _, c := range []struct{ d, dropM float64 }{{5_000, 1.707}, {20_000, 27.31}, {50_000, 170.7}, {150_000, 0}} {
		cell := c.d / 100
		for _, high := range []float64{300, 3000} {
			g := wide(t, 221, cell, func(p geo.XY) (float64, bool) {
				if p.Dist(geo.XY{X: c.d}) < cell/2 {
					return high, true
				}
				return -5000, true // out of sight
			})
			eye := 5012.0 // above that ground, 12 m above 0
			angle, _ := horizon(t, g, geo.XY{}, eye, 4, c.d*1.05)
			theta := c.d / effectiveM
			want := math.Atan(((effectiveM+high)*math.Cos(theta)-(effectiveM+12))/((effectiveM+high)*math.Sin(theta))) * deg
			if math.Abs(angle[1]-want) > 1e-3+want*high/measure.MeanEarthRadiusM {
				t.Errorf("%v m high at %v m: %v, want %v", high, c.d, angle[1], want)
			}
			if drop := high - 12 - c.d*math.Tan(angle[1]/deg); c.dropM > 0 && math.Abs(drop-c.dropM) > c.dropM/1000 {
				t.Errorf("at %v m the drop is %v m, want %v", c.d, drop, c.dropM)
			}
		}
	}
}

// A wall along the column X = D, H high, seen over level ground: at azimuth A its crest is D/sin A away,
// tan β = (H − h − drop) / (D / sin A). Rays that miss it see the level ground.
func TestHorizonOfAWall(t *testing.T) {
	const d, high, eye, cell = 1000.0, 60.0, 2.0, 20.0
	g := wide(t, 401, cell, func(p geo.XY) (float64, bool) {
		if p.X == d {
			return high, true
		}
		return 0, true
	})
	const n, reach = 720, 3900.0
	angle, _ := horizon(t, g, geo.XY{}, eye, n, reach)
	for i := range n {
		sin := math.Sin(2 * math.Pi * float64(i) / n)
		level := math.Atan((-eye-reach*reach/(2*effectiveM))/reach) * deg
		away := d / sin
		// Of a wall just out of reach, part of the bilinear ramp before it is seen.
		if sin > 0 && away > reach && away < reach*1.1 {
			continue
		}
		want := level
		if sin > 0 && away < reach {
			want = math.Atan((high-eye-away*away/(2*effectiveM))/away) * deg
		}
		if math.Abs(angle[i]-want) > 1e-6 {
			t.Errorf("azimuth %v: %v, want %v", 360*float64(i)/n, angle[i], want)
		}
	}
}

// A plane of gradient s that rises towards azimuth A, seen from 0 m above it: towards azimuth B it rises by
// s·cos(B − A), whatever the distance, less the drop; so the horizon is there nearest by where it rises and
// also where it falls.
func TestHorizonOfAPlane(t *testing.T) {
	for _, c := range []struct{ slope, rises float64 }{{0.1, 0}, {0.1, 90}, {0.5, 200}, {1, 317}} {
		s, north := math.Sincos(c.rises / deg)
		g := wide(t, 301, 10, func(p geo.XY) (float64, bool) { return c.slope * (s*p.X + north*p.Y), true })
		angle, _ := horizon(t, g, geo.XY{X: 3, Y: 4}, 0, 36, 1400)
		for i, a := range angle {
			want := math.Atan(c.slope*math.Cos((float64(i)*10-c.rises)/deg)) * deg
			if math.Abs(a-want) > 2e-3 {
				t.Errorf("a slope of %v up to %v, azimuth %d: %v, want %v", c.slope, c.rises, i*10, a, want)
			}
		}
	}
}

// A cone of gradient s and foot radius ρ₀ on level ground, its apex at a distance D, seen from the ground.
// In the direction φ off the apex the surface at t is s(ρ₀ − ρ) high, ρ² = D² + t² − 2Dt·cos φ. The angle is
// greatest where d/dt [(ρ₀ − ρ)/t] = 0, that is ρ₀·ρ = ρ² − t·(t − D·cos φ) = D² − D·t·cos φ. Squared:
// t²(D²cos²φ − ρ₀²) − 2t·D·cos φ·(D² − ρ₀²) + D²(D² − ρ₀²) = 0, whose lesser root is the near side.
func TestHorizonOfACone(t *testing.T) {
	const d, foot, slope = 2000.0, 800.0, 0.4
	g := wide(t, 1201, 5, func(p geo.XY) (float64, bool) {
		return slope * math.Max(0, foot-p.Dist(geo.XY{Y: -d})), true
	})
	const n = 720
	angle, known := horizon(t, g, geo.XY{}, 0, n, 2990)
	seen := 0
	for i := range n {
		phi := 2*math.Pi*float64(i)/n - math.Pi
		want := 0.0
		if d*math.Abs(math.Sin(phi)) < foot && math.Cos(phi) > 0 {
			c, k := math.Cos(phi), d*d-foot*foot
			a, half := d*d*c*c-foot*foot, d*c*k
			at := (half - math.Sqrt(half*half-a*d*d*k)) / a
			rho := math.Sqrt(d*d + at*at - 2*d*at*c)
			want = math.Atan((slope*(foot-rho)-at*at/(2*effectiveM))/at) * deg
			seen++
		}
		if math.Abs(angle[i]-want) > 0.02 || known[i] < 1-1e-9 {
			t.Errorf("azimuth %v: %v, want %v; known %v", float64(i)/2, angle[i], want, known[i])
		}
	}
	if top := math.Atan(slope*foot/d) * deg; math.Abs(angle[n/2]-top) > 0.01 || seen < 90 {
		t.Errorf("the apex, due south, stands at %v, want %v; the cone spans %d azimuths", angle[n/2], top, seen)
	}
}

// Azimuths run clockwise from grid north: towers of different heights in eight directions.
func TestHorizonAzimuthOrder(t *testing.T) {
	dirs := [8][2]int{{0, 1}, {1, 1}, {1, 0}, {1, -1}, {0, -1}, {-1, -1}, {-1, 0}, {-1, 1}}
	g := wide(t, 101, 10, func(p geo.XY) (float64, bool) {
		for i, e := range dirs {
			if p.Dist(geo.XY{X: float64(300 * e[0]), Y: float64(300 * e[1])}) < 1 {
				return float64(10 * (i + 1)), true
			}
		}
		return 0, true
	})
	angle, _ := horizon(t, g, geo.XY{}, 0, 8, 490)
	for i, e := range dirs {
		away := 300 * math.Hypot(float64(e[0]), float64(e[1]))
		want := math.Atan((float64(10*(i+1))-away*away/(2*effectiveM))/away) * deg
		if math.Abs(angle[i]-want) > 1e-9 {
			t.Errorf("azimuth %d: %v, want %v", 45*i, angle[i], want)
		}
	}
	for _, n := range []int{1, 3, 7, 360} {
		a, _ := horizon(t, g, geo.XY{}, 0, n, 490)
		if len(a) != n || a[0] != angle[0] {
			t.Errorf("of %d azimuths the first is %v, want that to the north, %v", n, a[0], angle[0])
		}
	}
}

// What is missing is skipped, and the known share of each ray says so.
func TestHorizonWithGaps(t *testing.T) {
	height := func(p geo.XY) (float64, bool) {
		if p.X > 300 && p.X < 500 {
			return 0, false
		}
		if p.X == 600 {
			return 50, true
		}
		return 0, true
	}
	g := wide(t, 201, 10, height)
	angle, known := horizon(t, g, geo.XY{}, 1, 4, 900)
	if want := math.Atan((49-600*600/(2*effectiveM))/600) * deg; math.Abs(angle[1]-want) > 1e-9 {
		t.Errorf("behind a gap: %v, want %v", angle[1], want)
	}
	// Heights end at 300 and begin at 500: 200 of 900 m are not known.
	for i, want := range []float64{1, 700.0 / 900, 1, 1} {
		if math.Abs(known[i]-want) > 1e-9 {
			t.Errorf("azimuth %d: known %v, want %v", 90*i, known[i], want)
		}
	}
	// The grid ends 1005 m away.
	_, known = horizon(t, g, geo.XY{}, 1, 4, 2010)
	if math.Abs(known[0]-0.5) > 1e-9 || math.Abs(known[1]-805.0/2010) > 1e-9 {
		t.Errorf("beyond the grid: %v", known)
	}
	// A lone height sees nothing.
	lone := wide(t, 5, 10, func(p geo.XY) (float64, bool) { return 7, p == geo.XY{} })
	angle, known = horizon(t, lone, geo.XY{}, 1, 16, 20)
	for i := range angle {
		if !math.IsNaN(angle[i]) || known[i] != 0 {
			t.Errorf("a lone height sees %v, %v", angle[i], known[i])
		}
	}
	// From the outer half cell, out of the grid.
	angle, known = horizon(t, g, geo.XY{X: 1004, Y: 1004}, 1, 4, 100)
	if known[0] > 0.0101 || known[1] > 0.0101 || known[2] < 1-1e-9 || math.IsNaN(angle[2]) {
		t.Errorf("from the corner: %v, %v", angle, known)
	}
}

// Against a walk in small steps over rough ground: nothing is missed, and never more seen than there is, near
// or far. The walk itself passes by ridges by up to half a step.
func TestHorizonMissesNothing(t *testing.T) {
	r := rand.New(rand.NewPCG(7, 7))
	worst := 0.0
	for range 6 {
		lift := r.Float64() * 40
		g := wide(t, 401, 25, func(p geo.XY) (float64, bool) {
			return 150*math.Sin(p.X/700+lift)*math.Cos(p.Y/900) + 12*r.Float64(), true
		})
		at := geo.XY{X: 1500 * (r.Float64() - 0.5), Y: 1500 * (r.Float64() - 0.5)}
		const n, reach, eye = 90, 4000.0, 1.6
		angle, _ := horizon(t, g, at, eye, n, reach)
		ground, _ := g.Sample(at)
		for i := range n {
			s, c := math.Sincos(2 * math.Pi * float64(i) / n)
			top := math.Inf(-1)
			step := g.CellM / 500
			for d := step; d <= reach; d += step {
				if d > 400 {
					step = g.CellM / 50
				}
				z, ok := g.Sample(geo.XY{X: at.X + d*s, Y: at.Y + d*c})
				if !ok {
					t.Fatal("the walk left the grid")
				}
				top = math.Max(top, (z-ground-eye-d*d/(2*effectiveM))/d)
			}
			walk := math.Atan(top) * deg
			worst = math.Max(worst, math.Abs(angle[i]-walk))
			if walk-angle[i] > 1e-9 || angle[i]-walk > 0.05 {
				t.Errorf("azimuth %d: %v, the walk sees %v", i*360/n, angle[i], walk)
			}
		}
	}
	t.Logf("at most %.4f degrees apart", worst)
}

// A crest of one cell far away is not stepped over.
func TestHorizonSeesALoneCrestFarAway(t *testing.T) {
	g := wide(t, 1601, 25, func(p geo.XY) (float64, bool) {
		if p.Y == 18_000 {
			return 400, true
		}
		return 0, true
	})
	angle, _ := horizon(t, g, geo.XY{X: 11, Y: 3}, 1.6, 360, 19_900)
	for _, az := range []int{0, 5, 350, 20} {
		away := (18_000 - 3) / math.Cos(float64(az)/deg)
		want := math.Atan((400-1.6-away*away/(2*effectiveM))/away) * deg
		if math.Abs(angle[az]-want) > 1e-6 {
			t.Errorf("azimuth %d: %v, want %v", az, angle[az], want)
		}
	}
}

func TestHorizonRefuses(t *testing.T) {
	g := grid(t, 6, 6, func(p geo.XY) (float64, bool) { return 1, p.X < 1030 })
	in := geo.XY{X: 1010, Y: -480}
	for name, f := range map[string]func() error{
		"no azimuth":     func() error { _, _, err := g.Horizon(in, 1, 0, 10); return err },
		"many azimuths":  func() error { _, _, err := g.Horizon(in, 1, 1<<20, 10); return err },
		"below ground":   func() error { _, _, err := g.Horizon(in, -1, 4, 10); return err },
		"no height":      func() error { _, _, err := g.Horizon(in, math.NaN(), 4, 10); return err },
		"no reach":       func() error { _, _, err := g.Horizon(in, 1, 4, 0); return err },
		"far reach":      func() error { _, _, err := g.Horizon(in, 1, 4, 1e6); return err },
		"NaN reach":      func() error { _, _, err := g.Horizon(in, 1, 4, math.NaN()); return err },
		"outside":        func() error { _, _, err := g.Horizon(geo.XY{}, 1, 4, 10); return err },
		"missing height": func() error { _, _, err := g.Horizon(geo.XY{X: 1040, Y: -480}, 1, 4, 10); return err },
		"NaN place":      func() error { _, _, err := g.Horizon(geo.XY{X: math.NaN()}, 1, 4, 10); return err },
	} {
		if f() == nil {
			t.Errorf("%s was accepted", name)
		}
	}
}

func BenchmarkHorizon(b *testing.B) {
	g := wide(b, 1601, 25, func(p geo.XY) (float64, bool) { return 80 * math.Sin(p.X/900) * math.Cos(p.Y/700), true })
	for _, n := range []int{72, 360} {
		b.Run(fmt.Sprintf("%d azimuths 20 km", n), func(b *testing.B) {
			for b.Loop() {
				if _, _, err := g.Horizon(geo.XY{X: 11, Y: 3}, 1.6, n, 19_900); err != nil {
					b.Fatal(err)
				}
			}
		})
	}
}
