package grid

import (
	"errors"
	"fmt"
	"groundtally/scoring/bounds"
	"math"
)

// HalfSineLost is the share of a clear day's energy that an export limit takes when the day is a half
// sine that peaks at the rating, (2·cos a − c(π − 2a))/2, a = asin c.
//
// c limitFrac, limit over rating, 0 to 1. A year loses much less: few hours come near the rating.
func HalfSineLost(limitFrac float64) (float64, error) {
	if err := unitShare("limit", limitFrac); err != nil {
		return 0, err
	}
	c := limitFrac
	a := math.Asin(c)
	return (float64(2*math.Cos(a)) - float64(c*(math.Pi-2*a))) / 2, nil
}

// LimitResult is what an export limit does to a profile.
type LimitResult struct {
	LostFrac     float64 // share of the energy
	LimitedShare float64 // share of the time, by weight
}

// LimitedShare cuts power values at a limit, lost = Σw·max(0, P−L)/ΣwP. Without weights all values count
// alike. Add the plants behind one limit hour by hour first. Hourly means understate the clipping of
// solar.
func LimitedShare(power, weight []float64, limit float64) (LimitResult, error) {
	if err := bounds.NonNegative("limit", limit); err != nil {
		return LimitResult{}, err
	}
	if weight != nil && len(weight) != len(power) {
		return LimitResult{}, bounds.Error("number of weights", float64(len(weight)), "as many as power values")
	}
	var all, lost, time, cut float64
	for i, p := range power {
		w := 1.0
		if weight != nil {
			w = weight[i]
		}
		if err := errors.Join(bounds.NonNegative("power", p), bounds.NonNegative("weight", w)); err != nil {
			return LimitResult{}, err
		}
		all += float64(w * p)
		time += w
		if p > limit {
			lost += float64(w * (p - limit))
			cut += w
		}
	}
	if all == 0 {
		return LimitResult{}, bounds.Error("energy", all, "above 0")
	}
	return LimitResult{LostFrac: lost / all, LimitedShare: cut / time}, nil
}

// ShareRule says how spare capacity is divided.
type ShareRule string

// The rules of sharing.
const (
	InOrder ShareRule = "in_order" // first come, first served, in the order of the requests
	ProRata ShareRule = "pro_rata" // each the same share of its request
	Equal   ShareRule = "equal"    // each the same amount, as far as it asks for it
)

// ShareSpare divides spare capacity among requests.
//
//	InOrder  g_i = min(r_i, C − Σ_{j<i} g_j)
//	ProRata  g_i = r_i·min(1, C/Σr)
//	Equal    g_i = min(r_i, h) with Σg = min(C, Σr)
//
// minimum, when not nil, is the least grant that a candidate can use; a grant below it becomes zero and
// goes back to the pool. Of such grants the one that reaches the smallest part of its minimum goes first,
// ties together, so that pro rata and equal shares do not depend on the order of the requests. Always
// Σg ≤ C and g_i ≤ r_i. Rank the candidates on what they would get alone: a rank that follows the grants
// is circular.
func ShareSpare(spare float64, requests, minimum []float64, rule ShareRule) ([]float64, error) {
	if err := bounds.NonNegative("spare capacity", spare); err != nil {
		return nil, err
	}
	if minimum != nil && len(minimum) != len(requests) {
		return nil, bounds.Error("number of minimums", float64(len(minimum)), "as many as requests")
	}
	least := func(i int) float64 {
		if minimum == nil {
			return 0
		}
		return minimum[i]
	}
	for i, r := range requests {
		if err := errors.Join(bounds.NonNegative("request", r), bounds.NonNegative("minimum", least(i))); err != nil {
			return nil, err
		}
	}
	in := make([]bool, len(requests))
	for i := range in {
		in[i] = true
	}
	grants := make([]float64, len(requests))
	if rule == InOrder {
		left := spare
		for i, r := range requests {
			g := math.Min(r, left)
			if g < least(i) {
				continue
			}
			grants[i] = g
			left -= g
		}
		return grants, nil
	}
	for {
		switch rule {
		case ProRata:
			proRata(spare, requests, in, grants)
		case Equal:
			waterFill(spare, requests, in, grants)
		default:
			return nil, fmt.Errorf("rule of sharing %q: %w", rule, ErrInput)
		}
		worst := 1.0
		for i := range grants {
			if in[i] && least(i) > 0 {
				worst = math.Min(worst, grants[i]/least(i))
			}
		}
		if worst >= 1 {
			return grants, nil
		}
		for i := range grants {
			if in[i] && least(i) > 0 && grants[i]/least(i) == worst {
				in[i] = false
			}
		}
	}
}

func proRata(spare float64, r []float64, in []bool, g []float64) {
	var sum float64
	for i := range r {
		if in[i] {
			sum += r[i]
		}
	}
	k := 1.0
	if sum > spare {
		k = spare / sum
	}
	for i := range r {
		g[i] = 0
		if in[i] {
			g[i] = r[i] * k
		}
	}
}

func waterFill(spare float64, r []float64, in []bool, g []float64) {
	open := make([]bool, len(r))
	n := 0
	for i := range r {
		g[i] = 0
		if in[i] {
			open[i] = true
			n++
		}
	}
	left := spare
	for n > 0 {
		level := left / float64(n)
		full := false
		for i := range r {
			if open[i] && r[i] <= level {
				g[i], open[i], full = r[i], false, true
				left -= r[i]
				n--
			}
		}
		if !full {
			for i := range r {
				if open[i] {
					g[i] = level
				}
			}
			return
		}
		left = math.Max(left, 0)
	}
}
