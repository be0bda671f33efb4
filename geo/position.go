package geo

import "math"

// LonLat is a position in degrees on WGS 84: longitude east positive, latitude north positive.
type LonLat struct {
	Lon float64 `json:"lon"`
	Lat float64 `json:"lat"`
}

// XY is a position in metres in a study's local frame: X to grid east, Y to grid north.
type XY struct{ X, Y float64 }

// Sub gives the vector from q to p in metres.
func (p XY) Sub(q XY) XY { return XY{p.X - q.X, p.Y - q.Y} }

// Dist gives the distance in metres between p and q in the plane of the frame.
func (p XY) Dist(q XY) float64 { return math.Hypot(p.X-q.X, p.Y-q.Y) }

// Finite reports whether both coordinates are finite numbers.
func (p XY) Finite() bool { return finite(p.X) && finite(p.Y) }

// Finite reports whether both coordinates are finite numbers.
func (p LonLat) Finite() bool { return finite(p.Lon) && finite(p.Lat) }

// Rounded gives the position to seven decimals, about a centimetre, as RFC 7946 suggests for exchange; zeros have no sign.
func (p LonLat) Rounded() LonLat {
	const d = 1e7
	return LonLat{Lon: math.Round(p.Lon*d)/d + 0, Lat: math.Round(p.Lat*d)/d + 0}
}

func finite(v float64) bool { return !math.IsNaN(v) && !math.IsInf(v, 0) }

// Extent is an axis-parallel box in metres. The zero Extent is the point at the origin; start from
// EmptyExtent.
type Extent struct{ MinX, MinY, MaxX, MaxY float64 }

// EmptyExtent contains nothing and is the neutral element of Union.
func EmptyExtent() Extent {
	return Extent{math.Inf(1), math.Inf(1), math.Inf(-1), math.Inf(-1)}
}

// Empty reports whether the extent contains no point.
func (e Extent) Empty() bool { return e.MinX > e.MaxX || e.MinY > e.MaxY }

// Add gives the smallest extent that contains e and p.
func (e Extent) Add(p XY) Extent {
	return Extent{math.Min(e.MinX, p.X), math.Min(e.MinY, p.Y), math.Max(e.MaxX, p.X), math.Max(e.MaxY, p.Y)}
}

// Union gives the smallest extent that contains e and f.
func (e Extent) Union(f Extent) Extent {
	return Extent{math.Min(e.MinX, f.MinX), math.Min(e.MinY, f.MinY), math.Max(e.MaxX, f.MaxX), math.Max(e.MaxY, f.MaxY)}
}

// Grow gives e with every side moved outwards by d metres.
func (e Extent) Grow(d float64) Extent {
	return Extent{e.MinX - d, e.MinY - d, e.MaxX + d, e.MaxY + d}
}

// Meets reports whether e and f share at least a point.
func (e Extent) Meets(f Extent) bool {
	return e.MinX <= f.MaxX && f.MinX <= e.MaxX && e.MinY <= f.MaxY && f.MinY <= e.MaxY
}

// Centre gives the middle of the extent.
func (e Extent) Centre() XY { return XY{(e.MinX + e.MaxX) / 2, (e.MinY + e.MaxY) / 2} }
