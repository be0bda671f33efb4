package solar

import (
	"fmt"

	"groundtally/assets/citedtable"
)

// Default is one shipped value with its range and where it comes from.
type Default struct {
	Name               string
	Low, Central, High float64
	Unit               string
	Source             string
	Provenance         citedtable.Provenance
}

// defaultNames are the names a table of defaults must have, each once, with the unit of each.
var defaultNames = [...]struct{ name, unit string }{
	{"soiling_frac", "1"},
	{"lid_frac", "1"},
	{"nameplate_frac", "1"},
	{"mismatch_frac", "1"},
	{"dc_wiring_frac", "1"},
	{"ac_wiring_frac", "1"},
	{"transformer_frac", "1"},
	{"auxiliary_frac", "1"},
	{"curtailment_frac", "1"},
	{"availability_frac", "1"},
	{"gamma_per_k", "1/K"},
	{"faiman_u0_w_per_m2k", "W/(m2 K)"},
	{"faiman_u1_ws_per_m3k", "W s/(m3 K)"},
	{"wind_at_panel_m_per_s", "m/s"},
	{"glass_ar", "1"},
	{"bifaciality", "1"},
	{"rear_structure_frac", "1"},
	{"rear_mismatch_frac", "1"},
	{"shade_blocks", "1"},
	{"inverter_k0", "1"},
	{"inverter_k1", "1"},
	{"inverter_k2", "1"},
	{"dc_ac_ratio", "1"},
	{"albedo", "1"},
	{"tracker_max_angle_deg", "deg"},
	{"gcr_fixed_tilt", "1"},
	{"gcr_single_axis", "1"},
	{"gcr_vertical", "1"},
	{"module_efficiency", "1"},
	{"usable_share", "1"},
	{"agri_clearance_m", "m"},
	{"degradation_per_yr", "1/yr"},
	{"sigma_ghi_station", "1"},
	{"sigma_ghi_satellite", "1"},
	{"sigma_ghi_map", "1"},
	{"sigma_model_monthly", "1"},
	{"sigma_model_hourly", "1"},
	{"sigma_model_steep", "1"},
	{"sigma_incidence", "1"},
	{"sigma_module", "1"},
	{"sigma_temperature", "1"},
	{"sigma_soiling", "1"},
	{"sigma_shading", "1"},
	{"sigma_inverter", "1"},
	{"sigma_availability", "1"},
	{"sigma_degradation", "1"},
	{"sigma_between_years", "1"},
}

// Defaults are the shipped values of the engine, in the order of their table.
type Defaults struct {
	rows  []Default
	index map[string]int
}

// ParseDefaults reads a table with the columns name, low, central, high, unit. It refuses a name that is
// unknown, stands twice or is missing, another unit than the engine's, and a range that is not in order.
func ParseDefaults(t *citedtable.Table) (*Defaults, error) {
	for _, c := range []string{"name", "low", "central", "high", "unit"} {
		if !t.Has(c) {
			return nil, fmt.Errorf("solar defaults %s: no column %s", t.Name, c)
		}
	}
	units := make(map[string]string, len(defaultNames))
	for _, n := range defaultNames {
		units[n.name] = n.unit
	}
	d := &Defaults{index: make(map[string]int, len(defaultNames))}
	for _, r := range t.Rows {
		x := Default{Name: r.Text("name"), Unit: r.Text("unit"), Source: r.Source, Provenance: r.Provenance}
		unit, known := units[x.Name]
		if !known {
			return nil, fmt.Errorf("solar defaults %s, line %d: unknown name %q", t.Name, r.Line, x.Name)
		}
		if unit != x.Unit {
			return nil, fmt.Errorf("solar defaults %s, line %d: %s in %q, want %q", t.Name, r.Line, x.Name, x.Unit, unit)
		}
		if _, twice := d.index[x.Name]; twice {
			return nil, fmt.Errorf("solar defaults %s, line %d: %s stands twice", t.Name, r.Line, x.Name)
		}
		for _, cell := range []struct {
			column string
			to     *float64
		}{{"low", &x.Low}, {"central", &x.Central}, {"high", &x.High}} {
			v, err := r.Float(cell.column)
			if err != nil {
				return nil, fmt.Errorf("solar defaults: %w", err)
			}
			*cell.to = v
		}
		if x.Low > x.Central || x.Central > x.High {
			return nil, fmt.Errorf("solar defaults %s, line %d: %s is not in the order low, central, high", t.Name, r.Line, x.Name)
		}
		d.index[x.Name] = len(d.rows)
		d.rows = append(d.rows, x)
	}
	for _, n := range defaultNames {
		if _, ok := d.index[n.name]; !ok {
			return nil, fmt.Errorf("solar defaults %s: %s is missing", t.Name, n.name)
		}
	}
	return d, nil
}

// All gives the values in the order of their table.
func (d *Defaults) All() []Default { return append([]Default(nil), d.rows...) }

// Get gives a value by its name.
func (d *Defaults) Get(name string) (Default, bool) {
	i, ok := d.index[name]
	if !ok {
		return Default{}, false
	}
	return d.rows[i], true
}

// central is for names that ParseDefaults has made sure of.
func (d *Defaults) central(name string) float64 { return d.rows[d.index[name]].Central }

// Losses gives the central losses.
func (d *Defaults) Losses() Losses {
	return Losses{
		SoilingFrac: EveryMonth(d.central("soiling_frac")), LIDFrac: d.central("lid_frac"),
		NameplateFrac: d.central("nameplate_frac"), MismatchFrac: d.central("mismatch_frac"),
		DCWiringFrac: d.central("dc_wiring_frac"), ACWiringFrac: d.central("ac_wiring_frac"),
		TransformerFrac: d.central("transformer_frac"), AuxiliaryFrac: d.central("auxiliary_frac"),
		CurtailmentFrac: d.central("curtailment_frac"), AvailabilityFrac: d.central("availability_frac"),
	}
}

// Module gives the central panel, without active rear unless bifacial.
func (d *Defaults) Module(bifacial bool) Module {
	m := Module{
		GammaPerK:   d.central("gamma_per_k"),
		Glass:       Glass{Ar: d.central("glass_ar")},
		U0WPerM2K:   d.central("faiman_u0_w_per_m2k"),
		U1WsPerM3K:  d.central("faiman_u1_ws_per_m3k"),
		ShadeBlocks: int(d.central("shade_blocks")),
	}
	if bifacial {
		m.Bifaciality = d.central("bifaciality")
		m.RearStructure = d.central("rear_structure_frac")
		m.RearMismatch = d.central("rear_mismatch_frac")
	}
	return m
}

// Inverter gives the central inverter.
func (d *Defaults) Inverter() Inverter {
	return Inverter{DCACRatio: d.central("dc_ac_ratio"), K0: d.central("inverter_k0"), K1: d.central("inverter_k1"), K2: d.central("inverter_k2")}
}

// Plant gives a plant of central values on a mount; vertical rows get panels with an active rear.
func (d *Defaults) Plant(m Mount) Plant {
	return Plant{
		Mount: m, Module: d.Module(m.Kind == VerticalRows), Inverter: d.Inverter(), Losses: d.Losses(),
		WindMS: d.central("wind_at_panel_m_per_s"),
	}
}

// SunlightSource says where the sunlight was taken from, which sets its uncertainty.
type SunlightSource uint8

// The sources of sunlight: a measuring station near by, satellite images, a map or old atlas.
const (
	FromStation SunlightSource = iota
	FromSatellite
	FromMap
)

func (s SunlightSource) String() string { return [...]string{"station", "satellite", "map"}[s] }

// Doubt is what the standard deviations of a plant's energy depend on.
type Doubt struct {
	Source SunlightSource
	Hourly bool // hours were given; months otherwise
	Steep  bool // panels stand steeper than 45 degrees
	Hilly  bool // the horizon takes more than HillyShare of the light
}

// HillyShare is the light lost to the horizon from which on shade counts as less sure. Source: assumption of this
// program.
const HillyShare = 0.01

// Sigmas gives the standard deviations: the central ones, for shade by a near horizon the high one. The model's is
// that of months or of hours, and no less than that of steep panels where they are steep.
func (d *Defaults) Sigmas(by Doubt) (Sigmas, error) {
	names := [...]string{"sigma_ghi_station", "sigma_ghi_satellite", "sigma_ghi_map"}
	if int(by.Source) >= len(names) {
		return Sigmas{}, &InputError{"SunlightSource", float64(by.Source), "station, satellite or map"}
	}
	model := d.central("sigma_model_monthly")
	if by.Hourly {
		model = d.central("sigma_model_hourly")
	}
	if by.Steep {
		model = max(model, d.central("sigma_model_steep"))
	}
	shading := d.central("sigma_shading")
	if by.Hilly {
		shading = d.rows[d.index["sigma_shading"]].High
	}
	return Sigmas{
		Sunlight: d.central(names[by.Source]), Model: model,
		Incidence: d.central("sigma_incidence"), Module: d.central("sigma_module"),
		Temperature: d.central("sigma_temperature"), Soiling: d.central("sigma_soiling"),
		Shading: shading, Inverter: d.central("sigma_inverter"),
		Availability: d.central("sigma_availability"), Degradation: d.central("sigma_degradation"),
		BetweenYears: d.central("sigma_between_years"),
	}, nil
}
