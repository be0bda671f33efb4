package term

import (
	"fmt"
	"slices"
	"strings"

	"groundtally/app/study"
)

// unanswered lists what the study must still be told before anything can be computed, each with the
// exact lines that tell it.
func (c *call) unanswered(snap *study.Snapshot) []study.Question {
	path := shellWord(c.args.places[0])
	var out []study.Question
	ask := func(text string, lines ...string) {
		for i := range lines {
			lines[i] = "gtally " + strings.ReplaceAll(lines[i], "STUDY", path)
		}
		out = append(out, study.Question{Text: text, Option: strings.Join(lines, "\n")})
	}
	if len(snap.LayersOf("parcels")) == 0 {
		ask("the study has no parcels yet; which file holds them?", "add STUDY FILE --as parcels")
	}
	plants := snap.Plants()
	if len(plants) == 0 {
		ask("the study has no plant option yet; what is to be tried? For one:", "set STUDY plant.wind.technology wind")
	}
	for _, id := range plants {
		key := "plant." + id + "."
		technology := snap.Text(key + "technology")
		if technology == "" {
			ask(fmt.Sprintf("which technology has the plant option %q?", id), "set STUDY "+key+"technology TECHNOLOGY")
			continue
		}
		if technology == "wind" || technology == "wind_solar" {
			c.askMachine(snap, id, ask)
		}
		for mode, need := range map[string]string{"power": "fit_power_kw", "machines": "fit_machines", "yearly_energy": "fit_energy_mwh_per_yr"} {
			if _, ok := snap.Number(key + need); snap.Text(key+"fit") == mode && !ok {
				ask(fmt.Sprintf("the plant option %q is fitted by %s; up to how much?", id, strings.ReplaceAll(mode, "_", " ")), "set STUDY "+key+need+" NUMBER")
			}
		}
	}
	c.askSun(snap, ask)
	return out
}

// askMachine asks for the measures of a machine; a named curve proposes its own.
func (c *call) askMachine(snap *study.Snapshot, id string, ask func(string, ...string)) {
	key := "plant." + id + "."
	name := snap.Text(key + "turbine")
	proposed := map[string]string{"hub_height_m": "NUMBER", "rotor_diameter_m": "NUMBER", "rated_kw": "NUMBER"}
	if name != "" {
		at := slices.Index(c.Params.TurbineIDs(), name)
		if own, ok := snap.Turbine(name); ok {
			proposed["rotor_diameter_m"], proposed["rated_kw"] = fmt.Sprintf("%g", own.RotorDiameterM), fmt.Sprintf("%g", own.RatedKW)
		} else if at < 0 {
			ask(fmt.Sprintf("the plant option %q names a reference curve %q that is not there; which one? They are: %s", id, name, strings.Join(c.Params.TurbineIDs(), ", ")),
				"set STUDY "+key+"turbine NAME")
		} else {
			t := c.Params.Turbines[at]
			proposed["rotor_diameter_m"], proposed["rated_kw"] = fmt.Sprintf("%g", t.RotorDiameterM), fmt.Sprintf("%g", t.RatedKW)
			if t.HubHeightM > 0 {
				proposed["hub_height_m"] = fmt.Sprintf("%g", t.HubHeightM)
			}
		}
	}
	var lines []string
	for _, need := range []string{"hub_height_m", "rotor_diameter_m", "rated_kw"} {
		if _, ok := snap.Number(key + need); !ok {
			lines = append(lines, "set STUDY "+key+need+" "+proposed[need])
		}
	}
	if len(lines) > 0 {
		ask(fmt.Sprintf("how large is the machine of the plant option %q?", id), lines...)
	}
}

// askSun asks for what is missing of a year of typed sunlight. Where a resource layer serves, nothing
// typed is used.
func (c *call) askSun(snap *study.Snapshot, ask func(string, ...string)) {
	if len(snap.LayersOf("solar_resource")) > 0 {
		return
	}
	var missing []string
	typed := false
	for month := 1; month <= 12; month++ {
		for _, key := range []string{fmt.Sprintf("solar.typed_ghi_%d_kwh_per_m2", month), fmt.Sprintf("solar.typed_temperature_%d_degc", month)} {
			if _, ok := snap.Number(key); ok {
				typed = true
			} else {
				missing = append(missing, "set STUDY "+key+" NUMBER")
			}
		}
	}
	if typed && len(missing) > 0 {
		ask("typed sunlight needs sunlight and mean temperature of all twelve months; what are these?", missing...)
	}
}
