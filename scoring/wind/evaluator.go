package wind

import "slices"

// LayoutDirections is the number of wind directions that is enough to compare layouts; the chosen
// layout is then computed with the full number.
const LayoutDirections = 12

// Evaluator judges layouts of one farm while they are being searched. All energies are those of the new
// machines in a typical year, in MWh, after wakes (of existing machines too) and before other losses.
//
// It remembers the solution of the last layout it was asked about, so that asking for many additions to,
// or moves within, one layout costs little: only the machines that the change reaches are computed
// again. Answers do not depend on what was asked before. Not safe for use by several goroutines at
// once; make one for each.
type Evaluator struct {
	f        *field
	w        [][][]float64
	existing []placed

	at    []Position // the remembered layout
	valid bool
	total float64
	base  []*flow // its solution by direction
	trial *flow
	ms    []placed
}

// NewEvaluator prepares the judge of a farm. In.At and In.Losses play no part.
func NewEvaluator(in FarmInput) (*Evaluator, error) {
	f, _, err := prepareFarm(in)
	if err != nil {
		return nil, err
	}
	e := &Evaluator{f: f, w: f.weights(1), trial: f.newFlow()}
	for _, m := range in.Existing {
		e.existing = append(e.existing, placed{m.At, f.kindOf(m)})
	}
	e.base = make([]*flow, len(f.shares))
	for d := range e.base {
		e.base[d] = f.newFlow()
	}
	return e, nil
}

// Total is the energy of a layout; 0 for none, and for one with a position that is not finite.
func (e *Evaluator) Total(at []Position) float64 {
	if e.valid && slices.Equal(e.at, at) {
		return e.total
	}
	e.at = append(e.at[:0], at...)
	e.ms = append(e.ms[:0], e.existing...)
	e.valid, e.total = true, 0
	for _, p := range at {
		if !p.finite() {
			e.valid = false
			return 0
		}
		e.ms = append(e.ms, placed{at: p})
	}
	for d, fl := range e.base {
		e.f.solve(fl, nil, d, e.ms, -1, e.w)
		e.total += e.own(fl)
	}
	return e.total
}

func (e *Evaluator) own(fl *flow) float64 {
	var sum float64
	for _, x := range fl.energy[len(e.existing):] {
		sum += x
	}
	return sum
}

// Add is the change of Total when a machine at p joins the layout.
func (e *Evaluator) Add(at []Position, p Position) float64 {
	before := e.Total(at)
	if !e.valid || !p.finite() {
		return -before
	}
	e.ms = append(e.ms[:len(e.existing)+len(at)], placed{at: p})
	after := e.retry(len(e.ms) - 1)
	e.ms = e.ms[:len(e.ms)-1]
	return after - before
}

// Move is the change of Total when the machine i of the layout goes to p. Out of range i changes
// nothing.
func (e *Evaluator) Move(at []Position, i int, p Position) float64 {
	before := e.Total(at)
	if i < 0 || i >= len(at) {
		return 0
	}
	if !e.valid || !p.finite() {
		return -before
	}
	m := len(e.existing) + i
	old := e.ms[m]
	e.ms[m].at = p
	after := e.retry(m)
	e.ms[m] = old
	return after - before
}

func (e *Evaluator) retry(moved int) float64 {
	var sum float64
	for d, base := range e.base {
		e.f.solve(e.trial, base, d, e.ms, moved, e.w)
		sum += e.own(e.trial)
	}
	return sum
}
