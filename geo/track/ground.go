package track

import (
	"cmp"
	"math"
	"slices"

	"groundtally/geo"
	"groundtally/geo/measure"
)

// Layers that cover ground; a cell or a position has the sum of those that cover it.
const (
	preferred uint8 = 1 << iota
	site
	blocked
)

const (
	blockedM = 1e-6 // shorter stretches of blocked ground are rounding where a way touches an edge
	edgeM    = 1e-5 // a position this near to an edge counts as on it
	reachM   = 1e-3 // edges this far outside a cell count as in it; more than twice edgeM
)

// ground is the area searched: square cells that know which layers cover them. Cells with the edge of a
// polygon in them are mixed and keep the edges, so that what covers a position is known exactly.
type ground struct {
	nx, ny int
	stepM  float64
	min    geo.XY
	flags  []uint8 // layers of the polygon parts that have no edge in the cell and cover it
	first  []int32 // 1 + the first of the cell's groups; 0 for none
	groups []group
	cost   [8]float64 // of a metre, by layers
	least  float64    // no ground costs less
	breaks []float64
	spans  []measure.Span
}

// group is what one polygon part has in one cell.
type group struct {
	layer  uint8
	inside bool // the cell's reference position lies in the part
	edges  []edge
	next   int32 // 1 + the next group of the cell; 0 for none
}

type edge struct{ p, q geo.XY }

func newGround(in Input, at []geo.XY) *ground {
	g := &ground{stepM: in.StepM, least: math.Min(in.OffGround, in.OffSite)}
	everywhere := in.Site.Empty()
	for f := range g.cost {
		switch layers := uint8(f); {
		case layers&blocked != 0:
			g.cost[f] = math.Inf(1)
		case layers&preferred != 0:
			g.cost[f] = 1
		case layers&site != 0 || everywhere:
			g.cost[f] = in.OffGround
		default:
			g.cost[f] = in.OffSite
		}
	}
	switch {
	case !in.Preferred.Empty():
		g.least = 1
	case everywhere:
		g.least = in.OffGround
	}

	x := geo.EmptyExtent()
	for _, p := range at {
		x = x.Add(p)
	}
	spreadM := math.Max(x.MaxX-x.MinX, x.MaxY-x.MinY)
	near, far := x.Grow(4*in.StepM), x.Grow(spreadM+8*in.StepM)
	extents := []geo.Extent{geo.ExtentOf(in.Preferred), geo.ExtentOf(in.Site)}
	for _, b := range in.Blocked {
		for _, part := range b.Parts { // what may lie in the way is to be gone round
			if e := geo.ExtentOf(geo.XYGeometry{Parts: [][][]geo.XY{part}}); e.Meets(near) {
				extents = append(extents, e)
			}
		}
	}
	for _, e := range extents {
		if e.Meets(far) {
			x = x.Union(geo.Extent{MinX: math.Max(e.MinX, far.MinX), MinY: math.Max(e.MinY, far.MinY),
				MaxX: math.Min(e.MaxX, far.MaxX), MaxY: math.Min(e.MaxY, far.MaxY)})
		}
	}
	x = x.Grow(math.Max(4*in.StepM, math.Max(x.MaxX-x.MinX, x.MaxY-x.MinY)/5))
	w, h := x.MaxX-x.MinX, x.MaxY-x.MinY
	for {
		n := math.Ceil(w/g.stepM) * math.Ceil(h/g.stepM)
		if n <= maxCells {
			break
		}
		g.stepM *= math.Max(1.005, math.Sqrt(n/maxCells))
	}
	g.nx, g.ny = int(math.Ceil(w/g.stepM)), int(math.Ceil(h/g.stepM))
	// Centred, so that a quarter turn of the input turns the cells with it.
	c := x.Centre()
	g.min = geo.XY{X: c.X - float64(float64(g.nx)*g.stepM)/2, Y: c.Y - float64(float64(g.ny)*g.stepM)/2}
	g.flags = make([]uint8, g.nx*g.ny)
	g.first = make([]int32, g.nx*g.ny)

	g.add(preferred, in.Preferred)
	g.add(site, in.Site)
	for _, b := range in.Blocked {
		g.add(blocked, b)
	}
	return g
}

// Where a cell's reference position lies in it. It is neither the centre nor anywhere else that edges at
// round coordinates would meet.
const refX, refY = 0.5414213562, 0.4669269147

func (g *ground) ref(cell int) geo.XY {
	return geo.XY{X: g.min.X + float64((float64(cell%g.nx)+refX)*g.stepM), Y: g.min.Y + float64((float64(cell/g.nx)+refY)*g.stepM)}
}

func (g *ground) centre(cell int) geo.XY {
	return geo.XY{X: g.min.X + float64((float64(cell%g.nx)+0.5)*g.stepM), Y: g.min.Y + float64((float64(cell/g.nx)+0.5)*g.stepM)}
}

// col and row give the cell of a coordinate, held to the grid.
func (g *ground) col(x float64) int {
	return int(max(0, min(float64(g.nx-1), math.Floor((x-g.min.X)/g.stepM))))
}

func (g *ground) row(y float64) int {
	return int(max(0, min(float64(g.ny-1), math.Floor((y-g.min.Y)/g.stepM))))
}

func (g *ground) extent() geo.Extent {
	return geo.Extent{MinX: g.min.X, MinY: g.min.Y, MaxX: g.min.X + float64(float64(g.nx)*g.stepM), MaxY: g.min.Y + float64(float64(g.ny)*g.stepM)}
}

func (g *ground) holds(p geo.XY) bool {
	x := g.extent()
	return p.X >= x.MinX && p.X <= x.MaxX && p.Y >= x.MinY && p.Y <= x.MaxY
}

func (g *ground) add(layer uint8, area geo.XYGeometry) {
	all := g.extent().Grow(reachM)
	for _, part := range area.Parts {
		one := geo.XYGeometry{Kind: geo.Polygons, Parts: [][][]geo.XY{part}}
		if x := geo.ExtentOf(one); x.Meets(all) {
			g.addPart(layer, one, x)
		}
	}
}

// addPart adds one part for itself, so that parts may overlap.
func (g *ground) addPart(layer uint8, one geo.XYGeometry, x geo.Extent) {
	type touch struct {
		cell int
		e    edge
		n    int
	}
	var touches []touch
	all := g.extent()
	n := 0
	for _, ring := range one.Parts[0] {
		for i := 1; i < len(ring); i++ {
			n++
			lo, hi := ring[i-1], ring[i]
			if lo.Y > hi.Y {
				lo, hi = hi, lo
			}
			box := geo.EmptyExtent().Add(lo).Add(hi).Grow(reachM)
			if !box.Meets(all) {
				continue
			}
			for r := g.row(box.MinY); r <= g.row(box.MaxY); r++ {
				minX, maxX := box.MinX, box.MaxX
				if lo.Y < hi.Y {
					// The stretch within the row, a little longer at both ends.
					y0 := math.Max(lo.Y, g.min.Y+float64(float64(r)*g.stepM)-reachM)
					y1 := math.Min(hi.Y, g.min.Y+float64(float64(r+1)*g.stepM)+reachM)
					k := (hi.X - lo.X) / (hi.Y - lo.Y)
					x0, x1 := lo.X+float64(k*(y0-lo.Y)), lo.X+float64(k*(y1-lo.Y))
					minX = math.Max(minX, math.Min(x0, x1)-reachM)
					maxX = math.Min(maxX, math.Max(x0, x1)+reachM)
				}
				if maxX < all.MinX || minX > all.MaxX {
					continue
				}
				for c := g.col(minX); c <= g.col(maxX); c++ {
					touches = append(touches, touch{r*g.nx + c, edge{ring[i-1], ring[i]}, n})
				}
			}
		}
	}
	slices.SortFunc(touches, func(a, b touch) int { return cmp.Or(cmp.Compare(a.cell, b.cell), cmp.Compare(a.n, b.n)) })
	edges := make([]edge, len(touches))
	from := len(g.groups)
	for i, t := range touches {
		edges[i] = t.e
		if i > 0 && touches[i-1].cell == t.cell {
			last := &g.groups[len(g.groups)-1]
			last.edges = last.edges[:len(last.edges)+1]
			continue
		}
		g.groups = append(g.groups, group{layer: layer, edges: edges[i : i+1], next: g.first[t.cell]})
		g.first[t.cell] = int32(len(g.groups))
	}
	slicer := measure.NewSlicer(one)
	for r := g.row(x.MinY); r <= g.row(x.MaxY); r++ {
		ref := g.ref(r * g.nx)
		g.spans = slicer.At(ref.Y, g.spans[:0])
		for _, s := range g.spans {
			c0 := math.Max(0, math.Ceil((s.Lo-ref.X)/g.stepM))
			c1 := math.Min(float64(g.nx-1), math.Ceil((s.Hi-ref.X)/g.stepM)-1)
			for c := int(c0); c <= int(c1); c++ {
				cell := r*g.nx + c
				if k := int(g.first[cell]) - 1; k >= from {
					g.groups[k].inside = true
				} else {
					g.flags[cell] |= layer
				}
			}
		}
	}
}

// turn is positive where the way from a over b to c turns left.
func turn(a, b, c geo.XY) float64 {
	return float64((b.X-a.X)*(c.Y-a.Y)) - float64((b.Y-a.Y)*(c.X-a.X))
}

// layersAt gives the layers over a position of a cell that lies on no edge: those over the reference
// position, changed by every edge between the two.
func (g *ground) layersAt(cell int, p geo.XY) uint8 {
	f := g.flags[cell]
	ref := g.ref(cell)
	for k := g.first[cell]; k > 0; k = g.groups[k-1].next {
		o := &g.groups[k-1]
		in := o.inside
		for _, e := range o.edges {
			if (turn(ref, p, e.p) > 0) != (turn(ref, p, e.q) > 0) && (turn(e.p, e.q, ref) > 0) != (turn(e.p, e.q, p) > 0) {
				in = !in
			}
		}
		if in {
			f |= o.layer
		}
	}
	return f
}

// layers is layersAt for any position of a way whose left has the direction n. On an edge the better side
// counts: a way may follow the edge of a lake or of buildable ground, but not the seam of two lakes.
func (g *ground) layers(cell int, p, n geo.XY) uint8 {
	for k := g.first[cell]; k > 0; k = g.groups[k-1].next {
		for _, e := range g.groups[k-1].edges {
			if !e.near(p) {
				continue
			}
			d := geo.XY{X: float64(2 * edgeM * n.X), Y: float64(2 * edgeM * n.Y)}
			l := g.layersAt(cell, geo.XY{X: p.X + d.X, Y: p.Y + d.Y})
			r := g.layersAt(cell, p.Sub(d))
			return (l|r)&^blocked | l&r&blocked
		}
	}
	return g.layersAt(cell, p)
}

// near reports whether p lies on the edge within edgeM. Most edges are refused by their line or box.
func (e edge) near(p geo.XY) bool {
	d, far := e.q.Sub(e.p), turn(e.p, e.q, p)
	if float64(far*far) > 1.01*edgeM*edgeM*(float64(d.X*d.X)+float64(d.Y*d.Y)) {
		return false
	}
	return p.X >= min(e.p.X, e.q.X)-edgeM && p.X <= max(e.p.X, e.q.X)+edgeM &&
		p.Y >= min(e.p.Y, e.q.Y)-edgeM && p.Y <= max(e.p.Y, e.q.Y)+edgeM && measure.PointToSegmentM(p, e.p, e.q) <= edgeM
}

// walk calls f for the cells that the segment from a to b runs through, in order, each with the stretch
// t0..t1 of the segment, until f says no. It is the traversal of Amanatides, Woo 1987 (Eurographics).
func (g *ground) walk(a, b geo.XY, f func(cell int, t0, t1 float64) bool) {
	c, r := g.col(a.X), g.row(a.Y)
	leftX, leftY := g.col(b.X)-c, g.row(b.Y)-r
	d := b.Sub(a)
	stepX, sideX, stepY, sideY := 1, 1, 1, 1
	if leftX < 0 {
		leftX, stepX, sideX = -leftX, -1, 0
	}
	if leftY < 0 {
		leftY, stepY, sideY = -leftY, -1, 0
	}
	t0 := 0.0
	for {
		tx, ty := math.Inf(1), math.Inf(1)
		if leftX > 0 {
			tx = (g.min.X + float64(float64(c+sideX)*g.stepM) - a.X) / d.X
		}
		if leftY > 0 {
			ty = (g.min.Y + float64(float64(r+sideY)*g.stepM) - a.Y) / d.Y
		}
		t1 := max(t0, min(1, tx, ty))
		if !f(r*g.nx+c, t0, t1) || leftX+leftY == 0 {
			return
		}
		if tx < ty {
			c += stepX
			leftX--
		} else {
			r += stepY
			leftY--
		}
		t0 = t1
	}
}

// along gives what the segment from a to b costs and how much of it lies outside Preferred, both in metres;
// +Inf when it crosses blocked ground or costs more than limit.
func (g *ground) along(a, b geo.XY, limit float64) (cost, offM float64) {
	l := a.Dist(b)
	if float64(g.least*l) > limit {
		return math.Inf(1), 0
	}
	if l == 0 {
		if g.layers(g.cell(a), a, geo.XY{X: 1})&blocked != 0 {
			return math.Inf(1), 0
		}
		return 0, 0
	}
	n := geo.XY{X: (a.Y - b.Y) / l, Y: (b.X - a.X) / l}
	count := func(layers uint8, m float64) {
		switch c := g.cost[layers]; {
		case m <= 0:
			return
		case !math.IsInf(c, 0):
			cost += float64(m * c)
		case m > blockedM:
			cost = math.Inf(1)
		default:
			cost += float64(m * g.least)
		}
		if layers&preferred == 0 {
			offM += m
		}
	}
	g.walk(a, b, func(cell int, t0, t1 float64) bool {
		if g.first[cell] == 0 {
			count(g.flags[cell], float64((t1-t0)*l))
			return cost <= limit
		}
		g.breaks = g.breaks[:0]
		for k := g.first[cell]; k > 0; k = g.groups[k-1].next {
			for _, e := range g.groups[k-1].edges {
				// Where the lines of the two meet; one that misses the edge itself only splits more.
				u, v := turn(e.p, e.q, a), turn(e.p, e.q, b)
				if u != v {
					if t := u / (u - v); t > t0 && t < t1 {
						g.breaks = append(g.breaks, t)
					}
				}
			}
		}
		g.breaks = append(g.breaks, t1)
		slices.Sort(g.breaks)
		for _, t := range g.breaks {
			if t > t0 {
				m := t0 + (t-t0)/2
				p := geo.XY{X: a.X + float64(m*(b.X-a.X)), Y: a.Y + float64(m*(b.Y-a.Y))}
				count(g.layers(cell, p, n), float64((t-t0)*l))
				t0 = t
			}
		}
		return cost <= limit
	})
	if cost > limit {
		return math.Inf(1), 0
	}
	return cost, offM
}

// cell gives the cell of a position.
func (g *ground) cell(p geo.XY) int { return g.row(p.Y)*g.nx + g.col(p.X) }
