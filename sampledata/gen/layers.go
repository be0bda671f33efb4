package gen

import (
	"bytes"
	"fmt"
	"math"
	"slices"
	"strconv"

	"groundtally/geo"
	"groundtally/scoring/units"
)

const ordinance = "Marram ordinance 2024 (invented)"

// parcelFlaws are the parcels that are spoilt on purpose.
type parcelFlaws struct{ bowTie, duplicate, noUse string }

// slopeAt gives the steepness at p as rise over run, over 60 m to either side.
func (g *land) slopeAt(p geo.XY) float64 {
	dx := g.ground(geo.XY{X: p.X + 60, Y: p.Y}) - g.ground(geo.XY{X: p.X - 60, Y: p.Y})
	dy := g.ground(geo.XY{X: p.X, Y: p.Y + 60}) - g.ground(geo.XY{X: p.X, Y: p.Y - 60})
	return math.Hypot(dx, dy) / 120
}

// mapper classes the ground for the layers.
type mapper struct {
	*isle
	n       noise
	water   *segments
	parcelX *segments
	boxes   []geo.Extent
	ext     geo.Extent
}

func newMapper(s *isle) *mapper {
	m := &mapper{isle: s, n: newNoise(s.seed, "ground"), water: newSegments(300), parcelX: newSegments(300), ext: geo.Extent{MinX: -12300, MinY: -7800, MaxX: 12300, MaxY: 7800}}
	for _, w := range s.land.streams {
		m.water.addLine(w.line, 0)
	}
	for i, p := range s.parcels {
		b := geo.EmptyExtent()
		for _, q := range p.ring {
			b = b.Add(q)
		}
		m.boxes = append(m.boxes, b)
		m.parcelX.add(geo.XY{X: b.MinX, Y: b.MinY}, geo.XY{X: b.MaxX, Y: b.MaxY}, i)
	}
	return m
}

// parcelAt gives the index of the parcel at p, -1 where there is none.
func (m *mapper) parcelAt(p geo.XY) int {
	for _, k := range m.parcelX.near(geo.Extent{MinX: p.X, MinY: p.Y, MaxX: p.X, MaxY: p.Y}) {
		i := m.parcelX.tag[k]
		if b := m.boxes[i]; p.X >= b.MinX && p.X <= b.MaxX && p.Y >= b.MinY && p.Y <= b.MaxY && inRing(p, m.parcels[i].ring) {
			return i
		}
	}
	return -1
}

// ashore moves a point that lies a little off the shore on to land; ok is false farther out.
func (m *mapper) ashore(p geo.XY) (geo.XY, bool) {
	d := m.land.inland.at(p)
	if d >= 0 {
		return p, true
	}
	if d < -130 {
		return p, false
	}
	s := m.land.inland.slope(p)
	return shift(p, unit(geo.XY{}, s), 45-d), true
}

// peatM is the depth of peat in metres: deep on the flat top of the moss, none on its flanks.
func (m *mapper) peatM(p geo.XY) float64 {
	h := m.land.ground(p)
	if h < 185 {
		return 0
	}
	d := float64(3.9*step01(195, 290, h)*step01(0.19, 0.03, m.land.slopeAt(p))) + float64(0.9*m.n.fractal(p, 900, 3))
	return math.Max(0, d)
}

func (m *mapper) dune(p geo.XY) bool {
	d, _ := lineNearest(p, duneLine)
	return d < 400+float64(110*m.n.at(p, 420))
}

func (m *mapper) flats(p geo.XY) bool {
	d, _ := lineNearest(p, flatsLine)
	return d < 230+float64(60*m.n.at(p, 350))
}

// Soil classes with carbon in the upper 30 cm, t C/ha: the order of magnitude of the reference stocks of
// a cool temperate moist climate (IPCC 2019 Refinement, volume 4, table 2.3), varied by class.
var soils = []struct {
	class string
	stock float64
}{{"blanket peat", 159}, {"peaty gley", 138}, {"podzol", 118}, {"brown earth", 78}, {"gley", 96}, {"river alluvium", 88}, {"marsh clay", 84}, {"dune sand", 18}}

func (m *mapper) soil(p geo.XY) int {
	p, ok := m.ashore(p)
	if !ok {
		return -1
	}
	h, d := m.land.ground(p), 0.0
	d, _ = m.water.nearest(p, 90)
	switch {
	case m.peatM(p) > 0.5:
		return 0
	case m.dune(p):
		return 7
	case m.flats(p):
		return 6
	case m.land.aboveRiver(p) < 4.5 || d < 80 && h < 90:
		return 5
	case h > 165:
		return 1
	case h > 82+float64(55*m.n.at(p, 1700)):
		return 2
	case m.n.fractal(geo.XY{X: p.X, Y: p.Y + 30000}, 1500, 3) > 0.42 && m.land.slopeAt(p) < 0.05:
		return 4
	}
	return 3
}

func (m *mapper) grade(p geo.XY) int {
	i := m.parcelAt(p)
	if i < 0 {
		return -1
	}
	switch m.parcels[i].use {
	case "built up", "wood", "moor", "garden":
		return -1
	}
	h := m.land.ground(p)
	q := 2.2 + float64(h/62) + float64(9*m.land.slopeAt(p)) + float64(1.15*m.n.fractal(geo.XY{X: p.X + 9000, Y: p.Y}, 2100, 3))
	if m.land.aboveRiver(p) < 6 {
		q -= 1.1
	}
	return int(clamp(math.Round(q), 1, 5))
}

var covers = []string{"arable", "grassland", "moorland", "bog", "wood", "open water", "built up", "dune", "saltmarsh", "coastal grassland"}

func (m *mapper) cover(p geo.XY) int {
	p, ok := m.ashore(p)
	if !ok {
		return -1
	}
	if m.land.inLake(p) {
		return 5
	}
	if m.peatM(p) > 1.2 {
		return 3
	}
	if i := m.parcelAt(p); i >= 0 {
		switch m.parcels[i].use {
		case "arable":
			return 0
		case "moor":
			return 2
		case "rough grazing":
			if m.n.at(p, 500) > 0.1 {
				return 2
			}
			return 1
		case "wood":
			return 4
		case "built up":
			return 6
		}
		return 1
	}
	switch {
	case m.dune(p):
		return 7
	case m.flats(p):
		return 8
	case town.at.Dist(p) < town.reachM:
		return 6
	}
	return 9
}

func (s *isle) parcelLayer(f parcelFlaws) []byte {
	c := &collection{}
	write := func(p parcel) {
		props := []prop{{"parcel_id", p.id}, {"use_class", p.use}, {"owner_consent", p.consent}, {"consent_date", nil}, {"owner", p.owner}, {"site_group", nil}, {"area_ha", round(p.areaHa, 2)}}
		if p.id == f.noUse {
			props[1].value = nil
		}
		if p.date != "" {
			props[3].value = p.date
		}
		if p.siteGroup != "" {
			props[5].value = p.siteGroup
		}
		if p.id == f.bowTie {
			c.begin("Polygon", props)
			c.buf.WriteByte('[')
			c.positions(bowTie(p.ring), true)
			c.buf.WriteString("]}}")
			return
		}
		c.polygon(p.ring, nil, props...)
	}
	var again parcel
	for _, p := range s.parcels {
		write(p)
		if p.id == f.duplicate {
			again = p
		}
	}
	write(again)
	return c.bytes()
}

// bowTie swaps two neighbouring corners of a ring so that it crosses itself; the first swap that does.
func bowTie(r []geo.XY) []geo.XY {
	for i := range r {
		out := append([]geo.XY(nil), r...)
		j := (i + 1) % len(r)
		out[i], out[j] = out[j], out[i]
		if !simpleRing(out) && r[i].Dist(r[j]) > 60 {
			return out
		}
	}
	return r
}

// pickFlaws chooses the parcels to spoil: middling fields well apart from one another.
func (s *isle) pickFlaws() (parcelFlaws, error) {
	var ids []string
	for i := 150; i < len(s.parcels) && len(ids) < 3; i++ {
		p := s.parcels[i]
		if p.areaHa > 6 && p.areaHa < 25 && (p.use == "arable" || p.use == "pasture") && p.siteGroup == "" && !simpleRing(bowTie(p.ring)) {
			ids = append(ids, p.id)
			i += 260
		}
	}
	if len(ids) < 3 {
		return parcelFlaws{}, fmt.Errorf("pick flaws: only %d parcels fit", len(ids))
	}
	return parcelFlaws{ids[0], ids[1], ids[2]}, nil
}

func (s *isle) dwellingLayer() []byte {
	c := &collection{}
	for _, d := range s.dwellings {
		props := []prop{{"dwelling_id", d.id}, {"class", d.class}, {"households", d.households}, {"group", d.group}, {"address", nil}, {"eaves_height", nil}}
		if d.address != "" {
			props[4].value = d.address
		}
		if d.eavesM > 0 {
			props[5].value = d.eavesM
		}
		c.point(d.at, props...)
	}
	return c.bytes()
}

func (s *isle) roadLayer() []byte {
	c := &collection{}
	for _, r := range s.roads {
		class := r.class
		if class == "street" {
			class = "lane"
		}
		props := []prop{{"class", class}, {"width", r.widthM}, {"surface", r.surface}, {"name", nil}}
		if r.name != "" {
			props[3].value = r.name
		}
		c.line(r.line, props...)
	}
	return c.bytes()
}

// The two substations and the way of the 33 kV ring between them.
var (
	southStation = km(-1.95, -4.75)
	northStation = km(2.35, 0.95)
	ringLegs     = []struct {
		name  string
		spare int
		way   []geo.XY
	}{
		{"Ring west, Saltreath to Thrennick", 12000, kms(-1.95, -4.75, -2.8, -4.2, -3.6, -3.3, -4.5, -2.6, -5.4, -1.7, -5.6, -0.6)},
		{"Ring north-west, Thrennick to Hollin", 0, kms(-5.6, -0.6, -5.0, 0.3, -3.9, 0.75, -2.7, 0.3, -1.8, -0.45, -0.7, -0.35, 0.5, 0.45, 1.5, 0.75, 2.35, 0.95)},
		{"Ring east, Hollin to Pellow Green", 15000, kms(2.35, 0.95, 3.3, 0.5, 4.2, -0.2, 4.6, -1.2, 4.5, -2.0)},
		{"Ring south, Pellow Green to Saltreath", 0, kms(4.5, -2.0, 3.6, -2.9, 2.4, -3.35, 1.2, -3.6, 0.2, -3.9, -0.9, -4.25, -1.95, -4.75)},
	}
)

const noVoltageLine = "Line to the airstrip"

func (s *isle) gridLayer() []byte {
	c := &collection{}
	r := stream(s.seed, "grid")
	// Towers stand about 220 m apart, each a little off the line drawn on the plan.
	towers := func(way []geo.XY) []geo.XY {
		var out []geo.XY
		for i := 1; i < len(way); i++ {
			n := int(way[i-1].Dist(way[i])/220) + 1
			for k := range n {
				p := along(way[i-1], way[i], float64(k)/float64(n))
				if k > 0 {
					p = shift(p, left(unit(way[i-1], way[i])), between(r, -3, 3))
				}
				out = append(out, snap(p))
			}
		}
		return append(out, way[len(way)-1])
	}
	for _, l := range ringLegs {
		props := []prop{{"name", l.name}, {"voltage", 33}, {"circuits", 1}, {"overhead", "yes"}, {"spare_capacity", nil}, {"told_by", nil}, {"told_on", nil}}
		if l.spare > 0 {
			props[4].value, props[5].value, props[6].value = l.spare, "Marram Power (invented), planning desk", "2025-11-14"
		}
		c.line(towers(l.way), props...)
	}
	c.line(towers(kms(2.35, 0.95, 3.6, 1.4, 5.0, 1.5, 6.4, 2.0, 7.4, 2.7, 7.5, 3.9)),
		prop{"name", "Spur to the north-east farms"}, prop{"voltage", 11}, prop{"circuits", 1}, prop{"overhead", "yes"}, prop{"spare_capacity", 1800}, prop{"told_by", "Marram Power (invented), planning desk"}, prop{"told_on", "2025-11-14"})
	c.line(towers(kms(2.4, -3.35, 2.7, -3.75, 2.95, -4.05)),
		prop{"name", noVoltageLine}, prop{"voltage", nil}, prop{"circuits", 1}, prop{"overhead", "no"}, prop{"spare_capacity", nil}, prop{"told_by", nil}, prop{"told_on", nil})
	return c.bytes()
}

func (s *isle) stationLayer() []byte {
	c := &collection{}
	c.point(southStation, prop{"name", "Saltreath"}, prop{"voltage", 33}, prop{"spare_capacity", 18000}, prop{"told_by", "Marram Power (invented), planning desk"}, prop{"told_on", "2025-11-14"}, prop{"short_circuit_power", 260}, prop{"upstream_id", nil})
	c.point(northStation, prop{"name", "Hollin"}, prop{"voltage", 33}, prop{"spare_capacity", 9000}, prop{"told_by", "Marram Power (invented), planning desk"}, prop{"told_on", "2025-11-14"}, prop{"short_circuit_power", 140}, prop{"upstream_id", "Saltreath"})
	return c.bytes()
}

// blob is a rounded outline about c, longer along u.
func (s *isle) blob(name string, c geo.XY, turnDeg, longM, wideM, rough float64) []geo.XY {
	n := newNoise(s.seed, "blob "+name)
	u := heading(turnDeg * math.Pi / 180)
	var out []geo.XY
	for k := range 32 {
		a := float64(float64(k) / 32 * 2 * math.Pi)
		f := 1 + float64(rough*n.at(geo.XY{X: 900 * math.Cos(a), Y: 900 * math.Sin(a)}, 700))
		out = append(out, snap(shift(shift(c, u, longM*f*math.Cos(a)), left(u), wideM*f*math.Sin(a))))
	}
	return out
}

// box is a rectangle about the line from a to b, widened by side and prolonged by ends.
func box(a, b geo.XY, sideM, endsM float64) []geo.XY {
	u := unit(a, b)
	p, q, v := shift(a, u, -endsM), shift(b, u, endsM), left(u)
	return []geo.XY{snap(shift(p, v, -sideM)), snap(shift(q, v, -sideM)), snap(shift(q, v, sideM)), snap(shift(p, v, sideM))}
}

func disc(c geo.XY, radiusM float64, n int) []geo.XY {
	var out []geo.XY
	for k := range n {
		out = append(out, snap(shift(c, heading(float64(k)/float64(n)*2*math.Pi), radiusM)))
	}
	return out
}

func (m *mapper) habitatLayer() []byte {
	classes := []struct{ class, condition, irreplaceable, protection string }{
		{"dune grassland", "good", "yes", ordinance + ", section 8: protected dunes"},
		{"bird shore", "good", "no", ordinance + ", section 8: bird shore"},
		{"blanket bog", "fair", "yes", ""},
		{"heath", "fair", "no", ""},
	}
	c := &collection{}
	for _, z := range zones(m.ext, 60, 2, func(p geo.XY) int {
		q, ok := m.ashore(p)
		if !ok {
			return -1
		}
		switch {
		case m.dune(q):
			return 0
		case m.flats(p):
			return 1
		case m.peatM(q) > 1.2:
			return 2
		case m.land.ground(q) > 195 && m.n.fractal(q, 1100, 2) > 0.05:
			return 3
		}
		return -1
	}) {
		if ringArea(z.outer) < 2*units.M2PerHa {
			continue
		}
		k := classes[z.class]
		props := []prop{{"class", k.class}, {"condition", k.condition}, {"irreplaceable", k.irreplaceable}, {"protection", nil}}
		if k.protection != "" {
			props[3].value = k.protection
		}
		c.polygon(z.outer, z.holes, props...)
	}
	return c.bytes()
}

func (s *isle) heritageLayer() []byte {
	c := &collection{projected: true}
	c.polygon(disc(km(-8.35, -2.15), 42, 16), nil, prop{"class", "stone circle"}, prop{"name", "Thren Stones"}, prop{"protection", "listed, " + ordinance + ", section 10"})
	c.polygon(box(km(2.1, -1.02), km(2.14, -1.0), 11, 3), nil, prop{"class", "chapel"}, prop{"name", "Wenna's Chapel"}, prop{"protection", "listed, " + ordinance + ", section 10"})
	c.polygon(disc(km(-11.35, 0.95), 14, 12), nil, prop{"class", "lighthouse"}, prop{"name", "Old West Light"}, prop{"protection", "listed, " + ordinance + ", section 10"})
	return c.bytes()
}

func (m *mapper) floodLayer() []byte {
	c := &collection{}
	for _, f := range []struct {
		years int
		above float64
	}{{20, 1.5}, {100, 2.6}} {
		for _, z := range zones(m.ext, 40, 2, func(p geo.XY) int {
			if m.land.aboveRiver(p) < f.above && m.land.inland.at(p) > 0 {
				return 1
			}
			return -1
		}) {
			if ringArea(z.outer) > units.M2PerHa {
				c.polygon(z.outer, z.holes, prop{"return_period", f.years}, prop{"citation", "Flood map of the island council 2023 (invented)"})
			}
		}
	}
	return c.bytes()
}

func (m *mapper) farmlandLayer() []byte {
	c := &collection{}
	for _, z := range zones(m.ext, 90, 2, m.grade) {
		c.polygon(z.outer, z.holes, prop{"grade", z.class})
	}
	return c.bytes()
}

func (m *mapper) soilLayer() []byte {
	c := &collection{}
	for _, z := range zones(m.ext, 80, 2, m.soil) {
		c.polygon(z.outer, z.holes, prop{"soil_class", soils[z.class].class}, prop{"organic_carbon_stock", soils[z.class].stock}, prop{"depth", 0.3})
	}
	return c.bytes()
}

func (m *mapper) peatLayer() []byte {
	steps := []struct{ from, depth float64 }{{0.5, 0.7}, {1, 1.5}, {2, 2.5}, {3, 3.4}}
	c := &collection{}
	for _, z := range zones(m.ext, 70, 2, func(p geo.XY) int {
		d, k := m.peatM(p), -1
		for i, s := range steps {
			if d > s.from {
				k = i
			}
		}
		return k
	}) {
		if ringArea(z.outer) > units.M2PerHa {
			c.polygon(z.outer, z.holes, prop{"depth", steps[z.class].depth}, prop{"condition", []string{"drained margin", "drained margin", "near natural", "near natural"}[z.class]})
		}
	}
	return c.bytes()
}

func (m *mapper) coverLayer() []byte {
	c := &collection{}
	for _, z := range zones(m.ext, 60, 1, m.cover) {
		c.polygon(z.outer, z.holes, prop{"class", covers[z.class]}, prop{"date", "2025-06-15"})
	}
	return c.bytes()
}

func (s *isle) forestLayer() []byte {
	r := stream(s.seed, "woods")
	c := &collection{}
	for _, p := range s.parcels {
		if p.use != "wood" {
			continue
		}
		kind, high := "broadleaf", between(r, 9, 15)
		if s.land.ground(p.middle) > 70 {
			kind, high = "spruce plantation", between(r, 12, 20)
		}
		c.polygon(p.ring, nil, prop{"kind", kind}, prop{"stand_age", 20 + r.IntN(70)}, prop{"biomass_dry", 60 + 10*r.IntN(12)}, prop{"canopy_height", round(high, 1)})
	}
	return c.bytes()
}

func (s *isle) waterLayer() []byte {
	c := &collection{}
	for _, w := range s.land.streams {
		c.line(w.line, prop{"kind", w.kind}, prop{"width", w.widthM}, prop{"name", w.name})
	}
	for _, l := range s.land.lakes {
		c.polygon(l.ring, nil, prop{"kind", "lake"}, prop{"width", nil}, prop{"name", l.name})
	}
	return c.bytes()
}

// ruleLayers writes the small layers of rules, boundaries, views and names.
func (s *isle) ruleLayers(out map[string][]byte) {
	c := &collection{}
	c.polygon(s.blob("spring", km(-3.3, 0.1), 60, 620, 430, 0.3), nil, prop{"zone", "inner"}, prop{"citation", ordinance + ", section 12: Thren spring"})
	out["water_protection.geojson"] = c.bytes()

	c = &collection{}
	c.polygon(s.blob("landfill", km(-3.15, -4.75), 25, 170, 110, 0.2), nil, prop{"reason", "closed landfill"}, prop{"citation", ordinance + ", section 9"}, prop{"applies_to", "all"})
	c.polygon(kms(-0.12, -6.05, 0.25, -6.2, 0.75, -5.75, 0.95, -5.1, 0.62, -4.95, 0.2, -5.35, 0.02, -5.75), nil, prop{"reason", "harbour area"}, prop{"citation", ordinance + ", section 9"}, prop{"applies_to", "all"})
	c.polygon(box(airstrip[0], airstrip[1], 75, 60), nil, prop{"reason", "airstrip ground"}, prop{"citation", ordinance + ", section 11"}, prop{"applies_to", "all"})
	out["exclusion.geojson"] = c.bytes()

	c = &collection{}
	for _, r := range []struct {
		kind         string
		usable       any
		from, to     geo.XY
		sideM, endsM float64
	}{
		{"roof", 0.6, km(0.30, -5.42), km(0.42, -5.42), 22, 4},
		{"roof", 0.6, km(0.30, -5.52), km(0.40, -5.52), 18, 2},
		{"roof", 0.5, km(0.48, -5.30), km(0.55, -5.30), 14, 0},
		{"car park", nil, km(0.52, -5.47), km(0.62, -5.47), 25, 0},
		{"landfill", 0.7, km(-3.22, -4.75), km(-3.08, -4.75), 60, 0},
	} {
		c.polygon(box(r.from, r.to, r.sideM, r.endsM), nil, prop{"kind", r.kind}, prop{"usable_share", r.usable}, prop{"owner", nil})
	}
	out["sealed_ground.geojson"] = c.bytes()

	c = &collection{}
	c.polygon(box(airstrip[0], airstrip[1], 300, 1600), nil, prop{"limit_value", 45}, prop{"limit_kind", "above ground"}, prop{"citation", ordinance + ", section 11: approach"}, prop{"applies_to", "all"})
	c.polygon(disc(along(airstrip[0], airstrip[1], 0.5), 2500, 48), nil, prop{"limit_value", 120}, prop{"limit_kind", "above ground"}, prop{"citation", ordinance + ", section 11: circuit"}, prop{"applies_to", "all"})
	out["height_limit.geojson"] = c.bytes()

	c = &collection{}
	for _, q := range []struct {
		kind, name string
		near       geo.XY
	}{{"school", "Saltreath School", km(-1.15, -5.1)}, {"school", "Thrennick School", km(-6.35, -1.15)}, {"care home", "Orchard House", km(-1.2, -6.0)}, {"burial ground", "Pellow burial ground", km(5.6, -2.4)}} {
		if p := s.emptyParcel(q.near); p != nil {
			c.polygon(p.ring, nil, prop{"kind", q.kind}, prop{"name", q.name}, prop{"citation", ordinance + ", section 7"})
		}
	}
	out["sensitive.geojson"] = c.bytes()

	c = &collection{}
	c.polygon(s.land.shore, nil, prop{"name", "Municipality of Marram"}, prop{"code", "MRM"})
	out["district.geojson"] = c.bytes()

	c = &collection{swapped: true}
	for i, v := range []struct {
		name, kind string
		at         geo.XY
		eye, head  float64
	}{
		{"Hollin Beacon", "lookout", km(-1.1, 3.7), 1.7, 180}, {"Harbour mole", "lookout", km(-0.25, -5.85), 1.7, 20}, {"Airstrip tower", "control tower", km(3.0, -4.05), 8, 250},
		{"Bird hide", "lookout", km(8.15, -2.25), 1.7, 90}, {"Old West Light", "lookout", km(-11.33, 0.93), 12, 80},
	} {
		c.point(v.at, prop{"point_id", fmt.Sprintf("V-%d", i+1)}, prop{"name", v.name}, prop{"kind", v.kind}, prop{"eye_height", v.eye}, prop{"heading", v.head})
	}
	out["viewpoints.geojson"] = c.bytes()

	c = &collection{}
	for _, p := range s.places {
		rank := map[string]int{"town": 1, "village": 2, "farm": 5}[p.kind]
		c.point(p.at, prop{"name", p.name}, prop{"kind", p.kind}, prop{"rank", rank}, prop{"language", "en"})
	}
	for _, p := range []struct {
		name, kind string
		at         geo.XY
		rank       int
	}{
		{"Hollin Moss", "upland", km(-0.6, 3.6), 2}, {"Marram Spit", "dunes", km(2.4, -6.9), 3}, {"Saltreath Harbour", "bay", km(1.4, -5.7), 3}, {"Tern Flats", "shore", km(8.9, -2.1), 3},
		{"West Head", "cape", km(-11.6, 1.1), 3}, {"East Ness", "cape", km(11.6, 0.4), 3}, {"Gannet Bay", "bay", km(-0.3, 5.7), 4}, {"Thren Bay", "bay", km(-10.0, -0.9), 4}, {"Long Strand", "beach", km(5.6, -6.3), 4},
	} {
		c.point(p.at, prop{"name", p.name}, prop{"kind", p.kind}, prop{"rank", p.rank}, prop{"language", "en"})
	}
	out["place_names.geojson"] = c.bytes()
}

// emptyParcel gives the parcel of a third of a hectare to two nearest to a place, on which no building stands.
func (s *isle) emptyParcel(near geo.XY) *parcel {
	best, at := math.Inf(1), -1
	for i, p := range s.parcels {
		d := p.middle.Dist(near)
		if p.areaHa < 0.33 || p.areaHa > 2 || d >= best || slices.ContainsFunc(s.dwellings, func(h dwelling) bool { return inRing(h.at, p.ring) }) {
			continue
		}
		best, at = d, i
	}
	if at < 0 {
		return nil
	}
	return &s.parcels[at]
}

// terrainGrid writes the heights as an ASCII grid, north row first, decimetres, -9999 at sea.
func (g *land) terrainGrid() []byte {
	f := g.height
	var b bytes.Buffer
	fmt.Fprintf(&b, "ncols %d\nnrows %d\nxllcorner %s\nyllcorner %s\ncellsize %s\nNODATA_value -9999\n", f.nx, f.ny,
		decimal(f.x0-terrainCellM/2+originEastingM, 2), decimal(f.y0-terrainCellM/2+originNorthingM, 2), decimal(terrainCellM, 2))
	for j := f.ny - 1; j >= 0; j-- {
		for i := range f.nx {
			if i > 0 {
				b.WriteByte(' ')
			}
			if v := f.get(i, j); v < -9000 {
				b.WriteString("-9999")
			} else {
				b.WriteString(strconv.FormatFloat(v, 'f', 1, 64))
			}
		}
		b.WriteByte('\n')
	}
	return b.Bytes()
}
