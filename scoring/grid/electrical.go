package grid

import (
	"errors"
	"math"

	"groundtally/scoring/bounds"
	"groundtally/scoring/units"
)

// ErrInput is wrapped by every error about a number outside its range.
var ErrInput = bounds.ErrInput

// ErrTransferImpossible tells that no voltage exists at which the line carries the power.
var ErrTransferImpossible = errors.New("transfer impossible: the line cannot carry this power at any voltage")

func unitShare(name string, v float64) error {
	if !(v >= 0 && v <= 1) {
		return bounds.Error(name, v, "0 to 1")
	}
	return nil
}

const (
	vPerKV   = 1e3
	wPerMW   = 1e6
	nF       = 1e-9
	refHz    = 50.0
	sqrt3    = 1.7320508075688772
	fraction = 100.0 // percent in a whole
)

// CurrentA is the line current of a three-phase circuit, I = P/(√3·U·cosφ), A.
//
// P powerKW; U line-to-line voltageKV; cosφ cosPhi, above 0 to 1.
func CurrentA(powerKW, voltageKV, cosPhi float64) (float64, error) {
	if err := errors.Join(bounds.NonNegative("power", powerKW), bounds.Positive("voltage", voltageKV), bounds.Positive("cos phi", cosPhi), unitShare("cos phi", cosPhi)); err != nil {
		return 0, err
	}
	return powerKW / (sqrt3 * voltageKV * cosPhi), nil
}

// ApparentMVA is the power that a current carries, S = √3·U·I·k, MVA; k derating, 0 to 1.
func ApparentMVA(currentA, voltageKV, derating float64) (float64, error) {
	if err := errors.Join(bounds.NonNegative("current", currentA), bounds.Positive("voltage", voltageKV), unitShare("derating", derating)); err != nil {
		return 0, err
	}
	return sqrt3 * voltageKV * currentA * derating / units.KWPerMW, nil
}

// Path is a series impedance per phase at a nominal line-to-line voltage.
type Path struct {
	VoltageKV, ROhm, XOhm float64
}

func (c Path) check() error {
	return errors.Join(bounds.Positive("voltage", c.VoltageKV), bounds.NonNegative("resistance", c.ROhm), bounds.NonNegative("reactance", c.XOhm))
}

// Flow is the power of the plant at the connection. InjectedKVAr is negative when the plant absorbs.
type Flow struct {
	ExportKW, InjectedKVAr float64
}

func (f Flow) check() error {
	if !bounds.Finite(f.ExportKW) || !bounds.Finite(f.InjectedKVAr) {
		return bounds.Error("power", f.ExportKW+f.InjectedKVAr, "a finite number")
	}
	return nil
}

// RiseLinear is the rise of the voltage along a path as a share of nominal, dU/U = (P·R + Q·X)/U².
//
// It never understates the rise, since the terms it leaves out are negative; it decides, the exact one
// is printed beside it.
func (c Path) RiseLinear(f Flow) (float64, error) {
	if err := errors.Join(c.check(), f.check()); err != nil {
		return 0, err
	}
	return c.riseLinear(f), nil
}

// With voltages in kV and powers in kW, (kW·Ω)/kV² is one thousandth of a share.
func (c Path) riseLinear(f Flow) float64 {
	return (float64(f.ExportKW*c.ROhm) + float64(f.InjectedKVAr*c.XOhm)) / (c.VoltageKV * c.VoltageKV) / vPerKV
}

// RiseExact is the rise from the stiff side, U0 = nominal, to the plant.
//
//	a = U0²/2 + R·P + X·Q;   U = √(a + √(a² − (R²+X²)(P²+Q²)));   rise = U/U0 − 1
//
// Where the inner root is not real the transfer is impossible: ErrTransferImpossible.
func (c Path) RiseExact(f Flow) (float64, error) {
	if err := errors.Join(c.check(), f.check()); err != nil {
		return 0, err
	}
	U0, R, X := c.VoltageKV*vPerKV, c.ROhm, c.XOhm
	P, Q := f.ExportKW*units.WPerKW, f.InjectedKVAr*units.WPerKW
	a := float64(U0*U0/2) + float64(R*P) + float64(X*Q)
	inner := float64(a*a) - float64((float64(R*R)+float64(X*X))*(float64(P*P)+float64(Q*Q)))
	if inner < 0 || a < 0 {
		return 0, ErrTransferImpossible
	}
	return math.Sqrt(a+math.Sqrt(inner))/U0 - 1, nil
}

// MaxPowerKW is the power at which the linear rise reaches a limit, P = lim·U²/(R + X·Q/P), kW.
//
// riseLimitFrac above 0; Q/P injectedOverExport, negative when absorbing. Where the sum below is zero or
// less the voltage does not limit the power: unlimited is true.
func (c Path) MaxPowerKW(riseLimitFrac, injectedOverExport float64) (kW float64, unlimited bool, err error) {
	if err := errors.Join(c.check(), bounds.Positive("rise limit", riseLimitFrac)); err != nil {
		return 0, false, err
	}
	if !bounds.Finite(injectedOverExport) {
		return 0, false, bounds.Error("reactive over active power", injectedOverExport, "a finite number")
	}
	z := c.ROhm + float64(c.XOhm*injectedOverExport)
	if z <= 0 {
		return 0, true, nil
	}
	return riseLimitFrac * c.VoltageKV * c.VoltageKV * vPerKV / z, false, nil
}

// MaxTransferKW is the largest power with a real voltage at cos phi 1, P = U²/(2(√(R²+X²) − R)), kW.
// A path without reactance has no such limit: unlimited is true.
func (c Path) MaxTransferKW() (kW float64, unlimited bool, err error) {
	if err := c.check(); err != nil {
		return 0, false, err
	}
	d := math.Hypot(c.ROhm, c.XOhm) - c.ROhm
	if d <= 0 {
		return 0, true, nil
	}
	return c.VoltageKV * c.VoltageKV * vPerKV / (2 * d), false, nil
}

// ZeroRiseCosPhi is the cos phi at which an absorbing plant leaves the voltage unchanged,
// Q = −(R/X)·P, cosφ = 1/√(1 + (R/X)²).
func ZeroRiseCosPhi(rOverX float64) (float64, error) {
	if err := bounds.NonNegative("R over X", rOverX); err != nil {
		return 0, err
	}
	return 1 / math.Hypot(1, rOverX), nil
}

// PeakLossKW is the loss of a path at a flow, p = R·(P² + Q²)/U², kW. At cos phi 1 its share of P equals
// the linear rise exactly.
func (c Path) PeakLossKW(f Flow) (float64, error) {
	if err := errors.Join(c.check(), f.check()); err != nil {
		return 0, err
	}
	return c.ROhm * (float64(f.ExportKW*f.ExportKW) + float64(f.InjectedKVAr*f.InjectedKVAr)) / (c.VoltageKV * c.VoltageKV) / vPerKV, nil
}

// PowerLengthMWKm is the product of power and length at which a line of its own reaches a rise limit at
// cos phi 1, P·L = lim·U²/r′, MW km.
func PowerLengthMWKm(voltageKV, ohmPerKm, riseLimitFrac float64) (float64, error) {
	if err := errors.Join(bounds.Positive("voltage", voltageKV), bounds.Positive("resistance", ohmPerKm), bounds.Positive("rise limit", riseLimitFrac)); err != nil {
		return 0, err
	}
	return riseLimitFrac * voltageKV * voltageKV / ohmPerKm, nil
}

// ChargingMVAr is the reactive power that a line's capacitance gives, Qc = ω·C′·U²·L, Mvar.
//
// C′ nFPerKm, nF/km; L lengthKm; frequencyHz.
func ChargingMVAr(nFPerKm, voltageKV, lengthKm, frequencyHz float64) (float64, error) {
	if err := errors.Join(bounds.NonNegative("capacitance", nFPerKm), bounds.Positive("voltage", voltageKV), bounds.NonNegative("length", lengthKm), bounds.Positive("frequency", frequencyHz)); err != nil {
		return 0, err
	}
	return 2 * math.Pi * frequencyHz * nFPerKm * nF * voltageKV * voltageKV * lengthKm, nil
}

// ChargingAPerKm is the charging current, Ic = ω·C′·U/√3, A/km.
func ChargingAPerKm(nFPerKm, voltageKV, frequencyHz float64) (float64, error) {
	q, err := ChargingMVAr(nFPerKm, voltageKV, 1, frequencyHz)
	return q * units.KWPerMW / (sqrt3 * voltageKV), err
}

// ChargingRise is the no-load rise of a line by its own charging, X·Qc/(2U²).
func ChargingRise(xOhm, chargingMVAr, voltageKV float64) (float64, error) {
	if err := errors.Join(bounds.NonNegative("reactance", xOhm), bounds.NonNegative("charging power", chargingMVAr), bounds.Positive("voltage", voltageKV)); err != nil {
		return 0, err
	}
	return xOhm * chargingMVAr / (2 * voltageKV * voltageKV), nil
}

// NetworkImpedance is the impedance behind a point of known short-circuit power,
// Z = U²/Sk″, R = Z/√(1+κ²), X = κR, κ = X/R.
func NetworkImpedance(voltageKV, shortCircuitMVA, xOverR float64) (Path, error) {
	if err := errors.Join(bounds.Positive("voltage", voltageKV), bounds.Positive("short-circuit power", shortCircuitMVA), bounds.NonNegative("X over R", xOverR)); err != nil {
		return Path{}, err
	}
	z := voltageKV * voltageKV / shortCircuitMVA
	r := z / math.Hypot(1, xOverR)
	return Path{VoltageKV: voltageKV, ROhm: r, XOhm: xOverR * r}, nil
}

// ShortCircuitBehindMVA is the short-circuit power at the far end of a line, U²/|Z_grid + Z_line|, MVA.
func ShortCircuitBehindMVA(network, line Path) (float64, error) {
	if err := errors.Join(network.check(), line.check()); err != nil {
		return 0, err
	}
	z := math.Hypot(network.ROhm+line.ROhm, network.XOhm+line.XOhm)
	if z == 0 {
		return 0, bounds.Error("impedance", z, "above 0")
	}
	return network.VoltageKV * network.VoltageKV / z, nil
}

// ShortCircuitRatio is SCR = Sk″/P at the point of connection; Sk″ is the least network value without
// other plants.
func ShortCircuitRatio(shortCircuitMVA, powerKW float64) (float64, error) {
	if err := errors.Join(bounds.Positive("short-circuit power", shortCircuitMVA), bounds.Positive("power", powerKW)); err != nil {
		return 0, err
	}
	return shortCircuitMVA * units.KWPerMW / powerKW, nil
}

// WeightedShortCircuitRatio is the ratio for several converter plants, ΣSk_i·P_i/(ΣP_i)² (Zhang et al.
// 2014). Powers in kW, short-circuit powers in MVA.
func WeightedShortCircuitRatio(shortCircuitMVA, powerKW []float64) (float64, error) {
	if len(shortCircuitMVA) != len(powerKW) || len(powerKW) == 0 {
		return 0, bounds.Error("number of plants", float64(len(powerKW)), "as many as short-circuit powers, one or more")
	}
	var num, sum float64
	for i, p := range powerKW {
		if err := errors.Join(bounds.Positive("short-circuit power", shortCircuitMVA[i]), bounds.Positive("power", p)); err != nil {
			return 0, err
		}
		num += float64(shortCircuitMVA[i] * units.KWPerMW * p)
		sum += p
	}
	return num / (sum * sum), nil
}
