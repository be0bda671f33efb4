package run

import (
	"math"

	"groundtally/geo"
	"groundtally/geo/overlay"
	"groundtally/scoring"
	"groundtally/scoring/wind"
)

// neighbourRole is the role of plant that is there or permitted.
const neighbourRole = "existing_plant"

// neighbourReachM is how far wakes are followed from one plant to another. Source: common practice.
const neighbourReachM = 10_000

// neighbour is an existing or permitted wind turbine.
type neighbour struct {
	at      geo.XY
	turbine wind.Turbine
	hubM    float64
	key     string // digest of what it was read from
	whole   bool   // hub height and rotor are known, so that it takes part in wakes
}

// neighbours reads the wind turbines of the layers of existing plant. Those that are only applied for count when the
// study says so.
func (w *world) neighbours() []neighbour {
	applied, _, _ := w.snap.Lookup("wind.count_applied")
	type kind struct{ ratedKW, rotorM float64 }
	curves := map[kind]wind.Turbine{}
	var out []neighbour
	for _, l := range w.byRole[neighbourRole] {
		for i, g := range l.xy {
			state := l.text(i, "state")
			if l.text(i, "technology") != windPart || g.Empty() || state == "applied" && applied.Value != "yes" {
				continue
			}
			n := neighbour{at: middle(site{geom: g, box: geo.ExtentOf(g)}).Parts[0][0][0]}
			if g.Kind == geo.Points {
				n.at = g.Parts[0][0][0]
			}
			rated, okP := l.number(i, "rated_power", "kW")
			hub, okH := l.number(i, "hub_height", "m")
			rotor, okD := l.number(i, "rotor_diameter", "m")
			k := newKey("neighbour", 1)
			k.bytes(l.hash[i][:])
			for _, field := range sortedNames(l.rec.Match) {
				k.texts([]string{field, l.rec.Match[field], l.rec.Units[l.rec.Match[field]]})
			}
			n.key = k.sum()
			// A polygon is the ground of a plant, not a mast.
			if n.whole = okP && okH && okD && g.Kind == geo.Points; n.whole {
				t, made := curves[kind{rated, rotor}]
				if !made {
					var err error
					if t, err = w.generic(rated, rotor); err != nil {
						t = wind.Turbine{} // no machine has that power and rotor: it counts as one that lacks them
					}
					curves[kind{rated, rotor}] = t
				}
				n.turbine, n.hubM = t, hub
				n.whole = t.RatedKW > 0 && hub > rotor/2
			}
			out = append(out, n)
		}
	}
	return out
}

// genericTurbine is the name of a machine with the generic curve.
const genericTurbine = "generic"

// generic gives the machine with the generic curve of a power and a rotor.
func (w *world) generic(ratedKW, rotorM float64) (wind.Turbine, error) {
	g, err := w.p.Wind.Generic(ratedKW, rotorM)
	if err != nil {
		return wind.Turbine{}, err
	}
	c, err := g.Curve()
	if err != nil {
		return wind.Turbine{}, err
	}
	return wind.Turbine{ID: genericTurbine, Name: "generic curve", RatedKW: ratedKW, RotorDiameterM: rotorM, CutInMPerS: g.CutInMPerS, CutOutMPerS: g.CutOutMPerS, Curve: c, Source: "Saint-Drenan et al. 2020, Renewable Energy"}, nil
}

// near gives the neighbours whose wakes may reach a site, or its wakes them.
func (f *fitter) near(s site) (out []neighbour) {
	reach := s.box.Grow(neighbourReachM)
	for _, n := range f.others {
		if reach.Meets(geo.Extent{MinX: n.at.X, MinY: n.at.Y, MaxX: n.at.X, MaxY: n.at.Y}) {
			out = append(out, n)
		}
	}
	return out
}

// wholeOf gives those that take part in wakes.
func wholeOf(list []neighbour) (out []neighbour) {
	for _, n := range list {
		if n.whole {
			out = append(out, n)
		}
	}
	return out
}

// clearOf takes the ground away on which a new machine would stand nearer to a neighbour than the spacing across the
// wind of the larger rotor.
func clearOf(e *overlay.Engine, g geo.XYGeometry, near []neighbour, acrossD, rotorM float64) (geo.XYGeometry, error) {
	var discs []geo.XYGeometry
	for _, n := range near {
		d, err := disc(n.at, acrossD*math.Max(rotorM, n.turbine.RotorDiameterM))
		if err != nil {
			return g, err
		}
		if geo.ExtentOf(d).Meets(geo.ExtentOf(g)) {
			discs = append(discs, d)
		}
	}
	if len(discs) == 0 {
		return g, nil
	}
	all, err := e.Union(discs...)
	if err != nil {
		return g, err
	}
	return e.Difference(g, all)
}

// machinesOf gives neighbours as the wind engine takes them.
func (f *fitter) machinesOf(s site, near []neighbour) []wind.Machine {
	to := f.turn(s)
	out := make([]wind.Machine, len(near))
	for i, n := range near {
		out[i] = wind.Machine{At: to(n.at), Turbine: n.turbine, HubHeightM: n.hubM}
	}
	return out
}

// lostNearby gives the energy that existing and permitted turbines lose to a plant, or why that is not known.
func (f *fitter) lostNearby(o option, around *pieces, s site, r fitResult) scoring.Value {
	near := f.near(s)
	switch {
	case !o.wind || len(r.Turbines) == 0:
		return scoring.NoneBecause("no rotor")
	case len(f.w.byRole[neighbourRole]) == 0:
		return scoring.UnknownBecause("no_layer:" + neighbourRole)
	case r.WindMWh.Why != "":
		return scoring.UnknownBecause(r.WindMWh.Why)
	case len(wholeOf(near)) < len(near):
		return scoring.UnknownBecause("missing_value:" + neighbourRole + ".rotor_diameter")
	case len(near) == 0 && !around.complete(neighbourRole):
		return scoring.UnknownBecause("layer_not_complete:" + neighbourRole)
	}
	return scoring.Num(r.NearbyLossMWh)
}
