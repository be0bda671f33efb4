package gen

import (
	"bytes"
	"encoding/csv"
	"math"
	"strconv"
	"testing"

	"groundtally/scoring/units"
)

func column(t *testing.T, table []byte, name string) []float64 {
	t.Helper()
	rows, err := csv.NewReader(bytes.NewReader(table)).ReadAll()
	if err != nil {
		t.Fatal(err)
	}
	for k, h := range rows[0] {
		if h != name {
			continue
		}
		var out []float64
		for _, r := range rows[1:] {
			v, err := strconv.ParseFloat(r[k], 64)
			if err != nil {
				t.Fatal(err)
			}
			out = append(out, v)
		}
		return out
	}
	t.Fatalf("no column %s", name)
	return nil
}

func total(v []float64) float64 {
	s := 0.0
	for _, x := range v {
		s += x
	}
	return s
}

func TestYearOfWeather(t *testing.T) {
	year := makeYear(Seed)
	hours, months := weatherTable(year), monthTable(year)
	ghi := column(t, hours, "ghi")
	if len(ghi) != int(units.HoursPerYear) {
		t.Fatalf("%d hours", len(ghi))
	}
	within(t, "yearly sunlight in kWh/m2", total(ghi)/units.WPerKW, 1140, 1160)
	if d := math.Abs(total(ghi)/units.WPerKW - total(column(t, months, "ghi"))); d > 0.07 {
		t.Errorf("months and hours differ by %g kWh/m2", d)
	}
	within(t, "diffuse share", total(column(t, months, "dhi"))/total(column(t, months, "ghi")), 0.45, 0.65)
	wind := column(t, hours, "wind_speed")
	within(t, "mean wind in m/s", total(wind)/units.HoursPerYear, 8.5, 8.7)
	within(t, "mean temperature", total(column(t, hours, "temperature"))/units.HoursPerYear, 11, 14)
	dni, dhi := column(t, hours, "dni"), column(t, hours, "dhi")
	for i, h := range year {
		cz, top := sunHeight(h.at)
		if ghi[i] > top*math.Max(0, cz)+0.1 || dni[i] > top || dhi[i] > ghi[i] || dni[i] < 0 {
			t.Errorf("%s: ghi %g, dni %g, dhi %g with %g beyond the air", h.at.Format(stamp), ghi[i], dni[i], dhi[i], top)
		}
		if cz > 0.06 {
			if d := math.Abs(float64(dni[i]*cz) + dhi[i] - ghi[i]); d > 0.2 {
				t.Errorf("%s: parts differ from the whole by %g W/m2", h.at.Format(stamp), d)
			}
		}
	}
	sector := make([]float64, sectors)
	for _, d := range column(t, hours, "wind_direction") {
		sector[int(d+15)/30%sectors]++
	}
	if best := 8; sector[best] < sector[2] || sector[best]/units.HoursPerYear < 0.12 {
		t.Errorf("wind from the south-west only %g of the year", sector[best]/units.HoursPerYear)
	}
}

func TestDemandAddsUp(t *testing.T) {
	load := column(t, demandTable(Seed, makeYear(Seed)), "load")
	if len(load) != int(units.HoursPerYear) {
		t.Fatalf("%d hours", len(load))
	}
	if s := math.Round(total(load)*10) / 10; s != 38e6 {
		t.Errorf("the year adds up to %f kWh, want 38,000,000", s)
	}
	lo, hi := math.Inf(1), 0.0
	for _, v := range load {
		lo, hi = math.Min(lo, v), math.Max(hi, v)
	}
	within(t, "least load in kW", lo, 1500, 3500)
	within(t, "highest load in kW", hi, 6000, 9000)
}
