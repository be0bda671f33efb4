package terrain

import (
	"context"
	"errors"
	"math"
	"testing"

	"groundtally/geo"
)

// On a plane of slope s that falls towards azimuth a the light is cos s·sin α + sin s·cos α·cos(ψ − a).
func TestShadeOfPlanes(t *testing.T) {
	for _, c := range []struct{ slope, aspect, azimuth, altitude float64 }{
		{0, 0, 315, 45}, {45, 315, 315, 45}, {30, 315, 315, 45}, {30, 135, 315, 45}, {60, 135, 315, 45}, {30, 45, 315, 45},
		{20, 200, 90, 10}, {70, 10, 360, 90}, {5, 300, -45, 60},
	} {
		s, a := c.slope*math.Pi/180, c.aspect*math.Pi/180
		g := grid(t, 5, 5, plane(100, -math.Tan(s)*math.Sin(a), -math.Tan(s)*math.Cos(a)))
		got, err := g.Shade(t.Context(), c.azimuth, c.altitude)
		if err != nil {
			t.Fatal(err)
		}
		alt := c.altitude * math.Pi / 180
		want := 1 + 254*math.Max(0, math.Cos(s)*math.Sin(alt)+math.Sin(s)*math.Cos(alt)*math.Cos(c.azimuth*math.Pi/180-a))
		if math.Abs(float64(got[2*5+2])-want) > 0.51 {
			t.Errorf("%+v: %d, want %.2f", c, got[12], want)
		}
		if got[0] != Unshaded || got[24] != Unshaded {
			t.Errorf("%+v: the edge has a shade", c)
		}
	}
}

func TestShadeRefuses(t *testing.T) {
	g := grid(t, 5, 5, plane(0, 0, 0))
	for _, c := range [][2]float64{{315, 0}, {315, 90.1}, {315, math.NaN()}, {math.NaN(), 45}, {math.Inf(1), 45}} {
		if _, err := g.Shade(t.Context(), c[0], c[1]); err == nil {
			t.Errorf("light from %v was accepted", c)
		}
	}
	ctx, stop := context.WithCancel(t.Context())
	stop()
	if _, err := g.Shade(ctx, 315, 45); !errors.Is(err, context.Canceled) {
		t.Errorf("stopped, it gave %v", err)
	}
}

func BenchmarkShade(b *testing.B) {
	g := grid(b, 1000, 600, func(p geo.XY) (float64, bool) { return 30 * math.Sin(p.X/90) * math.Cos(p.Y/70), true })
	for b.Loop() {
		if _, err := g.Shade(b.Context(), 315, 45); err != nil {
			b.Fatal(err)
		}
	}
}
