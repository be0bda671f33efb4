package run

import (
	"errors"
	"math"
	"slices"
	"strconv"
	"strings"
	"testing"

	"groundtally/app/study"
	"groundtally/geo"
	"groundtally/scoring"
	"groundtally/scoring/weigh"
)

func setAll(t *testing.T, s *study.Study, pairs ...string) {
	t.Helper()
	var edits []study.SettingEdit
	for i := 0; i < len(pairs); i += 2 {
		edits = append(edits, study.SettingEdit{Key: pairs[i], Value: pairs[i+1]})
	}
	if _, err := s.Set(t.Context(), "set", "", edits...); err != nil {
		t.Fatal(err)
	}
}

// A gate holds back just those that touch the stock, the order of the rest stays, and the places without gates are
// those of an order in which none is in force.
func TestCriticalStocksAreGates(t *testing.T) {
	s := smallStudy(t, 8)
	open := compute(t, s, nil, 2)
	setAll(t, s, "gate.critical.peat", "not_no", "gate.critical.irreplaceable_habitat", "yes")
	r := compute(t, s, nil, 2)
	stocks := map[string]int{}
	for v := range r.Voices {
		with, without := r.Voices[v], open.Voices[v]
		if len(without.HeldBack) != 0 {
			t.Fatal("something is held back without a gate")
		}
		places := map[string]int{}
		for _, row := range without.Order {
			places[row.Site+"/"+row.Plant] = row.Place
			if row.PlaceWithout != 0 {
				t.Fatal("a place without gates where no gate holds back")
			}
		}
		if len(with.HeldBack) == 0 || len(with.Order)+len(with.HeldBack) != len(without.Order) {
			t.Fatalf("voice %s: %d ordered and %d held back of %d", with.Voice, len(with.Order), len(with.HeldBack), len(without.Order))
		}
		last := 0
		for _, row := range with.Order {
			id := row.Site + "/" + row.Plant
			if row.PlaceWithout != places[id] || row.PlaceWithout <= last {
				t.Fatalf("voice %s: %s would be at %d, is at %d of an order without gates, after %d", with.Voice, id, row.PlaceWithout, places[id], last)
			}
			last = row.PlaceWithout
		}
		for _, h := range with.HeldBack {
			if h.Place != places[h.ID()] {
				t.Fatalf("voice %s: %s, held back, would be at %d and is at %d", with.Voice, h.ID(), h.Place, places[h.ID()])
			}
			c, err := r.Find(h.Site, h.Plant)
			if err != nil {
				t.Fatal(err)
			}
			for _, g := range h.Gates {
				stocks[g]++
				if q, _ := c.Consequence("peat_ha"); g == "peat" && !(q.State == scoring.Number && q.Central > 0) {
					t.Errorf("%s is held back for peat and touches %+v", h.ID(), q)
				}
				if v := c.stateOf("habitat_irreplaceable_ha"); g == "irreplaceable_habitat" && v.State == scoring.None {
					t.Errorf("%s is held back for habitat and touches none", h.ID())
				}
			}
		}
	}
	if stocks["peat"] == 0 || stocks["irreplaceable_habitat"] == 0 {
		t.Errorf("held back: %v", stocks)
	}
}

// One voice weighs one consequence of a family, unless it says why.
func TestAFamilyCountsOnceUnlessAReasonIsGiven(t *testing.T) {
	s := smallStudy(t, 120)
	setAll(t, s, "voice.farmers.weight.eroi_extended", "10")
	r := compute(t, s, nil, 1)
	var family *FamilyError
	if err := r.Unready["farmers"]; !errors.As(err, &family) || family.Family != "yield" || !strings.Contains(err.Error(), "voice.farmers.both.yield") {
		t.Fatalf("the voice says %v", r.Unready["farmers"])
	}
	if len(r.Voices) == 0 {
		t.Error("the other voices have no order either")
	}
	setAll(t, s, "voice.farmers.both.yield", "both were asked for at the hearing")
	r = compute(t, s, nil, 1)
	if len(r.Unready) != 0 {
		t.Fatalf("with a reason %v", r.Unready)
	}
	for _, v := range r.Voices {
		told := slices.ContainsFunc(v.Notices, func(n geo.Notice) bool {
			return n.Code == "family_twice" && n.Args["reason"] == "both were asked for at the hearing"
		})
		if told != (v.Voice == "farmers") {
			t.Errorf("voice %s: told %v", v.Voice, told)
		}
	}
	if err := CheckKey(catalog, shipped(t), "voice.farmers.both.yields"); err == nil {
		t.Error("a family that there is not was taken")
	}
}

// Where it is told that a default decides a place, a value of one's own beyond the one told turns the two round, and
// one short of it does not.
func TestADefaultThatDecidesAPlaceIsTold(t *testing.T) {
	s := smallStudy(t, 8)
	r := compute(t, s, nil, 2)
	tried := 0
	for _, v := range r.Voices {
		for _, n := range v.Notices {
			if n.Code != "default_decides" || tried == 4 {
				continue
			}
			tried++
			number := func(name string) float64 {
				x, err := strconv.ParseFloat(strings.ReplaceAll(n.Args[name], "\u202f", ""), 64)
				if err != nil {
					x, err = strconv.ParseFloat(strings.Join(strings.Fields(n.Args[name]), ""), 64)
				}
				if err != nil {
					t.Fatal(err)
				}
				return x
			}
			at, central := number("at"), number("central")
			for _, beyond := range []bool{false, true} {
				x := at - 0.05*(at-central)
				if beyond {
					x = at + 0.05*(at-central)
				}
				key := "inventory." + strings.ReplaceAll(n.Args["factor"], ".", "-")
				own := func(level string, from float64) { // the range moves along
					setAll(t, s, key+level, strconv.FormatFloat(from*x/central, 'g', -1, 64))
				}
				own(".low", number("low"))
				own(".central", central)
				own(".high", number("high"))
				after := compute(t, s, nil, 2)
				place := map[string]int{}
				for _, w := range after.Voices {
					if w.Voice == v.Voice {
						for _, row := range w.Order {
							place[row.Site+"/"+row.Plant] = row.Place
						}
					}
				}
				if turned := place[n.Args["below"]] < place[n.Args["above"]]; turned != beyond {
					t.Errorf("voice %s, %s at %v (told: %v): %s at %d, %s at %d", v.Voice, key, x, at, n.Args["above"], place[n.Args["above"]], n.Args["below"], place[n.Args["below"]])
				}
				setAll(t, s, key+".low", "", key+".central", "", key+".high", "")
			}
		}
	}
	if tried == 0 {
		t.Error("no default decides a place")
	}
}

// The alternatives stand where their score puts them, and take no place.
func TestAlternativesStandBeside(t *testing.T) {
	s := smallStudy(t, 40)
	setAll(t, s, "saving.investment_mj_per_mwh", "300", "saving.investment_g_per_kwh", "10")
	r := compute(t, s, nil, 2)
	snap, err := s.Snapshot()
	if err != nil {
		t.Fatal(err)
	}
	board, err := NewBoard(snap, shipped(t), r)
	if err != nil {
		t.Fatal(err)
	}
	for _, v := range r.Voices {
		if len(v.Beside) != 2 {
			t.Fatalf("%+v", v.Beside)
		}
		var st weigh.Standing
		raw := board.Raw(snap, v.Voice)
		if err := board.Weigh(raw, &st); err != nil {
			t.Fatal(err)
		}
		live, err := board.Beside(raw, &st)
		if err != nil {
			t.Fatal(err)
		}
		for i, b := range v.Beside {
			if b.Why != "" {
				t.Fatalf("%s: %s", b.Title, b.Why)
			}
			above, sum := 0, 0.0
			for _, row := range v.Order {
				if row.Score > b.Score {
					above++
				}
				if row.Plant == "" && row.Site != NoSite {
					t.Error("an alternative took a place")
				}
			}
			for _, part := range b.Parts {
				sum += part.Share
			}
			if b.Place != above+1 || math.Abs(sum-b.Score) > 1e-12 || b.ScoreLow > b.Score || b.ScoreHigh < b.Score {
				t.Errorf("voice %s, %s: %+v, %d stand above", v.Voice, b.Title, b, above)
			}
			if live[i].Place != b.Place || math.Abs(live[i].Score-b.Score) > 1e-12 {
				t.Errorf("voice %s, %s: the board says %+v, the order %+v", v.Voice, b.Title, live[i], b)
			}
		}
	}

	// Saving: what the middle candidate delivers; its return follows from loss and rebound, by hand.
	saving := r.Alternatives[0]
	c, _, _ := r.equalled(snap)
	want, _ := c.Consequence("delivered_mwh_per_yr")
	more := 0
	all := 0
	for i := range r.Candidates {
		if q, ok := r.Candidates[i].Consequence("delivered_mwh_per_yr"); ok && q.State == scoring.Number && r.Candidates[i].Status == Fitted {
			all++
			if q.Central > want.Central {
				more++
			}
		}
	}
	if more != all/2 {
		t.Errorf("%d of %d candidates give more than the middle one", more, all)
	}
	if q := saving.Consequence("delivered_mwh_per_yr"); q.Central != want.Central {
		t.Errorf("delivered %v, want %v", q.Central, want.Central)
	}
	// 3.6 GJ for every MWh that a plant would deliver; (1 - 0.05)/(1 - 0.2) MWh are saved for it at 300 MJ each.
	if q := saving.Consequence("eroi_extended"); math.Abs(q.Central-3600/(300*0.95/0.8)) > 1e-9 || q.Range != scoring.Corners || !(q.Low < q.Central && q.Central < q.High) {
		t.Errorf("return on a saving %+v", q)
	}
	if q := saving.Consequence("ghg_g_per_kwh"); math.Abs(q.Central-10*0.95/0.8) > 1e-9 {
		t.Errorf("greenhouse gas of a saving %+v", q)
	}
	if q := saving.Consequence("habitat_ha"); q.State != scoring.None {
		t.Errorf("a saving touches %+v", q)
	}

	// Sealed ground: five rectangles by hand, length by twice the half width, times their usable shares (0.5 where the
	// layer says none), at 1 MW a hectare.
	usable := 0.6*(128*44)/1e4 + 0.6*(104*36)/1e4 + 0.5*(70*28)/1e4 + 0.5*(100*50)/1e4 + 0.7*(140*120)/1e4
	sealed := r.Alternatives[1]
	q := sealed.Consequence("rated_kw")
	if math.Abs(q.Central/(usable*1000)-1) > 0.005 {
		t.Errorf("panels of %v kW on sealed ground, by hand %v", q.Central, usable*1000)
	}
	energy := sealed.Consequence("energy_p50_mwh_per_yr")
	sun := r.middle("specific_yield_kwh_per_kw", "solar")
	perKW, _ := sun.Consequence("specific_yield_kwh_per_kw")
	if math.Abs(energy.Central/(q.Central*perKW.Central/1000)-1) > 1e-9 {
		t.Errorf("energy %v", energy.Central)
	}
	for key, state := range map[string]scoring.State{"footprint_direct_ha": scoring.None, "soil_carbon_loss_tc": scoring.None, "eroi_extended": scoring.Number, "ghg_g_per_kwh": scoring.Number, "glare_min_per_yr": scoring.NotAssessed, "connection_spare_kw": scoring.NotAssessed} {
		if q := sealed.Consequence(key); q.State != state {
			t.Errorf("%s of sealed ground: %+v", key, q)
		}
	}
}

// More saving spares no less, all of it spares everything, and what is built is never less than what is needed.
func TestSparePlan(t *testing.T) {
	s := smallStudy(t, 20)
	r, a := accountsOf(t, s)
	order, err := r.Ordered(&r.Voices[0])
	if err != nil {
		t.Fatal(err)
	}
	p, err := a.SparePlan(r, order)
	if err != nil {
		t.Fatal(err)
	}
	if p.Basis != "target" || p.WantedMWh != 45000 || len(p.Sites) < 2 {
		t.Fatalf("%+v", p)
	}
	sites := map[string]bool{}
	sum := 0.0
	for _, one := range p.Sites {
		site, _, _ := strings.Cut(one.ID, "/")
		if sites[site] {
			t.Errorf("site %s is built twice", site)
		}
		sites[site] = true
		sum += one.DeliveredMWhPerYr
	}
	if sum < p.WantedMWh || sum-p.Sites[len(p.Sites)-1].DeliveredMWhPerYr >= p.WantedMWh {
		t.Errorf("%d sites give %v", len(p.Sites), sum)
	}
	before := 0
	for share := 0.0; share <= 1; share += 0.125 {
		spared, equal, err := p.At(share)
		if err != nil {
			t.Fatal(err)
		}
		if len(spared.Sites) < before || spared.StillBuilt+len(spared.Sites) != len(p.Sites) || spared.BuiltMWhPerYr < (1-share)*sum-1e-6 {
			t.Errorf("at %v: %+v", share, spared)
		}
		before = len(spared.Sites)
		// (1 - 0.05)/(1 - 0.2) of what the grid would have taken.
		if share > 0 && math.Abs(equal.Direct.Central.MWhPerYr/(share*sum*0.95/0.8)-1) > 1e-12 {
			t.Errorf("at %v: %+v", share, equal.Direct)
		}
		if equal.Economy.Central.MWhPerYr < equal.Direct.Central.MWhPerYr {
			t.Errorf("at %v the whole economy rebounds less than the same use", share)
		}
	}
	if before != len(p.Sites) {
		t.Errorf("saving all spares %d of %d", before, len(p.Sites))
	}
	setAll(t, s, "energy.target_mwh_per_yr", "")
	r, a = accountsOf(t, s)
	if p, err = a.SparePlan(r, order); err != nil || p.Basis != "demand" {
		t.Errorf("without a target: %+v, %v", p, err)
	}
}
