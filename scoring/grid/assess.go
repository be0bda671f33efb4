package grid

import (
	"errors"
	"fmt"
	"math"
	"strings"

	"groundtally/scoring/bounds"
	"groundtally/scoring/units"
)

// Number is a value that may not be known. Not known is never read as zero.
type Number struct {
	Value float64
	Known bool
}

// Known makes a known number.
func Known(v float64) Number { return Number{Value: v, Known: true} }

// Answer is yes, no or not known.
type Answer uint8

// The answers.
const (
	NotKnown Answer = iota
	Yes
	No
)

// AssetKind says what the plant would connect to.
type AssetKind string

// The kinds of asset.
const (
	Substation         AssetKind = "substation"          // its busbar is taken to be voltage regulated
	Line               AssetKind = "line"                // tapped along its way
	TransformerStation AssetKind = "transformer_station" // medium to low voltage
)

// AssessInput are the facts about one plant and one asset at one voltage. An asset with several voltages
// is assessed once for each.
type AssessInput struct {
	ID         string
	Kind       AssetKind
	VoltageKV  Number // network voltage of the asset
	TapAllowed Answer // lines only
	Spare      Number // kW that the asset can still take
	SpareAge   Number // months since the spare capacity was stated; not known counts as fresh

	ShortCircuitMVA Number // least value at the asset without other plants
	XOverR          Number // of the network at the asset

	StraightM float64  // straight distance from plant to asset
	RoutedM   Number   // length of a found route; the detour factor is then not used
	Overhead  bool     // build a line in place of a cable
	Material  Material // empty: the usual one
	LoopIn    bool     // lines only: cut the line and lead both ends to the plant in place of a tee

	PlantKW    float64 // alternating current at the connection, after any agreed export limit
	Technology string  // wind, solar_fixed, ... chooses the weight of the loss load factor
	LoadFactor float64 // yearly mean over PlantKW, after limiting
	LossLoad   Number  // loss load factor from a profile

	RiseLimit   Number // share of nominal voltage; not known: the default of the level
	MaxCircuits int    // 0: the default
	// Derating of the conductor rating; not known: the default of the kind.
	Derating Number
}

// Status of an asset for a plant.
type Status string

// The statuses. Missing facts never make an asset adequate.
const (
	Adequate    Status = "adequate"     // all tests pass and the stated spare capacity covers the plant
	Partly      Status = "partly"       // stated spare capacity covers part of the plant: an export limit is possible
	Unknown     Status = "unknown"      // all tests that can be made pass, but facts are missing
	NotAdequate Status = "not adequate" // a test fails
)

// Reason says which test decided, or which fact is missing.
type Reason string

// The reasons.
const (
	VoltageOutOfScope  Reason = "voltage_out_of_scope"
	VoltageUnknown     Reason = "voltage_unknown"
	AboveBand          Reason = "above_level_band"
	TapForbidden       Reason = "tap_forbidden"
	TapHighVoltage     Reason = "tap_high_voltage"
	TapUnknown         Reason = "tap_unknown"
	NoConductor        Reason = "no_conductor_listed"
	ThermalExceeded    Reason = "thermal_rating"
	RiseExceeded       Reason = "voltage_rise"
	TransferImpossible Reason = "transfer_impossible"
	SpareNone          Reason = "spare_none"
	SparePart          Reason = "spare_part"
	SpareUnknown       Reason = "spare_unknown"
	SpareOld           Reason = "spare_old"
	UpstreamUnknown    Reason = "upstream_unknown"
	RiseAtLongRoute    Reason = "voltage_rise_at_long_route" // note: the long end of the route range breaks the limit
	BelowBand          Reason = "below_level_band"           // note
	BandStudy          Reason = "above_usual_power"          // note
	WeakRed            Reason = "short_circuit_weak"         // note
	WeakAmber          Reason = "short_circuit_low"          // note
	WeakNote           Reason = "short_circuit_noted"        // note
	ChargingNote       Reason = "charging_ask"               // note
	ChargingHeavy      Reason = "charging_compensation"      // note
	RapidChange        Reason = "rapid_change"               // note
	BusbarRegulated    Reason = "busbar_taken_as_regulated"  // note
)

// Range is a low, central and high value.
type Range struct{ Low, Central, High float64 }

// Assessment is what follows for one asset.
type Assessment struct {
	ID     string
	Status Status
	Reason Reason   // the first of Failed or Missing; empty when adequate
	Failed []Reason // tests that fail
	Missed []Reason // facts that are missing
	Notes  []Reason

	Level          LevelID
	VoltageKV      float64
	VoltageAssumed bool // the voltage was not known; the least-effort level that fits was taken
	LevelsTried    []LevelID
	Band           Band

	Routed  bool
	RouteKm Range // ground length
	LineKm  Range // conductor length with slack and terminations

	// CircuitKm is what must be built: length times circuits, twice when the line is looped in. Multiply the
	// masses of Conductor by it.
	CircuitKm Range

	// Computed is false where no conductor is listed or the level is out of scope; the electrical
	// figures below are then zero and mean nothing.
	Computed      bool
	Conductor     Conductor
	Circuits      int
	CurrentA      float64 // all circuits, at the sizing cos phi, with charging
	LoadingFrac   float64 // current over derated rating
	RiseFrac      float64 // linear, with upstream where it is known, at the central length
	RiseExactFrac float64
	RiseLimitFrac float64
	RiseNewLine   Range  // linear, new line alone
	UpstreamRise  Number // from the network behind the asset
	LineLossFrac  Range  // share of the year's energy
	LossFrac      Range  // line and own high-voltage transformer
	ChargingMVAr  float64

	SCRAtPoint, SCRAtPlant Number

	// NeedsTransformer tells that a transformer stands between plant and asset. Unit transformers up to
	// 45 kV lie inside the plant: their loss and make belong there. At 66 kV and more it is the plant's
	// own substation, whose loss is in LossFrac.
	NeedsTransformer bool
	TransformerKVA   float64
	OwnSubstation    bool

	ExportLimitKW Number // set when partly: what the spare capacity allows
	Effort        Range  // unit: 1 km of buried medium-voltage cable through arable land; an assumption
}

// Assess screens one asset for one plant.
//
// Route: straight distance times the detour factor (low, central, high), not less than the distance and a
// fixed extra for short ones, or the routed length as it is; cables get slack and terminations. Conductor:
// the smallest listed size with I ≤ k·Iz at the sizing cos phi and a linear voltage rise within the
// limit, first with one circuit, then with more. Voltage: at the highest conductor temperature, cos phi 1,
// half of the charging power added. A substation busbar is taken to be regulated, so nothing upstream
// adds to the rise; behind other assets it follows from the short-circuit power or is missing. Losses: at
// the temperature of the root mean square current under the derated rating; low and high take the ends of
// the route and of the loss-load weight. Of a looped-in line one leg carries the power, which is cautious.
// Load and loss factors are those of the power after limiting.
//
// An asset of unknown voltage is tried at every level whose band admits the plant; it is unknown at best.
// A test that fails at a level says nothing about a higher one: assess the asset there as well. The tests
// are made at the full power of the plant; for an asset that takes a part, assess again with the export
// limit as the power. Only impossible input is an error.
func (m *Model) Assess(in AssessInput) (Assessment, error) {
	if err := in.check(); err != nil {
		return Assessment{}, fmt.Errorf("assess asset %q: %w", in.ID, err)
	}
	if in.VoltageKV.Known {
		a, err := m.assessAt(in, in.VoltageKV.Value)
		if err != nil {
			return Assessment{}, fmt.Errorf("assess asset %q: %w", in.ID, err)
		}
		return a, nil
	}
	var best Assessment
	var tried []LevelID
	for _, l := range m.levels {
		if l.BandOf(in.PlantKW) == BandAbove || (l.BandOf(in.PlantKW) == BandBelow && l.ID != LV) {
			continue
		}
		a, err := m.assessAt(in, l.NominalKV)
		if err != nil {
			return Assessment{}, fmt.Errorf("assess asset %q: %w", in.ID, err)
		}
		tried = append(tried, l.ID)
		better := len(tried) == 1 || (best.Status == NotAdequate && a.Status != NotAdequate) ||
			(a.Status != NotAdequate && a.Effort.Central < best.Effort.Central)
		if better {
			best = a
		}
	}
	if len(tried) == 0 {
		return Assessment{ID: in.ID, Status: NotAdequate, Reason: AboveBand, Failed: []Reason{AboveBand}, VoltageAssumed: true}, nil
	}
	best.VoltageAssumed, best.LevelsTried = true, tried
	best.Missed = append([]Reason{VoltageUnknown}, best.Missed...)
	if best.Status != NotAdequate {
		best.Status, best.Reason = Unknown, VoltageUnknown
	}
	return best, nil
}

func (in AssessInput) check() error {
	err := errors.Join(bounds.Positive("plant power", in.PlantKW), bounds.NonNegative("distance", in.StraightM))
	if !(in.LoadFactor > 0 && in.LoadFactor <= 1) {
		err = errors.Join(err, bounds.Error("load factor", in.LoadFactor, "above 0 to 1"))
	}
	switch in.Kind {
	case Substation, Line, TransformerStation:
	default:
		err = errors.Join(err, fmt.Errorf("kind of asset %q: %w", in.Kind, ErrInput))
	}
	switch in.Technology {
	case "wind", "solar_fixed", "solar_tracking", "solar_vertical", "solar_agri", "wind_solar":
	default:
		err = errors.Join(err, fmt.Errorf("technology %q: %w", in.Technology, ErrInput))
	}
	for _, n := range []struct {
		name string
		n    Number
		f    func(string, float64) error
	}{{"voltage", in.VoltageKV, bounds.Positive}, {"spare capacity", in.Spare, bounds.NonNegative}, {"age of the spare capacity", in.SpareAge, bounds.NonNegative},
		{"short-circuit power", in.ShortCircuitMVA, bounds.Positive}, {"X over R", in.XOverR, bounds.NonNegative}, {"route", in.RoutedM, bounds.NonNegative},
		{"loss load factor", in.LossLoad, unitShare}, {"rise limit", in.RiseLimit, bounds.Positive}, {"derating", in.Derating, bounds.Positive}} {
		if n.n.Known {
			err = errors.Join(err, n.f(n.name, n.n.Value))
		}
	}
	if in.LossLoad.Known && (in.LossLoad.Value > in.LoadFactor*(1+1e-9) || in.LossLoad.Value < in.LoadFactor*in.LoadFactor*(1-1e-9)) {
		err = errors.Join(err, bounds.Error("loss load factor", in.LossLoad.Value, "between LF squared and LF"))
	}
	if in.MaxCircuits < 0 {
		err = errors.Join(err, bounds.Error("most circuits", float64(in.MaxCircuits), "0 or more"))
	}
	return err
}

// Route gives the ground length, km, of a connection by the model's detour rule.
func (m *Model) Route(straightM float64, routedM Number) (Range, error) {
	if routedM.Known {
		if err := bounds.NonNegative("route", routedM.Value); err != nil {
			return Range{}, err
		}
		km := routedM.Value / units.MPerKm
		return Range{km, km, km}, nil
	}
	if err := bounds.NonNegative("distance", straightM); err != nil {
		return Range{}, err
	}
	// The extra stays constant beyond the short distance so that a longer way never gets a shorter route.
	least := straightM + m.shortExtraM
	if straightM > m.shortM {
		least = m.shortM + m.shortExtraM
	}
	var r [3]float64
	for i, f := range m.detour {
		r[i] = math.Max(f*straightM, least) / units.MPerKm
	}
	return Range{r[0], r[1], r[2]}, nil
}

func (m *Model) assessAt(in AssessInput, kv float64) (Assessment, error) {
	a := Assessment{ID: in.ID, VoltageKV: kv, Routed: in.RoutedM.Known}
	var err error
	if a.RouteKm, err = m.Route(in.StraightM, in.RoutedM); err != nil {
		return a, err
	}
	level, ok := m.LevelAt(kv)
	if !ok {
		a.Failed = append(a.Failed, VoltageOutOfScope)
		return a.judge(), nil
	}
	a.Level, a.Band = level.ID, level.BandOf(in.PlantKW)
	switch a.Band {
	case BandAbove:
		a.Failed = append(a.Failed, AboveBand)
	case BandBelow:
		a.Notes = append(a.Notes, BelowBand)
	case BandPossible:
		a.Notes = append(a.Notes, BandStudy)
	}
	m.tap(in, level, &a)
	m.spare(in, &a)

	kind, slack := Cable, m.slackCable
	if in.Overhead {
		kind, slack = Overhead, m.slackOvhead
	}
	lineKm := func(km float64) float64 { return float64(km*(1+slack)) + m.termM/units.MPerKm }
	a.LineKm = Range{lineKm(a.RouteKm.Low), lineKm(a.RouteKm.Central), lineKm(a.RouteKm.High)}

	mva := in.PlantKW / m.cosPhi / units.KWPerMW
	a.NeedsTransformer = level.ID != LV
	a.OwnSubstation = level.ID.high()
	if a.NeedsTransformer {
		a.TransformerKVA = mva * units.KWPerMW
	}
	a.RiseLimitFrac = level.RiseLimitFrac
	if in.RiseLimit.Known {
		a.RiseLimitFrac = in.RiseLimit.Value
	}
	if err := m.electric(in, level, kind, kv, &a); err != nil {
		return a, err
	}
	if err := m.shortCircuit(in, level, kv, &a); err != nil {
		return a, err
	}
	m.effort(in, level, kind, mva, &a)
	return a.judge(), nil
}

func (m *Model) tap(in AssessInput, level Level, a *Assessment) {
	if in.Kind != Line {
		return
	}
	switch {
	case in.TapAllowed == No:
		a.Failed = append(a.Failed, TapForbidden)
	case level.ID == HV110 && in.TapAllowed != Yes:
		a.Failed = append(a.Failed, TapHighVoltage)
	case in.TapAllowed == NotKnown:
		a.Missed = append(a.Missed, TapUnknown)
	}
}

func (m *Model) spare(in AssessInput, a *Assessment) {
	switch {
	case !in.Spare.Known:
		a.Missed = append(a.Missed, SpareUnknown)
	case in.SpareAge.Known && in.SpareAge.Value > m.spareMonths:
		a.Missed = append(a.Missed, SpareOld)
	case in.Spare.Value == 0:
		a.Failed = append(a.Failed, SpareNone)
	case in.Spare.Value < in.PlantKW:
		a.ExportLimitKW = Known(in.Spare.Value)
	}
}

// network gives the impedance behind the asset. regulated is true where none of it adds to the rise.
func (m *Model) network(in AssessInput, level Level, kv float64) (p Path, known, regulated bool, err error) {
	regulated = in.Kind == Substation && level.ID != LV
	if !in.ShortCircuitMVA.Known {
		return Path{}, false, regulated, nil
	}
	xr := m.xrRural
	switch {
	case in.XOverR.Known:
		xr = in.XOverR.Value
	case level.ID.high():
		xr = m.xrHV
	case in.Kind == Substation:
		xr = m.xrBusbar
	}
	p, err = NetworkImpedance(kv, in.ShortCircuitMVA.Value, xr)
	return p, true, regulated, err
}

func (m *Model) electric(in AssessInput, level Level, kind Kind, kv float64, a *Assessment) error {
	up, upKnown, regulated, err := m.network(in, level, kv)
	if err != nil {
		return err
	}
	switch {
	case regulated:
		a.Notes = append(a.Notes, BusbarRegulated)
		a.UpstreamRise = Known(0)
		up = Path{VoltageKV: kv}
	case upKnown:
		a.UpstreamRise = Known(up.riseLinear(Flow{ExportKW: in.PlantKW}))
	default:
		a.Missed = append(a.Missed, UpstreamUnknown)
		up = Path{VoltageKV: kv}
	}
	list := m.list(level.ID, kind, in.Material)
	if len(list) == 0 {
		a.Missed = append(a.Missed, NoConductor)
		return nil
	}
	a.Computed = true
	derate := m.derateBuried
	if kind == Overhead {
		derate = m.derateOverhead
	}
	if in.Derating.Known {
		derate = in.Derating.Value
	}
	most := in.MaxCircuits
	if most == 0 {
		most = m.circuits
	}
	var s sizing
	for n := 1; n <= most; n++ {
		k := derate
		if n > 1 && kind == Cable {
			k *= m.derateTwo
		}
		for _, c := range list {
			if s, err = m.size(in, c, n, k, kv, up, a); err != nil {
				return err
			}
			if s.fits {
				break
			}
		}
		if s.fits {
			break
		}
	}
	// Without a fit the figures of the largest conductor and most circuits stand, and say what fails.
	a.Conductor, a.Circuits = s.conductor, s.circuits
	a.CurrentA, a.LoadingFrac = s.current, s.loading
	a.RiseFrac, a.RiseNewLine = s.rise, s.newLine
	a.ChargingMVAr = s.charging
	built := float64(s.circuits) * legs(in)
	a.CircuitKm = Range{built * a.LineKm.Low, built * a.LineKm.Central, built * a.LineKm.High}
	if !s.thermal {
		a.Failed = append(a.Failed, ThermalExceeded)
	}
	if !s.voltage {
		a.Failed = append(a.Failed, RiseExceeded)
	}
	if s.impossible {
		a.Failed = append(a.Failed, TransferImpossible)
	} else {
		a.RiseExactFrac = s.exact
	}
	if s.voltage && s.newLine.High+s.upstream > a.RiseLimitFrac {
		a.Notes = append(a.Notes, RiseAtLongRoute)
	}
	if s.rise > m.rapid {
		a.Notes = append(a.Notes, RapidChange)
	}
	switch q := s.charging * units.KWPerMW / in.PlantKW; {
	case q > m.chargeHeavy:
		a.Notes = append(a.Notes, ChargingHeavy)
	case q > m.chargeNote:
		a.Notes = append(a.Notes, ChargingNote)
	}
	return m.loss(in, s, kv, kind, a)
}

type sizing struct {
	conductor                          Conductor
	circuits                           int
	derated                            float64 // rating of one circuit, A
	current, loading                   float64
	rise, exact, upstream, charging    float64
	newLine                            Range
	thermal, voltage, impossible, fits bool
}

func (m *Model) size(in AssessInput, c Conductor, n int, k, kv float64, up Path, a *Assessment) (sizing, error) {
	s := sizing{conductor: c, circuits: n, derated: c.RatedA * k}
	r, err := c.ResistanceOhmPerKm(c.ThetaMaxC)
	if err != nil {
		return s, err
	}
	fn := float64(n)
	x := c.XOhmPerKm * m.frequencyHz / refHz
	chargingPerKm, err := ChargingMVAr(c.CNFPerKm, kv, fn, m.frequencyHz)
	if err != nil {
		return s, err
	}
	at := func(km float64) (Path, Flow) {
		return Path{VoltageKV: kv, ROhm: r * km / fn, XOhm: x * km / fn},
			Flow{ExportKW: in.PlantKW, InjectedKVAr: chargingPerKm * km * units.KWPerMW / 2}
	}
	for i, km := range []float64{a.LineKm.Low, a.LineKm.Central, a.LineKm.High} {
		p, f := at(km)
		v := p.riseLinear(f)
		switch i {
		case 0:
			s.newLine.Low = v
		case 1:
			s.newLine.Central = v
		default:
			s.newLine.High = v
		}
	}
	line, flow := at(a.LineKm.Central)
	whole := Path{VoltageKV: kv, ROhm: line.ROhm + up.ROhm, XOhm: line.XOhm + up.XOhm}
	s.upstream = up.riseLinear(flow)
	s.rise = whole.riseLinear(flow)
	s.charging = chargingPerKm * a.LineKm.Central
	if s.exact, err = whole.RiseExact(flow); errors.Is(err, ErrTransferImpossible) {
		s.impossible = true
	} else if err != nil {
		return s, err
	}
	s.voltage = s.rise <= a.RiseLimitFrac

	i, err := CurrentA(in.PlantKW, kv, m.cosPhi)
	if err != nil {
		return s, err
	}
	ic := s.charging * units.KWPerMW / (sqrt3 * kv)
	active, reactive := i*m.cosPhi, float64(i*math.Sqrt(1-float64(m.cosPhi*m.cosPhi)))+ic
	s.current = math.Hypot(active, reactive)
	s.loading = s.current / (fn * s.derated)
	s.thermal = s.loading <= 1
	if s.thermal && s.loading > 1-m.margin {
		s.thermal = s.loading/m.lowVoltage <= 1
	}
	s.fits = s.thermal && s.voltage && !s.impossible
	return s, nil
}

func (m *Model) loss(in AssessInput, s sizing, kv float64, kind Kind, a *Assessment) error {
	k := m.kSolar
	if strings.HasPrefix(in.Technology, "wind") { // the hybrid takes the higher weight when it has no profile
		k = m.kWind
	}
	screen := 0.0
	if kind == Cable && a.Level != LV {
		screen = m.screen
	}
	km := [3]float64{a.LineKm.Low, a.LineKm.Central, a.LineKm.High}
	var line, total [3]float64
	peakA, err := CurrentA(in.PlantKW, kv, 1)
	if err != nil {
		return err
	}
	fn := float64(s.circuits)
	for i := range km {
		llf := in.LossLoad.Value
		if !in.LossLoad.Known {
			if llf, err = LossLoadFactor(in.LoadFactor, k[i]); err != nil {
				return err
			}
		}
		theta, err := OperatingC(math.Sqrt(llf)*peakA/fn, s.derated, s.conductor.ThetaAmbientC, s.conductor.ThetaMaxC)
		if err != nil {
			return err
		}
		// An overloaded conductor would melt; the asset has failed and the figure only has to be finite.
		r, err := s.conductor.ResistanceOhmPerKm(math.Min(theta, s.conductor.ThetaMaxC))
		if err != nil {
			return err
		}
		path := Path{VoltageKV: kv, ROhm: r * km[i] / fn * (1 + screen)}
		if line[i], err = LossShare(path.riseLinear(Flow{ExportKW: in.PlantKW}), Factors{Load: in.LoadFactor, LossLoad: llf}); err != nil {
			return err
		}
		total[i] = line[i]
		if a.OwnSubstation {
			t, err := m.transformers.Loss("liquid", 2, a.TransformerKVA, m.peiSplit)
			if err != nil {
				return err
			}
			p0, pk, err := t.YearKWh(llf, in.PlantKW/a.TransformerKVA)
			if err != nil {
				return err
			}
			total[i] += (p0 + pk) / (in.PlantKW * in.LoadFactor * units.HoursPerYear)
		}
	}
	a.LineLossFrac = Range{line[0], line[1], line[2]}
	a.LossFrac = Range{total[0], total[1], total[2]}
	return nil
}

func (m *Model) shortCircuit(in AssessInput, level Level, kv float64, a *Assessment) error {
	net, known, _, err := m.network(in, level, kv)
	if err != nil || !known {
		return err
	}
	at, err := ShortCircuitRatio(in.ShortCircuitMVA.Value, in.PlantKW)
	if err != nil {
		return err
	}
	a.SCRAtPoint = Known(at)
	worst := at
	if a.Computed {
		r, err := a.Conductor.ResistanceOhmPerKm(reference)
		if err != nil {
			return err
		}
		fn := float64(a.Circuits)
		sk, err := ShortCircuitBehindMVA(net, Path{VoltageKV: kv, ROhm: r * a.LineKm.Central / fn, XOhm: a.Conductor.XOhmPerKm * m.frequencyHz / refHz * a.LineKm.Central / fn})
		if err != nil {
			return err
		}
		if worst, err = ShortCircuitRatio(sk, in.PlantKW); err != nil {
			return err
		}
		a.SCRAtPlant = Known(worst)
	}
	switch {
	case worst < m.scrRed:
		a.Notes = append(a.Notes, WeakRed)
	case worst < m.scrAmber:
		a.Notes = append(a.Notes, WeakAmber)
	case worst <= m.scrNote:
		a.Notes = append(a.Notes, WeakNote)
	}
	return nil
}

// legs is the number of times the route is built.
func legs(in AssessInput) float64 {
	if in.LoopIn && in.Kind == Line {
		return 2
	}
	return 1
}

func (m *Model) effort(in AssessInput, level Level, kind Kind, mva float64, a *Assessment) {
	perKm := level.EffortCable
	if kind == Overhead {
		perKm = level.EffortOvhead
	}
	if a.Circuits > 1 {
		perKm *= 1 + float64(m.secondCircuit*float64(a.Circuits-1))
	}
	perKm *= legs(in)
	loop := legs(in) > 1
	var fixed float64
	switch {
	case level.ID == LV:
		fixed = m.lvPanel
	case level.ID.medium():
		fixed = m.mvlvStation + float64(m.mvlvPerMVA*mva)
		switch {
		case in.Kind == Substation:
			fixed += m.mvBay
		case loop:
			fixed += m.mvRing
		default:
			fixed += m.mvTee
		}
	default:
		fixed = m.hvStation + float64(m.hvPerMVA*mva)
		switch {
		case loop:
			fixed += m.hvLoop
		case in.Kind == Line:
			fixed += m.hvTee
		}
	}
	a.Effort = Range{
		Low:     (float64(perKm*a.RouteKm.Low) + fixed) / m.effortRange,
		Central: float64(perKm*a.RouteKm.Central) + fixed,
		High:    (float64(perKm*a.RouteKm.High) + fixed) * m.effortRange,
	}
}

// judge sets status and reason: a failed test comes first, then a missing fact, then a part of the spare
// capacity.
func (a Assessment) judge() Assessment {
	switch {
	case len(a.Failed) > 0:
		a.Status, a.Reason = NotAdequate, a.Failed[0]
	case a.ExportLimitKW.Known:
		a.Status, a.Reason = Partly, SparePart
	case len(a.Missed) > 0:
		a.Status, a.Reason = Unknown, a.Missed[0]
	default:
		a.Status = Adequate
	}
	return a
}
