package gen

import (
	"container/heap"
	"fmt"
	"math"
	"sort"

	"groundtally/geo"
)

// land is the island as ground: its shore, its heights and the water on it.
type land struct {
	shore   []geo.XY
	inland  *field // signed distance to the shore in metres, positive on land
	worn    *field // relief after erosion
	drained []float64
	down    []int32 // node that each node drains to
	streams []watercourse
	lakes   []lake
	height  *field // final heights on the terrain grid
	above   *field // height above the bed of the main river where it drains there, else large
	rough   noise
}

type watercourse struct {
	name, kind string
	widthM     float64
	line       []geo.XY
	main       bool
}

type lake struct {
	name string
	ring []geo.XY
}

// The grid on which water wears the land, and the terrain grid that is written.
const (
	wornCellM    = 60.0
	terrainCellM = 25.0
	peakM        = 310.0
)

var (
	mainGuide  = kms(-2.6, 3.2, -2.2, 2.2, -1.1, 1.0, -1.5, -0.6, -0.5, -1.9, 0.3, -3.2, 0.7, -4.75)
	sideGuides = [][]geo.XY{
		kms(-4.6, 3.6, -5.4, 2.2, -6.6, 1.2, -7.6, 0.0, -9.4, -0.8),
		kms(2.6, 3.4, 4.0, 2.2, 5.2, 1.0, 6.6, 0.1, 7.4, -1.2, 8.2, -2.0),
	}
)

// rawHeight is the relief before water touches it: a plateau in the north, low hills, a sloping plain.
func (g *land) rawHeight(p geo.XY) float64 {
	d := g.inland.at(p)
	if d <= 0 {
		return 0
	}
	hill := func(cx, cy, rx, ry, h float64) float64 {
		x, y := (p.X-float64(cx*1000))/(rx*1000), (p.Y-float64(cy*1000))/(ry*1000)
		q := math.Sqrt(float64(x*x) + float64(y*y))
		return float64(h * step01(1, 0.25, q))
	}
	n := g.rough.fractal(p, 3200, 4)
	moss := hill(-0.6+float64(0.5*n*0.3), 3.7, 8.6, 4.3, 292)
	h := 14 + float64(34*step01(0, 6000, d)) + moss + float64(16*g.rough.fractal(geo.XY{X: p.X + 40000, Y: p.Y}, 900, 4)*step01(0, 900, d)) +
		hill(-7.9, -2.3, 3.3, 2.2, 92) + hill(8.6, 1.2, 3.6, 2.8, 96) +
		hill(-3.4, -3.6, 2.2, 1.6, 52) + hill(3.4, -2.8, 2.6, 1.5, 46) + float64(n*(13+float64(0.07*moss)))
	for i, guide := range append([][]geo.XY{mainGuide}, sideGuides...) {
		w, depth := 900.0, 0.62
		if i == 0 {
			w, depth = 1250, 0.7
		}
		dist, at := lineNearest(p, guide)
		dist += float64(260 * g.rough.at(p, 800))
		h -= float64(float64(h*depth) * step01(w, 0, dist) * step01(0, 2600, at))
	}
	cliff := 3 + float64(9*step01(-1500, 4500, p.Y)) + float64(5*n)
	return math.Max(1.5, lerp(math.Max(2, cliff), h, step01(0, 1100, d)))
}

type brim struct {
	h  float64
	at int32
}
type brims []brim

func (b brims) Len() int { return len(b) }
func (b brims) Less(i, j int) bool {
	if b[i].h != b[j].h {
		return b[i].h < b[j].h
	}
	return b[i].at < b[j].at
}
func (b brims) Swap(i, j int) { b[i], b[j] = b[j], b[i] }
func (b *brims) Push(x any)   { *b = append(*b, x.(brim)) }
func (b *brims) Pop() any {
	o := *b
	x := o[len(o)-1]
	*b = o[:len(o)-1]
	return x
}

var around = [8][2]int{{1, 0}, {0, 1}, {-1, 0}, {0, -1}, {1, 1}, {-1, 1}, {-1, -1}, {1, -1}}

// drain fills hollows from the sea upwards (Barnes, Lehman and Mulla 2014) and gives for every land
// node the node it drains to, with all land nodes from high to low.
//
// Among the ways down the steeper is the likelier: chance, keyed by round and node, keeps the channels
// from running along the axes of the grid.
func (g *land) drain(h *field, round int) (down, order []int32) {
	n := len(h.v)
	down = make([]int32, n)
	done := make([]bool, n)
	q := &brims{}
	for k := range n {
		down[k] = -1
		if g.inland.v[k] <= 0 {
			done[k] = true
			heap.Push(q, brim{0, int32(k)})
		}
	}
	for q.Len() > 0 {
		b := heap.Pop(q).(brim)
		k := int(b.at)
		if g.inland.v[k] > 0 {
			order = append(order, b.at)
		}
		i, j := k%h.nx, k/h.nx
		for _, s := range around {
			ii, jj := i+s[0], j+s[1]
			if ii < 0 || jj < 0 || ii >= h.nx || jj >= h.ny || done[jj*h.nx+ii] {
				continue
			}
			m := jj*h.nx + ii
			done[m] = true
			if h.v[m] <= b.h {
				h.v[m] = b.h + 0.002
			}
			down[m] = int32(k)
			heap.Push(q, brim{h.v[m], int32(m)})
		}
	}
	// Where a steeper way down exists than the one by which the flood came, water takes it.
	for _, m := range order {
		i, j := int(m)%h.nx, int(m)/h.nx
		best := 0.0
		for s, d := range around {
			ii, jj := i+d[0], j+d[1]
			if ii < 0 || jj < 0 || ii >= h.nx || jj >= h.ny {
				continue
			}
			l := 1.0
			if s > 3 {
				l = math.Sqrt2
			}
			fall := (h.v[m] - h.v[jj*h.nx+ii]) / l
			if fall *= 0.35 + chance(g.rough.seed, uint64(round), uint64(m), uint64(s)); fall > best {
				best, down[m] = fall, int32(jj*h.nx+ii)
			}
		}
	}
	for a, b := 0, len(order)-1; a < b; a, b = a+1, b-1 {
		order[a], order[b] = order[b], order[a]
	}
	return down, order
}

// wear lets running water cut the land: stream power with exponent one half of the drained area, solved
// from the outlets upwards (Braun and Willett 2013), and a little creep of the slopes.
func (g *land) wear(rounds int, power, creep float64) {
	h := g.worn
	cellArea := wornCellM * wornCellM
	var order []int32
	for round := range rounds {
		g.down, order = g.drain(h, round)
		area := make([]float64, len(h.v))
		for _, m := range order {
			area[m] += cellArea
			area[g.down[m]] += area[m]
		}
		for a := len(order) - 1; a >= 0; a-- {
			m := order[a]
			to := g.down[m]
			l := g.worn.node(int(m)).Dist(g.worn.node(int(to)))
			k := power * (1 + float64(0.5*g.rough.at(h.node(int(m)), 900))) * lerp(1, 0.55, step01(170, 260, h.v[m]))
			f := k * math.Sqrt(area[m]) / l
			h.v[m] = (h.v[m] + float64(f*h.v[to])) / (1 + f)
		}
		next := append([]float64(nil), h.v...)
		for _, m := range order {
			k := int(m)
			s := h.v[k-1] + h.v[k+1] + h.v[k-h.nx] + h.v[k+h.nx]
			next[k] = h.v[k] + float64(creep*(s-float64(4*h.v[k])))
		}
		h.v = next
		g.drained = area
	}
	g.down, order = g.drain(h, rounds)
	g.drained = make([]float64, len(h.v))
	for _, m := range order {
		g.drained[m] += cellArea
		g.drained[g.down[m]] += g.drained[m]
	}
}

// streamStart is the drained area from which water is drawn as a stream.
const streamStartM2 = 1.4e6

// traceStreams follows the water from the sources down. The longest way to each outlet is one stream,
// what joins it another; short ones are left out.
func (g *land) traceStreams() error {
	h := g.worn
	wet := func(k int32) bool { return g.drained[k] >= streamStartM2 && g.inland.v[k] > 0 }
	up := make(map[int32][]int32)
	var outlets []int32
	for k := range h.v {
		m := int32(k)
		if !wet(m) {
			continue
		}
		to := g.down[m]
		up[to] = append(up[to], m)
		if g.inland.v[to] <= 0 {
			outlets = append(outlets, m)
		}
	}
	sort.SliceStable(outlets, func(a, b int) bool {
		if g.drained[outlets[a]] != g.drained[outlets[b]] {
			return g.drained[outlets[a]] > g.drained[outlets[b]]
		}
		return outlets[a] < outlets[b]
	})
	type todo struct {
		first int32
		below int32 // node it runs into
		trunk int
	}
	net := newNetwork()
	var names = []string{"River Sedge", "Hollin Water", "Thren Burn", "Curlew Burn", "Cotton Burn", "Kell Brook", "Rushy Brook", "Marl Brook", "Fern Burn", "Peel Brook", "Gannet Burn", "Sallow Brook", "Ling Burn", "Pipit Brook"}
	count := 0
	for rank, o := range outlets {
		if g.drained[o] < 5.5e6 {
			continue
		}
		list := []todo{{o, g.down[o], 0}}
		for len(list) > 0 {
			t := list[0]
			list = list[1:]
			path := []int32{t.below, t.first}
			var side []todo
			for k := t.first; ; {
				var big int32 = -1
				for _, u := range up[k] {
					if big < 0 || g.drained[u] > g.drained[big] {
						big = u
					}
				}
				if big < 0 {
					break
				}
				for _, u := range up[k] {
					if u != big {
						side = append(side, todo{u, k, t.trunk + 1})
					}
				}
				path = append(path, big)
				k = big
			}
			if float64(len(path))*wornCellM < 1300 {
				continue
			}
			list = append(list, side...)
			if count >= len(names) {
				return fmt.Errorf("trace streams: more than %d streams", len(names))
			}
			kind, width := "stream", 2.5
			if rank == 0 && t.trunk == 0 {
				kind, width = "river", 9
			} else if t.trunk == 0 {
				width = 4
			}
			var ids []int
			for a := len(path) - 1; a >= 0; a-- {
				ids = append(ids, net.vertex(h.node(int(path[a]))))
			}
			net.path(ids, count)
			g.streams = append(g.streams, watercourse{name: names[count], kind: kind, widthM: width, main: rank == 0 && t.trunk == 0})
			count++
		}
	}
	if len(g.streams) < 3 {
		return fmt.Errorf("trace streams: only %d", len(g.streams))
	}
	net.wiggle(stream(g.rough.seed, "meander"), 14)
	net.relax(7)
	lines := net.lines()
	for i := range g.streams {
		g.streams[i].line = simplify(lines[i], 2.5)
	}
	return nil
}

// mainLine is the course of the largest river, source first.
func (g *land) mainLine() []geo.XY {
	for _, s := range g.streams {
		if s.main {
			return s.line
		}
	}
	return nil
}

// placeLakes puts a lake on the main river in the hills and a tarn on another stream.
func (g *land) placeLakes(seed uint64) {
	r := stream(seed, "lakes")
	for i, want := range []struct {
		name       string
		near       geo.XY
		long, wide float64
	}{{"Sedge Water", km(-1.3, 0.6), 480, 210}, {"Curlew Tarn", km(4.6, 1.9), 230, 150}} {
		best, at, dir := math.Inf(1), geo.XY{}, geo.XY{}
		for _, s := range g.streams {
			total := lineLength(s.line)
			if total < 2500 {
				continue
			}
			for run := 700.0; run < total-1500; run += 50 {
				p, u := pointAt(s.line, run)
				if d := p.Dist(want.near); d < best {
					best, at, dir = d, p, u
				}
			}
		}
		n := newNoise(seed, "lake"+want.name)
		var ring []geo.XY
		for k := range 40 {
			a := float64(k) / 40 * 2 * math.Pi
			m := 1 + float64(0.35*n.at(geo.XY{X: math.Cos(a) * 700, Y: float64(math.Sin(a)*700) + float64(float64(i)*5000)}, 600)) + between(r, -.02, .02)
			p := shift(at, dir, want.long*m*math.Cos(a))
			ring = append(ring, snap(shift(p, left(dir), want.wide*m*math.Sin(a))))
		}
		g.lakes = append(g.lakes, lake{want.name, ring})
	}
}

// shape makes the terrain grid: the worn relief with fine detail, a plain along the lower river, level
// lakes, hummocky dunes.
func (g *land) shape(seed uint64) {
	fine := newNoise(seed, "detail")
	main := g.mainLine()
	mainIdx, allIdx := newSegments(400), newSegments(400)
	for _, s := range g.streams {
		allIdx.addLine(s.line, 0)
	}
	for i := 1; i < len(main); i++ {
		mainIdx.add(main[i-1], main[i], i)
	}
	// The bed falls steadily: walk the river from the sea up and never go down again.
	bed := make([]float64, len(main))
	for i := len(main) - 1; i >= 0; i-- {
		h := math.Max(0.3, g.worn.smooth(main[i])-1)
		if i < len(main)-1 {
			h = math.Max(h, bed[i+1]+0.02)
		}
		bed[i] = h
	}
	total := lineLength(main)
	runs := make([]float64, len(main))
	for i := 1; i < len(main); i++ {
		runs[i] = runs[i-1] + main[i-1].Dist(main[i])
	}
	level := make([]float64, len(g.lakes))
	for i, l := range g.lakes {
		low := math.Inf(1)
		for _, p := range l.ring {
			low = math.Min(low, g.worn.smooth(p))
		}
		level[i] = math.Round(low*10) / 10
	}
	nx, ny := 980, 620
	f := newField(nx, ny, float64(-float64(nx)/2*terrainCellM)+terrainCellM/2, -float64(ny)/2*terrainCellM+terrainCellM/2, terrainCellM)
	g.above = newField(nx, ny, f.x0, f.y0, terrainCellM)
	shoreRing := g.shore
	rows := scanRing(shoreRing, f)
	peak := 0.0
	for k := range f.v {
		p := f.node(k)
		g.above.v[k] = 999
		f.v[k] = -9999
		if !rows[k] {
			continue
		}
		d := math.Max(0, g.inland.at(p))
		h := math.Max(0.4, g.worn.smooth(p))
		h += float64(float64(fine.fractal(p, 420, 4)*(0.35+float64(0.012*h))) * step01(10, 250, d))
		if dist, seg := mainIdx.nearest(p, 900); seg >= 0 {
			share := runs[seg] / total
			w := lerp(40, 330, step01(0.35, 0.9, share)) * (1 + float64(0.45*fine.at(p, 700)))
			b := bed[seg]
			h = lerp(b+0.8+float64(0.9*dist/w), h, step01(0.55*w, 1.25*w, dist))
			g.above.v[k] = math.Max(0, h-b) + float64(900*step01(0.45, 0.3, share))
		}
		if dist, _ := allIdx.nearest(p, 60); dist < 60 {
			h -= float64(1.3 * step01(60, 8, dist))
		}
		if dd, _ := lineNearest(p, duneLine); dd < 700 {
			dune := 2 + float64(6.5*math.Abs(fine.at(p, 130))) + float64(3*math.Abs(fine.at(p, 47)))
			h = lerp(dune, h, step01(280, 600, dd))
		}
		if dd, _ := lineNearest(p, flatsLine); dd < 600 {
			h = lerp(0.9+float64(0.4*fine.at(p, 90)), h, step01(200, 560, dd))
		}
		h = lerp(math.Min(h, 1.2+float64(0.16*d)), h, float64(step01(0, 120, d)*step01(-2500, 1500, p.Y))+float64(step01(30, 260, d)*(1-step01(-2500, 1500, p.Y))))
		h = math.Max(0.3, h)
		for i, l := range g.lakes {
			if inRing(p, l.ring) {
				h = level[i]
			}
		}
		f.v[k] = h
		peak = math.Max(peak, h)
	}
	for k, h := range f.v {
		if h > -9000 {
			// Lowland keeps its height; the upland is stretched so that the summit has the stated one.
			f.v[k] = h * lerp(1, peakM/peak, step01(30, peak*0.9, h))
		}
	}
	g.height = f
}

// scanRing marks the grid nodes inside a ring, row by row.
func scanRing(r []geo.XY, f *field) []bool {
	in := make([]bool, len(f.v))
	for j := range f.ny {
		y := f.y0 + float64(f.cell*float64(j))
		var xs []float64
		for i := range r {
			a, b := r[i], r[(i+1)%len(r)]
			if (a.Y > y) != (b.Y > y) {
				xs = append(xs, a.X+float64((b.X-a.X)*(y-a.Y))/(b.Y-a.Y))
			}
		}
		sort.Float64s(xs)
		for k := 0; k+1 < len(xs); k += 2 {
			for i := max(0, int(math.Ceil((xs[k]-f.x0)/f.cell))); i < f.nx && f.x0+float64(f.cell*float64(i)) <= xs[k+1]; i++ {
				in[j*f.nx+i] = true
			}
		}
	}
	return in
}

// ground gives the height at a point on land, and at sea 0.
func (g *land) ground(p geo.XY) float64 {
	x, y := (p.X-g.height.x0)/terrainCellM, (p.Y-g.height.y0)/terrainCellM
	i, j := int(math.Floor(x)), int(math.Floor(y))
	c := [4]float64{g.height.get(i, j), g.height.get(i+1, j), g.height.get(i, j+1), g.height.get(i+1, j+1)}
	for k := range c {
		c[k] = math.Max(0, c[k])
	}
	u, v := x-float64(i), y-float64(j)
	return lerp(lerp(c[0], c[1], u), lerp(c[2], c[3], u), v)
}

// makeLand builds shore, relief, streams, lakes and terrain.
func makeLand(seed uint64) (*land, error) {
	g := &land{shore: makeCoast(seed), rough: newNoise(seed, "relief")}
	if !simpleRing(g.shore) {
		return nil, fmt.Errorf("make coast: the outline crosses itself with seed %d", seed)
	}
	nx, ny := 423, 273
	x0, y0 := -float64(nx-1)/2*wornCellM, -float64(ny-1)/2*wornCellM
	g.inland = newField(nx, ny, x0, y0, wornCellM)
	idx := newSegments(500)
	idx.addRing(g.shore, 0)
	in := scanRing(g.shore, g.inland)
	for k := range g.inland.v {
		d, _ := idx.nearest(g.inland.node(k), 6000)
		if !in[k] {
			d = -d
		}
		g.inland.v[k] = d
	}
	g.worn = newField(nx, ny, x0, y0, wornCellM)
	for k := range g.worn.v {
		g.worn.v[k] = g.rawHeight(g.worn.node(k))
	}
	g.wear(34, 0.055, 0.06)
	if err := g.traceStreams(); err != nil {
		return nil, err
	}
	g.placeLakes(seed)
	g.shape(seed)
	return g, nil
}
