package grid

import (
	"fmt"

	"groundtally/scoring/params"
	"groundtally/scoring/units"
)

// LevelID names a voltage level.
type LevelID string

// The levels, lowest first.
const (
	LV    LevelID = "lv"
	MV11  LevelID = "mv11"
	MV20  LevelID = "mv20"
	MV33  LevelID = "mv33"
	HV66  LevelID = "hv66"
	HV110 LevelID = "hv110"
)

var levelOrder = []LevelID{LV, MV11, MV20, MV33, HV66, HV110}

func (l LevelID) high() bool   { return l == HV66 || l == HV110 }
func (l LevelID) medium() bool { return l == MV11 || l == MV20 || l == MV33 }

// Level is a voltage level with its practice bands.
type Level struct {
	ID                        LevelID
	FromKV, NominalKV, ToKV   float64 // a network voltage v belongs here when FromKV <= v < ToKV
	LowerMW, UsualMW, MostMW  float64
	RiseLimitFrac             float64
	EffortCable, EffortOvhead float64 // per km
}

// Band places the power of a plant in the practice band of a level.
type Band string

// The bands.
const (
	BandBelow    Band = "unusual, dear"     // below the lower edge
	BandUsual    Band = "usual"             //
	BandPossible Band = "possible, study"   // above the usual upper edge, up to the extreme
	BandAbove    Band = "not at this level" // above the extreme
)

// BandOf gives the band of a power at the level.
func (l Level) BandOf(powerKW float64) Band {
	mw := powerKW / units.KWPerMW
	switch {
	case mw < l.LowerMW:
		return BandBelow
	case mw <= l.UsualMW:
		return BandUsual
	case mw <= l.MostMW:
		return BandPossible
	}
	return BandAbove
}

// Model holds the defaults and the catalogues that an assessment needs. It is read only once made and may
// be used by many goroutines.
type Model struct {
	levels       []Level
	conductors   map[conductorKey][]Conductor
	transformers *Transformers

	frequencyHz, cosPhi                                    float64
	detour, kWind, kSolar                                  [3]float64
	shortM, shortExtraM, slackCable, slackOvhead, termM    float64
	derateBuried, derateOverhead, derateTwo, screen        float64
	margin, lowVoltage                                     float64
	rapid, chargeNote, chargeHeavy                         float64
	scrRed, scrAmber, scrNote                              float64
	xrBusbar, xrRural, xrHV                                float64
	spareMonths                                            float64
	circuits                                               int
	peiSplit                                               float64
	effortRange, tie, secondCircuit                        float64
	lvPanel, mvlvStation, mvlvPerMVA, mvTee, mvRing, mvBay float64
	hvStation, hvPerMVA, hvTee, hvLoop                     float64
}

type conductorKey struct {
	level    LevelID
	kind     Kind
	material Material
}

// NewModel makes a model from an edition of grid defaults, the conductors and the transformers. A default
// that the edition lacks is an error.
func NewModel(defaults *params.Edition, conductors []Conductor, transformers *Transformers) (*Model, error) {
	m := &Model{transformers: transformers, conductors: map[conductorKey][]Conductor{}}
	var circuits float64
	for _, d := range []struct {
		id string
		to *float64
	}{
		{"frequency_hz", &m.frequencyHz}, {"cos_phi", &m.cosPhi},
		{"short_distance_m", &m.shortM}, {"short_extra_m", &m.shortExtraM}, {"slack_cable_frac", &m.slackCable},
		{"slack_overhead_frac", &m.slackOvhead}, {"termination_m", &m.termM},
		{"derate_buried", &m.derateBuried}, {"derate_overhead", &m.derateOverhead}, {"derate_two_circuits", &m.derateTwo}, {"screen_loss_frac", &m.screen},
		{"margin_low_voltage_frac", &m.margin}, {"low_voltage_test", &m.lowVoltage},
		{"rapid_change_limit_frac", &m.rapid}, {"charging_note_frac", &m.chargeNote}, {"charging_heavy_frac", &m.chargeHeavy},
		{"scr_red", &m.scrRed}, {"scr_amber", &m.scrAmber}, {"scr_note", &m.scrNote},
		{"x_over_r_busbar", &m.xrBusbar}, {"x_over_r_rural", &m.xrRural}, {"x_over_r_hv", &m.xrHV},
		{"spare_max_age_months", &m.spareMonths}, {"max_circuits", &circuits}, {"pei_split_ratio", &m.peiSplit},
		{"effort_range_factor", &m.effortRange}, {"effort_tie_frac", &m.tie}, {"effort_second_circuit_frac", &m.secondCircuit},
		{"effort_lv_panel", &m.lvPanel}, {"effort_mv_lv_station", &m.mvlvStation}, {"effort_mv_lv_station_per_mva", &m.mvlvPerMVA},
		{"effort_mv_tee", &m.mvTee}, {"effort_mv_ring", &m.mvRing}, {"effort_mv_bay", &m.mvBay},
		{"effort_hv_substation", &m.hvStation}, {"effort_hv_substation_per_mva", &m.hvPerMVA}, {"effort_hv_tee", &m.hvTee}, {"effort_hv_loop", &m.hvLoop},
	} {
		f, err := defaults.Get(d.id)
		if err != nil {
			return nil, fmt.Errorf("grid defaults: %w", err)
		}
		*d.to = f.Central
	}
	m.circuits = int(circuits)
	for _, d := range []struct {
		id string
		to *[3]float64
	}{{"detour_factor", &m.detour}, {"llf_k_wind", &m.kWind}, {"llf_k_solar", &m.kSolar}} {
		f, err := defaults.Get(d.id)
		if err != nil {
			return nil, fmt.Errorf("grid defaults: %w", err)
		}
		*d.to = [3]float64{f.Low, f.Central, f.High}
	}
	for _, id := range levelOrder {
		var fs [5]params.Factor
		for i, s := range []string{"kv", "mw", "rise_frac", "effort_cable", "effort_overhead"} {
			f, err := defaults.Get("level_" + string(id) + "_" + s)
			if err != nil {
				return nil, fmt.Errorf("grid defaults: %w", err)
			}
			fs[i] = f
		}
		m.levels = append(m.levels, Level{ID: id, FromKV: fs[0].Low, NominalKV: fs[0].Central, ToKV: fs[0].High,
			LowerMW: fs[1].Low, UsualMW: fs[1].Central, MostMW: fs[1].High, RiseLimitFrac: fs[2].Central,
			EffortCable: fs[3].Central, EffortOvhead: fs[4].Central})
		for _, k := range []Kind{Cable, Overhead} {
			for _, mat := range []Material{Aluminium, Copper, ACSR} {
				if list := standard(conductors, id, k, mat); len(list) > 0 {
					m.conductors[conductorKey{id, k, mat}] = list
				}
			}
		}
	}
	if m.circuits < 1 || m.frequencyHz <= 0 || !(m.cosPhi > 0 && m.cosPhi <= 1) || !(m.lowVoltage > 0 && m.lowVoltage <= 1) || m.effortRange < 1 {
		return nil, fmt.Errorf("grid defaults: circuits, frequency, cos phi, low-voltage test or effort range: %w", ErrInput)
	}
	if transformers == nil {
		return nil, fmt.Errorf("grid model without transformers: %w", ErrInput)
	}
	return m, nil
}

// Levels gives the levels, lowest first.
func (m *Model) Levels() []Level { return append([]Level(nil), m.levels...) }

// LevelAt gives the level that a network voltage belongs to; ok is false outside all of them.
func (m *Model) LevelAt(voltageKV float64) (l Level, ok bool) {
	for _, l := range m.levels {
		if voltageKV >= l.FromKV && voltageKV < l.ToKV {
			return l, true
		}
	}
	return Level{}, false
}

// list gives the conductors to try: for a cable aluminium, or copper at levels whose catalogue has no
// aluminium; for a line steel-cored aluminium. A material may be asked for.
func (m *Model) list(level LevelID, kind Kind, material Material) []Conductor {
	if material != "" {
		return m.conductors[conductorKey{level, kind, material}]
	}
	if kind == Overhead {
		return m.conductors[conductorKey{level, kind, ACSR}]
	}
	if l := m.conductors[conductorKey{level, kind, Aluminium}]; len(l) > 0 {
		return l
	}
	return m.conductors[conductorKey{level, kind, Copper}]
}
