package wind

import (
	"fmt"
	"math"

	"groundtally/scoring/units"
)

// Generic describes a machine of which no more than size is known.
type Generic struct {
	RatedKW           float64 // 1 to 30000
	RotorDiameterM    float64 // 1 to 300
	Cp                float64 // electrical power coefficient below rated, above 0 to 16/27
	TurbulenceFrac    float64 // turbulence intensity of the smoothing, 0 (none) to 0.3
	CutInMPerS        float64
	CutOutMPerS       float64
	SpeedStepMPerS    float64 // grid of the curve; 0.1 resolves the knee
	IntegrationPoints int     // points of the smoothing integral over plus and minus 5 sigma, at least 200
}

// RatedSpeed is the speed (m/s) at which a rotor reaches rated power:
// v_r = (P_r/(rho/2 pi D^2/4 Cp))^(1/3) with P_r in W and rho 1.225 kg/m3.
func RatedSpeed(ratedKW, rotorDiameterM, cp float64) float64 {
	return math.Cbrt(ratedKW * units.WPerKW / (0.5 * ReferenceDensityKgPerM3 * discArea(rotorDiameterM) * cp))
}

func discArea(d float64) float64 { return math.Pi * d * d / 4 }

// Curve makes the power curve of a machine from its size: P(v) = min(P_r, rho/2 pi D^2/4 Cp v^3) from
// cut-in to cut-out, then smoothed by turbulence, P_TI(u) = integral of P(x) N(x; u, TI u) dx, before
// the cut-out step. Cut-in and cut-out themselves stay sharp. Thrust is FrandsenCt. Source:
// Saint-Drenan et al. 2020, Renewable Energy 157 (simple form; Cp 0.44 is the mode of some 600
// published curves, four in five lie from 0.40 to 0.50).
func (g Generic) Curve() (*PowerCurve, error) {
	switch {
	case !(g.RatedKW >= 1 && g.RatedKW <= 30000):
		return nil, fmt.Errorf("rated power %g kW lies outside 1 to 30000", g.RatedKW)
	case !(g.RotorDiameterM >= 1 && g.RotorDiameterM <= 300):
		return nil, fmt.Errorf("rotor diameter %g m lies outside 1 to 300", g.RotorDiameterM)
	case !(g.Cp > 0 && g.Cp <= 16.0/27):
		return nil, fmt.Errorf("power coefficient %g lies outside 0 to 16/27", g.Cp)
	case !(g.TurbulenceFrac >= 0 && g.TurbulenceFrac <= 0.3):
		return nil, fmt.Errorf("turbulence intensity %g lies outside 0 to 0.3", g.TurbulenceFrac)
	case !(g.CutInMPerS >= 0 && g.CutOutMPerS > g.CutInMPerS && g.CutOutMPerS <= 50):
		return nil, fmt.Errorf("cut-in %g and cut-out %g m/s must rise within 0 to 50", g.CutInMPerS, g.CutOutMPerS)
	case !(g.SpeedStepMPerS >= 0.01 && g.SpeedStepMPerS <= 1):
		return nil, fmt.Errorf("speed step %g m/s lies outside 0.01 to 1", g.SpeedStepMPerS)
	case g.IntegrationPoints < 200 || g.IntegrationPoints > 100000:
		return nil, fmt.Errorf("%d integration points: 200 to 100000 are needed", g.IntegrationPoints)
	}
	rotor := 0.5 * ReferenceDensityKgPerM3 * discArea(g.RotorDiameterM) * g.Cp / units.WPerKW
	raw := func(v float64) float64 {
		if v < g.CutInMPerS {
			return 0
		}
		return math.Min(g.RatedKW, rotor*v*v*v)
	}
	smooth := func(u float64) float64 {
		if g.TurbulenceFrac == 0 || u == 0 {
			return raw(u)
		}
		const reach = 5.0
		n := g.IntegrationPoints
		var p, w float64
		for i := range n {
			s := reach * (2*(float64(i)+0.5)/float64(n) - 1)
			d := math.Exp(-0.5 * s * s)
			p += float64(d * raw(u+float64(s*g.TurbulenceFrac*u)))
			w += d
		}
		return math.Min(p/w, g.RatedKW) // a mean of values up to rated, but for rounding
	}
	steps := int(math.Ceil((g.CutOutMPerS - g.CutInMPerS) / g.SpeedStepMPerS * (1 - 1e-12)))
	pts := make([]CurvePoint, 0, steps+2)
	for i := range steps {
		v := g.CutInMPerS + float64(float64(i)*g.SpeedStepMPerS)
		// Without smoothing the knee is a corner; it gets a point of its own.
		vr := RatedSpeed(g.RatedKW, g.RotorDiameterM, g.Cp)
		if i > 0 && g.TurbulenceFrac == 0 && vr < v && vr > pts[len(pts)-1].SpeedMPerS {
			pts = append(pts, CurvePoint{SpeedMPerS: vr, PowerKW: g.RatedKW})
		}
		pts = append(pts, CurvePoint{SpeedMPerS: v, PowerKW: smooth(v)})
	}
	pts = append(pts, CurvePoint{SpeedMPerS: g.CutOutMPerS, PowerKW: smooth(g.CutOutMPerS)})
	return NewPowerCurve(pts)
}
