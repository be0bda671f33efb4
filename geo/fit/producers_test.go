package fit

import (
	"math"
	"math/rand/v2"
	"slices"
	"testing"

	"groundtally/geo"
	"groundtally/geo/measure"
)

// Around a square with sides of 3 stand 12 machines exactly a spacing apart when the walk starts at a corner.
func TestWalkAroundSquare(t *testing.T) {
	ring := box(0, 0, 3, 3)[0]
	at := walk(ring, 0, nil)
	if len(at) != 12 {
		t.Fatalf("%d machines at %v, want 12", len(at), at)
	}
	for i, p := range at {
		if d, _ := measure.PointToM(p, geo.XYGeometry{Kind: geo.Lines, Parts: [][][]geo.XY{{ring}}}); d > 1e-12 {
			t.Errorf("%v stands %v off the boundary", p, d)
		}
		if !free(p, at, i) {
			t.Errorf("%v stands too near", p)
		}
		if math.Abs(p.Dist(at[(i+1)%12])-1) > 1e-9 {
			t.Errorf("%v and %v are not neighbours", p, at[(i+1)%12])
		}
	}
}

// Every place on the ring is too near to a machine afterwards, whatever start.
func TestWalkLeavesNoGap(t *testing.T) {
	r := rand.New(rand.NewPCG(31, 1))
	for range 40 {
		ring := star(r, 2.5, 4+r.IntN(30))[0]
		for k := range walkStarts {
			at := walk(ring, startOf(ring, k), nil)
			for i, p := range at {
				if !free(p, at, i) {
					t.Fatalf("%v stands too near", p)
				}
			}
			for i := 1; i < len(ring); i++ {
				for s := range 50 {
					f := float64(s) / 50
					p := geo.XY{X: ring[i-1].X + f*(ring[i].X-ring[i-1].X), Y: ring[i-1].Y + f*(ring[i].Y-ring[i-1].Y)}
					clear := true
					for _, q := range at {
						clear = clear && metric(p, q) > 1+1e-6
					}
					if clear {
						t.Fatalf("start %d: a machine more has room at %v", k, p)
					}
				}
			}
		}
	}
	if at := walk(nil, 0, nil); at != nil {
		t.Errorf("no ring holds %v", at)
	}
}

// With pairwise losses additions are worth less the more machines stand, so that the quick greedy choice is
// the plain one.
func TestGreedyIsThePlainOne(t *testing.T) {
	r := rand.New(rand.NewPCG(32, 1))
	for range 10 {
		in := Input{Buildable: area(star(r, 900, 12)), Spacing: Spacing{AlongM: 500, AcrossM: 300, AzimuthDeg: 90}, Gain: &wind{}}
		j := newJob(in, 1)
		c := newCluster(j, j.parts, nil)
		for _, most := range []int{1, 3, math.MaxInt} {
			var want []geo.XY
			open := slices.Clone(thinned(c.points, greedyPoints))
			for len(open) > 0 && len(want) < most {
				best, k := math.Inf(-1), 0
				for i, p := range open {
					if d := in.Gain.Add(j.metres(want), j.f.metres(p)); d > best+1e-9 {
						best, k = d, i
					}
				}
				p := open[k]
				want = append(want, p)
				open = slices.DeleteFunc(open, func(q geo.XY) bool { return !apart(p, q) })
			}
			if got := j.greedy(c.points, nil, most); math.Abs(j.total(got)-j.total(want)) > 1e-6 || len(got) != len(want) {
				t.Errorf("%d machines for %v, want %d for %v", len(got), j.total(got), len(want), j.total(want))
			}
		}
	}
}

// New producers never cost what the earlier ones had, and the list of attempts agrees with the layout.
func TestAttempts(t *testing.T) {
	r := rand.New(rand.NewPCG(33, 1))
	won := map[string]int{}
	for i := range 60 {
		in := Input{Buildable: hectares(r, 20+100*r.Float64(), 5+r.IntN(30)), Spacing: Spacing{AlongM: 500, AcrossM: 300, AzimuthDeg: 360 * r.Float64()}}
		if i%2 == 0 {
			in.Gain = newWakes(100)
		}
		if i%3 == 0 {
			in.Max = 1 + i%5
		}
		out := machines(t, in)
		won[out.How]++
		last, named, most := -1, false, 0
		for _, a := range out.Tried {
			k := slices.Index(producers, a.How)
			if k <= last {
				t.Errorf("attempts out of order: %v", out.Tried)
			}
			last, most = k, max(most, a.Machines)
			named = named || a.How == out.How && a.Machines == len(out.At)
			if (a.Total != 0) != (in.Gain != nil) {
				t.Errorf("total %v", a.Total)
			}
			if a.How == out.How && out.Total < a.Total-1e-6 {
				t.Errorf("moves lost %v of %v", a.Total-out.Total, a.Total)
			}
		}
		if !named || most != len(out.At) {
			t.Errorf("%d machines by %s are not in %v", len(out.At), out.How, out.Tried)
		}
		if in.Gain == nil {
			continue
		}
		// Against the producers before walks and greedy choice.
		j := newJob(in, 1)
		all := j.all()
		if in.Max > 0 && len(all.early) > in.Max {
			at, _ := j.spread(all.early, all.earlyHow)
			all.early = at
		}
		old := j.refine(all.early)
		if len(old) > len(out.At) || len(old) == len(out.At) && j.total(old) > out.Total+1e-6 {
			t.Errorf("%d machines for %v by %s, were %d for %v", len(out.At), out.Total, out.How, len(old), j.total(old))
		}
	}
	for _, by := range []string{ByBoundary, ByGreedy} {
		if won[by] == 0 {
			t.Errorf("%s never won: %v", by, won)
		}
	}
}

// 100 ha must not ask a judge more often than a second allows; a real one takes some tens of microseconds.
func TestCallsOfJudge(t *testing.T) {
	for _, rotorM := range []float64{130, 60} {
		for _, most := range []int{0, 3, 30} {
			w := newWakes(rotorM)
			machines(t, Input{Buildable: hectares(rand.New(rand.NewPCG(100, 1)), 100, 200), Spacing: Spacing{AlongM: 5 * rotorM, AcrossM: 3 * rotorM, AzimuthDeg: 240}, Max: most, Gain: w})
			if n := w.totals + w.adds + w.moves; n > 5000 {
				t.Errorf("rotor %v m, at most %d machines: %d calls", rotorM, most, n)
			}
		}
	}
}
