package wind

import (
	"errors"
	"fmt"
	"math"

	"groundtally/scoring/units"
)

// mapReach is how far a wake spreads on a map, in widths sigma of the Gaussian: beyond lie 6e-5 of what it
// takes.
const mapReach = 4.0

// WakeMapper tells anywhere what share of the mean wind speed at hub height the wakes of a farm and of
// its neighbours take. Prepare it once, ask it for any number of points; it may be asked by several
// goroutines at once.
type WakeMapper struct {
	f          *field
	ms         []placed
	directions []mapDirection
}

// mapDirection is the solution for one direction.
type mapDirection struct {
	along, across []float64 // of the machines
	rows          []row
	weight        []float64 // by node: what a deficit of 1 takes off the mean speed, as a share
}

// NewWakeMapper prepares the map of a farm: machines new and existing, at least one of either, the wind
// of in.Site at in.HubHeightM. In.Losses plays no part. Machines may stand on top of each other.
func NewWakeMapper(in FarmInput) (*WakeMapper, error) {
	f, ms, err := prepareMap(in)
	if err != nil {
		return nil, err
	}
	v := make([]float64, len(f.edges)-1)
	for b := range v {
		v[b] = (f.edges[b] + f.edges[b+1]) / 2
	}
	weights := f.byDirection(f.overRose(1, [][]float64{v}))[0]
	var mean float64
	for _, s := range f.rose {
		if s.FrequencyFrac > 0 {
			mean += float64(s.FrequencyFrac * s.Weibull.Mean())
		}
	}
	m := &WakeMapper{f: f, ms: ms}
	none := f.noEnergy()
	for d, w := range weights {
		fl := f.newFlow()
		f.solve(fl, nil, d, ms, -1, none)
		for q := range w {
			w[q] /= mean
		}
		m.directions = append(m.directions, mapDirection{along: fl.along, across: fl.across, rows: fl.rows, weight: w})
	}
	return m, nil
}

// LossFracs gives for every point (m, the plane of the machines) the share, 0 to 1, of the free-stream
// mean speed at hub height that is lost there to wakes: the mean over the directions, speeds and times of
// the rose of v delta, per mean v, delta the root of the sum of squared deficits at the point. Machines
// stand still, and take nothing, outside their curves. The top hat acts where the point lies within the
// wake's radius. Close behind a rotor, where the models are not meant to hold, the Gaussian model stops
// the wind altogether. A point that is not finite gives NaN.
func (m *WakeMapper) LossFracs(at []Position) []float64 {
	out := make([]float64, len(at))
	sum := make([]float64, len(m.f.nodes))
	for i, p := range at {
		if !p.finite() {
			out[i] = math.NaN()
			continue
		}
		for d := range m.directions {
			dir := &m.directions[d]
			if m.f.meet(sum, dir, d, m.ms, p, m.f.kinds[0].hub, mapReach) {
				for q, s := range sum {
					out[i] += float64(dir.weight[q] * math.Min(1, math.Sqrt(s)))
				}
			}
		}
	}
	return out
}

// WakeMap is NewWakeMapper and LossFracs in one. An error when a point is not finite.
func WakeMap(in FarmInput, at []Position) ([]float64, error) {
	if err := finite(at); err != nil {
		return nil, err
	}
	m, err := NewWakeMapper(in)
	if err != nil {
		return nil, err
	}
	return m.LossFracs(at), nil
}

// WakeAlong gives for every point (m) the share, 0 to 1, of the speed at the farm's hub height that is
// lost to wakes of machines new and existing when wind of one speed (m/s in the free stream at that
// height) comes from one direction (degrees clockwise from north).
func WakeAlong(in FarmInput, at []Position, fromDeg, speedMPerS float64) ([]float64, error) {
	if !(speedMPerS > 0 && speedMPerS <= 100) || !(math.Abs(fromDeg) <= 1e6) {
		return nil, fmt.Errorf("wind of %g m/s from %g degrees: no such wind", speedMPerS, fromDeg)
	}
	if err := finite(at); err != nil {
		return nil, err
	}
	f, ms, err := prepareMap(in)
	if err != nil {
		return nil, err
	}
	s, c := math.Sincos(fromDeg * 2 * math.Pi / units.DegreesPerCircle)
	f.nodes, f.sin, f.cos = []float64{speedMPerS}, []float64{s}, []float64{c}
	for k := range f.kinds {
		f.prepare(&f.kinds[k])
	}
	fl := f.newFlow()
	f.solve(fl, nil, 0, ms, -1, f.noEnergy())
	dir := &mapDirection{along: fl.along, across: fl.across, rows: fl.rows}
	out, sum := make([]float64, len(at)), []float64{0}
	for i, p := range at {
		if f.meet(sum, dir, 0, ms, p, in.HubHeightM, gaussianReach) {
			out[i] = math.Min(1, math.Sqrt(sum[0]))
		}
	}
	return out, nil
}

func finite(at []Position) error {
	for i, p := range at {
		if !p.finite() {
			return fmt.Errorf("point %d: its position is not finite", i+1)
		}
	}
	return nil
}

// prepareMap is prepareFarm with the machines, of which the existing ones alone will do.
func prepareMap(in FarmInput) (*field, []placed, error) {
	f, _, err := prepareFarm(in)
	if err != nil {
		return nil, nil, err
	}
	if len(in.At) > 0 {
		ms, err := f.place(in)
		return f, ms, err
	}
	ms := make([]placed, 0, len(in.Existing))
	for _, m := range in.Existing {
		ms = append(ms, placed{m.At, f.kindOf(m)})
	}
	if len(ms) == 0 {
		return nil, nil, errors.New("no turbine positions")
	}
	return f, ms, nil
}

// noEnergy are weights for a solution of which only the speeds matter.
func (f *field) noEnergy() [][][]float64 {
	nothing := make([]float64, len(f.nodes))
	out := make([][][]float64, len(f.kinds))
	for k := range out {
		out[k] = make([][]float64, len(f.sin))
		for d := range out[k] {
			out[k][d] = nothing
		}
	}
	return out
}

// meet sums the squared deficits of all wakes at a point, node by node; false when none gets there.
func (f *field) meet(sum []float64, dir *mapDirection, d int, ms []placed, p Position, hub, reach float64) bool {
	along := -float64(p.X*f.sin[d]) - float64(p.Y*f.cos[d])
	across := float64(p.X*f.cos[d]) - float64(p.Y*f.sin[d])
	met := false
	for j := range ms {
		dx := along - dir.along[j]
		if dx <= 0 {
			continue
		}
		src := &f.kinds[ms[j].kind]
		w, ok := f.wakeAt(src, dx, across-dir.across[j], hub-src.hub, reach)
		if !ok {
			continue
		}
		if !met {
			clear(sum)
			met = true
		}
		f.add(sum, w, dir.rows[j])
	}
	return met
}

// wakeAt is the wake of a machine at a point dx (above 0) downwind, dy across and dz above its hub.
func (f *field) wakeAt(src *kind, dx, dy, dz, reach float64) (p pair, ok bool) {
	d := src.turbine.RotorDiameterM
	r2 := float64(dy*dy) + float64(dz*dz)
	switch f.set.Wake {
	case WakeJensen:
		radius := d/2 + float64(f.set.JensenK*dx)
		p.a = jensenGrowth(f.set.JensenK, dx, d)
		return p, r2 <= radius*radius
	case WakeIEA37:
		p.a = IEA37Deficit(dx, dy, d)
		return p, p.a > 0
	}
	p.a, p.b = f.kStar*dx/d, r2/(d*d)
	s := p.a + src.epsMax
	return p, p.b < reach*reach*s*s
}
