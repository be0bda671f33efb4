// Package overlaytest makes a district that is hard to overlay: twenty thousand parcels among a hundred
// thousand things that keep them at a distance.
package overlaytest

import (
	"math"
	"math/rand/v2"

	"groundtally/geo"
)

// Size of the set.
const (
	SideM     = 60000 // the district is a square of this side, in metres, with its south-west corner at 0, 0
	Parcels   = 20000
	Buildings = 70000
	Lines     = 29500
	Polygons  = 500
)

// Set is a district with the rules of one plant.
type Set struct {
	Parcels []geo.XYGeometry // in no spatial order, as a register gives them
	Rules   []Rule           // by name
}

// Rule takes the land within the distances of its sources.
type Rule struct {
	Name    string
	Sources []Source
}

// Source holds features that keep one distance.
type Source struct {
	SetbackM float64 // metres; 0 for polygons that take themselves alone
	Features []geo.XYGeometry
}

// Features gives the number of features of all rules.
func (s Set) Features() int {
	n := 0
	for _, r := range s.Rules {
		for _, src := range r.Sources {
			n += len(src.Features)
		}
	}
	return n
}

// New makes the set with the first so many of its parcels. The same seed gives the same set, whatever the
// number of parcels.
//
// Parcels have 10 to 60 positions and 0.5 to 50 hectares, spread evenly in the logarithm, 10.7 on average.
// Of the buildings 70 % keep 100 m; the others, a rule of their own, keep 250, 300, 500 m. Of the lines one
// half keeps 50 m, the other 150 m. Polygons of 2,000 positions and 50 to 1,500 hectares, also even in the
// logarithm, take what lies in them. Three in five buildings stand in hamlets.
func New(seed uint64, parcels int) Set {
	// Each kind has a stream of its own.
	stream := func(n uint64) *rand.Rand { return rand.New(rand.NewPCG(seed, n)) }

	var s Set
	r := stream(1)
	for range parcels {
		s.Parcels = append(s.Parcels, blob(r, anywhere(r), 1e4*logUniform(r, 0.5, 50), 10+r.IntN(51), 0.55))
	}

	r = stream(2)
	hamlets := make([]geo.XY, 900)
	for i := range hamlets {
		hamlets[i] = anywhere(r)
	}
	near, far := Source{SetbackM: 100}, []Source{{SetbackM: 250}, {SetbackM: 300}, {SetbackM: 500}}
	for i := range Buildings {
		at := anywhere(r)
		if r.IntN(5) < 3 {
			h := hamlets[r.IntN(len(hamlets))]
			at = geo.XY{X: h.X + 250*r.NormFloat64(), Y: h.Y + 250*r.NormFloat64()}
		}
		b := house(r, at)
		if i%10 < 7 {
			near.Features = append(near.Features, b)
		} else {
			k := r.IntN(len(far))
			far[k].Features = append(far[k].Features, b)
		}
	}

	r = stream(3)
	narrow, wide := Source{SetbackM: 50}, Source{SetbackM: 150}
	for i := range Lines {
		l := road(r, anywhere(r))
		if i%2 == 0 {
			narrow.Features = append(narrow.Features, l)
		} else {
			wide.Features = append(wide.Features, l)
		}
	}

	r = stream(4)
	var woods Source
	for range Polygons {
		woods.Features = append(woods.Features, blob(r, anywhere(r), 1e4*logUniform(r, 50, 1500), 2000, 0.06))
	}

	s.Rules = []Rule{
		{"dwellings", []Source{near}}, {"farms", far}, {"lines", []Source{narrow}}, {"roads", []Source{wide}}, {"woods", []Source{woods}},
	}
	return s
}

func anywhere(r *rand.Rand) geo.XY { return geo.XY{X: SideM * r.Float64(), Y: SideM * r.Float64()} }

func logUniform(r *rand.Rand, lo, hi float64) float64 { return lo * math.Pow(hi/lo, r.Float64()) }

// blob gives a polygon of n corners around c of the area in m². Its radius varies by the rough share from
// corner to corner and by slow waves.
func blob(r *rand.Rand, c geo.XY, areaM2 float64, n int, rough float64) geo.XYGeometry {
	p3, p5 := 2*math.Pi*r.Float64(), 2*math.Pi*r.Float64()
	ring := make([]geo.XY, 0, n+1)
	for i := range n {
		a := 2 * math.Pi * (float64(i) + 0.8*r.Float64()) / float64(n)
		d := (1 - rough*r.Float64()) * (1 + 0.2*math.Sin(3*a+p3) + 0.12*math.Sin(5*a+p5))
		ring = append(ring, geo.XY{X: d * math.Cos(a), Y: d * math.Sin(a)})
	}
	twice := 0.0
	for i, p := range ring {
		q := ring[(i+1)%n]
		twice += float64(p.X*q.Y) - float64(q.X*p.Y)
	}
	f := math.Sqrt(2 * areaM2 / twice)
	for i, p := range ring {
		ring[i] = geo.XY{X: c.X + float64(f*p.X), Y: c.Y + float64(f*p.Y)}
	}
	return geo.XYGeometry{Kind: geo.Polygons, Parts: [][][]geo.XY{{append(ring, ring[0])}}}
}

// house gives a turned rectangle of 8 to 20 by 6 to 14 m.
func house(r *rand.Rand, at geo.XY) geo.XYGeometry {
	w, h := 8+12*r.Float64(), 6+8*r.Float64()
	s, c := math.Sincos(math.Pi * r.Float64())
	ring := make([]geo.XY, 0, 5)
	for _, p := range [5]geo.XY{{}, {X: w}, {X: w, Y: h}, {Y: h}, {}} {
		ring = append(ring, geo.XY{X: at.X + float64(c*p.X) - float64(s*p.Y), Y: at.Y + float64(s*p.X) + float64(c*p.Y)})
	}
	ring[4] = ring[0]
	return geo.XYGeometry{Kind: geo.Polygons, Parts: [][][]geo.XY{{ring}}}
}

// road gives a winding line of 4 to 10 positions, 80 to 250 m apart.
func road(r *rand.Rand, at geo.XY) geo.XYGeometry {
	n := 4 + r.IntN(7)
	way := 2 * math.Pi * r.Float64()
	ring := []geo.XY{at}
	for range n - 1 {
		way += 0.5 * r.NormFloat64()
		d := 80 + 170*r.Float64()
		s, c := math.Sincos(way)
		at = geo.XY{X: at.X + float64(d*c), Y: at.Y + float64(d*s)}
		ring = append(ring, at)
	}
	return geo.XYGeometry{Kind: geo.Lines, Parts: [][][]geo.XY{{ring}}}
}
