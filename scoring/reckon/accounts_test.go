package reckon_test

import (
	"encoding/csv"
	"math"
	"math/rand/v2"
	"os"
	"slices"
	"sync"
	"testing"

	"groundtally/assets/citedtable"
	"groundtally/scoring"
	"groundtally/scoring/climate"
	"groundtally/scoring/energy"
	"groundtally/scoring/grid"
	"groundtally/scoring/land"
	"groundtally/scoring/params"
	"groundtally/scoring/reckon"
	"groundtally/scoring/wind"
)

// accounts is the graph of energy, land and climate over the shipped factors, with the connection's
// quantities that the energy account stands on. Facts and settings are made up for each candidate.
type accounts struct {
	g       *reckon.Graph
	factors map[string]params.Factor
	central []scoring.Value
	drawn   []reckon.Drawn
	want    []int // keys of the three accounts that the graph gives
}

func newAccounts(t testing.TB, trials int) *accounts {
	t.Helper()
	a := &accounts{factors: map[string]params.Factor{}}
	shipped := os.DirFS("../../assets/params")
	add := func(f params.Factor) {
		if _, dup := a.factors[f.ID]; dup {
			t.Fatalf("factor %q stands twice", f.ID)
		}
		a.factors[f.ID] = f
	}
	tab, err := params.OpenTable(shipped, ".", "inventory", "")
	if err != nil {
		t.Fatal(err)
	}
	inv, err := params.ParseInventory(tab)
	if err != nil {
		t.Fatal(err)
	}
	for _, it := range inv.Items {
		add(it.Energy)
		add(it.Climate)
	}
	for _, family := range []string{"land_defaults", "ghg_factors", "grid_defaults", "reckoning_defaults"} {
		tab, err := params.OpenTable(shipped, ".", family, "")
		if err != nil {
			t.Fatal(err)
		}
		e, err := params.ParseEdition(tab)
		if err != nil {
			t.Fatal(err)
		}
		for _, f := range e.Factors {
			if f.ID != "connection_loss_frac" {
				add(f)
			}
		}
	}
	if tab, err = citedtable.ParseFS(shipped, "wind_defaults.csv"); err != nil {
		t.Fatal(err)
	}
	defaults, err := wind.ParseDefaults(tab)
	if err != nil {
		t.Fatal(err)
	}
	for _, id := range []string{"crane_pad_m2", "foundation_m2", "laydown_m2", "compound_m2", "track_width_m"} {
		d, err := defaults.Get(id)
		if err != nil {
			t.Fatal(err)
		}
		f := params.Factor{ID: id, Low: d.Low, Central: d.Central, High: d.High, Dist: params.Triangular, Group: "wind_" + id}
		if f.Low == f.High {
			f.Dist = params.Fixed
		}
		add(f)
	}
	if tab, err = params.OpenTable(shipped, ".", "soil", ""); err != nil {
		t.Fatal(err)
	}
	soil, err := land.ParseSoil(tab)
	if err != nil {
		t.Fatal(err)
	}
	use, err := soil.Lookup("land_use", "2019", "cool_temperate_moist", "cropland")
	if err != nil {
		t.Fatal(err)
	}
	add(params.Factor{ID: "cropland_use_factor", Low: use.Value, Central: use.Value, High: use.Value, Dist: params.Fixed})

	qs := slices.Concat(energy.Quantities(), land.Quantities(), climate.Quantities(), grid.Quantities())
	given := map[string]bool{}
	for _, q := range qs {
		given[q.Name] = true
	}
	var leaves []scoring.Leaf
	seen := map[string]bool{}
	for _, q := range qs {
		for _, in := range q.Inputs {
			if given[in] || seen[in] {
				continue
			}
			seen[in] = true
			kind := scoring.FactLeaf
			if _, is := a.factors[in]; is {
				kind = scoring.FactorLeaf
			}
			leaves = append(leaves, scoring.Leaf{Name: in, Kind: kind})
		}
	}
	if a.g, err = reckon.New(leaves, qs); err != nil {
		t.Fatal(err)
	}
	a.central = make([]scoring.Value, a.g.Size())
	groups := map[string][]float64{}
	for slot, l := range leaves {
		f, is := a.factors[l.Name]
		if !is {
			continue
		}
		a.central[slot] = scoring.Num(f.Central)
		if f.Dist == params.Fixed || f.Low == f.High || l.Name == "human_power_w" {
			continue
		}
		group := f.Group
		if group == "" {
			group = f.ID
		}
		if groups[group] == nil {
			u := make([]float64, trials)
			for i := range u {
				u[i] = params.Draw(2026, group, i)
			}
			groups[group] = u
		}
		d := reckon.Drawn{Slot: slot, Values: make([]float64, trials), Shared: true}
		for i, u := range groups[group] {
			d.Values[i] = f.Quantile(u)
		}
		a.drawn = append(a.drawn, d)
	}
	for _, key := range accountKeys(t) {
		if slot, ok := a.g.Slot(key); ok {
			a.want = append(a.want, slot)
		}
	}
	return a
}

// accountKeys gives the consequence keys of the three accounts.
func accountKeys(t testing.TB) []string {
	f, err := os.Open("../../assets/words/keys.csv")
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	r := csv.NewReader(f)
	r.Comment = '#'
	rows, err := r.ReadAll()
	if err != nil {
		t.Fatal(err)
	}
	key, account := slices.Index(rows[0], "key"), slices.Index(rows[0], "account")
	var out []string
	for _, row := range rows[1:] {
		if slices.Contains([]string{"energy", "land", "climate"}, row[account]) {
			out = append(out, row[key])
		}
	}
	return out
}

// facts gives candidate i: wind, solar or both, one in four on peat, one in five cut off by the grid.
func facts(i int) map[string]scoring.Value {
	r := rand.New(rand.NewPCG(7, uint64(i)))
	num := scoring.Num
	n := float64(1 + r.IntN(6))
	windKW, solarKW := 4000*n, 1000+9000*r.Float64()
	switch i % 3 {
	case 0:
		solarKW = 0
	case 1:
		n, windKW = 0, 0
	}
	fence := solarKW / 870
	m := map[string]scoring.Value{
		"wind_kw": num(windKW), "solar_kw": num(solarKW), "solar_ac_kw": num(solarKW / 1.2), "ac_kw": num(windKW + solarKW/1.2),
		"tracking_kw": num(0), "vertical_kw": num(0), "elevated_kw": num(0), "turbines": num(n), "fence_ha": num(fence),
		"plant_ground_ha": num(fence + 20*n), "fence_grass_ha": num(fence * 0.3), "fence_arable_ha": num(fence * 0.7),
		"wind_p50_mwh": num(windKW * (2 + r.Float64())), "solar_p50_mwh": num(solarKW * (0.9 + 0.3*r.Float64())),
		"wind_yield_sigma": num(0.11), "solar_yield_sigma": num(0.06), "wind_yield_error": num(1), "solar_yield_error": num(1),
		"track_counted_km": num(0.2 + 0.4*n), "farmland_lost_ha": num(fence * 0.7), "soil_stock_tc_per_ha": num(50 + 40*r.Float64()), "soil_by_class": num(0),
		"peat_share": num(0), "peat_depth_m": num(0), "forest_ha": num(r.Float64()),
		"connection_route_km": num(1 + 9*r.Float64()), "connection_route_loss_frac": num(0.005 + 0.03*r.Float64()), "connection_route_rise_frac": num(0.01),
		"connection_spare_kw": num(5000 + 20000*r.Float64()), "curtailed_share": num(0), "circuits_lv": num(0), "circuits_mv": num(1), "circuits_hv": num(0),
		"transformer_kva": num((windKW + solarKW) * 1.1), "switchgear_count": num(1),
		"grid_factor_g_per_kwh": num(300), "displacement_share": num(0.8), "grid_decline_per_yr": num(0.04), "household_mwh_per_yr": num(3),
		"agreed_limit_kw": num(math.MaxFloat64), "demand_mwh_per_yr": num(20000), "used_at_once_share": num(0.6 + 0.3*r.Float64()), "unsold_share": num(0.2),
	}
	if i%4 == 0 {
		m["peat_share"], m["peat_depth_m"] = num(0.3), num(0.5+2*r.Float64())
	}
	if i%5 == 0 {
		m["curtailed_share"] = num(0.05)
	}
	if i%7 == 0 {
		m["soil_stock_tc_per_ha"] = scoring.UnknownBecause("no_layer:soil")
	}
	return m
}

// candidate gives the value vector of candidate i with its quantities still to be filled.
func (a *accounts) candidate(t testing.TB, i int) []scoring.Value {
	v := slices.Clone(a.central)
	f := facts(i)
	for slot, l := range a.g.Leaves() {
		if l.Kind != scoring.FactLeaf {
			continue
		}
		x, ok := f[l.Name]
		if !ok {
			x = scoring.UnknownBecause("not_in_this_test")
			if i == 0 {
				t.Logf("no made-up value for %q: unknown", l.Name)
			}
		}
		v[slot] = x
	}
	return v
}

// siteDrawn adds the errors of the site's yield to the factors that all candidates share.
func (a *accounts) siteDrawn(i int) []reckon.Drawn {
	out := slices.Clone(a.drawn)
	r := rand.New(rand.NewPCG(11, uint64(i)))
	for _, leaf := range []string{"wind_yield_error", "solar_yield_error"} {
		slot, _ := a.g.Slot(leaf)
		x := make([]float64, len(a.drawn[0].Values))
		for k := range x {
			x[k] = math.Max(0, 1+float64(0.08*r.NormFloat64()))
		}
		out = append(out, reckon.Drawn{Slot: slot, Values: x})
	}
	return out
}

// twoCores runs work for every i on two goroutines.
func twoCores(n int, work func(i int)) {
	var wg sync.WaitGroup
	for half := range 2 {
		wg.Go(func() {
			for i := half; i < n; i += 2 {
				work(i)
			}
		})
	}
	wg.Wait()
}

func BenchmarkAccounts10000(b *testing.B) {
	a := newAccounts(b, 1)
	in := make([][]scoring.Value, 10000)
	for i := range in {
		in[i] = a.candidate(b, i)
	}
	b.ReportMetric(float64(a.g.Size()-len(a.g.Leaves())), "quantities")
	for b.Loop() {
		twoCores(len(in), func(i int) { a.g.Central(in[i]) })
	}
}

// BenchmarkTrials takes 4,000 trials of 1,000 candidates, with the spread of every key of the three accounts.
func BenchmarkTrials(b *testing.B) {
	a := newAccounts(b, 4000)
	in := make([][]scoring.Value, 1000)
	own := make([][]reckon.Drawn, len(in))
	for i := range in {
		in[i] = a.candidate(b, i)
		a.g.Central(in[i])
		own[i] = a.siteDrawn(i)
	}
	b.ReportMetric(float64(len(a.want)), "keys")
	b.ReportAllocs()
	for b.Loop() {
		twoCores(len(in), func(i int) {
			if _, err := a.g.Trials(in[i], own[i], a.want); err != nil {
				b.Error(err)
			}
		})
	}
}

// spoilt puts states in place of some of a candidate's facts.
func (a *accounts) spoilt(v []scoring.Value, r *rand.Rand) {
	for slot, l := range a.g.Leaves() {
		if l.Kind != scoring.FactLeaf || r.Float64() > 0.06 {
			continue
		}
		v[slot] = []scoring.Value{scoring.UnknownBecause("no_layer"), scoring.NotSetKey("a.setting"), scoring.NoneBecause("no rotor"), scoring.NeverValue(), {}, scoring.Num(-1)}[r.IntN(6)]
	}
}

// Reckoning quantity by quantity over a block of trials gives each trial the very numbers and states that the
// graph gives for it alone, whatever stands in the facts.
func TestTrialsAreTheGraphTrialByTrial(t *testing.T) {
	const trials = 300 // more than a block
	a := newAccounts(t, trials)
	all := make([]int, a.g.Size())
	for s := range all {
		all[s] = s
	}
	r := rand.New(rand.NewPCG(71, 72))
	states := map[scoring.State]int{}
	for i := range 120 {
		v := a.candidate(t, i)
		if i > 20 {
			a.spoilt(v, r)
		}
		a.g.Central(v)
		before := slices.Clone(v)
		drawn := a.siteDrawn(i)
		if i%2 == 0 { // values that turn a number into a state in some trials
			for _, d := range drawn[len(drawn)-2:] {
				d.Values[r.IntN(trials)] = 0
				d.Values[r.IntN(trials)] = 1e308
			}
		}
		got := a.g.Samples(v, drawn, all, trials)
		spreads, err := a.g.Trials(v, drawn, all)
		if err != nil {
			t.Fatal(err)
		}
		if !slices.Equal(v, before) {
			t.Fatal("the central vector was changed")
		}
		samples := make([][]float64, len(all))
		nevers := make([]int, len(all))
		for k := range trials {
			one := slices.Clone(before)
			for _, d := range drawn {
				one[d.Slot] = scoring.Value{X: d.Values[k]}
			}
			a.g.Central(one)
			for s, want := range one {
				if x := got[k][s]; x.State != want.State || x.Why != want.Why || math.Float64bits(x.X) != math.Float64bits(want.X) {
					name := "leaf"
					if s >= len(a.g.Leaves()) {
						name = a.name(s)
					}
					t.Fatalf("candidate %d, trial %d, %s: %+v, alone %+v", i, k, name, x, want)
				}
				states[want.State]++
				switch want.State {
				case scoring.Number:
					samples[s] = append(samples[s], want.X)
				case scoring.Never:
					nevers[s]++
				}
			}
		}
		for s, sp := range spreads {
			if !sp.Moves {
				continue
			}
			want := reckon.Spread{Moves: true, Numbers: len(samples[s]), Nevers: nevers[s]}
			if want.Numbers > 0 {
				slices.Sort(samples[s])
				want.Low, want.Median, want.High = position(samples[s], 0.1), position(samples[s], 0.5), position(samples[s], 0.9)
			}
			if sp != want {
				t.Fatalf("candidate %d, slot %d: %+v, want %+v", i, s, sp, want)
			}
		}
	}
	for _, s := range []scoring.State{scoring.Number, scoring.Unknown, scoring.NotSet, scoring.None, scoring.Never} {
		if states[s] == 0 {
			t.Errorf("no value was %v", s)
		}
	}
}

// position is the value at (n-1)p of a sorted sample.
func position(sorted []float64, p float64) float64 {
	at := float64(len(sorted)-1) * p
	i := int(at)
	if i+1 == len(sorted) {
		return sorted[i]
	}
	return sorted[i] + float64((at-float64(i))*(sorted[i+1]-sorted[i]))
}

func (a *accounts) name(slot int) string {
	for _, q := range slices.Concat(energy.Quantities(), land.Quantities(), climate.Quantities(), grid.Quantities()) {
		if s, ok := a.g.Slot(q.Name); ok && s == slot {
			return q.Name
		}
	}
	return ""
}

// The spread of a large sample is that of the sorted sample, whatever its shape.
func TestSpreadOfLargeSamples(t *testing.T) {
	g, err := reckon.New([]scoring.Leaf{{Name: "a"}}, []scoring.Quantity{{Name: "b", Unit: "1", Formula: "a", Source: "identity", Inputs: []string{"a"},
		Eval: scoring.Plain(func(x []float64) float64 { return x[0] })}})
	if err != nil {
		t.Fatal(err)
	}
	r := rand.New(rand.NewPCG(81, 82))
	for name, f := range map[string]func(i int) float64{
		"even":     func(int) float64 { return r.Float64() },
		"normal":   func(int) float64 { return 1e-300 * r.NormFloat64() },
		"skewed":   func(int) float64 { return math.Exp(4 * r.NormFloat64()) },
		"heavy":    func(int) float64 { return 1 / (r.Float64() * r.Float64()) },
		"ties":     func(int) float64 { return float64(r.IntN(5)) },
		"two":      func(i int) float64 { return float64(i % 2) },
		"same":     func(int) float64 { return 7 },
		"rising":   func(i int) float64 { return float64(i) },
		"huge":     func(int) float64 { return 1.7e308 * (2*r.Float64() - 1) },
		"tiny":     func(int) float64 { return 5e-324 * float64(r.IntN(9)) },
		"outliers": func(i int) float64 { return r.Float64() + float64(i%100/99)*1e12 },
	} {
		for _, n := range []int{1, 2, 255, 256, 257, 1023, 1024, 4000, 10001} {
			x := make([]float64, n)
			for i := range x {
				x[i] = f(i)
			}
			s, err := g.Trials([]scoring.Value{{}, {}}, []reckon.Drawn{{Slot: 0, Values: x}}, []int{1, 0, 1})
			if err != nil {
				t.Fatal(err)
			}
			sorted := slices.Clone(x)
			slices.Sort(sorted)
			want := reckon.Spread{Moves: true, Numbers: n, Low: position(sorted, 0.1), Median: position(sorted, 0.5), High: position(sorted, 0.9)}
			if s[0] != want || s[1] != want || s[2] != want {
				t.Errorf("%s, %d: %+v, want %+v", name, n, s, want)
			}
		}
	}
}
