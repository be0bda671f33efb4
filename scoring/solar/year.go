package solar

import (
	"fmt"
	"math"

	"groundtally/scoring/units"
)

// MountKind is a way to carry panels.
type MountKind uint8

// The kinds of mount. FixedTilt: rows at a fixed tilt near the ground. SingleAxis: rows that turn about a
// horizontal axis (parallel to the ground on slopes). VerticalRows: upright rows active on both sides.
// Elevated: fixed tilt high over a crop.
const (
	FixedTilt MountKind = iota
	SingleAxis
	VerticalRows
	Elevated
)

func (k MountKind) String() string {
	return [...]string{"fixed tilt", "single axis", "vertical rows", "elevated"}[k]
}

// Mount is how the panels stand.
type Mount struct {
	Kind           MountKind
	TiltDeg        float64 // FixedTilt, Elevated: 0 to 90
	AzimuthDeg     float64 // where the front faces; for VerticalRows 90 is the usual east
	AxisAzimuthDeg float64 // SingleAxis: direction of the axis, 180 for north to south
	MaxAngleDeg    float64 // SingleAxis: largest rotation, 0 to 90
	Backtrack      bool    // SingleAxis: turn back so that rows do not shade each other
	GCR            float64 // collector width over horizontal pitch, 0 for a single row to 1
	Rows           int     // number of rows, whose first has a free front; 0 for very many
	WidthM         float64 // collector width; needed with bifacial panels that are not vertical
	ClearanceM     float64 // lower edge over ground, for trackers of the flat panel; needed as WidthM
	SlopeDeg       float64 // of the ground, 0 to 45
	AspectDeg      float64 // where the ground falls to
	// Horizon is what stands around the site; nil for a flat horizon.
	Horizon *Horizon
}

// Plant is what stands on the site.
type Plant struct {
	Mount    Mount
	Module   Module
	Inverter Inverter
	Losses   Losses
	WindMS   float64 // at the panels
	Sky      SkyModel
}

// EquatorAzimuthDeg gives the bearing of the equator: 180 in the north, 0 in the south.
func EquatorAzimuthDeg(latDeg float64) float64 {
	if latDeg < 0 {
		return 0
	}
	return 180
}

func (p *Plant) check() error {
	m, mod, l := &p.Mount, &p.Module, &p.Losses
	err := firstError(
		within("Mount.Kind", float64(m.Kind), 0, float64(Elevated)),
		within("Mount.GCR", m.GCR, 0, 1),
		within("Mount.Rows", float64(m.Rows), 0, 1e9),
		within("Mount.SlopeDeg", m.SlopeDeg, 0, 45),
		within("Mount.AspectDeg", m.AspectDeg, -360, 360),
		within("Mount.WidthM", m.WidthM, 0, 100),
		within("Mount.ClearanceM", m.ClearanceM, 0, 100),
		within("Module.GammaPerK", mod.GammaPerK, -0.02, 0.01),
		within("Module.Glass.Ar", mod.Glass.Ar, 0.05, 0.5),
		within("Module.U0WPerM2K", mod.U0WPerM2K, 5, 100),
		within("Module.U1WsPerM3K", mod.U1WsPerM3K, 0, 50),
		within("Module.Bifaciality", mod.Bifaciality, 0, 1),
		within("Module.RearStructure", mod.RearStructure, 0, 0.5),
		within("Module.RearMismatch", mod.RearMismatch, 0, 0.5),
		within("Module.ShadeBlocks", float64(mod.ShadeBlocks), 0, 1000),
		within("Inverter.DCACRatio", p.Inverter.DCACRatio, 0.2, 5),
		within("Inverter.K0", p.Inverter.K0, 0, 0.5),
		within("Inverter.K1", p.Inverter.K1, 0, 0.5),
		within("Inverter.K2", p.Inverter.K2, 0, 0.5),
		within("Losses.LIDFrac", l.LIDFrac, 0, 1),
		within("Losses.NameplateFrac", l.NameplateFrac, -0.2, 1),
		within("Losses.MismatchFrac", l.MismatchFrac, 0, 1),
		within("Losses.DCWiringFrac", l.DCWiringFrac, 0, 1),
		within("Losses.ACWiringFrac", l.ACWiringFrac, 0, 1),
		within("Losses.TransformerFrac", l.TransformerFrac, 0, 1),
		within("Losses.AuxiliaryFrac", l.AuxiliaryFrac, 0, 1),
		within("Losses.CurtailmentFrac", l.CurtailmentFrac, 0, 1),
		within("Losses.AvailabilityFrac", l.AvailabilityFrac, 0, 1),
		within("WindMS", p.WindMS, 0, 60),
		within("Sky", float64(p.Sky), 0, float64(Perez)),
	)
	for i := range l.SoilingFrac {
		err = firstError(err, within(fmt.Sprintf("Losses.SoilingFrac[%d]", i+1), l.SoilingFrac[i], 0, 1), within(fmt.Sprintf("Losses.SnowFrac[%d]", i+1), l.SnowFrac[i], 0, 1))
	}
	if err != nil {
		return err
	}
	switch m.Kind {
	case SingleAxis:
		err = firstError(within("Mount.AxisAzimuthDeg", m.AxisAzimuthDeg, -360, 360), within("Mount.MaxAngleDeg", m.MaxAngleDeg, 0, 90))
	case VerticalRows:
		err = within("Mount.AzimuthDeg", m.AzimuthDeg, -360, 360)
		if err == nil && mod.Bifaciality == 0 {
			err = &InputError{"Module.Bifaciality", 0, "over 0: vertical rows need panels active on both sides"}
		}
	default:
		err = firstError(within("Mount.AzimuthDeg", m.AzimuthDeg, -360, 360), within("Mount.TiltDeg", m.TiltDeg, 0, 90))
	}
	if err == nil && mod.Bifaciality > 0 && m.Kind != VerticalRows {
		switch {
		case m.WidthM == 0:
			err = &InputError{"Mount.WidthM", 0, "over 0 when the panels are bifacial"}
		case m.ClearanceM == 0:
			err = &InputError{"Mount.ClearanceM", 0, "over 0 when the panels are bifacial"}
		}
	}
	return err
}

// YearInput is a place and a plant.
type YearInput struct {
	Climate ClimateInput
	Plant   Plant
}

// PowerBins is the number of steps of a plant's distribution of power.
const PowerBins = 100

// YearResult is the first year of a plant. Energies are at the plant's alternating-current terminals.
type YearResult struct {
	SpecificYieldKWhPerKWp float64     // first year
	MonthKWhPerKWp         [12]float64 // adds up to SpecificYieldKWhPerKWp
	PlaneKWhPerM2          float64     // light on the front, without neighbouring rows
	PlaneMonthKWhPerM2     [12]float64
	PerformanceRatio       float64 // base: front-side light; bifacial plants may exceed 1
	CapacityFactorDC       float64 // base: panel rating
	Chain                  []Step
	// HourKWhPerKWp parts MonthKWhPerKWp by hour of the day: the hour from 0 to 1 first, by the sun where
	// months are given, by the file's clock where hours are.
	HourKWhPerKWp  [12][24]float64
	GHIKWhPerM2    [12]float64 // light on the open ground
	GroundKWhPerM2 [12]float64 // mean light on the ground between and under the rows
	DiffuseShare   float64     // of the light on the open ground
	// PowerHours are the hours of the year in which the inverters give from b to b+1 hundredths of their
	// rating, before the losses behind them; hours without power are left out.
	PowerHours [PowerBins]float64
	Notes      []MonthNote
}

// CropLight gives the mean light on the ground between and under the rows as a share of that on open
// ground, over the months of growth. ok is false when there is no light in them.
func (r *YearResult) CropLight(growing [12]bool) (share float64, ok bool) {
	ground, open := 0.0, 0.0
	for m, in := range growing {
		if in {
			ground += r.GroundKWhPerM2[m]
			open += r.GHIKWhPerM2[m]
		}
	}
	if open <= 0 {
		return 0, false
	}
	return ground / open, true
}

// AllYear marks all months as months of growth.
func AllYear() (g [12]bool) {
	for i := range g {
		g[i] = true
	}
	return g
}

// Year computes the first year of a plant at a place. For several plants at one place make the Climate
// once and call its Yield.
func Year(in YearInput) (YearResult, error) {
	if err := in.Plant.check(); err != nil {
		return YearResult{}, err
	}
	c, err := NewClimate(in.Climate)
	if err != nil {
		return YearResult{}, err
	}
	return c.Yield(in.Plant)
}

// The quantities summed over the moments of a month, in kWh/kWp, in the order of the chain.
const (
	sumPlane = iota
	sumHorizon
	sumShaded
	sumElectrical
	sumDiffuse
	sumIncidence
	sumRear
	sumSoiled
	sumWarm
	sumInverted
	sumClipped
	sums
)

// Yield computes the first year of a plant in this climate.
//
// At each moment and for each day type: light on the open plane (beam, sky by the plant's SkyModel,
// ground); what the horizon hides of the beam, of the light around the sun, of the sky, for which ground stands;
// beam and light around the sun less ShadedShare, then less ShadePowerLoss; sky and ground as
// seen among rows (ViewOfRows); glass (Martin and Ruiz); light on the rear times bifaciality; soiling;
// FaimanCellC from the light on both sides; power; constant losses; inverter; its limit. The chain of the
// result has these as steps.
//
// The light of the ground is the mean over the ground among the rows, shade counted. Near-ground rows
// that are not vertical get its part on the rear times min(1, clearance/(0.5 width)), because the ground
// under them is darker than the mean; this is a simplification of this program. Of Rows the share
// (Rows-1)/Rows stands behind another. All that the horizon hides of the sky counts as ground in the light of
// the site's own ground, which is an upper bound.
func (c *Climate) Yield(p Plant) (YearResult, error) { return c.yield(p, nil) }

// yield is Yield. Where power is not nil it also gets the power of the hours, see PowerSeries.
func (c *Climate) yield(p Plant, power []float64) (YearResult, error) {
	if err := p.check(); err != nil {
		return YearResult{}, err
	}
	m := &p.Mount
	phi := p.Module.Bifaciality * (1 - p.Module.RearStructure - p.Module.RearMismatch)
	dc := (1 - p.Losses.LIDFrac) * (1 - p.Losses.NameplateFrac) * (1 - p.Losses.MismatchFrac) * (1 - p.Losses.DCWiringFrac)
	rated := 1 / p.Inverter.DCACRatio
	v := newViewer(&p, phi)
	rowShare := v.rowShare
	var acc [12][sums]float64
	var ground [12]float64
	var hours [PowerBins]float64
	var clock [12][24]float64
	var kept [12]float64
	for m := range kept {
		kept[m] = (1 - p.Losses.SnowFrac[m]) * p.Losses.behindInverter()
	}
	for i := range c.moments {
		mo := &c.moments[i]
		suns := c.suns[mo.first : mo.first+mo.count]
		if m.Kind == SingleAxis {
			v.follow(suns[mo.count/2].v)
		}
		var lit looks
		if len(c.edges) > 0 {
			lit = v.look(suns, c.edges[2*i:2*i+2], mo.sinE)
		} else {
			lit = v.look(suns, nil, mo.sinE)
		}
		wind := mo.windMS
		if wind < 0 {
			wind = p.WindMS
		}
		cooling := p.Module.U0WPerM2K + float64(p.Module.U1WsPerM3K*wind)
		albedo := c.in.Albedo[mo.month]
		soil := 1 - p.Losses.SoilingFrac[mo.month]
		cosTilt := v.cosTilt
		sum := &acc[mo.month]
		for _, l := range c.of(mo) {
			if l.ghi <= 0 {
				continue
			}
			// around is the share of diffuse light that comes from around the sun, horizon that near the
			// horizon on the front; the rest comes from the whole dome.
			around, horizon := 0.0, 0.0
			switch p.Sky {
			case HayDavies:
				around = min(1, l.dni/mo.gon)
			case Perez:
				s := perezState(Light{l.ghi, l.dhi, l.dni, mo.gon, mo.sinE}, mo.airMass, mo.zenith)
				around = s.F1
				horizon = float64(l.dhi * s.F2 * math.Sqrt(max(0, 1-float64(cosTilt*cosTilt))))
			}
			dome := float64(l.dhi * (1 - around))
			ring := float64(l.dhi * around)
			beam := float64(l.dni*lit.front.cosIncidence) + float64(ring*lit.front.ratio)
			// A dark horizon dims no more than the dome gives.
			openDome := max(0, float64(dome*(1+cosTilt)/2)+horizon)
			openGnd := float64(albedo * l.ghi * (1 - cosTilt) / 2)
			plane := beam + openDome + openGnd
			// on is the light on open ground at this site.
			on := l.ghi
			if m.Horizon != nil {
				beam = float64(beam * lit.front.seen)
				horizon = float64(horizon * v.skyLeft)
				on = float64(l.dni*lit.seenSin) + float64(l.dhi*v.flatSky)
				openDome = max(0, float64(dome*v.sky)+horizon)
				openGnd = float64(albedo * on * (1 - v.sky))
			}
			cut := float64(beam * (1 - lit.shaded))
			live := float64(beam * (1 - lit.power))
			onGround := float64(l.dni*lit.groundSin) + float64(l.dhi*v.groundSky)
			// A row behind another sees no bright horizon; a dark one is kept.
			behind := min(0, horizon)
			skyIn := max(0, float64(dome*v.front.sky)+mix(behind, horizon, rowShare))
			gndIn := float64(albedo * mix(onGround, on, rowShare) * v.front.ground)
			among := live + skyIn + gndIn
			through := float64(live*lit.front.glass) + float64(skyIn*v.front.glassSky) + float64(gndIn*v.front.glassGnd)
			both, heat := through, cut+skyIn+gndIn
			if phi > 0 {
				rb := float64((float64(l.dni*lit.rear.cosIncidence) + float64(ring*lit.rear.ratio)) * lit.rear.seen * (1 - lit.power))
				rs := float64(dome * v.rear.sky)
				rg := float64(albedo * mix(onGround, on, rowShare) * v.rear.ground)
				both += float64(phi * (float64(rb*lit.rear.glass) + float64(rs*v.rear.glassSky) + float64(rg*v.rear.glassGnd)))
				heat += float64(phi * (rb + rs + rg))
			}
			clean := float64(both * soil)
			cell := mo.airC + heat/cooling
			var kw float64
			if p.Module.LowLight {
				kw = float64(clean/testIrradianceWPerM2) * HuldEfficiency(clean, cell)
			} else {
				kw = DCKWPerKWp(clean, cell, p.Module.GammaPerK)
			}
			in := float64(kw * dc)
			ac := float64(in * p.Inverter.Efficiency(in/rated))
			out := min(ac, rated)
			w := mo.weight
			sum[sumPlane] += float64(w * plane)
			sum[sumHorizon] += float64(w * (beam + openDome + openGnd))
			sum[sumShaded] += float64(w * (cut + openDome + openGnd))
			sum[sumElectrical] += float64(w * (live + openDome + openGnd))
			sum[sumDiffuse] += float64(w * among)
			sum[sumIncidence] += float64(w * through)
			sum[sumRear] += float64(w * both)
			sum[sumSoiled] += float64(w * clean)
			sum[sumWarm] += float64(w * kw * units.WPerKW)
			sum[sumInverted] += float64(w * ac * units.WPerKW)
			sum[sumClipped] += float64(w * out * units.WPerKW)
			ground[mo.month] += float64(w * onGround)
			clock[mo.month][mo.hour] += float64(w * out * units.WPerKW)
			if power != nil {
				power[c.slots[i]] = float64(out * kept[mo.month])
			}
			if out > 0 {
				hours[min(PowerBins-1, int(out/rated*PowerBins))] += float64(w * units.WPerKW)
			}
		}
	}
	r := c.result(&p, &acc, &clock, ground)
	r.PowerHours = hours
	return r, nil
}

// left gives the share of an open view that rows leave; all of it when nothing is seen anyway.
func left(among, open float64) float64 {
	if open < 1e-9 {
		return 1
	}
	return among / open
}

// mix gives the value among rows for a share of rows and the open value for the rest.
func mix(among, open, share float64) float64 {
	return float64(share*among) + float64((1-share)*open)
}

func (c *Climate) result(p *Plant, acc *[12][sums]float64, clock *[12][24]float64, ground [12]float64) YearResult {
	var total, snowed [sums]float64
	for m := range acc {
		for k, v := range acc[m] {
			total[k] += v
			snowed[k] += float64(v * (1 - p.Losses.SnowFrac[m]))
		}
	}
	l := &p.Losses
	ch := chain{at: total[sumPlane], steps: make([]Step, 0, 20)}
	if p.Mount.Horizon != nil {
		ch.to(StepHorizon, total[sumHorizon])
	}
	ch.to(StepRowShade, total[sumShaded])
	ch.to(StepShadePower, total[sumElectrical])
	ch.to(StepRowDiffuse, total[sumDiffuse])
	ch.to(StepIncidence, total[sumIncidence])
	ch.to(StepRear, total[sumRear])
	ch.to(StepSoiling, total[sumSoiled])
	ch.to(StepSnow, snowed[sumSoiled])
	ch.to(StepTemperature, snowed[sumWarm])
	ch.lose(StepLID, l.LIDFrac)
	ch.lose(StepNameplate, l.NameplateFrac)
	ch.lose(StepMismatch, l.MismatchFrac)
	ch.lose(StepDCWiring, l.DCWiringFrac)
	ch.to(StepInverter, snowed[sumInverted])
	ch.to(StepClipping, snowed[sumClipped])
	ch.lose(StepACWiring, l.ACWiringFrac)
	ch.lose(StepTransformer, l.TransformerFrac)
	ch.lose(StepAuxiliary, l.AuxiliaryFrac)
	ch.lose(StepCurtailment, l.CurtailmentFrac)
	ch.lose(StepAvailable, l.AvailabilityFrac)

	r := YearResult{
		SpecificYieldKWhPerKWp: ch.at,
		PlaneKWhPerM2:          total[sumPlane],
		CapacityFactorDC:       ch.at / units.HoursPerYear,
		Chain:                  ch.steps,
		GHIKWhPerM2:            c.ghi,
		GroundKWhPerM2:         ground,
		Notes:                  c.Notes(),
	}
	after := l.behindInverter()
	ghi, dhi := 0.0, 0.0
	for m := range acc {
		r.PlaneMonthKWhPerM2[m] = acc[m][sumPlane]
		r.MonthKWhPerKWp[m] = float64(acc[m][sumClipped] * (1 - p.Losses.SnowFrac[m]) * after)
		for h, kwh := range clock[m] {
			r.HourKWhPerKWp[m][h] = float64(kwh * (1 - p.Losses.SnowFrac[m]) * after)
		}
		ghi += c.ghi[m]
		dhi += c.dhi[m]
	}
	if r.PlaneKWhPerM2 > 0 {
		r.PerformanceRatio = ch.at / r.PlaneKWhPerM2
	}
	if ghi > 0 {
		r.DiffuseShare = dhi / ghi
	}
	return r
}

// TiltPoint is the yield at one tilt.
type TiltPoint struct{ TiltDeg, YieldKWhPerKWp float64 }

// TiltCurve computes the plant's yield at tilts from 0 to maxDeg in steps of stepDeg and gives all of
// them with the position of the best, the flattest of equals. The plant must be FixedTilt or Elevated;
// its own TiltDeg is not used.
func (c *Climate) TiltCurve(p Plant, stepDeg, maxDeg float64) (curve []TiltPoint, best int, err error) {
	if p.Mount.Kind != FixedTilt && p.Mount.Kind != Elevated {
		return nil, 0, &InputError{"Mount.Kind", float64(p.Mount.Kind), "fixed tilt or elevated for a curve of tilts"}
	}
	if err := firstError(within("stepDeg", stepDeg, 0.1, 90), within("maxDeg", maxDeg, 0, 90)); err != nil {
		return nil, 0, err
	}
	for i := 0; float64(float64(i)*stepDeg) <= maxDeg; i++ {
		p.Mount.TiltDeg = float64(float64(i) * stepDeg)
		r, err := c.Yield(p)
		if err != nil {
			return nil, 0, err
		}
		curve = append(curve, TiltPoint{p.Mount.TiltDeg, r.SpecificYieldKWhPerKWp})
		if r.SpecificYieldKWhPerKWp > curve[best].YieldKWhPerKWp {
			best = i
		}
	}
	return curve, best, nil
}
