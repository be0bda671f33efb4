package terrain

import (
	"context"
	"fmt"
	"math"
)

// Unshaded is the shade of a cell without a slope.
const Unshaded uint8 = 0

// Shade gives how much light of a sun at an azimuth, clockwise from grid north, and an altitude falls on
// every cell, in the order of HeightM: 1 on a cell turned away from the sun, 255 on one that faces it,
// Unshaded on one without a slope. No cell throws a shadow on another.
//
//	shade = 1 + 254 · max(0, cos i)
//	cos i = (sin α − cos α · (∂z/∂x·sin ψ + ∂z/∂y·cos ψ)) / √(1 + (∂z/∂x)² + (∂z/∂y)²)
//
// with ψ, α the sun's azimuth and altitude, an altitude above 0 and up to 90 degrees. It gives the context's
// error when stopped. Source: Horn 1981, "Hill shading and the reflectance map", Proceedings of the IEEE 69:
// the reflectance map of a matt surface; relief is read rightly with light from the north-west, 315 degrees,
// at 45 degrees.
func (g *Grid) Shade(ctx context.Context, sunAzimuthDeg, sunAltitudeDeg float64) ([]uint8, error) {
	if math.IsNaN(sunAzimuthDeg) || math.IsInf(sunAzimuthDeg, 0) || !(sunAltitudeDeg > 0 && sunAltitudeDeg <= 90) {
		return nil, fmt.Errorf("light from an azimuth of %v at an altitude of %v degrees: want a number, above 0 to 90", sunAzimuthDeg, sunAltitudeDeg)
	}
	out := make([]uint8, g.NX*g.NY)
	east, north := math.Sincos(sunAzimuthDeg * math.Pi / 180)
	up, level := math.Sincos(sunAltitudeDeg * math.Pi / 180)
	for r := range g.NY {
		if err := ctx.Err(); err != nil {
			return nil, err
		}
		for c := range g.NX {
			if p, q, ok := g.gradient(c, r); ok {
				light := (up - float64(level*(float64(p*east)+float64(q*north)))) / math.Sqrt(1+float64(p*p)+float64(q*q))
				out[r*g.NX+c] = uint8(1.5 + float64(254*math.Max(0, light)))
			}
		}
	}
	return out, nil
}
