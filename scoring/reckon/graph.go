package reckon

import (
	"fmt"
	"sort"

	"groundtally/scoring"
)

// Graph is a checked set of quantities in an order in which every quantity stands after its inputs.
type Graph struct {
	leaves     []scoring.Leaf
	quantities []scoring.Quantity // in evaluation order
	slot       map[string]int     // leaves first, then quantities
	inputs     [][]int            // slots, per quantity
}

// New checks the quantities and puts them in order. It refuses names that stand twice, inputs that
// nobody gives, and circles.
func New(leaves []scoring.Leaf, quantities []scoring.Quantity) (*Graph, error) {
	g := &Graph{leaves: leaves, slot: make(map[string]int, len(leaves)+len(quantities))}
	for i, l := range leaves {
		if _, dup := g.slot[l.Name]; dup {
			return nil, fmt.Errorf("leaf %q stands twice", l.Name)
		}
		g.slot[l.Name] = i
	}
	byName := make(map[string]scoring.Quantity, len(quantities))
	names := make([]string, 0, len(quantities))
	for _, q := range quantities {
		if _, dup := g.slot[q.Name]; dup {
			return nil, fmt.Errorf("quantity %q is also a leaf", q.Name)
		}
		if _, dup := byName[q.Name]; dup {
			return nil, fmt.Errorf("quantity %q stands twice", q.Name)
		}
		if q.Eval.Values == nil || q.Formula == "" || q.Unit == "" || q.Source == "" {
			return nil, fmt.Errorf("quantity %q lacks its formula, unit, source or function", q.Name)
		}
		byName[q.Name] = q
		names = append(names, q.Name)
	}
	sort.Strings(names)
	const (
		fresh = iota
		open
		done
	)
	mark := make(map[string]int, len(names))
	var visit func(name string) error
	visit = func(name string) error {
		switch mark[name] {
		case done:
			return nil
		case open:
			return fmt.Errorf("quantity %q depends on itself", name)
		}
		mark[name] = open
		q := byName[name]
		for _, in := range q.Inputs {
			if _, isLeaf := g.slot[in]; isLeaf {
				continue
			}
			if _, known := byName[in]; !known {
				return fmt.Errorf("quantity %q needs %q, which nothing gives", name, in)
			}
			if err := visit(in); err != nil {
				return err
			}
		}
		mark[name] = done
		g.quantities = append(g.quantities, q)
		return nil
	}
	for _, n := range names {
		if err := visit(n); err != nil {
			return nil, err
		}
	}
	for i, q := range g.quantities {
		g.slot[q.Name] = len(leaves) + i
	}
	g.inputs = make([][]int, len(g.quantities))
	for i, q := range g.quantities {
		for _, in := range q.Inputs {
			g.inputs[i] = append(g.inputs[i], g.slot[in])
		}
	}
	return g, nil
}

// Leaves gives the leaves in slot order.
func (g *Graph) Leaves() []scoring.Leaf { return g.leaves }

// Slot gives the place of a name in a value vector.
func (g *Graph) Slot(name string) (int, bool) { i, ok := g.slot[name]; return i, ok }

// Size gives the length of a value vector.
func (g *Graph) Size() int { return len(g.leaves) + len(g.quantities) }

// Quantity gives the quantity of a name.
func (g *Graph) Quantity(name string) (scoring.Quantity, bool) {
	i, ok := g.slot[name]
	if !ok || i < len(g.leaves) {
		return scoring.Quantity{}, false
	}
	return g.quantities[i-len(g.leaves)], true
}

// Leaf gives the leaf of a name.
func (g *Graph) Leaf(name string) (scoring.Leaf, bool) {
	i, ok := g.slot[name]
	if !ok || i >= len(g.leaves) {
		return scoring.Leaf{}, false
	}
	return g.leaves[i], true
}

// Central fills the quantities of a value vector whose leaves are set. The vector has length Size.
func (g *Graph) Central(v []scoring.Value) {
	var buf [16]scoring.Value
	for i := range g.quantities {
		v[len(g.leaves)+i] = g.eval(i, v, buf[:0])
	}
}

func (g *Graph) eval(i int, v []scoring.Value, buf []scoring.Value) scoring.Value {
	for _, s := range g.inputs[i] {
		buf = append(buf, v[s])
	}
	return g.quantities[i].Eval.Values(buf)
}

// Reaches gives the slots of the leaves that a quantity depends on, sorted; a leaf reaches itself, and
// a name that is not in the graph reaches nothing.
func (g *Graph) Reaches(name string) []int {
	s, ok := g.slot[name]
	if !ok {
		return nil
	}
	seen := make([]bool, g.Size())
	var visit func(s int)
	visit = func(s int) {
		if seen[s] {
			return
		}
		seen[s] = true
		if s >= len(g.leaves) {
			for _, in := range g.inputs[s-len(g.leaves)] {
				visit(in)
			}
		}
	}
	visit(s)
	var out []int
	for i := range g.leaves {
		if seen[i] {
			out = append(out, i)
		}
	}
	return out
}
