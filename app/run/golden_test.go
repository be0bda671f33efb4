package run

import (
	"encoding/csv"
	"flag"
	"fmt"
	"os"
	"strconv"
	"testing"

	"groundtally/scoring"
)

var update = flag.Bool("update", false, "write the golden values of the sample anew")

const goldenFile = "../../testdata/golden/marram.csv"

// goldenKeys are consequences of every account and of every step.
var goldenKeys = []string{"buildable_area_ha", "largest_patch_ha", "rated_kw", "energy_p50_mwh_per_yr", "energy_p90_mwh_per_yr", "delivered_mwh_per_yr", "wake_loss_frac", "performance_ratio_frac",
	"eroi_generation", "eroi_delivered", "eroi_extended", "eroi_stock", "net_share", "energy_payback_yr", "power_density_w_per_m2", "footprint_direct_ha", "footprint_total_ha", "farmland_quality_ha", "habitat_ha",
	"soil_carbon_loss_tc", "peat_ha", "ghg_g_per_kwh", "carbon_payback_yr", "nearest_dwelling_m", "noise_dba", "connection_km", "connection_loss_frac", "connection_voltage_rise_frac", "curtailed_mwh_per_yr"}

func editionText() string {
	e := Editions()
	return fmt.Sprintf("ground %d, fit %d, candidate %d, order %d", e["ground"], e["fit"], e["candidate"], e["order"])
}

// checkGolden compares the first candidates of each voice with the reviewed values of the sample. When
// digits change on purpose, the edition of the step that changed is raised, so that stored results and
// old appendices are not taken for new ones, and the file is written anew with -update.
func checkGolden(t *testing.T, r *Results) {
	t.Helper()
	rows := [][]string{{"editions", editionText(), "", "", "", "", ""}, {"place", "candidate", "key", "state", "low", "central", "high"}}
	number := func(x float64) string { return strconv.FormatFloat(x, 'g', 12, 64) }
	for _, v := range r.Voices {
		for i, row := range v.Order {
			if i >= 4 {
				break
			}
			place := fmt.Sprintf("%s %d tier %d", v.Voice, row.Place, row.Tier)
			rows = append(rows, []string{place, row.Site + "/" + row.Plant, "score", "number", number(row.ScoreLow), number(row.Score), number(row.ScoreHigh)})
			if row.Site == NoSite {
				continue
			}
			c, err := r.Find(row.Site, row.Plant)
			if err != nil {
				t.Fatal(err)
			}
			for _, k := range goldenKeys {
				q, _ := c.Consequence(k)
				cells := []string{place, c.ID(), k, q.State.String(), "", "", ""}
				if q.State == scoring.Number {
					copy(cells[4:], []string{number(q.Low), number(q.Central), number(q.High)})
				}
				rows = append(rows, cells)
			}
		}
	}
	if *update {
		f, err := os.Create(goldenFile)
		if err != nil {
			t.Fatal(err)
		}
		defer f.Close()
		w := csv.NewWriter(f)
		if err := w.WriteAll(rows); err != nil {
			t.Fatal(err)
		}
		return
	}
	f, err := os.Open(goldenFile)
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	want, err := csv.NewReader(f).ReadAll()
	if err != nil {
		t.Fatal(err)
	}
	if want[0][1] != rows[0][1] {
		t.Fatalf("the golden values are of the editions %q, the program's are %q: review them and run the test with -update", want[0][1], rows[0][1])
	}
	if len(want) != len(rows) {
		t.Fatalf("%d golden values, found %d: raise the edition of the step that changed", len(want), len(rows))
	}
	bad := 0
	for i := range rows {
		for j := range rows[i] {
			if rows[i][j] == want[i][j] {
				continue
			}
			a, err1 := strconv.ParseFloat(want[i][j], 64)
			b, err2 := strconv.ParseFloat(rows[i][j], 64)
			if err1 == nil && err2 == nil && near(a, b) {
				continue
			}
			if bad++; bad <= 5 {
				t.Errorf("%v: want %v; raise the edition of the step that changed, say how results change, and run the test with -update", rows[i], want[i])
			}
		}
	}
	if bad > 5 {
		t.Errorf("%d golden values differ in all", bad)
	}
}
