package tiles

import (
	"container/list"
	"context"
	"image"
	"runtime"
	"slices"
	"sync"
)

// Options say how a Painter works. Zero values are the defaults.
type Options struct {
	Workers  int    // goroutines; the number of processors
	MaxBytes int64  // memory for tiles; 96 MB
	Ready    func() // called from a worker whenever a wanted tile has a new picture
}

const defaultMaxBytes = 96 << 20

// Painter keeps tiles drawn and coloured in the background. Its methods return at once; any goroutine may
// call them.
//
// What is wanted is drawn in the order in which it was wanted, colouring before drawing, as it takes a
// fraction of the time. Work on a tile that is no longer wanted is stopped.
//
// A picture stays as it is until a newer one of the same tile was given out; then it may be drawn over.
// Whoever shows pictures must therefore show the newest that it was given.
type Painter struct {
	ready    func()
	maxBytes int64
	workers  sync.WaitGroup

	mu      sync.Mutex
	wake    *sync.Cond
	closed  bool
	paused  bool
	scene   scene
	tiles   map[Key]*entry
	recent  *list.List // of *entry, the latest used first
	bytes   int64
	wanted  []Key
	isIn    map[Key]bool
	running map[Key]context.CancelFunc
	counts  Counts
}

// scene is everything that a tile's picture depends on. Versions rise, so that an old result is known.
type scene struct {
	ground  *Ground
	style   Style
	shading Shading
	palette func() *Palette
	placed  func() *Placed
	drawn   uint64 // version of ground and style
	shaded  uint64 // version of everything
	marked  uint64 // version of the marks on their ground and style
}

type entry struct {
	key                   Key
	tile                  *Tile
	marks                 []ink
	picture               *image.RGBA // the newest
	given                 *image.RGBA // the one that was given out last
	spare                 *image.RGBA // one that nobody shows any more
	drawn, shaded, marked uint64
	bytes                 int64
	at                    *list.Element
}

// Counts tell what a painter did since it was made.
type Counts struct {
	Drawn     int   // tiles drawn from geometry
	Shaded    int   // pictures coloured
	Cancelled int   // drawings stopped, or of no use when they were done
	Tiles     int   // tiles kept now
	Bytes     int64 // memory of the tiles kept now
}

// NewPainter starts a painter. Close ends it.
func NewPainter(o Options) *Painter {
	if o.Workers <= 0 {
		o.Workers = runtime.NumCPU()
	}
	if o.MaxBytes <= 0 {
		o.MaxBytes = defaultMaxBytes
	}
	if o.Ready == nil {
		o.Ready = func() {}
	}
	p := &Painter{
		ready: o.Ready, maxBytes: o.MaxBytes,
		tiles: map[Key]*entry{}, recent: list.New(), running: map[Key]context.CancelFunc{},
	}
	p.wake = sync.NewCond(&p.mu)
	for range o.Workers {
		p.workers.Go(p.work)
	}
	return p
}

// Close stops all work and waits for the workers to end. Nothing is drawn afterwards.
func (p *Painter) Close() {
	p.mu.Lock()
	p.closed = true
	for _, stop := range p.running {
		stop()
	}
	p.wake.Broadcast()
	p.mu.Unlock()
	p.workers.Wait()
}

// Pause stops the work until Resume, for a map that cannot be seen. What is under way is finished.
func (p *Painter) Pause() { p.setPaused(true) }

// Resume goes on with what is wanted.
func (p *Painter) Resume() { p.setPaused(false) }

func (p *Painter) setPaused(paused bool) {
	p.mu.Lock()
	defer p.mu.Unlock()
	p.paused = paused
	p.wake.Broadcast()
}

// SetGround gives the painter another district, or none; all tiles are dropped.
func (p *Painter) SetGround(g *Ground) {
	p.mu.Lock()
	defer p.mu.Unlock()
	for _, stop := range p.running {
		stop()
	}
	p.tiles, p.recent, p.bytes = map[Key]*entry{}, list.New(), 0
	p.scene.ground = g
	p.scene.placed = nil
	p.redraw()
}

// SetStyle has all tiles drawn anew; until then they are given out as they were.
func (p *Painter) SetStyle(s Style) {
	p.mu.Lock()
	defer p.mu.Unlock()
	p.scene.style = s
	p.redraw()
}

// redraw marks everything as out of date. The lock is held.
func (p *Painter) redraw() {
	p.scene.drawn++
	p.scene.marked++
	p.reshade()
}

// reshade makes the palette anew and marks all colours as out of date. The lock is held.
func (p *Painter) reshade() {
	p.scene.shaded++
	if g := p.scene.ground; g != nil {
		s, style := p.scene.shading, p.scene.style
		p.scene.palette = sync.OnceValue(func() *Palette { return NewPalette(s, g.Parcels(), style) })
	}
	p.wake.Broadcast()
}

// SetShading has the tiles coloured anew, without drawing.
func (p *Painter) SetShading(s Shading) {
	p.mu.Lock()
	defer p.mu.Unlock()
	p.scene.shading = s
	p.reshade()
}

// SetMarks has other marks put over the tiles. They are dropped with the ground.
func (p *Painter) SetMarks(marks []Mark) {
	p.mu.Lock()
	defer p.mu.Unlock()
	p.scene.placed = nil
	if g := p.scene.ground; g != nil && len(marks) > 0 {
		p.scene.placed = sync.OnceValue(func() *Placed { return g.Place(marks) })
	}
	p.scene.marked++
	p.reshade()
}

// Want names the tiles that are needed, the most urgent first, in place of those wanted before. They are
// kept even when they alone take more memory than allowed.
func (p *Painter) Want(keys []Key) {
	p.mu.Lock()
	defer p.mu.Unlock()
	p.wanted = append(p.wanted[:0], keys...)
	p.isIn = make(map[Key]bool, len(keys))
	for i := len(keys) - 1; i >= 0; i-- {
		p.isIn[keys[i]] = true
		if e := p.tiles[keys[i]]; e != nil {
			p.recent.MoveToFront(e.at)
		}
	}
	for key, stop := range p.running {
		if !p.isIn[key] {
			stop()
		}
	}
	p.trim()
	p.wake.Broadcast()
}

// Picture gives the newest picture of a tile, or nil; fresh tells whether it shows everything as it is
// now.
func (p *Painter) Picture(key Key) (picture *image.RGBA, fresh bool) {
	p.mu.Lock()
	defer p.mu.Unlock()
	e := p.tiles[key]
	if e == nil {
		return nil, false
	}
	if e.given != e.picture {
		if e.given != nil {
			p.spare(e, e.given)
		}
		e.given = e.picture
	}
	return e.picture, e.drawn == p.scene.drawn && e.shaded == p.scene.shaded
}

// Counts tells what was done so far.
func (p *Painter) Counts() Counts {
	p.mu.Lock()
	defer p.mu.Unlock()
	c := p.counts
	c.Tiles, c.Bytes = len(p.tiles), p.bytes
	return c
}

// trim drops the tiles that were used longest ago until the rest fits. The lock is held.
func (p *Painter) trim() {
	for at := p.recent.Back(); at != nil && p.bytes > p.maxBytes; {
		e, before := at.Value.(*entry), at.Prev()
		if !p.isIn[e.key] {
			p.recent.Remove(at)
			delete(p.tiles, e.key)
			p.bytes -= e.bytes
		}
		at = before
	}
}

// job is one tile's work with the scene as it was when the work was taken.
type job struct {
	ctx   context.Context
	key   Key
	scene scene
	tile  *Tile       // nil when it must be drawn
	into  *image.RGBA // a picture that may be drawn over
	marks []ink
	// marked tells whether marks are those of the scene.
	marked bool
}

// next takes the most urgent work; the lock is held.
func (p *Painter) next() (job, bool) {
	if p.paused || p.scene.ground == nil {
		return job{}, false
	}
	for _, draw := range []bool{false, true} {
		for _, key := range p.wanted {
			if p.running[key] != nil {
				continue
			}
			e := p.tiles[key]
			missing := e == nil || e.drawn != p.scene.drawn
			if missing != draw || (!draw && e.shaded == p.scene.shaded) {
				continue
			}
			j := job{key: key, scene: p.scene}
			if !draw {
				j.tile, j.marks, j.marked = e.tile, e.marks, e.marked == p.scene.marked
			}
			if e != nil && e.spare != nil {
				j.into, e.spare = e.spare, nil
				p.bytes -= int64(len(j.into.Pix))
				e.bytes -= int64(len(j.into.Pix))
			}
			var stop context.CancelFunc
			j.ctx, stop = context.WithCancel(context.Background())
			p.running[key] = stop
			return j, true
		}
	}
	return job{}, false
}

func (p *Painter) work() {
	p.mu.Lock()
	defer p.mu.Unlock()
	for !p.closed {
		j, ok := p.next()
		if !ok {
			p.wake.Wait()
			continue
		}
		p.mu.Unlock()
		tile, marks, picture := j.do()
		p.mu.Lock()
		p.running[j.key]()
		delete(p.running, j.key)
		if p.keep(j, tile, marks, picture) {
			p.mu.Unlock()
			p.ready()
			p.mu.Lock()
		}
	}
}

// do draws and colours the job's tile; the lock is not held. The picture is nil when it was stopped.
func (j job) do() (*Tile, []ink, *image.RGBA) {
	tile, marks, s := j.tile, j.marks, j.scene
	if tile == nil {
		var err error
		if tile, err = s.ground.Draw(j.ctx, j.key.Level, j.key.Rect(), s.style); err != nil {
			return nil, nil, nil
		}
	}
	if !j.marked {
		marks = nil
		if s.placed != nil {
			marks = s.placed().Draw(j.key.Level, j.key.Rect(), s.style)
		}
	}
	return tile, marks, tile.Shade(s.palette(), marks, j.into)
}

// keep stores a job's result unless it is of no use any more; the lock is held.
func (p *Painter) keep(j job, tile *Tile, marks []ink, picture *image.RGBA) bool {
	if picture == nil || j.scene.drawn != p.scene.drawn {
		p.counts.Cancelled++
		return false
	}
	if j.tile == nil {
		p.counts.Drawn++
	}
	p.counts.Shaded++
	e := p.tiles[j.key]
	if e == nil {
		e = &entry{key: j.key}
		e.at = p.recent.PushFront(e)
		p.tiles[j.key] = e
	}
	if e.picture != nil && e.picture != e.given {
		e.spare = e.picture
	}
	e.tile, e.marks, e.picture = tile, marks, picture
	e.drawn, e.shaded, e.marked = j.scene.drawn, j.scene.shaded, j.scene.marked
	p.weigh(e)
	p.trim()
	return p.isIn[j.key]
}

// spare keeps a picture that nobody shows for the next colouring; the lock is held.
func (p *Painter) spare(e *entry, picture *image.RGBA) {
	e.spare = picture
	p.weigh(e)
	p.trim()
}

// weigh counts an entry's memory; the lock is held.
func (p *Painter) weigh(e *entry) {
	p.bytes -= e.bytes
	e.bytes = e.tile.bytes() + int64(4*len(e.marks))
	seen := [...]*image.RGBA{e.picture, e.given, e.spare}
	for i, img := range seen {
		if img != nil && !slices.Contains(seen[:i], img) {
			e.bytes += int64(len(img.Pix))
		}
	}
	p.bytes += e.bytes
}
