package run

import (
	"cmp"
	"fmt"
	"math"
	"slices"

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
	var found []limited
	sea := false
	for _, l := range w.byRole[heightRule] {
		for _, i := range l.tree.Search(s.box, nil) {
			if !appliesTo(l.text(i, "applies_to"), windPart) {
				continue
			}
			g, err := l.clip(e, i, s.box)
			if err != nil {
				return scoring.Value{}, fmt.Errorf("layer %q: %w", l.rec.Name, err)
			}
			if g.Empty() {
				continue
			}
			m, ok := l.number(i, "limit_value", "m")
			if !ok {
				return scoring.UnknownBecause("missing_value:limit_value"), nil
			}
			found = append(found, limited{g, m, l.aboveSea(i)})
			sea = sea || l.aboveSea(i)
		}
	}
	if len(found) == 0 {
		return free, nil
	}
	if sea {
		return w.heightBySpot(found, s, free)
	}
	return heightByArea(e, found, s, free)
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

// heightBySpot looks at the centres of the terrain's cells, since limits above sea level change with the
// ground.
func (w *world) heightBySpot(found []limited, s site, free scoring.Value) (scoring.Value, error) {
	if w.terrain == nil {
		return scoring.UnknownBecause("no_layer:terrain"), nil
	}
	t, err := w.terrain.get()
	if err != nil {
		return scoring.Value{}, err
	}
	best, unlimited, missing := math.Inf(-1), false, false
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
		unlimited = unlimited || math.IsInf(least, 1)
		best = math.Max(best, least)
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
	switch {
	case unlimited:
		return free, nil
	case missing || math.IsInf(best, 0):
		return scoring.UnknownBecause("height_unknown"), nil
	}
	return scoring.Num(best), nil
}
