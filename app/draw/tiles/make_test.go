package tiles

import (
	"context"
	"fmt"
	"image"
	"image/color"
	"math"
	"sync"
	"testing"

	"groundtally/geo"
)

// The generated district: cells in rows and columns with twenty shared, shaken corners each.
const (
	cellM      = 190.0
	perSide    = 5 // corners to a side of a parcel
	cornerStep = cellM / perSide
)

var testCentre = geo.LonLat{Lon: -27, Lat: 47.5}

// shake moves a corner of the lattice by chance that depends on its place alone, so that neighbours share
// it.
func shake(ix, iy int) geo.XY {
	h := uint64(ix)*0x9e3779b97f4a7c15 ^ uint64(iy)*0xc2b2ae3d27d4eb4f
	h ^= h >> 29
	h *= 0xbf58476d1ce4e5b9
	h ^= h >> 32
	dx, dy := float64(h&0xffff)/0xffff-0.5, float64(h>>16&0xffff)/0xffff-0.5
	return geo.XY{X: (float64(ix) + 0.7*dx) * cornerStep, Y: (float64(iy) + 0.7*dy) * cornerStep}
}

// parcelCells gives n parcels around the centre, row by row.
func parcelCells(n int) Layer {
	plane := NewPlane(testCentre)
	across := int(math.Ceil(math.Sqrt(float64(n))))
	l := Layer{Role: "parcels"}
	for i := range n {
		x0, y0 := (i%across-across/2)*perSide, (i/across-across/2)*perSide
		ring := make([]geo.LonLat, 0, 4*perSide+1)
		put := func(ix, iy int) { ring = append(ring, plane.From(shake(ix, iy))) }
		for k := range perSide {
			put(x0+k, y0)
		}
		for k := range perSide {
			put(x0+perSide, y0+k)
		}
		for k := range perSide {
			put(x0+perSide-k, y0+perSide)
		}
		for k := range perSide {
			put(x0, y0+perSide-k)
		}
		ring = append(ring, ring[0])
		l.Features = append(l.Features, Feature{ID: fmt.Sprintf("P%d", i), Geometry: polygons(ring)})
	}
	return l
}

func polygons(rings ...[]geo.LonLat) geo.LonLatGeometry {
	return geo.LonLatGeometry{Kind: geo.Polygons, Parts: [][][]geo.LonLat{rings}}
}

// local gives a geometry from metres around the centre.
func local(kind geo.Kind, rings ...[]geo.XY) geo.LonLatGeometry {
	plane := NewPlane(testCentre)
	return geo.Map(geo.XYGeometry{Kind: kind, Parts: [][][]geo.XY{rings}}, plane.From)
}

// there gives where a place in metres around the test's centre lies in the plane of a ground.
func there(g *Ground, x, y float64) geo.XY {
	return g.Plane().To(NewPlane(testCentre).From(geo.XY{X: x, Y: y}))
}

func square(x, y, half float64) []geo.XY {
	return []geo.XY{{X: x - half, Y: y - half}, {X: x + half, Y: y - half}, {X: x + half, Y: y + half}, {X: x - half, Y: y + half}, {X: x - half, Y: y - half}}
}

func mustGround(t testing.TB, layers ...Layer) *Ground {
	t.Helper()
	g, err := NewGround(context.Background(), layers)
	if err != nil {
		t.Fatal(err)
	}
	return g
}

// wide100k is the large district, made once for all tests that need it.
var wide100k = sync.OnceValue(func() *Ground {
	g, err := NewGround(context.Background(), []Layer{parcelCells(100_000)})
	if err != nil {
		panic(err)
	}
	return g
})

// mixed is a small district with something of every role.
func mixed(t testing.TB) *Ground {
	parcels := parcelCells(400)
	lines := func(role string, at ...[]geo.XY) Layer {
		l := Layer{Role: role}
		for i, line := range at {
			class := "lane"
			if i == 0 {
				class = "main"
			}
			l.Features = append(l.Features, Feature{ID: fmt.Sprint(i), Class: class, Geometry: local(geo.Lines, line)})
		}
		return l
	}
	points := func(role string, n int) Layer {
		l := Layer{Role: role}
		for i := range n {
			l.Features = append(l.Features, Feature{ID: fmt.Sprint(i), Geometry: local(geo.Points, []geo.XY{shake(i*7%40-20, i*11%40-20)})})
		}
		return l
	}
	return mustGround(t,
		Layer{Role: "district", Features: []Feature{{ID: "d", Geometry: local(geo.Polygons, square(0, 0, 2300), square(500, 500, 100))}}},
		parcels,
		Layer{Role: "peat", Features: []Feature{{ID: "p", Geometry: local(geo.Polygons, square(-300, 200, 411))}}},
		Layer{Role: "water", Features: []Feature{{ID: "w", Geometry: local(geo.Polygons, square(700, -300, 153), square(700, -300, 50))}}},
		lines("water", []geo.XY{{X: -2000, Y: 3000}, {X: 111, Y: 17}, {X: 900, Y: -2500}}),
		lines("roads", []geo.XY{{X: -2500, Y: -2000}, {X: 2500, Y: 1900}}, []geo.XY{{X: -2500, Y: 10}, {X: 2500, Y: 11}}),
		lines("grid_lines", []geo.XY{{X: -100, Y: 2500}, {X: -90, Y: 0}, {X: 1500, Y: -2500}}),
		points("dwellings", 300), points("substations", 5), points("viewpoints", 9),
	)
}

// everything shades the parcels in all ways there are.
func everything(parcels int) Shading {
	s := Shading{Class: make([]uint8, parcels), Over: make([]bool, parcels), Colours: []color.NRGBA{hex(0xdeece8), hex(0x5aa79f), hex(0x084848)}}
	for i := range parcels {
		s.Class[i] = []uint8{0, 1, 2, Unknown, Bare}[i*7%5]
		s.Over[i] = i%6 == 0
	}
	return s
}

func someMarks() []Mark {
	return []Mark{{
		Letter: "A", Parcels: []string{"P210", "P211", "not there"},
		Buildable: []geo.LonLatGeometry{local(geo.Polygons, square(100, 100, 70))},
		Panels:    []geo.LonLatGeometry{local(geo.Polygons, square(-200, -100, 60))},
		Turbines:  []geo.LonLat{NewPlane(testCentre).From(geo.XY{X: 3, Y: -4}), NewPlane(testCentre).From(geo.XY{X: 301, Y: 7})},
		Routes:    []geo.LonLatGeometry{local(geo.Lines, []geo.XY{{X: 0, Y: 0}, {X: -700, Y: 123}})},
		Setbacks: []Setback{
			{Geometry: local(geo.Points, []geo.XY{{X: 3, Y: -4}}), RadiusM: 250},
			{Geometry: local(geo.Points, []geo.XY{{X: 301, Y: 7}}), RadiusM: 250},
			{Geometry: local(geo.Lines, []geo.XY{{X: -400, Y: -400}, {X: 0, Y: -300}}), RadiusM: 90},
			{Geometry: local(geo.Polygons, square(-500, 500, 99))},
		},
	}}
}

// render draws and colours a rectangle in one go.
func render(t testing.TB, g *Ground, level int, rect image.Rectangle, s Shading, marks []Mark) *image.RGBA {
	t.Helper()
	style := Style{Look: LightLook()}
	tile, err := g.Draw(context.Background(), level, rect, style)
	if err != nil {
		t.Fatal(err)
	}
	return tile.Shade(NewPalette(s, g.Parcels(), style), g.Place(marks).Draw(level, rect, style), nil)
}

func at(img *image.RGBA, x, y int) color.NRGBA {
	c := img.RGBAAt(x, y)
	return color.NRGBA(c)
}
