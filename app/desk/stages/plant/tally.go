package plant

import (
	"sync"

	"groundtally/app/live"
	"groundtally/app/run"
)

// tally is what the results say of an option.
type tally struct {
	sites  int // on which it was tried
	fitted int
	best   int // candidate that stands highest in the order shown; -1 for none
}

// counting is results with the order to count over.
type counting struct {
	results *run.Results
	ranking *live.Ranking // nil while there is none
}

// counter counts off the window's goroutine: of several asked for meanwhile the newest counts.
type counter struct {
	done func(counting, map[string]tally)

	mu      sync.Mutex
	next    *counting
	running bool
}

func (c *counter) ask(of counting) {
	c.mu.Lock()
	defer c.mu.Unlock()
	c.next = &of
	if !c.running {
		c.running = true
		go c.work()
	}
}

func (c *counter) work() {
	for {
		c.mu.Lock()
		of := c.next
		c.next = nil
		if of == nil {
			c.running = false
			c.mu.Unlock()
			return
		}
		c.mu.Unlock()
		c.done(*of, count(*of))
	}
}

func count(of counting) map[string]tally {
	out := map[string]tally{}
	for i := range of.results.Candidates {
		c := &of.results.Candidates[i]
		t, seen := out[c.Plant]
		if !seen {
			t.best = -1
		}
		t.sites++
		if c.Status == run.Fitted {
			t.fitted++
		}
		out[c.Plant] = t
	}
	r := of.ranking
	if r == nil || r.Err != nil {
		return out
	}
	left := len(out)
	for _, item := range r.Standing.Order {
		at := r.Board.At[item]
		if at < 0 {
			continue
		}
		plant := of.results.Candidates[at].Plant
		if t := out[plant]; t.best < 0 {
			t.best = at
			out[plant] = t
			if left--; left == 0 {
				break
			}
		}
	}
	return out
}
