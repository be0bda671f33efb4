package methods

import (
	"math"
	"regexp"
	"slices"
	"strings"
	"testing"
	"testing/fstest"

	"groundtally/app/draw"
	"groundtally/app/program"
	"groundtally/app/run"
	"groundtally/app/study"
	"groundtally/app/study/studytest"
	"groundtally/scoring"
)

func shipped(t *testing.T) *program.Parts {
	t.Helper()
	parts, err := program.Load()
	if err != nil {
		t.Fatal(err)
	}
	return parts
}

const head = "topic,account,disputed,here,source,provenance\n"

func TestDisputesAreStrict(t *testing.T) {
	read := func(text string) ([]Dispute, error) {
		return Disputes(fstest.MapFS{disputesFile: {Data: []byte(text)}})
	}
	got, err := read("# note\n" + head + "A,energy,b,see energy.horizon_yr,book,read\nB,climate,b,c,book,common practice\n")
	if err != nil || len(got) != 2 || got[0] != (Dispute{"A", scoring.Energy, "b", "see energy.horizon_yr", "book", "read"}) || len(Of(got, scoring.Climate)) != 1 {
		t.Fatalf("%+v, %v", got, err)
	}
	for text, want := range map[string]string{
		head + "A,energy,b,c,book,read\nA,land,b,c,book,read\n":                          "line 3",
		head + "A,energy,,c,book,read\n":                                                 "line 2: the cell of disputed is empty",
		head + "A,energy,b, ,book,read\n":                                                "line 2: the cell of here is empty",
		head + "A,energy,b,c,,read\n":                                                    "line 2",
		head + "A,money,b,c,book,read\n":                                                 `line 2: there is no account "money"`,
		head + "A,neighbours,b,c,book,read\n":                                            "line 2",
		head + "A,energy,b,c,book,hearsay\n":                                             "line 2",
		head + "A,energy,b,c,more,book,read\n":                                           "line 2",
		"topic,account,disputed,here,note,source,provenance\nA,energy,b,c,d,book,read\n": "line 1: the columns",
		"topic,account,here,disputed,source,provenance\nA,energy,b,c,book,read\n":        "line 1",
		"topic,account,disputed,source,provenance\nA,energy,b,book,read\n":               "line 1",
	} {
		if _, err := read(text); err == nil || !strings.Contains(err.Error(), want) || !strings.Contains(err.Error(), "disputes.csv") {
			t.Errorf("%q gives %v, want %q", text, err, want)
		}
	}
}

// What ships is complete, in sentences, and names only what there is.
func TestShippedDisputes(t *testing.T) {
	parts := shipped(t)
	list, err := Shipped()
	if err != nil {
		t.Fatal(err)
	}
	if len(list) < 14 || len(list) > 18 {
		t.Errorf("%d disputes", len(list))
	}
	for _, a := range Accounts {
		if len(Of(list, a)) < 3 {
			t.Errorf("%s has %d disputes", a, len(Of(list, a)))
		}
	}
	for _, d := range list {
		for _, text := range []string{d.Disputed, d.Here} {
			if !strings.HasSuffix(text, ".") || strings.Contains(text, "  ") || !draw.HasLetters(text) {
				t.Errorf("%s: %q is no clean sentence, or has letters that the typeface lacks", d.Topic, text)
			}
		}
		if !draw.HasLetters(d.SourceWords()) || !strings.Contains(d.SourceWords(), d.Source) {
			t.Errorf("%s: %q", d.Topic, d.SourceWords())
		}
		names := d.Names()
		if len(names) == 0 {
			t.Errorf("%s names neither setting nor row", d.Topic)
		}
		if nameInText.MatchString(d.Disputed) {
			t.Errorf("%s: what is disputed names a setting", d.Topic)
		}
		for _, n := range names {
			_, row := parts.Params.Factors[n]
			_, known := parts.Params.Graph.Slot(n)
			_, setting := parts.Catalog.Definition(n)
			switch {
			case setting && !strings.Contains(n, "<"):
				if err := run.CheckKey(parts.Catalog, parts.Params, n); err != nil {
					t.Errorf("%s names %s: %v", d.Topic, n, err)
				}
			case !row && !known && !setting:
				t.Errorf("%s names %s, which is no setting, row or consequence", d.Topic, n)
			}
		}
	}
}

// The figures that the table states are those of the tables that ship, where these hold them.
func TestDisputesStateWhatShips(t *testing.T) {
	parts := shipped(t)
	list, err := Shipped()
	if err != nil {
		t.Fatal(err)
	}
	topic := func(name string) Dispute {
		i := slices.IndexFunc(list, func(d Dispute) bool { return d.Topic == name })
		if i < 0 {
			t.Fatalf("no dispute %q", name)
		}
		return list[i]
	}
	row := parts.Params.Factors

	// IPCC 2006 and 2019 in the shipped table of soils: the widest changes.
	low, high, sandy := 0.0, 0.0, 0.0
	for _, climate := range []string{"boreal", "cool_temperate_dry", "cool_temperate_moist", "warm_temperate_dry", "warm_temperate_moist", "tropical_dry", "tropical_moist", "tropical_wet", "tropical_montane"} {
		change := func(class string) float64 {
			was, err := parts.Params.Soil.Lookup("reference", "2006", climate, class)
			if err != nil {
				t.Fatal(err)
			}
			is, err := parts.Params.Soil.Lookup("reference", "2019", climate, class)
			if err != nil {
				t.Fatal(err)
			}
			return 100 * (is.Value/was.Value - 1)
		}
		low, high, sandy = math.Min(low, change("hac")), math.Max(high, change("hac")), math.Min(sandy, change("sandy"))
	}
	if math.Round(low) != -45 || math.Round(high) != 36 || math.Round(sandy) != -71 || !strings.Contains(topic("Reference soil carbon of 2006 or 2019").Disputed, "−45 to +36 %") || !strings.Contains(topic("Reference soil carbon of 2006 or 2019").Disputed, "−71 %") {
		t.Errorf("the reference stocks changed by %.1f to %.1f %%, sandy ones by %.1f", low, high, sandy)
	}
	if f := row["carbon_energy_mj_per_kgc"]; f.Low != 33 || f.High != 42 {
		t.Errorf("33 to 42 MJ: %+v", f)
	}
	// The high ends lie below twice the central value of wind and 1.6 times that of solar.
	if w, s := row["wind_turbine.mj"], row["pv_system_mono.mj"]; !(w.High < w.Central*24/12 && s.High < s.Central*1.6) {
		t.Errorf("the ranges cover what is said to lie beyond them: %+v, %+v", w, s)
	}
	// 5.6 as electricity and 15.9 as primary equivalent: example A of the accounts' methods, E_gen 502.617 TJ over 90.4 TJ.
	if r := 502.617 / 90.4; math.Round(r*10) != 56 || math.Round(r/row["grid_efficiency"].Central*10) != 159 {
		t.Errorf("the example comes to %v and %v", r, r/row["grid_efficiency"].Central)
	}
	if f := row["rebound_frac"]; f.High != 0.3 || row["rebound_economy_frac"].Central <= 0.5 {
		t.Errorf("rebound: %+v, %+v", f, row["rebound_economy_frac"])
	}
	// 40 and 11 g/kWh set the rows of the machines, as these say.
	for name, want := range map[string]string{"pv_system_mono.kgco2e": "10/40/80", "wind_turbine.kgco2e": "7/11/20"} {
		if !strings.Contains(row[name].Source, want) {
			t.Errorf("%s: %q has no %s", name, row[name].Source, want)
		}
	}
	// "the full amount as shipped", "no factor ships".
	for key, want := range map[string]string{"climate.displacement_share": "1", "climate.grid_factor_g_per_kwh": study.NotSetText, "energy.primary_equivalent": "off"} {
		if def, ok := parts.Catalog.Definition(key); !ok || def.Default != want {
			t.Errorf("%s ships as %q, not %q", key, def.Default, want)
		}
	}
	// "a scale that begins where as much is spent as is given".
	if c, ok := parts.Catalog.Criterion("eroi_extended"); !ok || c.Worst.X != 1 {
		t.Errorf("the scale of the return begins at %+v", c)
	}
	// What is said to be no part of the reckoning is none: no storage, no reference stock, no methane of peat.
	g := parts.Params.Graph
	for _, key := range []string{"eroi_extended", "ghg_life_tco2e", "soil_carbon_loss_tc"} {
		for _, slot := range g.Reaches(key) {
			if name := g.Leaves()[slot].Name; regexp.MustCompile(`storage|backup|reserve|labour|soc_ref|ch4|n2o|dissolved|displacement`).MatchString(name) {
				t.Errorf("%s follows %s", key, name)
			}
		}
	}
	// Losses are in what is delivered and not in what is spent; soil gain is in no loss; the efficiency of modules is in no row.
	for key, not := range map[string]string{"input_extended_mj": "connection_route_loss_frac", "eroi_stock": "gain_pv_shade_multiplier", "ghg_life_tco2e": "gain_pv_shade_multiplier", "soil_carbon_loss_tc": "gain_pv_shade_multiplier"} {
		for _, slot := range g.Reaches(key) {
			if g.Leaves()[slot].Name == not {
				t.Errorf("%s follows %s", key, not)
			}
		}
	}
	for key, in := range map[string]string{"delivered_mj_life": "connection_route_loss_frac", "soil_carbon_gain_tc": "gain_pv_shade_multiplier", "soil_carbon_loss_tc": "loss_pv_grassland_frac", "net_share": "grid_efficiency", "net_energy_gwh_life": "grid_efficiency", "energy_payback_yr": "grid_efficiency",
		"eroi_stock": "carbon_energy_mj_per_kgc", "saving_equivalent_mwh_per_yr": "rebound_frac", "eroi_used": "unsold_share", "carbon_payback_yr": "peat_drain_width_m", "ghg_g_per_kwh": "wind_life_yr"} {
		if !slices.ContainsFunc(g.Reaches(key), func(slot int) bool { return g.Leaves()[slot].Name == in }) {
			t.Errorf("%s does not follow %s", key, in)
		}
	}
	if slices.ContainsFunc(g.Reaches("saving_equivalent_mwh_per_yr"), func(slot int) bool { return g.Leaves()[slot].Name == "rebound_economy_frac" }) {
		t.Error("the two rebounds are mixed")
	}
}

func TestInForceFollowsTheStudy(t *testing.T) {
	parts := shipped(t)
	s, err := study.Open(t.Context(), studytest.New(), parts.Catalog, study.Options{})
	if err != nil {
		t.Fatal(err)
	}
	d := Dispute{Here: "With energy.primary_equivalent and grid_efficiency (inventory.grid_efficiency.central), climate.grid_factor_g_per_kwh, plant.<plant>.spacing_along_d, voice.<voice>.both.<family>, eroi_stock and limit.eroi_extended."}
	words := func() string {
		t.Helper()
		snap, err := s.Snapshot()
		if err != nil {
			t.Fatal(err)
		}
		text, err := InForce(parts.Params, snap, d)
		if err != nil {
			t.Fatal(err)
		}
		return text
	}
	if got, want := words(), "energy.primary_equivalent off; grid_efficiency 0.35 (0.3 to 0.45) MJ electric per MJ primary; climate.grid_factor_g_per_kwh not set"; got != want {
		t.Errorf("as shipped %q, want %q", got, want)
	}
	for key, value := range map[string]string{"energy.primary_equivalent": "on", "inventory.grid_efficiency.central": "0.4", "climate.grid_factor_g_per_kwh": "350"} {
		if _, err := s.Set(t.Context(), "set", "test", study.SettingEdit{Key: key, Value: value}); err != nil {
			t.Fatal(err)
		}
	}
	if got, want := words(), "energy.primary_equivalent on; grid_efficiency 0.4 (0.3 to 0.45) MJ electric per MJ primary, your own; climate.grid_factor_g_per_kwh 350 g CO₂e/kWh"; got != want {
		t.Errorf("then %q, want %q", got, want)
	}
	if got := d.HereWords(parts.Params); !strings.Contains(got, "'Energy return with stocks' and limit.eroi_extended.") || !strings.Contains(got, "energy.primary_equivalent") {
		t.Errorf("%q", got)
	}
}

// Every consequence of the three accounts that is reckoned has its formula and source, and every sign in a formula is explained.
func TestFormulasAreExplained(t *testing.T) {
	parts := shipped(t)
	inText := regexp.MustCompile(`'[^']*'`)
	word := regexp.MustCompile(`\pL[\pL\pN]*(?:_[\pL\pN]+)*`)
	sign := regexp.MustCompile(`^\pL(_.*|\pN*)$`)
	for _, a := range Accounts {
		list, measured := Formulas(parts.Params, a)
		var keys []string
		for _, f := range list {
			keys = append(keys, f.Key)
			if f.Title == "" || f.Text == "" || f.Source == "" || !draw.HasLetters(f.Text) {
				t.Errorf("%+v", f)
			}
		}
		for _, k := range measured {
			keys = append(keys, k.Key)
		}
		n := 0
		for _, k := range parts.Params.Keys() {
			if _, ok := parts.Params.Graph.Slot(k.Key); ok && k.Account == a && !k.Derived {
				if n++; !slices.Contains(keys, k.Key) {
					t.Errorf("%s is left out", k.Key)
				}
			}
		}
		if n != len(keys) {
			t.Errorf("%s: %d consequences, %d told", a, n, len(keys))
		}
		explained := map[string]bool{"a": true, "s": true, "W": true, "h": true} // the article, the possessive, watts, hours
		texts := []string{}
		for _, f := range list {
			texts = append(texts, f.Text)
		}
		for _, s := range Signs(parts.Params, list) {
			explained[strings.Fields(s.Sign)[0]] = true
			texts = append(texts, s.Words)
		}
		for _, text := range texts {
			for _, w := range word.FindAllString(inText.ReplaceAllString(text, ""), -1) {
				if sign.MatchString(w) && !explained[w] {
					t.Errorf("%s: %q in %q is not explained", a, w, text)
				}
			}
		}
	}
	energy, _ := Formulas(parts.Params, scoring.Energy)
	i := slices.IndexFunc(energy, func(f Formula) bool { return f.Key == "delivered_mwh_per_yr" })
	if want := "'Yearly energy, even odds' × (1 − 'Share of the energy cut off') × (1 − 'Loss in the connection')"; energy[i].Text != want {
		t.Errorf("%q, want %q", energy[i].Text, want)
	}
	if hasSign("E_del / I", "E") || hasSign("λ_dist", "λ") || !hasSign("E·(1 − z)", "E") || !hasSign("E_first year/η_G", "E_first year") {
		t.Error("signs are taken for others")
	}
}
