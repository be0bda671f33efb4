package wind

import (
	"errors"
	"fmt"
	"math"
	"slices"

	"groundtally/scoring/units"
)

// Position is a place in a metric plane: X to the east, Y to the north, in metres. The rose's north
// must be that of the plane.
type Position struct{ X, Y float64 }

func (p Position) finite() bool {
	s := math.Abs(p.X) + math.Abs(p.Y)
	return s <= math.MaxFloat64
}

// Machine is a turbine that already stands, or will, at a place.
type Machine struct {
	At         Position
	Turbine    Turbine
	HubHeightM float64
}

// Settings choose how wakes are computed. Defaults.Settings gives the usual ones.
type Settings struct {
	Wake           WakeModel
	JensenK        float64 // decay of the Jensen wake, above 0 to 0.2
	AmbientTIFrac  float64 // ambient turbulence intensity for the growth of the Gaussian wake, 0.01 to 0.4
	Directions     int     // wind directions computed, 4 to 360
	SpeedStepMPerS float64 // distance of the speeds at which wakes are computed, 0.1 to 2
}

func (s Settings) check() error {
	switch {
	case int(s.Wake) >= len(wakeNames):
		return fmt.Errorf("there is no %v", s.Wake)
	case !(s.JensenK > 0 && s.JensenK <= 0.2):
		return fmt.Errorf("wake decay %g lies outside 0 to 0.2", s.JensenK)
	case !(s.AmbientTIFrac >= 0.01 && s.AmbientTIFrac <= 0.4):
		return fmt.Errorf("ambient turbulence intensity %g lies outside 0.01 to 0.4", s.AmbientTIFrac)
	case s.Directions < 4 || s.Directions > 360:
		return fmt.Errorf("%d wind directions: 4 to 360 are possible", s.Directions)
	case !(s.SpeedStepMPerS >= 0.1 && s.SpeedStepMPerS <= 2):
		return fmt.Errorf("speed step %g m/s lies outside 0.1 to 2", s.SpeedStepMPerS)
	}
	return nil
}

// Site is the wind of a place.
type Site struct {
	// Rose has sectors of equal width, the first centred on north, clockwise; wind comes from there.
	// One sector means the same wind from everywhere; else 4 to 72. Frequencies must sum to 1 within
	// 2 percent and are divided by their sum.
	Rose       []Sector
	RefHeightM float64 // height above ground of the rose's distributions
	ShearAlpha float64 // power law exponent from there to the hub; plays no part when RoughnessM is given
	ElevationM float64 // of the ground above sea level
	TempC      float64 // mean air temperature at hub height, used when TempKnown
	TempKnown  bool
	// RoughnessM is the roughness length of the ground: above 0, speeds go from height to height by the
	// log law over it and over the displacement height DisplacementM (0 over open land); 0 leaves it to
	// the power law, and DisplacementM then plays no part.
	RoughnessM, DisplacementM float64
}

// row is what one machine, at each speed node, does to those behind it.
type row struct {
	ct   []float64 // Gaussian: thrust; Jensen: 1 - sqrt(1 - Ct); IEA37: 1
	eps  []float64 // Gaussian: width of the wake at the rotor per diameter
	left []float64 // speed that reaches the machine per free-stream speed
}

// kind is a type of machine in a field.
type kind struct {
	turbine Turbine
	hub     float64
	s       float64   // its curve's speed per free-stream speed at the farm's hub height
	p       float64   // factor on the curve's power
	epsMax  float64   // widest wake at the rotor
	inv     []float64 // 1/free power at each node; 0 where the machine stands still
	ones    []float64
	free    row
}

// field holds all that does not depend on the positions.
type field struct {
	set    Settings
	kStar  float64
	kinds  []kind
	nodes  []float64 // free-stream speeds at the farm's hub height
	sin    []float64
	cos    []float64
	edges  []float64 // of the energy bins
	lnEdge []float64
	rose   []Sector // at the farm's hub height, frequencies summing to 1
	shares [][]share
}

// share says how much of a sector's time belongs to a direction.
type share struct {
	sector int
	frac   float64
}

// newField prepares the kinds: kind 0 is the farm's own.
func newField(site Site, own Turbine, hubM float64, existing []Machine, set Settings, density float64) (*field, error) {
	f := &field{set: set, kStar: WakeGrowth(set.AmbientTIFrac)}
	if err := f.addKind(own, hubM, hubM, site, density); err != nil {
		return nil, err
	}
	for i, m := range existing {
		if !m.At.finite() {
			return nil, fmt.Errorf("existing machine %d: its position is not finite", i+1)
		}
		if f.kindOf(m) >= 0 {
			continue
		}
		if err := f.addKind(m.Turbine, m.HubHeightM, hubM, site, density); err != nil {
			return nil, fmt.Errorf("existing machine %d: %w", i+1, err)
		}
	}
	var err error
	if f.rose, err = hubRose(site, hubM); err != nil {
		return nil, err
	}
	f.layNodes()
	f.setDirections(set.Directions)
	f.shares = sectorShares(len(f.rose), set.Directions)
	for i := range f.kinds {
		f.prepare(&f.kinds[i])
	}
	return f, nil
}

func (f *field) addKind(t Turbine, hub, refHub float64, site Site, density float64) error {
	if err := t.Check(); err != nil {
		return err
	}
	if !(hub > t.RotorDiameterM/2 && hub <= 300) {
		return fmt.Errorf("hub height %g m must exceed half the rotor diameter, %g m, and stay within 300 m", hub, t.RotorDiameterM/2)
	}
	shear, err := site.speedFactor(refHub, hub)
	if err != nil {
		return err
	}
	k := kind{turbine: t, hub: hub, s: NormalisedSpeed(shear, density), p: 1}
	if t.Stall {
		k.s, k.p = shear, density/ReferenceDensityKgPerM3
	}
	for _, ct := range t.Curve.ct {
		k.epsMax = math.Max(k.epsMax, gaussianEpsilon(ct))
	}
	f.kinds = append(f.kinds, k)
	return nil
}

// kindOf finds the kind of a machine, -1 when it is not there yet.
func (f *field) kindOf(m Machine) int {
	for i, k := range f.kinds {
		if k.turbine.Curve == m.Turbine.Curve && k.turbine.RotorDiameterM == m.Turbine.RotorDiameterM && k.turbine.Stall == m.Turbine.Stall && k.hub == m.HubHeightM {
			return i
		}
	}
	return -1
}

func hubRose(site Site, hubM float64) ([]Sector, error) {
	n := len(site.Rose)
	if n != 1 && (n < 4 || n > 72) {
		return nil, fmt.Errorf("a wind rose with %d sectors: 1 or 4 to 72 are possible", n)
	}
	out := make([]Sector, n)
	var sum float64
	for i, s := range site.Rose {
		if !(s.FrequencyFrac >= 0 && s.FrequencyFrac <= 1.02) {
			return nil, fmt.Errorf("sector %d: frequency %g lies outside 0 to 1", i, s.FrequencyFrac)
		}
		sum += s.FrequencyFrac
		if s.FrequencyFrac == 0 {
			continue
		}
		if err := s.Weibull.Check(); err != nil {
			return nil, fmt.Errorf("sector %d: %w", i, err)
		}
		w, err := site.AtHub(s.Weibull, hubM)
		if err != nil {
			return nil, err
		}
		out[i] = Sector{FrequencyFrac: s.FrequencyFrac, Weibull: w}
	}
	if math.Abs(sum-1) > 0.02 {
		return nil, fmt.Errorf("the frequencies of the wind rose sum to %g, not to 1", sum)
	}
	for i := range out {
		out[i].FrequencyFrac /= sum
	}
	return out, nil
}

// Around the knee of the curve, where the waked machine still loses and the free one is at rated power,
// the ratio of their powers bends; nodes are twice as dense there.
const (
	kneeBelowMPerS = 2.0
	kneeAboveMPerS = 3.0
)

// layNodes sets the speeds at which wakes are computed (multiples of the step, and the ends of every
// curve, so that no bin lies between a running and a stopped machine) and the bins of the energy sum.
func (f *field) layNodes() {
	lo, hi := math.Inf(1), 0.0
	for _, k := range f.kinds {
		a, b := k.turbine.Curve.First()/k.s, k.turbine.Curve.Last()/k.s
		f.nodes = append(f.nodes, a, b)
		lo, hi = math.Min(lo, a), math.Max(hi, b)
	}
	step := f.set.SpeedStepMPerS / 2
	knee := f.kinds[0].turbine.Curve.knee() / f.kinds[0].s
	for i := math.Floor(lo/step) + 1; i*step < hi; i++ {
		v := i * step
		whole := math.Mod(i, 2) == 0
		if whole || (v > knee-kneeBelowMPerS && v < knee+kneeAboveMPerS) {
			f.nodes = append(f.nodes, v)
		}
	}
	slices.Sort(f.nodes)
	const near = 1e-9 // two nodes nearer than this are one
	f.nodes = slices.CompactFunc(f.nodes, func(a, b float64) bool { return math.Abs(a-b) < near })
	n := int(math.Ceil((hi - lo) / aepBinMPerS * (1 - 1e-12)))
	f.edges = make([]float64, n+1)
	f.lnEdge = make([]float64, n+1)
	for i := range f.edges {
		f.edges[i] = lo + float64((hi-lo)*float64(i)/float64(n))
		f.lnEdge[i] = math.Log(f.edges[i])
	}
}

func (f *field) setDirections(n int) {
	f.sin, f.cos = make([]float64, n), make([]float64, n)
	for d := range n {
		f.sin[d], f.cos[d] = math.Sincos(2 * math.Pi * float64(d) / float64(n))
	}
}

// sectorShares spreads every sector over the directions with a triangle as wide as the coarser of the
// two spacings. The shares of a sector sum to 1, so that the free-stream energy does not depend on the
// number of directions, while the joint distribution of speed and direction changes linearly between
// sector centres.
func sectorShares(sectors, directions int) [][]share {
	out := make([][]share, directions)
	if sectors == 1 {
		for d := range out {
			out[d] = []share{{0, 1 / float64(directions)}}
		}
		return out
	}
	// In units of 1/(sectors*directions) of a turn all angles are whole numbers.
	turn := sectors * directions
	width := max(sectors, directions)
	for s := range sectors {
		hat := func(d int) int {
			gap := (d*sectors - s*directions) % turn
			if gap < 0 {
				gap += turn
			}
			return max(0, width-min(gap, turn-gap))
		}
		sum := 0
		for d := range directions {
			sum += hat(d)
		}
		for d := range directions {
			if h := hat(d); h > 0 {
				out[d] = append(out[d], share{s, float64(h) / float64(sum)})
			}
		}
	}
	return out
}

// prepare computes what a machine does in the free stream.
func (f *field) prepare(k *kind) {
	n := len(f.nodes)
	k.inv, k.ones = make([]float64, n), make([]float64, n)
	k.free = row{ct: make([]float64, n), eps: make([]float64, n), left: make([]float64, n)}
	for i, v := range f.nodes {
		k.ones[i], k.free.left[i] = 1, 1
		if p := k.turbine.Curve.PowerKW(f.inCurve(k, v)); p > 0 {
			k.inv[i] = 1 / p
		}
		f.thrust(k, i, 1, k.free)
	}
}

// inCurve is the speed at which a kind reads its curve. Rounding must not push the ends of the curve
// out of it.
func (f *field) inCurve(k *kind, v float64) float64 {
	x := v * k.s
	const slack = 1e-9
	c := k.turbine.Curve
	if x > c.Last() && x < c.Last()+slack {
		return c.Last()
	}
	if x < c.First() && x > c.First()-slack {
		return c.First()
	}
	return x
}

// thrust fills the row at node i for a machine that gets a share left of the free speed.
func (f *field) thrust(k *kind, i int, left float64, r row) {
	switch f.set.Wake {
	case WakeIEA37:
		r.ct[i] = 1
	case WakeJensen:
		r.ct[i] = 1 - math.Sqrt(1-k.turbine.Curve.Ct(f.inCurve(k, f.nodes[i]*left)))
	default:
		ct := k.turbine.Curve.Ct(f.inCurve(k, f.nodes[i]*left))
		r.ct[i], r.eps[i] = ct, gaussianEpsilon(ct)
	}
}

// sectorEnergies gives the free-stream energy (MWh/yr) of one machine of the farm by sector of the rose.
func (f *field) sectorEnergies(bySector [][][]float64) []float64 {
	out := make([]float64, len(f.rose))
	for s, nodes := range bySector[0] {
		out[s] = dot(nodes, f.kinds[0].ones)
	}
	return out
}

// bySector gives the free-stream energy (MWh/yr) of each kind by sector of the rose and speed node, when all
// speeds are multiplied by speedFactor.
func (f *field) bySector(speedFactor float64) [][][]float64 {
	kw := make([][]float64, len(f.kinds))
	for k := range f.kinds {
		kd := &f.kinds[k]
		kw[k] = make([]float64, len(f.edges)-1)
		for b := range kw[k] {
			v := (f.edges[b] + f.edges[b+1]) / 2
			kw[k][b] = kd.p * kd.turbine.Curve.PowerKW(v*kd.s) * mwhPerKWYear
		}
	}
	return f.overRose(speedFactor, kw)
}

// overRose takes the mean over the rose's time of each of several functions of speed, given at the
// middles of the energy bins: by function, sector and speed node, linear between the nodes.
func (f *field) overRose(speedFactor float64, value [][]float64) [][][]float64 {
	n := len(f.nodes)
	bySector := make([][][]float64, len(value)) // function, sector, node
	for k := range bySector {
		bySector[k] = make([][]float64, len(f.rose))
		for s := range f.rose {
			bySector[k][s] = make([]float64, n)
		}
	}
	bins := len(f.edges) - 1
	node, t := make([]int, bins), make([]float64, bins)
	for b := range bins {
		v := (f.edges[b] + f.edges[b+1]) / 2
		j := 0
		if b > 0 {
			j = node[b-1]
		}
		for j+2 < n && f.nodes[j+1] <= v {
			j++
		}
		node[b], t[b] = j, math.Max(0, math.Min(1, (v-f.nodes[j])/(f.nodes[j+1]-f.nodes[j])))
	}
	for s, sec := range f.rose {
		if sec.FrequencyFrac == 0 {
			continue
		}
		lnA, shape := math.Log(sec.Weibull.AMPerS*speedFactor), sec.Weibull.K
		above := func(b int) float64 { return math.Exp(-math.Exp(shape * (f.lnEdge[b] - lnA))) }
		gHi := above(0)
		for b := range bins {
			gLo := gHi
			gHi = above(b + 1)
			prob := sec.FrequencyFrac * (gLo - gHi)
			for k := range value {
				e := prob * value[k][b]
				up := float64(e * t[b])
				bySector[k][s][node[b]] += e - up
				bySector[k][s][node[b]+1] += up
			}
		}
	}
	return bySector
}

// timeFrac is the share of the year that belongs to the direction d.
func (f *field) timeFrac(d int) float64 {
	var sum float64
	for _, sh := range f.shares[d] {
		sum += float64(sh.frac * f.rose[sh.sector].FrequencyFrac)
	}
	return sum
}

// weights gives the free-stream energy (MWh/yr) of each kind by direction and speed node, when all
// speeds are multiplied by speedFactor. Sum over a kind's weights is its energy alone.
func (f *field) weights(speedFactor float64) [][][]float64 {
	return f.byDirection(f.bySector(speedFactor))
}

// byDirection spreads what is given by sector over the directions.
func (f *field) byDirection(bySector [][][]float64) [][][]float64 {
	n := len(f.nodes)
	out := make([][][]float64, len(bySector))
	for k := range out {
		out[k] = make([][]float64, len(f.shares))
		for d, shares := range f.shares {
			w := make([]float64, n)
			for _, sh := range shares {
				for i, e := range bySector[k][sh.sector] {
					w[i] += float64(sh.frac * e)
				}
			}
			out[k][d] = w
		}
	}
	return out
}

// placed is a machine of a kind at a position.
type placed struct {
	at   Position
	kind int
}

// pair is one wake that reaches a machine.
type pair struct {
	src  int
	a, b float64 // Gaussian: k* x/D and (r/D)^2; Jensen: factor; IEA37: deficit
}

// wake gives the wake of one machine at another that lies dx downwind and dy across; ok is false when
// it does not get there.
func (f *field) wake(src, dst *kind, dx, dy float64) (p pair, ok bool) {
	if dx <= 0 {
		return p, false
	}
	d := src.turbine.RotorDiameterM
	dz := dst.hub - src.hub
	r2 := float64(dy*dy) + float64(dz*dz)
	switch f.set.Wake {
	case WakeJensen:
		r := dst.turbine.RotorDiameterM / 2
		area := OverlapArea(r, d/2+float64(f.set.JensenK*dx), math.Sqrt(r2))
		p.a = area / discArea(dst.turbine.RotorDiameterM) * jensenGrowth(f.set.JensenK, dx, d)
		return p, p.a > 0
	case WakeIEA37:
		p.a = IEA37Deficit(dx, dy, d)
		return p, p.a > 0
	}
	p.a, p.b = f.kStar*dx/d, r2/(d*d)
	s := p.a + src.epsMax
	return p, p.b < gaussianReach*gaussianReach*s*s
}

// add joins the squared deficits of one wake, node by node.
func (f *field) add(sum []float64, p pair, src row) {
	if f.set.Wake != WakeGaussian {
		for i, c := range src.ct {
			x := c * p.a
			sum[i] += float64(x * x)
		}
		return
	}
	// Below rated speed many machines keep their thrust, and with it the wake, from node to node.
	var last, x2 float64
	for i, ct := range src.ct {
		if ct > 0 {
			if ct != last {
				x := gaussian(ct, p.a+src.eps[i], p.b)
				last, x2 = ct, float64(x*x)
			}
			sum[i] += x2
		}
	}
}

// flow is the solution for one direction.
type flow struct {
	along, across []float64 // downwind and crosswind coordinates
	order         []int     // machines from upwind to downwind
	rows          []row
	ratio         [][]float64 // waked power per free power at each node
	energy        []float64   // MWh/yr at central weights
	dirty         []bool
	arena, sum    []float64
}

func (f *field) newFlow() *flow { return &flow{sum: make([]float64, len(f.nodes))} }

// solve computes the direction d. With a base (a solution of the same machines in which the machine
// moved stood elsewhere, or was not there) only what moved and what it reaches, before or after, is
// computed; the rest is taken over, and the result is bit for bit that of a full solution.
func (f *field) solve(fl, base *flow, d int, ms []placed, moved int, w [][][]float64) {
	n, nodes := len(ms), len(f.nodes)
	fl.along, fl.across = resize(fl.along, n), resize(fl.across, n)
	fl.energy, fl.arena = resize(fl.energy, n), resize(fl.arena, 4*n*nodes)
	fl.order, fl.dirty = resize(fl.order, n), resize(fl.dirty, n)
	fl.rows, fl.ratio = resize(fl.rows, n), resize(fl.ratio, n)
	for i, m := range ms {
		fl.along[i] = -float64(m.at.X*f.sin[d]) - float64(m.at.Y*f.cos[d])
		fl.across[i] = float64(m.at.X*f.cos[d]) - float64(m.at.Y*f.sin[d])
		fl.order[i] = i
	}
	slices.SortFunc(fl.order, func(a, b int) int {
		switch {
		case fl.along[a] < fl.along[b]:
			return -1
		case fl.along[a] > fl.along[b]:
			return 1
		}
		return a - b
	})
	var few [64]pair
	ups := few[:0]
	for place, i := range fl.order {
		k := &f.kinds[ms[i].kind]
		ups = ups[:0]
		fl.dirty[i] = base == nil || i == moved
		for _, j := range fl.order[:place] {
			p, ok := f.wake(&f.kinds[ms[j].kind], k, fl.along[i]-fl.along[j], fl.across[i]-fl.across[j])
			if !ok {
				continue
			}
			p.src = j
			ups = append(ups, p)
			fl.dirty[i] = fl.dirty[i] || fl.dirty[j]
		}
		if !fl.dirty[i] && moved < len(base.along) {
			_, was := f.wake(&f.kinds[ms[moved].kind], k, base.along[i]-base.along[moved], base.across[i]-base.across[moved])
			fl.dirty[i] = was
		}
		switch {
		case !fl.dirty[i]:
			fl.rows[i], fl.ratio[i], fl.energy[i] = base.rows[i], base.ratio[i], base.energy[i]
			continue
		case len(ups) == 0:
			fl.rows[i], fl.ratio[i] = k.free, k.ones
		default:
			f.reach(fl, i, k, ups, nodes)
		}
		fl.energy[i] = dot(w[ms[i].kind][d], fl.ratio[i])
	}
}

// reach computes the machine i behind the wakes ups: deficits join as the root of the sum of squares,
// relative to the free stream (Katic et al. 1986).
func (f *field) reach(fl *flow, i int, k *kind, ups []pair, nodes int) {
	cell := fl.arena[4*i*nodes:]
	r := row{ct: cell[:nodes], eps: cell[nodes : 2*nodes], left: cell[2*nodes : 3*nodes]}
	ratio := cell[3*nodes : 4*nodes]
	clear(fl.sum)
	for _, p := range ups {
		f.add(fl.sum, p, fl.rows[p.src])
	}
	above := 1.0
	for q := nodes - 1; q >= 0; q-- {
		r.left[q] = math.Max(0, 1-math.Sqrt(fl.sum[q]))
		f.thrust(k, q, r.left[q], r)
		// At the first speed of a curve the least wake stops the machine: a ratio of 0 there, linear to the
		// next node, would take too much. The ratio of the node above stands in, also where the free machine
		// gives no power.
		if k.inv[q] > 0 && f.inCurve(k, f.nodes[q]) > k.turbine.Curve.First() {
			above = k.turbine.Curve.PowerKW(f.inCurve(k, f.nodes[q]*r.left[q])) * k.inv[q]
		}
		ratio[q] = above
	}
	fl.rows[i], fl.ratio[i] = r, ratio
}

func dot(a, b []float64) float64 {
	var sum float64
	for i, x := range a {
		sum += float64(x * b[i])
	}
	return sum
}

func resize[T any](s []T, n int) []T {
	if cap(s) < n {
		return make([]T, n)
	}
	return s[:n]
}

// WakeSpeeds gives the speed (m/s) that reaches each of the machines when wind of one speed comes from
// one direction (degrees clockwise from north), all at one hub height, in air of 1.225 kg/m3.
func WakeSpeeds(t Turbine, hubM float64, at []Position, set Settings, fromDeg, speedMPerS float64) ([]float64, error) {
	if err := set.check(); err != nil {
		return nil, err
	}
	if !(speedMPerS > 0 && speedMPerS <= 100) || !(math.Abs(fromDeg) <= 1e6) {
		return nil, fmt.Errorf("wind of %g m/s from %g degrees: no such wind", speedMPerS, fromDeg)
	}
	if len(at) == 0 {
		return nil, errors.New("no turbine positions")
	}
	f := &field{set: set, kStar: WakeGrowth(set.AmbientTIFrac), nodes: []float64{speedMPerS}}
	if err := f.addKind(t, hubM, hubM, Site{}, ReferenceDensityKgPerM3); err != nil {
		return nil, err
	}
	s, c := math.Sincos(fromDeg * 2 * math.Pi / units.DegreesPerCircle)
	f.sin, f.cos = []float64{s}, []float64{c}
	f.prepare(&f.kinds[0])
	ms := make([]placed, len(at))
	for i, p := range at {
		if !p.finite() {
			return nil, fmt.Errorf("turbine %d: its position is not finite", i+1)
		}
		ms[i] = placed{at: p}
	}
	fl := f.newFlow()
	f.solve(fl, nil, 0, ms, -1, [][][]float64{{{0}}})
	out := make([]float64, len(at))
	for i := range out {
		out[i] = speedMPerS * fl.rows[i].left[0]
	}
	return out, nil
}
