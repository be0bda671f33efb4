package tiles

import (
	"math"

	"groundtally/geo"
)

// WGS 84 (NIMA TR8350.2): semi-major axis in metres, first eccentricity squared.
const (
	axisM = 6378137.0
	ecc2  = 0.00669437999014
)

// Plane maps positions to metres around a centre, east and north positive.
//
// It is the Cassini–Soldner projection to the second order (Snyder 1987, USGS PP 1395, p. 95), with the
// ellipsoid's radii of curvature at the centre: true to 0.01 % within 60 km. The simpler equirectangular
// plane would be off by 0.5 % there at 47° and by 0.9 % at 60°, so that a circle of 500 m would show
// metres beside what was computed.
type Plane struct {
	centre   geo.LonLat
	meridian float64 // radius of curvature along the meridian at the centre, m
	bend     float64 // how that radius grows with latitude, m per radian
}

// NewPlane makes a plane around a centre.
func NewPlane(centre geo.LonLat) Plane {
	s, c := math.Sincos(rad(centre.Lat))
	w := 1 - ecc2*s*s
	m := axisM * (1 - ecc2) / (w * math.Sqrt(w))
	return Plane{centre: centre, meridian: m, bend: 3 * m * ecc2 * s * c / w}
}

// To maps a position to the plane.
func (p Plane) To(at geo.LonLat) geo.XY {
	s, c := math.Sincos(rad(at.Lat))
	up, along := rad(at.Lat-p.centre.Lat), rad(at.Lon-p.centre.Lon)
	n := axisM / math.Sqrt(1-ecc2*s*s)
	sa := s * along
	return geo.XY{
		X: n * c * along * (1 - sa*sa/6),
		Y: up*(p.meridian+p.bend*up/2) + n*s*c*along*along/2,
	}
}

// From maps back from the plane; From(To(p)) is p to less than a millimetre within 60 km.
func (p Plane) From(at geo.XY) geo.LonLat {
	out := p.centre
	// Each round makes the error smaller by the convergence of the meridians, a hundred times or more.
	for range 8 {
		miss := at.Sub(p.To(out))
		c := math.Max(math.Cos(rad(out.Lat)), 0.01)
		out.Lat = math.Max(-89.9, math.Min(89.9, out.Lat+miss.Y/p.meridian*180/math.Pi))
		out.Lon += miss.X / (axisM * c) * 180 / math.Pi
	}
	return out
}

func rad(deg float64) float64 { return deg * math.Pi / 180 }
