package track

import (
	"math"
	"slices"

	"groundtally/geo"
	"groundtally/geo/measure"
)

const (
	// Eight neighbours make a way longer than straight by 1/cos 22.5° at most.
	eightWays = 1.0823922
	// Cells around a terminal to which it is tied, on each side.
	tied = 2
	// Ends this near to a terminal are at the terminal.
	sameM = 1e-6
)

// search grows one tree through the terminals at.
type search struct {
	*ground
	at      []geo.XY
	branch  bool // ways may begin on ways, not only at terminals
	reached []bool
	ways    []Way
	costs   []float64
	laid    []edge // all ways so far

	// What a cell's centre costs from the tree so far, what lies before it: a cell, or for −1−i the i-th
	// of begins. Costs only fall as the tree grows, so one search goes on through the whole growth.
	cost    []float64
	before  []int32
	begins  []geo.XY
	todo    heap
	stamped []int32 // number of the way that last looked at the cell

	ties   map[int][]tie // by cell; never gone through in the order of the map
	isTied []bool
	toward []tie      // the cheapest way to each terminal over cells: its last cell
	direct []straight // and in one straight line
	pulled []pulled   // the last way to each terminal over cells that was pulled straight
}

type tie struct {
	to   int // terminal in ties, cell in toward
	cost float64
}

type straight struct {
	from  geo.XY
	cost  float64
	nearM float64 // the terminal's distance from the tree whatever lies between
}

// pulled is what pull made of a way over cells.
type pulled struct {
	raw, line []geo.XY
	cost      float64
}

func newSearch(g *ground, at []geo.XY, start int, branch bool) *search {
	n := g.nx * g.ny
	s := &search{ground: g, at: at, branch: branch, reached: make([]bool, len(at)),
		cost: make([]float64, n), before: make([]int32, n), stamped: make([]int32, n),
		ties: map[int][]tie{}, isTied: make([]bool, n), toward: make([]tie, len(at)), direct: make([]straight, len(at)), pulled: make([]pulled, len(at))}
	for i := range s.cost {
		s.cost[i] = math.Inf(1)
	}
	for i, p := range at {
		s.toward[i].cost = math.Inf(1)
		s.direct[i] = straight{cost: math.Inf(1), nearM: math.Inf(1)}
		if i == start {
			continue
		}
		s.around(p, tied, func(cell int) {
			if c, _ := g.along(g.centre(cell), p, math.Inf(1)); !math.IsInf(c, 0) {
				s.ties[cell] = append(s.ties[cell], tie{i, c})
				s.isTied[cell] = true
			}
		})
	}
	s.join(start)
	return s
}

// around calls f for the cells up to n cells away from p.
func (s *search) around(p geo.XY, n int, f func(cell int)) {
	c, r := s.col(p.X), s.row(p.Y)
	for y := max(0, r-n); y <= min(s.ny-1, r+n); y++ {
		for x := max(0, c-n); x <= min(s.nx-1, c+n); x++ {
			f(y*s.nx + x)
		}
	}
}

func (s *search) run() {
	for {
		i, line := s.next()
		if i < 0 {
			return
		}
		s.lay(i, s.cut(line))
	}
}

// lead joins terminal i out of turn.
func (s *search) lead(i int) {
	s.spread(s.direct[i].cost*eightWays, i)
	if line, c := s.way(i); !math.IsInf(c, 0) {
		s.lay(i, s.cut(line))
	}
}

func (s *search) costM() float64 {
	sum := 0.0
	for _, c := range s.costs {
		sum += c
	}
	return sum
}

// join makes a terminal part of the tree.
func (s *search) join(i int) {
	s.reached[i] = true
	p := s.at[i]
	s.around(p, tied, func(cell int) { s.begin(cell, p) })
	for k := range s.at {
		s.aim(k, p)
	}
}

// begin lets ways to a cell begin at p of the tree.
func (s *search) begin(cell int, p geo.XY) {
	c, _ := s.along(p, s.centre(cell), s.cost[cell])
	if c < s.cost[cell] {
		s.begins = append(s.begins, p)
		s.enter(cell, c, int32(-len(s.begins)))
	}
}

func (s *search) enter(cell int, cost float64, before int32) {
	s.cost[cell], s.before[cell] = cost, before
	s.todo.push(entry{cost, int32(cell)})
}

// aim tries the straight line from p of the tree to a terminal.
func (s *search) aim(k int, p geo.XY) {
	if s.reached[k] {
		return
	}
	d := &s.direct[k]
	d.nearM = math.Min(d.nearM, p.Dist(s.at[k]))
	if c, _ := s.along(p, s.at[k], d.cost); c < d.cost {
		d.from, d.cost = p, c
	}
}

// lay adds a way to the tree.
func (s *search) lay(i int, line []geo.XY) {
	w := Way{From: Junction, To: i, Line: line}
	for k, p := range s.at {
		if s.reached[k] && p == line[0] {
			w.From = k
			break
		}
	}
	cost := 0.0
	for k := 1; k < len(line); k++ {
		c, off := s.along(line[k-1], line[k], math.Inf(1))
		cost += c
		w.LengthM += line[k-1].Dist(line[k])
		w.OffGroundM += off
	}
	s.ways = append(s.ways, w)
	s.costs = append(s.costs, cost)
	s.join(i)
	if !s.branch {
		return
	}
	one := geo.XYGeometry{Kind: geo.Lines, Parts: [][][]geo.XY{{line}}}
	for k := 1; k < len(line); k++ {
		s.laid = append(s.laid, edge{line[k-1], line[k]})
		s.walk(line[k-1], line[k], func(cell int, _, _ float64) bool {
			s.around(s.ground.centre(cell), 1, func(cell int) {
				if s.stamped[cell] != int32(len(s.ways)) {
					s.stamped[cell] = int32(len(s.ways))
					p, _ := measure.NearestOnOutline(s.centre(cell), one)
					s.begin(cell, p)
				}
			})
			return true
		})
	}
	for k, p := range s.at {
		if !s.reached[k] {
			q, _ := measure.NearestOnOutline(p, one)
			s.aim(k, q)
		}
	}
}

// next gives the terminal that is cheapest to reach and the way to it; −1 when there is none.
func (s *search) next() (int, []geo.XY) {
	first, nearM := -1, math.Inf(1)
	for i, d := range s.direct {
		if s.reached[i] {
			continue
		}
		nearM = math.Min(nearM, d.nearM)
		if first < 0 || d.cost < s.direct[first].cost {
			first = i
		}
	}
	if first < 0 {
		return -1, nil
	}
	if c := s.direct[first].cost; c <= float64(s.least*nearM)*(1+1e-12) {
		return first, []geo.XY{s.direct[first].from, s.at[first]}
	}
	s.spread(s.direct[first].cost*eightWays, -1)
	over := -1
	for i, t := range s.toward {
		if !s.reached[i] && !math.IsInf(t.cost, 0) && (over < 0 || t.cost < s.toward[over].cost) {
			over = i
		}
	}
	best, line, least := -1, []geo.XY(nil), math.Inf(1)
	for _, i := range []int{first, over} {
		if i < 0 || i == best {
			continue
		}
		if l, c := s.way(i); c < least {
			best, line, least = i, l, c
		}
	}
	return best, line
}

// spread searches cells until no terminal, or not the only one asked for, can be cheaper than the best found
// or than limit.
func (s *search) spread(limit float64, only int) {
	asked := func(i int) bool { return only < 0 || i == only }
	for i, t := range s.toward {
		if !s.reached[i] && asked(i) {
			limit = math.Min(limit, t.cost)
		}
	}
	for len(s.todo) > 0 && s.todo[0].cost < limit {
		e := s.todo.pop()
		cell := int(e.cell)
		if e.cost > s.cost[cell] {
			continue
		}
		if s.isTied[cell] {
			for _, t := range s.ties[cell] {
				if c := e.cost + t.cost; c < s.toward[t.to].cost && !s.reached[t.to] {
					s.toward[t.to] = tie{cell, c}
					if asked(t.to) {
						limit = math.Min(limit, c)
					}
				}
			}
		}
		s.relax(cell)
	}
}

func (s *search) relax(cell int) {
	c, r := cell%s.nx, cell/s.nx
	here := s.ground.cost[s.flags[cell]]
	for dy := -1; dy <= 1; dy++ {
		for dx := -1; dx <= 1; dx++ {
			if (dx == 0 && dy == 0) || c+dx < 0 || c+dx >= s.nx || r+dy < 0 || r+dy >= s.ny {
				continue
			}
			to := cell + dy*s.nx + dx
			spare := s.cost[to] - s.cost[cell]
			m := s.stepM
			if dx != 0 && dy != 0 {
				m *= math.Sqrt2
			}
			if float64(m*s.least) >= spare {
				continue
			}
			var more float64
			if s.first[cell] == 0 && s.first[to] == 0 {
				// Half of the step lies in each of the two.
				more = float64(m * (here + s.ground.cost[s.flags[to]]) / 2)
			} else {
				more, _ = s.along(s.centre(cell), s.centre(to), spare)
			}
			// The sums are compared, not more with spare: rounding would enter equal ones over and over.
			if c := s.cost[cell] + more; c < s.cost[to] {
				s.enter(to, c, int32(cell))
			}
		}
	}
}

// way gives the cheaper of the straight way to a terminal and the one over cells, pulled straight.
func (s *search) way(i int) ([]geo.XY, float64) {
	d := s.direct[i]
	line := []geo.XY{d.from, s.at[i]}
	if t := s.toward[i]; !math.IsInf(t.cost, 0) && t.cost <= d.cost*eightWays {
		// A terminal is looked at again and again until it is its turn.
		u := &s.pulled[i]
		if raw := s.trace(i); !slices.Equal(raw, u.raw) {
			u.raw = raw
			u.line, u.cost = s.pull(raw)
		}
		if u.cost < d.cost {
			return u.line, u.cost
		}
	}
	return line, d.cost
}

// trace gives the way over cells to a terminal.
func (s *search) trace(i int) []geo.XY {
	back := []geo.XY{s.at[i]}
	for cell := int32(s.toward[i].to); ; cell = s.before[cell] {
		if cell < 0 {
			back = append(back, s.begins[-1-cell])
			break
		}
		back = append(back, s.centre(int(cell)))
	}
	line := make([]geo.XY, len(back))
	for k, p := range back {
		line[len(back)-1-k] = p
	}
	return line
}

// straightM gives the length of the shortest straight tree through the terminals reached (Prim 1957, Bell
// System Technical Journal 36).
func (s *search) straightM() float64 {
	near := make([]float64, len(s.at))
	last := -1
	for i := range s.at {
		near[i] = math.Inf(1)
		if last < 0 && s.reached[i] {
			last = i
		}
	}
	done := make([]bool, len(s.at))
	sum := 0.0
	for last >= 0 {
		done[last] = true
		next := -1
		for i, p := range s.at {
			if done[i] || !s.reached[i] {
				continue
			}
			near[i] = math.Min(near[i], p.Dist(s.at[last]))
			if next < 0 || near[i] < near[next] {
				next = i
			}
		}
		if next >= 0 {
			sum += near[next]
		}
		last = next
	}
	return sum
}

// heap keeps the cheapest cell on top, of equal ones the one with the lowest number.
type heap []entry

type entry struct {
	cost float64
	cell int32
}

func (e entry) before(f entry) bool {
	return e.cost < f.cost || (e.cost == f.cost && e.cell < f.cell)
}

func (h *heap) push(e entry) {
	*h = append(*h, e)
	q := *h
	i := len(q) - 1
	for i > 0 {
		up := (i - 1) / 2
		if !e.before(q[up]) {
			break
		}
		q[i] = q[up]
		i = up
	}
	q[i] = e
}

func (h *heap) pop() entry {
	q := *h
	top := q[0]
	e := q[len(q)-1]
	q = q[:len(q)-1]
	*h = q
	i := 0
	for {
		k := 2*i + 1
		if k >= len(q) {
			break
		}
		if k+1 < len(q) && q[k+1].before(q[k]) {
			k++
		}
		if !q[k].before(e) {
			break
		}
		q[i] = q[k]
		i = k
	}
	if len(q) > 0 {
		q[i] = e
	}
	return top
}
