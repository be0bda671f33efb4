package gen

import (
	"fmt"
	"sort"
)

// isle is everything of the island that has a place.
type isle struct {
	seed      uint64
	land      *land
	roads     []road
	places    []place
	parcels   []parcel
	dwellings []dwelling
}

func makeIsle(seed uint64) (*isle, error) {
	g, err := makeLand(seed)
	if err != nil {
		return nil, fmt.Errorf("make land: %w", err)
	}
	s := &isle{seed: seed, land: g}
	s.roads, s.places = makeRoads(seed, g)
	if s.parcels, err = makeParcels(seed, g, s.roads, s.places); err != nil {
		return nil, err
	}
	if s.dwellings, err = makeDwellings(seed, g, s.roads, s.places); err != nil {
		return nil, err
	}
	return s, nil
}

// sortBy puts the indices in rising order of their weights.
func sortBy(order []int, weight []float64) {
	sort.SliceStable(order, func(a, b int) bool { return weight[order[a]] < weight[order[b]] })
}
