package wind

import "fmt"

// Names of the steps between free-stream gross energy and net energy, in their order.
const (
	LossWake         = "wake"
	LossAvailability = "availability" // turbine, balance of plant, grid
	LossElectrical   = "electrical"
	LossPerformance  = "performance" // sub-optimal running, adjustment of the curve, high-wind hysteresis
	LossEnvironment  = "environment" // icing, ageing in the first year, temperature, trees
	LossCurtailment  = "curtailment" // noise, flicker, bats, grid
	LossSmallTotal   = "small_total" // all of them together, for small machines
)

// Loss is one share taken off what is left before it.
type Loss struct {
	Name string
	Frac float64 // 0 to 1
}

// Step is one line of the loss chain: AfterMWh = BeforeMWh (1 - Share) exactly.
type Step struct {
	Name      string
	BeforeMWh float64
	Share     float64
	AfterMWh  float64
}

// Chain takes losses off a yearly energy one after the other: after = before (1 - share). The net
// energy is the last AfterMWh. Shares from 0 to 1; no losses give no steps and net equals gross.
// Multiplying (not adding) the shares follows the IEC 61400-15 framework as reviewed by Lee & Fields
// 2021, Wind Energy Science 6:311.
func Chain(grossMWhPerYr float64, losses []Loss) (steps []Step, netMWhPerYr float64, err error) {
	e := grossMWhPerYr
	steps = make([]Step, 0, len(losses))
	for _, l := range losses {
		if !(l.Frac >= 0 && l.Frac <= 1) {
			return nil, 0, fmt.Errorf("loss %q: share %g lies outside 0 to 1", l.Name, l.Frac)
		}
		s := Step{Name: l.Name, BeforeMWh: e, Share: l.Frac, AfterMWh: float64(e * (1 - l.Frac))}
		steps = append(steps, s)
		e = s.AfterMWh
	}
	return steps, e, nil
}
