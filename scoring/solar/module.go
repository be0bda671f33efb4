package solar

import "math"

// Module is what the engine needs to know of a panel.
type Module struct {
	GammaPerK     float64 // change of power with cell temperature, negative, per K
	LowLight      bool    // use HuldEfficiency in place of GammaPerK
	Glass         Glass
	U0WPerM2K     float64 // Faiman: heat loss without wind
	U1WsPerM3K    float64 // Faiman: more heat loss per m/s of wind
	Bifaciality   float64 // rear rating over front rating, 0 for a panel without active rear
	RearStructure float64 // share of rear light lost to posts and rails
	RearMismatch  float64 // share of rear power lost to uneven light
	ShadeBlocks   int     // bypass blocks across the row, see ShadePowerLoss
}

// FaimanCellC gives the cell temperature T_a + E/(U0 + U1 v): airC, irradianceWPerM2 on the panel,
// windMS at the panel. Fitted on open racks with seven glass-backsheet panels (U0 23.5 to 26.5, U1 6.25
// to 7.68); panels close to a roof run hotter. Source: Faiman 2008, Progress in Photovoltaics 16:307;
// IEC 61853-2.
func FaimanCellC(airC, irradianceWPerM2, windMS, u0, u1 float64) float64 {
	return airC + irradianceWPerM2/(u0+float64(u1*windMS))
}

// NOCTCellC gives the cell temperature T_a + (NOCT - 20)/800 E, an alternative to FaimanCellC. Source:
// IEC 61215 edition 2.
func NOCTCellC(airC, irradianceWPerM2, noctC float64) float64 {
	return airC + float64((noctC-20)/800*irradianceWPerM2)
}

// WindAtPanelMS brings wind speed from 10 m to a height: v10 (h/10)^0.2, h from 0.5 to 10 m; h outside
// counts as the nearest limit. Common practice.
func WindAtPanelMS(wind10mMS, heightM float64) float64 {
	return wind10mMS * math.Pow(clamp(heightM, 0.5, 10)/10, 0.2)
}

const (
	testIrradianceWPerM2 = 1000.0
	testCellC            = 25.0
)

// DCKWPerKWp gives the direct-current power for each kWp: (E/1000)[1 + gamma (T - 25)], E =
// irradianceWPerM2 that reaches the cells, T = cellC; never negative.
func DCKWPerKWp(irradianceWPerM2, cellC, gammaPerK float64) float64 {
	return max(0, irradianceWPerM2/testIrradianceWPerM2*(1+float64(gammaPerK*(cellC-testCellC))))
}

// HuldEfficiency gives efficiency relative to test conditions, with the effects of low light and
// temperature:
//
//	1 + k1 ln g + k2 ln^2 g + k3 t + k4 t ln g + k5 t ln^2 g + k6 t^2, g = E/1000, t = T - 25
//
// for crystalline silicon; g not below 0.01; never negative. Fitted on older panels: it overstates the
// low-light loss of recent ones. Source: Huld et al. 2011, Solar Energy Materials and Solar Cells
// 95:3359.
func HuldEfficiency(irradianceWPerM2, cellC float64) float64 {
	const k1, k2, k3, k4, k5, k6 = -0.017237, -0.040465, -0.004702, 0.000149, 0.000170, 0.000005
	l := math.Log(max(0.01, irradianceWPerM2/testIrradianceWPerM2))
	t := cellC - testCellC
	l2 := float64(l * l)
	e := 1 + float64(k1*l) + float64(k2*l2) + float64(t*(k3+float64(k4*l)+float64(k5*l2)+float64(k6*t)))
	return max(0, e)
}

// Inverter is the loss of power from direct to alternating current and its size.
type Inverter struct {
	DCACRatio  float64 // panel rating over inverter rating
	K0, K1, K2 float64 // own use, linear and square loss, as shares of the inverter's rating
}

// Efficiency gives p/(p + k0 + k1 p + k2 p^2), p = load, direct-current input over the inverter's
// rating; p over 1 counts as 1, p of 0 gives 0. Source: Schmidt and Sauer 1996, Sonnenenergie 4:43.
func (v Inverter) Efficiency(load float64) float64 {
	p := min(1, load)
	if p <= 0 {
		return 0
	}
	return p / (p + v.K0 + float64(v.K1*p) + float64(v.K2*float64(p*p)))
}

// EuropeanEfficiency gives the mean of Efficiency at 5, 10, 20, 30, 50 and 100 % load with the weights
// 0.03, 0.06, 0.13, 0.10, 0.48, 0.20.
func (v Inverter) EuropeanEfficiency() float64 {
	sum := 0.0
	for _, lw := range [6][2]float64{{.05, .03}, {.10, .06}, {.20, .13}, {.30, .10}, {.50, .48}, {1, .20}} {
		sum += float64(lw[1] * v.Efficiency(lw[0]))
	}
	return sum
}
