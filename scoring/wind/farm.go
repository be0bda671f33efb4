package wind

import (
	"errors"
	"fmt"
	"math"

	"groundtally/scoring/units"
)

// FarmInput is all that the year of a farm depends on.
type FarmInput struct {
	Site       Site
	Turbine    Turbine // one type for the whole farm
	HubHeightM float64
	At         []Position
	Existing   []Machine // of other farms, or permitted; their wakes act, their energy is not counted
	Settings   Settings
	Losses     []Loss // after the wake, in order; Defaults.Losses gives the usual ones
}

// Notice is a stable code for something a reader of the result must know.
type Notice string

// The notices of a farm result.
const (
	NoticeHighHub       Notice = "wind_hub_above_surface_layer"   // shear law extrapolated above 150 m
	NoticeFarFromRef    Notice = "wind_hub_far_from_reference"    // hub over twice, or under half, the reference height
	NoticeCtEstimated   Notice = "wind_ct_estimated"              // no published thrust; Frandsen's estimate
	NoticeCloseSpacing  Notice = "wind_spacing_below_3_rotors"    // wake models are not meant for it
	NoticeUncertainTI   Notice = "wind_turbulence_outside_fit"    // wake growth fitted for 0.065 to 0.15
	NoticeNoBlockage    Notice = "wind_blockage_not_modelled"     // for farms of several machines
	NoticeSmallTotal    Notice = "wind_small_total_loss"          // one total loss instead of categories
	NoticeRatedExceeded Notice = "wind_curve_exceeds_rated_power" // the published curve rises above rated
)

// TurbineYear is the first year of one machine, in MWh.
type TurbineYear struct {
	GrossMWhPerYr float64 // alone in the free stream
	WakedMWhPerYr float64 // behind the others, before further losses
	NetMWhPerYr   float64 // after all losses
	WakeLossFrac  float64
}

// SectorYear is what one sector of the rose gives in a typical first year, in MWh, before the losses behind the wake.
type SectorYear struct {
	FreeMWhPerYr  float64 // all machines in the free stream
	WakedMWhPerYr float64
}

// DirectionYear is what one computed direction gives in a typical first year, in MWh, before the losses
// behind the wake.
type DirectionYear struct {
	FromDeg       float64 // clockwise from north
	TimeFrac      float64 // of the year, all directions together 1
	FreeMWhPerYr  float64 // all machines in the free stream
	WakedMWhPerYr float64
}

// FarmResult is a typical first year of a farm.
type FarmResult struct {
	NetMWhPerYr      float64 // P50: even odds, by the inputs
	GrossMWhPerYr    float64 // free stream
	WakeLossFrac     float64 // by new and existing machines
	CapacityFactor   float64 // of the net energy
	Turbines         []TurbineYear
	Chain            []Step       // gross to net; the first step is the wake
	Sectors          []SectorYear // of the site's rose
	Directions       []DirectionYear
	SpeedSensitivity float64 // percent energy per percent speed, from runs at plus and minus 1 percent
	MeanSpeedMPerS   float64 // at the hub, free stream
	AirKgPerM3       float64 // density at the hub
	// ExtrapolationRatio is the hub height per height of the rose: how far the shear law was relied upon.
	ExtrapolationRatio float64
	// ExistingLossMWhPerYr is what the existing machines lose because of the new ones, before their
	// other losses.
	ExistingLossMWhPerYr float64
	Notices              []Notice
}

// FarmYear computes the energy of a farm in a typical first year of 8,760 hours.
//
// Each sector's Weibull scale is carried to the hub by the site's shear law. Air density comes from the
// standard atmosphere at ground plus hub height (with the site's temperature when known); machines with
// pitch control read their curve at v (rho/1.225)^(1/3), stall machines have their power scaled by
// rho/1.225. The rose is spread over Settings.Directions directions so that each sector keeps its time.
// For every direction and speed node the wakes are followed from the most upwind machine to the last,
// each with the thrust at its own waked speed; energy is
// sum over directions and bins of probability x free power x (waked/free power), the ratio linear
// between nodes. Losses follow as Chain has it.
//
// Positions nearer to each other than the sum of their rotor radii are an error.
func FarmYear(in FarmInput) (FarmResult, error) { return farmYear(in, nil) }

// farmYear is FarmYear that also shows the solution of every direction; the flow is only good until the
// next one. The farm's own machines follow the existing ones in it.
func farmYear(in FarmInput, show func(f *field, d int, fl *flow)) (FarmResult, error) {
	f, air, err := prepareFarm(in)
	if err != nil {
		return FarmResult{}, err
	}
	ms, err := f.place(in)
	if err != nil {
		return FarmResult{}, err
	}
	closest, err := closestApproach(in, ms, f)
	if err != nil {
		return FarmResult{}, err
	}
	bySector := f.bySector(1)
	w, wUp, wDown := f.byDirection(bySector), f.weights(1+sensitivityStep), f.weights(1-sensitivityStep)

	first := len(in.Existing)
	own := make([]TurbineYear, len(in.At))
	var alone, up, down, existing float64
	sectors := make([]SectorYear, len(f.rose))
	sectorFree := f.sectorEnergies(bySector)
	directions := make([]DirectionYear, len(f.shares))
	for d := range f.shares {
		alone += dot(w[0][d], f.kinds[0].ones)
	}
	fl := f.newFlow()
	for d := range f.shares {
		f.solve(fl, nil, d, ms, -1, w)
		if show != nil {
			show(f, d, fl)
		}
		waking := 0.0 // what the direction gives behind wakes, which its sectors share as they share its free energy
		for i := range ms {
			if i < first {
				existing += fl.energy[i]
				continue
			}
			own[i-first].WakedMWhPerYr += fl.energy[i]
			waking += fl.energy[i]
			up += dot(wUp[0][d], fl.ratio[i])
			down += dot(wDown[0][d], fl.ratio[i])
		}
		one := dot(w[0][d], f.kinds[0].ones)
		directions[d] = DirectionYear{
			FromDeg:  units.DegreesPerCircle * float64(d) / float64(len(f.shares)),
			TimeFrac: f.timeFrac(d), FreeMWhPerYr: one * float64(len(in.At)), WakedMWhPerYr: waking,
		}
		for _, sh := range f.shares[d] {
			free := float64(sh.frac * sectorFree[sh.sector])
			sectors[sh.sector].FreeMWhPerYr += float64(free * float64(len(in.At)))
			if one > 0 {
				sectors[sh.sector].WakedMWhPerYr += float64(waking * free / one)
			}
		}
	}
	r := FarmResult{Turbines: own, Sectors: sectors, Directions: directions, AirKgPerM3: air, ExtrapolationRatio: in.HubHeightM / in.Site.RefHeightM}
	var waked float64
	for i := range own {
		own[i].GrossMWhPerYr = alone
		r.GrossMWhPerYr += alone
		waked += own[i].WakedMWhPerYr
	}
	if !(r.GrossMWhPerYr > 0) || math.IsInf(r.GrossMWhPerYr, 0) {
		return FarmResult{}, fmt.Errorf("the site's wind gives %s no energy", in.Turbine.ID)
	}
	// Rounding may put the sum a last digit above gross for a machine that nothing wakes.
	r.WakeLossFrac = math.Max(0, 1-waked/r.GrossMWhPerYr)
	r.SpeedSensitivity = (up - down) / (2 * sensitivityStep * waked)
	losses := append([]Loss{{Name: LossWake, Frac: r.WakeLossFrac}}, in.Losses...)
	if r.Chain, r.NetMWhPerYr, err = Chain(r.GrossMWhPerYr, losses); err != nil {
		return FarmResult{}, err
	}
	left := r.NetMWhPerYr / r.Chain[0].AfterMWh
	for i := range own {
		own[i].NetMWhPerYr = own[i].WakedMWhPerYr * left
		own[i].WakeLossFrac = math.Max(0, 1-own[i].WakedMWhPerYr/alone)
	}
	r.CapacityFactor = CapacityFactor(r.NetMWhPerYr, in.Turbine.RatedKW*float64(len(in.At)))
	for _, s := range f.rose {
		if s.FrequencyFrac > 0 {
			r.MeanSpeedMPerS += float64(s.FrequencyFrac * s.Weibull.Mean())
		}
	}
	if first > 0 {
		var before float64
		for d := range f.shares {
			f.solve(fl, nil, d, ms[:first], -1, w)
			for _, e := range fl.energy[:first] {
				before += e
			}
		}
		r.ExistingLossMWhPerYr = math.Max(0, before-existing)
	}
	r.Notices = notices(in, closest)
	return r, nil
}

// sensitivityStep is the relative change of speed of the two side runs.
const sensitivityStep = 0.01

// prepareFarm checks all but the positions.
func prepareFarm(in FarmInput) (*field, float64, error) {
	if err := in.Settings.check(); err != nil {
		return nil, 0, err
	}
	air, err := StandardAtmosphere(in.Site.ElevationM + in.HubHeightM)
	if err == nil && in.Site.TempKnown {
		air, err = AtmosphereAt(in.Site.ElevationM+in.HubHeightM, in.Site.TempC)
	}
	if err != nil {
		return nil, 0, err
	}
	f, err := newField(in.Site, in.Turbine, in.HubHeightM, in.Existing, in.Settings, air.DensityKgPerM3)
	return f, air.DensityKgPerM3, err
}

// place lists the machines: existing ones first.
func (f *field) place(in FarmInput) ([]placed, error) {
	if len(in.At) == 0 {
		return nil, errors.New("no turbine positions")
	}
	ms := make([]placed, 0, len(in.Existing)+len(in.At))
	for _, m := range in.Existing {
		ms = append(ms, placed{m.At, f.kindOf(m)})
	}
	for i, p := range in.At {
		if !p.finite() {
			return nil, fmt.Errorf("turbine %d: its position is not finite", i+1)
		}
		ms = append(ms, placed{at: p})
	}
	return ms, nil
}

// closestApproach gives the least distance of a new machine to any other, in diameters of the larger
// rotor; an error when rotors could touch.
func closestApproach(in FarmInput, ms []placed, f *field) (float64, error) {
	closest := math.Inf(1)
	first := len(in.Existing)
	for i := first; i < len(ms); i++ {
		for j := range i {
			di, dj := f.kinds[ms[i].kind].turbine.RotorDiameterM, f.kinds[ms[j].kind].turbine.RotorDiameterM
			gap := math.Hypot(ms[i].at.X-ms[j].at.X, ms[i].at.Y-ms[j].at.Y)
			if gap < (di+dj)/2 {
				other := fmt.Sprintf("turbine %d", j-first+1)
				if j < first {
					other = fmt.Sprintf("existing machine %d", j+1)
				}
				return 0, fmt.Errorf("turbine %d stands %.1f m from %s: their rotors could touch", i-first+1, gap, other)
			}
			closest = math.Min(closest, gap/math.Max(di, dj))
		}
	}
	return closest, nil
}

func notices(in FarmInput, closest float64) []Notice {
	var out []Notice
	say := func(when bool, n Notice) {
		if when {
			out = append(out, n)
		}
	}
	say(in.HubHeightM > SurfaceLayerTopM, NoticeHighHub)
	say(in.HubHeightM > 2*in.Site.RefHeightM || 2*in.HubHeightM < in.Site.RefHeightM, NoticeFarFromRef)
	waked := len(in.At)+len(in.Existing) > 1
	estimated := !in.Turbine.Curve.HasCt()
	for _, m := range in.Existing {
		estimated = estimated || !m.Turbine.Curve.HasCt()
	}
	say(waked && estimated && in.Settings.Wake != WakeIEA37, NoticeCtEstimated)
	say(closest < 3, NoticeCloseSpacing)
	say(waked && in.Settings.Wake == WakeGaussian && (in.Settings.AmbientTIFrac < 0.065 || in.Settings.AmbientTIFrac > 0.15), NoticeUncertainTI)
	say(waked, NoticeNoBlockage)
	small := false
	for _, l := range in.Losses {
		small = small || l.Name == LossSmallTotal
	}
	say(small, NoticeSmallTotal)
	say(in.Turbine.Curve.MaxKW() > in.Turbine.RatedKW*1.01, NoticeRatedExceeded)
	return out
}

// WakeComparison is the farm's year by one wake model.
type WakeComparison struct {
	Wake          WakeModel
	WakeLossFrac  float64
	WakedMWhPerYr float64 // behind wakes, before the other losses
	NetMWhPerYr   float64
	Year          FarmResult
}

// CompareWakes computes the same farm by the Gaussian model and by the top hat of Jensen, in this order,
// whatever Settings.Wake says: how far they lie apart is a measure of how little is known of wakes.
// Errors are those of FarmYear.
func CompareWakes(in FarmInput) ([]WakeComparison, error) {
	models := []WakeModel{WakeGaussian, WakeJensen}
	out := make([]WakeComparison, 0, len(models))
	for _, m := range models {
		in.Settings.Wake = m
		r, err := FarmYear(in)
		if err != nil {
			return nil, err
		}
		out = append(out, WakeComparison{Wake: m, WakeLossFrac: r.WakeLossFrac, WakedMWhPerYr: r.Chain[0].AfterMWh, NetMWhPerYr: r.NetMWhPerYr, Year: r})
	}
	return out, nil
}
