package draw

import (
	"math"
	"sort"
	"strconv"

	"groundtally/geo"
)

// MapLayer is what a map shows of one layer.
type MapLayer struct {
	Role     string
	Features []MapFeature
}

// MapFeature is one shape with its name.
type MapFeature struct {
	ID, Name string
	Class    string
	Rank     float64
	Geometry geo.LonLatGeometry
}

// Shade gives the style and the words of a parcel.
type Shade func(id string) (Style, string)

// Legend is one line of a map's legend.
type Legend struct {
	Style Style
	Text  string
	Line  bool   // a line rather than a patch
	Sign  string // "turbine", "station" or "number" in place of a patch
}

// Numbered is a number set on the map, with the parcels that it stands for.
type Numbered struct {
	Text    string
	Parcels map[string]bool
}

// Marks are drawn over the parcels.
type Marks struct {
	Turbines []geo.LonLat
	Fences   []geo.LonLatGeometry
	Routes   [][2]geo.LonLat
	Numbers  []Numbered
}

// kmPerDegree is the length of a degree of latitude, for the scale bar and the shape of the map.
const kmPerDegree = 111.2

const (
	mapPad = 18
	casing = "#ffffff" // under outlines and signs, so that they show on light and dark ground
)

// frame places positions on a map.
type frame struct {
	west, north, cos, scale float64
}

func (f frame) to(p geo.LonLat) Point {
	return Point{mapPad + (p.Lon-f.west)*f.cos*f.scale, mapPad + (f.north-p.Lat)*f.scale}
}

func (f frame) path(g geo.LonLatGeometry, st Style) (Path, bool) {
	var rings [][]Point
	for _, part := range g.Parts {
		for _, ring := range part {
			pts := make([]Point, len(ring))
			for i, p := range ring {
				pts[i] = f.to(p)
			}
			rings = append(rings, pts)
		}
	}
	return Path{Rings: rings, Closed: g.Kind == geo.Polygons, Style: st}, len(rings) > 0
}

// Map draws the district with its parcels shaded: land, water, roads, power lines, dwellings, names,
// marks, scale bar, north, legend.
func Map(title string, layers []MapLayer, shade Shade, marks Marks, legend []Legend, width float64) *Scene {
	box := [4]float64{math.Inf(1), math.Inf(1), math.Inf(-1), math.Inf(-1)}
	grow := func(p geo.LonLat) {
		box = [4]float64{math.Min(box[0], p.Lon), math.Min(box[1], p.Lat), math.Max(box[2], p.Lon), math.Max(box[3], p.Lat)}
	}
	by := map[string][]MapFeature{}
	for _, l := range layers {
		by[l.Role] = append(by[l.Role], l.Features...)
	}
	for _, role := range []string{"parcels", "district"} {
		for _, f := range by[role] {
			f.Geometry.Each(grow)
		}
	}
	if math.IsInf(box[0], 1) || box[2] <= box[0] || box[3] <= box[1] {
		return &Scene{Width: width, Height: 40, Title: title}
	}
	cos := math.Cos((box[1] + box[3]) / 2 * math.Pi / 180)
	f := frame{west: box[0], north: box[3], cos: cos, scale: (width - 2*mapPad) / ((box[2] - box[0]) * cos)}
	height := (box[3]-box[1])*f.scale + 2*mapPad
	legend = append(append([]Legend(nil), legend...), ownLegend(by)...)
	columns, rows := legendShape(legend, width)
	s := &Scene{Width: width, Height: height + 22*float64(rows) + 14, Title: title}
	shape := func(g geo.LonLatGeometry, st Style, item, words string) {
		if p, ok := f.path(g, st); ok {
			p.Item, p.Title = item, words
			s.Path(p)
		}
	}
	s.Rect(0, 0, width, s.Height, Style{Fill: Paper}, "")
	if len(by["district"]) > 0 {
		s.Rect(0, 0, width, height, Style{Fill: Water}, "")
	}
	for _, d := range by["district"] {
		shape(d.Geometry, Style{Fill: Land, Stroke: Faint, Width: 0.8}, "", "")
	}
	for _, p := range by["parcels"] {
		st, words := shade(p.ID)
		shape(p.Geometry, st, p.ID, words)
	}
	for _, w := range by["water"] {
		shape(w.Geometry, waterStyle(w.Geometry.Kind), "", "")
	}
	for _, r := range by["roads"] {
		shape(r.Geometry, roadStyle(r.Class), "", "")
	}
	for _, l := range by["grid_lines"] {
		shape(l.Geometry, Style{Stroke: casing, Width: 2.6}, "", "")
		shape(l.Geometry, gridStyle, "", "power line "+first(l.Name, l.ID))
	}
	for _, d := range by["dwellings"] {
		if p, ok := firstPoint(d.Geometry); ok {
			q := f.to(p)
			s.Rect(q.X-0.8, q.Y-0.8, 1.6, 1.6, Style{Fill: dwellingFill}, "")
		}
	}
	for _, b := range by["substations"] {
		if p, ok := firstPoint(b.Geometry); ok {
			station(s, f.to(p), "substation "+first(b.Name, b.ID))
		}
	}
	taken := drawMarks(s, f, by["parcels"], marks)
	taken = append(taken, scaleBar(s, width, height, f.scale)...)
	names(s, by["place_names"], f, taken, height)
	for i, l := range legend {
		x := mapPad + float64(i%columns)*(width-2*mapPad)/float64(columns)
		drawLegend(s, l, x, height+10+22*float64(i/columns))
	}
	return s
}

const dwellingFill = "#3a3f3e"

var gridStyle = Style{Stroke: Ink, Width: 1.2, Dash: "6 2 1 2"}

func waterStyle(kind geo.Kind) Style {
	if kind == geo.Polygons {
		return Style{Fill: Water, Stroke: "#7fa6b5", Width: 0.6}
	}
	return Style{Stroke: "#7fa6b5", Width: 1}
}

func roadStyle(class string) Style {
	if class == "main" {
		return Style{Stroke: "#8d8574", Width: 1.8}
	}
	return Style{Stroke: "#8d8574", Width: 0.7}
}

func first(texts ...string) string {
	for _, t := range texts {
		if t != "" {
			return t
		}
	}
	return ""
}

func firstPoint(g geo.LonLatGeometry) (geo.LonLat, bool) {
	for _, part := range g.Parts {
		for _, ring := range part {
			if len(ring) > 0 {
				return ring[0], true
			}
		}
	}
	return geo.LonLat{}, false
}

func station(s *Scene, p Point, words string) {
	s.Rect(p.X-5, p.Y-5, 10, 10, Style{Fill: casing, Stroke: Ink, Width: 1.8}, words)
	s.Rect(p.X-1.5, p.Y-1.5, 3, 3, Style{Fill: Ink}, "")
}

func turbine(s *Scene, p Point, words string) {
	up := [][]Point{{{p.X, p.Y - 6}, {p.X + 5.5, p.Y + 4}, {p.X - 5.5, p.Y + 4}}}
	s.Path(Path{Rings: up, Closed: true, Style: Style{Stroke: casing, Width: 5}})
	s.Path(Path{Rings: up, Closed: true, Style: Style{Fill: casing, Stroke: Ink, Width: 1.8}, Title: words})
}

func number(s *Scene, p Point, text string) Box {
	w := math.Max(16, TextWidth(text, 11, true)+8)
	s.Rect(p.X-w/2, p.Y-8, w, 16, Style{Fill: casing, Stroke: Ink, Width: 1.4}, "")
	s.Text(Text{At: Point{p.X, p.Y + 4}, Text: text, Size: 11, Colour: Ink, Bold: true, Anchor: Middle})
	return Box{p.X - w/2, p.Y - 8, p.X + w/2, p.Y + 8}
}

// drawMarks draws the chosen plant: its parcels' outlines, fences, routes, turbines, and the numbers
// beside them, moved until none covers another. It gives the room that is taken.
func drawMarks(s *Scene, f frame, parcels []MapFeature, m Marks) []Box {
	var taken []Box
	at := make([]Point, len(m.Numbers))
	here := make([]bool, len(m.Numbers))
	for i, n := range m.Numbers {
		for _, p := range parcels {
			if !n.Parcels[p.ID] {
				continue
			}
			if path, ok := f.path(p.Geometry, Style{Stroke: casing, Width: 4.4}); ok {
				s.Path(path)
				path.Style = Style{Stroke: Ink, Width: 2}
				s.Path(path)
				if !here[i] {
					at[i], here[i] = middle(path.Rings[0]), true
				}
			}
		}
	}
	for _, g := range m.Fences {
		if p, ok := f.path(g, Style{Stroke: casing, Width: 3}); ok {
			s.Path(p)
			p.Style = Style{Stroke: Ink, Width: 1.2, Dash: "2 2"}
			s.Path(p)
		}
	}
	for _, r := range m.Routes {
		s.Line(Style{Stroke: casing, Width: 3}, f.to(r[0]), f.to(r[1]))
		s.Line(routeStyle, f.to(r[0]), f.to(r[1]))
	}
	for _, t := range m.Turbines {
		p := f.to(t)
		turbine(s, p, "turbine")
		taken = append(taken, Box{p.X - 7, p.Y - 8, p.X + 7, p.Y + 6})
	}
	for i, n := range m.Numbers {
		if !here[i] {
			continue
		}
		p := at[i]
		for try := range 40 { // around the place in growing rings
			angle := float64(try) * 2.4
			r := 5 * math.Sqrt(float64(try))
			p = Point{at[i].X + r*math.Cos(angle), at[i].Y + r*math.Sin(angle)}
			if !meetsAny(Box{p.X - 10, p.Y - 9, p.X + 10, p.Y + 9}, taken) {
				break
			}
		}
		taken = append(taken, number(s, p, n.Text).Grown(2, 2))
	}
	return taken
}

var routeStyle = Style{Stroke: Ink, Width: 1.4, Dash: "3 3"}

func meetsAny(b Box, others []Box) bool {
	for _, o := range others {
		if b.Meets(o) {
			return true
		}
	}
	return false
}

func middle(ring []Point) Point {
	b := Box{math.Inf(1), math.Inf(1), math.Inf(-1), math.Inf(-1)}
	for _, p := range ring {
		b = Box{math.Min(b.X0, p.X), math.Min(b.Y0, p.Y), math.Max(b.X1, p.X), math.Max(b.Y1, p.Y)}
	}
	return Point{(b.X0 + b.X1) / 2, (b.Y0 + b.Y1) / 2}
}

// ownLegend explains what the map draws of itself, as far as the layers are there.
func ownLegend(by map[string][]MapFeature) []Legend {
	var out []Legend
	add := func(role string, l Legend) {
		if len(by[role]) > 0 {
			out = append(out, l)
		}
	}
	add("roads", Legend{Style: roadStyle("main"), Line: true, Text: "road"})
	add("grid_lines", Legend{Style: gridStyle, Line: true, Text: "power line"})
	add("substations", Legend{Sign: "station", Text: "substation"})
	add("dwellings", Legend{Sign: "dwelling", Text: "dwelling"})
	add("water", Legend{Style: waterStyle(geo.Polygons), Text: "water"})
	return out
}

const legendText = 12

// legendShape finds how many columns the longest text allows.
func legendShape(legend []Legend, width float64) (columns, rows int) {
	if len(legend) == 0 {
		return 1, 0
	}
	longest := 0.0
	for _, l := range legend {
		longest = math.Max(longest, TextWidth(l.Text, legendText, false)+40)
	}
	columns = max(1, min(4, int((width-2*mapPad)/longest)))
	return columns, (len(legend) + columns - 1) / columns
}

func drawLegend(s *Scene, l Legend, x, y float64) {
	mid := Point{x + 10, y + 6}
	switch {
	case l.Sign == "turbine":
		turbine(s, mid, "")
	case l.Sign == "station":
		station(s, mid, "")
	case l.Sign == "dwelling":
		for _, d := range []float64{-5, 0, 5} {
			s.Rect(mid.X+d-0.8, mid.Y-0.8, 1.6, 1.6, Style{Fill: dwellingFill}, "")
		}
	case l.Sign == "number":
		number(s, Point{mid.X, mid.Y}, "1")
	case l.Line:
		s.Line(l.Style, Point{x, y + 6}, Point{x + 20, y + 6})
	default:
		s.Rect(x, y, 20, 12, l.Style, "")
	}
	s.Text(Text{At: Point{x + 28, y + 10.5}, Text: l.Text, Size: legendText, Colour: Ink})
}

// names sets place names by rank; one that would touch an earlier one, a mark, the scale bar or the
// edge is left out. Names of lesser places keep more room around them, so that the map stays calm.
func names(s *Scene, fs []MapFeature, f frame, taken []Box, height float64) {
	fs = append([]MapFeature(nil), fs...)
	sort.SliceStable(fs, func(i, j int) bool { return fs[i].Rank < fs[j].Rank })
	for _, n := range fs {
		at, ok := firstPoint(n.Geometry)
		if n.Name == "" || !ok {
			continue
		}
		t := Text{At: f.to(at), Text: n.Name, Size: 11, Colour: Ink, Anchor: Middle, Halo: true}
		gapX, gapY := 16.0, 9.0
		if n.Rank > 0 && n.Rank <= 1 {
			t.Size, t.Bold, gapX, gapY = 15, true, 4, 3
		}
		b := t.Box()
		// A name near the edge is moved inwards rather than cut.
		if d := 4 - b.X0; d > 0 {
			t.At.X += d
		}
		if d := b.X1 - (s.Width - 4); d > 0 {
			t.At.X -= d
		}
		b = t.Box().Grown(gapX, gapY)
		if b.Y0+gapY < 0 || b.Y1-gapY > height || meetsAny(b, taken) {
			continue
		}
		taken = append(taken, t.Box())
		s.Text(t)
	}
}

// scaleBar draws the scale bar and the north arrow, and gives the room that they take.
func scaleBar(s *Scene, width, height, pxPerDegree float64) []Box {
	km := 0.1
	for _, k := range []float64{0.2, 0.5, 1, 2, 5, 10, 20, 50, 100} {
		if k*pxPerDegree/kmPerDegree <= width/4 {
			km = k
		}
	}
	w := km * pxPerDegree / kmPerDegree
	x, y := width-w-24, height-16
	s.Rect(x-10, y-20, w+20, 28, Style{Fill: Paper}, "")
	s.Line(Style{Stroke: Ink, Width: 1.6}, Point{x, y - 4}, Point{x, y}, Point{x + w, y}, Point{x + w, y - 4})
	s.Text(Text{At: Point{x + w/2, y - 5}, Text: strconv.FormatFloat(km, 'g', -1, 64) + " km", Size: 11, Colour: Ink, Anchor: Middle})
	nx, ny := width-26.0, 22.0
	s.Path(Path{Rings: [][]Point{{{nx, ny}, {nx + 5, ny + 16}, {nx, ny + 12}, {nx - 5, ny + 16}}}, Closed: true, Style: Style{Fill: Ink}, Title: "north"})
	s.Text(Text{At: Point{nx, ny + 29}, Text: "N", Size: 12, Colour: Ink, Anchor: Middle, Bold: true})
	return []Box{{x - 10, y - 20, x + w + 10, y + 8}, {nx - 10, ny - 4, nx + 10, ny + 34}}
}
