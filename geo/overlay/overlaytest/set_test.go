package overlaytest

import (
	"bytes"
	"encoding/binary"
	"fmt"
	"reflect"
	"testing"

	"groundtally/geo"
	"groundtally/geo/measure"
	"groundtally/geo/overlay"
)

func TestSetIsWhatItSays(t *testing.T) {
	s := New(1, Parcels)
	if len(s.Parcels) != 20000 || s.Features() != 100000 || len(s.Rules) != 5 {
		t.Fatalf("%d parcels, %d features, %d rules", len(s.Parcels), s.Features(), len(s.Rules))
	}
	sum := 0.0
	for _, p := range s.Parcels {
		a, n := measure.AreaM2(p), p.Count()-1
		if a < 0.5e4*(1-1e-9) || a > 50e4*(1+1e-9) || n < 10 || n > 60 {
			t.Fatalf("a parcel has %v m2 and %d corners", a, n)
		}
		sum += a
	}
	if sum < 2100e6 || sum > 2200e6 {
		t.Errorf("the parcels have %v km2, want some 2,150", sum/1e6)
	}
	shares := map[string]float64{}
	for _, r := range s.Rules {
		for _, src := range r.Sources {
			shares[fmt.Sprintf("%s %v", r.Name, src.SetbackM)] = float64(len(src.Features))
		}
	}
	for key, want := range map[string]float64{"dwellings 100": 49000, "farms 250": 7000, "farms 300": 7000, "farms 500": 7000, "lines 50": 14750, "roads 150": 14750, "woods 0": 500} {
		if got := shares[key]; got < 0.97*want || got > 1.03*want {
			t.Errorf("%s: %v features, want some %v", key, got, want)
		}
	}
	for _, g := range s.Rules[4].Sources[0].Features {
		if a := measure.AreaM2(g); g.Count() != 2001 || a < 50e4*(1-1e-9) || a > 1500e4*(1+1e-9) {
			t.Fatalf("a polygon has %d positions and %v m2", g.Count(), a)
		}
	}
	few := New(1, 10)
	if !reflect.DeepEqual(few.Rules, s.Rules) || !reflect.DeepEqual(few.Parcels, s.Parcels[:10]) {
		t.Error("fewer parcels are another set")
	}
	if reflect.DeepEqual(New(2, 10).Parcels, few.Parcels) {
		t.Error("the seed has no effect")
	}
	e := overlay.New()
	for _, g := range append(few.Parcels, s.Rules[4].Sources[0].Features[:10]...) {
		if ok, why, err := e.Valid(g); !ok {
			t.Errorf("not valid: %s %v", why, err)
		}
	}
}

// small gives the set around its first parcels, so that it is quickly widened.
func small(parcels int) Set {
	s := New(1, parcels)
	near := func(g geo.XYGeometry) bool {
		for _, p := range s.Parcels {
			if geo.ExtentOf(p).Grow(600).Meets(geo.ExtentOf(g)) {
				return true
			}
		}
		return false
	}
	for i, r := range s.Rules {
		for j, src := range r.Sources {
			var fs []geo.XYGeometry
			for _, f := range src.Features {
				if near(f) {
					fs = append(fs, f)
				}
			}
			s.Rules[i].Sources[j].Features = fs
		}
	}
	return s
}

func TestOverlayDoesNotDependOnWorkers(t *testing.T) {
	s := small(20)
	var want Found
	for i, cores := range []int{1, 2, 5} {
		l, err := Widen(t.Context(), s, cores)
		if err != nil {
			t.Fatal(err)
		}
		got, err := Overlay(t.Context(), s, l, cores)
		if err != nil {
			t.Fatal(err)
		}
		if i == 0 {
			want = got
		}
		if !reflect.DeepEqual(got, want) {
			t.Errorf("on %d workers %+v, on one %+v", cores, got, want)
		}
	}
	if !(want.BuildableM2 > 0) || want.Rules[1].TakesAll == 0 || want.Candidates < 20*10 {
		t.Errorf("got %+v", want)
	}
}

func TestWrite(t *testing.T) {
	s := small(3)
	var b bytes.Buffer
	if err := Write(&b, s); err != nil {
		t.Fatal(err)
	}
	var head [4]uint32
	if err := binary.Read(&b, binary.LittleEndian, &head); err != nil || head != [4]uint32{5, 24, uint32(s.Features()), 3} {
		t.Fatalf("got %v %v", head, err)
	}
	for i := range s.Features() + 3 {
		if i < s.Features() {
			b.Next(12)
		}
		n := binary.LittleEndian.Uint32(b.Next(4))
		if g := b.Next(int(n)); len(g) != int(n) || g[0] != 1 {
			t.Fatalf("geometry %d is cut short", i+1)
		}
	}
	if b.Len() != 0 {
		t.Errorf("%d bytes are left over", b.Len())
	}
}

// One parcel after the other, widening left out.
func BenchmarkOverlay(b *testing.B) {
	for _, n := range []int{25, 100} {
		b.Run(fmt.Sprint(n), func(b *testing.B) {
			s := small(n)
			l, err := Widen(b.Context(), s, 2)
			if err != nil {
				b.Fatal(err)
			}
			for b.Loop() {
				if _, err := Overlay(b.Context(), s, l, 1); err != nil {
					b.Fatal(err)
				}
			}
			b.ReportMetric(float64(n)*float64(b.N)/b.Elapsed().Seconds(), "parcels/s")
		})
	}
}

// A whole district of 3,600 km² in tiles, then its zones, widening left out.
func BenchmarkDistrict(b *testing.B) {
	s := New(1, 1)
	l, err := Widen(b.Context(), s, 2)
	if err != nil {
		b.Fatal(err)
	}
	corners := []geo.XY{{}, {X: SideM}, {X: SideM, Y: SideM}, {Y: SideM}, {}}
	district := geo.XYGeometry{Kind: geo.Polygons, Parts: [][][]geo.XY{{corners}}}
	for _, sizeM := range []float64{1000, 2000} {
		tiles := overlay.Tiles(geo.ExtentOf(district), sizeM)
		e := overlay.New()
		var parts []geo.XYGeometry
		b.Run(fmt.Sprintf("tiles_of_%.0f_m", sizeM), func(b *testing.B) {
			for b.Loop() {
				parts = parts[:0]
				for _, x := range tiles {
					in := overlay.TileInput{Tile: x, District: district}
					for k, r := range s.Rules {
						in.Rules = append(in.Rules, overlay.RuleOf(r.Name, x, l[k]...))
					}
					out, err := e.LandLeft(in)
					if err != nil {
						b.Fatal(err)
					}
					parts = append(parts, out.Buildable)
				}
			}
			b.ReportMetric(float64(len(tiles)), "tiles")
		})
		b.Run(fmt.Sprintf("zones_of_%.0f_m", sizeM), func(b *testing.B) {
			for b.Loop() {
				zones, err := e.Zones(parts, 40, 20000)
				if err != nil {
					b.Fatal(err)
				}
				b.ReportMetric(float64(len(zones)), "zones")
			}
		})
	}
}
