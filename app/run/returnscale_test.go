package run

import (
	"testing"

	"groundtally/scoring/weigh"
)

// Of two candidates the one with the far higher ratio has hardly more left; with a burden beside it the other one is
// first as soon as what is left counts.
func TestReturnScaleIsTold(t *testing.T) {
	s := smallStudy(t, 60)
	r := compute(t, s, nil, 2)
	snap, err := s.Snapshot()
	if err != nil {
		t.Fatal(err)
	}
	of := func(keys map[string]float64) (*struct{ first, other string }, string) {
		var sc []scale
		for _, k := range shipped(t).Keys() {
			if w, ok := keys[k.Key]; ok {
				one, c, err := scaleOf(snap, "operator", k)
				if err != nil || c == nil {
					t.Fatal(err)
				}
				one.raw = w
				sc = append(sc, one)
			}
		}
		f, err := weighed(snap, sc, r.Candidates)
		if err != nil {
			t.Fatal(err)
		}
		n, err := returnScale(snap, shipped(t), "operator", sc, f.items, f.at, r.Candidates)
		if err != nil {
			t.Fatal(err)
		}
		first := func() string {
			best, id := -1.0, ""
			for _, it := range f.items {
				sum := 0.0
				for k := range sc {
					v := weigh.Part{Mid: 0.5}
					if it.Values[k].Known {
						v = it.Values[k]
					}
					sum += sc[k].raw * v.Mid
				}
				if sum > best {
					best, id = sum, it.ID
				}
			}
			return id
		}()
		if n == nil {
			return nil, first
		}
		return &struct{ first, other string }{n.Args["first"], n.Args["other"]}, first
	}
	told := 0
	for _, w := range []float64{0.05, 0.1, 0.2, 0.3, 0.5, 1, 2} {
		got, first := of(map[string]float64{"eroi_extended": 1, "nearest_dwelling_m": w})
		if got == nil {
			continue
		}
		told++
		if got.first != first || got.other == got.first {
			t.Errorf("weight %v: %+v, first %s", w, got, first)
		}
	}
	if told == 0 {
		t.Error("the scale of the return never decides, so this test shows nothing")
	}
	if got, _ := of(map[string]float64{"net_share": 1, "nearest_dwelling_m": 0.3}); got != nil {
		t.Errorf("no ratio is weighed, and yet %+v", got)
	}
}
