package wind

import (
	"fmt"
	"math"

	"groundtally/scoring/units"
)

// Works are the sizes of what is built for a farm. Defaults.Works gives the shipped ones; track length
// and substation depend on the site and have no default.
type Works struct {
	Turbines     int
	FoundationM2 float64 // per turbine, permanent
	CranePadM2   float64 // per turbine, permanent
	LaydownM2    float64 // per turbine, temporary
	CompoundM2   float64 // per farm, temporary
	TrackWidthM  float64
	TrackLengthM float64 // new track; existing road does not count
	SubstationM2 float64 // per farm, permanent
}

// LandTake is the ground that the works take.
type LandTake struct {
	FoundationsHa, CranePadsHa, TracksHa, SubstationHa float64
	PermanentHa                                        float64 // the sum of the four
	TemporaryHa                                        float64 // taken while building, besides the permanent
}

// Level picks one of the three values of a default.
type Level uint8

// The levels of a default.
const (
	Central Level = iota
	Low
	High
)

func (v Default) at(l Level) float64 {
	switch l {
	case Low:
		return v.Low
	case High:
		return v.High
	}
	return v.Central
}

// Works gives the sizes at a level of the defaults, for a number of turbines, new track (m) and
// substation ground (m2).
func (d Defaults) Works(l Level, turbines int, trackLengthM, substationM2 float64) (Works, error) {
	w := Works{Turbines: turbines, TrackLengthM: trackLengthM, SubstationM2: substationM2}
	for _, c := range []struct {
		name string
		to   *float64
	}{{"foundation_m2", &w.FoundationM2}, {"crane_pad_m2", &w.CranePadM2}, {"laydown_m2", &w.LaydownM2}, {"compound_m2", &w.CompoundM2}, {"track_width_m", &w.TrackWidthM}} {
		v, err := d.Get(c.name)
		if err != nil {
			return Works{}, err
		}
		*c.to = v.at(l)
	}
	return w, nil
}

// Land builds up the ground taken: permanent = n (foundation + crane pad) + track length x width +
// substation; temporary = n laydown + compound. Follows the distinction of Denholm et al. 2009,
// NREL/TP-6A2-45834, whose shares per MW come from smaller machines and are for comparison.
func (w Works) Land() (LandTake, error) {
	for _, x := range []float64{w.FoundationM2, w.CranePadM2, w.LaydownM2, w.CompoundM2, w.TrackWidthM, w.TrackLengthM, w.SubstationM2} {
		if !(x >= 0) || math.IsInf(x, 0) {
			return LandTake{}, fmt.Errorf("works of the wind farm: %g is not a size", x)
		}
	}
	if w.Turbines < 1 {
		return LandTake{}, fmt.Errorf("works of a wind farm with %d turbines", w.Turbines)
	}
	n := float64(w.Turbines)
	l := LandTake{
		FoundationsHa: n * w.FoundationM2 / units.M2PerHa,
		CranePadsHa:   n * w.CranePadM2 / units.M2PerHa,
		TracksHa:      w.TrackLengthM * w.TrackWidthM / units.M2PerHa,
		SubstationHa:  w.SubstationM2 / units.M2PerHa,
		TemporaryHa:   (float64(n*w.LaydownM2) + w.CompoundM2) / units.M2PerHa,
	}
	l.PermanentHa = l.FoundationsHa + l.CranePadsHa + l.TracksHa + l.SubstationHa
	return l, nil
}

// SpacingDensityMWPerKm2 is the rated power per ground of an endless square lattice with spacings a D
// by b D: P_r/(a b D^2). It counts the packing core alone, so it exceeds the density of whole leased
// land (Denholm et al. 2009: 3.0 MW/km2) several times; show both.
func SpacingDensityMWPerKm2(ratedKW, rotorDiameterM, a, b float64) (float64, error) {
	if !(ratedKW > 0) || !(rotorDiameterM > 0) || !(a > 0) || !(b > 0) {
		return 0, fmt.Errorf("density of %g kW, rotor %g m, spacing %g by %g: all must be above 0", ratedKW, rotorDiameterM, a, b)
	}
	areaKm2 := a * b * rotorDiameterM * rotorDiameterM / (units.MPerKm * units.MPerKm)
	return ratedKW / units.KWPerMW / areaKm2, nil
}

// DensityMWPerKm2 turns ground per power (ha/MW) into power per ground.
func DensityMWPerKm2(haPerMW float64) float64 {
	return units.MPerKm * units.MPerKm / units.M2PerHa / haPerMW
}
