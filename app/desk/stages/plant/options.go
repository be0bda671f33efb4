package plant

import (
	"fmt"
	"regexp"
	"slices"
	"strconv"
	"strings"

	"groundtally/app/desk/core"
	"groundtally/app/present"
	"groundtally/app/study"
)

// technologies in the order in which they are offered, in words.
var technologies = []struct{ name, words string }{
	{"wind", "Wind"}, {"solar_fixed", "Solar, fixed rows"}, {"solar_tracking", "Solar, tracking rows"}, {"solar_vertical", "Solar, upright rows"},
	{"solar_agri", "Solar raised over crops"}, {"wind_solar", "Wind with solar"},
}

// technologyWords writes a technology for people.
func technologyWords(name string) string {
	for _, t := range technologies {
		if t.name == name {
			return t.words
		}
	}
	if name == "" || name == study.NotSetText {
		return "technology not set"
	}
	return strings.ReplaceAll(name, "_", " ")
}

func hasWind(technology string) bool { return technology == "wind" || technology == "wind_solar" }
func hasSun(technology string) bool  { return technology != "" && technology != "wind" }

// labels of the settings of an option, in the order of the form.
var labels = []struct{ name, words string }{
	{"title", "Name"}, {"technology", "Technology"}, {"fit", "How it is fitted"}, {"fit_power_kw", "Power at most"}, {"fit_machines", "Machines at most"}, {"fit_energy_mwh_per_yr", "Yearly energy wanted"},
	{"turbine", "Reference curve"}, {"hub_height_m", "Hub height"}, {"rotor_diameter_m", "Rotor diameter"}, {"rated_kw", "Rated power of a machine"},
	{"spacing_along_d", "Spacing along the wind"}, {"spacing_across_d", "Spacing across the wind"},
	{"tilt_rule", "How the panels stand"}, {"tilt_deg", "Tilt"}, {"azimuth_deg", "Direction of the panels"}, {"rotation_max_deg", "Largest rotation"}, {"gcr", "Ground cover ratio"}, {"module_efficiency", "Module efficiency"},
	{"module_gamma_per_k", "Power of a module by heat"}, {"shade_blocks", "Blocks of cells under shade"}, {"module_width_m", "Module along the row"}, {"module_length_m", "Module across the row"},
	{"fence_offset_m", "From the fence to the panels"}, {"lane_every_m", "Lane every"}, {"lane_m", "Width of a lane"}, {"usable_share", "Share of the rows that is built"}, {"dc_ac_ratio", "Panel over inverter power"}, {"bifaciality", "Rear side of the modules"}, {"collector_width_m", "Width of the collector"},
	{"clearance_m", "Lower edge above ground"}, {"tower_clear_m", "Panels from a tower"},
}

// reads tells whether an option of a technology, fitted in a way, takes notice of a setting.
func reads(technology, fit, name string) bool {
	wind, sun := hasWind(technology), hasSun(technology)
	switch name {
	case "title", "technology", "fit":
		return true
	case "fit_power_kw": // panels are held to it however they are fitted
		return fit == "power" || sun
	case "fit_machines":
		return wind
	case "fit_energy_mwh_per_yr":
		return fit == "yearly_energy"
	case "turbine", "hub_height_m", "rotor_diameter_m", "rated_kw", "spacing_along_d", "spacing_across_d":
		return wind
	case "tilt_deg", "tilt_rule":
		return technology == "solar_fixed" || technology == "solar_agri" || technology == "wind_solar"
	case "azimuth_deg":
		return sun && technology != "solar_tracking"
	case "rotation_max_deg":
		return technology == "solar_tracking"
	case "gcr", "module_efficiency", "module_gamma_per_k", "shade_blocks", "module_width_m", "module_length_m", "fence_offset_m", "lane_every_m", "lane_m", "usable_share", "dc_ac_ratio", "bifaciality":
		return sun
	case "collector_width_m", "clearance_m":
		return sun && technology != "solar_vertical"
	case "tower_clear_m":
		return technology == "wind_solar"
	}
	return false
}

// fits lists the ways in which an option of a technology can be fitted.
func fits(technology string) []string {
	if hasWind(technology) {
		return []string{"fill", "power", "machines", "yearly_energy", "spare_capacity"}
	}
	return []string{"fill", "power", "yearly_energy", "spare_capacity"}
}

// goodID is what an option may be called in the study's settings.
var goodID = regexp.MustCompile(`^[A-Za-z0-9_]+$`)

// checkID tells why an option cannot have a name; nil when it can.
func checkID(snap *study.Snapshot, id string) error {
	switch {
	case !goodID.MatchString(id):
		return fmt.Errorf("the short name takes letters, digits and _ alone")
	case slices.Contains(snap.Plants(), id):
		return fmt.Errorf("there is an option %q already", id)
	case id == "solar" || slices.ContainsFunc(technologies, func(t struct{ name, words string }) bool { return t.name == id }):
		return fmt.Errorf("%q names a whole technology, whose rules hold for all its options", id)
	case strings.HasSuffix(id, "_panels"):
		return fmt.Errorf("a short name that ends in _panels is kept for the panels of a plant of both")
	}
	for key := range snap.Explicit {
		if of(key, id) {
			return fmt.Errorf("the study has settings of an option %q from before; take another short name", id)
		}
	}
	return nil
}

// endings that a rule named after an option may have.
var endings = []string{"m", "tip", "rotor", "deg", "ha"}

// of tells whether a setting belongs to an option: plant.<id>.*, rule.*.<id>_*, and its share of farming.
func of(key, id string) bool {
	_, ok := renamed(key, id, id)
	return ok
}

// renamed gives the key that a setting of one option has for another; ok is false for a setting that does not
// belong to the option.
func renamed(key, from, to string) (string, bool) {
	if rest, ok := strings.CutPrefix(key, "plant."+from+"."); ok {
		return "plant." + to + "." + rest, true
	}
	dot := strings.LastIndexByte(key, '.')
	if dot < 0 {
		return "", false
	}
	head, last := key[:dot+1], key[dot+1:]
	switch {
	case head == "rule.measured_to." && last == from:
		return head + to, true
	case head == "land.farmland_coshare." && (last == from || last == from+"_panels"):
		return head + to + strings.TrimPrefix(last, from), true
	case !strings.HasPrefix(key, "rule."):
		return "", false
	}
	end, ok := strings.CutPrefix(last, from+"_")
	if ok && (slices.Contains(endings, end) || slices.Contains(endings, strings.TrimPrefix(end, "panels_"))) {
		return head + to + "_" + end, true
	}
	return "", false
}

// copied gives the edits that make an option of another's settings.
func copied(snap *study.Snapshot, from, to, title string) []study.SettingEdit {
	var out []study.SettingEdit
	for _, key := range snap.Keys() { // sorted, so that the journal is the same every time
		s, own := snap.Explicit[key]
		now, ok := renamed(key, from, to)
		if !own || !ok {
			continue
		}
		e := study.SettingEdit{Key: now, Value: s.Value, Source: s.Source, Reason: s.Reason, AcceptedBy: s.AcceptedBy}
		if now == "plant."+to+".title" {
			e = study.SettingEdit{Key: now, Value: title}
		}
		out = append(out, e)
	}
	if snap.Text("plant."+from+".title") == "" {
		out = append(out, study.SettingEdit{Key: "plant." + to + ".title", Value: title})
	}
	return out
}

// emptied gives the edits that take an option out.
func emptied(snap *study.Snapshot, id string) []study.SettingEdit {
	var out []study.SettingEdit
	for _, key := range snap.Keys() {
		if _, own := snap.Explicit[key]; own && of(key, id) {
			out = append(out, study.SettingEdit{Key: key})
		}
	}
	return out
}

// sizes writes the main sizes of an option in a few words.
func sizes(snap *study.Snapshot, id string) string {
	text := func(name string) string {
		s, _, ok := snap.Lookup("plant." + id + "." + name)
		if !ok {
			return study.NotSetText
		}
		d, _ := snap.Catalog().Definition("plant." + id + "." + name)
		return value(s.Value, d.Unit)
	}
	technology := snap.Text("plant." + id + ".technology")
	var parts []string
	if hasWind(technology) {
		parts = append(parts, text("rated_kw"), "rotor "+text("rotor_diameter_m"), "hub "+text("hub_height_m"))
	}
	if hasSun(technology) {
		parts = append(parts, "ground cover "+text("gcr"))
	}
	return strings.Join(append(parts, fitWords(snap, id)), ", ")
}

// fitWords says how an option is fitted, with the number it needs.
func fitWords(snap *study.Snapshot, id string) string {
	mode := snap.Text("plant." + id + ".fit")
	number := func(name, unit string) string {
		s, _, ok := snap.Lookup("plant." + id + "." + name)
		if !ok || s.Value == study.NotSetText {
			return study.NotSetText
		}
		return value(s.Value, unit)
	}
	switch mode {
	case "power":
		return "up to " + number("fit_power_kw", "kW")
	case "machines":
		if n := number("fit_machines", "1"); n == "1" {
			return "up to 1 machine"
		} else {
			return "up to " + n + " machines"
		}
	case "yearly_energy":
		return "up to " + number("fit_energy_mwh_per_yr", "MWh/yr")
	}
	return present.Named(mode)
}

// value writes a setting with its unit.
func value(text, unit string) string {
	if text == study.NotSetText {
		return text
	}
	words := unitWords(unit, text)
	if n, err := strconv.Atoi(text); err == nil {
		text = core.Count(n)
	}
	return strings.TrimSpace(text + " " + words)
}

// unitWords writes the unit of a setting for people; several diameters or heights take the plural.
func unitWords(unit, number string) string {
	switch unit {
	case "rotor diameter":
		if number != "1" {
			return "rotor diameters"
		}
	case "tip height":
		if number != "1" {
			return "tip heights"
		}
	}
	return present.Unit(unit)
}
