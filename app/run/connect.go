package run

import (
	"fmt"
	"math"
	"strings"

	"groundtally/geo"
	"groundtally/geo/measure"
	"groundtally/scoring/grid"
	"groundtally/scoring/units"
	"groundtally/scoring/wind"
)

// asset is a line or substation at one of its voltages.
type asset struct {
	id, name string
	kind     grid.AssetKind
	layer    *layer
	feature  int
	kv       grid.Number
	spare    grid.Number
	toldBy   string
	toldOn   string
	sk       grid.Number
	tap      grid.Answer
}

// assets lists lines and substations, one entry a voltage.
func (w *world) assets() []asset {
	var out []asset
	for _, role := range []string{"substations", "grid_lines"} {
		for _, l := range w.byRole[role] {
			for i, f := range l.src.Features {
				a := asset{id: l.rec.Name + "/" + f.ID, name: l.text(i, "name"), kind: grid.Substation, layer: l, feature: i, toldBy: l.text(i, "told_by"), toldOn: l.text(i, "told_on")}
				if a.name == "" {
					a.name = strings.ReplaceAll(role, "_", " ") + " " + f.ID
				}
				if role == "grid_lines" {
					a.kind = grid.Line
				}
				if x, ok := l.number(i, "spare_capacity", "kW"); ok {
					a.spare = grid.Known(x)
				}
				if x, ok := w.snap.Number("grid.typed_spare_" + settingName(f.ID) + "_kw"); ok {
					a.spare = grid.Known(x)
					if s, _, _ := w.snap.Lookup("grid.typed_spare_" + settingName(f.ID) + "_kw"); s.Reason != "" {
						a.toldBy = s.Reason
					}
				}
				if x, ok := l.number(i, "short_circuit_power", "MVA"); ok {
					a.sk = grid.Known(x)
				}
				volts := l.voltages(i)
				if len(volts) == 0 {
					out = append(out, a)
				}
				for _, v := range volts {
					b := a
					b.kv = grid.Known(v)
					out = append(out, b)
				}
			}
		}
	}
	return out
}

// settingName makes an identifier fit for a setting's key.
func settingName(id string) string { return strings.ReplaceAll(id, ".", "-") }

// voltages reads one voltage or a list parted by semicolons, in kV.
func (l *layer) voltages(i int) []float64 {
	if v, ok := l.number(i, "voltage", "kV"); ok {
		if v > 0 {
			return []float64{v}
		}
		return nil
	}
	col := l.rec.Match["voltage"]
	var out []float64
	for _, s := range strings.Split(l.text(i, "voltage"), ";") {
		var v float64
		if _, err := fmt.Sscan(strings.TrimSpace(s), &v); err != nil || !(v > 0) {
			continue
		}
		if u := l.rec.Units[col]; u != "" {
			x, err := units.Convert(v, u, "kV")
			if err != nil {
				continue
			}
			v = x
		}
		out = append(out, v)
	}
	return out
}

// gridSettingsKey writes the settings that the connection reads.
func (w *world) gridSettingsKey(k *keyer) {
	for _, key := range w.snap.Keys() {
		if strings.HasPrefix(key, "grid.") {
			if s, _, in := w.snap.Lookup(key); in {
				k.text(key)
				k.text(s.Value)
			}
		}
	}
}

// spareFor gives the spare capacity of the nearest line or substation with a known one, for fitting up
// to it.
func (w *world) spareFor(s site) (kw float64, known bool, why string) {
	c := s.box.Centre()
	best := math.Inf(1)
	for _, a := range w.assets() {
		if !a.spare.Known {
			continue
		}
		if _, d := measure.NearestOnOutline(c, a.layer.xy[a.feature]); d < best {
			best, kw, known = d, a.spare.Value, true
		}
	}
	if !known {
		return 0, false, "spare_unknown"
	}
	return kw, true, ""
}

// link is the outcome of connecting a candidate.
type link struct {
	ok     bool
	why    string
	conn   *Connection
	best   grid.Assessment
	asset  asset
	circ   [3]float64 // low, medium, high voltage circuits
	kva    float64
	gear   float64
	share  float64 // of the energy above what may flow
	shareK bool
}

// connect assesses every line and substation and chooses one.
func (w *world) connect(f *fitter, o option, s site, r fitResult, assets []asset) (link, error) {
	out := link{}
	if len(assets) == 0 {
		out.why = "no_layer:grid_lines|substations"
		return out, nil
	}
	energy := r.WindMWh.MWh + r.SolarMWh.MWh
	if r.WindMWh.Why != "" || r.SolarMWh.Why != "" {
		out.why = r.WindMWh.Why + r.SolarMWh.Why
		return out, nil
	}
	ac := r.WindKW + r.SolarACKW
	plant := ac
	if x, ok := w.snap.Number("grid.export_limit_kw"); ok {
		plant = math.Min(plant, x)
	}
	from := terminal(r)
	list := make([]grid.Assessment, len(assets))
	nearest := make([]geo.XY, len(assets))
	for i, a := range assets {
		g := a.layer.xy[a.feature]
		p, d := measure.NearestOnOutline(from, g)
		if g.Kind == geo.Points {
			p = g.Parts[0][0][0]
			d = from.Dist(p)
		}
		nearest[i] = p
		in := grid.AssessInput{ID: fmt.Sprintf("%s at %g kV", a.id, a.kv.Value), Kind: a.kind, VoltageKV: a.kv, TapAllowed: a.tap, Spare: a.spare, ShortCircuitMVA: a.sk,
			StraightM: math.Max(d, 1), PlantKW: plant, Technology: o.technology, LoadFactor: math.Min(1, energy*units.KWhPerMWh/(plant*units.HoursPerYear))}
		if o.technology == "wind_solar" {
			in.Technology = "wind" // the greater weight, so the loss is not understated
		}
		if s, byUser, _ := w.snap.Lookup("grid.voltage_rise_limit_frac"); byUser {
			if x, ok := w.snap.Number("grid.voltage_rise_limit_frac"); ok && s.Value != "" {
				in.RiseLimit = grid.Known(x)
			}
		}
		var err error
		if list[i], err = w.p.Grid.Assess(in); err != nil {
			return out, fmt.Errorf("site %s, option %s, %s: %w", s.id, o.id, a.id, err)
		}
	}
	choice := w.p.Grid.Choose(list)
	if choice.Picked < 0 {
		out.why = "no_connection"
		return out, nil
	}
	b, a := list[choice.Picked], assets[choice.Picked]
	out.ok, out.best, out.asset = true, b, a
	c := &Connection{Asset: a.name, Kind: string(a.kind), VoltageKV: b.VoltageKV, Status: string(b.Status), Reason: string(b.Reason), Conductor: b.Conductor.ID, Circuits: b.Circuits,
		RouteKm: b.RouteKm.Central, ToldBy: a.toldBy, ToldOn: a.toldOn}
	c.StraightKm = from.Dist(nearest[choice.Picked]) / units.MPerKm
	if a.spare.Known {
		v := a.spare.Value
		c.SpareKW = &v
	}
	if choice.Unknown >= 0 && choice.Unknown != choice.Picked && list[choice.Unknown].Effort.Central < b.Effort.Central {
		c.Beside = assets[choice.Unknown].name
	}
	var err error
	if c.From, err = w.frame.Inverse(from); err != nil {
		return out, err
	}
	if c.To, err = w.frame.Inverse(nearest[choice.Picked]); err != nil {
		return out, err
	}
	out.conn = c
	n := float64(b.Circuits)
	switch b.Level {
	case grid.LV:
		out.circ[0] = n
	case grid.HV66, grid.HV110:
		out.circ[2] = n
	default:
		out.circ[1] = n
	}
	if b.NeedsTransformer {
		out.kva = b.TransformerKVA
	}
	out.gear = 1
	out.share, out.shareK, err = w.aboveLimit(f, o, s, r, ac, a)
	return out, err
}

// terminal is where the plant's cables meet: the mean of the towers, or the middle of the fence.
func terminal(r fitResult) geo.XY {
	if len(r.Turbines) > 0 {
		var c geo.XY
		for _, p := range r.Turbines {
			c.X += p.X / float64(len(r.Turbines))
			c.Y += p.Y / float64(len(r.Turbines))
		}
		return c
	}
	if c, ok := measure.Centroid(r.Fence); ok {
		return c
	}
	return geo.ExtentOf(r.Fence).Centre()
}

// aboveLimit gives the share of the energy that lies above what may flow. For wind alone it follows
// from the distribution of the free wind; otherwise it is the bound 1 − limit/rating for a plant that is
// either at full power or still.
func (w *world) aboveLimit(f *fitter, o option, s site, r fitResult, acKW float64, a asset) (share float64, known bool, err error) {
	limit := acKW
	if x, ok := w.snap.Number("grid.export_limit_kw"); ok {
		limit = math.Min(limit, x)
	}
	if !a.spare.Known {
		if limit < acKW {
			return bound(limit, acKW), true, nil
		}
		return 0, false, nil
	}
	limit = math.Min(limit, a.spare.Value)
	if limit >= acKW {
		return 0, true, nil
	}
	if r.SolarKW > 0 {
		return bound(limit, acKW), true, nil
	}
	p, _, ok := nearestWind(f.wind, s.box.Centre())
	if !ok {
		return bound(limit, acKW), true, nil
	}
	d, _ := o.num("rotor_diameter_m")
	hub, _ := o.num("hub_height_m")
	rated, _ := o.num("rated_kw")
	machine, err := f.turbine(o, rated, d)
	if err != nil {
		return 0, false, err
	}
	all, err := wind.CombineSectors(p.sectors)
	if err != nil {
		return 0, false, err
	}
	alpha, _ := w.snap.Number("wind.shear_alpha")
	if all, err = all.AtHeight(p.heightM, hub, alpha); err != nil {
		return 0, false, err
	}
	const step = 0.1 // m/s
	var power, weight []float64
	for v := step / 2; v < machine.Curve.Last(); v += step {
		power = append(power, machine.Curve.PowerKW(v))
		weight = append(weight, all.CDF(v+step/2)-all.CDF(v-step/2))
	}
	res, err := grid.LimitedShare(power, weight, rated*limit/acKW)
	return res.LostFrac, true, err
}

func bound(limit, rating float64) float64 { return math.Max(0, 1-limit/rating) }
