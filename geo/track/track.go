package track

import (
	"cmp"
	"fmt"
	"math"
	"slices"

	"groundtally/geo"
)

// Input is what a tree of tracks needs. Positions are metres of the local frame.
type Input struct {
	Towers      []geo.XY
	Entrance    geo.XY // where the tree begins, such as the nearest position of a road; may lie off the site
	HasEntrance bool   // else the tree begins at a tower

	Preferred geo.XYGeometry   // buildable ground: a metre costs a metre; empty for none
	Site      geo.XYGeometry   // ground where a metre costs OffGround metres; empty for all ground
	Blocked   []geo.XYGeometry // water, buildings: never crossed, though a way may run along an edge

	StepM     float64 // cell of the search grid, 1 m or more, such as 15 to 25; grown when the area is too large
	OffGround float64 // cost of a metre on the site outside Preferred, 1 or more
	OffSite   float64 // cost of a metre outside both, 1 or more
}

// What a way begins at when that is no tower.
const (
	Entrance = -1
	Junction = -2 // on an earlier way, between its ends
)

// Way is one track. Two towers in one place are joined by a way of two equal positions.
type Way struct {
	From       int      // tower, Entrance or Junction
	To         int      // tower
	Line       []geo.XY // two positions or more; ends exactly at the tower, begins exactly at the tower or entrance
	LengthM    float64
	OffGroundM float64 // length outside Preferred
}

// Tree is what Grow found.
type Tree struct {
	Ways       []Way   // in the order in which the tree grows: each begins on what is there
	LengthM    float64 // of all ways
	StraightM  float64 // of the shortest straight tree through the towers reached and the entrance, whatever lies between
	OffGroundM float64 // length of all ways outside Preferred
	CostM      float64 // metres of all ways times the cost of the ground: what Grow keeps small
	StepM      float64 // cell of the grid that was searched; 0 when there was nothing to search
	Unreached  []int   // towers to which no way was found, rising
}

const (
	maxCells  = 250000
	minStepM  = 1.0
	tries     = 24.0    // towers of all trees that begin with another tower than the nearest
	freeCells = 20000.0 // more cells allow fewer tries
	maxM      = 1e8     // further from the origin is no position of a local frame
)

// Grow lays the tree by the shortest path heuristic (Takahashi, Matsuyama 1980, Mathematica Japonica 24):
// the tower that is cheapest to reach from any position of the tree so far is joined next, so that tracks
// branch from tracks. The same is done with branching at towers alone and, for up to two dozen terminals, with some of
// the far ones joined first; the cheapest tree counts, so it is never dearer than what the same search finds between
// towers alone.
//
// Distances come from Dijkstra's method on the eight neighbours of square cells, from all of the tree at
// once, and from straight lines; eight neighbours alone would be up to 8.2 % too long. Ways found on cells are
// then pulled straight as long as that makes them cheaper. The tree is a good one, not a proven best: the
// heuristic may cost up to twice the best tree in theory; a passage much narrower than a cell may be missed;
// junctions are not moved once laid.
//
// The search covers the towers and the entrance; the site, Preferred and what is blocked among the towers as
// far as they lie no further off than the towers are spread; and a fifth more on all sides. A way that runs
// further out is not found. Where the area holds more than 250,000 cells, cells grow.
//
// Preferred counts where it overhangs the site; Blocked counts above all. Parts may touch and overlap, in
// any order. Without an entrance the tree begins at the first tower; when it does not reach all, the largest
// of the trees that can be grown counts and the other towers are unreached. With an entrance that reaches
// nothing all towers are. One tower or none without an entrance gives an empty tree.
//
// Errors: positions that are not finite or beyond 1e8 m, ground that is no polygons, StepM below 1 m,
// costs below 1 or not finite.
func Grow(in Input) (Tree, error) {
	if err := in.check(); err != nil {
		return Tree{}, err
	}
	// The entrance is a terminal like any other, behind the towers.
	at := append([]geo.XY(nil), in.Towers...)
	if in.HasEntrance {
		at = append(at, in.Entrance)
	}
	if len(in.Towers) == 0 || len(at) == 1 {
		return Tree{}, nil
	}
	g := newGround(in, at)
	start, s := len(at)-1, (*search)(nil)
	if in.HasEntrance {
		s = newSearch(g, at, start, true)
		s.run()
	} else {
		start, s = largest(g, at)
	}
	// Ways between terminals cost no less than straight on the best ground.
	if s.costM() > float64(g.least*s.straightM())*(1+1e-12) {
		others := []*search{newSearch(g, at, start, false)}
		for _, i := range leaders(g, at, start) {
			o := newSearch(g, at, start, true)
			o.lead(i)
			others = append(others, o)
		}
		for _, o := range others {
			o.run()
			// A tree that others equal but for rounding stays.
			if len(o.ways) > len(s.ways) || (len(o.ways) == len(s.ways) && o.costM() < s.costM()*(1-1e-9)) {
				s = o
			}
		}
	}
	out := Tree{Ways: s.ways, StraightM: s.straightM(), CostM: s.costM(), StepM: g.stepM}
	for i := range out.Ways {
		w := &out.Ways[i]
		if in.HasEntrance && w.From == len(in.Towers) {
			w.From = Entrance
		}
		out.LengthM += w.LengthM
		out.OffGroundM += w.OffGroundM
	}
	for i := range in.Towers {
		if !s.reached[i] {
			out.Unreached = append(out.Unreached, i)
		}
	}
	return out, nil
}

// leaders gives the towers that are tried as the first, the furthest before others: the fewer towers there
// are, the more a tree depends on its first way and the less another tree takes.
func leaders(g *ground, at []geo.XY, start int) []int {
	var all []int
	for i := range at {
		if i != start {
			all = append(all, i)
		}
	}
	slices.SortStableFunc(all, func(i, k int) int { return cmp.Compare(at[k].Dist(at[start]), at[i].Dist(at[start])) })
	n := tries * min(1, freeCells/float64(g.nx*g.ny)) / float64(len(at))
	return all[:min(len(all), int(n))]
}

// largest gives the tree that reaches the most terminals, the first of equal ones, with where it begins.
func largest(g *ground, at []geo.XY) (int, *search) {
	var best *search
	from := 0
	tried := make([]bool, len(at))
	left := len(at)
	for i := range at {
		if tried[i] {
			continue
		}
		s := newSearch(g, at, i, true)
		s.run()
		for k, r := range s.reached {
			if r && !tried[k] {
				tried[k] = true
				left--
			}
		}
		if best == nil || len(s.ways) > len(best.ways) {
			best, from = s, i
		}
		if left <= len(best.ways)+1 {
			break
		}
	}
	return from, best
}

func (in Input) check() error {
	ok := func(p geo.XY) bool { return p.Finite() && math.Abs(p.X) <= maxM && math.Abs(p.Y) <= maxM }
	for i, p := range in.Towers {
		if !ok(p) {
			return fmt.Errorf("tower %d at %v, %v is no position of the frame", i, p.X, p.Y)
		}
	}
	if in.HasEntrance && !ok(in.Entrance) {
		return fmt.Errorf("the entrance at %v, %v is no position of the frame", in.Entrance.X, in.Entrance.Y)
	}
	ground := func(what string, g geo.XYGeometry) error {
		if g.Empty() {
			return nil
		}
		if g.Kind != geo.Polygons {
			return fmt.Errorf("%s is a %v, want polygons", what, g.Kind)
		}
		fine := true
		g.Each(func(p geo.XY) { fine = fine && ok(p) })
		if !fine {
			return fmt.Errorf("%s has a position that is none of the frame", what)
		}
		return nil
	}
	if err := ground("the preferred ground", in.Preferred); err != nil {
		return err
	}
	if err := ground("the site", in.Site); err != nil {
		return err
	}
	for i, b := range in.Blocked {
		if err := ground(fmt.Sprintf("blocked ground %d", i), b); err != nil {
			return err
		}
	}
	if !(in.StepM >= minStepM) || math.IsInf(in.StepM, 0) {
		return fmt.Errorf("cells of %v m: want %v m or more", in.StepM, minStepM)
	}
	for _, c := range []float64{in.OffGround, in.OffSite} {
		if !(c >= 1) || math.IsInf(c, 0) {
			return fmt.Errorf("a metre of ground costs %v metres: want 1 or more", c)
		}
	}
	return nil
}
