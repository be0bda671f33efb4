package gen

import (
	"math"

	"groundtally/geo"
)

// km makes a point from kilometres.
func km(x, y float64) geo.XY { return geo.XY{X: x * 1000, Y: y * 1000} }

func kms(c ...float64) []geo.XY {
	out := make([]geo.XY, 0, len(c)/2)
	for i := 0; i+1 < len(c); i += 2 {
		out = append(out, km(c[i], c[i+1]))
	}
	return out
}

func cross(a, b geo.XY) float64 { return float64(a.X*b.Y) - float64(a.Y*b.X) }
func dot(a, b geo.XY) float64   { return float64(a.X*b.X) + float64(a.Y*b.Y) }

// along gives a + t·(b-a).
func along(a, b geo.XY, t float64) geo.XY { return geo.XY{X: lerp(a.X, b.X, t), Y: lerp(a.Y, b.Y, t)} }

// shift gives p + d·u.
func shift(p, u geo.XY, d float64) geo.XY {
	return geo.XY{X: p.X + float64(u.X*d), Y: p.Y + float64(u.Y*d)}
}

// unit gives the direction from a to b, the zero vector when they coincide.
func unit(a, b geo.XY) geo.XY {
	l := a.Dist(b)
	if l == 0 {
		return geo.XY{}
	}
	return geo.XY{X: (b.X - a.X) / l, Y: (b.Y - a.Y) / l}
}

// left turns a vector a quarter to the left.
func left(u geo.XY) geo.XY { return geo.XY{X: -u.Y, Y: u.X} }

// heading gives the unit vector at an angle in radians from east, turning left.
func heading(a float64) geo.XY { return geo.XY{X: math.Cos(a), Y: math.Sin(a)} }

// snap rounds to centimetres, so that later steps start from settled numbers.
func snap(p geo.XY) geo.XY {
	return geo.XY{X: math.Round(p.X*100) / 100, Y: math.Round(p.Y*100) / 100}
}

// ringArea is positive for a ring that turns left. Rings here are open: the first point is not repeated.
func ringArea(r []geo.XY) float64 {
	s := 0.0
	for i := range r {
		s += cross(r[i].Sub(r[0]), r[(i+1)%len(r)].Sub(r[0]))
	}
	return s / 2
}

func ringCentroid(r []geo.XY) geo.XY {
	var sx, sy, s float64
	for i := range r {
		a, b := r[i].Sub(r[0]), r[(i+1)%len(r)].Sub(r[0])
		c := cross(a, b)
		s += c
		sx += float64(c * (a.X + b.X))
		sy += float64(c * (a.Y + b.Y))
	}
	if s == 0 {
		return r[0]
	}
	return geo.XY{X: r[0].X + sx/(3*s), Y: r[0].Y + sy/(3*s)}
}

func ringLength(r []geo.XY) float64 {
	s := 0.0
	for i := range r {
		s += r[i].Dist(r[(i+1)%len(r)])
	}
	return s
}

func lineLength(l []geo.XY) float64 {
	s := 0.0
	for i := 1; i < len(l); i++ {
		s += l[i-1].Dist(l[i])
	}
	return s
}

func inRing(p geo.XY, r []geo.XY) bool {
	in := false
	for i := range r {
		a, b := r[i], r[(i+1)%len(r)]
		if (a.Y > p.Y) != (b.Y > p.Y) && p.X < a.X+float64((b.X-a.X)*(p.Y-a.Y))/(b.Y-a.Y) {
			in = !in
		}
	}
	return in
}

// segmentNearest gives the distance from p to the segment and where along it the nearest point lies.
func segmentNearest(p, a, b geo.XY) (distM, t float64) {
	d := b.Sub(a)
	l2 := dot(d, d)
	if l2 > 0 {
		t = clamp(dot(p.Sub(a), d)/l2, 0, 1)
	}
	return p.Dist(along(a, b, t)), t
}

// lineNearest gives the distance from p to a line and the running metres of the nearest point.
func lineNearest(p geo.XY, l []geo.XY) (distM, atM float64) {
	distM = math.Inf(1)
	run := 0.0
	for i := 1; i < len(l); i++ {
		d, t := segmentNearest(p, l[i-1], l[i])
		seg := l[i-1].Dist(l[i])
		if d < distM {
			distM, atM = d, run+float64(t*seg)
		}
		run += seg
	}
	return distM, atM
}

// pointAt gives the point and direction at running metres along a line.
func pointAt(l []geo.XY, atM float64) (p, dir geo.XY) {
	for i := 1; i < len(l); i++ {
		seg := l[i-1].Dist(l[i])
		if atM <= seg || i == len(l)-1 {
			return along(l[i-1], l[i], clamp(atM/seg, 0, 1)), unit(l[i-1], l[i])
		}
		atM -= seg
	}
	return l[0], geo.XY{}
}

// crossing gives where two segments properly cross, as shares of both.
func crossing(a, b, c, d geo.XY) (t, u float64, ok bool) {
	r, s := b.Sub(a), d.Sub(c)
	den := cross(r, s)
	if den == 0 {
		return 0, 0, false
	}
	q := c.Sub(a)
	t, u = cross(q, s)/den, cross(q, r)/den
	return t, u, t >= 0 && t <= 1 && u >= 0 && u <= 1
}

// simplify drops points of a line that lie within tol of the chord between kept ones.
func simplify(l []geo.XY, tolM float64) []geo.XY {
	if len(l) < 3 {
		return l
	}
	worst, at := -1.0, 0
	for i := 1; i < len(l)-1; i++ {
		if d, _ := segmentNearest(l[i], l[0], l[len(l)-1]); d > worst {
			worst, at = d, i
		}
	}
	if worst <= tolM {
		return []geo.XY{l[0], l[len(l)-1]}
	}
	head := simplify(l[:at+1], tolM)
	return append(append([]geo.XY{}, head...), simplify(l[at:], tolM)[1:]...)
}

// simplifyRing does the same for an open ring, keeping its first point and the one farthest from it.
func simplifyRing(r []geo.XY, tolM float64) []geo.XY {
	far, at := -1.0, 0
	for i, p := range r {
		if d := p.Dist(r[0]); d > far {
			far, at = d, i
		}
	}
	first := simplify(r[:at+1], tolM)
	second := simplify(append(append([]geo.XY{}, r[at:]...), r[0]), tolM)
	return append(append([]geo.XY{}, first...), second[1:len(second)-1]...)
}

// curve draws a smooth closed curve through the control points (Catmull and Rom 1974), n points each.
func curve(c []geo.XY, n int) []geo.XY {
	var out []geo.XY
	k := len(c)
	for i := range c {
		p0, p1, p2, p3 := c[(i+k-1)%k], c[i], c[(i+1)%k], c[(i+2)%k]
		for j := range n {
			t := float64(j) / float64(n)
			out = append(out, geo.XY{X: catmull(p0.X, p1.X, p2.X, p3.X, t), Y: catmull(p0.Y, p1.Y, p2.Y, p3.Y, t)})
		}
	}
	return out
}

func catmull(a, b, c, d, t float64) float64 {
	return b + float64(0.5*float64(t*(c-a+float64(t*(float64(2*a)-float64(5*b)+float64(4*c)-d+float64(t*(float64(3*(b-c))+d-a)))))))
}

// simpleRing reports whether no two edges of the ring cross or touch but at shared ends.
func simpleRing(r []geo.XY) bool {
	n := len(r)
	if n < 3 {
		return false
	}
	for i := range n {
		a, b := r[i], r[(i+1)%n]
		if a == b {
			return false
		}
		lox, hix := math.Min(a.X, b.X), math.Max(a.X, b.X)
		loy, hiy := math.Min(a.Y, b.Y), math.Max(a.Y, b.Y)
		for j := i + 2; j < n; j++ {
			if i == 0 && j == n-1 {
				continue
			}
			c, d := r[j], r[(j+1)%n]
			if math.Max(c.X, d.X) < lox || math.Min(c.X, d.X) > hix || math.Max(c.Y, d.Y) < loy || math.Min(c.Y, d.Y) > hiy {
				continue
			}
			if _, _, ok := crossing(a, b, c, d); ok {
				return false
			}
		}
	}
	return true
}

// segments is a bucket index over many line segments.
type segments struct {
	cell    float64
	buckets map[[2]int][]int32
	a, b    []geo.XY
	tag     []int
}

func newSegments(cellM float64) *segments {
	return &segments{cell: cellM, buckets: map[[2]int][]int32{}}
}

func (s *segments) key(x, y float64) (int, int) {
	return int(math.Floor(x / s.cell)), int(math.Floor(y / s.cell))
}

func (s *segments) add(a, b geo.XY, tag int) {
	id := int32(len(s.a))
	s.a, s.b, s.tag = append(s.a, a), append(s.b, b), append(s.tag, tag)
	i0, j0 := s.key(math.Min(a.X, b.X), math.Min(a.Y, b.Y))
	i1, j1 := s.key(math.Max(a.X, b.X), math.Max(a.Y, b.Y))
	for i := i0; i <= i1; i++ {
		for j := j0; j <= j1; j++ {
			s.buckets[[2]int{i, j}] = append(s.buckets[[2]int{i, j}], id)
		}
	}
}

func (s *segments) addLine(l []geo.XY, tag int) {
	for i := 1; i < len(l); i++ {
		s.add(l[i-1], l[i], tag)
	}
}

func (s *segments) addRing(r []geo.XY, tag int) {
	s.addLine(r, tag)
	s.add(r[len(r)-1], r[0], tag)
}

// nearest gives the distance to the nearest segment and its tag; maxM and -1 when none is closer.
func (s *segments) nearest(p geo.XY, maxM float64) (float64, int) {
	best, tag := maxM, -1
	ci, cj := s.key(p.X, p.Y)
	for ring := 0; float64(ring-1)*s.cell < best; ring++ {
		for i := ci - ring; i <= ci+ring; i++ {
			for j := cj - ring; j <= cj+ring; j++ {
				if i != ci-ring && i != ci+ring && j != cj-ring && j != cj+ring {
					continue
				}
				for _, id := range s.buckets[[2]int{i, j}] {
					if d, _ := segmentNearest(p, s.a[id], s.b[id]); d < best {
						best, tag = d, s.tag[id]
					}
				}
			}
		}
	}
	return best, tag
}

// near lists the segments whose buckets the box meets, in rising order, each once.
func (s *segments) near(e geo.Extent) []int32 {
	var out []int32
	seen := map[int32]bool{}
	i0, j0 := s.key(e.MinX, e.MinY)
	i1, j1 := s.key(e.MaxX, e.MaxY)
	for i := i0; i <= i1; i++ {
		for j := j0; j <= j1; j++ {
			for _, id := range s.buckets[[2]int{i, j}] {
				if !seen[id] {
					seen[id] = true
					out = append(out, id)
				}
			}
		}
	}
	return out
}

// field is a grid of values at nodes.
type field struct {
	nx, ny       int
	x0, y0, cell float64
	v            []float64
}

func newField(nx, ny int, x0, y0, cellM float64) *field {
	return &field{nx: nx, ny: ny, x0: x0, y0: y0, cell: cellM, v: make([]float64, nx*ny)}
}

func (f *field) node(k int) geo.XY {
	return geo.XY{X: f.x0 + float64(f.cell*float64(k%f.nx)), Y: f.y0 + float64(f.cell*float64(k/f.nx))}
}

func (f *field) get(i, j int) float64 {
	return f.v[min(max(j, 0), f.ny-1)*f.nx+min(max(i, 0), f.nx-1)]
}

// at interpolates linearly between the four nodes around p.
func (f *field) at(p geo.XY) float64 {
	x, y := (p.X-f.x0)/f.cell, (p.Y-f.y0)/f.cell
	i, j := int(math.Floor(x)), int(math.Floor(y))
	u, v := x-float64(i), y-float64(j)
	return lerp(lerp(f.get(i, j), f.get(i+1, j), u), lerp(f.get(i, j+1), f.get(i+1, j+1), u), v)
}

// smooth interpolates with cubic curves through sixteen nodes.
func (f *field) smooth(p geo.XY) float64 {
	x, y := (p.X-f.x0)/f.cell, (p.Y-f.y0)/f.cell
	i, j := int(math.Floor(x)), int(math.Floor(y))
	u, v := x-float64(i), y-float64(j)
	var row [4]float64
	for k := range 4 {
		jj := j - 1 + k
		row[k] = catmull(f.get(i-1, jj), f.get(i, jj), f.get(i+1, jj), f.get(i+2, jj), u)
	}
	return catmull(row[0], row[1], row[2], row[3], v)
}

// slope gives the gradient at p as rise over run, by differences over one cell to either side.
func (f *field) slope(p geo.XY) geo.XY {
	d := f.cell
	return geo.XY{
		X: (f.at(geo.XY{X: p.X + d, Y: p.Y}) - f.at(geo.XY{X: p.X - d, Y: p.Y})) / (2 * d),
		Y: (f.at(geo.XY{X: p.X, Y: p.Y + d}) - f.at(geo.XY{X: p.X, Y: p.Y - d})) / (2 * d),
	}
}
