package present

import (
	"strings"

	"groundtally/scoring"
)

// reasons says in plain words why a value is missing, why a connection was judged as it was, or why a
// candidate was not computed.
var reasons = map[string]string{
	"not_finite":              "the formula gives no finite number for these inputs",
	"height_unknown":          "the height of the ground is not known here",
	"not_assessed":            "this version does not look at it",
	"wind_by_year_alone":      "the wind is known for the year and not for its months",
	"no_soil_here":            "the soil layer has no value for this ground",
	"no_hours_of_demand":      "the study has no demand by the hour (columns time and load)",
	"no_hours_of_plant":       "the study has no hours of wind or sun that this plant's power could follow",
	"too_few_hours":           "less than four fifths of the hours are known of both plant and demand",
	"no_such_quantity":        "there is no such quantity",
	"no_way_for_tracks":       "no way for new tracks leads from the nearest road to the whole plant around water and buildings",
	"no_connection":           "no line or substation that the study knows can take the power",
	"energy_payback":          "the inputs do not allow a payback time to be worked out",
	"carbon_payback":          "the inputs do not allow a payback time to be worked out",
	"regrowth":                "the inputs do not allow a time of regrowth to be worked out",
	"biomass":                 "the inputs do not allow the plant carbon to be worked out",
	"crop":                    "the inputs do not allow the harvest given up to be worked out",
	"displaced":               "the inputs do not allow the emissions displaced to be worked out",
	"ghg":                     "the inputs do not allow the greenhouse gas to be worked out",
	"human_power":             "the inputs do not allow the human power to be worked out",
	"land_carbon":             "the inputs do not allow the carbon of the land to be worked out",
	"life_energy":             "the inputs do not allow the energy of the life to be worked out",
	"net_energy":              "the inputs do not allow the net energy to be worked out",
	"net_share":               "the inputs do not allow the share left after repayment to be worked out",
	"occupation":              "the inputs do not allow ground times years to be worked out",
	"peat":                    "the inputs do not allow the carbon lost from peat to be worked out",
	"saving":                  "the inputs do not allow the saving that equals it to be worked out",
	"soil":                    "the inputs do not allow the carbon lost from soil to be worked out",
	"soil_gain":               "the inputs do not allow the carbon gained in soil to be worked out",
	"eroi":                    "the inputs do not allow an energy return to be worked out",
	"fit_machines_needs_wind": "a number of machines was asked for, and this plant option has no turbine",

	"turbines_touch":          "rotors of turbines placed by hand could touch; move them apart",
	"existing_turbines_near":  "turbines of others stand too near on all buildable ground",
	"one_part_without_room":   "only one of the plant's two parts finds room here",
	"no_row_fits":             "the ground that is left has no room for a row of panels inside its fence",
	"limit_below_one_machine": "what the fit allows is less than one machine",
	"turbine_does_not_fit":    "the settings of the plant option do not fit the chosen turbine",
	"plant_out_of_range":      "a setting of the plant option is outside the range of the method",

	// Judgements on a line or substation.
	"voltage_out_of_scope":       "the voltage is outside what this screening covers; ask the network operator",
	"voltage_unknown":            "the voltage is not known; ask the network operator",
	"above_level_band":           "the plant is too large for this voltage",
	"tap_forbidden":              "the line may not be tapped",
	"tap_high_voltage":           "a line of this voltage is not tapped for a plant of this size; it needs a substation",
	"tap_unknown":                "it is not known whether the line may be tapped; ask the network operator",
	"no_conductor_listed":        "the table of conductors has none for this voltage",
	"thermal_rating":             "the current would be more than the conductor bears",
	"voltage_rise":               "the voltage would rise beyond the limit",
	"voltage_rise_at_long_route": "with the longest route the voltage would rise beyond the limit",
	"transfer_impossible":        "the power cannot be carried that far at this voltage",
	"spare_none":                 "no spare capacity is left",
	"spare_part":                 "the spare capacity covers only part of the plant; an export limit would be needed",
	"spare_unknown":              "the spare capacity is not known; ask the network operator",
	"spare_old":                  "the word on spare capacity is old; ask the network operator again",
	"upstream_unknown":           "it is not known what the network behind it can take; ask the network operator",
	"below_level_band":           "the plant is small for this voltage",
	"above_usual_power":          "the power is above what is usual at this voltage; expect a study by the network operator",
	"inventory_size":             "the inventory covers no machine of this size (wind_inventory_size_kw); enter a row of your own under inventory.wind_turbine-mj and inventory.wind_turbine-kgco2e",
	"no_such_candidate":          "the study has no such candidate",
	"no_energy_known":            "no candidate's energy is known",
	"short_circuit_weak":         "the network is weak here for this power",
	"short_circuit_low":          "the network is rather weak here for this power",
	"short_circuit_noted":        "the strength of the network here should be looked at",
	"charging_ask":               "a cable of this length draws charging power; ask the network operator",
	"charging_compensation":      "a cable of this length draws so much charging power that it needs compensation",
	"rapid_change":               "switching the plant would change the voltage quickly",
	"busbar_taken_as_regulated":  "the voltage of the substation is taken as held steady",
}

// prefixed are reasons that name something after a colon; %s stands for it.
var prefixed = map[string]string{
	"no_layer":           "the study has no layer of %s",
	"layer_not_complete": "nothing was found, and no layer of %s is declared complete for the place",
	"nothing_found":      "the layer of %s has nothing to measure to",
	"not_set":            "the setting %s must be entered first",
	"missing_value":      "features of the layer lack the value they need: %s",
	"tracks_not_placed":  "the likely way of new tracks meets %s, and their true place is not known",
}

// Reason writes in plain words why a value is unknown, not set or none, why a candidate was not
// computed, or how a connection was judged. A reason that is plain words already stays as it is.
func Reason(code string) string {
	if s, ok := reasons[code]; ok {
		return s
	}
	if name, what, ok := strings.Cut(code, ":"); ok {
		if s, known := prefixed[name]; known {
			if name != "not_set" {
				what = strings.ReplaceAll(plain(strings.ReplaceAll(what, "|", " or of ")), ".", ", ")
			}
			return strings.Replace(s, "%s", what, 1)
		}
	}
	if strings.Contains(code, " ") {
		return code
	}
	if strings.Contains(code, ".") { // the key of a setting
		return strings.Replace(prefixed["not_set"], "%s", code, 1)
	}
	return plain(code)
}

// WhyNot writes the state of a consequence that is no number, with its reason: "unknown: the study has
// no layer of soil". It is empty for a number.
func WhyNot(c scoring.Consequence) string {
	switch c.State {
	case scoring.Number:
		return ""
	case scoring.Never:
		return "never: what was spent is not paid back within the life of the plant"
	case scoring.NotAssessed:
		return "not assessed: " + reasons["not_assessed"]
	case scoring.Class:
		return c.Why
	}
	if c.Why == "" {
		return c.State.String()
	}
	return c.State.String() + ": " + Reason(c.Why)
}

// plain writes a code with blanks.
func plain(code string) string { return strings.ReplaceAll(code, "_", " ") }

// Rule writes the name of a rule in words: "setback:dwellings" becomes "distance from dwellings".
func Rule(name string) string {
	kind, what, ok := strings.Cut(name, ":")
	if !ok {
		return plain(name)
	}
	switch kind {
	case "setback":
		if what == "boundary" {
			return "distance from the site's boundary"
		}
		return "distance from " + plain(what)
	case "exclude":
		if what == "exclusion" {
			return "excluded ground"
		}
		return "ground excluded as " + plain(what)
	}
	return plain(kind) + " " + plain(what)
}

// steps names the steps of a loss chain.
var steps = map[string]string{
	"wake": "wakes of the other turbines", "availability": "time out of service", "electrical": "losses in cables and transformers", "performance": "performance below the published curve",
	"environment": "ice, dirt and weather", "curtailment": "energy cut off", "ac_wiring": "wiring behind the inverter", "dc_wiring": "wiring before the inverter", "auxiliary": "own use",
	"clipping": "power above what the inverter takes", "incidence_angle": "reflection at the glass", "inverter": "inverter", "light_induced": "first fading of the modules in light", "mismatch": "differences between modules",
	"nameplate": "modules below their rating", "rear_light": "light on the rear side", "far_horizon": "land on the horizon", "row_shade_beam": "rows shading each other, direct light", "row_shade_diffuse": "rows shading each other, light of the sky",
	"row_shade_electrical": "strings held back by shade", "snow": "snow", "soiling": "dirt on the modules", "temperature": "warmth of the modules", "transformer": "transformer",
}

// Step writes the name of a step of a loss chain in words.
func Step(name string) string {
	if s, ok := steps[name]; ok {
		return s
	}
	return plain(name)
}

// words of the few codes that people meet outside notices.
var named = map[string]string{
	"fitted": "fitted", "no_room": "without room", "not_computed": "not computed",
	"fill": "fills the buildable area", "power": "up to a power", "machines": "a number of machines", "yearly_energy": "up to a yearly energy", "spare_capacity": "up to the spare capacity",
	"grid_line": "power line", "line": "power line", "substation": "substation",
	"grid_lines": "power line", "substations": "substation",
}

// Named writes a status, a fit mode or a kind of connection in words.
func Named(code string) string {
	if s, ok := named[code]; ok {
		return s
	}
	return plain(code)
}

// Provenance writes how a value was come by. A value that was not checked against its source says so.
func Provenance(p string) string {
	switch p {
	case "memory":
		return "default, unverified"
	case "read":
		return "read in the source"
	case "secondary":
		return "second-hand"
	case "derived":
		return "derived from the source"
	case "user", "user ":
		return "entered by the user"
	}
	if who, ok := strings.CutPrefix(p, "user "); ok {
		return "entered by " + who
	}
	return p
}

// Relaxation writes a change of one rule that would bring a candidate back. Part is empty, "wind" or "solar".
func Relaxation(rule, part string, from, to float64, unit string, lifted bool) string {
	words := Rule(rule)
	if part != "" {
		words += " (" + part + " part)"
	}
	if lifted {
		return words + ": only without this rule"
	}
	digits := 1
	if unit == "ha" {
		digits = 3
	}
	return words + ": " + group(to, digits) + " " + Unit(unit) + " in place of " + group(from, digits) + " " + Unit(unit)
}
