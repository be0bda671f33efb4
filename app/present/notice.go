package present

import (
	"fmt"
	"math"
	"sort"
	"strconv"
	"strings"

	"groundtally/geo"
)

// sentences gives each notice code its text. Names in braces are arguments.
var sentences = map[string]string{
	"repaired_crossed":               "the outline crosses itself, so its area as delivered is not known. It was repaired, and encloses {area_after_ha} ha now. Check that this is the ground you meant.",
	"repaired":                       "the outline crossed itself or was not closed properly. It was repaired; its area went from {area_before_ha} ha to {area_after_ha} ha.",
	"not_repairable":                 "the outline encloses nothing that can be used. The feature was left out; redraw it or take it out of the file.",
	"duplicate":                      "it has exactly the outline of {of}. It was left out.",
	"same_identifier":                "the identifier stands twice. This one is called {now} here; correct the file if they are one parcel.",
	"missing_value":                  "the value is missing. What depends on it is unknown for this feature.",
	"no_geometry":                    "the feature has no place on the map. It was left out.",
	"wrong_geometry":                 "it is a {kind}, and the role takes {wanted}. It was left out.",
	"layer_apart":                    "the layer ({west} to {east}, {south} to {north}) does not meet the other layers. Check its coordinate system.",
	"not_a_candidate":                "the setting {setting} is not set, so the plant option was not fitted.",
	"inventory_default":              "reckoned with the program's default list of materials and work, not with figures for the machines on offer.",
	"memory_parameter":               "a parameter rests on a value that was not checked against its source (default, unverified).",
	"spare_unknown":                  "the spare capacity of the line or substation is not known; it is assumed that it can take the power. Ask the network operator.",
	"route_straight":                 "the route is the straight distance times a detour factor; no routed length yet.",
	"tracks_laid":                    "new tracks take the cheapest way along buildable ground, around water and buildings, from the nearest road; slopes, bends for long loads and the roads' strength are not looked at.",
	"tracks_rule":                    "the length of new track follows a rule of thumb; the true place of tracks is not known.",
	"may_never":                      "in some of the trials the payback never comes.",
	"median_differs":                 "the median of the trials differs from the central value by more than 2 %.",
	"wakes_of_others":                "turbines of others within 10 km (existing, permitted, and applied for where wind.count_applied says so) take part in the wakes, by the generic curve for their power and rotor; masts keep the spacing across the wind from them.",
	"wakes_of_others_unknown":        "existing or permitted wind plant within 10 km lacks hub height or rotor, has impossible ones, or is drawn as an area: its wakes are not counted.",
	"between_resources":              "wind statistics are taken from several resource points, weighted by the inverse square of their distances.",
	"nearest_resource":               "wind statistics are taken from the nearest resource point.",
	"rayleigh":                       "an even spread of directions and a Rayleigh distribution are assumed from one typed mean speed.",
	"terrain_missing":                "no ground heights: slope rules are not applied and sea level is assumed.",
	"horizon_flat":                   "no ground heights here: the horizon is taken as flat and the ground as level.",
	"sun_not_read":                   "the monthly sunlight is not read: {why}. The yield of panels is unknown where nothing else serves.",
	"sun_hardly":                     "sunlight of {year} kWh/m² in a year on level ground is hardly possible. Check the unit: sums of a day must be multiplied by the days of the month first.",
	"wind_hours_not_read":            "the wind of the hours is not read: {why}.",
	"wind_hours_read":                "wind of the hours: {what}; mean {mean} m/s, shape {shape}; {sectors} directions have too few hours for a fit of their own.",
	"wind_by_hours":                  "wind energy is summed over the hours of a file; the distributions fitted to them serve the layout only, and their energy stands beside.",
	"wind_extrapolated":              "the wind is known at less than two thirds of the hub height, or far above it: how it grows with height decides much, and the spread says so.",
	"wind_far":                       "the nearest wind data lie more than 10 km away.",
	"wind_place_unknown":             "where the wind of the hours was measured is not said (weather.latitude_deg, weather.longitude_deg): its distance counts as far.",
	"wind_hours_missing":             "more than one in twenty hours of the wind file is missing or empty.",
	"wind_calm":                      "more than one in ten hours of the wind file is calm: instruments stand still, or the place is sheltered.",
	"weather_not_read":               "the hours are not read: {why}.",
	"weather_shift":                  "on clear days the light fits the sun best with all times moved by {count} min: their zone, or what they mark (weather.stamp), may be another.",
	"weather_night":                  "{count} intervals have light while the sun is below the horizon: the times or the place may be wrong.",
	"weather_bright":                 "{count} intervals have more light than is possible; their light on level ground was parted anew, which may still be too much.",
	"weather_not_closing":            "in {count} intervals direct and diffuse light do not add up to the light on level ground; that was kept and parted anew.",
	"weather_twice":                  "{count} rows have the time of an earlier row and are left out.",
	"weather_filled":                 "{count} intervals are missing: {short} were filled from the hours around, {long} from the same hour of other days.",
	"weather_negative":               "{count} intervals have light below zero, which counts as none.",
	"weather_leap":                   "{count} intervals of 29 February are left out: a year has 8,760 hours.",
	"horizon_partly":                 "ground heights reach less than 20 km around; beyond them the horizon is taken as no higher than what is seen.",
	"layer_not_complete":             "the layer is not declared complete for the place, so nothing found does not mean that nothing is there.",
	"soil_counted_twice":             "soil carbon counts in more than one weighed consequence.",
	"slope_rule_not_applied":         "the slope rule was not applied because there are no ground heights.",
	"export_limited":                 "the connection takes less than the plant can give; energy is cut off.",
	"curtailment_by_hours":           "the energy cut off is summed over hours of wind and sun together; means of an hour hide peaks, so it is a little too low.",
	"curtailment_bound":              "the energy cut off is a bound from a distribution, not from an hourly file.",
	"voltage_unknown":                "a power line or substation has no voltage and was not used for a connection.",
	"changed_outside":                "the layer was changed by another program after it was added.",
	"soil_counted_in_two":            "soil carbon counts in two weighed consequences.",
	"shape_share":                    "the smallest width or smallest patch took land after the rules.",
	"third_ordinate":                 "heights in the coordinates were not used.",
	"closed_ring":                    "a ring was not closed; it was closed.",
	"nested_value":                   "a nested value was kept as text.",
	"mixed_column":                   "the column holds values of several kinds and was read as text.",
	"geometry_missing":               "no geometry ({count}; features {features}).",
	"geometry_empty":                 "the geometry has no position ({count}; features {features}).",
	"ring_closed":                    "{count} rings were not closed; they were closed (features {features}).",
	"part_too_short":                 "{count} lines of one position or rings of fewer than three were dropped (features {features}).",
	"collection_parted":              "parts of another dimension of a collection were left out (features {features}).",
	"height_left_out":                "heights in the coordinates were not used ({count}).",
	"property_nested":                "a list or object was kept as text ({count}).",
	"number_as_text":                 "a whole number too large to be exact was kept as text ({count}).",
	"column_mixed":                   "the column holds values of several kinds and was read as text.",
	"id_repeated":                    "an identifier stood twice and got a suffix (features {features}).",
	"record_left_out":                "a broken record was left out: {what}.",
	"central_outside":                "the central value lay outside P10 to P90 of the trials, because inputs are uncertain towards one side; low or high was moved to it.",
	"aspect_rule_not_applied":        "the rule on the direction of slopes was not applied because there are no ground heights.",
	"height_limit_needs_terrain":     "height limits above sea level were not applied because there are no ground heights; machines that are too tall may stand there.",
	"rule_excepted":                  "a rule does not hold on this site by the user's word; the reason stands among the exceptions.",
	"plot_unknown":                   "{count} features stand on no parcel, so distances are kept from their own outline and not from their plot.",
	"datum_unknown":                  "the shift between {crs} and WGS 84 is not known to the projection database here, so positions may be off by 100 m and more. Have the layer delivered in another system.",
	"datum_approximate":              "positions in {crs} come to WGS 84 by a shift that is true to {metres} m, without a grid of corrections.",
	"sliver":                         "the polygon is a sliver of {area_m2} m². It is kept; take it out of the delivery if it is a gap between outlines.",
	"has_holes":                      "{count} parcels have holes (features {features}). A hole is no part of a parcel.",
	"parcels_overlap":                "the parcel shares {area_ha} ha with parcel {other}. That ground counts for both.",
	"more_overlaps":                  "{count} more pairs of parcels overlap.",
	"consents_kept":                  "{count} consents of owners were kept from the edition before.",
	"hand_edit_lost":                 "a change by hand ({verb}; {reason}) finds its feature no longer. Make it again if it is still wanted.",
	"drawn_repaired_crossed":         "the drawn outline crosses itself, so its area is not known. It was repaired, and encloses {area_after_ha} ha now. Undo takes it back.",
	"drawn_repaired":                 "the drawn outline crossed itself or was not closed properly. It was repaired; its area went from {area_before_ha} ha to {area_after_ha} ha. Undo takes it back.",
	"hand_value_new":                 "no other feature has the value {value}; the values here are: {there}. Check that it is meant.",
	"only_value_absent":              "no feature has the value {value} that was asked for. The values here are: {there}.",
	"except_no_rule":                 "the exception has no effect: there is no rule {rule}; {rules}. Take it out, or name the right rule.",
	"except_no_site":                 "the exception has no effect: {what}. Take it out, or name the right site.",
	"except_rule_idle":               "the exception has no effect as things are: the rule ({rule}) is not in force, or has no layer.",
	"except_no_parcels":              "there are no parcels yet; the exception holds once there is a site {site}.",
	"setting_no_layer":               "the study has no layer of {role} yet, so the setting has no effect until one is added.",
	"setting_only_raster":            "what the study has of {role} is a raster or a table, which has no outlines, so the setting has no effect.",
	"setting_no_class":               "no feature has the class {class}, so the setting has no effect there. Classes of {role} here: {there}.",
	"setting_no_voltage":             "nothing has {kv} kV or more, so the setting has no effect. Voltages of {role} here: {there}.",
	"setting_voltage_taken":          "whatever has {kv} kV or more falls under the distance from {above} kV, so the setting has no effect. Voltages of {role} here: {there}.",
	"ring_repeated":                  "{count} rings stood twice in their shape; one was left out (features {features}).",
	"measure_left_out":               "measures along the shapes were not used ({count}).",
	"record_deleted":                 "{count} rows are marked as deleted; they were left out with their shapes.",
	"record_longer":                  "the record is longer than its shape needs; check the feature (features {features}).",
	"length_disagrees":               "by its header the .shp has {header} bytes, and it has {file}.",
	"index_broken":                   "the .shx was not used: {what}. The records were read one after the other.",
	"attributes_missing":             "there is no .dbf, so the features have numbers and no attributes.",
	"rows_disagree":                  "there are {shapes} shapes and {rows} rows of attributes; they were joined by number.",
	"encoding_assumed":               "nothing says how the text is encoded; {encoding} was taken.",
	"encoding_doubtful":              "the set says that its text is in {encoding}; it looks like UTF-8.",
	"encoding_unknown":               "the encoding is not known here: {what}.",
	"text_unreadable":                "{count} texts hold characters that are none in {encoding}.",
	"column_type_left_out":           "a column of type {type} cannot be read and was left out.",
	"date_as_written":                "{count} dates are none and were kept as they stand.",
	"cell_error":                     "{count} cells hold an error such as #N/A and have no value.",
	"formula_without_value":          "{count} formulas have no stored result. Open the workbook, save it, and add it again.",
	"time_in_days":                   "{count} lengths of time are given in days.",
	"cells_merged":                   "{count} groups of merged cells; the value stands in the first cell of each.",
	"sheet_chosen":                   "sheet {sheet} was read; there are {sheets}.",
	"geometry_unreadable":            "{count} geometries cannot be read; these features were left out ({features}): {what}.",
	"geometry_curved":                "{count} curved geometries were left out ({features}). Convert them to straight lines first.",
	"edits_unmerged":                 "another program has edits in {beside}. They were read; close the file there if they are not final.",
	"edits_not_read":                 "edits in {beside} could not be read. Close the file in the other program, or copy it into a folder of your own.",
	"table_not_there":                "the file lists this table, and it is not there or cannot be read.",
	"reference_system_missing":       "the coordinate system {number} is named and not described. Say which it is.",
	"reference_system_differs":       "{count} geometries name another coordinate system than their table ({table}); the table's was taken.",
	"column_left_out":                "the column holds binary data and was left out.",
	"value_unfit":                    "{count} of the values in column {column} do not fit the field; the first: {error}. Check that it is the right column and unit, or mend the values.",
	"value_left_out":                 "{count} binary values were read as missing.",
	"number_not_finite":              "{count} infinite numbers were read as missing.",
	"text_not_utf8":                  "{count} texts held bytes that are no characters; they were replaced.",
	"no_key":                         "the table has no primary key; its rows are called by their numbers.",
	"application_number":             "the file does not carry the mark of a GeoPackage ({number}); it was told by its tables.",
	"bands_left_out":                 "{count} of {of} bands were not read; the first one was.",
	"blocks_left_out":                "{count} blocks of the grid are left out of the file and count as missing; other programs may take them as zero.",
	"crs_not_stated":                 "the file does not say its coordinate system. Choose it.",
	"crs_user_defined":               "the file describes a coordinate system of its own, without a code: {citation}. Choose it.",
	"digits_lost":                    "{count} whole numbers are too large to be kept exactly; their last digits were rounded.",
	"horizontal_unit":                "the file says that its coordinates are in {unit}.",
	"images_left_out":                "the file has {count} further images, which were not read.",
	"mask_left_out":                  "the file has a mask of valid cells, which was not used.",
	"metadata_unreadable":            "the file's notes on scale and unit cannot be read; values were taken as they stand.",
	"nodata_not_stated":              "the file names no number for missing cells, but {count} cells hold {value}. Check whether they mean missing.",
	"nodata_unreadable":              "the number for missing cells cannot be read: {value}.",
	"values_infinite":                "{count} cells are infinite or too large and count as missing.",
	"values_not_metres":              "values are in {unit} of {metres} m and were not changed.",
	"values_scaled":                  "values were multiplied by {scale}, then {offset} was added, as the file asks.",
	"values_to_metres":               "values in {unit} were turned into metres.",
	"values_with_colours":            "each number has a colour: kinds of land cover, or a scanned map.",
	"vertical_unit_unknown":          "the unit of the values, {unit}, is not known here.",
	"exclusion_needs_width":          "an excluded line or point has no width and takes no land. Set a setback for it.",
	"height_unknown":                 "the height of the place is not known; sea level is assumed.",
	"rule_without_layer":             "a rule is set and its layer is not there, so the rule took no land.",
	"same_parcel_twice":              "the parcel's identifier stands in more than one layer. This one is called {now} here; take one of them out if they are one parcel.",
	"spacing_beyond_site":            "the spacing that a turbine needs reaches beyond the site.",
	"decimal_comma":                  "numbers are written with a decimal comma and were read so.",
	"grid_voids":                     "{voids} of the {count} cells of the grid inside {of} have no value, {area_ha} ha in all. What rests on them is unknown there; they are not filled.",
	"grid_apart":                     "no cell of the grid has its middle inside {of}. Check its coordinate system.",
	"mostly_missing":                 "{count} of {of} cells of the grid have no value. Check that the file is the right one.",
	"nodata_assumed":                 "the file does not say which number stands for a missing value; {value} was taken.",
	"column_repeated":                "the column name {name} stands twice; the later column got a suffix.",
	"leading_zeros":                  "numbers with leading zeros were kept as text, so that identifiers stay whole ({count}).",
	"column_not_numbers":             "{count} values are no numbers while {numbers} are, so the column was read as text. Correct them if it holds quantities.",
	"crs_not_understood":             "the coordinate system of the file was not understood: {what}.",
	"layer_empty":                    "the file has no feature.",
	"coordinates_not_degrees":        "the coordinates are not degrees. Say in which coordinate system they are, with --crs.",
	"peat_touched":                   "the plant stands on mapped peat. Peat raises a flag whatever the score.",
	"soil_by_class":                  "soil carbon is the guidelines' reference stock for the climate zone and soil class (climate.zone, climate.soil_method), as the soil layer gives no stock; such stocks are off by up to 90 %.",
	"old_habitat_touched":            "the plant touches habitat that the layer calls irreplaceable. It raises a flag whatever the score.",
	"default_decides":                "place {place} hangs on a row of the shipped inventory: with {row} at about {at} {unit} in place of {central} (its range is {low} to {high}), all else the same, {below} would come before {above}. Enter a value of your own if you have one.",
	"return_scale":                   "{first} stands first because a ratio of energy return is weighed on a straight scale; with the share left after repayment (net_share) in its place {other} would be first.",
	"family_twice":                   "this voice also weighs {other}, which counts the same event ({family}). The reason that was given: {reason}.",
	"role_missing":                   "no such layer yet. Without it: {without}. Usual holder: {holder}.",
	"legal_not_set":                  "not set. {what}",
	"missing_field":                  "no column gives this field. What depends on it is unknown.",
	"parcels_numbered":               "no column holds the parcels' identifiers, so they are called by their numbers in the file. Name the column with --match parcel_id=COLUMN if there is one.",
	"group_parcel_missing":           "the site {site} names this parcel, and no layer holds it. The site is smaller than it was meant to be.",
	"no_parcels":                     "the study has no parcels yet. Add them as a layer of that role.",
	"no_plants":                      "the study has no plant option yet. Make one, as plant.wind with the technology wind.",
	"voice_unusable":                 "{error}",
	"wind_hub_above_surface_layer":   "the hub stands above 150 m, where the power law is an extrapolation.",
	"wind_hub_far_from_reference":    "the hub is over twice, or under half, the height of the wind statistics.",
	"wind_ct_estimated":              "no thrust is published for the machine; it was estimated after Frandsen.",
	"wind_spacing_below_3_rotors":    "machines stand nearer than three rotors, for which wake models are not meant.",
	"wind_turbulence_outside_fit":    "the turbulence lies outside the range for which the wake growth was fitted.",
	"wind_blockage_not_modelled":     "blockage by the farm as a whole is not modelled.",
	"wind_small_total_loss":          "one total loss stands for the loss categories of small machines.",
	"wind_curve_exceeds_rated_power": "the published curve rises above rated power.",
	"layout_idle":                    "turbines are placed by hand on {site} for the plant option {plant}, and the site or the option is gone. They are kept; place them anew, or take them out with gtally place and --own.",
	"turbine_above_rated":            "the power curve of {turbine} reaches {kw} kW at {speed} m/s, above its rated power of {rated} kW. It is used as it stands.",
	"turbine_below_rated":            "the power curve of {turbine} reaches no more than {kw} kW, and its rated power is {rated} kW. Check both.",
	"turbine_power_falls":            "the power curve of {turbine} falls from {from} kW at {slower} m/s to {to} kW at {faster} m/s, before rated power is reached. Check these rows.",
	"turbine_starts_late":            "the power curve of {turbine} begins at {speed} m/s with {kw} kW; in less wind the machine counts as standing still. Add the speeds down to cut-in.",
	"turbine_ends_early":             "the power curve of {turbine} has power up to {speed} m/s; in more wind the machine counts as standing still. Add the speeds up to cut-out if it runs on.",
	"turbine_no_thrust":              "the power curve of {turbine} has no thrust coefficients, so wakes rest on an estimate after Frandsen, which is on the safe side above rated power.",
	"turbine_thrust_clipped":         "thrust coefficients of {turbine} above {most} ({count}, the first at {speed} m/s) are used as {most}: wake formulas have no solution above it.",
	"turbine_uneven_steps":           "the steps between the speeds of the power curve of {turbine} are uneven, from {least} to {most} m/s; between the speeds power is taken as a straight line.",
}

// Notice writes a notice as: where, what, what the program did or what the user can do.
func Notice(n geo.Notice) string {
	var where []string
	if n.Layer != "" {
		where = append(where, n.Layer)
	} else if n.File != "" {
		where = append(where, n.File)
	}
	if n.Feature != "" {
		where = append(where, "feature "+n.Feature)
	}
	if n.Field != "" {
		where = append(where, "field "+n.Field)
	}
	if n.Line > 0 {
		where = append(where, fmt.Sprintf("line %d", n.Line))
	}
	if n.At != nil {
		where = append(where, "near "+Place(*n.At))
	}
	text := Sentence(n.Code, n.Args)
	if len(where) == 0 {
		return text
	}
	return strings.Join(where, ", ") + ": " + text
}

// Sentence writes the text of a code with its arguments. A code without a text is shown as it is,
// with its arguments, so that nothing is hidden.
func Sentence(code string, args map[string]string) string {
	s, ok := sentences[code]
	if !ok {
		keys := make([]string, 0, len(args))
		for k := range args {
			keys = append(keys, k)
		}
		sort.Strings(keys)
		parts := []string{strings.ReplaceAll(code, "_", " ")}
		for _, k := range keys {
			parts = append(parts, k+" "+args[k])
		}
		return strings.Join(parts, "; ")
	}
	for k, v := range args {
		if deg, err := strconv.ParseFloat(v, 64); err == nil {
			switch k { // the sides of a layer, kept as signed degrees
			case "west", "east":
				v = Longitude(deg)
			case "south", "north":
				v = Latitude(deg)
			}
		}
		s = strings.ReplaceAll(s, "{"+k+"}", v)
	}
	return s
}

// Place writes a position in degrees with the letters of its half of the world in place of signs.
func Place(p geo.LonLat) string { return Latitude(p.Lat) + ", " + Longitude(p.Lon) }

// Latitude writes degrees north or south.
func Latitude(deg float64) string { return half(deg, "N", "S") }

// Longitude writes degrees east or west.
func Longitude(deg float64) string { return half(deg, "E", "W") }

func half(deg float64, above, below string) string {
	if deg < 0 {
		above = below
	}
	return fmt.Sprintf("%.5f %s", math.Abs(deg), above)
}
