package solar

import (
	"math"
	"testing"
)

// On the new distance, the edge of the row in front stands at the same height over the horizon as on flat ground:
// checked by placing the two edges in space, apart from the formula.
func TestPitchOnSlopeKeepsTheSunClear(t *testing.T) {
	const width, tilt, pitch = 4.0, 25.0, 9.0
	edge := func(p, slope, aspect, azimuth float64) float64 {
		// Upper rear edge of the front row, lower front edge of the one behind; distances towards the front.
		rise := -math.Tan(slope*math.Pi/180) * math.Cos((azimuth-aspect)*math.Pi/180)
		sin, cos := math.Sincos(tilt * math.Pi / 180)
		along := p - width*cos
		return math.Atan2(width*sin+p*rise, along) * 180 / math.Pi
	}
	flat := edge(pitch, 0, 0, 180)
	for _, c := range []struct{ slope, aspect, azimuth float64 }{{5, 180, 180}, {5, 0, 180}, {8, 45, 180}, {3, 100, 200}, {6, 0, 0}, {9, 270, 180}} {
		p := PitchOnSlope(pitch, width, tilt, c.azimuth, c.slope, c.aspect)
		if got := edge(p, c.slope, c.aspect, c.azimuth); math.Abs(got-flat) > 1e-9 {
			t.Errorf("%+v: at %v m the row in front stands %v degrees high, %v on flat ground", c, p, got, flat)
		}
	}
	// By hand: facing down a slope of 5 degrees the rows stand closer, up one farther; 4 m at 25 degrees take
	// 1.690 m of height in an aisle of 5.375 m, tan e = 0.3145, tan 5 = 0.0875: 9 × 0.3145/0.4020 and /0.2270.
	for aspect, want := range map[float64]float64{180: 7.041, 0: 12.469} {
		if got := PitchOnSlope(pitch, width, tilt, 180, 5, aspect); math.Abs(got-want) > 0.002 {
			t.Errorf("aspect %v: %v m, by hand %v", aspect, got, want)
		}
	}
	if got := PitchOnSlope(pitch, width, tilt, 180, 30, 0); got != 18 {
		t.Errorf("ground that rises to the sun: %v m", got)
	}
	if got, want := PitchOnSlope(pitch, width, tilt, 180, 30, 180), width*math.Cos(tilt*math.Pi/180)+2; math.Abs(got-want) > 1e-12 {
		t.Errorf("steep ground to the sun leaves %v m, want the least aisle, %v", got, want)
	}
	for _, keep := range [][2]float64{{90, 9}, {0, 9}, {25, 3}} {
		if got := PitchOnSlope(keep[1], width, keep[0], 180, 10, 0); got != keep[1] {
			t.Errorf("tilt %v, %v m: %v", keep[0], keep[1], got)
		}
	}
	if got := AlongSlope(90, 10, 90); math.Abs(got-math.Cos(10*math.Pi/180)) > 1e-12 {
		t.Errorf("down the slope a metre is %v long on the plan", got)
	}
	if got := AlongSlope(0, 10, 90); math.Abs(got-1) > 1e-12 {
		t.Errorf("along the contour a metre is %v long on the plan", got)
	}
}

// However steep the ground falls to the sun, the rows hold their own panels laid flat: what a plant may ask for.
func TestPitchOnSlopeHoldsThePanels(t *testing.T) {
	for width := 1.0; width <= 8; width += 0.5 {
		for tilt := 5.0; tilt <= 85; tilt += 5 {
			for slope := 0.0; slope <= 45; slope += 5 {
				flat := width / 0.7
				if p := PitchOnSlope(flat, width, tilt, 180, slope, 180); p < width-1e-12 || p > flat+1e-12 {
					t.Fatalf("width %v, tilt %v, slope %v: rows %v m apart, %v on flat ground", width, tilt, slope, p, flat)
				}
			}
		}
	}
}
