package wind

import (
	"fmt"
	"math"
)

// WakeMap gives, for each place, the share of the mean free wind speed at hub height that the wakes of new and existing
// machines take there, over all directions and speeds of the rose: 0 where no wake comes, below 1. Machines act as in
// FarmYear, with Settings.Directions directions; in.Losses plays no part. Wakes are formulas of the far wake: close
// behind a rotor, within about 3 diameters, the figures are rough. An error where FarmYear has one for the positions
// alone, and for a place that is not finite.
func WakeMap(in FarmInput, at []Position) ([]float64, error) {
	f, _, err := prepareFarm(in)
	if err != nil {
		return nil, err
	}
	ms, err := f.place(in)
	if err != nil {
		return nil, err
	}
	for i, p := range at {
		if !p.finite() {
			return nil, fmt.Errorf("place %d of the wake map is not finite", i+1)
		}
	}
	weights, mean := f.speedWeights()
	if !(mean > 0) {
		return nil, fmt.Errorf("the site's wind has no speed")
	}
	// A vane at hub height, so small that a wake covers it wholly or not at all.
	vane := kind{hub: in.HubHeightM, turbine: Turbine{RotorDiameterM: 1e-3}}
	none := f.weights(1)
	out := make([]float64, len(at))
	fl, sum := f.newFlow(), make([]float64, len(f.nodes))
	for d, w := range weights {
		f.solve(fl, nil, d, ms, -1, none)
		for i, p := range at {
			along := -float64(p.X*f.sin[d]) - float64(p.Y*f.cos[d])
			across := float64(p.X*f.cos[d]) - float64(p.Y*f.sin[d])
			waked := false
			for _, j := range fl.order {
				if fl.along[j] >= along {
					break
				}
				pr, ok := f.wake(&f.kinds[ms[j].kind], &vane, along-fl.along[j], across-fl.across[j])
				if !ok {
					continue
				}
				if !waked {
					clear(sum)
					waked = true
				}
				f.add(sum, pr, fl.rows[j])
			}
			if !waked {
				continue
			}
			var lost float64
			for q, s := range sum {
				lost += float64(w[q] * math.Min(1, math.Sqrt(s)))
			}
			out[i] += lost
		}
	}
	for i := range out {
		out[i] /= mean
	}
	return out, nil
}

// speedWeights gives the mean free speed at hub height (m/s), and how it is made up by direction and speed node: what
// lies between two nodes goes to both, in proportion to its nearness. Speeds outside every curve belong to the mean
// alone.
func (f *field) speedWeights() (weights [][]float64, meanMPerS float64) {
	n := len(f.nodes)
	bySector := make([][]float64, len(f.rose))
	for s, sec := range f.rose {
		bySector[s] = make([]float64, n)
		if sec.FrequencyFrac == 0 {
			continue
		}
		meanMPerS += float64(sec.FrequencyFrac * sec.Weibull.Mean())
		gHi := sec.Weibull.Above(f.edges[0])
		j := 0
		for b := 0; b+1 < len(f.edges); b++ {
			gLo := gHi
			gHi = sec.Weibull.Above(f.edges[b+1])
			v := (f.edges[b] + f.edges[b+1]) / 2
			for j+2 < n && f.nodes[j+1] <= v {
				j++
			}
			t := math.Max(0, math.Min(1, (v-f.nodes[j])/(f.nodes[j+1]-f.nodes[j])))
			part := float64(sec.FrequencyFrac * (gLo - gHi) * v)
			up := float64(part * t)
			bySector[s][j] += part - up
			bySector[s][j+1] += up
		}
	}
	weights = make([][]float64, len(f.shares))
	for d, shares := range f.shares {
		weights[d] = make([]float64, n)
		for _, sh := range shares {
			for q, x := range bySector[sh.sector] {
				weights[d][q] += float64(sh.frac * x)
			}
		}
	}
	return weights, meanMPerS
}
