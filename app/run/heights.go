package run

import (
	"cmp"
	"fmt"
	"math"
	"slices"
	"strconv"

	"groundtally/geo"
	"groundtally/geo/measure"
	"groundtally/geo/overlay"
	"groundtally/scoring"
)

// limited is a feature that limits heights on a site.
type limited struct {
	geom     geo.XYGeometry
	m        float64
	aboveSea bool
}

// heightAllowed gives the greatest height above ground that the mapped limits leave at the most favourable
// spot of a site. The lowest of overlapping limits holds. None says that some of the site has no limit.
func (w *world) heightAllowed(e *overlay.Engine, around *pieces, o option, s site) (scoring.Value, error) {
	if !o.wind {
		return scoring.NoneBecause("no tall parts"), nil
	}
	if len(w.byRole[heightRule]) == 0 {
		return scoring.UnknownBecause("no_layer:" + heightRule), nil
	}
	free := scoring.UnknownBecause("layer_not_complete:" + heightRule)
	if around.complete(heightRule) {
		free = scoring.NoneBecause("no height limit")
	}
	found, why, err := w.limitsOn(e, s)
	switch {
	case err != nil:
		return scoring.Value{}, err
	case why != "":
		return scoring.UnknownBecause(why), nil
	case len(found) == 0:
		return free, nil
	}
	if anyAboveSea(found) {
		l, why, err := w.limitsBySpot(found, s)
		switch {
		case err != nil:
			return scoring.Value{}, err
		case l.free:
			return free, nil
		case why != "":
			return scoring.UnknownBecause(why), nil
		}
		return scoring.Num(l.mostM), nil
	}
	return heightByArea(e, found, s, free)
}

func anyAboveSea(found []limited) bool {
	return slices.ContainsFunc(found, func(f limited) bool { return f.aboveSea })
}

// limitsOn gives the limits for wind that reach a site; why says that the value of one is missing.
func (w *world) limitsOn(e *overlay.Engine, s site) (found []limited, why string, err error) {
	for _, l := range w.byRole[heightRule] {
		for _, i := range l.tree.Search(s.box, nil) {
			if !appliesTo(l.text(i, "applies_to"), windPart) {
				continue
			}
			g, err := l.clip(e, i, s.box)
			if err != nil {
				return nil, "", fmt.Errorf("layer %q: %w", l.rec.Name, err)
			}
			if g.Empty() {
				continue
			}
			m, ok := l.number(i, "limit_value", "m")
			if !ok {
				return nil, "missing_value:limit_value", nil
			}
			found = append(found, limited{g, m, l.aboveSea(i)})
		}
	}
	return found, "", nil
}

// leastSpotM2 is an area below which two outlines only share an edge.
const leastSpotM2 = 1

// heightByArea lifts limits from the lowest on until they leave some of the site.
func heightByArea(e *overlay.Engine, found []limited, s site, free scoring.Value) (scoring.Value, error) {
	slices.SortStableFunc(found, func(a, b limited) int { return cmp.Compare(a.m, b.m) })
	rest := s.geom
	for i, f := range found {
		var err error
		if rest, err = e.Difference(rest, f.geom); err != nil {
			return scoring.Value{}, siteError(s, err)
		}
		if measure.AreaM2(rest) < leastSpotM2 {
			// This limit takes the last spot; limits equal to it may stand before it in the list.
			return scoring.Num(found[i].m), nil
		}
	}
	return free, nil
}

// spotLimits are the limits on a site above ground: the most and the least that spots have; free says that some spot
// has none.
type spotLimits struct {
	mostM, leastM float64
	free          bool
}

// limitsBySpot looks at the centres of the terrain's cells, since limits above sea level change with the ground. why
// says what is missing; free holds all the same.
func (w *world) limitsBySpot(found []limited, s site) (out spotLimits, why string, err error) {
	out = spotLimits{mostM: math.Inf(-1), leastM: math.Inf(1)}
	if w.terrain == nil {
		return out, "no_layer:terrain", nil
	}
	t, err := w.terrain.get()
	if err != nil {
		return out, "", err
	}
	missing := false
	look := func(p geo.XY) {
		least := math.Inf(1)
		for _, f := range found {
			if !measure.Inside(p, f.geom) {
				continue
			}
			m := f.m
			if f.aboveSea {
				z, ok := t.Sample(p)
				if !ok {
					missing = true
					return
				}
				m -= z
			}
			least = math.Min(least, m)
		}
		if math.IsInf(least, 1) {
			out.free = true
			return
		}
		out.mostM, out.leastM = math.Max(out.mostM, least), math.Min(out.leastM, least)
	}
	spots := 0
	if c0, r0, c1, r1, ok := t.Window(s.box); ok {
		for r := r0; r <= r1; r++ {
			for c := c0; c <= c1; c++ {
				if p := t.Centre(c, r); measure.Inside(p, s.geom) {
					look(p)
					spots++
				}
			}
		}
	}
	if spots == 0 { // the site is smaller than a cell
		for _, part := range s.geom.Parts {
			if p, ok := measure.InteriorPoint(part); ok {
				look(p)
			}
		}
	}
	if missing || math.IsInf(out.mostM, 0) {
		why = "height_unknown"
	}
	return out, why, nil
}

// Machine is a machine that the study or the program knows by its height.
type Machine struct {
	ID   string  `json:"id"` // of the plant option, or of the reference machine
	Name string  `json:"name"`
	TipM float64 `json:"tip_m"` // hub height and half the rotor
}

// Headroom is what the mapped height limits of a site leave a machine. Masts keep half a rotor from a limited area, so
// that no blade reaches into it.
type Headroom struct {
	TipM       float64  `json:"tip_m"`                // of the plant option
	LimitM     float64  `json:"limit_m"`              // above ground
	Everywhere bool     `json:"everywhere,omitempty"` // some of the site has no limit, and LimitM is the lowest of the rest; else LimitM is the most that a spot of the site has
	Tallest    *Machine `json:"tallest_fitting"`      // the tallest known machine that is no higher than LimitM; nil when none is
	Lowest     Machine  `json:"lowest_known"`         // the lowest machine known
}

// machines gives the plant options with turbines, then the reference machines of a published hub height, the tallest
// first.
func (w *world) machines() []Machine {
	var out []Machine
	for _, o := range w.options {
		hub, okH := o.num("hub_height_m")
		d, okD := o.num("rotor_diameter_m")
		if o.wind && okH && okD {
			out = append(out, Machine{ID: o.id, Name: cmp.Or(o.settings["title"], o.id), TipM: hub + d/2})
		}
	}
	for _, t := range w.p.Turbines {
		if t.HubHeightKnown {
			out = append(out, Machine{ID: t.ID, Name: t.Name, TipM: t.HubHeightM + t.RotorDiameterM/2})
		}
	}
	slices.SortStableFunc(out, func(a, b Machine) int { return cmp.Compare(b.TipM, a.TipM) })
	return out
}

// headroom gives what the height limits leave on a site whose tallest allowed height is known, or of which they take
// some ground; nil elsewhere, and where the limits are not known.
func (w *world) headroom(e *overlay.Engine, allowed scoring.Value, tipM float64, takes bool, s site) (*Headroom, error) {
	known := w.machines()
	if len(known) == 0 || tipM == 0 {
		return nil, nil
	}
	h := &Headroom{TipM: tipM, LimitM: allowed.X, Lowest: known[len(known)-1]}
	if !allowed.OK() {
		if !takes {
			return nil, nil
		}
		found, why, err := w.limitsOn(e, s)
		if err != nil || why != "" || len(found) == 0 {
			return nil, err
		}
		h.Everywhere, h.LimitM = true, math.Inf(1)
		if anyAboveSea(found) {
			l, why, err := w.limitsBySpot(found, s)
			if err != nil || why != "" {
				return nil, err
			}
			h.LimitM = l.leastM
		} else {
			for _, f := range found {
				h.LimitM = math.Min(h.LimitM, f.m)
			}
		}
	}
	for i := range known {
		if known[i].TipM <= h.LimitM {
			h.Tallest = &known[i]
			break
		}
	}
	return h, nil
}

// words says which machine fits, for people. They name no limit, so that sites of one answer share their words.
func (h *Headroom) words() string {
	where := "under the height limits of the site"
	if h.Everywhere {
		where = "under all height limits on the site"
	}
	if h.Tallest == nil {
		return fmt.Sprintf("none of the known machines fits %s; the lowest is %s with its tip at %s m", where, h.Lowest.Name, short(h.Lowest.TipM))
	}
	return fmt.Sprintf("the tallest known machine that fits %s is %s with its tip at %s m; its mast keeps half a rotor from a lower limit beside it", where, h.Tallest.Name, short(h.Tallest.TipM))
}

func short(m float64) string { return strconv.FormatFloat(math.Round(m*10)/10, 'f', -1, 64) }
