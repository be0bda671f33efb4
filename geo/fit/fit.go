package fit

import (
	"fmt"
	"math"
	"slices"

	"groundtally/geo"
	"groundtally/geo/measure"
)

// Gain judges layouts; more is better. Add, Move give the change of Total, so that a judge can work it out
// from the machines near the change:
//
//	Add(at, p)     = Total(at with p) − Total(at)
//	Move(at, i, p) = Total(at with p in place of at[i]) − Total(at)
//
// No method may keep or alter the slice.
type Gain interface {
	Total(at []geo.XY) float64
	Add(at []geo.XY, p geo.XY) float64
	Move(at []geo.XY, i int, p geo.XY) float64
}

// Input is what Machines needs.
type Input struct {
	Buildable geo.XYGeometry // polygons; machines may stand on their edges
	Spacing   Spacing
	Max       int  // most machines wanted; 0 for as many as fit
	Gain      Gain // nil for most machines
}

// Result is a layout.
type Result struct {
	At        []geo.XY
	How       string  // what found it: see the constants
	MinMetric float64 // least m(p, q) of all pairs; 0 with fewer than two machines
	Total     float64 // of the Gain; 0 without one
	Judged    int     // layouts that the Gain judged in full
	Bound     int     // machines that no layout in the area exceeds, nor Max
	BoundBy   string  // what shows it: see the constants; empty without an area
	Tried     []Attempt
}

// Attempt is what one producer of layouts found.
//
// As long as Max is no limit or not reached: its best layout in each cluster, put together, before machines
// move. A producer that was not tried in a cluster or found nothing there adds nothing, so that with several
// clusters fewer machines need not mean a worse producer. When more machines fit than Max: the thinned layout
// under the name of what found it and the greedy one, after machines moved.
type Attempt struct {
	How      string
	Machines int
	Total    float64 // of the Gain; 0 without one
}

// What found a layout. In a buildable area of several clusters it is what found most of the machines.
const (
	BySquareLattice    = "square lattice"
	ByHexagonalLattice = "hexagonal lattice"
	BySweep            = "sweep"  // greedy from one side
	BySearch           = "search" // all subsets of candidate positions
	ByBoundary         = "walk along the boundary"
	ByGreedy           = "greedy by energy"
)

// producers is the order in which they are tried.
var producers = []string{BySquareLattice, ByHexagonalLattice, BySweep, BySearch, ByBoundary, ByGreedy}

const (
	toleranceM   = 1e-6  // positions this far outside count as on the edge
	maxMachines  = 20000 // an area for more is refused
	maxJudged    = 24    // tied lattices that the Gain judges
	maxPoints    = 3000  // candidate positions
	searchPoints = 120   // of which the search of subsets takes
	searchNodes  = 200000
	searchUpTo   = 6 // machines up to which the search is tried
)

// Machines places machines by the ellipse rule. More machines win over fewer, then more Gain, then what
// was found first.
//
// Parts of the buildable area further apart than the spacing are clusters, treated one after the other.
// In each, with the ellipse stretched to a circle:
//
//  1. Square and hexagonal lattices, turned in steps of 5 degrees (0 to 85, 0 to 55), on 8 by 8 offsets.
//  2. Into the gaps of the best lattice, further machines at candidate positions: interior points, corners,
//     points on edges, a grid.
//  3. The same candidates filled greedily from 16 sides.
//  4. With 6 machines or fewer, a search for one more among at most 120 candidates; it is exhaustive for a
//     handful of machines and gives up after 200,000 steps. It is left out where the bound says that no
//     more fit.
//  5. With 300 machines or fewer, walks along the boundary (the idea: Stanley, Ning 2019, Wind Energy
//     Science 4): once around every ring, from 16 starting points both ways, a machine wherever the distance
//     allows, then candidates from four sides or the nodes of the best lattice inside.
//  6. With a Gain and 12 machines or fewer, a greedy choice among at most 300 candidates: always the one that
//     the Gain wants most. A layout of 5 or 6 must beat the earlier ones after machines moved, too.
//
// With a Gain up to 24 tied lattices and 8 walks are judged, and at the end machines move, as long as the
// Gain rises, by an eighth to a thirty-second of the spacing. With Max fewer machines than would fit, the
// spacing is stretched as far as still holds Max, then surplus machines go: the one whose loss costs the
// Gain least, without a Gain the most crowded one. With Max of 30 or fewer the greedy choice over all
// clusters stops at Max and wins where its Gain is higher.
//
// Lattices with unequal spacing or shear, random searches are not tried. The result is a good layout, not a
// proven best; Bound says how many more machines there might be.
func Machines(in Input) (Result, error) {
	if err := in.Spacing.check(); err != nil {
		return Result{}, err
	}
	if in.Max < 0 {
		return Result{}, fmt.Errorf("at most %d machines: want 0 or more", in.Max)
	}
	if in.Buildable.Empty() {
		return Result{}, nil
	}
	if in.Buildable.Kind != geo.Polygons {
		return Result{}, fmt.Errorf("the buildable area is a %v, want polygons", in.Buildable.Kind)
	}
	finite := true
	in.Buildable.Each(func(p geo.XY) { finite = finite && p.Finite() })
	if !finite {
		return Result{}, fmt.Errorf("the buildable area has a position that is not finite")
	}
	x := geo.ExtentOf(in.Buildable)
	if n := (x.MaxX - x.MinX + 1) * (x.MaxY - x.MinY + 1) / (in.Spacing.AlongM * in.Spacing.AcrossM); n > 100*maxMachines ||
		measure.AreaM2(in.Buildable)/(in.Spacing.AlongM*in.Spacing.AcrossM) > maxMachines {
		return Result{}, fmt.Errorf("the spacing %v m by %v m is too small for so large an area", in.Spacing.AlongM, in.Spacing.AcrossM)
	}
	job := newJob(in, 1)
	all := job.all()
	at, how, tried := all.at, all.how, all.tried
	if in.Max > 0 && len(at) > in.Max {
		at, how, tried = job.fewer(all)
	} else if in.Gain != nil {
		at, how = job.moved(all)
	}
	out := Result{How: how, Tried: tried, Bound: all.bound, BoundBy: all.boundBy}
	if in.Max > 0 && in.Max < out.Bound {
		out.Bound, out.BoundBy = in.Max, BoundByMax
	}
	out.Judged = job.judged
	f := job.f
	for _, u := range at {
		out.At = append(out.At, f.metres(u))
	}
	for i := range at {
		for j := range i {
			if m := metric(at[i], at[j]); out.MinMetric == 0 || m < out.MinMetric {
				out.MinMetric = m
			}
		}
	}
	if in.Gain != nil {
		out.Total = in.Gain.Total(out.At)
		if math.IsNaN(out.Total) {
			return Result{}, fmt.Errorf("the gain of the layout is not a number")
		}
	}
	return out, nil
}

// job is one placing in the stretched plane.
type job struct {
	in     Input
	f      frame
	parts  [][][]geo.XY // of the buildable area, stretched
	tol    float64
	judged int

	counts  bool // only whether Max machines fit is asked for
	mayWalk bool // for that, along the boundary too
}

// newJob stretches the plane; scale over 1 asks for more distance than the rule.
func newJob(in Input, scale float64) *job {
	j := &job{in: in, f: in.Spacing.frame()}
	j.f.o = geo.ExtentOf(in.Buildable).Centre()
	j.f.a *= scale
	j.f.b *= scale
	j.parts = geo.Map(in.Buildable, j.f.unit).Parts
	j.tol = toleranceM / math.Max(j.f.a, j.f.b)
	return j
}

func polygons(parts [][][]geo.XY) geo.XYGeometry {
	return geo.XYGeometry{Kind: geo.Polygons, Parts: parts}
}

func (j *job) metres(at []geo.XY) []geo.XY {
	out := make([]geo.XY, len(at))
	for i, u := range at {
		out[i] = j.f.metres(u)
	}
	return out
}

// total gives the Gain of a layout; not a number counts as the worst.
func (j *job) total(at []geo.XY) float64 {
	j.judged++
	t := j.in.Gain.Total(j.metres(at))
	if math.IsNaN(t) {
		return math.Inf(-1)
	}
	return t
}

// layout is what filling all clusters gave.
type layout struct {
	at      []geo.XY
	how     string
	tried   []Attempt
	bound   int
	boundBy string
	points  []geo.XY // candidates

	early    []geo.XY // best layout before walks and the greedy by energy
	earlyHow string
}

// all fills every cluster. Machines of earlier clusters count in the Gain of later ones.
func (j *job) all() (out layout) {
	machines, early, bounded := map[string]int{}, map[string]int{}, map[string]int{}
	tried := map[string][]geo.XY{}
	for _, parts := range clusters(j.parts) {
		c := newCluster(j, parts, out.at)
		f := c.best()
		out.at = append(out.at, f.at...)
		out.points = append(out.points, c.points...)
		machines[f.how] += len(f.at)
		out.early = append(out.early, f.early...)
		early[f.earlyHow] += len(f.early)
		out.bound += f.bound
		bounded[f.boundBy] += f.bound
		for by, at := range f.tried {
			tried[by] = append(tried[by], at...)
		}
	}
	out.how = most(producers, machines)
	out.earlyHow = most(producers, early)
	out.boundBy = most(bounds, bounded)
	if j.counts {
		return out
	}
	for _, by := range producers {
		at := tried[by]
		if len(at) == 0 {
			continue
		}
		a := Attempt{How: by, Machines: len(at)}
		if j.in.Gain != nil {
			a.Total = j.total(at)
		}
		out.tried = append(out.tried, a)
	}
	return out
}

// most gives the first name with the highest count; none when all are 0.
func most(names []string, counts map[string]int) (name string) {
	n := 0
	for _, by := range names {
		if counts[by] > n {
			name, n = by, counts[by]
		}
	}
	return name
}

// moved refines a layout. A walk or a greedy choice may be ahead of what was found before them only until
// machines move; the earlier layout stays when it is as good then.
func (j *job) moved(all layout) (at []geo.XY, how string) {
	at = j.refine(all.at)
	if len(all.early) < len(at) || slices.Equal(all.early, all.at) {
		return at, all.how
	}
	old := j.refine(all.early)
	if t := j.total(old); j.total(at) > t+1e-9*math.Abs(t) {
		return at, all.how
	}
	return old, all.earlyHow
}

// fewer makes a layout of Max machines where more fit.
func (j *job) fewer(all layout) (at []geo.XY, how string, tried []Attempt) {
	if j.in.Gain == nil {
		at, how = j.spread(all.at, all.how)
		return at, how, []Attempt{{How: how, Machines: len(at)}}
	}
	at, how = all.at, all.how
	if len(all.early) >= j.in.Max {
		at, how = all.early, all.earlyHow
	}
	if len(at) > j.in.Max {
		at, how = j.spread(at, how)
	}
	at = j.refine(at)
	total := j.total(at)
	tried = []Attempt{{How: how, Machines: len(at), Total: total}}
	if j.in.Max > greedyUpTo {
		return at, how, tried
	}
	got := j.refine(j.greedy(all.points, nil, j.in.Max))
	t := j.total(got)
	better := len(got) == len(at) && t > total+1e-9*math.Abs(total)
	if other := (Attempt{How: ByGreedy, Machines: len(got), Total: t}); how != ByGreedy {
		tried = append(tried, other)
	} else if better {
		tried[0] = other
	}
	if better {
		at, how = got, ByGreedy
	}
	return at, how, tried
}

// clusters groups parts whose boxes are less than the spacing apart, in the order of their first part.
func clusters(parts [][][]geo.XY) [][][][]geo.XY {
	n := len(parts)
	boxes := make([]geo.Extent, n)
	for i, part := range parts {
		boxes[i] = geo.ExtentOf(polygons([][][]geo.XY{part}))
	}
	group := make([]int, n)
	for i := range group {
		group[i] = -1
	}
	var out [][][][]geo.XY
	for i := range parts {
		if group[i] >= 0 {
			continue
		}
		id := len(out)
		out = append(out, nil)
		group[i] = id
		todo := []int{i}
		for len(todo) > 0 {
			k := todo[len(todo)-1]
			todo = todo[:len(todo)-1]
			for l := range parts {
				dx := math.Max(0, math.Max(boxes[l].MinX-boxes[k].MaxX, boxes[k].MinX-boxes[l].MaxX))
				dy := math.Max(0, math.Max(boxes[l].MinY-boxes[k].MaxY, boxes[k].MinY-boxes[l].MaxY))
				if group[l] < 0 && float64(dx*dx)+float64(dy*dy) < 1 {
					group[l] = id
					todo = append(todo, l)
				}
			}
		}
		for l := range parts {
			if group[l] == id {
				out[id] = append(out[id], parts[l])
			}
		}
	}
	return out
}

// spread thins a layout of more machines than wanted.
func (j *job) spread(at []geo.XY, how string) ([]geo.XY, string) {
	lo, hi := 1.0, 1.5*math.Sqrt(float64(len(at))/float64(j.in.Max))
	wide := j.in
	wide.Gain = nil
	for range 8 {
		mid := (lo + hi) / 2
		k := newJob(wide, mid)
		// With a Gain the greedy choice by energy does more for few machines than walks.
		k.counts, k.mayWalk = true, j.in.Gain == nil
		room := 0
		for _, parts := range clusters(k.parts) {
			room += k.quickBound(parts)
		}
		if room < j.in.Max { // saves the search for what cannot be
			hi = mid
			continue
		}
		wider := k.all()
		got := wider.at
		if len(got) < j.in.Max {
			hi = mid
			continue
		}
		lo, how = mid, wider.how
		at = at[:0:0]
		for _, u := range got {
			at = append(at, j.f.unit(k.f.metres(u)))
		}
	}
	for len(at) > j.in.Max {
		worst := 0
		if j.in.Gain != nil {
			best := math.Inf(-1)
			for i := range at {
				if t := j.total(without(at, i)); t > best {
					best, worst = t, i
				}
			}
		} else {
			least := math.Inf(1)
			for i := range at {
				near := math.Inf(1)
				for k := range at {
					if k != i {
						near = math.Min(near, metric(at[i], at[k]))
					}
				}
				if near < least*(1-1e-9) {
					least, worst = near, i
				}
			}
		}
		at = without(at, worst)
	}
	return at, how
}

func without(at []geo.XY, i int) []geo.XY {
	return slices.Delete(slices.Clone(at), i, i+1)
}

// refine moves single machines while the Gain rises.
func (j *job) refine(at []geo.XY) []geo.XY {
	at = slices.Clone(at)
	area := measure.NewSlicer(polygons(j.parts))
	var buf []measure.Span
	step := 1.0 / 8
	for range 6 {
		moved := false
		for i := range at {
			now := j.metres(at)
			best, to := 0.0, at[i]
			for k := range 8 {
				sin, cos := math.Sincos(float64(k) * math.Pi / 4)
				p := geo.XY{X: at[i].X + step*sin, Y: at[i].Y + step*cos}
				if !free(p, at, i) || !on(area, p, j.tol, &buf) {
					continue
				}
				if d := j.in.Gain.Move(now, i, j.f.metres(p)); d > best+1e-12 {
					best, to = d, p
				}
			}
			if to != at[i] {
				at[i], moved = to, true
			}
		}
		if !moved {
			if step /= 2; step < 1.0/32 {
				break
			}
		}
	}
	return at
}

// free reports whether p keeps its distance from all of at but number i.
func free(p geo.XY, at []geo.XY, i int) bool {
	for k, q := range at {
		if k != i && !apart(p, q) {
			return false
		}
	}
	return true
}

// on reports whether p lies in the area or within tol of its edge.
func on(area *measure.Slicer, p geo.XY, tol float64, buf *[]measure.Span) bool {
	*buf = area.Closed(p.Y, tol, (*buf)[:0])
	for _, s := range *buf {
		if p.X >= s.Lo && p.X <= s.Hi {
			return true
		}
	}
	return false
}
