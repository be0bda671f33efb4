package gen

import (
	"bytes"
	"encoding/csv"
	"fmt"
	"strconv"
)

type settingRow struct{ key, value, unit, source, reason string }

// settingTable writes the ordinance of the island, its plant options and its three voices as settings.
func settingTable() ([]byte, error) {
	var rows []settingRow
	section := func(n int) string { return fmt.Sprintf("%s, section %d", ordinance, n) }
	add := func(key, value, unit, source, reason string) {
		rows = append(rows, settingRow{key, value, unit, source, reason})
	}
	num := func(v float64) string { return strconv.FormatFloat(v, 'f', -1, 64) }
	options := "Marram energy office (invented), list of plant options 2025"

	type plant struct {
		id, title, fit string
		wind, sun      bool
		turbine        string
		hub, rotor, kw float64
		machines       float64
		tilt, azimuth  float64
		gcr, bifacial  float64
		powerKW        float64
		slopeDeg       float64
		patchHa, wideM float64
	}
	plants := []plant{
		{id: "solar_fixed", title: "Solar, fixed rows", fit: "power", sun: true, tilt: 30, azimuth: 180, gcr: 0.45, powerKW: 10000, slopeDeg: 12, patchHa: 1, wideM: 30},
		{id: "solar_tracking", title: "Solar, tracking", fit: "power", sun: true, tilt: 0, azimuth: 180, gcr: 0.35, bifacial: 0.7, powerKW: 10000, slopeDeg: 7, patchHa: 2, wideM: 50},
		{id: "solar_vertical", title: "Solar, upright rows", fit: "power", sun: true, tilt: 90, azimuth: 90, gcr: 0.22, bifacial: 0.85, powerKW: 5000, slopeDeg: 9, patchHa: 1, wideM: 40},
		{id: "solar_agri", title: "Solar over crops", fit: "power", sun: true, tilt: 20, azimuth: 180, gcr: 0.3, bifacial: 0.7, powerKW: 5000, slopeDeg: 8, patchHa: 1, wideM: 40},
		{id: "wind", title: "Wind 3.4 MW", fit: "machines", wind: true, turbine: "iea_3_4mw_130", hub: 110, rotor: 130, kw: 3370, machines: 3, slopeDeg: 15, patchHa: 0.3, wideM: 40},
		{id: "wind_large", title: "Wind 5 MW", fit: "machines", wind: true, turbine: "nrel_5mw_126", hub: 90, rotor: 126, kw: 5000, machines: 3, slopeDeg: 15, patchHa: 0.3, wideM: 40},
		{id: "wind_solar", title: "Wind with solar", fit: "spare_capacity", wind: true, sun: true, turbine: "iea_3_4mw_130", hub: 110, rotor: 130, kw: 3370, machines: 1, tilt: 30, azimuth: 180, gcr: 0.45, powerKW: 6000, slopeDeg: 10, patchHa: 1, wideM: 40},
	}
	technology := func(p plant) string {
		if p.id == "wind_large" {
			return "wind"
		}
		return p.id
	}
	add("study.name", "Isle of Marram, community plant", "", "identity", "name of the sample study")
	add("study.place", "Isle of Marram", "", "identity", "invented district")
	for _, p := range plants {
		k := "plant." + p.id + "."
		add(k+"title", p.title, "", options, "name shown")
		add(k+"technology", technology(p), "", options, "kind of plant")
		add(k+"fit", p.fit, "", options, "how it is fitted into the buildable area")
		if p.wind {
			add(k+"turbine", p.turbine, "", options, "open reference machine")
			add(k+"hub_height_m", num(p.hub), "m", options, "hub height of the reference machine")
			add(k+"rotor_diameter_m", num(p.rotor), "m", options, "rotor of the reference machine")
			add(k+"rated_kw", num(p.kw), "kW", options, "rated power of the reference machine")
			add(k+"spacing_along_d", "5", "rotor diameter", options, "along the prevailing wind")
			add(k+"spacing_across_d", "3", "rotor diameter", options, "across the prevailing wind")
			add(k+"fit_machines", num(p.machines), "1", options, "the island wants small groups")
		}
		if p.sun {
			add(k+"tilt_deg", num(p.tilt), "deg", options, "as planned")
			add(k+"azimuth_deg", num(p.azimuth), "deg", options, "as planned")
			add(k+"gcr", num(p.gcr), "1", options, "panel width over row pitch")
			add(k+"module_efficiency", "0.21", "1", options, "modules on the market")
			add(k+"dc_ac_ratio", "1.2", "1", options, "panel over inverter power")
			if p.bifacial > 0 {
				add(k+"bifaciality", num(p.bifacial), "1", options, "modules with a rear side")
			}
			add(k+"fit_power_kw", num(p.powerKW), "kW", options, "what one feeder takes")
		}
	}
	setback := func(role string, p plant, m float64, n int, reason string) {
		add("rule.setback."+role+"."+p.id+"_m", num(m), "m", section(n), reason)
	}
	pick := func(p plant, wind, sun float64) float64 {
		if p.wind {
			return wind
		}
		return sun
	}
	for _, p := range plants {
		setback("dwellings", p, pick(p, 500, 30), 4, "distance from the nearest lived-in building")
		setback("sensitive", p, pick(p, 300, 50), 7, "schools, care homes, burial grounds")
		setback("habitat", p, pick(p, 100, 20), 8, "edge of protected habitat")
		setback("heritage", p, pick(p, 400, 100), 10, "setting of listed sites")
		setback("water", p, 20, 12, "banks of streams and lakes")
		setback("forest", p, pick(p, 50, 20), 8, "edge of woods")
		setback("exclusion", p, 0, 9, "the excluded ground itself, no more")
		if p.wind {
			key := func(role, what string) string { return "rule.setback." + role + "." + p.id + "_" + what }
			add(key("roads", "tip"), "1.1", "tip height", section(5), "a falling machine stays clear of the road")
			add(key("grid_lines", "tip"), "1.1", "tip height", section(5), "a falling machine stays clear of the line")
			add(key("boundary", "rotor"), "0.5", "rotor diameter", section(6), "no blade over the neighbour's land")
		} else {
			setback("roads", p, 10, 5, "fence and hedge along the road")
			setback("grid_lines", p, 8, 5, "safety strip under the line")
			setback("boundary", p, 5, 6, "hedge along the boundary")
		}
		add("rule.slope_max."+p.id+"_deg", num(p.slopeDeg), "deg", section(6), "steeper ground erodes when built on")
		add("rule.smallest_patch."+p.id+"_ha", num(p.patchHa), "ha", section(6), "no scattered remnants")
		add("rule.smallest_width."+p.id+"_m", num(p.wideM), "m", section(6), "no strips too narrow to work")
	}
	for _, e := range []struct {
		role   string
		out    bool
		n      int
		reason string
	}{
		{"exclusion", true, 9, "landfill, harbour and airstrip"}, {"habitat", true, 8, "the classes named in the next rule"}, {"water", true, 12, "open water"},
		{"forest", true, 8, "woods are few on the island"}, {"flood", false, 12, "counted, not excluded"}, {"peat", false, 8, "counted and flagged, not excluded"},
		{"heritage", true, 10, "the ground of listed sites"}, {"sensitive", true, 7, "the places themselves"}, {"water_protection", true, 12, "inner zone of the spring"}, {"farmland", false, 6, "counted, not excluded"},
	} {
		add("rule.exclude."+e.role, strconv.FormatBool(e.out), "", section(e.n), e.reason)
	}
	add("rule.exclude.habitat.class", "dune grassland|bird shore", "", section(8), "protected dunes and bird shore")
	add("limit.noise_night_dba", "40", "dB(A)", section(14), "at dwellings, 22 to 6 h")
	add("limit.noise_day_dba", "45", "dB(A)", section(14), "at dwellings, 6 to 22 h")
	add("limit.flicker_h_per_yr", "30", "h/yr", section(15), "worst case at a dwelling")
	add("energy.target_mwh_per_yr", "45000", "MWh/yr", "Council of Marram (invented), resolution of 2025-03-12", "what the island wants from community plant")
	add("climate.grid_factor_g_per_kwh", "250", "g CO2e/kWh", "Marram Power (invented), supply statement 2025", "mix of the sea cable and the standby station")
	add("climate.zone", "cool temperate moist", "", "Marram energy office (invented)", "maritime climate at 47.5 N")
	add("weather.stamp", "start", "", "Marram weather office (invented), hourly year", "what the times of the file mark")
	add("weather.data_kind", "satellite", "", "Marram weather office (invented), hourly year", "an hourly year made from satellite images")
	add("wind.shear_alpha", "0.14", "1", "power law with about one seventh over open land", "open island")

	voices := []struct {
		id, title string
		weights   [7]int
	}{
		{"residents", "Residents", [7]int{20, 15, 45, 30, 100, 85, 5}},
		{"farmers", "Farmers", [7]int{12, 100, 0, 0, 2, 1, 0}},
		{"operator", "Network operator", [7]int{70, 10, 10, 35, 10, 5, 100}},
	}
	keys := [7]string{"net_share", "footprint_direct_ha_per_gwh", "habitat_ha_per_gwh", "ghg_g_per_kwh", "noise_dba", "dwellings_seeing_per_gwh", "connection_km"}
	for _, v := range voices {
		source := "Marram siting meeting (invented), minutes of 2025-10-08"
		add("voice."+v.id+".title", v.title, "", source, "name of the voice")
		for i, k := range keys {
			add("voice."+v.id+".weight."+k, strconv.Itoa(v.weights[i]), "swing points", source, "as agreed at the table of the "+v.title)
		}
	}
	var b bytes.Buffer
	w := csv.NewWriter(&b)
	if err := w.Write([]string{"key", "value", "unit", "source", "reason"}); err != nil {
		return nil, fmt.Errorf("write settings: %w", err)
	}
	for _, r := range rows {
		if err := w.Write([]string{r.key, r.value, r.unit, r.source, r.reason}); err != nil {
			return nil, fmt.Errorf("write settings: %w", err)
		}
	}
	w.Flush()
	return b.Bytes(), w.Error()
}
