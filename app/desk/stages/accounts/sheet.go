package accounts

import (
	"cmp"
	"math"
	"slices"
	"strings"
	"sync"

	"groundtally/app/live"
	"groundtally/app/run"
	"groundtally/app/study"
	"groundtally/scoring"
	"groundtally/scoring/criteria"
)

// direction says in which order a sorted column stands.
type direction int

const (
	studyOrder direction = iota
	bestFirst
	worstFirst
)

// next is what another tap on the header does.
func (d direction) next() direction { return (d + 1) % 3 }

// anyStatus lets candidates of every status through.
const anyStatus = ""

// filter says which candidates are listed.
type filter struct {
	words  string // each must be found in site, parcels or plant title
	plant  string // empty for all
	status string // empty for all
	key    string // consequence that is held to a number; empty for none
	most   bool   // at most, else at least
	number float64
}

// request is what the table is asked to show.
type request struct {
	results *run.Results
	index   *live.Index
	catalog *study.Catalog
	titles  map[string]string // of plant options
	keys    []string          // columns whose spans are wanted
	sortBy  string
	dir     direction
	filter  filter
}

// column is one consequence of all candidates.
type column struct {
	state    []uint8 // scoring.State, or missing
	central  []float64
	low      float64 // least low of all numbers
	high     float64 // greatest high of all numbers
	least    float64 // least central value
	greatest float64 // greatest central value
	numbers  int
}

// missing marks a candidate that has no such consequence because nothing was fitted.
const missing = 255

func newColumn(r *run.Results, key string) *column {
	n := len(r.Candidates)
	c := &column{state: make([]uint8, n), central: make([]float64, n)}
	c.low, c.least = math.Inf(1), math.Inf(1)
	c.high, c.greatest = math.Inf(-1), math.Inf(-1)
	for i := range r.Candidates {
		q, ok := r.Candidates[i].Consequence(key)
		switch {
		case !ok:
			c.state[i] = missing
		case q.State == scoring.Number:
			c.central[i] = q.Central
			c.numbers++
			c.low, c.high = min(c.low, q.Low), max(c.high, q.High)
			c.least, c.greatest = min(c.least, q.Central), max(c.greatest, q.Central)
		default:
			c.state[i] = uint8(q.State)
		}
	}
	return c
}

// share tells where a value lies between the least low and the greatest high, from 0 to 1.
func (c *column) share(x float64) float64 { return between(x, c.low, c.high) }

func between(x, low, high float64) float64 {
	if !(high > low) {
		return 0.5
	}
	return (x - low) / (high - low)
}

// listed is what the table shows of a request.
type listed struct {
	request
	rows    []int32 // candidates in the order of the table
	at      []int32 // by candidate: its row, -1 for one that is not listed
	columns map[string]*column
	over    int // candidates that break a limit, listed or not
	without int // candidates that only the missing number kept out
}

// lister works requests off the window's goroutine: of several asked for meanwhile the newest counts.
type lister struct {
	done func(*listed)

	mu      sync.Mutex
	next    *request
	running bool

	// Kept between requests on the same results; touched by the one running request only.
	of      *run.Results
	columns map[string]*column
	hay     []string // by site, in small letters: its name and parcels
}

func (l *lister) ask(r request) {
	l.mu.Lock()
	defer l.mu.Unlock()
	l.next = &r
	if !l.running {
		l.running = true
		go l.work()
	}
}

func (l *lister) work() {
	for {
		l.mu.Lock()
		r := l.next
		l.next = nil
		if r == nil {
			l.running = false
			l.mu.Unlock()
			return
		}
		l.mu.Unlock()
		l.done(l.list(*r))
	}
}

// list finds, filters and sorts.
func (l *lister) list(r request) *listed {
	if l.of != r.results {
		l.of, l.columns, l.hay = r.results, map[string]*column{}, nil
	}
	out := &listed{request: r, columns: make(map[string]*column, len(r.keys))}
	for _, k := range r.keys {
		out.columns[k] = l.column(k)
	}
	for i := range r.results.Candidates {
		if len(r.results.Candidates[i].OverLimit) > 0 {
			out.over++
		}
	}
	out.rows, out.without = l.filtered(r)
	if r.dir != studyOrder && r.sortBy != "" {
		sortRows(out.rows, l.column(r.sortBy), better(r.catalog, r.sortBy), r.dir)
	}
	out.at = make([]int32, len(r.results.Candidates))
	for i := range out.at {
		out.at[i] = -1
	}
	for row, i := range out.rows {
		out.at[i] = int32(row)
	}
	return out
}

func (l *lister) column(key string) *column {
	c, ok := l.columns[key]
	if !ok {
		c = newColumn(l.of, key)
		l.columns[key] = c
	}
	return c
}

// filtered gives the candidates that pass, in the order of the study.
func (l *lister) filtered(r request) (rows []int32, without int) {
	f := r.filter
	words := strings.Fields(strings.ToLower(f.words))
	plants := map[string]string{}
	if len(words) > 0 {
		if l.hay == nil {
			l.hay = haystack(r)
		}
		for id, t := range r.titles {
			plants[id] = strings.ToLower(t)
		}
	}
	var held *column
	if f.key != "" {
		held = l.column(f.key)
	}
	rows = make([]int32, 0, len(r.results.Candidates))
next:
	for i := range r.results.Candidates {
		c := &r.results.Candidates[i]
		if f.status != anyStatus && c.Status != f.status || f.plant != "" && c.Plant != f.plant {
			continue
		}
		for _, w := range words {
			if !strings.Contains(l.hay[r.index.SiteOf[i]], w) && !strings.Contains(plants[c.Plant], w) {
				continue next
			}
		}
		if held != nil {
			if held.state[i] != uint8(scoring.Number) {
				without++
				continue
			}
			if x := held.central[i]; f.most && x > f.number || !f.most && x < f.number {
				continue
			}
		}
		rows = append(rows, int32(i))
	}
	return rows, without
}

func haystack(r request) []string {
	hay := make([]string, len(r.index.Sites))
	for s, name := range r.index.Sites {
		text := name
		for _, p := range r.results.Candidates[r.index.Candidates[s][0]].Parcels {
			if p != name {
				text += "\n" + p
			}
		}
		hay[s] = strings.ToLower(text)
	}
	return hay
}

// better tells which direction of a consequence is the better one.
func better(cat *study.Catalog, key string) criteria.Better {
	if c, ok := cat.Criterion(key); ok {
		return c.Better
	}
	c, _ := cat.Criterion(strings.TrimSuffix(key, criteria.BurdenSuffix))
	return c.Better
}

// ranked is a candidate with what it is sorted by.
type ranked struct {
	x float64
	i int32
}

// sortRows puts rows in the order of a column, as run.SortBy ranks states: none, numbers, then
// unknown and its like, then never. Turned round, never comes first and what has no value stays last, since
// an unknown is neither best nor worst. Equals keep the order of the study.
func sortRows(rows []int32, c *column, b criteria.Better, dir direction) {
	var none, never, rest []int32
	numbers := make([]ranked, 0, len(rows))
	sign := -1.0
	if b == criteria.Less {
		sign = 1
	}
	if dir == worstFirst {
		sign = -sign
	}
	for _, i := range rows {
		switch c.state[i] {
		case uint8(scoring.Number):
			numbers = append(numbers, ranked{sign * c.central[i], i})
		case uint8(scoring.None):
			none = append(none, i)
		case uint8(scoring.Never):
			never = append(never, i)
		default:
			rest = append(rest, i)
		}
	}
	slices.SortFunc(numbers, func(a, b ranked) int {
		if o := cmp.Compare(a.x, b.x); o != 0 {
			return o
		}
		return cmp.Compare(a.i, b.i)
	})
	slices.SortStableFunc(rest, func(a, b int32) int { // nothing fitted stands behind unknown
		return cmp.Compare(c.state[a]/missing, c.state[b]/missing)
	})
	values := make([]int32, len(numbers))
	for k, n := range numbers {
		values[k] = n.i
	}
	parts := [][]int32{none, values, rest, never}
	if dir == worstFirst {
		parts = [][]int32{never, values, none, rest}
	}
	at := 0
	for _, part := range parts {
		at += copy(rows[at:], part)
	}
}
