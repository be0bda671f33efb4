package gen

import (
	"fmt"
	"math"

	"groundtally/geo"
)

type dwelling struct {
	id, class, group, address string
	households                int
	eavesM                    float64
	at                        geo.XY
}

// Number of dwellings by where they stand, farmhouses and barns apart, and the least distances they keep.
const (
	townHouses     = 1120
	westHouses     = 175
	eastHouses     = 140
	roadsideHouses = 255
	leastHouseGapM = 13.0
	leastRoadGapM  = 7.5
	leastWaterGapM = 22.0
	leastShoreGapM = 24.0
)

// makeDwellings sets houses along streets and lanes, farmhouses at the farms, barns beside them.
func makeDwellings(seed uint64, g *land, roads []road, places []place) ([]dwelling, error) {
	r := stream(seed, "houses")
	ways, water := newSegments(120), newSegments(200)
	for i, w := range roads {
		ways.addLine(w.line, i)
	}
	for _, s := range g.streams {
		water.addLine(s.line, 0)
	}
	taken := map[[2]int][]geo.XY{}
	free := func(p geo.XY) bool {
		if g.inland.at(p) < leastShoreGapM || g.inLake(p) || g.aboveRiver(p) < 1.6 {
			return false
		}
		if d, _ := ways.nearest(p, leastRoadGapM); d < leastRoadGapM {
			return false
		}
		if d, _ := water.nearest(p, leastWaterGapM); d < leastWaterGapM {
			return false
		}
		if d, _ := lineNearest(p, duneLine); d < 380 {
			return false
		}
		if d, _ := lineNearest(p, airstrip[:]); d < 150 {
			return false
		}
		i, j := int(math.Floor(p.X/leastHouseGapM)), int(math.Floor(p.Y/leastHouseGapM))
		for a := i - 1; a <= i+1; a++ {
			for b := j - 1; b <= j+1; b++ {
				for _, q := range taken[[2]int{a, b}] {
					if q.Dist(p) < leastHouseGapM {
						return false
					}
				}
			}
		}
		return true
	}
	take := func(p geo.XY) {
		k := [2]int{int(math.Floor(p.X / leastHouseGapM)), int(math.Floor(p.Y / leastHouseGapM))}
		taken[k] = append(taken[k], p)
	}
	var out []dwelling
	put := func(p geo.XY, class, group, address string) {
		d := dwelling{class: class, group: group, address: address, households: 1, at: snap(p)}
		switch class {
		case "flat block":
			d.households = 6 + r.IntN(25)
			d.eavesM = 8 + math.Round(between(r, 0, 5)*2)/2
		case "not lived in":
			d.households = 0
		}
		if class != "flat block" && r.Float64() < 0.45 {
			d.eavesM = math.Round(between(r, 2.6, 5.8)*10) / 10
		}
		take(d.at)
		out = append(out, d)
	}
	// Farmhouses first: they have the choice of ground.
	for _, q := range places {
		if q.kind != "farm" {
			continue
		}
		for range 60 {
			p := shift(q.at, heading(between(r, 0, 2*math.Pi)), between(r, 25, q.reachM))
			if free(p) {
				put(p, "farmhouse", q.name, q.name)
				for range 1 + r.IntN(2) {
					b := shift(p, heading(between(r, 0, 2*math.Pi)), between(r, 20, 48))
					if free(b) {
						put(b, "not lived in", q.name, "")
					}
				}
				break
			}
		}
	}
	type zone struct {
		want  int
		where func(geo.XY) bool
		name  string
		stepM float64
		flats float64
	}
	near := func(q place, f float64) func(geo.XY) bool {
		return func(p geo.XY) bool { return q.at.Dist(p) < f*q.reachM }
	}
	zones := []zone{
		{townHouses, near(town, 1.5), town.name, 17, 0.09},
		{westHouses, near(villageWest, 1.5), villageWest.name, 19, 0.015},
		{eastHouses, near(villageEast, 1.5), villageEast.name, 19, 0.015},
	}
	outside := func(p geo.XY) bool {
		for _, z := range zones[:3] {
			if z.where(p) {
				return false
			}
		}
		return true
	}
	zones = append(zones, zone{roadsideHouses, outside, "", 60, 0})
	for zi, z := range zones {
		type site struct {
			p geo.XY
			w int
		}
		var sites []site
		for wi, w := range roads {
			if w.class == "track" {
				continue
			}
			total := lineLength(w.line)
			for run := between(r, 4, z.stepM); run < total; run += float64(z.stepM * between(r, 0.75, 1.3)) {
				p, u := pointAt(w.line, run)
				for _, side := range []float64{1, -1} {
					q := shift(shift(p, left(u), float64(side*(w.widthM/2+between(r, 9, 17)))), u, between(r, -3, 3))
					if z.where(q) {
						sites = append(sites, site{q, wi})
					}
				}
			}
		}
		// In town the sites nearest the middle fill first; along lanes houses come in knots.
		knots := newNoise(seed, "knots")
		weight := make([]float64, len(sites))
		order := make([]int, len(sites))
		for i, s := range sites {
			order[i] = i
			if z.name != "" {
				var q place
				for _, pl := range places[:3] {
					if pl.name == z.name {
						q = pl
					}
				}
				weight[i] = q.at.Dist(s.p)/q.reachM + between(r, 0, 0.75)
			} else {
				farm := math.Inf(1)
				for _, pl := range places {
					farm = math.Min(farm, math.Max(0, pl.at.Dist(s.p)-pl.reachM))
				}
				weight[i] = farm/1100 + between(r, 0, 0.9) - float64(0.9*knots.at(s.p, 800)) + float64(2*step01(120, 190, g.ground(s.p)))
			}
		}
		sortBy(order, weight)
		left := z.want
		for _, k := range order {
			if left == 0 {
				break
			}
			s := sites[k]
			if !free(s.p) {
				continue
			}
			class := "house"
			if r.Float64() < z.flats && z.name == town.name && town.at.Dist(s.p) < 900 || zi > 0 && r.Float64() < z.flats {
				class = "flat block"
			}
			group := z.name
			if group == "" {
				group = nearestPlace(places, s.p)
			}
			street := roads[s.w].name
			if street == "" {
				street = group
			}
			put(s.p, class, group, fmt.Sprintf("%d %s", 1+r.IntN(120), street))
			left--
		}
		if left > 0 {
			return nil, fmt.Errorf("make dwellings: no room for %d houses in zone %q", left, z.name)
		}
	}
	for i := range out {
		out[i].id = fmt.Sprintf("D-%04d", i+1)
	}
	return out, nil
}

func nearestPlace(places []place, p geo.XY) string {
	best, name := math.Inf(1), ""
	for _, q := range places {
		if d := q.at.Dist(p) - q.reachM; d < best {
			best, name = d, q.name
		}
	}
	return name
}
