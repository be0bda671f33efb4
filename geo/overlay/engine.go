package overlay

import (
	"errors"
	"fmt"
	"math"
	"runtime"
	"sync/atomic"

	"github.com/twpayne/go-geos"

	"groundtally/geo"
)

// Precision of arcs.
const (
	// SegmentsPerQuadrant is the coarsest division of a quarter circle that an arc may have.
	SegmentsPerQuadrant = 16
	// askedSegments is what the library is asked for. It rounds the number of steps of an arc to the
	// nearest whole number, so that an arc of just under 1.5 steps gets a single one: to have no step
	// longer than 90/16 degrees it must be asked for half as many again.
	askedSegments = SegmentsPerQuadrant * 3 / 2
)

// arcFactor lengthens a radius so that the chords of its arcs lie outside the true circle: 1/cos(π/4q)
// with q = SegmentsPerQuadrant, 1.0012. A setback of 500 m is kept as 500.0 to 500.6 m at straight edges
// and at corners alike.
var arcFactor = 1 / math.Cos(math.Pi/(4*SegmentsPerQuadrant))

// gridsM are the grids, in metres, on which an overlay is tried in turn: floating precision first, which
// is three times as fast as any grid. No position moves by more than 0.71 of the grid.
var gridsM = [...]float64{0, 1e-6, 1e-3, 1e-2}

// finest is the number of the finest grid in gridsM.
const finest = 1

// Errors of an Engine.
var (
	// ErrBusy says that a second goroutine called an Engine in use.
	ErrBusy = errors.New("overlay engine is in use by another goroutine")
	// ErrClosed says that the Engine was closed.
	ErrClosed = errors.New("overlay engine is closed")
	// ErrNotComputed is wrapped when the library could not compute a result in spite of the retries.
	ErrNotComputed = errors.New("the overlay could not be computed")
	// ErrInvalid is wrapped when a polygon crosses itself or is broken otherwise: Repair it first.
	ErrInvalid = errors.New("the polygon is not valid")
)

// Engine computes overlays in one context of the library. Make one for every worker, with New, and let a
// worker use it for a batch of about a thousand sites; it is not for two goroutines at once and says so
// with ErrBusy. Geometry goes in and comes out as geo.XYGeometry in normal form: outer rings
// counter-clockwise, each ring starting at its least position, parts in rising order, so that equal shapes
// are equal values.
type Engine struct {
	ctx     *geos.Context
	busy    atomic.Bool
	closed  bool
	live    []*geos.Geom // of the job in hand, destroyed at its end
	buf     []byte
	retries int
	grid    int // first of gridsM that the job in hand still trusts
	memory  memory
	tally   tally
	large   large
}

// New gives an Engine with a context of its own.
func New() *Engine { return &Engine{ctx: geos.NewContext()} }

// Close destroys what the engine holds and gives the context up; every later call gives ErrClosed. The rest
// of the context's memory is freed by Go's collector.
func (e *Engine) Close() error {
	if !e.busy.CompareAndSwap(false, true) {
		return ErrBusy
	}
	defer e.busy.Store(false)
	e.memory.forget()
	e.large.forget()
	e.closed, e.ctx = true, nil
	return nil
}

// LibraryVersion gives the version of the library for the appendix.
func LibraryVersion() string {
	return fmt.Sprintf("%d.%d.%d", geos.VersionMajor, geos.VersionMinor, geos.VersionPatch)
}

// failure carries an error from inside a job to its border.
type failure struct{ err error }

// do runs a job: it holds the engine, turns every panic into an error, destroys what the job made.
func (e *Engine) do(name string, job func()) (err error) {
	if !e.busy.CompareAndSwap(false, true) {
		return ErrBusy
	}
	defer e.busy.Store(false)
	if e.closed {
		return ErrClosed
	}
	defer func() {
		r := recover()
		for _, g := range e.live {
			g.Destroy()
		}
		clear(e.live)
		e.live = e.live[:0]
		e.grid = 0
		if r == nil {
			return
		}
		if f, ok := r.(failure); ok {
			err = fmt.Errorf("%s: %w", name, f.err)
			return
		}
		// Anything else came from the library or is a fault: the context is not trusted any more.
		e.memory.forget()
		e.large.forget()
		e.ctx = geos.NewContext()
		err = fmt.Errorf("%s: %w: %v", name, ErrNotComputed, r)
	}()
	job()
	return nil
}

func fail(format string, args ...any) { panic(failure{fmt.Errorf(format, args...)}) }

// own registers a geometry for destruction; nil, which is how the library fails, ends the job.
func (e *Engine) own(g *geos.Geom, op string) *geos.Geom {
	if g == nil {
		fail("%s: %w", op, ErrNotComputed)
	}
	e.live = append(e.live, g)
	return g
}

// keep takes a geometry out of what the end of the job destroys: the caller has become its owner.
func (e *Engine) keep(g *geos.Geom) *geos.Geom {
	for i := len(e.live) - 1; i >= 0; i-- { // it is nearly always the last
		if e.live[i] == g {
			e.live = append(e.live[:i], e.live[i+1:]...)
			return g
		}
	}
	panic("overlay: a geometry is kept twice")
}

// try runs an operation of the library that panics on failure and gives nil instead.
func try(f func() *geos.Geom) (g *geos.Geom) {
	defer func() {
		if recover() != nil {
			g = nil
		}
	}()
	return f()
}

// raw takes a geometry into the context as it is.
func (e *Engine) raw(g geo.XYGeometry) *geos.Geom {
	var err error
	if e.buf, err = encode(e.buf[:0], g); err != nil {
		panic(failure{err})
	}
	return e.read(e.buf)
}

// read takes well-known binary into the context.
func (e *Engine) read(wkb []byte) *geos.Geom {
	out, err := e.ctx.NewGeomFromWKB(wkb)
	if err != nil {
		fail("%w: %v", ErrInvalid, err)
	}
	return e.own(out, "read")
}

// load takes a geometry into the context and sees to it that it is valid. Parts that are valid but share
// edges or overlap are joined; a polygon that is broken in itself ends the job with ErrInvalid.
func (e *Engine) load(g geo.XYGeometry) *geos.Geom {
	out := e.raw(g)
	if g.Kind != geo.Polygons || out.IsValid() {
		return out
	}
	if len(g.Parts) > 1 {
		for _, part := range g.Parts {
			p := e.raw(geo.XYGeometry{Kind: g.Kind, Parts: [][][]geo.XY{part}})
			if !p.IsValid() {
				fail("%w: %s", ErrInvalid, p.IsValidReason())
			}
			p.Destroy()
		}
		return e.unary(out)
	}
	fail("%w: %s", ErrInvalid, out.IsValidReason())
	return nil
}

// give takes a result out of the context: its parts of the given kind in normal form.
func (e *Engine) give(g *geos.Geom, kind geo.Kind) geo.XYGeometry {
	return e.giveInto(g, kind, &store{})
}

// giveInto is give with slices of the store.
func (e *Engine) giveInto(g *geos.Geom, kind geo.Kind, st *store) geo.XYGeometry {
	out := geo.XYGeometry{Kind: kind}
	if g.IsEmpty() {
		return out
	}
	if kind == geo.Polygons && g.TypeID() == geos.TypeIDPolygon {
		givePolygon(g, &out, st)
		return normal(out)
	}
	d := decoder{b: g.ToWKB(), store: *st}
	err := d.decode(&out)
	*st = d.store
	if err != nil {
		fail("%w: %v", ErrNotComputed, err)
	}
	if len(out.Parts) == 0 {
		out.Parts = nil
	}
	return normal(out)
}

// givePolygon takes one polygon out ring by ring, which is twice as fast as well-known binary.
func givePolygon(g *geos.Geom, out *geo.XYGeometry, st *store) {
	n := g.NumInteriorRings()
	part := cut(&st.rings, n+1, st.chunk)
	part[0] = giveRing(g.ExteriorRing(), st)
	for i := range n {
		part[i+1] = giveRing(g.InteriorRing(i), st)
	}
	out.Parts = cut(&st.parts, 1, st.chunk)
	out.Parts[0] = part
}

// giveRing takes out a ring, which belongs to its polygon: Destroy only lets go of it.
func giveRing(g *geos.Geom, st *store) []geo.XY {
	defer g.Destroy()
	ps := g.CoordSeq().ToCoords()
	ring := cut(&st.xy, len(ps), st.chunk)
	for i, p := range ps {
		ring[i] = geo.XY{X: p[0], Y: p[1]}
		if !ring[i].Finite() {
			fail("%w: a position is not finite", ErrNotComputed)
		}
	}
	return ring
}

type operation uint8

const (
	difference operation = iota
	intersection
	union
)

func (o operation) String() string { return [...]string{"difference", "intersection", "union"}[o] }

// onGrid computes a with b on a grid of gridM metres; 0 is floating precision. Nil is failure.
func onGrid(op operation, a, b *geos.Geom, gridM float64) *geos.Geom {
	return try(func() *geos.Geom {
		switch {
		case op == difference && gridM == 0:
			return a.Difference(b)
		case op == difference:
			return a.DifferencePrec(b, gridM)
		case op == intersection && gridM == 0:
			return a.Intersection(b)
		case op == intersection:
			return a.IntersectionPrec(b, gridM)
		case gridM == 0:
			return a.Union(b)
		}
		return a.UnionPrec(b, gridM)
	})
}

// overlay computes a with b on the first grid that the job still trusts. A failure, or a result whose area
// cannot be, is tried again on coarser grids: in floating precision the library now and then gives a wrong
// polygon without a word, such as a hole larger than its shell, where edges of two operands run along each
// other.
func (e *Engine) overlay(op operation, a, b *geos.Geom) *geos.Geom {
	return e.overlayFrom(e.grid, op, a, b)
}

func (e *Engine) overlayFrom(level int, op operation, a, b *geos.Geom) *geos.Geom {
	for _, gridM := range gridsM[level:] {
		if g := onGrid(op, a, b, gridM); g != nil {
			e.own(g, op.String())
			if plausible(op, g.Area(), a.Area(), b.Area()) {
				return g
			}
		}
		e.retries++
	}
	fail("%s: %w", op, ErrNotComputed)
	return nil
}

// plausible reports whether an overlay's area lies between its bounds. Not a number is not plausible.
func plausible(op operation, got, a, b float64) bool {
	lo, hi := 0.0, a
	switch op {
	case difference:
		lo = a - b
	case intersection:
		hi = math.Min(a, b)
	case union:
		lo, hi = math.Max(a, b), a+b
	}
	tol := closeShare*(a+b) + 1e-6
	return got >= lo-tol && got <= hi+tol && got >= 0
}

// unary joins the parts of a geometry, with the same retries.
func (e *Engine) unary(a *geos.Geom) *geos.Geom {
	for _, gridM := range gridsM[e.grid:] {
		g := try(func() *geos.Geom {
			if gridM == 0 {
				return a.UnaryUnion()
			}
			return a.UnaryUnionPrec(gridM)
		})
		if g != nil {
			return e.own(g, "union")
		}
		e.retries++
	}
	fail("union: %w", ErrNotComputed)
	return nil
}

// collect makes one collection of the geometries, which it owns from then on: the slice is cleared so
// that no one uses a member again.
func (e *Engine) collect(members []*geos.Geom) *geos.Geom {
	c := e.own(e.ctx.NewCollection(geos.TypeIDGeometryCollection, members), "collect")
	clear(members)
	return c
}

// join gives the union of the geometries, which are used up.
func (e *Engine) join(members []*geos.Geom) *geos.Geom {
	switch len(members) {
	case 0:
		return e.own(e.ctx.NewEmptyPolygon(), "union")
	case 1:
		return members[0]
	}
	c := e.collect(members)
	g := e.unary(c)
	c.Destroy()
	return g
}

// covers reports whether every position of b lies in a, which must be valid.
func (e *Engine) covers(a, b *geos.Geom) bool {
	p := a.Prepare()
	// Without this the collector would destroy the prepared geometry a second time.
	runtime.SetFinalizer(p, nil)
	defer p.Destroy()
	return p.Covers(b)
}

// widen gives the buffer of g by d metres exactly as asked of the library, round at corners, line ends.
func (e *Engine) widen(g *geos.Geom, d float64, segments int) *geos.Geom {
	return e.own(g.BufferWithStyle(d, segments, geos.BufCapStyleRound, geos.BufJoinStyleRound, 5), "buffer")
}

// setback gives the buffer that never keeps less than d metres.
func (e *Engine) setback(g *geos.Geom, d float64) *geos.Geom {
	if d == 0 {
		return g
	}
	return e.widen(g, d*arcFactor, askedSegments)
}

// clip cuts a geometry to a box. The library's quick method is used when it succeeds.
func (e *Engine) clip(g *geos.Geom, x geo.Extent) *geos.Geom {
	if out := try(func() *geos.Geom { return g.ClipByRect(x.MinX, x.MinY, x.MaxX, x.MaxY) }); out != nil {
		return e.own(out, "clip")
	}
	e.retries++
	return e.overlay(intersection, g, e.own(e.ctx.NewGeomFromBounds(x.MinX, x.MinY, x.MaxX, x.MaxY), "clip"))
}
