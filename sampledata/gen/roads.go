package gen

import (
	"container/heap"
	"math"
	"sort"

	"groundtally/geo"
)

// place is a settlement, from the harbour town to a lone farmstead.
type place struct {
	name, kind string
	at         geo.XY
	reachM     float64 // how far its houses stand from its middle
}

type road struct {
	name, class, surface string
	widthM               float64
	line                 []geo.XY
}

// Classes of road in rising tag order; where paths share a stretch the lowest tag holds.
const (
	mainRoad = iota
	laneRoad
	streetRoad
	trackRoad
)

var (
	harbourMiddle = km(0.35, -5.55)
	town          = place{"Saltreath", "town", km(-0.75, -5.55), 860}
	villageWest   = place{"Thrennick", "village", km(-6.2, -0.9), 330}
	villageEast   = place{"Pellow Green", "village", km(5.3, -2.2), 300}
	airstrip      = [2]geo.XY{km(2.55, -4.25), km(3.45, -4.05)}
)

type trip struct {
	cost float64
	at   int32
}
type trips []trip

func (t trips) Len() int { return len(t) }
func (t trips) Less(i, j int) bool {
	if t[i].cost != t[j].cost {
		return t[i].cost < t[j].cost
	}
	return t[i].at < t[j].at
}
func (t trips) Swap(i, j int) { t[i], t[j] = t[j], t[i] }
func (t *trips) Push(x any)   { *t = append(*t, x.(trip)) }
func (t *trips) Pop() any {
	o := *t
	x := o[len(o)-1]
	*t = o[:len(o)-1]
	return x
}

// wayfinder finds least-cost ways over the land; ways already made are cheap to follow.
type wayfinder struct {
	cost   *field // per metre of level way, negative at sea
	height []float64
	made   map[[2]int32]bool
	open   []bool // nodes that a way passes
	net    *network
}

const wayCellM = 70.0

func newWayfinder(g *land, n noise) *wayfinder {
	nx, ny := 361, 233
	w := &wayfinder{cost: newField(nx, ny, -float64(nx-1)/2*wayCellM, -float64(ny-1)/2*wayCellM, wayCellM),
		made: map[[2]int32]bool{}, net: newNetwork(), height: make([]float64, nx*ny), open: make([]bool, nx*ny)}
	water := newSegments(400)
	for _, s := range g.streams {
		water.addLine(s.line, 0)
	}
	for k := range w.cost.v {
		p := w.cost.node(k)
		d := g.inland.at(p)
		w.height[k] = g.ground(p)
		c := 1 + float64(0.55*n.at(p, 420)) + float64(4*step01(220, 40, d))
		if dist, _ := water.nearest(p, 160); dist < 160 {
			c += float64(2.4 * step01(160, 40, dist))
		}
		if dd, _ := lineNearest(p, duneLine); dd < 500 {
			c += 6
		}
		if ra, _ := lineNearest(p, airstrip[:]); ra < 260 {
			c += 14
		}
		for _, l := range g.lakes {
			if inRing(p, l.ring) || p.Dist(ringCentroid(l.ring)) < 180 {
				c = -1
			}
		}
		if d < 45 {
			c = -1
		}
		w.cost.v[k] = c
	}
	return w
}

// node gives the nearest open node to a point.
func (w *wayfinder) node(p geo.XY) int32 {
	best, at := math.Inf(1), int32(-1)
	ci, cj := int((p.X-w.cost.x0)/wayCellM), int((p.Y-w.cost.y0)/wayCellM)
	for j := max(0, cj-6); j <= min(w.cost.ny-1, cj+6); j++ {
		for i := max(0, ci-6); i <= min(w.cost.nx-1, ci+6); i++ {
			k := j*w.cost.nx + i
			if d := w.cost.node(k).Dist(p); w.cost.v[k] > 0 && d < best {
				best, at = d, int32(k)
			}
		}
	}
	return at
}

// find makes a way from a to b and marks it. follow is what a metre of existing way costs.
func (w *wayfinder) find(a, b geo.XY, tag int, follow float64) bool {
	from, to := w.node(a), w.node(b)
	if from < 0 || to < 0 || from == to {
		return false
	}
	nx := w.cost.nx
	best := map[int32]float64{from: 0}
	prev := map[int32]int32{}
	done := map[int32]bool{}
	q := &trips{{0, from}}
	goal := w.cost.node(int(to))
	for q.Len() > 0 {
		t := heap.Pop(q).(trip)
		if done[t.at] {
			continue
		}
		done[t.at] = true
		if t.at == to {
			break
		}
		here := w.cost.node(int(t.at))
		i, j := int(t.at)%nx, int(t.at)/nx
		for _, s := range around {
			ii, jj := i+s[0], j+s[1]
			if ii < 0 || jj < 0 || ii >= nx || jj >= w.cost.ny {
				continue
			}
			m := int32(jj*nx + ii)
			if w.cost.v[m] < 0 || done[m] {
				continue
			}
			l := here.Dist(w.cost.node(int(m)))
			c := float64(l * follow)
			if !w.made[[2]int32{min(t.at, m), max(t.at, m)}] {
				slope := math.Abs(w.height[m]-w.height[t.at]) / l / 0.055
				c = float64(l * ((w.cost.v[m]+w.cost.v[t.at])/2 + float64(slope*slope)))
				if w.open[m] && m != to {
					c += 25 // a new way leaves old ones alone unless it gains by them
				}
			}
			g := best[t.at] + c - float64(follow*here.Dist(goal)) + float64(follow*w.cost.node(int(m)).Dist(goal))
			if old, ok := best[m]; !ok || g < old {
				best[m], prev[m] = g, t.at
				heap.Push(q, trip{g, m})
			}
		}
	}
	if !done[to] {
		return false
	}
	ids := []int{w.net.vertex(goal)}
	w.open[to] = true
	for k := to; k != from; {
		p := prev[k]
		w.made[[2]int32{min(k, p), max(k, p)}] = true
		w.open[p] = true
		ids = append(ids, w.net.vertex(w.cost.node(int(p))))
		k = p
	}
	w.net.path(ids, tag)
	return true
}

// scatterFarms picks sites for farmsteads: dense near the town, sparse towards the hills, none high up.
func scatterFarms(seed uint64, g *land) []place {
	r := stream(seed, "farms")
	names := farmNames(stream(seed, "farm names"))
	var out []place
	fixed := []place{town, villageWest, villageEast}
	for range 26000 {
		p := geo.XY{X: between(r, -12000, 12000), Y: between(r, -7500, 7500)}
		h, d := g.ground(p), g.inland.at(p)
		if d < 330 || h > 165 {
			continue
		}
		if dd, _ := lineNearest(p, duneLine); dd < 650 {
			continue
		}
		if dd, _ := lineNearest(p, airstrip[:]); dd < 450 {
			continue
		}
		near := math.Inf(1)
		apart := math.Inf(1)
		for i, q := range fixed {
			s := q.at.Dist(p)
			near = math.Min(near, s-q.reachM)
			if i < 3 && s < q.reachM+420 {
				apart = 0
			}
		}
		for _, q := range out {
			apart = math.Min(apart, q.at.Dist(p))
		}
		want := lerp(680, 1180, step01(300, 4200, near)) + float64(420*step01(70, 160, h))
		if apart < want {
			continue
		}
		if len(out) == len(names) {
			break
		}
		out = append(out, place{names[len(out)], "farm", p, 110})
	}
	return out
}

// makeRoads joins town, villages and farms: one main road, lanes between neighbours, streets, tracks.
func makeRoads(seed uint64, g *land) (roads []road, places []place) {
	w := newWayfinder(g, newNoise(seed, "ways"))
	farms := scatterFarms(seed, g)
	places = append([]place{town, villageWest, villageEast}, farms...)

	// The main road runs from village to village through the town, by way of the lower bridge.
	w.find(villageWest.at, town.at, mainRoad, 0.4)
	w.find(town.at, villageEast.at, mainRoad, 0.4)

	// Neighbours are those with no third place closer to both (Toussaint 1980), and a few more pairs
	// whose circle of diameter holds no third place (Gabriel and Sokal 1969).
	type pair struct {
		a, b int
		d    float64
	}
	r := stream(seed, "lanes")
	var pairs []pair
	for a := range places {
		for b := a + 1; b < len(places); b++ {
			d := places[a].at.Dist(places[b].at)
			if d > 3600 {
				continue
			}
			relative, gabriel := true, true
			mid := along(places[a].at, places[b].at, 0.5)
			for c := range places {
				if c == a || c == b {
					continue
				}
				if math.Max(places[a].at.Dist(places[c].at), places[b].at.Dist(places[c].at)) < d {
					relative = false
				}
				if mid.Dist(places[c].at) < d/2 {
					gabriel = false
				}
			}
			draw := r.Float64()
			if relative || gabriel && draw < 0.42 {
				pairs = append(pairs, pair{a, b, d})
			}
		}
	}
	sort.SliceStable(pairs, func(i, j int) bool { return pairs[i].d < pairs[j].d })
	for _, p := range pairs {
		w.find(places[p.a].at, places[p.b].at, laneRoad, 0.45)
	}
	// Tracks climb from the highest farms on to the moor, and one crosses it.
	high := append([]place(nil), farms...)
	sort.SliceStable(high, func(i, j int) bool { return g.ground(high[i].at) > g.ground(high[j].at) })
	for i := range min(9, len(high)) {
		p := high[i].at
		u := unit(p, geo.XY{X: float64(p.X*0.75) - 150, Y: 3700})
		w.find(p, shift(p, u, between(r, 900, 1900)), trackRoad, 0.45)
	}
	w.find(km(-3.9, 1.2), km(-3.6, 5.2), trackRoad, 0.45)

	w.net.wiggle(stream(seed, "road wiggle"), 12)
	w.net.relax(6)
	lines, tags := w.net.chains()
	names := map[int]string{mainRoad: "Harbour Road"}
	for i, ids := range lines {
		var l []geo.XY
		for _, id := range ids {
			l = append(l, snap(w.net.pts[id]))
		}
		l = simplify(l, 2)
		roads = append(roads, newRoad(names[tags[i]], tags[i], l))
	}
	roads = append(roads, townStreets(seed, g)...)
	for i, v := range []place{villageWest, villageEast} {
		roads = append(roads, villageStreets(seed, g, v, i)...)
	}
	return roads, places
}

func newRoad(name string, tag int, l []geo.XY) road {
	switch tag {
	case mainRoad:
		return road{name, "main", "asphalt", 7, l}
	case laneRoad:
		return road{name, "lane", "asphalt", 4, l}
	case streetRoad:
		return road{name, "street", "asphalt", 5.5, l}
	}
	return road{name, "track", "gravel", 3, l}
}

// townStreets lays streets round the harbour and up from it.
func townStreets(seed uint64, g *land) []road {
	n := newNoise(seed, "streets")
	var out []road
	within := func(p geo.XY) bool {
		lim := (town.reachM + 60) * (1 + float64(0.35*n.at(p, 500)))
		dd, _ := lineNearest(p, duneLine)
		return town.at.Dist(p) < lim && g.inland.at(p) > 38 && p.X < 350 && dd > 300
	}
	bend := func(p geo.XY) geo.XY {
		return geo.XY{X: p.X + float64(55*n.at(p, 520)), Y: p.Y + float64(55*n.at(geo.XY{X: p.Y, Y: p.X}, 480))}
	}
	names := []string{"Quay Street", "Net Street", "Chapel Street", "Salter Street", "Mill Street", "High Street", "Cross Street", "Orchard Road", "Hill Road"}
	for i, rad := range []float64{330, 450, 575, 700, 850, 1010, 1180, 1370, 1580} {
		var l []geo.XY
		for a := 95.0; a <= 290; a += 4 {
			l = append(l, bend(shift(harbourMiddle, heading(a*math.Pi/180), rad)))
		}
		for _, part := range runs(l, within, 160) {
			out = append(out, newRoad(names[i%len(names)], streetRoad, part))
		}
	}
	for a := 102.0; a <= 285; a += 11 {
		start := 330.0
		if int(a)%2 == 0 {
			start = 575
		}
		var l []geo.XY
		for rad := start; rad <= 1850; rad += 30 {
			l = append(l, bend(shift(harbourMiddle, heading((a+float64(3*math.Sin(rad/300)))*math.Pi/180), rad)))
		}
		for _, part := range runs(l, within, 160) {
			out = append(out, newRoad("", streetRoad, part))
		}
	}
	return out
}

// villageStreets lays two back lanes and three cross lanes.
func villageStreets(seed uint64, g *land, v place, k int) []road {
	n := newNoise(seed, "village "+v.name)
	turn := 0.5 + float64(float64(k)*1.15)
	u := heading(turn)
	within := func(p geo.XY) bool {
		return v.at.Dist(p) < v.reachM*(1.05+float64(0.3*n.at(p, 300))) && g.inland.at(p) > 60
	}
	bend := func(p geo.XY) geo.XY {
		return geo.XY{X: p.X + float64(45*n.at(p, 260)), Y: p.Y + float64(45*n.at(geo.XY{X: p.Y, Y: p.X}, 260))}
	}
	var out []road
	for i := range 5 {
		dir, off, far := u, []float64{-115, 95, -190, 0, 205}[i], 420.0
		if i > 1 {
			dir = left(u)
		}
		var l []geo.XY
		for s := -far; s <= far; s += 25 {
			l = append(l, bend(shift(shift(v.at, dir, s), left(dir), off)))
		}
		for _, part := range runs(l, within, 120) {
			out = append(out, newRoad("", streetRoad, part))
		}
	}
	return out
}

// runs gives the stretches of a line whose points all satisfy the test, if long enough.
func runs(l []geo.XY, ok func(geo.XY) bool, leastM float64) [][]geo.XY {
	var out [][]geo.XY
	var cur []geo.XY
	flush := func() {
		if len(cur) > 1 && lineLength(cur) >= leastM {
			out = append(out, simplify(cur, 0.8))
		}
		cur = nil
	}
	for _, p := range l {
		if ok(p) {
			cur = append(cur, snap(p))
		} else {
			flush()
		}
	}
	flush()
	return out
}
