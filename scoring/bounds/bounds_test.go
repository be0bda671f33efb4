package bounds

import (
	"errors"
	"math"
	"testing"
)

func TestNumbersOutsideTheirRangeAreRefused(t *testing.T) {
	for _, c := range []struct {
		v                     float64
		nonNegative, positive bool
	}{{-1, false, false}, {0, true, false}, {math.Copysign(0, -1), true, false}, {1e-300, true, true}, {math.NaN(), false, false}, {math.Inf(1), false, false}, {math.Inf(-1), false, false}} {
		for _, got := range []struct {
			name string
			err  error
			ok   bool
		}{{"0 or more", NonNegative("height", c.v), c.nonNegative}, {"above 0", Positive("height", c.v), c.positive}} {
			if (got.err == nil) != got.ok || (got.err != nil && !errors.Is(got.err, ErrInput)) {
				t.Errorf("%v, %s: %v", c.v, got.name, got.err)
			}
		}
	}
	if got := Positive("height", -2).Error(); got != "height is -2, want above 0: input outside its range" {
		t.Errorf("the error says %q", got)
	}
}
