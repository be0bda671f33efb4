package run

import (
	"cmp"
	"fmt"
	"slices"
	"strconv"
	"strings"

	"groundtally/geo"
	"groundtally/geo/measure"
	"groundtally/geo/overlay"
	"groundtally/scoring"
	"groundtally/scoring/units"
)

// Habitat is the mapped living space that a plant touches, by class and condition as the layer writes them. Classes
// that overlap count in each.
type Habitat struct {
	Kinds []HabitatKind `json:"kinds"`
	// Pieces count all touched habitat together, whole features as far as they are mapped; without them (nil) only
	// the disturbed edge touches any.
	Pieces *HabitatPieces `json:"pieces,omitempty"`
}

// HabitatKind is one class in one condition.
type HabitatKind struct {
	Class         string  `json:"class"`
	Condition     string  `json:"condition,omitempty"`
	Protection    string  `json:"protection,omitempty"`
	Irreplaceable string  `json:"irreplaceable"` // yes, no, or unknown
	LostHa        float64 `json:"lost_ha"`       // under the plant's own ground
	EdgeHa        float64 `json:"edge_ha"`       // in the disturbed edge around it, beyond what is lost
}

// HabitatPieces tell into how many separate pieces the touched habitat falls.
type HabitatPieces struct {
	Before          int     `json:"before"`
	After           int     `json:"after"`
	LargestBeforeHa float64 `json:"largest_before_ha"`
	LargestAfterHa  float64 `json:"largest_after_ha"`
}

// Added is how many more pieces there are; none where pieces vanish.
func (p HabitatPieces) Added() int { return max(0, p.After-p.Before) }

const habitatRole = "habitat"

// irreplaceable gives yes, no, or unknown.
func (l *layer) irreplaceable(i int) string {
	text := strings.ToLower(l.text(i, "irreplaceable"))
	yes, err := strconv.ParseBool(text)
	switch {
	case text == "yes", err == nil && yes:
		return "yes"
	case text == "no", err == nil:
		return "no"
	}
	return "unknown"
}

// habitat tells which habitat a plant touches: g is its own ground, edge the same with the disturbed edge around it.
// ha is the state of the area touched, way where tracks would go that are not laid. It gives the facts of pieces and
// of irreplaceable classes.
func (w *world) habitat(e *overlay.Engine, around *pieces, g, edge geo.XYGeometry, way [][2]geo.XY, ha scoring.Value, f facts, notices map[string]bool) (*Habitat, error) {
	src := layerNames(w.byRole[habitatRole])
	const fragments, irreplaceable = "habitat_fragments", "habitat_irreplaceable_ha"
	list, err := around.of(e, habitatRole)
	if err != nil {
		return nil, err
	}
	type parts struct{ lost, touched []geo.XYGeometry }
	kinds := map[HabitatKind]*parts{}
	var whole, precious []geo.XYGeometry
	unsaid := false
	box := geo.ExtentOf(edge)
	for _, q := range list {
		if !q.box.Meets(box) {
			continue
		}
		x, err := e.Intersection(edge, q.geom)
		if err != nil {
			return nil, err
		}
		if x.Kind != geo.Polygons || measure.AreaM2(x)/units.M2PerHa < sliverHa {
			continue
		}
		l, i := q.layer, q.feature
		k := HabitatKind{Class: l.text(i, "class"), Condition: l.text(i, "condition"), Protection: l.text(i, "protection"), Irreplaceable: l.irreplaceable(i)}
		if kinds[k] == nil {
			kinds[k] = &parts{}
		}
		kinds[k].touched = append(kinds[k].touched, x)
		switch k.Irreplaceable {
		case "yes":
			precious = append(precious, x)
		case "unknown":
			unsaid = true
		}
		lost, err := e.Intersection(g, q.geom)
		if err != nil {
			return nil, err
		}
		if lost.Kind == geo.Polygons && measure.AreaM2(lost)/units.M2PerHa >= sliverHa {
			kinds[k].lost = append(kinds[k].lost, lost)
			whole = append(whole, l.xy[i])
		}
	}
	area := func(gs []geo.XYGeometry) (float64, error) {
		u, err := e.Union(gs...)
		return measure.AreaM2(u) / units.M2PerHa, err
	}

	missed := len(way) > 0 && w.meets(way, habitatRole) // the tracks that are not laid may touch more
	switch {
	case len(precious) > 0:
		x, err := area(precious)
		if err != nil {
			return nil, err
		}
		f.num(irreplaceable, x, src)
		notices["old_habitat_touched"] = true
	case unsaid:
		f.set(irreplaceable, scoring.UnknownBecause("missing_value:habitat.irreplaceable"), src)
	default:
		f.set(irreplaceable, around.touched(0, missed, habitatRole, "no irreplaceable habitat touched"), src)
	}
	if len(kinds) == 0 {
		f.set(fragments, ha, src)
		return nil, nil
	}
	out := &Habitat{}
	for k, p := range kinds {
		if k.LostHa, err = area(p.lost); err != nil {
			return nil, err
		}
		all, err := area(p.touched)
		if err != nil {
			return nil, err
		}
		k.EdgeHa = max(0, all-k.LostHa)
		if k.EdgeHa < sliverHa {
			k.EdgeHa = 0
		}
		out.Kinds = append(out.Kinds, k)
	}
	slices.SortFunc(out.Kinds, func(a, b HabitatKind) int {
		return cmp.Or(cmp.Compare(b.LostHa+b.EdgeHa, a.LostHa+a.EdgeHa), cmp.Compare(a.Class, b.Class), cmp.Compare(a.Condition, b.Condition), cmp.Compare(a.Protection, b.Protection), cmp.Compare(a.Irreplaceable, b.Irreplaceable))
	})
	if len(whole) == 0 { // an edge disturbs, and parts nothing
		f.num(fragments, 0, src)
	} else {
		before, err := e.Union(whole...)
		if err != nil {
			return nil, fmt.Errorf("pieces of habitat: %w", err)
		}
		after, err := e.Difference(before, g)
		if err != nil {
			return nil, fmt.Errorf("pieces of habitat: %w", err)
		}
		out.Pieces = &HabitatPieces{}
		out.Pieces.Before, out.Pieces.LargestBeforeHa = separate(before)
		out.Pieces.After, out.Pieces.LargestAfterHa = separate(after)
		f.num(fragments, float64(out.Pieces.Added()), src)
	}
	if missed {
		f.set(fragments, scoring.UnknownBecause("tracks_not_placed:"+habitatRole), src)
	}
	return out, nil
}

// separate counts the pieces of a surface that are more than slivers, and gives the area of the largest.
func separate(g geo.XYGeometry) (n int, largestHa float64) {
	for _, part := range g.Parts {
		ha := measure.AreaM2(geo.XYGeometry{Kind: geo.Polygons, Parts: [][][]geo.XY{part}}) / units.M2PerHa
		if ha >= sliverHa {
			n++
			largestHa = max(largestHa, ha)
		}
	}
	return n, largestHa
}
