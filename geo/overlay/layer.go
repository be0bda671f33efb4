package overlay

import (
	"context"
	"fmt"
	"math"
	"runtime"
	"sync"
	"sync/atomic"

	"groundtally/geo"
	"groundtally/geo/index"
)

// Layer is a rule's features widened by its setback once for many sites. It is read-only, so workers may
// share it.
type Layer struct {
	regions []geo.XYGeometry
	extents []geo.Extent // of the regions
	tree    *index.Tree
}

// layerSlab is the number of positions that the regions of a layer are stored in together, 512 kB.
const layerSlab = 32 << 10

// widenBlock is the number of features that a worker widens at a time.
const widenBlock = 512

// NewLayer repairs the features where needed, widens each by setbackM metres, packs them in an index.
// Without a setback, points and lines take no land and are left out. See NewLayer without an engine for
// many features.
func (e *Engine) NewLayer(features []geo.XYGeometry, setbackM float64) (*Layer, error) {
	st := &store{chunk: layerSlab}
	regions, err := e.widenAll(features, 0, setbackM, st)
	if err != nil {
		return nil, err
	}
	return packed(regions), nil
}

// NewLayer does what the method of an Engine does, on so many engines of its own at once. The layer does not
// depend on their number. It ends early with the context's error.
func NewLayer(ctx context.Context, cores int, features []geo.XYGeometry, setbackM float64) (*Layer, error) {
	blocks := make([][]geo.XYGeometry, (len(features)+widenBlock-1)/widenBlock)
	failed := make([]error, len(blocks))
	var next atomic.Int64
	var stop atomic.Bool
	var wg sync.WaitGroup
	for range min(max(cores, 1), len(blocks)) {
		wg.Go(func() {
			// The library's allocator keeps memory by thread.
			runtime.LockOSThread()
			defer runtime.UnlockOSThread()
			e := New()
			defer func() { _ = e.Close() }() // nobody else uses it
			st := &store{chunk: layerSlab}
			for ctx.Err() == nil && !stop.Load() {
				b := int(next.Add(1)) - 1
				if b >= len(blocks) {
					return
				}
				from := b * widenBlock
				blocks[b], failed[b] = e.widenAll(features[from:min(from+widenBlock, len(features))], from, setbackM, st)
				if failed[b] != nil {
					stop.Store(true)
				}
			}
		})
	}
	wg.Wait()
	if err := ctx.Err(); err != nil {
		return nil, fmt.Errorf("widen features: %w", err)
	}
	// Blocks are begun in order, so all before the first that failed are done, whatever the workers.
	n := 0
	for b, err := range failed {
		if err != nil {
			return nil, err
		}
		n += len(blocks[b])
	}
	regions := make([]geo.XYGeometry, 0, n)
	for _, b := range blocks {
		regions = append(regions, b...)
	}
	return packed(regions), nil
}

func packed(regions []geo.XYGeometry) *Layer {
	l := &Layer{regions: regions, extents: make([]geo.Extent, len(regions))}
	for i, r := range regions {
		l.extents[i] = geo.EmptyExtent()
		for _, part := range r.Parts {
			x, _ := extentOf(part) // regions are finite
			l.extents[i] = l.extents[i].Union(x)
		}
	}
	l.tree = index.New(l.extents)
	return l
}

// widenAll gives the regions of features, which are numbered from the one given.
func (e *Engine) widenAll(features []geo.XYGeometry, from int, setbackM float64, st *store) ([]geo.XYGeometry, error) {
	regions := make([]geo.XYGeometry, 0, len(features))
	if bad(setbackM) {
		if len(features) == 0 {
			return regions, nil
		}
		return nil, fmt.Errorf("feature %d: the setback %v m must be 0 or more", from+1, setbackM)
	}
	at := 0
	job := func() {
		f := features[at]
		if f.Empty() || (f.Kind != geo.Polygons && setbackM == 0) {
			return
		}
		g := e.raw(f)
		if f.Kind == geo.Polygons && !plainlyValid(f) && !g.IsValid() {
			g = e.makeValid(g)
		}
		if r := e.giveInto(e.setback(g, setbackM), geo.Polygons, st); !r.Empty() {
			regions = append(regions, r)
		}
	}
	for at = range features {
		if err := e.do(fmt.Sprintf("feature %d", from+at+1), job); err != nil {
			return nil, err
		}
	}
	return regions, nil
}

// plainlyValid reports that a polygon is valid without asking the library: one small ring that turns the same
// way at every corner, once around. It says no when in doubt.
func plainlyValid(g geo.XYGeometry) bool {
	const mostCorners = 16
	if len(g.Parts) != 1 || len(g.Parts[0]) != 1 {
		return false
	}
	ring := g.Parts[0][0]
	n := len(ring) - 1
	if n < 3 || n > mostCorners || ring[0] != ring[n] {
		return false
	}
	sign, turns := 0.0, 0
	for i := range n {
		a, b, c := ring[i], ring[i+1], ring[(i+1)%n+1]
		u, v := b.Sub(a), c.Sub(b)
		cross := u.X*v.Y - u.Y*v.X
		if sign == 0 {
			sign = cross
		}
		// A corner must be far sharper than rounding could make a straight line.
		if !(math.Abs(cross) > 1e-9*(math.Abs(u.X*v.Y)+math.Abs(u.Y*v.X))+1e-9) || (cross > 0) != (sign > 0) {
			return false
		}
		// Once around is two changes between edges that go east and those that do not.
		if (u.X > 0) != (v.X > 0) {
			turns++
		}
	}
	return turns == 2
}

// Len gives the number of regions.
func (l *Layer) Len() int { return len(l.regions) }

// Rule gives the rule with the regions that meet the extent of a site.
func (l *Layer) Rule(name string, site geo.Extent) Rule { return RuleOf(name, site, l) }

// RuleOf gives the rule of several layers with the regions that meet the extent of a site. It is quicker to
// apply than one whose features were put together by hand.
func RuleOf(name string, site geo.Extent, layers ...*Layer) Rule {
	r := Rule{Name: name, Checked: true}
	var few [64]int
	for _, l := range layers {
		for _, i := range l.tree.Search(site, few[:0]) {
			r.Features = append(r.Features, l.regions[i])
			r.regions = append(r.regions, piece{l.regions[i], l.extents[i]})
		}
	}
	return r
}
