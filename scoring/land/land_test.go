package land

import (
	"errors"
	"math"
	"math/rand/v2"
	"os"
	"strings"
	"testing"

	"groundtally/assets/citedtable"
	"groundtally/scoring/units"
)

func soilTable(t testing.TB) *SoilTable {
	t.Helper()
	tab, err := citedtable.ParseFS(os.DirFS("../../assets/params"), "soil_2026_01.csv")
	if err != nil {
		t.Fatal(err)
	}
	s, err := ParseSoil(tab)
	if err != nil {
		t.Fatal(err)
	}
	return s
}

func must(t testing.TB) func(float64, error) float64 {
	return func(v float64, err error) float64 {
		t.Helper()
		if err != nil {
			t.Fatal(err)
		}
		return v
	}
}

func TestCheckTable(t *testing.T) {
	tab, err := citedtable.ParseFS(os.DirFS("../../testdata/check"), "land.csv")
	if err != nil {
		t.Fatal(err)
	}
	checks, err := tab.Checks()
	if err != nil {
		t.Fatal(err)
	}
	soil := soilTable(t)
	for _, c := range checks {
		t.Run(c.ID+"_"+c.Quantity, func(t *testing.T) {
			ok, in := must(t), c.In
			var got float64
			switch c.Quantity {
			case "peat_stock":
				got = ok(PeatStockTCPerHa(in["depth"], in["cv"]))
			case "mwh_per_acre":
				got = in["v"] / units.MWhPerGWh / units.HaPerAcre
			case "heat_gj_per_ha":
				got = ok(HeatGJPerHaYr(in["w"]))
			case "kcal_per_g":
				got = ok(FoodEnergyMJPerKg(in["v"] * 100))
			case "carbon_of_fuel_mj_per_kg":
				got = units.GPerKg / in["g_per_mj"]
			case "carbon_floor_mj_per_kg":
				got = in["kj_per_mol"] / in["g_per_mol"] // kJ/g is MJ/kg
			case "co2_to_carbon":
				got = in["t"] / units.CO2PerC
			case "soc":
				got = ok(SOCTCPerHa(in["ref"], in["lu"], in["mg"], in["in"]))
			case "soc_table":
				ref, err := soil.Lookup("reference", c.Text["method"][1:], c.Text["climate"], c.Text["soil"])
				if err != nil {
					t.Fatal(err)
				}
				lu, err := soil.Lookup("land_use", c.Text["method"][1:], c.Text["climate"], c.Text["use"])
				if err != nil {
					t.Fatal(err)
				}
				got = ok(SOCTCPerHa(ref.Value, lu.Value, 1, 1))
			case "disturbance_loss":
				ch, err := DisturbanceChange(in["area"], in["stock"], in["f"])
				if err != nil {
					t.Fatal(err)
				}
				got = ch.LossTC
			case "grass_gain":
				got = ok(GrassGainTC(1, in["ref"], in["lu"], in["m"], in["T"], 20))
			case "relaxed":
				got = ok(Relaxed(in["r"], in["n"]))
			case "bog_co2":
				got = ok(BogCO2TPerHaYr(in["w"], in["t"]))
			case "fen_co2":
				got = ok(FenCO2TPerHaYr(in["w"], in["t"]))
			case "bog_ch4":
				v, clamped, err := BogCH4TCO2ePerHaYr(in["w"], in["t"])
				if err != nil {
					t.Fatal(err)
				}
				if clamped != (c.Expected == 0) {
					t.Errorf("clamped %v", clamped)
				}
				got = v
			case "peat_pit_co2":
				got = ok(ExcavatedPeatTC(in["volume"], in["cv"], 1)) * units.CO2PerC
			case "forest_carbon":
				got = ok(ForestCarbonTC(1, in["b"], in["r"], in["cf"]))
			case "forest_co2":
				got = Change{LossTC: ok(ForestCarbonTC(1, in["b"], in["r"], in["cf"]))}.CO2T()
			case "food_energy":
				got = ok(FoodEnergyMJPerKg(in["kcal"]))
			case "crop_energy":
				got = ok(CropEnergyGJPerYr(in["area"], in["co"], in["y"], in["e"]))
			case "crop_energy_life_tj":
				got = ok(CropEnergyGJPerYr(in["area"], in["co"], in["y"], in["e"])) * in["T"] * units.MJPerGJ / units.MJPerTJ
			case "soil_energy_tj":
				got = ok(CarbonEnergyMJ(in["tc"], in["ec"])) / units.MJPerTJ
			case "peat_total":
				l, err := Peat{DepthM: in["depth"], CarbonKgPerM3: in["cv"], ExcavatedHa: in["dug_ha"], ExcavatedDepthM: in["depth"], OxidisedFrac: 1,
					DrainedHa: in["drained_ha"], DrainDepthM: in["depth"], EmissionTCPerHaYr: in["ef"], DrainYears: in["T"]}.Loss()
				if err != nil {
					t.Fatal(err)
				}
				got = l.TotalTC
			default:
				t.Fatalf("unknown quantity %q", c.Quantity)
			}
			if !c.OK(got) {
				t.Errorf("got %v, want %v within %v (%s)", got, c.Expected, c.Tolerance, c.Source)
			}
		})
	}
}

func TestCarbonLostNeverExceedsTheStock(t *testing.T) {
	r := rand.New(rand.NewPCG(3, 4))
	for range 2000 {
		p := Peat{DepthM: r.Float64() * 3, CarbonKgPerM3: 30 + r.Float64()*60, ExcavatedHa: r.Float64() * 5, ExcavatedDepthM: r.Float64() * 5,
			OxidisedFrac: r.Float64(), DrainedHa: r.Float64() * 20, DrainDepthM: r.Float64() * 3, EmissionTCPerHaYr: r.Float64() * 30, DrainYears: r.Float64() * 100}
		l, err := p.Loss()
		if err != nil {
			t.Fatal(err)
		}
		perHa, err := PeatStockTCPerHa(p.DepthM, p.CarbonKgPerM3)
		if err != nil {
			t.Fatal(err)
		}
		const slack = 1 + 1e-12
		if l.DirectTC > l.ExcavatedStockTC*slack || l.DrainedTC > l.DrainableTC*slack || l.TotalTC > (p.ExcavatedHa+p.DrainedHa)*perHa*slack {
			t.Fatalf("%+v lost %+v", p, l)
		}
		area, stock, f := r.Float64()*10, r.Float64()*200, r.Float64()*2-1
		c, err := DisturbanceChange(area, stock, f)
		if err != nil {
			t.Fatal(err)
		}
		if c.LossTC > area*stock || (c.LossTC > 0 && c.GainTC > 0) {
			t.Fatalf("area %v, stock %v, share %v: %+v", area, stock, f, c)
		}
		u, err := UseChange(area, stock, r.Float64()*200, r.Float64()*60, 20)
		if err != nil {
			t.Fatal(err)
		}
		if u.LossTC > area*stock {
			t.Fatalf("use change lost %v of %v", u.LossTC, area*stock)
		}
	}
}

func TestPeatCapIsTold(t *testing.T) {
	l, err := Peat{DepthM: .5, CarbonKgPerM3: 53, DrainedHa: 1, DrainDepthM: 2, EmissionTCPerHaYr: 7.9, DrainYears: 100}.Loss()
	if err != nil || !l.DrainedCapped || math.Abs(l.DrainedTC-265) > 1e-9 {
		t.Errorf("got %+v, %v", l, err)
	}
	l, err = Peat{DepthM: .5, CarbonKgPerM3: 53, ExcavatedHa: 1, ExcavatedDepthM: 2, OxidisedFrac: 1}.Loss()
	if err != nil || !l.ExcavationCutShort || math.Abs(l.DirectTC-265) > 1e-9 {
		t.Errorf("got %+v, %v", l, err)
	}
}

// Peat split into two pieces loses the same carbon as the whole.
func TestPeatSplits(t *testing.T) {
	whole := Peat{DepthM: 1, CarbonKgPerM3: 53, ExcavatedHa: 4, ExcavatedDepthM: 1, OxidisedFrac: .8, DrainedHa: 6, DrainDepthM: .5, EmissionTCPerHaYr: 5.3, DrainYears: 90}
	half := whole
	half.ExcavatedHa, half.DrainedHa = 2, 3
	w, err1 := whole.Loss()
	h, err2 := half.Loss()
	if err1 != nil || err2 != nil || math.Abs(w.TotalTC-2*h.TotalTC) > 1e-9 {
		t.Errorf("whole %v, halves %v, %v %v", w.TotalTC, 2*h.TotalTC, err1, err2)
	}
}

func TestDrainedArea(t *testing.T) {
	got := must(t)(DrainedAreaHa(1000, []float64{80}, 10))
	if want := (2*1000*10 + 80*10 + math.Pi*100) / units.M2PerHa; math.Abs(got-want) > 1e-12 {
		t.Errorf("got %v, want %v", got, want)
	}
}

func TestGainsAndLossesStandApart(t *testing.T) {
	gain, err := UseChange(2, 50, 80, 10, 20)
	if err != nil || gain.LossTC != 0 || math.Abs(gain.GainTC-30) > 1e-12 {
		t.Fatalf("got %+v, %v", gain, err)
	}
	sum := gain.Add(Change{LossTC: 5})
	if sum.LossTC != 5 || sum.GainTC != gain.GainTC || sum.CO2T() != 5*units.CO2PerC {
		t.Errorf("netted: %+v", sum)
	}
}

func TestUses(t *testing.T) {
	uses := []Use{{AreaHa: 2, Years: 30, Quality: .5}, {AreaHa: 4, Years: 1, Quality: 1, CoUse: .75}}
	if got := must(t)(OccupationHaYr(uses)); got != 64 {
		t.Errorf("occupation %v, want 64", got)
	}
	if got := must(t)(QualityHectares(uses)); got != 2 {
		t.Errorf("quality hectares %v, want 2", got)
	}
}

func TestRegrowth(t *testing.T) {
	if r, err := RegrowthYears(100, 2, .25); err != nil || r.Never || r.Yr != 200 {
		t.Errorf("got %+v, %v", r, err)
	}
	if r, err := RegrowthYears(100, 2, 0); err != nil || !r.Never {
		t.Errorf("no growth: %+v, %v", r, err)
	}
	if r, err := RegrowthYears(0, 2, 0); err != nil || r.Never || r.Yr != 0 {
		t.Errorf("no loss: %+v, %v", r, err)
	}
}

func TestSoilTableHasNoSilentGap(t *testing.T) {
	s := soilTable(t)
	if _, err := s.Lookup("reference", "2019", "boreal", "lac"); !errors.Is(err, ErrNoSoilValue) {
		t.Errorf("a pair that the guidelines leave empty gave %v", err)
	}
	for _, m := range []string{"2006", "2019"} {
		for _, c := range []string{"boreal", "cool_temperate_dry", "cool_temperate_moist", "warm_temperate_dry", "warm_temperate_moist", "tropical_dry", "tropical_moist", "tropical_wet", "tropical_montane"} {
			for _, cl := range []string{"hac", "sandy", "volcanic", "wetland"} {
				if v, err := s.Lookup("reference", m, c, cl); err != nil || v.Value <= 0 {
					t.Errorf("%s %s %s: %+v, %v", m, c, cl, v, err)
				}
			}
		}
	}
}

func TestNoNaNLeaves(t *testing.T) {
	for name, f := range map[string]func(v float64) error{
		"ForestCarbonTC":    func(v float64) error { _, err := ForestCarbonTC(1, v, .24, .47); return err },
		"CropEnergy":        func(v float64) error { _, err := CropEnergyGJPerYr(v, 0, 8, 14); return err },
		"SOC":               func(v float64) error { _, err := SOCTCPerHa(v, 1, 1, 1); return err },
		"UseChange":         func(v float64) error { _, err := UseChange(1, v, 1, 1, 20); return err },
		"DisturbanceChange": func(v float64) error { _, err := DisturbanceChange(1, 1, v); return err },
		"CarbonEnergy":      func(v float64) error { _, err := CarbonEnergyMJ(1, v); return err },
		"Peat":              func(v float64) error { _, err := Peat{DepthM: v}.Loss(); return err },
		"Peat emission":     func(v float64) error { _, err := Peat{EmissionTCPerHaYr: v}.Loss(); return err },
		"Bog":               func(v float64) error { _, err := BogCO2TPerHaYr(.1, v); return err },
		"Drained":           func(v float64) error { _, err := DrainedAreaHa(1, []float64{v}, 1); return err },
		"Occupation":        func(v float64) error { _, err := OccupationHaYr([]Use{{AreaHa: v}}); return err },
	} {
		for _, v := range []float64{math.NaN(), math.Inf(1), -1000} {
			if err := f(v); !errors.Is(err, ErrInput) {
				t.Errorf("%s(%v): %v", name, v, err)
			}
		}
	}
}

func BenchmarkPeatLoss(b *testing.B) {
	p := Peat{DepthM: 1, CarbonKgPerM3: 53, ExcavatedHa: 4, ExcavatedDepthM: 1, OxidisedFrac: .8, DrainedHa: 6, DrainDepthM: .5, EmissionTCPerHaYr: 5.3, DrainYears: 90}
	for b.Loop() {
		if _, err := p.Loss(); err != nil {
			b.Fatal(err)
		}
	}
}

func TestForest(t *testing.T) {
	ok := must(t)
	if got := ok(LostSinkTC(2, 1.5, 30)); got != 90 {
		t.Errorf("lost sink %v, want 90", got)
	}
	// 120 t/ha with roots at 18 GJ/t.
	if got, want := ok(ForestHeatMJ(1, 120, .24, 18)), 120*1.24*18*units.MJPerGJ; math.Abs(got-want) > 1e-9*want {
		t.Errorf("heat %v, want %v", got, want)
	}
}

func TestSoilTableRefusals(t *testing.T) {
	const head = "kind,method,climate,class,value,rel_error,source,provenance\n"
	for name, body := range map[string]string{
		"kind":     "colour,2019,boreal,hac,1,0,book,read\n",
		"negative": "reference,2019,boreal,hac,-1,0,book,read\n",
		"twice":    "input,2019,boreal,medium,1,0,book,read\ninput,2019,boreal,medium,1,0,book,read\n",
		"number":   "input,2019,boreal,medium,much,0,book,read\n",
	} {
		tab, err := citedtable.Parse("soil", strings.NewReader(head+body))
		if err != nil {
			t.Fatal(err)
		}
		if _, err := ParseSoil(tab); err == nil {
			t.Errorf("%s: accepted", name)
		}
	}
}
