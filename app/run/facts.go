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
// towers, and the fence. The true place of tracks is not known.
func (w *world) plantGround(e *overlay.Engine, r fitResult) (geo.XYGeometry, error) {
	var all []geo.XYGeometry
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
	w    *world
	box  geo.Extent
	made map[string][]piece
}

type piece struct {
	layer   *layer
	feature int
	geom    geo.XYGeometry
	box     geo.Extent
}

// siteMarginM is how far a plant's ground may reach over its site's box: a pad around a tower.
const siteMarginM = 100

func (w *world) newPieces(s site) *pieces {
	edge, _ := w.snap.Number("land.habitat_edge_m")
	return &pieces{w: w, box: s.box.Grow(siteMarginM + edge), made: map[string][]piece{}}
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
			x, err := e.Intersection(l.xy[i], window)
			if err != nil {
				return nil, err
			}
			if x.Kind == geo.Polygons && !x.Empty() {
				out = append(out, piece{layer: l, feature: i, geom: x, box: geo.ExtentOf(x)})
			}
		}
	}
	p.made[role] = out
	return out, nil
}

// overlap lays the plant's ground over the features of a role: the area touched (overlaps counted
// once), and the sum of each feature's area times a weight.
func (p *pieces) overlap(e *overlay.Engine, g geo.XYGeometry, role string, weight func(l *layer, i int) float64) (ha, weighted float64, err error) {
	list, err := p.of(e, role)
	if err != nil {
		return 0, 0, err
	}
	box := geo.ExtentOf(g)
	var parts []geo.XYGeometry
	for _, q := range list {
		if !q.box.Meets(box) {
			continue
		}
		x, err := e.Intersection(g, q.geom)
		if err != nil {
			return 0, 0, err
		}
		if x.Kind != geo.Polygons || x.Empty() {
			continue
		}
		parts = append(parts, x)
		if weight != nil {
			weighted += measure.AreaM2(x) / units.M2PerHa * weight(q.layer, q.feature)
		}
	}
	if len(parts) == 0 {
		return 0, 0, nil
	}
	if len(parts) == 1 {
		return measure.AreaM2(parts[0]) / units.M2PerHa, weighted, nil
	}
	u, err := e.Union(parts...)
	if err != nil {
		return 0, 0, err
	}
	return measure.AreaM2(u) / units.M2PerHa, weighted, nil
}

// complete reports whether a layer of the role is declared complete for the place.
func (w *world) complete(role string) bool {
	for _, l := range w.byRole[role] {
		if l.rec.Complete {
			return true
		}
	}
	return false
}

// touched gives an area, or the state in its place: unknown without a layer; none when nothing was
// found and the layer is complete; unknown when nothing was found and it may not be.
func (w *world) touched(ha float64, role, none string) scoring.Value {
	switch {
	case len(w.byRole[role]) == 0:
		return scoring.UnknownBecause("no_layer:" + role)
	case ha > 0:
		return scoring.Num(ha)
	case w.complete(role):
		return scoring.NoneBecause(none)
	}
	return scoring.UnknownBecause("layer_not_complete:" + role)
}

func layerNames(ls []*layer) string {
	names := make([]string, len(ls))
	for i, l := range ls {
		names[i] = l.rec.Name
	}
	return strings.Join(names, ", ")
}

// measureFacts gives every fact of a fitted candidate that follows from the map.
func (w *world) measureFacts(e *overlay.Engine, around *pieces, o option, r fitResult, f facts, notices map[string]bool) error {
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
			return err
		}
		if !ok {
			f.set(d.name, scoring.UnknownBecause("nothing_found:"+d.role), "")
			continue
		}
		f.num(d.name, m, layerNames(w.byRole[d.role]))
	}

	g, err := w.plantGround(e, r)
	if err != nil {
		return err
	}
	groundHa := measure.AreaM2(g) / units.M2PerHa
	edge := g
	if x, ok := w.snap.Number("land.habitat_edge_m"); ok && x > 0 {
		if edge, err = e.Buffer(g, x); err != nil {
			return err
		}
	}
	for _, d := range []struct {
		name, role, none string
		over             geo.XYGeometry
	}{
		{"habitat_ha", "habitat", "no mapped habitat touched", edge},
		{"forest_ha", "forest", "no forest touched", g},
		{"flood_ha", "flood", "no flood area touched", g},
		{"water_protection_ha", "water_protection", "no water protection area touched", g},
		{"sensitive_ha", "sensitive", "no sensitive area touched", g},
	} {
		ha, _, err := around.overlap(e, d.over, d.role, nil)
		if err != nil {
			return err
		}
		f.set(d.name, w.touched(ha, d.role, d.none), layerNames(w.byRole[d.role]))
	}

	best, _ := w.snap.Number("land.farmland_best_grade")
	worst, _ := w.snap.Number("land.farmland_worst_grade")
	coshare, _, _ := w.cascadeNumber("land.farmland_coshare.", o, solarPart, "")
	farm, quality, err := around.overlap(e, g, "farmland", func(l *layer, i int) float64 {
		grade, ok := l.number(i, "quality", "grade or points")
		if !ok || best == worst {
			return 1
		}
		return math.Min(1, math.Max(0, (worst+1-grade)/(worst+1-best)))
	})
	if err != nil {
		return err
	}
	v := w.touched(farm, "farmland", "no farmland touched")
	f.set("farmland_lost_ha", v, layerNames(w.byRole["farmland"]))
	f.set("farmland_quality_ha", v, layerNames(w.byRole["farmland"]))
	if v.OK() {
		f.num("farmland_lost_ha", farm*(1-coshare), layerNames(w.byRole["farmland"]))
		f.num("farmland_quality_ha", quality*(1-coshare), layerNames(w.byRole["farmland"]))
	}

	// Soil: the mean stock under the plant's ground, ploughland and grass under the fence.
	soilHa, soilSum, err := around.overlap(e, g, "soil", func(l *layer, i int) float64 {
		x, ok := l.number(i, "organic_carbon_stock", "t C/ha")
		if !ok {
			return 0
		}
		return x
	})
	if err != nil {
		return err
	}
	if soilHa > 0 && soilSum > 0 {
		f.num("soil_stock_tc_per_ha", soilSum/soilHa, layerNames(w.byRole["soil"]))
	} else if len(w.byRole["soil"]) == 0 {
		f.set("soil_stock_tc_per_ha", scoring.UnknownBecause("no_layer:soil"), "")
	} else {
		f.set("soil_stock_tc_per_ha", scoring.UnknownBecause("no_soil_here"), layerNames(w.byRole["soil"]))
	}
	f.num("fence_grass_ha", r.FenceHa, "fence")
	f.num("fence_arable_ha", 0, "fence")
	if r.FenceHa > 0 {
		if len(w.byRole["land_cover"]) == 0 {
			f.set("fence_grass_ha", scoring.UnknownBecause("no_layer:land_cover"), "")
			f.set("fence_arable_ha", scoring.UnknownBecause("no_layer:land_cover"), "")
		} else {
			_, arable, err := around.overlap(e, r.Fence, "land_cover", func(l *layer, i int) float64 {
				c := strings.ToLower(l.text(i, "class"))
				if strings.Contains(c, "arable") || strings.Contains(c, "plough") || strings.Contains(c, "crop") {
					return 1
				}
				return 0
			})
			if err != nil {
				return err
			}
			f.num("fence_arable_ha", math.Min(arable, r.FenceHa), layerNames(w.byRole["land_cover"]))
			f.num("fence_grass_ha", math.Max(0, r.FenceHa-arable), layerNames(w.byRole["land_cover"]))
		}
	}

	peatHa, depthSum, err := around.overlap(e, g, "peat", func(l *layer, i int) float64 {
		x, ok := l.number(i, "depth", "m")
		if !ok {
			return 0
		}
		return x
	})
	if err != nil {
		return err
	}
	pv := w.touched(peatHa, "peat", "no mapped peat touched")
	f.set("peat_ha", pv, layerNames(w.byRole["peat"]))
	switch {
	case pv.OK():
		f.num("peat_share", math.Min(1, peatHa/groundHa), layerNames(w.byRole["peat"]))
		f.num("peat_depth_m", depthSum/peatHa, layerNames(w.byRole["peat"]))
		notices["peat_touched"] = true
	case pv.State == scoring.None:
		f.num("peat_share", 0, layerNames(w.byRole["peat"]))
		f.num("peat_depth_m", 0, layerNames(w.byRole["peat"]))
	default:
		f.set("peat_share", pv, "")
		f.set("peat_depth_m", pv, "")
	}
	return nil
}

// trackKm is the rule of thumb for new track: the shortest tree through the towers and from the nearest
// road to the first, times a detour.
func (w *world) trackKm(r fitResult, roadM scoring.Value) float64 {
	detour, err := w.p.Wind.Get("track_detour")
	if err != nil {
		return 0
	}
	access := 0.0
	if roadM.OK() {
		access = roadM.X
	}
	return detour.Central * (tree(r.Turbines) + access) / units.MPerKm
}

// tree gives the length of the shortest tree through points (Prim 1957).
func tree(at []geo.XY) float64 {
	if len(at) < 2 {
		return 0
	}
	in := make([]bool, len(at))
	dist := make([]float64, len(at))
	for i := range dist {
		dist[i] = math.Inf(1)
	}
	dist[0] = 0
	sum := 0.0
	for range at {
		best := -1
		for i := range at {
			if !in[i] && (best < 0 || dist[i] < dist[best]) {
				best = i
			}
		}
		in[best] = true
		sum += dist[best]
		for i := range at {
			dist[i] = math.Min(dist[i], at[best].Dist(at[i]))
		}
	}
	return sum
}
