package wind

import (
	"math"
	"testing"
)

// Wind from one direction: behind one machine the map is the formula of the wake, summed over the speeds.
func TestWakeMapIsTheWakeOfOneDirection(t *testing.T) {
	in := farm(t, "nrel_5mw_126", Position{})
	d, hub := in.Turbine.RotorDiameterM, in.HubHeightM
	in.Site.RefHeightM, in.Site.ElevationM, in.Site.TempKnown = hub, -hub, false // air of 1.225 kg/m3
	wb := Weibull{AMPerS: 8, K: 2}
	in.Site.Rose = make([]Sector, 72)
	for i := range in.Site.Rose {
		in.Site.Rose[i] = Sector{Weibull: wb}
	}
	in.Site.Rose[54].FrequencyFrac = 1 // from the west
	in.Settings.Directions = 72
	in.Settings.SpeedStepMPerS = 0.1
	places := []Position{{X: 5 * d}, {X: 7 * d}, {X: 7 * d, Y: 0.5 * d}, {X: -5 * d}, {Y: 3 * d}}
	for _, model := range []WakeModel{WakeGaussian, WakeJensen} {
		in.Settings.Wake = model
		got, err := WakeMap(in, places)
		if err != nil {
			t.Fatal(err)
		}
		for i, p := range places {
			want := 0.0
			const dv = 0.01
			for v := dv / 2; v < 30; v += dv {
				ct := in.Turbine.Curve.Ct(v)
				deficit := GaussianDeficit(ct, WakeGrowth(in.Settings.AmbientTIFrac), p.X/d, p.Y/d)
				if model == WakeJensen {
					if deficit = JensenDeficit(ct, in.Settings.JensenK, p.X, d); math.Abs(p.Y) > d/2+in.Settings.JensenK*p.X {
						deficit = 0
					}
				}
				want += wb.Density(v) * dv * v * deficit / wb.Mean()
			}
			if math.Abs(got[i]-want) > 0.01*want+1e-9 {
				t.Errorf("%v at %v: %v lost, by the formula %v", model, p, got[i], want)
			}
		}
	}
}

// An even wind slows the air alike all around one machine, less the farther away; at the place of a second one the map
// is less than what waked speeds of full thrust would give.
func TestWakeMapAllAround(t *testing.T) {
	in := farm(t, "nrel_5mw_126", Position{X: 100, Y: -50})
	w, err := Rayleigh(7)
	if err != nil {
		t.Fatal(err)
	}
	in.Site.Rose = []Sector{{FrequencyFrac: 1, Weibull: w}}
	in.Settings.Directions = 72
	at := func(r float64, deg float64) Position {
		s, c := math.Sincos(deg * math.Pi / 180)
		return Position{X: 100 + r*s, Y: -50 + r*c}
	}
	got, err := WakeMap(in, []Position{at(800, 0), at(800, 45), at(800, 270), at(1600, 0), at(60000, 10)})
	if err != nil {
		t.Fatal(err)
	}
	if !near(got[0], got[1], 1e-6) || !near(got[0], got[2], 1e-6) || got[3] >= got[0] || !(got[0] > 0.001) || got[0] > 0.1 || got[4] > 1e-3 {
		t.Errorf("lost around one machine: %v", got)
	}
	if _, err := WakeMap(in, []Position{{X: math.NaN()}}); err == nil {
		t.Error("a place that is not finite was taken")
	}
}

func BenchmarkWakeMap(b *testing.B) {
	in := farm(b, "iea_3_4mw_130", scatter(25, 3, 1500)...)
	in.Settings.Directions = 36
	var at []Position
	for y := range 70 {
		for x := range 100 {
			at = append(at, Position{X: float64(x-50) * 60, Y: float64(y-35) * 60})
		}
	}
	for b.Loop() {
		if _, err := WakeMap(in, at); err != nil {
			b.Fatal(err)
		}
	}
}
