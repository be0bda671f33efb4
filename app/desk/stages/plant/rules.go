package plant

import (
	"fmt"
	"strconv"
	"strings"

	"groundtally/app/run"
	"groundtally/app/study"
)

// part is a part of an option that has rules of its own: its masts or its panels.
type part struct {
	words string   // heads its rules; empty when the option has but one part
	names []string // under which it finds its settings, the most special first
	wind  bool
}

// partsOf gives the parts of an option. The names are those by which the computing finds rules: the panels
// of a plant of both are named <option>_panels.
func partsOf(id, technology string) []part {
	switch technology {
	case "wind_solar":
		return []part{
			{words: "Masts", names: []string{id, technology, "wind"}, wind: true},
			{words: "Panels", names: []string{id + "_panels", "solar_fixed", "solar"}},
		}
	case "wind":
		return []part{{names: []string{id, technology, "wind"}, wind: true}}
	}
	return []part{{names: []string{id, technology, "solar"}}}
}

// inForce is the setting that holds, with the key it was found under.
type inForce struct {
	key    string
	value  study.Setting
	byUser bool
	ok     bool
}

// notSet reports whether the user must enter the value.
func (f inForce) notSet() bool { return f.ok && f.value.Value == study.NotSetText }

// cascade finds the setting that holds for a part. A user's setting of a general name stands before a
// default of a special one.
func cascade(snap *study.Snapshot, prefix string, p part, suffix string) inForce {
	for _, user := range []bool{true, false} {
		for _, n := range p.names {
			key := prefix + n + suffix
			if s, byUser, ok := snap.Lookup(key); ok && (byUser || !user) {
				return inForce{key, s, byUser, true}
			}
		}
	}
	return inForce{}
}

// distanceUnits are the units in which a distance can be given.
var distanceUnits = []struct{ suffix, unit, words string }{
	{"_m", "m", "m"}, {"_tip", "tip height", "tip heights"}, {"_rotor", "rotor diameter", "rotor diameters"},
}

// rule is a rule of an option that is in force or asks for a value.
type rule struct {
	role   string // of a distance; empty for others
	label  string
	prefix string
	suffix string
	held   inForce
}

// boundary is the role of the site's own edge.
const boundary = "boundary"

// roleTitle writes what a distance is kept from.
func roleTitle(cat *study.Catalog, role string) string {
	if role == boundary {
		return "The site's own boundary"
	}
	if r, ok := cat.Role(role); ok {
		return r.Title
	}
	return strings.ReplaceAll(role, "_", " ")
}

// distanceRoles lists what a distance can be kept from.
func distanceRoles(cat *study.Catalog) []string {
	out := []string{boundary}
	for _, r := range cat.Roles {
		if r.Name != "parcels" && r.Name != "district" && (r.Accepts("point") || r.Accepts("line") || r.Accepts("polygon")) {
			out = append(out, r.Name)
		}
	}
	return out
}

// distances lists the distances that a part keeps or that ask for a value, in the order of the roles.
func distances(snap *study.Snapshot, p part) []rule {
	cat := snap.Catalog()
	var out []rule
	add := func(role, prefix, label string) {
		var held []rule
		number := false
		for _, u := range distanceUnits {
			f := cascade(snap, prefix, p, u.suffix)
			if !f.ok || !p.wind && u.suffix != "_m" && !f.byUser {
				continue
			}
			number = number || !f.notSet()
			held = append(held, rule{role: role, label: label, prefix: prefix, suffix: u.suffix, held: f})
		}
		for _, r := range held {
			if !number || !r.held.notSet() { // a distance in another unit answers for one that is not set
				out = append(out, r)
			}
		}
	}
	for _, role := range distanceRoles(cat) {
		prefix := "rule.setback." + role + "."
		add(role, prefix, roleTitle(cat, role))
		for _, name := range run.SpecialDistances(snap, role) {
			add(role, prefix+name, roleTitle(cat, role)+", "+specialWords(name))
		}
	}
	return out
}

// specialWords writes which features of a role have a distance of their own.
func specialWords(name string) string {
	name = strings.TrimSuffix(name, ".")
	if class, ok := strings.CutPrefix(name, "class."); ok {
		return class
	}
	return strings.TrimSuffix(strings.TrimPrefix(name, "from_"), "_kv") + " kV and more"
}

// special reads what a user writes of the features that have a distance of their own: nothing for all, a
// voltage such as "110 kV", else a class.
func special(words string) (string, error) {
	words = strings.Join(strings.Fields(words), " ")
	if words == "" {
		return "", nil
	}
	if number, ok := strings.CutSuffix(strings.ToLower(words), "kv"); ok {
		number = strings.TrimSpace(number)
		if kv, err := strconv.ParseFloat(number, 64); err != nil || kv <= 0 || strings.ContainsAny(number, ".,") {
			return "", fmt.Errorf("give the least voltage in whole kilovolts, as 110 kV")
		}
		return "from_" + number + "_kv.", nil
	}
	if strings.Contains(words, ".") {
		return "", fmt.Errorf("a class with a dot in its name cannot have a distance of its own")
	}
	return "class." + strings.ToLower(words) + ".", nil
}

// shapes lists the rules on slope and shape, whether they are in force or not.
func shapes(snap *study.Snapshot, p part) []rule {
	out := []rule{
		{label: "Steepest slope", prefix: "rule.slope_max.", suffix: "_deg"},
		{label: "Ground may fall from", prefix: "rule.aspect_from.", suffix: "_deg"},
		{label: "… clockwise to", prefix: "rule.aspect_to.", suffix: "_deg"},
		{label: "… where steeper than", prefix: "rule.aspect_slope.", suffix: "_deg"},
		{label: "Smallest patch", prefix: "rule.smallest_patch.", suffix: "_ha"},
		{label: "Smallest width", prefix: "rule.smallest_width.", suffix: "_m"},
		{label: "Farming that goes on", prefix: "land.farmland_coshare.", suffix: ""},
	}
	for i := range out {
		out[i].held = cascade(snap, out[i].prefix, p, out[i].suffix)
	}
	return out
}

// legalNotSet lists the legal values that some option needs and the user has not entered, by key.
func legalNotSet(snap *study.Snapshot) []string {
	var out []string
	seen := map[string]bool{}
	put := func(key string) {
		if !seen[key] {
			seen[key] = true
			out = append(out, key)
		}
	}
	wind := false
	for _, id := range snap.Plants() {
		technology := snap.Text("plant." + id + ".technology")
		wind = wind || hasWind(technology)
		for _, p := range partsOf(id, technology) {
			for _, r := range distances(snap, p) {
				if r.held.notSet() {
					put(r.prefix + p.names[0] + r.suffix)
				}
			}
		}
	}
	if wind {
		for _, key := range legalLimits(snap.Catalog()) {
			if s, _, ok := snap.Lookup(key); ok && s.Value == study.NotSetText {
				put(key)
			}
		}
	}
	return out
}

// legalLimits lists the limits on noise and flicker that the law gives.
func legalLimits(cat *study.Catalog) []string {
	var out []string
	for _, d := range cat.Definitions {
		if d.Legal && strings.HasPrefix(d.Key, "limit.") && !strings.Contains(d.Key, "<") {
			out = append(out, d.Key)
		}
	}
	return out
}

// ownRules counts the rules that the user entered.
func ownRules(snap *study.Snapshot) int {
	n := 0
	for key := range snap.Explicit {
		if strings.HasPrefix(key, "rule.") {
			n++
		}
	}
	return n
}
