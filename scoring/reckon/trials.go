package reckon

import (
	"fmt"
	"math"
	"slices"
	"sync"

	"groundtally/scoring"
)

// Drawn is a leaf that the trials vary: its slot and its value in each trial. Values do not change any more once they
// were used.
type Drawn struct {
	Slot   int
	Values []float64
	// Shared says that the same Values serve many candidates: what follows from such leaves alone is kept from one to
	// the next.
	Shared bool
}

// Spread is what the trials say of one quantity.
type Spread struct {
	Moves  bool    // some drawn leaf reaches the quantity
	Low    float64 // tenth percentile
	Median float64
	High   float64 // ninetieth percentile
	// Numbers and Nevers count the trials that gave a number or Never. When Never reaches into the
	// percentiles, Low, Median and High are those of the trials that gave a number, and the caller
	// says so.
	Numbers, Nevers int
}

// Trials evaluates the graph once per trial with the drawn leaves, on top of the central vector v,
// and gives the spread of the wanted slots in their order. Percentiles are linear between the order
// statistics (position (n-1)p, Hyndman and Fan 1996, type 7). All Values must have the same length.
// The vector v is left as it was.
func (g *Graph) Trials(v []scoring.Value, drawn []Drawn, want []int) ([]Spread, error) {
	out := make([]Spread, len(want))
	if len(drawn) == 0 {
		return out, nil
	}
	n := len(drawn[0].Values)
	for _, d := range drawn {
		if len(d.Values) != n {
			return nil, fmt.Errorf("trials: leaf %q has %d draws, want %d", g.leaves[d.Slot].Name, len(d.Values), n)
		}
	}
	b := benches.Get().(*bench)
	defer benches.Put(b)
	b.begin(g, v, drawn, want)
	b.recall(g, drawn, n)
	samples := b.samples(len(want), n)
	for i, s := range want {
		out[i].Moves = b.moves[s]
	}
	for from := 0; from < n; from += blockTrials {
		to := min(from+blockTrials, n)
		b.block(g, drawn, from, to)
		for i, s := range want {
			if out[i].Moves {
				b.collect(s, to-from, samples[i], &out[i])
			}
		}
	}
	for i := range want {
		if s := samples[i][:out[i].Numbers]; len(s) > 0 {
			p := b.pick.percentiles(s, [...]float64{0.1, 0.5, 0.9})
			out[i].Low, out[i].Median, out[i].High = p[0], p[1], p[2]
		}
	}
	return out, nil
}

// Samples evaluates the graph in the first n trials and gives the wanted slots' values, per trial. The
// vector v is left as it was.
func (g *Graph) Samples(v []scoring.Value, drawn []Drawn, want []int, n int) [][]scoring.Value {
	for _, d := range drawn {
		n = min(n, len(d.Values))
	}
	b := benches.Get().(*bench)
	defer benches.Put(b)
	b.begin(g, v, drawn, want)
	b.recall(g, drawn, n)
	out := make([][]scoring.Value, n)
	rows := make([]scoring.Value, n*len(want))
	for from := 0; from < n; from += blockTrials {
		to := min(from+blockTrials, n)
		b.block(g, drawn, from, to)
		for t := range to - from {
			row := rows[(from+t)*len(want):][:len(want):len(want)]
			for i, s := range want {
				row[i] = b.value(s, t)
			}
			out[from+t] = row
		}
	}
	return out
}

// blockTrials is how many trials are reckoned quantity by quantity: few enough for the columns to stay near
// the processor, enough for the cost of preparing a quantity to vanish.
const blockTrials = 256

// form says how a slot's values are held for a block of trials.
type form uint8

const (
	still   form = iota // the same value in every trial
	numbers             // a number in every trial
	mixed               // no number in some trials
)

// bench holds the columns of a block of trials. Quantities are pure, so that one whose inputs stand still is
// evaluated once, and the order of evaluation changes no digit.
type bench struct {
	moves []bool // by slot: some drawn leaf reaches it
	hot   []int  // quantities to evaluate, in order: those that move and that a wanted one needs
	form  []form
	one   []scoring.Value   // of those that stand still
	x     [][]float64       // numbers; of mixed ones 0 where there is none
	val   [][]scoring.Value // of mixed ones
	own   [][]float64       // the room of x that belongs to the bench
	of    *Graph            // whose memories these are
	kept  []memories        // by quantity
	calls int
	here  []origin // by slot: where a column that candidates share comes from

	need   []bool
	in     []scoring.Value
	arg    []float64
	at     []int // inputs that do not stand still
	room   [mostInputs]float64
	sample [][]float64
	pick   picker
}

var benches = sync.Pool{New: func() any { return &bench{} }}

func sized[T any](a []T, n int) []T {
	if cap(a) < n {
		return make([]T, n)
	}
	return a[:n]
}

// samples gives room for k samples of n numbers.
func (b *bench) samples(k, n int) [][]float64 {
	b.sample = sized(b.sample, k)
	for i := range b.sample {
		b.sample[i] = sized(b.sample[i], n)
	}
	return b.sample
}

// begin takes the central vector and finds what must be evaluated.
func (b *bench) begin(g *Graph, v []scoring.Value, drawn []Drawn, want []int) {
	n, leaves := g.Size(), len(g.leaves)
	b.moves, b.need = sized(b.moves, n), sized(b.need, n)
	clear(b.moves)
	clear(b.need)
	b.form, b.one = sized(b.form, n), sized(b.one, n)
	clear(b.form)
	copy(b.one, v)
	b.x, b.own, b.val = sized(b.x, n), sized(b.own, n), sized(b.val, n)
	for _, d := range drawn {
		b.moves[d.Slot] = true
	}
	for _, s := range want {
		b.need[s] = true
	}
	for i := len(g.quantities) - 1; i >= 0; i-- {
		if b.need[leaves+i] {
			for _, s := range g.inputs[i] {
				b.need[s] = true
			}
		}
	}
	b.hot = b.hot[:0]
	for i := range g.quantities {
		for _, s := range g.inputs[i] {
			if b.moves[s] {
				b.moves[leaves+i] = true
				if b.need[leaves+i] {
					b.hot = append(b.hot, i)
				}
				break
			}
		}
	}
}

// block sets the drawn leaves to the trials from..to and evaluates what depends on them.
func (b *bench) block(g *Graph, drawn []Drawn, from, to int) {
	for _, d := range drawn {
		b.form[d.Slot], b.x[d.Slot] = numbers, d.Values[from:to]
	}
	for _, i := range b.hot {
		m := b.kept[i].now
		slot := len(g.leaves) + i
		if m != nil && m.full {
			b.form[slot], b.x[slot] = numbers, m.col[from:to]
			continue
		}
		b.quantity(g, i, to-from)
		if m != nil {
			m.keep(b, slot, from, to)
		}
	}
}

// origin is where the column of a slot comes from: drawn values that candidates share, or a memory in one of its
// states. The zero origin is a column of this candidate alone.
type origin struct {
	values *float64
	state  int
}

// memory keeps the column of a quantity that follows from shared leaves alone, with what it was reckoned from.
type memory struct {
	from  []origin
	still []scoring.Value
	col   []float64
	state int  // tells the columns apart that lay in the same room
	full  bool // the column is whole
	odd   bool // some trial gave no number
	made  int  // call in which it was made, and the last one in which it was of use again; 0 for never
	hit   int
}

// memories are what is kept of a quantity: neighbouring candidates are of different technologies.
type memories struct {
	all [3]memory
	now *memory // for this candidate; nil where not all moving inputs are shared
}

// find gives the memory of the same inputs, else the room of the one that was of least use.
func (ms *memories) find(b *bench, inputs []int, n int) *memory {
	least := &ms.all[0]
	for i := range ms.all {
		m := &ms.all[i]
		same := m.full && len(m.col) == n
		for k, s := range inputs {
			same = same && m.from[k] == b.here[s] && (b.moves[s] || alike(m.still[k], b.one[s]))
		}
		if same {
			m.hit = b.calls
			return m
		}
		if m.hit < least.hit || m.hit == least.hit && m.made < least.made {
			least = m
		}
	}
	m := least
	m.from, m.still, m.col = m.from[:0], m.still[:0], sized(m.col, n)
	for _, s := range inputs {
		m.from, m.still = append(m.from, b.here[s]), append(m.still, b.one[s])
	}
	m.state++
	m.full, m.odd, m.made, m.hit = false, false, b.calls, 0
	return m
}

// keep takes a block into the column.
func (m *memory) keep(b *bench, slot, from, to int) {
	switch col := m.col[from:to]; b.form[slot] {
	case numbers:
		copy(col, b.x[slot][:to-from])
	case still:
		if m.odd = m.odd || !b.one[slot].OK(); !m.odd {
			for t := range col {
				col[t] = b.one[slot].X
			}
		}
	default:
		m.odd = true
	}
	if to == len(m.col) && !m.odd {
		m.full = true
	}
}

// alike compares values to the bit.
func alike(a, b scoring.Value) bool {
	return a.State == b.State && a.Why == b.Why && math.Float64bits(a.X) == math.Float64bits(b.X)
}

// recall finds which quantities of the candidate follow from shared leaves alone, and which of them were reckoned from
// the same before.
func (b *bench) recall(g *Graph, drawn []Drawn, n int) {
	if b.of != g {
		b.of, b.kept = g, make([]memories, len(g.quantities))
	}
	b.calls++
	b.here = sized(b.here, g.Size())
	clear(b.here)
	for _, d := range drawn {
		if d.Shared && n > 0 {
			b.here[d.Slot] = origin{values: &d.Values[0]}
		}
	}
	for _, i := range b.hot {
		ms, inputs := &b.kept[i], g.inputs[i]
		ms.now = nil
		shared := true
		for _, s := range inputs {
			shared = shared && (!b.moves[s] || b.here[s] != origin{})
		}
		if !shared {
			continue
		}
		ms.now = ms.find(b, inputs, n)
		b.here[len(g.leaves)+i] = origin{values: &ms.now.col[0], state: ms.now.state}
	}
}

// value gives a slot's value in trial t of the block.
func (b *bench) value(slot, t int) scoring.Value {
	switch b.form[slot] {
	case numbers:
		return scoring.Value{X: b.x[slot][t]}
	case mixed:
		return b.val[slot][t]
	}
	return b.one[slot]
}

// quantity evaluates quantity i in the n trials of the block.
func (b *bench) quantity(g *Graph, i, n int) {
	q, inputs, slot := &g.quantities[i], g.inputs[i], len(g.leaves)+i
	b.in, b.arg, b.at = sized(b.in, len(inputs)), sized(b.arg, len(inputs)), b.at[:0]
	plain, missing, none := q.Eval.Numbers != nil, false, false
	for k, s := range inputs {
		switch b.form[s] {
		case still:
			v := b.one[s]
			b.in[k], b.arg[k] = v, v.X
			switch v.State {
			case scoring.Number:
			case scoring.None:
				none = true
			default:
				missing = true
			}
			continue
		case mixed:
			plain = false
		}
		b.in[k], b.arg[k] = scoring.Value{}, 0
		if n := q.Eval.Pairs; k >= n && n > 0 && b.nought(inputs[k-n]) && b.form[s] == numbers {
			continue // a factor of nothing
		}
		b.at = append(b.at, k)
	}
	if zero := len(q.Eval.Zero) > 0 && plain && !missing; zero {
		for _, k := range q.Eval.Zero {
			zero = zero && b.nought(inputs[k])
		}
		if zero {
			b.at = b.at[:0]
		}
	}
	// What has Numbers is made by scoring.Plain, Guarded or NoneIsZero: missing data decide the answer
	// whatever the numbers are, and an effect that does not arise either decides it too or counts as zero.
	once := len(b.at) == 0 || plain && missing
	if plain && none && !once {
		once = q.Eval.Values(b.in).State == scoring.None
	}
	if once {
		b.form[slot], b.one[slot] = still, q.Eval.Values(b.in)
		return
	}
	b.own[slot] = sized(b.own[slot], blockTrials)
	out := b.own[slot][:n]
	b.x[slot] = out
	first := 0
	if plain {
		first = b.fast(q.Eval.Numbers, inputs, out)
	}
	if first == n {
		b.settle(slot, out)
		return
	}
	b.slow(&q.Eval, inputs, slot, out, first)
}

// nought reports whether a slot is zero in every trial.
func (b *bench) nought(slot int) bool {
	v := b.one[slot]
	return b.form[slot] == still && v.State == scoring.Number && v.X == 0
}

// fast fills a column with numbers from functions of numbers and gives how many trials it did: all, or those
// before the first that gives no finite number.
func (b *bench) fast(f func(x []float64) (float64, bool), inputs []int, out []float64) int {
	if len(inputs) > mostInputs {
		return 0
	}
	room := &b.room
	copy(room[:], b.arg)
	x := room[:len(inputs)]
	var cols [mostInputs][]float64
	var at [mostInputs]int
	for i, k := range b.at {
		at[i], cols[i] = k, b.x[inputs[k]][:len(out)]
	}
	// Most quantities have few inputs that move; the cases differ in speed alone.
	switch k0, k1, k2 := at[0], at[1], at[2]; len(b.at) {
	case 1:
		for t, x0 := range cols[0] {
			room[k0%mostInputs] = x0
			y, ok := f(x)
			if !ok || y-y != 0 {
				return t
			}
			out[t] = y
		}
	case 2:
		c1 := cols[1][:len(out)]
		for t, x0 := range cols[0][:len(out)] {
			room[k0%mostInputs], room[k1%mostInputs] = x0, c1[t]
			y, ok := f(x)
			if !ok || y-y != 0 {
				return t
			}
			out[t] = y
		}
	case 3:
		c1, c2 := cols[1][:len(out)], cols[2][:len(out)]
		for t, x0 := range cols[0][:len(out)] {
			room[k0%mostInputs], room[k1%mostInputs], room[k2%mostInputs] = x0, c1[t], c2[t]
			y, ok := f(x)
			if !ok || y-y != 0 {
				return t
			}
			out[t] = y
		}
	default:
		moving, places := cols[:len(b.at)], at[:len(b.at)]
		for t := range out {
			for i, c := range moving {
				room[places[i]%mostInputs] = c[t]
			}
			y, ok := f(x)
			if !ok || y-y != 0 {
				return t
			}
			out[t] = y
		}
	}
	return len(out)
}

// mostInputs is how many inputs a quantity may have to be reckoned in the fast way.
const mostInputs = 32

// settle marks a column of numbers, as standing still where all are the same.
func (b *bench) settle(slot int, x []float64) {
	b.form[slot] = numbers
	one := math.Float64bits(x[0])
	for _, y := range x[1:] {
		if math.Float64bits(y) != one {
			return
		}
	}
	b.form[slot], b.one[slot] = still, scoring.Value{X: x[0]}
}

// slow fills a column from the trial first on, whatever the states of inputs and answers.
func (b *bench) slow(e *scoring.Eval, inputs []int, slot int, out []float64, first int) {
	b.val[slot] = sized(b.val[slot], blockTrials)
	val := b.val[slot][:len(out)]
	for t := range first {
		val[t] = scoring.Value{X: out[t]}
	}
	odd := false
	for t := first; t < len(out); t++ {
		all := e.Numbers != nil
		for _, k := range b.at {
			if v := b.value(inputs[k], t); v.OK() {
				b.in[k], b.arg[k] = v, v.X
			} else {
				b.in[k], all = v, false
			}
		}
		for _, v := range b.in {
			all = all && v.OK()
		}
		if all {
			if y, ok := e.Numbers(b.arg); ok && y-y == 0 {
				out[t], val[t] = y, scoring.Value{X: y}
				continue
			}
		}
		v := e.Values(b.in)
		out[t], val[t] = v.X, v
		odd = odd || !v.OK()
	}
	if !odd {
		b.settle(slot, out)
		return
	}
	b.form[slot] = mixed
	for _, v := range val[1:] {
		if v != val[0] {
			return
		}
	}
	b.form[slot], b.one[slot] = still, val[0]
}

// collect adds a slot's numbers of a block of n trials to its sample and counts the rest.
func (b *bench) collect(slot, n int, sample []float64, out *Spread) {
	to := sample[out.Numbers:]
	switch b.form[slot] {
	case numbers:
		copy(to, b.x[slot][:n])
		out.Numbers += n
	case still:
		switch v := b.one[slot]; v.State {
		case scoring.Number:
			for t := range n {
				to[t] = v.X
			}
			out.Numbers += n
		case scoring.Never:
			out.Nevers += n
		}
	case mixed:
		for _, v := range b.val[slot][:n] {
			switch v.State {
			case scoring.Number:
				sample[out.Numbers] = v.X
				out.Numbers++
			case scoring.Never:
				out.Nevers++
			}
		}
	}
}

// picker finds order statistics of large samples.
type picker struct {
	bucket []uint8
	few    []float64
}

const pickBuckets = 256

// percentiles gives the values at the positions (n-1)p of the sorted sample, linear between neighbours. The
// sample is sorted into buckets of equal width, and only those that hold a position are sorted within. It may
// reorder the sample.
func (k *picker) percentiles(a []float64, p [3]float64) (out [3]float64) {
	n := len(a)
	lo, hi := a[0], a[0]
	for _, v := range a {
		if v < lo {
			lo = v
		}
		if v > hi {
			hi = v
		}
	}
	scale := pickBuckets / (hi - lo)
	if n < 4*pickBuckets || !(scale > 0) || math.IsInf(scale, 0) || !k.pick(a, p, lo, scale, &out) {
		for i := range p {
			out[i] = percentile(a, p[i])
		}
	}
	return out
}

// pick reports whether the buckets parted the sample well enough to be worth while.
func (k *picker) pick(a []float64, p [3]float64, lo, scale float64, out *[3]float64) bool {
	n := len(a)
	k.bucket = sized(k.bucket, n)
	bucket := k.bucket
	var count [pickBuckets]int
	for i, v := range a {
		// Rounding keeps the order of v, so that of the buckets is that of the values.
		j := uint8(min(int((v-lo)*scale), pickBuckets-1))
		bucket[i] = j
		count[j]++
	}
	var start, skipped [pickBuckets]int // values in lower buckets, and how many of those are not picked
	var wanted [pickBuckets]bool
	sum := 0
	for j, c := range count {
		start[j] = sum
		for i := range p {
			at := int(math.Floor(float64(n-1) * p[i]))
			for _, r := range [2]int{at, min(at+1, n-1)} {
				wanted[j] = wanted[j] || r >= sum && r < sum+c
			}
		}
		sum += c
	}
	total := 0
	for j, c := range count {
		skipped[j] = start[j] - total
		if wanted[j] {
			total += c
		}
	}
	if total > n/4 {
		return false
	}
	few := sized(k.few, total)
	k.few = few
	m := 0
	for i, j := range bucket {
		if wanted[j] {
			few[m] = a[i]
			m++
		}
	}
	slices.Sort(few)
	order := func(r int) float64 {
		j := 0
		for j+1 < pickBuckets && start[j+1] <= r {
			j++
		}
		return few[r-skipped[j]]
	}
	for i := range p {
		at := float64(n-1) * p[i]
		r := int(math.Floor(at))
		low := order(r)
		if r+1 >= n {
			out[i] = low
			continue
		}
		high := order(r + 1)
		out[i] = low + float64((at-float64(r))*(high-low))
	}
	return true
}

// percentile gives the value at position (n-1)p of the sorted sample, linear between neighbours. It
// reorders the sample, which is cheaper than sorting it.
func percentile(a []float64, p float64) float64 {
	at := float64(len(a)-1) * p
	i := int(math.Floor(at))
	low := nth(a, i)
	if i+1 >= len(a) {
		return low
	}
	high := slices.Min(a[i+1:]) // nth leaves what is not less behind i
	return low + float64((at-float64(i))*(high-low))
}

// nth puts the k-th smallest value at index k, smaller ones before and larger ones behind it (Hoare 1961,
// algorithm 65), and gives it.
func nth(a []float64, k int) float64 {
	lo, hi := 0, len(a)-1
	for lo < hi {
		pivot := a[(lo+hi)/2]
		i, j := lo, hi
		for i <= j {
			for a[i] < pivot {
				i++
			}
			for a[j] > pivot {
				j--
			}
			if i <= j {
				a[i], a[j] = a[j], a[i]
				i++
				j--
			}
		}
		switch {
		case k <= j:
			hi = j
		case k >= i:
			lo = i
		default:
			return a[k]
		}
	}
	return a[k]
}
