package wind

import (
	"fmt"

	"groundtally/assets/citedtable"
)

// Default is one shipped value with its range.
type Default struct {
	Low, Central, High float64
	Unit               string
	Source             string
	Provenance         citedtable.Provenance
}

// Defaults holds the shipped values by name.
type Defaults struct{ byName map[string]Default }

// ParseDefaults reads the table name, low, central, high, unit. Low <= central <= high must hold.
func ParseDefaults(t *citedtable.Table) (Defaults, error) {
	d := Defaults{byName: make(map[string]Default, len(t.Rows))}
	for _, r := range t.Rows {
		v := Default{Unit: r.Text("unit"), Source: r.Source, Provenance: r.Provenance}
		for _, c := range []struct {
			column string
			to     *float64
		}{{"low", &v.Low}, {"central", &v.Central}, {"high", &v.High}} {
			var err error
			if *c.to, err = r.Float(c.column); err != nil {
				return Defaults{}, err
			}
		}
		name := r.Text("name")
		if name == "" || !(v.Low <= v.Central && v.Central <= v.High) {
			return Defaults{}, fmt.Errorf("cited table %s, line %d: a name and low <= central <= high are needed", t.Name, r.Line)
		}
		if _, twice := d.byName[name]; twice {
			return Defaults{}, fmt.Errorf("cited table %s, line %d: %q stands twice", t.Name, r.Line, name)
		}
		d.byName[name] = v
	}
	return d, nil
}

// Get gives a default by name, or an error that names it.
func (d Defaults) Get(name string) (Default, error) {
	v, ok := d.byName[name]
	if !ok {
		return Default{}, fmt.Errorf("no wind default %q", name)
	}
	return v, nil
}

// fill copies central values into places; the first name that is missing is the error.
func (d Defaults) fill(to map[string]*float64, order ...string) error {
	for _, name := range order {
		v, err := d.Get(name)
		if err != nil {
			return err
		}
		*to[name] = v.Central
	}
	return nil
}

// Settings gives the settings of a farm computation at central defaults: Gaussian wakes, 72 directions
// of 5 degrees, speeds by 1 m/s.
func (d Defaults) Settings() (Settings, error) {
	s := Settings{Wake: WakeGaussian, Directions: 72, SpeedStepMPerS: 1}
	return s, d.fill(map[string]*float64{"jensen_k": &s.JensenK, "ambient_ti_frac": &s.AmbientTIFrac}, "jensen_k", "ambient_ti_frac")
}

// Losses gives the loss steps after the wake for a machine of a rated power: the categories of
// IEC 61400-15 one by one, or for small machines one step with the observed total.
func (d Defaults) Losses(ratedKW float64) ([]Loss, error) {
	small, err := d.Get("small_machine_below_kw")
	if err != nil {
		return nil, err
	}
	names := []string{LossAvailability, LossElectrical, LossPerformance, LossEnvironment, LossCurtailment}
	if ratedKW < small.Central {
		names = []string{LossSmallTotal}
	}
	out := make([]Loss, 0, len(names))
	for _, n := range names {
		v, err := d.Get("loss_" + n + "_frac")
		if err != nil {
			return nil, err
		}
		out = append(out, Loss{Name: n, Frac: v.Central})
	}
	return out, nil
}

// Generic gives the description of an unknown machine of a size at central defaults.
func (d Defaults) Generic(ratedKW, rotorDiameterM float64) (Generic, error) {
	g := Generic{RatedKW: ratedKW, RotorDiameterM: rotorDiameterM, SpeedStepMPerS: 0.1, IntegrationPoints: 400}
	return g, d.fill(map[string]*float64{"generic_cp": &g.Cp, "ambient_ti_frac": &g.TurbulenceFrac, "generic_cut_in": &g.CutInMPerS, "generic_cut_out": &g.CutOutMPerS},
		"generic_cp", "ambient_ti_frac", "generic_cut_in", "generic_cut_out")
}
