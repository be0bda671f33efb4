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
}

// What found a layout. In a buildable area of several clusters it is what found most of the machines.
const (
	BySquareLattice    = "square lattice"
	ByHexagonalLattice = "hexagonal lattice"
	BySweep            = "sweep"  // greedy from one side
	BySearch           = "search" // all subsets of candidate positions
)

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
//     handful of machines and gives up after 200,000 steps.
//
// With a Gain up to 24 tied lattices are judged, and at the end machines move, as long as the Gain rises,
// by an eighth to a thirty-second of the spacing. With Max fewer machines than would fit, the spacing is
// stretched as far as still holds Max, then surplus machines go: the one whose loss costs the Gain least,
// without a Gain the most crowded one.
//
// Lattices with unequal spacing or shear, walks along the boundary (Stanley, Ning 2019), random searches
// are not tried. The result is a good layout, not a proven best.
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
	at, how := job.all()
	if in.Max > 0 && len(at) > in.Max {
		at, how = job.spread(at, how)
	}
	if in.Gain != nil {
		at = job.refine(at)
	}
	out := Result{How: how, Judged: job.judged}
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

// all fills every cluster. Machines of earlier clusters count in the Gain of later ones.
func (j *job) all() (at []geo.XY, how string) {
	found := map[string]int{}
	for _, parts := range clusters(j.parts) {
		c := newCluster(j, parts, at)
		own, by := c.best()
		at = append(at, own...)
		found[by] += len(own)
	}
	most := 0
	for _, by := range []string{BySquareLattice, ByHexagonalLattice, BySweep, BySearch} {
		if found[by] > most {
			how, most = by, found[by]
		}
	}
	return at, how
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
		got, by := k.all()
		if len(got) < j.in.Max {
			hi = mid
			continue
		}
		lo, how = mid, by
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
