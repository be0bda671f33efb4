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
}

// Marks are drawn over the parcels.
type Marks struct {
	Turbines []geo.LonLat
	Fences   []geo.LonLatGeometry
	Routes   [][2]geo.LonLat
}

// kmPerDegree is the length of a degree of latitude, for the scale bar and the shape of the map.
const kmPerDegree = 111.2

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
	if math.IsInf(box[0], 1) {
		return &Scene{Width: width, Height: 40, Title: title}
	}
	cos := math.Cos((box[1] + box[3]) / 2 * math.Pi / 180)
	const pad = 18
	scale := (width - 2*pad) / ((box[2] - box[0]) * cos)
	height := (box[3]-box[1])*scale + 2*pad
	legendH := 22*float64((len(legend)+2)/3) + 16
	s := &Scene{Width: width, Height: height + legendH, Title: title}
	to := func(p geo.LonLat) Point {
		return Point{pad + (p.Lon-box[0])*cos*scale, pad + (box[3]-p.Lat)*scale}
	}
	shape := func(g geo.LonLatGeometry, st Style, item, words string) {
		var rings [][]Point
		for _, part := range g.Parts {
			for _, ring := range part {
				pts := make([]Point, len(ring))
				for i, p := range ring {
					pts[i] = to(p)
				}
				rings = append(rings, pts)
			}
		}
		if len(rings) > 0 {
			s.Path(Path{Rings: rings, Closed: g.Kind == geo.Polygons, Style: st, Item: item, Title: words})
		}
	}
	s.Rect(0, 0, width, height+legendH, Style{Fill: Paper}, "")
	if len(by["district"]) > 0 {
		s.Rect(0, 0, width, height, Style{Fill: Water}, "")
	}
	for _, f := range by["district"] {
		shape(f.Geometry, Style{Fill: Land, Stroke: Faint, Width: 0.8}, "", "")
	}
	for _, f := range by["parcels"] {
		st, words := shade(f.ID)
		shape(f.Geometry, st, f.ID, words)
	}
	for _, f := range by["water"] {
		st := Style{Stroke: "#7fa6b5", Width: 1}
		if f.Geometry.Kind == geo.Polygons {
			st = Style{Fill: Water, Stroke: "#7fa6b5", Width: 0.6}
		}
		shape(f.Geometry, st, "", "")
	}
	for _, f := range by["roads"] {
		w := 0.7
		if f.Class == "main" {
			w = 1.8
		}
		shape(f.Geometry, Style{Stroke: "#8d8574", Width: w}, "", "")
	}
	for _, f := range by["grid_lines"] {
		shape(f.Geometry, Style{Stroke: Ink, Width: 1, Dash: "6 2 1 2"}, "", "power line "+f.ID)
	}
	for _, f := range by["dwellings"] {
		for _, part := range f.Geometry.Parts {
			if len(part) > 0 && len(part[0]) > 0 {
				p := to(part[0][0])
				s.Rect(p.X-0.6, p.Y-0.6, 1.2, 1.2, Style{Fill: Faint}, "")
			}
		}
	}
	for _, f := range by["substations"] {
		for _, part := range f.Geometry.Parts {
			if len(part) > 0 && len(part[0]) > 0 {
				p := to(part[0][0])
				s.Rect(p.X-4, p.Y-4, 8, 8, Style{Fill: Paper, Stroke: Ink, Width: 1.6}, "substation "+f.Name)
			}
		}
	}
	for _, g := range marks.Fences {
		shape(g, Style{Stroke: Ink, Width: 1.4}, "", "")
	}
	for _, r := range marks.Routes {
		s.Line(Style{Stroke: Ink, Width: 1.2, Dash: "3 3"}, to(r[0]), to(r[1]))
	}
	for _, t := range marks.Turbines {
		p := to(t)
		s.Path(Path{Rings: [][]Point{{{p.X, p.Y - 5}, {p.X + 5, p.Y + 4}, {p.X - 5, p.Y + 4}}}, Closed: true, Style: Style{Fill: Paper, Stroke: Ink, Width: 1.4}, Title: "turbine"})
	}
	names(s, by["place_names"], to)
	scaleBar(s, width, height, scale)
	for i, l := range legend {
		x := pad + float64(i%3)*(width-2*pad)/3
		y := height + 10 + 22*float64(i/3)
		s.Rect(x, y, 18, 12, l.Style, "")
		s.Text(Text{At: Point{x + 24, y + 10.5}, Text: l.Text, Size: 12, Colour: Ink})
	}
	return s
}

// names sets place names by rank; one that would touch an earlier one is left out.
func names(s *Scene, fs []MapFeature, to func(geo.LonLat) Point) {
	fs = append([]MapFeature(nil), fs...)
	sort.SliceStable(fs, func(i, j int) bool { return fs[i].Rank < fs[j].Rank })
	type box struct{ x0, y0, x1, y1 float64 }
	var taken []box
	for _, f := range fs {
		if f.Name == "" || f.Geometry.Empty() {
			continue
		}
		p := to(f.Geometry.Parts[0][0][0])
		size := 11.0
		if f.Rank > 0 && f.Rank <= 1 {
			size = 15
		}
		w := float64(len([]rune(f.Name))) * size * 0.56
		b := box{p.X - w/2 - 3, p.Y - size - 2, p.X + w/2 + 3, p.Y + 4}
		free := b.x0 > 0 && b.x1 < s.Width
		for _, t := range taken {
			if b.x0 < t.x1 && t.x0 < b.x1 && b.y0 < t.y1 && t.y0 < b.y1 {
				free = false
			}
		}
		if !free {
			continue
		}
		taken = append(taken, b)
		s.Text(Text{At: p, Text: f.Name, Size: size, Colour: Ink, Anchor: Middle, Halo: true, Bold: size > 11})
	}
}

func scaleBar(s *Scene, width, height, pxPerDegree float64) {
	km := 1.0
	for _, k := range []float64{1, 2, 5, 10, 20, 50} {
		if k*pxPerDegree/kmPerDegree <= width/4 {
			km = k
		}
	}
	w := km * pxPerDegree / kmPerDegree
	x, y := width-w-24, height-16
	s.Rect(x-8, y-18, w+16, 26, Style{Fill: Paper}, "")
	s.Line(Style{Stroke: Ink, Width: 1.6}, Point{x, y - 4}, Point{x, y}, Point{x + w, y}, Point{x + w, y - 4})
	s.Text(Text{At: Point{x + w/2, y - 5}, Text: strconv.FormatFloat(km, 'g', -1, 64) + " km", Size: 11, Colour: Ink, Anchor: Middle})
	nx, ny := width-26.0, 22.0
	s.Path(Path{Rings: [][]Point{{{nx, ny}, {nx + 5, ny + 16}, {nx, ny + 12}, {nx - 5, ny + 16}}}, Closed: true, Style: Style{Fill: Ink}, Title: "north"})
	s.Text(Text{At: Point{nx, ny + 29}, Text: "N", Size: 12, Colour: Ink, Anchor: Middle, Bold: true})
}
