package wind

import (
	"fmt"

	"groundtally/assets/citedtable"
)

// Turbine is a machine: its curve with the facts that the other families need.
type Turbine struct {
	ID             string
	Name           string
	RatedKW        float64
	RotorDiameterM float64
	HubHeightM     float64 // meaningful when HubHeightKnown
	HubHeightKnown bool
	CutInMPerS     float64 // nominal; the curve may begin below it
	CutOutMPerS    float64
	Class          string // wind class of IEC 61400-1; empty when none is stated
	LicenceNote    string
	Source         string
	Stall          bool // power follows air density; false: pitch control, which keeps rated power
	Curve          *PowerCurve
}

// Check reports why t cannot be used, or nil.
func (t Turbine) Check() error {
	switch {
	case t.Curve == nil:
		return fmt.Errorf("turbine %q has no power curve", t.ID)
	case !(t.RatedKW > 0 && t.RatedKW <= 30000):
		return fmt.Errorf("turbine %q: rated power %g kW lies outside 0 to 30000", t.ID, t.RatedKW)
	case !(t.RotorDiameterM > 0 && t.RotorDiameterM <= 300):
		return fmt.Errorf("turbine %q: rotor diameter %g m lies outside 0 to 300", t.ID, t.RotorDiameterM)
	}
	return nil
}

// ratedTolerance is how far a curve's top may lie above rated power: the community machine of 20 kW
// reaches 26.4 kW in its published curve.
const ratedTolerance = 1.35

// ParseTurbines reads machines from a table of curves (turbine, speed_m_per_s, power_kw, ct) and a
// table of facts (turbine, name, rated_kw, rotor_diameter_m, hub_height_m, cut_in_m_per_s,
// cut_out_m_per_s, class, electrical_per_listed_power, licence_note), in the order of the facts. Ct
// and hub height may be empty. Listed power is multiplied by electrical_per_listed_power, because some
// publications list rotor power.
func ParseTurbines(curves, facts *citedtable.Table) ([]Turbine, error) {
	points := map[string][]CurvePoint{}
	for _, r := range curves.Rows {
		var p CurvePoint
		var err error
		if p.SpeedMPerS, err = r.Float("speed_m_per_s"); err != nil {
			return nil, err
		}
		if p.PowerKW, err = r.Float("power_kw"); err != nil {
			return nil, err
		}
		if r.Text("ct") != "" {
			p.HasCt = true
			if p.Ct, err = r.Float("ct"); err != nil {
				return nil, err
			}
		}
		id := r.Text("turbine")
		points[id] = append(points[id], p)
	}
	out := make([]Turbine, 0, len(facts.Rows))
	for _, r := range facts.Rows {
		t := Turbine{ID: r.Text("turbine"), Name: r.Text("name"), Class: r.Text("class"), LicenceNote: r.Text("licence_note"), Source: r.Source}
		var factor float64
		for _, c := range []struct {
			column string
			to     *float64
		}{{"rated_kw", &t.RatedKW}, {"rotor_diameter_m", &t.RotorDiameterM}, {"cut_in_m_per_s", &t.CutInMPerS}, {"cut_out_m_per_s", &t.CutOutMPerS}, {"electrical_per_listed_power", &factor}} {
			var err error
			if *c.to, err = r.Float(c.column); err != nil {
				return nil, err
			}
		}
		if r.Text("hub_height_m") != "" {
			var err error
			if t.HubHeightM, err = r.Float("hub_height_m"); err != nil {
				return nil, err
			}
			t.HubHeightKnown = true
		}
		pts, ok := points[t.ID]
		if !ok {
			return nil, fmt.Errorf("cited table %s: no curve for turbine %q", curves.Name, t.ID)
		}
		delete(points, t.ID)
		for i := range pts {
			pts[i].PowerKW *= factor
		}
		var err error
		if t.Curve, err = NewPowerCurve(pts); err != nil {
			return nil, fmt.Errorf("turbine %q: %w", t.ID, err)
		}
		if t.Curve.MaxKW() > t.RatedKW*ratedTolerance {
			return nil, fmt.Errorf("turbine %q: the curve reaches %g kW, rated power is %g kW", t.ID, t.Curve.MaxKW(), t.RatedKW)
		}
		if t.Curve.Last() != t.CutOutMPerS {
			return nil, fmt.Errorf("turbine %q: the curve ends at %g m/s, cut-out is %g m/s", t.ID, t.Curve.Last(), t.CutOutMPerS)
		}
		if err := t.Check(); err != nil {
			return nil, err
		}
		out = append(out, t)
	}
	for _, r := range curves.Rows { // in the order of the file, so that the message is always the same
		if id := r.Text("turbine"); points[id] != nil {
			return nil, fmt.Errorf("cited table %s, line %d: turbine %q has no facts", curves.Name, r.Line, id)
		}
	}
	return out, nil
}

// FindTurbine gives the machine with an id.
func FindTurbine(all []Turbine, id string) (Turbine, error) {
	for _, t := range all {
		if t.ID == id {
			return t, nil
		}
	}
	return Turbine{}, fmt.Errorf("no turbine %q", id)
}
