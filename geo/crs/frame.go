package crs

import (
	"errors"
	"fmt"
	"math"

	"groundtally/geo"
)

// The WGS 84 ellipsoid (NIMA TR8350.2).
const (
	semiMajorM   = 6378137.0
	flattening   = 1 / 298.257223563
	eccentricity = flattening * (2 - flattening) // e²
)

// Limits of the frame.
const (
	// MaxRadiusM is how far from the centre a position may lie. Lengths are there up to 2.8e-4 too long
	// or too short; within 42 km, which holds a district 60 km wide, up to 5.5e-6.
	MaxRadiusM = 300e3
	// MaxCentreLatDeg is how far from the equator the centre may lie.
	MaxCentreLatDeg = 85.0
	// DensifyM is the longest edge that is projected in one piece.
	DensifyM = 2000.0
)

// ErrTooFar is wrapped by the error for a position further than MaxRadiusM from the frame's centre.
var ErrTooFar = errors.New("position is too far from the centre of the study")

// Frame is a Lambert azimuthal equal-area projection of the WGS 84 ellipsoid centred on one position, so
// that areas are true everywhere and lengths nearly so close to the centre.
//
// Symbols after Snyder 1987, "Map projections: a working manual", USGS Professional Paper 1395, pages
// 187 to 190: φ latitude, λ longitude, β authalic latitude, q the quantity of equation 3-12, R_q the
// radius of the sphere with the ellipsoid's area, index 1 and λ₀ for the centre.
//
//	q  = (1 − e²)·[sin φ/(1 − e² sin² φ) − (1/2e)·ln((1 − e sin φ)/(1 + e sin φ))]      (3-12)
//	β  = asin(q/q_p)                                                                    (3-11)
//	R_q = a·√(q_p/2)                                                                    (3-13)
//	D  = a·m₁/(R_q·cos β₁),  m = cos φ/√(1 − e² sin² φ)                                 (24-20, 14-15)
//	B  = R_q·√(2/(1 + sin β₁ sin β + cos β₁ cos β cos(λ − λ₀)))                         (24-19)
//	x  = B·D·cos β·sin(λ − λ₀)                                                          (24-17)
//	y  = (B/D)·[cos β₁ sin β − sin β₁ cos β cos(λ − λ₀)]                                (24-18)
//
// Valid within MaxRadiusM of a centre no further than MaxCentreLatDeg from the equator; outside, the
// methods give an error. Check table: crs.csv.
type Frame struct {
	centre      geo.LonLat
	sinB1, cosB float64 // of β₁
	rq, d       float64
}

var (
	e1 = math.Sqrt(eccentricity)
	qp = authalicQ(1)
)

// authalicQ gives q of equation 3-12 from sin φ.
func authalicQ(sin float64) float64 {
	es := e1 * sin
	return (1 - eccentricity) * (sin/(1-float64(es*es)) + math.Atanh(es)/e1)
}

// authalic gives sine, cosine of the authalic latitude from the sine of the geodetic one. Within
// MaxCentreLatDeg and MaxRadiusM the cosine's rounding stays below 1e-14, which is 1e-7 m.
func authalic(sin float64) (sinB, cosB float64) {
	sinB = authalicQ(sin) / qp
	return sinB, math.Sqrt((1 - sinB) * (1 + sinB))
}

func sinDeg(deg float64) float64 { return math.Sin(deg * math.Pi / 180) }

// NewFrame makes the frame centred on a position.
func NewFrame(centre geo.LonLat) (Frame, error) {
	if !centre.Finite() || math.Abs(centre.Lat) > MaxCentreLatDeg || math.Abs(centre.Lon) > 360 {
		return Frame{}, fmt.Errorf("frame centre longitude %v, latitude %v: a study must be centred between %v degrees south and north", centre.Lon, centre.Lat, MaxCentreLatDeg)
	}
	f := Frame{centre: geo.LonLat{Lon: wrap(centre.Lon), Lat: centre.Lat}}
	f.sinB1, f.cosB = authalic(sinDeg(centre.Lat))
	f.rq = semiMajorM * math.Sqrt(qp/2)
	sin, cos := math.Sincos(centre.Lat * math.Pi / 180)
	m1 := cos / math.Sqrt(1-float64(eccentricity*sin*sin))
	f.d = semiMajorM * m1 / (f.rq * f.cosB)
	return f, nil
}

// RoundCentre gives the position rounded to 0.1 degrees, the form in which a study stores its centre.
func RoundCentre(p geo.LonLat) geo.LonLat {
	return geo.LonLat{Lon: math.Round(p.Lon*10) / 10, Lat: math.Round(p.Lat*10) / 10}
}

// Centre gives the position that maps to X 0, Y 0.
func (f Frame) Centre() geo.LonLat { return f.centre }

// Definition gives the frame as a projection string that other programs read.
func (f Frame) Definition() string {
	return fmt.Sprintf("+proj=laea +lat_0=%v +lon_0=%v +x_0=0 +y_0=0 +datum=WGS84 +units=m +no_defs", f.centre.Lat, f.centre.Lon)
}

// wrap brings a longitude or a difference of longitudes to −180 < λ ≤ 180. Values within are untouched.
func wrap(deg float64) float64 {
	if deg > -180 && deg <= 180 {
		return deg
	}
	deg = math.Mod(deg, 360)
	switch {
	case deg > 180:
		deg -= 360
	case deg <= -180:
		deg += 360
	}
	return deg
}

// Forward gives the frame's metres of a position.
func (f Frame) Forward(p geo.LonLat) (geo.XY, error) {
	if !p.Finite() || math.Abs(p.Lat) > 90 || math.Abs(p.Lon) > 540 {
		return geo.XY{}, fmt.Errorf("longitude %v, latitude %v is not a position in degrees", p.Lon, p.Lat)
	}
	sinB, cosB := authalic(sinDeg(p.Lat))
	sinL, cosL := math.Sincos(wrap(p.Lon-f.centre.Lon) * math.Pi / 180)
	g := 1 + float64(f.sinB1*sinB) + float64(f.cosB*float64(cosB*cosL))
	if g < 0.5 { // more than 90 degrees away: before the root grows without bound
		return geo.XY{}, f.tooFar(p)
	}
	b := f.rq * math.Sqrt(2/g)
	xy := geo.XY{
		X: b * f.d * cosB * sinL,
		Y: b / f.d * (float64(f.cosB*sinB) - float64(f.sinB1*float64(cosB*cosL))),
	}
	if math.Hypot(xy.X, xy.Y) > MaxRadiusM {
		return geo.XY{}, f.tooFar(p)
	}
	return xy, nil
}

func (f Frame) tooFar(p geo.LonLat) error {
	return fmt.Errorf("longitude %v, latitude %v is more than %.0f km from the centre longitude %v, latitude %v: %w", p.Lon, p.Lat, MaxRadiusM/1000, f.centre.Lon, f.centre.Lat, ErrTooFar)
}

// Inverse gives the position of the frame's metres.
//
//	ρ = √((x/D)² + (D·y)²),  C = 2·asin(ρ/2R_q)                                        (24-28, 24-29)
//	β = asin(cos C sin β₁ + D·y·sin C cos β₁/ρ)                                         (24-27, q = q_p·sin β)
//	λ = λ₀ + atan2(x·sin C, D·ρ·cos β₁ cos C − D²·y·sin β₁ sin C)                       (24-26)
//
// and φ from β by Newton's method on equation 3-12.
func (f Frame) Inverse(p geo.XY) (geo.LonLat, error) {
	if !p.Finite() {
		return geo.LonLat{}, fmt.Errorf("x %v, y %v is not a position in metres", p.X, p.Y)
	}
	if math.Hypot(p.X, p.Y) > MaxRadiusM*1.01 {
		return geo.LonLat{}, fmt.Errorf("x %.0f, y %.0f lies more than %.0f km from the origin: %w", p.X, p.Y, MaxRadiusM/1000, ErrTooFar)
	}
	x, y := p.X/f.d, p.Y*f.d
	rho := math.Hypot(x, y)
	if rho == 0 {
		return f.centre, nil
	}
	half := rho / (2 * f.rq)
	sinC, cosC := 2*half*math.Sqrt(1-float64(half*half)), 1-float64(2*half)*half
	sinB := float64(cosC*f.sinB1) + float64(y*sinC*f.cosB)/rho
	across := float64(x * sinC)                                          // ρ cos β sin(λ − λ₀)
	along := float64(rho*f.cosB*cosC) - float64(y*float64(f.sinB1*sinC)) // ρ cos β cos(λ − λ₀)
	beta := math.Atan2(sinB, math.Hypot(across, along)/rho)              // well-conditioned up to the pole
	lon := wrap(f.centre.Lon + math.Atan2(across, along)*180/math.Pi)
	return geo.LonLat{Lon: lon, Lat: geodetic(beta) * 180 / math.Pi}, nil
}

// geodetic gives φ from β in radians by Newton's method on β(φ), started with β, which is never more
// than 0.13 degrees off.
//
//	dβ/dφ = 2(1 − e²)·cos φ/((1 − e² sin² φ)²·q_p·cos β)
func geodetic(beta float64) float64 {
	phi := beta
	s, c := math.Sincos(beta)
	for range 6 {
		sin, cos := math.Sincos(phi)
		sinB, cosB := authalic(sin)
		// The sine of the difference of two β keeps digits that a difference of their sines loses.
		diff := math.Asin(float64(s*cosB) - float64(c*sinB))
		w := 1 - float64(eccentricity*sin*sin)
		phi += diff * float64(w*w) * qp * cosB / (2 * (1 - eccentricity) * cos)
		if math.Abs(diff) < 1e-15 {
			break
		}
	}
	return phi
}

// ConvergenceDeg gives the meridian convergence γ at a position of the frame: the angle from true north to
// grid north in degrees, positive when grid north lies to the east. Then true azimuth = grid azimuth + γ.
//
//	γ = −atan2(∂x/∂φ, ∂y/∂φ)
//
// with the derivatives of equations 24-17, 24-18. The frame is not conformal, so the relation is exact
// along the meridian only: for other directions it is off by up to 0.003 degrees at 42 km from the
// centre, 0.004·(distance/42 km)² further out.
func (f Frame) ConvergenceDeg(p geo.XY) (float64, error) {
	ll, err := f.Inverse(p)
	if err != nil {
		return 0, err
	}
	sinB, cosB := authalic(sinDeg(ll.Lat))
	sinL, cosL := math.Sincos(wrap(ll.Lon-f.centre.Lon) * math.Pi / 180)
	g := 1 + f.sinB1*sinB + f.cosB*cosB*cosL
	k := math.Sqrt(2 / g)
	dg := f.sinB1*cosB - f.cosB*sinB*cosL // ∂g/∂β
	dk := -k * dg / (2 * g)
	dx := f.d * sinL * (dk*cosB - k*sinB)
	dy := (dk*(f.cosB*sinB-f.sinB1*cosB*cosL) + k*(f.cosB*cosB+f.sinB1*sinB*cosL)) / f.d
	return -math.Atan2(dx, dy) * 180 / math.Pi, nil
}

// TrueAzimuthDeg gives the true azimuth, 0 ≤ azimuth < 360, of a grid azimuth at a position of the frame.
func (f Frame) TrueAzimuthDeg(at geo.XY, gridDeg float64) (float64, error) {
	c, err := f.ConvergenceDeg(at)
	if err != nil {
		return 0, err
	}
	return turn(gridDeg + c), nil
}

// GridAzimuthDeg gives the grid azimuth, 0 ≤ azimuth < 360, of a true azimuth at a position of the frame.
func (f Frame) GridAzimuthDeg(at geo.XY, trueDeg float64) (float64, error) {
	c, err := f.ConvergenceDeg(at)
	if err != nil {
		return 0, err
	}
	return turn(trueDeg - c), nil
}

func turn(deg float64) float64 {
	deg = math.Mod(deg, 360)
	if deg < 0 {
		deg += 360
	}
	if deg >= 360 { // a tiny negative angle rounds up
		deg = 0
	}
	return deg
}

// Project gives a geometry in the frame. Edges longer than DensifyM get evenly spaced positions first,
// because an edge that is straight in degrees is bent in the frame: at 48 degrees north an east-west edge
// of 10 km departs by 2.2 m, pieces of 2 km by less than 0.1 m. Neighbours that share an edge get the
// same positions on it, whichever way they run.
func (f Frame) Project(g geo.LonLatGeometry) (geo.XYGeometry, error) {
	return convert(g, f.Forward, func(p, q geo.LonLat, a, b geo.XY) float64 { return a.Dist(b) })
}

// Unproject gives a geometry of the frame in degrees, long edges divided as in Project.
func (f Frame) Unproject(g geo.XYGeometry) (geo.LonLatGeometry, error) {
	return convert(g, f.Inverse, func(p, q geo.XY, a, b geo.LonLat) float64 { return p.Dist(q) })
}

// convert maps every position by to, with long edges divided evenly in the source's coordinates.
func convert[P, Q geo.LonLat | geo.XY](g geo.Geometry[P], to func(P) (Q, error), lengthM func(p, q P, a, b Q) float64) (geo.Geometry[Q], error) {
	out := geo.Geometry[Q]{Kind: g.Kind, Parts: make([][][]Q, len(g.Parts))}
	for i, part := range g.Parts {
		out.Parts[i] = make([][]Q, len(part))
		for j, ring := range part {
			r := make([]Q, 0, len(ring))
			for k, p := range ring {
				q, err := to(p)
				if err != nil {
					return geo.Geometry[Q]{}, err
				}
				if k > 0 && g.Kind != geo.Points {
					n := math.Ceil(lengthM(ring[k-1], p, r[len(r)-1], q) / DensifyM)
					if n > 1e6 {
						return geo.Geometry[Q]{}, fmt.Errorf("an edge from %v to %v is too long", ring[k-1], p)
					}
					for s := 1.0; s < n; s++ {
						m, err := to(between(ring[k-1], p, s, n))
						if err != nil {
							return geo.Geometry[Q]{}, err
						}
						r = append(r, m)
					}
				}
				r = append(r, q)
			}
			out.Parts[i][j] = r
		}
	}
	return out, nil
}

// between gives the position s/n of the way from p to q. It is computed from the lesser of the two ends,
// so that the edge from q to p gets the very same positions.
func between[P geo.LonLat | geo.XY](p, q P, s, n float64) P {
	a, b := pair(p), pair(q)
	if b[0] < a[0] || (b[0] == a[0] && b[1] < a[1]) {
		a, b, s = b, a, n-s
	}
	t := s / n
	return unpair[P]([2]float64{a[0] + float64(t*(b[0]-a[0])), a[1] + float64(t*(b[1]-a[1]))})
}

func pair[P geo.LonLat | geo.XY](p P) [2]float64 {
	switch v := any(p).(type) {
	case geo.LonLat:
		return [2]float64{v.Lon, v.Lat}
	case geo.XY:
		return [2]float64{v.X, v.Y}
	}
	return [2]float64{}
}

func unpair[P geo.LonLat | geo.XY](v [2]float64) P {
	var p P
	switch q := any(&p).(type) {
	case *geo.LonLat:
		*q = geo.LonLat{Lon: v[0], Lat: v[1]}
	case *geo.XY:
		*q = geo.XY{X: v[0], Y: v[1]}
	}
	return p
}
