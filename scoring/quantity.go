package scoring

// Quantity is one number of the reckoning with the formula that gives it. Quantities form a graph:
// the inputs are names of other quantities or of leaves.
type Quantity struct {
	Name    string
	Unit    string // "1" for a pure number
	Title   string
	Formula string // for people, in the names of the inputs
	Source  string // publication or standard the formula stands in; "identity" for arithmetic
	Inputs  []string
	// Eval gives the value from the inputs' values, in the order of Inputs.
	Eval Eval
}

// Eval is a pure function of a quantity's inputs. Values serves any states; Numbers, where there is one,
// gives the same when all inputs are numbers, and ok false where Values must be asked.
//
// Pairs and Zero say where inputs do not matter, so that trials need not vary them: with Pairs above 0 input Pairs+i is
// only ever a factor of input i, and where all inputs in Zero are zero the value is zero whatever the others are.
type Eval struct {
	Values  func(in []Value) Value
	Numbers func(x []float64) (y float64, ok bool)
	Pairs   int
	Zero    []int
}

// Where gives an evaluation that is zero where the given inputs are.
func (e Eval) Where(zero ...int) Eval {
	e.Zero = zero
	return e
}

// Sum is the evaluation of Dot.
func Sum(n int) Eval {
	e := Plain(Dot(n))
	e.Pairs = n
	return e
}

// Custom makes an Eval of a function that looks at the states itself.
func Custom(f func(in []Value) Value) Eval { return Eval{Values: f} }

// known gives the numbers of values that are all numbers.
func known(in []Value, buf []float64) []float64 {
	for _, v := range in {
		buf = append(buf, v.X)
	}
	return buf
}

// LeafKind says where a leaf's value comes from.
type LeafKind string

// The kinds of leaf.
const (
	FactLeaf    LeafKind = "fact"    // measured from the layers or found by fitting
	FactorLeaf  LeafKind = "factor"  // a cited parameter
	SettingLeaf LeafKind = "setting" // entered or accepted by the user
)

// Leaf is an input of the reckoning that is not itself reckoned.
type Leaf struct {
	Name  string
	Unit  string
	Title string
	Kind  LeafKind
}

// Plain wraps a function of numbers: when an input is not a number, the answer is that input's state,
// the first one in the order of inputs, with a state that is missing data before one that is None.
func Plain(f func(x []float64) float64) Eval {
	return Eval{
		Values: func(in []Value) Value {
			if v, missing := FirstMissing(in); missing {
				return v
			}
			var buf [24]float64
			return Num(f(known(in, buf[:0])))
		},
		Numbers: func(x []float64) (float64, bool) { return f(x), true },
	}
}

// FirstMissing gives the value that decides when not all inputs are numbers: data that are missing
// (Unknown, NotAssessed, NotSet) come before Never, and Never before None and Class.
func FirstMissing(in []Value) (Value, bool) {
	best, rank := Value{}, 0
	for _, v := range in {
		r := 0
		switch v.State {
		case Unknown, NotAssessed:
			r = 4
		case NotSet:
			r = 3
		case Never:
			r = 2
		case None, Class:
			r = 1
		}
		if r > rank {
			best, rank = v, r
		}
	}
	return best, rank > 0
}

// Consequence is one quantity that follows from a candidate.
type Consequence struct {
	Key     string
	Account Account
	Unit    string
	State   State
	Why     string // code, setting's key or class
	Low     float64
	Central float64
	High    float64
	Median  float64 // of the trials; equal to Central where there are none
	Range   Range
	Quality string   // how the value was come by, in a few words
	Notices []string // codes
}

// Guarded wraps a formula that may refuse its input: an error becomes Unknown with the code.
func Guarded(code string, f func(x []float64) (float64, error)) Eval {
	return Eval{
		Values: func(in []Value) Value {
			if v, missing := FirstMissing(in); missing {
				return v
			}
			var buf [24]float64
			y, err := f(known(in, buf[:0]))
			if err != nil {
				return UnknownBecause(code)
			}
			return Num(y)
		},
		Numbers: func(x []float64) (float64, bool) {
			y, err := f(x)
			return y, err == nil
		},
	}
}

// NoneIsZero wraps an evaluation in which an effect that does not arise adds nothing.
func NoneIsZero(e Eval) Eval {
	return Eval{Numbers: e.Numbers, Pairs: e.Pairs, Zero: e.Zero, Values: func(in []Value) Value {
		var buf [24]Value
		y := buf[:0]
		for _, v := range in {
			if v.State == None {
				v = Value{}
			}
			y = append(y, v)
		}
		return e.Values(y)
	}}
}

// Dot gives a function that sums amount × factor over n amounts that are followed by their n factors.
func Dot(n int) func(x []float64) float64 {
	return func(x []float64) float64 {
		sum := 0.0
		for i := range n {
			sum += float64(x[i] * x[n+i])
		}
		return sum
	}
}
