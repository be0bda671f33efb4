package run

import (
	"math"
	"slices"

	"groundtally/geo"
	"groundtally/geo/measure"
	"groundtally/geo/overlay"
	"groundtally/geo/track"
	"groundtally/scoring"
	"groundtally/scoring/units"
)

// What a metre of track costs off the buildable ground, against one on it, and the cells in which ways are searched.
// Source: assumption of this program.
const (
	offGroundCost = 2
	leastCellM    = 10
	cellsAcross   = 80
)

// laid are the new tracks of a plant.
type laid struct {
	km      scoring.Value // unknown where no way is found
	counted float64       // km that land and energy count: the found ones, else by a rule of thumb
	ways    geo.XYGeometry
	ground  geo.XYGeometry // strips under them; empty where no way is found
	guess   [][2]geo.XY    // straight lines that tracks may take; empty where a way is found
	source  string
}

// tracks lays the new tracks of a plant: from the nearest road to the towers, and to the fence, along the cheapest ways
// around water and buildings. Without roads, or where there is no way, the length is unknown; what is counted for land
// and energy is then the usual share of sealed ground per megawatt of wind (Denholm et al. 2009), nothing for solar.
func (w *world) tracks(e *overlay.Engine, s site, buildable geo.XYGeometry, r fitResult, roadM scoring.Value) (laid, error) {
	out := laid{km: roadM, ways: geo.XYGeometry{Kind: geo.Lines}, ground: geo.XYGeometry{Kind: geo.Polygons}, source: "rule of thumb"}
	width := w.p.Factors["track_width_m"].Central
	if roadM.OK() {
		on, road := w.nearestRoad(r, roadM.X)
		to := slices.Clone(r.Turbines)
		if !r.Fence.Empty() {
			at, _ := measure.NearestOnOutline(road, r.Fence)
			if len(to) == 0 {
				at = on
			}
			to = append(to, at)
		}
		tree, err := w.grow(e, s, buildable, to, road)
		if err != nil {
			return out, siteError(s, err)
		}
		if len(tree.Unreached) == 0 {
			return out, out.follow(e, tree, width, layerNames(w.byRole["roads"]))
		}
		out.km = scoring.UnknownBecause("no_way_for_tracks")
	}
	perMW, err := w.p.Wind.Get("permanent_ha_per_mw")
	if err != nil {
		return out, err
	}
	ground := perMW.Central * r.WindKW / units.KWPerMW * units.M2PerHa
	out.counted = ground / width / units.MPerKm
	out.guess = treeEdges(r.Turbines)
	if roadM.OK() {
		on, road := w.nearestRoad(r, roadM.X)
		out.guess = append(out.guess, [2]geo.XY{on, road})
	}
	return out, nil
}

// follow takes the ways that were found.
func (l *laid) follow(e *overlay.Engine, tree track.Tree, widthM float64, roads string) (err error) {
	l.counted = tree.LengthM / units.MPerKm
	l.km = scoring.Num(l.counted)
	l.source = "ways along buildable ground from " + roads
	for _, way := range tree.Ways {
		if way.LengthM > 0 {
			l.ways.Parts = append(l.ways.Parts, [][]geo.XY{way.Line})
		}
	}
	if !l.ways.Empty() {
		l.ground, err = e.Buffer(l.ways, widthM/2)
	}
	return err
}

// grow searches the tree of tracks.
func (w *world) grow(e *overlay.Engine, s site, buildable geo.XYGeometry, to []geo.XY, road geo.XY) (track.Tree, error) {
	span := geo.EmptyExtent().Add(road)
	for _, p := range to {
		span = span.Add(p)
	}
	across := math.Max(span.MaxX-span.MinX, span.MaxY-span.MinY)
	in := track.Input{Towers: to, Entrance: road, HasEntrance: true, Preferred: buildable, Site: s.geom, StepM: math.Max(leastCellM, across/cellsAcross), OffGround: offGroundCost, OffSite: offGroundCost}
	box := span.Grow(math.Max(across/2, leastCellM))
	var buf []int
	for _, role := range []string{"water", "dwellings"} {
		for _, l := range w.byRole[role] {
			buf = l.tree.Search(box, buf[:0])
			slices.Sort(buf)
			for _, i := range buf {
				if l.xy[i].Kind != geo.Polygons {
					continue
				}
				g, err := l.clip(e, i, box)
				if err != nil {
					return track.Tree{}, err
				}
				if g.Kind == geo.Polygons && !g.Empty() {
					in.Blocked = append(in.Blocked, g)
				}
			}
		}
	}
	return track.Grow(in)
}

// nearestRoad gives the place of a plant nearest to a road, and that of the road, where their distance is known. The
// nearest places of two outlines are a corner of one and a place on the other.
func (w *world) nearestRoad(r fitResult, roadM float64) (on, road geo.XY) {
	box := geo.ExtentOf(r.Fence)
	for _, t := range r.Turbines {
		box = box.Add(t)
	}
	reach := roadM*1.001 + 1
	best := math.Inf(1)
	var buf []int
	for _, l := range w.byRole["roads"] {
		buf = l.tree.Search(box.Grow(reach), buf[:0])
		slices.Sort(buf)
		for _, i := range buf {
			g := l.xy[i]
			for _, t := range r.Turbines {
				if p, d := measure.NearestOnOutline(t, g); d < best {
					best, on, road = d, t, p
				}
			}
			if r.Fence.Empty() {
				continue
			}
			for _, part := range r.Fence.Parts {
				for _, ring := range part {
					for _, c := range ring {
						if p, d := measure.NearestOnOutline(c, g); d < best {
							best, on, road = d, c, p
						}
					}
				}
			}
			for _, part := range g.Parts {
				for _, line := range part {
					for _, c := range line {
						if !box.Grow(reach).Meets(geo.EmptyExtent().Add(c)) {
							continue
						}
						if p, d := measure.NearestOnOutline(c, r.Fence); d < best {
							best, on, road = d, p, c
						}
					}
				}
			}
		}
	}
	return on, road
}

// treeEdges gives the edges of the shortest tree through points (Prim 1957).
func treeEdges(at []geo.XY) [][2]geo.XY {
	if len(at) < 2 {
		return nil
	}
	in := make([]bool, len(at))
	dist := make([]float64, len(at))
	from := make([]int, len(at))
	for i := range dist {
		dist[i] = math.Inf(1)
	}
	dist[0] = 0
	var out [][2]geo.XY
	for n := range at {
		best := -1
		for i := range at {
			if !in[i] && (best < 0 || dist[i] < dist[best]) {
				best = i
			}
		}
		in[best] = true
		if n > 0 {
			out = append(out, [2]geo.XY{at[from[best]], at[best]})
		}
		for i := range at {
			if d := at[best].Dist(at[i]); !in[i] && d < dist[i] {
				dist[i], from[i] = d, best
			}
		}
	}
	return out
}
