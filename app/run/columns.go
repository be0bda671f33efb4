package run

import (
	"slices"
	"strings"

	"groundtally/scoring"
)

// Columns hold the consequences and facts of one plant option: one row a site, one column a key. They
// take about a quarter of the memory that a struct for each consequence would, so that a hundred thousand
// parcels fit. Rows come in blocks, so that sites without a plant take none. Texts that repeat (reasons,
// notices, sources) are kept once.
type Columns struct {
	keys   []KeyInfo
	at     map[string]int
	facts  []string
	rows   int
	blocks []*block
	texts  texts
}

// blockRows is the number of rows of a block.
const blockRows = 128

// block holds some rows, key-major.
type block struct {
	state, rng   []uint8
	central, low []float64
	high, median []float64
	why, quality []uint32
	notices      []uint32
	filled       []bool

	factState []uint8
	factX     []float64
	factWhy   []uint32
	factFrom  []uint32
	hasFacts  [blockRows]bool
}

// texts keeps each text once; 0 is the empty one.
type texts struct {
	list []string
	at   map[string]uint32
}

func (t *texts) put(s string) uint32 {
	if s == "" {
		return 0
	}
	if i, ok := t.at[s]; ok {
		return i
	}
	if t.at == nil {
		t.at = map[string]uint32{}
		t.list = []string{""}
	}
	i := uint32(len(t.list))
	t.list = append(t.list, s)
	t.at[s] = i
	return i
}

func (t *texts) get(i uint32) string {
	if i == 0 {
		return ""
	}
	return t.list[i]
}

var ranges = []scoring.Range{"", scoring.NoRange, scoring.P10P90, scoring.Bounds, scoring.Corners, scoring.LayerTolerance}

func newColumns(keys []KeyInfo, facts []string) *Columns {
	c := &Columns{keys: keys, facts: facts, at: make(map[string]int, len(keys))}
	for i, k := range keys {
		c.at[k.Key] = i
	}
	return c
}

// add makes a new row and gives its number.
func (c *Columns) add() int {
	if c.rows == len(c.blocks)*blockRows {
		n, m := len(c.keys)*blockRows, len(c.facts)*blockRows
		c.blocks = append(c.blocks, &block{
			state: make([]uint8, n), rng: make([]uint8, n), central: make([]float64, n), low: make([]float64, n), high: make([]float64, n), median: make([]float64, n),
			why: make([]uint32, n), quality: make([]uint32, n), notices: make([]uint32, n), filled: make([]bool, n),
			factState: make([]uint8, m), factX: make([]float64, m), factWhy: make([]uint32, m), factFrom: make([]uint32, m)})
	}
	c.rows++
	return c.rows - 1
}

// put writes the consequences and facts of a row.
func (c *Columns) put(row int, qs []scoring.Consequence, leaves []Leaf) {
	b, row := c.blocks[row/blockRows], row%blockRows
	for _, q := range qs {
		k, ok := c.at[q.Key]
		if !ok {
			continue
		}
		i := k*blockRows + row
		b.filled[i] = true
		b.state[i], b.rng[i] = uint8(q.State), uint8(max(0, slices.Index(ranges, q.Range)))
		b.central[i], b.low[i], b.high[i], b.median[i] = q.Central, q.Low, q.High, q.Median
		b.why[i], b.quality[i], b.notices[i] = c.texts.put(q.Why), c.texts.put(q.Quality), c.texts.put(strings.Join(q.Notices, ","))
	}
	if len(leaves) != len(c.facts) {
		return
	}
	b.hasFacts[row] = true
	for f, l := range leaves {
		i := f*blockRows + row
		b.factState[i], b.factX[i], b.factWhy[i], b.factFrom[i] = uint8(l.State), l.X, c.texts.put(l.Why), c.texts.put(l.Source)
	}
}

// consequence gives the view of one cell; ok is false when the row has no such consequence.
func (c *Columns) consequence(row, key int) (scoring.Consequence, bool) {
	b, i := c.blocks[row/blockRows], key*blockRows+row%blockRows
	if !b.filled[i] {
		return scoring.Consequence{}, false
	}
	k := c.keys[key]
	q := scoring.Consequence{Key: k.Key, Account: k.Account, Unit: k.Unit, State: scoring.State(b.state[i]), Range: ranges[b.rng[i]],
		Central: b.central[i], Low: b.low[i], High: b.high[i], Median: b.median[i], Why: c.texts.get(b.why[i]), Quality: c.texts.get(b.quality[i])}
	if n := c.texts.get(b.notices[i]); n != "" {
		q.Notices = strings.Split(n, ",")
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
	for f, name := range c.facts {
		i := f*blockRows + row
		out[f] = Leaf{Name: name, State: scoring.State(b.factState[i]), X: b.factX[i], Why: c.texts.get(b.factWhy[i]), Source: c.texts.get(b.factFrom[i])}
	}
	return out
}

// span gives the least and the greatest number of a column, low and high ends counted; ok is false when
// it has none.
func (c *Columns) span(key int) (least, greatest float64, ok bool) {
	for _, b := range c.blocks {
		for i := key * blockRows; i < (key+1)*blockRows; i++ {
			if !b.filled[i] || scoring.State(b.state[i]) != scoring.Number {
				continue
			}
			lo, hi := b.central[i], b.central[i]
			if r := ranges[b.rng[i]]; r != scoring.NoRange && r != "" {
				lo, hi = min(lo, b.low[i]), max(hi, b.high[i])
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
		if c == nil || seen[c] {
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
