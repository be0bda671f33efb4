package run

import (
	"math"
	"strings"

	"groundtally/geo"
	"groundtally/geo/measure"
	"groundtally/geo/overlay"
	"groundtally/scoring"
	"groundtally/scoring/units"
)

// fact is a leaf's value with where it comes from.
type fact struct {
	v      scoring.Value
	source string
}

type facts map[string]fact

func (f facts) num(name string, x float64, source string) { f[name] = fact{scoring.Num(x), source} }

func (f facts) set(name string, v scoring.Value, source string) { f[name] = fact{v, source} }

// plantGround is the ground on which the plant itself stands: discs of pad and foundation around the
// towers, the fence, and the new tracks where a way is found.
func (w *world) plantGround(e *overlay.Engine, r fitResult, tracks geo.XYGeometry) (geo.XYGeometry, error) {
	var all []geo.XYGeometry
	if !tracks.Empty() {
		all = append(all, tracks)
	}
	if len(r.Turbines) > 0 {
		area := w.p.Factors["crane_pad_m2"].Central + w.p.Factors["foundation_m2"].Central
		for _, p := range r.Turbines {
			d, err := disc(p, math.Sqrt(area/math.Pi))
			if err != nil {
				return geo.XYGeometry{}, err
			}
			all = append(all, d)
		}
	}
	if !r.Fence.Empty() {
		all = append(all, r.Fence)
	}
	return e.Union(all...)
}

// nearestM gives the distance from the plant to the nearest counted feature of a role. The search
// widens until nothing nearer can be missed.
func (w *world) nearestM(e *overlay.Engine, r fitResult, role string, keep func(l *layer, i int) bool) (float64, bool, error) {
	var plant geo.XYGeometry
	if r.Fence.Empty() {
		plant = geo.XYGeometry{Kind: geo.Points}
		for _, p := range r.Turbines {
			plant.Parts = append(plant.Parts, [][]geo.XY{{p}})
		}
	} else {
		plant = r.Fence
	}
	box := geo.ExtentOf(plant)
	towers := geo.EmptyExtent()
	for _, p := range r.Turbines {
		towers = towers.Add(p)
	}
	best := math.Inf(1)
	var buf []int
	for reach := 500.0; reach <= 200_000; reach *= 4 {
		for _, l := range w.byRole[role] {
			buf = l.tree.Search(box.Union(towers).Grow(reach), buf[:0])
			for _, i := range buf {
				if !keep(l, i) {
					continue
				}
				if l.xy[i].Kind == geo.Points && r.Fence.Empty() {
					for _, part := range l.xy[i].Parts {
						for _, p := range r.Turbines {
							best = math.Min(best, p.Dist(part[0][0]))
						}
					}
					continue
				}
				if !r.Fence.Empty() {
					d, err := e.DistanceM(r.Fence, l.xy[i])
					if err != nil {
						return 0, false, err
					}
					best = math.Min(best, d)
				}
				for _, p := range r.Turbines {
					if d, ok := measure.PointToM(p, l.xy[i]); ok {
						best = math.Min(best, d)
					}
				}
			}
		}
		if best <= reach {
			return best, true, nil
		}
	}
	return best, !math.IsInf(best, 1), nil
}

// pieces are the parts of a role's features around one site. The options of a site share them.
type pieces struct {
	w      *world
	box    geo.Extent
	made   map[string][]piece
	inside bool // the site lies in the district, or there is none
}

type piece struct {
	layer   *layer
	feature int
	geom    geo.XYGeometry
	box     geo.Extent
}

// siteMarginM is how far a plant's ground may reach over its site's box: a pad around a tower.
const siteMarginM = 100

func (w *world) newPieces(e *overlay.Engine, s site) (*pieces, error) {
	edge, _ := w.snap.Number("land.habitat_edge_m")
	p := &pieces{w: w, box: s.box.Grow(siteMarginM + edge), made: map[string][]piece{}, inside: true}
	if len(w.byRole["district"]) == 0 {
		return p, nil
	}
	// A layer that is complete is complete for the district; beyond it, nothing there proves nothing.
	p.inside = false
	for _, l := range w.byRole["district"] {
		for i, g := range l.xy {
			if l.src.Features[i].Geometry.Kind != geo.Polygons {
				continue
			}
			yes, err := e.Covers(g, middle(s))
			if err != nil {
				return nil, err
			}
			p.inside = p.inside || yes
		}
	}
	return p, nil
}

// middle gives a point inside the site's largest part.
func middle(s site) geo.XYGeometry {
	best, at := -1.0, s.box.Centre()
	for _, part := range s.geom.Parts {
		if a := measure.AreaM2(geo.XYGeometry{Kind: geo.Polygons, Parts: [][][]geo.XY{part}}); a > best {
			if p, ok := measure.InteriorPoint(part); ok {
				best, at = a, p
			}
		}
	}
	return geo.XYGeometry{Kind: geo.Points, Parts: [][][]geo.XY{{{at}}}}
}

func (p *pieces) of(e *overlay.Engine, role string) ([]piece, error) {
	if got, ok := p.made[role]; ok {
		return got, nil
	}
	var out []piece
	window := rectangle(p.box)
	var buf []int
	for _, l := range p.w.byRole[role] {
		buf = l.tree.Search(p.box, buf[:0])
		for _, i := range buf {
			if l.xy[i].Kind != geo.Polygons {
				continue
			}
			// Cutting to a box is much cheaper than an overlay, and may leave rings that touch themselves:
			// then the overlay is made after all.
			x, err := l.clip(e, i, p.box)
			if err != nil {
				return nil, err
			}
			if ok, _, err := e.Valid(x); err != nil {
				return nil, err
			} else if !ok {
				if x, err = e.Intersection(l.xy[i], window); err != nil {
					return nil, err
				}
			}
			if x.Kind == geo.Polygons && !x.Empty() {
				out = append(out, piece{layer: l, feature: i, geom: x, box: geo.ExtentOf(x)})
			}
		}
	}
	p.made[role] = out
	return out, nil
}

// touch is what lies under a plant's ground in the layers of a role.
type touch struct {
	ha      float64 // union of what is touched
	sumHa   float64 // sum over features, more than ha where they overlap
	sum     float64 // sum of each feature's area times its number
	missing bool    // a touched feature lacks its number
}

// mean gives the mean number of what is touched, overlaps counted as often as they stand.
func (t touch) mean() float64 {
	if t.sumHa == 0 {
		return 0
	}
	return t.sum / t.sumHa
}

// sliverHa is an area below which two layers only share an edge: one square metre.
const sliverHa = 1e-4

// overlap lays the plant's ground over the features of a role. number gives a feature's number.
func (p *pieces) overlap(e *overlay.Engine, g geo.XYGeometry, role string, number func(l *layer, i int) (float64, bool)) (touch, error) {
	var t touch
	list, err := p.of(e, role)
	if err != nil {
		return t, err
	}
	box := geo.ExtentOf(g)
	var parts []geo.XYGeometry
	for _, q := range list {
		if !q.box.Meets(box) {
			continue
		}
		x, err := e.Intersection(g, q.geom)
		if err != nil {
			return t, err
		}
		if x.Kind != geo.Polygons || x.Empty() {
			continue
		}
		ha := measure.AreaM2(x) / units.M2PerHa
		if ha < sliverHa {
			continue
		}
		parts = append(parts, x)
		if number == nil {
			continue
		}
		v, ok := number(q.layer, q.feature)
		if !ok {
			t.missing = true
			continue
		}
		t.sumHa += ha
		t.sum += float64(ha * v)
	}
	switch len(parts) {
	case 0:
		return t, nil
	case 1:
		t.ha = measure.AreaM2(parts[0]) / units.M2PerHa
		return t, nil
	}
	u, err := e.Union(parts...)
	if err != nil {
		return t, err
	}
	t.ha = measure.AreaM2(u) / units.M2PerHa
	return t, nil
}

// meets reports whether a way comes within half a track's width of any feature of a role.
func (w *world) meets(way [][2]geo.XY, role string) bool {
	var buf []int
	for _, s := range way {
		n := int(s[0].Dist(s[1])/trackWidthM) + 1
		box := geo.EmptyExtent().Add(s[0]).Add(s[1]).Grow(trackWidthM / 2)
		for _, l := range w.byRole[role] {
			buf = l.tree.Search(box, buf[:0])
			for _, i := range buf {
				for k := 0; k <= n; k++ {
					t := float64(k) / float64(n)
					p := geo.XY{X: s[0].X + float64(t*(s[1].X-s[0].X)), Y: s[0].Y + float64(t*(s[1].Y-s[0].Y))}
					if d, ok := measure.PointToM(p, l.xy[i]); ok && d <= trackWidthM/2 {
						return true
					}
				}
			}
		}
	}
	return false
}

// complete reports whether a layer of the role is declared complete for the place, and the site lies
// there.
func (p *pieces) complete(role string) bool {
	if !p.inside {
		return false
	}
	for _, l := range p.w.byRole[role] {
		if l.rec.Complete {
			return true
		}
	}
	return false
}

// touched gives an area, or the state in its place: unknown without a layer; none when nothing was
// found, the layer is complete here and the likely way of the tracks meets nothing either; else unknown.
func (p *pieces) touched(ha float64, onTrack bool, role, none string) scoring.Value {
	switch {
	case len(p.w.byRole[role]) == 0:
		return scoring.UnknownBecause("no_layer:" + role)
	case ha >= sliverHa:
		return scoring.Num(ha)
	case onTrack:
		return scoring.UnknownBecause("tracks_not_placed:" + role)
	case p.complete(role):
		return scoring.NoneBecause(none)
	}
	return scoring.UnknownBecause("layer_not_complete:" + role)
}

// trackWidthM is the width of the strip in which a track along the straight way would lie.
const trackWidthM = 20

func layerNames(ls []*layer) string {
	names := make([]string, len(ls))
	for i, l := range ls {
		names[i] = l.rec.Name
	}
	return strings.Join(names, ", ")
}

// measureFacts gives every fact of a fitted candidate that follows from the map, the tracks that it lays on the
// buildable ground, and the habitat that it touches (nil for none).
func (w *world) measureFacts(e *overlay.Engine, around *pieces, o option, s site, buildable geo.XYGeometry, r fitResult, f facts, notices map[string]bool) (laid, *Habitat, error) {
	var none laid
	anyFeature := func(*layer, int) bool { return true }
	for _, d := range []struct {
		name, role string
		keep       func(*layer, int) bool
	}{
		{"nearest_dwelling_m", "dwellings", func(l *layer, i int) bool { return l.text(i, "class") != notLived }},
		{"heritage_m", "heritage", anyFeature},
		{"sensitive_m", "sensitive", anyFeature},
		{"road_m", "roads", anyFeature},
	} {
		if len(w.byRole[d.role]) == 0 {
			f.set(d.name, scoring.UnknownBecause("no_layer:"+d.role), "")
			continue
		}
		m, ok, err := w.nearestM(e, r, d.role, d.keep)
		if err != nil {
			return none, nil, err
		}
		if !ok {
			f.set(d.name, scoring.UnknownBecause("nothing_found:"+d.role), "")
			continue
		}
		f.num(d.name, m, layerNames(w.byRole[d.role]))
	}

	allowed, err := w.heightAllowed(e, around, o, s)
	if err != nil {
		return none, nil, err
	}
	f.set("height_limit_m", allowed, layerNames(w.byRole[heightRule]))

	tracks, err := w.tracks(e, s, buildable, r, f["road_m"].v)
	if err != nil {
		return none, nil, err
	}
	f.set("track_km", tracks.km, tracks.source)
	f.num("track_counted_km", tracks.counted, tracks.source)
	g, err := w.plantGround(e, r, tracks.ground)
	if err != nil {
		return none, nil, err
	}
	groundHa := measure.AreaM2(g) / units.M2PerHa
	edge := g
	if x, ok := w.snap.Number("land.habitat_edge_m"); ok && x > 0 {
		if edge, err = e.Buffer(g, x); err != nil {
			return none, nil, err
		}
	}
	way := tracks.guess
	measured := func(name, role, none string, over geo.XYGeometry) (scoring.Value, error) {
		t, err := around.overlap(e, over, role, nil)
		if err != nil {
			return scoring.Value{}, err
		}
		v := around.touched(t.ha, t.ha < sliverHa && w.meets(way, role), role, none)
		f.set(name, v, layerNames(w.byRole[role]))
		return v, nil
	}
	for _, d := range []struct {
		name, role, none string
		over             geo.XYGeometry
	}{
		{"habitat_ha", "habitat", "no mapped habitat touched", edge},
		{"flood_ha", "flood", "no flood area touched", g},
		{"water_protection_ha", "water_protection", "no water protection area touched", g},
		{"sensitive_ha", "sensitive", "no sensitive area touched", g},
	} {
		if _, err := measured(d.name, d.role, d.none, d.over); err != nil {
			return none, nil, err
		}
	}
	habitat, err := w.habitat(e, around, g, edge, way, f["habitat_ha"].v, f, notices)
	if err != nil {
		return none, nil, err
	}
	if err := w.forestFacts(e, around, g, way, f); err != nil {
		return none, nil, err
	}

	best, _ := w.snap.Number("land.farmland_best_grade")
	worst, _ := w.snap.Number("land.farmland_worst_grade")
	main := windPart
	if !o.wind {
		main = solarPart
	}
	coshare, _, _ := w.cascadeNumber("land.farmland_coshare.", o, main, "")
	farm, err := around.overlap(e, g, "farmland", func(l *layer, i int) (float64, bool) {
		grade, ok := l.number(i, "quality", "grade or points")
		if !ok {
			return 0, false
		}
		return quality01(grade, best, worst), true
	})
	if err != nil {
		return none, nil, err
	}
	v := around.touched(farm.ha, false, "farmland", "no farmland touched")
	src := layerNames(w.byRole["farmland"])
	f.set("farmland_lost_ha", v, src)
	f.set("farmland_quality_ha", v, src)
	if v.OK() {
		f.num("farmland_lost_ha", farm.ha*(1-coshare), src)
		f.num("farmland_quality_ha", farm.ha*farm.mean()*(1-coshare), src)
		if farm.missing {
			f.set("farmland_quality_ha", scoring.UnknownBecause("missing_value:farmland.quality"), src)
		}
	}

	// Soil: the mean stock under the plant's ground, ploughland and grass under the fence.
	byClass := false
	soil, err := around.overlap(e, g, "soil", func(l *layer, i int) (float64, bool) {
		if x, ok := l.number(i, "organic_carbon_stock", "t C/ha"); ok {
			return x, true
		}
		x, ok := w.referenceStock(l.text(i, "soil_class"))
		if use, said := l.number(i, "land_use_factor", "1"); said {
			x *= use
		}
		byClass = byClass || ok
		return x, ok
	})
	if err != nil {
		return none, nil, err
	}
	f.num("soil_by_class", 0, "soil layer")
	if byClass {
		f.num("soil_by_class", 1, "soil layer")
		notices["soil_by_class"] = true
	}
	src = layerNames(w.byRole["soil"])
	switch {
	case len(w.byRole["soil"]) == 0:
		f.set("soil_stock_tc_per_ha", scoring.UnknownBecause("no_layer:soil"), "")
	case soil.missing:
		f.set("soil_stock_tc_per_ha", scoring.UnknownBecause("missing_value:soil.organic_carbon_stock"), src)
	case soil.sumHa == 0 || soil.ha < 0.5*groundHa:
		f.set("soil_stock_tc_per_ha", scoring.UnknownBecause("no_soil_here"), src)
	default:
		f.num("soil_stock_tc_per_ha", soil.mean(), src)
	}
	f.num("fence_grass_ha", r.FenceHa, "fence")
	f.num("fence_arable_ha", 0, "fence")
	if r.FenceHa > 0 {
		if len(w.byRole["land_cover"]) == 0 {
			f.set("fence_grass_ha", scoring.UnknownBecause("no_layer:land_cover"), "")
			f.set("fence_arable_ha", scoring.UnknownBecause("no_layer:land_cover"), "")
		} else {
			cover, err := around.overlap(e, r.Fence, "land_cover", func(l *layer, i int) (float64, bool) {
				if hasWord(l.text(i, "class"), "arable", "plough", "crop") {
					return 1, true
				}
				return 0, true
			})
			if err != nil {
				return none, nil, err
			}
			arable := math.Min(cover.sum, r.FenceHa)
			f.num("fence_arable_ha", arable, layerNames(w.byRole["land_cover"]))
			f.num("fence_grass_ha", r.FenceHa-arable, layerNames(w.byRole["land_cover"]))
		}
	}
	return tracks, habitat, w.peatFacts(e, around, g, way, groundHa, f, notices)
}

// soilClasses are the classes of the guidelines by the words that a soil layer may use for them: their own names and
// the reference soil groups that belong to one class alone.
var soilClasses = map[string]string{"hac": "hac", "high-activity clay": "hac", "lac": "lac", "low-activity clay": "lac", "sandy": "sandy", "arenosol": "sandy", "spodic": "spodic", "podzol": "spodic",
	"volcanic": "volcanic", "andosol": "volcanic", "wetland": "wetland", "gleysol": "wetland"}

// referenceStock gives the reference stock of the guidelines for the study's climate zone and a soil class, t C/ha; ok
// is false for a class that is none of theirs and for a pair that they leave out.
func (w *world) referenceStock(class string) (float64, bool) {
	v, err := w.p.Soil.Lookup("reference", w.snap.Text("climate.soil_method"), strings.ReplaceAll(w.snap.Text("climate.zone"), " ", "_"), soilClasses[strings.ToLower(strings.TrimSpace(class))])
	return v.Value, err == nil
}

// quality01 turns a grade into a share from 0 to 1: the best grade is 1, and the worst still counts as
// one step above nothing.
func quality01(grade, best, worst float64) float64 {
	if best == worst {
		return 1
	}
	s := 1.0
	if worst < best {
		s = -1
	}
	return math.Min(1, math.Max(0, (worst+s-grade)/(worst+s-best)))
}

func hasWord(text string, words ...string) bool {
	text = strings.ToLower(text)
	for _, w := range words {
		if strings.Contains(text, w) {
			return true
		}
	}
	return false
}

// forestFacts takes the forest from its own layer, else from land cover.
func (w *world) forestFacts(e *overlay.Engine, around *pieces, g geo.XYGeometry, way [][2]geo.XY, f facts) error {
	role := "forest"
	if len(w.byRole[role]) == 0 {
		role = "land_cover"
	}
	if len(w.byRole[role]) == 0 {
		f.set("forest_ha", scoring.UnknownBecause("no_layer:forest|land_cover"), "")
		return nil
	}
	t, err := around.overlap(e, g, role, func(l *layer, i int) (float64, bool) {
		if role == "forest" || hasWord(l.text(i, "class"), "forest", "wood") {
			return 1, true
		}
		return 0, true
	})
	if err != nil {
		return err
	}
	ha, track := t.sum, false
	if role == "forest" {
		ha = t.ha
		track = ha < sliverHa && w.meets(way, role)
	}
	f.set("forest_ha", around.touched(ha, track, role, "no forest touched"), layerNames(w.byRole[role]))
	return nil
}

// peatFacts takes the peat from its own layer; without one, from the classes of the soil layer, whose
// depth is then unknown.
func (w *world) peatFacts(e *overlay.Engine, around *pieces, g geo.XYGeometry, way [][2]geo.XY, groundHa float64, f facts, notices map[string]bool) error {
	role := "peat"
	number := func(l *layer, i int) (float64, bool) { return l.number(i, "depth", "m") }
	if len(w.byRole[role]) == 0 {
		role = "soil"
		number = func(l *layer, i int) (float64, bool) {
			if hasWord(l.text(i, "soil_class"), "peat", "bog", "histosol", "fen") {
				return 1, true
			}
			return 0, true
		}
	}
	src := layerNames(w.byRole[role])
	if len(w.byRole[role]) == 0 {
		for _, n := range []string{"peat_ha", "peat_share", "peat_depth_m"} {
			f.set(n, scoring.UnknownBecause("no_layer:peat|soil"), "")
		}
		return nil
	}
	t, err := around.overlap(e, g, role, number)
	if err != nil {
		return err
	}
	ha, track := t.ha, false
	if role == "soil" {
		ha = t.sum
	} else {
		track = ha < sliverHa && w.meets(way, role)
	}
	v := around.touched(ha, track, role, "no mapped peat touched")
	f.set("peat_ha", v, src)
	switch {
	case v.OK():
		notices["peat_touched"] = true
		f.num("peat_share", math.Min(1, ha/groundHa), src)
		if role == "soil" || t.missing {
			f.set("peat_depth_m", scoring.UnknownBecause("missing_value:peat.depth"), src)
		} else {
			f.num("peat_depth_m", t.mean(), src)
		}
	case v.State == scoring.None:
		f.num("peat_share", 0, src)
		f.num("peat_depth_m", 0, src)
	default:
		f.set("peat_share", v, src)
		f.set("peat_depth_m", v, src)
	}
	return nil
}
