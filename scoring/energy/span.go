package energy

import "groundtally/scoring/bounds"

// Span is a low, a central and a high value of one thing.
type Span struct{ Low, Central, High float64 }

// Same is the span of a value without a range.
func Same(x float64) Span { return Span{x, x, x} }

func (s Span) check(name string, least, most float64) error {
	for _, v := range []float64{s.Low, s.Central, s.High} {
		if !bounds.Finite(v) || v < least || v > most {
			return bounds.Error(name, v, "a finite number within its range")
		}
	}
	if s.Low > s.Central || s.Central > s.High {
		return bounds.Error(name, s.Central, "between its low and its high")
	}
	return nil
}
