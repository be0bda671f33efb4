package run

import (
	"fmt"
	"math"
	"strings"

	"groundtally/geo"
	"groundtally/geo/measure"
	"groundtally/scoring/grid"
	"groundtally/scoring/solar"
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
				typed := "grid.typed_spare_" + settingName(l.rec.Name+"/"+f.ID) + "_kw"
				if x, ok := w.snap.Number(typed); ok {
					a.spare = grid.Known(x)
					a.toldBy, a.toldOn = "", ""
					if s, _, _ := w.snap.Lookup(typed); s.Reason != "" {
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
				k.text(s.Reason) // by whom a spare capacity was told
			}
		}
	}
}

// spare gives the spare capacity of the nearest line or substation with a known one, for fitting up
// to it, cut to the agreed export limit.
func (f *fitter) spare(s site) (kw float64, asset string, known bool) {
	c := s.box.Centre()
	best := math.Inf(1)
	for _, a := range f.assets {
		if !a.spare.Known || !a.kv.Known {
			continue
		}
		if d := a.distM(c); d < best {
			best, kw, asset, known = d, a.spare.Value, a.id, true
		}
	}
	if x, ok := f.w.snap.Number("grid.export_limit_kw"); ok {
		kw = math.Min(kw, x)
	}
	return kw, asset, known
}

// nearest gives the place of the asset nearest to a point.
func (a asset) nearest(from geo.XY) geo.XY {
	g := a.layer.xy[a.feature]
	if g.Kind == geo.Points {
		return g.Parts[0][0][0]
	}
	p, _ := measure.NearestOnOutline(from, g)
	return p
}

func (a asset) distM(from geo.XY) float64 { return from.Dist(a.nearest(from)) }

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

	byHours bool // the share comes from hours of wind and sun together

	energyWhy string // why the yield, and with it the loss, is unknown; empty when it is known
}

// connect assesses every line and substation and chooses one.
func (w *world) connect(f *fitter, o option, s site, r fitResult, power *powerHours, assets []asset) (link, error) {
	out := link{}
	if len(assets) == 0 {
		out.why = "no_layer:grid_lines|substations"
		return out, nil
	}
	energy, energyWhy := r.WindMWh.MWh+r.SolarMWh.MWh, r.WindMWh.Why
	if energyWhy == "" {
		energyWhy = r.SolarMWh.Why
	}
	if r.SpareAsset != "" {
		// A plant fitted to one asset's spare capacity is connected there.
		var one []asset
		for _, a := range assets {
			if a.id == r.SpareAsset {
				one = append(one, a)
			}
		}
		assets = one
	}
	ac := r.WindKW + r.SolarACKW
	plant := ac
	if x, ok := w.snap.Number("grid.export_limit_kw"); ok && x > 0 {
		plant = math.Min(plant, x)
	}
	from := terminal(r)
	assess := func(a asset, plantKW, lostShare float64) (grid.Assessment, error) {
		in := grid.AssessInput{ID: fmt.Sprintf("%s at %g kV", a.id, a.kv.Value), Kind: a.kind, VoltageKV: a.kv, TapAllowed: a.tap, Spare: a.spare, ShortCircuitMVA: a.sk,
			StraightM: math.Max(a.distM(from), 1), PlantKW: plantKW, Technology: o.technology}
		in.LoadFactor = typicalLoadFactor
		if energyWhy == "" {
			in.LoadFactor = math.Min(1, energy*(1-lostShare)*units.KWhPerMWh/(plantKW*units.HoursPerYear))
		}
		if o.technology == "wind_solar" {
			in.Technology = "wind" // the greater weight, so the loss is not understated
		}
		if _, byUser, _ := w.snap.Lookup("grid.voltage_rise_limit_frac"); byUser {
			if x, ok := w.snap.Number("grid.voltage_rise_limit_frac"); ok {
				in.RiseLimit = grid.Known(x)
			}
		}
		return w.p.Grid.Assess(in)
	}
	list := make([]grid.Assessment, len(assets))
	for i, a := range assets {
		var err error
		if list[i], err = assess(a, plant, 0); err != nil {
			return out, fmt.Errorf("site %s, option %s, %s: %w", s.id, o.id, a.id, err)
		}
	}
	choice := w.p.Grid.Choose(list)
	if choice.Picked < 0 {
		out.why = "no_connection"
		return out, nil
	}
	b, a := list[choice.Picked], assets[choice.Picked]
	var err error
	limit, said := w.mayFlow(ac, a)
	together, err := together(power, s, r, limit)
	switch {
	case err != nil:
		return out, err
	case together != nil:
		out.share, out.shareK, out.byHours = together.share(), said, true
	default:
		if out.share, out.shareK, err = w.aboveLimit(f, o, s, r, ac, a); err != nil {
			return out, err
		}
	}
	if out.shareK && out.share > 0 && a.spare.Known && a.spare.Value < plant && a.spare.Value > 0 {
		// What really flows is the spare capacity; the status stays that of the whole plant.
		limited, err := assess(a, a.spare.Value, out.share)
		if err != nil {
			return out, fmt.Errorf("site %s, option %s, %s: %w", s.id, o.id, a.id, err)
		}
		limited.Status, limited.Reason = b.Status, b.Reason
		b = limited
	}
	if !b.Computed {
		// No conductor is listed for this voltage, so its figures are unknown and not zero.
		out.why = "no_conductor_listed"
		return out, nil
	}
	out.ok, out.best, out.asset, out.energyWhy = true, b, a, energyWhy
	c := &Connection{Asset: a.name, Kind: string(a.kind), VoltageKV: b.VoltageKV, Assumed: b.VoltageAssumed, Status: string(b.Status), Reason: string(b.Reason), Conductor: b.Conductor.ID, Circuits: b.Circuits,
		RouteKm: b.RouteKm.Central, ToldBy: a.toldBy, ToldOn: a.toldOn, Together: together}
	to := a.nearest(from)
	c.StraightKm = from.Dist(to) / units.MPerKm
	if a.spare.Known {
		v := a.spare.Value
		c.SpareKW = &v
	}
	if choice.Unknown >= 0 && choice.Unknown != choice.Picked && list[choice.Unknown].Effort.Central < b.Effort.Central {
		c.Beside = assets[choice.Unknown].name
	}
	if c.From, err = w.frame.Inverse(from); err != nil {
		return out, err
	}
	if c.To, err = w.frame.Inverse(to); err != nil {
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
	if b.OwnSubstation { // unit transformers at lower voltages belong to the plant itself
		out.kva = b.TransformerKVA
	}
	if b.Level != grid.LV {
		out.gear = 1
	}
	return out, nil
}

// typicalLoadFactor stands for an unknown yield when a conductor is chosen; the loss stays unknown.
const typicalLoadFactor = 0.3

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

// mayFlow gives the power that may leave a plant of acKW through an asset: spare capacity or agreed limit. known is
// false where nothing below acKW is said and the spare capacity is not known.
func (w *world) mayFlow(acKW float64, a asset) (kw float64, known bool) {
	kw = acKW
	if x, ok := w.snap.Number("grid.export_limit_kw"); ok {
		kw = math.Min(kw, x)
	}
	if a.spare.Known {
		kw = math.Min(kw, a.spare.Value)
	} else if kw >= acKW {
		return kw, false
	}
	return kw, true
}

// aboveLimit gives the share of the energy that lies above what may flow. It follows from the distributions of the free
// wind and of the plant's solar hours; a plant of both takes them as independent where no hours tell of both.
func (w *world) aboveLimit(f *fitter, o option, s site, r fitResult, acKW float64, a asset) (share float64, known bool, err error) {
	limit, known := w.mayFlow(acKW, a)
	if !known {
		return 0, false, nil
	}
	if limit >= acKW {
		return 0, true, nil
	}
	windP, windW, err := f.windDistribution(o, s, r)
	if err != nil {
		return 0, false, err
	}
	sunP, sunW, err := f.sunDistribution(o, s, r)
	if err != nil {
		return 0, false, err
	}
	if windP == nil && r.WindKW > 0 || sunP == nil && r.SolarKW > 0 {
		return 0, false, nil
	}
	power, weight := windP, windW
	switch {
	case r.WindKW == 0:
		power, weight = sunP, sunW
	case r.SolarKW > 0:
		power, weight = nil, nil
		for i := range windP {
			for j := range sunP {
				power = append(power, windP[i]+sunP[j])
				weight = append(weight, windW[i]*sunW[j])
			}
		}
	}
	res, err := grid.LimitedShare(power, weight, math.Max(0, limit))
	return res.LostFrac, true, err
}

// windDistribution gives the farm's power over the speeds of the free wind, all machines alike; nil
// without a resource.
func (f *fitter) windDistribution(o option, s site, r fitResult) (kw, share []float64, err error) {
	if r.WindKW == 0 {
		return nil, nil, nil
	}
	p, machine, hub, err := f.windAndMachine(o, s)
	if err != nil || !p.known {
		return nil, nil, err
	}
	all, err := wind.CombineSectors(p.sectors)
	if err != nil {
		return nil, nil, err
	}
	if all, err = p.wind.AtHub(all, hub); err != nil {
		return nil, nil, err
	}
	const step = 0.25 // m/s
	left := 1.0
	for v := step / 2; v < machine.Curve.Last(); v += step {
		share = append(share, all.CDF(v+step/2)-all.CDF(v-step/2))
		kw = append(kw, machine.Curve.PowerKW(v)*float64(len(r.Turbines)))
		left -= share[len(share)-1]
	}
	return append(kw, 0), append(share, math.Max(0, left)), nil
}

// windAndMachine gives the wind that serves an option on a site, its machine and the height of the hub.
func (f *fitter) windAndMachine(o option, s site) (p windHere, machine wind.Turbine, hubM float64, err error) {
	if p, err = f.windAt(o, s); err != nil || !p.known {
		return p, machine, 0, err
	}
	hubM, _ = o.num("hub_height_m")
	d, _ := o.num("rotor_diameter_m")
	rated, _ := o.num("rated_kw")
	machine, err = f.turbine(o, rated, d)
	return p, machine, hubM, err
}

// sunDistribution gives the panels' power over the hours of the year; nil without a resource.
func (f *fitter) sunDistribution(o option, s site, r fitResult) (kw, share []float64, err error) {
	if r.SolarKW == 0 {
		return nil, nil, nil
	}
	y, here, _, err := f.yieldAt(o, s)
	if err != nil || here.sunlight == nil {
		return nil, nil, err
	}
	left := 1.0
	for b, h := range y.powerHours {
		if h > 0 {
			kw = append(kw, (float64(b)+0.5)/solar.PowerBins*r.SolarACKW)
			share = append(share, h/units.HoursPerYear)
			left -= h / units.HoursPerYear
		}
	}
	return append(kw, 0), append(share, math.Max(0, left)), nil
}
