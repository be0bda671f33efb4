package scoring

import "math"

// State says what stands in place of a number, or that a number is there.
type State uint8

// The states of a value. They are states of their own: none of them is ever read as zero.
const (
	Number      State = iota // a finite number
	Unknown                  // the data do not give it; Why holds a code
	NotSet                   // a value that the user must enter is missing; Why holds the setting's key
	None                     // the technology or place has no such effect; scores as best; Why holds a code
	Never                    // a payback that never comes; scores as worst
	Class                    // a class by its own words, in Why
	NotAssessed              // this program does not look at it
)

var stateNames = [...]string{"number", "unknown", "not set", "none", "never", "class", "not assessed"}

func (s State) String() string { return stateNames[s] }

// Value is a number or the state that stands in its place.
type Value struct {
	State State
	X     float64 // the number when State is Number, else 0
	Why   string
}

// Num makes a number. A value that is not finite becomes Unknown with the code "not_finite", so that
// no NaN crosses a border.
func Num(x float64) Value {
	if math.IsNaN(x) || math.IsInf(x, 0) {
		return Value{State: Unknown, Why: "not_finite"}
	}
	return Value{X: x}
}

// UnknownBecause, NotSetKey, NoneBecause and NeverValue make the other states.
func UnknownBecause(code string) Value { return Value{State: Unknown, Why: code} }
func NotSetKey(setting string) Value   { return Value{State: NotSet, Why: setting} }
func NoneBecause(code string) Value    { return Value{State: None, Why: code} }
func NeverValue() Value                { return Value{State: Never} }

// OK reports whether the value is a number.
func (v Value) OK() bool { return v.State == Number }

// Range says what the low and the high of a consequence mean.
type Range string

// The meanings a range may have.
const (
	P10P90         Range = "p10_p90"         // tenth and ninetieth percentile of the trials
	Bounds         Range = "bounds"          // never outside, as far as the model goes
	Corners        Range = "corners"         // all inputs low, all inputs high: not a percentile
	LayerTolerance Range = "layer_tolerance" // from the stated tolerance of the layers' positions
	NoRange        Range = "none"            // no uncertainty is stated
)

// Account is a family of consequences that is never merged silently with another.
type Account string

// The accounts, in the order in which they are shown.
const (
	Energy     Account = "energy"
	Land       Account = "land"
	Climate    Account = "climate"
	Neighbours Account = "neighbours"
	Grid       Account = "grid"
	Own        Account = "own"
)

// Accounts lists the accounts in the order in which they are shown.
func Accounts() []Account { return []Account{Energy, Land, Climate, Neighbours, Grid, Own} }
