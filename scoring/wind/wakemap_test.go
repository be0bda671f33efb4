package wind

import (
	"fmt"
	"math"
	"testing"
)

// evenFarm has one wind from everywhere, in air that the standard atmosphere makes 1.225 kg/m3 to seven
// digits.
func evenFarm(t testing.TB, at ...Position) FarmInput {
	in := farm(t, "iea_3_4mw_130", at...)
	in.Site.Rose = []Sector{{1, Weibull{8, 2}}}
	in.Site.RefHeightM, in.Site.ElevationM = in.HubHeightM, -in.HubHeightM
	return in
}

func along(t *testing.T, in FarmInput, at []Position, deg, v float64) []float64 {
	t.Helper()
	out, err := WakeAlong(in, at, deg, v)
	if err != nil {
		t.Fatal(err)
	}
	return out
}

func wakeMap(t *testing.T, in FarmInput, at []Position) []float64 {
	t.Helper()
	out, err := WakeMap(in, at)
	if err != nil {
		t.Fatal(err)
	}
	return out
}

func TestWakeAlongIsTheSingleWake(t *testing.T) {
	in := evenFarm(t, Position{100, 50})
	d, ct := in.Turbine.RotorDiameterM, in.Turbine.Curve.Ct(8)
	k := WakeGrowth(in.Settings.AmbientTIFrac)
	for _, x := range []float64{-3, 2, 5, 9, 30} {
		for _, y := range []float64{-1.5, 0, 0.4, 1} {
			at := []Position{{100 + x*d, 50 - y*d}} // wind from the west
			in.Settings.Wake = WakeGaussian
			if got, want := along(t, in, at, 270, 8)[0], GaussianDeficit(ct, k, x, y); math.Abs(got-want) > 1e-7 {
				t.Errorf("Gaussian at %g, %g rotors: %g, want %g", x, y, got, want)
			}
			in.Settings.Wake = WakeJensen
			want := JensenDeficit(ct, in.Settings.JensenK, x*d, d)
			if math.Abs(y) > 0.5+in.Settings.JensenK*x {
				want = 0
			}
			if got := along(t, in, at, 270, 8)[0]; math.Abs(got-want) > 1e-7 {
				t.Errorf("top hat at %g, %g rotors: %g, want %g", x, y, got, want)
			}
			in.Settings.Wake = WakeIEA37
			if got, want := along(t, in, at, 270, 8)[0], IEA37Deficit(x*d, y*d, d); math.Abs(got-want) > 1e-12 {
				t.Errorf("IEA37 at %g, %g rotors: %g, want %g", x, y, got, want)
			}
		}
	}
}

func TestWakeAlongIsTheSpeedAtAMachine(t *testing.T) {
	in := evenFarm(t, scatter(7, 4, 800)...)
	for _, deg := range []float64{0, 77, 200, 311.5} {
		for _, v := range []float64{5, 9.5, 14} {
			us, err := WakeSpeeds(in.Turbine, in.HubHeightM, in.At, in.Settings, deg, v)
			if err != nil {
				t.Fatal(err)
			}
			for i, lost := range along(t, in, in.At, deg, v) {
				if !near(us[i], v*(1-lost), 1e-7) {
					t.Errorf("from %g at %g m/s, machine %d: %g m/s, by the map %g", deg, v, i, us[i], v*(1-lost))
				}
			}
		}
	}
	// Existing machines wake alike, alone too.
	both := along(t, in, []Position{{3000, 0}}, 270, 8)[0]
	in.Existing = nil
	for _, p := range in.At[:4] {
		in.Existing = append(in.Existing, Machine{p, in.Turbine, in.HubHeightM})
	}
	in.At = in.At[4:]
	if got := along(t, in, []Position{{3000, 0}}, 270, 8)[0]; !near(got, both, 1e-12) || !(both > 0) {
		t.Errorf("with four existing %g, all new %g", got, both)
	}
	in.At = nil
	if got := along(t, in, []Position{{3000, 0}}, 270, 8)[0]; !(got > 0 && got < both) {
		t.Errorf("existing ones alone %g, all %g", got, both)
	}
}

func TestWakeMapOfOneMachine(t *testing.T) {
	for _, model := range []WakeModel{WakeGaussian, WakeJensen, WakeIEA37} {
		in := evenFarm(t, Position{})
		in.Settings.Wake = model
		// A rose that is even and directions by 5 degrees: each turn by 5 degrees sees the same.
		for _, r := range []float64{150, 400, 1300, 5000} {
			var ring []Position
			for b := 0; b < 72; b++ {
				s, c := math.Sincos((float64(b)*5 + 2.5) * math.Pi / 180) // never just abeam
				ring = append(ring, Position{r * s, r * c})
			}
			got := wakeMap(t, in, ring)
			for i, x := range got {
				if !near(x, got[0], 1e-9) || !(x > 0 && x < 0.2) {
					t.Errorf("%v, %g m: %g at %d degrees, %g in the north", model, r, x, 5*i, got[0])
				}
			}
		}
		at := []Position{{300, 0}, {900, 0}, {3000, 0}, {30000, 0}, {1e7, 0}, {0, 0}}
		got := wakeMap(t, in, at)
		if !(got[0] > got[1] && got[1] > got[2] && got[2] > got[3]) || !(got[3] < 1e-3) || !(got[4] < 1e-7) || got[5] != 0 {
			t.Errorf("%v: %v", model, got)
		}
		if far := wakeMap(t, in, []Position{{math.MaxFloat64 / 4, 0}}); !(far[0] >= 0 && far[0] < 1e-12) {
			t.Errorf("%v: %v at the end of the world", model, far)
		}
	}
}

// TestWakeMapAgainstDirectSum integrates directions and a fine grid of speeds anew, from WakeAlong.
func TestWakeMapAgainstDirectSum(t *testing.T) {
	for _, model := range []WakeModel{WakeGaussian, WakeJensen} {
		in := evenFarm(t, Position{0, 0}, Position{520, 90}, Position{900, 500})
		in.Site.Rose = rose12()
		in.Existing = []Machine{{Position{-600, -300}, turbine(t, "dw100_27_6"), 60}}
		in.Settings.Wake, in.Settings.Directions = model, 12
		at := []Position{{300, 300}, {-400, 700}, {900, 500}, {2500, 1800}}
		got := wakeMap(t, in, at)
		want := make([]float64, len(at))
		var mean float64
		const dv = 0.05
		for s, sec := range in.Site.Rose {
			mean += sec.FrequencyFrac * sec.Weibull.Mean()
			for v := 0.0; v < 30; v += dv {
				p := sec.FrequencyFrac * (sec.Weibull.CDF(v+dv) - sec.Weibull.CDF(v)) * (v + dv/2)
				for i, x := range along(t, in, at, float64(s)*30, v+dv/2) {
					want[i] += p * x
				}
			}
		}
		for i := range want {
			if !near(got[i], want[i]/mean, 1e-2) || !(got[i] > 1e-4) {
				t.Errorf("%v, point %d: %g by nodes, %g by direct sum", model, i, got[i], want[i]/mean)
			}
		}
	}
}

func TestWakeMapRefusesBadInput(t *testing.T) {
	nan := math.NaN()
	ok, p := evenFarm(t, Position{}), []Position{{500, 0}}
	none := ok
	none.At = nil
	bad := ok
	bad.At = []Position{{nan, 0}}
	rough := ok
	rough.Settings.Directions = 0
	for name, err := range map[string]error{
		"no machines": second(WakeMap(none, p)), "a machine nowhere": second(WakeMap(bad, p)), "a point nowhere": second(WakeMap(ok, []Position{{0, nan}})),
		"settings": second(WakeMap(rough, p)), "along: settings": second(WakeAlong(rough, p, 0, 8)), "along: a point nowhere": second(WakeAlong(ok, []Position{{0, nan}}, 0, 8)),
		"no direction": second(WakeAlong(ok, p, nan, 8)), "no wind": second(WakeAlong(ok, p, 0, 0)), "along: no machines": second(WakeAlong(none, p, 0, 8)),
	} {
		if err == nil {
			t.Errorf("%s: accepted", name)
		}
	}
	m, err := NewWakeMapper(ok)
	if err != nil {
		t.Fatal(err)
	}
	if got := m.LossFracs([]Position{{nan, 0}, {500, 0}}); !math.IsNaN(got[0]) || !(got[1] > 0) {
		t.Errorf("points nowhere and somewhere: %v", got)
	}
}

func second(_ []float64, err error) error { return err }

func BenchmarkWakeMap(b *testing.B) {
	for _, model := range []WakeModel{WakeGaussian, WakeJensen} {
		for _, n := range []int{5, 25} {
			b.Run(fmt.Sprintf("%v_%d", model, n), func(b *testing.B) {
				in := farm(b, "iea_3_4mw_130", scatter(n, 7, 300*math.Sqrt(float64(n))+300)...)
				in.Settings.Wake = model
				var grid []Position
				for y := range 70 {
					for x := range 100 {
						grid = append(grid, Position{float64(x-50) * 60, float64(y-35) * 60})
					}
				}
				for b.Loop() {
					if _, err := WakeMap(in, grid); err != nil {
						b.Fatal(err)
					}
				}
			})
		}
	}
}
