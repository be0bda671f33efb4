package weigh

import "fmt"

// Board holds the values of items on keys, laid out once, so that other weights give the order anew in
// little time: what a person needs while dragging a weight. Mixes, dominance and tipping weights are
// Order's. A Board is read-only after NewBoard, so goroutines may share it.
type Board struct {
	m    *matrix
	keys []Key
}

// NewBoard lays out the items. Raw weights of the keys are not used, so they may all be 0; the rest is
// checked as Order does.
func NewBoard(keys []Key, items []Item) (*Board, error) {
	in := Input{Keys: make([]Key, len(keys)), Items: items}
	for k, key := range keys {
		in.Keys[k] = Key{Name: key.Name, Account: key.Account, RawWeight: 1}
	}
	m, err := newMatrix(&in)
	if err != nil {
		return nil, err
	}
	return &Board{m: m, keys: in.Keys}, nil
}

// Standing is an order under some weights. Its slices are used again by the next Weigh into it.
type Standing struct {
	Weights          []float64 // by key, adding up to 1
	Order            []int     // items by place, from the first
	Place            []int     // by item, from 1
	Tier             []int     // by item; see Tiers
	Score, Low, High []float64 // by item
	lows, highs      []float64
	complete         []bool
}

// Weigh puts the items in order under raw weights (swing points, at least 0, one above 0), one for each
// key. Scores, places and tiers are those of Order, bit for bit.
func (b *Board) Weigh(raw []float64, s *Standing) error {
	m := *b.m
	if len(raw) != m.d {
		return fmt.Errorf("board: %d weights for %d keys", len(raw), m.d)
	}
	w, err := Swing(raw)
	if err != nil {
		return fmt.Errorf("board: %w", err)
	}
	m.w, m.weighed = w, nil
	for k := range w {
		if w[k] > 0 {
			m.weighed = append(m.weighed, k)
		}
	}
	s.complete = sized(s.complete, m.n)
	for i := range s.complete {
		s.complete[i] = true
		for _, k := range m.weighed {
			s.complete[i] = s.complete[i] && !m.unknown(i, k)
		}
	}
	m.complete = s.complete
	s.Weights = w
	s.Score, s.Low, s.High = sized(s.Score, m.n), sized(s.Low, m.n), sized(s.High, m.n)
	s.lows, s.highs = sized(s.lows, m.n), sized(s.highs, m.n)
	s.Place, s.Tier = sized(s.Place, m.n), sized(s.Tier, m.n)
	for i := range m.n {
		s.Score[i], s.Low[i], s.High[i] = dot(w, m.midRow(i)), dot(w, m.lowRow(i)), dot(w, m.highRow(i))
	}
	s.Order = m.sorted(s.Score)
	for p, i := range s.Order {
		s.Place[i], s.lows[p], s.highs[p] = p+1, s.Low[i], s.High[i]
	}
	tiers, _ := Tiers(s.lows, s.highs)
	for p, i := range s.Order {
		s.Tier[i] = tiers[p]
	}
	return nil
}

// Part gives the value of an item on a key.
func (b *Board) Part(item, key int) Part { return b.m.items[item].Values[key] }

// Share gives what a key adds to an item's score under a standing's weights, with the ends of its
// interval. An unknown part adds half its weight.
func (b *Board) Share(s *Standing, item, key int) (low, mid, high float64) {
	w, at := s.Weights[key], item*b.m.d+key
	return float64(w * b.m.low[at]), float64(w * b.m.mid[at]), float64(w * b.m.high[at])
}

// sized gives a slice of n elements, in the old one's room where that is enough.
func sized[T any](s []T, n int) []T {
	if cap(s) < n {
		return make([]T, n)
	}
	return s[:n]
}
