package gen

import (
	"math"
	"sort"

	"groundtally/geo"
)

// Kinds of boundary between blocks of land.
const (
	limitEdge = iota // edge of the farmed land towards shore and dunes
	streamEdge
	lakeEdge
	laneEdge
	mainEdge
)

// verge is how far a parcel stays from the middle of what bounds it, in metres.
var verge = [5]float64{0, 2, 4, 4, 6}

// planar is a set of lines cut at all crossings.
type planar struct {
	pts   []geo.XY
	ids   map[[2]int64]int
	edges [][3]int // from, to, kind
}

func (p *planar) vertex(q geo.XY) int {
	q = snap(q)
	k := [2]int64{int64(math.Round(q.X * 100)), int64(math.Round(q.Y * 100))}
	if id, ok := p.ids[k]; ok {
		return id
	}
	p.ids[k] = len(p.pts)
	p.pts = append(p.pts, q)
	return len(p.pts) - 1
}

type kindedLine struct {
	pts  []geo.XY
	kind int
}

// cutLines makes the planar graph of the lines and drops what leads nowhere.
func cutLines(lines []kindedLine) *planar {
	const touchM = 0.6
	idx := newSegments(120)
	for _, l := range lines {
		idx.addLine(l.pts, l.kind)
	}
	p := &planar{ids: map[[2]int64]int{}}
	type cut struct {
		t  float64
		id int
	}
	cuts := make([][]cut, len(idx.a))
	for i := range idx.a {
		a, b := idx.a[i], idx.b[i]
		cuts[i] = append(cuts[i], cut{0, p.vertex(a)}, cut{1, p.vertex(b)})
	}
	for i := range idx.a {
		a, b := idx.a[i], idx.b[i]
		box := geo.EmptyExtent().Add(a).Add(b).Grow(touchM)
		for _, j32 := range idx.near(box) {
			j := int(j32)
			if j == i {
				continue
			}
			c, d := idx.a[j], idx.b[j]
			// An end of the other segment that lies on this one becomes a vertex of it.
			touched := false
			for _, e := range []geo.XY{c, d} {
				if e.Dist(a) < touchM || e.Dist(b) < touchM {
					touched = touched || e == a || e == b
					continue
				}
				if dist, t := segmentNearest(e, a, b); dist < touchM {
					cuts[i] = append(cuts[i], cut{t, p.vertex(e)})
					touched = true
				}
			}
			for _, e := range []geo.XY{a, b} {
				if dist, _ := segmentNearest(e, c, d); dist < touchM {
					touched = true
				}
			}
			if touched || j < i {
				continue
			}
			if t, u, ok := crossing(a, b, c, d); ok {
				id := p.vertex(along(a, b, t))
				cuts[i], cuts[j] = append(cuts[i], cut{t, id}), append(cuts[j], cut{u, id})
			}
		}
	}
	seen := map[[2]int]bool{}
	for i := range cuts {
		c := cuts[i]
		sort.SliceStable(c, func(x, y int) bool { return c[x].t < c[y].t })
		for k := 1; k < len(c); k++ {
			a, b := c[k-1].id, c[k].id
			key := [2]int{min(a, b), max(a, b)}
			if a != b && !seen[key] {
				seen[key] = true
				p.edges = append(p.edges, [3]int{a, b, idx.tag[i]})
			}
		}
	}
	for {
		degree := make([]int, len(p.pts))
		for _, e := range p.edges {
			degree[e[0]]++
			degree[e[1]]++
		}
		kept := p.edges[:0:0]
		for _, e := range p.edges {
			if degree[e[0]] > 1 && degree[e[1]] > 1 {
				kept = append(kept, e)
			}
		}
		if len(kept) == len(p.edges) {
			return p
		}
		p.edges = kept
	}
}

// block is a face of the planar graph: a ring that turns left and the kind of each edge from a vertex on.
type block struct {
	ring  []geo.XY
	kinds []int
}

// blocks gives the bounded faces, and how many rings turn the other way: one for each connected piece.
func (p *planar) blocks() (out []block, pieces int) {
	type half struct {
		to, kind int
		angle    float64
	}
	star := make([][]half, len(p.pts))
	for _, e := range p.edges {
		a, b := p.pts[e[0]], p.pts[e[1]]
		star[e[0]] = append(star[e[0]], half{e[1], e[2], math.Atan2(b.Y-a.Y, b.X-a.X)})
		star[e[1]] = append(star[e[1]], half{e[0], e[2], math.Atan2(a.Y-b.Y, a.X-b.X)})
	}
	for i := range star {
		s := star[i]
		sort.SliceStable(s, func(x, y int) bool { return s[x].angle < s[y].angle })
	}
	used := map[[2]int]bool{}
	for v := range star {
		for _, h := range star[v] {
			if used[[2]int{v, h.to}] {
				continue
			}
			var b block
			from, cur := v, h
			for !used[[2]int{from, cur.to}] {
				used[[2]int{from, cur.to}] = true
				b.ring, b.kinds = append(b.ring, p.pts[from]), append(b.kinds, cur.kind)
				// Turn as far right as there is a way: the neighbour before the one we came from.
				s := star[cur.to]
				k := 0
				for i := range s {
					if s[i].to == from {
						k = i
					}
				}
				from, cur = cur.to, s[(k+len(s)-1)%len(s)]
			}
			if a := ringArea(b.ring); a > 0 {
				out = append(out, b)
			} else {
				pieces++
			}
		}
	}
	return out, pieces
}

// inset moves every edge inwards by the verge of its kind times share.
func (b block) inset(share float64) []geo.XY {
	n := len(b.ring)
	out := make([]geo.XY, 0, n)
	for i := range n {
		prev, at, next := b.ring[(i+n-1)%n], b.ring[i], b.ring[(i+1)%n]
		d0, d1 := verge[b.kinds[(i+n-1)%n]]*share, verge[b.kinds[i]]*share
		u0, u1 := unit(prev, at), unit(at, next)
		n0, n1 := left(u0), left(u1)
		den := cross(u0, u1)
		var q geo.XY
		if math.Abs(den) < 0.12 {
			q = shift(at, unit(geo.XY{}, geo.XY{X: n0.X + n1.X, Y: n0.Y + n1.Y}), math.Max(d0, d1))
		} else {
			// Where the two moved edges meet.
			p0, p1 := shift(at, n0, d0), shift(at, n1, d1)
			q = shift(p0, u0, cross(p1.Sub(p0), u1)/den)
			if lim := 4 * math.Max(d0, d1); q.Dist(at) > lim {
				q = shift(at, unit(at, q), lim)
			}
		}
		out = append(out, snap(q))
	}
	return tidyRing(out)
}

// tidyRing drops points that repeat and spikes that go out and back.
func tidyRing(r []geo.XY) []geo.XY {
	for changed := true; changed && len(r) > 3; {
		changed = false
		for i := 0; i < len(r) && len(r) > 3; i++ {
			a, b, c := r[(i+len(r)-1)%len(r)], r[i], r[(i+1)%len(r)]
			if b.Dist(c) < 1 || dot(unit(a, b), unit(b, c)) < -0.985 {
				r = append(append([]geo.XY(nil), r[:i]...), r[i+1:]...)
				changed = true
			}
		}
	}
	return r
}

// farmLimits gives the edge of the land that can be farmed or built on: back from the cliff, behind the
// dunes and the flats. It is a line of equal value through a grid.
func farmLimits(g *land, n noise) []geo.XY {
	f := newField(491, 311, -12250, -7750, 50)
	for k := range f.v {
		p := f.node(k)
		v := g.inland.at(p) - 45 - float64(18*n.at(p, 300))
		dd, _ := lineNearest(p, duneLine)
		v = math.Min(v, dd-430-float64(110*n.at(p, 420)))
		df, _ := lineNearest(p, flatsLine)
		v = math.Min(v, df-210-float64(60*n.at(p, 350)))
		f.v[k] = v
	}
	var best []geo.XY
	for _, r := range contour(f, 0) {
		if ringArea(r) > 0 && (best == nil || ringArea(r) > ringArea(best)) {
			best = r
		}
	}
	return simplifyRing(best, 3)
}

// contour follows a line of equal value through a grid by linear interpolation on its edges. Rings have
// the higher side on their left. The value must be lower on the border of the grid.
func contour(f *field, level float64) [][]geo.XY {
	type key struct{ i, j, dir int }
	point := func(k key) geo.XY {
		a := f.get(k.i, k.j)
		var b float64
		p := geo.XY{X: f.x0 + float64(f.cell*float64(k.i)), Y: f.y0 + float64(f.cell*float64(k.j))}
		if k.dir == 0 {
			b = f.get(k.i+1, k.j)
			p.X += f.cell * (level - a) / (b - a)
		} else {
			b = f.get(k.i, k.j+1)
			p.Y += f.cell * (level - a) / (b - a)
		}
		return snap(p)
	}
	next := map[key]key{}
	var starts []key
	for j := 0; j+1 < f.ny; j++ {
		for i := 0; i+1 < f.nx; i++ {
			hi := func(a, b int) bool { return f.get(i+a, j+b) >= level }
			south, north := key{i, j, 0}, key{i, j + 1, 0}
			west, east := key{i, j, 1}, key{i + 1, j, 1}
			c := 0
			for b, on := range []bool{hi(0, 0), hi(1, 0), hi(1, 1), hi(0, 1)} {
				if on {
					c |= 1 << b
				}
			}
			link := func(a, b key) {
				next[a] = b
				starts = append(starts, a)
			}
			switch c {
			case 1:
				link(south, west)
			case 2:
				link(east, south)
			case 3:
				link(east, west)
			case 4:
				link(north, east)
			case 5:
				link(south, west)
				link(north, east)
			case 6:
				link(north, south)
			case 7:
				link(north, west)
			case 8:
				link(west, north)
			case 9:
				link(south, north)
			case 10:
				link(east, south)
				link(west, north)
			case 11:
				link(east, north)
			case 12:
				link(west, east)
			case 13:
				link(south, east)
			case 14:
				link(west, south)
			}
		}
	}
	var out [][]geo.XY
	done := map[key]bool{}
	for _, s := range starts {
		if done[s] {
			continue
		}
		var r []geo.XY
		for k := s; !done[k]; k = next[k] {
			done[k] = true
			p := point(k)
			if len(r) == 0 || r[len(r)-1] != p {
				r = append(r, p)
			}
		}
		if len(r) > 3 {
			out = append(out, r)
		}
	}
	return out
}
