package params

import "math/rand/v2"

// The smallest and the largest value that a draw can have.
const (
	uMin = 0.5 / (1 << 52)
	uMax = 1 - uMin
)

// Draw gives the value in (0,1) that all factors of a group share in a trial. It depends on nothing but
// its arguments, so trials may run in any order and in parallel. Pass the group of a factor, or its id
// when it has none.
func Draw(seed uint64, group string, trial int) float64 {
	h := text(byte64(fnvOffset, 'g'), group)
	return unit(seed, word(h, uint64(trial)))
}

// DrawSite gives the value in (0,1) of a parameter that is drawn anew for each site.
func DrawSite(seed uint64, site, parameter string, trial int) float64 {
	h := text(byte64(fnvOffset, 's'), site)
	h = text(h, parameter)
	return unit(seed, word(h, uint64(trial)))
}

// Draw gives the value of the factor in a trial.
func (f Factor) Draw(seed uint64, trial int) float64 {
	if f.Dist == Fixed {
		return f.Central
	}
	g := f.Group
	if g == "" {
		g = f.ID
	}
	return f.Quantile(Draw(seed, g, trial))
}

// FNV-1a, 64 bits (Fowler, Noll, Vo), spread by one step of the PCG generator of math/rand/v2.
const (
	fnvOffset uint64 = 14695981039346656037
	fnvPrime  uint64 = 1099511628211
)

func byte64(h uint64, b byte) uint64 { return (h ^ uint64(b)) * fnvPrime }

// text ends with a byte that cannot stand in UTF-8, so that "ab"+"c" differs from "a"+"bc".
func text(h uint64, s string) uint64 {
	for i := 0; i < len(s); i++ {
		h = byte64(h, s[i])
	}
	return byte64(h, 0xff)
}

func word(h, w uint64) uint64 {
	for i := 0; i < 8; i++ {
		h = byte64(h, byte(w>>(8*i)))
	}
	return h
}

func unit(seed, key uint64) float64 {
	var p rand.PCG
	p.Seed(seed, key)
	p.Uint64() // the first output follows its seed words too closely
	return (float64(p.Uint64()>>12) + 0.5) / (1 << 52)
}
