package live

import (
	"slices"
	"sync"

	"groundtally/app/run"
	"groundtally/scoring/weigh"
)

// Ranking is an order under weights that a person tries out.
type Ranking struct {
	Board    *run.Board
	Index    *Index
	Voice    string
	Raw      []float64 // swing points by key of the board
	Standing weigh.Standing
	Best     []int // by site: the item that stands highest; -1 for a site without one
	Err      error
}

// Weigher puts a board in order under changing weights, off the caller's goroutine: of several that
// were asked for meanwhile the newest counts.
type Weigher struct {
	done func(*Ranking)

	mu      sync.Mutex
	next    *Ranking
	running bool
}

// NewWeigher makes a weigher that hands each order to done, on a goroutine of its own.
func NewWeigher(done func(*Ranking)) *Weigher { return &Weigher{done: done} }

// Ask wants the order of a board under raw weights. The weights are copied.
func (w *Weigher) Ask(b *run.Board, x *Index, voice string, raw []float64) {
	w.mu.Lock()
	defer w.mu.Unlock()
	w.next = &Ranking{Board: b, Index: x, Voice: voice, Raw: slices.Clone(raw)}
	if !w.running {
		w.running = true
		go w.work()
	}
}

func (w *Weigher) work() {
	for {
		w.mu.Lock()
		r := w.next
		w.next = nil
		if r == nil {
			w.running = false
			w.mu.Unlock()
			return
		}
		w.mu.Unlock()
		r.Rank()
		w.done(r)
	}
}

// Rank puts the board in order and finds the best item of every site.
func (r *Ranking) Rank() {
	if r.Err = r.Board.Weigh(r.Raw, &r.Standing); r.Err != nil {
		return
	}
	r.Best = make([]int, len(r.Index.Sites))
	for i := range r.Best {
		r.Best[i] = -1
	}
	for _, item := range r.Standing.Order {
		if c := r.Board.At[item]; c >= 0 {
			if site := r.Index.SiteOf[c]; r.Best[site] < 0 {
				r.Best[site] = item
			}
		}
	}
}

// Best gives the candidate of a site that stands highest in an order of the view's results, else the first
// fitted one; -1 for a site without any. The order may be nil.
func (v *View) Best(r *Ranking, site int) int {
	if r != nil && r.Err == nil && r.Index == v.Index && r.Best[site] >= 0 {
		return r.Board.At[r.Best[site]]
	}
	for _, c := range v.Index.Candidates[site] {
		if v.Results.Candidates[c].Status == run.Fitted {
			return c
		}
	}
	return -1
}
