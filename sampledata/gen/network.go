package gen

import (
	"math/rand/v2"

	"groundtally/geo"
)

// network is a set of paths over shared vertices, so that what meets stays together when it is moved.
type network struct {
	pts   []geo.XY
	ids   map[geo.XY]int
	paths [][]int
	tags  []int
	fixed map[int]bool
}

func newNetwork() *network {
	return &network{ids: map[geo.XY]int{}, fixed: map[int]bool{}}
}

func (n *network) vertex(p geo.XY) int {
	if id, ok := n.ids[p]; ok {
		return id
	}
	n.ids[p] = len(n.pts)
	n.pts = append(n.pts, p)
	return len(n.pts) - 1
}

func (n *network) path(ids []int, tag int) {
	n.paths, n.tags = append(n.paths, ids), append(n.tags, tag)
}

// neighbours lists for every vertex those it is joined to, in order of arrival, each once.
func (n *network) neighbours() [][]int {
	out := make([][]int, len(n.pts))
	link := func(a, b int) {
		for _, c := range out[a] {
			if c == b {
				return
			}
		}
		out[a] = append(out[a], b)
	}
	for _, p := range n.paths {
		for i := 1; i < len(p); i++ {
			link(p[i-1], p[i])
			link(p[i], p[i-1])
		}
	}
	return out
}

// relax moves every vertex towards the middle of its neighbours; ends and fixed vertices stay.
func (n *network) relax(times int) {
	next := n.neighbours()
	for range times {
		moved := append([]geo.XY(nil), n.pts...)
		for i, nb := range next {
			if len(nb) < 2 || n.fixed[i] {
				continue
			}
			share := 0.5
			if len(nb) > 2 {
				share = 0.3
			}
			var m geo.XY
			for _, j := range nb {
				m.X += n.pts[j].X / float64(len(nb))
				m.Y += n.pts[j].Y / float64(len(nb))
			}
			moved[i] = along(n.pts[i], m, share)
		}
		n.pts = moved
	}
}

// wiggle moves the vertices at random, so that a path over a grid loses the grid.
func (n *network) wiggle(r *rand.Rand, byM float64) {
	next := n.neighbours()
	for i := range n.pts {
		dx, dy := between(r, -byM, byM), between(r, -byM, byM)
		if len(next[i]) == 2 && !n.fixed[i] {
			n.pts[i] = geo.XY{X: n.pts[i].X + dx, Y: n.pts[i].Y + dy}
		}
	}
}

// lines gives the paths as points, settled to centimetres.
func (n *network) lines() [][]geo.XY {
	out := make([][]geo.XY, len(n.paths))
	for i, p := range n.paths {
		for _, id := range p {
			out[i] = append(out[i], snap(n.pts[id]))
		}
	}
	return out
}

// chains cuts the network at junctions and gives each piece once with the lowest tag of its edges.
// Pieces come in order of the vertices at which they begin.
func (n *network) chains() (ids [][]int, tags []int) {
	next := n.neighbours()
	tag := map[[2]int]int{}
	key := func(a, b int) [2]int { return [2]int{min(a, b), max(a, b)} }
	for k, p := range n.paths {
		for i := 1; i < len(p); i++ {
			e := key(p[i-1], p[i])
			if old, ok := tag[e]; !ok || n.tags[k] < old {
				tag[e] = n.tags[k]
			}
		}
	}
	done := map[[2]int]bool{}
	node := func(v int) bool {
		if len(next[v]) != 2 {
			return true
		}
		return tag[key(v, next[v][0])] != tag[key(v, next[v][1])]
	}
	walk := func(a, b int) {
		c := []int{a, b}
		t := tag[key(a, b)]
		done[key(a, b)] = true
		for !node(b) && b != c[0] {
			to := next[b][0]
			if to == a {
				to = next[b][1]
			}
			a, b = b, to
			done[key(a, b)] = true
			c = append(c, b)
		}
		ids, tags = append(ids, c), append(tags, t)
	}
	for pass := range 2 {
		for v := range n.pts {
			if pass == 0 && !node(v) {
				continue
			}
			for _, w := range next[v] {
				if !done[key(v, w)] {
					walk(v, w)
				}
			}
		}
	}
	return ids, tags
}
