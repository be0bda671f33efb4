package fit

import (
	"errors"
	"fmt"
	"math"

	"groundtally/geo"
)

// Spacing is the ellipse rule: machines keep AlongM metres from each other along the prevailing wind,
// AcrossM across it, in between the distance of the ellipse with these semi-axes.
//
//	m(p, q) = (Δp/a)² + (Δc/b)² ≥ 1
//
// with a = AlongM, b = AcrossM, Δp, Δc the components of q − p along AzimuthDeg and across it.
type Spacing struct {
	AlongM     float64 // usually 5 rotor diameters
	AcrossM    float64 // usually 3 rotor diameters
	AzimuthDeg float64 // prevailing wind direction, clockwise from grid north; its reverse is the same
}

// ErrSpacing is wrapped when a spacing is not two positive lengths with a direction.
var ErrSpacing = errors.New("spacing needs two positive lengths with a direction")

func (s Spacing) check() error {
	ok := func(v float64) bool { return v > 0 && !math.IsInf(v, 0) }
	if !ok(s.AlongM) || !ok(s.AcrossM) || math.IsNaN(s.AzimuthDeg) || math.IsInf(s.AzimuthDeg, 0) {
		return fmt.Errorf("%w: %v m along, %v m across, azimuth %v", ErrSpacing, s.AlongM, s.AcrossM, s.AzimuthDeg)
	}
	return nil
}

// Metric gives m(p, q), the left side of the rule; 1 is just far enough.
func (s Spacing) Metric(p, q geo.XY) float64 {
	f := s.frame()
	return metric(f.unit(p), f.unit(q))
}

// metricSlack lets positions that are exactly far enough pass in spite of rounding.
const metricSlack = 1e-9

func metric(p, q geo.XY) float64 {
	d := q.Sub(p)
	return float64(d.X*d.X) + float64(d.Y*d.Y)
}

func apart(p, q geo.XY) bool { return metric(p, q) >= 1-metricSlack }

// frame maps metres to the plane in which the rule is a distance of 1: X along the wind, Y to its left.
type frame struct {
	sin, cos, a, b float64
	o              geo.XY // origin
}

func (s Spacing) frame() frame {
	sin, cos := math.Sincos(s.AzimuthDeg * math.Pi / 180)
	return frame{sin: sin, cos: cos, a: s.AlongM, b: s.AcrossM}
}

func (f frame) unit(p geo.XY) geo.XY {
	d := p.Sub(f.o)
	return geo.XY{
		X: (float64(d.X*f.sin) + float64(d.Y*f.cos)) / f.a,
		Y: (float64(d.Y*f.sin) - float64(d.X*f.cos)) / f.b,
	}
}

func (f frame) metres(u geo.XY) geo.XY {
	p, c := u.X*f.a, u.Y*f.b
	return geo.XY{
		X: f.o.X + (float64(p*f.sin) - float64(c*f.cos)),
		Y: f.o.Y + (float64(p*f.cos) + float64(c*f.sin)),
	}
}

// ellipseCorners is the number of corners of an ellipse's polygon.
const ellipseCorners = 64

// Ellipse gives the spacing ellipse around a machine with both semi-axes multiplied by scale: scale 0.5
// gives ellipses that just touch when machines stand as near as the rule allows. It is a polygon with 64
// corners, enlarged by √(2π/(n·sin(2π/n))), 0.08 %, so that its area is the true π·a·b·scale².
func (s Spacing) Ellipse(centre geo.XY, scale float64) (geo.XYGeometry, error) {
	if err := s.check(); err != nil {
		return geo.XYGeometry{}, err
	}
	if !(scale > 0) || math.IsInf(scale, 0) || !centre.Finite() {
		return geo.XYGeometry{}, fmt.Errorf("an ellipse around %v scaled by %v", centre, scale)
	}
	f := s.frame()
	f.o = centre
	const n = ellipseCorners
	r := scale * math.Sqrt(2*math.Pi/(n*math.Sin(2*math.Pi/n)))
	ring := make([]geo.XY, 0, n+1)
	for i := range n {
		sin, cos := math.Sincos(2 * math.Pi * float64(i) / n)
		ring = append(ring, f.metres(geo.XY{X: r * cos, Y: r * sin}))
	}
	ring = append(ring, ring[0])
	return geo.XYGeometry{Kind: geo.Polygons, Parts: [][][]geo.XY{{ring}}}, nil
}
