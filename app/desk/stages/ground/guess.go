package ground

import (
	"path/filepath"
	"slices"
	"strings"

	"groundtally/app/study"
	"groundtally/scoring/units"
)

// roleWords are words in names of files that hint at a role, in a few languages.
var roleWords = map[string][]string{
	"parcels": {"parcel", "cadastre", "cadastral", "flurst", "parzell", "kataster", "lots", "plots"}, "dwellings": {"dwelling", "house", "building", "address", "gebaeude", "home"},
	"district": {"district", "municipal", "gemeinde", "commune", "boundary", "border"}, "roads": {"road", "street", "strasse", "highway", "ways"},
	"grid_lines": {"gridline", "powerline", "leitung", "cable", "transmission"}, "substations": {"substation", "umspann", "transformer"},
	"terrain": {"terrain", "dem", "dtm", "dgm", "elevation", "height"}, "surface_heights": {"surface", "dsm", "dom", "canopy"},
	"wind_resource": {"wind"}, "solar_resource": {"solar", "sun", "ghi", "radiation"}, "hourly_weather": {"hourly", "weather"}, "demand": {"demand", "load", "use"},
	"habitat": {"habitat", "biotop"}, "water_protection": {"waterprotection", "wasserschutz"}, "flood": {"flood", "hochwasser"}, "water": {"water", "river", "lake", "gewaesser"},
	"soil": {"soil", "boden"}, "peat": {"peat", "moor", "bog"}, "farmland": {"farm", "field", "acker"}, "forest": {"forest", "wood", "wald"}, "land_cover": {"landcover", "landuse", "cover"},
	"heritage": {"heritage", "monument", "denkmal"}, "exclusion": {"exclusion", "exclude", "nogo"}, "sensitive": {"sensitive", "school", "hospital"}, "corridors": {"corridor", "rail", "pipeline"},
	"height_limit": {"heightlimit", "aviation", "radar"}, "existing_plant": {"existing", "permitted", "turbines"}, "designated": {"designated", "zone", "planned"},
	"viewpoints": {"viewpoint", "views"}, "access_points": {"access", "gates"}, "place_names": {"placename", "names"}, "sealed_ground": {"sealed", "roof", "parking"}, "backdrop": {"backdrop", "aerial", "ortho"},
}

// guessRole proposes a role from the name of a file; empty where the name says nothing. The longest word
// found counts.
func guessRole(cat *study.Catalog, file, made string) string {
	base := filepath.Base(file)
	base = strings.ToLower(strings.TrimSuffix(base, filepath.Ext(base)))
	plain := strings.NewReplacer("_", "", "-", "", " ", "", ".", "").Replace(base)
	best, most := "", 2
	for _, r := range cat.Roles {
		if !fits(r, made) {
			continue
		}
		for _, w := range append([]string{strings.ReplaceAll(r.Name, "_", "")}, roleWords[r.Name]...) {
			if len(w) > most && strings.Contains(plain, w) {
				best, most = r.Name, len(w)
			}
		}
	}
	return best
}

// fits tells whether a role takes what a file is made of; an empty kind is not known yet.
func fits(r study.Role, made string) bool { return made == "" || r.Accepts(made) }

// madeOf tells of what a file is made: its first feature with a place, else rows or a grid.
func madeOf(in study.Import) string {
	if in.Layer == nil {
		return "raster"
	}
	for _, f := range in.Layer.Features {
		if !f.Geometry.Empty() {
			return f.Geometry.Kind.String()
		}
	}
	return "table"
}

// someUnits are the units that a form offers beside the role's own.
var someUnits = []string{"m", "km", "cm", "mm", "ft", "V", "kV", "W", "kW", "MW", "kWh/yr", "MWh/yr", "GWh/yr", "m/s", "km/h", "t C/ha", "kg C/m2", "kWh/(m2 month)", "MJ/(m2 month)", "kVA", "MVA"}

// unitsFor gives the units that can be brought to one, itself first.
func unitsFor(unit string) []string {
	out := []string{unit}
	for _, u := range someUnits {
		if _, err := units.Convert(1, u, unit); err == nil && !slices.Contains(out, u) {
			out = append(out, u)
		}
	}
	return out
}

// unitInName reads a unit off the end of a column's name, as of "rated_kw"; empty where it says none.
func unitInName(column, unit string) string {
	plain := func(s string) string {
		return strings.NewReplacer("/", "_per_", "(", "", ")", "", " ", "_").Replace(strings.ToLower(s))
	}
	best := ""
	for _, u := range unitsFor(unit) {
		if strings.HasSuffix(strings.ToLower(column), "_"+plain(u)) && len(u) > len(best) {
			best = u
		}
	}
	return best
}
