package run

import (
	"context"
	"testing"

	"groundtally/app/study"
	"groundtally/scoring/weigh"
)

// While weights alone change, weighing again equals computing anew, and a board gives the same order.
func TestReweighAndBoardEqualCompute(t *testing.T) {
	s := smallStudy(t, 12)
	p := shipped(t)
	ctx := context.Background()
	before, err := s.Snapshot()
	if err != nil {
		t.Fatal(err)
	}
	cache := &Memory{}
	e := &Engine{Params: p, Cache: cache, Load: StoreLoader(s.Store())}
	r, err := e.Compute(ctx, before)
	if err != nil {
		t.Fatal(err)
	}
	for _, edits := range [][]study.SettingEdit{
		{{Key: "voice.farmers.weight.net_share", Value: "70"}},
		{{Key: "voice.farmers.weight.habitat_ha_per_gwh", Value: "15"}, {Key: "anchor.connection_km.worst", Value: "9"}},
		{{Key: "voice.elders.weight.connection_km", Value: "3"}, {Key: "weigh.mixes", Value: "40"}, {Key: "gate.owner_consent", Value: "not_no"}},
		{{Key: "gate.critical.farmland", Value: "not_no"}, {Key: "saving.investment_g_per_kwh", Value: "12"}},
		{{Key: "voice.broken.weight.rated_kw", Value: "3"}},
	} {
		if _, err := s.Set(ctx, "set", "", edits...); err != nil {
			t.Fatal(err)
		}
		snap, err := s.Snapshot()
		if err != nil {
			t.Fatal(err)
		}
		if !OnlyWeighing(before, snap) {
			t.Fatalf("%v changes more than the weighing", edits)
		}
		want, err := e.Compute(ctx, snap)
		if err != nil {
			t.Fatal(err)
		}
		got, err := e.Reweigh(ctx, snap, r)
		if err != nil {
			t.Fatal(err)
		}
		if got.Code != want.Code || len(got.Notices) != len(want.Notices) || len(got.Unready) != len(want.Unready) {
			t.Fatalf("after %v: weighing again gives %+v, computing %+v", edits, got.Code, want.Code)
		}
		b, err := NewBoard(snap, p, got)
		if err != nil {
			t.Fatal(err)
		}
		var st weigh.Standing
		for _, v := range want.Voices {
			if err := b.Weigh(b.Raw(snap, v.Voice), &st); err != nil {
				t.Fatal(err)
			}
			if len(st.Order) != len(v.Order) {
				t.Fatalf("the board orders %d, the voice %d", len(st.Order), len(v.Order))
			}
			for place, row := range v.Order {
				i := st.Order[place]
				id := row.Site
				if row.Site != NoSite {
					id += "/" + row.Plant
				}
				if b.IDs[i] != id || st.Tier[i] != row.Tier || st.Score[i] != row.Score || st.Low[i] != row.ScoreLow || st.High[i] != row.ScoreHigh {
					t.Fatalf("voice %s, place %d: the board has %s (%v, tier %d), the order %s (%v, tier %d)", v.Voice, place+1, b.IDs[i], st.Score[i], st.Tier[i], id, row.Score, row.Tier)
				}
			}
		}
		r = got
	}
	if _, err := s.Set(ctx, "set", "", study.SettingEdit{Key: "rule.setback.roads.solar_m", Value: "30"}); err != nil {
		t.Fatal(err)
	}
	snap, err := s.Snapshot()
	if err != nil {
		t.Fatal(err)
	}
	if OnlyWeighing(before, snap) {
		t.Error("a setback was taken for a matter of weighing")
	}
}
