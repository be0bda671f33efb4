package gen

import (
	"math"
	"sync"
	"testing"

	"groundtally/geo"
)

// shipped builds the island that ships once for all tests.
var shipped = sync.OnceValues(func() (*isle, error) { return makeIsle(Seed) })

func theIsle(t *testing.T) *isle {
	t.Helper()
	s, err := shipped()
	if err != nil {
		t.Fatal(err)
	}
	return s
}

func within(t *testing.T, what string, got, lo, hi float64) {
	t.Helper()
	if got < lo || got > hi {
		t.Errorf("%s is %g, want %g to %g", what, got, lo, hi)
	}
}

func TestIslandHasTheStatedSize(t *testing.T) {
	s := theIsle(t)
	e := geo.EmptyExtent()
	for _, p := range s.land.shore {
		e = e.Add(p)
	}
	within(t, "width in m", e.MaxX-e.MinX, 23000, 25000)
	within(t, "height in m", e.MaxY-e.MinY, 14000, 16000)
	peak := 0.0
	for _, h := range s.land.height.v {
		peak = math.Max(peak, h)
	}
	within(t, "highest point in m", peak, peakM-0.05, peakM+0.05)

	big := 0
	for _, p := range s.parcels {
		if p.areaHa > 1 {
			big++
		}
	}
	within(t, "parcels", float64(len(s.parcels)), 1150, 1300)
	within(t, "parcels over 1 ha", float64(big), 560, 680)
	lived, households := 0, 0
	for _, d := range s.dwellings {
		if d.class != "not lived in" {
			lived++
			households += d.households
		}
	}
	within(t, "dwellings with barns", float64(len(s.dwellings)), 1850, 2000)
	within(t, "people at 2.3 to a household", 2.3*float64(households), 7500, 10500)
	if lived == len(s.dwellings) {
		t.Error("there are no barns")
	}
}

// Parcels tile: every ring is simple, no two rings cross, no parcel's middle lies in another.
func TestParcelsTile(t *testing.T) {
	s := theIsle(t)
	m := newMapper(s)
	idx := newSegments(150)
	type side struct{ a, b geo.XY }
	sides := map[side]bool{}
	for i, p := range s.parcels {
		if !simpleRing(p.ring) {
			t.Errorf("%s crosses itself", p.id)
		}
		if ringArea(p.ring) <= 0 {
			t.Errorf("%s turns right", p.id)
		}
		idx.addRing(p.ring, i)
		for k := range p.ring {
			sides[side{p.ring[k], p.ring[(k+1)%len(p.ring)]}] = true
		}
	}
	for i := range s.parcels {
		if at := m.parcelAt(s.parcels[i].middle); at != i {
			t.Errorf("the middle of %s lies in parcel %d", s.parcels[i].id, at)
		}
	}
	crossings := 0
	for i := range idx.a {
		a, b := idx.a[i], idx.b[i]
		for _, j := range idx.near(geo.EmptyExtent().Add(a).Add(b)) {
			if int(j) <= i || idx.tag[j] == idx.tag[i] {
				continue
			}
			c, d := idx.a[j], idx.b[j]
			const end = 1e-7
			if tt, u, ok := crossing(a, b, c, d); ok && tt > end && tt < 1-end && u > end && u < 1-end {
				crossings++
				if crossings < 6 {
					t.Errorf("%s and %s cross near %v", s.parcels[idx.tag[i]].id, s.parcels[idx.tag[j]].id, along(a, b, tt))
				}
			}
		}
	}
	shared := 0
	for e := range sides {
		if sides[side{e.b, e.a}] {
			shared++
		}
	}
	if 2*shared < len(sides)/2 {
		t.Errorf("only %d of %d sides are shared point by point", shared, len(sides))
	}
}

// One can drive from everywhere to everywhere: main road and lanes are joined at common points.
func TestRoadsAreOneNetwork(t *testing.T) {
	s := theIsle(t)
	parent := map[geo.XY]geo.XY{}
	var find func(p geo.XY) geo.XY
	find = func(p geo.XY) geo.XY {
		if q, ok := parent[p]; ok && q != p {
			r := find(q)
			parent[p] = r
			return r
		}
		parent[p] = p
		return p
	}
	var first geo.XY
	for i, r := range s.roads {
		if r.class == "street" {
			continue
		}
		if i == 0 {
			first = r.line[0]
		}
		for k := 1; k < len(r.line); k++ {
			parent[find(r.line[k])] = find(r.line[k-1])
		}
	}
	for _, r := range s.roads {
		if r.class != "street" && find(r.line[0]) != find(first) {
			t.Errorf("a %s near %v is cut off", r.class, r.line[0])
		}
	}
	ways := newSegments(200)
	for i, r := range s.roads {
		ways.addLine(r.line, i)
	}
	for _, d := range s.dwellings {
		if dist, _ := ways.nearest(d.at, 1000); dist < leastRoadGapM-0.02 {
			t.Errorf("dwelling %s stands %.1f m from the middle of a road", d.id, dist)
		}
		if !inRing(d.at, s.land.shore) {
			t.Errorf("dwelling %s stands in the sea", d.id)
		}
	}
}

// Water runs down to the sea, and the big river is the only one with a flood plain.
func TestStreamsRunDown(t *testing.T) {
	s := theIsle(t)
	toSea := 0
	for _, w := range s.land.streams {
		first, last := w.line[0], w.line[len(w.line)-1]
		if s.land.ground(first) <= s.land.ground(last) {
			t.Errorf("%s begins at %.1f m and ends at %.1f m", w.name, s.land.ground(first), s.land.ground(last))
		}
		if s.land.inland.at(last) <= 0 {
			toSea++
		}
	}
	if toSea < 3 {
		t.Errorf("only %d streams reach the sea", toSea)
	}
	if s.land.mainLine() == nil {
		t.Error("no main river")
	}
}

// Zones of one layer never overlap, and their rings are simple.
func TestZonesAreClean(t *testing.T) {
	m := newMapper(theIsle(t))
	for name, f := range map[string]func(geo.XY) int{"soil": m.soil, "cover": m.cover, "grade": m.grade} {
		var area float64
		zs := zones(m.ext, 90, 2, f)
		for _, z := range zs {
			if !simpleRing(z.outer) {
				t.Errorf("%s: a ring of class %d near %v touches itself", name, z.class, z.outer[0])
			}
			area += ringArea(z.outer)
			for _, h := range z.holes {
				area += ringArea(h)
			}
		}
		// A point in two zones would show in a sample.
		r := stream(Seed, "sample "+name)
		for range 400 {
			p := geo.XY{X: between(r, -12000, 12000), Y: between(r, -7500, 7500)}
			n := 0
			for _, z := range zs {
				if !inRing(p, z.outer) {
					continue
				}
				n++
				for _, h := range z.holes {
					if inRing(p, h) {
						n--
					}
				}
			}
			if n > 1 || n == 0 && name != "grade" && m.land.inland.at(p) > 0 {
				t.Errorf("%s: point %v lies in %d zones", name, p, n)
			}
		}
		if area <= 0 {
			t.Errorf("%s covers nothing", name)
		}
	}
}

func TestBowTieCrossesItself(t *testing.T) {
	r := []geo.XY{{X: 0, Y: 0}, {X: 100, Y: 0}, {X: 100, Y: 100}, {X: 0, Y: 100}}
	if simpleRing(bowTie(r)) {
		t.Error("the ring is still simple")
	}
}

func BenchmarkIsle(b *testing.B) {
	for b.Loop() {
		if _, err := makeIsle(Seed); err != nil {
			b.Fatal(err)
		}
	}
}
