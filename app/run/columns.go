package run

import (
	"strings"

	"groundtally/scoring"
)

// Columns hold the consequences and facts of the candidates of one plant option: one row a site, one
// column a key. Rows come in blocks. What repeats from row to row (state, reason, source, notices) is kept
// once, and numbers take room only in columns that have some, so that a hundred thousand parcels fit.
type Columns struct {
	keys   []KeyInfo
	at     map[string]int
	facts  []string
	rows   int
	blocks []*block
	forms  []form // by number; the first stands for no entry
	known  map[form]uint32
	demand fact // yearly use of the district, as a table tells it; of use to what reckons a candidate anew
}

// blockRows is the number of rows of a block.
const blockRows = 128

// block holds some rows: the cells of each key, and those of each fact.
type block struct {
	keys, facts []cells
	hasFacts    [blockRows]bool
}

// cells are one column of a block. Any slice may be missing: the forms where no row has an entry, the
// numbers where all are zero, the spreads where every end is the central number.
type cells struct {
	form   []uint32
	x      []float64
	spread []spread
}

// spread is what a consequence has beside its central number.
type spread struct{ low, high, median float64 }

// form is what an entry has beside its numbers.
type form struct {
	state                scoring.State
	rng                  scoring.Range
	why, source, notices string
}

func newColumns(keys []KeyInfo, facts []string) *Columns {
	c := &Columns{keys: keys, facts: facts, at: make(map[string]int, len(keys)), forms: []form{{}}, known: map[form]uint32{}}
	for i, k := range keys {
		c.at[k.Key] = i
	}
	return c
}

// add makes a new row and gives its number.
func (c *Columns) add() int {
	if c.rows == len(c.blocks)*blockRows {
		c.blocks = append(c.blocks, &block{keys: make([]cells, len(c.keys)), facts: make([]cells, len(c.facts))})
	}
	c.rows++
	return c.rows - 1
}

func (c *Columns) number(f form) uint32 {
	n, ok := c.known[f]
	if !ok {
		n = uint32(len(c.forms))
		c.forms, c.known[f] = append(c.forms, f), n
	}
	return n
}

func (l *cells) put(row int, form uint32, x float64, s spread) {
	if l.form == nil {
		l.form = make([]uint32, blockRows)
	}
	l.form[row] = form
	if l.x == nil && x != 0 {
		l.x = make([]float64, blockRows)
	}
	if l.x != nil {
		l.x[row] = x
	}
	if l.spread == nil && s != (spread{x, x, x}) {
		l.spread = make([]spread, blockRows)
		for i := range l.spread {
			y := l.number(i)
			l.spread[i] = spread{y, y, y}
		}
	}
	if l.spread != nil {
		l.spread[row] = s
	}
}

func (l *cells) number(row int) float64 {
	if l.x == nil {
		return 0
	}
	return l.x[row]
}

// get gives the number of the form, 0 where there is no entry, and the numbers.
func (l *cells) get(row int) (form uint32, x float64, s spread) {
	if l.form == nil {
		return 0, 0, s
	}
	x = l.number(row)
	if s = (spread{x, x, x}); l.spread != nil {
		s = l.spread[row]
	}
	return l.form[row], x, s
}

// put writes the consequences and facts of a row.
func (c *Columns) put(row int, qs []scoring.Consequence, leaves []Leaf) {
	b, row := c.blocks[row/blockRows], row%blockRows
	for _, q := range qs {
		if k, ok := c.at[q.Key]; ok {
			f := c.number(form{q.State, q.Range, q.Why, q.Quality, strings.Join(q.Notices, ",")})
			b.keys[k].put(row, f, q.Central, spread{q.Low, q.High, q.Median})
		}
	}
	if len(leaves) != len(c.facts) {
		return
	}
	b.hasFacts[row] = true
	for i, l := range leaves {
		b.facts[i].put(row, c.number(form{state: l.State, why: l.Why, source: l.Source}), l.X, spread{l.X, l.X, l.X})
	}
}

// consequence gives the view of one cell; ok is false when the row has no such consequence.
func (c *Columns) consequence(row, key int) (scoring.Consequence, bool) {
	n, x, s := c.blocks[row/blockRows].keys[key].get(row % blockRows)
	if n == 0 {
		return scoring.Consequence{}, false
	}
	k, f := c.keys[key], &c.forms[n]
	q := scoring.Consequence{Key: k.Key, Account: k.Account, Unit: k.Unit, State: f.state, Range: f.rng,
		Central: x, Low: s.low, High: s.high, Median: s.median, Why: f.why, Quality: f.source}
	if f.notices != "" {
		q.Notices = strings.Split(f.notices, ",")
	}
	return q, true
}

// leaves gives the facts of a row; nil when it has none.
func (c *Columns) leaves(row int) []Leaf {
	b, row := c.blocks[row/blockRows], row%blockRows
	if !b.hasFacts[row] {
		return nil
	}
	out := make([]Leaf, len(c.facts))
	for i, name := range c.facts {
		n, x, _ := b.facts[i].get(row)
		f := &c.forms[n]
		out[i] = Leaf{Name: name, State: f.state, X: x, Why: f.why, Source: f.source}
	}
	return out
}

// span gives the least and the greatest number of a column, low and high ends counted; ok is false when
// it has none.
func (c *Columns) span(key int) (least, greatest float64, ok bool) {
	for _, b := range c.blocks {
		for i := range blockRows {
			n, lo, s := b.keys[key].get(i)
			if n == 0 || c.forms[n].state != scoring.Number {
				continue
			}
			hi := lo
			if r := c.forms[n].rng; r != scoring.NoRange && r != "" {
				lo, hi = min(lo, s.low), max(hi, s.high)
			}
			if !ok || lo < least {
				least = lo
			}
			if !ok || hi > greatest {
				greatest = hi
			}
			ok = true
		}
	}
	return least, greatest, ok
}

// Spans gives for every consequence the least and the greatest number among all fitted candidates, with
// the ends of their ranges. A consequence without any number is not in it.
func (r *Results) Spans() map[string][2]float64 {
	out := map[string][2]float64{}
	seen := map[*Columns]bool{}
	for i := range r.Candidates {
		c := r.Candidates[i].columns
		if c == nil || seen[c] || r.Candidates[i].Status != Fitted {
			continue
		}
		seen[c] = true
		for k, info := range c.keys {
			lo, hi, ok := c.span(k)
			if !ok {
				continue
			}
			if old, there := out[info.Key]; there {
				lo, hi = min(lo, old[0]), max(hi, old[1])
			}
			out[info.Key] = [2]float64{lo, hi}
		}
	}
	return out
}
