package gen

import (
	"encoding/json"
	"fmt"

	"groundtally/sampledata/manifest"
)

// Seed is the seed of the district that ships.
const Seed uint64 = 2024

// Generate makes every file of the district, by name. The same seed gives the same bytes.
func Generate(seed uint64) (map[string][]byte, error) {
	s, err := makeIsle(seed)
	if err != nil {
		return nil, fmt.Errorf("generate district: %w", err)
	}
	flaws, err := s.pickFlaws()
	if err != nil {
		return nil, fmt.Errorf("generate district: %w", err)
	}
	m := newMapper(s)
	out := map[string][]byte{
		"parcels.geojson":     s.parcelLayer(flaws),
		"dwellings.geojson":   s.dwellingLayer(),
		"roads.geojson":       s.roadLayer(),
		"grid_lines.geojson":  s.gridLayer(),
		"substations.geojson": s.stationLayer(),
		"habitat.geojson":     m.habitatLayer(),
		"heritage.geojson":    s.heritageLayer(),
		"flood.geojson":       m.floodLayer(),
		"farmland.geojson":    m.farmlandLayer(),
		"soil.geojson":        m.soilLayer(),
		"peat.geojson":        m.peatLayer(),
		"land_cover.geojson":  m.coverLayer(),
		"forest.geojson":      s.forestLayer(),
		"water.geojson":       s.waterLayer(),
		"terrain.asc":         s.land.terrainGrid(),
		"LICENCE.txt":         []byte(licenceText),
	}
	s.ruleLayers(out)
	s.windLayers(out)
	year := makeYear(seed)
	out["hourly_weather.csv"] = weatherTable(year)
	out["solar_monthly.csv"] = monthTable(year)
	out["demand.csv"] = demandTable(seed, year)
	if out["settings.csv"], err = settingTable(); err != nil {
		return nil, fmt.Errorf("generate district: %w", err)
	}
	b, err := json.MarshalIndent(describe(flaws), "", " ")
	if err != nil {
		return nil, fmt.Errorf("generate district: write manifest: %w", err)
	}
	out["manifest.json"] = append(b, '\n')
	return out, nil
}

const licenceText = `The Isle of Marram: an invented district.

Everything in this folder is made by the generator in sampledata/gen. No place, person, office or firm is
meant; any likeness is chance. The files are dedicated to the public domain under CC0 1.0 Universal
(https://creativecommons.org/publicdomain/zero/1.0/): use, change and pass them on without asking.
`

// describe lists the files with what a reader must know of them, and the flaws.
func describe(flaws parcelFlaws) manifest.Manifest {
	const (
		registry = "Marram land registry (invented)"
		council  = "Municipality of Marram (invented)"
		power    = "Marram Power (invented)"
		survey   = "Marram ground survey (invented)"
		nature   = "Marram nature office (invented)"
		weather  = "Marram weather station (invented)"
	)
	f := func(path, role, name, holder string) manifest.File {
		return manifest.File{Path: path, Role: role, Name: name, Edition: "2026", Holder: holder}
	}
	with := func(m manifest.File, edit func(*manifest.File)) manifest.File {
		edit(&m)
		return m
	}
	whole := func(m *manifest.File) { m.Complete = true }
	weibull := map[string]string{"height": "m", "weibull_a": "m/s", "weibull_k": "1", "sector_from": "deg", "sector_share": "1"}
	return manifest.Manifest{
		Name:    "Isle of Marram",
		Licence: "CC0 1.0; invented data",
		Files: []manifest.File{
			with(f("district.geojson", "district", "Municipality", council), whole),
			with(f("parcels.geojson", "parcels", "Parcels", registry), func(m *manifest.File) {
				m.Personal = []string{"owner"}
				m.Units = map[string]string{"area_ha": "ha"}
				m.Note = "farmed land and settlements; shore, dunes and roads have no parcel number"
			}),
			with(f("dwellings.geojson", "dwellings", "Dwellings", registry), func(m *manifest.File) {
				m.Complete, m.Personal = true, []string{"address"}
				m.Units = map[string]string{"eaves_height": "m", "households": "1"}
				m.Note = "barns and workplaces have the class not lived in"
			}),
			with(f("roads.geojson", "roads", "Roads", council), func(m *manifest.File) {
				m.Complete, m.Units, m.Note = true, map[string]string{"width": "m"}, "centre lines"
			}),
			with(f("grid_lines.geojson", "grid_lines", "Power lines", power), func(m *manifest.File) {
				m.Complete, m.Units = true, map[string]string{"voltage": "kV", "circuits": "1", "spare_capacity": "kW"}
			}),
			with(f("substations.geojson", "substations", "Substations", power), func(m *manifest.File) {
				m.Complete, m.Units = true, map[string]string{"voltage": "kV", "spare_capacity": "kW", "short_circuit_power": "MVA"}
			}),
			with(f("habitat.geojson", "habitat", "Habitats", nature), whole),
			with(f("heritage.geojson", "heritage", "Listed sites", council), func(m *manifest.File) {
				m.Complete, m.CRS = true, "EPSG:32626"
				m.Note = "older form of GeoJSON with a crs member"
			}),
			with(f("flood.geojson", "flood", "Flood areas", council), func(m *manifest.File) {
				m.Complete, m.Units = true, map[string]string{"return_period": "yr"}
				m.Note = "the area of the rarer flood holds that of the commoner one"
			}),
			with(f("farmland.geojson", "farmland", "Farmland quality", survey), func(m *manifest.File) {
				m.Match, m.Units, m.Note = map[string]string{"quality": "grade"}, map[string]string{"grade": "grade"}, "grade 1 is best, 5 is worst"
			}),
			with(f("soil.geojson", "soil", "Soils", survey), func(m *manifest.File) {
				m.Complete, m.Units = true, map[string]string{"organic_carbon_stock": "t C/ha", "depth": "m"}
				m.Note = "carbon to a depth of 0.3 m; reaches a little past the shore"
			}),
			with(f("peat.geojson", "peat", "Peat depth", survey), func(m *manifest.File) {
				m.Complete, m.Units = true, map[string]string{"depth": "m"}
			}),
			with(f("land_cover.geojson", "land_cover", "Land cover", survey), func(m *manifest.File) {
				m.Complete, m.Note = true, "reaches a little past the shore"
			}),
			with(f("forest.geojson", "forest", "Woods", council), func(m *manifest.File) {
				m.Complete, m.Units = true, map[string]string{"stand_age": "yr", "biomass_dry": "t/ha", "canopy_height": "m"}
			}),
			with(f("water.geojson", "water", "Streams and lakes", council), func(m *manifest.File) {
				m.Complete, m.Units = true, map[string]string{"width": "m"}
			}),
			with(f("water_protection.geojson", "water_protection", "Spring protection", council), whole),
			with(f("exclusion.geojson", "exclusion", "Excluded ground", council), whole),
			with(f("sealed_ground.geojson", "sealed_ground", "Roofs and car parks", council), func(m *manifest.File) {
				m.Complete, m.Personal, m.Note = true, []string{"owner"}, "large roofs, a car park and the closed landfill"
			}),
			with(f("height_limit.geojson", "height_limit", "Airstrip height limits", council), func(m *manifest.File) {
				m.Complete, m.Units = true, map[string]string{"limit_value": "m"}
			}),
			with(f("sensitive.geojson", "sensitive", "Schools and quiet places", council), whole),
			f("place_names.geojson", "place_names", "Place names", council),
			with(f("viewpoints.geojson", "viewpoints", "Given points", council), func(m *manifest.File) {
				m.SwapAxes, m.Units, m.Note = true, map[string]string{"eye_height": "m", "heading": "deg"}, "positions stand as latitude, longitude"
			}),
			with(f("terrain.asc", "terrain", "Ground heights", survey), func(m *manifest.File) {
				m.CRS, m.Complete, m.Units, m.Note = "EPSG:32626", true, map[string]string{"height": "m"}, "bare ground, 25 m cells, no value at sea"
			}),
			with(f("wind_grid.geojson", "wind_resource", "Wind grid", weather), func(m *manifest.File) {
				m.Complete, m.Units, m.Note = true, weibull, "points 1.5 km apart; sector_from is the middle of a sector of 30 degrees"
			}),
			with(f("wind_points.geojson", "wind_resource", "Wind points", weather), func(m *manifest.File) {
				m.Units, m.Note = weibull, "twelve sites; sector_from is the middle of a sector of 30 degrees"
			}),
			with(f("solar_monthly.csv", "solar_resource", "Monthly sunlight", weather), func(m *manifest.File) {
				m.Complete, m.Units = true, map[string]string{"ghi": "kWh/(m2 month)", "dhi": "kWh/(m2 month)", "temperature": "degC", "albedo": "1"}
				m.Note = "sums of the hourly year"
			}),
			with(f("hourly_weather.csv", "hourly_weather", "Hourly year", weather), func(m *manifest.File) {
				m.Complete = true
				m.Units = map[string]string{"time": "UTC", "ghi": "W/m2", "dni": "W/m2", "dhi": "W/m2", "temperature": "degC", "wind_speed": "m/s", "wind_direction": "deg", "wind_height": "m"}
				m.Note = "the stamp is the start of the hour"
			}),
			with(f("demand.csv", "demand", "Hourly demand", power), func(m *manifest.File) {
				m.Complete, m.Units, m.Note = true, map[string]string{"time": "UTC", "load": "kW"}, "38 GWh in the year; the stamp is the start of the hour"
			}),
			f("settings.csv", "settings", "Ordinance, plant options, voices", council),
		},
		Flaws: []manifest.Flaw{
			{File: "parcels.geojson", Feature: flaws.bowTie, What: "the ring crosses itself"},
			{File: "parcels.geojson", Feature: flaws.duplicate, What: "the parcel stands twice, the second time as the last feature"},
			{File: "parcels.geojson", Feature: flaws.noUse, What: "use_class is missing"},
			{File: "grid_lines.geojson", Feature: noVoltageLine, What: "voltage is missing"},
			{File: "viewpoints.geojson", Feature: "all", What: "positions stand as latitude, longitude"},
			{File: "heritage.geojson", Feature: "all", What: "coordinates are metres in EPSG:32626, named in a crs member"},
		},
	}
}
