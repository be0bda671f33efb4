package energy

import (
	"fmt"
	"groundtally/scoring/bounds"
	"slices"
)

// DensityPoint is one layout of the crowding curve: units per hectare, energy and input per hectare over
// the life, both in the currency of the caller.
type DensityPoint struct {
	UnitsPerHa    float64
	EnergyMJPerHa float64
	InputMJPerHa  float64
}

// DensityOptima are the three best densities of a crowding curve. AtEnd tells that the best sampled
// layout is the first or the last, so that the true one may lie outside the sweep.
type DensityOptima struct {
	Return, Net, Energy                   float64 // units per hectare
	BestReturn, BestNetMJPerHa            float64
	ReturnAtEnd, NetAtEnd, EnergyMaxAtEnd bool
}

// FindDensityOptima marks where the return E/I, the net energy E − w·I and the energy E of a crowding
// curve are highest.
//
// The best sampled point is refined by the parabola through it and its two neighbours, which is exact
// for a parabola and off by the order of the square of the step otherwise. w inputWeight is 1 for net
// energy as accounted and η_G for net energy as electricity. At least three points, in rising density,
// with inputs above zero. For a concave E whose best return is 1 or more the optima stand in the order
// return, net, energy: the marginal return equals the average at the first, 1 (or η_G) at the second, 0
// at the third.
func FindDensityOptima(points []DensityPoint, inputWeight float64) (DensityOptima, error) {
	if len(points) < 3 {
		return DensityOptima{}, fmt.Errorf("%d layouts, want 3 or more: %w", len(points), ErrInput)
	}
	if !(inputWeight > 0) || !bounds.Finite(inputWeight) {
		return DensityOptima{}, bounds.Error("weight of the input", inputWeight, "above 0")
	}
	n := make([]float64, len(points))
	ret, net, en := slices.Clone(n), slices.Clone(n), slices.Clone(n)
	for i, p := range points {
		if !bounds.Finite(p.UnitsPerHa) || !bounds.Finite(p.EnergyMJPerHa) || !bounds.Finite(p.InputMJPerHa) || !(p.InputMJPerHa > 0) {
			return DensityOptima{}, fmt.Errorf("layout %d: %w", i, bounds.Error("input", p.InputMJPerHa, "finite numbers and input above 0"))
		}
		if i > 0 && p.UnitsPerHa <= points[i-1].UnitsPerHa {
			return DensityOptima{}, fmt.Errorf("layout %d: %w", i, bounds.Error("density", p.UnitsPerHa, "rising values"))
		}
		n[i] = p.UnitsPerHa
		ret[i] = p.EnergyMJPerHa / p.InputMJPerHa
		net[i] = p.EnergyMJPerHa - float64(inputWeight*p.InputMJPerHa)
		en[i] = p.EnergyMJPerHa
	}
	var o DensityOptima
	o.Return, o.BestReturn, o.ReturnAtEnd = peak(n, ret)
	o.Net, o.BestNetMJPerHa, o.NetAtEnd = peak(n, net)
	o.Energy, _, o.EnergyMaxAtEnd = peak(n, en)
	return o, nil
}

// peak gives the place and height of the maximum; of equal samples the sparser wins.
func peak(x, y []float64) (at, top float64, end bool) {
	k := 0
	for i := range y {
		if y[i] > y[k] {
			k = i
		}
	}
	if k == 0 || k == len(y)-1 {
		return x[k], y[k], true
	}
	// Newton's form of the parabola through the three points.
	h1, h2 := x[k]-x[k-1], x[k+1]-x[k]
	s1, s2 := (y[k]-y[k-1])/h1, (y[k+1]-y[k])/h2
	c := (s2 - s1) / (h1 + h2)
	if !(c < 0) {
		return x[k], y[k], false
	}
	b := (float64(s1*h2) + float64(s2*h1)) / (h1 + h2) // slope at x[k]
	at = x[k] - b/(2*c)
	return at, y[k] - b*b/(4*c), false
}
