package gen

import (
	"groundtally/geo"
)

// shoreControls outlines the island, kilometres in the plane, turning left from the east cape. The
// third number is how broken the shore is there: cliffs in the north and west, smooth sand in the south.
var shoreControls = [][3]float64{
	{12.0, 0.5, .17}, {11.3, 1.4, .17}, {10.2, 1.9, .18}, {9.7, 2.8, .18}, {8.7, 2.7, .17}, {8.1, 3.5, .17},
	{8.9, 4.5, .2}, {8.5, 5.5, .2}, {7.4, 6.1, .19}, {6.3, 5.8, .2}, {5.3, 6.5, .19}, {4.2, 7.2, .19}, {2.8, 7.4, .2},
	{1.6, 6.9, .19}, {0.6, 6.3, .18}, {0.1, 5.4, .16}, {-0.8, 5.3, .16}, {-1.5, 6.3, .18}, {-2.8, 7.1, .2}, {-4.2, 6.8, .19},
	{-5.4, 6.3, .19}, {-6.0, 5.3, .18}, {-7.2, 5.5, .2}, {-8.3, 5.0, .2}, {-8.9, 4.1, .19}, {-8.1, 3.2, .16}, {-8.7, 2.4, .17},
	{-9.9, 2.5, .19}, {-10.9, 2.2, .2}, {-11.9, 1.5, .19}, {-11.9, 0.6, .17}, {-11.2, 0.1, .16}, {-10.2, -0.1, .14},
	{-9.3, -0.7, .10}, {-9.5, -1.6, .14}, {-10.4, -2.4, .18}, {-10.2, -3.4, .18}, {-9.1, -4.0, .17}, {-8.0, -3.8, .14},
	{-7.1, -4.4, .15}, {-6.3, -5.3, .16}, {-5.0, -5.6, .15}, {-3.9, -5.2, .13}, {-2.9, -5.7, .15}, {-2.2, -6.5, .15},
	{-1.3, -6.8, .13}, {-0.5, -6.5, .10}, {-0.1, -5.9, .05}, {0.25, -5.3, .04}, {0.7, -4.75, .05}, {1.2, -4.6, .05}, {1.8, -4.85, .07},
	{2.5, -5.2, .07}, {3.3, -5.7, .07}, {3.9, -6.1, .05}, {3.1, -6.45, .03}, {2.2, -6.68, .03}, {1.3, -6.72, .03},
	{0.75, -6.55, .02}, {0.55, -6.68, .02}, {0.9, -6.95, .02}, {1.6, -7.12, .012}, {2.7, -7.12, .012}, {3.9, -6.9, .012}, {5.1, -6.5, .012},
	{6.3, -6.1, .012}, {7.4, -5.55, .012}, {8.3, -4.8, .015}, {8.9, -4.0, .02}, {9.5, -3.4, .06}, {9.1, -2.75, .08}, {8.4, -2.5, .08},
	{8.2, -1.9, .08}, {8.9, -1.35, .09}, {10.0, -1.3, .15}, {11.0, -0.9, .16}, {11.7, -0.3, .17},
}

// The lines that later steps measure from: the open beach with its dunes, the flats of the bird shore.
var (
	duneLine  = kms(0.7, -6.7, 1.6, -6.98, 2.7, -7.0, 3.9, -6.75, 5.1, -6.4, 6.3, -6.0, 7.4, -5.45, 8.3, -4.7, 8.8, -4.0)
	flatsLine = kms(9.4, -3.3, 9.0, -2.75, 8.4, -2.5, 8.2, -1.9, 8.9, -1.4)
)

// makeCoast breaks the outline up by moving the middle of each side, smooths it and breaks it again
// more finely. The ring is open and turns left.
func makeCoast(seed uint64) []geo.XY {
	r := stream(seed, "coast")
	ring, rough := make([]geo.XY, 0), make([]float64, 0)
	for _, c := range shoreControls {
		ring, rough = append(ring, km(c[0], c[1])), append(rough, c[2])
	}
	breakUp := func(times int, share float64) {
		for range times {
			var p []geo.XY
			var q []float64
			for i := range ring {
				a, b := ring[i], ring[(i+1)%len(ring)]
				k := (rough[i] + rough[(i+1)%len(ring)]) / 2
				d := float64(a.Dist(b)*k*share) * clamp(r.NormFloat64(), -1.8, 1.8)
				p = append(p, a, shift(along(a, b, between(r, 0.4, 0.6)), left(unit(a, b)), d))
				q = append(q, rough[i], k)
			}
			ring, rough = p, q
		}
	}
	breakUp(2, 1)
	fine := curve(ring, 3)
	var spread []float64
	for i := range rough {
		k := rough[i]
		spread = append(spread, k, k, k)
	}
	ring, rough = fine, spread
	breakUp(1, 0.8)
	for i := range ring {
		ring[i] = snap(ring[i])
	}
	return simplifyRing(ring, 1.5)
}
