package study

import (
	"fmt"
	"math"
	"slices"
	"sort"
	"strconv"
	"strings"
	"unicode"

	"groundtally/geo"
	"groundtally/scoring/units"
)

// roleWords are parts of file names and columns, in several languages, by which a role is proposed. A
// proposal is shown and never taken without the user's word. Source: common practice.
var roleWords = map[string][]string{
	"parcels":          {"parcel", "parzell", "cadastr", "kadaster", "kataster", "flurst", "lots", "plots", "parcela", "particelle", "candidate_land", "grundst"},
	"district":         {"district", "boundary", "municipal", "gemeinde", "commune", "municipio", "comune", "grenze", "limites_admin", "admin", "border"},
	"dwellings":        {"dwelling", "building", "house", "gebaeude", "gebäude", "wohn", "home", "batiment", "bâtiment", "edificio", "edifici", "address", "hauskoord", "bygning", "gebouw"},
	"roads":            {"road", "street", "highway", "strasse", "straße", "route", "carretera", "ways", "strade", "wegen", "veje"},
	"grid_lines":       {"power_line", "powerline", "grid_line", "gridline", "cable", "leitung", "ligne_elec", "freileitung", "linea_elec", "transmission", "hoogspanning"},
	"substations":      {"substation", "transformer", "umspann", "poste_elec", "poste_source", "subestacion", "cabina_prim", "onderstation"},
	"existing_plant":   {"existing", "permitted", "existing_plant", "turbine", "windrad", "eolien", "éolien", "aerogenerador", "anlagenregister", "plant_register"},
	"exclusion":        {"exclusion", "exclude", "excluded", "ausschluss", "no_go", "restricted", "prohibited"},
	"habitat":          {"habitat", "biotop", "protected", "natura", "schutzgebiet", "reserve", "ffh", "bird_area"},
	"forest":           {"forest", "wood", "wald", "foret", "forêt", "bosque", "bosco", "bos_"},
	"farmland":         {"farm", "field", "farmland", "agric", "acker", "feldblock", "crop", "arable", "cultiv"},
	"water":            {"water", "river", "lake", "gewaesser", "gewässer", "cours_d_eau", "hydro", "fluss", "rio_", "acqua"},
	"water_protection": {"water_protection", "wasserschutz", "wasserschutzgebiet", "captage", "well_protection"},
	"flood":            {"flood", "hochwasser", "ueberschwemm", "überschwemm", "inond", "inundacion", "overstrom"},
	"heritage":         {"heritage", "monument", "denkmal", "patrimoine", "patrimonio", "listed"},
	"sensitive":        {"school", "hospital", "sensitive", "schule", "ecole", "école", "cemetery", "friedhof"},
	"soil":             {"soil", "boden", "sol_", "suelo", "suolo", "bodem"},
	"peat":             {"peat", "bog", "moor", "torf", "tourb", "turba", "veen"},
	"land_cover":       {"land_cover", "landcover", "landuse", "land_use", "cover", "clc", "bodenbedeckung", "occupation_sol"},
	"terrain":          {"terrain", "dem", "dtm", "dgm", "elevation", "height", "hoehen", "höhen", "mnt", "altitud"},
	"surface_heights":  {"dsm", "dom", "surface", "canopy", "surface_height", "mns", "canopy_height"},
	"height_limit":     {"height_limit", "obstacle", "aviation", "bauhoehe", "airport", "flight", "radar"},
	"wind_resource":    {"wind", "wind_resource", "wind_speed", "windatlas", "wind_atlas", "weibull"},
	"solar_resource":   {"solar_resource", "solar", "sun", "radiation", "ghi", "irradiation", "sunlight", "globalstrahlung", "ensoleillement"},
	"hourly_weather":   {"hourly", "weather", "tmy", "stundenwerte"},
	"demand":           {"demand", "load", "load_profile", "lastgang", "consumption", "verbrauch"},
	"place_names":      {"place_name", "toponym", "ortsnamen", "lieux", "names"},
	"corridors":        {"corridor", "pipeline", "railway", "rail", "bahn", "gasleitung"},
	"sealed_ground":    {"sealed", "roof", "parking", "car_park", "landfill", "dach"},
	"designated":       {"designated", "zone", "planned"},
	"viewpoints":       {"viewpoint", "views"},
	"access_points":    {"access", "gates"},
	"backdrop":         {"backdrop", "aerial", "ortho"},
}

// ProposeRole proposes what a file means here, from its name; of several words the longest counts, so that
// water_protection is no water. It is empty when no word fits that the file's kind allows.
func ProposeRole(cat *Catalog, in Import) string {
	role, _ := ProposedRole(cat, in)
	return role
}

// ProposedRole is ProposeRole with the word of the file's name from which the role follows.
func ProposedRole(cat *Catalog, in Import) (role, word string) {
	name := strings.ToLower(strings.TrimSuffix(in.Base, ext(in.Base)))
	name = strings.Map(func(r rune) rune {
		if unicode.IsLetter(r) || unicode.IsDigit(r) {
			return r
		}
		return '_'
	}, name) + "_"
	kinds := map[string]bool{}
	switch {
	case in.Layer == nil:
		kinds["raster"] = true
	default:
		for _, f := range in.Layer.Features {
			kinds[f.Geometry.Kind.String()] = true
		}
		if kinds["none"] && len(kinds) == 1 {
			kinds["table"] = true
		}
	}
	for _, r := range cat.Roles {
		if !slices.ContainsFunc(r.Geometry, func(k string) bool { return kinds[k] }) {
			continue
		}
		for _, w := range roleWords[r.Name] {
			if len(w) > len(word) && strings.Contains(name, w) {
				role, word = r.Name, w
			}
		}
	}
	return role, word
}

// voltsFromKV is a number from which on a voltage can only be volts. Source: common practice, no line in
// service is above 1,200 kV.
const voltsFromKV = 1300

// ProposeUnit proposes the unit of a column for a field: the one at the end of the column's name, as of
// "rated_kw", or volts where the numbers are too great for kilovolts; else the field's own. why says what it
// follows from; it is empty for the field's own.
func ProposeUnit(l *geo.Layer, column string, f RoleField) (unit, why string) {
	plain := func(s string) string {
		return strings.NewReplacer("/", "_per_", "(", "", ")", "", " ", "_").Replace(strings.ToLower(s))
	}
	for _, u := range units.Alike(f.Unit) {
		if strings.HasSuffix(strings.ToLower(column), "_"+plain(u)) && len(u) > len(unit) {
			unit, why = u, "the column's name ends so"
		}
	}
	if unit != "" {
		return unit, why
	}
	if f.Unit == "kV" {
		if lo, hi, ok := span(l, column); ok && hi > voltsFromKV {
			return "V", fmt.Sprintf("its numbers run from %g to %g", lo, hi)
		}
	}
	return f.Unit, ""
}

func span(l *geo.Layer, column string) (lo, hi float64, ok bool) {
	c := l.ColumnIndex(column)
	if c < 0 {
		return 0, 0, false
	}
	lo, hi = math.Inf(1), math.Inf(-1)
	for _, f := range l.Features {
		if x, is := f.Values[c].Float(); is {
			lo, hi, ok = math.Min(lo, x), math.Max(hi, x), true
		}
	}
	return lo, hi, ok
}

// Remember takes over what the user said earlier of the same columns of the same role: of the layer that is
// replaced first, then of the others. What is said now stands before it.
func Remember(in *Import, role Role, snap *Snapshot) {
	if in.Layer == nil {
		return
	}
	match, unit := map[string]string{}, map[string]string{}
	layers := snap.LayersOf(role.Name)
	sort.SliceStable(layers, func(i, j int) bool { return layers[i].Name == in.Replace && layers[j].Name != in.Replace })
	for _, l := range layers {
		for field, col := range l.Match {
			if match[field] == "" && in.Layer.ColumnIndex(col) >= 0 {
				match[field] = col
			}
		}
		for col, u := range l.Units {
			if unit[col] == "" && in.Layer.ColumnIndex(col) >= 0 {
				unit[col] = u
			}
		}
	}
	for field, col := range in.Match {
		match[field] = col
	}
	for col, u := range in.Units {
		unit[col] = u
	}
	in.Match, in.Units = match, unit
}

// Wanted is a part of a file's features that the user asks for: those whose column holds one of the values.
type Wanted struct {
	Column string   `json:"column"`
	Values []string `json:"values"`
}

// ParseWanted reads COLUMN=VALUE|VALUE.
func ParseWanted(text string) (Wanted, error) {
	col, values, ok := strings.Cut(text, "=")
	if !ok || strings.TrimSpace(col) == "" || strings.TrimSpace(values) == "" {
		return Wanted{}, fmt.Errorf("%q is not COLUMN=VALUE or COLUMN=VALUE|VALUE", text)
	}
	w := Wanted{Column: strings.TrimSpace(col)}
	for _, v := range strings.Split(values, "|") {
		w.Values = append(w.Values, strings.TrimSpace(v))
	}
	return w, nil
}

// absent tells of each wanted value that no feature has, while others are there.
func absent(l *geo.Layer, wanted []Wanted) []geo.Notice {
	var out []geo.Notice
	for _, w := range wanted {
		there := otherValues(l, l.ColumnIndex(w.Column))
		for _, v := range w.Values {
			if !slices.ContainsFunc(there, func(t string) bool { return strings.EqualFold(t, v) }) {
				out = append(out, geo.Notice{Code: "only_value_absent", Severity: geo.Warning, Field: w.Column, Args: map[string]string{"value": v, "there": few(there, 20)}})
			}
		}
	}
	return out
}

// only keeps the features that fit at least one of the wanted parts, and counts the others.
func only(l *geo.Layer, wanted []Wanted) (left int) {
	if len(wanted) == 0 {
		return 0
	}
	kept := l.Features[:0:0]
	for _, f := range l.Features {
		if slices.ContainsFunc(wanted, func(w Wanted) bool {
			return slices.ContainsFunc(w.Values, func(v string) bool { return strings.EqualFold(v, f.Values[l.ColumnIndex(w.Column)].String()) })
		}) {
			kept = append(kept, f)
		}
	}
	left = len(l.Features) - len(kept)
	l.Features = kept
	return left
}

// degreesAsMetres asks about a layer whose system has metres and whose coordinates look like degrees. The
// user's own word on the system is not doubted.
func degreesAsMetres(rec *LayerRecord, in Import, l *geo.Layer, transform func(geo.LonLat) (geo.LonLat, error)) *Question {
	if in.CRSOption != "" {
		return nil
	}
	if _, bad := outOfDegrees(l); bad {
		return nil
	}
	for _, f := range l.Features {
		if f.Geometry.Empty() {
			continue
		}
		p := anyPosition(f.Geometry)
		q, err := transform(p)
		if err == nil && math.Abs(q.Lon-p.Lon) < 1 && math.Abs(q.Lat-p.Lat) < 1 {
			return nil // a system of degrees
		}
		return &Question{Text: fmt.Sprintf("the file says %s, whose coordinates are metres, but they look like degrees (%s, %s); which system is it?", CRSWords(rec.CRS), strconv.FormatFloat(p.Lon, 'g', 8, 64), strconv.FormatFloat(p.Lat, 'g', 8, 64)),
			Option: "--crs OGC:CRS84 for longitude and latitude, or --crs " + code(rec.CRS) + " if they are metres indeed"}
	}
	return nil
}

// code gives a coordinate system as it can be typed; a definition stands for a code that the user must find.
func code(crs string) string {
	if strings.Contains(crs, "[") {
		return "AUTH:CODE, the code of that system,"
	}
	return crs
}

// Sizes below which a polygon is no piece of land but a gap between two outlines.
const (
	sliverM2 = 10
	sliverM  = 0.5 // mean width: twice the area by the length of the outline
)

// parcelChecks looks at parcels as a whole: slivers, holes, overlaps.
func parcelChecks(rec *LayerRecord, layer *geo.Layer, flat []geo.XYGeometry, measure func(geo.XYGeometry) (areaM2, lengthM float64), tools Tools, note func(geo.Notice)) error {
	holes, first := 0, []string{}
	for i, f := range layer.Features {
		area, length := measure(flat[i])
		if area < sliverM2 || 2*area/length < sliverM {
			at := anyPosition(f.Geometry)
			note(geo.Notice{Code: "sliver", Severity: geo.Warning, Feature: f.ID, At: &at, Args: map[string]string{"area_m2": strconv.FormatFloat(area, 'f', 1, 64)}})
		}
		if slices.ContainsFunc(f.Geometry.Parts, func(rings [][]geo.LonLat) bool { return len(rings) > 1 }) {
			if holes++; len(first) < 5 {
				first = append(first, f.ID)
			}
		}
	}
	if holes > 0 {
		note(geo.Notice{Code: "has_holes", Severity: geo.Info, Args: map[string]string{"count": strconv.Itoa(holes), "features": strings.Join(first, ", ")}})
	}
	list, err := tools.Overlaps(flat, sliverM2)
	if err != nil {
		return err
	}
	for n, o := range list {
		if n == maxOverlaps {
			note(geo.Notice{Code: "more_overlaps", Severity: geo.Warning, Args: map[string]string{"count": strconv.Itoa(len(list) - n)}})
			break
		}
		at := anyPosition(layer.Features[o.I].Geometry)
		note(geo.Notice{Code: "parcels_overlap", Severity: geo.Warning, Feature: layer.Features[o.I].ID, At: &at, Args: map[string]string{
			"other": layer.Features[o.J].ID, "area_ha": strconv.FormatFloat(o.AreaM2/units.M2PerHa, 'f', 4, 64)}})
	}
	return nil
}

// maxOverlaps is how many overlapping pairs are listed one by one.
const maxOverlaps = 50
