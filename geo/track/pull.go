package track

import (
	"math"
	"slices"

	"groundtally/geo"
	"groundtally/geo/measure"
)

const (
	span   = 64   // positions of a way over cells that one straight piece may skip at a time
	rounds = 12   // of moving bends
	worth  = 1e-6 // share of the cost that a moved bend must save
	alike  = 1e-12
)

// pull straightens a way that begins on the tree and gives what it then costs.
func (s *search) pull(line []geo.XY) ([]geo.XY, float64) {
	line = s.shortcut(line)
	for n := 0; n < 3; n++ {
		before := len(line)
		s.tighten(line)
		if line = s.shortcut(line); len(line) == before {
			break
		}
	}
	cost := 0.0
	for k := 1; k < len(line); k++ {
		c, _ := s.along(line[k-1], line[k], math.Inf(1))
		cost += c
	}
	return line, cost
}

// shortcut leaves out positions so that what is left, joined by straight pieces, is cheapest; of equally
// cheap ways the one with the longest pieces.
func (s *search) shortcut(line []geo.XY) []geo.XY {
	for {
		n := len(line)
		cost := make([]float64, n)
		from := make([]int, n)
		for j := 1; j < n; j++ {
			c, _ := s.along(line[j-1], line[j], math.Inf(1))
			cost[j], from[j] = cost[j-1]+c, j-1
			for i := max(0, j-span); i < j-1; i++ {
				most := float64(cost[j] * (1 - alike))
				if from[j] == j-1 { // the longest of equally cheap pieces is the first to come here
					most = float64(cost[j] * (1 + alike))
				}
				if c, _ := s.along(line[i], line[j], most-cost[i]); cost[i]+c <= most {
					cost[j], from[j] = cost[i]+c, i
				}
			}
		}
		var out []geo.XY
		for j := n - 1; j > 0; j = from[j] {
			out = append(out, line[j])
		}
		out = append(out, line[0])
		slices.Reverse(out)
		if len(out) == n {
			return out
		}
		line = out
	}
}

// tighten moves the bends of a way, and where it begins on the tree, as long as that makes it cheaper.
func (s *search) tighten(line []geo.XY) {
	// A bend that found nothing better finds nothing before a neighbour moves.
	still := make([][3]geo.XY, len(line))
	for range rounds {
		moved := false
		if len(line) > 2 {
			if p, ok := s.nearest(line[1]); ok && p != line[0] {
				now, _ := s.along(line[0], line[1], math.Inf(1))
				if c, _ := s.along(p, line[1], now); c < now*(1-worth) {
					line[0], moved = p, true
				}
			}
		}
		for i := 1; i+1 < len(line); i++ {
			if still[i] == [3]geo.XY{line[i-1], line[i], line[i+1]} {
				continue
			}
			if s.bend(line[i-1], &line[i], line[i+1]) {
				moved = true
			} else {
				still[i] = [3]geo.XY{line[i-1], line[i], line[i+1]}
			}
		}
		if !moved {
			return
		}
	}
}

// bend moves the bend v between a and b. Along its two legs it slides round corners, towards the line from
// a to b it leaves useless detours, in the eight directions it finds where costly ground begins.
func (s *search) bend(a geo.XY, v *geo.XY, b geo.XY) (moved bool) {
	c1, _ := s.along(a, *v, math.Inf(1))
	c2, _ := s.along(*v, b, math.Inf(1))
	now := c1 + c2
	try := func(p geo.XY) bool {
		if !s.holds(p) || p == *v {
			return false
		}
		want := float64(now * (1 - worth))
		if float64(s.least*(a.Dist(p)+p.Dist(b))) >= want {
			return false
		}
		c1, _ := s.along(a, p, want)
		if c1 >= want {
			return false
		}
		c2, _ := s.along(p, b, want-c1)
		if c1+c2 >= want {
			return false
		}
		*v, now, moved = p, c1+c2, true
		return true
	}
	for t := 1.0; t > 0.01; t /= 2 {
		for _, to := range []geo.XY{measure.NearestOnSegment(*v, a, b), a, b} {
			if try(geo.XY{X: v.X + float64(t*(to.X-v.X)), Y: v.Y + float64(t*(to.Y-v.Y))}) {
				break
			}
		}
	}
	for r := s.stepM / 2; r > s.stepM/100; r /= 2 {
		for k := range 8 {
			d := eight[k]
			if try(geo.XY{X: v.X + float64(r*d.X), Y: v.Y + float64(r*d.Y)}) {
				break
			}
		}
	}
	return moved
}

var eight = [8]geo.XY{{X: 1}, {Y: 1}, {X: -1}, {Y: -1},
	{X: math.Sqrt2 / 2, Y: math.Sqrt2 / 2}, {X: -math.Sqrt2 / 2, Y: math.Sqrt2 / 2},
	{X: -math.Sqrt2 / 2, Y: -math.Sqrt2 / 2}, {X: math.Sqrt2 / 2, Y: -math.Sqrt2 / 2}}

// nearest gives the position of the tree nearest to p; false when ways begin at terminals alone.
func (s *search) nearest(p geo.XY) (at geo.XY, ok bool) {
	best := math.Inf(1)
	for _, e := range s.laid {
		q := measure.NearestOnSegment(p, e.p, e.q)
		if d := p.Dist(q); d < best {
			at, best, ok = q, d, true
		}
	}
	return s.snap(at), ok
}

// snap gives the terminal of the tree that p lies at in spite of rounding, else p.
func (s *search) snap(p geo.XY) geo.XY {
	for i, q := range s.at {
		if s.reached[i] && p.Dist(q) < sameM {
			return q
		}
	}
	return p
}

// cut lets a way begin where it last meets the tree.
func (s *search) cut(line []geo.XY) []geo.XY {
	for k := len(line) - 2; k >= 0; k-- {
		a, b := line[k], line[k+1]
		last := -1.0
		var at geo.XY
		for _, e := range s.laid {
			ta, tb, tp, tq := turn(e.p, e.q, a), turn(e.p, e.q, b), turn(a, b, e.p), turn(a, b, e.q)
			if (ta > 0) == (tb > 0) || (tp > 0) == (tq > 0) {
				continue
			}
			if t := ta / (ta - tb); t > last {
				last = t
				u := tp / (tp - tq)
				at = geo.XY{X: e.p.X + float64(u*(e.q.X-e.p.X)), Y: e.p.Y + float64(u*(e.q.Y-e.p.Y))}
			}
		}
		if last >= 0 {
			if c, _ := s.along(at, b, math.Inf(1)); !math.IsInf(c, 0) {
				return append([]geo.XY{s.snap(at)}, line[k+1:]...)
			}
		}
	}
	return line
}
