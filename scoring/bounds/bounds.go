// Package bounds checks that numbers lie within the range that a formula is valid for.
package bounds

import (
	"errors"
	"fmt"
	"math"
)

// ErrInput is wrapped by every error about a number outside its range.
var ErrInput = errors.New("input outside its range")

// Error says of a number what was wanted in its place.
func Error(name string, v float64, want string) error {
	return fmt.Errorf("%s is %v, want %s: %w", name, v, want, ErrInput)
}

// Finite reports whether v is neither NaN nor infinite.
func Finite(v float64) bool { return v-v == 0 } // NaN and infinities less themselves are NaN

// NonNegative asks for a finite number of 0 or more.
func NonNegative(name string, v float64) error {
	if v >= 0 && v <= math.MaxFloat64 {
		return nil
	}
	return Error(name, v, "0 or more")
}

// AllNonNegative reports whether all are finite numbers of 0 or more: a quick question before each is asked for a
// fault of its own.
func AllNonNegative(v ...float64) bool {
	for _, x := range v {
		if !(x >= 0 && x <= math.MaxFloat64) {
			return false
		}
	}
	return true
}

// Positive asks for a finite number above 0.
func Positive(name string, v float64) error {
	if v > 0 && v <= math.MaxFloat64 {
		return nil
	}
	return Error(name, v, "above 0")
}
