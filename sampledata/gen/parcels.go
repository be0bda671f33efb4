package gen

import (
	"fmt"
	"math"
	"math/rand/v2"
	"sort"

	"groundtally/geo"
	"groundtally/scoring/units"
)

// parcel is one holding with the ring of its boundary.
type parcel struct {
	id        string
	ring      []geo.XY
	use       string
	consent   string
	date      string
	owner     string
	siteGroup string
	areaHa    float64
	middle    geo.XY
}

// mesh holds the vertices of the fields of one block. When an edge is split the new vertex is kept under
// the edge, so that the neighbour across it gets the same vertex: boundaries are shared to the last digit.
type mesh struct {
	pts   []geo.XY
	split map[[2]int]int
}

func edgeKey(a, b int) [2]int { return [2]int{min(a, b), max(a, b)} }

// whole puts every vertex that was set on an edge since into the ring.
func (m *mesh) whole(r []int) []int {
	var out []int
	var put func(a, b int)
	put = func(a, b int) {
		if c, ok := m.split[edgeKey(a, b)]; ok {
			put(a, c)
			put(c, b)
			return
		}
		out = append(out, a)
	}
	for i := range r {
		put(r[i], r[(i+1)%len(r)])
	}
	return out
}

func (m *mesh) points(r []int) []geo.XY {
	out := make([]geo.XY, len(r))
	for i, id := range r {
		out[i] = m.pts[id]
	}
	return out
}

// cut divides a ring along a line through c in direction u, from boundary to boundary, with the middle
// bent by up to bendM. It fails when the line misses, or when the bent line would leave the ring.
func (m *mesh) cut(r []int, c, u geo.XY, bend float64, rnd *rand.Rand) (one, two []int, ok bool) {
	type hit struct {
		s, t float64
		edge int
	}
	nrm := left(u)
	var hits []hit
	n := len(r)
	for i := range n {
		a, b := m.pts[r[i]], m.pts[r[(i+1)%n]]
		da, db := dot(a.Sub(c), nrm), dot(b.Sub(c), nrm)
		if (da > 0) != (db > 0) {
			t := da / (da - db)
			hits = append(hits, hit{dot(along(a, b, t).Sub(c), u), t, i})
		}
	}
	sort.SliceStable(hits, func(a, b int) bool { return hits[a].s < hits[b].s })
	best, from := math.Inf(1), -1
	for k := 0; k+1 < len(hits); k += 2 {
		gap := math.Max(hits[k].s, -hits[k+1].s)
		if gap < best {
			best, from = gap, k
		}
	}
	if from < 0 {
		return nil, nil, false
	}
	type end struct {
		id, edge int // edge -1: an existing vertex
		pos      int // where in the ring the end stands, or after which it is put
		p        geo.XY
	}
	var ends [2]end
	for k := range 2 {
		h := hits[from+k]
		a, b := r[h.edge], r[(h.edge+1)%n]
		pa, pb := m.pts[a], m.pts[b]
		l := pa.Dist(pb)
		near := math.Min(14, 0.3*l)
		switch {
		case h.t*l < near:
			ends[k] = end{a, -1, h.edge, pa}
		case (1-h.t)*l < near:
			ends[k] = end{b, -1, (h.edge + 1) % n, pb}
		default:
			ends[k] = end{-1, h.edge, h.edge, snap(along(pa, pb, h.t))}
		}
	}
	p, q := ends[0].p, ends[1].p
	l := p.Dist(q)
	if l < 15 || ends[0].edge >= 0 && ends[0].edge == ends[1].edge {
		return nil, nil, false
	}
	clear := func(chord []geo.XY) bool {
		for i := 1; i < len(chord); i++ {
			for j := range n {
				a, b := m.pts[r[j]], m.pts[r[(j+1)%n]]
				if i == 1 && (j == ends[0].edge || a == p || b == p) || i == len(chord)-1 && (j == ends[1].edge || a == q || b == q) {
					continue
				}
				if _, _, hit := crossing(chord[i-1], chord[i], a, b); hit {
					return false
				}
			}
		}
		mid := along(chord[0], chord[1], 0.5)
		if len(chord) > 2 {
			mid = chord[len(chord)/2]
		}
		return inRing(mid, m.points(r))
	}
	chord := []geo.XY{p, q}
	bends := int(clamp(l/130, 0, 5))
	if bends > 0 && bend > 0 {
		bent := []geo.XY{p}
		sway := between(rnd, -1, 1) * bend * l
		for k := 1; k <= bends; k++ {
			t := (float64(k) + between(rnd, -0.25, 0.25)) / float64(bends+1)
			off := float64(sway*math.Sin(math.Pi*t)) + float64(between(rnd, -0.4, 0.4)*bend*l)
			bent = append(bent, snap(shift(along(p, q, t), left(unit(p, q)), off)))
		}
		bent = append(bent, q)
		if clear(bent) {
			chord = bent
		}
	}
	if !clear(chord) {
		return nil, nil, false
	}
	// The vertices are set only now that the cut is sure to hold.
	for k := range ends {
		if e := &ends[k]; e.edge >= 0 {
			m.pts = append(m.pts, e.p)
			e.id = len(m.pts) - 1
			m.split[edgeKey(r[e.edge], r[(e.edge+1)%n])] = e.id
		}
	}
	var inner []int
	for _, x := range chord[1 : len(chord)-1] {
		m.pts = append(m.pts, x)
		inner = append(inner, len(m.pts)-1)
	}
	walk := func(a, b end) []int {
		out := []int{a.id}
		i := a.pos
		if a.edge >= 0 {
			i = a.edge
		}
		for {
			if b.edge >= 0 && i == b.edge {
				return append(out, b.id)
			}
			i = (i + 1) % n
			out = append(out, r[i])
			if b.edge < 0 && i == b.pos {
				return out
			}
		}
	}
	one = walk(ends[0], ends[1])
	for k := len(inner) - 1; k >= 0; k-- {
		one = append(one, inner[k])
	}
	two = walk(ends[1], ends[0])
	two = append(two, inner...)
	return one, two, true
}

// frame is the smallest turned box around a ring, its long side along u.
type frame struct {
	mid, u     geo.XY
	long, wide float64
}

func ringFrame(r []geo.XY) frame {
	best := math.Inf(1)
	var f frame
	for i := range r {
		u := unit(r[i], r[(i+1)%len(r)])
		if u == (geo.XY{}) {
			continue
		}
		v := left(u)
		lo, hi := geo.XY{X: math.Inf(1), Y: math.Inf(1)}, geo.XY{X: math.Inf(-1), Y: math.Inf(-1)}
		for _, p := range r {
			a, b := dot(p, u), dot(p, v)
			lo = geo.XY{X: math.Min(lo.X, a), Y: math.Min(lo.Y, b)}
			hi = geo.XY{X: math.Max(hi.X, a), Y: math.Max(hi.Y, b)}
		}
		l, w := hi.X-lo.X, hi.Y-lo.Y
		if float64(l*w) < best {
			best = float64(l * w)
			mid := shift(shift(geo.XY{}, u, (lo.X+hi.X)/2), v, (lo.Y+hi.Y)/2)
			if l >= w {
				f = frame{mid, u, l, w}
			} else {
				f = frame{mid, v, w, l}
			}
		}
	}
	return f
}

// roundness is 1 for a disc and falls towards 0 for a sliver.
func roundness(r []geo.XY) float64 {
	l := ringLength(r)
	return 4 * math.Pi * ringArea(r) / float64(l*l)
}

// fieldMaker divides blocks into parcels.
type fieldMaker struct {
	g      *land
	places []place
	n      noise
	rnd    *rand.Rand
}

// settled gives the distance beyond the edge of the nearest town or village, negative inside, and to the
// nearest farm.
func (f *fieldMaker) settled(p geo.XY) (edgeM, farmM float64) {
	edgeM, farmM = math.Inf(1), math.Inf(1)
	for _, q := range f.places {
		d := q.at.Dist(p)
		if q.kind == "farm" {
			farmM = math.Min(farmM, d)
		} else {
			edgeM = math.Min(edgeM, d-q.reachM)
		}
	}
	return edgeM, farmM
}

// wantedHa is the size at which a parcel is left whole.
func (f *fieldMaker) wantedHa(p geo.XY) float64 {
	edge, farm := f.settled(p)
	h := f.g.ground(p)
	want := 0.84
	if edge > 0 {
		want += float64(11*step01(140, 480, edge)) + float64(41*step01(380, 2400, edge)) + float64(26*step01(2400, 6500, edge))
	}
	want *= lerp(0.55, 1, step01(150, 500, farm))
	want *= lerp(1, 1.8, step01(90, 190, h)) * lerp(1, 2, step01(190, 260, h))
	return want * math.Exp(0.45*f.n.fractal(p, 900, 2))
}

// stripEdgeM is how far from the edge of a town or village the long strips reach.
const stripEdgeM = 280

// divide cuts a ring again and again across its longer side, along the direction of its own sides, until
// the parts have the wanted size; close to a settlement it cuts lengthwise, which gives strips. A ring that
// no cut divides well stays whole.
func (f *fieldMaker) divide(m *mesh, r []int, out *[][]int, depth int) {
	r = m.whole(r)
	pts := m.points(r)
	area := ringArea(pts) / units.M2PerHa
	c := ringCentroid(pts)
	want := f.wantedHa(c)
	fr := ringFrame(pts)
	edge, _ := f.settled(c)
	high := f.g.ground(c) > 170
	strips := edge > 20 && edge < stripEdgeM && area < 7 && f.n.at(c, 1500) > -0.55
	limit := want * between(f.rnd, 1.15, 1.75)
	if strips {
		limit = 0.95
	}
	if area < limit && !(fr.long > 5.5*fr.wide && area > want*0.8 && !strips) || depth > 16 {
		*out = append(*out, r)
		return
	}
	for try := range 14 {
		u := left(fr.u)
		if strips && fr.wide > 46 && fr.long < 9*fr.wide {
			u = fr.u // long strips, side by side
		}
		u = alignTo(pts, u, fr)
		sway := 0.05
		bend := 0.012
		if high {
			sway, bend = 0.42, 0.055
		}
		a := math.Atan2(u.Y, u.X) + float64(f.rnd.NormFloat64()*sway*(1+float64(0.5*float64(try))))
		u = heading(a)
		across := left(u)
		span := fr.long
		if math.Abs(dot(u, fr.u)) > 0.7 {
			span = fr.wide
		}
		off := between(f.rnd, -0.13, 0.13) * span
		if try > 6 {
			off = between(f.rnd, -0.3, 0.3) * span
		}
		one, two, ok := m.tryCut(r, shift(fr.mid, across, off), u, bend, f.rnd)
		if !ok {
			continue
		}
		f.divide(m, one, out, depth+1)
		f.divide(m, two, out, depth+1)
		return
	}
	*out = append(*out, r)
}

// tryCut cuts and takes the cut back when a part would be a sliver.
func (m *mesh) tryCut(r []int, c, u geo.XY, bend float64, rnd *rand.Rand) (one, two []int, ok bool) {
	before := len(m.pts)
	one, two, ok = m.cut(r, c, u, bend, rnd)
	if !ok {
		return nil, nil, false
	}
	parent := m.points(r)
	total := ringArea(parent)
	least := math.Min(0.2, 0.75*roundness(parent))
	for _, part := range [][]int{one, two} {
		pts := m.points(part)
		if ringArea(pts) < 0.16*total || roundness(pts) < least || !simpleRing(pts) {
			for k, v := range m.split {
				if v >= before {
					delete(m.split, k)
				}
			}
			m.pts = m.pts[:before]
			return nil, nil, false
		}
	}
	return one, two, true
}

// alignTo turns a direction to that of the longest side of the ring that runs about the same way.
func alignTo(r []geo.XY, u geo.XY, fr frame) geo.XY {
	best, out := 0.2*fr.wide, u
	for i := range r {
		a, b := r[i], r[(i+1)%len(r)]
		v := unit(a, b)
		if d := dot(u, v); math.Abs(d) > 0.88 && a.Dist(b) > best {
			best = a.Dist(b)
			out = v
			if d < 0 {
				out = geo.XY{X: -v.X, Y: -v.Y}
			}
		}
	}
	return out
}

// makeParcels cuts the farmed land into blocks along roads, streams and its limit, and blocks into fields.
func makeParcels(seed uint64, g *land, roads []road, places []place) ([]parcel, error) {
	f := &fieldMaker{g: g, places: places, n: newNoise(seed, "fields"), rnd: stream(seed, "fields")}
	limit := farmLimits(g, newNoise(seed, "limit"))
	lines := []kindedLine{{append(append([]geo.XY(nil), limit...), limit[0]), limitEdge}}
	for _, r := range roads {
		switch r.class {
		case "main":
			lines = append(lines, kindedLine{r.line, mainEdge})
		case "lane", "street":
			lines = append(lines, kindedLine{r.line, laneEdge})
		}
	}
	for _, s := range g.streams {
		lines = append(lines, kindedLine{s.line, streamEdge})
	}
	for _, l := range g.lakes {
		lines = append(lines, kindedLine{append(append([]geo.XY(nil), l.ring...), l.ring[0]), lakeEdge})
	}
	blocks, pieces := cutLines(lines).blocks()
	if pieces != 1 {
		return nil, fmt.Errorf("make parcels: the lines of the land fall into %d pieces", pieces)
	}
	var rings [][]geo.XY
	for _, b := range blocks {
		area := ringArea(b.ring)
		if area < 900 {
			continue
		}
		in := interior(b.ring)
		if !inRing(in, limit) || g.inLake(in) {
			continue
		}
		var ring []geo.XY
		for _, share := range []float64{1, 0.6, 0.3, 0.1} {
			if r := b.inset(share); len(r) > 3 && simpleRing(r) && ringArea(r) > 600 {
				ring = r
				break
			}
		}
		if ring == nil {
			continue
		}
		m := &mesh{split: map[[2]int]int{}}
		var r []int
		for _, p := range ring {
			m.pts = append(m.pts, p)
			r = append(r, len(r))
		}
		var parts [][]int
		f.divide(m, r, &parts, 0)
		for _, part := range parts {
			pts := m.points(m.whole(part))
			if ringArea(pts) > 700 {
				rings = append(rings, pts)
			}
		}
	}
	return f.describe(seed, rings), nil
}

// interior gives a point inside a ring: the middle of the longest stretch of a level line through it.
func interior(r []geo.XY) geo.XY {
	c := ringCentroid(r)
	if inRing(c, r) {
		return c
	}
	var xs []float64
	for i := range r {
		a, b := r[i], r[(i+1)%len(r)]
		if (a.Y > c.Y) != (b.Y > c.Y) {
			xs = append(xs, a.X+float64((b.X-a.X)*(c.Y-a.Y))/(b.Y-a.Y))
		}
	}
	sort.Float64s(xs)
	best := c
	w := 0.0
	for i := 0; i+1 < len(xs); i += 2 {
		if xs[i+1]-xs[i] > w {
			w = xs[i+1] - xs[i]
			best.X = (xs[i] + xs[i+1]) / 2
		}
	}
	return best
}

func (g *land) inLake(p geo.XY) bool {
	for _, l := range g.lakes {
		if inRing(p, l.ring) {
			return true
		}
	}
	return false
}

// describe numbers the parcels in rows from the south-west and gives each its use and consent.
func (f *fieldMaker) describe(seed uint64, rings [][]geo.XY) []parcel {
	out := make([]parcel, len(rings))
	for i, r := range rings {
		out[i] = parcel{ring: r, areaHa: ringArea(r) / units.M2PerHa, middle: interior(r)}
	}
	row := func(p geo.XY) int { return int(math.Floor((p.Y + 8000) / 1500)) }
	sort.SliceStable(out, func(i, j int) bool {
		a, b := out[i].middle, out[j].middle
		if row(a) != row(b) {
			return row(a) < row(b)
		}
		if a.X != b.X {
			return a.X < b.X
		}
		return a.Y < b.Y
	})
	r := stream(seed, "holders")
	// Farmers own what lies near their farm; the council owns the moor's middle, others own the rest.
	holder := make([]string, len(f.places))
	for i := range holder {
		holder[i] = people(r)
	}
	estates := []struct {
		name string
		at   geo.XY
		max  int
	}{{"Marramer estate", km(-3.9, -2.4), 9}, {"Pellow estate", km(7.0, -0.2), 7}, {"Church lands", km(-8.2, 1.2), 5}, {"Hollin common", km(1.3, 3.6), 4}}
	count := make([]int, len(estates))
	for i := range out {
		p := &out[i]
		p.id = fmt.Sprintf("M-%04d", i+1)
		edge, farm := f.settled(p.middle)
		h := f.g.ground(p.middle)
		draw := r.Float64()
		patch := f.n.at(p.middle, 1600)
		switch {
		case edge < 0 && p.areaHa < 1.6 && draw < 0.8:
			p.use = "built up"
		case edge < 90 && p.areaHa < 1:
			p.use = "garden"
		case f.g.aboveRiver(p.middle) < 3.5:
			p.use = "meadow"
		case h > 205:
			p.use = "moor"
		case h > 135:
			p.use = "rough grazing"
		case p.areaHa > 3 && p.areaHa < 45 && farm > 380 && draw < 0.055+float64(0.05*step01(30, 100, h)):
			p.use = "wood"
		case patch+float64(1.1*(draw-0.5)) > 0.1+float64(0.5*step01(40, 110, h))-float64(0.25*step01(3500, 1200, edge)):
			p.use = "arable"
		default:
			p.use = "pasture"
		}
		best := math.Inf(1)
		p.owner = people(r)
		for k, q := range f.places {
			if d := q.at.Dist(p.middle); q.kind == "farm" && d < best && d < 800 {
				best = d
				p.owner = holder[k]
			}
		}
		if p.use == "moor" && r.Float64() < 0.5 {
			p.owner = "Marram District Council"
		}
		for k, e := range estates {
			if p.areaHa > 2 && p.middle.Dist(e.at) < 1700 && count[k] < e.max && p.use != "wood" && p.use != "built up" {
				count[k]++
				p.siteGroup, p.owner = e.name, e.name
				break
			}
		}
		switch v := r.Float64(); {
		case p.areaHa < 1 || v < 0.46:
			p.consent = "unknown"
		case v < 0.62:
			p.consent = "not asked"
		case v < 0.71:
			p.consent = "asked"
		case v < 0.88:
			p.consent = "yes"
		case v < 0.95:
			p.consent = "conditional"
		default:
			p.consent = "no"
		}
		if p.consent != "unknown" && p.consent != "not asked" {
			p.date = fmt.Sprintf("2025-%02d-%02d", 1+r.IntN(12), 1+r.IntN(28))
		}
	}
	return out
}

// aboveRiver gives the height above the bed of the main river near it, a large number elsewhere.
func (g *land) aboveRiver(p geo.XY) float64 {
	i := int(math.Round((p.X - g.above.x0) / terrainCellM))
	j := int(math.Round((p.Y - g.above.y0) / terrainCellM))
	return g.above.get(i, j)
}
